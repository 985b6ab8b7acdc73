package hardware

import (
	"fmt"
	"math"

	"holdfast/filter"
)

// Mixing is the sign convention of the mixer that joins two quadratures: which carrier Q multiplies.
type Mixing string

const (
	MinusSin Mixing = "I cos - Q sin"
	PlusSin  Mixing = "I cos + Q sin"
)

// The kinds of channel.
const (
	Quadrature = "quadrature" // two converters, I and Q, into one mixer
	Baseband   = "baseband"   // one converter, without a carrier: samples and codes are real
)

// The shapes of a quadrature channel's amplitude limit.
const (
	Disc = "disc" // on the length of (I, Q)
	Box  = "box"  // on I and on Q apart
)

// What happens to channels whose lines are of unlike length.
const (
	AlignDelay = "delay" // all but the latest are delayed by whole samples, as near to it as these allow
	AlignNone  = "none"  // their samples leave the converters together
)

// The widest values that a profile may state. They bound work and memory; real instruments lie well inside.
const (
	minBits, maxBits = 2, 16 // codes are int16
	maxBlock         = 4096
	maxSamples       = 65536
	maxChannels      = 64
	maxLowpass       = 4
	maxTails         = 8
	maxResonances    = 4
	maxPoints        = 64 // of a compression
)

// A Profile is what one instrument and its lines can do. Load makes one.
type Profile struct {
	File         string  // as given to Load
	Name         string  // of the instrument
	SamplePeriod float64 // h, ns
	Bits         int     // of a converter, 2 to 16
	Block        int     // waveform lengths are multiples of this many samples
	Shortest     int     // samples
	Longest      int     // samples
	Align        string  // AlignDelay or AlignNone; Load's default is AlignDelay, and an empty one means the same
	Channels     []Channel
}

// A Channel is one output of the instrument with its line to the device.
//
// Samples are shares of full scale. Where the drive compresses, those of this package's sets and checks are what the drive makes of
// the converter's output, y = Compression.Reached(x): amplitude and slew limit x; rms, out-of-band, mean and ring-out limit y.
type Channel struct {
	Name           string
	Kind           string  // Quadrature or Baseband; an empty one means Quadrature
	Mixing         Mixing  // of a quadrature channel
	Carrier        float64 // GHz; 0: not stated
	FullScale      float64 // steady Rabi frequency at full code (baseband: turning frequency), rad/ns: "40 MHz" is 2 pi 0.04
	FullScaleLevel float64 // at the connector, V; 0: not stated
	Envelope       string  // Disc or Box, of a quadrature channel; an empty one means Disc
	AmplitudeLimit float64 // on |x|, or for a box on |x_I| and |x_Q|, share of full scale, at most 1
	SlewLimit      float64 // on each quadrature, share of full scale per sample; +Inf: none
	RMSLimit       float64 // on the root of sum |y|^2 / max(samples of the span, RMSPeriod/h), share of full scale; 0: none
	RMSPeriod      float64 // ns; 0: the span
	Band           float64 // of the samples, either side of the carrier (baseband: of zero), GHz; +Inf: none
	OutOfBand      float64 // on the rms over the span of what lies outside Band, share of full scale; 0: none
	ZeroMean       bool    // the samples of a span must sum to zero, in I and in Q
	GuardLead      int     // samples held at zero at the start of the span
	GuardTrail     int     // samples held at zero at its end
	RingOut        RingOut
	Latency        float64     // from trigger to converter output, ns
	Compression    Compression // of the drive, before the line; nil: none
	Shift          float64     // of the device by the drive at steady full scale, rad/ns, of either sign: H += Shift |u|^2 Z/2, u in shares
	Line           filter.Line // from converter to device
	Sections       []string    // the line in words, one sentence each, in the order of the profile
	Parameters     []Parameter // of the line: what may be known badly
}

// RingOut limits what still arrives after the span: in each quadrature at most Limit at every instant of the first Fast ns
// and at most Tail at every later one. Fast also tells which poles make up the slow tail.
type RingOut struct {
	Limit float64 // share of full scale, per quadrature; +Inf: none, and none later either
	Fast  float64 // ns
	Tail  float64 // share of full scale; 0: Limit
}

// After gives the limit at t ns after the span.
func (r RingOut) After(t float64) float64 {
	if t > r.Fast && r.Tail > 0 && !math.IsInf(r.Limit, 1) {
		return r.Tail
	}
	return r.Limit
}

// A Parameter is one figure of a line, and what the line does when it changes. The names are lowpass[i].corner, allpass, ac_coupling,
// resonance[i].offset, .half_width and .depth (an offset of zero has none), tails[i].amplitude and .time, delay.
type Parameter struct {
	Name    string  // such as "lowpass[0].corner"
	KnownTo float64 // relative to its value, where the profile says so; 0: not stated
	// Slope is dG/dlambda of the whole line when the parameter becomes 1+lambda times what the profile says, with the delay of the line:
	// samples x that arrive as u arrive as u + lambda Slope x. Its steady gain is 0: full scale is what was measured, whatever the parameter.
	Slope   filter.Line
	Refused string // why there is no Slope, one clause; empty: there is
}

// Parameter finds a parameter of the line by its name.
func (c *Channel) Parameter(name string) (p *Parameter, ok bool) {
	for i := range c.Parameters {
		if c.Parameters[i].Name == name {
			return &c.Parameters[i], true
		}
	}
	return nil, false
}

// Columns is the number of converters, and of codes for each sample: 2 for a quadrature channel, 1 for a baseband one.
func (c *Channel) Columns() int {
	if c.Kind == Baseband {
		return 1
	}
	return 2
}

// boxed reports whether the amplitude limit holds for each quadrature apart.
func (c *Channel) boxed() bool { return c.Kind == Baseband || c.Envelope == Box }

// Start is the instant at which the window of channel c begins at the device: its latency, the pure delay of its line and its
// shift, ns after the trigger. The rest of a line's group delay belongs to the shape that arrives.
func (p *Profile) Start(c int) float64 {
	return p.arrival(c) + float64(p.Shift(c))*p.SamplePeriod
}

// arrival is Start without the shift.
func (p *Profile) arrival(c int) float64 { return p.Channels[c].Latency + p.Channels[c].Line.Delay }

// Shift is the number of whole samples by which channel c has to be delayed so that its window begins as near as possible to that
// of the latest channel of the profile; 0 when channels are not aligned. At most half a sample period remains.
func (p *Profile) Shift(c int) int {
	if p.Align == AlignNone {
		return 0
	}
	latest := 0.0
	for i := range p.Channels {
		latest = max(latest, p.arrival(i))
	}
	return int(math.Round((latest - p.arrival(c)) / p.SamplePeriod))
}

// Window is the latest Start of all channels, ns after the trigger.
func (p *Profile) Window() float64 {
	latest := 0.0
	for c := range p.Channels {
		latest = max(latest, p.Start(c))
	}
	return latest
}

// Channel finds a channel by its name.
func (p *Profile) Channel(name string) (index int, ok bool) {
	for i := range p.Channels {
		if p.Channels[i].Name == name {
			return i, true
		}
	}
	return 0, false
}

// CheckSpan says why the instrument cannot play a waveform of this many samples, or nil.
func (p *Profile) CheckSpan(samples int) error {
	switch {
	case samples < p.Shortest || samples > p.Longest:
		return fmt.Errorf("a span of %d samples; %s plays %d to %d", samples, p.Name, p.Shortest, p.Longest)
	case samples%p.Block != 0:
		return fmt.Errorf("a span of %d samples; %s plays multiples of %d", samples, p.Name, p.Block)
	}
	return nil
}
