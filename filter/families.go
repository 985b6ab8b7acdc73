package filter

import "fmt"

// Ranges of the constructors, in ns and GHz. They are far wider than any line
// and keep every intermediate number finite.
const (
	shortestTime  = 1e-6
	longestTime   = 1e12
	lowestCorner  = 1e-12
	highestCorner = 1e6
	largestTail   = 1e3
)

// SinglePole returns the low-pass 1/(1 + s tau) with unit steady gain, tau in ns
// from 1e-6 to 1e12. Its step response is 1 - e^{-t/tau}, its -3.0103 dB corner
// 1/(2 pi tau).
func SinglePole(tau float64) (Line, error) {
	if !(tau >= shortestTime && tau <= longestTime) {
		return Line{}, fmt.Errorf("filter: single-pole time constant %g ns; allowed: %g to %g ns", tau, shortestTime, longestTime)
	}
	return Line{Terms: []Term{{Pole: complex(-1/tau, 0), Power: 1, Residue: complex(1/tau, 0)}}}, nil
}

// Delay returns the pure delay e^{-s ns}, from 0 to 1e12 ns.
func Delay(ns float64) (Line, error) {
	if !(ns >= 0 && ns <= longestTime) {
		return Line{}, fmt.Errorf("filter: delay %g ns; allowed: 0 to %g ns", ns, longestTime)
	}
	return Line{Delay: ns, Direct: 1}, nil
}

// A Tail is a settling tail of the step response: Amplitude is a share of the
// step, of either sign; Time is its time constant in ns.
type Tail struct{ Amplitude, Time float64 }

// Tails returns the line whose step response is 1 + sum a e^{-t/T},
//
//	G(s) = 1 + sum a s T/(1 + s T) = (1 + sum a) - sum (a/T)/(s + 1/T).
//
// The steady gain stays one: a negative amplitude arrives late, a positive one
// overshoots. Amplitudes reach from -1000 to 1000, times from 1e-6 to 1e12 ns;
// tails of equal time are added. No tail at all gives [Through].
func Tails(tails []Tail) (Line, error) {
	if len(tails) > MaxTerms {
		return Line{}, fmt.Errorf("filter: %d tails; allowed: at most %d", len(tails), MaxTerms)
	}
	l := Through()
	seen := make(map[float64]int, len(tails)) // pole -> its term
	for i, t := range tails {
		if !(t.Amplitude >= -largestTail && t.Amplitude <= largestTail) {
			return Line{}, fmt.Errorf("filter: tail %d: amplitude %g; allowed: %g to %g", i, t.Amplitude, -largestTail, largestTail)
		}
		if !(t.Time >= shortestTime && t.Time <= longestTime) {
			return Line{}, fmt.Errorf("filter: tail %d: time %g ns; allowed: %g to %g ns", i, t.Time, shortestTime, longestTime)
		}
		if t.Amplitude == 0 {
			continue
		}
		p := -1 / t.Time
		r := complex(t.Amplitude*p, 0)
		l.Direct += complex(t.Amplitude, 0)
		if j, ok := seen[p]; ok {
			l.Terms[j].Residue += r
			continue
		}
		seen[p] = len(l.Terms)
		l.Terms = append(l.Terms, Term{Pole: complex(p, 0), Power: 1, Residue: r})
	}
	return l, nil
}
