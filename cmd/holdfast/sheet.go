package main

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"

	"holdfast/design"
	"holdfast/design/datasheet"
	"holdfast/design/replay"
	"holdfast/design/rival"
	"holdfast/filter"
	"holdfast/hardware"
	"holdfast/hardware/quantity"
)

// newSheet gathers what the datasheet and the text say about a pulse.
func newSheet(ctx context.Context, in design.Inputs, r *design.Record, folder *replay.Folder, v *replay.Verdict) (*datasheet.Sheet, error) {
	m := folder.Model
	channel, ok := in.Profile.Channel(m.Channels[0].Name)
	if !ok {
		return nil, fmt.Errorf("%s: channel %q is not in the profile that the folder keeps", folder.Dir, m.Channels[0].Name)
	}
	ch := &in.Profile.Channels[channel]
	span := m.Span()
	s := &datasheet.Sheet{
		Name: r.Pulse.Name, Target: r.Pulse.Target, Span: span, Ends: m.Ends, Held: r.Pulse.Held,
		Instrument: in.Profile.Name, Channel: ch.Name, SamplePeriod: m.SamplePeriod, Bits: m.Bits,
		FullScale: ch.FullScale / (2 * math.Pi) * 1e3, FullScaleLevel: ch.FullScaleLevel, Band: ch.Band,
		GuardLead: ch.GuardLead, GuardTrail: ch.GuardTrail, AmplitudeLimit: ch.AmplitudeLimit, RingOutLimit: ch.RingOut.Limit,
		WindowStart: m.WindowStart, Samples: m.Channels[0].Samples,
		T1: folder.T1, T2: folder.T2, Required: folder.Require.Infidelity, Verdict: v,
		LineFacts: ch.Sections, CoefficientsI: r.Basis.I, CoefficientsQ: r.Basis.Q,
		Cautions: cautions(in.Profile, channel),
	}
	if r.Pulse.Status != string(design.Found) {
		s.Status = r.Pulse.Status
	}
	s.Arrives = arrivals(ch.Line, s.Samples, m.SamplePeriod, m.WindowStart)
	if dc := ch.Line.DC(); dc != 0 {
		s.Line = func(mhz float64) complex128 { return ch.Line.Response(2*math.Pi*mhz*1e-3) / dc }
	}
	for _, f := range lineFigures(ch.Line) {
		s.LineFigures = append(s.LineFigures, datasheet.Row(f))
	}
	s.Basis = []datasheet.Row{
		{Name: "family", Value: r.Basis.Family},
		{Name: "coefficients per quadrature", Value: fmt.Sprint(r.Basis.PerQuad)},
	}
	if r.Basis.Band != "" {
		s.Basis = append(s.Basis, datasheet.Row{Name: "band either side", Value: r.Basis.Band})
	}
	s.Search = []datasheet.Row{
		{Name: "status", Value: r.Pulse.Status},
		{Name: "random seed", Value: fmt.Sprint(r.Search.Seed)},
		{Name: "starts", Value: fmt.Sprintf("%d tried of %d allowed, %d at a zero, number %d kept", r.Search.Tried, r.Search.Starts, r.Search.Successes, r.Search.Winner)},
		{Name: "equations", Value: fmt.Sprintf("%d for %d coefficients", r.Search.Equations, 2*r.Basis.PerQuad)},
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
	for _, f := range r.Files {
		s.Files = append(s.Files, datasheet.Row{Name: f.Name, Value: f.SHA256})
	}
	var err error
	s.Rivals, err = rivals(ctx, in, channel, folder, v)
	return s, err
}

func smallFigure(v float64) string {
	if v < 1e-9 {
		return "< 1e-9 in this model"
	}
	return fmt.Sprintf("%.2g", v)
}

// arrivals samples what the device sees, from a little before the window to
// well after it.
func arrivals(l filter.Line, x []complex128, h, start float64) []datasheet.Arrival {
	const perSample, before, after = 8, 2.0, 40.0 // ns around the window
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

// rivals calibrates the textbook pulses and has replay judge them as it judged
// the pulse. Only a rotation about an axis that the drive can turn about has
// some.
func rivals(ctx context.Context, in design.Inputs, channel int, folder *replay.Folder, v *replay.Verdict) ([]datasheet.Rival, error) {
	t := in.Brief.Target
	if t.Angle == 0 || math.Abs(t.Axis[2]) > 1e-9 {
		return nil, nil
	}
	m := folder.Model
	// the operators say which way Q turns
	sign := 1.0
	if imag(m.Channels[0].Operators[1][1]) > 0 { // +Y/2 has -i/2 at (0, 1)
		sign = -1
	}
	phase := sign * math.Atan2(t.Axis[1], t.Axis[0])
	figures := func(x []complex128) (replay.Figures, error) {
		settled, window, _, err := m.WithSamples(len(x), x).Figures(ctx)
		if m.Ends == "window" {
			return window, err
		}
		return settled, err
	}
	list, err := rival.Make(in.Profile, channel, t.Angle, phase, func(x []complex128) (float64, error) {
		f, err := figures(x)
		return f.Infidelity, err
	})
	if err != nil {
		return nil, err
	}
	var out []datasheet.Rival
	for _, r := range list {
		f, err := figures(r.Samples)
		if err != nil {
			return nil, err
		}
		other := m.WithSamples(len(r.Samples), r.Samples)
		curves, err := other.Curves(ctx, folder.Require.Infidelity, v.Errors)
		if err != nil {
			return nil, err
		}
		pair, err := other.Pair(ctx)
		if err != nil {
			return nil, err
		}
		d := datasheet.Rival{
			Name: r.Name, Span: other.Span(), Infidelity: f.Infidelity, Samples: r.Samples, Errors: curves, PairInfidelity: pair.Infidelity,
		}
		readings, err := in.Profile.CheckSamples(channel, r.Samples)
		if err != nil {
			return nil, err
		}
		for _, q := range readings {
			if q.Limit == hardware.RingOutFast || q.Limit == hardware.RingOutTail {
				d.RingOut = math.Max(d.RingOut, q.Found)
				d.BreaksRingOut = d.BreaksRingOut || !q.OK
			}
		}
		out = append(out, d)
	}
	return out, nil
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
