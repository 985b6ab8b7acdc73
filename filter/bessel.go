package filter

import (
	"fmt"
	"math"
	"math/cmplx"
)

// maxBessel is the highest order offered.
const maxBessel = 8

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
	if order < 1 || order > maxBessel {
		return Line{}, fmt.Errorf("filter: Bessel order %d; allowed: 1 to %d", order, maxBessel)
	}
	if !(corner >= lowestCorner && corner <= highestCorner) {
		return Line{}, fmt.Errorf("filter: Bessel corner %g GHz; allowed: %g to %g GHz", corner, lowestCorner, highestCorner)
	}
	poles := besselPoles(order)
	scale := complex(2*math.Pi*corner/besselCorner(order), 0)
	var l Line
	for i, p := range poles {
		// r_i = theta(0)/theta'(p_i) = -p_i prod_{j != i} p_j/(p_j - p_i).
		r := -p
		for j, q := range poles {
			if j != i {
				r *= q / (q - p)
			}
		}
		if imag(p) == 0 {
			r = complex(real(r), 0)
		}
		l.Terms = append(l.Terms, Term{Pole: scale * p, Power: 1, Residue: scale * r})
		if i%2 == 1 && imag(p) < 0 { // the exact conjugate of the term before
			l.Terms[i].Residue = cmplx.Conj(l.Terms[i-1].Residue)
		}
	}
	return l, nil
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

// besselPoles returns the zeros of theta_n: conjugates adjacent, upper one
// first, exact mirror images; the real one of an odd order last. Durand and
// Kerner's iteration finds all zeros at once, to what the conditioning of the
// coefficients allows (1e-13 for n = 8): Newton steps after it gain nothing.
func besselPoles(n int) []complex128 {
	a := besselCoefficients(n)
	z := make([]complex128, n)
	for i := range z {
		// A ring of about the right size, turned off the real axis.
		z[i] = cmplx.Rect(float64(n), 0.4+2*math.Pi*float64(i)/float64(n))
	}
	for range 500 {
		change := 0.0
		for i := range z {
			d := complex128(0)
			for k := n; k >= 0; k-- {
				d = d*z[i] + complex(a[k], 0)
			}
			for j := range z {
				if j != i {
					d /= z[i] - z[j]
				}
			}
			z[i] -= d
			change = max(change, cmplx.Abs(d)/cmplx.Abs(z[i]))
		}
		if change < 1e-13 {
			break
		}
	}
	var poles []complex128
	single := complex(0, math.Inf(1)) // the zero nearest the real axis
	for _, v := range z {
		if math.Abs(imag(v)) < math.Abs(imag(single)) {
			single = v
		}
	}
	for _, v := range z {
		if n%2 == 1 && v == single || imag(v) < 0 {
			continue
		}
		poles = append(poles, v, cmplx.Conj(v))
	}
	if n%2 == 1 {
		poles = append(poles, complex(real(single), 0))
	}
	return poles
}

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
	lo, hi := 0.0, 10.0 // about sqrt((2n-1) ln 2), 3.2 for n = 8
	for {
		mid := (lo + hi) / 2
		if mid <= lo || mid >= hi {
			return mid
		}
		if over(mid) {
			hi = mid
		} else {
			lo = mid
		}
	}
}
