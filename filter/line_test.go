package filter

import (
	"bufio"
	"fmt"
	"math"
	"math/big"
	"math/cmplx"
	"os"
	"strings"
	"testing"
)

func relative(got, want float64) float64 { return math.Abs(got-want) / math.Abs(want) }

// Transition time times corner (10-90 %, IEEE Std 181), overshoot.
// CALC: independent computation of a published definition.
func TestTransitionTimesFromOutside(t *testing.T) {
	one := pole(t, 1.7)
	f := one.StepFigures()
	// Single pole ln 9/(2 pi) = 0.349699.
	if got := f.TransitionTime * one.Corner(); !(math.Abs(got-0.349699) <= 5e-7) || !(relative(got, math.Log(9)/(2*math.Pi)) <= 1e-13) {
		t.Errorf("single pole: transition time x corner %.9f, want 0.349699", got)
	}
	// Single pole settles to 1e-3 in 6.908 tau (exactly 3 ln 10).
	if got := f.Settling01pc / 1.7; !(math.Abs(got-6.908) <= 5e-4) || !(relative(got, 3*math.Ln10) <= 1e-12) {
		t.Errorf("single pole settles to 1e-3 in %.6f tau, want 6.908", got)
	}
	if got := f.Settling1pc / 1.7; !(relative(got, 2*math.Ln10) <= 1e-12) {
		t.Errorf("single pole settles to 1e-2 in %.6f tau, want 2 ln 10", got)
	}
	if f.Overshoot != 0 || !(relative(f.GroupDelay, 1.7) <= 1e-15) {
		t.Errorf("single pole: overshoot %g, group delay %g; want 0, 1.7", f.Overshoot, f.GroupDelay)
	}
	for _, c := range []struct {
		order                 int
		transition, overshoot float64
	}{
		{2, 0.34207, 0.0043}, // Bessel, CALC
		{4, 0.35013, 0.0084},
	} {
		l := bessel(t, c.order, 0.2)
		f := l.StepFigures()
		if got := f.TransitionTime * 0.2; !(math.Abs(got-c.transition) <= 5e-6) {
			t.Errorf("Bessel %d: transition time x corner %.7f, want %g", c.order, got, c.transition)
		}
		if !(math.Abs(f.Overshoot-c.overshoot) <= 5e-5) {
			t.Errorf("Bessel %d: overshoot %.6f, want %g", c.order, f.Overshoot, c.overshoot)
		}
	}
	// Butterworth 2, its poles written out: checks the figures on a stronger
	// overshoot, exp(-pi) in closed form (CALC: 0.34187, 4.32 %).
	p := complex(-1, 1) / complex(math.Sqrt2, 0)
	r := 1 / (p - cmplx.Conj(p))
	butter := Line{Terms: []Term{{p, 1, r}, {cmplx.Conj(p), 1, cmplx.Conj(r)}}}
	same := line(t)(Butterworth(2, 1/(2*math.Pi)))
	for _, w := range []float64{0, 0.5, 1, 7} {
		if d := cmplx.Abs(same.Response(w) - butter.Response(w)); !(d <= 4e-16) {
			t.Errorf("Butterworth 2 at %g: off its poles written out by %g", w, d)
		}
	}
	b := butter.StepFigures()
	if got := b.TransitionTime * butter.Corner(); !(math.Abs(got-0.34187) <= 5e-6) {
		t.Errorf("Butterworth 2: transition time x corner %.7f, want 0.34187", got)
	}
	if !(math.Abs(b.Overshoot-math.Exp(-math.Pi)) <= 1e-14) || !(math.Abs(b.Overshoot-0.0432) <= 5e-5) {
		t.Errorf("Butterworth 2: overshoot %.16f, want exp(-pi)", b.Overshoot)
	}
}

// Hold droop at .25, .4, .5 of the sample rate, dB (CALC).
func TestHoldDroop(t *testing.T) {
	for _, c := range []struct{ share, dB float64 }{{0.25, -0.91210}, {0.4, -2.42007}, {0.5, -3.92240}} {
		if got := 20 * math.Log10(HoldDroop(c.share/2.5, 2.5)); !(math.Abs(got-c.dB) <= 5e-6) {
			t.Errorf("droop at %g of the sample rate: %.6f dB, want %g", c.share, got, c.dB)
		}
	}
	if HoldDroop(0, 1) != 1 || HoldDroop(-0.3, 1) != HoldDroop(0.3, 1) || !(HoldDroop(1, 1) <= 1e-15) {
		t.Error("droop: 1 at zero, even, zero at the sample rate")
	}
}

// A bias tee of 1 ms droops 1.000e-4 in 100 ns (CALC): the AC-coupling
// corner s T/(1+s T) is a line of this form with a tail of amplitude one.
func TestBiasTee(t *testing.T) {
	l := line(t)(ACCoupling(1e6))
	if l.Direct != 1 || len(l.Terms) != 1 || l.Terms[0] != (Term{-1e-6, 1, -1e-6}) {
		t.Errorf("bias tee: %v", l)
	}
	if got := 1 - real(l.Step(100)); !(math.Abs(got-1.000e-4) <= 5e-8) {
		t.Errorf("droop %g, want 1.000e-4", got)
	}
	if l.DC() != 0 || !math.IsInf(l.Corner(), 1) || !math.IsInf(l.StepFigures().TransitionTime, 1) {
		t.Errorf("AC coupling: DC %v, corner %g, figures %v; want 0 and no figures", l.DC(), l.Corner(), l.StepFigures())
	}
}

// Step response of tails is 1 + sum a e^{-t/T}, of either sign, from the first instant.
func TestTails(t *testing.T) {
	list := []Tail{{-0.015, 30}, {0.04, 300}, {0.25, 1e5}, {0.01, 30}, {0, 5}}
	l := tails(t, list...)
	if len(l.Terms) != 3 {
		t.Errorf("%d terms, want equal times added and an empty tail left out", len(l.Terms))
	}
	for _, at := range []float64{0, 1e-9, 0.3, 29, 400, 1e5, 1e9} {
		want := 1.0
		for _, tail := range list {
			want += tail.Amplitude * math.Exp(-at/tail.Time)
		}
		if got := l.Step(at); !(cmplx.Abs(got-complex(want, 0)) <= 1e-15) {
			t.Errorf("tails at %g: %v, want %.17g", at, got, want)
		}
	}
	if !(cmplx.Abs(l.DC()-1) <= 4e-16) || !l.Real() {
		t.Errorf("tails: DC %v, real %v", l.DC(), l.Real())
	}
	f := tails(t, Tail{-0.015, 30}).StepFigures()
	if !(relative(f.Settling01pc, 30*math.Log(15)) <= 1e-12) || !(relative(f.Settling1pc, 30*math.Log(1.5)) <= 1e-12) || f.Overshoot != 0 || f.TransitionTime != 0 {
		t.Errorf("tail of -1.5 %%: %+v, want settling 30 ln 15 and 30 ln 1.5 ns, no overshoot, no transition time", f)
	}
	if !(relative(f.GroupDelay, 0.015*30) <= 1e-12) { // int (1 - step) dt
		t.Errorf("tail of -1.5 %%: group delay %g, want 0.45 ns", f.GroupDelay)
	}
	f = tails(t, Tail{0.015, 30}).StepFigures()
	if !(relative(f.Overshoot, 0.015) <= 1e-12) || !(relative(f.Settling01pc, 30*math.Log(15)) <= 1e-12) {
		t.Errorf("tail of +1.5 %%: %+v", f)
	}
	if got := tails(t); len(got.Terms) != 0 || got.Direct != 1 {
		t.Errorf("no tail: %v, want straight through", got)
	}
}

// theta evaluates the reverse Bessel polynomial from its published coefficients
// (2n-k)!/(2^{n-k} k! (n-k)!), not from the recurrence that the package uses.
func theta(n int, s complex128) complex128 {
	factorial := func(k int) float64 { return math.Round(math.Gamma(float64(k + 1))) }
	sum := complex128(0)
	for k := n; k >= 0; k-- {
		c := factorial(2*n-k) / (math.Pow(2, float64(n-k)) * factorial(k) * factorial(n-k))
		sum = sum*s + complex(c, 0)
	}
	return sum
}

// Every order against its polynomial transfer function theta(0)/theta(i w/w3),
// with w3 found here by secant steps; corner, gain, and delay (one at w = 0 before scaling:
// the property that makes it a Bessel filter).
func TestBesselAgainstThePolynomial(t *testing.T) {
	for n := 1; n <= 8; n++ {
		const corner = 0.2
		w0, w1 := 1.0, math.Sqrt(float64(2*n-1)*math.Ln2)+0.1
		excess := func(w float64) float64 {
			return math.Log(cmplx.Abs(theta(n, complex(0, w))/theta(n, 0))) - math.Ln2/2
		}
		for range 40 {
			if e0, e1 := excess(w0), excess(w1); e0 != e1 {
				w0, w1 = w1, w1-e1*(w1-w0)/(e1-e0)
			}
		}
		l := bessel(t, n, corner)
		if !l.Real() || len(l.Terms) != n || l.Direct != 0 {
			t.Errorf("order %d: real %v, %d terms, direct %v", n, l.Real(), len(l.Terms), l.Direct)
		}
		worst := 0.0
		for _, f := range []float64{0, 0.01, 0.1, 0.2, 0.35, 0.7, 1.5} {
			want := theta(n, 0) / theta(n, complex(0, f/corner*w1))
			worst = max(worst, cmplx.Abs(l.Response(2*math.Pi*f)-want))
		}
		if !(worst <= 1e-13) {
			t.Errorf("order %d: response off the polynomial by %g", n, worst)
		}
		if got := cmplx.Abs(l.Response(2*math.Pi*corner)) * math.Sqrt2; !(math.Abs(got-1) <= 1e-12) {
			t.Errorf("order %d: |G| at the corner is %.15f of 1/sqrt 2", n, got)
		}
		if got := l.Corner(); !(relative(got, corner) <= 1e-12) {
			t.Errorf("order %d: corner %.15f, want %g", n, got, corner)
		}
		if got := l.StepFigures().GroupDelay * 2 * math.Pi * corner / w1; !(math.Abs(got-1) <= 1e-11) {
			t.Errorf("order %d: group delay %.13f, want 1", n, got)
		}
		t.Logf("order %d: worst response error %.1e, sum of residues %.1f", n, worst, size(l))
	}
}

// size is the sum that bounds rounding errors, in units of one ulp.
func size(l Line) float64 {
	sum := cmplx.Abs(l.Direct)
	for _, term := range l.Terms {
		sum += cmplx.Abs(term.Residue / cmplx.Pow(complex(-real(term.Pole), 0), complex(float64(term.Power), 0)))
	}
	return sum
}

// Poles against 40-digit values: testdata/bessel.txt, made by testdata/bessel.py with
// mpmath 1.3.0; and the residual of the polynomial at the poles before scaling, in
// 200-bit arithmetic. The four-digit values are from memory, of published tables.
func TestBesselPoles(t *testing.T) {
	file, err := os.Open("testdata/bessel.txt")
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	rows, worst := 0, 0.0
	for lines := bufio.NewScanner(file); lines.Scan(); {
		if strings.HasPrefix(lines.Text(), "#") {
			continue
		}
		var n int
		var kind string
		var re, im float64
		if _, err := fmt.Sscan(lines.Text(), &n, &kind, &re, &im); err != nil {
			t.Fatal(err)
		}
		rows++
		if kind == "corner" {
			if got := besselCorner(n); !(relative(got, re) <= 1e-15) {
				t.Errorf("order %d: corner %.17g, want %.17g", n, got, re)
			}
			continue
		}
		best := math.Inf(1)
		for _, term := range bessel(t, n, 1/(2*math.Pi)).Terms {
			best = min(best, cmplx.Abs(term.Pole-complex(re, im))/math.Hypot(re, im))
		}
		worst = max(worst, best)
		if !(best <= 2e-13) {
			t.Errorf("order %d: no pole within 2e-13 of %g%+gi, nearest %g", n, re, im, best)
		}
	}
	if rows != 8+36 {
		t.Errorf("%d rows read, want 44", rows)
	}
	t.Logf("worst pole error %.1e", worst)

	for n := 1; n <= 8; n++ {
		for _, p := range besselPoles(n) {
			if got, scale := besselResidual(n, p); !(got <= 2e-13*scale) {
				t.Errorf("order %d: |theta(%v)| is %g of |s theta'|", n, p, got/scale)
			}
		}
	}
	for _, c := range []struct {
		order int
		pole  complex128
	}{{2, -1.1016 + 0.6360i}, {3, -1.3227}, {4, -0.9952 + 1.2571i}, {5, -1.3808 + 0.7179i}, {6, -1.5715 + 0.3209i}, {7, -0.9099 + 1.8364i}, {8, -0.8929 + 1.9983i}} {
		found := false
		for _, term := range bessel(t, c.order, 1/(2*math.Pi)).Terms {
			found = found || cmplx.Abs(term.Pole-c.pole) <= 1e-4
		}
		if !found {
			t.Errorf("order %d: no pole at %v", c.order, c.pole)
		}
	}
}

// besselResidual returns |theta_n(p)| in 200-bit arithmetic, and |p theta_n'(p)|:
// their ratio is the relative error of a simple zero.
func besselResidual(n int, p complex128) (residual, scale float64) {
	const bits = 200
	num := func(v float64) *big.Float { return new(big.Float).SetPrec(bits).SetFloat64(v) }
	re, im := num(0), num(0)
	a, b := num(real(p)), num(imag(p))
	mul := func(x, y *big.Float) *big.Float { return num(0).Mul(x, y) }
	derivative := complex128(0)
	for k := n; k >= 0; k-- {
		c := new(big.Int).MulRange(int64(n-k)+1, int64(2*n-k)) // (2n-k)!/(n-k)!
		c.Div(c, new(big.Int).MulRange(1, int64(k)))
		c.Rsh(c, uint(n-k))
		coefficient := new(big.Float).SetPrec(bits).SetInt(c)
		re, im = num(0).Sub(mul(re, a), mul(im, b)), num(0).Add(mul(re, b), mul(im, a))
		re.Add(re, coefficient)
		if k > 0 {
			v, _ := coefficient.Float64()
			derivative = derivative*p + complex(float64(k)*v, 0)
		}
	}
	x, _ := re.Float64()
	y, _ := im.Float64()
	return math.Hypot(x, y), cmplx.Abs(p * derivative)
}

// Step responses of all orders against fourth-order Runge-Kutta integration of
// the differential equation theta(d/dt / w) u = theta(0), and the figures read
// off that trace.
func TestBesselStepByIntegration(t *testing.T) {
	for n := 1; n <= 8; n++ {
		l := bessel(t, n, 0.2)
		scale := 2 * math.Pi * 0.2 / besselCorner(n)
		a := besselCoefficients(n)
		derivative := func(v []float64) []float64 {
			d := make([]float64, n)
			copy(d, v[1:])
			d[n-1] = a[0]
			for k := range n {
				d[n-1] -= a[k] * v[k]
			}
			return d
		}
		v := make([]float64, n)
		dt := 0.001 // in units of 1/scale
		worst, top, t10, t90 := 0.0, 0.0, 0.0, 0.0
		for i := 1; i <= 12000; i++ {
			old := v[0]
			at := func(k []float64, f float64) []float64 {
				w := append([]float64(nil), v...)
				for j := range w {
					w[j] += f * k[j]
				}
				return w
			}
			k1 := derivative(v)
			k2 := derivative(at(k1, dt/2))
			k3 := derivative(at(k2, dt/2))
			k4 := derivative(at(k3, dt))
			for j := range v {
				v[j] += dt / 6 * (k1[j] + 2*k2[j] + 2*k3[j] + k4[j])
			}
			now := float64(i) * dt / scale
			worst = max(worst, cmplx.Abs(l.Step(now)-complex(v[0], 0)))
			top = max(top, v[0]-1)
			cross := func(level float64) float64 { return (float64(i-1) + (level-old)/(v[0]-old)) * dt / scale }
			if old < 0.1 && v[0] >= 0.1 {
				t10 = cross(0.1)
			}
			if old < 0.9 && v[0] >= 0.9 {
				t90 = cross(0.9)
			}
		}
		f := l.StepFigures()
		if !(worst <= 1e-10) || !(math.Abs(f.Overshoot-top) <= 1e-7) || !(math.Abs(f.TransitionTime-(t90-t10)) <= 1e-5) {
			t.Errorf("order %d: step off by %g; overshoot %.8f, integrated %.8f; transition %.7f, integrated %.7f", n, worst, f.Overshoot, top, f.TransitionTime, t90-t10)
		}
	}
}

// Settling against a fine scan of the step response, ringing lines included.
func TestSettlingAgainstAScan(t *testing.T) {
	for name, l := range zoo(t) {
		if name == "nearly still pole" || name == "high quality" {
			continue // too long for a scan; closed form below
		}
		if l.DC() == 0 {
			if f := l.StepFigures(); !math.IsInf(f.Settling01pc, 1) || !math.IsInf(l.Corner(), 1) {
				t.Errorf("%s: no steady gain, yet corner %g and figures %+v", name, l.Corner(), f)
			}
			continue
		}
		f := l.StepFigures()
		dc := l.DC()
		for _, c := range []struct{ level, got float64 }{{0.01, f.Settling1pc}, {0.001, f.Settling01pc}} {
			// Nothing over the level later on, and over it just before.
			const n = 20000
			span := c.got + 10*l.SlowestTime()
			for i := range n {
				at := c.got + (span-c.got)*math.Pow(float64(i)/n, 4)
				if off := cmplx.Abs(l.Step(at)/dc - 1); !(off <= c.level*(1+1e-9)) {
					t.Errorf("%s: settled to %g at %g, but %g at %g", name, c.level, c.got, off, at)
					break
				}
			}
			if c.got > 0 {
				if off := cmplx.Abs(l.Step(c.got*(1-1e-9))/dc - 1); !(off >= c.level*(1-1e-6)) {
					t.Errorf("%s: already %g just before settling to %g at %g", name, off, c.level, c.got)
				}
			}
		}
	}
	// A ringing pair: deviation e^{-at} |cos wt + (a/w) sin wt|; it last
	// exceeds the level within half a turn before a t = ln(1/level).
	a, w := 0.01, 2.0
	p := complex(-a, w)
	l := Line{Terms: []Term{{p, 1, complex(a*a+w*w, 0) / complex(0, 2*w)}, {cmplx.Conj(p), 1, complex(a*a+w*w, 0) / complex(0, -2*w)}}}
	f := l.StepFigures()
	if end := math.Log(1000) / a; !(f.Settling01pc <= end+0.01 && f.Settling01pc > end-math.Pi/w) {
		t.Errorf("ringing pair settles at %g, want just under %g", f.Settling01pc, end)
	}
	if want := math.Exp(-a * math.Pi / w); !(relative(f.Overshoot, want) <= 1e-12) {
		t.Errorf("ringing pair overshoots by %g, want %g", f.Overshoot, want)
	}
	if f := pole(t, 1e9).StepFigures(); !(relative(f.Settling01pc, 3e9*math.Ln10) <= 1e-12) {
		t.Errorf("slow pole settles at %g", f.Settling01pc)
	}
	// The sixth extremum, -e^{-6 pi a/w} at t = 6 pi/w, exceeds 0.1 % by a millionth
	// only, between two steps of the search: it still counts.
	w = 3.0
	a = -w / (6 * math.Pi) * math.Log(0.001*(1+1e-6))
	p = complex(-a, w)
	r := complex(a*a+w*w, 0) / complex(0, 2*w)
	l = Line{Terms: []Term{{p, 1, r}, {cmplx.Conj(p), 1, cmplx.Conj(r)}}}
	if got, want := l.StepFigures().Settling01pc*w, 6*math.Pi; !(got > want && got < want+0.01) {
		t.Errorf("sixth extremum: settled at phase %g, want just over %g", got, want)
	}
	for _, r := range []complex128{0.015, 0.015i} { // wherever in its swing the search ends
		sharp := Line{Direct: 1, Terms: []Term{{-1e-7 + 2i, 1, r}, {-1e-7 - 2i, 1, cmplx.Conj(r)}}}
		if f := sharp.StepFigures(); !math.IsInf(f.Settling01pc, 1) || !math.IsInf(f.Settling1pc, 1) {
			t.Errorf("a pole too sharp to search settles at %g and %g, want +Inf", f.Settling1pc, f.Settling01pc)
		}
	}
	if got := (Through().StepFigures()); got != (StepFigures{}) {
		t.Errorf("straight through: %+v, want all zero", got)
	}
}

func TestCorner(t *testing.T) {
	if got := pole(t, 3).Corner(); !(relative(got, 1/(6*math.Pi)) <= 1e-14) {
		t.Errorf("single pole: %g", got)
	}
	if got := Through().Corner(); !math.IsInf(got, 1) {
		t.Errorf("straight through: %g", got)
	}
	// A tail of -50 % halves the gain at high frequency: G = (1 + iz/2)/(1 + iz)
	// with z = wT, so |G|^2 = 1/2 at z^2 = 2.
	if got := tails(t, Tail{-0.5, 40}).Corner(); !(relative(got, math.Sqrt2/40/(2*math.Pi)) <= 1e-13) {
		t.Errorf("tail: %g, want sqrt 2/(2 pi T)", got)
	}
	if got := tails(t, Tail{-0.2, 40}).Corner(); !math.IsInf(got, 1) {
		t.Errorf("small tail: %g, want none", got)
	}
	// m equal poles: (1 + z^2)^m = 2.
	one := pole(t, 1)
	if got, want := cascade(t, one, one, one).Corner(), math.Sqrt(math.Cbrt(2)-1)/(2*math.Pi); !(relative(got, want) <= 1e-13) {
		t.Errorf("three poles: %g, want %g", got, want)
	}
	// A narrow dip far below the low-pass corner, against a fine scan.
	dip := Line{Direct: 1, Terms: []Term{{-0.01 + 2i, 1, -0.007}, {-0.01 - 2i, 1, -0.007}}}
	scan := 0.0
	for cmplx.Abs(dip.Response(scan))*math.Sqrt2 > cmplx.Abs(dip.DC()) {
		scan += 1e-6
	}
	if got := dip.Corner() * 2 * math.Pi; !(math.Abs(got-scan) <= 2e-6) || !(scan > 1.9 && scan < 2) {
		t.Errorf("dip: corner at %g rad/ns, by scan %g", got, scan)
	}
	// A pole off the real axis, nearer on the negative side.
	skew := Line{Terms: []Term{{-1 + 0.2i, 1, 1}}}
	if got := skew.Corner(); !(cmplx.Abs(skew.Response(-2*math.Pi*got))*math.Sqrt2/cmplx.Abs(skew.DC()) <= 1+1e-12) ||
		!(cmplx.Abs(skew.Response(2*math.Pi*got))*math.Sqrt2/cmplx.Abs(skew.DC()) > 1.01) {
		t.Errorf("complex pole: corner %g is not on the negative side", got)
	}
	if l := rackB(t); l.SlowestTime() != 30 || !(relative(l.FastestRate(), 2*math.Pi*0.2*math.Hypot(1.101601330592161701458178, 0.6360098247570344821262112)) <= 1e-13) {
		t.Errorf("rack B: slowest %g ns, fastest %g 1/ns", l.SlowestTime(), l.FastestRate())
	}
	if l := Through(); l.SlowestTime() != 0 || l.FastestRate() != 0 {
		t.Error("straight through has a pole")
	}
}

// The group delay is the slope of the phase, for every line; the pure delay is not in it.
func TestGroupDelay(t *testing.T) {
	for name, l := range zoo(t) {
		if l.DC() == 0 {
			continue // no phase at w = 0
		}
		l.Delay = 0
		step := 1e-4 / l.SlowestTime()
		if len(l.Terms) == 0 {
			step = 1
		}
		want := -cmplx.Phase(l.Response(step)/l.Response(-step)) / (2 * step)
		if got := l.groupDelay(); !(math.Abs(got-want) <= 1e-6*(math.Abs(want)+1e-3*l.SlowestTime())) {
			t.Errorf("%s: group delay %.10g, slope of the phase %.10g", name, got, want)
		}
	}
	one := pole(t, 3)
	if got := cascade(t, one, one, one).StepFigures().GroupDelay; !(relative(got, 9) <= 1e-14) {
		t.Errorf("three equal poles: group delay %g, want 9", got)
	}
}

func TestReal(t *testing.T) {
	lopsided := map[string]bool{"asymmetric": true, "high quality": true, "resonator": true, "resonance": true}
	for name, l := range zoo(t) {
		for _, term := range l.Terms { // constructors give conjugates to the bit
			paired := false
			for _, o := range l.Terms {
				paired = paired || o.Power == term.Power && o.Pole == cmplx.Conj(term.Pole) && o.Residue == cmplx.Conj(term.Residue)
			}
			if !paired && !lopsided[name] {
				t.Errorf("%s: no exact conjugate of %v", name, term)
			}
		}
		want := !lopsided[name]
		if l.Real() != want {
			t.Errorf("%s: real %v, want %v", name, l.Real(), want)
		}
		if !want {
			continue
		}
		for _, w := range []float64{0.1, 3} {
			if d := cmplx.Abs(l.Response(w) - cmplx.Conj(l.Response(-w))); !(d <= 1e-12) {
				t.Errorf("%s: G(-iw) is not the conjugate, off by %g", name, d)
			}
		}
	}
	d, err := Delay(2)
	l := must(t, d, err)
	if got, want := l.Response(0.3), cmplx.Exp(-0.6i); !(cmplx.Abs(got-want) <= 1e-15) {
		t.Errorf("delay: %v, want %v", got, want)
	}
}

func TestRefusals(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	refuse := func(what string, err error, words ...string) {
		t.Helper()
		if err == nil {
			t.Errorf("%s: accepted", what)
			return
		}
		for _, w := range append(words, "filter: ", "allowed") {
			if !strings.Contains(err.Error(), w) {
				t.Errorf("%s: %q lacks %q", what, err, w)
			}
		}
	}
	for _, v := range []float64{nan, inf, -inf, 0, -1, 1e-7, 1e13} {
		_, err := SinglePole(v)
		refuse(fmt.Sprint("single pole ", v), err, "ns")
		_, err = Tails([]Tail{{0.1, 3}, {0.1, v}})
		refuse(fmt.Sprint("tail time ", v), err, "tail 1")
	}
	for _, v := range []float64{nan, inf, -1e4, 1001} {
		_, err := Tails([]Tail{{v, 3}})
		refuse(fmt.Sprint("tail ", v), err, "amplitude")
	}
	_, err := Tails(make([]Tail, MaxTerms+1))
	refuse("too many tails", err)
	for _, v := range []float64{nan, inf, 0, -0.1, 1e-13, 1e7} {
		_, err := Bessel(2, v)
		refuse(fmt.Sprint("corner ", v), err, "GHz")
	}
	for _, n := range []int{-1, 0, 9, 1 << 40} {
		_, err := Bessel(n, 0.2)
		refuse(fmt.Sprint("order ", n), err, "1 to 8")
	}
	for _, v := range []float64{nan, inf, -1e-9, 1e13} {
		_, err := Delay(v)
		refuse(fmt.Sprint("delay ", v), err, "ns")
	}
	good := Term{-1, 1, 1}
	for what, l := range map[string]Line{
		"delay":          {Delay: -1},
		"direct":         {Direct: cmplx.NaN()},
		"undamped pole":  {Terms: []Term{good, {1i, 1, 1}}},
		"growing pole":   {Terms: []Term{{1e-9, 1, 1}}},
		"nan pole":       {Terms: []Term{{complex(-1, nan), 1, 1}}},
		"endless pole":   {Terms: []Term{{complex(-inf, 0), 1, 1}}},
		"power 0":        {Terms: []Term{{-1, 0, 1}}},
		"power too high": {Terms: []Term{{-1, MaxPower + 1, 1}}},
		"residue":        {Terms: []Term{{-1, 1, cmplx.Inf()}}},
		"terms":          {Terms: make([]Term, MaxTerms+1)},
	} {
		refuse(what, l.Check())
		_, err := Cascade(Through(), l)
		refuse(what+" in a cascade", err, "section 1")
	}
	for name, l := range zoo(t) {
		if err := l.Check(); err != nil {
			t.Errorf("%s: %v", name, err)
		}
	}
	far, _ := Delay(9e11)
	_, err = Cascade(far, far)
	refuse("delays", err)
}
