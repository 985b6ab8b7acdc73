//go:build measure

package replay

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
)

// TestMeasureChain judges the pulses that package design's measure has left below $CHAIN under 500 random errors of each
// class: combinations of length 1 of the half products of one body, or of two.
func TestMeasureChain(t *testing.T) {
	for _, name := range []string{"move-one", "move-two", "entangle-one", "entangle-two"} {
		f, err := Open(filepath.Join(os.Getenv("CHAIN"), name))
		if err != nil {
			t.Fatal(err)
		}
		e, err := newEngine(context.Background(), f.Model)
		if err != nil {
			t.Fatal(err)
		}
		ops, names := basis(e.dim)
		for bodies := 1; bodies <= 2; bodies++ {
			var class [][]complex128
			for i, n := range names {
				if len(n)-strings.Count(n, "1") == bodies {
					class = append(class, ops[i])
				}
			}
			line := fmt.Sprintf("%s, 500 random errors of %d of %d operators:", name, bodies, len(class))
			for _, mhz := range []float64{0, 0.1, 0.2, 0.5, 1} {
				rng := rand.New(rand.NewPCG(4, 4))
				gates := make([]gate, 500)
				for i := range gates {
					op, norm := make([]complex128, e.dim*e.dim), 0.0
					v := make([]float64, len(class))
					for k := range v {
						v[k] = rng.NormFloat64()
						norm += v[k] * v[k]
					}
					for k, o := range class {
						for j, x := range o {
							op[j] += complex(v[k]/math.Sqrt(norm), 0) * x
						}
					}
					gates[i] = gate{newStatic(op, e.dim), mhz * perMHz}
				}
				if mhz == 0 {
					gates = gates[:1]
				}
				found := make([]float64, len(gates))
				if err := e.infidelities(context.Background(), gates, found); err != nil {
					t.Fatal(err)
				}
				mean := 0.0
				for _, x := range found {
					mean += x / float64(len(found))
				}
				line += fmt.Sprintf("  %g MHz %.2g (worst %.2g)", mhz, mean, slices.Max(found))
			}
			fmt.Println(line)
		}
	}
}
