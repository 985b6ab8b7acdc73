package brief

import (
	"fmt"
	"math"
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
// gives: one sentence with the file, line and key that is at fault.
func LoadAll(path string) (*Brief, *hardware.Profile, *device.Device, error) {
	b, err := Load(path)
	if err != nil {
		return nil, nil, nil, err
	}
	p, err := hardware.Load(b.ProfilePath)
	if err != nil {
		return nil, nil, nil, err
	}
	d, err := device.Load(b.DevicePath)
	if err != nil {
		return nil, nil, nil, err
	}
	if fault := b.against(p, d); fault != nil {
		return nil, nil, nil, fault
	}
	return b, p, d, nil
}

// against checks the brief and the device against what they refer to, and fills in the channels of a defaulted amplitude error.
func (b *Brief) against(p *hardware.Profile, d *device.Device) *quantity.Error {
	var channels, sites, driven []string
	for _, c := range p.Channels {
		channels = append(channels, c.Name)
	}
	for _, s := range d.Sites {
		sites = append(sites, s.Name)
	}
	for i, drive := range d.Drives {
		if e := known(drive.Channel, channels, "a channel of "+p.File); e != nil {
			e.File, e.Line, e.Key = d.File, drive.Line, fmt.Sprintf("drive[%d].channel", i)
			return e
		}
		driven = append(driven, drive.Channel)
	}
	if e := known(b.Target.Site, sites, "a site of "+d.File); e != nil {
		e.File, e.Line, e.Key = b.File, b.lines.site, "target.site"
		return e
	}
	for i := range b.Errors {
		e := &b.Errors[i]
		var fault *quantity.Error
		switch {
		case e.key == "detuning":
			fault = known(e.on, sites, "a site of "+d.File)
		case e.key == "amplitude":
			fault = known(e.on, driven, "a channel that drives a site of "+d.File)
		case e.Kind == Amplitude: // the default: whatever drives the device
			e.Channels = driven
		}
		if fault != nil {
			fault.File, fault.Line, fault.Key = b.File, e.line, fmt.Sprintf("error[%d].%s", e.index, e.key)
			return fault
		}
	}
	return b.spanOn(p, driven)
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
		if b.Basis.Coefficients > max(free, 0) {
			return &quantity.Error{File: b.File, Line: b.lines.coefficients, Key: "basis.coefficients", Found: fmt.Sprint(b.Basis.Coefficients),
				Allowed: fmt.Sprintf("at most %d, the samples of %q in this span that are not guards", max(free, 0), name)}
		}
	}
	return nil
}
