package replay

import (
	"fmt"
	"math"

	"holdfast/design/device"
)

// What a map may hold.
const (
	maxPowers = 8
	maxPower1 = 10.0 // of a coefficient
)

// mapped tells whether what arrives is no rate itself.
func (c *Channel) mapped() bool { return len(c.MapPolynomial)+len(c.MapLoop) > 0 }

// curve turns the Taylor coefficients of what arrives over a step, s in shares of full scale, into those of the rate that it drives, in shares of the
// full-scale rate: of a polynomial by Horner's rule, of a loop by the recurrences of sine, cosine and a power of a series. scratch has
// room for four series.
func (c *Channel) curve(s []complex128, scratch []float64) {
	n := len(s)
	u, a, b, q := scratch[:n], scratch[n:2*n], scratch[2*n:3*n], scratch[3*n:4*n]
	for i, v := range s {
		u[i] = real(v)
	}
	clear(a)
	if l := c.MapLoop; len(l) > 0 {
		highest, bias, scale, asymmetry := l[0], l[1], l[2], l[3]
		// theta = pi f; a = sin theta, b = cos theta
		for i := range u {
			u[i] *= math.Pi * scale
		}
		u[0] += math.Pi * bias
		a[0], b[0] = math.Sincos(u[0])
		for i := 1; i < n; i++ {
			a[i], b[i] = 0, 0
			for k := 1; k <= i; k++ {
				f := float64(k) / float64(i) * u[k]
				a[i] += f * b[i-k]
				b[i] -= f * a[i-k]
			}
		}
		for i := range q { // cos² + asymmetry² sin²
			q[i] = 0
			for k := 0; k <= i; k++ {
				q[i] += b[k]*b[i-k] + asymmetry*asymmetry*a[k]*a[i-k]
			}
		}
		p := u // its fourth root: q p' = p q'/4
		p[0] = math.Sqrt(math.Sqrt(q[0]))
		for i := 1; i < n; i++ {
			sum := 0.0
			for k := 1; k <= i; k++ {
				sum += (float64(k)/4 - float64(i-k)) * q[k] * p[i-k]
			}
			p[i] = sum / (float64(i) * q[0])
		}
		for i := range s {
			s[i] = complex(highest/c.FullScale*p[i], 0)
		}
		s[0] -= complex(highest/c.FullScale*loopAt(bias, asymmetry), 0)
		return
	}
	for k := len(c.MapPolynomial) - 1; k >= 0; k-- { // a <- (a + c_k) u
		a[0] += c.MapPolynomial[k]
		for i := n - 1; i >= 0; i-- {
			b[i] = 0
			for j := 0; j <= i; j++ {
				b[i] += a[j] * u[i-j]
			}
		}
		copy(a, b)
	}
	for i := range s {
		s[i] = complex(a[i], 0)
	}
}

// loopAt is the share of its highest frequency that a loop has at f flux quanta.
func loopAt(f, asymmetry float64) float64 {
	sin, cos := math.Sincos(math.Pi * f)
	return math.Sqrt(math.Sqrt(cos*cos + asymmetry*asymmetry*sin*sin))
}

// steepest bounds the slope of the map by what arrives, within a fifth beyond full scale, as a share of the full-scale rate; 1 without a map.
func (c *Channel) steepest() float64 {
	const reach, points = 1.2, 2000
	switch {
	case len(c.MapLoop) > 0:
		most := 0.0
		step := 2 * reach / points
		for i := range points {
			at := func(k int) float64 { return loopAt(c.MapLoop[1]+c.MapLoop[2]*(-reach+step*float64(k)), c.MapLoop[3]) }
			most = math.Max(most, math.Abs(at(i+1)-at(i))/step)
		}
		return 2 * most * c.MapLoop[0] / c.FullScale // twice, for what lies between the points
	case len(c.MapPolynomial) > 0:
		sum, power := 0.0, 1.0
		for k, v := range c.MapPolynomial {
			sum += float64(k+1) * math.Abs(v) * power
			power *= reach
		}
		return sum
	}
	return 1
}

// validCurve checks a channel's map.
func (c *Channel) validCurve(key string) *fault {
	bad := func(k string, found any, allowed string) *fault {
		return &fault{key + k, fmt.Sprint(found), allowed}
	}
	if !c.mapped() {
		return nil
	}
	name := "map_polynomial"
	if len(c.MapLoop) > 0 {
		name = "map_loop"
	}
	switch {
	case len(c.MapPolynomial) > 0 && len(c.MapLoop) > 0:
		return bad(name, "a loop beside a polynomial", "one of the two")
	case c.Kind != "baseband":
		return bad(name, "a map of a quadrature channel", "one of a baseband channel")
	case c.Shift != 0 || len(c.Paths) > 0:
		return bad(name, "a map beside a shift or a path", "a channel without either")
	case len(c.MapPolynomial) > maxPowers:
		return bad(name, fmt.Sprintf("%d coefficients", len(c.MapPolynomial)), fmt.Sprintf("up to %d", maxPowers))
	case len(c.MapLoop) > 0 && len(c.MapLoop) != 4:
		return bad(name, fmt.Sprintf("%d numbers", len(c.MapLoop)), "4: the highest frequency in rad/ns, flux quanta at rest and for full scale, the asymmetry")
	}
	for _, v := range c.MapPolynomial {
		if !(math.Abs(v) <= maxPower1) {
			return bad(name, v, fmt.Sprintf("-%g to %g", maxPower1, maxPower1))
		}
	}
	if l := c.MapLoop; len(l) > 0 {
		if !(l[0] > 0 && l[0] <= 1e4 && math.Abs(l[1]) <= 1 && math.Abs(l[2]) <= 1 && l[3] >= 0 && l[3] <= 1) {
			return bad(name, l, "above 0 to 1e4, -1 to 1, -1 to 1, 0 to 1")
		}
		// what the limit of the samples lets arrive, and a fifth more for what the line overshoots
		low, high := l[1]-1.2*math.Abs(l[2]), l[1]+1.2*math.Abs(l[2])
		for k := math.Ceil(low - 0.5); k+0.5 <= high; k++ {
			if l[3] < 1e-3 {
				return bad(name, l, "an asymmetry of 1e-3 at least where the flux passes half a quantum")
			}
		}
	}
	return nil
}

// curves compares a channel's map with the device's.
func (c *comparison) curves(key string, ch *Channel, b *device.Bias) {
	var polynomial, loop []float64
	if b != nil {
		if polynomial = b.Polynomial; b.Loop != nil {
			loop = []float64{b.Loop.Highest, b.Loop.Bias, b.Loop.FullScale, b.Loop.Asymmetry}
		}
	}
	for _, m := range []struct {
		name              string
		recorded, rebuilt []float64
	}{{"map_polynomial", ch.MapPolynomial, polynomial}, {"map_loop", ch.MapLoop, loop}} {
		if len(m.recorded) != len(m.rebuilt) {
			c.differ(key+m.name, fmt.Sprintf("%d numbers", len(m.recorded)), fmt.Sprintf("%d numbers", len(m.rebuilt)))
			continue
		}
		for i := range m.rebuilt {
			c.number(fmt.Sprintf("%s%s[%d]", key, m.name, i), m.recorded[i], m.rebuilt[i])
		}
	}
}
