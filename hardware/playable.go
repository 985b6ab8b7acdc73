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
	RMS         Limit = "rms"
	OutOfBand   Limit = "out-of-band"
	Mean        Limit = "mean"
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

// A Ball keeps one quadratic limit: with x_I and x_Q the two quadratures of all samples,
//
//	sum over rows w of (w.x_I)^2 + (w.x_Q)^2 <= Bound^2.
//
// Weights nil stands for the identity: the sum of |x[k]|^2.
type Ball struct {
	Limit   Limit
	Weights [][]float64 // rows over all samples of the span
	Bound   float64     // share of full scale, times the root of a number of samples; reserves taken off
}

// A Set is the convex set of samples of one channel that an instrument can play in a span, rounding to codes included:
// guard samples (the first Lead and the last Trail) zero, the amplitude limit on the others, and every row and ball kept. Whatever
// lies in it obeys the profile exactly, before rounding and after. Two limits are not kept by rounding, and codes
// must be checked: a zero mean, and what is not Reserved.
//
// Of a baseband channel the samples are real. Where the drive compresses, samples are what it reaches (see Channel), and Profile.Codes
// turns them into codes.
//
// Limits that the amplitude limit implies have no row and no ball: a slew limit of twice the disc, ring-out that decays in
// the trailing guard. No row at all is thus possible.
type Set struct {
	Samples, Lead, Trail int
	// Disc bounds |x[k]|, share of full scale. Where Box is positive it is only the circle around the box and need not be kept apart.
	Disc float64
	// Box bounds |x_I[k]| and |x_Q[k]| apart, of a baseband channel and of an envelope "box"; 0: the disc is the limit.
	Box   float64
	Rows  []Row
	Balls []Ball
	// OutOfBand bounds the energy outside the channel's band: int over |f| > band of |X(f)|^2 df <= OutOfBand, f in cycles per sample, X
	// the transform sum of x[k] e^{-2 pi i f k}, the energies of both quadratures added; +Inf: none.
	OutOfBand float64
	// ZeroMean asks that the samples sum to zero. It is an equality: take the mean out of the basis.
	ZeroMean bool
	// Reserved is false when rounding could use more than a fifth of the ring-out limit. Rows of ring-out then keep the
	// limit before rounding only, and the codes must be checked. OutOfBandReserved says the same of OutOfBand.
	Reserved, OutOfBandReserved bool
}

// discReserve is what rounding both quadratures, each by at most half an LSB, can add to |x|: 1/sqrt 2 LSB, a little up.
const discReserve = 0.7072

// boxReserve is what rounding can add to one quadrature, in LSB.
const boxReserve = 0.5

// slewReserve is what rounding two neighbours can add to their difference, in LSB.
const slewReserve = 1

// roundingShare is the largest share of a limit on ring-out or on what is out of band that is given up for rounding.
const roundingShare = 0.2

// Playable gives the set of samples that a channel can play in a span. Rounding is reserved for: with LSB = 2^-(bits-1),
//
//	Disc        = min(amplitude limit, 1 - LSB) - 0.7072 LSB
//	Box         = min(amplitude limit - LSB/2, 1 - LSB)
//	slew bound  = slew limit - LSB, on x[k] - x[k-1] for every step, those from and to zero included
//	rms         : sum |x|^2 <= (R sqrt(m) - r LSB sqrt(free))^2, m = max(samples, RMSPeriod/h), r = 0.7072 (baseband 0.5)
//	out-of-band : energy <= (limit sqrt(samples) - r LSB sqrt(free))^2, while the reserve is under a fifth of the limit
//	ring-out    = limit - reserve for the time between rows - LSB/2 sum |w|     (see ringOutRows)
//
// As |x[k]| <= Disc in each quadrature, no code exceeds 2^(bits-1) - 1.
//
// A drive that compresses, y = f(|x|) x/|x|, is played in y. With f from zero to the amplitude limit and its slopes between s and S:
// Disc = f(that of x); a step of y is at most a step of x times the largest row sum of the Jacobian, which is symmetric with
// eigenvalues f'(r) and f(r)/r, both between s and S, so it is at most
//
//	K = (S + s)/2 + (S - s)/sqrt 2        (baseband: K = S)
//
// and rounding x by half an LSB in each quadrature moves each of y by at most K LSB/2, and y by S times as much as x; for the
// inverse, which bounds the steps of x by those of y, s and S become 1/S and 1/s: the slew bound is divided by that K.
//
// The error names the limit that leaves nothing to play.
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
	share := func(v float64) string { return quantity.Format(v, quantity.Ratio) }
	lsb := LeastStep(p.Bits)
	s := &Set{Samples: samples, Lead: c.GuardLead, Trail: c.GuardTrail, OutOfBand: math.Inf(1), ZeroMean: c.ZeroMean, Reserved: true, OutOfBandReserved: true}
	free := samples - s.Lead - s.Trail
	if free <= 0 {
		return nothing("guard: %d samples at zero before and %d after leave no free one", s.Lead, s.Trail)
	}
	if s.ZeroMean && free < 2 {
		return nothing("zero_mean: one free sample sums to zero only when it is zero")
	}
	edge := min(c.AmplitudeLimit, 1-lsb) - discReserve*lsb // at the converter
	if c.boxed() {
		edge = min(c.AmplitudeLimit-boxReserve*lsb, 1-lsb)
	}
	if !(edge > 0) {
		return nothing("amplitude_limit: %s is within the rounding of %d bit", share(c.AmplitudeLimit), p.Bits)
	}
	least, most := c.Compression.slopes(c.AmplitudeLimit)
	gain, inverse, perSample := stretch(least, most), stretch(1/most, 1/least), discReserve*most*lsb
	farthest := c.Compression.at(c.AmplitudeLimit) // of |y|, rounded or not
	s.Disc = c.Compression.at(edge)
	switch {
	case c.Kind == Baseband:
		gain, inverse, perSample = most, 1/least, boxReserve*most*lsb
		s.Box = s.Disc
	case c.boxed():
		s.Box, s.Disc = s.Disc, math.Sqrt2*s.Disc
		farthest *= math.Sqrt2
	}
	across := s.Disc // what one quadrature reaches
	if s.Box > 0 {
		across = s.Box
	}
	if bound := (c.SlewLimit - slewReserve*lsb) / inverse; !(bound > 0) {
		return nothing("slew_limit: %s is within the rounding of %d bit", quantity.Format(c.SlewLimit, quantity.PerSample), p.Bits)
	} else if bound < 2*across {
		s.Rows = slewRows(s, p.SamplePeriod, bound, across)
	}
	rounding := perSample * math.Sqrt(float64(free)) // of the root of the sum of squares
	if c.RMSLimit > 0 {
		bound := c.RMSLimit*math.Sqrt(c.rmsSamples(samples, p.SamplePeriod)) - rounding
		if !(bound > 0) {
			return nothing("rms_limit: %s is within the rounding of %d bit", share(c.RMSLimit), p.Bits)
		}
		if s.Disc*math.Sqrt(float64(free)) > bound {
			s.Balls = append(s.Balls, Ball{Limit: RMS, Bound: bound})
		}
	}
	if c.OutOfBand > 0 && c.Band*p.SamplePeriod < 0.5 {
		root := c.OutOfBand * math.Sqrt(float64(samples))
		if s.OutOfBandReserved = rounding <= roundingShare*root; s.OutOfBandReserved {
			root -= rounding
		}
		s.OutOfBand = root * root
	}
	if !math.IsInf(c.RingOut.Limit, 1) {
		rows, reserved, err := ringOutRows(p, c, s, farthest, gain)
		if err != nil {
			return nothing("ring_out: %v", err)
		}
		s.Rows = append(s.Rows, rows...)
		s.Reserved = reserved
	}
	return s, nil
}

// stretch is K for slopes between least and most.
func stretch(least, most float64) float64 { return (most+least)/2 + (most-least)/math.Sqrt2 }

// rmsSamples is the number of samples over which the mean square is taken.
func (c *Channel) rmsSamples(samples int, period float64) float64 {
	return math.Max(float64(samples), c.RMSPeriod/period)
}

// slewRows bounds each step between neighbours of which one at least is free. Outside the span the output is zero.
func slewRows(s *Set, period, bound, across float64) []Row {
	first, end := s.Lead, s.Samples-s.Trail
	rows := make([]Row, 0, end-first+1)
	for k := first; k <= end; k++ { // the step from sample k-1 to sample k
		row := Row{Limit: Slew, At: float64(k) * period, First: k - 1, Weights: []complex128{-1, 1}, Bound: bound}
		if k == first {
			row.First, row.Weights = k, row.Weights[1:]
		} else if k == end {
			row.Weights = row.Weights[:1]
		}
		if len(row.Weights) == 2 || bound < across {
			rows = append(rows, row)
		}
	}
	return rows
}
