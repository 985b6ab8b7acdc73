package hardware

import (
	"fmt"
	"math"
	"math/cmplx"
)

// A Reading is one limit as it was found in samples or codes.
type Reading struct {
	Limit    Limit
	Unit     string  // of Found and Allowed
	Found    float64 // the largest value
	Allowed  float64
	Headroom float64 // 1 - Found/Allowed; 0 where nothing is allowed
	OK       bool    // Found exceeds Allowed by at most CheckTolerance
}

// CheckTolerance is how far, in shares of full scale, samples may exceed a limit and still pass: rounding of the
// arithmetic that made them. It is far less than one code of any converter, so codes are judged exactly.
const CheckTolerance = 1e-12

// CheckSamples judges unrounded samples of one channel, in shares of full scale, against every limit of the profile. It
// shares nothing with Playable: amplitude, slew and guards are read off the samples, ring-out is searched for in time, and what lies out
// of band is integrated over frequency. Readings come in a fixed order; a limit that the profile does not set has none. The largest code is
// that after rounding.
//
// Where the drive compresses, samples are what it reaches (see Channel): amplitude, slew and codes are judged at the converter. The
// mean of each quadrature must be zero before rounding; of codes it may be half an LSB, which is what rounding leaves.
//
// Samples of a baseband channel are real; others are an error.
func (p *Profile) CheckSamples(channel int, x []complex128) ([]Reading, error) {
	c, err := p.checked(channel, len(x))
	if err != nil {
		return nil, err
	}
	for k, v := range x {
		if cmplx.IsNaN(v) || cmplx.IsInf(v) {
			return nil, fmt.Errorf("sample %d is %v; needed: finite numbers", k, v)
		}
		if c.Kind == Baseband && imag(v) != 0 {
			return nil, fmt.Errorf("sample %d is %v; needed: real numbers, as %q is a baseband channel", k, v, c.Name)
		}
	}
	at := x
	if c.Compression != nil {
		at = make([]complex128, len(x))
		for k, v := range x {
			at[k] = c.Compression.Converter(v)
		}
	}
	return p.check(c, at, x, 0), nil
}

// CheckCodes judges codes of one channel, interleaved I0 Q0 I1 Q1 ... or of a baseband channel one for each sample, as CheckSamples does
// samples. A code that the converter does not have is a reading that is not OK; half a pair is an error.
func (p *Profile) CheckCodes(channel int, codes []int16) ([]Reading, error) {
	c, err := p.checked(channel, 0)
	if err != nil {
		return nil, err
	}
	at, err := c.atConverter(codes, p.Bits)
	if err != nil {
		return nil, err
	}
	if _, err := p.checked(channel, len(at)); err != nil {
		return nil, err
	}
	reached := at
	_, steepest := c.Compression.slopes(1)
	if c.Compression != nil {
		reached = make([]complex128, len(at))
		for k, v := range at {
			reached[k] = c.Compression.Reached(v)
		}
		if c.Kind != Baseband {
			least, most := c.Compression.slopes(1)
			steepest = stretch(least, most)
		}
	}
	return p.check(c, at, reached, steepest*LeastStep(p.Bits)/2), nil
}

// checked gives a channel, and complains of one that is not there and of too many samples.
func (p *Profile) checked(channel, samples int) (*Channel, error) {
	if channel < 0 || channel >= len(p.Channels) {
		return nil, fmt.Errorf("%s has no channel %d; it has %d", p.Name, channel, len(p.Channels))
	}
	if samples > maxSamples {
		return nil, fmt.Errorf("%d samples; allowed: at most %d", samples, maxSamples)
	}
	return &p.Channels[channel], nil
}

// check judges samples at the converter and what the drive makes of them. mean is what the mean of a quadrature may be.
func (p *Profile) check(c *Channel, at, reached []complex128, mean float64) []Reading {
	scale := math.Ldexp(1, p.Bits-1)
	var guards, amplitude, code, slew float64
	last := complex128(0)
	for k, v := range at {
		if k < c.GuardLead || k >= len(at)-c.GuardTrail {
			guards = max(guards, cmplx.Abs(v))
		}
		if c.boxed() {
			amplitude = max(amplitude, math.Abs(real(v)), math.Abs(imag(v)))
		} else {
			amplitude = max(amplitude, cmplx.Abs(v))
		}
		for _, q := range []float64{real(v), imag(v)} {
			// -2^(bits-1) exists and counts like 2^(bits-1) - 1.
			q = math.Round(q * scale)
			code = max(code, q, -q-1)
		}
		slew = max(slew, math.Abs(real(v-last)), math.Abs(imag(v-last)))
		last = v
	}
	slew = max(slew, math.Abs(real(last)), math.Abs(imag(last)))

	length := reading(Length, "samples", float64(len(at)), float64(p.Longest))
	length.OK = p.CheckSpan(len(at)) == nil
	list := []Reading{length,
		reading(Guards, "of full scale", guards, 0),
		reading(Amplitude, "of full scale", amplitude, c.AmplitudeLimit),
		reading(LargestOne, "code", code, float64(LargestCode(p.Bits))),
	}
	if !math.IsInf(c.SlewLimit, 1) {
		list = append(list, reading(Slew, "of full scale per sample", slew, c.SlewLimit))
	}
	if c.RMSLimit > 0 {
		sum := 0.0
		for _, v := range reached {
			sum += real(v)*real(v) + imag(v)*imag(v)
		}
		over := math.Max(float64(len(reached)), c.RMSPeriod/p.SamplePeriod)
		list = append(list, reading(RMS, "of full scale", math.Sqrt(sum/over), c.RMSLimit))
	}
	if c.OutOfBand > 0 && c.Band*p.SamplePeriod < 0.5 {
		energy := outOfBand(reached, c.Band*p.SamplePeriod)
		list = append(list, reading(OutOfBand, "of full scale rms", math.Sqrt(energy/float64(len(reached))), c.OutOfBand))
	}
	if c.ZeroMean {
		sum := complex128(0)
		for _, v := range reached {
			sum += v
		}
		found := math.Max(math.Abs(real(sum)), math.Abs(imag(sum))) / float64(max(1, len(reached)))
		list = append(list, reading(Mean, "of full scale", found, mean))
	}
	if limit := c.RingOut.Limit; !math.IsInf(limit, 1) {
		fast, tail := p.ringOut(c, reached)
		list = append(list, reading(RingOutFast, "of full scale", fast, limit), reading(RingOutTail, "of full scale", tail, c.RingOut.After(math.Inf(1))))
	}
	return list
}

// Kept says whether every reading is OK.
func Kept(list []Reading) bool {
	for _, r := range list {
		if !r.OK {
			return false
		}
	}
	return true
}

func reading(limit Limit, unit string, found, allowed float64) Reading {
	r := Reading{Limit: limit, Unit: unit, Found: found, Allowed: allowed, OK: found <= allowed+CheckTolerance}
	if allowed != 0 {
		r.Headroom = 1 - found/allowed
	}
	return r
}

const (
	// stepShare is the step of the search in time as a share of 1/|p| of the fastest pole that is left: small enough for second
	// differences to show how v bends, also where many poles make it turn far more sharply than one could.
	stepShare = 0.04
	// leftExponent: a pole is left until e^-leftExponent, 1e-20.
	leftExponent = 46
	// subdivision and divisions: each division makes what an interval can hide 64 times smaller, 2e-4 becomes 3e-15.
	subdivision = 8
	divisions   = 6
	// leastGain: where v bends by no more than this share of the largest value, rounding is all that a division would find; on
	// the flat of a slow tail every interval would be divided for nothing.
	leastGain = 1e-13
)

// ringOut searches for the largest quadrature of what arrives after the span, in the first RingOut.Fast ns and later.
func (p *Profile) ringOut(c *Channel, x []complex128) (fast, tail float64) {
	times := []float64{0}
	split := 1 // the index of the first time after RingOut.Fast
	for {
		t, rate := times[len(times)-1], 0.0
		for _, term := range c.Line.Terms {
			// t^(m-1) delays the decay of a repeated pole.
			if s := -real(term.Pole) * t; s-float64(term.Power-1)*math.Log1p(s) < leftExponent {
				rate = max(rate, cmplx.Abs(term.Pole))
			}
		}
		if rate == 0 {
			break
		}
		next := t + stepShare/rate
		if t < c.RingOut.Fast {
			next = min(next, c.RingOut.Fast)
		}
		times = append(times, next)
		if next <= c.RingOut.Fast {
			split = len(times)
		}
	}
	v := p.arrive(c, x, times)
	fast = p.largest(c, x, times[:split], v[:split])
	if split < len(times) {
		tail = p.largest(c, x, times[split-1:], v[split-1:])
	}
	return fast, tail
}

// largest gives the largest quadrature between the first and the last of the times, where v arrives. Between two instants v stays
// within an eighth of its second difference of the chord. Intervals that with four times as much could still hold the largest
// value are divided, again and again.
func (p *Profile) largest(c *Channel, x []complex128, times []float64, v []complex128) float64 {
	found := 0.0
	for _, part := range []func(complex128) float64{
		func(v complex128) float64 { return real(v) },
		func(v complex128) float64 { return imag(v) },
	} {
		most := 0.0
		for _, z := range v {
			most = max(most, math.Abs(part(z)))
		}
		if most == 0 {
			continue
		}
		// The times are runs of cells intervals each; between one run and the next is a gap.
		times, v, cells := times, v, len(times)-1
		for range divisions {
			var finer []float64
			for i := 0; i+1 < len(times); i++ {
				first := i - i%(cells+1) // of the run
				if i == first+cells {
					continue
				}
				bend := 0.0
				for j := max(i, first+1); j <= min(i+1, first+cells-1); j++ {
					bend = max(bend, math.Abs(part(v[j-1])-2*part(v[j])+part(v[j+1])))
				}
				// A single interval has no second difference yet and is always divided.
				higher := max(math.Abs(part(v[i])), math.Abs(part(v[i+1]))) + bend/2
				if cells > 1 && (bend/2 <= leastGain*most || higher < most) {
					continue
				}
				for j := range subdivision + 1 {
					finer = append(finer, times[i]+(times[i+1]-times[i])*float64(j)/subdivision)
				}
			}
			if len(finer) == 0 {
				break
			}
			times, cells = finer, subdivision
			v = p.arrive(c, x, times)
			for _, z := range v {
				most = max(most, math.Abs(part(z)))
			}
		}
		found = max(found, most)
	}
	return found
}

// arrive gives what arrives at ascending times after the span.
func (p *Profile) arrive(c *Channel, x []complex128, after []float64) []complex128 {
	end := float64(len(x)) * p.SamplePeriod
	times := make([]float64, len(after))
	for i, t := range after {
		times[i] = end + t
	}
	return c.Line.Held(x, p.SamplePeriod, times, nil)
}
