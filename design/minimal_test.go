package design

import (
	"context"
	"fmt"
	"math"
	"testing"
	xtime "time"

	"holdfast/hardware"
)

// The shortest X(pi) at a limited drive of both quadratures, length sqrt(I² + Q²)
// <= 1 rad per unit of time, against nothing, detuning and any static error, first
// order, for pulses of 192 constant pieces, in units of pi:
//
//   - nothing 1, the plain pulse;
//   - detuning 7/3, short CORPSE, conjectured optimal by S. Kukita, H. Kiya, Y. Kondo,
//     arXiv 2405.11170 (2024): READ, and CALC;
//   - any static error 4.871: CALC, best of many starts. A pulse found more than
//     0.3 % below it would be an error of the program.
//
// An ideal instrument is a profile without line, slew, band and ring-out limit, and
// design takes it like any other: one coefficient a sample, 192 samples of 1 ns, and
// a full scale that makes the 192 ns last as long as the candidate time. From either
// side: above the published time a pulse is found, and replay agrees that it is one;
// below it, none is, from all the starts stated here, each of which ends at a miss.
func TestMinimalTimes(t *testing.T) {
	for _, c := range []struct {
		name   string
		head   string // of the brief
		tail   string
		time   float64 // pi
		above  float64 // share of the time at which a pulse is found
		within int     // so many starts
		below  float64 // share at which none is
		starts int     // from so many
	}{
		{"nothing", `hold = "nothing"`, "", 1, 1.0003, 4, 0.9997, 4},
		{"detuning", "", "[[error]]\ndetuning = \"q1\"", 7. / 3, 1.001, 4, 0.999, 4},
		{"any static error", "", "[[error]]\nany = \"all\"", 4.871, 1.005, 20, 0.997, 10},
	} {
		p := minimal(t, c.head, c.tail, c.above*c.time, c.within)
		if p.Status != Found {
			t.Errorf("held against %s, %g of %.4f pi: %s", c.name, c.above, c.time, p.Summary())
		}
		p = minimal(t, c.head, c.tail, c.below*c.time, c.starts)
		if p.Status != NotFound || p.Record.Search.Tried != c.starts || p.Record.Search.Successes != 0 {
			t.Errorf("held against %s, %g of %.4f pi: %s", c.name, c.below, c.time, p.Summary())
		}
	}
}

// minimal designs an X(pi) that lasts so many pi in units of the largest drive.
func minimal(t *testing.T, head, tail string, time float64, starts int) *Pulse {
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
	// the largest playable sample turns by time pi in 192 ns: cyclic, in MHz
	scale := 1e3 * time / (2 * n * set.Disc)
	in := idealInputs(t, fmt.Sprintf("%.15g MHz", scale), n, fmt.Sprintf("seed = 1\nstarts = %d\nrefine = false\n%s", starts, head), tail)
	began := xtime.Now()
	p, err := Run(context.Background(), in, nil)
	t.Log(time, p.Summary(), p.Record.Search.Evaluations, p.Record.Search.Miss, xtime.Since(began))
	if err != nil {
		t.Fatal(err)
	}
	angle, largest := 0.0, 0.0
	for _, x := range p.Exact {
		largest = math.Max(largest, math.Hypot(real(x), imag(x)))
	}
	angle = largest * in.Profile.Channels[0].FullScale * n
	if !(angle <= time*math.Pi*(1+1e-12)) {
		t.Errorf("the drive is strong enough for %.9g pi, more than the %.9g pi allowed", angle/math.Pi, time)
	}
	if p.Status != Found {
		return p
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
	return p
}
