package design

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"

	"holdfast/design/dynamics"
	"holdfast/design/replay"
	"holdfast/design/robust"
	"holdfast/filter"
)

// TestWitness drives a spin with 50 random pulses through random lines and
// compares the gate that dynamics finds on design's grid with that of replay's
// integrator, which shares no numerics with it, for both ends and with a static
// Hamiltonian in half of them.
func TestWitness(t *testing.T) {
	rng := rand.New(rand.NewPCG(50, 1))
	worst := 0.0
	for trial := range 50 {
		sections := []filter.Line{}
		low, err := filter.Bessel(1+rng.IntN(4), 0.1+0.3*rng.Float64())
		if err != nil {
			t.Fatal(err)
		}
		tails, err := filter.Tails([]filter.Tail{{Amplitude: 0.06*rng.Float64() - 0.03, Time: 10 + 40*rng.Float64()}})
		if err != nil {
			t.Fatal(err)
		}
		sections = append(sections, low, tails)
		line, err := filter.Cascade(sections...)
		if err != nil {
			t.Fatal(err)
		}
		const n, h, full = 24, 1.0, 0.25
		x := make([]complex128, n)
		for k := range x {
			x[k] = complex(rng.Float64()-0.5, rng.Float64()-0.5) * 1.4
		}
		static := 0.0
		if trial%2 == 1 {
			static = 0.2 * (rng.Float64() - 0.5)
		}
		// the target is the identity: the infidelity is far from zero and tests all of U
		m := &replay.Model{
			SamplePeriod: h, Samples: n, Bits: 14, Ends: "settled", WindowStart: 3.2, Dim: 2, CodeSpace: []int{0, 1},
			Static: []complex128{complex(static/2, 0), 0, 0, complex(-static/2, 0)}, Target: []complex128{1, 0, 0, 1},
			Channels: []replay.Channel{{
				Name: "drive", Kind: "quadrature", FullScale: full, Delay: 3.2, Direct: line.Direct,
				Operators: [][]complex128{{0, 0.5, 0.5, 0}, {0, -0.5i, 0.5i, 0}},
				MaxShare:  1, MaxSlew: math.Inf(1), RingOut: math.Inf(1), Samples: x,
			}},
		}
		for _, term := range line.Terms {
			c := &m.Channels[0]
			c.Poles, c.Powers, c.Residues = append(c.Poles, term.Pole), append(c.Powers, term.Power), append(c.Residues, term.Residue)
		}
		settled, window, _, err := m.Figures(context.Background())
		if err != nil {
			t.Fatal(err)
		}
		for _, ends := range []bool{true, false} {
			a, err := newAxis([]feed{{line: line}}, n, h, claimShare, ends, full, math.Abs(static), 0)
			if err != nil {
				t.Fatal(err)
			}
			s := robust.Spin{
				Grid: a.Grid, Static: dynamics.Vec{0, 0, static},
				Axes: []dynamics.Vec{{full, 0, 0}, {0, full, 0}}, Target: dynamics.One,
			}
			v := a.field(feed{line: line}, x, nil)
			u := make([]float64, 2*len(v))
			for i, z := range v {
				u[i], u[len(v)+i] = real(z), imag(z)
			}
			got := robust.NewGate(s, robust.Response{}, 0).Figures(u, nil).Infidelity
			want := window.Infidelity
			if ends {
				want = settled.Infidelity
			}
			worst = math.Max(worst, math.Abs(got-want))
			// fields here change from full to full within a sample, which no slew limit holds back:
			// ten times the largest difference seen, 1.8e-9
			if !(math.Abs(got-want) <= 2e-8) {
				t.Errorf("trial %d, settled %v: infidelity %.12f by dynamics, %.12f by replay", trial, ends, got, want)
			}
		}
	}
	t.Logf("largest difference in infidelity: %.2g", worst)
}
