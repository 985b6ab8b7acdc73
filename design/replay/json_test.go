package replay

import (
	"context"
	"encoding/json"
	"math"
	"reflect"
	"slices"
	"strings"
	"testing"
)

// keys lists every key of a JSON value with its path, lists by their first element.
func keys(v any, path string) []string {
	switch v := v.(type) {
	case map[string]any:
		var list []string
		for k, e := range v {
			list = append(list, keys(e, path+"."+k)...)
		}
		slices.Sort(list)
		return list
	case []any:
		if len(v) == 0 {
			return []string{path + "[]"}
		}
		return keys(v[0], path+"[]")
	}
	return []string{strings.TrimPrefix(path, ".")}
}

// The documented keys and no others, figures whole, what is not finite as null.
func TestVerdictJSON(t *testing.T) {
	third := 1. / 3
	v := &Verdict{
		Name: "a <pulse>", Ends: "window", Measure: "gate", Settled: Figures{third * 1e-9, 0}, Window: Figures{math.Nextafter(1e-9, 1), 5e-324}, TailAngle: 0.006,
		Pair: Pair{math.NaN(), math.NaN()}, Decoherence: 1e-3,
		Errors: []Error{
			{Name: "any", Kind: "any", Held: true, Unit: "MHz", Susceptibility: third, Low: math.Inf(-1), High: math.Inf(1), WorstDirection: "1.00 X", WorstSusceptibility: 0, Direction: []float64{1, 0, -third}, Curve: []Point{{0.5, 1e21}}},
			{Name: "corner", Kind: "line", Unit: "%", Low: -2, High: 3},
		},
		BringUp:      BringUp{Amplitude: []Population{{0.9, third}}, Detuning: []Population{{-5, 0}}, Repeats: []Population{{1, 1}}},
		Inputs:       []Difference{{"bits", "14", "12"}},
		Requirements: []Requirement{{Name: "margin against any", Unit: "MHz", Found: math.Inf(1), Allowed: 0.1, Margin: true, Met: true}},
		Warnings:     []string{"W."},
	}
	v.Limits = append(v.Limits, Limit{Channel: "q1"})
	v.Limits[0].Limit, v.Limits[0].Found = "rms", third
	data, err := json.Marshal(v)
	if err != nil {
		t.Fatal(err)
	}
	var got map[string]any
	if err := json.Unmarshal(data, &got); err != nil {
		t.Fatal(err)
	}
	want := strings.Fields(`
		agreement.infidelity agreement.ok agreement.susceptibility agreement.tail_angle_rad
		agreement.worst.allowed agreement.worst.figure agreement.worst.found agreement.worst.recorded
		bring_up.amplitude[].one bring_up.amplitude[].scale bring_up.detuning[].mhz bring_up.detuning[].one bring_up.repeats[].one bring_up.repeats[].pulses
		decoherence ends
		errors[].curve[].infidelity errors[].curve[].value errors[].direction[] errors[].held errors[].high errors[].kind errors[].low errors[].name
		errors[].susceptibility errors[].unit errors[].worst_direction errors[].worst_susceptibility
		format inputs[].key inputs[].rebuilt inputs[].recorded
		limits[].allowed limits[].channel limits[].found limits[].headroom limits[].limit limits[].ok limits[].unit
		met name pair.infidelity pair.phase_deg
		requirements[].allowed requirements[].found requirements[].margin requirements[].met requirements[].name requirements[].unit
		settled.infidelity settled.leakage tail_angle_rad warnings[] window.infidelity window.leakage`)
	if list := keys(got, ""); !reflect.DeepEqual(list, want) {
		t.Errorf("keys %q\nwant %q", list, want)
	}
	at := func(path ...any) any {
		var v any = got
		for _, p := range path {
			switch p := p.(type) {
			case string:
				v = v.(map[string]any)[p]
			case int:
				v = v.([]any)[p]
			}
		}
		return v
	}
	for _, c := range []struct {
		got, want any
	}{
		{at("format"), 1.0}, {at("name"), "a <pulse>"}, {at("ends"), "window"}, {at("met"), false},
		{at("settled", "infidelity"), third * 1e-9}, {at("window", "infidelity"), math.Nextafter(1e-9, 1)}, {at("window", "leakage"), 5e-324},
		{at("pair", "infidelity"), nil}, {at("pair", "phase_deg"), nil}, {at("errors", 0, "low"), nil}, {at("errors", 0, "high"), nil},
		{at("errors", 0, "direction", 2), -third}, {at("errors", 0, "worst_susceptibility"), 0.0}, {at("errors", 0, "curve", 0, "infidelity"), 1e21},
		{at("errors", 1, "low"), -2.0}, {at("errors", 1, "high"), 3.0}, {at("requirements", 0, "found"), nil}, {at("requirements", 0, "allowed"), 0.1},
		{at("limits", 0, "found"), third}, {at("limits", 0, "limit"), "rms"}, {at("inputs", 0, "recorded"), "14"}, {at("warnings", 0), "W."},
		{at("bring_up", "amplitude", 0, "scale"), 0.9}, {at("bring_up", "detuning", 0, "mhz"), -5.0}, {at("bring_up", "repeats", 0, "pulses"), 1.0},
	} {
		if c.got != c.want {
			t.Errorf("%v, want %v", c.got, c.want)
		}
	}
	// What only some verdicts have.
	leak := third
	wide, err := json.Marshal(&Verdict{Measure: "state", Dropped: &Figures{third, 1e-20}, Errors: []Error{
		{Kind: "any", LeakSusceptibility: &leak, Leak: true, Members: []string{"ZX"}, Sampled: "one"}, {Kind: "static", LeakSusceptibility: new(float64)}, {Kind: "static"}}})
	if err != nil {
		t.Fatal(err)
	}
	had := keys(got, "")
	if err := json.Unmarshal(wide, &got); err != nil {
		t.Fatal(err)
	}
	var more []string
	for _, k := range keys(got, "") {
		if !slices.Contains(had, k) && !strings.HasSuffix(k, "[]") {
			more = append(more, k)
		}
	}
	if want := strings.Fields("dropped.infidelity dropped.leakage errors[].leak errors[].leak_susceptibility errors[].sampled measure"); !reflect.DeepEqual(more, want) {
		t.Errorf("more keys %q, want %q", more, want)
	}
	for _, c := range []struct{ got, want any }{
		{at("measure"), "state"}, {at("dropped", "infidelity"), third}, {at("dropped", "leakage"), 1e-20}, {at("errors", 0, "leak"), true},
		{at("errors", 0, "leak_susceptibility"), third}, {at("errors", 0, "members", 0), "ZX"}, {at("errors", 0, "sampled"), "one"},
		{at("errors", 1, "leak_susceptibility"), 0.0}, {at("errors", 1, "leak"), nil}, {at("errors", 2, "leak_susceptibility"), nil}, {at("errors", 1, "members"), nil},
	} {
		if c.got != c.want {
			t.Errorf("%v, want %v", c.got, c.want)
		}
	}
	// Nothing is null that is a list, and the kinds that have no direction have none.
	empty, err := json.Marshal(&Verdict{Errors: []Error{{Kind: "static"}}})
	if err != nil {
		t.Fatal(err)
	}
	if strings.Contains(string(empty), "null") || strings.Contains(string(empty), "direction") {
		t.Errorf("an empty verdict: %s", empty)
	}
	// A real one says what it is.
	m := testModel()
	real, err := m.Judge(context.Background(), 1e-4)
	if err != nil {
		t.Fatal(err)
	}
	if data, err = json.Marshal(real); err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(data, &got); err != nil || at("settled", "infidelity") != real.Settled.Infidelity || at("met") != false {
		t.Errorf("%v: %.300s", err, data)
	}
	real.Agreement.OK, real.Limits = true, nil
	if data, _ = json.Marshal(real); !strings.Contains(string(data), `"met":true`) {
		t.Errorf("met: %.300s", data)
	}
}
