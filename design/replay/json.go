package replay

import (
	"encoding/json"
	"math"
	"strconv"
)

// verdictFormat is the format of a Verdict in JSON. It changes when a key changes its meaning or goes.
const verdictFormat = 1

// MarshalJSON writes the verdict for machines. Figures are whole: as many digits as it takes to read the same number back. Numbers that are
// not finite are null: a low or high of null says that the error is withstood to the end of what is searched. Lists are never null.
//
//	format          1
//	name, ends      of the pulse; "settled" or "window"
//	met             whether every requirement, every limit and the agreement with the record hold
//	measure         what infidelity means, where it is not the average gate infidelity: "state" or "subspace"
//	settled, window { infidelity, leakage }
//	dropped         { infidelity, leakage } for the required ends with the rotating terms that the model leaves out; absent when there are none
//	tail_angle_rad  that the ring-out still turns after the window
//	pair            { infidelity, phase_deg }: twice without a gap, the second turned by the worst of four phases; infidelity null where not judged
//	decoherence     to be added to every infidelity
//	limits          [{ channel, limit, unit, found, allowed, headroom, ok }]
//	errors          [{ name, kind, held, unit ("MHz", "%" or "deg"), susceptibility, low, high, curve [{ value, infidelity }],
//	                where levels lie outside the code space leak_susceptibility, and leak (true) of a class of leakage,
//	                and of kind "any" worst_direction, worst_susceptibility, direction, of a class of many operators members (their names, in
//	                the order of direction) and sampled (what low, high and curve were looked for along) }]
//	bring_up        populations of |1>: { amplitude [{ scale, one }], detuning [{ mhz, one }], repeats [{ pulses, one }] }
//	agreement       with the record's claim, largest differences: { infidelity, susceptibility, tail_angle_rad, ok,
//	                worst { figure, found, recorded, allowed } }: the figure that differs most for what is allowed, "" when nothing is claimed
//	inputs          what inputs/ do not bear out: [{ key, recorded, rebuilt }]
//	requirements    [{ name, unit, found, allowed, margin, met }]; found must be at most allowed, for a margin at least
//	warnings        sentences
func (v *Verdict) MarshalJSON() ([]byte, error) {
	figures := func(f Figures) figuresJSON { return figuresJSON{figure(f.Infidelity), figure(f.Leakage)} }
	j := verdictJSON{
		Format: verdictFormat, Name: v.Name, Ends: v.Ends, Met: v.Met(),
		Settled: figures(v.Settled), Window: figures(v.Window), TailAngle: figure(v.TailAngle),
		Pair:        pairJSON{figure(v.Pair.Infidelity), figure(v.Pair.Phase)},
		Decoherence: figure(v.Decoherence),
		Limits:      []limitJSON{}, Errors: []errorJSON{}, Inputs: []differenceJSON{}, Requirements: []requirementJSON{}, Warnings: []string{},
		BringUp: bringUpJSON{[]scaleJSON{}, []detuningJSON{}, []repeatJSON{}},
		Agreement: agreementJSON{figure(v.Agreement.Infidelity), figure(v.Agreement.Susceptibility), figure(v.Agreement.TailAngle), v.Agreement.OK,
			disagreementJSON{v.Agreement.Worst.Figure, figure(v.Agreement.Worst.Found), figure(v.Agreement.Worst.Recorded), figure(v.Agreement.Worst.Allowed)}},
	}
	if v.Measure != "gate" {
		j.Measure = v.Measure
	}
	if v.Dropped != nil {
		f := figures(*v.Dropped)
		j.Dropped = &f
	}
	for _, l := range v.Limits {
		j.Limits = append(j.Limits, limitJSON{l.Channel, string(l.Limit), l.Unit, figure(l.Found), figure(l.Allowed), figure(l.Headroom), l.OK})
	}
	for _, e := range v.Errors {
		o := errorJSON{
			Name: e.Name, Kind: e.Kind, Held: e.Held, Unit: e.Unit, Susceptibility: figure(e.Susceptibility), Low: figure(e.Low), High: figure(e.High),
			Leak: e.Leak, Members: e.Members, Sampled: e.Sampled,
			Curve: []pointJSON{},
		}
		if e.LeakSusceptibility != nil {
			leak := figure(*e.LeakSusceptibility)
			o.LeakSusceptibility = &leak
		}
		o.Spread = e.Spread
		for _, x := range []struct {
			from *float64
			to   **figure
		}{{e.SpreadInfidelity, &o.SpreadInfidelity}, {e.NoiseInfidelity, &o.NoiseInfidelity}} {
			if x.from != nil {
				f := figure(*x.from)
				*x.to = &f
			}
		}
		for _, p := range e.Curve {
			o.Curve = append(o.Curve, pointJSON{figure(p.Value), figure(p.Infidelity)})
		}
		if e.Kind == "any" {
			worst := figure(e.WorstSusceptibility)
			o.WorstDirection, o.WorstSusceptibility = e.WorstDirection, &worst
			for _, d := range e.Direction {
				o.Direction = append(o.Direction, figure(d))
			}
		}
		j.Errors = append(j.Errors, o)
	}
	for _, p := range v.BringUp.Amplitude {
		j.BringUp.Amplitude = append(j.BringUp.Amplitude, scaleJSON{figure(p.Value), figure(p.One)})
	}
	for _, p := range v.BringUp.Detuning {
		j.BringUp.Detuning = append(j.BringUp.Detuning, detuningJSON{figure(p.Value), figure(p.One)})
	}
	for _, p := range v.BringUp.Repeats {
		j.BringUp.Repeats = append(j.BringUp.Repeats, repeatJSON{figure(p.Value), figure(p.One)})
	}
	for _, d := range v.Inputs {
		j.Inputs = append(j.Inputs, differenceJSON(d))
	}
	for _, r := range v.Requirements {
		j.Requirements = append(j.Requirements, requirementJSON{r.Name, r.Unit, figure(r.Found), figure(r.Allowed), r.Margin, r.Met})
	}
	j.Warnings = append(j.Warnings, v.Warnings...)
	return json.Marshal(j)
}

// A figure is a number that may be missing.
type figure float64

func (f figure) MarshalJSON() ([]byte, error) {
	if math.IsNaN(float64(f)) || math.IsInf(float64(f), 0) {
		return []byte("null"), nil
	}
	return strconv.AppendFloat(nil, float64(f), 'g', -1, 64), nil
}

type verdictJSON struct {
	Format       int               `json:"format"`
	Name         string            `json:"name"`
	Ends         string            `json:"ends"`
	Met          bool              `json:"met"`
	Measure      string            `json:"measure,omitempty"`
	Settled      figuresJSON       `json:"settled"`
	Window       figuresJSON       `json:"window"`
	Dropped      *figuresJSON      `json:"dropped,omitempty"`
	TailAngle    figure            `json:"tail_angle_rad"`
	Pair         pairJSON          `json:"pair"`
	Decoherence  figure            `json:"decoherence"`
	Limits       []limitJSON       `json:"limits"`
	Errors       []errorJSON       `json:"errors"`
	BringUp      bringUpJSON       `json:"bring_up"`
	Agreement    agreementJSON     `json:"agreement"`
	Inputs       []differenceJSON  `json:"inputs"`
	Requirements []requirementJSON `json:"requirements"`
	Warnings     []string          `json:"warnings"`
}

type figuresJSON struct {
	Infidelity figure `json:"infidelity"`
	Leakage    figure `json:"leakage"`
}

type pairJSON struct {
	Infidelity figure `json:"infidelity"`
	Phase      figure `json:"phase_deg"`
}

type limitJSON struct {
	Channel  string `json:"channel"`
	Limit    string `json:"limit"`
	Unit     string `json:"unit"`
	Found    figure `json:"found"`
	Allowed  figure `json:"allowed"`
	Headroom figure `json:"headroom"`
	OK       bool   `json:"ok"`
}

type errorJSON struct {
	Name                string      `json:"name"`
	Kind                string      `json:"kind"`
	Held                bool        `json:"held"`
	Unit                string      `json:"unit"`
	Susceptibility      figure      `json:"susceptibility"`
	LeakSusceptibility  *figure     `json:"leak_susceptibility,omitempty"`
	Leak                bool        `json:"leak,omitempty"`
	Spread              string      `json:"spread,omitempty"`
	SpreadInfidelity    *figure     `json:"spread_infidelity,omitempty"`
	NoiseInfidelity     *figure     `json:"noise_infidelity,omitempty"`
	Low                 figure      `json:"low"`
	High                figure      `json:"high"`
	WorstDirection      string      `json:"worst_direction,omitempty"`
	WorstSusceptibility *figure     `json:"worst_susceptibility,omitempty"`
	Direction           []figure    `json:"direction,omitempty"`
	Members             []string    `json:"members,omitempty"`
	Sampled             string      `json:"sampled,omitempty"`
	Curve               []pointJSON `json:"curve"`
}

type pointJSON struct {
	Value      figure `json:"value"`
	Infidelity figure `json:"infidelity"`
}

type bringUpJSON struct {
	Amplitude []scaleJSON    `json:"amplitude"`
	Detuning  []detuningJSON `json:"detuning"`
	Repeats   []repeatJSON   `json:"repeats"`
}

type scaleJSON struct {
	Scale figure `json:"scale"`
	One   figure `json:"one"`
}

type detuningJSON struct {
	MHz figure `json:"mhz"`
	One figure `json:"one"`
}

type repeatJSON struct {
	Pulses figure `json:"pulses"`
	One    figure `json:"one"`
}

type agreementJSON struct {
	Infidelity     figure `json:"infidelity"`
	Susceptibility figure `json:"susceptibility"`
	TailAngle      figure `json:"tail_angle_rad"`
	OK             bool   `json:"ok"`

	Worst disagreementJSON `json:"worst"`
}

type disagreementJSON struct {
	Figure   string `json:"figure"`
	Found    figure `json:"found"`
	Recorded figure `json:"recorded"`
	Allowed  figure `json:"allowed"`
}

type differenceJSON struct {
	Key      string `json:"key"`
	Recorded string `json:"recorded"`
	Rebuilt  string `json:"rebuilt"`
}

type requirementJSON struct {
	Name    string `json:"name"`
	Unit    string `json:"unit"`
	Found   figure `json:"found"`
	Allowed figure `json:"allowed"`
	Margin  bool   `json:"margin"`
	Met     bool   `json:"met"`
}
