package rival

import (
	"context"
	"errors"
	"math"
	"math/cmplx"
	"testing"

	"holdfast/hardware"
)

func rackB(t *testing.T) *hardware.Profile {
	t.Helper()
	p, err := hardware.Load("../../testdata/skerry/rack-b.toml")
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// areaJudge knows the gate of pulses in one phase on a line without memory: the
// angle is the sum of the samples, so the infidelity is 2/3 sin² of half the
// excess, plus what a wrong phase costs.
func areaJudge(p *hardware.Profile, angle, phase, gain float64) Judge {
	full := p.Channels[0].FullScale * p.SamplePeriod * gain
	return func(x []complex128) (float64, error) {
		sum := complex128(0)
		for _, v := range x {
			sum += v
		}
		turned := cmplx.Abs(sum) * full
		off := cmplx.Phase(sum) - phase
		s, c := math.Sin((turned-angle)/2), math.Sin(off/2)*math.Sin(angle/2)
		return 2. / 3 * (s*s + 4*c*c), nil
	}
}

// Common practice on the demonstration rack: ten samples of square and fourteen
// of raised cosine make a quarter turn; with four guard samples they fill 16 and 24.
func TestSpans(t *testing.T) {
	p := rackB(t)
	list, err := Make(p, 0, math.Pi/2, 0, areaJudge(p, math.Pi/2, 0, 1))
	if err != nil || len(list) != 2 {
		t.Fatalf("%d rivals, %v", len(list), err)
	}
	for i, want := range []struct {
		name    string
		samples int
	}{{"square", 16}, {"raised cosine", 24}} {
		r := list[i]
		if r.Name != want.name || len(r.Samples) != want.samples {
			t.Errorf("%q in %d samples, want %q in %d", r.Name, len(r.Samples), want.name, want.samples)
		}
		for k, v := range r.Samples {
			if k >= want.samples-4 && v != 0 {
				t.Errorf("%s: guard sample %d is %v", r.Name, k, v)
			}
			if !(cmplx.Abs(v) <= 0.95) {
				t.Errorf("%s: sample %d is %v", r.Name, k, v)
			}
		}
	}
	// NUMERICS of the project: 1/4, 1/2, 3/4, then 0.89286 of the top.
	if got := real(list[0].Samples[4]) / real(list[0].Samples[1]); !(math.Abs(got-2) <= 1e-9) {
		t.Errorf("the plateau is %v of the second ramp step, want 2", got)
	}
}

// A judge that wants two per cent more and another phase is met by calibration.
func TestCalibration(t *testing.T) {
	p := rackB(t)
	judge := areaJudge(p, math.Pi/2, 0.3, 1/1.02)
	list, err := Make(p, 0, math.Pi/2, 0.25, judge)
	if err != nil || len(list) != 2 {
		t.Fatalf("%d rivals, %v", len(list), err)
	}
	for _, r := range list {
		if loss, _ := judge(r.Samples); !(loss <= 1e-9) {
			t.Errorf("%s: infidelity %v after calibration", r.Name, loss)
		}
	}
}

func TestJudgeFails(t *testing.T) {
	p := rackB(t)
	if _, err := Make(p, 0, math.Pi/2, 0, func([]complex128) (float64, error) { return 0, context.Canceled }); !errors.Is(err, context.Canceled) {
		t.Errorf("error %v, want that of the judge", err)
	}
}

// An instrument too weak for the angle has no rival, and no error.
func TestNoRoom(t *testing.T) {
	p := rackB(t)
	p.Longest = 8
	list, err := Make(p, 0, math.Pi/2, 0, areaJudge(p, math.Pi/2, 0, 1))
	if err != nil || len(list) != 0 {
		t.Errorf("%d rivals, %v; want none", len(list), err)
	}
}
