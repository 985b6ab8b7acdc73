package replay

import (
	"context"
	"math"
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
