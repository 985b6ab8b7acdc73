package robust

import (
	"math"
	"math/rand/v2"
	"testing"

	"holdfast/design/dynamics"
)

// wide is a problem with everything at once: a pair of quadratures that mix, a
// baseband control, drive-induced shifts, errors of every kind.
func wide(rng *rand.Rand, held []Class, before, after, shifts bool) (Spin, Response) {
	a := axes()[2]
	s := Spin{
		Grid: a.grid, Static: a.static, Target: target, Held: held, FreeBefore: before, FreeAfter: after,
		Axes: []dynamics.Vec{{0.25, 0.01, 0}, {-0.02, 0.24, 0.01}, {0, 0.01, 0.2}},
	}
	if shifts {
		s.Shifts = []dynamics.Vec{{0, 0, 0.03}, {0, 0, 0.03}, {0.01, 0, 0}}
	}
	const n = 3
	nodes := 2 * len(a.grid.Steps)
	fill := func(n int) []float64 {
		v := make([]float64, n*nodes)
		for i := range v {
			v[i] = rng.NormFloat64()
		}
		return v
	}
	blocks := func() []Block {
		return []Block{{First: 0, N: n, Quadrature: true, Re: fill(n), Im: fill(n)}, {First: 2 * n, N: 2, Control: 2, Re: fill(2)}}
	}
	r := Response{Dim: 2*n + 2, Blocks: blocks(), Slopes: make([][]Block, len(held))}
	for i, c := range held {
		if c.Kind == Line {
			r.Slopes[i] = blocks()[i%2 : i%2+1] // of one channel
		}
	}
	return s, r
}

var (
	skew   = Class{Kind: Mixed, Mix: [][]float64{{0, -1, 0}, {0, 0, 0}, {0, 0, 0}}, Weight: 0.7, Size: 0.02}
	onlyI  = Class{Kind: Mixed, Mix: [][]float64{{1, 0, 0}, {0, 0, 0}, {0, 0, 0}}, Weight: 1, Size: 0.03}
	corner = Class{Kind: Line, Weight: 1, Size: 0.05}
)

var wideHelds = [][]Class{
	nil, {skew}, {corner}, {corner, detuning, corner}, {anyStatic, amplitude, skew, onlyI, corner},
	{second(detuning), second(skew), second(amplitude)}, {second(anyStatic), second(corner)},
}

func second(c Class) Class {
	c.Order = 2
	return c
}

// TestWideJacobian compares derivatives with central differences of fourth order, with
// free angles those of the residuals at angles that follow, and with maps of the controls.
func TestWideJacobian(t *testing.T) {
	rng := rand.New(rand.NewPCG(9, 1))
	worst := 0.0
	for which, maps := range [][]Map{nil, {nil, nil, cubic}, {cubic, wave3, folded}} {
		for i, held := range wideHelds {
			for _, free := range [][2]bool{{false, false}, {true, false}, {false, true}, {true, true}} {
				for _, shifts := range []bool{false, true} {
					s, resp := wide(rng, held, free[0], free[1], shifts)
					s.Maps = maps
					g := NewGate(s, resp, 0.5)
					dim, rows := g.Dim(), g.Rows()
					c, r, jac := make([]float64, dim), make([]float64, rows), make([]float64, rows*dim)
					for k := range c {
						c[k] = 0.4 * rng.NormFloat64()
					}
					g.Residuals(c, r)
					g.Jacobian(jac)
					at := func(k int, e float64) []float64 {
						x := append([]float64(nil), c...)
						x[k] += e
						r := make([]float64, rows)
						g.Residuals(x, r)
						return r
					}
					for k := range c {
						const e = 1e-3
						p, m, pp, mm := at(k, e), at(k, -e), at(k, 2*e), at(k, -2*e)
						slope := func(a, b, c, d float64) float64 { return (8*(a-b) - (c - d)) / (12 * e) }
						for row := range rows {
							d := math.Abs(jac[row*dim+k] - slope(p[row], m[row], pp[row], mm[row]))
							worst = math.Max(worst, d)
						}
						grad := 0.0
						for row := range rows {
							grad += 2 * jac[row*dim+k] * r[row]
						}
						d := math.Abs(grad - slope(squares(p), squares(m), squares(pp), squares(mm)))
						worst = math.Max(worst, d)
					}
					if !(worst <= 5e-8) { // second differences grow the rounding of these a hundredfold
						t.Fatalf("maps %d, held %d, free %v, shifts %v: derivative off by %.3g", which, i, free, shifts, worst)
					}
				}
			}
		}
		t.Logf("maps %d: largest difference %.2g", which, worst)
	}
}

func squares(r []float64) float64 {
	s := 0.0
	for _, v := range r {
		s += v * v
	}
	return s
}

// TestFreeAngles finds the best angles by brute force.
func TestFreeAngles(t *testing.T) {
	rng := rand.New(rand.NewPCG(9, 2))
	for range 30 {
		s, _ := wide(rng, nil, false, false, false)
		u := make([]float64, 3*2*len(s.Grid.Steps))
		for i := range u {
			u[i] = rng.NormFloat64()
		}
		for _, free := range [][2]bool{{true, false}, {false, true}, {true, true}} {
			s.FreeBefore, s.FreeAfter = free[0], free[1]
			f := NewGate(s, Response{}, 0).Figures(u, nil)
			x := NewGate(s, Response{}, 0).Unitary(u)
			loss := func(before, after float64) float64 {
				y := dynamics.Turn(dynamics.Vec{0, 0, after}).Mul(x).Mul(dynamics.Turn(dynamics.Vec{0, 0, before}))
				e := y.Mul(s.Target.Conj())
				return 2. / 3 * (e[1]*e[1] + e[2]*e[2] + e[3]*e[3])
			}
			if got := loss(f.Before, f.After); !(math.Abs(got-f.Infidelity) <= 1e-13) {
				t.Errorf("free %v: infidelity %v, at the angles that go with it %v", free, f.Infidelity, got)
			}
			if got := NewGate(s, Response{}, 0).InfidelityAt(u, f.Before, f.After); !(math.Abs(got-f.Infidelity) <= 1e-13) {
				t.Errorf("free %v: infidelity %v, at the best angles %v", free, f.Infidelity, got)
			}
			least := 1.0
			const steps = 60
			for i := range steps {
				for k := range steps {
					b, a := 0.0, 0.0
					if free[0] {
						b = 2 * math.Pi * float64(i) / steps
					}
					if free[1] {
						a = 2 * math.Pi * float64(k) / steps
					}
					least = math.Min(least, loss(b, a))
				}
			}
			if !(f.Infidelity <= least && least-f.Infidelity <= 0.01) {
				t.Errorf("free %v: infidelity %v, least of many angles %v", free, f.Infidelity, least)
			}
		}
	}
}

// TestWideFigures checks susceptibilities and finite errors of errors that ride on
// the controls by their meaning: what happens to the gate when the controls move by a little.
func TestWideFigures(t *testing.T) {
	rng := rand.New(rand.NewPCG(9, 3))
	for _, shifts := range []bool{false, true} {
		s, _ := wide(rng, []Class{skew, corner, amplitude}, false, false, shifts)
		s.Static = dynamics.Vec{}
		s.Grid = axes()[0].grid // no steps outside the window
		n := 2 * len(s.Grid.Steps)
		u, v := make([]float64, 3*n), make([]float64, 3*n)
		for i := range u {
			u[i], v[i] = rng.NormFloat64(), rng.NormFloat64()
		}
		g := NewGate(s, Response{}, 0)
		f := g.Figures(u, [][]float64{nil, v, nil})
		x := g.Unitary(u)
		for i, moved := range [][]float64{nil, v, u} {
			if i == 0 {
				moved = make([]float64, 3*n)
				for k := range n {
					moved[k] = -u[n+k]
				}
			}
			// rotation vector of U(0)' U(λ) per λ is ∫ Rᵀ F dt
			const l = 1e-4
			at := func(l float64) dynamics.Vec {
				w := make([]float64, len(u))
				for k := range w {
					w[k] = u[k] + l*moved[k]
				}
				d := x.Conj().Mul(g.Unitary(w))
				return dynamics.Vec{2 * d[1], 2 * d[2], 2 * d[3]}
			}
			p, m := at(l), at(-l)
			turn := norm(dynamics.Vec{(p[0] - m[0]) / (2 * l), (p[1] - m[1]) / (2 * l), (p[2] - m[2]) / (2 * l)})
			power := 0.0
			for j, h := range s.Grid.Steps {
				for node := 2 * j; node < 2*j+2; node++ {
					var field dynamics.Vec
					for k, e := range s.Axes {
						for c := range 3 {
							field[c] += moved[k*n+node] * e[c]
							if shifts {
								field[c] += 2 * u[k*n+node] * moved[k*n+node] * s.Shifts[k][c]
							}
						}
					}
					power += h / 2 * (field[0]*field[0] + field[1]*field[1] + field[2]*field[2])
				}
			}
			want := turn / math.Sqrt(power*s.Grid.Window())
			// a step's own order: the controls here are rough
			if !(math.Abs(f.Susceptibility[i]-want) <= 0.03*(1+want)) {
				t.Errorf("shifts %v, class %d: susceptibility %v, want about %v", shifts, i, f.Susceptibility[i], want)
			}
			sum := 0.0
			for _, sign := range []float64{1, -1} {
				w := make([]float64, len(u))
				for k := range w {
					w[k] = u[k] + sign*s.Held[i].Size*moved[k]
				}
				sum += g.InfidelityAt(w, 0, 0) / 2
			}
			if got := g.MeanInfidelity(u, [][]float64{nil, v, nil}, i); !(math.Abs(got-sum) <= 1e-13) {
				t.Errorf("shifts %v, class %d: mean infidelity %v, want %v", shifts, i, got, sum)
			}
		}
	}
}

// TestSecondOrderRows: the residuals of second order are half the second derivative of the gate's residuals by the angle that the error turns.
func TestSecondOrderRows(t *testing.T) {
	rng := rand.New(rand.NewPCG(9, 12))
	s, resp := wide(rng, []Class{second(detuning)}, false, false, false)
	g := NewGate(s, resp, 0)
	c, r := make([]float64, g.Dim()), make([]float64, g.Rows())
	for k := range c {
		c[k] = 0.4 * rng.NormFloat64()
	}
	g.Residuals(c, r)
	at := func(x float64) dynamics.Vec {
		g.finite.Run(g.u, dynamics.Vec{0, 0, x / g.span})
		return g.see(g.finite.Gate, 0, 0).miss
	}
	const h = 0.01
	p, m, o := at(h), at(-h), at(0)
	for k := range 3 {
		if got, want := r[len(r)-3+k], (p[k]+m[k]-2*o[k])/(2*h*h); !(math.Abs(got-want) <= 1e-5) {
			t.Errorf("row %d: %v, want %v", k, got, want)
		}
	}
}
