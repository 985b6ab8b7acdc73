package main

import (
	"math"

	"holdfast/design/brief"
	"holdfast/design/device"
	"holdfast/hardware"
)

// What check -json prints. A figure that is not stated, and a limit that is not there, is null.
type (
	checkForm struct {
		Format int        `json:"format"`
		Files  []fileForm `json:"files"`
	}
	// One of the three descriptions is there, or error.
	fileForm struct {
		File    string       `json:"file"`
		Kind    string       `json:"kind,omitempty"`
		Error   string       `json:"error,omitempty"`
		Profile *profileForm `json:"profile,omitempty"`
		Device  *deviceForm  `json:"device,omitempty"`
		Brief   *briefForm   `json:"brief,omitempty"`
	}
	profileForm struct {
		Name         string        `json:"name"`
		SamplePeriod number        `json:"sample_period_ns"`
		Bits         int           `json:"resolution_bit"`
		Block        int           `json:"block_samples"`
		Shortest     int           `json:"shortest_samples"`
		Longest      int           `json:"longest_samples"`
		Channels     []channelForm `json:"channels"`
	}
	channelForm struct {
		Name           string     `json:"name"`
		Kind           string     `json:"kind"`
		Mixing         string     `json:"mixing"`
		Carrier        number     `json:"carrier_ghz"`
		FullScale      number     `json:"full_scale_mhz"`
		FullScaleLevel number     `json:"full_scale_level_v"`
		Envelope       string     `json:"envelope"`
		AmplitudeLimit number     `json:"amplitude_limit_share"`
		SlewLimit      number     `json:"slew_limit_share_per_sample"`
		RMSLimit       number     `json:"rms_limit_share"`
		RMSPeriod      number     `json:"rms_period_ns"`
		Band           number     `json:"band_mhz"`
		OutOfBand      number     `json:"out_of_band_share"`
		ZeroMean       bool       `json:"zero_mean"`
		GuardLead      int        `json:"guard_lead_samples"`
		GuardTrail     int        `json:"guard_trail_samples"`
		RingOutLimit   number     `json:"ring_out_limit_share"`
		RingOutFast    number     `json:"ring_out_fast_ns"`
		RingOutTail    number     `json:"ring_out_tail_share"`
		Compression    [][]number `json:"compression_shares"`
		Shift          number     `json:"shift_mhz"`
		Delayed        int        `json:"delayed_samples"`
		WindowStart    number     `json:"window_start_ns"`
		Line           []string   `json:"line"`
		SteadyGain     number     `json:"line_steady_gain"`
		Corner         number     `json:"line_corner_mhz"`
		TransitionTime number     `json:"line_transition_time_ns"`
		Overshoot      number     `json:"line_overshoot_share"`
		Settling1pc    number     `json:"line_settling_1_percent_ns"`
		Settling01pc   number     `json:"line_settling_0_1_percent_ns"`
		GroupDelay     number     `json:"line_group_delay_ns"`
		Spans          []spanForm `json:"spans"`
		Cautions       []string   `json:"cautions"`
	}
	spanForm struct {
		Span      number `json:"span_ns"`
		Samples   int    `json:"samples"`
		PerQuad   int    `json:"coefficients_per_quadrature"`
		Equations int    `json:"equations"`
		EnoughFor string `json:"enough_for"`
	}
	deviceForm struct {
		Name  string     `json:"name"`
		Sites []siteForm `json:"sites"`
		// Of several sites.
		Levels      int             `json:"levels,omitempty"`
		CodeStates  int             `json:"code_states,omitempty"`
		Decoherence *number         `json:"decoherence_infidelity_per_100_ns,omitempty"`
		Couplings   []couplingForm  `json:"couplings,omitempty"`
		Crosstalk   []crosstalkForm `json:"crosstalk,omitempty"`
	}
	siteForm struct {
		Name      string   `json:"name"`
		Levels    int      `json:"levels"`
		Zero      string   `json:"zero"`
		Frequency number   `json:"frequency_ghz"`
		Detuning  number   `json:"detuning_mhz"`
		T1        number   `json:"t1_ns"`
		T2        number   `json:"t2_ns"`
		Channels  []string `json:"channels"`
		// Of more than two levels.
		Kind          string   `json:"kind,omitempty"`
		Code          []int    `json:"code_levels,omitempty"`
		Anharmonicity *number  `json:"anharmonicity_mhz,omitempty"`
		Higher        []number `json:"higher_mhz,omitempty"`
		Quadratic     *number  `json:"quadratic_mhz,omitempty"`
	}
	couplingForm struct {
		Kind     string   `json:"kind"`
		Sites    []string `json:"sites"`
		Axes     []string `json:"axes,omitempty"`
		Strength number   `json:"strength_mhz"`
		Still    bool     `json:"stands_still"`
		Turning  []number `json:"turning_mhz"`
		Dropped  []number `json:"left_out_mhz"`
	}
	crosstalkForm struct {
		Channel string `json:"channel"`
		Site    string `json:"site"`
		Share   number `json:"share"`
		Phase   number `json:"phase_deg"`
		Turning number `json:"turning_mhz"`
	}
	briefForm struct {
		Name           string       `json:"name"`
		Profile        string       `json:"profile"`
		Device         string       `json:"device"`
		Site           string       `json:"site"`
		Gate           string       `json:"gate"`
		Angle          number       `json:"angle_rad"`
		Axis           []number     `json:"axis"`
		Span           number       `json:"span_ns"`
		Samples        int          `json:"samples"`
		Free           int          `json:"free_samples"`
		Ends           string       `json:"ends"`
		Held           []heldForm   `json:"held"`
		HeldByDefault  bool         `json:"held_by_default"`
		Equations      int          `json:"equations"`
		Independent    int          `json:"independent_equations"`
		Family         string       `json:"basis_family"`
		PerQuad        int          `json:"coefficients_per_quadrature"`
		Together       int          `json:"coefficients"`
		Infidelity     number       `json:"required_infidelity"`
		Susceptibility number       `json:"required_susceptibility"`
		Margins        []marginForm `json:"required_margins"`
		Seed           uint64       `json:"seed"`
		Starts         int          `json:"starts"`
		Refine         bool         `json:"refine"`
		Decoherence    number       `json:"decoherence_infidelity"`
		Warnings       []string     `json:"warnings"`
		// Of several sites, or states.
		Sites  []string `json:"sites,omitempty"`
		FreeZ  string   `json:"free_z,omitempty"`
		Local  bool     `json:"up_to_local_rotations,omitempty"`
		States int      `json:"states,omitempty"`
	}
	// Of the three sizes those that do not apply are null.
	heldForm struct {
		Name   string `json:"name"`
		Kind   string `json:"kind"`
		Rate   number `json:"size_mhz"`
		Share  number `json:"size_share"`
		Angle  number `json:"size_rad"`
		Weight number `json:"weight"`

		Operators int `json:"operators,omitempty"` // of a class, on more than one spin
	}
	marginForm struct {
		Error string `json:"error"`
		Rate  number `json:"size_mhz"`
		Share number `json:"size_share"`
		Angle number `json:"size_rad"`
	}
)

// mhz turns a rate in rad/ns into MHz.
func mhz(rate float64) number { return number(rate / (2 * math.Pi) * 1e3) }

func profileFormOf(p *hardware.Profile) (*profileForm, error) {
	f := &profileForm{Name: p.Name, SamplePeriod: number(p.SamplePeriod), Bits: p.Bits, Block: p.Block, Shortest: p.Shortest, Longest: p.Longest}
	for c := range p.Channels {
		ch := &p.Channels[c]
		step := ch.Line.StepFigures()
		v := channelForm{
			Name: ch.Name, Kind: ch.Kind, Mixing: string(ch.Mixing), Carrier: unless(ch.Carrier, 0), FullScale: mhz(ch.FullScale),
			FullScaleLevel: unless(ch.FullScaleLevel, 0), AmplitudeLimit: number(ch.AmplitudeLimit), SlewLimit: number(ch.SlewLimit), Band: number(1e3 * ch.Band),
			GuardLead: ch.GuardLead, GuardTrail: ch.GuardTrail, RingOutLimit: number(ch.RingOut.Limit), RingOutFast: number(ch.RingOut.Fast),
			Envelope: ch.Envelope, RMSLimit: unless(ch.RMSLimit, 0), RMSPeriod: unless(ch.RMSPeriod, 0), OutOfBand: unless(ch.OutOfBand, 0), ZeroMean: ch.ZeroMean,
			RingOutTail: number(ch.RingOut.After(math.Inf(1))), Compression: [][]number{}, Shift: mhz(ch.Shift), Delayed: p.Shift(c),
			WindowStart: number(p.Start(c)), Line: list(ch.Sections), SteadyGain: number(steady(ch)), Corner: number(1e3 * ch.Line.Corner()),
			TransitionTime: number(step.TransitionTime), Overshoot: number(step.Overshoot), Settling1pc: number(step.Settling1pc),
			Settling01pc: number(step.Settling01pc), GroupDelay: number(step.GroupDelay), Spans: []spanForm{}, Cautions: cautions(p, c),
		}
		for _, pt := range ch.Compression {
			v.Compression = append(v.Compression, numbers([]float64{pt.Converter, pt.Reached}))
		}
		if math.IsInf(ch.RingOut.Limit, 1) {
			v.RingOutFast = number(math.NaN())
		}
		_, lines, err := spansOf(p, c)
		if err != nil {
			return nil, err
		}
		for _, l := range lines {
			v.Spans = append(v.Spans, spanForm{number(float64(l.samples) * p.SamplePeriod), l.samples, l.perQuad, carries(ch, ch.Columns()*l.perQuad), degrees()[l.degree].words})
		}
		f.Channels = append(f.Channels, v)
	}
	return f, nil
}

func deviceFormOf(d *device.Device) *deviceForm {
	f := &deviceForm{Name: d.Name}
	for i := range d.Sites {
		s := &d.Sites[i]
		v := siteForm{
			Name: s.Name, Levels: s.Levels, Zero: s.Zero, Frequency: unless(s.Frequency, 0), Detuning: mhz(s.Detuning),
			T1: unless(s.T1, 0), T2: unless(s.T2, 0), Channels: []string{},
		}
		if s.Levels > 2 {
			v.Kind, v.Code = s.Kind, s.Code[:]
			if a, q := mhz(s.Anharmonicity), mhz(s.Quadratic); s.Kind == device.Ladder {
				v.Anharmonicity = &a
			} else {
				v.Quadratic = &q
			}
			for _, h := range s.Higher {
				v.Higher = append(v.Higher, mhz(h))
			}
		}
		for _, drive := range d.Drives {
			if drive.Site == s.Name {
				v.Channels = append(v.Channels, drive.Channel)
			}
		}
		for _, bias := range d.Biases {
			if bias.Site == s.Name {
				v.Channels = append(v.Channels, bias.Channel)
			}
		}
		f.Sites = append(f.Sites, v)
	}
	if len(d.Sites) > 1 {
		loss := number(together(d, 100))
		f.Levels, f.CodeStates, f.Decoherence = d.Dim(), len(d.CodeSpace()), &loss
	}
	for i, c := range d.Couplings {
		x := framed(d, i)
		f.Couplings = append(f.Couplings, couplingForm{c.Kind, c.Sites, c.Axes, mhz(c.Strength), x.still, frequencies(x.turning), frequencies(x.dropped)})
	}
	for _, c := range d.Crosstalk {
		f.Crosstalk = append(f.Crosstalk, crosstalkForm{c.Channel, c.Site, number(c.Share), number(c.Phase * 180 / math.Pi), mhz(crosstalkTurns(d, &c))})
	}
	return f
}

// frequencies lists those of turning terms.
func frequencies(terms []device.Rotating) []number {
	out := []number{}
	for _, r := range terms {
		out = append(out, mhz(r.Frequency))
	}
	return out
}

// sizes gives the size of an error as a rate, as a share or as an angle.
func sizes(kind string, size float64) (rate, share, angle number) {
	none := number(math.NaN())
	switch kind {
	case brief.Amplitude, brief.Line, brief.Offset, brief.Crosstalk:
		return none, number(size), none
	case brief.Skew:
		return none, none, number(size)
	}
	return mhz(size), none, none
}

func briefFormOf(b *brief.Brief, p *hardware.Profile, d *device.Device, samples int, r room, loss float64, warn []string) *briefForm {
	f := &briefForm{
		Name: b.Name, Profile: b.ProfilePath, Device: b.DevicePath, Site: b.Target.Site, Gate: b.Target.Label, Angle: number(b.Target.Angle), Axis: numbers(b.Target.Axis[:]),
		Span: number(b.Span), Samples: samples, Free: r.free, Ends: b.Ends, Held: []heldForm{}, HeldByDefault: b.Defaulted,
		Equations: r.equations, Independent: r.independent, Family: r.family, PerQuad: r.perQuad, Together: r.together,
		Infidelity: number(b.Require.Infidelity), Susceptibility: number(b.Require.Susceptibility), Margins: []marginForm{},
		Seed: b.Seed, Starts: b.Starts, Refine: b.Refine, Decoherence: number(loss), Warnings: list(warn),
	}
	for _, e := range b.Errors {
		rate, share, angle := sizes(e.Kind, e.Size)
		h := heldForm{Name: e.Name, Kind: e.Kind, Rate: rate, Share: share, Angle: angle, Weight: number(e.Weight)}
		if e.Kind == brief.Any && !plainSpin(b, d) {
			h.Operators = len(e.Members)
		}
		f.Held = append(f.Held, h)
	}
	if len(d.Sites) > 1 || b.Target.From != nil {
		f.Sites, f.FreeZ, f.Local = list(b.Target.Sites), b.Target.FreeZ, b.Target.Local
		if len(b.Target.Sites) != 1 {
			f.Angle, f.Axis = number(math.NaN()), []number{}
		}
		f.States = len(b.Target.From)
	}
	for _, m := range b.Require.Margins {
		rate, share, angle := sizes(marginKind(b, m.Error), m.Size)
		f.Margins = append(f.Margins, marginForm{m.Error, rate, share, angle})
	}
	return f
}
