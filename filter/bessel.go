package filter

import "math"

// Bessel returns the low-pass of maximally flat group delay of the given order,
// 1 to 8, with unit steady gain, scaled so that |G| is 1/sqrt 2 (-3.0103 dB) at
// the cyclic frequency corner, in GHz from 1e-12 to 1e6:
//
//	G(s) = theta_n(0)/theta_n(s),
//	theta_n(s) = sum_k (2n-k)! / (2^{n-k} k! (n-k)!) s^k,
//
// the reverse Bessel polynomial, before scaling (W. E. Thomson, Proc. IEE 96
// III (1949) 487). The poles are within 2e-13 of the exact ones, relative, and the
// response within 1e-13 (tests against 40-digit poles and the polynomial).
func Bessel(order int, corner float64) (Line, error) {
	if err := checkLowPass("Bessel", order, corner); err != nil {
		return Line{}, err
	}
	return allPole(besselPoles(order), 2*math.Pi*corner/besselCorner(order)), nil
}

// besselCoefficients returns the coefficients of theta_n, lowest power first.
// They are integers below 2^22 for n <= 8, so exact.
func besselCoefficients(n int) []float64 {
	// theta_n = (2n-1) theta_{n-1} + s^2 theta_{n-2}
	before, now := []float64{1}, []float64{1, 1}
	if n == 0 {
		return before
	}
	for k := 2; k <= n; k++ {
		next := make([]float64, k+1)
		for i, v := range now {
			next[i] += float64(2*k-1) * v
		}
		for i, v := range before {
			next[i+2] += v
		}
		before, now = now, next
	}
	return now
}

// besselPoles returns the zeros of theta_n, ordered as [zeros] does; the
// coefficients allow 1e-13 for n = 8.
func besselPoles(n int) []complex128 { return zeros(besselCoefficients(n), float64(n)) }

// besselCorner returns the w at which |theta_n(iw)|^2 = 2 theta_n(0)^2. The left
// side rises with w, so halving an interval finds it to the last bit.
func besselCorner(n int) float64 {
	a := besselCoefficients(n)
	over := func(w float64) bool {
		even, odd := 0.0, 0.0
		for k := n; k >= 0; k-- { // Horner in s = iw: real part even, imaginary odd
			even, odd = a[k]-w*odd, w*even
		}
		return even*even+odd*odd > 2*a[0]*a[0]
	}
	// About sqrt((2n-1) ln 2), 3.2 for n = 8.
	return crossing(0, 10, over)
}
