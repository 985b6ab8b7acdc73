package replay

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"
)

// pauli gives half the product of Pauli matrices named by one letter a site, 1 for none.
func pauli(name string) []complex128 {
	letters := map[byte][]complex128{'1': {1, 0, 0, 1}, 'X': {0, 1, 1, 0}, 'Y': {0, -1i, 1i, 0}, 'Z': {1, 0, 0, -1}}
	var list [][]complex128
	for i := range len(name) {
		list = append(list, letters[name[i]])
	}
	return scaled(kron(list), 0.5)
}

// paulis lists the names of the products over n sites that have one to so many letters.
func paulis(n, most int) []string {
	names := []string{""}
	for range n {
		var longer []string
		for _, s := range names {
			for _, c := range "1XYZ" {
				longer = append(longer, s+string(c))
			}
		}
		names = longer
	}
	var list []string
	for _, s := range names {
		k := 0
		for _, c := range s {
			if c != '1' {
				k++
			}
		}
		if k >= 1 && k <= most {
			list = append(list, s)
		}
	}
	return list
}

// classOf is a class of products of Pauli matrices, all alike.
func classOf(name string, products ...string) Class {
	c := Class{Name: name, Kind: "any", Names: products}
	for _, p := range products {
		c.Operators, c.Weights = append(c.Operators, pauli(p)), append(c.Weights, 1)
	}
	return c
}

// idle is a device of so many spins, each with a drive of full scale 40 MHz through a line that lets everything through, of n samples of
// 1 ns of silence; its target is to do nothing.
func idle(sites, n int) *Model {
	dim, inf := 1<<sites, math.Inf(1)
	m := &Model{SamplePeriod: 1, Samples: n, Bits: 14, Ends: "settled", Dim: dim, Static: make([]complex128, dim*dim), Target: make([]complex128, dim*dim)}
	setIdentity(m.Target, dim)
	for i := range dim {
		m.CodeSpace = append(m.CodeSpace, i)
	}
	for i := range sites {
		if sites > 1 {
			m.Sites = append(m.Sites, 2)
		}
		name := func(p byte) string {
			s := []byte("111111")[:sites]
			s[i] = p
			return string(s)
		}
		m.Channels = append(m.Channels, Channel{
			Name: fmt.Sprintf("q%d drive", i+1), Kind: "quadrature", FullScale: 2 * math.Pi * 0.04, Direct: 1,
			Operators: [][]complex128{pauli(name('X')), pauli(name('Y'))}, MaxShare: inf, MaxSlew: inf, RingOut: inf, Samples: make([]complex128, n),
		})
	}
	return m
}

// add gives a + f b.
func add(a []complex128, f complex128, b []complex128) []complex128 {
	c := append([]complex128(nil), a...)
	for i := range c {
		c[i] += f * b[i]
	}
	return c
}

// flip is |to><from| of two spins.
func flip(from, to int) []complex128 {
	m := make([]complex128, 16)
	m[to*4+from] = 1
	return m
}

// A free exchange of two spins, J(|01><10| + |10><01|): |01> becomes cos(Jt)|01> - i sin(Jt)|10>, and Jt = -pi/2 is an iSWAP,
// exp(i pi/4 (XX + YY)).
func TestExchange(t *testing.T) {
	const span = 40
	for _, angle := range []float64{0.3, 1.1, -math.Pi / 2} {
		m := idle(2, span)
		j := complex(angle/span, 0)
		m.Static = add(add(m.Static, j, flip(1, 2)), j, flip(2, 1))
		c, s := complex(math.Cos(angle), 0), complex(0, -math.Sin(angle))
		m.Target = []complex128{1, 0, 0, 0, 0, c, s, 0, 0, s, c, 0, 0, 0, 0, 1}
		settled, window, tail, err := m.Figures(context.Background())
		if err != nil {
			t.Fatal(err)
		}
		if !(settled.Infidelity <= 1e-25) || !(window.Infidelity <= 1e-25) || tail != 0 || settled.Leakage != 0 {
			t.Errorf("angle %g: %+v settled, %+v in the window, tail %g", angle, settled, window, tail)
		}
		if angle == -math.Pi/2 {
			m.Target = []complex128{1, 0, 0, 0, 0, 0, 1i, 0, 0, 1i, 0, 0, 0, 0, 0, 1}
			if settled, _, _, err = m.Figures(context.Background()); err != nil || !(settled.Infidelity <= 1e-25) {
				t.Errorf("iSWAP: %+v, %v", settled, err)
			}
		}
	}
}

// driven fills the channels with smooth random pulses and gives them a line with a pole and a tail.
func driven(m *Model, r *rand.Rand) *Model {
	for c := range m.Channels {
		ch := &m.Channels[c]
		ch.Delay = 1.5
		ch.Direct, ch.Poles, ch.Powers = 0.1, []complex128{complex(-0.9, 0.3*r.Float64()), -0.2}, []int{1, 1}
		ch.Residues = []complex128{complex(0.8, 0.1), -0.01}
		for k := range ch.Samples {
			ch.Samples[k] = complex(1.4*r.Float64()-0.7, 1.4*r.Float64()-0.7)
		}
	}
	m.WindowStart = 1.5
	return m
}

// hermitian is a random Hermitian matrix of a size.
func hermitian(r *rand.Rand, n int, size float64) []complex128 {
	a := make([]complex128, n*n)
	for i := range n {
		a[i*n+i] = complex(size*r.NormFloat64(), 0)
		for j := i + 1; j < n; j++ {
			a[i*n+j] = complex(size*r.NormFloat64(), size*r.NormFloat64())
			a[j*n+i] = cmplx.Conj(a[i*n+j])
		}
	}
	return a
}

// turningModel is a short pulse on two spins, or a spin and a ladder of three levels, with everything that turns by itself.
func turningModel(r *rand.Rand, dim int) *Model {
	m := idle(2, 7)
	if dim == 6 {
		m.Dim, m.Sites, m.CodeSpace = 6, []int{2, 3}, []int{0, 1, 3, 4}
		m.Static = make([]complex128, 36)
		for c := range m.Channels {
			m.Channels[c].Operators = [][]complex128{hermitian(r, 6, 0.4), hermitian(r, 6, 0.4)}
		}
	}
	driven(m, r)
	m.Static = hermitian(r, dim, 0.02)
	for i := range 2 {
		m.Rotating = append(m.Rotating, Rotating{0.3 + float64(i) + r.Float64(), hermitian(r, dim, 0.02), hermitian(r, dim, 0.02)})
	}
	m.Channels[0].Paths = []Path{{0.9, [][]complex128{hermitian(r, dim, 0.2), hermitian(r, dim, 0.2)}}, {-2.1, [][]complex128{hermitian(r, dim, 0.1), hermitian(r, dim, 0.1)}}}
	one := hermitian(r, dim, 0.3)
	m.Channels = append(m.Channels, Channel{
		Name: "bias", Kind: "baseband", FullScale: 0.2, Delay: 1.25, Direct: 1, Operators: [][]complex128{one}, MaxShare: 1, MaxSlew: math.Inf(1),
		RingOut: math.Inf(1), Samples: make([]complex128, 7),
		Paths: []Path{{1.3, [][]complex128{hermitian(r, dim, 0.2)}}, {-0.4, [][]complex128{hermitian(r, dim, 0.1), hermitian(r, dim, 0.1)}}},
	})
	for k := range m.Channels[2].Samples {
		m.Channels[2].Samples[k] = complex(r.Float64()-0.5, 0)
	}
	m.Errors = []Class{
		{Name: "slope", Kind: "line", Channels: []string{"q1 drive"}, Direct: 0.2, Poles: []complex128{-1, -1}, Powers: []int{1, 2}, Residues: []complex128{0.6, -0.4}},
		{Name: "onto the other", Kind: "crosstalk", Channels: []string{"q1 drive"}, Operators: [][]complex128{hermitian(r, dim, 0.6), hermitian(r, dim, 0.6)}},
		{Name: "of the bias", Kind: "crosstalk", Channels: []string{"bias"}, Operators: [][]complex128{hermitian(r, dim, 0.6)}},
	}
	return m
}

// What turns by itself, paths of both kinds of channel and every error on top against the definitions, for two spins and with a ladder.
func TestTurningDrives(t *testing.T) {
	r := rand.New(rand.NewPCG(21, 22))
	worst := 0.0
	for i := range 16 {
		m := turningModel(r, 4+2*(i&1))
		e := newTestEngine(t, m)
		lambda := 0.2 * (r.Float64() + 0.1)
		var p *probe
		var w wrong
		switch i / 2 {
		case 0:
		case 1:
			p, w.i, w.q = e.newAmplitude(nil, ""), lambda, lambda
		case 2: // the bias has no second quadrature and would be left out
			m.Channels, m.Errors = m.Channels[:2], m.Errors[:2]
			e = newTestEngine(t, m)
			p, w.i = e.newAmplitude(nil, "I"), lambda
		case 3:
			p, w.q = e.newAmplitude(nil, "Q"), lambda
		case 4:
			p, w.skew = e.newSkew(nil), lambda
		case 5:
			p, w.line, w.lambda = e.newLineError(&m.Errors[0]), &m.Errors[0], lambda
		case 6:
			k := 1 + i&1
			p, w.cross, w.lambda = e.newCrosstalk(&m.Errors[k]), &m.Errors[k], lambda
		case 7:
			w.static = hermitian(r, m.Dim, 0.05)
			p, lambda = newStatic(w.static, m.Dim), 1
		}
		want := slowlyFrom(m, m.WindowStart, m.Samples*32, m.SamplePeriod/32, w)
		got := apart(evolve(t, e, p, lambda), want, m.Dim) // the reference keeps the traces, which turn a phase
		worst = math.Max(worst, got)
		if !(got <= 2e-9) { // what the reference is good for
			t.Errorf("case %d of %d levels: off by %.2g", i/2, m.Dim, got)
		}
	}
	t.Logf("worst %.2g", worst)
}

// apart is how far two unitary matrices are apart up to a phase.
func apart(a, b []complex128, n int) float64 {
	var tr complex128
	for i := range a {
		tr += cmplx.Conj(a[i]) * b[i]
	}
	phase := tr / complex(cmplx.Abs(tr), 0)
	return distance(scaledBy(a, phase), b)
}

func scaledBy(a []complex128, f complex128) []complex128 {
	b := append([]complex128(nil), a...)
	for i := range b {
		b[i] *= f
	}
	return b
}

// Two spins of unlike frequencies in two pictures. In a frame of its own each, at 0 and delta, a drive stands still and the exchange turns,
// J(e^(i delta t)|10><01| + its conjugate). In one frame the exchange stands still, the first spin is detuned, G = delta |1><1|, and its drive
// turns, u e^(-i delta t). The two gates are the same up to exp(-i G T).
func TestOneFrame(t *testing.T) {
	const delta, j = 0.37, 0.05
	r := rand.New(rand.NewPCG(23, 24))
	own := driven(idle(2, 30), r)
	own.Rotating = []Rotating{{delta, scaledBy(add(flip(1, 2), 1, flip(2, 1)), j), scaledBy(add(scaledBy(flip(1, 2), 1i), -1i, flip(2, 1)), j)}}
	one := *own
	one.Rotating = nil
	g := []float64{0, 0, delta, delta} // |1> of the first
	one.Static = add(add(one.Static, j, flip(1, 2)), j, flip(2, 1))
	for i, v := range g {
		one.Static[i*5] += complex(v, 0)
	}
	one.Channels = append([]Channel(nil), own.Channels...)
	ch := &one.Channels[0]
	ch.Paths = []Path{{delta, ch.Operators}}
	ch.Operators = [][]complex128{make([]complex128, 16), make([]complex128, 16)}
	a, b := evolve(t, newTestEngine(t, own), nil, 0), evolve(t, newTestEngine(t, &one), nil, 0)
	for i := range 4 {
		for k := range 4 {
			a[i*4+k] *= cmplx.Rect(1, -g[i]*30)
		}
	}
	if d := apart(a, b, 4); !(d <= 1e-12) {
		t.Errorf("the two pictures differ by %.2g", d)
	}
	// It is the turning that does it: without, the gates differ.
	own.Rotating[0].Frequency = 1e-9
	if d := apart(evolve(t, newTestEngine(t, own), nil, 0), b, 4); !(d > 0.1) {
		t.Errorf("an exchange that stands still changes the gate by %.2g", d)
	}
}

// Settled ends where the undriven device turns by itself: U0(Ts <- Tend)' U(Ts <- t0) U0(start <- t0)' by the slow reference, both evolutions from
// the definitions, with drive before the window and a tail after it.
func TestSettledTurning(t *testing.T) {
	r := rand.New(rand.NewPCG(25, 26))
	m := turningModel(r, 4)
	m.Channels[2].Delay = 0.5 // a sample edge of the others
	m.WindowStart = 3.5
	for c := range 2 {
		m.Channels[c].Poles = []complex128{-0.9, -0.25}
	}
	const start, before, after, per = 0.5, 3, 120, 16
	silent := m.WithSamples(m.Samples)
	u0 := func(from float64, length int) []complex128 {
		return slowlyFrom(silent, from, length*per, 1./per, wrong{})
	}
	whole := slowlyFrom(m, start, (before+7+after)*per, 1./per, wrong{})
	n := m.Dim
	half, want := make([]complex128, n*n), make([]complex128, n*n)
	mulAdjointLeft(half, u0(3.5+7, after), whole, n)
	mulAdjointRight(want, half, u0(start, before), n)
	e := newTestEngine(t, m)
	l := e.labours[0]
	got := e.settle(l, evolve(t, e, nil, 0))
	if d := apart(got, want, n); !(d <= 1e-8) {
		t.Errorf("settled off by %.2g", d)
	}
	if d := apart(got, evolve(t, e, nil, 0), n); !(d > 0.05) {
		t.Errorf("settled and window differ by %.2g only", d)
	}
	if e.left > settledAngle {
		t.Errorf("%.2g rad left", e.left)
	}
	// Errors are judged by what becomes of the code space, from before the drive until all has settled.
	for _, ends := range []string{"settled", "window"} {
		m.Ends = ends
		e = newTestEngine(t, m)
		var f [1]float64
		if err := e.infidelities(context.Background(), []gate{{}}, f[:]); err != nil {
			t.Fatal(err)
		}
		l = e.labours[0]
		if want := e.figuresOf(l, e.ended(l, evolve(t, e, nil, 0))).Infidelity; !(math.Abs(f[0]-want) <= 1e-8) {
			t.Errorf("%s: infidelity %.10g, want %.10g", ends, f[0], want)
		}
	}
	m.Ends = "settled"
	// What is still to come counts paths too: with the channel's own operators gone they alone must settle.
	m.Channels[0].Operators = [][]complex128{make([]complex128, 16), make([]complex128, 16)}
	m.Channels[1].Samples, m.Channels[2].Samples = make([]complex128, 7), make([]complex128, 7)
	e = newTestEngine(t, m)
	tail := slowlyFrom(m, 3.5+7, after*per, 1./per, wrong{})
	mulAdjointLeft(want, u0(3.5+7, after), tail, n)
	setIdentity(half, n)
	if d := apart(e.post, want, n); !(d <= 1e-8) || !(apart(want, half, n) > 1e-3) {
		t.Errorf("the paths' tail is off by %.2g", d)
	}
}

// The same of one spin, whose kernel is another: a term that turns by itself, on the axis of the drive and across it, in the window, in what comes after it, and in
// the frame that this is seen from.
func TestSpinTurning(t *testing.T) {
	for _, axes := range [][2][]complex128{{halfX, halfY}, {halfX, halfZ}, {halfZ, halfY}} {
		m := rackB(cosine(12, 16))
		m.Channels[0].Poles[2], m.Channels[0].Residues[2] = -0.2, m.Channels[0].Residues[2]*20
		m.WindowStart = 5.2 // two samples after the first arrives
		m.Rotating = []Rotating{{0.8, scaled(axes[0], 0.05), scaled(axes[1], 0.03)}}
		m.Channels[0].Paths = []Path{{-0.3, [][]complex128{scaled(axes[0], 0.2), scaled(axes[1], 0.4)}}}
		const per, after = 16, 150
		silent := m.WithSamples(16)
		u0 := func(from float64, length int) []complex128 {
			return slowlyFrom(silent, from, length*per, 1./per, wrong{})
		}
		whole := slowlyFrom(m, 3.2, (2+16+after)*per, 1./per, wrong{})
		want := product(adjoint(u0(5.2+16, after)), product(whole, adjoint(u0(3.2, 2))))
		e := newTestEngine(t, m)
		window := evolve(t, e, nil, 0)
		if d := distance(window, slowlyFrom(m, 5.2, 16*per, 1./per, wrong{})); !(d <= 1e-9) {
			t.Errorf("window off by %.2g", d)
		}
		if d := distance(e.settle(e.labours[0], window), want); !(d <= 1e-8) || !(distance(want, window) > 1e-2) {
			t.Errorf("settled off by %.2g", d)
		}
	}
}

// The bound of the remainder covers what turns fast, slowly and strongly: plans of an eighth of the step change nothing.
func TestErrorControlTurning(t *testing.T) {
	r := rand.New(rand.NewPCG(27, 28))
	for _, w := range []float64{0.05, 40} {
		m := turningModel(r, 4)
		m.Rotating = []Rotating{{w, hermitian(r, 4, 0.3), hermitian(r, 4, 0.3)}}
		m.Channels[0].Paths[0].Frequency = -w
		m.Errors[0].Direct, m.Errors[0].Residues = 600, []complex128{900, -600} // far stronger than the line itself
		for i := range 2 {
			m.Channels[0].Operators[i] = scaled(m.Channels[0].Operators[i], 0.1)
			m.Errors[1].Operators[i] = scaled(m.Errors[1].Operators[i], 1000)
		}
		e := newTestEngine(t, m)
		ctx := context.Background()
		for _, g := range []gate{{}, {e.newSkew(nil), 0.1}, {e.newCrosstalk(&m.Errors[1]), 0.1}, {e.newAmplitude(nil, "Q"), -0.12}, {e.newLineError(&m.Errors[0]), 0.12}} {
			for _, rough := range []bool{false, true} {
				p, err := e.plan(ctx, g.p, g.lambda, rough)
				if err != nil {
					t.Fatal(err)
				}
				need := g.p.reach(0.125)
				fine := e.newWalker(g.p, 1)
				fine.step = m.SamplePeriod / 8
				if err := fine.to(ctx, e.start, reach{}, fine.newPlan()); err != nil {
					t.Fatal(err)
				}
				q := fine.newPlan()
				for fine.t < e.start+e.span-1e-9 {
					if err := fine.to(ctx, math.Min(fine.t+p.steps[0].s/8, e.start+e.span), need, q); err != nil {
						t.Fatal(err)
					}
				}
				a, b := make([]complex128, 16), make([]complex128, 16)
				e.labours[0].integrate(p, g.p, g.lambda, a)
				e.labours[0].integrate(q, g.p, g.lambda, b)
				allowed := 1e-10 // strong errors: some hundred rad, and lines whose residues nearly cancel
				if rough {
					allowed += 1e-10 * float64(len(p.steps))
				}
				if d := distance(a, b); !(d <= allowed) {
					t.Errorf("%g rad/ns, rough %v: an eighth of the step changes the gate by %.2g", w, rough, d)
				}
				if d := defect(a, 4); !(d <= allowed) {
					t.Errorf("%g rad/ns, rough %v: unitary to %.2g", w, rough, d)
				}
			}
		}
	}
}
