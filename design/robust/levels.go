package robust

import (
	"fmt"
	"math"
	"math/cmplx"

	"holdfast/design/dynamics"
)

// Levels is the problem of one driven system of Dim levels whose first Code levels
// are the code space. Static must be diagonal. Matrices are row by row.
type Levels struct {
	Grid   Grid
	Dim    int
	Code   int
	Static []complex128   // rad/ns
	Axes   [][]complex128 // of each control at full scale, rad/ns
	Target []complex128   // on the code space
	Held   []Class        // kind Static by its Operator; kind Any is not known here
}

// A LevelsGate evaluates a Levels problem, as Gate does a Spin. Its residuals are
//
//	( phase W'M - 1 )/√c       M the block of U on the c code levels, phase that of the trace
//	( rows of U that leave the code space )/√c
//
// of which the sum of squares is 1 - F_pro plus the leakage to first order, then for
// every held class the averaged toggled error cut to the code space, traceless there,
// relative to the error cut likewise. What an error adds to the leakage is of second
// order in it and has no residual of its own; the finite errors see it.
type LevelsGate struct {
	drive
	spec    Levels
	span    float64
	full    float64 // ||axis|| on the code space, of the strongest control
	weight  float64
	nominal dynamics.Levels
	finite  dynamics.Levels
	before  []complex128 // free evolution that is taken out, diagonals
	after   []complex128
	toggles []toggledClass
	members []placed
	rows    int

	d, raw []float64 // raw rows: d² of the nominal generator, d² of each toggled error, d² of each member
	slopes dynamics.LevelsSlopes
	member []dynamics.LevelsSlopes
	lever  [][]float64 // of the nominal gate, then of each member: gate rows x d²
	x      []complex128
}

// toggledClass says which toggled error of nominal belongs to which class, and the
// factor that makes its residuals relative.
type toggledClass struct {
	class, toggle int
	factor        float64
}

// NewLevelsGate prepares the residuals. The error says what the problem asks for that
// this kernel does not know.
func NewLevelsGate(s Levels, r Response, refine float64) (*LevelsGate, error) {
	d := s.Dim
	g := &LevelsGate{drive: newDrive(r, s.Held, len(s.Axes), s.Grid), spec: s, weight: refine, span: s.Grid.Window()}
	base := dynamics.Levels{Dim: d, Static: s.Static, Axes: s.Axes, Steps: s.Grid.Steps, First: s.Grid.First, Last: s.Grid.Last, Within: 1e-11}
	g.nominal, g.finite = base, base
	g.before, g.after = make([]complex128, d), make([]complex128, d)
	for i := range d {
		e := real(s.Static[i*d+i])
		g.before[i], g.after[i] = cmplx.Rect(1, e*s.Grid.Lead), cmplx.Rect(1, e*s.Grid.Trail)
	}
	for _, a := range s.Axes {
		g.full = math.Max(g.full, math.Sqrt(g.cut(a)))
	}
	for i, class := range s.Held {
		switch class.Kind {
		case Static:
			size := math.Sqrt(g.cut(class.Operator))
			if !(size > 0) {
				return nil, fmt.Errorf("error %q: does nothing on the code space", class.Name)
			}
			g.toggles = append(g.toggles, toggledClass{i, len(g.nominal.Held), 1 / (g.span * size)})
			g.nominal.Held = append(g.nominal.Held, class.Operator)
		case Any:
			return nil, fmt.Errorf("error %q: any = \"all\" is known for one spin; with more than two levels name the errors", class.Name)
		}
	}
	for k, i := range g.borne {
		g.toggles = append(g.toggles, toggledClass{i, len(g.nominal.Held) + k, 1 / (g.span * g.full)})
		g.nominal.Borne = append(g.nominal.Borne, g.v[i])
	}
	if refine > 0 {
		for i, class := range s.Held {
			for _, m := range class.ensemble() {
				g.members = append(g.members, placed{m, i})
			}
		}
	}
	if err := g.nominal.Reset(); err != nil {
		return nil, err
	}
	if err := g.finite.Reset(); err != nil {
		return nil, err
	}
	g.x = make([]complex128, d*d)
	g.rows = g.gateRows() + len(g.toggles)*g.errorRows() + len(g.members)*g.gateRows()
	g.lever = make([][]float64, 1+len(g.members))
	for i := range g.lever {
		g.lever[i] = make([]float64, g.gateRows()*d*d)
	}
	if r.Dim == 0 {
		return g, nil
	}
	w, dd := g.count*g.nodes, d*d
	rawRows := dd * (1 + len(g.toggles) + len(g.members))
	g.d, g.raw = make([]float64, rawRows*w), make([]float64, rawRows*r.Dim)
	rows := func(from, n int) (list [][]float64) {
		for i := range n {
			list = append(list, g.d[(from+i)*w:(from+i+1)*w])
		}
		return list
	}
	g.slopes.Gate = rows(0, dd)
	if len(g.toggles) > 0 {
		g.slopes.Toggle = rows(dd, dd*len(g.toggles))
	}
	if n := len(g.borne); n > 0 {
		direct := make([]float64, dd*n*w)
		for i := range dd * n {
			g.slopes.Direct = append(g.slopes.Direct, direct[i*w:(i+1)*w])
		}
	}
	for i := range g.members {
		g.member = append(g.member, dynamics.LevelsSlopes{Gate: rows(g.memberRow(i), dd)})
	}
	return g, nil
}

// gateRows counts the residuals of one gate, errorRows those of one toggled error.
func (g *LevelsGate) gateRows() int  { return 2 * g.spec.Code * g.spec.Dim }
func (g *LevelsGate) errorRows() int { return g.spec.Code*g.spec.Code - 1 }

func (g *LevelsGate) memberRow(i int) int {
	return g.spec.Dim * g.spec.Dim * (1 + len(g.toggles) + i)
}

// cut returns the square of the Frobenius norm of a matrix cut to the code space,
// traceless there.
func (g *LevelsGate) cut(a []complex128) float64 {
	d, c := g.spec.Dim, g.spec.Code
	sum, trace := 0.0, complex128(0)
	for i := range c {
		trace += a[i*d+i]
		for j := range c {
			sum += real(a[i*d+j])*real(a[i*d+j]) + imag(a[i*d+j])*imag(a[i*d+j])
		}
	}
	return sum - (real(trace)*real(trace)+imag(trace)*imag(trace))/float64(c)
}

// Rows returns the number of residuals, Dim the number of coefficients.
func (g *LevelsGate) Rows() int { return g.rows }

// Dim returns the number of coefficients.
func (g *LevelsGate) Dim() int { return g.response.Dim }

// miss stores the residuals of a gate in r and, unless lever is nil, the matrix that
// takes the coordinates of the generator δ, U -> U exp(-iδ), to their derivatives.
func (g *LevelsGate) miss(u []complex128, r, lever []float64) {
	d, c := g.spec.Dim, g.spec.Code
	x := g.x
	for i := range d {
		for j := range d {
			x[i*d+j] = g.after[i] * u[i*d+j] * g.before[j]
		}
	}
	trace := complex128(0)
	w := g.spec.Target
	for i := range c {
		for j := range c {
			trace += cmplx.Conj(w[i*c+j]) * x[i*d+j]
		}
	}
	size := cmplx.Abs(trace)
	phase := complex128(1)
	if size > 0 {
		phase = cmplx.Conj(trace) / complex(size, 0)
	}
	f := 1 / math.Sqrt(float64(c))
	at := 0
	put := func(v complex128) {
		r[at], r[at+1] = f*real(v), f*imag(v)
		at += 2
	}
	for i := range c {
		for j := range c {
			v := complex128(0)
			for k := range c {
				v += cmplx.Conj(w[k*c+i]) * x[k*d+j]
			}
			if v *= phase; i == j {
				v--
			}
			put(v)
		}
	}
	for i := c; i < d; i++ {
		for j := range c {
			put(x[i*d+j])
		}
	}
	if lever == nil {
		return
	}
	// by each coordinate of δ: dX = -i after U δ before = -i X δ', δ' = before' δ before
	e := make([]complex128, d*d)
	coord := make([]float64, d*d)
	dx := make([]complex128, d*d)
	for col := range d * d {
		clear(coord)
		coord[col] = 1
		dynamics.FromCoordinates(e, coord, d)
		for i := range d {
			for j := range d {
				v := complex128(0)
				for k := range d {
					v += x[i*d+k] * cmplx.Conj(g.before[k]) * e[k*d+j] * g.before[j]
				}
				dx[i*d+j] = -1i * v
			}
		}
		dt := complex128(0)
		for i := range c {
			for j := range c {
				dt += cmplx.Conj(w[i*c+j]) * dx[i*d+j]
			}
		}
		turn := complex128(0) // the phase follows the trace
		if size > 0 {
			turn = complex(0, -imag(dt/trace))
		}
		row := 0
		set := func(v complex128) {
			lever[row*d*d+col], lever[(row+1)*d*d+col] = f*real(v), f*imag(v)
			row += 2
		}
		for i := range c {
			for j := range c {
				v := complex128(0)
				for k := range c {
					v += cmplx.Conj(w[k*c+i]) * (dx[k*d+j] + turn*x[k*d+j])
				}
				set(phase * v)
			}
		}
		for i := c; i < d; i++ {
			for j := range c {
				set(dx[i*d+j])
			}
		}
	}
}

// pick lists, for the residuals of a toggled error, which coordinates they are made
// of: those of the code space's block without its trace.
func (g *LevelsGate) pick(visit func(row int, coordinate int, factor float64)) {
	d, c := g.spec.Dim, g.spec.Code
	row := 0
	for k := 1; k < c; k++ { // an orthonormal basis of traceless diagonals
		n := math.Sqrt(float64(k * (k + 1)))
		for i := range k {
			visit(row, dynamics.Coordinate(i, i, d), 1/n)
		}
		visit(row, dynamics.Coordinate(k, k, d), -float64(k)/n)
		row++
	}
	for i := range c {
		for j := i + 1; j < c; j++ {
			at := dynamics.Coordinate(i, j, d)
			visit(row, at, 1)
			visit(row+1, at+1, 1)
			row += 2
		}
	}
}

// Residuals stores the residuals at c in r, as solve.Problem asks.
func (g *LevelsGate) Residuals(c, r []float64) {
	g.controls(c)
	g.nominal.Run(g.u, nil)
	g.miss(g.nominal.Gate, r, g.lever[0])
	at := g.gateRows()
	d := g.spec.Dim
	coord := make([]float64, d*d)
	for _, t := range g.toggles {
		dynamics.Coordinates(coord, g.nominal.Toggle[t.toggle], d)
		out := r[at : at+g.errorRows()]
		clear(out)
		f := t.factor * g.held[t.class].Weight
		g.pick(func(row, k int, factor float64) { out[row] += f * factor * coord[k] })
		at += g.errorRows()
	}
	for i, e := range g.members {
		u := g.u
		if e.scale != 1 || e.lambda != 0 {
			g.err(e.member, g.v[e.class])
			u = g.moved
		}
		g.finite.Run(u, g.offset(e))
		out := r[at : at+g.gateRows()]
		g.miss(g.finite.Gate, out, g.lever[1+i])
		for k := range out {
			out[k] *= g.weight
		}
		at += g.gateRows()
		g.finite.Derive(u, &g.member[i])
	}
}

// offset is what a finite static error adds to H; its field is the length of the
// member's, along the class's operator.
func (g *LevelsGate) offset(e placed) []complex128 {
	size := norm(e.offset)
	if size == 0 {
		return nil
	}
	if e.offset[2] < 0 {
		size = -size
	}
	op := g.held[e.class].Operator
	f := size / math.Sqrt(2*g.cut(op)) // a field F is F Z/2, of norm F/√2, on a spin
	m := make([]complex128, len(op))
	for i, v := range op {
		m[i] = complex(f, 0) * v
	}
	return m
}

// Jacobian stores the derivatives at the c of the last call of Residuals in jac. It
// may be called once for each call of Residuals.
func (g *LevelsGate) Jacobian(jac []float64) {
	n, dd := g.response.Dim, g.spec.Dim*g.spec.Dim
	w := g.count * g.nodes
	nh := len(g.nominal.Held)
	clear(g.raw)
	g.nominal.Derive(g.u, &g.slopes)
	for i, class := range g.borne {
		c := &g.held[class]
		row := dd * (1 + nh + i)
		for k := range dd {
			direct, toggle := g.slopes.Direct[dd*i+k], g.slopes.Toggle[dd*(nh+i)+k]
			switch c.Kind {
			case Amplitude:
				for j, v := range direct {
					toggle[j] += v
				}
			case Mixed:
				g.unmix(c.Mix, 1, direct, toggle, 0, g.nodes)
			}
		}
		if c.Kind == Line {
			g.contract(g.response.Slopes[class], 1, g.slopes.Direct[dd*i][:dd*w:dd*w], dd, g.first, g.last, g.raw[row*n:])
		}
	}
	for i, e := range g.members {
		c, row := &g.held[e.class], g.memberRow(i)
		switch {
		case e.scale != 1:
			for k := range dd {
				for a := range g.count {
					part := g.member[i].Gate[k][a*g.nodes+g.first : a*g.nodes+g.last]
					for j := range part {
						part[j] *= e.scale
					}
				}
			}
		case e.lambda != 0 && c.Kind == Line:
			g.contract(g.response.Slopes[e.class], e.lambda, g.d[row*w:], dd, g.first, g.last, g.raw[row*n:])
		case e.lambda != 0:
			for k := range dd {
				d := g.member[i].Gate[k]
				copy(g.moved, d)
				g.unmix(c.Mix, e.lambda, g.moved, d, g.first, g.last)
			}
		}
	}
	g.contract(g.response.Blocks, 1, g.d, len(g.d)/w, 0, g.nodes, g.raw)

	clear(jac[:g.rows*n])
	add := func(row, raw int, f float64) {
		dst, src := jac[row*n:(row+1)*n], g.raw[raw*n:(raw+1)*n]
		for i, v := range src {
			dst[i] += f * v
		}
	}
	gate := func(out, raw int, lever []float64, f float64) {
		for row := range g.gateRows() {
			for k := range dd {
				if v := lever[row*dd+k]; v != 0 {
					add(out+row, raw+k, f*v)
				}
			}
		}
	}
	gate(0, 0, g.lever[0], 1)
	out := g.gateRows()
	for _, t := range g.toggles {
		f := t.factor * g.held[t.class].Weight
		g.pick(func(row, k int, factor float64) { add(out+row, dd*(1+t.toggle)+k, f*factor) })
		out += g.errorRows()
	}
	for i := range g.members {
		gate(out, g.memberRow(i), g.lever[1+i], g.weight)
		out += g.gateRows()
	}
}

// losses returns the average gate infidelity and the leakage of a gate: with E and L
// the two parts of the residuals, |Tr W'M|/c = 1 - (|E|² + |L|²)/2, in which nothing
// cancels.
func (g *LevelsGate) losses(u []complex128) (infidelity, leakage float64) {
	c := g.spec.Code
	r := make([]float64, g.gateRows())
	g.miss(u, r, nil)
	inside := 0.0
	for _, v := range r[:2*c*c] {
		inside += v * v
	}
	for _, v := range r[2*c*c:] {
		leakage += v * v
	}
	x := (inside + leakage) / 2
	process := 2*x - x*x
	return (process*float64(c) + leakage) / float64(c+1), leakage
}

// Figures evaluates controls u and the v of classes of kind Line.
func (g *LevelsGate) Figures(u []float64, v [][]float64) Figures {
	g.load(u, v)
	g.nominal.Run(g.u, nil)
	var f Figures
	f.Infidelity, f.Leakage = g.losses(g.nominal.Gate)
	f.Susceptibility, f.Worst = make([]float64, len(g.held)), make([]Worst, len(g.held))
	for _, t := range g.toggles {
		a := math.Sqrt(g.cut(g.nominal.Toggle[t.toggle]))
		if g.held[t.class].Kind == Static {
			f.Susceptibility[t.class] = a * t.factor
		} else if p := g.power(g.v[t.class]); p > 0 {
			f.Susceptibility[t.class] = a / math.Sqrt(g.span*p)
		}
	}
	return f
}

// power returns ∫ ||V||² dt over the window, cut to the code space, of the error that
// rides on the controls as v.
func (g *LevelsGate) power(v []float64) float64 {
	dd := g.spec.Dim * g.spec.Dim
	m := make([]complex128, dd)
	sum := 0.0
	for j := g.spec.Grid.First; j < g.spec.Grid.Last; j++ {
		for node := 2 * j; node < 2*j+2; node++ {
			clear(m)
			for k, e := range g.spec.Axes {
				f := complex(v[k*g.nodes+node], 0)
				for i, x := range e {
					m[i] += f * x
				}
			}
			sum += g.spec.Grid.Steps[j] / 2 * g.cut(m)
		}
	}
	return sum
}

// MeanInfidelity is that of Gate.
func (g *LevelsGate) MeanInfidelity(u []float64, v [][]float64, class int) float64 {
	g.load(u, v)
	list := g.held[class].ensemble()
	if len(list) == 0 {
		return 0
	}
	sum := 0.0
	for _, e := range list {
		g.err(e, g.v[class])
		g.finite.Run(g.moved, g.offset(placed{e, class}))
		loss, _ := g.losses(g.finite.Gate)
		sum += loss
	}
	return sum / float64(len(list))
}
