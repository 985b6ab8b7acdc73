package datasheet

import (
	"fmt"
	"math"
	"regexp"
	"slices"
	"strings"
	"testing"

	"holdfast/design/replay"
)

// registerSheet is a sheet of invented figures of a gate on two sites, one of them with more levels than two. It tests the page, not the physics.
func registerSheet() *Sheet {
	s := demoSheet()
	s.Name, s.Target, s.Held = "CZ of a spin and a ladder", "CZ on q1, q2", []string{"any one-body error", "any leakage"}
	s.T1, s.T2, s.Detuning, s.Rivals = 0, 0, 0, nil
	second := s.Channels[0]
	second.Name, second.Samples = "q2 drive", append([]complex128(nil), second.Samples...)
	s.Channels = append(s.Channels, second)
	s.Further = []Coefficients{{Channel: "q2 drive", I: []float64{0.25, -0.5}, Q: []float64{0.125}}, {Channel: "q2 flux", I: []float64{0.75}}}
	s.Sites = []Site{
		{Name: "q1", T1: 60e3, T2: 40e3, Loss: 1.2e-3, Before: "0.5 rad = 28.6479 deg about Z", After: "-0.25 rad = -14.3239 deg about Z"},
		{Name: "q2", T2: 30e3, Loss: 8e-4, After: "1 rad = 57.2958 deg about Z"},
	}
	s.NoRivals = "No textbook pulse stands beside this one."
	s.LeftOut = []float64{200, 10400}
	v := s.Verdict
	v.Measure, v.Pair = "gate", replay.Pair{Infidelity: math.NaN(), Phase: math.NaN()}
	v.Settled.Leakage, v.Decoherence = 3.4e-7, 2e-3
	v.Dropped = &replay.Figures{Infidelity: 4.4e-5, Leakage: 5.5e-6}
	v.Warnings = []string{"Pulses back to back are not judged."}
	v.BringUp = replay.BringUp{}
	leak, none := 2.1e-4, 3e-11
	curve := v.Errors[1].Curve
	v.Errors = []replay.Error{
		{Name: "any one-body error", Kind: "any", Held: true, Unit: "MHz", Susceptibility: 1.7e-5, LeakSusceptibility: &leak, Low: -0.2, High: 0.2, Curve: curve,
			WorstDirection: "0.83 q1 X - 0.41 q2 Re 0-1", WorstSusceptibility: 2.1e-5, Members: []string{"q1 X", "q1 Y", "q1 Z", "q2 Re 0-1"}, Sampled: "the 4 operators of the class, both ways"},
		{Name: "any leakage", Kind: "any", Held: true, Leak: true, Unit: "MHz", Susceptibility: 2.2e-5, LeakSusceptibility: &leak, Low: -0.3, High: 0.3, Curve: curve,
			WorstDirection: "1.00 Re 01-02", WorstSusceptibility: 3e-5, Members: []string{"Re 01-02"}, Sampled: "the one operator of the class, both ways"},
		{Name: "q1 drive on q2", Kind: "crosstalk", Unit: "%", Susceptibility: 0.3, LeakSusceptibility: &none, Low: -2, High: 2, Curve: curve},
	}
	v.Requirements = v.Requirements[:1]
	return s
}

func TestRegisterText(t *testing.T) { golden(t, "register.txt", summary(t, registerSheet())) }

func TestRegisterPage(t *testing.T) {
	p := page(t, registerSheet())
	text := wellFormed(t, p)
	for _, want := range []string{
		"What playback adds", "28.6479 deg about Z", "−0.25 rad", "Decoherence by site", "60 µs", "30 µs", "not stated", "0.0012", "8e-4",
		"the sum over the sites of d/(d+1) T/4 (1/T1 + 2/T2), d = 4 code states,", "0.002 in all",
		"The model leaves out what turns at 200 MHz and 10400 MHz in the frames of the sites", "Put back, it makes the infidelity 4.4e-5 in the place of 2.71e-9, of which the leakage is 5.5e-6",
		"with what is left out", "3.4e-7", "share that ends outside the code space",
		"any one-body error held (4 operators)", "any leakage held (1 operator)", "leads out", "2.1e-4", "< 1e-9 in this model",
		"Any one-body error: q1 X, q1 Y, q1 Z and q2 Re 0-1. What it withstands was looked for along the 4 operators of the class, both ways.",
		"These couple the code space to other levels", "Of any one-body error, 0.83 q1 X − 0.41 q2 Re 0-1 survives most",
		"The rivals", "No textbook pulse stands beside this one.", "are not judged; a warning above says why",
		"Coefficients of I, q1 drive", "Coefficients of Q, q2 drive 0.125", "Coefficients of q2 flux 0.75", "Samples played of q2 drive", "1e-9 in infidelity and 1e-5 in susceptibility.",
	} {
		if !strings.Contains(text, want) {
			t.Errorf("the page does not say %q", want)
		}
	}
	for _, not := range []string{"not computed", "At the bench", "tail angle", "pair without a gap", "Shapes of the rivals"} {
		if strings.Contains(text, not) {
			t.Errorf("the page says %q", not)
		}
	}
	if m := outside.FindString(p); m != "" {
		t.Errorf("the page refers to something outside itself: %q", m)
	}
	if tables, captions := strings.Count(p, "<table"), strings.Count(p, "<caption"); tables != captions {
		t.Errorf("%d tables, %d captions", tables, captions)
	}
	// every row of a table has as many cells as its head, beside rivals too
	beside := registerSheet()
	beside.Rivals = demoSheet().Rivals
	for _, table := range regexp.MustCompile(`(?s)<table.*?</table>`).FindAllString(p+page(t, beside), -1) {
		columns := func(row string) (n int) {
			for _, cell := range regexp.MustCompile(`<t[hd]\b[^>]*>`).FindAllString(row, -1) {
				span := 1
				if _, after, ok := strings.Cut(cell, `colspan="`); ok {
					fmt.Sscanf(after, "%d", &span)
				}
				n += span
			}
			return n
		}
		_, body, ok := strings.Cut(table, "<tbody>")
		if !ok || !strings.Contains(table, "<thead>") {
			continue
		}
		first, _, _ := strings.Cut(table, "</tr>")
		for _, row := range strings.Split(body, "</tr>") {
			if n := columns(row); n > 0 && n != columns(first) {
				t.Errorf("a row of %d cells below a head of %d: %s", n, columns(first), row)
			}
		}
	}
	// a gate on one site says none of this
	text = wellFormed(t, page(t, demoSheet()))
	for _, not := range []string{"What playback adds", "Decoherence by site", "leads out", "operators", "No textbook", "leaves out"} {
		if strings.Contains(text, not) {
			t.Errorf("the page of one site says %q", not)
		}
	}
}

// States are no gates: what the infidelity is of stands on the plate, the axes and in the text.
func TestStates(t *testing.T) {
	for measure, words := range map[string]string{"state": "of the state", "subspace": "of the subspace"} {
		s := registerSheet()
		s.Verdict.Measure = measure
		text := wellFormed(t, page(t, s))
		for _, want := range []string{words + ", without any error", "infidelity " + words + " (ratio)"} {
			if !strings.Contains(text, want) {
				t.Errorf("%s: the page does not say %q", measure, want)
			}
		}
		if strings.Contains(text, "average gate infidelity") {
			t.Errorf("%s: the page speaks of a gate", measure)
		}
		if got := summary(t, s); !strings.Contains(got, "\ninfidelity "+words+" 2.71e-9 settled") {
			t.Errorf("%s: %s", measure, got)
		}
	}
	// of one site there are no sites to list, and still no gate
	s := demoSheet()
	s.Verdict.Measure, s.Verdict.Pair.Infidelity = "state", math.NaN()
	if text := wellFormed(t, page(t, s)); !strings.Contains(text, "are not judged; a warning above says why") || strings.Contains(text, "pair without a gap") {
		t.Errorf("a state of one site speaks of pairs")
	}
}

// Text and figures of several sites, however hostile, stay text and words.
func TestHostileRegister(t *testing.T) {
	const evil = "</title><script>alert(1)</script>\"'&]]>\x00\x1b[31m\u202e\xff{{.}}"
	s := registerSheet()
	for i := range s.Sites {
		s.Sites[i].Name, s.Sites[i].Before, s.Sites[i].After = evil, evil, evil
	}
	s.NoRivals, s.Further[0].Channel, s.Further[1].Channel = evil, evil, evil
	for i := range s.Verdict.Errors {
		e := &s.Verdict.Errors[i]
		e.Name, e.Sampled, e.Members = evil, evil, slices.Repeat([]string{evil}, 500)
	}
	p := page(t, s)
	wellFormed(t, p)
	text := summary(t, s)
	for _, bad := range []string{"<script", "\x00", "\x1b", "\u202e"} {
		if strings.Contains(p, bad) || bad != "<script" && strings.Contains(text, bad) {
			t.Errorf("the page or the text has %q", bad)
		}
	}
	if !strings.Contains(wellFormed(t, p), "477 more") {
		t.Errorf("500 operators are not cut")
	}
	for _, bad := range []float64{math.NaN(), math.Inf(1), math.Inf(-1), 1e308, -1e308, 1e-320, 0} {
		s := registerSheet()
		for i := range s.Sites {
			s.Sites[i].T1, s.Sites[i].T2, s.Sites[i].Loss = bad, bad, bad
		}
		s.LeftOut = slices.Repeat([]float64{bad}, 9)
		s.Further[0].I[0], s.Further[0].Q[0] = bad, bad
		s.Verdict.Dropped = &replay.Figures{Infidelity: bad, Leakage: bad}
		s.Verdict.Settled = *s.Verdict.Dropped
		for i := range s.Verdict.Errors {
			*s.Verdict.Errors[i].LeakSusceptibility = bad
		}
		check(t, bad, s)
	}
}

// Sixteen long channels do not make a page too large: what is not drawn is named.
func TestManyChannels(t *testing.T) {
	s := registerSheet()
	c := s.Channels[0]
	c.Samples, c.Arrives = make([]complex128, 4096), nil
	for k := range c.Samples {
		f := float64(k)
		c.Samples[k] = complex(0.9*math.Sin(f*f/1e5), 0.9*math.Cos(f))
		c.Arrives = append(c.Arrives, Arrival{f, c.Samples[k]})
	}
	s.Channels, s.Span = nil, 4096
	for i := range 16 {
		c.Name = fmt.Sprintf("q%d drive", i+1)
		s.Channels = append(s.Channels, c)
	}
	p := page(t, s)
	text := wellFormed(t, p)
	if len(p) > SizeLimit || !strings.Contains(text, "Samples played of q1 drive") || strings.Contains(text, "Samples played of q16 drive") ||
		!regexp.MustCompile(`The drawings of .*q15 drive and q16 drive are left out`).MatchString(text) {
		t.Errorf("%d bytes", len(p))
	}
	if strings.Contains(wellFormed(t, page(t, registerSheet())), "are left out, for the page") {
		t.Errorf("two channels are too many")
	}
}

// TestFluctuations: what a noise adds, and the infidelity over a spread, stand on the page and in the text.
func TestFluctuations(t *testing.T) {
	s := registerSheet()
	noise, mean := 1.53e-7, 1.04e-5
	s.Verdict.Errors[0].NoiseInfidelity = &noise
	s.Verdict.Errors[1].Spread, s.Verdict.Errors[1].SpreadInfidelity = "worst", &mean
	for name, text := range map[string]string{"page": wellFormed(t, page(t, s)), "text": summary(t, s)} {
		for _, want := range []string{"any one-body error adds 1.53e-7 to the infidelity", "the largest infidelity over its spread is 1.04e-5"} {
			if !strings.Contains(text, want) {
				t.Errorf("the %s does not say %q", name, want)
			}
		}
	}
}
