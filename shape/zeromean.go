package shape

import (
	"fmt"
	"math"
)

// References of this file:
//
//	[golub] G. H. Golub, C. F. Van Loan, Matrix computations, 3rd ed., Johns
//	        Hopkins (1996): section 5.1, Householder reflections and their sign;
//	        section 6.1, equalities removed by a basis of their null space.

// meanless is what the root of the sum of squares of the columns' sums may be, as a
// share of sqrt(N), its largest possible value, for a basis to count as one of
// zero mean: far above the rounding of a sum, far below any other basis made here.
const meanless = 1e-12

// ZeroMean returns a basis of those sequences of b whose samples sum to zero:
// what passes an AC-coupled line without leaving it charged. It has one column fewer.
//
// The samples B c sum to a'c, where a holds the sums of the columns. The reflection
//
//	H = 1 - 2 v v'/(v'v),  v = a + sign(a_i) |a| e_i,
//
// sends a to the axis i, the one of the largest |a_i|; the other columns of B H
// are orthonormal as those of B are, and sum to zero ([golub]). They replace, in
// order, the columns of B, and a column that already sums to zero stays as it is,
// to the last bit if its sum is exactly zero as computed, like the antisymmetric
// ones of [Slepian]. Sums of the new columns are zero to 1e-15 sqrt(N).
//
// The equality is linear in the samples as shares of full scale: rounding to
// codes does not keep it, so check the codes. A basis that is of zero mean
// already is returned itself. It is an error when b has one column and that does
// not sum to zero.
func ZeroMean(b *Basis) (*Basis, error) {
	free := b.Samples - b.Lead - b.Trail
	v := make([]float64, b.Count)
	var norm float64
	pivot := 0
	for j := range v {
		v[j] = columnSum(b.free(j, free))
		norm += v[j] * v[j]
		if math.Abs(v[j]) > math.Abs(v[pivot]) {
			pivot = j
		}
	}
	norm = math.Sqrt(norm)
	switch {
	case norm <= meanless*math.Sqrt(float64(free)):
		return b, nil
	case b.Count == 1:
		return nil, fmt.Errorf("shape: zero mean: the basis has a single column, whose samples sum to %.6g; needed: 2 columns or more", v[0])
	}
	z, err := newBasis(b.Samples, b.Lead, b.Trail, b.Count-1, b.Family)
	if err != nil {
		return nil, err
	}
	z.ZeroMean = true
	// v'v = 2 |a| (|a| + |a_i|)
	v[pivot] += math.Copysign(norm, v[pivot])
	scale := 1 / (norm * math.Abs(v[pivot]))
	w := b.Apply(v, nil)[b.Lead : b.Lead+free]
	to := 0
	for j := range b.Count {
		if j == pivot {
			continue
		}
		column, factor := z.free(to, free), scale*v[j]
		for k, x := range b.free(j, free) {
			column[k] = x - factor*w[k]
		}
		to++
	}
	return z, nil
}

// columnSum adds v from both ends inwards, so that the sum of an antisymmetric
// sequence is exactly zero, and keeps what each addition loses.
func columnSum(v []float64) float64 {
	var sum, lost float64
	n := len(v)
	add := func(x float64) {
		next := sum + x
		if math.Abs(sum) >= math.Abs(x) {
			lost += (sum - next) + x
		} else {
			lost += (x - next) + sum
		}
		sum = next
	}
	for k := range n / 2 {
		add(v[k] + v[n-1-k])
	}
	if n%2 == 1 {
		add(v[n/2])
	}
	return sum + lost
}
