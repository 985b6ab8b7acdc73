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
	mid, end quat
	w        vec     // exp(-i dt H/2) = exp(-i w·σ)
	cos, mu  float64 // cos|w| and sin|w|/|w|
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

// halfTurn returns cos|w| and sin|w|/|w| for w² = x.
func halfTurn(x float64) (c, mu float64) {
	if x < 0.02 { // the terms left out are under 3e-18
		c = 1 - x*(1./2-x*(1./24-x*(1./720-x*(1./40320-x*(1./3628800)))))
		mu = 1 - x*(1./6-x*(1./120-x*(1./5040-x*(1./362880-x*(1./39916800)))))
		return c, mu
	}
	th := math.Sqrt(x)
	s, c := math.Sincos(th)
	return c, s / th
}

// value is Cost.Value.
func (s *spinCost) value(u, grad []float64) float64 {
	n, nk := s.c.Steps, len(s.ctrl)
	q := quat{w: 1}
	m := sym4{ww: 1}
	last := 2.0
	for i := range s.step {
		w := s.static
		for k, x := range u[i*nk : i*nk+nk] {
			w = w.plus(x, s.ctrl[k])
		}
		w = w.times(s.c.Step / 4)
		c, mu := halfTurn(w.dot(w))
		t := quat{c, mu * w.x, mu * w.y, mu * w.z}
		mid := t.mul(q)
		q = t.mul(mid)
		st := &s.step[i]
		st.mid, st.end, st.w, st.cos, st.mu = mid, q, w, c, mu
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
	// K as a vector: turning a frame by exp(-i δ·σ) on the left changes F by k·δ. A half
	// turn exp(-i w·σ) takes it back by its Rᵀ, and moves by δ = J dw when w does:
	//
	//	Rᵀ k = k - 2cµ w×k + 2µ² w×(w×k)
	//	Jᵀ k = k -  µ² w×k +  β w×(w×k),   β = (1-cµ)/w²
	k := cotangent(quat{-2 * tau * t.w, -2 * tau * t.x, -2 * tau * t.y, -2 * tau * t.z}, q).plus(1, b.source(q))
	for i := n - 1; i >= 0; i-- {
		st := &s.step[i]
		c, mu, w := st.cos, st.mu, st.w
		beta := 2. / 3
		if x := w.dot(w); x > 1e-30 {
			beta = (1 - c*mu) / x
		}
		mm := mu * mu
		sum := k
		p := w.cross(k)
		r := w.cross(p)
		k = k.plus(-2*c*mu, p).plus(2*mm, r).plus(4, b.source(st.mid))
		sum = sum.add(k)
		p1 := w.cross(k)
		r1 := w.cross(p1)
		k = k.plus(-2*c*mu, p1).plus(2*mm, r1)
		if i > 0 {
			k = k.plus(2, b.source(s.step[i-1].end))
		}
		sum = sum.plus(-mm, p.add(p1)).plus(beta, r.add(r1)).times(s.c.Step / 4)
		at := grad[i*nk : i*nk+nk]
		for k, e := range s.ctrl {
			at[k] = sum.dot(e)
		}
	}
	return f
}

// cotangent is the vector K of a frame q whose derivative is y: that of y conj(q).
func cotangent(y, q quat) vec {
	return vec{
		q.w*y.x - y.w*q.x - y.y*q.z + y.z*q.y,
		q.w*y.y - y.w*q.y - y.z*q.x + y.x*q.z,
		q.w*y.z - y.w*q.z - y.x*q.y + y.y*q.x,
	}
}

// source is the vector K of a frame of weight 1 in the averages.
func (m *sym4) source(q quat) vec { return cotangent(m.apply(q), q) }
