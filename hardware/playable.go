package hardware

import (
	"fmt"
	"math"

	"holdfast/hardware/quantity"
)

// A Limit names what a row keeps, and what a reading judges.
type Limit string

const (
	Amplitude   Limit = "amplitude"
	Slew        Limit = "slew"
	RingOutFast Limit = "ring-out (fast)"
	RingOutTail Limit = "ring-out (tail)"
	Guards      Limit = "guards"
	LargestOne  Limit = "largest code"
	Length      Limit = "length"
)

// A Row keeps one linear limit in both quadratures: with w.x = sum_j Weights[j] x[First+j],
//
//	|Re(w.x)| <= Bound  and  |Im(w.x)| <= Bound.
//
// Weights are of free samples only; guard samples are zero and have none.
type Row struct {
	Limit   Limit
	At      float64 // ns: for slew after the start of the span, for ring-out after its end
	First   int
	Weights []complex128
	Bound   float64 // share of full scale, reserves taken off
}

// A Set is the convex set of samples of one channel that an instrument can play in a span, rounding to codes included:
// guard samples (the first Lead and the last Trail) zero, |x[k]| <= Disc on the others, and every row kept. Whatever
// lies in it obeys the profile exactly, before rounding and after.
//
// Limits that the disc implies have no row: a slew limit of twice the disc, ring-out that decays in the trailing
// guard. No row at all is thus possible.
type Set struct {
	Samples, Lead, Trail int
	Disc                 float64 // share of full scale
	Rows                 []Row
	// Reserved is false when rounding could use more than a fifth of the ring-out limit. Rows of ring-out then keep the
	// limit before rounding only, and the codes must be checked.
	Reserved bool
}

// discReserve is what rounding both quadratures, each by at most half an LSB, can add to |x|: 1/sqrt 2 LSB, a little up.
const discReserve = 0.7072

// slewReserve is what rounding two neighbours can add to their difference, in LSB.
const slewReserve = 1

// roundingShare is the largest share of the ring-out limit that is given up for rounding.
const roundingShare = 0.2

// Playable gives the set of samples that a channel can play in a span. Rounding is reserved for: with LSB = 2^-(bits-1),
//
//	Disc       = min(amplitude limit, 1 - LSB) - 0.7072 LSB
//	slew bound = slew limit - LSB, on x[k] - x[k-1] for every step, those from and to zero included
//	ring-out   = limit - reserve for the time between rows - LSB/2 sum |w|     (see ringOutRows)
//
// As |x[k]| <= Disc in each quadrature, no code exceeds 2^(bits-1) - 1. The error names the limit that leaves
// nothing to play.
func (p *Profile) Playable(channel, samples int) (*Set, error) {
	if channel < 0 || channel >= len(p.Channels) {
		return nil, fmt.Errorf("%s has no channel %d; it has %d", p.Name, channel, len(p.Channels))
	}
	if err := p.CheckSpan(samples); err != nil {
		return nil, err
	}
	c := &p.Channels[channel]
	nothing := func(format string, args ...any) (*Set, error) {
		return nil, fmt.Errorf("channel %q can play nothing in %d samples: %s", c.Name, samples, fmt.Sprintf(format, args...))
	}
	lsb := LeastStep(p.Bits)
	s := &Set{Samples: samples, Lead: c.GuardLead, Trail: c.GuardTrail, Reserved: true}
	if s.Lead+s.Trail >= samples {
		return nothing("guard: %d samples at zero before and %d after leave no free one", s.Lead, s.Trail)
	}
	s.Disc = min(c.AmplitudeLimit, 1-lsb) - discReserve*lsb
	if !(s.Disc > 0) {
		return nothing("amplitude_limit: %s is within the rounding of %d bit", quantity.Format(c.AmplitudeLimit, quantity.Ratio), p.Bits)
	}
	if bound := c.SlewLimit - slewReserve*lsb; !(bound > 0) {
		return nothing("slew_limit: %s is within the rounding of %d bit", quantity.Format(c.SlewLimit, quantity.PerSample), p.Bits)
	} else if bound < 2*s.Disc {
		s.Rows = slewRows(s, p.SamplePeriod, bound)
	}
	if limit := c.RingOut.Limit; !math.IsInf(limit, 1) {
		rows, reserved, err := ringOutRows(p, c, s)
		if err != nil {
			return nothing("ring_out: %v", err)
		}
		s.Rows = append(s.Rows, rows...)
		s.Reserved = reserved
	}
	return s, nil
}

// slewRows bounds each step between neighbours of which one at least is free. Outside the span the output is zero.
func slewRows(s *Set, period, bound float64) []Row {
	first, end := s.Lead, s.Samples-s.Trail
	rows := make([]Row, 0, end-first+1)
	for k := first; k <= end; k++ { // the step from sample k-1 to sample k
		row := Row{Limit: Slew, At: float64(k) * period, First: k - 1, Weights: []complex128{-1, 1}, Bound: bound}
		if k == first {
			row.First, row.Weights = k, row.Weights[1:]
		} else if k == end {
			row.Weights = row.Weights[:1]
		}
		if len(row.Weights) == 2 || bound < s.Disc {
			rows = append(rows, row)
		}
	}
	return rows
}
