package replay

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
)

// A moment is one node of Simpson's rule over the window, with the evolution up to it.
type moment struct {
	t, weight float64
	u         []complex128
}

// A history is the evolution over the window at the nodes of two rules, the second of half the step.
type history struct {
	m     *Model
	rules [2][]moment
}

// newHistory takes many small steps, each the exponential of the Hamiltonian in its middle.
func newHistory(m *Model) *history {
	h := &history{m: m}
	n := m.Dim
	for i, per := range []int{16, 32} { // steps a sample
		dt := m.SamplePeriod / float64(per)
		u := make([]complex128, n*n)
		setIdentity(u, n)
		for k := range m.Samples * per {
			t := m.WindowStart + float64(k)*dt
			// Edges of samples belong to the step that they begin or end.
			h.rules[i] = append(h.rules[i], moment{t + 1e-9*dt, dt / 6, u})
			for half := range 2 {
				next := make([]complex128, n*n)
				mul(next, exponential(hamiltonian(m, t+(0.25+0.5*float64(half))*dt, wrong{}), dt/2), u, n)
				u = next
				if half == 0 {
					h.rules[i] = append(h.rules[i], moment{t + dt/2, 4 * dt / 6, u})
				}
			}
			h.rules[i] = append(h.rules[i], moment{t + dt - 1e-9*dt, dt / 6, u})
		}
	}
	return h
}

// toggled gives A = int U'VU dt over the window and int |V|^2 dt of V without its trace: the definitions as they stand, which the engine never uses. What the
// two rules give is extrapolated.
func (h *history) toggled(v func(t float64) []complex128) (a []complex128, energy float64) {
	n := h.m.Dim
	half, turned := make([]complex128, n*n), make([]complex128, n*n)
	a = make([]complex128, n*n)
	for i, rule := range h.rules {
		f := []float64{-1. / 3, 4. / 3}[i]
		for _, at := range rule {
			op := append([]complex128(nil), v(at.t)...)
			dropTrace(op, n)
			energy += f * at.weight * inner(op, op)
			mul(half, op, at.u, n)
			mulAdjointLeft(turned, at.u, half, n)
			for i := range a {
				a[i] += complex(f*at.weight, 0) * turned[i]
			}
		}
	}
	return a, energy
}

// A expected is what the definitions give for a class.
type expected struct{ susceptibility, leak, worst float64 }

// define works a class out from its operators with their weights, what becomes of each, and T times the integral of its square.
func define(m *Model, leakage bool, ops, as [][]complex128, energies []float64) expected {
	n, k := m.Dim, len(m.From)
	cutTo := func(op []complex128, rows []int) []complex128 {
		var b []complex128
		for _, i := range rows {
			for _, j := range m.CodeSpace {
				b = append(b, op[i*n+j])
			}
		}
		return b
	}
	var rest []int
	for i := range n {
		if !slices.Contains(m.CodeSpace, i) {
			rest = append(rest, i)
		}
	}
	inside := func(op []complex128) []complex128 {
		b := cutTo(op, m.CodeSpace)
		dropTrace(b, len(m.CodeSpace))
		return b
	}
	// (1 - Q) op |from>, every column.
	moved := func(op []complex128) []complex128 {
		var list []complex128
		whole := func(v []complex128) []complex128 {
			w := make([]complex128, n)
			for i, s := range m.CodeSpace {
				w[s] = v[i]
			}
			return w
		}
		for _, f := range m.From {
			w, from := make([]complex128, n), whole(f)
			for i := range n {
				for j := range n {
					w[i] += op[i*n+j] * from[j]
				}
			}
			for _, g := range m.From {
				q := whole(g)
				var part complex128
				for i := range n {
					part += cmplx.Conj(q[i]) * w[i]
				}
				for i := range n {
					w[i] -= part * q[i]
				}
			}
			list = append(list, w...)
		}
		return list
	}
	var columns [][]complex128
	var x expected
	left, of, leak, all := 0.0, 0.0, 0.0, 0.0
	for i, a := range as {
		span := m.Span()
		var column []complex128
		whole := 0.0
		switch {
		case k > 0:
			column, whole = moved(a), energies[i]*float64(k)/float64(n)
		case leakage:
			column, whole = cutTo(a, rest), span*span*math.Pow(frobenius(cutTo(ops[i], rest)), 2)
		default:
			column = inside(a)
			if ops != nil {
				whole = span * span * math.Pow(frobenius(inside(ops[i])), 2)
			} else {
				whole = energies[i]
			}
		}
		columns = append(columns, column)
		left += math.Pow(frobenius(column), 2)
		of += whole
		leak += math.Pow(frobenius(cutTo(a, rest)), 2)
		all += energies[i]
	}
	x.susceptibility, x.leak = math.Sqrt(left/of), math.Sqrt(leak/all)
	// The largest of |sum v_i column_i| over |v| = 1, by raising a start to it again and again.
	v := make([]float64, len(columns))
	for i := range v {
		v[i] = 1 + 0.1*float64(i)
	}
	size := 0.0
	for range 3000 {
		sum := make([]complex128, len(columns[0]))
		for i, c := range columns {
			for j, z := range c {
				sum[j] += complex(v[i], 0) * z
			}
		}
		size = 0
		for i, c := range columns {
			v[i] = inner(c, sum)
			size = math.Hypot(size, v[i])
		}
		for i := range v {
			v[i] /= size
		}
	}
	x.worst = math.Sqrt(size) / math.Sqrt(of/float64(len(columns)))
	return x
}

// The susceptibilities of every kind against their definitions: of a gate on a code space, of states and of a span of states, with levels outside and
// without, of classes with weights, of leakage, and of errors that ride on the drive; all while other things turn by themselves.
func TestDefinitions(t *testing.T) {
	r := rand.New(rand.NewPCG(41, 42))
	for _, dim := range []int{4, 6} {
		for states := range 3 {
			m := turningModel(r, dim)
			m.Ends = "window"
			if states == 0 {
				m.Target = unitary(r, 4)
			} else {
				u, v := unitary(r, 4), unitary(r, 4)
				m.Target = nil
				for j := range states {
					from, to := make([]complex128, 4), make([]complex128, 4)
					for i := range 4 {
						from[i], to[i] = u[i*4+j], v[i*4+j]
					}
					m.From, m.To = append(m.From, from), append(m.To, to)
				}
			}
			m.Errors = m.Errors[1:2]
			list := Class{Name: "list", Kind: "any"}
			sum := 0.0
			for i := range 5 {
				list.Operators, list.Names = append(list.Operators, hermitian(r, dim, 0.3)), append(list.Names, fmt.Sprint("op ", i))
				list.Weights = append(list.Weights, 0.3+r.Float64())
				sum += square(complex(list.Weights[i], 0)) / 5
			}
			for i := range list.Weights {
				list.Weights[i] /= math.Sqrt(sum)
			}
			one := Class{Name: "one", Kind: "static", Operator: hermitian(r, dim, 0.3)}
			m.Errors = append(m.Errors, list, one, Class{Name: "all", Kind: "any"}, Class{Name: "amplitude", Kind: "amplitude"})
			if dim == 6 {
				out := list
				out.Name, out.Leak = "leakage", true
				m.Errors = append(m.Errors, out)
			}
			if err := m.Validate(); err != nil {
				t.Fatal(err)
			}
			var like []Error
			for _, c := range m.Errors {
				like = append(like, Error{Name: c.Name, Curve: []Point{{}}})
			}
			found, err := m.Curves(context.Background(), 1e-9, like)
			if err != nil {
				t.Fatal(err)
			}
			got := map[string]Error{}
			for _, e := range found {
				got[e.Name] = e
			}
			h := newHistory(m)
			span := m.Span()
			static := func(c Class) ([][]complex128, [][]complex128, []float64) {
				ops := c.Operators
				if c.Kind == "static" {
					ops = [][]complex128{c.Operator}
				} else if ops == nil {
					ops, _ = basis(dim)
				}
				var weighted, as [][]complex128
				var energies []float64
				for i, op := range ops {
					if c.Weights != nil {
						op = scaled(op, c.Weights[i])
					}
					op = append([]complex128(nil), op...)
					dropTrace(op, dim)
					a, e := h.toggled(func(float64) []complex128 { return op })
					weighted, as, energies = append(weighted, op), append(as, a), append(energies, span*e)
				}
				return weighted, as, energies
			}
			for i := range m.Errors {
				c := m.Errors[i]
				var want expected
				switch c.Kind {
				case "any", "static":
					ops, as, energies := static(c)
					want = define(m, c.Leak, ops, as, energies)
					if c.Operators == nil && states == 0 { // relative to one of the basis as a whole
						want.worst *= math.Sqrt(15 / float64(dim*dim-1))
					}
				default:
					w := wrong{i: 1, q: 1}
					if c.Kind == "crosstalk" {
						w = wrong{cross: &m.Errors[i], lambda: 1}
					}
					a, e := h.toggled(func(t float64) []complex128 { return add(hamiltonian(m, t, w), -1, hamiltonian(m, t, wrong{})) })
					if states > 0 {
						want = define(m, false, nil, [][]complex128{a}, []float64{span * e})
					} else {
						// Of a gate it is V on the code space that counts.
						_, inside := h.toggled(func(t float64) []complex128 {
							v := add(hamiltonian(m, t, w), -1, hamiltonian(m, t, wrong{}))
							block, whole := make([]complex128, 16), make([]complex128, dim*dim)
							cut(block, v, dim, m.CodeSpace)
							for i, a := range m.CodeSpace {
								for j, b := range m.CodeSpace {
									whole[a*dim+b] = block[i*4+j]
								}
							}
							return whole
						})
						want = define(m, false, nil, [][]complex128{a}, []float64{span * inside})
						want.leak *= math.Sqrt(inside / e)
					}
				}
				g := got[c.Name]
				if !(math.Abs(g.Susceptibility-want.susceptibility) <= 3e-6) || !(want.susceptibility > 0.05) {
					t.Errorf("%d levels, %d states, %s: susceptibility %.9g, want %.9g", dim, states, c.Name, g.Susceptibility, want.susceptibility)
				}
				if c.Kind == "any" && !(math.Abs(g.WorstSusceptibility-want.worst) <= 3e-6) {
					t.Errorf("%d levels, %d states, %s: worst %.9g, want %.9g", dim, states, c.Name, g.WorstSusceptibility, want.worst)
				}
				if (g.LeakSusceptibility != nil) != (dim == 6) || g.LeakSusceptibility != nil && !(math.Abs(*g.LeakSusceptibility-want.leak) <= 3e-6) {
					t.Errorf("%d levels, %d states, %s: leak %v, want %.9g", dim, states, c.Name, g.LeakSusceptibility, want.leak)
				}
				if g.Leak != c.Leak {
					t.Errorf("%s: a class of leakage %v", c.Name, g.Leak)
				}
				if c.Kind == "any" && c.Operators != nil && !slices.Equal(g.Members, c.Names) {
					t.Errorf("%s: members %q", c.Name, g.Members)
				}
			}
		}
	}
}

// A class by closed forms: a square pi pulse leaves X whole and 2/pi of Z, so that of a class of both, with weights, a and b of a^2 + b^2 = 2,
// (a^2 + 4 b^2/pi^2)/2 survives in the square; the worst of it is X alone, a times what one of root mean square would leave, and the margin is that of X
// divided by a.
func TestWeights(t *testing.T) {
	const threshold = 1e-4
	for _, a := range []float64{1.2, 0.4} {
		b := math.Sqrt(2 - a*a)
		m := composite(plain)
		m.Errors = []Class{{Name: "two", Kind: "any", Operators: [][]complex128{halfX, halfZ}, Names: []string{"first", "second"}, Weights: []float64{a, b}}}
		if err := m.Validate(); err != nil {
			t.Fatal(err)
		}
		list := judged(t, m, threshold)
		got, x, z := list["two"], list["X"], list["Z"]
		if want := math.Sqrt((a*a + 4*b*b/(math.Pi*math.Pi)) / 2); !(math.Abs(got.Susceptibility-want) <= 1e-11) {
			t.Errorf("a = %g: susceptibility %.12g, want %.12g", a, got.Susceptibility, want)
		}
		worst, direction := a, "1.00 first"
		if b*2/math.Pi > a {
			worst, direction = b*2/math.Pi, "1.00 second"
		}
		if !(math.Abs(got.WorstSusceptibility-worst) <= 1e-11) || got.WorstDirection != direction {
			t.Errorf("a = %g: worst %.12g of %q, want %.12g of %q", a, got.WorstSusceptibility, got.WorstDirection, worst, direction)
		}
		if want := math.Min(x.High/a, z.High/b); !(math.Abs(got.High/want-1) <= 1e-6) || got.Low != -got.High {
			t.Errorf("a = %g: margin %.9g, want %.9g", a, got.High, want)
		}
		if got.Sampled != "the 2 operators of the class, the combination that survives most, 16 fixed combinations, both ways" || len(got.Curve) != 21 {
			t.Errorf("looked at %q, a curve of %d points", got.Sampled, len(got.Curve))
		}
	}
}

// Two and three idle spins: an error of half a product of Pauli matrices turns by p = w T and leaves 1 - F = d/(d+1) sin^2(p/2); all of it survives, and no
// combination does worse, for of all operators of one norm those with two eigenvalues spoil a gate first.
func TestIdleClass(t *testing.T) {
	const threshold = 1e-3
	for _, c := range []struct {
		sites, samples, most int
		sampled              string
	}{
		{2, 50, 2, "the 15 operators of the class, the combination that survives most, 16 fixed combinations, both ways"},
		{2, 50, 1, "the 6 operators of the class, the combination that survives most, 16 fixed combinations, both ways"},
		{3, 1000, 1, "the 9 operators of the class, the combination that survives most, 16 fixed combinations, both ways; the curve along the 4 ways that are worst"},
	} {
		m := idle(c.sites, c.samples)
		d := float64(m.Dim)
		m.Errors = []Class{classOf("any", paulis(c.sites, c.most)...), {Name: "amplitude", Kind: "amplitude"}}
		if c.sites == 2 && c.most == 2 { // the same without a list
			m.Errors = append(m.Errors, Class{Name: "all", Kind: "any"})
		}
		list := judged(t, m, threshold)
		for _, name := range []string{"any", "all"} {
			got, ok := list[name]
			if !ok {
				continue
			}
			if !(math.Abs(got.Susceptibility-1) <= 1e-8) || !(math.Abs(got.WorstSusceptibility-1) <= 1e-8) || got.LeakSusceptibility != nil {
				t.Errorf("%d sites, %s: %+v", c.sites, name, got)
			}
			want := 2 * math.Asin(math.Sqrt(threshold*(d+1)/d)) / m.Span() / perMHz
			if !(math.Abs(got.High/want-1) <= 1e-6) || got.Low != -got.High {
				t.Errorf("%d sites, %s: margin %.9g, want %.9g", c.sites, name, got.High, want)
			}
			for _, p := range got.Curve {
				want := d / (d + 1) * math.Pow(math.Sin(p.Value*perMHz*m.Span()/2), 2)
				if !(math.Abs(p.Infidelity-want) <= 1e-8*(want+1e-3)) {
					t.Errorf("%d sites, %s: curve at %g is %.9g, want %.9g", c.sites, name, p.Value, p.Infidelity, want)
				}
			}
			if got.Sampled != c.sampled || len(got.Curve) != 21 || len(got.Members) != len(paulis(c.sites, c.most)) || got.Members[0] != paulis(c.sites, 1)[0] {
				t.Errorf("%d sites, %s: looked at %q; %d points, members %q", c.sites, name, got.Sampled, len(got.Curve), got.Members)
			}
		}
		if got := list["amplitude"]; got.Susceptibility != 0 || !math.IsInf(got.High, 1) || (len(got.Curve) == 21) != (c.sites == 3) {
			t.Errorf("amplitude of silence: %+v", got)
		}
		// Nothing to search where nothing is withstood, or everything is.
		m.Target[0], m.Target[1], m.Target[m.Dim], m.Target[m.Dim+1] = 0, 1, 1, 0
		if got := judged(t, m, threshold)["any"]; got.High != 0 || got.Low != 0 || math.Signbit(got.Low) || len(got.Curve) != 21 {
			t.Errorf("%d sites, a wrong gate: margins %g and %g", c.sites, got.Low, got.High)
		}
	}
	m := idle(2, 3)
	m.Errors = []Class{classOf("any", "ZZ")}
	if got := judged(t, m, 1)["any"]; !math.IsInf(got.High, 1) || !math.IsInf(got.Low, -1) || got.Sampled != "the one operator of the class, both ways" {
		t.Errorf("nothing is required: %+v", got)
	}
}

// The smallest margin is found wherever the search begins, and whichever way along.
func TestNearest(t *testing.T) {
	ctx := context.Background()
	m := idle(2, 60)
	for k := range m.Samples { // a spin that turns is not alike in both ways
		m.Channels[0].Samples[k] = complex(0.2, 0.1*math.Sin(float64(k)))
		m.Channels[1].Samples[k] = complex(0.1*math.Cos(0.2*float64(k)), 0.1)
	}
	// A little off its target, so that errors do more harm one way than the other.
	mul(m.Target, exponential(hermitian(rand.New(rand.NewPCG(43, 44)), 4, 0.004), 1), evolve(t, newTestEngine(t, m), nil, 0), 4)
	e := newTestEngine(t, m)
	nominal, err := e.nominal(ctx)
	if err != nil || !(nominal > 1e-6 && nominal < 1e-4) {
		t.Fatal(nominal, err)
	}
	var list []course
	want := math.Inf(1)
	for _, name := range paulis(2, 2) {
		o := &probed{probe: newStatic(pauli(name), 4), unit: perMHz}
		e.weigh(o, nil)
		if err := e.search(ctx, []*probed{o}, nominal, 1e-3, searchEnd); err != nil {
			t.Fatal(err)
		}
		want = math.Min(want, math.Min(-o.low, o.high))
		list = append(list, course{o, 1}, course{o, -1})
	}
	harm := make([]float64, len(list))
	for lead := range list {
		for _, c := range list {
			c.o.harm = 0
		}
		list[lead].o.harm = 1
		got, err := e.nearest(ctx, list, harm, nominal, 1e-3)
		if err != nil || !(math.Abs(got/want-1) <= 1e-7) {
			t.Fatalf("beginning with %d: %.9g, want %.9g, %v", lead, got, want, err)
		}
	}
	if len(list) != 30 || slices.Max(harm) < 1e-3 {
		t.Errorf("%d courses, harm up to %g", len(list), slices.Max(harm))
	}
	// A class of one operator that does more harm one way than the other, and less the other way: its margin and its curve are those of the worse.
	ways := 0
	for i := 0; i < len(list); i += 2 {
		o := list[i].o
		if r := -o.low / o.high; ways == 2 || r > 0.999 && r < 1.001 || (r < 1) != (ways == 0) {
			continue
		}
		ways++
		m.Errors = []Class{classOf("any", paulis(2, 2)[i/2])}
		got := judged(t, m, 1e-3)["any"]
		if want := math.Min(-o.low, o.high); !(math.Abs(got.High/want-1) <= 1e-7) {
			t.Errorf("%s: margin %.9g, want %.9g", m.Errors[0].Names[0], got.High, want)
		}
		last := got.Curve[20]
		f, err := m.Against(ctx, [][]complex128{scaled(o.static, last.Value*perMHz), scaled(o.static, -last.Value*perMHz)})
		if err != nil || !(math.Abs(last.Infidelity-slices.Max(f)) <= 1e-9) || !(math.Abs(f[0]/f[1]-1) > 1e-3) {
			t.Errorf("%s: curve ends at %.9g, want the larger of %.9g, %v", m.Errors[0].Names[0], last.Infidelity, f, err)
		}
	}
	if ways != 2 {
		t.Errorf("%d ways of two", ways)
	}
	// A required margin beyond is searched for.
	if got, err := e.nearest(ctx, list, harm, nominal, 1); err != nil || !math.IsInf(got, 1) {
		t.Errorf("nothing is required: %g, %v", got, err)
	}
}

// A curve follows the ways that are worst near the margin: with two operators of a class that are cancelled and one that is not, it is the
// curve of that one.
func TestFewWays(t *testing.T) {
	m := idle(3, 800)
	full := math.Pi / 5 / m.Channels[0].FullScale
	for k := range m.Channels[0].Samples { // spins one and two refocus every ten samples
		if k%10 < 5 {
			m.Channels[0].Samples[k], m.Channels[1].Samples[k] = complex(full, 0), complex(full, 0)
		} else {
			m.Channels[0].Samples[k], m.Channels[1].Samples[k] = complex(-full, 0), complex(-full, 0)
		}
	}
	m.Errors = []Class{classOf("any", "Y11", "Z11", "1Y1", "1Z1", "11Z"), {Name: "11Z", Kind: "static", Operator: pauli("11Z")}}
	e := newTestEngine(t, m)
	if n := e.affordable(); n > 21*2*22 {
		t.Fatalf("%d gates are affordable, and nothing is left out", n)
	}
	list := judged(t, m, 1e-3)
	any, z := list["any"], list["11Z"]
	if !strings.HasSuffix(any.Sampled, "ways that are worst") || !(math.Abs(any.High/z.High-1) <= 1e-6) {
		t.Errorf("margin %.9g, want %.9g; looked at %q", any.High, z.High, any.Sampled)
	}
	m.Errors = m.Errors[1:]
	same, err := m.Curves(context.Background(), 1e-3, []Error{{Name: "11Z", Curve: any.Curve}})
	if err != nil {
		t.Fatal(err)
	}
	for i, p := range same[0].Curve {
		if !(math.Abs(any.Curve[i].Infidelity-p.Infidelity) <= 1e-7) {
			t.Errorf("curve at %g: %.9g, of the worst %.9g", p.Value, any.Curve[i].Infidelity, p.Infidelity)
		}
	}
}

// A tenth of a channel reaches the other spin, in quadrature: a square pulse that turns its own spin by pi turns the other by pi/10, which
// is what an error of that size costs; a constant in both.
func TestCrosstalk(t *testing.T) {
	m := idle(2, 20)
	for k := range m.Channels[0].Samples {
		m.Channels[0].Samples[k] = cmplx.Rect(math.Pi/20/m.Channels[0].FullScale, 0.4)
	}
	m.Target = evolve(t, newTestEngine(t, m), nil, 0)
	m.Errors = []Class{{Name: "x", Kind: "crosstalk", Channels: []string{"q1 drive"}, Operators: [][]complex128{scaled(pauli("1Y"), -1), pauli("1X")}}}
	if err := m.Validate(); err != nil {
		t.Fatal(err)
	}
	got := judged(t, m, 1e-4)["x"]
	want := 100 * 2 / math.Pi * math.Asin(math.Sqrt(1e-4*5/4))
	if got.Unit != "%" || !(math.Abs(got.Susceptibility-1) <= 1e-8) || !(math.Abs(got.High/want-1) <= 1e-6) || !(math.Abs(got.Low/want+1) <= 1e-6) {
		t.Errorf("%+v, want margins of %.9g", got, want)
	}
	for _, p := range got.Curve {
		if want := 0.8 * math.Pow(math.Sin(math.Pi/2*p.Value/100), 2); !(math.Abs(p.Infidelity-want) <= 1e-8*(want+1e-3)) {
			t.Errorf("curve at %g: %.9g, want %.9g", p.Value, p.Infidelity, want)
		}
	}
}

// register is so many spins in a row with exchange, random smooth pulses of n samples through the lines of rack B, and the gate that they make.
func register(t testing.TB, sites, n int, products []string) *Model {
	t.Helper()
	m := idle(sites, n)
	line := rackB(nil).Channels[0]
	for i := range m.Channels {
		c := &m.Channels[i]
		c.Delay, c.Direct, c.Poles, c.Powers, c.Residues = line.Delay, line.Direct, line.Poles, line.Powers, line.Residues
		for k := range c.Samples {
			f := math.Pow(math.Sin(math.Pi*float64(k)/float64(n)), 2)
			c.Samples[k] = complex(0.6*f*math.Sin(0.1*float64(k)*float64(i+1)), 0.5*f*math.Cos(0.2*float64(k)))
		}
	}
	m.WindowStart = line.Delay
	for i := range sites - 1 {
		for _, p := range "XYZ" {
			name := []byte(strings.Repeat("1", sites))
			name[i], name[i+1] = byte(p), byte(p)
			m.Static = add(m.Static, 0.02, pauli(string(name)))
		}
	}
	m.Errors = []Class{classOf("any", products...), {Name: "amplitude", Kind: "amplitude"}}
	e := newTestEngine(t, m)
	m.Target = append([]complex128(nil), e.settle(e.labours[0], evolve(t, e, nil, 0))...)
	return m
}

func BenchmarkRegister(b *testing.B) {
	two := slices.DeleteFunc(paulis(4, 2), func(s string) bool { return strings.Count(s, "1") == 3 })
	for _, c := range []struct {
		sites, samples int
		products       []string
	}{{2, 560, paulis(2, 2)}, {4, 200, paulis(4, 1)}, {4, 200, two}} {
		b.Run(fmt.Sprintf("%d sites, %d samples, %d operators", c.sites, c.samples, len(c.products)), func(b *testing.B) {
			m := register(b, c.sites, c.samples, c.products)
			for b.Loop() {
				if _, err := m.Judge(context.Background(), 1e-4); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
