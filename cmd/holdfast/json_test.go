package main

import (
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"maps"
	"math"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

// emitted is what a JSON text holds, by path: [] after a list.
type emitted struct {
	keys  map[string]bool // of every leaf, and of every list without elements
	order []string        // the same as they came, each once
}

// keysOf reads one JSON text to its end.
func keysOf(t *testing.T, text string) emitted {
	t.Helper()
	e := emitted{keys: map[string]bool{}}
	d := json.NewDecoder(strings.NewReader(text))
	leaf := func(path string) {
		if !e.keys[path] {
			e.order = append(e.order, path)
		}
		e.keys[path] = true
	}
	var value func(path string)
	next := func() json.Token {
		token, err := d.Token()
		if err != nil {
			t.Fatalf("%v in %.300s", err, text)
		}
		return token
	}
	value = func(path string) {
		switch next() {
		case json.Delim('{'):
			for d.More() {
				value(strings.TrimPrefix(path+"."+next().(string), "."))
			}
			next()
		case json.Delim('['):
			if !d.More() {
				leaf(path + "[]")
			}
			for d.More() {
				value(path + "[]")
			}
			next()
		default:
			leaf(path)
		}
	}
	value("")
	if _, err := d.Token(); !errors.Is(err, io.EOF) {
		t.Errorf("something after the object: %v", err)
	}
	if len(e.order) == 0 || e.order[0] != "format" || !strings.HasPrefix(text, "{\n  \"format\": 1,\n") {
		t.Errorf("the object does not begin with its format: %.100s", text)
	}
	return e
}

// The keys that help json explains are those that the verbs print, in that order.
func TestJSONKeys(t *testing.T) {
	dir := newLab(t)
	at := func(name string) string { return filepath.Join(dir, name) }
	// a brief with all that can be asked, which a short search does not find
	write(t, at("all.toml"), strings.Replace(quick, "hold = \"nothing\"\n", "starts = 2\n", 1)+"[[error]]\nany = \"all\"\n[[error]]\namplitude = \"q1 drive\"\n[[require.margin]]\nerror = \"detuning\"\nsize = \"0.3 MHz\"\n")
	found := map[string][]emitted{}
	ask := func(status int, args ...string) string {
		t.Helper()
		got, stdout, stderr := play(append(args, "-json")...)
		if got != status || status != exitBadInput && stderr != "" {
			t.Fatalf("%v: status %d, want %d: %s", args, got, status, stderr)
		}
		if _, again, _ := play(append(args, "-json")...); args[0] != "start" && args[0] != "design" && args[0] != "card" && len(args) < 3 && again != stdout {
			t.Errorf("%v: a second run prints something else", args)
		}
		found[args[0]] = append(found[args[0]], keysOf(t, stdout))
		return stdout
	}
	ask(exitMet, "version")
	ask(exitMet, "help")
	ask(exitMet, "help", "version")
	ask(exitMet, "help", "profile")
	ask(exitMet, "help", "json")
	ask(exitMet, "start", at("other"))
	ask(exitMet, "check", at("rack-b.toml"), at("skerry.toml"), at("all.toml"))
	write(t, at("other.toml"), strings.Replace(read(t, at("rack-b.toml")), "full_scale =", "compression = [[\"0 %\", \"0 %\"], [\"100 %\", \"95 %\"]]\nfull_scale =", 1))
	ask(exitMet, "check", at("other.toml"))
	checked := ask(exitBadInput, "check", at("skerry.toml"), at("no.toml"), at("quick.toml"))
	ask(exitMet, "card", at("rack-b.toml"), at("skerry.toml"), "-out", at("card"))
	ask(exitMissed, "design", at("all.toml"), "-out", at("pulse"))
	ask(exitMissed, "replay", at("pulse"), "-datasheet="+at("page.html"))
	// what only several sites have, or more levels: a device with everything, two spins of which the coupling is left out, and a state of a ladder
	two := newPair(t)
	in := func(name string) string { return filepath.Join(two, name) }
	write(t, in("mixed.toml"), mixed)
	write(t, in("up.toml"), fmt.Sprintf(pair, "hold = \"nothing\"\n[target]\nsites = [\"q1\", \"q2\"]\ngate = \"CZ\"\nup_to = \"local rotations\"\n"))
	write(t, in("apart.toml"), strings.NewReplacer(`name = "q1"`, "name = \"q1\"\nfrequency = \"5.1 GHz\"", `name = "q2"`, "name = \"q2\"\nfrequency = \"5.3 GHz\"", "\"5 MHz\"", "\"2 MHz\"\nrotating_wave = true").
		Replace(read(t, in("skerry-pair.toml"))))
	write(t, in("product.toml"), strings.Replace(fmt.Sprintf(pair, "hold = \"nothing\"\n[require]\ninfidelity = 1e-3\n[target]\ngates = { q1 = \"X90\", q2 = \"X90\" }\nfree_z = \"both\"\n"), "skerry-pair", "apart", 1))
	write(t, in("ladder.toml"), "format = 1\nname = \"ladder\"\n[[site]]\nname = \"q1\"\nlevels = 3\nanharmonicity = \"-220 MHz\"\n[[drive]]\nsite = \"q1\"\nchannel = \"q1 drive\"\n")
	write(t, in("state.toml"), strings.Replace(fmt.Sprintf(pair, "starts = 1\n[target]\nfrom = \"0\"\nto = \"1\"\n[[error]]\nany = \"leakage\"\n"), "skerry-pair", "ladder", 1))
	ask(exitMet, "check", in("mixed.toml"), in("up.toml"), in("state.toml"))
	ask(exitMet, "design", in("product.toml"), "-out", in("product"))
	ask(exitMissed, "design", in("state.toml"), "-out", in("state"))
	ask(exitMet, "card", in("rack-b-pair.toml"), in("apart.toml"), "-channel=q1 drive", "-out", in("card"))
	change(t, filepath.Join(at("pulse"), "pulse.toml"), "guard_trail = 4", "guard_trail = 3")
	replayed := ask(exitMissed, "replay", at("pulse"))

	for _, v := range jsonKeys() {
		documented := map[string]bool{}
		var order []string
		for _, k := range v.keys {
			if documented[k.path] {
				t.Errorf("%s: help json explains %q twice", v.verbs, k.path)
			}
			documented[k.path] = true
			order = append(order, k.path)
		}
		all := map[string]bool{}
		for name := range strings.SplitSeq(v.verbs, ", ") {
			for _, e := range found[name] {
				maps.Copy(all, e.keys)
				last := -1
				for _, path := range e.order {
					// a list's later elements may have what its first has not: only the top of the path tells the order
					top, _, _ := strings.Cut(path, ".")
					i := slices.IndexFunc(order, func(k string) bool { return k == top || strings.HasPrefix(k, top+".") })
					if i < last {
						t.Errorf("%s prints %q later than help json has it", name, path)
					}
					last = max(last, i)
				}
			}
			delete(found, name)
		}
		for path := range all {
			below := slices.ContainsFunc(order, func(k string) bool { return strings.HasPrefix(k, path+".") || strings.HasPrefix(k, path+"[") })
			if !documented[path] && !(strings.HasSuffix(path, "[]") && below) {
				t.Errorf("%s prints %q, of which help json says nothing", v.verbs, path)
			}
		}
		for _, path := range order {
			if !all[path] {
				t.Errorf("help json explains %q, which %s does not print", path, v.verbs)
			}
		}
	}
	for name := range found {
		t.Errorf("help json says nothing of %s", name)
	}

	// what stands there, by other means
	var v struct {
		Files []struct {
			File, Kind, Error string
			Device            *struct {
				Sites []struct {
					T1        float64 `json:"t1_ns"`
					Frequency float64 `json:"frequency_ghz"`
				}
			}
			Brief *struct {
				Span float64 `json:"span_ns"`
				Held []any
			}
		}
	}
	if err := json.Unmarshal([]byte(checked), &v); err != nil {
		t.Fatal(err)
	}
	if f := v.Files; len(f) != 3 || f[0].Device == nil || f[0].Device.Sites[0].T1 != 60000 || f[0].Device.Sites[0].Frequency != 5.1 ||
		f[1].File != at("no.toml") || !strings.Contains(f[1].Error, "no such file") || f[2].Brief == nil || f[2].Brief.Span != 40 || f[2].Brief.Held == nil {
		t.Errorf("check: %s", checked)
	}
	var r struct {
		Met       bool
		Datasheet *string
		Folder    string
		Verdict   struct {
			Met    bool
			Inputs []struct{ Key, Recorded, Rebuilt string }
			Limits []struct {
				Limit string
				Found float64
			}
		}
	}
	if err := json.Unmarshal([]byte(replayed), &r); err != nil {
		t.Fatal(err)
	}
	if r.Met || r.Verdict.Met || r.Datasheet != nil || r.Folder != at("pulse") || len(r.Verdict.Inputs) != 1 || r.Verdict.Inputs[0].Recorded != "3" || r.Verdict.Inputs[0].Rebuilt != "4" {
		t.Errorf("replay: %+v", r)
	}
}

// What has no figure is null, and a missing list is empty; with bad input nothing is printed.
func TestJSONNumbers(t *testing.T) {
	text, err := json.Marshal(numbers([]float64{0, -1.5, 1e-9, math.Inf(1), math.Inf(-1), math.NaN(), 1.0 / 3, 1e21, math.MaxFloat64, math.Copysign(0, -1)}))
	if want := "[0,-1.5,1e-09,null,null,null,0.3333333333333333,1e+21,1.7976931348623157e+308,-0]"; err != nil || string(text) != want {
		t.Errorf("%s, %v; want %s", text, err, want)
	}
	if text, err := json.Marshal(list[string](nil)); err != nil || string(text) != "[]" {
		t.Errorf("no list is %s, %v", text, err)
	}
	if text, err := json.Marshal([]number{unless(0, 0), unless(1, 0)}); err != nil || string(text) != "[null,1]" {
		t.Errorf("%s, %v", text, err)
	}
	dir := newLab(t)
	change(t, filepath.Join(dir, "rack-b.toml"), "slew_limit", "# slew_limit")
	change(t, filepath.Join(dir, "rack-b.toml"), "ring_out", "# ring_out")
	_, stdout, _ := play("check", "-json", filepath.Join(dir, "rack-b.toml"))
	mustHave(t, "check -json", stdout, `"slew_limit_share_per_sample": null`, `"ring_out_limit_share": null`, `"ring_out_fast_ns": null`, `"carrier_ghz": null`)
	for _, args := range [][]string{{"design", "no.toml"}, {"replay", dir}, {"start", dir}, {"card", "a", "b"}, {"help", "nothing"}, {"version", "x"}} {
		status, stdout, stderr := play(append(args, "-json")...)
		if status != exitBadInput || stdout != "" {
			t.Errorf("%v: %d, %q", args, status, stdout)
		}
		mustBeOneLine(t, stderr)
	}
}
