package dynamics

import (
	"fmt"
	"math"
)

// A Levels is a closed system of Dim levels driven by K controls on a fixed grid of
// steps: what Spin is for one spin. The Hamiltonian at a node is
//
//	H = Static + sum_k ( u_k Axes[k] + u_k² Shifts[k] ),   rad/ns,
//
// with whole d x d matrices, row by row: the Axes of one spin are X/2 and Y/2. Each
// step of length h is integrated by the fourth-order Magnus expansion on its Gauss
// nodes 1 and 2 (Blanes, Casas, Oteo, Ros 2009, Phys. Rep. 470, 151),
//
//	Hb = (H1+H2)/2 + i (√3/12) h [H1,H2],   U -> exp(-i Hb h) U,
//
// and with D = (√3/12) h² (H2-H1), V = (V1+V2)/2, DV = (√3/12) h² (V2-V1),
// Hm = (H1+H2)/2 and Um = exp(-i Hb h/2) its share of a toggled integral, in the frame
// of its start, is
//
//	int_0^h e^{i Hb s} V e^{-i Hb s} ds + Um' ( -i [D,V] + i [Hm,DV] ) Um
//
// (order four, for static and control-borne errors alike; for one spin these are the
// formulas of Spin). The integral is taken by Gauss-Legendre quadrature inside the step;
// Reset chooses an odd number of points for each step so that Peak and Within hold.
//
// Run gives the gate and the toggled integrals. Then either
//
//   - Derive gives, for every control and node, the generator of the gate and the
//     derivatives of all toggled integrals: the rows of a Jacobian, for few errors; or
//   - Pull takes the derivatives of one number by the gate and the toggled integrals,
//     and gives its gradient by every control: for many errors, or large d.
//
// Cost per step, in products of d x d matrices (d³ complex multiply-adds), with q
// points, J errors, K controls (q is 3 for h |Hb| up to 0.04 and 5 up to 0.4, the trace
// apart; with Within at 1e-9 up to 0.18 and 1.1):
//
//	Run      about 4 without errors; with them 7 + q plus, of each error, 1.5 q
//	Derive   as Run, then 2K (1.5 q + 1), and 2K (q+1) J for the errors
//	Pull     as Run, then 2q + 4, and q J for the errors
//
// (operators with few entries cost less). When the static errors are so many that it
// pays, Run and Pull do not toggle them one by one but through the Gram matrix of the
// frames: q (b/d + 1) and 2q (b/d + 1) products for b occupied entries of the errors'
// matrices, above the diagonal or on it, whatever J.
//
// The memory is 16 d² bytes a step, and 48 d² for every block of the Gram matrix where
// that serves (b, less what entries share): at d = 64, 66 MB for 1000 steps and 7 MB
// for one-body errors on six spins; plus about (40 + 3q) 16 d² bytes, and
// 2 (q+1) 16 d² for every error that is toggled by itself, as Derive does with all.
//
// The exported fields are set once; Reset sizes the working memory, after which
// Run and Pull allocate nothing, nor Derive after its first call. A Levels serves
// one goroutine.
type Levels struct {
	Dim    int
	Static []complex128   // rad/ns
	Axes   [][]complex128 // one per control, rad/ns per unit of control
	Shifts [][]complex128 // what the square of a control adds, rad/ns; nil for none
	Steps  []float64      // ns; nodes 2j and 2j+1 are the Gauss nodes of step j

	// Known is how many of the controls, the last ones, are given functions of time: a
	// term that rotates. Derive and Pull pass them over.
	Known int

	// Errors act in the steps First <= j < Last, the gate's window.
	First, Last int

	// Held are the static errors whose toggled integrals are wanted.
	Held [][]complex128
	// Borne are the control-borne errors, V(t) = sum_k v_k(t) (Axes[k] + 2 u_k Shifts[k]),
	// laid out like the controls, known ones included.
	Borne [][]float64

	// Peak is the largest |u_k| to be expected; default 1. Larger controls are
	// integrated all the same, less closely.
	Peak float64
	// Within bounds the error of the integral inside a step relative to h |V|; default
	// 1e-13. The order of the step is not touched by it. A search may do with 1e-9.
	Within float64

	// Results of Run.
	Gate   []complex128   // U of the whole grid, first step to last
	Toggle [][]complex128 // int U' V U dt over the window for Held, then Borne

	k        *kit
	pow      *powers
	axes     []*sparse
	shifts   []*sparse
	held     []*sparse
	gram     *gram   // nil where the errors are toggled one by one
	rules    []*rule // by step
	start    []complex128
	offset   []complex128
	errors   int
	most     int // points of any step's rule
	hasShift bool
	f        levelsFrames
	slope    *levelsSlope // of Derive, made by its first call
	pull     levelsPull
}

// levelsFrames is one step, as far as Run needs it.
type levelsFrames struct {
	h1, h2, hb, hm, d []complex128
	c, s, e           []complex128
	mid               []complex128   // exp(-i Hb h/2) U
	frame             [][]complex128 // at the points of the rule
	v, dv             []complex128   // of a control-borne error
	p, q              []complex128
	toggled           [][][]complex128 // V seen from each point, by error
	bent              [][]complex128   // the correction, by error
	dvm               [][]complex128   // DV seen from the middle, by control-borne error
	dm, hmm           []complex128     // D and Hm seen from the middle
}

// Reset takes the exported fields over and sizes the working memory. The error says
// which of them is out of range or not Hermitian.
func (l *Levels) Reset() error {
	d := l.Dim
	if d < 2 || d > MaxDim {
		return fmt.Errorf("dynamics: found dimension %d; allowed: 2 to %d", d, MaxDim)
	}
	if l.First < 0 || l.Last > len(l.Steps) || l.First > l.Last {
		return fmt.Errorf("dynamics: window of steps %d to %d outside a grid of %d", l.First, l.Last, len(l.Steps))
	}
	if l.Known < 0 || l.Known > len(l.Axes) {
		return fmt.Errorf("dynamics: found %d known controls of %d", l.Known, len(l.Axes))
	}
	if l.Shifts != nil && len(l.Shifts) != len(l.Axes) {
		return fmt.Errorf("dynamics: found %d shifts for %d controls", len(l.Shifts), len(l.Axes))
	}
	if err := hermitian("the static part", l.Static, d); err != nil {
		return err
	}
	for _, c := range []struct {
		name string
		list [][]complex128
	}{{"axis", l.Axes}, {"shift", l.Shifts}, {"error", l.Held}} {
		for i, a := range c.list {
			if err := hermitian(fmt.Sprintf("%s %d", c.name, i), a, d); err != nil {
				return err
			}
		}
	}
	nodes := 2 * len(l.Steps)
	for i, v := range l.Borne {
		if len(v) != nodes*len(l.Axes) {
			return fmt.Errorf("dynamics: control-borne error %d has %d values; allowed: %d", i, len(v), nodes*len(l.Axes))
		}
	}
	peak, within := l.Peak, l.Within
	if peak == 0 {
		peak = 1
	}
	if within == 0 {
		within = 1e-13
	}
	l.k = newKit(d)
	l.pow = newPowers(l.k)
	dd := l.k.dd
	list := func(all [][]complex128) (s []*sparse) {
		for _, a := range all {
			s = append(s, newSparse(a, d))
		}
		return s
	}
	l.axes, l.shifts, l.held = list(l.Axes), list(l.Shifts), list(l.Held)
	l.hasShift = l.Shifts != nil
	l.errors = len(l.Held) + len(l.Borne)

	// twice a bound of |H - trace| bounds the differences of its eigenvalues
	b := make([]complex128, dd)
	size := func(a []complex128) float64 {
		copy(b, a)
		center(b, d)
		return min(spread(b, d), rowSum(b, d))
	}
	wide := size(l.Static)
	for i := range l.Axes {
		wide += peak * size(l.Axes[i])
		if l.hasShift {
			wide += peak * peak * size(l.Shifts[i])
		}
	}
	points := map[int]*rule{}
	l.rules = make([]*rule, len(l.Steps))
	most := 1
	for j, h := range l.Steps {
		if !(h > 0) || math.IsInf(h, 1) {
			return fmt.Errorf("dynamics: found a step of %v ns; allowed: positive lengths", h)
		}
		n := pointsFor(2*wide*h, within)
		if points[n] == nil {
			points[n] = newRule(n)
		}
		l.rules[j] = points[n]
		most = max(most, n)
	}

	l.gram = nil
	if len(l.Held) > 1 {
		g := newGram(l.k, l.Held)
		entries, cost := 0, 0.0
		for _, gr := range g.groups {
			entries += len(gr.pairs)
		}
		for _, s := range l.held {
			cost += 0.5 + float64(len(s.col))/float64(dd)
		}
		// both ways: a frame costs 3/d products for each entry and one more, or every
		// error those of cost and a commutator
		if 3*float64(entries)/float64(d)+1 < cost+float64(len(l.Held)) {
			l.gram = g
		}
	}
	l.most = most
	l.start = make([]complex128, len(l.Steps)*dd)
	l.Gate = make([]complex128, dd)
	l.Toggle = matrices(l.errors, dd)
	f := &l.f
	for _, m := range []*[]complex128{&f.h1, &f.h2, &f.hb, &f.hm, &f.d, &f.c, &f.s, &f.e, &f.mid, &f.v, &f.dv, &f.p, &f.q, &f.dm, &f.hmm} {
		*m = make([]complex128, dd)
	}
	f.frame = matrices(most, dd)
	f.toggled = make([][][]complex128, l.errors)
	f.bent = make([][]complex128, l.errors)
	l.room(l.alone())
	f.dvm = matrices(len(l.Borne), dd)
	l.slope = nil
	l.pull = newLevelsPull(most, dd, len(l.Held))
	return nil
}

// matrices returns n of them, of dd entries.
func matrices(n, dd int) [][]complex128 {
	m := make([][]complex128, n)
	for i := range m {
		m[i] = make([]complex128, dd)
	}
	return m
}

// alone is the first error that Run and Pull toggle by itself.
func (l *Levels) alone() int {
	if l.gram != nil {
		return len(l.held)
	}
	return 0
}

// room makes the memory in which errors from the given one on are toggled by
// themselves.
func (l *Levels) room(from int) {
	for i := from; i < l.errors; i++ {
		if l.f.toggled[i] == nil {
			l.f.toggled[i] = matrices(l.most, l.k.dd)
			l.f.bent[i] = make([]complex128, l.k.dd)
		}
	}
}

// Run propagates. The controls u run node by node for one control after the other,
// u[k*nodes+node] with nodes = 2 len(Steps), as for Spin; offset, a Hermitian
// matrix or nil, is added to the static part inside the window only: a finite
// error. It is kept by reference for Derive and Pull.
func (l *Levels) Run(u []float64, offset []complex128) {
	dd := l.k.dd
	l.offset = offset
	for _, a := range l.Toggle {
		clear(a)
	}
	if l.gram != nil {
		l.gram.clear()
	}
	identity(l.Gate, l.Dim)
	for j := range l.Steps {
		copy(l.start[j*dd:j*dd+dd], l.Gate)
		l.fields(u, j)
		if l.errors == 0 || j < l.First || j >= l.Last {
			l.whole(j)
			continue
		}
		l.frames(j)
		l.toggle(u, j, l.alone())
		if l.gram != nil {
			l.gather(j)
		}
		r, h := l.rules[j], l.Steps[j]
		for i := l.alone(); i < l.errors; i++ {
			l.f.share(l.Toggle[i], i, r, h)
		}
		copy(l.Gate, l.f.e)
	}
	if l.gram != nil {
		for i := range l.held {
			l.gram.integral(l.Toggle[i], i, 1)
		}
	}
}

// fields fills h1, h2, hb, hm and d of step j.
func (l *Levels) fields(u []float64, j int) {
	f := &l.f
	l.node(f.h1, u, 2*j)
	l.node(f.h2, u, 2*j+1)
	h := l.Steps[j]
	// i [H1,H2] is minus the bracket
	l.k.bracket(f.hb, f.h1, f.h2)
	g := gauss * h
	for i, x := range f.hb {
		a, b := f.h1[i], f.h2[i]
		m := complex((real(a)+real(b))/2, (imag(a)+imag(b))/2)
		f.hm[i] = m
		f.hb[i] = complex(real(m)-g*real(x), imag(m)-g*imag(x))
		f.d[i] = complex(g*h*(real(b)-real(a)), g*h*(imag(b)-imag(a)))
	}
}

// node stores H at a node in h.
func (l *Levels) node(h []complex128, u []float64, node int) {
	nodes := 2 * len(l.Steps)
	copy(h, l.Static)
	if l.offset != nil && node >= 2*l.First && node < 2*l.Last {
		addReal(h, l.offset, 1)
	}
	for k, s := range l.axes {
		x := u[k*nodes+node]
		s.add(h, x)
		if l.hasShift {
			l.shifts[k].add(h, x*x)
		}
	}
}

// whole takes Gate over step j in one exponential.
func (l *Levels) whole(j int) {
	f, h := &l.f, l.Steps[j]
	copy(f.p, f.hb)
	mean := center(f.p, l.Dim)
	l.pow.raise(l.k, f.p, nil, h)
	l.pow.wave(l.k, f.c, f.s, h, nil)
	unitary(f.q, f.c, f.s)
	rotate(f.q, mean*h)
	copy(f.p, l.Gate)
	l.k.mul(l.Gate, f.q, f.p)
}

// rotate multiplies a by exp(-i x).
func rotate(a []complex128, x float64) {
	if x == 0 {
		return
	}
	s, c := math.Sincos(x)
	for i := range a {
		a[i] *= complex(c, -s)
	}
}

// frames fills the frames of step j: those at the points, mid, and e at its end. A
// common phase is left out of all but the last: conjugation does not see it.
func (l *Levels) frames(j int) {
	f, h, r, k := &l.f, l.Steps[j], l.rules[j], l.k
	u := l.start[j*k.dd : (j+1)*k.dd]
	copy(f.p, f.hb)
	mean := center(f.p, l.Dim)
	l.pow.raise(k, f.p, nil, h/2)
	l.pow.wave(k, f.c, f.s, h/2, nil)
	unitary(f.q, f.c, f.s)
	k.mul(f.mid, f.q, u)
	k.mul(f.e, f.q, f.mid)
	rotate(f.e, mean*h)
	m := r.n / 2
	copy(f.frame[m], f.mid)
	for i := range m { // points in pairs about the middle
		l.pow.wave(k, f.c, f.s, h*(r.node[r.n-1-i]-0.5), nil)
		unitary(f.q, f.c, f.s)
		k.mul(f.frame[r.n-1-i], f.q, f.mid)
		k.mulLeft(f.frame[i], f.q, f.mid)
	}
}

// gather adds the frames of step j to the Gram matrix.
func (l *Levels) gather(j int) {
	f, h, r := &l.f, l.Steps[j], l.rules[j]
	for q := 0; q+1 < r.n; q += 2 {
		l.gram.add(h*r.weight[q], f.frame[q], h*r.weight[q+1], f.frame[q+1])
	}
	l.gram.add(h*r.weight[r.n-1], f.frame[r.n-1], 0, nil)
	l.along()
	l.gram.addCross(1, f.mid, f.q)
}

// along stores i D mid in q: -i [D,V] seen from the middle is what the conjugation by
// mid gains when mid moves along it.
func (l *Levels) along() {
	f := &l.f
	l.k.mul(f.q, f.d, f.mid)
	for i, x := range f.q {
		f.q[i] = complex(-imag(x), real(x))
	}
}

// share adds to dst the share of error i in a step of length h.
func (f *levelsFrames) share(dst []complex128, i int, r *rule, h float64) {
	for q := range r.n {
		addReal(dst, f.toggled[i][q], h*r.weight[q])
	}
	addReal(dst, f.bent[i], 1)
}

// toggle finds, for step j, what the errors from the given one on look like from every
// point of the step.
func (l *Levels) toggle(u []float64, j, from int) {
	f, r, k := &l.f, l.rules[j], l.k
	nh := len(l.held)
	mid := r.n / 2
	if from < l.errors {
		k.mul(f.p, f.d, f.mid)
		k.hermLeft(f.dm, f.mid, f.p)
		if len(l.Borne) > 0 {
			k.mul(f.p, f.hm, f.mid)
			k.hermLeft(f.hmm, f.mid, f.p)
		}
	}
	for i := from; i < l.errors; i++ {
		if i >= nh {
			l.borne(u, l.Borne[i-nh], j)
		}
		for q := range r.n {
			if i < nh {
				l.held[i].mul(f.p, f.frame[q])
			} else {
				k.mul(f.p, f.v, f.frame[q])
			}
			k.hermLeft(f.toggled[i][q], f.frame[q], f.p)
		}
		k.bracket(f.bent[i], f.dm, f.toggled[i][mid])
		if i >= nh {
			k.mul(f.p, f.dv, f.mid)
			k.hermLeft(f.dvm[i-nh], f.mid, f.p)
			k.bracket(f.p, f.hmm, f.dvm[i-nh])
			addReal(f.bent[i], f.p, -1)
		}
	}
}

// borne fills v and dv of the control-borne error w in step j.
func (l *Levels) borne(u, w []float64, j int) {
	f, nodes := &l.f, 2*len(l.Steps)
	clear(f.v)
	clear(f.dv)
	g := gauss * l.Steps[j] * l.Steps[j]
	for k, s := range l.axes {
		at := k*nodes + 2*j
		a, b := w[at], w[at+1]
		s.add(f.v, (a+b)/2)
		s.add(f.dv, g*(b-a))
		if l.hasShift {
			a, b = 2*u[at]*a, 2*u[at+1]*b
			l.shifts[k].add(f.v, (a+b)/2)
			l.shifts[k].add(f.dv, g*(b-a))
		}
	}
}

// ByFrames tells whether Run and Pull follow the static errors through the Gram matrix
// of the frames; Reset decides it.
func (l *Levels) ByFrames() bool { return l.gram != nil }
