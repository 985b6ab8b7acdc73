package main

import (
	"fmt"
	"math"
	"path/filepath"
	"strings"
	"testing"

	"holdfast/design/device"
)

// The demonstration's profile, in words. The figures are calculated by hand where they are not those of the file: one code
// of 14 bit is 2^-13; sinc(0.1) is 0.983632; 36 free samples of a 40 ns span carry floor(2*36*0.1)-1 = 6 coefficients.
func TestCheckProfile(t *testing.T) {
	dir := newLab(t)
	path := filepath.Join(dir, "rack-b.toml")
	status, stdout, stderr := play("check", path)
	if status != exitMet || stderr != "" {
		t.Fatalf("check: %d, %s", status, stderr)
	}
	mustHave(t, "check", stdout,
		`hardware profile of "rack B, position 3"`, "1 GS/s", "each sample is held for 1 ns", "14 bit: one code (LSB) is 0.012207 %", "8 to 65536 samples in blocks of 8, 8 ns each",
		"I multiplies the cosine of the carrier and Q minus its sine", "Q turns a spin about +Y when its |0> is the upper energy, about -Y when it is the lower", "the frame that turns with the carrier",
		"40 MHz, once in 25 ns", "up to 95 %", "25 %/sample", "4 steps from zero", "100 MHz from the carrier; there holding the samples leaves 98.36 % (-0.143 dB)",
		"0 samples at zero before the pulse and 4 after", "0.1 % of full scale may arrive", "Bessel low-pass of order 2", "tail of -1.5 %", "10-90 % transition: 1.7", "overshoot: ", "settles to 1 %: 13.", "settles to 0.1 %: 8", "corner (-3.01 dB): 19",
		"window begins at the device 3.2 ns after the trigger", "0 ns of latency and 3.2 ns of pure delay",
		"quarter turn in 10 ns and a half turn in 16 ns",
		"playable in spans from 8 ns up", "equations = together - 1 - 6: one more coefficient than equations is wanted, and 6 for the ring-out limit", "40 ns 40 6 12 5 the gate alone", "64 ns 64 11 22 15 any static error and amplitude",
		"500 mV", "burn and blind")
	for l := range strings.Lines(stdout) {
		if n := len([]rune(l)); n > 115 && !strings.Contains(l, dir) {
			t.Errorf("a line of %d characters: %s", n, l)
		}
	}

	// the other mixer turns Q the other way; limits that are not there are none
	change(t, path, `mixing = "I cos - Q sin"`, `mixing = "I cos + Q sin"`)
	change(t, path, "slew_limit", "# slew_limit")
	change(t, path, "band", "# band")
	change(t, path, "ring_out", "# ring_out")
	change(t, path, "full_scale_level", "# full_scale_level")
	change(t, path, `kind = "quadrature"`, "kind = \"quadrature\"\ncarrier = \"5.1 GHz\"\nlatency = \"100 ns\"")
	status, stdout, stderr = play("check", path)
	if status != exitMet || stderr != "" {
		t.Fatalf("check: %d, %s", status, stderr)
	}
	mustHave(t, "check", stdout, "Q plus its sine", "about -Y when its |0> is the upper energy, about +Y when it is the lower", "(5.1 GHz)",
		"slew no limit", "no limit below half the sample rate, 500 MHz", "no limit on what arrives", "103.2 ns after the trigger: 100 ns of latency", "does not state the level",
		"equations = together - 1: one more", "8 ns 8 4 8 7 one named error") // 4 free samples, each a coefficient
}

// Channels of unlike delay stay apart, and check says by how much.
func TestCheckStarts(t *testing.T) {
	dir := newLab(t)
	path := filepath.Join(dir, "rack-b.toml")
	text := read(t, path)
	_, channel, _ := strings.Cut(text, "\n[[channel]]")
	channel = strings.NewReplacer(`"q1 drive"`, `"q2 drive"`, `"3.2 ns"`, `"5.7 ns"`).Replace(channel)
	write(t, path, text+"\n[[channel]]"+channel)
	status, stdout, stderr := play("check", path)
	if status != exitMet || stderr != "" {
		t.Fatalf("check: %d, %s", status, stderr)
	}
	mustHave(t, "check", stdout, "q1 drive begins 6.2 ns after the trigger, 0 ns before the latest; its samples are to be delayed by 3 samples for that",
		"q2 drive begins 5.7 ns after the trigger, 500 ps before the latest", "up to 500 ps (0.5 samples) apart: whole samples bring them no nearer",
		"3.2 ns of pure delay, and 3 samples for the sake of the slower channels")
	change(t, path, "block = 8", "block = 8\nalign = \"none\"")
	_, stdout, _ = play("check", path)
	mustHave(t, "check", stdout, "q1 drive begins 3.2 ns after the trigger, 2.5 ns before the latest", "q2 drive begins 5.7 ns after the trigger, 0 ns before the latest",
		"up to 2.5 ns (2.5 samples) apart, as align = \"none\" asks")
}

// What few profiles have is told in words where it stands there, and a baseband channel has no mixer.
func TestCheckOtherLimits(t *testing.T) {
	dir := newLab(t)
	path := filepath.Join(dir, "rack-b.toml")
	change(t, path, `kind = "quadrature"`, "kind = \"quadrature\"\nrms_limit = \"60 %\"\nrms_period = \"1 us\"\nout_of_band = \"1 %\"\nzero_mean = true\nshift = \"12 kHz\"\n"+
		"compression = [[\"0 %\", \"0 %\"], [\"50 %\", \"49 %\"], [\"100 %\", \"95 %\"]]")
	change(t, path, `fast = "8 ns"`, `fast = "8 ns", tail = "0.05 %"`)
	_, stdout, stderr := play("check", path)
	mustHave(t, "check", stdout, "at most 60 % of full scale over the span, or over 1 us where that is longer", "at most 1 % of full scale, rms over the span",
		"sum to zero", "at 100 % of the converter's range the drive reaches 95 % of full scale; 3 points", "moves the transition by 12 kHz",
		"in the first 8 ns after the span, and 0.05 % at every later instant",
		"40 ns 40 5 10") // one coefficient less
	if stderr != "" {
		t.Errorf("stderr: %s", stderr)
	}
	dir = newLab(t)
	path = filepath.Join(dir, "rack-b.toml")
	change(t, path, `kind = "quadrature"`, `kind = "baseband"`)
	change(t, path, `mixing = "I cos - Q sin"`, "")
	_, stdout, stderr = play("check", path)
	mustHave(t, "check", stdout, "one converter without a carrier", "up to 95 % of full scale, either sign", "64 ns 64 11 11 4 the gate alone")
	if stderr != "" || strings.Contains(stdout, "mixing") || strings.Contains(stdout, "frame that turns") {
		t.Errorf("baseband: %s%s", stdout, stderr)
	}
	// a drive and a bias: 60 free samples carry 11 coefficients for each of three converters
	dir = newLab(t)
	path = filepath.Join(dir, "rack-b.toml")
	write(t, path, read(t, path)+"\n[[channel]]\nname = \"q1 flux\"\nkind = \"baseband\"\nfull_scale = \"10 MHz\"\nband = \"100 MHz\"\nguard = { trail = 4 }\n")
	write(t, filepath.Join(dir, "skerry.toml"), read(t, filepath.Join(dir, "skerry.toml"))+"\n[[bias]]\nsite = \"q1\"\nchannel = \"q1 flux\"\n")
	text := strings.NewReplacer("weight = 1", "weight = 1\n[[error]]\nline = \"q1 drive\"\nparameter = \"tails[0].time\"\n[[error]]\nquadrature_angle = \"q1 drive\"\n"+
		"[[error]]\noffset = \"q1 flux\"", `"72 ns"`, `"64 ns"`).Replace(held)
	write(t, filepath.Join(dir, "held.toml"), text)
	_, stdout, stderr = play("check", filepath.Join(dir, "held.toml"), filepath.Join(dir, "skerry.toml"))
	mustHave(t, "check", stdout, "against them 33 coefficients, 11 per quadrature", "15: 3 of the gate and 12 of the errors, of which 3 repeat others", // the offset is a detuning
		`"q1 flux" turns about +Z by what it puts out`, "tails[0].time up to 5 %, quadrature angle up to 1 deg, offset", `channel "q1 flux" of the hardware profile, about Z`)
	if stderr != "" {
		t.Errorf("stderr: %s", stderr)
	}
}

// 100 ns cost 100/6 (1/60000 + 2/40000) = 1.11e-3 with the demonstration's times.
func TestCheckDevice(t *testing.T) {
	dir := newLab(t)
	path := filepath.Join(dir, "skerry.toml")
	_, stdout, _ := play("check", path)
	mustHave(t, "check", stdout, `device "Skerry"`, "the upper of the two energies", "5.1 GHz", "0 Hz of the transition", `channel "q1 drive"`, "60 us", "40 us", "adds 0.00111")
	change(t, path, "T1 =", "# T1 =")
	change(t, path, "T2 =", "# T2 =")
	change(t, path, "frequency =", "# frequency =")
	change(t, path, `zero = "upper"`, `zero = "lower"`)
	_, stdout, _ = play("check", path)
	mustHave(t, "check", stdout, "the lower of the two energies", "transition not stated", "T1 not stated", "left out of every figure")
	// With T1 alone T2 is 2 T1 at most: T/6 (1/T1 + 1/T1). With T2 alone T1 is endless.
	for _, c := range []struct{ T1, T2, want float64 }{
		{60000, 40000, 100. / 6 * (1./60000 + 2./40000)}, {60000, 0, 100. / 6 * 2 / 60000}, {0, 40000, 100. / 6 * 2 / 40000}, {0, 0, 0},
	} {
		if got := decoherence(device.Site{T1: c.T1, T2: c.T2}, 100); !(math.Abs(got-c.want) <= 1e-15) {
			t.Errorf("T1 %g, T2 %g: decoherence %g, want %g", c.T1, c.T2, got, c.want)
		}
	}
	change(t, path, "# T1 =", "T1 =")
	change(t, path, `detuning = "0 MHz"`, `detuning = "2 MHz"`)
	_, stdout, _ = play("check", path)
	mustHave(t, "check", stdout, "adds 0.000556", "with T2 = 2 T1", "positive: above it", "the lower energy, it adds -2 pi f Z/2")
	change(t, path, `zero = "lower"`, `zero = "upper"`)
	_, stdout, _ = play("check", path)
	mustHave(t, "check", stdout, "the upper energy, it adds 2 pi f Z/2")
}

func TestCheckBrief(t *testing.T) {
	dir := newLab(t)
	path := filepath.Join(dir, "x90.toml")
	_, stdout, _ := play("check", path)
	mustHave(t, "check", stdout, `brief "x90-any"`, "X90 on q1: 90 deg about (1, 0, 0)", "112 ns: 112 samples in 14 blocks of 8; 0 held at zero before and 4 after, 108 free",
		"settled: ", "any static error up to 1 MHz", "12: 3 of the gate and 9 of the errors; against them 40 coefficients, 20 per quadrature",
		"infidelity at most 1e-06", "of each held error, that infidelity up to ±", " kHz of detuning", "60 starts, seed 1",
		`"q1 drive" mixes I cos - Q sin, and |0> of q1 is the upper energy: I turns about +X and Q about +Y, in the frame that turns about +Z`,
		"adds 0.00124", "Decoherence alone costs 0.00124")

	for _, c := range []struct {
		name, text string
		wanted     []string
		not        string
	}{
		// 36 free samples: 12 coefficients. Named errors that repeat each other count once.
		{"too few", "[[error]]\nany = \"all\"\n", []string{"12: 3 of the gate and 9 of the errors; against them 12 coefficients", "Too few coefficients: 12 equations and the ring-out limit want more than 16, and the span carries 12"}, ""},
		{"hardly enough", "[[error]]\ndetuning = \"q1\"\n", []string{"6: 3 of the gate and 3 of the errors", "Hardly enough coefficients: 6 equations and the ring-out limit are easy with more than 12"}, ""},
		{"repeated", "[[error]]\ndetuning = \"q1\"\n[[error]]\noperator = \"Z\"\n[[error]]\nany = \"all\"\n[[error]]\namplitude = \"q1 drive\"\nsize = \"2 %\"\nweight = 0.5\n",
			[]string{"21: 3 of the gate and 18 of the errors, of which 6 repeat others", "Too few coefficients: 15 equations", "amplitude up to 2 % with weight 0.5"}, ""},
		{"default", "", []string{"detuning up to 3 MHz, amplitude up to 3 %, any static error up to 1 MHz (the brief names none, so these)", "18: 3 of the gate and 15 of the errors, of which 3 repeat others"}, ""},
		{"a margin of an amplitude", "[[error]]\namplitude = \"q1 drive\"\n[require]\n[[require.margin]]\nerror = \"amplitude\"\nsize = \"1 %\"\n", []string{"up to ±1 % of amplitude"}, ""},
		{"a spread", "[[error]]\ndetuning = \"q1\"\nspread = \"worst\"\n", []string{"detuning, the worst over a spread of 3 MHz", "3: 3 of the gate; second orders, spreads and noise are not counted; against them"}, "oo few"},
		{"samples", "[basis]\nfamily = \"samples\"\n", []string{"72 coefficients, 36 per quadrature, family samples"}, "coefficients:"},
		{"axis and angle", "axis = [-0.0, 0, 1]\nangle = \"90 deg\"\n", []string{"target 90 deg about (0, 0, 1) on q1 span"}, "(-0"},
		{"matrix", "matrix = [[[0.70710678, -0.70710678], 0], [0, [0.70710678, 0.70710678]]]\n", []string{"target matrix on q1: 90 deg about (0, 0, 1)"}, "-0,"},
		{"own number", "[basis]\ncoefficients = 30\n", []string{"60 coefficients, 30 per quadrature, family slepian"}, "oo few"},
	} {
		path := filepath.Join(dir, "other.toml")
		text := strings.Replace(quick, `hold = "nothing"`, "", 1) + c.text
		if strings.HasPrefix(c.text, "axis") || strings.HasPrefix(c.text, "matrix") { // in the place of the gate
			text = strings.Replace(text, "gate = \"X90\"\n", "", 1)
		}
		write(t, path, text)
		status, stdout, stderr := play("check", path)
		if status != exitMet || stderr != "" {
			t.Errorf("%s: %d, %s", c.name, status, stderr)
			continue
		}
		mustHave(t, c.name, stdout, c.wanted...)
		if c.not != "" && strings.Contains(stdout, c.not) {
			t.Errorf("%s: says %q:\n%s", c.name, c.not, stdout)
		}
	}

	// hold = "nothing", a carrier that is not the transition's, |0> below
	change(t, filepath.Join(dir, "rack-b.toml"), `kind = "quadrature"`, "kind = \"quadrature\"\ncarrier = \"5 GHz\"")
	change(t, filepath.Join(dir, "skerry.toml"), `zero = "upper"`, `zero = "lower"`)
	change(t, filepath.Join(dir, "rack-b.toml"), "band =", "# band =")
	write(t, path, strings.Replace(read(t, path), "[target]", "basis = { coefficients = 5 }\n[target]", 1))
	_, stdout, _ = play("check", path)
	mustHave(t, "check", stdout, "108 per quadrature, family samples", "basis.coefficients = 5 has no effect")
	change(t, filepath.Join(dir, "rack-b.toml"), "# band =", "band =")
	_, stdout, _ = play("check", filepath.Join(dir, "quick.toml"))
	mustHave(t, "check", stdout, `nothing (hold = "nothing")`, "3: 3 of the gate; against them 12 coefficients", "Q about -Y", "turns about -Z with the carrier (5 GHz)", "5.1 GHz, lies 100 MHz above the carrier, 5 GHz")
	// the right distance on the wrong side is told too
	for detuning, warned := range map[string]bool{"100 MHz": false, "-100 MHz": true} {
		change(t, filepath.Join(dir, "skerry.toml"), `detuning = "0 MHz"`, fmt.Sprintf("detuning = %q", detuning))
		_, stdout, _ = play("check", filepath.Join(dir, "quick.toml"))
		if strings.Contains(stdout, "lies 100 MHz above") != warned {
			t.Errorf("detuning %s, transition 100 MHz above the carrier: warned %v, want %v", detuning, !warned, warned)
		}
		change(t, filepath.Join(dir, "skerry.toml"), fmt.Sprintf("detuning = %q", detuning), `detuning = "0 MHz"`)
	}
}

// A bad file does not keep check from the others.
func TestCheckGoesOn(t *testing.T) {
	dir := newLab(t)
	at := func(name string) string { return filepath.Join(dir, name) }
	write(t, at("what.toml"), "format = 1\ncolour = \"red\"\n")
	write(t, at("capitals.toml"), "[Instrument]\nname = \"x\"\n")
	write(t, at("lost.toml"), strings.Replace(quick, "skerry.toml", "gone.toml", 1))
	status, stdout, stderr := play("check", at("what.toml"), at("skerry.toml"), at("none.toml"), at("lost.toml"), at("capitals.toml"), at("rack-b.toml"))
	if status != exitBadInput {
		t.Errorf("status %d", status)
	}
	mustHave(t, "check", stdout, `device "Skerry"`, "hardware profile")
	lines := strings.Split(strings.TrimSuffix(stderr, "\n"), "\n")
	if len(lines) != 4 {
		t.Fatalf("%d lines on stderr: %s", len(lines), stderr)
	}
	for i, wanted := range [][]string{
		{at("what.toml"), "[instrument] in a profile"},
		{at("none.toml"), "no such file"},
		{at("lost.toml") + ":", "device: found \"gone.toml\"", at("gone.toml"), "no such file"},
		{at("capitals.toml"), "Instrument", "instrument"},
	} {
		for _, s := range wanted {
			if !strings.HasPrefix(lines[i], "holdfast: "+wanted[0]) || !strings.Contains(lines[i], s) {
				t.Errorf("line %d does not say %q: %s", i+1, s, lines[i])
			}
		}
	}
}

// Every file of the demonstrations is in order.
func TestCheckDemonstrations(t *testing.T) {
	files, err := filepath.Glob(filepath.Join("..", "..", "testdata", "*", "*.toml"))
	if err != nil || len(files) < 3 {
		t.Fatalf("%d files: %v", len(files), err)
	}
	if status, stdout, stderr := play(append([]string{"check"}, files...)...); status != exitMet || stderr != "" {
		t.Errorf("check: %d, %s", status, stderr)
	} else if strings.Contains(stdout, "NaN") || strings.Contains(stdout, "Inf") {
		t.Errorf("a figure that is none:\n%s", stdout)
	}
}

func TestRank(t *testing.T) {
	of := func(x ...float64) (v vector) {
		for i, f := range x {
			if f != 0 {
				v = append(v, entry{i, f})
			}
		}
		return v
	}
	x, y, z := of(1), of(0, 1), of(0, 0, 1)
	for _, c := range []struct {
		list []vector
		want int
	}{
		{nil, 0}, {[]vector{z}, 1}, {[]vector{z, of(0, 0, -0.5)}, 1}, {[]vector{x, of(1, 1e-3)}, 2}, {[]vector{x, of(1, 1e-9)}, 1},
		{[]vector{x, y, of(1, 1)}, 2}, {[]vector{x, y, z, of(1, 2, 3)}, 3}, {[]vector{nil, x}, 1}, {[]vector{of(1, 2, 3), of(4, 5, 6), of(7, 8, 9)}, 2},
	} {
		if got := rank(c.list); got != c.want {
			t.Errorf("rank(%v) = %d, want %d", c.list, got, c.want)
		}
	}
}

func TestWrap(t *testing.T) {
	if got, want := wrap("one two  three four", 8, 2), "one two\n  three\n  four"; got != want {
		t.Errorf("%q, want %q", got, want)
	}
	if got := wrap("averylongword", 4, 2); got != "averylongword" {
		t.Errorf("%q", got)
	}
}

// A limit that rounding alone can break is said before the search, and only then.
func TestCheckLimitBelowRounding(t *testing.T) {
	dir := t.TempDir()
	for name, edit := range map[string][2]string{"rack-b.toml": {`limit = "0.1 %"`, `limit = "1 ppm"`}, "skerry.toml": {}, "x90.toml": {}} {
		text := read(t, filepath.Join("starter", name))
		if edit[0] != "" {
			edited := strings.Replace(text, edit[0], edit[1], 1)
			if edited == text {
				t.Fatalf("%s has no %s", name, edit[0])
			}
			text = edited
		}
		write(t, filepath.Join(dir, name), text)
	}
	if _, out, _ := play("check", filepath.Join(dir, "x90.toml")); !strings.Contains(strings.Join(strings.Fields(out), " "), "more than a fifth of ring_out by itself") {
		t.Errorf("no word of rounding:\n%s", out)
	}
	if _, out, _ := play("check", filepath.Join("starter", "x90.toml")); strings.Contains(out, "a fifth of") {
		t.Errorf("a word of rounding without a reason:\n%s", out)
	}
}
