package design

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"holdfast/design/brief"
	"holdfast/design/replay"
)

// A scene is an instrument, a device and a brief with one thing out of the
// ordinary. Everything must come through the whole road: found, playable, and
// agreed with by replay, which computes each by its own means.
type scene struct {
	name                 string
	channel              string // keys of the drive's [[channel]]
	line                 string // its [channel.line]
	more                 string // further channels
	site                 string // further keys of the device's [[site]]
	device               string // further tables of the device
	head, target, errors string // of the brief
	ns                   int
}

const plainLine = "delay = \"3.2 ns\"\nlowpass = { family = \"bessel\", order = 2, corner = \"200 MHz\" }\ntails = [ { amplitude = \"-1.5 %\", time = \"30 ns\", known_to = \"20 %\" } ]\n"

var scenes = []scene{
	{name: "fourier", head: "[basis]\nfamily = \"fourier\"", ns: 64, errors: "[[error]]\ndetuning = \"q1\""},
	{name: "b-spline", head: "[basis]\nfamily = \"b-spline\"", ns: 72, errors: "[[error]]\ndetuning = \"q1\""},
	{name: "best", head: "[basis]\nfamily = \"best\"", ns: 64, errors: "[[error]]\ndetuning = \"q1\""},
	{name: "tail and corner", ns: 96, line: strings.Replace(plainLine, "\"200 MHz\"", "\"200 MHz\", known_to = \"5 %\"", 1), head: "hold = \"profile\""},
	{name: "delay", ns: 72, errors: "[[error]]\nline = \"q1 drive\"\nparameter = \"delay\"\nsize = \"3 %\""},
	{name: "one quadrature", ns: 72, errors: "[[error]]\namplitude = \"q1 drive\"\nquadrature = \"Q\"\n[[error]]\nquadrature_angle = \"q1 drive\""},
	{name: "offset", ns: 96, errors: "[[error]]\noffset = \"q1 drive\""},
	{name: "free Z", ns: 64, target: "free_z = \"both\"", errors: "[[error]]\ndetuning = \"q1\""},
	{name: "free Z after", ns: 64, target: "free_z = \"after\"", errors: "[[error]]\ndetuning = \"q1\""},
	{name: "rms and band", ns: 80, channel: "rms_limit = \"60 %\"\nout_of_band = \"0.2 %\"", errors: "[[error]]\ndetuning = \"q1\""},
	{name: "box", ns: 64, channel: "envelope = \"box\"", errors: "[[error]]\ndetuning = \"q1\""},
	{name: "zero mean", ns: 96, channel: "zero_mean = true", line: plainLine + "ac_coupling = \"1 ms\"\n", errors: "[[error]]\ndetuning = \"q1\""},
	{name: "asymmetric line", ns: 72, line: plainLine + "resonance = [ { offset = \"60 MHz\", half_width = \"20 MHz\", depth = \"4 %\" } ]\n", errors: "[[error]]\ndetuning = \"q1\""},
	{name: "compression and shift", ns: 80, channel: "compression = [[\"0 %\", \"0 %\"], [\"50 %\", \"49 %\"], [\"100 %\", \"94 %\"]]\nshift = \"200 kHz\"", errors: "[[error]]\ndetuning = \"q1\"\n[[error]]\namplitude = \"q1 drive\""},
	{name: "bias", ns: 64, more: `[[channel]]
name = "q1 flux"
kind = "baseband"
full_scale = "20 MHz"
slew_limit = "25 %/sample"
band = "100 MHz"
guard = { lead = 0, trail = 4 }
ring_out = { limit = "0.1 %", fast = "8 ns" }
latency = "1.3 ns"
[channel.line]
delay = "2.4 ns"
lowpass = { family = "single-pole", corner = "250 MHz" }
`, device: "[[bias]]\nsite = \"q1\"\nchannel = \"q1 flux\"\n", errors: "[[error]]\ndetuning = \"q1\"\n[[error]]\namplitude = \"q1 drive\""},
	{name: "by samples, the other way", site: "levels = 2", ns: 64, head: "phase_by = \"samples\"\nphases = [\"90 deg\", \"180 deg\", \"37 deg\"]", errors: "[[error]]\ndetuning = \"q1\""},
	{name: "by samples, three levels", site: "levels = 3\nanharmonicity = \"-220 MHz\"", ns: 40, head: "hold = \"nothing\"\nphase_by = \"samples\"\nphases = [\"90 deg\"]"},
	{name: "many errors", ns: 160, head: "refine = false\nhold = \"profile\"", line: strings.NewReplacer("\"200 MHz\"", "\"200 MHz\", known_to = \"5 %\"", "\"30 ns\", known_to", "\"30 ns\", known_to").Replace(plainLine),
		errors: "[[error]]\ndetuning = \"q1\"\n[[error]]\nquadrature_angle = \"q1 drive\"\n[[error]]\namplitude = \"q1 drive\"\nquadrature = \"I\"\n[[error]]\namplitude = \"q1 drive\"\nquadrature = \"Q\"\nname = \"Q\"\n[[error]]\nline = \"q1 drive\"\nparameter = \"delay\""},
	{name: "three levels", ns: 40, site: "levels = 3\nanharmonicity = \"-220 MHz\"", head: "hold = \"nothing\""},
	{name: "three levels, detuning", ns: 64, head: "refine = false", site: "levels = 3\nanharmonicity = \"-220 MHz\"", errors: "[[error]]\ndetuning = \"q1\""},
	{name: "by samples", ns: 64, head: "phase_by = \"samples\"\nphases = [\"90 deg\", \"180 deg\", \"37 deg\"]", errors: "[[error]]\ndetuning = \"q1\""},
}

func (s scene) inputs(t *testing.T) Inputs {
	t.Helper()
	dir := t.TempDir()
	line := s.line
	if line == "" {
		line = plainLine
	}
	write := func(name, text string) {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	write("p.toml", `format = 1
[instrument]
name = "invented"
sample_rate = "1 GS/s"
resolution = "14 bit"
block = 8
[[channel]]
name = "q1 drive"
kind = "quadrature"
mixing = "I cos - Q sin"
full_scale = "40 MHz"
amplitude_limit = "95 %"
slew_limit = "25 %/sample"
band = "100 MHz"
guard = { lead = 0, trail = 4 }
ring_out = { limit = "0.1 %", fast = "8 ns" }
`+s.channel+"\n[channel.line]\n"+line+s.more)
	if strings.Contains(s.site, "levels") { // a ladder stands on |0>, the lower level
		s.site += "\nzero = \"lower\""
	} else {
		s.site += "\nzero = \"upper\""
	}
	write("d.toml", "format = 1\nname = \"invented\"\n[[site]]\nname = \"q1\"\n"+s.site+"\n[[drive]]\nsite = \"q1\"\nchannel = \"q1 drive\"\n"+s.device)
	head, basis, _ := strings.Cut(s.head, "[basis]")
	if basis != "" {
		basis = "[basis]" + basis
	}
	write("b.toml", fmt.Sprintf("format = 1\nname = \"x\"\nprofile = \"p.toml\"\ndevice = \"d.toml\"\nspan = \"%d ns\"\n%s\n[target]\nsite = \"q1\"\ngate = \"X90\"\n%s\n%s\n%s\n[require]\ninfidelity = 1e-6\n", s.ns, head, s.target, basis, s.errors))
	b, p, d, err := brief.LoadAll(filepath.Join(dir, "b.toml"))
	if err != nil {
		t.Fatalf("%s: %v", s.name, err)
	}
	return Inputs{Brief: b, Profile: p, Device: d, Version: "test"}
}

// folderOf designs and writes a pulse, and opens its folder as replay does. It
// returns how long the design took, for those that print it.
func folderOf(t *testing.T, in Inputs) (*Pulse, *replay.Folder, time.Duration) {
	t.Helper()
	begun := time.Now()
	p, err := Run(context.Background(), in, nil)
	if err != nil {
		t.Fatal(err)
	}
	took := time.Since(begun)
	src, err := ReadSources(in)
	if err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	if err := p.Write(dir, src); err != nil {
		t.Fatal(err)
	}
	f, err := replay.Open(dir)
	if err != nil {
		t.Fatal(err)
	}
	return p, f, took
}

func TestWidth(t *testing.T) {
	for _, s := range scenes {
		t.Run(s.name, func(t *testing.T) {
			in := s.inputs(t)
			p, f, _ := folderOf(t, in)
			v, err := replay.Judge(context.Background(), f)
			if err != nil {
				t.Fatal(err)
			}
			// what the record calls the samples before rounding must be those
			exact, err := f.Model.BeforeRounding().Judge(context.Background(), 1e-4)
			if err != nil {
				t.Fatal(err)
			}
			tol := 1e-10
			if in.Brief.Target.FreeZ != brief.NoFreeZ { // the recorded angles are the best of the codes
				tol = 1e-8
			}
			if !(exact.Required().Infidelity <= tol) {
				t.Errorf("infidelity %.2g before rounding", exact.Required().Infidelity)
			}
			t.Logf("%s; infidelity %.2g; differs by %.2g, %.2g, %.2g; inputs %v", p.Summary(), v.Required().Infidelity, v.Agreement.Infidelity, v.Agreement.Susceptibility, v.Agreement.TailAngle, v.Inputs)
			if p.Status != Found {
				t.Fatalf("%s", p.Summary())
			}
			if !v.Met() {
				for _, r := range v.Requirements {
					t.Logf("%+v", r)
				}
				for _, l := range v.Limits {
					t.Logf("%+v", l)
				}
				t.Errorf("replay does not agree, or a limit or a requirement is broken: %+v %v", v.Agreement, v.Inputs)
			}
			for _, h := range p.Record.Headroom {
				if !h.Kept {
					t.Errorf("%s: %s breaks its limit", h.Channel, h.Limit)
				}
			}
			for _, e := range v.Errors {
				if e.Held && !(e.Susceptibility <= 1e-3) {
					t.Errorf("%s: susceptibility %.2g", e.Name, e.Susceptibility)
				}
			}
			if n := len(in.Brief.Phases); len(p.Turned) != n || len(p.Record.Pulse.Phases) != n {
				t.Fatalf("%d waveforms turned, %d recorded, want %d", len(p.Turned), len(p.Record.Pulse.Phases), n)
			}
			for i, ph := range p.Record.Pulse.Phases {
				if !ph.Kept || !(ph.Infidelity <= 1e-7) || len(ph.Files) != 4 {
					t.Errorf("turned by %v: %+v", ph.Angle, ph)
				}
				// by replay: D T D' with D = exp(-i angle Z/2)
				turned := f.Model.WithSamples(f.Model.Samples, p.Turned[i].Channels[0].Exact)
				turned.Target = append([]complex128(nil), turned.Target...)
				turned.Target[1] *= cmplx.Rect(1, -p.Turned[i].Angle)
				turned.Target[2] *= cmplx.Rect(1, p.Turned[i].Angle)
				g, _, _, err := turned.Figures(context.Background())
				if err != nil || !(g.Infidelity <= 1e-9) {
					t.Errorf("turned by %v: infidelity %.2g by replay, %v", ph.Angle, g.Infidelity, err)
				}
			}
		})
	}
}

// TestTwoLevelsOnThree replays a pulse that was designed for a spin on a ladder of
// three levels: the light shift of the third costs 1e-3 and more, far above what
// the design for the ladder itself leaves.
func TestTwoLevelsOnThree(t *testing.T) {
	run := func(s scene) (*Pulse, *replay.Model) {
		p, f, _ := folderOf(t, s.inputs(t))
		return p, f.Model
	}
	detuning := "[[error]]\ndetuning = \"q1\""
	two, _ := run(scene{site: "levels = 2", ns: 64, head: "refine = false", errors: detuning})
	three, m := run(scene{site: "levels = 3\nanharmonicity = \"-220 MHz\"", ns: 64, head: "refine = false", errors: detuning})
	own, _, _, err := m.Figures(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	strange, _, _, err := m.WithSamples(64, two.Channels[0].Exact).Figures(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	t.Logf("%s; on three levels infidelity %.2g, leakage %.2g; the spin's pulse there: %.2g, %.2g", three.Summary(), own.Infidelity, own.Leakage, strange.Infidelity, strange.Leakage)
	if !(own.Infidelity <= 1e-8) || !(own.Leakage <= 1e-8) {
		t.Errorf("designed for the ladder: infidelity %.2g, leakage %.2g", own.Infidelity, own.Leakage)
	}
	if !(strange.Infidelity >= 1e-3 && strange.Infidelity <= 1e-2) {
		t.Errorf("designed for a spin: infidelity %.2g on the ladder; want 1e-3 to 1e-2", strange.Infidelity)
	}
}

// TestSizes: an error of size f adds a field of 2π f, whatever its operator.
func TestSizes(t *testing.T) {
	in := scene{ns: 64, errors: "[[error]]\ndetuning = \"q1\"\nsize = \"2 MHz\"\n[[error]]\noperator = \"X\"\nsize = \"2 MHz\"\n[[error]]\nany = \"all\"\nsize = \"2 MHz\""}.inputs(t)
	q, err := newTask(in, brief.Slepian)
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range q.spin.Held {
		if want := 2 * math.Pi * 2e-3; !(math.Abs(c.Size-want) <= 1e-15) {
			t.Errorf("%s: size %v rad/ns, want %v", c.Name, c.Size, want)
		}
	}
}
