package main

import (
	"context"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"holdfast/design"
	"holdfast/design/brief"
	"holdfast/design/datasheet"
	"holdfast/design/replay"
	"holdfast/hardware"
)

// sheetOf replays a folder and gathers its sheet.
func sheetOf(t *testing.T, pulse string) *datasheet.Sheet {
	t.Helper()
	folder, err := replay.Open(pulse)
	if err != nil {
		t.Fatal(err)
	}
	record, err := design.ReadRecord(pulse)
	if err != nil {
		t.Fatal(err)
	}
	in, err := folderInputs(pulse)
	if err != nil {
		t.Fatal(err)
	}
	s, _, err := judged(context.Background(), in, record, folder)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// fluxChannel is a second output, which turns the spin about Z; its line is slower, so that the drive's samples wait for it, and no whole number of samples brings
// the two together.
const fluxChannel = `
[[channel]]
name = "q1 flux"
kind = "baseband"
full_scale = "10 MHz"
full_scale_level = "1 V"
band = "100 MHz"
guard = { trail = 4 }
[channel.line]
delay = "4.6 ns"
lowpass = { family = "single-pole", corner = "250 MHz" }
`

// Every channel is told, with what it plays and what arrives of it behind compression and line: the same as the folder's own file of arrivals.
func TestSheetOfSeveralChannels(t *testing.T) {
	dir := newLab(t)
	rack, device := filepath.Join(dir, "rack-b.toml"), filepath.Join(dir, "skerry.toml")
	change(t, rack, "slew_limit =", "compression = [[\"0 %\", \"0 %\"], [\"50 %\", \"45 %\"], [\"100 %\", \"75 %\"]]\nslew_limit =")
	write(t, rack, read(t, rack)+fluxChannel)
	write(t, device, read(t, device)+"\n[[bias]]\nsite = \"q1\"\nchannel = \"q1 flux\"\n")
	pulse := filepath.Join(dir, "pulse")
	status, stdout, stderr := play("design", filepath.Join(dir, "held.toml"), "-out", pulse)
	if status != exitMet {
		t.Fatalf("design: %d, %s%s", status, stdout, stderr)
	}
	s := sheetOf(t, pulse)
	if len(s.Channels) != 2 || s.Channels[0].Name != "q1 drive" || s.Channels[1].Name != "q1 flux" || s.Channels[0].Baseband || !s.Channels[1].Baseband {
		t.Fatalf("channels %+v", s.Channels)
	}
	if s.Channels[0].Reached == nil || s.Channels[1].Reached != nil || s.Channels[0].RingOutLimit != 0.001 || !math.IsInf(s.Channels[1].RingOutLimit, 1) {
		t.Errorf("compression or limits of the wrong channel")
	}
	for i, name := range []string{"q1-drive", "q1-flux"} {
		c := &s.Channels[i]
		rows := 2*8*len(c.Samples) + 1
		want, _, err := hardware.ReadNPY[float64](filepath.Join(pulse, name+"-arrives.npy"), rows, 3)
		if err != nil {
			t.Fatal(err)
		}
		largest, at := 0.0, 0
		for r := 0; r+3 <= len(want); r += 3 {
			time, u := want[r], complex(want[r+1], want[r+2])/complex(c.FullScale, 0)
			for at+1 < len(c.Arrives) && c.Arrives[at+1].Time < time {
				at++
			}
			if at+1 == len(c.Arrives) {
				break
			}
			a, b := c.Arrives[at], c.Arrives[at+1]
			if time < a.Time {
				t.Fatalf("%s: arrivals begin at %g ns, the file's at %g", name, a.Time, time)
			}
			share := (time - a.Time) / (b.Time - a.Time)
			got := a.U + complex(share, 0)*(b.U-a.U)
			if !(cmplx.Abs(got-u) <= 0.01) { // between points 1/8 ns apart it is taken as straight
				t.Errorf("%s at %g ns: %.4g, the file has %.4g", name, time, got, u)
				break
			}
			largest = math.Max(largest, cmplx.Abs(u))
		}
		if !(largest > 0.2) {
			t.Errorf("%s: nothing arrives", name)
		}
	}
	page := read(t, filepath.Join(pulse, "datasheet.html"))
	for _, want := range []string{"<h3>q1 drive</h3>", "<h3>q1 flux</h3>", "Samples played of q1 flux", "compression leaves at most", "q1 drive: At full scale the connector puts out 500", "q1 flux: At full scale the connector puts out 1"} {
		if !strings.Contains(strings.ReplaceAll(page, "\u00a0", " "), want) {
			t.Errorf("the page does not say %q", want)
		}
	}
	// the drive alone plays the rivals, through its compression, and they are right
	if len(s.Rivals) != 2 {
		t.Fatalf("%d rivals", len(s.Rivals))
	}
	for _, r := range s.Rivals {
		if r.Channel != 0 || !(r.Infidelity <= 1e-9) {
			t.Errorf("%s by channel %d: infidelity %.2g", r.Name, r.Channel, r.Infidelity)
		}
	}
}

// Textbook pulses are played on resonance, whichever energy |0> has and however the mixer turns, and for negative turns too.
func TestRivalsOnResonance(t *testing.T) {
	dir := newLab(t)
	rack, device, file := filepath.Join(dir, "rack-b.toml"), filepath.Join(dir, "skerry.toml"), filepath.Join(dir, "quick.toml")
	zero, mixing, gate := `zero = "upper"`, `mixing = "I cos - Q sin"`, `gate = "X90"`
	for i, c := range []struct{ zero, mixing, gate, detuning string }{
		{`zero = "upper"`, `mixing = "I cos - Q sin"`, `gate = "X90"`, "0 MHz"},
		{`zero = "upper"`, `mixing = "I cos - Q sin"`, `gate = "Y90"`, "2 MHz"},
		{`zero = "lower"`, `mixing = "I cos - Q sin"`, `gate = "Y90"`, "2 MHz"},
		{`zero = "lower"`, `mixing = "I cos + Q sin"`, `gate = "-X90"`, "-1 MHz"},
		{`zero = "upper"`, `mixing = "I cos + Q sin"`, `gate = "-Y90"`, "2 MHz"},
	} {
		change(t, device, zero, c.zero)
		change(t, rack, mixing, c.mixing)
		change(t, file, gate, c.gate)
		zero, mixing, gate = c.zero, c.mixing, c.gate
		text := read(t, device)
		change(t, device, `detuning = "0 MHz"`, `detuning = "`+c.detuning+`"`)
		pulse := filepath.Join(dir, "pulse")
		if status, stdout, stderr := play("design", file, "-out", pulse); status != exitMet {
			t.Fatalf("%d: design: %d, %s%s", i, status, stdout, stderr)
		}
		s := sheetOf(t, pulse)
		if len(s.Rivals) != 2 {
			t.Errorf("%+v: %d rivals", c, len(s.Rivals))
		}
		for _, r := range s.Rivals {
			if !(r.Infidelity <= 1e-9) {
				t.Errorf("%+v: %s has infidelity %.2g without error", c, r.Name, r.Infidelity)
			}
		}
		sign := map[string]float64{`zero = "upper"`: 1, `zero = "lower"`: -1}[c.zero]
		if want := sign * map[string]float64{"0 MHz": 0, "2 MHz": 2, "-1 MHz": -1}[c.detuning]; !(math.Abs(s.Detuning-want) <= 1e-12) {
			t.Errorf("%+v: the device's own detuning is %g MHz of Z/2, want %g", c, s.Detuning, want)
		}
		if strings.Contains(read(t, filepath.Join(pulse, "datasheet.html")), "on top of the device") != (c.detuning != "0 MHz") {
			t.Errorf("%+v: the page's captions of detuning", c)
		}
		if err := os.RemoveAll(pulse); err != nil {
			t.Fatal(err)
		}
		write(t, device, text)
	}
}

// Where the instrument states no limit on ring-out the rivals' is still a figure, and no limit is broken.
func TestRivalsWithoutRingOutLimit(t *testing.T) {
	dir := newLab(t)
	change(t, filepath.Join(dir, "rack-b.toml"), "ring_out", "# ring_out")
	pulse := filepath.Join(dir, "pulse")
	if status, stdout, stderr := play("design", filepath.Join(dir, "quick.toml"), "-out", pulse); status != exitMet {
		t.Fatalf("design: %d, %s%s", status, stdout, stderr)
	}
	s := sheetOf(t, pulse)
	if len(s.Rivals) != 2 {
		t.Fatalf("%d rivals", len(s.Rivals))
	}
	for _, r := range s.Rivals {
		if r.BreaksRingOut || !(r.RingOut > 1e-3 && r.RingOut < 1e-2) {
			t.Errorf("%s: ring-out %g, broken: %v", r.Name, r.RingOut, r.BreaksRingOut)
		}
	}
	if !strings.Contains(read(t, filepath.Join(pulse, "datasheet.html")), "no limit stated") {
		t.Error("the page does not say that there is no limit")
	}
}

// Only a design that ended as asked exits 0: one that was cut short, or found no zero, does not, even where its pulse happens to
// meet what is required.
func TestStatusCounts(t *testing.T) {
	met, missed := &replay.Verdict{Agreement: replay.Agreement{OK: true}}, &replay.Verdict{}
	for _, c := range []struct {
		status design.Status
		v      *replay.Verdict
		want   int
	}{
		{design.Found, met, exitMet}, {design.Found, missed, exitMissed},
		{design.NotFound, met, exitMissed}, {design.NotFound, missed, exitMissed},
		{design.Interrupted, met, exitInterrupted}, {design.Interrupted, missed, exitInterrupted},
	} {
		if got := pulseStatus(&design.Record{Pulse: design.PulseFacts{Status: string(c.status)}}, c.v); got != c.want {
			t.Errorf("%s, met %v: exit %d, want %d", c.status, c.v.Met(), got, c.want)
		}
	}
	// a waveform that was turned counts as much as the base one
	turned := &design.Record{Pulse: design.PulseFacts{Status: string(design.Found), Phases: []design.PhaseFacts{{Infidelity: 1e-9, Kept: true}}}}
	turned.Require.Infidelity = 1e-6
	if got := pulseStatus(turned, met); got != exitMet {
		t.Errorf("turned: exit %d", got)
	}
	turned.Pulse.Phases = append(turned.Pulse.Phases, design.PhaseFacts{Infidelity: 0.1, Kept: true})
	if got := pulseStatus(turned, met); got != exitMissed {
		t.Errorf("turned and off: exit %d, want %d", got, exitMissed)
	}
	_, pulse := newPulse(t)
	if status, _, _ := play("replay", pulse); status != exitMet {
		t.Fatalf("replay: %d", status)
	}
	for _, status := range []design.Status{design.NotFound, design.Interrupted} {
		text := read(t, filepath.Join(pulse, "pulse.toml"))
		change(t, filepath.Join(pulse, "pulse.toml"), `status = "found"`, `status = "`+string(status)+`"`)
		exit, stdout, stderr := play("replay", pulse)
		if exit != exitMissed || stderr != "" {
			t.Errorf("replay of a pulse that was %s: exit %d, %s", status, exit, stderr)
		}
		mustHave(t, "replay", stdout, "infidelity < 1e-9 in this model at most 1e-4 met", "("+string(status)+").")
		exit, stdout, _ = play("replay", "-json", pulse)
		if exit != exitMissed || !strings.Contains(strings.Join(strings.Fields(stdout), ""), `"met":false,"held"`) {
			t.Errorf("replay -json of a pulse that was %s: exit %d", status, exit)
		}
		write(t, filepath.Join(pulse, "pulse.toml"), text)
	}
}

// A textbook pulse about an axis at angle a in the XY plane has its samples at phase a where Q turns about +Y and at -a where it turns about -Y; on a device that runs by
// d Z/2 they run after it with d, or with -d.
func TestTurnOf(t *testing.T) {
	const d = 0.02 // rad/ns
	for _, side := range []float64{1, -1} {
		y := complex(0, -side/2)
		m := &replay.Model{Dim: 2, Static: []complex128{d / 2, 0, 0, -d / 2}, Channels: []replay.Channel{{}, {
			Operators: [][]complex128{{0, 0.5, 0.5, 0}, {0, y, -y, 0}},
		}}}
		for _, c := range []struct{ axis, angle, wantAngle, wantPhase float64 }{{0, 1, 1, 0}, {0.7, 1.5, 1.5, 0.7}, {0.7, -1.5, 1.5, 0.7 + math.Pi}} {
			got := turnOf(brief.Target{Angle: c.angle, Axis: [3]float64{math.Cos(c.axis), math.Sin(c.axis), 0}}, m, 1)
			if off := math.Remainder(got.Phase-side*c.wantPhase, 2*math.Pi); !(math.Abs(off) <= 1e-12) || got.Angle != c.wantAngle || !(math.Abs(got.Slope-side*d) <= 1e-15) {
				t.Errorf("%+v, Q by %g: %+v", c, side, got)
			}
		}
	}
}
