package hardware

import (
	"bufio"
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"strconv"
	"strings"
)

// Waveform files are NPY arrays of two dimensions, (samples, quadratures), C order, little endian,
// of int16 (codes) or float64 (samples before rounding).
//
// The format is NEP 1, "A Simple File Format for NumPy Arrays" (Kern 2007), and it is small: magic,
// version, length and text of one dictionary, padding to a multiple of 64, raw data. It is read here
// by hand because a folder from outside must be refused with a sentence whatever its bytes are; the
// library in go.mod reads back what is written here (in the tests), but gives up the
// program on a broken header.

// MaxNPYBytes is the largest waveform file that is read: 64 MiB, some hundred times the longest waveform
// that a profile may allow.
const MaxNPYBytes = 64 << 20

const npyMagic = "\x93NUMPY"

// npyDescr gives the format's name of an element type and its size in bytes.
func npyDescr[T int16 | float64]() (descr string, size int) {
	var zero T
	if _, ok := any(zero).(int16); ok {
		return "<i2", 2
	}
	return "<f8", 8
}

// WriteNPY writes data, rows by columns in C order, as a new NPY file at path. It refuses to
// overwrite. Nothing is left behind when it fails.
func WriteNPY[T int16 | float64](path string, rows, columns int, data []T) (err error) {
	if rows < 0 || columns < 0 || len(data) != rows*columns {
		return fmt.Errorf("%s: %d values do not fill an array of shape (%d, %d)", path, len(data), rows, columns)
	}
	f, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o666)
	if err != nil {
		return fileError(path, err)
	}
	defer func() {
		if cerr := f.Close(); err == nil && cerr != nil {
			err = fileError(path, cerr)
		}
		if err != nil {
			os.Remove(path)
		}
	}()
	descr, _ := npyDescr[T]()
	header := fmt.Sprintf("{'descr': '%s', 'fortran_order': False, 'shape': (%d, %d), }", descr, rows, columns)
	start := len(npyMagic) + 4
	header += strings.Repeat(" ", 63-(start+len(header))%64) + "\n"
	w := bufio.NewWriter(f)
	w.WriteString(npyMagic + "\x01\x00")
	// A bufio.Writer keeps its first error: Flush reports it.
	binary.Write(w, binary.LittleEndian, uint16(len(header)))
	w.WriteString(header)
	binary.Write(w, binary.LittleEndian, data)
	if err := w.Flush(); err != nil {
		return fileError(path, err)
	}
	return nil
}

// ReadNPY reads an NPY file of exactly rows by columns elements of type T; a negative count accepts any.
// A file that is not regular, larger than MaxNPYBytes, truncated or longer than its header says, of another
// type, byte order, element order or shape, or that holds a value that is not finite is refused with one
// sentence that begins with path.
func ReadNPY[T int16 | float64](path string, rows, columns int) (data []T, shape [2]int, err error) {
	raw, err := readRegular(path, MaxNPYBytes)
	if err != nil {
		return nil, shape, err
	}
	fail := func(format string, args ...any) ([]T, [2]int, error) {
		return nil, [2]int{}, fmt.Errorf("%s: %s", path, fmt.Sprintf(format, args...))
	}
	if len(raw) < len(npyMagic) || string(raw[:len(npyMagic)]) != npyMagic {
		return fail("not an NPY file")
	}
	if len(raw) < 12 {
		return fail("truncated NPY file: %d bytes", len(raw))
	}
	var length, start int
	switch raw[6] {
	case 1:
		length, start = int(binary.LittleEndian.Uint16(raw[8:])), 10
	case 2, 3:
		// Compared as 64 bits, so that no length overflows an int.
		if n := int64(binary.LittleEndian.Uint32(raw[8:])); n > int64(len(raw)) {
			return fail("truncated NPY file: %d bytes with a header of %d", len(raw), n)
		}
		length, start = int(binary.LittleEndian.Uint32(raw[8:])), 12
	default:
		return fail("NPY version %d.%d; allowed: 1.0 to 3.0", raw[6], raw[7])
	}
	if start+length > len(raw) {
		return fail("truncated NPY file: %d bytes with a header of %d", len(raw), length)
	}
	h, err := parseNPYHeader(string(raw[start : start+length]))
	if err != nil {
		return fail("broken NPY header: %v", err)
	}
	descr, size := npyDescr[T]()
	if h.descr != descr {
		return fail("NPY type %q; needed: %q", h.descr, descr)
	}
	if h.fortran {
		return fail("NPY array in Fortran order; needed: C order")
	}
	if len(h.shape) != 2 || rows >= 0 && h.shape[0] != rows || columns >= 0 && h.shape[1] != columns {
		return fail("NPY shape %s; needed: (%s, %s)", shapeText(h.shape), countText(rows), countText(columns))
	}
	shape = [2]int(h.shape)
	body := raw[start+length:]
	// Both counts are at most MaxNPYBytes (parseNPYHeader), so the product fits 64 bits.
	want := int64(shape[0]) * int64(shape[1]) * int64(size)
	if int64(len(body)) < want {
		return fail("truncated NPY file: %d bytes of data; shape %s needs %d", len(body), shapeText(h.shape), want)
	}
	if int64(len(body)) > want {
		return fail("NPY file with %d bytes after its data", int64(len(body))-want)
	}
	data = make([]T, shape[0]*shape[1])
	if _, err := binary.Decode(body, binary.LittleEndian, data); err != nil {
		return fail("%v", err)
	}
	for k, v := range data {
		if f := float64(v); math.IsNaN(f) || math.IsInf(f, 0) {
			return fail("value %d is %v; needed: finite numbers", k, f)
		}
	}
	return data, shape, nil
}

type npyHeader struct {
	descr   string
	fortran bool
	shape   []int
}

// parseNPYHeader reads the one dictionary that the format allows: the keys descr, fortran_order and
// shape, each once, in any order.
func parseNPYHeader(s string) (h npyHeader, err error) {
	s = strings.TrimSpace(s)
	if len(s) < 2 || s[0] != '{' || s[len(s)-1] != '}' {
		return h, errors.New("no dictionary")
	}
	s = strings.TrimSpace(s[1 : len(s)-1])
	seen := map[string]bool{}
	for s != "" {
		key, rest, ok := cutQuoted(s)
		rest = strings.TrimSpace(rest)
		if !ok || !strings.HasPrefix(rest, ":") {
			return h, errors.New("no quoted key where one belongs")
		}
		if seen[key] {
			return h, fmt.Errorf("key %q twice", key)
		}
		seen[key] = true
		rest = strings.TrimSpace(rest[1:])
		switch key {
		case "descr":
			if h.descr, rest, ok = cutQuoted(rest); !ok {
				return h, errors.New("descr is not one simple type")
			}
		case "fortran_order":
			if after, found := strings.CutPrefix(rest, "True"); found {
				h.fortran, rest = true, after
			} else if after, found := strings.CutPrefix(rest, "False"); found {
				rest = after
			} else {
				return h, errors.New("fortran_order is neither True nor False")
			}
		case "shape":
			inner, after, found := strings.Cut(rest, ")")
			if !found || !strings.HasPrefix(inner, "(") {
				return h, errors.New("shape is not a tuple")
			}
			rest = after
			inner = strings.TrimSuffix(strings.TrimSpace(inner[1:]), ",")
			for field := range strings.SplitSeq(inner, ",") {
				if inner == "" {
					break
				}
				n, err := strconv.ParseUint(strings.TrimSpace(field), 10, 31)
				if err != nil || n > MaxNPYBytes || len(h.shape) == 8 {
					return h, errors.New("shape is not a short tuple of counts")
				}
				h.shape = append(h.shape, int(n))
			}
		default:
			return h, fmt.Errorf("unknown key %.40q", key)
		}
		rest = strings.TrimSpace(rest)
		if rest != "" && rest[0] != ',' {
			return h, errors.New("no comma between two keys")
		}
		s = strings.TrimSpace(strings.TrimPrefix(rest, ","))
	}
	for _, key := range []string{"descr", "fortran_order", "shape"} {
		if !seen[key] {
			return h, fmt.Errorf("no key %q", key)
		}
	}
	return h, nil
}

// cutQuoted takes a text in single or double quotes from the front of s. The format never escapes.
func cutQuoted(s string) (text, rest string, ok bool) {
	if s == "" || s[0] != '\'' && s[0] != '"' {
		return "", s, false
	}
	return strings.Cut(s[1:], s[:1])
}

func shapeText(shape []int) string {
	parts := make([]string, len(shape))
	for i, n := range shape {
		parts[i] = strconv.Itoa(n)
	}
	if len(parts) == 1 {
		return "(" + parts[0] + ",)"
	}
	return "(" + strings.Join(parts, ", ") + ")"
}

func countText(n int) string {
	if n < 0 {
		return "any"
	}
	return strconv.Itoa(n)
}

// readRegular reads a whole regular file of at most limit bytes; pipes and devices are refused unopened.
func readRegular(path string, limit int64) ([]byte, error) {
	info, err := os.Stat(path)
	if err != nil {
		return nil, fileError(path, err)
	}
	if !info.Mode().IsRegular() {
		return nil, fmt.Errorf("%s: not a regular file", path)
	}
	if info.Size() > limit {
		return nil, fmt.Errorf("%s: %d bytes; allowed: at most %d", path, info.Size(), limit)
	}
	f, err := os.Open(path)
	if err != nil {
		return nil, fileError(path, err)
	}
	defer f.Close()
	raw, err := io.ReadAll(io.LimitReader(f, limit+1))
	if err != nil {
		return nil, fileError(path, err)
	}
	if int64(len(raw)) > limit {
		return nil, fmt.Errorf("%s: more than %d bytes", path, limit)
	}
	return raw, nil
}

// fileError puts the path first and drops the name of the system call: "p.toml: no such file or directory".
func fileError(path string, err error) error {
	var pe *os.PathError
	if errors.As(err, &pe) {
		err = pe.Err
	}
	var le *os.LinkError
	if errors.As(err, &le) {
		err = le.Err
	}
	return fmt.Errorf("%s: %w", path, err)
}
