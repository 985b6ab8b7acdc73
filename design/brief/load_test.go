package brief

import (
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// An invented rack and device, and a brief for them; TestLoadAllRefuses makes one mistake in one of the three.
var folder = map[string]string{
	"racks/rack.toml": `format = 1
[instrument]
name = "rack B"
sample_rate = "1 GS/s"
resolution = "14 bit"
block = 8
shortest = 20
longest = 1000
[[channel]]
name = "q1 drive"
kind = "quadrature"
mixing = "I cos - Q sin"
full_scale = "40 MHz"
amplitude_limit = "95 %"
guard = { lead = 0, trail = 4 }
[[channel]]
name = "q2 drive"
kind = "quadrature"
mixing = "I cos - Q sin"
full_scale = "40 MHz"
amplitude_limit = "95 %"
`,
	"device.toml": `format = 1
name = "Skerry"
[[site]]
name = "q1"
[[drive]]
site = "q1"
channel = "q1 drive"
`,
	"brief.toml": `format = 1
name = "X90, held"
profile = "racks/rack.toml"
device = "device.toml"
span = "112 ns"
[target]
site = "q1"
gate = "X90"
[basis]
coefficients = 20
[[error]]
detuning = "q1"
[[error]]
amplitude = "q1 drive"
`,
}

// write makes the folder with one replacement in one file, and gives its path.
func write(t *testing.T, name, old, new string) string {
	t.Helper()
	dir := t.TempDir()
	if err := os.Mkdir(filepath.Join(dir, "racks"), 0o777); err != nil {
		t.Fatal(err)
	}
	for file, text := range folder {
		if file == name {
			if !strings.Contains(text, old) {
				t.Fatalf("%q is not in %s", old, file)
			}
			text = strings.Replace(text, old, new, 1)
		}
		if err := os.WriteFile(filepath.Join(dir, file), []byte(text), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	return dir
}

func TestLoadAll(t *testing.T) {
	dir := write(t, "", "", "")
	b, p, d, err := LoadAll(filepath.Join(dir, "brief.toml"))
	if err != nil {
		t.Fatal(err)
	}
	if b.Name != "X90, held" || b.Span != 112 || p.Name != "rack B" || p.File != filepath.Join(dir, "racks", "rack.toml") || d.Name != "Skerry" || d.File != filepath.Join(dir, "device.toml") {
		t.Errorf("%+v\n%+v\n%+v", b, p, d)
	}
	// A defaulted amplitude error is of the channels that drive the device.
	dir = write(t, "brief.toml", "[[error]]\ndetuning = \"q1\"\n[[error]]\namplitude = \"q1 drive\"\n", "")
	b, _, _, err = LoadAll(filepath.Join(dir, "brief.toml"))
	if err != nil || !b.Defaulted || len(b.Errors) != 3 || len(b.Errors[1].Channels) != 1 || b.Errors[1].Channels[0] != "q1 drive" {
		t.Errorf("default errors %+v, %v", b, err)
	}
}

// Another file in the place of a brief is recognised.
func TestNotABrief(t *testing.T) {
	dir := write(t, "", "", "")
	for file, kind := range map[string]string{"racks/rack.toml": "hardware profile", "device.toml": "device file"} {
		path := filepath.Join(dir, filepath.FromSlash(file))
		_, _, _, err := LoadAll(path)
		if want := path + ": found what looks like a " + kind + "; allowed: a brief, which has a [target] and names a profile and a device"; err == nil || err.Error() != want {
			t.Errorf("%s: %v, want %s", file, err, want)
		}
	}
	for file, kind := range map[string]FileKind{"racks/rack.toml": ProfileFile, "device.toml": DeviceFile, "brief.toml": BriefFile} {
		if got, err := KindOf(filepath.Join(dir, filepath.FromSlash(file))); got != kind || err != nil {
			t.Errorf("%s: %q, %v", file, got, err)
		}
	}
}

// A default size is no larger than a share of the drive's full scale: a rack of 40 MHz and a faster one have exactly 3 and 1 MHz, a slow one 7.5 % and 2.5 %. What
// the brief says stays.
func TestDefaultSizes(t *testing.T) {
	for _, c := range []struct {
		full         string
		named, every float64 // MHz
	}{{"40 MHz", 3, 1}, {"400 MHz", 3, 1}, {"20 MHz", 1.5, 0.5}, {"1 MHz", 0.075, 0.025}, {"10 kHz", 0.00075, 0.00025}} {
		for name, errors := range map[string]string{
			"named":   "[[error]]\ndetuning = \"q1\"\n[[error]]\nany = \"all\"\n[[error]]\noperator = \"X\"\nsize = \"3 MHz\"\n[[error]]\namplitude = \"q1 drive\"\n[[error]]\nmatrix = [[0.5, 0], [0, -0.5]]\n",
			"default": "",
		} {
			dir := write(t, "brief.toml", "[[error]]\ndetuning = \"q1\"\n[[error]]\namplitude = \"q1 drive\"\n", errors)
			path := filepath.Join(dir, "racks", "rack.toml")
			text := strings.Replace(folder["racks/rack.toml"], "40 MHz", c.full, 1) // the other channel drives nothing
			if err := os.WriteFile(path, []byte(text), 0o666); err != nil {
				t.Fatal(err)
			}
			b, p, d, err := LoadAll(filepath.Join(dir, "brief.toml"))
			if err != nil {
				t.Fatal(err)
			}
			for range 2 {
				for _, e := range b.Errors {
					want, tolerance := rate(c.named/1e3), 1e-14
					switch {
					case e.Kind == Any:
						want = rate(c.every / 1e3)
					case e.Kind == Amplitude:
						want = 0.03
					case e.Name == "X":
						want = rate(0.003)
					}
					if c.full == "40 MHz" || c.full == "400 MHz" {
						tolerance = 0
					}
					if !(math.Abs(e.Size-want) <= tolerance*want) {
						t.Errorf("full scale %s, %s: %s of size %g, want %g", c.full, name, e.Name, e.Size, want)
					}
				}
				if err := b.Complete(p, d); err != nil { // a second call changes nothing
					t.Fatal(err)
				}
			}
		}
	}
}

// A period without exact decimals: the span as people write it becomes the exact multiple.
func TestSpanBecomesExact(t *testing.T) {
	dir := write(t, "racks/rack.toml", "1 GS/s", "2.4 GS/s")
	path := filepath.Join(dir, "brief.toml")
	text := strings.Replace(folder["brief.toml"], "112 ns", "46.667 ns", 1) // 112.0008 samples
	if err := os.WriteFile(path, []byte(text), 0o666); err != nil {
		t.Fatal(err)
	}
	b, p, _, err := LoadAll(path)
	if err != nil || b.Span != 112*p.SamplePeriod {
		t.Errorf("%+v, %v", b, err)
	}
}

func TestLoadAllRefuses(t *testing.T) {
	const spans = "24 ns to 1000 ns in steps of 8 ns, the block of 8 samples"
	for _, c := range []struct{ file, old, new, at, want string }{
		{"brief.toml", "112 ns", "100 ns", "brief.toml", `:5: span: found 100 ns, which is 100 samples; allowed: ` + spans + ` (nearest: 96 ns and 104 ns)`},
		{"brief.toml", "112 ns", "112.5 ns", "brief.toml", `:5: span: found 112.5 ns, which is 112.5 samples; allowed: ` + spans + ` (nearest: 112 ns and 120 ns)`},
		{"brief.toml", "112 ns", "16 ns", "brief.toml", `:5: span: found 16 ns; allowed: ` + spans + ` (nearest: 24 ns)`},
		{"brief.toml", "112 ns", "22 ns", "brief.toml", `:5: span: found 22 ns; allowed: ` + spans + ` (nearest: 24 ns)`},
		{"brief.toml", "112 ns", "999 ns", "brief.toml", `:5: span: found 999 ns, which is 999 samples; allowed: ` + spans + ` (nearest: 992 ns and 1000 ns)`},
		{"brief.toml", "112 ns", "1000.3 ns", "brief.toml", `:5: span: found 1.0003 us, which is 1000.3 samples; allowed: ` + spans + ` (nearest: 1000 ns)`},
		{"brief.toml", "112 ns", "1 ms", "brief.toml", `:5: span: found 1 ms; allowed: ` + spans + ` (nearest: 1000 ns)`},
		{"brief.toml", "gate =", "gat =", "brief.toml", `:8: target.gat: found an unknown key; allowed: site, sites, gates, from, to, free_z, up_to, gate, controlled, axis, matrix, angle (did you mean gate?)`},
		{"brief.toml", "site = \"q1\"", "site = \"q2\"", "brief.toml", `:7: target.site: found "q2"; allowed: a site of DIR/device.toml, "q1"`},
		{"brief.toml", "detuning = \"q1\"", "detuning = \"Q1\"", "brief.toml", `:12: error[0].detuning: found "Q1"; allowed: a site of DIR/device.toml, "q1"`},
		{"brief.toml", "amplitude = \"q1 drive\"", "amplitude = \"q2 drive\"", "brief.toml", `:14: error[1].amplitude: found "q2 drive"; allowed: a channel that drives a site of DIR/device.toml, "q1 drive"`},
		{"brief.toml", "coefficients = 20", "coefficients = 109", "brief.toml", `:10: basis.coefficients: found 109; allowed: at most 108, the samples of "q1 drive" in this span that are free`},
		{"brief.toml", "racks/rack.toml", "rack.toml", "brief.toml", `:3: profile: found "rack.toml", and at DIR/rack.toml no such file; allowed: a hardware profile, by its path from the brief's folder or from the root`},
		{"brief.toml", "device.toml", "racks", "brief.toml", `:4: device: found "racks", and at DIR/racks a folder; allowed: a device file, by its path from the brief's folder or from the root`},
		{"brief.toml", "racks/rack.toml", "brief.toml", "brief.toml", `:3: profile: found "brief.toml", which looks like a brief; allowed: a hardware profile, by its path from the brief's folder or from the root`},
		{"brief.toml", "device.toml", "racks/rack.toml", "brief.toml", `:4: device: found "racks/rack.toml", which looks like a hardware profile; allowed: a device file, by its path from the brief's folder or from the root`},
		{"device.toml", "channel = \"q1 drive\"", "channel = \"q1\"", "device.toml", `:7: drive[0].channel: found "q1"; allowed: a channel of DIR/racks/rack.toml, "q1 drive", "q2 drive"`},
		{"device.toml", "[[site]]", "[[site]]\nT1 = 4", "device.toml", `:4: site[0].T1: found 4; allowed: a time such as "112 ns", 1 ns to 1e+06 s (a bare number has no unit: write a quantity in quotes)`},
		{"racks/rack.toml", "\"1 GS/s\"", "1", "racks/rack.toml", `:4: instrument.sample_rate: found 1; allowed: a sample rate such as "1 GS/s", 1 MS/s to 100 GS/s (a bare number has no unit: write a quantity in quotes)`},
	} {
		dir := write(t, c.file, c.old, c.new)
		_, _, _, err := LoadAll(filepath.Join(dir, "brief.toml"))
		want := filepath.Join(dir, c.at) + strings.ReplaceAll(c.want, "DIR", dir)
		if err == nil || err.Error() != want {
			t.Errorf("%s, %q:\n got %v\nwant %s", c.file, c.new, err, want)
		}
	}
}

// An invented rack with two channels on one spin, and a brief that asks for every kind of error that needs the profile.
func wideFolder(t *testing.T, file, old, new string) string {
	t.Helper()
	files := map[string]string{
		"rack.toml": `format = 1
[instrument]
name = "rack"
sample_rate = "1 GS/s"
resolution = "14 bit"
[[channel]]
name = "drive"
kind = "quadrature"
mixing = "I cos - Q sin"
full_scale = "40 MHz"
[channel.line]
delay = "2 ns"
lowpass = { family = "bessel", order = 2, corner = "200 MHz", known_to = "5 %" }
tails = [ { amplitude = "1 %", time = "30 ns", known_to = "20 %" } ]
[[channel]]
name = "flux"
kind = "baseband"
full_scale = "40 MHz"
[channel.line]
delay = "2 ns"
delay_known_to = "3 %"
[[channel]]
name = "coupled"
kind = "baseband"
full_scale = "40 MHz"
[channel.line]
ac_coupling = "1 ms"
[[channel]]
name = "plain"
kind = "quadrature"
mixing = "I cos - Q sin"
full_scale = "40 MHz"
`,
		"device.toml": `format = 1
name = "Skerry"
[[site]]
name = "q1"
[[drive]]
site = "q1"
channel = "drive"
[[bias]]
site = "q1"
channel = "flux"
[[bias]]
site = "q1"
channel = "coupled"
axis = "X"
`,
		"brief.toml": `format = 1
name = "wide"
profile = "rack.toml"
device = "device.toml"
span = "64 ns"
[target]
site = "q1"
gate = "X90"
[[error]]
line = "drive"
parameter = "lowpass[0].corner"
[[error]]
line = "drive"
parameter = "delay"
[[error]]
offset = "flux"
[[error]]
quadrature_angle = "drive"
[[error]]
amplitude = "drive"
quadrature = "I"
`}
	dir := t.TempDir()
	for name, text := range files {
		if name == file {
			if !strings.Contains(text, old) {
				t.Fatalf("%q is not in %s", old, name)
			}
			text = strings.Replace(text, old, new, 1)
		}
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	return filepath.Join(dir, "brief.toml")
}

func TestComplete(t *testing.T) {
	b, p, d, err := LoadAll(wideFolder(t, "", "", ""))
	if err != nil {
		t.Fatal(err)
	}
	sizes := map[string]float64{"drive lowpass[0].corner": 0.05, "drive delay": 0.05, "offset I": 1e-3, "quadrature angle": math.Pi / 180, "amplitude I": 0.03}
	check := func() {
		t.Helper()
		if len(b.Errors) != len(sizes) {
			t.Errorf("%d errors", len(b.Errors))
		}
		for _, e := range b.Errors {
			if want, ok := sizes[e.Name]; !ok || e.Size != want {
				t.Errorf("%+v; size needed: %g", e, want)
			}
		}
	}
	check()
	if err := b.Complete(p, d); err != nil { // once more
		t.Error(err)
	}
	check()
	// The profile's figure, unless the brief gives one.
	b, _, _, err = LoadAll(wideFolder(t, "brief.toml", "parameter = \"lowpass[0].corner\"", "parameter = \"tails[0].time\"\n[[error]]\nline = \"drive\"\nparameter = \"tails[0].amplitude\"\nsize = \"1 %\""))
	if err != nil || b.Errors[0].Size != 0.2 || b.Errors[1].Size != 0.01 {
		t.Errorf("%+v, %v", b, err)
	}
	// hold = "profile": what is known to some share, beside what the brief says of the same parameter.
	_, _, _, err = LoadAll(wideFolder(t, "brief.toml", "span", "hold = \"profile\"\nspan"))
	if err == nil || !strings.Contains(err.Error(), ":5: hold: found \"profile\", and nothing can be held to \"delay\" of \"flux\": ") {
		t.Errorf("%v", err) // the flux line is straight: its field jumps
	}
	path := wideFolder(t, "rack.toml", "delay_known_to = \"3 %\"", "")
	text, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(path, []byte(strings.Replace(string(text), "span", "hold = \"profile\"\nspan", 1)), 0o666); err != nil {
		t.Fatal(err)
	}
	b, p, d, err = LoadAll(path)
	if err != nil {
		t.Fatal(err)
	}
	sizes["drive tails[0].amplitude"], sizes["drive tails[0].time"] = 0.2, 0.2
	check()
	if err := b.Complete(p, d); err != nil {
		t.Error(err)
	}
	check()
	if e := b.Errors[len(b.Errors)-1]; e.Kind != Line || e.Channels[0] != "drive" || e.Parameter != "tails[0].time" || e.Weight != 1 {
		t.Errorf("%+v", e)
	}
	// The default amplitude is of everything that drives or biases.
	cut, _, _ := strings.Cut(string(text), "[[error]]")
	if err := os.WriteFile(path, []byte(cut), 0o666); err != nil {
		t.Fatal(err)
	}
	if b, _, _, err = LoadAll(path); err != nil || strings.Join(b.Errors[1].Channels, ",") != "drive,flux,coupled" {
		t.Errorf("%+v, %v", b, err)
	}
}

func TestCompleteRefuses(t *testing.T) {
	for _, c := range []struct{ file, old, new, at, want string }{
		{"brief.toml", "\"lowpass[0].corner\"", "\"lowpass[1].corner\"", "brief.toml", `:11: error[0].parameter: found "lowpass[1].corner"; allowed: a parameter of the line of "drive", "lowpass[0].corner", "tails[0].amplitude", "tails[0].time", "delay"`},
		{"brief.toml", "line = \"drive\"", "line = \"plain\"", "brief.toml", `:10: error[0].line: found "plain"; allowed: a channel that drives a site of DIR/device.toml, "drive", "flux", "coupled"`},
		{"brief.toml", "line = \"drive\"\nparameter = \"delay\"", "line = \"flux\"\nparameter = \"delay\"", "brief.toml", `:14: error[1].parameter: found "delay" of "flux", to which nothing can be held: the field jumps at sample edges (direct gain (1+0i)) and has no derivative in the delay; allowed: a parameter on which what arrives depends smoothly`},
		{"brief.toml", "quadrature_angle = \"drive\"", "quadrature_angle = \"flux\"", "brief.toml", `:18: error[3].quadrature_angle: found "flux", a baseband channel; allowed: a quadrature channel`},
		{"brief.toml", "offset = \"flux\"", "offset = \"coupled\"", "brief.toml", `:16: error[2].offset: found "coupled", of which the line passes nothing steady; allowed: a channel whose line passes an offset`},
		{"brief.toml", "offset = \"flux\"", "offset = \"flux\"\nquadrature = \"Q\"", "brief.toml", `:17: error[2].quadrature: found "Q" of "flux", a baseband channel; allowed: no quadrature there, as it has one converter`},
		{"brief.toml", "amplitude = \"drive\"", "amplitude = \"flux\"", "brief.toml", `:21: error[4].quadrature: found "I" of "flux", a baseband channel; allowed: no quadrature there, as it has one converter`},
		{"device.toml", "channel = \"drive\"", "channel = \"other\"", "device.toml", `:7: drive[0].channel: found "other"; allowed: a channel of DIR/rack.toml, "drive", "flux", "coupled", "plain"`},
		{"device.toml", "channel = \"flux\"", "channel = \"plain\"", "device.toml", `:10: bias[0].channel: found "plain", a quadrature channel; allowed: a baseband channel (a [[drive]] takes a quadrature channel, a [[bias]] a baseband one)`},
		{"device.toml", "[[drive]]\nsite = \"q1\"\nchannel = \"drive\"\n[[bias]]", "[[drive]]", "device.toml", `:7: drive[0].channel: found "flux", a baseband channel; allowed: a quadrature channel (a [[drive]] takes a quadrature channel, a [[bias]] a baseband one)`},
		{"rack.toml", "kind = \"quadrature\"", "kind = \"square\"", "rack.toml", `:8: channel[0].kind: found "square"; allowed: "quadrature" or "baseband"`},
		{"rack.toml", "lowpass = { family = \"bessel\", order = 2, corner = \"200 MHz\", known_to = \"5 %\" }\ntails = [ { amplitude = \"1 %\", time = \"30 ns\", known_to = \"20 %\" } ]", "", "brief.toml", `:11: error[0].parameter: found "lowpass[0].corner"; allowed: a parameter of the line of "drive", "delay"`},
		{"brief.toml", "[[error]]", "[basis]\ncoefficients = 65\n[[error]]", "brief.toml", `:10: basis.coefficients: found 65; allowed: at most 64, the samples of "drive" in this span that are free`},
	} {
		path := wideFolder(t, c.file, c.old, c.new)
		_, _, _, err := LoadAll(path)
		dir := filepath.Dir(path)
		want := filepath.Join(dir, c.at) + strings.ReplaceAll(c.want, "DIR", dir)
		if err == nil || err.Error() != want {
			t.Errorf("%s, %q:\n got %v\nwant %s", c.file, c.new, err, want)
		}
	}
	// A word that needs the profile, and a profile that knows everything to the last digit.
	path := wideFolder(t, "rack.toml", "known_to = \"5 %\" }", "known_to = \"0 %\" }")
	text, err := os.ReadFile(filepath.Join(filepath.Dir(path), "rack.toml"))
	if err != nil {
		t.Fatal(err)
	}
	sure := strings.NewReplacer(", known_to = \"20 %\"", "", "delay_known_to = \"3 %\"", "").Replace(string(text))
	if err := os.WriteFile(filepath.Join(filepath.Dir(path), "rack.toml"), []byte(sure), 0o666); err != nil {
		t.Fatal(err)
	}
	if text, err = os.ReadFile(path); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(path, []byte(strings.Replace(string(text), "span", "hold = \"profile\"\nspan", 1)), 0o666); err != nil {
		t.Fatal(err)
	}
	want := path + `:5: hold: found "profile", and no parameter of these lines is said to be known to any share; allowed: "nothing", or "profile" with a known_to in the [channel.line] of a channel that drives the device`
	if _, _, _, err := LoadAll(path); err == nil || err.Error() != want {
		t.Errorf("got %v\nwant %s", err, want)
	}
}
