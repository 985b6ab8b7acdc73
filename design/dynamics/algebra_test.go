package dynamics

import (
	"math"
	"math/rand/v2"
	"testing"
)

func randomMatrix(rng *rand.Rand, d int) []complex128 {
	a := make([]complex128, d*d)
	for i := range a {
		a[i] = complex(rng.NormFloat64(), rng.NormFloat64())
	}
	return a
}

// TestKit holds every product against its definition, at the dimensions that are
// written out and at all remainders of four.
func TestKit(t *testing.T) {
	rng := rand.New(rand.NewPCG(31, 32))
	for d := 2; d <= 9; d++ {
		k := newKit(d)
		a, b := randomMatrix(rng, d), randomMatrix(rng, d)
		// Hermitian and commuting: h and two polynomials in it
		h := randomHermitian(rng, d, 1)
		h2 := slowMul(h, h, d)
		sum := make([]complex128, d*d)
		for i := range sum {
			sum[i] = a[i] + slowMul(a, b, d)[i]
		}
		bracket := slowMul(h, h2, d)
		anti := slowMul(h, slowAdj(h, d), d)
		x := randomHermitian(rng, d, 1)
		for i, v := range slowMul(x, h, d) {
			bracket[i] = -1i * (slowMul(h, x, d)[i] - v)
		}
		sp := newSparse(h, d)
		got := make([]complex128, d*d)
		for _, c := range []struct {
			name string
			do   func()
			want []complex128
		}{
			{"mul", func() { k.mul(got, a, b) }, slowMul(a, b, d)},
			{"mulAdd", func() { copy(got, a); k.mulAdd(got, a, b) }, sum},
			{"mulLeft", func() { k.mulLeft(got, a, b) }, slowMul(slowAdj(a, d), b, d)},
			{"mulRight", func() { k.mulRight(got, a, b) }, slowMul(a, slowAdj(b, d), d)},
			{"herm", func() { k.herm(got, h, h2) }, slowMul(h, h2, d)},
			{"hermLeft", func() { k.hermLeft(got, a, a) }, slowMul(slowAdj(a, d), a, d)},
			{"hermRight", func() { k.hermRight(got, a, a) }, slowMul(a, slowAdj(a, d), d)},
			{"bracket", func() { k.bracket(got, h, x) }, bracket},
			{"sparse mul", func() { sp.mul(got, a) }, slowMul(h, a, d)},
			{"sparse herm", func() { sp.herm(got, h) }, anti},
		} {
			for i := range got {
				got[i] = complex(math.NaN(), 0)
			}
			c.do()
			if e := off(got, c.want); !(e <= 1e-12) {
				t.Errorf("d = %d: %s off by %.2g", d, c.name, e)
			}
		}
		tr := 0.0
		for i := range d {
			tr += real(slowMul(h, x, d)[i*d+i])
		}
		if got := sp.trace(x); !(math.Abs(got-tr) <= 1e-12) {
			t.Errorf("d = %d: trace %v, want %v", d, got, tr)
		}
	}
}

// TestExponential holds exp(-i t H) against its Taylor series from the smallest
// arguments to those that are halved, and against unitarity.
func TestExponential(t *testing.T) {
	rng := rand.New(rand.NewPCG(33, 34))
	for _, d := range []int{2, 3, 4, 7} {
		k := newKit(d)
		p := newPowers(k)
		h := randomHermitian(rng, d, 1)
		n := spread(h, d)
		c, s, e := make([]complex128, d*d), make([]complex128, d*d), make([]complex128, d*d)
		for _, x := range []float64{0, 1e-9, 1e-4, 0.0005, 0.01, 0.05, 0.2, 0.4, 0.8, 1.3, 1.9, 2.1, 5, 30} {
			at := x / n
			for _, part := range []float64{1, -0.4} { // a smaller argument of the same powers, and the other way
				p.raise(k, h, nil, at)
				p.wave(k, c, s, part*at, nil)
				unitary(e, c, s)
				tol := 3e-15 * (1 + x*x)
				if got := off(e, slowExp(h, part*at, d)); !(got <= tol) {
					t.Errorf("d = %d, |tH| = %v: off by %.2g", d, part*x, got)
				}
				if got := off(slowMul(slowAdj(e, d), e, d), eye(d)); !(got <= tol) {
					t.Errorf("d = %d, |tH| = %v: unitary to %.2g", d, part*x, got)
				}
			}
		}
	}
}

// TestSeries holds the economised series against cos and sin over their whole reach.
func TestSeries(t *testing.T) {
	for m, s := range newSeries() {
		if m == 0 {
			continue
		}
		worst := 0.0
		for i := range 201 {
			x := s.reach * float64(i) / 200
			a, b := 0.0, 0.0
			for j := m; j >= 0; j-- {
				a = a*x*x + s.a[j]
				b = b*x*x + s.b[j]
			}
			worst = math.Max(worst, math.Abs(a-math.Cos(x)))
			worst = math.Max(worst, math.Abs(b*x-math.Sin(x)))
		}
		// the series' own error and rounding
		if !(worst <= seriesError+3e-16) {
			t.Errorf("%d powers up to %.3g: off by %.2g", m, s.reach, worst)
		}
		if m > 1 && m < mostPowers-1 && !(s.reach > newSeries()[m-1].reach) {
			t.Errorf("%d powers reach no farther than %d", m, m-1)
		}
	}
}

func TestRule(t *testing.T) {
	for n := 3; n <= mostPoints; n += 2 {
		r := newRule(n)
		for p := range 2 * n { // x^p
			sum := 0.0
			for q := range n {
				sum += r.weight[q] * math.Pow(r.node[q], float64(p))
			}
			if want := 1 / float64(p+1); !(math.Abs(sum-want) <= 1e-14) {
				t.Errorf("%d points: integral of x^%d is %v, want %v", n, p, sum, want)
			}
			if p >= n {
				continue
			}
			for q := range n {
				sum := 0.0
				for o := range n {
					sum += r.upto[q][o] * math.Pow(r.node[o], float64(p))
				}
				if want := math.Pow(r.node[q], float64(p+1)) / float64(p+1); !(math.Abs(sum-want) <= 1e-11) {
					t.Errorf("%d points: integral of x^%d up to %v is %v, want %v", n, p, r.node[q], sum, want)
				}
			}
		}
	}
	// points of three: 0.5 ± √15/10, weights 5/18 and 4/9 (Abramowitz and Stegun 1964,
	// table 25.4)
	r := newRule(3)
	if !(math.Abs(r.node[0]-(0.5-math.Sqrt(15)/10)) <= 1e-15 && math.Abs(r.weight[0]-5./18) <= 1e-15 && r.node[1] == 0.5 && math.Abs(r.weight[1]-4./9) <= 1e-15) {
		t.Errorf("three points: %v, %v", r.node, r.weight)
	}
	// the number of points keeps its promise for e^{ixs}
	for _, x := range []float64{0.01, 0.1, 0.5, 1, 2, 3, 5} {
		for _, within := range []float64{1e-9, 1e-13} {
			r := newRule(pointsFor(x, within))
			var re, im float64
			for q := range r.n {
				s, c := math.Sincos(x * r.node[q])
				re += r.weight[q] * c
				im += r.weight[q] * s
			}
			if e := math.Hypot(re-math.Sin(x)/x, im-(1-math.Cos(x))/x); !(e <= within+5e-16) {
				t.Errorf("x = %v: %d points are off by %.2g, want %.2g", x, r.n, e, within)
			}
		}
	}
}
