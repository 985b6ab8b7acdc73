package shape

import (
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// The whole matrix against 60-digit arithmetic (mpmath 1.2.1, CALC;
// testdata/shape/families.py), small elements relative to their size.
func TestOutOfBandForm(t *testing.T) {
	smallest := 1.0
	for _, r := range readFamilyReference(t).Forms {
		b := named(t, r.Family).basis(t, r.N+3, 1, 2, r.W, r.Count)
		for j, v := range r.Columns {
			for k, want := range v {
				if got := b.Column(j)[k+1]; !(math.Abs(got-want) <= 3e-16) {
					t.Errorf("%s N=%d: column %d is %.17g at %d, want %.17g", r.Family, r.N, j, got, k, want)
				}
			}
		}
		e, err := b.OutOfBand(r.W)
		if err != nil {
			t.Fatal(err)
		}
		for i, row := range r.Form {
			for j, d := range row {
				want, a, c := float64(d), math.Sqrt(float64(r.Form[i][i])), math.Sqrt(float64(r.Form[j][j]))
				if got := e[i*r.Count+j]; !(math.Abs(got-want) <= 1e-14*a*c+1e-16*(a+c)) {
					t.Errorf("%s N=%d: E(%d,%d) = %.15g, want %.15g", r.Family, r.N, i, j, got, want)
				}
			}
			smallest = math.Min(smallest, float64(row[i]))
		}
		// The diagonal is what Concentration calls outside.
		_, outside := concentration(t, b, r.W)
		for j, want := range outside {
			if got := e[j*r.Count+j]; !(math.Abs(got-want) <= 1e-15*want) {
				t.Errorf("%s N=%d: E(%d,%d) = %v, outside %v", r.Family, r.N, j, j, got, want)
			}
		}
	}
	if !(smallest < 1e-7) {
		t.Errorf("smallest diagonal element %.3g", smallest)
	}
}

// The definition, B'(1-K)B with the sinc kernel, which the code never forms; the
// quadratic form is the energy; symmetric; no negative eigenvalue, also when
// every column is scaled to the same energy.
func TestOutOfBandKernel(t *testing.T) {
	rng := rand.New(rand.NewPCG(9, 9))
	bases := someBases(t)
	for _, f := range families {
		b := f.basis(t, 70, 2, 5, 0.15, 0)
		z, err := ZeroMean(b)
		if err != nil {
			t.Fatal(err)
		}
		bases = append(bases, b, z)
	}
	for _, b := range bases {
		for _, w := range []float64{0.03, 0.15, 0.4, 0.5} {
			e, err := b.OutOfBand(w)
			if err != nil {
				t.Fatal(err)
			}
			n := b.Count
			var trace float64
			scaled := mat.NewSymDense(n, nil)
			for i := range n {
				trace += e[i*n+i]
				filtered := make([]float64, b.Samples)
				for k := range filtered {
					filtered[k] = b.Column(i)[k]
					for l, x := range b.Column(i) {
						kernel := 2 * w
						if d := float64(k - l); d != 0 {
							kernel = math.Sin(2*math.Pi*w*d) / (math.Pi * d)
						}
						filtered[k] -= kernel * x
					}
				}
				for j := range n {
					if want := dot(b.Column(j), filtered); !(math.Abs(e[i*n+j]-want) <= 1e-14) || e[i*n+j] != e[j*n+i] {
						t.Errorf("%s %dx%d W=%v: E(%d,%d) = %.16g, want %.16g, mirrored %.16g", b.Family, b.Samples, n, w, i, j, e[i*n+j], want, e[j*n+i])
					}
					if scale := math.Sqrt(e[i*n+i] * e[j*n+j]); scale > 0 {
						scaled.SetSym(i, j, e[i*n+j]/scale)
					}
				}
			}
			var eigen mat.EigenSym
			for name, m := range map[string]*mat.SymDense{"E": mat.NewSymDense(n, e), "E scaled": scaled} {
				if !eigen.Factorize(m, false) {
					t.Fatal("no eigenvalues")
				}
				if least := eigen.Values(nil)[0]; !(least >= -1e-15*float64(n)) {
					t.Errorf("%s %dx%d W=%v: %s has the eigenvalue %.3g", b.Family, b.Samples, n, w, name, least)
				}
			}
			c := normal(rng, n)
			x := b.Apply(c, nil)
			var form float64
			for i := range n {
				form += c[i] * dot(e[i*n:(i+1)*n], c)
			}
			energy, share, err := OutOfBand(x, w)
			if err != nil || !(math.Abs(energy-form) <= 1e-13*dot(c, c)*math.Sqrt(trace)) || !(math.Abs(share*dot(x, x)-energy) <= 1e-14*energy) {
				t.Errorf("%s %dx%d W=%v: energy %v, form %v, share %v, %v", b.Family, b.Samples, n, w, energy, form, share, err)
			}
		}
	}
	for _, w := range []float64{0, -1, 0.6, math.NaN()} {
		if e, err := bases[1].OutOfBand(w); e != nil || err == nil {
			t.Errorf("W=%v: no error", w)
		}
	}
}

// In a Slepian basis E is diagonal, with one minus the eigenvalues; a column
// that is off by 1e-16 N towards another brings that much of the other's energy.
func TestOutOfBandSlepian(t *testing.T) {
	b := slepian(t, 64, 4.0/64, 8)
	e, err := b.OutOfBand(4.0 / 64)
	if err != nil {
		t.Fatal(err)
	}
	if want := 2.54163e-10; !(math.Abs(e[0]-want) <= 1e-5*want) { // CALC, as in TestSlepianPublished
		t.Errorf("1-l0 = %v, want %v", e[0], want)
	}
	for i := range 8 {
		for j := range i {
			if limit := 1e-16*64*math.Max(e[9*i], e[9*j]) + 1e-16*(math.Sqrt(e[9*i])+math.Sqrt(e[9*j])); !(math.Abs(e[8*i+j]) <= limit) {
				t.Errorf("E(%d,%d) = %v, over %v", i, j, e[8*i+j], limit)
			}
		}
	}
}

// Sequences against 60-digit arithmetic (mpmath, CALC; testdata/shape/families.py), down to 3e-30 of the whole.
func TestOutOfBandSequence(t *testing.T) {
	smallest := 1.0
	for _, r := range readFamilyReference(t).Energy {
		want, whole := float64(r.Energy), dot(r.X, r.X)
		energy, share, err := OutOfBand(r.X, r.W)
		if tolerance := 1e-14*want + 1e-16*math.Sqrt(want*whole); err != nil || !(math.Abs(energy-want) <= tolerance) || !(math.Abs(share-want/whole) <= tolerance/whole) {
			t.Errorf("W=%v: energy %.15g, want %.15g, share %.15g, %v", r.W, energy, want, share, err)
		}
		// Zeros around it, its sign and its scale do not matter.
		y := make([]float64, len(r.X)+30)
		for k, v := range r.X {
			y[k+13] = -1024 * v
		}
		if e, s, err := OutOfBand(y, r.W); err != nil || !(math.Abs(e/1048576-energy) <= 1e-15*energy) || !(math.Abs(s-share) <= 1e-15*share) {
			t.Errorf("W=%v: moved and scaled %v, %v, %v", r.W, e/1048576, s, err)
		}
		smallest = math.Min(smallest, want/whole)
	}
	if !(smallest < 1e-29) {
		t.Errorf("smallest reference %.3g", smallest)
	}
	if e, s, err := OutOfBand(make([]float64, 9), 0.1); e != 0 || s != 0 || err != nil {
		t.Errorf("zeros: %v, %v, %v", e, s, err)
	}
	if e, _, err := OutOfBand([]float64{1, -2, 3}, 0.5); e != 0 || err != nil {
		t.Errorf("W=0.5: %v, %v", e, err)
	}
	for want, c := range map[string]struct {
		x []float64
		w float64
	}{
		"a span of 0 samples":        {nil, 0.1},
		"a span of 65537 samples":    {make([]float64, MaxSamples+1), 0.1},
		"a band of 0 cycles":         {[]float64{1}, 0},
		"a band of NaN":              {[]float64{1}, math.NaN()},
		"sample 1 is NaN; allowed":   {[]float64{1, math.NaN()}, 0.1},
		"sample 2 is -Inf; allowed:": {[]float64{1, 0, math.Inf(-1)}, 0.1},
	} {
		if _, _, err := OutOfBand(c.x, c.w); err == nil || !strings.HasPrefix(err.Error(), "shape: "+want) {
			t.Errorf("got %v, want %q", err, want)
		}
	}
}

func BenchmarkOutOfBand(b *testing.B) {
	basis := benchmarkBasis(b)
	for b.Loop() {
		e, err := basis.OutOfBand(0.1)
		if err != nil {
			b.Fatal(err)
		}
		sink += e[0]
	}
}
