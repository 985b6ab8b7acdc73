package hardware

import (
	"fmt"
	"math"
	"math/cmplx"

	"holdfast/filter"
	"holdfast/hardware/quantity"
)

// Load reads a hardware profile. Every error is one sentence with the file, the line, the key, what was found and what is
// allowed (quantity.Error), except that of a file that cannot be read.
//
//	format = 1
//	[instrument]   name, sample_rate, resolution, block (1), shortest (one block), longest (65536), align ("delay"; or "none")
//	[[channel]]    name, kind, mixing, carrier, full_scale, full_scale_level, envelope ("disc"; or "box"), amplitude_limit (100 %),
//	               slew_limit, rms_limit, rms_period (the span), band, out_of_band, zero_mean (false),
//	               guard = { lead (0), trail (0) }, ring_out = { limit, fast (8 samples), tail (limit) }, latency (0),
//	               compression = [["0 %", "0 %"], ..., ["100 %", "95 %"]], shift (0)
//	[channel.line] delay (0), delay_known_to,
//	               lowpass = { family, order, corner, known_to } or a list of them; family "single-pole" (without order), "bessel",
//	               "butterworth", "critical", "gaussian"
//	               allpass, allpass_known_to, ac_coupling, ac_coupling_known_to,
//	               resonance = [{ offset, half_width, depth, known_to }], tails = [{ amplitude, time, known_to }]
//
// In brackets what a key means when it is absent. A limit that is absent (slew, rms, band, out-of-band, ring-out) is none; an absent line
// lets everything through. kind is "quadrature" or "baseband"; a baseband channel has neither mixing, carrier, envelope nor resonance.
//
// allpass is the low-frequency delay of (1 - s T/2)/(1 + s T/2), ac_coupling the time constant T of s T/(1 + s T). A resonance is a dip (depth
// positive) or a peak in what the line passes, offset above the carrier in true frequency: behind "I cos - Q sin" the samples
// x_I + i x_Q meet it at +offset, behind "I cos + Q sin" at -offset. It is divided by its gain at the carrier, because full scale and phase
// are what was calibrated there.
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
	p.Align = in.Choice("align", []string{AlignDelay, AlignNone}, AlignDelay)
	if p.Shortest > p.Longest {
		in.Fail("shortest", "found %d samples; allowed: at most the longest waveform, %d", p.Shortest, p.Longest)
	} else if p.Longest/p.Block*p.Block < p.Shortest {
		in.Fail("longest", "found %d to %d samples; allowed: a range that holds a multiple of the block, %d", p.Shortest, p.Longest, p.Block)
	}
	root.Has("channel") // so that it is known to whatever is said about the instrument
	// Ranges of the channels follow from the sample rate: without one they would be blamed, wherever they stand.
	if err := doc.Mistake(); err != nil {
		return nil, err
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
	c := Channel{Name: t.Text("name"), Kind: t.Choice("kind", []string{Quadrature, Baseband})}
	if c.Kind == Quadrature {
		c.Mixing = Mixing(t.Choice("mixing", []string{string(MinusSin), string(PlusSin)}))
		c.Carrier = t.Quantity("carrier", quantity.Frequency, 1e-9, 1e4, 0)
		c.Envelope = t.Choice("envelope", []string{Disc, Box}, Disc)
	} else {
		for _, key := range []string{"mixing", "carrier", "envelope"} {
			if t.Has(key) {
				t.Fail(key, `found beside kind = "baseband"; allowed: no %s there, as it has one converter and no carrier`, key)
			}
		}
	}
	c.FullScale = 2 * math.Pi * t.Quantity("full_scale", quantity.Frequency, 1e-9, 100)
	c.FullScaleLevel = t.Quantity("full_scale_level", quantity.Voltage, 1e-6, 1e3, 0)
	c.AmplitudeLimit = t.Quantity("amplitude_limit", quantity.Ratio, 1e-4, 1, 1)
	c.SlewLimit = t.Quantity("slew_limit", quantity.PerSample, 1e-4, 2, math.Inf(1))
	c.RMSLimit = t.Quantity("rms_limit", quantity.Ratio, 1e-4, 1, 0)
	c.RMSPeriod = t.Quantity("rms_period", quantity.Time, 1e-3, 1e12, 0)
	if t.Has("rms_period") && !t.Has("rms_limit") {
		t.Fail("rms_limit", `found nothing beside rms_period; allowed: a share such as "60 %%", or neither key`)
	}
	c.Band = t.Quantity("band", quantity.Frequency, 1e-6, rate/2, math.Inf(1))
	c.OutOfBand = t.Quantity("out_of_band", quantity.Ratio, 1e-6, 1, 0)
	if t.Has("out_of_band") && !t.Has("band") {
		t.Fail("band", `found nothing beside out_of_band; allowed: a frequency such as "100 MHz", or neither key`)
	}
	c.ZeroMean = t.Bool("zero_mean", false)
	c.Latency = t.Quantity("latency", quantity.Time, 0, 1e6, 0)
	guard := t.Table("guard")
	c.GuardLead = guard.Int("lead", 0, maxSamples, 0)
	c.GuardTrail = guard.Int("trail", 0, maxSamples, 0)
	c.RingOut = RingOut{Limit: math.Inf(1)}
	if t.Has("ring_out") {
		r := t.Table("ring_out")
		c.RingOut.Limit = r.Quantity("limit", quantity.Ratio, 1e-6, 1)
		c.RingOut.Fast = r.Quantity("fast", quantity.Time, 0, 1e9, 8/rate)
		c.RingOut.Tail = r.Quantity("tail", quantity.Ratio, 1e-6, 1, c.RingOut.Limit)
	}
	if t.Has("compression") {
		c.compressionOf(t)
	}
	c.Shift = 2 * math.Pi * t.Quantity("shift", quantity.Frequency, -1, 1, 0)
	c.lineOf(t.Table("line"))
	return c
}

func (c *Channel) compressionOf(t *quantity.Table) {
	pairs := t.Pairs("compression", maxPoints, quantity.Ratio, 0, 1)
	if pairs == nil {
		return
	}
	share := func(v float64) string { return quantity.Format(v, quantity.Ratio) }
	fail := func(format string, args ...any) {
		t.Fail("compression", "found "+format+`; allowed: 2 to %d pairs, from ["0 %%", "0 %%"] to "100 %%" at the converter, both shares rising`, append(args, maxPoints)...)
	}
	last := len(pairs) - 1
	switch {
	case len(pairs) < 2:
		fail("%d pairs", len(pairs))
		return
	case pairs[0] != [2]float64{}:
		fail("%s, %s as the first pair", share(pairs[0][0]), share(pairs[0][1]))
		return
	case pairs[last][0] != 1:
		fail("a last pair at %s", share(pairs[last][0]))
		return
	case c.Envelope == Box:
		t.Fail("compression", `found beside envelope = "box"; allowed: with envelope = "disc" or a baseband channel, as it acts on the length of (I, Q)`)
		return
	}
	list := make(Compression, len(pairs))
	for i, q := range pairs {
		list[i] = Point{Converter: q[0], Reached: q[1]}
		if i == 0 {
			continue
		}
		dx, dy := q[0]-pairs[i-1][0], q[1]-pairs[i-1][1]
		switch {
		case !(dx > 0 && dy > 0):
			fail("%s, %s after %s, %s", share(q[0]), share(q[1]), share(pairs[i-1][0]), share(pairs[i-1][1]))
			return
		case !(dy >= leastSlope*dx && dy <= mostSlope*dx):
			t.Fail("compression", "found a slope of %.4g between %s and %s at the converter; allowed: %g to %g", dy/dx, share(pairs[i-1][0]), share(q[0]), leastSlope, mostSlope)
			return
		}
	}
	c.Compression = list
}

func (c *Channel) lineOf(t *quantity.Table) {
	l := &lineMaker{channel: c, table: t}
	delay, share := t.Quantity("delay", quantity.Time, 0, 1e6, 0), t.Quantity("delay_known_to", quantity.Ratio, 0, 1, notStated)
	if delay > 0 {
		line, err := filter.Delay(delay)
		l.add("delay", line, err)
		l.delayKnownTo = l.known(share)
		l.say("A pure delay of %s", quantity.Format(delay, quantity.Time))
	}
	for i, s := range t.Tables("lowpass", maxLowpass) {
		family := s.Choice("family", []string{"single-pole", "bessel", "butterworth", "critical", "gaussian"})
		order := s.Int("order", 1, 8, 1)
		if family != "single-pole" && !s.Has("order") {
			s.Fail("order", "found nothing; allowed: a whole number, 1 to 8")
		} else if family == "single-pole" && s.Has("order") {
			s.Fail("order", "found in a single-pole section; allowed: no order there")
		}
		corner := s.Quantity("corner", quantity.Frequency, 1e-6, 1e3)
		var line filter.Line
		var err error
		what := ""
		switch family {
		case "single-pole":
			line, err = filter.SinglePole(1 / (2 * math.Pi * corner))
			what = "single-pole low-pass"
		case "bessel":
			line, err = filter.Bessel(order, corner)
			what = fmt.Sprintf("Bessel low-pass of order %d", order)
		case "butterworth":
			line, err = filter.Butterworth(order, corner)
			what = fmt.Sprintf("Butterworth low-pass of order %d", order)
		case "critical":
			line, err = filter.CriticallyDamped(order, corner)
			what = fmt.Sprintf("critically damped low-pass of order %d", order)
		case "gaussian":
			line, err = filter.GaussianLike(order, corner)
			what = fmt.Sprintf("Gaussian-like low-pass of order %d", order)
		}
		at := l.add("lowpass", line, err)
		slope, err := line.CornerSlope()
		l.parameter(fmt.Sprintf("lowpass[%d].corner", i), l.known(s.Quantity("known_to", quantity.Ratio, 0, 1, notStated)), at, slope, err)
		l.say("A %s with its corner at %s", what, quantity.Format(corner, quantity.Frequency))
	}
	if t.Has("allpass") {
		time := t.Quantity("allpass", quantity.Time, 1e-3, 1e3)
		line, err := filter.FractionalDelay(time)
		at := l.add("allpass", line, err)
		slope, err := line.CornerSlope()
		l.parameter("allpass", l.known(t.Quantity("allpass_known_to", quantity.Ratio, 0, 1, notStated)), at, scaled(slope, -1), err)
		l.say("A first-order allpass that delays slow signals by %s", quantity.Format(time, quantity.Time))
	}
	if t.Has("ac_coupling") {
		time := t.Quantity("ac_coupling", quantity.Time, 1, 1e12)
		line, err := filter.ACCoupling(time)
		at := l.add("ac_coupling", line, err)
		slope, err := line.CornerSlope()
		l.parameter("ac_coupling", l.known(t.Quantity("ac_coupling_known_to", quantity.Ratio, 0, 1, notStated)), at, scaled(slope, -1), err)
		l.say("An AC coupling with a time constant of %s", quantity.Format(time, quantity.Time))
	}
	for i, s := range t.Tables("resonance", maxResonances) {
		l.resonance(i, s)
	}
	l.tails(t.Tables("tails", maxTails))
	for _, key := range []string{"delay", "allpass", "ac_coupling"} {
		if t.Has(key+"_known_to") && !t.Has(key) {
			t.Fail(key, "found nothing beside %s_known_to; allowed: a time, or neither key", key)
		}
	}
	l.finish()
}

// resonance adds one resonance, of unit gain at the carrier, seen through the mixer.
func (l *lineMaker) resonance(i int, s *quantity.Table) {
	offset := s.Quantity("offset", quantity.Frequency, -1e3, 1e3)
	width := s.Quantity("half_width", quantity.Frequency, 1e-6, 1e3)
	depth := s.Quantity("depth", quantity.Ratio, -10, 1)
	share := l.known(s.Quantity("known_to", quantity.Ratio, 0, 1, notStated))
	if l.channel.Kind == Baseband {
		s.Fail("", "found a resonance beside kind = \"baseband\"; allowed: resonances of quadrature channels, as their offset counts from the carrier")
		return
	}
	line, err := filter.Resonance(offset, width, complex(depth, 0))
	if err != nil {
		s.Fail("", "%s", clause(err))
		return
	}
	carrier := line.DC() // what the resonance leaves at the carrier
	if cmplx.Abs(carrier) < leastAtCarrier {
		s.Fail("depth", "found a resonance that passes %s at the carrier; allowed: at least %s",
			quantity.Format(cmplx.Abs(carrier), quantity.Ratio), quantity.Format(leastAtCarrier, quantity.Ratio))
		return
	}
	at := l.add("resonance", l.mixed(scaled(line, 1/carrier)), nil)
	// d(G/G(0)) = dG/G(0) - G dG(0)/G(0)^2
	normalised := func(slope filter.Line) (filter.Line, error) {
		sum, err := filter.Sum(scaled(slope, 1/carrier), scaled(line, -slope.DC()/(carrier*carrier)))
		return l.mixed(sum), err
	}
	perOffset, wide, deep, err := filter.ResonanceSlopes(offset, width, complex(depth, 0))
	if err != nil {
		s.Fail("", "%s", clause(err))
		return
	}
	for _, q := range []struct {
		name  string
		slope filter.Line
		moves bool
	}{{"offset", scaled(perOffset, complex(offset, 0)), offset != 0}, {"half_width", wide, true}, {"depth", deep, true}} {
		if q.moves && depth != 0 {
			slope, err := normalised(q.slope)
			l.parameter(fmt.Sprintf("resonance[%d].%s", i, q.name), share, at, slope, err)
		}
	}
	kind := "dip"
	if depth < 0 {
		kind = "peak"
	}
	l.say("A %s of %s, %s above the carrier, with half a width of %s", kind, quantity.Format(math.Abs(depth), quantity.Ratio),
		quantity.Format(offset, quantity.Frequency), quantity.Format(width, quantity.Frequency))
}

// tails adds all settling tails as one section.
func (l *lineMaker) tails(tables []*quantity.Table) {
	var tails []filter.Tail
	var shares []float64
	for _, s := range tables {
		tail := filter.Tail{
			Amplitude: s.Quantity("amplitude", quantity.Ratio, -0.5, 0.5),
			Time:      s.Quantity("time", quantity.Time, 1e-2, 1e9),
		}
		tails = append(tails, tail)
		shares = append(shares, l.known(s.Quantity("known_to", quantity.Ratio, 0, 1, notStated)))
		l.say("A settling tail of %s with a time constant of %s", quantity.Format(tail.Amplitude, quantity.Ratio), quantity.Format(tail.Time, quantity.Time))
	}
	if len(tails) == 0 {
		return
	}
	line, err := filter.Tails(tails)
	at := l.add("tails", line, err)
	for i, share := range shares {
		amplitude, time, err := filter.TailSlopes(tails, i)
		l.parameter(fmt.Sprintf("tails[%d].amplitude", i), share, at, amplitude, err)
		l.parameter(fmt.Sprintf("tails[%d].time", i), share, at, time, err)
	}
}
