package hardware

import (
	"math"
	"math/cmplx"
)

// The integral over frequency is cut into panels of panelWidth/n cycles per sample, n the number of samples between the first and the
// last that is not zero. There every part of |X|^2 makes at most one turn, and the remainder of the rule is below rounding.
const panelWidth = 1.0

// gauss gives the nodes in (0, 1) and the weights of the Gauss-Legendre rule of ten points on [-1, 1], for each sign of the node
// (Abramowitz and Stegun, Handbook of Mathematical Functions, 1964, table 25.4; from memory, confirmed by the test against the sinc kernel).
func gauss() [5][2]float64 {
	return [5][2]float64{
		{0.1488743389816312, 0.2955242247147529},
		{0.4333953941292472, 0.2692667193099963},
		{0.6794095682990244, 0.2190863625159820},
		{0.8650633666889845, 0.1494513491505806},
		{0.9739065285171717, 0.0666713443086881},
	}
}

// outOfBand gives the energy of samples outside |f| <= w cycles per sample,
//
//	int over w < |f| <= 1/2 of |X(f)|^2 df,   X(f) = sum_k x[k] e^{-2 pi i f k},
//
// which for w = 0 is the sum of |x|^2. It is a sum of positive numbers, so a small energy keeps its digits. Work is of order
// 10 n^2 (1 - 2w).
func outOfBand(x []complex128, w float64) float64 {
	first, end := 0, len(x)
	for first < end && x[first] == 0 {
		first++
	}
	for end > first && x[end-1] == 0 {
		end--
	}
	x = x[first:end]
	width := 0.5 - w
	if len(x) == 0 || !(width > 0) {
		return 0
	}
	panels := max(1, int(math.Ceil(width*float64(len(x))/panelWidth)))
	half := width / float64(panels) / 2
	rule := gauss()
	sum := 0.0
	for i := range panels {
		centre := w + float64(2*i+1)*half
		for _, r := range rule {
			for _, f := range [2]float64{centre - r[0]*half, centre + r[0]*half} {
				sum += r[1] * half * (power(x, f) + power(x, -f))
			}
		}
	}
	return sum
}

// power gives |X(f)|^2. The turning factor is made anew every few samples, which keeps its rounding from growing.
func power(x []complex128, f float64) float64 {
	const run = 64
	turn := cmplx.Rect(1, -2*math.Pi*f)
	total := complex128(0)
	for from := 0; from < len(x); from += run {
		part := complex128(0)
		piece := x[from:min(from+run, len(x))]
		for k := len(piece) - 1; k >= 0; k-- { // Horner
			part = part*turn + piece[k]
		}
		total += part * cmplx.Rect(1, -2*math.Pi*math.Mod(f*float64(from), 1))
	}
	return real(total)*real(total) + imag(total)*imag(total)
}
