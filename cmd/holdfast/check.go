package main

import (
	"errors"
	"fmt"
	"io"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"slices"
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

// describeDevice says what is driven, what couples it, and what waiting costs.
func describeDevice(w io.Writer, d *device.Device) {
	fmt.Fprintf(w, "%s: device %q\n", d.File, d.Name)
	if len(d.Sites) > 1 {
		fmt.Fprintln(w)
		printFacts(w, []fact{
			{"in all", fmt.Sprintf("%s, %d levels in their product, of which %d are the code space; %s", count(len(d.Sites), "site"), d.Dim(), len(d.CodeSpace()), count(len(d.Channels()), "channel"))},
			{"decoherence", waiting(together(d, 100), fmt.Sprintf("the sum over the sites of d/(d+1) T/4 (1/T1 + 2/T2), d = %d code states", len(d.CodeSpace())))},
		})
	}
	for i, s := range d.Sites {
		list := siteFacts(d, i)
		for _, drive := range d.Drives {
			if drive.Site == s.Name {
				list = append(list, fact{"driven by", fmt.Sprintf("channel %q of the hardware profile", drive.Channel)})
			}
		}
		for _, bias := range d.Biases {
			if bias.Site == s.Name {
				list = append(list, fact{"turned by", fmt.Sprintf("channel %q of the hardware profile, about %s%s", bias.Channel, bias.Axis, mapInWords(&bias))})
			}
		}
		list = append(list, fact{"T1", stated(s.T1, quantity.Time)}, fact{"T2", stated(s.T2, quantity.Time)})
		loss, how := decoherence(s, 100), "T/6 (1/T1 + 2/T2)"
		if len(d.Sites) > 1 {
			loss, how = together(d, 100, i), "its share of that of the device"
		}
		list = append(list, fact{"decoherence", waiting(loss, how+unstatedT(s))})
		fmt.Fprintf(w, "\nsite %q, %d levels\n", s.Name, s.Levels)
		printFacts(w, list)
	}
	for _, part := range []struct {
		title string
		facts []fact
	}{{"couplings", couplingFacts(d)}, {"crosstalk", crosstalkFacts(d)}} {
		if len(part.facts) > 0 {
			fmt.Fprintf(w, "\n%s\n", part.title)
			printFacts(w, part.facts)
		}
	}
}

// waiting says what decoherence costs a gate of 100 ns.
func waiting(loss float64, how string) string {
	if loss > 0 {
		return fmt.Sprintf("adds %.3g to the infidelity for every 100 ns of a gate, whatever the pulse: %s", loss, how)
	}
	return "is left out of every figure, as neither T1 nor T2 is stated"
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

// together is what a gate of T ns on all sites of a device loses, as replay has it, or what the given ones contribute to that.
func together(d *device.Device, T float64, only ...int) float64 {
	f := replay.Folder{Model: &replay.Model{SamplePeriod: T, Samples: 1, CodeSpace: d.CodeSpace()}}
	for i, s := range d.Sites {
		if len(only) == 0 || slices.Contains(only, i) {
			f.Decay = append(f.Decay, replay.Decay{Site: s.Name, T1: s.T1, T2: s.T2})
		}
	}
	return f.Decoherence()
}

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
	if b.PhaseBy == brief.BySamples && (len(d.Sites) > 1 || b.Target.From != nil) { // as design has it
		return nil, fmt.Errorf(`%s: phase_by: found "samples" for several sites, or for states; allowed: for a gate on a device of one site, or phase_by = "instrument"`, b.File)
	}
	driven := drivenBy(p, d)
	ch := &p.Channels[driven[0].channel]
	var channels []int
	samples := int(math.Round(b.Span / p.SamplePeriod))
	for _, x := range driven {
		channels = append(channels, x.channel)
		if _, err := p.Playable(x.channel, samples); err != nil {
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
		{"target", targetInWords(b.Target, d)},
		{"span", fmt.Sprintf("%s: %s in %s of %d; %d held at zero before and %d after, %d free",
			quantity.Format(b.Span, quantity.Time), count(samples, "sample"), count(samples/p.Block, "block"), p.Block, ch.GuardLead, ch.GuardTrail, r.free)},
		{"ends", endsInWords(b.Ends)},
		{"held against", heldInWords(b, d)},
		{"equations", r.String()},
		{"requires", requiredInWords(b)},
		{"search", searchInWords(b)},
	}
	for i, x := range driven {
		name := "drive"
		if i > 0 {
			name = ""
		}
		list = append(list, fact{name, x.words})
	}
	if z := b.Target.FreeZ; z != brief.NoFreeZ && z != "" {
		of := ""
		if len(d.Sites) > 1 {
			of = " of every site"
		}
		list = append(list, fact{"free Z", fmt.Sprintf("rotations about Z%s cost nothing %s the gate: the design chooses them, the record says which", of, map[string]string{
			brief.Before: "before", brief.After: "after", brief.Both: "before and after"}[z])})
	}
	if b.Target.Local {
		list = append(list, fact{"free", "every rotation of a single site costs nothing before and after the gate: the design chooses them, the record says which"})
	}
	if len(b.Phases) > 0 {
		var angles []string
		for _, a := range b.Phases {
			angles = append(angles, quantity.Format(a, quantity.Angle))
		}
		list = append(list, fact{"phases", "the gate is written turned about Z by " + strings.Join(angles, ", ")})
	}
	loss := together(d, b.Span)
	if loss > 0 {
		of := ""
		if len(d.Sites) > 1 {
			of = " on all sites"
		}
		list = append(list, fact{"decoherence", fmt.Sprintf("adds %.3g to the infidelity in this span%s, whatever the pulse", loss, of)})
	}
	printFacts(w, list)
	var warn []string
	if r.verdict != "" {
		warn = append(warn, r.verdict)
	}
	if n := b.Basis.Coefficients; n > 0 && n != r.perQuad {
		warn = append(warn, fmt.Sprintf("basis.coefficients = %d has no effect: without a band below half the sample rate every free sample is a coefficient.", n))
	}
	if loss > b.Require.Infidelity {
		warn = append(warn, fmt.Sprintf("Decoherence alone costs %.3g, more than the infidelity of %.3g that is required: the requirement is judged without it, a bench will not see it met.", loss, b.Require.Infidelity))
	}
	warn = append(warn, belowRounding(p, samples)...)
	for _, x := range driven {
		warn = append(warn, offCarrier(x.site, &p.Channels[x.channel], len(d.Sites) > 1)...)
	}
	printCautions(w, warn)
	return briefFormOf(b, p, d, samples, r, loss, warn), nil
}

// offCarrier warns of a transition that does not lie where the carrier and the detuning put it; named says which site it is.
func offCarrier(site *device.Site, ch *hardware.Channel, named bool) []string {
	off := site.Frequency - ch.Carrier
	if ch.Kind == hardware.Baseband || site.Frequency == 0 || ch.Carrier == 0 {
		return nil
	}
	stated := site.Detuning / (2 * math.Pi)
	if math.Abs(off-stated) <= 1e-6*site.Frequency {
		return nil
	}
	side, of := "above", ""
	if off < 0 {
		side = "below"
	}
	if named {
		of = " of " + site.Name
	}
	return []string{fmt.Sprintf("The transition%s, %s, lies %s %s the carrier, %s, and the device states a detuning of %s (positive: above): the pulse is designed for the detuning.", of,
		quantity.Format(site.Frequency, quantity.Frequency), quantity.Format(math.Abs(off), quantity.Frequency), side, quantity.Format(ch.Carrier, quantity.Frequency), quantity.Format(stated, quantity.Frequency))}
}

// A turner is a channel of the profile, the site that it is meant for, and what it does there.
type turner struct {
	site    *device.Site
	channel int
	words   string
}

// drivenBy finds the channels that act on a device. brief.LoadAll has seen to it that all exist and that there is one.
func drivenBy(p *hardware.Profile, d *device.Device) (list []turner) {
	several := len(d.Sites) > 1
	for i, drive := range d.Drives {
		c, ok := p.Channel(drive.Channel)
		s, known := d.Site(drive.Site)
		if !ok || !known {
			continue
		}
		site, ch := &d.Sites[s], &p.Channels[c]
		sign, sense, of := "+", "+", ""
		if imag(d.Operators(i, string(ch.Mixing))[1].At(0, 1)) > 0 { // +Y/2 has -i/2 there
			sign = "-"
		}
		if site.Zero == device.Lower {
			sense = "-"
		}
		if several {
			of = " of " + site.Name
		}
		list = append(list, turner{site, c, fmt.Sprintf("%q mixes %s, and |0> of %s is the %s energy: I turns about +X and Q about %sY%s, in the frame that turns about %sZ with the carrier (%s)",
			ch.Name, ch.Mixing, site.Name, site.Zero, sign, of, sense, carrier(ch))})
	}
	for _, bias := range d.Biases {
		c, ok := p.Channel(bias.Channel)
		s, known := d.Site(bias.Site)
		if !ok || !known {
			continue
		}
		of := ""
		if several {
			of = " of " + bias.Site
		}
		list = append(list, turner{&d.Sites[s], c, fmt.Sprintf("%q turns about +%s%s by what it puts out, without a carrier", bias.Channel, bias.Axis, of)})
	}
	return list
}

func carrier(ch *hardware.Channel) string {
	if ch.Carrier == 0 {
		return "its frequency is not stated"
	}
	return quantity.Format(ch.Carrier, quantity.Frequency)
}

// targetInWords names the gate, or the states, and says its rotation where the name does not.
func targetInWords(t brief.Target, d *device.Device) string {
	switch {
	case len(t.From) > 1:
		return fmt.Sprintf("%s, the span of these %d states of %s to that of the others", t.Label, len(t.From), siteNames(d))
	case t.From != nil:
		return fmt.Sprintf("%s, states of %s", t.Label, siteNames(d))
	}
	words := fmt.Sprintf("%s on %s", t.Label, strings.Join(t.Sites, ", "))
	if turn := t.Turn(); len(t.Sites) == 1 && turn != t.Label {
		words += ": " + turn
	}
	if t.Local {
		words += ", up to local rotations"
	}
	var others []string
	for _, s := range d.Sites {
		if !slices.Contains(t.Sites, s.Name) {
			others = append(others, s.Name)
		}
	}
	if len(others) > 0 {
		words += "; to be left alone: " + strings.Join(others, ", ")
	}
	return words
}

// siteNames lists the sites of a device.
func siteNames(d *device.Device) string {
	var names []string
	for _, s := range d.Sites {
		names = append(names, s.Name)
	}
	return strings.Join(names, ", ")
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
	case brief.Amplitude, brief.Line, brief.Offset, brief.Crosstalk:
		return quantity.Format(size, quantity.Ratio)
	case brief.Skew:
		return quantity.Format(size, quantity.Angle)
	}
	return quantity.Format(size/(2*math.Pi), quantity.Frequency)
}

func heldInWords(b *brief.Brief, d *device.Device) string {
	if len(b.Errors) == 0 {
		return `nothing (hold = "nothing")`
	}
	var list []string
	for _, e := range b.Errors {
		s := e.Name
		if e.Kind == brief.Any && !plainSpin(b, d) {
			s += fmt.Sprintf(" (%s%s)", count(len(e.Members), "operator"), weighed(&e))
		}
		switch {
		case e.Noise != nil:
			s += fmt.Sprintf(", noise of %s rms", sizeInWords(e.Kind, math.Sqrt(e.Noise.Variance())))
		case e.Spread != "" && len(e.Values) > 0:
			s += fmt.Sprintf(", the %s over %s", e.Spread, count(len(e.Values), "size"))
		case e.Spread != "":
			s += fmt.Sprintf(", the %s over a spread of %s", e.Spread, sizeInWords(e.Kind, e.Size))
		default:
			s += " up to " + sizeInWords(e.Kind, e.Size)
		}
		if e.Order == 2 {
			s += " to second order"
		}
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

// weighed says where the weights of the operators of a class come from.
func weighed(e *brief.Error) string {
	if e.Rates == "" {
		return ""
	}
	return ", weighed by " + e.Rates
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
