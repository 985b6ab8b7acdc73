package shape

import (
	"fmt"
	"math"
	"strings"
	"testing"
)

// sequences are the composite sequences by name.
var sequences = map[string]func(float64) ([]Segment, error){
	"CORPSE": CORPSE, "short CORPSE": ShortCORPSE, "SCROFULOUS": SCROFULOUS, "BB1": BB1, "Knill": Knill,
}

// quaternion w - i (x X + y Y + z Z).
type quaternion struct{ w, x, y, z float64 }

// after is the rotation q following p.
func (q quaternion) after(p quaternion) quaternion {
	return quaternion{
		q.w*p.w - q.x*p.x - q.y*p.y - q.z*p.z,
		q.w*p.x + q.x*p.w + q.y*p.z - q.z*p.y,
		q.w*p.y + q.y*p.w + q.z*p.x - q.x*p.z,
		q.w*p.z + q.z*p.w + q.x*p.y - q.y*p.x,
	}
}

// play drives a spin with the segments at a Rabi rate of 1+eps and a detuning f,
// H = (O cos(phase) X + O sin(phase) Y + f Z)/2, each segment Angle long.
func play(segments []Segment, eps, f float64) quaternion {
	q := quaternion{w: 1}
	for _, s := range segments {
		rate := math.Hypot(1+eps, f)
		sin, cos := math.Sincos(rate * s.Angle / 2)
		q = quaternion{cos, sin * (1 + eps) / rate * math.Cos(s.Phase), sin * (1 + eps) / rate * math.Sin(s.Phase), sin * f / rate}.after(q)
	}
	return q
}

// infidelity is the average gate infidelity of q against a rotation by theta
// about X. For one spin that is 2/3 of the squared vector part of the difference
// (from 1 - F_avg = (1 - F_pro) d/(d+1)), which loses no digits.
func infidelity(q quaternion, theta float64) float64 {
	sin, cos := math.Sincos(theta / 2)
	d := quaternion{w: cos, x: -sin}.after(q)
	return (d.x*d.x + d.y*d.y + d.z*d.z) * 2 / 3
}

// Without error each sequence is its gate, for every angle.
func TestCompositeGates(t *testing.T) {
	for name, sequence := range sequences {
		for i := -48; i <= 48; i++ {
			theta := 2 * math.Pi * float64(i) / 48
			if name == "Knill" {
				theta = math.Copysign(math.Pi, theta)
			}
			s, err := sequence(theta)
			if err != nil {
				t.Fatal(err)
			}
			if got := infidelity(play(s, 0, 0), theta); !(got <= 1e-28) {
				t.Errorf("%s(%v): infidelity %.3g", name, theta, got)
			}
			for _, x := range s {
				if !(x.Angle >= 0 && x.Angle <= 4*math.Pi) || math.IsNaN(x.Phase) {
					t.Errorf("%s(%v): segment %v", name, theta, x)
				}
			}
		}
	}
}

// Angles at 180 degrees. Source: Cummins, Llewellyn, Jones 2003, Phys. Rev. A
// 67, 042308; Wimperis 1994, J. Magn. Reson. A 109, 221 (MEM, confirmed by the
// coefficients below). Knill: Ryan, Hodges, Cory 2010, Phys. Rev. Lett. 105, 200402
// (MEM, confirmed below), 30 0 90 0 30 less 150 degrees.
// SCROFULOUS at 90 and 45 degrees: Cummins et al., table (MEM, confirmed by the formula in reference.py).
func TestCompositePublishedAngles(t *testing.T) {
	for _, c := range []struct {
		name      string
		degrees   float64
		want      string
		tolerance float64 // degrees, half a unit of the last digit given
	}{
		{"CORPSE", 180, "420@0 300@180 60@0", 1e-12},
		{"short CORPSE", 180, "60@0 300@180 60@0", 1e-12},
		{"SCROFULOUS", 180, "180@60 180@-60 180@60", 1e-12},
		{"SCROFULOUS", 90, "115.2@62.0 180@-79.4 115.2@62.0", 0.05},
		{"SCROFULOUS", 45, "96.7@73.4 180@-85.1 96.7@73.4", 0.05},
		{"BB1", 180, "180@104.4775 360@313.4325 180@104.4775 180@0", 0.00005},
		{"Knill", 180, "180@-120 180@-150 180@-60 180@-150 180@-120", 1e-12},
	} {
		s, err := sequences[c.name](c.degrees * math.Pi / 180)
		if err != nil {
			t.Fatal(err)
		}
		want := strings.Fields(c.want)
		if len(s) != len(want) {
			t.Errorf("%s: %d segments, want %d", c.name, len(s), len(want))
			continue
		}
		for i, w := range want {
			var angle, phase float64
			if _, err := fmt.Sscanf(w, "%f@%f", &angle, &phase); err != nil {
				t.Fatal(err)
			}
			tolerance := c.tolerance + 1e-12*360
			if a, p := s[i].Angle*180/math.Pi, s[i].Phase*180/math.Pi; !(math.Abs(a-angle) <= tolerance && math.Abs(p-phase) <= tolerance) {
				t.Errorf("%s(%v): segment %d is %.6f@%.6f, want %s", c.name, c.degrees, i, a, p, w)
			}
		}
	}
	bb1, err := BB1(math.Pi)
	if err != nil {
		t.Fatal(err)
	}
	if want := math.Acos(-0.25); bb1[0].Phase != want || bb1[1].Phase != 3*want {
		t.Errorf("BB1(pi): phases %v, want acos(-1/4) = %v and its treble", bb1, want)
	}
}

// The share of the gate that an error leaves, average gate infidelity. Source:
// the table of composite pulses at 180 degrees (angles of Cummins et al. 2003 and
// Wimperis 1994; coefficients CALC), order and coefficient in eps and f.
func TestCompositeCoefficients(t *testing.T) {
	for _, c := range []struct {
		name                string
		ampOrder            int
		amplitude           float64
		detOrder            int
		detuning, tolerance float64
	}{
		{"CORPSE", 2, math.Pi * math.Pi / 6, 4, 0.0043338, 2e-5},
		{"short CORPSE", 2, math.Pi * math.Pi / 6, 4, 1.8181, 4e-5},
		{"SCROFULOUS", 4, 3.0440, 2, 2.6667, 2e-5},
		{"BB1", 6, 6.2590, 2, 2.0 / 3, 2e-5},
	} {
		checkCoefficients(t, c.name, 180, c.ampOrder, c.amplitude, c.detOrder, c.detuning, c.tolerance)
	}
	// The same and other angles, and Knill, from 60-digit arithmetic (mpmath
	// 1.2.1, CALC; testdata/shape/reference.py writes the sequences on its own).
	for _, c := range readReference(t).Composite {
		checkCoefficients(t, c.Name, c.Degrees, c.AmplitudeOrder, c.Amplitude, c.DetuningOrder, c.Detuning, 3e-6)
		s, err := sequences[c.Name](c.Degrees * math.Pi / 180)
		if err != nil {
			t.Fatal(err)
		}
		for i, want := range c.Segments {
			if !(math.Abs(s[i].Angle-want[0]) <= 1e-14 && math.Abs(s[i].Phase-want[1]) <= 1e-14) {
				t.Errorf("%s(%v): segment %d is %v, want %v", c.Name, c.Degrees, i, s[i], want)
			}
		}
	}
}

func checkCoefficients(t *testing.T, name string, degrees float64, ampOrder int, amplitude float64, detOrder int, detuning, tolerance float64) {
	t.Helper()
	theta := degrees * math.Pi / 180
	s, err := sequences[name](theta)
	if err != nil {
		t.Fatal(err)
	}
	// Errors of 1e-3 and half of that, both signs, extrapolated to none. Order 6
	// leaves a vector part near 1e-9, of which rounding is 1e-7: no smaller errors.
	coefficient := func(order int, of func(float64) quaternion) float64 {
		at := func(h float64) float64 {
			return (infidelity(of(h), theta) + infidelity(of(-h), theta)) / 2 / math.Pow(h, float64(order))
		}
		return (4*at(5e-4) - at(1e-3)) / 3
	}
	if got := coefficient(ampOrder, func(e float64) quaternion { return play(s, e, 0) }); !(math.Abs(got-amplitude) <= tolerance*amplitude) {
		t.Errorf("%s(%v): amplitude %.8g eps^%d, want %.8g", name, degrees, got, ampOrder, amplitude)
	}
	if got := coefficient(detOrder, func(f float64) quaternion { return play(s, 0, f) }); !(math.Abs(got-detuning) <= tolerance*detuning) {
		t.Errorf("%s(%v): detuning %.8g f^%d, want %.8g", name, degrees, got, detOrder, detuning)
	}
}

// Each holds against what it is for at every angle, negative and beyond pi too.
func TestCompositeHolds(t *testing.T) {
	const h = 1e-4
	for name, sequence := range sequences {
		for i := -47; i <= 47; i++ {
			theta := 2 * math.Pi * (float64(i) + 0.37) / 48
			if name == "Knill" {
				theta = math.Copysign(math.Pi, theta)
			}
			s, err := sequence(theta)
			if err != nil {
				t.Fatal(err)
			}
			if name != "CORPSE" && name != "short CORPSE" { // fourth order or better: 1e-16 times a few tens
				if got := infidelity(play(s, h, 0), theta); !(got <= 1e-14) {
					t.Errorf("%s(%v): amplitude error leaves %.3g", name, theta, got)
				}
			}
			if name != "SCROFULOUS" && name != "BB1" {
				if got := infidelity(play(s, 0, h), theta); !(got <= 1e-14) {
					t.Errorf("%s(%v): detuning leaves %.3g", name, theta, got)
				}
			}
		}
	}
}

// The published equations of SCROFULOUS hold to the last digits, small angles included.
func TestScrofulousRoot(t *testing.T) {
	for _, theta := range []float64{0, 1e-12, 1e-8, 1e-3, 0.1, 1, 2, 3, math.Pi - 1e-9, math.Pi} {
		s, err := SCROFULOUS(theta)
		if err != nil {
			t.Fatal(err)
		}
		if got, want := math.Sin(s[0].Angle)/s[0].Angle, 2*math.Cos(theta/2)/math.Pi; !(math.Abs(got-want) <= 3e-16) {
			t.Errorf("theta %v: sinc theta1 = %.17g, want %.17g", theta, got, want)
		}
		// phi1 = pi/2 - pi theta/8 for small theta, by expansion (derived here).
		if theta <= 1e-8 && !(math.Abs(s[0].Phase-(math.Pi/2-math.Pi*theta/8)) <= 1e-15) {
			t.Errorf("theta %v: phi1 = %.17g", theta, s[0].Phase)
		}
		if got := infidelity(play(s, 0, 0), theta); !(got <= 1e-30) {
			t.Errorf("theta %v: infidelity %.3g", theta, got)
		}
	}
}

// A negative angle is the same sequence with all phases turned by pi.
func TestCompositeNegative(t *testing.T) {
	for name, sequence := range sequences {
		plus, err := sequence(math.Pi)
		if err != nil {
			t.Fatal(err)
		}
		minus, err := sequence(-math.Pi)
		if err != nil {
			t.Fatal(err)
		}
		for i := range plus {
			if minus[i].Angle != plus[i].Angle || !(math.Abs(minus[i].Phase-plus[i].Phase-math.Pi) <= 1e-15) {
				t.Errorf("%s: segment %d is %v for -pi, %v for pi", name, i, minus[i], plus[i])
			}
		}
	}
}

func TestCompositeRefused(t *testing.T) {
	for name, sequence := range sequences {
		for _, theta := range []float64{math.NaN(), math.Inf(1), math.Inf(-1), 6.3, -6.3, 1e300} {
			s, err := sequence(theta)
			if s != nil || err == nil || !strings.HasPrefix(err.Error(), "shape: "+name+": a rotation by ") {
				t.Errorf("%s(%v): %v, %v", name, theta, s, err)
			}
		}
	}
	if _, err := Knill(math.Pi / 2); err == nil || !strings.Contains(err.Error(), "a half turn") {
		t.Errorf("Knill(pi/2): %v", err)
	}
}
