package filter

import (
	"math"
	"math/cmplx"
	"slices"
)

// StepFigures describes a line's step response relative to its steady value.
// Times are in ns and measured from arrival.
type StepFigures struct {
	TransitionTime float64 // from first crossing 10 % to first crossing 90 % (IEEE Std 181)
	Overshoot      float64 // largest excess over the steady value, as a share of it
	Settling1pc    float64 // after this time the response stays within 1 % of the steady value
	Settling01pc   float64 // the same for 0.1 %
	GroupDelay     float64 // -d arg G/dw at w = 0, without the pure delay
}

const (
	// figureStep is the step of the search over time, in units of 1/|p| of the
	// fastest pole still alive: an extremum between two steps is then bracketed.
	figureStep = 0.05
	// alive is the share of the steady value under which a pole no longer
	// matters for the figures.
	alive = 1e-7
	// figureSteps bounds the search for lines of absurdly high quality factor.
	figureSteps = 200_000
)

// StepFigures returns the figures of the step response. Of a complex line, the
// crossings and the overshoot are of the part in phase with the steady value, the
// settling times of the whole deviation. A line without steady gain has no such
// figures: all are +Inf, and so are settling times beyond the reach of the search, which
// ends after 200 000 steps (a ringing pole with |p| above some 600 |Re p|).
func (l Line) StepFigures() StepFigures {
	dc := l.DC()
	if dc == 0 {
		inf := math.Inf(1)
		return StepFigures{inf, inf, inf, inf, inf}
	}
	dev := func(t float64) complex128 { return l.Step(t)/dc - 1 }
	rise := func(t float64) float64 { return real(dev(t)) }
	off := func(t float64) float64 { return cmplx.Abs(dev(t)) }

	times, total := l.search(cmplx.Abs(dc), math.Inf(1))
	nodes := withPeaks(times, rise, off)

	f := StepFigures{
		Settling1pc:  lastOver(nodes, 0.01, off),
		Settling01pc: lastOver(nodes, 0.001, off),
		GroupDelay:   l.groupDelay(),
	}
	if total > 0.01 {
		f.Settling1pc = math.Inf(1)
	}
	if total > 0.001 {
		f.Settling01pc = math.Inf(1)
	}
	for _, t := range nodes {
		f.Overshoot = max(f.Overshoot, rise(t))
	}
	f.TransitionTime = firstOver(nodes, -0.1, rise) - firstOver(nodes, -0.9, rise)
	if math.IsNaN(f.TransitionTime) {
		f.TransitionTime = math.Inf(1)
	}
	return f
}

// search returns the times, from arrival on, at which to look at the step response,
// up to the one at which every pole has died or the first at or past end. total
// bounds the deviation from the steady value from the last of them on, as a share of scale.
func (l Line) search(scale, end float64) (times []float64, total float64) {
	chains := l.chains()
	for t := 0.0; len(times) < figureSteps; {
		times = append(times, t)
		total = 0
		fastest := 0.0
		for i := range chains {
			left := chains[i].tailBound(t) / scale
			total += left
			if left > alive {
				fastest = max(fastest, cmplx.Abs(chains[i].pole))
			}
		}
		if total <= 10*alive || fastest == 0 || t >= end {
			break
		}
		t += figureStep / fastest
	}
	return times, total
}

// withPeaks returns the times with the extrema of the functions between two of them,
// so that the passes that follow need look at nodes only.
func withPeaks(times []float64, functions ...func(float64) float64) []float64 {
	nodes := times[:1:1]
	for i := 1; i < len(times); i++ {
		if i+1 < len(times) {
			for _, f := range functions {
				nodes = append(nodes, peak(times[i-1], times[i+1], times[i], f))
			}
		}
		nodes = append(nodes, times[i])
	}
	slices.Sort(nodes)
	return nodes
}

// Droop returns by how much the step response has fallen t ns after arrival from its
// largest size until then, as a share of that: for [ACCoupling] 1 - e^{-t/tau}, 1e-4
// after 100 ns of a bias tee of 1 ms. It is 0 while the response still rises, 1 where it
// crosses zero, and counts the fall after an overshoot too. It is 0 before arrival
// and for a line that passes nothing, and NaN beyond the reach of the search, which ends
// after 200 000 steps (see [Line.StepFigures]).
func (l Line) Droop(t float64) float64 {
	if !(t > 0) {
		return 0
	}
	size := func(t float64) float64 { return cmplx.Abs(l.Step(t)) }
	scale := cmplx.Abs(l.Direct)
	for _, c := range l.chains() {
		scale += c.tailBound(0)
	}
	if scale == 0 {
		return 0
	}
	times, total := l.search(scale, t)
	if last := times[len(times)-1]; last < t && total > 10*alive {
		return math.NaN()
	}
	largest := size(t)
	for _, at := range withPeaks(times, size) {
		if at < t {
			largest = max(largest, size(at))
		}
	}
	if largest == 0 {
		return 0
	}
	return 1 - size(t)/largest
}

// firstOver returns the first time at which f reaches level; +Inf if it never does.
func firstOver(nodes []float64, level float64, f func(float64) float64) float64 {
	for i, t := range nodes {
		if f(t) < level {
			continue
		}
		if i == 0 {
			return t
		}
		return crossing(nodes[i-1], t, func(t float64) bool { return f(t) >= level })
	}
	return math.Inf(1)
}

// lastOver returns the time after which f stays at or under level; +Inf if it is
// still above at the last node.
func lastOver(nodes []float64, level float64, f func(float64) float64) float64 {
	for i := len(nodes) - 1; i >= 0; i-- {
		if f(nodes[i]) <= level {
			continue
		}
		if i == len(nodes)-1 {
			return math.Inf(1)
		}
		return crossing(nodes[i], nodes[i+1], func(t float64) bool { return f(t) <= level })
	}
	return 0
}

// crossing returns, to the last bit, where is turns true between a and b.
func crossing(a, b float64, is func(float64) bool) float64 {
	for {
		mid := a + (b-a)/2
		if mid <= a || mid >= b {
			return b
		}
		if is(mid) {
			b = mid
		} else {
			a = mid
		}
	}
}

// peak returns the maximum of f between a and b by golden section when the value
// at the inner point m is not below both ends, else m.
func peak(a, b, m float64, f func(float64) float64) float64 {
	if fm := f(m); !(fm >= f(a) && fm >= f(b)) {
		return m
	}
	const g = 0.3819660112501051 // (3 - sqrt 5)/2
	x, y := a+g*(b-a), b-g*(b-a)
	fx, fy := f(x), f(y)
	for range 60 { // shrinks the bracket by 3e-13
		if fx > fy {
			b, y, fy = y, x, fx
			x = a + g*(b-a)
			fx = f(x)
		} else {
			a, x, fx = x, y, fy
			y = b - g*(b-a)
			fy = f(y)
		}
	}
	return (a + b) / 2
}

func (l Line) chains() []chain {
	var all []chain
	var c chain
	for i := range l.Terms {
		if c.load(l.Terms, i) {
			all = append(all, c)
		}
	}
	return all
}

// tailBound bounds what is still to come of the chain's step response after t:
// |r| int_t^inf v^{m-1}/(m-1)! e^{-a v} dv = |r| a^{-m} e^{-at} sum_{j<m} (at)^j/j!.
func (c *chain) tailBound(t float64) float64 {
	at := c.rate * t
	term := math.Exp(-at)
	sum, bound := 0.0, 0.0
	for m := 1; m <= c.n; m++ {
		sum += term
		term *= at / float64(m)
		bound += cmplx.Abs(c.out[m-1]) * sum
	}
	return bound
}

// groupDelay returns -Re G'(0)/G(0), with G'(0) = -sum m r/(-p)^{m+1}.
func (l Line) groupDelay() float64 {
	d := complex128(0)
	for _, t := range l.Terms {
		v := t.Residue * complex(float64(t.Power), 0)
		for range t.Power + 1 {
			v /= -t.Pole
		}
		d += v
	}
	return real(d / l.DC())
}

// Corner returns the lowest cyclic frequency, in GHz, at which |G| falls to
// 1/sqrt 2 (-3.0103 dB) of the steady gain, on either side of the carrier for a
// complex line; +Inf when it never does, or when there is no steady gain.
//
// The search steps by a twentieth of the distance to the nearest pole, within
// which the response is a convergent power series, and ends at a million times
// the fastest pole.
func (l Line) Corner() float64 {
	dc := cmplx.Abs(l.DC())
	end := 1e6 * l.FastestRate()
	first := math.Inf(1)
	for _, sign := range []float64{1, -1} {
		under := func(w float64) bool { return cmplx.Abs(l.response(sign*w)) <= dc/math.Sqrt2 }
		for w := 0.0; w < end && w < first && dc > 0; {
			near := math.Inf(1)
			for _, t := range l.Terms {
				near = min(near, cmplx.Abs(complex(0, sign*w)-t.Pole))
			}
			next := w + max(near/20, 1e-6*w) // the floor passes a pole almost on the axis
			if !(next > w) {
				break
			}
			if under(next) {
				first = min(first, crossing(w, next, under))
				break
			}
			w = next
		}
	}
	return first / (2 * math.Pi)
}
