package main

import (
	"bytes"
	"context"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"runtime"
	"sort"
	"strings"
	"testing"

	"holdfast/design/replay"
)

// asProgram, set in the environment, makes this test binary the program itself,
// so that a test can run it as a process and end it.
const asProgram = "HOLDFAST_TEST_AS_PROGRAM"

func TestMain(m *testing.M) {
	if os.Getenv(asProgram) != "" {
		main()
	}
	os.Exit(m.Run())
}

// play runs the program in this process.
func play(args ...string) (status int, stdout, stderr string) {
	var out, errs bytes.Buffer
	status = run(context.Background(), args, &out, &errs)
	return status, out.String(), errs.String()
}

// quick is a brief that is done in a moment.
const quick = `format = 1
name = "quick"
profile = "rack-b.toml"
device = "skerry.toml"
span = "40 ns"
hold = "nothing"
refine = false
[target]
site = "q1"
gate = "X90"
`

// held is a brief with an error in it, which a search and a refinement solve.
const held = `format = 1
name = "held"
profile = "rack-b.toml"
device = "skerry.toml"
span = "72 ns"
[target]
site = "q1"
gate = "X90"
[[error]]
detuning = "q1"
weight = 1
[require]
infidelity = 1e-6
`

// newLab makes a folder with the starter files and the briefs above.
func newLab(t testing.TB) string {
	t.Helper()
	dir := filepath.Join(t.TempDir(), "lab")
	if status, _, stderr := play("start", dir); status != exitMet {
		t.Fatalf("start: %d, %s", status, stderr)
	}
	write(t, filepath.Join(dir, "quick.toml"), quick)
	write(t, filepath.Join(dir, "held.toml"), held)
	return dir
}

func write(t testing.TB, path, text string) {
	t.Helper()
	if err := os.WriteFile(path, []byte(text), 0o666); err != nil {
		t.Fatal(err)
	}
}

func read(t testing.TB, path string) string {
	t.Helper()
	data, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	return string(data)
}

// tree lists every file below dir with its bytes, and every other thing with its kind.
func tree(t testing.TB, dir string) map[string]string {
	t.Helper()
	files := map[string]string{}
	err := filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		name, err := filepath.Rel(dir, path)
		if err != nil {
			return err
		}
		if !d.Type().IsRegular() {
			files[name] = d.Type().String()
			return nil
		}
		files[name] = read(t, path)
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	return files
}

// compare names the files in which two trees differ.
func compare(a, b map[string]string) (names []string) {
	for name, data := range a {
		if other, ok := b[name]; !ok || other != data {
			names = append(names, name)
		}
	}
	for name := range b {
		if _, ok := a[name]; !ok {
			names = append(names, name)
		}
	}
	sort.Strings(names)
	return names
}

func mustHave(t testing.TB, what, text string, wanted ...string) {
	t.Helper()
	// a long line is broken between words
	flat := strings.Join(strings.Fields(text), " ")
	for _, s := range wanted {
		if !strings.Contains(flat, s) {
			t.Errorf("%s does not say %q:\n%s", what, s, text)
		}
	}
}

// The way of a first user, from nothing to a replayed pulse.
func TestHappyPath(t *testing.T) {
	dir := newLab(t)
	at := func(name string) string { return filepath.Join(dir, name) }

	status, stdout, stderr := play("check", at("rack-b.toml"), at("skerry.toml"), at("x90.toml"), at("quick.toml"))
	if status != exitMet || stderr != "" {
		t.Fatalf("check: %d, %s", status, stderr)
	}
	mustHave(t, "check", stdout, "hardware profile", `device "Skerry"`, `brief "x90-any"`, `brief "quick"`)

	pulse := at("pulse")
	status, stdout, stderr = play("design", at("quick.toml"), "-out", pulse)
	if status != exitMet || stderr != "" {
		t.Fatalf("design: %d, %s", status, stderr)
	}
	mustHave(t, "design", stdout, "MET.", "search: found", "pulse: "+pulse, "datasheet: "+filepath.Join(pulse, datasheetFile))
	made := tree(t, pulse)
	for _, name := range []string{"pulse.toml", "q1-drive.npy", "q1-drive-exact.npy", "q1-drive.csv", "q1-drive.int16", "q1-drive-arrives.npy", datasheetFile, "inputs/profile.toml", "inputs/device.toml", "inputs/brief.toml"} {
		if made[name] == "" {
			t.Errorf("the pulse folder has no %s", name)
		}
	}
	if made["inputs/brief.toml"] != quick {
		t.Errorf("inputs/brief.toml is no copy of the brief")
	}
	for name, text := range made {
		if strings.Contains(text, dir) {
			t.Errorf("%s tells the path %s", name, dir)
		}
	}

	status, stdout, stderr = play("replay", pulse)
	if status != exitMet || stderr != "" {
		t.Fatalf("replay: %d, %s", status, stderr)
	}
	mustHave(t, "replay", stdout, "MET.", "infidelity")
	if d := compare(made, tree(t, pulse)); d != nil {
		t.Errorf("replay changed %v", d)
	}
	page := at("page.html")
	if status, _, stderr = play("replay", pulse, "-datasheet", page); status != exitMet {
		t.Fatalf("replay -datasheet: %d, %s", status, stderr)
	}
	if read(t, page) != made[datasheetFile] {
		t.Errorf("replay -datasheet and design write different pages")
	}
	if status, _, stderr = play("replay", "-datasheet", page, pulse); status != exitBadInput {
		t.Errorf("replay wrote over a page: %d", status)
	} else {
		mustBeOneLine(t, stderr, page)
	}
}

// mustBeOneLine looks at what stands on stderr after bad input.
func mustBeOneLine(t testing.TB, stderr string, wanted ...string) {
	t.Helper()
	if strings.Count(stderr, "\n") != 1 || !strings.HasPrefix(stderr, "holdfast: ") || !strings.HasSuffix(stderr, "\n") {
		t.Errorf("stderr is not one line of the program: %q", stderr)
	}
	if len(stderr) > 1000 {
		t.Errorf("the line has %d characters: %.300q...", len(stderr), stderr)
	}
	for _, s := range wanted {
		if !strings.Contains(stderr, s) {
			t.Errorf("stderr does not say %q: %s", s, stderr)
		}
	}
}

func TestExistingFolder(t *testing.T) {
	dir := newLab(t)
	pulse := filepath.Join(dir, "pulse")
	brief := filepath.Join(dir, "quick.toml")
	design := func(args ...string) (int, string) {
		status, _, stderr := play(append([]string{"design"}, args...)...)
		return status, stderr
	}
	if status, stderr := design("-out", pulse, brief); status != exitMet {
		t.Fatalf("design: %d, %s", status, stderr)
	}
	write(t, filepath.Join(pulse, "note.txt"), "of the first\n")
	first := tree(t, pulse)
	all := tree(t, dir)
	status, stderr := design(brief, "-out", pulse)
	if status != exitBadInput {
		t.Errorf("a second design into the same folder: %d", status)
	}
	mustBeOneLine(t, stderr, pulse, "-force")
	if d := compare(all, tree(t, dir)); d != nil {
		t.Errorf("a refused design changed %v", d)
	}
	if status, stderr = design(brief, "-force", "-out="+pulse); status != exitMet {
		t.Fatalf("design -force: %d, %s", status, stderr)
	}
	if d := compare(first, tree(t, pulse+".before-1")); d != nil {
		t.Errorf("the old folder differs in %v", d)
	}
	delete(first, "note.txt")
	if d := compare(first, tree(t, pulse)); d != nil {
		t.Errorf("the same inputs gave another %v", d)
	}
	// a file is no pulse folder, and stays
	file := filepath.Join(dir, "file")
	write(t, file, "mine\n")
	status, stderr = design(brief, "-force", "-out", file)
	if status != exitBadInput || read(t, file) != "mine\n" {
		t.Errorf("design -force over a file: %d", status)
	}
	mustBeOneLine(t, stderr, file)
	// start has no such flag at all
	if status, _, stderr := play("start", dir); status != exitBadInput {
		t.Errorf("start into an existing folder: %d", status)
	} else {
		mustBeOneLine(t, stderr, dir)
	}
}

// Without -out the folder is the brief's name, here, and never elsewhere.
func TestFolderName(t *testing.T) {
	for name, want := range map[string]string{
		"x90": "x90", "../up": "-up", "a/b": "a-b", `a\b`: "a-b", "...": "pulse", ".hidden": "hidden", "held 2 ways": "held 2 ways",
	} {
		if got := folderName(name); got != want {
			t.Errorf("folderName(%q) = %q, want %q", name, got, want)
		}
	}
	dir := newLab(t)
	t.Chdir(dir)
	if status, stdout, stderr := play("design", "quick.toml"); status != exitMet {
		t.Fatalf("design: %d, %s", status, stderr)
	} else {
		mustHave(t, "design", stdout, "pulse: quick", "datasheet: quick/datasheet.html")
	}
	if _, err := os.Stat(filepath.Join(dir, "quick", "pulse.toml")); err != nil {
		t.Error(err)
	}
}

func TestArguments(t *testing.T) {
	for _, c := range []struct {
		args   []string
		status int
		stderr string // part of the one line; empty: nothing there
	}{
		{[]string{"dsign", "x.toml"}, exitBadInput, `the verb "dsign"; allowed: start, check, design, replay, card, help, version`},
		{[]string{"design"}, exitBadInput, "design: found 0 operands"},
		{[]string{"design", "a", "b"}, exitBadInput, "design: found 2 operands"},
		{[]string{"design", "-fast", "a"}, exitBadInput, "-fast"},
		{[]string{"design", "a", "-out"}, exitBadInput, "-out"},
		{[]string{"design", "a", "-force=maybe"}, exitBadInput, "force"},
		{[]string{"replay"}, exitBadInput, "replay: found 0 operands"},
		{[]string{"check"}, exitBadInput, "check: found 0 operands"},
		{[]string{"check", "-v", "a"}, exitBadInput, "-v"},
		{[]string{"start"}, exitBadInput, "start: found 0 operands"},
		{[]string{"start", ""}, exitBadInput, "no name"},
		{[]string{"start", "/"}, exitBadInput, "/"},
		{[]string{"start", filepath.Join(t.TempDir(), "no", "such")}, exitBadInput, "found no folder"},
		{[]string{"help", "nothing"}, exitBadInput, `the topic "nothing"; allowed: `},
		{[]string{"help", "a", "b"}, exitBadInput, "help: found 2 operands"},
		{[]string{"version", "a"}, exitBadInput, "version: found 1 operands"},
		{[]string{"replay", "--", "-out"}, exitBadInput, "-out: "},
		{[]string{"card", "a"}, exitBadInput, "card: found 1 operands"},
		{[]string{"card", "a", "b", "-json=perhaps"}, exitBadInput, "json"},
		{[]string{"help"}, exitMet, ""},
		{[]string{"-h"}, exitMet, ""},
		{[]string{"--help"}, exitMet, ""},
		{[]string{"--version"}, exitMet, ""},
		{[]string{"version"}, exitMet, ""},
		{[]string{"design", "-h"}, exitMet, ""},
		{[]string{"check", "--help"}, exitMet, ""},
		{[]string{"start", "-h"}, exitMet, ""},
		{[]string{"replay", "-h"}, exitMet, ""},
	} {
		status, stdout, stderr := play(c.args...)
		if status != c.status {
			t.Errorf("%q: status %d, want %d", c.args, status, c.status)
		}
		if c.stderr == "" {
			if stderr != "" || stdout == "" {
				t.Errorf("%q: stdout %q, stderr %q", c.args, stdout, stderr)
			}
			continue
		}
		if stdout != "" {
			t.Errorf("%q: stdout %q", c.args, stdout)
		}
		mustBeOneLine(t, stderr, c.stderr)
	}
	if status, stdout, stderr := play(); status != exitBadInput || stdout != "" || !strings.Contains(stderr, "Usage:") {
		t.Errorf("without arguments: %d, %q", status, stdout)
	}
}

// Embedding does not reach testdata, so the starter files stand there twice; each is of one of the examples.
func TestStarterIsTheDemonstration(t *testing.T) {
	demo := tree(t, filepath.Join("..", "..", "testdata", "skerry"))
	ours := tree(t, "starter")
	if d := compare(ours, demo); d != nil {
		t.Errorf("starter and testdata/skerry differ in %v", d)
	}
	written := tree(t, newLabOnly(t))
	if len(written) != 1+3 { // and the folder
		t.Errorf("start writes %d files", len(written)-1)
	}
	for name, text := range tree(t, newPair(t)) {
		if _, twice := written[name]; twice && name != "." {
			t.Errorf("%s is of both examples", name)
		}
		written[name] = text
	}
	if d := compare(ours, written); d != nil {
		t.Errorf("start writes another %v", d)
	}
}

func newLabOnly(t *testing.T) string {
	dir := filepath.Join(t.TempDir(), "lab")
	if status, _, stderr := play("start", dir); status != exitMet {
		t.Fatalf("start: %d, %s", status, stderr)
	}
	return dir
}

// The same inputs give the same bytes, on however many processors.
func TestSameBytesOnOneAndTwoProcessors(t *testing.T) {
	dir := newLab(t)
	defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(0))
	for _, name := range []string{"quick", "held"} {
		var folders []map[string]string
		for n := 1; n <= 2; n++ {
			runtime.GOMAXPROCS(n)
			pulse := filepath.Join(dir, fmt.Sprint(name, n))
			if status, _, stderr := play("design", filepath.Join(dir, name+".toml"), "-out", pulse); status != exitMet {
				t.Fatalf("%s on %d: %d, %s", name, n, status, stderr)
			}
			folders = append(folders, tree(t, pulse))
		}
		if len(folders[0]) < 8 {
			t.Errorf("%s: the folder has %d entries", name, len(folders[0]))
		}
		if d := compare(folders[0], folders[1]); d != nil {
			t.Errorf("%s: one and two processors differ in %v", name, d)
		}
	}
}

// A search that finds nothing ends with status 1 and a folder that says so.
func TestNotFound(t *testing.T) {
	dir := newLab(t)
	text := strings.NewReplacer(`"72 ns"`, `"40 ns"`, `name = "held"`, "name = \"held\"\nstarts = 4").Replace(held)
	write(t, filepath.Join(dir, "short.toml"), text)
	pulse := filepath.Join(dir, "pulse")
	status, stdout, stderr := play("design", filepath.Join(dir, "short.toml"), "-out", pulse)
	if status != exitMissed || stderr != "" {
		t.Fatalf("design: %d, %s", status, stderr)
	}
	mustHave(t, "design", stdout, "not found", "MISSED", "4 starts", "best miss")
	status, stdout, stderr = play("replay", pulse)
	if status != exitMissed || stderr != "" {
		t.Fatalf("replay: %d, %s", status, stderr)
	}
	mustHave(t, "replay", stdout, "not found", "MISSED")
	mustBeWhole(t, pulse)
}

// mustBeWhole demands a pulse folder that replay reads, with its datasheet.
func mustBeWhole(t testing.TB, dir string) *replay.Folder {
	t.Helper()
	f, err := replay.Open(dir)
	if err != nil {
		t.Fatalf("%s: not a whole folder: %v", dir, err)
	}
	if page := read(t, filepath.Join(dir, datasheetFile)); !strings.HasSuffix(strings.TrimSpace(page), "</html>") {
		t.Errorf("%s: the datasheet is cut off", dir)
	}
	return f
}
