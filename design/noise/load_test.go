package noise

import (
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"holdfast/hardware/quantity"
)

// read reads the table [noise] of a document, beside which the files stand.
func read(t *testing.T, kind Kind, text string, files map[string]string) (*Spectrum, error) {
	t.Helper()
	dir := t.TempDir()
	for name, data := range files {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(data), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	doc, err := quantity.ParseDocument("brief.toml", []byte("[noise]\n"+text))
	if err != nil {
		t.Fatal(err)
	}
	s := Read(doc.Root().Table("noise"), dir, kind)
	return s, doc.Err()
}

func TestRead(t *testing.T) {
	const hz = 2 * math.Pi * 1e-9
	trace, values := "time_s,value_hz\n", []float64{}
	for i := range 64 {
		values = append(values, 1e4*math.Sin(float64(i*i)))
		trace += fmt.Sprintf("%.9g,%.17g\n", 5+1e-6*float64(i), values[i])
	}
	for _, c := range []struct {
		name, text, file string
		kind             Kind
		low, high        float64
		variance         float64
		at, s            float64
	}{
		{name: "white", text: "form = \"white\"\nsigma = \"100 kHz\"\nhigh = \"10 MHz\"",
			high: 1e7 * hz, variance: 1e10 * hz * hz, at: 5e6 * hz, s: 1e10 * hz * hz / (2 * 1e7 * 1e-9)}, // two-sided, in 1/(cycles/ns)
		{name: "white from 1 MHz", text: "form = \"white\"\nsigma = \"100 kHz\"\nlow = \"1 MHz\"\nhigh = \"11 MHz\"",
			low: 1e6 * hz, high: 1.1e7 * hz, variance: 1e10 * hz * hz, at: 5e6 * hz, s: 1e10 * hz * hz / (2 * 1e7 * 1e-9)},
		{name: "power law", text: "form = \"power-law\"\nsigma = \"100 kHz\"\nexponent = 1.0\nlow = \"1 Hz\"\nhigh = \"10 MHz\"",
			low: hz, high: 1e7 * hz, variance: 1e10 * hz * hz, at: 1e3 * hz, s: 1e10 * hz * hz / math.Log(1e7) * math.Pi / (1e3 * hz)},
		{name: "relative power law", kind: Relative, text: "form = \"power-law\"\nsigma = \"0.1 %\"\nexponent = 2\nlow = \"1 kHz\"\nhigh = \"10 MHz\"",
			low: 1e3 * hz, high: 1e7 * hz, variance: 1e-6, at: 1e4 * hz, s: 1e-6 * math.Pi * (1e3 * hz) / (1e8 * hz * hz) / (1 - 1e-4)},
		{name: "Lorentzian", text: "form = \"lorentzian\"\nsigma = \"100 kHz\"\ncorrelation_time = \"2 us\"",
			high: math.Inf(1), variance: 1e10 * hz * hz, at: 1 / 2000.0, s: 1e10 * hz * hz * 2000},
		{name: "table of one side", text: "form = \"table\"\nfile = \"f.csv\"\nsided = \"one\"", file: "frequency_hz,psd_hz2_per_hz\n1e3,2e4\n1e6,2e4\n",
			low: 1e3 * hz, high: 1e6 * hz, variance: 2e4 * 0.999e6 * hz * hz, at: 1e4 * hz, s: 1e4 * hz * hz * 1e9},
		{name: "table of two sides", text: "form = \"table\"\nfile = \"f.csv\"\nsided = \"two\"", file: "\xef\xbb\xbffrequency_hz, psd_hz2_per_hz\r\n\"1e3\", 1e4\r\n1e6 ,1e2\r\n",
			low: 1e3 * hz, high: 1e6 * hz, variance: 2 * 3 * 1e7 * (10 - 1) * hz * hz, at: math.Sqrt(1e9) * hz, s: 1e3 * hz * hz * 1e9},
		{name: "relative table", kind: Relative, text: "form = \"table\"\nfile = \"f.csv\"\nsided = \"one\"", file: "frequency_hz,psd_per_hz\n1e3,2e-10\n1e6,2e-10\n",
			low: 1e3 * hz, high: 1e6 * hz, variance: 2e-10 * 0.999e6, at: 1e4 * hz, s: 1e-10 * 1e9},
		{name: "trace", text: "form = \"trace\"\nfile = \"f.csv\"", file: trace, high: math.Pi / 1000},
		{name: "trace with its segment", text: "form = \"trace\"\nfile = \"f.csv\"\nsegment = 64", file: trace, high: math.Pi / 1000},
		{name: "relative trace", kind: Relative, text: "form = \"trace\"\nfile = \"f.csv\"\nsegment = 32", file: strings.Replace(trace, "_hz", "", 1), high: math.Pi / 1000},
	} {
		s, err := read(t, c.kind, c.text, map[string]string{"f.csv": c.file})
		if err != nil {
			t.Errorf("%s: %v", c.name, err)
			continue
		}
		if want := strings.Contains(c.text, "file"); (s.File == "f.csv") != want {
			t.Errorf("%s: file %q", c.name, s.File)
		}
		near(t, c.name+", low", s.Low(), c.low, 1e-12)
		if s.High() != c.high {
			near(t, c.name+", high", s.High(), c.high, 1e-8)
		}
		if c.at > 0 {
			near(t, c.name+", S", s.S(c.at), c.s, 1e-9)
			near(t, c.name+", S", s.S(-c.at), c.s, 1e-9)
		}
		if c.variance > 0 {
			near(t, c.name+", variance", s.Variance(), c.variance, 1e-9)
		}
		if c.file == "" || c.at > 0 {
			continue
		}
		segment := 32
		if strings.Contains(c.text, "64") {
			segment = 64
		}
		unit := hz
		if c.kind == Relative {
			unit = 1
		}
		scaled := make([]float64, 64)
		for i, v := range values {
			scaled[i] = unit * v
		}
		want := made(t)(FromTrace(scaled, 1000, segment))
		near(t, c.name+", variance", s.Variance(), want.Variance(), 1e-8)
		near(t, c.name+", S", s.S(0.002), want.S(0.002), 1e-6)
	}
}

func TestReadRefuses(t *testing.T) {
	rows := func(header string, lines ...string) map[string]string {
		return map[string]string{"f.csv": header + "\n" + strings.Join(lines, "\n") + "\n"}
	}
	const table = "form = \"table\"\nfile = \"f.csv\"\nsided = \"one\""
	const trace = "form = \"trace\"\nfile = \"f.csv\""
	even := func(change func(i int) (time, value string)) map[string]string {
		var lines []string
		for i := range 40 {
			time, value := fmt.Sprint(i), fmt.Sprint(i%3)
			if change != nil {
				if a, b := change(i); a != "" {
					time, value = a, b
				}
			}
			lines = append(lines, time+","+value)
		}
		return rows("time_s,value_hz", lines...)
	}
	for _, c := range []struct {
		text  string
		kind  Kind
		files map[string]string
		want  string
	}{
		{text: "", want: `brief.toml:1: noise.form: found nothing; allowed: "white", "power-law", "lorentzian", "table" or "trace"`},
		{text: `form = "pink"`, want: `brief.toml:2: noise.form: found "pink"; allowed: "white", "power-law", "lorentzian", "table" or "trace"`},
		{text: `form = "white"`, want: `brief.toml:1: noise.sigma: found nothing; allowed: a frequency`},
		{text: "form = \"white\"\nsigma = \"1 %\"\nhigh = \"1 MHz\"", want: `brief.toml:3: noise.sigma: found "1 %"; allowed: a frequency such as`},
		{text: "form = \"white\"\nsigma = \"1 MHz\"\nhigh = \"1 MHz\"", kind: Relative, want: `brief.toml:3: noise.sigma: found "1 MHz"; allowed: a share such as`},
		{text: "form = \"white\"\nsigma = \"1 MHz\"\nlow = \"1 MHz\"\nhigh = \"1 MHz\"", want: `brief.toml:5: noise.high: found a band from 1 MHz to 1 MHz; allowed: high above low`},
		{text: "form = \"white\"\nsigma = \"1 MHz\"\nhigh = \"1 MHz\"\nexponent = 1.0", want: `brief.toml:5: noise.exponent: found an unknown key; allowed: form, sigma, low, high`},
		{text: "form = \"power-law\"\nsigma = \"1 MHz\"\nexponent = 5\nlow = \"1 Hz\"\nhigh = \"1 MHz\"", want: `brief.toml:4: noise.exponent: found 5; allowed: a number, -4 to 4`},
		{text: "form = \"power-law\"\nsigma = \"1 MHz\"\nexponent = 1\nhigh = \"1 MHz\"", want: `brief.toml:1: noise.low: found nothing; allowed: a frequency`},
		{text: "form = \"power-law\"\nsigma = \"1 MHz\"\nexponent = 1\nlow = \"0 Hz\"\nhigh = \"1 MHz\"", want: `brief.toml:5: noise.low: found "0 Hz"; allowed: a frequency`},
		{text: "form = \"lorentzian\"\nsigma = \"1 MHz\"", want: `brief.toml:1: noise.correlation_time: found nothing; allowed: a time`},
		{text: "form = \"table\"\nsided = \"one\"", want: `brief.toml:1: noise.file: found nothing; allowed: a text in quotes`},
		{text: "form = \"table\"\nfile = \"f.csv\"\nsided = \"both\"", want: `brief.toml:4: noise.sided: found "both"; allowed: "one" or "two"`},
		{text: table, want: `brief.toml:3: noise.file: found no file at "f.csv"; allowed: a CSV file of at most 64 MB`},
		{text: "form = \"table\"\nfile = \".\"\nsided = \"one\"", want: `brief.toml:3: noise.file: found a folder at "."`},
		{text: table, files: map[string]string{"f.csv": ""}, want: `brief.toml:3: noise.file: f.csv:1: found an empty file; allowed: the header frequency_hz,psd_hz2_per_hz`},
		{text: table, files: rows("frequency_hz,psd_per_hz"), want: `brief.toml:3: noise.file: f.csv:1: found the header "frequency_hz,psd_per_hz"; allowed: frequency_hz,psd_hz2_per_hz`},
		{text: table, kind: Relative, files: rows("frequency_hz,psd_hz2_per_hz"), want: `f.csv:1: found the header "frequency_hz,psd_hz2_per_hz"; allowed: frequency_hz,psd_per_hz`},
		{text: table, files: rows("frequency_hz,\"psd"), want: `f.csv:1: found text that is not CSV; allowed: two columns, frequency_hz,psd_hz2_per_hz`},
		{text: table, files: rows("frequency_hz"), want: `f.csv:1: found the header "frequency_hz"; allowed`},
		{text: trace, kind: Relative, files: rows("time_s,value_hz"), want: `f.csv:1: found the header "time_s,value_hz"; allowed: time_s,value`},
		{text: table, files: rows("frequency_hz,psd_hz2_per_hz", "1,1"), want: `f.csv:2: found 1 rows; allowed: 2 to 1000000`},
		{text: table, files: rows("frequency_hz,psd_hz2_per_hz", "1,1", "", "2,1,1"), want: `f.csv:4: found another number of columns; allowed: two columns, frequency_hz,psd_hz2_per_hz`},
		{text: table, files: rows("frequency_hz,psd_hz2_per_hz", "1,1", "2,1\"1"), want: `f.csv:3: found text that is not CSV; allowed: two columns`},
		{text: table, files: rows("frequency_hz,psd_hz2_per_hz", "1,1", "1,2"), want: `f.csv:3: found 1 Hz after 1 Hz; allowed: ascending frequencies`},
		{text: table, files: rows("frequency_hz,psd_hz2_per_hz", "0,1", "1,2"), want: `f.csv:2: found "0" as frequency_hz; allowed: a number, 1e-12 to 1e+13`},
		{text: table, files: rows("frequency_hz,psd_hz2_per_hz", "1,1", "2,0"), want: `f.csv:3: found "0" as psd_hz2_per_hz; allowed: a number, 1e-40 to 1e+40`},
		{text: table, files: rows("frequency_hz,psd_hz2_per_hz", "1,1", "2,nan"), want: `f.csv:3: found "nan" as psd_hz2_per_hz; allowed`},
		{text: table, files: rows("frequency_hz,psd_hz2_per_hz", "1,1", "2,"+strings.Repeat("x", 100)), want: `f.csv:3: found "` + strings.Repeat("x", 60) + `"... as psd_hz2_per_hz; allowed`},
		{text: table, files: rows("frequency_hz,psd_hz2_per_hz", "1e3,1", "1000.0000000000001,1"), want: `f.csv: a spectrum with 6.283185307179587e-06 rad/ns after 6.283185307179587e-06`},
		{text: trace + "\nsegment = 48", files: even(nil), want: `brief.toml:4: noise.segment: found 48; allowed: a power of two, 32 to 524288`},
		{text: trace + "\nsegment = 16", files: even(nil), want: `brief.toml:4: noise.segment: found 16; allowed: a whole number, 32 to 524288`},
		{text: trace + "\nsegment = 64", files: even(nil), want: `f.csv:41: found 40 rows; allowed: one segment, 64, to 1000000`},
		{text: trace, files: rows("time_s,value_hz", "0,1", "1,2"), want: `f.csv:3: found 2 rows; allowed: one segment, 32, to 1000000`},
		{text: trace, files: rows("time_s,value_hz", "0,1", "1,inf"), want: `f.csv:3: found "inf" as value_hz; allowed: a number, -1e+15 to 1e+15`},
		{text: trace, files: even(func(i int) (string, string) { return "7", fmt.Sprint(i) }), want: `f.csv:41: found 40 rows from 7 s to 7 s; allowed: ascending times, 1e-14 s to 1e12 s apart`},
		{text: trace, files: even(func(i int) (string, string) { return map[int]string{20: "20.02"}[i], "1" }),
			want: `f.csv:22: found 20.02 s as the time of row 21 of an even trace, which is 20 s; allowed: within 0.01 of the mean period, 1 s`},
		{text: trace, files: even(func(i int) (string, string) { return fmt.Sprint(i), "0.1" }), want: `f.csv: found a trace of mean square 0 about its mean; allowed: a trace that changes`},
	} {
		s, err := read(t, c.kind, c.text, c.files)
		if err == nil || !strings.Contains(err.Error(), c.want) || strings.Contains(err.Error(), "\n") {
			t.Errorf("%s\ngot  %v, %v\nwant %s", c.text, s, err, c.want)
		}
	}
}

func TestReadRefusesLargeFiles(t *testing.T) {
	many := "frequency_hz,psd_hz2_per_hz\n" + strings.Repeat("1,1\n", 2)
	r := newReader("f.csv", []byte(many), Detuning.columns("table"))
	r.rows = mostRows - 1
	if !r.next() || r.next() || r.err == nil || r.err.Error() != "f.csv:3: found more rows; allowed: at most 1000000" {
		t.Error(r.err)
	}
	dir := t.TempDir()
	path := filepath.Join(dir, "large.csv")
	if err := os.WriteFile(path, nil, 0o666); err != nil {
		t.Fatal(err)
	}
	if err := os.Truncate(path, mostBytes+1); err != nil {
		t.Fatal(err)
	}
	if data, found := readRegular(path); data != nil || found != "67108865 bytes" {
		t.Error(found)
	}
	if data, found := readRegular(os.DevNull); data != nil || found != "something that is not a regular file" {
		t.Error(found)
	}
}

// Whatever a file holds, it is refused with a sentence or gives a spectrum that can be used.
func FuzzTable(f *testing.F) {
	f.Add("frequency_hz,psd_hz2_per_hz\n1,1\n1e6,1e-3\n", false)
	f.Add("frequency_hz,psd_hz2_per_hz\r\n\"1\",1e40\r\n1.0000000000000002,1e-40\r\n1e13,1e40", false)
	var trace strings.Builder
	trace.WriteString("time_s,value_hz\n")
	for i := range 40 {
		fmt.Fprintf(&trace, "%d,%d\n", i, i*i%7)
	}
	f.Add(trace.String(), true)
	f.Fuzz(func(t *testing.T, text string, isTrace bool) {
		parse := func() (*Spectrum, error) { return parseTable("f.csv", []byte(text), Detuning, true) }
		if isTrace {
			parse = func() (*Spectrum, error) { return parseTrace("f.csv", []byte(text), Detuning, 0) }
		}
		s, err := parse()
		if err != nil {
			if s != nil || !strings.HasPrefix(err.Error(), "f.csv:") || strings.Contains(err.Error(), "\n") {
				t.Errorf("got %v, %q", s, err)
			}
			return
		}
		if v := s.Variance(); !(v > 0 && v < math.Inf(1)) || !(s.Low() >= 0 && s.Low() < s.High()) {
			t.Errorf("variance %g from %g to %g", v, s.Low(), s.High())
		}
		for _, T := range []float64{0.01, 10, 1e8} {
			checkRule(t, s.Nodes(T, 20), 20)
		}
	})
}
