package filter

import (
	"math"
	"math/cmplx"
)

// GaussianLike returns the all-pole approximation of a Gaussian low-pass of the
// given order, 1 to 8, with unit steady gain and |G| = 1/sqrt 2 (-3.0103 dB) at the
// cyclic frequency corner, in GHz from 1e-12 to 1e6. The exponential of the
// Gaussian's 1/|G|^2 = exp(ln 2 (f/corner)^2) is cut after its n-th power (M. Dishal,
// Electrical Communication 36 (1959) 3; from memory) and the corner is restored:
//
//	|G(iw)|^2 = 1/e_n(y_n (f/corner)^2),   e_n(z) = sum_{k<=n} z^k/k!,   e_n(y_n) = 2.
//
// The poles are -sqrt(-z/y_n) for the zeros z of e_n, scaled by the corner.
//
// A true Gaussian has no finite number of poles: this one is near, not equal. With
// the largest differences of gain and of step response (50 % points aligned), the
// 10-90 % transition time over the corner, which is 0.339624 for the Gaussian, and
// the overshoot:
//
//	order  gain    step    transition  overshoot
//	  1    0.2721  0.2025   0.34970    0
//	  2    0.1416  0.0940   0.34260    0.051 %
//	  3    0.0771  0.0574   0.34325    0.063 %
//	  4    0.0433  0.0406   0.34353    0.033 %
//	  5    0.0250  0.0314   0.34318    0.001 %
//	  6    0.0148  0.0259   0.34264    0.001 %
//	  7    0.0090  0.0223   0.34213    0.001 %
//	  8    0.0055  0.0198   0.34172    0.001 %
//
// Order 1 is the single pole. Gain converges geometrically, the step more slowly:
// the phase is that of a causal line, not that of a pure delay.
func GaussianLike(order int, corner float64) (Line, error) {
	if err := checkLowPass("Gaussian-like", order, corner); err != nil {
		return Line{}, err
	}
	poles := zeros(exponentialCoefficients(order), float64(order)/2)
	for i, z := range poles { // the upper zero of a pair gives the upper pole
		poles[i] = -cmplx.Sqrt(-z)
		if imag(z) == 0 {
			poles[i] = complex(real(poles[i]), 0)
		}
	}
	return allPole(poles, 2*math.Pi*corner/math.Sqrt(gaussianCorner(order))), nil
}

// exponentialCoefficients returns n!/k! for k = 0..n, those of n! e_n: integers,
// so exact.
func exponentialCoefficients(n int) []float64 {
	a := make([]float64, n+1)
	a[n] = 1
	for k := n; k > 0; k-- {
		a[k-1] = a[k] * float64(k)
	}
	return a
}

// gaussianCorner returns y_n, at which e_n is 2: between ln 2 and 1, where e_1 is.
func gaussianCorner(n int) float64 {
	a := exponentialCoefficients(n)
	return crossing(0.5, 1.5, func(y float64) bool {
		sum := 0.0
		for k := n; k >= 0; k-- {
			sum = float64(sum*y) + a[k]
		}
		return sum >= 2*a[0]
	})
}
