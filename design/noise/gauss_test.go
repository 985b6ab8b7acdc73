package noise

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"
)

func TestPanelIsGaussLegendre(t *testing.T) {
	for _, m := range []int{1, 2, 7, 20, 32} {
		p := newPanel(2, 5, false, m)
		for k := range 64 {
			newCells(1).even(2+3*float64(k)/64, 2+3*float64(k+1)/64, p.add)
		}
		x, weight := make([]float64, m), make([]float64, m)
		quad.Legendre{}.FixedLocations(x, weight, 2, 5)
		slices.Reverse(x) // it gives them descending
		slices.Reverse(weight)
		k := 0
		p.nodes(func(w, v float64) {
			near(t, fmt.Sprintf("node %d of %d", k, m), w, x[k], 1e-12)
			near(t, fmt.Sprintf("weight %d of %d", k, m), v, weight[k], 1e-11)
			k++
		})
		if k != m {
			t.Errorf("%d nodes of %d", k, m)
		}
	}
}

// The quadrature of m nodes is exact to degree 2m - 1 for whatever measure, in w or in w^2, and not beyond.
func TestPanelIsExact(t *testing.T) {
	random := rand.New(rand.NewPCG(3, 4))
	const lo, hi, m = 0.3, 4.0, 6
	for _, squared := range []bool{false, true} {
		p := newPanel(lo, hi, squared, m)
		variable := func(w float64) float64 {
			if squared {
				return 2*(w*w-lo*lo)/(hi*hi-lo*lo) - 1
			}
			return 2*(w-lo)/(hi-lo) - 1
		}
		moments := make([]float64, 2*m+1)
		take := func(w, weight float64, into []float64) {
			for j := range into {
				into[j] += weight * math.Cos(float64(j)*math.Acos(max(-1, min(1, variable(w))))) // Chebyshev polynomials
			}
		}
		for range 500 {
			w, weight := lo+(hi-lo)*random.Float64(), math.Exp(12*random.Float64())
			p.add(w, weight)
			take(w, weight, moments)
		}
		got := make([]float64, 2*m+1)
		p.nodes(func(w, weight float64) { take(w, weight, got) })
		for j, want := range moments {
			if off := math.Abs(got[j]-want) / moments[0]; !(off <= 1e-13) == (j < 2*m) {
				t.Errorf("squared %t: the moment of degree %d is off by %g", squared, j, off)
			}
		}
	}
}

// A measure of fewer points than nodes comes back as it is.
func TestPanelOfFewPoints(t *testing.T) {
	p := newPanel(1, 2, false, 5)
	want := [][2]float64{{1.1, 1e-12}, {1.5, 3}, {1.9, 1e3}}
	p.add(1.3, 0)
	for _, k := range []int{1, 2, 0} {
		p.add(want[k][0], want[k][1])
	}
	if p.count != 3 {
		t.Errorf("%d points", p.count)
	}
	var got [][2]float64
	p.nodes(func(w, weight float64) { got = append(got, [2]float64{w, weight}) })
	if len(got) != len(want) {
		t.Fatal(got)
	}
	for k := range want {
		near(t, "node", got[k][0], want[k][0], 1e-12)
		near(t, "weight", got[k][1], want[k][1], 1e-6)
	}
	newPanel(1, 2, true, 5).nodes(func(w, weight float64) { t.Error("a node of no measure") })
}
