package shape

import "math"

// Gaussian returns the shortest truncated Gaussian of the given area, the sum
// of its samples, that keeps |x| <= amplitude and |x[k+1]-x[k]| <= slew, the
// steps from and to zero included. It is sampled at mid-sample,
//
//	x(k) = H (g(k+1/2-L/2) - g(L/2)),  g(t) = exp(-t^2/(2 s^2)),  s = L/(2 cut),  k = 0 ... L-1,
//
// with the H that meets the area: the Gaussian is cut off at cut standard
// deviations s on either side and its offset there is removed, so that it
// starts from zero, half a sample before its first sample, and not with a step.
// The spectrum of the step would outlast that of the bell.
//
// area is in samples of full scale, of either sign; amplitude is a share of
// full scale; slew is in shares per sample, and +Inf means no limit; cut is 0.5 to
// 8, and 2 to 3 is common practice. The limits are kept exactly, as the doubles
// stand; the area is met to a relative 1e-12. It returns nil for an area of zero, for
// what is not finite or not positive where it must be, for a cut out of its
// range, and where MaxSamples would not do.
func Gaussian(area, amplitude, slew, cut float64) []float64 {
	size, ok := envelopeLimits(area, amplitude, slew)
	if !ok || !(cut >= 0.5 && cut <= 8) {
		return nil
	}
	enough := size * (1 - areaSlack)
	// No sequence at all is shorter than the ramped square.
	for n := len(RampedSquare(area, amplitude, slew)); n > 0 && n <= MaxSamples; {
		x := make([]float64, n)
		var peak, step, before float64
		sum := gaussianBell(x, cut)
		for _, v := range x[:(n+1)/2] {
			peak, step, before = math.Max(peak, v), math.Max(step, v-before), v
		}
		over := math.Max(enough*peak/sum/amplitude, enough*step/sum/slew)
		if !(over > 1) {
			for k := range x {
				x[k] *= size / sum
			}
			return settle(x, area, amplitude, slew)
		}
		// Peaks shrink as 1/n and steps as 1/n^2, up to a relative 4/n^2 or so for
		// where the samples fall: no length below n sqrt(over) will do, less a margin.
		n = max(n+1, int(float64(n)*math.Sqrt(over)*(1-2/float64(n)))-4)
	}
	return nil
}

// gaussianBell fills x with the bell for H = 1 and returns its sum.
func gaussianBell(x []float64, cut float64) (sum float64) {
	n := len(x)
	for k := range (n + 1) / 2 {
		// In units of the half length; g(t) - g(end) = g(end) (e^d - 1), without cancellation.
		t := float64(n-1-2*k) / float64(n)
		v := math.Exp(-cut*cut/2) * math.Expm1(cut*cut/2*(1-t)*(1+t))
		x[k], x[n-1-k] = v, v
	}
	for _, v := range x {
		sum += v
	}
	return sum
}
