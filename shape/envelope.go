package shape

import "math"

// areaSlack is how far, relatively, an envelope may stay under the wanted
// area so that rounding alone never costs a sample: sums and quotients of a few
// doubles are off by a few 1e-16.
const areaSlack = 1e-14

// envelopeLimits refuses, with false, what no envelope can be made for, and
// gives the wanted area without its sign, so that one rule serves both.
func envelopeLimits(area, amplitude, slew float64) (size float64, ok bool) {
	size = math.Abs(area)
	ok = size > 0 && amplitude > 0 && !math.IsInf(amplitude, 0) && slew > 0 &&
		size/amplitude <= MaxSamples // false for NaN, and for an infinite area
	return size, ok
}

// settle takes off the symmetric x, which rises to its centre, the last bits by
// which rounding breaks a limit, gives it the sign of area and returns it.
// Afterwards the doubles themselves, and their differences as doubles, keep the limits.
func settle(x []float64, area, amplitude, slew float64) []float64 {
	before := 0.0
	for k := range (len(x) + 1) / 2 {
		v := math.Min(x[k], amplitude)
		if v-before > slew {
			v = before + slew
			for v-before > slew { // the sum was rounded up
				v = math.Nextafter(v, 0)
			}
		}
		before = v
		v = math.Copysign(v, area)
		x[k], x[len(x)-1-k] = v, v
	}
	return x
}
