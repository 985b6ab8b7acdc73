package main

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

// change replaces text in a file and gives the number of the line where it stood.
func change(t testing.TB, path, old, new string) int {
	t.Helper()
	text := read(t, path)
	before, after, found := strings.Cut(text, old)
	if !found {
		t.Fatalf("%s has no %q", path, old)
	}
	write(t, path, before+new+after)
	return 1 + strings.Count(before, "\n")
}

// replaceFile puts something else in the place of a file.
func replaceFile(t testing.TB, path string, data []byte) {
	t.Helper()
	if err := os.Remove(path); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(path, data, 0o666); err != nil {
		t.Fatal(err)
	}
}

// An edit replaces text of one of the three files.
type edit struct {
	name     string
	file     string // rack-b.toml, skerry.toml or quick.toml
	old, new string
	key      string // that the message names; the line is that of the edit
	says     string // that it says besides
}

// Malformed and hostile inputs, each by one edit of files that are in order: check of the file, where it alone is at fault,
// and design of the brief end with status 2 and one line that names file, line and key, and leave nothing behind.
func TestEditedInputs(t *testing.T) {
	const rack, dev, quickName = "rack-b.toml", "skerry.toml", "quick.toml"
	deep := strings.Repeat("[", 5000)
	for _, c := range []edit{
		// the profile
		{"unit of another kind", rack, `sample_rate = "1 GS/s"`, `sample_rate = "1 GHz"`, "instrument.sample_rate", "unit of frequency"},
		{"unit in another case", rack, `"40 MHz"`, `"40 mhz"`, "channel[0].full_scale", "case-sensitive"},
		{"no unit", rack, `"40 MHz"`, `"40"`, "channel[0].full_scale", "unit is missing"},
		{"bare number", rack, `"40 MHz"`, `40`, "channel[0].full_scale", "bare number"},
		{"nan", rack, `limit = "95 %"`, `limit = "nan %"`, "channel[0].amplitude_limit", "not a finite"},
		{"inf", rack, `time = "30 ns"`, `time = "inf ns"`, "channel[0].line.tails[0].time", "not a finite"},
		{"out of range", rack, `limit = "95 %"`, `limit = "195 %"`, "channel[0].amplitude_limit", "0.01 % to 100 %"},
		{"huge count", rack, `longest = 65536`, `longest = 99999999999`, "instrument.longest", "1 to 65536"},
		{"count beyond 64 bit", rack, `longest = 65536`, `longest = 999999999999999999999`, "instrument.longest", ""},
		{"count of zero", rack, `block = 8`, `block = 0`, "instrument.block", "1 to 4096"},
		{"negative count", rack, `trail = 4`, `trail = -4`, "channel[0].guard.trail", "0 to 65536"},
		{"fraction of a sample", rack, `trail = 4`, `trail = 4.5`, "channel[0].guard.trail", "whole number"},
		{"key in another case", rack, `slew_limit`, `Slew_limit`, "channel[0].Slew_limit", "slew_limit"},
		{"unknown key", rack, `latency`, ``, "", ""}, // replaced below
		{"key twice", rack, `block = 8`, "block = 8\nblock = 8", "instrument.block", "second time"},
		{"choice", rack, `"I cos - Q sin"`, `"I cos - Q cos"`, "channel[0].mixing", `"I cos + Q sin"`},
		{"order", rack, `order = 2`, `order = 9`, "channel[0].line.lowpass.order", "1 to 8"},
		{"no quotes", rack, `"200 MHz"`, `200 MHz`, "", ""},
		{"no end of a text", rack, `name = "q1 drive"`, `name = "q1 drive`, "", "TOML"},
		{"deep nesting", rack, `trail = 4`, `trail = ` + deep, "", "16 levels"},
		{"control character", rack, `"q1 drive"`, "\"q1\x00drive\"", "", "control character"},
		{"not UTF-8", rack, `"q1 drive"`, "\"q1\xffdrive\"", "", "UTF-8"},
		{"newline in a name", rack, `"q1 drive"`, `"q1\ndrive"`, "channel[0].name", "printable"},
		{"second version", rack, `format = 1`, `format = 2`, "format", "nothing else"},
		{"table instead of text", rack, `kind = "quadrature"`, `kind = { a = 1 }`, "channel[0].kind", ""},
		// the device
		{"energy", dev, `"upper"`, `"middle"`, "site[0].zero", `"lower" or "upper"`},
		{"T2 beyond 2 T1", dev, `"40 us"`, `"121 us"`, "site[0].T2", "twice T1"},
		{"thirty levels", dev, `levels = 2`, `levels = 30`, "site[0].levels", "2 to 16"},
		{"driven site unknown", dev, `site = "q1"`, `site = "q2"`, "drive[0].site", `"q1"`},
		{"time in MHz", dev, `"60 us"`, `"60 MHz"`, "site[0].T1", "unit of frequency"},
		// the brief, alone and against the others
		{"span of half a block", quickName, `"40 ns"`, `"44 ns"`, "span", "nearest: 40 ns and 48 ns"},
		{"span of half a sample", quickName, `"40 ns"`, `"40.5 ns"`, "span", "steps of 8 ns"},
		{"span beyond the instrument", quickName, `"40 ns"`, `"1 ms"`, "span", "8 ns to 65536 ns"},
		{"negative span", quickName, `"40 ns"`, `"-40 ns"`, "span", "a time"},
		{"gate unknown", quickName, `"X90"`, `"X91"`, "target.gate", `"X90"`},
		{"gate and axis", quickName, `gate = "X90"`, "axis = [1, 0, 0]\nangle = \"90 deg\"\ngate = \"X90\"", "target.axis", "exactly one"},
		{"axis of nan", quickName, `gate = "X90"`, "axis = [nan, 0, 0]\nangle = \"90 deg\"", "target.axis", "numbers"},
		{"matrix not unitary", quickName, `gate = "X90"`, `matrix = [[1, 0], [0, 2]]`, "target.matrix", "unitary"},
		{"matrix of a million", quickName, `gate = "X90"`, `matrix = [` + strings.Repeat("[1],", 90000) + `]`, "target.matrix", "2 rows"},
		{"site unknown", quickName, `site = "q1"`, `site = "q7"`, "target.site", `"q1"`},
		{"hold something", quickName, `"nothing"`, `"everything"`, "hold", `"nothing"`},
		{"no starts", quickName, `refine = false`, `starts = 0`, "starts", "1 to 100000"},
		{"seed below zero", quickName, `refine = false`, `seed = -1`, "seed", "0 to"},
		{"truth in quotes", quickName, `refine = false`, `refine = "false"`, "refine", "without quotes"},
		{"coefficients beyond the samples", quickName, `[target]`, "basis = { coefficients = 37 }\n[target]", "basis.coefficients", "at most 36"},
		{"profile unknown", quickName, `"rack-b.toml"`, `"rack-c.toml"`, "profile", "no such file"},
		{"profile is a folder", quickName, `"rack-b.toml"`, `"."`, "profile", "a folder"},
		{"profile is a device", quickName, `"rack-b.toml"`, `"skerry.toml"`, "profile", "which looks like a device file; allowed: a hardware profile"},
		{"device is no file", quickName, `"skerry.toml"`, `"/dev/zero"`, "device", "not a regular file"},
		{"device is the brief", quickName, `"skerry.toml"`, `"quick.toml"`, "device", "which looks like a brief; allowed: a device file"},
	} {
		if c.name == "unknown key" {
			c.old, c.new, c.key, c.says = "slew_limit =", "slow_limit =", "channel[0].slow_limit", "unknown key"
		}
		t.Run(c.name, func(t *testing.T) {
			below := 0
			if c.name == "key twice" {
				below = 1
			}
			edited(t, newLab(t), quickName, below, c)
		})
	}
}

// edited demands that check of a file that was edited, and design of the brief, name the line of the edit or one so many below it.
func edited(t *testing.T, dir, brief string, below int, c edit) {
	t.Helper()
	path := filepath.Join(dir, c.file)
	at := change(t, path, c.old, c.new) + below
	wanted := []string{c.says, fmt.Sprintf("%s:%d: %s", path, at, c.key)}
	refused(t, dir, wanted, "design", filepath.Join(dir, brief), "-out", filepath.Join(dir, "pulse"))
	refused(t, dir, wanted, "check", path)
}

// The same of what only several sites have. What the device or the brief says of the others is at fault by itself or against them.
func TestEditedPairs(t *testing.T) {
	const dev, name = "skerry-pair.toml", "sqrt-iswap.toml"
	coupling := "kind = \"exchange\"          # or \"heisenberg\", \"dipolar\", \"dispersive\", or any product, as in on = { q1 = \"Z\", q2 = \"Z\" }\n"
	target := "sites = [\"q1\", \"q2\"]       # the gate acts on these, in this order; other sites of the device would be left alone\n"
	gate := "gate = \"sqrt-iSWAP\"        # or another by its name, controlled = \"X90\", gates = { ... }, a matrix, or from and to for states\n"
	free := "free_z = \"both\""
	errors := func(text string) string { return "[[error]]\n" + text + "\n[require]" }
	for _, c := range []struct {
		edit
		below int
	}{
		// the device
		{edit{"two sites of one name", dev, `name = "q2"`, `name = "q1"`, "site[1].name", "a name of its own"}, 0},
		{edit{"levels beyond 64", dev, "levels = 2", "levels = 16\nkind = \"spin\"\n[[site]]\nname = \"q3\"\nkind = \"spin\"\nlevels = 16", "site[1].levels", "at most 64"}, 5},
		{edit{"kind", dev, `zero = "upper"             #`, `kind = "atom" #`, "site[0].kind", `"spin" or "ladder"`}, 0},
		{edit{"ladder upside down", dev, "levels = 2", "kind = \"ladder\"", "site[0].zero", "it stands on |0>"}, 1},
		{edit{"ladder without anharmonicity", dev, "levels = 2", "levels = 3\nkind = \"ladder\"", "site[0].anharmonicity", "of a ladder"}, -2},
		{edit{"quadratic of a ladder", dev, "levels = 2", "levels = 3\nkind = \"ladder\"\nanharmonicity = \"-220 MHz\"\nquadratic = \"1 MHz\"", "site[0].quadratic", "quadratic on a spin"}, 3},
		{edit{"higher of a spin", dev, "levels = 2", "levels = 3\nkind = \"spin\"\nhigher = [\"1 MHz\"]", "site[0].higher", "higher on a ladder"}, 2},
		{edit{"code out of range", dev, "levels = 2", "code = [0, 2]", "site[0].code", "0 to 1"}, 0},
		{edit{"code twice the same", dev, "levels = 2", "code = [1, 1]", "site[0].code", "two levels"}, 0},
		{edit{"a million higher", dev, "levels = 2", "higher = [" + strings.Repeat("\"1 MHz\",", 50000) + "]", "site[0].higher", "at most 13"}, 0},
		{edit{"coupling of another kind", dev, `"exchange"  `, `"gravity"  `, "coupling[0].kind", `"dispersive"`}, 0},
		{edit{"coupling on beside kind", dev, coupling, "on = { q1 = \"Z\", q2 = \"Z\" }\n", "coupling[0].on", "on alone"}, 0},
		{edit{"coupling along W", dev, coupling + "between = [\"q1\", \"q2\"]", "on = { q1 = \"Z\", q2 = \"W\" }", "coupling[0].on.q2", `"X", "Y" or "Z"`}, 0},
		{edit{"coupling of one site", dev, coupling + "between = [\"q1\", \"q2\"]", "on = { q1 = \"Z\" }", "coupling[0].on", "two or more of"}, 0},
		{edit{"coupling of an unknown site", dev, coupling + "between = [\"q1\", \"q2\"]", "on = { q1 = \"Z\", q2 = \"Z\", q7 = \"Z\" }", "coupling[0].on.q7", "unknown key"}, 0},
		{edit{"coupling between a site and itself", dev, `["q1", "q2"]`, `["q1", "q1"]`, "coupling[0].between", "two sites of this device"}, 0},
		{edit{"coupling of three", dev, `["q1", "q2"]`, `["q1", "q2", "q2"]`, "coupling[0].between", "at most 2"}, 0},
		{edit{"strength without end", dev, `"5 MHz"`, `"inf MHz"`, "coupling[0].strength", "not a finite"}, 0},
		{edit{"strength as a number", dev, `"5 MHz"`, `5`, "coupling[0].strength", "bare number"}, 0},
		{edit{"rotating wave without frequencies", dev, `"5 MHz"`, "\"5 MHz\"\nrotating_wave = true", "coupling[0].rotating_wave", "each of them states its frequency"}, 1},
		{edit{"one frequency of two", dev, `name = "q1"`, "name = \"q1\"\nfrequency = \"5.1 GHz\"", "coupling[0]", "or for none"}, 24},
		{edit{"a channel twice", dev, `channel = "q2 drive"`, `channel = "q1 drive"`, "drive[1].channel", "a channel of its own"}, 0},
		{edit{"channel unknown", dev, `channel = "q2 drive"`, `channel = "q9 drive"`, "drive[1].channel", `"q1 drive", "q2 drive"`}, 0},
		{edit{"crosstalk onto its own site", dev, `"5 MHz"`, "\"5 MHz\"\n[[crosstalk]]\nchannel = \"q1 drive\"\nsite = \"q1\"\nshare = \"3 %\"", "crosstalk[0].site", "another site"}, 3},
		{edit{"crosstalk of no channel", dev, `"5 MHz"`, "\"5 MHz\"\n[[crosstalk]]\nchannel = \"q7\"\nsite = \"q2\"\nshare = \"3 %\"", "crosstalk[0].channel", `"q2 drive"`}, 2},
		{edit{"crosstalk of nan", dev, `"5 MHz"`, "\"5 MHz\"\n[[crosstalk]]\nchannel = \"q1 drive\"\nsite = \"q2\"\nshare = \"nan %\"", "crosstalk[0].share", "not a finite"}, 4},
		{edit{"phase beyond a turn", dev, `"5 MHz"`, "\"5 MHz\"\n[[crosstalk]]\nchannel = \"q1 drive\"\nsite = \"q2\"\nshare = \"3 %\"\nphase = \"400 deg\"", "crosstalk[0].phase", "-360 deg to 360 deg"}, 5},
		// the target
		{edit{"sites twice", name, `["q1", "q2"]`, `["q1", "q1"]`, "target.sites", "each site once"}, 0},
		{edit{"site unknown", name, `["q1", "q2"]`, `["q1", "q7"]`, "target.sites", `"q1", "q2"`}, 0},
		{edit{"seven sites", name, `["q1", "q2"]`, `["a", "b", "c", "d", "e", "f", "g"]`, "target.sites", "at most 6"}, 0},
		{edit{"gate of one site", name, `"sqrt-iSWAP"`, `"X90"`, "target.gate", `"sqrt-iSWAP"`}, 0},
		{edit{"site beside sites", name, target, "site = \"q1\"\n" + target, "target.sites", "one of the two"}, 1},
		{edit{"gates beside sites", name, gate, "gates = { q1 = \"X90\", q2 = \"X90\" }\n", "target.sites", "gates alone"}, -1},
		{edit{"gates of what is none", name, target + gate, "gates = { q1 = \"X90\", q2 = \"X91\" }\n", "target.gates.q2", `"X90"`}, 0},
		{edit{"gates as a text", name, target + gate, "gates = \"X90\"\n", "target.gates", "a table"}, 0},
		{edit{"matrix of one site", name, gate, "matrix = [[1, 0], [0, 1]]\n", "target.matrix", "4 rows"}, 0},
		{edit{"matrix not unitary", name, gate, "matrix = [[1,0,0,0],[0,1,0,0],[0,0,1,0],[0,0,0,2]]\n", "target.matrix", "unitary"}, 0},
		{edit{"controlled by nothing", name, target + gate, "site = \"q1\"\ncontrolled = \"X90\"\n", "target.controlled", "the controls and then the site"}, 1},
		{edit{"axis of two sites", name, gate, "axis = [1, 0, 0]\nangle = \"90 deg\"\n", "target.axis", "for one site"}, 0},
		{edit{"local rotations beside free Z", name, free, free + "\nup_to = \"local rotations\"", "target.free_z", "one of the two"}, 0},
		{edit{"up to something", name, free, `up_to = "everything"`, "target.up_to", `"local rotations"`}, 0},
		{edit{"states beside sites", name, gate, "from = \"00\"\nto = \"11\"\n", "target.sites", "all sites of the device"}, -1},
		{edit{"states of three sites", name, target + gate + free, "from = \"000\"\nto = \"111\"\n#", "target.from", "labels of 2 digits"}, 0},
		{edit{"states of other digits", name, target + gate + free, "from = \"02\"\nto = \"11\"\n#", "target.from", "labels of 0 and 1"}, 0},
		{edit{"more states than before", name, target + gate + free, "from = \"00\"\nto = [\"01\", \"10\"]\n#", "target.to", "as many states"}, 1},
		{edit{"state of nan", name, target + gate + free, "from = [nan, 0, 0, 0]\nto = \"11\"\n#", "target.from", "a number"}, 0},
		{edit{"state of no length", name, target + gate + free, "from = [0, 0, 0, 0]\nto = \"11\"\n#", "target.from", "length 1"}, 0},
		{edit{"state of nothing", name, target + gate + free, "from = []\nto = \"11\"\n#", "target.from", "no state"}, 0},
		{edit{"from without to", name, target + gate + free, "from = \"00\"\n#", "target.to", ""}, -1},
		{edit{"free Z of states", name, target + gate, "from = \"00\"\nto = \"11\"\n", "target.free_z", "for a gate"}, 2},
		// what may go wrong
		{edit{"any of another word", name, `[require]`, errors(`any = "three-body"`), "error[0].any", `"two-body"`}, 1},
		{edit{"any on an unknown site", name, `[require]`, errors(`any = "on q1, q7"`), "error[0].any", `"q1", "q2"`}, 1},
		{edit{"leakage of spins", name, `[require]`, errors(`any = "leakage"`), "error[0].any", "more than two levels"}, 1},
		{edit{"except what is not there", name, `[require]`, errors("any = \"one-body\"\nexcept = [{ q1 = \"Z\", q2 = \"Z\" }]"), "error[0].except[0]", "not of the class"}, 2},
		{edit{"except everything", name, `[require]`, errors("any = \"on q1\"\nexcept = [{ q1 = \"X\" }, { q1 = \"Y\" }, { q1 = \"Z\" }]"), "error[0].any", "keeps an operator"}, 1},
		{edit{"except beside another kind", name, `[require]`, errors("detuning = \"q1\"\nexcept = [{ q1 = \"Z\" }]"), "error[0].except", "beside any"}, 2},
		{edit{"rates elsewhere", name, `[require]`, errors("any = \"all\"\nrates = \"../rates.csv\""), "error[0].rates", "beside the brief"}, 2},
		{edit{"rates that are not there", name, `[require]`, errors("any = \"all\"\nrates = \"rates.csv\""), "error[0].rates", "no such file"}, 2},
		{edit{"product of nothing", name, `[require]`, errors(`on = {}`), "error[0].on", "0 sites"}, 1},
		{edit{"product along W", name, `[require]`, errors(`on = { q1 = "W" }`), "error[0].on.q1", `"X", "Y" or "Z"`}, 1},
		{edit{"product of an unknown site", name, `[require]`, errors(`on = { q1 = "Z", q9 = "Z" }`), "error[0].on", `"q1", "q2"`}, 1},
		{edit{"operator of no site", name, `[require]`, errors(`operator = "X"`), "error[0].operator", "a site"}, 1},
		{edit{"collective W", name, `[require]`, errors(`collective = "W"`), "error[0].collective", `"X", "Y" or "Z"`}, 1},
		{edit{"matrix of another size", name, `[require]`, errors(`matrix = [[1, 0, 0], [0, -1, 0], [0, 0, 0]]`), "error[0].matrix", "4 rows"}, 1},
		{edit{"crosstalk without a site", name, `[require]`, errors(`crosstalk = "q1 drive"`), "error[0].site", "a text"}, 0},
		{edit{"crosstalk onto its own", name, `[require]`, errors("crosstalk = \"q1 drive\"\nsite = \"q1\""), "error[0].site", "another site"}, 2},
		{edit{"margin of what is not held", name, `infidelity = 1e-6 `, "infidelity = 1e-6\n[[require.margin]]\nerror = \"detuning\"\nsize = \"1 MHz\"\n#", "require.margin[0].error", "not on this device"}, 2},
		{edit{"phases of two sites", name, "span = \"40 ns\"", "phases = [\"0 deg\", \"90 deg\"]\nspan = \"40 ns\"", "", `phase_by: found "samples" for several sites`}, 0},
	} {
		t.Run(c.name, func(t *testing.T) {
			dir := newPair(t)
			path := filepath.Join(dir, c.file)
			switch {
			case strings.HasPrefix(c.new, "[[error]]"): // in the place of nothing
				change(t, path, "hold = \"nothing\"\n", "")
			case c.name == "phases of two sites", c.name == "channel unknown": // a sentence without a line; a fault only against the profile
				at := change(t, path, c.old, c.new)
				wanted := []string{fmt.Sprintf("%s:%d: %s", path, at, c.key), c.says}
				if c.key == "" {
					wanted[0] = path + ": "
				}
				for _, args := range [][]string{{"design", filepath.Join(dir, name), "-out", filepath.Join(dir, "pulse")}, {"check", filepath.Join(dir, name)}} {
					refused(t, dir, wanted, args...)
				}
				return
			}
			edited(t, dir, name, c.below, c.edit)
		})
	}
}

// Files of rates that are none, through check and design.
func TestHostileRates(t *testing.T) {
	for name, c := range map[string]struct{ text, says string }{
		"empty": {"", "empty file"}, "another header": {"p,r\nZZ,1\n", "pauli,rate"}, "nan": {"pauli,rate\nZZ,nan\n", "0 to"}, "negative": {"pauli,rate\nZZ,-1\n", "0 to"},
		"another letter": {"pauli,rate\nZW,1\n", "I, X, Y or Z"}, "too many letters": {"pauli,rate\nZZZ,1\n", "2 letters"}, "twice": {"pauli,rate\nZZ,1\nZZ,1\n", "once"},
		"no rate": {"pauli,rate\nZZ\n", "columns"}, "binary": {"pauli,rate\n\x00\xff,1\n", "I, X, Y or Z"}, "nothing above zero": {"pauli,rate\nZZ,0\n", "above 0"},
		"too large": {"pauli,rate\n" + strings.Repeat("ZZ,1\n", 300_000), "1 MiB"}, "a quote without end": {"pauli,rate\n\"ZZ,1\n", "comma-separated"},
	} {
		t.Run(name, func(t *testing.T) {
			dir := newPair(t)
			path := filepath.Join(dir, "b.toml")
			write(t, path, fmt.Sprintf(pair, "[target]\nsites = [\"q1\", \"q2\"]\ngate = \"CZ\"\n[[error]]\nany = \"all\"\nrates = \"rates.csv\"\n"))
			write(t, filepath.Join(dir, "rates.csv"), c.text)
			for _, args := range [][]string{{"design", path, "-out", filepath.Join(dir, "pulse")}, {"check", path}} {
				refused(t, dir, []string{dir, c.says}, args...)
			}
		})
	}
}

// refused demands status 2, one line, nothing on stdout and nothing written.
func refused(t *testing.T, dir string, wanted []string, args ...string) {
	t.Helper()
	before := tree(t, dir)
	status, stdout, stderr := play(args...)
	if status != exitBadInput {
		t.Errorf("%q: status %d", args, status)
	}
	mustBeOneLine(t, stderr, wanted...)
	if stdout != "" && args[0] != "check" {
		t.Errorf("%q: stdout %q", args, stdout)
	}
	if d := compare(before, tree(t, dir)); d != nil {
		t.Errorf("%q changed %v", args, d)
	}
}

// More hostile inputs, which an edit does not make.
func TestHostileFiles(t *testing.T) {
	for _, c := range []struct {
		name   string
		file   string
		make   func(t *testing.T, path string)
		wanted string
	}{
		{"missing", "rack-b.toml", func(t *testing.T, path string) { os.Remove(path) }, "no such file"},
		{"folder", "skerry.toml", func(t *testing.T, path string) { os.Remove(path); os.Mkdir(path, 0o777) }, "a folder"},
		{"garbage", "rack-b.toml", func(t *testing.T, path string) {
			garbage := make([]byte, 4096)
			for i := range garbage {
				garbage[i] = byte(i*i*7 + i>>3)
			}
			replaceFile(t, path, garbage)
		}, "rack-b.toml:1: "},
		{"2 MB", "quick.toml", func(t *testing.T, path string) {
			replaceFile(t, path, append([]byte(quick), bytes.Repeat([]byte("# more\n"), 300_000)...))
		}, "at most 1 MiB"},
		{"empty", "skerry.toml", func(t *testing.T, path string) { replaceFile(t, path, nil) }, "skerry.toml"},
		{"loop of links", "rack-b.toml", func(t *testing.T, path string) {
			os.Remove(path)
			if err := os.Symlink(filepath.Base(path), path); err != nil {
				t.Fatal(err)
			}
		}, `profile: found "rack-b.toml", and at `},
		{"dangling link", "quick.toml", func(t *testing.T, path string) {
			os.Remove(path)
			if err := os.Symlink("nowhere", path); err != nil {
				t.Fatal(err)
			}
		}, "no such file"},
		{"a hundred channels", "rack-b.toml", func(t *testing.T, path string) {
			text := read(t, path)
			write(t, path, text+strings.Repeat("[[channel]]\nname = \"x\"\n", 99))
		}, "channel: found 100 tables; allowed: at most 64"},
		{"120 000 tables", "quick.toml", func(t *testing.T, path string) {
			write(t, path, quick+strings.Repeat("[[e]]\n", 120_000))
		}, "at most 100000 keys"},
		{"two channels of one name", "rack-b.toml", func(t *testing.T, path string) {
			text := read(t, path)
			_, channel, _ := strings.Cut(text, "\n[[channel]]")
			write(t, path, text+"\n[[channel]]"+channel)
		}, "channel[1].name"},
		{"no site", "skerry.toml", func(t *testing.T, path string) {
			write(t, path, "format = 1\nname = \"x\"\n[[drive]]\nsite = \"q1\"\nchannel = \"q1 drive\"\n")
		}, "site: found none"},
		{"error beside hold", "quick.toml", func(t *testing.T, path string) {
			write(t, path, quick+"[[error]]\nany = \"all\"\n")
		}, "quick.toml:11: error[0]: "},
		{"amplitude of an unknown channel", "quick.toml", func(t *testing.T, path string) {
			write(t, path, strings.Replace(quick, `hold = "nothing"`, "", 1)+"[[error]]\namplitude = \"q9 drive\"\n")
		}, `quick.toml:12: error[0].amplitude: found "q9 drive"`},
		{"nan as weight", "quick.toml", func(t *testing.T, path string) {
			write(t, path, strings.Replace(quick, `hold = "nothing"`, "", 1)+"[[error]]\nany = \"all\"\nweight = nan\n")
		}, "quick.toml:13: error[0].weight: "},
		{"infinite requirement", "quick.toml", func(t *testing.T, path string) {
			write(t, path, quick+"[require]\ninfidelity = inf\n")
		}, "quick.toml:12: require.infidelity: "},
		{"margin of any", "quick.toml", func(t *testing.T, path string) {
			write(t, path, strings.Replace(quick, `hold = "nothing"`, "", 1)+"[[error]]\nany = \"all\"\n[[require.margin]]\nerror = \"any static error\"\nsize = \"1 MHz\"\n")
		}, "quick.toml:14: require.margin[0].error: "},
	} {
		t.Run(c.name, func(t *testing.T) {
			dir := newLab(t)
			path := filepath.Join(dir, c.file)
			c.make(t, path)
			refused(t, dir, []string{path, c.wanted}, "design", filepath.Join(dir, "quick.toml"), "-out", filepath.Join(dir, "pulse"))
			refused(t, dir, []string{path}, "check", path)
		})
	}
}

// A profile that nothing can be played on is in order as a file; the limit that binds is named.
func TestNothingPlayable(t *testing.T) {
	for _, c := range []struct{ name, old, new, says string }{
		{"guards", "trail = 4", "trail = 65536", "guard"},
		{"guards of the span", "trail = 4", "trail = 40", "guard"},
		{"slew within rounding", `"25 %/sample"`, `"0.01 %/sample"`, "slew_limit"},
		{"amplitude within rounding", `"14 bit"`, `"2 bit"`, ""},
	} {
		t.Run(c.name, func(t *testing.T) {
			dir := newLab(t)
			path := filepath.Join(dir, "rack-b.toml")
			change(t, path, c.old, c.new)
			if c.says == "" {
				change(t, path, `limit = "95 %"`, `limit = "1 %"`)
				change(t, path, `slew_limit`, `# slew_limit`)
				c.says = "amplitude_limit"
			}
			refused(t, dir, []string{"quick.toml", c.says}, "design", filepath.Join(dir, "quick.toml"), "-out", filepath.Join(dir, "pulse"))
			refused(t, dir, []string{"quick.toml", c.says}, "check", filepath.Join(dir, "quick.toml"))
			if c.name == "guards of the span" { // longer spans have room
				if status, _, stderr := play("check", path); status != exitMet {
					t.Errorf("check: %d, %s", status, stderr)
				}
				return
			}
			refused(t, dir, []string{path, c.says}, "check", path)
		})
	}
}

// rehash makes the record's hash of a file that of its bytes.
func rehash(t testing.TB, pulse, name string) {
	t.Helper()
	sum := sha256.Sum256([]byte(read(t, filepath.Join(pulse, filepath.FromSlash(name)))))
	record := filepath.Join(pulse, "pulse.toml")
	text := read(t, record)
	entry := regexp.MustCompile(`(name = "` + regexp.QuoteMeta(name) + `"\nsha256 = ")[0-9a-f]{64}`)
	if !entry.MatchString(text) {
		t.Fatalf("the record has no hash of %s", name)
	}
	write(t, record, entry.ReplaceAllString(text, "${1}"+hex.EncodeToString(sum[:])))
}

// newPulse designs the quick brief.
func newPulse(t testing.TB) (dir, pulse string) {
	t.Helper()
	dir = newLab(t)
	pulse = filepath.Join(dir, "pulse")
	if status, _, stderr := play("design", filepath.Join(dir, "quick.toml"), "-out", pulse); status != exitMet {
		t.Fatalf("design: %d, %s", status, stderr)
	}
	return dir, pulse
}

// copyTree copies what tree gave.
func copyTree(t testing.TB, files map[string]string, dir string) {
	t.Helper()
	for name, text := range files {
		path := filepath.Join(dir, name)
		if strings.HasPrefix(text, "d") && !strings.Contains(text, "\n") {
			continue
		}
		if err := os.MkdirAll(filepath.Dir(path), 0o777); err != nil {
			t.Fatal(err)
		}
		write(t, path, text)
	}
}

// Pulse folders at fault.
func TestHostileFolders(t *testing.T) {
	_, made := newPulse(t)
	good := tree(t, made)
	codes := func(pulse string) string { return filepath.Join(pulse, "q1-drive.npy") }
	record := func(pulse string) string { return filepath.Join(pulse, "pulse.toml") }
	for _, c := range []struct {
		name   string
		make   func(t *testing.T, pulse string)
		wanted string
	}{
		{"truncated codes", func(t *testing.T, p string) { write(t, codes(p), good["q1-drive.npy"][:200]) }, "q1-drive.npy: changed since"},
		{"truncated codes, hash mended", func(t *testing.T, p string) {
			write(t, codes(p), good["q1-drive.npy"][:200])
			rehash(t, p, "q1-drive.npy")
		}, "q1-drive.npy: "},
		{"header cut off, hash mended", func(t *testing.T, p string) {
			write(t, codes(p), good["q1-drive.npy"][:9])
			rehash(t, p, "q1-drive.npy")
		}, "q1-drive.npy: "},
		{"more codes, hash mended", func(t *testing.T, p string) {
			write(t, codes(p), good["q1-drive.npy"]+"\x00\x00")
			rehash(t, p, "q1-drive.npy")
		}, "q1-drive.npy: "},
		{"one code changed", func(t *testing.T, p string) {
			data := []byte(good["q1-drive.npy"])
			data[140] ^= 1
			write(t, codes(p), string(data))
		}, "q1-drive.npy: changed since"},
		{"another type, hash mended", func(t *testing.T, p string) {
			write(t, codes(p), strings.Replace(good["q1-drive.npy"], "<i2", "<f2", 1))
			rehash(t, p, "q1-drive.npy")
		}, "q1-drive.npy: "},
		{"another shape, hash mended", func(t *testing.T, p string) {
			write(t, codes(p), strings.Replace(good["q1-drive.npy"], "(40, 2)", "(80, 1)", 1))
			rehash(t, p, "q1-drive.npy")
		}, "q1-drive.npy: "},
		{"huge shape, hash mended", func(t *testing.T, p string) {
			write(t, codes(p), strings.Replace(good["q1-drive.npy"], "(40, 2), }          ", "(4000000000, 2), }  ", 1))
			rehash(t, p, "q1-drive.npy")
		}, "q1-drive.npy: "},
		{"no codes", func(t *testing.T, p string) { os.Remove(codes(p)) }, "q1-drive.npy: "},
		{"codes are a link", func(t *testing.T, p string) {
			os.Rename(codes(p), filepath.Join(p, "elsewhere"))
			if err := os.Symlink("elsewhere", codes(p)); err != nil {
				t.Fatal(err)
			}
		}, "q1-drive.npy: a link"},
		{"wrong hash", func(t *testing.T, p string) { change(t, record(p), `sha256 = "`, `sha256 = "00`) }, "changed since"},
		{"hash of a file outside", func(t *testing.T, p string) {
			change(t, record(p), `name = "q1-drive.npy"`, `name = "../quick.toml"`)
		}, "does not name a file inside"},
		{"profile changed", func(t *testing.T, p string) {
			change(t, filepath.Join(p, "inputs", "profile.toml"), `"200 MHz"`, `"210 MHz"`)
		}, "profile.toml: changed since"},
		{"profile is garbage, hash mended", func(t *testing.T, p string) {
			write(t, filepath.Join(p, "inputs", "profile.toml"), "\x01\x02")
			rehash(t, p, "inputs/profile.toml")
		}, "profile.toml:1: "},
		{"no inputs", func(t *testing.T, p string) { os.RemoveAll(filepath.Join(p, "inputs")) }, "inputs"},
		{"no record", func(t *testing.T, p string) { os.Remove(record(p)) }, "found a folder without pulse.toml"},
		{"record cut off", func(t *testing.T, p string) { write(t, record(p), good["pulse.toml"][:1500]) }, "pulse.toml"},
		{"record is binary", func(t *testing.T, p string) { write(t, record(p), "\x7fELF\x02\x01\x01") }, "pulse.toml:1: "},
		{"unknown key in the model", func(t *testing.T, p string) { change(t, record(p), "bits = 14", "bits = 14\nbytes = 2") }, ": model.bytes: "},
		{"key in another case", func(t *testing.T, p string) { change(t, record(p), "bits = 14", "Bits = 14") }, ": model.Bits: "},
		{"nan in the model", func(t *testing.T, p string) { change(t, record(p), "sample_period_ns = 1.0", "sample_period_ns = nan") }, ": model.sample_period_ns: "},
		{"inf in the claim", func(t *testing.T, p string) { change(t, record(p), "tail_angle_rad = ", "tail_angle_rad = inf # ") }, ": claim.tail_angle_rad: "},
		{"huge count", func(t *testing.T, p string) { change(t, record(p), "samples = 40", "samples = 4000000000") }, ": model.samples: "},
		{"other count", func(t *testing.T, p string) { change(t, record(p), "samples = 40", "samples = 48") }, "q1-drive.npy: "},
		{"unstable line", func(t *testing.T, p string) {
			change(t, record(p), "[-0.03333333333333333, 0.0]", "[0.03333333333333333, 0.0]")
		}, ": model.channel[0].poles_per_ns"},
		{"huge dimension", func(t *testing.T, p string) { change(t, record(p), "dim = 2", "dim = 100000") }, ": model.dim: "},
		{"no name", func(t *testing.T, p string) { change(t, record(p), `name = "quick"`, "") }, "pulse.name"},
		{"status of another type", func(t *testing.T, p string) { change(t, record(p), `status = "found"`, "status = 1") }, "pulse.toml"},
		{"broken basis", func(t *testing.T, p string) {
			change(t, record(p), "coefficients_per_quadrature = 6", `coefficients_per_quadrature = "six"`)
		}, "pulse.toml"},
	} {
		t.Run(c.name, func(t *testing.T) {
			dir := t.TempDir()
			pulse := filepath.Join(dir, "pulse")
			copyTree(t, good, pulse)
			c.make(t, pulse)
			refused(t, dir, []string{pulse, c.wanted}, "replay", pulse)
			refused(t, dir, []string{pulse, c.wanted}, "replay", pulse, "-datasheet", filepath.Join(dir, "page.html"))
		})
	}
	dir := t.TempDir()
	file := filepath.Join(dir, "file")
	write(t, file, quick)
	refused(t, dir, []string{file, "found a file; allowed: a pulse folder"}, "replay", file)
	refused(t, dir, []string{filepath.Join(dir, "none"), "found no such folder; allowed: a pulse folder", "holdfast design"}, "replay", filepath.Join(dir, "none"))
	refused(t, dir, []string{dir, "found a folder without pulse.toml"}, "replay", dir)
	refused(t, dir, []string{dir, "folder"}, "design", dir)
	lab := newLab(t)
	refused(t, lab, []string{filepath.Join(lab, "a", "b", "c"), "found no folder " + filepath.Join(lab, "a", "b"), "allowed: a new name in a folder that is there"}, "start", filepath.Join(lab, "a", "b", "c"))
	refused(t, lab, []string{filepath.Join(lab, "rack-b.toml"), "found what looks like a hardware profile; allowed: a brief"}, "design", filepath.Join(lab, "rack-b.toml"))
	refused(t, made, []string{made, "replay"}, "check", made)
	refused(t, made, []string{"pulse.toml", "replay"}, "check", filepath.Join(made, "pulse.toml"))
}

// A record that was made to fit other files is not refused, and not believed either: status 1, and the page says where.
func TestSwappedInputs(t *testing.T) {
	_, made := newPulse(t)
	good := tree(t, made)
	for _, c := range []struct {
		name string
		make func(t *testing.T, pulse string)
		says string
	}{
		{"profile", func(t *testing.T, p string) {
			change(t, filepath.Join(p, "inputs", "profile.toml"), `corner = "200 MHz"`, `corner = "210 MHz"`)
			rehash(t, p, "inputs/profile.toml")
		}, "poles"},
		{"device", func(t *testing.T, p string) {
			change(t, filepath.Join(p, "inputs", "device.toml"), `"upper"`, `"lower"`)
			rehash(t, p, "inputs/device.toml")
		}, "operators"},
		{"brief", func(t *testing.T, p string) {
			change(t, filepath.Join(p, "inputs", "brief.toml"), `"X90"`, `"Y90"`)
			rehash(t, p, "inputs/brief.toml")
		}, "target"},
		{"codes", func(t *testing.T, p string) {
			data := []byte(good["q1-drive.npy"])
			data[128+4*20] ^= 0x40 // 64 codes in the middle
			write(t, filepath.Join(p, "q1-drive.npy"), string(data))
			rehash(t, p, "q1-drive.npy")
		}, "does not agree with the record"},
	} {
		t.Run(c.name, func(t *testing.T) {
			pulse := filepath.Join(t.TempDir(), "pulse")
			copyTree(t, good, pulse)
			c.make(t, pulse)
			status, stdout, stderr := play("replay", pulse)
			if status != exitMissed || stderr != "" {
				t.Errorf("status %d, stderr %q", status, stderr)
			}
			mustHave(t, "replay", stdout, "MISSED", c.says)
		})
	}
}
