package hardware

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"holdfast/filter"
	"holdfast/hardware/quantity"
)

// Rack B's figures as the project's demonstration defines them, each converted by hand.
func TestLoadRackB(t *testing.T) {
	p := rackB(t)
	if p.File != "../testdata/skerry/rack-b.toml" || p.Name != "rack B, position 3" || p.SamplePeriod != 1 || p.Bits != 14 ||
		p.Block != 8 || p.Shortest != 8 || p.Longest != 65536 || len(p.Channels) != 1 {
		t.Errorf("instrument: %+v", p)
	}
	c := p.Channels[0]
	if c.Name != "q1 drive" || c.Kind != Quadrature || c.Mixing != MinusSin || c.Carrier != 0 ||
		!(math.Abs(c.FullScale-0.25132741228718347) <= 1e-16) || c.FullScaleLevel != 0.5 || c.AmplitudeLimit != 0.95 ||
		c.SlewLimit != 0.25 || c.Band != 0.1 || c.GuardLead != 0 || c.GuardTrail != 4 || c.RingOut != (RingOut{1e-3, 8, 1e-3}) || c.Latency != 0 {
		t.Errorf("channel: %+v", c)
	}
	if got := p.Start(0); got != 3.2 {
		t.Errorf("the window starts at %g; needed: 3.2", got)
	}
	if i, ok := p.Channel("q1 drive"); i != 0 || !ok {
		t.Errorf("Channel: %d, %v", i, ok)
	}
	if _, ok := p.Channel("Q1 drive"); ok {
		t.Error("channel names ignore case")
	}
	want := []string{"A pure delay of 3.2 ns.", "A Bessel low-pass of order 2 with its corner at 200 MHz.",
		"A settling tail of -1.5 % with a time constant of 30 ns."}
	if !slices.Equal(c.Sections, want) {
		t.Errorf("sections %q", c.Sections)
	}
	// G = (1 - 0.015 s T/(1 + s T)) G_Bessel e^{-3.2 s}: steady gain one; at the corner the Bessel's magnitude is 1/sqrt 2 and
	// the tail's factor is near 1 - 0.015.
	if !c.Line.Real() || !(cmplx.Abs(c.Line.DC()-1) <= 1e-12) {
		t.Errorf("steady gain %v", c.Line.DC())
	}
	w := 2 * math.Pi * 0.2
	s := complex(0, 30*w)
	if got, want := cmplx.Abs(c.Line.Response(w)), cmplx.Abs(1-0.015*s/(1+s))/math.Sqrt2; !(math.Abs(got-want) <= 1e-9) {
		t.Errorf("gain at 200 MHz %g; by hand %g", got, want)
	}
}

// A profile with every key, and one with as few as possible.
func TestLoadAllAndLeast(t *testing.T) {
	p, err := Parse("all.toml", []byte(`
format = 1
[instrument]
name = "all"
sample_rate = "2.5 GS/s"
resolution = "16 bit"
block = 4
shortest = 12
longest = 1000
[[channel]]
name = "a"
kind = "quadrature"
mixing = "I cos + Q sin"
carrier = "5.1 GHz"
full_scale = "60 MHz"
full_scale_level = "300 mV"
amplitude_limit = "90 %"
slew_limit = "200 %/sample"
band = "1.25 GHz"
latency = "80 ns"
guard = { lead = 2, trail = 3 }
ring_out = { limit = "500 ppm" }
[channel.line]
delay = "2 ns"
lowpass = [ { family = "bessel", order = 4, corner = "300 MHz", known_to = "5 %" }, { family = "single-pole", corner = "1 GHz" } ]
tails = [ { amplitude = "-1 %", time = "40 ns", known_to = "20 %" }, { amplitude = "2000 ppm", time = "3 us" } ]
[[channel]]
name = "b"
kind = "quadrature"
mixing = "I cos - Q sin"
full_scale = "60 MHz"
`))
	if err != nil {
		t.Fatal(err)
	}
	if p.SamplePeriod != 0.4 || p.Block != 4 || p.Shortest != 12 || p.Longest != 1000 || len(p.Channels) != 2 {
		t.Errorf("%+v", p)
	}
	a, b := p.Channels[0], p.Channels[1]
	if a.Mixing != PlusSin || a.Carrier != 5.1 || a.FullScaleLevel != 0.3 || a.SlewLimit != 2 || a.Band != 1.25 || a.Latency != 80 ||
		a.GuardLead != 2 || a.GuardTrail != 3 || a.RingOut != (RingOut{5e-4, 3.2, 5e-4}) {
		t.Errorf("a: %+v", a)
	}
	// b has no delay: 205 periods of 0.4 ns bring it to a's 82 ns.
	if p.Start(0) != 82 || !(math.Abs(p.Start(1)-82) <= 1e-12) || p.Shift(0) != 0 || p.Shift(1) != 205 || p.Window() != max(82, p.Start(1)) {
		t.Errorf("starts %g and %g", p.Start(0), p.Start(1))
	}
	if want := []string{"A pure delay of 2 ns.", "A Bessel low-pass of order 4 with its corner at 300 MHz, known to 5 %.",
		"A single-pole low-pass with its corner at 1 GHz.", "A settling tail of -1 % with a time constant of 40 ns, known to 20 %.",
		"A settling tail of 0.2 % with a time constant of 3 us."}; !slices.Equal(a.Sections, want) {
		t.Errorf("sections %q", a.Sections)
	}
	// The line is the product of its sections: at 1 GHz the single pole gives 1/(1+i).
	w := 2 * math.Pi
	bessel, err := filter.Bessel(4, 0.3)
	if err != nil {
		t.Fatal(err)
	}
	tail := func(amplitude, time float64) complex128 {
		s := complex(0, w*time)
		return complex(amplitude, 0) * s / (1 + s)
	}
	want := bessel.Response(w) / (1 + 1i) * (1 + tail(-0.01, 40) + tail(0.002, 3000)) * cmplx.Exp(complex(0, -2*w))
	if got := a.Line.Response(w); !(cmplx.Abs(got-want) <= 1e-10) {
		t.Errorf("response at 1 GHz %v; by hand %v", got, want)
	}
	if b.AmplitudeLimit != 1 || !math.IsInf(b.SlewLimit, 1) || !math.IsInf(b.Band, 1) || !math.IsInf(b.RingOut.Limit, 1) ||
		b.GuardLead+b.GuardTrail != 0 || b.Carrier != 0 || b.FullScaleLevel != 0 || b.Line.Direct != 1 || len(b.Line.Terms) != 0 ||
		!slices.Equal(b.Sections, []string{"Straight through: the device sees the held samples."}) {
		t.Errorf("b: %+v", b)
	}
}

// Every malformed profile is one sentence: file, line, key, what was found and what is allowed.
func TestLoadRefuses(t *testing.T) {
	good, err := os.ReadFile("../testdata/skerry/rack-b.toml")
	if err != nil {
		t.Fatal(err)
	}
	lines := strings.Split(string(good), "\n")
	lineOf := func(key string) int {
		for i, l := range lines {
			if strings.HasPrefix(l, key) {
				return i + 1
			}
		}
		t.Fatalf("no line begins with %q", key)
		return 0
	}
	for _, test := range []struct {
		line string // begins so in rack B; it is replaced by
		with string
		want string // after "p.toml:LINE: "
	}{
		{"format", "", `p.toml:1: format: found nothing; allowed: 1, and nothing else`},
		{"format", "format = 2", `format: found 2; allowed: 1, and nothing else`},
		{"name = \"rack", `name = ""`, `instrument.name: found ""; allowed: at least one character`},
		{"name = \"rack", `name = "a\u0007"`, `instrument.name: found "a\a"; allowed: printable characters only, on one line`},
		{"sample_rate", `sample_rate = 1`, `instrument.sample_rate: found 1; allowed: a sample rate such as "1 GS/s", 1 MS/s to 100 GS/s (a bare number has no unit: write a quantity in quotes)`},
		{"sample_rate", `sample_rate = "1 GHz"`, `instrument.sample_rate: found "1 GHz"; allowed: a sample rate such as "1 GS/s", 1 MS/s to 100 GS/s ("GHz" is a unit of frequency)`},
		{"sample_rate", `sample_rate = "1 kS/s"`, `instrument.sample_rate: found "1 kS/s"; allowed: a sample rate such as "1 GS/s", 1 MS/s to 100 GS/s`},
		{"sample_rate", `sample_rate = "nan GS/s"`, `instrument.sample_rate: found "nan GS/s"; allowed: a sample rate such as "1 GS/s", 1 MS/s to 100 GS/s (not a finite number)`},
		{"sample_rate", `sample_rate = inf`, `instrument.sample_rate: found +Inf; allowed: a sample rate such as "1 GS/s", 1 MS/s to 100 GS/s`},
		{"sample_rate", `Sample_rate = "1 GS/s"`, `instrument.Sample_rate: found an unknown key; allowed: name, sample_rate, resolution, block, shortest, longest, align (keys are case-sensitive: write sample_rate)`},
		{"resolution", `resolution = "17 bit"`, `instrument.resolution: found "17 bit"; allowed: a resolution such as "14 bit", 2 bit to 16 bit`},
		{"resolution", `resolution = 14`, `instrument.resolution: found 14; allowed: a resolution such as "14 bit", 2 bit to 16 bit (a bare number has no unit: write a quantity in quotes)`},
		{"block", `block = 0`, `instrument.block: found 0; allowed: a whole number, 1 to 4096`},
		{"block", `block = 8.0`, `instrument.block: found 8; allowed: a whole number, 1 to 4096 (write 8, without a point)`},
		{"longest", `longest = 65537`, `instrument.longest: found 65537; allowed: a whole number, 1 to 65536`},
		{"longest", `longest = 7`, `p.toml:SHORTEST: instrument.shortest: found 8 samples; allowed: at most the longest waveform, 7`},
		{"shortest", `shortest = 65530`, ``},
		{"longest", "longest = 65536\nalign = \"delays\"", `instrument.align: found "delays"; allowed: "delay" or "none" (did you mean "delay"?)`},
		{"longest", "longest = 65536\nalign = true", `instrument.align: found true; allowed: "delay" or "none"`},
		{"longest", "longest = 65536\ngap = 4", `instrument.gap: found an unknown key; allowed: name, sample_rate, resolution, block, shortest, longest, align`},
		{"format", "format = 1\nother = 1", `other: found an unknown key; allowed: format, instrument, channel`},
		{"kind", `kind = "base"`, `channel[0].kind: found "base"; allowed: "quadrature" or "baseband"`},
		{"kind", `kind = "Quadrature"`, `channel[0].kind: found "Quadrature"; allowed: "quadrature" or "baseband" (did you mean "quadrature"?)`},
		{"kind", `kind = "baseband"`, `channel[0].mixing: found beside kind = "baseband"; allowed: no mixing there, as it has one converter and no carrier`},
		{"mixing", `mixing = "I cos * Q sin"`, `channel[0].mixing: found "I cos * Q sin"; allowed: "I cos - Q sin" or "I cos + Q sin" (did you mean "I cos - Q sin"?)`},
		{"mixing", ``, `p.toml:CHANNEL: channel[0].mixing: found nothing; allowed: "I cos - Q sin" or "I cos + Q sin"`},
		{"full_scale =", `full_scale = "40 V"`, `channel[0].full_scale: found "40 V"; allowed: a frequency such as "40 MHz", 1 Hz to 100 GHz ("V" is a unit of voltage)`},
		{"full_scale =", `full_scale = "-40 MHz"`, `channel[0].full_scale: found "-40 MHz"; allowed: a frequency such as "40 MHz", 1 Hz to 100 GHz`},
		{"full_scale_level", `full_scale_level = "2 kV"`, `channel[0].full_scale_level: found "2 kV"; allowed: a voltage such as "0.5 V", 1 uV to 1000 V ("kV" is not one of uV, µV, mV, V)`},
		{"amplitude_limit", `amplitude_limit = "101 %"`, `channel[0].amplitude_limit: found "101 %"; allowed: a share such as "1.5 %", 0.01 % to 100 %`},
		{"amplitude_limit", `amplitude_limit = 0.95`, `channel[0].amplitude_limit: found 0.95; allowed: a share such as "1.5 %", 0.01 % to 100 % (a bare number has no unit: write a quantity in quotes)`},
		{"slew_limit", `slew_limit = "25 MHz"`, `channel[0].slew_limit: found "25 MHz"; allowed: a share per sample such as "25 %/sample", 0.01 %/sample to 200 %/sample ("MHz" is a unit of frequency)`},
		{"slew_limit", "slew_limit = \"25 %/sample\"\nslew_limit = \"25 %/sample\"", fmt.Sprintf(`channel[0].slew_limit: found this key a second time, after line %d; allowed: each key once`, lineOf("slew_limit"))},
		{"band", `band = "501 MHz"`, `channel[0].band: found "501 MHz"; allowed: a frequency such as "40 MHz", 1 kHz to 500 MHz`},
		{"guard", `guard = { lead = -1, trail = 4 }`, `channel[0].guard.lead: found -1; allowed: a whole number, 0 to 65536`},
		{"guard", `guard = 4`, `channel[0].guard: found 4; allowed: a table, [channel[0].guard] or guard = { ... }`},
		{"guard", `guard = { lead = 0, trail = 4, middle = 1 }`, `channel[0].guard.middle: found an unknown key; allowed: lead, trail`},
		{"ring_out", `ring_out = { fast = "8 ns" } #`, `channel[0].ring_out.limit: found nothing; allowed: a share such as "1.5 %", 1 ppm to 100 %`},
		{"ring_out", `ring_out = { limit = "0 %" } #`, `channel[0].ring_out.limit: found "0 %"; allowed: a share such as "1.5 %", 1 ppm to 100 %`},
		{"[channel.line]", "rms_limit = \"60 %\"\n[channel.line]", ``},
		{"[channel.line]", "[channel.line]\nmeasured = \"a.csv\"", `channel[0].line.measured: found an unknown key; allowed: delay, delay_known_to, lowpass, allpass, ac_coupling, resonance, tails, allpass_known_to, ac_coupling_known_to`},
		{"delay", `delay = "3.2"`, `channel[0].line.delay: found "3.2"; allowed: a time such as "112 ns", 0 ns to 1 ms (the unit is missing)`},
		{"delay", `delay = "-1 ns"`, `channel[0].line.delay: found "-1 ns"; allowed: a time such as "112 ns", 0 ns to 1 ms`},
		{"lowpass", `lowpass = { family = "bessel", order = 9, corner = "200 MHz" }`, `channel[0].line.lowpass.order: found 9; allowed: a whole number, 1 to 8`},
		{"lowpass", `lowpass = { family = "bessel", corner = "200 MHz" }`, `channel[0].line.lowpass.order: found nothing; allowed: a whole number, 1 to 8`},
		{"lowpass", `lowpass = { family = "gauss", corner = "200 MHz" }`, `channel[0].line.lowpass.family: found "gauss"; allowed: "single-pole", "bessel", "butterworth", "critical" or "gaussian"`},
		{"lowpass", `lowpass = { family = "single-pole", order = 1, corner = "200 MHz" }`, `channel[0].line.lowpass.order: found in a single-pole section; allowed: no order there`},
		{"lowpass", `lowpass = { family = "bessel", order = 2, corner = "200 MHz", known_to = "5" }`, `channel[0].line.lowpass.known_to: found "5"; allowed: a share such as "1.5 %", 0 % to 100 % (the unit is missing)`},
		{"lowpass", `lowpass = [` + strings.Repeat(`{ family = "bessel", order = 2, corner = "200 MHz" }, `, 5) + `]`, `channel[0].line.lowpass: found 5 tables; allowed: at most 4`},
		{"tails", `tails = [ { amplitude = "-51 %", time = "30 ns" } ]`, `channel[0].line.tails[0].amplitude: found "-51 %"; allowed: a share such as "1.5 %", -50 % to 50 %`},
		{"tails", `tails = [ { amplitude = "1 %", time = "0 ns" } ]`, `channel[0].line.tails[0].time: found "0 ns"; allowed: a time such as "112 ns", 10 ps to 1 s`},
		{"tails", `tails = [ { amplitude = "1 %" } ]`, `channel[0].line.tails[0].time: found nothing; allowed: a time such as "112 ns", 10 ps to 1 s`},
		{"tails", `tails = [ 1 ]`, `channel[0].line.tails: found 1; allowed: only tables in this array`},
		{"kind", "kind = \"quadrature\"\nenvelope = \"sphere\"", `channel[0].envelope: found "sphere"; allowed: "disc" or "box"`},
		{"slew_limit", `rms_limit = "0 %"`, `channel[0].rms_limit: found "0 %"; allowed: a share such as "1.5 %", 0.01 % to 100 %`},
		{"slew_limit", `rms_period = "1 us"`, `p.toml:CHANNEL: channel[0].rms_limit: found nothing beside rms_period; allowed: a share such as "60 %", or neither key`},
		{"slew_limit", "rms_limit = \"60 %\"\nrms_period = \"1 MHz\"", `channel[0].rms_period: found "1 MHz"; allowed: a time such as "112 ns", 1 ps to 1000 s ("MHz" is a unit of frequency)`},
		{"slew_limit", `out_of_band = "200 %"`, `channel[0].out_of_band: found "200 %"; allowed: a share such as "1.5 %", 1 ppm to 100 %`},
		{"band", `out_of_band = "0.1 %"`, `p.toml:CHANNEL: channel[0].band: found nothing beside out_of_band; allowed: a frequency such as "100 MHz", or neither key`},
		{"slew_limit", `zero_mean = "yes"`, `channel[0].zero_mean: found "yes"; allowed: true or false`},
		{"slew_limit", `zero_mean = 1`, `channel[0].zero_mean: found 1; allowed: true or false`},
		{"slew_limit", `shift = 12000`, `channel[0].shift: found 12000; allowed: a frequency such as "40 MHz", -1 GHz to 1 GHz (a bare number has no unit: write a quantity in quotes)`},
		{"ring_out", `ring_out = { limit = "0.1 %", tail = "0 %" } #`, `channel[0].ring_out.tail: found "0 %"; allowed: a share such as "1.5 %", 1 ppm to 100 %`},
		{"ring_out", `ring_out = { limit = "0.1 %", slow = "0.1 %" } #`, `channel[0].ring_out.slow: found an unknown key; allowed: limit, fast, tail`},
		{"slew_limit", `compression = "95 %"`, `channel[0].compression: found "95 %"; allowed: an array of at most 64 pairs of texts, each a share such as "1.5 %"`},
		{"slew_limit", `compression = []`, `channel[0].compression: found 0 pairs; allowed: 2 to 64 pairs, from ["0 %", "0 %"] to "100 %" at the converter, both shares rising`},
		{"slew_limit", `compression = [["0 %", "0 %"], ["100 %"]]`, `channel[0].compression: found an array of 1 as element 1; allowed: pairs of texts, each a share such as "1.5 %"`},
		{"slew_limit", `compression = [["0 %", "0 %"], [1, 1]]`, `channel[0].compression: found 1 in pair 1; allowed: a share such as "1.5 %", 0 % to 100 %`},
		{"slew_limit", `compression = [["0 %", "0 %"], ["100 %", "95"]]`, `channel[0].compression: found "95" in pair 1; allowed: a share such as "1.5 %", 0 % to 100 % (the unit is missing)`},
		{"slew_limit", `compression = [["0 %", "0 %"], ["100 %", "120 %"]]`, `channel[0].compression: found "120 %" in pair 1; allowed: a share such as "1.5 %", 0 % to 100 %`},
		{"slew_limit", `compression = [["1 %", "0 %"], ["100 %", "95 %"]]`, `channel[0].compression: found 1 %, 0 % as the first pair; allowed: 2 to 64 pairs, from ["0 %", "0 %"] to "100 %" at the converter, both shares rising`},
		{"slew_limit", `compression = [["0 %", "0 %"], ["90 %", "95 %"]]`, `channel[0].compression: found a last pair at 90 %; allowed: 2 to 64 pairs, from ["0 %", "0 %"] to "100 %" at the converter, both shares rising`},
		{"slew_limit", `compression = [["0 %", "0 %"], ["50 %", "60 %"], ["100 %", "60 %"]]`, `channel[0].compression: found 100 %, 60 % after 50 %, 60 %; allowed: 2 to 64 pairs, from ["0 %", "0 %"] to "100 %" at the converter, both shares rising`},
		{"slew_limit", `compression = [["0 %", "0 %"], ["50 %", "99 %"], ["100 %", "99.9 %"]]`, `channel[0].compression: found a slope of 0.018 between 50 % and 100 % at the converter; allowed: 0.02 to 50`},
		{"slew_limit", "envelope = \"box\"\ncompression = [[\"0 %\", \"0 %\"], [\"100 %\", \"95 %\"]]", `channel[0].compression: found beside envelope = "box"; allowed: with envelope = "disc" or a baseband channel, as it acts on the length of (I, Q)`},
		{"delay", `delay_known_to = "1 %"`, `p.toml:SECTIONS: channel[0].line.delay: found nothing beside delay_known_to; allowed: a time, or neither key`},
		{"delay", `ac_coupling_known_to = "1 %"`, `p.toml:SECTIONS: channel[0].line.ac_coupling: found nothing beside ac_coupling_known_to; allowed: a time, or neither key`},
		{"delay", `allpass = "0 ns"`, `channel[0].line.allpass: found "0 ns"; allowed: a time such as "112 ns", 1 ps to 1 us`},
		{"delay", `ac_coupling = "1 kHz"`, `channel[0].line.ac_coupling: found "1 kHz"; allowed: a time such as "112 ns", 1 ns to 1000 s ("kHz" is a unit of frequency)`},
		{"delay", `ac_coupling = "0.5 ns"`, `channel[0].line.ac_coupling: found "0.5 ns"; allowed: a time such as "112 ns", 1 ns to 1000 s`},
		{"lowpass", `lowpass = { family = "butterworth", corner = "200 MHz" }`, `channel[0].line.lowpass.order: found nothing; allowed: a whole number, 1 to 8`},
		{"lowpass", `lowpass = { family = "critical", order = 0, corner = "200 MHz" }`, `channel[0].line.lowpass.order: found 0; allowed: a whole number, 1 to 8`},
		{"delay", `resonance = [ { half_width = "5 MHz", depth = "10 %" } ]`, `channel[0].line.resonance[0].offset: found nothing; allowed: a frequency such as "40 MHz", -1000 GHz to 1000 GHz`},
		{"delay", `resonance = [ { offset = "30 MHz", half_width = "0 MHz", depth = "10 %" } ]`, `channel[0].line.resonance[0].half_width: found "0 MHz"; allowed: a frequency such as "40 MHz", 1 kHz to 1000 GHz`},
		{"delay", `resonance = [ { offset = "30 MHz", half_width = "5 MHz", depth = "101 %" } ]`, `channel[0].line.resonance[0].depth: found "101 %"; allowed: a share such as "1.5 %", -1000 % to 100 %`},
		{"delay", `resonance = [ { offset = "0 MHz", half_width = "5 MHz", depth = "100 %" } ]`, `channel[0].line.resonance[0].depth: found a resonance that passes 0 % at the carrier; allowed: at least 1 %`},
		{"delay", `resonance = [ { offset = "0 MHz", half_width = "5 MHz", depth = "10 %", phase = "1 deg" } ]`, `channel[0].line.resonance[0].phase: found an unknown key; allowed: offset, half_width, depth, known_to`},
		{"tails", `tails = [ { amplitude = "1 %", time = "30 ns", known_to = "101 %" } ]`, `channel[0].line.tails[0].known_to: found "101 %"; allowed: a share such as "1.5 %", 0 % to 100 %`},
		{"tails", "[[channel]]\nname = \"q1 drive\"\nkind = \"quadrature\"\nmixing = \"I cos - Q sin\"\nfull_scale = \"1 MHz\"", "p.toml:LINE+1: channel[1].name: found \"q1 drive\" a second time; allowed: a name of its own for each channel"},
		{"tails", strings.Repeat("[[channel]]\n", 64), `p.toml:CHANNELS: channel: found 65 tables; allowed: at most 64`},
	} {
		line := lineOf(test.line)
		changed := slices.Clone(lines)
		changed[line-1] = test.with
		p, err := Parse("p.toml", []byte(strings.Join(changed, "\n")))
		if test.want == "" {
			if err != nil {
				t.Errorf("%s: %v", test.with, err)
			}
			continue
		}
		// The complaint stands at the replaced line, at the next one where two came for one, or where the test says.
		want := []string{fmt.Sprintf("p.toml:%d: %s", line, test.want), fmt.Sprintf("p.toml:%d: %s", line+1, test.want)}
		if strings.Contains(test.want, "p.toml:") {
			want[0] = strings.NewReplacer("SHORTEST", fmt.Sprint(lineOf("shortest")), "LINE+1", fmt.Sprint(line+1), "SECTIONS", fmt.Sprint(lineOf("[channel.line]")), "CHANNELS", fmt.Sprint(lineOf("[[channel]]")), "CHANNEL", fmt.Sprint(lineOf("[[channel]]"))).Replace(test.want)
		}
		if err == nil || !slices.Contains(want, err.Error()) || p != nil {
			t.Errorf("%q:\n got    %v\n needed %s", test.with, err, want[0])
		}
		var e *quantity.Error
		if !errors.As(err, &e) {
			t.Errorf("%q: the error is no *quantity.Error", test.with)
		}
	}
	for file, want := range map[string]string{
		"": `p.toml:1: format: found nothing; allowed: 1, and nothing else`,
		"format = 1\n[instrument]\nname = \"a\"\nsample_rate = \"1 GS/s\"\nresolution = \"14 bit\"\n": `p.toml:1: channel: found no channel; allowed: 1 to 64, each [[channel]]`,
		"format = 1\n[instrument\n": `p.toml:2: `,
		"\xff\xfe":                  `p.toml:1: `,
	} {
		if p, err := Parse("p.toml", []byte(file)); err == nil || !strings.HasPrefix(err.Error(), want) || strings.Contains(err.Error(), "\n") {
			t.Errorf("%q: got %v, %v; needed: %s...", file, p, err, want)
		}
	}
	missing := filepath.Join(t.TempDir(), "missing.toml")
	if _, err := Load(missing); err == nil || !strings.HasPrefix(err.Error(), missing+": ") || strings.Contains(err.Error(), "\n") {
		t.Errorf("missing: %v", err)
	}
}

// Channels may stand before the instrument; a fault of its sample rate is not theirs.
func TestInstrumentFaultFirst(t *testing.T) {
	const channel = "[[channel]]\nname = \"a\"\nkind = \"quadrature\"\nmixing = \"I cos - Q sin\"\nfull_scale = \"40 MHz\"\nband = \"100 MHz\"\n"
	for rate, want := range map[string]string{
		`sample_rate = "1 GHz"`:      `p.toml:10: instrument.sample_rate: found "1 GHz"; allowed: a sample rate such as "1 GS/s", 1 MS/s to 100 GS/s ("GHz" is a unit of frequency)`,
		`Sample_rate = "1 GS/s"`:     `p.toml:10: instrument.Sample_rate: found an unknown key; allowed: name, sample_rate, resolution, block, shortest, longest, align (keys are case-sensitive: write sample_rate)`,
		`resolution = "12 bit"`:      `p.toml:8: instrument.sample_rate: found nothing; allowed: a sample rate such as "1 GS/s", 1 MS/s to 100 GS/s`,
		`sample_rate = "100 MS/s"`:   `p.toml:7: channel[0].band: found "100 MHz"; allowed: a frequency such as "40 MHz", 1 kHz to 50 MHz`,
		"sample_rate = \"1 GS/s\"\n": ``,
	} {
		text := "format = 1\n" + channel + "[instrument]\nname = \"a\"\n" + rate + "\n"
		if !strings.Contains(rate, "resolution") {
			text += "resolution = \"14 bit\"\n"
		}
		_, err := Parse("p.toml", []byte(text))
		if got := fmt.Sprint(err); want == "" && err != nil || want != "" && got != want {
			t.Errorf("%s:\n got    %v\n needed %s", rate, err, want)
		}
	}
}

func TestWaveformRangeHoldsABlock(t *testing.T) {
	_, err := Parse("p.toml", []byte(`format = 1
[instrument]
name = "a"
sample_rate = "1 GS/s"
resolution = "14 bit"
block = 100
shortest = 101
longest = 199
[[channel]]
name = "a"
kind = "quadrature"
mixing = "I cos - Q sin"
full_scale = "1 MHz"
`))
	want := `p.toml:8: instrument.longest: found 101 to 199 samples; allowed: a range that holds a multiple of the block, 100`
	if err == nil || err.Error() != want {
		t.Errorf("got %v; needed: %s", err, want)
	}
}
