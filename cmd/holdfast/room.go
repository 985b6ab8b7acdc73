package main

import (
	"fmt"
	"math"
	"slices"

	"holdfast/design/brief"
	"holdfast/design/device"
	"holdfast/hardware"
	"holdfast/shape"
)

// Counting equations against coefficients. The gate is three equations (a
// rotation vector), every named error three (the vector that survives it), any
// static error nine (three for each direction). A pulse has as many unknowns as
// coefficients. More of these than of those is needed and is not enough: whether
// the limits leave a solution only a search can tell.

const (
	gateEquations  = 3
	namedEquations = 3
	anyEquations   = 9
)

// What ring-out costs beside the equations, in coefficients of both quadratures:
// with fewer than the first a search hardly ever succeeds, with more than the
// second the count is in its favour. Measured on many designs; not a law.
const (
	ringOutLeast = 4
	ringOutEasy  = 6
)

// A room says how a span's coefficients compare with the equations.
type room struct {
	free        int // samples that are not guards
	perQuad     int // coefficients per quadrature of the first channel
	together    int // of all quadratures of all channels
	family      string
	equations   int
	independent int    // fewer when one error contains another
	gate        int    // of the equations
	why         string // of other than a gate on one spin: from what those that are not independent follow
	more        string // what is not counted
	spare       int    // coefficients that ring-out wants
	verdict     string
}

// perQuadrature gives the number of coefficients that a design uses by default,
// and the family: without a band, or with one of all frequencies, every free sample is one. What sums to zero has one less.
func perQuadrature(ch *hardware.Channel, period float64, free int, family string) (int, string) {
	n := free
	if width := ch.Band * period; family != shape.FamilySamples && width < 0.5 {
		n = shape.DefaultCount(free, width)
		if family == "" {
			family = shape.FamilySlepian
		}
	} else {
		family = shape.FamilySamples
	}
	if ch.ZeroMean {
		n = max(n-1, 0)
	}
	return n, family
}

// carries says for how many equations some coefficients suffice by the count,
// both quadratures together.
func carries(ch *hardware.Channel, together int) int { return together - 1 - spare(ch, ringOutEasy) }

// spare is n for a channel with a limit on ring-out and none for another.
func spare(ch *hardware.Channel, n int) int {
	if math.IsInf(ch.RingOut.Limit, 1) {
		return 0
	}
	return n
}

// roomOf counts for a brief, of which the site is turned by the given channels.
func roomOf(b *brief.Brief, p *hardware.Profile, d *device.Device, channels []int, samples int) (room, error) {
	ch := &p.Channels[channels[0]]
	r := room{free: samples - ch.GuardLead - ch.GuardTrail, gate: gateEquations, equations: gateEquations, independent: gateEquations}
	for i, c := range channels {
		q := &p.Channels[c]
		perQuad, family := perQuadrature(q, p.SamplePeriod, samples-q.GuardLead-q.GuardTrail, b.Basis.Family)
		if n := b.Basis.Coefficients; n > 0 && family != shape.FamilySamples {
			perQuad = n
		}
		if perQuad*samples > shape.MaxEntries {
			return r, fmt.Errorf("span: found %s with %d coefficients per quadrature; allowed: a product of at most %d",
				count(samples, "sample"), perQuad, shape.MaxEntries)
		}
		if i == 0 {
			r.perQuad, r.family = perQuad, family
		}
		r.together += q.Columns() * perQuad
	}
	for _, e := range b.Errors {
		if e.Order == 2 || lowered(&e) {
			r.more = "second orders, spreads and noise are not counted"
		}
	}
	if !plainSpin(b, d) {
		r.countRegister(b, p, d, ch)
		return r, nil
	}
	var directions []vector
	scaled := map[string]int{} // amplitude errors of a channel: of three, I, Q and both, one is the sum of the others
	for _, e := range b.Errors {
		if lowered(&e) {
			continue
		}
		if e.Kind == brief.Any {
			r.equations += anyEquations
			for _, name := range device.OperatorNames() {
				directions = append(directions, along(name))
			}
			continue
		}
		r.equations += namedEquations
		switch e.Kind {
		case brief.Static:
			directions = append(directions, operatorVector(e.Operator))
		case brief.Offset: // a constant along what the quadrature turns about
			about := "X"
			if e.Quadrature == "Q" {
				about = "Y"
			}
			for _, bias := range d.Biases {
				if bias.Channel == e.Channels[0] {
					about = bias.Axis
				}
			}
			directions = append(directions, along(about))
		case brief.Amplitude:
			scaled[fmt.Sprint(e.Channels)]++
		default: // each parameter is its own
			r.independent += namedEquations
		}
	}
	r.independent += namedEquations * rank(directions)
	for _, n := range scaled {
		r.independent += namedEquations * min(n, 2)
		if n > 1 && !slices.ContainsFunc(b.Errors, func(e brief.Error) bool { return e.Kind == brief.Amplitude && e.Quadrature != "" }) {
			r.independent -= namedEquations // the same error again
		}
	}
	together := r.together
	switch r.spare = spare(ch, ringOutEasy); {
	case together <= r.independent+spare(ch, ringOutLeast):
		r.verdict = fmt.Sprintf("Too few coefficients: %d equations%s want more than %d, and the span carries %d. Expect 'not found'; a longer span carries more.",
			r.independent, r.andRingOut(), r.independent+spare(ch, ringOutLeast), together)
	case together <= r.independent+r.spare:
		r.verdict = fmt.Sprintf("Hardly enough coefficients: %d equations%s are easy with more than %d, and the span carries %d. A longer span carries more.",
			r.independent, r.andRingOut(), r.independent+r.spare, together)
	}
	return r, nil
}

// along gives X, Y or Z of a spin.
func along(name string) vector {
	o, _ := device.Operator(name)
	return operatorVector(o)
}

func (r room) andRingOut() string {
	if r.spare == 0 {
		return ""
	}
	return " and the ring-out limit"
}

func (r room) String() string {
	s := fmt.Sprintf("%d: %d of the gate", r.equations, r.gate)
	if r.equations > r.gate {
		s += fmt.Sprintf(" and %d of the errors", r.equations-r.gate)
	}
	switch {
	case r.why != "":
		s += fmt.Sprintf("; %d are independent, the others follow from %s", r.independent, r.why)
	case r.independent < r.equations:
		s += fmt.Sprintf(", of which %d repeat others", r.equations-r.independent)
	}
	if r.more != "" {
		s += "; " + r.more
	}
	return s + fmt.Sprintf("; against them %d coefficients, %d per quadrature, family %s", r.together, r.perQuad, r.family)
}
