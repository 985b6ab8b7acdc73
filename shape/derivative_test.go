package shape

import (
	"math"
	"math/cmplx"
	"strings"
	"testing"
)

// ladder plays the samples, held, on exactly three levels with anharmonicity a
// and gives the average gate infidelity against a half turn about X and the
// leakage. Times in samples, rates in rad per sample; detuning may be nil.
func ladder(inPhase, quadrature, detuning []float64, turn, a float64) (infidelity, leakage float64) {
	type matrix [3][3]complex128
	mul := func(x, y *matrix) (z matrix) {
		for i := range 3 {
			for j := range 3 {
				for k := range 3 {
					z[i][j] += x[i][k] * y[k][j]
				}
			}
		}
		return z
	}
	one := matrix{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}}
	u := one
	for k := range inPhase {
		// (O_x (b + b') + O_y i (b' - b))/2 = (o b' + conj(o) b)/2 with o = O_x + i O_y
		o := complex(turn/2, 0) * complex(inPhase[k], quadrature[k])
		var d float64
		if detuning != nil {
			d = detuning[k]
		}
		h := matrix{1: {1: complex(d, 0)}, 2: {2: complex(a+2*d, 0)}}
		for n := range 2 {
			root := complex(math.Sqrt(float64(n+1)), 0)
			h[n+1][n], h[n][n+1] = o*root, cmplx.Conj(o)*root
		}
		step, power := one, one // exp(-i h), |h| well under 1
		for order := 1; order <= 12; order++ {
			power = mul(&power, &h)
			for i := range 3 {
				for j := range 3 {
					power[i][j] *= complex(0, -1/float64(order))
					step[i][j] += power[i][j]
				}
			}
		}
		u = mul(&step, &u)
	}
	// Average gate infidelity with leakage: Pedersen, Moeller, Moelmer, Phys. Lett. A 367, 47 (2007).
	var kept float64
	for i := range 2 {
		for j := range 2 {
			kept += real(u[i][j])*real(u[i][j]) + imag(u[i][j])*imag(u[i][j])
		}
	}
	overlap := cmplx.Abs(u[0][1] + u[1][0]) // of the half turn, up to its phase
	return 1 - (kept+overlap*overlap)/6, 1 - kept/2
}

// X(pi) in 20 ns on three levels with a/2pi = -200 MHz. Source: Motzoi, Gambetta,
// Rebentrost, Wilhelm, Phys. Rev. Lett. 103, 110501 (2009) for the formulas (MEM),
// figures CALC, to four and three digits. They are for a continuous envelope: 8192
// samples here.
func TestDerivativeCorrectionPublished(t *testing.T) {
	const samples, period = 8192, 20. / 8192 // ns
	a := -2 * math.Pi * 0.2 * period
	// (theta/T)(1 - cos 2 pi t/T) at mid-sample; full scale is its peak, 2 theta/T.
	turn := 2 * math.Pi / 20 * period
	x := make([]float64, samples)
	for k := range x {
		x[k] = (1 - math.Cos(2*math.Pi*(float64(k)+0.5)/samples)) / 2
	}
	check := func(name string, inPhase, quadrature, detuning []float64, wantI, tolI, wantL, tolL float64) {
		t.Helper()
		infidelity, leakage := ladder(inPhase, quadrature, detuning, turn, a)
		if !(math.Abs(infidelity-wantI) <= tolI) || !(math.Abs(leakage-wantL) <= tolL) {
			t.Errorf("%s: infidelity %.5g, want %.4g; leakage %.4g, want %.3g", name, infidelity, wantI, leakage, wantL)
		}
	}
	check("none", x, make([]float64, samples), nil, 7.817e-3, 0.6e-6, 3.63e-5, 0.6e-7)
	i, q, err := DerivativeCorrection(x, turn, a)
	if err != nil {
		t.Fatal(err)
	}
	check("fixed carrier", i, q, nil, 4.891e-5, 0.6e-8, 8.57e-6, 0.6e-8)
	i, q, d, err := FullDerivativeCorrection(x, turn, a)
	if err != nil {
		t.Fatal(err)
	}
	check("full", i, q, d, 1.274e-6, 0.6e-9, 1.26e-8, 0.6e-10)
	// The same with the carrier's shift played as a phase: the angle that is left
	// is a rotation about Z, so that leakage is what can be compared.
	phase := 0.0
	for k := range i {
		turned := cmplx.Rect(1, phase+d[k]/2) * complex(i[k], q[k])
		phase += d[k]
		i[k], q[k] = real(turned), imag(turned)
	}
	if _, leakage := ladder(i, q, nil, turn, a); !(math.Abs(leakage-1.26e-8) <= 0.6e-10) {
		t.Errorf("full, by phase: leakage %.4g, want 1.26e-8", leakage)
	}
}

// Sample by sample, by hand.
func TestDerivativeCorrectionByHand(t *testing.T) {
	x := []float64{.25, 1, .5}
	i, q, err := DerivativeCorrection(x, 0.5, -2)
	if err != nil {
		t.Fatal(err)
	}
	fullI, fullQ, d, err := FullDerivativeCorrection(x, 0.5, -2)
	if err != nil {
		t.Fatal(err)
	}
	slope := []float64{.5, .125, -.5}
	for k := range x {
		o := 0.5 * x[k] // rad per sample
		for name, c := range map[string][2]float64{
			"I": {i[k], x[k]}, "Q": {q[k], slope[k] / 4}, "full I": {fullI[k], (o - o*o*o/16) / 0.5}, "full Q": {fullQ[k], slope[k] / 2}, "detuning": {d[k], o * o / 4},
		} {
			if !(math.Abs(c[0]-c[1]) <= 1e-16) {
				t.Errorf("%s: %v at %d, want %v", name, c[0], k, c[1])
			}
		}
	}
	if i[0] = 9; x[0] != .25 {
		t.Error("the envelope is shared with the result")
	}
}

func TestDerivativeCorrectionRefused(t *testing.T) {
	one := []float64{1}
	for want, c := range map[string]struct {
		x       []float64
		turn, a float64
	}{
		"a span of 0 samples":                     {nil, 1, 1},
		"a span of 65537 samples":                 {make([]float64, MaxSamples+1), 1, 1},
		"sample 1 is +Inf":                        {[]float64{1, math.Inf(1)}, 1, 1},
		"a full scale of 0 rad per sample":        {one, 0, 1},
		"a full scale of -1 rad per sample":       {one, -1, 1},
		"a full scale of NaN rad per sample":      {one, math.NaN(), 1},
		"a full scale of +Inf rad per sample":     {one, math.Inf(1), 1},
		"an anharmonicity of 0 rad per sample":    {one, 1, 0},
		"an anharmonicity of NaN rad per sample":  {one, 1, math.NaN()},
		"an anharmonicity of -Inf rad per sample": {one, 1, math.Inf(-1)},
	} {
		_, _, err := DerivativeCorrection(c.x, c.turn, c.a)
		_, _, _, full := FullDerivativeCorrection(c.x, c.turn, c.a)
		for _, err := range []error{err, full} {
			if err == nil || !strings.HasPrefix(err.Error(), "shape: "+want) {
				t.Errorf("got %v, want %q", err, want)
			}
		}
	}
}
