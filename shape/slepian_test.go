package shape

import (
	"math"
	"slices"
	"testing"
)

func slepian(t *testing.T, n int, w float64, count int) *Basis {
	t.Helper()
	b, err := Slepian(n, 0, 0, w, count)
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// Eigenvalues and a sequence. Source: D. Slepian, Bell Syst. Tech. J. 57, 1371
// (1978), the definition; digits CALC (independent computation in 40 digits).
func TestSlepianPublished(t *testing.T) {
	inside, outside := concentration(t, slepian(t, 64, 4.0/64, 8), 4.0/64)
	if want := 2.54163e-10; !(math.Abs(outside[0]-want) <= 1e-5*want) { // CALC, six digits given
		t.Errorf("N=64 NW=4: 1-l0 = %.9g, want %.6g", outside[0], want)
	}
	for j, want := range map[int]float64{3: .999969657680049, 6: .937468604926453, 7: .699685077369259} { // CALC
		if !(math.Abs(inside[j]-want) <= 1e-14) {
			t.Errorf("N=64 NW=4: l%d = %.17g, want %.15g", j, inside[j], want)
		}
	}
	b := slepian(t, 16, 2.0/16, 4)
	inside, _ = concentration(t, b, 2.0/16)
	for j, want := range []float64{.999956555803971, .997931629370327, .96234642983662, .72624739746144} { // CALC
		if !(math.Abs(inside[j]-want) <= 1e-14) {
			t.Errorf("N=16 NW=2: l%d = %.17g, want %.15g", j, inside[j], want)
		}
	}
	for k, want := range []float64{.0166861972, .0474413151, .0968656002, .1631896253, .2393767262, .3140174335, .3738438768, .4071727942} { // CALC
		if got := b.Column(0)[k]; !(math.Abs(got-want) <= 0.51e-10) {
			t.Errorf("N=16 NW=2: v0(%d) = %.12g, want %.10g", k, got, want)
		}
	}
}

func concentration(t *testing.T, b *Basis, w float64) (inside, outside []float64) {
	t.Helper()
	inside, outside, err := b.Concentration(w)
	if err != nil {
		t.Fatal(err)
	}
	return inside, outside
}

// Sequences against scipy.signal.windows.dpss 1.10.1 (CALC; the script is
// testdata/shape/reference.py), whose own rounding sets the tolerance. Signs
// are compared elsewhere: where v(0) is tiny that library's are accidental.
func TestSlepianAgainstLibrary(t *testing.T) {
	for _, r := range readReference(t).Sequences {
		b := slepian(t, r.N, r.W, len(r.Columns))
		inside, _ := concentration(t, b, r.W)
		for j, want := range r.Columns {
			got := b.Column(j)
			sign := math.Copysign(1, dot(got, want))
			for k := range want {
				if !(math.Abs(sign*got[k]-want[k]) <= 1e-12) {
					t.Errorf("N=%d W=%.4g: v%d(%d) = %.16g, want %.16g", r.N, r.W, j, k, sign*got[k], want[k])
					break
				}
			}
			if !(math.Abs(inside[j]-r.Ratios[j]) <= 1e-12) {
				t.Errorf("N=%d W=%.4g: l%d = %.16g, want %.16g", r.N, r.W, j, inside[j], r.Ratios[j])
			}
		}
	}
}

// What is left outside the band against 60-digit arithmetic (mpmath 1.2.1,
// CALC; testdata/shape/reference.py). The columns are rounded at 1e-16 of their
// norm: that much of the root of the energy is noise.
func TestSlepianOutside(t *testing.T) {
	const noise = 1e-16
	smallest := 1.0
	for _, r := range readReference(t).Concentration {
		inside, outside := concentration(t, slepian(t, r.N, r.W, len(r.Outside)), r.W)
		for j, d := range r.Outside {
			want := math.Max(0, float64(d)) // under 1e-58 its sign is rounding
			if !(math.Abs(outside[j]-want) <= 1e-11*want+2*noise*math.Sqrt(want)+noise*noise) {
				t.Errorf("N=%d W=%.4g: 1-l%d = %.12g, want %.12g", r.N, r.W, j, outside[j], want)
			}
			if !(math.Abs(inside[j]-(1-want)) <= 1e-14) {
				t.Errorf("N=%d W=%.4g: l%d = %.17g, want %.17g", r.N, r.W, j, inside[j], 1-want)
			}
			if want > 1e-20 {
				smallest = math.Min(smallest, want)
			}
		}
	}
	if !(smallest < 1e-15) {
		t.Errorf("smallest reference %.3g: this test no longer reaches what 1-l cannot", smallest)
	}
}

// The definition: eigenvectors of the sinc kernel, which the code never forms.
func TestSlepianSincKernel(t *testing.T) {
	for _, c := range []struct {
		n, count int
		w        float64
	}{{60, 11, 0.1}, {33, 33, 0.2}, {50, 50, 0.25}, {50, 50, 0.4}, {7, 7, 0.01}} {
		b := slepian(t, c.n, c.w, c.count)
		inside, _ := concentration(t, b, c.w)
		for j := range c.count {
			v := b.Column(j)
			for k := range v {
				var got float64
				for i, x := range v {
					kernel := 2 * c.w
					if d := float64(k - i); d != 0 {
						kernel = math.Sin(2*math.Pi*c.w*d) / (math.Pi * d)
					}
					got += kernel * x
				}
				if want := inside[j] * v[k]; !(math.Abs(got-want) <= 1e-14) {
					t.Errorf("N=%d W=%v: (K v%d)(%d) = %.16g, want %.16g", c.n, c.w, j, k, got, want)
				}
			}
			if j > 0 && !(inside[j] <= inside[j-1]+1e-14) {
				t.Errorf("N=%d W=%v: l%d = %v over l%d = %v", c.n, c.w, j, inside[j], j-1, inside[j-1])
			}
		}
	}
}

// Orthonormality to 1e-13 for small, odd, even, wide, narrow, whole and long.
func TestSlepianOrthonormal(t *testing.T) {
	for n := 1; n <= 12; n++ {
		for _, w := range []float64{1e-9, 0.01, 0.1, 0.25, 0.3, 0.499999, 0.5} {
			for count := 1; count <= n; count++ {
				if worst := orthonormality(slepian(t, n, w, count)); !(worst <= 1e-15*5) {
					t.Errorf("N=%d W=%v count %d: off by %.3g", n, w, count, worst)
				}
			}
		}
	}
	for _, c := range []struct {
		n, count int
		w        float64
	}{{64, 64, 0.1}, {109, 0, 0.1}, {300, 300, 0.02}, {300, 300, 0.45}, {601, 600, 0.5}, {2048, 0, 0.05}, {MaxSamples, 6, 3e-5}} {
		if worst := orthonormality(slepian(t, c.n, c.w, c.count)); !(worst <= 1e-13) {
			t.Errorf("N=%d W=%v count %d: off by %.3g", c.n, c.w, c.count, worst)
		}
	}
}

// Exact symmetry, the signs of [slepian], j changes of sign. Elements under
// 1e-13 may be nothing but rounding and count for neither; TestSlepianDual sees those columns.
func TestSlepianSymmetryAndSigns(t *testing.T) {
	for _, c := range []struct {
		n int
		w float64
	}{{16, 0.125}, {17, 0.125}, {64, 0.1}, {65, 0.3}, {200, 0.25}, {200, 0.49}, {5, 1e-6}} {
		b := slepian(t, c.n, c.w, c.n)
		_, outside := concentration(t, b, c.w)
		seen := 0
		for j := range c.n {
			v := b.Column(j)
			changes, before, least := 0, 0.0, math.Inf(1)
			var sum, moment float64
			for k, x := range v {
				if mirror := v[c.n-1-k]; x != mirror && j%2 == 0 || x != -mirror && j%2 == 1 {
					t.Fatalf("N=%d W=%v: v%d(%d) = %v, mirrored %v", c.n, c.w, j, k, x, mirror)
				}
				if x*before < 0 {
					changes++
				}
				if x != 0 {
					before, least = x, math.Min(least, math.Abs(x))
				}
				sum += x
				moment += float64(c.n-1-2*k) * x
			}
			if least > 1e-13 {
				seen++
				if changes != j || !(v[0] > 0) {
					t.Errorf("N=%d W=%v: v%d starts at %v and has %d changes of sign", c.n, c.w, j, v[0], changes)
				}
			}
			// Inside the band sum and moment stand well above their rounding.
			if outside[j] < 0.5 && (j%2 == 0 && !(sum > 0) || j%2 == 1 && !(moment > 0)) {
				t.Errorf("N=%d W=%v: v%d has sum %v, moment %v", c.n, c.w, j, sum, moment)
			}
		}
		if seen < min(c.n, 20)/2 {
			t.Errorf("N=%d W=%v: only %d columns stand above rounding", c.n, c.w, seen)
		}
	}
}

// What is worst concentrated in a band is best concentrated in the rest of the
// frequencies: v_j(k; W) = (-1)^k v_(N-1-j)(k; 1/2-W) ([slepian], section 2.3),
// the signs included, because both start positive.
func TestSlepianDual(t *testing.T) {
	for _, c := range []struct {
		n int
		w float64
	}{{16, 0.125}, {17, 0.125}, {64, 0.1}, {300, 0.04}, {300, 0.25}} {
		b, dual := slepian(t, c.n, c.w, c.n), slepian(t, c.n, 0.5-c.w, c.n)
		tolerance := 2e-16 * float64(c.n) // measured: 1e-16 N at most
		if c.n == 64 {
			tolerance = 3.5e-15 // measured 1.7e-15, and 5.3e-15 before the eigenvalue is improved
		}
		for j := range c.n {
			v, u := b.Column(j), dual.Column(c.n-1-j)
			for k := range v {
				if want := u[k] * float64(1-2*(k%2)); !(math.Abs(v[k]-want) <= tolerance) {
					t.Errorf("N=%d W=%v: v%d(%d) = %v, its dual %v", c.n, c.w, j, k, v[k], want)
					break
				}
			}
		}
	}
}

// Guards only move the sequences.
func TestSlepianGuards(t *testing.T) {
	plain := slepian(t, 60, 0.1, 0)
	for _, g := range [][2]int{{0, 4}, {4, 0}, {3, 17}} {
		b, err := Slepian(60+g[0]+g[1], g[0], g[1], 0.1, 0)
		if err != nil {
			t.Fatal(err)
		}
		if b.Count != plain.Count || b.Lead != g[0] || b.Trail != g[1] {
			t.Fatalf("guards %v: %d columns, guards %d and %d", g, b.Count, b.Lead, b.Trail)
		}
		for j := range b.Count {
			if !slices.Equal(b.Column(j)[g[0]:g[0]+60], plain.Column(j)) {
				t.Errorf("guards %v: column %d differs", g, j)
			}
		}
	}
}

// max(1, floor(2NW)-1), at most N; nothing to leak at W = 0.5.
func TestDefaultCount(t *testing.T) {
	for _, c := range []struct {
		n    int
		w    float64
		want int
	}{
		{1, 0.5, 1}, {1, 1e-9, 1}, {2, 0.4, 1}, {10, 0.1, 1}, {15, 0.1, 2}, {14, 0.1, 1},
		{60, 0.1, 11}, {108, 0.1, 20}, {92, 0.1, 17}, // 64, 112 and 96 samples, 4 of them guards, 100 MHz at 1 GS/s
		{30, 0.09999999999999998, 5}, // as 0.7-0.6 in doubles: the product still counts as 6
		{30, 0.0999999, 4},
		{100, 0.499999, 98}, {100, 0.5, 100}, {192, 0.5, 192},
	} {
		if got := DefaultCount(c.n, c.w); got != c.want {
			t.Errorf("N=%d W=%v: %d, want %d", c.n, c.w, got, c.want)
		}
		if b := slepian(t, c.n, c.w, 0); b.Count != c.want {
			t.Errorf("N=%d W=%v: %d columns, want %d", c.n, c.w, b.Count, c.want)
		}
	}
}

// With nothing outside the band: the unit vectors. Fewer columns are the limit
// of those for a band that is just short of it.
func TestSlepianWholeBand(t *testing.T) {
	b, err := Slepian(20, 2, 3, 0.5, 0)
	if err != nil {
		t.Fatal(err)
	}
	s, err := Samples(20, 2, 3)
	if err != nil {
		t.Fatal(err)
	}
	if b.Count != 15 || !slices.Equal(b.Columns, s.Columns) || b.Family != FamilySlepian || s.Family != FamilySamples {
		t.Errorf("W=0.5: %d columns of family %s", b.Count, b.Family)
	}
	for j := range s.Count {
		for k, v := range s.Column(j) {
			if want := map[bool]float64{true: 1}[k == j+2]; v != want {
				t.Errorf("unit vector %d is %v at %d", j, v, k)
			}
		}
	}
	whole, near := slepian(t, 20, 0.5, 7), slepian(t, 20, 0.5-1e-9, 7)
	for i := range whole.Columns {
		if !(math.Abs(whole.Columns[i]-near.Columns[i]) <= 1e-12) {
			t.Errorf("W=0.5: entry %d is %v, just below %v", i, whole.Columns[i], near.Columns[i])
		}
	}
}

// A unit vector has a flat spectrum; inside and outside make up the whole.
func TestConcentration(t *testing.T) {
	s, err := Samples(40, 3, 5)
	if err != nil {
		t.Fatal(err)
	}
	for _, w := range []float64{1e-6, 0.1, 0.37, 0.5} {
		inside, outside := concentration(t, s, w)
		for j := range inside {
			if !(math.Abs(inside[j]-2*w) <= 1e-14) || !(math.Abs(outside[j]-(1-2*w)) <= 1e-14) {
				t.Errorf("W=%v: unit vector %d has %v inside, %v outside", w, j, inside[j], outside[j])
			}
		}
	}
	inside, outside := concentration(t, slepian(t, 70, 0.1, 20), 0.23)
	for j := range inside {
		if !(math.Abs(inside[j]+outside[j]-1) <= 1e-14) {
			t.Errorf("column %d: %v inside and %v outside", j, inside[j], outside[j])
		}
	}
	for _, w := range []float64{0, -1, 0.6, math.NaN()} {
		if _, _, err := s.Concentration(w); err == nil {
			t.Errorf("W=%v: no error", w)
		}
	}
}

func TestSlepianDeterministic(t *testing.T) {
	if a, b := slepian(t, 108, 0.1, 0), slepian(t, 108, 0.1, 0); !slices.Equal(a.Columns, b.Columns) {
		t.Error("two calls differ")
	}
}
