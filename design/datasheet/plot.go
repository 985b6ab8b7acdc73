package datasheet

import (
	"fmt"
	"html"
	"html/template"
	"math"
	"strings"
)

// A plot is one drawing: curves over a pair of axes, with rules, shaded spans
// and labels that stand beside what they name. It is drawn in px of its own
// viewBox and scales with the page. Colours and dashes come from the page's
// style sheet by class (s0 to s4 for curves), so print can change them.
type plot struct {
	id            string // unique on the page
	title, desc   string // read out by a screen reader
	width, height int    // px
	fine          bool   // thinner lines, for dense curves

	x, y  axis
	right *axis // a second scale of y, for another unit

	spans  []span
	rules  []rule
	series []series
	dots   []dot
}

// A series is one curve. NaN and infinite values break it.
type series struct {
	label  string // "" for none
	points []point
	class  int // 0 to 4
}

type point struct{ x, y float64 }

// A rule is a straight line across the plot.
type rule struct {
	at       float64
	vertical bool
	label    string
	class    string // "limit", "floor" or "mark"
}

// A span is a shaded range of x.
type span struct {
	lo, hi float64
	label  string
	class  string // "window" or "guard"
}

// A dot marks one value.
type dot struct {
	point
	class int
}

// Sizes in tenths of a px, the unit that drawings are computed in: integers
// keep the bytes of a page the same on every machine.
const (
	padLeft   = 580
	padRight  = 140
	padScale  = 520 // on the right, with a second scale
	padTop    = 260
	padBottom = 430

	textSize  = 125
	charWidth = 70 // wide enough for the widest of the usual fonts, on average
)

// mark is a place on the drawing, in tenths of a px.
type mark struct{ x, y int }

// tenths rounds to tenths of a px. The small bias sends values half-way between
// two tenths the same way on machines that differ in the last bit.
func tenths(v float64) int { return int(math.Floor(v + 0.5 + 1e-6)) }

// frame is the box of the axes.
type frame struct{ left, top, right, bottom int }

func (p *plot) frame() frame {
	f := frame{padLeft, padTop, 10*p.width - padRight, 10*p.height - padBottom}
	if p.right != nil {
		f.right = 10*p.width - padScale
	}
	return f
}

// px returns the unrounded place of a value, in tenths of a px.
func (p *plot) px(v point) (x, y float64) {
	f := p.frame()
	x = float64(f.left) + float64(p.x.share(v.x)*float64(f.right-f.left))
	y = float64(f.bottom) - float64(p.y.share(v.y)*float64(f.bottom-f.top))
	return x, y
}

// lines returns a curve as the polylines that are left of it inside the frame.
func (p *plot) lines(pts []point) [][]mark {
	f := p.frame()
	var out [][]mark
	var run []mark
	flush := func() {
		if len(run) > 0 {
			out = append(out, simplify(thin(run)))
		}
		run = nil
	}
	var px, py float64
	open := false
	for _, v := range pts {
		if !finite(v.x) || !finite(v.y) {
			flush()
			open = false
			continue
		}
		x, y := p.px(v)
		if open {
			ax, ay, bx, by, ok := clip(px, py, x, y, f)
			if ok {
				a, b := mark{tenths(ax), tenths(ay)}, mark{tenths(bx), tenths(by)}
				if len(run) == 0 || run[len(run)-1] != a {
					flush()
					run = append(run, a)
				}
				if a != b {
					run = append(run, b)
				}
			} else {
				flush()
			}
		}
		px, py, open = x, y, true
	}
	flush()
	return out
}

// clip cuts the segment a-b to the frame (Liang and Barsky 1984, ACM Trans.
// Graphics 3, 1) and reports whether anything is left.
func clip(ax, ay, bx, by float64, f frame) (x0, y0, x1, y1 float64, ok bool) {
	dx, dy := bx-ax, by-ay
	t0, t1 := 0.0, 1.0
	for _, e := range [...]struct{ d, q float64 }{
		{-dx, ax - float64(f.left)}, {dx, float64(f.right) - ax},
		{-dy, ay - float64(f.top)}, {dy, float64(f.bottom) - ay},
	} {
		switch {
		case e.d == 0:
			if e.q < 0 {
				return 0, 0, 0, 0, false
			}
		case e.d < 0:
			t0 = math.Max(t0, e.q/e.d)
		default:
			t1 = math.Min(t1, e.q/e.d)
		}
	}
	if !(t0 <= t1) {
		return 0, 0, 0, 0, false
	}
	x0, y0, x1, y1 = ax, ay, bx, by
	if t0 > 0 {
		x0, y0 = ax+float64(t0*dx), ay+float64(t0*dy)
	}
	if t1 < 1 {
		x1, y1 = ax+float64(t1*dx), ay+float64(t1*dy)
	}
	return x0, y0, x1, y1, true
}

// thin keeps the first, lowest, highest and last mark of every px where a
// polyline of ascending x has far more than can be seen.
func thin(m []mark) []mark {
	const column = 10
	if len(m) < 4000 {
		return m
	}
	var out []mark
	for i := 0; i < len(m); {
		j, low, high := i, i, i
		for ; j < len(m) && m[j].x/column == m[i].x/column; j++ {
			if m[j].y < m[low].y {
				low = j
			}
			if m[j].y > m[high].y {
				high = j
			}
		}
		out = append(out, m[i])
		for _, k := range [...]int{min(low, high), max(low, high), j - 1} {
			if out[len(out)-1] != m[k] {
				out = append(out, m[k])
			}
		}
		i = j
	}
	return out
}

// simplify drops marks that lie within a tenth of a px of the line through
// their neighbours (Douglas and Peucker 1973, Cartographica 10, 112), in
// integers.
func simplify(m []mark) []mark {
	if len(m) < 3 {
		return m
	}
	keep := make([]bool, len(m))
	keep[0], keep[len(m)-1] = true, true
	stack := [][2]int{{0, len(m) - 1}}
	for len(stack) > 0 {
		a, b := stack[len(stack)-1][0], stack[len(stack)-1][1]
		stack = stack[:len(stack)-1]
		dx, dy := int64(m[b].x-m[a].x), int64(m[b].y-m[a].y)
		length := dx*dx + dy*dy
		worst, at := int64(0), -1
		for k := a + 1; k < b; k++ {
			ex, ey := int64(m[k].x-m[a].x), int64(m[k].y-m[a].y)
			d := dx*ey - dy*ex
			d *= d
			if length == 0 {
				d = ex*ex + ey*ey
			}
			if d > worst {
				worst, at = d, k
			}
		}
		if at >= 0 && worst > max(length, 1) {
			keep[at] = true
			stack = append(stack, [2]int{a, at}, [2]int{at, b})
		}
	}
	out := m[:0:0]
	for k, v := range m {
		if keep[k] {
			out = append(out, v)
		}
	}
	return out
}

// steps turns samples into the points of a held line from start, one every h.
func steps(x []float64, start, h float64) []point {
	if len(x) == 0 {
		return nil
	}
	pts := []point{{start, 0}}
	for k, v := range x {
		a, b := start+float64(float64(k)*h), start+float64(float64(k+1)*h)
		pts = append(pts, point{a, v}, point{b, v})
	}
	return append(pts, point{start + float64(float64(len(x))*h), 0})
}

// dec writes tenths of a px.
func dec(v int) string {
	sign := ""
	if v < 0 {
		sign, v = "-", -v
	}
	if v%10 == 0 {
		return fmt.Sprintf("%s%d", sign, v/10)
	}
	return fmt.Sprintf("%s%d.%d", sign, v/10, v%10)
}

// path writes polylines as the data of an SVG path, in coordinates relative to
// the mark before, which is the shorter form.
func path(lines [][]mark) string {
	var b strings.Builder
	for _, l := range lines {
		if len(l) == 0 {
			continue
		}
		fmt.Fprintf(&b, "M%s %s", dec(l[0].x), dec(l[0].y))
		if len(l) > 1 {
			b.WriteByte('l')
		}
		for k := 1; k < len(l); k++ {
			if k > 1 {
				b.WriteByte(' ')
			}
			fmt.Fprintf(&b, "%s %s", dec(l[k].x-l[k-1].x), dec(l[k].y-l[k-1].y))
		}
	}
	return b.String()
}

// svg draws the plot. Axes that cannot be drawn give a sentence instead.
func (p *plot) svg() template.HTML {
	var b strings.Builder
	if !p.x.valid() || !p.y.valid() {
		fmt.Fprintf(&b, `<p class="none">%s: nothing to draw.</p>`, html.EscapeString(clean(p.title)))
		return template.HTML(b.String())
	}
	f := p.frame()
	class := "plot"
	if p.fine {
		class = "plot fine"
	}
	fmt.Fprintf(&b, `<svg class="%s" viewBox="0 0 %d %d" role="img" aria-labelledby="%s-t %s-d"><title id="%s-t">%s</title><desc id="%s-d">%s</desc>`,
		class, p.width, p.height, p.id, p.id, p.id, html.EscapeString(clean(p.title)), p.id, html.EscapeString(clean(p.desc)))
	text := func(class string, x, y int, anchor, s string) {
		fmt.Fprintf(&b, `<text class="%s" x="%s" y="%s" text-anchor="%s">%s</text>`, class, dec(x), dec(y), anchor, html.EscapeString(s))
	}
	line := func(class string, a, c mark) {
		fmt.Fprintf(&b, `<path class="%s" d="M%s %sL%s %s"/>`, class, dec(a.x), dec(a.y), dec(c.x), dec(c.y))
	}

	for _, s := range p.spans {
		lo, hi, ok := p.spanBox(s)
		if ok {
			fmt.Fprintf(&b, `<rect class="%s" x="%s" y="%s" width="%s" height="%s"/>`, s.class, dec(lo), dec(f.top), dec(hi-lo), dec(f.bottom-f.top))
		}
	}

	// Grid, ticks and the captions of the axes.
	for _, t := range p.y.ticks(max(3, (f.bottom-f.top)/320)) {
		_, y := p.px(point{p.x.lo, t.at})
		m := tenths(y)
		line("grid", mark{f.left, m}, mark{f.right, m})
		text("tick", f.left-70, m+42, "end", t.label)
	}
	for _, t := range p.x.ticks(max(3, (f.right-f.left)/500)) {
		x, _ := p.px(point{t.at, p.y.lo})
		m := tenths(x)
		line("stub", mark{m, f.bottom}, mark{m, f.bottom + 40})
		text("tick", m, f.bottom+170, "middle", t.label)
	}
	text("axis", (f.left+f.right)/2, f.bottom+370, "middle", p.x.label)
	text("axis", 20, f.top-110, "start", p.y.label)
	if p.right != nil && p.right.valid() {
		for _, t := range p.right.ticks(max(3, (f.bottom-f.top)/320)) {
			m := tenths(float64(f.bottom) - float64(p.right.share(t.at)*float64(f.bottom-f.top)))
			line("stub", mark{f.right, m}, mark{f.right + 40, m})
			text("tick", f.right+70, m+42, "start", t.label)
		}
		text("axis", 10*p.width-20, f.top-110, "end", p.right.label)
	}
	fmt.Fprintf(&b, `<path class="box" d="M%s %sV%sH%s`, dec(f.left), dec(f.top), dec(f.bottom), dec(f.right))
	if p.right != nil {
		fmt.Fprintf(&b, "V%s", dec(f.top))
	}
	b.WriteString(`"/>`)

	for _, r := range p.rules {
		if a, c, ok := p.ruleLine(r); ok {
			line(r.class, a, c)
		}
	}
	// The first series matters most: it is drawn last, on top.
	for i := len(p.series) - 1; i >= 0; i-- {
		s := p.series[i]
		if d := path(p.lines(s.points)); d != "" {
			fmt.Fprintf(&b, `<path class="s s%d" d="%s"/>`, s.class, d)
		}
	}
	for _, d := range p.dots {
		if !finite(d.x) || !finite(d.y) {
			continue
		}
		x, y := p.px(d.point)
		if m := (mark{tenths(x), tenths(y)}); f.contains(m) {
			fmt.Fprintf(&b, `<circle class="d%d" cx="%s" cy="%s" r="3.2"/>`, d.class, dec(m.x), dec(m.y))
		}
	}
	for _, l := range p.labels() {
		if l.sample != nil {
			line(strings.Replace(l.class, "t", "s s", 1), l.sample[0], l.sample[1])
		}
		text("label "+l.class, l.box.left+l.pad, l.box.bottom-30, "start", l.text)
	}
	b.WriteString("</svg>")
	return template.HTML(b.String())
}

func (f frame) contains(m mark) bool {
	return m.x >= f.left && m.x <= f.right && m.y >= f.top && m.y <= f.bottom
}

func (p *plot) spanBox(s span) (lo, hi int, ok bool) {
	if !(s.lo < s.hi) || !finite(s.lo) || !finite(s.hi) {
		return 0, 0, false
	}
	f := p.frame()
	a, _ := p.px(point{s.lo, p.y.lo})
	c, _ := p.px(point{s.hi, p.y.lo})
	a, c = math.Max(a, float64(f.left)), math.Min(c, float64(f.right))
	if !(a < c) {
		return 0, 0, false
	}
	return tenths(a), tenths(c), true
}

func (p *plot) ruleLine(r rule) (a, c mark, ok bool) {
	if !finite(r.at) {
		return a, c, false
	}
	f := p.frame()
	x, y := p.px(point{r.at, r.at})
	if r.vertical {
		if !(x >= float64(f.left) && x <= float64(f.right)) {
			return a, c, false
		}
		return mark{tenths(x), f.top}, mark{tenths(x), f.bottom}, true
	}
	if !(y >= float64(f.top) && y <= float64(f.bottom)) {
		return a, c, false
	}
	return mark{f.left, tenths(y)}, mark{f.right, tenths(y)}, true
}
