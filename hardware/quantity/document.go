package quantity

import (
	"errors"
	"fmt"
	"io"
	"os"
	"regexp"
	"strings"
	"unicode/utf8"

	"github.com/BurntSushi/toml"
)

// Document is one TOML file, its values and the line of every key. It keeps the complaints of the accessors of its
// tables; Err gives the one to show. It is not safe for concurrent use.
type Document struct {
	file     string
	values   map[string]any
	index    *index
	mistakes []mistake // in the order of the calls
}

// mistake is a complaint with what ranks it.
type mistake struct {
	err    *Error
	table  *node // whose key it is; nil below a missing table
	order  int   // of the key, or of the table that should hold it
	origin origin
}

// origin says who complains of a mistake.
type origin int

const (
	byValue   origin = iota // an accessor: the value is wrong
	byAbsence               // an accessor: the key is missing
	byLoader                // Table.Fail
)

// ReadFile reads a TOML file of at most 1 MiB strictly. Errors are an *Error with the file as path names it, and the line
// where there is one.
func ReadFile(path string) (*Document, error) { return read(path, 1) }

// ReadRecord is ReadFile for what a program has written: of at most 16 MiB and sixteen times as many keys, as of the matrices of many levels.
func ReadRecord(path string) (*Document, error) { return read(path, recordScale) }

// recordScale is how many times larger a record may be than a file that people write.
const recordScale = 16

func read(path string, scale int) (*Document, error) {
	whole := func(found string) error {
		return &Error{File: path, Found: found, Allowed: fmt.Sprintf("a TOML file of at most %d MiB that can be read", scale)}
	}
	info, err := os.Stat(path)
	switch {
	case errors.Is(err, os.ErrNotExist):
		return nil, whole("no such file")
	case err != nil:
		return nil, whole(reason(err))
	case info.IsDir():
		return nil, whole("a folder")
	case !info.Mode().IsRegular(): // reading a pipe might never end
		return nil, whole("something that is not a regular file")
	}
	f, err := os.Open(path)
	if err != nil {
		return nil, whole(reason(err))
	}
	defer f.Close() // read only: nothing can be lost
	data, err := io.ReadAll(io.LimitReader(f, int64(scale)*sizeLimit+1))
	if err != nil {
		return nil, whole(reason(err))
	}
	return parseDocument(path, data, scale)
}

// reason gives the cause of a file error without the operation and the path.
func reason(err error) string {
	if pe := (*os.PathError)(nil); errors.As(err, &pe) {
		return "an error of the system: " + pe.Err.Error()
	}
	return "an error of the system: " + err.Error()
}

// ParseDocument reads the text of a TOML file strictly; file is its name in messages. Errors are an *Error with the line.
// It refuses more than 1 MiB, more than 16 levels of tables and arrays, and more than 100 000 keys.
func ParseDocument(file string, data []byte) (*Document, error) { return parseDocument(file, data, 1) }

func parseDocument(file string, data []byte, scale int) (*Document, error) {
	if len(data) > scale*sizeLimit {
		return nil, &Error{File: file, Found: "a larger file", Allowed: fmt.Sprintf("at most %d MiB", scale)}
	}
	data = withoutMark(data)
	if line, what := forbidden(data); what != "" {
		return nil, &Error{File: file, Line: line, Found: what, Allowed: "UTF-8 text, tabs and line ends"}
	}
	text := string(data)
	// The scanner goes first: its limits protect the library, which recurses into arrays and tables without one.
	ix, lost, complaint := scan(file, text, scale*keyLimit)
	if complaint != nil {
		return nil, complaint
	}
	values, err := decode(text)
	if pe := (toml.ParseError{}); errors.As(err, &pe) {
		return nil, syntaxError(file, text, ix, pe)
	} else if err != nil {
		return nil, &Error{File: file, Found: oneLine(err.Error()), Allowed: "valid TOML"}
	}
	if lost || !ix.root.agrees(values) {
		// No such text is known; if the library ever takes one, its lines are unknown and it is refused.
		return nil, &Error{File: file, Line: 1, Found: "TOML of which the lines cannot be told", Allowed: "plain TOML"}
	}
	return &Document{file: file, values: values, index: ix}, nil
}

// agrees reports whether n has a node for every key and for every table and array that is an element below the value v, and no other,
// so that the accessors can rely on it.
func (n *node) agrees(v any) bool {
	var list []any
	switch v := v.(type) {
	case map[string]any:
		for key, below := range v {
			if k := n.kids[key]; k == nil || !k.agrees(below) {
				return false
			}
		}
		return len(v) == len(n.kids) && len(n.elems) == 0
	case []map[string]any:
		for _, m := range v {
			list = append(list, m)
		}
	case []any:
		list = v
	}
	if len(n.kids) != 0 || len(list) != len(n.elems) {
		return false
	}
	for i, e := range n.elems {
		_, isTable := list[i].(map[string]any)
		_, isArray := list[i].([]any)
		if (e != nil) != (isTable || isArray) || e != nil && !e.agrees(list[i]) {
			return false
		}
	}
	return true
}

// decode hands the text to the toml library. Structs would match keys without regard to case, so the values are maps. The
// library panics with text where it meets a defect of its own; to the user that is a file which cannot be read.
func decode(text string) (values map[string]any, err error) {
	defer func() {
		if r := recover(); r != nil {
			values, err = nil, fmt.Errorf("text that the TOML library cannot take: %v", r)
		}
	}()
	_, err = toml.Decode(text, &values)
	return values, err
}

// bareValue finds a value that should stand in quotes: a quantity or a word.
var bareValue = regexp.MustCompile(`=\s*([-+]?[0-9][0-9.]*(?:[eE][-+]?[0-9]+)?\s*[A-Za-zµμ%°][A-Za-zµμ%/]*|[A-Za-z](?:[A-Za-z0-9_ +-]*[A-Za-z0-9])?)\s*(?:#.*)?$`)

// syntaxError turns the library's complaint into the form of this package.
func syntaxError(file, text string, ix *index, pe toml.ParseError) *Error {
	// The library's line is one too far where the line end itself is what it did not expect; its offset is right.
	line := 1 + strings.Count(text[:max(0, min(pe.Position.Start, len(text)))], "\n")
	e := &Error{File: file, Line: line, Found: "text that is not valid TOML: " + oneLine(pe.Message), Allowed: "key = value, with text and quantities in quotes"}
	for _, n := range ix.keys {
		if n.line == e.Line {
			e.Key = n.path() // the last key on the line: the scanner goes no further than the library by much
		}
	}
	if lines := strings.Split(text, "\n"); e.Line <= len(lines) {
		if m := bareValue.FindStringSubmatch(strings.TrimSuffix(lines[e.Line-1], "\r")); m != nil {
			switch strings.ToLower(m[1]) {
			case "true", "false", "yes", "no", "on", "off":
				e.Found, e.Allowed = m[1], "true or false where it answers a question, and text in quotes"
			default:
				e.Found, e.Allowed, e.Hint = clipped(m[1])+" without quotes", "text and quantities in quotes", "write "+quote(m[1])
			}
		}
	}
	return e
}

// oneLine makes a library's message part of one sentence.
func oneLine(s string) string { return clippedTo(strings.Join(strings.Fields(s), " "), 4*foundLength) }

// clipped cuts text that stands without quotes to the length that quote keeps.
func clipped(s string) string { return clippedTo(s, foundLength) }

func clippedTo(s string, most int) string {
	if len(s) <= most {
		return s
	}
	for most > 0 && !utf8.RuneStart(s[most]) {
		most--
	}
	return s[:most] + "..."
}

// File gives the name of the file, as the caller of ReadFile or ParseDocument gave it.
func (d *Document) File() string { return d.file }

// Root gives the table of the top level.
func (d *Document) Root() *Table {
	d.index.root.visited = true
	return &Table{doc: d, values: d.values, node: &d.index.root, line: 1}
}

// Err gives the complaint to show, or nil, as an *Error. Call it last, when every key has been asked for. It is, in this
// order: the first mistake in the file that an accessor met (a wrong value, a missing key); the first one that the loader itself
// complained of by Table.Fail, which may follow from the former; the first key that nobody asked for. Where a key is missing, or
// the loader complains, in a table that also holds a key misspelt, the misspelt key is the complaint.
func (d *Document) Err() error {
	if err := d.Mistake(); err != nil {
		return err
	}
	for _, n := range d.index.keys {
		if stray := n.stray(); stray != nil {
			meant := ""
			if m, key := misspelt(stray.parent); m == stray {
				meant = key
			}
			return d.unknown(stray, meant)
		}
	}
	return nil
}

// Mistake is Err for what has been met so far, without a complaint about keys that nobody has asked for yet: for a loader of which
// the next part depends on what it has read.
func (d *Document) Mistake() error {
	var first *mistake
	for i := range d.mistakes {
		m := &d.mistakes[i]
		if first == nil || m.rank() < first.rank() || m.rank() == first.rank() && m.order < first.order {
			first = m
		}
	}
	if first != nil {
		if first.origin != byValue {
			if n, meant := misspelt(first.table); n != nil {
				return d.unknown(n, meant)
			}
		}
		return first.err
	}
	return nil
}

// rank puts what the loader says behind what the accessors found.
func (m *mistake) rank() int {
	if m.origin == byLoader {
		return 1
	}
	return 0
}

// stray gives the topmost key, n or one above it, that nobody asked for, or nil. Below a value that was read as a whole (a matrix) or
// refused nothing is asked for, and nothing is stray.
func (n *node) stray() *node {
	var top *node
	for k := n; k.parent != nil; k = k.parent {
		if k.at < 0 && k.parent.visited && !k.parent.hasAsked(k.name) {
			top = k
		}
	}
	return top
}

func (n *node) hasAsked(key string) bool {
	for _, k := range n.asked {
		if k == key {
			return true
		}
	}
	return false
}

// unknown complains of key n that nobody asked for.
func (d *Document) unknown(n *node, meant string) *Error {
	e := &Error{File: d.file, Line: n.line, Key: n.path(), Found: "an unknown key", Allowed: strings.Join(n.parent.asked, ", ")}
	switch {
	case len(n.parent.asked) == 0:
		e.Allowed = "nothing here"
	case meant != "" && strings.EqualFold(meant, n.name):
		e.Hint = "keys are case-sensitive: write " + meant
	case meant != "":
		e.Hint = "did you mean " + meant + "?"
	}
	return e
}

// misspelt looks in a table for a key that nobody asked for and that resembles one that was asked for and is absent; the first
// in the file, or nil.
func misspelt(t *node) (n *node, meant string) {
	for name, k := range t.kids {
		if t.hasAsked(name) || n != nil && k.order > n.order {
			continue
		}
		best := 3 // the least distance that is no resemblance
		for _, key := range t.asked {
			if t.kids[key] != nil {
				continue
			}
			if d := distance(plain(name), plain(key)); d < best && 2*d < len(key) {
				best, n, meant = d, k, key
			}
		}
	}
	return n, meant
}

// plain gives a key without what is easily mistaken in it: case, and hyphens for underscores.
func plain(key string) string { return strings.ToLower(strings.ReplaceAll(key, "-", "_")) }

// distance counts the insertions, deletions and replacements of bytes between a and b (Levenshtein 1966, Soviet Physics Doklady
// 10, 707), of which nobody wants to know when there are more than 2.
func distance(a, b string) int {
	if len(a) > len(b)+2 || len(b) > len(a)+2 {
		return 3
	}
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i := range len(a) {
		diagonal := row[0]
		row[0] = i + 1
		for j := range len(b) {
			change := diagonal
			if a[i] != b[j] {
				change++
			}
			diagonal = row[j+1]
			row[j+1] = min(change, row[j+1]+1, row[j]+1)
		}
	}
	return row[len(b)]
}
