package replay

import (
	"context"
	"math"
	"math/cmplx"
	"testing"
)

// join plays samples one after another, each list times its phase.
func join(x []complex128, turns ...complex128) []complex128 {
	var y []complex128
	for _, f := range turns {
		for _, v := range x {
			y = append(y, f*v)
		}
	}
	return y
}

// The pair as one long pulse against the square of the target, with lines of which one is worst at phase zero and the other elsewhere.
func TestPair(t *testing.T) {
	ctx := context.Background()
	elsewhere := 0
	for _, tail := range []complex128{-0.1, -0.03} {
		m := rackB(cosine(24, 32))
		m.Channels[0].Poles[2] = tail
		got, err := m.Pair(ctx)
		if err != nil {
			t.Fatal(err)
		}
		window := *m
		window.Ends = "window"
		if same, err := window.Pair(ctx); err != nil || same != got {
			t.Errorf("with window ends the pair is %v, %v; want %v", same, err, got)
		}
		var at [4]float64
		worst := 0.0
		for quarter := range at {
			phi := float64(quarter) * math.Pi / 2
			long := m.WithSamples(64, join(m.Channels[0].Samples, 1, cmplx.Rect(1, phi)))
			long.Target = product(rotation(math.Pi/2, phi), rotation(math.Pi/2, 0))
			f, _, _, err := long.Figures(ctx)
			if err != nil {
				t.Fatal(err)
			}
			at[quarter] = f.Infidelity
			worst = math.Max(worst, f.Infidelity)
		}
		if !(math.Abs(got.Infidelity/worst-1) <= 1e-6) {
			t.Errorf("tail %g: pair %v, want %v", real(tail), got, worst)
		}
		if quarter := int(got.Phase / 90); got.Phase != 90*float64(quarter) || !(math.Abs(at[quarter]/worst-1) <= 1e-6) { // two phases may do equally badly
			t.Errorf("tail %g: worst at %g degrees, want one of the worst of %v", real(tail), got.Phase, at)
		}
		if !(worst > 1e-5) {
			t.Errorf("tail %g: the pair shows no memory: %g", real(tail), worst)
		}
		if worst > 1.01*at[0] {
			elsewhere++
		}
	}
	if elsewhere != 1 {
		t.Errorf("%d of the lines are worst at another phase than zero, want 1", elsewhere)
	}
}

// Without memory the pair and the repeats are exact, whichever way the mixer turns, with free frames and with a detuning of the frame.
func TestSequencesWithoutMemory(t *testing.T) {
	ctx := context.Background()
	for _, c := range []struct {
		name          string
		minusY        bool
		before, after float64
	}{{"plain", false, 0, 0}, {"other mixing", true, 0, 0}, {"frames", false, 0.4, -1.1}, {"frames, other mixing", true, 0.4, 0.3}} {
		x := join([]complex128{cmplx.Rect(0.5, 0.7)}, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1)
		m := spinModel(1, nil, x)
		phase := 0.7
		if c.minusY {
			minus := make([]complex128, 4)
			for i, v := range halfY {
				minus[i] = -v
			}
			m.Channels[0].Operators = [][]complex128{halfX, minus}
			phase = -0.7
		}
		m.Channels[0].FullScale = math.Pi / 10 // half of it for 10 ns: a quarter turn
		m.FreeZBefore, m.FreeZAfter = []float64{c.before}, []float64{c.after}
		m.Target = product(rotationZ(c.after), product(rotation(math.Pi/2, phase), rotationZ(c.before)))
		f, w, _, err := m.Figures(ctx)
		if err != nil {
			t.Fatal(err)
		}
		if !(f.Infidelity <= 1e-26) || !(w.Infidelity <= 1e-26) {
			t.Errorf("%s: infidelity %.2g settled, %.2g in the window", c.name, f.Infidelity, w.Infidelity)
		}
		p, err := m.Pair(ctx)
		if err != nil {
			t.Fatal(err)
		}
		if !(p.Infidelity <= 1e-25) {
			t.Errorf("%s: pair %v", c.name, p)
		}
		e := newTestEngine(t, m)
		b, err := e.bringUp(ctx)
		if err != nil {
			t.Fatal(err)
		}
		total := []complex128{1, 0, 0, 1}
		if len(b.Repeats) != 32 {
			t.Fatalf("%s: %d repeats", c.name, len(b.Repeats))
		}
		for n, got := range b.Repeats {
			total = product(m.Target, total)
			if want := square(total[2]); !(math.Abs(got.One-want) <= 1e-12) || got.Value != float64(n+1) {
				t.Errorf("%s: %d repeats give %.12g, want %.12g", c.name, n+1, got.One, want)
			}
		}
	}
}

func rotationZ(a float64) []complex128 {
	return []complex128{cmplx.Rect(1, -a/2), 0, 0, cmplx.Rect(1, a/2)}
}

// Populations with memory: repeats as one long pulse, amplitude and detuning by the closed form of a square pulse.
func TestBringUp(t *testing.T) {
	ctx := context.Background()
	m := rackB(cosine(16, 16))
	m.Channels[0].GuardTrail = 0
	for _, ends := range []string{"settled", "window"} {
		for _, early := range []float64{0, 2, -1.5} {
			m.Ends, m.WindowStart = ends, 3.2+early
			b, err := newTestEngine(t, m).bringUp(ctx)
			if err != nil {
				t.Fatal(err)
			}
			for _, n := range []int{1, 2, 7, 32} {
				turns := make([]complex128, n)
				for i := range turns {
					turns[i] = 1
				}
				long := m.WithSamples(16*n, join(m.Channels[0].Samples, turns...))
				e := newTestEngine(t, long)
				u := evolve(t, e, nil, 0)
				want := square(e.ended(e.labours[0], u)[2])
				if got := b.Repeats[n-1]; !(math.Abs(got.One-want) <= 1e-11) {
					t.Errorf("%s, %g ns early: %d repeats give %.12g, want %.12g", ends, early, n, got.One, want)
				}
			}
		}
	}
	b, err := newTestEngine(t, composite(plain)).bringUp(ctx)
	if err != nil {
		t.Fatal(err)
	}
	for _, p := range b.Amplitude {
		if want := math.Pow(math.Sin(math.Pi/2*p.Value), 2); !(math.Abs(p.One-want) <= 1e-12) {
			t.Errorf("amplitude %g: %.12g, want %.12g", p.Value, p.One, want)
		}
	}
	if n := len(b.Amplitude); n != 21 || b.Amplitude[0].Value != 0.9 || b.Amplitude[20].Value != 1.1 {
		t.Errorf("amplitude table of %d", n)
	}
	for _, p := range b.Detuning {
		w := math.Hypot(math.Pi/30, 2*math.Pi*1e-3*p.Value)
		if want := math.Pow(math.Pi/30/w*math.Sin(w*15), 2); !(math.Abs(p.One-want) <= 1e-12) {
			t.Errorf("detuning %g MHz: %.12g, want %.12g", p.Value, p.One, want)
		}
	}
	if n := len(b.Detuning); n != 41 || b.Detuning[0].Value != -5 || b.Detuning[40].Value != 5 {
		t.Errorf("detuning table of %d", n)
	}
}

// A static part that no turn of the frame leaves alone: one phase, and a warning.
func TestNoTurn(t *testing.T) {
	m := rackB(cosine(24, 32))
	m.Static = []complex128{0, 0.001, 0.001, 0}
	v, err := m.Judge(context.Background(), 1e-4)
	if err != nil {
		t.Fatal(err)
	}
	if len(v.Warnings) != 1 || v.Pair.Phase != 0 || !(v.Pair.Infidelity > 0) {
		t.Errorf("warnings %q, pair %v", v.Warnings, v.Pair)
	}
	m.FreeZAfter = []float64{0.3}
	if v, err = m.Judge(context.Background(), 1e-4); err != nil || len(v.Warnings) != 1 || !math.IsNaN(v.Pair.Infidelity) {
		t.Errorf("free frames: %v, warnings %q", err, v.Warnings)
	}
	// A shift about X is no friend of the frame either, and one about Z is.
	m = rackB(cosine(24, 32))
	for want, op := range map[int][]complex128{1: halfX, 0: halfZ} {
		m.Channels[0].Shift, m.Channels[0].ShiftOperator = 0.01, op
		if v, err = m.Judge(context.Background(), 1e-4); err != nil || len(v.Warnings) != want {
			t.Errorf("a shift about %v: %v, warnings %q", op, err, v.Warnings)
		}
	}
	// A ladder turns by its number of quanta.
	s := complex(math.Sqrt2/2, 0)
	m = rackB(cosine(24, 32))
	m.Dim, m.Static = 3, []complex128{0, 0, 0, 0, 0, 0, 0, 0, -1}
	m.Channels[0].Operators = [][]complex128{{0, 0.5, 0, 0.5, 0, s, 0, s, 0}, {0, -0.5i, 0, 0.5i, 0, -1i * s, 0, 1i * s, 0}}
	g, err := newTestEngine(t, m).turn()
	if err != nil || !(math.Abs(g[0]-1) <= 1e-12) || !(math.Abs(g[1]) <= 1e-12) || !(math.Abs(g[2]+1) <= 1e-12) {
		t.Errorf("a ladder turns by %v, %v", g, err)
	}
}

// Two spins, each turned by its own channel, alike in both windows: the pair is exact, with the same free angle on both sites too, whichever phase all drives
// have. Where sites have unlike angles, where local rotations are free, where the Hamiltonian turns by itself and where states are the target it is not judged.
func TestPairOfSites(t *testing.T) {
	ctx := context.Background()
	model := func() *Model {
		m := idle(2, 10)
		for c := range 2 {
			for k := range m.Samples {
				m.Channels[c].Samples[k] = cmplx.Rect(0.3+0.2*float64(c), 0.4*float64(c)+0.1*float64(k%3))
			}
		}
		for i := range m.Static { // an exchange and a coupling of the Z parts, which turn of both together leaves alone
			m.Static[i] = 0.02 * (pauli("XX")[i] + pauli("YY")[i] + 2*pauli("ZZ")[i])
		}
		return m
	}
	m := model()
	u := evolve(t, newTestEngine(t, m), nil, 0)
	z := kron([][]complex128{rotationZ(0.7), rotationZ(0.7)})
	for i := range 4 {
		for j := range 4 {
			m.Target[i*4+j] = z[i*5] * u[i*4+j]
		}
	}
	m.FreeZAfter = []float64{0.7, 0.7}
	p, err := m.Pair(ctx)
	if err != nil || !(p.Infidelity <= 1e-24) {
		t.Errorf("the same angle on both: %v, %v", p, err)
	}
	if w := m.Target; distance(w, u) < 0.1 {
		t.Error("the angle does nothing")
	}
	warned := func(m *Model, want error) {
		t.Helper()
		m.Errors = []Class{{Name: "amplitude", Kind: "amplitude"}}
		if _, err := m.Pair(ctx); err != want {
			t.Errorf("%v, want %v", err, want)
		}
		v, err := m.Judge(ctx, 1e-4)
		if err != nil || len(v.Warnings) != 1 || v.Warnings[0] != sentence(want) || !math.IsNaN(v.Pair.Infidelity) {
			t.Errorf("%v, warnings %q, pair %v; want %v", err, v.Warnings, v.Pair, want)
		}
	}
	m.FreeZAfter[1] = 0.6
	warned(m, errNoFrame)
	m = model()
	m.LocalBefore, m.LocalAfter = [][]complex128{unit(2), unit(2)}, [][]complex128{unit(2), unit(2)}
	warned(m, errNoFollow)
	m = model()
	m.Rotating = []Rotating{{1, m.Static, m.Static}}
	warned(m, errTurning)
	m = model()
	m.Channels[1].Paths = []Path{{1, m.Channels[0].Operators}}
	warned(m, errTurning)
	m = model()
	m.Target, m.From, m.To = nil, [][]complex128{label(4, 0)}, [][]complex128{label(4, 0)}
	warned(m, errNoSquare)
	// A spin that turns by itself, or of which states are asked, has its tables still; repeats only where they can follow.
	one := composite(plain)
	one.Target, one.From, one.To = nil, [][]complex128{{1, 0}}, [][]complex128{{0, 1}}
	v, err := one.Judge(ctx, 1e-4)
	if err != nil || !(v.Settled.Infidelity <= 1e-26) || len(v.BringUp.Amplitude) != 21 || len(v.BringUp.Repeats) != repeats {
		t.Errorf("%+v, %v", v.Settled, err)
	}
	one.Rotating = []Rotating{{0.5, halfX, halfY}}
	if v, err = one.Judge(ctx, 1e-4); err != nil || len(v.BringUp.Amplitude) != 21 || len(v.BringUp.Repeats) != 0 {
		t.Errorf("%d, %d rows, %v", len(v.BringUp.Amplitude), len(v.BringUp.Repeats), err)
	}
}
