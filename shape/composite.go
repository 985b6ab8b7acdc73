package shape

import (
	"fmt"
	"math"
)

// References of this file:
//
//	[cummins]  H. K. Cummins, G. Llewellyn, J. A. Jones, Tackling systematic errors
//	           in quantum logic gates with composite rotations, Phys. Rev. A 67,
//	           042308 (2003).
//	[wimperis] S. Wimperis, Broadband, narrowband, and passband composite pulses for
//	           use in advanced NMR experiments, J. Magn. Reson. A 109, 221 (1994).
//	[ryan]     C. A. Ryan, J. S. Hodges, D. G. Cory, Robust decoupling techniques to
//	           extend quantum coherence in diamond, Phys. Rev. Lett. 105, 200402 (2010),
//	           which credits the sequence to E. Knill.

// A Segment is one rotation of a composite sequence: by Angle rad about the
// axis cos(Phase) X + sin(Phase) Y, Phase in rad. Angle is never negative.
type Segment struct{ Angle, Phase float64 }

// CORPSE returns the sequence that turns by theta about X and cancels a
// detuning to first order, n = (1, 1, 0) of [cummins]: with
// k = asin(sin(theta/2)/2),
//
//	2 pi + theta/2 - k,  2 pi - 2k at phase pi,  theta/2 - k.
//
// theta is in rad, within 2 pi of zero; anything else is an error. A negative
// theta turns about -X: every phase grows by pi.
func CORPSE(theta float64) ([]Segment, error) {
	return corpse("CORPSE", 2*math.Pi, theta)
}

// ShortCORPSE returns the shorter sequence of the same kind, n = (0, 1, 0) of
// [cummins]: as [CORPSE] without the full turn of the first segment. theta is as
// for CORPSE. It turns by theta - 2 pi: the same gate, of the other sign.
func ShortCORPSE(theta float64) ([]Segment, error) {
	return corpse("short CORPSE", 0, theta)
}

// corpse has extra rad, whole turns, in its first segment.
func corpse(name string, extra, theta float64) ([]Segment, error) {
	turn, axis, err := rotation(name, theta, 2*math.Pi)
	if err != nil {
		return nil, err
	}
	k := math.Asin(math.Sin(turn/2) / 2)
	return []Segment{
		{extra + (turn/2 - k), axis},
		{2*math.Pi - 2*k, axis + math.Pi},
		{turn/2 - k, axis},
	}, nil
}

// SCROFULOUS returns the sequence of three segments that turns by theta about
// X and cancels an amplitude error to first order [cummins]:
//
//	theta1 at phase phi1,  pi at phi2,  theta1 at phi1, where
//	sin(theta1)/theta1 = 2 cos(theta/2)/pi,
//	phi1 = acos(-pi cos(theta1)/(2 theta1 sin(theta/2))),
//	phi2 = phi1 - acos(-pi/(2 theta1)).
//
// theta is in rad, within 2 pi of zero; anything else is an error. A negative
// theta turns about -X: every phase grows by pi. Beyond pi the sequence is the
// one for theta - 2 pi, the same gate of the other sign, because the formula
// has no solution from 220 degrees on.
func SCROFULOUS(theta float64) ([]Segment, error) {
	turn, axis, err := rotation("SCROFULOUS", theta, 2*math.Pi)
	if err != nil {
		return nil, err
	}
	if turn > math.Pi {
		turn, axis = 2*math.Pi-turn, axis+math.Pi
	}
	// In terms of excess = theta1 - pi/2, where a small theta loses no digits:
	//
	//	f = 2 sin^2(theta/4) - 2 sin^2(excess/2) - (2 excess/pi) cos(theta/2) = 0.
	//
	// f falls and is concave from 0 to pi/2, and is not positive at pi/2: from
	// there Newton's iterates fall towards the root without passing it, so that
	// the first one that does not fall has met the rounding.
	lift, cos := 2*math.Pow(math.Sin(turn/4), 2), math.Cos(turn/2)
	excess := math.Pi / 2
	for range 64 {
		f := lift - 2*math.Pow(math.Sin(excess/2), 2) - 2*excess/math.Pi*cos
		next := excess + f/(math.Sin(excess)+2/math.Pi*cos)
		if !(next < excess) {
			break
		}
		excess = math.Max(next, 0)
	}
	angle := math.Pi/2 + excess
	first := math.Pi / 2 // the limit at theta = 0
	if turn > 0 {
		first = math.Acos(math.Min(1, math.Pi*math.Sin(excess)/(2*angle*math.Sin(turn/2))))
	}
	// acos(-1/(1+e)) = pi - 2 asin(sqrt(e/(1+e)/2)), e = 2 excess/pi.
	middle := first - math.Pi + 2*math.Asin(math.Sqrt(excess/angle/2))
	return []Segment{{angle, axis + first}, {math.Pi, axis + middle}, {angle, axis + first}}, nil
}

// BB1 returns the sequence that turns by theta about X and cancels an
// amplitude error to second order [wimperis]: with phi = acos(-theta/(4 pi)),
//
//	pi at phase phi,  2 pi at 3 phi,  pi at phi,  theta at 0.
//
// theta is in rad, within 2 pi of zero; anything else is an error. A negative
// theta turns about -X: every phase grows by pi.
func BB1(theta float64) ([]Segment, error) {
	turn, axis, err := rotation("BB1", theta, 2*math.Pi)
	if err != nil {
		return nil, err
	}
	phi := math.Acos(-turn / (4 * math.Pi))
	return []Segment{
		{math.Pi, axis + phi},
		{2 * math.Pi, axis + 3*phi},
		{math.Pi, axis + phi},
		{turn, axis},
	}, nil
}

// Knill returns the sequence of five half turns that makes a half turn about
// X and cancels both an amplitude error and a detuning to first order [ryan].
//
// As published, with phases pi/6, 0, pi/2, 0, pi/6, it is followed by a rotation
// of -pi/3 about Z. Five half turns with phases p1 to p5 are a half turn with
// phase p1-p2+p3-p4+p5 = 5 pi/6, so taking 5 pi/6 off every phase turns about X
// itself:
//
//	pi at -2 pi/3, -5 pi/6, -pi/3, -5 pi/6, -2 pi/3.
//
// theta is pi or -pi, to 1e-9; the sequence exists for half turns only, and
// anything else is an error.
func Knill(theta float64) ([]Segment, error) {
	if !(math.Abs(math.Abs(theta)-math.Pi) <= 1e-9) {
		return nil, fmt.Errorf("shape: Knill: a rotation by %v rad; allowed: pi or -pi, a half turn", theta)
	}
	_, axis, err := rotation("Knill", theta, 4)
	if err != nil {
		return nil, err
	}
	s := make([]Segment, 5)
	for i, sixths := range [5]float64{-4, -5, -2, -5, -4} {
		s[i] = Segment{math.Pi, axis + sixths*math.Pi/6}
	}
	return s, nil
}

// rotation splits theta into a turn of 0 to limit and the phase of its axis, 0
// or pi.
func rotation(name string, theta, limit float64) (turn, axis float64, err error) {
	switch {
	case !(math.Abs(theta) <= limit):
		return 0, 0, fmt.Errorf("shape: %s: a rotation by %v rad; allowed: within %.9g of zero", name, theta, limit)
	case theta < 0:
		return -theta, math.Pi, nil
	}
	return theta, 0, nil
}
