package main

import (
	"fmt"
	"math"

	"holdfast/design/brief"
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
	perQuad     int // coefficients per quadrature
	family      string
	equations   int
	independent int // fewer when one error contains another
	spare       int // coefficients that ring-out wants
	verdict     string
}

// perQuadrature gives the number of coefficients that a design uses by default,
// and the family: without a band, or with one of all frequencies, every free sample is one.
func perQuadrature(ch *hardware.Channel, period float64, free int, family string) (int, string) {
	if width := ch.Band * period; family != shape.FamilySamples && width < 0.5 {
		return shape.DefaultCount(free, width), shape.FamilySlepian
	}
	return free, shape.FamilySamples
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

// roomOf counts for a brief.
func roomOf(b *brief.Brief, p *hardware.Profile, channel, samples int) (room, error) {
	ch := &p.Channels[channel]
	r := room{free: samples - ch.GuardLead - ch.GuardTrail, equations: gateEquations, independent: gateEquations}
	r.perQuad, r.family = perQuadrature(ch, p.SamplePeriod, r.free, b.Basis.Family)
	if n := b.Basis.Coefficients; n > 0 && r.family == shape.FamilySlepian {
		r.perQuad = n
	}
	if r.perQuad*samples > shape.MaxEntries {
		return r, fmt.Errorf("span: found %s with %d coefficients per quadrature; allowed: a product of at most %d",
			count(samples, "sample"), r.perQuad, shape.MaxEntries)
	}
	var directions [][3]float64
	amplitude := false
	for _, e := range b.Errors {
		switch e.Kind {
		case brief.Any:
			r.equations += anyEquations
			directions = append(directions, [3]float64{1}, [3]float64{0, 1}, [3]float64{0, 0, 1})
		case brief.Amplitude:
			r.equations += namedEquations
			amplitude = true
		default:
			r.equations += namedEquations
			m := e.Operator
			directions = append(directions, [3]float64{real(m.At(0, 1)), -imag(m.At(0, 1)), real(m.At(0, 0))})
		}
	}
	r.independent += namedEquations * rank(directions)
	if amplitude { // one drive: a second amplitude error is the first again
		r.independent += namedEquations
	}
	together := 2 * r.perQuad
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

func (r room) andRingOut() string {
	if r.spare == 0 {
		return ""
	}
	return " and the ring-out limit"
}

func (r room) String() string {
	s := fmt.Sprintf("%d: %d of the gate", r.equations, gateEquations)
	if r.equations > gateEquations {
		s += fmt.Sprintf(" and %d of the errors", r.equations-gateEquations)
	}
	if r.independent < r.equations {
		s += fmt.Sprintf(", of which %d repeat others", r.equations-r.independent)
	}
	return s + fmt.Sprintf("; against them %d coefficients, %d per quadrature, family %s", 2*r.perQuad, r.perQuad, r.family)
}

// rank counts independent directions, by Gram and Schmidt.
func rank(list [][3]float64) int {
	var kept [][3]float64
	for _, v := range list {
		whole := dot(v, v)
		for _, k := range kept {
			f := dot(v, k) / dot(k, k)
			for i := range v {
				v[i] -= f * k[i]
			}
		}
		if len(kept) < 3 && dot(v, v) > 1e-12*whole {
			kept = append(kept, v)
		}
	}
	return len(kept)
}

func dot(a, b [3]float64) float64 { return a[0]*b[0] + a[1]*b[1] + a[2]*b[2] }
