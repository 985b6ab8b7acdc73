package main

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"holdfast/design/brief"
	"holdfast/design/device"
	"holdfast/hardware"
)

// Counting for whatever is more than a gate on one spin. With c code states of d levels the search asks of a gate that 2cd real numbers vanish, those of its
// columns less the target's; c^2 of them follow from the others, as the columns stay orthonormal, one is the global phase, and as many as there are
// independent directions in which the free rotations move the target cost nothing. Of k states that become others it asks 2kd, and 2k(d - k) say that nothing
// is left outside the span of the others. Each operator of a static error asks c^2 - 1 numbers, the traceless block of the code space; one that leaks 2c(d - c);
// one of a target of states 2kd, of which 2k(d - k) count; an error that rides on the controls as many as an operator. Operators that are sums of others ask
// for nothing new.
//
// On two spins with an exchange of 5 MHz and a drive each, searches with as many coefficients as independent equations never succeeded in 60 starts, those with
// four more did within five, and those with eight more at the first or second: limits on ring-out cost less than on one spin, and the warnings are for these.

// plainSpin says whether a brief is about a gate on one spin, for which roomOf counts by itself.
func plainSpin(b *brief.Brief, d *device.Device) bool {
	return d.Dim() == 2 && b.Target.From == nil &&
		!slices.ContainsFunc(b.Errors, func(e brief.Error) bool {
			return e.Kind == brief.Any && (len(e.Members) != 3 || e.Rates != "") || e.Noise != nil
		})
}

// lowered says whether what an error does is lowered and not cancelled: no equation asks for that.
func lowered(e *brief.Error) bool { return e.Spread != "" || e.Noise != nil }

// A tally counts what is asked, and what of it is independent.
type tally struct{ asked, independent int }

func (t *tally) add(asked, independent int) {
	t.asked, t.independent = t.asked+asked, t.independent+independent
}

// countRegister counts the equations of a brief into a room that knows its coefficients.
func (r *room) countRegister(b *brief.Brief, p *hardware.Profile, d *device.Device, ch *hardware.Channel) {
	dim, c, k := d.Dim(), len(d.CodeSpace()), len(b.Target.From)
	var gate, errors, each, leak tally
	var why []string
	if k > 0 {
		gate.add(2*k*dim, 2*k*(dim-k))
		each, leak = gate, gate
		why = append(why, "the span that is meant")
	} else {
		free := freeRank(&b.Target)
		gate.add(2*c*dim, 2*c*dim-c*c-1-free)
		each, leak = tally{c*c - 1, c*c - 1}, tally{2 * c * (dim - c), 2 * c * (dim - c)}
		if why = append(why, "unitarity", "the phase"); free > 0 {
			why = append(why, "the free rotations")
		}
	}
	var statics, leaking, borne span
	contained := false
	in := func(s *span, v vector, t tally) {
		if s.add(v) {
			errors.add(t.asked, t.independent)
		} else {
			errors.add(t.asked, 0)
			contained = true
		}
	}
	for i := range b.Errors {
		e := &b.Errors[i]
		if lowered(e) {
			continue
		}
		switch e.Kind {
		case brief.Static, brief.Any:
			for _, m := range e.Members {
				if e.Leak {
					in(&leaking, operatorVector(m.Operator), leak)
				} else {
					in(&statics, operatorVector(m.Operator), each)
				}
			}
		case brief.Offset:
			in(&statics, operatorVector(offsetOperator(e, p, d)), each)
		case brief.Amplitude: // of I, Q and both one is the sum of the others, and so of channels
			in(&borne, scaledControls(e, d), each)
		default: // each parameter is its own
			errors.add(each.asked, each.independent)
		}
	}
	if contained {
		why = append(why, "errors that others contain")
	}
	r.gate, r.equations, r.independent = gate.asked, gate.asked+errors.asked, gate.independent+errors.independent
	if r.independent < r.equations {
		if r.why = why[len(why)-1]; len(why) > 1 {
			r.why = strings.Join(why[:len(why)-1], ", ") + " and " + r.why
		}
	}
	switch r.spare = spare(ch, ringOutLeast); {
	case r.together <= r.independent:
		r.verdict = fmt.Sprintf("Too few coefficients: %d equations want more than %d, and the span carries %d. Expect 'not found'; a longer span carries more.",
			r.independent, r.independent, r.together)
	case r.together <= r.independent+r.spare:
		r.verdict = fmt.Sprintf("Hardly enough coefficients: %d equations%s are easy with more than %d, and the span carries %d. A longer span carries more.",
			r.independent, r.andRingOut(), r.independent+r.spare, r.together)
	}
}

// freeRank counts the independent directions in which the free rotations move the target W: of the before ones G those of G, of the after ones those of W'GW.
func freeRank(t *brief.Target) int {
	var axes []string
	before, after := t.Local, t.Local
	switch {
	case t.Local:
		axes = device.OperatorNames()
	case t.FreeZ != brief.NoFreeZ && t.FreeZ != "":
		axes = []string{"Z"}
		before, after = t.FreeZ != brief.After, t.FreeZ != brief.Before
	}
	w := t.Whole
	var s span
	n := 0
	for c := 1; c < w.N; c *= 2 { // a site of the code space for each factor of two
		for _, axis := range axes {
			o, _ := device.Operator(axis)
			g := device.Kron(device.Kron(device.Identity(w.N/(2*c)), o), device.Identity(c))
			if before && s.add(operatorVector(g)) {
				n++
			}
			if after && s.add(operatorVector(w.Adjoint().Mul(g).Mul(w))) {
				n++
			}
		}
	}
	return n
}

// offsetOperator gives what a constant at the converter of a channel drives.
func offsetOperator(e *brief.Error, p *hardware.Profile, d *device.Device) device.Matrix {
	mixing := ""
	if c, ok := p.Channel(e.Channels[0]); ok {
		mixing = string(p.Channels[c].Mixing)
	}
	ops := d.Paths(e.Channels[0], mixing)[0].Operators
	if e.Quadrature == "Q" && len(ops) == 2 {
		return ops[1]
	}
	return ops[0]
}

// scaledControls says which quadratures of which channels an amplitude error scales; of no channel in particular all.
func scaledControls(e *brief.Error, d *device.Device) vector {
	var v vector
	for i, name := range d.Channels() {
		if len(e.Channels) > 0 && !slices.Contains(e.Channels, name) {
			continue
		}
		_, drives := d.Aim(name)
		if e.Quadrature != "Q" || !drives {
			v = append(v, entry{2 * i, 1})
		}
		if e.Quadrature != "I" && drives {
			v = append(v, entry{2*i + 1, 1})
		}
	}
	return v
}

// A vector has its entries other than zero, in the order of their places: operators of many levels have few.
type vector []entry

type entry struct {
	at int
	v  float64
}

// operatorVector gives the coordinates of the traceless part of a Hermitian matrix.
func operatorVector(m device.Matrix) (v vector) {
	mean := real(m.Trace()) / float64(m.N)
	for i := range m.N {
		for j := i; j < m.N; j++ {
			z := m.At(i, j)
			if i == j {
				z -= complex(mean, 0)
			}
			at := 2 * (i*m.N + j)
			if x := real(z); x != 0 {
				v = append(v, entry{at, x})
			}
			if y := imag(z); y != 0 && i != j {
				v = append(v, entry{at + 1, y})
			}
		}
	}
	return v
}

// dot gives the scalar product.
func (v vector) dot(w vector) float64 {
	sum := 0.0
	for len(v) > 0 && len(w) > 0 {
		switch {
		case v[0].at < w[0].at:
			v = v[1:]
		case v[0].at > w[0].at:
			w = w[1:]
		default:
			sum += v[0].v * w[0].v
			v, w = v[1:], w[1:]
		}
	}
	return sum
}

// less gives v - f w.
func (v vector) less(f float64, w vector) (out vector) {
	for len(v) > 0 || len(w) > 0 {
		switch {
		case len(w) == 0 || len(v) > 0 && v[0].at < w[0].at:
			out, v = append(out, v[0]), v[1:]
		case len(v) == 0 || v[0].at > w[0].at:
			out, w = append(out, entry{w[0].at, -f * w[0].v}), w[1:]
		default:
			out = append(out, entry{v[0].at, v[0].v - f*w[0].v})
			v, w = v[1:], w[1:]
		}
	}
	return out
}

// rank counts the independent ones of some vectors.
func rank(list []vector) int {
	var s span
	for _, v := range list {
		s.add(v)
	}
	return len(s)
}

// A span is what some vectors span: orthogonal ones of length 1.
type span []vector

// add puts a vector in and says whether it was outside what is there, by Gram and Schmidt.
func (s *span) add(v vector) bool {
	whole := math.Sqrt(v.dot(v))
	for _, k := range *s {
		if f := v.dot(k); math.Abs(f) > 1e-12*whole {
			v = v.less(f, k)
		}
	}
	left := math.Sqrt(v.dot(v))
	if !(left > 1e-6*whole) {
		return false
	}
	out := make(vector, len(v))
	for i, e := range v {
		out[i] = entry{e.at, e.v / left}
	}
	*s = append(*s, out)
	return true
}
