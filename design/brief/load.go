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

// Complete checks the brief and the device against what they refer to, as LoadAll does, and fills in what only the two others know: the target on
// the whole of the device, the members of static errors, with learned rates read from their file, the channels of a defaulted amplitude error, the size of an error of a
// line's parameter, the errors of hold = "profile", and that a baseband channel has an offset of one kind only. The errors of a brief that names none
// become amplitude and any one-body error where there are several sites. A static error for which the brief gives no size is no larger than 7.5 % of the full scale of
// the fastest drive (any static error: 2.5 %), so that slow drives are not held against errors faster than they are. Errors are
// an *quantity.Error. A second call changes nothing.
func (b *Brief) Complete(p *hardware.Profile, d *device.Device) error {
	if fault := b.against(p, d); fault != nil {
		return fault
	}
	return nil
}

func (b *Brief) against(p *hardware.Profile, d *device.Device) *quantity.Error {
	var channels, driven []string
	for _, c := range p.Channels {
		channels = append(channels, c.Name)
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
	if e := b.completeTarget(d); e != nil {
		return e
	}
	if len(d.Sites) > 1 {
		b.defaultSeveral()
	}
	b.scaleDefaults(p, d)
	if len(straight(driven, d)) == 0 {
		b.Errors = slices.DeleteFunc(b.Errors, func(e Error) bool { return e.Kind == Amplitude && e.key == "" })
	}
	for i := range b.Errors {
		e := &b.Errors[i]
		if fault := b.errorOn(e, p, d, driven); fault != nil {
			if fault.File != "" { // of another file that the error names
				return fault
			}
			fault.File = b.File
			if fault.Key == "" {
				fault.Line, fault.Key = e.line, e.key
			}
			fault.Key = fmt.Sprintf("error[%d].%s", e.index, fault.Key)
			return fault
		}
		if e.Order == 2 && (len(e.Members) > mostSecond || e.Leak) {
			found := fmt.Sprintf("2 of %d operators", len(e.Members))
			if e.Leak {
				found = "2 of leakage"
			}
			return &quantity.Error{File: b.File, Line: e.lineOrder, Key: fmt.Sprintf("error[%d].order", e.index), Found: found,
				Allowed: fmt.Sprintf("1, or 2 of at most %d operators of the code space, as of any static error of two spins", mostSecond)}
		}
	}
	// Of an offset of both quadratures a baseband channel has one.
	b.Errors = slices.DeleteFunc(b.Errors, func(e Error) bool {
		i, ok := p.Channel(e.on)
		return e.expanded && e.Quadrature == "Q" && ok && p.Channels[i].Kind == hardware.Baseband
	})
	if fault := b.holdProfile(p, d, driven); fault != nil {
		return fault
	}
	if fault := b.marginsOn(d); fault != nil {
		return fault
	}
	return b.spanOn(p, driven)
}

// defaultSeveral turns the errors of a brief that names none into those of a device of several sites: amplitude and any one-body error.
func (b *Brief) defaultSeveral() {
	if !b.Defaulted {
		return
	}
	b.Errors = slices.DeleteFunc(b.Errors, func(e Error) bool { return e.Kind == Static })
	for i := range b.Errors {
		if e := &b.Errors[i]; e.Kind == Any {
			e.Name, e.Scope, e.scope = anyNames[OneBody], OneBody, OneBody
		}
	}
}

// marginsOn complains of a margin of an error that is judged undeclared on one spin only.
func (b *Brief) marginsOn(d *device.Device) *quantity.Error {
	if d.Dim() == 2 {
		return nil
	}
	var names []string
	for _, e := range b.Errors {
		if e.Kind != Any {
			names = append(names, e.Name)
		}
	}
	for i, m := range b.Require.Margins {
		if e := known(m.Error, names, "an error of the brief that is not of any"); e != nil {
			if len(names) == 0 {
				e.Allowed = "no margin, as the brief has no error that is not of any"
			}
			e.File, e.Line, e.Key = b.File, b.lines.margins[i], fmt.Sprintf("require.margin[%d].error", i)
			e.Hint = "what is judged undeclared on one spin is not on this device"
			return e
		}
	}
	return nil
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

// straight leaves out the channels of biases with a map, of which no error is known that rides on what arrives.
func straight(driven []string, d *device.Device) []string {
	return slices.DeleteFunc(slices.Clone(driven), func(name string) bool { return d.Map(name) != nil })
}

// errorOn checks one error against profile and device, and completes it. A complaint without a key is about the key that made the error.
func (b *Brief) errorOn(e *Error, p *hardware.Profile, d *device.Device, driven []string) *quantity.Error {
	switch {
	case e.Kind == Static:
		return b.staticOn(e, d)
	case e.Kind == Any:
		return e.fill(d)
	case e.Kind == Amplitude && e.key == "": // the default: whatever drives the device by a rate of its own
		e.Channels = straight(driven, d)
		return nil
	case len(e.Channels) == 0 || e.key == "":
		return nil
	}
	if fault := known(e.on, driven, "a channel that drives a site of "+d.File); fault != nil {
		return fault
	}
	if d.Map(e.on) != nil && e.Kind != Offset {
		return &quantity.Error{Found: fmt.Sprintf("%q, a bias with a polynomial or a loop", e.on), Allowed: "a channel that drives in proportion to what arrives, or an offset"}
	}
	i, _ := p.Channel(e.on)
	c := &p.Channels[i]
	if e.Noise != nil && c.Shift != 0 {
		return &quantity.Error{Found: fmt.Sprintf("noise of %q, which shifts what it drives", e.on), Allowed: "noise of the amplitude of a channel without a shift"}
	}
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
	case Crosstalk:
		return crosstalkOn(e, string(c.Mixing), d)
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

// staticOn completes an error of one operator.
func (b *Brief) staticOn(e *Error, d *device.Device) *quantity.Error {
	at := func(site string, line int, key string) (int, *quantity.Error) {
		fault := known(site, siteNames(d), "a site of "+d.File)
		if fault != nil {
			fault.Line, fault.Key = line, key
		}
		i, _ := d.Site(site)
		return i, fault
	}
	one := func(site int) device.Matrix { return d.Embed(map[int]device.Matrix{site: d.LiftAt(site, e.Operator)}) }
	var m device.Matrix
	switch e.key {
	case "detuning":
		site, fault := at(e.on, e.line, "detuning")
		if fault != nil {
			return fault
		}
		m = one(site)
	case "operator":
		name, line, key := e.site, e.siteAt.line, "site"
		switch {
		case name != "":
		case len(b.Target.Sites) == 1:
			name, line, key = b.Target.Sites[0], e.line, "operator"
		case len(d.Sites) == 1:
			name = d.Sites[0].Name
		default:
			return &quantity.Error{Found: "no site beside it", Allowed: fmt.Sprintf("a site, as in site = %q (the target is not of one site)", d.Sites[0].Name)}
		}
		site, fault := at(name, line, key)
		if fault != nil {
			return fault
		}
		m = one(site)
	case "on":
		ops := map[int]device.Matrix{}
		for i, name := range e.product.sites {
			site, fault := at(name, e.product.line, "on")
			if fault != nil {
				return fault
			}
			ops[site] = d.Local(site, e.product.axes[i])
		}
		m = d.Embed(ops).Scale(0.5)
	case "collective":
		m = device.Zero(d.Dim())
		for site := range d.Sites {
			m = m.Add(0.5, d.Embed(map[int]device.Matrix{site: d.Local(site, e.product.axes[0])}))
		}
	case "matrix":
		switch {
		case e.matrix.N == d.Dim():
			m = e.matrix
		case e.matrix.N == 2 && len(d.Sites) == 1: // what it means on a ladder or a spin of more levels
			m = one(0)
		default:
			return &quantity.Error{Found: fmt.Sprintf("%d rows", e.matrix.N), Allowed: fmt.Sprintf("%d rows, the levels of %s", d.Dim(), d.File)}
		}
	default: // the detuning of a defaulted brief
		m = one(0)
	}
	e.Members = []Member{{Name: e.Name, Operator: m, Weight: 1}}
	if e.Operator.N == 0 && m.N == 2 {
		e.Operator = m
	}
	return nil
}

// crosstalkOn completes an error of a channel that reaches another site.
func crosstalkOn(e *Error, mixing string, d *device.Device) *quantity.Error {
	fault := known(e.Site, siteNames(d), "a site of "+d.File)
	if fault != nil {
		fault.Line, fault.Key = e.siteAt.line, "site"
		return fault
	}
	fail := func(found, allowed string) *quantity.Error {
		return &quantity.Error{Line: e.siteAt.line, Key: "site", Found: found, Allowed: allowed}
	}
	site, _ := d.Site(e.Site)
	own, drive := d.Aim(e.on)
	if own == site {
		return fail(fmt.Sprintf("%q, the site that %q is meant for", e.Site, e.on), "another site (amplitude is what scales a channel on its own)")
	}
	if from, to := &d.Sites[own], &d.Sites[site]; drive && (from.Frequency > 0) != (to.Frequency > 0) {
		return fail(fmt.Sprintf("a frequency for one of %q and %q only", from.Name, to.Name), "a frequency for both in "+d.File+", or for neither (the field then turns with both)")
	}
	path := d.Reach(e.on, site, mixing)
	if path.Frequency != 0 {
		f := math.Abs(path.Frequency) / (2 * math.Pi)
		return fail(fmt.Sprintf("%q, whose frame turns by %s away from that of %q", e.Site, quantity.Format(f, quantity.Frequency), e.on), "a site whose frame turns as fast")
	}
	e.Reach = path.Operators
	return nil
}

// holdProfile adds an error for each parameter of the driving lines that is known to a share, unless the brief has one of its own.
func (b *Brief) holdProfile(p *hardware.Profile, d *device.Device, driven []string) *quantity.Error {
	if !b.HoldProfile {
		return nil
	}
	fail := func(format string, args ...any) *quantity.Error {
		return &quantity.Error{File: b.File, Line: b.lines.hold, Key: "hold", Found: `"profile", and ` + fmt.Sprintf(format, args...),
			Allowed: `"nothing", or "profile" with a known_to in the [channel.line] of a channel that drives the device`}
	}
	found := false
	for _, name := range straight(driven, d) {
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
