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
		{"thirty levels", dev, `levels = 2`, `levels = 30`, "site[0].levels", "2 to 8"},
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
			dir := newLab(t)
			path := filepath.Join(dir, c.file)
			at := change(t, path, c.old, c.new)
			if c.name == "key twice" {
				at++
			}
			wanted := []string{c.says, fmt.Sprintf("%s:%d: %s", path, at, c.key)}
			refused(t, dir, wanted, "design", filepath.Join(dir, quickName), "-out", filepath.Join(dir, "pulse"))
			refused(t, dir, wanted, "check", path)
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
