package hardware

import (
	"bufio"
	"os"
	"os/exec"
	"path/filepath"
	"runtime"
	"slices"
	"strings"
	"testing"
)

func write(t *testing.T, path, text string) {
	t.Helper()
	if err := os.MkdirAll(filepath.Dir(path), 0o777); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(path, []byte(text), 0o666); err != nil {
		t.Fatal(err)
	}
}

func read(t *testing.T, path string) string {
	t.Helper()
	raw, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	return string(raw)
}

func names(t *testing.T, dir string) []string {
	t.Helper()
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	var list []string
	for _, e := range entries {
		list = append(list, e.Name())
	}
	return list
}

// stage writes one file into a new staging folder.
func stage(t *testing.T, final string, force bool, text string) *Staging {
	t.Helper()
	s, err := NewStaging(final, force)
	if err != nil {
		t.Fatal(err)
	}
	write(t, filepath.Join(s.Dir(), "inputs", "a.txt"), text)
	return s
}

func TestManifest(t *testing.T) {
	dir := t.TempDir()
	write(t, filepath.Join(dir, "a.npy"), "abc")
	write(t, filepath.Join(dir, "inputs", "b c.toml"), "")
	write(t, filepath.Join(dir, "inputs", RecordName), "x")
	write(t, filepath.Join(dir, RecordName), "the record")
	list, err := ListFiles(dir)
	if err != nil || !slices.Equal(list, []string{"a.npy", "inputs/b c.toml", "inputs/pulse.toml"}) {
		t.Fatalf("%v, %v", list, err)
	}
	m, err := HashFiles(dir, list)
	if err != nil {
		t.Fatal(err)
	}
	// SHA-256 of "abc" and of nothing: FIPS 180-2, Secure Hash Standard (2002), appendix B.1 (MEM), and CALC with sha256sum.
	if m[0].SHA256 != "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad" ||
		m[1].SHA256 != "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855" {
		t.Errorf("%v", m)
	}
	if !m.Has("inputs/b c.toml") || m.Has(RecordName) || m.Has("b c.toml") {
		t.Error("Has is wrong")
	}
	if err := m.Verify(dir); err != nil {
		t.Error(err)
	}
	write(t, filepath.Join(dir, "a.npy"), "abd")
	want := filepath.Join(dir, "a.npy") + `: changed since the pulse was written: its SHA-256 is ` +
		`a52d159f262b2c6ddb724a61840befc36eb30c88877a4030b65cbe86298449c9; the record says "` + m[0].SHA256 + `"`
	if err := m.Verify(dir); err == nil || err.Error() != want {
		t.Errorf("got %v; needed: %s", err, want)
	}
}

func TestManifestRefuses(t *testing.T) {
	dir := t.TempDir()
	write(t, filepath.Join(dir, "a"), "abc")
	write(t, filepath.Join(dir, "..", "outside"), "abc")
	if err := os.Symlink("a", filepath.Join(dir, "link")); err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink("..", filepath.Join(dir, "up")); err != nil {
		t.Fatal(err)
	}
	abc := "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad"
	at := func(name string) string { return filepath.Join(dir, name) }
	for _, test := range []struct {
		m    Manifest
		want string
	}{
		{Manifest{{"a", abc}}, ""},
		{Manifest{{"a", strings.ToUpper(abc)}}, at("a") + ": changed since the pulse was written: its SHA-256 is " + abc + `; the record says "` + strings.ToUpper(abc) + `"`},
		{Manifest{{"a", ""}}, at("a") + ": changed since the pulse was written: its SHA-256 is " + abc + `; the record says ""`},
		{Manifest{{"a", abc}, {"a", abc}}, at("a") + ": listed twice"},
		{Manifest{{"b", abc}}, at("b") + ": no such file or directory"},
		{Manifest{{"link", abc}}, at("link") + ": a link; a pulse folder holds its files itself"},
		{Manifest{{"up/outside", abc}}, at("up") + ": a link; a pulse folder holds its files itself"},
		{Manifest{{"../outside", abc}}, dir + `: "../outside" does not name a file inside the folder`},
		{Manifest{{"/etc/passwd", abc}}, dir + `: "/etc/passwd" does not name a file inside the folder`},
		{Manifest{{"", abc}}, dir + `: "" does not name a file inside the folder`},
		{Manifest{{".", abc}}, dir + `: "." does not name a file inside the folder`},
		{Manifest{{`..\outside`, abc}}, dir + `: "..\\outside" does not name a file inside the folder`},
		{Manifest{{"a\x00", abc}}, dir + `: "a\x00" does not name a file inside the folder`},
		{make(Manifest, maxFolderFiles+1), dir + ": 10001 files listed; allowed: at most 10000"},
	} {
		err := test.m.Verify(dir)
		if test.want == "" && err != nil || test.want != "" && (err == nil || err.Error() != test.want) {
			t.Errorf("%.80q: got %v; needed: %s", test.m, err, test.want)
		}
	}
	if err := os.Mkdir(at("folder"), 0o777); err != nil {
		t.Fatal(err)
	}
	if err := (Manifest{{"folder", abc}}).Verify(dir); err == nil {
		t.Error("a folder has a hash")
	}
	if _, err := ListFiles(dir); err == nil || err.Error() != at("link")+": not a regular file" {
		t.Errorf("a link is listed: %v", err)
	}
}

func TestStaging(t *testing.T) {
	parent := t.TempDir()
	for _, name := range []string{"plain", "with space", "[a-z]*?", "käfer", ".hidden", "-dash", "a.part-1", "per%cent"} {
		final := filepath.Join(parent, name)
		s := stage(t, final+"/", false, "one") // a slash at the end is a habit of shells
		if filepath.Dir(s.Dir()) != parent || !strings.HasPrefix(filepath.Base(s.Dir()), "."+name+".part-") {
			t.Errorf("%q is made in %s", name, s.Dir())
		}
		if _, err := os.Lstat(final); err == nil {
			t.Errorf("%q stands before it is complete", name)
		}
		if err := s.Commit(); err != nil {
			t.Fatal(err)
		}
		if err := s.Discard(); err != nil {
			t.Errorf("Discard after Commit: %v", err)
		}
		if got := read(t, filepath.Join(final, "inputs", "a.txt")); got != "one" {
			t.Errorf("%q holds %q", name, got)
		}

		want := final + ": exists already; choose another name, or -force, which keeps the old folder as " + name + ".before-N"
		if _, err := NewStaging(final, false); err == nil || err.Error() != want {
			t.Errorf("got %v; needed: %s", err, want)
		}
		for i, text := range []string{"two", "three"} {
			if err := stage(t, final, true, text).Commit(); err != nil {
				t.Fatal(err)
			}
			before := final + ".before-" + string(rune('1'+i))
			if got, old := read(t, filepath.Join(final, "inputs", "a.txt")), read(t, filepath.Join(before, "inputs", "a.txt")); got != text ||
				old != []string{"one", "two"}[i] {
				t.Errorf("%q holds %q, before it %q", name, got, old)
			}
		}
		d := stage(t, final, true, "four")
		if err := d.Discard(); err != nil {
			t.Fatal(err)
		}
		if got := read(t, filepath.Join(final, "inputs", "a.txt")); got != "three" {
			t.Errorf("after Discard %q holds %q", name, got)
		}
	}
	for _, name := range names(t, parent) {
		if strings.Contains(name, ".part-") && name != "a.part-1" && !strings.HasPrefix(name, "a.part-1.before-") {
			t.Errorf("%s is left over", name)
		}
	}
}

func TestStagingRefuses(t *testing.T) {
	dir := t.TempDir()
	t.Chdir(dir)
	write(t, "file", "x")
	if err := os.Mkdir("empty", 0o777); err != nil {
		t.Fatal(err)
	}
	for _, test := range []struct {
		final string
		force bool
		want  string
	}{
		{"", true, "the pulse folder has no name"},
		{".", true, ".: not a name for a new folder"},
		{"..", true, "..: not a name for a new folder"},
		{"/", true, "/: not a name for a new folder"},
		{"file", false, "file: exists and is not a folder"},
		{"file", true, "file: exists and is not a folder"},
		{"file/a", false, "file: not a folder"},
		{"missing/a", false, "missing/a: found no folder missing to make it in; allowed: a new name in a folder that is there (make missing first)"},
		{"empty", false, "empty: exists already; choose another name, or -force, which keeps the old folder as empty.before-N"},
	} {
		if s, err := NewStaging(test.final, test.force); err == nil || err.Error() != test.want {
			t.Errorf("%q: got %v, %v; needed: %s", test.final, s, err, test.want)
		}
	}
	if got := names(t, "."); !slices.Equal(got, []string{"empty", "file"}) {
		t.Errorf("refusals left %v", got)
	}
	// A folder that comes into being while the pulse is made is not replaced, not even an empty one.
	s := stage(t, "late", false, "new")
	if err := os.Mkdir("late", 0o777); err != nil {
		t.Fatal(err)
	}
	if err := s.Commit(); err == nil {
		t.Error("a folder that came in between was replaced")
	}
	if err := s.Discard(); err != nil {
		t.Error(err)
	}
	if got := names(t, "."); !slices.Equal(got, []string{"empty", "file", "late"}) || len(names(t, "late")) != 0 {
		t.Errorf("left: %v", got)
	}
}

// -force moves a link itself away, never what it leads to.
func TestStagingMovesLinks(t *testing.T) {
	dir := t.TempDir()
	write(t, filepath.Join(dir, "real", "a"), "mine")
	for _, target := range []string{"real", "nowhere"} {
		link := filepath.Join(dir, "to "+target)
		if err := os.Symlink(target, link); err != nil {
			t.Fatal(err)
		}
		if _, err := NewStaging(link, false); err == nil {
			t.Error("a link counts as nothing")
		}
		if err := stage(t, link, true, "new").Commit(); err != nil {
			t.Fatal(err)
		}
		if info, err := os.Lstat(link); err != nil || !info.IsDir() {
			t.Errorf("%s is no folder: %v", link, err)
		}
		if got, err := os.Readlink(link + ".before-1"); err != nil || got != target {
			t.Errorf("the link is now %q, %v", got, err)
		}
	}
	if got := read(t, filepath.Join(dir, "real", "a")); got != "mine" {
		t.Errorf("the link's folder holds %q", got)
	}
}

// stagingChild says that this process is the test below, started a second time.
const stagingChild = "HOLDFAST_TEST_STAGING"

// A process killed in the middle leaves the final name as it was, and its part folder until the next run; part folders of the
// living stay.
func TestStagingKilled(t *testing.T) {
	if final := os.Getenv(stagingChild); final != "" {
		stage(t, final, true, "half")
		os.Stdout.WriteString("staged\n")
		select {}
	}
	if runtime.GOOS == "windows" || runtime.GOOS == "plan9" {
		t.Log("no folder locks on this system")
		return
	}
	exe, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	dir := t.TempDir()
	final := filepath.Join(dir, "pulse")
	if err := stage(t, final, false, "old").Commit(); err != nil {
		t.Fatal(err)
	}
	write(t, filepath.Join(dir, ".pulse.part-x", "a"), "somebody else's")
	write(t, filepath.Join(dir, ".pulse.part-7"), "a file of somebody else")
	child := exec.Command(exe, "-test.run=^TestStagingKilled$")
	child.Env = append(os.Environ(), stagingChild+"="+final)
	out, err := child.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := child.Start(); err != nil {
		t.Fatal(err)
	}
	lines := bufio.NewScanner(out)
	for lines.Scan() && lines.Text() != "staged" {
	}
	// The child lives: its folder stays, ours is another one.
	s := stage(t, final, true, "ours")
	if filepath.Base(s.Dir()) != ".pulse.part-2" {
		t.Errorf("our folder is %s beside %v", s.Dir(), names(t, dir))
	}
	if err := child.Process.Kill(); err != nil {
		t.Fatal(err)
	}
	child.Wait()
	if got := names(t, dir); !slices.Equal(got, []string{".pulse.part-1", ".pulse.part-2", ".pulse.part-7", ".pulse.part-x", "pulse"}) {
		t.Errorf("after the kill: %v", got)
	}
	if got := read(t, filepath.Join(final, "inputs", "a.txt")); got != "old" {
		t.Errorf("after the kill the pulse holds %q", got)
	}
	// The next run removes the dead one's folder and nothing else.
	next := stage(t, final, true, "next")
	if got := read(t, filepath.Join(s.Dir(), "inputs", "a.txt")); got != "ours" {
		t.Errorf("the living folder holds %q", got)
	}
	if filepath.Base(next.Dir()) != ".pulse.part-1" {
		t.Errorf("the next folder is %s", next.Dir())
	}
	if err := next.Discard(); err != nil {
		t.Error(err)
	}
	if err := s.Commit(); err != nil {
		t.Error(err)
	}
	if got := names(t, dir); !slices.Equal(got, []string{".pulse.part-7", ".pulse.part-x", "pulse", "pulse.before-1"}) {
		t.Errorf("at the end: %v", got)
	}
}
