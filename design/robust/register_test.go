package robust

import (
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"holdfast/design/dynamics"
)

// kron is the product of two operators, the first site slowest.
func kron(a, b []complex128) []complex128 {
	n, m := side(a), side(b)
	c := make([]complex128, n*n*m*m)
	for i := range n * m {
		for j := range n * m {
			c[i*n*m+j] = a[i/m*n+j/m] * b[i%m*m+j%m]
		}
	}
	return c
}

func side(a []complex128) int { return int(math.Round(math.Sqrt(float64(len(a))))) }

var (
	one2   = []complex128{1, 0, 0, 1}
	pauliX = []complex128{0, 1, 1, 0}
	pauliY = []complex128{0, -1i, 1i, 0}
	pauliZ = []complex128{1, 0, 0, -1}
)

func sum(list ...[]complex128) []complex128 {
	c := make([]complex128, len(list[0]))
	for _, a := range list {
		for i, v := range a {
			c[i] += v
		}
	}
	return c
}

func randomUnitary(rng *rand.Rand, n int) []complex128 {
	m := make([]complex128, n*n)
	for i := range m {
		m[i] = complex(rng.NormFloat64(), rng.NormFloat64())
	}
	for i := range n { // rows, orthonormal
		for k := range i {
			dot := complex128(0)
			for j := range n {
				dot += cmplx.Conj(m[k*n+j]) * m[i*n+j]
			}
			for j := range n {
				m[i*n+j] -= dot * m[k*n+j]
			}
		}
		s := 0.0
		for j := range n {
			s += real(m[i*n+j])*real(m[i*n+j]) + imag(m[i*n+j])*imag(m[i*n+j])
		}
		for j := range n {
			m[i*n+j] /= complex(math.Sqrt(s), 0)
		}
	}
	return m
}

// registers lists problems of two spins, of a spin and a ladder, and of states, with
// couplings that stand still and that rotate.
func registers(a axisKind) map[string]Levels {
	rng := rand.New(rand.NewPCG(5, 5))
	grid := a.grid
	for j, at := 0, -grid.Lead; j < len(grid.Steps); j++ {
		for _, g := range dynamics.GaussNodes {
			grid.Times = append(grid.Times, at+g*grid.Steps[j])
		}
		at += grid.Steps[j]
	}
	exchange := scaledMatrix(sum(kron(pauliX, pauliX), kron(pauliY, pauliY)), 0.04)
	rotating := []Rotating{{Frequency: 0.31, Cosine: scaledMatrix(kron(pauliX, pauliX), 0.03), Sine: scaledMatrix(kron(pauliY, pauliX), 0.02)}}
	pair := Levels{
		Grid: grid, Dim: 4, Code: []int{0, 1, 2, 3}, Static: sum(exchange, scaledMatrix(kron(pauliZ, one2), 0.02)),
		Axes:   [][]complex128{scaledMatrix(kron(pauliX, one2), 0.12), scaledMatrix(kron(pauliY, one2), 0.12), scaledMatrix(kron(one2, pauliX), 0.1)},
		Target: randomUnitary(rng, 4),
	}
	statics := func(ops ...[]complex128) Class {
		c := Class{Name: "some", Kind: Any, Weight: 0.8, Size: 0.02, Operators: ops}
		for i := range ops {
			c.Factors = append(c.Factors, 0.5+0.3*float64(i))
		}
		return c
	}
	list := map[string]Levels{}
	any := statics(kron(pauliX, one2), kron(pauliZ, pauliX), kron(one2, pauliY))
	p := pair
	p.Held = []Class{second(any), {Name: "amplitude", Kind: Amplitude, Order: 2, Weight: 0.6, Size: 0.03}}
	list["two spins"] = p
	p.FreeBefore, p.FreeAfter = true, true
	p.Rotating = rotating
	list["free Z, a rotating coupling"] = p
	p.FreeBefore, p.FreeAfter, p.Local = false, false, true
	p.Held = []Class{any, {Name: "line", Kind: Line, Weight: 1, Size: 0.05}, {Name: "one", Kind: Static, Weight: 1, Size: 0.01, Operators: [][]complex128{kron(pauliZ, pauliZ)}}}
	list["local rotations"] = p
	p.Local, p.Target = false, nil
	u, v := randomUnitary(rng, 4), randomUnitary(rng, 4)
	p.From, p.To = [][]complex128{u[:4]}, [][]complex128{v[:4]}
	p.Rotating = nil
	list["states"] = p
	p.From, p.To = [][]complex128{u[:4], u[4:8]}, [][]complex128{v[:4], v[4:8]}
	list["subspaces"] = p

	i3, q3, n3 := ladder(3)
	one3 := []complex128{1, 0, 0, 0, 1, 0, 0, 0, 1}
	static := make([]complex128, 36)
	for k := range 6 {
		if k%3 == 2 {
			static[k*6+k] = -1.1
		}
	}
	mixed := Levels{
		Grid: grid, Dim: 6, Code: []int{1, 0, 3, 4}, Static: sum(static, scaledMatrix(kron(pauliX, i3), 0.05)),
		Axes:     [][]complex128{scaledMatrix(kron(pauliX, one3), 0.12), scaledMatrix(kron(one2, i3), 0.2), scaledMatrix(kron(one2, q3), 0.2)},
		Shifts:   [][]complex128{make([]complex128, 36), scaledMatrix(kron(pauliZ, one3), 0.02), scaledMatrix(kron(one2, n3), 0.02)},
		Rotating: []Rotating{{Frequency: 0.2, Cosine: scaledMatrix(kron(pauliZ, i3), 0.04), Sine: scaledMatrix(kron(pauliX, n3), 0.02)}},
		Target:   randomUnitary(rng, 4), FreeAfter: true,
	}
	p = pair
	p.Held = []Class{
		{Name: "noise", Kind: Static, Weight: 0.7, Operators: [][]complex128{kron(pauliZ, pauliX)}, Noise: []Node{{0.05, 0.02}, {0.4, 0.01}}},
		{Name: "one noisy drive", Kind: Mixed, Mix: [][]float64{{1, 0, 0}, {0, 1, 0}, {0, 0, 0}}, Weight: 0.8, Noise: []Node{{0.2, 0.03}}},
		{Name: "noisy drive", Kind: Amplitude, Weight: 1, Noise: []Node{{0.1, 0.03}, {0.7, 0.02}}},
		{Name: "spread", Kind: Static, Weight: 0.5, Operators: [][]complex128{kron(one2, pauliX)}, Values: []float64{-0.02, 0.01, 0.03}, Shares: []float64{0.2, 0.5, 0.3}},
		{Name: "spread of amplitudes", Kind: Amplitude, Weight: 0.5, Values: []float64{-0.1, 0.1}, Shares: []float64{0.5, 0.5}},
	}
	list["noise and spreads"] = p
	leak := make([]complex128, 9)
	leak[5], leak[7] = 1i, -1i
	mixed.Held = []Class{
		statics(kron(pauliX, n3), kron(pauliY, i3)),
		{Name: "leak", Kind: Any, Leak: true, Weight: 1, Size: 0.01, Operators: [][]complex128{kron(one2, leak), kron(pauliX, leak)}},
		{Name: "mixed", Kind: Mixed, Mix: [][]float64{{0, 0, 0}, {0, 0, -1}, {0.3, 0, 0}}, Weight: 0.7, Size: 0.02},
		{Name: "line", Kind: Line, Weight: 1, Size: 0.05},
	}
	list["a spin and a ladder"] = mixed
	return list
}

// TestRegisterJacobian compares Jacobian with central differences and Gradient with Jᵀr, finite errors, free
// rotations and maps of the controls included.
func TestRegisterJacobian(t *testing.T) {
	const n = 3
	for _, a := range []axisKind{axes()[1], axes()[2]} {
		for name, s := range mappedToo(registers(a)) {
			rng := rand.New(rand.NewPCG(11, 9))
			nodes := 2 * len(s.Grid.Steps)
			fill := func() []float64 {
				v := make([]float64, n*nodes)
				for i := range v {
					v[i] = 0.5 * rng.NormFloat64()
				}
				return v
			}
			blocks := func() []Block {
				pair, single := 0, 2
				if s.Dim == 6 {
					pair, single = 1, 0
				}
				return []Block{{N: n, Control: pair, Quadrature: true, Re: fill(), Im: fill()}, {First: 2 * n, N: n, Control: single, Re: fill()}}
			}
			r := Response{Dim: 3 * n, Blocks: blocks(), Slopes: make([][]Block, len(s.Held))}
			for i, c := range s.Held {
				if c.Kind == Line {
					r.Slopes[i] = blocks()[:1]
				}
			}
			g, err := NewLevelsGate(s, r, 0.5)
			if err != nil {
				t.Fatal(err)
			}
			dim, rows := g.Dim(), g.Rows()
			c, res, jac, grad := make([]float64, dim), make([]float64, rows), make([]float64, rows*dim), make([]float64, dim)
			for i := range c {
				c[i] = 0.5 * rng.NormFloat64()
			}
			g.Residuals(c, res)
			g.Jacobian(jac)
			for k := range res {
				res[k] = rng.NormFloat64()
			}
			g.Gradient(res, grad)
			off := 0.0
			for k := range c {
				want := 0.0
				for row := range rows {
					want += jac[row*dim+k] * res[row]
				}
				off = math.Max(off, math.Abs(want-grad[k])/(1+math.Abs(want)))
			}
			if !(off <= 1e-10) {
				t.Errorf("%s, %s: the gradient differs from the Jacobian's by %.3g", a.name, name, off)
			}
			at := func(k int, e float64) []float64 {
				x := append([]float64(nil), c...)
				x[k] += e
				r := make([]float64, rows)
				g.Residuals(x, r)
				return r
			}
			worst, where := 0.0, 0
			for k := range c {
				const e = 1e-3
				p, m, pp, mm := at(k, e), at(k, -e), at(k, 2*e), at(k, -2*e)
				for row := range rows {
					if d := math.Abs(jac[row*dim+k] - (8*(p[row]-m[row])-(pp[row]-mm[row]))/(12*e)); d > worst {
						worst, where = d, row
					}
				}
			}
			if !(worst <= 3e-8) {
				t.Errorf("%s, %s: derivative of row %d of %d off by %.3g", a.name, name, where, rows, worst)
			}
		}
	}
}

// TestRegisterFigures compares susceptibilities with what central differences of exact gates leave, by their
// definitions, and the infidelity with its formula at rotations that random ones do not beat.
func TestRegisterFigures(t *testing.T) {
	a := axes()[2]
	// short steps: the toggled integral and the gate err by their fourth power, each its own way
	a.grid.Steps = append([]float64(nil), a.grid.Steps...)
	for j := range a.grid.Steps {
		a.grid.Steps[j] /= 32
	}
	a.grid.Lead, a.grid.Trail = a.grid.Lead/32, a.grid.Trail/32
	for name, s := range registers(a) {
		rng := rand.New(rand.NewPCG(11, 10))
		g, err := NewLevelsGate(s, Response{}, 0)
		if err != nil {
			t.Fatal(err)
		}
		d, c := s.Dim, len(s.Code)
		u := make([]float64, len(s.Axes)*2*len(s.Grid.Steps))
		for i := range u {
			u[i] = 8 * rng.NormFloat64()
		}
		v := make([][]float64, len(s.Held))
		for i, class := range s.Held {
			if class.Kind == Line {
				v[i] = make([]float64, len(u))
				for k := range v[i] {
					v[i][k] = rng.NormFloat64()
				}
			}
		}
		f := g.Figures(u, v)
		x := product(product(g.aim.after, g.nominal.Gate, d, d, d), g.aim.before, d, d, d)
		inside := func(i int) (at int, ok bool) {
			for k, q := range s.Code {
				if q == i {
					return k, true
				}
			}
			return 0, false
		}
		// infidelity
		if s.Target != nil {
			block := make([]complex128, c*c)
			weight := 0.0
			for i, p := range s.Code {
				for j, q := range s.Code {
					block[i*c+j] = x[p*d+q]
					weight += real(x[p*d+q] * cmplx.Conj(x[p*d+q]))
				}
			}
			fidelity := func(r Rotations) float64 {
				m := product(product(g.aim.whole(r.After), block, c, c, c), g.aim.whole(r.Before), c, c, c)
				tr := complex128(0)
				for i := range m {
					tr += cmplx.Conj(s.Target[i]) * m[i]
				}
				return (weight + real(tr*cmplx.Conj(tr))) / float64(c*(c+1))
			}
			if want := 1 - fidelity(f.Rotations); !(math.Abs(f.Infidelity-want) <= 1e-12) {
				t.Errorf("%s: infidelity %v, want %v", name, f.Infidelity, want)
			}
			if want := 1 - weight/float64(c); !(math.Abs(f.Leakage-want) <= 1e-12) {
				t.Errorf("%s: leakage %v, want %v", name, f.Leakage, want)
			}
			// the mean over finite errors, at the rotations without error
			for i, class := range s.Held {
				if class.Kind != Static && class.Kind != Any || class.Noise != nil || class.Values != nil {
					continue
				}
				want, n := 0.0, 0
				for k, op := range class.Operators {
					for _, sign := range []float64{1, -1} {
						g.finite.Run(g.u, scaledMatrix(op, sign*class.Size*class.factor(k)))
						y := product(product(g.aim.after, g.finite.Gate, d, d, d), g.aim.before, d, d, d)
						moved := make([]complex128, c*c)
						power := 0.0
						for i, p := range s.Code {
							for j, q := range s.Code {
								moved[i*c+j] = y[p*d+q]
								power += real(y[p*d+q] * cmplx.Conj(y[p*d+q]))
							}
						}
						kept, all := block, weight
						block, weight = moved, power
						want += 1 - fidelity(f.Rotations)
						block, weight = kept, all
						n++
					}
				}
				if got := g.MeanInfidelity(u, v, i); !(math.Abs(got-want/float64(n)) <= 1e-12) {
					t.Errorf("%s, %s: mean infidelity %v, want %v", name, class.Name, got, want/float64(n))
				}
			}
			for i, class := range s.Held {
				if class.Values == nil || class.Kind != Static {
					continue
				}
				want := 0.0
				for k, x := range class.Values {
					g.finite.Run(g.u, scaledMatrix(class.Operators[0], x))
					y := product(product(g.aim.after, g.finite.Gate, d, d, d), g.aim.before, d, d, d)
					want += class.Shares[k] * (1 - fidelityOf(y, s.Target, d))
				}
				if got := g.MeanInfidelity(u, v, i); !(math.Abs(got-want) <= 1e-12) {
					t.Errorf("%s, %s: mean infidelity %v, want %v", name, class.Name, got, want)
				}
			}
			f = g.Figures(u, v)
			for range 300 {
				var r Rotations
				for side, list := range []*[][4]complex128{&r.Before, &r.After} {
					for i := range [][][4]complex128{f.Rotations.Before, f.Rotations.After}[side] {
						m := [4]complex128(randomUnitary(rng, 2))
						if !s.Local {
							m = [4]complex128{m[0] / complex(cmplx.Abs(m[0]), 0), 0, 0, m[3] / complex(cmplx.Abs(m[3]), 0)}
						}
						_ = i
						*list = append(*list, m)
					}
				}
				if got := fidelity(r); got > 1-f.Infidelity+1e-9 {
					t.Errorf("%s: random rotations reach %v, the best %v", name, got, 1-f.Infidelity)
				}
			}
		} else {
			want, lost := 0.0, 0.0
			for _, from := range s.From {
				for _, to := range s.To {
					amplitude := complex128(0)
					for i, p := range s.Code {
						for j, q := range s.Code {
							amplitude += cmplx.Conj(to[i]) * x[p*d+q] * from[j]
						}
					}
					want += real(amplitude*cmplx.Conj(amplitude)) / float64(len(s.From))
				}
			}
			if !(math.Abs(f.Infidelity-(1-want)) <= 1e-12) || f.Leakage != lost {
				t.Errorf("%s: infidelity %v, want %v; leakage %v", name, f.Infidelity, 1-want, f.Leakage)
			}
		}
		// susceptibilities
		left := func(op []complex128) []complex128 {
			ends := func(e float64) []complex128 {
				offset := scaledMatrix(op, e)
				g.finite.Run(g.u, offset)
				return append([]complex128(nil), g.finite.Gate...)
			}
			const e = 1e-3
			u0 := ends(0)
			p, m, pp, mm := ends(e), ends(-e), ends(2*e), ends(-2*e)
			slope := make([]complex128, d*d)
			for i := range slope {
				slope[i] = 1i * (8*(p[i]-m[i]) - (pp[i] - mm[i])) / (12 * e)
			}
			return product(adjoint(u0, d, d), slope, d, d, d)
		}
		// what counts of a matrix, by definition
		counts := func(m []complex128, leak bool) (out []complex128) {
			if s.Target == nil {
				q := make([]complex128, d*d)
				for _, from := range s.From {
					for i, p := range s.Code {
						for j, r := range s.Code {
							q[p*d+r] += from[i] * cmplx.Conj(from[j])
						}
					}
				}
				rest := diagonal(d)
				for i := range rest {
					rest[i] -= q[i]
				}
				return product(product(rest, m, d, d, d), q, d, d, d)
			}
			trace := complex128(0)
			for _, p := range s.Code {
				trace += m[p*d+p]
			}
			for i := range d {
				for j := range d {
					_, at := inside(i)
					_, from := inside(j)
					v := m[i*d+j]
					if i == j {
						v -= trace / complex(float64(c), 0)
					}
					if from && (at != leak) {
						out = append(out, v)
					}
				}
			}
			return out
		}
		power := func(m []complex128) float64 {
			p := 0.0
			for _, x := range m {
				p += real(x)*real(x) + imag(x)*imag(x)
			}
			return p
		}
		for i, class := range s.Held {
			if class.Kind != Any && class.Kind != Static {
				continue
			}
			kept, lost, size, whole := 0.0, 0.0, 0.0, 0.0
			for k, op := range class.Operators {
				w := class.factor(k)
				m := left(scaledMatrix(op, w))
				kept += power(counts(m, class.Leak))
				lost += power(counts(m, true))
				if s.Target == nil {
					size += w * w * power(op) * float64(len(s.From)) / float64(d)
				} else {
					size += w * w * power(counts(op, class.Leak))
				}
				whole += w * w * power(op)
			}
			span := s.Grid.Window()
			if want := math.Sqrt(kept/size) / span; !(math.Abs(f.Susceptibility[i]-want) <= 3e-6) {
				t.Errorf("%s, %s: susceptibility %v, want %v", name, class.Name, f.Susceptibility[i], want)
			}
			if want := math.Sqrt(lost/whole) / span; s.Target != nil && !class.Leak && !(math.Abs(f.Leak[i]-want) <= 3e-6) {
				t.Errorf("%s, %s: leak %v, want %v", name, class.Name, f.Leak[i], want)
			}
		}
	}
}

// TestNoiseFigures compares what a noise leaves with exact gates under its components, small ones: relative to the gate
// without error, 1 - F_pro of ε V cos wt and of ε V sin wt, over ε squared.
func TestNoiseFigures(t *testing.T) {
	for _, maps := range [][]Map{nil, {nil, wave3}, {cubic, wave3, folded}} {
		noiseFigures(t, maps)
	}
}

func noiseFigures(t *testing.T, maps []Map) {
	t.Helper()
	a := axes()[1]
	a.grid.Steps = append([]float64(nil), a.grid.Steps...)
	for j := range a.grid.Steps {
		a.grid.Steps[j] /= 8
	}
	s := registers(a)["noise and spreads"]
	s.Maps = maps
	rng := rand.New(rand.NewPCG(3, 10))
	nodes := 2 * len(s.Grid.Steps)
	u := make([]float64, len(s.Axes)*nodes)
	for i := range u {
		u[i] = 4 * rng.NormFloat64()
	}
	g, err := NewLevelsGate(s, Response{}, 0)
	if err != nil {
		t.Fatal(err)
	}
	f := g.Figures(u, make([][]float64, len(s.Held)))
	// the gate with one more control, along the operator
	gate := func(moved []float64, along []complex128, v []float64) []complex128 {
		moved = append([]float64(nil), moved...)
		for k, m := range maps {
			for i := k * nodes; i < (k+1)*nodes && m != nil; i++ {
				moved[i], _, _ = m(moved[i])
			}
		}
		l := dynamics.Levels{Dim: 4, Static: s.Static, Axes: append(append([][]complex128(nil), s.Axes...), along), Steps: s.Grid.Steps, Last: len(s.Grid.Steps)}
		if err := l.Reset(); err != nil {
			t.Fatal(err)
		}
		l.Run(append(append([]float64(nil), moved...), v...), nil)
		return append([]complex128(nil), l.Gate...)
	}
	none := make([]float64, nodes)
	nominal := gate(u, one4(), none)
	for i, class := range s.Held {
		if class.Noise == nil {
			if f.Noise[i] != 0 {
				t.Errorf("%s: noise of %v", class.Name, f.Noise[i])
			}
			continue
		}
		want := 0.0
		for _, node := range class.Noise {
			for _, wave := range []func(float64) float64{math.Cos, math.Sin} {
				for _, e := range []float64{1e-4, -1e-4} { // of which maps alone tell the sign, in the third order
					v, moved, along := append([]float64(nil), none...), append([]float64(nil), u...), one4()
					for n, at := range s.Grid.Times {
						switch class.Kind {
						case Static:
							along = class.Operators[0]
							v[n] = e * wave(node.Frequency*at)
						case Amplitude:
							for k := range s.Axes {
								moved[k*nodes+n] *= 1 + e*wave(node.Frequency*at)
							}
						case Mixed: // of the first two controls
							for k := range 2 {
								moved[k*nodes+n] *= 1 + e*wave(node.Frequency*at)
							}
						}
					}
					m := gate(moved, along, v)
					tr := complex128(0)
					for k := range m {
						tr += cmplx.Conj(nominal[k]) * m[k]
					}
					want += node.Weight / 2 * (1 - real(tr*cmplx.Conj(tr))/16) / (e * e) * 4 / 5 // average gate infidelity
				}
			}
		}
		if !(math.Abs(f.Noise[i]/want-1) <= 1e-4) {
			t.Errorf("%d maps, %s: noise leaves %v, want %v", len(maps), class.Name, f.Noise[i], want)
		}
	}
}

func one4() []complex128 { return kron(one2, one2) }

// fidelityOf is the average gate fidelity without a code space.
func fidelityOf(m, target []complex128, d int) float64 {
	tr := complex128(0)
	for i := range m {
		tr += cmplx.Conj(target[i]) * m[i]
	}
	return (float64(d) + real(tr*cmplx.Conj(tr))) / float64(d*(d+1))
}
