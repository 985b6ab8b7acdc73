package noise

import (
	"fmt"
	"math"
	"sort"
)

// form says how S runs.
type form int

const (
	straight   form = iota // straight in w between the points, zero outside
	power                  // ln S straight in ln w between the points, zero outside
	lorentzian             // 2 sigma^2 tau/(1 + (w tau)^2), without points
)

// Spectrum is the two-sided power spectral density S(w) of a stationary noise; see the package for units and signs. White, PowerLaw,
// Lorentzian, Tabulated, FromTrace and Read make one. It does not change once made, and is safe for concurrent use.
type Spectrum struct {
	// File is the CSV file of the measurement, as the table that Read read names it; empty for a spectrum given by a formula.
	File string

	form       form
	w, s       []float64 // two or more points: w in rad/ns ascending, S there
	sigma, tau float64
}

// The ranges of the constructors. They leave room for every product of this package in float64.
const (
	leastLevel, mostLevel         = 1e-60, 1e60 // of S
	leastFrequency, mostFrequency = 1e-21, 1e6  // rad/ns
	mostExponent                  = 4
)

// within reports whether v is a number from lo to hi.
func within(v, lo, hi float64) bool { return v >= lo && v <= hi }

// White gives S = level for low <= |w| <= high, in rad/ns, and zero outside; low may be 0. Level is from 1e-60 to 1e60, high to 1e6 rad/ns.
func White(level, low, high float64) (*Spectrum, error) {
	switch {
	case !within(level, leastLevel, mostLevel):
		return nil, fmt.Errorf("white noise of level %g; allowed: %g to %g", level, leastLevel, mostLevel)
	case !within(high, leastFrequency, mostFrequency) || !(low >= 0 && low < high):
		return nil, fmt.Errorf("white noise from %g to %g rad/ns; allowed: from 0 or more to %g or less, ascending", low, high, mostFrequency)
	}
	return &Spectrum{w: []float64{low, high}, s: []float64{level, level}}, nil
}

// PowerLaw gives S = level (at/|w|)^exponent for low <= |w| <= high, and zero outside; at, low and high in rad/ns, all above zero. The exponent,
// from -4 to 4, is 1 for 1/f noise. S must stay within 1e-60 to 1e60.
func PowerLaw(level, at, exponent, low, high float64) (*Spectrum, error) {
	switch {
	case !within(exponent, -mostExponent, mostExponent):
		return nil, fmt.Errorf("a power law of exponent %g; allowed: %d to %d", exponent, -mostExponent, mostExponent)
	case !within(at, leastFrequency, mostFrequency):
		return nil, fmt.Errorf("a power law stated at %g rad/ns; allowed: %g to %g", at, leastFrequency, mostFrequency)
	case !within(low, leastFrequency, mostFrequency) || !within(high, leastFrequency, mostFrequency) || !(low < high):
		return nil, fmt.Errorf("a power law from %g to %g rad/ns; allowed: %g to %g, ascending", low, high, leastFrequency, mostFrequency)
	}
	s := &Spectrum{form: power, w: []float64{low, high}, s: []float64{level * math.Pow(at/low, exponent), level * math.Pow(at/high, exponent)}}
	for i, v := range s.s {
		if !within(v, leastLevel, mostLevel) {
			return nil, fmt.Errorf("a power law that reaches %g at %g rad/ns; allowed: %g to %g", v, s.w[i], leastLevel, mostLevel)
		}
	}
	return s, nil
}

// Lorentzian gives S = 2 sigma^2 tau/(1 + (w tau)^2): noise of the root mean square sigma that is forgotten as exp(-t/tau), tau in ns. Both
// from 1e-20 to 1e20.
func Lorentzian(sigma, tau float64) (*Spectrum, error) {
	if !within(sigma, 1e-20, 1e20) || !within(tau, 1e-20, 1e20) {
		return nil, fmt.Errorf("Lorentzian noise of root mean square %g and correlation time %g ns; allowed: 1e-20 to 1e20 each", sigma, tau)
	}
	return &Spectrum{form: lorentzian, sigma: sigma, tau: tau}, nil
}

// Tabulated gives the spectrum through points (w, S): w in rad/ns, strictly ascending and above zero, S two-sided from 1e-60 to 1e60. Between two points
// ln S is straight in ln w; outside S is zero.
func Tabulated(w, s []float64) (*Spectrum, error) {
	if len(w) < 2 || len(w) != len(s) {
		return nil, fmt.Errorf("a spectrum of %d frequencies and %d densities; allowed: two or more of both", len(w), len(s))
	}
	for i := range w {
		switch {
		case !within(w[i], leastFrequency, mostFrequency):
			return nil, fmt.Errorf("a spectrum with a point at %g rad/ns; allowed: %g to %g", w[i], leastFrequency, mostFrequency)
		case i > 0 && !(w[i] > w[i-1]):
			return nil, fmt.Errorf("a spectrum with %g rad/ns after %g; allowed: ascending frequencies", w[i], w[i-1])
		case !within(s[i], leastLevel, mostLevel):
			return nil, fmt.Errorf("a spectrum of density %g at %g rad/ns; allowed: %g to %g", s[i], w[i], leastLevel, mostLevel)
		}
	}
	return &Spectrum{form: power, w: append([]float64(nil), w...), s: append([]float64(nil), s...)}, nil
}

// Low gives the frequency in rad/ns below which S is zero; 0 when there is none.
func (s *Spectrum) Low() float64 {
	if s.form == lorentzian {
		return 0
	}
	return s.w[0]
}

// High gives the frequency in rad/ns above which S is zero; infinite when there is none.
func (s *Spectrum) High() float64 {
	if s.form == lorentzian {
		return math.Inf(1)
	}
	return s.w[len(s.w)-1]
}

// S gives the two-sided density at w in rad/ns, of either sign.
func (s *Spectrum) S(w float64) float64 {
	w = math.Abs(w)
	if s.form == lorentzian {
		x := w * s.tau
		return 2 * s.sigma * s.sigma * s.tau / (1 + x*x)
	}
	if !within(w, s.Low(), s.High()) {
		return 0
	}
	return s.on(s.piece(w), w)
}

// piece gives the interval between two points that w lies in, or begins.
func (s *Spectrum) piece(w float64) int {
	i := sort.SearchFloat64s(s.w, w)
	if i == len(s.w) || s.w[i] > w {
		i--
	}
	return max(0, min(i, len(s.w)-2))
}

// slope gives d ln S/d ln w on piece i of a power law.
func (s *Spectrum) slope(i int) float64 {
	return math.Log(s.s[i+1]/s.s[i]) / math.Log1p((s.w[i+1]-s.w[i])/s.w[i])
}

// on gives S at w on piece i.
func (s *Spectrum) on(i int, w float64) float64 {
	if s.form == power {
		return s.s[i] * math.Exp(s.slope(i)*math.Log1p((w-s.w[i])/s.w[i]))
	}
	share := (w - s.w[i]) / (s.w[i+1] - s.w[i])
	return float64((1-share)*s.s[i]) + float64(share*s.s[i+1])
}

// Variance gives <lambda^2> = (1/2pi) int S dw over both signs of w, by closed forms.
func (s *Spectrum) Variance() float64 {
	if s.form == lorentzian {
		return s.sigma * s.sigma
	}
	return s.moment(0, s.Low(), s.High()) / math.Pi
}

// moment gives int_a^b S(w) w^p dw over positive frequencies, p = -2, 0 or 2, by closed forms; 0 unless a < b. For p = -2, a is above zero; b may be
// infinite, for p = 2 only where S ends.
func (s *Spectrum) moment(p int, a, b float64) float64 {
	if !(a < b) {
		return 0
	}
	if s.form == lorentzian {
		level := 2 * s.sigma * s.sigma
		switch p {
		case 0:
			if math.IsInf(b, 1) {
				return level * math.Atan2(1, a*s.tau)
			}
			return level * math.Atan2((b-a)*s.tau, 1+a*s.tau*(b*s.tau))
		case 2:
			return level * (beyondArctan(b*s.tau) - beyondArctan(a*s.tau)) / (s.tau * s.tau)
		default:
			sum := beyondArctan(1 / (a * s.tau))
			if !math.IsInf(b, 1) {
				sum -= beyondArctan(1 / (b * s.tau))
			}
			return level * s.tau * s.tau * sum
		}
	}
	a, b = max(a, s.Low()), min(b, s.High())
	sum := 0.0
	for i := s.piece(a); a < b; i++ {
		end := min(b, s.w[i+1])
		if s.form == power {
			sum += s.on(i, a) * math.Pow(a, float64(p+1)) * growth(s.slope(i)+float64(p+1), math.Log1p((end-a)/a))
		} else {
			sum += straightMoment(p, a, end, s.on(i, a), s.on(i, end))
		}
		a = end
	}
	return sum
}

// growth gives int_0^x e^{ku} du.
func growth(k, x float64) float64 {
	if y := k * x; y != 0 {
		return x * math.Expm1(y) / y
	}
	return x
}

// straightMoment gives int_a^b S w^p dw of an S that runs straight from u to v.
func straightMoment(p int, a, b, u, v float64) float64 {
	switch p {
	case 0:
		return (b - a) * (u + v) / 2
	case 2: // Simpson's rule is exact for a cubic
		middle := (a + b) / 2
		return (b - a) / 6 * (a*a*u + 2*middle*middle*(u+v) + b*b*v)
	default:
		rise := (v - u) / (b - a)
		return (u-rise*a)*(b-a)/(a*b) + rise*math.Log1p((b-a)/a)
	}
}

// beyondArctan gives x - atan x for x >= 0.
func beyondArctan(x float64) float64 {
	if x > 0.2 {
		return x - math.Atan(x)
	}
	// The series x^3/3 - x^5/5 + ...: at 0.2 the twelfth term is below 1e-17 of the first.
	sum, y := 0.0, x*x
	for k := 25; k >= 3; k -= 2 {
		sum = 1/float64(k) - y*sum
	}
	return x * y * sum
}
