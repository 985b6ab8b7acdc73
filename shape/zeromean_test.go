package shape

import (
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
)

// Sums of zero, orthonormal, inside the span of b, one column fewer; and nothing
// lost: what is missing of b is one direction, that of the sums.
func TestZeroMean(t *testing.T) {
	bases := someBases(t)[1:]
	for _, f := range families[1:] {
		bases = append(bases, f.basis(t, 64, 0, 4, 0.1, 0), f.basis(t, 41, 3, 2, 0.3, 7), f.basis(t, 33, 0, 1, 0.5, 0))
	}
	// Columns of the other sign, the sum of the first negative and the only one:
	// with the wrong sign of the reflection nothing would be left of v.
	u := named(t, FamilySlepian).basis(t, 64, 0, 4, 0.1, 2)
	negative := &Basis{Samples: u.Samples, Count: u.Count, Columns: slices.Clone(u.Columns), Family: u.Family, Lead: u.Lead, Trail: u.Trail}
	for i := range negative.Columns {
		negative.Columns[i] *= -1
	}
	bases = append(bases, negative)
	for _, b := range bases {
		z, err := ZeroMean(b)
		if err != nil {
			t.Fatal(err)
		}
		if z.Count != b.Count-1 || z.Samples != b.Samples || z.Lead != b.Lead || z.Trail != b.Trail || z.Family != b.Family || !z.ZeroMean || b.ZeroMean {
			t.Fatalf("%s %dx%d: made %dx%d, guards %d and %d, zero mean %v", b.Family, b.Samples, b.Count, z.Samples, z.Count, z.Lead, z.Trail, z.ZeroMean)
		}
		if worst := orthonormality(z); !(worst <= 3e-15) {
			t.Errorf("%s %dx%d: off orthonormality by %.3g", b.Family, b.Samples, b.Count, worst)
		}
		a := make([]float64, b.Count)
		for j := range a {
			a[j] = sum(b.Column(j))
		}
		for j := range z.Count {
			v := z.Column(j)
			if s := sum(v); !(math.Abs(s) <= 1e-15*math.Sqrt(float64(b.Samples))) {
				t.Errorf("%s %dx%d: column %d sums to %.3g", b.Family, b.Samples, b.Count, j, s)
			}
			c := b.Transpose(v, nil)
			for k, got := range b.Apply(c, nil) {
				if !(math.Abs(got-v[k]) <= 3e-15) {
					t.Errorf("%s %dx%d: column %d leaves the span at %d by %.3g", b.Family, b.Samples, b.Count, j, k, got-v[k])
				}
			}
			for k := range v {
				if (k < z.Lead || k >= z.Samples-z.Trail) && v[k] != 0 {
					t.Errorf("%s %dx%d: column %d is %v on guard %d", b.Family, b.Samples, b.Count, j, v[k], k)
				}
			}
		}
		// The projection of any member of b on z is that member less its part along a.
		c := normal(rand.New(rand.NewPCG(8, 8)), b.Count)
		part := dot(c, a) / dot(a, a)
		want := slices.Clone(c)
		for j := range want {
			want[j] -= part * a[j]
		}
		wantX := b.Apply(want, nil)
		for k, got := range z.Apply(z.Transpose(b.Apply(c, nil), nil), nil) {
			if !(math.Abs(got-wantX[k]) <= 1e-14) {
				t.Errorf("%s %dx%d: projection is %v at %d, want %v", b.Family, b.Samples, b.Count, got, k, wantX[k])
			}
		}
		again, err := ZeroMean(z)
		if err != nil || again != z {
			t.Errorf("%s %dx%d: a basis of zero mean was changed: %v", b.Family, b.Samples, b.Count, err)
		}
	}
}

// Columns that sum to zero already stay as they are, to the last bit.
func TestZeroMeanKeepsAntisymmetric(t *testing.T) {
	for _, f := range families[:3] {
		b := f.basis(t, 64, 0, 4, 0.1, 0)
		before := slices.Clone(b.Columns)
		z, err := ZeroMean(b)
		if err != nil {
			t.Fatal(err)
		}
		if !slices.Equal(b.Columns, before) {
			t.Errorf("%s: the basis itself was changed", f.name)
		}
		kept := 0
		for j := 1; j < b.Count; j += 2 {
			for i := range z.Count {
				if slices.Equal(z.Column(i), b.Column(j)) {
					kept++
				}
			}
		}
		if kept != b.Count/2 {
			t.Errorf("%s: %d of %d antisymmetric columns kept", f.name, kept, b.Count/2)
		}
	}
}

func TestZeroMeanRefused(t *testing.T) {
	b, err := Samples(9, 4, 4)
	if err != nil {
		t.Fatal(err)
	}
	if z, err := ZeroMean(b); z != nil || err == nil || !strings.HasPrefix(err.Error(), "shape: zero mean: the basis has a single column, whose samples sum to 1;") {
		t.Errorf("one free sample: %v, %v", z, err)
	}
}
