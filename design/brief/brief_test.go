package brief

import (
	"math"
	"strings"
	"testing"

	"holdfast/design/device"
	"holdfast/hardware/quantity"
)

// The test brief is invented.
const whole = `format = 1
name = "X90, held"
profile = "racks/b.toml"
device = "/somewhere/skerry.toml"
span = "112 ns"
ends = "window"
seed = 7
starts = 12
refine = false

[target]
site = "q1"
gate = "X90"

[basis]
family = "slepian"
coefficients = 20

[[error]]
detuning = "q1"
size = "1 MHz"
weight = 2

[[error]]
amplitude = "q1 drive"
size = "2 %"

[[error]]
operator = "Y"

[[error]]
name = "skew"
matrix = [[0.5, [0, -0.5]], [[0, 0.5], -0.5]]

[[error]]
any = "all"

[require]
infidelity = 1e-6
susceptibility = 2e-3

[[require.margin]]
error = "detuning"
size = "500 kHz"

[[require.margin]]
error = "amplitude"
size = "1 %"

[[require.margin]]
error = "skew"
size = "1 MHz"
`

func parse(t *testing.T, text string) (*Brief, error) {
	t.Helper()
	doc, err := quantity.ParseDocument("jobs/b.toml", []byte(text))
	if err != nil {
		return nil, err
	}
	return read(doc, valuesOf([]byte(text)))
}

func near(got, want float64) bool { return math.Abs(got-want) <= 1e-15*math.Abs(want) }

func sameMatrix(a, b device.Matrix) bool { return a.N == b.N && a.Add(-1, b).Norm() <= 1e-15 }

func TestRead(t *testing.T) {
	b, err := parse(t, whole)
	if err != nil {
		t.Fatal(err)
	}
	if b.File != "jobs/b.toml" || b.Name != "X90, held" || b.Profile != "racks/b.toml" || b.ProfilePath != "jobs/racks/b.toml" || b.DevicePath != "/somewhere/skerry.toml" ||
		b.Span != 112 || b.Ends != Window || b.Seed != 7 || b.Starts != 12 || b.Refine || b.Defaulted || b.HoldNothing || b.Basis != (Basis{Slepian, 20, 3}) {
		t.Errorf("%+v", b)
	}
	x, _ := device.Operator("X")
	r := complex(math.Sqrt2/2, 0)
	if want := device.Identity(2).Scale(r).Add(-1i*r, x); b.Target.Site != "q1" || b.Target.Label != "X90" || !sameMatrix(b.Target.Matrix, want) || !near(b.Target.Angle, math.Pi/2) || b.Target.Axis != [3]float64{1, 0, 0} {
		t.Errorf("target %+v", b.Target)
	}
	y, _ := device.Operator("Y")
	z, _ := device.Operator("Z")
	mhz := 2 * math.Pi * 1e-3
	want := []Error{
		{Name: "detuning", Kind: Static, Operator: z.Scale(0.5), Size: mhz, Weight: 2},
		{Name: "amplitude", Kind: Amplitude, Channels: []string{"q1 drive"}, Size: 0.02, Weight: 1},
		{Name: "Y", Kind: Static, Operator: y.Scale(0.5), Size: 3 * mhz, Weight: 1},
		{Name: "skew", Kind: Static, Operator: y.Scale(0.5).Add(0.5, z), Size: 3 * mhz, Weight: 1},
		{Name: "any static error", Kind: Any, Size: mhz, Weight: 1},
	}
	if len(b.Errors) != len(want) {
		t.Fatalf("%d errors", len(b.Errors))
	}
	for i, w := range want {
		got := b.Errors[i]
		if got.Name != w.Name || got.Kind != w.Kind || !near(got.Size, w.Size) || got.Weight != w.Weight || !sameMatrix(got.Operator, w.Operator) || strings.Join(got.Channels, ",") != strings.Join(w.Channels, ",") {
			t.Errorf("error %d: %+v, want %+v", i, got, w)
		}
	}
	if b.Require.Infidelity != 1e-6 || b.Require.Susceptibility != 2e-3 || len(b.Require.Margins) != 3 {
		t.Fatalf("require %+v", b.Require)
	}
	for i, w := range []Margin{{"detuning", mhz / 2}, {"amplitude", 0.01}, {"skew", mhz}} {
		if got := b.Require.Margins[i]; got.Error != w.Error || !near(got.Size, w.Size) {
			t.Errorf("margin %+v, want %+v", got, w)
		}
	}
}

// The shortest brief, and what it means.
const bare = "format = 1\nname = 'n'\nprofile = 'p.toml'\ndevice = 'd.toml'\nspan = '64 ns'\n[target]\nsite = 'q1'\n"

func TestDefaults(t *testing.T) {
	b, err := parse(t, bare+"gate = 'H'\n")
	if err != nil {
		t.Fatal(err)
	}
	if b.Ends != Settled || b.Seed != 1 || b.Starts != 60 || !b.Refine || !b.Defaulted || b.HoldNothing || b.Basis != (Basis{Slepian, 0, 3}) ||
		b.Require.Infidelity != 1e-4 || b.Require.Susceptibility != 1e-3 || len(b.Require.Margins) != 0 {
		t.Errorf("%+v", b)
	}
	z, _ := device.Operator("Z")
	mhz := 2 * math.Pi * 1e-3
	if e := b.Errors; len(e) != 3 || e[0].Name != "detuning" || e[0].Kind != Static || !sameMatrix(e[0].Operator, z.Scale(0.5)) || !near(e[0].Size, 3*mhz) ||
		e[1].Name != "amplitude" || e[1].Kind != Amplitude || e[1].Size != 0.03 || e[2].Name != "any static error" || e[2].Kind != Any || !near(e[2].Size, mhz) ||
		e[0].Weight != 1 || e[1].Weight != 1 || e[2].Weight != 1 {
		t.Errorf("default errors %+v", e)
	}
	// H is the half turn about X+Z.
	if !near(b.Target.Angle, math.Pi) || !near(b.Target.Axis[0], math.Sqrt2/2) || b.Target.Axis[1] != 0 || !near(b.Target.Axis[2], math.Sqrt2/2) {
		t.Errorf("target %+v", b.Target)
	}
	b, err = parse(t, "hold = 'nothing'\n"+bare+"gate = 'X180'\n[basis]\nfamily = 'samples'\n")
	if err != nil || !b.HoldNothing || b.Defaulted || len(b.Errors) != 0 || b.Basis.Family != Samples {
		t.Errorf("held against nothing: %+v, %v", b, err)
	}
}

// What the width brought: kinds of error, free rotations, phases, families.
func TestReadWide(t *testing.T) {
	b, err := parse(t, "phases = ['0 deg', '90 deg']\n"+bare+`gate = 'X90'
free_z = 'both'
[basis]
family = 'b-spline'
degree = 4
[[error]]
line = 'q1 drive'
parameter = 'lowpass[0].corner'
[[error]]
line = 'q1 drive'
parameter = 'tails[0].time'
name = 'slow tail'
size = '20 %'
weight = 3
[[error]]
amplitude = 'q1 drive'
quadrature = 'Q'
[[error]]
quadrature_angle = 'q1 drive'
[[error]]
offset = 'q1 drive'
[[error]]
offset = 'q1 drive'
quadrature = 'I'
name = 'leak'
size = '0.5 %'
[[require.margin]]
error = 'slow tail'
size = '10 %'
[[require.margin]]
error = 'quadrature angle'
size = '0.5 deg'
[[require.margin]]
error = 'offset Q'
size = '0.2 %'
`)
	if err != nil {
		t.Fatal(err)
	}
	if b.Target.FreeZ != Both || b.PhaseBy != BySamples || len(b.Phases) != 2 || b.Phases[0] != 0 || !near(b.Phases[1], math.Pi/2) || b.Basis != (Basis{BSpline, 0, 4}) || b.Defaulted || b.HoldProfile {
		t.Errorf("%+v", b)
	}
	for i, w := range []Error{
		{Name: "q1 drive lowpass[0].corner", Kind: Line, Parameter: "lowpass[0].corner", Size: 0.05, Weight: 1},
		{Name: "slow tail", Kind: Line, Parameter: "tails[0].time", Size: 0.2, Weight: 3},
		{Name: "amplitude Q", Kind: Amplitude, Quadrature: "Q", Size: 0.03, Weight: 1},
		{Name: "quadrature angle", Kind: Skew, Size: math.Pi / 180, Weight: 1},
		{Name: "offset I", Kind: Offset, Quadrature: "I", Size: 1e-3, Weight: 1},
		{Name: "offset Q", Kind: Offset, Quadrature: "Q", Size: 1e-3, Weight: 1},
		{Name: "leak", Kind: Offset, Quadrature: "I", Size: 5e-3, Weight: 1},
	} {
		got := b.Errors[i]
		if got.Name != w.Name || got.Kind != w.Kind || got.Parameter != w.Parameter || got.Quadrature != w.Quadrature || !near(got.Size, w.Size) || got.Weight != w.Weight || len(got.Channels) != 1 || got.Channels[0] != "q1 drive" {
			t.Errorf("error %d: %+v, want %+v", i, got, w)
		}
	}
	for i, w := range []float64{0.1, math.Pi / 360, 0.002} {
		if got := b.Require.Margins[i]; !near(got.Size, w) {
			t.Errorf("margin %+v, want %g", got, w)
		}
	}
	b, err = parse(t, bare+"gate = 'X90'\n")
	if err != nil || b.Target.FreeZ != NoFreeZ || b.PhaseBy != ByInstrument || b.Phases != nil {
		t.Errorf("%+v, %v", b, err)
	}
	b, err = parse(t, "hold = 'profile'\n"+bare+"gate = 'X90'\n")
	if err != nil || !b.HoldProfile || b.Defaulted || b.HoldNothing || len(b.Errors) != 0 {
		t.Errorf("%+v, %v", b, err)
	}
}

// The same gate in three ways.
func TestTargets(t *testing.T) {
	for _, c := range []struct{ text, label string }{
		{"gate = 'Y90'", "Y90"},
		{"axis = [0, 2, 0]\nangle = '90 deg'", "90 deg about (0, 1, 0)"},
		{"matrix = [[0.70710678, -0.70710678], [0.70710678, 0.70710678]]", "matrix"},
		{"matrix = [[[0, 0.70710678], [0, -0.70710678]], [[0, 0.70710678], [0, 0.70710678]]]", "matrix"}, // with a phase
	} {
		b, err := parse(t, bare+c.text+"\n")
		if err != nil {
			t.Errorf("%s: %v", c.text, err)
			continue
		}
		y, _ := device.Operator("Y")
		r := complex(math.Sqrt2/2, 0)
		if want := device.Identity(2).Scale(r).Add(-1i*r, y); b.Target.Label != c.label || !sameMatrix(b.Target.Matrix, want) || !near(b.Target.Angle, math.Pi/2) || !near(b.Target.Axis[1], 1) {
			t.Errorf("%s: %+v", c.text, b.Target)
		}
	}
}

// An axis of any length.
func TestTargetAxis(t *testing.T) {
	b, err := parse(t, bare+"axis = [2, 3, -6]\nangle = '-1.5 rad'\n") // of length 7
	if err != nil {
		t.Fatal(err)
	}
	for i, want := range []float64{2. / 7, 3. / 7, -6. / 7} {
		if !near(b.Target.Axis[i], want) {
			t.Errorf("axis %v", b.Target.Axis)
		}
	}
	if want := device.Rotation(b.Target.Axis, -1.5); b.Target.Angle != -1.5 || !sameMatrix(b.Target.Matrix, want) || b.Target.Label != "-85.9437 deg about (0.2857, 0.4286, -0.8571)" {
		t.Errorf("%+v", b.Target)
	}
}

// What typing leaves is removed from the matrix of an error.
func TestOperatorMatrix(t *testing.T) {
	b, err := parse(t, bare+"gate = 'X90'\n[[error]]\nmatrix = [[0.3333333333, [0.1, 0.2]], [[0.1, -0.2000000001], -0.3333333334]]\n")
	if err != nil {
		t.Fatal(err)
	}
	m := b.Errors[0].Operator
	if m.Trace() != 0 || m.Add(-1, m.Adjoint()).Norm() != 0 || !(math.Abs(real(m.At(0, 0))-0.33333333335) <= 1e-15) {
		t.Errorf("operator %v", m)
	}
}

// One mistake each in the whole brief.
func TestRefuses(t *testing.T) {
	for _, c := range []struct{ old, new, want string }{
		{"format = 1", "format = '1'", `1: format: found "1"; allowed: 1, and nothing else (write it without quotes)`},
		{"span = \"112 ns\"", "span = 112", `5: span: found 112; allowed: a time such as "112 ns", 1 ps to 1 s (a bare number has no unit: write a quantity in quotes)`},
		{"span = \"112 ns\"", "span = 112 ns", `5: span: found 112 ns without quotes; allowed: text and quantities in quotes (write "112 ns")`},
		{"span = \"112 ns\"", "span = inf", `5: span: found +Inf; allowed: a time such as "112 ns", 1 ps to 1 s`},
		{"span = \"112 ns\"", "span = \"112 MHz\"", `5: span: found "112 MHz"; allowed: a time such as "112 ns", 1 ps to 1 s ("MHz" is a unit of frequency)`},
		{"span = \"112 ns\"", "Span = \"112 ns\"", `5: Span: found an unknown key; allowed: format, name, profile, device, span, ends, seed, starts, refine, target, phases, phase_by, basis, error, hold, require (keys are case-sensitive: write span)`},
		{"span = \"112 ns\"", "span = \"112 ns\"\nspan = \"64 ns\"", `6: span: found this key a second time, after line 5; allowed: each key once`},
		{"ends = \"window\"", "ends = \"end\"", `6: ends: found "end"; allowed: "settled" or "window"`},
		{"seed = 7", "seed = -7", `7: seed: found -7; allowed: a whole number, 0 to 9223372036854775807`},
		{"seed = 7", "seed = 99999999999999999999", `7: seed: found text that is not valid TOML: 99999999999999999999 is out of range for int64; allowed: key = value, with text and quantities in quotes`},
		{"starts = 12", "starts = 1_000_000_000", `8: starts: found 1000000000; allowed: a whole number, 1 to 100000`},
		{"refine = false", "refine = \"no\"", `9: refine: found "no"; allowed: true or false`},
		{"refine = false", "refine = no", `9: refine: found no; allowed: true or false where it answers a question, and text in quotes`},
		{"refine = false", "hold = \"everything\"", `9: hold: found "everything"; allowed: "nothing" or "profile"`},
		{"refine = false", "hold = \"nothing\"", `19: error[0]: found an [[error]] beside hold = "nothing"; allowed: one of the two`},
		// The target.
		{"[target]", "[tarket]", `11: tarket: found an unknown key; allowed: format, name, profile, device, span, ends, seed, starts, refine, target, phases, phase_by, basis, error, hold, require (did you mean target?)`},
		{"gate = \"X90\"", "gate = \"x90\"", `13: target.gate: found "x90"; allowed: "X90", "-X90", "X180", "Y90", "-Y90", "Y180", "Z90", "Z180", "H", "S", "T" or "identity" (did you mean "X90"?)`},
		{"gate = \"X90\"", "", `11: target: found none of gate, gates, controlled, axis, matrix or from; allowed: exactly one of them`},
		{"gate = \"X90\"", "Gate = \"X90\"", `13: target.Gate: found an unknown key; allowed: site, sites, gates, from, to, free_z, up_to, gate, controlled, axis, matrix, angle (keys are case-sensitive: write gate)`},
		{"gate = \"X90\"", "gate = \"X90\"\nmatrix = [[1, 0], [0, 1]]", `14: target.matrix: found matrix beside gate; allowed: exactly one of gate, gates, controlled, axis, matrix or from`},
		{"gate = \"X90\"", "gate = \"X90\"\naxis = [0, 0, 1]\nangle = \"90 deg\"", `14: target.axis: found axis beside gate; allowed: exactly one of gate, gates, controlled, axis, matrix or from`},
		{"gate = \"X90\"", "gate = \"X90\"\nangle = \"90 deg\"", `14: target.angle: found an angle without an axis; allowed: both, as in axis = [1, 0, 0] and angle = "90 deg"`},
		{"gate = \"X90\"", "axis = [0, 0, 1]", `11: target.angle: found nothing; allowed: an angle such as "90 deg", -720 deg to 720 deg`},
		{"gate = \"X90\"", "axis = [0, 0, 1]\nangle = 90", `14: target.angle: found 90; allowed: an angle such as "90 deg", -720 deg to 720 deg (a bare number has no unit: write a quantity in quotes)`},
		{"gate = \"X90\"", "axis = [0, 0, 0]\nangle = \"90 deg\"", `13: target.axis: found an axis of no length; allowed: 3 components that are not all 0, as in [1, 0, 0]`},
		{"gate = \"X90\"", "axis = [0, 1]\nangle = \"90 deg\"", `13: target.axis: found 2 numbers; allowed: the 3 components of the axis, as in [1, 0, 0]`},
		{"gate = \"X90\"", "axis = [0, nan, 1]\nangle = \"90 deg\"", `13: target.axis: found NaN as element 1; allowed: numbers, -1e+06 to 1e+06`},
		{"gate = \"X90\"", "axis = \"X\"\nangle = \"90 deg\"", `13: target.axis: found "X"; allowed: an array of at most 3 numbers`},
		{"gate = \"X90\"", "matrix = [[1, 0], [0, 0.9]]", `13: target.matrix: found a matrix M with |M'M - 1| = 0.19; allowed: a unitary one, to within 1e-06 (write the entries with 8 digits or more, or give axis and angle)`},
		{"gate = \"X90\"", "matrix = [[1]]", `13: target.matrix: found 1 row; allowed: 2 rows, for a spin`},
		{"gate = \"X90\"", "matrix = [[1, 0, 0], [0, 1, 0], [0, 0, 1]]", `13: target.matrix: found 3 rows; allowed: a square matrix of at most 2 rows, each entry a number or [re, im], each part from -1e+30 to 1e+30`},
		// The basis.
		{"coefficients = 20", "coefficients = 1000000", `17: basis.coefficients: found 1000000; allowed: a whole number, 1 to 65536`},
		{"\"slepian\"", "\"splines\"", `16: basis.family: found "splines"; allowed: "slepian", "fourier", "tapered", "b-spline", "samples" or "best"`},
		{"\"slepian\"", "\"b-spline\"\ndegree = 6", `17: basis.degree: found 6; allowed: a whole number, 1 to 5`},
		{"\"slepian\"", "\"bspline\"", `16: basis.family: found "bspline"; allowed: "slepian", "fourier", "tapered", "b-spline", "samples" or "best" (did you mean "b-spline"?)`},
		{"\"slepian\"", "\"samples\"", `17: basis.coefficients: found 20 with family = "samples"; allowed: no number here, as there is one coefficient for each sample`},
		// Errors.
		{"detuning = \"q1\"\n", "", `19: error[0]: found none of detuning, amplitude, operator, matrix, any, line, quadrature_angle, offset, on, collective or crosstalk; allowed: exactly one of them`},
		{"detuning = \"q1\"\n", "detunning = \"q1\"\n", `20: error[0].detunning: found an unknown key; allowed: detuning, amplitude, operator, matrix, any, line, quadrature_angle, offset, on, collective, crosstalk, quadrature, parameter, site, except, rates, size, noise, name, weight, order, spread, values (did you mean detuning?)`},
		{"detuning = \"q1\"\n", "detuning = \"q1\"\nany = \"all\"\n", `21: error[0].any: found any beside detuning; allowed: exactly one of detuning, amplitude, operator, matrix, any, line, quadrature_angle, offset, on, collective or crosstalk`},
		{"size = \"1 MHz\"", "size = \"1 %\"", `21: error[0].size: found "1 %"; allowed: a frequency such as "40 MHz", 1 Hz to 1 GHz ("%" is a unit of share)`},
		{"size = \"1 MHz\"", "size = \"0 MHz\"", `21: error[0].size: found "0 MHz"; allowed: a frequency such as "40 MHz", 1 Hz to 1 GHz`},
		{"weight = 2", "weight = 0", `22: error[0].weight: found 0; allowed: a number, 1e-06 to 1e+06`},
		{"weight = 2", "weight = nan", `22: error[0].weight: found NaN; allowed: a number, 1e-06 to 1e+06`},
		{"size = \"2 %\"", "size = \"2 MHz\"", `26: error[1].size: found "2 MHz"; allowed: a share such as "1.5 %", 1 ppm to 50 % ("MHz" is a unit of frequency)`},
		{"operator = \"Y\"", "operator = \"YY\"", `29: error[2].operator: found "YY"; allowed: "X", "Y" or "Z"`},
		{"operator = \"Y\"", "detuning = \"q1\"", `28: error[2].name: found a second error called "detuning"; allowed: a name of its own for each error`},
		{"operator = \"Y\"", "operator = \"Y\"\nname = \"X\"", `30: error[2].name: found "X" for another error; allowed: any name but detuning, amplitude, X, Y and Z, which stand for the errors of these kinds`},
		{"[[0.5, [0, -0.5]], [[0, 0.5], -0.5]]", "[[0, 1], [2, 0]]", `33: error[3].matrix: found 1 in row 0, column 1 and 2 in row 1, column 0, which are not conjugate; allowed: a traceless Hermitian matrix, as in [[0, [0, -0.5]], [[0, 0.5], 0]]`},
		{"[[0.5, [0, -0.5]], [[0, 0.5], -0.5]]", "[[0, [0, 1]], [[0, 1], 0]]", `33: error[3].matrix: found [0, 1] in row 0, column 1 and [0, 1] in row 1, column 0, which are not conjugate; allowed: a traceless Hermitian matrix, as in [[0, [0, -0.5]], [[0, 0.5], 0]]`},
		{"[[0.5, [0, -0.5]], [[0, 0.5], -0.5]]", "[[[0, 1], 0], [0, [0, -1]]]", `33: error[3].matrix: found [0, 1] in row 0, column 0 and [0, 1] in row 0, column 0, which are not conjugate; allowed: a traceless Hermitian matrix, as in [[0, [0, -0.5]], [[0, 0.5], 0]]`},
		{"[[0.5, [0, -0.5]], [[0, 0.5], -0.5]]", "[[0, 0], [0, 1]]", `33: error[3].matrix: found the trace 1; allowed: a traceless Hermitian matrix, as in [[0, [0, -0.5]], [[0, 0.5], 0]] (subtract 0.5 from the diagonal: an energy common to all levels changes nothing)`},
		{"[[0.5, [0, -0.5]], [[0, 0.5], -0.5]]", "[[0, 0], [0, 0]]", `33: error[3].matrix: found nothing but zeros; allowed: a traceless Hermitian matrix, as in [[0, [0, -0.5]], [[0, 0.5], 0]]`},
		{"[[0.5, [0, -0.5]], [[0, 0.5], -0.5]]", "[[0, 101], [101, 0]]", `33: error[3].matrix: found an entry of 101; allowed: entries up to 100 (the size of the error is another key)`},
		{"[[0.5, [0, -0.5]], [[0, 0.5], -0.5]]", "[[0]]", `33: error[3].matrix: found 1 row; allowed: 2 rows or more, as many as the device has levels`},
		{"[[0.5, [0, -0.5]], [[0, 0.5], -0.5]]", "\"X\"", `33: error[3].matrix: found "X"; allowed: a square matrix of at most 64 rows, each entry a number or [re, im], each part from -1e+30 to 1e+30`},
		{"any = \"all\"", "any = \"three-body\"", `36: error[4].any: found "three-body"; allowed: "all", "one-body", "two-body", "leakage" or sites, as in "on q1, q2"`},
		{"any = \"all\"", "any = \"all\"" + strings.Repeat("\n[[error]]\nany = \"all\"", 16), `19: error: found 21 tables; allowed: at most 16`},
		{"any = \"all\"", "line = \"q1 drive\"", `35: error[4].parameter: found nothing; allowed: a text in quotes`},
		{"any = \"all\"", "line = \"q1 drive\"\nparameter = 1", `37: error[4].parameter: found 1; allowed: a text in quotes`},
		{"any = \"all\"", "line = \"q1 drive\"\nparameter = \"delay\"\nsize = \"1 MHz\"", `38: error[4].size: found "1 MHz"; allowed: a share such as "1.5 %", 1 ppm to 50 % ("MHz" is a unit of frequency)`},
		{"any = \"all\"", "line = \"q1 drive\"\nparameter = \"delay\"\nquadrature = \"I\"", `38: error[4].quadrature: found a quadrature beside line; allowed: only beside amplitude or offset`},
		{"any = \"all\"", "any = \"all\"\nparameter = \"delay\"", `37: error[4].parameter: found a parameter beside any; allowed: only beside line`},
		{"any = \"all\"", "amplitude = \"q1 drive\"\nquadrature = \"i\"", `37: error[4].quadrature: found "i"; allowed: "I" or "Q" (did you mean "I"?)`},
		{"any = \"all\"", "amplitude = \"q1 drive\"\nquadrature = \"I\"\nname = \"amplitude\"", `38: error[4].name: found "amplitude" for another error; allowed: any name but detuning, amplitude, X, Y and Z, which stand for the errors of these kinds`},
		{"any = \"all\"", "quadrature_angle = \"q1 drive\"\nsize = \"31 deg\"", `37: error[4].size: found "31 deg"; allowed: an angle such as "90 deg", 5.72958e-05 deg to 30 deg`},
		{"any = \"all\"", "offset = \"q1 drive\"\nsize = \"1 mV\"", `37: error[4].size: found "1 mV"; allowed: a share such as "1.5 %", 1 ppm to 50 % ("mV" is a unit of voltage)`},
		{"any = \"all\"", "offset = \"q1 drive\"\n[[error]]\noffset = \"q1 drive\"\nquadrature = \"Q\"", `37: error[5].name: found a second error called "offset Q"; allowed: a name of its own for each error`},
		{"any = \"all\"", "offset = 1", `36: error[4].offset: found 1; allowed: a text in quotes`},
		// Free rotations and phases.
		{"gate = \"X90\"", "gate = \"X90\"\nfree_z = true", `14: target.free_z: found true; allowed: "none", "before", "after" or "both"`},
		{"refine = false", "phase_by = \"samples\"", `1: phases: found nothing; allowed: an array of at most 64 texts, each an angle such as "90 deg"`},
		{"refine = false", "phase_by = \"hand\"", `9: phase_by: found "hand"; allowed: "instrument" or "samples"`},
		{"refine = false", "phase_by = \"instrument\"\nphases = [\"0 deg\"]", `10: phases: found phases beside phase_by = "instrument"; allowed: phases with phase_by = "samples"`},
		{"refine = false", "phases = []", `9: phases: found no phase; allowed: 1 to 64, as in ["0 deg", "90 deg"]`},
		{"refine = false", "phases = [0, 90]", `9: phases: found 0 as element 0; allowed: an angle such as "90 deg", -720 deg to 720 deg`},
		{"refine = false", "phases = [\"0 deg\", \"90 ns\"]", `9: phases: found "90 ns" as element 1; allowed: an angle such as "90 deg", -720 deg to 720 deg ("ns" is a unit of time)`},
		{"refine = false", "phases = [\"-90 deg\", \"0 deg\", \"270 deg\"]", `9: phases: found 270 deg, the same turn as -90 deg; allowed: each turn once`},
		{"refine = false", "phases = [" + strings.Repeat("\"1 deg\", ", 65) + "]", `9: phases: found an array of 65; allowed: an array of at most 64 texts, each an angle such as "90 deg"`},
		// Requirements.
		{"infidelity = 1e-6", "infidelity = \"1e-6\"", `39: require.infidelity: found "1e-6"; allowed: a number, 1e-12 to 1 (this figure has no unit: write it without quotes)`},
		{"infidelity = 1e-6", "infidelity = 0", `39: require.infidelity: found 0; allowed: a number, 1e-12 to 1`},
		{"susceptibility = 2e-3", "susceptability = 2e-3", `40: require.susceptability: found an unknown key; allowed: infidelity, susceptibility, margin (did you mean susceptibility?)`},
		{"error = \"detuning\"", "error = \"any static error\"", `43: require.margin[0].error: found "any static error"; allowed: "detuning", "amplitude", "X", "Y", "Z" or "skew"`},
		{"size = \"500 kHz\"", "size = \"5 %\"", `44: require.margin[0].size: found "5 %"; allowed: a frequency such as "40 MHz", 1 Hz to 1 GHz ("%" is a unit of share)`},
		{"size = \"1 %\"", "size = \"1 MHz\"", `48: require.margin[1].size: found "1 MHz"; allowed: a share such as "1.5 %", 1 ppm to 50 % ("MHz" is a unit of frequency)`},
		{"size = \"1 %\"", "", `46: require.margin[1].size: found nothing; allowed: a share such as "1.5 %", 1 ppm to 50 %`},
		{"error = \"amplitude\"\nsize = \"1 %\"", "error = \"detuning\"\nsize = \"1 MHz\"", `47: require.margin[1].error: found a second margin of "detuning"; allowed: one for each error`},
	} {
		if !strings.Contains(whole, c.old) {
			t.Fatalf("%q is not in the brief", c.old)
		}
		_, err := parse(t, strings.Replace(whole, c.old, c.new, 1))
		if err == nil || err.Error() != "jobs/b.toml:"+c.want {
			t.Errorf("%q:\n got %v\nwant jobs/b.toml:%s", c.new, err, c.want)
		}
	}
}

// Whatever the text, a brief is read or refused in one line, and a gate is unitary.
func FuzzRead(f *testing.F) {
	f.Add(whole)
	f.Add(bare + "axis = [0, 0, 1]\nangle = '90 deg'\n[[error]]\nmatrix = [[1]]")
	for _, c := range []string{
		"sites = ['a', 'b']\ngate = 'CNOT'\nup_to = 'local rotations'", "gates = { a = 'X90', b = 'H' }", "sites = ['a', 'b', 'c']\ncontrolled = 'T'", "from = ['00', '01']\nto = ['11', '10']",
		"from = [1, 0, [0, 0], 0]\nto = 'W'", "sites = ['a', 'b']\nmatrix = [[1,0,0,0],[0,1,0,0],[0,0,1,0],[0,0,0,1]]",
	} {
		f.Add(strings.Replace(bare, "site = 'q1'\n", "", 1) + c + "\n[[error]]\non = { a = 'Z' }\n[[error]]\nany = 'on a, b'\nexcept = [{ a = 'X' }]\nrates = 'r.csv'\n[[error]]\ncrosstalk = 'c'\nsite = 'b'\n")
	}
	f.Fuzz(func(t *testing.T, text string) {
		b, err := parse(t, text)
		if err != nil {
			if strings.Contains(err.Error(), "\n") {
				t.Fatal(err)
			}
			return
		}
		m, n := b.Target.Matrix, 1<<len(b.Target.Sites)
		if b.Target.Sites == nil {
			n = 0
		}
		if m.N != n || !(math.Abs(m.Norm()-math.Sqrt(float64(n))) <= 1e-12) || !(b.Span > 0) {
			t.Fatalf("%+v", b)
		}
	})
}

// Whatever the text, rates are read or refused in one line.
func FuzzRates(f *testing.F) {
	for _, text := range []string{"pauli,rate\nXI,1e-3\nZZ,0\n", "\ufeffpauli, rate\r\n\"IX\",1\r\n", "pauli,rate\n\"X\nX\",1"} {
		f.Add(text)
	}
	f.Fuzz(func(t *testing.T, text string) {
		rates, err := parseRates("r.csv", text, 2)
		switch {
		case err != nil && (strings.Contains(err.Error(), "\n") || err.Line < 1):
			t.Fatal(err)
		case err != nil:
			return
		}
		for name, r := range rates {
			if len(name) != 2 || strings.Trim(name, "IXYZ") != "" || !(r >= 0 && r <= largestRate) {
				t.Fatalf("%q: %v", name, r)
			}
		}
	})
}
