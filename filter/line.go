package filter

import (
	"fmt"
	"math"
	"math/cmplx"
)

const (
	// MaxPower is the highest power of one pole. Scratch for a chain of this
	// length lives on the stack; thirty-two equal poles in a row is far beyond
	// any line met in practice.
	MaxPower = 32
	// MaxTerms bounds the terms of one line, so that a hostile description
	// cannot ask for unlimited work.
	MaxTerms = 4096
)

// A Term is one term Residue/(s-Pole)^Power of a transfer function. Pole is in
// rad/ns with a negative real part, Power lies in 1..MaxPower, Residue is in
// (1/ns)^Power and unnormalised.
type Term struct {
	Pole    complex128
	Power   int
	Residue complex128
}

// A Line is the transfer function
//
//	G(s) = e^{-s Delay} ( Direct + sum Residue/(s-Pole)^Power ).
//
// Delay is in ns; Direct is the gain at infinite frequency. A pole that occurs
// with several powers is listed once for each. Every constructor of this
// package returns a line that passes [Line.Check]; a line put together by hand
// should be checked before use. The zero value passes nothing on; [Through]
// is the line that changes nothing.
type Line struct {
	Delay  float64
	Direct complex128
	Terms  []Term
}

// Through returns the line that changes nothing, G = 1.
func Through() Line { return Line{Direct: 1} }

// Check reports the first reason why l is not a stable line with finite
// numbers: a negative or endless delay, a pole that does not decay, a power
// outside 1..MaxPower, more than MaxTerms terms, or a number that is not finite.
func (l Line) Check() error {
	if !(l.Delay >= 0 && l.Delay <= longestTime) {
		return fmt.Errorf("filter: delay %g ns; allowed: 0 to %g ns", l.Delay, float64(longestTime))
	}
	if !finite(l.Direct) {
		return fmt.Errorf("filter: direct gain %v; allowed: finite numbers", l.Direct)
	}
	if len(l.Terms) > MaxTerms {
		return fmt.Errorf("filter: %d terms; allowed: at most %d", len(l.Terms), MaxTerms)
	}
	for i, t := range l.Terms {
		if !finite(t.Pole) || !(real(t.Pole) < 0) {
			return fmt.Errorf("filter: term %d: pole %v 1/ns; allowed: finite, with a negative real part", i, t.Pole)
		}
		if t.Power < 1 || t.Power > MaxPower {
			return fmt.Errorf("filter: term %d: power %d; allowed: 1 to %d", i, t.Power, MaxPower)
		}
		if !finite(t.Residue) {
			return fmt.Errorf("filter: term %d: residue %v; allowed: finite numbers", i, t.Residue)
		}
	}
	return nil
}

func finite(z complex128) bool { return !cmplx.IsNaN(z) && !cmplx.IsInf(z) }

// realTolerance is the relative mismatch at which two numbers of a line still
// count as conjugates: a few hundred roundings, and far under any line's
// uncertainty.
const realTolerance = 1e-12

// Real reports whether l maps real samples to real fields: a real direct gain
// and every term matched by its conjugate, both to 1e-12 of their size.
func (l Line) Real() bool {
	near := func(a, b complex128) bool { return cmplx.Abs(a-b) <= realTolerance*cmplx.Abs(a) }
	if !near(l.Direct, cmplx.Conj(l.Direct)) {
		return false
	}
	for _, t := range l.Terms {
		found := false
		for _, o := range l.Terms {
			if o.Power == t.Power && near(t.Pole, cmplx.Conj(o.Pole)) && near(t.Residue, cmplx.Conj(o.Residue)) {
				found = true
				break
			}
		}
		if !found {
			return false
		}
	}
	return true
}

// Response returns G(iw), pure delay included, at the angular frequency w in
// rad/ns, of either sign.
func (l Line) Response(w float64) complex128 {
	g := l.response(w)
	if l.Delay != 0 {
		sin, cos := math.Sincos(-w * l.Delay)
		g *= complex(cos, sin)
	}
	return g
}

// response is Response without the pure delay.
func (l Line) response(w float64) complex128 {
	g := l.Direct
	for _, t := range l.Terms {
		d := complex(0, w) - t.Pole
		v := t.Residue
		for range t.Power {
			v /= d
		}
		g += v
	}
	return g
}

// steadyRounding is the share of the sum of its parts' sizes under which a steady
// gain is nothing but rounding: 512 units in the last place. Long cascades of close
// poles leave up to some forty.
const steadyRounding = 512 * 0x1p-52

// DC returns the steady gain G(0) = Direct + sum Residue/(-Pole)^Power. Where the
// parts cancel to within their rounding, 1.1e-13 of the sum of their sizes, as in
// an AC-coupled line, it is exactly 0.
func (l Line) DC() complex128 {
	g, size := l.Direct, cmplx.Abs(l.Direct)
	for _, t := range l.Terms {
		v := t.Residue
		for range t.Power {
			v /= -t.Pole
		}
		g += v
		size += cmplx.Abs(v)
	}
	if cmplx.Abs(g) <= steadyRounding*size {
		return 0
	}
	return g
}

// GroupDelay returns -d arg G/dw in ns, pure delay included, at the angular
// frequency w in rad/ns, of either sign: how late the envelope of a narrow-band
// signal at w arrives. It is NaN where the gain is zero.
func (l Line) GroupDelay(w float64) float64 {
	g, d := l.Direct, complex128(0) // G and -G', delay aside
	for _, t := range l.Terms {
		v := t.Residue
		at := complex(0, w) - t.Pole
		for range t.Power {
			v /= at
		}
		g += v
		d += v / at * complex(float64(t.Power), 0)
	}
	if g == 0 {
		return math.NaN()
	}
	return l.Delay + real(d/g)
}

// Step returns the response at t ns after arrival to an input that rises from
// zero to one and stays,
//
//	Direct + sum Residue int_0^t v^{m-1}/(m-1)! e^{p v} dv.
//
// It is 0 before arrival, Direct just after it, and tends to DC.
func (l Line) Step(t float64) complex128 {
	if !(t >= 0) {
		return 0
	}
	u := l.Direct
	var c chain
	var q state
	for i := range l.Terms {
		if !c.load(l.Terms, i) {
			continue
		}
		c.integrals(t, &q)
		u += c.apply(&c.out, &q)
	}
	return u
}

// SlowestTime returns the longest time constant 1/|Re p| in ns, and 0 for a
// line without poles.
func (l Line) SlowestTime() float64 {
	slowest := 0.0
	for _, t := range l.Terms {
		slowest = max(slowest, 1/math.Abs(real(t.Pole)))
	}
	return slowest
}

// FastestRate returns the largest |p| in 1/ns, and 0 for a line without poles.
func (l Line) FastestRate() float64 {
	fastest := 0.0
	for _, t := range l.Terms {
		fastest = max(fastest, cmplx.Abs(t.Pole))
	}
	return fastest
}

// HoldDroop returns |sinc(f h)|, sinc x = sin(pi x)/(pi x): the gain at the
// cyclic frequency f (GHz) of a converter that holds each sample for h ns. It is
// 1 at f = 0 and 2/pi (-3.92 dB) at half the sample rate.
func HoldDroop(f, h float64) float64 {
	x := math.Pi * f * h
	if math.Abs(x) < 1e-8 { // x^2/6 is below half an ulp of one
		return 1
	}
	return math.Abs(math.Sin(x) / x)
}
