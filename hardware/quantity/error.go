package quantity

import (
	"fmt"
	"strconv"
	"strings"
	"unicode/utf8"
)

// Error is one complaint about one place in a file. Its text is one sentence,
//
//	rack-b.toml:12: channel[0].slew_limit: found "25 MHz"; allowed: a share per sample such as "25 %/sample"
//
// in which an empty File, a Line of 0 and an empty Key are left out.
type Error struct {
	File    string // as the caller named it
	Line    int    // from 1; 0 when the complaint is about the whole file
	Key     string // the full path of the key, such as channel[0].line.delay
	Found   string // what stands there, quoted as it should be printed; the whole sentence when Allowed is empty
	Allowed string // what may stand there
	Hint    string // a likely remedy; may be empty
}

// Error gives the sentence.
func (e *Error) Error() string {
	var b strings.Builder
	if e.File != "" {
		b.WriteString(e.File)
		if e.Line > 0 {
			fmt.Fprintf(&b, ":%d", e.Line)
		}
		b.WriteString(": ")
	}
	if e.Key != "" {
		b.WriteString(e.Key)
		b.WriteString(": ")
	}
	if e.Allowed == "" {
		b.WriteString(e.Found)
	} else {
		fmt.Fprintf(&b, "found %s; allowed: %s", e.Found, e.Allowed)
	}
	if e.Hint != "" {
		fmt.Fprintf(&b, " (%s)", e.Hint)
	}
	return b.String()
}

// foundLength is the longest piece of a user's text, in bytes, that a message repeats.
const foundLength = 60

// quote gives s in quotes with everything unprintable escaped, cut to foundLength.
func quote(s string) string {
	if len(s) > foundLength {
		cut := foundLength
		for cut > 0 && !utf8.RuneStart(s[cut]) {
			cut--
		}
		return strconv.Quote(s[:cut]) + "..."
	}
	return strconv.Quote(s)
}

// describe says what kind of TOML value v is, in the words of a message.
func describe(v any) string {
	switch v := v.(type) {
	case string:
		return quote(v)
	case int64:
		return strconv.FormatInt(v, 10)
	case float64:
		return number(v)
	case bool:
		return strconv.FormatBool(v)
	case []any:
		return fmt.Sprintf("an array of %d", len(v))
	case map[string]any:
		return "a table"
	case []map[string]any:
		return "an array of tables"
	}
	return "a date or time"
}

// number prints a bare number in the shortest form that reads back to it.
func number(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }
