package noise

import (
	"fmt"
	"math"
	"strings"
	"testing"
)

func TestForms(t *testing.T) {
	white, law, lorentz := made(t)(White(2, 0.5, 4)), made(t)(PowerLaw(3, 2, 1.5, 0.1, 10)), made(t)(Lorentzian(0.7, 5))
	table := made(t)(Tabulated([]float64{1, 10, 20}, []float64{1, 100, 25}))
	for _, c := range []struct {
		name    string
		s       *Spectrum
		w, want float64
	}{
		{"white", white, 0.5, 2}, {"white", white, -3, 2}, {"white", white, 4, 2}, {"white", white, 4.01, 0}, {"white", white, 0.49, 0}, {"white", white, 0, 0},
		{"power law", law, 2, 3}, {"power law", law, -8, 3.0 / 8}, {"power law", law, 0.1, 3 * math.Pow(20, 1.5)}, {"power law", law, 0.099, 0}, {"power law", law, 10.1, 0},
		{"Lorentzian", lorentz, 0, 4.9}, {"Lorentzian", lorentz, 0.2, 2.45}, {"Lorentzian", lorentz, -0.6, 0.49},
		{"table", table, 1, 1}, {"table", table, 2, 4}, {"table", table, -5, 25}, {"table", table, 10, 100}, {"table", table, math.Sqrt(200), 50}, {"table", table, 20, 25},
		{"table", table, 0.99, 0}, {"table", table, 20.1, 0}, {"table", table, math.NaN(), 0},
	} {
		near(t, fmt.Sprintf("%s at %g", c.name, c.w), c.s.S(c.w), c.want, 1e-13)
	}
	if white.Low() != 0.5 || white.High() != 4 || law.Low() != 0.1 || law.High() != 10 || lorentz.Low() != 0 || !math.IsInf(lorentz.High(), 1) || table.Low() != 1 || table.High() != 20 {
		t.Error("limits")
	}
	near(t, "variance of white noise", white.Variance(), 7/math.Pi, 1e-14)
	near(t, "variance of a power law", law.Variance(), 3/math.Pi*math.Pow(2, 1.5)*2*(1/math.Sqrt(0.1)-1/math.Sqrt(10)), 1e-13)
	near(t, "variance of 1/f noise", made(t)(PowerLaw(3, 2, 1, 0.1, 10)).Variance(), 6/math.Pi*math.Log(100), 1e-13)
	near(t, "variance of Lorentzian noise", lorentz.Variance(), 0.49, 1e-14)
	// int_1^10 w^2 dw = 333, int_10^20 1e4/w^2 dw = 500
	near(t, "variance of a table", table.Variance(), (333+500)/math.Pi, 1e-13)
}

// The convention: <lambda(0) lambda(t)> = (1/2pi) int S e^{iwt} dw, which for Lorentzian noise is sigma^2 exp(-t/tau).
func TestCorrelation(t *testing.T) {
	s := made(t)(Lorentzian(0.7, 5))
	for _, at := range []float64{1, 5, 12} {
		c, period := 0.0, 2*math.Pi/at
		for k := range 4000 {
			c += adaptive(func(w float64) float64 { return s.S(w) * math.Cos(w*at) / math.Pi }, float64(k)*period, float64(k+1)*period, 1e-11)
		}
		near(t, fmt.Sprintf("correlation after %g ns", at), c, 0.49*math.Exp(-at/5), 1e-5)
	}
}

func TestMoments(t *testing.T) {
	trace := &Spectrum{w: []float64{0, 1, 2, 3}, s: []float64{4, 1, 0, 2}}
	steep := made(t)(Tabulated([]float64{1, 1.001, 3, 3.5}, []float64{1, 50, 0.1, 0.1}))
	for i, s := range []*Spectrum{trace, steep, made(t)(White(2, 0.5, 4)), made(t)(PowerLaw(3, 2, 1, 0.1, 10)), made(t)(PowerLaw(3, 2, -1, 0.1, 10)),
		made(t)(PowerLaw(3, 2, 3, 0.1, 10)), made(t)(Lorentzian(1, 0.01)), made(t)(Lorentzian(1, 1)), made(t)(Lorentzian(1, 300))} {
		for _, p := range []int{-2, 0, 2} {
			for _, band := range [][2]float64{{0.2, 0.9}, {0.7, 2.6}, {1.0005, 1.2}, {2.2, 9}, {2.5, 2.501}, {5, 3}} {
				want := 0.0
				cuts := []float64{band[0], band[1]}
				for a := band[0]; a < band[1]; {
					b := min(band[1], a+0.01)
					for _, point := range s.w {
						if point > a && point < b {
							b = point
						}
					}
					want += adaptive(func(w float64) float64 { return s.S(w) * math.Pow(w, float64(p)) }, math.Nextafter(a, b), math.Nextafter(b, a), 1e-14)
					a = b
				}
				near(t, fmt.Sprintf("spectrum %d, w^%d, %v", i, p, cuts), s.moment(p, band[0], band[1]), want, 1e-8)
			}
		}
	}
	lorentz := made(t)(Lorentzian(1, 2))
	near(t, "half the band", lorentz.moment(0, 0, math.Inf(1)), math.Pi, 1e-14)
	near(t, "above 3", lorentz.moment(0, 3, math.Inf(1)), 2*(math.Pi/2-math.Atan(6)), 1e-13)
	near(t, "above 3, by w^2", lorentz.moment(-2, 3, math.Inf(1)), 4*(1.0/3-2*(math.Pi/2-math.Atan(6))), 1e-12)
	for _, x := range []float64{1e-5, 0.0999, 0.2, 0.2001, 3} {
		want := adaptive(func(y float64) float64 { return y * y / (1 + y*y) }, 0, x, 1e-18)
		near(t, fmt.Sprintf("x - atan x at %g", x), beyondArctan(x), want, 1e-11)
	}
}

func TestConstructorsRefuse(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	for _, c := range []struct {
		say  string
		make func() (*Spectrum, error)
	}{
		{"level 0", func() (*Spectrum, error) { return White(0, 0, 1) }},
		{"level NaN", func() (*Spectrum, error) { return White(nan, 0, 1) }},
		{"from 1 to 1", func() (*Spectrum, error) { return White(1, 1, 1) }},
		{"from -1 to 1", func() (*Spectrum, error) { return White(1, -1, 1) }},
		{"from 0 to +Inf", func() (*Spectrum, error) { return White(1, 0, inf) }},
		{"from NaN to 1", func() (*Spectrum, error) { return White(1, nan, 1) }},
		{"exponent 5", func() (*Spectrum, error) { return PowerLaw(1, 1, 5, 1, 2) }},
		{"stated at 0", func() (*Spectrum, error) { return PowerLaw(1, 0, 1, 1, 2) }},
		{"from 0 to 2", func() (*Spectrum, error) { return PowerLaw(1, 1, 1, 0, 2) }},
		{"from 2 to 1", func() (*Spectrum, error) { return PowerLaw(1, 1, 1, 2, 1) }},
		{"reaches 1e+80", func() (*Spectrum, error) { return PowerLaw(1, 1, 4, 1e-20, 2) }},
		{"reaches -1", func() (*Spectrum, error) { return PowerLaw(-1, 1, 0, 1, 2) }},
		{"square 0", func() (*Spectrum, error) { return Lorentzian(0, 1) }},
		{"time NaN", func() (*Spectrum, error) { return Lorentzian(1, nan) }},
		{"1 frequencies", func() (*Spectrum, error) { return Tabulated([]float64{1}, []float64{1}) }},
		{"1 densities", func() (*Spectrum, error) { return Tabulated([]float64{1, 2}, []float64{1}) }},
		{"at 0 rad", func() (*Spectrum, error) { return Tabulated([]float64{0, 2}, []float64{1, 1}) }},
		{"2 rad/ns after 2", func() (*Spectrum, error) { return Tabulated([]float64{2, 2}, []float64{1, 1}) }},
		{"density 0", func() (*Spectrum, error) { return Tabulated([]float64{1, 2}, []float64{1, 0}) }},
		{"density NaN", func() (*Spectrum, error) { return Tabulated([]float64{1, 2}, []float64{1, nan}) }},
	} {
		if s, err := c.make(); s != nil || err == nil || !strings.Contains(err.Error(), c.say) {
			t.Errorf("%s: got %v, %v", c.say, s, err)
		}
	}
	w, v := []float64{1, 2}, []float64{1, 1}
	s := made(t)(Tabulated(w, v))
	w[1], v[0] = 3, 7
	if s.High() != 2 || s.S(1) != 1 {
		t.Error("a table shares its caller's slices")
	}
}
