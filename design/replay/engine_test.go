package replay

import (
	"context"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"reflect"
	"runtime"
	"testing"
)

// A resonant square pulse and a detuned one through a line that lets everything through, against the closed form of a constant
// Hamiltonian, exp(-i t/2 (O X + D Z)): Rabi 1937, Phys. Rev. 51, 652 (from memory).
func TestRabi(t *testing.T) {
	x := make([]complex128, 40)
	for k := range x {
		x[k] = 0.7
	}
	m := spinModel(1, rotation(math.Pi, 0), x)
	e := newTestEngine(t, m)
	omega := 0.7 * m.Channels[0].FullScale
	detuning := newStatic(halfZ, 2)
	for _, d := range []float64{0, 0.003, -0.05, 0.21, 1.1} {
		u := evolve(t, e, detuning, d)
		w := math.Hypot(omega, d)
		c, s := math.Cos(w*40/2), math.Sin(w*40/2)
		want := []complex128{complex(c, -s*d/w), complex(0, -s*omega/w), complex(0, -s*omega/w), complex(c, s*d/w)}
		if got := distance(u, want); !(got <= 3e-13) {
			t.Errorf("detuning %g rad/ns: off by %.2g", d, got)
		}
	}
}

// slowly integrates U' = -iHU with many midpoint exponentials and Richardson extrapolation, the line by its closed-form response: shares
// nothing with the engine. It gives the evolution over the window with H += extra and controls scaled.
func slowly(m *Model, extra []complex128, scale float64, perSample int) []complex128 {
	w := wrong{static: extra, i: scale - 1, q: scale - 1}
	return slowlyFrom(m, m.WindowStart, m.Samples*perSample, m.SamplePeriod/float64(perSample), w)
}

// wrong is an error for the reference, of every channel that can have it.
type wrong struct {
	static []complex128
	i, q   float64 // u_I and u_Q times 1 + this
	skew   float64
	line   *Class
	cross  *Class
	lambda float64 // of line or cross
}

// slowlyFrom takes so many steps of dt from time start.
func slowlyFrom(m *Model, start float64, steps int, dt float64, w wrong) []complex128 {
	n := m.Dim
	once := func(finer int) []complex128 {
		u, next := make([]complex128, n*n), make([]complex128, n*n)
		setIdentity(u, n)
		dt := dt / float64(finer)
		for k := range steps * finer {
			mul(next, exponential(hamiltonian(m, start+(float64(k)+0.5)*dt, w), dt), u, n)
			u, next = next, u
		}
		return u
	}
	a, b, c := once(1), once(2), once(4)
	out := make([]complex128, n*n)
	for i := range out {
		ab, bc := b[i]+(b[i]-a[i])/3, c[i]+(c[i]-b[i])/3
		out[i] = bc + (bc-ab)/15
	}
	return out
}

// hamiltonian is H(t) with an error, from the definitions.
func hamiltonian(m *Model, t float64, w wrong) []complex128 {
	h := append([]complex128(nil), m.Static...)
	add := func(f float64, op []complex128) {
		for i := range op {
			h[i] += complex(f, 0) * op[i]
		}
	}
	add(1, w.static)
	for c := range m.Channels {
		ch := &m.Channels[c]
		u := arrives(m, c, t)
		if w.line != nil && w.line.Channels[0] == ch.Name {
			other := *ch
			other.Direct, other.Poles, other.Powers, other.Residues = w.line.Direct, w.line.Poles, w.line.Powers, w.line.Residues
			slope := *m
			slope.Channels = []Channel{other}
			u += complex(w.lambda, 0) * arrives(&slope, 0, t)
		}
		i, q := (1+w.i)*real(u), (1+w.q)*imag(u)
		if ch.Kind == "baseband" {
			q = 0
		} else {
			i -= w.skew * imag(u)
			add(ch.FullScale*q, ch.Operators[1])
		}
		add(ch.FullScale*i, ch.Operators[0])
		if ch.Shift != 0 {
			add(ch.Shift*(i*i+q*q), ch.ShiftOperator)
		}
		for _, p := range ch.Paths {
			v := complex(i, q) * cmplx.Exp(complex(0, -p.Frequency*(t-m.WindowStart)))
			add(ch.FullScale*real(v), p.Operators[0])
			if len(p.Operators) > 1 {
				add(ch.FullScale*imag(v), p.Operators[1])
			}
		}
		if w.cross != nil && w.cross.Channels[0] == ch.Name {
			for k, op := range w.cross.Operators {
				add(w.lambda*ch.FullScale*[]float64{real(u), imag(u)}[k], op)
			}
		}
	}
	for _, r := range m.Rotating {
		add(math.Cos(r.Frequency*(t-m.WindowStart)), r.Cosine)
		add(math.Sin(r.Frequency*(t-m.WindowStart)), r.Sine)
	}
	return h
}

// arrives is u(t)/full scale on channel c: the sum of the step responses of all samples.
func arrives(m *Model, c int, t float64) complex128 {
	ch := &m.Channels[c]
	step := func(t float64) complex128 {
		if t <= 0 {
			return 0
		}
		v := ch.Direct
		for i, p := range ch.Poles {
			// integral of r t^(n-1) e^(pt)/(n-1)! by parts
			term := complex(0, 0)
			for k := ch.Powers[i]; k > 0; k-- {
				// (-1)^j t^(k-1)/(k-1)! e^(pt)/p^(j+1)
				j := ch.Powers[i] - k
				sign := complex(1-2*float64(j%2), 0)
				term += sign * cmplx.Exp(p*complex(t, 0)) * complex(math.Pow(t, float64(k-1))/math.Gamma(float64(k)), 0) / cmplx.Pow(p, complex(float64(j+1), 0))
			}
			j := ch.Powers[i] - 1
			term -= complex(1-2*float64(j%2), 0) / cmplx.Pow(p, complex(float64(j+1), 0))
			v += ch.Residues[i] * term
		}
		return v
	}
	var u complex128
	for k := range m.Samples {
		at := t - ch.Delay - float64(k)*m.SamplePeriod
		if at <= 0 {
			break
		}
		if ch.Samples[k] == 0 {
			continue
		}
		u += pressed(ch, ch.Samples[k]) * (step(at) - step(at-m.SamplePeriod))
	}
	return u
}

// pressed is a sample after compression: the sum of what each piece of the table adds.
func pressed(ch *Channel, x complex128) complex128 {
	if ch.Compression == nil || x == 0 {
		return x
	}
	a, f := cmplx.Abs(x), 0.0
	for i := 1; i < len(ch.Compression); i++ {
		p, q := ch.Compression[i-1], ch.Compression[i]
		end := q.Share
		if i == len(ch.Compression)-1 {
			end = math.Inf(1)
		}
		f += (q.Reached - p.Reached) / (q.Share - p.Share) * math.Max(0, math.Min(a, end)-p.Share)
	}
	return cmplx.Rect(f, cmplx.Phase(x))
}

// exponential is exp(-i H dt) of a Hermitian matrix, 2 x 2 by its eigenvalues, larger by the series of a small part, squared again and again.
func exponential(h []complex128, dt float64) []complex128 {
	if n := int(math.Round(math.Sqrt(float64(len(h))))); n > 2 {
		halvings := max(0, int(math.Ceil(math.Log2(4*frobenius(h)*dt+1e-300))))
		f := complex(0, -dt/math.Ldexp(1, halvings))
		u, term, next := make([]complex128, n*n), make([]complex128, n*n), make([]complex128, n*n)
		setIdentity(u, n)
		setIdentity(term, n)
		for k := 1; k <= 14; k++ { // (1/4)^15/15! is 7e-22
			mul(next, h, term, n)
			for i := range next {
				term[i] = f / complex(float64(k), 0) * next[i]
				u[i] += term[i]
			}
		}
		for range halvings {
			mul(next, u, u, n)
			u, next = next, u
		}
		return u
	}
	mean := (real(h[0]) + real(h[3])) / 2
	z := (real(h[0]) - real(h[3])) / 2
	w := math.Hypot(z, cmplx.Abs(h[1]))
	c, s := complex(math.Cos(w*dt), 0), complex(0, -dt)
	if w > 0 {
		s = complex(0, -math.Sin(w*dt)/w)
	}
	f := cmplx.Rect(1, -mean*dt)
	return []complex128{f * (c + s*complex(z, 0)), f * s * h[1], f * s * h[2], f * (c - s*complex(z, 0))}
}

// randomModel is a short pulse of random samples through a random line; now and then with a pole twice, a fast
// pole or two channels.
func randomModel(r *rand.Rand) *Model {
	n := 6 + r.IntN(8)
	x := make([]complex128, n)
	for k := range x {
		x[k] = complex(r.Float64()*1.4-0.7, r.Float64()*1.4-0.7)
	}
	h := 0.5 + r.Float64()
	m := spinModel(h, rotation(1, 0), x)
	m.WindowStart = 1.5
	c := &m.Channels[0]
	c.Delay = 1.5
	c.Direct = complex(r.Float64(), 0.1*r.Float64())
	for range 1 + r.IntN(3) {
		p := complex(-0.05-2*r.Float64(), 2*r.Float64()-1)
		c.Poles = append(c.Poles, p)
		c.Powers = append(c.Powers, 1)
		c.Residues = append(c.Residues, complex(r.Float64()-0.5, r.Float64()-0.5))
		if r.IntN(2) == 0 { // the same pole once more, squared or cubed
			c.Poles = append(c.Poles, p)
			c.Powers = append(c.Powers, 2+r.IntN(2))
			c.Residues = append(c.Residues, complex(0.3*(r.Float64()-0.5), 0))
		}
	}
	if r.IntN(3) == 0 {
		c.Poles, c.Powers, c.Residues = append(c.Poles, -12), append(c.Powers, 1), append(c.Residues, 3)
	}
	z := 0.2*r.Float64() - 0.1
	m.Static = []complex128{complex(z, 0), complex(0.02, 0.03), complex(0.02, -0.03), complex(-z, 0)}
	if r.IntN(3) == 0 {
		o := *c
		o.Name = "other"
		o.Operators = [][]complex128{halfZ, halfX}
		o.Samples = make([]complex128, n)
		for k := range o.Samples {
			o.Samples[k] = complex(r.Float64()-0.5, r.Float64()-0.5)
		}
		m.Channels = append(m.Channels, o)
	}
	return m
}

func TestRandomDrives(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	worst := 0.0
	for i := range 50 {
		m := randomModel(r)
		e := newTestEngine(t, m)
		lambda := 0.1 * (r.Float64() - 0.5)
		extra := []complex128{complex(lambda/2, 0), 0, 0, complex(-lambda/2, 0)}
		got := distance(evolve(t, e, newStatic(halfZ, 2), lambda), slowly(m, extra, 1, 24))
		worst = math.Max(worst, got)
		if !(got <= 2e-10) { // what the reference is good for
			t.Errorf("drive %d: static error off by %.2g", i, got)
		}
		got = distance(evolve(t, e, e.newAmplitude(nil, ""), 3*lambda), slowly(m, nil, 1+3*lambda, 24))
		worst = math.Max(worst, got)
		if !(got <= 2e-10) {
			t.Errorf("drive %d: amplitude error off by %.2g", i, got)
		}
	}
	t.Logf("worst of 100: %.2g", worst)
}

// product is a b for 2 x 2 matrices, adjoint a'.
func product(a, b []complex128) []complex128 {
	c := make([]complex128, 4)
	mul(c, a, b, 2)
	return c
}

func adjoint(a []complex128) []complex128 {
	c := make([]complex128, 4)
	mulAdjointLeft(c, a, []complex128{1, 0, 0, 1}, 2)
	return c
}

// Settled ends against the slow reference: the tail for 700 ns, without the error, in the frame of the undriven device, with and without a
// static part, and drive that arrives before the window.
func TestSettledEnds(t *testing.T) {
	for _, c := range []struct {
		name           string
		static, before float64
	}{{"plain", 0, 0}, {"static part", 0.004, 0}, {"early arrival", 0.004, 2}} {
		m := rackB(cosine(12, 16))
		m.Channels[0].Poles[2], m.Channels[0].Residues[2] = -0.1, m.Channels[0].Residues[2]*2 // a tail that ends sooner, and turns more
		m.Static = []complex128{complex(c.static, 0), 0, 0, complex(-c.static, 0)}
		m.WindowStart += c.before
		e := newTestEngine(t, m)
		if !(e.left <= settledAngle) {
			t.Fatalf("%s: %.2g rad left", c.name, e.left)
		}
		const after = 260.0
		long := m.WithSamples(m.Samples+after, m.Channels[0].Samples)
		idle := func(t float64) []complex128 { return exponential(m.Static, t) }
		tail := product(slowly(long, nil, 1, 8), adjoint(slowly(m, nil, 1, 8)))
		pre := []complex128{1, 0, 0, 1}
		if c.before > 0 {
			lead := m.WithSamples(int(c.before), m.Channels[0].Samples[:int(c.before)])
			lead.WindowStart -= c.before
			pre = product(slowly(lead, nil, 1, 8), adjoint(idle(c.before)))
		}
		const lambda = 0.02
		extra := []complex128{lambda / 2, 0, 0, -lambda / 2}
		want := product(adjoint(idle(after)), product(tail, product(slowly(m, extra, 1, 8), pre)))
		var got []complex128
		err := e.run(context.Background(), []gate{{newStatic(halfZ, 2), lambda}}, func(l *labour, _ int, u []complex128) {
			got = append([]complex128(nil), e.settle(l, u)...)
		})
		if err != nil {
			t.Fatal(err)
		}
		if d := distance(got, want); !(d <= 1e-9) {
			t.Errorf("%s: settled gate off by %.2g", c.name, d)
		}
		if d := angle(tail, 2) - angle(e.post, 2); c.static == 0 && !(math.Abs(d) <= 1e-9) {
			t.Errorf("%s: tail angle off by %.2g", c.name, d)
		}
	}
}

// Tolerance: plans with shorter steps and more terms change nothing that matters.
func TestErrorControl(t *testing.T) {
	m := rackB(cosine(112, 112))
	e := newTestEngine(t, m)
	w := e.newWalker(nil, 1)
	fine := &plan{controls: 2}
	if err := w.to(context.Background(), e.start, reach{}, &plan{controls: 2}); err != nil {
		t.Fatal(err)
	}
	for k := range 112 * 8 {
		if err := w.to(context.Background(), e.start+float64(k+1)/8, reaches[2], fine); err != nil {
			t.Fatal(err)
		}
	}
	l := e.labours[0]
	a, b := make([]complex128, 4), make([]complex128, 4)
	for _, g := range []gate{{}, {newStatic(halfZ, 2), 0.05}, {newStatic(halfX, 2), -0.01}, {e.newAmplitude(nil, ""), 0.1}} {
		l.integrate(e.plans[0], g.p, g.lambda, a)
		l.integrate(fine, g.p, g.lambda, b)
		if d := distance(a, b); !(d <= 1e-13) {
			t.Errorf("an eighth of the step changes the gate by %.2g", d)
		}
		if d := defect(a, 2); !(d <= 1e-13) {
			t.Errorf("unitary to %.2g", d)
		}
	}
	// Further reaches give the same gate.
	far := evolve(t, e, newStatic(halfZ, 2), 0.3)
	p, err := e.plan(context.Background(), newStatic(halfZ, 2), 10, false)
	if err != nil {
		t.Fatal(err)
	}
	l.integrate(p, newStatic(halfZ, 2), 0.3, a)
	if d := distance(a, far); !(d <= 1e-13) {
		t.Errorf("another reach changes the gate by %.2g", d)
	}
	huge := evolve(t, e, newStatic(halfZ, 2), 40) // beyond every reach
	if d := defect(huge, 2); !(d <= 1e-11) {
		t.Errorf("a huge error: unitary to %.2g", d)
	}
}

// The kernel for two levels against the one for any number, and two levels inside three and four.
func TestGeneralKernel(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 6))
	for range 10 {
		m := randomModel(r)
		e := newTestEngine(t, m)
		general := &labour{e: e}
		general.levels(2)
		a, b := make([]complex128, 4), make([]complex128, 4)
		for _, g := range []gate{{}, {newStatic(halfX, 2), 0.02}, {e.newAmplitude([]string{"q1 drive"}, ""), 0.05}} {
			e.labours[0].integrate(e.plans[0], g.p, g.lambda, a)
			general.integrate(e.plans[0], g.p, g.lambda, b)
			if d := distance(a, b); !(d <= 1e-13) {
				t.Errorf("the two kernels differ by %.2g", d)
			}
		}
	}
	// A spectator level changes nothing in the code space.
	m := rackB(cosine(24, 32))
	m.Errors = []Class{{Name: "Z", Kind: "static", Operator: halfZ}, {Name: "amplitude", Kind: "amplitude"}}
	grow := func(op []complex128) []complex128 {
		return []complex128{op[0], 0, op[1], 0, 0, 0, op[2], 0, op[3]}
	}
	big := *m
	big.Dim, big.CodeSpace, big.Static = 3, []int{0, 2}, make([]complex128, 9)
	big.Channels = append([]Channel(nil), m.Channels...)
	big.Channels[0].Operators = [][]complex128{grow(halfX), grow(halfY)}
	big.Errors = []Class{{Name: "Z", Kind: "static", Operator: grow(halfZ)}, {Name: "amplitude", Kind: "amplitude"}}
	// An energy that all code states share is no error.
	big.Errors = append(big.Errors, Class{Name: "common", Kind: "static", Operator: []complex128{1, 0, 0, 0, -2, 0, 0, 0, 1}})
	a, err := m.Judge(context.Background(), 1e-4)
	if err != nil {
		t.Fatal(err)
	}
	b, err := big.Judge(context.Background(), 1e-4)
	if err != nil {
		t.Fatal(err)
	}
	if d := math.Abs(a.Window.Infidelity - b.Window.Infidelity); !(d <= 1e-18) || b.Window.Leakage != 0 {
		t.Errorf("a spectator level changes the infidelity by %.2g, leakage %.2g", d, b.Window.Leakage)
	}
	if c := b.Errors[2]; c.Name != "common" || c.Susceptibility != 0 || !math.IsInf(c.High, 1) {
		t.Errorf("a common energy: susceptibility %g, margin %g", c.Susceptibility, c.High)
	}
	for _, ea := range a.Errors {
		for _, eb := range b.Errors {
			if ea.Name != eb.Name {
				continue
			}
			if !(math.Abs(ea.Susceptibility-eb.Susceptibility) <= 1e-8) || !(math.Abs(ea.High/eb.High-1) <= 1e-7) { // of three levels by rough plans
				t.Errorf("%s: susceptibility %.9g and %.9g, margin %.9g and %.9g", ea.Name, ea.Susceptibility, eb.Susceptibility, ea.High, eb.High)
			}
		}
	}
}

// Three levels, Motzoi, Gambetta, Rebentrost, Wilhelm 2009, Phys. Rev. Lett. 103, 110501: X(pi) in 20 ns by a raised cosine, anharmonicity -200 MHz. Infidelity
// and leakage without and with the derivative on the other quadrature, by independent computation (not this project's code), to
// their four and three digits. The continuous envelope is sampled finely.
func TestThreeLevels(t *testing.T) {
	const alpha, n, h = -2 * math.Pi * 0.2, 2000, 0.01
	s := complex(math.Sqrt2/2, 0)
	ladderX := []complex128{0, 0.5, 0, 0.5, 0, s, 0, s, 0}
	ladderY := []complex128{0, -0.5i, 0, 0.5i, 0, -1i * s, 0, 1i * s, 0}
	for _, c := range []struct {
		correct             float64
		infidelity, leakage float64
	}{{0, 7.817e-3, 3.63e-5}, {1, 4.891e-5, 8.57e-6}} {
		x := make([]complex128, n)
		for k := range x {
			at := 2 * math.Pi * (float64(k) + 0.5) / n
			x[k] = complex(math.Pi/20*(1-math.Cos(at)), -c.correct*math.Pi/20*2*math.Pi/20*math.Sin(at)/(2*alpha))
		}
		m := spinModel(h, rotation(math.Pi, 0), x)
		m.Dim, m.Static = 3, []complex128{0, 0, 0, 0, 0, 0, 0, 0, alpha}
		m.Channels[0].FullScale, m.Channels[0].Operators = 1, [][]complex128{ladderX, ladderY}
		m.Ends = "window"
		_, got, _, err := m.Figures(context.Background())
		if err != nil {
			t.Fatal(err)
		}
		if !(math.Abs(got.Infidelity/c.infidelity-1) <= 2e-4) || !(math.Abs(got.Leakage/c.leakage-1) <= 2e-3) {
			t.Errorf("correction %g: infidelity %.5g and leakage %.4g, want %.4g and %.3g", c.correct, got.Infidelity, got.Leakage, c.infidelity, c.leakage)
		}
	}
}

// The infidelity keeps its digits far below the rounding of 1, and agrees with its definition (Pedersen, Moeller, Moelmer 2007, Phys. Lett. A 367, 47) where
// that has any.
func TestFigures(t *testing.T) {
	m := spinModel(1, rotation(math.Pi/2, 0), make([]complex128, 4))
	e := newTestEngine(t, m)
	l := e.labours[0]
	for _, eps := range []float64{1e-3, 1e-7, 1e-12} {
		// exp(-i (pi/2 + eps)/2 X): 1 - F = (2/3) sin^2(eps/2)
		got := e.figuresOf(l, product(rotation(eps, 0.3), rotation(math.Pi/2, 0))).Infidelity
		want := 2. / 3 * math.Pow(math.Sin(eps/2), 2)
		if !(math.Abs(got/want-1) <= 4e-16/eps+1e-12) {
			t.Errorf("error %g: infidelity %.12g, want %.12g", eps, got, want)
		}
	}
	if got := e.figuresOf(l, product(rotation(math.Pi, 0), rotation(math.Pi/2, 0))).Infidelity; !(math.Abs(got-2./3) <= 1e-15) {
		t.Errorf("infidelity %.17g of an orthogonal gate, want 2/3", got)
	}
	// A random unitary of three levels, by a random drive, against the definition.
	r := rand.New(rand.NewPCG(8, 9))
	op := func() []complex128 {
		a := make([]complex128, 9)
		for i := range 3 {
			a[4*i] = complex(r.NormFloat64(), 0)
			for j := i + 1; j < 3; j++ {
				a[3*i+j] = complex(r.NormFloat64(), r.NormFloat64())
				a[3*j+i] = cmplx.Conj(a[3*i+j])
			}
		}
		return a
	}
	big := *m
	big.Dim, big.CodeSpace, big.Static = 3, []int{2, 0}, op()
	big.FreeZBefore, big.FreeZAfter = []float64{0.7}, []float64{-0.4}
	big.Channels = append([]Channel(nil), m.Channels...)
	big.Channels[0].Operators = [][]complex128{op(), op()}
	e = newTestEngine(t, &big)
	u := evolve(t, e, nil, 0)
	got := e.figuresOf(e.labours[0], u)
	z := func(a float64) []complex128 { return []complex128{cmplx.Rect(1, -a/2), 0, 0, cmplx.Rect(1, a/2)} }
	block := product(z(-0.4), product([]complex128{u[8], u[6], u[2], u[0]}, z(0.7)))
	w := product(adjoint(big.Target), block)
	mm := product(adjoint(block), block)
	tr := real(mm[0] + mm[3])
	want := 1 - (tr+square(w[0]+w[3]))/6
	if !(math.Abs(got.Infidelity-want) <= 1e-13) || !(math.Abs(got.Leakage-(1-tr/2)) <= 1e-13) {
		t.Errorf("figures %.15g, %.15g; by definition %.15g, %.15g", got.Infidelity, got.Leakage, want, 1-tr/2)
	}
}

func TestNoAllocation(t *testing.T) {
	e := newTestEngine(t, rackB(cosine(24, 112)))
	l, p, u := e.labours[0], newStatic(halfZ, 2), make([]complex128, 4)
	if n := testing.AllocsPerRun(10, func() { l.integrate(e.plans[0], p, 0.01, u); e.figuresOf(l, e.ended(l, u)) }); n != 0 {
		t.Errorf("%v allocations a gate", n)
	}
}

// The same bits whatever the number of goroutines.
func TestDeterminism(t *testing.T) {
	m := rackB(cosine(24, 112))
	m.Errors = []Class{{Name: "any", Kind: "any"}}
	var first *Verdict
	for _, procs := range []int{1, 2, 5} {
		old := runtime.GOMAXPROCS(procs)
		v, err := m.Judge(context.Background(), 1e-4)
		runtime.GOMAXPROCS(old)
		if err != nil {
			t.Fatal(err)
		}
		if first == nil {
			first = v
		} else if !reflect.DeepEqual(v, first) {
			t.Errorf("%d processors: another verdict", procs)
		}
	}
}

func TestCancelled(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := rackB(cosine(24, 112)).Judge(ctx, 1e-4); err != context.Canceled {
		t.Errorf("a cancelled context gives %v", err)
	}
}

func BenchmarkGate(b *testing.B) {
	e := newTestEngine(b, rackB(cosine(112, 112)))
	l, p := e.labours[0], newStatic(halfZ, 2)
	u := make([]complex128, 4)
	for b.Loop() {
		l.integrate(e.plans[0], p, 0.01, u)
	}
}

func BenchmarkJudge(b *testing.B) {
	m := rackB(cosine(112, 112))
	m.Errors = []Class{{Name: "any", Kind: "any"}}
	for b.Loop() {
		if _, err := m.Judge(context.Background(), 1e-4); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkEngine(b *testing.B) {
	m := rackB(cosine(112, 112))
	for b.Loop() {
		newTestEngine(b, m)
	}
}

// Fields that are added to the Hamiltonian, by the closed form of a square pi pulse: X of rate d is an amplitude error.
func TestAgainst(t *testing.T) {
	m := composite(plain)
	const d = 0.004
	got, err := m.Against(context.Background(), [][]complex128{make([]complex128, 4), {0, d / 2, d / 2, 0}, {1, -d / 2, -d / 2, 1}})
	if err != nil {
		t.Fatal(err)
	}
	want := 2. / 3 * math.Pow(math.Sin(15*d), 2)
	if !(got[0] <= 1e-26) || !(math.Abs(got[1]/want-1) <= 1e-9) || !(math.Abs(got[2]/want-1) <= 1e-9) {
		t.Errorf("infidelities %v, want 0 and twice %g", got, want)
	}
}
