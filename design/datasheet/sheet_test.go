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
		"breaks the limit", "Population of |1⟩ against repeats", "Amplified radio-frequency power burns",
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
	v.Agreement = replay.Agreement{Infidelity: 1e-3}
	v.Inputs = []replay.Difference{{Key: "channel[0].delay_ns", Recorded: "3.2", Rebuilt: "3.4"}}
	for name, text := range map[string]string{"page": wellFormed(t, page(t, s)), "text": summary(t, s)} {
		for _, want := range []string{"does not meet its requirements", "margin against detuning: found ±0.4 MHz, required at least ±1 MHz",
			"slew: 0.26 of full scale per sample where 0.25", "interrupted", "replay does not agree", "1 of its numbers differ"} {
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
	s.Name, s.Target, s.Ends, s.Status, s.Instrument, s.Channel = evil, evil, evil, evil, evil, evil
	s.Held = []string{evil}
	for _, rows := range [][]Row{s.LineFigures, s.Basis, s.Search, s.Provenance, s.Files} {
		rows[0] = Row{evil, evil}
	}
	s.LineFacts, s.Cautions = []string{evil}, []string{evil}
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
		s.Span, s.SamplePeriod, s.FullScale, s.FullScaleLevel, s.Band = bad, bad, bad, bad, bad
		s.AmplitudeLimit, s.RingOutLimit, s.WindowStart, s.Required, s.T1, s.T2 = bad, bad, bad, bad, bad, bad
		spoil(s, bad)
		check(t, bad, s)

		s = demoSheet() // good scales, bad values
		spoil(s, bad)
		check(t, bad, s)
	}
}

func spoil(s *Sheet, bad float64) {
	s.Samples[7], s.Arrives[9].U, s.Arrives[30].Time = complex(bad, 0), complex(0, bad), bad
	s.CoefficientsI[0] = bad
	s.Line = func(float64) complex128 { return complex(bad, bad) }
	v := s.Verdict
	v.Settled = replay.Figures{Infidelity: bad, Leakage: bad}
	v.Window, v.TailAngle, v.Decoherence = v.Settled, bad, bad
	v.Pair = replay.Pair{Infidelity: bad, Phase: bad}
	v.Agreement = replay.Agreement{Infidelity: bad, Susceptibility: bad, TailAngle: bad}
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
	s.Samples = make([]complex128, 65536)
	s.Arrives = nil
	for k := range s.Samples {
		f := float64(k)
		s.Samples[k] = complex(0.9*math.Sin(f*f/1e5), 0.9*math.Cos(f))
		s.Arrives = append(s.Arrives, Arrival{f, s.Samples[k]})
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
