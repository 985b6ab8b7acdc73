package datasheet

import (
	"bytes"
	"encoding/xml"
	"flag"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"

	"github.com/pmezard/go-difflib/difflib"

	"holdfast/design/replay"
)

var update = flag.Bool("update", false, "rewrite the golden files")

func page(t *testing.T, s *Sheet) string {
	t.Helper()
	var b bytes.Buffer
	if err := Write(&b, s); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

func summary(t *testing.T, s *Sheet) string {
	t.Helper()
	var b bytes.Buffer
	if err := Text(&b, s); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

func golden(t *testing.T, name, got string) {
	t.Helper()
	file := filepath.Join("testdata", name)
	if *update {
		if err := os.MkdirAll("testdata", 0o777); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(file, []byte(got), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if got != string(want) {
		diff, _ := difflib.GetUnifiedDiffString(difflib.UnifiedDiff{
			A: difflib.SplitLines(string(want)), B: difflib.SplitLines(got), FromFile: file, ToFile: "now", Context: 1})
		if len(diff) > 4000 {
			diff = diff[:4000] + "\n..."
		}
		t.Errorf("%s differs (go test -update rewrites it):\n%s", file, diff)
	}
}

func TestGolden(t *testing.T) {
	s := demoSheet()
	golden(t, "sheet.html", page(t, s))
	golden(t, "sheet.txt", summary(t, s))
}

// wellFormed parses the page as XML, which is stricter than HTML: every element
// closed, every attribute quoted, every entity known. It returns the text, and
// fails on double ids and on references that lead out of the page.
func wellFormed(t *testing.T, page string) string {
	t.Helper()
	d := xml.NewDecoder(strings.NewReader(page))
	d.Strict = true
	ids := map[string]bool{}
	var wanted []string
	var text strings.Builder
	depth := 0
	for {
		tok, err := d.Token()
		if err == io.EOF {
			break
		}
		if err != nil {
			t.Fatalf("not well-formed: %v", err)
		}
		switch e := tok.(type) {
		case xml.StartElement:
			depth++
			switch e.Name.Local {
			case "script", "link", "img", "iframe", "object", "image", "use", "base", "form":
				t.Errorf("the page has an element %s", e.Name.Local)
			}
			for _, a := range e.Attr {
				switch name := a.Name.Local; {
				case name == "id":
					if ids[a.Value] {
						t.Errorf("id %q stands twice", a.Value)
					}
					ids[a.Value] = true
				case name == "aria-labelledby":
					wanted = append(wanted, strings.Fields(a.Value)...)
				case name == "href" || name == "src" || strings.HasPrefix(name, "on"):
					t.Errorf("the page has an attribute %s=%q", name, a.Value)
				}
			}
		case xml.EndElement:
			depth--
		case xml.CharData:
			text.Write(e)
		}
	}
	if depth != 0 {
		t.Errorf("%d elements are not closed", depth)
	}
	for _, id := range wanted {
		if !ids[id] {
			t.Errorf("no element has the id %q", id)
		}
	}
	return strings.ReplaceAll(text.String(), string(noBreak), " ")
}

var outside = regexp.MustCompile(`(?i)https?:|//[a-z]|url\(|@import|data:|javascript:`)

func TestPageStandsAlone(t *testing.T) {
	p := page(t, demoSheet())
	wellFormed(t, p)
	if m := outside.FindString(p); m != "" {
		t.Errorf("the page refers to something outside itself: %q", m)
	}
	if len(p) > 300_000 {
		t.Errorf("the page has %d bytes; usually it is under 300 kB", len(p))
	}
	if n := strings.Count(p, "<svg class=\"plot"); n != strings.Count(p, "<title id=") || n != strings.Count(p, "<desc id=") || n < 10 {
		t.Errorf("%d drawings, %d titles, %d descriptions", n, strings.Count(p, "<title id="), strings.Count(p, "<desc id="))
	}
	if tables, captions := strings.Count(p, "<table"), strings.Count(p, "<caption"); tables != captions {
		t.Errorf("%d tables, %d captions", tables, captions)
	}
}

func TestPageSaysWhatIsAsked(t *testing.T) {
	text := wellFormed(t, page(t, demoSheet()))
	for _, want := range []string{
		"It meets its requirements", "X90 on q1, 112 ns, held against any static error",
		"2.71e-9", "at most 1e-4", // infidelity and what is required of it
		"Samples played", "What arrives at the device", "band edge", "ring-out limit", "decoherence", "required",
		"0.00612 rad (0.351 deg)", "1.24e-5 (second pulse at 90 deg)", "0.488 % free",
		"Of any static error, 0.83 X − 0.41 Y survives most",
		"Against X this pulse withstands ±0.18 MHz, less than a plain one", // the honest half
		"0.62 %, over 0.1 %", "kept at zero", "T1 60 µs and T2 40 µs", "Population of |1⟩ against repeats", "Amplified radio-frequency power burns",
		"seed", "9f86d081", "0.5 V at the connector",
	} {
		if !strings.Contains(text, want) {
			t.Errorf("the page does not say %q", want)
		}
	}
}

// Every axis carries its unit.
func TestAxesHaveUnits(t *testing.T) {
	p := page(t, demoSheet())
	p = strings.ReplaceAll(p, string(noBreak), " ")
	axes := regexp.MustCompile(`<text class="axis"[^>]*>([^<]*)<`).FindAllStringSubmatch(p, -1)
	if len(axes) < 20 {
		t.Fatalf("%d axis captions", len(axes))
	}
	unit := regexp.MustCompile(`\((ns|MHz|%|ratio|count)\)$|^(share|% of|dB of|I, share)`)
	for _, a := range axes {
		if !unit.MatchString(a[1]) {
			t.Errorf("axis %q has no unit", a[1])
		}
	}
}

func TestMissed(t *testing.T) {
	s := demoSheet()
	s.Status = "interrupted: the best so far"
	v := s.Verdict
	v.Requirements[2].Found, v.Requirements[2].Met = 0.4, false
	v.Limits[1].OK, v.Limits[1].Found, v.Limits[1].Headroom = false, 0.26, -0.04
	v.Agreement = replay.Agreement{Infidelity: 1e-3, Worst: replay.Disagreement{Figure: "infidelity, settled", Found: 2.71e-9, Recorded: 0.0010000271}}
	v.Inputs = []replay.Difference{{Key: "channel[0].delay_ns", Recorded: "3.2", Rebuilt: "3.4"}}
	for name, text := range map[string]string{"page": wellFormed(t, page(t, s)), "text": summary(t, s)} {
		for _, want := range []string{"does not meet its requirements", "margin against detuning: found ±0.4 MHz, required at least ±1 MHz",
			"slew: 0.26 of full scale per sample where 0.25", "It does not meet its requirements (interrupted: the best so far).",
			"replay does not agree with the record in the folder: infidelity, settled is 2.71e-9 by replay and 0.001 in the record", "1 of its numbers differ"} {
			if !strings.Contains(text, want) {
				t.Errorf("%s does not say %q", name, want)
			}
		}
		if strings.Contains(text, "It meets") {
			t.Errorf("%s says that it meets its requirements", name)
		}
	}
}

// Text of the sheet, however hostile, stays text.
func TestHostileText(t *testing.T) {
	const evil = "</title></style><script>alert(1)</script><svg onload=\"x\">\"'&]]>\x00\x1b[31m\u202e\xff{{.}}"
	s := demoSheet()
	s.Name, s.Target, s.Ends, s.Status, s.Instrument, s.Channels[0].Name = evil, evil, evil, evil, evil, evil
	s.Held = []string{evil}
	for _, rows := range [][]Row{s.Channels[0].LineFigures, s.Basis, s.Search, s.Provenance, s.Files} {
		rows[0] = Row{evil, evil}
	}
	s.Channels[0].LineFacts, s.Cautions = []string{evil}, []string{evil}
	v := s.Verdict
	v.Ends, v.Warnings = evil, []string{evil}
	v.Inputs = []replay.Difference{{Key: evil, Recorded: evil, Rebuilt: evil}}
	v.Requirements[0].Name, v.Requirements[0].Unit = evil, evil
	v.Limits[0].Channel, v.Limits[0].Reading.Limit, v.Limits[0].Unit, v.Limits[0].OK = evil, evil, evil, false
	for i := range v.Errors {
		v.Errors[i].Name, v.Errors[i].Unit, v.Errors[i].Kind, v.Errors[i].WorstDirection = evil, evil, evil, evil
	}
	for i := range s.Rivals {
		s.Rivals[i].Name = evil
		for k := range s.Rivals[i].Errors {
			s.Rivals[i].Errors[k].Name, s.Rivals[i].Errors[k].Unit = evil, evil
		}
	}
	p := page(t, s)
	wellFormed(t, p)
	for _, bad := range []string{"<script", "onload=\"", "\x00", "\x1b", "\u202e"} {
		if strings.Contains(p, bad) {
			t.Errorf("the page has %q", bad)
		}
	}
	if text := summary(t, s); strings.ContainsAny(text, "\x00\x1b\u202e") {
		t.Error("the text has control characters")
	}
}

// Whatever is not a number is said in words, and never reaches a drawing.
func TestNotNumbers(t *testing.T) {
	nan, inf := math.NaN(), math.Inf(1)
	for _, bad := range []float64{nan, inf, -inf, 1e308, -1e308, 1e-320, 0} {
		s := demoSheet()
		c := &s.Channels[0]
		s.Span, s.SamplePeriod, c.FullScale, c.FullScaleLevel, c.Band = bad, bad, bad, bad, bad
		c.AmplitudeLimit, c.RingOutLimit, s.WindowStart, s.Required, s.T1, s.T2, s.Detuning = bad, bad, bad, bad, bad, bad, bad
		spoil(s, bad)
		check(t, bad, s)

		s = demoSheet() // good scales, bad values
		spoil(s, bad)
		check(t, bad, s)
	}
}

func spoil(s *Sheet, bad float64) {
	c := &s.Channels[0]
	c.Samples[7], c.Arrives[9].U, c.Arrives[30].Time = complex(bad, 0), complex(0, bad), bad
	s.CoefficientsI[0] = bad
	c.Line = func(float64) complex128 { return complex(bad, bad) }
	v := s.Verdict
	v.Settled = replay.Figures{Infidelity: bad, Leakage: bad}
	v.Window, v.TailAngle, v.Decoherence = v.Settled, bad, bad
	v.Pair = replay.Pair{Infidelity: bad, Phase: bad}
	v.Agreement = replay.Agreement{Infidelity: bad, Susceptibility: bad, TailAngle: bad, Worst: replay.Disagreement{Figure: "leakage", Found: bad, Recorded: bad}}
	for i := range v.Requirements {
		v.Requirements[i].Found, v.Requirements[i].Allowed = bad, bad
	}
	for i := range v.Limits {
		v.Limits[i].Found, v.Limits[i].Allowed, v.Limits[i].Headroom = bad, bad, bad
	}
	wound := func(errors []replay.Error) {
		for i := range errors {
			e := &errors[i]
			e.Susceptibility, e.Low, e.High, e.WorstSusceptibility = bad, -bad, bad, bad
			e.Curve[3].Value, e.Curve[10].Infidelity = bad, bad
		}
	}
	wound(v.Errors)
	for i := range s.Rivals {
		r := &s.Rivals[i]
		r.Span, r.Infidelity, r.RingOut, r.PairInfidelity, r.Samples[2] = bad, bad, bad, bad, complex(bad, bad)
		wound(r.Errors)
	}
	b := &v.BringUp
	b.Amplitude[1].One, b.Amplitude[2].Value, b.Detuning[0].Value, b.Repeats[4].One = bad, bad, bad, bad
}

var notANumber = regexp.MustCompile(`(?i)\bnan\b|[+-]?\binf\b|infinity|%!|922337203685`)

func check(t *testing.T, bad float64, s *Sheet) {
	t.Helper()
	p := page(t, s)
	wellFormed(t, p)
	for name, out := range map[string]string{"page": p, "text": summary(t, s)} {
		if m := notANumber.FindString(out); m != "" {
			at := strings.Index(out, m)
			t.Errorf("with %g the %s has %q: ...%s...", bad, name, m, out[max(0, at-80):min(len(out), at+80)])
		}
	}
}

func TestEmptySheet(t *testing.T) {
	if err := Write(io.Discard, nil); err == nil {
		t.Error("no error for no sheet")
	}
	if err := Write(io.Discard, &Sheet{}); err == nil {
		t.Error("no error for a sheet without a verdict")
	}
	if err := Text(io.Discard, &Sheet{}); err == nil {
		t.Error("no error for a text without a verdict")
	}
	s := &Sheet{Verdict: &replay.Verdict{}}
	wellFormed(t, page(t, s))
	check(t, 0, s)
}

// A page that would be too large is an error, and nothing is written.
func TestSizeLimit(t *testing.T) {
	s := demoSheet()
	for k := range 20000 {
		s.Provenance = append(s.Provenance, Row{fmt.Sprint("row ", k), strings.Repeat("x", 400)})
	}
	var b bytes.Buffer
	if err := Write(&b, s); err == nil || b.Len() > 0 {
		t.Errorf("error %v, %d bytes written", err, b.Len())
	}
}

// The longest pulse that an instrument plays still gives a page of usual size.
func TestLongPulse(t *testing.T) {
	s := demoSheet()
	c := &s.Channels[0]
	c.Samples = make([]complex128, 65536)
	c.Arrives = nil
	for k := range c.Samples {
		f := float64(k)
		c.Samples[k] = complex(0.9*math.Sin(f*f/1e5), 0.9*math.Cos(f))
		c.Arrives = append(c.Arrives, Arrival{f, c.Samples[k]})
	}
	s.Span = 65536
	if p := page(t, s); len(p) > 1_200_000 {
		t.Errorf("%d bytes", len(p))
	}
}

func TestSameBytes(t *testing.T) {
	a, b := page(t, demoSheet()), page(t, demoSheet())
	if a != b {
		t.Error("the same sheet gave two pages")
	}
}

// A disagreement in a late digit is told to that digit.
func TestWorstDigits(t *testing.T) {
	for _, c := range []struct {
		d    replay.Disagreement
		want string
	}{
		{replay.Disagreement{Figure: "tail angle in rad", Found: 0.0061234, Recorded: 0.0061239}, ": tail angle in rad is 0.006123 by replay and 0.006124 in the record"},
		{replay.Disagreement{Figure: "leakage", Found: 0.5, Recorded: 0.5}, ": leakage is 0.5 by replay and 0.5 in the record"},
		{replay.Disagreement{}, ""},
	} {
		if got := worst(c.d); got != c.want {
			t.Errorf("%q, want %q", got, c.want)
		}
	}
}

// Both outputs of a sheet.
func outputs(t *testing.T, s *Sheet) map[string]string {
	t.Helper()
	return map[string]string{"page": wellFormed(t, page(t, s)), "text": summary(t, s)}
}

func mustSay(t *testing.T, name, text string, wanted ...string) {
	t.Helper()
	for _, want := range wanted {
		if !strings.Contains(text, want) {
			t.Errorf("the %s does not say %q", name, want)
		}
	}
}

func mustNotSay(t *testing.T, name, text string, unwanted ...string) {
	t.Helper()
	for _, bad := range unwanted {
		if strings.Contains(text, bad) {
			t.Errorf("the %s says %q", name, bad)
		}
	}
}

// Without a limit on ring-out the rivals' ring-out is a value, or it is said that there is no limit; never a share of nothing.
func TestNoRingOutLimit(t *testing.T) {
	for _, found := range []float64{0.0062, 0, math.NaN()} {
		s := demoSheet()
		s.Channels[0].RingOutLimit = 0
		for i := range s.Rivals {
			s.Rivals[i].RingOut, s.Rivals[i].BreaksRingOut = found, false
		}
		p := outputs(t, s)["page"]
		mustSay(t, "page", p, "no limit stated", "The instrument states no limit.")
		mustNotSay(t, "page", p, ">0 %<", "not computed", "0 %, no limit", "over 0 %")
		if found > 0 {
			mustSay(t, "page", p, "0.62 %, no limit stated")
		}
	}
}

// Where the required infidelity is broken before any error comes, that is what stands in the place of a margin.
func TestAlreadyAbove(t *testing.T) {
	s := demoSheet()
	s.Required = 1e-9
	v := s.Verdict
	v.Requirements[0].Allowed, v.Requirements[0].Met = 1e-9, false
	v.Requirements[2].Found, v.Requirements[2].Met = 0, false
	for i := range v.Errors {
		v.Errors[i].Low, v.Errors[i].High = 0, 0
	}
	for name, text := range outputs(t, s) {
		mustSay(t, name, text, "already above 1e-9 without error", "margin against detuning: found already above 1e-9 without error",
			"Against X this pulse is already above 1e-9 without error, and a plain one withstands some: square")
		mustNotSay(t, name, text, "withstands nothing", "withstands already", "±0 MHz")
	}
	mustSay(t, "page", wellFormed(t, page(t, s)), "of any static error: already above 1e-9 without error")
}

// Detunings are on top of the device's own, and captions say so where it has one.
func TestDetunedDevice(t *testing.T) {
	mustNotSay(t, "page", outputs(t, demoSheet())["page"], "on top of the device")
	s := demoSheet()
	s.Detuning = -2.5
	p := outputs(t, s)["page"]
	if n := strings.Count(p, "on top of the device's own −2.5 MHz (MHz)"); n < 3 { // the curve, the bench's figure and its table
		t.Errorf("the page says %d times that detunings are on top of the device's", n)
	}
	mustSay(t, "page", p, "detuning on top of the device's own −2.5 MHz (MHz)")
}

// Guards are kept at zero or they are not: no share of nothing.
func TestGuards(t *testing.T) {
	s := demoSheet()
	p := outputs(t, s)["page"]
	mustSay(t, "page", p, "kept at zero")
	mustNotSay(t, "page", p, "0 of full scale")
	s = demoSheet()
	l := &s.Verdict.Limits[4]
	l.Found, l.OK = 0.01, false
	for name, text := range outputs(t, s) {
		mustSay(t, name, text, "guards: 0.01 of full scale where zero is asked")
		mustNotSay(t, name, text, "kept at zero", "where 0")
	}
}

// Times carry the unit that suits them, the same in every place.
func TestDurations(t *testing.T) {
	s := demoSheet()
	s.T1, s.T2, s.Span = 5e6, 2.5e3, 12500
	s.Rivals[0].Span = 1600
	for name, text := range outputs(t, s) {
		mustSay(t, name, text, "12.5 µs, held against")
	}
	mustSay(t, "page", outputs(t, s)["page"], "T1 5 ms and T2 2.5 µs", "1.6 µs", "24 ns")
}

// Several channels: each with its samples, arrivals, spectrum and figures, under its name.
func TestSeveralChannels(t *testing.T) {
	s := demoSheet()
	flux := s.Channels[0]
	flux.Name, flux.Baseband, flux.FullScale, flux.FullScaleLevel, flux.RingOutLimit = "q1 <flux>", true, 10, 1, 0
	flux.Samples = make([]complex128, len(flux.Samples))
	for k := range flux.Samples {
		flux.Samples[k] = complex(0.3*math.Sin(float64(k)/18), 0)
	}
	flux.Arrives = demoArrivals(flux.Samples)
	flux.LineFacts, flux.LineFigures = []string{"A single pole."}, []Row{{"overshoot", "0 %"}}
	s.Channels = append(s.Channels, flux)
	html := page(t, s)
	p := wellFormed(t, html)
	mustSay(t, "page", p, "Samples played of q1 drive", "Samples played of q1 <flux>", "What arrives at the device from q1 drive", "What arrives at the device from q1 <flux>",
		"Spectrum of the samples of q1 <flux>", "After the window from q1 <flux>", "turns of the device (MHz)", "frequency (MHz)", "output",
		"The line of q1 drive: Delay of 3.2 ns.", "The line of q1 <flux>: A single pole.", "Output of q1 drive", "Output of q1 <flux>", "Line of q1 <flux>",
		"0.5 V (q1 drive) and 1 V (q1 <flux>) at the connector", "10 MHz steady turns of the device")
	for _, heading := range []string{"<h3>q1 drive</h3>", "<h3>q1 &lt;flux&gt;</h3>"} {
		if strings.Count(html, heading) != 1 {
			t.Errorf("the heading %s stands %d times", heading, strings.Count(html, heading))
		}
	}
	if n := strings.Count(html, "<svg class=\"plot"); n != strings.Count(page(t, demoSheet()), "<svg class=\"plot")+6 { // played and arriving twice each, spectrum, after
		t.Errorf("%d drawings", n)
	}
	mustNotSay(t, "page", wellFormed(t, page(t, demoSheet())), "Samples played of", "Output of", "The line of")
	// a rival is judged by the limit of the channel that plays it
	s.Rivals[0].Channel, s.Rivals[0].BreaksRingOut = 1, false
	mustSay(t, "page", wellFormed(t, page(t, s)), "0.62 %, no limit stated", "0.41 %, over 0.1 %")
}

// Where the drive compresses, what is played is at the converter, without a scale of rates, and the spectrum is of what is left.
func TestCompression(t *testing.T) {
	s := demoSheet()
	c := &s.Channels[0]
	c.Reached = make([]complex128, len(c.Samples))
	for k, x := range c.Samples {
		c.Reached[k] = x * complex(1-0.2*math.Hypot(real(x), imag(x)), 0)
	}
	html := page(t, s)
	p := wellFormed(t, html)
	mustSay(t, "page", p, "At the converter: the drive's compression leaves at most "+percent(peak(c.Reached))+" of full scale", "Both are of what the drive's compression leaves.", "undone before the codes")
	if n, before := strings.Count(p, "Rabi frequency (MHz)"), strings.Count(wellFormed(t, page(t, demoSheet())), "Rabi frequency (MHz)"); n != before-3 { // wide, narrow, rivals
		t.Errorf("%d scales of rates, %d without compression", n, before)
	}
	got, want := *c, *c
	want.Samples, want.Reached = c.Reached, nil
	if a, b := NewSpectrum(got.entering(), 1, 0.1, c.Line), NewSpectrum(want.entering(), 1, 0.1, c.Line); a.Outside != b.Outside {
		t.Errorf("share outside the band %g, of what is reached %g", a.Outside, b.Outside)
	}
}

// The table of the rivals stands beside a drawing: what does not break must be short, or its last column is cut off on a page of usual width.
func TestRivalsFit(t *testing.T) {
	const most, mostBroken = 14, 9 // characters: of a cell that may not break, and of a word in one that may
	s := demoSheet()
	s.Rivals[0].Infidelity, s.Rivals[0].PairInfidelity = 3e-15, 1e-20
	s.Rivals[1].Span, s.Rivals[1].RingOut = 123456.7, 0.00219
	v := newView(s)
	for _, r := range v.Rivals {
		for _, cell := range []string{r.Span, r.Infidelity, r.Pair, r.Decoherence} {
			if n := len([]rune(cell)); n > most {
				t.Errorf("a cell of %d characters: %q", n, cell)
			}
		}
		for _, word := range strings.Fields(r.RingOut) {
			if n := len([]rune(word)); n > mostBroken && !strings.ContainsRune(word, noBreak) || n > most {
				t.Errorf("a word of %d characters: %q", n, word)
			}
		}
		if len(strings.Fields(strings.ReplaceAll(r.RingOut, string(noBreak), "_"))) > 3 {
			t.Errorf("many words: %q", r.RingOut)
		}
	}
}
