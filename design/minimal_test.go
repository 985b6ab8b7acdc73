package design

import (
	"context"
	"fmt"
	"math"
	"testing"

	"holdfast/hardware"
)

// The shortest X(pi) when the drive sqrt(I² + Q²) is at most 1 rad per unit of time,
// held to first order against nothing, detuning or any static error, as 192 constant
// pieces, in units of pi:
//
//   - nothing 1, the plain pulse;
//   - detuning 7/3, short CORPSE, conjectured optimal by S. Kukita, H. Kiya, Y. Kondo,
//     arXiv 2405.11170 (2024): READ, and CALC;
//   - any static error 4.871: CALC, best of many starts. A pulse found more than 0.3 %
//     below it would be an error of the program.
//
// An instrument without line, slew, band and ring-out limit is a profile like any
// other, and goes to the same Run: one coefficient a sample, 192 samples of 1 ns, and
// a full scale that makes 192 ns as long as the candidate time. From both sides:
// above the published time a pulse is found, and replay agrees that it is one;
// below it none is, from all of the starts stated here.
func TestMinimalTimes(t *testing.T) {
	for _, c := range []struct {
		name       string
		head, tail string  // of the brief
		time       float64 // units of pi
		above      float64 // share of the time at which a pulse is found,
		within     int     // in at most so many starts
		below      float64 // share at which none is,
		starts     int     // in so many
	}{
		{"nothing", `hold = "nothing"`, "", 1, 1.0003, 4, 0.9997, 3},
		{"detuning", "", "[[error]]\ndetuning = \"q1\"", 7. / 3, 1.001, 4, 0.999, 3},
		{"any static error", "", "[[error]]\nany = \"all\"", 4.871, 1.005, 20, 0.997, 6},
	} {
		p := minimal(t, c.head, c.tail, c.above*c.time, c.within)
		t.Logf("%s, %g of %.4f pi: %s", c.name, c.above, c.time, p.Summary())
		if p.Status != Found {
			t.Errorf("held against %s, %g of %.4f pi: %s", c.name, c.above, c.time, p.Summary())
		}
		p = minimal(t, c.head, c.tail, c.below*c.time, c.starts)
		t.Logf("%s, %g of %.4f pi: %s", c.name, c.below, c.time, p.Summary())
		s := p.Record.Search
		if p.Status != NotFound || s.Tried != c.starts || s.Successes != 0 {
			t.Errorf("held against %s, %g of %.4f pi: %s", c.name, c.below, c.time, p.Summary())
		}
		// The residual is the sine of half the angle that is lacking: of a plain pulse
		// at full drive, exactly this.
		if want := math.Pow(math.Sin(math.Pi/2*(1-c.below)), 2); c.name == "nothing" && !(math.Abs(s.Miss/want-1) <= 1e-3) {
			t.Errorf("held against nothing, %g pi: best miss %.6g, want %.6g", c.below, s.Miss, want)
		}
	}
}

// minimal designs an X(pi) of 192 samples that lasts time pi over the largest
// playable drive. What is found is judged by replay, before rounding.
func minimal(t *testing.T, head, tail string, time float64, starts int) *Pulse {
	t.Helper()
	_, p := minimalInputs(t, head, tail, time, starts)
	return p
}

func minimalInputs(t *testing.T, head, tail string, time float64, starts int) (Inputs, *Pulse) {
	t.Helper()
	const n = 192
	ideal, err := hardware.Parse("ideal.toml", []byte(textFile(t, "ideal/ideal.toml")))
	if err != nil {
		t.Fatal(err)
	}
	set, err := ideal.Playable(0, n)
	if err != nil {
		t.Fatal(err)
	}
	// A sample on the edge of the disc turns by time pi in n ns; cyclic, in MHz.
	scale := 1e3 * time / (2 * n * set.Disc)
	in := idealInputs(t, fmt.Sprintf("%.15g MHz", scale), n, fmt.Sprintf("starts = %d\nrefine = false\n%s", starts, head), tail)
	p, err := Run(context.Background(), in, nil)
	if err != nil {
		t.Fatal(err)
	}
	largest := 0.0
	for _, x := range p.Channels[0].Exact {
		largest = math.Max(largest, math.Hypot(real(x), imag(x)))
	}
	if angle := largest * in.Profile.Channels[0].FullScale * n / math.Pi; !(angle <= time*(1+1e-12)) {
		t.Errorf("the drive of a pulse of %.6g pi would turn by %.9g pi", time, angle)
	}
	if p.Status != Found {
		return in, p
	}
	src, err := ReadSources(in)
	if err != nil {
		t.Fatal(err)
	}
	v, err := writtenBack(t, p, src).Model.BeforeRounding().Judge(context.Background(), 1e-4)
	if err != nil {
		t.Fatal(err)
	}
	if !(v.Required().Infidelity <= 1e-12) {
		t.Errorf("replay finds infidelity %.3g in a pulse of %.6g pi", v.Required().Infidelity, time)
	}
	for _, e := range v.Errors {
		if e.Held && !(e.Susceptibility <= 1e-6) {
			t.Errorf("replay finds susceptibility %.3g to %s in a pulse of %.6g pi", e.Susceptibility, e.Name, time)
		}
	}
	return in, p
}
