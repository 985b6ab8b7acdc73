package robust

import (
	"math"

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
	// Times are the instants of the nodes, two a step, in ns from the start of the
	// window; wanted where terms rotate.
	Times []float64
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
	Static dynamics.Vec   // H0 = Static·σ/2, rad/ns
	Axes   []dynamics.Vec // of each control at full scale: H += share (Axes·σ)/2, rad/ns
	Shifts []dynamics.Vec // what the square of each control's share adds, rad/ns; nil for none
	// Maps of the controls from the first on, nil for a straight one: a map's value, of about 1 at most, stands
	// in the place of the share with Axes and Shifts. Errors that ride on the controls act on the share.
	Maps   []Map
	Target dynamics.Quat
	// FreeBefore and FreeAfter leave a rotation about Z on that side of the gate to
	// the playback: the residuals are those at the best angles.
	FreeBefore, FreeAfter bool
	Held                  []Class
}

// A Block is the response of the controls to a group of coefficients at the
// grid's nodes. Re and Im have a row of nodes for each of N coefficients. A block
// of one control gives u = Re c with c = c[First:First+N]; one of two quadratures
// gives u_I + i u_Q = (Re + i Im)(c_I + i c_Q) to Control and the next, c_I as
// above and c_Q the N coefficients that follow. Im is nil for a line that does not
// mix the quadratures.
type Block struct {
	First, N   int
	Control    int
	Quadrature bool
	Re, Im     []float64
}

// Response is what each coefficient gives at the nodes.
type Response struct {
	Dim    int // coefficients in all
	Blocks []Block
	// Slopes give, for a held class of kind Line, its v; nil for the others.
	Slopes [][]Block
}

// A Gate evaluates a Spin problem. It serves one goroutine; Clone makes more.
type Gate struct {
	drive
	spec   Spin
	span   float64 // window, ns
	before dynamics.Quat
	after  dynamics.Quat
	full   float64 // full-scale rate that makes residuals of borne errors dimensionless, rad/ns
	weight float64 // of the residuals of finite errors

	nominal dynamics.Spin // with every toggled error
	finite  dynamics.Spin // gate only
	combine []triple
	members []placed
	blocks  []blend // of gates, each three residuals
	rows    int

	d      []float64    // derivatives by node: raw rows x controls x nodes; the slopes lie in it
	raw    []float64    // by coefficient: raw rows x Dim
	seen   []seen       // the nominal gate, then each member
	turned [2][]float64 // derivatives of the free angles by the coefficients, before and after
	slopes dynamics.Slopes
	member []dynamics.Slopes
}

// placed is a member with the class that it comes from.
type placed struct {
	member
	class int
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

// seen is the miss of a gate at given free angles, the frame that takes the generator δ
// of dynamics to its derivative, and its derivatives by the angles, before and after.
type seen struct {
	miss   dynamics.Vec
	frame  [9]float64
	angles [2]dynamics.Vec
}

// A blend is a linear combination of the residuals of gates, by their number; the nominal gate is 0.
type blend struct {
	gates   []int
	factors []float64
}

// NewGate prepares the residuals of the problem: the gate error (3), then for
// every held class the time-averaged toggled error (3, or 9 for Any), static
// classes before those that ride on the controls; then for every class of order 2 what
// the second order leaves in each of its directions (3). With refine > 0, the gate errors
// of the classes' ensembles (3 each) follow with that weight. Gates with an error are
// seen at the free angles of the one without, as playback has them.
func NewGate(s Spin, r Response, refine float64) *Gate {
	g := &Gate{drive: newDrive(r, s.Held, len(s.Axes), s.Grid, s.Maps), spec: s, weight: refine}
	g.span = s.Grid.Window()
	g.before = dynamics.Turn(scaled(s.Static, -s.Grid.Lead))
	g.after = dynamics.Turn(scaled(s.Static, -s.Grid.Trail))
	for _, a := range s.Axes {
		g.full = math.Max(g.full, norm(a))
	}
	K := len(s.Axes)
	base := dynamics.Spin{Static: s.Static, Axes: s.Axes, Shifts: s.Shifts, Steps: s.Grid.Steps, First: s.Grid.First, Last: s.Grid.Last}
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
	for _, c := range s.Held {
		switch {
		case c.Kind == Any:
			for i := range 3 {
				g.combine = append(g.combine, triple{c.heldWeight(), []part{{i, 1 / g.span}}})
			}
		case c.Kind == Static && all:
			v := unit(c.Vector)
			g.combine = append(g.combine, triple{c.heldWeight(), []part{{0, v[0] / g.span}, {1, v[1] / g.span}, {2, v[2] / g.span}}})
		case c.Kind == Static:
			g.combine = append(g.combine, triple{c.heldWeight(), []part{{len(g.nominal.Held), 1 / g.span}}})
			g.nominal.Held = append(g.nominal.Held, unit(c.Vector))
		}
	}
	for k, i := range g.borne {
		g.combine = append(g.combine, triple{s.Held[i].heldWeight(), []part{{len(g.nominal.Held) + k, 1 / (g.span * g.full)}}})
		g.nominal.Borne = append(g.nominal.Borne, g.v[i])
	}
	for i, c := range s.Held {
		list, factors := c.spread()
		for k, m := range list {
			g.members = append(g.members, placed{m, i})
			g.blocks = append(g.blocks, blend{[]int{len(g.members)}, factors[k : k+1]})
		}
		if c.Order != 2 {
			continue
		}
		for _, way := range c.ways(g.span, g.full) {
			b := secondDifference(len(g.members)+1, c.Weight)
			for _, f := range secondPoints {
				g.members = append(g.members, placed{way(f), i})
			}
			g.blocks = append(g.blocks, b)
		}
	}
	if refine > 0 {
		for i, c := range s.Held {
			for _, m := range c.ensemble() {
				g.members = append(g.members, placed{m, i})
				g.blocks = append(g.blocks, blend{[]int{len(g.members)}, []float64{refine}})
			}
		}
	}
	g.nominal.Reset()
	g.finite.Reset()
	g.rows = 3 + 3*len(g.combine) + 3*len(g.blocks)
	g.seen = make([]seen, 1+len(g.members))
	for i := range g.turned {
		g.turned[i] = make([]float64, r.Dim)
	}

	if r.Dim == 0 { // figures alone are wanted
		return g
	}
	// Raw rows: nominal gate, toggled errors, members.
	rawRows := 3 + 3*len(g.nominal.Toggle) + 3*len(g.members)
	g.d = make([]float64, rawRows*K*g.nodes)
	g.raw = make([]float64, rawRows*r.Dim)
	row := func(i int) []float64 { return g.d[i*K*g.nodes : (i+1)*K*g.nodes] }
	gateRows := func(i int) [3][]float64 { return [3][]float64{row(i), row(i + 1), row(i + 2)} }
	g.slopes.Gate = gateRows(0)
	for i := range 3 * len(g.nominal.Toggle) {
		g.slopes.Toggle = append(g.slopes.Toggle, row(3+i))
	}
	if len(g.borne) > 0 {
		direct := make([]float64, 3*len(g.borne)*K*g.nodes)
		for i := range 3 * len(g.borne) {
			g.slopes.Direct = append(g.slopes.Direct, direct[i*K*g.nodes:(i+1)*K*g.nodes])
		}
	}
	for i := range g.members {
		g.member = append(g.member, dynamics.Slopes{Gate: gateRows(g.memberRow(i))})
	}
	return g
}

// memberRow is the first raw row of a member.
func (g *Gate) memberRow(i int) int { return 3 + 3*len(g.nominal.Toggle) + 3*i }

// Clone returns a Gate with working memory of its own.
func (g *Gate) Clone() *Gate { return NewGate(g.spec, g.response, g.weight) }

// Rows returns the number of residuals, Dim the number of coefficients.
func (g *Gate) Rows() int { return g.rows }

// Dim returns the number of coefficients.
func (g *Gate) Dim() int { return g.response.Dim }

// see looks at a gate q at free angles: the vector part of the gate error, signed so
// that the scalar part is positive, and its derivatives.
func (g *Gate) see(q dynamics.Quat, before, after float64) (s seen) {
	left, right := g.after.Mul(q), g.before
	if g.free() {
		left = dynamics.Turn(dynamics.Vec{0, 0, after}).Mul(left)
		right = right.Mul(dynamics.Turn(dynamics.Vec{0, 0, before}))
	}
	right = right.Mul(g.spec.Target.Conj())
	e := left.Mul(right)
	sign := 1.0
	if e[0] < 0 {
		sign = -1
	}
	for i := range 3 {
		var half dynamics.Quat
		half[1+i] = sign / 2
		d := left.Mul(half).Mul(right)
		s.frame[i], s.frame[3+i], s.frame[6+i] = d[1], d[2], d[3]
	}
	s.miss = dynamics.Vec{sign * e[1], sign * e[2], sign * e[3]}
	z := dynamics.Quat{0, 0, 0, sign / 2}
	if g.spec.FreeBefore {
		d := e.Mul(g.spec.Target).Mul(z).Mul(g.spec.Target.Conj())
		s.angles[0] = dynamics.Vec{d[1], d[2], d[3]}
	}
	if g.spec.FreeAfter {
		d := z.Mul(e)
		s.angles[1] = dynamics.Vec{d[1], d[2], d[3]}
	}
	return s
}

func (g *Gate) free() bool { return g.spec.FreeBefore || g.spec.FreeAfter }

// best returns the best free angles of a gate.
func (g *Gate) best(q dynamics.Quat) (before, after float64) {
	if !g.free() {
		return 0, 0
	}
	return g.angles(g.after.Mul(q).Mul(g.before))
}

// overlaps returns the coefficients of the overlap of x with the target: with x = (w, x,
// y, z), a turn by α after and β before rotates (w, z) by (α+β)/2 and (x, y) by (α-β)/2,
// and the overlap is A cos s + B sin s + C cos d + D sin d, s = (α+β)/2, d = (α-β)/2.
func (g *Gate) overlaps(x dynamics.Quat) (A, B, C, D float64) {
	t := g.spec.Target
	return x[0]*t[0] + x[3]*t[3], x[0]*t[3] - x[3]*t[0], x[1]*t[1] + x[2]*t[2], x[1]*t[2] - x[2]*t[1]
}

// angles returns the rotations about Z, before and after, that bring x closest
// to the target: closed forms for either side alone and for both.
func (g *Gate) angles(x dynamics.Quat) (before, after float64) {
	A, B, C, D := g.overlaps(x)
	switch {
	case g.spec.FreeBefore && g.spec.FreeAfter:
		s, d := math.Atan2(B, A), math.Atan2(D, C)
		return s - d, s + d
	case g.spec.FreeAfter: // s = d = α/2
		return 0, 2 * math.Atan2(B+D, A+C)
	}
	return 2 * math.Atan2(B-D, A+C), 0 // s = -d = β/2
}

// bends returns how the best angles of a gate q follow its generator δ: the whole of the
// variable projection of Golub and Pereyra 1973, SIAM J. Numer. Anal. 10, 413.
func (g *Gate) bends(q dynamics.Quat) (before, after dynamics.Vec) {
	left, right := g.after.Mul(q), g.before
	A, B, C, D := g.overlaps(left.Mul(right))
	atan := func(y, x, dy, dx float64) float64 {
		if r := x*x + y*y; r > 1e-24 {
			return (x*dy - y*dx) / r
		}
		return 0 // the angle does nothing here
	}
	for i := range 3 {
		var half dynamics.Quat
		half[1+i] = 0.5
		a, b, c, d := g.overlaps(left.Mul(half).Mul(right))
		switch {
		case g.spec.FreeBefore && g.spec.FreeAfter:
			s, t := atan(B, A, b, a), atan(D, C, d, c)
			before[i], after[i] = s-t, s+t
		case g.spec.FreeAfter:
			after[i] = 2 * atan(B+D, A+C, b+d, a+c)
		default:
			before[i] = 2 * atan(B-D, A+C, b-d, a+c)
		}
	}
	return before, after
}

// Residuals stores the residuals at c in r, as solve.Problem asks.
func (g *Gate) Residuals(c, r []float64) {
	g.controls(c)
	g.nominal.Run(g.u, dynamics.Vec{})
	before, after := g.best(g.nominal.Gate)
	g.seen[0] = g.see(g.nominal.Gate, before, after)
	copy(r, g.seen[0].miss[:])
	at := 3
	for i := range g.combine {
		e := scaled(g.averaged(i), g.combine[i].weight)
		copy(r[at:], e[:])
		at += 3
	}
	for i, e := range g.members {
		u, slope := g.u, g.slope
		if e.scale != 1 || e.lambda != 0 {
			g.err(e.member, g.added(e.class))
			u, slope = g.moved, g.movedSlope
		}
		g.finite.Run(u, e.offset)
		g.seen[1+i] = g.see(g.finite.Gate, before, after)
		// the derivatives by node are cheap while the steps are at hand
		g.finite.Derive(u, &g.member[i])
		for _, d := range g.member[i].Gate {
			g.multiply(slope, d)
		}
	}
	for _, b := range g.blocks {
		clear(r[at : at+3])
		for i, gate := range b.gates {
			for k := range 3 {
				r[at+k] += b.factors[i] * g.seen[gate].miss[k]
			}
		}
		at += 3
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
// jac, Rows x Dim. It may be called once for each call of Residuals.
func (g *Gate) Jacobian(jac []float64) {
	n := g.response.Dim
	w := len(g.spec.Axes) * g.nodes
	nt, nh := len(g.nominal.Toggle), len(g.nominal.Held)
	first, last := g.first, g.last
	clear(g.raw)
	g.nominal.Derive(g.u, &g.slopes)
	for i := range 3 + 3*nt {
		g.multiply(g.slope, g.d[i*w:(i+1)*w])
	}
	// What an error that rides on the controls gains by itself, beside what the
	// frame gives it: by the controls where it is made of them, else by its own line.
	for i, class := range g.borne {
		c := &g.spec.Held[class]
		row := 3 + 3*(nh+i)
		for k := range 3 {
			direct, toggle := g.slopes.Direct[3*i+k], g.slopes.Toggle[3*(nh+i)+k]
			if g.mapped != nil {
				g.unmap(direct, toggle, g.w[class])
			}
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
			g.contract(g.response.Slopes[class], 1, g.slopes.Direct[3*i][:3*w:3*w], 3, first, last, g.raw[row*n:])
		}
	}
	// The same for the members: their controls were u + λ v.
	for i, e := range g.members {
		c, row := &g.spec.Held[e.class], g.memberRow(i)
		switch {
		case e.scale != 1:
			for k := range 3 {
				for a := range g.spec.Axes {
					part := g.member[i].Gate[k][a*g.nodes+first : a*g.nodes+last]
					for j := range part {
						part[j] *= e.scale
					}
				}
			}
		case e.lambda != 0 && c.Kind == Line:
			g.contract(g.response.Slopes[e.class], e.lambda, g.d[row*w:], 3, first, last, g.raw[row*n:])
		case e.lambda != 0:
			for k := range 3 {
				d := g.member[i].Gate[k]
				copy(g.moved, d)
				g.unmix(c.Mix, e.lambda, g.moved, d, first, last)
			}
		}
	}
	g.contract(g.response.Blocks, 1, g.d, len(g.d)/w, 0, g.nodes, g.raw)

	if g.free() {
		before, after := g.bends(g.nominal.Gate)
		for side, v := range [2]dynamics.Vec{before, after} {
			for i := range g.turned[side] {
				g.turned[side][i] = v[0]*g.raw[i] + v[1]*g.raw[n+i] + v[2]*g.raw[2*n+i]
			}
		}
	}
	clear(jac[:3*n])
	g.turnRows(jac, 0, 0, &g.seen[0], 1)
	out := 3
	for _, e := range g.combine {
		dst := jac[out*n : (out+3)*n]
		clear(dst)
		for _, x := range e.parts {
			src := g.raw[(3+3*x.toggle)*n : (6+3*x.toggle)*n]
			f := e.weight * x.factor
			for i, v := range src {
				dst[i] += f * v
			}
		}
		out += 3
	}
	for _, b := range g.blocks {
		clear(jac[out*n : (out+3)*n])
		for i, gate := range b.gates {
			row := 0
			if gate > 0 {
				row = 3 + 3*nt + 3*(gate-1)
			}
			g.turnRows(jac, out, row, &g.seen[gate], b.factors[i])
		}
		out += 3
	}
}

// turnRows adds f times the derivatives of a gate, of which the raw rows are given, to three rows of jac.
func (g *Gate) turnRows(jac []float64, out, in int, s *seen, f float64) {
	w, k := g.response.Dim, &s.frame
	a, b, c := g.raw[in*w:(in+1)*w], g.raw[(in+1)*w:(in+2)*w], g.raw[(in+2)*w:(in+3)*w]
	for r := range 3 {
		dst := jac[(out+r)*w : (out+r+1)*w]
		x, y, z := f*k[3*r], f*k[3*r+1], f*k[3*r+2]
		for i := range dst {
			dst[i] += x*a[i] + y*b[i] + z*c[i]
		}
		for side, v := range s.angles {
			if p := f * v[r]; p != 0 {
				for i, t := range g.turned[side] {
					dst[i] += p * t
				}
			}
		}
	}
}

func norm(v dynamics.Vec) float64 { return math.Sqrt(v[0]*v[0] + v[1]*v[1] + v[2]*v[2]) }
