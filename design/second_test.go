package design

import (
	"math"
	"testing"

	"holdfast/design/dynamics"
	"holdfast/design/robust"
)

// secondTime is the shortest X(pi), in units of pi over the largest drive, that was found held against a
// detuning to second order with 192 constant pieces.
const secondTime = 4.285

// exponent gives the power of a detuning with which the infidelity of a pulse grows, from
// two detunings as shares of the largest drive.
func exponent(t *testing.T, in Inputs, p *Pulse, small, large float64) (power, loss float64) {
	t.Helper()
	q, err := newTask(in, in.Brief.Basis.Family)
	if err != nil {
		t.Fatal(err)
	}
	a, err := q.axis(claimShare, q.settled)
	if err != nil {
		t.Fatal(err)
	}
	s := q.spin
	s.Grid, s.Held = a.Grid, nil
	g := robust.NewGate(s, robust.Response{}, 0)
	u, _ := q.controls(&a, [][]complex128{p.Channels[0].Exact})
	full := length(q.spin.Axes[0])
	at := func(f float64) float64 { return g.Infidelity(u, dynamics.Vec{0, 0, f * full}, 1) }
	return math.Log(at(large)/at(small)) / math.Log(large/small), at(large)
}

// TestSecondOrder: held to second order against a detuning, the infidelity begins with its sixth power; to
// first order with its fourth.
func TestSecondOrder(t *testing.T) {
	for _, c := range []struct {
		order        string
		time         float64
		least, most  float64
		small, large float64
	}{
		{"", 7. / 3 * 1.02, 3.9, 4.1, 0.01, 0.02},
		{"order = 2", secondTime * 1.005, 5.8, 6.2, 0.03, 0.05},
	} {
		in, p := minimalInputs(t, "", "[[error]]\ndetuning = \"q1\"\n"+c.order, c.time, 20)
		if p.Status != Found {
			t.Fatalf("%q: %s", c.order, p.Summary())
		}
		power, loss := exponent(t, in, p, c.small, c.large)
		t.Logf("%q, %.3f pi: exponent %.3f, infidelity %.3g at %g of the drive", c.order, c.time, power, loss, c.large)
		if !(power >= c.least && power <= c.most) {
			t.Errorf("%q: exponent %v, want %v to %v", c.order, power, c.least, c.most)
		}
	}
}
