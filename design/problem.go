package design

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"

	"gonum.org/v1/gonum/mat"

	"holdfast/design/brief"
	"holdfast/design/device"
	"holdfast/design/dynamics"
	"holdfast/design/robust"
	"holdfast/design/solve"
	"holdfast/hardware"
	"holdfast/shape"
)

// A problem is one span, ready for the solver: the lanes that play, the playable
// set in coefficients, and the residuals on a coarse grid for the search and on a
// fine one for the finish.
type problem struct {
	profile *hardware.Profile
	samples int
	target  dynamics.Vec // rotation vector of the target, rad
	lanes   []lane
	dim     int // coefficients in all
	count   int // controls

	set   *solve.Set
	quiet *mat.Dense // orthonormal columns: the directions that ring out; nil without such a limit

	settled        bool
	coarse, fine   axis
	spin           robust.Spin    // without grid; of other problems on one site its two lowest levels
	levels         *robust.Levels // of ladders, registers, states and noise, without grid and errors; nil for a spin
	slopes         []*slope       // by held class: the line of an error of a line; nil for the others
	coarseR, fineR robust.Response
	starts         int
	require        brief.Require
	seed           uint64
	visit          func(c []float64) // of every point evaluated; nil outside tests
	turns          []complex128      // e^{iφ} of the angles that the samples are emitted at; 1 comes first
}

// A lane is one channel that plays: its coefficients are c[first:first+n] and, of
// a quadrature channel, n more for Q.
type lane struct {
	channel     int // of the profile
	first       int
	quadratures int // 2, or 1 for a baseband channel
	control     int // the first of its controls
	paths       []path
	feed        feed
	basis       *shape.Basis
	limit       *hardware.Set
	columns     [][]complex128 // samples of each basis function
}

// A slope is the line of an error of a line's parameter, on one lane.
type slope struct {
	lane int
	feed feed
}

// mostWork bounds the multiplications of one evaluation, roughly: half a minute.
const mostWork = 6e10

// mostEntries bounds the response matrix of a problem, 64 MB: some 2000 samples
// at the demonstration's band.
const mostEntries = 8 << 20

// A wish is what newProblem needs to know of a brief.
type wish struct {
	channels []int // of the profile, in the order of the controls
	paths    [][]path
	plain    bool // a spin's
	phantoms []device.Matrix
	samples  int
	family   string
	count    int // coefficients per quadrature; 0: what the band carries
	degree   int // of B-splines
	spin     robust.Spin
	levels   *robust.Levels // nil for a spin
	slopes   []*slope
	target   dynamics.Vec
	settled  bool
	turns    []complex128
}

// newProblem puts the rooms together.
func newProblem(p *hardware.Profile, w wish) (*problem, error) {
	q := &problem{profile: p, samples: w.samples, spin: w.spin, levels: w.levels, slopes: w.slopes, target: w.target, settled: w.settled, turns: w.turns}
	if len(q.turns) == 0 {
		q.turns = []complex128{1}
	}
	control, opening := 0, math.Inf(-1)
	for _, c := range w.channels {
		opening = math.Max(opening, p.Start(c))
	}
	for i, c := range w.channels {
		l, err := newLane(p, c, w, opening)
		if err != nil {
			return nil, err
		}
		l.first, l.control = q.dim, control
		l.feed.curved = p.Channels[c].Shift != 0 || control < len(w.spin.Maps) && w.spin.Maps[control] != nil
		q.dim += l.quadratures * l.basis.Count
		control += l.quadratures
		if w.paths != nil {
			l.paths = w.paths[i]
			control += len(l.paths) * l.quadratures
		}
		q.lanes = append(q.lanes, l)
	}
	q.count = control + len(w.phantoms)
	var err error
	if q.coarse, err = q.axis(stepShare, w.settled); err != nil {
		return nil, err
	}
	if q.fine, err = q.axis(fineShare, w.settled); err != nil {
		return nil, err
	}
	if entries := q.fine.nodes() * q.dim; entries > mostEntries {
		return nil, fmt.Errorf("span: %d samples with %d coefficients and %d steps are more than a search can hold; allowed: coefficients times steps up to %d: take a shorter span or a narrower band",
			w.samples, q.dim, len(q.fine.Steps), mostEntries/2)
	}
	q.coarseR, q.fineR = q.response(&q.coarse), q.response(&q.fine)
	q.constrain()
	if q.levels != nil { // before any search: is all that is asked known?
		s := *q.levels
		s.Grid, s.Held = q.coarse.Grid, q.spin.Held
		g, err := robust.NewLevelsGate(s, robust.Response{}, 0)
		if err != nil {
			return nil, err
		}
		if _, gradient := g.Work(); gradient > mostWork {
			return nil, fmt.Errorf("span: %d levels, %d steps and errors of %d residuals take minutes to look at once; allowed: fewer levels, a shorter span or a smaller class of errors", s.Dim, len(s.Grid.Steps), g.Rows())
		}
	}
	return q, nil
}

// newLane readies one channel; opening is the instant of the gate's window.
func newLane(p *hardware.Profile, c int, w wish, opening float64) (lane, error) {
	ch := &p.Channels[c]
	l := lane{channel: c, quadratures: ch.Columns(), feed: feed{line: ch.Line, at: p.Start(c) - opening}}
	free := w.samples - ch.GuardLead - ch.GuardTrail
	if width := math.Min(0.5, ch.Band*p.SamplePeriod); free > 0 && float64(2*w.samples)*float64(l.quadratures*shape.DefaultCount(free, width)) > mostEntries {
		return l, fmt.Errorf("span: %d samples with %d coefficients per quadrature are more than a search can hold; allowed: a shorter span or a narrower band", w.samples, shape.DefaultCount(free, width))
	}
	var err error
	if l.limit, err = p.Playable(c, w.samples); err != nil {
		return l, err
	}
	if l.basis, err = newBasis(ch, p.SamplePeriod, w); err != nil {
		return l, fmt.Errorf("channel %q: %w", ch.Name, err)
	}
	n := w.samples
	for j := range l.basis.Count {
		col := make([]complex128, n)
		for k, v := range l.basis.Columns[j*n : (j+1)*n] {
			col[k] = complex(v, 0)
		}
		l.columns = append(l.columns, col)
	}
	return l, nil
}

// newBasis makes the samples' basis. Where the channel has no band, or one of half
// the sample rate, every family is the whole space: one coefficient per sample.
func newBasis(ch *hardware.Channel, h float64, w wish) (b *shape.Basis, err error) {
	lead, trail, width := ch.GuardLead, ch.GuardTrail, ch.Band*h
	switch {
	case w.family == brief.Samples || width >= 0.5:
		b, err = shape.Samples(w.samples, lead, trail)
	case w.family == brief.Fourier:
		b, err = shape.Fourier(w.samples, lead, trail, width, w.count)
	case w.family == brief.Tapered:
		b, err = shape.TaperedFourier(w.samples, lead, trail, width, w.count)
	case w.family == brief.BSpline:
		b, err = shape.BSpline(w.samples, lead, trail, width, w.count, w.degree)
	default:
		b, err = shape.Slepian(w.samples, lead, trail, width, w.count)
	}
	if err == nil && ch.ZeroMean {
		b, err = shape.ZeroMean(b)
	}
	return b, err
}

// axis builds a grid for the lanes that play.
func (q *problem) axis(share float64, settled bool) (axis, error) {
	var feeds []feed
	for _, l := range q.lanes {
		feeds = append(feeds, l.feed)
	}
	return newAxis(feeds, q.samples, q.profile.SamplePeriod, share, settled, q.fastest(), length(q.spin.Static), q.reach())
}

// fastest is the largest rate at which one control turns the code space, rad/ns; of a mapped one
// the axis has the steepest slope.
func (q *problem) fastest() float64 {
	full := 0.0
	for _, a := range q.spin.Axes {
		full = math.Max(full, length(a))
	}
	if q.spin.Axes != nil || q.levels == nil {
		return full
	}
	for _, a := range q.levels.Axes {
		for _, i := range q.levels.Code {
			row := 0.0
			for _, j := range q.levels.Code {
				row += cmplx.Abs(a[i*q.levels.Dim+j])
			}
			full = math.Max(full, 2*row)
		}
	}
	return full
}

// reach bounds the largest difference of the energies of the undriven levels (Gershgorin),
// or how fast its terms rotate, rad/ns; zero for a spin.
func (q *problem) reach() float64 {
	if q.levels == nil {
		return 0
	}
	low, high := math.Inf(1), math.Inf(-1)
	d := q.levels.Dim
	for i := range d {
		row := 0.0
		for j := range d {
			if j != i {
				row += cmplx.Abs(q.levels.Static[i*d+j])
			}
		}
		e := real(q.levels.Static[i*d+i])
		low, high = math.Min(low, e-row), math.Max(high, e+row)
	}
	turning := 0.0
	for _, r := range q.levels.Rotating {
		turning = math.Max(turning, r.Frequency)
	}
	for _, l := range q.lanes {
		for _, p := range l.paths {
			turning = math.Max(turning, math.Abs(p.frequency))
		}
	}
	return high - low + turning
}

// response gives every coefficient's field at the nodes, and every slope's.
func (q *problem) response(a *axis) robust.Response {
	r := robust.Response{Dim: q.dim, Slopes: make([][]robust.Block, len(q.slopes))}
	for i := range q.lanes {
		r.Blocks = append(r.Blocks, a.blocks(&q.lanes[i], q.lanes[i].feed)...)
	}
	for i, s := range q.slopes {
		if s != nil {
			r.Slopes[i] = a.blocks(&q.lanes[s.lane], s.feed)
		}
	}
	return r
}

func length(v dynamics.Vec) float64 { return math.Sqrt(v[0]*v[0] + v[1]*v[1] + v[2]*v[2]) }

// constrain multiplies the playable sets by the bases.
func (q *problem) constrain() {
	q.set = solve.NewSet(q.dim)
	var ringing []float64 // the ring-out rows, one after the other
	rows := 0
	for i := range q.lanes {
		l := &q.lanes[i]
		n, N := l.basis.Count, q.samples
		// a row over samples becomes one over the coefficients of each quadrature
		row := func(first int, weights []complex128) (re, im []float64) {
			re, im = make([]float64, q.dim), make([]float64, q.dim)
			for j := range n {
				var w complex128
				for k, v := range weights {
					w += v * complex(l.basis.Columns[j*N+first+k], 0)
				}
				re[l.first+j], im[l.first+j] = real(w), imag(w)
				if l.quadratures == 2 { // w·x with x = B (c_I + i c_Q)
					re[l.first+n+j], im[l.first+n+j] = -imag(w), real(w)
				}
			}
			return re, im
		}
		turns := []complex128{1}
		if l.quadratures == 2 {
			turns = q.turns // every angle that the samples are emitted at
		}
		for k := l.limit.Lead; k < N-l.limit.Trail; k++ {
			if l.limit.Box == 0 {
				re, im := row(k, []complex128{1})
				q.set.AddDisc(re, im, l.limit.Disc)
				continue
			}
			for _, turn := range turns {
				re, im := row(k, []complex128{turn})
				q.set.AddRow(re, l.limit.Box)
				q.set.AddRow(im, l.limit.Box)
			}
		}
		for _, r := range l.limit.Rows {
			for i, turn := range turns {
				weights := r.Weights
				if i > 0 {
					weights = make([]complex128, len(r.Weights))
					for k, w := range r.Weights {
						weights[k] = turn * w
					}
				}
				re, im := row(r.First, weights)
				for _, a := range [][]float64{re, im} {
					q.set.AddRow(a, r.Bound)
					if r.Limit != hardware.Slew && i == 0 {
						rows++
						for _, v := range a {
							ringing = append(ringing, v/r.Bound)
						}
					}
				}
			}
		}
		for _, b := range l.limit.Balls {
			q.set.AddBall(l.both(q.dim, l.overlap(b.Weights, N)), b.Bound)
		}
		if !math.IsInf(l.limit.OutOfBand, 1) && l.limit.OutOfBand > 0 {
			width := q.profile.Channels[l.channel].Band * q.profile.SamplePeriod
			if e, err := l.basis.OutOfBand(width); err == nil && width < 0.5 {
				q.set.AddBall(l.both(q.dim, e), math.Sqrt(l.limit.OutOfBand))
			}
		}
	}
	if rows == 0 {
		return
	}
	var svd mat.SVD
	if !svd.Factorize(mat.NewDense(rows, q.dim, ringing), mat.SVDThin) {
		return
	}
	values := svd.Values(nil)
	rank := 0
	for rank < len(values) && rank < q.dim/2 && values[rank] > 1e-2*values[0] {
		rank++
	}
	if rank == 0 {
		return
	}
	var v mat.Dense
	svd.VTo(&v)
	q.quiet = mat.DenseCopyOf(v.Slice(0, q.dim, 0, rank))
}

// overlap gives the matrix of a sum of squares over rows of samples, in the
// coefficients of one quadrature; the identity for no rows, as the columns are
// orthonormal.
func (l *lane) overlap(rows [][]float64, samples int) []float64 {
	n := l.basis.Count
	m := make([]float64, n*n)
	if rows == nil {
		for i := range n {
			m[i*n+i] = 1
		}
	}
	for _, w := range rows {
		a := l.basis.Transpose(w, nil)
		for i, v := range a {
			for k, u := range a {
				m[i*n+k] += v * u
			}
		}
	}
	return m
}

// both puts the matrix of one quadrature in the place of each of the lane's.
func (l *lane) both(dim int, m []float64) []float64 {
	n := l.basis.Count
	q := make([]float64, dim*dim)
	for k := range l.quadratures {
		first := l.first + k*n
		for i := range n {
			copy(q[(first+i)*dim+first:(first+i)*dim+first+n], m[i*n:(i+1)*n])
		}
	}
	return q
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
	s := start{c: make([]float64, q.dim), kappa: [...]float64{5, 1, 20}[number%3]}
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

// addArea moves c along the lowest shapes so that the areas of the controls turn
// a resonant spin by want about the target's axis, as far as they can.
func (q *problem) addArea(c []float64, want, angle float64) {
	if q.spin.Axes == nil { // a register's starts have no area in common
		return
	}
	for _, l := range q.lanes {
		n := l.basis.Count
		sums := make([]float64, n)
		total := 0.0
		for j := range n {
			for _, v := range l.basis.Columns[j*q.samples : (j+1)*q.samples] {
				sums[j] += v
			}
			total += sums[j] * sums[j]
		}
		if total == 0 {
			continue
		}
		for k := range l.quadratures {
			axis := q.spin.Axes[l.control+k]
			full := length(axis) * q.profile.SamplePeriod
			along := 0.0
			for i := range 3 {
				along += axis[i] * q.target[i]
			}
			along /= length(axis) * angle
			part := c[l.first+k*n : l.first+(k+1)*n]
			have := 0.0
			for j := range n {
				have += sums[j] * part[j]
			}
			f := (want*along/full - have) / total
			for j := range n {
				part[j] += f * sums[j]
			}
		}
	}
}

// An evaluator gives residuals and figures of one gate: robust.Gate of a spin, or
// robust.LevelsGate of all else.
type evaluator interface {
	Rows() int
	Dim() int
	Residuals(c, r []float64)
	Jacobian(jac []float64)
	Figures(u []float64, v [][]float64) robust.Figures
	MeanInfidelity(u []float64, v [][]float64, class int) float64
}

// evaluator makes one on a grid. What a ladder asks for was found to be known when
// the problem was made.
func (q *problem) evaluator(grid robust.Grid, r robust.Response, held []robust.Class, refine float64) evaluator {
	if q.levels != nil {
		s := *q.levels
		if s.Grid, s.Held = grid, held; len(grid.Steps) == len(q.coarse.Steps) {
			s.Within = 1e-9
		}
		g, err := robust.NewLevelsGate(s, r, refine)
		if err != nil {
			panic("design: " + err.Error())
		}
		return g
	}
	s := q.spin
	s.Grid, s.Held = grid, held
	return robust.NewGate(s, r, refine)
}

// gate returns the residuals on the coarse or the fine grid.
func (q *problem) gate(fine bool) evaluator {
	if fine {
		return q.evaluator(q.fine.Grid, q.fineR, q.spin.Held, 0)
	}
	return q.evaluator(q.coarse.Grid, q.coarseR, q.spin.Held, 0)
}

// finite returns the residuals on the coarse grid with those of a stage's finite
// errors.
func (q *problem) finite(st stage) evaluator {
	held := append([]robust.Class(nil), q.spin.Held...)
	for i := range held {
		held[i].Size *= st.stretch
		held[i].OneSided = st.oneSided
	}
	return q.evaluator(q.coarse.Grid, q.coarseR, held, refineWeight)
}

// residuals makes the solver's problem of a gate.
func (q *problem) residuals(g evaluator) solve.Problem {
	p := solve.Problem{Dim: g.Dim(), Rows: g.Rows(), Residuals: g.Residuals, Jacobian: g.Jacobian}
	if l, ok := g.(*robust.LevelsGate); ok && l.Many() {
		p.Jacobian, p.Gradient = nil, l.Gradient
	}
	if q.visit != nil {
		p.Residuals = func(c, r []float64) {
			q.visit(c)
			g.Residuals(c, r)
		}
	}
	return p
}

// sampled returns the samples of c, lane by lane.
func (q *problem) sampled(c []float64) [][]complex128 {
	list := make([][]complex128, len(q.lanes))
	for i, l := range q.lanes {
		n, N := l.basis.Count, q.samples
		x := make([]complex128, N)
		for j := range n {
			re, im := c[l.first+j], 0.0
			if l.quadratures == 2 {
				im = c[l.first+n+j]
			}
			for k, v := range l.basis.Columns[j*N : (j+1)*N] {
				x[k] += complex(v*re, v*im)
			}
		}
		list[i] = x
	}
	return list
}

// controls returns what arrives at the nodes of a grid, in shares of full scale, for the samples of every
// lane, and for every held class that is an error of a line what λ multiplies.
func (q *problem) controls(a *axis, x [][]complex128) (u []float64, v [][]float64) {
	u = make([]float64, q.count*a.nodes())
	v = make([][]float64, len(q.slopes))
	for i := range q.lanes {
		a.put(&q.lanes[i], q.lanes[i].feed, x[i], u)
	}
	for i, s := range q.slopes {
		if s != nil {
			v[i] = make([]float64, len(u))
			a.put(&q.lanes[s.lane], s.feed, x[s.lane], v[i])
		}
	}
	return u, v
}
