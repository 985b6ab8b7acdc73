package datasheet

import (
	"math"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"holdfast/design/replay"
	"holdfast/hardware/quantity"
)

// notComputed stands where a figure is not a number.
const notComputed = "not computed"

// tiny is the size under which a figure says more about the model than about
// the device.
const tiny = 1e-9

// figure prints an infidelity, a susceptibility, a leakage or an angle: three
// digits, and no smaller than tiny.
func figure(v float64) string {
	switch {
	case !finite(v):
		return notComputed
	case math.Abs(v) < tiny:
		return "< 1e-9 in this model"
	}
	return digits(v, 3)
}

// digits prints v with n significant digits, trailing zeros cut, as a decimal
// between 1e-3 and 1e6 and with a short exponent elsewhere ("2.7e-9").
func digits(v float64, n int) string {
	if !finite(v) {
		return notComputed
	}
	if v == 0 {
		return "0"
	}
	s := strconv.FormatFloat(v, 'e', n-1, 64)
	mantissa, exponent, _ := strings.Cut(s, "e")
	e, err := strconv.Atoi(exponent)
	if err != nil { // FormatFloat always writes an exponent here
		return s
	}
	if e >= -3 && e < 6 {
		// Through the rounded digits, so that 0.99996 prints as 1, not 1.000.
		r, _ := strconv.ParseFloat(s, 64)
		return trimZeros(strconv.FormatFloat(r, 'f', max(0, n-1-e), 64))
	}
	return trimZeros(mantissa) + "e" + strconv.Itoa(e)
}

func trimZeros(s string) string {
	if !strings.Contains(s, ".") {
		return s
	}
	return strings.TrimSuffix(strings.TrimRight(s, "0"), ".")
}

// signed prints v with three digits and its sign.
func signed(v float64) string {
	if v > 0 {
		return "+" + digits(v, 3)
	}
	return digits(v, 3)
}

// short is figure for columns that are narrow.
func short(v float64) string {
	if finite(v) && math.Abs(v) < tiny {
		return "< 1e-9"
	}
	return figure(v)
}

// duration prints a time in ns with the unit that suits it.
func duration(ns float64) string {
	if !finite(ns) {
		return notComputed
	}
	return strings.Replace(quantity.Format(ns, quantity.Time), " us", " µs", 1)
}

// percent prints a share as a percentage.
func percent(share float64) string {
	if !finite(share) {
		return notComputed
	}
	return digits(100*share, 3) + " %"
}

// withUnit appends a unit where there is one.
func withUnit(value, unit string) string {
	if unit == "" {
		return value
	}
	return value + " " + unit
}

// broken reports whether a pulse breaks the required infidelity without any error.
func broken(e replay.Error) bool { return e.Low == 0 && e.High == 0 }

// already says so.
func (s *Sheet) already() string {
	if r := s.required(); r > 0 {
		return "already above " + digits(r, 3) + " without error"
	}
	return "already above what is required without error"
}

// withstandsText says in a phrase what a pulse withstands of an error.
func (s *Sheet) withstandsText(e replay.Error) string {
	if broken(e) {
		return s.already()
	}
	return "withstands " + s.margin(e)
}

// margin prints the range of error sizes that a pulse withstands. Where one
// side holds to the end of the searched range the end of its curve is named.
func (s *Sheet) margin(e replay.Error) string {
	unit := clean(e.Unit)
	switch {
	case math.IsNaN(e.Low) || math.IsNaN(e.High):
		return notComputed
	case broken(e):
		return s.already()
	case math.IsInf(e.Low, -1) && math.IsInf(e.High, 1):
		switch lo, hi, ok := curveRange(e.Curve); {
		case ok && lo == -hi:
			return withUnit("more than ±"+digits(hi, 3), unit)
		case ok && lo == 0: // sizes without a sign
			return withUnit("more than "+digits(hi, 3), unit)
		}
		return "all that was tried"
	}
	side := func(v float64) string {
		if !math.IsInf(v, 0) {
			return signed(v)
		}
		lo, hi, ok := curveRange(e.Curve)
		switch {
		case ok && v < 0:
			return "beyond " + signed(lo)
		case ok:
			return "beyond " + signed(hi)
		}
		return "all that was tried"
	}
	low, high := side(e.Low), side(e.High)
	if strings.TrimPrefix(low, "-") == strings.TrimPrefix(high, "+") {
		return withUnit("±"+strings.TrimPrefix(high, "+"), unit)
	}
	return withUnit(low+" to "+high, unit)
}

// withstands returns the size of error that a pulse withstands whatever its
// sign, in the error's unit: the smaller of its two margins.
func withstands(e replay.Error) float64 { return math.Min(-e.Low, e.High) }

func curveRange(c []replay.Point) (lo, hi float64, ok bool) {
	lo, hi = math.Inf(1), math.Inf(-1)
	for _, p := range c {
		if finite(p.Value) {
			lo, hi = math.Min(lo, p.Value), math.Max(hi, p.Value)
		}
	}
	return lo, hi, lo < hi
}

// longest text that the page takes over from the sheet, in runes.
const longestText = 600

// clean makes text fit for a page: valid UTF-8 without control or direction
// characters, of bounded length.
func clean(s string) string {
	var b strings.Builder
	n := 0
	for _, r := range s {
		if n++; n > longestText {
			b.WriteString("…")
			break
		}
		switch {
		case r == '\n' || r == '\t' || r == '\r':
			b.WriteByte(' ')
		case r == unicode.ReplacementChar || !unicode.IsPrint(r) && r != ' ':
			b.WriteRune(unicode.ReplacementChar)
		default:
			b.WriteRune(r)
		}
	}
	return b.String()
}

// noBreak is the space between a number and its unit, for the page.
const noBreak = '\u00a0'

// typographic turns the hyphens that stand for minus signs into true ones and
// keeps units on the line of their numbers, for the page. Exponents keep their
// hyphen: "2.7e-9" can be copied into any program.
func typographic(s string) string {
	var b strings.Builder
	runes := []rune(s)
	at := func(i int) rune {
		if i < 0 || i >= len(runes) {
			return ' '
		}
		return runes[i]
	}
	digit := func(r rune) bool { return '0' <= r && r <= '9' }
	for i, r := range runes {
		switch {
		case r == '-' && at(i-1) == ' ' && (digit(at(i+1)) || at(i+1) == ' ' && i > 0):
			r = '−'
		case r == ' ' && digit(at(i-1)) && startsUnit(string(runes[i+1:min(len(runes), i+5)])):
			r = noBreak
		}
		b.WriteRune(r)
	}
	return b.String()
}

// startsUnit reports whether s begins with a unit that the page uses.
func startsUnit(s string) bool {
	for _, u := range [...]string{"%", "Hz", "kHz", "MHz", "GHz", "ps", "ns", "µs", "ms", "s", "mV", "V", "rad", "deg", "dB"} {
		if rest, ok := strings.CutPrefix(s, u); ok {
			r, _ := utf8.DecodeRuneInString(rest)
			return !unicode.IsLetter(r) || r == utf8.RuneError
		}
	}
	return false
}

// list joins words as a sentence does.
func list(words []string) string {
	switch n := len(words); n {
	case 0:
		return ""
	case 1:
		return words[0]
	default:
		return strings.Join(words[:n-1], ", ") + " and " + words[n-1]
	}
}
