package rival

import (
	"context"
	"errors"
	"math"
	"math/cmplx"
	"slices"
	"testing"

	"holdfast/design/device"
	"holdfast/filter"
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
	list, err := Make(p, 0, Turn{Angle: math.Pi / 2}, areaJudge(p, math.Pi/2, 0, 1))
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
	// The least plateau of ten samples (package shape): 1/4, 1/2, 3/4, then 0.89286 of the top.
	if got := real(list[0].Samples[4]) / real(list[0].Samples[1]); !(math.Abs(got-2) <= 1e-9) {
		t.Errorf("the plateau is %v of the second ramp step, want 2", got)
	}
}

// A judge that wants two per cent more and another phase is met by calibration.
func TestCalibration(t *testing.T) {
	p := rackB(t)
	judge := areaJudge(p, math.Pi/2, 0.3, 1/1.02)
	list, err := Make(p, 0, Turn{Angle: math.Pi / 2, Phase: 0.25}, judge)
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
	if _, err := Make(p, 0, Turn{Angle: math.Pi / 2}, func([]complex128) (float64, error) { return 0, context.Canceled }); !errors.Is(err, context.Canceled) {
		t.Errorf("error %v, want that of the judge", err)
	}
}

// An instrument too weak for the angle has no rival, and no error.
func TestNoRoom(t *testing.T) {
	p := rackB(t)
	p.Longest = 8
	list, err := Make(p, 0, Turn{Angle: math.Pi / 2}, areaJudge(p, math.Pi/2, 0, 1))
	if err != nil || len(list) != 0 {
		t.Errorf("%d rivals, %v; want none", len(list), err)
	}
}

// spinJudge plays samples sample by sample on a spin that is detuned by so many rad/ns, without a line; side is the sign of Q.
func spinJudge(p *hardware.Profile, target device.Matrix, detuning, side float64) Judge {
	full := p.Channels[0].FullScale
	return func(x []complex128) (float64, error) {
		u := device.Identity(2)
		for _, v := range x {
			a, b, c := full*real(v), side*full*imag(v), detuning
			rate := math.Sqrt(a*a + b*b + c*c)
			if rate > 0 {
				u = device.Rotation([3]float64{a / rate, b / rate, c / rate}, rate*p.SamplePeriod).Mul(u)
			}
		}
		t := target.Adjoint().Mul(u).Trace() / 2
		return 2. / 3 * (1 - real(t)*real(t) - imag(t)*imag(t)), nil
	}
}

// Off resonance a textbook pulse is calibrated in amplitude, phase and frequency, three figures for the three of a rotation: nothing is left of
// it, and the same input gives the same samples. Amplitude and phase alone leave 1e-4 and more.
func TestDetuned(t *testing.T) {
	for _, mhz := range []float64{0.5, -2, 4} {
		for _, side := range []float64{1, -1} {
			p := rackB(t)
			detuning := 2 * math.Pi * mhz * 1e-3
			calls := 0
			inner := spinJudge(p, device.Rotation([3]float64{1}, math.Pi/2), detuning, side)
			judge := func(x []complex128) (float64, error) {
				if calls++; calls == 1 { // it starts on resonance
					if got, want := cmplx.Phase(x[5]/x[4]), side*detuning*p.SamplePeriod; !(math.Abs(got-want) <= 1e-12) {
						t.Errorf("%g MHz, Q by %g: the phase of the first samples runs by %g rad a sample, want %g", mhz, side, got, want)
					}
				}
				return inner(x)
			}
			turn := Turn{Angle: math.Pi / 2, Slope: side * detuning}
			list, err := Make(p, 0, turn, judge)
			if err != nil || len(list) != 2 {
				t.Fatalf("%g MHz: %d rivals, %v", mhz, len(list), err)
			}
			for _, r := range list {
				if loss, _ := inner(r.Samples); !(loss <= 1e-9) {
					t.Errorf("%g MHz, Q by %g: %s has infidelity %.2g", mhz, side, r.Name, loss)
				}
				mustKeep(t, p, r)
			}
			if calls > 4000 {
				t.Errorf("%g MHz: %d evaluations", mhz, calls)
			}
			again, err := Make(p, 0, turn, inner)
			if err != nil || !slices.EqualFunc(list, again, func(a, b Rival) bool { return slices.Equal(a.Samples, b.Samples) }) {
				t.Errorf("%g MHz: a second run gives other samples, %v", mhz, err)
			}
			// what the frequency is for
			x := list[0].Samples
			flat := func(scale, off, _ float64) []complex128 {
				y := make([]complex128, len(x))
				for k, v := range x {
					y[k] = cmplx.Rect(scale*cmplx.Abs(v), off)
				}
				return y
			}
			y, err := calibrate(flat, 0, float64(len(x)), inner)
			if loss, _ := inner(y); err != nil || !(loss >= 1e-5) {
				t.Errorf("%g MHz: without a frequency the square has %.2g, %v", mhz, loss, err)
			}
		}
	}
}

// mustKeep asks the instrument's own check.
func mustKeep(t *testing.T, p *hardware.Profile, r Rival) {
	t.Helper()
	readings, err := p.CheckSamples(0, r.Samples)
	if err != nil {
		t.Fatal(err)
	}
	for _, q := range readings {
		if (q.Limit == hardware.Amplitude || q.Limit == hardware.Slew || q.Limit == hardware.Guards) && !(q.Found <= q.Allowed*(1+2e-9)) {
			t.Errorf("%s: %s is %g, allowed %g", r.Name, q.Limit, q.Found, q.Allowed)
		}
	}
}

// Calibrated, a pulse of the shortest length may need more than the limits leave. Then a slower one is made, or none where the
// waveform would be too long; none breaks a limit.
func TestOverdriven(t *testing.T) {
	p := rackB(t)
	shortest := 0
	for _, more := range []float64{1, 1.02, 1.1, 1.25, 3} {
		list, err := Make(p, 0, Turn{Angle: math.Pi / 2}, areaJudge(p, math.Pi/2, 0, 1/more))
		if err != nil {
			t.Fatal(err)
		}
		if more < 1.3 && len(list) != 2 || more > 2 && len(list) != 0 {
			t.Errorf("with %g times the area %d rivals", more, len(list))
		}
		for _, r := range list {
			mustKeep(t, p, r)
		}
		if more == 1 {
			shortest = len(list[0].Samples)
		}
	}
	p.Longest = shortest // no room for a slower one: fourteen samples of raised cosine do not fit, nor a square with more area
	list, err := Make(p, 0, Turn{Angle: math.Pi / 2}, areaJudge(p, math.Pi/2, 0, 1/1.5))
	if err != nil || len(list) != 0 {
		t.Errorf("%d rivals, %v; want none", len(list), err)
	}
}

// A line that turns the phase is undone before anything is calibrated, so the first pulse is right already.
func TestLinePhase(t *testing.T) {
	p := rackB(t)
	gain := cmplx.Rect(0.9, 0.4)
	p.Channels[0].Line = filter.Line{Direct: gain}
	inner := areaJudge(p, math.Pi/2, 0.3, 1)
	calls := 0
	judge := func(x []complex128) (float64, error) {
		calls++
		behind := make([]complex128, len(x))
		for k, v := range x {
			behind[k] = gain * v
		}
		return inner(behind)
	}
	list, err := Make(p, 0, Turn{Angle: math.Pi / 2, Phase: 0.3}, judge)
	if err != nil || len(list) != 2 {
		t.Fatalf("%d rivals, %v", len(list), err)
	}
	if calls != 2 {
		t.Errorf("%d evaluations for two pulses that need no calibration", calls)
	}
}

// A drive that compresses: the samples are what is reached, and what the converter plays for them is within its limits.
func TestCompressed(t *testing.T) {
	p := rackB(t)
	c := &p.Channels[0]
	c.Compression = hardware.Compression{{}, {Converter: 0.5, Reached: 0.49}, {Converter: 1, Reached: 0.8}}
	for _, more := range []float64{1, 1.1} { // the second needs more than the limits leave of the first try
		list, err := Make(p, 0, Turn{Angle: math.Pi / 2}, areaJudge(p, math.Pi/2, 0, 1/more))
		if err != nil || len(list) != 2 {
			t.Fatalf("%d rivals, %v", len(list), err)
		}
		for _, r := range list {
			mustKeep(t, p, r)
		}
	}
}
