package brief

import (
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
		{"brief.toml", "gate =", "gat =", "brief.toml", `:8: target.gat: found an unknown key; allowed: site, angle, gate, axis, matrix (did you mean gate?)`},
		{"brief.toml", "site = \"q1\"", "site = \"q2\"", "brief.toml", `:7: target.site: found "q2"; allowed: a site of DIR/device.toml, "q1"`},
		{"brief.toml", "detuning = \"q1\"", "detuning = \"Q1\"", "brief.toml", `:12: error[0].detuning: found "Q1"; allowed: a site of DIR/device.toml, "q1"`},
		{"brief.toml", "amplitude = \"q1 drive\"", "amplitude = \"q2 drive\"", "brief.toml", `:14: error[1].amplitude: found "q2 drive"; allowed: a channel that drives a site of DIR/device.toml, "q1 drive"`},
		{"brief.toml", "coefficients = 20", "coefficients = 109", "brief.toml", `:10: basis.coefficients: found 109; allowed: at most 108, the samples of "q1 drive" in this span that are not guards`},
		{"brief.toml", "racks/rack.toml", "rack.toml", "rack.toml", `: found no such file; allowed: a TOML file of at most 1 MiB that can be read`},
		{"brief.toml", "device.toml", "racks", "racks", `: found a folder; allowed: a TOML file of at most 1 MiB that can be read`},
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
