package main

import (
	"encoding/binary"
	"encoding/csv"
	"math"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"holdfast/design"
	"holdfast/hardware"
)

// Every format of a pulse's waveform, each parsed for itself, says the same; each file is listed with its hash; and a
// changed one is refused.
func TestFormatsAgree(t *testing.T) {
	dir := newLab(t)
	pulse := filepath.Join(dir, "pulse")
	if status, _, stderr := play("design", filepath.Join(dir, "quick.toml"), "-out", pulse); status != exitMet {
		t.Fatalf("design: %d, %s", status, stderr)
	}
	files := tree(t, pulse)
	record, err := design.ReadRecord(pulse)
	if err != nil {
		t.Fatal(err)
	}
	listed := map[string]bool{}
	for _, f := range record.Files {
		listed[f.Name] = true
	}
	for name := range files {
		folder := name == "." || name == "inputs"
		if !folder && name != hardware.RecordName && name != datasheetFile && !listed[filepath.ToSlash(name)] {
			t.Errorf("%s is not listed with a hash", name)
		}
	}
	codes, shape, err := hardware.ReadNPY[int16](filepath.Join(pulse, "q1-drive.npy"), -1, 2)
	if err != nil {
		t.Fatal(err)
	}
	raw := []byte(files["q1-drive.int16"])
	rows, err := csv.NewReader(strings.NewReader(files["q1-drive.csv"])).ReadAll()
	if err != nil || len(rows) != shape[0]+1 || len(raw) != 2*len(codes) || shape[0] != 40 {
		t.Fatalf("%d samples, %d lines, %d bytes: %v", shape[0], len(rows), len(raw), err)
	}
	for k := range shape[0] {
		var v [5]float64
		for i, field := range rows[k+1] {
			if v[i], err = strconv.ParseFloat(field, 64); err != nil {
				t.Fatal(err)
			}
		}
		i, q := codes[2*k], codes[2*k+1]
		if v != [5]float64{float64(k), float64(i), float64(q), float64(i) / 8192, float64(q) / 8192} {
			t.Errorf("CSV, sample %d: %v; codes %d, %d", k, v, i, q)
		}
		if a, b := int16(binary.LittleEndian.Uint16(raw[4*k:])), int16(binary.LittleEndian.Uint16(raw[4*k+2:])); a != i || b != q {
			t.Errorf("raw, sample %d: %d, %d; codes %d, %d", k, a, b, i, q)
		}
	}
	// What arrives, of a line with unit steady gain: the area under it is that of the samples, but for a tail that is yet to come (the
	// slow one holds 1.5 %, and a span after the end most of it has come).
	arrives, shape, err := hardware.ReadNPY[float64](filepath.Join(pulse, "q1-drive-arrives.npy"), -1, 3)
	if err != nil || shape[0] != 2*40*hardware.ArrivalRows+1 {
		t.Fatalf("shape %v: %v", shape, err)
	}
	if first, last := arrives[0], arrives[len(arrives)-3]; !(math.Abs(first-3.2) <= 1e-12) || !(math.Abs(last-83.2) <= 1e-12) {
		t.Errorf("from %v ns to %v ns", first, last)
	}
	for q := range 2 {
		sent, got := 0.0, 0.0
		for k := range 40 {
			sent += float64(codes[2*k+q]) / 8192 * 40
		}
		for k := 1; k < shape[0]; k++ {
			got += (arrives[3*k+1+q] + arrives[3*k-2+q]) / 2 / hardware.ArrivalRows
		}
		if !(math.Abs(got-sent) <= 0.01*math.Abs(sent)+2) {
			t.Errorf("quadrature %d: %v MHz ns sent, %v arrive", q, sent, got)
		}
	}
	for _, name := range []string{"q1-drive.csv", "q1-drive.int16", "q1-drive-arrives.npy"} {
		path := filepath.Join(pulse, name)
		write(t, path, files[name][:len(files[name])-1]+"x")
		status, _, stderr := play("replay", pulse)
		if status != exitBadInput {
			t.Errorf("replay took a changed %s: %d", name, status)
		}
		mustBeOneLine(t, stderr, path, "changed since the pulse was written")
		write(t, path, files[name])
	}
	if status, _, stderr := play("replay", pulse); status != exitMet {
		t.Errorf("replay: %d, %s", status, stderr)
	}
}
