package replay

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"reflect"
	"regexp"
	"slices"
	"strings"
	"testing"

	"holdfast/design/brief"
	"holdfast/design/device"
	"holdfast/hardware"
)

const pairProfile = `format = 1
[instrument]
name = "rack P (invented)"
sample_rate = "1 GS/s"
resolution = "14 bit"
block = 8
longest = 65536

[[channel]]
name = "q1 drive"
kind = "quadrature"
mixing = "I cos + Q sin"
full_scale = "40 MHz"
[[channel]]
name = "q2 drive"
kind = "quadrature"
mixing = "I cos + Q sin"
full_scale = "30 MHz"
[[channel]]
name = "q2 flux"
kind = "baseband"
full_scale = "20 MHz"
`

// A spin and a ladder of three levels 100 MHz below it.
const pairDevice = `format = 1
name = "Skerry pair (invented)"
[[site]]
name = "q1"
frequency = "5.1 GHz"
T1 = "60 us"
T2 = "40 us"
[[site]]
name = "q2"
levels = 3
frequency = "5.0 GHz"
anharmonicity = "-200 MHz"
T1 = "90 us"
[[coupling]]
kind = "exchange"
between = ["q1", "q2"]
strength = "3 MHz"
[[coupling]]
on = { q1 = "Z", q2 = "Z" }
strength = "0.4 MHz"
[[coupling]]
on = { q1 = "X", q2 = "X" }
strength = "2 MHz"
rotating_wave = true
[[drive]]
site = "q1"
channel = "q1 drive"
[[drive]]
site = "q2"
channel = "q2 drive"
[[bias]]
site = "q2"
channel = "q2 flux"
[[crosstalk]]
channel = "q1 drive"
site = "q2"
share = "3 %"
phase = "40 deg"
[[crosstalk]]
channel = "q2 flux"
site = "q1"
share = "-2 %"
`

const pairBrief = `format = 1
name = "test pulse"
profile = "elsewhere.toml"
device = "elsewhere.toml"
span = "24 ns"
[target]
gates = { q1 = "X90", q2 = "identity" }
up_to = "local rotations"
[[error]]
any = "one-body"
[[error]]
any = "leakage"
[[error]]
on = { q1 = "Z", q2 = "X" }
[[error]]
amplitude = "q1 drive"
[require]
infidelity = 1e-4
susceptibility = 1e-3
[[require.margin]]
error = "ZX on q1, q2"
size = "0.1 MHz"
`

// onPair puts operators of a spin and of a ladder of three levels together.
func onPair(a, b []complex128) []complex128 {
	m := make([]complex128, 36)
	for i := range 6 {
		for j := range 6 {
			m[i*6+j] = a[i/3*2+j/3] * b[i%3*3+j%3]
		}
	}
	return m
}

func dagger(m []complex128, n int) []complex128 {
	one, d := make([]complex128, n*n), make([]complex128, n*n)
	setIdentity(one, n)
	mulAdjointLeft(d, m, one, n)
	return d
}

// membersOf gives an error of a brief as loaders have it: which operators belong to a class is not replay's.
func membersOf(t testing.TB, profile, dev, text, name string) Class {
	t.Helper()
	dir := t.TempDir()
	for file, text := range map[string]string{"p.toml": profile, "d.toml": dev, "b.toml": text, "rates.csv": pairRates} {
		if err := os.WriteFile(filepath.Join(dir, file), []byte(text), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	p, err := hardware.Load(filepath.Join(dir, "p.toml"))
	if err != nil {
		t.Fatal(err)
	}
	d, err := device.Load(filepath.Join(dir, "d.toml"))
	if err != nil {
		t.Fatal(err)
	}
	b, err := brief.Load(filepath.Join(dir, "b.toml"))
	if err != nil {
		t.Fatal(err)
	}
	if err := b.Complete(p, d); err != nil {
		t.Fatal(err)
	}
	for _, e := range b.Errors {
		if e.Name != name {
			continue
		}
		c := Class{Name: name, Kind: "any", Held: true, Leak: e.Leak}
		for _, m := range e.Members {
			c.Operators, c.Names, c.Weights = append(c.Operators, m.Operator.Data), append(c.Names, m.Name), append(c.Weights, m.Weight)
		}
		return c
	}
	t.Fatalf("no error %q", name)
	return Class{}
}

// pairModel is what a record should make of the three files, by hand.
func pairModel(t testing.TB) *Model {
	t.Helper()
	const w1, w2 = 2 * math.Pi * 5.1, 2 * math.Pi * 5.0
	inf := math.Inf(1)
	s := complex(math.Sqrt2, 0)
	a, b := []complex128{0, 1, 0, 0}, []complex128{0, 1, 0, 0, 0, s, 0, 0, 0} // take a quantum out
	one2, one3 := []complex128{1, 0, 0, 1}, []complex128{1, 0, 0, 0, 1, 0, 0, 0, 1}
	x2, y2, z2 := []complex128{0, 1, 1, 0}, []complex128{0, -1i, 1i, 0}, []complex128{1, 0, 0, -1}
	x3 := add(b, 1, dagger(b, 3))
	y3 := add(scaledBy(dagger(b, 3), 1i), -1i, b)
	z3 := []complex128{0, 0, 0, 0, -2, 0, 0, 0, -4}
	turning := func(w float64, v []complex128) Rotating { // v e^(iwt) and its conjugate
		return Rotating{w, add(v, 1, dagger(v, 6)), add(scaledBy(v, 1i), -1i, dagger(v, 6))}
	}
	_, x := rounded(cosine(20, 24), 14)
	m := &Model{
		SamplePeriod: 1, Samples: 24, Bits: 14, Ends: "settled", Dim: 6, Sites: []int{2, 3}, CodeSpace: []int{0, 1, 3, 4},
		Static:   add(onPair(one2, []complex128{0, 0, 0, 0, 0, 0, 0, 0, -2 * math.Pi * 0.2}), 2*math.Pi*0.0004/2, onPair(z2, z3)),
		Rotating: []Rotating{turning(w1-w2, scaledBy(onPair(dagger(a, 2), b), 2*math.Pi*0.003))},
		Dropped: []Rotating{
			turning(w1-w2, scaledBy(onPair(dagger(a, 2), b), 2*math.Pi*0.002/2)),
			turning(w1+w2, scaledBy(onPair(dagger(a, 2), dagger(b, 3)), 2*math.Pi*0.002/2)),
		},
		Target: kron([][]complex128{rotation(math.Pi/2, 0), one2}),
	}
	m.LocalBefore = [][]complex128{rotation(0.3, 0.2), rotation(0.1, 1)}
	m.LocalAfter = [][]complex128{rotation(1.3, 0.2), rotationZ(0.4)}
	share, phase := 0.03, 40*math.Pi/180
	re, im := complex(share*math.Cos(phase), 0), complex(share*math.Sin(phase), 0)
	hx, hy := scaled(onPair(one2, x3), 0.5), scaled(onPair(one2, y3), 0.5)
	for i, ops := range [][][]complex128{
		{scaled(onPair(x2, one3), 0.5), scaled(onPair(y2, one3), 0.5)}, {hx, hy}, {add(scaled(onPair(one2, z3), 0.5), -0.01, onPair(z2, one3))},
	} {
		c := Channel{
			Name: []string{"q1 drive", "q2 drive", "q2 flux"}[i], Kind: []string{"quadrature", "quadrature", "baseband"}[i], FullScale: []float64{2 * math.Pi * 0.04, 2 * math.Pi * 0.03, 2 * math.Pi * 0.02}[i],
			Direct: 1, Operators: ops, MaxShare: 1, MaxSlew: inf, RingOut: inf, Samples: make([]complex128, 24),
		}
		if i == 0 {
			c.Samples = x
			c.Paths = []Path{{w1 - w2, [][]complex128{add(scaledBy(hx, re), im, hy), add(scaledBy(hy, re), -im, hx)}}}
		}
		m.Channels = append(m.Channels, c)
	}
	m.Errors = []Class{
		membersOf(t, pairProfile, pairDevice, pairBrief, "any one-body error"),
		membersOf(t, pairProfile, pairDevice, pairBrief, "any leakage"),
		{Name: "ZX on q1, q2", Kind: "static", Held: true, Operator: scaled(onPair(z2, x3), 0.5)},
		{Name: "amplitude", Kind: "amplitude", Held: true, Channels: []string{"q1 drive"}},
	}
	return m
}

// asRead takes a record's claims and codes from what was read, and empty lists where there are none.
func asRead(m *Model) *Model {
	o := *m
	o.Channels, o.Errors = slices.Clone(m.Channels), slices.Clone(m.Errors)
	for i := range o.Channels {
		o.Channels[i].Codes, o.Channels[i].Exact, o.Channels[i].Poles, o.Channels[i].Powers, o.Channels[i].Residues = nil, nil, nil, nil, nil
	}
	for i := range o.Errors {
		e := &o.Errors[i]
		e.Susceptibility, e.LeakSusceptibility, e.claimed, e.claimedLeak = 0, 0, false, false
	}
	o.FreeZBefore, o.FreeZAfter = nil, nil
	return &o
}

// pairFolder is writeFolderOf with a margin of two sites in the place of the one of one spin.
func pairFolder(t testing.TB, m *Model, v *Verdict, dev, text string) string {
	t.Helper()
	dir := writeFolderOf(t, m, v, pairProfile, dev, text)
	path := filepath.Join(dir, "pulse.toml")
	record, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	record = []byte(strings.Replace(string(record), `error = "detuning"`, `error = "ZX on q1, q2"`, 1))
	if err := os.WriteFile(path, record, 0o666); err != nil {
		t.Fatal(err)
	}
	return dir
}

// A record of two sites is read for what it is, borne out by inputs, judged, and agrees with what it claims.
func TestPairFolder(t *testing.T) {
	ctx := context.Background()
	m := pairModel(t)
	if err := m.Validate(); err != nil {
		t.Fatal(err)
	}
	direct, err := m.Judge(ctx, 1e-4)
	if err != nil {
		t.Fatal(err)
	}
	f, err := Open(pairFolder(t, m, direct, pairDevice, pairBrief))
	if err != nil {
		t.Fatal(err)
	}
	if got, want := asRead(f.Model), asRead(m); !reflect.DeepEqual(got, want) {
		t.Errorf("read %+v\nwant %+v", got, want)
	}
	if want := []Decay{{"q1", 60000, 40000}, {"q2", 90000, 0}}; !reflect.DeepEqual(f.Decay, want) || f.T1 != 0 || f.T2 != 0 {
		t.Errorf("times %+v, %g, %g", f.Decay, f.T1, f.T2)
	}
	v, err := Judge(ctx, f)
	if err != nil {
		t.Fatal(err)
	}
	if len(v.Inputs) != 0 || !v.Agreement.OK || v.Agreement.Infidelity > 1e-15 || v.Agreement.Susceptibility > 1e-15 {
		t.Errorf("inputs %v, agreement %+v", v.Inputs, v.Agreement)
	}
	if want := 24 * 4. / 5 * (1./4*(1./60000+2./40000) + 1./4*(1./90000+2./180000)); !(math.Abs(v.Decoherence-want) <= 1e-15) {
		t.Errorf("decoherence %.12g, want %.12g", v.Decoherence, want)
	}
	if v.Dropped == nil || v.Measure != "gate" || !math.IsNaN(v.Pair.Infidelity) || len(v.BringUp.Amplitude) != 0 {
		t.Errorf("%+v, %q, %v, %v", v.Dropped, v.Measure, v.Pair, v.BringUp)
	}
	known := false
	for _, r := range v.Requirements {
		known = known || r.Name == "margin against ZX on q1, q2" && r.Unit == "MHz"
	}
	if !known {
		t.Errorf("requirements %+v", v.Requirements)
	}
	// A claim of what leaks that is wrong is told.
	leak := *direct.Errors[1].LeakSusceptibility + 2e-5
	direct.Errors[1].LeakSusceptibility = &leak
	if f, err = Open(pairFolder(t, m, direct, pairDevice, pairBrief)); err != nil {
		t.Fatal(err)
	}
	if v, err = Judge(ctx, f); err != nil || v.Agreement.OK || v.Agreement.Worst.Figure != "leak susceptibility to any leakage" {
		t.Errorf("a wrong leak: %+v, %v", v.Agreement, err)
	}
}

const pairRates = "pauli,rate\nXI,0.3\nZZ,1.2\nIY,0\n"

// The same for states, without frequencies, with an error of crosstalk and one of learned rates, and for a class that a record need not list.
func TestPairStates(t *testing.T) {
	spins := regexp.MustCompile(`levels = 3\n|frequency.*\n|anharm.*\n|rotating_wave.*\n|(?s)\[\[crosstalk.*`).ReplaceAllString(pairDevice, "")
	text := regexp.MustCompile(`(?s)gates.*rotations"\n`).ReplaceAllString(pairBrief, "from = \"01\"\nto = \"W\"\n")
	text = strings.Replace(text, "[require]", "[[error]]\ncrosstalk = \"q1 drive\"\nsite = \"q2\"\n[[error]]\nany = \"all\"\nrates = \"rates.csv\"\n[[error]]\nany = \"all\"\n[require]", 1)
	text = strings.Replace(text, "[[error]]\nany = \"leakage\"\n", "", 1)
	m := pairModel(t)
	m.Dim, m.Sites, m.CodeSpace, m.Rotating, m.Dropped, m.LocalBefore, m.LocalAfter = 4, []int{2, 2}, []int{0, 1, 2, 3}, nil, nil, nil, nil
	m.Static = add(add(add(make([]complex128, 16), 2*math.Pi*0.003, add(flip(1, 2), 1, flip(2, 1))), 2*math.Pi*0.0004, pauli("ZZ")), 2*math.Pi*0.002, pauli("XX"))
	for i, names := range [][]string{{"X1", "Y1"}, {"1X", "1Y"}, {"1Z"}} {
		c := &m.Channels[i]
		c.Paths, c.Operators = nil, nil
		for _, name := range names {
			c.Operators = append(c.Operators, pauli(name))
		}
	}
	s := complex(math.Sqrt(0.5), 0)
	m.Target, m.From, m.To = nil, [][]complex128{label(4, 1)}, [][]complex128{{0, s, s, 0}}
	m.Errors = []Class{
		classOf("any one-body error", "1X", "1Y", "1Z", "X1", "Y1", "Z1"),
		{Name: "ZX on q1, q2", Kind: "static", Operator: pauli("ZX")},
		{Name: "amplitude", Kind: "amplitude", Channels: []string{"q1 drive"}},
		{Name: "q1 drive on q2", Kind: "crosstalk", Channels: []string{"q1 drive"}, Operators: [][]complex128{pauli("1X"), pauli("1Y")}},
		{Name: "any learned error", Kind: "any", Operators: [][]complex128{pauli("X1"), pauli("ZZ")}, Names: []string{"X1", "ZZ"}, Weights: []float64{math.Sqrt(0.4), math.Sqrt(1.6)}},
		{Name: "any static error", Kind: "any"},
	}
	for i := range m.Errors {
		m.Errors[i].Held = true
	}
	if err := m.Validate(); err != nil {
		t.Fatal(err)
	}
	ctx := context.Background()
	direct, err := m.Judge(ctx, 1e-4)
	if err != nil {
		t.Fatal(err)
	}
	// The rates lie beside the brief, with a hash.
	open := func(m *Model, rates bool) *Folder {
		t.Helper()
		dir := pairFolder(t, m, direct, spins, text)
		if err := os.WriteFile(filepath.Join(dir, "inputs", "rates.csv"), []byte(pairRates), 0o666); err != nil {
			t.Fatal(err)
		}
		if rates {
			names, err := hardware.HashFiles(dir, []string{"inputs/rates.csv"})
			if err != nil {
				t.Fatal(err)
			}
			f, err := os.OpenFile(filepath.Join(dir, "pulse.toml"), os.O_APPEND|os.O_WRONLY, 0)
			if err != nil {
				t.Fatal(err)
			}
			fmt.Fprintf(f, "[[file]]\nname = %q\nsha256 = %q\n", names[0].Name, names[0].SHA256)
			if err := f.Close(); err != nil {
				t.Fatal(err)
			}
		}
		f, err := Open(dir)
		if err != nil {
			t.Fatal(err)
		}
		return f
	}
	f := open(m, true)
	if got, want := asRead(f.Model), asRead(m); !reflect.DeepEqual(got, want) {
		t.Errorf("read %+v\nwant %+v", got, want)
	}
	v, err := Judge(ctx, f)
	if err != nil {
		t.Fatal(err)
	}
	if len(v.Inputs) != 0 || !v.Agreement.OK || v.Measure != "state" {
		t.Errorf("inputs %v, agreement %+v, measure %q", v.Inputs, v.Agreement, v.Measure)
	}
	seen := func(key string, m *Model, rates bool) {
		t.Helper()
		list, err := open(m, rates).differences()
		if err != nil || !slices.ContainsFunc(list, func(d Difference) bool { return d.Key == key }) {
			t.Errorf("%s: not seen in %v, %v", key, list, err)
		}
	}
	seen("file", m, false)
	change := func(do func(m *Model)) *Model {
		o := *m
		o.Errors = slices.Clone(m.Errors)
		do(&o)
		if err := o.Validate(); err != nil {
			t.Fatal(err)
		}
		return &o
	}
	seen("from[0][1]", change(func(o *Model) { o.From = [][]complex128{label(4, 2)} }), true)
	seen("to[0][0]", change(func(o *Model) { o.To = [][]complex128{label(4, 0)} }), true)
	seen("to", change(func(o *Model) {
		o.From, o.To = [][]complex128{label(4, 1), label(4, 0)}, [][]complex128{label(4, 1), label(4, 0)}
	}), true)
	seen("from", change(func(o *Model) { o.From, o.To, o.Target = nil, nil, unit(4) }), true)
	seen("error[3].operators[1][0][0]", change(func(o *Model) { o.Errors[3].Operators = [][]complex128{pauli("1X"), pauli("1Z")} }), true)
	seen("error[3].channel", change(func(o *Model) { o.Errors[3].Channels = []string{"q2 drive"} }), true)
	seen("error[4].weights[0]", change(func(o *Model) { o.Errors[4].Weights = []float64{1, 1} }), true)
	seen("error[4].operators", change(func(o *Model) { o.Errors[4] = Class{Name: "any learned error", Kind: "any", Held: true} }), true)
	seen("error[0].operators", change(func(o *Model) { o.Errors[0] = classOf("any one-body error", "1X", "1Y"); o.Errors[0].Held = true }), true)
	// All of the operators, listed or not, are the same class.
	all := classOf("any static error", paulis(2, 2)...)
	all.Held = true
	if list, err := open(change(func(o *Model) { o.Errors[5] = all }), true).differences(); err != nil || len(list) != 0 {
		t.Errorf("a list of all: %v, %v", list, err)
	}
}

// A record without a list stands for a class of a brief that has every operator, each as likely as the others, and for no other.
func TestAllMembers(t *testing.T) {
	d := &device.Device{Sites: []device.Site{{Levels: 2}}}
	e := brief.Error{Name: "any", Kind: brief.Any}
	for _, op := range [][]complex128{halfX, halfY, halfZ} {
		e.Members = append(e.Members, brief.Member{Name: "one", Operator: device.Matrix{N: 2, Data: op}, Weight: 1})
	}
	differ := func(e brief.Error) bool {
		c := &comparison{}
		w := c.wantedOf(e, nil, d)
		c.members("error[0].", &Class{}, &w)
		return len(c.list) > 0
	}
	if differ(e) {
		t.Error("all of them, alike: a list is missed")
	}
	few := e
	few.Members = e.Members[:2]
	leak := e
	leak.Leak = true
	unlike := e
	unlike.Members = slices.Clone(e.Members)
	unlike.Members[0].Weight, unlike.Members[1].Weight = math.Sqrt(1.5), math.Sqrt(0.5)
	for i, e := range []brief.Error{few, leak, unlike} {
		if !differ(e) {
			t.Errorf("case %d: no list is missed", i)
		}
	}
}

func unit(n int) []complex128 {
	m := make([]complex128, n*n)
	setIdentity(m, n)
	return m
}

// Whatever a record of two sites says otherwise than its inputs is told, by its key.
func TestPairDisagreement(t *testing.T) {
	for key, change := range map[string]func(m *Model){
		"rotating[0].frequency_rad_per_ns": func(m *Model) { m.Rotating[0].Frequency *= 1.001 },
		"rotating[0].cosine[1][3]":         func(m *Model) { m.Rotating[0].Cosine = scaled(m.Rotating[0].Cosine, 1.001) },
		"rotating[0].sine[1][3]":           func(m *Model) { m.Rotating[0].Sine = scaled(m.Rotating[0].Sine, -1) },
		"rotating":                         func(m *Model) { m.Rotating = nil },
		"dropped":                          func(m *Model) { m.Dropped = m.Dropped[:1] },
		"dropped[1].cosine[0][4]":          func(m *Model) { m.Dropped[1].Cosine = scaled(m.Dropped[1].Cosine, 1.001) },
		"sites":                            func(m *Model) { m.Sites = []int{3, 2} },
		"code_space":                       func(m *Model) { m.CodeSpace, m.Errors = []int{0, 1, 3, 5}, m.Errors[2:] },
		"target[0][0]":                     func(m *Model) { m.Target = unit(4) },
		"channel[0].path":                  func(m *Model) { m.Channels[0].Paths = nil },
		"channel[0].path[0].frequency_rad_per_ns": func(m *Model) { m.Channels[0].Paths[0].Frequency *= -1 },
		"channel[0].path[0].operators[1][0][1]":   func(m *Model) { m.Channels[0].Paths[0].Operators[1] = scaled(m.Channels[0].Paths[0].Operators[1], -1) },
		"channel[2].operators[0][0][0]":           func(m *Model) { m.Channels[2].Operators[0] = scaled(m.Channels[2].Operators[0], 1.001) },
		"error[0].names[2]":                       func(m *Model) { m.Errors[0].Names[2] = "another" },
		"error[0].weights[0]":                     func(m *Model) { m.Errors[0].Weights[0], m.Errors[0].Weights[1] = math.Sqrt(1.1), math.Sqrt(0.9) },
		"error[0].operators[1][0][1]":             func(m *Model) { m.Errors[0].Operators[1] = scaled(m.Errors[0].Operators[1], -1) },
		"error[1].leak":                           func(m *Model) { m.Errors[1].Leak = false },
		"error[2].operator[0][1]":                 func(m *Model) { m.Errors[2].Operator = scaled(m.Errors[2].Operator, 2) },
		"static_rad_per_ns[2][2]":                 func(m *Model) { m.Static[2*7] += 1e-4 },
	} {
		m := pairModel(t)
		change(m)
		if err := m.Validate(); err != nil {
			t.Fatal(key, err)
		}
		f, err := Open(pairFolder(t, m, &Verdict{}, pairDevice, pairBrief))
		if err != nil {
			t.Fatal(key, err)
		}
		list, err := f.differences()
		if err != nil || !slices.ContainsFunc(list, func(d Difference) bool { return d.Key == key && d.Recorded != d.Rebuilt }) {
			t.Errorf("%s: not seen in %v, %v", key, list, err)
		}
	}
	// Rotations that the brief does not leave free; a phase is none. Times that the device does not state.
	m := pairModel(t)
	text := strings.Replace(pairBrief, "up_to = \"local rotations\"\n", "", 1)
	for _, c := range []struct{ dev, want string }{{pairDevice, "local_before[0] local_before[1] local_after[0] local_after[1]"}, {strings.Replace(pairDevice, "T1 = \"90 us\"\n", "", 1), "local_after[1] decoherence"}, {strings.Replace(pairDevice, "90 us", "91 us", 1), "local_after[1] decoherence[1].t1_ns"}} {
		f, err := Open(pairFolder(t, m, &Verdict{}, c.dev, text))
		if err != nil {
			t.Fatal(err)
		}
		list, err := f.differences()
		if err != nil {
			t.Fatal(err)
		}
		var got []string
		for _, d := range list {
			got = append(got, d.Key)
		}
		if strings.Join(got, " ") != c.want {
			t.Errorf("found %q, want %q", got, c.want)
		}
		m.LocalBefore = [][]complex128{scaledBy(unit(2), 1i), unit(2)}
		m.LocalAfter[0] = unit(2)
	}
}

// Models by hand that make no sense: the key and what is wrong with it.
func TestInvalidPairs(t *testing.T) {
	tooMany := func(n int) []Rotating {
		var list []Rotating
		for i := range n {
			list = append(list, Rotating{float64(i + 1), make([]complex128, 36), make([]complex128, 36)})
		}
		return list
	}
	bad := hermitian(rand.New(rand.NewPCG(1, 1)), 6, 1)
	bad[1] += 1
	states := func(m *Model) {
		m.Target, m.LocalBefore, m.LocalAfter = nil, nil, nil
		m.From, m.To = [][]complex128{label(4, 0), label(4, 1)}, [][]complex128{label(4, 2), label(4, 3)}
	}
	many := func(m *Model, n int) {
		e := &m.Errors[0]
		e.Operators, e.Names, e.Weights = nil, nil, nil
		for i := range n {
			e.Operators, e.Names, e.Weights = append(e.Operators, m.Static), append(e.Names, fmt.Sprint(i)), append(e.Weights, 1)
		}
	}
	for _, c := range []struct {
		change func(m *Model)
		want   string
	}{
		{func(m *Model) { m.Sites = []int{6} }, `sites: found 1 sites; allowed: 2 to 6, and no list for one`},
		{func(m *Model) { m.Sites = []int{2, 2} }, `sites: found 4 basis states in all; allowed: 6`},
		{func(m *Model) { m.Sites = []int{6, 1} }, `sites: found a site of 1 levels`},
		{func(m *Model) { m.Sites = []int{17, 2} }, `sites: found a site of 17 levels`},
		{func(m *Model) { m.Sites = []int{2, 2, 2, 2, 2, 2, 2} }, `sites: found 7 sites`},
		{func(m *Model) { m.Rotating = tooMany(65) }, `rotating: found 65 terms; allowed: up to 64`},
		{func(m *Model) { m.Dropped = tooMany(65) }, `dropped: found 65 terms`},
		{func(m *Model) { m.Rotating[0].Frequency = 0 }, `rotating\[0\]\.frequency_rad_per_ns: found 0; allowed: above 0`},
		{func(m *Model) { m.Rotating[0].Frequency = 2e5 }, `rotating\[0\]\.frequency_rad_per_ns: found 200000`},
		{func(m *Model) { m.Dropped[1].Frequency = m.Dropped[0].Frequency }, `dropped\[1\]\.frequency_rad_per_ns: found .*; allowed: above 0 and above that of the term before`},
		{func(m *Model) { m.Rotating[0].Cosine = bad }, `rotating\[0\]\.cosine: found elements \(0, 1\) and \(1, 0\)`},
		{func(m *Model) { m.Rotating[0].Sine = m.Rotating[0].Sine[1:] }, `rotating\[0\]\.sine: found 35 elements; allowed: a Hermitian 6 x 6 matrix`},
		{func(m *Model) { m.Channels[0].Paths = make([]Path, 17) }, `channel\[0\]\.path: found 17 paths; allowed: up to 16`},
		{func(m *Model) { m.Channels[0].Paths[0].Frequency = 0 }, `channel\[0\]\.path\[0\]\.frequency_rad_per_ns: found 0; allowed: .* and not 0`},
		{func(m *Model) { m.Channels[0].Paths[0].Frequency = -2e5 }, `channel\[0\]\.path\[0\]\.frequency_rad_per_ns: found -200000`},
		{func(m *Model) { m.Channels[0].Paths[0].Operators = m.Channels[0].Paths[0].Operators[:1] }, `channel\[0\]\.path\[0\]\.operators: found 1 matrices; allowed: 2`},
		{func(m *Model) { m.Channels[2].Paths = []Path{{1, nil}} }, `channel\[2\]\.path\[0\]\.operators: found 0 matrices`},
		{func(m *Model) { m.Channels[0].Paths[0].Operators[1] = bad }, `channel\[0\]\.path\[0\]\.operators\[1\]: found elements`},
		{func(m *Model) { m.Target = nil }, `target: found 0 elements`},
		{func(m *Model) { states(m); m.Target = unit(4) }, `target: found a matrix beside from and to`},
		{func(m *Model) { states(m); m.From = nil }, `from: found 0 vectors; allowed: 1 to 4`},
		{func(m *Model) { states(m); m.To = m.To[:1] }, `to: found 1 vectors; allowed: as many as from has, 2`},
		{func(m *Model) { states(m); m.From[1] = m.From[0] }, `from: found vectors 0 and 1 whose product is \(1\+0i\)`},
		{func(m *Model) { states(m); m.To[1] = []complex128{0.6, 0.6, 0, 0} }, `to: found vectors 0 and 1|to: found vectors 1 and 1 whose product`},
		{func(m *Model) { states(m); m.To[0] = m.To[0][1:] }, `to: found 3 entries in vector 0; allowed: orthonormal vectors on the code space, 4 entries each`},
		{func(m *Model) { states(m); m.To[0][0] = complex(math.NaN(), 0) }, `to: found entry`},
		{func(m *Model) { states(m); m.FreeZAfter = []float64{0, 0} }, `free_z_after: found 2 angles; allowed: none beside from and to`},
		{func(m *Model) { m.LocalAfter = nil }, `local_after: found 0 matrices; allowed: one for each two-level site of a code space of 4`},
		{func(m *Model) { m.LocalBefore = m.LocalBefore[:1] }, `local_before: found 1 matrices`},
		{func(m *Model) { m.FreeZBefore = []float64{0, 0} }, `local_before: found 2 matrices; allowed: none beside free_z_before`},
		{func(m *Model) { l := m.LocalBefore; a := m.LocalAfter; states(m); m.LocalBefore, m.LocalAfter = l, a }, `local_before: found 2 matrices; allowed: none beside`},
		{func(m *Model) { m.LocalAfter[1] = []complex128{1, 0, 0, 2} }, `local_after\[1\]: found columns 1 and 1`},
		{func(m *Model) { m.Errors[0].Names = nil }, `error\[0\]\.operators: found 11 matrices, 0 names and 11 weights; allowed: as many of each, or none`},
		{func(m *Model) { m.Errors[0].Operators = nil }, `error\[0\]\.operators: found 0 matrices, 11 names`},
		{func(m *Model) { m.Errors[0].Operators[3] = bad }, `error\[0\]\.operators\[3\]: found elements`},
		{func(m *Model) { m.Errors[0].Operators[3] = unit(6) }, `error\[0\]\.operators\[3\]: found a multiple of the identity`},
		{func(m *Model) { m.Errors[0].Names[3] = m.Errors[0].Names[2] }, `error\[0\]\.names: found ".*" as name 3; allowed: a name of its own`},
		{func(m *Model) { m.Errors[0].Names[3] = "" }, `error\[0\]\.names: found ""`},
		{func(m *Model) { m.Errors[0].Weights[3] = 0 }, `error\[0\]\.weights: found 0; allowed: numbers above 0`},
		{func(m *Model) { m.Errors[0].Weights[3] = 1.001 }, `error\[0\]\.weights: found a root mean square of 1\.00009`},
		{func(m *Model) { many(m, 4097) }, `error\[0\]\.operators: found 4097 matrices; allowed: up to 4096`},
		{func(m *Model) { m.Errors[0].Leak = true }, `error\[0\]\.operators\[\d\]: found nothing between the code space and the other levels`},
		{func(m *Model) { m.Errors[2].Leak = true }, `error\[2\]\.leak: found true; allowed: none but of kind "any"`},
		{func(m *Model) { m.Errors[1] = Class{Name: "all", Kind: "any", Leak: true} }, `error\[1\]\.leak: found true`},
		{func(m *Model) {
			m.CodeSpace, m.Target = []int{0, 1, 2, 3, 4, 5}, unit(6)
			m.LocalBefore, m.LocalAfter = nil, nil
		}, `error\[1\]\.leak: found true`},
		{func(m *Model) {
			m.CodeSpace, m.Target, m.LocalBefore, m.LocalAfter, m.Errors = []int{0, 1, 2, 3, 4, 5}, unit(6), nil, nil, m.Errors[2:]
			m.Errors[0].claimedLeak = true
		}, `error\[0\]\.leak_susceptibility: found 0; allowed: none without levels outside`},
		{func(m *Model) { m.Errors[2] = Class{Name: "c", Kind: "crosstalk", Channels: []string{"q3"}} }, `error\[2\]\.channel: found \["q3"\]; allowed: the name of`},
		{func(m *Model) {
			m.Errors[2] = Class{Name: "c", Kind: "crosstalk", Channels: []string{"q1 drive"}, Operators: m.Errors[0].Operators[:1]}
		}, `error\[2\]\.operators: found 1 matrices; allowed: 2, one for each quadrature of "q1 drive"`},
		{func(m *Model) {
			m.Errors[2] = Class{Name: "c", Kind: "crosstalk", Channels: []string{"q2 flux"}, Operators: [][]complex128{bad}}
		}, `error\[2\]\.operators\[0\]: found elements`},
		{func(m *Model) {
			m.Errors[2] = Class{Name: "c", Kind: "crosstalk", Channels: []string{"q1 drive"}, Operators: [][]complex128{unit(6), make([]complex128, 36)}}
		}, `error\[2\]\.operators: found multiples of the identity`},
		{func(m *Model) { m.Errors[2].Kind = "noise" }, `error\[2\]\.kind: found "noise"; allowed: .*"crosstalk"`},
	} {
		m := pairModel(t)
		c.change(m)
		err := m.Validate()
		if err == nil || !regexp.MustCompile("^(?:"+c.want+")").MatchString(err.Error()) || strings.Contains(err.Error(), "\n") {
			t.Errorf("%v\nwant %s", err, c.want)
		}
	}
	// What all errors hold together is bounded too: 16 times 65 matrices of 64 levels.
	m := idle(6, 1)
	op := pauli("XXXXXX")
	for i := range 16 {
		e := Class{Name: fmt.Sprint("class ", i), Kind: "any"}
		for k := range 65 {
			e.Operators, e.Names, e.Weights = append(e.Operators, op), append(e.Names, fmt.Sprint(k)), append(e.Weights, 1)
		}
		m.Errors = append(m.Errors, e)
	}
	if err := m.Validate(); err == nil || !strings.HasPrefix(err.Error(), "error[15].operators: found 4259840 matrix elements up to here; allowed: up to 4194304") {
		t.Error(err)
	}
	m.Errors = m.Errors[:15]
	if err := m.Validate(); err != nil {
		t.Error(err)
	}
	m.Errors = []Class{{Name: "all", Kind: "any"}}
	if err := m.Validate(); err == nil || !strings.Contains(err.Error(), `found "any" with 64 levels; allowed: up to 16 levels, or a list of operators`) {
		t.Error(err)
	}
}

// Records of two sites from outside that make no sense: one sentence with file, line and key.
func TestMalformedPairs(t *testing.T) {
	m := pairModel(t)
	m.Errors = append(m.Errors, Class{Name: "c", Kind: "crosstalk", Channels: []string{"q1 drive"}, Operators: m.Errors[0].Operators[:2]})
	states := pairModel(t)
	states.Target, states.LocalBefore, states.LocalAfter = nil, nil, nil
	states.From, states.To = [][]complex128{label(4, 0)}, [][]complex128{label(4, 1)}
	for _, c := range []struct {
		m               *Model
		find, put, want string
	}{
		{m, `frequency_rad_per_ns = 0\.`, `frequency_rad_per_ns = -0.`, `pulse\.toml:\d+: model\.rotating\[0\]\.frequency_rad_per_ns: found -0\.6`},
		{m, `\ncosine = .*`, "", `pulse\.toml:\d+: model\.rotating\[0\]\.cosine: found nothing`},
		{m, `\nsine = `, "\nphase = 1\nsine = ", `pulse\.toml:\d+: model\.rotating\[0\]\.phase: found an unknown key`},
		{m, `\[\[model\.dropped\]\]\nfrequency`, "[[model.dropped]]\nFrequency", `pulse\.toml:\d+: model\.dropped\[0\]\.Frequency`},
		{m, `(?s)(\[\[model\.channel\.path\]\]\nfrequency_rad_per_ns = )[^\n]*`, "${1}0.0", `pulse\.toml:\d+: model\.channel\[0\]\.path\[0\]\.frequency_rad_per_ns: found 0; allowed`},
		{m, `(\[\[model\.channel\.path\]\]\n)`, "${1}share = 1\n", `pulse\.toml:\d+: model\.channel\[0\]\.path\[0\]\.share: found an unknown key`},
		{m, `\nsites = .*`, "\nsites = [2, 4]", `pulse\.toml:\d+: model\.sites: found 8 basis states`},
		{m, `\nsites = .*`, "\nsites = [2, 2.5]", `pulse\.toml:\d+: model\.sites: found 2\.5; allowed: whole numbers`},
		{m, `\nsites = .*`, "", `pulse\.toml:\d+: decoherence: found 2 tables, number 1 of site "q2"`},
		{m, `\nlocal_after = .*`, "", `pulse\.toml:\d+: model\.local_after: found nothing`},
		{m, `\nlocal_after = \[\[`, "\nlocal_after = [[[9, 0],", `pulse\.toml:\d+: model\.local_after: found 2 rows and 3|pulse\.toml:\d+: model\.local_after: found`},
		{m, `(?s)(names = .*?)\nweights = [^\n]*`, "${1}", `pulse\.toml:\d+: model\.error\[0\]\.weights: found nothing`},
		{m, `(names = )\["[^"]*"`, `${1}[1`, `pulse\.toml:\d+: model\.error\[0\]\.names: found`},
		{m, `(weights = )\[1\.0`, `${1}[-1.0`, `pulse\.toml:\d+: model\.error\[0\]\.weights: found -1`},
		{m, `leak = true`, `leak = 1`, `pulse\.toml:\d+: model\.error\[1\]\.leak: found 1`},
		{m, `(kind = "amplitude")`, "${1}\nleak = true", `pulse\.toml:\d+: model\.error\[3\]\.leak: found an unknown key`},
		{m, `(kind = "amplitude")`, "${1}\noperators = []", `pulse\.toml:\d+: model\.error\[3\]\.operators: found an unknown key`},
		{m, `(kind = "amplitude")`, "${1}\nleak_susceptibility = -1.0", `pulse\.toml:\d+: model\.error\[3\]\.leak_susceptibility: found -1`},
		{m, `(kind = "crosstalk"\nchannel = )"q1 drive"`, `${1}"q3 drive"`, `pulse\.toml:\d+: model\.error\[4\]\.channel: found \["q3 drive"\]`},
		{m, `(kind = "crosstalk")\nchannel = "q1 drive"`, `${1}`, `pulse\.toml:\d+: model\.error\[4\]\.channel: found nothing`},
		{m, `(kind = "crosstalk")`, "${1}\nnames = []", `pulse\.toml:\d+: model\.error\[4\]\.names: found an unknown key`},
		{m, `site = "q2"\nt1_ns`, "site = \"q1\"\nt1_ns", `pulse\.toml:\d+: decoherence\[1\]\.site: found "q1" again`},
		{m, `site = "q2"\nt1_ns`, "t1_ns", `pulse\.toml:\d+: decoherence: found 2 tables, number 1 of site ""`},
		{m, `site = "q2"\nt1_ns`, "site = \"q2\"\nt3_ns = 1.0\nt1_ns", `pulse\.toml:\d+: decoherence\[1\]\.t3_ns: found an unknown key`},
		{m, `\ntarget = \[.*`, "", `pulse\.toml:\d+: model\.target: found nothing`},
		{m, `\ntarget = \[.*`, "\nfrom = [[1, 0, 0, 0]]", `pulse\.toml:\d+: model\.to: found something else`},
		{states, `\nfrom = .*`, "", `pulse\.toml:\d+: model\.from: found something else; allowed: a list of vectors`},
		{states, `\nto = .*`, "\nto = [0, 1, 0, 0]", `pulse\.toml:\d+: model\.to: found something else as vector 0; allowed: a list of vectors`},
		{states, `\nto = .*`, "\nto = [[0, \"1\", 0, 0]]", `pulse\.toml:\d+: model\.to: found something else as entry 1 of vector 0`},
		{states, `\nto = .*`, "\nto = [[0, [1, 0, 0], 0, 0]]", `pulse\.toml:\d+: model\.to: found something else as entry 1 of vector 0`},
		{states, `\nto = .*`, "\nto = [[0, [nan, 0], 0, 0]]", `pulse\.toml:\d+: model\.to: found something else as entry 1 of vector 0`},
		{states, `\nto = .*`, "\nto = [[0, 0.5, 0, 0]]", `pulse\.toml:\d+: model\.to: found vectors 0 and 0 whose product is`},
		{states, `\nto = .*`, "\nto = [[0, 1, 0]]", `pulse\.toml:\d+: model\.to: found 3 entries in vector 0`},
		{states, `\nto = .*`, "\nto = [[0, 1, [0, 0], 0]]", `^$`}, // plain numbers will do
		{states, `\nto = (.*)`, "\nto = ${1}\ntarget = [[1, 0, 0, 0], [0, 1, 0, 0], [0, 0, 1, 0], [0, 0, 0, 1]]", `pulse\.toml:\d+: model\.target: found a matrix beside from and to`},
		{states, `\nfree_z_after = .*`, "\nfree_z_after = [0.0, 0.0]", `pulse\.toml:\d+: model\.free_z_after: found 2 angles`},
	} {
		dir := pairFolder(t, c.m, &Verdict{}, pairDevice, pairBrief)
		path := filepath.Join(dir, "pulse.toml")
		text, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		at := regexp.MustCompile(c.find).FindSubmatchIndex(text)
		if at == nil {
			t.Fatalf("nothing matches %q", c.find)
		}
		changed := slices.Concat(text[:at[0]], regexp.MustCompile(c.find).Expand(nil, []byte(c.put), text, at), text[at[1]:])
		if err := os.WriteFile(path, changed, 0o666); err != nil {
			t.Fatal(err)
		}
		_, err = Open(dir)
		got := ""
		if err != nil {
			got = err.Error()
		}
		if !regexp.MustCompile(c.want).MatchString(got) || strings.Contains(got, "\n") || len(got) > 900 {
			t.Errorf("%s: %s\nwant %s", c.find, got, c.want)
		}
	}
}
