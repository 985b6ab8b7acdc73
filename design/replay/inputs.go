package replay

import (
	"fmt"
	"math"
	"math/cmplx"
	"path/filepath"
	"slices"
	"strings"

	"holdfast/design/brief"
	"holdfast/design/device"
	"holdfast/filter"
	"holdfast/hardware"
)

// inputsTolerance is how far, relative to its size, a recorded number may lie from the rebuilt one: far more than
// rounding, far less than any instrument can tell.
const inputsTolerance = 1e-9

// A comparison gathers what [model] and inputs/ disagree on.
type comparison struct{ list []Difference }

func (c *comparison) differ(key string, recorded, rebuilt any) {
	c.list = append(c.list, Difference{Key: key, Recorded: fmt.Sprint(recorded), Rebuilt: fmt.Sprint(rebuilt)})
}

func (c *comparison) number(key string, recorded, rebuilt float64) {
	if recorded == rebuilt {
		return
	}
	if math.IsInf(recorded, 0) || math.IsInf(rebuilt, 0) || !(math.Abs(recorded-rebuilt) <= inputsTolerance*math.Max(math.Abs(recorded), math.Abs(rebuilt))) {
		c.differ(key, limitText(recorded), limitText(rebuilt))
	}
}

// limitText prints a number of which infinity says that there is no limit.
func limitText(v float64) string {
	if math.IsInf(v, 1) {
		return "none"
	}
	return fmt.Sprintf("%.12g", v)
}

func (c *comparison) text(key, recorded, rebuilt string) {
	if recorded != rebuilt {
		c.differ(key, fmt.Sprintf("%q", recorded), fmt.Sprintf("%q", rebuilt))
	}
}

// matrix compares to absolute tolerance times the scale of the rebuilt matrix, the first element that differs.
func (c *comparison) matrix(key string, recorded, rebuilt []complex128) {
	if len(recorded) != len(rebuilt) {
		c.differ(key, fmt.Sprintf("%d elements", len(recorded)), fmt.Sprintf("%d elements", len(rebuilt)))
		return
	}
	scale := 1e-6 // rad/ns: a static part of zero has no scale of its own
	for _, v := range rebuilt {
		scale = math.Max(scale, cmplx.Abs(v))
	}
	n := int(math.Round(math.Sqrt(float64(len(rebuilt)))))
	for i := range rebuilt {
		if !(cmplx.Abs(recorded[i]-rebuilt[i]) <= inputsTolerance*scale) {
			c.differ(fmt.Sprintf("%s[%d][%d]", key, i/n, i%n), complexText(recorded[i]), complexText(rebuilt[i]))
			return
		}
	}
}

func complexText(z complex128) string { return fmt.Sprintf("[%.12g, %.12g]", real(z), imag(z)) }

// differences rebuilds the model from inputs/ with the loaders of the design path, but none of its numerics, and says where the record
// differs. The error is a loader's sentence about a file that cannot be read.
func (f *Folder) differences() ([]Difference, error) {
	p, err := hardware.Load(filepath.Join(f.Dir, filepath.FromSlash(profileFile)))
	if err != nil {
		return nil, err
	}
	d, err := device.Load(filepath.Join(f.Dir, filepath.FromSlash(deviceFile)))
	if err != nil {
		return nil, err
	}
	b, err := brief.Load(filepath.Join(f.Dir, filepath.FromSlash(briefFile)))
	if err != nil {
		return nil, err
	}
	c := &comparison{}
	m := f.Model
	// Whatever the three files say against each other; the comparison goes on with what there is.
	if err := b.Complete(p, d); err != nil {
		c.differ("inputs", "three files that go together", err)
	}
	c.number("sample_period_ns", m.SamplePeriod, p.SamplePeriod)
	// A span as written may be a little off a whole number of samples, as 1/2.4 ns has no exact decimals.
	if n := b.Span / p.SamplePeriod; !(math.Abs(n-float64(m.Samples)) <= 0.01) {
		c.differ("samples", m.Samples, limitText(n))
	}
	if err := p.CheckSpan(m.Samples); err != nil {
		c.differ("samples", m.Samples, err)
	}
	c.number("bits", float64(m.Bits), float64(p.Bits))
	c.text("ends", m.Ends, b.Ends)
	c.number("dim", float64(m.Dim), float64(d.Dim()))
	var levels []int
	if len(d.Sites) > 1 {
		levels = d.Levels()
	}
	if !slices.Equal(m.Sites, levels) {
		c.differ("sites", m.Sites, levels)
	}
	if code := d.CodeSpace(); !slices.Equal(m.CodeSpace, code) {
		c.differ("code_space", m.CodeSpace, code)
	}
	c.matrix("static_rad_per_ns", m.Static, d.Static().Data)
	c.rotating("rotating", m.Rotating, d.Rotating())
	c.rotating("dropped", m.Dropped, d.Dropped())
	c.target(m, &b.Target)
	for _, z := range []struct {
		key    string
		angles []float64
		free   bool
	}{
		{"free_z_before", m.FreeZBefore, b.Target.FreeZ == brief.Before || b.Target.FreeZ == brief.Both},
		{"free_z_after", m.FreeZAfter, b.Target.FreeZ == brief.After || b.Target.FreeZ == brief.Both},
	} {
		// Which angle was chosen is the design's; whether there is one is the brief's. An angle of zero does no harm.
		if free := slices.ContainsFunc(z.angles, func(a float64) bool { return a != 0 }); free && !z.free {
			c.differ(z.key, z.angles, "[]")
		}
	}
	for _, l := range []struct {
		key  string
		list [][]complex128
	}{{"local_before", m.LocalBefore}, {"local_after", m.LocalAfter}} {
		for i, u := range l.list {
			// A rotation that turns nothing but a phase does no harm.
			if phase := nearestUnitary(u, 2, 2)[0]; !b.Target.Local && cmplx.Abs(u[1])+cmplx.Abs(u[3]-phase) > inputsTolerance {
				c.differ(fmt.Sprintf("%s[%d]", l.key, i), "a rotation", "none that is free")
			}
		}
	}
	if n := len(d.Channels()); len(m.Channels) != n {
		c.differ("channel", fmt.Sprintf("%d channels", len(m.Channels)), fmt.Sprintf("%d drives and biases", n))
	}
	start := math.Inf(-1)
	for i := range m.Channels {
		ch, key := &m.Channels[i], fmt.Sprintf("channel[%d].", i)
		kind, paths, known := pathsOf(d, p, ch.Name)
		k, ok := p.Channel(ch.Name)
		switch {
		case !known:
			c.differ(key+"name", fmt.Sprintf("%q", ch.Name), "nothing: the device has neither drive nor bias by it")
		case !ok:
			c.differ(key+"name", fmt.Sprintf("%q", ch.Name), fmt.Sprintf("%q, which the profile does not have", ch.Name))
		default:
			start = math.Max(start, p.Start(k))
			c.text(key+"kind", ch.Kind, kind)
			c.channel(key, ch, p, k, paths, d.ShiftOperator(ch.Name).Data)
			c.curves(key, ch, d.Map(ch.Name))
		}
	}
	if !math.IsInf(start, 0) {
		c.number("window_start_ns", m.WindowStart, start)
	}
	c.classes(m, b, p, d)
	c.number("require.infidelity", f.Require.Infidelity, b.Require.Infidelity)
	c.number("require.susceptibility", f.Require.Susceptibility, b.Require.Susceptibility)
	if len(f.Require.Margins) != len(b.Require.Margins) {
		c.differ("require.margin", fmt.Sprintf("%d margins", len(f.Require.Margins)), fmt.Sprintf("%d margins", len(b.Require.Margins)))
	} else {
		for i, r := range f.Require.Margins {
			key := fmt.Sprintf("require.margin[%d].", i)
			c.text(key+"error", r.Error, b.Require.Margins[i].Error)
			c.number(key+"size", r.Size, c.marginSize(b, p, b.Require.Margins[i]))
		}
	}
	c.decay(f.Decay, d)
	for _, e := range b.Errors {
		if name := inputsDir + e.Rates; e.Rates != "" && !f.files.Has(name) {
			c.differ("file", fmt.Sprintf("no hash of %.80q", name), "one of every file that the brief names")
		}
	}
	return c.list, nil
}

// rotating compares terms that turn by themselves.
func (c *comparison) rotating(key string, recorded []Rotating, rebuilt []device.Rotating) {
	if len(recorded) != len(rebuilt) {
		c.differ(key, fmt.Sprintf("%d terms", len(recorded)), fmt.Sprintf("%d terms", len(rebuilt)))
		return
	}
	for i, r := range recorded {
		at := func(name string) string { return fmt.Sprintf("%s[%d].%s", key, i, name) }
		c.number(at("frequency_rad_per_ns"), r.Frequency, rebuilt[i].Frequency)
		c.matrix(at("cosine"), r.Cosine, rebuilt[i].Cosine.Data)
		c.matrix(at("sine"), r.Sine, rebuilt[i].Sine.Data)
	}
}

// target compares what the pulse is to do.
func (c *comparison) target(m *Model, t *brief.Target) {
	if len(m.From) == 0 && len(t.From) == 0 {
		c.matrix("target", m.Target, t.Whole.Data)
		return
	}
	for _, v := range []struct {
		key               string
		recorded, rebuilt [][]complex128
	}{{"from", m.From, t.From}, {"to", m.To, t.To}} {
		if len(v.recorded) != len(v.rebuilt) {
			c.differ(v.key, fmt.Sprintf("%d vectors", len(v.recorded)), fmt.Sprintf("%d vectors", len(v.rebuilt)))
			continue
		}
		for i, list := range v.recorded {
			if len(list) != len(v.rebuilt[i]) {
				c.differ(fmt.Sprintf("%s[%d]", v.key, i), fmt.Sprintf("%d entries", len(list)), fmt.Sprintf("%d entries", len(v.rebuilt[i])))
				continue
			}
			for k, z := range list {
				if !(cmplx.Abs(z-v.rebuilt[i][k]) <= inputsTolerance) {
					c.differ(fmt.Sprintf("%s[%d][%d]", v.key, i, k), complexText(z), complexText(v.rebuilt[i][k]))
				}
			}
		}
	}
}

// decay compares the times of the sites that state any.
func (c *comparison) decay(recorded []Decay, d *device.Device) {
	var rebuilt []Decay
	for _, s := range d.Sites {
		if s.T1 > 0 || s.T2 > 0 {
			rebuilt = append(rebuilt, Decay{s.Name, s.T1, s.T2})
		}
	}
	if len(recorded) != len(rebuilt) {
		c.differ("decoherence", fmt.Sprintf("%d sites", len(recorded)), fmt.Sprintf("%d sites", len(rebuilt)))
		return
	}
	for i, r := range recorded {
		at := func(name string) string { return fmt.Sprintf("decoherence[%d].%s", i, name) }
		if r.Site != "" {
			c.text(at("site"), r.Site, rebuilt[i].Site)
		}
		c.number(at("t1_ns"), r.T1, rebuilt[i].T1)
		c.number(at("t2_ns"), r.T2, rebuilt[i].T2)
	}
}

// pathsOf gives what the channel of this name does to the device: the first path is what its operators are, the others turn.
func pathsOf(d *device.Device, p *hardware.Profile, name string) (kind string, paths []device.Path, ok bool) {
	if !slices.Contains(d.Channels(), name) {
		return "", nil, false
	}
	mixing := hardware.Mixing("")
	if k, ok := p.Channel(name); ok {
		mixing = p.Channels[k].Mixing
	}
	kind = hardware.Baseband
	if _, drives := d.Aim(name); drives {
		kind = hardware.Quadrature
	}
	return kind, d.Paths(name, string(mixing)), true
}

// marginSize gives the size of a brief's margin as the record has it: an offset is a static error there.
func (c *comparison) marginSize(b *brief.Brief, p *hardware.Profile, m brief.Margin) float64 {
	for _, e := range b.Errors {
		if e.Name != m.Error || e.Kind != brief.Offset {
			continue
		}
		if k, ok := p.Channel(e.Channels[0]); ok {
			return m.Size * p.Channels[k].FullScale * cmplx.Abs(steady(p.Channels[k].Line))
		}
	}
	return m.Size
}

// steady is the gain of a line for what does not change.
func steady(l filter.Line) complex128 {
	g := l.Direct
	for _, t := range l.Terms {
		g += t.Residue / cmplx.Pow(-t.Pole, complex(float64(t.Power), 0))
	}
	return g
}

func (c *comparison) channel(key string, ch *Channel, p *hardware.Profile, k int, paths []device.Path, shift []complex128) {
	q := &p.Channels[k]
	c.number(key+"full_scale_rad_per_ns", ch.FullScale, q.FullScale)
	c.number(key+"delay_ns", ch.Delay, p.Start(k))
	c.line(key, recordedLine{ch.Direct, ch.Poles, ch.Powers, ch.Residues}, q.Line)
	c.operators(key+"operators", ch.Operators, paths[0].Operators)
	if len(ch.Paths) != len(paths)-1 {
		c.differ(key+"path", fmt.Sprintf("%d paths", len(ch.Paths)), fmt.Sprintf("%d paths", len(paths)-1))
	} else {
		for i, r := range ch.Paths {
			at := fmt.Sprintf("%spath[%d].", key, i)
			c.number(at+"frequency_rad_per_ns", r.Frequency, paths[i+1].Frequency)
			c.operators(at+"operators", r.Operators, paths[i+1].Operators)
		}
	}
	// In [model] zero says that there is no limit; in words it is none.
	limit := func(name string, recorded, rebuilt float64) {
		for _, v := range []*float64{&recorded, &rebuilt} {
			if *v == 0 {
				*v = math.Inf(1)
			}
		}
		c.number(key+name, recorded, rebuilt)
	}
	c.number(key+"max_share", math.Min(1, ch.MaxShare), q.AmplitudeLimit) // without a limit it is full scale
	c.number(key+"max_slew_per_sample", ch.MaxSlew, q.SlewLimit)
	c.number(key+"guard_lead", float64(ch.GuardLead), float64(q.GuardLead))
	c.number(key+"guard_trail", float64(ch.GuardTrail), float64(q.GuardTrail))
	c.number(key+"ring_out_share", ch.RingOut, q.RingOut.Limit)
	if recorded, rebuilt := envelope(ch.Box), envelope(q.Envelope == hardware.Box); ch.Kind == hardware.Quadrature {
		c.text(key+"envelope", recorded, rebuilt)
	}
	limit("rms_share", ch.RMS, q.RMSLimit)
	if ch.RMS > 0 {
		// A repetition period that is no longer than the span changes nothing; one between two whole numbers of samples may be recorded as the
		// stricter.
		whole := func(samples float64) float64 {
			return math.Max(float64(len(ch.Samples)), math.Floor(samples*(1+inputsTolerance)))
		}
		c.number(key+"rms_samples", whole(ch.RMSSamples), whole(q.RMSPeriod/p.SamplePeriod))
	}
	limit("out_of_band_share", ch.OutOfBand, q.OutOfBand)
	if ch.OutOfBand > 0 {
		c.number(key+"band_ghz", ch.Band, q.Band)
	}
	if ch.ZeroMean != q.ZeroMean {
		c.differ(key+"zero_mean", ch.ZeroMean, q.ZeroMean)
	}
	// The tail's budget where it is another than that of the rest.
	if !math.IsInf(q.RingOut.Limit, 1) || ch.RingOutTail > 0 {
		recorded, rebuilt := ch.RingOut, q.RingOut.Limit
		if ch.RingOutTail > 0 {
			recorded = ch.RingOutTail
		}
		if q.RingOut.Tail > 0 {
			rebuilt = q.RingOut.Tail
		}
		c.number(key+"ring_out_tail_share", recorded, rebuilt)
		if ch.RingOutTail > 0 && ch.RingOutTail != ch.RingOut {
			c.number(key+"ring_out_fast_ns", ch.RingOutFast, q.RingOut.Fast)
		}
	}
	if len(ch.Compression) != len(q.Compression) {
		c.differ(key+"compression", fmt.Sprintf("%d points", len(ch.Compression)), fmt.Sprintf("%d points", len(q.Compression)))
	} else {
		for i, k := range ch.Compression {
			c.number(fmt.Sprintf("%scompression[%d][0]", key, i), k.Share, q.Compression[i].Converter)
			c.number(fmt.Sprintf("%scompression[%d][1]", key, i), k.Reached, q.Compression[i].Reached)
		}
	}
	c.number(key+"shift_rad_per_ns", ch.Shift, q.Shift)
	if ch.Shift != 0 && q.Shift != 0 {
		c.matrix(key+"shift_operator", ch.ShiftOperator, shift)
	}
}

// operators compares as many matrices as both lists have; how many a model has to have its kinds say.
func (c *comparison) operators(key string, recorded [][]complex128, rebuilt []device.Matrix) {
	for i := range min(len(recorded), len(rebuilt)) {
		c.matrix(fmt.Sprintf("%s[%d]", key, i), recorded[i], rebuilt[i].Data)
	}
}

func envelope(box bool) string {
	if box {
		return hardware.Box
	}
	return hardware.Disc
}

// A recordedLine is a line, or a line's slope, as [model] has it.
type recordedLine struct {
	direct   complex128
	poles    []complex128
	powers   []int
	residues []complex128
}

// line compares poles one by one when they stand in the same order, and otherwise the responses, for a stranger may have sorted them.
func (c *comparison) line(key string, r recordedLine, l filter.Line) {
	found := &comparison{}
	found.matrix(key+"direct", []complex128{r.direct}, []complex128{l.Direct})
	if len(r.poles) != len(l.Terms) {
		found.differ(key+"poles_per_ns", fmt.Sprintf("%d poles", len(r.poles)), fmt.Sprintf("%d poles", len(l.Terms)))
	} else {
		for i, t := range l.Terms {
			at := func(name string) string { return fmt.Sprintf("%s%s[%d]", key, name, i) }
			found.number(at("powers"), float64(r.powers[i]), float64(t.Power))
			found.complex(at("poles_per_ns"), r.poles[i], t.Pole)
			found.complex(at("residues"), r.residues[i], t.Residue)
		}
	}
	if len(found.list) == 0 {
		return
	}
	// The values at more points than a function of so few poles can agree in by chance.
	same := true
	scale, fastest := 0.0, 1e-3
	for _, t := range l.Terms {
		fastest = math.Max(fastest, cmplx.Abs(t.Pole))
	}
	for i := -200; i <= 200 && same; i++ {
		w := math.Copysign(fastest*math.Pow(10, 1-6*(1-math.Abs(float64(i))/200)), float64(i))
		rebuilt, recorded := l.Direct, r.direct
		for _, t := range l.Terms {
			rebuilt += t.Residue / cmplx.Pow(complex(0, w)-t.Pole, complex(float64(t.Power), 0))
		}
		for k, p := range r.poles {
			recorded += r.residues[k] / cmplx.Pow(complex(0, w)-p, complex(float64(r.powers[k]), 0))
		}
		scale = math.Max(scale, cmplx.Abs(rebuilt))
		same = cmplx.Abs(recorded-rebuilt) <= inputsTolerance*math.Max(1, scale)
	}
	if !same {
		c.list = append(c.list, found.list...)
	}
}

func (c *comparison) complex(key string, recorded, rebuilt complex128) {
	if !(cmplx.Abs(recorded-rebuilt) <= inputsTolerance*math.Max(cmplx.Abs(recorded), cmplx.Abs(rebuilt))) {
		c.differ(key, complexText(recorded), complexText(rebuilt))
	}
}

// A wanted is an error class as inputs/ have it.
type wanted struct {
	Class
	slope     filter.Line // of kind line
	operators []device.Matrix
	all       bool // of kind any: they span all traceless operators, each as strong as the others
}

// wantedOf gives what the record should make of one error of the brief.
func (c *comparison) wantedOf(e brief.Error, p *hardware.Profile, d *device.Device) wanted {
	w := wanted{Class: Class{Name: e.Name, Kind: e.Kind, Held: true, Channels: e.Channels, Quadrature: e.Quadrature}}
	switch e.Kind {
	case brief.Static:
		if len(e.Members) > 0 { // none where the three files do not go together
			w.Operator = e.Members[0].Operator.Data
		}
	case brief.Any:
		w.Leak, w.all = e.Leak, !e.Leak && len(e.Members) == d.Dim()*d.Dim()-1
		for _, m := range e.Members {
			w.operators, w.Names, w.Weights = append(w.operators, m.Operator), append(w.Names, m.Name), append(w.Weights, m.Weight)
			w.all = w.all && m.Weight == 1
		}
	case brief.Crosstalk:
		w.operators = e.Reach
	case brief.Line:
		if k, ok := p.Channel(e.Channels[0]); ok {
			if q, ok := p.Channels[k].Parameter(e.Parameter); ok {
				w.slope = q.Slope
			}
		}
	case brief.Offset:
		// A constant at the converter of one quadrature is a static error along what the line's steady gain makes of it.
		w.Kind, w.Channels, w.Quadrature = brief.Static, nil, ""
		k, ok := p.Channel(e.Channels[0])
		_, paths, known := pathsOf(d, p, e.Channels[0])
		if !ok || !known {
			break
		}
		ops := paths[0].Operators
		g := steady(p.Channels[k].Line)
		if e.Quadrature == "Q" {
			g *= 1i
		}
		g /= complex(cmplx.Abs(g), 0)
		w.Operator = make([]complex128, len(ops[0].Data))
		for i := range w.Operator {
			w.Operator[i] = complex(real(g), 0) * ops[0].Data[i]
			if len(ops) > 1 {
				w.Operator[i] += complex(imag(g), 0) * ops[1].Data[i]
			}
		}
	}
	return w
}

// classes compares what the pulse is held against, and that every other error of the record is what its name says.
func (c *comparison) classes(m *Model, b *brief.Brief, p *hardware.Profile, d *device.Device) {
	driven := d.Channels()
	list := map[string]wanted{}
	for _, e := range b.Errors {
		w := c.wantedOf(e, p, d)
		if w.Kind == brief.Amplitude && len(w.Channels) == 0 {
			w.Channels = driven
		}
		list[e.Name] = w
		if !slices.ContainsFunc(m.Errors, func(r Class) bool { return r.Name == e.Name }) {
			c.differ("error", "nothing", fmt.Sprintf("%q, held", e.Name))
		}
	}
	undeclared := *m
	undeclared.Errors = nil
	for _, s := range undeclared.classes() {
		if _, declared := list[s.Name]; !declared {
			if s.Kind == "amplitude" {
				s.Channels = driven
			}
			list[s.Name] = wanted{Class: s}
		}
	}
	for i, r := range m.Errors {
		key := fmt.Sprintf("error[%d].", i)
		w, ok := list[r.Name]
		if !ok {
			c.differ(key+"name", fmt.Sprintf("%q", r.Name), "nothing")
			continue
		}
		if r.Held != w.Held {
			c.differ(key+"held", r.Held, w.Held)
		}
		c.text(key+"kind", r.Kind, w.Kind)
		if r.Kind != w.Kind {
			continue
		}
		if k := slices.IndexFunc(b.Errors, func(e brief.Error) bool { return e.Name == r.Name }); k >= 0 {
			e, scale := &b.Errors[k], 1.0
			if e.Kind == brief.Offset {
				scale = c.marginSize(b, p, brief.Margin{Error: e.Name, Size: 1})
			}
			c.fluctuations(key, &r, e, b.Span, scale)
		}
		switch r.Kind {
		case "static":
			c.matrix(key+"operator", r.Operator, w.Operator)
		case "any":
			c.members(key, &r, &w)
		case "crosstalk":
			c.text(key+"channel", r.Channels[0], w.Channels[0])
			c.operators(key+"operators", r.Operators, w.operators)
		case "line":
			c.text(key+"channel", r.Channels[0], w.Channels[0])
			c.line(key, recordedLine{r.Direct, r.Poles, r.Powers, r.Residues}, w.slope)
		case "amplitude", "skew":
			c.text(key+"quadrature", r.Quadrature, w.Quadrature)
			both := r.Kind == "skew" || r.Quadrature != ""
			c.text(key+"channels", m.named(r.Channels, both), m.named(w.Channels, both))
		}
	}
}

// members compares the operators of a class. A record without a list means all traceless ones, and so may a brief.
func (c *comparison) members(key string, r *Class, w *wanted) {
	if r.Leak != w.Leak {
		c.differ(key+"leak", r.Leak, w.Leak)
	}
	if r.Operators == nil {
		if !w.all {
			c.differ(key+"operators", "all traceless ones", fmt.Sprintf("%d of them", len(w.operators)))
		}
		return
	}
	if len(r.Operators) != len(w.operators) {
		c.differ(key+"operators", fmt.Sprintf("%d matrices", len(r.Operators)), fmt.Sprintf("%d matrices", len(w.operators)))
		return
	}
	for i, name := range r.Names {
		c.text(fmt.Sprintf("%snames[%d]", key, i), name, w.Names[i])
		c.number(fmt.Sprintf("%sweights[%d]", key, i), r.Weights[i], w.Weights[i])
	}
	c.operators(key+"operators", r.Operators, w.operators)
}

// named lists channels in order; none means all, or all with two quadratures.
func (m *Model) named(list []string, both bool) string {
	list = append([]string(nil), list...)
	if len(list) == 0 {
		for _, ch := range m.Channels {
			if !both || ch.Kind == hardware.Quadrature {
				list = append(list, ch.Name)
			}
		}
	}
	slices.Sort(list)
	return strings.Join(slices.Compact(list), ", ")
}
