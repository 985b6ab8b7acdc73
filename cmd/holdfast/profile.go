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

// describeStarts says when the windows of several channels begin, what delays them, and what stays misaligned.
func describeStarts(w io.Writer, p *hardware.Profile) {
	fmt.Fprintf(w, "\nwindows of the channels at the device\n")
	var list []fact
	apart := 0.0
	for c := range p.Channels {
		early := p.Window() - p.Start(c)
		apart = math.Max(apart, math.Abs(early))
		words := fmt.Sprintf("begins %s after the trigger, %s before the latest", quantity.Format(p.Start(c), quantity.Time), quantity.Format(early, quantity.Time))
		if n := p.Shift(c); n > 0 {
			words += fmt.Sprintf("; its samples are to be delayed by %s for that", count(n, "sample"))
		}
		list = append(list, fact{p.Channels[c].Name, words})
	}
	printFacts(w, list)
	switch whole := apart / p.SamplePeriod; {
	case apart <= 1e-9:
		fmt.Fprintf(w, "  All begin together.\n")
	case p.Align == hardware.AlignNone:
		fmt.Fprintf(w, "  They stay up to %s (%.4g samples) apart, as align = \"none\" asks.\n", quantity.Format(apart, quantity.Time), whole)
	default:
		fmt.Fprintf(w, "  They stay up to %s (%.4g samples) apart: whole samples bring them no nearer.\n", quantity.Format(apart, quantity.Time), whole)
	}
}

func describeChannel(w io.Writer, p *hardware.Profile, c int) error {
	ch := &p.Channels[c]
	fmt.Fprintf(w, "\nchannel %q, %s\n", ch.Name, ch.Kind)
	var list []fact
	if ch.Kind == hardware.Baseband {
		list = append(list, fact{"kind", "one converter without a carrier: what it puts out turns the device about the axis that the device file gives its bias"})
	} else {
		q, upper, lower := "plus", "-", "+"
		if ch.Mixing == hardware.MinusSin {
			q, upper, lower = "minus", "+", "-"
		}
		list = append(list,
			fact{"mixing", fmt.Sprintf("%s: I multiplies the cosine of the carrier and Q %s its sine; Q turns a spin about %sY when its |0> is the upper energy, about %sY when it is the lower",
				ch.Mixing, q, upper, lower)},
			fact{"frame", fmt.Sprintf("everything is told in the frame that turns with the carrier (%s)", carrier(ch))})
	}
	list = append(list, []fact{
		{"full scale", fmt.Sprintf("a steady drive at full code turns a spin at %s, once in %s", quantity.Format(ch.FullScale/(2*math.Pi), quantity.Frequency), quantity.Format(2*math.Pi/ch.FullScale, quantity.Time))},
		{"amplitude", fmt.Sprintf("up to %s of full scale, %s", quantity.Format(ch.AmplitudeLimit, quantity.Ratio), amplitudeOf(ch))},
		{"slew", slewInWords(ch)},
		{"band", bandInWords(p, ch)},
		{"guards", fmt.Sprintf("%s at zero before the pulse and %d after, within the span", count(ch.GuardLead, "sample"), ch.GuardTrail)},
		{"ring-out", ringOutInWords(ch)},
	}...)
	list = append(list, otherLimits(ch)...)
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
		fact{"window", fmt.Sprintf("begins at the device %s after the trigger: %s of latency and %s",
			quantity.Format(p.Start(c), quantity.Time), quantity.Format(ch.Latency, quantity.Time), delayInWords(p, c))},
		fact{"plain turns", plainTurns(p, ch)})
	printFacts(w, list)
	err := describeSpans(w, p, c)
	fmt.Fprintln(w)
	printCautions(w, cautions(p, c))
	return err
}

// delayInWords tells the rest of the window's start.
func delayInWords(p *hardware.Profile, c int) string {
	words := quantity.Format(p.Channels[c].Line.Delay, quantity.Time) + " of pure delay"
	if n := p.Shift(c); n > 0 {
		words += fmt.Sprintf(", and %s for the sake of the slower channels", count(n, "sample"))
	}
	return words
}

// amplitudeOf says of what the amplitude is limited.
func amplitudeOf(ch *hardware.Channel) string {
	switch {
	case ch.Kind == hardware.Baseband:
		return "either sign"
	case ch.Envelope == hardware.Box:
		return "I and Q apart"
	}
	return "the length of (I, Q)"
}

// otherLimits tells what few profiles have.
func otherLimits(ch *hardware.Channel) []fact {
	share := func(v float64) string { return quantity.Format(v, quantity.Ratio) }
	var list []fact
	if ch.RMSLimit > 0 {
		over := "the span"
		if ch.RMSPeriod > 0 {
			over += ", or over " + quantity.Format(ch.RMSPeriod, quantity.Time) + " where that is longer"
		}
		list = append(list, fact{"rms", fmt.Sprintf("at most %s of full scale over %s", share(ch.RMSLimit), over)})
	}
	if ch.OutOfBand > 0 {
		list = append(list, fact{"out of band", fmt.Sprintf("at most %s of full scale, rms over the span, may lie outside the band", share(ch.OutOfBand))})
	}
	if ch.ZeroMean {
		list = append(list, fact{"mean", "the samples of a span sum to zero"})
	}
	if n := len(ch.Compression); n > 0 {
		last := ch.Compression[n-1]
		list = append(list, fact{"compression", fmt.Sprintf("at %s of the converter's range the drive reaches %s of full scale; %d points, inverted before the codes",
			share(last.Converter), share(last.Reached), n)})
	}
	if ch.Shift != 0 {
		list = append(list, fact{"shift", fmt.Sprintf("a steady drive at full scale moves the transition by %s along Z/2, in proportion to its power", quantity.Format(ch.Shift/(2*math.Pi), quantity.Frequency))})
	}
	return list
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
	if tail := ch.RingOut.Tail; tail > 0 && tail != ch.RingOut.Limit {
		return fmt.Sprintf("at most %s of full scale may arrive in I and in Q in the first %s after the span, and %s at every later instant",
			quantity.Format(ch.RingOut.Limit, quantity.Ratio), quantity.Format(ch.RingOut.Fast, quantity.Time), quantity.Format(tail, quantity.Ratio))
	}
	return fmt.Sprintf("at most %s of full scale may arrive in I and in Q at any instant after the span; the first %s and the rest are told apart",
		quantity.Format(ch.RingOut.Limit, quantity.Ratio), quantity.Format(ch.RingOut.Fast, quantity.Time))
}

// plainTurns says how long a square pulse takes that is held against nothing.
func plainTurns(p *hardware.Profile, ch *hardware.Channel) string {
	if !(steady(ch) > 1e-6) {
		return "no steady drive reaches the device"
	}
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

// A spanLine says what one span carries.
type spanLine struct{ samples, perQuad, degree int }

// spansOf counts the coefficients that each span carries, from the first that carries the gate to the first that carries
// everything. first is the least number of samples in which something is playable.
func spansOf(p *hardware.Profile, c int) (first int, lines []spanLine, err error) {
	ch := &p.Channels[c]
	least := max(p.Shortest, ch.GuardLead+ch.GuardTrail+1)
	first = (least + p.Block - 1) / p.Block * p.Block
	if first > p.Longest {
		return 0, nil, fmt.Errorf("channel %q can play nothing: guard: %d samples at zero leave none free in the longest waveform, %d samples", ch.Name, ch.GuardLead+ch.GuardTrail, p.Longest)
	}
	if _, err := p.Playable(c, first); err != nil {
		return 0, nil, err
	}
	most := len(degrees()) - 1
	for n := first; n <= p.Longest; n += p.Block {
		perQuad, _ := perQuadrature(ch, p.SamplePeriod, n-ch.GuardLead-ch.GuardTrail, "")
		l := spanLine{n, perQuad, -1}
		for i, d := range degrees() {
			if d.equations <= carries(ch, ch.Columns()*perQuad) {
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
	return first, lines, nil
}

// spareInWords says what carries takes off beside the one.
func spareInWords(ch *hardware.Channel) string {
	if n := spare(ch, ringOutEasy); n > 0 {
		return fmt.Sprintf(" - %d: one more coefficient than equations is wanted, and %d for the ring-out limit", n, n)
	}
	return ": one more coefficient than equations is wanted"
}

// describeSpans tables them.
func describeSpans(w io.Writer, p *hardware.Profile, c int) error {
	ch := &p.Channels[c]
	first, lines, err := spansOf(p, c)
	if err != nil {
		return err
	}
	fmt.Fprintf(w, "\n  Something is playable in spans from %s up.", quantity.Format(float64(first)*p.SamplePeriod, quantity.Time))
	if len(lines) == 0 {
		fmt.Fprintf(w, " No span carries coefficients enough for a gate.\n")
		return nil
	}
	fmt.Fprintf(w, " This table counts the coefficients that a span carries and the\n"+
		"  equations for which they are enough: %d for the gate, %d for each named error, %d for any static error. That many\n"+
		"  are needed; the limits may ask for a longer span, which only design can tell.\n", gateEquations, namedEquations, anyEquations)
	fmt.Fprintf(w, "  equations = together - 1%s.\n\n", spareInWords(ch))
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
			l.samples, l.perQuad, ch.Columns()*l.perQuad, carries(ch, ch.Columns()*l.perQuad), degrees()[l.degree].words)
	}
	t.Flush()
	return nil
}
