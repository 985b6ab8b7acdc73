package device

import (
	"math"
	"slices"

	"holdfast/hardware/quantity"
)

// Loop says how the flux through a loop of two junctions, like or unlike, tunes the transition of a site: at f flux quanta it has the frequency
// Highest g(f) (Koch and others 2007, Phys. Rev. A 76, 042319, where the charging energy is small), with
//
//	g(f) = (cos²(pi f) + Asymmetry² sin²(pi f))^(1/4),    f = Bias + FullScale s,
//
// s the share of full scale that arrives.
type Loop struct {
	Highest         float64 // transition frequency without flux, rad/ns
	Bias, FullScale float64 // flux quanta: at rest, and what full scale adds; FullScale of either sign
	Asymmetry       float64 // 0 to 1: difference of the junctions over their sum
}

// The ranges of maps.
const (
	mostPowers     = 8
	largestPower   = 10
	leastPower     = 1e-6               // of the largest coefficient
	largestFlux    = 1                  // quanta, of Bias and of FullScale
	leastFlux      = 1e-6               // of FullScale
	clearOfHalf    = 0.02               // flux quanta that a loop of like junctions keeps from half a quantum, where its frequency has a corner
	leastAsymmetry = 0.01               // of a loop that comes nearer
	leastSwing     = 2 * math.Pi * 1e-6 // rad/ns: what a loop changes at least
	loopPoints     = 1000               // on either side, of the search for its largest change
	lowestOfLoop   = 1e-3               // of Highest, GHz
	highestOfLoop  = 1e3
)

// Rate gives what stands in the place of u where s, a share of full scale, arrives: H += rate O/2. It is fullScale s, of a
// Polynomial fullScale (c_1 s + c_2 s² + ...), and of a Loop the change of the transition from s = 0,
// whatever fullScale. Rates and fullScale are in rad/ns; slope and curvature are the first two derivatives by s. Any s is taken, beyond full
// scale too.
func (b *Bias) Rate(s, fullScale float64) (rate, slope, curvature float64) {
	switch {
	case b.Loop != nil:
		l := b.Loop
		g, dg, ddg := l.tuned(l.Bias + l.FullScale*s)
		rest, _, _ := l.tuned(l.Bias)
		return l.Highest * (g - rest), l.Highest * l.FullScale * dg, l.Highest * l.FullScale * l.FullScale * ddg
	case b.Polynomial != nil:
		for k := len(b.Polynomial) - 1; k >= 0; k-- { // by Horner, from c_n to c_1 and then to no constant
			curvature = curvature*s + 2*slope
			slope = slope*s + rate
			rate = rate*s + b.Polynomial[k]
		}
		curvature = curvature*s + 2*slope
		slope = slope*s + rate
		return fullScale * rate * s, fullScale * slope, fullScale * curvature
	}
	return fullScale * s, fullScale, 0
}

// Mapped tells whether the bias is no straight one.
func (b *Bias) Mapped() bool { return b.Polynomial != nil || b.Loop != nil }

// tuned gives g and its derivatives by f.
func (l *Loop) tuned(f float64) (g, slope, curvature float64) {
	sin, cos := math.Sincos(math.Pi * f)
	a := l.Asymmetry * l.Asymmetry
	q := cos*cos + a*sin*sin
	// dq/df and d²q/df²
	dq := -2 * math.Pi * (1 - a) * sin * cos
	ddq := -2 * math.Pi * math.Pi * (1 - a) * (cos*cos - sin*sin)
	g = math.Sqrt(math.Sqrt(q))
	slope = g / (4 * q) * dq
	return g, slope, g / (4 * q) * (ddq - 3./4*dq*dq/q)
}

// Map gives the bias of a channel that has a map, nil for any other channel.
func (d *Device) Map(channel string) *Bias {
	i := slices.IndexFunc(d.Biases, func(b Bias) bool { return b.Channel == channel && b.Mapped() })
	if i < 0 {
		return nil
	}
	return &d.Biases[i]
}

// readMap reads a bias's polynomial or loop.
func readMap(t *quantity.Table, b *Bias) {
	polynomial, loop := t.Has("polynomial"), t.Has("loop")
	switch {
	case polynomial && loop:
		t.Fail("loop", "found a loop beside a polynomial; allowed: one of the two")
	case polynomial:
		list := t.Numbers("polynomial", mostPowers, -largestPower, largestPower)
		if list == nil {
			return
		}
		if !slices.ContainsFunc(list, func(c float64) bool { return math.Abs(c) >= leastPower }) {
			t.Fail("polynomial", "found %v; allowed: 1 to %d numbers, -%d to %d, one of them at least %g in size, as in [1, 0.2]", list, mostPowers, largestPower, largestPower, leastPower)
			return
		}
		if !slices.Equal(list, []float64{1}) {
			b.Polynomial = list
		}
	case loop:
		b.Loop = readLoop(t, b.Axis)
	}
}

func readLoop(t *quantity.Table, axis string) *Loop {
	lt := t.Table("loop")
	l := &Loop{
		Highest:   2 * math.Pi * lt.Quantity("highest", quantity.Frequency, lowestOfLoop, highestOfLoop),
		Bias:      lt.Number("bias", -largestFlux, largestFlux, 0),
		FullScale: lt.Number("full_scale", -largestFlux, largestFlux),
		Asymmetry: lt.Number("asymmetry", 0, 1, 0),
	}
	if axis != "Z" {
		t.Fail("axis", "found %q beside a loop; allowed: \"Z\", as it is the transition that a loop tunes", axis)
		return l
	}
	if math.Abs(l.FullScale) < leastFlux {
		lt.Fail("full_scale", "found %g; allowed: flux quanta, at least %g in size and at most %d", l.FullScale, leastFlux, largestFlux)
		return l
	}
	reach := math.Abs(l.FullScale)
	low, high := l.Bias-reach, l.Bias+reach
	half := math.Round((low+high)/2-0.5) + 0.5 // the nearest half quantum
	if near := math.Max(0, math.Max(low-half, half-high)); near < clearOfHalf && l.Asymmetry < leastAsymmetry {
		lt.Fail("asymmetry", "found %g where the flux goes from %.4g to %.4g quanta; allowed: at least %g, or a flux that stays %g away from half a quantum", l.Asymmetry, low, high, leastAsymmetry, clearOfHalf)
		return l
	}
	b, most := Bias{Loop: l}, 0.0
	for i := range 2*loopPoints + 1 {
		rate, _, _ := b.Rate(float64(i-loopPoints)/loopPoints, 0)
		most = math.Max(most, math.Abs(rate))
	}
	if most < leastSwing {
		lt.Fail("", "found a transition that the flux, from %.4g to %.4g quanta, changes by less than %s; allowed: a larger change (less asymmetry, or a larger full_scale)", low, high,
			quantity.Format(leastSwing/(2*math.Pi), quantity.Frequency))
	}
	return l
}
