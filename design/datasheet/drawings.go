package datasheet

import (
	"fmt"
	"html/template"
	"math"
	"math/cmplx"
	"strings"
	"unicode"
	"unicode/utf8"

	"holdfast/design/replay"
)

// Sizes of the drawings, in px.
const (
	fullWidth, fullHeight   = 1000, 320
	severalHeight           = 230 // of each of several channels
	halfWidth, halfHeight   = 480, 320
	thirdWidth, thirdHeight = 330, 240
)

// both draws a plot for wide pages and, redrawn and not merely scaled, for
// narrow ones.
func both(p plot, title, note string) figureView {
	f := figureView{Title: title, Note: note, Wide: p.svg()}
	p.id, p.width, p.height = p.id+"n", halfWidth, min(p.height, halfHeight)
	f.Narrow = p.svg()
	return f
}

func one(p plot, title, note string) figureView {
	return figureView{Title: title, Note: note, Wide: p.svg()}
}

func quadratures(x []complex128) (i, q []float64) {
	i, q = make([]float64, len(x)), make([]float64, len(x))
	for k, v := range x {
		i[k], q[k] = real(v), imag(v)
	}
	return i, q
}

// largest returns the largest finite size in xs, or 0.
func largest(xs ...[]float64) float64 {
	m := 0.0
	for _, x := range xs {
		for _, v := range x {
			if finite(v) {
				m = math.Max(m, math.Abs(v))
			}
		}
	}
	return m
}

// around returns a symmetric axis that holds size with some air.
func around(size float64, label string) axis {
	if !positive(size) {
		size = 1
	}
	return axis{lo: -1.12 * size, hi: 1.12 * size, label: label}
}

// rate returns the right-hand scale in MHz that goes with a scale in shares.
func (c *Channel) rate(y axis) *axis {
	if !positive(c.FullScale) {
		return nil
	}
	label := "Rabi frequency (MHz)"
	if c.Baseband {
		label = "turns of the device (MHz)"
	}
	return &axis{lo: y.lo * c.FullScale, hi: y.hi * c.FullScale, label: label}
}

// pair gives the curves of the quadratures, or the one of a baseband channel.
func (c *Channel) pair(i, q []point) []series {
	if c.Baseband {
		return []series{{label: "output", points: i, class: 0}}
	}
	return []series{{label: "I", points: i, class: 0}, {label: "Q", points: q, class: 1}}
}

// A drawn is a channel while its figures are drawn.
type drawn struct {
	*Channel
	sheet  *Sheet
	suffix string // of ids
	of     string // of titles
	height int
}

func (s *Sheet) drawings(v *view) {
	size := 0
	var undrawn []string
	for n := range s.Channels {
		c := drawn{Channel: &s.Channels[n], sheet: s, height: fullHeight}
		var f channelView
		if s.several() {
			f.Name = clean(c.Name)
			c.suffix, c.of, c.height = fmt.Sprintf("-%d", n), " of "+f.Name, severalHeight
		}
		if len(c.Samples) > 0 && positive(s.SamplePeriod) {
			f.Played = c.playedFigure()
		}
		if len(c.Arrives) > 1 {
			f.Arriving = c.arrivingFigure()
			f.After = c.afterFigure()
		}
		if sp := NewSpectrum(c.entering(), s.SamplePeriod, c.Band, c.Line); sp != nil {
			f.Spectrum = c.spectrumFigure(sp)
		}
		size += f.size()
		if f.Played.Wide == "" && f.Arriving.Wide == "" {
			continue
		}
		if n > 0 && size > drawingsLimit {
			undrawn = append(undrawn, f.Name)
			continue
		}
		v.Channels = append(v.Channels, f)
	}
	if len(undrawn) > 0 {
		v.Undrawn = "The drawings of " + list(undrawn) + " are left out, for the page would be too large; the files hold what they play and what arrives."
	}
}

// drawingsLimit is how large the drawings of channels after the first may make a page, in bytes: the rest needs what is left of SizeLimit.
const drawingsLimit = 1_200_000

// size is that of the drawings, in bytes.
func (f *channelView) size() int {
	n := 0
	for _, d := range []figureView{f.Played, f.Arriving, f.Spectrum, f.After} {
		n += len(d.Wide) + len(d.Narrow)
	}
	return n
}

func (s drawn) playedFigure() figureView {
	i, q := quadratures(s.Samples)
	h := s.sheet.SamplePeriod
	length := float64(len(i)) * h
	size := largest(i, q)
	p := plot{
		id: "played" + s.suffix, title: "Samples played" + s.of, width: fullWidth, height: s.height,
		x:      axis{lo: -0.02 * length, hi: 1.02 * length, label: "time at the converter (ns)"},
		series: s.pair(steps(i, 0, h), steps(q, 0, h)),
	}
	if a := s.AmplitudeLimit; positive(a) && a <= 2 {
		size = math.Max(size, a)
		p.rules = append(p.rules, rule{at: a, label: "amplitude limit", class: "limit"}, rule{at: -a, class: "limit"})
	}
	p.y = around(size, "share of full scale")
	note := ""
	if s.Reached == nil {
		p.right = s.rate(p.y)
	} else { // a share at the converter is no share of the rate
		note = fmt.Sprintf("At the converter: the drive's compression leaves at most %s of full scale of them.", percent(peak(s.Reached)))
	}
	lead, trail := float64(s.GuardLead)*h, float64(s.GuardTrail)*h
	p.spans = []span{{0, lead, "guard", "guard"}, {length - trail, length, "guard", "guard"}}
	p.desc = fmt.Sprintf("Two step lines over %d samples of %s ns: the in-phase quadrature I, at most %s of full scale in size, and the quadrature Q, at most %s.",
		len(i), digits(h, 4), digits(largest(i), 3), digits(largest(q), 3))
	if s.Baseband {
		p.desc = fmt.Sprintf("A step line over %d samples of %s ns, at most %s of full scale in size.", len(i), digits(h, 4), digits(largest(i), 3))
	}
	return both(p, "Samples played"+s.of, typographic(note))
}

// peak returns the largest finite |x|.
func peak(x []complex128) float64 {
	m := 0.0
	for _, v := range x {
		if a := cmplx.Abs(v); finite(a) {
			m = math.Max(m, a)
		}
	}
	return m
}

// window returns where the window begins and ends at the device, in ns.
func (s *Sheet) window() (lo, hi float64) { return s.WindowStart, s.WindowStart + s.Span }

func (s *Channel) arrivals(scale float64) (i, q []point, t0, t1 float64) {
	t0, t1 = math.Inf(1), math.Inf(-1)
	for _, a := range s.Arrives {
		i = append(i, point{a.Time, scale * real(a.U)})
		q = append(q, point{a.Time, scale * imag(a.U)})
		if finite(a.Time) {
			t0, t1 = math.Min(t0, a.Time), math.Max(t1, a.Time)
		}
	}
	return i, q, t0, t1
}

func sizes(pts ...[]point) float64 {
	m := 0.0
	for _, p := range pts {
		for _, v := range p {
			if finite(v.y) {
				m = math.Max(m, math.Abs(v.y))
			}
		}
	}
	return m
}

func (s drawn) arrivingFigure() figureView {
	i, q, t0, t1 := s.arrivals(1)
	lo, hi := s.sheet.window()
	p := plot{
		id: "arrives" + s.suffix, title: "What arrives at the device" + s.from(), width: fullWidth, height: s.height,
		x:      axis{lo: t0, hi: t1, label: "time after the edge of sample 0 (ns)"},
		y:      around(sizes(i, q), "share of full scale"),
		series: s.pair(i, q),
		spans:  []span{{lo, hi, fmt.Sprintf("window, %s to %s ns", digits(lo, 4), digits(hi, 4)), "window"}},
		desc: fmt.Sprintf(s.curves()+" after hold and line. The window of the gate, %s to %s ns, is shaded; what is outside it is ring-out.",
			digits(lo, 4), digits(hi, 4)),
	}
	p.right = s.rate(p.y)
	return both(p, "What arrives at the device"+s.from(), "")
}

// from names the channel in a title about the device.
func (s drawn) from() string { return strings.Replace(s.of, " of ", " from ", 1) }

func (c *Channel) curves() string {
	if c.Baseband {
		return "The curve of what the channel puts out"
	}
	return "Two curves, I and Q, of the drive"
}

// afterFigure magnifies what arrives after the window.
func (s drawn) afterFigure() figureView {
	i, q, _, t1 := s.arrivals(100)
	_, hi := s.sheet.window()
	after := func(pts []point) []point {
		var out []point
		for _, v := range pts {
			if v.x >= hi-1e-9 {
				out = append(out, v)
			}
		}
		return out
	}
	i, q = after(i), after(q)
	size := sizes(i, q)
	if size == 0 || len(i) < 2 {
		return figureView{}
	}
	p := plot{
		id: "after" + s.suffix, title: "After the window" + s.from(), width: halfWidth, height: min(s.height, halfHeight),
		x:      axis{lo: hi, hi: t1, label: "time after the edge of sample 0 (ns)"},
		series: s.pair(i, q),
	}
	note := "What the device still sees after the window, magnified."
	if r := 100 * s.RingOutLimit; positive(r) {
		size = math.Max(size, r)
		p.rules = []rule{{at: r, label: "ring-out limit", class: "limit"}, {at: -r, class: "limit"}}
		note += " The limit holds for each quadrature at every instant."
	} else {
		note += " The instrument states no limit."
	}
	p.y = around(1.1*size, "% of full scale")
	p.desc = fmt.Sprintf("What arrives from the end of the window at %s ns on, at most %s %% of full scale.", digits(hi, 4), digits(sizes(i, q), 3))
	return one(p, "After the window"+s.from(), note)
}

func (s drawn) spectrumFigure(sp *Spectrum) figureView {
	curve := func(y []float64) []point {
		var pts []point
		for k, f := range sp.Frequency {
			if y != nil {
				pts = append(pts, point{f, y[k]})
			}
		}
		return pts
	}
	half := 500 / s.sheet.SamplePeriod // MHz
	about, offset := "about the carrier", "offset from the carrier (MHz)"
	if s.Baseband {
		about, offset = "about zero", "frequency (MHz)"
	}
	p := plot{
		id: "spectrum" + s.suffix, title: "Spectrum of the samples" + s.of, fine: true, width: halfWidth, height: min(s.height, halfHeight),
		x:      axis{lo: -half, hi: half, label: offset},
		y:      axis{lo: -100, hi: 5, label: "dB of the largest"},
		series: []series{{label: "played", points: curve(sp.Played), class: 0}},
	}
	note := ""
	if sp.Arriving != nil {
		p.series = []series{{label: "arriving", points: curve(sp.Arriving), class: 1}, p.series[0]} // the lower one on top
		note = "Arriving: with the converter's hold and the line. "
	}
	if s.Reached != nil {
		note += "Both are of what the drive's compression leaves. "
	}
	p.desc = fmt.Sprintf("Energy against frequency from %s to %s MHz %s, in dB of the largest.", digits(-half, 4), digits(half, 4), about)
	if b := 1e3 * s.Band; positive(b) {
		p.spans = []span{{-b, b, "", "window"}}
		p.rules = []rule{{at: -b, vertical: true, class: "limit"}, {at: b, vertical: true, label: "band edge", class: "limit"}}
		share := fmt.Sprintf("%s of the energy lies outside the band of ±%s MHz.", percentSmall(sp.Outside), digits(b, 4))
		note += share
		p.desc += " " + share
	}
	return one(p, "Spectrum of the samples"+s.of, note)
}

func percentSmall(share float64) string {
	if share < 1e-7 {
		return "Less than 0.00001 %"
	}
	return percent(share)
}

// blade draws the size of the drive over time, mirrored and without axes, as
// the sign of the sheet.
func (s *Sheet) blade() template.HTML {
	const width, height = 300, 64
	samples := s.first().Samples
	size := peak(samples)
	if size == 0 || len(samples) < 2 {
		return ""
	}
	// At most one value a px: the largest of the samples that fall there.
	n := min(len(samples), width)
	tops := make([]float64, n)
	for k, v := range samples {
		if a := cmplx.Abs(v); finite(a) {
			tops[k*n/len(samples)] = math.Max(tops[k*n/len(samples)], a/size)
		}
	}
	var up, down []mark
	for k, a := range tops {
		x := tenths(float64(10*width*k) / float64(n-1))
		y := float64(5*height-20) * a
		up = append(up, mark{x, 5*height - tenths(y)})
		down = append(down, mark{x, 5*height + tenths(y)})
	}
	for l, r := 0, len(down)-1; l < r; l, r = l+1, r-1 {
		down[l], down[r] = down[r], down[l]
	}
	return template.HTML(fmt.Sprintf(`<svg class="blade" viewBox="0 0 %d %d" aria-hidden="true"><path class="leaf" d="%sz"/><path class="rib" d="M0 %dH%d"/></svg>`,
		width, height, path([][]mark{append(up, down...)}), height/2, width))
}

// errors fills the margin curves and the table of susceptibilities.
func (s *Sheet) errors(v *view) {
	verdict := s.Verdict
	for _, r := range s.Rivals {
		v.RivalNames = append(v.RivalNames, clean(r.Name))
	}
	y := s.infidelityAxis()
	for n, e := range verdict.Errors {
		row := errorRow{Name: clean(e.Name), Kind: clean(e.Kind), Held: e.Held, Leak: leaks(e), Of: operators(e),
			Cells: []errorCell{{typographic(figure(e.Susceptibility)), typographic(s.margin(e))}}}
		for _, r := range s.Rivals {
			cell := errorCell{"–", "–"}
			if re, ok := find(r.Errors, e); ok {
				cell = errorCell{typographic(figure(re.Susceptibility)), typographic(s.margin(re))}
			}
			row.Cells = append(row.Cells, cell)
		}
		v.Errors = append(v.Errors, row)
		v.Leaks = v.Leaks || row.Leak != ""
		if w := membersText(e); w != "" {
			v.Members = append(v.Members, typographic(w))
		}
		if f := s.marginFigure(n, e, y); f.Wide != "" {
			v.Margins = append(v.Margins, f)
		}
		if e.WorstDirection != "" {
			v.Worst = append(v.Worst, typographic(fmt.Sprintf("Of %s, %s survives most: susceptibility %s.", clean(e.Name), clean(e.WorstDirection), figure(e.WorstSusceptibility))))
		}
		for _, w := range fluctuations(&e) {
			v.Worst = append(v.Worst, typographic(strings.ToUpper(w[:1])+w[1:]+"."))
		}
		if w := s.weaker(e); w != "" {
			v.Weaker = append(v.Weaker, typographic(w))
		}
	}
	if r := s.required(); r > 0 {
		v.MarginNote = "A margin ends where the required infidelity of " + digits(r, 3) + " is first broken (dots)."
	}
	v.MarginKey = s.key()
}

// key names the dashes of the margin curves in words.
func (s *Sheet) key() string {
	words := []string{"this pulse solid"}
	dashes := [...]string{"dashed", "dash and dot", "dotted", "long dashes"}
	for i, r := range s.Rivals {
		if i < len(dashes) {
			words = append(words, clean(r.Name)+" "+dashes[i])
		}
	}
	return list(words) + "."
}

// leaks says what an error leads out of the code space, empty where there is nothing outside.
func leaks(e replay.Error) string {
	if e.LeakSusceptibility == nil {
		return ""
	}
	return typographic(figure(*e.LeakSusceptibility))
}

// operators counts those of a class, empty where it is not one of many.
func operators(e replay.Error) string {
	switch n := len(e.Members); n {
	case 0:
		return ""
	case 1:
		return "1 operator"
	default:
		return fmt.Sprintf("%d operators", n)
	}
}

// membersText names the operators of a class and says what was looked at for its margin.
func membersText(e replay.Error) string {
	if len(e.Members) == 0 {
		return ""
	}
	names := cleanAll(e.Members)
	if n := len(names); n > mostMembers {
		names = append(names[:mostMembers-1:mostMembers-1], fmt.Sprintf("%d more", n-mostMembers+1))
	}
	text := fmt.Sprintf("%s: %s.", capital(clean(e.Name)), list(names))
	if e.Leak {
		text += " These couple the code space to other levels, and its susceptibility is the share of that which survives."
	}
	if e.Sampled != "" {
		text += fmt.Sprintf(" What it withstands was looked for along %s.", clean(e.Sampled))
	}
	return text
}

// capital makes the first letter of a sentence one.
func capital(s string) string {
	for i, r := range s {
		return string(unicode.ToUpper(r)) + s[i+utf8.RuneLen(r):]
	}
	return s
}

func find(errors []replay.Error, e replay.Error) (replay.Error, bool) {
	for _, o := range errors {
		if o.Name == e.Name && o.Unit == e.Unit {
			return o, true
		}
	}
	return replay.Error{}, false
}

// weaker says where a rival does better than this pulse: a pulse held against
// one error is often worse than a plain one against another.
func (s *Sheet) weaker(e replay.Error) string {
	const clearly = 1.05
	mine := withstands(e)
	var better []string
	for _, r := range s.Rivals {
		re, ok := find(r.Errors, e)
		if !ok {
			continue
		}
		if theirs := withstands(re); theirs > clearly*mine {
			amount := withUnit("±"+digits(theirs, 3), clean(e.Unit))
			if math.IsInf(theirs, 1) {
				amount = "all that was tried"
			}
			better = append(better, fmt.Sprintf("%s %s", clean(r.Name), amount))
		}
	}
	if len(better) == 0 || math.IsNaN(mine) {
		return ""
	}
	own := "withstands " + withUnit("±"+digits(mine, 3), clean(e.Unit)) + ", less than a plain one"
	if broken(e) {
		own = "is " + s.margin(e) + ", and a plain one withstands some"
	} else if mine <= 0 {
		own = "withstands nothing, less than a plain one"
	}
	return fmt.Sprintf("Against %s this pulse %s: %s.", clean(e.Name), own, strings.Join(better, ", "))
}

// infidelityAxis is shared by all margin curves, so that they can be compared.
func (s *Sheet) infidelityAxis() axis {
	low, high := 1e-5, 1e-3
	if r := s.required(); r > 0 {
		low, high = r/10, r*10
	}
	if d := s.Verdict.Decoherence; positive(d) {
		low, high = math.Min(low, d), math.Max(high, d)
	}
	take := func(e replay.Error, reach float64) {
		for _, p := range e.Curve {
			if math.Abs(p.Value) <= reach && positive(p.Infidelity) {
				low, high = math.Min(low, p.Infidelity), math.Max(high, p.Infidelity)
			}
		}
	}
	for _, e := range s.Verdict.Errors {
		reach := s.reach(e)
		take(e, reach)
		for _, r := range s.Rivals {
			if re, ok := find(r.Errors, e); ok {
				take(re, reach)
			}
		}
	}
	a := axis{log: true, label: "average gate infidelity (ratio)"}
	if m := s.measured(); m != "" {
		a.label = "infidelity " + m + " (ratio)"
	}
	a.lo = math.Pow10(int(math.Floor(math.Log10(math.Max(low, tiny)) + 1e-9)))
	a.hi = math.Pow10(int(math.Ceil(math.Log10(math.Min(math.Max(high, 10*a.lo), 1)) - 1e-9)))
	return a
}

// reach is the half width of the margin plot of an error: all of its curve,
// or half as far again as the widest margin where that is less.
func (s *Sheet) reach(e replay.Error) float64 {
	lo, hi, ok := curveRange(e.Curve)
	if !ok {
		return 0
	}
	end := math.Max(math.Abs(lo), math.Abs(hi))
	widest, open := 0.0, false
	see := func(e replay.Error) {
		for _, v := range [...]float64{-e.Low, e.High} {
			if math.IsInf(v, 1) {
				open = true
			} else if finite(v) {
				widest = math.Max(widest, v)
			}
		}
	}
	see(e)
	for _, r := range s.Rivals {
		if re, ok := find(r.Errors, e); ok {
			see(re)
		}
	}
	if open || widest <= 0 {
		return end
	}
	return math.Min(end, 1.5*widest)
}

func (s *Sheet) marginFigure(n int, e replay.Error, y axis) figureView {
	reach := s.reach(e)
	if reach <= 0 {
		return figureView{}
	}
	name, unit := clean(e.Name), clean(e.Unit)
	p := plot{
		id: fmt.Sprintf("margin%d", n), title: "Infidelity against " + name, width: halfWidth, height: halfHeight,
		x: axis{lo: -reach, hi: reach, label: fmt.Sprintf("%s (%s)", name, unit)}, y: y,
		series: []series{{label: "this pulse", points: curve(e), class: 0}},
		desc:   fmt.Sprintf("This pulse %s.", s.withstandsText(e)),
	}
	if e.Name == "detuning" && e.Unit == "MHz" {
		p.x.label = s.detuningText("detuning")
	}
	if lo, _, _ := curveRange(e.Curve); lo >= 0 { // sizes without a sign
		p.x.lo = 0
	}
	for i, r := range s.Rivals {
		if re, ok := find(r.Errors, e); ok {
			p.series = append(p.series, series{label: clean(r.Name), points: curve(re), class: 1 + i%4})
			p.desc += fmt.Sprintf(" %s: %s.", clean(r.Name), s.withstandsText(re))
		}
	}
	if r := s.required(); r > 0 {
		p.rules = append(p.rules, rule{at: r, label: "required", class: "limit"})
		for _, v := range [...]float64{e.Low, e.High} {
			if v != 0 {
				p.dots = append(p.dots, dot{point{v, r}, 0})
			}
		}
	}
	if d := s.Verdict.Decoherence; positive(d) {
		p.rules = append(p.rules, rule{at: d, label: "decoherence", class: "floor"})
	}
	title := name
	if e.Held {
		title += " (held)"
	}
	return one(p, title, typographic(s.withstandsText(e)))
}

// detuningText captions an axis or a table of detunings with their unit, and says on top of what they are.
func (s *Sheet) detuningText(name string) string {
	if s.Detuning == 0 || !finite(s.Detuning) {
		return name + " (MHz)"
	}
	return typographic(fmt.Sprintf("%s on top of the device's own %s MHz (MHz)", name, digits(s.Detuning, 4)))
}

func curve(e replay.Error) []point {
	var pts []point
	for _, p := range e.Curve {
		pts = append(pts, point{p.Value, p.Infidelity})
	}
	return pts
}

// rivals fills the table of the textbook pulses and their shapes.
func (s *Sheet) rivals(v *view) {
	v.NoRivals = typographic(clean(s.NoRivals))
	if len(s.Rivals) == 0 {
		return
	}
	p := plot{id: "rivals", title: "Shapes of the rivals", width: 400, height: 290}
	c := s.channelOf(s.Rivals[0])
	length, size := 0.0, 0.0
	for n, r := range s.Rivals {
		row := rivalRow{Name: clean(r.Name), Infidelity: short(r.Infidelity), Breaks: r.BreaksRingOut,
			Span: duration(r.Span), Pair: "–", Decoherence: "–"}
		if r.PairInfidelity != 0 {
			row.Pair = short(r.PairInfidelity)
		}
		if d := s.Verdict.Decoherence; positive(d) && positive(s.Span) && positive(r.Span) {
			row.Decoherence = short(d * r.Span / s.Span)
		}
		row.RingOut = s.ringOutText(r)
		row.Infidelity, row.Pair = typographic(row.Infidelity), typographic(row.Pair)
		row.RingOut, row.Span, row.Decoherence = typographic(row.RingOut), typographic(row.Span), typographic(row.Decoherence)
		v.Rivals = append(v.Rivals, row)
		if len(r.Samples) > 0 && positive(s.SamplePeriod) {
			i, q := quadratures(r.Samples)
			p.series = append(p.series, series{label: clean(r.Name), points: steps(i, 0, s.SamplePeriod), class: 1 + n%4})
			if largest(q) > 0 {
				p.series = append(p.series, series{label: clean(r.Name) + ", Q", points: steps(q, 0, s.SamplePeriod), class: 1 + n%4})
			}
			length = math.Max(length, float64(len(i))*s.SamplePeriod)
			size = math.Max(size, largest(i, q))
		}
	}
	if length > 0 {
		p.x = axis{lo: -0.04 * length, hi: 1.04 * length, label: "time at the converter (ns)"}
		p.y = axis{lo: -0.08 * size, hi: 1.25 * size, label: "I, share of full scale"}
		low := 0.0
		for _, c := range p.series {
			for _, q := range c.points {
				if finite(q.y) {
					low = math.Min(low, q.y)
				}
			}
		}
		p.y.lo = math.Min(p.y.lo, 1.12*low)
		if c.Reached == nil {
			p.right = c.rate(p.y)
		}
		p.desc = "Step lines of the samples of the textbook pulses: " + list(v.RivalNames) + "."
		v.RivalShapes = one(p, "Shapes of the rivals", "")
	}
}

// channelOf gives the channel that plays a rival.
func (s *Sheet) channelOf(r Rival) *Channel {
	if r.Channel >= 0 && r.Channel < len(s.Channels) {
		return &s.Channels[r.Channel]
	}
	return &Channel{}
}

// ringOutText says how much of a rival arrives after its window, and what the instrument says to that.
func (s *Sheet) ringOutText(r Rival) string {
	limit := s.channelOf(r).RingOutLimit
	switch {
	case !positive(limit) && !positive(r.RingOut):
		return "no limit stated"
	case !positive(limit):
		return percent(r.RingOut) + ", no limit stated"
	case r.BreaksRingOut:
		return percent(r.RingOut) + ", over " + percent(limit)
	}
	return percent(r.RingOut)
}

// bringUp fills the populations that a bench should read.
func (s *Sheet) bringUp(v *view) {
	b := s.Verdict.BringUp
	add := func(id, title, setting, label string, pts []replay.Population, whole bool) {
		if len(pts) == 0 {
			return
		}
		u := bringUp{Title: title, Setting: setting}
		p := plot{
			id: id, title: title, width: thirdWidth, height: thirdHeight, y: axis{lo: -0.03, hi: 1.03, label: "population of |1⟩ (ratio)"},
			desc: fmt.Sprintf("Population of 1 for %d settings; the table below has the numbers.", len(pts)),
		}
		lo, hi := math.Inf(1), math.Inf(-1)
		var line []point
		for _, q := range pts {
			if !finite(q.Value) || !finite(q.One) {
				continue
			}
			lo, hi = math.Min(lo, q.Value), math.Max(hi, q.Value)
			line = append(line, point{q.Value, q.One})
			p.dots = append(p.dots, dot{point{q.Value, q.One}, 0})
		}
		air := 0.04 * (hi - lo)
		p.x = axis{lo: lo - air, hi: hi + air, label: label}
		p.series = []series{{points: line, class: 0}}
		if whole { // the dots of counts are not points of a curve
			p.series = []series{{points: line, class: 5}}
		}
		u.Figure = one(p, title, "")
		u.Blocks = blocks(pts)
		v.BringUp = append(v.BringUp, u)
	}
	add("bring-amplitude", "Amplitude scale", "amplitude scale", "amplitude scale (ratio)", b.Amplitude, false)
	on := s.detuningText("detuning")
	short := on
	if s.Detuning != 0 {
		short = strings.TrimPrefix(on, "detuning ")
	}
	add("bring-detuning", "Detuning", on, short, b.Detuning, false)
	add("bring-repeats", "Repeats", "repeats", "pulses back to back (count)", b.Repeats, true)
	if len(v.BringUp) > 0 {
		v.BringUpNote = "Prepare |0⟩, play the pulse, and read how often |1⟩ is found. Set the carrier and the amplitude so that the readings follow these columns, coarse first by a single pulse, then fine by the repeats, which multiply what is left of an error; " +
			"a column that does not bend where this one does means that another pulse is playing, or the wrong sign of I or Q. Decoherence and readout errors are not in these numbers."
	}
}

// blocks cuts a list into rows of at most eleven of nearly equal length.
func blocks(pts []replay.Population) [][]population {
	const most, longest = 11, 256
	if len(pts) > longest {
		pts = pts[:longest]
	}
	rows := (len(pts) + most - 1) / most
	var out [][]population
	for r := range rows {
		var b []population
		for _, q := range pts[r*len(pts)/rows : (r+1)*len(pts)/rows] {
			b = append(b, population{typographic(digits(q.Value, 4)), fixed(q.One)})
		}
		out = append(out, b)
	}
	return out
}

// fixed prints a population to three places.
func fixed(v float64) string {
	if !finite(v) {
		return notComputed
	}
	return fmt.Sprintf("%.3f", v)
}
