//go:build measure

package design

import (
	"context"
	"fmt"
	"os"
	"path/filepath"
	"runtime"
	"strings"
	"testing"
	"time"

	"holdfast/design/robust"
)

// TestMeasurePair finds the spans of two spins.
func TestMeasurePair(t *testing.T) {
	for _, c := range []struct {
		gate string
		ns   int
		held string
	}{
		{"sqrt-iSWAP", 40, ""}, {"CNOT", 64, ""},
		{"sqrt-iSWAP", 240, `any = "one-body"`}, {"sqrt-iSWAP", 272, `any = "one-body"`}, {"CNOT", 272, `any = "one-body"`},
		{"sqrt-iSWAP", 560, `any = "all"`},
	} {
		if only := os.Getenv("ONLY"); only != "" && only != fmt.Sprintf("%s %d", c.gate, c.ns) {
			continue
		}
		held := "hold = \"nothing\"\n"
		if c.held != "" {
			held = ""
		}
		text := fmt.Sprintf("span = \"%d ns\"\n%s\n%s\n[target]\nsites = [\"q1\", \"q2\"]\ngate = %q\nfree_z = \"both\"\n", c.ns, held, os.Getenv("EXTRA"), c.gate)
		if c.held != "" {
			text += "[[error]]\n" + c.held + "\n"
		}
		in := register(t, 2, exchanged, text)
		begun := time.Now()
		last := time.Now()
		p, err := Run(context.Background(), in, func(p Progress) {
			if time.Since(last) > 5*time.Second {
				last = time.Now()
				fmt.Printf("   %s %d of %d, %d won, best %.3g, expected %v; %v\n", p.Stage, p.Done, p.Of, p.Successes, p.Best, p.Expected, time.Since(begun))
			}
		})
		if err != nil {
			t.Fatal(err)
		}
		m := &p.Record.Model
		s := ""
		for _, e := range m.Errors {
			s += fmt.Sprintf(" %s %.2g", e.Name, e.Susceptibility)
		}
		t.Logf("%s %d ns: %s; infidelity %.2g before rounding, %.2g after,%s; %v", c.gate, c.ns, p.Summary(), p.Record.Search.Before, p.Record.Claim.Infidelity, s, time.Since(begun))
	}
}

// TestMeasureSecond looks for the shortest X(pi) of second order.
func TestMeasureSecond(t *testing.T) {
	for _, time := range []float64{4.26, 4.275, 4.28, 4.285, 4.29, 4.3} {
		_, p := minimalInputs(t, "", "[[error]]\ndetuning = \"q1\"\norder = 2", time, 24)
		t.Logf("%.3f pi: %s", time, p.Summary())
	}
}

// chain couples n spins to their neighbours by exchange.
func chain(n int, strength string) (s string) {
	for i := 1; i < n; i++ {
		s += fmt.Sprintf("[[coupling]]\nkind = \"exchange\"\nbetween = [\"q%d\", \"q%d\"]\nstrength = %q\n", i, i+1, strength)
	}
	return s
}

// TestMeasureChain moves a state along four spins, and entangles them, held against one-body and,
// apart, against two-body errors: one start each. The pulses are written below $CHAIN, where the measure of package replay finds them.
func TestMeasureChain(t *testing.T) {
	for _, c := range []struct {
		name, target, held string
		weight             float64 // two-body errors are more than this span can hold off: the state comes first
	}{
		{"move-one", "from = \"1000\"\nto = \"0001\"", "one-body", 1},
		{"move-two", "from = \"1000\"\nto = \"0001\"", "two-body", 0.1},
		{"entangle-one", "from = \"0000\"\nto = \"GHZ\"", "one-body", 1},
		{"entangle-two", "from = \"0000\"\nto = \"GHZ\"", "two-body", 0.1},
	} {
		if only := os.Getenv("ONLY"); only != "" && only != c.name {
			continue
		}
		in := register(t, 4, chain(4, "5 MHz"), fmt.Sprintf("span = \"256 ns\"\nends = \"window\"\nstarts = 1\nrefine = false\n[target]\n%s\n[[error]]\nany = %q\nweight = %g\n", c.target, c.held, c.weight))
		begun := time.Now()
		p, err := Run(context.Background(), in, nil)
		if err != nil {
			t.Fatal(err)
		}
		e := p.Record.Model.Errors[0]
		t.Logf("%s, held against %s errors: %s; infidelity %.2g, susceptibility %.2g; %v", c.name, c.held, p.Summary(), p.Record.Claim.Infidelity, e.Susceptibility, time.Since(begun))
		dir := filepath.Join(os.Getenv("CHAIN"), c.name)
		src, err := ReadSources(in)
		if err != nil {
			t.Fatal(err)
		}
		if err := os.MkdirAll(dir, 0o777); err != nil {
			t.Fatal(err)
		}
		if err := p.Write(dir, src); err != nil {
			t.Fatal(err)
		}
	}
}

// TestMeasureRates compares a design that knows learned rates with one that takes all errors
// for alike, at a span too short to hold off all of them: by what the learned errors leave.
func TestMeasureRates(t *testing.T) {
	for _, span := range []int{320, 400} {
		var left [2]float64
		for i, rates := range []string{"", "rates = \"rates.csv\"\n"} {
			text := fmt.Sprintf("span = \"%d ns\"\nrefine = false\nstarts = 4\n[target]\nsites = [\"q1\", \"q2\"]\ngate = \"sqrt-iSWAP\"\nfree_z = \"both\"\n[[error]]\nany = \"all\"\n%s[require]\nsusceptibility = 1e-9\n", span, rates)
			in := register(t, 2, exchanged, text)
			begun := time.Now()
			p, err := Run(context.Background(), in, nil)
			if err != nil {
				t.Fatal(err)
			}
			other := register(t, 2, exchanged, strings.Replace(text, "any = \"all\"\n", "any = \"all\"\nrates = \"rates.csv\"\n", 1-i))
			q, err := newTask(other, "slepian")
			if err != nil {
				t.Fatal(err)
			}
			u, v := q.controls(&q.fine, [][]complex128{p.Channels[0].Exact, p.Channels[1].Exact})
			f := q.gate(true).Figures(u, v)
			left[i] = f.Susceptibility[0]
			t.Logf("%d ns, %q: %s; infidelity %.2g; susceptibility to the learned errors %.3g; %v", span, rates, p.Summary(), f.Infidelity, f.Susceptibility[0], time.Since(begun))
		}
		t.Logf("%d ns: expected infidelity lower by %.3g", span, left[0]*left[0]/(left[1]*left[1]))
	}
}

// TestMeasureLarge evaluates a gate on six spins, 64 levels, held against every one-body error, once, and says what memory it takes.
func TestMeasureLarge(t *testing.T) {
	gates := ""
	for i := range 6 {
		gates += fmt.Sprintf(", q%d = \"X90\"", i+1)
	}
	in := register(t, 6, chain(6, "200 kHz"), "span = \"96 ns\"\n[target]\ngates = {"+gates[1:]+" }\n[[error]]\nany = \"one-body\"\n")
	q, err := newTask(in, "slepian")
	if err != nil {
		t.Fatal(err)
	}
	g := q.gate(false).(*robust.LevelsGate)
	_, work := g.Work()
	r, grad := make([]float64, g.Rows()), make([]float64, g.Dim())
	begun := time.Now()
	g.Residuals(q.start(0).c, r)
	residuals := time.Since(begun)
	g.Gradient(r, grad)
	var m runtime.MemStats
	runtime.ReadMemStats(&m)
	t.Logf("%d levels, %d steps, %d residuals, %d coefficients, quasi-Newton %v: residuals %v, gradient %v (%.2g multiplications), %.0f MB from the system", in.Device.Dim(), len(q.coarse.Steps), g.Rows(), g.Dim(), g.Many(),
		residuals, time.Since(begun)-residuals, work, float64(m.Sys)/1e6)
}
