package shape

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"
)

// someBases has each path through Apply and Transpose: counts that are and are
// not multiples of four, guards on neither, either and both sides, unit vectors.
func someBases(t testing.TB) []*Basis {
	t.Helper()
	var all []*Basis
	add := func(b *Basis, err error) {
		t.Helper()
		if err != nil {
			t.Fatal(err)
		}
		all = append(all, b)
	}
	add(Slepian(1, 0, 0, 0.3, 0))
	add(Slepian(64, 0, 4, 0.1, 0))
	add(Slepian(64, 5, 0, 0.1, 12))
	add(Slepian(41, 3, 2, 0.2, 13))
	add(Slepian(40, 3, 2, 0.25, 14))
	add(Slepian(40, 3, 2, 0.37, 35))
	add(Slepian(33, 1, 2, 0.5, 0))
	add(Samples(19, 0, 0))
	add(Samples(24, 3, 4))
	// The same columns without the short cut for unit vectors.
	u := all[len(all)-1]
	all = append(all, &Basis{Samples: u.Samples, Count: u.Count, Columns: u.Columns, Family: u.Family, Lead: u.Lead, Trail: u.Trail})
	return all
}

func normal(r *rand.Rand, n int) []float64 {
	x := make([]float64, n)
	for k := range x {
		x[k] = r.NormFloat64()
	}
	return x
}

func dot(a, b []float64) float64 {
	var s float64
	for k, v := range a {
		s += v * b[k]
	}
	return s
}

// orthonormality is the largest element of |B'B - 1|.
func orthonormality(b *Basis) float64 {
	worst := 0.0
	for i := range b.Count {
		for j := range i + 1 {
			s := dot(b.Column(i), b.Column(j))
			if i == j {
				s--
			}
			if !(math.Abs(s) <= worst) {
				worst = math.Abs(s)
			}
		}
	}
	return worst
}

func TestBasisInvariants(t *testing.T) {
	for _, b := range someBases(t) {
		if len(b.Columns) != b.Samples*b.Count {
			t.Errorf("%s %dx%d: %d entries", b.Family, b.Samples, b.Count, len(b.Columns))
		}
		if worst := orthonormality(b); !(worst <= 1e-13) {
			t.Errorf("%s %dx%d: off orthonormality by %.3g", b.Family, b.Samples, b.Count, worst)
		}
		for j := range b.Count {
			for k, v := range b.Column(j) {
				if (k < b.Lead || k >= b.Samples-b.Trail) && v != 0 {
					t.Errorf("%s %dx%d: column %d is %v on guard sample %d", b.Family, b.Samples, b.Count, j, v, k)
				}
			}
		}
	}
}

// Apply and Transpose against their definitions, into new and into used memory.
func TestApplyAndTranspose(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for _, b := range someBases(t) {
		c, x := normal(r, b.Count), normal(r, b.Samples)
		usedX, usedC := normal(r, b.Samples), normal(r, b.Count)
		for name, got := range map[string][]float64{"new": b.Apply(c, nil), "used": b.Apply(c, usedX)} {
			for k := range got {
				want := 0.0
				for j := range c {
					want += b.Columns[j*b.Samples+k] * c[j]
				}
				if !(math.Abs(got[k]-want) <= 1e-14*float64(b.Count)) {
					t.Errorf("%s %dx%d: Apply (%s) gives %v at %d, definition %v", b.Family, b.Samples, b.Count, name, got[k], k, want)
				}
				if (k < b.Lead || k >= b.Samples-b.Trail) && got[k] != 0 {
					t.Errorf("%s %dx%d: Apply (%s) gives %v on guard %d", b.Family, b.Samples, b.Count, name, got[k], k)
				}
			}
		}
		for name, got := range map[string][]float64{"new": b.Transpose(x, nil), "used": b.Transpose(x, usedC)} {
			for j := range got {
				want := dot(b.Column(j), x)
				if !(math.Abs(got[j]-want) <= 1e-14*float64(b.Samples)) {
					t.Errorf("%s %dx%d: Transpose (%s) gives %v at %d, definition %v", b.Family, b.Samples, b.Count, name, got[j], j, want)
				}
			}
		}
		// <B c, x> = <c, B' x>, and B' B = 1.
		if got, want := dot(b.Apply(c, nil), x), dot(c, b.Transpose(x, nil)); !(math.Abs(got-want) <= 1e-13*(1+math.Abs(want))) {
			t.Errorf("%s %dx%d: <Bc,x> = %v, <c,B'x> = %v", b.Family, b.Samples, b.Count, got, want)
		}
		back := b.Transpose(b.Apply(c, nil), nil)
		for j := range c {
			if !(math.Abs(back[j]-c[j]) <= 1e-13) {
				t.Errorf("%s %dx%d: B'B c differs from c at %d by %.3g", b.Family, b.Samples, b.Count, j, back[j]-c[j])
			}
		}
		// What stands on the guards does not matter.
		want := b.Transpose(x, nil)
		for k := range x {
			if k < b.Lead || k >= b.Samples-b.Trail {
				x[k] = math.NaN()
			}
		}
		for j, got := range b.Transpose(x, nil) {
			if got != want[j] {
				t.Errorf("%s %dx%d: guards changed coefficient %d from %v to %v", b.Family, b.Samples, b.Count, j, want[j], got)
			}
		}
	}
}

func TestApplyAndTransposeAllocateNothing(t *testing.T) {
	for _, b := range someBases(t) {
		c, x := make([]float64, b.Count), make([]float64, b.Samples)
		if n := testing.AllocsPerRun(10, func() { b.Apply(c, x); b.Transpose(x, c) }); n != 0 {
			t.Errorf("%s %dx%d: %v allocations", b.Family, b.Samples, b.Count, n)
		}
	}
}

func TestWrongLengthsPanic(t *testing.T) {
	b, err := Samples(5, 1, 1)
	if err != nil {
		t.Fatal(err)
	}
	for name, call := range map[string]func(){
		"Apply: coefficients":   func() { b.Apply(make([]float64, 4), nil) },
		"Apply: dst":            func() { b.Apply(make([]float64, 3), make([]float64, 6)) },
		"Transpose: samples":    func() { b.Transpose(make([]float64, 3), nil) },
		"Transpose: dst":        func() { b.Transpose(make([]float64, 5), make([]float64, 5)) },
		"Transpose: empty dst":  func() { b.Transpose(make([]float64, 5), []float64{}) },
		"Apply: no coefficient": func() { b.Apply(nil, nil) },
	} {
		func() {
			defer func() {
				message, _ := recover().(string)
				if !strings.HasPrefix(message, "shape: ") {
					t.Errorf("%s: recovered %q", name, message)
				}
			}()
			call()
		}()
	}
}

func TestBasesRefused(t *testing.T) {
	const all = 4096 // the longest span whose unit vectors fill MaxEntries
	for _, c := range []struct {
		name                string
		samples, lead, tail int
		band                float64
		count               int
		want                string
	}{
		{"no samples", 0, 0, 0, 0.1, 0, "a span of 0 samples; allowed: 1 to 65536"},
		{"negative samples", -8, 0, 0, 0.1, 0, "a span of -8 samples"},
		{"too many samples", MaxSamples + 1, 0, 0, 0.1, 1, "a span of 65537 samples"},
		{"huge samples", math.MaxInt, 0, 0, 0.1, 1, "allowed: 1 to 65536"},
		{"negative lead", 8, -1, 0, 0.1, 0, "guards of -1 and 0 samples; allowed"},
		{"negative trail", 8, 0, -1, 0.1, 0, "guards of 0 and -1 samples; allowed"},
		{"all guards", 8, 4, 4, 0.1, 0, "leave nothing free in a span of 8"},
		{"huge guards", 8, math.MaxInt, math.MaxInt, 0.1, 0, "leave nothing free"},
		{"huge trail", 8, 1, math.MaxInt, 0.1, 0, "leave nothing free"},
		{"no band", 8, 0, 0, 0, 0, "a band of 0 cycles per sample; allowed: over 0, up to 0.5"},
		{"negative band", 8, 0, 0, -0.1, 0, "a band of -0.1"},
		{"band over Nyquist", 8, 0, 0, 0.5000001, 0, "a band of 0.5000001"},
		{"band not a number", 8, 0, 0, math.NaN(), 0, "a band of NaN"},
		{"infinite band", 8, 0, 0, math.Inf(1), 0, "a band of +Inf"},
		{"negative count", 8, 0, 0, 0.1, -1, "-1 coefficients over 8 free samples; allowed: 1 to 8"},
		{"too many coefficients", 8, 1, 2, 0.1, 6, "6 coefficients over 5 free samples"},
		{"too many entries", MaxSamples, 0, 0, 0.1, 0, "a basis of 65536 samples by 13106 coefficients has 858914816 entries; allowed: up to 16777216"},
		{"too many entries, whole space", MaxSamples, 0, 0, 0.5, 0, "has 4294967296 entries"},
		{"just too many entries", MaxSamples, 0, 0, 0.1, 257, "has 16842752 entries"},
	} {
		b, err := Slepian(c.samples, c.lead, c.tail, c.band, c.count)
		if b != nil || err == nil || !strings.HasPrefix(err.Error(), "shape: ") || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: got %v, want an error with %q", c.name, err, c.want)
		}
	}
	for _, c := range [][3]int{{0, 0, 0}, {8, 4, 4}, {8, -1, 0}, {all + 1, 0, 0}, {MaxSamples, 0, 0}, {MaxSamples + 1, 0, 0}} {
		if b, err := Samples(c[0], c[1], c[2]); b != nil || err == nil {
			t.Errorf("Samples%v: no error", c)
		}
	}
	if b, err := Samples(all, 0, 0); err != nil || b.Count != all {
		t.Errorf("Samples(%d): %v", all, err)
	}
	// A long span is no offence where the columns are few.
	if b, err := Samples(MaxSamples, 0, MaxSamples-100); err != nil || b.Count != 100 {
		t.Errorf("Samples(%d) with 100 free: %v", MaxSamples, err)
	}
}

var sink float64

// The basis of a 112 ns span with 4 guards, 1 GS/s and a band of 100 MHz.
func benchmarkBasis(b *testing.B) *Basis {
	b.Helper()
	basis, err := Slepian(112, 0, 4, 0.1, 0)
	if err != nil {
		b.Fatal(err)
	}
	return basis
}

func BenchmarkApply(b *testing.B) {
	basis := benchmarkBasis(b)
	c, x := normal(rand.New(rand.NewPCG(1, 1)), basis.Count), make([]float64, basis.Samples)
	for b.Loop() {
		sink += basis.Apply(c, x)[50]
	}
}

func BenchmarkTranspose(b *testing.B) {
	basis := benchmarkBasis(b)
	x, c := normal(rand.New(rand.NewPCG(1, 1)), basis.Samples), make([]float64, basis.Count)
	for b.Loop() {
		sink += basis.Transpose(x, c)[0]
	}
}

func BenchmarkSlepian(b *testing.B) {
	for b.Loop() {
		sink += benchmarkBasis(b).Columns[50]
	}
}

func BenchmarkSlepian2048(b *testing.B) {
	for b.Loop() {
		basis, err := Slepian(2048, 0, 4, 0.1, 0)
		if err != nil {
			b.Fatal(err)
		}
		sink += basis.Columns[50]
	}
}

func BenchmarkConcentration(b *testing.B) {
	basis := benchmarkBasis(b)
	for b.Loop() {
		_, outside, err := basis.Concentration(0.1)
		if err != nil {
			b.Fatal(err)
		}
		sink += outside[0]
	}
}
