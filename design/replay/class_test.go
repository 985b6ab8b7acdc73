package replay

import (
	"context"
	"math"
	"strings"
	"testing"
)

// segment is a part of a composite pulse, in degrees.
type segment struct{ angle, phase float64 }

// composite plays segments at the full Rabi frequency pi/30 rad/ns, ten samples of 1 ns for 60 degrees, through a line
// that lets everything through.
func composite(segments []segment) *Model {
	var x []complex128
	for _, s := range segments {
		for range int(math.Round(s.angle / 6)) {
			x = append(x, complex(math.Cos(s.phase*math.Pi/180), math.Sin(s.phase*math.Pi/180)))
		}
	}
	m := spinModel(1, rotation(math.Pi, 0), x)
	m.Channels[0].FullScale = math.Pi / 30
	return m
}

var (
	bb1Phase = math.Acos(-0.25) * 180 / math.Pi // acos(-theta/4 pi), theta = pi

	plain       = []segment{{180, 0}}
	corpse      = []segment{{420, 0}, {300, 180}, {60, 0}}
	shortCorpse = []segment{{60, 180}, {300, 0}, {60, 180}}
	scrofulous  = []segment{{180, 60}, {180, -60}, {180, 60}}
	bb1         = []segment{{180, bb1Phase}, {360, 3 * bb1Phase}, {180, bb1Phase}, {180, 0}}
)

// Leading coefficients of the infidelity of composite pi pulses, infidelity = coefficient x error^power: angles
// from Cummins, Llewellyn, Jones 2003, Phys. Rev. A 67, 042308 and Wimperis 1994, J. Magn. Reson. A 109, 221 (from memory), coefficients by
// independent computation in 40 digits, not this project's code.
func TestCompositePulses(t *testing.T) {
	for _, c := range []struct {
		name      string
		segments  []segment
		amplitude float64
		power     float64
		size      float64 // where the leading term rules, and the digits that it then has
		digits    float64
		detuning  float64
		power2    float64
		size2     float64
		digits2   float64
	}{
		{"plain", plain, math.Pi * math.Pi / 6, 2, 1e-4, 1e-6, 2. / 3, 2, 1e-4, 1e-6},
		{"CORPSE", corpse, math.Pi * math.Pi / 6, 2, 1e-4, 1e-6, 0.0043338, 4, 1e-4, 5e-5},
		{"short CORPSE", shortCorpse, math.Pi * math.Pi / 6, 2, 1e-4, 1e-6, 1.8181, 4, 1e-3, 1e-4},
		{"SCROFULOUS", scrofulous, 3.0440, 4, 1e-3, 1e-4, 2.6667, 2, 1e-4, 1e-4},
		{"BB1", bb1, 6.2590, 6, 5e-3, 2e-3, 2. / 3, 2, 1e-4, 1e-6},
	} {
		e := newTestEngine(t, composite(c.segments))
		found := make([]float64, 5)
		rate := e.m.Channels[0].FullScale
		z, a := newStatic(halfZ, 2), e.newAmplitude(nil, "")
		if err := e.infidelities(context.Background(), []gate{{}, {a, c.size}, {a, -c.size}, {z, c.size2 * rate}, {z, -c.size2 * rate}}, found); err != nil {
			t.Fatal(err)
		}
		if !(found[0] <= 1e-26) {
			t.Errorf("%s: infidelity %.3g without error", c.name, found[0])
		}
		got := (found[1] + found[2]) / 2 / math.Pow(c.size, c.power)
		if !(math.Abs(got/c.amplitude-1) <= c.digits) {
			t.Errorf("%s: amplitude coefficient %.6g, want %.6g", c.name, got, c.amplitude)
		}
		got = (found[3] + found[4]) / 2 / math.Pow(c.size2, c.power2)
		if !(math.Abs(got/c.detuning-1) <= c.digits2) {
			t.Errorf("%s: detuning coefficient %.6g, want %.6g", c.name, got, c.detuning)
		}
	}
}

func judged(t testing.TB, m *Model, threshold float64) map[string]Error {
	t.Helper()
	list, err := m.Curves(context.Background(), threshold, nil)
	if err != nil {
		t.Fatal(err)
	}
	byName := map[string]Error{}
	for _, e := range list {
		byName[e.Name] = e
	}
	return byName
}

// What survives: a square pi pulse turns Z and Y once over half a circle, of which 2/pi is left, and leaves X and its own
// amplitude error whole. Frame potential of a square pi pulse 2 + 8/pi^2 (closed form), so that with the equal form
// 3 s^2 + 1 = 2 + 8/pi^2. Short CORPSE cancels detuning, and so does CORPSE, to first order (Cummins, Llewellyn, Jones 2003).
func TestSusceptibility(t *testing.T) {
	m := composite(plain)
	m.Errors = []Class{{Name: "any static error", Kind: "any", Held: true}}
	got := judged(t, m, 1e-4)
	for name, want := range map[string]float64{
		"X": 1, "Y": 2 / math.Pi, "Z": 2 / math.Pi, "detuning": 2 / math.Pi, "amplitude": 1,
		"any static error": math.Sqrt((1 + 8/(math.Pi*math.Pi)) / 3),
	} {
		if !(math.Abs(got[name].Susceptibility-want) <= 1e-11) {
			t.Errorf("square pulse, %s: susceptibility off by %.2g", name, got[name].Susceptibility-want)
		}
	}
	any := got["any static error"]
	if any.WorstDirection != "1.00 X" || !(math.Abs(any.WorstSusceptibility-1) <= 1e-11) {
		t.Errorf("worst direction %q, %.12g", any.WorstDirection, any.WorstSusceptibility)
	}
	for name, segments := range map[string][]segment{"CORPSE": corpse, "short CORPSE": shortCorpse} {
		e := judged(t, composite(segments), 1e-4)
		if !(e["detuning"].Susceptibility <= 1e-11) {
			t.Errorf("%s: susceptibility to detuning %.3g", name, e["detuning"].Susceptibility)
		}
	}
	if e := judged(t, composite(bb1), 1e-4); !(e["amplitude"].Susceptibility <= 1e-11) {
		t.Errorf("BB1: susceptibility to amplitude %.3g", e["amplitude"].Susceptibility)
	}
}

// Margins of the square pi pulse in closed form: an amplitude error eps leaves 1 - F = (2/3) sin^2(pi eps/2), an X error of rate d the same
// with eps = d/O, and detuning is broken where the Rabi formula says.
func TestMargins(t *testing.T) {
	m := composite(plain)
	const threshold = 1e-4
	m.Errors = []Class{{Name: "any", Kind: "any"}}
	got := judged(t, m, threshold)
	eps := 2 / math.Pi * math.Asin(math.Sqrt(1.5*threshold))
	rate := m.Channels[0].FullScale / perMHz
	check := func(name string, low, high float64) {
		t.Helper()
		e := got[name]
		if !(math.Abs(e.Low-low) <= 1e-7*math.Abs(low)) || !(math.Abs(e.High-high) <= 1e-7*high) {
			t.Errorf("%s: margins %.9g and %.9g, want %.9g and %.9g", name, e.Low, e.High, low, high)
		}
	}
	check("amplitude", -100*eps, 100*eps)
	check("X", -rate*eps, rate*eps)
	check("any", -rate*eps, rate*eps)
	// Detuning f = D/O: Tr(X U)/2 = sin(pi w/2)/w with w^2 = 1 + f^2; average infidelity (2/3)(1 - that^2). By bisection.
	lo, hi := 0.0, 0.1
	for range 60 {
		f := (lo + hi) / 2
		w := math.Hypot(1, f)
		s := math.Sin(math.Pi*w/2) / w
		if 2./3*(1-s*s) > threshold {
			hi = f
		} else {
			lo = f
		}
	}
	check("detuning", -rate*lo, rate*lo)
	check("Z", -rate*lo, rate*lo)
	// Broken without any error, and never broken.
	m.Target = rotation(1, 0)
	if e := judged(t, m, threshold)["X"]; e.Low != 0 || e.High != 0 {
		t.Errorf("margins %g, %g of a wrong gate", e.Low, e.High)
	}
	m.Target = rotation(math.Pi, 0)
	if e := judged(t, m, 1)["X"]; !math.IsInf(e.Low, -1) || !math.IsInf(e.High, 1) {
		t.Errorf("margins %g, %g where nothing is required", e.Low, e.High)
	}
	if e := judged(t, m, 1)["any"]; !math.IsInf(e.Low, -1) || !math.IsInf(e.High, 1) {
		t.Errorf("margins %g, %g against any error where nothing is required", e.Low, e.High)
	}
	for _, e := range got {
		for _, p := range e.Curve {
			if e.Name == "amplitude" {
				want := 2. / 3 * math.Pow(math.Sin(math.Pi/2*p.Value/100), 2)
				if !(math.Abs(p.Infidelity-want) <= 1e-12) {
					t.Errorf("amplitude curve at %g %%: %.12g, want %.12g", p.Value, p.Infidelity, want)
				}
			}
			if e.Name == "any" && p.Value < 0 {
				t.Errorf("a negative size of any error")
			}
		}
		if len(e.Curve) < 21 {
			t.Errorf("%s: %d points", e.Name, len(e.Curve))
		}
	}
}

// A drive a thousand times slower with samples a thousand times longer is the same gate, so its margins are a thousandth of the others'; and neither they nor
// the tables reach far beyond what such a drive can feel.
func TestSlowDrive(t *testing.T) {
	const threshold, slower = 1e-4, 1000
	fast := composite(plain)
	fast.Errors = []Class{{Name: "any", Kind: "any"}}
	m := composite(plain)
	m.Errors = fast.Errors
	m.SamplePeriod *= slower
	m.Channels[0].FullScale /= slower
	full := m.Channels[0].FullScale / perMHz
	want, got := judged(t, fast, threshold), judged(t, m, threshold)
	for name, w := range want {
		g, scale := got[name], 1.0
		if w.Unit == "MHz" {
			scale = slower
		}
		if !(math.Abs(g.High*scale/w.High-1) <= 1e-6) || !(math.Abs(g.Low*scale/w.Low-1) <= 1e-6) || !(math.Abs(g.Susceptibility-w.Susceptibility) <= 1e-9) {
			t.Errorf("%s: margins %g and %g, want those of %g and %g over %g", name, g.Low, g.High, w.Low, w.High, scale)
		}
		if last := g.Curve[len(g.Curve)-1].Value; w.Unit == "MHz" && !(last >= 1.5*g.High && last <= 5*g.High) {
			t.Errorf("%s: withstands %g MHz, and the curve ends at %g", name, g.High, last)
		}
	}
	for name, e := range judged(t, m, 1) { // nothing is required, so the whole range is searched and drawn
		end := searchEnd
		if e.Unit == "MHz" {
			end = searchScale * full
		}
		if last := e.Curve[len(e.Curve)-1].Value; !math.IsInf(e.High, 1) || !(math.Abs(last/end-1) <= 1e-12) {
			t.Errorf("%s: margin %g, the curve ends at %g, want %g", name, e.High, last, end)
		}
	}
	// A margin that is required is looked for wherever it lies.
	for _, c := range []struct{ required, end float64 }{{full, 2 * full}, {7 * full, 7 * full}, {80, searchEnd}} {
		list := []Margin{{Error: "X", Size: c.required * perMHz}, {Error: "amplitude", Size: 0.4, Share: true}, {Error: "skew", Size: 0.3, Angle: true}}
		if end := m.farthest(list); !(math.Abs(end/c.end-1) <= 1e-12) {
			t.Errorf("with %g MHz required margins are searched up to %g, want %g", c.required, end, c.end)
		}
	}
	m.Target = rotation(1, 0)
	e := judged(t, m, threshold)["X"]
	if last := e.Curve[len(e.Curve)-1].Value; e.High != 0 || !(math.Abs(last/(0.2*full)-1) <= 1e-12) {
		t.Errorf("a wrong gate: margin %g, the curve ends at %g, want %g", e.High, last, 0.2*full)
	}
	b, err := newTestEngine(t, m).bringUp(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	for i, p := range b.Detuning {
		if want := full / 2 * float64(i-20) / 20; !(math.Abs(p.Value-want) <= 1e-12*full) {
			t.Errorf("detuning %d of the table is %g MHz, want %g", i, p.Value, want)
		}
	}
}

// The first of several crossings: near a full turn the infidelity of a pulse returns to nothing.
func TestFirstCrossing(t *testing.T) {
	x := make([]complex128, 200) // 200 ns of nothing, the target being nothing: X of 5 MHz turns once
	m := spinModel(1, []complex128{1, 0, 0, 1}, x)
	e := judged(t, m, 1e-2)["X"]
	want := 2 * math.Asin(math.Sqrt(1.5e-2)) / 200 / perMHz // (2/3) sin^2(angle/2) = 1e-2
	if !(math.Abs(e.High-want) <= 1e-7*want) {
		t.Errorf("margin %.9g, want %.9g", e.High, want)
	}
	if s := e.Susceptibility; !(math.Abs(s-1) <= 1e-11) {
		t.Errorf("susceptibility %.12g of doing nothing", s)
	}
	// Held again from 3 to 7 MHz: a stride that is too long does not see the first crossing.
	e = judged(t, m, 0.6)["X"]
	want = 2 * math.Asin(math.Sqrt(0.9)) / 200 / perMHz
	if !(math.Abs(e.High-want) <= 1e-7*want) {
		t.Errorf("margin %.9g, want %.9g", e.High, want)
	}
	if a := judged(t, m, 1e-2)["amplitude"]; a.Susceptibility != 0 || !math.IsInf(a.High, 1) {
		t.Errorf("amplitude error of silence: %g, margin %g", a.Susceptibility, a.High)
	}
}

// Curves of another model over the same values.
func TestCurvesAlike(t *testing.T) {
	m := composite(plain)
	first := judged(t, m, 1e-4)
	rival := m.WithSamples(40, composite(plain).Channels[0].Samples)
	list, err := rival.Curves(context.Background(), 1e-4, []Error{first["X"], first["amplitude"]})
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range list {
		want := first[e.Name].Curve
		if e.Name != "X" && e.Name != "amplitude" {
			continue
		}
		if len(e.Curve) != len(want) {
			t.Fatalf("%s: %d points, want %d", e.Name, len(e.Curve), len(want))
		}
		for i, p := range e.Curve {
			if p.Value != want[i].Value {
				t.Errorf("%s: value %g, want %g", e.Name, p.Value, want[i].Value)
			}
		}
	}
}

// A basis of static errors is orthogonal, traceless, Hermitian and of the strength of a spin's Z/2.
func TestBasis(t *testing.T) {
	for _, n := range []int{2, 3, 4, 5} {
		ops, names := basis(n)
		if len(ops) != n*n-1 || len(names) != n*n-1 {
			t.Fatalf("%d levels: %d operators", n, len(ops))
		}
		for i, a := range ops {
			if what := notHermitian(a, n); what != "" {
				t.Errorf("%d levels, %s: %s", n, names[i], what)
			}
			if tr := inner(a, func() []complex128 { one := make([]complex128, n*n); setIdentity(one, n); return one }()); !(math.Abs(tr) <= 1e-14) {
				t.Errorf("%d levels, %s: trace %g", n, names[i], tr)
			}
			for j, b := range ops {
				want := 0.0
				if i == j {
					want = float64(n) / 4
				}
				if got := inner(a, b); !(math.Abs(got-want) <= 1e-14) {
					t.Errorf("%d levels: %s . %s = %g, want %g", n, names[i], names[j], got, want)
				}
			}
		}
	}
	if ops, names := basis(2); names[0] != "X" || names[1] != "Y" || names[2] != "Z" || distance(ops[1], halfY) != 0 {
		t.Errorf("a spin's basis is %v", names)
	}
}

func TestWords(t *testing.T) {
	names := []string{"X", "Y", "Z"}
	for _, c := range []struct {
		r    []float64
		want string
	}{
		{[]float64{0.83, 0.41, 0}, "0.83 X + 0.41 Y"},
		{[]float64{-0.8, 0.6, 0.001}, "0.80 X - 0.60 Y"},
		{[]float64{0.1, 0, -0.99}, "-0.10 X + 0.99 Z"},
	} {
		if got := words(c.r, names); got != c.want {
			t.Errorf("%q, want %q", got, c.want)
		}
	}
	// The six largest, in the order of the class.
	if got, want := words([]float64{.1, -.5, .2, .004, .3, .4, .35, .6}, strings.Split("abcdefgh", "")), "-0.50 b + 0.20 c + 0.30 e + 0.40 f + 0.35 g + 0.60 h + ..."; got != want {
		t.Errorf("%q, want %q", got, want)
	}
	if got := words([]float64{.4, .4, .4, .4, .4, .4, .4}, strings.Split("abcdefg", "")); !strings.HasSuffix(got, " + ...") {
		t.Errorf("a long direction reads %q", got)
	}
}

// Two channels that share the drive of a square pi pulse: together they are the one channel, and an error of one of them alone counts
// half, of which all survives.
func TestTwoChannels(t *testing.T) {
	m := composite(plain)
	const threshold = 1e-4
	half := make([]complex128, m.Samples)
	for k, x := range m.Channels[0].Samples {
		half[k] = x / 2
	}
	second := m.Channels[0]
	second.Name = "second"
	m.Channels = append([]Channel{m.Channels[0]}, second)
	m.Channels[0].Samples, m.Channels[1].Samples = half, half
	m.Errors = []Class{{Name: "second only", Kind: "amplitude", Channels: []string{"second"}}}
	got := judged(t, m, threshold)
	eps := 200 / math.Pi * math.Asin(math.Sqrt(1.5*threshold))
	for name, want := range map[string]float64{"amplitude": eps, "second only": 2 * eps} {
		e := got[name]
		if !(math.Abs(e.Susceptibility-1) <= 1e-11) || !(math.Abs(e.High/want-1) <= 1e-7) {
			t.Errorf("%s: susceptibility %.12g, margin %.9g, want 1 and %.9g", name, e.Susceptibility, e.High, want)
		}
	}
}

// A worst direction between the axes: the spin precesses about (1, 1, 1), five whole turns, and an error along it survives whole, one
// along X to a third in its rotation.
func TestWorstBetweenAxes(t *testing.T) {
	m := spinModel(1, []complex128{1, 0, 0, 1}, make([]complex128, 200))
	rate := complex(2*math.Pi*5/200/math.Sqrt(3), 0)
	for i := range m.Static {
		m.Static[i] = rate * (halfX[i] + halfY[i] + halfZ[i])
	}
	m.Errors = []Class{{Name: "any", Kind: "any"}}
	got := judged(t, m, 1e-3)
	want := 2 * math.Asin(math.Sqrt(1.5e-3)) / 200 / perMHz
	any := got["any"]
	if !(math.Abs(any.High-want) <= 1e-7*want) || any.Low != -any.High || !(got["X"].High > 1.5*want) {
		t.Errorf("margin %.9g, want %.9g, along X %.9g", any.High, want, got["X"].High)
	}
	if any.WorstDirection != "0.58 X + 0.58 Y + 0.58 Z" || !(math.Abs(any.WorstSusceptibility-1) <= 1e-11) || !(math.Abs(any.Susceptibility-1/math.Sqrt(3)) <= 1e-11) {
		t.Errorf("worst %q %.12g, rms %.12g", any.WorstDirection, any.WorstSusceptibility, any.Susceptibility)
	}
	for _, p := range any.Curve {
		if s := 2. / 3 * math.Pow(math.Sin(p.Value*perMHz*100), 2); !(p.Infidelity >= s-1e-12) {
			t.Errorf("curve at %g: %g is not the worst", p.Value, p.Infidelity)
		}
	}
}

// A square pi pulse about an axis at angle phi between X and Y, u_I = O cos phi and u_Q = O sin phi: an error of one quadrature, or of the angle
// between them, is a static error along X or Y, of which the part along the axis survives whole and that across to 2/pi; and margins are those of
// the static error of the same rate.
func TestQuadratureErrors(t *testing.T) {
	const phi = 0.4
	c, s := math.Cos(phi), math.Sin(phi)
	m := composite([]segment{{180, phi * 180 / math.Pi}})
	m.Target = rotation(math.Pi, phi)
	m.Errors = []Class{
		{Name: "amplitude I", Kind: "amplitude", Quadrature: "I", Channels: []string{"q1 drive"}},
		{Name: "amplitude Q", Kind: "amplitude", Quadrature: "Q"},
		{Name: "angle", Kind: "skew"},
	}
	got := judged(t, m, 1e-4)
	rate := m.Channels[0].FullScale / perMHz
	for name, want := range map[string]struct {
		along, across, per float64 // parts of the error along the axis and across; MHz of one unit
		of, unit           string
	}{
		"amplitude I": {c, s, rate * c / 100, "X", "%"},
		"amplitude Q": {s, c, rate * s / 100, "Y", "%"},
		"angle":       {c, s, -rate * s * math.Pi / 180, "X", "deg"},
	} {
		e, static := got[name], got[want.of]
		if share := math.Hypot(want.along, want.across*2/math.Pi); !(math.Abs(e.Susceptibility-share) <= 1e-11) {
			t.Errorf("%s: susceptibility %.12g, want %.12g", name, e.Susceptibility, share)
		}
		low, high := static.Low/want.per, static.High/want.per
		if low > high {
			low, high = high, low
		}
		if !(math.Abs(e.Low/low-1) <= 1e-7) || !(math.Abs(e.High/high-1) <= 1e-7) || e.Unit != want.unit {
			t.Errorf("%s: margins %.9g and %.9g %s, want %.9g and %.9g %s", name, e.Low, e.High, e.Unit, low, high, want.unit)
		}
		for _, p := range e.Curve {
			f, err := m.Against(context.Background(), [][]complex128{scaled(map[string][]complex128{"X": halfX, "Y": halfY}[want.of], p.Value*want.per*perMHz)})
			if err != nil {
				t.Fatal(err)
			}
			if !(math.Abs(p.Infidelity-f[0]) <= 1e-13) {
				t.Errorf("%s: curve at %g is %.12g, want %.12g", name, p.Value, p.Infidelity, f[0])
			}
		}
	}
	// A channel with one quadrature has neither error; none without drive is withstood for ever.
	m.Errors = []Class{{Name: "amplitude Q", Kind: "amplitude", Quadrature: "Q"}, {Name: "angle", Kind: "skew"}}
	m.Channels[0].Samples = composite(plain).Channels[0].Samples
	m.Target = rotation(math.Pi, 0)
	for _, name := range []string{"amplitude Q", "angle"} {
		if e := judged(t, m, 1e-4)[name]; e.Susceptibility != 0 || !math.IsInf(e.High, 1) {
			t.Errorf("%s of silence: %g, margin %g", name, e.Susceptibility, e.High)
		}
	}
}

// The corner of a single-pole low-pass, w/(s+w), whose slope is dG/dlog w = w/(s+w) - w^2/(s+w)^2: first order against gates through lines with
// other corners (WithLine), the strength against a quadrature of the closed-form response, and the curve against the reference
// integrator. For window ends lines differ inside the window only, as the error does.
func TestLineError(t *testing.T) {
	const w, n = 0.12, 32
	m := spinModel(1, rotation(math.Pi/2, 0), cosine(24, n))
	for k := range m.Channels[0].Samples {
		m.Channels[0].Samples[k] *= complex(1, 0.2*math.Sin(float64(k)))
	}
	m.Ends = "window"
	c := &m.Channels[0]
	c.Direct, c.Poles, c.Powers, c.Residues = 0, []complex128{-w}, []int{1}, []complex128{w}
	m.Errors = []Class{{Name: "corner", Kind: "line", Channels: []string{"q1 drive"}, Poles: []complex128{-w, -w}, Powers: []int{1, 2}, Residues: []complex128{w, -w * w}}}
	class := &m.Errors[0]
	at := func(lambda float64) []complex128 {
		p := w * (1 + lambda)
		o := m.WithLine(0, 0, 0, []complex128{complex(-p, 0)}, []int{1}, []complex128{complex(p, 0)})
		return evolve(t, newTestEngine(t, o), nil, 0)
	}
	m.Target = at(0)
	got := judged(t, m, 1e-3)["corner"]
	// Central differences with one extrapolation: good to h^4.
	const h = 1e-3
	slope := make([]complex128, 4)
	a, b, c2, d := at(h), at(-h), at(h/2), at(-h/2)
	for i := range slope {
		slope[i] = (4*(c2[i]-d[i])/h - (a[i]-b[i])/(2*h)) / 3
	}
	left := product(adjoint(at(0)), slope)
	dropTrace(left, 2)
	// sqrt(T int |v|^2 dt |X/2|_F^2), Simpson's rule inside each sample.
	bent := *m
	bent.Channels = append([]Channel(nil), m.Channels...)
	bent.Channels[0].Poles, bent.Channels[0].Powers, bent.Channels[0].Residues = class.Poles, class.Powers, class.Residues
	energy := 0.0
	const parts = 64
	for k := range n * parts {
		t0, dt := float64(k)/parts, 1./parts
		energy += dt / 6 * (square(arrives(&bent, 0, t0)) + 4*square(arrives(&bent, 0, t0+dt/2)) + square(arrives(&bent, 0, t0+dt)))
	}
	want := frobenius(left) / (c.FullScale * math.Sqrt(n*energy/2))
	if !(math.Abs(got.Susceptibility-want) <= 1e-8) || !(want > 0.05) {
		t.Errorf("susceptibility %.10g, want %.10g", got.Susceptibility, want)
	}
	if got.Unit != "%" || got.Kind != "line" || len(got.Curve) != 61 {
		t.Errorf("unit %q, kind %q, %d points", got.Unit, got.Kind, len(got.Curve))
	}
	e := newTestEngine(t, m)
	infidelity := func(size float64) float64 {
		return e.figuresOf(e.labours[0], slowlyWrong(m, wrong{line: class, lambda: size / 100})).Infidelity
	}
	for i := 0; i < len(got.Curve); i += 10 {
		if p := got.Curve[i]; !(math.Abs(p.Infidelity-infidelity(p.Value)) <= 1e-9) {
			t.Errorf("curve at %g %%: %.10g, want %.10g", p.Value, p.Infidelity, infidelity(p.Value))
		}
	}
	if f := infidelity(got.High); !(math.Abs(f/1e-3-1) <= 1e-6) {
		t.Errorf("margin of %g %%: infidelity %.9g there", got.High, f)
	}
	if f := infidelity(got.Low); !(math.Abs(f/1e-3-1) <= 1e-6) {
		t.Errorf("margin of %g %%: infidelity %.9g there", got.Low, f)
	}
	// A slope that is the line itself is an amplitude error.
	m.Errors[0].Poles, m.Errors[0].Powers, m.Errors[0].Residues = c.Poles, c.Powers, c.Residues
	list := judged(t, m, 1e-3)
	x, y := list["corner"], list["amplitude"]
	if !(math.Abs(x.Susceptibility-y.Susceptibility) <= 1e-11) || !(math.Abs(x.High/y.High-1) <= 1e-8) || !(math.Abs(x.Low/y.Low-1) <= 1e-8) {
		t.Errorf("the line as its own slope: %+v, amplitude %+v", x, y)
	}
}

func slowlyWrong(m *Model, w wrong) []complex128 {
	return slowlyFrom(m, m.WindowStart, m.Samples*12, m.SamplePeriod/12, w)
}
