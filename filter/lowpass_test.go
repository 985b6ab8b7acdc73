package filter

import (
	"bufio"
	"fmt"
	"math"
	"math/cmplx"
	"os"
	"strings"
	"testing"
)

// rows calls f with the fields of every line of a file in testdata that is no comment.
func rows(t *testing.T, name string, f func(fields []string)) {
	t.Helper()
	file, err := os.Open("testdata/" + name)
	if err != nil {
		t.Fatal(err)
	}
	defer file.Close()
	lines := bufio.NewScanner(file)
	for lines.Scan() {
		if !strings.HasPrefix(lines.Text(), "#") {
			f(strings.Fields(lines.Text()))
		}
	}
	if err := lines.Err(); err != nil {
		t.Fatal(err)
	}
}

// numbers reads fields as numbers.
func numbers(t *testing.T, fields ...string) []float64 {
	t.Helper()
	var all []float64
	for _, s := range fields {
		var v float64
		if _, err := fmt.Sscan(s, &v); err != nil {
			t.Fatalf("%q: %v", s, err)
		}
		all = append(all, v)
	}
	return all
}

var lowPasses = map[string]func(int, float64) (Line, error){
	"butterworth": Butterworth, "bessel": Bessel, "damped": CriticallyDamped, "gaussian": GaussianLike,
}

// CALC (independent computation of a published definition), 10-90 %
// transition (IEEE Std 181) times corner, and overshoot: Butterworth 2 and 4.
func TestButterworthFromOutside(t *testing.T) {
	for _, c := range []struct {
		order                 int
		transition, overshoot float64
	}{{2, 0.34187, 0.0432}, {4, 0.38713, 0.1083}} {
		f := line(t)(Butterworth(c.order, 0.35)).StepFigures()
		if got := f.TransitionTime * 0.35; !(math.Abs(got-c.transition) <= 5e-6) {
			t.Errorf("order %d: transition time x corner %.7f, want %g", c.order, got, c.transition)
		}
		if !(math.Abs(f.Overshoot-c.overshoot) <= 5e-5) {
			t.Errorf("order %d: overshoot %.6f, want %g", c.order, f.Overshoot, c.overshoot)
		}
	}
}

// The magnitudes that define the families, at frequencies of either sign; unit
// gain; the -3.0103 dB corner, as a gain and as Corner finds it.
func TestLowPassMagnitude(t *testing.T) {
	const corner = 0.2
	for n := 1; n <= 8; n++ {
		// y_n by Newton steps on e_n(y) = 2, e_n' = e_{n-1}.
		e := func(n int, y float64) float64 {
			sum, term := 0.0, 1.0
			for k := 0; k <= n; k++ {
				sum += term
				term *= y / float64(k+1)
			}
			return sum
		}
		y := 0.7
		for range 30 {
			y -= (e(n, y) - 2) / e(n-1, y)
		}
		for family, square := range map[string]func(x float64) float64{ // 1/|G|^2 at f = x corner
			"butterworth": func(x float64) float64 { return 1 + math.Pow(x, float64(2*n)) },
			"damped":      func(x float64) float64 { return math.Pow(1+x*x*(math.Pow(2, 1/float64(n))-1), float64(n)) },
			"gaussian":    func(x float64) float64 { return e(n, y*x*x) },
		} {
			l := line(t)(lowPasses[family](n, corner))
			if err := l.Check(); err != nil || !l.Real() || l.Direct != 0 || l.Delay != 0 {
				t.Errorf("%s %d: %v, %v", family, n, err, l)
			}
			worst := 0.0
			for _, x := range []float64{0, 0.01, 0.3, 0.7, 1, 1.3, 2, 5, 30} {
				for _, sign := range []float64{1, -1} {
					got := cmplx.Abs(l.Response(sign * 2 * math.Pi * corner * x))
					worst = max(worst, math.Abs(got-1/math.Sqrt(square(x))))
				}
			}
			if !(worst <= 2e-14) {
				t.Errorf("%s %d: |G| off the definition by %g", family, n, worst)
			}
			if d := cmplx.Abs(l.DC() - 1); !(d <= 2e-14) {
				t.Errorf("%s %d: DC %v", family, n, l.DC())
			}
			if dB := 20 * math.Log10(cmplx.Abs(l.Response(2*math.Pi*corner))); !(math.Abs(dB+3.0103) <= 1e-6) {
				t.Errorf("%s %d: %.6f dB at the corner", family, n, dB)
			}
			if got := l.Corner(); !(relative(got, corner) <= 1e-13) {
				t.Errorf("%s %d: corner %.15f", family, n, got)
			}
			t.Logf("%s %d: |G| off by %.1e, sum of terms %.1f", family, n, worst, size(l))
		}
	}
}

// Order 1 of every family is the single pole.
func TestFirstOrderIsOnePole(t *testing.T) {
	want := pole(t, 1/(2*math.Pi*0.2)).Terms[0]
	for family, f := range lowPasses {
		l := line(t)(f(1, 0.2))
		if len(l.Terms) != 1 || !(cmplx.Abs(l.Terms[0].Pole-want.Pole) <= 1e-15) || !(cmplx.Abs(l.Terms[0].Residue-want.Residue) <= 1e-15) {
			t.Errorf("%s 1: %v, want %v", family, l.Terms, want)
		}
	}
}

// Poles, transition times and overshoots of Butterworth and Gaussian-like filters, and
// the latter's distance from the Gaussian, against 40-digit values: testdata/lowpass.txt,
// made by testdata/lowpass.py with mpmath 1.2.1.
func TestLowPassFiguresFrom40Digits(t *testing.T) {
	const corner = 1 / (2 * math.Pi)
	seen, worst := 0, 0.0
	sigma := math.Sqrt(math.Ln2)
	rows(t, "lowpass.txt", func(s []string) {
		v := numbers(t, s[1], s[3], s[4])
		n, want := int(v[0]), v[1]
		l := line(t)(lowPasses[s[0]](n, corner))
		name := s[0] + " " + s[1] + " " + s[2]
		seen++
		check := func(got, tol float64) {
			t.Helper()
			if !(math.Abs(got-want) <= tol) {
				t.Errorf("%s: %.15g, want %.15g", name, got, want)
			}
		}
		switch s[2] {
		case "pole":
			best := math.Inf(1)
			for _, term := range l.Terms {
				best = min(best, cmplx.Abs(term.Pole-complex(v[1], v[2]))/math.Hypot(v[1], v[2]))
			}
			worst = max(worst, best)
			if !(best <= 1e-13) {
				t.Errorf("%s: none within 1e-13 of %g%+gi, nearest %g", name, v[1], v[2], best)
			}
		case "transition":
			check(l.StepFigures().TransitionTime*corner, 1e-12)
		case "overshoot":
			check(l.StepFigures().Overshoot, 1e-13)
		case "gain":
			check(furthest(20, func(w float64) float64 {
				return cmplx.Abs(l.Response(w)) - math.Exp(-math.Ln2*w*w/2)
			}), 1e-8)
		case "step":
			mid := crossing(0, 20, func(t float64) bool { return real(l.Step(t)) >= 0.5 })
			check(furthest(20, func(at float64) float64 {
				return real(l.Step(at)) - math.Erfc(-(at-mid)/(sigma*math.Sqrt2))/2
			}), 1e-8)
		default:
			t.Errorf("unknown row %v", s)
		}
	})
	if seen != 2*36+2*2*8+2*8 {
		t.Errorf("%d rows read", seen)
	}
	t.Logf("worst pole error %.1e", worst)
}

// furthest returns the largest |f| over 0..end by a scan whose error is second
// order in its step of 2e-4.
func furthest(end float64, f func(float64) float64) float64 {
	far := 0.0
	for i := range int(end / 2e-4) {
		far = max(far, math.Abs(f(float64(i)*2e-4)))
	}
	return far
}

// The table in GaussianLike's documentation is what the filters do, its last column
// but one above the Gaussian's 0.339624 (CALC) and nearer with every order
// from 4 on.
func TestGaussianTable(t *testing.T) {
	source, err := os.ReadFile("gaussian.go")
	if err != nil {
		t.Fatal(err)
	}
	table := map[string][]string{}
	for _, l := range strings.Split(string(source), "\n") {
		if s := strings.Fields(strings.TrimPrefix(l, "//")); len(s) >= 5 && len(s[0]) == 1 && s[0] >= "1" && s[0] <= "8" {
			table[s[0]] = s
		}
	}
	rows(t, "lowpass.txt", func(s []string) {
		if s[0] != "gaussian" || s[2] == "pole" {
			return
		}
		column, format, scale := 0, "%.4f", 1.0
		switch s[2] {
		case "gain":
			column = 1
		case "step":
			column = 2
		case "transition":
			column, format = 3, "%.5f"
		case "overshoot":
			column, format, scale = 4, "%.3f", 100
		}
		want := fmt.Sprintf(format, numbers(t, s[3])[0]*scale)
		if want == "0.000" && s[1] == "1" {
			want = "0"
		}
		if row := table[s[1]]; row == nil || row[column] != want {
			t.Errorf("order %s, %s: table %v, want %s", s[1], s[2], table[s[1]], want)
		}
	})
	limit := 2 * 1.2815515655446004 * math.Sqrt(math.Ln2) / (2 * math.Pi) // quantile of 90 %
	if !(math.Abs(limit-0.339624) <= 5e-7) {
		t.Errorf("Gaussian: %.7f, want 0.339624", limit)
	}
	before := math.Inf(1)
	for n := 4; n <= 8; n++ {
		got := line(t)(GaussianLike(n, 1)).StepFigures().TransitionTime
		if !(got > limit && got < before) {
			t.Errorf("order %d: transition %.6f, order before %.6f, limit %.6f", n, got, before, limit)
		}
		before = got
	}
	if !(before-limit <= 0.0021) {
		t.Errorf("order 8: transition %.6f, more than 0.0021 above %.6f", before, limit)
	}
}

// Step responses against a general reference library: testdata/step.txt, made by
// testdata/step.py with scipy 1.10.1 (Debian python3-scipy). Its matrix exponentials of
// companion matrices carry some 1e-12.
func TestStepFromReferenceLibrary(t *testing.T) {
	const corner = 1 / (2 * math.Pi)
	seen, worst := map[string]int{}, 0.0
	rows(t, "step.txt", func(s []string) {
		v := numbers(t, s[1], s[2], s[3])
		var l Line
		switch s[0] {
		case "high-pass":
			l = line(t)(HighPass(corner))
		case "allpass":
			l = line(t)(Allpass(1))
		default:
			l = line(t)(lowPasses[s[0]](int(v[0]), corner))
		}
		seen[s[0]]++
		d := cmplx.Abs(l.Step(v[1]) - complex(v[2], 0))
		worst = max(worst, d)
		if !(d <= 1e-11) {
			t.Errorf("%s %s at %g: %v, want %.15g", s[0], s[1], v[1], l.Step(v[1]), v[2])
		}
	})
	for name, want := range map[string]int{"butterworth": 200, "bessel": 200, "damped": 200, "high-pass": 25, "allpass": 25} {
		if seen[name] != want {
			t.Errorf("%s: %d rows, want %d", name, seen[name], want)
		}
	}
	t.Logf("worst %.1e", worst)
}

// n equal poles: one term of power n, the cascade of n single poles, whose step is
// the gamma distribution and never overshoots.
func TestCriticallyDamped(t *testing.T) {
	for n := 1; n <= 8; n++ {
		l := line(t)(CriticallyDamped(n, 0.2))
		tau := math.Sqrt(math.Pow(2, 1/float64(n))-1) / (2 * math.Pi * 0.2)
		var sections []Line
		for range n {
			sections = append(sections, pole(t, tau))
		}
		same := cascade(t, sections...)
		if len(l.Terms) != 1 || l.Terms[0].Power != n {
			t.Fatalf("order %d: %v", n, l.Terms)
		}
		for _, at := range []float64{1e-3, 0.4, 2, 9} {
			if d := cmplx.Abs(l.Step(at) - same.Step(at)); !(d <= 1e-14) {
				t.Errorf("order %d at %g: off the cascade by %g", n, at, d)
			}
		}
		f := l.StepFigures()
		if !(f.Overshoot <= 1e-15) || !(relative(f.GroupDelay, float64(n)*tau) <= 1e-13) {
			t.Errorf("order %d: %+v, want no overshoot and a delay of %g", n, f, float64(n)*tau)
		}
	}
}

func TestFamilyRefusals(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	refuse := func(what string, l Line, err error, words ...string) {
		t.Helper()
		if err == nil || !l.zero() {
			t.Errorf("%s: accepted", what)
			return
		}
		for _, w := range append(words, "filter: ", "allowed") {
			if !strings.Contains(err.Error(), w) {
				t.Errorf("%s: %q lacks %q", what, err, w)
			}
		}
	}
	for family, f := range lowPasses {
		for _, n := range []int{-1, 0, 9, 1 << 40} {
			l, err := f(n, 0.2)
			refuse(fmt.Sprint(family, " ", n), l, err, "order", "1 to 8")
		}
		for _, c := range []float64{nan, inf, -inf, 0, -0.1, 1e-13, 1e7} {
			l, err := f(3, c)
			refuse(fmt.Sprint(family, " ", c), l, err, "corner", "GHz")
		}
		for _, c := range []float64{1e-12, 1e6} {
			for n := 1; n <= 8; n++ {
				l := line(t)(f(n, c))
				if err := l.Check(); err != nil || !(relative(l.Corner(), c) <= 1e-12) {
					t.Errorf("%s %d at the end of its range: %v, corner %g", family, n, err, l.Corner())
				}
			}
		}
	}
	for _, v := range []float64{nan, inf, -inf, 0, -1, 1e-7, 1e13} {
		l, err := ACCoupling(v)
		refuse(fmt.Sprint("AC coupling ", v), l, err, "ns")
		l, err = Allpass(v)
		refuse(fmt.Sprint("allpass ", v), l, err, "ns")
		l, err = FractionalDelay(v)
		refuse(fmt.Sprint("fractional delay ", v), l, err, "ns")
	}
	for _, v := range []float64{nan, inf, -inf, 1e7, -1e7} {
		l, err := Resonator(v, 0.1)
		refuse(fmt.Sprint("resonator offset ", v), l, err, "offset", "GHz")
	}
	for _, v := range []float64{nan, inf, 0, -0.1, 1e-13, 1e7} {
		l, err := HighPass(v)
		refuse(fmt.Sprint("high-pass ", v), l, err, "GHz")
		l, err = Resonance(0.1, v, 0.2)
		refuse(fmt.Sprint("half width ", v), l, err, "half width", "GHz")
	}
	for _, v := range []complex128{cmplx.NaN(), cmplx.Inf(), 1001, -800 - 800i} {
		l, err := Resonance(0.1, 0.1, v)
		refuse(fmt.Sprint("depth ", v), l, err, "depth")
	}
	l, err := line(t)(ACCoupling(3)).UnitGain()
	refuse("unit gain", l, err, "steady gain")
	l, err = Line{Delay: -1}.UnitGain()
	refuse("unit gain of no line", l, err, "delay")
	l, err = Line{Terms: []Term{{-1e300, 1, 1e300}, {-2e300, 1, -2e300 + 2e290}}}.UnitGain()
	refuse("unit gain out of range", l, err, "too small", "residue")
}
