package replay

import (
	"bytes"
	"context"
	"crypto/sha256"
	"encoding/hex"
	"math"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

// goodFolder writes the test pulse with a claim that is true.
func goodFolder(t testing.TB) (dir string, m *Model, v *Verdict) {
	t.Helper()
	m = testModel()
	v, err := m.Judge(context.Background(), 1e-4)
	if err != nil {
		t.Fatal(err)
	}
	return writeFolder(t, m, v), m, v
}

func TestJudgeFolder(t *testing.T) {
	dir, m, direct := goodFolder(t)
	f, err := Open(dir)
	if err != nil {
		t.Fatal(err)
	}
	if f.Name != "test pulse" || f.T1 != 60000 || f.T2 != 40000 || f.Model.Samples != 32 {
		t.Errorf("read %q, T1 %g, T2 %g, %d samples", f.Name, f.T1, f.T2, f.Model.Samples)
	}
	for k, x := range f.Model.Channels[0].Samples {
		if x != m.Channels[0].Samples[k] {
			t.Errorf("sample %d is %v, want %v", k, x, m.Channels[0].Samples[k])
		}
	}
	v, err := Judge(context.Background(), f)
	if err != nil {
		t.Fatal(err)
	}
	if v.Settled != direct.Settled || v.Window != direct.Window || v.TailAngle != direct.TailAngle || v.Pair != direct.Pair {
		t.Errorf("from the folder %+v %+v, directly %+v %+v", v.Settled, v.Window, direct.Settled, direct.Window)
	}
	if !v.Agreement.OK || v.Agreement.Infidelity > 1e-20 || v.Agreement.Susceptibility > 1e-15 {
		t.Errorf("agreement %+v", v.Agreement)
	}
	if len(v.Inputs) != 0 {
		t.Errorf("inputs differ: %v", v.Inputs)
	}
	if want := 32. / 6 * (1./60000 + 2./40000); !(math.Abs(v.Decoherence-want) <= 1e-15) {
		t.Errorf("decoherence %g, want %g", v.Decoherence, want)
	}
	if len(v.Errors) != 5 || len(v.Requirements) != 2 || len(v.Warnings) != 0 {
		t.Errorf("%d errors, %d requirements, warnings %q", len(v.Errors), len(v.Requirements), v.Warnings)
	}
	if r := v.Requirements[1]; r.Name != "margin against detuning" || !(math.Abs(r.Allowed-0.1) <= 1e-12) || r.Unit != "MHz" || !r.Met || !(r.Found > 0.1) {
		t.Errorf("margin %+v", r)
	}
	if v.Met() { // the raised cosine rings longer than rack B allows, and nothing else is wrong
		t.Errorf("the ring-out limit is not seen")
	}
	for _, l := range v.Limits {
		if l.OK == (l.Limit == ringOut) {
			t.Errorf("limit %+v", l)
		}
	}
	if b := f.Model.BeforeRounding(); b == nil || b.Channels[0].Samples[5] != m.Channels[0].Samples[5] {
		t.Errorf("samples before rounding not read")
	}
}

// A wrong claim is told, and the sign of the mixer, the line and the limits of the profile too.
func TestDisagreement(t *testing.T) {
	m := testModel()
	v, err := m.Judge(context.Background(), 1e-4)
	if err != nil {
		t.Fatal(err)
	}
	reopened := func(m *Model, v *Verdict) *Verdict {
		t.Helper()
		f, err := Open(writeFolder(t, m, v))
		if err != nil {
			t.Fatal(err)
		}
		got, err := Judge(context.Background(), f)
		if err != nil {
			t.Fatal(err)
		}
		return got
	}
	for name, change := range map[string]func(v *Verdict){
		"infidelity, settled":                   func(v *Verdict) { v.Settled.Infidelity += 2e-9 },
		"infidelity, in the window":             func(v *Verdict) { v.Window.Infidelity += 2e-9; v.Settled.Infidelity += 1e-9 },
		"tail angle in rad":                     func(v *Verdict) { v.TailAngle += 2e-4 },
		"susceptibility to " + v.Errors[1].Name: func(v *Verdict) { v.Errors[1].Susceptibility += 2e-5 },
	} {
		wrong := *v
		wrong.Errors = append([]Error(nil), v.Errors...)
		change(&wrong)
		if got := reopened(m, &wrong); got.Agreement.OK || got.Met() {
			t.Errorf("%s: a wrong claim passes: %+v", name, got.Agreement)
		} else if w := got.Agreement.Worst; w.Figure != name || !(math.Abs(math.Abs(w.Found-w.Recorded)/w.Allowed-2) <= 0.01) {
			t.Errorf("%s: the worst disagreement is %+v", name, w)
		}
	}
	for key, change := range map[string]func(m *Model){
		"channel[0].operators[1][0][1]":    func(m *Model) { m.Channels[0].Operators = [][]complex128{halfX, {0, 0.5i, -0.5i, 0}} },
		"channel[0].full_scale_rad_per_ns": func(m *Model) { m.Channels[0].FullScale *= 1.001 },
		"channel[0].delay_ns":              func(m *Model) { m.Channels[0].Delay += 0.1 },
		"channel[0].residues[2]":           func(m *Model) { m.Channels[0].Residues[2] *= 1.01 },
		"channel[0].max_slew_per_sample":   func(m *Model) { m.Channels[0].MaxSlew = math.Inf(1) },
		"channel[0].guard_trail":           func(m *Model) { m.Channels[0].GuardTrail = 3 },
		"channel[0].direct[0][0]":          func(m *Model) { m.Channels[0].Direct = 0.001 },
		"bits":                             func(m *Model) { m.Bits = 12 },
		"window_start_ns":                  func(m *Model) { m.WindowStart = 3 },
		"ends":                             func(m *Model) { m.Ends = "window" },
		"target[0][0]":                     func(m *Model) { m.Target = rotation(1.5, 0) },
		"static_rad_per_ns[0][0]":          func(m *Model) { m.Static = []complex128{1e-6, 0, 0, -1e-6} },
		"error[0].held":                    func(m *Model) { m.Errors[0].Held = true },
		"error[0].operator[0][0]":          func(m *Model) { m.Errors[0].Operator = halfX },
	} {
		other := testModel()
		change(other)
		got := reopened(other, v)
		seen := false
		for _, d := range got.Inputs {
			seen = seen || d.Key == key && d.Recorded != d.Rebuilt
		}
		if !seen || got.Met() {
			t.Errorf("%s: not seen in %v", key, got.Inputs)
		}
	}
	// Poles in another order are the same line.
	other := testModel()
	c := &other.Channels[0]
	for _, list := range [][]complex128{c.Poles, c.Residues} {
		list[0], list[2] = list[2], list[0]
	}
	if got := reopened(other, v); len(got.Inputs) != 0 {
		t.Errorf("poles in another order: %v", got.Inputs)
	}
}

// rehash writes a changed file and its new hash into the record.
func rehash(t *testing.T, dir, name string, data []byte) {
	t.Helper()
	path := filepath.Join(dir, name)
	old, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(path, data, 0o666); err != nil {
		t.Fatal(err)
	}
	record := filepath.Join(dir, "pulse.toml")
	text, err := os.ReadFile(record)
	if err != nil {
		t.Fatal(err)
	}
	was, is := sha256.Sum256(old), sha256.Sum256(data)
	text = bytes.Replace(text, []byte(hex.EncodeToString(was[:])), []byte(hex.EncodeToString(is[:])), 1)
	if err := os.WriteFile(record, text, 0o666); err != nil {
		t.Fatal(err)
	}
}

// Folders from outside: one sentence each, with the file, and for the record with line and key.
func TestMalformedFolders(t *testing.T) {
	template, _, _ := goodFolder(t)
	record := func(find, put string) func(t *testing.T, dir string) {
		return func(t *testing.T, dir string) {
			path := filepath.Join(dir, "pulse.toml")
			text, err := os.ReadFile(path)
			if err != nil {
				t.Fatal(err)
			}
			changed := regexp.MustCompile(`(?m)`+find).ReplaceAllString(string(text), put)
			if changed == string(text) {
				t.Fatalf("nothing matches %q", find)
			}
			if err := os.WriteFile(path, []byte(changed), 0o666); err != nil {
				t.Fatal(err)
			}
		}
	}
	codes := func(change func(data []byte) []byte, hashed bool) func(t *testing.T, dir string) {
		return func(t *testing.T, dir string) {
			path := filepath.Join(dir, "channel-0.npy")
			data, err := os.ReadFile(path)
			if err != nil {
				t.Fatal(err)
			}
			data = change(append([]byte(nil), data...))
			if hashed {
				rehash(t, dir, "channel-0.npy", data)
			} else if err := os.WriteFile(path, data, 0o666); err != nil {
				t.Fatal(err)
			}
		}
	}
	for _, c := range []struct {
		name   string
		change func(t *testing.T, dir string)
		want   string // regular expression
	}{
		{"one code changed", codes(func(d []byte) []byte { d[140]++; return d }, false), `channel-0\.npy: changed since the pulse was written`},
		{"truncated codes", codes(func(d []byte) []byte { return d[:len(d)-3] }, true), `channel-0\.npy: truncated`},
		{"codes of another type", codes(func(d []byte) []byte { return bytes.Replace(d, []byte("<i2"), []byte("<i4"), 1) }, true), `channel-0\.npy: NPY type`},
		{"a code that does not exist", codes(func(d []byte) []byte { d[len(d)-1] = 0x7f; return d }, true), `channel-0\.npy: sample 31 has code 32512`},
		{"no codes", func(t *testing.T, dir string) { os.Remove(filepath.Join(dir, "channel-0.npy")) }, `channel-0\.npy: no such file`},
		{"no record", func(t *testing.T, dir string) { os.Remove(filepath.Join(dir, "pulse.toml")) }, `: found a folder without pulse\.toml; allowed: a pulse folder`},
		{"no inputs", func(t *testing.T, dir string) { os.RemoveAll(filepath.Join(dir, "inputs")) }, `inputs.*: no such file`},
		{"wrong hash", record(`^sha256 = "....`, `sha256 = "0000`), `changed since the pulse was written`},
		{"no hashes", record(`(?s)\[\[file\]\].*`, ``), `pulse\.toml: file: found nothing`},
		{"an input without hash", record(`name = "inputs/brief.toml"\nsha256 = "[0-9a-f]*"`, `name = "channel-0.npy"`+"\n"+`sha256 = "x"`), `listed twice|no hash of`},
		{"codes outside the folder", record(`^codes = .*`, `codes = "../pulse/channel-0.npy"`), `no hash of "\.\./pulse/channel-0\.npy"`},
		{"unknown key in [model]", record(`^bits = 14`, "bits = 14\nbit = 1"), `pulse\.toml:\d+: model\.bit: found an unknown key`},
		{"mis-cased key", record(`^window_start_ns`, "Window_start_ns"), `pulse\.toml:\d+: model\.Window_start_ns`},
		{"unknown key in a channel", record(`^delay_ns = `, "rms_limit = 0.5\ndelay_ns = "), `pulse\.toml:\d+: model\.channel\[0\]\.rms_limit: found an unknown key`},
		{"missing key", record(`^delay_ns.*\n`, ""), `pulse\.toml:\d+: model\.channel\[0\]\.delay_ns: found nothing`},
		{"missing model", record(`(?s)\[model\].*?\[\[model`, "[[model"), `pulse\.toml:\d+: model\.`},
		{"not a number", record(`^sample_period_ns = .*`, "sample_period_ns = nan"), `pulse\.toml:\d+: model\.sample_period_ns: found (?i)nan`},
		{"endless", record(`^full_scale_rad_per_ns = .*`, "full_scale_rad_per_ns = inf"), `pulse\.toml:\d+: model\.channel\[0\]\.full_scale_rad_per_ns: found (?i)\+?inf`},
		{"text for a number", record(`^samples = .*`, `samples = "32"`), `pulse\.toml:\d+: model\.samples: found "32"`},
		{"too many samples", record(`^samples = .*`, "samples = 65537"), `model\.samples: found 65537; allowed: a whole number, 1 to 65536`},
		{"too many levels", record(`^dim = .*`, "dim = 65"), `model\.dim: found 65`},
		{"other shape", record(`^samples = .*`, "samples = 40"), `channel-0\.npy: NPY shape \(32, 2\); needed: \(40, 2\)`},
		{"levels and matrices differ", record(`^dim = .*`, "dim = 3"), `pulse\.toml:\d+: model\.static_rad_per_ns: found 4 elements; allowed: a Hermitian 3 x 3 matrix`},
		{"not Hermitian", record(`^static_rad_per_ns = .*`, "static_rad_per_ns = [[0, 1], [0, 0]]"), `pulse\.toml:\d+: model\.static_rad_per_ns: found elements \(0, 1\) and \(1, 0\)`},
		{"not square", record(`^static_rad_per_ns = .*`, "static_rad_per_ns = [[0, 1]]"), `pulse\.toml:\d+: model\.static_rad_per_ns: found 1 rows and 2`},
		{"not unitary", record(`^target = .*`, "target = [[1, 0], [0, 2]]"), `pulse\.toml:\d+: model\.target: found columns`},
		{"a growing pole", record(`^poles_per_ns = \[\[-`, "poles_per_ns = [["), `pulse\.toml:\d+: model\.channel\[0\]\.poles_per_ns: found`},
		{"a pole too many", record(`^poles_per_ns = \[`, "poles_per_ns = [[-1, 0], "), `pulse\.toml:\d+: model\.channel\[0\]\.powers: found 3 powers; allowed: one for each of 4 poles`},
		{"a power of zero", record(`^powers = .*`, "powers = [1, 1, 0]"), `pulse\.toml:\d+: model\.channel\[0\]\.powers`},
		{"half a power", record(`^powers = .*`, "powers = [1, 1, 1.5]"), `pulse\.toml:\d+: model\.channel\[0\]\.powers: found 1\.5; allowed: whole numbers`},
		{"unknown kind of error", record(`^kind = "amplitude"`, `kind = "noise"`), `pulse\.toml:\d+: model\.error\[1\]\.kind: found "noise"`},
		{"unknown channel", record(`^channels = .*`, `channels = ["q2 drive"]`), `pulse\.toml:\d+: model\.error\[1\]\.channels: found "q2 drive"`},
		{"guards longer than the span", record(`^guard_trail = .*`, "guard_trail = 40"), `pulse\.toml:\d+: model\.channel\[0\]\.guard_lead: found guards of 0 and 40`},
		{"code space twice", record(`^code_space = .*`, "code_space = [1, 1]"), `pulse\.toml:\d+: model\.code_space`},
		{"unknown ends", record(`^ends = .*`, `ends = "loose"`), `pulse\.toml:\d+: model\.ends: found "loose"; allowed: "settled" or "window"`},
		{"a claim below zero", record(`^infidelity_other_ends = .*`, "infidelity_other_ends = -1.0"), `pulse\.toml:\d+: claim\.infidelity_other_ends`},
		{"a margin of two kinds", record(`^size_rad_per_ns`, "size_share = 0.1\nsize_rad_per_ns"), `pulse\.toml:\d+: require\.margin\[0\]\.size_share`},
		{"another format", record(`^format = 1`, "format = 2"), `pulse\.toml:1: format: found 2`},
		{"a key twice", record(`^bits = 14`, "bits = 14\nbits = 12"), `pulse\.toml:\d+: .*bits`},
		{"no name", record(`^name = "test pulse"\n`, ""), `pulse\.toml:\d+: pulse\.name: found nothing`},
		{"nothing at all", func(t *testing.T, dir string) { os.WriteFile(filepath.Join(dir, "pulse.toml"), nil, 0o666) }, `pulse\.toml: pulse: found nothing`},
		{"no folder", func(t *testing.T, dir string) { os.RemoveAll(dir) }, `pulse: found no such folder; allowed: a pulse folder, which 'holdfast design BRIEF' makes`},
		{"a file", func(t *testing.T, dir string) { os.RemoveAll(dir); os.WriteFile(dir, []byte("x"), 0o666) }, `pulse: found a file; allowed: a pulse folder`},
	} {
		t.Run(c.name, func(t *testing.T) {
			dir := filepath.Join(t.TempDir(), "pulse")
			if err := os.CopyFS(dir, os.DirFS(template)); err != nil {
				t.Fatal(err)
			}
			c.change(t, dir)
			_, err := Open(dir)
			if err == nil {
				t.Fatal("no error")
			}
			if got := err.Error(); !regexp.MustCompile(c.want).MatchString(got) || strings.Contains(got, "\n") || len(got) > 700 {
				t.Errorf("%s\nwant %s", got, c.want)
			}
		})
	}
}

// Requirements by hand: upper limits, and margins to both sides, of known errors and unknown ones.
func TestRequirements(t *testing.T) {
	v := &Verdict{Ends: "window", Settled: Figures{Infidelity: 1}, Window: Figures{Infidelity: 1e-5}, Errors: []Error{
		{Name: "detuning", Unit: "MHz", Low: -0.5, High: 2, Susceptibility: 0.3},
		{Name: "any", Unit: "MHz", Held: true, Low: math.Inf(-1), High: math.Inf(1), Susceptibility: 2e-3},
		{Name: "amplitude", Unit: "%", Low: -3, High: 1, Susceptibility: 1},
	}}
	v.require(Require{Infidelity: 1e-4, Susceptibility: 1e-3, Margins: []Margin{
		{"detuning", 0.6 * perMHz, false, false}, {"detuning", 0.5 * perMHz, false, false}, {"amplitude", 0.01, true, false}, {"amplitude", 0.011, true, false},
		{"any", 60 * perMHz, false, false}, {"amplitude", 1e-9, false, false}, {"Q", 1e-9, false, false},
	}})
	want := []bool{true, false, false, true, true, false, true, false, false}
	if len(v.Requirements) != len(want) {
		t.Fatalf("%d requirements", len(v.Requirements))
	}
	for i, r := range v.Requirements {
		if r.Met != want[i] {
			t.Errorf("requirement %d: %+v", i, r)
		}
	}
	if len(v.Warnings) != 3 { // beyond what is searched, in the wrong unit, unknown
		t.Errorf("warnings %q", v.Warnings)
	}
}

// A profile swapped, its hash with it, opens and is told by the verdict; one that is no profile is a sentence.
func TestSwappedInputs(t *testing.T) {
	judge := func(name, text string) (*Verdict, error) {
		t.Helper()
		dir, _, _ := goodFolder(t)
		rehash(t, dir, name, []byte(text))
		f, err := Open(dir)
		if err != nil {
			t.Fatal(err)
		}
		return Judge(context.Background(), f)
	}
	for _, c := range []struct{ file, find, put, text, key string }{
		{profileFile, `corner = "200 MHz"`, `corner = "180 MHz"`, testProfile, "channel[0].poles_per_ns[0]"},
		{profileFile, `amplitude_limit = "95 %"`, `amplitude_limit = "90 %"`, testProfile, "channel[0].max_share"},
		{profileFile, `"I cos - Q sin"`, `"I cos + Q sin"`, testProfile, "channel[0].operators[1][0][1]"},
		{profileFile, `block = 8`, `block = 24`, testProfile, "samples"},
		{profileFile, `name = "q1 drive"`, `name = "q2 drive"`, testProfile, "channel[0].name"},
		{deviceFile, `T2 = "40 us"`, `T2 = "50 us"`, testDevice, "decoherence[0].t2_ns"},
		{briefFile, `gate = "X90"`, `gate = "X180"`, testBrief, "target[0][0]"},
		{briefFile, `span = "32 ns"`, `span = "40 ns"`, testBrief, "samples"},
		{briefFile, `size = "0.1 MHz"`, `size = "0.2 MHz"`, testBrief, "require.margin[0].size"},
		{briefFile, `hold = "nothing"`, ``, testBrief, "error[0].held"},
	} {
		if !strings.Contains(c.text, c.find) {
			t.Fatalf("nothing to change: %s", c.find)
		}
		v, err := judge(c.file, strings.Replace(c.text, c.find, c.put, 1))
		if err != nil {
			t.Errorf("%s: %v", c.put, err)
			continue
		}
		seen := false
		for _, d := range v.Inputs {
			seen = seen || d.Key == c.key
		}
		if !seen || v.Met() {
			t.Errorf("%s: %v does not tell %s", c.put, v.Inputs, c.key)
		}
	}
	if _, err := judge(profileFile, strings.Replace(testProfile, "40 MHz", "40", 1)); err == nil ||
		!regexp.MustCompile(`inputs/profile\.toml:\d+: channel\[0\]\.full_scale: found "40"`).MatchString(err.Error()) {
		t.Errorf("a broken profile: %v", err)
	}
}

// T/6 (1/T1 + 2/T2) is T/(3 T1) + T/(3 T_phi) with 1/T2 = 1/(2 T1) + 1/T_phi.
func TestDecoherence(t *testing.T) {
	const t1, tphi, span = 60e3, 55e3, 112.0
	t2 := 1 / (1/(2*t1) + 1/tphi)
	for _, c := range []struct{ t1, t2, want float64 }{
		{t1, t2, span/(3*t1) + span/(3*tphi)},
		{0, 0, 0},
		{t1, 0, span / (3 * t1)},
		{0, t2, span / (3 * t2)},
	} {
		if got := Decoherence(span, c.t1, c.t2); !(math.Abs(got-c.want) <= 1e-15) {
			t.Errorf("T1 %g, T2 %g: %g, want %g", c.t1, c.t2, got, c.want)
		}
	}
	// By the formula: T1 60 us, T2 40 us, 64 ns: about 7.1e-4 (16 ns: 1.8e-4).
	if got := Decoherence(64, 60e3, 40e3); !(math.Abs(got-7.111e-4) <= 1e-6) {
		t.Errorf("64 ns: %g", got)
	}
}

// Numbers that are allowed one by one and absurd together end with a sentence.
func TestAbsurdModels(t *testing.T) {
	for name, change := range map[string]func(m *Model){
		"a pole that rings for ever":    func(m *Model) { m.Channels[0].Poles[2] = complex(-1e-14, 1e6) },
		"a static part without measure": func(m *Model) { m.Static = []complex128{1e6, 0, 0, -1e6} },
		"a period without measure":      func(m *Model) { m.SamplePeriod = 1e6 },
		"a residue without measure":     func(m *Model) { m.Channels[0].Residues[0] = 1e9 },
	} {
		m := testModel()
		change(m)
		if err := m.Validate(); err != nil {
			t.Fatal(name, err)
		}
		if _, err := m.Judge(context.Background(), 1e-4); err != errTooLong && err != errTooFast {
			t.Errorf("%s: %v", name, err)
		}
	}
}
