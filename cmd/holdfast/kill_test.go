package main

import (
	"bytes"
	"context"
	"errors"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"holdfast/design"
)

// A process is the program, running.
type process struct {
	*exec.Cmd
	out, errs bytes.Buffer
	done      chan struct{} // closed at its end
	err       error
}

// launch starts the program as a process of its own, which a failed test ends.
func launch(t *testing.T, args ...string) *process {
	t.Helper()
	self, err := os.Executable()
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithTimeout(context.Background(), time.Minute)
	t.Cleanup(cancel)
	p := &process{Cmd: exec.CommandContext(ctx, self, args...), done: make(chan struct{})}
	p.Env = append(os.Environ(), asProgram+"=1")
	p.Stdout, p.Stderr = &p.out, &p.errs
	if err := p.Start(); err != nil {
		t.Fatal(err)
	}
	go func() {
		p.err = p.Wait()
		close(p.done)
	}()
	return p
}

// wait waits for the end and gives the exit status, -1 for a killed process.
func (p *process) wait(t *testing.T) int {
	t.Helper()
	<-p.done
	if e := (*exec.ExitError)(nil); p.err != nil && !errors.As(p.err, &e) {
		t.Fatal(p.err)
	}
	return p.ProcessState.ExitCode()
}

// filesOf counts what a part folder holds by now, -1 where there is none.
func filesOf(pulse string) int {
	parts, _ := filepath.Glob(filepath.Join(filepath.Dir(pulse), "."+filepath.Base(pulse)+".part-*"))
	if len(parts) == 0 {
		return -1
	}
	n := 0
	for _, dir := range []string{parts[0], filepath.Join(parts[0], "inputs")} {
		entries, _ := os.ReadDir(dir)
		n += len(entries)
	}
	return n
}

func exists(path string) bool {
	_, err := os.Lstat(path)
	return err == nil
}

// Whenever a design is killed, its folder is there as a whole or not at all, and what it left does not
// stand in the way of the next.
func TestKilled(t *testing.T) {
	dir := newLab(t)
	brief, pulse := filepath.Join(dir, "quick.toml"), filepath.Join(dir, "pulse")
	killed, done := 0, 0
	// with one file more in the part folder each time: 3 inputs and their folder, 2 waveforms, record, page
	for n := 0; n <= 8; n++ {
		p := launch(t, "design", brief, "-out", pulse)
		for filesOf(pulse) < n && !exists(pulse) && !p.ended() {
			time.Sleep(50 * time.Microsecond)
		}
		p.Process.Kill()
		p.wait(t)
		if !exists(pulse) {
			killed++
			continue
		}
		done++
		mustBeWhole(t, pulse)
		if err := os.RemoveAll(pulse); err != nil {
			t.Fatal(err)
		}
	}
	if killed == 0 {
		t.Errorf("no process was killed before its end; %d came to it", done)
	}
	if status, _, stderr := play("design", brief, "-out", pulse); status != exitMet {
		t.Fatalf("the next design: %d, %s", status, stderr)
	}
	mustBeWhole(t, pulse)
	if n := filesOf(pulse); n >= 0 {
		t.Errorf("the killed ones' parts are still there")
	}
}

// ended says whether a process has ended.
func (p *process) ended() bool {
	select {
	case <-p.done:
		return true
	default:
		return false
	}
}

// With -force a complete folder stands at every instant, under one name or the other.
func TestKilledWithForce(t *testing.T) {
	dir, pulse := newPulse(t)
	write(t, filepath.Join(pulse, "old"), "old\n")
	old := tree(t, pulse)
	for n := 5; n <= 9; n++ {
		p := launch(t, "design", filepath.Join(dir, "quick.toml"), "-out", pulse, "-force")
		for filesOf(pulse) < n && !p.ended() {
			time.Sleep(20 * time.Microsecond)
		}
		p.Process.Kill()
		p.wait(t)
		switch before := pulse + ".before-1"; {
		case exists(before):
			if d := compare(old, tree(t, before)); d != nil {
				t.Errorf("the old folder, now %s, differs in %v", before, d)
			}
			if exists(pulse) {
				mustBeWhole(t, pulse)
				if err := os.RemoveAll(pulse); err != nil {
					t.Fatal(err)
				}
			}
			if err := os.Rename(before, pulse); err != nil {
				t.Fatal(err)
			}
		default:
			if d := compare(old, tree(t, pulse)); d != nil {
				t.Errorf("the old folder differs in %v", d)
			}
		}
	}
}

// An interrupt in a long search ends it with status 3 and the best so far, which replay reads.
func TestInterrupted(t *testing.T) {
	dir := newLab(t)
	// nine equations more than the span has coefficients: no start succeeds
	text := strings.NewReplacer(`"72 ns"`, `"40 ns"`, `name = "held"`, "name = \"hopeless\"\nstarts = 100000", `detuning = "q1"`, `any = "all"`).Replace(held)
	brief, pulse := filepath.Join(dir, "hopeless.toml"), filepath.Join(dir, "pulse")
	write(t, brief, text)
	for _, pause := range []time.Duration{0, 300 * time.Millisecond} {
		p := launch(t, "design", brief, "-out", pulse)
		for filesOf(pulse) < 0 && !p.ended() {
			time.Sleep(time.Millisecond)
		}
		time.Sleep(pause)
		if err := p.Process.Signal(os.Interrupt); err != nil {
			t.Fatal(err)
		}
		if status := p.wait(t); status != exitInterrupted || p.errs.Len() > 0 {
			t.Fatalf("after %v: status %d, stderr %q", pause, status, p.errs.String())
		}
		mustHave(t, "design", p.out.String(), "MISSED", "interrupted", "the best so far", "pulse: "+pulse)
		mustBeWhole(t, pulse)
		record, err := design.ReadRecord(pulse)
		if err != nil || record.Pulse.Status != string(design.Interrupted) || record.Search.Tried >= 100000 {
			t.Errorf("after %v: %v, status %q", pause, err, record.Pulse.Status)
		}
		status, stdout, stderr := play("replay", pulse)
		if status != exitMissed || stderr != "" {
			t.Errorf("replay: %d, %s", status, stderr)
		}
		mustHave(t, "replay", stdout, "interrupted")
		if n := filesOf(pulse); n >= 0 {
			t.Errorf("a part folder is left")
		}
		if err := os.RemoveAll(pulse); err != nil {
			t.Fatal(err)
		}
	}
}

// An interrupted replay writes nothing and says so.
func TestReplayInterrupted(t *testing.T) {
	_, pulse := newPulse(t)
	before := tree(t, filepath.Dir(pulse))
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	var out, errs bytes.Buffer
	if status := run(ctx, []string{"replay", pulse}, &out, &errs); status != exitInterrupted {
		t.Errorf("status %d", status)
	}
	mustBeOneLine(t, errs.String(), pulse, "interrupted")
	if d := compare(before, tree(t, filepath.Dir(pulse))); d != nil || out.Len() > 0 {
		t.Errorf("changed %v, wrote %q", d, out.String())
	}
}
