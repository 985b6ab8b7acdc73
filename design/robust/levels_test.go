package robust

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"holdfast/design/dynamics"
)

// ladder gives the operators of an anharmonic ladder: the quadratures (a+a')/2 and
// i(a'-a)/2, and -n, which is Z/2 on two levels without its trace.
func ladder(d int) (i, q, detuning []complex128) {
	i, q, detuning = make([]complex128, d*d), make([]complex128, d*d), make([]complex128, d*d)
	for n := range d {
		detuning[n*d+n] = complex(-float64(n), 0)
		if n+1 < d {
			r := complex(math.Sqrt(float64(n+1))/2, 0)
			i[n*d+n+1], i[(n+1)*d+n] = r, r
			q[n*d+n+1], q[(n+1)*d+n] = -1i*r, 1i*r
		}
	}
	return i, q, detuning
}

func scaledMatrix(a []complex128, f float64) []complex128 {
	b := make([]complex128, len(a))
	for i, v := range a {
		b[i] = complex(f, 0) * v
	}
	return b
}

// levelsOn is a ladder of d levels on the second of the time axes, with every kind
// of error that levels know.
func levelsOn(d int, a axisKind, held []Class) Levels {
	i, q, n := ladder(d)
	static := make([]complex128, d*d)
	for k := range d {
		static[k*d+k] = complex(-0.7*float64(k*(k-1))/2+0.05*float64(k), 0)
	}
	for k := range held {
		if held[k].Kind == Static {
			held[k].Operators = [][]complex128{n}
		}
	}
	t := matrixOf(target)
	return Levels{
		Grid: a.grid, Dim: d, Code: []int{0, 1}, Static: static, Axes: [][]complex128{scaledMatrix(i, 0.25), scaledMatrix(q, 0.24)},
		Target: []complex128{t[0][0], t[0][1], t[1][0], t[1][1]}, Held: held,
	}
}

func levelHelds() [][]Class {
	mixed := Class{Kind: Mixed, Mix: [][]float64{{0, -1}, {0, 0}}, Weight: 0.7, Size: 0.02}
	return [][]Class{
		nil, {{Kind: Static, Vector: dynamics.Vec{0, 0, 1}, Weight: 0.6, Size: 0.02}},
		{amplitude, mixed}, {{Kind: Line, Weight: 1, Size: 0.05}, {Kind: Static, Vector: dynamics.Vec{0, 0, 1}, Weight: 1, Size: 0.02}, amplitude},
	}
}

func TestLevelsJacobian(t *testing.T) {
	rng := rand.New(rand.NewPCG(11, 1))
	const n = 3
	for _, d := range []int{2, 3, 4} {
		for which, held := range levelHelds() {
			a := axes()[2]
			nodes := 2 * len(a.grid.Steps)
			fill := func() []float64 {
				v := make([]float64, n*nodes)
				for i := range v {
					v[i] = 0.5 * rng.NormFloat64()
				}
				return v
			}
			r := Response{Dim: 2 * n, Blocks: []Block{{N: n, Quadrature: true, Re: fill(), Im: fill()}}, Slopes: make([][]Block, len(held))}
			for i, c := range held {
				if c.Kind == Line {
					r.Slopes[i] = []Block{{N: n, Quadrature: true, Re: fill(), Im: fill()}}
				}
			}
			g, err := NewLevelsGate(levelsOn(d, a, held), r, 0.5)
			if err != nil {
				t.Fatal(err)
			}
			dim, rows := g.Dim(), g.Rows()
			c, res, jac := make([]float64, dim), make([]float64, rows), make([]float64, rows*dim)
			for i := range c {
				c[i] = 0.5 * rng.NormFloat64()
			}
			g.Residuals(c, res)
			g.Jacobian(jac)
			at := func(k int, e float64) []float64 {
				x := append([]float64(nil), c...)
				x[k] += e
				r := make([]float64, rows)
				g.Residuals(x, r)
				return r
			}
			worst := 0.0
			for k := range c {
				const e = 1e-3
				p, m, pp, mm := at(k, e), at(k, -e), at(k, 2*e), at(k, -2*e)
				for row := range rows {
					worst = math.Max(worst, math.Abs(jac[row*dim+k]-(8*(p[row]-m[row])-(pp[row]-mm[row]))/(12*e)))
				}
			}
			if !(worst <= 1e-8) {
				t.Errorf("%d levels, held %d: derivative off by %.3g", d, which, worst)
			}
		}
	}
}

// TestLevelsOfTwo: two levels are a spin. The ladder's -n has the trace of half a
// turn's phase, which no figure sees.
func TestLevelsOfTwo(t *testing.T) {
	rng := rand.New(rand.NewPCG(11, 2))
	for _, a := range []axisKind{axes()[0], axes()[2]} {
		held := []Class{{Kind: Static, Vector: dynamics.Vec{0, 0, 1}, Weight: 1, Size: 0.02}, amplitude, {Kind: Mixed, Mix: [][]float64{{0, -1}, {0, 0}}, Weight: 1, Size: 0.02}}
		s := levelsOn(2, a, held)
		g, err := NewLevelsGate(s, Response{}, 0)
		if err != nil {
			t.Fatal(err)
		}
		spin := Spin{Grid: a.grid, Static: dynamics.Vec{0, 0, -0.05}, Axes: []dynamics.Vec{{0.25, 0, 0}, {0, 0.24, 0}}, Target: target, Held: held}
		h := NewGate(spin, Response{}, 0)
		u := make([]float64, 4*len(a.grid.Steps))
		for i := range u {
			u[i] = rng.NormFloat64()
		}
		x, y := g.Figures(u, make([][]float64, 3)), h.Figures(u, make([][]float64, 3))
		if !(math.Abs(x.Infidelity-y.Infidelity) <= 1e-12) || x.Leakage != 0 {
			t.Errorf("%s: infidelity %v, leakage %v; a spin has %v", a.name, x.Infidelity, x.Leakage, y.Infidelity)
		}
		for i := range held {
			if !(math.Abs(x.Susceptibility[i]-y.Susceptibility[i]) <= 1e-11) {
				t.Errorf("%s: susceptibility %d is %v; a spin has %v", a.name, i, x.Susceptibility[i], y.Susceptibility[i])
			}
			if p, q := g.MeanInfidelity(u, make([][]float64, 3), i), h.MeanInfidelity(u, make([][]float64, 3), i); !(math.Abs(p-q) <= 1e-12) {
				t.Errorf("%s: mean infidelity %d is %v; a spin has %v", a.name, i, p, q)
			}
		}
	}
}

// TestLevelsLosses compares with the formulas of Pedersen, Moeller, Moelmer 2007,
// Phys. Lett. A 367, 47, and the identity between average and process
// infidelity.
func TestLevelsLosses(t *testing.T) {
	rng := rand.New(rand.NewPCG(11, 3))
	a := axes()[0]
	s := levelsOn(4, a, nil)
	g, err := NewLevelsGate(s, Response{}, 0)
	if err != nil {
		t.Fatal(err)
	}
	for range 20 {
		u := make([]float64, 4*len(a.grid.Steps))
		for i := range u {
			u[i] = rng.NormFloat64()
		}
		f := g.Figures(u, nil)
		m := g.nominal.Gate
		trace, inside := complex128(0), 0.0
		for i := range 2 {
			for j := range 2 {
				trace += cmplx.Conj(s.Target[i*2+j]) * m[i*4+j]
				inside += real(m[i*4+j])*real(m[i*4+j]) + imag(m[i*4+j])*imag(m[i*4+j])
			}
		}
		tr := cmplx.Abs(trace)
		if want := 1 - (inside+tr*tr)/6; !(math.Abs(f.Infidelity-want) <= 1e-12) {
			t.Errorf("infidelity %v, want %v", f.Infidelity, want)
		}
		if want := 1 - inside/2; !(math.Abs(f.Leakage-want) <= 1e-12) {
			t.Errorf("leakage %v, want %v", f.Leakage, want)
		}
	}
}

func TestLevelsRefuse(t *testing.T) {
	if _, err := NewLevelsGate(levelsOn(3, axes()[0], []Class{{Kind: Any, Weight: 1}}), Response{}, 0); err == nil {
		t.Error("any error on three levels was taken")
	}
}
