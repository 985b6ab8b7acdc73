package replay

import "math"

// A labour is the scratch of one goroutine that integrates U' = -i H U along plans.
type labour struct {
	e *engine

	window, half, whole []complex128 // Dim x Dim
	block, gram         []complex128 // on the code space

	spin   *spinLabour // two levels
	series [][]complex128
	sums   []complex128
	lambda complex128
	extra  sparse
	ops    []sparse // of every control with this gate's error
	op     []complex128
	own    []sparse // memory of those that the error changes
}

func newLabour(e *engine) *labour {
	n, d := e.dim, len(e.m.CodeSpace)
	l := &labour{
		e: e, window: make([]complex128, n*n), half: make([]complex128, n*n), whole: make([]complex128, n*n),
		block: make([]complex128, d*d), gram: make([]complex128, d*d),
	}
	if n == 2 {
		l.spin = newSpinLabour(e)
		return l
	}
	l.series = make([][]complex128, maxOrder+1)
	for i := range l.series {
		l.series[i] = make([]complex128, n*n)
	}
	l.sums, l.op = make([]complex128, n*n), make([]complex128, n*n)
	return l
}

// integrate sets u to the evolution along p with error lambda times pr; pr may be nil.
func (l *labour) integrate(p *plan, pr *probe, lambda float64, u []complex128) {
	if l.spin != nil {
		l.spin.choose(p, pr, lambda)
		l.spin.integrate(p, u)
		return
	}
	l.extra, l.lambda = nil, complex(lambda, 0)
	if pr != nil && pr.static != nil {
		l.extra = sparsely(pr.static, l.e.dim)
	}
	l.choose(p, pr, lambda)
	setIdentity(u, l.e.dim)
	for i := range p.steps {
		l.step(p, &p.steps[i], u)
	}
}

// choose makes the operators of every control of p with error lambda times pr.
func (l *labour) choose(p *plan, pr *probe, lambda float64) {
	for len(l.ops) < p.controls {
		l.ops, l.own = append(l.ops, nil), append(l.own, nil)
	}
	for k := range p.controls {
		l.ops[k] = nil
		if k < len(l.e.controls) {
			l.ops[k] = l.e.controls[k].elements
		}
		if pr == nil || pr.first == nil || pr.first[k] == nil && pr.second[k] == nil {
			continue
		}
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
		l.own[k] = appendSparse(l.own[k][:0], l.op, l.e.dim)
		l.ops[k] = l.own[k]
	}
}

// undriven sets u to the static evolution over the length of p.
func (l *labour) undriven(p *plan, u []complex128) {
	if l.spin != nil {
		l.spin.still(p)
		l.spin.integrate(p, u)
		return
	}
	l.extra, l.ops, l.own = nil, make([]sparse, p.controls), make([]sparse, p.controls)
	setIdentity(u, l.e.dim)
	for i := range p.steps {
		l.step(p, &p.steps[i], u)
	}
}

// step multiplies the evolution of one step into u, for any number of levels: the recurrence of plan.go with one product by a
// (usually sparse) operator for each control and order.
func (l *labour) step(p *plan, st *timeStep, u []complex128) {
	n, e := l.e.dim, l.e
	copy(l.series[0], u)
	for o := range st.order {
		next := l.series[o+1]
		clear(next)
		f := complex(0, -1/float64(o+1)) // -i/(n+1)
		fs := f * complex(st.s, 0)
		apply(next, e.elements, l.series[o], fs, n)
		if l.extra != nil {
			apply(next, l.extra, l.series[o], fs*l.lambda, n)
		}
		for k := range p.controls {
			if len(l.ops[k]) == 0 {
				continue
			}
			h := p.numbers[st.at+k*st.order : st.at+(k+1)*st.order]
			clear(l.sums)
			some := false
			for j := 0; j <= o; j++ {
				if h[j] == 0 {
					continue
				}
				some = true
				v := h[j]
				for i, z := range l.series[o-j] {
					l.sums[i] += complex(v*real(z), v*imag(z))
				}
			}
			if some {
				apply(next, l.ops[k], l.sums, fs, n)
			}
		}
	}
	clear(u)
	for o := st.order; o >= 0; o-- { // the smallest first
		for i, z := range l.series[o] {
			u[i] += z
		}
	}
}

// apply adds f a b to dst.
func apply(dst []complex128, a sparse, b []complex128, f complex128, n int) {
	for _, el := range a {
		v := f * el.v
		row, out := b[el.j*n:(el.j+1)*n], dst[el.i*n:(el.i+1)*n]
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

// still lets nothing drive the device.
func (s *spinLabour) still(p *plan) {
	s.rest, s.flat = axisOf(s.e.static), true
	for len(s.op) < p.controls {
		s.op = append(s.op, axis{})
	}
	s.op = s.op[:p.controls]
	clear(s.op)
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
