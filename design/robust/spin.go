package robust

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"

	"holdfast/design/dynamics"
)

// A Grid is the time axis of one gate: steps in ns, those of the gate's window
// (in which alone errors act) at First <= j < Last.
type Grid struct {
	Steps       []float64
	First, Last int
	// Lead and Trail, ns, are what of the grid lies before and after the window:
	// the free evolution over them is taken out of the gate, whose frame is that of
	// the undriven device.
	Lead, Trail float64
}

// Window returns the length of the gate's window in ns.
func (g Grid) Window() float64 {
	t := 0.0
	for _, h := range g.Steps[g.First:g.Last] {
		t += h
	}
	return t
}

// Spin is the problem of one driven spin.
type Spin struct {
	Grid   Grid
	Static dynamics.Vec    // H0 = Static·σ/2, rad/ns
	Axes   [2]dynamics.Vec // of I and Q at full scale: H += share (Axes·σ)/2, rad/ns
	Target dynamics.Quat
	Held   []Class
}

// A Gate evaluates a Spin problem. It serves one goroutine; Clone makes more.
type Gate struct {
	spec     Spin
	response Response
	span     float64 // window, ns
	before   dynamics.Quat
	after    dynamics.Quat
	full     float64 // full-scale rate that makes amplitude residuals dimensionless, rad/ns
	members  []member
	weight   float64 // of the members' residuals

	nominal dynamics.Spin // with every toggled error
	finite  dynamics.Spin // gate only
	combine []triple

	re, im blas64.General // the response, N x nodes: products then run along the nodes

	u    []float64
	rows int
	d    []float64 // derivatives by node: raw rows x 2 nodes; slopes lie in it
	raw  []float64 // by coefficient: raw rows x 2 n
	k    [][9]float64

	slopes       dynamics.Slopes
	memberSlopes []dynamics.Slopes
}

// Response is what each coefficient of one quadrature gives at the grid's
// nodes: Re and Im are row-major, nodes x N; u = (Re + i Im)(c_I + i c_Q). Im is
// nil for a line that does not mix the quadratures.
type Response struct {
	N      int
	Re, Im []float64
}

// triple says what three residuals are: a weight times an averaged toggled
// error, put together from those that dynamics follows.
type triple struct {
	weight float64
	parts  []part
}

// part is one toggled error and its factor in a triple.
type part struct {
	toggle int
	factor float64
}

// NewGate prepares the residuals of the problem: the gate error (3), then for
// every held class the time-averaged toggled error (3, or 9 for Any). With
// refine > 0, the gate errors of the classes' ensembles (3 each) follow with
// that weight.
func NewGate(s Spin, r Response, refine float64) *Gate {
	g := &Gate{spec: s, response: r, weight: refine}
	g.span = s.Grid.Window()
	g.before = dynamics.Turn(scaled(s.Static, -s.Grid.Lead))
	g.after = dynamics.Turn(scaled(s.Static, -s.Grid.Trail))
	g.full = math.Max(norm(s.Axes[0]), norm(s.Axes[1]))
	base := dynamics.Spin{Static: s.Static, Axes: s.Axes[:], Steps: s.Grid.Steps, First: s.Grid.First, Last: s.Grid.Last}
	g.nominal, g.finite = base, base

	statics, all := 0, false
	for _, c := range s.Held {
		switch c.Kind {
		case Static:
			statics++
		case Any:
			all = true
		}
	}
	// Either each named static error is toggled by itself, or, when that is less
	// work, the three directions are and the named ones combined from them.
	all = all || statics > 3
	if all {
		g.nominal.Held = []dynamics.Vec{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}}
	}
	amplitude := -1
	for _, c := range s.Held {
		switch {
		case c.Kind == Any:
			for i := range 3 {
				g.combine = append(g.combine, triple{c.Weight, []part{{i, 1 / g.span}}})
			}
		case c.Kind == Static && all:
			v := unit(c.Vector)
			g.combine = append(g.combine, triple{c.Weight, []part{{0, v[0] / g.span}, {1, v[1] / g.span}, {2, v[2] / g.span}}})
		case c.Kind == Static:
			g.combine = append(g.combine, triple{c.Weight, []part{{len(g.nominal.Held), 1 / g.span}}})
			g.nominal.Held = append(g.nominal.Held, unit(c.Vector))
		}
	}
	for _, c := range s.Held {
		if c.Kind == Amplitude {
			if amplitude < 0 {
				amplitude = len(g.nominal.Held)
				g.nominal.Borne = make([][]float64, 1) // the controls themselves, see below
			}
			g.combine = append(g.combine, triple{c.Weight, []part{{amplitude, 1 / (g.span * g.full)}}})
		}
	}
	if refine > 0 {
		for _, c := range s.Held {
			g.members = append(g.members, c.ensemble()...)
		}
	}
	nodes := 2 * len(s.Grid.Steps)
	g.u = make([]float64, 2*nodes)
	if amplitude >= 0 {
		g.nominal.Borne[0] = g.u
	}
	g.nominal.Reset()
	g.finite.Reset()
	g.rows = 3 + 3*len(g.combine) + 3*len(g.members)
	rawRows := 3 + 3*len(g.nominal.Toggle) + 3*len(g.members)
	g.re, g.im = transposed(r.Re, nodes, r.N), transposed(r.Im, nodes, r.N)
	g.d = make([]float64, rawRows*2*nodes)
	row := func(i int) []float64 { return g.d[i*2*nodes : (i+1)*2*nodes] }
	gateRows := func(i int) [3][]float64 { return [3][]float64{row(i), row(i + 1), row(i + 2)} }
	g.slopes.Gate = gateRows(0)
	for i := range 3 * len(g.nominal.Toggle) {
		g.slopes.Toggle = append(g.slopes.Toggle, row(3+i))
	}
	for range 3 * len(g.nominal.Borne) {
		g.slopes.Direct = append(g.slopes.Direct, make([]float64, 2*nodes))
	}
	for i := range g.members {
		first := 3 + 3*len(g.nominal.Toggle) + 3*i
		g.memberSlopes = append(g.memberSlopes, dynamics.Slopes{Gate: gateRows(first)})
	}
	g.raw = make([]float64, rawRows*2*r.N)
	g.k = make([][9]float64, 1+len(g.members))
	return g
}

// transposed returns the transpose of a row-major matrix, empty for nil.
func transposed(a []float64, rows, cols int) blas64.General {
	if a == nil {
		return blas64.General{}
	}
	t := blas64.General{Rows: cols, Cols: rows, Stride: rows, Data: make([]float64, len(a))}
	for i := range rows {
		for j := range cols {
			t.Data[j*rows+i] = a[i*cols+j]
		}
	}
	return t
}

// Clone returns a Gate with working memory of its own.
func (g *Gate) Clone() *Gate { return NewGate(g.spec, g.response, g.weight) }

// Rows returns the number of residuals, Dim the number of coefficients (both
// quadratures: c = (c_I, c_Q)).
func (g *Gate) Rows() int { return g.rows }

// Dim returns the number of coefficients.
func (g *Gate) Dim() int { return 2 * g.response.N }

// field stores what arrives at the nodes in u.
func (g *Gate) field(c []float64) {
	n := g.response.N
	nodes := len(g.u) / 2
	ci := blas64.Vector{N: n, Inc: 1, Data: c[:n]}
	cq := blas64.Vector{N: n, Inc: 1, Data: c[n : 2*n]}
	ui := blas64.Vector{N: nodes, Inc: 1, Data: g.u[:nodes]}
	uq := blas64.Vector{N: nodes, Inc: 1, Data: g.u[nodes:]}
	blas64.Gemv(blas.Trans, 1, g.re, ci, 0, ui)
	blas64.Gemv(blas.Trans, 1, g.re, cq, 0, uq)
	if g.response.Im != nil {
		blas64.Gemv(blas.Trans, -1, g.im, cq, 1, ui)
		blas64.Gemv(blas.Trans, 1, g.im, ci, 1, uq)
	}
}

// miss returns the vector part of the gate error, signed so that the scalar
// part is positive, and the matrix that takes the generator δ of
// dynamics.Spin.Derive to its derivative.
func (g *Gate) miss(q dynamics.Quat) (m dynamics.Vec, k [9]float64) {
	left := g.after.Mul(q)
	right := g.before.Mul(g.spec.Target.Conj())
	e := left.Mul(right)
	sign := 1.0
	if e[0] < 0 {
		sign = -1
	}
	for i := range 3 {
		var half dynamics.Quat
		half[1+i] = sign / 2
		d := left.Mul(half).Mul(right)
		k[i], k[3+i], k[6+i] = d[1], d[2], d[3]
	}
	return dynamics.Vec{sign * e[1], sign * e[2], sign * e[3]}, k
}

// Residuals stores the residuals at c in r, as solve.Problem asks.
func (g *Gate) Residuals(c, r []float64) {
	g.field(c)
	g.nominal.Run(g.u, dynamics.Vec{}, 1)
	var m dynamics.Vec
	m, g.k[0] = g.miss(g.nominal.Gate)
	copy(r, m[:])
	at := 3
	for i := range g.combine {
		e := scaled(g.averaged(i), g.combine[i].weight)
		copy(r[at:], e[:])
		at += 3
	}
	if len(g.members) == 0 {
		return
	}
	for i, e := range g.members {
		g.finite.Run(g.u, e.offset, e.scale)
		m, g.k[1+i] = g.miss(g.finite.Gate)
		for k := range 3 {
			r[at+k] = g.weight * m[k]
		}
		at += 3
		// the derivatives by node are cheap while the steps are at hand
		g.finite.Derive(e.scale, &g.memberSlopes[i])
	}
}

// averaged returns the averaged toggled error of triple i of the last run,
// without its weight.
func (g *Gate) averaged(i int) dynamics.Vec {
	var sum dynamics.Vec
	for _, x := range g.combine[i].parts {
		t := g.nominal.Toggle[x.toggle]
		for k := range 3 {
			sum[k] += x.factor * t[k]
		}
	}
	return sum
}

// Jacobian stores the derivatives at the c of the last call of Residuals in
// jac, Rows x Dim.
func (g *Gate) Jacobian(jac []float64) {
	n, nodes := g.response.N, len(g.u)/2
	w := 2 * nodes
	nt := len(g.nominal.Toggle)
	g.nominal.Derive(1, &g.slopes)
	// an amplitude error is the controls themselves: both ways add up
	for i, direct := range g.slopes.Direct {
		row := g.slopes.Toggle[3*len(g.nominal.Held)+i]
		for k, v := range direct {
			row[k] += v
		}
	}

	rawRows := len(g.d) / w
	di := blas64.General{Rows: rawRows, Cols: nodes, Stride: w, Data: g.d}
	dq := blas64.General{Rows: rawRows, Cols: nodes, Stride: w, Data: g.d[nodes:]}
	ji := blas64.General{Rows: rawRows, Cols: n, Stride: 2 * n, Data: g.raw}
	jq := blas64.General{Rows: rawRows, Cols: n, Stride: 2 * n, Data: g.raw[n:]}
	blas64.Gemm(blas.NoTrans, blas.Trans, 1, di, g.re, 0, ji)
	blas64.Gemm(blas.NoTrans, blas.Trans, 1, dq, g.re, 0, jq)
	if g.response.Im != nil {
		blas64.Gemm(blas.NoTrans, blas.Trans, 1, dq, g.im, 1, ji)
		blas64.Gemm(blas.NoTrans, blas.Trans, -1, di, g.im, 1, jq)
	}

	g.turnRows(jac, 0, 0, g.k[0], 1)
	out := 3
	for _, e := range g.combine {
		dst := jac[out*2*n : (out+3)*2*n]
		clear(dst)
		for _, x := range e.parts {
			src := g.raw[(3+3*x.toggle)*2*n : (6+3*x.toggle)*2*n]
			f := e.weight * x.factor
			for i, v := range src {
				dst[i] += f * v
			}
		}
		out += 3
	}
	for i := range g.members {
		g.turnRows(jac, out, 3+3*nt+3*i, g.k[1+i], g.weight)
		out += 3
	}
}

// turnRows stores f k times three raw rows in three rows of jac.
func (g *Gate) turnRows(jac []float64, out, in int, k [9]float64, f float64) {
	w := 2 * g.response.N
	a, b, c := g.raw[in*w:(in+1)*w], g.raw[(in+1)*w:(in+2)*w], g.raw[(in+2)*w:(in+3)*w]
	for r := range 3 {
		dst := jac[(out+r)*w : (out+r+1)*w]
		x, y, z := f*k[3*r], f*k[3*r+1], f*k[3*r+2]
		for i := range dst {
			dst[i] = x*a[i] + y*b[i] + z*c[i]
		}
	}
}

// Figures say what a gate is worth.
type Figures struct {
	Infidelity float64 // average gate infidelity
	// Susceptibility of each held class of the Spin, in order.
	Susceptibility []float64
	Worst          []Worst // of each held class; the zero value for classes of one error
}

// Worst is the error of a class that survives most.
type Worst struct {
	Susceptibility float64
	Direction      string // "0.83 X + 0.41 Y"
}

// Figures evaluates controls u given at the grid's nodes, I then Q, share of
// full scale.
func (g *Gate) Figures(u []float64) Figures {
	copy(g.u, u) // of which amplitude errors are made
	g.nominal.Run(g.u, dynamics.Vec{}, 1)
	m, _ := g.miss(g.nominal.Gate)
	f := Figures{Infidelity: 2. / 3 * (m[0]*m[0] + m[1]*m[1] + m[2]*m[2])}
	at := 0
	// combine lists static classes before amplitude ones: walk them as NewGate did
	share := make([]float64, len(g.spec.Held))
	worst := make([]Worst, len(g.spec.Held))
	for i, c := range g.spec.Held {
		switch c.Kind {
		case Any:
			var m [9]float64
			for col := range 3 {
				t := g.averaged(at + col)
				for row := range 3 {
					m[3*row+col] = t[row]
				}
			}
			at += 3
			share[i], worst[i] = universal(m)
		case Static:
			share[i] = norm(g.averaged(at))
			at++
		}
	}
	for i, c := range g.spec.Held {
		if c.Kind == Amplitude {
			if p := g.power(u); p > 0 { // without a drive there is nothing to scale
				share[i] = norm(g.averaged(at)) * g.full * math.Sqrt(g.span/p)
			}
			at++
		}
	}
	f.Susceptibility, f.Worst = share, worst
	return f
}

// power returns ∫|u|² dt over the window in rad²/ns, both quadratures at full
// scale included.
func (g *Gate) power(u []float64) float64 {
	nodes := len(u) / 2
	sum := 0.0
	for j := g.spec.Grid.First; j < g.spec.Grid.Last; j++ {
		for node := 2 * j; node < 2*j+2; node++ {
			var v dynamics.Vec
			for i := range 3 {
				v[i] = u[node]*g.spec.Axes[0][i] + u[nodes+node]*g.spec.Axes[1][i]
			}
			sum += g.spec.Grid.Steps[j] / 2 * (v[0]*v[0] + v[1]*v[1] + v[2]*v[2])
		}
	}
	return sum
}

// universal returns ||M||_F/√3 of the averaged map and its worst direction.
func universal(m [9]float64) (float64, Worst) {
	sum := 0.0
	for _, v := range m {
		sum += v * v
	}
	var svd mat.SVD
	w := Worst{}
	if svd.Factorize(mat.NewDense(3, 3, m[:]), mat.SVDFull) {
		var v mat.Dense
		svd.VTo(&v)
		w.Susceptibility = svd.Values(nil)[0]
		w.Direction = inWords(dynamics.Vec{v.At(0, 0), v.At(1, 0), v.At(2, 0)})
	}
	return math.Sqrt(sum / 3), w
}

// Infidelity returns the average gate infidelity with a static error of field
// offset (rad/ns) and every control scaled, in the window only.
func (g *Gate) Infidelity(u []float64, offset dynamics.Vec, scale float64) float64 {
	g.finite.Run(u, offset, scale)
	m, _ := g.miss(g.finite.Gate)
	return 2. / 3 * (m[0]*m[0] + m[1]*m[1] + m[2]*m[2])
}

// MeanInfidelity returns the mean average gate infidelity over the finite errors
// of a class at its size, both signs of each.
func (g *Gate) MeanInfidelity(u []float64, c Class) float64 {
	c.OneSided = false
	list := c.ensemble()
	if len(list) == 0 {
		return 0
	}
	sum := 0.0
	for _, e := range list {
		sum += g.Infidelity(u, e.offset, e.scale)
	}
	return sum / float64(len(list))
}

// Unitary returns the gate of controls u given at the grid's nodes, in the frame
// of the undriven device.
func (g *Gate) Unitary(u []float64) dynamics.Quat {
	g.finite.Run(u, dynamics.Vec{}, 1)
	return g.after.Mul(g.finite.Gate).Mul(g.before)
}

func norm(v dynamics.Vec) float64 { return math.Sqrt(v[0]*v[0] + v[1]*v[1] + v[2]*v[2]) }
