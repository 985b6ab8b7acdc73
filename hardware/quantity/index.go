package quantity

import (
	"bytes"
	"fmt"
	"strconv"
	"strings"
	"unicode/utf8"
)

// The limits of a document.
const (
	sizeLimit    = 1 << 20 // bytes
	nestingLimit = 16      // tables and arrays within one another, the root not counted
	keyLimit     = 100_000 // keys, table headers, and tables and arrays that are elements of an array
)

// node is one key of a document, or one element of an array that is itself a table or an array, and where it stands.
type node struct {
	parent *node
	name   string // of a key
	at     int    // of an element: its place in the array; -1 for a key
	line   int    // from 1
	order  int    // place among all nodes, in file order

	kids  map[string]*node // of a table
	elems []*node          // of an array; nil where the element is a plain value

	assigned bool // by key = value
	header   bool // by [name], or, of an element, by [[name]]
	list     bool // of the array that [[name]] makes

	// What the loader did with it.
	visited bool     // a Table was handed out for it
	asked   []string // the keys that were asked of that Table, in order, each once
}

// index is the tree of every key of a document. The toml library gives the values and no places; this scanner gives the
// places and no values. It understands just enough of TOML to find the keys: it accepts much that is no TOML, which is
// the library's to refuse, and the two are compared by FuzzParseDocument.
type index struct {
	root  node
	keys  []*node // one entry per key and per header, in file order, as the library counts them
	count int     // nodes made
}

// scanner walks through the text. Its first complaint is final.
type scanner struct {
	index
	file  string
	text  string // without byte order mark
	pos   int
	line  int
	most  int    // keys
	table *node  // that the current header opened
	err   *Error // a limit exceeded, a key named twice
	lost  bool   // the text is no TOML as far as the scanner can tell
}

// scan builds the index. It complains about limits and about keys that are named twice; lost says that the scanner found
// the text malformed, so that the library must be able to say why.
func scan(file, text string, most int) (ix *index, lost bool, err *Error) {
	s := &scanner{file: file, text: text, line: 1, most: most}
	s.root = node{at: -1, line: 1, header: true}
	s.table = &s.root
	for s.blanks(true); s.pos < len(s.text) && !s.stopped(); s.blanks(true) {
		if s.text[s.pos] == '[' {
			s.tableHeader()
		} else {
			s.keyValue(s.table, s.depth(s.table))
		}
		// Only a comment may follow on the same line.
		s.blanks(false)
		if !s.stopped() && s.pos < len(s.text) && s.text[s.pos] != '\n' {
			s.lost = true
		}
	}
	return &s.index, s.lost, s.err
}

func (s *scanner) stopped() bool { return s.lost || s.err != nil }

// depth counts the tables above and including n, without the root and without array levels.
func (s *scanner) depth(n *node) int {
	d := 0
	for ; n.parent != nil; n = n.parent {
		if n.at < 0 {
			d++
		}
	}
	return d
}

// fail records a complaint about the current line.
func (s *scanner) fail(found, allowed string) {
	if s.err == nil {
		s.err = &Error{File: s.file, Line: s.line, Found: found, Allowed: allowed}
	}
}

// add makes a node below parent.
func (s *scanner) add(parent *node, name string, at int) *node {
	s.count++
	if s.count > s.most {
		s.fail("more keys", fmt.Sprintf("at most %d keys in a file", s.most))
	}
	n := &node{parent: parent, name: name, at: at, line: s.line, order: s.count}
	if at < 0 {
		if parent.kids == nil {
			parent.kids = make(map[string]*node)
		}
		parent.kids[name] = n
	}
	return n
}

// kid gives the node of a key below n, made when missing; of an array of tables it is the last element, as TOML has it.
func (s *scanner) kid(n *node, name string) *node {
	k := n.kids[name]
	if k == nil {
		return s.add(n, name, -1)
	}
	if len(k.elems) > 0 {
		if last := k.elems[len(k.elems)-1]; last != nil {
			return last
		}
	}
	return k
}

// twice complains of a key that stands in the file already.
func (s *scanner) twice(n *node) {
	s.fail(fmt.Sprintf("this key a second time, after line %d", n.line), "each key once")
	s.err.Key = n.path()
}

// blanks skips spaces and a comment and, with lines, line ends and the comments of the lines that follow.
func (s *scanner) blanks(lines bool) {
	for s.pos < len(s.text) {
		switch c := s.text[s.pos]; {
		case c == ' ' || c == '\t' || c == '\r':
			s.pos++
		case c == '\n' && lines:
			s.pos++
			s.line++
		case c == '#':
			for s.pos < len(s.text) && s.text[s.pos] != '\n' {
				s.pos++
			}
		default:
			return
		}
	}
}

// next steps over c, or the scanner is lost.
func (s *scanner) next(c byte) bool {
	if s.pos < len(s.text) && s.text[s.pos] == c {
		s.pos++
		return true
	}
	s.lost = true
	return false
}

func (s *scanner) spaces() {
	for s.pos < len(s.text) && (s.text[s.pos] == ' ' || s.text[s.pos] == '\t') {
		s.pos++
	}
}

// tableHeader reads [name] or [[name]].
func (s *scanner) tableHeader() {
	s.next('[')
	double := s.pos < len(s.text) && s.text[s.pos] == '['
	if double {
		s.pos++
	}
	path := s.dotted()
	if s.lost || !s.next(']') || double && !s.next(']') {
		s.lost = true
		return
	}
	if len(path) > nestingLimit {
		s.tooDeep()
		return
	}
	n := &s.root
	for _, name := range path[:len(path)-1] {
		n = s.kid(n, name)
	}
	name := path[len(path)-1]
	k := n.kids[name]
	switch {
	case k == nil:
		k = s.add(n, name, -1)
		k.list = double
	case k.assigned || k.list != double || k.header: // only a list may have a second header
		s.twice(k)
		return
	}
	if double {
		e := s.add(k, "", len(k.elems))
		k.elems = append(k.elems, e)
		k = e
	}
	k.header = true
	k.line = s.line // a table made by what stands below it had another line so far
	s.table = k
	s.keys = append(s.keys, k)
}

func (s *scanner) tooDeep() {
	s.fail("tables or arrays nested deeper", fmt.Sprintf("at most %d levels", nestingLimit))
}

// keyValue reads key = value into table, which is depth levels down.
func (s *scanner) keyValue(table *node, depth int) {
	path := s.dotted()
	if s.lost || !s.next('=') {
		s.lost = true
		return
	}
	if depth+len(path) > nestingLimit {
		s.tooDeep()
		return
	}
	n := table
	for _, name := range path[:len(path)-1] {
		n = s.kid(n, name)
	}
	name := path[len(path)-1]
	if k := n.kids[name]; k != nil {
		s.twice(k)
		return
	}
	k := s.add(n, name, -1)
	k.assigned = true
	s.keys = append(s.keys, k)
	s.spaces()
	s.value(k, depth+len(path))
}

// dotted reads a key of one or more parts, and the spaces around it.
func (s *scanner) dotted() []string {
	var path []string
	for {
		s.spaces()
		part, ok := s.keyPart()
		if !ok {
			s.lost = true
			return nil
		}
		path = append(path, part)
		s.spaces()
		if s.pos >= len(s.text) || s.text[s.pos] != '.' {
			return path
		}
		s.pos++
	}
}

// keyPart reads one bare or quoted part of a key.
func (s *scanner) keyPart() (string, bool) {
	if s.pos < len(s.text) && (s.text[s.pos] == '"' || s.text[s.pos] == '\'') {
		raw := s.text[s.pos] == '\''
		body, ok := s.quoted()
		if !ok || raw {
			return body, ok
		}
		return unescape(body)
	}
	start := s.pos
	for s.pos < len(s.text) && isBare(s.text[s.pos]) {
		s.pos++
	}
	return s.text[start:s.pos], s.pos > start
}

func isBare(c byte) bool {
	return c >= 'a' && c <= 'z' || c >= 'A' && c <= 'Z' || isDigit(c) || c == '_' || c == '-'
}

// quoted reads a string on one line and gives what stands between the quotes, escapes and all.
func (s *scanner) quoted() (string, bool) {
	q := s.text[s.pos]
	s.pos++
	start := s.pos
	for s.pos < len(s.text) {
		switch c := s.text[s.pos]; {
		case c == q:
			s.pos++
			return s.text[start : s.pos-1], true
		case c == '\n':
			return "", false
		case c == '\\' && q == '"' && s.pos+1 < len(s.text) && s.text[s.pos+1] != '\n':
			s.pos++
		}
		s.pos++
	}
	return "", false
}

// multiline reads a string in triple quotes of the character q; the scanner stands behind the opening three. A run of up to five
// quotes ends the string, the first two of them being its own.
func (s *scanner) multiline(q byte) {
	run := 0
	for s.pos < len(s.text) {
		c := s.text[s.pos]
		if c == q {
			run++
		} else {
			if run >= 3 {
				return
			}
			run = 0
			if c == '\\' && q == '"' && s.pos+1 < len(s.text) {
				s.pos++
				c = s.text[s.pos]
			}
			if c == '\n' {
				s.line++
			}
		}
		s.pos++
	}
	if run < 3 {
		s.lost = true
	}
}

// value reads the value of n, which is depth levels down, and what lies below it.
func (s *scanner) value(n *node, depth int) {
	if s.pos >= len(s.text) {
		s.lost = true
		return
	}
	switch c := s.text[s.pos]; c {
	case '"', '\'':
		if strings.HasPrefix(s.text[s.pos:], strings.Repeat(string(c), 3)) {
			s.pos += 3
			s.multiline(c)
		} else if _, ok := s.quoted(); !ok {
			s.lost = true
		}
	case '[':
		s.array(n, depth)
	case '{':
		s.inline(n, depth)
	default:
		start := s.pos
		for s.pos < len(s.text) && strings.IndexByte(",]}#\n", s.text[s.pos]) < 0 {
			s.pos++
		}
		if strings.TrimSpace(s.text[start:s.pos]) == "" {
			s.lost = true
		}
	}
}

// array reads an array. Elements which are tables or arrays get nodes of their own.
func (s *scanner) array(n *node, depth int) {
	if depth+1 > nestingLimit {
		s.tooDeep()
		return
	}
	s.pos++
	for i := 0; ; i++ {
		s.blanks(true)
		if s.pos < len(s.text) && s.text[s.pos] == ']' {
			s.pos++
			return
		}
		var e *node
		child := n
		if s.pos < len(s.text) && (s.text[s.pos] == '[' || s.text[s.pos] == '{') {
			e = s.add(n, "", i)
			e.assigned = true
			child = e
		}
		n.elems = append(n.elems, e)
		s.value(child, depth+1)
		if s.stopped() {
			return
		}
		s.blanks(true)
		if s.pos < len(s.text) && s.text[s.pos] == ',' {
			s.pos++
		} else if s.pos >= len(s.text) || s.text[s.pos] != ']' {
			s.lost = true
			return
		}
	}
}

// inline reads an inline table.
func (s *scanner) inline(n *node, depth int) {
	if depth+1 > nestingLimit {
		s.tooDeep()
		return
	}
	s.pos++
	for {
		s.blanks(true)
		if s.pos < len(s.text) && s.text[s.pos] == '}' {
			s.pos++
			return
		}
		s.keyValue(n, depth)
		if s.stopped() {
			return
		}
		s.blanks(true)
		if s.pos < len(s.text) && s.text[s.pos] == ',' {
			s.pos++
		} else if s.pos >= len(s.text) || s.text[s.pos] != '}' {
			s.lost = true
			return
		}
	}
}

// unescape resolves the escapes of a basic string; ok is false when one is not TOML's.
func unescape(s string) (string, bool) {
	if !strings.Contains(s, `\`) {
		return s, true
	}
	var b strings.Builder
	for i := 0; i < len(s); i++ {
		if s[i] != '\\' {
			b.WriteByte(s[i])
			continue
		}
		i++
		if i >= len(s) {
			return "", false
		}
		width := 0
		switch s[i] {
		case 'b':
			b.WriteByte('\b')
		case 't':
			b.WriteByte('\t')
		case 'n':
			b.WriteByte('\n')
		case 'f':
			b.WriteByte('\f')
		case 'r':
			b.WriteByte('\r')
		case 'e':
			b.WriteByte(0x1b)
		case '"', '\\':
			b.WriteByte(s[i])
		case 'x':
			width = 2
		case 'u':
			width = 4
		case 'U':
			width = 8
		default:
			return "", false
		}
		if width > 0 {
			if i+width >= len(s) {
				return "", false
			}
			r, err := strconv.ParseUint(s[i+1:i+1+width], 16, 32)
			if err != nil || !utf8.ValidRune(rune(r)) {
				return "", false
			}
			b.WriteRune(rune(r))
			i += width
		}
	}
	return b.String(), true
}

// path gives the full name of n, such as channel[0].line.delay.
func (n *node) path() string {
	if n.parent == nil {
		return ""
	}
	up := n.parent.path()
	if n.at >= 0 {
		return up + "[" + strconv.Itoa(n.at) + "]"
	}
	return join(up, n.name)
}

// join appends a key to a path, in quotes where TOML would need them.
func join(up, name string) string {
	if name == "" || strings.ContainsFunc(name, func(r rune) bool { return r >= utf8.RuneSelf || !isBare(byte(r)) }) {
		name = quote(name)
	}
	if up == "" {
		return name
	}
	return up + "." + name
}

// forbidden finds the first byte that no TOML file holds: a control character, or what is no UTF-8. It gives the line, and
// what it is in words; empty when there is none.
func forbidden(data []byte) (line int, what string) {
	line = 1
	for i := 0; i < len(data); {
		c := data[i]
		switch {
		case c == '\n':
			line++
		case c == '\r' && (i+1 == len(data) || data[i+1] != '\n'):
			return line, "a carriage return without a line feed"
		case c < ' ' && c != '\t' && c != '\r', c == 0x7f:
			return line, fmt.Sprintf("the control character U+%04X", c)
		case c >= utf8.RuneSelf:
			r, width := utf8.DecodeRune(data[i:])
			if r == utf8.RuneError && width == 1 {
				return line, fmt.Sprintf("the byte 0x%02x, which is not UTF-8", c)
			}
			i += width
			continue
		}
		i++
	}
	return line, ""
}

// withoutMark cuts off a UTF-8 byte order mark.
func withoutMark(data []byte) []byte { return bytes.TrimPrefix(data, []byte("\xef\xbb\xbf")) }
