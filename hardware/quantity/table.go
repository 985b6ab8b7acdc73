package quantity

import (
	"fmt"
	"math"
	"slices"
	"strings"
	"unicode"
)

// Table is a cursor into a Document: one table of it, or the empty one that stands for a table that is missing or is no table.
// Each accessor takes a key of the table. When the key is absent it gives the default, if the call has one, and otherwise
// records that the key is missing; when the value is not what is allowed it records that. After a mistake it gives the default
// or, without one, a value that does no harm: the lower limit, the first choice, the empty text, nil.
type Table struct {
	doc    *Document
	values map[string]any
	node   *node  // of an empty table the nearest one above it that is there
	empty  bool   // there is no such table
	broken bool   // there is none because its value is something else: its keys are not missed
	path   string // "" for the root
	line   int
}

// note records a mistake at a key, or at the table when key is empty.
func (t *Table) note(key string, o origin, e *Error) {
	e.File, e.Line, e.Key = t.doc.file, t.line, t.path
	m := mistake{err: e, table: t.node, order: t.node.order, origin: o}
	if key != "" {
		e.Key, e.Line = join(t.path, key), t.Line(key)
		if n := t.kid(key); n != nil {
			m.order = n.order
		}
	}
	t.doc.mistakes = append(t.doc.mistakes, m)
}

// kid gives the node of a key, or nil.
func (t *Table) kid(key string) *node {
	if t.empty {
		return nil
	}
	return t.node.kids[key]
}

// wrong records that the value v of a key is not what is allowed.
func (t *Table) wrong(key string, v any, allowed, hint string) {
	t.note(key, byValue, &Error{Found: describe(v), Allowed: allowed, Hint: hint})
}

// look gives the value of a key and counts the key as known. Without a default its absence is a mistake.
func (t *Table) look(key, allowed string, optional bool) (any, bool) {
	v, ok := t.values[key]
	if !t.empty && !t.node.hasAsked(key) {
		t.node.asked = append(t.node.asked, key)
	}
	if !ok && !optional && !t.broken {
		t.note(key, byAbsence, &Error{Found: "nothing", Allowed: allowed})
	}
	return v, ok
}

// Has reports whether the table has the key. It counts the key as known; a loader that asks must read it or Fail.
func (t *Table) Has(key string) bool {
	_, ok := t.look(key, "", true)
	return ok
}

// Line gives the line of a key, or of the table where the key is absent: for complaints that can only be made later.
func (t *Table) Line(key string) int {
	if n := t.kid(key); n != nil {
		return n.line
	}
	return t.line
}

// Fail records a loader's own complaint about a key, present or not, with the file and the line; about the table itself when
// key is empty. The text should say what was found and what is allowed. Document.Err prefers the mistakes that accessors met.
func (t *Table) Fail(key, format string, args ...any) {
	t.note(key, byLoader, &Error{Found: oneLine(fmt.Sprintf(format, args...))})
}

// Table gives the table under a key, [key] or key = { ... }. When there is none it gives an empty table, whose required keys
// report that they are missing.
func (t *Table) Table(key string) *Table {
	v, ok := t.look(key, "", true)
	if m, isTable := v.(map[string]any); isTable {
		return t.below(m, t.kid(key), join(t.path, key))
	}
	if ok {
		t.wrong(key, v, "a table, ["+join(t.path, key)+"] or "+key+" = { ... }", "")
	}
	return &Table{doc: t.doc, node: t.node, empty: true, broken: ok || t.broken, path: join(t.path, key), line: t.line}
}

// below makes the cursor for a table that is there.
func (t *Table) below(values map[string]any, n *node, path string) *Table {
	n.visited = true
	return &Table{doc: t.doc, values: values, node: n, path: path, line: n.line}
}

// Tables gives the tables under a key, [[key]] or key = [{ ... }, { ... }]; a single table, [key] or key = { ... }, is a list of
// one. Absent it gives none, and more than most are a mistake.
func (t *Table) Tables(key string, most int) []*Table {
	v, ok := t.look(key, "", true)
	if !ok {
		return nil
	}
	var list []map[string]any
	switch v := v.(type) {
	case map[string]any:
		return []*Table{t.Table(key)}
	case []map[string]any:
		list = v
	case []any:
		for _, e := range v {
			m, isTable := e.(map[string]any)
			if !isTable {
				t.wrong(key, e, "only tables in this array", "")
				return nil
			}
			list = append(list, m)
		}
	default:
		t.wrong(key, v, "a list of tables, each [["+join(t.path, key)+"]]", "")
		return nil
	}
	if len(list) > most {
		t.note(key, byValue, &Error{Found: fmt.Sprintf("%d tables", len(list)), Allowed: fmt.Sprintf("at most %d", most)})
		return nil
	}
	tables := make([]*Table, len(list))
	array := t.kid(key)
	for i, m := range list {
		tables[i] = t.below(m, array.elems[i], fmt.Sprintf("%s[%d]", join(t.path, key), i))
	}
	return tables
}

// otherwise gives the default of a call, or the value that does no harm.
func otherwise[T any](def []T, harmless T) T {
	if len(def) > 0 {
		return def[0]
	}
	return harmless
}

// textBytes is the longest text that Text allows.
const textBytes = 256

// textFault says why s is no text that a message or a page may show, with what is allowed; empty when it is.
func textFault(s string) string {
	switch {
	case s == "":
		return "at least one character"
	case len(s) > textBytes:
		return fmt.Sprintf("at most %d bytes", textBytes)
	case strings.ContainsFunc(s, func(r rune) bool { return !unicode.IsPrint(r) }):
		return "printable characters only, on one line"
	}
	return ""
}

// Text gives a text of 1 to 256 bytes, all printable.
func (t *Table) Text(key string, def ...string) string {
	v, ok := t.look(key, "a text in quotes", len(def) > 0)
	if !ok {
		return otherwise(def, "")
	}
	s, isText := v.(string)
	if !isText {
		t.wrong(key, v, "a text in quotes", "")
		return otherwise(def, "")
	}
	if fault := textFault(s); fault != "" {
		t.wrong(key, v, fault, "")
		return otherwise(def, "")
	}
	return s
}

// Texts gives an array of at most most texts, each as Text allows.
func (t *Table) Texts(key string, most int) []string {
	list := t.array(key, most, "texts in quotes")
	if list == nil {
		return nil
	}
	texts := make([]string, 0, len(list))
	for i, v := range list {
		s, isText := v.(string)
		fault := "a text in quotes"
		if isText {
			fault = textFault(s)
		}
		if fault != "" {
			t.element(key, i, v, fault)
			return nil
		}
		texts = append(texts, s)
	}
	return texts
}

// Choice gives one of the allowed texts.
func (t *Table) Choice(key string, allowed []string, def ...string) string {
	list := make([]string, len(allowed))
	for i, a := range allowed {
		list[i] = quote(a)
	}
	say := strings.Join(list, ", ")
	if len(list) > 1 {
		say = strings.Join(list[:len(list)-1], ", ") + " or " + list[len(list)-1]
	}
	v, ok := t.look(key, say, len(def) > 0)
	if !ok {
		return otherwise(def, allowed[0])
	}
	s, _ := v.(string)
	if slices.Contains(allowed, s) {
		return s
	}
	hint := ""
	for _, a := range allowed {
		if s != "" && (strings.EqualFold(a, s) || distance(a, s) <= 2 && len(a) > 4) {
			hint = "did you mean " + quote(a) + "?"
			break
		}
	}
	t.wrong(key, v, say, hint)
	return otherwise(def, allowed[0])
}

// Int gives a whole number from lo to hi.
func (t *Table) Int(key string, lo, hi int, def ...int) int {
	allowed := fmt.Sprintf("a whole number, %d to %d", lo, hi)
	if lo == hi {
		allowed = fmt.Sprintf("%d, and nothing else", lo)
	}
	v, ok := t.look(key, allowed, len(def) > 0)
	if !ok {
		return otherwise(def, lo)
	}
	n, isInt := v.(int64)
	switch {
	case !isInt:
		hint := ""
		if f, isFloat := v.(float64); isFloat && f == math.Trunc(f) && math.Abs(f) < 1e15 {
			hint = fmt.Sprintf("write %d, without a point", int64(f))
		} else if _, isText := v.(string); isText {
			hint = "write it without quotes"
		}
		t.wrong(key, v, allowed, hint)
	case n < int64(lo) || n > int64(hi):
		t.wrong(key, v, allowed, "")
	default:
		return int(n)
	}
	return otherwise(def, lo)
}

// span says the range from lo to hi in words, with each end as text; an infinite end is open.
func span(lo, hi float64, text func(float64) string) string {
	switch {
	case math.IsInf(lo, -1) && math.IsInf(hi, 1):
		return ""
	case math.IsInf(lo, -1):
		return ", at most " + text(hi)
	case math.IsInf(hi, 1):
		return ", at least " + text(lo)
	}
	return ", " + text(lo) + " to " + text(hi)
}

// least gives a value of the range that does no harm.
func least(lo float64) float64 {
	if math.IsInf(lo, 0) {
		return 0
	}
	return lo
}

// finite gives a bare TOML number, whole or not, unless it is nan or inf.
func finite(v any) (float64, bool) {
	switch v := v.(type) {
	case int64:
		return float64(v), true
	case float64:
		return v, !math.IsNaN(v) && !math.IsInf(v, 0)
	}
	return 0, false
}

// Number gives a bare number from lo to hi inclusive, for a figure that has no unit.
func (t *Table) Number(key string, lo, hi float64, def ...float64) float64 {
	allowed := "a number" + span(lo, hi, number)
	v, ok := t.look(key, allowed, len(def) > 0)
	if !ok {
		return otherwise(def, least(lo))
	}
	f, isNumber := finite(v)
	if !isNumber || !(f >= lo && f <= hi) {
		hint := ""
		if _, isText := v.(string); isText {
			hint = "this figure has no unit: write it without quotes"
		}
		t.wrong(key, v, allowed, hint)
		return otherwise(def, least(lo))
	}
	return f
}

// Quantity gives a quantity of kind k from lo to hi inclusive, all in the base unit of k. The message prints the range with units.
func (t *Table) Quantity(key string, k Kind, lo, hi float64, def ...float64) float64 {
	allowed := k.traits().noun + span(lo, hi, func(v float64) string { return Format(v, k) })
	v, ok := t.look(key, allowed, len(def) > 0)
	if !ok {
		return otherwise(def, least(lo))
	}
	s, isText := v.(string)
	if !isText {
		hint := ""
		if _, isNumber := finite(v); isNumber {
			hint = "a bare number has no unit: write a quantity in quotes"
		}
		t.wrong(key, v, allowed, hint)
		return otherwise(def, least(lo))
	}
	q, hint := parse(s, k)
	if hint != "" || !(q >= lo && q <= hi) {
		t.wrong(key, v, allowed, hint)
		return otherwise(def, least(lo))
	}
	return q
}

// Bool gives true or false.
func (t *Table) Bool(key string, def ...bool) bool {
	v, ok := t.look(key, "true or false", len(def) > 0)
	if !ok {
		return otherwise(def, false)
	}
	b, isBool := v.(bool)
	if !isBool {
		hint := ""
		if s, isText := v.(string); isText && (strings.EqualFold(s, "true") || strings.EqualFold(s, "false")) {
			hint = "write it without quotes"
		}
		t.wrong(key, v, "true or false", hint)
		return otherwise(def, false)
	}
	return b
}

// array gives the elements of a required array of at most most elements, nil after a mistake; words name them in messages.
func (t *Table) array(key string, most int, words string) []any {
	allowed := fmt.Sprintf("an array of at most %d %s", most, words)
	v, ok := t.look(key, allowed, false)
	if !ok {
		return nil
	}
	list, isArray := v.([]any)
	if !isArray || len(list) > most {
		t.wrong(key, v, allowed, "")
		return nil
	}
	return list
}

// element records that element i of an array is not what is allowed.
func (t *Table) element(key string, i int, v any, allowed string) {
	t.note(key, byValue, &Error{Found: fmt.Sprintf("%s as element %d", describe(v), i), Allowed: allowed})
	if e := t.kid(key).elems[i]; e != nil {
		t.doc.mistakes[len(t.doc.mistakes)-1].err.Line = e.line
	}
}

// Numbers gives an array of at most most bare numbers, each from lo to hi inclusive. The key is required; the array may be empty.
func (t *Table) Numbers(key string, most int, lo, hi float64) []float64 {
	list := t.array(key, most, "numbers")
	if list == nil {
		return nil
	}
	numbers := make([]float64, 0, len(list))
	for i, v := range list {
		f, isNumber := finite(v)
		if !isNumber || !(f >= lo && f <= hi) {
			t.element(key, i, v, "numbers"+span(lo, hi, number))
			return nil
		}
		numbers = append(numbers, f)
	}
	return numbers
}

// entryLimit bounds the real and the imaginary part of complex numbers in arrays and matrices, so that no product of a few of them
// overflows. It leaves room for the residues of powers of fast poles.
const entryLimit = 1e30

// complexWords says what complexNumber takes.
const complexWords = "a number or [re, im], each part from -1e+30 to 1e+30"

// complexNumber gives a number or a pair [re, im].
func complexNumber(v any) (complex128, bool) {
	inRange := func(v any) (float64, bool) {
		f, ok := finite(v)
		return f, ok && math.Abs(f) <= entryLimit
	}
	if pair, isArray := v.([]any); isArray {
		if len(pair) != 2 {
			return 0, false
		}
		re, ok := inRange(pair[0])
		im, also := inRange(pair[1])
		return complex(re, im), ok && also
	}
	re, ok := inRange(v)
	return complex(re, 0), ok
}

// Quantities gives an array of at most most quantities of kind k, each from lo to hi inclusive in the base unit of k. The key is
// required; the array may be empty.
func (t *Table) Quantities(key string, most int, k Kind, lo, hi float64) []float64 {
	list := t.array(key, most, "texts, each "+k.traits().noun)
	if list == nil {
		return nil
	}
	values := make([]float64, 0, len(list))
	for i, v := range list {
		q, allowed := inRange(v, k, lo, hi)
		if allowed != "" {
			t.element(key, i, v, allowed)
			return nil
		}
		values = append(values, q)
	}
	return values
}

// Pairs gives an array of at most most pairs of quantities of kind k, [["a", "b"], ...], each from lo to hi inclusive in the base unit of
// k. The key is required; the array may be empty.
func (t *Table) Pairs(key string, most int, k Kind, lo, hi float64) [][2]float64 {
	list := t.array(key, most, "pairs of texts, each "+k.traits().noun)
	if list == nil {
		return nil
	}
	pairs := make([][2]float64, 0, len(list))
	for i, v := range list {
		pair, isArray := v.([]any)
		if !isArray || len(pair) != 2 {
			t.element(key, i, v, "pairs of texts, each "+k.traits().noun)
			return nil
		}
		var values [2]float64
		for j, v := range pair {
			q, allowed := inRange(v, k, lo, hi)
			if allowed != "" {
				t.note(key, byValue, &Error{Found: fmt.Sprintf("%s in pair %d", describe(v), i), Allowed: allowed})
				return nil
			}
			values[j] = q
		}
		pairs = append(pairs, values)
	}
	return pairs
}

// inRange reads an element that is a quantity; allowed says what it should have been, and is empty when it is in order.
func inRange(v any, k Kind, lo, hi float64) (q float64, allowed string) {
	allowed = k.traits().noun + span(lo, hi, func(v float64) string { return Format(v, k) })
	s, isText := v.(string)
	if !isText {
		return 0, allowed
	}
	q, hint := parse(s, k)
	if hint != "" {
		return 0, allowed + " (" + hint + ")"
	}
	if !(q >= lo && q <= hi) {
		return 0, allowed
	}
	return q, ""
}

// Complexes gives an array of at most most complex numbers, each a number or [re, im]. The key is required; the array may be empty.
func (t *Table) Complexes(key string, most int) []complex128 {
	list := t.array(key, most, "complex numbers")
	if list == nil {
		return nil
	}
	numbers := make([]complex128, 0, len(list))
	for i, v := range list {
		c, ok := complexNumber(v)
		if !ok {
			t.element(key, i, v, complexWords)
			return nil
		}
		numbers = append(numbers, c)
	}
	return numbers
}

// Matrix gives a square matrix of 1 to most rows; an entry is a number or [re, im].
func (t *Table) Matrix(key string, most int) [][]complex128 {
	allowed := fmt.Sprintf("a square matrix of at most %d rows", most)
	v, ok := t.look(key, allowed, false)
	if !ok {
		return nil
	}
	m, fault := matrix(v, most)
	if fault != "" {
		t.note(key, byValue, &Error{Found: fault, Allowed: allowed + ", each entry " + complexWords})
		return nil
	}
	return m
}

// Matrices gives an array of at most count square matrices, each as Matrix allows. The key is required; the array may be empty.
func (t *Table) Matrices(key string, count, most int) [][][]complex128 {
	list := t.array(key, count, "square matrices")
	if list == nil {
		return nil
	}
	matrices := make([][][]complex128, 0, len(list))
	for i, v := range list {
		m, fault := matrix(v, most)
		if fault != "" {
			t.note(key, byValue, &Error{Found: fmt.Sprintf("%s in matrix %d", fault, i),
				Allowed: fmt.Sprintf("square matrices of at most %d rows, each entry %s", most, complexWords)})
			return nil
		}
		matrices = append(matrices, m)
	}
	return matrices
}

// matrix reads a square matrix, or says what is wrong with it.
func matrix(v any, most int) (m [][]complex128, fault string) {
	rows, isArray := v.([]any)
	if !isArray {
		return nil, describe(v)
	}
	if len(rows) == 0 || len(rows) > most {
		return nil, fmt.Sprintf("%d rows", len(rows))
	}
	m = make([][]complex128, len(rows))
	for i, row := range rows {
		entries, isArray := row.([]any)
		if !isArray {
			return nil, fmt.Sprintf("%s as row %d", describe(row), i)
		}
		if len(entries) != len(rows) {
			return nil, fmt.Sprintf("%d rows and %d entries in row %d", len(rows), len(entries), i)
		}
		m[i] = make([]complex128, len(entries))
		for j, entry := range entries {
			c, ok := complexNumber(entry)
			if !ok {
				return nil, fmt.Sprintf("%s as the entry in row %d, column %d", describe(entry), i, j)
			}
			m[i][j] = c
		}
	}
	return m, ""
}
