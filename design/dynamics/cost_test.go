package dynamics

import (
	"bufio"
	"fmt"
	"io"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strconv"
	"testing"
	"time"
)

// reader reads QCOST 1 (testdata/kernel/README.md), word by word; the first thing
// that is not as described ends it.
type reader struct {
	s   *bufio.Scanner
	err error
}

func (r *reader) next() string {
	if r.err == nil && !r.s.Scan() {
		if r.err = r.s.Err(); r.err == nil {
			r.err = io.ErrUnexpectedEOF
		}
	}
	if r.err != nil {
		return ""
	}
	return r.s.Text()
}

func (r *reader) want(words ...string) {
	for _, w := range words {
		if got := r.next(); r.err == nil && got != w {
			r.err = fmt.Errorf("found %q, want %q", got, w)
		}
	}
}

func (r *reader) number() float64 {
	w := r.next()
	if r.err != nil {
		return 0
	}
	v, err := strconv.ParseFloat(w, 64)
	if err != nil {
		r.err = err
	}
	return v
}

func (r *reader) count(name string) int {
	r.want(name)
	v := r.number()
	if r.err == nil && (v != math.Floor(v) || v < 1 || v > 100000) {
		r.err = fmt.Errorf("found %s %v", name, v)
	}
	if r.err != nil {
		return 0
	}
	return int(v)
}

func (r *reader) matrix(d int) []complex128 {
	m := make([]complex128, d*d)
	for i := range m {
		re := r.number()
		m[i] = complex(re, r.number())
	}
	return m
}

func readCost(file io.Reader) (*Cost, []float64, error) {
	r := &reader{s: bufio.NewScanner(file)}
	r.s.Split(bufio.ScanWords)
	c := &Cost{}
	r.want("QCOST", "1")
	c.Dim = r.count("d")
	k := r.count("K")
	c.Steps = r.count("N")
	j := r.count("J")
	r.want("dt")
	c.Step = r.number()
	r.want("rule", "simpson", "H0")
	c.Static = r.matrix(c.Dim)
	for i := range k {
		r.want("H", strconv.Itoa(i))
		c.Controls = append(c.Controls, r.matrix(c.Dim))
	}
	r.want("W")
	c.Target = r.matrix(c.Dim)
	for i := range j {
		r.want("V", strconv.Itoa(i))
		c.Weights = append(c.Weights, r.number())
		c.Errors = append(c.Errors, r.matrix(c.Dim))
	}
	r.want("u")
	u := make([]float64, c.Steps*k)
	for i := range u {
		u[i] = r.number()
	}
	r.want("end")
	if r.err != nil {
		return nil, nil, r.err
	}
	return c, u, c.Reset()
}

func problem(t testing.TB, name string) (*Cost, []float64) {
	f, err := os.Open(filepath.Join("..", "..", "testdata", "kernel", name+".txt"))
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	c, u, err := readCost(f)
	if err != nil {
		t.Fatalf("%s: %v", name, err)
	}
	return c, u
}

// kernelValues are those of testdata/kernel/README.md: two independent
// implementations (numpy 1.24, compiled C) that agree to 1e-12.
var kernelValues = []struct {
	name                 string
	exact, simpson, grad float64
}{
	{"A", 0.736024279269222, 0.736024278872446, 0.274043327728088},
	{"B", 1.14865975699781, 1.14865975895509, 0.0332588848157242},
	{"C", 1.19613923273215, 1.19613923290542, 0.124912458316946},
	{"D", 1.18751164547003, 1.18751164540753, 0.0359105913631350},
	{"E", 1.33892818061787, 1.33892818061584, 0.0113048990525011},
}

func TestCostValues(t *testing.T) {
	for _, want := range kernelValues {
		c, u := problem(t, want.name)
		grad := make([]float64, len(u))
		f := c.Value(u, grad)
		norm := 0.0
		for _, g := range grad {
			norm += g * g
		}
		norm = math.Sqrt(norm)
		if !(math.Abs(f-want.simpson) <= 1e-12) || !(math.Abs(f-want.exact) <= 5e-9) {
			t.Errorf("%s: F = %.15g, want %.15g by Simpson's rule, %.15g exactly", want.name, f, want.simpson, want.exact)
		}
		if !(math.Abs(norm-want.grad) <= 1e-11*want.grad) {
			t.Errorf("%s: norm of gradient %.15g, want %.15g", want.name, norm, want.grad)
		}
		if g := c.Value(u, nil); g != f {
			t.Errorf("%s: %v without gradient, %v with", want.name, g, f)
		}
		t.Logf("%s: F off by %.1e (Simpson), %.1e (exact); norm of gradient by %.1e", want.name, f-want.simpson, f-want.exact, norm/want.grad-1)
	}
}

func TestCostGradient(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	for _, want := range kernelValues {
		c, u := problem(t, want.name)
		grad := make([]float64, len(u))
		c.Value(u, grad)
		most := 0.0
		for _, g := range grad {
			most = max(most, math.Abs(g))
		}
		const e = 3e-4
		at := func(i int, x float64) float64 {
			old := u[i]
			u[i] = old + x
			f := c.Value(u, nil)
			u[i] = old
			return f
		}
		for range 12 {
			i := rng.IntN(len(u))
			// two central differences, extrapolated: what is left is rounding, 1e-13/e
			p := (at(i, e) - at(i, -e)) / (2 * e)
			q := (at(i, 2*e) - at(i, -2*e)) / (4 * e)
			diff := (4*p - q) / 3
			if !(math.Abs(grad[i]-diff) <= 1e-7*most+2e-12) {
				t.Errorf("%s: derivative %d is %.12g, central difference %.12g", want.name, i, grad[i], diff)
			}
		}
	}
}

// slowCost is the definition of Cost with its Simpson rule, transcribed: Taylor
// series of the exponentials, one error at a time.
func slowCost(c *Cost, u []float64) float64 {
	d, n := c.Dim, c.Steps
	acc := make([][]complex128, len(c.Errors))
	for j := range acc {
		acc[j] = make([]complex128, d*d)
	}
	x := slowExp(c.Static, 0, d)
	add := func(w float64) {
		for j, v := range c.Errors {
			for i, y := range slowMul(slowAdj(x, d), slowMul(v, x, d), d) {
				acc[j][i] += times(y, w)
			}
		}
	}
	for i := range n {
		h := append([]complex128(nil), c.Static...)
		for k, m := range c.Controls {
			for q := range h {
				h[q] += times(m[q], u[i*len(c.Controls)+k])
			}
		}
		e := slowExp(h, c.Step/2, d)
		add(c.Step / 6)
		x = slowMul(e, x, d)
		add(4 * c.Step / 6)
		x = slowMul(e, x, d)
		add(c.Step / 6)
	}
	var tau complex128
	for i, w := range c.Target {
		tau += conj(w) * x[i]
	}
	f := 1 - real(tau*conj(tau))/float64(d*d)
	for j, a := range acc {
		for i := range a {
			a[i] = times(a[i], 1/(c.Step*float64(n)))
		}
		for i := range d {
			var tr complex128
			for l := range d {
				tr += c.Errors[j][l*d+l]
			}
			a[i*d+i] -= tr / complex(float64(d), 0)
		}
		for _, y := range a {
			f += c.Weights[j] * real(y*conj(y)) / float64(d)
		}
	}
	return f
}

func slowMul(a, b []complex128, d int) []complex128 {
	c := make([]complex128, d*d)
	for i := range d {
		for j := range d {
			for k := range d {
				c[i*d+j] += a[i*d+k] * b[k*d+j]
			}
		}
	}
	return c
}

func slowAdj(a []complex128, d int) []complex128 {
	c := make([]complex128, d*d)
	for i := range d {
		for j := range d {
			c[i*d+j] = conj(a[j*d+i])
		}
	}
	return c
}

// slowExp is exp(-i t h) by its Taylor series, halved until it converges fast.
func slowExp(h []complex128, t float64, d int) []complex128 {
	if math.Abs(t)*spread(h, d) > 1 {
		e := slowExp(h, t/2, d)
		return slowMul(e, e, d)
	}
	sum := make([]complex128, d*d)
	for i := range d {
		sum[i*d+i] = 1
	}
	term := append([]complex128(nil), sum...)
	for n := 1; n < 22; n++ {
		term = slowMul(term, h, d)
		for i := range term {
			term[i] *= complex(0, -t/float64(n))
			sum[i] += term[i]
		}
	}
	return sum
}

func randomHermitian(rng *rand.Rand, d int, size float64) []complex128 {
	a := make([]complex128, d*d)
	for i := range d {
		a[i*d+i] = complex(size*rng.NormFloat64(), 0)
		for j := i + 1; j < d; j++ {
			z := complex(size*rng.NormFloat64(), size*rng.NormFloat64())
			a[i*d+j], a[j*d+i] = z, conj(z)
		}
	}
	return a
}

// randomCost has rough controls, long steps and errors with traces.
func randomCost(rng *rand.Rand, d int) (*Cost, []float64) {
	s := 1 / math.Sqrt(float64(d))
	c := &Cost{Dim: d, Static: randomHermitian(rng, d, s), Step: 0.3, Steps: 7,
		Target: slowExp(randomHermitian(rng, d, s), 1, d)}
	for j := range 3 {
		c.Controls = append(c.Controls, randomHermitian(rng, d, s))
		v := randomHermitian(rng, d, s)
		if j == 1 { // a pattern with holes
			for i := range v {
				if i%d != i/d {
					v[i] = 0
				}
			}
		}
		c.Errors = append(c.Errors, v)
		c.Weights = append(c.Weights, 0.3+float64(j))
	}
	u := make([]float64, 3*c.Steps)
	for i := range u {
		u[i] = 0.5 * rng.NormFloat64()
	}
	return c, u
}

func TestCostSlow(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 6))
	for _, d := range []int{2, 3, 4, 5, 6, 7, 9, 12} {
		c, u := randomCost(rng, d)
		if err := c.Reset(); err != nil {
			t.Fatal(err)
		}
		grad := make([]float64, len(u))
		if got, want := c.Value(u, grad), slowCost(c, u); !(math.Abs(got-want) <= 1e-13*want) {
			t.Errorf("d = %d: %.16g, want %.16g", d, got, want)
		}
		const e = 2e-4
		for i := range u {
			x := u[i]
			var v [4]float64
			for m, s := range []float64{-2, -1, 1, 2} {
				u[i] = x + s*e
				v[m] = c.Value(u, nil)
			}
			u[i] = x
			diff := (8*(v[2]-v[1]) - (v[3] - v[0])) / (12 * e)
			if !(math.Abs(grad[i]-diff) <= 1e-9) {
				t.Errorf("d = %d: derivative %d is %.12g, want %.12g", d, i, grad[i], diff)
			}
		}
	}
}

func TestCostRefuses(t *testing.T) {
	for name, spoil := range map[string]func(c *Cost){
		"dimension": func(c *Cost) { c.Dim = 65 },
		"steps":     func(c *Cost) { c.Steps = 0 },
		"step":      func(c *Cost) { c.Step = math.NaN() },
		"weights":   func(c *Cost) { c.Weights = c.Weights[1:] },
		"target":    func(c *Cost) { c.Target = c.Target[1:] },
		"static":    func(c *Cost) { c.Static[1] += 1e-9 },
		"control":   func(c *Cost) { c.Controls[1] = nil },
		"error":     func(c *Cost) { c.Errors[2][0] = complex(math.NaN(), 0) },
	} {
		c, _ := randomCost(rand.New(rand.NewPCG(7, 8)), 3)
		spoil(c)
		if c.Reset() == nil {
			t.Errorf("%s: no error", name)
		}
	}
}

func TestCostNoAllocation(t *testing.T) {
	for _, want := range kernelValues {
		c, u := problem(t, want.name)
		grad := make([]float64, len(u))
		if n := testing.AllocsPerRun(5, func() { c.Value(u, grad) }); n != 0 {
			t.Errorf("%s: %v allocations", want.name, n)
		}
	}
}

// speed returns the best rate, in floating-point operations per ns, of products of
// complex 4 x 4 matrices written out as in this package, over a few ms: the yardstick
// between machines. On that of testdata/kernel/README.md it is 13.
func speed() float64 {
	var x, y, z [16]complex128
	for i := range x {
		x[i], y[i] = complex(1, float64(i)), complex(float64(i), 2)
	}
	best := 0.0
	for range 200 {
		start := time.Now()
		for range 200 {
			mul4(&z, &x, &y)
		}
		best = max(best, 200*8*64/float64(time.Since(start).Nanoseconds()))
	}
	return best
}

// BenchmarkCost times a cost and gradient of each problem of testdata/kernel. Beside
// the mean stand the fastest evaluation, which other work on the machine disturbs
// least, and the same scaled to the machine of the README there by the speed of the
// yardstick (its best while the benchmark ran).
func BenchmarkCost(b *testing.B) {
	for _, want := range kernelValues {
		b.Run(want.name, func(b *testing.B) {
			c, u := problem(b, want.name)
			grad := make([]float64, len(u))
			yard := speed()
			best := math.Inf(1)
			for b.Loop() {
				start := time.Now()
				c.Value(u, grad)
				best = min(best, float64(time.Since(start).Nanoseconds())/1000)
			}
			yard = max(yard, speed())
			b.ReportMetric(best, "best-µs")
			b.ReportMetric(yard, "yard-GFLOP/s")
			b.ReportMetric(best*yard/13, "scaled-µs")
		})
	}
}
