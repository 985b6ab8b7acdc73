package solve

import (
	"math"
	"math/rand/v2"
	"testing"
)

// byGradient takes the Jacobian away and leaves Jᵀr.
func byGradient(p Problem) Problem {
	jac := make([]float64, p.Rows*p.Dim)
	q := p
	q.Jacobian = nil
	q.Gradient = func(r, grad []float64) {
		p.Jacobian(jac)
		clear(grad)
		for i, v := range r {
			for k := range grad {
				grad[k] += v * jac[i*p.Dim+k]
			}
		}
	}
	return q
}

// TestQuasiNewton: the same zeros and minima as with a Jacobian, inside and at limits.
func TestQuasiNewton(t *testing.T) {
	s := in(2).disc(2, []float64{1, 0}, []float64{0, 1})
	for _, c0 := range [][]float64{{-1.2, 1}, {0, 0}, {1.9, 0.1}, {-0.5, -1.9}} {
		res := run(t, byGradient(rosenbrock()), s, c0, Options{})
		wantAt(t, res, Converged, []float64{1, 1}, 1e-6)
		if res.Evaluations > 500 {
			t.Errorf("%d evaluations from %v", res.Evaluations, c0)
		}
	}
	target := []float64{0.9999, -0.9999, 0.3}
	wantAt(t, run(t, byGradient(identity(target)), box(3, 1), []float64{0, 0, 0}, Options{}), Converged, target, 1e-6)

	p := byGradient(linear([][]float64{{1, 0}, {1, 1}, {1, 2}}, []float64{1, 0, 1}))
	res := run(t, p, box(2, 3), []float64{-2, 2}, Options{})
	wantAt(t, res, Stalled, []float64{2. / 3, 0}, 1e-3)

	limit := in(2).disc(1, []float64{1, 0}, []float64{0, 1}).row(1, 1, 1)
	res = run(t, byGradient(identity([]float64{4, 1})), limit, []float64{0, 0}, Options{})
	wantAt(t, res, Stalled, []float64{1, 0}, 4e-2)
	if !(math.Abs(res.Miss-10) <= 2e-2) {
		t.Errorf("miss %v, want 10", res.Miss)
	}
}

// TestUpdate: with exact gradients of a quadratic and n steps that are conjugate, the
// update is its Hessian (Nocedal and Wright 2006, theorem 6.4); and it stays positive
// definite where the curvature is not.
func TestUpdate(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 8))
	const n = 5
	h := make([]float64, n*n)
	for i := range n { // diag(1..n), along axes that are conjugate
		h[i*n+i] = float64(i + 1)
	}
	b := make([]float64, n*n)
	u := newUpdate(n)
	x, next, g := make([]float64, n), make([]float64, n), make([]float64, n)
	grad := func(x []float64) {
		for i := range n {
			g[i] = 0
			for k := range n {
				g[i] += h[i*n+k] * x[k]
			}
		}
	}
	for i := range x {
		x[i] = rng.NormFloat64()
	}
	grad(x)
	u.begin(g, 1, b)
	for i := range n {
		copy(next, x)
		next[i] += 0.3
		grad(x)
		u.before(x, next, g)
		grad(next)
		u.after(g, b)
		copy(x, next)
	}
	for i := range n {
		for k := i; k < n; k++ {
			if !(math.Abs(b[i*n+k]-h[i*n+k]) <= 1e-12) {
				t.Errorf("entry (%d, %d) is %v, want %v", i, k, b[i*n+k], h[i*n+k])
			}
		}
	}
	// a step along which the slope falls
	for i := range n {
		next[i] = x[i] + rng.NormFloat64()
		g[i] = 0
	}
	u.before(x, next, g)
	for i := range n {
		g[i] = -(next[i] - x[i])
	}
	u.after(g, b)
	bent := 0.0
	for i := range n {
		for k := i; k < n; k++ {
			f := 2.0
			if i == k {
				f = 1
			}
			bent += f * b[i*n+k] * u.step[i] * u.step[k]
		}
	}
	if !(bent > 0) {
		t.Errorf("curvature %v along the last step", bent)
	}
}
