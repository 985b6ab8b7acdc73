package hardware

import (
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"sort"
	"strconv"
	"strings"
)

// RecordName is the file of a pulse folder that lists the hashes of all others, and so has none itself.
const RecordName = "pulse.toml"

// maxFolderFiles bounds what a listed folder may hold: a hostile one is refused, not read for ever.
const maxFolderFiles = 10000

// A FileHash names one file of a pulse folder, with forward slashes and relative to the folder, and
// the SHA-256 of its bytes in 64 lower-case hexadecimal digits.
type FileHash struct{ Name, SHA256 string }

// A Manifest lists the files of a pulse folder: all but pulse.toml, which carries the list.
type Manifest []FileHash

// ListFiles names every regular file in dir and below except pulse.toml at its top, sorted. A link or
// anything else that is neither file nor folder is an error.
func ListFiles(dir string) ([]string, error) {
	var names []string
	err := filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		if err != nil {
			return fileError(path, err)
		}
		if path == dir || d.IsDir() {
			return nil
		}
		if !d.Type().IsRegular() {
			return fmt.Errorf("%s: not a regular file", path)
		}
		name, err := filepath.Rel(dir, path)
		if err != nil {
			return err
		}
		if name = filepath.ToSlash(name); name != RecordName {
			names = append(names, name)
		}
		if len(names) > maxFolderFiles {
			return fmt.Errorf("%s: more than %d files", dir, maxFolderFiles)
		}
		return nil
	})
	sort.Strings(names)
	return names, err
}

// HashFiles hashes the named files of dir, in the order given. A name that leaves the folder, a link
// anywhere on its way and anything but a regular file are refused.
func HashFiles(dir string, names []string) (Manifest, error) {
	m := make(Manifest, 0, len(names))
	for _, name := range names {
		sum, err := hashFile(dir, name)
		if err != nil {
			return nil, err
		}
		m = append(m, FileHash{name, sum})
	}
	return m, nil
}

// Has says whether the manifest lists the file.
func (m Manifest) Has(name string) bool {
	for _, f := range m {
		if f.Name == name {
			return true
		}
	}
	return false
}

// Verify hashes every listed file of dir again. The error names the first file that is missing, listed
// twice, outside the folder or changed. A file that is not listed is not looked at: a reader of the folder
// must ask Has before it trusts one.
func (m Manifest) Verify(dir string) error {
	if len(m) > maxFolderFiles {
		return fmt.Errorf("%s: %d files listed; allowed: at most %d", dir, len(m), maxFolderFiles)
	}
	seen := make(map[string]bool, len(m))
	for _, f := range m {
		if seen[f.Name] {
			return fmt.Errorf("%s: listed twice", filepath.Join(dir, filepath.FromSlash(f.Name)))
		}
		seen[f.Name] = true
		sum, err := hashFile(dir, f.Name)
		if err != nil {
			return err
		}
		if sum != f.SHA256 {
			return fmt.Errorf("%s: changed since the pulse was written: its SHA-256 is %s; the record says %.64q",
				filepath.Join(dir, filepath.FromSlash(f.Name)), sum, f.SHA256)
		}
	}
	return nil
}

func hashFile(dir, name string) (string, error) {
	if !fs.ValidPath(name) || name == "." || strings.ContainsAny(name, "\\:\x00") {
		return "", fmt.Errorf("%s: %.200q does not name a file inside the folder", dir, name)
	}
	path := dir
	for part := range strings.SplitSeq(name, "/") {
		path = filepath.Join(path, part)
		info, err := os.Lstat(path)
		if err != nil {
			return "", fileError(path, err)
		}
		if info.Mode()&fs.ModeSymlink != 0 {
			return "", fmt.Errorf("%s: a link; a pulse folder holds its files itself", path)
		}
		if !info.IsDir() && !info.Mode().IsRegular() {
			return "", fmt.Errorf("%s: not a regular file", path)
		}
	}
	f, err := os.Open(path)
	if err != nil {
		return "", fileError(path, err)
	}
	defer f.Close()
	h := sha256.New()
	if _, err := io.Copy(h, f); err != nil {
		return "", fileError(path, err)
	}
	return hex.EncodeToString(h.Sum(nil)), nil
}

// A Staging is a folder in the making: a sibling ".NAME.part-N" of the final folder NAME, which takes the
// final name when it is complete. Use NewStaging; then exactly one of Commit and Discard.
//
// A process killed in between leaves its ".NAME.part-N" behind, and NAME untouched. While a process lives it
// holds a lock on its part folder, so the next NewStaging for the same NAME removes what the dead have left
// and nothing else. (On systems without such locks nothing is removed.)
type Staging struct {
	final string
	dir   string
	force bool
	lock  *os.File
}

// NewStaging makes an empty folder next to final to write into. When final exists it refuses without force,
// and with force too when it is neither a folder nor a link: force renames, and is meant for pulse folders. The folder
// above final must exist.
func NewStaging(final string, force bool) (*Staging, error) {
	if final == "" {
		return nil, errors.New("the pulse folder has no name")
	}
	final = filepath.Clean(final)
	parent, name := filepath.Dir(final), filepath.Base(final)
	if name == "." || name == ".." || name == string(filepath.Separator) {
		return nil, fmt.Errorf("%s: not a name for a new folder", final)
	}
	if info, err := os.Stat(parent); errors.Is(err, fs.ErrNotExist) {
		return nil, fmt.Errorf("%s: found no folder %s to make it in; allowed: a new name in a folder that is there (make %s first)", final, parent, parent)
	} else if err != nil {
		return nil, fileError(parent, err)
	} else if !info.IsDir() {
		return nil, fmt.Errorf("%s: not a folder", parent)
	}
	s := &Staging{final: final, force: force}
	if _, err := s.occupied(); err != nil {
		return nil, err
	}
	prefix := "." + name + ".part-"
	removeStale(parent, prefix)
	for n := 1; ; n++ {
		s.dir = filepath.Join(parent, prefix+strconv.Itoa(n))
		err := os.Mkdir(s.dir, 0o777)
		if errors.Is(err, fs.ErrExist) {
			continue
		}
		if err != nil {
			return nil, fileError(s.dir, err)
		}
		if s.lock, err = lockFolder(s.dir); err == nil {
			return s, nil
		}
		if !errors.Is(err, errHeld) {
			os.Remove(s.dir)
			return nil, fileError(s.dir, err)
		}
		// Another run took the new folder for a stale one before it was locked, and removes it.
	}
}

// occupied says whether something stands at the final name, and refuses what may not be moved away.
func (s *Staging) occupied() (bool, error) {
	info, err := os.Lstat(s.final)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return false, nil
	case err != nil:
		return false, fileError(s.final, err)
	case !info.IsDir() && info.Mode()&fs.ModeSymlink == 0:
		return true, fmt.Errorf("%s: exists and is not a folder", s.final)
	case !s.force:
		return true, fmt.Errorf("%s: exists already; choose another name, or -force, which keeps the old folder as %s.before-N",
			s.final, filepath.Base(s.final))
	}
	return true, nil
}

// removeStale removes part folders that no living process has locked. What it cannot remove it leaves.
func removeStale(parent, prefix string) {
	entries, err := os.ReadDir(parent)
	if err != nil {
		return
	}
	for _, e := range entries {
		digits, ok := strings.CutPrefix(e.Name(), prefix)
		if _, err := strconv.ParseUint(digits, 10, 32); !ok || err != nil || !e.IsDir() {
			continue
		}
		path := filepath.Join(parent, e.Name())
		lock, err := lockFolder(path)
		if err != nil || lock == nil {
			continue
		}
		os.RemoveAll(path)
		lock.Close()
	}
}

// Dir is the folder to write into until Commit or Discard; empty afterwards.
func (s *Staging) Dir() string { return s.dir }

// Commit flushes every file and folder to the disk and gives the folder its final name. With force an old
// folder is first renamed to NAME.before-N, N the first free number from 1: at every instant a complete folder stands
// under one of the two names. When it fails, nothing that stood before is gone; call Discard then.
func (s *Staging) Commit() error {
	if err := syncTree(s.dir); err != nil {
		return err
	}
	old, err := s.occupied()
	if err != nil {
		return err
	}
	before := ""
	if old {
		if before, err = freeName(s.final + ".before-"); err != nil {
			return err
		}
		if err := os.Rename(s.final, before); err != nil {
			return fileError(s.final, err)
		}
	}
	if err := os.Rename(s.dir, s.final); err != nil {
		if old {
			os.Rename(before, s.final)
		}
		return fileError(s.final, err)
	}
	if s.lock != nil {
		s.lock.Close()
		s.lock = nil
	}
	s.dir = ""
	return syncPath(filepath.Dir(s.final))
}

// Discard removes the unfinished folder and all in it. After Commit succeeded it does nothing.
func (s *Staging) Discard() error {
	if s.dir == "" {
		return nil
	}
	dir := s.dir
	err := os.RemoveAll(dir)
	if s.lock != nil {
		s.lock.Close()
		s.lock = nil
	}
	s.dir = ""
	if err != nil {
		return fileError(dir, err)
	}
	return nil
}

func freeName(prefix string) (string, error) {
	for n := 1; ; n++ {
		name := prefix + strconv.Itoa(n)
		_, err := os.Lstat(name)
		if errors.Is(err, fs.ErrNotExist) {
			return name, nil
		}
		if err != nil {
			return "", fileError(name, err)
		}
	}
}

func syncTree(dir string) error {
	return filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		if err != nil {
			return fileError(path, err)
		}
		if !d.IsDir() && !d.Type().IsRegular() {
			return fmt.Errorf("%s: not a regular file", path)
		}
		return syncPath(path)
	})
}

func syncPath(path string) error {
	f, err := os.Open(path)
	if err != nil {
		return fileError(path, err)
	}
	err = f.Sync()
	if cerr := f.Close(); err == nil {
		err = cerr
	}
	// Some file systems cannot flush a folder; the rename is then as lasting as they make it.
	if err != nil && !errors.Is(err, errors.ErrUnsupported) && !errors.Is(err, errCannotSync) {
		return fileError(path, err)
	}
	return nil
}
