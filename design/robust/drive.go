package robust

import (
	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
)

// A drive takes coefficients to the controls at the nodes, and derivatives by
// node back to derivatives by coefficient: what the gates of a spin and of more
// levels have in common.
type drive struct {
	response    Response
	held        []Class
	count       int // controls that coefficients drive
	total       int // controls in all: given functions of time come last
	nodes       int
	first, last int // nodes of the window: first <= node < last

	u     []float64   // controls, one after the other
	moved []float64   // the same with a finite error
	v     [][]float64 // of each class that is borne: what λ multiplies; u itself for an amplitude
	borne []int       // these classes

	maps   []Map
	mapped []int // the controls that have one; with none, what follows is nil
	// What arrives, of which the mapped controls are functions, and what λ of each class adds to it; s itself for an amplitude.
	s []float64
	w [][]float64
	// The derivatives of the maps, where they are, at s, and at what arrives with the finite error of moved.
	slope, curve, movedSlope []float64
}

// A Map takes what arrives of a control, a share of full scale, to what multiplies its
// Axes, with its first two derivatives by the share. At zero it is zero.
type Map func(s float64) (value, slope, curvature float64)

func newDrive(r Response, held []Class, count int, grid Grid, maps []Map) drive {
	g := drive{
		response: r, held: held, count: count, total: count, nodes: 2 * len(grid.Steps),
		first: 2 * grid.First, last: 2 * grid.Last, v: make([][]float64, len(held)), maps: maps,
	}
	g.u, g.moved = make([]float64, count*g.nodes), make([]float64, count*g.nodes)
	for k, m := range maps {
		if m != nil {
			g.mapped = append(g.mapped, k)
		}
	}
	if g.mapped != nil {
		g.w = make([][]float64, len(held))
		for _, x := range []*[]float64{&g.s, &g.slope, &g.curve, &g.movedSlope} {
			*x = make([]float64, count*g.nodes)
		}
	}
	for i, c := range held {
		if !c.Kind.borne() {
			continue
		}
		if g.v[i] = g.u; c.Kind != Amplitude || g.mapped != nil {
			g.v[i] = make([]float64, count*g.nodes)
		}
		if g.mapped != nil {
			if g.w[i] = g.s; c.Kind != Amplitude {
				g.w[i] = make([]float64, count*g.nodes)
			}
		}
		g.borne = append(g.borne, i)
	}
	return g
}

// arriving gives the room for what arrives, and for what λ of a class adds to it: the
// controls and v themselves where all maps are straight.
func (g *drive) arriving() []float64 {
	if g.mapped == nil {
		return g.u[:g.count*g.nodes]
	}
	return g.s
}

func (g *drive) added(class int) []float64 {
	if g.mapped == nil {
		return g.v[class]
	}
	return g.w[class]
}

// mapControls makes the controls, and every v, of what arrives.
func (g *drive) mapControls() {
	if g.mapped == nil {
		return
	}
	copy(g.u, g.s)
	for _, k := range g.mapped {
		for i := k * g.nodes; i < (k+1)*g.nodes; i++ {
			g.u[i], g.slope[i], g.curve[i] = g.maps[k](g.s[i])
		}
	}
	for _, class := range g.borne {
		v := g.v[class]
		copy(v, g.w[class])
		g.multiply(g.slope, v)
	}
}

// mapMoved makes the controls of what arrives with a finite error, in moved.
func (g *drive) mapMoved() {
	for _, k := range g.mapped {
		for i := k * g.nodes; i < (k+1)*g.nodes; i++ {
			g.moved[i], g.movedSlope[i], _ = g.maps[k](g.moved[i])
		}
	}
}

// multiply multiplies the mapped controls of a row by those of another one: derivatives by
// the controls become those by what arrives when multiplied by the slope.
func (g *drive) multiply(by, row []float64) {
	for _, k := range g.mapped {
		a, b := by[k*g.nodes:(k+1)*g.nodes], row[k*g.nodes:(k+1)*g.nodes]
		for i, f := range a {
			b[i] *= f
		}
	}
}

// unmap takes derivatives by what λ of a borne error multiplies, v = map'(s) w, to those by
// w, and adds to a row of derivatives by s what v has of them through s. What w itself has of s is left to the caller.
func (g *drive) unmap(direct, row, w []float64) {
	for _, k := range g.mapped {
		for i := k * g.nodes; i < (k+1)*g.nodes; i++ {
			row[i] += direct[i] * w[i] * g.curve[i]
		}
	}
	g.multiply(g.slope, direct)
}

// apply adds what blocks give for the coefficients c to the controls in dst.
func (g *drive) apply(blocks []Block, c, dst []float64) {
	for _, b := range blocks {
		control := func(k int) blas64.Vector {
			return blas64.Vector{N: g.nodes, Inc: 1, Data: dst[(b.Control+k)*g.nodes : (b.Control+k+1)*g.nodes]}
		}
		part := func(k int) blas64.Vector {
			return blas64.Vector{N: b.N, Inc: 1, Data: c[b.First+k*b.N : b.First+(k+1)*b.N]}
		}
		re := blas64.General{Rows: b.N, Cols: g.nodes, Stride: g.nodes, Data: b.Re}
		blas64.Gemv(blas.Trans, 1, re, part(0), 1, control(0))
		if !b.Quadrature {
			continue
		}
		blas64.Gemv(blas.Trans, 1, re, part(1), 1, control(1))
		if b.Im != nil {
			im := blas64.General{Rows: b.N, Cols: g.nodes, Stride: g.nodes, Data: b.Im}
			blas64.Gemv(blas.Trans, -1, im, part(1), 1, control(0))
			blas64.Gemv(blas.Trans, 1, im, part(0), 1, control(1))
		}
	}
}

// contract adds f times rows of derivatives by node, d of rows x controls x
// nodes, taken from the nodes first <= node < last, to derivatives by coefficient.
func (g *drive) contract(blocks []Block, f float64, d []float64, rows, first, last int, raw []float64) {
	w, n := g.total*g.nodes, last-first
	if rows == 0 || n == 0 {
		return
	}
	for _, b := range blocks {
		control := func(k int) blas64.General {
			return blas64.General{Rows: rows, Cols: n, Stride: w, Data: d[(b.Control+k)*g.nodes+first:]}
		}
		part := func(k int) blas64.General {
			return blas64.General{Rows: rows, Cols: b.N, Stride: g.response.Dim, Data: raw[b.First+k*b.N:]}
		}
		re := blas64.General{Rows: b.N, Cols: n, Stride: g.nodes, Data: b.Re[first:]}
		blas64.Gemm(blas.NoTrans, blas.Trans, f, control(0), re, 1, part(0))
		if !b.Quadrature {
			continue
		}
		blas64.Gemm(blas.NoTrans, blas.Trans, f, control(1), re, 1, part(1))
		if b.Im != nil {
			im := blas64.General{Rows: b.N, Cols: n, Stride: g.nodes, Data: b.Im[first:]}
			blas64.Gemm(blas.NoTrans, blas.Trans, f, control(1), im, 1, part(0))
			blas64.Gemm(blas.NoTrans, blas.Trans, -f, control(0), im, 1, part(1))
		}
	}
}

// mix stores Mix u in v, and unmix adds f Mixᵀ d to d for one row of
// derivatives in the nodes first <= node < last.
func (g *drive) mix(mix [][]float64, u, v []float64) {
	clear(v)
	for k, row := range mix {
		for l, m := range row {
			if m == 0 {
				continue
			}
			to, from := v[k*g.nodes:(k+1)*g.nodes], u[l*g.nodes:(l+1)*g.nodes]
			for i, x := range from {
				to[i] += m * x
			}
		}
	}
}

func (g *drive) unmix(mix [][]float64, f float64, from, to []float64, first, last int) {
	for k, row := range mix {
		for l, m := range row {
			if m == 0 {
				continue
			}
			a, b := from[k*g.nodes+first:k*g.nodes+last], to[l*g.nodes+first:l*g.nodes+last]
			for i, x := range a {
				b[i] += f * m * x
			}
		}
	}
}

// controls fills u and every v for the coefficients.
func (g *drive) controls(c []float64) {
	s := g.arriving()
	clear(s)
	g.apply(g.response.Blocks, c, s)
	for i, class := range g.held {
		switch class.Kind {
		case Mixed:
			g.mix(class.Mix, s, g.added(i))
		case Line:
			w := g.added(i)
			clear(w)
			g.apply(g.response.Slopes[i], c, w)
		}
	}
	g.mapControls()
}

// err stores the controls with a finite error, in the window only, in moved; v is what λ
// adds to what arrives.
func (g *drive) err(e member, v []float64) {
	copy(g.moved, g.u)
	if g.mapped != nil {
		copy(g.moved, g.s)
	}
	first, last := g.first, g.last
	for k := range g.count {
		row := g.moved[k*g.nodes+first : k*g.nodes+last]
		if e.scale != 1 {
			for i := range row {
				row[i] *= e.scale
			}
		}
		if e.lambda != 0 {
			for i, x := range v[k*g.nodes+first : k*g.nodes+last] {
				row[i] += e.lambda * x
			}
		}
	}
	g.mapMoved()
}

// set takes what arrives, given at the grid's nodes, one control after the other in shares of full scale.
func (g *drive) set(u []float64) {
	copy(g.arriving(), u)
	g.mapControls()
}

// load takes controls u given at the grid's nodes, one control after the other
// in shares of full scale, and for every held class of kind Line its v.
func (g *drive) load(u []float64, v [][]float64) {
	s := g.arriving()
	copy(s, u)
	for i, c := range g.held {
		switch c.Kind {
		case Mixed:
			g.mix(c.Mix, s, g.added(i))
		case Line:
			copy(g.added(i), v[i])
		}
	}
	g.mapControls()
}
