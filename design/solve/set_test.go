package solve

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
)

// A dense is a Set written out: every row and disc in full length, already
// divided by its bound. It is the definition that Set's spans abbreviate.
type dense struct {
	rows  [][]float64
	discs [][2][]float64
	balls [][][]float64 // rows of each
}

func inner(a, b []float64) float64 {
	s := 0.0
	for i := range a {
		s += a[i] * b[i]
	}
	return s
}

func (d dense) gauge(c []float64) float64 {
	m := 0.0
	for _, a := range d.rows {
		m = math.Max(m, math.Abs(inner(a, c)))
	}
	for _, p := range d.discs {
		x, y := inner(p[0], c), inner(p[1], c)
		m = math.Max(m, math.Sqrt(x*x+y*y))
	}
	for _, rows := range d.balls {
		m = math.Max(m, math.Sqrt(energy(rows, c)))
	}
	return m
}

// barrier takes every slack's logarithm by itself.
func (d dense) barrier(c []float64) float64 {
	sum := 0.0
	for _, a := range d.rows {
		v := inner(a, c)
		sum -= math.Log(1-v) + math.Log(1+v)
	}
	for _, p := range d.discs {
		x, y := inner(p[0], c), inner(p[1], c)
		sum -= math.Log(1 - x*x - y*y)
	}
	for _, rows := range d.balls {
		sum -= math.Log(1 - energy(rows, c))
	}
	return sum
}

func energy(rows [][]float64, c []float64) float64 {
	sum := 0.0
	for _, a := range rows {
		v := inner(a, c)
		sum += v * v
	}
	return sum
}

// part returns a random vector of length n that is zero outside a random
// stretch; holes inside it occur too.
func part(rng *rand.Rand, n int) []float64 {
	v := make([]float64, n)
	lo := rng.IntN(n)
	hi := lo + 1 + rng.IntN(n-lo)
	for i := lo; i < hi; i++ {
		if rng.IntN(5) > 0 {
			v[i] = rng.NormFloat64()
		}
	}
	v[lo] += 0.3
	return v
}

func scaledBy(v []float64, f float64) []float64 {
	w := make([]float64, len(v))
	for i := range v {
		w[i] = f * v[i]
	}
	return w
}

// randomSet returns a bounded set in n dimensions, with rows and discs of
// partial support, and the same written out.
func randomSet(rng *rand.Rand, n int) (*Set, dense) {
	s, d := NewSet(n), dense{}
	for range 2 + rng.IntN(6) {
		a, bound := part(rng, n), 0.1+rng.Float64()
		s.AddRow(a, bound)
		d.rows = append(d.rows, scaledBy(a, 1/bound))
	}
	for range 1 + rng.IntN(4) {
		p, q, r := part(rng, n), part(rng, n), 0.1+rng.Float64()
		if rng.IntN(3) == 0 {
			clear(q) // a disc of one vector is a row
		}
		s.AddDisc(p, q, r)
		d.discs = append(d.discs, [2][]float64{scaledBy(p, 1/r), scaledBy(q, 1/r)})
	}
	for range rng.IntN(3) {
		var rows [][]float64
		q, bound := make([]float64, n*n), 0.2+rng.Float64()
		for range 1 + rng.IntN(3) {
			a := part(rng, n)
			rows = append(rows, scaledBy(a, 1/bound))
			for i, v := range a {
				for k, w := range a {
					q[i*n+k] += v * w
				}
			}
		}
		s.AddBall(q, bound)
		d.balls = append(d.balls, rows)
	}
	for i := range n { // so that no direction is free
		a := make([]float64, n)
		a[i] = 1
		s.AddRow(a, 2)
		d.rows = append(d.rows, scaledBy(a, 0.5))
	}
	return s, d
}

// inside returns a random point of the set at the given gauge.
func inside(rng *rand.Rand, d dense, n int, gauge float64) []float64 {
	c := make([]float64, n)
	for i := range c {
		c[i] = rng.NormFloat64()
	}
	return scaledBy(c, gauge/d.gauge(c))
}

func TestSetAgainstDefinition(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 1))
	for trial := range 60 {
		n := 1 + rng.IntN(9)
		s, d := randomSet(rng, n)
		if got, want := s.Constraints(), 2*len(d.rows)+len(d.discs)+len(d.balls); got != want || len(s.rows) != len(d.rows) || s.Dim() != n {
			t.Fatalf("trial %d: %d constraints, want %d; %d rows, want %d; dimension %d, want %d", trial, got, want, len(s.rows), len(d.rows), s.Dim(), n)
		}
		for _, gauge := range []float64{0.01, 0.5, 0.999} {
			c := inside(rng, d, n, gauge)
			if got := s.Gauge(c); !(math.Abs(got-gauge) <= 1e-13) {
				t.Errorf("trial %d: gauge %v, want %v", trial, got, gauge)
			}
			if got, want := s.barrier(c), d.barrier(c); !(math.Abs(got-want) <= 1e-10*(1+math.Abs(want))) {
				t.Errorf("trial %d at gauge %v: barrier %v, want %v", trial, gauge, got, want)
			}
			p := inside(rng, d, n, math.Exp(4*rng.NormFloat64()))
			reach := s.reach(c, p)
			end := make([]float64, n)
			for i := range end {
				end[i] = c[i] + reach*p[i]
			}
			// at the end of the reach the point is on the boundary, and not before
			if got := d.gauge(end); !(math.Abs(got-1) <= 1e-12) {
				t.Errorf("trial %d at gauge %v: gauge %v at the reach %v, want 1", trial, gauge, got, reach)
			}
			for i := range end {
				end[i] = c[i] + 0.999*reach*p[i]
			}
			if !(d.gauge(end) < 1) {
				t.Errorf("trial %d: outside before the reach", trial)
			}
		}
		for _, gauge := range []float64{1.0000001, 3, math.NaN()} {
			if got := s.barrier(inside(rng, d, n, gauge)); !math.IsInf(got, 1) {
				t.Errorf("trial %d: barrier %v at gauge %v, want +Inf", trial, got, gauge)
			}
		}
		if got := s.barrier(make([]float64, n)); got != 0 {
			t.Errorf("trial %d: barrier %v at the origin, want 0", trial, got)
		}
	}
}

func TestBarrierDerivatives(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 2))
	for trial := range 40 {
		n := 1 + rng.IntN(7)
		s, d := randomSet(rng, n)
		c := inside(rng, d, n, 0.1+0.8*rng.Float64())
		g, h := make([]float64, n), make([]float64, n*n)
		for i := range h { // what was there before must not matter
			h[i] = math.NaN()
		}
		s.derivatives(c, g, h)
		const e = 2e-6
		for i := range n {
			p, m := append([]float64(nil), c...), append([]float64(nil), c...)
			p[i] += e
			m[i] -= e
			// e² times what 1/slack² adds, slack >= 0.1, and the rounding of φ over e
			if want := (d.barrier(p) - d.barrier(m)) / (2 * e); !(math.Abs(g[i]-want) <= 1e-6*(1+math.Abs(want))) {
				t.Errorf("trial %d: gradient[%d] = %v, want %v", trial, i, g[i], want)
			}
			gp, gm, none := make([]float64, n), make([]float64, n), make([]float64, n*n)
			s.derivatives(p, gp, none)
			s.derivatives(m, gm, none)
			for k := i; k < n; k++ {
				if want := (gp[k] - gm[k]) / (2 * e); !(math.Abs(h[i*n+k]-want) <= 1e-6*(1+math.Abs(want))) {
					t.Errorf("trial %d: Hessian[%d][%d] = %v, want %v", trial, i, k, h[i*n+k], want)
				}
			}
		}
	}
}

func TestBarrierOfManyLimits(t *testing.T) {
	// Far more slacks near zero than the running product could hold at once.
	s := NewSet(1)
	const n = 400
	for range n {
		s.AddRow([]float64{1}, 1)
	}
	c := 1 - 1e-9 // as a float64: a constant would be exact
	want := -n * (math.Log(1-c) + math.Log(1+c))
	if got := s.barrier([]float64{c}); !(math.Abs(got-want) <= 1e-12*want) {
		t.Errorf("barrier %v, want %v", got, want)
	}
}

func TestZeroRowsAreLeftOut(t *testing.T) {
	s := NewSet(3)
	s.AddRow([]float64{0, 0, 0}, 1)
	s.AddDisc([]float64{0, 0, 0}, []float64{0, 0, 0}, 1)
	if len(s.rows) != 0 || s.Constraints() != 0 {
		t.Errorf("%d rows and %d constraints of zero vectors", len(s.rows), s.Constraints())
	}
	if g := s.Gauge([]float64{5, 6, 7}); g != 0 {
		t.Errorf("gauge %v in the whole space", g)
	}
	if r := s.reach([]float64{5, 6, 7}, []float64{1, 1, 1}); !math.IsInf(r, 1) {
		t.Errorf("reach %v in the whole space", r)
	}
}

// BenchmarkDerivatives times the barrier of 100 discs and 100 rows over 40
// coefficients: about a design of 100 samples.
func BenchmarkDerivatives(b *testing.B) {
	rng := rand.New(rand.NewPCG(3, 4))
	const n = 40
	s := NewSet(n)
	for range 100 {
		p, q := make([]float64, n), make([]float64, n)
		for j := range n / 2 {
			p[j] = rng.NormFloat64()
			q[n/2+j] = p[j]
		}
		s.AddDisc(p, q, 20)
		s.AddRow(p, 20)
	}
	c, g, h := make([]float64, n), make([]float64, n), make([]float64, n*n)
	for i := range c {
		c[i] = rng.NormFloat64() / 10
	}
	if !(s.Gauge(c) < 1) {
		b.Fatal("outside")
	}
	for b.Loop() {
		s.derivatives(c, g, h)
	}
}

func ExampleSet() {
	s := NewSet(2)
	s.AddRow([]float64{1, 1}, 1)                     // |c0 + c1| <= 1
	s.AddDisc([]float64{1, 0}, []float64{0, 1}, 0.9) // |c| <= 0.9
	fmt.Println(s.Constraints(), s.Gauge([]float64{0.5, 0.25}))
	// Output: 3 0.75
}
