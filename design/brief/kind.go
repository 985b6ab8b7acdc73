package brief

import (
	"errors"
	"fmt"
	"strings"

	"holdfast/hardware/quantity"
)

// A FileKind is what a TOML file of this program describes, in words.
type FileKind string

// The kinds of file.
const (
	ProfileFile FileKind = "hardware profile"
	DeviceFile  FileKind = "device file"
	BriefFile   FileKind = "brief"
	RecordFile  FileKind = "pulse's record"
)

// KindOf recognises a file by the tables that only its kind has, and gives an empty kind where there is none of them. The error is that of a file that cannot be
// read as TOML. A table in capitals tells the kind too: the loader then says how it is written.
func KindOf(path string) (FileKind, error) {
	doc, err := quantity.ReadFile(path)
	if err != nil {
		return "", err
	}
	root := doc.Root()
	for _, s := range []struct {
		kind   FileKind
		tables []string
	}{
		{RecordFile, []string{"model", "claim"}},
		{ProfileFile, []string{"instrument", "channel"}},
		{DeviceFile, []string{"site", "drive"}},
		{BriefFile, []string{"target", "require", "error", "span"}},
	} {
		for _, name := range s.tables {
			for _, spelt := range []string{name, strings.ToUpper(name), strings.ToUpper(name[:1]) + name[1:]} {
				if root.Has(spelt) {
					return s.kind, nil
				}
			}
		}
	}
	return "", nil
}

// mistaken says that a file looks like another kind than the one that is needed, or nothing.
func mistaken(path string, needed FileKind) (FileKind, bool) {
	kind, err := KindOf(path)
	return kind, err == nil && kind != "" && kind != needed
}

// named turns the complaint of a loader about a file that the brief names into one about the brief's key, where the file is not there or is of another kind;
// what stands in a file of the right kind is that file's own matter.
func (b *Brief) named(key, value, path string, line int, needed FileKind, err error) error {
	e := &quantity.Error{File: b.File, Line: line, Key: key, Allowed: "a " + string(needed) + ", by its path from the brief's folder or from the root"}
	if other, wrong := mistaken(path, needed); wrong {
		e.Found = fmt.Sprintf("%q, which looks like a %s", value, other)
		return e
	}
	if whole := (*quantity.Error)(nil); errors.As(err, &whole) && whole.Line == 0 && whole.File == path {
		e.Found = fmt.Sprintf("%q, and at %s %s", value, path, whole.Found)
		return e
	}
	return err
}
