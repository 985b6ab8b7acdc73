package device

import (
	"fmt"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"holdfast/hardware/quantity"
)

// The test device is invented.
const whole = `format = 1
name = "Skerry"

[[site]]
name = "q1"
levels = 2
zero = "upper"
frequency = "5.1 GHz"
detuning = "-250 kHz"
T1 = "40 us"
T2 = "80 us"

[[drive]]
site = "q1"
channel = "q1 drive"

[[bias]]
site = "q1"
channel = "q1 flux"

[[bias]]
site = "q1"
channel = "q1 side"
axis = "X"
`

func TestLoad(t *testing.T) {
	path := filepath.Join(t.TempDir(), "device.toml")
	if err := os.WriteFile(path, []byte(whole), 0o666); err != nil {
		t.Fatal(err)
	}
	d, err := Load(path)
	if err != nil {
		t.Fatal(err)
	}
	if d.File != path || d.Name != "Skerry" || d.Dim() != 2 || len(d.Sites) != 1 || len(d.Drives) != 1 {
		t.Errorf("device %+v", d)
	}
	if got, want := d.Sites[0], (Site{Name: "q1", Kind: Spin, Levels: 2, Code: [2]int{0, 1}, Zero: Upper, Frequency: 5.1, T1: 40_000, T2: 80_000, Detuning: 2 * math.Pi * -0.00025}); !reflect.DeepEqual(got, want) {
		t.Errorf("site %+v, want %+v", got, want)
	}
	if got, want := d.Drives[0], (Drive{"q1", "q1 drive", 15}); got != want {
		t.Errorf("drive %+v, want %+v", got, want)
	}
	if want := []Bias{{Site: "q1", Channel: "q1 flux", Axis: "Z", Line: 19}, {Site: "q1", Channel: "q1 side", Axis: "X", Line: 23}}; !reflect.DeepEqual(d.Biases, want) {
		t.Errorf("biases %+v", d.Biases)
	}
	if z, x := (Matrix{2, []complex128{0.5, 0, 0, -0.5}}), (Matrix{2, []complex128{0, 0.5, 0.5, 0}}); !near(d.BiasOperator(0), z, 0) || !near(d.BiasOperator(1), x, 0) || !near(d.ShiftOperator("q1 drive"), z, 0) {
		t.Errorf("operators %v, %v, %v", d.BiasOperator(0), d.BiasOperator(1), d.ShiftOperator("q1 drive"))
	}
	// |0> is the upper state: H0 = 2 pi f Z/2.
	want := Matrix{2, []complex128{complex(-math.Pi*0.00025, 0), 0, 0, complex(math.Pi*0.00025, 0)}}
	if !near(d.Static(), want, 1e-15) {
		t.Errorf("static %v, want %v", d.Static(), want)
	}
	if _, err := Load(path + ".none"); err == nil || !strings.HasPrefix(err.Error(), path+".none: found no such file") {
		t.Errorf("missing file: %v", err)
	}
}

// The energies of a spin are +-w/2 and |0> is the +1 state of Z, so in a frame that turns with the carrier a transition above it leaves
// the upper state raised: H0 = 2 pi f Z/2 when that is |0>, and -2 pi f Z/2 when |0> is the lower. Worked out by hand from H = w/2 (|upper><upper| -
// |lower><lower|) and the frame's -carrier/2 of the same.
func TestDetuningSign(t *testing.T) {
	for _, c := range []struct {
		zero, detuning string
		first          float64 // <0|H0|0>, rad/ns
	}{
		{Upper, "2 MHz", math.Pi * 2e-3}, {Upper, "-2 MHz", -math.Pi * 2e-3},
		{Lower, "2 MHz", -math.Pi * 2e-3}, {Lower, "-2 MHz", math.Pi * 2e-3},
	} {
		d := mustRead(t, fmt.Sprintf("format = 1\nname = 'd'\n[[site]]\nname = 'q1'\nzero = %q\ndetuning = %q\n[[drive]]\nsite = 'q1'\nchannel = 'c'\n", c.zero, c.detuning))
		if got := d.Static().At(0, 0); !near(d.Static(), Matrix{2, []complex128{complex(c.first, 0), 0, 0, complex(-c.first, 0)}}, 1e-15) {
			t.Errorf("|0> %s, %s: <0|H0|0> = %v, want %v", c.zero, c.detuning, got, c.first)
		}
	}
	d := mustRead(t, "format = 1\nname = 'd'\n[[site]]\nname = 'q1'\n[[drive]]\nsite = 'q1'\nchannel = 'c'\n")
	if v := d.Static().At(0, 0); math.Signbit(real(v)) {
		t.Errorf("without a detuning <0|H0|0> = %v, want 0 and not -0", v)
	}
}

func TestDefaults(t *testing.T) {
	d := mustRead(t, "format = 1\nname = 'd'\n[[site]]\nname = 'q1'\n[[drive]]\nsite = 'q1'\nchannel = 'c'\n")
	if got, want := d.Sites[0], (Site{Name: "q1", Kind: Spin, Levels: 2, Code: [2]int{0, 1}, Zero: Lower}); !reflect.DeepEqual(got, want) {
		t.Errorf("site %+v, want %+v", got, want)
	}
	if d.Static().Norm() != 0 {
		t.Errorf("static %v", d.Static())
	}
}

// A device that only biases turn.
func TestBiasAlone(t *testing.T) {
	d := mustRead(t, "format = 1\nname = 'd'\n[[site]]\nname = 'q1'\n[[bias]]\nsite = 'q1'\nchannel = 'c'\naxis = 'Y'\n")
	if y := (Matrix{2, []complex128{0, -0.5i, 0.5i, 0}}); len(d.Drives) != 0 || len(d.Biases) != 1 || !near(d.BiasOperator(0), y, 0) {
		t.Errorf("%+v", d)
	}
}

func mustRead(t *testing.T, text string) *Device {
	t.Helper()
	doc, err := quantity.ParseDocument("d.toml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	d, err := read(doc)
	if err != nil {
		t.Fatal(err)
	}
	return d
}

// One mistake each in the whole device.
func TestRefuses(t *testing.T) {
	for _, c := range []struct{ old, new, want string }{
		{"format = 1", "format = 2", "d.toml:1: format: found 2; allowed: 1, and nothing else"},
		{"format = 1", "", "d.toml:1: format: found nothing; allowed: 1, and nothing else"},
		{`name = "Skerry"`, `Name = "Skerry"`, `d.toml:2: Name: found an unknown key; allowed: format, name, site, drive, bias, coupling, crosstalk (keys are case-sensitive: write name)`},
		{`name = "Skerry"`, `name = 7`, `d.toml:2: name: found 7; allowed: a text in quotes`},
		{"levels = 2", "levels = 3", `d.toml:4: site[0].anharmonicity: found nothing; allowed: a frequency such as "40 MHz", -1 GHz to 1 GHz`},
		{"levels = 2", "levels = 3\nanharmonicity = \"-220 MHz\"", `d.toml:8: site[0].zero: found "upper"; allowed: "lower" for more than two levels, the ladder stands on |0>`},
		{"levels = 2", "levels = 2\nanharmonicity = \"-220\"", `d.toml:7: site[0].anharmonicity: found "-220"; allowed: a frequency such as "40 MHz", -1 GHz to 1 GHz (the unit is missing)`},
		{"levels = 2", "levels = 1000000000000", "d.toml:6: site[0].levels: found 1000000000000; allowed: a whole number, 2 to 16"},
		{"levels = 2", "level = 2", "d.toml:6: site[0].level: found an unknown key; allowed: name, levels, zero, frequency, T1, T2, detuning, kind, anharmonicity, quadratic, higher, code (did you mean levels?)"},
		{`zero = "upper"`, `zero = "ground"`, `d.toml:7: site[0].zero: found "ground"; allowed: "lower" or "upper"`},
		{"5.1 GHz", "5.1 ns", `d.toml:8: site[0].frequency: found "5.1 ns"; allowed: a frequency such as "40 MHz", 1 Hz to 10000 GHz ("ns" is a unit of time)`},
		{`"-250 kHz"`, "-0.25", `d.toml:9: site[0].detuning: found -0.25; allowed: a frequency such as "40 MHz", -1 GHz to 1 GHz (a bare number has no unit: write a quantity in quotes)`},
		{`"-250 kHz"`, "nan", `d.toml:9: site[0].detuning: found NaN; allowed: a frequency such as "40 MHz", -1 GHz to 1 GHz`},
		{`T1 = "40 us"`, `T1 = "0 us"`, `d.toml:10: site[0].T1: found "0 us"; allowed: a time such as "112 ns", 1 ns to 1e+06 s`},
		{`T1 = "40 us"`, `T1 = "inf us"`, `d.toml:10: site[0].T1: found "inf us"; allowed: a time such as "112 ns", 1 ns to 1e+06 s (not a finite number)`},
		{`T1 = "40 us"`, `t1 = "40 us"`, `d.toml:10: site[0].t1: found an unknown key; allowed: name, levels, zero, frequency, T1, T2, detuning, kind, anharmonicity, quadratic, higher, code (keys are case-sensitive: write T1)`},
		{`T2 = "80 us"`, `T2 = "80.1 us"`, "d.toml:11: site[0].T2: found 80.1 us; allowed: at most twice T1, 80 us"},
		{`T2 = "80 us"`, "T2 = \"80 us\"\nT2 = \"80 us\"", "d.toml:12: site[0].T2: found this key a second time, after line 11; allowed: each key once"},
		{"[[site]]", "[other]\nx = 1\n[[site]]", "d.toml:4: other: found an unknown key; allowed: format, name, site, drive, bias, coupling, crosstalk"},
		{"[[drive]]", "[[drive]]\nsite = \"q1\"\nchannel = \"q1 drive\"\n[[drive]]", "d.toml:18: drive[1].channel: found \"q1 drive\" in a second [[drive]]; allowed: a channel of its own"},
		{"[[drive]]\nsite = \"q1\"\nchannel = \"q1 drive\"\n\n[[bias]]\nsite = \"q1\"\nchannel = \"q1 flux\"\n\n[[bias]]\nsite = \"q1\"\nchannel = \"q1 side\"\naxis = \"X\"\n", "",
			"d.toml:1: drive: found none, and no bias; allowed: a [[drive]], which names the site and the channel that drives it, or a [[bias]]"},
		{`"q1 flux"`, `"q1 drive"`, `d.toml:19: bias[0].channel: found "q1 drive", which a [[drive]] has; allowed: a channel of its own`},
		{`"q1 side"`, `"q1 flux"`, `d.toml:23: bias[1].channel: found "q1 flux" in a second [[bias]]; allowed: a channel of its own`},
		{`axis = "X"`, `axis = "x"`, `d.toml:24: bias[1].axis: found "x"; allowed: "X", "Y" or "Z" (did you mean "X"?)`},
		{`axis = "X"`, `axes = "X"`, `d.toml:24: bias[1].axes: found an unknown key; allowed: site, channel, axis, polynomial, loop (did you mean axis?)`},
		{"[[bias]]\nsite = \"q1\"", "[[bias]]\nsite = \"q3\"", `d.toml:18: bias[0].site: found "q3"; allowed: a site of this device, "q1"`},
		{`channel = "q1 flux"`, ``, `d.toml:17: bias[0].channel: found nothing; allowed: a text in quotes`},
		{"[[bias]]\nsite = \"q1\"", strings.Repeat("[[bias]]\n", 16), `d.toml:17: bias: found 17 tables; allowed: at most 16`},
		{"[[drive]]\nsite", "[[drives]]\nsite", "d.toml:13: drives: found an unknown key; allowed: format, name, site, drive, bias, coupling, crosstalk (did you mean drive?)"},
		{`site = "q1"`, `site = "q2"`, `d.toml:14: drive[0].site: found "q2"; allowed: a site of this device, "q1"`},
		{`channel = "q1 drive"`, ``, `d.toml:13: drive[0].channel: found nothing; allowed: a text in quotes`},
		{`channel = "q1 drive"`, "channel = \"q1 drive\"\n[[couplings]]\n", `d.toml:16: couplings: found an unknown key; allowed: format, name, site, drive, bias, coupling, crosstalk (did you mean coupling?)`},
		{`"q1 drive"`, `q1 drive`, `d.toml:15: drive[0].channel: found q1 drive without quotes; allowed: text and quantities in quotes (write "q1 drive")`},
	} {
		if !strings.Contains(whole, c.old) {
			t.Fatalf("%q is not in the device", c.old)
		}
		doc, err := quantity.ParseDocument("d.toml", []byte(strings.Replace(whole, c.old, c.new, 1)))
		if err == nil {
			_, err = read(doc)
		}
		if err == nil || err.Error() != c.want {
			t.Errorf("%q:\n got %v\nwant %s", c.new, err, c.want)
		}
	}
	doc, err := quantity.ParseDocument("d.toml", []byte("format = 1\nname = 'x'\n"))
	if err != nil {
		t.Fatal(err)
	}
	if _, err := read(doc); err == nil || err.Error() != "d.toml:1: site: found none; allowed: 1 to 6 [[site]], each with its name" {
		t.Errorf("no site: %v", err)
	}
}

// The four cases of mixing and zero, against the carriers themselves: in the frame that turns with H0 = -+w Z/2, the field
// (I cos wt -+ Q sin wt) X leaves, averaged over its period, (I X +- Q Y)/2. Here w is 1 and the average is taken over 64 points, which
// is exact for these products of sines.
func TestOperatorsAgainstCarrier(t *testing.T) {
	x, _ := Operator("X")
	for _, c := range []struct {
		zero, mixing string
		sin, energy  float64 // of the carrier's Q; of |0>, in units of w/2
	}{
		{Lower, "I cos + Q sin", 1, -1}, {Lower, "I cos - Q sin", -1, -1}, {Upper, "I cos + Q sin", 1, 1}, {Upper, "I cos - Q sin", -1, 1},
	} {
		d := &Device{Sites: []Site{{Name: "q1", Levels: 2, Zero: c.zero}}, Drives: []Drive{{Site: "q1"}}}
		ops := d.Operators(0, c.mixing)
		for quadrature, wave := range []func(float64) float64{math.Cos, func(a float64) float64 { return c.sin * math.Sin(a) }} {
			average := Zero(2)
			const points = 64
			for k := range points {
				a := 2 * math.Pi * float64(k) / points
				free := Rotation([3]float64{0, 0, 1}, c.energy*a) // exp(-i energy w t Z/2)
				average = average.Add(complex(wave(a)/points, 0), free.Adjoint().Mul(x).Mul(free))
			}
			if !near(average, ops[quadrature], 1e-14) {
				t.Errorf("|0> %s, %s, quadrature %d: got %v, the carrier gives %v", c.zero, c.mixing, quadrature, ops[quadrature], average)
			}
		}
	}
}

func near(a, b Matrix, tolerance float64) bool {
	return a.N == b.N && a.Add(-1, b).Norm() <= tolerance
}

// TestLadder checks a ladder of four levels against its definition: quadratures (a+a')/2 and i(a'-a)/2, energies
// delta n + alpha n(n-1)/2, and a detuning of Z/2 on the lowest two that is -n.
func TestLadder(t *testing.T) {
	d := &Device{
		Sites:  []Site{{Name: "q", Levels: 4, Zero: Lower, Detuning: 0.3, Anharmonicity: -1.4}},
		Drives: []Drive{{Site: "q", Channel: "c"}}, Biases: []Bias{{Site: "q", Channel: "b", Axis: "Z"}},
	}
	ops := d.Operators(0, "I cos + Q sin")
	static, bias := d.Static(), d.BiasOperator(0)
	for i := range 4 {
		for j := range 4 {
			var x, y, s, b complex128
			switch {
			case i == j:
				n := float64(i)
				s, b = complex(0.3*n-1.4*n*(n-1)/2, 0), complex(-n, 0)
			case j == i+1: // a
				r := complex(math.Sqrt(float64(j)), 0)
				x, y = r/2, -1i*r/2
			case i == j+1: // a'
				r := complex(math.Sqrt(float64(i)), 0)
				x, y = r/2, 1i*r/2
			}
			for _, c := range []struct {
				name      string
				got, want complex128
			}{{"I", ops[0].At(i, j), x}, {"Q", ops[1].At(i, j), y}, {"static", static.At(i, j), s}, {"bias", bias.At(i, j), b}} {
				if !(cmplx.Abs(c.got-c.want) <= 1e-15) {
					t.Errorf("%s (%d, %d): %v, want %v", c.name, i, j, c.got, c.want)
				}
			}
		}
	}
	if got := d.Operators(0, "I cos - Q sin")[1].At(0, 1); got != 0.5i {
		t.Errorf("Q with the other mixing: %v, want 0.5i", got)
	}
	if d.Dim() != 4 {
		t.Errorf("dimension %d", d.Dim())
	}
}
