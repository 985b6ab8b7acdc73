package replay

import (
	"context"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"
)

// unitary is a random n x n unitary matrix: what a random Hamiltonian does.
func unitary(r *rand.Rand, n int) []complex128 { return exponential(hermitian(r, n, 1), 1) }

// label is a vector of a code space, all of it in one state.
func label(n, i int) []complex128 {
	v := make([]complex128, n)
	v[i] = 1
	return v
}

// A square pulse on the first of two spins turns it by an angle a: from |00> to |10> it misses by cos^2(a/2), whatever the phase, and so does
// the span of |00> and |01> to that of |10> and |11>, in whatever basis the targets are given. A turn of the other spin leaves that span alone.
func TestStates(t *testing.T) {
	ctx := context.Background()
	r := rand.New(rand.NewPCG(31, 32))
	for _, angle := range []float64{math.Pi, 3, 1, 0.2} {
		m := idle(2, 20)
		for k := range m.Channels[0].Samples {
			m.Channels[0].Samples[k] = cmplx.Rect(angle/20/m.Channels[0].FullScale, 0.6)
		}
		m.Target = nil
		want := math.Pow(math.Cos(angle/2), 2)
		check := func(what string) {
			t.Helper()
			settled, window, _, err := m.Figures(ctx)
			if err != nil {
				t.Fatal(err)
			}
			if !(math.Abs(settled.Infidelity-want) <= 1e-14+1e-13*want) || settled != window || settled.Leakage != 0 {
				t.Errorf("angle %g, %s: %v, want %v", angle, what, settled, want)
			}
		}
		m.From, m.To = [][]complex128{label(4, 0)}, [][]complex128{{0, 0, cmplx.Rect(1, 1.3), 0}}
		check("one state")
		u := unitary(r, 2)
		m.From = [][]complex128{label(4, 0), label(4, 1)}
		m.To = [][]complex128{{0, 0, u[0], u[2]}, {0, 0, u[1], u[3]}}
		check("two states")
		for k := range m.Channels[1].Samples {
			m.Channels[1].Samples[k] = complex(0.3*float64(k%3), 0.1)
		}
		check("two states, the other spin turned")
		m.From, m.To = [][]complex128{label(4, 0)}, [][]complex128{label(4, 2)}
		if s, _, _, err := m.Figures(ctx); err != nil || !(s.Infidelity > want+0.01) && want < 0.9 {
			t.Errorf("angle %g: one state with the other spin turned misses by %v, %v", angle, s, err)
		}
	}
	// An exchange of a quarter takes |01> to (|01> - i|10>)/sqrt 2.
	m := idle(2, 10)
	j := complex(math.Pi/4/10, 0)
	m.Static = add(add(m.Static, j, flip(1, 2)), j, flip(2, 1))
	s := complex(math.Sqrt(0.5), 0)
	m.Target, m.From, m.To = nil, [][]complex128{label(4, 1)}, [][]complex128{{0, s, -1i * s, 0}}
	v, err := m.Judge(ctx, 1e-4)
	if err != nil || !(v.Settled.Infidelity <= 1e-29) || v.Measure != "state" {
		t.Errorf("exchange of a quarter: %+v, %v", v, err)
	}
	// With digits far below the rounding of 1, of one spin too, whose code space stands the other way round.
	for _, eps := range []float64{1e-3, 1e-8} {
		m := spinModel(1, nil, []complex128{complex((math.Pi+eps)/(2*math.Pi*0.04), 0)})
		m.CodeSpace = []int{1, 0}
		m.From, m.To = [][]complex128{{0, 1}}, [][]complex128{{1i, 0}}
		f, _, _, err := m.Figures(ctx)
		if want := math.Pow(math.Sin(eps/2), 2); err != nil || !(math.Abs(f.Infidelity/want-1) <= 1e-7) {
			t.Errorf("error %g: infidelity %.12g, want %.12g, %v", eps, f.Infidelity, want, err)
		}
	}
}

// Three levels with drive between the last two: what it takes out of |1> is leakage, sin^2(a/2), all of it for the state |1> and half for
// the span of |0> and |1>.
func TestStatesLeak(t *testing.T) {
	const angle = 0.8
	x := make([]complex128, 10)
	for k := range x {
		x[k] = complex(angle/10/(2*math.Pi*0.04), 0)
	}
	m := spinModel(1, nil, x)
	m.Dim, m.Static = 3, make([]complex128, 9)
	m.Channels[0].Operators = [][]complex128{{0, 0, 0, 0, 0, 0.5, 0, 0.5, 0}, {0, 0, 0, 0, 0, -0.5i, 0, 0.5i, 0}}
	full := math.Pow(math.Sin(angle/2), 2)
	for _, c := range []struct {
		from [][]complex128
		want float64
	}{{[][]complex128{{0, 1}}, full}, {[][]complex128{{1, 0}, {0, 1}}, full / 2}, {[][]complex128{{1, 0}}, 0}} {
		m.From, m.To = c.from, c.from
		f, _, _, err := m.Figures(context.Background())
		if err != nil || !(math.Abs(f.Infidelity-c.want) <= 1e-14) || !(math.Abs(f.Leakage-c.want) <= 1e-14) {
			t.Errorf("%d states: %+v, want %g, %v", len(c.from), f, c.want, err)
		}
	}
}

// A gate is right up to local rotations when what it does stands between them, the first site's slowest; and it is not without them, nor with the
// sites' or the sides exchanged.
func TestLocalRotations(t *testing.T) {
	r := rand.New(rand.NewPCG(33, 34))
	m := idle(2, 12)
	for i := range m.Static {
		m.Static[i] = 0.05 * (pauli("XX")[i] + pauli("YY")[i] + 0.3*pauli("ZZ")[i])
	}
	u := evolve(t, newTestEngine(t, m), nil, 0)
	var before, after [][]complex128
	for range 2 {
		before, after = append(before, unitary(r, 2)), append(after, unitary(r, 2))
	}
	half := make([]complex128, 16)
	mul(half, u, kron(before), 4)
	m.Target = make([]complex128, 16)
	mul(m.Target, kron(after), half, 4)
	swapped := func(l [][]complex128) [][]complex128 { return [][]complex128{l[1], l[0]} }
	for _, c := range []struct {
		name          string
		before, after [][]complex128
		right         bool
	}{
		{"as they are", before, after, true}, {"none", nil, nil, false}, {"sides exchanged", after, before, false},
		{"sites exchanged before", swapped(before), after, false}, {"sites exchanged after", before, swapped(after), false},
	} {
		m.LocalBefore, m.LocalAfter = c.before, c.after
		if err := m.Validate(); err != nil {
			t.Fatal(err)
		}
		f, _, _, err := m.Figures(context.Background())
		if err != nil || (f.Infidelity <= 1e-25) != c.right || !c.right && f.Infidelity < 0.1 {
			t.Errorf("%s: %+v, %v", c.name, f, err)
		}
	}
	// Against the definition of the average infidelity, with a code space in a larger one.
	m = idle(2, 12)
	m.Dim, m.Sites, m.CodeSpace, m.Static = 6, []int{2, 3}, []int{0, 1, 3, 4}, hermitian(r, 6, 0.1)
	for c := range m.Channels {
		m.Channels[c].Operators = [][]complex128{hermitian(r, 6, 0.1), hermitian(r, 6, 0.1)}
	}
	m.Target, m.LocalBefore, m.LocalAfter = unitary(r, 4), before, after
	e := newTestEngine(t, m)
	u = evolve(t, e, nil, 0)
	block := make([]complex128, 16)
	for i, a := range m.CodeSpace {
		for j, b := range m.CodeSpace {
			block[i*4+j] = u[a*6+b]
		}
	}
	moved, w, mm := make([]complex128, 16), make([]complex128, 16), make([]complex128, 16)
	mul(half, block, kron(before), 4)
	mul(moved, kron(after), half, 4)
	mulAdjointLeft(w, m.Target, moved, 4)
	mulAdjointLeft(mm, moved, moved, 4)
	trace := func(a []complex128) complex128 { return a[0] + a[5] + a[10] + a[15] }
	want := 1 - (real(trace(mm))+square(trace(w)))/20
	got := e.figuresOf(e.labours[0], u)
	if !(math.Abs(got.Infidelity-want) <= 1e-13) || !(math.Abs(got.Leakage-(1-real(trace(mm))/4)) <= 1e-13) || !(got.Leakage > 0.01) {
		t.Errorf("figures %+v, want %.15g and %.15g", got, want, 1-real(trace(mm))/4)
	}
}

// The terms that a model leaves out: an exchange that turns at delta in the frames of two idle spins takes from |01> to |10> with probability
// (2J)^2/W^2 sin^2(W T/2), W^2 = delta^2 + 4 J^2, and turns the phases of both (Bloch and Siegert 1940, Phys. Rev. 57, 522, for a driven spin; the closed
// form is Rabi's). Terms that the model has stay.
func TestDropped(t *testing.T) {
	ctx := context.Background()
	const delta, j, span = 0.7, 0.03, 60
	m := idle(2, span)
	x, y := add(flip(1, 2), 1, flip(2, 1)), add(scaledBy(flip(1, 2), 1i), -1i, flip(2, 1))
	m.Dropped = []Rotating{{delta, scaledBy(x, j), scaledBy(y, j)}}
	v, err := m.Judge(ctx, 1e-4)
	if err != nil {
		t.Fatal(err)
	}
	w := math.Hypot(delta, 2*j)
	// In one frame H = delta/2 (|10><10| - |01><01|) + J X of the pair; back in the frames of each, e^(i delta T/2) on |10>.
	c, s := math.Cos(w*span/2), math.Sin(w*span/2)
	diagonal := complex(c, -s*delta/w) * cmplx.Rect(1, delta*span/2) // of |10>; that of |01> is its conjugate
	trace := 2 + 2*real(diagonal)
	want := 1 - (4+trace*trace)/20
	if v.Dropped == nil || !(math.Abs(v.Dropped.Infidelity-want) <= 1e-9) || !(want > 1e-3) || v.Dropped.Leakage != 0 {
		t.Fatalf("with the terms put back %+v, want %.12g", v.Dropped, want)
	}
	if v.Settled.Infidelity != 0 || len(v.Warnings) != 1 {
		t.Errorf("without them %+v, warnings %q", v.Settled, v.Warnings)
	}
	// The same as a term of the model, beside one that it keeps, which another frequency cannot hide.
	m.Rotating = []Rotating{{delta / 3, pauli("XX"), pauli("ZY")}, {2 * delta, pauli("1Y"), pauli("XZ")}}
	for i := range m.Rotating {
		m.Rotating[i].Cosine, m.Rotating[i].Sine = scaledBy(m.Rotating[i].Cosine, 0.01), scaledBy(m.Rotating[i].Sine, 0.01)
	}
	v, err = m.Judge(ctx, 1)
	if err != nil {
		t.Fatal(err)
	}
	full := *m
	full.Rotating, full.Dropped = []Rotating{m.Rotating[0], m.Dropped[0], m.Rotating[1]}, nil
	settled, _, _, err := full.Figures(ctx)
	if err != nil || !(math.Abs(v.Dropped.Infidelity-settled.Infidelity) <= 1e-9) || !(math.Abs(v.Dropped.Infidelity-v.Settled.Infidelity) > 1e-4) {
		t.Errorf("put back %+v, as terms of the model %+v, without %+v, %v", v.Dropped, settled, v.Settled, err)
	}
	if err := m.WithDropped().Validate(); err != nil {
		t.Error(err)
	}
	// Too fast to be integrated: said, and not judged.
	m.Dropped[0].Frequency = 9e4
	if v, err = m.Judge(ctx, 1); err != nil || v.Dropped != nil || len(v.Warnings) != 2 {
		t.Errorf("too fast: %+v, %v, %v", v.Dropped, v.Warnings, err)
	}
	m.Ends, m.Dropped[0].Frequency = "window", delta
	m.Channels[0].Samples[span-1], m.Channels[0].Poles, m.Channels[0].Powers, m.Channels[0].Residues = 0.5, []complex128{-0.1}, []int{1}, []complex128{0.1}
	if v, err = m.Judge(ctx, 1); err != nil {
		t.Fatal(err)
	}
	_, window, _, err := m.WithDropped().Figures(ctx)
	if err != nil || !(math.Abs(v.Dropped.Infidelity-window.Infidelity) <= 1e-9) {
		t.Errorf("window ends: %+v, want %+v, %v", v.Dropped, window, err)
	}
}

// Decoherence of several sites against exact channels: amplitude damping and dephasing have Kraus operators diag(1, sqrt(1-g)), sqrt(g)|0><1| and,
// with probability p, Z; F_avg = (d F_e + 1)/(d + 1) with F_e the product over sites of sum |Tr K|^2/4 (Horodecki 1999, Phys. Rev. A 60, 1888).
func TestDecoherenceOfSites(t *testing.T) {
	const span = 200.0
	for _, sites := range [][]Decay{{{"q1", 60e6, 40e6}}, {{"q1", 60e6, 40e6}, {"q2", 90e6, 0}}, {{"q1", 60e6, 40e6}, {"q3", 0, 70e6}, {"q2", 90e6, 180e6}}} {
		n := len(sites)
		m := idle(n, int(span))
		f := &Folder{Model: m, Decay: sites}
		fe := 1.0
		for _, s := range sites {
			gamma, t2 := 0.0, s.T2
			if s.T1 > 0 {
				gamma = 1 - math.Exp(-span/s.T1)
				if t2 == 0 {
					t2 = 2 * s.T1
				}
			}
			rate := 1 / t2 // of pure dephasing
			if s.T1 > 0 {
				rate -= 1 / (2 * s.T1)
			}
			p := (1 - math.Exp(-span*rate)) / 2
			one := math.Pow(1+math.Sqrt(1-gamma), 2) / 4
			z := math.Pow(1-math.Sqrt(1-gamma), 2) / 4
			fe *= (1-p)*one + p*z
		}
		d := float64(m.Dim)
		want := 1 - (d*fe+1)/(d+1)
		if got := f.Decoherence(); !(math.Abs(got/want-1) <= 2e-5) {
			t.Errorf("%d sites: %.10g, exact channels %.10g", n, got, want)
		}
	}
	f := &Folder{Model: idle(1, 112), Decay: []Decay{{"q1", 60e3, 40e3}}}
	if got, want := f.Decoherence(), Decoherence(112, 60e3, 40e3); got != want {
		t.Errorf("one spin: %.17g, want %.17g", got, want)
	}
}
