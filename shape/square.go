package shape

import "math"

// RampedSquare returns the shortest sequence of the given area, the sum of its
// samples, that keeps |x| <= amplitude and |x[k+1]-x[k]| <= slew, the steps from
// and to zero included: a square pulse with the ramps that the instrument asks for.
//
// area is in samples of full scale, of either sign; amplitude is a share of
// full scale; slew is in shares per sample, and +Inf means no limit.
// The limits are kept exactly, as the doubles stand; the area is met to a
// relative 1e-12. It returns nil for an area of zero, for what is not finite or
// not positive where it must be, and where MaxSamples would not do.
//
// No sequence of length L within the limits lies anywhere above
//
//	top(k) = min(amplitude, (k+1) slew, (L-k) slew),  k = 0 ... L-1,
//
// so the length is the least L whose top(k) sum to the area. Of that length the
// result is, where one fits, the symmetric trapezoid with ramps of r equal steps,
//
//	x(k) = H min(1, (k+1)/r, (L-k)/r),  H = area/(L+1-r),
//
// with the least such r, which has the lowest plateau. Else, because the last
// step of the ramps has to be a short one, it is
//
//	x(k) = min(H, (k+1) slew, (L-k) slew)  with the H that meets the area.
func RampedSquare(area, amplitude, slew float64) []float64 {
	size, ok := envelopeLimits(area, amplitude, slew)
	if !ok {
		return nil
	}
	enough := size * (1 - areaSlack)
	if !(largestArea(MaxSamples, amplitude, slew) >= enough) {
		return nil
	}
	short, long := 0, MaxSamples // too short; long enough
	for long-short > 1 {
		if mid := (short + long) / 2; largestArea(mid, amplitude, slew) >= enough {
			long = mid
		} else {
			short = mid
		}
	}
	n := long
	x := make([]float64, n)
	if r := equalSteps(size, n, amplitude, slew); r > 0 {
		plateau := size / float64(n+1-r)
		for k := range x {
			x[k] = plateau * float64(min(r, k+1, n-k)) / float64(r)
		}
	} else {
		plateau := clippedPlateau(size, n, slew)
		for k := range x {
			x[k] = math.Min(plateau, float64(min(k+1, n-k))*slew)
		}
	}
	return settle(x, area, amplitude, slew)
}

// largestArea sums top(k) over n samples.
func largestArea(n int, amplitude, slew float64) float64 {
	half := n / 2
	area := 2 * rampSum(half, amplitude, slew)
	if n%2 == 1 {
		area += math.Min(amplitude, float64(half+1)*slew)
	}
	return area
}

// rampSum is the sum of min(amplitude, k slew) for k = 1 ... n.
func rampSum(n int, amplitude, slew float64) float64 {
	ramp := n // steps that stay under the amplitude
	if steps := math.Floor(amplitude / slew); steps < float64(n) {
		ramp = int(steps)
	}
	var area float64
	if ramp > 0 { // with slew = +Inf there is no ramp, and 0 times Inf is no number
		area = slew * (float64(ramp) * float64(ramp+1) / 2)
	}
	return area + float64(n-ramp)*amplitude
}

// equalSteps is the least number of equal ramp steps with which a trapezoid of
// n samples has the area within the limits, or 0.
func equalSteps(area float64, n int, amplitude, slew float64) int {
	for r := 1; 2*(r-1) < n; r++ {
		plateau := area / float64(n+1-r) * (1 - areaSlack)
		if plateau > amplitude {
			return 0 // and more steps need a higher plateau
		}
		if plateau <= float64(r)*slew {
			return r
		}
	}
	return 0
}

// clippedPlateau solves sum of min(H, (k+1) slew, (n-k) slew) = area for H,
// for an area that the ramps can reach. With m of the steps under H on either side,
//
//	area = m (m+1) slew + (n-2m) H.
func clippedPlateau(area float64, n int, slew float64) float64 {
	for m := 0; 2*m < n; m++ {
		ramps := float64(m) * float64(m+1) * slew
		plateau := (area - ramps) / float64(n-2*m)
		if plateau <= float64(m+1)*slew {
			return plateau
		}
	}
	return math.Inf(1) // an even n at its largest area, by rounding: no plateau
}
