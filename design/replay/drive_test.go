package replay

import (
	"context"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"
)

var table = []Knee{{0, 0}, {0.3, 0.33}, {0.6, 0.55}, {1, 0.8}}

// wideModel is a short random pulse on a quadrature channel and a baseband one of unlike delays, the window starting with the later or
// after both; now and then compressed, with a shift, and with an error of the first channel's line.
func wideModel(r *rand.Rand) *Model {
	m := randomModel(r)
	m.Channels = m.Channels[:1]
	h := m.SamplePeriod
	c := &m.Channels[0]
	x := make([]complex128, m.Samples)
	for k := range x {
		x[k] = complex(r.Float64()*1.2-0.6, 0)
	}
	m.Channels = append(m.Channels, Channel{
		Name: "flux", Kind: "baseband", FullScale: 0.3, Delay: c.Delay + h*float64(r.IntN(9)-4)/4,
		Direct: complex(0.2, 0.1), Poles: []complex128{-0.8, complex(-0.3, 0.4)}, Powers: []int{1, 1}, Residues: []complex128{0.5, complex(0.1, -0.2)},
		Operators: [][]complex128{{0.4, 0.2, 0.2, -0.4}}, MaxShare: 1, MaxSlew: math.Inf(1), RingOut: math.Inf(1), Samples: x,
	})
	c = &m.Channels[0]
	m.WindowStart = math.Max(c.Delay, m.Channels[1].Delay) + h*float64(r.IntN(2))/2
	if r.IntN(2) == 0 {
		c.Compression = table
		m.Channels[1].Compression = table
	}
	if r.IntN(2) == 0 {
		c.Shift, c.ShiftOperator = 0.4*(r.Float64()-0.5), []complex128{0.5, 0.1i, -0.1i, -0.5}
		m.Channels[1].Shift, m.Channels[1].ShiftOperator = 0.1, halfX
	}
	for _, name := range []string{"q1 drive", "flux"} {
		m.Errors = append(m.Errors, Class{
			Name: "slope of " + name, Kind: "line", Channels: []string{name}, Direct: complex(0.1*r.Float64(), 0.1),
			Poles: []complex128{-1, -1, complex(-0.4, 0.7)}, Powers: []int{1, 2, 1}, Residues: []complex128{0.6, -0.4, complex(0.1, 0.2)},
		})
	}
	return m
}

// Channels of both kinds, compression, shift and every kind of error against the definitions.
func TestWideDrives(t *testing.T) {
	r := rand.New(rand.NewPCG(11, 12))
	for i := range 18 {
		m := wideModel(r)
		e := newTestEngine(t, m)
		lambda := 0.2 * (r.Float64() - 0.5)
		var p *probe
		var w wrong
		switch i % 6 {
		case 0:
			p, w.i, w.q = e.newAmplitude(nil, ""), lambda, lambda
		case 1:
			p, w.i = e.newAmplitude([]string{"q1 drive"}, "I"), lambda
			m = inert(m)
		case 2:
			p, w.q = e.newAmplitude(nil, "Q"), lambda
		case 3:
			p, w.skew = e.newSkew(nil), lambda
		default:
			p, w.line, w.lambda = e.newLineError(&m.Errors[i%6-4]), &m.Errors[i%6-4], lambda
		}
		want := slowlyFrom(m, m.WindowStart, m.Samples*40, m.SamplePeriod/40, w)
		if got := distance(evolve(t, e, p, lambda), want); !(got <= 1e-9) { // what the reference is good for
			t.Errorf("drive %d: off by %.2g", i, got)
		}
	}
}

// inert makes a baseband channel one that an error of I leaves alone: in the reference all channels have the error.
func inert(m *Model) *Model {
	o := *m
	o.Channels = append([]Channel(nil), m.Channels...)
	c := &o.Channels[1]
	c.Kind = "quadrature" // its I moved to Q
	c.Operators = [][]complex128{make([]complex128, 4), c.Operators[0]}
	c.Compression = nil
	c.Samples = append([]complex128(nil), c.Samples...)
	for k, x := range c.Samples {
		c.Samples[k] = 1i * pressed(&m.Channels[1], x)
	}
	// Re(G x) is wanted on Q, and nothing on I: half of it through each of G and its conjugate.
	n := len(c.Poles)
	c.Direct = complex(real(c.Direct), 0)
	for i := range n {
		c.Poles, c.Powers = append(c.Poles, cmplx.Conj(c.Poles[i])), append(c.Powers, c.Powers[i])
		c.Residues = append(c.Residues, cmplx.Conj(c.Residues[i])/2)
	}
	c.Residues = append([]complex128(nil), c.Residues...)
	for i := range n {
		c.Residues[i] /= 2
	}
	return &o
}

// The kernel for any number of levels takes every kind of error as the one for two does.
func TestGeneralKernelErrors(t *testing.T) {
	r := rand.New(rand.NewPCG(13, 14))
	for range 6 {
		m := wideModel(r)
		e := newTestEngine(t, m)
		general := &labour{e: e}
		general.levels(2)
		a, b := make([]complex128, 4), make([]complex128, 4)
		for i, p := range []*probe{nil, e.newAmplitude(nil, "I"), e.newAmplitude(nil, ""), e.newSkew(nil), e.newLineError(&m.Errors[0]), e.newLineError(&m.Errors[1]), newStatic(halfY, 2)} {
			plan, err := e.plan(context.Background(), p, 0.1, false)
			if err != nil {
				t.Fatal(err)
			}
			e.labours[0].integrate(plan, p, 0.1, a)
			general.integrate(plan, p, 0.1, b)
			if d := distance(a, b); !(d <= 1e-13) {
				t.Errorf("error %d: the two kernels differ by %.2g", i, d)
			}
		}
	}
}

// The bound of the remainder covers the power term and every error up to its reach: plans with an eighth of the step change nothing. The
// shift is made to rule, once as strong as the drive and once far stronger.
func TestErrorControlWide(t *testing.T) {
	ctx := context.Background()
	for _, shift := range []float64{0, 0.2, 30} {
		m := rackB(cosine(12, 16))
		c := &m.Channels[0]
		for k := range c.Samples {
			c.Samples[k] *= complex(2, 0.5*float64(k%5))
		}
		c.Shift, c.ShiftOperator = shift, halfZ
		m.Errors = []Class{{Name: "corner", Kind: "line", Channels: []string{"q1 drive"}, Poles: []complex128{-1.2, -1.2}, Powers: []int{1, 2}, Residues: []complex128{1.2, -1.44}}}
		e := newTestEngine(t, m)
		l := e.labours[0]
		a, b := make([]complex128, 4), make([]complex128, 4)
		for name, p := range map[string]*probe{
			"none": nil, "amplitude": e.newAmplitude(nil, ""), "I": e.newAmplitude(nil, "I"), "Q": e.newAmplitude(nil, "Q"), "skew": e.newSkew(nil), "line": e.newLineError(&m.Errors[0]),
		} {
			for _, lambda := range []float64{0.125, -0.5, 2, 20} {
				angle := 0.0 // at most, in rad: a turn of that many is known to a few roundings of it
				for _, x := range c.Samples {
					u := (1 + math.Abs(lambda)) * cmplx.Abs(x)
					angle += c.FullScale*u + shift*u*u
				}
				if angle > 5000 {
					continue
				}
				coarse, err := e.plan(ctx, p, lambda, false)
				if err != nil {
					t.Fatal(err)
				}
				w := e.newWalker(p, 1)
				fine := w.newPlan()
				for k := range m.Samples * 8 {
					r := p.reach(lambda)
					if err := w.to(ctx, e.start+float64(k+1)*m.SamplePeriod/8, r, fine); err != nil {
						t.Fatal(err)
					}
				}
				l.integrate(coarse, p, lambda, a)
				l.integrate(fine, p, lambda, b)
				tolerance := 1e-13 + 1e-14*angle
				if d := distance(a, b); !(d <= tolerance) {
					t.Errorf("shift %g, %s of %g: an eighth of the step changes the gate by %.2g", shift, name, lambda, d)
				}
				if d := defect(a, 2); !(d <= tolerance) {
					t.Errorf("shift %g, %s of %g: unitary to %.2g", shift, name, lambda, d)
				}
			}
		}
	}
}

// A resonant square pulse that shifts its own spin by D at full power: the gate of a constant Hamiltonian about an axis between X and Z,
// exp(-i T/2 (x O X + x^2 D Z)), its amplitude error with x (1 + lambda), and what first order leaves of that error: of V = x O X/2 + 2 x^2 D Z/2
// the part along the axis whole, and the rest times |sinc(w T/2)| (a vector turned about an axis at a right angle, averaged over the angle w T).
func TestShiftedSquare(t *testing.T) {
	const n, o, d = 40, 2 * math.Pi * 0.04, 0.09
	x := make([]complex128, n)
	for k := range x {
		x[k] = 0.8
	}
	m := spinModel(1, rotation(math.Pi, 0), x)
	m.Channels[0].Shift, m.Channels[0].ShiftOperator = d, halfZ
	m.Errors = []Class{{Name: "amplitude I", Kind: "amplitude", Quadrature: "I"}}
	e := newTestEngine(t, m)
	for _, lambda := range []float64{0, 0.1, -0.3} {
		f, z := 0.8*(1+lambda)*o, math.Pow(0.8*(1+lambda), 2)*d
		w := math.Hypot(f, z)
		c, s := math.Cos(w*n/2), math.Sin(w*n/2)
		want := []complex128{complex(c, -s*z/w), complex(0, -s*f/w), complex(0, -s*f/w), complex(c, s*z/w)}
		for _, p := range []*probe{e.newAmplitude(nil, ""), e.newAmplitude(nil, "I")} {
			if got := distance(evolve(t, e, p, lambda), want); !(got <= 3e-13) {
				t.Errorf("amplitude %g: off by %.2g", lambda, got)
			}
		}
	}
	f, z := 0.8*o, 0.64*d
	w := math.Hypot(f, z)
	along := (f*f + 2*z*z) / w
	across := math.Sqrt(f*f + 4*z*z - along*along)
	left := math.Hypot(along, across*math.Sin(w*n/2)/(w*n/2))
	want := left / math.Hypot(f, 2*z)
	got := judged(t, m, 1e-4)
	for _, name := range []string{"amplitude", "amplitude I"} {
		if s := got[name].Susceptibility; !(math.Abs(s-want) <= 1e-11) {
			t.Errorf("%s: susceptibility %.12g, want %.12g", name, s, want)
		}
	}
}

// What the ring-out shifts, where it hardly drives: a tail A e^(-t/10 ns) turns about Z by D A^2 5 ns.
func TestShiftedTail(t *testing.T) {
	const d = 0.7
	m := spinModel(1, rotation(1, 0), []complex128{0.3, 0.2, -0.5, 0.1})
	c := &m.Channels[0]
	c.FullScale, c.Shift, c.ShiftOperator = 1e-10, d, halfZ
	c.Direct, c.Poles, c.Powers, c.Residues = 0, []complex128{-0.1}, []int{1}, []complex128{0.1}
	e := newTestEngine(t, m)
	a := real(arrives(m, 0, 4))
	if got, want := angle(e.post, 2), d*a*a*5; !(math.Abs(got-want) <= 1e-11) {
		t.Errorf("the tail turns by %.15g, want %.15g", got, want)
	}
}

// A bias turns about Z by what its samples add up to, real part only, at its own delay; and turns of the drive's phase leave it alone.
func TestBaseband(t *testing.T) {
	ctx := context.Background()
	x := make([]complex128, 12)
	angle := 0.0
	for k := range x {
		x[k] = complex(0.1*float64(k)-0.4, 0)
		angle += 0.3 * real(x[k])
	}
	m := spinModel(1, rotationZ(angle), x)
	m.Channels[0] = Channel{
		Name: "flux", Kind: "baseband", FullScale: 0.3, Direct: complex(1, 5), Operators: [][]complex128{halfZ},
		MaxShare: 1, MaxSlew: math.Inf(1), RingOut: math.Inf(1), Samples: x,
	}
	if err := m.Validate(); err != nil {
		t.Fatal(err)
	}
	settled, window, tail, err := m.Figures(ctx)
	if err != nil {
		t.Fatal(err)
	}
	if !(settled.Infidelity <= 1e-27) || !(window.Infidelity <= 1e-27) || tail != 0 {
		t.Errorf("infidelity %.2g and %.2g, tail %g", settled.Infidelity, window.Infidelity, tail)
	}
	// The same bias beside a drive: the pair as one long pulse, of which the phase turns the drive only.
	m = rackB(cosine(24, 32))
	m.Channels[0].Poles[2] = -0.1
	for k, v := range m.Channels[0].Samples {
		m.Channels[0].Samples[k] = 1.3 * v
	}
	flux := make([]complex128, 32)
	for k := range 20 {
		flux[k] = complex(0.05+0.01*float64(k), 0)
	}
	m.Channels = append(m.Channels, Channel{
		Name: "flux", Kind: "baseband", FullScale: 0.3, Delay: 2.2, Poles: []complex128{-0.5}, Powers: []int{1}, Residues: []complex128{0.5},
		Operators: [][]complex128{halfZ}, MaxShare: 1, MaxSlew: math.Inf(1), RingOut: math.Inf(1), Samples: flux,
	})
	m.Channels[0].Shift, m.Channels[0].ShiftOperator = -0.05, halfZ
	got, err := m.Pair(ctx)
	if err != nil {
		t.Fatal(err)
	}
	worst := Pair{Infidelity: -1}
	for quarter := range 4 {
		phi := float64(quarter) * math.Pi / 2
		long := m.WithSamples(64, join(m.Channels[0].Samples, 1, cmplx.Rect(1, phi)), join(flux, 1, 1))
		long.Target = product(rotation(math.Pi/2, phi), rotation(math.Pi/2, 0))
		f, _, _, err := long.Figures(ctx)
		if err != nil {
			t.Fatal(err)
		}
		if f.Infidelity > worst.Infidelity {
			worst = Pair{f.Infidelity, 90 * float64(quarter)}
		}
	}
	if !(math.Abs(got.Infidelity/worst.Infidelity-1) <= 1e-9) || got.Phase != worst.Phase {
		t.Errorf("pair %v, want %v", got, worst)
	}
}

// Settled ends of channels with unlike delays, of which one begins before the window and one rings longest, with static part and shift; an
// error acts in the window only.
func TestSettledUnlikeDelays(t *testing.T) {
	m := rackB(cosine(12, 16))
	c := &m.Channels[0]
	c.Poles[2], c.Residues[2] = -0.1, 2*c.Residues[2]
	c.Shift, c.ShiftOperator = 0.05, halfZ
	m.Static = []complex128{0.002, 0, 0, -0.002}
	flux := make([]complex128, 16)
	for k := range flux {
		flux[k] = complex(0.3*math.Sin(float64(k)), 0)
	}
	m.Channels = append(m.Channels, Channel{
		Name: "flux", Kind: "baseband", FullScale: 0.2, Delay: 1.2, Poles: []complex128{-0.15}, Powers: []int{1}, Residues: []complex128{0.1},
		Operators: [][]complex128{{0.3, 0.1, 0.1, -0.3}}, MaxShare: 1, MaxSlew: math.Inf(1), RingOut: math.Inf(1), Samples: flux,
	})
	m.Errors = []Class{{Name: "time", Kind: "line", Channels: []string{"flux"}, Direct: 0.1, Poles: []complex128{-0.15}, Powers: []int{2}, Residues: []complex128{0.05}}}
	e := newTestEngine(t, m)
	const after, lambda = 260, 0.2
	idle := func(t float64) []complex128 { return exponential(m.Static, t) }
	pre := product(slowlyFrom(m, 1.2, 2*8, 1./8, wrong{}), adjoint(idle(2)))
	tail := slowlyFrom(m, 3.2+16, after*8, 1./8, wrong{})
	inside := slowlyFrom(m, 3.2, 16*8, 1./8, wrong{line: &m.Errors[0], lambda: lambda})
	want := product(adjoint(idle(after)), product(tail, product(inside, pre)))
	var got []complex128
	err := e.run(context.Background(), []gate{{e.newLineError(&m.Errors[0]), lambda}}, func(l *labour, _ int, u []complex128) {
		got = append([]complex128(nil), e.settle(l, u)...)
	})
	if err != nil {
		t.Fatal(err)
	}
	if d := distance(got, want); !(d <= 1e-9) {
		t.Errorf("settled gate off by %.2g", d)
	}
}

// Compression by hand, and a compressed pulse as one whose samples are what is left.
func TestCompression(t *testing.T) {
	c := Channel{Compression: []Knee{{0, 0}, {0.5, 0.49}, {1, 0.95}}}
	for x, want := range map[complex128]complex128{
		0: 0, 0.25: 0.245, -0.25: -0.245, 0.5: 0.49, 0.75i: 0.72i, -1: -0.95, 1.1: 1.042, complex(0.45, -0.6): complex(0.6, -0.8) * 0.72,
	} {
		if got := c.Compressed(x); !(cmplx.Abs(got-want) <= 1e-15) {
			t.Errorf("%v is compressed to %v, want %v", x, got, want)
		}
		if got := pressed(&c, x); !(cmplx.Abs(got-want) <= 1e-15) {
			t.Errorf("the reference: %v is compressed to %v, want %v", x, got, want)
		}
	}
	if got := (&Channel{}).Compressed(0.3); got != 0.3 {
		t.Errorf("without a table %v", got)
	}
	m := rackB(cosine(24, 32))
	plain := m.WithSamples(32, m.Channels[0].Samples)
	m.Channels[0].Compression = table
	for k, x := range m.Channels[0].Samples {
		plain.Channels[0].Samples[k] = pressed(&m.Channels[0], x*complex(1, 0.3))
		m.Channels[0].Samples[k] = x * complex(1, 0.3)
	}
	a, err := m.Judge(context.Background(), 1e-4)
	if err != nil {
		t.Fatal(err)
	}
	b, err := plain.Judge(context.Background(), 1e-4)
	if err != nil {
		t.Fatal(err)
	}
	if !(math.Abs(a.Settled.Infidelity-b.Settled.Infidelity) <= 1e-15) || !(math.Abs(a.Pair.Infidelity-b.Pair.Infidelity) <= 1e-14) {
		t.Errorf("compressed %v, %v; its samples %v, %v", a.Settled, a.Pair, b.Settled, b.Pair)
	}
	if a.Settled == m.WithSamples(32).figuresOf(t) {
		t.Errorf("silence gives the same")
	}
	for i, l := range a.Limits {
		found := b.Limits[i].Found
		if l.Limit == ringOut {
			if !(math.Abs(l.Found/found-1) <= 1e-9) {
				t.Errorf("ring-out %.12g, of the compressed samples %.12g", l.Found, found)
			}
		} else if l.Found == found && found != 0 {
			t.Errorf("%s is of the compressed samples", l.Limit)
		}
	}
}

func (m *Model) figuresOf(t *testing.T) Figures {
	t.Helper()
	f, _, _, err := m.Figures(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	return f
}

// Thirty-two equal poles in a row, 1/(1 - s/p)^32, slow and fast against the sample period: against the closed-form step response.
func TestHighPowers(t *testing.T) {
	for _, p := range []float64{-0.9, -4} {
		m := spinModel(1, rotation(1, 0), make([]complex128, 24))
		for k := range 8 {
			m.Channels[0].Samples[k] = complex(0.9, -0.1*float64(k))
		}
		c := &m.Channels[0]
		c.Direct, c.Poles, c.Powers, c.Residues = 0, []complex128{complex(p, 0)}, []int{32}, []complex128{cmplx.Pow(complex(-p, 0), 32)}
		e := newTestEngine(t, m)
		if d := distance(evolve(t, e, nil, 0), slowly(m, nil, 1, 16)); !(d <= 1e-10) {
			t.Errorf("pole %g: off by %.2g", p, d)
		}
	}
}

// Another line of one channel is that channel made with it, and nothing else.
func TestWithLine(t *testing.T) {
	m := testModel()
	o := testModel()
	c := &o.Channels[0]
	c.Delay, c.Direct, c.Poles[2], c.Residues[2] = 3.5, 0.01, -0.05, -0.0012
	was := append([]complex128(nil), m.Channels[0].Poles...)
	got := m.WithLine(0, c.Delay, c.Direct, c.Poles, c.Powers, c.Residues)
	if a, b := got.figuresOf(t), o.figuresOf(t); a != b || a == m.figuresOf(t) {
		t.Errorf("figures %v, want %v, of the other line %v", a, b, m.figuresOf(t))
	}
	c.Poles[0] = -1 // the model has copies
	if got.Channels[0].Poles[0] == -1 || m.Channels[0].Poles[2] != was[2] || m.Channels[0].Delay != 3.2 {
		t.Errorf("lists are shared")
	}
	if err := m.WithLine(0, 0, 1, []complex128{1}, []int{1}, []complex128{1}).Validate(); err == nil {
		t.Errorf("a growing pole is valid")
	}
	for name, bad := range map[string]func(){
		"no such channel": func() { m.WithLine(1, 0, 1, nil, nil, nil) },
		"unlike lists":    func() { m.WithLine(0, 0, 1, []complex128{-1}, nil, nil) },
	} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("%s: no panic", name)
				}
			}()
			bad()
		}()
	}
}
