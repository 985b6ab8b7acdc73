package quantity

import (
	"math"
	"strconv"
	"strings"
)

// Kind says what a quantity measures, and with that its base unit and the units that may be written.
type Kind int

// The kinds of quantity. The unit in brackets is the base unit of Parse, Format and Table.Quantity.
const (
	Time       Kind = iota // [ns]
	Frequency              // [GHz], cyclic: multiply by 2 pi for rad/ns
	SampleRate             // [GS/s]
	Ratio                  // [1], written "%" or "ppm"
	PerSample              // [1/sample], written "%/sample"
	Voltage                // [V]
	Bits                   // [bit], whole numbers only
	Angle                  // [rad], written "deg" or "rad"
)

// unit is one way of writing a kind: the base unit times 10^exponent, or, for an angle in degrees, times pi/180.
type unit struct {
	symbol   string
	exponent int
	degrees  bool
	hidden   bool // accepted, but Format prefers another spelling
}

// traits of a kind: its units from small to large, the one that writes zero, and the words of messages.
type traits struct {
	noun, name string // `a time such as "112 ns"`, "time"
	units      []unit
	zero       string
}

// traits gives the table entry of k. Digits are shifted in decimal (see Parse), so each unit is a power of ten.
func (k Kind) traits() traits {
	switch k {
	case Time:
		return traits{`a time such as "112 ns"`, "time", []unit{{symbol: "ps", exponent: -3}, {symbol: "ns"}, {symbol: "us", exponent: 3},
			{symbol: "µs", exponent: 3, hidden: true}, {symbol: "μs", exponent: 3, hidden: true}, // micro sign, Greek mu
			{symbol: "ms", exponent: 6}, {symbol: "s", exponent: 9}}, "ns"}
	case Frequency:
		return traits{`a frequency such as "40 MHz"`, "frequency", []unit{{symbol: "Hz", exponent: -9}, {symbol: "kHz", exponent: -6},
			{symbol: "MHz", exponent: -3}, {symbol: "GHz"}}, "Hz"}
	case SampleRate:
		return traits{`a sample rate such as "1 GS/s"`, "sample rate", []unit{{symbol: "S/s", exponent: -9}, {symbol: "kS/s", exponent: -6},
			{symbol: "MS/s", exponent: -3}, {symbol: "GS/s"}}, "S/s"}
	case Ratio:
		return traits{`a share such as "1.5 %"`, "share", []unit{{symbol: "ppm", exponent: -6}, {symbol: "%", exponent: -2}}, "%"}
	case PerSample:
		return traits{`a share per sample such as "25 %/sample"`, "share per sample", []unit{{symbol: "%/sample", exponent: -2}}, "%/sample"}
	case Voltage:
		return traits{`a voltage such as "0.5 V"`, "voltage", []unit{{symbol: "uV", exponent: -6}, {symbol: "µV", exponent: -6, hidden: true},
			{symbol: "μV", exponent: -6, hidden: true}, {symbol: "mV", exponent: -3}, {symbol: "V"}}, "V"}
	case Bits:
		return traits{`a resolution such as "14 bit"`, "resolution", []unit{{symbol: "bit"}}, "bit"}
	default:
		return traits{`an angle such as "90 deg"`, "angle", []unit{{symbol: "rad", hidden: true}, {symbol: "deg", degrees: true}}, "deg"}
	}
}

// kinds lists every kind, for the hint that a unit belongs to another one.
func kinds() []Kind {
	return []Kind{Time, Frequency, SampleRate, Ratio, PerSample, Voltage, Bits, Angle}
}

// textLength is the longest quantity, in bytes, that Parse looks at.
const textLength = 64

// Parse reads a decimal number, spaces, and one of the units of k, and gives the value in the base unit of k. It refuses
// bare numbers, nan, inf, unknown units and anything left over, with an *Error that has neither file nor key.
//
// The digits are shifted in decimal before they become binary, so "40 MHz" is the float64 nearest to 0.04 and not
// 40 times the one nearest to 0.001. Degrees alone are multiplied (by pi/180).
func Parse(s string, k Kind) (float64, error) {
	v, hint := parse(s, k)
	if hint != "" {
		return 0, &Error{Found: quote(s), Allowed: k.traits().noun, Hint: hint}
	}
	return v, nil
}

// parse is Parse with the reason for refusing as text, empty when s is in order.
func parse(s string, k Kind) (v float64, hint string) {
	if len(s) > textLength {
		return 0, "longer than " + strconv.Itoa(textLength) + " characters"
	}
	trimmed := strings.Trim(s, " ")
	if trimmed == "" {
		return 0, "the text is empty"
	}
	if strings.HasPrefix(trimmed, "−") { // the typographer's minus sign, U+2212
		return 0, "write the minus sign as the hyphen -"
	}
	switch word := strings.ToLower(strings.TrimLeft(trimmed, "+-")); {
	case strings.HasPrefix(word, "inf"), strings.HasPrefix(word, "nan"):
		return 0, "not a finite number"
	}
	mantissa, exponent, rest := splitNumber(trimmed)
	if mantissa == "" {
		return 0, "no number at the start"
	}
	if strings.HasPrefix(rest, ",") {
		return 0, "write decimals with a point, not with a comma"
	}
	symbol := strings.TrimLeft(rest, " ")
	if symbol == "" {
		return 0, "the unit is missing"
	}
	for _, u := range k.traits().units {
		if u.symbol != symbol {
			continue
		}
		// ParseFloat rounds once, correctly; it reports an error only for overflow here, as mantissa is digits.
		v, err := strconv.ParseFloat(mantissa+"e"+strconv.Itoa(exponent+u.exponent), 64)
		if err != nil || math.IsInf(v, 0) {
			return 0, "too large a number"
		}
		if u.degrees {
			v = v * math.Pi / 180
			if math.IsInf(v, 0) {
				return 0, "too large a number"
			}
		}
		if k == Bits && v != math.Trunc(v) {
			return 0, "a whole number is needed"
		}
		return v, ""
	}
	return 0, unitHint(symbol, k)
}

// splitNumber takes the decimal number off the front of s: [+-] digits [. digits] [e [+-] digits], or the same with
// digits on only one side of the point. It gives the mantissa with its sign, the exponent, and what follows. The
// mantissa is empty when s starts with no number.
func splitNumber(s string) (mantissa string, exponent int, rest string) {
	i, digits := 0, 0
	if i < len(s) && (s[i] == '+' || s[i] == '-') {
		i++
	}
	for ; i < len(s) && isDigit(s[i]); i++ {
		digits++
	}
	if i < len(s) && s[i] == '.' {
		for i++; i < len(s) && isDigit(s[i]); i++ {
			digits++
		}
	}
	if digits == 0 {
		return "", 0, s
	}
	mantissa, rest = s[:i], s[i:]
	if len(rest) > 1 && (rest[0] == 'e' || rest[0] == 'E') {
		j := 1
		if rest[j] == '+' || rest[j] == '-' {
			j++
		}
		first := j
		for j < len(rest) && isDigit(rest[j]) {
			j++
		}
		if j > first {
			exponent, _ = strconv.Atoi(rest[1:j]) // out of range: Atoi clamps, and the bound below does the rest
			exponent = max(-100_000, min(100_000, exponent))
			rest = rest[j:]
		}
	}
	return mantissa, exponent, rest
}

func isDigit(c byte) bool { return c >= '0' && c <= '9' }

// unitHint says why symbol is no unit of k: it is one of another kind, or it is spelt otherwise.
func unitHint(symbol string, k Kind) string {
	for _, other := range kinds() {
		if other == k {
			continue
		}
		for _, u := range other.traits().units {
			if u.symbol == symbol {
				return quote(symbol) + " is a unit of " + other.traits().name
			}
		}
	}
	for _, u := range k.traits().units {
		if strings.EqualFold(u.symbol, symbol) {
			return "units are case-sensitive: write " + u.symbol
		}
	}
	if meant := synonym(symbol); meant != "" {
		for _, u := range k.traits().units {
			if u.symbol == meant {
				return "write " + meant
			}
		}
	}
	var list []string
	for _, u := range k.traits().units {
		if !strings.HasPrefix(u.symbol, "μ") { // looks like the µ beside it
			list = append(list, u.symbol)
		}
	}
	return quote(symbol) + " is not one of " + strings.Join(list, ", ")
}

// synonym gives this package's spelling of a unit that is often written in another way, or nothing.
func synonym(symbol string) string {
	switch strings.ToLower(symbol) {
	case "bits", "b":
		return "bit"
	case "percent", "pct":
		return "%"
	case "%/sa", "%/s", "%/samples", "% / sample", "percent/sample":
		return "%/sample"
	case "°", "degree", "degrees":
		return "deg"
	case "radian", "radians":
		return "rad"
	case "sps", "sa/s":
		return "S/s"
	case "ksps", "ksa/s":
		return "kS/s"
	case "msps", "msa/s":
		return "MS/s"
	case "gsps", "gsa/s":
		return "GS/s"
	case "nsec":
		return "ns"
	case "usec":
		return "us"
	case "sec", "second", "seconds":
		return "s"
	}
	return ""
}

// Format writes v, in the base unit of k, for people: a scale that puts one to three digits before the point where there
// is one, and up to 6 significant digits. Parse reads the result back, unless v is not finite ("infinite", "not a number").
func Format(v float64, k Kind) string {
	t := k.traits()
	switch {
	case math.IsNaN(v):
		return "not a number"
	case math.IsInf(v, 1):
		return "infinite"
	case math.IsInf(v, -1):
		return "minus infinite"
	case v == 0:
		return "0 " + t.zero
	}
	v = max(-1e300, min(1e300, v)) // so that no scale overflows
	var text, symbol string
	for _, u := range t.units {
		if u.hidden {
			continue
		}
		scaled := v
		if u.degrees {
			scaled = v / math.Pi * 180
		} else if u.exponent > 0 {
			scaled = v / math.Pow10(u.exponent)
		} else {
			scaled = v * math.Pow10(-u.exponent)
		}
		digits := strconv.FormatFloat(scaled, 'g', 6, 64)
		// The first unit always serves; a larger one takes over while the rounded figure is at least 1 in it. A share
		// is in per cent from 0.01 % up: parts per million are for less than that.
		least := 1.0
		if k == Ratio {
			least = 0.01
		}
		if rounded, err := strconv.ParseFloat(digits, 64); text == "" || err == nil && math.Abs(rounded) >= least {
			text, symbol = digits, u.symbol
		}
	}
	return text + " " + symbol
}
