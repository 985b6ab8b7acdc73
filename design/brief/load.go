package brief

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"holdfast/design/device"
	"holdfast/hardware"
	"holdfast/hardware/quantity"
)

// wholeSamples is how far a span as written may be from a whole number of samples, in samples: multiples of a period such as 1/2.4 ns
// have no exact decimals. LoadAll removes what is left.
const wholeSamples = 0.01

// LoadAll reads a brief with the hardware profile and the device that it names, and checks the three against each other: the
// span is one that the instrument plays, to the last digit a multiple of its sample period, and the sites and channels that are
// named exist. Errors are an *quantity.Error or what hardware.Load
// gives: one sentence with the file, line and key that is at fault. A file that is not there, or is of another kind, is a fault of the brief's key.
func LoadAll(path string) (*Brief, *hardware.Profile, *device.Device, error) {
	b, err := Load(path)
	if err != nil {
		return nil, nil, nil, err
	}
	p, err := hardware.Load(b.ProfilePath)
	if err != nil {
		return nil, nil, nil, b.named("profile", b.Profile, b.ProfilePath, b.lines.profile, ProfileFile, err)
	}
	d, err := device.Load(b.DevicePath)
	if err != nil {
		return nil, nil, nil, b.named("device", b.Device, b.DevicePath, b.lines.device, DeviceFile, err)
	}
	if err := b.Complete(p, d); err != nil {
		return nil, nil, nil, err
	}
	return b, p, d, nil
}

// Complete checks the brief and the device against what they refer to, as LoadAll does, and fills in what only the profile knows: the
// channels of a defaulted amplitude error, the size of an error of a line's parameter, the errors of hold = "profile",
// and that a baseband channel has an offset of one kind only. A static error for which the brief gives no size is no larger than 7.5 % of the full scale of
// the fastest drive (any static error: 2.5 %), so that slow drives are not held against errors faster than they are. Errors are
// an *quantity.Error. A second call changes nothing.
func (b *Brief) Complete(p *hardware.Profile, d *device.Device) error {
	if fault := b.against(p, d); fault != nil {
		return fault
	}
	return nil
}

func (b *Brief) against(p *hardware.Profile, d *device.Device) *quantity.Error {
	var channels, sites, driven []string
	for _, c := range p.Channels {
		channels = append(channels, c.Name)
	}
	for _, s := range d.Sites {
		sites = append(sites, s.Name)
	}
	uses := func(key, channel string, line int, kind string) *quantity.Error {
		e := known(channel, channels, "a channel of "+p.File)
		if i, _ := p.Channel(channel); e == nil && (p.Channels[i].Kind == hardware.Baseband) != (kind == hardware.Baseband) {
			e = &quantity.Error{Found: fmt.Sprintf("%q, a %s channel", channel, p.Channels[i].Kind),
				Allowed: "a " + kind + " channel (a [[drive]] takes a quadrature channel, a [[bias]] a baseband one)"}
		}
		if e != nil {
			e.File, e.Line, e.Key = d.File, line, key
		}
		driven = append(driven, channel)
		return e
	}
	for i, drive := range d.Drives {
		if e := uses(fmt.Sprintf("drive[%d].channel", i), drive.Channel, drive.Line, hardware.Quadrature); e != nil {
			return e
		}
	}
	for i, bias := range d.Biases {
		if e := uses(fmt.Sprintf("bias[%d].channel", i), bias.Channel, bias.Line, hardware.Baseband); e != nil {
			return e
		}
	}
	if e := known(b.Target.Site, sites, "a site of "+d.File); e != nil {
		e.File, e.Line, e.Key = b.File, b.lines.site, "target.site"
		return e
	}
	b.scaleDefaults(p, d)
	for i := range b.Errors {
		e := &b.Errors[i]
		if fault := b.errorOn(e, p, d, sites, driven); fault != nil {
			fault.File = b.File
			if fault.Key == "" {
				fault.Line, fault.Key = e.line, e.key
			}
			fault.Key = fmt.Sprintf("error[%d].%s", e.index, fault.Key)
			return fault
		}
	}
	// Of an offset of both quadratures a baseband channel has one.
	b.Errors = slices.DeleteFunc(b.Errors, func(e Error) bool {
		i, ok := p.Channel(e.on)
		return e.expanded && e.Quadrature == "Q" && ok && p.Channels[i].Kind == hardware.Baseband
	})
	if fault := b.holdProfile(p, driven); fault != nil {
		return fault
	}
	return b.spanOn(p, driven)
}

// scaleDefaults lowers the default sizes of static errors where the drives are slow; where there are only biases, where they are.
func (b *Brief) scaleDefaults(p *hardware.Profile, d *device.Device) {
	fastest := 0.0 // rad/ns
	for _, drive := range d.Drives {
		if i, ok := p.Channel(drive.Channel); ok {
			fastest = math.Max(fastest, p.Channels[i].FullScale)
		}
	}
	if len(d.Drives) == 0 {
		for _, bias := range d.Biases {
			if i, ok := p.Channel(bias.Channel); ok {
				fastest = math.Max(fastest, p.Channels[i].FullScale)
			}
		}
	}
	for i := range b.Errors {
		e := &b.Errors[i]
		most := 0.0
		switch e.Kind {
		case Static:
			most = staticShare * fastest
		case Any:
			most = anyShare * fastest
		}
		if !e.unsized || most == 0 {
			continue
		}
		e.unsized = false
		if most < e.Size*(1-1e-12) { // a full scale of 40 MHz gives the defaults to the last bit
			e.Size = most
		}
	}
}

// errorOn checks one error against profile and device, and completes it. A complaint without a key is about the key that made the error.
func (b *Brief) errorOn(e *Error, p *hardware.Profile, d *device.Device, sites, driven []string) *quantity.Error {
	switch {
	case e.key == "detuning":
		return known(e.on, sites, "a site of "+d.File)
	case e.Kind == Amplitude && e.key == "": // the default: whatever drives the device
		e.Channels = driven
		return nil
	case len(e.Channels) == 0 || e.key == "":
		return nil
	}
	if fault := known(e.on, driven, "a channel that drives a site of "+d.File); fault != nil {
		return fault
	}
	i, _ := p.Channel(e.on)
	c := &p.Channels[i]
	if c.Kind == hardware.Baseband {
		if e.Kind == Skew {
			return &quantity.Error{Found: fmt.Sprintf("%q, a baseband channel", e.on), Allowed: "a quadrature channel"}
		}
		if e.Quadrature != "" && !e.expanded {
			return &quantity.Error{Line: e.lineQuadrature, Key: "quadrature", Found: fmt.Sprintf("%q of %q, a baseband channel", e.Quadrature, e.on),
				Allowed: "no quadrature there, as it has one converter"}
		}
	}
	switch e.Kind {
	case Offset:
		if c.Line.DC() == 0 {
			return &quantity.Error{Found: fmt.Sprintf("%q, of which the line passes nothing steady", e.on), Allowed: "a channel whose line passes an offset"}
		}
	case Line:
		q, ok := c.Parameter(e.Parameter)
		if !ok {
			names := make([]string, len(c.Parameters))
			for i, q := range c.Parameters {
				names[i] = q.Name
			}
			fault := known(e.Parameter, names, fmt.Sprintf("a parameter of the line of %q", e.on))
			if len(names) == 0 {
				fault.Allowed = fmt.Sprintf("none, as the line of %q has no parameter", e.on)
			}
			fault.Line, fault.Key = e.lineParameter, "parameter"
			return fault
		}
		if q.Refused != "" {
			return &quantity.Error{Line: e.lineParameter, Key: "parameter", Found: fmt.Sprintf("%q of %q, to which nothing can be held: %s", q.Name, e.on, q.Refused),
				Allowed: "a parameter on which what arrives depends smoothly"}
		}
		if e.unsized && q.KnownTo > 0 {
			e.Size = q.KnownTo
		}
		e.unsized = false
	}
	return nil
}

// holdProfile adds an error for each parameter of the driving lines that is known to a share, unless the brief has one of its own.
func (b *Brief) holdProfile(p *hardware.Profile, driven []string) *quantity.Error {
	if !b.HoldProfile {
		return nil
	}
	fail := func(format string, args ...any) *quantity.Error {
		return &quantity.Error{File: b.File, Line: b.lines.hold, Key: "hold", Found: `"profile", and ` + fmt.Sprintf(format, args...),
			Allowed: `"nothing", or "profile" with a known_to in the [channel.line] of a channel that drives the device`}
	}
	found := false
	for _, name := range driven {
		i, _ := p.Channel(name)
		for _, q := range p.Channels[i].Parameters {
			if !(q.KnownTo > 0) {
				continue
			}
			found = true
			if slices.ContainsFunc(b.Errors, func(e Error) bool { return e.Kind == Line && e.Channels[0] == name && e.Parameter == q.Name }) {
				continue
			}
			if q.Refused != "" {
				return fail("nothing can be held to %q of %q: %s", q.Name, name, q.Refused)
			}
			e := Error{Name: lineName(name, q.Name), Kind: Line, Channels: []string{name}, Parameter: q.Name, Size: q.KnownTo, Weight: 1, on: name, index: -1}
			if slices.ContainsFunc(b.Errors, func(other Error) bool { return other.Name == e.Name }) {
				return fail("%q already is the name of another error", e.Name)
			}
			b.Errors = append(b.Errors, e)
		}
	}
	if !found {
		return fail("no parameter of these lines is said to be known to any share")
	}
	return nil
}

// known says that a name is not in the list, or nothing.
func known(name string, list []string, what string) *quantity.Error {
	quoted := make([]string, len(list))
	for i, s := range list {
		if s == name {
			return nil
		}
		quoted[i] = fmt.Sprintf("%q", s)
	}
	return &quantity.Error{Found: fmt.Sprintf("%q", name), Allowed: what + ", " + strings.Join(quoted, ", ")}
}

// spanOn checks the span, and the number of coefficients that it has to carry.
func (b *Brief) spanOn(p *hardware.Profile, driven []string) *quantity.Error {
	e := &quantity.Error{File: b.File, Line: b.lines.span, Key: "span"}
	// The whole blocks that the instrument plays, first and last, in samples.
	first := (p.Shortest + p.Block - 1) / p.Block * p.Block
	last := p.Longest / p.Block * p.Block
	exact := b.Span / p.SamplePeriod
	n := math.Round(exact)
	time := func(samples int) string { return fmt.Sprintf("%.9g ns", float64(samples)*p.SamplePeriod) }
	e.Allowed = fmt.Sprintf("%s to %s in steps of %s, the block of %d samples", time(first), time(last), time(p.Block), p.Block)
	switch {
	case n < float64(first) || n > float64(last):
		e.Found = quantity.Format(b.Span, quantity.Time)
		nearest := first
		if n > float64(last) {
			nearest = last
		}
		e.Hint = "nearest: " + time(nearest)
		return e
	case math.Abs(exact-n) > wholeSamples, int(n)%p.Block != 0:
		e.Found = fmt.Sprintf("%s, which is %.6g samples", quantity.Format(b.Span, quantity.Time), exact)
		below := int(math.Floor(exact/float64(p.Block))) * p.Block
		if below < first {
			e.Hint = "nearest: " + time(first)
		} else if below+p.Block > last {
			e.Hint = "nearest: " + time(last)
		} else {
			e.Hint = fmt.Sprintf("nearest: %s and %s", time(below), time(below+p.Block))
		}
		return e
	}
	b.Span = n * p.SamplePeriod
	for _, name := range driven {
		i, _ := p.Channel(name)
		free := int(n) - p.Channels[i].GuardLead - p.Channels[i].GuardTrail
		if p.Channels[i].ZeroMean {
			free--
		}
		if b.Basis.Coefficients > max(free, 0) {
			return &quantity.Error{File: b.File, Line: b.lines.coefficients, Key: "basis.coefficients", Found: fmt.Sprint(b.Basis.Coefficients),
				Allowed: fmt.Sprintf("at most %d, the samples of %q in this span that are free", max(free, 0), name)}
		}
	}
	return nil
}
