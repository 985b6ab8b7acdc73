package noise

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/integrate/quad"
)

const (
	slowEdge     = 0.1 // times 1/T: below, all of S is one node
	reachSpacing = 2.8 // times 1/T: the band that one node serves where S goes on
	fullSpacing  = 1.6 // the same where S ends
	spareNodes   = 3   // given beyond those
	panelNodes   = 32  // at most
	leastNodes   = 2
	mostNodes    = 1 << 14
	leastGate    = 1e-6 // ns
	mostGate     = 1e9  // ns

	panelCells = 32    // a panel of Gauss nodes is found from at least so many cells of its measure
	thinCell   = 0.004 // times 1/T: a cell in which one point is enough
	cellRatio  = 1.5   // most that w grows within a cell, as S may run as a power of it
	cellFall   = 4.0   // most that ln S changes within a cell
)

// Rule is a quadrature of (1/2pi) int S(w) F(w) dw over both signs of w.
type Rule struct {
	Frequency []float64 // rad/ns, ascending, above zero
	Weight    []float64 // above zero, in units of lambda squared; both signs of w are in it

	// Cut is the frequency in rad/ns at which the nodes end: that at which S ends, or less.
	Cut float64

	// Remainder says how much of S the nodes stand for indirectly. It is 0 where S ends at Cut, and else
	//
	//	(1/pi) int l(w) S(w)/w^2 dw,    l from 0 in the middle of the nodes' range to 1 at Cut and above
	//
	// That part of S makes Remainder times a mean of w^2 F, and the weights hold Remainder times another mean of w^2 F, from the upper half of
	// the nodes' range. With w^2 F <= B from the middle of that range on, the sum is therefore wrong by B times Remainder at most
	// on this account, and by far less when w^2 F has settled to a mean. Integration by parts gives
	//
	//	B = ( ||V_I(0)||_F + ||V_I(T)||_F + int_0^T ||dV_I/dt||_F dt )^2/d
	//
	// where a jump of V_I counts in the integral by its size.
	Remainder float64
}

// Nodes gives frequencies w_q and weights W_q, at most n of each, such that sum_q W_q F(w_q) approximates (1/2pi) int S(w) F(w) dw for every
// even filter function F of a gate of length T in ns (the package says how). It is deterministic. The sum of the weights is the variance where
// Remainder is zero.
//
// The nodes reach to 2.8 n/T, or to where S ends. F must have passed its peak there: for a field that turns a spin at the rate Omega, n well above
// Omega T/2.8. Relative errors, the worst under 1/f, white (both to 20000/T, some thousand periods of F) and Lorentzian noise (correlation times T/20,
// T and 1e4 T):
//
//	n                                             8      16     32     64     128
//	free evolution, echo, a field of one turn     7e-2   8e-3   2e-4   3e-5   4e-6
//	CPMG of 2 and 4 pulses, UDD of 5              0.8    8e-2   2e-2   1e-2   2e-4
//	all of them where S ends at 2 n/T or before   4e-7   1e-7   1e-7   1e-7   1e-7
//
// F is taken as a + b w^2 below 0.1/T. That is good to 1e-5 of the sum for spectra up to 1/f^2, and to 1e-3 (1/f^3) or 2 % (1/f^4) for a gate that
// holds slow noise off to second order.
//
// It panics when T is not from 1e-6 to 1e9 ns, or n not from 2 to 16384.
func (s *Spectrum) Nodes(T float64, n int) Rule {
	if !within(T, leastGate, mostGate) || n < leastNodes || n > mostNodes {
		panic(fmt.Sprintf("noise: %d nodes for a gate of %g ns", n, T))
	}
	edge := slowEdge / T
	r := Rule{Cut: min(s.High(), edge)}
	if mass := s.moment(0, 0, edge); mass > 0 {
		r.add(math.Sqrt(s.moment(2, 0, edge)/mass), mass/math.Pi)
		n--
	}
	start := max(edge, s.Low())
	if start >= s.High() {
		return r
	}
	r.Cut = min(s.High(), start+float64(n)*reachSpacing/T)
	r.Remainder = s.moment(-2, r.Cut, s.High()) / math.Pi
	spacing := reachSpacing
	if r.Remainder == 0 {
		spacing = fullSpacing
	}
	count := int(min(float64(n), math.Ceil((r.Cut-start)*T/spacing)+spareNodes))
	panels := (count + panelNodes - 1) / panelNodes
	c := newCells(T)
	// Where S goes on, the measure fades over the upper half of the nodes' range, so that no edge cuts through the oscillations of F; what is
	// lost there and above is given back with the mean of w^2 F over that half.
	fade := fading{start + (r.Cut-start)/2, r.Cut}
	if r.Remainder > 0 {
		c.measure(s, fade.lo, fade.hi, func(w, weight float64) { r.Remainder += weight * fade.lost(w) / (w * w) })
	}
	lo := start
	for i := range panels {
		hi := r.Cut
		if i < panels-1 {
			hi = start + (r.Cut-start)*float64(i+1)/float64(panels)
		}
		p := newPanel(lo, hi, i == 0, count*(i+1)/panels-count*i/panels)
		if r.Remainder == 0 {
			c.measure(s, lo, hi, p.add)
		} else {
			c.measure(s, lo, hi, func(w, weight float64) { p.add(w, weight*(1-fade.lost(w))) })
			if hi > fade.lo {
				c.even(max(lo, fade.lo), hi, func(w, width float64) { p.add(w, r.Remainder*w*w*fade.slope(w)*width) })
			}
		}
		p.nodes(r.add)
		lo = hi
	}
	return r
}

// fading goes from 0 at lo to 1 at hi, with a slope that begins and ends at zero: the integral of the window of Hann.
type fading struct{ lo, hi float64 }

func (f fading) lost(w float64) float64 {
	u := max(0, (w-f.lo)/(f.hi-f.lo))
	return max(0, min(1, u-math.Sin(2*math.Pi*u)/(2*math.Pi)))
}

// slope gives d lost/dw between lo and hi.
func (f fading) slope(w float64) float64 {
	return (1 - math.Cos(2*math.Pi*(w-f.lo)/(f.hi-f.lo))) / (f.hi - f.lo)
}

// add appends a node, unless it counts for nothing.
func (r *Rule) add(w, weight float64) {
	if weight > 0 {
		r.Frequency, r.Weight = append(r.Frequency, w), append(r.Weight, weight)
	}
}

// cells cuts measures into points, finely enough for anything that is smooth on the scale 1/T.
type cells struct {
	T         float64
	x, weight [8]float64 // the Gauss-Legendre rule on [0, 1]
}

func newCells(T float64) *cells {
	c := &cells{T: T}
	quad.Legendre{}.FixedLocations(c.x[:], c.weight[:], 0, 1)
	return c
}

// measure hands points and weights to add that stand for (1/pi) S(w) dw between lo and hi. What a cell weighs is exact.
func (c *cells) measure(s *Spectrum, lo, hi float64, add func(w, weight float64)) {
	i := 0
	if s.form != lorentzian {
		i = s.piece(lo)
	}
	for a := lo; a < hi; {
		b := min(hi, a*cellRatio, a+(hi-lo)/panelCells)
		if s.form != lorentzian {
			for i < len(s.w)-2 && s.w[i+1] <= a {
				i++
			}
			b = min(b, s.w[i+1])
			if s.form == power && (b-a)*c.T > thinCell {
				b = min(b, a*math.Exp(cellFall/math.Abs(s.slope(i))))
			}
		}
		b = max(b, math.Nextafter(a, hi)) // where lo and hi are neighbours
		mass := s.moment(0, a, b)
		if (b-a)*c.T <= thinCell {
			if mass > 0 {
				add(max(a, min(b, math.Sqrt(s.moment(2, a, b)/mass))), mass/math.Pi)
			}
			a = b
			continue
		}
		var share [8]float64
		sum := 0.0
		for k, x := range c.x {
			share[k] = c.weight[k] * s.S(a+(b-a)*x)
			sum += share[k]
		}
		for k, x := range c.x {
			if mass > 0 && share[k] > 0 {
				add(a+(b-a)*x, mass/math.Pi*share[k]/sum)
			}
		}
		a = b
	}
}

// even hands points and weights to add that stand for dw between lo and hi.
func (c *cells) even(lo, hi float64, add func(w, width float64)) {
	width := (hi - lo) / panelCells
	for i := range panelCells {
		for k, x := range c.x {
			add(lo+width*(float64(i)+x), width*c.weight[k])
		}
	}
}
