package shape

import "math"

// Concentration returns, of the energy of each column, the share inside and the
// share outside the band |f| <= W:
//
//	inside(j) = int_-W^W |V_j(f)|^2 df,  V_j(f) = sum_k v_j(k) e^{-2 pi i f k},
//
// and outside(j) the same integral over the rest of |f| <= 1/2. Of a Slepian
// column made for W, inside is the eigenvalue of the sinc kernel. Both are sums of
// positive terms, each integrated over its own part of the frequencies. The
// rounding of the columns, 1e-16 of their norm, leaves an error of about 1e-16
// times the root of the share, 1e-21 for a share of 1e-10, where one minus the
// other would be off by 1e-16.
//
// bandTimesPeriod is W in cycles per sample, over 0 and at most 0.5; anything
// else is an error. The cost is of order 3 N^2 (Count + 20): seconds at N = 4096.
func (b *Basis) Concentration(bandTimesPeriod float64) (inside, outside []float64, err error) {
	if err := checkBand(bandTimesPeriod); err != nil {
		return nil, nil, err
	}
	inside, outside = make([]float64, b.Count), make([]float64, b.Count)
	b.energy(0, bandTimesPeriod, inside)
	b.energy(bandTimesPeriod, 0.5, outside)
	return inside, outside, nil
}

// Gauss-Legendre quadrature with n nodes of cos(c x) on [-1, 1] errs by less
// than 2^(2n+1) (n!)^4 c^(2n) / ((2n+1) ((2n)!)^3). |V|^2 is a sum of cosines of up to N-1
// cycles per unit of frequency; over a panel of width panelCycles/N, c is at most pi
// panelCycles, and the error is under 1e-31 of the whole energy.
const (
	panelNodes  = 32
	panelCycles = 5.0
)

// energy adds to dst[j] the energy of column j in lo <= |f| <= hi.
func (b *Basis) energy(lo, hi float64, dst []float64) {
	b.spectrum(lo, hi, func(weight float64, re, im []float64) {
		for j := range dst {
			dst[j] += weight * (re[j]*re[j] + im[j]*im[j])
		}
	})
}

// spectrum calls visit for the nodes of a quadrature over lo <= |f| <= hi, with
// their weights and the transforms of all columns at positive f, whose phase
// is that at the centre of the free samples; the weights count the negative f too.
// What visit is given is valid during the call only.
func (b *Basis) spectrum(lo, hi float64, visit func(weight float64, re, im []float64)) {
	n := b.Samples - b.Lead - b.Trail
	panels := int(math.Ceil((hi - lo) * float64(n) / panelCycles))
	nodes, weights := legendre()
	cos, sin := make([]float64, n), make([]float64, n)
	re, im := make([]float64, b.Count), make([]float64, b.Count)
	centre := float64(n-1) / 2
	for panel := range panels {
		width := (hi - lo) / float64(panels)
		middle := lo + (float64(panel)+0.5)*width
		for i, x := range nodes {
			f := middle + x*width/2
			for k := range n {
				// The product f (k-centre), less its whole part, with what its
				// rounding lost: without that, long sequences lose digits.
				t := float64(k) - centre
				cycles := f * t
				lost := math.FMA(f, t, -cycles)
				sin[k], cos[k] = math.Sincos(2 * math.Pi * (cycles - math.RoundToEven(cycles) + lost))
			}
			for j := range re {
				var x, y float64
				for k, v := range b.free(j, n) {
					x += v * cos[k]
					y += v * sin[k]
				}
				re[j], im[j] = x, y
			}
			visit(weights[i]*width, re, im) // width/2, twice for the negative frequencies
		}
	}
}

// legendre returns the nodes and weights of Gauss-Legendre quadrature on
// [-1, 1], by Newton's method on the three-term recurrence of the polynomials.
func legendre() (nodes, weights [panelNodes]float64) {
	const n = panelNodes
	for i := range n / 2 {
		x := math.Cos(math.Pi * (float64(i) + 0.75) / (n + 0.5))
		var slope float64
		for range 8 { // quadratic from two digits: five suffice
			p0, p1 := 1.0, x
			for k := 2; k <= n; k++ {
				p0, p1 = p1, (float64(2*k-1)*x*p1-float64(k-1)*p0)/float64(k)
			}
			slope = n * (x*p1 - p0) / (x*x - 1)
			x -= p1 / slope
		}
		w := 2 / ((1 - x*x) * slope * slope)
		nodes[i], weights[i] = -x, w
		nodes[n-1-i], weights[n-1-i] = x, w
	}
	return nodes, weights
}
