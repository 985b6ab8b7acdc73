package datasheet

import (
	"fmt"
	"io"
	"math"
	"slices"
	"strings"
	"unicode/utf8"

	"holdfast/design/replay"
)

// Text writes a short summary for a terminal, about 25 lines, in the words and
// figures of the page. It fails when the sheet carries no verdict or w fails.
func Text(w io.Writer, s *Sheet) error {
	if s == nil || s.Verdict == nil {
		return errNoVerdict
	}
	v := s.Verdict
	var b strings.Builder
	line := func(format string, args ...any) { fmt.Fprintf(&b, format+"\n", args...) }

	name := clean(s.Name)
	if name == "" {
		name = "a pulse without a name"
	}
	line("%s", name)
	line("%s.", s.sentence())
	answer := strings.ToUpper(s.word()) + ". "
	line("%s", answer+s.verdictSentence())
	for _, r := range s.reasons() {
		line("  %s", hyphens(r))
	}

	if len(v.Requirements) > 0 {
		rows := [][]string{{"requirement", "found", "required", ""}}
		for _, r := range v.Requirements {
			found, allowed := s.requirementText(r)
			met := "met"
			if !r.Met {
				met = "MISSED"
			}
			rows = append(rows, []string{clean(r.Name), found, allowed, met})
		}
		table(&b, rows)
	}

	if len(v.Errors) > 0 {
		out := slices.ContainsFunc(v.Errors, func(e replay.Error) bool { return e.LeakSusceptibility != nil })
		head := []string{"error", "susceptibility", "withstands"}
		if out {
			head = append(head, "leads out")
		}
		for _, r := range s.Rivals {
			head = append(head, clean(r.Name))
		}
		rows := [][]string{head}
		for _, e := range v.Errors {
			name := clean(e.Name)
			switch of := operators(e); {
			case e.Held && of != "":
				name += " (held, " + of + ")"
			case e.Held:
				name += " (held)"
			case of != "":
				name += " (" + of + ")"
			}
			row := []string{name, figure(e.Susceptibility), s.margin(e)}
			if out {
				leak := "-"
				if e.LeakSusceptibility != nil {
					leak = figure(*e.LeakSusceptibility)
				}
				row = append(row, leak)
			}
			for _, r := range s.Rivals {
				cell := "-"
				if re, ok := find(r.Errors, e); ok {
					cell = s.margin(re)
				}
				row = append(row, cell)
			}
			rows = append(rows, row)
		}
		table(&b, rows)
	}

	for _, e := range v.Errors {
		if e.WorstDirection != "" {
			line("  of %s, %s survives most: %s", clean(e.Name), clean(e.WorstDirection), figure(e.WorstSusceptibility))
		}
		for _, w := range fluctuations(&e) {
			line("  %s", w)
		}
	}

	b.WriteByte('\n')
	of := s.measured()
	if of != "" {
		of += " "
	}
	line("infidelity %s%s settled, %s in the window", of, figure(v.Settled.Infidelity), figure(v.Window.Infidelity))
	if l := v.Required().Leakage; s.register() && l != 0 {
		line("leakage %s, the share that ends outside the code space", figure(l))
	}
	if v.Dropped != nil {
		line("with the rotating terms put back that the model leaves out: infidelity %s", figure(v.Dropped.Infidelity))
	}
	tail := figure(v.TailAngle)
	if finite(v.TailAngle) && math.Abs(v.TailAngle) >= tiny {
		tail += " rad"
	}
	if s.judgesPair() {
		line("ring-out turns %s after the window; two without a gap lose %s", tail, figure(v.Pair.Infidelity))
	} else {
		line("ring-out turns %s after the window", tail)
	}
	if v.Decoherence > 0 {
		if v.Measure == "state" || v.Measure == "subspace" {
			line("decoherence adds some %s: its mean over all states of the sites", figure(v.Decoherence))
		} else {
			line("decoherence adds %s, whatever the pulse", figure(v.Decoherence))
		}
	}
	if l, ok := tightest(v.Limits); ok {
		line("tightest limit: %s, %s, %s free", clean(l.Channel), clean(string(l.Reading.Limit)), percent(l.Headroom))
	}
	for _, r := range s.Rivals {
		if r.BreaksRingOut {
			line("the %s breaks the ring-out limit (%s of full scale)", clean(r.Name), percent(r.RingOut))
		}
	}
	for _, e := range v.Errors {
		if w := s.weaker(e); w != "" {
			line("%s", w)
		}
	}
	if s.NoRivals != "" {
		line("%s", clean(s.NoRivals))
	}
	for _, warning := range v.Warnings {
		line("warning: %s", clean(warning))
	}
	_, err := io.WriteString(w, b.String())
	return err
}

// hyphens is the inverse of typographic, for terminals.
func hyphens(s string) string {
	return strings.NewReplacer("−", "-", string(noBreak), " ").Replace(s)
}

// table writes rows in aligned columns after an empty line; the first row is
// its head.
func table(b *strings.Builder, rows [][]string) {
	var width []int
	for _, r := range rows {
		for i, c := range r {
			if i == len(width) {
				width = append(width, 0)
			}
			width[i] = max(width[i], utf8.RuneCountInString(c))
		}
	}
	b.WriteByte('\n')
	for _, r := range rows {
		var l strings.Builder
		for i, c := range r {
			l.WriteString("  " + c + strings.Repeat(" ", width[i]-utf8.RuneCountInString(c)))
		}
		b.WriteString(strings.TrimRight(l.String(), " ") + "\n")
	}
}

// fluctuations says what an error's noise adds, and the infidelity over its spread.
func fluctuations(e *replay.Error) (list []string) {
	if e.NoiseInfidelity != nil {
		list = append(list, fmt.Sprintf("noise: %s adds %s to the infidelity, to first order in its spectrum", clean(e.Name), figure(*e.NoiseInfidelity)))
	}
	if e.SpreadInfidelity != nil {
		what := "the mean infidelity over its spread is "
		if e.Spread == "worst" {
			what = "the largest infidelity over its spread is "
		}
		list = append(list, "spread: of "+clean(e.Name)+" "+what+figure(*e.SpreadInfidelity))
	}
	return list
}
