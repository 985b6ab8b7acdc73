package hardware

import (
	"math"
	"math/cmplx"
	"sort"
)

// A Compression says what a drive makes of the converter's output: how much of full scale it reaches at each share at the
// converter. Between its points it is linear; below zero it is odd; of a pair of quadratures it acts on the length and keeps the
// direction. With f the table,
//
//	y = x/|x| f(|x|),   x = y/|y| f^-1(|y|).
//
// The first point is 0, 0 and the last at the converter's full scale; both shares rise from point to point. nil changes nothing. It
// acts at once, before the line. A rate is a share of the profile's full scale, so f'(0) = 1 makes that the rate
// which a weak drive has, extrapolated.
type Compression []Point

// A Point of a compression, both in shares of full scale.
type Point struct{ Converter, Reached float64 }

// The range of the slopes between points of a compression. Beyond it nothing sensible is left of limits and rounding.
const leastSlope, mostSlope = 0.02, 50.0

// Reached gives y for x, within full scale; beyond, the last piece goes on.
func (c Compression) Reached(x complex128) complex128 {
	return along(x, func(r float64) float64 { return c.at(r) })
}

// Converter gives x for y: the inverse of Reached.
func (c Compression) Converter(y complex128) complex128 {
	return along(y, func(r float64) float64 { return c.inverse(r) })
}

// along applies f to the length of z. A real z stays exactly real.
func along(z complex128, f func(float64) float64) complex128 {
	switch r := cmplx.Abs(z); {
	case r == 0:
		return z
	case imag(z) == 0:
		return complex(math.Copysign(f(r), real(z)), imag(z))
	case real(z) == 0:
		return complex(real(z), math.Copysign(f(r), imag(z)))
	default:
		return z * complex(f(r)/r, 0)
	}
}

// at is f.
func (c Compression) at(r float64) float64 {
	if c == nil {
		return r
	}
	i := sort.Search(len(c)-2, func(i int) bool { return r <= c[i+1].Converter })
	a, b := c[i], c[i+1]
	return a.Reached + (b.Reached-a.Reached)*((r-a.Converter)/(b.Converter-a.Converter))
}

// inverse is f^-1.
func (c Compression) inverse(r float64) float64 {
	if c == nil {
		return r
	}
	i := sort.Search(len(c)-2, func(i int) bool { return r <= c[i+1].Reached })
	a, b := c[i], c[i+1]
	return a.Converter + (b.Converter-a.Converter)*((r-a.Reached)/(b.Reached-a.Reached))
}

// slopes gives the least and the largest slope of f from 0 to r at the converter.
func (c Compression) slopes(r float64) (least, most float64) {
	if c == nil {
		return 1, 1
	}
	least, most = math.Inf(1), 0
	for i := range len(c) - 1 {
		if i > 0 && c[i].Converter >= r {
			break
		}
		s := (c[i+1].Reached - c[i].Reached) / (c[i+1].Converter - c[i].Converter)
		least, most = min(least, s), max(most, s)
	}
	return least, most
}
