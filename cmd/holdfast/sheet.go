package main

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"
	"slices"

	"holdfast/design"
	"holdfast/design/brief"
	"holdfast/design/datasheet"
	"holdfast/design/device"
	"holdfast/design/replay"
	"holdfast/design/rival"
	"holdfast/filter"
	"holdfast/hardware"
	"holdfast/hardware/quantity"
)

// newSheet gathers what the datasheet and the text say about a pulse.
func newSheet(ctx context.Context, in design.Inputs, r *design.Record, folder *replay.Folder, v *replay.Verdict) (*datasheet.Sheet, error) {
	m := folder.Model
	s := &datasheet.Sheet{
		Name: r.Pulse.Name, Target: r.Pulse.Target, Span: m.Span(), Ends: m.Ends, Held: r.Pulse.Held,
		Instrument: in.Profile.Name, SamplePeriod: m.SamplePeriod, Bits: m.Bits, WindowStart: m.WindowStart,
		T1: folder.T1, T2: folder.T2, Required: folder.Require.Infidelity, Verdict: v,
		CoefficientsI: r.Basis.I,
	}
	several := len(in.Device.Sites) > 1
	if several {
		s.Sites = sheetSites(in.Device, r, folder)
		for _, c := range r.Basis.More {
			s.Further = append(s.Further, datasheet.Coefficients{Channel: c.Channel, I: c.I, Q: c.Q})
		}
	} else {
		s.Detuning = detuningOf(m) / (2 * math.Pi) * 1e3
	}
	for _, t := range m.Dropped {
		s.LeftOut = append(s.LeftOut, t.Frequency/(2*math.Pi)*1e3)
	}
	if r.Pulse.Status != string(design.Found) {
		s.Status = r.Pulse.Status
	}
	channels := make([]int, len(m.Channels)) // of the profile
	for i := range m.Channels {
		c, ok := in.Profile.Channel(m.Channels[i].Name)
		if !ok {
			return nil, fmt.Errorf("%s: channel %q is not in the profile that the folder keeps", folder.Dir, m.Channels[i].Name)
		}
		channels[i] = c
		s.Channels = append(s.Channels, sheetChannel(&in.Profile.Channels[c], &m.Channels[i], m.SamplePeriod))
	}
	if m.Channels[0].Kind != hardware.Baseband {
		s.CoefficientsQ = r.Basis.Q
	}
	s.Cautions = sheetCautions(in.Profile, channels)
	s.Basis = []datasheet.Row{
		{Name: "family", Value: r.Basis.Family},
		{Name: "coefficients per quadrature", Value: fmt.Sprint(r.Basis.PerQuad)},
	}
	if r.Basis.Band != "" {
		s.Basis = append(s.Basis, datasheet.Row{Name: "band either side", Value: r.Basis.Band})
	}
	equations := fmt.Sprintf("%d for %d coefficients", r.Search.Equations, len(s.CoefficientsI)+len(s.CoefficientsQ))
	if len(m.Channels) > 1 {
		first := fmt.Sprintf(", %q", m.Channels[0].Name)
		for i := range s.Basis {
			s.Basis[i].Name += first
		}
		equations = fmt.Sprint(r.Search.Equations)
	}
	s.Search = []datasheet.Row{
		{Name: "status", Value: r.Pulse.Status},
		{Name: "random seed", Value: fmt.Sprint(r.Search.Seed)},
		{Name: "starts", Value: fmt.Sprintf("%d tried of %d allowed, %d at a zero, number %d kept", r.Search.Tried, r.Search.Starts, r.Search.Successes, r.Search.Winner)},
		{Name: "equations", Value: equations},
		{Name: "evaluations", Value: fmt.Sprint(r.Search.Evaluations)},
		{Name: "sum of squared residuals", Value: fmt.Sprintf("%.2g", r.Search.Miss)},
		{Name: "infidelity before rounding", Value: smallFigure(r.Search.Before)},
	}
	s.Provenance = []datasheet.Row{
		{Name: "program", Value: r.Provenance.Program + " " + r.Provenance.Version},
		{Name: "instrument", Value: r.Provenance.Instrument},
		{Name: "device", Value: r.Provenance.Device},
		{Name: "site", Value: r.Provenance.Site},
	}
	if several {
		s.Provenance[3] = datasheet.Row{Name: "sites", Value: siteNames(in.Device)}
	}
	for _, f := range playback(r, in.Device) {
		if f.site == "" { // those of several sites have a table
			s.Provenance = append(s.Provenance, datasheet.Row(f.fact))
		}
	}
	for _, f := range r.Files {
		s.Files = append(s.Files, datasheet.Row{Name: f.Name, Value: f.SHA256})
	}
	if several || m.Target == nil {
		s.NoRivals = noRivals
		return s, nil
	}
	var err error
	s.Rivals, err = rivals(ctx, in, channels, folder, v)
	return s, err
}

// noRivals says why no textbook pulses stand beside a pulse.
const noRivals = "No textbook pulse stands beside this one: those that are known here make a gate on the one site that they drive."

// sheetSites gathers what is told of each of several sites.
func sheetSites(d *device.Device, r *design.Record, folder *replay.Folder) []datasheet.Site {
	list := make([]datasheet.Site, len(d.Sites))
	for i, site := range d.Sites {
		list[i] = datasheet.Site{Name: site.Name}
		for _, x := range folder.Decay {
			if x.Site == site.Name {
				alone := *folder
				alone.Decay = []replay.Decay{x}
				list[i].T1, list[i].T2, list[i].Loss = x.T1, x.T2, alone.Decoherence()
			}
		}
	}
	for _, t := range turns(r, d) {
		at := &list[t.site].Before
		if t.after {
			at = &list[t.site].After
		}
		*at = t.words
	}
	return list
}

// sheetChannel gathers what one channel plays, and what arrives of it.
func sheetChannel(ch *hardware.Channel, played *replay.Channel, period float64) datasheet.Channel {
	c := datasheet.Channel{
		Name: ch.Name, Baseband: ch.Kind == hardware.Baseband,
		FullScale: ch.FullScale / (2 * math.Pi) * 1e3, FullScaleLevel: ch.FullScaleLevel, Band: ch.Band,
		GuardLead: ch.GuardLead, GuardTrail: ch.GuardTrail, AmplitudeLimit: ch.AmplitudeLimit, RingOutLimit: ch.RingOut.Limit,
		Samples: played.Samples, LineFacts: ch.Sections,
	}
	enters := played.Samples
	if ch.Compression != nil {
		c.Reached = make([]complex128, len(enters))
		for k, x := range enters {
			c.Reached[k] = played.Compressed(x)
		}
		enters = c.Reached
	}
	c.Arrives = arrivals(ch.Line, enters, period, played.Delay)
	if dc := ch.Line.DC(); dc != 0 {
		c.Line = func(mhz float64) complex128 { return ch.Line.Response(2*math.Pi*mhz*1e-3) / dc }
	}
	for _, f := range lineFigures(ch.Line) {
		c.LineFigures = append(c.LineFigures, datasheet.Row(f))
	}
	return c
}

// detuningOf gives the factor of Z/2 in the static part of the two lowest levels, rad/ns.
func detuningOf(m *replay.Model) float64 { return real(m.Static[0] - m.Static[m.Dim+1]) }

func smallFigure(v float64) string {
	if v < 1e-9 {
		return "< 1e-9 in this model"
	}
	return fmt.Sprintf("%.2g", v)
}

// arrivals samples what the device sees of samples that enter a line, from a little before the first arrives at start to
// well after the last has.
func arrivals(l filter.Line, x []complex128, h, start float64) []datasheet.Arrival {
	const perSample, before, after = 8, 2.0, 40.0 // ns around the span
	step := h / perSample
	var times []float64
	for t := 0.0; t <= float64(len(x))*h+after; t += step {
		times = append(times, t)
	}
	list := []datasheet.Arrival{{Time: start - before}}
	for i, u := range l.Held(x, h, times, nil) {
		list = append(list, datasheet.Arrival{Time: start + times[i], U: u})
	}
	return list
}

// turnOf gives the rotation that a textbook pulse of a quadrature channel has to make for a target about an axis in the XY plane: which way Q turns and which way the
// device runs from the drive is in the model's operators and its static part.
func turnOf(t brief.Target, m *replay.Model, channel int) rival.Turn {
	turn := rival.Turn{Angle: t.Angle, Phase: math.Atan2(t.Axis[1], t.Axis[0]), Slope: detuningOf(m)}
	if turn.Angle < 0 {
		turn.Angle, turn.Phase = -turn.Angle, turn.Phase+math.Pi
	}
	if imag(m.Channels[channel].Operators[1][1]) > 0 { // -Y/2 has i/2 at (0, 1)
		turn.Phase, turn.Slope = -turn.Phase, -turn.Slope
	}
	return turn
}

// rivals calibrates the textbook pulses and has replay judge them as it judged
// the pulse. The first quadrature channel plays them, all others are silent; only
// a rotation about an axis that a drive can turn about has some. channels are the
// profile's numbers of the model's.
func rivals(ctx context.Context, in design.Inputs, channels []int, folder *replay.Folder, v *replay.Verdict) ([]datasheet.Rival, error) {
	t, m := in.Brief.Target, folder.Model
	drive := slices.IndexFunc(m.Channels, func(c replay.Channel) bool { return c.Kind == hardware.Quadrature })
	if t.Angle == 0 || math.Abs(t.Axis[2]) > 1e-9 || drive < 0 {
		return nil, nil
	}
	profile, stated := withRingOut(in.Profile, channels[drive])
	compression := profile.Channels[channels[drive]].Compression
	// What is reached, as package rival has it, is played so that compression makes it of what the converter puts out.
	atConverter := func(y []complex128) []complex128 {
		x := make([]complex128, len(y))
		for k, v := range y {
			x[k] = compression.Converter(v)
		}
		return x
	}
	played := func(x []complex128) *replay.Model {
		list := make([][]complex128, drive+1)
		list[drive] = x
		return m.WithSamples(len(x), list...)
	}
	figures := func(o *replay.Model) (replay.Figures, error) {
		settled, window, _, err := o.Figures(ctx)
		if m.Ends == brief.Window {
			return window, err
		}
		return settled, err
	}
	list, err := rival.Make(in.Profile, channels[drive], turnOf(t, m, drive), func(y []complex128) (float64, error) {
		f, err := figures(played(atConverter(y)))
		return f.Infidelity, err
	})
	if err != nil {
		return nil, err
	}
	var out []datasheet.Rival
	for _, r := range list {
		x := atConverter(r.Samples)
		other := played(x)
		f, err := figures(other)
		if err != nil {
			return nil, err
		}
		curves, err := other.Curves(ctx, folder.Require.Infidelity, v.Errors)
		if err != nil {
			return nil, err
		}
		d := datasheet.Rival{Name: r.Name, Span: other.Span(), Infidelity: f.Infidelity, Channel: drive, Samples: x, Errors: curves}
		if !math.IsNaN(v.Pair.Infidelity) { // free frames that one pulse cannot hand on to the next stop a rival too
			pair, err := other.Pair(ctx)
			if err != nil {
				return nil, err
			}
			d.PairInfidelity = pair.Infidelity
		}
		readings, err := profile.CheckSamples(channels[drive], r.Samples)
		if err != nil {
			return nil, err
		}
		for _, q := range readings {
			if q.Limit == hardware.RingOutFast || q.Limit == hardware.RingOutTail {
				d.RingOut = math.Max(d.RingOut, q.Found)
				d.BreaksRingOut = d.BreaksRingOut || stated && !q.OK
			}
		}
		out = append(out, d)
	}
	return out, nil
}

// withRingOut gives a profile of which the check reads the ring-out of a channel whether or not there is a limit, and whether there is one.
func withRingOut(p *hardware.Profile, channel int) (other *hardware.Profile, stated bool) {
	if !math.IsInf(p.Channels[channel].RingOut.Limit, 1) {
		return p, true
	}
	copied := *p
	copied.Channels = slices.Clone(p.Channels)
	copied.Channels[channel].RingOut = hardware.RingOut{Limit: 1, Tail: 1}
	return &copied, false
}

// fact is one figure with its name.
type fact struct{ Name, Value string }

// lineFigures says what a line does to a step.
func lineFigures(l filter.Line) []fact {
	if len(l.Terms) == 0 {
		return []fact{{"line", "lets everything through, with its delay"}}
	}
	f := l.StepFigures()
	ns := func(v float64) string { return quantity.Format(v, quantity.Time) }
	list := []fact{
		{"pure delay", ns(l.Delay)},
		{"corner (-3.01 dB)", quantity.Format(l.Corner(), quantity.Frequency)},
		{"10-90 % transition", ns(f.TransitionTime)},
		{"overshoot", fmt.Sprintf("%.2g %%", 100*f.Overshoot)},
		{"settles to 1 %", ns(f.Settling1pc)},
		{"settles to 0.1 %", ns(f.Settling01pc)},
		{"group delay beyond the pure one", ns(f.GroupDelay)},
	}
	if g := cmplx.Abs(l.DC()); math.Abs(g-1) > 1e-9 {
		list = append(list, fact{"steady gain", fmt.Sprintf("%.6g", g)})
	}
	return list
}

// sheetCautions are those of the channels that play: what is said of levels once for each, by name where there are several.
func sheetCautions(p *hardware.Profile, channels []int) []string {
	var list []string
	for _, c := range channels {
		level := cautions(p, c)[0]
		if len(channels) > 1 {
			level = fmt.Sprintf("%s: %s", p.Channels[c].Name, level)
		}
		list = append(list, level)
	}
	return append(list, cautions(p, channels[0])[1:]...)
}

// cautions are what must be said before someone connects a cable.
func cautions(p *hardware.Profile, channel int) []string {
	ch := &p.Channels[channel]
	level := "The profile does not state the level at full scale: measure it before connecting anything."
	if ch.FullScaleLevel > 0 {
		level = fmt.Sprintf("At full scale the connector puts out %s; what an amplifier adds comes on top.", quantity.Format(ch.FullScaleLevel, quantity.Voltage))
	}
	return []string{
		level,
		"Check this level against the ratings of every part of the line, the device included, before connecting it.",
		"Amplified RF and pulsed lasers burn and blind. Follow local rules and the people licensed for the installation.",
		"This program computes; it never switches anything on.",
	}
}
