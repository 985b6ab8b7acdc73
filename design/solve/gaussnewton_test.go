package solve

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
)

// A watch wraps a problem: it fails the test when a point outside the set is
// evaluated, by the definition of the set rather than by its own gauge, and
// counts.
type watch struct {
	t           *testing.T
	set         dense
	evaluations int
	best        float64 // smallest finite |r|² evaluated
}

func (w *watch) over(p Problem) Problem {
	w.best = math.Inf(1)
	q := p
	q.Residuals = func(c, r []float64) {
		w.evaluations++
		if g := w.set.gauge(c); !(g < 1) || math.IsNaN(c[0]) {
			w.t.Errorf("evaluated at gauge %v: %v", g, c)
		}
		p.Residuals(c, r)
		if s := inner(r, r); s < w.best {
			w.best = s
		}
	}
	return q
}

// of makes a problem of residuals and their Jacobian.
func of(dim, rows int, f func(c, r []float64), df func(c, jac []float64)) Problem {
	at := make([]float64, dim)
	return Problem{Dim: dim, Rows: rows,
		Residuals: func(c, r []float64) { copy(at, c); f(at, r) },
		Jacobian:  func(jac []float64) { df(at, jac) },
	}
}

// linear is r = A c - b.
func linear(a [][]float64, b []float64) Problem {
	return of(len(a[0]), len(a),
		func(c, r []float64) {
			for i := range a {
				r[i] = inner(a[i], c) - b[i]
			}
		},
		func(_, jac []float64) {
			for i := range a {
				copy(jac[i*len(a[0]):], a[i])
			}
		})
}

// identity is r = c - target.
func identity(target []float64) Problem {
	a := make([][]float64, len(target))
	for i := range a {
		a[i] = make([]float64, len(target))
		a[i][i] = 1
	}
	return linear(a, target)
}

// rosenbrock is r = (10 (y - x²), 1 - x): Rosenbrock 1960, Computer Journal 3,
// 175, with its zero at (1, 1).
func rosenbrock() Problem {
	return of(2, 2,
		func(c, r []float64) { r[0], r[1] = 10*(c[1]-c[0]*c[0]), 1-c[0] },
		func(c, jac []float64) { copy(jac, []float64{-20 * c[0], 10, -1, 0}) })
}

// limits builds a set and the same written out.
type limits struct {
	*Set
	full dense
}

func in(n int) *limits { return &limits{Set: NewSet(n)} }

func (l *limits) row(bound float64, a ...float64) *limits {
	l.AddRow(a, bound)
	l.full.rows = append(l.full.rows, scaledBy(a, 1/bound))
	return l
}

func (l *limits) disc(radius float64, p, q []float64) *limits {
	l.AddDisc(p, q, radius)
	l.full.discs = append(l.full.discs, [2][]float64{scaledBy(p, 1/radius), scaledBy(q, 1/radius)})
	return l
}

func box(n int, bound float64) *limits {
	l := in(n)
	for i := range n {
		a := make([]float64, n)
		a[i] = 1
		l.row(bound, a...)
	}
	return l
}

// run solves with every check that holds for any problem: no point outside, the
// reported miss is that of the reported point and the best evaluated, counts
// agree, and a second run repeats every bit.
func run(t *testing.T, p Problem, s *limits, c0 []float64, o Options) Result {
	t.Helper()
	w := watch{t: t, set: s.full}
	res := GaussNewton(context.Background(), w.over(p), s.Set, c0, o)
	if w.evaluations != res.Evaluations {
		t.Errorf("%d evaluations reported, %d seen", res.Evaluations, w.evaluations)
	}
	r := make([]float64, p.Rows)
	p.Residuals(res.C, r)
	if got := inner(r, r); !(got == res.Miss) {
		t.Errorf("miss %v reported, %v at the reported point", res.Miss, got)
	}
	if !(s.full.gauge(res.C) < 1) {
		t.Errorf("the result lies at gauge %v", s.full.gauge(res.C))
	}
	o = o.filled(p.Jacobian == nil)
	if res.Iterations > o.Iterations {
		t.Errorf("%d iterations of %d", res.Iterations, o.Iterations)
	}
	if (res.Status == Converged) != (res.Miss < o.Tolerance) {
		t.Errorf("%v at a miss of %v, tolerance %v", res.Status, res.Miss, o.Tolerance)
	}
	again := GaussNewton(context.Background(), p, s.Set, c0, o)
	if fmt.Sprint(again) != fmt.Sprint(res) {
		t.Errorf("the second run differs:\n%v\n%v", again, res)
	}
	return res
}

func wantAt(t *testing.T, res Result, status Status, want []float64, tol float64) {
	t.Helper()
	if res.Status != status {
		t.Errorf("%v, want %v (miss %v after %d iterations)", res.Status, status, res.Miss, res.Iterations)
	}
	for i := range want {
		if !(math.Abs(res.C[i]-want[i]) <= tol) {
			t.Errorf("ended at %v, want %v to %v", res.C, want, tol)
			return
		}
	}
}

func TestZeros(t *testing.T) {
	t.Run("Rosenbrock", func(t *testing.T) {
		s := in(2).disc(2, []float64{1, 0}, []float64{0, 1})
		for _, c0 := range [][]float64{{-1.2, 1}, {0, 0}, {1.9, 0.1}, {-0.5, -1.9}} {
			res := run(t, rosenbrock(), s, c0, Options{})
			// at |r|² < 1e-13 the point is off by at most |r|/smallest singular value (0.45) < 1e-6
			wantAt(t, res, Converged, []float64{1, 1}, 1e-6)
			if res.Evaluations > 120 {
				t.Errorf("%d evaluations from %v", res.Evaluations, c0)
			}
		}
	})
	t.Run("close to the boundary", func(t *testing.T) {
		// the zero lies at gauge 0.9999
		target := []float64{0.9999, -0.9999, 0.3}
		wantAt(t, run(t, identity(target), box(3, 1), []float64{0, 0, 0}, Options{}), Converged, target, 1e-6)
	})
	t.Run("landing", func(t *testing.T) {
		// Within reach of a zero the step to it is taken whole, though the barrier would
		// rather stay in the middle.
		res := run(t, identity([]float64{0.9, 0.05}), box(2, 1), []float64{0.85, 0}, Options{})
		wantAt(t, res, Converged, []float64{0.9, 0.05}, 1e-6)
		if res.Evaluations > 3 {
			t.Errorf("%d evaluations", res.Evaluations)
		}
	})
	t.Run("trigonometric", func(t *testing.T) {
		// r_i = n - sum cos c_j + i (1 - cos c_i) - sin c_i: Moré, Garbow, Hillstrom
		// 1981, ACM Trans. Math. Softw. 7, 17, problem 26; zero at the origin.
		const n = 6
		p := of(n, n,
			func(c, r []float64) {
				sum := 0.0
				for _, v := range c {
					sum += math.Cos(v)
				}
				for i, v := range c {
					r[i] = n - sum + float64(i+1)*(1-math.Cos(v)) - math.Sin(v)
				}
			},
			func(c, jac []float64) {
				for i := range n {
					for k := range n {
						jac[i*n+k] = math.Sin(c[k])
					}
					jac[i*n+i] += float64(i+1)*math.Sin(c[i]) - math.Cos(c[i])
				}
			})
		c0 := make([]float64, n)
		for i := range c0 {
			c0[i] = 1. / n
		}
		res := run(t, p, box(n, 1), c0, Options{})
		if res.Status != Converged {
			t.Errorf("%v at %v, miss %v", res.Status, res.C, res.Miss)
		}
	})
}

func TestMissesInside(t *testing.T) {
	// A line through three points off it: normal equations by hand. Minimum of
	// (a-1)² + (a+b-0)² + (a+2b-1)²: a = 2/3, b = 0, miss 2/3.
	p := linear([][]float64{{1, 0}, {1, 1}, {1, 2}}, []float64{1, 0, 1})
	res := run(t, p, box(2, 3), []float64{-2, 2}, Options{})
	wantAt(t, res, Stalled, []float64{2. / 3, 0}, 1e-4)
	if !(math.Abs(res.Miss-2./3) <= 1e-8) {
		t.Errorf("miss %v, want 2/3", res.Miss)
	}
	// Freudenstein and Roth 1963, J. ACM 10, 550 (as problem 2 of Moré, Garbow,
	// Hillstrom 1981): besides its zero at (5, 4) a local minimum of 48.98425 at
	// (11.41, -0.8968).
	p = of(2, 2,
		func(c, r []float64) {
			x, y := c[0], c[1]
			r[0], r[1] = -13+x+((5-y)*y-2)*y, -29+x+((y+1)*y-14)*y
		},
		func(c, jac []float64) {
			y := c[1]
			copy(jac, []float64{1, 10*y - 3*y*y - 2, 1, 3*y*y + 2*y - 14})
		})
	s := in(2).row(20, 1, 0).row(2, 0, 1) // without the zero
	res = run(t, p, s, []float64{0.5, -1.9}, Options{})
	wantAt(t, res, Stalled, []float64{11.41278, -0.89681}, 5e-2)
	if !(math.Abs(res.Miss-48.98425) <= 5e-3) {
		t.Errorf("miss %v, want 48.98425", res.Miss)
	}
}

func TestMissesAtLimits(t *testing.T) {
	rng := rand.New(rand.NewPCG(4, 1))
	// missTol is of the miss, relative. It is the damping that sets it, not the
	// last barrier weight, which is κ 0.2¹⁵ of the miss at most: steps that gain
	// less than 1e-3 count towards the stall. 4e-5 is the worst seen here.
	const missTol = 2e-4
	check := func(t *testing.T, res Result, want []float64, miss float64) {
		t.Helper()
		wantAt(t, res, Stalled, want, 4e-2)
		if !(math.Abs(res.Miss-miss) <= missTol*miss) {
			t.Errorf("miss %v, want %v (off by %.2g of it)", res.Miss, miss, res.Miss/miss-1)
		}
	}
	t.Run("corner of a box", func(t *testing.T) {
		for range 20 {
			n := 1 + rng.IntN(6)
			target, want := make([]float64, n), make([]float64, n)
			miss := 0.0
			for i := range n {
				target[i] = 3 * rng.NormFloat64()
				want[i] = math.Max(-1, math.Min(1, target[i]))
				miss += (target[i] - want[i]) * (target[i] - want[i])
			}
			if miss < 1e-3 {
				continue
			}
			check(t, run(t, identity(target), box(n, 1), make([]float64, n), Options{}), want, miss)
		}
	})
	t.Run("disc", func(t *testing.T) {
		// the nearest point of a disc of radius 0.7 to (3, 4) is 0.14 (3, 4)
		s := in(2).disc(0.7, []float64{1, 0}, []float64{0, 1})
		check(t, run(t, identity([]float64{3, 4}), s, []float64{-0.2, 0.5}, Options{}), []float64{0.42, 0.56}, 4.3*4.3)
	})
	t.Run("disc and row", func(t *testing.T) {
		// the unit disc cut at |x+y| <= 1: (4, 1) is nearest to the corner where
		// both are active, (1, 0).
		s := in(2).disc(1, []float64{1, 0}, []float64{0, 1}).row(1, 1, 1)
		check(t, run(t, identity([]float64{4, 1}), s, []float64{0, 0}, Options{}), []float64{1, 0}, 10)
		// (2, 2) is nearest to the middle of the cut, where only the row is
		check(t, run(t, identity([]float64{2, 2}), s, []float64{0.3, -0.6}, Options{}), []float64{0.5, 0.5}, 4.5)
	})
	t.Run("curved", func(t *testing.T) {
		// Two residuals that are not linear, under a disc and a skew row, against a
		// search of the boundary and the inside by brute force.
		p := of(2, 2,
			func(c, r []float64) { r[0], r[1] = math.Sin(2*c[0])+c[1]-2, c[0]*c[1]+c[0]-1.5 },
			func(c, jac []float64) { copy(jac, []float64{2 * math.Cos(2*c[0]), 1, c[1] + 1, c[0]}) })
		s := in(2).disc(1, []float64{1, 0}, []float64{0, 1}).row(0.9, 1, 0.7)
		best, at := math.Inf(1), []float64{0, 0}
		r := make([]float64, 2)
		lo, hi := []float64{-1, -1}, []float64{1, 1}
		for range 12 { // a grid, then finer and finer ones around the best point
			const n = 200
			for i := 0; i <= n; i++ {
				for k := 0; k <= n; k++ {
					c := []float64{lo[0] + (hi[0]-lo[0])*float64(i)/n, lo[1] + (hi[1]-lo[1])*float64(k)/n}
					if s.full.gauge(c) <= 1 {
						if p.Residuals(c, r); inner(r, r) < best {
							best, at = inner(r, r), c
						}
					}
				}
			}
			for i := range 2 {
				w := (hi[i] - lo[i]) / 10
				lo[i], hi[i] = at[i]-w, at[i]+w
			}
		}
		if g := s.full.gauge(at); !(g > 0.999999) {
			t.Fatalf("the minimum lies inside, at gauge %v: this tests nothing", g)
		}
		for _, c0 := range [][]float64{{0, 0}, {0.3, 0.6}, {0.6, -0.2}} {
			check(t, run(t, p, s, c0, Options{}), at, best)
		}
	})
	t.Run("kappa", func(t *testing.T) {
		s := in(2).disc(1, []float64{1, 0}, []float64{0, 1}).row(1, 1, 1)
		for _, kappa := range []float64{0.2, 1, 20} {
			check(t, run(t, identity([]float64{4, 1}), s, []float64{0, 0}, Options{Kappa: kappa}), []float64{1, 0}, 10)
		}
	})
}

func TestRankDeficient(t *testing.T) {
	// One equation for four coefficients, and the same equation twice.
	a := []float64{1, -1, 2, 0}
	for _, p := range []Problem{linear([][]float64{a}, []float64{1.5}), linear([][]float64{a, a}, []float64{1.5, 1.5})} {
		for _, s := range []*limits{box(4, 1), in(4), in(4).row(1, 1, 0, 0, 0)} {
			res := run(t, p, s, []float64{0.1, 0.2, -0.3, 0.9}, Options{})
			if res.Status != Converged {
				t.Errorf("%d rows, %d constraints: %v, miss %v", p.Rows, s.Constraints(), res.Status, res.Miss)
			}
		}
	}
	// Many coefficients that few equations leave free, and no limit at all: the
	// normal matrix is singular to the last bit.
	rng := rand.New(rand.NewPCG(4, 4))
	for _, n := range []int{20, 60, 150} {
		a, b := make([][]float64, 3), make([]float64, 3)
		for i := range a {
			for range n {
				a[i] = append(a[i], rng.NormFloat64())
			}
			b[i] = rng.NormFloat64()
		}
		res := run(t, linear(a, b), in(n), make([]float64, n), Options{})
		if res.Status != Converged || res.Evaluations > 30 {
			t.Errorf("%d coefficients: %v, miss %v, %d evaluations", n, res.Status, res.Miss, res.Evaluations)
		}
	}
	// Two that contradict each other: the best is half way.
	res := run(t, linear([][]float64{a, a}, []float64{1, 0}), box(4, 1), []float64{0.1, 0.2, -0.3, 0.9}, Options{})
	if res.Status != Stalled || !(math.Abs(res.Miss-0.5) <= 1e-9) {
		t.Errorf("%v, miss %v, want 0.5", res.Status, res.Miss)
	}
	// Residuals that do not depend on c at all.
	res = run(t, linear([][]float64{{0, 0}}, []float64{1}), box(2, 1), []float64{0.5, 0.2}, Options{})
	if res.Status != Stalled || res.Miss != 1 {
		t.Errorf("%v, miss %v, want a stall at 1", res.Status, res.Miss)
	}
}

func TestScales(t *testing.T) {
	// Units of the coefficients and of the residuals must not matter, the tolerance
	// going with the latter. The landing threshold is an absolute one, so the
	// paths may differ.
	target := []float64{0.7, -0.4, 0.2}
	for _, size := range []float64{1e-9, 1e-3, 1e6} {
		for _, unit := range []float64{1e-6, 1, 1e8} {
			a := make([][]float64, 4)
			b := make([]float64, 4)
			for i := range a {
				a[i] = make([]float64, 3)
				for k := range 3 {
					a[i][k] = unit / size * math.Cos(float64(1+i*(k+2)))
					b[i] += a[i][k] * target[k] * size
				}
			}
			res := run(t, linear(a, b), box(3, size), []float64{0, 0.5 * size, 0}, Options{Tolerance: 1e-20 * unit * unit})
			wantAt(t, res, Converged, scaledBy(target, size), 1e-8*size)
			// and an infeasible one
			far := scaledBy(target, 3*size)
			want := []float64{size, -size, 0.6 * size}
			p := identity(far)
			q := of(3, 3,
				func(c, r []float64) {
					p.Residuals(c, r)
					for i := range r {
						r[i] *= unit / size
					}
				},
				func(_, jac []float64) {
					clear(jac)
					jac[0], jac[4], jac[8] = unit/size, unit/size, unit/size
				})
			wantAt(t, run(t, q, box(3, size), []float64{0, 0, 0}, Options{Tolerance: 1e-20 * unit * unit}), Stalled, want, 1e-3*size)
		}
	}
}

func TestNotANumber(t *testing.T) {
	nan := math.NaN()
	t.Run("a region without residuals", func(t *testing.T) {
		// r = c - (0.5, 0), but nothing is known where c1 > 0.1
		for _, poison := range []float64{nan, math.Inf(1), math.Inf(-1)} {
			p := identity([]float64{0.5, 0})
			q := p
			q.Residuals = func(c, r []float64) {
				p.Residuals(c, r)
				if c[1] > 0.1 {
					r[0] = poison
				}
			}
			wantAt(t, run(t, q, box(2, 1), []float64{-0.9, -0.9}, Options{}), Converged, []float64{0.5, 0}, 1e-6)
			// the zero itself out of reach: it ends, and where residuals exist
			p = identity([]float64{0.5, 0.5})
			res := run(t, q, box(2, 1), []float64{-0.9, -0.9}, Options{})
			if res.Status == Converged || !(res.C[1] <= 0.1) || !(res.Miss < 0.5) {
				t.Errorf("poison %v: %v at %v, miss %v", poison, res.Status, res.C, res.Miss)
			}
		}
	})
	t.Run("at the start", func(t *testing.T) {
		for _, poison := range []float64{nan, math.Inf(-1), 1e200} {
			jacobians := 0
			p := of(2, 1, func(c, r []float64) { r[0] = poison }, func(c, jac []float64) { jacobians++ })
			res := GaussNewton(context.Background(), p, box(2, 1).Set, []float64{0.1, 0.2}, Options{})
			if res.Status != Stalled || !math.IsInf(res.Miss, 1) || res.Evaluations != 1 || jacobians != 0 || res.C[0] != 0.1 || res.C[1] != 0.2 {
				t.Errorf("poison %v: %+v", poison, res)
			}
		}
	})
	t.Run("everywhere but at the start", func(t *testing.T) {
		first := true
		p := identity([]float64{0.5, 0})
		q := p
		q.Residuals = func(c, r []float64) {
			p.Residuals(c, r)
			if !first {
				r[1] = nan
			}
			first = false
		}
		res := GaussNewton(context.Background(), q, box(2, 1).Set, []float64{0, 0.25}, Options{Iterations: 100000})
		if res.Status != Stalled || res.C[0] != 0 || res.C[1] != 0.25 || res.Miss != 0.3125 || res.Evaluations > 200 {
			t.Errorf("%+v", res)
		}
	})
	t.Run("in the Jacobian", func(t *testing.T) {
		for _, poison := range []float64{nan, math.Inf(1), 1e200} {
			p := of(2, 1, func(c, r []float64) { r[0] = c[0] - 0.01 }, func(c, jac []float64) { jac[0], jac[1] = poison, 1 })
			w := watch{t: t, set: box(2, 1).full}
			res := GaussNewton(context.Background(), w.over(p), box(2, 1).Set, []float64{0, 0}, Options{Iterations: 100000})
			if res.Status != Stalled || res.Iterations > 100 || !(res.Miss == 1e-4) {
				t.Errorf("poison %v: %+v", poison, res)
			}
		}
	})
}

func TestStatuses(t *testing.T) {
	s := in(2).disc(2, []float64{1, 0}, []float64{0, 1})
	res := run(t, rosenbrock(), s, []float64{-1.2, 1}, Options{Iterations: 3})
	if res.Status != Exhausted || res.Iterations != 3 {
		t.Errorf("%v after %d iterations, want the limit of 3", res.Status, res.Iterations)
	}
	// a start that is a zero needs one evaluation
	res = run(t, rosenbrock(), s, []float64{1, 1}, Options{})
	if res.Status != Converged || res.Evaluations != 1 || res.Iterations != 0 {
		t.Errorf("from the zero: %+v", res)
	}
	// convergence in the last allowed iteration counts
	whole := run(t, rosenbrock(), s, []float64{-1.2, 1}, Options{})
	res = run(t, rosenbrock(), s, []float64{-1.2, 1}, Options{Iterations: whole.Iterations})
	if res.Status != Converged {
		t.Errorf("%v with the %d iterations it takes", res.Status, whole.Iterations)
	}
	// a negative tolerance goes on to the rounding
	res = run(t, rosenbrock(), s, []float64{-1.2, 1}, Options{Tolerance: -1})
	if res.Status != Stalled || !(res.Miss <= 1e-25) {
		t.Errorf("without tolerance: %v at a miss of %v", res.Status, res.Miss)
	}
	for status, want := range map[Status]string{Converged: "converged", Stalled: "stalled at a miss", Exhausted: "iteration limit", Interrupted: "interrupted"} {
		if status.String() != want {
			t.Errorf("%d is %q, want %q", status, status, want)
		}
	}
}

func TestInterrupted(t *testing.T) {
	s := in(2).disc(2, []float64{1, 0}, []float64{0, 1})
	whole := run(t, rosenbrock(), s, []float64{-1.2, 1}, Options{})
	for at := 1; at < whole.Evaluations; at += 3 {
		ctx, cancel := context.WithCancel(context.Background())
		w := watch{t: t, set: s.full}
		p := w.over(rosenbrock())
		inner := p.Residuals
		p.Residuals = func(c, r []float64) {
			inner(c, r)
			if w.evaluations == at {
				cancel()
			}
		}
		res := GaussNewton(ctx, p, s.Set, []float64{-1.2, 1}, Options{})
		cancel()
		if res.Status != Interrupted && res.Status != Converged || res.Evaluations > at+2*halvings+1 {
			t.Errorf("cancelled at evaluation %d: %v after %d", at, res.Status, res.Evaluations)
		}
		if !(res.Miss <= 24.2) || !(s.Gauge(res.C) < 1) { // that of the start: 10² (1-1.44)² + 2.2²
			t.Errorf("cancelled at evaluation %d: miss %v at gauge %v", at, res.Miss, s.Gauge(res.C))
		}
	}
}

func TestBestPointIsKept(t *testing.T) {
	// Whatever the merit does, the point returned is the best that was accepted,
	// and cutting the run short never returns a better one.
	s := in(2).disc(2, []float64{1, 0}, []float64{0, 1}).row(0.5, 1, 1)
	last := math.Inf(1)
	for iterations := 1; iterations < 60; iterations++ {
		res := run(t, rosenbrock(), s, []float64{-1.2, 1.5}, Options{Iterations: iterations})
		if !(res.Miss <= last) {
			t.Errorf("%d iterations: miss %v, %v with one less", iterations, res.Miss, last)
		}
		last = res.Miss
	}
}

func TestFollow(t *testing.T) {
	// The correction for the bend solves N b = -Jᵀ (rt - r - t J p), N the normal
	// matrix of the step p; where the residuals are linear there is none.
	rng := rand.New(rand.NewPCG(4, 5))
	const n, m = 5, 3
	draw := func(k int) []float64 {
		v := make([]float64, k)
		for i := range v {
			v[i] = rng.NormFloat64()
		}
		return v
	}
	jac, r, rt, g, hb := draw(m*n), draw(m), draw(m), draw(n), make([]float64, n*n)
	jj, full := make([]float64, n*n), make([]float64, n*n)
	for i := range n {
		hb[i*n+i] = 1 + rng.Float64()
		for k := range n {
			for row := range m {
				jj[i*n+k] += jac[row*n+i] * jac[row*n+k]
			}
			full[i*n+k] = jj[i*n+k] + 0.3*hb[i*n+k]
		}
	}
	step, norm, bent := make([]float64, n), make([]float64, n*n), draw(n)
	if !descend(step, g, jj, hb, norm, 0.3, n) {
		t.Fatal("not positive definite")
	}
	for i := range n {
		if got := inner(full[i*n:(i+1)*n], step); !(math.Abs(got+g[i]) <= 1e-12) {
			t.Errorf("N p = %v, want %v", got, -g[i])
		}
	}
	const part = 0.7
	follow(bent, rt, r, jac, step, norm, part, m, n)
	for i := range n {
		want := 0.0
		for row := range m {
			want -= jac[row*n+i] * (rt[row] - r[row] - part*inner(jac[row*n:(row+1)*n], step))
		}
		if got := inner(full[i*n:(i+1)*n], bent); !(math.Abs(got-want) <= 1e-12) {
			t.Errorf("N b = %v, want %v", got, want)
		}
	}
	for row := range m {
		rt[row] = r[row] + part*inner(jac[row*n:(row+1)*n], step)
	}
	follow(bent, rt, r, jac, step, norm, part, m, n)
	if !(math.Sqrt(inner(bent, bent)) <= 1e-14) {
		t.Errorf("a bend of %v where there is none", bent)
	}
}

func TestStartOutsidePanics(t *testing.T) {
	for _, c0 := range [][]float64{{1, 0}, {0, -3}, {math.NaN(), 0}} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("no panic at %v", c0)
				}
			}()
			GaussNewton(context.Background(), rosenbrock(), box(2, 1).Set, c0, Options{})
		}()
	}
}

func TestRandomProblemsStayInside(t *testing.T) {
	// Random sets, random residuals that are not linear, many of them infeasible.
	rng := rand.New(rand.NewPCG(4, 2))
	statuses := map[Status]int{}
	for range 60 {
		n, m := 2+rng.IntN(6), 1+rng.IntN(8)
		set, d := randomSet(rng, n)
		s := &limits{set, d}
		a := make([]float64, m*n)
		for i := range a {
			a[i] = rng.NormFloat64()
		}
		b := inside(rng, d, n, 0.2+1.6*rng.Float64())
		f := func(c []float64, i int) (v, slope float64) {
			x := inner(a[i*n:(i+1)*n], c)
			return x + 0.3*math.Sin(3*x), 1 + 0.9*math.Cos(3*x)
		}
		p := of(n, m,
			func(c, r []float64) {
				for i := range m {
					v, _ := f(c, i)
					w, _ := f(b, i)
					r[i] = v - w
				}
			},
			func(c, jac []float64) {
				for i := range m {
					_, slope := f(c, i)
					for k := range n {
						jac[i*n+k] = slope * a[i*n+k]
					}
				}
			})
		res := run(t, p, s, inside(rng, d, n, 0.98*rng.Float64()), Options{})
		statuses[res.Status]++
	}
	if statuses[Converged] < 15 || statuses[Stalled] < 5 {
		t.Errorf("statuses %v: too one-sided to test anything", statuses)
	}
}

// BenchmarkGaussNewton times a solve of 12 residuals over 40 coefficients under
// 100 discs, where the residuals cost nothing.
func BenchmarkGaussNewton(b *testing.B) {
	rng := rand.New(rand.NewPCG(4, 3))
	const n, m = 40, 12
	s := NewSet(n)
	for range 100 {
		p, q := make([]float64, n), make([]float64, n)
		for j := range n / 2 {
			p[j] = rng.NormFloat64()
			q[n/2+j] = p[j]
		}
		s.AddDisc(p, q, 5)
	}
	a, target := make([][]float64, m), make([]float64, m)
	for i := range a {
		a[i] = make([]float64, n)
		for k := range n {
			a[i][k] = rng.NormFloat64()
		}
		target[i] = 2 * rng.NormFloat64()
	}
	p := linear(a, target)
	c0 := make([]float64, n)
	evaluations := 0
	for b.Loop() {
		res := GaussNewton(context.Background(), p, s, c0, Options{})
		if res.Status != Converged {
			b.Fatal(res.Status, res.Miss)
		}
		evaluations = res.Evaluations
	}
	b.ReportMetric(float64(evaluations), "evaluations")
}
