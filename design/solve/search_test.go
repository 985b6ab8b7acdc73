package solve

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"sync/atomic"
	"testing"
	"testing/synctest"
	"time"
)

// A plan says how every start of a search will end and how long it takes.
type plan struct {
	status []Status
	took   []time.Duration
}

func drawPlan(rng *rand.Rand, n int) plan {
	var p plan
	share := rng.Float64()
	for range n {
		status := Status(1 + rng.IntN(2)) // Stalled or Exhausted
		if rng.Float64() < share {
			status = Converged
		}
		p.status = append(p.status, status)
		p.took = append(p.took, time.Duration(1+rng.IntN(1000))*time.Millisecond)
	}
	return p
}

// run is a start that takes its time, unless it is cancelled.
func (p plan) run(ctx context.Context, start int) Result {
	select {
	case <-time.After(p.took[start]):
		return Result{C: []float64{float64(start)}, Miss: float64(100 - start), Status: p.status[start]}
	case <-ctx.Done():
		return Result{C: []float64{-1}, Miss: 1e6, Status: Interrupted}
	}
}

// needed is the definition: all starts up to the want-th success counted from
// below, or all.
func (p plan) needed(want int) int {
	for i, s := range p.status {
		if s == Converged {
			if want--; want == 0 {
				return i + 1
			}
		}
	}
	return len(p.status)
}

// TestSearchKeepsTheLowestNumbers runs in the fake time of synctest: the order
// in which starts end is that of their durations, whatever the machine does.
func TestSearchKeepsTheLowestNumbers(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 1))
	for trial := range 150 {
		n, want, workers := rng.IntN(12), 1+rng.IntN(5), 1+rng.IntN(9)
		p := drawPlan(rng, n)
		synctest.Test(t, func(t *testing.T) {
			begun := time.Now()
			var reported, inReport atomic.Int32
			successes, best := 0, math.Inf(1)
			list := Search(context.Background(), n, want, workers, p.run, func(done, won int, least float64) {
				if inReport.Add(1) != 1 {
					t.Errorf("two reports at once")
				}
				if int(reported.Add(1)) != done || won < successes || !(least <= best) {
					t.Errorf("report %d of %d done, %d after %d won, best %v after %v", reported.Load(), done, won, successes, least, best)
				}
				successes, best = won, least
				inReport.Add(-1)
			})
			needed := p.needed(want)
			if len(list) != needed {
				t.Fatalf("trial %d (%d starts, want %d, %d workers): %d results, want %d of %v", trial, n, want, workers, len(list), needed, p.status)
			}
			for i, r := range list {
				if r.Start != i || r.Status != p.status[i] || r.C[0] != float64(i) || r.Miss != float64(100-i) {
					t.Errorf("trial %d: result %d is %+v, want start %d, %v", trial, i, r, i, p.status[i])
				}
			}
			// nobody waits for a start that is not needed: the longest chain of starts
			// below the limit bounds the time
			var total time.Duration
			for _, d := range p.took[:needed] {
				total += d
			}
			if took := time.Since(begun); workers == 1 && took != total {
				t.Errorf("trial %d: one worker took %v, want %v", trial, took, total)
			} else if took > total+time.Second {
				t.Errorf("trial %d: took %v, one worker would take %v", trial, took, total)
			}
		})
	}
}

func TestSearchUsesItsWorkers(t *testing.T) {
	for _, c := range []struct{ n, workers, together int }{{10, 4, 4}, {3, 8, 3}, {5, 1, 1}, {5, 0, 1}, {5, -2, 1}} {
		synctest.Test(t, func(t *testing.T) {
			var running, most atomic.Int32
			begun := time.Now()
			list := Search(context.Background(), c.n, c.n+1, c.workers, func(ctx context.Context, start int) Result {
				most.Store(max(most.Load(), running.Add(1)))
				time.Sleep(time.Second)
				running.Add(-1)
				return Result{Status: Converged}
			}, nil)
			rounds := (c.n + c.together - 1) / c.together
			if took := time.Since(begun); len(list) != c.n || int(most.Load()) != c.together || took != time.Duration(rounds)*time.Second {
				t.Errorf("%d starts on %d workers: %d results, %d at once, %v", c.n, c.workers, len(list), most.Load(), took)
			}
		})
	}
}

func TestSearchCancelsOnlyWhatIsNotNeeded(t *testing.T) {
	// Start 5 succeeds first, 2 later, 0 and 1 not at all, 3 last: 3 must be cancelled
	// when 2 succeeds and not when 5 does.
	p := plan{
		status: []Status{Stalled, Stalled, Converged, Converged, Stalled, Converged, Converged},
		took:   []time.Duration{3 * time.Second, 3 * time.Second, 2 * time.Second, 9 * time.Second, 9 * time.Second, time.Second, 9 * time.Second},
	}
	synctest.Test(t, func(t *testing.T) {
		var cancelled [7]atomic.Int64
		begun := time.Now()
		list := Search(context.Background(), 7, 1, 7, func(ctx context.Context, start int) Result {
			r := p.run(ctx, start)
			if r.Status == Interrupted {
				cancelled[start].Store(int64(time.Since(begun) / time.Second))
			}
			return r
		}, nil)
		if len(list) != 3 || Best(list).Start != 2 {
			t.Errorf("%+v", list)
		}
		for start, want := range []int64{0, 0, 0, 2, 2, 0, 1} {
			if got := cancelled[start].Load(); got != want {
				t.Errorf("start %d was cancelled after %d s, want %d", start, got, want)
			}
		}
		if took := time.Since(begun); took != 3*time.Second {
			t.Errorf("took %v, want 3 s: starts 0 and 1 must be heard", took)
		}
	})
}

func TestSearchInterrupted(t *testing.T) {
	p := plan{status: make([]Status, 20), took: make([]time.Duration, 20)}
	for i := range 20 {
		p.status[i], p.took[i] = Stalled, time.Duration(1+i%3)*time.Second
	}
	p.status[1] = Converged
	synctest.Test(t, func(t *testing.T) {
		ctx, cancel := context.WithTimeout(context.Background(), 4500*time.Millisecond)
		defer cancel()
		begun := time.Now()
		list := Search(ctx, 20, 3, 2, p.run, nil)
		if took := time.Since(begun); took != 4500*time.Millisecond {
			t.Errorf("took %v to stop", took)
		}
		// worker A: 0 (1 s), 2 (3 s), 4 cut short at 4.5 s; B: 1 (2 s), 3 (1 s), 5 cut short
		want := "[0 stalled at a miss] [1 converged] [2 stalled at a miss] [3 stalled at a miss] [4 interrupted] [5 interrupted] "
		got := ""
		for _, r := range list {
			got += fmt.Sprintf("[%d %v] ", r.Start, r.Status)
		}
		if got != want {
			t.Errorf("got  %s\nwant %s", got, want)
		}
		if b := Best(list); b.Start != 1 {
			t.Errorf("best is %+v", b)
		}
	})
	// cancelled before the first start: nothing
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if list := Search(ctx, 20, 3, 2, p.run, nil); len(list) != 0 {
		t.Errorf("%d results of a search that never began", len(list))
	}
}

func TestSearchOfSolves(t *testing.T) {
	// The real thing, on real time: Rosenbrock from numbered random starts, with a
	// budget that some miss, on 1 to 8 workers.
	s := in(2).disc(2, []float64{1, 0}, []float64{0, 1})
	solve := func(ctx context.Context, start int) Result {
		rng := rand.New(rand.NewPCG(9, uint64(start)))
		c0 := []float64{rng.Float64() - 1.3, rng.Float64()}
		return GaussNewton(ctx, rosenbrock(), s.Set, c0, Options{Iterations: 18 + 3*(start%5)})
	}
	want := ""
	for workers := 1; workers <= 8; workers++ {
		list := Search(context.Background(), 40, 3, workers, solve, nil)
		got := fmt.Sprint(list)
		if workers == 1 {
			want = got
			if n := len(list); n < 4 || n > 39 {
				t.Errorf("%d starts for 3 successes: too one-sided to test anything", n)
			}
		} else if got != want {
			t.Errorf("%d workers:\n%s\nwant\n%s", workers, got, want)
		}
	}
}

func TestBest(t *testing.T) {
	of := func(start int, miss float64, status Status) Numbered {
		return Numbered{start, Result{Miss: miss, Status: status}}
	}
	for _, c := range []struct {
		list []Numbered
		want int
	}{
		{[]Numbered{of(0, 3, Stalled), of(1, 2, Exhausted), of(2, 2, Stalled)}, 1},
		{[]Numbered{of(0, 3, Stalled), of(1, 1e-14, Converged), of(2, 1e-20, Converged)}, 1},
		{[]Numbered{of(0, math.Inf(1), Stalled), of(1, 5, Stalled)}, 1},
		{[]Numbered{of(4, 1e-30, Stalled), of(7, 1e-14, Converged)}, 7},
		{[]Numbered{of(4, 2, Interrupted)}, 4},
	} {
		if got := Best(c.list); got.Start != c.want {
			t.Errorf("best of %+v is %d, want %d", c.list, got.Start, c.want)
		}
	}
}
