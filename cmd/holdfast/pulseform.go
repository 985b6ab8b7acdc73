package main

import (
	"encoding/json"

	"holdfast/design"
	"holdfast/design/datasheet"
)

// What design -json and replay -json print.
type (
	pulseForm struct {
		Format        int            `json:"format"`
		Folder        string         `json:"folder"`
		Datasheet     *string        `json:"datasheet"` // null when none was written
		Name          string         `json:"name"`
		Target        string         `json:"target"`
		Status        string         `json:"status"`
		Met           bool           `json:"met"`
		Held          []string       `json:"held"`
		HeldByDefault bool           `json:"held_by_default"`
		Search        searchForm     `json:"search"`
		Files         []string       `json:"files"`
		Rivals        []rivalForm    `json:"rivals"`
		NoRivals      string         `json:"rivals_left_out,omitempty"`
		Verdict       json.Marshaler `json:"verdict"`
	}
	searchForm struct {
		Seed        uint64 `json:"seed"`
		Starts      int    `json:"starts_allowed"`
		Tried       int    `json:"starts_tried"`
		Successes   int    `json:"successes"`
		Winner      int    `json:"winning_start"`
		Evaluations int    `json:"evaluations"`
		Miss        number `json:"sum_of_squared_residuals"`
		Before      number `json:"infidelity_before_rounding"`
	}
	rivalForm struct {
		Name       string `json:"name"`
		Span       number `json:"span_ns"`
		Infidelity number `json:"infidelity"`
		Pair       number `json:"pair_infidelity"`
		RingOut    number `json:"ring_out_share"`
		Breaks     bool   `json:"breaks_ring_out"`
	}
)

// pulseFormOf gathers what is told of a pulse. page is the datasheet that was written, if any.
func pulseFormOf(folder, page string, status int, r *design.Record, s *datasheet.Sheet) pulseForm {
	f := pulseForm{
		Format: jsonFormat, Folder: folder, Name: r.Pulse.Name, Target: s.Target, Status: r.Pulse.Status, Met: status == exitMet,
		Held: list(r.Pulse.Held), HeldByDefault: r.Pulse.HeldByDefault,
		Search: searchForm{r.Search.Seed, r.Search.Starts, r.Search.Tried, r.Search.Successes, r.Search.Winner, r.Search.Evaluations, number(r.Search.Miss), number(r.Search.Before)},
		Files:  []string{}, Rivals: []rivalForm{}, NoRivals: s.NoRivals, Verdict: s.Verdict,
	}
	if page != "" {
		f.Datasheet = &page
	}
	for _, file := range r.Files {
		f.Files = append(f.Files, file.Name)
	}
	for _, v := range s.Rivals {
		f.Rivals = append(f.Rivals, rivalForm{v.Name, number(v.Span), number(v.Infidelity), number(v.PairInfidelity), number(v.RingOut), v.BreaksRingOut})
	}
	return f
}
