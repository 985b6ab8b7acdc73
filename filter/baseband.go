package filter

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"
)

// Resonator returns the path through a resonator that is not tuned to the carrier,
// with unit gain at the carrier:
//
//	G(s) = -p/(s - p),   p = 2 pi (-halfWidth + i offset).
//
// offset is the resonator's centre in the baseband of the samples, in GHz from -1e6
// to 1e6; halfWidth is half its full width between the -3.0103 dB points, in GHz from
// 1e-12 to 1e6. With an offset the response is tilted: d|G|/dw at the carrier is
// Im p/|p|^2, and I turns into Q. See [Mirror] for which side a frequency above the
// carrier appears on. Without offset it is the single pole.
func Resonator(offset, halfWidth float64) (Line, error) {
	if err := checkResonance(offset, halfWidth, 0); err != nil {
		return Line{}, err
	}
	p := resonancePole(offset, halfWidth)
	return Line{Terms: []Term{{Pole: p, Power: 1, Residue: -p}}}, nil
}

// Resonance returns a line that passes by a resonance, with unit gain far from it:
//
//	G(s) = 1 - depth kappa/(s - p),   kappa = 2 pi halfWidth,   p = -kappa + 2 pi i offset.
//
// Ranges of offset and halfWidth (GHz) are those of [Resonator]. depth, up to 1000 in
// size, is the share that is missing at the resonance, where G = 1 - depth: between 0 and 1
// a dip, negative a peak, complex a lopsided line shape. A dip on the carrier itself
// whose depth is real is a real line; any other turns I into Q.
// [Line.UnitGain] brings the gain at the carrier to one instead.
func Resonance(offset, halfWidth float64, depth complex128) (Line, error) {
	if err := checkResonance(offset, halfWidth, depth); err != nil {
		return Line{}, err
	}
	l := Through()
	if depth != 0 {
		l.Terms = []Term{resonanceTerm(offset, halfWidth, depth)}
	}
	return l, nil
}

func checkResonance(offset, halfWidth float64, depth complex128) error {
	if !(math.Abs(offset) <= highestCorner) {
		return fmt.Errorf("filter: resonance offset %g GHz; allowed: %g to %g GHz", offset, -highestCorner, highestCorner)
	}
	if !(halfWidth >= lowestCorner && halfWidth <= highestCorner) {
		return fmt.Errorf("filter: resonance half width %g GHz; allowed: %g to %g GHz", halfWidth, lowestCorner, highestCorner)
	}
	if !(cmplx.Abs(depth) <= largestTail) {
		return fmt.Errorf("filter: resonance depth %v; allowed: up to %g in size", depth, largestTail)
	}
	return nil
}

func resonancePole(offset, halfWidth float64) complex128 {
	return complex(-2*math.Pi*halfWidth, 2*math.Pi*offset)
}

func resonanceTerm(offset, halfWidth float64, depth complex128) Term {
	return Term{Pole: resonancePole(offset, halfWidth), Power: 1, Residue: -depth * complex(2*math.Pi*halfWidth, 0)}
}

// Mirror returns the line whose response is conj G(-iw): poles, residues and direct
// gain conjugated, the delay kept.
//
// A line described by the gain S21 at the frequencies carrier + f acts on samples
// x_I + i x_Q as S21(carrier + f) when the carrier is x_I cos - x_Q sin, and
// as conj S21(carrier - f), the mirror image, when it is x_I cos + x_Q sin: a
// resonance above the carrier then has a negative offset. A real line is its own mirror.
// Mirroring twice changes nothing, and the mirror passes conj x as l passes x,
// conjugated.
func Mirror(l Line) Line {
	m := Line{Delay: l.Delay, Direct: cmplx.Conj(l.Direct), Terms: append([]Term(nil), l.Terms...)}
	for i, t := range m.Terms {
		m.Terms[i] = Term{cmplx.Conj(t.Pole), t.Power, cmplx.Conj(t.Residue)}
	}
	return m
}

// UnitGain returns l divided by its steady gain, so that it passes the carrier with
// gain one and phase zero, pure delay aside: what calibrating the drive on
// resonance does. A line without steady gain is refused.
func (l Line) UnitGain() (Line, error) {
	if err := l.Check(); err != nil {
		return Line{}, err
	}
	dc := l.DC()
	if dc == 0 {
		return Line{}, errors.New("filter: the line has no steady gain to divide by; allowed: lines that pass the carrier")
	}
	if l.Real() {
		dc = complex(real(dc), 0)
	}
	u := Line{Delay: l.Delay, Direct: l.Direct / dc, Terms: append([]Term(nil), l.Terms...)}
	for i := range u.Terms {
		u.Terms[i].Residue /= dc
	}
	if err := u.Check(); err != nil {
		return Line{}, fmt.Errorf("filter: steady gain %v is too small to divide by: %w", dc, err)
	}
	return u, nil
}
