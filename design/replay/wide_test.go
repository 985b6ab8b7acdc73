package replay

import (
	"context"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"reflect"
	"regexp"
	"strings"
	"testing"

	"holdfast/filter"
	"holdfast/hardware"
)

const wideProfile = `format = 1
[instrument]
name = "rack W (invented)"
sample_rate = "1 GS/s"
resolution = "14 bit"
block = 8
longest = 65536

[[channel]]
name = "q1 drive"
kind = "quadrature"
mixing = "I cos - Q sin"
full_scale = "40 MHz"
amplitude_limit = "95 %"
slew_limit = "25 %/sample"
rms_limit = "60 %"
rms_period = "1 us"
band = "200 MHz"
out_of_band = "5 %"
guard = { lead = 0, trail = 4 }
ring_out = { limit = "5 %", fast = "8 ns", tail = "1 %" }
compression = [["0 %", "0 %"], ["50 %", "49 %"], ["100 %", "95 %"]]
shift = "-12 kHz"
[channel.line]
delay = "3.2 ns"
lowpass = { family = "bessel", order = 2, corner = "200 MHz", known_to = "5 %" }
tails = [ { amplitude = "-1.5 %", time = "30 ns", known_to = "20 %" } ]

[[channel]]
name = "q1 flux"
kind = "baseband"
full_scale = "30 MHz"
zero_mean = true
[channel.line]
delay = "1.4 ns"
lowpass = { family = "single-pole", corner = "150 MHz" }

[[channel]]
name = "spare"
kind = "quadrature"
mixing = "I cos - Q sin"
full_scale = "40 MHz"
envelope = "box"
`

const wideDevice = testDevice + `[[bias]]
site = "q1"
channel = "q1 flux"
`

const wideBrief = `format = 1
name = "test pulse"
profile = "elsewhere.toml"
device = "elsewhere.toml"
hold = "profile"
span = "32 ns"
[target]
site = "q1"
gate = "X90"
free_z = "both"
[[error]]
line = "q1 drive"
parameter = "lowpass[0].corner"
name = "corner"
[[error]]
amplitude = "q1 drive"
quadrature = "I"
[[error]]
quadrature_angle = "q1 drive"
[[error]]
offset = "q1 drive"
quadrature = "Q"
[require]
infidelity = 1e-4
susceptibility = 1e-3
[[require.margin]]
error = "detuning"
size = "0.1 MHz"
[[require.margin]]
error = "corner"
size = "1 %"
[[require.margin]]
error = "quadrature angle"
size = "1 deg"
[[require.margin]]
error = "offset Q"
size = "0.2 %"
`

// wideTestModel is what a record should make of the three files, lines and slopes as package filter has them.
func wideTestModel(t testing.TB) *Model {
	t.Helper()
	p, err := hardware.Parse("profile.toml", []byte(wideProfile))
	if err != nil {
		t.Fatal(err)
	}
	list := func(l filter.Line) (d complex128, p []complex128, n []int, r []complex128) {
		for _, term := range l.Terms {
			p, n, r = append(p, term.Pole), append(n, term.Power), append(r, term.Residue)
		}
		return l.Direct, p, n, r
	}
	_, x := rounded(cosine(24, 32), 14)
	m := rackB(x)
	m.FreeZBefore, m.FreeZAfter = []float64{0.1}, []float64{-0.2}
	c := &m.Channels[0]
	c.Direct, c.Poles, c.Powers, c.Residues = list(p.Channels[0].Line)
	c.RMS, c.RMSSamples, c.Band, c.OutOfBand = 0.6, 1000, 0.2, 0.05
	c.RingOut, c.RingOutFast, c.RingOutTail = 0.05, 8, 0.01
	c.Compression = []Knee{{0, 0}, {0.5, 0.49}, {1, 0.95}}
	c.Shift, c.ShiftOperator = -2*math.Pi*12e-6, halfZ
	_, flux := rounded(cosine(20, 32), 14)
	for k := range flux {
		flux[k] = -flux[k]
		if k < 16 {
			flux[k] = -flux[k]
		}
	}
	f := Channel{
		Name: "q1 flux", Kind: "baseband", FullScale: 2 * math.Pi * 0.03, Delay: 3.4, Operators: [][]complex128{halfZ},
		MaxShare: 1, MaxSlew: math.Inf(1), RingOut: math.Inf(1), ZeroMean: true, Samples: flux,
	}
	f.Direct, f.Poles, f.Powers, f.Residues = list(p.Channels[1].Line)
	m.Channels = append(m.Channels, f)
	m.WindowStart = 3.4 // the flux's, two whole samples later than its line
	m.Errors = []Class{
		{Name: "corner", Kind: "line", Held: true, Channels: []string{"q1 drive"}},
		{Name: "amplitude I", Kind: "amplitude", Held: true, Channels: []string{"q1 drive"}, Quadrature: "I"},
		{Name: "quadrature angle", Kind: "skew", Held: true, Channels: []string{"q1 drive"}},
		{Name: "offset Q", Kind: "static", Held: true, Operator: halfY},
		{Name: "q1 drive tails[0].amplitude", Kind: "line", Held: true, Channels: []string{"q1 drive"}},
		{Name: "q1 drive tails[0].time", Kind: "line", Held: true, Channels: []string{"q1 drive"}},
	}
	for i, name := range map[int]string{0: "lowpass[0].corner", 4: "tails[0].amplitude", 5: "tails[0].time"} {
		q, ok := p.Channels[0].Parameter(name)
		if !ok {
			t.Fatalf("no parameter %s", name)
		}
		e := &m.Errors[i]
		e.Direct, e.Poles, e.Powers, e.Residues = list(q.Slope)
	}
	return m
}

// Every key of a wide record is read for what it is, and borne out by inputs.
func TestWideFolder(t *testing.T) {
	ctx := context.Background()
	m := wideTestModel(t)
	if err := m.Validate(); err != nil {
		t.Fatal(err)
	}
	direct, err := m.Judge(ctx, 1e-4)
	if err != nil {
		t.Fatal(err)
	}
	f, err := Open(writeFolderOf(t, m, direct, wideProfile, wideDevice, wideBrief))
	if err != nil {
		t.Fatal(err)
	}
	for c := range f.Model.Channels {
		got := f.Model.Channels[c]
		if len(got.Codes) != 32*len(got.Operators) || got.Codes[5*len(got.Operators)] != int16(8192*real(m.Channels[c].Samples[5])) || !reflect.DeepEqual(got.Exact, m.Channels[c].Samples) {
			t.Errorf("%s: %d codes", got.Name, len(got.Codes))
		}
		got.Codes, got.Exact = nil, nil
		if !reflect.DeepEqual(got, m.Channels[c]) {
			t.Errorf("read %+v\nwant %+v", got, m.Channels[c])
		}
	}
	for i := range f.Model.Errors {
		got := f.Model.Errors[i]
		got.claimed, got.Susceptibility = false, 0
		if !reflect.DeepEqual(got, m.Errors[i]) {
			t.Errorf("read %+v\nwant %+v", got, m.Errors[i])
		}
	}
	v, err := Judge(ctx, f)
	if err != nil {
		t.Fatal(err)
	}
	if len(v.Inputs) != 0 || !v.Agreement.OK || len(v.Warnings) != 0 {
		t.Errorf("inputs %v, agreement %+v, warnings %q", v.Inputs, v.Agreement, v.Warnings)
	}
	units := map[string]string{"corner": "%", "amplitude I": "%", "quadrature angle": "deg", "offset Q": "MHz", "detuning": "MHz"}
	for _, e := range v.Errors {
		if want, ok := units[e.Name]; ok && e.Unit != want {
			t.Errorf("%s in %s, want %s", e.Name, e.Unit, want)
		}
	}
	sizes := map[string]Requirement{
		"margin against corner": {Unit: "%", Allowed: 1}, "margin against quadrature angle": {Unit: "deg", Allowed: 1}, "margin against offset Q": {Unit: "MHz", Allowed: 0.08},
	}
	for _, r := range v.Requirements {
		if want, ok := sizes[r.Name]; ok {
			delete(sizes, r.Name)
			if r.Unit != want.Unit || !(math.Abs(r.Allowed-want.Allowed) <= 1e-12) {
				t.Errorf("%+v, want %+v", r, want)
			}
		}
	}
	if len(sizes) != 0 {
		t.Errorf("not required: %v", sizes)
	}
	limits := map[hardware.Limit]bool{hardware.RMS: true, hardware.OutOfBand: true, hardware.Mean: true, hardware.RingOutFast: true, hardware.RingOutTail: true}
	for _, l := range v.Limits {
		delete(limits, l.Limit)
	}
	if len(limits) != 0 {
		t.Errorf("not judged: %v", limits)
	}
}

// Whatever a record says otherwise than its inputs is told, by its key.
func TestWideDisagreement(t *testing.T) {
	turned := func(z []complex128, f complex128) []complex128 {
		z = append([]complex128(nil), z...)
		for i := range z {
			z[i] *= f
		}
		return z
	}
	for key, change := range map[string]func(m *Model){
		"channel[0].rms_share":             func(m *Model) { m.Channels[0].RMS = 0.61 },
		"channel[0].rms_samples":           func(m *Model) { m.Channels[0].RMSSamples = 900 },
		"channel[0].out_of_band_share":     func(m *Model) { m.Channels[0].OutOfBand = 0 },
		"channel[0].band_ghz":              func(m *Model) { m.Channels[0].Band = 0.21 },
		"channel[0].ring_out_tail_share":   func(m *Model) { m.Channels[0].RingOutTail = 0.02 },
		"channel[0].ring_out_fast_ns":      func(m *Model) { m.Channels[0].RingOutFast = 9 },
		"channel[0].envelope":              func(m *Model) { m.Channels[0].Box = true },
		"channel[0].zero_mean":             func(m *Model) { m.Channels[0].ZeroMean = true },
		"channel[1].zero_mean":             func(m *Model) { m.Channels[1].ZeroMean = false },
		"channel[0].compression":           func(m *Model) { m.Channels[0].Compression = nil },
		"channel[0].compression[1][1]":     func(m *Model) { m.Channels[0].Compression[1].Reached = 0.5 },
		"channel[0].shift_rad_per_ns":      func(m *Model) { m.Channels[0].Shift *= -1 },
		"channel[0].shift_operator[0][0]":  func(m *Model) { m.Channels[0].ShiftOperator = halfX },
		"channel[1].delay_ns":              func(m *Model) { m.Channels[1].Delay = 1.4 },
		"channel[1].operators[0][0][0]":    func(m *Model) { m.Channels[1].Operators = [][]complex128{halfX} },
		"channel[1].full_scale_rad_per_ns": func(m *Model) { m.Channels[1].FullScale *= 2 },
		"window_start_ns":                  func(m *Model) { m.WindowStart = 3.2 },
		"channel":                          func(m *Model) { m.Channels = m.Channels[:1] },
		"error[0].residues[0]":             func(m *Model) { m.Errors[0].Residues = turned(m.Errors[0].Residues, 1.01) },
		"error[4].held":                    func(m *Model) { m.Errors[4].Held = false },
		"error[1].quadrature":              func(m *Model) { m.Errors[1].Quadrature = "Q" },
		"error[1].channels":                func(m *Model) { m.Errors[1].Channels = []string{"q1 flux"}; m.Errors[1].Quadrature = "" },
		"error[2].kind":                    func(m *Model) { m.Errors[2].Kind = "amplitude" },
		"error[3].operator[0][1]":          func(m *Model) { m.Errors[3].Operator = halfX },
		"error[4].channel":                 func(m *Model) { m.Errors[4].Channels = []string{"q1 flux"} },
		"error":                            func(m *Model) { m.Errors = m.Errors[:5] },
		"require.margin[3].size":           func(m *Model) { m.Errors[3].Name = "offset R" },
		"channel[0].max_slew_per_sample":   func(m *Model) { m.Channels[0].MaxSlew = 0.3 },
	} {
		m := wideTestModel(t)
		change(m)
		if err := m.Validate(); err != nil {
			t.Fatal(key, err)
		}
		if key == "require.margin[3].size" {
			key = "require.margin"
		}
		f, err := Open(writeFolderOf(t, m, &Verdict{}, wideProfile, wideDevice, wideBrief))
		if err != nil {
			t.Fatal(key, err)
		}
		list, err := f.differences()
		if err != nil {
			t.Fatal(key, err)
		}
		seen := false
		for _, d := range list {
			seen = seen || d.Key == key && d.Recorded != d.Rebuilt
		}
		if !seen {
			t.Errorf("%s: not seen in %v", key, list)
		}
	}
	// Free angles that the brief does not give.
	for free, key := range map[string]string{"before": "free_z_after", "after": "free_z_before"} {
		f, err := Open(writeFolderOf(t, wideTestModel(t), &Verdict{}, wideProfile, wideDevice, strings.Replace(wideBrief, `"both"`, `"`+free+`"`, 1)))
		if err != nil {
			t.Fatal(err)
		}
		list, err := f.differences()
		if err != nil || len(list) != 1 || list[0].Key != key {
			t.Errorf("free_z = %q: %v, %v", free, list, err)
		}
	}
	// An offset that a complex steady gain turns: 0.8 e^(i 0.3) on Q is along Y turned by 0.3.
	l := filter.Line{Direct: cmplx.Rect(0.8, 0.3), Terms: []filter.Term{{Pole: -1, Power: 2, Residue: 0}}}
	if got := steady(l); !(cmplx.Abs(got-cmplx.Rect(0.8, 0.3)) <= 1e-15) {
		t.Errorf("steady gain %v", got)
	}
	l.Terms[0].Residue = 0.5
	if got := steady(l); !(cmplx.Abs(got-cmplx.Rect(0.8, 0.3)-0.5) <= 1e-15) {
		t.Errorf("steady gain %v", got)
	}
}

// Wide records from outside that make no sense: one sentence with file, line and key.
func TestMalformedWideFolders(t *testing.T) {
	template := writeFolderOf(t, wideTestModel(t), &Verdict{}, wideProfile, wideDevice, wideBrief)
	text, err := os.ReadFile(filepath.Join(template, "pulse.toml"))
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct{ find, put, want string }{
		{`(?m)^envelope.*|^zero_mean = true`, `envelope = "box"`, `channel\[1\]\.envelope: found "box"; allowed: none`},
		{`compression = \[\[0\.0, 0\.0\], `, `compression = [[0.1, 0.0], `, `compression: found \[0\.1, 0\]; allowed: \[0, 0\]`},
		{`\[1\.0, 0\.95\]\]`, `[1.0, 0.4]]`, `compression: found \[1, 0\.4\]; allowed: points that rise`},
		{`compression = .*`, `compression = [[0.0, 0.0]]`, `compression: found 1 points`},
		{`compression = .*`, `compression = [["0 %", "0 %"]]`, `compression`},
		{`shift_operator = .*`, ``, `shift_operator: found nothing`},
		{`shift_operator = .*`, `shift_operator = [[0, 1], [0, 0]]`, `shift_operator: found elements`},
		{`rms_share = .*`, ``, `rms_samples: found 1000; allowed: none without rms_share`},
		{`rms_share = .*`, `rms_share = -0.5`, `rms_share: found -0\.5`},
		{`band_ghz = .*`, ``, `out_of_band_share: found 0\.05; allowed: none without band_ghz`},
		{`ring_out_share = .*\n`, ``, `^$`}, // the tail alone is a limit
		{`ring_out_fast_ns = .*`, ``, `ring_out_fast_ns: found nothing`},
		{`quadrature = "I"`, `quadrature = "both"`, `error\[1\]\.quadrature: found "both"`},
		{`channels = \["q1 drive"\]\nquadrature`, "channels = [\"q1 flux\"]\nquadrature", `error\[1\]\.channels: found "q1 flux", which has one quadrature`},
		{`kind = "skew"\nchannels = \["q1 drive"\]`, "kind = \"skew\"\nchannels = [\"q1 flux\"]", `error\[2\]\.channels: found "q1 flux", which has one`},
		{`kind = "skew"`, "kind = \"skew\"\nquadrature = \"I\"", `error\[2\]\.quadrature: found an unknown key`},
		{`kind = "line"\nchannel = "q1 drive"`, "kind = \"line\"\nchannel = \"q2\"", `error\[0\]\.channel: found \["q2"\]; allowed: the name`},
		{`kind = "line"\nchannel = "q1 drive"`, `kind = "line"`, `error\[0\]\.channel: found nothing`},
		{`(?s)(kind = "line".*?powers = )\[[^]]*\]`, `${1}[1]`, `error\[0\]\.powers: found 1 powers`},
		{`(?s)(kind = "line".*?poles_per_ns = \[\[)-`, `${1}`, `error\[0\]\.poles_per_ns: found`},
		{`size_rad = `, "size_share = 0.1\nsize_rad = ", `require\.margin\[2\]\.size_share: found sizes of more than one unit`},
		{`codes = "channel-1.npy"`, `codes = "channel-0.npy"`, `channel-0\.npy: NPY shape \(32, 2\); needed: \(32, 1\)`},
	} {
		dir := filepath.Join(t.TempDir(), "pulse")
		if err := os.CopyFS(dir, os.DirFS(template)); err != nil {
			t.Fatal(err)
		}
		done := false
		changed := regexp.MustCompile(c.find).ReplaceAllStringFunc(string(text), func(s string) string {
			if done {
				return s
			}
			done = true
			return regexp.MustCompile(c.find).ReplaceAllString(s, c.put)
		})
		if changed == string(text) {
			t.Fatalf("nothing matches %q", c.find)
		}
		if err := os.WriteFile(filepath.Join(dir, "pulse.toml"), []byte(changed), 0o666); err != nil {
			t.Fatal(err)
		}
		_, err := Open(dir)
		got := ""
		if err != nil {
			got = err.Error()
		}
		if !regexp.MustCompile(c.want).MatchString(got) || strings.Contains(got, "\n") || len(got) > 900 {
			t.Errorf("%s: %s\nwant %s", c.find, got, c.want)
		}
	}
}
