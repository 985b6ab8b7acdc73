package main

import (
	"bytes"
	"fmt"
	"go/ast"
	"go/parser"
	"go/token"
	"maps"
	"os"
	"path/filepath"
	"reflect"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"

	"github.com/BurntSushi/toml"

	"holdfast/design"
	"holdfast/design/brief"
	"holdfast/design/device"
	"holdfast/hardware"
)

// askedKeys gives the keys that the source of a loader asks its tables for: the first
// argument of every accessor of quantity.Table that is a text, and the texts of oneOf.
func askedKeys(t *testing.T, files ...string) map[string]bool {
	t.Helper()
	accessors := []string{"Has", "Table", "Tables", "Text", "Texts", "Choice", "Int", "Number", "Quantity", "Bool", "Numbers", "Complexes", "Matrix", "Matrices"}
	keys := map[string]bool{}
	for _, name := range files {
		file, err := parser.ParseFile(token.NewFileSet(), name, nil, 0)
		if err != nil {
			t.Fatal(err)
		}
		ast.Inspect(file, func(n ast.Node) bool {
			call, ok := n.(*ast.CallExpr)
			if !ok {
				return true
			}
			var args []ast.Expr
			switch f := call.Fun.(type) {
			case *ast.SelectorExpr:
				switch {
				case slices.Contains(accessors, f.Sel.Name) && len(call.Args) > 0:
					args = call.Args[:1]
				case f.Sel.Name == "known": // of a line: the table, the key
					args = call.Args[1:]
				}
			case *ast.Ident:
				switch f.Name {
				case "oneOf", "wholes", "readState":
					args = call.Args[1:]
				case "energy": // of a site
					args = call.Args[:1]
				}
			}
			for _, a := range args {
				if lit, ok := a.(*ast.BasicLit); ok && lit.Kind == token.STRING {
					key, err := strconv.Unquote(lit.Value)
					if err != nil {
						t.Fatal(err)
					}
					keys[key] = true
				}
			}
			return true
		})
	}
	return keys
}

// named gives every part of the paths of the documented keys.
func named(keys []key) map[string]bool {
	names := map[string]bool{}
	for _, k := range keys {
		for part := range strings.SplitSeq(strings.ReplaceAll(k.path, "[]", ""), ".") {
			names[part] = true
		}
	}
	return names
}

// Whatever a loader reads is in the help, and nothing else is.
func TestHelpHasEveryKey(t *testing.T) {
	for topic, c := range map[string]struct {
		keys  []key
		files []string
	}{
		"profile": {profileKeys(), []string{"../../hardware/load.go"}},
		"device":  {deviceKeys(), []string{"../../design/device/device.go", "../../design/device/bias.go"}},
		"brief": {briefKeys(), []string{"../../design/brief/brief.go", "../../design/brief/target.go", "../../design/brief/errors.go", "../../design/brief/any.go",
			"../../design/brief/load.go", "../../design/noise/load.go"}},
	} {
		asked, documented := askedKeys(t, c.files...), named(c.keys)
		if len(asked) < 10 {
			t.Errorf("%s: only %d keys found in the loader", topic, len(asked))
		}
		for k := range asked {
			if !documented[k] {
				t.Errorf("help %s says nothing of %q", topic, k)
			}
		}
		for k := range documented {
			if !asked[k] {
				t.Errorf("help %s explains %q, for which the loader does not ask", topic, k)
			}
		}
	}
	// The record: what design writes, and what replay reads of it.
	written := map[string]bool{}
	recordKeys(reflect.TypeFor[design.Record](), "", written)
	documented := map[string]bool{}
	for _, k := range pulseKeys() {
		documented[k.path] = true
		if !written[k.path] {
			t.Errorf("help pulse explains %q, which design does not write", k.path)
		}
	}
	for k := range written {
		if !documented[k] {
			t.Errorf("help pulse says nothing of %q", k)
		}
	}
	names := named(pulseKeys())
	for k := range askedKeys(t, "../../design/replay/folder.go") {
		if !names[k] {
			t.Errorf("help pulse says nothing of %q, which replay reads", k)
		}
	}
}

// recordKeys lists the paths of the record's keys.
func recordKeys(t reflect.Type, at string, keys map[string]bool) {
	for i := range t.NumField() {
		f := t.Field(i)
		tag, _, _ := strings.Cut(f.Tag.Get("toml"), ",")
		path := strings.TrimPrefix(at+"."+tag, ".")
		inner, list := f.Type, ""
		if inner.Kind() == reflect.Pointer {
			inner = inner.Elem()
		}
		if inner.Kind() == reflect.Slice && inner.Elem().Kind() == reflect.Struct {
			inner, list = inner.Elem(), "[]"
		}
		if inner.Kind() == reflect.Struct {
			if f.Anonymous { // its keys stand among those of the table
				path = at
			}
			recordKeys(inner, path+list, keys)
			continue
		}
		keys[path] = true
	}
}

// A document is a TOML file in the making.
type document map[string]any

// set puts the value, as TOML text, at a path of tables, where [] means the first of a list.
func (d document) set(t *testing.T, path, text string) {
	t.Helper()
	var v struct{ Value any }
	if _, err := toml.Decode("Value = "+text, &v); err != nil {
		t.Fatalf("%s = %s: %v", path, text, err)
	}
	table, name := d.table(path)
	table[name] = v.Value
}

func (d document) remove(path string) {
	table, name := d.table(path)
	delete(table, name)
}

// table finds the table of a path, made when missing, and the last name.
func (d document) table(path string) (map[string]any, string) {
	parts := strings.Split(path, ".")
	at := map[string]any(d)
	for _, part := range parts[:len(parts)-1] {
		name, list := strings.CutSuffix(part, "[]")
		if list {
			if at[name] == nil {
				at[name] = []map[string]any{{}}
			}
			at = at[name].([]map[string]any)[0]
			continue
		}
		if at[name] == nil {
			at[name] = map[string]any{}
		}
		at = at[name].(map[string]any)
	}
	return at, parts[len(parts)-1]
}

// save writes the document with its channels last: the encoder sorts by name, and the first
// complaint in the order of the file is the one that counts.
func (d document) save(t *testing.T, path string) {
	t.Helper()
	var b bytes.Buffer
	first, last := maps.Clone(d), document{}
	if channels, ok := d["channel"]; ok {
		delete(first, "channel")
		last["channel"] = channels
	}
	for _, part := range []document{first, last} {
		if err := toml.NewEncoder(&b).Encode(map[string]any(part)); err != nil {
			t.Fatal(err)
		}
	}
	write(t, path, b.String())
}

// loaded prints what a loader makes of a file, without the places of its keys, and without whether a size was written: the
// default is lowered for slow drives, once the profile is known.
func loaded(topic, path string) (string, error) {
	var v any
	var err error
	switch topic {
	case "profile":
		v, err = hardware.Load(path)
	case "device":
		v, err = device.Load(path)
	default:
		v, err = brief.Load(path)
	}
	if err != nil {
		return "", err
	}
	text := fmt.Sprintf("%+v", v)
	if d, ok := v.(*device.Device); ok { // of which only the addresses are printed
		for _, b := range d.Biases {
			if b.Loop != nil {
				text += fmt.Sprintf("%+v", *b.Loop)
			}
		}
	}
	return placeOfKey.ReplaceAllString(text, ""), nil
}

var placeOfKey = regexp.MustCompile(`\b[Ll]ine\w*:[0-9]+|lines:\{[^}]*\}|unsized:(true|false)|0x[0-9a-f]+`)

// Every key of a profile, a device and a brief as the help shows it is taken; a value that
// is not allowed gets a message with the range that the help gives; and leaving the key
// out does what the help says.
func TestHelpIsTrue(t *testing.T) {
	dir := t.TempDir()
	for topic, keys := range map[string][]key{"profile": profileKeys(), "device": deviceKeys(), "brief": briefKeys()} {
		for _, k := range keys {
			path := filepath.Join(dir, topic+".toml")
			full := func() document {
				d := document{}
				not := rivalsOf(topic, k.path)
				for _, other := range keys {
					if !not[other.path] {
						d.set(t, other.path, other.example)
					}
				}
				if form := noiseForms[k.path]; form != "" {
					d.set(t, "error[].noise.form", strconv.Quote(form))
					rows := "frequency_hz,psd_hz2_per_hz\n1e3,1\n1e6,1e-3\n"
					if form == "trace" {
						rows = "time_s,value_hz\n"
						for i := range 256 {
							rows += fmt.Sprintf("%g,%d\n", float64(i)*1e-6, i%7)
						}
					}
					write(t, filepath.Join(dir, "noise.csv"), rows)
				}
				if topic == "device" { // what the examples need that is not of one site
					second := map[string]any{"name": "q2"}
					if k.path != "site[].frequency" {
						second["frequency"] = "5.2 GHz"
					}
					d["site"] = append(d["site"].([]map[string]any), second)
				}
				return d
			}
			d := full()
			d.save(t, path)
			if _, err := loaded(topic, path); err != nil {
				t.Errorf("%s: the examples of the help are refused: %v", k.path, err)
				continue
			}
			shown := strings.ReplaceAll(k.path, "[]", "[0]")
			name := func(message string) bool {
				return strings.Contains(message, ": "+shown+": ") || strings.Contains(message, ": "+strings.ReplaceAll(shown, "lowpass[0]", "lowpass")+": ")
			}

			// a value of the wrong type
			d.set(t, k.path, "1979-05-27")
			d.save(t, path)
			_, err := loaded(topic, path)
			limits := strings.ReplaceAll(k.limits, "half the sample rate", "500 MHz")
			if err == nil || !name(err.Error()) || !strings.Contains(err.Error(), limits) {
				t.Errorf("%s: the loader allows something else than %q: %v", k.path, limits, err)
			}

			// nothing
			d = full()
			d.remove(k.path)
			d.save(t, path)
			without, err := loaded(topic, path)
			switch value := defaultOf(k); {
			case k.absent == must || strings.HasPrefix(k.absent, "required"):
				if err == nil || !name(err.Error()) {
					t.Errorf("%s: not required: %v", k.path, err)
				}
			case alternatives[k.path]:
				if err == nil {
					t.Errorf("%s: left out without its alternative, and taken", k.path)
				}
			case err != nil:
				t.Errorf("%s: required, and the help says %q", k.path, k.absent)
			case value != "":
				d.set(t, k.path, value)
				d.save(t, path)
				if with, err := loaded(topic, path); err != nil || with != without {
					t.Errorf("%s = %s is not what its absence means: %v\n%s\n%s", k.path, value, err, with, without)
				}
			}
		}
	}
}

// alternatives are the keys of which one must stand there.
var alternatives = map[string]bool{}

func init() {
	for _, list := range [][]string{targetKinds, errorKinds, couplingKinds} {
		for _, path := range list {
			alternatives[path] = true
		}
	}
	alternatives["target.sites"] = true // or site, or gates, or states
}

var (
	couplingKinds = []string{"coupling[].on", "coupling[].kind"}
	targetKinds   = []string{"target.gate", "target.gates", "target.controlled", "target.axis", "target.matrix", "target.from"}
	errorKinds    = []string{"error[].detuning", "error[].amplitude", "error[].operator", "error[].on", "error[].collective", "error[].matrix", "error[].any",
		"error[].line", "error[].quadrature_angle", "error[].offset", "error[].crosstalk"}
)

// beside gives of a key that has no meaning by itself the alternative beside which it stands in the examples.
var beside = map[string]string{
	"coupling[].between": "coupling[].kind",
	"target.angle":       "target.axis", "target.sites": "target.controlled", "target.up_to": "target.controlled", "target.to": "target.from",
	"error[].values":    "error[].detuning", // and a spread
	"error[].parameter": "error[].line", "error[].quadrature": "error[].offset", "error[].site": "error[].crosstalk", "error[].except": "error[].any", "error[].rates": "error[].any",
}

// noiseForms gives of a key of noise a form beside which it stands.
var noiseForms = map[string]string{
	"error[].noise.form": "lorentzian", "error[].noise.sigma": "lorentzian", "error[].noise.correlation_time": "lorentzian",
	"error[].noise.exponent": "power-law", "error[].noise.low": "power-law", "error[].noise.high": "power-law",
	"error[].noise.file": "table", "error[].noise.sided": "table", "error[].noise.segment": "trace",
}

// rivalsOf gives the keys that may not stand beside one: those of the other alternatives, and those that have no meaning there.
func rivalsOf(topic, path string) map[string]bool {
	not := map[string]bool{}
	// pick leaves of the alternatives the one that the key is, or stands beside, or else the first, and what may stand beside that.
	pick := func(list []string) string {
		chosen := list[0]
		for _, k := range list {
			if path == k || beside[path] == k {
				chosen = k
			}
		}
		for _, k := range list {
			not[k] = k != chosen
		}
		for k, with := range beside {
			if slices.Contains(list, with) && with != chosen {
				not[k] = true
			}
		}
		return chosen
	}
	switch topic {
	case "device":
		pick(couplingKinds)
		for _, k := range deviceKeys() { // a bias has one map
			if loop := strings.HasPrefix(path, "bias[].loop"); strings.HasPrefix(k.path, "bias[].loop") {
				not[k.path] = !loop
			} else if k.path == "bias[].polynomial" {
				not[k.path] = loop
			}
		}
		if path == "site[].frequency" { // without it there is no coupling to a site that has one
			for _, k := range deviceKeys() {
				not[k.path] = not[k.path] || strings.HasPrefix(k.path, "coupling") || strings.HasPrefix(k.path, "crosstalk")
			}
		}
	case "brief":
		not["hold"] = path != "hold"
		kind := pick(errorKinds)
		switch kind {
		case "error[].amplitude", "error[].line", "error[].quadrature_angle", "error[].offset", "error[].crosstalk":
			not["error[].size"] = true // its example is a frequency
		}
		not["error[].spread"] = kind == "error[].any"
		not["error[].values"] = not["error[].values"] || path == "error[].spread" // without which there are none
		form, noisy := noiseForms[path]
		for k := range noiseForms {
			not[k] = noiseForms[k] != form || k == "error[].noise.segment" && path != k // and a table has no segment
		}
		not["error[].noise.form"] = !noisy
		if noisy {
			not["error[].noise.file"] = form != "table" && form != "trace"
			not["error[].noise.sigma"] = form == "table" || form == "trace"
			not["error[].size"], not["error[].spread"], not["error[].values"] = true, true, true
		}
		if path == "hold" {
			for _, k := range briefKeys() {
				not[k.path] = not[k.path] || strings.HasPrefix(k.path, "error")
			}
		}
		target := pick(targetKinds)
		not["target.site"] = target == "target.gates" || target == "target.from" || target == "target.controlled" // which names the sites, or stands beside sites
		not["target.free_z"] = target == "target.from" || path == "target.up_to"
		not["target.up_to"] = path != "target.up_to"
	}
	return not
}

// defaultOf gives the value that the help names for an absent key, empty when it is not a plain value.
func defaultOf(k key) string {
	switch k.absent {
	case "one block": // of 8 samples in the example
		return "8"
	case "8 samples":
		return `"8 ns"`
	}
	if strings.HasPrefix(k.path, "error[].") && (strings.HasSuffix(k.path, "name") || strings.HasSuffix(k.path, "size")) {
		first := strings.FieldsFunc(k.absent, func(r rune) bool { return r == ',' || r == ';' })[0]
		return first // those of a detuning
	}
	var v struct{ Value any }
	text := k.absent
	if strings.HasPrefix(k.example, `"`) && !strings.HasPrefix(text, `"`) {
		text = `"` + text + `"`
		if !regexp.MustCompile(`^"[0-9]`).MatchString(text) {
			return ""
		}
	}
	if _, err := toml.Decode("Value = "+text, &v); err != nil {
		return ""
	}
	return text
}

// The gates of two sites that the help names are those that there are.
func TestHelpNamesGates(t *testing.T) {
	names := device.Gate2Names()
	for i, name := range names {
		names[i] = strconv.Quote(name)
	}
	last := len(names) - 1
	if want := strings.Join(names[:last], ", ") + " or " + names[last]; twoSiteGates != want {
		t.Errorf("the help names %s; there are %s", twoSiteGates, want)
	}
}

// Each topic of the help is there, its lines fit a terminal, and -h shows the same.
func TestHelp(t *testing.T) {
	topics := []string{"profile", "device", "brief", "pulse", "json"}
	for _, v := range verbs() {
		topics = append(topics, v.name)
		_, a, _ := play("help", v.name)
		if _, b, _ := play(v.name, "-h"); a != b {
			t.Errorf("%s -h and help %s differ", v.name, v.name)
		}
		mustHave(t, "help", a, "Usage: holdfast "+v.name)
	}
	for _, topic := range topics {
		status, stdout, stderr := play("help", topic)
		if status != exitMet || stderr != "" {
			t.Errorf("help %s: %d, %s", topic, status, stderr)
		}
		for line := range strings.Lines(stdout) {
			if n := len([]rune(strings.TrimSuffix(line, "\n"))); n > 120 {
				t.Errorf("help %s: a line of %d characters: %s", topic, n, line)
			}
			if strings.HasSuffix(line, " \n") {
				t.Errorf("help %s: a space at the end of %q", topic, line)
			}
		}
		if !strings.HasSuffix(stdout, "\n") {
			t.Errorf("help %s does not end a line", topic)
		}
	}
	_, stdout, _ := play("help")
	for _, v := range verbs() {
		mustHave(t, "help", stdout, "holdfast "+v.name)
	}
	for _, c := range []struct{ topic, flag string }{{"start", "-pair"}, {"design", "-out"}, {"design", "-force"}, {"replay", "-datasheet"}, {"card", "-out"}, {"card", "-force"}, {"card", "-detuning"}, {"card", "-channel"}} {
		_, stdout, _ := play("help", c.topic)
		mustHave(t, "help "+c.topic, stdout, c.flag)
	}
	// -json is a flag of every verb
	for _, v := range verbs() {
		_, stdout, _ := play("help", v.name)
		mustHave(t, "help "+v.name, stdout, "[-json]", "-json print one JSON object instead of text")
	}
	// the flags in the source are the ones above
	for file, want := range map[string]int{"design.go": 2, "replay.go": 1, "card.go": 4, "check.go": 0, "start.go": 1, "help.go": 0} {
		source, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		if n := len(regexp.MustCompile(`\bf\.(String|Bool|Int|Duration|Float64|\w+Var)\("`).FindAll(source, -1)); n != want {
			t.Errorf("%s defines %d flags; the help has %d", file, n, want)
		}
	}
}
