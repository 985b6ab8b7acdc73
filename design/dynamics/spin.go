package dynamics

// A Spin is one spin driven by K controls on a fixed grid of steps. The field
// at a node is
//
//	Static + sum_k ( u_k Axes[k] + u_k² Shifts[k] ),   rad/ns.
//
// The exported fields are set once; Reset sizes the working memory, after which
// Run and Derive allocate nothing. A Spin serves one goroutine.
type Spin struct {
	Static Vec       // rad/ns
	Axes   []Vec     // one per control, rad/ns per unit of control
	Shifts []Vec     // what the square of a control adds, rad/ns; nil for none
	Steps  []float64 // ns; nodes 2j and 2j+1 are the Gauss nodes of step j

	// Errors act in the steps First <= j < Last, the gate's window.
	First, Last int

	// Held are the static errors whose toggled integrals are wanted: V = Held[i]·σ.
	Held []Vec
	// Borne are the control-borne errors, V(t) = sum_k v_k(t) (Axes[k] + 2 u_k
	// Shifts[k])·σ: what the field gains when the controls move along v, which is
	// laid out like them. An amplitude error is the controls themselves; another
	// one may be their derivative by a parameter of the line.
	Borne [][]float64

	// Results of Run.
	Gate   Quat  // of the whole grid, first step to last
	Toggle []Vec // ∫ Rᵀ V dt over the window for Held, then Borne, in the frame of the grid's start

	static vec
	axes   []vec
	shifts []vec // 2 Shifts; nil for none
	held   []vec
	step   []stepData
	share  []share // empty without errors
}

// stepData is what Run leaves of a step for Derive.
type stepData struct {
	a, b vec // fields at the nodes
	back Mat // Rᵀ before the step: from the step's frame to that of the grid's start
	arc
}

// share is what Run leaves of a step in which errors are toggled.
type share struct {
	own        [MaxToggles]vec // the step's own share of Toggle, in the frame of the grid's start
	mean, diff [MaxToggles]vec // of the control-borne errors at the two nodes
}

// MaxToggles bounds the static and control-borne errors of one Spin together.
const MaxToggles = 24

const gauss = 0.14433756729740643 // √3/12

// GaussNodes are the two Gauss-Legendre nodes of a step of unit length.
var GaussNodes = [2]float64{0.5 - 0.28867513459481287, 0.5 + 0.28867513459481287}

// Reset takes the exported fields over and sizes the working memory. It panics
// when there are more than MaxToggles errors or the window leaves the grid: both
// are mistakes of the caller.
func (s *Spin) Reset() {
	n := len(s.Held) + len(s.Borne)
	if n > MaxToggles {
		panic("dynamics: too many toggled errors for one Spin")
	}
	if s.First < 0 || s.Last > len(s.Steps) || s.First > s.Last {
		panic("dynamics: window outside the grid")
	}
	s.static = s.Static.vec()
	s.axes, s.shifts, s.held = nil, nil, nil
	for _, e := range s.Shifts {
		s.shifts = append(s.shifts, e.vec().times(2))
	}
	for _, e := range s.Axes {
		s.axes = append(s.axes, e.vec())
	}
	for _, v := range s.Held {
		s.held = append(s.held, v.vec())
	}
	s.step = make([]stepData, len(s.Steps))
	s.Toggle = make([]Vec, n)
	s.share = nil
	if n > 0 {
		s.share = make([]share, len(s.Steps))
	}
}

// Run propagates. The controls u run node by node for one control after the
// other, u[k*nodes+node] with nodes = 2 len(Steps); offset is added to the static
// field inside the window only: a finite error.
func (s *Spin) Run(u []float64, offset Vec) {
	nodes := 2 * len(s.Steps)
	q := quat{w: 1}
	nh := len(s.held)
	off := offset.vec()
	var t turn
	var sum [MaxToggles]vec
	for j, h := range s.Steps {
		st := &s.step[j]
		a := s.static
		inside := j >= s.First && j < s.Last
		if inside {
			a = a.add(off)
		}
		b := a
		for k, e := range s.axes {
			at := k*nodes + 2*j
			a = a.plus(u[at], e)
			b = b.plus(u[at+1], e)
			if s.shifts != nil {
				a = a.plus(u[at]*u[at]/2, s.shifts[k])
				b = b.plus(u[at+1]*u[at+1]/2, s.shifts[k])
			}
		}
		g := gauss * h * h
		w := a.add(b).times(h/2).plus(-g, a.cross(b))
		st.a, st.b = a, b
		q.back(&st.back)
		next := st.begin(w)
		if inside && len(s.share) > 0 {
			t.arc = st.arc
			t.average()
			t.halfway()
			d := b.plus(-1, a).times(g)
			sh := &s.share[j]
			for i, v := range s.held {
				own := st.back.apply(t.toggled(h, v, d.cross(v)))
				sh.own[i] = own
				sum[i] = sum[i].add(own)
			}
			for i, v := range s.Borne {
				mean, diff := s.borne(u, v, j)
				sh.mean[i], sh.diff[i] = mean, diff
				own := st.back.apply(t.toggled(h, mean, st.bow(g, mean, diff)))
				sh.own[nh+i] = own
				sum[nh+i] = sum[nh+i].add(own)
			}
		}
		q = next.mul(q)
	}
	s.Gate = Quat{q.w, q.x, q.y, q.z}
	for i := range s.Toggle {
		s.Toggle[i] = sum[i].pub()
	}
}

// borne returns the mean of a control-borne error over the two nodes of step j
// and the difference, later minus earlier.
func (s *Spin) borne(u, v []float64, j int) (mean, diff vec) {
	nodes := 2 * len(s.Steps)
	var a, b vec
	for k, e := range s.axes {
		at := k*nodes + 2*j
		a = a.plus(v[at], e)
		b = b.plus(v[at+1], e)
		if s.shifts != nil {
			a = a.plus(v[at]*u[at], s.shifts[k])
			b = b.plus(v[at+1]*u[at+1], s.shifts[k])
		}
	}
	return a.add(b).times(0.5), b.plus(-1, a)
}

// bow returns what multiplies R(w/2)ᵀ in the toggled integral of a control-borne
// error over the step, d × mean - g (a+b)/2 × diff with d = g (b - a) and
// g = (√3/12) h².
func (st *stepData) bow(g float64, mean, diff vec) vec {
	d := st.b.plus(-1, st.a)
	f := st.a.add(st.b).times(0.5)
	return d.cross(mean).plus(-1, f.cross(diff)).times(g)
}

// Slopes are the derivatives that Derive fills. Each row runs over the controls
// and nodes like the controls of Run. Gate is always wanted; the others may be
// nil.
type Slopes struct {
	Gate   [3][]float64 // of the generator δ: U -> U exp(-i δ·σ/2), in the frame of the grid's start
	Toggle [][]float64  // row 3e+i: of component i of Toggle[e], by the controls
	Direct [][]float64  // row 3b+i: of component i of the Toggle of Borne[b], by its v
}

// Derive fills the derivatives of the last Run, the controls of which must be
// passed again.
func (s *Spin) Derive(u []float64, d *Slopes) {
	nodes := 2 * len(s.Steps)
	nh, ne := len(s.held), len(s.Toggle)
	if d.Toggle == nil {
		ne = 0
	}
	var rest [MaxToggles]vec                 // the shares of all later steps
	var byW, byD [MaxToggles]Mat             // derivatives of a share, by w (with the turn of all later steps) and by d
	var t turn                               //
	var toStart, halfToStart Mat             // Rᵀ G, Rᵀ R(w/2)ᵀ
	for j := len(s.Steps) - 1; j >= 0; j-- { // backwards: rest grows
		h := s.Steps[j]
		st := &s.step[j]
		t.arc = st.arc
		g := gauss * h * h
		inside := j >= s.First && j < s.Last
		t.average()
		toStart.mul(&st.back, &t.mean)
		toggling := ne > 0 && j < s.Last
		if toggling {
			s.steps(j, h, g, inside, nh, ne, &t, &toStart, &halfToStart, &byW, &byD, &rest)
		}
		for k := range s.axes {
			for node := range 2 {
				col := k*nodes + 2*j + node
				axis := s.axes[k]
				if s.shifts != nil {
					axis = axis.plus(u[col], s.shifts[k])
				}
				other, sign := st.b, -1.0
				if node == 1 {
					other, sign = st.a, 1.0
				}
				// w = h(a+b)/2 - g a×b, so da gives -g da×b and db gives +g db×a
				gs := g * sign
				dw := axis.times(h/2).plus(gs, axis.cross(other))
				delta := toStart.apply(dw)
				d.Gate[0][col], d.Gate[1][col], d.Gate[2][col] = delta.x, delta.y, delta.z
				if ne == 0 {
					continue
				}
				if !toggling {
					for r := range 3 * ne {
						d.Toggle[r][col] = 0
					}
				} else {
					dd := axis.times(gs)
					for i := range ne {
						p := byW[i].apply(dw).add(byD[i].apply(dd))
						if i >= nh && inside {
							// the field multiplies the error's difference, and moves
							p = p.plus(-g/2, halfToStart.apply(axis.cross(s.share[j].diff[i-nh])))
							if s.shifts != nil { // and the error itself moves with the control
								e := s.shifts[k].times(s.Borne[i-nh][col])
								p = p.add(st.direct(&toStart, &halfToStart, h, g, sign, e))
							}
						}
						d.Toggle[3*i][col], d.Toggle[3*i+1][col], d.Toggle[3*i+2][col] = p.x, p.y, p.z
					}
				}
				if d.Direct == nil {
					continue
				}
				var p vec
				if inside {
					p = st.direct(&toStart, &halfToStart, h, g, sign, axis)
				}
				for i := range s.Borne {
					d.Direct[3*i][col], d.Direct[3*i+1][col], d.Direct[3*i+2][col] = p.x, p.y, p.z
				}
			}
		}
		if inside {
			for i := range ne {
				rest[i] = rest[i].add(s.share[j].own[i])
			}
		}
	}
}

// steps fills byW and byD for step j, and halfToStart when it is inside.
func (s *Spin) steps(j int, h, g float64, inside bool, nh, ne int, t *turn, toStart, halfToStart *Mat, byW, byD *[MaxToggles]Mat, rest *[MaxToggles]vec) {
	st := &s.step[j]
	var slope Mat
	if inside {
		t.halfway()
		t.slopes()
		halfToStart.mul(&st.back, &t.half)
	}
	for i := range ne {
		if !inside { // before the window: the whole integral turns
			byW[i], byD[i] = Mat{}, Mat{}
		} else {
			var v, bow vec
			if i < nh {
				v = s.held[i]
				bow = st.b.plus(-1, st.a).times(g).cross(v)
			} else {
				v = s.share[j].mean[i-nh]
				bow = st.bow(g, v, s.share[j].diff[i-nh])
			}
			t.slope(&slope, h, v, bow)
			byW[i].mul(&st.back, &slope)
			// R(w/2)ᵀ (dd × v) = -R(w/2)ᵀ [v]x dd
			m := Mat{0, v.z, -v.y, -v.z, 0, v.x, v.y, -v.x, 0}
			byD[i].mul(halfToStart, &m)
		}
		byW[i].addCross(rest[i], toStart)
	}
}

// direct is the derivative of a control-borne error's share by the error itself
// at one node along e: its mean moves by half of e, its
// difference by sign e.
func (st *stepData) direct(toStart, halfToStart *Mat, h, g, sign float64, e vec) vec {
	half := e.times(0.5)
	d := st.b.plus(-1, st.a)
	f := st.a.add(st.b).times(0.5)
	bow := d.cross(half).plus(-sign, f.cross(e)).times(g)
	return halfToStart.apply(bow).plus(h, toStart.apply(half))
}
