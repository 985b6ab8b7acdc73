package filter

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"strings"
	"testing"
)

// difference is the fourth-order central difference at 0 of the held response of
// the line that build makes.
func difference(t *testing.T, build func(change float64) Line, x []complex128, h float64, times []float64) []complex128 {
	t.Helper()
	const e = 1e-3
	d := make([]complex128, len(times))
	for _, c := range []struct{ at, weight float64 }{{e, 8}, {-e, -8}, {2 * e, -1}, {-2 * e, 1}} {
		for i, v := range build(c.at).Held(x, h, times, nil) {
			d[i] += v * complex(c.weight/(12*e), 0)
		}
	}
	return d
}

// compare fails when two fields differ by more than tol of the largest.
func compare(t *testing.T, what string, times []float64, got, want []complex128, tol float64) float64 {
	t.Helper()
	largest, worst, at := 0.0, 0.0, 0.0
	for i := range want {
		largest = max(largest, cmplx.Abs(want[i]))
		if d := cmplx.Abs(got[i] - want[i]); !(d <= worst) {
			worst, at = d, times[i]
		}
	}
	if !(worst <= tol*largest) || largest == 0 {
		t.Errorf("%s: slope and difference part by %g of %g at %g ns", what, worst, largest, at)
	}
	return worst / largest
}

// Every slope against differences of the held response, alone and with other
// sections of the line around it, at edges and between them, to 1e-8 of the largest
// value, 1e-7 where near poles make the differences noisy.
func TestSlopesAgainstDifferences(t *testing.T) {
	make1 := line(t)
	up := math.Exp // a relative change
	list := []Tail{{-0.015, 30}, {0.04, 6}}
	amplitude := make([]Line, 2)
	time := make([]Line, 2)
	for i := range list {
		a, b, err := TailSlopes(list, i)
		amplitude[i], time[i] = must(t, a, err), must(t, b, err)
	}
	changed := func(i int, f func(*Tail)) Line {
		l := append([]Tail(nil), list...)
		f(&l[i])
		return tails(t, l...)
	}
	scaled := func(l Line, by complex128) Line {
		for i := range l.Terms {
			l.Terms[i].Residue *= by
		}
		return l
	}
	minus := func(l Line) Line { return scaled(make1(l.CornerSlope()), -1) }
	const off, half, depth = 0.05, 0.03, 0.4 - 0.2i
	resonatorOffset, resonatorWidth, err := ResonatorSlopes(off, half)
	if err != nil {
		t.Fatal(err)
	}
	resonanceOffset, resonanceWidth, resonanceDepth, err := ResonanceSlopes(off, half, depth)
	if err != nil {
		t.Fatal(err)
	}
	delayed := make1(Delay(2.5))
	cases := map[string]struct {
		slope Line
		build func(e float64) Line
	}{
		"single pole, time": {minus(pole(t, 0.8)), func(e float64) Line { return pole(t, 0.8*up(e)) }},
		"AC coupling, time": {minus(make1(ACCoupling(40))), func(e float64) Line { return make1(ACCoupling(40 * up(e))) }},
		"high-pass, corner": {make1(make1(HighPass(0.004)).CornerSlope()), func(e float64) Line { return make1(HighPass(0.004 * up(e))) }},
		"allpass, time":     {minus(make1(Allpass(0.7))), func(e float64) Line { return make1(Allpass(0.7 * up(e))) }},
		"fractional delay":  {minus(make1(FractionalDelay(0.7))), func(e float64) Line { return make1(FractionalDelay(0.7 * up(e))) }},
		"resonator, offset": {scaled(resonatorOffset, 0.02), func(e float64) Line { return make1(Resonator(off+e/50, half)) }},
		"resonator, width":  {resonatorWidth, func(e float64) Line { return make1(Resonator(off, half*up(e))) }},
		"resonance, offset": {scaled(resonanceOffset, 0.02), func(e float64) Line { return make1(Resonance(off+e/50, half, depth)) }},
		"resonance, width":  {resonanceWidth, func(e float64) Line { return make1(Resonance(off, half*up(e), depth)) }},
		"resonance, depth":  {resonanceDepth, func(e float64) Line { return make1(Resonance(off, half, depth*complex(up(e), 0))) }},
		"tail 0, amplitude": {amplitude[0], func(e float64) Line { return changed(0, func(t *Tail) { t.Amplitude *= up(e) }) }},
		"tail 1, amplitude": {amplitude[1], func(e float64) Line { return changed(1, func(t *Tail) { t.Amplitude *= up(e) }) }},
		"tail 0, time":      {time[0], func(e float64) Line { return changed(0, func(t *Tail) { t.Time *= up(e) }) }},
		"tail 1, time":      {time[1], func(e float64) Line { return changed(1, func(t *Tail) { t.Time *= up(e) }) }},
		"all tails, time":   {minus(tails(t, list...)), func(e float64) Line { return tails(t, Tail{-0.015, 30 * up(e)}, Tail{0.04, 6 * up(e)}) }},
		"with a delay": {make1(cascade(t, delayed, bessel(t, 2, 0.2)).CornerSlope()),
			func(e float64) Line { return cascade(t, delayed, bessel(t, 2, 0.2*up(e))) }},
		"mirrored": {Mirror(resonatorWidth), func(e float64) Line { return Mirror(make1(Resonator(off, half*up(e)))) }},
	}
	for family, f := range lowPasses {
		for _, n := range []int{1, 2, 3, 4, 8} {
			cases[family+" "+string(rune('0'+n))] = struct {
				slope Line
				build func(e float64) Line
			}{make1(make1(f(n, 0.2)).CornerSlope()), func(e float64) Line { return make1(f(n, 0.2*up(e))) }}
		}
	}
	rng := rand.New(rand.NewPCG(19, 20))
	const h = 0.8
	x := randomSamples(rng, 25)
	times := grid(rng, len(x), h)
	worst := 0.0
	for name, c := range cases {
		if err := c.slope.Check(); err != nil {
			t.Errorf("%s: %v", name, err)
		}
		if c.slope.Real() != c.build(0).Real() {
			t.Errorf("%s: slope real %v, line %v", name, c.slope.Real(), c.build(0).Real())
		}
		worst = max(worst, compare(t, name, times, c.slope.Held(x, h, times, nil), difference(t, c.build, x, h, times), 1e-8))
		for around, others := range map[string][2]Line{
			"low-pass and tail":  {bessel(t, 3, 0.31), tails(t, Tail{-0.02, 12})},
			"delay and coupling": {delayed, make1(ACCoupling(500))},
			"its own like":       {c.build(0), pole(t, 0.82)},
			"complex":            {make1(Resonance(-0.1, 0.02, 0.2i)), make1(Butterworth(5, 0.25))},
		} {
			sections := []Line{others[0], c.build(0), others[1]}
			l, err := CascadeSlope(sections, 1, c.slope)
			if err != nil {
				t.Errorf("%s with %s: %v", name, around, err)
				continue
			}
			if want := cascade(t, sections...).Delay; l.Delay != want {
				t.Errorf("%s with %s: delay %g, want %g", name, around, l.Delay, want)
			}
			d := difference(t, func(e float64) Line { return cascade(t, others[0], c.build(e), others[1]) }, x, h, times)
			worst = max(worst, compare(t, name+" with "+around, times, l.Held(x, h, times, nil), d, 1e-7))
		}
	}
	t.Logf("%d slopes, worst %.1e", len(cases), worst)
}

// The steady gain does not depend on a corner, nor on a tail, and the step begins as
// it did: slopes of the corner and of a tail's time have neither steady nor direct gain.
func TestSlopesLeaveTheSteadyGain(t *testing.T) {
	for name, l := range zoo(t) {
		d := line(t)(l.CornerSlope())
		if d.DC() != 0 || d.Direct != 0 || d.Delay != l.Delay {
			t.Errorf("%s: steady gain %v, direct %v, delay %g", name, d.DC(), d.Direct, d.Delay)
		}
	}
	a, b, err := TailSlopes([]Tail{{0.1, 20}}, 0)
	if err != nil || a.DC() != 0 || a.Direct != 0.1 || b.DC() != 0 || b.Direct != 0 {
		t.Errorf("tail: %v, amplitude %v, time %v", err, a, b)
	}
	// In closed form: a e^{-t/T} and a (t/T) e^{-t/T}.
	for _, at := range []float64{0, 1, 20, 90} {
		v := at / 20
		if !(cmplx.Abs(a.Step(at)-complex(0.1*math.Exp(-v), 0)) <= 1e-16) || !(cmplx.Abs(b.Step(at)-complex(0.1*v*math.Exp(-v), 0)) <= 1e-16) {
			t.Errorf("tail at %g: %v and %v", at, a.Step(at), b.Step(at))
		}
	}
}

// The delay's slope against differences of the whole line's held response in time,
// away from edges; its sign (later arrival: the field of a moment ago); and at the edges,
// where a line that falls off as 1/s has kinks, the value just after.
func TestDelaySlope(t *testing.T) {
	make1 := line(t)
	rng := rand.New(rand.NewPCG(21, 22))
	const h = 0.8
	x := randomSamples(rng, 25)
	var times []float64
	for k := range 30 {
		for _, s := range []float64{0.1, 0.31, 0.5, 0.77, 0.9} {
			times = append(times, (float64(k)+s)*h)
		}
	}
	times = append(times, 60, 200)
	for name, l := range map[string]Line{
		"single pole":    pole(t, 0.8),
		"rack B":         rackB(t),
		"butterworth 8":  make1(Butterworth(8, 0.2)),
		"damped 3":       make1(CriticallyDamped(3, 0.2)),
		"gaussian 5":     make1(GaussianLike(5, 0.3)),
		"pole and tail":  cascade(t, pole(t, 0.8), tails(t, Tail{0.1, 20})),
		"everything":     cascade(t, bessel(t, 3, 0.2), make1(ACCoupling(300)), make1(Allpass(0.4)), make1(Resonance(0.03, 0.02, 0.3)), make1(Delay(1.5))),
		"resonator":      make1(Resonator(0.05, 0.03)),
		"slope of slope": make1(bessel(t, 4, 0.2).CornerSlope()),
		"nearly equal":   cascade(t, pole(t, 1), pole(t, 1.0001), pole(t, 1.01), tails(t, Tail{0.3, 1.001})),
	} {
		d, err := l.DelaySlope()
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		const e = 1e-3
		want := make([]complex128, len(times))
		for _, c := range []struct{ at, weight float64 }{{e, 8}, {-e, -8}, {2 * e, -1}, {-2 * e, 1}} {
			moved := make([]float64, len(times)) // the line's delay is c.at longer: times from arrival are shorter
			for i := range times {
				moved[i] = times[i] - c.at
			}
			for i, v := range l.Held(x, h, moved, nil) {
				want[i] += v * complex(c.weight/(12*e), 0)
			}
		}
		compare(t, name, times, d.Held(x, h, times, nil), want, 1e-8)
		if d.DC() != 0 || d.Delay != l.Delay || d.Real() != l.Real() {
			t.Errorf("%s: steady gain %v, delay %g, real %v", name, d.DC(), d.Delay, d.Real())
		}
		falls := cmplx.Abs(l.Response(1e6)) * 1e6 // |sum of first residues| of a line that falls off as 1/s
		if (d.Direct == 0) != (falls < 1e-3) {
			t.Errorf("%s: direct gain %v, |s G| far away %g", name, d.Direct, falls)
		}
		for _, w := range []float64{0.1, -2} {
			if got, want := d.Response(w), complex(0, -w)*l.Response(w); !(cmplx.Abs(got-want) <= 1e-12) {
				t.Errorf("%s at %g: %v, want -iw G = %v", name, w, got, want)
			}
		}
	}
	// A step through a pole: u = 1 - e^{-t}; later arrival lowers it by e^{-t}. At the edge
	// the slope is that just after it.
	d := make1(pole(t, 1).DelaySlope())
	for _, at := range []float64{0, 0.7, 3} {
		if got := d.Step(at); !(cmplx.Abs(got+complex(math.Exp(-at), 0)) <= 1e-15) {
			t.Errorf("pole at %g: %v, want -e^{-t}", at, got)
		}
	}
	edge := d.Held([]complex128{1, 0}, 1, []float64{1 - 1e-6, 1}, nil)
	if before, after := -math.Exp(-1), 1-math.Exp(-1); !(cmplx.Abs(edge[0]-complex(before, 0)) <= 1e-5) || !(cmplx.Abs(edge[1]-complex(after, 0)) <= 1e-14) {
		t.Errorf("at the falling edge %v, want %g then %g", edge, before, after)
	}
	// A real line's slope has a real direct gain, in whatever order conjugates come.
	p, q := -1+2i, -0.7+0.3i
	mixed := Line{Terms: []Term{{p, 1, 0.5 + 0.1i}, {q, 1, 0.3 + 0.2i}, {-3, 1, 1}, {cmplx.Conj(p), 1, 0.5 - 0.1i}, {cmplx.Conj(q), 1, 0.3 - 0.2i}}}
	if got := make1(mixed.DelaySlope()).Direct; imag(got) != 0 || !(math.Abs(real(got)+2.6) <= 1e-15) {
		t.Errorf("conjugates apart: direct gain %v, want -2.6", got)
	}
	for name, l := range map[string]Line{"through": Through(), "tail": tails(t, Tail{0.1, 3}), "coupling": make1(ACCoupling(5)), "resonance": make1(Resonance(0.1, 0.1, 0.5))} {
		if _, err := l.DelaySlope(); err == nil || !strings.Contains(err.Error(), "jumps") || !strings.Contains(err.Error(), "allowed") {
			t.Errorf("%s jumps at edges, yet: %v", name, err)
		}
		if _, err := cascade(t, l, pole(t, 0.1)).DelaySlope(); err != nil {
			t.Errorf("%s behind a low-pass: %v", name, err)
		}
	}
}

// A corner shared by two sections has the sum of their slopes; sums in general are sums.
func TestSum(t *testing.T) {
	make1 := line(t)
	b, tail := bessel(t, 3, 0.2), tails(t, Tail{0.05, 8})
	sections := []Line{make1(Delay(2)), b, tail, b}
	slope := make1(b.CornerSlope())
	first, err := CascadeSlope(sections, 1, slope)
	first = must(t, first, err)
	second, err := CascadeSlope(sections, 3, slope)
	second = must(t, second, err)
	both := make1(Sum(first, Line{}, second))
	rng := rand.New(rand.NewPCG(23, 24))
	x := randomSamples(rng, 20)
	times := grid(rng, 20, 1)
	d := difference(t, func(e float64) Line {
		moved := bessel(t, 3, 0.2*math.Exp(e))
		return cascade(t, sections[0], moved, tail, moved)
	}, x, 1, times)
	compare(t, "shared corner", times, both.Held(x, 1, times, nil), d, 1e-8)
	if both.Delay != 2 || len(both.Terms) != len(first.Terms) || !both.Real() {
		t.Errorf("sum: delay %g, %d terms for %d, real %v", both.Delay, len(both.Terms), len(first.Terms), both.Real())
	}
	// The whole line's corner slope is the sum over its sections, the tail's included.
	atTail, err := CascadeSlope(sections, 2, make1(tail.CornerSlope()))
	all := make1(Sum(both, must(t, atTail, err)))
	whole := make1(cascade(t, sections...).CornerSlope())
	for _, w := range []float64{0, 0.1, -1.2, 5} {
		if d := cmplx.Abs(all.Response(w) - whole.Response(w)); !(d <= 1e-12) {
			t.Errorf("at %g: sum over sections and whole differ by %g", w, d)
		}
	}
	if l := make1(Sum()); !l.zero() {
		t.Errorf("sum of nothing: %v", l)
	}
	kept := first.Terms[0].Residue
	both.Terms[0].Residue = 7
	if first.Terms[0].Residue != kept {
		t.Error("the sum shares its terms")
	}
	// A slope that is zero, in a cascade: passes nothing, without complaint.
	none, _, err := TailSlopes([]Tail{{0, 8}}, 0)
	none = must(t, none, err)
	if l, err := CascadeSlope([]Line{make1(Delay(3)), b}, 0, none); err != nil || l.Delay != 3 || l.DC() != 0 || len(l.Terms) != 0 {
		t.Errorf("zero slope: %v, %v", l, err)
	}
}

func TestSlopeRefusals(t *testing.T) {
	refuse := func(what string, err error, words ...string) {
		t.Helper()
		if err == nil {
			t.Errorf("%s: accepted", what)
			return
		}
		for _, w := range append(words, "filter: ", "allowed") {
			if !strings.Contains(err.Error(), w) {
				t.Errorf("%s: %q lacks %q", what, err, w)
			}
		}
	}
	bad := Line{Terms: []Term{{1, 1, 1}}}
	_, err := bad.CornerSlope()
	refuse("corner of a growing pole", err, "pole")
	_, err = bad.DelaySlope()
	refuse("delay of a growing pole", err, "pole")
	full := Line{Terms: []Term{{-1, MaxPower, 1}}}
	_, err = full.CornerSlope()
	refuse("power", err, "power 33")
	if _, err = full.DelaySlope(); err != nil {
		t.Errorf("delay of the highest power: %v", err)
	}
	_, err = Line{Terms: []Term{{-1e300, 1, 1e300}}}.CornerSlope()
	refuse("overflow", err, "residue")
	for _, i := range []int{-1, 1} {
		_, _, err = TailSlopes([]Tail{{0.1, 3}}, i)
		refuse("tail index", err, "tail")
		_, err = CascadeSlope([]Line{Through()}, i, Through())
		refuse("section index", err, "section")
	}
	_, _, err = TailSlopes([]Tail{{0.1, math.NaN()}}, 0)
	refuse("tail", err, "time")
	_, err = CascadeSlope([]Line{Through(), {Delay: 3, Direct: 1}}, 1, Through())
	refuse("delays", err, "delay of 0 ns")
	_, err = CascadeSlope([]Line{Through()}, 0, bad)
	refuse("slope", err, "pole")
	_, err = CascadeSlope([]Line{Through(), bad}, 0, Through())
	refuse("section", err, "pole")
	_, err = Sum(Through(), bad)
	refuse("sum of a growing pole", err, "line 1")
	_, err = Sum(Through(), Line{Delay: 1, Direct: 1})
	refuse("sum of unlike delays", err, "delay of 1 ns")
	many := Line{}
	for i := range MaxTerms {
		many.Terms = append(many.Terms, Term{complex(-1, float64(i)), 1, 1})
	}
	_, err = Sum(many, pole(t, 3))
	refuse("sum of too many", err, "terms")
	_, _, err = ResonatorSlopes(0.1, 0)
	refuse("resonator", err, "half width")
	_, _, _, err = ResonanceSlopes(math.NaN(), 0.1, 0.1)
	refuse("resonance", err, "offset")
	if a, b, c, err := ResonanceSlopes(0.1, 0.1, 0); err != nil || !a.zero() || !b.zero() || !c.zero() {
		t.Errorf("resonance of no depth: %v %v %v %v", a, b, c, err)
	}
}

func ExampleCascadeSlope() {
	lowPass, err := Butterworth(2, 0.2)
	if err != nil {
		fmt.Println(err)
		return
	}
	settling, err := Tails([]Tail{{Amplitude: -0.02, Time: 10}})
	if err != nil {
		fmt.Println(err)
		return
	}
	slope, err := lowPass.CornerSlope()
	if err != nil {
		fmt.Println(err)
		return
	}
	// How the field answers to the corner of the low-pass, per relative change.
	slope, err = CascadeSlope([]Line{lowPass, settling}, 0, slope)
	if err != nil {
		fmt.Println(err)
		return
	}
	for _, u := range slope.Held([]complex128{1, 1}, 1, []float64{0.5, 1, 1.5, 4}, nil) {
		fmt.Printf("%+.4f\n", real(u))
	}
	// Output:
	// +0.2401
	// +0.5564
	// +0.6706
	// -0.6561
}
