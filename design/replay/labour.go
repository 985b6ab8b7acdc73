package replay

import "math"

// A labour is the scratch of one goroutine that integrates U' = -i H U along plans.
type labour struct {
	e *engine

	window, half, whole []complex128 // Dim x Dim
	first, last         []complex128 // Dim x columns: what a gate makes of the first states, in the window and for the required ends
	states              []complex128 // Dim x k, of a target of states
	block, gram         []complex128 // on the code space

	spin *spinLabour // two levels

	// More levels. A step's series is kept twice: its last term, and all of them, the real and imaginary parts of one element one after another in time
	// order backwards, the term of order m at series[(2 element + part) width + maxOrder - m], so that H_j and U_(n-j) run the same way.
	series     []float64
	term, next []complex128
	sums       []complex128
	still      sparse   // what is constant in time, this gate's error included
	ops        []sparse // of every control with this gate's error
	active     []int    // the controls that have any
	own        []sparse // memory of those that the error changes
	op         []complex128
}

const width = maxOrder + 1 // of one element's series

func newLabour(e *engine) *labour {
	n, c, d := e.dim, e.columns, len(e.m.CodeSpace)
	l := &labour{
		e: e, window: make([]complex128, n*n), half: make([]complex128, n*n), whole: make([]complex128, n*n),
		first: make([]complex128, n*c), last: make([]complex128, n*c), states: make([]complex128, n*e.states),
		block: make([]complex128, d*d), gram: make([]complex128, d*d),
	}
	if n == 2 {
		l.spin = newSpinLabour(e)
		return l
	}
	l.levels(n)
	return l
}

// levels makes the scratch for any number of levels.
func (l *labour) levels(n int) {
	size := n * (n + n&1) // room for an even number of columns
	l.series = make([]float64, 2*size*width)
	l.term, l.next, l.sums, l.op = make([]complex128, size), make([]complex128, size), make([]complex128, size), make([]complex128, n*n)
}

// integrate sets u, Dim x Dim, to the evolution along p with error lambda times pr; pr may be nil.
func (l *labour) integrate(p *plan, pr *probe, lambda float64, u []complex128) {
	if l.spin != nil {
		l.spin.choose(p, pr, lambda)
		l.spin.integrate(p, u)
		return
	}
	setIdentity(u, l.e.dim)
	l.carry(p, pr, lambda, u, l.e.dim)
}

// carry does the same to so many columns u, Dim x columns, of more than two levels.
func (l *labour) carry(p *plan, pr *probe, lambda float64, u []complex128, columns int) {
	l.choose(p, pr, lambda)
	for i := range p.steps {
		l.step(p, &p.steps[i], u, columns)
	}
}

// choose makes the operators of every control of p with error lambda times pr.
func (l *labour) choose(p *plan, pr *probe, lambda float64) {
	n := l.e.dim
	l.room(p)
	l.still = l.e.elements
	if pr != nil && pr.static != nil {
		copy(l.op, l.e.static)
		for i, v := range pr.static {
			l.op[i] += complex(lambda, 0) * v
		}
		l.still = sparsely(l.op, n)
	}
	for k := range p.controls {
		if k < len(l.e.controls) {
			l.ops[k] = l.e.controls[k].elements
		}
		if pr != nil && pr.first != nil && (pr.first[k] != nil || pr.second[k] != nil) {
			clear(l.op)
			if k < len(l.e.controls) {
				copy(l.op, l.e.controls[k].op)
			}
			for i, v := range pr.first[k] {
				l.op[i] += complex(lambda, 0) * v
			}
			for i, v := range pr.second[k] {
				l.op[i] += complex(lambda*lambda, 0) * v
			}
			l.own[k] = appendSparse(sparse{elements: l.own[k].elements[:0], rows: l.own[k].rows[:0]}, l.op, n)
			l.ops[k] = l.own[k]
		}
		if len(l.ops[k].elements) > 0 {
			l.active = append(l.active, k)
		}
	}
}

// room makes the lists of p's controls, with no operators.
func (l *labour) room(p *plan) {
	for len(l.ops) < p.controls {
		l.ops, l.own = append(l.ops, sparse{}), append(l.own, sparse{})
	}
	clear(l.ops)
	l.active = l.active[:0]
}

// undriven sets u to the evolution over the length of p without drive: the static part and what turns by itself.
func (l *labour) undriven(p *plan, u []complex128) {
	if l.spin != nil {
		l.spin.still(p)
		l.spin.integrate(p, u)
		return
	}
	l.room(p)
	l.still = l.e.elements
	for k := range l.e.controls {
		if c := &l.e.controls[k]; c.channel < 0 && len(c.elements.elements) > 0 {
			l.ops[k] = c.elements
			l.active = append(l.active, k)
		}
	}
	setIdentity(u, l.e.dim)
	for i := range p.steps {
		l.step(p, &p.steps[i], u, l.e.dim)
	}
}

// step multiplies the evolution of one step into u, for any number of levels: the recurrence of plan.go with one product by a
// (usually sparse) operator for each control and order.
func (l *labour) step(p *plan, st *timeStep, u []complex128, columns int) {
	n := l.e.dim
	even := columns + columns&1
	size := n * even
	term, next, sums := l.term[:size], l.next[:size], l.sums[:size]
	for i := range n {
		copy(term[i*even:], u[i*columns:(i+1)*columns])
		clear(term[i*even+columns : (i+1)*even])
	}
	series := l.series[:2*size*width]
	keep(series, term, 0)
	for o := range st.order {
		clear(next)
		f := complex(0, -st.s/float64(o+1)) // -i s/(n+1)
		apply(next, l.still, term, f, even)
		for _, k := range l.active {
			h := p.numbers[st.at+k*st.order : st.at+k*st.order+o+1]
			// What is too small to matter at the end is left out.
			for len(h) > 0 && math.Abs(h[len(h)-1])*st.s < p.least {
				h = h[:len(h)-1]
			}
			if len(h) == 0 {
				continue
			}
			for _, row := range l.ops[k].rows {
				for i := row * even; i < (row+1)*even; i += 2 {
					sums[i], sums[i+1] = products(series[2*i*width+maxOrder-o:], h)
				}
			}
			apply(next, l.ops[k], sums, f, even)
		}
		term, next = next, term
		keep(series, term, o+1)
	}
	for i := range n {
		for j := range columns {
			at := 2 * (i*even + j) * width
			u[i*columns+j] = complex(total(series[at:at+width], st.order), total(series[at+width:at+2*width], st.order))
		}
	}
}

// keep writes the term of order m where step looks for it.
func keep(series []float64, term []complex128, m int) {
	at := maxOrder - m
	for _, z := range term {
		series[at], series[at+width] = real(z), imag(z)
		at += 2 * width
	}
}

// products gives the sums of h_j U_(n-j) of two elements whose series follow one another, from that of order n on.
func products(s, h []float64) (x, y complex128) {
	a, b := s[:len(h)], s[width:width+len(h)]
	c, d := s[2*width:2*width+len(h)], s[3*width:3*width+len(h)]
	var p, q, r, t float64
	for j, v := range h {
		p += v * a[j]
		q += v * b[j]
		r += v * c[j]
		t += v * d[j]
	}
	return complex(p, q), complex(r, t)
}

// total adds the terms of a series, the smallest first.
func total(s []float64, order int) float64 {
	sum := 0.0
	for _, v := range s[maxOrder-order:] {
		sum += v
	}
	return sum
}

// apply adds f a b to dst, b of so many columns.
func apply(dst []complex128, a sparse, b []complex128, f complex128, columns int) {
	for _, el := range a.elements {
		v := f * el.v
		row, out := b[el.j*columns:(el.j+1)*columns], dst[el.i*columns:(el.i+1)*columns]
		out = out[:len(row)]
		for k, z := range row {
			out[k] += v * z
		}
	}
}

// A spinLabour does the same for two levels. H is traceless, H = [[z, conj c], [c, -z]], so the second column of U follows from the
// first, (a, b), and the first obeys
//
//	a' = -i (z a + conj(c) b),   b' = -i (c a - z b)
type spinLabour struct {
	e    *engine
	op   []axis // of every control, with this gate's error
	rest axis   // what is constant in time
	flat bool   // no control has a part along Z: only the first coefficient of z is not zero

	reciprocal [maxOrder + 1]float64 // 1/n

	h    [maxOrder]axis
	back [maxOrder + 1]column // U_n at back[maxOrder - n]: then H_j and U_(n-j) run the same way
}

type axis struct{ cr, ci, z float64 }

type column struct{ ar, ai, br, bi float64 }

func axisOf(m []complex128) axis { // m Hermitian and traceless
	return axis{real(m[2]), imag(m[2]), real(m[0])}
}

func newSpinLabour(e *engine) *spinLabour {
	s := &spinLabour{e: e}
	for n := 1; n <= maxOrder; n++ {
		s.reciprocal[n] = 1 / float64(n)
	}
	return s
}

// choose makes the operators of every control of p with error lambda times pr.
func (s *spinLabour) choose(p *plan, pr *probe, lambda float64) {
	s.still(p)
	copy(s.op, s.e.axes)
	if pr != nil && pr.static != nil {
		s.rest.add(lambda, axisOf(pr.static))
	}
	for k := range s.op {
		if pr != nil && pr.first != nil {
			s.op[k].add(lambda, pr.firstAxes[k])
			s.op[k].add(lambda*lambda, pr.secondAxes[k])
		}
		s.flat = s.flat && s.op[k].z == 0
	}
}

// still lets nothing drive the device but what turns by itself.
func (s *spinLabour) still(p *plan) {
	s.rest, s.flat = axisOf(s.e.static), true
	for len(s.op) < p.controls {
		s.op = append(s.op, axis{})
	}
	s.op = s.op[:p.controls]
	clear(s.op)
	for k := range s.e.controls {
		if s.e.controls[k].channel < 0 {
			s.op[k] = s.e.axes[k]
			s.flat = s.flat && s.op[k].z == 0
		}
	}
}

func (a *axis) add(f float64, b axis) {
	a.cr += f * b.cr
	a.ci += f * b.ci
	a.z += f * b.z
}

func (s *spinLabour) integrate(p *plan, u []complex128) {
	c := column{ar: 1}
	for i := range p.steps {
		st := &p.steps[i]
		h := s.h[:st.order]
		first := true
		for k := range s.op {
			o := s.op[k]
			if o == (axis{}) {
				continue
			}
			numbers := p.numbers[st.at+k*st.order:]
			numbers = numbers[:len(h)]
			if first {
				first = false
				for j, v := range numbers {
					f := v * st.s
					h[j] = axis{f * o.cr, f * o.ci, f * o.z}
				}
				continue
			}
			for j, v := range numbers {
				f := v * st.s
				h[j].cr += f * o.cr
				h[j].ci += f * o.ci
				h[j].z += f * o.z
			}
		}
		if first {
			clear(h)
		}
		h[0].add(st.s, s.rest)
		if s.flat {
			c = s.stepFlat(h, c)
		} else {
			c = s.step(h, c)
		}
	}
	u[0], u[1] = complex(c.ar, c.ai), complex(-c.br, c.bi)
	u[2], u[3] = complex(c.br, c.bi), complex(c.ar, -c.ai)
}

func (s *spinLabour) step(h []axis, c column) column {
	s.back[maxOrder] = c
	for n := range h {
		v := s.back[maxOrder-n:]
		hs := h[:len(v)]
		var pr, pi, qr, qi float64
		for j := range v {
			g, w := &hs[j], &v[j]
			pr += g.cr*w.br + g.ci*w.bi + g.z*w.ar
			pi += g.cr*w.bi - g.ci*w.br + g.z*w.ai
			qr += g.cr*w.ar - g.ci*w.ai - g.z*w.br
			qi += g.cr*w.ai + g.ci*w.ar - g.z*w.bi
		}
		f := s.reciprocal[n+1]
		s.back[maxOrder-n-1] = column{f * pi, -f * pr, f * qi, -f * qr}
	}
	return s.total(len(h))
}

func (s *spinLabour) stepFlat(h []axis, c column) column {
	s.back[maxOrder] = c
	z := h[0].z
	for n := range h {
		v := s.back[maxOrder-n:]
		hs := h[:len(v)]
		pr, pi := z*v[0].ar, z*v[0].ai
		qr, qi := -z*v[0].br, -z*v[0].bi
		for j := range v {
			g, w := &hs[j], &v[j]
			pr += g.cr*w.br + g.ci*w.bi
			pi += g.cr*w.bi - g.ci*w.br
			qr += g.cr*w.ar - g.ci*w.ai
			qi += g.cr*w.ai + g.ci*w.ar
		}
		f := s.reciprocal[n+1]
		s.back[maxOrder-n-1] = column{f * pi, -f * pr, f * qi, -f * qr}
	}
	return s.total(len(h))
}

// total adds the terms of the series at the end of the step, the smallest first.
func (s *spinLabour) total(order int) column {
	var t column
	for _, v := range s.back[maxOrder-order:] {
		t.ar += v.ar
		t.ai += v.ai
		t.br += v.br
		t.bi += v.bi
	}
	return t
}

// defect is how far u is from unitary, |u'u - 1|: what the integration has gathered in rounding and remainders.
func defect(u []complex128, n int) float64 {
	g := make([]complex128, n*n)
	mulAdjointLeft(g, u, u, n)
	for i := range n {
		g[i*n+i] -= 1
	}
	return math.Sqrt(inner(g, g))
}
