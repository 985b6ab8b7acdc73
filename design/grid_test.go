package design

import (
	"math"
	"strings"
	"testing"

	"holdfast/filter"
)

func cascade(t *testing.T, sections ...filter.Line) filter.Line {
	t.Helper()
	l, err := filter.Cascade(sections...)
	if err != nil {
		t.Fatal(err)
	}
	return l
}

// TestAxis checks what a grid promises: steps that add up to the window between
// First and Last, cut at every sample edge of every feed, nodes inside their
// steps, and steps no longer than the poles that live and the field allow.
func TestAxis(t *testing.T) {
	low, err := filter.Bessel(2, 0.2)
	if err != nil {
		t.Fatal(err)
	}
	tail, err := filter.Tails([]filter.Tail{{Amplitude: -0.015, Time: 30}})
	if err != nil {
		t.Fatal(err)
	}
	line := cascade(t, low, tail)
	for _, c := range []struct {
		name    string
		feeds   []feed
		settled bool
		static  float64
	}{
		{"one", []feed{{line: line}}, true, 0},
		{"window", []feed{{line: line}}, false, 0},
		{"static", []feed{{line: line}}, true, 0.03},
		{"two, one early", []feed{{line: line}, {line: low, at: -1.3}}, true, 0},
		{"two, window", []feed{{line: line}, {line: low, at: -1.3}}, false, 0},
		{"through", []feed{{line: filter.Through()}}, true, 0},
	} {
		const n, h = 12, 1.0
		a, err := newAxis(c.feeds, n, h, stepShare, c.settled, 0.25, c.static, 0)
		if err != nil {
			t.Fatal(err)
		}
		sum := func(list []float64) float64 {
			s := 0.0
			for _, v := range list {
				s += v
			}
			return s
		}
		if got := sum(a.Steps[a.First:a.Last]); !(math.Abs(got-n*h) <= 1e-12) {
			t.Errorf("%s: the window lasts %v, want %v", c.name, got, n*h)
		}
		if got := sum(a.Steps[:a.First]); !(math.Abs(got-a.Lead) <= 1e-12) || c.settled && c.feeds[len(c.feeds)-1].at < 0 && !(math.Abs(a.Lead-1.3) <= 1e-12) {
			t.Errorf("%s: %v before the window, Lead says %v", c.name, got, a.Lead)
		}
		steps := a.Steps
		if a.cell {
			steps = steps[:len(steps)-1]
		}
		if got := sum(steps[a.Last:]); !(math.Abs(got-a.Trail) <= 1e-9*(1+got)) || !(math.Abs(n*h+got-a.end) <= 1e-9*(1+got)) {
			t.Errorf("%s: %v after the window, Trail says %v and end %v", c.name, got, a.Trail, a.end)
		}
		if len(a.Times) != 2*len(steps) {
			t.Fatalf("%s: %d nodes for %d steps", c.name, len(a.Times), len(steps))
		}
		at := -a.Lead
		for j, s := range steps {
			if x, y := a.Times[2*j]-at, a.Times[2*j+1]-at; !(x > 0 && x < y && y < s) {
				t.Errorf("%s: step %d of %v has its nodes at %v and %v", c.name, j, s, x, y)
			}
			for _, f := range c.feeds { // no edge inside a step
				for k := range n + 1 {
					if e := f.at + float64(k)*h - at; e > 1e-9 && e < s-1e-9 && j < a.Last {
						t.Errorf("%s: an edge %v into step %d of %v", c.name, e, j, s)
					}
				}
			}
			if j < a.Last && len(line.Terms) > 0 && c.name != "through" && !(s <= stepShare/line.FastestRate()*(1+1e-9)) {
				t.Errorf("%s: step %d of %v is too long", c.name, j, s)
			}
			at += s
		}
	}
}

// TestAxisBudget: what would take too long is refused, and not cut off.
func TestAxisBudget(t *testing.T) {
	slow, err := filter.Tails([]filter.Tail{{Amplitude: 0.1, Time: 1e8}})
	if err != nil {
		t.Fatal(err)
	}
	for _, static := range []float64{0, 0.06} {
		_, err = newAxis([]feed{{line: slow}, {line: slow}}, 10, 1, stepShare, true, 0.25, static, 0)
		if err == nil || !strings.Contains(err.Error(), "steps") {
			t.Errorf("static %v: %v; want a refusal", static, err)
		}
	}
}
