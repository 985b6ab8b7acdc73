package replay

import (
	"context"
	"math"
	"math/cmplx"
	"runtime"
	"slices"
	"sync"
)

// A part says which real function of time a control is.
type part int

const (
	inPhase part = iota // u_I of a channel, rad/ns
	quadrature
	squareI // u_I^2 of a channel with a drive-induced shift, u in shares of full scale
	squareQ
	cross // u_I u_Q
	// Of a path of frequency w, with t from the window's start; rad/ns:
	cosI // u_I cos(wt)
	sinI // u_I sin(wt)
	cosQ
	sinQ
	// Of what turns by itself:
	cosTerm // cos(wt)
	sinTerm // sin(wt), of the control after
	// Of an error of kind line, with v what arrives through the slope of its channel's line:
	slopeI // v_I, rad/ns
	slopeQ
	beat   // u_I v_I + u_Q v_Q, in shares
	slopes // |v|^2
)

// A control is one real function of time times one operator, H += f(t) op. Errors may change the operator, and some controls are there
// for errors only and have none without.
type control struct {
	channel   int // -1 of what turns by itself
	part      part
	op        []complex128 // traceless
	norm      float64      // bound of its largest eigenvalue; of a path's that of any of its operators
	elements  sparse
	frequency float64 // of a path or of what turns by itself, rad/ns
	slope     bool    // of a path: not of u but of what arrives through the slope of its channel's line
}

func newControl(channel int, p part, op []complex128, n int) control {
	return control{channel: channel, part: p, op: op, norm: operatorNorm(op, n), elements: sparsely(op, n)}
}

// A drive is one channel made ready.
type drive struct {
	fullScale float64 // rad/ns
	samples   []complex128
	turned    bool // follows a turn of the frame: the quadrature channels do
	ops       [2]int
	// The controls of the channel: u_I and u_Q, then the squares and the product where there is a shift; -1 where there is none.
	squares [3]int
	shift   []complex128 // of |u|^2, rad/ns, traceless; nil without shift
	norm    float64      // of shift
	paths   [][4]int     // the controls of each path: cosI, sinI, cosQ, sinQ; -1 where there is none
	bent    float64      // bound of the norm of what an error of crosstalk of this channel drives by u_I = u_Q = 1; 0 without one
}

// An engine is a model made ready: lines walked through once, what comes before and after the window integrated.
// Its methods may be called from one goroutine only; they use more of their own, with results that do not depend on how many.
type engine struct {
	m          *Model
	dim        int
	farthest   float64 // MHz: how far margins of static errors are searched
	start      float64 // of the window, ns
	span       float64 // ns
	tolerance  float64 // of plans that are not rough
	still      float64 // rad to come when a gate counts as settled
	drives     []drive
	controls   []control
	axes       []axis // the controls' operators when there are two levels
	static     []complex128
	staticNorm float64
	elements   sparse       // of static
	target     []complex128 // of a gate, on the code space, the rotations of a gate up to local ones taken out
	before     []complex128 // free Z phases on the code space; nil when all are 1
	after      []complex128
	from, to   []complex128 // of a target of states: as many columns on the code space as states
	states     int          // 0 of a gate
	outside    []int        // states that are not in the code space

	plans, rough plans // the second of roughTolerance

	pre, post []complex128 // Dim x Dim: settled = post window pre
	left      float64      // rad still to come when the integration stopped

	// Classes of errors are judged by what becomes of some first states, the columns of basis: those of the code space, or of a target
	// of states the first ones where that is all that is asked for. entry is where they are when the window starts.
	columns      int
	basis, entry []complex128 // Dim x columns
	reduced      bool         // they are the target's

	labours []*labour // scratch, one for each goroutine
}

// plans are those of the window, one for each of reaches, each made when it is first needed.
type plans [len(reaches)]*plan

// takeControls makes the channels' samples and every control ready.
func (e *engine) takeControls() {
	n := e.dim
	traceless := func(op []complex128) []complex128 {
		op = append([]complex128(nil), op...)
		dropTrace(op, n)
		return op
	}
	for c := range e.m.Channels {
		ch := &e.m.Channels[c]
		d := drive{fullScale: ch.FullScale, samples: ch.Samples, turned: ch.Kind == "quadrature", ops: [2]int{-1, -1}, squares: [3]int{-1, -1, -1}}
		if ch.Compression != nil {
			d.samples = make([]complex128, len(ch.Samples))
			for k, x := range ch.Samples {
				d.samples[k] = ch.Compressed(x)
			}
		}
		for q, op := range ch.Operators {
			d.ops[q] = len(e.controls)
			e.controls = append(e.controls, newControl(c, inPhase+part(q), traceless(op), n))
		}
		for i := range e.m.Errors {
			if x := &e.m.Errors[i]; x.Kind == "crosstalk" && x.Channels[0] == ch.Name {
				sum := 0.0
				for _, op := range x.Operators {
					sum += operatorNorm(traceless(op), n)
				}
				d.bent = math.Max(d.bent, sum)
			}
		}
		e.drives = append(e.drives, d)
	}
	for c := range e.drives {
		d, ch := &e.drives[c], &e.m.Channels[c]
		if ch.Shift == 0 {
			continue
		}
		d.shift = traceless(ch.ShiftOperator)
		for i := range d.shift {
			d.shift[i] *= complex(ch.Shift, 0)
		}
		d.norm = operatorNorm(d.shift, n)
		ops := [][]complex128{d.shift}
		if d.ops[1] >= 0 {
			ops = [][]complex128{d.shift, d.shift, make([]complex128, n*n)}
		}
		for i, op := range ops {
			d.squares[i] = len(e.controls)
			e.controls = append(e.controls, newControl(c, squareI+part(i), op, n))
		}
	}
	for c := range e.drives {
		d, ch := &e.drives[c], &e.m.Channels[c]
		for _, p := range ch.Paths {
			var ops [2][]complex128
			for q, op := range p.Operators {
				ops[q] = traceless(op)
			}
			at := [4]int{-1, -1, -1, -1}
			for i, op := range turnedOps(ops, d.ops[1] >= 0) {
				if op != nil {
					at[i] = len(e.controls)
					e.controls = append(e.controls, e.newTurned(c, cosI+part(i), op, p.Frequency, ops))
				}
			}
			d.paths = append(d.paths, at)
		}
	}
	for _, r := range e.m.Rotating {
		for i, op := range [][]complex128{r.Cosine, r.Sine} {
			c := newControl(-1, cosTerm+part(i), traceless(op), n)
			c.frequency = r.Frequency
			e.controls = append(e.controls, c)
		}
	}
	if n == 2 {
		for _, c := range e.controls {
			e.axes = append(e.axes, axisOf(c.op))
		}
	}
}

// turnedOps gives what the four controls of a path drive, cosI, sinI, cosQ and sinQ, nil where there is none: with O the path's operators, of which the second may
// be nil,
//
//	Re(u e^(-iwt)) O_0 + Im(u e^(-iwt)) O_1 = (u_I cos wt + u_Q sin wt) O_0 + (u_Q cos wt - u_I sin wt) O_1
func turnedOps(ops [2][]complex128, both bool) [4][]complex128 {
	var list [4][]complex128
	list[0] = ops[0]
	if ops[1] != nil {
		list[1] = scaled(ops[1], -1)
	}
	if both {
		list[2], list[3] = ops[1], ops[0]
	}
	return list
}

// newTurned makes a control of a path of which the operators are ops.
func (e *engine) newTurned(channel int, p part, op []complex128, frequency float64, ops [2][]complex128) control {
	c := newControl(channel, p, op, e.dim)
	c.frequency = frequency
	for _, o := range ops {
		if o != nil {
			c.norm = math.Max(c.norm, operatorNorm(o, e.dim))
		}
	}
	return c
}

// newEngine walks the pulse once and integrates what surrounds the window.
func newEngine(ctx context.Context, m *Model) (*engine, error) {
	return newEngineTo(ctx, m, stepTolerance, settledAngle)
}

// newEngineTo does so to a tolerance of the norm of U, per step, until an angle in rad is still to come.
func newEngineTo(ctx context.Context, m *Model, tolerance, still float64) (*engine, error) {
	n := m.Dim
	e := &engine{m: m, dim: n, farthest: m.farthest(nil), start: m.WindowStart, span: m.Span(), tolerance: tolerance, still: still}
	e.static = append([]complex128(nil), m.Static...)
	dropTrace(e.static, n)
	e.staticNorm, e.elements = operatorNorm(e.static, n), sparsely(e.static, n)
	e.takeControls()
	e.takeTarget()
	for range min(runtime.GOMAXPROCS(0), maxLabours) {
		e.labours = append(e.labours, newLabour(e))
	}

	w := e.newWalker(nil, 1)
	lead := w.newPlan()
	if err := w.to(ctx, e.start, reach{}, lead); err != nil {
		return nil, err
	}
	window := w.newPlan()
	if err := w.to(ctx, e.start+e.span, reaches[0], window); err != nil {
		return nil, err
	}
	e.plans[0] = window
	l := e.labours[0]
	// pre = U(start <- t0) U0(start - t0)'
	u, u0 := make([]complex128, n*n), make([]complex128, n*n)
	l.integrate(lead, nil, 0, u)
	l.undriven(lead, u0)
	e.pre = make([]complex128, n*n)
	mulAdjointRight(e.pre, u, u0, n)
	var err error
	if e.post, e.left, err = e.settled(ctx, w); err != nil {
		return nil, err
	}
	e.entry = e.basis
	if m.Ends != "window" {
		e.entry = make([]complex128, n*e.columns)
		multiply(e.entry, e.pre, e.basis, n, n, e.columns)
	}
	return e, nil
}

// takeTarget makes ready what gates are compared with, and the first states that they are judged by.
func (e *engine) takeTarget() {
	m, n := e.m, e.dim
	for a := range n {
		if !slices.Contains(m.CodeSpace, a) {
			e.outside = append(e.outside, a)
		}
	}
	d := len(m.CodeSpace)
	if e.states = len(m.From); e.states > 0 {
		k := e.states
		list := [2][]complex128{}
		for i, vectors := range [][][]complex128{m.From, m.To} {
			list[i] = make([]complex128, d*k)
			for j, v := range vectors {
				for a, z := range v {
					list[i][a*k+j] = z
				}
			}
			list[i] = nearestUnitary(list[i], d, k)
		}
		e.from, e.to = list[0], list[1]
	} else {
		e.target = nearestUnitary(m.Target, d, d)
		if len(m.LocalBefore) > 0 { // |Tr W' A M B| is that of A'W B' against M
			a, b := nearestUnitary(kron(m.LocalAfter), d, d), nearestUnitary(kron(m.LocalBefore), d, d)
			half := make([]complex128, d*d)
			mulAdjointLeft(half, a, e.target, d)
			mulAdjointRight(e.target, half, b, d)
		}
	}
	e.before, e.after = frames(m.FreeZBefore, d), frames(m.FreeZAfter, d)
	if e.states > 0 && len(e.outside) == 0 && n > 2 {
		e.columns, e.reduced = e.states, true
		e.basis = make([]complex128, n*e.columns)
		for i, a := range m.CodeSpace {
			copy(e.basis[a*e.columns:(a+1)*e.columns], e.from[i*e.states:])
		}
		return
	}
	e.columns = d
	e.basis = make([]complex128, n*d)
	for i, a := range m.CodeSpace {
		e.basis[a*d+i] = 1
	}
}

// settled integrates from where w stands until the lines have settled, and gives U0(Ts - t)' U(Ts <- t) and the angle in
// rad that is left at Ts.
func (e *engine) settled(ctx context.Context, w *walker) (post []complex128, left float64, err error) {
	n := e.dim
	tail := w.newPlan()
	if left, err = w.settle(ctx, tail); err != nil {
		return nil, 0, err
	}
	l := e.labours[0]
	u, u0 := make([]complex128, n*n), make([]complex128, n*n)
	l.integrate(tail, nil, 0, u)
	l.undriven(tail, u0)
	post = make([]complex128, n*n)
	mulAdjointLeft(post, u0, u, n)
	return post, left, nil
}

// plan gives the window's steps, good for errors of size lambda along pr, which may be nil; rough ones are of roughTolerance.
func (e *engine) plan(ctx context.Context, pr *probe, lambda float64, rough bool) (*plan, error) {
	made, line := [...]*plans{&e.plans, &e.rough}, pr != nil && pr.slope != nil
	if line {
		made = [...]*plans{&pr.plans, &pr.rough}
	}
	tolerance, kind := e.tolerance, 0
	if rough {
		tolerance, kind = roughTolerance, 1
	}
	need := pr.reach(lambda)
	i := 0
	for i < len(reaches)-1 && !reaches[i].as(line).holds(need) {
		i++
	}
	r := reaches[i].as(line)
	kept := r.holds(need) // else an error beyond all reason: its plan is made for it alone
	if kept && made[kind][i] != nil {
		return made[kind][i], nil
	}
	if !kept {
		r = need
	}
	w := e.newWalker(pr, 1)
	w.tolerance = tolerance
	if err := w.to(ctx, e.start, reach{}, w.newPlan()); err != nil {
		return nil, err
	}
	p := w.newPlan()
	if err := w.to(ctx, e.start+e.span, r, p); err != nil {
		return nil, err
	}
	if kept {
		made[kind][i] = p
	}
	return p, nil
}

// frames gives the diagonal of the product of exp(-i angle Z/2) over sites, first site slowest, on a code space
// of d = 2^sites states; nil without angles.
func frames(angles []float64, d int) []complex128 {
	if len(angles) == 0 {
		return nil
	}
	f := make([]complex128, d)
	for i := range f {
		phase := 0.0
		for s, a := range angles {
			if i>>(len(angles)-1-s)&1 == 0 {
				phase -= a / 2
			} else {
				phase += a / 2
			}
		}
		f[i] = cmplx.Rect(1, phase)
	}
	return f
}

// A gate is one simulation that is wanted: the pulse with one error.
type gate struct {
	p      *probe // nil without error
	lambda float64
}

// maxLabours bounds the goroutines: the gates of one batch are too few to feed more.
const maxLabours = 8

// run simulates gates and hands each window's evolution, Dim x Dim, to use, which may keep results under its index only:
// it is called from several goroutines, and u is scratch.
func (e *engine) run(ctx context.Context, gates []gate, use func(l *labour, i int, u []complex128)) error {
	return e.simulate(ctx, gates, false, func(l *labour, i int, p *plan) {
		l.integrate(p, gates[i].p, gates[i].lambda, l.window)
		use(l, i, l.window)
	})
}

// carry simulates gates and hands what becomes of the first states for the required ends, Dim x columns, to use, as run does; of more than two levels
// by rough plans.
func (e *engine) carry(ctx context.Context, gates []gate, use func(l *labour, i int, w []complex128)) error {
	return e.simulate(ctx, gates, e.dim > 2, func(l *labour, i int, p *plan) {
		if l.spin != nil {
			l.integrate(p, gates[i].p, gates[i].lambda, l.window)
			use(l, i, e.first(l, e.ended(l, l.window)))
			return
		}
		copy(l.first, e.entry)
		l.carry(p, gates[i].p, gates[i].lambda, l.first, e.columns)
		if e.m.Ends == "window" {
			use(l, i, l.first)
			return
		}
		multiply(l.last, e.post, l.first, e.dim, e.dim, e.columns)
		use(l, i, l.last)
	})
}

// first gives what a whole gate, Dim x Dim, makes of the first states.
func (e *engine) first(l *labour, u []complex128) []complex128 {
	multiply(l.last, u, e.basis, e.dim, e.dim, e.columns)
	return l.last
}

// simulate makes every gate's plan and lets several goroutines work on the gates.
func (e *engine) simulate(ctx context.Context, gates []gate, rough bool, do func(l *labour, i int, p *plan)) error {
	// The plans first: making one is not for several goroutines at once.
	plans := make([]*plan, len(gates))
	for i, g := range gates {
		var err error
		if plans[i], err = e.plan(ctx, g.p, g.lambda, rough); err != nil {
			return err
		}
	}
	work := func(l *labour, first, stride int) {
		for i := first; i < len(gates) && ctx.Err() == nil; i += stride {
			do(l, i, plans[i])
		}
	}
	n := min(len(e.labours), len(gates))
	var wg sync.WaitGroup
	for g := 1; g < n; g++ {
		wg.Go(func() { work(e.labours[g], g, n) })
	}
	if n > 0 {
		work(e.labours[0], 0, n)
	}
	wg.Wait()
	return ctx.Err()
}

// ended gives the gate for the required ends from the window's evolution.
func (e *engine) ended(l *labour, u []complex128) []complex128 {
	if e.m.Ends == "window" {
		return u
	}
	return e.settle(l, u)
}

func (e *engine) settle(l *labour, u []complex128) []complex128 {
	mul(l.half, e.post, u, e.dim)
	mul(l.whole, l.half, e.pre, e.dim)
	return l.whole
}

// infidelities simulates gates and gives their infidelity for the required ends.
func (e *engine) infidelities(ctx context.Context, gates []gate, dst []float64) error {
	return e.carry(ctx, gates, func(l *labour, i int, w []complex128) {
		dst[i] = e.figures(l, w).Infidelity
	})
}

// figuresOf compares a whole gate, Dim x Dim, with the target.
func (e *engine) figuresOf(l *labour, u []complex128) Figures { return e.figures(l, e.first(l, u)) }

// figures compares what a gate has made of the first states, Dim x columns, with the target. Of states it is 1 - F averaged over them,
//
//	1 - (1/k) sum_ij |<to_i|U|from_j>|^2 = (1/k) sum_j |(1 - P_to) U from_j|^2
//
// of which the second form has no difference of large numbers in it.
func (e *engine) figures(l *labour, w []complex128) Figures {
	if e.states == 0 {
		return e.against(l, w, e.target, e.before, e.after)
	}
	d, k := len(e.m.CodeSpace), e.states
	v := e.fromStates(l, w)
	miss, leak := 0.0, 0.0
	for j := range k {
		for _, a := range e.outside {
			leak += square(v[a*k+j])
		}
		copied := l.block[:d]
		for i, a := range e.m.CodeSpace {
			copied[i] = v[a*k+j]
		}
		for q := range k {
			var part complex128
			for i, a := range e.m.CodeSpace {
				part += cmplx.Conj(e.to[i*k+q]) * v[a*k+j]
			}
			for i := range copied {
				copied[i] -= part * e.to[i*k+q]
			}
		}
		for _, z := range copied {
			miss += square(z)
		}
	}
	return Figures{Infidelity: (miss + leak) / float64(k), Leakage: leak / float64(k)}
}

// fromStates gives what becomes of the first states of a target of states, Dim x states, from what becomes of the first states.
func (e *engine) fromStates(l *labour, w []complex128) []complex128 {
	if e.reduced {
		return w
	}
	multiply(l.states, w, e.from, e.dim, e.columns, e.states)
	return l.states
}

// against compares what a gate has made of the code space, Dim x code states, with a target.
//
// With M the gate's block there, free frames included, W the target and E = phase W'M - 1, the phase making Tr W'M real,
// and w the weight that has leaked, w = d L, unitarity says 2 Re Tr E = -(|E|^2 + w), and
//
//	1 - F = 1 - (Tr M'M + |Tr W'M|^2)/(d(d+1)) = ( d |E|^2 + (d+1) w - (|E|^2 + w)^2/4 ) / (d(d+1))
//
// which has no difference of large numbers in it and so keeps its digits far below 1e-16.
func (e *engine) against(l *labour, w, target, before, after []complex128) Figures {
	code := e.m.CodeSpace
	d := len(code)
	block, g := l.block, l.gram
	for i, a := range code {
		for j := range d {
			v := w[a*d+j]
			if before != nil {
				v *= before[j]
			}
			if after != nil {
				v *= after[i]
			}
			block[i*d+j] = v
		}
	}
	mulAdjointLeft(g, target, block, d)
	var tr complex128
	for i := range d {
		tr += g[i*d+i]
	}
	phase := complex(1, 0)
	if a := cmplx.Abs(tr); a > 0 {
		phase = cmplx.Conj(tr) / complex(a, 0)
	}
	miss := 0.0
	for i := range d {
		for j := range d {
			v := phase * g[i*d+j]
			if i == j {
				v -= 1
			}
			miss += square(v)
		}
	}
	leak := 0.0
	for _, a := range e.outside {
		for j := range d {
			leak += square(w[a*d+j])
		}
	}
	df, q := float64(d), (miss+leak)/2
	return Figures{
		Infidelity: (df*miss + (df+1)*leak - q*q) / (df * (df + 1)),
		Leakage:    leak / df,
	}
}

// angle gives the angle in rad by which u turns: of a rotation when there are two levels, and in general
// 4 asin( |phase u - 1| / sqrt(4 n) ), the rotation angle of a spin for which the same share of the identity is left.
func angle(u []complex128, n int) float64 {
	var tr complex128
	for i := range n {
		tr += u[i*n+i]
	}
	phase := complex(1, 0)
	if a := cmplx.Abs(tr); a > 0 {
		phase = cmplx.Conj(tr) / complex(a, 0)
	}
	s := 0.0
	for i := range n {
		for j := range n {
			v := phase * u[i*n+j]
			if i == j {
				v -= 1
			}
			s += square(v)
		}
	}
	return 4 * math.Asin(math.Min(1, math.Sqrt(s/(4*float64(n)))))
}
