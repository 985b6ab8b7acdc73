package datasheet

import (
	"fmt"
	"math"
	"math/cmplx"
	"strings"
	"testing"

	"holdfast/design/replay"
)

func labelsOf(t []tick) string {
	var l []string
	for _, v := range t {
		l = append(l, v.label)
	}
	return strings.Join(l, " ")
}

func TestTicks(t *testing.T) {
	for _, c := range []struct {
		a    axis
		most int
		want string
	}{
		{axis{lo: 0, hi: 1}, 6, "0.0 0.2 0.4 0.6 0.8 1.0"},
		{axis{lo: -1, hi: 1}, 5, "−1.0 −0.5 0.0 0.5 1.0"},
		{axis{lo: -0.02, hi: 112.3}, 7, "0 20 40 60 80 100"},
		{axis{lo: 115.2, hi: 155.2}, 5, "120 130 140 150"},
		{axis{lo: -0.0013, hi: 0.0013}, 4, "−0.001 0.000 0.001"},
		{axis{lo: 1e-9, hi: 1, log: true}, 10, "1e-9 1e-8 1e-7 1e-6 1e-5 1e-4 1e-3 1e-2 1e-1 1"},
		{axis{lo: 1e-9, hi: 1, log: true}, 5, "1e-8 1e-6 1e-4 1e-2 1"},
		{axis{lo: 2e-4, hi: 30, log: true}, 8, "1e-3 1e-2 1e-1 1 1e1"},
		{axis{lo: 1, hi: 1}, 5, ""},
		{axis{lo: math.NaN(), hi: 1}, 5, ""},
		{axis{lo: -1, hi: 1, log: true}, 5, ""},
		{axis{lo: 1e17, hi: 1e17 + 32}, 5, ""}, // no float64 between the ticks
	} {
		if got := labelsOf(c.a.ticks(c.most)); got != c.want {
			t.Errorf("ticks of [%g, %g]: %q, want %q", c.a.lo, c.a.hi, got, c.want)
		}
	}
	// Whatever the range: not too many, all inside, ascending, all labels different.
	for k := range 400 {
		lo := math.Sin(float64(k)) * math.Pow(10, float64(k%13-6))
		a := axis{lo: lo, hi: lo + math.Pow(10, float64(k%7-3))*(1+math.Abs(math.Cos(float64(k))))}
		ticks := a.ticks(6)
		if len(ticks) > 6 || len(ticks) < 2 {
			t.Errorf("[%g, %g] has %d ticks", a.lo, a.hi, len(ticks))
		}
		for i, v := range ticks {
			slack := 1e-6 * (a.hi - a.lo)
			if !(v.at >= a.lo-slack && v.at <= a.hi+slack) || i > 0 && (!(v.at > ticks[i-1].at) || v.label == ticks[i-1].label) {
				t.Errorf("[%g, %g] has ticks %v", a.lo, a.hi, ticks)
			}
		}
	}
}

func TestAxisShare(t *testing.T) {
	for _, c := range []struct {
		a       axis
		v, want float64
	}{
		{axis{lo: -2, hi: 2}, 1, 0.75},
		{axis{lo: 2, hi: 4}, 5, 1.5},
		{axis{lo: 1e-8, hi: 1, log: true}, 1e-6, 0.25},
		{axis{lo: 1e-8, hi: 1, log: true}, 0, -10},
		{axis{lo: 1e-8, hi: 1, log: true}, -3, -10},
		{axis{lo: 0, hi: 1}, 1e300, 1e6},
	} {
		if got := c.a.share(c.v); !(math.Abs(got-c.want) <= 1e-12*math.Max(1, c.want)) {
			t.Errorf("share of %g on [%g, %g] is %g, want %g", c.v, c.a.lo, c.a.hi, got, c.want)
		}
	}
}

// unit is a plot whose frame is the unit square.
func unit() *plot {
	return &plot{id: "u", width: 300, height: 300, x: axis{hi: 1}, y: axis{hi: 1}}
}

// Curves never leave the frame, and break where they do or where a value is
// missing.
func TestClipping(t *testing.T) {
	p := unit()
	f := p.frame()
	nan := math.NaN()
	for _, c := range []struct {
		name  string
		pts   []point
		lines int
	}{
		{"inside", []point{{0, 0}, {1, 1}}, 1},
		{"through", []point{{-1, 0.5}, {2, 0.5}}, 1},
		{"outside", []point{{-1, 2}, {2, 3}}, 0},
		{"out and in", []point{{0.1, 0.5}, {0.3, 4}, {0.5, 0.5}}, 2},
		{"a gap", []point{{0.1, 0.5}, {0.2, 0.5}, {0.3, nan}, {0.4, 0.5}, {0.5, 0.6}}, 2},
		{"corner cut", []point{{-0.5, 0.6}, {0.6, 1.7}}, 0},
		{"far", []point{{0.5, -1e300}, {0.5, 1e300}}, 1},
		{"infinite", []point{{0.5, math.Inf(-1)}, {0.5, 1}}, 0},
	} {
		lines := p.lines(c.pts)
		if len(lines) != c.lines {
			t.Errorf("%s: %d polylines, want %d", c.name, len(lines), c.lines)
		}
		for _, l := range lines {
			for _, m := range l {
				if !f.contains(m) {
					t.Errorf("%s: %v lies outside %v", c.name, m, f)
				}
			}
		}
	}
	// A line through the frame enters and leaves where it should.
	l := p.lines([]point{{-1, -1}, {2, 2}})
	if len(l) != 1 || l[0][0] != (mark{f.left, f.bottom}) || l[0][len(l[0])-1] != (mark{f.right, f.top}) {
		t.Errorf("the diagonal is drawn as %v", l)
	}
}

// Simplifying leaves no mark further than about a tenth of a px from the line.
func TestSimplify(t *testing.T) {
	var m []mark
	for k := range 2000 {
		m = append(m, mark{4 * k, int(1000 * math.Sin(float64(k)/150))})
	}
	s := simplify(append([]mark(nil), m...))
	if len(s) > len(m)/4 {
		t.Errorf("%d marks of %d are left", len(s), len(m))
	}
	at := 0
	for _, v := range m {
		for at+2 < len(s) && v.x > s[at+1].x {
			at++
		}
		a, c := s[at], s[at+1]
		y := float64(a.y) + float64(c.y-a.y)*float64(v.x-a.x)/float64(c.x-a.x)
		if slope := math.Hypot(1, float64(c.y-a.y)/float64(c.x-a.x)); !(math.Abs(y-float64(v.y)) <= 1.01*slope) {
			t.Errorf("at %d the line is at %g, the curve at %d", v.x, y, v.y)
		}
	}
	// A closed or doubled curve keeps its turning points.
	if s := simplify([]mark{{0, 0}, {50, 50}, {0, 0}}); len(s) != 3 {
		t.Errorf("there and back is %v", s)
	}
}

// Thinning keeps the extremes of every column.
func TestThin(t *testing.T) {
	var m []mark
	for k := range 20000 {
		m = append(m, mark{k / 40, k * 7919 % 1000})
	}
	m[12345].y = -5000
	s := thin(m)
	if len(s) > 4*51 {
		t.Errorf("%d marks are left", len(s))
	}
	found := false
	for _, v := range s {
		found = found || v.y == -5000
	}
	if !found || s[0] != m[0] || s[len(s)-1] != m[len(m)-1] {
		t.Error("an extreme or an end is lost")
	}
}

// Labels keep apart and inside, and every one is placed, for curves that lie
// one on another as for curves that fill the frame.
func TestLabelsDoNotCollide(t *testing.T) {
	for k := range 60 {
		p := &plot{id: "l", width: 480, height: 320, x: axis{lo: 0, hi: 1}, y: axis{lo: -1, hi: 1}}
		p.rules = []rule{{at: 0.3, label: "required", class: "limit"}, {at: 0.5, vertical: true, label: "band edge", class: "limit"},
			{at: 0.31, label: "decoherence", class: "floor"}}
		p.spans = []span{{0.2, 0.6, "window", "window"}, {0.9, 0.95, "guard", "guard"}}
		for i, name := range []string{"this pulse", "square", "raised cosine", "two-tone", "long-named rival"} {
			var pts []point
			for j := range 200 {
				x := float64(j) / 199
				pts = append(pts, point{x, math.Sin(float64(k%6*10)*x+float64(i*(k%4))) * float64(k) / 30})
			}
			p.series = append(p.series, series{label: name, points: pts, class: i})
		}
		l := p.labels()
		want := 5 // rules and spans
		for _, s := range p.series {
			if len(p.lines(s.points)) > 0 {
				want++
			}
		}
		if len(l) != want {
			t.Errorf("plot %d has %d labels, want %d", k, len(l), want)
		}
		for i, a := range l {
			if !a.box.inside(p.frame()) {
				t.Errorf("plot %d: %q lies outside", k, a.text)
			}
			for _, c := range l[:i] {
				if a.box.overlaps(c.box) {
					t.Errorf("plot %d: %q covers %q", k, a.text, c.text)
				}
			}
		}
	}
}

// A label stands beside the curve that it names.
func TestLabelStandsBesideItsCurve(t *testing.T) {
	p := unit()
	p.series = []series{{"low", []point{{0, 0.2}, {1, 0.2}}, 0}, {"high", []point{{0, 0.8}, {1, 0.8}}, 1}}
	for _, l := range p.labels() {
		_, y := p.px(point{0, map[string]float64{"low": 0.2, "high": 0.8}[l.text]})
		middle := float64(l.box.top+l.box.bottom) / 2
		if d := math.Abs(middle - y); !(d <= 3*labelHeight) {
			t.Errorf("%q stands %g px from its curve", l.text, d/10)
		}
	}
}

func TestSteps(t *testing.T) {
	got := fmt.Sprint(steps([]float64{1, -2}, 3, 0.5))
	if want := "[{3 0} {3 1} {3.5 1} {3.5 -2} {4 -2} {4 0}]"; got != want {
		t.Errorf("got %s, want %s", got, want)
	}
}

// The spectrum is that of the definition, a sum over samples at each frequency,
// and of the right sign: a rotating exp(2 pi i f t) lies at +f.
func TestSpectrum(t *testing.T) {
	const n, h = 24, 0.8 // ns
	x := make([]complex128, n)
	for k := range x {
		x[k] = cmplx.Rect(0.5, 2*math.Pi*0.1*h*float64(k)) * complex(math.Sin(math.Pi*(float64(k)+0.5)/n), 0)
	}
	line := func(mhz float64) complex128 { return 1 / complex(1, mhz/200) }
	s := NewSpectrum(x, h, 0.15, line)
	if s == nil || len(s.Frequency) != 1024 {
		t.Fatal("no spectrum of 1024 bins")
	}
	sum := func(mhz float64) float64 {
		v := complex128(0)
		for k := range x {
			v += x[k] * cmplx.Rect(1, -2*math.Pi*mhz/1e3*h*float64(k))
		}
		return cmplx.Abs(v)
	}
	top := 0.0
	var all, out float64
	for _, f := range s.Frequency {
		v := sum(f)
		top = math.Max(top, v)
		all += v * v
		if math.Abs(f) > 150 {
			out += v * v
		}
	}
	best := 0
	for i, f := range s.Frequency {
		if s.Played[i] > s.Played[best] {
			best = i
		}
		want := 20 * math.Log10(sum(f)/top)
		if want < -120 {
			continue // cancellation: few digits are left
		}
		if !(math.Abs(s.Played[i]-want) <= 1e-6) {
			t.Errorf("at %g MHz: %g dB, want %g", f, s.Played[i], want)
		}
		a := math.Pi * f / 1e3 * h
		droop := 1.0
		if a != 0 {
			droop = math.Sin(a) / a
		}
		if arriving := want + 20*math.Log10(math.Abs(droop)/math.Hypot(1, f/200)); !(math.Abs(s.Arriving[i]-arriving) <= 1e-6) {
			t.Errorf("at %g MHz: %g dB arrive, want %g", f, s.Arriving[i], arriving)
		}
	}
	if !(math.Abs(s.Frequency[best]-100) <= 2) {
		t.Errorf("a drive at +100 MHz peaks at %g MHz", s.Frequency[best])
	}
	if !(s.Frequency[0] == -625 && s.Frequency[1023] < 625) {
		t.Errorf("frequencies run from %g to %g MHz", s.Frequency[0], s.Frequency[1023])
	}
	if !(math.Abs(s.Outside-out/all) <= 1e-12) {
		t.Errorf("%g of the energy outside, want %g", s.Outside, out/all)
	}
	// Hold droop, CALC: -2.42007 dB at 0.4 of the sample rate.
	if got := decibels(sinc(0.4) * sinc(0.4)); !(math.Abs(got+2.42007) <= 1e-5) {
		t.Errorf("droop at 0.4 fs is %g dB", got)
	}
	for name, bad := range map[string][]complex128{"nothing": nil, "zeros": make([]complex128, 8), "NaN": {1, cmplx.NaN()}} {
		if NewSpectrum(bad, 1, 0, nil) != nil {
			t.Errorf("%s has a spectrum", name)
		}
	}
}

func TestNumbers(t *testing.T) {
	for _, c := range []struct{ got, want string }{
		{figure(2.7e-9), "2.7e-9"}, {figure(9.99e-10), "< 1e-9 in this model"}, {figure(0), "< 1e-9 in this model"}, {figure(-3e-12), "< 1e-9 in this model"},
		{figure(math.NaN()), "not computed"}, {figure(math.Inf(1)), "not computed"}, {figure(0.00612), "0.00612"}, {figure(1), "1"},
		{digits(0.99996, 3), "1"}, {digits(9.999e-4, 3), "0.001"}, {digits(1234567, 3), "1.23e6"}, {digits(65536, 5), "65536"}, {digits(-0.5, 3), "-0.5"},
		{digits(123456, 3), "123000"}, {digits(5e-324, 3), "4.94e-324"},
		{percent(0.00488), "0.488 %"},
		{(&Sheet{Required: 1e-9, Verdict: &replay.Verdict{}}).margin(replay.Error{Low: -1.2, High: 1.2, Unit: "MHz"}), "±1.2 MHz"},
		{(&Sheet{Required: 1e-9, Verdict: &replay.Verdict{}}).margin(replay.Error{Low: -1.2, High: 1.3, Unit: "%"}), "-1.2 to +1.3 %"},
		{(&Sheet{Required: 1e-9, Verdict: &replay.Verdict{}}).margin(replay.Error{Unit: "%"}), "already above 1e-9 without error"},
		{(&Sheet{Required: 1e-9, Verdict: &replay.Verdict{}}).margin(replay.Error{Low: math.Inf(-1), High: math.Inf(1)}), "all that was tried"},
		{(&Sheet{Required: 1e-9, Verdict: &replay.Verdict{}}).margin(replay.Error{Low: math.Inf(-1), High: math.Inf(1), Unit: "%", Curve: []replay.Point{{Value: -20}, {Value: 20}}}), "more than ±20 %"},
		{(&Sheet{Required: 1e-9, Verdict: &replay.Verdict{}}).margin(replay.Error{Low: math.Inf(-1), High: math.Inf(1), Unit: "MHz", Curve: []replay.Point{{Value: 0}, {Value: 50}}}), "more than 50 MHz"},
		{(&Sheet{Required: 1e-9, Verdict: &replay.Verdict{}}).margin(replay.Error{Low: -0.5, High: math.Inf(1), Unit: "MHz", Curve: []replay.Point{{Value: -20}, {Value: 20}}}), "-0.5 to beyond +20 MHz"},
		{typographic("-0.5 to 2.7e-9 ns, 0.8 X - 0.4 Y at 3 nsx"), "−0.5 to 2.7e-9\u00a0ns, 0.8 X − 0.4 Y at 3 nsx"},
		{clean("a\x00b\nc"), "a\ufffdb c"},
		{list([]string{"a", "b", "c"}), "a, b and c"},
	} {
		if c.got != c.want {
			t.Errorf("%q, want %q", c.got, c.want)
		}
	}
}
