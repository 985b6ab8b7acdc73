package device

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"reflect"
	"slices"
	"strings"
	"testing"

	"holdfast/hardware/quantity"
)

// manyDrives are fourteen more drives.
var manyDrives = func() string {
	var b strings.Builder
	for i := range 14 {
		fmt.Fprintf(&b, "[[drive]]\nsite = \"q1\"\nchannel = \"%d\"\n", i)
	}
	return b.String()
}()

// An invented device with everything that a file may say of several sites.
const several = `format = 1
name = "Skerry"

[[site]]
name = "q1"
frequency = "5.1 GHz"
detuning = "1 MHz"

[[site]]
name = "q2"
levels = 4
code = [0, 2]
frequency = "5.2 GHz"
anharmonicity = "-220 MHz"
higher = ["3 MHz", "-1 MHz"]

[[site]]
name = "q3"
kind = "spin"
levels = 3
zero = "upper"
quadratic = "2 MHz"

[[drive]]
site = "q1"
channel = "q1 drive"

[[drive]]
site = "q2"
channel = "q2 drive"

[[bias]]
site = "q3"
channel = "q3 field"

[[bias]]
site = "q3"
channel = "q3 side"
axis = "X"

[[coupling]]
kind = "exchange"
between = ["q2", "q1"]
strength = "5 MHz"
rotating_wave = true

[[coupling]]
on = { q2 = "Z", q1 = "X" }
strength = "-200 kHz"

[[crosstalk]]
channel = "q1 drive"
site = "q2"
share = "3 %"
phase = "40 deg"

[[crosstalk]]
channel = "q3 side"
site = "q1"
share = "-200 %"
`

func TestLoadSeveral(t *testing.T) {
	d := mustRead(t, several)
	const mhz = 2 * math.Pi * 1e-3
	close := func(got, want float64) bool { return math.Abs(got-want) <= 1e-15*math.Abs(want) }
	q1, q2, q3 := d.Sites[0], d.Sites[1], d.Sites[2]
	if q1.Kind != Spin || q1.Code != [2]int{0, 1} || !close(q1.Detuning, mhz) ||
		q2.Kind != Ladder || q2.Code != [2]int{0, 2} || q2.Levels != 4 || !close(q2.Anharmonicity, -220*mhz) || len(q2.Higher) != 2 || !close(q2.Higher[0], 3*mhz) || !close(q2.Higher[1], -mhz) ||
		q3.Kind != Spin || q3.Zero != Upper || !close(q3.Quadratic, 2*mhz) || q3.Frequency != 0 {
		t.Errorf("sites %+v", d.Sites)
	}
	if len(d.Couplings) != 2 {
		t.Fatalf("couplings %+v", d.Couplings)
	}
	for i, want := range []Coupling{
		{Kind: Exchange, Sites: []string{"q2", "q1"}, Strength: 5 * mhz, RotatingWave: true},
		{Kind: Product, Sites: []string{"q1", "q2"}, Axes: []string{"X", "Z"}, Strength: -0.2 * mhz},
	} {
		got := d.Couplings[i]
		if !close(got.Strength, want.Strength) {
			t.Errorf("strength %v, want %v", got.Strength, want.Strength)
		}
		if got.Strength = want.Strength; !reflect.DeepEqual(got, want) {
			t.Errorf("coupling %+v, want %+v", got, want)
		}
	}
	if c := d.Crosstalk; len(c) != 2 || c[0].Channel != "q1 drive" || c[0].Site != "q2" || c[0].Share != 0.03 || !close(c[0].Phase, math.Pi*2/9) || c[1] != (Crosstalk{"q3 side", "q1", -2, 0}) {
		t.Errorf("crosstalk %+v", d.Crosstalk)
	}
	if got, want := d.Channels(), []string{"q1 drive", "q2 drive", "q3 field", "q3 side"}; !slices.Equal(got, want) {
		t.Errorf("channels %q", got)
	}
	if d.Dim() != 24 || !slices.Equal(d.Levels(), []int{2, 4, 3}) {
		t.Errorf("%d levels, %v", d.Dim(), d.Levels())
	}
	// |q1 q2 q3> at 12 q1 + 3 q2 + q3, with levels 0 and 2 of q2.
	if got, want := d.CodeSpace(), []int{0, 1, 6, 7, 12, 13, 18, 19}; !slices.Equal(got, want) {
		t.Errorf("code space %v, want %v", got, want)
	}
	if i, ok := d.Site("q3"); i != 2 || !ok {
		t.Errorf("site q3: %d, %v", i, ok)
	}
	if i, ok := d.Site("q4"); i != 0 || ok {
		t.Errorf("site q4: %d, %v", i, ok)
	}
	for channel, want := range map[string]int{"q1 drive": 0, "q2 drive": 1, "q3 side": 2} {
		if site, drives := d.Aim(channel); site != want || drives != (want < 2) {
			t.Errorf("%s aims at site %d, %v", channel, site, drives)
		}
	}
}

// What the keys mean when they are left out, for every kind of site.
func TestSiteDefaults(t *testing.T) {
	for _, c := range []struct{ text, kind string }{
		{"", Spin}, {"levels = 2\nkind = 'ladder'", Ladder}, {"levels = 3\nanharmonicity = '-1 MHz'", Ladder}, {"levels = 16\nkind = 'spin'", Spin},
		{"higher = ['1 MHz']\nquadratic = '1 MHz'\nanharmonicity = '1 MHz'", Spin}, // of no effect on two levels
	} {
		d := mustRead(t, "format = 1\nname = 'd'\n[[site]]\nname = 'q1'\n"+c.text+"\n[[drive]]\nsite = 'q1'\nchannel = 'c'\n")
		if s := d.Sites[0]; s.Kind != c.kind || s.Code != [2]int{0, 1} {
			t.Errorf("%s: %+v", c.text, s)
		}
		if d.Dim() == 2 && d.Static().Norm() != 0 {
			t.Errorf("%s: static %v", c.text, d.Static())
		}
	}
	// A site that only couplings reach.
	d := mustRead(t, "format = 1\nname = 'd'\n[[site]]\nname = 'a'\n[[site]]\nname = 'b'\n[[bias]]\nsite = 'b'\nchannel = 'c'\n")
	if got := d.Static(); got.N != 4 || got.Norm() != 0 {
		t.Errorf("static %v", got)
	}
}

// site makes a device of one site for what has no file.
func site(s Site) *Device { return &Device{Sites: []Site{s}} }

// Spins of every size by what makes them spins: [X, Y] = 2i Z and so on, X^2 + Y^2 + Z^2 = 4 s(s+1), and Z with the values 2m, the largest first.
func TestSpinOperators(t *testing.T) {
	for levels := 2; levels <= mostLevels; levels++ {
		d := site(Site{Kind: Spin, Levels: levels})
		ops := []Matrix{d.Local(0, "X"), d.Local(0, "Y"), d.Local(0, "Z")}
		square := Zero(levels)
		for i, a := range ops {
			b, c := ops[(i+1)%3], ops[(i+2)%3]
			if !near(a.Mul(b).Add(-1, b.Mul(a)), c.Scale(2i), 1e-12) || !near(a, a.Adjoint(), 0) {
				t.Errorf("%d levels: commutator of operator %d", levels, i)
			}
			square = square.Add(1, a.Mul(a))
		}
		if !near(square, Identity(levels).Scale(complex(float64(levels*levels-1), 0)), 1e-12) {
			t.Errorf("%d levels: X^2 + Y^2 + Z^2 = %v", levels, square)
		}
		for k := range levels {
			for l := range levels {
				want := complex(0, 0)
				if k == l {
					want = complex(float64(levels-1-2*k), 0)
				}
				if got := ops[2].At(k, l); got != want {
					t.Errorf("%d levels: Z has %v at %d, %d, want %v", levels, got, k, l, want)
				}
			}
			if k > 0 && !(real(ops[0].At(k-1, k)) > 0) {
				t.Errorf("%d levels: X has %v below the diagonal", levels, ops[0].At(k-1, k))
			}
		}
	}
}

// Energies against the sums of the definition, added level by level: the k-th difference of a ladder's energies is constant but for Higher, and a spin's
// are those of m and m^2.
func TestStaticOfLevels(t *testing.T) {
	s := Site{Levels: 7, Zero: Lower, Detuning: 0.3, Anharmonicity: -1.4, Higher: []float64{0.02, -0.003}}
	// Pascal's rule: e'(n) = E(n+1) - E(n) is a polynomial of the same coefficients, one place lower.
	coefficients := []float64{0, 0.3, -1.4, 0.02, -0.003}
	var energy func(n, from int) float64
	energy = func(n, from int) float64 {
		switch {
		case from >= len(coefficients):
			return 0
		case n == 0:
			return coefficients[from]
		}
		return energy(n-1, from) + energy(n-1, from+1)
	}
	m := site(s).Static()
	for n := range 7 {
		if got, want := m.At(n, n), complex(energy(n, 0), 0); !(cmplx.Abs(got-want) <= 1e-14) {
			t.Errorf("level %d: %v, want %v", n, got, want)
		}
	}
	// More figures than levels are of no effect, and |0> = m = +1, the highest for Upper; spin 1 and spin 3/2 by hand.
	short := Site{Levels: 3, Zero: Lower, Detuning: 0.3, Anharmonicity: -1.4}
	long := short
	long.Higher = []float64{5, 6}
	if !near(site(short).Static(), site(long).Static(), 0) {
		t.Errorf("higher levels change three: %v", site(long).Static())
	}
	for _, c := range []struct {
		levels int
		zero   string
		want   []float64
	}{
		{3, Upper, []float64{0.3 + 0.1/3, -0.2 / 3, -0.3 + 0.1/3}},
		{3, Lower, []float64{-0.3 + 0.1/3, -0.2 / 3, 0.3 + 0.1/3}},
		{4, Upper, []float64{0.45 + 0.1, 0.15 - 0.1, -0.15 - 0.1, -0.45 + 0.1}},
	} {
		m := site(Site{Kind: Spin, Levels: c.levels, Zero: c.zero, Detuning: 0.3, Quadratic: 0.1}).Static()
		if !(cmplx.Abs(m.Trace()) <= 1e-15) {
			t.Errorf("trace %v", m.Trace())
		}
		for k, want := range c.want {
			if got := m.At(k, k); !(cmplx.Abs(got-complex(want, 0)) <= 1e-15) {
				t.Errorf("spin of %d levels, %s, level %d: %v, want %v", c.levels, c.zero, k, got, want)
			}
		}
	}
}

// One spin is what it always was, to the last bit.
func TestOneSpinBits(t *testing.T) {
	same := func(what string, got Matrix, want []complex128) {
		t.Helper()
		for i := range want {
			g, w := got.Data[i], want[i]
			if math.Float64bits(real(g)) != math.Float64bits(real(w)) || math.Float64bits(imag(g)) != math.Float64bits(imag(w)) {
				t.Errorf("%s entry %d: %v, want %v", what, i, g, w)
			}
		}
	}
	for _, zero := range []string{Lower, Upper} {
		d := &Device{Sites: []Site{{Name: "q", Levels: 2, Zero: zero, Detuning: 0.1}}, Drives: []Drive{{Site: "q", Channel: "c"}}, Biases: []Bias{{Site: "q", Channel: "b", Axis: "Y"}}}
		x, _ := Operator("X")
		y, _ := Operator("Y")
		z, _ := Operator("Z")
		sign := complex128(1)
		if zero == Upper {
			sign = -1
		}
		paths := d.Paths("c", "I cos + Q sin")
		if len(paths) != 1 || paths[0].Frequency != 0 || len(paths[0].Operators) != 2 {
			t.Fatalf("%+v", paths)
		}
		same("I", paths[0].Operators[0], x.Scale(0.5).Data)
		same("Q", paths[0].Operators[1], y.Scale(sign*0.5).Data)
		same("bias", d.Paths("b", "")[0].Operators[0], y.Scale(0.5).Data)
		same("shift", d.ShiftOperator("c"), z.Scale(0.5).Data)
		same("static", d.Static(), z.Scale(-sign*0.05).Data)
	}
}

// at gives the entry of a product of operators on single sites, from its definition.
func at(d *Device, ops map[int]Matrix, row, col int) complex128 {
	v := complex128(1)
	for s := len(d.Sites) - 1; s >= 0; s-- {
		n := d.Sites[s].Levels
		r, c := row%n, col%n
		row, col = row/n, col/n
		if o, ok := ops[s]; ok {
			v *= o.At(r, c)
		} else if r != c {
			v = 0
		}
	}
	return v
}

func randomMatrix(r *rand.Rand, n int) Matrix {
	m := Zero(n)
	for i := range m.Data {
		m.Data[i] = complex(r.NormFloat64(), r.NormFloat64())
	}
	return m
}

func TestEmbed(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 6))
	d := &Device{Sites: []Site{{Levels: 2}, {Levels: 3}, {Levels: 4}}}
	for _, sites := range [][]int{{}, {0}, {1}, {2}, {0, 2}, {1, 2}, {0, 1, 2}} {
		ops := map[int]Matrix{}
		for _, s := range sites {
			ops[s] = randomMatrix(r, d.Sites[s].Levels)
		}
		m := d.Embed(ops)
		for i := range 24 {
			for j := range 24 {
				if got, want := m.At(i, j), at(d, ops, i, j); !(cmplx.Abs(got-want) <= 1e-13) {
					t.Fatalf("sites %v at %d, %d: %v, want %v", sites, i, j, got, want)
				}
			}
		}
	}
	// A copy, that callers may change.
	one := &Device{Sites: []Site{{Levels: 2}}}
	a := Identity(2)
	one.Embed(map[int]Matrix{0: a}).Data[0] = 7
	if a.Data[0] != 1 {
		t.Error("Embed gives its operand away")
	}
	defer func() {
		if recover() == nil {
			t.Error("an operator of the wrong dimension was embedded")
		}
	}()
	d.Embed(map[int]Matrix{1: Identity(2)})
}

// Traceless, Hermitian, orthogonal, of norm sqrt(n), and as many as there are.
func TestBasis(t *testing.T) {
	for levels := 2; levels <= mostLevels; levels++ {
		ops, names := site(Site{Levels: levels}).Basis(0)
		if len(ops) != levels*levels-1 || len(names) != len(ops) {
			t.Fatalf("%d levels: %d operators, %d names", levels, len(ops), len(names))
		}
		for i, a := range ops {
			if !(cmplx.Abs(a.Trace()) <= 1e-13) || !near(a, a.Adjoint(), 0) {
				t.Errorf("%d levels, %s: trace %v", levels, names[i], a.Trace())
			}
			for j, b := range ops[:i+1] {
				want := 0.0
				if i == j {
					want = float64(levels)
				}
				got := complex(0, 0) // Tr a'b
				for k, v := range a.Data {
					got += cmplx.Conj(v) * b.Data[k]
				}
				if !(cmplx.Abs(got-complex(want, 0)) <= 1e-12) {
					t.Errorf("%d levels, %s and %s: %v, want %v", levels, names[i], names[j], got, want)
				}
			}
		}
	}
	if _, names := site(Site{Levels: 2}).Basis(0); !slices.Equal(names, []string{"X", "Y", "Z"}) {
		t.Errorf("names %q", names)
	}
	ops, names := site(Site{Levels: 3}).Basis(0)
	if !slices.Equal(names, []string{"Re 0-1", "Im 0-1", "Re 0-2", "Im 0-2", "Re 1-2", "Im 1-2", "level 1", "level 2"}) {
		t.Errorf("names %q", names)
	}
	// On the two levels of a transition they have the signs of X, Y and Z.
	r := complex(math.Sqrt(1.5), 0)
	if ops[4].At(1, 2) != ops[4].At(2, 1) || !(real(ops[4].At(1, 2)) > 0) || !(imag(ops[5].At(2, 1)) > 0) || !(cmplx.Abs(ops[6].At(0, 0)-r) <= 1e-15) || !(real(ops[7].At(2, 2)) < 0) {
		t.Errorf("signs of %v", ops)
	}
}

// spinOf gives Sx, Sy, Sz of a spin by its quantum numbers, m = s first: <m+1|S+|m> = sqrt(s(s+1) - m(m+1)).
func spinOf(levels int) [3]Matrix {
	s := float64(levels-1) / 2
	var o [3]Matrix
	for k := range o {
		o[k] = Zero(levels)
	}
	for k := range levels {
		m := s - float64(k)
		o[2].Data[k*levels+k] = complex(m, 0)
		if k > 0 {
			r := complex(math.Sqrt(s*(s+1)-m*(m+1))/2, 0)
			o[0].Data[(k-1)*levels+k], o[0].Data[k*levels+k-1] = r, r
			o[1].Data[(k-1)*levels+k], o[1].Data[k*levels+k-1] = -1i*r, 1i*r
		}
	}
	return o
}

// ladderOf gives the same of a ladder: X/2, Y/2 and Z/2 with X = a + a', Y = i(a' - a), Z = -2n.
func ladderOf(levels int) [3]Matrix {
	a, n := Zero(levels), Zero(levels)
	for k := range levels {
		n.Data[k*levels+k] = complex(float64(k), 0)
		if k > 0 {
			a.Data[(k-1)*levels+k] = complex(math.Sqrt(float64(k)), 0)
		}
	}
	return [3]Matrix{a.Add(1, a.Adjoint()).Scale(0.5), a.Adjoint().Add(-1, a).Scale(0.5i), n.Scale(-1)}
}

// parts gives S of a site, what takes a quantum out, and the number of the level, by their definitions.
func parts(s Site) (spin [3]Matrix, lower, number Matrix) {
	if spin = spinOf(s.Levels); s.Kind == Ladder {
		spin = ladderOf(s.Levels)
	}
	sign := complex128(1i)
	if s.Zero == Upper {
		sign = -1i
	}
	number = Zero(s.Levels)
	for k := range s.Levels {
		n := k
		if s.Zero == Upper {
			n = s.Levels - 1 - k
		}
		number.Data[k*s.Levels+k] = complex(float64(n), 0)
	}
	return spin, spin[0].Add(sign, spin[1]), number
}

// sorts of sites, in frames or not.
var sorts = []Site{
	{Kind: Spin, Levels: 2, Zero: Lower}, {Kind: Spin, Levels: 2, Zero: Upper}, {Kind: Ladder, Levels: 3, Zero: Lower},
	{Kind: Spin, Levels: 3, Zero: Upper}, {Kind: Spin, Levels: 4, Zero: Lower}, {Kind: Ladder, Levels: 4, Zero: Lower},
}

func TestLiftAt(t *testing.T) {
	for _, s := range sorts {
		spin, _, _ := parts(s)
		d := site(s)
		for k, axis := range OperatorNames() {
			if got := d.Local(0, axis); !near(got, spin[k].Scale(2), 1e-14) {
				t.Errorf("%s of %+v: %v", axis, s, got)
			}
		}
		x, _ := Operator("X")
		y, _ := Operator("Y")
		z, _ := Operator("Z")
		want := spin[0].Scale(0.6).Add(-1.4, spin[1]).Add(0.4, spin[2])
		if got := d.LiftAt(0, x.Scale(0.3).Add(-0.7, y).Add(0.2, z)); !near(got, want, 1e-14) {
			t.Errorf("combination on %+v: %v, want %v", s, got, want)
		}
	}
}

// Every kind of coupling on every pair of sites, on sites 0 and 2 of three, against the sums of its definition.
func TestCouplings(t *testing.T) {
	const j = 0.7
	for _, s1 := range sorts {
		for _, s2 := range sorts {
			s1.Name, s2.Name = "a", "b"
			d := &Device{Sites: []Site{s1, {Name: "idle", Levels: 2}, s2}}
			spin1, lower1, number1 := parts(s1)
			spin2, lower2, number2 := parts(s2)
			pair := func(a, b Matrix) Matrix {
				m := Zero(d.Dim())
				for r := range m.N {
					for c := range m.N {
						m.Data[r*m.N+c] = at(d, map[int]Matrix{0: a, 2: b}, r, c)
					}
				}
				return m
			}
			dot := pair(spin1[0], spin2[0]).Add(1, pair(spin1[1], spin2[1])).Add(1, pair(spin1[2], spin2[2]))
			for _, c := range []struct {
				coupling Coupling
				want     Matrix
			}{
				{Coupling{Kind: Product, Sites: []string{"a", "b"}, Axes: []string{"Z", "X"}}, pair(spin1[2], spin2[0]).Scale(2 * j)},
				{Coupling{Kind: Product, Sites: []string{"b", "a"}, Axes: []string{"Y", "Z"}}, pair(spin1[2], spin2[1]).Scale(2 * j)},
				{Coupling{Kind: Exchange, Sites: []string{"a", "b"}}, pair(lower1, lower2.Adjoint()).Add(1, pair(lower1.Adjoint(), lower2)).Scale(j)},
				{Coupling{Kind: Heisenberg, Sites: []string{"b", "a"}}, dot.Scale(j)},
				{Coupling{Kind: Dipolar, Sites: []string{"a", "b"}}, pair(spin1[2], spin2[2]).Scale(3).Add(-1, dot).Scale(j)},
				{Coupling{Kind: Dispersive, Sites: []string{"a", "b"}}, pair(number1, number2).Scale(j)},
			} {
				c.coupling.Strength = j
				d.Couplings = []Coupling{c.coupling}
				if got := d.Static(); !near(got, c.want, 1e-13) {
					t.Errorf("%+v of %+v and %+v:\n got %v\nwant %v", c.coupling, s1, s2, got, c.want)
				}
				if d.Rotating() != nil || d.Dropped() != nil {
					t.Errorf("%+v turns without frequencies", c.coupling)
				}
			}
		}
	}
}

// What textbooks say of two spins, entry by entry: exchange is (XX + YY) J/2, which takes |01> to |10> at J; the triplet and the singlet of Heisenberg have
// J/4 and -3J/4; the secular dipolar coupling is J/2, -J/2, -J/2, J/2 with -J/2 between the middle two; a product ZZ of strength J is +-J/2; dispersive shifts |11>
// of lower spins and |00> of upper ones.
func TestCouplingsOfTwoSpins(t *testing.T) {
	const j = 0.6
	for _, c := range []struct {
		kind string
		zero string
		want [][]complex128
	}{
		{Exchange, Lower, [][]complex128{{0, 0, 0, 0}, {0, 0, j, 0}, {0, j, 0, 0}, {0, 0, 0, 0}}},
		{Exchange, Upper, [][]complex128{{0, 0, 0, 0}, {0, 0, j, 0}, {0, j, 0, 0}, {0, 0, 0, 0}}},
		{Heisenberg, Lower, [][]complex128{{j / 4, 0, 0, 0}, {0, -j / 4, j / 2, 0}, {0, j / 2, -j / 4, 0}, {0, 0, 0, j / 4}}},
		{Dipolar, Lower, [][]complex128{{j / 2, 0, 0, 0}, {0, -j / 2, -j / 2, 0}, {0, -j / 2, -j / 2, 0}, {0, 0, 0, j / 2}}},
		{Dispersive, Lower, [][]complex128{{0, 0, 0, 0}, {0, 0, 0, 0}, {0, 0, 0, 0}, {0, 0, 0, j}}},
		{Dispersive, Upper, [][]complex128{{j, 0, 0, 0}, {0, 0, 0, 0}, {0, 0, 0, 0}, {0, 0, 0, 0}}},
		{Product, Lower, [][]complex128{{j / 2, 0, 0, 0}, {0, -j / 2, 0, 0}, {0, 0, -j / 2, 0}, {0, 0, 0, j / 2}}},
	} {
		d := &Device{
			Sites:     []Site{{Name: "a", Levels: 2, Zero: c.zero}, {Name: "b", Levels: 2, Zero: c.zero}},
			Couplings: []Coupling{{Kind: c.kind, Sites: []string{"a", "b"}, Axes: []string{"Z", "Z"}, Strength: j}},
		}
		if got := d.Static(); !near(got, FromRows(c.want), 1e-15) {
			t.Errorf("%s, |0> %s: %v", c.kind, c.zero, got)
		}
	}
}

// A spin 1/2 and a spin 1 under Heisenberg: total spin 3/2, four times at J/2, and 1/2, twice at -J (J/2 (S(S+1) - 3/4 - 2)).
func TestHeisenbergEnergies(t *testing.T) {
	d := &Device{
		Sites:     []Site{{Name: "a", Levels: 2}, {Name: "b", Levels: 3, Kind: Spin}},
		Couplings: []Coupling{{Kind: Heisenberg, Sites: []string{"a", "b"}, Strength: 1}},
	}
	h := d.Static()
	if p := h.Add(-0.5, Identity(6)).Mul(h.Add(1, Identity(6))); !(p.Norm() <= 1e-14) || !(cmplx.Abs(h.Trace()) <= 1e-14) {
		t.Errorf("energies of %v", h)
	}
}

// framed gives a device of the sites, each with a frequency, and F, by which its frames turn: -+f Sz of spins and f n of ladders.
func framed(r *rand.Rand, sites ...Site) (d *Device, f []float64) {
	d = &Device{}
	for i := range sites {
		s := sites[i]
		s.Name, s.Frequency, s.Detuning = fmt.Sprintf("q%d", i), 4+2*r.Float64(), 0.1*r.NormFloat64()
		d.Sites = append(d.Sites, s)
	}
	f = make([]float64, d.Dim())
	for state := range f {
		rest := state
		for i := len(d.Sites) - 1; i >= 0; i-- {
			s := d.Sites[i]
			frame := 2*math.Pi*s.Frequency - s.Detuning
			spin, _, _ := parts(s)
			m := real(spin[2].At(rest%s.Levels, rest%s.Levels)) // Sz of a spin, -n of a ladder
			if s.Zero == Upper {
				f[state] += frame * m
			} else {
				f[state] -= frame * m
			}
			rest /= s.Levels
		}
	}
	return d, f
}

// turned gives exp(iFt) v exp(-iFt).
func turned(v Matrix, f []float64, time float64) Matrix {
	m := Zero(v.N)
	for i := range v.N {
		for j := range v.N {
			m.Data[i*v.N+j] = cmplx.Rect(1, f[i]*time) * v.At(i, j) * cmplx.Rect(1, -f[j]*time)
		}
	}
	return m
}

func sum(m Matrix, time float64, terms ...[]Rotating) Matrix {
	for _, list := range terms {
		for _, r := range list {
			m = m.Add(complex(math.Cos(r.Frequency*time), 0), r.Cosine).Add(complex(math.Sin(r.Frequency*time), 0), r.Sine)
		}
	}
	return m
}

// Couplings in the frames of the sites against the transformation itself, at random times, for every kind and every pair of sites.
func TestRotating(t *testing.T) {
	r := rand.New(rand.NewPCG(7, 8))
	for _, s1 := range sorts {
		for _, s2 := range sorts {
			for _, c := range []Coupling{
				{Kind: Product, Sites: []string{"q0", "q1"}, Axes: []string{"X", "Y"}},
				{Kind: Product, Sites: []string{"q0", "q2"}, Axes: []string{"Z", "Y"}},
				{Kind: Product, Sites: []string{"q0", "q1", "q2"}, Axes: []string{"X", "X", "Y"}},
				{Kind: Exchange, Sites: []string{"q0", "q2"}}, {Kind: Heisenberg, Sites: []string{"q2", "q0"}},
				{Kind: Dipolar, Sites: []string{"q0", "q2"}}, {Kind: Dispersive, Sites: []string{"q0", "q2"}},
			} {
				d, f := framed(r, s1, Site{Levels: 2, Zero: Upper}, s2)
				c.Strength = r.NormFloat64()
				bare := d.Static()
				lab := &Device{Sites: slices.Clone(d.Sites), Couplings: []Coupling{c}}
				for i := range lab.Sites {
					lab.Sites[i].Frequency = 0
				}
				v := lab.Static().Add(-1, bare)
				d.Couplings = []Coupling{c}
				turning := d.Rotating()
				// What stands still and what turns at each frequency; with rotating_wave the latter is left out and listed.
				d.Couplings[0].RotatingWave = true
				if len(d.Rotating()) != 0 || !reflect.DeepEqual(d.Dropped(), turning) {
					t.Errorf("%+v: what is left out is not what turns", c)
				}
				static := d.Static().Add(-1, bare)
				for i, term := range turning {
					if !(term.Frequency > 0) || i > 0 && !(term.Frequency > turning[i-1].Frequency) || !near(term.Cosine, term.Cosine.Adjoint(), 0) || !near(term.Sine, term.Sine.Adjoint(), 0) {
						t.Errorf("%+v: term %d of %g rad/ns", c, i, term.Frequency)
					}
				}
				for range 3 {
					time := 100 * r.Float64()
					if got, want := sum(static, time, turning), turned(v, f, time); !near(got, want, 1e-9) {
						t.Errorf("%+v of %+v and %+v at %g ns: off by %g of %g", c, s1, s2, time, got.Add(-1, want).Norm(), want.Norm())
					}
				}
				if c.Kind == Dispersive && len(turning) != 0 || (c.Kind == Exchange || c.Kind == Heisenberg) && s1.Zero == s2.Zero && len(turning) != 1 {
					t.Errorf("%+v of %+v and %+v: %d frequencies", c, s1, s2, len(turning))
				}
			}
		}
	}
}

// Couplings of several kinds together: the frequencies that they have in common stand once; sites that turn alike stand still towards one another;
// a coupling between sites without frequencies is as stated, beside others with them.
func TestRotatingTogether(t *testing.T) {
	r := rand.New(rand.NewPCG(9, 10))
	d, f := framed(r, Site{Kind: Ladder, Levels: 3, Zero: Lower}, Site{Levels: 2, Zero: Lower}, Site{Levels: 2, Zero: Upper})
	// The frames of the first two turn alike, though their transitions do not.
	d.Sites[1].Frequency = d.Sites[0].Frequency + 0.01
	d.Sites[1].Detuning = d.Sites[0].Detuning + 2*math.Pi*0.01
	for state := range f {
		rest := []int{state / 4, state / 2 % 2, state % 2}
		one, two := 2*math.Pi*d.Sites[0].Frequency-d.Sites[0].Detuning, 2*math.Pi*d.Sites[2].Frequency-d.Sites[2].Detuning
		f[state] = one*float64(rest[0]+rest[1]) + two*float64(1-rest[2])
	}
	d.Couplings = []Coupling{
		{Kind: Exchange, Sites: []string{"q0", "q1"}, Strength: 0.3},
		{Kind: Product, Sites: []string{"q0", "q1"}, Axes: []string{"X", "X"}, Strength: 0.5, RotatingWave: true},
		{Kind: Product, Sites: []string{"q0", "q2"}, Axes: []string{"X", "Y"}, Strength: 0.2},
		{Kind: Product, Sites: []string{"q1", "q2"}, Axes: []string{"Y", "Y"}, Strength: 0.1},
	}
	bare := &Device{Sites: d.Sites}
	lab := &Device{Sites: slices.Clone(d.Sites), Couplings: d.Couplings}
	for i := range lab.Sites {
		lab.Sites[i].Frequency = 0
	}
	v := lab.Static().Add(-1, bare.Static())
	static := d.Static().Add(-1, bare.Static())
	if kept, dropped := d.Rotating(), d.Dropped(); len(kept) != 2 || len(dropped) != 1 {
		t.Errorf("%d frequencies kept, %d left out", len(kept), len(dropped))
	}
	for range 5 {
		time := 100 * r.Float64()
		if got, want := sum(static, time, d.Rotating(), d.Dropped()), turned(v, f, time); !near(got, want, 1e-9) {
			t.Errorf("at %g ns: off by %g", time, got.Add(-1, want).Norm())
		}
	}
	// XX + YY of alike frames is the half of XX that stands still, and the exchange is all there.
	if got := static.At(4, 2); !(cmplx.Abs(got-complex(0.3+0.25, 0)) <= 1e-12) {
		t.Errorf("|010> to |100> at %v", got)
	}
	d.Sites[2].Frequency, d.Sites[1].Frequency = 0, 0
	d.Couplings = d.Couplings[3:]
	d.Couplings = append(d.Couplings, Coupling{Kind: Product, Sites: []string{"q1", "q2"}, Axes: []string{"X", "X"}, Strength: 0.1})
	if d.Rotating() != nil || !(math.Abs(real(d.Static().At(1, 2))-0.1) <= 1e-15) {
		t.Errorf("sites without frequency: %v, %v", d.Rotating(), d.Static())
	}
}

// Frames that differ by less than 1 Hz are one, by what a file's decimals leave; by more they are two.
func TestStill(t *testing.T) {
	for _, c := range []struct {
		apart float64 // Hz
		terms int
	}{{0.9, 0}, {-0.9, 0}, {1.1, 1}, {-1.1, 1}} {
		d := &Device{
			Sites:     []Site{{Name: "a", Levels: 2, Zero: Lower, Frequency: 5}, {Name: "b", Levels: 2, Zero: Lower, Frequency: 5, Detuning: 2 * math.Pi * c.apart * 1e-9}},
			Couplings: []Coupling{{Kind: Exchange, Sites: []string{"a", "b"}, Strength: 1}},
			Drives:    []Drive{{"a", "c", 0}}, Crosstalk: []Crosstalk{{"c", "b", 0.1, 0}},
		}
		if got := len(d.Rotating()); got != c.terms {
			t.Errorf("%g Hz apart: %d terms turn", c.apart, got)
		}
		if got := len(d.Paths("c", "I cos + Q sin")); got != 1+c.terms {
			t.Errorf("%g Hz apart: %d paths", c.apart, got)
		}
		if p := d.Reach("c", 1, "I cos + Q sin"); (p.Frequency == 0) != (c.terms == 0) {
			t.Errorf("%g Hz apart: reached at %g rad/ns", c.apart, p.Frequency)
		}
	}
}

// A channel with the carrier of its own site, seen at another one: in the laboratory the field is (I cos w1 t +- Q sin w1 t), of the share and with the
// phase of the crosstalk, times X of that site; in the site's frame it is the path's and a part that turns at w1 + w2 and is averaged away. That
// part changes sign after half a turn, and nothing else does.
func TestCrosstalkAgainstCarrier(t *testing.T) {
	r := rand.New(rand.NewPCG(11, 12))
	for _, own := range []Site{{Levels: 2, Zero: Lower}, {Levels: 2, Zero: Upper}} {
		for _, s2 := range sorts {
			for _, mixing := range []string{"I cos + Q sin", "I cos - Q sin"} {
				d, f := framed(r, own, s2)
				d.Drives = []Drive{{Site: "q0", Channel: "c"}}
				share, phase := 0.3*r.Float64(), 6*r.Float64()
				d.Crosstalk = []Crosstalk{{"c", "q1", share, phase}}
				paths := d.Paths("c", mixing)
				if len(paths) != 2 || paths[0].Frequency != 0 {
					t.Fatalf("%d paths", len(paths))
				}
				w1 := 2*math.Pi*d.Sites[0].Frequency - d.Sites[0].Detuning
				w2 := 2*math.Pi*d.Sites[1].Frequency - d.Sites[1].Detuning
				spin, _, _ := parts(s2)
				x := d.Embed(map[int]Matrix{1: spin[0].Scale(2)})
				u := complex(r.NormFloat64(), r.NormFloat64())
				fast := func(time float64) Matrix {
					there := u * cmplx.Rect(share, phase)
					field := real(there)*math.Cos(w1*time) + imag(there)*math.Sin(w1*time)
					if mixing == "I cos - Q sin" {
						field = real(there)*math.Cos(w1*time) - imag(there)*math.Sin(w1*time)
					}
					p := u * cmplx.Rect(1, -paths[1].Frequency*time)
					return turned(x.Scale(complex(field, 0)), f, time).Add(complex(-real(p), 0), paths[1].Operators[0]).Add(complex(-imag(p), 0), paths[1].Operators[1])
				}
				for range 3 {
					time := 10 * r.Float64()
					a, b := fast(time), fast(time+math.Pi/(w1+w2))
					if !(a.Norm() >= 0.1*cmplx.Abs(u)*share) || !near(a, b.Scale(-1), 1e-12) {
						t.Errorf("own %s, other %+v, %s: %g and %g, together %g", own.Zero, s2, mixing, a.Norm(), b.Norm(), a.Add(1, b).Norm())
					}
				}
			}
		}
	}
}

// Crosstalk in one frame belongs to the first path; what turns alike is one path; frequencies ascend, either sign; biases have a share alone.
func TestPaths(t *testing.T) {
	sites := []Site{{Name: "a", Levels: 2, Zero: Lower, Frequency: 5}, {Name: "b", Levels: 3, Zero: Lower, Frequency: 5}, {Name: "c", Levels: 2, Zero: Upper, Frequency: 4.9}, {Name: "e", Levels: 2, Zero: Lower, Frequency: 5.2}, {Name: "f", Levels: 2, Zero: Lower, Frequency: 5.2}}
	d := &Device{
		Sites: sites, Drives: []Drive{{Site: "a", Channel: "d"}}, Biases: []Bias{{Site: "b", Channel: "x", Axis: "X"}},
		Crosstalk: []Crosstalk{{"d", "c", 0.5, 0}, {"d", "e", 0.2, math.Pi / 2}, {"d", "b", 0.1, math.Pi}, {"d", "f", 0.3, 0}, {"x", "c", -0.4, 0}},
	}
	half := func(site int, axis string) Matrix {
		return d.Embed(map[int]Matrix{site: d.Local(site, axis).Scale(0.5)})
	}
	const mixing = "I cos + Q sin"
	paths := d.Paths("d", mixing)
	if len(paths) != 3 {
		t.Fatalf("%d paths", len(paths))
	}
	for i, want := range []Path{
		{0, []Matrix{half(0, "X").Add(-0.1, half(1, "X")), half(0, "Y").Add(-0.1, half(1, "Y"))}},
		// i u in the place of u: u_I on Y, -u_Q on X.
		{-2 * math.Pi * 0.2, []Matrix{half(4, "X").Scale(0.3).Add(0.2, half(3, "Y")), half(4, "Y").Scale(0.3).Add(-0.2, half(3, "X"))}},
		{2 * math.Pi * 0.1, []Matrix{half(2, "X").Scale(0.5), half(2, "Y").Scale(-0.5)}},
	} {
		got := paths[i]
		if !(math.Abs(got.Frequency-want.Frequency) <= 1e-12) || len(got.Operators) != 2 || !near(got.Operators[0], want.Operators[0], 1e-15) || !near(got.Operators[1], want.Operators[1], 1e-15) {
			t.Errorf("path %d turns at %g, want %g", i, got.Frequency, want.Frequency)
		}
	}
	if got := d.Paths("x", ""); len(got) != 1 || got[0].Frequency != 0 || len(got[0].Operators) != 1 || !near(got[0].Operators[0], half(1, "X").Add(-0.4, half(2, "X")), 1e-15) {
		t.Errorf("bias %v", got)
	}
	if d.Paths("other", mixing) != nil {
		t.Error("a channel of another device has paths")
	}
	if got := d.ShiftOperator("x"); !near(got, half(1, "Z"), 0) {
		t.Errorf("shift %v", got)
	}
	if got := d.ShiftOperator("d"); !near(got, half(0, "Z"), 0) {
		t.Errorf("shift %v", got)
	}
	// What a channel would do to another site whole, and where it stands still.
	if p := d.Reach("d", 1, mixing); p.Frequency != 0 || !near(p.Operators[1], half(1, "Y"), 0) {
		t.Errorf("reach %v", p)
	}
	if p := d.Reach("d", 2, "I cos - Q sin"); !(math.Abs(p.Frequency+2*math.Pi*0.1) <= 1e-12) || !near(p.Operators[1], half(2, "Y"), 0) {
		t.Errorf("reach %v", p)
	}
	// Without frequencies every site is of one frame.
	for i := range d.Sites {
		d.Sites[i].Frequency = 0
	}
	if got := d.Paths("d", mixing); len(got) != 1 {
		t.Errorf("%d paths without frequencies", len(got))
	}
}

// One mistake each in the device of several sites.
func TestRefusesSeveral(t *testing.T) {
	for _, c := range []struct{ old, new, want string }{
		{`name = "q2"`, `name = "q1"`, `10: site[1].name: found "q1" a second time; allowed: a name of its own for each site`},
		{"levels = 4", "levels = 17", `11: site[1].levels: found 17; allowed: a whole number, 2 to 16`},
		{"levels = 4", "levels = 11", `20: site[2].levels: found 3 levels, 66 with those of the sites before it; allowed: at most 64, in the product over the sites`},
		{"[[drive]]", strings.Repeat("[[site]]\nname = \"x\"\n", 4) + "[[drive]]", `4: site: found 7 tables; allowed: at most 6`},
		{`kind = "spin"`, `kind = "rotor"`, `19: site[2].kind: found "rotor"; allowed: "spin" or "ladder"`},
		{`kind = "spin"`, `kind = "ladder"`, `17: site[2].anharmonicity: found nothing; allowed: a frequency, of a ladder of more than two levels`},
		{"code = [0, 2]", "quadratic = \"1 MHz\"", `12: site[1].quadratic: found it on a ladder of 4 levels; allowed: anharmonicity and higher on a ladder, quadratic on a spin`},
		{"quadratic = \"2 MHz\"", "anharmonicity = \"2 MHz\"", `22: site[2].anharmonicity: found it on a spin of 3 levels; allowed: anharmonicity and higher on a ladder, quadratic on a spin`},
		{"quadratic = \"2 MHz\"", "higher = [\"2 MHz\"]", `22: site[2].higher: found it on a spin of 3 levels; allowed: anharmonicity and higher on a ladder, quadratic on a spin`},
		{"quadratic = \"2 MHz\"", "quadratic = \"2 GHz\"", `22: site[2].quadratic: found "2 GHz"; allowed: a frequency such as "40 MHz", -1 GHz to 1 GHz`},
		{`higher = ["3 MHz", "-1 MHz"]`, `higher = ["3 MHz", "-1"]`, `15: site[1].higher: found "-1" as element 1; allowed: a frequency such as "40 MHz", -1 GHz to 1 GHz (the unit is missing)`},
		{`higher = ["3 MHz", "-1 MHz"]`, `higher = [` + strings.Repeat(`"1 MHz",`, 14) + `]`, `15: site[1].higher: found an array of 14; allowed: an array of at most 13 texts, each a frequency such as "40 MHz"`},
		{`anharmonicity = "-220 MHz"`, ``, `9: site[1].anharmonicity: found nothing; allowed: a frequency such as "40 MHz", -1 GHz to 1 GHz`},
		{`anharmonicity = "-220 MHz"`, "anharmonicity = \"-220 MHz\"\nzero = \"upper\"", `15: site[1].zero: found "upper"; allowed: "lower" for more than two levels, the ladder stands on |0>`},
		{`name = "q1"`, "name = \"q1\"\nkind = \"ladder\"\nzero = \"upper\"", `7: site[0].zero: found "upper"; allowed: "lower" for a ladder, it stands on |0>`},
		{"code = [0, 2]", "code = [0, 4]", `12: site[1].code: found 4 as element 1; allowed: numbers, 0 to 3`},
		{"code = [0, 2]", "code = [1, 1]", `12: site[1].code: found [1, 1]; allowed: two levels, whole numbers from 0 to 3, as in [0, 1]`},
		{"code = [0, 2]", "code = [0.5, 1]", `12: site[1].code: found [0.5, 1]; allowed: two levels, whole numbers from 0 to 3, as in [0, 1]`},
		{"code = [0, 2]", "code = [1]", `12: site[1].code: found [1]; allowed: two levels, whole numbers from 0 to 3, as in [0, 1]`},
		{"code = [0, 2]", "code = \"01\"", `12: site[1].code: found "01"; allowed: an array of at most 2 numbers`},
		{`name = "q1"`, "name = \"q1\"\ncode = [1, 0]", `6: site[0].code: found [1, 0]; allowed: [0, 1] for two levels (zero says which energy |0> has)`},
		// Channels.
		{`channel = "q2 drive"`, `channel = "q1 drive"`, `30: drive[1].channel: found "q1 drive" in a second [[drive]]; allowed: a channel of its own`},
		{`channel = "q3 side"`, `channel = "q2 drive"`, `38: bias[1].channel: found "q2 drive", which a [[drive]] has; allowed: a channel of its own`},
		{"[[bias]]", strings.Repeat("[[drive]]\n", 15) + "[[bias]]", `24: drive: found 17 tables; allowed: at most 16`},
		{"[[bias]]", manyDrives + "[[bias]]", `74: bias: found 2, and 16 drives; allowed: at most 16 together`},
		// Couplings.
		{`kind = "exchange"`, `kind = "capacitive"`, `42: coupling[0].kind: found "capacitive"; allowed: "exchange", "heisenberg", "dipolar" or "dispersive"`},
		{`kind = "exchange"`, ``, `41: coupling[0].kind: found nothing; allowed: "exchange", "heisenberg", "dipolar" or "dispersive"`},
		{`between = ["q2", "q1"]`, ``, `41: coupling[0].between: found nothing; allowed: an array of at most 2 texts in quotes`},
		{`between = ["q2", "q1"]`, `between = ["q2", "q2"]`, `43: coupling[0].between: found ["q2", "q2"]; allowed: two sites of this device, as in ["q1", "q2"]`},
		{`between = ["q2", "q1"]`, `between = ["q2"]`, `43: coupling[0].between: found ["q2"]; allowed: two sites of this device, as in ["q1", "q2"]`},
		{`between = ["q2", "q1"]`, `between = ["q2", "Q1"]`, `43: coupling[0].between: found "Q1"; allowed: a site of this device, "q1", "q2", "q3"`},
		{`between = ["q2", "q1"]`, `between = ["q2", "q3"]`, `41: coupling[0]: found a frequency for "q2" and none for "q3"; allowed: a frequency for each site of a coupling, or for none (the coupling then is what it is in their frames)`},
		{`strength = "5 MHz"`, ``, `41: coupling[0].strength: found nothing; allowed: a frequency such as "40 MHz", -1 GHz to 1 GHz`},
		{`strength = "5 MHz"`, `strength = "5 %"`, `44: coupling[0].strength: found "5 %"; allowed: a frequency such as "40 MHz", -1 GHz to 1 GHz ("%" is a unit of share)`},
		{`rotating_wave = true`, `rotating_wave = "yes"`, `45: coupling[0].rotating_wave: found "yes"; allowed: true or false`},
		{"frequency = \"5.1 GHz\"", "", `41: coupling[0]: found a frequency for "q2" and none for "q1"; allowed: a frequency for each site of a coupling, or for none (the coupling then is what it is in their frames)`},
		{`on = { q2 = "Z", q1 = "X" }`, `on = { q2 = "Z", q1 = "x" }`, `48: coupling[1].on.q1: found "x"; allowed: "X", "Y" or "Z" (did you mean "X"?)`},
		{`on = { q2 = "Z", q1 = "X" }`, `on = { q2 = "Z" }`, `48: coupling[1].on: found 1 of the sites; allowed: two or more of "q1", "q2", "q3", each with X, Y or Z, as in { q1 = "Z", q2 = "Z" }`},
		{`on = { q2 = "Z", q1 = "X" }`, `on = { q2 = "Z", q9 = "X" }`, `48: coupling[1].on: found 1 of the sites; allowed: two or more of "q1", "q2", "q3", each with X, Y or Z, as in { q1 = "Z", q2 = "Z" }`},
		{`on = { q2 = "Z", q1 = "X" }`, `on = { q2 = "Z", q1 = "X", q9 = "X" }`, `48: coupling[1].on.q9: found an unknown key; allowed: q1, q2, q3`},
		{`on = { q2 = "Z", q1 = "X" }`, `on = "ZX"`, `48: coupling[1].on: found "ZX"; allowed: a table, [coupling[1].on] or on = { ... }`},
		{`on = { q2 = "Z", q1 = "X" }`, ``, `47: coupling[1]: found neither on nor kind; allowed: on, as in { q1 = "Z", q2 = "Z" }, or kind with between`},
		{`on = { q2 = "Z", q1 = "X" }`, "on = { q2 = \"Z\", q1 = \"X\" }\nkind = \"exchange\"", `48: coupling[1].on: found on beside kind or between; allowed: on alone, or kind with between`},
		{`on = { q2 = "Z", q1 = "X" }`, `on = { q2 = "Z", q3 = "X" }`, `47: coupling[1]: found a frequency for "q2" and none for "q3"; allowed: a frequency for each site of a coupling, or for none (the coupling then is what it is in their frames)`},
		{`on = { q2 = "Z", q1 = "X" }`, `ons = { q2 = "Z", q1 = "X" }`, `47: coupling[1]: found neither on nor kind; allowed: on, as in { q1 = "Z", q2 = "Z" }, or kind with between`},
		{"[[crosstalk]]", strings.Repeat("[[coupling]]\n", 63) + "[[crosstalk]]", `41: coupling: found 65 tables; allowed: at most 64`},
		// Crosstalk.
		{"channel = \"q1 drive\"\nsite = \"q2\"", "channel = \"q1\"\nsite = \"q2\"", `52: crosstalk[0].channel: found "q1"; allowed: a channel of a [[drive]] or a [[bias]], "q1 drive", "q2 drive", "q3 field", "q3 side"`},
		{"site = \"q2\"\nshare", "site = \"q4\"\nshare", `53: crosstalk[0].site: found "q4"; allowed: a site of this device, "q1", "q2", "q3"`},
		{"site = \"q2\"\nshare", "site = \"q1\"\nshare", `53: crosstalk[0].site: found "q1", the site that "q1 drive" is meant for; allowed: another site`},
		{"site = \"q2\"\nshare", "site = \"q3\"\nshare", `51: crosstalk[0]: found a frequency for one of "q1" and "q3" only; allowed: a frequency for both, or for neither (the field then turns with both)`},
		{`share = "3 %"`, ``, `51: crosstalk[0].share: found nothing; allowed: a share such as "1.5 %", -1000 % to 1000 %`},
		{`share = "3 %"`, `share = "1001 %"`, `54: crosstalk[0].share: found "1001 %"; allowed: a share such as "1.5 %", -1000 % to 1000 %`},
		{`phase = "40 deg"`, `phase = "400 deg"`, `55: crosstalk[0].phase: found "400 deg"; allowed: an angle such as "90 deg", -360 deg to 360 deg`},
		{`share = "-200 %"`, "share = \"-200 %\"\nphase = \"1 deg\"", `61: crosstalk[1].phase: found 1 deg for "q3 side", a bias; allowed: no phase, as it has no carrier (a share may be negative)`},
		{"channel = \"q3 side\"\nsite = \"q1\"\nshare = \"-200 %\"", "channel = \"q1 drive\"\nsite = \"q2\"\nshare = \"1 %\"", `59: crosstalk[1].site: found "q2" a second time for "q1 drive"; allowed: each site once for a channel`},
	} {
		if !strings.Contains(several, c.old) {
			t.Fatalf("%q is not in the device", c.old)
		}
		doc, err := quantity.ParseDocument("d.toml", []byte(strings.Replace(several, c.old, c.new, 1)))
		if err == nil {
			_, err = read(doc)
		}
		if err == nil || err.Error() != "d.toml:"+c.want {
			t.Errorf("%q:\n got %v\nwant d.toml:%s", c.new, err, c.want)
		}
	}
	still := "format = 1\nname = 'd'\n[[site]]\nname = 'a'\n[[site]]\nname = 'b'\n[[drive]]\nsite = 'a'\nchannel = 'c'\n[[coupling]]\nkind = 'exchange'\nbetween = ['a', 'b']\nstrength = '1 MHz'\nrotating_wave = true\n"
	doc, err := quantity.ParseDocument("d.toml", []byte(still))
	if err != nil {
		t.Fatal(err)
	}
	want := "d.toml:14: coupling[0].rotating_wave: found true for sites without a frequency; allowed: true where each of them states its frequency, for otherwise nothing turns"
	if _, err := read(doc); err == nil || err.Error() != want {
		t.Errorf("got %v\nwant %s", err, want)
	}
}

// Whatever the text, a device is read or refused in one line, and what it makes is Hermitian and finite.
func FuzzRead(f *testing.F) {
	f.Add(whole)
	f.Add(several)
	f.Fuzz(func(t *testing.T, text string) {
		doc, err := quantity.ParseDocument("d.toml", []byte(text))
		var d *Device
		if err == nil {
			d, err = read(doc)
		}
		if err != nil {
			if strings.Contains(err.Error(), "\n") {
				t.Fatal(err)
			}
			return
		}
		hermitian := func(m Matrix) {
			if m.N != d.Dim() || !(m.Add(-1, m.Adjoint()).Norm() <= 1e-9*m.Norm()) {
				t.Fatalf("%d of %d levels, norm %v", m.N, d.Dim(), m.Norm())
			}
		}
		hermitian(d.Static())
		for _, r := range append(d.Rotating(), d.Dropped()...) {
			hermitian(r.Cosine)
			hermitian(r.Sine)
		}
		for _, c := range d.Channels() {
			for _, p := range d.Paths(c, "I cos + Q sin") {
				for _, o := range p.Operators {
					hermitian(o)
				}
			}
		}
		if code := d.CodeSpace(); len(code) != 1<<len(d.Sites) || slices.Max(code) >= d.Dim() {
			t.Fatalf("code space %v", code)
		}
	})
}
