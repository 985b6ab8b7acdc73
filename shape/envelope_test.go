package shape

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

// The drive of the examples: a full scale of 40 MHz turns by 2 pi 0.04 rad a
// sample of 1 ns, so X90 has an area of 6.25 and X180 of 12.5.
const quarterTurn = (math.Pi / 2) / (2 * math.Pi * 0.04)

// keeps checks the limits by the plainest means, exactly.
func keeps(x []float64, amplitude, slew float64) bool {
	padded := append(append([]float64{0}, x...), 0)
	for k, v := range padded {
		if math.IsNaN(v) || v > amplitude || -v > amplitude {
			return false
		}
		if k > 0 && (v-padded[k-1] > slew || padded[k-1]-v > slew) {
			return false
		}
	}
	return true
}

func sum(x []float64) float64 {
	var s, lost float64 // compensated
	for _, v := range x {
		y := v - lost
		next := s + y
		lost = (next - s) - y
		s = next
	}
	return s
}

// Cases by hand. The first is the X90 of rack B: 1/4, 1/2, 3/4, 4 x 1, 3/4,
// 1/2, 1/4 of a top of .89286 (CALC: 6.25/7; 9 samples hold at most 5.85).
func TestRampedSquareByHand(t *testing.T) {
	inf := math.Inf(1)
	for _, c := range []struct {
		area, amplitude, slew float64
		want                  []float64
	}{
		{quarterTurn, 0.95, 0.25, []float64{.25 * 6.25 / 7, .5 * 6.25 / 7, .75 * 6.25 / 7, 6.25 / 7, 6.25 / 7, 6.25 / 7, 6.25 / 7, .75 * 6.25 / 7, .5 * 6.25 / 7, .25 * 6.25 / 7}},
		{-1.5, 1, 0.25, []float64{-.25, -.5, -.5, -.25}},
		{1, 1, 1, []float64{1}},
		{1, 1, inf, []float64{1}},
		{2.5, 1, inf, []float64{2.5 / 3, 2.5 / 3, 2.5 / 3}},
		{0.3, 1, 0.25, []float64{.15, .15}},
		{0.1, 1, 0.25, []float64{.1}},
		{1, 1, 0.25, []float64{.25, .5, .25}},                                            // exactly what three samples hold
		{6.8, 0.95, 0.25, []float64{.25, .5, .75, .95, .95, .95, .95, .75, .5, .25}},     // exactly what ten samples hold
		{6.7, 0.95, 0.25, []float64{.25, .5, .75, .925, .925, .925, .925, .75, .5, .25}}, // equal steps would need .957
		{1.4, 1, 0.25, []float64{1.4 / 6, 1.4 / 3, 1.4 / 3, 1.4 / 6}},
	} {
		got := RampedSquare(c.area, c.amplitude, c.slew)
		if len(got) != len(c.want) {
			t.Errorf("%v, %v, %v: got %v, want %v", c.area, c.amplitude, c.slew, got, c.want)
			continue
		}
		for k := range got {
			if !(math.Abs(got[k]-c.want[k]) <= 1e-14) {
				t.Errorf("%v, %v, %v: sample %d is %.17g, want %.17g", c.area, c.amplitude, c.slew, k, got[k], c.want[k])
			}
		}
	}
}

// With 4 guard samples and blocks of 8, the raised cosine of X90 on rack B
// takes 24 samples and the square 16: its own length is 13 to 20. By hand:
// the peak of 13 samples is 2 area/13 = .9615, over .95; of 14 it is .8817.
func TestRaisedCosineByHand(t *testing.T) {
	got := RaisedCosine(quarterTurn, 0.95, 0.25)
	if len(got) != 14 {
		t.Fatalf("%d samples, want 14", len(got))
	}
	for k, v := range got {
		if want := 6.25 / 7 * (1 - math.Cos(2*math.Pi*(float64(k)+0.5)/14)) / 2; !(math.Abs(v-want) <= 1e-15) {
			t.Errorf("sample %d is %v, want %v", k, v, want)
		}
	}
	for _, c := range []struct {
		area, amplitude, slew float64
		want                  []float64
	}{
		{0.5, 1, 1, []float64{.5}},
		{1.2, 1, 1, []float64{.6, .6}},
		{-1.2, 0.9, 0.7, []float64{-.6, -.6}},
		{1.2, 1, 0.5, []float64{.3 * (1 - math.Sqrt2/2), .3 * (1 + math.Sqrt2/2), .3 * (1 + math.Sqrt2/2), .3 * (1 - math.Sqrt2/2)}}, // .2 .8 .2 would step by .6
	} {
		got := RaisedCosine(c.area, c.amplitude, c.slew)
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

// randomLimits draws limits of every relative size, some of them such that an
// envelope just fits, where rounding bites.
func randomLimits(r *rand.Rand) (area, amplitude, slew float64) {
	amplitude = math.Exp(-3 * r.Float64())
	slew = amplitude * math.Exp(1-5*r.Float64())
	area = amplitude * math.Exp(6*r.Float64()-1)
	switch r.IntN(5) {
	case 0:
		slew = amplitude / float64(1+r.IntN(40))
		area = amplitude * float64(1+r.IntN(200))
	case 1:
		amplitude, slew, area = 0.95, 0.01*float64(1+r.IntN(100)), 0.25*float64(1+r.IntN(100))
	case 2: // exactly what n samples hold
		area = 0
		n := 1 + r.IntN(300)
		for k := range n {
			area += math.Min(amplitude, slew*float64(min(k+1, n-k)))
		}
	case 3:
		slew = math.Inf(1)
	}
	if r.IntN(2) == 0 {
		area = -area
	}
	return area, amplitude, slew
}

// Limits exact, area kept, symmetric, and not one sample longer than it must be:
// no sequence at all of one sample less holds the area.
func TestRampedSquareRandom(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	equal := 0
	for range 4000 {
		area, amplitude, slew := randomLimits(r)
		x := RampedSquare(area, amplitude, slew)
		checkEnvelope(t, "square", x, area, amplitude, slew)
		n := len(x) - 1
		most := 0.0
		for k := range n {
			most += math.Min(amplitude, slew*float64(min(k+1, n-k)))
		}
		if n > 0 && !(most < math.Abs(area)) {
			t.Errorf("area %v, amplitude %v, slew %v: %d samples, but %d hold %v", area, amplitude, slew, len(x), n, most)
		}
		// Equal steps wherever they do, and then as few as possible.
		if first := math.Abs(x[0]); math.Abs(first-math.Min(slew, amplitude)) > 1e-9*first {
			equal++
			steps := math.Round(math.Abs(x[len(x)/2]) / first)
			if steps > 1 {
				flatter := math.Abs(area) / (float64(len(x)+1) - (steps - 1))
				if flatter <= amplitude && flatter/(steps-1) <= slew*(1-1e-12) {
					t.Errorf("area %v, amplitude %v, slew %v: %v ramp steps, one less would do", area, amplitude, slew, steps)
				}
			}
		}
	}
	if equal < 1000 {
		t.Errorf("only %d trapezoids of equal steps among 4000", equal)
	}
}

// One part in 1e11 more than ten samples hold takes eleven; rounding does not.
func TestEnvelopeLengthAtTheEdge(t *testing.T) {
	for _, c := range []struct {
		excess float64
		want   int
	}{{-1e-11, 10}, {0, 10}, {2e-16, 10}, {1e-11, 11}} {
		if x := RampedSquare(6.8*(1+c.excess), 0.95, 0.25); len(x) != c.want {
			t.Errorf("square, excess %v: %d samples, want %d", c.excess, len(x), c.want)
		}
		// The trapezoid of four steps and a plateau of .95 has 6.65.
		if x := RampedSquare(6.65*(1+c.excess), 0.95, 0.25); (c.excess <= 2e-16) != (math.Abs(x[0]-0.2375) < 1e-9) {
			t.Errorf("square, excess %v: starts at %v", c.excess, x[0])
		}
		// Ten samples reach (1+cos(pi/10))/2 of 2 area/10; eleven reach 2 area/11.
		limit := 5 / ((1 + math.Cos(math.Pi/10)) / 2)
		if x := RaisedCosine(limit*(1+c.excess), 1, 1); len(x) != c.want {
			t.Errorf("raised cosine, excess %v: %d samples, want %d", c.excess, len(x), c.want)
		}
	}
}

// The same for the raised cosine; no shorter one fits, by its definition.
func TestRaisedCosineRandom(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 6))
	for range 600 {
		area, amplitude, slew := randomLimits(r)
		x := RaisedCosine(area, amplitude, slew)
		checkEnvelope(t, "raised cosine", x, area, amplitude, slew)
		for n := 1; n <= len(x); n++ {
			shape := make([]float64, n)
			for k := range shape {
				shape[k] = (1 - math.Cos(2*math.Pi*(float64(k)+0.5)/float64(n))) / 2
			}
			scale := area / sum(shape)
			for k := range shape {
				shape[k] *= scale
			}
			if n < len(x) {
				if keeps(shape, amplitude*(1-1e-9), slew*(1-1e-9)) {
					t.Errorf("area %v, amplitude %v, slew %v: %d samples, but %d do", area, amplitude, slew, len(x), n)
				}
				continue
			}
			for k := range shape {
				if !(math.Abs(x[k]-shape[k]) <= 1e-12*amplitude) {
					t.Errorf("area %v, amplitude %v, slew %v: sample %d is %v, want %v", area, amplitude, slew, k, x[k], shape[k])
				}
			}
		}
	}
}

func checkEnvelope(t *testing.T, name string, x []float64, area, amplitude, slew float64) {
	t.Helper()
	if len(x) == 0 {
		t.Fatalf("%s, area %v, amplitude %v, slew %v: nothing", name, area, amplitude, slew)
	}
	if !keeps(x, amplitude, slew) {
		t.Errorf("%s, area %v, amplitude %v, slew %v: a limit is broken: %v", name, area, amplitude, slew, x)
	}
	if got := sum(x); !(math.Abs(got-area) <= 1e-12*math.Abs(area)) {
		t.Errorf("%s, amplitude %v, slew %v: area %v, want %v", name, amplitude, slew, got, area)
	}
	mirrored := slices.Clone(x)
	slices.Reverse(mirrored)
	if !slices.Equal(x, mirrored) {
		t.Errorf("%s, area %v, amplitude %v, slew %v: not symmetric", name, area, amplitude, slew)
	}
}

func TestEnvelopesRefused(t *testing.T) {
	inf, nan := math.Inf(1), math.NaN()
	for _, c := range [][3]float64{
		{0, 1, 1}, {nan, 1, 1}, {inf, 1, 1}, {-inf, 1, 1},
		{1, 0, 1}, {1, -1, 1}, {1, nan, 1}, {1, inf, 1}, {1, inf, inf},
		{1, 1, 0}, {1, 1, -1}, {1, 1, nan},
		{1, 1e-5, 1}, {1, 1, 1e-11}, {1e300, 1, 1}, {1, 1e-320, 1}, {1, 1, 1e-320}, {1, 1e-320, inf},
	} {
		if x := RampedSquare(c[0], c[1], c[2]); x != nil {
			t.Errorf("square%v: %d samples", c, len(x))
		}
		if x := RaisedCosine(c[0], c[1], c[2]); x != nil {
			t.Errorf("raised cosine%v: %d samples", c, len(x))
		}
	}
	// The longest that there is: all samples at the amplitude, or one ramp up and down.
	if x := RampedSquare(MaxSamples, 1, inf); len(x) != MaxSamples || !keeps(x, 1, inf) {
		t.Errorf("%d samples, want %d", len(x), MaxSamples)
	}
	if x := RampedSquare(1e-5*32768*32769, 1, 1e-5); len(x) != MaxSamples || !keeps(x, 1, 1e-5) {
		t.Errorf("%d samples, want %d", len(x), MaxSamples)
	}
	if x := RaisedCosine(32767, 1, inf); len(x) == 0 || !keeps(x, 1, inf) {
		t.Errorf("raised cosine of %d samples", len(x))
	}
}

func BenchmarkRampedSquare(b *testing.B) {
	for b.Loop() {
		sink += RampedSquare(quarterTurn, 0.95, 0.25)[0]
	}
}

func BenchmarkRaisedCosine(b *testing.B) {
	for b.Loop() {
		sink += RaisedCosine(quarterTurn, 0.95, 0.25)[0]
	}
}
