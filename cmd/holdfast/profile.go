package main

import (
	"fmt"
	"io"
	"math"
	"text/tabwriter"

	"holdfast/filter"
	"holdfast/hardware"
	"holdfast/hardware/quantity"
	"holdfast/shape"
)

// describeProfile says what an instrument can play and what its lines make of
// it. The error names the limit that leaves a channel nothing to play.
func describeProfile(w io.Writer, p *hardware.Profile) error {
	fmt.Fprintf(w, "%s: hardware profile of %q\n\n", p.File, p.Name)
	lsb := hardware.LeastStep(p.Bits)
	printFacts(w, []fact{
		{"sample rate", fmt.Sprintf("%s: each sample is held for %s", quantity.Format(1/p.SamplePeriod, quantity.SampleRate), quantity.Format(p.SamplePeriod, quantity.Time))},
		{"resolution", fmt.Sprintf("%d bit: one code (LSB) is %s of full scale, codes %d to %d", p.Bits, quantity.Format(lsb, quantity.Ratio), -(1 << (p.Bits - 1)), 1<<(p.Bits-1)-1)},
		{"waveforms", fmt.Sprintf("%d to %d samples in blocks of %d, %s each", p.Shortest, p.Longest, p.Block, quantity.Format(float64(p.Block)*p.SamplePeriod, quantity.Time))},
		{"channels", fmt.Sprint(len(p.Channels))},
	})
	var fault error
	for c := range p.Channels {
		if err := describeChannel(w, p, c); err != nil && fault == nil {
			fault = fmt.Errorf("%s: %w", p.File, err)
		}
	}
	if len(p.Channels) > 1 {
		describeStarts(w, p)
	}
	return fault
}

// describeStarts says what stays misaligned: in this version waveforms of all
// channels leave the converters together, whatever their delays.
func describeStarts(w io.Writer, p *hardware.Profile) {
	fmt.Fprintf(w, "\nwindows of the channels at the device\n")
	first := math.Inf(1)
	for c := range p.Channels {
		first = math.Min(first, p.Start(c))
	}
	var list []fact
	apart := 0.0
	for c := range p.Channels {
		late := p.Start(c) - first
		apart = math.Max(apart, late)
		list = append(list, fact{p.Channels[c].Name, fmt.Sprintf("begins %s after the trigger, %s after the earliest", quantity.Format(p.Start(c), quantity.Time), quantity.Format(late, quantity.Time))})
	}
	printFacts(w, list)
	if whole := apart / p.SamplePeriod; apart > 0 {
		fmt.Fprintf(w, "  They stay up to %s (%.4g samples) apart; this version plays one channel and aligns none.\n", quantity.Format(apart, quantity.Time), whole)
	} else {
		fmt.Fprintf(w, "  All begin together.\n")
	}
}

func describeChannel(w io.Writer, p *hardware.Profile, c int) error {
	ch := &p.Channels[c]
	fmt.Fprintf(w, "\nchannel %q, %s\n", ch.Name, ch.Kind)
	q, upper, lower := "plus", "-", "+"
	if ch.Mixing == hardware.MinusSin {
		q, upper, lower = "minus", "+", "-"
	}
	list := []fact{
		{"mixing", fmt.Sprintf("%s: I multiplies the cosine of the carrier and Q %s its sine; Q turns a spin about %sY when its |0> is the upper energy, about %sY when it is the lower",
			ch.Mixing, q, upper, lower)},
		{"frame", fmt.Sprintf("everything is told in the frame that turns with the carrier (%s)", carrier(ch))},
		{"full scale", fmt.Sprintf("a steady drive at full code turns a spin at %s, once in %s", quantity.Format(ch.FullScale/(2*math.Pi), quantity.Frequency), quantity.Format(2*math.Pi/ch.FullScale, quantity.Time))},
		{"amplitude", fmt.Sprintf("up to %s of full scale, the length of (I, Q)", quantity.Format(ch.AmplitudeLimit, quantity.Ratio))},
		{"slew", slewInWords(ch)},
		{"band", bandInWords(p, ch)},
		{"guards", fmt.Sprintf("%s at zero before the pulse and %d after, within the span", count(ch.GuardLead, "sample"), ch.GuardTrail)},
		{"ring-out", ringOutInWords(ch)},
	}
	for i, s := range ch.Sections {
		name := "line"
		if i > 0 {
			name = ""
		}
		list = append(list, fact{name, s})
	}
	if len(ch.Line.Terms) > 0 {
		for _, f := range lineFigures(ch.Line) {
			if f.Name != "pure delay" { // the sections have told
				list = append(list, fact{"", f.Name + ": " + f.Value})
			}
		}
	}
	list = append(list,
		fact{"window", fmt.Sprintf("begins at the device %s after the trigger: %s of latency and %s of pure delay",
			quantity.Format(p.Start(c), quantity.Time), quantity.Format(ch.Latency, quantity.Time), quantity.Format(ch.Line.Delay, quantity.Time))},
		fact{"plain turns", plainTurns(p, ch)})
	printFacts(w, list)
	err := describeSpans(w, p, c)
	fmt.Fprintln(w)
	printCautions(w, cautions(p, c))
	return err
}

func slewInWords(ch *hardware.Channel) string {
	if math.IsInf(ch.SlewLimit, 1) {
		return "no limit"
	}
	return fmt.Sprintf("%s in I and in Q, the steps from and to zero included: %s from zero to the amplitude limit",
		quantity.Format(ch.SlewLimit, quantity.PerSample), count(int(math.Ceil(ch.AmplitudeLimit/ch.SlewLimit-1e-9)), "step"))
}

// bandInWords tells the band with what holding the samples loses at its edge.
func bandInWords(p *hardware.Profile, ch *hardware.Channel) string {
	edge, words := ch.Band, "up to "
	if math.IsInf(edge, 1) {
		edge, words = 1/(2*p.SamplePeriod), "no limit below half the sample rate, "
	}
	droop := filter.HoldDroop(edge, p.SamplePeriod)
	return fmt.Sprintf("%s%s from the carrier; there holding the samples leaves %.4g %% (%.3g dB)",
		words, quantity.Format(edge, quantity.Frequency), 100*droop, 20*math.Log10(droop))
}

func ringOutInWords(ch *hardware.Channel) string {
	if math.IsInf(ch.RingOut.Limit, 1) {
		return "no limit on what arrives after the span"
	}
	return fmt.Sprintf("at most %s of full scale may arrive in I and in Q at any instant after the span; the first %s and the rest are told apart",
		quantity.Format(ch.RingOut.Limit, quantity.Ratio), quantity.Format(ch.RingOut.Fast, quantity.Time))
}

// plainTurns says how long a square pulse takes that is held against nothing.
func plainTurns(p *hardware.Profile, ch *hardware.Channel) string {
	long := func(angle float64) string {
		area := angle / (ch.FullScale * p.SamplePeriod * steady(ch))
		n := len(shape.RampedSquare(area, ch.AmplitudeLimit, ch.SlewLimit))
		if n == 0 || n+ch.GuardLead+ch.GuardTrail > p.Longest {
			return "more than the longest waveform"
		}
		return quantity.Format(float64(n)*p.SamplePeriod, quantity.Time)
	}
	return fmt.Sprintf("amplitude and slew alone allow a quarter turn in %s and a half turn in %s, guards apart", long(math.Pi/2), long(math.Pi))
}

// A degree is how much a pulse may be held against, with its equations.
type degree struct {
	equations int
	words     string
}

func degrees() []degree {
	return []degree{
		{gateEquations, "the gate alone"},
		{gateEquations + namedEquations, "one named error"},
		{gateEquations + 2*namedEquations, "two named errors"},
		{gateEquations + anyEquations, "any static error"},
		{gateEquations + anyEquations + namedEquations, "any static error and amplitude"},
	}
}

// describeSpans tables the coefficients that each span carries, from the first
// that carries the gate to the first that carries everything.
func describeSpans(w io.Writer, p *hardware.Profile, c int) error {
	ch := &p.Channels[c]
	least := max(p.Shortest, ch.GuardLead+ch.GuardTrail+1)
	first := (least + p.Block - 1) / p.Block * p.Block
	if first > p.Longest {
		return fmt.Errorf("channel %q can play nothing: guard: %d samples at zero leave none free in the longest waveform, %d samples", ch.Name, ch.GuardLead+ch.GuardTrail, p.Longest)
	}
	if _, err := p.Playable(c, first); err != nil {
		return err
	}
	type line struct{ samples, perQuad, degree int }
	var lines []line
	most := len(degrees()) - 1
	for n := first; n <= p.Longest; n += p.Block {
		perQuad, _ := perQuadrature(ch, p.SamplePeriod, n-ch.GuardLead-ch.GuardTrail, "")
		l := line{n, perQuad, -1}
		for i, d := range degrees() {
			if d.equations <= carries(ch, 2*perQuad) {
				l.degree = i
			}
		}
		if l.degree >= 0 {
			lines = append(lines, l)
		}
		if l.degree == most {
			break
		}
	}
	fmt.Fprintf(w, "\n  Something is playable in spans from %s up.", quantity.Format(float64(first)*p.SamplePeriod, quantity.Time))
	if len(lines) == 0 {
		fmt.Fprintf(w, " No span carries coefficients enough for a gate.\n")
		return nil
	}
	fmt.Fprintf(w, " This table counts the coefficients that a span carries and the\n"+
		"  equations for which they are enough: %d for the gate, %d for each named error, %d for any static error. That many\n"+
		"  are needed; the limits may ask for a longer span, which only design can tell.\n\n", gateEquations, namedEquations, anyEquations)
	const longTable = 12 // lines; beyond, only those at which something changes
	t := tabwriter.NewWriter(w, 0, 0, 3, ' ', tabwriter.AlignRight)
	fmt.Fprint(t, "span\tsamples\tin I, in Q\ttogether\tequations\t  enough for\n")
	before := -1
	for _, l := range lines {
		if l.degree == before && len(lines) > longTable {
			continue
		}
		before = l.degree
		fmt.Fprintf(t, "%s\t%d\t%d\t%d\t%d\t  %s\n", quantity.Format(float64(l.samples)*p.SamplePeriod, quantity.Time),
			l.samples, l.perQuad, 2*l.perQuad, carries(ch, 2*l.perQuad), degrees()[l.degree].words)
	}
	t.Flush()
	return nil
}
