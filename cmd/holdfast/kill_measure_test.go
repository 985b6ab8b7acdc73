//go:build measure

package main

import (
	"math/rand/v2"
	"os"
	"path/filepath"
	"testing"
	"time"
)

// TestMeasureKill kills designs at 200 random moments of their run, from the start of the process to a little after its usual end, and asks every time for a
// whole folder or none under the final name. Run it with
//
//	go test -tags measure -run TestMeasureKill -v ./cmd/holdfast
func TestMeasureKill(t *testing.T) {
	const kills = 200
	dir := newLab(t)
	brief, pulse := filepath.Join(dir, "held.toml"), filepath.Join(dir, "pulse")
	begun := time.Now()
	if status := launch(t, "design", brief, "-out", pulse).wait(t); status != exitMet {
		t.Fatalf("design: %d", status)
	}
	usual := time.Since(begun)
	mustBeWhole(t, pulse)
	if err := os.RemoveAll(pulse); err != nil {
		t.Fatal(err)
	}
	random := rand.New(rand.NewPCG(11, 4)) // which moments; where in its run a process then stands is up to the machine
	none, before, amid, whole := 0, 0, 0, 0
	for range kills {
		p := launch(t, "design", brief, "-out", pulse)
		moment := time.NewTimer(time.Duration(1.2 * random.Float64() * float64(usual)))
		select {
		case <-moment.C:
		case <-p.done:
		}
		p.Process.Kill()
		killed := p.wait(t) == -1
		parts := filesOf(pulse)
		switch {
		case exists(pulse):
			whole++
			mustBeWhole(t, pulse)
			if err := os.RemoveAll(pulse); err != nil {
				t.Fatal(err)
			}
		case !killed:
			t.Errorf("a process that came to its end left no folder")
		case parts > 0:
			amid++
			fallthrough
		default:
			none++
			if parts <= 0 {
				before++
			}
		}
	}
	t.Logf("%d kills within %v: %d left no folder (%d before the first file was written, %d with files in a part folder, its own or that of the kill before), %d a whole one", kills, (usual * 12 / 10).Round(time.Millisecond), none, before, amid, whole)
	if none == 0 || whole == 0 {
		t.Errorf("the moments do not cover the run: %d without a folder, %d with a whole one", none, whole)
	}
	if status, _, stderr := play("design", brief, "-out", pulse); status != exitMet {
		t.Fatalf("the next design: %d, %s", status, stderr)
	}
	mustBeWhole(t, pulse)
	if n := filesOf(pulse); n >= 0 {
		t.Errorf("the killed ones' parts are still there")
	}
}
