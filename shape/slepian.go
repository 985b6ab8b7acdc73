package shape

import (
	"fmt"
	"math"
)

// References of this file:
//
//	[slepian]  D. Slepian, Prolate spheroidal wave functions, Fourier analysis,
//	           and uncertainty V: the discrete case, Bell Syst. Tech. J. 57,
//	           1371 (1978): section 2.2, the commuting tridiagonal matrix; section
//	           2.1, the signs.
//	[kahan]    W. Kahan, Accurate eigenvalues of a symmetric tri-diagonal matrix,
//	           Stanford report CS41 (1966): the pivots of the bisection are those
//	           of a matrix that differs by rounding only.
//	[fernando] K. V. Fernando, On computing an eigenvector of a tridiagonal
//	           matrix, SIAM J. Matrix Anal. Appl. 18, 1013 (1997): the vector
//	           from the forward and the backward pivots.

// wholeCount forgives rounding in 2 N W: a band of 0.1 cycles per sample and 60
// samples make 12, whichever way the product was rounded. Products of a few
// doubles are off by some 1e-16 of at most 131072.
const wholeCount = 1e-9

// DefaultCount returns the number of coefficients that a band carries over
// the free samples of a span, max(1, floor(2 N W) - 1) and at most N: 2 N W is
// the number of sequences that the band holds, and the last of them already
// leaks. free is N, at least 1; bandTimesPeriod is W in cycles per sample, over
// 0 and at most 0.5. At W = 0.5 nothing lies outside the band and the count is N.
func DefaultCount(free int, bandTimesPeriod float64) int {
	if bandTimesPeriod >= 0.5 {
		return free
	}
	count := int(math.Floor(2*float64(free)*bandTimesPeriod+wholeCount)) - 1
	return min(max(count, 1), free)
}

// Slepian returns the discrete prolate spheroidal sequences of the free
// samples: of all orthonormal sequences of that length, those that are most
// concentrated in the frequencies |f| <= W, best first.
//
// samples is the span, 1 to MaxSamples, of which the first lead and the last
// trail stay at zero; N are left free. bandTimesPeriod is W, the band times the
// sample period, in cycles per sample, over 0 and at most 0.5. count is the
// number of columns, 1 to N, or 0 for [DefaultCount]. At W = 0.5 all sequences
// are equally concentrated, and all N of them are returned as the unit vectors
// of [Samples]. Anything else, and a basis over MaxEntries, is an error.
//
// Column j is symmetric in time for even j and antisymmetric for odd j,
// exactly, and has j changes of sign. Its first element is positive (where it is
// far under 1e-16: before rounding). These are Slepian's signs: inside the band
// the sum of an even column and the first moment sum((N-1-2k) v(k)) of an odd one
// are positive [slepian].
//
// The columns are eigenvectors of the tridiagonal matrix
//
//	T(k,k) = ((N-1-2k)/2)^2 cos(2 pi W),  T(k-1,k) = T(k,k-1) = k (N-k)/2,
//
// which commutes with the sinc kernel but has its eigenvalues well apart
// ([slepian]); see the comments in the code for the means. They are orthonormal
// to 3e-14 and accurate to about 1e-16 N. The cost is of order 100 N count, and
// N count^2/20 where that is more.
func Slepian(samples, lead, trail int, bandTimesPeriod float64, count int) (*Basis, error) {
	free, err := freeSamples(samples, lead, trail)
	if err != nil {
		return nil, err
	}
	if err := checkBand(bandTimesPeriod); err != nil {
		return nil, err
	}
	if count, err = columnCount(count, free, DefaultCount(free, bandTimesPeriod)); err != nil {
		return nil, err
	}
	if bandTimesPeriod == 0.5 && count == free {
		return unitBasis(samples, lead, trail, count, FamilySlepian)
	}
	b, err := newBasis(samples, lead, trail, count, FamilySlepian)
	if err != nil {
		return nil, err
	}
	// T is symmetric about its centre, so that it falls into a half for the
	// symmetric and one for the antisymmetric vectors, whose eigenvalues
	// alternate. The halves cost less and have their eigenvalues twice as far apart.
	for parity := 0; parity < min(2, count); parity++ {
		half := slepianHalf(free, bandTimesPeriod, parity == 1)
		upper := half.above
		// Rounding turns a computed vector towards another by a few 1e-16 times the
		// norm of T over the distance of their eigenvalues: it matters, and is
		// taken out, between those that lie near each other.
		reach := math.Max(math.Abs(half.above), math.Abs(half.below)) / 16
		values := make([]float64, 0, (count+1)/2)
		for j := parity; j < count; j += 2 {
			lambda := half.eigenvalue(j/2, upper)
			upper = lambda
			values = append(values, lambda)
			v := b.free(j, free)
			half.vector(lambda, v)
			for i := j - 2; i >= 0 && values[i/2]-lambda < reach; i -= 2 {
				half.project(v, b.free(i, free))
			}
			half.unfold(v)
		}
	}
	return b, nil
}

// checkBand refuses a band that is no part of the Nyquist band.
func checkBand(w float64) error {
	if !(w > 0 && w <= 0.5) {
		return fmt.Errorf("shape: a band of %v cycles per sample; allowed: over 0, up to 0.5", w)
	}
	return nil
}

// columnCount is the count that the caller asked for, or the default for 0.
func columnCount(count, free, usual int) (int, error) {
	switch {
	case count < 0 || count > free:
		return 0, fmt.Errorf("shape: %d coefficients over %d free samples; allowed: 1 to %d, or 0 for the default", count, free, free)
	case count == 0:
		return usual, nil
	}
	return count, nil
}
