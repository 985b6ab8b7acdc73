package robust

import (
	"math"
	"testing"

	"holdfast/design/dynamics"
)

// filterFunction gives |∫ R^T z e^{iwt} dt|² of a spin under pulses of full drive about X of the given
// angles, rad, of which the sign is the drive's; time in units of 1/drive. Of V = Z/2 it is four times the F of noises.
func filterFunction(t *testing.T, w float64, angles ...float64) float64 {
	t.Helper()
	s := Levels{
		Dim: 2, Code: []int{0, 1}, Static: make([]complex128, 4), Axes: [][]complex128{scaledMatrix(pauliX, 0.5)}, Target: one2,
		Held: []Class{{Name: "noise", Kind: Static, Weight: 1, Operators: [][]complex128{scaledMatrix(pauliZ, 0.5)}, Noise: []Node{{Frequency: w, Weight: 1}}}},
	}
	var u []float64
	at := 0.0
	for _, a := range angles {
		const steps = 400
		h := math.Abs(a) / steps
		for range steps {
			s.Grid.Steps = append(s.Grid.Steps, h)
			for _, g := range dynamics.GaussNodes {
				s.Grid.Times = append(s.Grid.Times, at+g*h)
				u = append(u, math.Copysign(1, a))
			}
			at += h
		}
	}
	s.Grid.Last = len(s.Grid.Steps)
	g, err := NewLevelsGate(s, Response{}, 0)
	if err != nil {
		t.Fatal(err)
	}
	return 4 * g.Figures(u, nil).Noise[0] * 3 / 2 // process infidelity of a unit weight is F
}

// TestPublishedFilterFunctions: of a resonant half turn the closed form is
// 4 cos²(πw/2)(w²+1)/(w²-1)² (Green, Sastrawan, Uys, Biercuk 2013, New J. Phys. 15, 095004; CALC); free evolution is
// 2 sin²(wt/2)/w² times two (Cywinski et al. 2008, Phys. Rev. B 77, 174509); and short CORPSE (Cummins, Llewellyn, Jones 2003,
// Phys. Rev. A 67, 042308) leaves nothing of slow noise and 1.224989e-2 at w = 0.01 (CALC).
func TestPublishedFilterFunctions(t *testing.T) {
	for _, c := range []struct{ w, want float64 }{{1e-9, 4}, {0.1, 4.021155}, {1, 4.934802}, {2.7, 4 * math.Pow(math.Cos(math.Pi*1.35), 2) * (2.7*2.7 + 1) / math.Pow(2.7*2.7-1, 2)}} {
		if got := filterFunction(t, c.w, math.Pi); !(math.Abs(got-c.want) <= 2e-6*(1+c.want)) {
			t.Errorf("a half turn at w = %v: %v, want %v", c.w, got, c.want)
		}
	}
	short := []float64{math.Pi / 3, -5 * math.Pi / 3, math.Pi / 3}
	if got := filterFunction(t, 1e-9, short...); !(got <= 1e-12) {
		t.Errorf("short CORPSE leaves %v of slow noise", got)
	}
	if got := filterFunction(t, 0.01, short...); !(math.Abs(got-1.224989e-2) <= 1e-8) {
		t.Errorf("short CORPSE at w = 0.01: %v, want 1.224989e-2", got)
	}
	// A robust pulse is worse than a plain one above 0.1888 of the drive (CALC).
	at := func(w float64) float64 { return filterFunction(t, w, short...) - filterFunction(t, w, math.Pi) }
	if below, above := at(0.1887), at(0.1889); !(below < 0 && above > 0) {
		t.Errorf("short CORPSE less a half turn: %v at w = 0.1887, %v at 0.1889", below, above)
	}
}
