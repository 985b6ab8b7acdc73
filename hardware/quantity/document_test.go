package quantity

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"github.com/BurntSushi/toml"
)

// plainKey gives the path of n without the places in arrays, as the toml library counts keys.
func (n *node) plainKey() toml.Key {
	var key toml.Key
	for ; n.parent != nil; n = n.parent {
		if n.at < 0 {
			key = append(toml.Key{n.name}, key...)
		}
	}
	return key
}

// checkIndex compares the keys of the scanner with those of the library.
func checkIndex(t *testing.T, d *Document, text string) {
	t.Helper()
	var values map[string]any
	meta, err := toml.Decode(text, &values)
	if err != nil {
		t.Fatalf("the library refuses what ParseDocument took: %v", err)
	}
	keys := meta.Keys()
	if len(keys) != len(d.index.keys) {
		t.Fatalf("%d keys, the library has %d", len(d.index.keys), len(keys))
	}
	for i, n := range d.index.keys {
		if got := n.plainKey(); !slices.Equal(got, keys[i]) {
			t.Fatalf("key %d is %q, the library has %q", i, got, keys[i])
		}
	}
}

// keysAndLines uses every way TOML has of writing a key.
const keysAndLines = `# comment with [brackets] and "quotes
format = 1
'single quoted' = 1 ; "double \"quoted\" \u00e9 # =" = [ # comment ]
  1, "]", [2, 3],   # more ]
  { x = 1 },
]
text = """
a = 1
[not.a.table]
ends with quotes \""" and two more"""""
raw = '''
b = 'x' '' \'''
date = 1979-05-27 07:32:00 # with a space
[ a . "b.c" ]
d.e.f = { g = [ { h = 1 }, { h = 2, i.j = 3 } ], k = '}' }
d.e.l = -1e-3
[[list]]
[[list]]
x = 1
[list.sub]
y = true
[[list.deep]]
z = "#"
[[list]]
x = 3
[z]
`

func TestLines(t *testing.T) {
	text := strings.Replace(keysAndLines, " ; ", "\n", 1)
	d, err := ParseDocument("f.toml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	checkIndex(t, d, text)
	var got []string
	for _, n := range d.index.keys {
		got = append(got, fmt.Sprintf("%d %s", n.line, n.path()))
	}
	want := []string{
		"2 format", `3 "single quoted"`, `4 "double \"quoted\" é # ="`, `6 "double \"quoted\" é # ="[3].x`, "8 text", "12 raw", "14 date",
		`15 a."b.c"`, `16 a."b.c".d.e.f`, `16 a."b.c".d.e.f.g`, `16 a."b.c".d.e.f.g[0].h`, `16 a."b.c".d.e.f.g[1].h`, `16 a."b.c".d.e.f.g[1].i.j`, `16 a."b.c".d.e.f.k`,
		`17 a."b.c".d.e.l`, "18 list[0]", "19 list[1]", "20 list[1].x", "21 list[1].sub", "22 list[1].sub.y", "23 list[1].deep[0]", "24 list[1].deep[0].z",
		"25 list[2]", "26 list[2].x", "27 z",
	}
	if !slices.Equal(got, want) {
		t.Errorf("got\n%s\nwant\n%s", strings.Join(got, "\n"), strings.Join(want, "\n"))
	}
}

// The same lines with the line ends and the mark of another system.
func TestLinesCRLF(t *testing.T) {
	d, err := ParseDocument("f.toml", []byte("\xef\xbb\xbfa = 1\r\n\r\n[b] # x\r\nc = [\r\n1,\r\n]\r\nd = 2\r\n"))
	if err != nil {
		t.Fatal(err)
	}
	var got []int
	for _, n := range d.index.keys {
		got = append(got, n.line)
	}
	if want := []int{1, 3, 4, 7}; !slices.Equal(got, want) {
		t.Errorf("lines %v, want %v", got, want)
	}
}

func TestParseDocumentRefuses(t *testing.T) {
	deep := func(n int) string { return strings.Repeat("[", n) + strings.Repeat("]", n) }
	for _, c := range []struct{ text, want string }{
		{"a = 1\nb = 2\na = 3\n", "f.toml:3: a: found this key a second time, after line 1; allowed: each key once"},
		{"[x]\ny = 1\n[x]\n", "f.toml:3: x: found this key a second time, after line 1; allowed: each key once"},
		{"[[x]]\n[x]\n", "f.toml:2: x: found this key a second time, after line 1; allowed: each key once"},
		{"[x]\n[[x]]\n", "f.toml:2: x: found this key a second time, after line 1; allowed: each key once"},
		{"[[c]]\na = 1\n[[c]]\na = 1\n'a' = 2\n", "f.toml:5: c[1].a: found this key a second time, after line 4; allowed: each key once"},
		{"t = { a = 1, a = 2 }\n", "f.toml:1: t.a: found this key a second time, after line 1; allowed: each key once"},
		{"span = 112 ns\n", `f.toml:1: span: found 112 ns without quotes; allowed: text and quantities in quotes (write "112 ns")`},
		{"[[channel]]\n\nslew_limit = 25 %/sample # steep\r\n", `f.toml:3: channel[0].slew_limit: found 25 %/sample without quotes; allowed: text and quantities in quotes (write "25 %/sample")`},
		{"gate = X90\n", `f.toml:1: gate: found X90 without quotes; allowed: text and quantities in quotes (write "X90")`},
		{"b = True\n", `f.toml:1: b: found True; allowed: true or false where it answers a question, and text in quotes`},
		{"a = \"x\nb = 1\n", `f.toml:1: a: found text that is not valid TOML: strings cannot contain newlines; allowed: key = value, with text and quantities in quotes`},
		{"a = [1,\n2\n", `f.toml:2: found text that is not valid TOML: expected a comma (',') or array terminator (']'), but got end of file; allowed: key = value, with text and quantities in quotes`},
		{"[channel\n", `f.toml:1: found text that is not valid TOML: expected '.' or ']' to end table name, but got '\n' instead; allowed: key = value, with text and quantities in quotes`},
		{"a\n", `f.toml:1: found text that is not valid TOML: expected '.' or '=', but got '\n' instead; allowed: key = value, with text and quantities in quotes`},
		{"x = 1\na = \"b\x00\"\n", `f.toml:2: found the control character U+0000; allowed: UTF-8 text, tabs and line ends`},
		{"a = 1\rb = 2\n", `f.toml:1: found a carriage return without a line feed; allowed: UTF-8 text, tabs and line ends`},
		{"\n\na = \"\xff\"\n", `f.toml:3: found the byte 0xff, which is not UTF-8; allowed: UTF-8 text, tabs and line ends`},
		{"\nk = " + deep(16) + "\n", "f.toml:2: found tables or arrays nested deeper; allowed: at most 16 levels"},
		{"k = " + strings.Repeat("[", 400_000), "f.toml:1: found tables or arrays nested deeper; allowed: at most 16 levels"},
		{"k = " + strings.Repeat("{a=", 300_000), "f.toml:1: found tables or arrays nested deeper; allowed: at most 16 levels"},
		{"a" + strings.Repeat(".a", 16) + " = 1", "f.toml:1: found tables or arrays nested deeper; allowed: at most 16 levels"},
		{"[a" + strings.Repeat(".a", 400_000) + "]", "f.toml:1: found tables or arrays nested deeper; allowed: at most 16 levels"},
		{strings.Repeat("[[k]]\n", 100_000), "f.toml:100000: found more keys; allowed: at most 100000 keys in a file"},
		{"k = [" + strings.Repeat("{},", 100_000) + "]", "f.toml:1: found more keys; allowed: at most 100000 keys in a file"},
		{strings.Repeat(" ", 1<<20+1), "f.toml: found a larger file; allowed: at most 1 MiB"},
	} {
		_, err := ParseDocument("f.toml", []byte(c.text))
		if err == nil || err.Error() != c.want {
			t.Errorf("%.40q:\n got %v\nwant %s", c.text, err, c.want)
		}
		if e := (*Error)(nil); err != nil && !errors.As(err, &e) {
			t.Errorf("%.40q: the error is a %T", c.text, err)
		}
	}
	for _, text := range []string{"", "k = " + deep(15), strings.Repeat(" ", 1<<20), "a = " + strings.Repeat("{a = ", 15) + "1" + strings.Repeat("}", 15)} {
		if _, err := ParseDocument("f.toml", []byte(text)); err != nil {
			t.Errorf("%.40q: %v", text, err)
		}
	}
}

func TestReadFile(t *testing.T) {
	dir := t.TempDir()
	good := filepath.Join(dir, "good.toml")
	if err := os.WriteFile(good, []byte("a = 1\n"), 0o666); err != nil {
		t.Fatal(err)
	}
	large := filepath.Join(dir, "large.toml")
	if err := os.WriteFile(large, make([]byte, 2<<20), 0o666); err != nil {
		t.Fatal(err)
	}
	d, err := ReadFile(good)
	if err != nil || d.File() != good || d.Root().Int("a", 0, 9) != 1 {
		t.Errorf("good.toml: %v", err)
	}
	for path, want := range map[string]string{
		filepath.Join(dir, "none.toml"): ": found no such file; allowed: a TOML file of at most 1 MiB that can be read",
		dir:                             ": found a folder; allowed: a TOML file of at most 1 MiB that can be read",
		os.DevNull:                      ": found something that is not a regular file; allowed: a TOML file of at most 1 MiB that can be read",
		large:                           ": found a larger file; allowed: at most 1 MiB",
		filepath.Join(good, "below"):    ": found an error of the system: not a directory; allowed: a TOML file of at most 1 MiB that can be read",
	} {
		if _, err := ReadFile(path); err == nil || err.Error() != path+want {
			t.Errorf("got %v\nwant %s%s", err, path, want)
		}
	}
}

// Whatever the bytes are, ParseDocument takes them with the library's keys or refuses them in one line; it never panics and
// never finds itself at odds with the library.
func FuzzParseDocument(f *testing.F) {
	f.Add([]byte(strings.Replace(keysAndLines, " ; ", "\n", 1)))
	for _, s := range []string{"a = 112 ns", "a = [[1, 2], [3, [4, 5]]]", "[[a]]\n[a.b]\n[[a.b.c]]\nd = 1", "a.b = 1\na.c = 2\n[a.d]", "x = '''\n''''''", "x = \"\"\"\"\"\"\"\"",
		"a = { b = { c = 1 }, # x\n d = 2,\n}", "'' = 1", "a = [ { b = 1 }, 2 ]\n[[a]]", "[a]\n[a.b]\n[a]", "k = \"\\x41\\e\"", "a = inf\nb = nan", "a = {}\n[a.b]", "[a.b.c]\n[a]\nb = {}"} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		d, err := ParseDocument("f.toml", data)
		if err != nil {
			if strings.Contains(err.Error(), "\n") || strings.Contains(err.Error(), "lines cannot be told") {
				t.Fatalf("%v", err)
			}
			return
		}
		checkIndex(t, d, string(withoutMark(data)))
		// A loader that asks for everything in every way must not panic, and gets a verdict.
		d.askAll(d.Root(), d.values)
		_ = d.Err()
	})
}

// askAll asks for every key of t with every accessor.
func (d *Document) askAll(t *Table, values map[string]any) {
	for key, v := range values {
		t.Has(key)
		t.Text(key)
		t.Texts(key, 3)
		t.Choice(key, []string{"a", "b"})
		t.Int(key, 0, 10)
		t.Number(key, -1, 1)
		t.Quantity(key, Time, 0, 1)
		t.Bool(key)
		t.Numbers(key, 3, 0, 1)
		t.Complexes(key, 3)
		t.Matrix(key, 3)
		t.Matrices(key, 3, 3)
		t.Table(key).Text("x")
		t.Fail(key, "no")
		if m, isTable := v.(map[string]any); isTable {
			d.askAll(t.Table(key), m)
			continue // as a list of one it would be asked twice, at every level
		}
		for _, sub := range t.Tables(key, 3) {
			d.askAll(sub, sub.values)
		}
	}
}

// TestReadRecord: a record may be larger than a file that people write, sixteen times.
func TestReadRecord(t *testing.T) {
	path := filepath.Join(t.TempDir(), "record.toml")
	write := func(size int) {
		if err := os.WriteFile(path, []byte("text = \"here\"\n# "+strings.Repeat("x", size)+"\n"), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	write(2 << 20)
	if _, err := ReadFile(path); err == nil || !strings.Contains(err.Error(), "at most 1 MiB") {
		t.Errorf("as a file: %v", err)
	}
	doc, err := ReadRecord(path)
	if err != nil {
		t.Fatal(err)
	}
	if got := doc.Root().Text("text"); got != "here" {
		t.Errorf("text %q", got)
	}
	write(17 << 20)
	if _, err := ReadRecord(path); err == nil || !strings.Contains(err.Error(), "at most 16 MiB") {
		t.Errorf("a record too large: %v", err)
	}
}
