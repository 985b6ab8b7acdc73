package filter

import (
	"fmt"
	"math"
	"math/cmplx"
)

// highestOrder is the highest order of every low-pass family.
const highestOrder = 8

// checkLowPass reports the order or corner that a low-pass family refuses.
func checkLowPass(family string, order int, corner float64) error {
	if order < 1 || order > highestOrder {
		return fmt.Errorf("filter: %s order %d; allowed: 1 to %d", family, order, highestOrder)
	}
	return checkCorner(family, corner)
}

func checkCorner(family string, corner float64) error {
	if !(corner >= lowestCorner && corner <= highestCorner) {
		return fmt.Errorf("filter: %s corner %g GHz; allowed: %g to %g GHz", family, corner, lowestCorner, highestCorner)
	}
	return nil
}

// allPole returns the low-pass prod p/(p-s) with the given simple poles times
// scale, of unit steady gain. Conjugate poles are adjacent, the upper one first;
// a real pole comes last.
func allPole(poles []complex128, scale float64) Line {
	by := complex(scale, 0)
	var l Line
	for i, p := range poles {
		// r_i = -p_i prod_{j != i} p_j/(p_j - p_i), the residue of theta(0)/theta(s)
		// for the polynomial theta with these zeros.
		r := -p
		for j, q := range poles {
			if j != i {
				r *= q / (q - p)
			}
		}
		if imag(p) == 0 {
			r = complex(real(r), 0)
		}
		l.Terms = append(l.Terms, Term{Pole: by * p, Power: 1, Residue: by * r})
		if i%2 == 1 && imag(p) < 0 { // the exact conjugate of the term before
			l.Terms[i].Residue = cmplx.Conj(l.Terms[i-1].Residue)
		}
	}
	return l
}

// zeros returns the zeros of the real polynomial sum a[k] s^k, whose leading
// coefficient is one: conjugates adjacent, upper one first, exact mirror images;
// the real one of an odd order last. There is no other real one. Durand and
// Kerner's iteration finds all zeros at once, to what the conditioning of the
// coefficients allows, from a ring of about the right radius: Newton steps after
// it gain nothing.
func zeros(a []float64, radius float64) []complex128 {
	n := len(a) - 1
	z := make([]complex128, n)
	for i := range z {
		// Turned off the real axis.
		z[i] = cmplx.Rect(radius, 0.4+2*math.Pi*float64(i)/float64(n))
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
	var found []complex128
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
		found = append(found, v, cmplx.Conj(v))
	}
	if n%2 == 1 {
		found = append(found, complex(real(single), 0))
	}
	return found
}
