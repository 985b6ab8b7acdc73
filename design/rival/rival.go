// Package rival makes the textbook pulses that a design is compared with: the
// square with the ramps that the slew limit asks for, and the raised cosine, each
// of the shortest length that fits amplitude and slew and calibrated through the
// same line, in a span of whole blocks, as a bench would: amplitude, phase and
// frequency.
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
	Samples []complex128 // of the whole span, guards included; share of full scale that is reached, before any compression is undone
}

// A Turn is the rotation that rivals make.
type Turn struct {
	Angle float64 // rad, positive
	Phase float64 // rad, of its axis, from the in-phase axis towards quadrature
	// Slope is how fast the phase of the samples has to run for the drive to stay on the transition, rad/ns: the device's detuning, with the
	// sign that the quadratures give it. The calibration starts there.
	Slope float64
}

// A Judge returns the average gate infidelity of samples played through the
// line, for the ends that count.
type Judge func(samples []complex128) (float64, error)

const (
	// goodEnough is the infidelity below which a calibration gains nothing: what is
	// left of a textbook pulse's first calibration is far above it, or zero.
	goodEnough = 1e-10
	// Evaluations that a calibration of amplitude and phase may take, and one of frequency with them.
	twoBudget, threeBudget = 80, 400
)

// shares are the parts of the amplitude and slew limits that a first pulse takes: calibrated, it needs a little more or
// less, and when that is beyond the limits a slower one is tried.
var shares = [...]float64{1, 0.97, 0.9, 0.8, 0.65}

// Make calibrates the rivals of a rotation on a channel of the profile. Rivals that do not fit the instrument are left out.
func Make(p *hardware.Profile, channel int, turn Turn, judge Judge) ([]Rival, error) {
	ch := &p.Channels[channel]
	gain := cmplx.Abs(ch.Line.DC())
	if gain == 0 {
		return nil, nil
	}
	var list []Rival
	for _, f := range []struct {
		name string
		make func(area, amplitude, slew float64) []float64
	}{{"square", shape.RampedSquare}, {"raised cosine", shape.RaisedCosine}} {
		for _, share := range shares {
			x, err := one(p, ch, turn, share, f.make, judge)
			if err != nil {
				return nil, err
			}
			if x != nil {
				list = append(list, Rival{Name: f.name, Samples: x})
				break
			}
		}
	}
	return list, nil
}

// one calibrates one rival that at first takes a share of the limits, and gives nothing where it does not fit.
func one(p *hardware.Profile, ch *hardware.Channel, turn Turn, share float64, envelope func(area, amplitude, slew float64) []float64, judge Judge) ([]complex128, error) {
	limits := limitsOf(p, ch)
	area := turn.Angle / (ch.FullScale * p.SamplePeriod * cmplx.Abs(ch.Line.DC()))
	first := envelope(area, share*limits.amplitude, share*limits.slew)
	if first == nil {
		return nil, nil
	}
	samples := span(p, ch, len(first))
	if p.CheckSpan(samples) != nil {
		return nil, nil
	}
	// The phase is that of the pulse's middle, so that it and the slope do not depend on each other to first order.
	phase, middle := turn.Phase-cmplx.Phase(ch.Line.DC()), float64(len(first)-1)/2
	at := func(scale, off, slope float64) []complex128 {
		x := make([]complex128, samples)
		for k, v := range first {
			x[ch.GuardLead+k] = cmplx.Rect(v*scale, phase+off+slope*p.SamplePeriod*(float64(k)-middle))
		}
		return x
	}
	best, err := calibrate(at, turn.Slope, float64(len(first))*p.SamplePeriod, judge)
	if err != nil || limits.broken(best) {
		return nil, err
	}
	return best, nil
}

// span is the shortest legal number of samples with room for n and the guards.
func span(p *hardware.Profile, ch *hardware.Channel, n int) int {
	n += ch.GuardLead + ch.GuardTrail
	n = (n + p.Block - 1) / p.Block * p.Block
	return max(n, p.Shortest)
}

// calibrate finds the scale, the phase and the slope (rad/ns) with the least infidelity of a pulse of some length (ns): the first two at the given
// slope, and all three where that is not enough.
func calibrate(at func(scale, off, slope float64) []complex128, slope, length float64, judge Judge) ([]complex128, error) {
	x := at(1, 0, slope)
	loss, err := judge(x)
	if err != nil || loss < goodEnough {
		return x, err
	}
	v := []float64{0, 0, 0}
	for _, stage := range []struct{ variables, budget int }{{2, twoBudget}, {3, threeBudget}} {
		var failed error
		reached := math.Inf(1)
		pulse := func(u []float64) []complex128 {
			w := append(append([]float64(nil), u...), v[len(u):]...)
			return at(1+w[0], w[1], slope+w[2]/length)
		}
		problem := optimize.Problem{
			Func: func(u []float64) float64 {
				loss, err := judge(pulse(u))
				if err != nil {
					failed = err
					return math.Inf(1)
				}
				reached = math.Min(reached, loss)
				return loss
			},
			Status: func() (optimize.Status, error) {
				if failed != nil {
					return optimize.Failure, failed
				}
				if reached < goodEnough/10 {
					return optimize.Success, nil
				}
				return optimize.NotTerminated, nil
			},
		}
		r, err := optimize.Minimize(problem, append([]float64(nil), v[:stage.variables]...),
			&optimize.Settings{FuncEvaluations: stage.budget, Converger: &optimize.FunctionConverge{Absolute: 1e-13, Relative: 1e-5, Iterations: 30}},
			&optimize.NelderMead{SimplexSize: 0.02})
		if failed != nil {
			return nil, failed
		}
		if r == nil {
			return nil, err
		}
		copy(v, r.X)
		if r.F < goodEnough {
			break
		}
	}
	return at(1+v[0], v[1], slope+v[2]/length), nil
}

// limits are what samples have to keep, in shares of full scale.
type limits struct {
	amplitude, slew float64 // of what is reached: what a pulse of constant phase may take
	converter, step float64 // of what the converter plays
	compression     hardware.Compression
	box             bool // converter limits I and Q apart
}

func limitsOf(p *hardware.Profile, ch *hardware.Channel) limits {
	l := limits{converter: math.Min(ch.AmplitudeLimit, 1-hardware.LeastStep(p.Bits)), step: ch.SlewLimit, compression: ch.Compression, box: ch.Envelope == hardware.Box}
	// Where a drive compresses, the converter steps more than what is reached, by the inverse of the table's slope.
	slope := 1.0
	for i := 1; i < len(ch.Compression); i++ {
		a, b := ch.Compression[i-1], ch.Compression[i]
		slope = math.Min(slope, (b.Reached-a.Reached)/(b.Converter-a.Converter))
	}
	l.amplitude = real(ch.Compression.Reached(complex(l.converter, 0)))
	l.slew = slope * ch.SlewLimit
	return l
}

// broken says whether a calibrated pulse leaves the limits by more than a
// rounding would.
func (l *limits) broken(x []complex128) bool {
	const more = 1 + 1e-9
	last := complex128(0)
	for _, v := range append(append([]complex128(nil), x...), 0) {
		v = l.compression.Converter(v)
		size := cmplx.Abs(v)
		if l.box {
			size = math.Max(math.Abs(real(v)), math.Abs(imag(v)))
		}
		d := v - last
		if size > l.converter*more || math.Abs(real(d)) > l.step*more || math.Abs(imag(d)) > l.step*more {
			return true
		}
		last = v
	}
	return false
}
