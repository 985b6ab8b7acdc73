// Package rival makes the textbook pulses that a design is compared with: the
// square with the ramps that the slew limit asks for, and the raised cosine, each
// of the shortest length that fits amplitude and slew and calibrated through the
// same line, in a span of whole blocks.
//
// It stands beside package design and uses none of it: package shape gives the
// envelopes, whoever calls gives the judge (replay, as a rule).
package rival

import (
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/optimize"

	"holdfast/hardware"
	"holdfast/shape"
)

// A Rival is one textbook pulse.
type Rival struct {
	Name    string       // "square", "raised cosine"
	Samples []complex128 // of the whole span, guards included; share of full scale
}

// A Judge returns the average gate infidelity of samples played through the
// line, for the ends that count.
type Judge func(samples []complex128) (float64, error)

// goodEnough is the infidelity below which a calibration gains nothing: what is
// left of a textbook pulse's first calibration is far above it, or zero.
const goodEnough = 1e-10

// Make calibrates the rivals of a rotation by angle (rad, positive) about the axis
// at phase (rad) from the in-phase axis towards quadrature, on a channel of the
// profile. Rivals that do not fit the instrument are left out.
func Make(p *hardware.Profile, channel int, angle, phase float64, judge Judge) ([]Rival, error) {
	ch := &p.Channels[channel]
	lsb := hardware.LeastStep(p.Bits)
	amplitude := math.Min(ch.AmplitudeLimit, 1-lsb)
	gain := cmplx.Abs(ch.Line.DC())
	if gain == 0 {
		return nil, nil
	}
	area := angle / (ch.FullScale * p.SamplePeriod * gain)
	phase -= cmplx.Phase(ch.Line.DC())
	var list []Rival
	for _, f := range []struct {
		name string
		make func(area, amplitude, slew float64) []float64
	}{{"square", shape.RampedSquare}, {"raised cosine", shape.RaisedCosine}} {
		first := f.make(area, amplitude, ch.SlewLimit)
		if first == nil {
			continue
		}
		samples := span(p, ch, len(first))
		if p.CheckSpan(samples) != nil {
			continue
		}
		at := func(scale, turn float64) []complex128 {
			x := make([]complex128, samples)
			for k, v := range first {
				x[ch.GuardLead+k] = cmplx.Rect(v*scale, phase+turn)
			}
			return x
		}
		best, err := calibrate(at, judge)
		if err != nil {
			return nil, err
		}
		// the calibrated pulse may need a little more than the limits leave
		if overdriven(best, amplitude, ch.SlewLimit) {
			continue
		}
		list = append(list, Rival{Name: f.name, Samples: best})
	}
	return list, nil
}

// span is the shortest legal number of samples with room for n and the guards.
func span(p *hardware.Profile, ch *hardware.Channel, n int) int {
	n += ch.GuardLead + ch.GuardTrail
	n = (n + p.Block - 1) / p.Block * p.Block
	return max(n, p.Shortest)
}

// calibrate finds the scale and the phase with the least infidelity.
func calibrate(at func(scale, turn float64) []complex128, judge Judge) ([]complex128, error) {
	x := at(1, 0)
	loss, err := judge(x)
	if err != nil || loss < goodEnough {
		return x, err
	}
	var failed error
	problem := optimize.Problem{Func: func(v []float64) float64 {
		loss, err := judge(at(1+v[0], v[1]))
		if err != nil {
			failed = err
			return math.Inf(1)
		}
		return loss
	}}
	r, err := optimize.Minimize(problem, []float64{0, 0},
		&optimize.Settings{FuncEvaluations: 80, Converger: &optimize.FunctionConverge{Absolute: 1e-12, Iterations: 20}},
		&optimize.NelderMead{SimplexSize: 0.02})
	if failed != nil {
		return nil, failed
	}
	if r == nil {
		return nil, err
	}
	return at(1+r.X[0], r.X[1]), nil
}

// overdriven says whether a calibrated pulse leaves the limits by more than a
// rounding would.
func overdriven(x []complex128, amplitude, slew float64) bool {
	last := complex128(0)
	for _, v := range append(append([]complex128(nil), x...), 0) {
		d := v - last
		if cmplx.Abs(v) > amplitude*(1+1e-9) || math.Abs(real(d)) > slew*(1+1e-9) || math.Abs(imag(d)) > slew*(1+1e-9) {
			return true
		}
		last = v
	}
	return false
}
