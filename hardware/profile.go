package hardware

import (
	"fmt"

	"holdfast/filter"
)

// Mixing is the sign convention of the mixer that joins two quadratures: which carrier Q multiplies.
type Mixing string

const (
	MinusSin Mixing = "I cos - Q sin"
	PlusSin  Mixing = "I cos + Q sin"
)

// Quadrature is the kind of a channel that feeds I and Q into one mixer.
const Quadrature = "quadrature"

// The widest values that a profile may state. They bound work and memory; real instruments lie well inside.
const (
	minBits, maxBits = 2, 16 // codes are int16
	maxBlock         = 4096
	maxSamples       = 65536
	maxChannels      = 64
	maxLowpass       = 4
	maxTails         = 8
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
	Channels     []Channel
}

// A Channel is one output of the instrument with its line to the device.
type Channel struct {
	Name           string
	Kind           string // Quadrature
	Mixing         Mixing
	Carrier        float64 // GHz; 0: not stated
	FullScale      float64 // steady Rabi frequency at full code, rad/ns: "40 MHz" is 2 pi 0.04
	FullScaleLevel float64 // at the connector, V; 0: not stated
	AmplitudeLimit float64 // on |x|, share of full scale, at most 1
	SlewLimit      float64 // on each quadrature, share of full scale per sample; +Inf: none
	Band           float64 // of the samples, either side of the carrier, GHz; +Inf: none
	GuardLead      int     // samples held at zero at the start of the span
	GuardTrail     int     // samples held at zero at its end
	RingOut        RingOut
	Latency        float64     // from trigger to converter output, ns
	Line           filter.Line // from converter to device
	Sections       []string    // the line in words, one sentence each, in the order of the profile
	KnownTo        []KnownTo   // how well the line's parameters are known, where the profile says so
}

// RingOut limits what still arrives after the span: at every instant after it, each quadrature is at most Limit.
// Fast only tells two parts of it apart in messages and readings, the first Fast ns and the rest, and tells
// which poles make up the slow tail.
type RingOut struct {
	Limit float64 // share of full scale, per quadrature; +Inf: none
	Fast  float64 // ns
}

// KnownTo says how well one parameter of a line is known, relative to its value.
type KnownTo struct {
	Parameter string // such as "lowpass[0].corner"
	Share     float64
}

// Start is the instant at which the window of channel c begins at the device: its latency plus the pure delay of its
// line, ns after the trigger. The rest of a line's group delay belongs to the shape that arrives.
func (p *Profile) Start(c int) float64 { return p.Channels[c].Latency + p.Channels[c].Line.Delay }

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
