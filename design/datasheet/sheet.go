// Package datasheet writes what replay found about a pulse as one printable
// page and as a short text for the terminal.
//
// It sits at the very end of the road: cmd fills a Sheet from the pulse folder,
// the profile and the replay.Verdict, and this package only arranges, draws and
// explains. Nothing is judged here and nothing is computed here but the
// spectrum of the samples, so that the page can never disagree with replay.
//
// The page is a single HTML file. It asks for no outside resource and runs no
// script; its drawings are SVG written by the small plot type of this package.
// The same Sheet gives the same bytes: no date, host or path is printed unless
// the Sheet carries it.
//
// Conventions of the page: infidelity without adjective is the average gate
// infidelity, of a target of states the share of them that is lost, which the plate says; a figure under 1e-9 is printed as "< 1e-9 in this model";
// frequencies are cyclic. To the bench the page says MHz, ns and per cent.
package datasheet

import (
	"errors"
	"fmt"
	"html/template"
	"io"
	"math"

	_ "embed"

	"holdfast/design/replay"
)

// A Sheet is everything that the page and the text say. Quantities are in the
// units given beside them. A length, limit or time which is zero is not stated
// and leaves its line out; text is shown as it is, escaped, with control
// characters replaced.
type Sheet struct {
	Name   string   // of the pulse
	Target string   // such as "X90 on q1"
	Span   float64  // ns, the time that the gate occupies, guards included
	Ends   string   // "settled" or "window"; empty takes the verdict's
	Held   []string // error classes that the design was held against; empty: nothing
	Status string   // one phrase where the design did not end as asked, such as "interrupted: the best so far"

	Instrument   string    // name of the profile
	SamplePeriod float64   // ns
	Bits         int       // of the converters
	WindowStart  float64   // ns from the leading edge of sample 0
	Channels     []Channel // that play; the first one's shape is the sign of the sheet

	Sites    []Site  // of a device of several sites; empty for one
	T1, T2   float64 // ns, of a device of one site; 0 = not stated
	Detuning float64 // MHz, of the device itself: what it adds is 2 pi Detuning Z/2, and errors come on top
	Required float64 // infidelity that the brief requires; 0 takes the verdict's requirement of that name
	Verdict  *replay.Verdict
	Rivals   []Rival // textbook pulses for the same target through the same line
	NoRivals string  // why there are none, a sentence; empty where that is not worth one
	// LeftOut are the frequencies, MHz, of what turns by itself and is left out of the model.
	LeftOut []float64

	Basis         []Row     // family, coefficients per quadrature, ...
	CoefficientsI []float64 // of the first channel
	CoefficientsQ []float64
	Further       []Coefficients // of further channels, of a device of several sites
	Search        []Row          // seed, starts, stopping reason, ...
	Provenance    []Row          // version, inputs, ...
	Files         []Row          // file names and their SHA-256
	Cautions      []string
}

// A Site is one of several sites of a device.
type Site struct {
	Name   string
	T1, T2 float64 // ns; 0 = not stated
	Loss   float64 // its share of what decoherence adds
	// Before and After are the rotations of the site that the playback has to add to the samples, in words; empty where none is free.
	Before, After string
}

// Coefficients are those of one channel; a baseband one has no Q.
type Coefficients struct {
	Channel string
	I, Q    []float64
}

// A Channel is one output of the instrument, with what it plays and what its line makes of that.
type Channel struct {
	Name           string
	Baseband       bool    // one converter without a carrier: samples are real
	FullScale      float64 // MHz, steady Rabi frequency at full code; of a baseband channel the frequency by which it turns the device
	FullScaleLevel float64 // V at the connector at full code, 0 = not stated
	Band           float64 // GHz, the band is [-Band, Band]; 0 or +Inf = none
	GuardLead      int     // samples held at zero at the start of the span
	GuardTrail     int     // samples held at zero at its end
	AmplitudeLimit float64 // share of full scale; 0 or +Inf = none
	RingOutLimit   float64 // share of full scale per quadrature; 0 or +Inf = none

	Samples []complex128                 // x_I + i x_Q of the rounded codes, as the converter plays them, share of full scale
	Reached []complex128                 // what the drive's compression leaves of them, which enters the line; nil without compression
	Arrives []Arrival                    // at the device, ascending in time, from a little before the window to well after it
	Line    func(mhz float64) complex128 // frequency response of the line at an offset from the carrier, its unit steady gain kept; nil = not known

	LineFacts   []string // sentences about the line, one a section
	LineFigures []Row    // transition time, settling, ...
}

// first gives the first channel, or an empty one.
func (s *Sheet) first() *Channel {
	if len(s.Channels) == 0 {
		return &Channel{}
	}
	return &s.Channels[0]
}

// several reports whether channels need to be told apart.
func (s *Sheet) several() bool { return len(s.Channels) > 1 }

// register reports whether the sheet is of more than a gate on one site.
func (s *Sheet) register() bool { return len(s.Sites) > 1 || s.ofStates() }

// ofStates reports whether states are to become others.
func (s *Sheet) ofStates() bool {
	return s.Verdict.Measure == "state" || s.Verdict.Measure == "subspace"
}

// measured says what infidelity is of, empty for a gate's average.
func (s *Sheet) measured() string {
	switch s.Verdict.Measure {
	case "state":
		return "of the state"
	case "subspace":
		return "of the subspace"
	}
	return ""
}

// entering is what enters the line.
func (c *Channel) entering() []complex128 {
	if c.Reached != nil {
		return c.Reached
	}
	return c.Samples
}

// An Arrival is what the device sees at one time.
type Arrival struct {
	Time float64    // ns from the leading edge of sample 0
	U    complex128 // u_I + i u_Q, share of full scale
}

// A Rival is a textbook pulse for the same target, played through the same line
// and judged by replay in the same way.
type Rival struct {
	Name           string
	Span           float64        // ns
	Infidelity     float64        // without any error, for the ends of the sheet
	Channel        int            // that plays it, of the sheet's
	BreaksRingOut  bool           // the limit of that channel
	RingOut        float64        // share of full scale, the largest that arrives after its window, per quadrature; NaN = not known
	Samples        []complex128   // as the converter plays them, share of full scale
	Errors         []replay.Error // names and units as in the sheet's verdict, so that curves overlay
	PairInfidelity float64        // two without a gap, worst phase; 0 = not computed
}

// A Row is one line of a list of facts.
type Row struct {
	Name, Value string
}

//go:embed page.html
var pageSource string

//go:embed page.css
var pageStyle string

// SizeLimit is the largest page that Write gives out, in bytes.
const SizeLimit = 2_000_000

// Write writes the page. It fails when the sheet carries no verdict, when the
// page would exceed SizeLimit, or when w fails; until the page is whole nothing
// is written.
func Write(w io.Writer, s *Sheet) error {
	page, err := render(s)
	if err != nil {
		return err
	}
	_, err = w.Write(page)
	return err
}

var errNoVerdict = errors.New("datasheet: the sheet carries no verdict of replay")

func render(s *Sheet) ([]byte, error) {
	if s == nil || s.Verdict == nil {
		return nil, errNoVerdict
	}
	t, err := template.New("page").Parse(pageSource)
	if err != nil {
		return nil, fmt.Errorf("datasheet: the page's template: %w", err)
	}
	buf := limitedBuffer{limit: SizeLimit}
	if err := t.Execute(&buf, newView(s)); err != nil {
		return nil, fmt.Errorf("datasheet: %w", err)
	}
	return buf.data, nil
}

// limitedBuffer refuses to grow past its limit, so that a hostile sheet cannot
// fill memory.
type limitedBuffer struct {
	data  []byte
	limit int
}

func (b *limitedBuffer) Write(p []byte) (int, error) {
	if len(b.data)+len(p) > b.limit {
		return 0, fmt.Errorf("the page would be larger than %d bytes", b.limit)
	}
	b.data = append(b.data, p...)
	return len(p), nil
}

// required returns the infidelity that the brief requires, 0 when it requires
// none.
func (s *Sheet) required() float64 {
	if positive(s.Required) {
		return s.Required
	}
	for _, r := range s.Verdict.Requirements {
		if r.Name == "infidelity" && positive(r.Allowed) {
			return r.Allowed
		}
	}
	return 0
}

// ends returns the ends that the pulse is judged by.
func (s *Sheet) ends() string {
	if s.Ends != "" {
		return s.Ends
	}
	return s.Verdict.Ends
}

// positive reports whether v is a finite number above zero, that is, whether a
// quantity is stated.
func positive(v float64) bool { return v > 0 && !math.IsInf(v, 0) }

// finite reports whether v is neither NaN nor infinite.
func finite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }
