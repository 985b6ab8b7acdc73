package filter

import "math"

// Butterworth returns the low-pass of maximally flat gain of the given order, 1
// to 8, with unit steady gain and |G| = 1/sqrt 2 (-3.0103 dB) at the cyclic
// frequency corner, in GHz from 1e-12 to 1e6:
//
//	|G(iw)|^2 = 1/(1 + (f/corner)^{2n}),
//	p_k/(2 pi corner) = -sin a_k + i cos a_k,  a_k = pi (2k-1)/(2n),  k = 1..n
//
// (S. Butterworth, Experimental Wireless 7 (1930) 536). The step response
// overshoots, from 4.32 % for order 2 to 16.34 % for order 8; orders 2 and 4 have
// a 10-90 % transition time of 0.34187 and 0.38713 over the corner. Where ringing
// matters, see [Bessel].
func Butterworth(order int, corner float64) (Line, error) {
	if err := checkLowPass("Butterworth", order, corner); err != nil {
		return Line{}, err
	}
	var poles []complex128
	for k := 1; k <= order/2; k++ {
		sin, cos := math.Sincos(math.Pi * float64(2*k-1) / float64(2*order))
		poles = append(poles, complex(-sin, cos), complex(-sin, -cos))
	}
	if order%2 == 1 {
		poles = append(poles, -1)
	}
	return allPole(poles, 2*math.Pi*corner), nil
}
