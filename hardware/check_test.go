package hardware

import (
	"math"
	"testing"

	"holdfast/filter"
)

// Behind a single pole what arrives after the span decays as e^(-t/tau), so the largest of the fast part is what the span's end leaves,
// and the largest of the tail what is left exactly when the fast part ends, wherever the steps of the search would lie: they are 0.04 tau
// long, and the ends of the fast part below are no multiples of that.
func TestCheckSplitsAtFast(t *testing.T) {
	const tau, h = 5.0, 1.0
	line, err := filter.SinglePole(tau)
	if err != nil {
		t.Fatal(err)
	}
	x := []complex128{0.5 - 0.25i, 0.5 - 0.25i, 0}
	// held over [0, 2 h): 0.5 (1 - e^(-2h/tau)) at 2 h, and h later the span ends
	end := 0.5 * (1 - math.Exp(-2*h/tau)) * math.Exp(-h/tau)
	for _, fast := range []float64{0.013, 0.1, 0.31, 1.77, 4.999, 23.456} {
		p := &Profile{SamplePeriod: h, Bits: 14, Block: 1, Shortest: 1, Longest: 100, Channels: []Channel{{
			Name: "a", Kind: Quadrature, Envelope: Disc, AmplitudeLimit: 1, SlewLimit: math.Inf(1), Band: math.Inf(1), Line: line,
			RingOut: RingOut{Limit: 1, Fast: fast, Tail: 1},
		}}}
		readings, err := p.CheckSamples(0, x)
		if err != nil {
			t.Fatal(err)
		}
		seen := 0
		for _, r := range readings {
			want := end
			switch r.Limit {
			case RingOutTail:
				want *= math.Exp(-fast / tau)
			case RingOutFast:
			default:
				continue
			}
			seen++
			if !(math.Abs(r.Found/want-1) <= 1e-12) {
				t.Errorf("fast part of %g ns: %s is %.15g, want %.15g", fast, r.Limit, r.Found, want)
			}
		}
		if seen != 2 {
			t.Errorf("%d readings of ring-out", seen)
		}
	}
}
