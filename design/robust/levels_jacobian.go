package robust

import (
	"holdfast/design/dynamics"
)

// levelsJacobian is the working memory of Jacobian.
type levelsJacobian struct {
	d, raw  []float64 // raw rows: d² of every gate, nominal first, then what is needed of each toggled error
	gate    []dynamics.LevelsSlopes
	toggled [][]int // raw row of each coordinate, by toggle and then by wave; -1 where not needed
	lever   []float64
	bent    []float64 // angles x d²
	angle   []float64 // angles x coefficients
}

func (g *LevelsGate) newJacobian() *levelsJacobian {
	j := new(levelsJacobian)
	dd, w := g.spec.Dim*g.spec.Dim, g.total*g.nodes
	gates := 1 + len(g.members)
	rows := gates * dd
	place := func(r *reading) {
		at := make([]int, dd)
		for k := range at {
			at[k] = -1
		}
		for _, k := range r.needed {
			at[k] = rows
			rows++
		}
		j.toggled = append(j.toggled, at)
	}
	for _, t := range g.toggles {
		place(g.reading(t.class))
	}
	for range g.waves {
		place(&g.read[0])
	}
	j.d, j.raw = make([]float64, rows*w), make([]float64, rows*g.response.Dim)
	row := func(i int) []float64 { return j.d[i*w : (i+1)*w] }
	for i := range gates {
		s := dynamics.LevelsSlopes{}
		for k := range dd {
			s.Gate = append(s.Gate, row(i*dd+k))
		}
		j.gate = append(j.gate, s)
	}
	s := &j.gate[0]
	if n := len(g.toggles) + len(g.waves); n > 0 {
		s.Toggle = make([][]float64, dd*n)
	}
	if n := len(g.nominal.Borne); n > 0 {
		s.Direct = make([][]float64, dd*n)
	}
	for i := range j.toggled {
		for k, at := range j.toggled[i] {
			if at < 0 {
				continue
			}
			toggle, direct := g.toggle(i)
			s.Toggle[dd*toggle+k] = row(at)
			if b := toggle - len(g.nominal.Held); direct {
				s.Direct[dd*b+k] = make([]float64, w)
			}
		}
	}
	j.lever = make([]float64, g.aim.rows()*dd)
	n := g.aim.angles()
	j.bent, j.angle = make([]float64, n*dd), make([]float64, n*g.response.Dim)
	return j
}

// toggle gives the number that dynamics has for a toggled error, by toggle and then by
// wave, and whether it moves with the controls by itself.
func (g *LevelsGate) toggle(i int) (number int, direct bool) {
	if i < len(g.toggles) {
		return g.toggles[i].toggle, g.toggles[i].toggle >= len(g.nominal.Held)
	}
	w := &g.waves[i-len(g.toggles)]
	return w.toggle, g.rides(w)
}

// Jacobian stores the derivatives at the c of the last call of Residuals in jac.
func (g *LevelsGate) Jacobian(jac []float64) {
	if g.jac == nil {
		g.jac = g.newJacobian()
	}
	j := g.jac
	n, dd := g.response.Dim, g.spec.Dim*g.spec.Dim
	w := g.total * g.nodes
	clear(j.raw)
	g.nominal.Derive(g.u, &j.gate[0])
	for _, rows := range [][][]float64{j.gate[0].Gate, j.gate[0].Toggle} {
		for _, row := range rows {
			if row != nil {
				g.multiply(g.slope, row)
			}
		}
	}
	for i, t := range g.toggles {
		b := t.toggle - len(g.nominal.Held)
		if b < 0 {
			continue
		}
		c := &g.held[t.class]
		for k, at := range j.toggled[i] {
			if at < 0 {
				continue
			}
			direct, toggle := j.gate[0].Direct[dd*b+k], j.d[at*w:(at+1)*w]
			if g.mapped != nil {
				g.unmap(direct, toggle, g.w[t.class])
			}
			switch c.Kind {
			case Amplitude:
				for q, v := range direct[:g.count*g.nodes] {
					toggle[q] += v
				}
			case Mixed:
				g.unmix(c.Mix, 1, direct, toggle, 0, g.nodes)
			case Line:
				g.contract(g.response.Slopes[t.class], 1, direct, 1, g.first, g.last, j.raw[at*n:])
			}
		}
	}
	for i := range g.waves {
		x := &g.waves[i]
		if !g.rides(x) {
			continue
		}
		b := x.toggle - len(g.nominal.Held)
		for k, at := range j.toggled[len(g.toggles)+i] {
			if at >= 0 {
				g.lend(x, j.gate[0].Direct[dd*b+k], j.d[at*w:(at+1)*w])
			}
		}
	}
	for i := range g.members {
		u := g.runMember(i)
		g.finite.Derive(u, &j.gate[1+i])
		g.chain(i, j.gate[1+i].Gate, func(f float64, rows []float64, k int) {
			g.contract(g.response.Slopes[g.members[i].class], f, rows, 1, g.first, g.last, j.raw[((1+i)*dd+k)*n:])
		})
	}
	g.contract(g.response.Blocks, 1, j.d, len(j.d)/w, 0, g.nodes, j.raw)

	clear(jac[:g.rows*n])
	if g.bend != nil {
		g.bend.slopes(g.views[0], j.bent)
		for i := range g.bend.n {
			combine(j.angle[i*n:(i+1)*n], j.bent[i*dd:(i+1)*dd], j.raw, n)
		}
	}
	at := 0
	for b, x := range g.blocks {
		for k, gate := range x.gates {
			v := g.views[gate]
			v.lever(j.lever)
			for row := range g.aim.rows() {
				dst := jac[(at+row)*n : (at+row+1)*n]
				for q, f := range j.lever[row*dd : (row+1)*dd] {
					if f != 0 {
						axpy(dst, x.factors[k]*f, j.raw[(gate*dd+q)*n:(gate*dd+q+1)*n])
					}
				}
			}
			if g.bend == nil {
				continue
			}
			v.turns()
			for a := range g.bend.n {
				for row, f := range v.along(a) {
					axpy(jac[(at+row)*n:(at+row+1)*n], x.factors[k]*f, j.angle[a*n:(a+1)*n])
				}
			}
		}
		if at += g.aim.rows(); b > 0 {
			continue
		}
		for i, t := range g.toggles {
			f := t.factor * g.held[t.class].heldWeight()
			r := g.reading(t.class)
			for _, p := range r.parts {
				raw := j.toggled[i][p.coordinate]
				axpy(jac[(at+p.row)*n:(at+p.row+1)*n], f*p.factor, j.raw[raw*n:(raw+1)*n])
			}
			at += r.rows
		}
		for i := range g.waves {
			x := &g.waves[i]
			f := x.factor * g.held[x.class].Weight
			for _, p := range g.read[0].parts {
				raw := j.toggled[len(g.toggles)+i][p.coordinate]
				axpy(jac[(at+p.row)*n:(at+p.row+1)*n], f*p.factor, j.raw[raw*n:(raw+1)*n])
			}
			at += g.read[0].rows
		}
	}
}

// lend adds to the derivatives by the controls what those by the wave's own v, direct, make of them.
// direct is spoilt.
func (g *LevelsGate) lend(w *wave, direct, to []float64) {
	for k := range g.count {
		for n, f := range w.time {
			direct[k*g.nodes+n] *= f
		}
	}
	if g.mapped != nil {
		g.unmap(direct, to, g.w[w.class])
	}
	if c := &g.held[w.class]; c.Kind == Mixed {
		g.unmix(c.Mix, 1, direct, to, 0, g.nodes)
		return
	}
	axpy(to[:g.count*g.nodes], 1, direct[:g.count*g.nodes])
}

// axpy adds f src to dst.
func axpy(dst []float64, f float64, src []float64) {
	for i, v := range src {
		dst[i] += f * v
	}
}

// combine stores the combination of the first rows of raw in dst.
func combine(dst, factors, raw []float64, n int) {
	clear(dst)
	for k, f := range factors {
		if f != 0 {
			axpy(dst, f, raw[k*n:(k+1)*n])
		}
	}
}

// chain turns rows of derivatives by the controls of a member into those by what
// arrives without its error; line is called, for an error of a line, with what its own slope is to bring.
func (g *LevelsGate) chain(i int, rows [][]float64, line func(f float64, row []float64, k int)) {
	e := &g.members[i]
	c := &g.held[e.class]
	slope := g.movedSlope
	if e.operator != nil {
		slope = g.slope
	}
	for _, row := range rows {
		g.multiply(slope, row)
	}
	if e.operator != nil {
		return
	}
	switch {
	case e.scale != 1:
		for _, row := range rows {
			for a := range g.count {
				part := row[a*g.nodes+g.first : a*g.nodes+g.last]
				for k := range part {
					part[k] *= e.scale
				}
			}
		}
	case e.lambda != 0 && c.Kind == Line:
		for k, row := range rows {
			line(e.lambda, row, k)
		}
	case e.lambda != 0:
		for _, row := range rows {
			copy(g.moved, row)
			g.unmix(c.Mix, e.lambda, g.moved, row, g.first, g.last)
		}
	}
}

// Gradient stores Jᵀr in grad, J the Jacobian at the c of the last call of Residuals
// and r given residuals, without forming J: for many residuals, or many levels.
func (g *LevelsGate) Gradient(r, grad []float64) {
	d := g.spec.Dim
	dd := d * d
	clear(grad)
	cot := make([][]complex128, len(g.views))
	angles := make([]float64, g.aim.angles())
	var toggle [][]complex128
	if n := len(g.toggles) + len(g.waves); n > 0 {
		toggle = make([][]complex128, n)
	}
	at, rows := 0, g.aim.rows()
	z := make([]float64, rows)
	for b, x := range g.blocks {
		for k, gate := range x.gates {
			for i, v := range r[at : at+rows] {
				z[i] = x.factors[k] * v
			}
			if cot[gate] == nil {
				cot[gate] = make([]complex128, dd)
			}
			v := g.views[gate]
			v.cotangent(cot[gate], z)
			if g.bend == nil {
				continue
			}
			v.turns()
			for a := range angles {
				for i, y := range v.along(a) {
					angles[a] += z[i] * y
				}
			}
		}
		if at += rows; b > 0 {
			continue
		}
		back := func(number int, reading *reading, f float64) {
			clear(g.coord)
			for _, p := range reading.parts {
				g.coord[p.coordinate] += f * p.factor * r[at+p.row]
			}
			m := make([]complex128, dd)
			dynamics.FromCoordinates(m, g.coord, d)
			toggle[number] = m
			at += reading.rows
		}
		for _, t := range g.toggles {
			back(t.toggle, g.reading(t.class), t.factor*g.held[t.class].heldWeight())
		}
		for _, w := range g.waves {
			back(w.toggle, &g.read[0], w.factor*g.held[w.class].Weight)
		}
	}
	if g.bend != nil {
		g.bend.cotangent(g.views[0], cot[0], angles)
	}
	w := g.total * g.nodes
	u := make([]float64, w)
	var direct [][]float64
	for range g.nominal.Borne {
		direct = append(direct, make([]float64, w))
	}
	g.nominal.Pull(g.u, &dynamics.LevelsCotangent{Gate: cot[0], Toggle: toggle}, u, direct)
	g.multiply(g.slope, u)
	for k, class := range g.borne {
		c := &g.held[class]
		if g.mapped != nil {
			g.unmap(direct[k], u, g.w[class])
		}
		switch c.Kind {
		case Amplitude:
			axpy(u[:g.count*g.nodes], 1, direct[k][:g.count*g.nodes])
		case Mixed:
			g.unmix(c.Mix, 1, direct[k], u, 0, g.nodes)
		case Line:
			g.contract(g.response.Slopes[class], 1, direct[k], 1, g.first, g.last, grad)
		}
	}
	for i := range g.waves {
		if x := &g.waves[i]; g.rides(x) {
			g.lend(x, direct[x.toggle-len(g.nominal.Held)], u)
		}
	}
	g.contract(g.response.Blocks, 1, u, 1, 0, g.nodes, grad)
	for i := range g.members {
		if cot[1+i] == nil {
			continue
		}
		g.finite.Pull(g.runMember(i), &dynamics.LevelsCotangent{Gate: cot[1+i]}, u, nil)
		g.chain(i, [][]float64{u}, func(f float64, row []float64, _ int) {
			g.contract(g.response.Slopes[g.members[i].class], f, row, 1, g.first, g.last, grad)
		})
		g.contract(g.response.Blocks, 1, u, 1, 0, g.nodes, grad)
	}
}
