package solve

import (
	"context"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/lapack64"
)

// A Problem is a vector of residuals over coefficients.
type Problem struct {
	Dim  int // coefficients
	Rows int // residuals
	// Residuals stores the residuals at c in r. It is never called with a c
	// outside the set.
	Residuals func(c, r []float64)
	// Jacobian stores the Jacobian at the c of the last call of Residuals in jac,
	// row by row (Rows x Dim).
	Jacobian func(jac []float64)
	// Gradient stores Jᵀr in grad, at the c of the last call of Residuals which gave r.
	// It serves where Jacobian is nil: where residuals are many, J costs
	// more than what it saves in iterations.
	Gradient func(r, grad []float64)
}

// Status says why a solve ended.
type Status int

// The reasons.
const (
	Converged   Status = iota // |r|² fell below the tolerance
	Stalled                   // a local minimum: no gain although the barrier was lowered again and again, or no step left
	Exhausted                 // the budget of iterations was used up
	Interrupted               // the context was cancelled
)

func (s Status) String() string {
	return [...]string{"converged", "stalled at a miss", "iteration limit", "interrupted"}[s]
}

// Options of one solve. A zero field means its default.
type Options struct {
	Kappa      float64 // bound on µ: κ|r|²/constraints; default 5
	Tolerance  float64 // on |r|²; default 1e-13; negative: never converged, go on until it stalls
	Iterations int     // default 400, without Jacobian 4000
	Stalls     int     // steps that gain under 1e-3, each of which lowers the barrier, before Stalled; default 15
}

func (o Options) filled(quasi bool) Options {
	if o.Kappa == 0 {
		o.Kappa = 5
	}
	if o.Tolerance == 0 {
		o.Tolerance = 1e-13
	}
	if o.Iterations == 0 {
		o.Iterations = 400 // of Gauss-Newton
		if quasi {
			o.Iterations = 4000
		}
	}
	if o.Stalls == 0 {
		o.Stalls = 15
	}
	return o
}

// A Result is the best point of a solve, strictly inside the set.
type Result struct {
	C           []float64
	Miss        float64 // |r|² there
	Status      Status
	Iterations  int
	Evaluations int // of the residuals; the Jacobian, or the gradient, is formed at accepted points only
}

const (
	armijo        = 1e-4
	nearBoundary  = 0.95  // of the way to the boundary, at most
	maxDamping    = 1e10  // λ at which a step so short is a miss
	bendLimit     = 1e4   // growth of |r|² over one step beyond which its bend is not followed
	halvings      = 6     // of a step, before the damping is raised
	landingMiss   = 1e-2  // |r|² under which a landing is tried
	landingGain   = 0.1   // of |r|², at most, or the landing is not taken
	landingMetric = 1e-3  // weight of the barrier's metric in a landing, times |r|²/constraints
	landingWait   = 3     // iterations after a failed landing before the next
	quasiSpell    = 25    // quasi-Newton steps that are judged together, as one of them says little
	quasiGain     = 0.02  // of |r|² in a spell, under which it counts towards a stall
	tinyDiagonal  = 1e-14 // of the trace, added to the normal matrix: the barrier's condition reaches 1e17
)

// GaussNewton runs the iteration of the package comment from c0, which must lie
// strictly inside the set (Gauge < 1); it panics when it does not, a mistake of
// the caller. It is deterministic. Points whose residuals are not finite are
// never accepted: a start of that kind ends at once, Stalled with an infinite
// Miss.
func GaussNewton(ctx context.Context, p Problem, s *Set, c0 []float64, o Options) Result {
	if math.IsInf(s.barrier(c0), 1) {
		panic("solve: start outside the set")
	}
	o = o.filled(p.Jacobian == nil)
	n, m := p.Dim, p.Rows
	var (
		c     = append([]float64(nil), c0...)
		trial = make([]float64, n)
		step  = make([]float64, n)
		bent  = make([]float64, n)
		r     = make([]float64, m)
		rt    = make([]float64, m)
		jac   []float64
		g     = make([]float64, n)
		jr    = make([]float64, n)
		gb    = make([]float64, n)
		hb    = make([]float64, n*n)
		norm  = make([]float64, n*n)
		jj    = make([]float64, n*n)
	)
	ncon := float64(max(1, s.Constraints()))
	p.Residuals(c, r)
	res := Result{C: c, Miss: sumSquares(r), Status: Stalled, Evaluations: 1}
	if math.IsInf(res.Miss, 1) {
		return res
	}
	var quasi *update
	if p.Jacobian != nil {
		jac = make([]float64, m*n)
		p.Jacobian(jac)
	} else {
		quasi = newUpdate(n)
		p.Gradient(r, jr)
		quasi.begin(jr, res.Miss, jj)
	}
	miss, best := res.Miss, append([]float64(nil), c...)
	mu := o.Kappa * miss / ncon
	lambda := 1e-2
	phi := s.barrier(c)
	stalls, wait := 0, 0
	mark := math.Inf(1) // |r|² at the end of the last spell
	status := Exhausted
	fresh := true // r, jac belong to a new c: normal matrices must be formed
	// look evaluates the trial point, unless it lies outside: the barrier sees what
	// reach cannot, a step that is not finite.
	look := func() (miss, phi float64, ok bool) {
		if phi = s.barrier(trial); math.IsInf(phi, 1) {
			return math.Inf(1), phi, false
		}
		p.Residuals(trial, rt)
		res.Evaluations++
		return sumSquares(rt), phi, true
	}
	// move makes the trial, which look saw last, the current point. The merit may
	// fall while the miss rises, so the last point need not be the best.
	move := func(newMiss, newPhi float64) {
		c, trial = trial, c
		r, rt = rt, r
		miss, phi = newMiss, newPhi
		if miss <= res.Miss {
			res.Miss = miss
			copy(best, c)
		}
		if fresh = true; quasi == nil {
			p.Jacobian(jac)
			return
		}
		quasi.before(trial, c, jr)
		p.Gradient(r, jr)
		quasi.after(jr, jj)
	}
	for res.Iterations = 0; res.Iterations < o.Iterations; res.Iterations++ {
		if miss < o.Tolerance {
			status = Converged
			break
		}
		if ctx.Err() != nil {
			status = Interrupted
			break
		}
		if fresh {
			s.derivatives(c, gb, hb)
			if quasi == nil {
				J := blas64.General{Rows: m, Cols: n, Stride: n, Data: jac}
				blas64.Syrk(blas.Trans, 1, J, 0, blas64.Symmetric{Uplo: blas.Upper, N: n, Stride: n, Data: jj})
				blas64.Gemv(blas.Trans, 1, J, blas64.Vector{N: m, Inc: 1, Data: r}, 0, blas64.Vector{N: n, Inc: 1, Data: jr})
			}
			fresh = false
		}
		// Landing: near a zero the shortest step to it, in the barrier's metric,
		// converges quadratically where the centring below would keep the
		// convergence linear. It is taken when it fits and gains.
		if wait--; wait < 0 && quasi == nil && o.Tolerance > 0 && miss < landingMiss && descend(step, jr, jj, hb, norm, landingMetric*miss/ncon, n) &&
			nearBoundary*s.reach(c, step) >= 1 {
			for i := range trial {
				trial[i] = c[i] + step[i]
			}
			if newMiss, newPhi, ok := look(); ok && newMiss < landingGain*miss {
				move(newMiss, newPhi)
				wait = 0
				continue
			}
			wait = landingWait
		}
		mu = math.Min(mu, o.Kappa*miss/ncon)
		for i := range g {
			g[i] = jr[i] + mu*gb[i]
		}
		if !descend(step, g, jj, hb, norm, mu+lambda*miss, n) {
			if lambda *= 4; lambda > maxDamping {
				status = Stalled
				break
			}
			continue
		}
		slope := 0.0
		for i := range g {
			slope += g[i] * step[i]
		}
		merit := miss/2 + mu*phi
		t := math.Min(1, nearBoundary*s.reach(c, step))
		t0 := t
		var newMiss, newPhi float64
		accepted := false
		enough := func() (ok bool) {
			newMiss, newPhi, ok = look()
			return ok && newMiss/2+mu*newPhi <= merit+armijo*t*slope
		}
		for try := range halvings {
			for i := range trial {
				trial[i] = c[i] + t*step[i]
			}
			if accepted = enough(); accepted {
				break
			}
			// The full step failed because the residuals bend away from their
			// tangent: follow the bend once before shortening the step.
			if try == 0 && quasi == nil && newMiss < bendLimit*miss {
				follow(bent, rt, r, jac, step, norm, t, m, n)
				for i := range trial {
					trial[i] += bent[i]
				}
				if accepted = enough(); accepted {
					break
				}
			}
			t /= 2
		}
		if !accepted {
			lambda *= 4
			if lambda > maxDamping {
				status = Stalled
				break
			}
			continue
		}
		gain := (merit - newMiss/2 - mu*newPhi) / math.Max(math.Abs(miss/2), 1e-300)
		move(newMiss, newPhi)
		if t > 0.5 {
			lambda = math.Max(lambda/4, 1e-12)
		} else if t < 0.3*t0 {
			lambda *= 4
		}
		slow := gain < 1e-3
		if quasi != nil {
			if slow = false; (res.Iterations+1)%quasiSpell == 0 {
				slow = miss > (1-quasiGain)*mark
				mark = miss
			}
		}
		if slow {
			mu *= 0.2
			if stalls++; stalls >= o.Stalls {
				status = Stalled
				res.Iterations++
				break
			}
		}
	}
	if miss < o.Tolerance {
		status = Converged
	}
	res.C, res.Status = best, status
	return res
}

// follow stores in bent the correction of a step of length t that failed: with the
// part of the new residuals rt that the tangent does not explain,
//
//	N bent = -Jᵀ (rt - r - t J step),
//
// N the factorised normal matrix of the step (the second-order correction of
// Nocedal and Wright 2006, section 18.3, applied to all residuals).
func follow(bent, rt, r, jac, step, norm []float64, t float64, m, n int) {
	clear(bent)
	for i := range m {
		row := jac[i*n : (i+1)*n]
		e := rt[i] - r[i]
		for k, v := range row {
			e -= t * v * step[k]
		}
		for k, v := range row {
			bent[k] -= e * v
		}
	}
	tri := blas64.Triangular{Uplo: blas.Upper, Diag: blas.NonUnit, N: n, Stride: n, Data: norm}
	substitute(tri, bent)
}

// descend solves (jj + f hb) step = -g, forming the matrix in norm; false when
// it is not finite or not positive definite.
func descend(step, g, jj, hb, norm []float64, f float64, n int) bool {
	trace := 0.0
	for i := range n {
		for k := i; k < n; k++ {
			norm[i*n+k] = jj[i*n+k] + f*hb[i*n+k]
		}
		trace += norm[i*n+i]
	}
	if !(trace < math.MaxFloat64) {
		return false
	}
	for i := range n {
		norm[i*n+i] += tinyDiagonal * trace
	}
	tri, ok := lapack64.Potrf(blas64.Symmetric{Uplo: blas.Upper, N: n, Stride: n, Data: norm})
	if !ok {
		return false
	}
	for i := range g {
		step[i] = -g[i]
	}
	substitute(tri, step)
	return true
}

// substitute solves RᵀR x = v in place. For one right-hand side two triangular
// solves beat the library's routine for many.
func substitute(r blas64.Triangular, v []float64) {
	x := blas64.Vector{N: r.N, Inc: 1, Data: v}
	blas64.Trsv(blas.Trans, r, x)
	blas64.Trsv(blas.NoTrans, r, x)
}

// sumSquares returns |r|², +Inf when it is not a number.
func sumSquares(r []float64) float64 {
	s := 0.0
	for _, v := range r {
		s += v * v
	}
	if math.IsNaN(s) {
		return math.Inf(1)
	}
	return s
}
