package filter

import "math"

// CriticallyDamped returns the low-pass of order equal real poles, 1 to 8, with
// unit steady gain and |G| = 1/sqrt 2 (-3.0103 dB) at the cyclic frequency corner,
// in GHz from 1e-12 to 1e6:
//
//	G(s) = 1/(1 + s T)^n,   2 pi corner T = sqrt(2^{1/n} - 1).
//
// Its step response, 1 - e^{-v} sum_{j<n} v^j/j! with v = t/T, never overshoots: the
// closest model of a chain of buffers of equal speed.
func CriticallyDamped(order int, corner float64) (Line, error) {
	if err := checkLowPass("critically damped", order, corner); err != nil {
		return Line{}, err
	}
	rate := 2 * math.Pi * corner / math.Sqrt(math.Expm1(math.Ln2/float64(order)))
	residue := 1.0
	for range order {
		residue *= rate
	}
	return Line{Terms: []Term{{Pole: complex(-rate, 0), Power: order, Residue: complex(residue, 0)}}}, nil
}
