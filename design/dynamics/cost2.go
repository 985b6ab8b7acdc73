package dynamics

import "math"

// spinCost is Cost for d = 2, in quaternions: a frame q has the components of
// U = q0 - i q·σ, the Gram matrix of the frames is real, symmetric and 4 x 4, and so
// is the matrix of the backward sum, whatever the number of errors.
//
//	V = v·σ:  (1/T) int U' V U dt = a·σ,  a = G v,  G = (1/T) int Rᵀ dt, linear in the Gram matrix.
type spinCost struct {
	c      *Cost
	static vec // Ω of H = Ω·σ/2
	ctrl   []vec
	c3     Mat // sum_j w_j v_j v_jᵀ
	target quat

	step []spinStep
}

// spinStep is what the forward sweep leaves of a step.
type spinStep struct {
	turn     quat // exp(-i dt H/2)
	mid, end quat
}

// sym4 is a symmetric 4 x 4 matrix, its upper triangle.
type sym4 struct{ ww, wx, wy, wz, xx, xy, xz, yy, yz, zz float64 }

func (m *sym4) apply(q quat) quat {
	return quat{
		m.ww*q.w + m.wx*q.x + m.wy*q.y + m.wz*q.z,
		m.wx*q.w + m.xx*q.x + m.xy*q.y + m.xz*q.z,
		m.wy*q.w + m.xy*q.x + m.yy*q.y + m.yz*q.z,
		m.wz*q.w + m.xz*q.x + m.yz*q.y + m.zz*q.z,
	}
}

// components returns f such that a = trace + f·σ.
func components(a []complex128) vec {
	return vec{(real(a[1]) + real(a[2])) / 2, (imag(a[2]) - imag(a[1])) / 2, (real(a[0]) - real(a[3])) / 2}
}

func newSpinCost(c *Cost) *spinCost {
	s := &spinCost{c: c, static: components(c.Static).times(2)}
	for _, h := range c.Controls {
		s.ctrl = append(s.ctrl, components(h).times(2))
	}
	for j, m := range c.Errors {
		v, w := components(m), c.Weights[j]
		e := [3]float64{v.x, v.y, v.z}
		for i := range 3 {
			for l := range 3 {
				s.c3[3*i+l] += w * e[i] * e[l]
			}
		}
	}
	// |Tr(W' U)| = |2 w·q| with w the real part of W's components once its phase is
	// taken out: W = phase (w0 - i w·σ).
	t := c.Target
	p := [4]complex128{(t[0] + t[3]) / 2, (t[1] + t[2]) / -2i, (t[2] - t[1]) / 2, (t[0] - t[3]) / -2i}
	best := 0
	for i := range p {
		if cabs(p[i]) > cabs(p[best]) {
			best = i
		}
	}
	if r := cabs(p[best]); r > 0 {
		ph := complex(real(p[best])/r, -imag(p[best])/r)
		for i := range p {
			p[i] *= ph
		}
	}
	s.target = quat{real(p[0]), real(p[1]), real(p[2]), real(p[3])}
	s.step = make([]spinStep, c.Steps)
	return s
}

func cabs(z complex128) float64 { return math.Hypot(real(z), imag(z)) }

// halfTurn returns exp(-i w·σ) as a quaternion, and for w² = x the derivatives by x of
// its cosine and of µ = sin|w|/|w|.
func halfTurn(w vec) (q quat, dc, mu, dmu float64) {
	x := w.dot(w)
	var c float64
	if x < 0.04 { // the terms left out are under 1e-17
		c = 1 - x*(1./2-x*(1./24-x*(1./720-x*(1./40320-x*(1./3628800)))))
		mu = 1 - x*(1./6-x*(1./120-x*(1./5040-x*(1./362880-x*(1./39916800)))))
		dmu = -1./6 + x*(1./60-x*(1./1680-x*(1./90720-x*(1./7983360))))
	} else {
		th := math.Sqrt(x)
		var sn float64
		sn, c = math.Sincos(th)
		mu = sn / th
		dmu = (c - mu) / (2 * x)
	}
	return quat{c, mu * w.x, mu * w.y, mu * w.z}, -mu / 2, mu, dmu
}

// field returns w of step i: the half step is exp(-i w·σ), w = dt Ω/4.
func (s *spinCost) field(u []float64) vec {
	f := s.static
	for k, e := range s.ctrl {
		f = f.plus(u[k], e)
	}
	return f.times(s.c.Step / 4)
}

// value is Cost.Value.
func (s *spinCost) value(u, grad []float64) float64 {
	n, nk := s.c.Steps, len(s.ctrl)
	q := quat{w: 1}
	m := sym4{ww: 1}
	last := 2.0
	for i := range s.step {
		t, _, _, _ := halfTurn(s.field(u[i*nk : i*nk+nk]))
		mid := t.mul(q)
		q = t.mul(mid)
		s.step[i] = spinStep{t, mid, q}
		if i == n-1 {
			last = 1
		}
		a, b := 4*mid.w, last*q.w
		m.ww += a*mid.w + b*q.w
		m.wx += a*mid.x + b*q.x
		m.wy += a*mid.y + b*q.y
		m.wz += a*mid.z + b*q.z
		a, b = 4*mid.x, last*q.x
		m.xx += a*mid.x + b*q.x
		m.xy += a*mid.y + b*q.y
		m.xz += a*mid.z + b*q.z
		a, b = 4*mid.y, last*q.y
		m.yy += a*mid.y + b*q.y
		m.yz += a*mid.z + b*q.z
		m.zz += 4*mid.z*mid.z + last*q.z*q.z
	}
	// G = (1/T) int Rᵀ, Simpson's weights dt/6 over N dt
	w := 1 / float64(6*n)
	g := Mat{
		m.ww + m.xx - m.yy - m.zz, 2 * (m.xy + m.wz), 2 * (m.xz - m.wy),
		2 * (m.xy - m.wz), m.ww - m.xx + m.yy - m.zz, 2 * (m.yz + m.wx),
		2 * (m.xz + m.wy), 2 * (m.yz - m.wx), m.ww - m.xx - m.yy + m.zz,
	}
	// ||a·σ||²/2 = |a|²: sum_j w_j |G v_j|² = Tr(G C Gᵀ), its derivative by G is 2 G C
	var gc Mat
	gc.mul(&g, &s.c3)
	f := 0.0
	for i := range g {
		f += g[i] * gc[i] * w * w
		gc[i] *= 2 * w * w
	}
	t := s.target
	tau := t.w*q.w + t.x*q.x + t.y*q.y + t.z*q.z // Tr(W' U)/2, up to a phase
	f += 1 - tau*tau
	if grad == nil {
		return f
	}
	// the derivative by q of a frame of weight 1 is b q
	b := sym4{
		ww: 2 * (gc[0] + gc[4] + gc[8]), xx: 2 * (gc[0] - gc[4] - gc[8]),
		yy: 2 * (gc[4] - gc[0] - gc[8]), zz: 2 * (gc[8] - gc[0] - gc[4]),
		wx: 2 * (gc[5] - gc[7]), wy: 2 * (gc[6] - gc[2]), wz: 2 * (gc[1] - gc[3]),
		xy: 2 * (gc[1] + gc[3]), xz: 2 * (gc[2] + gc[6]), yz: 2 * (gc[5] + gc[7]),
	}
	y := b.apply(q)
	y = quat{y.w - 2*tau*t.w, y.x - 2*tau*t.x, y.y - 2*tau*t.y, y.z - 2*tau*t.z}
	for i := n - 1; i >= 0; i-- {
		st := &s.step[i]
		start := quat{w: 1}
		if i > 0 {
			start = s.step[i-1].end
		}
		// end = turn mid, mid = turn start; back through a product: y to turn' y and
		// y times the other factor's conjugate
		back := quat{st.turn.w, -st.turn.x, -st.turn.y, -st.turn.z}
		dt := y.mul(quat{st.mid.w, -st.mid.x, -st.mid.y, -st.mid.z})
		y = back.mul(y)
		z := b.apply(st.mid)
		y = quat{y.w + 4*z.w, y.x + 4*z.x, y.y + 4*z.y, y.z + 4*z.z}
		e := y.mul(quat{start.w, -start.x, -start.y, -start.z})
		dt = quat{dt.w + e.w, dt.x + e.x, dt.y + e.y, dt.z + e.z}
		y = back.mul(y)
		z = b.apply(start)
		y = quat{y.w + 2*z.w, y.x + 2*z.x, y.y + 2*z.y, y.z + 2*z.z}
		// through the half turn
		v := s.field(u[i*nk : i*nk+nk])
		_, dc, mu, dmu := halfTurn(v)
		d := vec{dt.x, dt.y, dt.z}
		d = d.times(mu).plus(2*(dt.w*dc+dmu*d.dot(v)), v).times(s.c.Step / 4)
		for k, e := range s.ctrl {
			grad[i*nk+k] = d.dot(e)
		}
	}
	return f
}
