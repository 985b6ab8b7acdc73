package quantity

import (
	"math"
	"slices"
	"strings"
	"testing"
)

func document(t *testing.T, text string) *Document {
	t.Helper()
	d, err := ParseDocument("f.toml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	return d
}

func TestTableReads(t *testing.T) {
	d := document(t, `
name = "rack B"
mode = "b"
n = 8
figure = 1e-4
whole = 2
on = true
empty = []
numbers = [1, 2.5]
texts = ["q1 drive", "q2 drive"]
angles = ["0 deg", "90 deg"]
pairs = [["0 %", "0 %"], ["50 %", "49 %"]]
complexes = [1, [0.5, -0.25]]
matrix = [[0, [0, -1]], [[0, 1], 0]]
matrices = [[[1]], [[0, 1], [1, 0]]]
single = { rate = "1 GS/s" }
inline = [{ x = 1 }, { x = 2 }]
whether = { any = 1 }
[[headed]]
x = 3
[[headed]]
x = 4
[headed.sub]
y = "40 MHz"
`)
	r := d.Root()
	if !r.Has("name") || !r.Has("whether") || r.Has("nothing") {
		t.Error("Has")
	}
	if r.Text("name") != "rack B" || r.Text("absent", "else") != "else" || r.Choice("mode", []string{"a", "b"}) != "b" || r.Choice("no mode", []string{"a", "b"}, "a") != "a" {
		t.Error("texts")
	}
	if r.Int("n", 1, 8) != 8 || r.Int("m", 1, 8, 5) != 5 || r.Number("figure", 0, 1) != 1e-4 || r.Number("whole", 0, 2) != 2 || r.Number("f", 0, 1, 0.5) != 0.5 || !r.Bool("on") || !r.Bool("off", true) {
		t.Error("numbers")
	}
	if len(r.Numbers("empty", 3, 0, 1)) != 0 || !slices.Equal(r.Numbers("numbers", 2, 1, 2.5), []float64{1, 2.5}) || !slices.Equal(r.Texts("texts", 2), []string{"q1 drive", "q2 drive"}) ||
		!slices.Equal(r.Complexes("complexes", 2), []complex128{1, complex(0.5, -0.25)}) {
		t.Error("arrays")
	}
	if a := r.Quantities("angles", 2, Angle, 0, 7); !slices.Equal(a, []float64{0, math.Pi / 2}) {
		t.Error("quantities", a)
	}
	if a := r.Pairs("pairs", 2, Ratio, 0, 1); !slices.Equal(a, [][2]float64{{0, 0}, {0.5, 0.49}}) {
		t.Error("pairs", a)
	}
	m := r.Matrix("matrix", 2)
	if len(m) != 2 || !slices.Equal(m[0], []complex128{0, -1i}) || !slices.Equal(m[1], []complex128{1i, 0}) {
		t.Error("matrix", m)
	}
	if ms := r.Matrices("matrices", 2, 2); len(ms) != 2 || ms[0][0][0] != 1 || ms[1][0][1] != 1 {
		t.Error("matrices", ms)
	}
	if r.Table("single").Quantity("rate", SampleRate, 0, 1) != 1 || r.Tables("single", 1)[0].Quantity("rate", SampleRate, 0, 1) != 1 {
		t.Error("single table")
	}
	if ts := r.Tables("inline", 2); len(ts) != 2 || ts[0].Int("x", 0, 9) != 1 || ts[1].Int("x", 0, 9) != 2 {
		t.Error("inline tables")
	}
	ts := r.Tables("headed", 2)
	if len(ts) != 2 || ts[0].Int("x", 0, 9) != 3 || ts[1].Int("x", 0, 9) != 4 || ts[1].Table("sub").Quantity("y", Frequency, 0, 1) != 0.04 || ts[0].Table("sub").Quantity("y", Frequency, 0, 1, math.Inf(1)) != math.Inf(1) {
		t.Error("headed tables")
	}
	if r.Tables("none", 1) != nil {
		t.Error("absent tables")
	}
	if err := d.Err(); err != nil {
		t.Error(err)
	}
}

// Each text holds one mistake, which the call meets; the sentence is the whole of it.
func TestTableSentences(t *testing.T) {
	for _, c := range []struct {
		text string
		ask  func(r *Table)
		want string
	}{
		// Quantities.
		{"[[channel]]\nslew_limit = \"25 MHz\"", func(r *Table) { r.Tables("channel", 4)[0].Quantity("slew_limit", PerSample, 1e-4, 2) },
			`f.toml:2: channel[0].slew_limit: found "25 MHz"; allowed: a share per sample such as "25 %/sample", 0.01 %/sample to 200 %/sample ("MHz" is a unit of frequency)`},
		{"\nspan = 112", func(r *Table) { r.Quantity("span", Time, 1, 1e6) },
			`f.toml:2: span: found 112; allowed: a time such as "112 ns", 1 ns to 1 ms (a bare number has no unit: write a quantity in quotes)`},
		{"span = nan", func(r *Table) { r.Quantity("span", Time, 1, 1e6) }, `f.toml:1: span: found NaN; allowed: a time such as "112 ns", 1 ns to 1 ms`},
		{`span = "inf ns"`, func(r *Table) { r.Quantity("span", Time, 1, 1e6) }, `f.toml:1: span: found "inf ns"; allowed: a time such as "112 ns", 1 ns to 1 ms (not a finite number)`},
		{`span = "2 ms"`, func(r *Table) { r.Quantity("span", Time, 1, 1e6) }, `f.toml:1: span: found "2 ms"; allowed: a time such as "112 ns", 1 ns to 1 ms`},
		{`span = "-1 ns"`, func(r *Table) { r.Quantity("span", Time, 0, math.Inf(1)) }, `f.toml:1: span: found "-1 ns"; allowed: a time such as "112 ns", at least 0 ns`},
		{`tail = "3 %"`, func(r *Table) { r.Quantity("tail", Ratio, math.Inf(-1), 0.02) }, `f.toml:1: tail: found "3 %"; allowed: a share such as "1.5 %", at most 2 %`},
		{"span = true", func(r *Table) { r.Quantity("span", Time, math.Inf(-1), math.Inf(1)) }, `f.toml:1: span: found true; allowed: a time such as "112 ns"`},
		{"", func(r *Table) { r.Quantity("span", Time, 1, 1e6) }, `f.toml:1: span: found nothing; allowed: a time such as "112 ns", 1 ns to 1 ms`},
		// Bare numbers.
		{"n = 8.0", func(r *Table) { r.Int("n", 1, 16) }, `f.toml:1: n: found 8; allowed: a whole number, 1 to 16 (write 8, without a point)`},
		{`n = "8"`, func(r *Table) { r.Int("n", 1, 16) }, `f.toml:1: n: found "8"; allowed: a whole number, 1 to 16 (write it without quotes)`},
		{"n = 9223372036854775807", func(r *Table) { r.Int("n", 1, 16) }, `f.toml:1: n: found 9223372036854775807; allowed: a whole number, 1 to 16`},
		{"n = 0", func(r *Table) { r.Int("n", 1, 16, 4) }, `f.toml:1: n: found 0; allowed: a whole number, 1 to 16`},
		{"n = 2", func(r *Table) { r.Int("n", 1, 1) }, `f.toml:1: n: found 2; allowed: 1, and nothing else`},
		{"f = inf", func(r *Table) { r.Number("f", 0, 1) }, `f.toml:1: f: found +Inf; allowed: a number, 0 to 1`},
		{"f = -nan", func(r *Table) { r.Number("f", math.Inf(-1), math.Inf(1)) }, `f.toml:1: f: found NaN; allowed: a number`},
		{"f = 1.5", func(r *Table) { r.Number("f", 1e-12, 1) }, `f.toml:1: f: found 1.5; allowed: a number, 1e-12 to 1`},
		{`f = "1 %"`, func(r *Table) { r.Number("f", 0, 1) }, `f.toml:1: f: found "1 %"; allowed: a number, 0 to 1 (this figure has no unit: write it without quotes)`},
		{`b = "True"`, func(r *Table) { r.Bool("b") }, `f.toml:1: b: found "True"; allowed: true or false (write it without quotes)`},
		{"b = 1", func(r *Table) { r.Bool("b", true) }, `f.toml:1: b: found 1; allowed: true or false`},
		// Texts.
		{"s = 1979-05-27", func(r *Table) { r.Text("s") }, `f.toml:1: s: found a date or time; allowed: a text in quotes`},
		{`s = ""`, func(r *Table) { r.Text("s") }, `f.toml:1: s: found ""; allowed: at least one character`},
		{`s = "a\u0007b"`, func(r *Table) { r.Text("s") }, `f.toml:1: s: found "a\ab"; allowed: printable characters only, on one line`},
		{`s = "a\u202eb"`, func(r *Table) { r.Text("s") }, `f.toml:1: s: found "a\u202eb"; allowed: printable characters only, on one line`},
		{"s = '''a\nb'''", func(r *Table) { r.Text("s") }, `f.toml:1: s: found "a\nb"; allowed: printable characters only, on one line`},
		{`s = "` + strings.Repeat("é", 129) + `"`, func(r *Table) { r.Text("s") }, `f.toml:1: s: found "éééééééééééééééééééééééééééééé"...; allowed: at most 256 bytes`},
		{`s = ["a", 1]`, func(r *Table) { r.Texts("s", 4) }, `f.toml:1: s: found 1 as element 1; allowed: a text in quotes`},
		{`s = ["a", "b"]`, func(r *Table) { r.Texts("s", 1) }, `f.toml:1: s: found an array of 2; allowed: an array of at most 1 texts in quotes`},
		{`ends = "Window"`, func(r *Table) { r.Choice("ends", []string{"settled", "window"}, "settled") }, `f.toml:1: ends: found "Window"; allowed: "settled" or "window" (did you mean "window"?)`},
		{`ends = "setled"`, func(r *Table) { r.Choice("ends", []string{"settled", "window"}) }, `f.toml:1: ends: found "setled"; allowed: "settled" or "window" (did you mean "settled"?)`},
		{`ends = 3`, func(r *Table) { r.Choice("ends", []string{"settled", "window", "both"}) }, `f.toml:1: ends: found 3; allowed: "settled", "window" or "both"`},
		{``, func(r *Table) { r.Choice("ends", []string{"settled"}) }, `f.toml:1: ends: found nothing; allowed: "settled"`},
		// Arrays and matrices.
		{"a = [1, inf]", func(r *Table) { r.Numbers("a", 4, -1, 1) }, `f.toml:1: a: found +Inf as element 1; allowed: numbers, -1 to 1`},
		{"a = [\n1,\n[2]]", func(r *Table) { r.Numbers("a", 4, -1, 1) }, `f.toml:3: a: found an array of 1 as element 1; allowed: numbers, -1 to 1`},
		{"a = 1", func(r *Table) { r.Numbers("a", 4, -1, 1) }, `f.toml:1: a: found 1; allowed: an array of at most 4 numbers`},
		{"a = [1, [2, nan]]", func(r *Table) { r.Complexes("a", 4) }, `f.toml:1: a: found an array of 2 as element 1; allowed: a number or [re, im], each part from -1e+30 to 1e+30`},
		{"a = [1e31]", func(r *Table) { r.Complexes("a", 4) }, `f.toml:1: a: found 1e+31 as element 0; allowed: a number or [re, im], each part from -1e+30 to 1e+30`},
		{`a = ["90 deg", "1 s"]`, func(r *Table) { r.Quantities("a", 4, Angle, 0, 7) }, `f.toml:1: a: found "1 s" as element 1; allowed: an angle such as "90 deg", 0 deg to 401.07 deg ("s" is a unit of time)`},
		{"a = [\n\"1 ns\",\n\"9 ns\"]", func(r *Table) { r.Quantities("a", 4, Time, 0, 7) }, `f.toml:1: a: found "9 ns" as element 1; allowed: a time such as "112 ns", 0 ns to 7 ns`},
		{`a = ["1 ns", 2]`, func(r *Table) { r.Quantities("a", 4, Time, 0, 7) }, `f.toml:1: a: found 2 as element 1; allowed: a time such as "112 ns", 0 ns to 7 ns`},
		{`a = ["1 ns", "2 ns"]`, func(r *Table) { r.Quantities("a", 1, Time, 0, 7) }, `f.toml:1: a: found an array of 2; allowed: an array of at most 1 texts, each a time such as "112 ns"`},
		{`a = "1 %"`, func(r *Table) { r.Pairs("a", 2, Ratio, 0, 1) }, `f.toml:1: a: found "1 %"; allowed: an array of at most 2 pairs of texts, each a share such as "1.5 %"`},
		{`a = [["0 %", "0 %"], ["1 %", "1 %", "1 %"]]`, func(r *Table) { r.Pairs("a", 2, Ratio, 0, 1) }, `f.toml:1: a: found an array of 3 as element 1; allowed: pairs of texts, each a share such as "1.5 %"`},
		{`a = [["0 %", "0 %"], ["1 %", "200 %"]]`, func(r *Table) { r.Pairs("a", 2, Ratio, 0, 1) }, `f.toml:1: a: found "200 %" in pair 1; allowed: a share such as "1.5 %", 0 % to 100 %`},
		{`a = [["0 %", 0]]`, func(r *Table) { r.Pairs("a", 2, Ratio, 0, 1) }, `f.toml:1: a: found 0 in pair 0; allowed: a share such as "1.5 %", 0 % to 100 %`},
		{"", func(r *Table) { r.Pairs("a", 2, Ratio, 0, 1) }, `f.toml:1: a: found nothing; allowed: an array of at most 2 pairs of texts, each a share such as "1.5 %"`},
		{"m = []", func(r *Table) { r.Matrix("m", 2) }, `f.toml:1: m: found 0 rows; allowed: a square matrix of at most 2 rows, each entry a number or [re, im], each part from -1e+30 to 1e+30`},
		{"m = [[1],[1],[1]]", func(r *Table) { r.Matrix("m", 2) }, `f.toml:1: m: found 3 rows; allowed: a square matrix of at most 2 rows, each entry a number or [re, im], each part from -1e+30 to 1e+30`},
		{"m = [[1, 2], [3]]", func(r *Table) { r.Matrix("m", 2) }, `f.toml:1: m: found 2 rows and 1 entries in row 1; allowed: a square matrix of at most 2 rows, each entry a number or [re, im], each part from -1e+30 to 1e+30`},
		{"m = [1, 2]", func(r *Table) { r.Matrix("m", 2) }, `f.toml:1: m: found 1 as row 0; allowed: a square matrix of at most 2 rows, each entry a number or [re, im], each part from -1e+30 to 1e+30`},
		{`m = [[1, "i"], [0, 1]]`, func(r *Table) { r.Matrix("m", 2) }, `f.toml:1: m: found "i" as the entry in row 0, column 1; allowed: a square matrix of at most 2 rows, each entry a number or [re, im], each part from -1e+30 to 1e+30`},
		{`m = "X"`, func(r *Table) { r.Matrix("m", 2) }, `f.toml:1: m: found "X"; allowed: a square matrix of at most 2 rows, each entry a number or [re, im], each part from -1e+30 to 1e+30`},
		{`m = [[[1]], [[1, 2]]]`, func(r *Table) { r.Matrices("m", 2, 2) }, `f.toml:1: m: found 1 rows and 2 entries in row 0 in matrix 1; allowed: square matrices of at most 2 rows, each entry a number or [re, im], each part from -1e+30 to 1e+30`},
		// Tables.
		{"t = 1", func(r *Table) { r.Table("t").Text("s") }, `f.toml:1: t: found 1; allowed: a table, [t] or t = { ... }`},
		{"[[t]]", func(r *Table) { r.Table("t").Table("u").Text("s") }, `f.toml:1: t: found an array of tables; allowed: a table, [t] or t = { ... }`},
		{"a = 1", func(r *Table) { r.Int("a", 0, 1); r.Table("t").Table("u").Text("s") }, `f.toml:1: t.u.s: found nothing; allowed: a text in quotes`},
		{"\n[t]\n", func(r *Table) { r.Table("t").Text("s") }, `f.toml:2: t.s: found nothing; allowed: a text in quotes`},
		{"\n[t.u]\n[t]\n", func(r *Table) { r.Table("t").Text("s") }, `f.toml:3: t.s: found nothing; allowed: a text in quotes`},
		{"t = [1]", func(r *Table) { r.Tables("t", 2) }, `f.toml:1: t: found 1; allowed: only tables in this array`},
		{"t = 'x'", func(r *Table) { r.Tables("t", 2) }, `f.toml:1: t: found "x"; allowed: a list of tables, each [[t]]`},
		{"[[t]]\n[[t]]\n[[t]]", func(r *Table) { r.Tables("t", 2) }, `f.toml:1: t: found 3 tables; allowed: at most 2`},
		// Unknown keys.
		{"[b]\nx = 1\nyy = 2\n", func(r *Table) { r.Table("b").Int("x", 0, 9) }, `f.toml:3: b.yy: found an unknown key; allowed: x`},
		{"x = 1\nc.d.e = 2\n", func(r *Table) { r.Int("x", 0, 9) }, `f.toml:2: c: found an unknown key; allowed: x`},
		{"x = 1\nc = [{ d = 1 }]\n", func(r *Table) { r.Int("x", 0, 9); r.Tables("c", 1) }, `f.toml:2: c[0].d: found an unknown key; allowed: nothing here`},
		{"\"a\\u000ab\" = 1", func(r *Table) { r.Int("x", 0, 9, 0) }, `f.toml:1: "a\nb": found an unknown key; allowed: x`},
		{"Name = 'x'", func(r *Table) { r.Text("name", ""); r.Int("x", 0, 9, 0) }, `f.toml:1: Name: found an unknown key; allowed: name, x (keys are case-sensitive: write name)`},
		{"slew-limt = 'x'", func(r *Table) { r.Text("slew_limit", "") }, `f.toml:1: slew-limt: found an unknown key; allowed: slew_limit (did you mean slew_limit?)`},
		// A misspelt key explains the missing one, and what the loader made of that.
		{"\n[b]\n\nNAME = 'x'", func(r *Table) { r.Table("b").Text("name") }, `f.toml:4: b.NAME: found an unknown key; allowed: name (keys are case-sensitive: write name)`},
		{"\n[instruments]\nname = 'x'", func(r *Table) { r.Table("instrument").Text("name") }, `f.toml:2: instruments: found an unknown key; allowed: instrument (did you mean instrument?)`},
		{"detunning = 'q1'", func(r *Table) { r.Has("detuning"); r.Fail("", "found neither") }, `f.toml:1: detunning: found an unknown key; allowed: detuning (did you mean detuning?)`},
		// The loader's own complaints.
		{"\na = 1", func(r *Table) { r.Int("a", 0, 9); r.Fail("a", "found %d;\n  allowed: 2", 1) }, `f.toml:2: a: found 1; allowed: 2`},
		{"[t]\na = 1", func(r *Table) { r.Table("t").Int("a", 0, 9); r.Table("t").Fail("b", "no b") }, `f.toml:1: t.b: no b`},
		{"[t]\n", func(r *Table) { r.Table("t").Fail("", "no use") }, `f.toml:1: t: no use`},
		// Which one of several: the first in the file that an accessor met, then the loader's, then unknown keys.
		{"u = 1\na = 1\nb = 2", func(r *Table) { r.Fail("a", "x"); r.Int("b", 3, 4); r.Int("a", 3, 4) }, `f.toml:2: a: found 1; allowed: a whole number, 3 to 4`},
		{"u = 1\na = 1", func(r *Table) { r.Fail("a", "found 1") }, `f.toml:2: a: found 1`},
	} {
		d := document(t, c.text)
		c.ask(d.Root())
		if err := d.Err(); err == nil || err.Error() != c.want {
			t.Errorf("%.60q:\n got %v\nwant %s", c.text, err, c.want)
		}
	}
}

// After a mistake, the values that accessors give do no harm.
func TestTableDefaults(t *testing.T) {
	d := document(t, "x = 1979-05-27")
	r := d.Root()
	if r.Text("x") != "" || r.Text("x", "d") != "d" || r.Choice("x", []string{"a", "b"}) != "a" || r.Int("x", 3, 9) != 3 || r.Int("x", 3, 9, 7) != 7 || r.Number("x", 2, 4) != 2 ||
		r.Number("x", math.Inf(-1), 4) != 0 || r.Quantity("x", Time, 5, 6) != 5 || r.Quantity("x", Time, 5, 6, 5.5) != 5.5 || r.Bool("x") || !r.Bool("x", true) ||
		r.Numbers("x", 3, 0, 1) != nil || r.Texts("x", 2) != nil || r.Matrix("x", 2) != nil || r.Tables("x", 2) != nil {
		t.Error("a value after a mistake")
	}
}

func TestErrorWithoutPlace(t *testing.T) {
	for _, c := range []struct {
		e    Error
		want string
	}{
		{Error{Found: "no room"}, "no room"},
		{Error{File: "f", Found: "x", Allowed: "y"}, "f: found x; allowed: y"},
		{Error{File: "f", Line: 3, Key: "k", Found: "x", Allowed: "y", Hint: "z"}, "f:3: k: found x; allowed: y (z)"},
	} {
		if got := c.e.Error(); got != c.want {
			t.Errorf("got %q, want %q", got, c.want)
		}
	}
}
