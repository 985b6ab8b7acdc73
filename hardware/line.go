package hardware

import (
	"fmt"
	"strings"

	"holdfast/filter"
	"holdfast/hardware/quantity"
)

// leastAtCarrier is the least gain at the carrier that a resonance may leave: it is divided by that gain.
const leastAtCarrier = 0.01

// A lineMaker gathers the sections of a channel's line as the loader reads them, and makes the line and its parameters of them.
type lineMaker struct {
	channel      *Channel
	table        *quantity.Table
	sections     []filter.Line
	slopes       []sectionSlope
	delayKnownTo float64
	knownTo      string // in words, of the section that is being read
}

// A sectionSlope is a parameter before the sections are joined.
type sectionSlope struct {
	Parameter
	section int
}

// add appends a section whose parameters are in range; a section that filter refuses all the same is a complaint at key. It
// gives the index of the section.
func (l *lineMaker) add(key string, line filter.Line, err error) int {
	if err != nil {
		l.table.Fail(key, "%s", clause(err))
		line = filter.Through()
	}
	l.sections = append(l.sections, line)
	return len(l.sections) - 1
}

// notStated is the default of a known_to.
const notStated = -1.0

// known notes for the next sentence how well the parameters of a section are known, and gives 0 where that is not stated.
func (l *lineMaker) known(share float64) float64 {
	if share == notStated {
		return 0
	}
	l.knownTo = ", known to " + quantity.Format(share, quantity.Ratio)
	return share
}

// say appends a sentence on a section, with what was read by known since the last one.
func (l *lineMaker) say(format string, args ...any) {
	l.channel.Sections = append(l.channel.Sections, fmt.Sprintf(format, args...)+l.knownTo+".")
	l.knownTo = ""
}

// parameter notes a parameter of a section, with the slope of that section.
func (l *lineMaker) parameter(name string, share float64, section int, slope filter.Line, err error) {
	p := sectionSlope{Parameter{Name: name, KnownTo: share, Slope: slope}, section}
	if err != nil {
		p.Refused = reason(err)
	}
	l.slopes = append(l.slopes, p)
}

// mixed gives a line of true frequencies as the samples meet it behind the channel's mixer.
func (l *lineMaker) mixed(line filter.Line) filter.Line {
	if l.channel.Mixing == PlusSin {
		return filter.Mirror(line)
	}
	return line
}

// finish joins the sections and, for each parameter, its slope with the other sections.
func (l *lineMaker) finish() {
	c := l.channel
	line, err := filter.Cascade(l.sections...)
	if err != nil {
		l.table.Fail("", "these sections cannot be joined: %s", clause(err))
		line = filter.Through()
		l.slopes = nil
	}
	c.Line = line
	for _, s := range l.slopes {
		p := s.Parameter
		if p.Refused == "" {
			slope, err := filter.CascadeSlope(l.sections, s.section, p.Slope)
			if err != nil {
				p.Refused = reason(err)
			}
			p.Slope = slope
		}
		if p.Refused != "" {
			p.Slope = filter.Line{}
		}
		c.Parameters = append(c.Parameters, p)
	}
	if line.Delay > 0 {
		p := Parameter{Name: "delay", KnownTo: l.delayKnownTo}
		if slope, err := line.DelaySlope(); err != nil {
			p.Refused = reason(err)
		} else {
			p.Slope = scaled(slope, complex(line.Delay, 0))
		}
		c.Parameters = append(c.Parameters, p)
	}
	if len(c.Sections) == 0 {
		c.Sections = []string{"Straight through: the device sees the held samples."}
	}
}

// scaled gives a line times a factor.
func scaled(l filter.Line, f complex128) filter.Line {
	s := filter.Line{Delay: l.Delay, Direct: l.Direct * f, Terms: make([]filter.Term, len(l.Terms))}
	for i, t := range l.Terms {
		s.Terms[i] = filter.Term{Pole: t.Pole, Power: t.Power, Residue: t.Residue * f}
	}
	return s
}

// clause is an error of package filter as a clause of a sentence on a file.
func clause(err error) string { return strings.TrimPrefix(err.Error(), "filter: ") }

// reason is clause without what would be allowed.
func reason(err error) string {
	words, _, _ := strings.Cut(clause(err), "; allowed:")
	return words
}
