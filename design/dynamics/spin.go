package dynamics

// A Spin is one spin driven by K controls on a fixed grid of steps. The field
// at a node is Static + sum_k u_k Axes[k], in rad/ns.
//
// The exported fields are set once; Reset sizes the working memory, after which
// Run and Derive allocate nothing. A Spin serves one goroutine.
type Spin struct {
	Static Vec       // rad/ns
	Axes   []Vec     // one per control, rad/ns per unit of control
	Steps  []float64 // ns; nodes 2j and 2j+1 are the Gauss nodes of step j

	// Errors act in the steps First <= j < Last, the gate's window.
	First, Last int

	// Held are the static errors whose toggled integrals are wanted: V = Held[i]·σ.
	Held []Vec
	// Gains are the control-borne errors: V(t) = sum_k Gains[i][k] u_k(t) Axes[k]·σ.
	Gains [][]float64

	// Results of Run.
	Gate   Quat  // of the whole grid, first step to last
	Toggle []Vec // ∫ Rᵀ V dt over the window for Held, then Gains, in the frame of the grid's start

	step []stepData
}

type stepData struct {
	a, b       Vec             // fields at the nodes
	d          Vec             // (√3/12) h² (b - a)
	back       Mat             // Rᵀ before the step: from the step's frame to that of the grid's start
	turn       turn            // of the step's rotation vector
	own        [MaxToggles]Vec // the step's own share of Toggle, in the frame of the grid's start
	mean, diff [MaxToggles]Vec // of the control-borne errors at the two nodes
}

// MaxToggles bounds the static and control-borne errors of one Spin together.
const MaxToggles = 8

const gauss = 0.14433756729740643 // √3/12

// GaussNodes are the two Gauss-Legendre nodes of a step of unit length.
var GaussNodes = [2]float64{0.5 - 0.28867513459481287, 0.5 + 0.28867513459481287}

// Reset sizes the working memory for the exported fields. It panics when there
// are more than MaxToggles errors or the window leaves the grid: both are
// mistakes of the caller.
func (s *Spin) Reset() {
	n := len(s.Held) + len(s.Gains)
	if n > MaxToggles {
		panic("dynamics: too many toggled errors for one Spin")
	}
	if s.First < 0 || s.Last > len(s.Steps) || s.First > s.Last {
		panic("dynamics: window outside the grid")
	}
	s.step = make([]stepData, len(s.Steps))
	s.Toggle = make([]Vec, n)
}

// Run propagates. The controls u run node by node for one control after the
// other, u[k*nodes+node] with nodes = 2 len(Steps); offset is added
// to the static field and scale multiplies every control, both inside the
// window only: the finite errors of an ensemble. Toggled integrals are meant
// for offset 0 and scale 1.
func (s *Spin) Run(u []float64, offset Vec, scale float64) {
	nodes := 2 * len(s.Steps)
	q := One
	nh := len(s.Held)
	clear(s.Toggle)
	for j, h := range s.Steps {
		st := &s.step[j]
		a := s.Static
		inside := j >= s.First && j < s.Last
		gain := 1.0
		if inside {
			gain = scale
			add(&a, offset)
		}
		b := a
		for k := range s.Axes {
			e := &s.Axes[k]
			ga, gb := gain*u[k*nodes+2*j], gain*u[k*nodes+2*j+1]
			a[0] += ga * e[0]
			a[1] += ga * e[1]
			a[2] += ga * e[2]
			b[0] += gb * e[0]
			b[1] += gb * e[1]
			b[2] += gb * e[2]
		}
		g := gauss * h * h
		c := cross(a, b)
		w := Vec{h*(a[0]+b[0])/2 - g*c[0], h*(a[1]+b[1])/2 - g*c[1], h*(a[2]+b[2])/2 - g*c[2]}
		st.a, st.b = a, b
		st.d = Vec{g * (b[0] - a[0]), g * (b[1] - a[1]), g * (b[2] - a[2])}
		st.back = q.Conj().Rotation()
		t := &st.turn
		next := t.begin(w)
		if inside && len(s.Toggle) > 0 {
			t.average()
			t.half = bend(w, t.theta2, t.mu, t.nu)
			for i, v := range s.Held {
				st.own[i] = st.back.Apply(t.toggled(h, v, cross(st.d, v)))
				add(&s.Toggle[i], st.own[i])
			}
			for i, gains := range s.Gains {
				st.mean[i], st.diff[i] = s.borne(gains, u, j)
				st.own[nh+i] = st.back.Apply(t.toggled(h, st.mean[i], st.bow(g, i)))
				add(&s.Toggle[nh+i], st.own[nh+i])
			}
		}
		q = next.Mul(q)
	}
	s.Gate = q
}

// borne returns the mean of a control-borne error over the two nodes and the
// difference over step j, later minus earlier.
func (s *Spin) borne(gains, u []float64, j int) (mean, diff Vec) {
	nodes := 2 * len(s.Steps)
	for k := range s.Axes {
		e := &s.Axes[k]
		ua, ub := u[k*nodes+2*j], u[k*nodes+2*j+1]
		m, f := gains[k]*(ua+ub)/2, gains[k]*(ub-ua)
		mean[0] += m * e[0]
		mean[1] += m * e[1]
		mean[2] += m * e[2]
		diff[0] += f * e[0]
		diff[1] += f * e[1]
		diff[2] += f * e[2]
	}
	return mean, diff
}

// bow returns, for control-borne error i, what multiplies R(w/2)ᵀ in the
// toggled integral of the step: d × mean - g (a+b)/2 × diff.
func (st *stepData) bow(g float64, i int) Vec {
	x := cross(st.d, st.mean[i])
	f := Vec{g * (st.a[0] + st.b[0]) / 2, g * (st.a[1] + st.b[1]) / 2, g * (st.a[2] + st.b[2]) / 2}
	y := cross(f, st.diff[i])
	return Vec{x[0] - y[0], x[1] - y[1], x[2] - y[2]}
}

// Derive fills the derivatives of the last Run with respect to every node
// control (the scale of that Run must be passed again). Each row of gate and
// toggle runs over the nodes and controls like u:
//
//	gate[i][k*nodes+node]      component i of the generator δ: U -> U exp(-i δ·σ/2), in the frame of the grid's start
//	toggle[3e+i][k*nodes+node] derivative of component i of Toggle[e]
//
// toggle may be nil.
func (s *Spin) Derive(scale float64, gate [3][]float64, toggle [][]float64) {
	nodes := 2 * len(s.Steps)
	nh, ne := len(s.Held), len(s.Toggle)
	if toggle == nil {
		ne = 0
	}
	var rest [MaxToggles]Vec                 // the shares of all later steps
	var byW, byD [MaxToggles]Mat             // derivatives of a share, by w (with the turn of all later steps) and by d
	var toStart, halfToStart Mat             // Rᵀ G, Rᵀ R(w/2)ᵀ
	for j := len(s.Steps) - 1; j >= 0; j-- { // backwards: rest grows
		h := s.Steps[j]
		st := &s.step[j]
		t := &st.turn
		g := gauss * h * h
		inside := j >= s.First && j < s.Last
		gain := 1.0
		if inside {
			gain = scale
		}
		if !inside || len(s.Toggle) == 0 {
			t.average()
		}
		toStart.mul(&st.back, &t.mean)
		toggling := ne > 0 && j < s.Last
		if toggling {
			if inside {
				t.slopes()
				halfToStart.mul(&st.back, &t.half)
			}
			for i := range ne {
				if !inside { // before the window: the whole integral turns
					byW[i], byD[i] = Mat{}, Mat{}
				} else {
					var slope Mat
					v := Vec{}
					if i < nh {
						v = s.Held[i]
						t.slope(&slope, h, v, cross(st.d, v))
					} else {
						v = st.mean[i-nh]
						t.slope(&slope, h, v, st.bow(g, i-nh))
					}
					byW[i].mul(&st.back, &slope)
					// R(w/2)ᵀ (dd × v) = -R(w/2)ᵀ [v]x dd
					m := Mat{0, v[2], -v[1], -v[2], 0, v[0], v[1], -v[0], 0}
					byD[i].mul(&halfToStart, &m)
				}
				byW[i].addCross(rest[i], &toStart)
			}
		}
		for node := range 2 {
			other, sign := &st.b, -1.0
			if node == 1 {
				other, sign = &st.a, 1.0
			}
			for k := range s.Axes {
				col := k*nodes + 2*j + node
				e := s.Axes[k]
				axis := Vec{gain * e[0], gain * e[1], gain * e[2]}
				// w = h(a+b)/2 - g a×b, so da gives -g da×b and db gives +g db×a
				c := cross(axis, *other)
				gs := g * sign
				dw := Vec{h/2*axis[0] + gs*c[0], h/2*axis[1] + gs*c[1], h/2*axis[2] + gs*c[2]}
				delta := toStart.Apply(dw)
				gate[0][col], gate[1][col], gate[2][col] = delta[0], delta[1], delta[2]
				if ne == 0 {
					continue
				}
				if !toggling {
					for r := range 3 * ne {
						toggle[r][col] = 0
					}
					continue
				}
				dd := Vec{gs * axis[0], gs * axis[1], gs * axis[2]}
				for i := range ne {
					p, q := byW[i].Apply(dw), byD[i].Apply(dd)
					if i >= nh && inside {
						r := s.ownDrive(st, &toStart, &halfToStart, h, g, sign, i-nh, k, axis)
						q[0], q[1], q[2] = q[0]+r[0], q[1]+r[1], q[2]+r[2]
					}
					toggle[3*i][col], toggle[3*i+1][col], toggle[3*i+2][col] = p[0]+q[0], p[1]+q[1], p[2]+q[2]
				}
			}
		}
		if inside {
			for i := range ne {
				add(&rest[i], st.own[i])
			}
		}
	}
}

// ownDrive is what the derivative of a control-borne error's share has beyond
// that of a static one: the error itself moves with control k (its mean by
// half, its difference by sign), and so does the field that multiplies its
// difference.
func (s *Spin) ownDrive(st *stepData, toStart, halfToStart *Mat, h, g, sign float64, i, k int, axis Vec) Vec {
	gk := s.Gains[i][k]
	e := s.Axes[k]
	dm := Vec{gk * e[0] / 2, gk * e[1] / 2, gk * e[2] / 2}
	df := Vec{g * sign * gk * e[0], g * sign * gk * e[1], g * sign * gk * e[2]}
	field := Vec{(st.a[0] + st.b[0]) / 2, (st.a[1] + st.b[1]) / 2, (st.a[2] + st.b[2]) / 2}
	half := Vec{g * axis[0] / 2, g * axis[1] / 2, g * axis[2] / 2}
	x, y, z := cross(st.d, dm), cross(half, st.diff[i]), cross(field, df)
	p := halfToStart.Apply(Vec{x[0] - y[0] - z[0], x[1] - y[1] - z[1], x[2] - y[2] - z[2]})
	q := toStart.Apply(dm)
	return Vec{p[0] + h*q[0], p[1] + h*q[1], p[2] + h*q[2]}
}
