package filter

import "fmt"

// Allpass returns the first-order allpass of the time tau, in ns from 1e-6 to 1e12:
//
//	G(s) = (1 - s tau)/(1 + s tau) = -1 + (2/tau)/(s + 1/tau).
//
// |G| is one everywhere; the phase is -2 atan(w tau), the group delay
// 2 tau/(1 + (w tau)^2). The step response, 1 - 2 e^{-t/tau}, begins at -1: the
// field jumps the wrong way at every sample edge before it follows.
func Allpass(tau float64) (Line, error) {
	if !(tau >= shortestTime && tau <= longestTime) {
		return Line{}, fmt.Errorf("filter: allpass time %g ns; allowed: %g to %g ns", tau, shortestTime, longestTime)
	}
	return allpass(tau), nil
}

func allpass(tau float64) Line {
	rate := 1 / tau
	return Line{Direct: -1, Terms: []Term{{Pole: complex(-rate, 0), Power: 1, Residue: complex(2*rate, 0)}}}
}

// FractionalDelay returns the first-order allpass that stands for a delay of ns, in
// ns from 1e-6 to 1e12,
//
//	G(s) = (1 - s ns/2)/(1 + s ns/2),
//
// the (1,1) Pade approximant of e^{-s ns}. It is a delay for slow signals only: the
// phase falls short of the delay's by (w ns)^3/12, 0.3 degrees where w ns = 0.4,
// the group delay is ns/(1 + (w ns/2)^2), and an edge begins with a jump of -1. [Delay] is
// exact at every frequency, of any length, and should be used for lines; this is the
// model of an instrument whose own delay correction is such an allpass.
func FractionalDelay(ns float64) (Line, error) {
	if !(ns >= shortestTime && ns <= longestTime) {
		return Line{}, fmt.Errorf("filter: fractional delay %g ns; allowed: %g to %g ns", ns, shortestTime, longestTime)
	}
	return allpass(ns / 2), nil
}
