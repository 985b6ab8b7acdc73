package filter

import (
	"fmt"
	"math"
	"math/cmplx"
)

// How a line answers to errors of its own parameters. G depends linearly on each of
// its sections, and the held response linearly on G, so the derivative of what
// arrives is what arrives through another line: the slope of the section that has
// the parameter, cascaded with the other sections. Slopes are exact, not
// differences; poles of power m give poles of power m+1.
//
// For a section whose poles all scale with one corner, G(s) = g(s/corner), the
// residue of a term scales as corner^m and
//
//	d/dlog corner [ r/(s-p)^m ] = m r/(s-p)^m + m r p/(s-p)^{m+1}.

// CornerSlope returns dG/dlog(corner): the change of the line per relative change of
// every pole's frequency together, at the same delay, direct gain and steady gain.
// It is the derivative in the corner of one section of [SinglePole], [Bessel],
// [Butterworth], [CriticallyDamped], [GaussianLike], [HighPass]; in the time of [SinglePole],
// [ACCoupling], [Allpass] and [FractionalDelay] it is that with the sign changed. For several
// sections see [CascadeSlope]. The result has no steady gain and no direct gain.
// A line that fails [Line.Check], or has a pole of power MaxPower, is refused.
func (l Line) CornerSlope() (Line, error) {
	if err := l.Check(); err != nil {
		return Line{}, err
	}
	d := Line{Delay: l.Delay}
	for _, t := range l.Terms {
		r := t.Residue * complex(float64(t.Power), 0)
		d.add(Term{t.Pole, t.Power, r})
		d.add(Term{t.Pole, t.Power + 1, r * t.Pole})
	}
	return d.slope()
}

// DelaySlope returns dG/dDelay = -s G(s), in 1/ns: minus the field's slope in time,
//
//	-s r/(s-p)^m = -r/(s-p)^{m-1} - p r/(s-p)^m.
//
// It belongs to the times of l: Held gives, at a time t after the nominal
// arrival, the change of the field at that instant per ns of later arrival.
//
// Only a line without direct gain has one: where the field jumps at the sample edges, a
// shift of the edges changes it by the whole jump, in an instant, however small the
// shift. Such a line is refused; cascade it with the low-pass that follows first. A line that
// falls off as 1/s has kinks at the edges, where its slope jumps: the result then has a
// direct gain, and on an edge the slope is the one just after it.
func (l Line) DelaySlope() (Line, error) {
	if err := l.Check(); err != nil {
		return Line{}, err
	}
	if l.Direct != 0 {
		return Line{}, fmt.Errorf("filter: the field jumps at sample edges (direct gain %v) and has no derivative in the delay; allowed: direct gain 0, as after a low-pass", l.Direct)
	}
	d := Line{Delay: l.Delay}
	size := 0.0
	for _, t := range l.Terms {
		if t.Power == 1 {
			d.Direct -= t.Residue
			size += cmplx.Abs(t.Residue)
		} else {
			d.add(Term{t.Pole, t.Power - 1, -t.Residue})
		}
		d.add(Term{t.Pole, t.Power, -t.Pole * t.Residue})
	}
	// The residues of a line that falls off as 1/s^2 or faster add to zero.
	if cmplx.Abs(d.Direct) <= realTolerance*size {
		d.Direct = 0
	}
	if l.Real() {
		d.Direct = complex(real(d.Direct), 0)
	}
	return d.slope()
}

// TailSlopes returns the derivatives of Tails(list) per relative change of the
// amplitude and of the time of tail i, from 0:
//
//	dG/dlog a = a s T/(1 + s T),   dG/dlog T = a s T/(1 + s T)^2.
//
// Errors are those of [Tails], and an i outside the list.
func TailSlopes(list []Tail, i int) (amplitude, time Line, err error) {
	if _, err := Tails(list); err != nil {
		return Line{}, Line{}, err
	}
	if i < 0 || i >= len(list) {
		return Line{}, Line{}, fmt.Errorf("filter: tail %d; allowed: 0 to %d", i, len(list)-1)
	}
	t := list[i]
	if t.Amplitude == 0 {
		return Line{}, Line{}, nil
	}
	a, p := complex(t.Amplitude, 0), complex(-1/t.Time, 0)
	amplitude = Line{Direct: a, Terms: []Term{{p, 1, a * p}}}
	time = Line{Terms: []Term{{p, 1, -a * p}, {p, 2, -a * p * p}}}
	return amplitude, time, nil
}

// ResonatorSlopes returns the derivatives of Resonator(offset, halfWidth): per GHz of
// the offset, which may be zero, and per relative change of the half width.
func ResonatorSlopes(offset, halfWidth float64) (perOffset, width Line, err error) {
	if err := checkResonance(offset, halfWidth, 0); err != nil {
		return Line{}, Line{}, err
	}
	p := resonancePole(offset, halfWidth)
	by := func(move complex128) Line { // dG/dp = -1/(s-p) - p/(s-p)^2
		return Line{Terms: []Term{{p, 1, -move}, {p, 2, -p * move}}}
	}
	return by(complex(0, 2*math.Pi)), by(complex(real(p), 0)), nil
}

// ResonanceSlopes returns the derivatives of Resonance(offset, halfWidth, depth): per
// GHz of the offset, which may be zero, and per relative change of the half width and
// of the depth.
func ResonanceSlopes(offset, halfWidth float64, depth complex128) (perOffset, width, deep Line, err error) {
	if err := checkResonance(offset, halfWidth, depth); err != nil {
		return Line{}, Line{}, Line{}, err
	}
	if depth == 0 {
		return Line{}, Line{}, Line{}, nil
	}
	t := resonanceTerm(offset, halfWidth, depth)
	perOffset = Line{Terms: []Term{{t.Pole, 2, t.Residue * complex(0, 2*math.Pi)}}}
	width = Line{Terms: []Term{t, {t.Pole, 2, t.Residue * complex(real(t.Pole), 0)}}}
	deep = Line{Terms: []Term{t}}
	return perOffset, width, deep, nil
}

// CascadeSlope returns the derivative of Cascade(sections...) in a parameter of
// section i, from 0, given that section's own slope: the product with the slope in
// its place. The slope must have the delay of the section that it stands for, so
// that times still count from the same arrival. Other errors are those of [Cascade].
//
// A parameter that several sections share has the [Sum] of their slopes; the delay of
// the whole has [Line.DelaySlope] of the whole.
func CascadeSlope(sections []Line, i int, slope Line) (Line, error) {
	if i < 0 || i >= len(sections) {
		return Line{}, fmt.Errorf("filter: slope of section %d; allowed: 0 to %d", i, len(sections)-1)
	}
	if err := slope.Check(); err != nil {
		return Line{}, fmt.Errorf("filter: slope of section %d: %w", i, err)
	}
	if slope.Delay != sections[i].Delay && !slope.zero() {
		return Line{}, fmt.Errorf("filter: slope of section %d has a delay of %g ns; allowed: that of the section, %g ns", i, slope.Delay, sections[i].Delay)
	}
	slope.Delay = sections[i].Delay
	parts := append([]Line(nil), sections...)
	parts[i] = slope
	return Cascade(parts...)
}

// Sum returns the line whose field is the sum of the lines' fields, as when two
// paths of equal delay meet, or when one parameter acts in several places. Lines with
// unlike delays are refused, as are those that fail [Line.Check]; a line that passes
// nothing may have any delay. No line at all passes nothing.
func Sum(lines ...Line) (Line, error) {
	var sum Line
	first := true
	for i, l := range lines {
		if err := l.Check(); err != nil {
			return Line{}, fmt.Errorf("filter: line %d of the sum: %w", i, err)
		}
		switch {
		case l.zero():
			continue
		case first:
			sum.Delay, first = l.Delay, false
		case l.Delay != sum.Delay:
			return Line{}, fmt.Errorf("filter: line %d of the sum has a delay of %g ns; allowed: that of the others, %g ns", i, l.Delay, sum.Delay)
		}
		sum.Direct += l.Direct
		for _, t := range l.Terms {
			sum.add(t)
		}
	}
	if err := sum.Check(); err != nil {
		return Line{}, fmt.Errorf("filter: the lines cannot be added: %w", err)
	}
	return sum, nil
}

// zero reports whether l passes nothing.
func (l Line) zero() bool { return l.Direct == 0 && len(l.Terms) == 0 }

// add adds a term, to the one with the same pole and power where there is one.
func (l *Line) add(t Term) {
	for i, o := range l.Terms {
		if o.Pole == t.Pole && o.Power == t.Power {
			l.Terms[i].Residue += t.Residue
			return
		}
	}
	l.Terms = append(l.Terms, t)
}

// slope returns l when it is within the limits of a line.
func (l Line) slope() (Line, error) {
	if err := l.Check(); err != nil {
		return Line{}, fmt.Errorf("filter: the line's slope leaves the limits of a line: %w", err)
	}
	return l, nil
}
