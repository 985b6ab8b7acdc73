package datasheet

import "unicode/utf8"

// Direct labels: every curve, rule and span is named where it stands. A label
// is tried at a list of places and takes the cheapest: it never covers another
// label, and covers a curve only where nothing else is left. A label for which
// no place is free goes to a key in the corner, with a piece of its line.

// A label is one placed text.
type label struct {
	text, class string
	box         frame
	pad         int      // from the left of the box to the text
	sample      *[2]mark // a piece of the line, in the key only
}

const (
	labelHeight = 150
	labelGap    = 35 // between a line and the text beside it
)

func labelWidth(s string) int { return utf8.RuneCountInString(s)*charWidth + 40 }

func (f frame) overlaps(g frame) bool {
	return f.left < g.right && g.left < f.right && f.top < g.bottom && g.top < f.bottom
}

func (f frame) inside(g frame) bool {
	return f.left >= g.left && f.right <= g.right && f.top >= g.top && f.bottom <= g.bottom
}

// crossed counts the segments of polylines that touch the box.
func (f frame) crossed(lines [][]mark) int {
	n := 0
	for _, l := range lines {
		for k := 1; k < len(l); k++ {
			a, c := l[k-1], l[k]
			if max(a.x, c.x) < f.left || min(a.x, c.x) > f.right || max(a.y, c.y) < f.top || min(a.y, c.y) > f.bottom {
				continue
			}
			if _, _, _, _, ok := clip(float64(a.x), float64(a.y), float64(c.x), float64(c.y), f); ok {
				n++
			}
		}
	}
	return n
}

// labels places all labels of the plot.
func (p *plot) labels() []label {
	f := p.frame()
	var curves, rules [][]mark
	drawn := make([][][]mark, len(p.series))
	for i, s := range p.series {
		drawn[i] = p.lines(s.points)
		curves = append(curves, drawn[i]...)
	}
	for _, r := range p.rules {
		if a, c, ok := p.ruleLine(r); ok {
			rules = append(rules, []mark{a, c})
		}
	}

	var guards []frame // shaded spans that a curve's label keeps out of
	for _, s := range p.spans {
		if lo, hi, ok := p.spanBox(s); ok && s.class == "guard" {
			guards = append(guards, frame{lo, f.top, hi, f.bottom})
		}
	}

	var placed []label
	var homeless []label
	place := func(l label, others [][]mark, places []frame) {
		best, at := 0, -1
		for i, c := range places {
			if !c.inside(f) {
				continue
			}
			cost := 20*min(c.crossed(curves), 20) + 12*c.crossed(rules) + i
			// Room around it, so that it is clear which curve is meant.
			const room = 120
			wide := frame{c.left - room, c.top - room, c.right + room, c.bottom + room}
			cost += 60*min(wide.crossed(others), 3) + 15*wide.crossed(rules)
			for _, g := range guards {
				if c.overlaps(g) {
					cost += 200
				}
			}
			taken := false
			for _, o := range placed {
				taken = taken || c.overlaps(o.box)
			}
			if !taken && (at < 0 || cost < best) {
				best, at = cost, i
			}
		}
		if at < 0 {
			homeless = append(homeless, l)
			return
		}
		l.box, l.pad = places[at], 20
		placed = append(placed, l)
	}

	for _, r := range p.rules {
		if a, c, ok := p.ruleLine(r); ok && r.label != "" {
			text := clean(r.label)
			place(label{text: text, class: "t" + r.class}, nil, besideRule(a, c, labelWidth(text), r.vertical))
		}
	}
	for _, s := range p.spans {
		if lo, hi, ok := p.spanBox(s); ok && s.label != "" {
			text := clean(s.label)
			w := labelWidth(text)
			var places []frame
			for _, x := range [...]int{(lo+hi)/2 - w/2, lo, hi - w, lo - w, hi} {
				for _, y := range [...]int{f.top + 5, f.bottom - 5 - labelHeight, f.top + (f.bottom-f.top)/5, f.top + (f.bottom-f.top)*4/5} {
					places = append(places, frame{x, y, x + w, y + labelHeight})
				}
			}
			place(label{text: text, class: "t" + s.class}, nil, places)
		}
	}
	for i, s := range p.series {
		if s.label != "" && len(drawn[i]) > 0 {
			text := clean(s.label)
			var others [][]mark
			for k, d := range drawn {
				if k != i {
					others = append(others, d...)
				}
			}
			place(label{text: text, class: "t" + string(rune('0'+s.class))}, others, besideCurve(drawn[i], f, labelWidth(text)))
		}
	}

	// The key: rows down from the top right corner, past what is taken.
	const sample = 260
	y := f.top + 10
	for _, l := range homeless {
		w := labelWidth(l.text) + sample
		for ; y+labelHeight < f.bottom; y += labelHeight / 2 {
			l.box, l.pad = frame{max(f.left, f.right-w), y, f.right, y + labelHeight}, sample
			taken := false
			for _, o := range placed {
				taken = taken || l.box.overlaps(o.box)
			}
			if !taken {
				break
			}
		}
		if y+labelHeight >= f.bottom {
			break // a drawing too small for its labels: the page names the curves beside it
		}
		m := y + labelHeight/2
		if len(l.class) == 2 { // a curve's
			l.sample = &[2]mark{{l.box.left, m}, {l.box.left + sample - 40, m}}
		}
		placed = append(placed, l)
		y += labelHeight
	}
	return placed
}

// besideRule lists places along a rule, the tidiest first.
func besideRule(a, c mark, w int, vertical bool) []frame {
	var out []frame
	if vertical {
		for k := range 8 {
			y := a.y + 10 + k*(c.y-a.y-labelHeight-20)/7
			out = append(out, frame{a.x + labelGap, y, a.x + labelGap + w, y + labelHeight},
				frame{a.x - labelGap - w, y, a.x - labelGap, y + labelHeight})
		}
		return out
	}
	for k := range 9 {
		x := c.x - w - 10 - k*(c.x-a.x-w-20)/8
		out = append(out, frame{x, a.y - labelGap/2 - labelHeight, x + w, a.y - labelGap/2},
			frame{x, a.y + labelGap/2, x + w, a.y + labelGap/2 + labelHeight})
	}
	return out
}

// besideCurve lists places along a curve: beside, above and below it, near and
// not so near, at 24 columns of the frame.
func besideCurve(lines [][]mark, f frame, w int) []frame {
	const columns = 24
	var out []frame
	for _, gap := range [...]int{labelGap, 3 * labelGap, 8 * labelGap} {
		for k := columns - 1; k > 0; k-- {
			x := f.left + k*(f.right-f.left)/columns
			y, ok := heightAt(lines, x)
			if !ok {
				continue
			}
			out = append(out,
				frame{x + gap, y - labelHeight/2, x + gap + w, y + labelHeight/2},
				frame{x - gap - w, y - labelHeight/2, x - gap, y + labelHeight/2},
				frame{x - w/2, y - gap - labelHeight, x + w - w/2, y - gap},
				frame{x - w/2, y + gap, x + w - w/2, y + gap + labelHeight})
		}
	}
	return out
}

// heightAt returns y of the first polyline that spans x.
func heightAt(lines [][]mark, x int) (int, bool) {
	for _, l := range lines {
		for k := 1; k < len(l); k++ {
			a, c := l[k-1], l[k]
			if min(a.x, c.x) <= x && x <= max(a.x, c.x) {
				if a.x == c.x {
					return (a.y + c.y) / 2, true
				}
				return a.y + (c.y-a.y)*(x-a.x)/(c.x-a.x), true
			}
		}
	}
	return 0, false
}
