package filter

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"
)

// Gains that define a resonator: one at the carrier, largest at its own centre,
// 1/sqrt 2 of that half a width to either side; the tilt at the carrier.
func TestResonator(t *testing.T) {
	const offset, half = -0.03, 0.02
	l := line(t)(Resonator(offset, half))
	if !(cmplx.Abs(l.DC()-1) <= 1e-15) || l.Real() || l.Direct != 0 {
		t.Errorf("DC %v, real %v, direct %v", l.DC(), l.Real(), l.Direct)
	}
	at := func(f float64) float64 { return cmplx.Abs(l.Response(2 * math.Pi * f)) }
	top := math.Hypot(offset, half) / half
	if !(relative(at(offset), top) <= 1e-14) {
		t.Errorf("gain at the centre %g, want %g", at(offset), top)
	}
	for _, f := range []float64{offset - half, offset + half} {
		if !(relative(at(f), top/math.Sqrt2) <= 1e-14) {
			t.Errorf("gain half a width off %g, want %g", at(f), top/math.Sqrt2)
		}
	}
	p := l.Terms[0].Pole
	tilt := (at(1e-6) - at(-1e-6)) / (4e-6 * math.Pi)
	if want := imag(p) / (real(p)*real(p) + imag(p)*imag(p)); !(relative(tilt, want) <= 1e-6) {
		t.Errorf("tilt %g, want %g", tilt, want)
	}
	// Without offset: the single pole.
	same, one := line(t)(Resonator(0, half)), pole(t, 1/(2*math.Pi*half))
	if !same.Real() || !(cmplx.Abs(same.Response(0.1)-one.Response(0.1)) <= 1e-15) {
		t.Errorf("tuned: %v, want %v", same, one)
	}
}

// One far away, 1 - depth at the centre, and in between a circle in the complex plane.
func TestResonance(t *testing.T) {
	const offset, half = 0.04, 0.005
	for _, depth := range []complex128{0.6, -0.3, 0.4 - 0.2i, 1} {
		l := line(t)(Resonance(offset, half, depth))
		if got := l.Response(2 * math.Pi * offset); !(cmplx.Abs(got-(1-depth)) <= 1e-15) {
			t.Errorf("depth %v: gain %v at the centre", depth, got)
		}
		for _, w := range []float64{1e9, -1e9} {
			if d := cmplx.Abs(l.Response(w) - 1); !(d <= 1e-9) {
				t.Errorf("depth %v: %g from one far away", depth, d)
			}
		}
		for _, f := range []float64{-0.1, 0, 0.03, 0.04, 0.041, 0.5} { // about 1 - depth/2
			if r := cmplx.Abs(l.Response(2*math.Pi*f) - (1 - depth/2)); !(math.Abs(r-cmplx.Abs(depth)/2) <= 1e-14) {
				t.Errorf("depth %v at %g GHz: %g from the circle's centre, want %g", depth, f, r, cmplx.Abs(depth)/2)
			}
		}
		if l.Real() {
			t.Errorf("depth %v: real", depth)
		}
		u := line(t)(l.UnitGain())
		if !(cmplx.Abs(u.DC()-1) <= 1e-15) || !(cmplx.Abs(u.Response(0.3)-l.Response(0.3)/l.DC()) <= 1e-15) {
			t.Errorf("depth %v: unit gain %v", depth, u.DC())
		}
	}
	if l := line(t)(Resonance(offset, half, 0)); len(l.Terms) != 0 || l.Direct != 1 {
		t.Errorf("no depth: %v, want straight through", l)
	}
	if l := line(t)(Resonance(0, half, 0.5)); !l.Real() {
		t.Error("a dip on the carrier is not real")
	}
	// Unit gain keeps the conjugates of a real line, and its delay.
	b := rackB(t)
	for i := range b.Terms {
		b.Terms[i].Residue *= 3
	}
	u := line(t)(b.UnitGain())
	if !u.Real() || u.Delay != b.Delay || !(cmplx.Abs(u.DC()-1) <= 1e-14) {
		t.Errorf("rack B: real %v, delay %g, DC %v", u.Real(), u.Delay, u.DC())
	}
}

// Real samples (I alone) through a detuned resonator give a Q: that of
// u_Q = Im[1 - e^{pt}], in closed form; the mirror image gives the opposite Q, and a
// real line none.
func TestIBecomesQ(t *testing.T) {
	l := line(t)(Resonator(0.05, 0.04))
	m := Mirror(l)
	x := make([]complex128, 30)
	for k := range x {
		x[k] = 1
	}
	times := []float64{0.5, 2, 3.7, 11, 29}
	u, v := l.Held(x, 1, times, nil), m.Held(x, 1, times, nil)
	for i, at := range times {
		want := -math.Exp(-2*math.Pi*0.04*at) * math.Sin(2*math.Pi*0.05*at)
		if !(math.Abs(imag(u[i])-want) <= 1e-14) || !(math.Abs(imag(v[i])+want) <= 1e-14) || !(math.Abs(real(u[i])-real(v[i])) <= 1e-14) {
			t.Errorf("at %g: %v, mirror %v, want Q of %g", at, u[i], v[i], want)
		}
	}
	if q := imag(u[1]); !(math.Abs(q) > 0.1) {
		t.Errorf("Q of %g only", q)
	}
	for i, w := range rackB(t).Held(x, 1, times, nil) {
		if !(math.Abs(imag(w)) <= 1e-15) {
			t.Errorf("a real line gives Q %g at %g", imag(w), times[i])
		}
	}
}

// The mirror's response is conj G(-w), delay included; twice is nothing; a real line is
// its own; conjugate samples give the conjugate field; and it goes through cascades.
func TestMirror(t *testing.T) {
	rng := rand.New(rand.NewPCG(17, 18))
	for name, l := range zoo(t) {
		m := Mirror(l)
		for _, w := range []float64{0, 0.3, -0.9, 4} {
			want := cmplx.Conj(l.Response(-w))
			if d := cmplx.Abs(m.Response(w) - want); !(d <= 1e-14*(1+cmplx.Abs(want))) {
				t.Errorf("%s at %g: %v, want %v", name, w, m.Response(w), want)
			}
			if l.Real() && !(cmplx.Abs(m.Response(w)-l.Response(w)) <= 1e-11*(1+cmplx.Abs(want))) {
				t.Errorf("%s is real, but not its own mirror", name)
			}
		}
		if m.Real() != l.Real() {
			t.Errorf("%s: mirror real %v", name, m.Real())
		}
		back := Mirror(m)
		if back.Delay != l.Delay || back.Direct != l.Direct || len(back.Terms) != len(l.Terms) {
			t.Errorf("%s: mirrored twice %v", name, back)
		}
		for i := range back.Terms {
			if back.Terms[i] != l.Terms[i] {
				t.Errorf("%s: mirrored twice %v, want %v", name, back.Terms[i], l.Terms[i])
			}
		}
		x := randomSamples(rng, 20)
		conj := make([]complex128, len(x))
		for k := range x {
			conj[k] = cmplx.Conj(x[k])
		}
		times := grid(rng, 20, 1)
		u, v := l.Held(x, 1, times, nil), m.Held(conj, 1, times, nil)
		for i := range u {
			if !(cmplx.Abs(u[i]-cmplx.Conj(v[i])) <= 1e-14*(1+size(l))) {
				t.Fatalf("%s at %g: %v, mirror %v", name, times[i], u[i], v[i])
			}
		}
	}
	a, b := line(t)(Resonance(0.04, 0.01, 0.3-0.1i)), bessel(t, 3, 0.2)
	for _, w := range []float64{-1, 0.2, 0.25} {
		if d := cmplx.Abs(cascade(t, Mirror(a), b).Response(w) - Mirror(cascade(t, a, b)).Response(w)); !(d <= 1e-14) {
			t.Errorf("cascade of mirrors at %g: off by %g", w, d)
		}
	}
	// A resonance measured above the carrier: S21 at carrier + f is G of a positive
	// offset, which conj S21(carrier - f) turns into a negative one.
	if got, want := Mirror(line(t)(Resonance(0.04, 0.01, 0.3))), line(t)(Resonance(-0.04, 0.01, 0.3)); got.Terms[0] != want.Terms[0] {
		t.Errorf("mirror %v, want %v", got.Terms, want.Terms)
	}
	l := rackB(t)
	m := Mirror(l)
	m.Terms[0].Residue = 7
	if l.Terms[0].Residue == 7 {
		t.Error("the mirror shares its terms")
	}
}
