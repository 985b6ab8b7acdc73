package noise

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// panel finds the Gauss quadrature of a measure on [lo, hi], given as points with weights: it is exact for the polynomials of degree 2m - 1, m its
// number of nodes, in w, or in w^2 if squared. The recurrence of the orthogonal polynomials is updated point by point (Gragg and Harwood
// 1984, Numer. Math. 44, 317), which keeps every weight above zero, and no point is kept. Nodes and weights follow from the eigenvectors of the
// Jacobi matrix (Golub and Welsch 1969, Math. Comput. 23, 221).
type panel struct {
	lo, hi  float64 // rad/ns, lo < hi
	squared bool
	alpha   []float64 // diagonal of the Jacobi matrix
	beta    []float64 // squares of what stands beside it, from 1; beta[0] is the mass
	count   int       // rows so far
}

// newPanel makes one of at most m nodes.
func newPanel(lo, hi float64, squared bool, m int) *panel {
	return &panel{lo: lo, hi: hi, squared: squared, alpha: make([]float64, m), beta: make([]float64, m)}
}

// add takes a point w in [lo, hi] into the measure, unless it weighs nothing.
func (p *panel) add(w, weight float64) {
	if !(weight > 0) {
		return
	}
	x := (w - p.lo) / (p.hi - p.lo)
	if p.squared {
		x *= (w + p.lo) / (p.hi + p.lo)
	}
	if p.count < len(p.alpha) {
		p.alpha[p.count], p.beta[p.count] = x, 0
		p.count++
	}
	gamma, sigma, t := 1.0, 0.0, 0.0
	for k := range p.alpha[:p.count] {
		rho := p.beta[k] + weight
		scaled, before := gamma*rho, sigma
		gamma, sigma = 1, 0
		if rho > 0 {
			gamma, sigma = p.beta[k]/rho, weight/rho
		}
		next := sigma*(p.alpha[k]-x) - gamma*t
		p.alpha[k] -= next - t
		t = next
		if sigma > 0 {
			weight = t * t / sigma
		} else {
			weight = before * p.beta[k]
		}
		p.beta[k] = scaled
	}
}

// nodes hands the nodes and weights to add, ascending.
func (p *panel) nodes(add func(w, weight float64)) {
	if p.count == 0 {
		return
	}
	jacobi := mat.NewSymDense(p.count, nil)
	for k, a := range p.alpha[:p.count] {
		jacobi.SetSym(k, k, a)
		if k > 0 {
			jacobi.SetSym(k-1, k, math.Sqrt(p.beta[k]))
		}
	}
	var eigen mat.EigenSym
	if !eigen.Factorize(jacobi, true) {
		panic("noise: the eigenvalues of a Jacobi matrix do not converge") // never seen: it is finite and at most 24 rows
	}
	var vectors mat.Dense
	eigen.VectorsTo(&vectors)
	for k, x := range eigen.Values(nil) {
		x = max(0, min(1, x)) // rounding
		w := p.lo + x*(p.hi-p.lo)
		if p.squared {
			w = math.Sqrt(p.lo*p.lo + x*(p.hi-p.lo)*(p.hi+p.lo))
		}
		v := vectors.At(0, k)
		add(w, p.beta[0]*v*v)
	}
}
