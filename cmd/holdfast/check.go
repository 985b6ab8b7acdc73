package main

import (
	"errors"
	"fmt"
	"io"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"strings"

	"holdfast/design/brief"
	"holdfast/design/device"
	"holdfast/design/replay"
	"holdfast/hardware"
	"holdfast/hardware/quantity"
)

// check reads every file strictly and says what it means. A file at fault costs
// one line on stderr and the exit status; the others are read all the same.
func check(c *call) (int, error) {
	files, err := c.parse(c.flags(), 1, math.MaxInt)
	if err != nil {
		return exitBadInput, err
	}
	status := exitMet
	forms := checkForm{Format: jsonFormat}
	for i, path := range files {
		if i > 0 && !c.json {
			fmt.Fprintln(c.stdout)
		}
		w := c.stdout
		if c.json {
			w = io.Discard
		}
		form := fileForm{File: path}
		if err := checkFile(w, path, &form); err != nil {
			fmt.Fprintf(c.stderr, "holdfast: %s\n", oneLine(err))
			status = exitBadInput
			form = fileForm{File: path, Kind: form.Kind, Error: oneLine(err)}
		}
		forms.Files = append(forms.Files, form)
	}
	if c.json {
		return status, c.emit(forms)
	}
	return status, nil
}

// fileKind tells what a file describes.
type fileKind string

const (
	profileKind fileKind = "profile"
	deviceKind  fileKind = "device"
	briefKind   fileKind = "brief"
	pulseKind   fileKind = "pulse"
)

// checkFile describes one file on w, and in form.
func checkFile(w io.Writer, path string, form *fileForm) error {
	kind, err := kindOf(path)
	if err != nil {
		return err
	}
	form.Kind = string(kind)
	switch kind {
	case profileKind:
		p, err := hardware.Load(path)
		if err != nil {
			return err
		}
		if err := describeProfile(w, p); err != nil {
			return err
		}
		form.Profile, err = profileFormOf(p)
		return err
	case deviceKind:
		d, err := device.Load(path)
		if err != nil {
			return err
		}
		describeDevice(w, d)
		form.Device = deviceFormOf(d)
		return nil
	case briefKind:
		b, p, d, err := brief.LoadAll(path)
		if err != nil {
			return inBrief(path, err)
		}
		form.Brief, err = describeBrief(w, b, p, d)
		return err
	}
	return fmt.Errorf("%s: found a pulse's record; allowed: a profile, a device or a brief ('holdfast replay' takes the record's folder)", path)
}

// kindOf recognises a file by the tables that only its kind has.
func kindOf(path string) (fileKind, error) {
	if info, err := os.Stat(filepath.Join(path, hardware.RecordName)); err == nil && info.Mode().IsRegular() {
		return "", fmt.Errorf("%s: found a pulse folder; allowed: a profile, a device or a brief ('holdfast replay' takes the folder)", path)
	}
	kind, err := brief.KindOf(path)
	if err != nil {
		return "", err
	}
	switch kind {
	case brief.RecordFile:
		return pulseKind, nil
	case brief.ProfileFile:
		return profileKind, nil
	case brief.DeviceFile:
		return deviceKind, nil
	case brief.BriefFile:
		return briefKind, nil
	}
	return "", fmt.Errorf("%s: found none of the tables that tell what a file is; allowed: [instrument] in a profile, [[site]] in a device, [target] in a brief", path)
}

// inBrief says which brief led to the complaint when it is about another file.
func inBrief(path string, err error) error {
	if e := (*quantity.Error)(nil); errors.As(err, &e) && e.File == path {
		return err
	}
	return fmt.Errorf("%s: what it names is at fault: %w", path, err)
}

// describeDevice says what is driven, and what waiting costs.
func describeDevice(w io.Writer, d *device.Device) {
	fmt.Fprintf(w, "%s: device %q\n", d.File, d.Name)
	for _, s := range d.Sites {
		list := []fact{
			{"|0>", fmt.Sprintf("the %s of the two energies, and the +1 state of Z", s.Zero)},
			{"transition", stated(s.Frequency, quantity.Frequency)},
			{"detuning", detuningInWords(s)},
		}
		for _, drive := range d.Drives {
			if drive.Site == s.Name {
				list = append(list, fact{"driven by", fmt.Sprintf("channel %q of the hardware profile", drive.Channel)})
			}
		}
		for _, bias := range d.Biases {
			if bias.Site == s.Name {
				list = append(list, fact{"turned by", fmt.Sprintf("channel %q of the hardware profile, about %s", bias.Channel, bias.Axis)})
			}
		}
		list = append(list, fact{"T1", stated(s.T1, quantity.Time)}, fact{"T2", stated(s.T2, quantity.Time)})
		if loss := decoherence(s, 100); loss > 0 {
			list = append(list, fact{"decoherence", fmt.Sprintf("adds %.3g to the infidelity for every 100 ns of a gate, whatever the pulse: T/6 (1/T1 + 2/T2)%s", loss, unstatedT(s))})
		} else {
			list = append(list, fact{"decoherence", "is left out of every figure, as neither T1 nor T2 is stated"})
		}
		fmt.Fprintf(w, "\nsite %q, %d levels\n", s.Name, s.Levels)
		printFacts(w, list)
	}
}

// detuningInWords says where the transition lies and what that adds.
func detuningInWords(s device.Site) string {
	f := quantity.Format(s.Detuning/(2*math.Pi), quantity.Frequency)
	if s.Detuning == 0 {
		return f + " of the transition from the frame of the drive"
	}
	sign := ""
	if s.Zero == device.Lower {
		sign = "-"
	}
	return fmt.Sprintf("%s of the transition from the frame of the drive (positive: above it), constant: as |0> is the %s energy, it adds %s2 pi f Z/2", f, s.Zero, sign)
}

// unstatedT says what is taken for the one of T1 and T2 that the device does not state.
func unstatedT(s device.Site) string {
	switch {
	case s.T2 == 0:
		return " with T2 = 2 T1, the longest that it can be, as it is not stated"
	case s.T1 == 0:
		return " with T1 endless, as it is not stated"
	}
	return ""
}

// decoherence is what a gate of T ns loses, as replay has it.
func decoherence(s device.Site, T float64) float64 { return replay.Decoherence(T, s.T1, s.T2) }

// belowRounding warns of limits that rounding to codes can break by itself: the search keeps them
// before rounding only, and the finished codes are judged.
func belowRounding(p *hardware.Profile, samples int) (warn []string) {
	for c := range p.Channels {
		set, err := p.Playable(c, samples)
		if err != nil {
			continue // said elsewhere
		}
		for _, l := range []struct {
			name string
			kept bool
		}{{"ring_out", set.Reserved}, {"out_of_band", set.OutOfBandReserved}} {
			if !l.kept {
				warn = append(warn, fmt.Sprintf("Channel %q: rounding to %d bit can use more than a fifth of %s by itself: the search keeps the limit before rounding, and the codes may break it.", p.Channels[c].Name, p.Bits, l.name))
			}
		}
	}
	return warn
}

// stated formats a figure of which zero says that the file is silent.
func stated(v float64, k quantity.Kind) string {
	if v == 0 {
		return "not stated"
	}
	return quantity.Format(v, k)
}

// describeBrief says what is wanted, and whether there is room for it, in words and as a form.
func describeBrief(w io.Writer, b *brief.Brief, p *hardware.Profile, d *device.Device) (*briefForm, error) {
	site, channels, words := driven(b, p, d)
	ch := &p.Channels[channels[0]]
	samples := int(math.Round(b.Span / p.SamplePeriod))
	for _, c := range channels {
		if _, err := p.Playable(c, samples); err != nil {
			return nil, fmt.Errorf("%s: %w", b.File, err)
		}
	}
	r, err := roomOf(b, p, d, channels, samples)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", b.File, err)
	}
	fmt.Fprintf(w, "%s: brief %q\n\n", b.File, b.Name)
	list := []fact{
		{"profile", fmt.Sprintf("%s, %q", p.File, p.Name)},
		{"device", fmt.Sprintf("%s, %q", d.File, d.Name)},
		{"target", targetInWords(b.Target)},
		{"span", fmt.Sprintf("%s: %s in %s of %d; %d held at zero before and %d after, %d free",
			quantity.Format(b.Span, quantity.Time), count(samples, "sample"), count(samples/p.Block, "block"), p.Block, ch.GuardLead, ch.GuardTrail, r.free)},
		{"ends", endsInWords(b.Ends)},
		{"held against", heldInWords(b)},
		{"equations", r.String()},
		{"requires", requiredInWords(b)},
		{"search", searchInWords(b)},
	}
	for i, line := range words {
		name := "drive"
		if i > 0 {
			name = ""
		}
		list = append(list, fact{name, line})
	}
	if z := b.Target.FreeZ; z != brief.NoFreeZ && z != "" {
		list = append(list, fact{"free Z", fmt.Sprintf("rotations about Z cost nothing %s the gate: the design chooses them, the record says which", map[string]string{
			brief.Before: "before", brief.After: "after", brief.Both: "before and after"}[z])})
	}
	if len(b.Phases) > 0 {
		var angles []string
		for _, a := range b.Phases {
			angles = append(angles, quantity.Format(a, quantity.Angle))
		}
		list = append(list, fact{"phases", "the gate is written turned about Z by " + strings.Join(angles, ", ")})
	}
	if loss := decoherence(site, b.Span); loss > 0 {
		list = append(list, fact{"decoherence", fmt.Sprintf("adds %.3g to the infidelity in this span, whatever the pulse", loss)})
	}
	printFacts(w, list)
	var warn []string
	if r.verdict != "" {
		warn = append(warn, r.verdict)
	}
	if n := b.Basis.Coefficients; n > 0 && n != r.perQuad {
		warn = append(warn, fmt.Sprintf("basis.coefficients = %d has no effect: without a band below half the sample rate every free sample is a coefficient.", n))
	}
	if loss := decoherence(site, b.Span); loss > b.Require.Infidelity {
		warn = append(warn, fmt.Sprintf("Decoherence alone costs %.3g, more than the infidelity of %.3g that is required: the requirement is judged without it, a bench will not see it met.", loss, b.Require.Infidelity))
	}
	warn = append(warn, belowRounding(p, samples)...)
	if off := site.Frequency - ch.Carrier; ch.Kind != hardware.Baseband && site.Frequency > 0 && ch.Carrier > 0 {
		stated := site.Detuning / (2 * math.Pi)
		if !(math.Abs(off-stated) <= 1e-6*site.Frequency) {
			side := "above"
			if off < 0 {
				side = "below"
			}
			warn = append(warn, fmt.Sprintf("The transition, %s, lies %s %s the carrier, %s, and the device states a detuning of %s (positive: above): the pulse is designed for the detuning.",
				quantity.Format(site.Frequency, quantity.Frequency), quantity.Format(math.Abs(off), quantity.Frequency), side, quantity.Format(ch.Carrier, quantity.Frequency), quantity.Format(stated, quantity.Frequency)))
		}
	}
	printCautions(w, warn)
	return briefFormOf(b, p, samples, r, decoherence(site, b.Span), warn), nil
}

// driven finds the site of the target, the channels that turn it, and says what each does there. brief.LoadAll has seen to it that
// all exist and that there is one.
func driven(b *brief.Brief, p *hardware.Profile, d *device.Device) (site device.Site, channels []int, words []string) {
	for _, s := range d.Sites {
		if s.Name == b.Target.Site {
			site = s
		}
	}
	for i, drive := range d.Drives {
		c, ok := p.Channel(drive.Channel)
		if drive.Site != site.Name || !ok {
			continue
		}
		ch := &p.Channels[c]
		sign, sense := "+", "+"
		if imag(d.Operators(i, string(ch.Mixing))[1].At(0, 1)) > 0 { // +Y/2 has -i/2 there
			sign = "-"
		}
		if site.Zero == device.Lower {
			sense = "-"
		}
		channels = append(channels, c)
		words = append(words, fmt.Sprintf("%q mixes %s, and |0> of %s is the %s energy: I turns about +X and Q about %sY, in the frame that turns about %sZ with the carrier (%s)",
			ch.Name, ch.Mixing, site.Name, site.Zero, sign, sense, carrier(ch)))
	}
	for _, bias := range d.Biases {
		c, ok := p.Channel(bias.Channel)
		if bias.Site != site.Name || !ok {
			continue
		}
		channels = append(channels, c)
		words = append(words, fmt.Sprintf("%q turns about +%s by what it puts out, without a carrier", bias.Channel, bias.Axis))
	}
	return site, channels, words
}

func carrier(ch *hardware.Channel) string {
	if ch.Carrier == 0 {
		return "its frequency is not stated"
	}
	return quantity.Format(ch.Carrier, quantity.Frequency)
}

// targetInWords names the gate, and says its rotation where the name does not.
func targetInWords(t brief.Target) string {
	words := fmt.Sprintf("%s on %s", t.Label, t.Site)
	if turn := t.Turn(); turn != t.Label {
		words += ": " + turn
	}
	return words
}

func endsInWords(ends string) string {
	if ends == brief.Window {
		return "window: what arrives after the span is left out of the gate"
	}
	return "settled: what still arrives after the span is part of the gate"
}

// sizeInWords gives the size of an error: a rotation frequency, a share, or an angle.
func sizeInWords(kind string, size float64) string {
	switch kind {
	case brief.Amplitude, brief.Line, brief.Offset:
		return quantity.Format(size, quantity.Ratio)
	case brief.Skew:
		return quantity.Format(size, quantity.Angle)
	}
	return quantity.Format(size/(2*math.Pi), quantity.Frequency)
}

func heldInWords(b *brief.Brief) string {
	if len(b.Errors) == 0 {
		return `nothing (hold = "nothing")`
	}
	var list []string
	for _, e := range b.Errors {
		s := fmt.Sprintf("%s up to %s", e.Name, sizeInWords(e.Kind, e.Size))
		if e.Weight != 1 {
			s += fmt.Sprintf(" with weight %.4g", e.Weight)
		}
		list = append(list, s)
	}
	words := strings.Join(list, ", ")
	if b.Defaulted {
		words += " (the brief names none, so these)"
	}
	return words
}

func requiredInWords(b *brief.Brief) string {
	words := fmt.Sprintf("infidelity at most %.3g", b.Require.Infidelity)
	if len(b.Errors) > 0 {
		words += fmt.Sprintf(", susceptibility at most %.3g of each held error", b.Require.Susceptibility)
	}
	for _, m := range b.Require.Margins {
		kind := marginKind(b, m.Error)
		words += fmt.Sprintf(", that infidelity up to ±%s of %s", sizeInWords(kind, m.Size), m.Error)
	}
	return words
}

// marginKind is the kind of the error that a margin names.
func marginKind(b *brief.Brief, name string) string {
	for _, e := range b.Errors {
		if e.Name == name {
			return e.Kind
		}
	}
	if name == "amplitude" {
		return brief.Amplitude
	}
	return brief.Static
}

func searchInWords(b *brief.Brief) string {
	words := fmt.Sprintf("up to %s, seed %d", count(b.Starts, "start"), b.Seed)
	switch {
	case len(b.Errors) == 0:
	case b.Refine:
		words += ", refined for errors of the sizes above"
	default:
		words += ", not refined: held in first order only"
	}
	return words
}

// count writes a number with its noun.
func count(n int, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return fmt.Sprintf("%d %ss", n, noun)
}

// printFacts writes names and values in two columns.
func printFacts(w io.Writer, list []fact) {
	const widest = 110
	names := 0
	for _, f := range list {
		names = max(names, len(f.Name))
	}
	for _, f := range list {
		fmt.Fprintf(w, "  %-*s  %s\n", names, f.Name, wrap(f.Value, widest-names-4, names+4))
	}
}

// printCautions writes one sentence a line.
func printCautions(w io.Writer, list []string) {
	for _, s := range list {
		fmt.Fprintf(w, "  ! %s\n", wrap(s, 106, 4))
	}
}

// wrap breaks text between words after width characters and indents what follows.
func wrap(text string, width, indent int) string {
	var b strings.Builder
	col := 0
	for i, word := range strings.Fields(text) {
		n := len([]rune(word))
		switch {
		case i == 0:
		case col+1+n > width:
			b.WriteString("\n" + strings.Repeat(" ", indent))
			col = 0
		default:
			b.WriteByte(' ')
			col++
		}
		b.WriteString(word)
		col += n
	}
	return b.String()
}

// steady is the line's gain for a steady input.
func steady(ch *hardware.Channel) float64 { return cmplx.Abs(ch.Line.DC()) }
