package solve

import (
	"context"
	"sync"
)

// Search runs the starts 0 .. n-1 on some workers and returns the results in
// the order of their numbers. It ends as soon as the want lowest-numbered
// successes (Status Converged) are certain: a start is cancelled only when that
// many lower ones have succeeded, so the answer does not depend on the number
// of workers or on their speed. Results of starts that were not needed are left
// out; when fewer than want succeed, all n are there. When ctx is cancelled,
// what had been reached is returned.
//
// report, unless nil, is called from one goroutine at a time after every start.
func Search(ctx context.Context, n, want, workers int, run func(ctx context.Context, start int) Result, report func(done, successes int, best float64)) []Numbered {
	type slot struct {
		res    Result
		done   bool
		cancel context.CancelFunc
	}
	var (
		mu        sync.Mutex
		slots     = make([]slot, n)
		next      int
		limit     = n // starts at or above it are not needed
		done, won int
		best      = -1.0
		wg        sync.WaitGroup
	)
	for range max(1, min(workers, n)) {
		wg.Go(func() {
			for {
				mu.Lock()
				if next >= limit || ctx.Err() != nil {
					mu.Unlock()
					return
				}
				i := next
				next++
				c, cancel := context.WithCancel(ctx)
				slots[i].cancel = cancel
				mu.Unlock()

				res := run(c, i)
				cancel()

				mu.Lock()
				slots[i].res, slots[i].done = res, true
				done++
				if best < 0 || res.Miss < best {
					best = res.Miss
				}
				if res.Status == Converged {
					won++
					// the want-th success, counted from below, bounds what is needed
					count := 0
					for k := range slots {
						if slots[k].done && slots[k].res.Status == Converged {
							if count++; count == want {
								limit = min(limit, k+1)
								break
							}
						}
					}
					for k := limit; k < n; k++ {
						if slots[k].cancel != nil {
							slots[k].cancel()
						}
					}
				}
				if report != nil {
					report(done, won, best)
				}
				mu.Unlock()
			}
		})
	}
	wg.Wait()
	var out []Numbered
	for i := range slots[:limit] {
		if slots[i].done {
			out = append(out, Numbered{Start: i, Result: slots[i].res})
		}
	}
	return out
}

// Numbered is the result of one start of a search.
type Numbered struct {
	Start int
	Result
}

// Best returns the success with the lowest number, or else the result with the
// smallest miss (the lower number on a tie). The list must not be empty.
func Best(list []Numbered) Numbered {
	best := list[0]
	for _, r := range list {
		if r.Status == Converged {
			return r
		}
		if r.Miss < best.Miss {
			best = r
		}
	}
	return best
}
