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
	count       int // controls
	nodes       int
	first, last int // nodes of the window: first <= node < last

	u     []float64   // controls, one after the other
	moved []float64   // the same with a finite error
	v     [][]float64 // of each class that is borne: what λ multiplies; u itself for an amplitude
	borne []int       // these classes
}

func newDrive(r Response, held []Class, count int, grid Grid) drive {
	g := drive{
		response: r, held: held, count: count, nodes: 2 * len(grid.Steps),
		first: 2 * grid.First, last: 2 * grid.Last, v: make([][]float64, len(held)),
	}
	g.u, g.moved = make([]float64, count*g.nodes), make([]float64, count*g.nodes)
	for i, c := range held {
		if !c.Kind.borne() {
			continue
		}
		if g.v[i] = g.u; c.Kind != Amplitude {
			g.v[i] = make([]float64, count*g.nodes)
		}
		g.borne = append(g.borne, i)
	}
	return g
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
	w, n := g.count*g.nodes, last-first
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
	clear(g.u)
	g.apply(g.response.Blocks, c, g.u)
	for i, class := range g.held {
		switch class.Kind {
		case Mixed:
			g.mix(class.Mix, g.u, g.v[i])
		case Line:
			clear(g.v[i])
			g.apply(g.response.Slopes[i], c, g.v[i])
		}
	}
}

// err stores the controls with a finite error in moved: in the window only.
func (g *drive) err(e member, v []float64) {
	copy(g.moved, g.u)
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
}

// load takes controls u given at the grid's nodes, one control after the other
// in shares of full scale, and for every held class of kind Line its v.
func (g *drive) load(u []float64, v [][]float64) {
	copy(g.u, u)
	for i, c := range g.held {
		switch c.Kind {
		case Mixed:
			g.mix(c.Mix, g.u, g.v[i])
		case Line:
			copy(g.v[i], v[i])
		}
	}
}
