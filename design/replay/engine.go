package replay

import (
	"context"
	"math"
	"math/cmplx"
	"runtime"
	"slices"
	"sync"
)

// A control is one real function of time times one operator: a quadrature of a channel.
type control struct {
	channel, quadrature int
	op                  []complex128 // traceless
	norm                float64      // bound of its largest eigenvalue
	elements            sparse
}

// An engine is a model made ready: lines walked through once, what comes before and after the window integrated.
// Its methods may be called from one goroutine only; they use more of their own, with results that do not depend on how many.
type engine struct {
	m          *Model
	dim        int
	start      float64 // of the window, ns
	span       float64 // ns
	controls   []control
	axes       []axis // the controls' operators when there are two levels
	static     []complex128
	staticNorm float64
	elements   sparse // of static
	target     []complex128
	before     []complex128 // free Z phases on the code space; nil when all are 1
	after      []complex128
	outside    []int  // states that are not in the code space
	turned     []bool // which channels follow a turn of the frame: the quadrature ones
	plans      [len(reaches)]*plan

	pre, post []complex128 // Dim x Dim: settled = post window pre
	left      float64      // rad still to come when the integration stopped

	labours []*labour // scratch, one for each goroutine
}

// newEngine walks the pulse once and integrates what surrounds the window.
func newEngine(ctx context.Context, m *Model) (*engine, error) {
	n := m.Dim
	e := &engine{m: m, dim: n, start: m.WindowStart, span: m.Span()}
	e.static = append([]complex128(nil), m.Static...)
	dropTrace(e.static, n)
	e.staticNorm, e.elements = operatorNorm(e.static, n), sparsely(e.static, n)
	for c := range m.Channels {
		e.turned = append(e.turned, m.Channels[c].Kind == "quadrature")
		for q, op := range m.Channels[c].Operators {
			op = append([]complex128(nil), op...)
			dropTrace(op, n)
			e.controls = append(e.controls, control{c, q, op, operatorNorm(op, n), sparsely(op, n)})
			if n == 2 {
				e.axes = append(e.axes, axisOf(op))
			}
		}
	}
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

	w := e.newWalker(1)
	lead := &plan{controls: len(e.controls)}
	if err := w.to(ctx, e.start, reach{}, lead); err != nil {
		return nil, err
	}
	window := &plan{controls: len(e.controls)}
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
	tail := &plan{controls: len(e.controls)}
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

// plan gives the window's steps, good for errors up to need.
func (e *engine) plan(ctx context.Context, need reach) (*plan, error) {
	i := 0
	for i < len(reaches)-1 && !reaches[i].holds(need) {
		i++
	}
	kept := reaches[i].holds(need) // else an error beyond all reason: its plan is made for it alone
	if e.plans[i] == nil || !kept {
		w, p := e.newWalker(1), &plan{controls: len(e.controls)}
		if err := w.to(ctx, e.start, reach{}, &plan{controls: len(e.controls)}); err != nil {
			return nil, err
		}
		r := reaches[i]
		if !kept {
			r = need
		}
		if err := w.to(ctx, e.start+e.span, r, p); err != nil {
			return nil, err
		}
		if !kept {
			return p, nil
		}
		e.plans[i] = p
	}
	return e.plans[i], nil
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

// A probe is one way in which things go wrong, to be multiplied by a size lambda.
type probe struct {
	static    []complex128 // traceless; H += lambda static, lambda in rad/ns; nil for an amplitude error
	norm      float64      // of static
	amplitude []bool       // for each channel: u scaled by 1 + lambda
}

func newStatic(op []complex128, n int) *probe {
	p := &probe{static: append([]complex128(nil), op...)}
	dropTrace(p.static, n)
	p.norm = operatorNorm(p.static, n)
	return p
}

// newAmplitude scales the named channels, or all.
func (e *engine) newAmplitude(names []string) *probe {
	p := &probe{amplitude: make([]bool, len(e.m.Channels))}
	for c := range e.m.Channels {
		p.amplitude[c] = len(names) == 0
		for _, name := range names {
			p.amplitude[c] = p.amplitude[c] || name == e.m.Channels[c].Name
		}
	}
	return p
}

func (p *probe) same(o *probe) bool {
	if (p.static == nil) != (o.static == nil) {
		return false
	}
	for i := range p.static {
		if p.static[i] != o.static[i] {
			return false
		}
	}
	for i := range p.amplitude {
		if p.amplitude[i] != o.amplitude[i] {
			return false
		}
	}
	return true
}

func (p *probe) reach(lambda float64) reach {
	if p == nil {
		return reach{}
	}
	if p.static != nil {
		return reach{static: math.Abs(lambda) * p.norm}
	}
	return reach{amplitude: math.Abs(lambda)}
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
		if plans[i], err = e.plan(ctx, g.p.reach(g.lambda)); err != nil {
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
