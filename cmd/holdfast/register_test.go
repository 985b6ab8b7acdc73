package main

import (
	"context"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"holdfast/design"
	"holdfast/design/brief"
	"holdfast/design/device"
	"holdfast/hardware"
)

// pair is a brief for the two spins of the example, done in a moment; %s is its target, and what else it asks.
const pair = `format = 1
name = "pair"
profile = "rack-b-pair.toml"
device = "skerry-pair.toml"
span = "48 ns"
refine = false
%s
`

// newPair makes a folder with the example of two spins.
func newPair(t testing.TB) string {
	t.Helper()
	dir := filepath.Join(t.TempDir(), "lab")
	if status, _, stderr := play("start", "-pair", dir); status != exitMet {
		t.Fatalf("start -pair: %d, %s", status, stderr)
	}
	return dir
}

// mixed is a device of a ladder, a spin of one and a spin, with everything that a device of several sites may have.
const mixed = `format = 1
name = "mixed"
[[site]]
name = "q1"
levels = 4
anharmonicity = "-220 MHz"
higher = ["3 MHz"]
frequency = "5.1 GHz"
T1 = "60 us"
[[site]]
name = "q2"
kind = "spin"
levels = 3
code = [0, 2]
quadratic = "2 MHz"
frequency = "5.3 GHz"
zero = "upper"
[[site]]
name = "q3"
frequency = "5.1 GHz"
T1 = "50 us"
T2 = "30 us"
[[drive]]
site = "q1"
channel = "q1 drive"
[[drive]]
site = "q2"
channel = "q2 drive"
[[bias]]
site = "q3"
channel = "q3 flux"
[[coupling]]
kind = "exchange"
between = ["q1", "q3"]
strength = "2 MHz"
[[coupling]]
kind = "exchange"
between = ["q1", "q2"]
strength = "-3 MHz"
[[coupling]]
on = { q1 = "Z", q2 = "Z", q3 = "Z" }
strength = "20 kHz"
[[coupling]]
on = { q2 = "X", q3 = "X" }
strength = "40 kHz"
rotating_wave = true
[[crosstalk]]
channel = "q1 drive"
site = "q2"
share = "3 %"
phase = "40 deg"
[[crosstalk]]
channel = "q1 drive"
site = "q3"
share = "-1 %"
[[crosstalk]]
channel = "q3 flux"
site = "q2"
share = "2 %"
`

// The way of a first user of two spins, from nothing to a replayed pulse.
func TestPair(t *testing.T) {
	dir := newPair(t)
	at := func(name string) string { return filepath.Join(dir, name) }
	ours, demo := tree(t, dir), tree(t, filepath.Join("..", "..", "testdata", "skerry"))
	delete(ours, ".") // the folder itself
	if len(ours) != 3 {
		t.Errorf("start -pair writes %d files", len(ours))
	}
	for name, text := range ours {
		if demo[name] != text {
			t.Errorf("start -pair writes another %s than testdata/skerry has", name)
		}
		if !strings.Contains(text, "INVENTED DATA") && name != "sqrt-iswap.toml" {
			t.Errorf("%s does not say that it is invented", name)
		}
	}
	_, stdout, _ := play("start", "-pair", at("again"), "-json")
	mustHave(t, "start -json", stdout, `"files": [ "rack-b-pair.toml", "skerry-pair.toml", "sqrt-iswap.toml" ]`)
	_, stdout, _ = play("start", at("more"), "-pair")
	mustHave(t, "start -pair", stdout, "rack-b-pair.toml what the instrument", "Next: holdfast check "+at("more"), "holdfast design "+filepath.Join(at("more"), "sqrt-iswap.toml"))

	status, stdout, stderr := play("check", at("rack-b-pair.toml"), at("skerry-pair.toml"), at("sqrt-iswap.toml"))
	if status != exitMet || stderr != "" {
		t.Fatalf("check: %d, %s", status, stderr)
	}
	mustHave(t, "check", stdout, "2 sites, 4 levels in their product, of which 4 are the code space; 2 channels",
		"q1, q2 exchange, 5 MHz: J (a b' + a' b), of spins J (X X + Y Y)/2; stands still, as these sites state no frequency",
		`channel "q2 drive" of the hardware profile`, "target sqrt-iSWAP on q1, q2 span",
		"32: 32 of the gate; 12 are independent, the others follow from unitarity, the phase and the free rotations; against them 24 coefficients, 6 per quadrature",
		"I turns about +X and Q about +Y of q1,", "I turns about +X and Q about +Y of q2,", "rotations about Z of every site cost nothing before and after the gate")
	if strings.Contains(stdout, "oo few") || strings.Contains(stdout, "Hardly") {
		t.Errorf("check warns of an example that is found:\n%s", stdout)
	}

	pulse := at("pulse")
	status, stdout, stderr = play("design", at("sqrt-iswap.toml"), "-out", pulse)
	if status != exitMet || stderr != "" {
		t.Fatalf("design: %d, %s%s", status, stdout, stderr)
	}
	mustHave(t, "design", stdout, "sqrt-iSWAP on q1, q2, 40 ns, held against nothing.", "MET.", "No textbook pulse stands beside this one", "turn of q1 before the gate: ", "turn of q2 after the gate: ",
		"deg about Z")
	made := tree(t, pulse)
	for _, name := range []string{"q1-drive.npy", "q2-drive.npy", "q1-drive.csv", "q2-drive-arrives.npy", "inputs/device.toml"} {
		if made[name] == "" {
			t.Errorf("the pulse folder has no %s", name)
		}
	}
	status, replayed, stderr := play("replay", pulse, "-datasheet", at("page.html"))
	if status != exitMet || stderr != "" {
		t.Fatalf("replay: %d, %s", status, stderr)
	}
	if before, _, _ := strings.Cut(stdout, "\nsearch:"); before != replayed {
		t.Errorf("design and replay say different things:\n%s\n%s", stdout, replayed)
	}
	page := read(t, at("page.html"))
	if page != made[datasheetFile] {
		t.Errorf("replay -datasheet and design write different pages")
	}
	page = strings.ReplaceAll(page, "\u00a0", " ")
	for _, want := range []string{"Samples played of q1 drive", "Samples played of q2 drive", "What playback adds", "Decoherence by site", "No textbook pulse stands beside this one", "55 µs",
		"Coefficients of Q, q2 drive", "sum over the sites"} {
		if !strings.Contains(page, want) {
			t.Errorf("the page does not say %q", want)
		}
	}
	for _, not := range []string{"not computed", "At the bench", "Shapes of the rivals", "tail angle"} {
		if strings.Contains(page, not) {
			t.Errorf("the page says %q", not)
		}
	}

	// the angles of the page are those of the record, by site
	r, err := design.ReadRecord(pulse)
	if err != nil {
		t.Fatal(err)
	}
	for side, angles := range map[string][]float64{"before": r.Model.FreeZBefore, "after": r.Model.FreeZAfter} {
		for i, a := range angles {
			mustHave(t, "design", stdout, fmt.Sprintf("turn of q%d %s the gate: %.6f rad = %.4f deg about Z", i+1, side, a, a*180/math.Pi))
		}
	}
	var form struct {
		Target string
		Rivals []any
		Left   string `json:"rivals_left_out"`
	}
	_, stdout, _ = play("replay", "-json", pulse)
	if err := json.Unmarshal([]byte(stdout), &form); err != nil || form.Target != "sqrt-iSWAP on q1, q2" || len(form.Rivals) != 0 || form.Left == "" {
		t.Errorf("%+v, %v", form, err)
	}
}

// What a device of several sites is, against figures worked out by hand: an exchange turns at the difference of the frames, the product X X at difference and
// sum, Z Z Z not at all, and crosstalk at the difference.
func TestCheckMixedDevice(t *testing.T) {
	path := filepath.Join(t.TempDir(), "mixed.toml")
	write(t, path, mixed)
	status, stdout, stderr := play("check", path)
	if status != exitMet || stderr != "" {
		t.Fatalf("check: %d, %s", status, stderr)
	}
	// d/(d+1) T/4 (1/T1 + 2/T2), d = 8, T = 100 ns: q1 with T2 = 2 T1, q3 with its own
	one, three := 8./9*100./4*(1./60e3+1./60e3), 8./9*100./4*(1./50e3+2./30e3)
	mustHave(t, "check", stdout, "3 sites, 24 levels in their product, of which 8 are the code space; 3 channels",
		"the sum over the sites of d/(d+1) T/4 (1/T1 + 2/T2), d = 8 code states", fmt.Sprintf("adds %.3g", one), fmt.Sprintf("adds %.3g", three), fmt.Sprintf("adds %.3g", one+three),
		"with T2 = 2 T1, the longest that it can be", "is left out of every figure",
		`site "q1", 4 levels |0>, |1> levels 0 and 1; level 0 has the lowest energy ladder the 1-2 transition lies 220 MHz below the 0-1 one, and level n C(n,3) 3 MHz higher`,
		`site "q2", 3 levels |0>, |1> levels 0 and 2; level 0 has the highest energy spin s = 1, level 0 is m = +s; and 2 MHz (Sz^2 - s(s+1)/3)`,
		`site "q3", 2 levels |0> the lower of the two energies`, `turned by channel "q3 flux" of the hardware profile, about Z`,
		"q1, q3 exchange, 2 MHz: J (a b' + a' b), of spins J (X X + Y Y)/2; stands still, in the frames of these sites",
		"q1, q2 exchange, -3 MHz: J (a b' + a' b), of spins J (X X + Y Y)/2; turns at 200 MHz, in the frames",
		"q1, q2, q3 Z Z Z, 20 kHz: J Z Z Z/2; stands still, in the frames",
		"q2, q3 X X, 40 kHz: J X X/2; is left out where it turns, at 200 MHz, 10.4 GHz, in the frames",
		`"q1 drive" on q2 3 % of what it does to q1, at 40 deg; turns at 200 MHz in the frame of q2`, `"q1 drive" on q3 -1 % of what it does to q1`, `"q3 flux" on q2 2 % of what it does to q3`)
	for _, c := range []struct{ line, want string }{
		{"polynomial = [1, -0.25]", "about Z, by full scale times 1 s - 0.25 s^2, s the share that arrives"},
		{`loop = { highest = "5.4 GHz", bias = 0.1, full_scale = 0.05 }`, "by the flux through a loop: 5.4 GHz without flux, 0.1 quanta at rest, full scale adds 0.05, asymmetry 0"},
	} {
		mapped, _, _ := strings.Cut(mixed, "[[crosstalk]]")
		write(t, path, strings.Replace(mapped, `channel = "q3 flux"`, "channel = \"q3 flux\"\n"+c.line, 1))
		_, stdout, _ := play("check", path)
		mustHave(t, c.line, stdout, c.want)
	}
	write(t, path, mixed)
	for line := range strings.Lines(stdout) {
		if n := len([]rune(line)); n > 121 && !strings.Contains(line, path) {
			t.Errorf("a line of %d characters: %s", n, line)
		}
	}
	var form struct {
		Files []struct {
			Device deviceForm
		}
	}
	_, stdout, _ = play("check", "-json", path)
	if err := json.Unmarshal([]byte(stdout), &form); err != nil {
		t.Fatal(err)
	}
	d := form.Files[0].Device
	near := func(a number, b float64) bool { return math.Abs(float64(a)-b) <= 1e-9*math.Abs(b) }
	if d.Levels != 24 || d.CodeStates != 8 || !near(*d.Decoherence, one+three) || len(d.Couplings) != 4 || len(d.Crosstalk) != 3 || d.Sites[1].Code[1] != 2 ||
		!near(*d.Sites[0].Anharmonicity, -220) || !near(d.Sites[0].Higher[0], 3) || !near(*d.Sites[1].Quadratic, 2) || d.Sites[2].Kind != "" ||
		!d.Couplings[0].Still || d.Couplings[1].Still || !near(d.Couplings[1].Turning[0], 200) || !near(d.Couplings[1].Strength, -3) || !d.Couplings[2].Still ||
		!near(d.Couplings[3].Dropped[1], 10400) || strings.Join(d.Couplings[3].Axes, "") != "XX" || !near(d.Crosstalk[0].Phase, 40) || !near(d.Crosstalk[0].Turning, 200) || d.Crosstalk[1].Turning != 0 {
		t.Errorf("%s", stdout)
	}
}

// The count of equations: those that are asked are the rows of the search, as the record has them; those that are independent are worked out by hand. The rotations of
// single sites that leave a gate what it is, before and after together, are as many as the sites' rotations that the gate takes to such: for sqrt-iSWAP the turn
// about Z of both, for CNOT that about Z of the first and about X of the second, for SWAP all.
func TestCountOfRegisters(t *testing.T) {
	dir := newPair(t)
	path := filepath.Join(dir, "b.toml")
	write(t, filepath.Join(dir, "ladder.toml"), strings.Replace(strings.Replace(strings.ReplaceAll(read(t, filepath.Join(dir, "skerry-pair.toml")), `"upper"`, `"lower"`), "levels = 2 ", "levels = 3\nanharmonicity = \"-220 MHz\"\n#", 1), "strength = \"5 MHz\"", "strength = \"5 MHz\"", 1))
	const both = "[target]\nsites = [\"q1\", \"q2\"]\n"
	for _, c := range []struct {
		name, text         string
		asked, independent int
		design             bool // compare with a record
	}{
		{"sqrt-iSWAP", "hold = \"nothing\"\n" + both + "gate = \"sqrt-iSWAP\"\n", 32, 15, true},
		{"free after", "hold = \"nothing\"\n" + both + "gate = \"sqrt-iSWAP\"\nfree_z = \"after\"\n", 32, 13, false},
		{"free Z", "hold = \"nothing\"\n" + both + "gate = \"sqrt-iSWAP\"\nfree_z = \"both\"\n", 32, 12, false},
		{"CNOT, free Z", "hold = \"nothing\"\n" + both + "gate = \"CNOT\"\nfree_z = \"both\"\n", 32, 12, false},
		{"CNOT, local", "hold = \"nothing\"\n" + both + "gate = \"CNOT\"\nup_to = \"local rotations\"\n", 32, 15 - 12 + 2, true},
		{"sqrt-iSWAP, local", "hold = \"nothing\"\n" + both + "gate = \"sqrt-iSWAP\"\nup_to = \"local rotations\"\n", 32, 15 - 12 + 1, false},
		{"SWAP, local", "hold = \"nothing\"\n" + both + "gate = \"SWAP\"\nup_to = \"local rotations\"\n", 32, 15 - 12 + 6, false},
		{"one site", "hold = \"nothing\"\n[target]\nsite = \"q2\"\ngate = \"X90\"\nfree_z = \"both\"\n", 32, 15 - 3, false},
		{"a state", "hold = \"nothing\"\n[target]\nfrom = \"00\"\nto = \"W\"\n", 8, 6, true},
		{"a subspace", "hold = \"nothing\"\n[target]\nfrom = [\"00\", \"11\"]\nto = [\"01\", \"10\"]\n", 16, 8, false},
		{"one-body", both + "gate = \"CZ\"\n[[error]]\nany = \"one-body\"\n", 32 + 6*15, 15 + 6*15, true},
		{"contained", both + "gate = \"CZ\"\n[[error]]\nany = \"one-body\"\n[[error]]\ndetuning = \"q1\"\n[[error]]\ncollective = \"X\"\n[[error]]\non = { q1 = \"Z\", q2 = \"Z\" }\n[[error]]\noperator = \"Y\"\nsite = \"q2\"\n",
			32 + 10*15, 15 + 7*15, true},
		{"all", both + "gate = \"CZ\"\n[[error]]\nany = \"all\"\n[[error]]\noffset = \"q2 drive\"\n", 32 + 17*15, 15 + 15*15, false},
		{"all but one", both + "gate = \"CZ\"\n[[error]]\nany = \"all\"\nexcept = [{ q2 = \"Y\" }]\n[[error]]\noffset = \"q2 drive\"\n", 32 + 16*15, 15 + 15*15, false},
		{"amplitudes", both + "gate = \"CZ\"\n[[error]]\namplitude = \"q1 drive\"\n[[error]]\namplitude = \"q1 drive\"\nquadrature = \"I\"\n[[error]]\namplitude = \"q1 drive\"\nquadrature = \"Q\"\n" +
			"[[error]]\namplitude = \"q2 drive\"\nname = \"the other\"\n[[error]]\nquadrature_angle = \"q2 drive\"\n[[error]]\ncrosstalk = \"q1 drive\"\nsite = \"q2\"\n", 32 + 6*15, 15 + 5*15, true},
		{"a quadrature", both + "gate = \"CZ\"\n[[error]]\namplitude = \"q1 drive\"\n[[error]]\namplitude = \"q1 drive\"\nquadrature = \"I\"\n", 32 + 2*15, 15 + 2*15, false},
		{"default", both + "gate = \"CZ\"\n", 32 + 7*15, 15 + 7*15, false},
		{"state, held", "[target]\nfrom = \"00\"\nto = \"GHZ\"\n[[error]]\nany = \"one-body\"\n", 8 + 6*8, 6 + 6*6, true},
		{"ladder", "hold = \"nothing\"\n" + both + "gate = \"CZ\"\n", 48, 48 - 16 - 1, true},
		{"ladder, leakage", both + "gate = \"CZ\"\n[[error]]\nany = \"leakage\"\n[[error]]\ndetuning = \"q1\"\n", 48 + 16*16 + 15, 31 + 16*16 + 15, true},
	} {
		text := fmt.Sprintf(pair, "starts = 1\n"+c.text)
		if strings.HasPrefix(c.name, "ladder") {
			text = strings.Replace(text, "skerry-pair", "ladder", 1)
		}
		write(t, path, text)
		b, p, d, err := brief.LoadAll(path)
		if err != nil {
			t.Errorf("%s: %v", c.name, err)
			continue
		}
		r, err := roomOf(b, p, d, []int{0, 1}, 48)
		if err != nil || r.equations != c.asked || r.independent != c.independent || r.together != 28 {
			t.Errorf("%s: %d equations, %d independent, %d coefficients; want %d, %d, 28: %v", c.name, r.equations, r.independent, r.together, c.asked, c.independent, err)
		}
		if !c.design {
			continue
		}
		ctx, cancel := context.WithCancel(context.Background())
		cancel() // the rows are known before the first start
		made, err := design.Run(ctx, design.Inputs{Brief: b, Profile: p, Device: d}, nil)
		if err != nil {
			t.Errorf("%s: %v", c.name, err)
		} else if n := made.Record.Search.Equations; n != r.equations {
			t.Errorf("%s: check counts %d equations, the search %d", c.name, r.equations, n)
		}
	}
}

// What a brief on several sites says, and what it warns of.
func TestCheckRegisterBriefs(t *testing.T) {
	dir := newPair(t)
	path := filepath.Join(dir, "b.toml")
	write(t, filepath.Join(dir, "rates.csv"), "pauli,rate\nIX,1e-4\nZZ,4e-4\nXX,0\n")
	three := read(t, filepath.Join(dir, "skerry-pair.toml")) + "\n[[site]]\nname = \"q3\"\n"
	write(t, filepath.Join(dir, "three.toml"), three)
	const both = "[target]\nsites = [\"q1\", \"q2\"]\n"
	for _, c := range []struct {
		name, text string
		wanted     []string
		not        string
	}{
		{"local", "hold = \"nothing\"\n" + both + "gate = \"CNOT\"\nup_to = \"local rotations\"\n", []string{"target CNOT on q1, q2, up to local rotations span",
			"free every rotation of a single site costs nothing before and after the gate"}, "free Z"},
		{"products", "hold = \"nothing\"\n[target]\ngates = { q1 = \"X90\", q2 = \"identity\" }\n", []string{"target X90, identity on q1, q2 span"}, ""},
		{"controlled", "hold = \"nothing\"\n" + both + "controlled = \"X90\"\n", []string{"target controlled X90 on q1, q2 span"}, ""},
		{"one of three", "hold = \"nothing\"\n[target]\nsite = \"q2\"\ngate = \"X90\"\n", []string{"target X90 on q2: 90 deg about (1, 0, 0); to be left alone: q1, q3 span", "63 are independent"}, ""},
		{"state", "hold = \"nothing\"\n[target]\nfrom = \"00\"\nto = \"GHZ\"\n", []string{"target 00 to GHZ, states of q1, q2 span", "8: 8 of the gate; 6 are independent, the others follow from the span that is meant"}, ""},
		{"subspace", "hold = \"nothing\"\n[target]\nfrom = [\"00\", \"01\"]\nto = [\"00\", \"10\"]\n", []string{"target 00, 01 to 00, 10, the span of these 2 states of q1, q2 to that of the others span"}, ""},
		{"default", both + "gate = \"CZ\"\n", []string{"amplitude up to 3 %, any one-body error (6 operators) up to 1 MHz (the brief names none, so these)",
			"137: 32 of the gate and 105 of the errors; 120 are independent, the others follow from unitarity and the phase;",
			"Too few coefficients: 120 equations want more than 120, and the span carries 28. Expect 'not found'"}, ""},
		{"rates", both + "gate = \"CZ\"\n[[error]]\nany = \"all\"\nrates = \"rates.csv\"\n[[error]]\ncrosstalk = \"q1 drive\"\nsite = \"q2\"\n",
			[]string{"any learned error (2 operators, weighed by rates.csv) up to 1 MHz, q1 drive on q2 up to 1 %"}, ""},
		{"too few", "hold = \"nothing\"\nbasis = { coefficients = 3 }\n" + both + "gate = \"CZ\"\nfree_z = \"both\"\n", []string{"Too few coefficients: 13 equations want more than 13, and the span carries 12"}, ""},
		{"hardly enough", "hold = \"nothing\"\nbasis = { coefficients = 4 }\n" + both + "gate = \"CZ\"\n", []string{"Hardly enough coefficients: 15 equations and the ring-out limit are easy with more than 19, and the span carries 16"}, ""},
		{"enough", "hold = \"nothing\"\nbasis = { coefficients = 5 }\n" + both + "gate = \"CZ\"\n", []string{"15 are independent"}, "coefficients:"},
		{"lowered", both + "gate = \"CZ\"\n[[error]]\ndetuning = \"q1\"\norder = 2\n[[error]]\ndetuning = \"q2\"\nname = \"b\"\nsize = \"2 MHz\"\nspread = \"average\"\n" +
			"[[error]]\namplitude = \"q1 drive\"\nspread = \"worst\"\nvalues = [\"-1 %\", \"2 %\"]\n[[error]]\non = { q1 = \"Z\", q2 = \"Z\" }\nname = \"c\"\nnoise = { form = \"lorentzian\", sigma = \"50 kHz\", correlation_time = \"2 us\" }\n" +
			"[[error]]\namplitude = \"q2 drive\"\nname = \"d\"\nnoise = { form = \"white\", sigma = \"2 %\", high = \"1 MHz\" }\n",
			[]string{"detuning up to 3 MHz to second order, b, the average over a spread of 2 MHz, amplitude, the worst over 2 sizes, c, noise of 50 kHz rms, d, noise of 2 % rms",
				"47: 32 of the gate and 15 of the errors; 30 are independent, the others follow from unitarity and the phase; second orders, spreads and noise are not counted; against them 28"}, ""},
		{"a margin", both + "gate = \"CZ\"\n[[error]]\ncrosstalk = \"q2 drive\"\nsite = \"q1\"\n[[require.margin]]\nerror = \"q2 drive on q1\"\nsize = \"2 %\"\n", []string{"up to ±2 % of q2 drive on q1"}, ""},
	} {
		text := fmt.Sprintf(pair, c.text)
		if c.name == "one of three" {
			text = strings.Replace(text, "skerry-pair", "three", 1)
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

	// decoherence is that of all sites: 4/5 T/4 sum (1/T1 + 2/T2)
	loss := 4. / 5 * 48. / 4 * (1./60e3 + 2./40e3 + 1./55e3 + 2./35e3)
	write(t, path, fmt.Sprintf(pair, "hold = \"nothing\"\n"+both+"gate = \"CZ\"\n"))
	_, stdout, _ := play("check", path)
	mustHave(t, "check", stdout, fmt.Sprintf("adds %.3g to the infidelity in this span on all sites", loss), fmt.Sprintf("Decoherence alone costs %.3g", loss))
	var form struct{ Files []struct{ Brief briefForm } }
	_, stdout, _ = play("check", "-json", path)
	if err := json.Unmarshal([]byte(stdout), &form); err != nil {
		t.Fatal(err)
	}
	if b := form.Files[0].Brief; !(math.Abs(float64(b.Decoherence)-loss) <= 1e-12) || b.Site != "" || !slices.Equal(b.Sites, []string{"q1", "q2"}) || b.FreeZ != "none" || b.Local || len(b.Axis) != 0 ||
		!strings.Contains(stdout, `"angle_rad": null`) {
		t.Errorf("%s", stdout)
	}

	// a transition that is not where its carrier and its detuning put it is told by site
	rack, file := filepath.Join(dir, "rack-b-pair.toml"), filepath.Join(dir, "skerry-pair.toml")
	write(t, rack, strings.ReplaceAll(read(t, rack), `kind = "quadrature"`, "kind = \"quadrature\"\ncarrier = \"5 GHz\""))
	write(t, file, strings.NewReplacer(`name = "q1"`, "name = \"q1\"\nfrequency = \"5 GHz\"", `name = "q2"`, "name = \"q2\"\nfrequency = \"5.2 GHz\"").Replace(read(t, file)))
	_, stdout, _ = play("check", path)
	mustHave(t, "check", stdout, "The transition of q2, 5.2 GHz, lies 200 MHz above the carrier, 5 GHz")
	if strings.Contains(stdout, "The transition of q1") {
		t.Errorf("warns of q1:\n%s", stdout)
	}
}

// A card is that of one site by itself: of the pair it is refused, whose exchange swaps what the drive brings up, and of sites that hardly feel one another
// it is that of the same site in a file of its own.
func TestCardOfSeveralSites(t *testing.T) {
	dir := newPair(t)
	at := func(name string) string { return filepath.Join(dir, name) }
	card := func(device string, args ...string) (int, string, string) {
		return play(append([]string{"card", at("rack-b-pair.toml"), at(device), "-out", at("card"), "-force"}, args...)...)
	}
	text := read(t, at("skerry-pair.toml"))
	bare, _, _ := strings.Cut(text, "\n# The spins exchange")
	write(t, at("apart.toml"), bare)
	far := strings.NewReplacer(`name = "q1"`, "name = \"q1\"\nfrequency = \"5.1 GHz\"", `name = "q2"`, "name = \"q2\"\nfrequency = \"5.3 GHz\"", "5 MHz\"", "2 MHz\"\n[[crosstalk]]\nchannel = \"q2 drive\"\nsite = \"q1\"\nshare = \"2 %\"").Replace(text)
	write(t, at("far.toml"), far)
	write(t, at("alone.toml"), "format = 1\nname = \"Skerry\"\n[[site]]\nname = \"q2\"\nzero = \"upper\"\nT1 = \"55 us\"\nT2 = \"35 us\"\n[[drive]]\nsite = \"q2\"\nchannel = \"q2 drive\"\n")
	write(t, at("levels.toml"), strings.Replace(strings.ReplaceAll(text, `"upper"`, `"lower"`), "levels = 2\n", "levels = 3\nanharmonicity = \"-220 MHz\"\n", 1))
	for _, c := range []struct {
		device string
		args   []string
		says   string
	}{
		{"skerry-pair.toml", nil, `found 2 drives, "q1 drive", "q2 drive"; allowed: a card for one of them, as in -channel "q1 drive"`},
		{"skerry-pair.toml", []string{"-channel", "q3 drive"}, `-channel: found "q3 drive"; allowed: a drive of ` + at("skerry-pair.toml") + ` through a mixer, "q1 drive", "q2 drive"`},
		{"skerry-pair.toml", []string{"-channel", "q2 drive"}, `channel "q2 drive": found couplings or crosstalk that move the populations of q2 by up to 0.`},
		{"levels.toml", []string{"-channel", "q2 drive"}, `found a site of 3 levels, "q2"; allowed: a card for a site of two`},
		{"alone.toml", []string{"-channel", "q1 drive"}, `-channel: found "q1 drive"`},
	} {
		before := tree(t, dir)
		status, stdout, stderr := card(c.device, c.args...)
		if status != exitBadInput || stdout != "" {
			t.Errorf("%s %v: %d, %q", c.device, c.args, status, stdout)
		}
		mustBeOneLine(t, stderr, c.says)
		if d := compare(before, tree(t, dir)); d != nil {
			t.Errorf("%s %v changed %v", c.device, c.args, d)
		}
	}
	populations := func(text string) string {
		_, table, _ := strings.Cut(text, "\nPopulations of |1>")
		table, _, _ = strings.Cut(table, "the carrier was not moved")
		return table
	}
	_, alone, _ := card("alone.toml")
	for _, device := range []string{"apart.toml", "far.toml"} {
		status, stdout, stderr := card(device, "-channel", "q2 drive")
		if status != exitMet || stderr != "" {
			t.Fatalf("%s: %d, %s", device, status, stderr)
		}
		mustHave(t, "card", stdout, `channel "q2 drive" of "rack B, positions 3 and 4" drives site "q2" of "Skerry"`, `This is the table of site "q2" by itself, with all 2 sites in |0> first`)
		if populations(stdout) != populations(alone) || populations(alone) == "" {
			t.Errorf("%s: another table than that of the site in a file of its own:\n%s\n%s", device, stdout, alone)
		}
	}
	if strings.Contains(alone, "by itself") {
		t.Errorf("the card of one site speaks of others:\n%s", alone)
	}
	var form struct {
		Moved float64 `json:"moved_by_other_sites"`
	}
	_, stdout, _ := card("far.toml", "-channel", "q2 drive", "-json")
	if err := json.Unmarshal([]byte(stdout), &form); err != nil || !(form.Moved > 1e-5 && form.Moved <= aloneWithin) {
		t.Errorf("moved by %g, %v", form.Moved, err)
	}
}

// The whole device against the site by itself: uncoupled they agree, at any detuning that the file states, and a coupling J Z Z/2 to a site in |0> is
// a detuning of J.
func TestWholeBench(t *testing.T) {
	load := func(text string) *bench {
		path := filepath.Join(t.TempDir(), "d.toml")
		write(t, path, text)
		p, err := hardware.Load("starter/rack-b-pair.toml")
		if err != nil {
			t.Fatal(err)
		}
		d, err := device.Load(path)
		if err != nil {
			t.Fatal(err)
		}
		b, err := newBench(p, d, "q2 drive")
		if err != nil {
			t.Fatal(err)
		}
		b.detuning = 0.002
		return b
	}
	text := read(t, "starter/skerry-pair.toml")
	bare, _, _ := strings.Cut(text, "\n# The spins exchange")
	shifted := strings.Replace(bare, `name = "q2"`, "name = \"q2\"\ndetuning = \"7 MHz\"", 1)
	const J = "600 kHz"
	coupled := bare + "\n[[coupling]]\non = { q1 = \"Z\", q2 = \"Z\" }\nstrength = \"" + J + "\"\n"
	for name, c := range map[string]struct {
		text   string
		beyond float64 // GHz
	}{
		"apart": {bare, 0}, "stated detuning": {shifted, 0}, "Z Z": {coupled, 0.0006},
		"Z Z, lower": {strings.ReplaceAll(coupled, `"upper"`, `"lower"`), -0.0006},
	} {
		b := load(c.text)
		list, err := b.sequences()
		if err != nil {
			t.Fatal(err)
		}
		moved := 0.0
		for i := range 4 {
			whole, err := b.whole(list[i%3].codes, i == 3)
			if err != nil {
				t.Fatal(err)
			}
			found, err := b.excited(context.Background(), whole)
			if err != nil {
				t.Fatal(err)
			}
			read := func(f float64) float64 {
				m, err := b.model(b.stated(), f, list[i%3].codes, i == 3)
				if err != nil {
					t.Fatal(err)
				}
				p, err := population(context.Background(), m)
				if err != nil {
					t.Fatal(err)
				}
				return p
			}
			if want := read(b.detuning + c.beyond); !(math.Abs(found-want) <= 1e-9) {
				t.Errorf("%s: population %d is %v with the whole device, %v with the site alone", name, i, found, want)
			}
			moved = math.Max(moved, math.Abs(found-read(b.detuning)))
		}
		if c.beyond != 0 && !(moved > 1e-3) {
			t.Errorf("%s: the coupling moves nothing", name)
		}
	}
}

// States, local rotations, and what a model leaves out, on the terminal and on the page.
func TestRegisterSheets(t *testing.T) {
	dir := newPair(t)
	at := func(name string) string { return filepath.Join(dir, name) }
	write(t, at("apart.toml"), strings.NewReplacer(`name = "q1"`, "name = \"q1\"\nfrequency = \"5.1 GHz\"", `name = "q2"`, "name = \"q2\"\nfrequency = \"5.3 GHz\"", "5 MHz\"", "2 MHz\"\nrotating_wave = true").
		Replace(read(t, at("skerry-pair.toml"))))
	for _, c := range []struct {
		name, text    string
		text1, onPage []string
	}{
		{"ghz", "hold = \"nothing\"\n[target]\nfrom = \"00\"\nto = \"GHZ\"\n", []string{"00 to GHZ on q1, q2, 48 ns", "infidelity of the state"}, []string{"of the state, without any error"}},
		{"cnot", "hold = \"nothing\"\n[target]\nsites = [\"q1\", \"q2\"]\ngate = \"CNOT\"\nup_to = \"local rotations\"\n", []string{"turn of q1 before the gate: ", " Y ", "turn of q2 after the gate"},
			[]string{"What playback adds", "before the gate", "deg about "}},
		{"far", "hold = \"nothing\"\n[target]\ngates = { q1 = \"X90\", q2 = \"identity\" }\nfree_z = \"both\"\n[require]\ninfidelity = 1e-3\n",
			[]string{"with the rotating terms put back that the model leaves out: infidelity "}, []string{"The model leaves out what turns at 200 MHz in the frames of the sites", "Put back, it makes the infidelity", "with what is left out"}},
	} {
		text := fmt.Sprintf(pair, c.text)
		switch c.name {
		case "far":
			text = strings.Replace(text, "skerry-pair", "apart", 1)
		case "cnot":
			text = strings.Replace(text, "48 ns", "64 ns", 1)
		}
		write(t, at(c.name+".toml"), text)
		status, stdout, stderr := play("design", at(c.name+".toml"), "-out", at(c.name))
		if status != exitMet || stderr != "" {
			t.Errorf("%s: %d, %s%s", c.name, status, stdout, stderr)
			continue
		}
		mustHave(t, c.name, stdout, c.text1...)
		page := strings.ReplaceAll(read(t, filepath.Join(at(c.name), datasheetFile)), "\u00a0", " ")
		for _, want := range c.onPage {
			if !strings.Contains(page, want) {
				t.Errorf("%s: the page does not say %q", c.name, want)
			}
		}
	}

	// what is told of the rotations makes the gate that the record tells
	r, err := design.ReadRecord(at("cnot"))
	if err != nil {
		t.Fatal(err)
	}
	d, err := device.Load(at("skerry-pair.toml"))
	if err != nil {
		t.Fatal(err)
	}
	told := turns(r, d)
	if len(told) != 4 {
		t.Fatalf("%d rotations", len(told))
	}
	for _, x := range told {
		var angle, degrees float64
		var axis [3]float64
		if _, err := fmt.Sscanf(strings.ReplaceAll(x.words, "- ", "+ -"), "%f rad = %f deg about %f X + %f Y + %f Z", &angle, &degrees, &axis[0], &axis[1], &axis[2]); err != nil {
			t.Fatalf("%q: %v", x.words, err)
		}
		rows := r.Model.LocalBefore
		if x.after {
			rows = r.Model.LocalAfter
		}
		product := device.Zero(2)
		for i := range 2 {
			for j := range 2 {
				z := rows[x.site][i][j]
				product.Data[2*i+j] = complex(z[0], z[1])
			}
		}
		overlap := device.Rotation(axis, angle).Adjoint().Mul(product).Trace()
		if size := math.Hypot(real(overlap), imag(overlap)); !(math.Abs(size-2) <= 1e-5) || !(math.Abs(degrees-angle*180/math.Pi) <= 1e-3) {
			t.Errorf("%q is not the rotation of the record", x.words)
		}
	}
}

// A device of several sites is told of what it is held against by default.
func TestRegisterByDefault(t *testing.T) {
	dir := newPair(t)
	path := filepath.Join(dir, "b.toml")
	write(t, path, fmt.Sprintf(pair, "starts = 1\n[target]\nsites = [\"q1\", \"q2\"]\ngate = \"CZ\"\n"))
	_, stdout, stderr := play("design", path, "-out", filepath.Join(dir, "pulse"))
	mustHave(t, "design", stdout, "The brief names no [[error]]: held against amplitude and any one-body error.", "any one-body error (held, 6 operators)", "not found")
	if stderr != "" {
		t.Errorf("stderr: %s", stderr)
	}
	if _, err := os.Stat(filepath.Join(dir, "pulse", datasheetFile)); err != nil {
		t.Error(err)
	}
}
