package shape

import (
	"fmt"
	"math"
)

// OutOfBand returns, of the energy sum of x(k)^2, what lies outside the band |f| <= W,
//
//	energy = int over W < |f| <= 1/2 of |X(f)|^2 df,  X(f) = sum_k x(k) e^{-2 pi i f k},
//
// and its share of the whole, 0 for a sequence of zeros. energy is in the
// square of the samples' unit, shares of full scale; that, not the share, is convex
// in x. Of two quadratures the energies add.
//
// The integral is over a positive function, not the small difference of two large
// numbers: an energy down to 1e-32 of the whole is told from zero, with an error of
// about 1e-16 times the root of energy and whole (see [Basis.Concentration]).
//
// x has 1 to MaxSamples finite samples; bandTimesPeriod is W in cycles per
// sample, over 0 and at most 0.5. Anything else is an error. The cost is of
// order 100 N^2 with N the samples between the first and the last that is not
// zero: a millisecond at 100, seconds at 4096.
func OutOfBand(x []float64, bandTimesPeriod float64) (energy, share float64, err error) {
	if _, err := freeSamples(len(x), 0, 0); err != nil {
		return 0, 0, err
	}
	if err := checkBand(bandTimesPeriod); err != nil {
		return 0, 0, err
	}
	var whole float64
	first, last := len(x), -1
	for k, v := range x {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return 0, 0, fmt.Errorf("shape: sample %d is %v; allowed: finite samples", k, v)
		}
		if v != 0 {
			first, last = min(first, k), k
		}
		whole += v * v
	}
	if last < 0 || whole == 0 {
		return 0, 0, nil
	}
	x = x[first : last+1]
	b := Basis{Samples: len(x), Count: 1, Columns: x}
	b.spectrum(bandTimesPeriod, 0.5, func(weight float64, re, im []float64) {
		energy += weight * (re[0]*re[0] + im[0]*im[0])
	})
	return energy, energy / whole, nil
}

// OutOfBand returns the symmetric matrix E, Count by Count, row-major, whose quadratic form is
// the energy outside the band |f| <= W of the samples B c:
//
//	c' E c = int over W < |f| <= 1/2 of |X(f)|^2 df,  x = B c,
//
// as the function [OutOfBand] defines it. It is B'(1 - K)B with the sinc kernel
// K(k,l) = sin(2 pi W (k-l))/(pi (k-l)), which is never formed: E is the sum over
// frequencies of the outer products of the columns' transforms, all of
// positive weight. So E is positive semidefinite to rounding, element (i,j) is off by
// about 1e-16 times the root of E(i,i) E(j,j), and by 1e-16 times either root for the rounding of the
// columns, and a small diagonal element keeps its digits as in
// [Basis.Concentration], whose outside the diagonal is. c' E c <= eps is then a
// convex limit in c, for one quadrature or channel; of two quadratures the forms
// add. At W = 0.5 E is zero.
//
// bandTimesPeriod is W in cycles per sample, over 0 and at most 0.5; anything
// else is an error. The cost is of order 3 N^2 (Count + 20) + 3 N Count^2.
func (b *Basis) OutOfBand(bandTimesPeriod float64) ([]float64, error) {
	if err := checkBand(bandTimesPeriod); err != nil {
		return nil, err
	}
	n := b.Count
	e := make([]float64, n*n)
	b.spectrum(bandTimesPeriod, 0.5, func(weight float64, re, im []float64) {
		for i := range n {
			x, y := weight*re[i], weight*im[i]
			row := e[i*n : i*n+i+1]
			for j := range row {
				row[j] += x*re[j] + y*im[j]
			}
		}
	})
	for i := range n {
		for j := range i {
			e[j*n+i] = e[i*n+j]
		}
	}
	return e, nil
}
