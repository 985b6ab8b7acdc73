package filter

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"
)

// A bias tee of 1 ms droops by 1.000e-4 in 100 ns (CALC); a single pole
// settles to 1e-3 in 6.908 tau (CALC), and so does the droop to 1 - 1e-3.
func TestDroop(t *testing.T) {
	tee := line(t)(ACCoupling(1e6))
	if got := tee.Droop(100); !(math.Abs(got-1.000e-4) <= 5e-8) || !(relative(got, -math.Expm1(-1e-4)) <= 1e-11) {
		t.Errorf("bias tee: droop %g, want 1.000e-4", got)
	}
	short := line(t)(ACCoupling(20))
	if got := short.Droop(6.908 * 20); !(math.Abs(got-0.999) <= 1e-6) {
		t.Errorf("droop after 6.908 tau %g, want 0.999", got)
	}
	for _, at := range []float64{0.01, 3, 20, 100, 1e3, 1e5} {
		if got := short.Droop(at); !(math.Abs(got+math.Expm1(-at/20)) <= 1e-15) {
			t.Errorf("droop after %g ns %g, want 1 - e^{-t/tau}", at, got)
		}
	}
	// Behind a low-pass: against a fine scan for the top.
	l := cascade(t, line(t)(Butterworth(2, 0.2)), tee)
	top := 0.0
	for i := range 20000 {
		top = max(top, real(l.Step(float64(i)*5e-4)))
	}
	for _, at := range []float64{50, 1e4, 1e6} {
		if got, want := l.Droop(at), 1-real(l.Step(at))/top; !(math.Abs(got-want) <= 1e-7) {
			t.Errorf("behind a low-pass after %g ns: %g, by scan %g", at, got, want)
		}
	}
	// Still rising: none. At the bottom after an overshoot of e^{-pi}: that share of the top.
	second := line(t)(Butterworth(2, 1/(2*math.Pi)))
	if got := second.Droop(1.5); got != 0 {
		t.Errorf("rising step droops by %g", got)
	}
	e := math.Exp(-math.Pi)
	if got, want := second.Droop(2*math.Pi*math.Sqrt2), (e+e*e)/(1+e); !(math.Abs(got-want) <= 1e-12) {
		t.Errorf("after the overshoot %g, want %g", got, want)
	}
	if Through().Droop(5) != 0 || (Line{}).Droop(5) != 0 || tee.Droop(-1) != 0 || tee.Droop(math.NaN()) != 0 {
		t.Error("droop where there is none")
	}
	sharp := Line{Direct: 1, Terms: []Term{{-1e-7 + 2i, 1, 0.015}, {-1e-7 - 2i, 1, 0.015}}}
	if got := sharp.Droop(1e7); !math.IsNaN(got) {
		t.Errorf("a pole too sharp to search: %g, want NaN", got)
	}
}

// A corner given in GHz is the time constant 1/(2 pi corner), at -3.0103 dB of the
// gain far above it.
func TestHighPassCorner(t *testing.T) {
	l := line(t)(HighPass(1e-4))
	same := line(t)(ACCoupling(1 / (2 * math.Pi * 1e-4)))
	for _, w := range []float64{1e-7, 1e-4, 2 * math.Pi * 1e-4, 0.1} {
		if d := cmplx.Abs(l.Response(w) - same.Response(w)); !(d <= 1e-15) {
			t.Errorf("at %g off by %g", w, d)
		}
	}
	if dB := 20 * math.Log10(cmplx.Abs(l.Response(2*math.Pi*1e-4))); !(math.Abs(dB+3.0103) <= 1e-6) {
		t.Errorf("%.6f dB at the corner", dB)
	}
	if l.DC() != 0 || l.Direct != 1 || !l.Real() {
		t.Errorf("DC %v, direct %v, real %v", l.DC(), l.Direct, l.Real())
	}
}

// No steady gain passes through any cascade with an AC-coupled section: exactly zero,
// in whatever order and however near the poles lie, and a line with a small steady gain keeps it.
func TestNoSteadyGainSurvivesCascades(t *testing.T) {
	worst := 0.0
	for _, tau := range []float64{0.5, 30, 30.2, 1e4, 1e6} {
		ac := line(t)(ACCoupling(tau))
		for name, others := range map[string][]Line{
			"nothing":       {},
			"rack B":        {rackB(t)},
			"itself":        {ac},
			"bessel 8":      {bessel(t, 8, 0.2)},
			"butterworth 8": {line(t)(Butterworth(8, 0.2)), rackB(t)},
			"damped":        {line(t)(CriticallyDamped(8, 0.3)), pole(t, tau)},
			"resonance":     {line(t)(Resonance(0.03, 0.01, 0.4i)), tails(t, Tail{0.1, 3})},
			"near":          {bessel(t, 5, 0.2), bessel(t, 5, 0.201), pole(t, tau*1.01)},
		} {
			for _, l := range []Line{cascade(t, append(others, ac)...), cascade(t, append([]Line{ac}, others...)...)} {
				worst = max(worst, cmplx.Abs(l.response(0))/size(l))
				if l.DC() != 0 {
					t.Errorf("tau %g with %s: DC %v", tau, name, l.DC())
				}
				if !math.IsInf(l.Corner(), 1) || l.StepFigures() != (StepFigures{math.Inf(1), math.Inf(1), math.Inf(1), math.Inf(1), math.Inf(1)}) {
					t.Errorf("tau %g with %s: corner %g, figures %v", tau, name, l.Corner(), l.StepFigures())
				}
			}
		}
	}
	t.Logf("rounding of a steady gain of zero: %.1e of the terms", worst)
	small := Line{Direct: 1, Terms: []Term{{-1, 1, -1 + 1e-12}}}
	if d := real(small.DC()); !(relative(d, 1e-12) <= 1e-3) {
		t.Errorf("steady gain %g, want 1e-12", d)
	}
}

// After n samples the undershoot through AC coupling is, in closed form,
// -(e^{h/tau} - 1) sum_k x_k e^{kh/tau} e^{-t/tau}: about -h/tau sum x_k when they do not sum to
// zero, second order in the length over tau when they do. The field of any pulse
// integrates to zero.
func TestZeroMeanLeavesNoUndershoot(t *testing.T) {
	const tau, h, n = 1e5, 0.8, 100
	l := line(t)(ACCoupling(tau))
	rng := rand.New(rand.NewPCG(15, 16))
	x := randomSamples(rng, n)
	mean := complex128(0)
	for _, v := range x {
		mean += v / n
	}
	zero := make([]complex128, n)
	for k, v := range x {
		zero[k] = v - mean
	}
	end := []float64{n * h}
	left := func(x []complex128) (got, want complex128) {
		for k, v := range x {
			want -= v * complex(math.Expm1(h/tau)*math.Exp((float64(k)*h-n*h)/tau), 0)
		}
		return l.Held(x, h, end, nil)[0], want
	}
	got, want := left(x)
	if !(cmplx.Abs(got-want) <= 1e-14) || !(cmplx.Abs(got+mean*complex(n*h/tau, 0)) <= 1e-2*cmplx.Abs(got)) {
		t.Errorf("mean %v leaves %v, closed form %v", mean, got, want)
	}
	none, want := left(zero)
	if !(cmplx.Abs(none-want) <= 1e-15) || !(cmplx.Abs(none) <= 1e-2*cmplx.Abs(got)) {
		t.Errorf("zero mean leaves %v, closed form %v; with mean %v", none, want, got)
	}
	behind := cascade(t, bessel(t, 3, 0.2), l)
	for _, line := range []Line{l, behind} {
		if d := cmplx.Abs(line.Remaining(x, h, -1)); !(d <= 1e-9) {
			t.Errorf("the field integrates to %g", d)
		}
		if a, b := line.Remaining(x, h, n*h+60), complex(-tau, 0)*mean*complex(n*h/tau, 0); !(cmplx.Abs(a-b) <= 2e-3*cmplx.Abs(b)) {
			t.Errorf("undershoot integrates to %v, want minus the pulse's %v", a, b)
		}
	}
}

// |G| = 1 everywhere, the phase and the delay in closed form, and the step's first jump
// the wrong way; how far a fractional delay is from a delay.
func TestAllpass(t *testing.T) {
	const tau = 0.3
	l := line(t)(Allpass(tau))
	for _, w := range []float64{0, 0.1, -0.7, 2, 40, -1e4} {
		g := l.Response(w)
		if !(math.Abs(cmplx.Abs(g)-1) <= 1e-15) || !(math.Abs(cmplx.Phase(g)+2*math.Atan(w*tau)) <= 2e-15) {
			t.Errorf("at %g: gain %g, phase %g, want 1 and -2 atan(w tau)", w, cmplx.Abs(g), cmplx.Phase(g))
		}
		if got, want := l.GroupDelay(w), 2*tau/(1+w*w*tau*tau); !(relative(got, want) <= 1e-7) {
			t.Errorf("at %g: group delay %g, want %g", w, got, want)
		}
	}
	for _, at := range []float64{0, 0.1, 0.5, 3} {
		if got, want := l.Step(at), 1-2*math.Exp(-at/tau); !(cmplx.Abs(got-complex(want, 0)) <= 1e-15) {
			t.Errorf("step at %g: %v, want %g", at, got, want)
		}
	}
	if f := l.StepFigures(); !(relative(f.GroupDelay, 2*tau) <= 1e-14) || !(relative(f.TransitionTime, tau*math.Log(9)) <= 1e-12) || f.Overshoot != 0 {
		t.Errorf("figures %+v, want a delay of 2 tau, ln 9 tau, no overshoot", f)
	}
	d := line(t)(FractionalDelay(0.8))
	for _, w := range []float64{0.01, 0.1, 0.5} { // phase error (w d)^3/12 to the next order, (w d)^5/80
		x := 0.8 * w
		miss := cmplx.Phase(d.Response(w) * cmplx.Exp(complex(0, x)))
		if !(math.Abs(miss-x*x*x/12) <= x*x*x*x*x/80+1e-15) {
			t.Errorf("fractional delay at w d = %g: phase off by %g, want %g", x, miss, x*x*x/12)
		}
	}
	if miss := cmplx.Phase(d.Response(0.5)*cmplx.Exp(0.4i)) * 180 / math.Pi; !(math.Abs(miss-0.3) <= 0.01) {
		t.Errorf("fractional delay at w d = 0.4: %g degrees, want 0.3", miss)
	}
}

// The group delay at any frequency is the slope of the phase, for every line, pure
// delay included; at zero it is that of the step's figures.
func TestGroupDelayAnywhere(t *testing.T) {
	for name, l := range zoo(t) {
		for _, w := range []float64{-1.3, -0.2, 0.01, 0.4, 1.7} {
			step := 1e-5
			if name == "high quality" {
				step = 1e-7
			}
			g := l.Response(w)
			up := l.Response(w+step) / g
			down := l.Response(w-step) / g
			want := -(cmplx.Phase(up) - cmplx.Phase(down)) / (2 * step)
			if got := l.GroupDelay(w); !(math.Abs(got-want) <= 1e-6*(1+math.Abs(want))) {
				t.Errorf("%s at %g: %.9g, slope of the phase %.9g", name, w, got, want)
			}
		}
		if dc := l.DC(); dc != 0 {
			if got, want := l.GroupDelay(0), l.Delay+l.groupDelay(); !(math.Abs(got-want) <= 1e-12*math.Abs(want)) {
				t.Errorf("%s: %g at zero, figures %g", name, got, want)
			}
		}
	}
	if got := line(t)(ACCoupling(3)).GroupDelay(0); !math.IsNaN(got) {
		t.Errorf("delay of no gain: %g, want NaN", got)
	}
}
