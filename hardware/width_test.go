package hardware

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"

	"holdfast/filter"
)

// An invented instrument with every key: a drive whose line has every kind of section, a bias on a baseband channel behind a coupling
// capacitor, and a drive that is limited as a box.
const wide = `format = 1
[instrument]
name = "wide"
sample_rate = "1 GS/s"
resolution = "14 bit"

[[channel]]
name = "drive"
kind = "quadrature"
mixing = "MIXING"
full_scale = "40 MHz"
envelope = "disc"
amplitude_limit = "95 %"
slew_limit = "25 %/sample"
rms_limit = "60 %"
rms_period = "1 us"
band = "100 MHz"
out_of_band = "0.2 %"
zero_mean = true
guard = { lead = 1, trail = 4 }
ring_out = { limit = "0.3 %", fast = "8 ns", tail = "0.05 %" }
compression = [["0 %", "0 %"], ["50 %", "49 %"], ["100 %", "95 %"]]
shift = "-12 kHz"
[channel.line]
delay = "3.2 ns"
delay_known_to = "1 %"
lowpass = [ { family = "bessel", order = 3, corner = "200 MHz", known_to = "5 %" }, { family = "critical", order = 2, corner = "400 MHz" } ]
allpass = "0.4 ns"
allpass_known_to = "10 %"
ac_coupling = "1 ms"
ac_coupling_known_to = "20 %"
resonance = [ { offset = "60 MHz", half_width = "8 MHz", depth = "15 %", known_to = "30 %" } ]
tails = [ { amplitude = "-1.5 %", time = "30 ns", known_to = "25 %" }, { amplitude = "0.3 %", time = "400 ns" } ]

[[channel]]
name = "flux"
kind = "baseband"
full_scale = "200 MHz"
amplitude_limit = "80 %"
zero_mean = true
[channel.line]
lowpass = { family = "gaussian", order = 4, corner = "120 MHz" }
ac_coupling = "50 us"

[[channel]]
name = "other"
kind = "quadrature"
mixing = "I cos + Q sin"
full_scale = "40 MHz"
envelope = "box"
latency = "1.3 ns"
[channel.line]
lowpass = { family = "butterworth", order = 4, corner = "250 MHz" }
`

func wideProfile(t *testing.T, mixing Mixing, changes ...string) *Profile {
	t.Helper()
	text := strings.Replace(wide, "MIXING", string(mixing), 1)
	for i := 0; i+1 < len(changes); i += 2 {
		if !strings.Contains(text, changes[i]) {
			t.Fatalf("%q is not in the profile", changes[i])
		}
		text = strings.Replace(text, changes[i], changes[i+1], 1)
	}
	p, err := Parse("wide.toml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	return p
}

func TestLoadWide(t *testing.T) {
	p := wideProfile(t, MinusSin)
	c := p.Channels[0]
	if c.Kind != Quadrature || c.Envelope != Disc || c.RMSLimit != 0.6 || c.RMSPeriod != 1000 || c.OutOfBand != 0.002 || !c.ZeroMean ||
		c.RingOut != (RingOut{3e-3, 8, 5e-4}) || !(math.Abs(c.Shift+2*math.Pi*12e-6) <= 1e-18) || c.Columns() != 2 ||
		!slices.Equal(c.Compression, Compression{{0, 0}, {0.5, 0.49}, {1, 0.95}}) {
		t.Errorf("drive: %+v", c)
	}
	want := []string{"A pure delay of 3.2 ns, known to 1 %.", "A Bessel low-pass of order 3 with its corner at 200 MHz, known to 5 %.",
		"A critically damped low-pass of order 2 with its corner at 400 MHz.", "A first-order allpass that delays slow signals by 0.4 ns, known to 10 %.",
		"An AC coupling with a time constant of 1 ms, known to 20 %.",
		"A dip of 15 %, 60 MHz above the carrier, with half a width of 8 MHz, known to 30 %.",
		"A settling tail of -1.5 % with a time constant of 30 ns, known to 25 %.", "A settling tail of 0.3 % with a time constant of 400 ns."}
	for i, s := range want {
		got := strings.ReplaceAll(c.Sections[i], "400 ps", "0.4 ns")
		if got != s {
			t.Errorf("section %d: %q; needed: %q", i, got, s)
		}
	}
	shares := map[string]float64{"lowpass[0].corner": 0.05, "lowpass[1].corner": 0, "allpass": 0.1, "ac_coupling": 0.2, "resonance[0].offset": 0.3,
		"resonance[0].half_width": 0.3, "resonance[0].depth": 0.3, "tails[0].amplitude": 0.25, "tails[0].time": 0.25, "tails[1].amplitude": 0, "tails[1].time": 0, "delay": 0.01}
	if len(c.Parameters) != len(shares) {
		t.Errorf("%d parameters; needed: %d", len(c.Parameters), len(shares))
	}
	for name, share := range shares {
		q, ok := c.Parameter(name)
		if !ok || q.KnownTo != share || q.Refused != "" || q.Slope.Delay != 3.2 || q.Slope.Check() != nil {
			t.Errorf("%s: %+v", name, q)
		}
	}
	flux, other := p.Channels[1], p.Channels[2]
	if flux.Kind != Baseband || flux.Mixing != "" || flux.Envelope != "" || flux.Columns() != 1 || !flux.Line.Real() || flux.Line.DC() != 0 {
		t.Errorf("flux: %+v", flux)
	}
	if other.Envelope != Box || len(other.Compression) != 0 || other.OutOfBand != 0 || other.RMSLimit != 0 || other.ZeroMean {
		t.Errorf("other: %+v", other)
	}
	// Defaults mean the same when they are written.
	b := wideProfile(t, MinusSin, "sample_rate", "align = \"delay\"\nsample_rate", "amplitude_limit = \"80 %\"", "amplitude_limit = \"80 %\"\nshift = \"0 Hz\"",
		"zero_mean = true\n[channel.line]\nlowpass = { family = \"gaussian\"", "zero_mean = true\nguard = { lead = 0, trail = 0 }\n[channel.line]\nlowpass = { family = \"gaussian\"")
	if fmt.Sprintf("%+v", b) != fmt.Sprintf("%+v", p) {
		t.Error("defaults that are written mean something else")
	}
}

// Each family by the figures that make it (the functions of package filter have their own tests): attenuation at the corner, and the
// steady gain; AC coupling by its closed form.
func TestLowpassFamilies(t *testing.T) {
	for _, family := range []string{"bessel", "butterworth", "critical", "gaussian"} {
		p := wideProfile(t, MinusSin, `family = "butterworth", order = 4`, fmt.Sprintf("family = %q, order = 5", family))
		l := p.Channels[2].Line
		if got := cmplx.Abs(l.Response(2 * math.Pi * 0.25)); !(math.Abs(got-math.Sqrt2/2) <= 1e-9) || !(cmplx.Abs(l.DC()-1) <= 1e-12) || !l.Real() {
			t.Errorf("%s: gain %g at its corner, %v steady", family, got, l.DC())
		}
		// Butterworth: |G|^2 = 1/(1 + (f/corner)^10). The others fall off as steeply only far out.
		if got := cmplx.Abs(l.Response(2 * math.Pi * 0.5)); (math.Abs(got-1/math.Sqrt(1+1024)) <= 1e-9) != (family == "butterworth") {
			t.Errorf("%s: gain %g at twice its corner", family, got)
		}
	}
}

// The slope of every parameter is the central difference of the responses of lines that are loaded from a changed file.
func TestParameterSlopes(t *testing.T) {
	const d = 1e-4
	for _, mixing := range []Mixing{MinusSin, PlusSin} {
		base := wideProfile(t, mixing)
		for _, q := range base.Channels[0].Parameters {
			text := map[string]struct {
				old, new string
				value    float64
			}{
				"lowpass[0].corner":       {`corner = "200 MHz"`, `corner = "%.15g MHz"`, 200},
				"lowpass[1].corner":       {`corner = "400 MHz"`, `corner = "%.15g MHz"`, 400},
				"allpass":                 {`allpass = "0.4 ns"`, `allpass = "%.15g ns"`, 0.4},
				"ac_coupling":             {`ac_coupling = "1 ms"`, `ac_coupling = "%.15g ms"`, 1},
				"resonance[0].offset":     {`offset = "60 MHz"`, `offset = "%.15g MHz"`, 60},
				"resonance[0].half_width": {`half_width = "8 MHz"`, `half_width = "%.15g MHz"`, 8},
				"resonance[0].depth":      {`depth = "15 %"`, `depth = "%.15g %%"`, 15},
				"tails[0].amplitude":      {`amplitude = "-1.5 %"`, `amplitude = "%.15g %%"`, -1.5},
				"tails[0].time":           {`time = "30 ns"`, `time = "%.15g ns"`, 30},
				"tails[1].amplitude":      {`amplitude = "0.3 %"`, `amplitude = "%.15g %%"`, 0.3},
				"tails[1].time":           {`time = "400 ns"`, `time = "%.15g ns"`, 400},
				"delay":                   {`delay = "3.2 ns"`, `delay = "%.15g ns"`, 3.2},
			}[q.Name]
			up := wideProfile(t, mixing, text.old, fmt.Sprintf(text.new, text.value*(1+d))).Channels[0].Line
			down := wideProfile(t, mixing, text.old, fmt.Sprintf(text.new, text.value*(1-d))).Channels[0].Line
			largest := 0.0
			for _, f := range []float64{-0.4, -0.11, -0.06, -0.01, -1e-4, 1e-6, 3e-4, 0.02, 0.06, 0.07, 0.2, 0.5} {
				w := 2 * math.Pi * f
				want := (up.Response(w) - down.Response(w)) / (2 * d)
				got := q.Slope.Response(w)
				// a third of d^2 of the third derivative, and the 1e-10 to which filter joins sections over 2d
				if !(cmplx.Abs(got-want) <= 3e-6*(1+cmplx.Abs(want))) {
					t.Errorf("%s, %s at %g GHz: slope %v; by differences %v", mixing, q.Name, f, got, want)
				}
				largest = max(largest, cmplx.Abs(want))
			}
			if !(largest >= 1e-4) {
				t.Errorf("%s: the largest slope is %g: nothing was tested", q.Name, largest)
			}
			if dc := q.Slope.DC(); !(cmplx.Abs(dc) <= 1e-9) {
				t.Errorf("%s: steady gain of the slope %v", q.Name, dc)
			}
		}
	}
}

// Where the field jumps at sample edges, nothing can be held to the delay, and the profile is in order all the same.
func TestDelayOfAStraightLine(t *testing.T) {
	p := wideProfile(t, MinusSin, `lowpass = { family = "butterworth", order = 4, corner = "250 MHz" }`, `delay = "2 ns"`)
	q, ok := p.Channels[2].Parameter("delay")
	if !ok || q.Refused == "" || strings.Contains(q.Refused, "filter:") || len(q.Slope.Terms) != 0 {
		t.Errorf("%+v", q)
	}
}

// A resonance 60 MHz above the carrier is met at +60 MHz of the samples' spectrum behind I cos - Q sin, which is Re[x e^{iwt}], and at
// -60 MHz, conjugated, behind I cos + Q sin, which is Re[x e^{-iwt}]. The line is divided by its gain at the carrier.
func TestSideOfAResonance(t *testing.T) {
	true21 := func(f float64) complex128 { // f from the carrier, GHz: a dip of 15 %, 8 MHz half a width
		return 1 - 0.15*0.008/complex(0.008, f-0.06)
	}
	for _, mixing := range []Mixing{MinusSin, PlusSin} {
		with := wideProfile(t, mixing).Channels[0].Line
		without := wideProfile(t, mixing, `resonance = [ { offset = "60 MHz", half_width = "8 MHz", depth = "15 %", known_to = "30 %" } ]`, "").Channels[0].Line
		for _, f := range []float64{-0.2, -0.065, -0.06, -0.05, 0.001, 0.05, 0.06, 0.065, 0.3} {
			got := with.Response(2*math.Pi*f) / without.Response(2*math.Pi*f)
			want := true21(f) / true21(0)
			if mixing == PlusSin {
				want = cmplx.Conj(true21(-f) / true21(0))
			}
			if !(cmplx.Abs(got-want) <= 1e-8) {
				t.Errorf("%s at %g GHz: %v; by hand %v", mixing, f, got, want)
			}
		}
		if with.Real() {
			t.Errorf("%s: a line with a resonance beside the carrier is said to be real", mixing)
		}
	}
}

func TestAlign(t *testing.T) {
	p := wideProfile(t, MinusSin)
	// arrivals 3.2, 0 and 1.3 ns: 3 samples for 0, 2 for 1.3, and the latest is 1.3 + 2.
	for i, want := range []struct {
		shift int
		start float64
	}{{0, 3.2}, {3, 3}, {2, 3.3}} {
		if p.Shift(i) != want.shift || !(math.Abs(p.Start(i)-want.start) <= 1e-12) {
			t.Errorf("channel %d: shift %d, start %g; by hand %v", i, p.Shift(i), p.Start(i), want)
		}
	}
	if !(math.Abs(p.Window()-3.3) <= 1e-12) {
		t.Errorf("window %g", p.Window())
	}
	p = wideProfile(t, MinusSin, "sample_rate", "align = \"none\"\nsample_rate")
	if p.Shift(1) != 0 || p.Start(1) != 0 || p.Start(2) != 1.3 || p.Window() != 3.2 {
		t.Errorf("not aligned: %d, %g, %g, %g", p.Shift(1), p.Start(1), p.Start(2), p.Window())
	}
	rng := rand.New(rand.NewPCG(2, 2))
	for range 100 {
		p := &Profile{SamplePeriod: 0.2 + rng.Float64()}
		latest := 0.0
		for range 1 + rng.IntN(6) {
			c := Channel{Latency: 30 * rng.Float64(), Line: filter.Line{Delay: 50 * rng.Float64()}}
			latest = max(latest, c.Latency+c.Line.Delay)
			p.Channels = append(p.Channels, c)
		}
		for i := range p.Channels {
			if off := p.Start(i) - latest; p.Shift(i) < 0 || !(math.Abs(off) <= p.SamplePeriod/2*(1+1e-9)) {
				t.Errorf("channel %d starts %g ns from the latest", i, off)
			}
		}
	}
}

func TestCompression(t *testing.T) {
	rng := rand.New(rand.NewPCG(6, 6))
	c := Compression{{0, 0}, {0.5, 0.49}, {1, 0.95}}
	for _, test := range []struct{ x, y complex128 }{
		{0, 0}, {0.25, 0.245}, {-0.5, -0.49}, {0.75i, 0.72i}, {1, 0.95}, {complex(0.45, -0.6), complex(0.72*0.6, -0.72*0.8)}, {1.1, 1.042},
	} {
		if got := c.Reached(test.x); !(cmplx.Abs(got-test.y) <= 1e-15) {
			t.Errorf("%v reaches %v; by hand %v", test.x, got, test.y)
		}
		if got := c.Converter(test.y); !(cmplx.Abs(got-test.x) <= 1e-15) {
			t.Errorf("%v needs %v; by hand %v", test.y, got, test.x)
		}
	}
	worst := 0.0
	for range 200 {
		c := randomCompression(rng)
		least, most := c.slopes(1)
		for range 200 {
			x := cmplx.Rect(rng.Float64(), 2*math.Pi*rng.Float64())
			y := c.Reached(x)
			worst = max(worst, cmplx.Abs(c.Converter(y)-x))
			if !(math.Abs(cmplx.Phase(y)-cmplx.Phase(x)) <= 1e-12) || !(c.Reached(-x) == -y) {
				t.Errorf("%v reaches %v and %v %v", x, y, -x, c.Reached(-x))
			}
			// The bounds on which the set's reserves rest.
			e := complex(2*rng.Float64()-1, 2*rng.Float64()-1) * 1e-3
			if cmplx.Abs(x+e) > 1 {
				continue
			}
			moved := c.Reached(x+e) - y
			side := max(math.Abs(real(e)), math.Abs(imag(e)))
			if !(max(math.Abs(real(moved)), math.Abs(imag(moved))) <= stretch(least, most)*side*(1+1e-9)) || !(cmplx.Abs(moved) <= most*cmplx.Abs(e)*(1+1e-9)) {
				t.Errorf("%v moved by %v: reached moves by %v, slopes %g to %g", x, e, moved, least, most)
			}
		}
	}
	t.Logf("the inverse is good to %.1e", worst)
	if !(worst <= 1e-14) {
		t.Errorf("the inverse is off by %g", worst)
	}
	// The bound in a quadrature is not idle: some direction comes near.
	nearest := 0.0
	for i := range 10000 {
		a := 2 * math.Pi * float64(i) / 10000
		steep := Compression{{0, 0}, {0.5, 0.8}, {1, 0.9}} // at 1: along 0.2, across 0.9
		x := cmplx.Rect(0.99, a)
		moved := steep.Reached(x+complex(1e-7, 1e-7)) - steep.Reached(x)
		nearest = max(nearest, max(math.Abs(real(moved)), math.Abs(imag(moved)))/1e-7)
	}
	if want := stretch(0.2, 0.9*(1-1e-2)); !(nearest >= want && nearest <= stretch(0.2, 1.6)) {
		t.Errorf("the largest stretch met is %g; needed: %g", nearest, want)
	}
}

// randomCompression has 2 to 6 points, slopes from 0.2 to 2.
func randomCompression(rng *rand.Rand) Compression {
	n := 1 + rng.IntN(5)
	c := Compression{{}}
	for i := range n {
		slope := 0.2 * math.Pow(5, rng.Float64())
		c = append(c, Point{Converter: float64(i+1) / float64(n), Reached: c[i].Reached + slope/float64(n)})
	}
	return c
}

// The energy out of band against the quadratic form with the sinc kernel, and the whole energy at no band.
func TestOutOfBand(t *testing.T) {
	rng := rand.New(rand.NewPCG(9, 1))
	for _, n := range []int{1, 2, 3, 17, 64, 300} {
		x := make([]complex128, n+5)
		for k := range n {
			x[k+2] = complex(rng.NormFloat64(), rng.NormFloat64())
		}
		for _, w := range []float64{1e-12, 0.01, 0.1, 0.37, 0.499} {
			want := quadratic(x, x, w)
			if got := outOfBand(x, w); !(math.Abs(got-want) <= 1e-13*real(innerSum(x, x))) {
				t.Errorf("%d samples, band %g: %g; by the kernel %g", n, w, got, want)
			}
		}
		if got := outOfBand(x, 0.5); got != 0 {
			t.Errorf("band 0.5: %g", got)
		}
	}
	// A small energy keeps its digits. For 48 cos^8 samples at W = 0.35: the integral at 60 digits would serve as well; here the same
	// integral by a plain midpoint sum, which for a trigonometric polynomial over this interval converges as the square of the step.
	x := make([]complex128, 48)
	for k := range x {
		x[k] = complex(math.Pow(math.Sin(math.Pi*(float64(k)+0.5)/48), 8), 0)
	}
	sum := 0.0
	const steps = 20000
	for i := range steps {
		f := 0.35 + 0.15*(float64(i)+0.5)/steps
		v := complex128(0)
		for k := range x {
			v += x[k] * cmplx.Rect(1, -2*math.Pi*f*float64(k))
		}
		sum += 2 * real(v*cmplx.Conj(v)) * 0.15 / steps
	}
	if got := outOfBand(x, 0.35); !(math.Abs(got-sum) <= 1e-6*sum) || !(sum <= 1e-12) {
		t.Errorf("a small energy: %g; by the midpoints %g", got, sum)
	}
	if list, err := wideProfile(t, MinusSin).CheckSamples(0, nil); err != nil || list[0].OK {
		t.Errorf("no samples: %v, %v", list, err)
	}
}

func innerSum(a, b []complex128) complex128 { return inner(a, b) }

// quadratic is Re a'(1 - K)b with the sinc kernel K.
func quadratic(a, b []complex128, w float64) float64 {
	sum := complex128(0)
	for k := range a {
		for l := range b {
			e := 0.0
			if k == l {
				e = 1 - 2*w
			} else {
				e = -math.Sin(2*math.Pi*w*float64(k-l)) / (math.Pi * float64(k-l))
			}
			sum += cmplx.Conj(a[k]) * b[l] * complex(e, 0)
		}
	}
	return real(sum)
}

// After an AC coupling alone, a pulse whose samples do not sum to zero leaves what the closed form says, and one that does leaves nothing
// but a trace of the second order in h/tau.
func TestACCoupledLine(t *testing.T) {
	const tau, h = 1000.0, 1.0
	p := &Profile{Name: "by hand", SamplePeriod: h, Bits: 14, Block: 1, Shortest: 1, Longest: 200}
	line, err := filter.ACCoupling(tau)
	if err != nil {
		t.Fatal(err)
	}
	p.Channels = []Channel{{Name: "a", AmplitudeLimit: 1, SlewLimit: math.Inf(1), Band: math.Inf(1), ZeroMean: true, Line: line, RingOut: RingOut{Limit: 1e-3, Fast: 10}}}
	n := 40
	single := make([]complex128, n)
	for k := range single {
		single[k] = complex(0.8*math.Pow(math.Sin(math.Pi*(float64(k)+0.5)/float64(n)), 2), 0)
	}
	double := make([]complex128, n)
	for k := range double {
		double[k] = complex(0.8*math.Sin(2*math.Pi*(float64(k)+0.5)/float64(n)), 0)
	}
	for _, c := range []struct {
		x    []complex128
		kept bool
	}{{single, false}, {double, true}} {
		// v(t) = -sum_k x_k (e^{-(t-(k+1)h)/tau} - e^{-(t-kh)/tau}), largest at the span's end.
		want, sum := 0.0, 0.0
		for k, v := range c.x {
			want += real(v) * math.Exp(-(float64(n)*h-float64(k+1)*h)/tau) * math.Expm1(-h/tau)
			sum += real(v)
		}
		if droop := -sum * h / tau; !c.kept && !(math.Abs(want-droop) <= 0.03*math.Abs(droop)) {
			t.Errorf("droop %g; to first order %g", want, droop)
		}
		list, err := p.CheckSamples(0, c.x)
		if err != nil {
			t.Fatal(err)
		}
		found := list[len(list)-2].Found
		if !(math.Abs(found-math.Abs(want)) <= 1e-14) {
			t.Errorf("ring-out %g; by hand %g", found, want)
		}
		if c.kept != (found <= 1e-3) || Kept(list) != c.kept {
			t.Errorf("ring-out %g, kept %v: %+v", found, c.kept, list)
		}
		for _, r := range list {
			if r.Limit == Mean && (r.OK != c.kept || r.Allowed != 0 || !(math.Abs(r.Found-math.Abs(sum)/float64(n)) <= 1e-15)) {
				t.Errorf("mean %+v; by hand %g", r, sum/float64(n))
			}
		}
	}
	// Codes have what rounding leaves of a mean, and no more.
	codes, err := p.Codes(0, double)
	if err != nil {
		t.Fatal(err)
	}
	for _, extra := range []int16{0, 40} { // one code too many in each sample of I
		moved := slices.Clone(codes)
		for k := range n {
			moved[2*k] += extra / 40
		}
		list, err := p.CheckCodes(0, moved)
		if err != nil {
			t.Fatal(err)
		}
		for _, r := range list {
			if r.Limit == Mean && (r.OK != (extra == 0) || !(math.Abs(r.Allowed-0.5/8192) <= 1e-18)) {
				t.Errorf("%d codes more: %+v", extra, r)
			}
		}
	}
	s, err := p.Playable(0, n)
	if err != nil || !s.ZeroMean {
		t.Errorf("%+v, %v", s, err)
	}
}

func TestBasebandChannel(t *testing.T) {
	p := wideProfile(t, MinusSin)
	s, err := p.Playable(1, 24)
	if err != nil {
		t.Fatal(err)
	}
	if want := 0.8 - 0.5/8192; !(math.Abs(s.Box-want) <= 1e-15) || s.Disc != s.Box || !s.ZeroMean || len(s.Balls) != 0 || !math.IsInf(s.OutOfBand, 1) {
		t.Errorf("set: %+v", s)
	}
	x := []complex128{0.25, -0.5, 0.3, -0.05}
	codes, err := p.Codes(1, x)
	if err != nil || !slices.Equal(codes, []int16{2048, -4096, 2458, -410}) {
		t.Errorf("codes %v, %v", codes, err)
	}
	back, err := p.Samples(1, codes)
	if err != nil || len(back) != 4 || back[1] != -0.5 || back[2] != 2458.0/8192 {
		t.Errorf("samples %v, %v", back, err)
	}
	list, err := p.CheckCodes(1, codes)
	if err != nil || !Kept(list) || list[2].Found != 0.5 || list[0].Found != 4 {
		t.Errorf("readings %+v, %v", list, err)
	}
	if list, err := p.CheckCodes(1, []int16{6554, -6554}); err != nil || list[2].OK { // 80 % is 6553.6
		t.Errorf("readings %+v, %v", list, err)
	}
	for _, err := range []error{
		second(p.Codes(1, []complex128{0.1i})), second(p.CheckSamples(1, []complex128{0.1, 1e-9i})),
	} {
		if err == nil || !strings.Contains(err.Error(), "real numbers") {
			t.Errorf("an imaginary sample: %v", err)
		}
	}
	if _, err := p.Codes(1, []complex128{0.2, 1}); err == nil || !strings.Contains(err.Error(), "sample 1") {
		t.Errorf("full scale: %v", err)
	}
	for _, err := range []error{second(p.Codes(7, x)), second(p.Samples(-1, codes)), second(p.CheckCodes(3, codes)), second(p.Samples(1, make([]int16, maxSamples+1))),
		second(p.Samples(0, []int16{1})), second(p.Samples(0, []int16{8192, 0})), second(p.CheckCodes(1, make([]int16, maxSamples+1)))} {
		if err == nil || strings.Contains(err.Error(), "\n") {
			t.Errorf("taken: %v", err)
		}
	}
}

func second[T any](_ T, err error) error { return err }

// Codes undo the compression, and what they reach is the samples again within what rounding makes of it.
func TestCodesOfACompressedDrive(t *testing.T) {
	p := wideProfile(t, MinusSin)
	c := p.Channels[0].Compression
	y := []complex128{0, 0.49, complex(0.3, -0.4), 0.9i, -0.902}
	codes, err := p.Codes(0, y)
	if err != nil {
		t.Fatal(err)
	}
	if codes[2] != 4096 || codes[7] != int16(math.Round((0.5+0.41/0.92)*8192)) {
		t.Errorf("codes %v", codes)
	}
	back, err := p.Samples(0, codes)
	if err != nil {
		t.Fatal(err)
	}
	for k := range y {
		if !(cmplx.Abs(back[k]-y[k]) <= 0.7072/8192) {
			t.Errorf("sample %d: %v came back as %v", k, y[k], back[k])
		}
		x, _ := SamplesOf(codes[2*k:2*k+2], 14)
		if got := c.Reached(x[0]); got != back[k] {
			t.Errorf("sample %d: %v; by the table %v", k, back[k], got)
		}
	}
}

func TestWideSetByHand(t *testing.T) {
	p := wideProfile(t, MinusSin)
	c := &p.Channels[0]
	lsb := 1.0 / 8192
	s, err := p.Playable(0, 100)
	if err != nil {
		t.Fatal(err)
	}
	// slopes 0.98 and 0.92; at the converter 0.95 less the reserve
	if want := 0.49 + 0.92*(0.95-0.7072*lsb-0.5); !(math.Abs(s.Disc-want) <= 1e-15) || s.Box != 0 {
		t.Errorf("disc %g; by hand %g", s.Disc, want)
	}
	low, high := 1/0.98, 1/0.92
	if want := (0.25 - lsb) / ((low+high)/2 + (high-low)/math.Sqrt2); s.Rows[0].Limit != Slew || !(math.Abs(s.Rows[0].Bound-want) <= 1e-15) {
		t.Errorf("slew %+v; by hand %g", s.Rows[0], want)
	}
	// 95 free samples; 1 us is 1000 samples; 0.6 sqrt(1000) = 19 cannot be reached with 95 samples
	if len(s.Balls) != 0 {
		t.Errorf("balls %+v", s.Balls)
	}
	reserve := 0.7072 * 0.98 * lsb * math.Sqrt(95)
	if want := math.Pow(0.002*math.Sqrt(100)-reserve, 2); !(math.Abs(s.OutOfBand-want) <= 1e-15) || !s.OutOfBandReserved {
		t.Errorf("out of band %g; by hand %g", s.OutOfBand, want)
	}
	c.RMSPeriod = 0
	c.OutOfBand = 2e-4 // a fifth of it is 4e-5, less than the rounding, 8e-5
	if s, err = p.Playable(0, 100); err != nil {
		t.Fatal(err)
	}
	if want := 0.6*10 - reserve; len(s.Balls) != 1 || s.Balls[0].Limit != RMS || s.Balls[0].Weights != nil || !(math.Abs(s.Balls[0].Bound-want) <= 1e-14) {
		t.Errorf("balls %+v; by hand %g", s.Balls, want)
	}
	if s.OutOfBandReserved || !(math.Abs(s.OutOfBand-4e-6) <= 1e-18) {
		t.Errorf("out of band %g, reserved %v", s.OutOfBand, s.OutOfBandReserved)
	}
	box, err := p.Playable(2, 16)
	if err != nil {
		t.Fatal(err)
	}
	if want := 1 - lsb; box.Box != want || !(math.Abs(box.Disc-math.Sqrt2*want) <= 1e-15) {
		t.Errorf("box %+v", box)
	}
	for _, test := range []struct {
		change func(c *Channel)
		n      int
		want   string
	}{
		{func(c *Channel) { c.RMSLimit = 1e-4 }, 16, `channel "drive" can play nothing in 16 samples: rms_limit: 0.01 % is within the rounding of 10 bit`},
		{func(c *Channel) { c.GuardLead = 11 }, 16, `channel "drive" can play nothing in 16 samples: zero_mean: one free sample sums to zero only when it is zero`},
		{func(c *Channel) { c.AmplitudeLimit = 1e-3 }, 16, `channel "drive" can play nothing in 16 samples: amplitude_limit: 0.1 % is within the rounding of 10 bit`},
		{func(c *Channel) { c.Envelope, c.AmplitudeLimit = Box, 9e-4 }, 16, `channel "drive" can play nothing in 16 samples: amplitude_limit: 0.09 % is within the rounding of 10 bit`},
	} {
		p := wideProfile(t, MinusSin)
		p.Bits = 10
		test.change(&p.Channels[0])
		if test.n == 16 && p.Channels[0].GuardLead == 11 {
			// one free sample
			p.Channels[0].GuardTrail = 4
		}
		if s, err := p.Playable(0, test.n); err == nil || err.Error() != test.want {
			t.Errorf("got %v, %v; needed: %s", s, err, test.want)
		}
	}
}

// The checker's readings of the new limits, by hand.
func TestWideReadings(t *testing.T) {
	p := wideProfile(t, MinusSin)
	c := &p.Channels[0]
	c.ZeroMean = false
	x := make([]complex128, 40)
	x[10], x[11] = 0.3, complex(0, -0.4)
	find := func(l Limit) Reading {
		t.Helper()
		list, err := p.CheckSamples(0, x)
		if err != nil {
			t.Fatal(err)
		}
		for _, r := range list {
			if r.Limit == l {
				return r
			}
		}
		t.Fatalf("no reading %q", l)
		return Reading{}
	}
	near := func(what string, got, want float64) {
		t.Helper()
		if !(math.Abs(got-want) <= 1e-13) {
			t.Errorf("%s %g; by hand %g", what, got, want)
		}
	}
	near("rms", find(RMS).Found, math.Sqrt(0.25/1000)) // over 1 us
	c.RMSPeriod = 0
	near("rms", find(RMS).Found, math.Sqrt(0.25/40))
	// |X|^2 = 0.25 + cross terms: Re(0.3 conj(-0.4i)) = 0, so white: 80 % of the energy lies outside 100 MHz at 1 GS/s up to the cross
	// term 2 Re(conj(a) b (-K)) = 0 too
	near("out of band", find(OutOfBand).Found, math.Sqrt(0.25*0.8/40))
	near("amplitude", find(Amplitude).Found, 0.4/0.98)
	near("slew", find(Slew).Found, 0.4/0.98)
	if find(RMS).OK != true || find(OutOfBand).OK || find(RingOutTail).Allowed != 5e-4 || find(RingOutFast).Allowed != 3e-3 {
		t.Errorf("%+v", find(RingOutTail))
	}
	c.Envelope, c.Compression = Box, nil
	x[11] = complex(0.3, -0.4)
	near("amplitude", find(Amplitude).Found, 0.4)
	// A span of Band at half the sample rate has nothing outside.
	c.Band = 0.5
	list, err := p.CheckSamples(0, x)
	if err != nil || slices.ContainsFunc(list, func(r Reading) bool { return r.Limit == OutOfBand }) {
		t.Errorf("%v, %v", list, err)
	}
}

// reachWide is reach with the limits that the width brought: box, balls, and the energy out of band with its kernel matrix (nil: none).
func reachWide(s *Set, kernel [][]float64, x, d []complex128) float64 {
	far, _ := reach(s, x, d)
	quadratic := func(a, b, c float64) { // a t^2 + 2 b t + c <= 0
		if a > 0 {
			c = min(c, 0)
			far = min(far, -c/(b+math.Sqrt(b*b-a*c)))
		}
	}
	if s.Box > 0 {
		for k := range x {
			for _, q := range [][2]float64{{real(x[k]), real(d[k])}, {imag(x[k]), imag(d[k])}} {
				if q[1] != 0 {
					far = min(far, max(0, (s.Box-math.Copysign(1, q[1])*q[0])/math.Abs(q[1])))
				}
			}
		}
	}
	for _, b := range s.Balls {
		quadratic(real(inner(d, d)), real(inner(x, d)), real(inner(x, x))-b.Bound*b.Bound)
	}
	if kernel != nil {
		form := func(a, b []complex128) float64 {
			sum := 0.0
			for k, row := range kernel {
				for l, e := range row {
					sum += e * real(cmplx.Conj(a[k])*b[l])
				}
			}
			return sum
		}
		quadratic(form(d, d), form(x, d), form(x, x)-s.OutOfBand)
	}
	return far
}

// A waveform of any set, from zero along random directions, on its boundary at the end.
func wanderWide(s *Set, c *Channel, kernel [][]float64, rng *rand.Rand, steps int) []complex128 {
	x, d := make([]complex128, s.Samples), make([]complex128, s.Samples)
	for step := range steps {
		smooth := 1 + rng.IntN(12) // smooth directions get farther within a band
		mean := complex128(0)
		for k := s.Lead; k < s.Samples-s.Trail; k++ {
			v := complex(rng.NormFloat64(), rng.NormFloat64())
			if c.Kind == Baseband {
				v = complex(real(v), 0)
			}
			d[k] = v
		}
		for range smooth {
			before := complex128(0)
			for k := s.Lead; k < s.Samples-s.Trail; k++ {
				next := complex128(0)
				if k+1 < s.Samples-s.Trail {
					next = d[k+1]
				}
				before, d[k] = d[k], before/4+d[k]/2+next/4
			}
		}
		free := float64(s.Samples - s.Lead - s.Trail)
		if s.ZeroMean {
			for k := s.Lead; k < s.Samples-s.Trail; k++ {
				mean += d[k] / complex(free, 0)
			}
			for k := s.Lead; k < s.Samples-s.Trail; k++ {
				d[k] -= mean
			}
		}
		far := reachWide(s, kernel, x, d)
		if step < steps-1 {
			far *= rng.Float64()
		}
		for k := range x {
			x[k] += complex(far*(1-1e-13), 0) * d[k]
		}
	}
	return x
}

// drawWide has one channel of any kind with any of the limits.
func drawWide(rng *rand.Rand) (*Profile, string, error) {
	p := &Profile{Name: "random", SamplePeriod: 0.4 + rng.Float64(), Bits: 8 + rng.IntN(9), Block: 1, Shortest: 1, Longest: 100}
	c := Channel{Name: "a", Kind: Quadrature, AmplitudeLimit: 0.5 + rng.Float64()/2, SlewLimit: math.Inf(1), Band: math.Inf(1), RingOut: RingOut{Limit: math.Inf(1)}}
	words := fmt.Sprintf("h %.3f, %d bit", p.SamplePeriod, p.Bits)
	note := func(format string, args ...any) { words += ", " + fmt.Sprintf(format, args...) }
	var sections []filter.Line
	var fault error
	section := func(l filter.Line, err error) {
		if err != nil {
			fault = err
		}
		sections = append(sections, l)
	}
	corner := 0.05 * math.Pow(20, rng.Float64())
	order := 1 + rng.IntN(6)
	switch rng.IntN(4) {
	case 0:
		section(filter.Butterworth(order, corner))
	case 1:
		section(filter.CriticallyDamped(order, corner))
	case 2:
		section(filter.GaussianLike(order, corner))
	default:
		section(filter.Bessel(order, corner))
	}
	note("order %d at %.3g GHz", order, corner)
	if rng.IntN(2) == 0 {
		section(filter.Tails([]filter.Tail{{Amplitude: 0.06*rng.Float64() - 0.03, Time: 5 * math.Pow(100, rng.Float64())}}))
		note("tail")
	}
	switch rng.IntN(4) {
	case 0:
		c.Kind = Baseband
	case 1:
		c.Envelope = Box
	}
	note("%s %s", c.Kind, c.Envelope)
	if c.Kind == Quadrature && rng.IntN(3) == 0 {
		section(filter.Resonance(0.2*rng.NormFloat64(), 0.005+0.05*rng.Float64(), complex(rng.Float64(), 0)))
		note("resonance")
	}
	if rng.IntN(4) == 0 {
		section(filter.ACCoupling(100 * math.Pow(1e4, rng.Float64())))
		c.ZeroMean = true
		note("zero mean behind a coupling")
	}
	if fault == nil {
		c.Line, fault = filter.Cascade(sections...)
	}
	if c.Envelope != Box && rng.IntN(2) == 0 {
		c.Compression = randomCompression(rng)
		note("compression %.3g", c.Compression)
	}
	if rng.IntN(2) == 0 {
		c.SlewLimit = 0.1 + rng.Float64()
		note("slew %.3g", c.SlewLimit)
	}
	if rng.IntN(2) == 0 {
		c.RMSLimit, c.RMSPeriod = 0.1+0.4*rng.Float64(), 50*rng.Float64()
		note("rms %.3g", c.RMSLimit)
	}
	if rng.IntN(2) == 0 {
		c.Band, c.OutOfBand = (0.1+0.3*rng.Float64())/p.SamplePeriod, 1e-3*math.Pow(100, rng.Float64())
		note("band %.3g, out of it %.3g", c.Band, c.OutOfBand)
	}
	if rng.IntN(2) == 0 {
		c.GuardLead, c.GuardTrail = rng.IntN(3), rng.IntN(6)
	}
	if rng.IntN(3) > 0 {
		c.RingOut = RingOut{Limit: 1e-3 * math.Pow(30, rng.Float64()), Fast: 20 * rng.Float64(), Tail: 1e-3 * math.Pow(30, rng.Float64())}
		note("ring-out %.3g", c.RingOut)
	}
	p.Channels = []Channel{c}
	return p, words, fault
}

// No waveform of the set, on its boundary or inside, breaks a limit of the profile before rounding, by the checker and by means that share
// nothing with either; nor do its codes, but where the set says so.
func TestWideInvariants(t *testing.T) {
	rng := rand.New(rand.NewPCG(31, 4))
	nearest := map[Limit]float64{}
	sets, unreserved := 0, 0
	for sets < 60 {
		p, words, err := drawWide(rng)
		if err != nil { // sections whose poles filter cannot join
			continue
		}
		c := &p.Channels[0]
		n := 12 + rng.IntN(30)
		s, err := p.Playable(0, n)
		if err != nil {
			if !strings.Contains(err.Error(), "can play nothing") {
				t.Fatalf("%s: %v", words, err)
			}
			continue
		}
		sets++
		if !s.Reserved || !s.OutOfBandReserved {
			unreserved++
		}
		var kernel [][]float64
		if !math.IsInf(s.OutOfBand, 1) {
			kernel = make([][]float64, n)
			for k := range kernel {
				for l := range n {
					one, other := make([]complex128, n), make([]complex128, n)
					one[k], other[l] = 1, 1
					kernel[k] = append(kernel[k], quadratic(one[k:k+1], other[k:k+1], c.Band*p.SamplePeriod))
					if k != l {
						kernel[k][l] = -math.Sin(2*math.Pi*c.Band*p.SamplePeriod*float64(k-l)) / (math.Pi * float64(k-l))
					}
				}
			}
		}
		for range 10 {
			x := wanderWide(s, c, kernel, rng, 1+rng.IntN(8))
			list, err := p.CheckSamples(0, x)
			if err != nil {
				t.Fatalf("%s: %v", words, err)
			}
			for _, r := range list {
				if !r.OK {
					t.Errorf("%s, %d samples: %+v", words, n, r)
				}
				if r.Limit != Length && r.Allowed > 0 {
					nearest[r.Limit] = max(nearest[r.Limit], r.Found/r.Allowed)
				}
			}
			codes, err := p.Codes(0, x)
			if err != nil {
				t.Errorf("%s: %v", words, err)
				continue
			}
			reached, err := p.Samples(0, codes)
			if err != nil {
				t.Fatal(err)
			}
			list, err = p.CheckCodes(0, codes)
			if err != nil {
				t.Fatal(err)
			}
			for _, r := range list {
				excused := !s.Reserved && (r.Limit == RingOutFast || r.Limit == RingOutTail) || !s.OutOfBandReserved && r.Limit == OutOfBand
				if !r.OK && !excused {
					t.Errorf("%s, %d samples, codes: %+v", words, n, r)
				}
			}
			judgeWide(t, words, p, x, func(v complex128) complex128 { return bisected(c.Compression, v) }, true, kernel)
			if s.Reserved && s.OutOfBandReserved {
				at, _ := c.atConverter(codes, p.Bits)
				k := 0
				judgeWide(t, words+", codes", p, reached, func(complex128) complex128 { k++; return at[k-1] }, false, kernel)
			}
		}
	}
	t.Logf("%d sets without room for rounding; nearest to each limit: %v", unreserved, nearest)
	for limit, least := range map[Limit]float64{Amplitude: 0.99, LargestOne: 0.9, Slew: 0.95, RMS: 0.98, OutOfBand: 0.98, RingOutFast: 0.98, RingOutTail: 0.97} {
		if !(nearest[limit] >= least) {
			t.Errorf("the nearest to the limit on %s is %g of it; needed: %g for the test to say something", limit, nearest[limit], least)
		}
	}
	if unreserved == 0 || unreserved == sets {
		t.Errorf("%d of %d sets without room for rounding", unreserved, sets)
	}
}

// bisected undoes a compression without its inverse.
func bisected(c Compression, y complex128) complex128 {
	lo, hi := 0.0, 2.0
	for range 60 {
		if mid := (lo + hi) / 2; cmplx.Abs(c.Reached(complex(mid, 0))) < cmplx.Abs(y) {
			lo = mid
		} else {
			hi = mid
		}
	}
	if y == 0 {
		return 0
	}
	return y * complex(lo/cmplx.Abs(y), 0)
}

// judgeWide judges what the drive reaches, y, and what the converter puts out, without package code but Held.
func judgeWide(t *testing.T, words string, p *Profile, y []complex128, converter func(complex128) complex128, exact bool, kernel [][]float64) {
	t.Helper()
	c := &p.Channels[0]
	n := len(y)
	broken := func(what string, found, allowed float64) {
		if !(found <= allowed+shareTolerance) {
			t.Errorf("%s, %d samples: %s %g; limit %g", words, n, what, found, allowed)
		}
	}
	last := complex128(0)
	squares := 0.0
	for k, v := range append(slices.Clone(y), 0) {
		x := complex128(0)
		if k < n {
			x = converter(v)
		}
		size := cmplx.Abs(x)
		if c.Envelope == Box || c.Kind == Baseband {
			size = max(math.Abs(real(x)), math.Abs(imag(x)))
		}
		broken("amplitude", size, c.AmplitudeLimit)
		broken("slew", max(math.Abs(real(x-last)), math.Abs(imag(x-last))), c.SlewLimit)
		if (k < c.GuardLead || k >= n-c.GuardTrail) && x != 0 || c.Kind == Baseband && imag(x) != 0 {
			t.Errorf("%s, %d samples: sample %d is %v", words, n, k, x)
		}
		last = x
		squares += real(v)*real(v) + imag(v)*imag(v)
	}
	if c.RMSLimit > 0 {
		broken("rms", math.Sqrt(squares/math.Max(float64(n), c.RMSPeriod/p.SamplePeriod)), c.RMSLimit)
	}
	if kernel != nil {
		sum := 0.0
		for k, row := range kernel {
			for l, e := range row {
				sum += e * real(cmplx.Conj(y[k])*y[l])
			}
		}
		// the kernel's sum cancels: rounding of 1e-15 of the whole energy
		broken("out of band", math.Sqrt(max(0, sum-1e-14*squares)/float64(n)), c.OutOfBand)
	}
	if c.ZeroMean && exact {
		sum := complex128(0)
		for _, v := range y {
			sum += v
		}
		broken("mean", cmplx.Abs(sum)/float64(n), 0)
	}
	if math.IsInf(c.RingOut.Limit, 1) {
		return
	}
	end := float64(n) * p.SamplePeriod
	times := append(allAfter(c.Line, end), end+c.RingOut.Fast)
	slices.Sort(times)
	for i, v := range c.Line.Held(y, p.SamplePeriod, times, nil) {
		limit := c.RingOut.Limit
		if times[i] > end+c.RingOut.Fast {
			limit = c.RingOut.Tail
		}
		broken(fmt.Sprintf("ring-out %g ns later", times[i]-end), max(math.Abs(real(v)), math.Abs(imag(v))), limit)
	}
}

// Two budgets of ring-out: the rows keep both at every instant, and come near to both.
func TestTwoBudgets(t *testing.T) {
	rng := rand.New(rand.NewPCG(17, 3))
	nearFast, nearTail, most := 0.0, 0.0, 0
	for range 40 {
		p, words := randomProfile(t, rng)
		c := &p.Channels[0]
		c.SlewLimit = math.Inf(1)
		c.RingOut.Fast = 15 * rng.Float64() * float64(rng.IntN(8)) / 7
		c.RingOut.Tail = c.RingOut.Limit * math.Pow(30, 2*rng.Float64()-1.5)
		words += fmt.Sprintf(", then %.3g", c.RingOut.Tail)
		n := 12 + rng.IntN(20)
		s, err := p.Playable(0, n)
		if err != nil {
			t.Fatalf("%s: %v", words, err)
		}
		most = max(most, len(s.Rows))
		end := float64(n) * p.SamplePeriod
		weights := make([]complex128, n)
		for trial := range 8 {
			x := wander(s, rng, 1+rng.IntN(6))
			if trial > 1 && len(s.Rows) > 0 {
				at := s.Rows[rng.IntN(len(s.Rows))].At
				if trial%2 == 0 {
					at = c.RingOut.Fast * (1 + 1e-3*rng.Float64()) // just after the step of the limit
				}
				c.Line.Weights(end+at*1.01, p.SamplePeriod, weights)
				x = climb(s, x, weights)
			}
			times := append(allAfter(c.Line, end), end+c.RingOut.Fast*(1+1e-12))
			slices.Sort(times)
			var fast, tail float64
			for i, v := range c.Line.Held(x, p.SamplePeriod, times, nil) {
				size := max(math.Abs(real(v)), math.Abs(imag(v)))
				if times[i]-end > c.RingOut.Fast {
					tail = max(tail, size)
				} else {
					fast = max(fast, size)
				}
			}
			if !(fast <= c.RingOut.Limit+shareTolerance) || !(tail <= c.RingOut.Tail+shareTolerance) {
				t.Errorf("%s, %d samples: ring-out %g and %g; limits %g and %g", words, n, fast, tail, c.RingOut.Limit, c.RingOut.Tail)
			}
			nearFast, nearTail = max(nearFast, fast/c.RingOut.Limit), max(nearTail, tail/c.RingOut.Tail)
			list, err := p.CheckSamples(0, x)
			if err != nil || !Kept(list) {
				t.Errorf("%s, %d samples: %+v, %v", words, n, list, err)
			}
		}
	}
	t.Logf("at most %d rows; nearest %.5f and %.5f of the limits", most, nearFast, nearTail)
	if !(min(nearFast, nearTail) >= 0.995) {
		t.Errorf("the nearest met are %g and %g of the limits; needed: 0.995", nearFast, nearTail)
	}
}

// The first row behind a single pole by hand: its reserves for the time between rows and for what a compression makes of
// rounding; and with a box the row is there as long as a quadrature can reach its limit.
func TestRingOutRowByHand(t *testing.T) {
	line, err := filter.SinglePole(2)
	if err != nil {
		t.Fatal(err)
	}
	worst := 0.9 * math.Exp(-3.0/2) * (1 - math.Exp(-9.0/2)) // of a quadrature, after 9 samples at 90 % and 3 guards
	p := &Profile{Name: "by hand", SamplePeriod: 1, Bits: 14, Block: 1, Shortest: 1, Longest: 100}
	p.Channels = []Channel{{Name: "a", Kind: Quadrature, Envelope: Box, AmplitudeLimit: 0.9, SlewLimit: math.Inf(1), Band: math.Inf(1), GuardTrail: 3, Line: line,
		RingOut: RingOut{Limit: 0.995 * worst, Fast: 8}}}
	s, err := p.Playable(0, 12)
	if err != nil || len(s.Rows) != 1 {
		t.Fatalf("%+v, %v", s, err)
	}
	c := &p.Channels[0]
	c.Envelope, c.Compression, c.RingOut.Limit = Disc, Compression{{0, 0}, {0.5, 0.8}, {1, 0.9}}, 0.1
	for _, test := range []struct {
		kind string
		gain float64
	}{{Quadrature, 0.9 + 1.4/math.Sqrt2}, {Baseband, 1.6}} { // slopes 0.2 and 1.6
		c.Kind = test.kind
		if s, err = p.Playable(0, 12); err != nil || len(s.Rows) != 1 {
			t.Fatalf("%+v, %v", s, err)
		}
		sum := 0.0
		for k := range 9 { // weights of a held sample behind 1/(1 + 2 s)
			sum += math.Exp(-float64(11-k)/2) - math.Exp(-float64(12-k)/2)
		}
		if want := 0.1*0.995 - test.gain/2/8192*sum; !(math.Abs(s.Rows[0].Bound-want) <= 1e-14) {
			t.Errorf("%s: bound %g; by hand %g", test.kind, s.Rows[0].Bound, want)
		}
	}
}
