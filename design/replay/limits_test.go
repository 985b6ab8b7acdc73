package replay

import (
	"context"
	"math"
	"math/cmplx"
	"testing"

	"holdfast/hardware"
)

func reading(t *testing.T, m *Model, name hardware.Limit) hardware.Reading {
	t.Helper()
	list, err := m.Limits(context.Background())
	if err != nil {
		t.Fatal(err)
	}
	for _, l := range list {
		if l.Limit == name {
			if l.Channel != m.Channels[0].Name {
				t.Errorf("channel %q", l.Channel)
			}
			return l.Reading
		}
	}
	t.Fatalf("no reading of %s", name)
	return hardware.Reading{}
}

func TestLimits(t *testing.T) {
	x := []complex128{0.2, complex(0.4, 0.1), complex(0.5, -0.1), complex(0.3, 0), 0, 0, 0, 0}
	m := rackB(x)
	for name, want := range map[hardware.Limit]float64{
		hardware.Amplitude: math.Hypot(0.5, 0.1), hardware.Slew: 0.3, hardware.Guards: 0, hardware.LargestOne: 4096,
	} {
		if r := reading(t, m, name); !(math.Abs(r.Found-want) <= 1e-15*want) {
			t.Errorf("%s: %g, want %g", name, r.Found, want)
		}
	}
	if r := reading(t, m, hardware.Slew); r.OK || r.Allowed != 0.25 || !(math.Abs(r.Headroom+0.2) <= 1e-12) {
		t.Errorf("slew: %+v", r)
	}
	broken := func(change func(x []complex128), name hardware.Limit) {
		t.Helper()
		y := append([]complex128(nil), x...)
		y[3] = 0.25 // all else in order
		change(y)
		if r := reading(t, m.WithSamples(8, y), name); r.OK {
			t.Errorf("%s: not seen: %+v", name, r)
		}
	}
	broken(func(y []complex128) { y[1] = complex(0.2, 0.95) }, hardware.Amplitude)
	broken(func(y []complex128) { y[0] = complex(0, 0.2501) }, hardware.Slew) // from zero
	broken(func(y []complex128) { y[6], y[7] = 0.2, 0.4 }, hardware.Slew)     // to zero
	broken(func(y []complex128) { y[4] = 1. / 8192 }, hardware.Guards)
	broken(func(y []complex128) { y[2] = 1 }, hardware.LargestOne) // +1 has no code
	broken(func(y []complex128) { y[2] = -8193. / 8192 }, hardware.LargestOne)
	if r := reading(t, m.WithSamples(8, []complex128{-1}), hardware.LargestOne); !r.OK {
		t.Errorf("the most negative code exists: %+v", r)
	}
	if r := reading(t, m.WithSamples(8, []complex128{0, 0, 0, 0.25}), hardware.Slew); !r.OK {
		t.Errorf("a slew of just the limit: %+v", r)
	}
	m.Channels[0].GuardLead = 1
	if r := reading(t, m, hardware.Guards); r.OK || r.Found != 0.2 || r.Headroom != 0 {
		t.Errorf("a leading guard: %+v", r)
	}
	free := spinModel(1, rotation(1, 0), x)
	list, err := free.Limits(context.Background())
	if err != nil || len(list) != 2 {
		t.Errorf("no limits: %v, %v", list, err)
	}
}

// Ring-out against the closed-form response on a dense grid.
func TestRingOut(t *testing.T) {
	x := cosine(24, 28)
	for k := range x {
		x[k] *= complex(1, 0.3*float64(k))
	}
	x[27] = complex(0.01, -0.02)
	for _, sharp := range []float64{1, 8} { // 8: poles that are fast against the sample period
		m := rackB(x)
		for i := range m.Channels[0].Poles {
			m.Channels[0].Poles[i] *= complex(sharp, 0)
			m.Channels[0].Residues[i] *= complex(sharp, 0)
		}
		want := 0.0
		for i := range 10000 {
			u := arrives(m, 0, 3.2+28+float64(i)*0.0004+1e-9)
			want = math.Max(want, math.Max(math.Abs(real(u)), math.Abs(imag(u))))
		}
		if r := reading(t, m, "ring-out"); !(math.Abs(r.Found/want-1) <= 5e-6) || r.Allowed != 0.001 {
			t.Errorf("ring-out %.9g, want %.9g", r.Found, want)
		}
	}
	quiet := rackB(cosine(20, 28))
	for k := range quiet.Channels[0].Samples {
		quiet.Channels[0].Samples[k] *= 0.5
	}
	if r := reading(t, quiet, "ring-out"); !r.OK {
		t.Errorf("a quiet pulse: %+v", r)
	}
}

// Box, rms, mean and out-of-band energy by their definitions, and of what compression leaves.
func TestMoreLimits(t *testing.T) {
	x := []complex128{complex(0.2, 0.3), complex(0.6, -0.7), complex(-0.5, 0.1), complex(0.3, 0), 0, 0, 0, 0}
	m := rackB(x)
	c := &m.Channels[0]
	c.Box, c.RMS, c.OutOfBand, c.Band, c.ZeroMean = true, 0.9, 0.5, 0.13, true
	check := func(name hardware.Limit, found, allowed float64, ok bool) {
		t.Helper()
		if r := reading(t, m, name); !(math.Abs(r.Found-found) <= 1e-12) || !(math.Abs(r.Allowed-allowed) <= 1e-15) || r.OK != ok {
			t.Errorf("%s: %+v, want %.12g of %g", name, r, found, allowed)
		}
	}
	judge := func(leaves func(complex128) complex128, stretch float64) {
		t.Helper()
		var energy float64
		var sum complex128
		for _, v := range x {
			energy += square(leaves(v))
			sum += leaves(v)
		}
		c.RMSSamples = 0
		check(hardware.RMS, math.Sqrt(energy/8), 0.9, true)
		c.RMSSamples = 7.5 // shorter than the span
		check(hardware.RMS, math.Sqrt(energy/8), 0.9, true)
		c.RMSSamples = 40
		check(hardware.RMS, math.Sqrt(energy/40), 0.9, true)
		check(hardware.Mean, math.Max(math.Abs(real(sum)), math.Abs(imag(sum)))/8, stretch/16384, false)
		// int over 0.13 < |f| <= 0.5 cycles a sample of |X(f)|^2 by Simpson's rule.
		const parts = 4000
		outside := 0.0
		for _, side := range []float64{-1, 1} {
			for i := 0; i <= parts; i++ {
				f := side * (0.13 + 0.37*float64(i)/parts)
				var s complex128
				for k, v := range x {
					s += leaves(v) * cmplx.Rect(1, -2*math.Pi*f*float64(k))
				}
				weight := 2.0 + 2*float64(i%2)
				if i == 0 || i == parts {
					weight = 1
				}
				outside += weight * square(s) * 0.37 / parts / 3
			}
		}
		check(hardware.OutOfBand, math.Sqrt(outside/8), 0.5, math.Sqrt(outside/8) <= 0.5)
	}
	check(hardware.Amplitude, 0.7, 0.95, true)
	judge(func(v complex128) complex128 { return v }, 1)
	c.Compression = table
	check(hardware.Amplitude, 0.7, 0.95, true) // as the converter plays
	judge(func(v complex128) complex128 { return pressed(c, v) }, (1.1+0.625)/2+(1.1-0.625)/math.Sqrt2)
	// No rounding of two quadratures is stretched further, and one comes near.
	far := 0.0
	for i := range 2000 {
		v := cmplx.Rect(0.05+0.4*float64(i%20)/20, 2*math.Pi*float64(i)/2000)
		for _, e := range []complex128{1e-6 * (1 + 1i), 1e-6 * (1 - 1i)} {
			d := (pressed(c, v+e) - pressed(c, v)) / 1e-6
			far = math.Max(far, math.Max(math.Abs(real(d)), math.Abs(imag(d))))
		}
	}
	if s := c.stretch(); !(far <= s+1e-5) || !(far >= 0.85*s) {
		t.Errorf("stretched by %g, at most %g", far, s)
	}
	c.Box = false
	check(hardware.Amplitude, math.Hypot(0.6, 0.7), 0.95, true)
	c.Compression, c.RMS, c.RMSSamples = nil, 0.3, 0
	if r := reading(t, m, hardware.RMS); r.OK {
		t.Errorf("rms: not seen: %+v", r)
	}
	// Half a code a sample is what rounding leaves of a mean of zero.
	for _, v := range []struct {
		x  []complex128
		ok bool
	}{{[]complex128{4. / 8192}, true}, {[]complex128{-5i / 8192}, false}, {[]complex128{0.5, -0.5}, true}, {[]complex128{complex(0.1, 0.5), complex(-0.1, 0.5)}, false}} {
		if r := reading(t, m.WithSamples(8, v.x), hardware.Mean); r.OK != v.ok {
			t.Errorf("mean of %v: %+v", v.x, r)
		}
	}
	if r := reading(t, m.WithSamples(8), hardware.OutOfBand); r.Found != 0 || !r.OK {
		t.Errorf("silence out of band: %+v", r)
	}
	c.Band = 0.5
	if r := reading(t, m, hardware.OutOfBand); r.Found != 0 {
		t.Errorf("outside the whole band: %+v", r)
	}
	// A pure tone at 0.25, faded in and out, is outside a band of 0.13 and inside one of 0.37, to what the fading leaves.
	long := rackB(make([]complex128, 256))
	energy := 0.0
	for k := range 256 {
		v := cmplx.Rect(0.25*(1-math.Cos(2*math.Pi*(float64(k)+0.5)/256)), math.Pi/2*float64(k))
		long.Channels[0].Samples[k] = v
		energy += square(v)
	}
	d := &long.Channels[0]
	for band, share := range map[float64]float64{0.13: 1, 0.37: 0} {
		d.OutOfBand, d.Band = 0.1, band
		if r := reading(t, long, hardware.OutOfBand); !(math.Abs(r.Found*r.Found*256/energy-share) <= 1e-6) {
			t.Errorf("a tone: %g of its energy outside %g", r.Found*r.Found*256/energy, band)
		}
	}
}

// Baseband: one quadrature, and no part of a complex response that it does not use.
func TestBasebandLimits(t *testing.T) {
	m := rackB([]complex128{0.3, -0.8, 0.4, 0, 0, 0, 0, 0})
	c := &m.Channels[0]
	c.Kind, c.Operators = "baseband", [][]complex128{halfZ}
	c.Direct, c.Poles, c.Powers, c.Residues = 0, []complex128{complex(-0.5, 0.6)}, []int{1}, []complex128{complex(0.5, 0.4)}
	c.RingOut = 1
	want := 0.0
	for i := range 40000 {
		want = math.Max(want, math.Abs(real(arrives(m, 0, 3.2+8+float64(i)*0.0005+1e-9))))
	}
	if r := reading(t, m, "ring-out"); !(math.Abs(r.Found/want-1) <= 1e-5) {
		t.Errorf("ring-out %.9g, want %.9g", r.Found, want)
	}
	if r := reading(t, m, hardware.Amplitude); r.Found != 0.8 {
		t.Errorf("amplitude %+v", r)
	}
	if r := reading(t, m, hardware.Slew); !(math.Abs(r.Found-1.2) <= 1e-15) {
		t.Errorf("slew %+v", r)
	}
}

// Two budgets of ring-out, the second from an instant on that is none of the integrator's own, against the closed-form response.
func TestRingOutParts(t *testing.T) {
	x := cosine(24, 28)
	x[27] = complex(0.01, -0.02)
	type instant struct{ at, u float64 }
	var dense []instant
	see := func(at float64) instant {
		u := arrives(rackB(x), 0, 3.2+28+at+1e-9)
		return instant{at, math.Max(math.Abs(real(u)), math.Abs(imag(u)))}
	}
	for i := range 3000 {
		dense = append(dense, see(float64(i)*0.003), see(9+float64(i)*0.02))
	}
	for _, fast := range []float64{0, 0.37, 5.3, 40} {
		m := rackB(x)
		c := &m.Channels[0]
		c.RingOutFast, c.RingOutTail = fast, 2e-4
		want := [2]float64{0, see(fast).u}
		if fast > 0 {
			want[0] = want[1]
		}
		for _, v := range dense {
			part := 0
			if v.at >= fast {
				part = 1
			}
			want[part] = math.Max(want[part], v.u)
		}
		for i, name := range []hardware.Limit{hardware.RingOutFast, hardware.RingOutTail} {
			r := reading(t, m, name)
			if !(math.Abs(r.Found-want[i]) <= 2e-5*want[i]+1e-12) || r.Allowed != []float64{0.001, 2e-4}[i] || r.OK != (want[i] <= r.Allowed) {
				t.Errorf("fast to %g ns, %s: %.9g of %g, want %.9g", fast, name, r.Found, r.Allowed, want[i])
			}
		}
		c.RingOut = math.Inf(1) // the tail alone
		list, err := m.Limits(context.Background())
		if err != nil {
			t.Fatal(err)
		}
		if n := len(list); list[n-1].Limit != hardware.RingOutTail || list[n-2].Limit == hardware.RingOutFast {
			t.Errorf("the tail alone: %+v", list)
		}
	}
}
