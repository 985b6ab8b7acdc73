package filter

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"strings"
	"testing"
)

// A cascade's response is the product of its sections', delays included.
func TestCascadeIsTheProduct(t *testing.T) {
	d1, err := Delay(1.5)
	d1 = must(t, d1, err)
	d2, err := Delay(2.25)
	d2 = must(t, d2, err)
	asym := zoo(t)["asymmetric"]
	for name, sections := range map[string][]Line{
		"none":                 {},
		"one":                  {rackB(t)},
		"rack B":               {d1, bessel(t, 2, 0.2), tails(t, Tail{-0.015, 30}), d2},
		"bessel squared":       {bessel(t, 8, 0.2), bessel(t, 8, 0.2)},
		"bessel near bessel":   {bessel(t, 8, 0.2), bessel(t, 8, 0.203)},
		"bessel by 7 %":        {bessel(t, 5, 0.2), bessel(t, 5, 0.214)},
		"tail on its own pole": {pole(t, 30), tails(t, Tail{-0.015, 30}, Tail{0.1, 30.3})},
		"undone":               {pole(t, 10), {Direct: 10, Terms: []Term{{-2, 1, -19.5}}}},
		"complex":              {asym, asym, {Terms: []Term{{-0.4 + 2.001i, 2, 1}}}},
		"wide":                 {pole(t, 0.01), bessel(t, 3, 0.2), tails(t, Tail{-0.02, 1e3}, Tail{0.01, 1e6}), pole(t, 1)},
		"many tails":           {tails(t, Tail{0.01, 10}), tails(t, Tail{0.01, 11}), tails(t, Tail{0.01, 12}), tails(t, Tail{0.01, 13})},
	} {
		l := cascade(t, sections...)
		allReal := true
		for _, s := range sections {
			allReal = allReal && s.Real()
		}
		if l.Real() != allReal {
			t.Errorf("%s: real %v, want %v", name, l.Real(), allReal)
		}
		worst, largest := 0.0, 0.0
		for e := -9.0; e < 4; e += 0.05 {
			for _, w := range []float64{math.Pow(10, e), -math.Pow(10, e)} {
				want := complex128(1)
				for _, s := range sections {
					want *= s.Response(w)
				}
				worst = max(worst, cmplx.Abs(l.Response(w)-want))
				largest = max(largest, cmplx.Abs(want))
			}
		}
		if !(worst <= 3e-11*largest) {
			t.Errorf("%s: response off the product by %g of %g", name, worst, largest)
		}
		t.Logf("%-22s %2d terms, off by %.1e, sum of terms %.1e", name, len(l.Terms), worst/largest, size(l))
	}
}

// Two poles a relative distance d apart, from far to one rounding: whatever the
// representation, the step response is the closed form, written so that nothing
// cancels.
func TestNearlyEqualPoles(t *testing.T) {
	worst := 0.0
	for _, d := range []float64{0, 1e-16, 3e-16, 1e-15, 1e-12, 1e-9, 1e-6, 1e-4, 1e-3, 0.01, 0.02, 0.0299, 0.0301, 0.05, 0.2, 1} {
		a, b := 1.0, 1/(1/(1+d))
		l := cascade(t, pole(t, 1), pole(t, 1/(1+d)))
		for _, at := range []float64{1e-3, 0.2, 1, 2.7, 8, 30} {
			// 1 - (b e^{-at} - a e^{-bt})/(b-a) = 1 - e^{-mt} (cosh vt + m sinh(vt)/v),
			// m the mean and v half the distance.
			m, v := (a+b)/2, (b-a)/2
			sinhc := at
			if v*at > 1e-8 {
				sinhc = math.Sinh(v*at) / v
			}
			want := 1 - math.Exp(-m*at)*(math.Cosh(v*at)+m*sinhc)
			got := l.Step(at)
			worst = max(worst, cmplx.Abs(got-complex(want, 0)))
			if !(cmplx.Abs(got-complex(want, 0)) <= 1e-13) {
				t.Errorf("distance %g at %g: %v, want %.17g, off by %g", d, at, got, want, cmplx.Abs(got-complex(want, 0)))
			}
		}
	}
	t.Logf("worst %.1e", worst)
}

// Cascades of many nearly equal poles are accurate or refused in a clear
// sentence; the step response is checked against Runge-Kutta through the sections,
// the response against the product.
func TestManyNearlyEqualPoles(t *testing.T) {
	refused, merged := 0, 0
	for _, n := range []int{3, 5, 8} {
		for _, d := range []float64{1e-13, 1e-8, 1e-4, 1e-2, 0.025, 0.05, 0.1, 0.3} {
			var sections []Line
			var taus []float64
			for i := range n {
				tau := 1 + d*float64(i)
				taus = append(taus, tau)
				sections = append(sections, pole(t, tau))
			}
			l, err := Cascade(sections...)
			if err != nil {
				refused++
				if !strings.Contains(err.Error(), "allowed") {
					t.Errorf("%d poles, %g apart: unclear refusal %q", n, d, err)
				}
				t.Logf("%d poles, %g apart: %v", n, d, err)
				continue
			}
			if l.Terms[0].Power != 1 || l.Terms[len(l.Terms)-1].Power > 1 {
				merged++
			}
			for w := 0.0; w < 5; w += 0.1 {
				want := complex128(1)
				for _, s := range sections {
					want *= s.Response(w)
				}
				if off := cmplx.Abs(l.Response(w) - want); !(off <= cascadeTolerance) {
					t.Fatalf("%d poles, %g apart, w %g: off by %g", n, d, w, off)
				}
			}
			v := make([]float64, n)
			slope := func(v []float64) []float64 {
				s := make([]float64, n)
				in := 1.0
				for i := range s {
					s[i] = (in - v[i]) / taus[i]
					in = v[i]
				}
				return s
			}
			const dt = 0.002
			for i := 1; i <= 4000; i++ {
				at := func(k []float64, f float64) []float64 {
					o := append([]float64(nil), v...)
					for j := range o {
						o[j] += f * k[j]
					}
					return o
				}
				k1 := slope(v)
				k2 := slope(at(k1, dt/2))
				k3 := slope(at(k2, dt/2))
				k4 := slope(at(k3, dt))
				for j := range v {
					v[j] += dt / 6 * (k1[j] + 2*k2[j] + 2*k3[j] + k4[j])
				}
				if i%400 == 0 {
					if off := cmplx.Abs(l.Step(float64(i)*dt) - complex(v[n-1], 0)); !(off <= 1e-10) {
						t.Fatalf("%d poles, %g apart, step at %g: off by %g", n, d, float64(i)*dt, off)
					}
				}
			}
		}
	}
	if merged < 12 {
		t.Errorf("only %d of the cascades were merged", merged)
	}
	t.Logf("%d merged, %d refused", merged, refused)

	// Past the limits: too many equal poles, too many poles.
	var sections []Line
	for range MaxPower + 1 {
		sections = append(sections, pole(t, 1))
	}
	if _, err := Cascade(sections...); err == nil || !strings.Contains(err.Error(), "power 33; allowed: 1 to 32") {
		t.Errorf("33 equal poles: %v", err)
	}
	wide := Line{}
	for i := range MaxTerms {
		wide.Terms = append(wide.Terms, Term{complex(-1, float64(i)), 1, 1})
	}
	if _, err := Cascade(wide, pole(t, 1)); err == nil || !strings.Contains(err.Error(), "allowed: at most") {
		t.Errorf("too many poles: %v", err)
	}
	// Sixteen poles evenly over a factor of 2.2: too many digits cancel.
	sections = nil
	for i := range 16 {
		sections = append(sections, pole(t, 1+0.08*float64(i)))
	}
	if l, err := Cascade(sections...); err == nil {
		t.Errorf("sixteen crowded poles accepted, sum of terms %g", size(l))
	} else if !strings.Contains(err.Error(), "too close together") {
		t.Errorf("sixteen crowded poles: %v", err)
	}
}

// The order and the grouping of sections do not matter.
func TestCascadeOrder(t *testing.T) {
	rng := rand.New(rand.NewPCG(13, 14))
	a, b, c := bessel(t, 3, 0.2), tails(t, Tail{-0.05, 12}, Tail{0.02, 200}), pole(t, 12.1)
	x := randomSamples(rng, 40)
	times := grid(rng, 40, 1)
	u := cascade(t, a, b, c).Held(x, 1, times, nil)
	for _, l := range []Line{cascade(t, c, b, a), cascade(t, cascade(t, b, a), Through(), c), cascade(t, a, cascade(t, c, b))} {
		for i, v := range l.Held(x, 1, times, nil) {
			if !(cmplx.Abs(v-u[i]) <= 2e-12) {
				t.Fatalf("at %g: %v, want %v", times[i], v, u[i])
			}
		}
	}
	// A cascade of one line is a copy that shares nothing.
	l := cascade(t, a)
	l.Terms[0].Residue = 7
	if a.Terms[0].Residue == 7 {
		t.Error("cascade of one line shares its terms")
	}
}

// A group of poles that is its own mirror image gets a real centre, in whatever
// order its members come.
func TestMirroredGroup(t *testing.T) {
	p, q := -1+0.01i, -1.001+0.0131i
	l := Line{Terms: []Term{{p, 1, 0.3}, {q, 1, 0.1i}, {cmplx.Conj(p), 1, 0.3}, {cmplx.Conj(q), 1, -0.1i}}}
	joined := cascade(t, l, pole(t, 1.003), l)
	if !joined.Real() {
		t.Error("not real")
	}
	for _, term := range joined.Terms {
		if imag(term.Pole) != 0 || imag(term.Residue) != 0 {
			t.Errorf("term %v, want a real one", term)
		}
	}
	for w := 0.0; w < 5; w += 0.25 {
		want := l.Response(w) * l.Response(w) * pole(t, 1.003).Response(w)
		if d := cmplx.Abs(joined.Response(w) - want); !(d <= 1e-14) {
			t.Errorf("w %g: off by %g", w, d)
		}
	}
}

// Poles with powers beside other poles: what the narrow gap would lose, a wider one
// keeps, with the response of the product at many frequencies.
func TestWiderGaps(t *testing.T) {
	wider := 0
	for _, gap := range []float64{0.031, 0.045, 0.06, 0.09, 0.15} {
		for _, n := range []int{4, 6, 8} {
			sections := []Line{line(t)(CriticallyDamped(n, 0.2))}
			rate := -real(sections[0].Terms[0].Pole)
			sections = append(sections, pole(t, 1/(rate*(1+gap))), tails(t, Tail{0.1, 1 / (rate * (1 - gap))}))
			l := cascade(t, sections...)
			if _, err := join(sections, mergeGap, true); err != nil {
				wider++
			}
			if !l.Real() {
				t.Errorf("gap %g, order %d: not real", gap, n)
			}
			for w := 0.0; w < 20; w += 0.1 {
				want := complex128(1)
				for _, s := range sections {
					want *= s.Response(w)
				}
				if d := cmplx.Abs(l.Response(w) - want); !(d <= cascadeTolerance) {
					t.Fatalf("gap %g, order %d, w %g: off by %g", gap, n, w, d)
				}
			}
		}
	}
	if wider < 5 {
		t.Errorf("only %d cascades needed a wider gap", wider)
	}
	t.Logf("%d cascades needed a wider gap", wider)
}
