package shape

import "fmt"

// Families of basis, as they stand in [Basis].Family.
const (
	FamilySlepian        = "slepian"
	FamilyFourier        = "fourier"
	FamilyTaperedFourier = "tapered-fourier"
	FamilyBSpline        = "b-spline"
	FamilySamples        = "samples"
)

// Limits of this package. A basis is stored whole, so that what bounds its
// memory is the number of its entries: 1<<24 of them fill 128 MiB.
const (
	MaxSamples = 65536   // samples in a span or an envelope
	MaxEntries = 1 << 24 // samples times columns of a basis
)

// A Basis maps coefficients to samples, x = B c.
//
// Its columns are orthonormal over the free samples and zero on the guards.
// [Slepian], [Fourier], [TaperedFourier], [BSpline] and [Samples] make it, and
// [ZeroMean] takes the mean out of it; it is not changed afterwards and may be used by
// several goroutines at once.
type Basis struct {
	Samples int       // rows: samples of the span, guards included
	Count   int       // columns: coefficients
	Columns []float64 // column-major: Columns[j*Samples+k] is sample k of column j
	Family  string    // one of the constants Family...
	Lead    int       // guard samples before the free ones
	Trail   int       // guard samples after them

	ZeroMean bool // made by [ZeroMean]: every column sums to zero

	unit bool // column j is 1 at sample Lead+j and 0 elsewhere
}

// Samples returns the basis with one coefficient per free sample, for
// instruments that limit neither band nor slew.
//
// samples is the span, 1 to MaxSamples, of which the first lead and the last
// trail stay at zero. It is an error when no sample is left free or when the
// basis would exceed MaxEntries, which bounds a span without guards to 4096.
func Samples(samples, lead, trail int) (*Basis, error) {
	free, err := freeSamples(samples, lead, trail)
	if err != nil {
		return nil, err
	}
	return unitBasis(samples, lead, trail, free, FamilySamples)
}

// Column returns column j, Samples long; it is a view, not a copy.
func (b *Basis) Column(j int) []float64 {
	n := b.Samples
	return b.Columns[j*n : (j+1)*n : (j+1)*n]
}

// Apply stores the samples B c in dst and returns it.
//
// len(c) must be Count. A nil dst is allocated; any other dst must be Samples
// long and must not overlap c. A wrong length is a caller's bug and panics.
func (b *Basis) Apply(c, dst []float64) []float64 {
	if len(c) != b.Count {
		panic("shape: Apply: coefficients do not match the basis")
	}
	dst = destination(dst, b.Samples, "shape: Apply: dst does not match the basis")
	clear(dst)
	x := dst[b.Lead : b.Samples-b.Trail]
	if b.unit {
		copy(x, c)
		return dst
	}
	// Four columns at a time: each pass loads and stores x once.
	j := 0
	for ; j+4 <= b.Count; j += 4 {
		c0, c1, c2, c3 := c[j], c[j+1], c[j+2], c[j+3]
		v0, v1, v2, v3 := b.free(j, len(x)), b.free(j+1, len(x)), b.free(j+2, len(x)), b.free(j+3, len(x))
		for k := range x {
			x[k] += (c0*v0[k] + c1*v1[k]) + (c2*v2[k] + c3*v3[k])
		}
	}
	for ; j < b.Count; j++ {
		cj, v := c[j], b.free(j, len(x))
		for k := range x {
			x[k] += cj * v[k]
		}
	}
	return dst
}

// Transpose stores the coefficients B' x in dst and returns it: the adjoint
// of Apply, and its inverse on the span of the basis.
//
// len(x) must be Samples; what x holds on the guards does not matter. A nil
// dst is allocated; any other dst must be Count long and must not overlap x.
// A wrong length is a caller's bug and panics.
func (b *Basis) Transpose(x, dst []float64) []float64 {
	if len(x) != b.Samples {
		panic("shape: Transpose: samples do not match the basis")
	}
	dst = destination(dst, b.Count, "shape: Transpose: dst does not match the basis")
	x = x[b.Lead : b.Samples-b.Trail]
	if b.unit {
		copy(dst, x)
		return dst
	}
	// Four columns at a time: four independent sums hide the latency of one.
	j := 0
	for ; j+4 <= b.Count; j += 4 {
		v0, v1, v2, v3 := b.free(j, len(x)), b.free(j+1, len(x)), b.free(j+2, len(x)), b.free(j+3, len(x))
		var s0, s1, s2, s3 float64
		for k, xk := range x {
			s0 += xk * v0[k]
			s1 += xk * v1[k]
			s2 += xk * v2[k]
			s3 += xk * v3[k]
		}
		dst[j], dst[j+1], dst[j+2], dst[j+3] = s0, s1, s2, s3
	}
	for ; j < b.Count; j++ {
		v := b.free(j, len(x))
		var s float64
		for k, xk := range x {
			s += xk * v[k]
		}
		dst[j] = s
	}
	return dst
}

// free is the free part of column j, n long.
func (b *Basis) free(j, n int) []float64 {
	at := j*b.Samples + b.Lead
	return b.Columns[at : at+n : at+n]
}

// freeSamples counts the samples that guards leave, or says why none is left.
func freeSamples(samples, lead, trail int) (int, error) {
	switch {
	case samples < 1 || samples > MaxSamples:
		return 0, fmt.Errorf("shape: a span of %d samples; allowed: 1 to %d", samples, MaxSamples)
	case lead < 0 || trail < 0:
		return 0, fmt.Errorf("shape: guards of %d and %d samples; allowed: 0 or more", lead, trail)
	case lead >= samples || trail >= samples-lead:
		return 0, fmt.Errorf("shape: guards of %d and %d samples leave nothing free in a span of %d", lead, trail, samples)
	}
	return samples - lead - trail, nil
}

// newBasis allocates a basis of zeros, or refuses one that is too large.
func newBasis(samples, lead, trail, count int, family string) (*Basis, error) {
	if entries := int64(samples) * int64(count); entries > MaxEntries {
		return nil, fmt.Errorf("shape: a basis of %d samples by %d coefficients has %d entries; allowed: up to %d", samples, count, entries, MaxEntries)
	}
	return &Basis{
		Samples: samples,
		Count:   count,
		Columns: make([]float64, samples*count),
		Family:  family,
		Lead:    lead,
		Trail:   trail,
	}, nil
}

// unitBasis is the first count unit vectors over the free samples.
func unitBasis(samples, lead, trail, count int, family string) (*Basis, error) {
	b, err := newBasis(samples, lead, trail, count, family)
	if err != nil {
		return nil, err
	}
	for j := range count {
		b.Columns[j*samples+lead+j] = 1
	}
	b.unit = true
	return b, nil
}

// destination is dst, or a new slice of length n when dst is nil.
func destination(dst []float64, n int, complaint string) []float64 {
	if dst == nil {
		return make([]float64, n)
	}
	if len(dst) != n {
		panic(complaint)
	}
	return dst
}
