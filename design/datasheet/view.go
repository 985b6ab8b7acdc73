package datasheet

import (
	"fmt"
	"html/template"
	"math"
	"strings"

	"holdfast/design/replay"
)

// A view is what the page's template prints: text that is ready to be escaped,
// and drawings.
type view struct {
	Style template.CSS

	Name, Sentence string
	Word           string // Met, Missed, or Unfinished where the verdict is good and the design not at its end
	Met            bool
	Verdict        string   // the answer in one sentence
	Reasons        []string // why not
	Plate          []plate
	Blade          template.HTML

	Requirements []requirement
	Warnings     []string
	Agreement    []string
	Differences  []replay.Difference

	Channels                 []channelView
	Margins                  []figureView
	MarginNote, MarginKey    string
	Errors                   []errorRow
	RivalNames               []string
	Weaker, Worst            []string
	Rivals                   []rivalRow
	RivalShapes              figureView
	Between                  []Row
	BetweenNote              string
	NoRivals                 string
	Playback                 []Row3
	PlaybackNote             string
	Decay                    []decayRow
	LeftOut                  []string
	Undrawn                  string
	Leaks                    bool // the table of errors says what they lead out of the code space
	Members                  []string
	Limits                   []limitRow
	BringUp                  []bringUp
	BringUpNote              string
	Lines                    []lineView
	Facts                    []facts
	CoefficientsI            string
	CoefficientsQ            string
	CoefficientsOf           string // the channel, where there are further ones
	Further                  []Row  // coefficients of further channels
	Cautions                 []string
	Decoherence, FullScaleMV string
}

// A channelView is what one channel plays and what arrives; its name stands there where there are several.
type channelView struct {
	Name             string
	Played, Arriving figureView
	Spectrum, After  figureView
}

// A lineView describes the line of one channel.
type lineView struct {
	Title     string
	Sentences []string
}

type plate struct{ Name, Value, Note string }

type requirement struct {
	Name, Found, Allowed string
	Met                  bool
}

type figureView struct {
	Title, Note  string
	Wide, Narrow template.HTML
}

// A Row3 is a line of three columns.
type Row3 struct{ Name, Before, After string }

type decayRow struct{ Site, T1, T2, Adds string }

type errorRow struct {
	Name, Kind string
	Held       bool
	Leak       string      // what it leads out of the code space; empty without other levels
	Of         string      // how many operators; empty for one
	Cells      []errorCell // this pulse first, then the rivals
}

type errorCell struct{ Susceptibility, Margin string }

type rivalRow struct {
	Name, Span, Infidelity, Decoherence, Pair, RingOut string
	Breaks                                             bool
}

type limitRow struct {
	Channel, Limit, Found, Allowed, Headroom string
	Bar                                      string // width of the used part, 0 to 100; empty for none
	OK                                       bool
}

type bringUp struct {
	Title, Setting string
	Figure         figureView
	Blocks         [][]population
}

type population struct{ Value, One string }

type facts struct {
	Title string
	Rows  []Row
	Mono  bool
}

func newView(s *Sheet) *view {
	v := s.Verdict
	view := &view{
		Style:    template.CSS(pageStyle),
		Name:     clean(s.Name),
		Sentence: s.sentence(),
		Met:      v.Met() && clean(s.Status) == "",
		Word:     s.word(),
		Verdict:  s.verdictSentence(),
		Reasons:  s.reasons(),
		Plate:    s.plate(),
		Blade:    s.blade(),
		Cautions: typographicAll(cleanAll(s.Cautions)),
		Warnings: typographicAll(cleanAll(v.Warnings)),
	}
	if view.Name == "" {
		view.Name = "a pulse without a name"
	}
	for _, r := range v.Requirements {
		found, allowed := s.requirementText(r)
		view.Requirements = append(view.Requirements, requirement{clean(r.Name), typographic(found), typographic(allowed), r.Met})
	}
	view.Agreement = s.agreement()
	for _, d := range v.Inputs {
		view.Differences = append(view.Differences, replay.Difference{Key: clean(d.Key), Recorded: clean(d.Recorded), Rebuilt: clean(d.Rebuilt)})
	}
	if v.Decoherence > 0 && finite(v.Decoherence) {
		view.Decoherence = s.decoherenceSentence()
	}
	var levels []string
	for i := range s.Channels {
		c := &s.Channels[i]
		if positive(c.FullScaleLevel) {
			level := digits(c.FullScaleLevel, 3) + " V"
			if s.several() {
				level += " (" + clean(c.Name) + ")"
			}
			levels = append(levels, level)
		}
		if len(c.LineFacts) > 0 {
			l := lineView{"The line", typographicAll(cleanAll(c.LineFacts))}
			if s.several() {
				l.Title += " of " + clean(c.Name)
			}
			view.Lines = append(view.Lines, l)
		}
	}
	view.FullScaleMV = typographic(list(levels))
	s.drawings(view)
	s.sites(view)
	s.errors(view)
	s.rivals(view)
	s.between(view)
	for _, l := range v.Limits {
		view.Limits = append(view.Limits, newLimitRow(l))
	}
	s.bringUp(view)
	s.provenance(view)
	return view
}

// sentence says what the pulse is.
func (s *Sheet) sentence() string {
	var parts []string
	if t := clean(s.Target); t != "" {
		parts = append(parts, t)
	}
	if positive(s.Span) {
		parts = append(parts, duration(s.Span))
	}
	return strings.Join(append(parts, "held against "+s.heldText()), ", ")
}

func (s *Sheet) heldText() string {
	if len(s.Held) == 0 {
		return "nothing"
	}
	return list(cleanAll(s.Held))
}

func (s *Sheet) endsText() string {
	switch s.ends() {
	case "window":
		return "in the window: drive before it and after it is left out"
	case "settled":
		return "settled: all that still arrives after the window is counted"
	}
	return clean(s.ends())
}

// verdictSentence gives the answer, and with it how the design ended where that is not as asked.
func (s *Sheet) verdictSentence() string {
	answer := "It meets its requirements, and every limit of the instrument is kept"
	switch {
	case !s.Verdict.Met():
		answer = "It does not meet its requirements"
	case len(s.Verdict.Requirements) == 0:
		answer = "Nothing was required of it; every limit of the instrument is kept"
	}
	if status := clean(s.Status); status != "" {
		answer += " (" + status + ")"
	}
	return answer + "."
}

// word is the verdict in one word: a design that did not end as asked is
// unfinished even where the requirements are met.
func (s *Sheet) word() string {
	switch {
	case !s.Verdict.Met():
		return "Missed"
	case clean(s.Status) != "":
		return "Unfinished"
	}
	return "Met"
}

// reasons lists what keeps a verdict from being met.
func (s *Sheet) reasons() []string {
	var out []string
	v := s.Verdict
	for _, r := range v.Requirements {
		if !r.Met {
			found, allowed := s.requirementText(r)
			out = append(out, fmt.Sprintf("%s: found %s, required %s", clean(r.Name), found, allowed))
		}
	}
	for _, l := range v.Limits {
		if !l.OK && l.Allowed == 0 {
			out = append(out, fmt.Sprintf("%s, %s: %s where zero is asked", clean(l.Channel), clean(string(l.Reading.Limit)), withUnit(digits(l.Found, 5), clean(l.Unit))))
		} else if !l.OK {
			out = append(out, fmt.Sprintf("%s, %s: %s where %s is allowed", clean(l.Channel), clean(string(l.Reading.Limit)),
				withUnit(digits(l.Found, 5), clean(l.Unit)), withUnit(digits(l.Allowed, 5), clean(l.Unit))))
		}
	}
	if !v.Agreement.OK {
		out = append(out, "replay does not agree with the record in the folder"+worst(v.Agreement.Worst))
	}
	if n := len(v.Inputs); n > 0 {
		out = append(out, fmt.Sprintf("the model in the folder is not the one that its inputs give (%d of its numbers differ)", n))
	}
	for i := range out {
		out[i] = typographic(out[i])
	}
	return out
}

// worst names the figure of which replay and the record differ most, and both numbers, to as many digits as tell them apart.
func worst(d replay.Disagreement) string {
	if d.Figure == "" {
		return ""
	}
	found, recorded := digits(d.Found, 3), digits(d.Recorded, 3)
	for n := 4; found == recorded && n <= 17; n++ {
		found, recorded = digits(d.Found, n), digits(d.Recorded, n)
	}
	return fmt.Sprintf(": %s is %s by replay and %s in the record", clean(d.Figure), found, recorded)
}

// requirementText says what was found and what is allowed.
func (s *Sheet) requirementText(r replay.Requirement) (found, allowed string) {
	unit := clean(r.Unit)
	if r.Margin {
		found = withUnit("±"+digits(r.Found, 3), unit)
		switch {
		case math.IsInf(r.Found, 1):
			found = "all that was tried"
		case math.IsNaN(r.Found):
			found = notComputed
		case r.Found == 0 && s.brokenOf(r):
			found = s.already()
		case r.Found == 0:
			found = "nothing"
		}
		return found, withUnit("at least ±"+digits(r.Allowed, 3), unit)
	}
	return withUnit(figure(r.Found), unit), withUnit("at most "+digits(r.Allowed, 3), unit)
}

// brokenOf reports whether the error of a required margin is one of which nothing is withstood because the infidelity is broken already.
func (s *Sheet) brokenOf(r replay.Requirement) bool {
	for _, e := range s.Verdict.Errors {
		if strings.HasSuffix(r.Name, " "+e.Name) && e.Unit == r.Unit {
			return broken(e)
		}
	}
	return false
}

// plate returns the figures of the head block. A nominal infidelity never
// stands there alone: what it withstands and what a pair loses stand beside it.
func (s *Sheet) plate() []plate {
	v := s.Verdict
	var out []plate
	add := func(name, value, note string) {
		out = append(out, plate{name, typographic(value), typographic(note)})
	}
	note := "without any error"
	if m := s.measured(); m != "" {
		note = m + ", " + note
	}
	if r := s.required(); r > 0 {
		note += ", required at most " + digits(r, 3)
	}
	switch s.ends() {
	case "settled":
		note += ", settled"
	case "window":
		note += ", in the window"
	}
	add("infidelity", figure(v.Required().Infidelity), note)
	withstands := func(e replay.Error) {
		if broken(e) {
			add("withstands", "nothing", "of "+clean(e.Name)+": "+s.already())
			return
		}
		add("withstands", s.margin(e), clean(e.Name))
	}
	var held *replay.Error
	for i, e := range v.Errors {
		if e.Held {
			withstands(e)
			if held == nil || e.Susceptibility > held.Susceptibility {
				held = &v.Errors[i]
			}
		}
	}
	if held == nil { // a nominal figure alone would flatter
		for _, e := range v.Errors[:min(2, len(v.Errors))] {
			withstands(e)
		}
	} else {
		add("susceptibility", figure(held.Susceptibility), "share of "+clean(held.Name)+" that survives; 1 = all")
	}
	if s.judgesPair() {
		add("pair without a gap", figure(v.Pair.Infidelity), "infidelity of two in a row, worst of four phases")
	}
	if l := v.Required().Leakage; s.register() && l != 0 {
		add("leakage", figure(l), "share that ends outside the code space")
	}
	if v.Dropped != nil {
		add("with what is left out", figure(v.Dropped.Infidelity), "infidelity with the rotating terms put back")
	}
	if v.Decoherence > 0 {
		add("decoherence adds", figure(v.Decoherence), "whatever the pulse, for this span")
	}
	if l, ok := tightest(v.Limits); ok {
		add("tightest limit", percent(l.Headroom)+" free", clean(string(l.Reading.Limit)))
	}
	return out
}

// judgesPair reports whether two pulses in a row are worth a word: of more than one site they often cannot be judged.
func (s *Sheet) judgesPair() bool { return !s.register() || finite(s.Verdict.Pair.Infidelity) }

func tightest(limits []replay.Limit) (replay.Limit, bool) {
	best := -1
	for i, l := range limits {
		if !finite(l.Headroom) || !positive(l.Allowed) { // a guard sample is zero or it is not
			continue
		}
		if best < 0 || l.Headroom < limits[best].Headroom {
			best = i
		}
	}
	if best < 0 {
		return replay.Limit{}, false
	}
	return limits[best], true
}

func (s *Sheet) agreement() []string {
	a := s.Verdict.Agreement
	if !a.OK {
		return []string{typographic(fmt.Sprintf("Replay does not agree with the record%s. At most, infidelity differs by %s, susceptibility by %s, tail angle in rad by %s. Do not play this pulse before that is explained.",
			worst(a.Worst), figure(a.Infidelity), figure(a.Susceptibility), figure(a.TailAngle)))}
	}
	text := "Every figure here was computed by replay from the integer codes in the folder, by other means than the design's. It agrees with the record within 1e-9 in infidelity, 1e-5 in susceptibility and 1e-4 rad in tail angle."
	if s.register() { // of which the record claims no angle
		text = strings.Replace(text, ", 1e-5 in susceptibility and 1e-4 rad in tail angle", " and 1e-5 in susceptibility", 1)
	}
	return []string{text}
}

func (s *Sheet) decoherenceSentence() string {
	v := s.Verdict
	text := "Decoherence adds " + figure(v.Decoherence)
	var of []string
	if positive(s.T1) {
		of = append(of, "T1 "+duration(s.T1))
	}
	if positive(s.T2) {
		of = append(of, "T2 "+duration(s.T2))
	}
	if len(of) > 0 {
		text += " (" + list(of) + ")"
	}
	how := "T/6 (1/T1 + 2/T2)"
	if len(s.Sites) > 1 {
		how = "the sum over the sites of d/(d+1) T/4 (1/T1 + 2/T2), d = " + fmt.Sprint(1<<len(s.Sites)) + " code states,"
	}
	every := " whatever the pulse: "
	if v.Measure == "state" || v.Measure == "subspace" { // of one state it depends on the way
		every = " the mean over all states of the sites and so a scale for these: "
	}
	text += " to every coherent infidelity here, " + how + every + figure(v.Required().Infidelity+v.Decoherence) + " in all without any other error."
	if r := s.required(); r > 0 && v.Decoherence > r {
		text += " That alone is more than the " + digits(r, 3) + " required, which is judged on the coherent figure."
	}
	return typographic(text)
}

func newLimitRow(l replay.Limit) limitRow {
	unit := clean(l.Unit)
	r := limitRow{
		Channel:  clean(l.Channel),
		Limit:    clean(string(l.Reading.Limit)),
		Found:    typographic(withUnit(digits(l.Found, 5), unit)),
		Allowed:  typographic(withUnit(digits(l.Allowed, 5), unit)),
		Headroom: typographic(percent(l.Headroom)),
		OK:       l.OK,
	}
	if math.IsInf(l.Allowed, 1) {
		r.Allowed = "no limit"
	}
	switch {
	case !finite(l.Headroom):
		r.Headroom = "–"
	case l.Allowed == 0:
		r.Headroom, r.Allowed = "–", "zero"
		if l.Found == 0 {
			r.Found, r.Allowed = "kept at zero", "–"
		}
	default:
		r.Bar = digits(100*math.Max(0, math.Min(1, 1-l.Headroom)), 3)
	}
	return r
}

func (s *Sheet) between(view *view) {
	v := s.Verdict
	add := func(name, value string) {
		view.Between = append(view.Between, Row{name, typographic(value)})
	}
	add("infidelity, settled", figure(v.Settled.Infidelity))
	add("infidelity, in the window alone", figure(v.Window.Infidelity))
	if l := v.Required().Leakage; l != 0 {
		add("leakage", figure(l))
	}
	angle := figure(v.TailAngle)
	if finite(v.TailAngle) && math.Abs(v.TailAngle) >= tiny {
		angle += " rad (" + digits(v.TailAngle*180/math.Pi, 3) + " deg)"
	}
	add("angle that the ring-out still turns", angle)
	if !s.judgesPair() {
		view.BetweenNote = "Two of these pulses without a gap are not judged; a warning above says why."
		return
	}
	pair := figure(v.Pair.Infidelity)
	if finite(v.Pair.Phase) {
		pair += " (second pulse at " + digits(v.Pair.Phase, 3) + " deg)"
	}
	add("two without a gap, worst of four phases", pair)
	single := v.Required().Infidelity
	text := "Two of these pulses without a gap, the second turned by the worst of four phases, miss the square of their target by " + figure(v.Pair.Infidelity)
	switch {
	case !finite(single) || !finite(v.Pair.Infidelity):
	case v.Pair.Infidelity > 3*math.Max(single, tiny):
		text += ", more than the figure of a single gate tells, because what still rings from the first is there when the second begins: " +
			"quote this figure for sequences, or leave a gap after which the ring-out has gone."
	default:
		text += ": what the first leaves behind does not spoil the second more than its own figure tells."
	}
	if strings.HasSuffix(text, figure(v.Pair.Infidelity)) {
		text += "."
	}
	view.BetweenNote = typographic(text)
}

func (s *Sheet) provenance(view *view) {
	add := func(title string, mono bool, rows []Row) {
		if len(rows) == 0 {
			return
		}
		f := facts{Title: title, Mono: mono}
		for _, r := range rows {
			f.Rows = append(f.Rows, Row{clean(r.Name), typographic(clean(r.Value))})
		}
		view.Facts = append(view.Facts, f)
	}
	var wave []Row
	text := func(name, value string) {
		if value != "" {
			wave = append(wave, Row{name, value})
		}
	}
	number := func(name string, v float64, unit string) {
		if positive(v) {
			wave = append(wave, Row{name, digits(v, 5) + " " + unit})
		}
	}
	text("instrument", s.Instrument)
	if !s.several() {
		text("channel", s.first().Name)
	}
	if n := len(s.first().Samples); n > 0 {
		text("samples", fmt.Sprintf("%d", n))
	}
	number("sample period", s.SamplePeriod, "ns")
	if s.Bits > 0 {
		text("converter", fmt.Sprintf("%d bit", s.Bits))
	}
	output := func(c *Channel) {
		kind, about := "steady Rabi frequency", "about the carrier"
		if c.Baseband {
			kind, about = "steady turns of the device", "about zero"
		}
		number("full scale", c.FullScale, "MHz "+kind)
		number("level at full scale", c.FullScaleLevel, "V")
		if positive(c.Band) {
			text("band", "±"+digits(1e3*c.Band, 4)+" MHz "+about)
		}
		if c.GuardLead > 0 || c.GuardTrail > 0 {
			text("guard samples", fmt.Sprintf("%d before, %d after", c.GuardLead, c.GuardTrail))
		}
		if c.Reached != nil {
			text("compression", "undone before the codes; arrivals and spectrum are behind it")
		}
	}
	if !s.several() {
		output(s.first())
	}
	number("window begins", s.WindowStart, "ns after sample 0")
	text("judged", s.endsText())
	add("Waveform", false, wave)
	for i := range s.Channels {
		c, of := &s.Channels[i], ""
		if s.several() {
			of = " of " + clean(c.Name)
			wave = nil
			output(c)
			add("Output"+of, false, wave)
		}
		add("Line"+of, false, c.LineFigures)
	}
	add("Basis", false, s.Basis)
	add("Search", false, s.Search)
	add("Provenance", false, s.Provenance)
	add("Files", true, s.Files)
	view.CoefficientsI = coefficients(s.CoefficientsI)
	view.CoefficientsQ = coefficients(s.CoefficientsQ)
	if len(s.Further) > 0 {
		view.CoefficientsOf = ", " + clean(s.first().Name)
	}
	for _, c := range s.Further {
		name := clean(c.Channel)
		if len(c.Q) == 0 {
			view.Further = append(view.Further, Row{"Coefficients of " + name, coefficients(c.I)})
			continue
		}
		view.Further = append(view.Further, Row{"Coefficients of I, " + name, coefficients(c.I)}, Row{"Coefficients of Q, " + name, coefficients(c.Q)})
	}
}

// sites says what is told of each of several sites: what playback has to add, and what waiting costs; and what of them the model leaves out.
func (s *Sheet) sites(view *view) {
	v := s.Verdict
	free, decays := false, false
	for _, x := range s.Sites {
		free = free || x.Before != "" || x.After != ""
		decays = decays || positive(x.Loss)
	}
	or := func(text string) string {
		if text == "" {
			return "–"
		}
		return typographic(clean(text))
	}
	stated := func(ns float64) string {
		if !positive(ns) {
			return "not stated"
		}
		return typographic(duration(ns))
	}
	for _, x := range s.Sites {
		if free {
			view.Playback = append(view.Playback, Row3{clean(x.Name), or(x.Before), or(x.After)})
		}
		if decays {
			view.Decay = append(view.Decay, decayRow{clean(x.Name), stated(x.T1), stated(x.T2), typographic(figure(x.Loss))})
		}
	}
	if free {
		view.PlaybackNote = "These rotations of single sites belong to the gate and are not in the samples: they cost nothing where the phases of later pulses are turned instead. A turn is exp(-i angle n·(X, Y, Z)/2), |0⟩ the +1 state of Z; every figure on this page counts them in."
	}
	if len(s.LeftOut) > 0 {
		var words []string
		for i, f := range s.LeftOut {
			if i == mostFrequencies {
				words = append(words, fmt.Sprintf("%d more", len(s.LeftOut)-i))
				break
			}
			words = append(words, digits(f, 5)+" MHz")
		}
		text := "The model leaves out what turns at " + list(words) + " in the frames of the sites, as the device file asks."
		if v.Dropped != nil {
			text += fmt.Sprintf(" Put back, it makes the infidelity %s in the place of %s", figure(v.Dropped.Infidelity), figure(v.Required().Infidelity))
			if l := v.Dropped.Leakage; l != 0 {
				text += ", of which the leakage is " + figure(l)
			}
			text += ". The other figures of this page are without it."
		} else {
			text += " What that costs is not judged."
		}
		view.LeftOut = append(view.LeftOut, typographic(text))
	}
}

// mostFrequencies are named of what is left out, mostMembers of the operators of a class.
const (
	mostFrequencies = 6
	mostMembers     = 24
)

// coefficients prints numbers to six digits; the record has them whole.
func coefficients(c []float64) string {
	const most = 512
	var b strings.Builder
	for i, v := range c {
		if i == most {
			fmt.Fprintf(&b, "  … and %d more, in the record", len(c)-most)
			break
		}
		if i > 0 {
			b.WriteString("  ")
		}
		b.WriteString(digits(v, 6))
	}
	return typographic(b.String())
}

func typographicAll(s []string) []string {
	for i := range s {
		s[i] = typographic(s[i])
	}
	return s
}

func cleanAll(s []string) []string {
	var out []string
	for _, t := range s {
		out = append(out, clean(t))
	}
	return out
}
