package dynamics

import "math"

// Vec is a vector in rad/ns, ns or radians, as its user says.
type Vec [3]float64

// Mat is a 3x3 matrix, row by row.
type Mat [9]float64

// Quat is a unit quaternion (q0, q1, q2, q3) standing for q0 - i q·σ.
type Quat [4]float64

// vec and quat are Vec and Quat inside the loops: the compiler keeps the fields of
// small structs in registers, and arrays in memory.
type (
	vec  struct{ x, y, z float64 }
	quat struct{ w, x, y, z float64 }
)

func (v Vec) vec() vec { return vec{v[0], v[1], v[2]} }
func (v vec) pub() Vec { return Vec{v.x, v.y, v.z} }

func (v vec) add(u vec) vec             { return vec{v.x + u.x, v.y + u.y, v.z + u.z} }
func (v vec) plus(f float64, u vec) vec { return vec{v.x + f*u.x, v.y + f*u.y, v.z + f*u.z} }
func (v vec) times(f float64) vec       { return vec{f * v.x, f * v.y, f * v.z} }
func (v vec) dot(u vec) float64         { return v.x*u.x + v.y*u.y + v.z*u.z }
func (v vec) cross(u vec) vec {
	return vec{v.y*u.z - v.z*u.y, v.z*u.x - v.x*u.z, v.x*u.y - v.y*u.x}
}

func (p quat) mul(q quat) quat {
	return quat{
		p.w*q.w - p.x*q.x - p.y*q.y - p.z*q.z,
		p.w*q.x + p.x*q.w + p.y*q.z - p.z*q.y,
		p.w*q.y - p.x*q.z + p.y*q.w + p.z*q.x,
		p.w*q.z + p.x*q.y - p.y*q.x + p.z*q.w,
	}
}

// back stores Rᵀ of the quaternion in m.
func (p quat) back(m *Mat) {
	xx, yy, zz := p.x*p.x, p.y*p.y, p.z*p.z
	xy, xz, yz := p.x*p.y, p.x*p.z, p.y*p.z
	wx, wy, wz := p.w*p.x, p.w*p.y, p.w*p.z
	m[0], m[1], m[2] = 1-2*(yy+zz), 2*(xy+wz), 2*(xz-wy)
	m[3], m[4], m[5] = 2*(xy-wz), 1-2*(xx+zz), 2*(yz+wx)
	m[6], m[7], m[8] = 2*(xz+wy), 2*(yz-wx), 1-2*(xx+yy)
}

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
	var t arc
	q := t.begin(w.vec())
	return Quat{q.w, q.x, q.y, q.z}
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

func (m *Mat) apply(v vec) vec {
	return vec{
		m[0]*v.x + m[1]*v.y + m[2]*v.z,
		m[3]*v.x + m[4]*v.y + m[5]*v.z,
		m[6]*v.x + m[7]*v.y + m[8]*v.z,
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
func (m *Mat) addCross(v vec, b *Mat) {
	m[0] += v.y*b[6] - v.z*b[3]
	m[1] += v.y*b[7] - v.z*b[4]
	m[2] += v.y*b[8] - v.z*b[5]
	m[3] += v.z*b[0] - v.x*b[6]
	m[4] += v.z*b[1] - v.x*b[7]
	m[5] += v.z*b[2] - v.x*b[8]
	m[6] += v.x*b[3] - v.y*b[0]
	m[7] += v.x*b[4] - v.y*b[1]
	m[8] += v.x*b[5] - v.y*b[2]
}

// An arc is one rotation vector w with what its quaternion needs, θ = |w|:
//
//	µ = sin(θ/2)/θ        ν = (1-cos(θ/2))/θ²
type arc struct {
	w        vec
	mu, nu   float64
	theta2   float64 // θ²
	sin, cos float64 // of θ/2, when θ² >= small
}

// A turn is an arc with the two matrix functions that a step needs,
//
//	G(w)      = ∫₀¹ R(s w)ᵀ ds = 1 - α [w]x + β [w]x²   α = (1-cos θ)/θ²   β = (θ-sin θ)/θ³
//	R(w/2)ᵀ   =                  1 - µ [w]x + ν [w]x²
//
// and the derivatives of α, β, µ, ν by θ, each divided by θ.
type turn struct {
	arc
	alpha, beta             float64
	dAlpha, dBeta, dMu, dNu float64
	mean, half              Mat // G and R(w/2)ᵀ
}

// The Taylor series serve below θ = 0.1, where the terms kept reach 1e-16 and the
// closed forms of the derivatives would lose up to eight digits.
const small = 0.01 // θ²

// begin sets w, µ and ν, and returns the quaternion of the rotation.
func (t *arc) begin(w vec) quat {
	x := w.dot(w)
	t.w, t.theta2 = w, x
	var c, mu, nu float64
	if x < small {
		y := x / 4
		mu = (1 - y*(1./6-y*(1./120-y*(1./5040-y*(1./362880))))) / 2
		nu = (1./2 - y*(1./24-y*(1./720-y*(1./40320-y*(1./3628800))))) / 4
		c = 1 - nu*x
	} else {
		th := math.Sqrt(x)
		var s float64
		s, c = math.Sincos(th / 2)
		mu, nu = s/th, (1-c)/x
		t.sin, t.cos = s, c
	}
	t.mu, t.nu = mu, nu
	return quat{c, mu * w.x, mu * w.y, mu * w.z}
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
	bend(&t.mean, t.w, x, t.alpha, t.beta)
}

// halfway sets R(w/2)ᵀ, after begin.
func (t *turn) halfway() { bend(&t.half, t.w, t.theta2, t.mu, t.nu) }

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

// bend stores 1 - p [w]x + q [w]x² in m, x = |w|².
func bend(m *Mat, w vec, x, p, q float64) {
	d := 1 - q*x
	qx, qy := q*w.x, q*w.y
	xy, xz, yz := qx*w.y, qx*w.z, qy*w.z
	px, py, pz := p*w.x, p*w.y, p*w.z
	m[0], m[1], m[2] = d+qx*w.x, xy+pz, xz-py
	m[3], m[4], m[5] = xy-pz, d+qy*w.y, yz+px
	m[6], m[7], m[8] = xz+py, yz-px, d+q*w.z*w.z
}

// addBendSlope adds f times the derivative by w of (1 - p [w]x + q [w]x²) v,
// dp and dq being the derivatives of p and q by θ over θ:
//
//	p [v]x + q ( (w·v) + w vᵀ - 2 v wᵀ ) + ( dq w×(w×v) - dp w×v ) wᵀ.
func (t *turn) addBendSlope(m *Mat, f, p, q, dp, dq float64, v vec) {
	w := t.w
	wv := w.dot(v)
	c := w.cross(v)
	p, q, dp, dq = f*p, f*q, f*dp, f*dq
	// w×(w×v) = w (w·v) - v θ²; gather the vectors that multiply wᵀ
	r := w.times(dq*wv).plus(-dq*t.theta2-2*q, v).plus(-dp, c)
	d := q * wv
	qv := v.times(q)
	m[0] += d + w.x*qv.x + r.x*w.x
	m[1] += w.x*qv.y + r.x*w.y - p*v.z
	m[2] += w.x*qv.z + r.x*w.z + p*v.y
	m[3] += w.y*qv.x + r.y*w.x + p*v.z
	m[4] += d + w.y*qv.y + r.y*w.y
	m[5] += w.y*qv.z + r.y*w.z - p*v.x
	m[6] += w.z*qv.x + r.z*w.x - p*v.y
	m[7] += w.z*qv.y + r.z*w.y + p*v.x
	m[8] += d + w.z*qv.z + r.z*w.z
}

// slope stores in m the derivative by w of h G v + R(w/2)ᵀ bow.
func (t *turn) slope(m *Mat, h float64, v, bow vec) {
	*m = Mat{}
	t.addBendSlope(m, h, t.alpha, t.beta, t.dAlpha, t.dBeta, v)
	t.addBendSlope(m, 1, t.mu, t.nu, t.dMu, t.dNu, bow)
}

// toggled returns h G v + R(w/2)ᵀ bow: the toggled integral of an error of mean
// v over one step, in the frame of the step's start.
func (t *turn) toggled(h float64, v, bow vec) vec {
	return t.half.apply(bow).plus(h, t.mean.apply(v))
}
