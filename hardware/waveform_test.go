package hardware

import (
	"bytes"
	"encoding/binary"
	"encoding/csv"
	"flag"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"

	"holdfast/filter"
)

var update = flag.Bool("update", false, "rewrite the golden waveform files")

// The codes of the golden files, at 14 bit: zero, one, the ends of the range, and others.
var goldenCodes = []int16{0, 1, -1, 8191, -8192, 258, 3, -4000}

// waveformFiles writes one of each format into dir and names them.
func waveformFiles(t *testing.T, dir string) []string {
	t.Helper()
	at := func(name string) string { return filepath.Join(dir, name) }
	for _, err := range []error{
		WriteCSV(at("quadrature.csv"), 1/2.4, 14, 2, goldenCodes),
		WriteCSV(at("baseband.csv"), 1, 14, 1, goldenCodes),
		WriteRaw(at("codes.int16"), goldenCodes),
		WriteArrival(at("arrives.npy"), []float64{3.2, 0, 0, 3.325, 0.1, -40, 3.45, 1e-17, 39.999}),
	} {
		if err != nil {
			t.Fatal(err)
		}
	}
	return []string{"quadrature.csv", "baseband.csv", "codes.int16", "arrives.npy"}
}

// The bytes of each format stay what they are.
func TestWaveformFilesGolden(t *testing.T) {
	dir := t.TempDir()
	for _, name := range waveformFiles(t, dir) {
		got, err := os.ReadFile(filepath.Join(dir, name))
		if err != nil {
			t.Fatal(err)
		}
		golden := filepath.Join("testdata", "waveform", name)
		if *update {
			if err := os.WriteFile(golden, got, 0o666); err != nil {
				t.Fatal(err)
			}
		}
		want, err := os.ReadFile(golden)
		if err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(got, want) {
			t.Errorf("%s has changed (go test -run Golden -update rewrites it):\n%q\nwas\n%q", name, got, want)
		}
	}
}

// What is in the files by hand: RFC 4180, section 2 (lines end in CRLF, the header has as many fields as every record);
// 8191/8192 is 0.9998779296875; 258 is 0x0102.
func TestWaveformFilesByHand(t *testing.T) {
	dir := t.TempDir()
	waveformFiles(t, dir)
	text := func(name string) string {
		data, err := os.ReadFile(filepath.Join(dir, name))
		if err != nil {
			t.Fatal(err)
		}
		return string(data)
	}
	if want := "time_ns,code_i,code_q,share_i,share_q\r\n0,0,1,0,0.0001220703125\r\n"; !strings.HasPrefix(text("quadrature.csv"), want) {
		t.Errorf("%q does not begin with %q", text("quadrature.csv"), want)
	}
	if want := "time_ns,code,share\r\n0,0,0\r\n1,1,0.0001220703125\r\n2,-1,-0.0001220703125\r\n3,8191,0.9998779296875\r\n4,-8192,-1\r\n"; !strings.HasPrefix(text("baseband.csv"), want) {
		t.Errorf("%q does not begin with %q", text("baseband.csv"), want)
	}
	if got, want := text("codes.int16"), "\x00\x00\x01\x00\xff\xff\xff\x1f\x00\xe0\x02\x01\x03\x00\x60\xf0"; got != want {
		t.Errorf("raw %q, want %q", got, want)
	}
}

// Every file read back with a reader that is not ours gives the very numbers that went in.
func TestWaveformFilesComeBack(t *testing.T) {
	dir := t.TempDir()
	for _, bits := range []int{2, 12, 16} {
		var codes []int16
		for c := -1 << (bits - 1); c < 1<<(bits-1); c += 1 + 1<<bits/57 {
			codes = append(codes, int16(c))
		}
		codes = append(codes, int16(LargestCode(bits)))
		if len(codes)%2 == 1 {
			codes = append(codes, 0)
		}
		x, err := SamplesOf(codes, bits)
		if err != nil {
			t.Fatal(err)
		}
		for _, period := range []float64{1, 1 / 2.4, 0.1, 1000.0 / 3} {
			path := filepath.Join(dir, "a.csv")
			os.Remove(path)
			if err := WriteCSV(path, period, bits, 2, codes); err != nil {
				t.Fatal(err)
			}
			f, err := os.Open(path)
			if err != nil {
				t.Fatal(err)
			}
			rows, err := csv.NewReader(f).ReadAll()
			f.Close()
			if err != nil || len(rows) != 1+len(x) {
				t.Fatalf("%d rows of %d samples: %v", len(rows), len(x), err)
			}
			for k, row := range rows[1:] {
				var v [5]float64
				for i := range v {
					if v[i], err = strconv.ParseFloat(row[i], 64); err != nil {
						t.Fatal(err)
					}
				}
				if v[0] != float64(k)*period || v[1] != float64(codes[2*k]) || v[2] != float64(codes[2*k+1]) || v[3] != real(x[k]) || v[4] != imag(x[k]) {
					t.Errorf("%d bit, %v ns: sample %d reads %v", bits, period, k, row)
				}
			}
		}
		path := filepath.Join(dir, "a.int16")
		os.Remove(path)
		if err := WriteRaw(path, codes); err != nil {
			t.Fatal(err)
		}
		raw, err := os.ReadFile(path)
		if err != nil || len(raw) != 2*len(codes) {
			t.Fatalf("%d bytes: %v", len(raw), err)
		}
		for k, c := range codes {
			if got := int16(binary.LittleEndian.Uint16(raw[2*k:])); got != c {
				t.Errorf("raw code %d is %d, want %d", k, got, c)
			}
		}
	}
	// a file is never written over, and a broken call leaves none
	path := filepath.Join(dir, "a.csv")
	if err := WriteCSV(path, 1, 14, 2, goldenCodes); err == nil || !strings.HasPrefix(err.Error(), path+": ") {
		t.Errorf("written over: %v", err)
	}
	if err := WriteRaw(path, goldenCodes); err == nil {
		t.Errorf("written over")
	}
	other := filepath.Join(dir, "b.csv")
	if err := WriteCSV(other, 1, 14, 2, goldenCodes[:3]); err == nil {
		t.Errorf("half a sample was written")
	}
	if _, err := os.Stat(other); err == nil {
		t.Errorf("a file was left behind")
	}
}

// What arrives, against the closed form of a single pole: a step of height x reaches x (1 - exp(-t/tau)) and decays as
// exp(-t/tau) after its end. The rows run from the window's start to a span after its end.
func TestArrival(t *testing.T) {
	const tau, h, full, n = 3.0, 0.5, 2 * math.Pi * 0.04, 8
	line, err := filter.SinglePole(tau)
	if err != nil {
		t.Fatal(err)
	}
	line.Delay = 2.5
	p := &Profile{Name: "one pole", SamplePeriod: h, Bits: 14, Block: 1, Shortest: 1, Longest: 100,
		Channels: []Channel{{Name: "a", Kind: Quadrature, FullScale: full, AmplitudeLimit: 1, SlewLimit: math.Inf(1), Band: math.Inf(1),
			RingOut: RingOut{Limit: math.Inf(1)}, Latency: 10, Line: line}}}
	codes := make([]int16, 2*n)
	for k := range n {
		codes[2*k], codes[2*k+1] = 4096, -2048 // 1/2 and -1/4
	}
	rows, err := p.Arrival(0, codes)
	if err != nil {
		t.Fatal(err)
	}
	if len(rows) != 3*(2*n*ArrivalRows+1) {
		t.Fatalf("%d numbers", len(rows))
	}
	for k := 0; k < len(rows)/3; k++ {
		at := float64(k) * h / ArrivalRows
		want := 40 * (1 - math.Exp(-at/tau))
		if at > n*h {
			want = 40 * (math.Exp(n*h/tau) - 1) * math.Exp(-at/tau)
		}
		for i, w := range []float64{12.5 + at, 0.5 * want, -0.25 * want} {
			if got := rows[3*k+i]; !(math.Abs(got-w) <= 1e-12*40) {
				t.Errorf("row %d, column %d: %v, want %v", k, i, got, w)
			}
		}
	}
	path := filepath.Join(t.TempDir(), "a.npy")
	if err := WriteArrival(path, rows); err != nil {
		t.Fatal(err)
	}
	back, shape, err := ReadNPY[float64](path, -1, 3)
	if err != nil || shape[0] != len(rows)/3 || !slices.Equal(back, rows) {
		t.Errorf("read back: %v, %v", shape, err)
	}
	// a straight line: the edge row is the value just after the edge
	p.Channels[0].Line = filter.Through()
	if rows, err = p.Arrival(0, codes); err != nil {
		t.Fatal(err)
	}
	if end := 3 * n * ArrivalRows; rows[1] != 20 || rows[end-2] != 20 || rows[end+1] != 0 || rows[end+2] != 0 {
		t.Errorf("edges: %v, %v, %v", rows[:3], rows[end-3:end], rows[end:end+3])
	}
	// a drive that compresses, by hand: the length of (1/2, -1/4) is 0.559; the table gives 0.9 of it there
	length := math.Sqrt(5) / 4
	p.Channels[0].Compression = Compression{{0, 0}, {length, 0.9 * length}, {1, 0.95}}
	if rows, err = p.Arrival(0, codes); err != nil {
		t.Fatal(err)
	}
	if !(math.Abs(rows[1]-18) <= 1e-12*40) || !(math.Abs(rows[2]+9) <= 1e-12*40) {
		t.Errorf("compressed: %v", rows[:3])
	}
	// one converter: a sample a code
	p.Channels[0].Compression, p.Channels[0].Kind = nil, Baseband
	if rows, err = p.Arrival(0, codes[1:]); err != nil {
		t.Fatal(err)
	}
	if next := 3 * ArrivalRows; len(rows) != 3*(2*(2*n-1)*ArrivalRows+1) || rows[1] != -10 || rows[next+1] != 20 || rows[next+2] != 0 {
		t.Errorf("baseband: %d numbers, %v, %v", len(rows), rows[:3], rows[next:next+3])
	}
	if _, err := p.Arrival(1, codes); err == nil {
		t.Errorf("a channel that is not there")
	}
	p.Channels[0].Kind = Quadrature
	if _, err := p.Arrival(0, codes[1:]); err == nil {
		t.Errorf("half a sample")
	}
	codes[3] = 8192
	if _, err := p.Arrival(0, codes); err == nil {
		t.Errorf("a code beyond 14 bit")
	}
}
