package dynamics

import "math"

// A rule is Gauss-Legendre quadrature with n points on a step of unit length, with what
// takes it up to each of its points: the integral of the interpolating polynomial,
//
//	int_0^1 f ≈ sum_q weight[q] f(node[q])     int_0^node[q] f ≈ sum_r upto[q][r] f(node[r]).
//
// Both together integrate f(s') g(s) over s' < s with an error of the order of that of
// the rule itself: if either has a degree below n, the other may go up to 2n-2 less
// it (Butcher 1964, Math. Comp. 18, 50: the properties C(n) and D(n) of the Gauss
// methods).
type rule struct {
	n      int
	node   []float64
	weight []float64
	upto   [][]float64
}

// pointsFor returns the least odd number of points n >= 3 with an error
// x^{2n} (n!)⁴/((2n+1) (2n)!³) <= within for e^{ixs} over a unit step (Abramowitz and
// Stegun 1964, 25.4.30), at most mostPoints.
func pointsFor(x, within float64) int {
	for n := 3; n < mostPoints; n += 2 {
		e := 1 / float64(2*n+1)
		for i := 1; i <= n; i++ { // n!²/(2n)! and x²ⁿ n!²/(2n)!²
			f := float64(i)
			a := f * f / (float64(2*i-1) * float64(2*i))
			e *= a * a * x * x / (float64(2*i-1) * float64(2*i))
		}
		if e <= within {
			return n
		}
	}
	return mostPoints
}

const mostPoints = 15

// newRule builds the rule of n points, n odd.
func newRule(n int) *rule {
	r := &rule{n: n, node: make([]float64, n), weight: make([]float64, n)}
	legendre := func(x float64) (p, slope float64) {
		p0, p1 := 1.0, x
		for k := 2; k <= n; k++ {
			p0, p1 = p1, (float64(2*k-1)*x*p1-float64(k-1)*p0)/float64(k)
		}
		return p1, float64(n) * (x*p1 - p0) / (x*x - 1)
	}
	for i := range n {
		x := -math.Cos(math.Pi * (float64(i) + 0.75) / (float64(n) + 0.5))
		if i == n/2 {
			x = 0
		}
		for range 8 { // Newton's method from the asymptotic roots: 5 steps reach 1e-16
			p, s := legendre(x)
			if i != n/2 {
				x -= p / s
			}
		}
		_, s := legendre(x)
		r.node[i] = (1 + x) / 2
		r.weight[i] = 1 / ((1 - x*x) * s * s)
	}
	// Integrals of the interpolating polynomial up to a node, by the rule itself, which
	// is exact for them: the Lagrange polynomials have degree n-1.
	r.upto = make([][]float64, n)
	for q := range n {
		r.upto[q] = make([]float64, n)
		for m := range n {
			for p := range n {
				x := r.node[q] * r.node[p]
				v := 1.0
				for o := range n {
					if o != m {
						v *= (x - r.node[o]) / (r.node[m] - r.node[o])
					}
				}
				r.upto[q][m] += r.node[q] * r.weight[p] * v
			}
		}
	}
	return r
}
