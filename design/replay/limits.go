package replay

import (
	"context"
	"math"
	"math/cmplx"

	"holdfast/hardware"
)

// ringOut names the reading of everything that arrives after the span where the model does not tell its parts apart.
const ringOut hardware.Limit = "ring-out"

// Limits reads every limit of every channel from the codes, or from the samples where there are no codes. It uses no constraint row
// and none of package hardware's checks: amplitudes, differences and guards are counted, and what still arrives after the
// span is integrated and its peaks sought. Guards, amplitude and slew are of what the converter plays; rms, out-of-band, mean and ring-out
// of what compression leaves of it.
//
// Rounding keeps no sum of zero: a mean passes within half a code in each quadrature, or the most that compression makes of half a code,
// as if every sample had been rounded the same way.
func (m *Model) Limits(ctx context.Context) ([]Limit, error) {
	var list []Limit
	for i := range m.Channels {
		c := &m.Channels[i]
		add := func(limit hardware.Limit, unit string, found, allowed float64) {
			r := hardware.Reading{Limit: limit, Unit: unit, Found: found, Allowed: allowed, OK: found <= allowed+hardware.CheckTolerance}
			if allowed != 0 {
				r.Headroom = 1 - found/allowed
			}
			list = append(list, Limit{Channel: c.Name, Reading: r})
		}
		full := math.Ldexp(1, m.Bits-1)
		var guards, amplitude, slew, code, energy float64
		var last, sum complex128
		y := make([]complex128, len(c.Samples))
		step := func(x complex128) {
			slew = math.Max(slew, math.Max(math.Abs(real(x-last)), math.Abs(imag(x-last))))
			last = x
		}
		for k, x := range c.Samples {
			step(x)
			if c.Box {
				amplitude = math.Max(amplitude, math.Max(math.Abs(real(x)), math.Abs(imag(x))))
			} else {
				amplitude = math.Max(amplitude, cmplx.Abs(x))
			}
			y[k] = c.Compressed(x)
			energy += square(y[k])
			sum += y[k]
			if k < c.GuardLead || k >= m.Samples-c.GuardTrail {
				guards = math.Max(guards, cmplx.Abs(x))
			}
			for _, v := range [...]float64{real(x), imag(x)} {
				v = math.Round(v * full)
				code = math.Max(code, math.Max(v, -v-1)) // the most negative code exists
			}
		}
		step(0)
		add(hardware.Guards, "of full scale", guards, 0)
		if !math.IsInf(c.MaxShare, 1) {
			add(hardware.Amplitude, "of full scale", amplitude, c.MaxShare)
		}
		add(hardware.LargestOne, "code", code, full-1)
		if !math.IsInf(c.MaxSlew, 1) {
			add(hardware.Slew, "of full scale per sample", slew, c.MaxSlew)
		}
		span := float64(m.Samples)
		if c.RMS > 0 {
			add(hardware.RMS, "of full scale", math.Sqrt(energy/math.Max(span, c.RMSSamples)), c.RMS)
		}
		if c.OutOfBand > 0 {
			add(hardware.OutOfBand, "of full scale rms", math.Sqrt(outside(y, c.Band*m.SamplePeriod)/span), c.OutOfBand)
		}
		if c.ZeroMean {
			add(hardware.Mean, "of full scale", math.Max(math.Abs(real(sum)), math.Abs(imag(sum)))/span, 0.5*c.stretch()/full)
		}
		if c.RingOutTail == 0 && math.IsInf(c.RingOut, 1) {
			continue
		}
		fast, tail, err := m.ringing(ctx, i)
		if err != nil {
			return nil, err
		}
		if c.RingOutTail == 0 {
			add(ringOut, "of full scale", math.Max(fast, tail), c.RingOut)
			continue
		}
		if !math.IsInf(c.RingOut, 1) {
			add(hardware.RingOutFast, "of full scale", fast, c.RingOut)
		}
		add(hardware.RingOutTail, "of full scale", tail, c.RingOutTail)
	}
	return list, nil
}

// stretch is by how much compression can multiply an error of up to half a code in each quadrature. Along the radius it multiplies
// by a slope of the table and across by one between the least and the most of them: with a and b the most and the least, an
// error (1, 1)/2 seen by a quadrature at angle t to the radius is at most
//
//	a cos^2 t + b sin^2 t + (a - b) cos t sin t <= (a + b)/2 + (a - b)/sqrt 2
//
// times a half, and where there is one quadrature a times a half.
func (c *Channel) stretch() float64 {
	if len(c.Compression) < 2 {
		return 1
	}
	least, most := math.Inf(1), 0.0
	for k := 1; k < len(c.Compression); k++ {
		p, q := c.Compression[k-1], c.Compression[k]
		slope := (q.Reached - p.Reached) / (q.Share - p.Share)
		least, most = math.Min(least, slope), math.Max(most, slope)
	}
	if c.Kind == "baseband" {
		return most
	}
	return (most+least)/2 + (most-least)/math.Sqrt2
}

// outside gives the energy of x outside the band |f| <= w, in cycles a sample: the sum of |x|^2 less that inside,
//
//	sum over j, k of x_j conj(x_k) sin(2 pi w (j-k))/(pi (j-k))
//
// from the autocorrelation of x, added up as it stands; good to about 1e-15 of the sum of |x|^2.
func outside(x []complex128, w float64) float64 {
	if w >= 0.5 {
		return 0
	}
	first, last := len(x), 0
	for k, v := range x {
		if v != 0 {
			first, last = min(first, k), k+1
		}
	}
	if first > last {
		return 0
	}
	x = x[first:last]
	e := 0.0
	for m := range x {
		r := 0.0 // Re sum x_(k+m) conj(x_k)
		for k, v := range x[m:] {
			r += real(v)*real(x[k]) + imag(v)*imag(x[k])
		}
		if m == 0 {
			e += (1 - 2*w) * r
			continue
		}
		e -= 2 * r * math.Sin(2*math.Pi*w*float64(m)) / (math.Pi * float64(m))
	}
	return math.Max(0, e)
}

// ringing gives the largest quadrature of channel c, in shares of full scale, at any instant after its last sample has been played: in the
// first RingOutFast ns, and from then on.
func (m *Model) ringing(ctx context.Context, c int) (fast, tail float64, err error) {
	// The channel alone, with a quadrature's operators of norm 1 so that the steps resolve u itself.
	one := *m
	one.Channels = []Channel{m.Channels[c]}
	ch := &one.Channels[0]
	ch.FullScale, ch.Delay, ch.Shift, ch.Paths, ch.Operators = 1, 0, 0, nil, make([][]complex128, len(ch.Operators))
	for q := range ch.Operators {
		ch.Operators[q] = [][]complex128{{0, 1, 1, 0}, {0, -1i, 1i, 0}}[q]
	}
	one.WindowStart, one.Dim, one.Rotating, one.Errors = 0, 2, nil, nil
	e := &engine{m: &one, dim: 2, tolerance: stepTolerance}
	e.takeControls()
	w := e.newWalker(nil, 1)
	// What has been stored when the last sample ends, without keeping the steps.
	for k := range m.Samples {
		if err := w.to(ctx, float64(k+1)*m.SamplePeriod, reach{}, &plan{}); err != nil {
			return 0, 0, err
		}
	}
	w.take()
	split := w.t + ch.RingOutFast
	worst := &tail
	if ch.RingOutFast > 0 {
		worst = &fast
	}
	for w.count = 0; w.count < settleBudget; {
		if err := ctx.Err(); err != nil {
			return 0, 0, err
		}
		still := 0.0
		for i := range w.lines[0].chains {
			still += w.lines[0].chains[i].peak()
		}
		if still < 1e-15 || still <= *worst && worst == &tail {
			break
		}
		step := w.step
		if worst == &fast && w.t+step >= split*(1-1e-15) {
			step = split - w.t
		}
		p := w.newPlan()
		if err := w.stride(step, reach{}, p); err != nil {
			return 0, 0, err
		}
		st := p.steps[0]
		for k := range e.controls {
			*worst = math.Max(*worst, largest(p.numbers[st.at+k*st.order:st.at+(k+1)*st.order]))
		}
		if worst == &fast && w.t >= split*(1-1e-15) {
			worst = &tail
		}
	}
	return fast, tail, nil
}

// largest gives the largest |u| of the polynomial sum u_n y^n on [0, 1]: the ends, and between them wherever the slope
// changes its sign from one of 32 parts to the next.
func largest(u []float64) float64 {
	value := func(y float64) float64 {
		s := 0.0
		for n := len(u) - 1; n >= 0; n-- {
			s = s*y + u[n]
		}
		return s
	}
	slope := func(y float64) float64 {
		s := 0.0
		for n := len(u) - 1; n > 0; n-- {
			s = s*y + float64(n)*u[n]
		}
		return s
	}
	most := math.Max(math.Abs(value(0)), math.Abs(value(1)))
	const parts = 32
	before := slope(0)
	for i := range parts {
		lo, hi := float64(i)/parts, float64(i+1)/parts
		after := slope(hi)
		if before*after < 0 {
			for range 50 {
				mid := (lo + hi) / 2
				if before*slope(mid) > 0 {
					lo = mid
				} else {
					hi = mid
				}
			}
			most = math.Max(most, math.Abs(value(lo)))
		}
		before = after
	}
	return most
}
