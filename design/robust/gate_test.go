package robust

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"holdfast/design/dynamics"
)

var (
	detuning  = Class{Name: "detuning", Kind: Static, Vector: dynamics.Vec{0, 0, 1}, Weight: 1, Size: 0.02}
	amplitude = Class{Name: "amplitude", Kind: Amplitude, Weight: 1, Size: 0.03}
	anyStatic = Class{Name: "any static error", Kind: Any, Weight: 1, Size: 0.006}
)

func static(x, y, z, weight float64) Class {
	return Class{Kind: Static, Vector: dynamics.Vec{x, y, z}, Weight: weight, Size: 0.01}
}

// The classes under which everything is checked.
var helds = []struct {
	name string
	held []Class
}{
	{"nothing", nil},
	{"detuning", []Class{detuning}},
	{"a static vector", []Class{static(0.3, -1.2, 0.7, 1)}},
	{"amplitude", []Class{amplitude}},
	{"any", []Class{anyStatic}},
	{"amplitude before detuning", []Class{amplitude, detuning}},
	{"three vectors", []Class{static(1, 0, 0, 1), static(0, 0.1, 0.1, 1), static(-1, 2, 0, 1)}},
	{"five vectors", []Class{static(1, 0, 0, 1), static(0, 0.1, 0.1, 1), static(-1, 2, 0, 1), static(3, 1, 1, 1), static(0, 0, -2, 1)}},
	{"more vectors than dynamics toggles", []Class{static(1, 0, 0, 1), static(0, 0.1, 0.1, 1), static(-1, 2, 0, 1), static(3, 1, 1, 1), static(0, 0, -2, 1),
		static(1, 2, 0, 1), static(0, 1, 0.1, 1), static(-1, 2, 5, 1), amplitude, static(3, -1, 1, 1)}},
	{"one side", []Class{{Kind: Any, Weight: 1, Size: 0.01, OneSided: true}}},
	{"weights", []Class{static(1, 2, 3, 0.25), {Kind: Amplitude, Weight: 7, Size: 0.05}, {Kind: Any, Weight: 1e-3, Size: 0.01}, static(0, 1, 0, 40)}},
	{"two amplitudes", []Class{amplitude, {Kind: Amplitude, Weight: 2, Size: 0.1}}},
	{"sizes of zero", []Class{{Kind: Any, Weight: 1}, {Kind: Amplitude, Weight: 1}, static(1, 1, 0, 1)}},
}

// The time axes: the whole grid a window; steps before and after it, with a
// frame of their own; and a last cell that stands for all the rest.
type axisKind struct {
	name   string
	static dynamics.Vec
	grid   Grid
	cell   bool
}

func axes() []axisKind {
	lead := Grid{Steps: []float64{0.4, 0.7, 1, 1.2, 0.8, 1, 0.9, 1.1, 0.5, 2, 3}, First: 2, Last: 9}
	lead.Lead = lead.Steps[0] + lead.Steps[1]
	lead.Trail = lead.Steps[9] + lead.Steps[10]
	return []axisKind{
		{"window", dynamics.Vec{}, Grid{Steps: []float64{1, 1, 0.7, 1, 1, 1.3, 1, 1}, Last: 8}, false},
		{"static field", dynamics.Vec{0.05, -0.03, 0.21}, Grid{Steps: []float64{1, 1, 0.7, 1, 1, 1.3, 1, 1}, Last: 8}, false},
		{"lead and trail", dynamics.Vec{0.02, 0.01, -0.17}, lead, false},
		{"end cell", dynamics.Vec{}, Grid{Steps: []float64{1, 0.6, 1, 1, 1, 1, 0.5, 1.5, 1}, Last: 6}, true},
	}
}

func randomResponse(rng *rand.Rand, g Grid, cell, mixing bool, n int) Response {
	nodes := 2 * len(g.Steps)
	fill := func() []float64 {
		a := make([]float64, nodes*n)
		for i := range a {
			a[i] = rng.NormFloat64()
		}
		if cell { // both nodes of the last cell carry the same integral
			copy(a[(nodes-1)*n:], a[(nodes-2)*n:(nodes-1)*n])
		}
		return a
	}
	re := fill()
	if mixing {
		return quadratures(n, re, fill())
	}
	return quadratures(n, re, nil)
}

// quadratures is the response of one pair of quadratures; re and im have a row of
// n coefficients for each node.
func quadratures(n int, re, im []float64) Response {
	return Response{Dim: 2 * n, Blocks: []Block{{N: n, Quadrature: true, Re: turned(re, n), Im: turned(im, n)}}}
}

// turned gives rows of nodes from rows of n coefficients.
func turned(a []float64, n int) []float64 {
	if a == nil {
		return nil
	}
	nodes := len(a) / n
	b := make([]float64, len(a))
	for i := range nodes {
		for j := range n {
			b[j*nodes+i] = a[i*n+j]
		}
	}
	return b
}

// target is a rotation with no special axis.
var target = dynamics.Turn(dynamics.Vec{1.1, -0.4, 0.3})

func spinOn(a axisKind, held []Class) Spin {
	return Spin{Grid: a.grid, Static: a.static, Axes: []dynamics.Vec{{0.25, 0.01, 0}, {-0.02, 0.24, 0.01}}, Target: target, Held: held}
}

// TestJacobian compares every derivative with central differences of fourth
// order, relative to the largest derivative of its block of three residuals. The
// derivatives are exact, so what is left is the differences' own error, 3e-12 here.
func TestJacobian(t *testing.T) {
	rng := rand.New(rand.NewPCG(6, 1))
	const n = 4
	worst := 0.0
	for _, a := range axes() {
		for _, h := range helds {
			for _, mixing := range []bool{false, true} {
				for _, refine := range []float64{0, 0.05, 1} {
					name := fmt.Sprintf("%s, %s, mixing %v, refine %v", a.name, h.name, mixing, refine)
					g := NewGate(spinOn(a, h.held), randomResponse(rng, a.grid, a.cell, mixing, n), refine)
					members := 0
					for _, c := range h.held {
						if refine > 0 {
							members += len(c.ensemble())
						}
					}
					dim, rows := g.Dim(), g.Rows()
					if want := 3 + errorRows(h.held) + 3*members; dim != 2*n || rows != want {
						t.Fatalf("%s: %d x %d, want %d x %d", name, rows, dim, want, 2*n)
					}
					c := make([]float64, dim)
					for i := range c {
						c[i] = 0.5 * rng.NormFloat64()
					}
					at := func(i int, e float64) []float64 {
						x := append([]float64(nil), c...)
						x[i] += e
						r := make([]float64, rows)
						g.Residuals(x, r)
						return r
					}
					r, jac := make([]float64, rows), make([]float64, rows*dim)
					for i := range jac {
						jac[i] = math.NaN() // what was there must not matter
					}
					g.Residuals(c, r)
					g.Jacobian(jac)
					block := make([]float64, rows/3) // largest derivative of each triple
					for i, v := range jac {
						block[i/dim/3] = math.Max(block[i/dim/3], math.Abs(v))
					}
					const e = 1e-3
					for i := range dim {
						p2, p1, m1, m2 := at(i, 2*e), at(i, e), at(i, -e), at(i, -2*e)
						for k := range rows {
							want := (8*(p1[k]-m1[k]) - (p2[k] - m2[k])) / (12 * e)
							off := math.Abs(jac[k*dim+i]-want) / block[k/3]
							if !(off <= 1e-9) {
								t.Fatalf("%s: derivative of residual %d by coefficient %d is %v, want %v", name, k, i, jac[k*dim+i], want)
							}
							worst = math.Max(worst, off)
						}
					}
					// a clone has the same values and memory of its own
					o := g.Clone()
					ro, jo := make([]float64, rows), make([]float64, rows*dim)
					o.Residuals(c, ro)
					g.Residuals(make([]float64, dim), r)
					o.Jacobian(jo)
					if fmt.Sprint(jo) != fmt.Sprint(jac) {
						t.Errorf("%s: the clone's Jacobian differs", name)
					}
				}
			}
		}
	}
	t.Logf("worst relative difference %.1e", worst)
}

func errorRows(held []Class) int {
	n := 0
	for _, c := range held {
		n += 3
		if c.Kind == Any {
			n += 6
		}
	}
	return n
}

// stepwise draws controls that are constant in every step.
func stepwise(rng *rand.Rand, s Spin) slow {
	p := slow{spin: s}
	for range 2 * len(s.Grid.Steps) {
		p.u = append(p.u, 2*rng.NormFloat64())
	}
	return p
}

// identity is the response of a line that passes each step's controls on: one
// coefficient per step.
func identity(g Grid) Response {
	n := len(g.Steps)
	re := make([]float64, 2*n*n)
	for j := range n {
		re[(2*j)*n+j], re[(2*j+1)*n+j] = 1, 1
	}
	return quadratures(n, re, nil)
}

func matrixOf(q dynamics.Quat) matrix {
	return evolve([3]float64{2 * q[1], 2 * q[2], 2 * q[3]}, math.Atan2(math.Sqrt(q[1]*q[1]+q[2]*q[2]+q[3]*q[3]), q[0])/math.Sqrt(q[1]*q[1]+q[2]*q[2]+q[3]*q[3]))
}

// TestFiguresAgainstDefinition compares figures and residuals with the slow
// writing-out of their definitions.
func TestFiguresAgainstDefinition(t *testing.T) {
	rng := rand.New(rand.NewPCG(6, 2))
	const tol = 1e-12
	w := matrixOf(target)
	for _, a := range axes() {
		for _, h := range helds {
			name := a.name + ", " + h.name
			s := stepwise(rng, spinOn(a, h.held))
			g := NewGate(s.spin, identity(a.grid), 0.5)
			f := g.Figures(s.nodes(), nil)
			if want := infidelity(w, s.unitary([3]float64{}, 1)); !(math.Abs(f.Infidelity-want) <= tol) {
				t.Errorf("%s: infidelity %v, want %v", name, f.Infidelity, want)
			}
			r := make([]float64, g.Rows())
			g.Residuals(s.u, r)
			if got := 2. / 3 * (r[0]*r[0] + r[1]*r[1] + r[2]*r[2]); !(math.Abs(got-f.Infidelity) <= tol) {
				t.Errorf("%s: 2/3 of the squared gate residuals is %v, want %v", name, got, f.Infidelity)
			}
			if len(f.Susceptibility) != len(h.held) || len(f.Worst) != len(h.held) {
				t.Fatalf("%s: %d figures, %d directions for %d classes", name, len(f.Susceptibility), len(f.Worst), len(h.held))
			}
			var power float64 // of the drive, as the amplitude residuals are normalised by full scale
			for j := a.grid.First; j < a.grid.Last; j++ {
				power += a.grid.Steps[j] * 2 * s.borne(j).norm2()
			}
			full := math.Max(norm(s.spin.Axes[0]), norm(s.spin.Axes[1]))
			var first, last []float64 // static and any classes come before amplitudes
			for i, c := range h.held {
				var want float64
				switch c.Kind {
				case Static:
					want = s.static(c.Vector)
					first = append(first, c.Weight*want)
				case Amplitude:
					want = s.susceptibility(s.borne)
					last = append(last, c.Weight*want*math.Sqrt(power/a.grid.Window())/full)
				case Any:
					m := s.mmap()
					sum, most := 0.0, 0.0
					for row := range 3 {
						for col := range 3 {
							sum += m[row][col] * m[row][col]
						}
					}
					want = math.Sqrt(sum / 3)
					first = append(first, c.Weight*want*math.Sqrt(3))
					for range 20000 { // random directions: the worst is an upper bound, and a tight one
						v := unit(dynamics.Vec{rng.NormFloat64(), rng.NormFloat64(), rng.NormFloat64()})
						most = math.Max(most, norm(apply(m, v)))
					}
					if got := f.Worst[i].Susceptibility; !(got >= most && got-most <= 1e-3) {
						t.Errorf("%s: worst direction %v, the worst of many %v", name, got, most)
					}
					if got := norm(apply(m, fromWords(t, f.Worst[i].Direction))); !(math.Abs(got-f.Worst[i].Susceptibility) <= 0.02) {
						t.Errorf("%s: along %q %v survives, want %v", name, f.Worst[i].Direction, got, f.Worst[i].Susceptibility)
					}
					if got, want := s.framePotential(), 1+sum; !(math.Abs(got-want) <= 1e-9) {
						t.Errorf("%s: frame potential %v, ||Mmap||² + 1 = %v", name, got, want)
					}
				}
				if !(math.Abs(f.Susceptibility[i]-want) <= tol) {
					t.Errorf("%s: susceptibility %d is %v, want %v", name, i, f.Susceptibility[i], want)
				}
				if c.Kind != Any && f.Worst[i] != (Worst{}) {
					t.Errorf("%s: a worst direction for one error: %v", name, f.Worst[i])
				}
			}
			at := 3
			for _, want := range append(first, last...) {
				rows := 3
				if k := before(h.held, Any); k >= 0 && at == 3+3*k {
					rows = 9
				}
				sum := 0.0
				for _, v := range r[at : at+rows] {
					sum += v * v
				}
				if !(math.Abs(math.Sqrt(sum)-want) <= tol*(1+want)) {
					t.Errorf("%s: residuals at %d have length %v, want %v", name, at, math.Sqrt(sum), want)
				}
				at += rows
			}
			for _, c := range h.held { // ensembles, in the order of the classes
				for _, e := range c.ensemble() {
					want := infidelity(w, s.unitary(e.offset, e.scale))
					got := 2. / 3 * (r[at]*r[at] + r[at+1]*r[at+1] + r[at+2]*r[at+2]) / 0.25
					if !(math.Abs(got-want) <= tol) {
						t.Errorf("%s: finite residuals at %d mean %v, want %v", name, at, got, want)
					}
					if got := g.Infidelity(s.nodes(), e.offset, e.scale); !(math.Abs(got-want) <= tol) {
						t.Errorf("%s: infidelity of %v is %v, want %v", name, e, got, want)
					}
					at += 3
				}
			}
			if at != len(r) {
				t.Errorf("%s: %d residuals, %d accounted for", name, len(r), at)
			}
		}
	}
}

// before counts the residual triples before the first class of kind k, which is
// not Amplitude; -1 when there is none.
func before(held []Class, k Kind) int {
	n := 0
	for _, c := range held {
		if c.Kind == k {
			return n
		}
		if c.Kind != Amplitude {
			n++
		}
	}
	return -1
}

func apply(m [3][3]float64, v dynamics.Vec) (w dynamics.Vec) {
	for i := range 3 {
		for k := range 3 {
			w[i] += m[i][k] * v[k]
		}
	}
	return w
}

// fromWords reads "0.83 X - 0.41 Y" and returns it at unit length.
func fromWords(t *testing.T, s string) (v dynamics.Vec) {
	t.Helper()
	sign := 1.0
	for s != "" {
		var x float64
		var axis string
		if s[0] == '-' || s[0] == '+' {
			if s[0] == '-' {
				sign = -1
			}
			s = s[1:]
			continue
		}
		if n, err := fmt.Sscanf(s, "%f %s", &x, &axis); n != 2 || len(axis) != 1 || axis < "X" || axis > "Z" {
			t.Fatalf("direction %q: %v", s, err)
		}
		v[axis[0]-'X'] = sign * x
		sign = 1
		i := 0
		for i < len(s) && s[i] != axis[0] {
			i++
		}
		s = s[i+1:]
		for s != "" && s[0] == ' ' {
			s = s[1:]
		}
	}
	return unit(v)
}

func TestMeanInfidelity(t *testing.T) {
	rng := rand.New(rand.NewPCG(6, 3))
	a := axes()[2]
	s := stepwise(rng, spinOn(a, nil))
	w := matrixOf(target)
	mean := func(list ...[4]float64) float64 {
		sum := 0.0
		for _, e := range list {
			sum += infidelity(w, s.unitary([3]float64{e[0], e[1], e[2]}, 1+e[3]))
		}
		return sum / float64(len(list))
	}
	const d = 0.006
	r := d / math.Sqrt(3)
	var sphere [][4]float64
	for i := range 3 {
		var v [4]float64
		v[i] = d
		sphere = append(sphere, v)
		v[i] = -d
		sphere = append(sphere, v)
	}
	for i := range 8 {
		sphere = append(sphere, [4]float64{r * float64(1-i&1*2), r * float64(1-i>>1&1*2), r * float64(1-i>>2&1*2)})
	}
	oneSided := anyStatic
	oneSided.OneSided = true
	for _, c := range []struct {
		class Class
		want  float64
	}{
		{detuning, mean([4]float64{0, 0, 0.02}, [4]float64{0, 0, -0.02})},
		{static(0, 3, 4, 1), mean([4]float64{0, 0.006, 0.008}, [4]float64{0, -0.006, -0.008})},
		{amplitude, mean([4]float64{3: 0.03}, [4]float64{3: -0.03})},
		{anyStatic, mean(sphere...)},
		{oneSided, mean(sphere...)},
		{Class{Kind: Any, Weight: 1}, 0},
	} {
		s.spin.Held = []Class{detuning, c.class}
		g := NewGate(s.spin, Response{}, 0)
		if got := g.MeanInfidelity(s.nodes(), nil, 1); !(math.Abs(got-c.want) <= 1e-13) {
			t.Errorf("%+v: %v, want %v", c.class, got, c.want)
		}
	}
	g := NewGate(s.spin, Response{}, 0)
	if got, want := infidelity(matrixOf(g.Unitary(s.nodes())), s.unitary([3]float64{}, 1)), 0.0; !(math.Abs(got-want) <= 1e-13) {
		t.Errorf("the unitary misses the definition by %v", got)
	}
}

// pulse is a drive of unit Rabi rate in segments of angle and phase, degrees,
// cut into equal steps, perPi of them in 180 degrees.
func pulse(perPi int, segments ...[2]float64) slow {
	s := slow{spin: Spin{Axes: []dynamics.Vec{{1, 0, 0}, {0, 1, 0}}, Target: dynamics.Turn(dynamics.Vec{math.Pi, 0, 0})}}
	var q []float64
	for _, g := range segments {
		for range int(math.Round(g[0] / 180 * float64(perPi))) {
			s.spin.Grid.Steps = append(s.spin.Grid.Steps, math.Pi/float64(perPi))
			s.u = append(s.u, math.Cos(g[1]*math.Pi/180))
			q = append(q, math.Sin(g[1]*math.Pi/180))
		}
	}
	s.u = append(s.u, q...)
	s.spin.Grid.Last = len(s.spin.Grid.Steps)
	return s
}

func (s slow) figures(held ...Class) Figures {
	spin := s.spin
	spin.Held = held
	return NewGate(spin, Response{}, 0).Figures(s.nodes(), nil)
}

var (
	square      = [][2]float64{{180, 0}}
	shortCORPSE = [][2]float64{{60, 0}, {300, 180}, {60, 0}} // Cummins, Llewellyn, Jones 2003, Phys. Rev. A 67, 042308
)

func TestTextbookPulses(t *testing.T) {
	t.Run("square", func(t *testing.T) {
		// X(π) on resonance: M = diag(1, 0, 0) plus the sine average 2/π that takes Y to
		// Z and Z to -Y, so ||Mmap||² + 1 = 2 + 8/π², by hand.
		for _, perPi := range []int{1, 3, 10} {
			s := pulse(perPi, square...)
			f := s.figures(anyStatic, detuning, amplitude, static(1, 0, 0, 1))
			if got, want := 1+3*f.Susceptibility[0]*f.Susceptibility[0], 2+8/(math.Pi*math.Pi); !(math.Abs(got-want) <= 1e-13) {
				t.Errorf("%d steps: frame potential %v, want %v", perPi, got, want)
			}
			if w := f.Worst[0]; w.Direction != "1.00 X" || !(math.Abs(w.Susceptibility-1) <= 1e-13) {
				t.Errorf("worst direction %+v, want 1.00 X with 1", w)
			}
			for i, want := range []float64{2 / math.Pi, 1, 1} {
				if got := f.Susceptibility[1+i]; !(math.Abs(got-want) <= 1e-13) {
					t.Errorf("%d steps: susceptibility %d is %v, want %v", perPi, 1+i, got, want)
				}
			}
			if !(f.Infidelity <= 1e-30) {
				t.Errorf("infidelity %v", f.Infidelity)
			}
			// Filter value at w = 0, |∫ Rᵀ z dt|² = 4: Green, Sastrawan, Uys, Biercuk 2013,
			// New J. Phys. 15, 095004, whose square π pulse has 4 cos²(πw/2)(w²+1)/(w²-1)².
			if got := math.Pow(math.Pi*f.Susceptibility[1], 2); !(math.Abs(got-4) <= 1e-12) {
				t.Errorf("filter value at zero %v, want 4", got)
			}
		}
	})
	t.Run("short CORPSE", func(t *testing.T) {
		// One left-endpoint sample of V_I a step leaves |E|² = 0.0171 at 24 steps per π,
		// where the integral vanishes (CALC; effect: arXiv 2602.10349, 2026).
		s := pulse(24, shortCORPSE...)
		var left matrix
		u := matrix{{1, 0}, {0, 1}}
		for j, h := range s.spin.Grid.Steps {
			left.add(h, u.adjoint().mul(pauli[2]).mul(u))
			u = evolve(s.field(j, [3]float64{}, 1), h).mul(u)
		}
		if got := left.norm2() / 2; !(math.Abs(got-0.0171) <= 5e-5) {
			t.Errorf("left endpoints give %v, want 0.0171", got)
		}
		f := s.figures(detuning, amplitude)
		if got := math.Pow(s.spin.Grid.Window()*f.Susceptibility[0], 2); !(got <= 1e-25) {
			t.Errorf("|E|² = %v, want 0", got)
		}
		if !(f.Infidelity <= 1e-28) {
			t.Errorf("infidelity %v", f.Infidelity)
		}
	})
}

// TestSecondDifference ties susceptibilities to the simulated infidelity: for a
// static error F·σ/2 relative to the nominal gate
//
//	(g(F) + g(-F) - 2 g(0))/2 = 2/3 (|F| T s/2)² + O(F⁴),
//
// and for the amplitude with ∫ ||V||² = ∫ |u|²/2.
func TestSecondDifference(t *testing.T) {
	rng := rand.New(rand.NewPCG(6, 4))
	for _, a := range axes() {
		v := dynamics.Vec{0.4, -0.5, 0.6}
		s := stepwise(rng, spinOn(a, []Class{{Kind: Static, Vector: v, Weight: 1}, amplitude}))
		s.spin.Target = NewGate(s.spin, Response{}, 0).Unitary(s.nodes())
		g := NewGate(s.spin, Response{}, 0)
		f := g.Figures(s.nodes(), nil)
		if !(f.Infidelity <= 1e-28) {
			t.Fatalf("%s: the nominal gate misses itself by %v", a.name, f.Infidelity)
		}
		T := a.grid.Window()
		// at two sizes, so that the fourth order can be taken out
		second := func(l float64, inf func(l float64) float64) float64 {
			d := func(l float64) float64 { return (inf(l) + inf(-l) - 2*inf(0)) / (2 * l * l) }
			return (4*d(l/2) - d(l)) / 3
		}
		got := second(1e-3, func(l float64) float64 { return g.Infidelity(s.nodes(), scaled(unit(v), l), 1) })
		want := 2. / 3 * math.Pow(T*f.Susceptibility[0]/2, 2)
		if !(math.Abs(got-want) <= 1e-7*want) {
			t.Errorf("%s: static: second difference %v, want %v", a.name, got, want)
		}
		got = second(1e-3, func(l float64) float64 { return g.Infidelity(s.nodes(), dynamics.Vec{}, 1+l) })
		size := 0.0
		for j := a.grid.First; j < a.grid.Last; j++ {
			size += a.grid.Steps[j] * s.borne(j).norm2() / 2 // of the vector
		}
		want = 2. / 3 * T * size * math.Pow(f.Susceptibility[1], 2)
		if !(math.Abs(got-want) <= 1e-7*want) {
			t.Errorf("%s: amplitude: second difference %v, want %v", a.name, got, want)
		}
	}
}

func TestWithoutDrive(t *testing.T) {
	// Doing nothing cancels nothing, and has no amplitude to be wrong.
	s := pulse(4, square...)
	clear(s.u)
	f := s.figures(anyStatic, detuning, amplitude)
	for i, want := range []float64{1, 1, 0} {
		if got := f.Susceptibility[i]; !(math.Abs(got-want) <= 1e-14) {
			t.Errorf("susceptibility %d is %v, want %v", i, got, want)
		}
	}
	if !(math.Abs(f.Infidelity-2./3) <= 1e-14) { // the identity against X(π): 1 - (2 + 0)/6
		t.Errorf("infidelity %v, want 2/3", f.Infidelity)
	}
}

func TestSignOfTheTarget(t *testing.T) {
	// A rotation has two quaternions: the residuals must not tell them apart.
	rng := rand.New(rand.NewPCG(6, 5))
	for range 20 {
		s := stepwise(rng, spinOn(axes()[1], nil))
		a := NewGate(s.spin, identity(s.spin.Grid), 0)
		for i := range s.spin.Target {
			s.spin.Target[i] *= -1
		}
		b := NewGate(s.spin, identity(s.spin.Grid), 0)
		ra, rb := make([]float64, 3), make([]float64, 3)
		a.Residuals(s.u, ra)
		b.Residuals(s.u, rb)
		if fmt.Sprint(ra) != fmt.Sprint(rb) {
			t.Errorf("residuals %v, %v for the same target", ra, rb)
		}
	}
}

func TestEnsembles(t *testing.T) {
	oneSided := anyStatic
	oneSided.OneSided = true
	for _, c := range []struct {
		class Class
		want  int
	}{{detuning, 2}, {amplitude, 2}, {anyStatic, 14}, {oneSided, 7}, {Class{Kind: Any}, 0}} {
		list := c.class.ensemble()
		if len(list) != c.want {
			t.Errorf("%+v: %d finite errors, want %d", c.class, len(list), c.want)
		}
		for i, e := range list {
			if size := norm(e.offset) + math.Abs(e.scale-1); !(math.Abs(size-c.class.Size) <= 1e-15) {
				t.Errorf("%+v: error %d has size %v", c.class, i, size)
			}
			for _, o := range list[:i] {
				if e == o || c.class.OneSided && e.offset == scaled(o.offset, -1) {
					t.Errorf("%+v: %v beside %v", c.class, e, o)
				}
			}
		}
	}
}

func TestDirections(t *testing.T) {
	// 14 unit vectors without a preferred direction: their mean vanishes, and the
	// mean of v vᵀ is 1/3.
	list := Directions()
	var sum dynamics.Vec
	var second [3][3]float64
	for i, v := range list {
		if !(math.Abs(norm(v)-1) <= 1e-15) {
			t.Errorf("%v has length %v", v, norm(v))
		}
		if i%2 == 1 && v != scaled(list[i-1], -1) {
			t.Errorf("%v after %v, want the opposite", v, list[i-1])
		}
		for k := range 3 {
			sum[k] += v[k]
			for l := range 3 {
				second[k][l] += v[k] * v[l] / float64(len(list))
			}
		}
	}
	if len(list) != 14 || !(norm(sum) <= 1e-15) {
		t.Errorf("%d directions, sum %v", len(list), sum)
	}
	for k := range 3 {
		for l := range 3 {
			want := 0.0
			if k == l {
				want = 1. / 3
			}
			if !(math.Abs(second[k][l]-want) <= 1e-15) {
				t.Errorf("second moment [%d][%d] = %v, want %v", k, l, second[k][l], want)
			}
		}
	}
}

func TestInWords(t *testing.T) {
	for _, c := range []struct {
		v    dynamics.Vec
		want string
	}{
		{dynamics.Vec{1, 0, 0}, "1.00 X"},
		{dynamics.Vec{0, -1, 0.049}, "1.00 Y"},
		{dynamics.Vec{0.6, -0.8, 0}, "-0.60 X + 0.80 Y"},
		{dynamics.Vec{0.8, -0.6, 0.06}, "0.80 X - 0.60 Y + 0.06 Z"},
		{dynamics.Vec{-0.1, 0, -0.995}, "0.10 X + 0.99 Z"},
	} {
		if got := inWords(c.v[:], []string{"X", "Y", "Z"}); got != c.want {
			t.Errorf("%v is %q, want %q", c.v, got, c.want)
		}
	}
}

// big is a problem of the size of a design: 96 samples at two steps each and 20
// coefficients per quadrature.
func big(held []Class, refine float64) (*Gate, []float64, []float64, []float64) {
	var grid Grid
	for range 192 {
		grid.Steps = append(grid.Steps, 0.5)
	}
	grid.Last = 192
	const n = 20
	re := make([]float64, 384*n)
	for node := range 384 {
		for j := range n {
			re[node*n+j] = math.Sin(math.Pi*float64(j+1)*(float64(node)+0.5)/384) / 8
		}
	}
	g := NewGate(Spin{Grid: grid, Axes: []dynamics.Vec{{0.25, 0, 0}, {0, 0.25, 0}}, Target: target, Held: held}, quadratures(n, re, nil), refine)
	c := make([]float64, g.Dim())
	for i := range c {
		c[i] = math.Cos(float64(3 * i))
	}
	return g, c, make([]float64, g.Rows()), make([]float64, g.Rows()*g.Dim())
}

func TestNoAllocation(t *testing.T) {
	for _, refine := range []float64{0, 1} {
		g, c, r, jac := big([]Class{anyStatic, amplitude, detuning}, refine)
		if n := testing.AllocsPerRun(5, func() {
			g.Residuals(c, r)
			g.Jacobian(jac)
		}); n != 0 {
			t.Errorf("refine %v: %v allocations in Residuals and Jacobian", refine, n)
		}
	}
}

func BenchmarkGate(b *testing.B) {
	for _, c := range []struct {
		name   string
		held   []Class
		refine float64
	}{
		{"nothing", nil, 0}, {"detuning", []Class{detuning}, 0}, {"any", []Class{anyStatic}, 0},
		{"any+amplitude", []Class{anyStatic, amplitude}, 0}, {"any refined", []Class{anyStatic}, 1},
	} {
		b.Run(c.name, func(b *testing.B) {
			g, x, r, jac := big(c.held, c.refine)
			for b.Loop() {
				g.Residuals(x, r)
				g.Jacobian(jac)
			}
		})
	}
}
