package main

import (
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"holdfast/design/brief"
	"holdfast/design/device"
	"holdfast/design/replay"
	"holdfast/hardware"
)

// Fuzz targets of the files that people write or send: whatever their bytes are, the program ends with a sentence or goes on, and
// what it goes on with is sound. Those of the NPY reader, the TOML reader and the units stand beside them. .ci/fuzz runs all.

// oneSentence demands what every refusal must be.
func oneSentence(t *testing.T, err error, file string) {
	t.Helper()
	text := oneLine(err)
	if text == "" || len(text) > 4096 || !strings.Contains(text, file) {
		t.Errorf("not a sentence about %s: %.500q", file, text)
	}
}

// seeds gives the fuzzer the demonstration's files, and edits of them that reach what the demonstration does not use.
func seeds(f *testing.F, name string, edits ...string) {
	f.Helper()
	text := read(f, filepath.Join("starter", name))
	f.Add([]byte(text))
	f.Add([]byte(""))
	for i := 0; i+1 < len(edits); i += 2 {
		edited := strings.Replace(text, edits[i], edits[i+1], 1)
		if edited == text {
			f.Fatalf("%s has no %q", name, edits[i])
		}
		f.Add([]byte(edited))
	}
}

// small is what a fuzzed file may be long: the limit of 1 MiB has its own test.
const small = 1 << 14

func FuzzProfile(f *testing.F) {
	seeds(f, "rack-b.toml",
		`kind = "quadrature"`, `kind = "baseband"`,
		`kind = "quadrature"`, "kind = \"quadrature\"\nenvelope = \"box\"\nrms_limit = \"60 %\"\nrms_period = \"1 us\"\nout_of_band = \"1 %\"",
		`kind = "quadrature"`, "kind = \"quadrature\"\ncompression = [[\"0 %\", \"0 %\"], [\"50 %\", \"49 %\"], [\"100 %\", \"95 %\"]]\nshift = \"12 kHz\"\nzero_mean = true",
		`delay = "3.2 ns"`, "delay = \"3.2 ns\"\nac_coupling = \"1 ms\"\nallpass = \"0.4 ns\"\nresonance = [{ offset = \"80 MHz\", half_width = \"2 MHz\", depth = \"10 %\" }]",
		`family = "bessel", order = 2`, `family = "gaussian"`,
		`family = "bessel", order = 2`, `family = "butterworth", order = 5, known_to = "5 %"`)
	path := filepath.Join(f.TempDir(), "p.toml")
	f.Fuzz(func(t *testing.T, data []byte) {
		if len(data) > small {
			return
		}
		p, err := hardware.Parse(path, data)
		if err != nil {
			oneSentence(t, err, path)
			return
		}
		if !(p.SamplePeriod > 0) || len(p.Channels) == 0 || p.Block < 1 {
			t.Errorf("taken: %+v", p)
		}
		if len(p.Channels) > 2 || p.Longest > 1024 { // the words of more take long and are the same
			return
		}
		if err := describeProfile(io.Discard, p); err != nil {
			oneSentence(t, err, path)
			return
		}
		if _, err := profileFormOf(p); err != nil {
			t.Errorf("described, but no form: %v", err)
		}
	})
}

func FuzzDevice(f *testing.F) {
	seeds(f, "skerry.toml",
		`[[drive]]`, "[[bias]]\nsite = \"q1\"\nchannel = \"q1 flux\"\naxis = \"Z\"\n[[drive]]",
		`"upper"`, `"lower"`)
	seeds(f, "skerry-pair.toml",
		`kind = "exchange"`, `kind = "dipolar"`,
		`"5 MHz"`, "\"5 MHz\"\n[[crosstalk]]\nchannel = \"q1 drive\"\nsite = \"q2\"\nshare = \"3 %\"\nphase = \"40 deg\"")
	f.Add([]byte(mixed))
	path := filepath.Join(f.TempDir(), "d.toml")
	f.Fuzz(func(t *testing.T, data []byte) {
		if len(data) > small {
			return
		}
		write(t, path, string(data))
		d, err := device.Load(path)
		if err != nil {
			oneSentence(t, err, path)
			return
		}
		if d.Dim() < 2 || len(d.Static().Data) != d.Dim()*d.Dim() {
			t.Errorf("taken: %+v", d)
		}
		describeDevice(io.Discard, d)
		deviceFormOf(d)
	})
}

func FuzzBrief(f *testing.F) {
	seeds(f, "x90.toml",
		`gate = "X90"`, "axis = [1, 0.5, 0]\nangle = \"30 deg\"\nfree_z = \"both\"",
		`gate = "X90"`, "matrix = [[0, 1], [1, 0]]",
		`any = "all"`, `line = "q1 drive"`+"\nparameter = \"lowpass[0].corner\"",
		`size = "1 MHz"`, "\n[[error]]\namplitude = \"q1 drive\"\nquadrature = \"I\"\n[[error]]\noffset = \"q1 drive\"\n[[error]]\nquadrature_angle = \"q1 drive\"",
		`seed = 1`, "seed = 1\nphase_by = \"samples\"\nphases = [\"0 deg\", \"90 deg\"]\nbasis = { family = \"b-spline\", degree = 4 }")
	seeds(f, "sqrt-iswap.toml",
		`gate = "sqrt-iSWAP"`, `controlled = "X90"`,
		`sites = ["q1", "q2"]`, "#", // no site, and a gate
		`hold = "nothing"`, "#",
		`free_z = "both"`, `up_to = "local rotations"`,
		`[require]`, "[[error]]\nany = \"two-body\"\nexcept = [{ q1 = \"Z\", q2 = \"Z\" }]\n[require]")
	for _, text := range []string{
		"hold = \"nothing\"\n[target]\nfrom = [\"00\", \"11\"]\nto = [\"01\", \"10\"]\n", "[target]\nfrom = \"00\"\nto = [0.6, 0, 0, [0, 0.8]]\n[[error]]\ncollective = \"Z\"\n",
		"[target]\ngates = { q1 = \"X90\", q2 = \"H\" }\n[[error]]\nany = \"all\"\nrates = \"rates.csv\"\n[[error]]\non = { q1 = \"X\" }\n[[error]]\ncrosstalk = \"q1 drive\"\nsite = \"q2\"\n",
	} {
		f.Add([]byte(fmt.Sprintf(pair, text)))
	}
	dir := f.TempDir()
	write(f, filepath.Join(dir, "rates.csv"), "pauli,rate\nZZ,1e-4\nIX,2e-4\n")
	for _, name := range []string{"rack-b.toml", "skerry.toml", "rack-b-pair.toml", "skerry-pair.toml"} {
		write(f, filepath.Join(dir, name), read(f, filepath.Join("starter", name)))
	}
	path := filepath.Join(dir, "b.toml")
	f.Fuzz(func(t *testing.T, data []byte) {
		// a brief names other files: none outside the folder, none that is not a file
		if text := string(data); len(data) > small || strings.ContainsAny(text, "/\\") {
			return
		}
		write(t, path, string(data))
		b, p, d, err := brief.LoadAll(path)
		if err != nil {
			oneSentence(t, err, dir)
			return
		}
		if b.Span > 500 { // the words of more take long and are the same
			return
		}
		if _, err := describeBrief(io.Discard, b, p, d); err != nil {
			oneSentence(t, err, dir)
		}
	})
}

// The record of a folder of which all other files are in order.
func FuzzRecord(f *testing.F) {
	dir := newLab(f)
	pulse := filepath.Join(dir, "pulse")
	if status, _, stderr := play("design", filepath.Join(dir, "quick.toml"), "-out", pulse); status != exitMet {
		f.Fatalf("design: %d, %s", status, stderr)
	}
	path := filepath.Join(pulse, hardware.RecordName)
	record := read(f, path)
	f.Add([]byte(record))
	f.Add([]byte(""))
	for _, edit := range [][2]string{
		{`kind = "quadrature"`, `kind = "baseband"`}, {`ends = "settled"`, `ends = "window"`}, {"samples = 40", "samples = 41"},
		{"powers = [", "powers = [2, "}, {"dim = 2", "dim = 3"}, {"free_z_after = []", "free_z_after = [0.5]"}, {"susceptibility = ", "susceptibility = 1"},
	} {
		f.Add([]byte(strings.Replace(record, edit[0], edit[1], 1)))
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		if len(data) > 4*small {
			return
		}
		if err := os.WriteFile(path, data, 0o666); err != nil {
			t.Fatal(err)
		}
		folder, err := replay.Open(pulse)
		if err != nil {
			oneSentence(t, err, pulse)
			return
		}
		if err := folder.Model.Validate(); err != nil {
			t.Errorf("taken, and not valid: %v", err)
		}
	})
}
