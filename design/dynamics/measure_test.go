//go:build measure

package dynamics

import (
	"fmt"
	"math"
	"math/rand/v2"
	"runtime"
	"testing"
	"time"
)

// TestMeasureCost times value and gradient of spins in a chain, held against every one-body
// error, by the number of spins and of steps, and what memory that takes.
func TestMeasureCost(t *testing.T) {
	type point struct{ d, steps, ms float64 }
	var list []point
	for n := 1; n <= 6; n++ {
		for _, steps := range []int{100, 400} {
			d := 1 << n
			runtime.GC()
			var before, after runtime.MemStats
			runtime.ReadMemStats(&before)
			l, u := oneBodyChain(n, steps)
			if err := l.Reset(); err != nil {
				t.Fatal(err)
			}
			c := &LevelsCotangent{Gate: l.Gate, Toggle: l.Toggle}
			grad := make([]float64, len(u))
			l.Run(u, nil)
			l.Pull(u, c, grad, nil)
			runtime.ReadMemStats(&after)
			best := math.Inf(1)
			for range 3 {
				begun := time.Now()
				l.Run(u, nil)
				l.Pull(u, c, grad, nil)
				best = math.Min(best, time.Since(begun).Seconds()*1e3)
			}
			fmt.Printf("%d spins, %d levels, %d steps, %d errors: %.3g ms, %.1f MB\n", n, d, steps, len(l.Held), best, float64(after.TotalAlloc-before.TotalAlloc)/1e6)
			list = append(list, point{float64(d), float64(steps), best})
		}
	}
	for i := 2; i+2 < len(list); i += 2 {
		fmt.Printf("from %g to %g levels: exponent %.2f; steps: exponent %.2f\n", list[i].d, list[i+2].d,
			math.Log(list[i+3].ms/list[i+1].ms)/math.Log(2), math.Log(list[i+1].ms/list[i].ms)/math.Log(4))
	}
}

// oneBodyChain is n spins with exchange between neighbours, two quadratures each, held against X, Y and Z of each.
func oneBodyChain(n, steps int) (*Levels, []float64) {
	d := 1 << n
	pauli := [3][4]complex128{{0, 1, 1, 0}, {0, -1i, 1i, 0}, {1, 0, 0, -1}}
	on := func(site, axis int, f complex128) []complex128 {
		m := make([]complex128, d*d)
		bit := n - 1 - site
		for i := range d {
			for b := range 2 {
				j := i&^(1<<bit) | b<<bit
				m[i*d+j] = f * pauli[axis][2*(i>>bit&1)+b]
			}
		}
		return m
	}
	mul := func(a, b []complex128) []complex128 {
		m := make([]complex128, d*d)
		for i := range d {
			for k := range d {
				if f := a[i*d+k]; f != 0 {
					for j := range d {
						m[i*d+j] += f * b[k*d+j]
					}
				}
			}
		}
		return m
	}
	l := &Levels{Dim: d, Static: make([]complex128, d*d), Last: steps, Within: 1e-9}
	for s := range n {
		for axis := range 3 {
			l.Held = append(l.Held, on(s, axis, 0.5))
			if axis < 2 {
				l.Axes = append(l.Axes, on(s, axis, 0.125))
			}
			if axis < 2 && s > 0 {
				addReal(l.Static, mul(on(s-1, axis, 1), on(s, axis, 1)), 2*math.Pi*5e-3/2)
			}
		}
	}
	for range steps {
		l.Steps = append(l.Steps, 0.5)
	}
	u := make([]float64, len(l.Axes)*2*steps)
	rng := rand.New(rand.NewPCG(1, 2))
	for i := range u {
		u[i] = rng.NormFloat64() / 2
	}
	return l, u
}
