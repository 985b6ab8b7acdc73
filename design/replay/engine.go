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
	// Of an error of kind line, with v what arrives through the slope of its channel's line:
	slopeI // v_I, rad/ns
	slopeQ
	beat   // u_I v_I + u_Q v_Q, in shares
	slopes // |v|^2
)

// A control is one real function of time times one operator, H += f(t) op. Errors may change the operator, and some controls are there
// for errors only and have none without.
type control struct {
	channel  int
	part     part
	op       []complex128 // traceless
	norm     float64      // bound of its largest eigenvalue
	elements sparse
}

func newControl(channel int, p part, op []complex128, n int) control {
	return control{channel, p, op, operatorNorm(op, n), sparsely(op, n)}
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
}

// An engine is a model made ready: lines walked through once, what comes before and after the window integrated.
// Its methods may be called from one goroutine only; they use more of their own, with results that do not depend on how many.
type engine struct {
	m          *Model
	dim        int
	farthest   float64 // MHz: how far margins of static errors are searched
	start      float64 // of the window, ns
	span       float64 // ns
	drives     []drive
	controls   []control
	axes       []axis // the controls' operators when there are two levels
	static     []complex128
	staticNorm float64
	elements   sparse // of static
	target     []complex128
	before     []complex128 // free Z phases on the code space; nil when all are 1
	after      []complex128
	outside    []int // states that are not in the code space
	plans      plans

	pre, post []complex128 // Dim x Dim: settled = post window pre
	left      float64      // rad still to come when the integration stopped

	labours []*labour // scratch, one for each goroutine
}

// plans are those of the window, one for each of reaches, each made when it is first needed.
type plans [len(reaches)]*plan

// takeDrives makes the channels' samples and controls ready.
func (e *engine) takeDrives() {
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
	if n == 2 {
		for _, c := range e.controls {
			e.axes = append(e.axes, axisOf(c.op))
		}
	}
}

// newEngine walks the pulse once and integrates what surrounds the window.
func newEngine(ctx context.Context, m *Model) (*engine, error) {
	n := m.Dim
	e := &engine{m: m, dim: n, farthest: m.farthest(nil), start: m.WindowStart, span: m.Span()}
	e.static = append([]complex128(nil), m.Static...)
	dropTrace(e.static, n)
	e.staticNorm, e.elements = operatorNorm(e.static, n), sparsely(e.static, n)
	e.takeDrives()
	for a := range n {
		if !slices.Contains(m.CodeSpace, a) {
			e.outside = append(e.outside, a)
		}
	}
	d := len(m.CodeSpace)
	e.target = nearestUnitary(m.Target, d)
	e.before, e.after = frames(m.FreeZBefore, d), frames(m.FreeZAfter, d)
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
	return e, nil
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

// plan gives the window's steps, good for errors of size lambda along pr; pr may be nil.
func (e *engine) plan(ctx context.Context, pr *probe, lambda float64) (*plan, error) {
	made, line := &e.plans, pr != nil && pr.slope != nil
	if line {
		made = &pr.plans
	}
	need := pr.reach(lambda)
	i := 0
	for i < len(reaches)-1 && !reaches[i].as(line).holds(need) {
		i++
	}
	r := reaches[i].as(line)
	kept := r.holds(need) // else an error beyond all reason: its plan is made for it alone
	if kept && made[i] != nil {
		return made[i], nil
	}
	if !kept {
		r = need
	}
	w := e.newWalker(pr, 1)
	if err := w.to(ctx, e.start, reach{}, w.newPlan()); err != nil {
		return nil, err
	}
	p := w.newPlan()
	if err := w.to(ctx, e.start+e.span, r, p); err != nil {
		return nil, err
	}
	if kept {
		made[i] = p
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
	// The plans first: making one is not for several goroutines at once.
	plans := make([]*plan, len(gates))
	for i, g := range gates {
		var err error
		if plans[i], err = e.plan(ctx, g.p, g.lambda); err != nil {
			return err
		}
	}
	work := func(l *labour, first, stride int) {
		for i := first; i < len(gates) && ctx.Err() == nil; i += stride {
			l.integrate(plans[i], gates[i].p, gates[i].lambda, l.window)
			use(l, i, l.window)
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
	return e.run(ctx, gates, func(l *labour, i int, u []complex128) {
		dst[i] = e.figures(l, e.ended(l, u)).Infidelity
	})
}

// figures compares a gate, Dim x Dim, with the target on the code space.
//
// With M the gate's block there, free frames included, W the target and E = phase W'M - 1, the phase making Tr W'M real,
// and w the weight that has leaked, w = d L, unitarity says 2 Re Tr E = -(|E|^2 + w), and
//
//	1 - F = 1 - (Tr M'M + |Tr W'M|^2)/(d(d+1)) = ( d |E|^2 + (d+1) w - (|E|^2 + w)^2/4 ) / (d(d+1))
//
// which has no difference of large numbers in it and so keeps its digits far below 1e-16.
func (e *engine) figures(l *labour, u []complex128) Figures {
	return e.against(l, u, e.target, e.before, e.after)
}

func (e *engine) against(l *labour, u, target, before, after []complex128) Figures {
	code, n := e.m.CodeSpace, e.dim
	d := len(code)
	block, g := l.block, l.gram
	for i, a := range code {
		for j, b := range code {
			v := u[a*n+b]
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
		for _, b := range code {
			leak += square(u[a*n+b])
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
