package main

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/cmplx"
	"slices"
	"strings"

	"holdfast/design/device"
	"holdfast/design/replay"
	"holdfast/hardware"
	"holdfast/shape"
)

// Which signs a bench can see.
//
// With u = u_I + i u_Q what arrives and d the transition's distance from the carrier, H = (Re u X + s Im u Y + z d Z)/2, where
// s and z are signs. Two changes of H never change a population that is measured after |0> was prepared:
//
//	u -> e^(i phi) u                a turn about Z, which prepares and reads the same
//	(s, z) -> (-s, -z)              a half turn about X, which exchanges |0> and |1>; for two levels P(0->1) = P(1->0)
//
// Exchanging the cables is u -> i u*, so that it turns s and, unseen, the frame by 90 degrees. Which energy |0> has turns s and
// z at once, for its H0 is +w Z/2 or -w Z/2, and is not seen at all. What is seen is the product
//
//	(mixing) x (cables) x (side of the carrier)
//
// and, with the Q input of the mixer terminated, the cables alone: then nothing but I can arrive, and through exchanged
// cables that is the other converter. So the 16 combinations are four groups of four.

// signs are one combination of what may be wired or told the wrong way.
type signs struct {
	mixing  hardware.Mixing
	swapped bool   // I and Q exchanged between converter and mixer
	zero    string // device.Upper or device.Lower: which energy |0> has
	above   bool   // the carrier lies above the transition instead of below
}

// allSigns lists the 16 combinations; the first is what the files say and the card asks for.
func allSigns(stated signs) []signs {
	var list []signs
	for n := range 16 {
		s := stated
		if n&8 != 0 {
			s.mixing = otherMixing(s.mixing)
		}
		if n&4 != 0 {
			s.swapped = true
		}
		if n&2 != 0 {
			s.above = true
		}
		if n&1 != 0 {
			if s.zero = device.Upper; stated.zero == device.Upper {
				s.zero = device.Lower
			}
		}
		list = append(list, s)
	}
	return list
}

func otherMixing(m hardware.Mixing) hardware.Mixing {
	if m == hardware.MinusSin {
		return hardware.PlusSin
	}
	return hardware.MinusSin
}

// A bench is one drive of a device with everything but its signs.
type bench struct {
	profile  *hardware.Profile
	channel  int
	device   *device.Device
	drive    int
	detuning float64 // between carrier and transition, GHz, cyclic, positive
}

// newBench finds the drive of the named channel, or without a name that of a mixer: the first of one site, the only one of several.
func newBench(p *hardware.Profile, d *device.Device, name string) (*bench, error) {
	var mixers []*bench
	var names []string
	for i, drive := range d.Drives {
		c, ok := p.Channel(drive.Channel)
		if !ok {
			return nil, fmt.Errorf("%s:%d: drive[%d].channel: found %q; allowed: a channel of %s", d.File, drive.Line, i, drive.Channel, p.File)
		}
		if p.Channels[c].Kind != hardware.Quadrature {
			continue
		}
		b := &bench{profile: p, channel: c, device: d, drive: i}
		if drive.Channel == name || name == "" && len(d.Sites) == 1 {
			return b, b.isSpin()
		}
		mixers, names = append(mixers, b), append(names, fmt.Sprintf("%q", drive.Channel))
	}
	switch {
	case len(mixers) == 0:
		return nil, fmt.Errorf("%s: found no drive through a channel of kind %q; allowed: one, for only a mixer has signs to tell", d.File, hardware.Quadrature)
	case name != "":
		return nil, fmt.Errorf("-channel: found %q; allowed: a drive of %s through a mixer, %s", name, d.File, strings.Join(names, ", "))
	case len(mixers) > 1:
		return nil, fmt.Errorf("%s: found %d drives, %s; allowed: a card for one of them, as in -channel %s", d.File, len(mixers), strings.Join(names, ", "), names[0])
	}
	return mixers[0], mixers[0].isSpin()
}

// isSpin complains of a driven site that the card's plain pulses would lead out of two levels.
func (b *bench) isSpin() error {
	if s := b.site(); s.Levels != 2 {
		return fmt.Errorf("%s: channel %q: found a site of %d levels, %q; allowed: a card for a site of two, as plain pulses lead out of them", b.device.File, b.profile.Channels[b.channel].Name, s.Levels, s.Name)
	}
	return nil
}

// site is the one that is driven.
func (b *bench) site() *device.Site {
	for i := range b.device.Sites {
		if b.device.Sites[i].Name == b.device.Drives[b.drive].Site {
			return &b.device.Sites[i]
		}
	}
	return &b.device.Sites[0] // device.Load has seen to it that the site exists
}

// stated are the signs of the files, with the cables in order and the carrier below.
func (b *bench) stated() signs {
	return signs{mixing: b.profile.Channels[b.channel].Mixing, zero: b.site().Zero}
}

// model is the bench with signs s and a distance f between carrier and transition, GHz, while codes play. With terminated, the Q
// input of the mixer is.
func (b *bench) model(s signs, f float64, codes []int16, terminated bool) (*replay.Model, error) {
	x, err := hardware.SamplesOf(codes, b.profile.Bits)
	if err != nil {
		return nil, err
	}
	for k, v := range x {
		if s.swapped {
			v = complex(imag(v), real(v))
		}
		if terminated {
			v = complex(real(v), 0)
		}
		x[k] = v
	}
	ch := &b.profile.Channels[b.channel]
	turned := *b.device
	turned.Sites = append([]device.Site(nil), b.device.Sites...)
	for i := range turned.Sites {
		turned.Sites[i].Zero = s.zero
	}
	// |0> is the +1 state of Z: the upper energy makes H0 = +w Z/2. Below the transition the carrier leaves +f of w.
	z := 2 * math.Pi * f
	if (s.zero == device.Lower) != s.above {
		z = -z
	}
	c := replay.Channel{
		Name: ch.Name, Kind: "quadrature", FullScale: ch.FullScale, Delay: b.profile.Start(b.channel), Direct: ch.Line.Direct,
		MaxShare: math.Inf(1), MaxSlew: math.Inf(1), RingOut: math.Inf(1), Samples: x,
	}
	for _, t := range ch.Line.Terms {
		c.Poles, c.Powers, c.Residues = append(c.Poles, t.Pole), append(c.Powers, t.Power), append(c.Residues, t.Residue)
	}
	if s.mixing != ch.Mixing {
		// The line itself stays what it is; to I + iQ of the other mixer it is the mirror image. Real lines are their own.
		c.Direct = cmplx.Conj(c.Direct)
		for i := range c.Poles {
			c.Poles[i], c.Residues[i] = cmplx.Conj(c.Poles[i]), cmplx.Conj(c.Residues[i])
		}
	}
	for _, pt := range ch.Compression {
		c.Compression = append(c.Compression, replay.Knee{Share: pt.Converter, Reached: pt.Reached})
	}
	if ch.Shift != 0 {
		// The profile tells the shift along Z for the energy that the device states.
		c.Shift, c.ShiftOperator = ch.Shift, []complex128{0.5, 0, 0, -0.5}
		if s.zero != b.site().Zero {
			c.Shift = -c.Shift
		}
	}
	for _, op := range turned.Operators(b.drive, string(s.mixing)) {
		c.Operators = append(c.Operators, op.Data)
	}
	m := &replay.Model{
		SamplePeriod: b.profile.SamplePeriod, Samples: len(x), Bits: b.profile.Bits, Ends: "settled", WindowStart: c.Delay,
		Dim: 2, CodeSpace: []int{0, 1}, Static: []complex128{complex(z/2, 0), 0, 0, complex(-z/2, 0)},
		Target: []complex128{0, 1, 1, 0}, Channels: []replay.Channel{c},
	}
	return m, m.Validate()
}

// population gives that of |1> after |0> by replay's integrator. With U = q0 - i(q1 X + q2 Y + q3 Z) it is q1^2 + q2^2, and the
// square of one component is the process fidelity with that Pauli operator, 1 - 3/2 of the average infidelity for two levels.
func population(ctx context.Context, m *replay.Model) (float64, error) {
	sum := 0.0
	for _, pauli := range [][]complex128{{0, 1, 1, 0}, {0, -1i, 1i, 0}} {
		other := *m
		other.Target = pauli
		f, _, _, err := other.Figures(ctx)
		if err != nil {
			return 0, err
		}
		sum += 1 - 1.5*f.Infidelity
	}
	return math.Min(1, math.Max(0, sum)), nil // rounding
}

// A sequence is a waveform of the card.
type sequence struct {
	name  string // its files begin with it
	says  string
	codes []int16
}

// How much of the limits a card's pulses take, and how far its detuning stays below full scale: with 1/16 of it a half turn still
// turns well, and a quarter period lasts several pulses.
const (
	cardShare    = 0.9
	cardDetuning = 1.0 / 16
)

// pulse gives the samples of a raised cosine that turns by angle.
func (b *bench) pulse(angle float64) ([]float64, error) {
	ch := &b.profile.Channels[b.channel]
	gain := steady(ch)
	if !(gain > 1e-6) {
		return nil, fmt.Errorf("%s: channel %q: a steady drive does not reach the device, and a plain pulse cannot turn it", b.profile.File, ch.Name)
	}
	lsb := hardware.LeastStep(b.profile.Bits)
	area := angle / (ch.FullScale * b.profile.SamplePeriod * gain)
	// A drive that compresses reaches less, and the converter then steps more than what is reached; its least slope is that of the table.
	amplitude, slope := cardShare*ch.AmplitudeLimit, 1.0
	for i := 1; i < len(ch.Compression); i++ {
		a, b := ch.Compression[i-1], ch.Compression[i]
		slope = math.Min(slope, (b.Reached-a.Reached)/(b.Converter-a.Converter))
	}
	amplitude = real(ch.Compression.Reached(complex(amplitude, 0)))
	x := shape.RaisedCosine(area, amplitude, slope*(cardShare*ch.SlewLimit-lsb))
	if x == nil || len(x) > b.profile.Longest {
		return nil, fmt.Errorf("%s: channel %q: no raised cosine within amplitude and slew turns by %.0f degrees", b.profile.File, ch.Name, angle*180/math.Pi)
	}
	return x, nil
}

// usual gives the detuning that the card asks for by itself, GHz: 1, 2 or 5 times a power of ten.
func (b *bench) usual() (float64, error) {
	quarter, err := b.pulse(math.Pi / 2)
	if err != nil {
		return 0, err
	}
	most := math.Min(cardDetuning*b.profile.Channels[b.channel].FullScale/(2*math.Pi), b.widest(quarter)/2)
	power := math.Pow(10, math.Floor(math.Log10(most)))
	for _, digit := range []float64{5, 2} {
		if digit*power <= most {
			return digit * power, nil
		}
	}
	return power, nil
}

// widest is the largest detuning of which a quarter period still holds a pulse, GHz.
func (b *bench) widest(quarter []float64) float64 {
	return 1 / (4 * float64(len(quarter)) * b.profile.SamplePeriod)
}

// sequences makes the three.
func (b *bench) sequences() ([]sequence, error) {
	half, err := b.pulse(math.Pi)
	if err != nil {
		return nil, err
	}
	quarter, err := b.pulse(math.Pi / 2)
	if err != nil {
		return nil, err
	}
	if most := b.widest(quarter); b.detuning > most {
		return nil, fmt.Errorf("-detuning: found %.6g MHz; allowed: up to %.6g MHz, of which a quarter period still holds a pulse", b.detuning*1e3, most*1e3)
	}
	// From the middle of one pulse to that of the next the spin turns by a quarter about Z, which makes the second pulse
	// bring it up or down.
	gap := math.Round(1 / (4 * b.detuning * b.profile.SamplePeriod))
	if !(gap+float64(len(quarter)) <= float64(b.profile.Longest)) {
		return nil, fmt.Errorf("-detuning: found %.6g MHz; allowed: more, for a quarter period of it is longer than the longest waveform", b.detuning*1e3)
	}
	place := func(x []complex128, at int, pulse []float64, phase complex128) []complex128 {
		for len(x) < at+len(pulse) {
			x = append(x, 0)
		}
		for k, v := range pulse {
			x[at+k] += complex(v, 0) * phase
		}
		return x
	}
	list := []sequence{
		{name: "1-turn", says: "a half turn on I alone"},
		{name: "2-plus", says: "a quarter turn on I, a wait, a quarter turn on +Q"},
		{name: "3-minus", says: "a quarter turn on I, a wait, a quarter turn on -Q"},
	}
	for i, x := range [][]complex128{
		place(nil, 0, half, 1),
		place(place(nil, 0, quarter, 1), int(gap), quarter, 1i),
		place(place(nil, 0, quarter, 1), int(gap), quarter, -1i),
	} {
		if list[i].codes, err = b.playable(x); err != nil {
			return nil, fmt.Errorf("%s: sequence %s: %w", b.profile.File, list[i].name, err)
		}
	}
	return list, nil
}

// playable surrounds x by silence until every limit is kept, ring-out last, and rounds it.
func (b *bench) playable(x []complex128) ([]int16, error) {
	p := b.profile
	ch := &p.Channels[b.channel]
	x = append(make([]complex128, ch.GuardLead), x...)
	blocks := func(n int) int { return (n + p.Block - 1) / p.Block * p.Block }
	var last error
	for n := blocks(max(p.Shortest, len(x)+ch.GuardTrail)); n <= p.Longest; n = blocks(n + max(1, n/8)) {
		codes, err := p.Codes(b.channel, append(x[:len(x):len(x)], make([]complex128, n-len(x))...))
		if err != nil {
			return nil, err
		}
		readings, err := p.CheckCodes(b.channel, codes)
		if err != nil {
			return nil, err
		}
		last = nil
		for _, r := range readings {
			if !r.OK {
				last = fmt.Errorf("channel %q: %s stays at %.3g %s; allowed: %.3g, even in %d samples", ch.Name, r.Limit, r.Found, r.Unit, r.Allowed, n)
			}
		}
		if last == nil {
			return codes, nil
		}
	}
	if last == nil {
		last = errors.New("it is longer than the longest waveform")
	}
	return nil, last
}

// A prediction is what a bench with some signs reads.
type prediction struct {
	signs
	group       string
	populations [4]float64 // of |1>: the three sequences, and the first with the mixer's Q input terminated
}

// alike is how far apart, in every population, two combinations may be that a bench cannot tell apart. Without a
// drive-induced shift and on a line that treats both sides of the carrier alike, those of a group are equal but for the integrator's error,
// 1e-12; a shift keeps its sign when all others turn, and such a line its sides.
const alike = 0.05

// predict computes the 16 combinations and puts those that read alike into one group. distance is the smallest one between
// two groups: over pairs of their rows, the largest difference in any column. within is the largest in one group. unmoved is
// what the files' signs read when the carrier is on the transition.
func (b *bench) predict(ctx context.Context, list []sequence) (k *predictions, err error) {
	read := func(s signs, f float64) (p [4]float64, err error) {
		for i := range p {
			q := list[i%3]
			m, err := b.model(s, f, q.codes, i == 3)
			if err != nil {
				return p, err
			}
			if p[i], err = population(ctx, m); err != nil {
				return p, err
			}
		}
		return p, nil
	}
	k = &predictions{distance: math.Inf(1)}
	var first [][4]float64 // row of each group
	for _, s := range allSigns(b.stated()) {
		r := prediction{signs: s}
		if r.populations, err = read(s, b.detuning); err != nil {
			return nil, err
		}
		at := slices.IndexFunc(first, func(p [4]float64) bool { return apart(r.populations, p) <= alike })
		if at < 0 {
			at = len(first)
			first = append(first, r.populations)
		}
		r.group = string(rune('A' + at))
		for _, other := range k.table {
			if d := apart(r.populations, other.populations); r.group == other.group {
				k.within = math.Max(k.within, d)
			} else {
				k.distance = math.Min(k.distance, d)
			}
		}
		k.table = append(k.table, r)
	}
	k.unmoved, err = read(b.stated(), 0)
	return k, err
}

// predictions are what the card's table says.
type predictions struct {
	table            []prediction
	unmoved          [4]float64
	distance, within float64
}

// apart is the largest difference in any column.
func apart(a, b [4]float64) float64 {
	most := 0.0
	for i := range a {
		most = math.Max(most, math.Abs(a[i]-b[i]))
	}
	return most
}
