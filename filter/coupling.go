package filter

import (
	"fmt"
	"math"
)

// ACCoupling returns the first-order high-pass of a coupling capacitor or a bias
// tee with the time constant tau, in ns from 1e-6 to 1e12:
//
//	G(s) = s tau/(1 + s tau) = 1 - (1/tau)/(s + 1/tau).
//
// The step response is e^{-t/tau}: an edge passes whole and then droops, by t/tau at
// first. The steady gain is exactly zero, also after [Cascade], so the field of
// any finite pulse integrates to zero: after a pulse whose samples do not sum to
// zero, an undershoot of their sum times -h/tau remains and dies with tau.
func ACCoupling(tau float64) (Line, error) {
	if !(tau >= shortestTime && tau <= longestTime) {
		return Line{}, fmt.Errorf("filter: AC-coupling time constant %g ns; allowed: %g to %g ns", tau, shortestTime, longestTime)
	}
	return highPass(1 / tau), nil
}

// HighPass is [ACCoupling] by its corner: the cyclic frequency, in GHz from 1e-12
// to 1e6, at which |G| is 1/sqrt 2 (-3.0103 dB) of the gain far above it,
// 1/(2 pi tau).
func HighPass(corner float64) (Line, error) {
	if err := checkCorner("high-pass", corner); err != nil {
		return Line{}, err
	}
	return highPass(2 * math.Pi * corner), nil
}

func highPass(rate float64) Line {
	return Line{Direct: 1, Terms: []Term{{Pole: complex(-rate, 0), Power: 1, Residue: complex(-rate, 0)}}}
}
