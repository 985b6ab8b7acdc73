package shape

import "math"

// References of this file:
//
//	[strang] G. Strang, The discrete cosine transform, SIAM Rev. 41, 135 (1999):
//	         the sines are the eigenvectors of the second difference with zero
//	         on both sides, hence orthogonal.
//	[szego]  G. Szego, Orthogonal polynomials, Amer. Math. Soc. (1939): section
//	         4.7, the ultraspherical polynomials.

// Fourier returns the sine series over the free samples: with N of them,
//
//	v_j(k) = sqrt(2/(N+1)) sin(pi j (k+1)/(N+1)),  k = 0 ... N-1,  j = 1 ... count,
//
// which are orthonormal by themselves ([strang]). Column j-1 holds v_j, of frequency
// j/(2(N+1)) cycles per sample, and would be zero on the sample before the
// first and on the one after the last.
//
// samples, lead, trail, bandTimesPeriod, count and the errors are those of
// [Slepian], the default count included: [DefaultCount] is what the band carries, and
// the frequency of its last column stays inside. A sine that stops is not
// confined to its frequency: of normal coefficients' energy, 0.7 % lies
// outside the band where the Slepian sequences leave 0.2 % (N = 108, W = 0.1,
// 20 columns), and it falls off as slowly as the fourth power of the frequency.
// [TaperedFourier] trades one column for a faster fall.
//
// Column j-1 is symmetric in time for odd j and antisymmetric for even j,
// exactly, and starts positive. Elements are good to 3e-16 of the largest.
func Fourier(samples, lead, trail int, bandTimesPeriod float64, count int) (*Basis, error) {
	return series(samples, lead, trail, bandTimesPeriod, count, 0, FamilyFourier, func(j, k, n int64) float64 {
		return sinOfPi(j*(k+1), n+1)
	})
}

// TaperedFourier returns the cosines tapered by sin^2, orthonormalised: with
// a(k) = pi (k+1)/(N+1) over N free samples, column j-1 spans, together with those before it,
//
//	sin^2(a) cos(i a),  i = 0 ... j-1,  j = 1 ... count,
//
// so that its highest frequency is (j+1)/(2(N+1)) cycles per sample. The
// polynomials in cos(a) that are orthogonal under sin^4 are the ultraspherical
// ones of parameter 2 ([szego]), whose closed form gives the columns, up to a factor:
//
//	v_j(k) ~ sin((j+1) a) cot(a) - (j+1) cos((j+1) a).
//
// Not only the value but the slope is zero beside the free samples. That is what
// it adds to [Fourier], measured at N = 108, W = 0.1 with the default counts and
// normal coefficients: the steps from and to zero, as a share of the largest
// sample, are 0.03 instead of 0.21 (median), so that a slew limit or a ring-out
// limit leaves more of the shapes; the energy outside the band is 0.20 % instead of
// 0.67 %, and falls with the sixth power of the frequency. With equal counts the two leak
// alike (0.65 %). It is not a larger space: full-period sines and tapered cosines
// together leave the steps at 0.11 and 0.31 %.
//
// Arguments and errors are those of [Slepian]. The default count is one less
// than [DefaultCount], at least 1, because the columns reach one step further
// in frequency; at W = 0.5 it is N. Column j-1 is symmetric in time for odd j and antisymmetric for
// even j, exactly, and starts positive. The columns are orthonormal to 3e-14.
func TaperedFourier(samples, lead, trail int, bandTimesPeriod float64, count int) (*Basis, error) {
	return series(samples, lead, trail, bandTimesPeriod, count, 1, FamilyTaperedFourier, func(j, k, n int64) float64 {
		a := (j + 1) * (k + 1)
		cot := cosOfPi(k+1, n+1) / sinOfPi(k+1, n+1)
		return sinOfPi(a, n+1)*cot - float64(j+1)*cosOfPi(a, n+1)
	})
}

// series makes a family from its unnormalised columns: element(j, k, N) for k
// in the first half of the free samples, symmetric for odd j = 1, 2 ... The
// default count is spare less than what the band carries.
func series(samples, lead, trail int, w float64, count, spare int, family string, element func(j, k, n int64) float64) (*Basis, error) {
	free, err := freeSamples(samples, lead, trail)
	if err != nil {
		return nil, err
	}
	if err := checkBand(w); err != nil {
		return nil, err
	}
	carried := DefaultCount(free, w)
	if w < 0.5 {
		carried = max(1, carried-spare)
	}
	if count, err = columnCount(count, free, carried); err != nil {
		return nil, err
	}
	b, err := newBasis(samples, lead, trail, count, family)
	if err != nil {
		return nil, err
	}
	for j := range count {
		v := b.free(j, free)
		for k := range (free + 1) / 2 {
			x := element(int64(j+1), int64(k), int64(free))
			mirror := x
			if j%2 == 1 {
				mirror = -x
				if 2*k+1 == free {
					x, mirror = 0, 0 // the centre of an antisymmetric column
				}
			}
			v[k], v[free-1-k] = x, mirror
		}
		normalise(v)
	}
	return b, nil
}

// normalise makes the norm of v 1.
func normalise(v []float64) {
	var norm float64
	for _, x := range v {
		norm += x * x
	}
	scale := 1 / math.Sqrt(norm)
	for k := range v {
		v[k] *= scale
	}
}

// sinOfPi is sin(pi p/q) for q > 0, its argument reduced in whole numbers to
// at most pi/4: good to 1e-16 of the result, exact in its zeros and symmetries.
func sinOfPi(p, q int64) float64 {
	p %= 2 * q
	if p < 0 {
		p += 2 * q
	}
	sign := 1.0
	if p >= q {
		p, sign = p-q, -1
	}
	if 2*p > q {
		p = q - p
	}
	if 4*p > q {
		return sign * math.Cos(math.Pi*float64(q-2*p)/float64(2*q))
	}
	return sign * math.Sin(math.Pi*float64(p)/float64(q))
}

// cosOfPi is cos(pi p/q), likewise.
func cosOfPi(p, q int64) float64 { return sinOfPi(2*p+q, 2*q) }
