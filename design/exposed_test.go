package design

import (
	"context"
	"math"
	"slices"
	"strings"
	"testing"

	"holdfast/design/replay"
	"holdfast/hardware"
)

// rackInputs are those of a pulse for the test device Skerry on rack B, with the
// line or without it. The brief lacks only what names its files.
func rackInputs(t *testing.T, line bool, brief string) Inputs {
	t.Helper()
	profile := textFile(t, "skerry/rack-b.toml")
	before, after, ok := strings.Cut(profile, "[channel.line]")
	if !ok || strings.Contains(after, "[[") {
		t.Fatal("rack-b.toml does not end with its [channel.line]")
	}
	if !line {
		profile = before
	}
	return inputsOf(t, profile, textFile(t, "skerry/skerry.toml"), brief)
}

// The briefs of the two pulses: settled ends, default seed, starts and refinement.
const (
	heldDetuning = "span = \"64 ns\"\n[target]\nsite = \"q1\"\ngate = \"X90\"\n[[error]]\ndetuning = \"q1\"\n"
	heldAny      = "span = \"112 ns\"\n[target]\nsite = \"q1\"\ngate = \"X90\"\n[[error]]\nany = \"all\"\n"
)

// designed runs a design, demands that it is found, writes its folder with the
// its source files and lets replay judge that.
func designed(t *testing.T, in Inputs) (*Pulse, *replay.Folder, *replay.Verdict) {
	t.Helper()
	p, err := Run(context.Background(), in, nil)
	if err != nil {
		t.Fatal(err)
	}
	if p.Status != Found {
		t.Fatal(p.Summary())
	}
	src, err := ReadSources(in)
	if err != nil {
		t.Fatal(err)
	}
	f := writtenBack(t, p, src)
	v, err := replay.Judge(context.Background(), f)
	if err != nil {
		t.Fatal(err)
	}
	return p, f, v
}

// On the codes of 14 bit that are written: the gate is as good as rounding lets it
// be, and replay, which integrates on its own, agrees with the record.
func TestRoundedPulses(t *testing.T) {
	for _, c := range []struct{ name, brief string }{
		{"64 ns against detuning", heldDetuning},
		{"112 ns against any static error", heldAny},
	} {
		in := rackInputs(t, true, c.brief)
		if in.Profile.Bits != 14 {
			t.Fatalf("rack B has %d bit", in.Profile.Bits)
		}
		p, f, v := designed(t, in)
		claim := p.Record.Claim
		t.Logf("%s: infidelity %.3g before rounding, %.3g on the codes; agreement %+v", c.name, p.Record.Search.Before, claim.Infidelity, v.Agreement)
		if v.Ends != "settled" {
			t.Errorf("%s: judged for %s ends", c.name, v.Ends)
		}
		if !(v.Settled.Infidelity <= 3e-8) || !(claim.Infidelity <= 3e-8) {
			t.Errorf("%s: infidelity %.3g replayed, %.3g recorded; want 3e-8 or less", c.name, v.Settled.Infidelity, claim.Infidelity)
		}
		for _, x := range []struct {
			name                 string
			got, want, tolerance float64
			read                 float64 // by replay, of the claim
		}{
			{"settled infidelity", v.Settled.Infidelity, claim.Infidelity, 1e-9, f.Claim.Infidelity},
			{"window infidelity", v.Window.Infidelity, claim.InfidelityOtherEnds, 1e-9, f.Claim.InfidelityOtherEnds},
			{"tail angle", v.TailAngle, *claim.TailAngle, 1e-6, f.Claim.TailAngle},
		} {
			if !(math.Abs(x.got-x.want) <= x.tolerance) {
				t.Errorf("%s: %s %.9g replayed, %.9g recorded", c.name, x.name, x.got, x.want)
			}
			if x.read != x.want {
				t.Errorf("%s: %s: the folder says %v, the record %v", c.name, x.name, x.read, x.want)
			}
		}
		if n := len(p.Record.Model.Errors); n < 5 {
			t.Errorf("%s: the record tells of %d errors", c.name, n)
		}
		for _, e := range p.Record.Model.Errors {
			got := foundError(t, v, e.Name)
			if !(math.Abs(got.Susceptibility-e.Susceptibility) <= 1e-5) {
				t.Errorf("%s: susceptibility to %s %.9g replayed, %.9g recorded", c.name, e.Name, got.Susceptibility, e.Susceptibility)
			}
			if e.Held && !(got.Susceptibility <= 1e-3) {
				t.Errorf("%s: susceptibility to %s %.3g, which it is held against", c.name, e.Name, got.Susceptibility)
			}
		}
		if !v.Met() {
			t.Errorf("%s: replay is not satisfied: limits %+v, agreement %+v, inputs %v, requirements %+v", c.name, v.Limits, v.Agreement, v.Inputs, v.Requirements)
		}
	}
}

// A pulse for a line that is not there, played through the one that is: its record
// promises what its sibling keeps, and replay exposes it. The infidelity depends on
// which pulse is found: a line of unit gain leaves the area of the drive as it is, and
// settled ends count all of it, so a pulse that turns nearly about one axis hides
// the line (area 90 degrees: 1e-6), while the refined ones, which need both axes, do
// not. The susceptibility shows in every one.
func TestLineLeftOut(t *testing.T) {
	with, without := rackInputs(t, true, heldDetuning), rackInputs(t, false, heldDetuning)
	_, honest, v := designed(t, with)
	if e := foundError(t, v, "detuning"); !v.Met() || !(v.Settled.Infidelity <= 3e-8) || !(e.Susceptibility <= 1e-3) {
		t.Errorf("designed with the line: infidelity %.3g, susceptibility %.3g", v.Settled.Infidelity, e.Susceptibility)
	}
	for seed := range uint64(4) { // 0: the default settings; else without refinement
		if seed > 0 {
			without.Brief.Seed, without.Brief.Refine = seed, false
		}
		p, _, v := designed(t, without)
		if e := foundError(t, v, "detuning"); !v.Met() || !(v.Settled.Infidelity <= 3e-8) || !(e.Susceptibility <= 1e-3) {
			t.Errorf("designed and judged without a line: infidelity %.3g, susceptibility %.3g", v.Settled.Infidelity, e.Susceptibility)
		}
		rounded, err := hardware.SamplesOf(p.Channels[0].Codes, without.Profile.Bits)
		if err != nil {
			t.Fatal(err)
		}
		v, err = honest.Model.WithSamples(len(rounded), rounded).Judge(context.Background(), 1e-4)
		if err != nil {
			t.Fatal(err)
		}
		s := foundError(t, v, "detuning").Susceptibility
		t.Logf("line left out: infidelity %.3g settled, %.3g window; susceptibility to detuning %.3g", v.Settled.Infidelity, v.Window.Infidelity, s)
		if !(s >= 1e-2 && s <= 6e-2) {
			t.Errorf("line left out: susceptibility to detuning %.3g, want about 2e-2 to 4e-2", s)
		}
		if seed > 0 {
			continue
		}
		for _, got := range []float64{v.Settled.Infidelity, v.Window.Infidelity} {
			if !(got >= 2e-4 && got <= 1e-2) {
				t.Errorf("line left out: infidelity %.3g, want about 1e-3", got)
			}
		}
		// A folder whose [model] has no line but whose inputs/ have one contradicts itself.
		src, err := ReadSources(with)
		if err != nil {
			t.Fatal(err)
		}
		v, err = replay.Judge(context.Background(), writtenBack(t, p, src))
		if err != nil {
			t.Fatal(err)
		}
		noticed := slices.ContainsFunc(v.Inputs, func(d replay.Difference) bool { return strings.Contains(d.Key, "poles") })
		if v.Met() || !noticed {
			t.Errorf("replay does not notice that the poles of inputs/ are not in [model]: %v", v.Inputs)
		}
	}
}

// Rounding to B bits costs about
//
//	(1/6) 2 T h (O LSB)²/12
//
// in infidelity, with the span T and the sample period h in ns, full scale O in rad/ns
// and LSB = 2/2^B: the errors of the samples of both quadratures, uniform within
// half a step either way, add up to one random turn. It is an order of magnitude
// only (single pulses were seen to scatter from 0.06 to 4 times), so the mean of several
// seeds is taken.
func TestRoundingCosts(t *testing.T) {
	in := rackInputs(t, true, heldDetuning)
	const seeds = 6
	for _, bits := range []int{8, 10, 12, 14} {
		profile := *in.Profile
		profile.Bits = bits
		lsb := math.Ldexp(2, -bits)
		rule := 1. / 6 * 2 * in.Brief.Span * profile.SamplePeriod * math.Pow(profile.Channels[0].FullScale*lsb, 2) / 12
		mean := 0.0
		for seed := range uint64(seeds) {
			b := *in.Brief
			b.Seed, b.Refine = seed+1, false
			p, err := Run(context.Background(), Inputs{Brief: &b, Profile: &profile, Device: in.Device, Version: "test"}, nil)
			if err != nil {
				t.Fatal(err)
			}
			if p.Status != Found || !(p.Record.Search.Before <= 1e-3*rule) {
				t.Fatalf("%d bit: %s; infidelity %.3g before rounding", bits, p.Summary(), p.Record.Search.Before)
			}
			mean += p.Record.Claim.Infidelity / seeds
		}
		t.Logf("%d bit: mean infidelity %.3g, %.2f of the rule's %.3g", bits, mean, mean/rule, rule)
		if !(mean >= rule/4 && mean <= 4*rule) {
			t.Errorf("%d bit: mean infidelity %.3g, want %.3g within a factor of 4", bits, mean, rule)
		}
	}
}
