package replay

import "math"

// A probe is one way in which things go wrong, to be multiplied by a size lambda: operator k of the plan's controls becomes
//
//	op + lambda first[k] + lambda^2 second[k]
//
// and H += lambda static. The quadratic part is there only for what a drive-induced shift makes of the other.
type probe struct {
	static        []complex128   // traceless, lambda in rad/ns; nil where there is none
	norm          float64        // of static
	first, second [][]complex128 // for each control, extra ones included; nil where there is none

	firstAxes, secondAxes []axis // the same when there are two levels

	// An error of a line: what arrives through its slope are controls of its own, and so are the plans.
	slope        *Class
	extra        []control
	paths        [][4]int // of the slope's controls, those of each path of the channel, by their numbers in a plan
	plans, rough plans
}

func newStatic(op []complex128, n int) *probe {
	p := &probe{static: append([]complex128(nil), op...)}
	dropTrace(p.static, n)
	p.norm = operatorNorm(p.static, n)
	return p
}

// chosen says which channels a class is about; those that lack a second quadrature are left out where it is needed, and those with a map always:
// their amplitude is no factor of what they drive.
func (e *engine) chosen(names []string, both bool) []bool {
	list := make([]bool, len(e.drives))
	for c := range list {
		list[c] = len(names) == 0
		for _, name := range names {
			list[c] = list[c] || name == e.m.Channels[c].Name
		}
		list[c] = list[c] && !(both && e.drives[c].ops[1] < 0) && !e.m.Channels[c].mapped()
	}
	return list
}

func scaled(op []complex128, f float64) []complex128 {
	m := make([]complex128, len(op))
	for i, v := range op {
		m[i] = complex(f, 0) * v
	}
	return m
}

func (e *engine) newProbe(extra ...control) *probe {
	n := len(e.controls) + len(extra)
	return &probe{first: make([][]complex128, n), second: make([][]complex128, n), extra: extra}
}

// ready fills in what follows from first and second.
func (e *engine) ready(p *probe) *probe {
	if e.dim == 2 {
		p.firstAxes, p.secondAxes = make([]axis, len(p.first)), make([]axis, len(p.first))
		for k := range p.first {
			if p.first[k] != nil {
				p.firstAxes[k] = axisOf(p.first[k])
			}
			if p.second[k] != nil {
				p.secondAxes[k] = axisOf(p.second[k])
			}
		}
	}
	return p
}

// newAmplitude scales the named channels, or all: both quadratures, or the one that is named. The share of a shift that the scaled
// quadrature makes grows with its square.
func (e *engine) newAmplitude(names []string, which string) *probe {
	p := e.newProbe()
	for c, yes := range e.chosen(names, which != "") {
		if !yes {
			continue
		}
		d := &e.drives[c]
		for q, name := range [...]string{"I", "Q"} {
			if d.ops[q] < 0 || which != "" && which != name {
				continue
			}
			p.first[d.ops[q]] = e.controls[d.ops[q]].op
			if s := d.squares[q]; s >= 0 {
				p.first[s], p.second[s] = scaled(d.shift, 2), d.shift
			}
			for _, path := range d.paths {
				for _, k := range path[2*q : 2*q+2] {
					if k >= 0 {
						p.first[k] = e.controls[k].op
					}
				}
			}
		}
	}
	return e.ready(p)
}

// newSkew lets u_I of the named channels, or of all with two quadratures, take up -lambda u_Q:
// H = u_I O_I + u_Q (O_Q - lambda O_I), and of a shift (u_I - lambda u_Q)^2 = u_I^2 - 2 lambda u_I u_Q + lambda^2 u_Q^2.
func (e *engine) newSkew(names []string) *probe {
	p := e.newProbe()
	for c, yes := range e.chosen(names, true) {
		if !yes {
			continue
		}
		d := &e.drives[c]
		p.first[d.ops[1]] = scaled(e.controls[d.ops[0]].op, -1)
		if d.shift != nil {
			p.first[d.squares[2]], p.second[d.squares[1]] = scaled(d.shift, -2), d.shift
		}
		for _, path := range d.paths {
			// u_Q cos goes where u_I cos does, and u_Q sin where u_I sin does.
			for i := range 2 {
				p.first[path[2+i]] = scaled(e.controls[path[i]].op, -1)
			}
		}
	}
	return e.ready(p)
}

// newCrosstalk lets u of the class's channel drive lambda times the class's operators.
func (e *engine) newCrosstalk(class *Class) *probe {
	p := e.newProbe()
	for c, yes := range e.chosen(class.Channels, false) {
		for q, op := range class.Operators {
			if yes {
				op = append([]complex128(nil), op...)
				dropTrace(op, e.dim)
				p.first[e.drives[c].ops[q]] = op
			}
		}
	}
	return e.ready(p)
}

// newLineError adds lambda v to u of the class's channel, v what arrives through the slope of its line:
// of a shift, |u + lambda v|^2 = |u|^2 + 2 lambda Re(conj(u) v) + lambda^2 |v|^2. By the channel's paths v drives what u does.
func (e *engine) newLineError(class *Class) *probe {
	c := 0
	for i := range e.m.Channels {
		if e.m.Channels[i].Name == class.Channels[0] {
			c = i
		}
	}
	d := &e.drives[c]
	none := make([]complex128, e.dim*e.dim)
	var extra []control
	var first, second [][]complex128
	add := func(p part, f, s []complex128) {
		extra = append(extra, newControl(c, p, none, e.dim))
		first, second = append(first, f), append(second, s)
	}
	for q, k := range d.ops {
		if k >= 0 {
			add(slopeI+part(q), e.controls[k].op, nil)
		}
	}
	if d.shift != nil {
		add(beat, scaled(d.shift, 2), nil)
		add(slopes, nil, d.shift)
	}
	var paths [][4]int
	for _, path := range d.paths {
		for i, k := range path {
			if k < 0 {
				continue
			}
			o := &e.controls[k]
			path[i] = len(e.controls) + len(extra)
			add(o.part, o.op, nil)
			x := &extra[len(extra)-1]
			x.frequency, x.slope, x.norm = o.frequency, true, o.norm
		}
		paths = append(paths, path)
	}
	p := e.newProbe(extra...)
	p.paths = paths
	copy(p.first[len(e.controls):], first)
	copy(p.second[len(e.controls):], second)
	p.slope = class
	return e.ready(p)
}

// channel is the one of a line error.
func (p *probe) channel() int { return p.extra[0].channel }

func (p *probe) same(o *probe) bool {
	if (p.static == nil) != (o.static == nil) || (p.slope == nil) != (o.slope == nil) {
		return false
	}
	for i := range p.static {
		if p.static[i] != o.static[i] {
			return false
		}
	}
	if p.slope != nil {
		return p.slope == o.slope
	}
	for k := range p.first {
		for _, m := range [...][2][]complex128{{p.first[k], o.first[k]}, {p.second[k], o.second[k]}} {
			if (m[0] == nil) != (m[1] == nil) {
				return false
			}
			for i := range m[0] {
				if m[0][i] != m[1][i] {
					return false
				}
			}
		}
	}
	return true
}

func (p *probe) reach(lambda float64) reach {
	switch lambda = math.Abs(lambda); {
	case p == nil:
		return reach{}
	case p.static != nil:
		return reach{static: lambda * p.norm}
	case p.slope != nil:
		return reach{line: lambda}
	}
	return reach{amplitude: lambda}
}
