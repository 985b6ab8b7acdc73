package hardware

import (
	"fmt"
	"math"

	"holdfast/filter"
	"holdfast/hardware/quantity"
)

// Load reads a hardware profile. Every error is one sentence with the file, the line, the key, what was found and what is
// allowed (quantity.Error), except that of a file that cannot be read.
//
//	format = 1
//	[instrument]   name, sample_rate, resolution, block (1), shortest (one block), longest (65536)
//	[[channel]]    name, kind, mixing, carrier, full_scale, full_scale_level, amplitude_limit (100 %), slew_limit, band,
//	               guard = { lead (0), trail (0) }, ring_out = { limit, fast (8 samples) }, latency (0)
//	[channel.line] delay (0), lowpass = { family, order, corner, known_to } or a list of them, tails = [{ amplitude, time, known_to }]
//
// In brackets what a key means when it is absent. A limit that is absent (slew, band, ring-out) is none; an absent line lets
// everything through.
func Load(path string) (*Profile, error) {
	doc, err := quantity.ReadFile(path)
	if err != nil {
		return nil, err
	}
	return profileOf(doc)
}

// Parse is Load for a profile that is in memory already; file is its name in messages.
func Parse(file string, data []byte) (*Profile, error) {
	doc, err := quantity.ParseDocument(file, data)
	if err != nil {
		return nil, err
	}
	return profileOf(doc)
}

func profileOf(doc *quantity.Document) (*Profile, error) {
	root := doc.Root()
	root.Int("format", 1, 1)
	in := root.Table("instrument")
	p := &Profile{File: doc.File()}
	p.Name = in.Text("name")
	rate := in.Quantity("sample_rate", quantity.SampleRate, 1e-3, 100)
	p.SamplePeriod = 1 / rate
	p.Bits = int(in.Quantity("resolution", quantity.Bits, minBits, maxBits))
	p.Block = in.Int("block", 1, maxBlock, 1)
	p.Shortest = in.Int("shortest", 1, maxSamples, p.Block)
	p.Longest = in.Int("longest", 1, maxSamples, maxSamples)
	if p.Shortest > p.Longest {
		in.Fail("shortest", "found %d samples; allowed: at most the longest waveform, %d", p.Shortest, p.Longest)
	} else if p.Longest/p.Block*p.Block < p.Shortest {
		in.Fail("longest", "found %d to %d samples; allowed: a range that holds a multiple of the block, %d", p.Shortest, p.Longest, p.Block)
	}
	tables := root.Tables("channel", maxChannels)
	if len(tables) == 0 {
		root.Fail("channel", "found no channel; allowed: 1 to %d, each [[channel]]", maxChannels)
	}
	for _, t := range tables {
		c := channelOf(t, rate)
		if _, taken := p.Channel(c.Name); taken {
			t.Fail("name", "found %q a second time; allowed: a name of its own for each channel", c.Name)
		}
		p.Channels = append(p.Channels, c)
	}
	if err := doc.Err(); err != nil {
		return nil, err
	}
	return p, nil
}

func channelOf(t *quantity.Table, rate float64) Channel {
	c := Channel{
		Name:   t.Text("name"),
		Kind:   t.Choice("kind", []string{Quadrature}),
		Mixing: Mixing(t.Choice("mixing", []string{string(MinusSin), string(PlusSin)})),
	}
	c.Carrier = t.Quantity("carrier", quantity.Frequency, 1e-9, 1e4, 0)
	c.FullScale = 2 * math.Pi * t.Quantity("full_scale", quantity.Frequency, 1e-9, 100)
	c.FullScaleLevel = t.Quantity("full_scale_level", quantity.Voltage, 1e-6, 1e3, 0)
	c.AmplitudeLimit = t.Quantity("amplitude_limit", quantity.Ratio, 1e-4, 1, 1)
	c.SlewLimit = t.Quantity("slew_limit", quantity.PerSample, 1e-4, 2, math.Inf(1))
	c.Band = t.Quantity("band", quantity.Frequency, 1e-6, rate/2, math.Inf(1))
	c.Latency = t.Quantity("latency", quantity.Time, 0, 1e6, 0)
	guard := t.Table("guard")
	c.GuardLead = guard.Int("lead", 0, maxSamples, 0)
	c.GuardTrail = guard.Int("trail", 0, maxSamples, 0)
	c.RingOut = RingOut{Limit: math.Inf(1)}
	if t.Has("ring_out") {
		r := t.Table("ring_out")
		c.RingOut.Limit = r.Quantity("limit", quantity.Ratio, 1e-6, 1)
		c.RingOut.Fast = r.Quantity("fast", quantity.Time, 0, 1e9, 8/rate)
	}
	c.lineOf(t.Table("line"))
	return c
}

func (c *Channel) lineOf(t *quantity.Table) {
	var sections []filter.Line
	// add keeps a section whose parameters are in range; a section that filter refuses all the same is a complaint at key.
	add := func(key string, l filter.Line, err error) {
		if err != nil {
			t.Fail(key, "%v", err)
			return
		}
		sections = append(sections, l)
	}
	known := func(section *quantity.Table, parameter string) (words string) {
		share := section.Quantity("known_to", quantity.Ratio, 0, 1, 0)
		if !section.Has("known_to") {
			return ""
		}
		c.KnownTo = append(c.KnownTo, KnownTo{parameter, share})
		return ", known to " + quantity.Format(share, quantity.Ratio)
	}
	if delay := t.Quantity("delay", quantity.Time, 0, 1e6, 0); delay > 0 {
		l, err := filter.Delay(delay)
		add("delay", l, err)
		c.Sections = append(c.Sections, fmt.Sprintf("A pure delay of %s.", quantity.Format(delay, quantity.Time)))
	}
	for i, s := range t.Tables("lowpass", maxLowpass) {
		family := s.Choice("family", []string{"bessel", "single-pole"})
		order := s.Int("order", 1, 8, 0)
		if family == "bessel" && !s.Has("order") {
			s.Fail("order", "found nothing; allowed: a whole number, 1 to 8")
		} else if family != "bessel" && s.Has("order") {
			s.Fail("order", "found in a single-pole section; allowed: no order there")
		}
		corner := s.Quantity("corner", quantity.Frequency, 1e-6, 1e3)
		words := known(s, fmt.Sprintf("lowpass[%d].corner", i))
		if family == "bessel" {
			l, err := filter.Bessel(max(1, order), corner)
			add("lowpass", l, err)
			c.Sections = append(c.Sections, fmt.Sprintf("A Bessel low-pass of order %d with its corner at %s%s.",
				order, quantity.Format(corner, quantity.Frequency), words))
		} else {
			l, err := filter.SinglePole(1 / (2 * math.Pi * corner))
			add("lowpass", l, err)
			c.Sections = append(c.Sections, fmt.Sprintf("A single-pole low-pass with its corner at %s%s.",
				quantity.Format(corner, quantity.Frequency), words))
		}
	}
	var tails []filter.Tail
	for i, s := range t.Tables("tails", maxTails) {
		tail := filter.Tail{
			Amplitude: s.Quantity("amplitude", quantity.Ratio, -0.5, 0.5),
			Time:      s.Quantity("time", quantity.Time, 1e-2, 1e9),
		}
		words := known(s, fmt.Sprintf("tails[%d]", i))
		tails = append(tails, tail)
		c.Sections = append(c.Sections, fmt.Sprintf("A settling tail of %s with a time constant of %s%s.",
			quantity.Format(tail.Amplitude, quantity.Ratio), quantity.Format(tail.Time, quantity.Time), words))
	}
	if len(tails) > 0 {
		l, err := filter.Tails(tails)
		add("tails", l, err)
	}
	line, err := filter.Cascade(sections...)
	if err != nil {
		t.Fail("", "these sections cannot be joined: %v", err)
		line = filter.Through()
	}
	c.Line = line
	if len(c.Sections) == 0 {
		c.Sections = []string{"Straight through: the device sees the held samples."}
	}
}
