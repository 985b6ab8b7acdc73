package shape

import (
	"math"
	"math/rand/v2"
	"testing"
)

// By hand: at cut 2 two samples lie at half the half length, H (e^-1/2 - e^-2)
// each, so half the area each; three lie at -2/3, 0 and 2/3 of it.
func TestGaussianByHand(t *testing.T) {
	top, side, floor := 1.0, math.Exp(-8./9), math.Exp(-2)
	whole := top + 2*side - 3*floor
	for _, c := range []struct {
		area, amplitude, slew float64
		want                  []float64
	}{
		{0.5, 1, 1, []float64{.5}},
		{-1.2, 0.9, 0.7, []float64{-.6, -.6}},
		{1.2, 0.9, 0.55, []float64{1.2 * (side - floor) / whole, 1.2 * (top - floor) / whole, 1.2 * (side - floor) / whole}},
	} {
		got := Gaussian(c.area, c.amplitude, c.slew, 2)
		if len(got) != len(c.want) {
			t.Errorf("%v: got %v, want %v", c.area, got, c.want)
			continue
		}
		for k := range got {
			if !(math.Abs(got[k]-c.want[k]) <= 1e-15) {
				t.Errorf("%v: got %v, want %v", c.area, got, c.want)
				break
			}
		}
	}
}

// Limits exact, area kept, symmetric, and no shorter one fits, by its definition.
func TestGaussianRandom(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 7))
	longest := 0
	for range 200 {
		area, amplitude, slew := randomLimits(r)
		cut := 0.5 + 7.5*r.Float64()
		x := Gaussian(area, amplitude, slew, cut)
		checkEnvelope(t, "Gaussian", x, area, amplitude, slew)
		longest = max(longest, len(x))
		for n := 1; n <= len(x); n++ {
			if n < len(x) && n < len(x)/3 && n%7 != 0 {
				continue
			}
			bell := make([]float64, n)
			half := float64(n) / 2
			for k := range bell {
				s := half / cut
				at := float64(k) + 0.5 - half
				bell[k] = math.Exp(-at*at/(2*s*s)) - math.Exp(-half*half/(2*s*s))
			}
			scale := area / sum(bell)
			for k := range bell {
				bell[k] *= scale
			}
			if n < len(x) {
				if keeps(bell, amplitude*(1-1e-9), slew*(1-1e-9)) {
					t.Errorf("area %v, amplitude %v, slew %v, cut %v: %d samples, but %d do", area, amplitude, slew, cut, len(x), n)
				}
				continue
			}
			for k := range bell {
				if !(math.Abs(x[k]-bell[k]) <= 1e-12*amplitude) {
					t.Errorf("area %v, amplitude %v, slew %v, cut %v: sample %d is %v, want %v", area, amplitude, slew, cut, k, x[k], bell[k])
				}
			}
		}
	}
	if longest < 300 {
		t.Errorf("longest of all: %d samples", longest)
	}
}

func TestGaussianRefused(t *testing.T) {
	inf, nan := math.Inf(1), math.NaN()
	for _, c := range [][4]float64{
		{0, 1, 1, 2}, {nan, 1, 1, 2}, {inf, 1, 1, 2}, {1, 0, 1, 2}, {1, nan, 1, 2}, {1, inf, 1, 2}, {1, 1, 0, 2}, {1, 1, nan, 2},
		{1, 1e-5, 1, 2}, {1, 1, 1e-11, 2}, {MaxSamples, 1, inf, 2}, {1, 1, 1, 0.49}, {1, 1, 1, 8.1}, {1, 1, 1, -2}, {1, 1, 1, nan}, {1, 1, 1, inf},
	} {
		if x := Gaussian(c[0], c[1], c[2], c[3]); x != nil {
			t.Errorf("Gaussian%v: %d samples", c, len(x))
		}
	}
	if x := Gaussian(20000, 1, inf, 2.5); len(x) < 30000 || !keeps(x, 1, inf) {
		t.Errorf("%d samples", len(x))
	}
}
