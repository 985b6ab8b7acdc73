package datasheet

import (
	"math"
	"math/cmplx"

	"github.com/mjibson/go-dsp/fft"
)

// A Spectrum is that of the samples in dB, relative to the largest of what is
// played, against the offset from the carrier.
type Spectrum struct {
	Frequency []float64 // MHz, ascending over [-fs/2, fs/2)
	Played    []float64 // dB, of the sample values
	Arriving  []float64 // dB, after the converter's hold and the line; nil when the line is not known
	Outside   float64   // share of the played energy outside the band, 0 to 1; 0 without a band
}

// floorDB stands for no energy at all.
const floorDB = -400.0

// longestSpectrum bounds the padded length.
const longestSpectrum = 1 << 20

// NewSpectrum computes the spectrum of samples x (share of full scale) at the
// sample period h (ns), padded with zeros to a power of two of at least eight
// times their number, which draws the lobes of a short pulse smoothly. The
// arriving curve is |X(f)| |sinc(f h)| |line(f)|, sinc x = sin(pi x)/(pi x),
// within half the sample rate; images beyond it are not drawn. line may be nil,
// band (GHz) zero or infinite. It returns nil for no samples, samples that are
// all zero or not finite, or more than 2^20 of them.
func NewSpectrum(x []complex128, h, band float64, line func(mhz float64) complex128) *Spectrum {
	if len(x) == 0 || len(x) > longestSpectrum || !positive(h) {
		return nil
	}
	n := 1024
	for n < 8*len(x) && n < longestSpectrum {
		n *= 2
	}
	padded := make([]complex128, n)
	for k, v := range x {
		if cmplx.IsNaN(v) || cmplx.IsInf(v) {
			return nil
		}
		padded[k] = v
	}
	bins := fft.FFT(padded)

	s := &Spectrum{Frequency: make([]float64, n), Played: make([]float64, n)}
	if line != nil {
		s.Arriving = make([]float64, n)
	}
	var largest, total, outside float64
	power := make([]float64, n)
	for i := range n {
		// Bin n/2 is -fs/2: the upper half of the bins comes first.
		v := bins[(i+n/2)%n]
		power[i] = float64(real(v)*real(v)) + float64(imag(v)*imag(v))
		f := 1e3 * float64(i-n/2) / (float64(n) * h)
		s.Frequency[i] = f
		largest = math.Max(largest, power[i])
		total += power[i]
		if positive(band) && math.Abs(f) > 1e3*band {
			outside += power[i]
		}
	}
	if !positive(largest) {
		return nil
	}
	s.Outside = outside / total
	for i, p := range power {
		s.Played[i] = decibels(p / largest)
		if line != nil {
			f := s.Frequency[i]
			g := sinc(f*h/1e3) * cmplx.Abs(line(f))
			s.Arriving[i] = decibels(p / largest * g * g)
		}
	}
	return s
}

func decibels(ratio float64) float64 {
	if !(ratio > 1e-40) { // floorDB; also what is not a number
		return floorDB
	}
	return 10 * math.Log10(ratio)
}

func sinc(x float64) float64 {
	if x == 0 {
		return 1
	}
	return math.Sin(math.Pi*x) / (math.Pi * x)
}
