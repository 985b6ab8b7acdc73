package noise

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"strings"
	"testing"
)

// slow is Welch's estimate by its definition: the two-sided density at bin k of segments of length m, half overlapping, in the window of Hann, is
// the mean over segments of period |sum_j h_j x_j e^{-2 pi i jk/m}|^2 / sum_j h_j^2.
func slow(x []float64, period float64, m int) []float64 {
	hann, norm := make([]float64, m), 0.0
	for j := range hann {
		hann[j] = math.Pow(math.Sin(math.Pi*float64(j)/float64(m-1)), 2)
		norm += hann[j] * hann[j]
	}
	density, segments := make([]float64, m/2+1), 0
	for start := 0; start+m <= len(x); start += m / 2 {
		segments++
		for k := range density {
			var sum complex128
			for j := range m {
				sum += cmplx.Rect(hann[j]*x[start+j], -2*math.Pi*float64(j*k%m)/float64(m))
			}
			density[k] += period * real(sum*cmplx.Conj(sum)) / norm
		}
	}
	for k := range density {
		density[k] /= float64(segments)
	}
	return density
}

func TestTraceByDefinition(t *testing.T) {
	random := rand.New(rand.NewPCG(11, 5))
	const period = 2.5
	for _, c := range []struct{ n, segment, used int }{{32, 32, 32}, {33, 0, 32}, {127, 0, 32}, {300, 0, 64}, {1000, 64, 64}, {1000, 512, 512}, {1000, 0, 128}} {
		x, mean := make([]float64, c.n), 0.0
		for i := range x {
			x[i] = 40 + random.NormFloat64() + 3*math.Sin(float64(i))
			mean += x[i] / float64(c.n)
		}
		s := made(t)(FromTrace(x, period, c.segment))
		for i := range x {
			x[i] -= mean
		}
		want := slow(x, period, c.used)
		if len(s.s) != len(want) {
			t.Fatalf("%d bins of %d", len(s.s), len(want))
		}
		for k, v := range want {
			w := 2 * math.Pi * float64(k) / (float64(c.used) * period)
			near(t, fmt.Sprintf("frequency %d", k), s.w[k], w, 1e-14)
			if !(math.Abs(s.s[k]-v) <= 1e-11*v+1e-13) {
				t.Errorf("%v: bin %d is %g, wanted %g", c, k, s.s[k], v)
			}
		}
		near(t, "S between bins", s.S((s.w[3]+s.w[4])/2), (s.s[3]+s.s[4])/2, 1e-12)
		// Parseval: the variance is the mean square in the windows.
		square, weight := 0.0, 0.0
		for start := 0; start+c.used <= c.n; start += c.used / 2 {
			for j := range c.used {
				h := math.Pow(math.Sin(math.Pi*float64(j)/float64(c.used-1)), 4)
				square, weight = square+h*x[start+j]*x[start+j], weight+h
			}
		}
		near(t, "variance", s.Variance(), square/weight, 1e-11)
		if s.Low() != 0 || s.S(s.High()*1.0001) != 0 {
			t.Error("limits")
		}
		near(t, "half the sample rate", s.High(), math.Pi/period, 1e-14)
	}
}

// Synthetic noise of a known spectrum, one fixed seed.
func TestTraceOfKnownNoise(t *testing.T) {
	random := rand.New(rand.NewPCG(2024, 7))
	const n, segment, period, sigma = 1 << 18, 1024, 4.0, 0.3
	white := make([]float64, n)
	for i := range white {
		white[i] = 7 + sigma*random.NormFloat64()
	}
	s := made(t)(FromTrace(white, period, segment))
	near(t, "variance of white noise", s.Variance(), sigma*sigma, 0.01)
	// An average over many of the 511 bins of about 510 segments.
	for _, band := range [][2]int{{1, 100}, {100, 300}, {300, 511}} {
		mean := 0.0
		for _, v := range s.s[band[0]:band[1]] {
			mean += v / float64(band[1]-band[0])
		}
		near(t, fmt.Sprint("level of white noise in bins ", band), mean, sigma*sigma*period, 0.015)
	}
	// With K segments a bin scatters by the share sqrt(19/(18 K)) in the long run (Welch 1967 for half overlap).
	scatter := 0.0
	for _, v := range s.s[1:512] {
		scatter += math.Pow(v/(sigma*sigma*period)-1, 2) / 511
	}
	near(t, "scatter", math.Sqrt(scatter), math.Sqrt(19.0/18/float64(2*n/segment-1)), 0.15)

	// x' = r x + sqrt(1 - r^2) sigma xi, r = exp(-period/tau): sampled Lorentzian noise. Its density holds what lies above half the sample rate too:
	// sigma^2 period (1 - r^2)/(1 - 2 r cos(w period) + r^2).
	const tau = 160.0
	r := math.Exp(-period / tau)
	x := sigma * random.NormFloat64()
	lorentz := make([]float64, n)
	for i := range lorentz {
		lorentz[i] = x
		x = r*x + math.Sqrt(1-r*r)*sigma*random.NormFloat64()
	}
	s = made(t)(FromTrace(lorentz, period, segment))
	near(t, "variance of Lorentzian noise", s.Variance(), sigma*sigma, 4*math.Sqrt(2*tau/(n*period)))
	want := made(t)(Lorentzian(sigma, tau))
	for _, band := range [][2]int{{2, 8}, {8, 20}, {20, 60}, {60, 200}, {200, 500}} {
		got, sampled, ideal := 0.0, 0.0, 0.0
		for k := band[0]; k < band[1]; k++ {
			w := s.w[k]
			got += s.s[k]
			sampled += sigma * sigma * period * (1 - r*r) / (1 - 2*r*math.Cos(w*period) + r*r)
			ideal += want.S(w)
		}
		chance := 4 / math.Sqrt(float64(2*n/segment-1)*float64(band[1]-band[0]))
		near(t, fmt.Sprint("sampled Lorentzian noise in bins ", band), got, sampled, chance)
		if band[1] <= 60 {
			near(t, fmt.Sprint("Lorentzian noise in bins ", band), got, ideal, chance+0.01)
		}
	}
	// What it is for: the same infidelity of an echo as that of the true spectrum.
	const T = 400.0
	filter := func(w float64) float64 { return echo().filter(w, T) }
	near(t, "echo", sum(s.Nodes(T, 64), filter), ornstein(echo(), sigma, tau, T), 0.03)
}

// Noise slower than a segment is not lost.
func TestTraceOfSlowNoise(t *testing.T) {
	x, square := make([]float64, 4096), 0.0
	for i := range x {
		x[i] = math.Cos(2 * math.Pi * float64(i) / 4096)
		square += x[i] * x[i] / 4096
	}
	s := made(t)(FromTrace(x, 1, 128))
	near(t, "variance", s.Variance(), square, 0.03)
	near(t, "variance in the lowest bins", s.moment(0, 0, s.w[3])/math.Pi, square, 0.03)
}

func TestTraceRefuses(t *testing.T) {
	alternating := func(n int) []float64 {
		x := make([]float64, n)
		for i := range x {
			x[i] = float64(i % 2)
		}
		return x
	}
	for _, c := range []struct {
		say     string
		x       []float64
		period  float64
		segment int
	}{
		{"trace of 0 values", nil, 1, 0},
		{"trace of 31 values", alternating(31), 1, 0},
		{"trace of 100 values", alternating(100), 1, 128},
		{"trace of 1000001 values", alternating(1_000_001), 1, 64},
		{"segments of 48 values", alternating(100), 1, 48},
		{"segments of 16 values", alternating(100), 1, 16},
		{"segments of -4 values", alternating(100), 1, -4},
		{"every 0 ns", alternating(100), 0, 0},
		{"every -1 ns", alternating(100), -1, 0},
		{"every NaN ns", alternating(100), math.NaN(), 0},
		{"mean square 0", make([]float64, 64), 1, 0},
		{"value NaN", append(alternating(99), math.NaN()), 1, 0},
		{"value +Inf", append(alternating(99), math.Inf(1)), 1, 0},
	} {
		if s, err := FromTrace(c.x, c.period, c.segment); s != nil || err == nil || !strings.Contains(err.Error(), c.say) {
			t.Errorf("%s: got %v, %v", c.say, s, err)
		}
	}
}
