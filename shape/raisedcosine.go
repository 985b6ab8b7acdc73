package shape

import "math"

// RaisedCosine returns the shortest raised cosine of the given area, the sum
// of its samples, that keeps |x| <= amplitude and |x[k+1]-x[k]| <= slew, the steps
// from and to zero included. It is sampled at mid-sample,
//
//	x(k) = H (1 - cos(2 pi (k+1/2)/L))/2,  k = 0 ... L-1,
//
// with H = 2 area/L, and H = area for L = 1.
//
// area is in samples of full scale, of either sign; amplitude is a share of
// full scale; slew is in shares per sample, and +Inf means no limit. The limits
// are kept exactly, as the doubles stand; the area is met to a relative 1e-12.
// It returns nil for an area of zero, for what is not finite or not positive
// where it must be, and where MaxSamples would not do.
func RaisedCosine(area, amplitude, slew float64) []float64 {
	size, ok := envelopeLimits(area, amplitude, slew)
	if !ok {
		return nil
	}
	enough := size * (1 - areaSlack)
	first := max(1, int(size/amplitude)) // no sequence of n samples holds more than n amplitudes
	for n := first; n <= MaxSamples; n++ {
		peak, step := raisedCosineFigures(n)
		if enough*peak > amplitude || enough*step > slew {
			continue
		}
		x := make([]float64, n)
		for k := range x {
			s := math.Sin(math.Pi * (float64(min(k, n-1-k)) + 0.5) / float64(n)) // symmetric to the last bit
			x[k] = size * (s * s * raisedCosineScale(n))
		}
		return settle(x, area, amplitude, slew)
	}
	return nil
}

// raisedCosineScale is H for unit area: the samples (1-cos)/2 sum to n/2,
// but for n = 1, where the one sample is 1.
func raisedCosineScale(n int) float64 {
	if n == 1 {
		return 1
	}
	return 2 / float64(n)
}

// raisedCosineFigures returns the largest sample and the largest step, those
// from and to zero included, of the raised cosine of n samples and unit area.
//
// Step k, from sample k-1 to k, is H sin(pi/n) sin(2 pi k/n), largest for a k
// beside n/4; the first from zero is H sin^2(pi/2n).
func raisedCosineFigures(n int) (peak, step float64) {
	h, period := raisedCosineScale(n), float64(n)
	peak = h
	if n%2 == 0 {
		peak *= 1 - math.Pow(math.Sin(math.Pi/(2*period)), 2)
	}
	edge := math.Sin(math.Pi / (2 * period))
	step = h * edge * edge
	for _, k := range [2]int{n / 4, n/4 + 1} {
		step = math.Max(step, h*math.Sin(math.Pi/period)*math.Sin(2*math.Pi*float64(k)/period))
	}
	return peak, step
}
