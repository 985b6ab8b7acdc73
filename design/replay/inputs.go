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
	code := make([]int, len(m.CodeSpace))
	for i := range code {
		code[i] = i
	}
	if !slices.Equal(m.CodeSpace, code) {
		c.differ("code_space", m.CodeSpace, code)
	}
	c.matrix("static_rad_per_ns", m.Static, d.Static().Data)
	c.matrix("target", m.Target, b.Target.Matrix.Data)
	for i, angles := range [][]float64{m.FreeZBefore, m.FreeZAfter} {
		if slices.ContainsFunc(angles, func(a float64) bool { return a != 0 }) {
			c.differ([]string{"free_z_before", "free_z_after"}[i], angles, "[]")
		}
	}
	if len(m.Channels) != len(d.Drives) {
		c.differ("channel", fmt.Sprintf("%d channels", len(m.Channels)), fmt.Sprintf("%d drives", len(d.Drives)))
	} else {
		start := math.Inf(-1)
		for i, drive := range d.Drives {
			k, ok := p.Channel(drive.Channel)
			if !ok {
				c.differ(fmt.Sprintf("channel[%d].name", i), fmt.Sprintf("%q", m.Channels[i].Name), fmt.Sprintf("%q, which the profile does not have", drive.Channel))
				continue
			}
			start = math.Max(start, p.Start(k))
			c.channel(fmt.Sprintf("channel[%d].", i), &m.Channels[i], p, k, d, i)
		}
		if !math.IsInf(start, 0) {
			c.number("window_start_ns", m.WindowStart, start)
		}
	}
	c.classes(m, b, d)
	c.number("require.infidelity", f.Require.Infidelity, b.Require.Infidelity)
	c.number("require.susceptibility", f.Require.Susceptibility, b.Require.Susceptibility)
	if len(f.Require.Margins) != len(b.Require.Margins) {
		c.differ("require.margin", fmt.Sprintf("%d margins", len(f.Require.Margins)), fmt.Sprintf("%d margins", len(b.Require.Margins)))
	} else {
		for i, r := range f.Require.Margins {
			key := fmt.Sprintf("require.margin[%d].", i)
			c.text(key+"error", r.Error, b.Require.Margins[i].Error)
			c.number(key+"size", r.Size, b.Require.Margins[i].Size)
		}
	}
	c.number("decoherence.t1_ns", f.T1, d.Sites[0].T1)
	c.number("decoherence.t2_ns", f.T2, d.Sites[0].T2)
	return c.list, nil
}

func (c *comparison) channel(key string, ch *Channel, p *hardware.Profile, k int, d *device.Device, drive int) {
	q := &p.Channels[k]
	c.text(key+"name", ch.Name, q.Name)
	c.text(key+"kind", ch.Kind, q.Kind)
	c.number(key+"full_scale_rad_per_ns", ch.FullScale, q.FullScale)
	c.number(key+"delay_ns", ch.Delay, p.Start(k))
	c.line(key, ch, q.Line)
	for i, op := range d.Operators(drive, string(q.Mixing)) {
		if i < len(ch.Operators) {
			c.matrix(fmt.Sprintf("%soperators[%d]", key, i), ch.Operators[i], op.Data)
		}
	}
	c.number(key+"max_share", math.Min(1, ch.MaxShare), q.AmplitudeLimit) // without a limit it is full scale
	c.number(key+"max_slew_per_sample", ch.MaxSlew, q.SlewLimit)
	c.number(key+"guard_lead", float64(ch.GuardLead), float64(q.GuardLead))
	c.number(key+"guard_trail", float64(ch.GuardTrail), float64(q.GuardTrail))
	c.number(key+"ring_out_share", ch.RingOut, q.RingOut.Limit)
}

// line compares poles one by one when they stand in the same order, and otherwise the responses, for a stranger may have sorted them.
func (c *comparison) line(key string, ch *Channel, l filter.Line) {
	found := &comparison{}
	found.matrix(key+"direct", []complex128{ch.Direct}, []complex128{l.Direct})
	if len(ch.Poles) != len(l.Terms) {
		found.differ(key+"poles_per_ns", fmt.Sprintf("%d poles", len(ch.Poles)), fmt.Sprintf("%d poles", len(l.Terms)))
	} else {
		for i, t := range l.Terms {
			at := func(name string) string { return fmt.Sprintf("%s%s[%d]", key, name, i) }
			found.number(at("powers"), float64(ch.Powers[i]), float64(t.Power))
			found.complex(at("poles_per_ns"), ch.Poles[i], t.Pole)
			found.complex(at("residues"), ch.Residues[i], t.Residue)
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
		rebuilt, recorded := l.Direct, ch.Direct
		for _, t := range l.Terms {
			rebuilt += t.Residue / cmplx.Pow(complex(0, w)-t.Pole, complex(float64(t.Power), 0))
		}
		for k, p := range ch.Poles {
			recorded += ch.Residues[k] / cmplx.Pow(complex(0, w)-p, complex(float64(ch.Powers[k]), 0))
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

// classes compares what the pulse is held against, and that every other error of the record is what its name says.
func (c *comparison) classes(m *Model, b *brief.Brief, d *device.Device) {
	var driven []string
	for _, drive := range d.Drives {
		driven = append(driven, drive.Channel)
	}
	wanted := map[string]Class{}
	for _, e := range b.Errors {
		w := Class{Name: e.Name, Kind: e.Kind, Held: true, Channels: e.Channels}
		if e.Kind == brief.Static {
			w.Operator = e.Operator.Data
		}
		if e.Kind == brief.Amplitude && len(w.Channels) == 0 {
			w.Channels = driven
		}
		wanted[e.Name] = w
		if !slices.ContainsFunc(m.Errors, func(r Class) bool { return r.Name == e.Name }) {
			c.differ("error", "nothing", fmt.Sprintf("%q, held", e.Name))
		}
	}
	undeclared := *m
	undeclared.Errors = nil
	for _, s := range undeclared.classes() {
		if _, declared := wanted[s.Name]; !declared {
			if s.Kind == "amplitude" {
				s.Channels = driven
			}
			wanted[s.Name] = s
		}
	}
	for i, r := range m.Errors {
		key := fmt.Sprintf("error[%d].", i)
		w, ok := wanted[r.Name]
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
		if r.Kind == "static" {
			c.matrix(key+"operator", r.Operator, w.Operator)
		}
		if r.Kind == "amplitude" {
			names := r.Channels
			if len(names) == 0 {
				for _, ch := range m.Channels {
					names = append(names, ch.Name)
				}
			}
			sorted := func(list []string) string {
				list = append([]string(nil), list...)
				slices.Sort(list)
				return strings.Join(slices.Compact(list), ", ")
			}
			c.text(key+"channels", sorted(names), sorted(w.Channels))
		}
	}
}
