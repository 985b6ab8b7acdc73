package hardware

import (
	"encoding/binary"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"codeberg.org/sbinet/npyio/npy"
)

func TestNPYComesBack(t *testing.T) {
	dir := t.TempDir()
	codes := []int16{0, 1, -1, 32767, -32768, 258}
	samples := []float64{0, math.Pi, -math.Pi, math.SmallestNonzeroFloat64, -math.MaxFloat64, math.Copysign(0, -1)}
	for name, shape := range map[string][2]int{"a.npy": {3, 2}, "b.npy": {6, 1}, "c.npy": {1, 6}} {
		path := filepath.Join(dir, name)
		if err := WriteNPY(path, shape[0], shape[1], codes); err != nil {
			t.Fatal(err)
		}
		got, gotShape, err := ReadNPY[int16](path, shape[0], -1)
		if err != nil || gotShape != shape || !slices.Equal(got, codes) {
			t.Errorf("%s: %v %v %v", name, got, gotShape, err)
		}
		if err := WriteNPY(path+"x", shape[0], shape[1], samples); err != nil {
			t.Fatal(err)
		}
		back, gotShape, err := ReadNPY[float64](path+"x", -1, -1)
		if err != nil || gotShape != shape || !slices.Equal(back, samples) {
			t.Errorf("%s: %v %v %v", name, back, gotShape, err)
		}
	}
	empty := filepath.Join(dir, "empty.npy")
	if err := WriteNPY[int16](empty, 0, 2, nil); err != nil {
		t.Fatal(err)
	}
	if got, shape, err := ReadNPY[int16](empty, -1, 2); err != nil || len(got) != 0 || shape != [2]int{0, 2} {
		t.Errorf("empty: %v %v %v", got, shape, err)
	}
}

// The files against another implementation, codeberg.org/sbinet/npyio v0.14.0, both ways, and against the format's own
// words: "the total of len(magic string) + 2 + len(length) + HEADER_LEN is divisible by 64" (NPY format, version 1.0; MEM).
func TestNPYIsTheFormat(t *testing.T) {
	path := filepath.Join(t.TempDir(), "a.npy")
	codes := []int16{1, -2, 3, -4, 5, -6}
	if err := WriteNPY(path, 3, 2, codes); err != nil {
		t.Fatal(err)
	}
	raw, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	if len(raw) != 128+12 || binary.LittleEndian.Uint16(raw[8:]) != 118 || raw[127] != '\n' || raw[128] != 1 || raw[130] != 0xfe || raw[131] != 0xff {
		t.Errorf("%d bytes: %q", len(raw), raw)
	}
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	r, err := npy.NewReader(f)
	if err != nil {
		t.Fatal(err)
	}
	if !slices.Equal(r.Header.Descr.Shape, []int{3, 2}) || r.Header.Descr.Fortran {
		t.Errorf("header %+v", r.Header)
	}
	var got []int16
	if err := r.Read(&got); err != nil || !slices.Equal(got, codes) {
		t.Errorf("%v, %v", got, err)
	}

	theirs, err := os.Create(path + "2")
	if err != nil {
		t.Fatal(err)
	}
	if err := npy.Write(theirs, [3][2]float64{{1, -2}, {3, -4}, {5.5, -6}}); err != nil {
		t.Fatal(err)
	}
	if err := theirs.Close(); err != nil {
		t.Fatal(err)
	}
	back, shape, err := ReadNPY[float64](path+"2", 3, 2)
	if err != nil || shape != [2]int{3, 2} || !slices.Equal(back, []float64{1, -2, 3, -4, 5.5, -6}) {
		t.Errorf("%v %v %v", back, shape, err)
	}
}

// npyBytes puts a file together: version, header text, data.
func npyBytes(version byte, header string, data ...byte) []byte {
	raw := append([]byte(npyMagic), version, 0)
	if version == 1 {
		raw = binary.LittleEndian.AppendUint16(raw, uint16(len(header)))
	} else {
		raw = binary.LittleEndian.AppendUint32(raw, uint32(len(header)))
	}
	return append(append(raw, header...), data...)
}

func TestNPYRefuses(t *testing.T) {
	dir := t.TempDir()
	good := "{'descr': '<i2', 'fortran_order': False, 'shape': (2, 1), }\n"
	replace := func(old, new string) []byte { return npyBytes(1, strings.Replace(good, old, new, 1), 1, 0, 2, 0) }
	for _, test := range []struct {
		raw  []byte
		want string // after "PATH: "; empty: it is read
	}{
		{npyBytes(1, good, 1, 0, 2, 0), ""},
		{npyBytes(2, good, 1, 0, 2, 0), ""},
		{npyBytes(3, `{"shape":(2,1),"descr":"<i2","fortran_order":False}`, 1, 0, 2, 0), ""},
		{nil, "not an NPY file"},
		{[]byte("PK\x03\x04 zip, not npy"), "not an NPY file"},
		{[]byte(npyMagic + "\x01"), "truncated NPY file: 7 bytes"},
		{npyBytes(9, good, 1, 0, 2, 0), "NPY version 9.0; allowed: 1.0 to 3.0"},
		{npyBytes(1, good)[:30], "truncated NPY file: 30 bytes with a header of 60"},
		{append([]byte(npyMagic+"\x02\x00\xff\xff\xff\xff"), good...), "truncated NPY file: 72 bytes with a header of 4294967295"},
		{npyBytes(1, good, 1, 0, 2), "truncated NPY file: 3 bytes of data; shape (2, 1) needs 4"},
		{npyBytes(1, good, 1, 0, 2, 0, 0), "NPY file with 1 bytes after its data"},
		{replace("<i2", ">i2"), `NPY type ">i2"; needed: "<i2"`},
		{replace("<i2", "<f8"), `NPY type "<f8"; needed: "<i2"`},
		{replace("<i2", "|O"), `NPY type "|O"; needed: "<i2"`},
		{replace("'<i2'", "[('a', '<i2')]"), "broken NPY header: descr is not one simple type"},
		{replace("False", "True"), "NPY array in Fortran order; needed: C order"},
		{replace("False", "0"), "broken NPY header: fortran_order is neither True nor False"},
		{replace("(2, 1)", "(1, 2)"), "NPY shape (1, 2); needed: (2, 1)"},
		{replace("(2, 1)", "(2,)"), "NPY shape (2,); needed: (2, 1)"},
		{replace("(2, 1)", "()"), "NPY shape (); needed: (2, 1)"},
		{replace("(2, 1)", "(2, 1, 1)"), "NPY shape (2, 1, 1); needed: (2, 1)"},
		{replace("(2, 1)", "(-2, -1)"), "broken NPY header: shape is not a short tuple of counts"},
		{replace("(2, 1)", "(99999999999999999999, 1)"), "broken NPY header: shape is not a short tuple of counts"},
		{replace("(2, 1)", "(2000000000, 2000000000)"), "broken NPY header: shape is not a short tuple of counts"},
		{replace("(2, 1)", "2"), "broken NPY header: shape is not a tuple"},
		{replace("(2, 1)", "(1,1,1,1,1,1,1,1,1,1)"), "broken NPY header: shape is not a short tuple of counts"},
		{replace("'shape'", "'size'"), `broken NPY header: unknown key "size"`},
		{replace("'shape': (2, 1), ", ""), `broken NPY header: no key "shape"`},
		{replace("'shape': (2, 1), ", "'descr': '<i2'"), `broken NPY header: key "descr" twice`},
		{replace("'<i2',", "'<i2'"), "broken NPY header: no comma between two keys"},
		{replace("'descr'", "descr"), "broken NPY header: no quoted key where one belongs"},
		{replace("{", ""), "broken NPY header: no dictionary"},
		{npyBytes(1, ""), "truncated NPY file: 10 bytes"},
		{npyBytes(1, "  "), "broken NPY header: no dictionary"},
	} {
		path := filepath.Join(dir, "a.npy")
		if err := os.WriteFile(path, test.raw, 0o666); err != nil {
			t.Fatal(err)
		}
		got, _, err := ReadNPY[int16](path, 2, 1)
		switch {
		case test.want == "":
			if err != nil || !slices.Equal(got, []int16{1, 2}) {
				t.Errorf("%q: %v, %v", test.raw, got, err)
			}
		case err == nil || err.Error() != path+": "+test.want || got != nil:
			t.Errorf("%q: got %v, %v; needed: %s", test.raw, got, err, test.want)
		}
	}

	path := filepath.Join(dir, "nan.npy")
	if err := WriteNPY(path, 2, 1, []float64{1, math.NaN()}); err != nil {
		t.Fatal(err)
	}
	if _, _, err := ReadNPY[float64](path, 2, 1); err == nil || err.Error() != path+": value 1 is NaN; needed: finite numbers" {
		t.Errorf("nan: %v", err)
	}
	if _, _, err := ReadNPY[int16](dir, 2, 1); err == nil || err.Error() != dir+": not a regular file" {
		t.Errorf("a folder: %v", err)
	}
	missing := filepath.Join(dir, "missing.npy")
	if _, _, err := ReadNPY[int16](missing, 2, 1); err == nil || err.Error() != missing+": no such file or directory" {
		t.Errorf("missing: %v", err)
	}
	huge := filepath.Join(dir, "huge.npy")
	f, err := os.Create(huge)
	if err != nil {
		t.Fatal(err)
	}
	if err := f.Truncate(MaxNPYBytes + 1); err != nil {
		t.Fatal(err)
	}
	f.Close()
	if _, _, err := ReadNPY[int16](huge, 2, 1); err == nil || err.Error() != huge+": 67108865 bytes; allowed: at most 67108864" {
		t.Errorf("huge: %v", err)
	}
}

func TestWriteNPYRefuses(t *testing.T) {
	path := filepath.Join(t.TempDir(), "a.npy")
	if err := WriteNPY(path, 2, 2, []int16{1, 2, 3}); err == nil {
		t.Error("three values fill (2, 2)")
	}
	if _, err := os.Lstat(path); err == nil {
		t.Error("a refused array left a file")
	}
	if err := WriteNPY(path, 1, 1, []int16{7}); err != nil {
		t.Fatal(err)
	}
	if err := WriteNPY(path, 1, 1, []int16{8}); err == nil || err.Error() != path+": file exists" {
		t.Errorf("overwriting: %v", err)
	}
	if got, _, err := ReadNPY[int16](path, 1, 1); err != nil || got[0] != 7 {
		t.Errorf("the first file is now %v, %v", got, err)
	}
}

// Whatever the bytes, reading ends with an error or with an array that fills its shape.
func FuzzReadNPY(f *testing.F) {
	f.Add(npyBytes(1, "{'descr': '<i2', 'fortran_order': False, 'shape': (2, 1), }\n", 1, 0, 2, 0))
	f.Add(npyBytes(2, "{'descr': '<f8', 'fortran_order': True, 'shape': (), }\n"))
	f.Fuzz(func(t *testing.T, raw []byte) {
		path := filepath.Join(t.TempDir(), "a.npy")
		if err := os.WriteFile(path, raw, 0o666); err != nil {
			t.Fatal(err)
		}
		if got, shape, err := ReadNPY[int16](path, -1, -1); err == nil && len(got) != shape[0]*shape[1] {
			t.Errorf("%d values of shape %v", len(got), shape)
		}
	})
}
