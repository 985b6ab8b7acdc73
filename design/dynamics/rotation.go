package dynamics

import "math"

// Vec is a vector in rad/ns, ns or radians, as its user says.
type Vec [3]float64

// Mat is a 3x3 matrix, row by row.
type Mat [9]float64

// Quat is a unit quaternion (q0, q1, q2, q3) standing for q0 - i q·σ.
type Quat [4]float64

// One is the quaternion of the identity.
var One = Quat{1, 0, 0, 0}

// Mul returns the product p q: q acts first.
func (p Quat) Mul(q Quat) Quat {
	return Quat{
		p[0]*q[0] - p[1]*q[1] - p[2]*q[2] - p[3]*q[3],
		p[0]*q[1] + p[1]*q[0] + p[2]*q[3] - p[3]*q[2],
		p[0]*q[2] - p[1]*q[3] + p[2]*q[0] + p[3]*q[1],
		p[0]*q[3] + p[1]*q[2] - p[2]*q[1] + p[3]*q[0],
	}
}

// Conj returns the inverse rotation.
func (p Quat) Conj() Quat { return Quat{p[0], -p[1], -p[2], -p[3]} }

// Turn returns the quaternion of exp(-i w·σ/2): a rotation by |w| about w.
func Turn(w Vec) Quat {
	var t turn
	return t.begin(w)
}

// Rotation returns R of the quaternion.
func (p Quat) Rotation() Mat {
	w, x, y, z := p[0], p[1], p[2], p[3]
	return Mat{
		1 - 2*(y*y+z*z), 2 * (x*y - w*z), 2 * (x*z + w*y),
		2 * (x*y + w*z), 1 - 2*(x*x+z*z), 2 * (y*z - w*x),
		2 * (x*z - w*y), 2 * (y*z + w*x), 1 - 2*(x*x+y*y),
	}
}

// Apply returns m v.
func (m *Mat) Apply(v Vec) Vec {
	return Vec{
		m[0]*v[0] + m[1]*v[1] + m[2]*v[2],
		m[3]*v[0] + m[4]*v[1] + m[5]*v[2],
		m[6]*v[0] + m[7]*v[1] + m[8]*v[2],
	}
}

// mul stores a b in m, which must be neither.
func (m *Mat) mul(a, b *Mat) {
	b0, b1, b2 := b[0], b[1], b[2]
	b3, b4, b5 := b[3], b[4], b[5]
	b6, b7, b8 := b[6], b[7], b[8]
	m[0], m[1], m[2] = a[0]*b0+a[1]*b3+a[2]*b6, a[0]*b1+a[1]*b4+a[2]*b7, a[0]*b2+a[1]*b5+a[2]*b8
	m[3], m[4], m[5] = a[3]*b0+a[4]*b3+a[5]*b6, a[3]*b1+a[4]*b4+a[5]*b7, a[3]*b2+a[4]*b5+a[5]*b8
	m[6], m[7], m[8] = a[6]*b0+a[7]*b3+a[8]*b6, a[6]*b1+a[7]*b4+a[8]*b7, a[6]*b2+a[7]*b5+a[8]*b8
}

// addCross adds [v]x b to m.
func (m *Mat) addCross(v Vec, b *Mat) {
	m[0] += v[1]*b[6] - v[2]*b[3]
	m[1] += v[1]*b[7] - v[2]*b[4]
	m[2] += v[1]*b[8] - v[2]*b[5]
	m[3] += v[2]*b[0] - v[0]*b[6]
	m[4] += v[2]*b[1] - v[0]*b[7]
	m[5] += v[2]*b[2] - v[0]*b[8]
	m[6] += v[0]*b[3] - v[1]*b[0]
	m[7] += v[0]*b[4] - v[1]*b[1]
	m[8] += v[0]*b[5] - v[1]*b[2]
}

func cross(a, b Vec) Vec {
	return Vec{a[1]*b[2] - a[2]*b[1], a[2]*b[0] - a[0]*b[2], a[0]*b[1] - a[1]*b[0]}
}

func dot(a, b Vec) float64 { return a[0]*b[0] + a[1]*b[1] + a[2]*b[2] }

func add(dst *Vec, v Vec) {
	dst[0] += v[0]
	dst[1] += v[1]
	dst[2] += v[2]
}

// A turn holds the two matrix functions of one rotation vector w that a step
// needs, with θ = |w|,
//
//	G(w)      = ∫₀¹ R(s w)ᵀ ds = 1 - α [w]x + β [w]x²   α = (1-cos θ)/θ²   β = (θ-sin θ)/θ³
//	R(w/2)ᵀ   =                  1 - μ [w]x + ν [w]x²   μ = sin(θ/2)/θ     ν = (1-cos(θ/2))/θ²
//
// and the derivatives of α, β, μ, ν by θ, each divided by θ.
type turn struct {
	w                       Vec
	alpha, beta, mu, nu     float64
	dAlpha, dBeta, dMu, dNu float64
	theta2, sin, cos        float64 // θ², and of θ/2 when θ² >= small
	mean, half              Mat     // G and R(w/2)ᵀ
}

// The Taylor series serve below θ = 0.1, where the terms kept reach 1e-16 and the
// closed forms of the derivatives would lose up to eight digits.
const small = 0.01 // θ²

// begin sets w, µ and ν, and returns the quaternion of the rotation.
func (t *turn) begin(w Vec) Quat {
	x := dot(w, w)
	t.w, t.theta2 = w, x
	c := 1.0
	if x < small {
		y := x / 4
		t.mu = (1 - y*(1./6-y*(1./120-y*(1./5040-y*(1./362880))))) / 2
		t.nu = (1./2 - y*(1./24-y*(1./720-y*(1./40320-y*(1./3628800))))) / 4
		c = 1 - t.nu*x
	} else {
		th := math.Sqrt(x)
		var s float64
		s, c = math.Sincos(th / 2)
		t.mu, t.nu = s/th, (1-c)/x
		t.sin, t.cos = s, c
	}
	return Quat{c, t.mu * w[0], t.mu * w[1], t.mu * w[2]}
}

// average sets α, β and G, after begin.
func (t *turn) average() {
	x := t.theta2
	if x < small {
		t.alpha = 1./2 - x*(1./24-x*(1./720-x*(1./40320-x*(1./3628800))))
		t.beta = 1./6 - x*(1./120-x*(1./5040-x*(1./362880-x*(1./39916800))))
	} else {
		th := math.Sqrt(x)
		t.alpha = 2 * t.sin * t.sin / x
		t.beta = (th - 2*t.sin*t.cos) / (x * th)
	}
	t.mean = bend(t.w, x, t.alpha, t.beta)
}

// slopes sets the derivatives of α, β, µ and ν, after average.
func (t *turn) slopes() {
	x := t.theta2
	if x < small {
		t.dAlpha = -1./12 + x*(1./180-x*(1./6720-x*(1./453600)))
		t.dBeta = -1./60 + x*(1./1260-x*(1./60480-x*(1./4989600)))
		y := x / 4
		t.dMu = (-1./3 + y*(1./30-y*(1./840-y*(1./45360)))) / 8
		t.dNu = (-1./12 + y*(1./180-y*(1./6720-y*(1./453600)))) / 16
		return
	}
	ix := 1 / x
	t.dAlpha = (2*t.mu*t.cos - 2*t.alpha) * ix
	t.dBeta = (t.alpha - 3*t.beta) * ix
	t.dMu = (t.cos/2 - t.mu) * ix
	t.dNu = (t.mu/2 - 2*t.nu) * ix
}

// bend returns 1 - p [w]x + q [w]x², x = |w|².
func bend(w Vec, x, p, q float64) Mat {
	d := 1 - q*x
	xy, xz, yz := q*w[0]*w[1], q*w[0]*w[2], q*w[1]*w[2]
	px, py, pz := p*w[0], p*w[1], p*w[2]
	return Mat{
		d + q*w[0]*w[0], xy + pz, xz - py,
		xy - pz, d + q*w[1]*w[1], yz + px,
		xz + py, yz - px, d + q*w[2]*w[2],
	}
}

// addBendSlope adds f times the derivative by w of (1 - p [w]x + q [w]x²) v,
// dp and dq being the derivatives of p and q by θ over θ:
//
//	p [v]x + q ( (w·v) + w vᵀ - 2 v wᵀ ) + ( dq w×(w×v) - dp w×v ) wᵀ.
func (t *turn) addBendSlope(m *Mat, f, p, q, dp, dq float64, v Vec) {
	w := t.w
	wv := dot(w, v)
	c := cross(w, v)
	p, q = f*p, f*q
	dp, dq = f*dp, f*dq
	// w×(w×v) = w (w·v) - v θ²; gather the vectors that multiply wᵀ
	r0 := dq*(w[0]*wv-v[0]*t.theta2) - dp*c[0] - 2*q*v[0]
	r1 := dq*(w[1]*wv-v[1]*t.theta2) - dp*c[1] - 2*q*v[1]
	r2 := dq*(w[2]*wv-v[2]*t.theta2) - dp*c[2] - 2*q*v[2]
	d := q * wv
	q0, q1, q2 := q*v[0], q*v[1], q*v[2]
	m[0] += d + w[0]*q0 + r0*w[0]
	m[1] += w[0]*q1 + r0*w[1] - p*v[2]
	m[2] += w[0]*q2 + r0*w[2] + p*v[1]
	m[3] += w[1]*q0 + r1*w[0] + p*v[2]
	m[4] += d + w[1]*q1 + r1*w[1]
	m[5] += w[1]*q2 + r1*w[2] - p*v[0]
	m[6] += w[2]*q0 + r2*w[0] - p*v[1]
	m[7] += w[2]*q1 + r2*w[1] + p*v[0]
	m[8] += d + w[2]*q2 + r2*w[2]
}

// slope stores in m the derivative by w of h G v + R(w/2)ᵀ bow.
func (t *turn) slope(m *Mat, h float64, v, bow Vec) {
	*m = Mat{}
	t.addBendSlope(m, h, t.alpha, t.beta, t.dAlpha, t.dBeta, v)
	t.addBendSlope(m, 1, t.mu, t.nu, t.dMu, t.dNu, bow)
}

// toggled returns h G v + R(w/2)ᵀ bow: the toggled integral of an error of mean
// v over one step, in the frame of the step's start.
func (t *turn) toggled(h float64, v, bow Vec) Vec {
	g, k := t.mean.Apply(v), t.half.Apply(bow)
	return Vec{h*g[0] + k[0], h*g[1] + k[1], h*g[2] + k[2]}
}
