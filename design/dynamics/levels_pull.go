package dynamics

// LevelsCotangent holds the derivatives of one number f by the results of Run:
//
//	df = Re Tr(Gate' dU) + sum_e Tr(Toggle[e] dA_e),
//
// with A_e the toggled integrals and Hermitian Toggle[e]. A nil matrix stands for zero.
// For f = sum over entries of |A|², Toggle is 2 A; for f = -|Tr W'U|², Gate is
// -2 Tr(W'U) W.
type LevelsCotangent struct {
	Gate   []complex128
	Toggle [][]complex128 // as Levels.Toggle; nil for none at all
}

// levelsPull is the working memory of Pull.
type levelsPull struct {
	rest, bent   []complex128   // K of all later steps, and of this one's corrections
	source       [][]complex128 // K of each point
	byD, byH     []complex128   // derivatives by D and by Hm, seen from the middle
	turn, w, sum []complex128
	direct       []complex128 // derivative by the control-borne error at a node
	zero         []complex128
	z            [][]complex128
}

func newLevelsPull(most, dd, held int) levelsPull {
	p := levelsPull{source: matrices(most, dd), z: make([][]complex128, held)}
	for _, m := range []*[]complex128{&p.rest, &p.bent, &p.byD, &p.byH, &p.turn, &p.w, &p.sum, &p.direct, &p.zero} {
		*m = make([]complex128, dd)
	}
	return p
}

// Pull fills grad, laid out like the controls of the last Run, which must be passed
// again, with the derivatives of f by the controls; and direct[b], when direct is not
// nil, with those by the v of Borne[b]. Entries of known controls are left alone. The
// derivatives are exact for the computation of Run to Within.
//
// K, Hermitian, says how f changes when a frame turns: F -> F exp(-i Γ) gives
// df = Tr(Γ K), seen from the grid's start. A point of a static error gives
// K = i weight [B, Z].
func (l *Levels) Pull(u []float64, c *LevelsCotangent, grad []float64, direct [][]float64) {
	k, f, p := l.k, &l.f, &l.pull
	nodes := 2 * len(l.Steps)
	free := len(l.axes) - l.Known
	clear(p.rest)
	if c.Gate != nil {
		k.mulLeft(f.p, c.Gate, l.Gate)
		k.turn(f.p, f.p)
		addReal(p.rest, f.p, 0.5)
	}
	toggled := c.Toggle != nil && l.errors > 0
	byGram := false
	if toggled && l.gram != nil {
		for e := range p.z {
			p.z[e] = p.zero
			if z := c.Toggle[e]; z != nil {
				p.z[e] = z
				byGram = true
			}
		}
		l.gram.pull(p.z)
	}
	for j := len(l.Steps) - 1; j >= 0; j-- {
		h, r := l.Steps[j], l.rules[j]
		g := gauss * h
		mid := r.n / 2
		inside := toggled && j >= l.First && j < l.Last
		l.fields(u, j)
		l.frames(j)
		if inside {
			l.sources(u, j, c, byGram)
		}
		// W = sum_r F_r (h weight[r] K_rest + h sum_q upto[q][r] K_q) F_r'
		clear(p.w)
		for q := range r.n {
			clear(p.turn)
			addReal(p.turn, p.rest, h*r.weight[q])
			if inside {
				for o := range r.n {
					addReal(p.turn, p.source[o], h*r.upto[o][q])
				}
				addReal(p.turn, p.bent, h*r.upto[mid][q])
			}
			k.mul(f.p, f.frame[q], p.turn)
			k.hermRight(f.q, f.p, f.frame[q])
			addReal(p.w, f.q, 1)
		}
		if inside {
			for q := range r.n {
				addReal(p.rest, p.source[q], 1)
			}
			addReal(p.rest, p.bent, 1)
			l.outward(p.byD)
			l.outward(p.byH)
		}
		for node := range 2 {
			// Tr(dHb W) = Tr(e (W/2 -+ i g [W, H2 or H1])) with g = (√3/12) h
			other, sign := f.h2, -1.0
			if node == 1 {
				other, sign = f.h1, 1
			}
			k.bracket(p.sum, other, p.w)
			for i, x := range p.sum {
				y := p.w[i]
				p.sum[i] = complex(sign*g*real(x)+real(y)/2, sign*g*imag(x)+imag(y)/2)
			}
			if inside {
				addReal(p.sum, p.byD, sign*g*h)
				addReal(p.sum, p.byH, 0.5)
			}
			for n := range free {
				col := n*nodes + 2*j + node
				grad[col] = l.overlap(p.sum, n, u[col])
			}
		}
		if direct == nil && !l.hasShift {
			continue
		}
		for b := range l.Borne {
			l.directly(u, j, b, c, inside, grad, direct)
		}
	}
}

// overlap returns Tr(e a), e being the axis of control c at u.
func (l *Levels) overlap(a []complex128, c int, u float64) float64 {
	t := l.axes[c].trace(a)
	if l.hasShift {
		t += 2 * u * l.shifts[c].trace(a)
	}
	return t
}

// outward turns a, seen from the grid's start, into what it is in the middle of the step.
func (l *Levels) outward(a []complex128) {
	f := &l.f
	l.k.mul(f.p, f.mid, a)
	l.k.hermRight(a, f.p, f.mid)
}

// sources fills source, bent, byD and byH of step j; the last two still seen from the
// grid's start.
func (l *Levels) sources(u []float64, j int, c *LevelsCotangent, byGram bool) {
	k, f, p, h, r := l.k, &l.f, &l.pull, l.Steps[j], l.rules[j]
	nh := len(l.held)
	mid := r.n / 2
	for q := range r.n {
		clear(p.source[q])
	}
	clear(p.bent)
	clear(p.byD)
	clear(p.byH)
	l.toggle(u, j, l.alone())
	for e := l.alone(); e < l.errors; e++ {
		z := c.Toggle[e]
		if z == nil {
			continue
		}
		for q := range r.n {
			k.bracket(f.p, f.toggled[e][q], z)
			addReal(p.source[q], f.p, -h*r.weight[q])
			if q == mid {
				addReal(p.byD, f.p, 1)
			}
		}
		k.bracket(f.p, f.bent[e], z)
		addReal(p.bent, f.p, -1)
		if e >= nh {
			k.bracket(f.p, f.dvm[e-nh], z)
			addReal(p.byH, f.p, -1)
		}
	}
	if !byGram {
		return
	}
	for q := range r.n {
		l.gram.back(p.turn, f.frame[q], 1)
		k.mul(f.p, p.turn, f.frame[q])
		k.turn(f.p, f.p)
		addReal(p.source[q], f.p, h*r.weight[q])
		if q == mid {
			addReal(p.byD, f.p, -1)
			copy(p.sum, p.turn)
		}
	}
	l.along() // i D mid in q
	l.gram.back(p.turn, f.q, 1)
	k.mul(f.p, p.turn, f.mid)
	k.mulAdd(f.p, p.sum, f.q)
	k.turn(f.p, f.p)
	addReal(p.bent, f.p, 1)
}

// directly adds what moves through the control-borne error b itself in step j.
func (l *Levels) directly(u []float64, j, b int, c *LevelsCotangent, inside bool, grad []float64, direct [][]float64) {
	k, f, p, h, r := l.k, &l.f, &l.pull, l.Steps[j], l.rules[j]
	nodes := 2 * len(l.Steps)
	free := len(l.axes) - l.Known
	var z []complex128
	if inside {
		z = c.Toggle[len(l.held)+b]
	}
	if z != nil {
		clear(p.w)
		for q := range r.n {
			k.mul(f.p, f.frame[q], z)
			k.hermRight(f.q, f.p, f.frame[q])
			addReal(p.w, f.q, h*r.weight[q]/2)
			if q == r.n/2 {
				copy(p.turn, f.q)
			}
		}
		k.bracket(f.p, f.d, p.turn)
		addReal(p.w, f.p, -0.5)
		k.bracket(f.p, f.hm, p.turn)
		copy(p.turn, f.p)
	}
	for node := range 2 {
		sign := 2*float64(node) - 1
		if z != nil {
			copy(p.direct, p.w)
			addReal(p.direct, p.turn, sign*gauss*h*h)
		}
		for n := range free {
			col := n*nodes + 2*j + node
			if direct != nil && direct[b] != nil {
				direct[b][col] = 0
				if z != nil {
					direct[b][col] = l.overlap(p.direct, n, u[col])
				}
			}
			if z != nil && l.hasShift {
				grad[col] += 2 * l.Borne[b][col] * l.shifts[n].trace(p.direct)
			}
		}
	}
}
