package design

import (
	"fmt"
	"math"
	"math/rand/v2"

	"gonum.org/v1/gonum/mat"

	"holdfast/design/dynamics"
	"holdfast/design/robust"
	"holdfast/design/solve"
	"holdfast/hardware"
	"holdfast/shape"
)

// A problem is one span of one channel, ready for the solver: the basis, the
// playable set in coefficients, and the residuals on a coarse grid for the
// search and on a fine one for the finish. Coefficients are c = (c_I, c_Q).
type problem struct {
	profile *hardware.Profile
	channel int
	samples int
	target  dynamics.Vec // rotation vector of the target, rad

	basis *shape.Basis
	limit *hardware.Set
	set   *solve.Set
	quiet *mat.Dense // orthonormal columns: the directions that ring out; nil without such a limit

	coarse, fine   axis
	spin           robust.Spin // without grid
	coarseR, fineR robust.Response
	starts         int
	seed           uint64
	visit          func(c []float64) // of every point evaluated; nil outside tests
	columns        [][]complex128
}

// mostEntries bounds the response matrix of a problem, 64 MB, of which every
// worker holds a copy: some 2000 samples at the demonstration's band.
const mostEntries = 8 << 20

// newProblem puts the rooms together for n samples.
func newProblem(p *hardware.Profile, channel, n int, family string, count int, s robust.Spin, target dynamics.Vec, settled bool) (*problem, error) {
	ch := &p.Channels[channel]
	h := p.SamplePeriod
	limit, err := p.Playable(channel, n)
	if err != nil {
		return nil, err
	}
	q := &problem{profile: p, channel: channel, samples: n, spin: s, limit: limit, target: target}
	switch width := ch.Band * h; {
	case family == shape.FamilySamples || width >= 0.5:
		q.basis, err = shape.Samples(n, ch.GuardLead, ch.GuardTrail)
	default:
		q.basis, err = shape.Slepian(n, ch.GuardLead, ch.GuardTrail, width, count)
	}
	if err != nil {
		return nil, err
	}
	full := 0.0
	for _, a := range s.Axes {
		full = math.Max(full, length(a))
	}
	static := length(s.Static)
	for j := range q.basis.Count {
		col := make([]complex128, n)
		for k := range n {
			col[k] = complex(q.basis.Columns[j*n+k], 0)
		}
		q.columns = append(q.columns, col)
	}
	q.coarse = newAxis(ch.Line, n, h, stepShare, settled, full, static, q.after())
	q.fine = newAxis(ch.Line, n, h, fineShare, settled, full, static, q.after())
	if entries := 2 * len(q.fine.Steps) * q.basis.Count; entries > mostEntries {
		return nil, fmt.Errorf("span: %d samples with %d coefficients per quadrature and %d steps are more than a search can hold; allowed: coefficients times steps up to %d: take a shorter span or a narrower band",
			n, q.basis.Count, len(q.fine.Steps), mostEntries/2)
	}
	q.coarseR = q.coarse.response(ch.Line, q.columns, h)
	q.fineR = q.fine.response(ch.Line, q.columns, h)
	q.constrain()
	return q, nil
}

// after is the largest field, rad/ns, that the steps after the span must resolve.
func (q *problem) after() float64 {
	full := math.Max(length(q.spin.Axes[0]), length(q.spin.Axes[1]))
	if limit := q.profile.Channels[q.channel].RingOut.Limit; !math.IsInf(limit, 1) {
		return full * math.Min(1, 2*limit)
	}
	return full
}

func length(v dynamics.Vec) float64 { return math.Sqrt(v[0]*v[0] + v[1]*v[1] + v[2]*v[2]) }

// constrain multiplies the playable set by the basis.
func (q *problem) constrain() {
	n := q.basis.Count
	N := q.samples
	q.set = solve.NewSet(2 * n)
	for k := q.limit.Lead; k < N-q.limit.Trail; k++ {
		i, s := make([]float64, 2*n), make([]float64, 2*n)
		for j := range n {
			i[j] = q.basis.Columns[j*N+k]
			s[n+j] = i[j]
		}
		q.set.AddDisc(i, s, q.limit.Disc)
	}
	var ringing []float64 // the ring-out rows, one after the other
	rows := 0
	for _, row := range q.limit.Rows {
		// w·x with x = B (c_I + i c_Q): real and imaginary part
		re, im := make([]float64, 2*n), make([]float64, 2*n)
		for j := range n {
			var w complex128
			for k, v := range row.Weights {
				w += v * complex(q.basis.Columns[j*N+row.First+k], 0)
			}
			re[j], re[n+j] = real(w), -imag(w)
			im[j], im[n+j] = imag(w), real(w)
		}
		for _, a := range [][]float64{re, im} {
			q.set.AddRow(a, row.Bound)
			if row.Limit != hardware.Slew {
				rows++
				for _, v := range a {
					ringing = append(ringing, v/row.Bound)
				}
			}
		}
	}
	if rows == 0 {
		return
	}
	var svd mat.SVD
	if !svd.Factorize(mat.NewDense(rows, 2*n, ringing), mat.SVDThin) {
		return
	}
	values := svd.Values(nil)
	rank := 0
	for rank < len(values) && rank < n && values[rank] > 1e-2*values[0] {
		rank++
	}
	var v mat.Dense
	svd.VTo(&v)
	q.quiet = mat.DenseCopyOf(v.Slice(0, 2*n, 0, rank))
}

// silence takes the directions that ring out from c.
func (q *problem) silence(c []float64) {
	if q.quiet == nil {
		return
	}
	_, rank := q.quiet.Dims()
	for k := range rank {
		col := mat.Col(nil, k, q.quiet)
		dot := 0.0
		for i, v := range col {
			dot += v * c[i]
		}
		for i, v := range col {
			c[i] -= dot * v
		}
	}
}

// shrink scales c so that its gauge is at most g.
func (q *problem) shrink(c []float64, g float64) {
	if have := q.set.Gauge(c); have > g {
		for i := range c {
			c[i] *= g / have
		}
	}
}

// A start is where a search begins, and how.
type start struct {
	c     []float64
	kappa float64
}

// ways lists how the starts are drawn, in turn. Most of what is found at the
// shortest spans, and the best of what is found at long ones, has the area of the
// target's angle plus whole turns, so that most starts have it too.
var ways = [...]struct {
	area  bool // the area of the target's angle plus turns
	turns float64
	reach float64 // of the boundary; 0: drawn from 0.3 to 0.9
}{
	{},
	{area: true, turns: 1},
	{area: true, turns: 2},
	{area: true},
	{area: true},
	{area: true, turns: 1},
	{area: true, turns: -1},
	{reach: 0.97},
	{area: true, turns: 2},
	{area: true, turns: -2},
}

// start draws the numbered start: Gaussian coefficients that do not ring, in one
// of the ways.
func (q *problem) start(number int) start {
	rng := rand.New(rand.NewPCG(q.seed, uint64(number)))
	s := start{c: make([]float64, 2*q.basis.Count), kappa: [...]float64{5, 1, 20}[number%3]}
	for i := range s.c {
		s.c[i] = rng.NormFloat64()
	}
	way := ways[number%len(ways)]
	reach := 0.3 + 0.6*rng.Float64()
	if way.reach > 0 {
		reach = way.reach
	}
	q.silence(s.c)
	g := q.set.Gauge(s.c)
	for i := range s.c {
		s.c[i] *= reach / g
	}
	if angle := length(q.target); way.area && angle > 0 {
		q.addArea(s.c, angle+2*math.Pi*way.turns, angle)
		q.silence(s.c)
		q.shrink(s.c, 0.9)
	}
	return s
}

// addArea moves c along the lowest shape so that the areas of the quadratures
// turn a resonant spin by want about the target's transverse axis.
func (q *problem) addArea(c []float64, want, angle float64) {
	n := q.basis.Count
	sums := make([]float64, n)
	total := 0.0
	for j := range n {
		for _, v := range q.basis.Columns[j*q.samples : (j+1)*q.samples] {
			sums[j] += v
		}
		total += sums[j] * sums[j]
	}
	if total == 0 {
		return
	}
	for k, axis := range q.spin.Axes {
		full := length(axis) * q.profile.SamplePeriod
		along := 0.0
		for i := range 3 {
			along += axis[i] * q.target[i]
		}
		along /= length(axis) * angle
		have := 0.0
		for j := range n {
			have += sums[j] * c[k*n+j]
		}
		f := (want*along/full - have) / total
		for j := range n {
			c[k*n+j] += f * sums[j]
		}
	}
}

// gate returns the residuals on the coarse or the fine grid.
func (q *problem) gate(fine bool) *robust.Gate {
	s := q.spin
	if fine {
		s.Grid = q.fine.Grid
		return robust.NewGate(s, q.fineR, 0)
	}
	s.Grid = q.coarse.Grid
	return robust.NewGate(s, q.coarseR, 0)
}

// finite returns the residuals on the coarse grid with those of a stage's finite
// errors.
func (q *problem) finite(st stage) *robust.Gate {
	s := q.spin
	s.Grid = q.coarse.Grid
	s.Held = append([]robust.Class(nil), s.Held...)
	for i := range s.Held {
		s.Held[i].Size *= st.stretch
		s.Held[i].OneSided = st.oneSided
	}
	return robust.NewGate(s, q.coarseR, refineWeight)
}

// residuals makes the solver's problem of a gate.
func (q *problem) residuals(g *robust.Gate) solve.Problem {
	p := solve.Problem{Dim: g.Dim(), Rows: g.Rows(), Residuals: g.Residuals, Jacobian: g.Jacobian}
	if q.visit != nil {
		p.Residuals = func(c, r []float64) {
			q.visit(c)
			g.Residuals(c, r)
		}
	}
	return p
}

// sampled returns the samples of c.
func (q *problem) sampled(c []float64) []complex128 {
	n, N := q.basis.Count, q.samples
	x := make([]complex128, N)
	for j := range n {
		for k, v := range q.basis.Columns[j*N : (j+1)*N] {
			x[k] += complex(v*c[j], v*c[n+j])
		}
	}
	return x
}
