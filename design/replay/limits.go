package replay

import (
	"context"
	"math"
	"math/cmplx"

	"holdfast/hardware"
)

// ringOut names the reading of everything that arrives after the span: [model] does not tell its parts apart.
const ringOut hardware.Limit = "ring-out"

// Limits reads every limit of every channel from the codes, or from the samples where there are no codes. It uses no constraint row
// and none of package hardware's checks: amplitudes, differences and guards are counted, and what still arrives after the
// span is integrated and its peaks sought.
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
		var guards, amplitude, slew, code float64
		var last complex128
		step := func(x complex128) {
			slew = math.Max(slew, math.Max(math.Abs(real(x-last)), math.Abs(imag(x-last))))
			last = x
		}
		for k, x := range c.Samples {
			step(x)
			amplitude = math.Max(amplitude, cmplx.Abs(x))
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
		if !math.IsInf(c.RingOut, 1) {
			found, err := m.ringing(ctx, i)
			if err != nil {
				return nil, err
			}
			add(ringOut, "of full scale", found, c.RingOut)
		}
	}
	return list, nil
}

// ringing gives the largest quadrature of channel c, in shares of full scale, at any instant after its last sample has been played.
func (m *Model) ringing(ctx context.Context, c int) (float64, error) {
	// The channel alone, with a quadrature's operators of norm 1 so that the steps resolve u itself.
	one := *m
	one.Channels = []Channel{m.Channels[c]}
	ch := &one.Channels[0]
	ch.FullScale, ch.Delay = 1, 0
	one.WindowStart = 0
	e := &engine{m: &one, turned: []bool{true}}
	for q := range ch.Operators {
		e.controls = append(e.controls, control{quadrature: q, norm: 1})
	}
	w := e.newWalker(1)
	// What has been stored when the last sample ends, without keeping the steps.
	for k := range m.Samples {
		if err := w.to(ctx, float64(k+1)*m.SamplePeriod, reach{}, &plan{}); err != nil {
			return 0, err
		}
	}
	w.take()
	worst := 0.0
	for w.count = 0; w.count < settleBudget; {
		if err := ctx.Err(); err != nil {
			return 0, err
		}
		still := 0.0
		for i := range w.lines[0].chains {
			still += w.lines[0].chains[i].peak()
		}
		if still <= worst || still < 1e-15 {
			break
		}
		p := &plan{controls: len(e.controls)}
		if err := w.stride(w.step, reach{}, p); err != nil {
			return 0, err
		}
		st := p.steps[0]
		for k := range e.controls {
			worst = math.Max(worst, largest(p.numbers[st.at+k*st.order:st.at+(k+1)*st.order]))
		}
	}
	return worst, nil
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
