package design

import (
	"context"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"holdfast/design/brief"
	"holdfast/design/dynamics"
	"holdfast/design/replay"
	"holdfast/design/robust"
	"holdfast/hardware"
)

// textFile returns a file of testdata as text.
func textFile(t *testing.T, name string) string {
	t.Helper()
	data, err := os.ReadFile(filepath.Join("..", "testdata", filepath.FromSlash(name)))
	if err != nil {
		t.Fatal(err)
	}
	return string(data)
}

// inputsOf writes a profile, a device and the rest of a brief to a folder and loads
// them as a user's.
func inputsOf(t *testing.T, profile, device, briefRest string) Inputs {
	t.Helper()
	dir := t.TempDir()
	for name, text := range map[string]string{
		"profile.toml": profile, "device.toml": device,
		"brief.toml": "format = 1\nname = \"test\"\nprofile = \"profile.toml\"\ndevice = \"device.toml\"\n" + briefRest,
	} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	b, p, d, err := brief.LoadAll(filepath.Join(dir, "brief.toml"))
	if err != nil {
		t.Fatal(err)
	}
	return Inputs{Brief: b, Profile: p, Device: d, Version: "test"}
}

// idealInputs are those of a half turn about X by the ideal instrument.
// head and tail go before and after the tables that every such brief has.
func idealInputs(t *testing.T, fullScale string, ns int, head, tail string) Inputs {
	t.Helper()
	const as = `full_scale = "40 MHz"`
	profile := textFile(t, "ideal/ideal.toml")
	if !strings.Contains(profile, as) {
		t.Fatalf("ideal.toml has no %s", as)
	}
	profile = strings.Replace(profile, as, fmt.Sprintf("full_scale = %q", fullScale), 1)
	const device = `format = 1
name = "a spin (invented)"
[[site]]
name = "q1"
zero = "upper"
[[drive]]
site = "q1"
channel = "drive"
`
	return inputsOf(t, profile, device, fmt.Sprintf(`span = "%d ns"
ends = "settled"
%s
[target]
site = "q1"
gate = "X180"
[basis]
family = "samples"
%s
`, ns, head, tail))
}

// writtenBack writes the pulse to a folder and opens it as replay does.
func writtenBack(t *testing.T, p *Pulse, s Sources) *replay.Folder {
	t.Helper()
	dir := t.TempDir()
	if err := p.Write(dir, s); err != nil {
		t.Fatal(err)
	}
	f, err := replay.Open(dir)
	if err != nil {
		t.Fatal(err)
	}
	return f
}

// foundError picks one error of a verdict.
func foundError(t *testing.T, v *replay.Verdict, name string) replay.Error {
	t.Helper()
	for _, e := range v.Errors {
		if e.Name == name {
			return e
		}
	}
	t.Fatalf("replay judged no error %q", name)
	return replay.Error{}
}

// The table of composite pi pulses: average gate infidelity = coefficient times
// error to the power of order, amplitude error eps and detuning f in units of the
// Rabi rate. Angles from H. K. Cummins, G. Llewellyn, J. A. Jones, Phys. Rev. A 67,
// 042308 (2003), and S. Wimperis, J. Magn. Reson. A 109, 221 (1994): MEM, confirmed.
// Coefficients CALC, by independent computation. They are played as samples by the
// ideal instrument; package replay has the same table for its own integrator, and
// package shape for the angles.
func TestPublishedComposites(t *testing.T) {
	// 12 degrees a sample: 5/6 of a full scale of 40 MHz for 1 ns.
	const share, degrees = 5. / 6, 12.
	phase := math.Acos(-0.25) * 180 / math.Pi // of BB1: acos(-theta/4 pi)
	type part struct{ angle, phase float64 }
	for _, c := range []struct {
		name                string
		parts               []part
		amplitudeOrder      int
		amplitude           float64
		detuningOrder       int
		detuning, tolerance float64 // relative; the five digits quoted
	}{
		{"plain", []part{{180, 0}}, 2, math.Pi * math.Pi / 6, 2, 2. / 3, 1e-9},
		{"CORPSE", []part{{420, 0}, {300, 180}, {60, 0}}, 2, math.Pi * math.Pi / 6, 4, 0.0043338, 2e-5},
		{"short CORPSE", []part{{60, 0}, {300, 180}, {60, 0}}, 2, math.Pi * math.Pi / 6, 4, 1.8181, 4e-5},
		{"SCROFULOUS", []part{{180, 60}, {180, -60}, {180, 60}}, 4, 3.0440, 2, 2.6667, 2e-5},
		{"BB1", []part{{180, phase}, {360, 3 * phase}, {180, phase}, {180, 0}}, 6, 6.2590, 2, 2. / 3, 1e-5},
	} {
		var x []complex128
		for _, p := range c.parts {
			n := p.angle / degrees
			if n != math.Trunc(n) {
				t.Fatalf("%s: %g degrees are not whole samples", c.name, p.angle)
			}
			s, r := math.Sincos(p.phase * math.Pi / 180)
			for range int(n) {
				x = append(x, complex(share*r, share*s))
			}
		}
		in := idealInputs(t, "40 MHz", len(x), "", "") // no error named: detuning, amplitude and any
		readings, err := in.Profile.CheckSamples(0, x)
		if err != nil || !hardware.Kept(readings) {
			t.Errorf("%s: the ideal instrument does not play it: %v %v", c.name, readings, err)
		}
		q, err := newTask(in, in.Brief.Basis.Family)
		if err != nil {
			t.Fatal(err)
		}
		g := q.gate(true).(*robust.Gate)
		u, _ := q.controls(&q.fine, [][]complex128{x})
		f := g.Figures(u, nil)
		if !(f.Infidelity <= 1e-28) {
			t.Errorf("%s: infidelity %.3g without error", c.name, f.Infidelity)
		}
		rate := degrees * math.Pi / 180 // rad/ns
		// The second of two sizes cancels the next order; a first-order error leaves
		// an odd one besides, which the two signs cancel.
		coefficient := func(order int, at func(e float64) float64) float64 {
			h := 1e-3 // CORPSE wants no larger detuning
			if order == 6 {
				h = 4e-3 // or nothing but rounding is left
			}
			of := func(e float64) float64 { return (at(e) + at(-e)) / 2 / math.Pow(e, float64(order)) }
			return (4*of(h/2) - of(h)) / 3
		}
		for _, e := range []struct {
			name           string
			order          int
			want           float64
			at             func(e float64) float64
			susceptibility float64
		}{
			{"amplitude", c.amplitudeOrder, c.amplitude, func(e float64) float64 { return g.Infidelity(u, dynamics.Vec{}, 1+e) }, f.Susceptibility[1]},
			{"detuning", c.detuningOrder, c.detuning, func(e float64) float64 { return g.Infidelity(u, dynamics.Vec{0, 0, e * rate}, 1) }, f.Susceptibility[0]},
		} {
			if got := coefficient(e.order, e.at); !(math.Abs(got/e.want-1) <= c.tolerance) {
				t.Errorf("%s: %s: %.7g, want %.7g", c.name, e.name, got, e.want)
			}
			// Of the field e Ω that an error adds, a share s turns the spin throughout
			// T: to second order the infidelity is (e Ω s T)²/6.
			want := 0.0
			if e.order == 2 {
				want = math.Sqrt(6*e.want) / (rate * float64(len(x)))
			}
			if !(math.Abs(e.susceptibility-want) <= c.tolerance) {
				t.Errorf("%s: susceptibility to %s %.7g, want %.7g", c.name, e.name, e.susceptibility, want)
			}
		}
	}
}

// burp is a shaped pulse of H. Geen and R. Freeman, J. Magn. Reson. 93, 93 (1991),
// as coefficients of its field w1 over a length T:
//
//	w1(t) T/(2 pi) = a[0] + sum over n of a[n] cos(2 pi n t/T) + b[n] sin(2 pi n t/T).
type burp struct{ a, b []float64 }

// Coefficients MEM; the profiles below, CALC, confirm them.
var (
	eBURP2 = burp{
		[]float64{.26, .91, .29, -1.28, -.05, .04, .02, .06, .00, -.02, .00},
		[]float64{0, -.16, -1.82, .18, .42, .07, .07, -.01, -.04, .00, .00},
	}
	iBURP2 = burp{
		[]float64{.50, .81, .07, -1.25, -.24, .07, .11, .05, -.02, -.03, -.02, .00},
		[]float64{0, -.68, -1.38, .20, .45, .23, .05, -.04, -.04, .00, .01, .01},
	}
	burpOffsets = []float64{0, 1, 2, 2.5, 3, 4} // 1/T
)

// samples plays the shape in n samples of 1 ns; a sample holds the value of its
// middle. full is in GHz.
func (p burp) samples(n int, full float64) []complex128 {
	x := make([]complex128, n)
	for k := range x {
		at := 2 * math.Pi * (float64(k) + 0.5) / float64(n)
		v := 0.0
		for i := range p.a {
			s, c := math.Sincos(float64(i) * at)
			v += p.a[i]*c + p.b[i]*s
		}
		x[k] = complex(v/(float64(n)*full), 0)
	}
	return x
}

// The magnetisation that is left of (0, 0, 1) at offsets from resonance: -My after
// E-BURP-2, Mz after I-BURP-2. Values CALC, to four digits.
func TestPublishedShapes(t *testing.T) {
	const n, full = 1000, 0.04 // samples of 1 ns, so that 1/T is 1 MHz; GHz
	in := idealInputs(t, "40 MHz", n, `hold = "nothing"`, "")
	line, period := in.Profile.Channels[0].Line, in.Profile.SamplePeriod
	for _, c := range []struct {
		name string
		p    burp
		row  int // of the rotation: what the start along z becomes
		sign float64
		want []float64
	}{
		{"E-BURP-2", eBURP2, 1, -1, []float64{.9980, .9842, .9596, .6290, .0924, .0120}},
		{"I-BURP-2", iBURP2, 2, 1, []float64{-1.0000, -.9995, -.9641, -.2530, .7753, .9781}},
	} {
		x := c.p.samples(n, full)
		readings, err := in.Profile.CheckSamples(0, x)
		if err != nil || !hardware.Kept(readings) {
			t.Errorf("%s: the ideal instrument does not play it: %v %v", c.name, readings, err)
		}
		for i, offset := range burpOffsets {
			w := 2 * math.Pi * full
			s := robust.Spin{
				Static: dynamics.Vec{0, 0, 2 * math.Pi * offset / (n * period)},
				Axes:   []dynamics.Vec{{w, 0, 0}, {0, w, 0}}, Target: dynamics.One,
			}
			// as claim does for a pulse of any length
			a, err := newAxis([]feed{{line: line}}, n, period, claimShare, true, w, length(s.Static), 0)
			if err != nil {
				t.Fatal(err)
			}
			s.Grid = a.Grid
			u := make([]float64, 2*a.nodes())
			a.put(&lane{quadratures: 2}, feed{line: line}, x, u)
			r := robust.NewGate(s, robust.Response{}, 0).Unitary(u).Rotation()
			if got := c.sign * r[3*c.row+2]; !(math.Abs(got-c.want[i]) <= 0.7e-4) {
				t.Errorf("%s at %g/T: %.5f, want %.4f", c.name, offset, got, c.want[i])
			}
		}
	}
}

// The same inversion profile in the bring-up table of replay, which integrates on
// its own: the population of |1> against detuning is (1 - Mz)/2.
func TestPublishedShapeReplayed(t *testing.T) {
	const n, full = 1000, 0.04
	want := map[float64]float64{0: -1.0000, 1: -.9995, 2: -.9641, 2.5: -.2530, 3: .7753, 4: .9781} // CALC
	inf := math.Inf(1)
	m := &replay.Model{
		SamplePeriod: 1, Samples: n, Bits: 16, Ends: brief.Settled, Dim: 2, CodeSpace: []int{0, 1},
		Static: make([]complex128, 4), Target: []complex128{0, -1i, -1i, 0},
		Channels: []replay.Channel{{
			Name: "drive", Kind: "quadrature", FullScale: 2 * math.Pi * full, Direct: 1,
			Operators: [][]complex128{{0, 0.5, 0.5, 0}, {0, -0.5i, 0.5i, 0}},
			MaxShare:  1, MaxSlew: inf, RingOut: inf, Samples: iBURP2.samples(n, full),
		}},
	}
	if err := m.Validate(); err != nil {
		t.Fatal(err)
	}
	v, err := m.Judge(context.Background(), 1e-4)
	if err != nil {
		t.Fatal(err)
	}
	seen := 0
	for _, p := range v.BringUp.Detuning {
		mz, ok := want[math.Abs(p.Value)]
		if !ok {
			continue
		}
		seen++
		if got := 1 - 2*p.One; !(math.Abs(got-mz) <= 0.7e-4) {
			t.Errorf("I-BURP-2 at %g/T: Mz %.5f, want %.4f", p.Value, got, mz)
		}
	}
	if seen != 2*len(want)-1 {
		t.Errorf("the bring-up table has %d of the %d detunings", seen, 2*len(want)-1)
	}
}
