package noise

import (
	"fmt"
	"math"

	"github.com/mjibson/go-dsp/spectral"
)

// The lengths of a trace and its segments, in samples.
const (
	leastSegment = 32
	mostSegment  = 1 << 19
	mostRows     = 1_000_000 // of a trace or a table
)

// FromTrace estimates the spectrum of a measured trace lambda(k period), period in ns, by the averaged periodogram of Welch (1967, IEEE Trans.
// Audio Electroacoust. 15, 70): the mean of the whole trace is taken off, segments that overlap by half are weighed with the window of Hann,
// and their periodograms averaged. S runs straight between the bins, from 0 to half the sample rate, and is zero above, so that Variance is the
// mean square of the windowed segments exactly (Parseval).
//
// A segment is a power of two from 32 to 2^19 samples, and at most the trace; 0 chooses the largest with which seven or more fit, and 32 for traces
// that are too short for that. Nothing is known of the noise faster than half the sample rate, nor of what is slower than the trace; what is
// slower than a segment lands in the lowest bins. With K segments, every bin is uncertain by about 1/sqrt(K) of its value.
//
// It refuses more than 1e6 values, values beyond 1e20 or not finite, and a trace that never changes.
func FromTrace(values []float64, period float64, segment int) (*Spectrum, error) {
	if segment == 0 {
		for segment = leastSegment; segment*2 <= min(len(values)/4, mostSegment); segment *= 2 {
		}
	}
	switch {
	case len(values) < segment || len(values) > mostRows:
		return nil, fmt.Errorf("found a trace of %d values; allowed: one segment, %d, to %d", len(values), segment, mostRows)
	case segment < leastSegment || segment > mostSegment || segment&(segment-1) != 0:
		return nil, fmt.Errorf("found segments of %d values; allowed: a power of two, %d to %d", segment, leastSegment, mostSegment)
	case !within(math.Pi/period, leastFrequency, mostFrequency):
		return nil, fmt.Errorf("found a sample every %g ns; allowed: %g to %g", period, math.Pi/mostFrequency, math.Pi/leastFrequency)
	}
	mean := 0.0
	for i, v := range values {
		if !within(v, -1e20, 1e20) {
			return nil, fmt.Errorf("found the value %g; allowed: numbers from -1e20 to 1e20", v)
		}
		mean += (v - mean) / float64(i+1)
	}
	centred := make([]float64, len(values))
	for i, v := range values {
		centred[i] = v - mean
	}
	s := &Spectrum{w: make([]float64, segment/2+1), s: welch(centred, period, segment)}
	for k := range s.w {
		s.w[k] = 2 * math.Pi * float64(k) / (float64(segment) * period)
	}
	if v := s.Variance(); !within(v, leastLevel, mostLevel) {
		return nil, fmt.Errorf("found a trace of mean square %g about its mean; allowed: a trace that changes", v)
	}
	return s, nil
}

// welch gives the two-sided densities at the segment/2 + 1 frequencies from 0 to half the sample rate. The library scales rightly when it pads to the
// length of a segment, and its transform is sound at powers of two. It keeps tables for the whole program and starts goroutines for each
// transform, so it is called nowhere else in this package.
func welch(x []float64, period float64, segment int) []float64 {
	density, _ := spectral.Pwelch(x, 1/period, &spectral.PwelchOptions{NFFT: segment, Pad: segment, Noverlap: segment / 2})
	// What stands at a negative frequency was added to its positive one, except at the ends, which have none.
	for k := 1; k < len(density)-1; k++ {
		density[k] /= 2
	}
	return density
}
