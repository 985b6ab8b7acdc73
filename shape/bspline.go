package shape

import "fmt"

// References of this file:
//
//	[deboor]    C. de Boor, A practical guide to splines, Springer (1978): chapter
//	            IX, the basis; chapter X, its stable evaluation, all sums of
//	            positive terms.
//	[schoenberg] I. J. Schoenberg, A. Whitney, On Polya frequency functions III, Trans.
//	            Amer. Math. Soc. 74, 246 (1953): sampled splines are independent
//	            when each has a sample of its own in its support.
//	[giraud]    L. Giraud, J. Langou, M. Rozloznik, J. van den Eshof, Rounding error
//	            analysis of the classical Gram-Schmidt orthogonalization process,
//	            Numer. Math. 101, 87 (2005): twice is enough.

// MaxDegree is the highest degree of [BSpline], and DefaultDegree what 0 stands for.
const (
	MaxDegree     = 5
	DefaultDegree = 3
)

// BSpline returns orthonormalised B-splines of equal spacing over the free
// samples, zero at both ends.
//
// The splines of the given degree d stand on m intervals of equal length, with
// knots 0 and m taken d+1 times (clamped); they follow from Cox and de Boor's recurrence
//
//	B_i,0(x) = 1 on [t_i, t_i+1), else 0
//	B_i,p(x) = (x - t_i)/(t_i+p - t_i) B_i,p-1(x) + (t_i+p+1 - x)/(t_i+p+1 - t_i+1) B_i+1,p-1(x)
//
// ([deboor]) and sum to 1 everywhere. Knot 0 lies on the sample before the first free one
// and knot m on the sample after the last, x(k) = m (k+1)/(N+1). Near an end the
// splines vanish like the powers 0, 1, 2 ... of the distance, and the first
// floor((d+1)/2) at either end are left out: the one of power 0 is not zero where the
// span begins, and would ask for a step of its full height. What is left begins with
// a zero value and, from degree 3 on, zero slope (degree 5: zero curvature also), and
// m is count, or count + 1 for odd d: at the default count the knots are at
// least 1/(2W) samples apart, as they must be to carry no more than the band.
//
// Measured for degree 3, N = 108, W = 0.1, 20 columns and normal coefficients,
// with 0, 1 and 2 splines left out at either end: steps from and to zero of 0.95, 0.46
// and 0.05 of the largest sample (median), energy outside the band 11 %, 4.0 % and 3.0 %.
// At 2, degrees 1 to 5 leave 6.8, 3.6, 3.0, 2.4 and 2.3 % there; the Slepian sequences
// 0.2 %: where the band matters splines need fewer columns than the band
// carries (18 leave 0.8 %).
//
// samples, lead, trail, bandTimesPeriod, count and its default, and the errors
// are those of [Slepian]; degree is 1 to 5, or 0 for 3. The columns come from
// the splines in order of time by QR factorisation: column j is a sum of the
// first j+1 splines, the last of them with a positive factor. They are
// orthonormal to 3e-14 and span what the splines span to about 1e-14 (the condition
// number of the sampled splines was under 25 at every count tried up to N = 400).
func BSpline(samples, lead, trail int, bandTimesPeriod float64, count, degree int) (*Basis, error) {
	free, err := freeSamples(samples, lead, trail)
	if err != nil {
		return nil, err
	}
	if err := checkBand(bandTimesPeriod); err != nil {
		return nil, err
	}
	if degree < 0 || degree > MaxDegree {
		return nil, fmt.Errorf("shape: splines of degree %d; allowed: 1 to %d, or 0 for %d", degree, MaxDegree, DefaultDegree)
	}
	if degree == 0 {
		degree = DefaultDegree
	}
	if count, err = columnCount(count, free, DefaultCount(free, bandTimesPeriod)); err != nil {
		return nil, err
	}
	b, err := newBasis(samples, lead, trail, count, FamilyBSpline)
	if err != nil {
		return nil, err
	}
	skip := (degree + 1) / 2
	intervals := int64(count + 2*skip - degree)
	var values [MaxDegree + 1]float64
	for k := range free {
		// x = at + rest/(N+1), in whole numbers.
		at, rest := intervals*int64(k+1)/int64(free+1), intervals*int64(k+1)%int64(free+1)
		splines(int(at), int(intervals), float64(rest)/float64(free+1), float64(int64(free+1)-rest)/float64(free+1), values[:degree+1])
		for i, value := range values[:degree+1] {
			if j := int(at) + i - skip; j >= 0 && j < count {
				b.free(j, free)[k] = value
			}
		}
	}
	// The factor R of the QR factorisation is banded: spline j meets only the d
	// splines before it, and the columns made of the earlier ones end before it
	// begins. So Gram-Schmidt against the last d columns is the whole factorisation;
	// done twice, it is orthogonal to rounding [giraud].
	for j := range count {
		v := b.free(j, free)
		for range 2 {
			for i := max(0, j-degree); i < j; i++ {
				u := b.free(i, free)
				var overlap float64
				for k, x := range u {
					overlap += x * v[k]
				}
				for k, x := range u {
					v[k] -= overlap * x
				}
			}
		}
		normalise(v)
	}
	return b, nil
}

// splines stores in dst, degree+1 long, the values of the splines that are not
// zero at x = at + past = at + 1 - ahead on the clamped knots 0, 1 ... intervals: those
// of index at ... at+degree among all intervals+degree of them.
func splines(at, intervals int, past, ahead float64, dst []float64) {
	dst[0] = 1
	for p := 1; p < len(dst); p++ {
		var carried float64
		for i := range p {
			right := float64(min(i, intervals-at-1)) + ahead // from x to knot i+1 on its right
			left := float64(min(p-1-i, at)) + past           // from knot p-i on its left to x
			share := dst[i] / (right + left)
			dst[i] = carried + right*share
			carried = left * share
		}
		dst[p] = carried
	}
}
