package noise

import (
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"strconv"
	"strings"

	"holdfast/hardware/quantity"
)

// Kind says what lambda is, and with that the units of the files.
type Kind int

// The kinds of noise.
const (
	Detuning Kind = iota // a rotation frequency: lambda in rad/ns, in files in Hz
	Relative             // a relative change: lambda without unit
)

const (
	mostBytes = 64 << 20 // of a CSV file
	leastRows = 2        // of a table
	mostValue = 1e15     // of a trace, in Hz or without unit
	leastPSD  = 1e-40    // of a table, in Hz^2/Hz or 1/Hz
	mostPSD   = 1e40
)

// columns gives the header of a table's or a trace's file.
func (k Kind) columns(form string) [2]string {
	switch {
	case form == "table" && k == Detuning:
		return [2]string{"frequency_hz", "psd_hz2_per_hz"}
	case form == "table":
		return [2]string{"frequency_hz", "psd_per_hz"}
	case k == Detuning:
		return [2]string{"time_s", "value_hz"}
	default:
		return [2]string{"time_s", "value"}
	}
}

// unit gives lambda for a value of 1 in a file.
func (k Kind) unit() float64 {
	if k == Detuning {
		return 2 * math.Pi * 1e-9
	}
	return 1
}

// Read reads a spectrum from the keys of a table; dir is the folder of the TOML file, from which file is counted.
//
//	form = "white"       sigma, low (0), high
//	form = "power-law"   sigma, exponent, low, high
//	form = "lorentzian"  sigma, correlation_time
//	form = "table"       file, sided = "one" or "two"
//	form = "trace"       file, segment (chosen from the length)
//
// sigma is the root mean square over the whole band, a frequency for Detuning and a share for Relative; low, high and the frequencies of
// files are cyclic. A file is CSV (RFC 4180) of two columns under a header: frequency_hz, psd_hz2_per_hz or frequency_hz, psd_per_hz for a table,
// frequencies ascending and everything above zero, straight in log-log between its points and zero outside; time_s, value_hz or time_s, value for a trace,
// evenly sampled, of which FromTrace says what becomes. It has at most 1e6 rows and 64 MB.
//
// Every mistake is recorded in the document with file, line and key, those in a CSV file with its own line too; Read then gives nil, or a spectrum that does
// no harm.
func Read(t *quantity.Table, dir string, kind Kind) *Spectrum {
	forms := []string{"white", "power-law", "lorentzian", "table", "trace"}
	form := t.Choice("form", forms, "")
	switch form {
	case "": // no other key means anything without it
		if !t.Has("form") {
			t.Choice("form", forms)
		}
		return nil
	case "table":
		sided := t.Choice("sided", []string{"one", "two"})
		return readFile(t, dir, func(file string, data []byte) (*Spectrum, error) { return parseTable(file, data, kind, sided == "one") })
	case "trace":
		segment := t.Int("segment", leastSegment, mostSegment, 0)
		if segment&(segment-1) != 0 {
			t.Fail("segment", "found %d; allowed: a power of two, %d to %d", segment, leastSegment, mostSegment)
			return nil
		}
		return readFile(t, dir, func(file string, data []byte) (*Spectrum, error) { return parseTrace(file, data, kind, segment) })
	}
	var sigma float64
	if kind == Detuning {
		sigma = 2 * math.Pi * t.Quantity("sigma", quantity.Frequency, 1e-15, 100)
	} else {
		sigma = t.Quantity("sigma", quantity.Ratio, 1e-9, 1)
	}
	var s *Spectrum
	var err error
	if form == "lorentzian" {
		s, err = Lorentzian(sigma, t.Quantity("correlation_time", quantity.Time, 1e-3, 1e15))
	} else {
		const least, most = 1e-18, 1e3 // GHz
		var low float64
		exponent := 0.0
		if form == "white" {
			low = t.Quantity("low", quantity.Frequency, 0, most, 0)
		} else {
			exponent = t.Number("exponent", -mostExponent, mostExponent)
			low = t.Quantity("low", quantity.Frequency, least, most)
		}
		high := t.Quantity("high", quantity.Frequency, least, most)
		if !(low < high) {
			t.Fail("high", "found a band from %s to %s; allowed: high above low", quantity.Format(low, quantity.Frequency), quantity.Format(high, quantity.Frequency))
			return nil
		}
		if form == "white" {
			s, err = White(1, 2*math.Pi*low, 2*math.Pi*high)
		} else {
			middle := 2 * math.Pi * math.Sqrt(low*high) // so that no level is out of the ordinary
			s, err = PowerLaw(1, middle, exponent, 2*math.Pi*low, 2*math.Pi*high)
		}
	}
	if err != nil { // the ranges of the keys leave nothing to refuse
		t.Fail("", "%s", err)
		return nil
	}
	factor := sigma * sigma / s.Variance() // of Lorentzian noise, which has no points, 1
	for i := range s.s {
		s.s[i] *= factor
	}
	return s
}

// readFile reads the CSV file of the key file.
func readFile(t *quantity.Table, dir string, parse func(file string, data []byte) (*Spectrum, error)) *Spectrum {
	name := t.Text("file")
	if name == "" {
		return nil // said already
	}
	path := filepath.FromSlash(name)
	if !filepath.IsAbs(path) {
		path = filepath.Join(dir, path)
	}
	data, found := readRegular(path)
	if found != "" {
		t.Fail("file", "found %s at %q; allowed: a CSV file of at most %d MB", found, name, mostBytes>>20)
		return nil
	}
	s, err := parse(name, data)
	if err != nil {
		t.Fail("file", "%s", err)
		return nil
	}
	s.File = name
	return s
}

// readRegular reads a file that is regular and not too large, or says what was found instead.
func readRegular(path string) (data []byte, found string) {
	reason := func(err error) string {
		if pe := (*os.PathError)(nil); errors.As(err, &pe) {
			err = pe.Err
		}
		return "an error of the system, " + err.Error() + ","
	}
	info, err := os.Stat(path)
	switch {
	case errors.Is(err, os.ErrNotExist):
		return nil, "no file"
	case err != nil:
		return nil, reason(err)
	case info.IsDir():
		return nil, "a folder"
	case !info.Mode().IsRegular(): // reading a pipe might never end
		return nil, "something that is not a regular file"
	case info.Size() > mostBytes:
		return nil, fmt.Sprintf("%d bytes", info.Size())
	}
	f, err := os.Open(path)
	if err != nil {
		return nil, reason(err)
	}
	defer f.Close() // read only: nothing can be lost
	data, err = io.ReadAll(io.LimitReader(f, mostBytes+1))
	switch {
	case err != nil:
		return nil, reason(err)
	case len(data) > mostBytes:
		return nil, "a file that grows"
	}
	return data, ""
}

// parseTable reads the points of a spectrum; file is its name in messages.
func parseTable(file string, data []byte, kind Kind, oneSided bool) (*Spectrum, error) {
	r := newReader(file, data, kind.columns("table"))
	// Densities are per Hz of cyclic frequency; 1 per GHz is 1 per rad/ns with the 1/2pi of the package's convention.
	unit := kind.unit() * kind.unit() * 1e9
	if oneSided {
		unit /= 2
	}
	var w, s []float64
	last := 0.0
	for r.next() {
		f, density := r.number(0, 1e-12, 1e13), r.number(1, leastPSD, mostPSD)
		if r.err == nil && !(f > last) {
			r.fail(fmt.Sprintf("%g Hz after %g Hz", f, last), "ascending frequencies")
		}
		last = f
		w, s = append(w, 2*math.Pi*1e-9*f), append(s, unit*density)
	}
	if r.err == nil && len(w) < leastRows {
		r.fail(fmt.Sprintf("%d rows", len(w)), fmt.Sprintf("%d to %d", leastRows, mostRows))
	}
	if r.err != nil {
		return nil, r.err
	}
	spectrum, err := Tabulated(w, s)
	if err != nil { // frequencies that rounding has made the same
		return nil, fmt.Errorf("%s: %w", file, err)
	}
	return spectrum, nil
}

// parseTrace reads a measured trace; file is its name in messages.
func parseTrace(file string, data []byte, kind Kind, segment int) (*Spectrum, error) {
	r := newReader(file, data, kind.columns("trace"))
	var times, values []float64
	var lines []int
	for r.next() {
		times, values = append(times, r.number(0, -1e15, 1e15)), append(values, kind.unit()*r.number(1, -mostValue, mostValue))
		lines = append(lines, r.line)
	}
	n := len(times)
	if least := max(leastSegment, segment); r.err == nil && n < least {
		r.fail(fmt.Sprintf("%d rows", n), fmt.Sprintf("one segment, %d, to %d", least, mostRows))
	}
	if r.err != nil {
		return nil, r.err
	}
	const evenly = 0.01 // of the period: room for times that were printed with few digits
	period := (times[n-1] - times[0]) / float64(n-1)
	if !within(period, 1e-14, 1e12) {
		r.line = lines[n-1]
		r.fail(fmt.Sprintf("%d rows from %g s to %g s", n, times[0], times[n-1]), "ascending times, 1e-14 s to 1e12 s apart")
		return nil, r.err
	}
	for i, t := range times {
		if even := times[0] + float64(i)*period; !(math.Abs(t-even) <= evenly*period) {
			r.line = lines[i]
			r.fail(fmt.Sprintf("%.12g s as the time of row %d of an even trace, which is %.12g s", t, i+1, even), fmt.Sprintf("within %g of the mean period, %.6g s", evenly, period))
			return nil, r.err
		}
	}
	s, err := FromTrace(values, 1e9*period, segment)
	if err != nil {
		return nil, fmt.Errorf("%s: %w", file, err)
	}
	return s, nil
}

// reader goes through the rows of a CSV file of two columns. Its first complaint is final.
type reader struct {
	file    string
	columns [2]string
	csv     *csv.Reader
	row     []string
	line    int // of the row
	rows    int
	err     error
}

// newReader reads the header.
func newReader(file string, data []byte, columns [2]string) *reader {
	data = bytes.TrimPrefix(data, []byte("\xef\xbb\xbf")) // a byte order mark
	r := &reader{file: file, columns: columns, csv: csv.NewReader(bytes.NewReader(data)), line: 1}
	r.csv.ReuseRecord = true
	r.csv.TrimLeadingSpace = true
	header := strings.Join(columns[:], ",")
	switch row, err := r.csv.Read(); {
	case err == io.EOF:
		r.fail("an empty file", "the header "+header)
	case err != nil:
		r.broken(err)
	case len(row) != 2 || strings.TrimSpace(row[0]) != columns[0] || strings.TrimSpace(row[1]) != columns[1]:
		r.line, _ = r.csv.FieldPos(0)
		r.fail("the header "+clipped(strings.Join(row, ",")), header)
	}
	return r
}

// fail complains about the line.
func (r *reader) fail(found, allowed string) {
	if r.err == nil {
		r.err = &quantity.Error{File: r.file, Line: r.line, Found: found, Allowed: allowed}
	}
}

// broken complains of what is no CSV.
func (r *reader) broken(err error) {
	found := "text that is not CSV"
	if pe := (*csv.ParseError)(nil); errors.As(err, &pe) {
		r.line = pe.StartLine
		if errors.Is(err, csv.ErrFieldCount) {
			found = "another number of columns"
		}
	}
	r.fail(found, "two columns, "+strings.Join(r.columns[:], ","))
}

// next steps to the next row and reports whether there is one.
func (r *reader) next() bool {
	if r.err != nil {
		return false
	}
	row, err := r.csv.Read()
	if err == io.EOF {
		return false
	}
	if err != nil {
		r.broken(err)
		return false
	}
	r.line, _ = r.csv.FieldPos(0)
	r.row = row
	if r.rows++; r.rows > mostRows {
		r.fail("more rows", fmt.Sprintf("at most %d", mostRows))
		return false
	}
	return true
}

// number gives the number of a column, from lo to hi; lo after a mistake.
func (r *reader) number(column int, lo, hi float64) float64 {
	text := strings.TrimSpace(r.row[column])
	v, err := strconv.ParseFloat(text, 64)
	if err != nil || !within(v, lo, hi) {
		r.fail(clipped(text)+" as "+r.columns[column], fmt.Sprintf("a number, %g to %g", lo, hi))
		return lo
	}
	return v
}

// clipped gives text from a file for a message: in quotes and not too long.
func clipped(s string) string {
	const most = 60
	if len(s) > most {
		return strconv.Quote(strings.ToValidUTF8(s[:most], "")) + "..."
	}
	return strconv.Quote(s)
}
