package brief

import (
	"fmt"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"strings"
	"testing"

	"holdfast/design/device"
)

// An invented rack with a drive for each of three sites, and a field.
const severalRack = `format = 1
[instrument]
name = "rack"
sample_rate = "1 GS/s"
resolution = "14 bit"
[[channel]]
name = "d1"
kind = "quadrature"
mixing = "I cos + Q sin"
full_scale = "40 MHz"
[[channel]]
name = "d2"
kind = "quadrature"
mixing = "I cos - Q sin"
full_scale = "40 MHz"
[[channel]]
name = "field"
kind = "baseband"
full_scale = "40 MHz"
`

// Invented devices: a head, and their sites.
const (
	severalDevice = "format = 1\nname = 'Skerry'\n"
	threeSpins    = severalDevice + "[[site]]\nname = 'q1'\n[[site]]\nname = 'q2'\n[[site]]\nname = 'q3'\n[[drive]]\nsite = 'q1'\nchannel = 'd1'\n[[drive]]\nsite = 'q2'\nchannel = 'd2'\n[[bias]]\nsite = 'q3'\nchannel = 'field'\n"
	twoSpins      = severalDevice + "[[site]]\nname = 'q1'\n[[site]]\nname = 'q2'\n[[drive]]\nsite = 'q1'\nchannel = 'd1'\n[[bias]]\nsite = 'q2'\nchannel = 'field'\n"
	oneSpin       = severalDevice + "[[site]]\nname = 'q1'\n[[drive]]\nsite = 'q1'\nchannel = 'd1'\n"
	// Of a ladder, a spin 1 and a spin; the code levels of the second are its ends.
	mixedSites = severalDevice + "[[site]]\nname = 'q1'\nlevels = 3\nanharmonicity = '-220 MHz'\n[[site]]\nname = 'q2'\nlevels = 3\nkind = 'spin'\ncode = [0, 2]\n[[site]]\nname = 'q3'\n[[drive]]\nsite = 'q1'\nchannel = 'd1'\n"
	oneLadder  = severalDevice + "[[site]]\nname = 'q1'\nlevels = 3\nanharmonicity = '-220 MHz'\n[[drive]]\nsite = 'q1'\nchannel = 'd1'\n"
)

const severalHead = "format = 1\nname = 'n'\nprofile = 'rack.toml'\ndevice = 'device.toml'\nspan = '64 ns'\n"

// several loads a brief for a device; files are more of them by name and text.
func several(t *testing.T, deviceText, briefText string, files ...string) (*Brief, *device.Device, string, error) {
	t.Helper()
	dir := t.TempDir()
	files = append([]string{"rack.toml", severalRack, "device.toml", deviceText, "brief.toml", severalHead + briefText}, files...)
	for i := 0; i < len(files); i += 2 {
		if err := os.WriteFile(filepath.Join(dir, files[i]), []byte(files[i+1]), 0o666); err != nil {
			t.Fatal(err)
		}
	}
	b, p, d, err := LoadAll(filepath.Join(dir, "brief.toml"))
	if err != nil {
		return nil, nil, dir, err
	}
	twice := *b
	twice.Errors = slices.Clone(b.Errors)
	if err := twice.Complete(p, d); err != nil || !reflect.DeepEqual(*b, twice) {
		t.Errorf("completing twice, %v, makes\n%+v\nof\n%+v", err, twice, *b)
	}
	return b, d, dir, nil
}

// must is several without an error.
func must(t *testing.T, deviceText, briefText string, files ...string) (*Brief, *device.Device) {
	t.Helper()
	b, d, _, err := several(t, deviceText, briefText, files...)
	if err != nil {
		t.Fatal(err)
	}
	return b, d
}

func rotation(name string) device.Matrix {
	axis, angle, _ := device.Gate(name)
	return device.Rotation(axis, angle)
}

// close reports whether two matrices agree in every digit that a handful of products leaves.
func close(a, b device.Matrix) bool { return a.N == b.N && a.Add(-1, b).Norm() <= 1e-14 }

// on gives a gate on some of n spins, the first of them slowest in it: its expansion in products of Pauli matrices, each put where it belongs.
func on(m device.Matrix, places []int, n int) device.Matrix {
	d := &device.Device{Sites: make([]device.Site, n)}
	for i := range d.Sites {
		d.Sites[i].Levels = 2
	}
	whole := device.Zero(1 << n)
	letters := append([]string{""}, device.OperatorNames()...)
	for k := range 1 << (2 * len(places)) {
		small, ops := device.Identity(1), map[int]device.Matrix{}
		for i, p := range places {
			o, ok := device.Operator(letters[k>>(2*i)&3])
			if !ok {
				o = device.Identity(2)
			}
			small, ops[p] = device.Kron(small, o), o
		}
		whole = whole.Add(small.Mul(m).Trace()/complex(float64(m.N), 0), d.Embed(ops))
	}
	return whole
}

func TestTargetsOfSeveral(t *testing.T) {
	cnot, _ := device.Gate2("CNOT")
	swap, _ := device.Gate2("sqrt-iSWAP")
	r := complex(math.Sqrt2/2, 0)
	s := device.FromRows([][]complex128{{1, 0}, {0, 1i}})
	quarter := cmplx.Rect(1, math.Pi/4)
	h := device.FromRows([][]complex128{{r, r}, {r, -r}})
	for _, c := range []struct {
		text   string
		sites  string
		label  string
		small  device.Matrix
		places []int
	}{
		{"site = 'q2'\ngate = 'X90'", "q2", "X90", rotation("X90"), []int{1}},
		{"sites = ['q3']\ngate = 'H'", "q3", "H", rotation("H"), []int{2}},
		{"sites = ['q2', 'q1']\ngate = 'CNOT'", "q2,q1", "CNOT", cnot, []int{1, 0}},
		{"sites = ['q1', 'q3']\ngate = 'sqrt-iSWAP'", "q1,q3", "sqrt-iSWAP", swap, []int{0, 2}},
		{"sites = ['q1', 'q2']\ngate = 'identity'", "q1,q2", "identity", device.Identity(4), []int{0, 1}},
		{"sites = ['q1', 'q2', 'q3']\ngate = 'identity'", "q1,q2,q3", "identity", device.Identity(8), []int{0, 1, 2}},
		{"gates = { q2 = 'Y90', q1 = 'X180', q3 = 'T' }", "q1,q2,q3", "X180, Y90, T", device.Kron(rotation("X180"), device.Kron(rotation("Y90"), rotation("T"))), []int{0, 1, 2}},
		{"gates = { q3 = 'Y90' }", "q3", "Y90", rotation("Y90"), []int{2}},
		{"sites = ['q3', 'q1']\ncontrolled = 'X90'", "q3,q1", "controlled X90", device.Controlled(rotation("X90")), []int{2, 0}},
		{"sites = ['q3', 'q1', 'q2']\ncontrolled = '-Y90'", "q3,q1,q2", "controlled -Y90", device.Controlled(device.Controlled(rotation("-Y90"))), []int{2, 0, 1}},
		{"sites = ['q1', 'q2']\ncontrolled = 'S'", "q1,q2", "controlled S", device.Controlled(s), []int{0, 1}},
		{"sites = ['q1', 'q2']\ncontrolled = 'T'", "q1,q2", "controlled T", device.Controlled(device.FromRows([][]complex128{{1, 0}, {0, quarter}})), []int{0, 1}},
		{"sites = ['q1', 'q2']\ncontrolled = 'H'", "q1,q2", "controlled H", device.Controlled(h), []int{0, 1}},
		{"sites = ['q1', 'q2']\ncontrolled = 'Z90'", "q1,q2", "controlled Z90", device.Controlled(rotation("Z90")), []int{0, 1}},
		{"site = 'q2'\naxis = [0, 1, 0]\nangle = '30 deg'", "q2", "30 deg about (0, 1, 0)", device.Rotation([3]float64{0, 1, 0}, math.Pi/6), []int{1}},
		{"sites = ['q3', 'q2']\nmatrix = [[1,0,0,0],[0,[0, 1],0,0],[0,0,0.70710678,[0.70710678, 0]],[0,0,0.70710678,-0.70710678]]", "q3,q2", "matrix",
			device.FromRows([][]complex128{{1, 0, 0, 0}, {0, 1i, 0, 0}, {0, 0, r, r}, {0, 0, r, -r}}), []int{2, 1}},
		{"site = 'q3'\nmatrix = [[1, 0], [0, [0, 1]]]", "q3", "matrix", rotation("S"), []int{2}},
	} {
		for _, sites := range []string{threeSpins, mixedSites} {
			b, _ := must(t, sites, "[target]\n"+c.text+"\n")
			g := b.Target
			one := ""
			if len(c.places) == 1 {
				one = c.sites
			}
			if g.Site != one || strings.Join(g.Sites, ",") != c.sites || g.Label != c.label || g.FreeZ != NoFreeZ || g.Local || g.From != nil || g.To != nil {
				t.Errorf("%s: %+v", c.text, g)
			}
			if !close(g.Matrix, c.small) {
				t.Errorf("%s: %v, want %v", c.text, g.Matrix, c.small)
			}
			if want := on(c.small, c.places, 3); !close(g.Whole, want) {
				t.Errorf("%s: whole %v, want %v", c.text, g.Whole, want)
			}
			if one != "" && !close(device.Rotation(g.Axis, g.Angle), c.small) {
				t.Errorf("%s: %v about %v", c.text, g.Angle, g.Axis)
			}
		}
	}
	// Of one site the matrix itself.
	b, _ := must(t, oneSpin, "[target]\nsite = 'q1'\ngate = 'X90'\n")
	if !slices.Equal(b.Target.Whole.Data, b.Target.Matrix.Data) || b.Target.Site != "q1" {
		t.Errorf("%+v", b.Target)
	}
	b, _ = must(t, oneLadder, "[target]\ngates = { q1 = 'X90' }\nfree_z = 'after'\n")
	if b.Target.Whole.N != 2 || b.Target.Site != "q1" || b.Target.Angle != math.Pi/2 || b.Target.FreeZ != After {
		t.Errorf("%+v", b.Target)
	}
	b, _ = must(t, twoSpins, "[target]\nsites = ['q1', 'q2']\ngate = 'CZ'\nup_to = 'local rotations'\n")
	if !b.Target.Local {
		t.Errorf("%+v", b.Target)
	}
}

func TestStates(t *testing.T) {
	r2, r3 := complex(math.Sqrt2/2, 0), complex(1/math.Sqrt(3), 0)
	basis := func(n, i int) []complex128 {
		v := make([]complex128, n)
		v[i] = 1
		return v
	}
	for _, c := range []struct {
		sites, text, label string
		from, to           [][]complex128
	}{
		{twoSpins, "from = '01'\nto = '10'", "01 to 10", [][]complex128{basis(4, 1)}, [][]complex128{basis(4, 2)}},
		{threeSpins, "from = '000'\nto = 'GHZ'", "000 to GHZ", [][]complex128{basis(8, 0)}, [][]complex128{{r2, 0, 0, 0, 0, 0, 0, r2}}},
		{mixedSites, "from = 'GHZ'\nto = 'W'", "GHZ to W", [][]complex128{{r2, 0, 0, 0, 0, 0, 0, r2}}, [][]complex128{{0, r3, r3, 0, r3, 0, 0, 0}}},
		{oneSpin, "from = '0'\nto = '1'", "0 to 1", [][]complex128{{1, 0}}, [][]complex128{{0, 1}}},
		{twoSpins, "from = ['00', '11']\nto = ['10', '01']", "00, 11 to 10, 01", [][]complex128{basis(4, 0), basis(4, 3)}, [][]complex128{basis(4, 2), basis(4, 1)}},
		{twoSpins, "from = ['00']\nto = [0, [0, 0.6], 0, 0.80000001]", "00 to vector", [][]complex128{basis(4, 0)}, [][]complex128{{0, complex(0, 0.6/1.000000008), 0, complex(0.80000001/1.000000008, 0)}}},
		{oneSpin, "from = [0.6, 0.8]\nto = [[0, 1], 0]", "vector to vector", [][]complex128{{0.6, 0.8}}, [][]complex128{{1i, 0}}},
	} {
		b, _ := must(t, c.sites, "[target]\n"+c.text+"\n")
		g := b.Target
		if g.Label != c.label || g.Site != "" || g.Sites != nil || g.Matrix.N != 0 || g.Whole.N != 0 || g.FreeZ != NoFreeZ || g.Local {
			t.Errorf("%s: %+v", c.text, g)
		}
		for k, pair := range [][2][][]complex128{{g.From, c.from}, {g.To, c.to}} {
			if len(pair[0]) != len(pair[1]) {
				t.Fatalf("%s: %d states, want %d", c.text, len(pair[0]), len(pair[1]))
			}
			for i, v := range pair[0] {
				norm := 0.0
				for j := range v {
					norm += real(v[j])*real(v[j]) + imag(v[j])*imag(v[j])
					if len(v) != len(pair[1][i]) || !(cmplx.Abs(v[j]-pair[1][i][j]) <= 1e-8) {
						t.Fatalf("%s, end %d: %v, want %v", c.text, k, pair[0], pair[1])
					}
				}
				if !(math.Abs(norm-1) <= 1e-15) {
					t.Errorf("%s, end %d: of length^2 %.17g", c.text, k, norm)
				}
			}
		}
	}
}

// halves gives half the product of X, Y or Z of sites, from the operators of each.
func halves(d *device.Device, axes ...string) device.Matrix {
	ops := map[int]device.Matrix{}
	for i, a := range axes {
		if a != "" {
			ops[i] = d.Local(i, a)
		}
	}
	return d.Embed(ops).Scale(0.5)
}

func TestStaticMembers(t *testing.T) {
	matrix := func(n int) string { // diag(1, -1, 0, ...) and a transition at the end
		var rows []string
		for i := range n {
			row := make([]string, n)
			for j := range n {
				row[j] = "0"
				switch {
				case i == j && i < 2:
					row[j] = fmt.Sprint(1 - 2*i)
				case i == n-1 && j == 0:
					row[j] = "[0, 2]"
				case i == 0 && j == n-1:
					row[j] = "[0, -2]"
				}
			}
			rows = append(rows, "["+strings.Join(row, ", ")+"]")
		}
		return "matrix = [" + strings.Join(rows, ", ") + "]"
	}
	const target = "[target]\nsite = 'q2'\ngate = 'X90'\n[[error]]\n"
	for _, sites := range []string{threeSpins, mixedSites} {
		for _, c := range []struct {
			text, name string
			want       func(d *device.Device) device.Matrix
			local      string
		}{
			{"detuning = 'q3'", "detuning", func(d *device.Device) device.Matrix { return halves(d, "", "", "Z") }, "Z"},
			{"operator = 'Y'", "Y", func(d *device.Device) device.Matrix { return halves(d, "", "Y") }, "Y"},
			{"operator = 'X'\nsite = 'q1'", "X on q1", func(d *device.Device) device.Matrix { return halves(d, "X") }, "X"},
			{"on = { q3 = 'Z', q1 = 'X' }", "XZ on q1, q3", func(d *device.Device) device.Matrix { return halves(d, "X", "", "Z") }, ""},
			{"on = { q2 = 'Y' }\nname = 'tilt'", "tilt", func(d *device.Device) device.Matrix { return halves(d, "", "Y") }, ""},
			{"on = { q1 = 'Z', q2 = 'Z', q3 = 'Z' }", "ZZZ on q1, q2, q3", func(d *device.Device) device.Matrix { return halves(d, "Z", "Z", "Z") }, ""},
			{"collective = 'Z'", "collective Z", func(d *device.Device) device.Matrix {
				return halves(d, "Z").Add(1, halves(d, "", "Z")).Add(1, halves(d, "", "", "Z"))
			}, ""},
			{"MATRIX", "matrix", func(d *device.Device) device.Matrix {
				n := d.Dim()
				m := device.Zero(n)
				m.Data[0], m.Data[n+1] = 1, -1
				m.Data[n-1], m.Data[(n-1)*n] = -2i, 2i
				return m
			}, ""},
		} {
			text := c.text
			if text == "MATRIX" {
				text = matrix(map[string]int{threeSpins: 8, mixedSites: 18}[sites])
			}
			b, d := must(t, sites, target+text+"\n[[require.margin]]\nerror = '"+c.name+"'\nsize = '1 MHz'\n")
			e := b.Errors[0]
			if e.Name != c.name || e.Kind != Static || len(e.Members) != 1 || e.Members[0].Name != c.name || e.Members[0].Weight != 1 || e.Scope != "" || !near(e.Size, rate(0.003)) {
				t.Errorf("%s: %+v", c.text, e)
				continue
			}
			if want := c.want(d); !close(e.Members[0].Operator, want) {
				t.Errorf("%s: %v, want %v", c.text, e.Members[0].Operator, want)
			}
			if m, ok := device.Operator(c.local); ok && !sameMatrix(e.Operator, m.Scale(0.5)) || !ok && e.Operator.N != 0 {
				t.Errorf("%s: on two levels %v", c.text, e.Operator)
			}
		}
	}
	// One spin: every way of saying it fills both; one ladder: 2 by 2 is lifted, 3 by 3 is as written.
	for _, text := range []string{"detuning = 'q1'", "operator = 'Z'", "on = { q1 = 'Z' }", "collective = 'Z'", "matrix = [[0.5, 0], [0, -0.5]]"} {
		b, _ := must(t, oneSpin, "[target]\nsite = 'q1'\ngate = 'X90'\n[[error]]\n"+text+"\n")
		z, _ := device.Operator("Z")
		if e := b.Errors[0]; !sameMatrix(e.Operator, z.Scale(0.5)) || !slices.Equal(e.Operator.Data, e.Members[0].Operator.Data) {
			t.Errorf("%s: %+v", text, e)
		}
	}
	b, d := must(t, oneLadder, "[target]\nsite = 'q1'\ngate = 'X90'\n[[error]]\nmatrix = [[0.5, 0], [0, -0.5]]\n[[error]]\nname = 'wide'\nmatrix = [[1, 0, 0], [0, 0, 0], [0, 0, -1]]\n")
	if !close(b.Errors[0].Members[0].Operator, halves(d, "Z")) || b.Errors[0].Operator.N != 2 || b.Errors[1].Members[0].Operator.At(2, 2) != -1 || b.Errors[1].Operator.N != 0 {
		t.Errorf("%+v", b.Errors)
	}
	// What typing left of a trace is spread over all levels.
	b, _ = must(t, twoSpins, "[target]\nsite = 'q1'\ngate = 'X90'\n[[error]]\nmatrix = [[1, 0, 0, 0], [0, 1, 0, 0], [0, 0, -1, 0], [0, 0, 0, -0.9999999998]]\n")
	if m := b.Errors[0].Members[0].Operator; !(cmplx.Abs(m.Trace()) <= 1e-15) || !(cmplx.Abs(m.At(0, 0)-m.At(1, 1)) == 0) || !(math.Abs(real(m.At(0, 0))-0.99999999995) <= 1e-15) {
		t.Errorf("%v", m)
	}
	// An operator without a site where the target has none.
	b, d = must(t, oneSpin, "[target]\nfrom = '0'\nto = '1'\n[[error]]\noperator = 'X'\n")
	if !close(b.Errors[0].Members[0].Operator, halves(d, "X")) {
		t.Errorf("%+v", b.Errors)
	}
}

// spins gives a device of n spins.
func spins(n int) string {
	text := severalDevice
	for i := range n {
		text += fmt.Sprintf("[[site]]\nname = 'q%d'\n", i+1)
	}
	return text + "[[drive]]\nsite = 'q1'\nchannel = 'd1'\n"
}

// Every class: how many operators it has, that they are Hermitian, traceless, orthogonal and of norm sqrt(d)/2, and what some of them are.
func TestScopes(t *testing.T) {
	for _, c := range []struct {
		sites, scope, name string
		count              int
		first, last        string
	}{
		{spins(1), "all", "any static error", 3, "X", "Z"},
		{spins(1), "one-body", "any one-body error", 3, "X", "Z"},
		{spins(2), "all", "any static error", 15, "1X", "ZZ"},
		{spins(2), "one-body", "any one-body error", 6, "1X", "Z1"},
		{spins(2), "two-body", "any two-body error", 9, "XX", "ZZ"},
		{spins(4), "one-body", "any one-body error", 12, "111X", "Z111"},
		{spins(4), "two-body", "any two-body error", 54, "11XX", "ZZ11"},
		{spins(4), "on q2, q4", "any error on q2, q4", 15, "111X", "1Z1Z"},
		{spins(4), "on q3", "any error on q3", 3, "11X1", "11Z1"},
		{spins(4), "on  q4,q2", "any error on q4, q2", 15, "111X", "1Z1Z"},
		{spins(5), "all", "any static error", 1023, "1111X", "ZZZZZ"},
		{spins(6), "two-body", "any two-body error", 135, "1111XX", "ZZ1111"},
		{oneLadder, "all", "any static error", 8, "q1 Re 0-1", "q1 level 2"},
		{oneLadder, "leakage", "any leakage", 4, "q1 Re 0-2", "q1 Im 1-2"},
		{mixedSites, "one-body", "any one-body error", 19, "q3 X", "q1 level 2"},
		{mixedSites, "two-body", "any two-body error", 8*8 + 8*3 + 8*3, "q2 Re 0-1, q3 X", "q1 level 2, q2 level 2"},
		{mixedSites, "on q2, q3", "any error on q2, q3", 35, "q3 X", "q2 level 2, q3 Z"},
		{mixedSites, "all", "any static error", 323, "q3 X", "q1 level 2, q2 level 2, q3 Z"},
		{mixedSites, "leakage", "any leakage", 2 * 8 * 10, "Re 000-010", "Im 121-221"},
	} {
		b, d := must(t, c.sites, "[target]\nsite = 'q1'\ngate = 'X90'\n[[error]]\nany = '"+c.scope+"'\n")
		e := b.Errors[0]
		scope := c.scope
		if after, ok := strings.CutPrefix(c.name, "any error "); ok {
			scope = after
		}
		if e.Name != c.name || e.Kind != Any || e.Scope != scope || e.Leak != (c.scope == "leakage") || e.Rates != "" || len(e.Members) != c.count {
			t.Errorf("%s: %d operators of %q, scope %q, leak %v", c.scope, len(e.Members), e.Name, e.Scope, e.Leak)
			continue
		}
		if f, l := e.Members[0].Name, e.Members[c.count-1].Name; f != c.first || l != c.last {
			t.Errorf("%s: from %q to %q, want %q and %q", c.scope, f, l, c.first, c.last)
		}
		code := d.CodeSpace()
		names := map[string]bool{}
		for i, m := range e.Members {
			names[m.Name] = true
			o := m.Operator
			if !(cmplx.Abs(o.Trace()) <= 1e-13) || o.Add(-1, o.Adjoint()).Norm() != 0 || !(math.Abs(o.Norm()-math.Sqrt(float64(d.Dim()))/2) <= 1e-13) || m.Weight != 1 {
				t.Errorf("%s, %s: trace %v, norm %v, weight %v", c.scope, m.Name, o.Trace(), o.Norm(), m.Weight)
			}
			if i > 0 && c.count < 400 {
				for _, other := range e.Members[:i] {
					product := complex(0, 0) // Tr a'b
					for k, v := range o.Data {
						product += cmplx.Conj(v) * other.Operator.Data[k]
					}
					if !(cmplx.Abs(product) <= 1e-13) {
						t.Errorf("%s: %s and %s overlap by %v", c.scope, m.Name, other.Name, product)
					}
				}
			}
			if e.Leak { // nothing but between the two
				for row := range o.N {
					for col := range o.N {
						if o.At(row, col) != 0 && slices.Contains(code, row) == slices.Contains(code, col) {
							t.Errorf("%s has an entry at %d, %d", m.Name, row, col)
						}
					}
				}
			}
			if len(d.Sites) > 1 && d.Dim() == 1<<len(d.Sites) { // the name says what it is
				axes := make([]string, len(d.Sites))
				for s, letter := range m.Name {
					axes[s] = strings.Trim(string(letter), "1")
				}
				if !close(o, halves(d, axes...)) {
					t.Errorf("%s: %s is %v", c.scope, m.Name, o)
				}
			}
		}
		if len(names) != c.count {
			t.Errorf("%s: %d names for %d operators", c.scope, len(names), c.count)
		}
	}
	// Products of a mixed device by their names.
	b, d := must(t, mixedSites, "[target]\nsite = 'q1'\ngate = 'X90'\n[[error]]\nany = 'all'\n")
	for _, m := range b.Errors[0].Members {
		if m.Name == "q1 Im 1-2, q3 Y" {
			ops, names := d.Basis(0)
			y, _ := device.Operator("Y")
			if !close(m.Operator, d.Embed(map[int]device.Matrix{0: ops[slices.Index(names, "Im 1-2")], 2: y}).Scale(0.5)) {
				t.Errorf("%s is %v", m.Name, m.Operator)
			}
			return
		}
	}
	t.Error("no product of q1 and q3")
}

func memberNames(e Error) string {
	var names []string
	for _, m := range e.Members {
		names = append(names, m.Name)
	}
	return strings.Join(names, " ")
}

func TestExcept(t *testing.T) {
	const target = "[target]\nsite = 'q1'\ngate = 'X90'\n[[error]]\n"
	b, _ := must(t, spins(2), target+"any = 'one-body'\nexcept = [ { q1 = 'Z' }, { q2 = 'Y' } ]\n")
	if got := memberNames(b.Errors[0]); got != "1X 1Z X1 Y1" || b.Errors[0].Scope != OneBody {
		t.Errorf("%s, %s", got, b.Errors[0].Scope)
	}
	b, _ = must(t, spins(2), target+"any = 'all'\n[[error.except]]\nq2 = 'Z'\nq1 = 'X'\n")
	if got := memberNames(b.Errors[0]); got != "1X 1Y 1Z X1 XX XY Y1 YX YY YZ Z1 ZX ZY ZZ" || b.Errors[0].Scope != Some {
		t.Errorf("%s, %s", got, b.Errors[0].Scope)
	}
	b, _ = must(t, mixedSites, target+"any = 'one-body'\nexcept = { q3 = 'X' }\n")
	if e := b.Errors[0]; len(e.Members) != 18 || e.Members[0].Name != "q3 Y" {
		t.Errorf("%s", memberNames(e))
	}
}

// Learned rates: weights that go as their roots, of root mean square 1, for what the class and the file have in common.
func TestRates(t *testing.T) {
	const target = "[target]\nsite = 'q1'\ngate = 'X90'\n[[error]]\nrates = 'learned.csv'\n"
	const table = "\ufeffpauli, rate\r\nII,0.9\r\nZI, 4e-3\r\n\r\nIX,1e-3\r\nXI,0\r\nZZ,1.5e-2\r\n"
	for _, c := range []struct {
		any   string
		names string
		rates []float64
	}{
		{"any = 'all'", "1X Z1 ZZ", []float64{1, 4, 15}},
		{"any = 'one-body'", "1X Z1", []float64{1, 4}},
		{"any = 'two-body'", "ZZ", []float64{1}},
		{"any = 'all'\nexcept = [ { q1 = 'Z', q2 = 'Z' } ]", "1X Z1", []float64{1, 4}},
	} {
		b, _ := must(t, spins(2), target+c.any+"\n", "learned.csv", table)
		e := b.Errors[0]
		if e.Name != "any learned error" || e.Scope != Learned || e.Leak || e.Rates != "learned.csv" || filepath.Base(e.RatesPath) != "learned.csv" || memberNames(e) != c.names {
			t.Errorf("%s: %q of scope %q: %s", c.any, e.Name, e.Scope, memberNames(e))
			continue
		}
		mean := 0.0
		for _, r := range c.rates {
			mean += r / float64(len(c.rates))
		}
		for i, m := range e.Members {
			if want := math.Sqrt(c.rates[i] / mean); !(math.Abs(m.Weight-want) <= 1e-14) {
				t.Errorf("%s: %s weighs %v, want %v", c.any, m.Name, m.Weight, want)
			}
		}
	}
	// Standard deviations: the rates are their squares.
	a, _ := must(t, spins(1), target+"any = 'all'\n", "learned.csv", "pauli,sigma\nX,3\nY,1\nZ,2\n")
	if m := a.Errors[0].Members; len(m) != 3 || !(math.Abs(m[0].Weight/m[1].Weight-3) <= 1e-12) || !(math.Abs(m[2].Weight/m[1].Weight-2) <= 1e-12) {
		t.Errorf("of standard deviations: %+v", m)
	}
	// Of whatever size, as long as they are numbers.
	b, _ := must(t, spins(1), target+"any = 'all'\n", "learned.csv", "pauli,rate\nX,1e12\nY,1e-300\nZ,1e12\n")
	for i, want := range []float64{math.Sqrt(1.5), math.Sqrt(1.5) * 1e-156, math.Sqrt(1.5)} {
		if got := b.Errors[0].Members[i].Weight; !(math.Abs(got-want) <= 1e-14*want) {
			t.Errorf("weight %v, want %v", got, want)
		}
	}
	for _, c := range []struct{ table, want string }{
		{"", `:1: found an empty file; allowed: the header pauli,rate or pauli,sigma and a row for each operator`},
		{"Pauli,rate\nX,1\n", `:1: found the header "Pauli,rate"; allowed: pauli,rate or pauli,sigma`},
		{"X,1\n", `:1: found the header "X,1"; allowed: pauli,rate or pauli,sigma`},
		{"pauli,rate\n\nX1,1\n", `:3: pauli: found "X1"; allowed: 2 letters I, X, Y or Z, one for each site of the device`},
		{"pauli,rate\nXXX,1\n", `:2: pauli: found "XXX"; allowed: 2 letters I, X, Y or Z, one for each site of the device`},
		{"pauli,rate\nxx,1\n", `:2: pauli: found "xx"; allowed: 2 letters I, X, Y or Z, one for each site of the device`},
		{"pauli,rate\nXX,1\nXX,2\n", `:3: pauli: found "XX" a second time; allowed: each operator once`},
		{"pauli,rate\nXX,-1\n", `:2: rate: found "-1"; allowed: a number, 0 to 1e+12`},
		{"pauli,rate\nXX,nan\n", `:2: rate: found "nan"; allowed: a number, 0 to 1e+12`},
		{"pauli,rate\nXX,1e13\n", `:2: rate: found "1e13"; allowed: a number, 0 to 1e+12`},
		{"pauli,rate\nXX,\n", `:2: rate: found ""; allowed: a number, 0 to 1e+12`},
		{"pauli,rate\nXX\n", `:2: found 1 columns; allowed: two, an operator and its rate`},
		{"pauli,rate\nXX,1,2\n", `:2: found 3 columns; allowed: two, an operator and its rate`},
		{"pauli,rate\n\"XX,1\n", `:2: found text that is none: extraneous or missing " in quoted-field; allowed: comma-separated values`},
		{"pauli,rate\n" + strings.Repeat("Q", 100) + ",1\n", `:2: pauli: found "` + strings.Repeat("Q", 60) + `..."; allowed: 2 letters I, X, Y or Z, one for each site of the device`},
	} {
		_, _, dir, err := several(t, spins(2), target+"any = 'all'\n", "learned.csv", c.table)
		if want := filepath.Join(dir, "learned.csv") + c.want; err == nil || err.Error() != want {
			t.Errorf("%q:\n got %v\nwant %s", c.table, err, want)
		}
	}
	for _, c := range []struct{ sites, any, table, want string }{
		{spins(2), "any = 'all'", "pauli,rate\nXX,0\n", `:10: error[0].rates: found "learned.csv", which has no rate above 0 for an operator of the class; allowed: a rate above 0 for one of them at least`},
		{spins(2), "any = 'one-body'", "pauli,rate\nXX,1\n", `:10: error[0].rates: found "learned.csv", which has no rate above 0 for an operator of the class; allowed: a rate above 0 for one of them at least`},
		{oneLadder, "any = 'all'", "pauli,rate\nX,1\n", `:10: error[0].rates: found rates for a device with a site of more than two levels; allowed: rates for sites of two levels`},
		{spins(2), "any = 'all'", strings.Repeat("#", ratesBytes+1), `:10: error[0].rates: found "learned.csv", and at DIR/learned.csv a larger file; allowed: a file of rates of at most 1 MiB`},
	} {
		_, _, dir, err := several(t, c.sites, target+c.any+"\n", "learned.csv", c.table)
		if want := filepath.Join(dir, "brief.toml") + strings.ReplaceAll(c.want, "DIR", dir); err == nil || err.Error() != want {
			t.Errorf("%s:\n got %v\nwant %s", c.any, err, want)
		}
	}
	_, _, dir, err := several(t, spins(2), target+"any = 'all'\n")
	if want := filepath.Join(dir, "brief.toml") + `:10: error[0].rates: found "learned.csv", and at ` + dir + `/learned.csv no such file; allowed: a file of rates, beside the brief`; err == nil || err.Error() != want {
		t.Errorf("got %v\nwant %s", err, want)
	}
}

// A share of a channel that nobody knows, on another site: what the channel would do to that site of its own kind, per share.
func TestCrosstalk(t *testing.T) {
	const target = "[target]\nsite = 'q1'\ngate = 'X90'\n"
	b, d := must(t, threeSpins, target+"[[error]]\ncrosstalk = 'd2'\nsite = 'q3'\nsize = '2 %'\n[[error]]\ncrosstalk = 'field'\nsite = 'q1'\n[[require.margin]]\nerror = 'd2 on q3'\nsize = '5 %'\n")
	e := b.Errors[0]
	if e.Name != "d2 on q3" || e.Kind != Crosstalk || len(e.Channels) != 1 || e.Channels[0] != "d2" || e.Site != "q3" || e.Size != 0.02 || e.Members != nil || len(e.Reach) != 2 ||
		!close(e.Reach[0], halves(d, "", "", "X")) || !close(e.Reach[1], halves(d, "", "", "Y").Scale(-1)) { // the other mixing
		t.Errorf("%+v", e)
	}
	if e := b.Errors[1]; e.Name != "field on q1" || e.Size != 0.01 || len(e.Reach) != 1 || !close(e.Reach[0], halves(d, "Z")) {
		t.Errorf("%+v", e)
	}
	if m := b.Require.Margins[0]; !near(m.Size, 0.05) {
		t.Errorf("margin %+v", m)
	}
}

// Without [[error]] a device of several sites is held against amplitude and any one-body error.
func TestDefaultsOfSeveral(t *testing.T) {
	b, _ := must(t, twoSpins, "[target]\nsites = ['q1', 'q2']\ngate = 'CZ'\n[[require.margin]]\nerror = 'amplitude'\nsize = '1 %'\n")
	if e := b.Errors; !b.Defaulted || len(e) != 2 || e[0].Name != "amplitude" || strings.Join(e[0].Channels, ",") != "d1,field" ||
		e[1].Name != "any one-body error" || e[1].Scope != OneBody || len(e[1].Members) != 6 || !near(e[1].Size, rate(0.001)) {
		t.Errorf("%+v", e)
	}
	b, _ = must(t, oneSpin, "[target]\nsite = 'q1'\ngate = 'X90'\n[[require.margin]]\nerror = 'Y'\nsize = '1 MHz'\n")
	if e := b.Errors; len(e) != 3 || memberNames(e[0]) != "detuning" || memberNames(e[2]) != "X Y Z" || e[2].Scope != All {
		t.Errorf("%+v", e)
	}
	b, _ = must(t, oneLadder, "[target]\nsite = 'q1'\ngate = 'X90'\n")
	if e := b.Errors; len(e) != 3 || len(e[2].Members) != 8 {
		t.Errorf("%+v", e)
	}
}

func TestRefusesSeveral(t *testing.T) {
	const gate = "[target]\nsites = ['q1', 'q2']\ngate = 'CNOT'\n"
	const single = "[target]\nsite = 'q1'\ngate = 'X90'\n"
	framed := strings.Replace(strings.Replace(twoSpins, "'q1'\n", "'q1'\nfrequency = '5 GHz'\n", 1), "name = 'q2'\n", "name = 'q2'\nfrequency = '5.1 GHz'\n", 1)
	for _, c := range []struct{ sites, text, want string }{
		// Sites of the target.
		{twoSpins, "[target]\nsites = ['q1', 'q4']\ngate = 'CNOT'\n", `7: target.sites: found "q4"; allowed: a site of DIR/device.toml, "q1", "q2"`},
		{twoSpins, "[target]\nsites = ['q1', 'q1']\ngate = 'CNOT'\n", `7: target.sites: found "q1" a second time; allowed: each site once`},
		{twoSpins, "[target]\nsites = []\ngate = 'CNOT'\n", `7: target.sites: found no site; allowed: 1 to 6, as in ["q1", "q2"]`},
		{twoSpins, "[target]\nsites = ['1', '2', '3', '4', '5', '6', '7']\ngate = 'identity'\n", `7: target.sites: found an array of 7; allowed: an array of at most 6 texts in quotes`},
		{twoSpins, "[target]\nsite = 'q1'\nsites = ['q1', 'q2']\ngate = 'CNOT'\n", `8: target.sites: found sites beside site; allowed: one of the two`},
		{twoSpins, "[target]\nsites = ['q1', 'q2']\ngate = 'X90'\n", `8: target.gate: found "X90"; allowed: "CNOT", "CZ", "SWAP", "iSWAP", "sqrt-iSWAP", "sqrt-SWAP" or "identity"`},
		{threeSpins, "[target]\nsites = ['q1', 'q2', 'q3']\ngate = 'CNOT'\n", `8: target.gate: found "CNOT"; allowed: "identity"`},
		{twoSpins, "[target]\nsites = ['q1', 'q2']\naxis = [0, 0, 1]\nangle = '90 deg'\n", `8: target.axis: found an axis for 2 sites; allowed: axis and angle for one site`},
		{twoSpins, "[target]\nsites = ['q1', 'q2']\nmatrix = [[1, 0], [0, 1]]\n", `8: target.matrix: found 2 rows; allowed: 4 rows, 2 for each of the 2 sites multiplied together`},
		{twoSpins, "[target]\nsites = ['q1', 'q2']\nmatrix = [[1, 0, 0, 0], [0, 1, 0, 0], [0, 0, 1, 0], [0, 0, 0, 1.1]]\n", `8: target.matrix: found a matrix M with |M'M - 1| = 0.21; allowed: a unitary one, to within 1e-06 (write the entries with 8 digits or more)`},
		{twoSpins, "[target]\nsites = ['q1', 'q2']\nmatrix = [[1, 0, 0, 0, 0], [0, 1, 0, 0, 0], [0, 0, 1, 0, 0], [0, 0, 0, 1, 0], [0, 0, 0, 0, 1]]\n", `8: target.matrix: found 5 rows; allowed: a square matrix of at most 4 rows, each entry a number or [re, im], each part from -1e+30 to 1e+30`},
		{twoSpins, "[target]\nsite = 'q1'\ngates = { q1 = 'X90' }\n", `7: target.site: found site beside gates; allowed: gates alone, which names the sites`},
		{twoSpins, "[target]\ngates = { q1 = 'x90', q2 = 'H' }\n", `7: target.gates.q1: found "x90"; allowed: "X90", "-X90", "X180", "Y90", "-Y90", "Y180", "Z90", "Z180", "H", "S", "T" or "identity" (did you mean "X90"?)`},
		{twoSpins, "[target]\ngates = { q1 = 'X90', q9 = 'H' }\n", `7: target.gates: found "q9"; allowed: a site of DIR/device.toml, "q1", "q2"`},
		{twoSpins, "[target]\ngates = {}\n", `7: target.gates: found 0 sites; allowed: 1 to 6, as in { q1 = "X90", q2 = "identity" }`},
		{twoSpins, "[target]\ngates = 'X90'\n", `7: target.gates: found "X90"; allowed: a table, [target.gates] or gates = { ... }`},
		{twoSpins, "[target]\nsite = 'q1'\ncontrolled = 'X90'\n", `8: target.controlled: found it for one site; allowed: sites, the controls and then the site of the gate, as in ["q1", "q2"]`},
		{twoSpins, "[target]\nsites = ['q1', 'q2']\ncontrolled = 'CNOT'\n", `8: target.controlled: found "CNOT"; allowed: "X90", "-X90", "X180", "Y90", "-Y90", "Y180", "Z90", "Z180", "H", "S", "T" or "identity"`},
		{twoSpins, gate + "free_z = 'both'\nup_to = 'local rotations'\n", `9: target.free_z: found free_z beside up_to = "local rotations"; allowed: one of the two, as the latter frees every rotation of a single site`},
		{twoSpins, gate + "up_to = 'phases'\n", `9: target.up_to: found "phases"; allowed: "local rotations"`},
		{oneSpin, single + "up_to = 'local rotations'\n", `9: target.up_to: found local rotations for a device of one site; allowed: them for two sites or more, as of one they are every gate`},
		// States.
		{twoSpins, "[target]\nsite = 'q1'\nfrom = '0'\nto = '1'\n", `7: target.site: found site beside from or to; allowed: these alone, as they are states of all sites of the device`},
		{twoSpins, "[target]\nfrom = '00'\n", `6: target.to: found nothing; allowed: a text in quotes`},
		{twoSpins, "[target]\nto = '00'\n", `6: target: found none of gate, gates, controlled, axis, matrix or from; allowed: exactly one of them`},
		{twoSpins, "[target]\ngate = 'CNOT'\nto = '00'\n", `8: target.to: found to without from; allowed: both, as in from = "00" and to = "11"`},
		{twoSpins, "[target]\ngate = 'CNOT'\nfrom = '00'\nto = '00'\n", `8: target.from: found from beside gate; allowed: exactly one of gate, gates, controlled, axis, matrix or from`},
		{twoSpins, "[target]\nfrom = '00'\nto = '012'\n", `8: target.to: found "012"; allowed: labels of 0 and 1, one for each site, as in "01"; or GHZ, W, or 2^n numbers`},
		{twoSpins, "[target]\nfrom = '000'\nto = '01'\n", `7: target.from: found "000"; allowed: labels of 2 digits, a 0 or 1 for each site of the device`},
		{twoSpins, "[target]\nfrom = '00'\nto = '1'\n", `8: target.to: found "1"; allowed: labels of 2 digits, a 0 or 1 for each site of the device`},
		{twoSpins, "[target]\nfrom = ['00', '1']\nto = ['00', '11']\n", `7: target.from: found "1" beside "00"; allowed: labels of one length`},
		{twoSpins, "[target]\nfrom = ['00', '00']\nto = ['00', '11']\n", `7: target.from: found "00" a second time; allowed: each state once`},
		{twoSpins, "[target]\nfrom = ['00', 'GHZ']\nto = ['00', '11']\n", `7: target.from: found "GHZ"; allowed: labels of 0 and 1, one for each site, as in "01"; or GHZ, W, or 2^n numbers`},
		{twoSpins, "[target]\nfrom = ['00', '01']\nto = ['00']\n", `8: target.to: found 1 where from has 2; allowed: as many states as in from`},
		{twoSpins, "[target]\nfrom = ['00', '01']\nto = 'GHZ'\n", `8: target.to: found 1 where from has 2; allowed: as many states as in from`},
		{twoSpins, "[target]\nfrom = ['00', 1]\nto = ['00', '11']\n", `7: target.from: found 1 as element 1; allowed: a text in quotes`},
		{twoSpins, "[target]\nfrom = []\nto = '00'\n", `7: target.from: found no state; allowed: labels of 0 and 1, one for each site, as in "01"`},
		{twoSpins, "[target]\nfrom = 7\nto = '00'\n", `7: target.from: found 7; allowed: a text in quotes`},
		{twoSpins, "[target]\nfrom = ['00', '01', '10', '11']\nto = ['11', '01', '10', '00']\n", `7: target.from: found all 4 states; allowed: fewer, as the span of all of them stays what it is`},
		{twoSpins, "[target]\nfrom = [1, 0]\nto = '00'\n", `7: target.from: found 2 numbers; allowed: 4, one for each code state of the 2 sites`},
		{twoSpins, "[target]\nfrom = [1, 0, 0, 0.1]\nto = '00'\n", `7: target.from: found a state of length 1.0049876; allowed: a state of length 1, to within 1e-06`},
		{twoSpins, "[target]\nfrom = [1, 0, [0, 0, 0], 0]\nto = '00'\n", `7: target.from: found an array of 3 as element 2; allowed: a number or [re, im], each part from -1e+30 to 1e+30`},
		{oneSpin, "[target]\nfrom = '0'\nto = 'W'\n", `8: target.to: found "W" for one site; allowed: it for two sites or more`},
		{twoSpins, "[target]\nfrom = '00'\nto = '11'\nfree_z = 'after'\n", `9: target.free_z: found free_z beside from; allowed: free_z for a gate`},
		{twoSpins, "[target]\nfrom = '00'\nto = '11'\nup_to = 'local rotations'\n", `9: target.up_to: found up_to beside from; allowed: up_to for a gate`},
		// Errors.
		{twoSpins, gate + "[[error]]\noperator = 'X'\n", `10: error[0].operator: found no site beside it; allowed: a site, as in site = "q1" (the target is not of one site)`},
		{twoSpins, gate + "[[error]]\noperator = 'X'\nsite = 'q3'\n", `11: error[0].site: found "q3"; allowed: a site of DIR/device.toml, "q1", "q2"`},
		{twoSpins, gate + "[[error]]\ndetuning = 'q1'\nsite = 'q2'\n", `11: error[0].site: found a site beside detuning; allowed: only beside operator or crosstalk`},
		{twoSpins, gate + "[[error]]\non = { q1 = 'Z', q3 = 'X' }\n", `10: error[0].on: found "q3"; allowed: a site of DIR/device.toml, "q1", "q2"`},
		{twoSpins, gate + "[[error]]\non = { q1 = 'z', q2 = 'X' }\n", `10: error[0].on.q1: found "z"; allowed: "X", "Y" or "Z" (did you mean "Z"?)`},
		{twoSpins, gate + "[[error]]\non = {}\n", `10: error[0].on: found 0 sites; allowed: 1 to 6, each with X, Y or Z, as in { q1 = "Z", q2 = "X" }`},
		{twoSpins, gate + "[[error]]\non = 'ZZ'\n", `10: error[0].on: found "ZZ"; allowed: a table, [error[0].on] or on = { ... }`},
		{twoSpins, gate + "[[error]]\ncollective = 'ZZ'\n", `10: error[0].collective: found "ZZ"; allowed: "X", "Y" or "Z"`},
		{twoSpins, gate + "[[error]]\nmatrix = [[0.5, 0], [0, -0.5]]\n", `10: error[0].matrix: found 2 rows; allowed: 4 rows, the levels of DIR/device.toml`},
		{twoSpins, gate + "[[error]]\nmatrix = [[1, 0, 0, 0], [0, 1, 0, 0], [0, 0, 0, 0], [0, 0, 0, 0]]\n", `10: error[0].matrix: found the trace 2; allowed: a traceless Hermitian matrix, as in [[0, [0, -0.5]], [[0, 0.5], 0]] (subtract 0.5 from the diagonal: an energy common to all levels changes nothing)`},
		{twoSpins, gate + "[[error]]\nany = 'on q1, q3'\n", `10: error[0].any: found "q3"; allowed: sites of DIR/device.toml, "q1", "q2"`},
		{twoSpins, gate + "[[error]]\nany = 'on q1, q1'\n", `10: error[0].any: found "on q1, q1"; allowed: 1 to 6 sites, each once, as in "on q1, q2"`},
		{twoSpins, gate + "[[error]]\nany = 'on '\n", `10: error[0].any: found "on "; allowed: 1 to 6 sites, each once, as in "on q1, q2"`},
		{twoSpins, gate + "[[error]]\nany = 'leakage'\n", `10: error[0].any: found "leakage" for a device without levels outside the code space; allowed: it where a site has more than two levels`},
		{oneSpin, single + "[[error]]\nany = 'two-body'\n", `10: error[0].any: found "two-body" for a device of 1 site; allowed: a class that has an operator there`},
		{spins(6), single + "[[error]]\nany = 'all'\n", `10: error[0].any: found 4095 operators of 64 levels; allowed: at most 1024 (a smaller class, such as "one-body", "two-body" or "on q1, q2")`},
		{twoSpins, gate + "[[error]]\nany = 'one-body'\nexcept = [ { q1 = 'Z', q2 = 'Z' } ]\n", `11: error[0].except[0]: found ZZ on q1, q2, which is not of the class, or out of it already; allowed: an operator of the class, once`},
		{twoSpins, gate + "[[error]]\nany = 'one-body'\nexcept = [\n{ q1 = 'Z' },\n{ q1 = 'Z' } ]\n", `13: error[0].except[1]: found Z on q1, which is not of the class, or out of it already; allowed: an operator of the class, once`},
		{twoSpins, gate + "[[error]]\nany = 'one-body'\nexcept = [ { q3 = 'Z' } ]\n", `11: error[0].except[0]: found "q3"; allowed: sites of DIR/device.toml, "q1", "q2"`},
		{twoSpins, gate + "[[error]]\nany = 'one-body'\nexcept = [ { q1 = 'z' } ]\n", `11: error[0].except[0].q1: found "z"; allowed: "X", "Y" or "Z" (did you mean "Z"?)`},
		{twoSpins, gate + "[[error]]\nany = 'one-body'\nexcept = ['Z1']\n", `11: error[0].except: found "Z1"; allowed: only tables in this array`},
		{twoSpins, gate + "[[error]]\nany = 'on q1'\nexcept = [{q1 = 'X'}, {q1 = 'Y'}, {q1 = 'Z'}]\n", `10: error[0].any: found "on q1", of which except leaves nothing; allowed: a class that keeps an operator`},
		{mixedSites, single + "[[error]]\nany = 'all'\nexcept = [ { q2 = 'Z' } ]\n", `11: error[0].except[0]: found "q2", a site of 3 levels; allowed: sites of two levels`},
		{mixedSites, single + "[[error]]\nany = 'leakage'\nexcept = [ { q3 = 'Z' } ]\n", `11: error[0].except: found it beside any = "leakage"; allowed: except beside the other classes, whose operators are products`},
		{mixedSites, single + "[[error]]\nany = 'leakage'\nrates = 'r.csv'\n", `11: error[0].rates: found it beside any = "leakage"; allowed: rates beside the other classes, of sites with two levels`},
		{twoSpins, gate + "[[error]]\non = { q1 = 'Z' }\nexcept = [ { q1 = 'Z' } ]\n", `11: error[0].except: found except beside on; allowed: only beside any`},
		{twoSpins, gate + "[[error]]\ncollective = 'Z'\nrates = 'r.csv'\n", `11: error[0].rates: found rates beside collective; allowed: only beside any`},
		{twoSpins, gate + "[[error]]\nany = 'all'\nrates = '../r.csv'\n", `11: error[0].rates: found "../r.csv"; allowed: the name of a .csv file that lies beside the brief, such as "rates.csv"`},
		{twoSpins, gate + "[[error]]\nany = 'all'\nrates = 'r.toml'\n", `11: error[0].rates: found "r.toml"; allowed: the name of a .csv file that lies beside the brief, such as "rates.csv"`},
		{twoSpins, gate + "[[error]]\nany = 'all'\nrates = '.csv'\n", `11: error[0].rates: found ".csv"; allowed: the name of a .csv file that lies beside the brief, such as "rates.csv"`},
		{twoSpins, gate + "[[error]]\ncrosstalk = 'd1'\n", `9: error[0].site: found nothing; allowed: a text in quotes`},
		{twoSpins, gate + "[[error]]\ncrosstalk = 'd3'\nsite = 'q2'\n", `10: error[0].crosstalk: found "d3"; allowed: a channel that drives a site of DIR/device.toml, "d1", "field"`},
		{twoSpins, gate + "[[error]]\ncrosstalk = 'd1'\nsite = 'q3'\n", `11: error[0].site: found "q3"; allowed: a site of DIR/device.toml, "q1", "q2"`},
		{twoSpins, gate + "[[error]]\ncrosstalk = 'd1'\nsite = 'q1'\n", `11: error[0].site: found "q1", the site that "d1" is meant for; allowed: another site (amplitude is what scales a channel on its own)`},
		{framed, gate + "[[error]]\ncrosstalk = 'd1'\nsite = 'q2'\n", `11: error[0].site: found "q2", whose frame turns by 100 MHz away from that of "d1"; allowed: a site whose frame turns as fast`},
		{strings.Replace(framed, "frequency = '5 GHz'\n", "", 1), gate + "[[error]]\ncrosstalk = 'd1'\nsite = 'q2'\n", `11: error[0].site: found a frequency for one of "q1" and "q2" only; allowed: a frequency for both in DIR/device.toml, or for neither (the field then turns with both)`},
		{twoSpins, gate + "[[error]]\ncrosstalk = 'd1'\nsite = 'q2'\nsize = '1 MHz'\n", `12: error[0].size: found "1 MHz"; allowed: a share such as "1.5 %", 1 ppm to 50 % ("MHz" is a unit of frequency)`},
		// Margins.
		{twoSpins, gate + "[[require.margin]]\nerror = 'amplitude'\nsize = '1 %'\n[[require.margin]]\nerror = 'detuning'\nsize = '1 MHz'\n", `13: require.margin[1].error: found "detuning"; allowed: an error of the brief that is not of any, "amplitude" (what is judged undeclared on one spin is not on this device)`},
		{twoSpins, gate + "[[error]]\nany = 'one-body'\n[[require.margin]]\nerror = 'X'\nsize = '1 MHz'\n", `12: require.margin[0].error: found "X"; allowed: no margin, as the brief has no error that is not of any (what is judged undeclared on one spin is not on this device)`},
		{oneLadder, single + "[[require.margin]]\nerror = 'X'\nsize = '1 MHz'\n", `10: require.margin[0].error: found "X"; allowed: an error of the brief that is not of any, "detuning", "amplitude" (what is judged undeclared on one spin is not on this device)`},
		{twoSpins, gate + "[[error]]\nany = 'one-body'\n[[require.margin]]\nerror = 'any one-body error'\nsize = '1 MHz'\n", `12: require.margin[0].error: found "any one-body error"; allowed: "detuning", "amplitude", "X", "Y" or "Z"`},
	} {
		_, _, dir, err := several(t, c.sites, c.text)
		want := filepath.Join(dir, "brief.toml") + ":" + strings.ReplaceAll(c.want, "DIR", dir)
		if err == nil || err.Error() != want {
			t.Errorf("%q:\n got %v\nwant %s", c.text, err, want)
		}
	}
}

// TestMapped: errors that ride on a bias with a map are refused by name and left out of defaults.
func TestMapped(t *testing.T) {
	d := "format = 1\nname = 'x'\n[[site]]\nname = 'q1'\n[[drive]]\nsite = 'q1'\nchannel = 'a'\n[[bias]]\nsite = 'q1'\nchannel = 'f'\npolynomial = [1, 0.2]\n"
	profile := "format = 1\n[instrument]\nname = 'x'\nsample_rate = '1 GS/s'\nresolution = '14 bit'\nblock = 8\n[[channel]]\nname = 'a'\nkind = 'quadrature'\nmixing = 'I cos + Q sin'\nfull_scale = '40 MHz'\n" +
		"[[channel]]\nname = 'f'\nkind = 'baseband'\nfull_scale = '20 MHz'\n[channel.line]\ntails = [ { amplitude = '-1 %', time = '30 ns', known_to = '20 %' } ]\n"
	load := func(rest string) (*Brief, error) {
		dir := t.TempDir()
		for name, text := range map[string]string{"p.toml": profile, "d.toml": d, "b.toml": "format = 1\nname = 'x'\nprofile = 'p.toml'\ndevice = 'd.toml'\nspan = '64 ns'\n" + rest} {
			if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o666); err != nil {
				t.Fatal(err)
			}
		}
		b, _, _, err := LoadAll(filepath.Join(dir, "b.toml"))
		return b, err
	}
	const target = "[target]\nsite = 'q1'\ngate = 'X90'\n"
	b, err := load(target)
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range b.Errors {
		if e.Kind == Amplitude && !slices.Equal(e.Channels, []string{"a"}) {
			t.Errorf("amplitude of %v", e.Channels)
		}
	}
	for _, key := range []string{"amplitude = 'f'", "line = 'f'\nparameter = 'delay'"} {
		if _, err := load(target + "[[error]]\n" + key + "\n"); err == nil || !strings.Contains(err.Error(), "a bias with a polynomial or a loop") {
			t.Errorf("%s: %v", key, err)
		}
	}
	if _, err := load("hold = 'profile'\n" + target); err == nil || !strings.Contains(err.Error(), "no parameter of these lines") {
		t.Errorf("hold: %v", err)
	}
	if _, err := load(target + "[[error]]\noffset = 'f'\n"); err != nil {
		t.Error(err)
	}
}

// TestMoving: order, spread and noise as they are read, and what they do not go with.
func TestMoving(t *testing.T) {
	const d = "format = 1\nname = 'x'\n[[site]]\nname = 'q1'\n[[drive]]\nsite = 'q1'\nchannel = 'a'\n"
	profile := func(shift string) string {
		return "format = 1\n[instrument]\nname = 'x'\nsample_rate = '1 GS/s'\nresolution = '14 bit'\nblock = 8\n[[channel]]\nname = 'a'\nkind = 'quadrature'\nmixing = 'I cos + Q sin'\nfull_scale = '40 MHz'\n" + shift
	}
	load := func(shift, rest string) (*Brief, error) {
		dir := t.TempDir()
		for name, text := range map[string]string{"p.toml": profile(shift), "d.toml": d, "b.toml": "format = 1\nname = 'x'\nprofile = 'p.toml'\ndevice = 'd.toml'\nspan = '64 ns'\n[target]\nsite = 'q1'\ngate = 'X90'\n[[error]]\n" + rest} {
			if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o666); err != nil {
				t.Fatal(err)
			}
		}
		b, _, _, err := LoadAll(filepath.Join(dir, "b.toml"))
		return b, err
	}
	const noise = "noise = { form = 'white', sigma = '1 %', high = '1 MHz' }\n"
	b, err := load("", "detuning = 'q1'\nspread = 'worst'\nvalues = ['-2 MHz', '1 MHz']\n[[error]]\namplitude = 'a'\n"+noise+"[[error]]\noperator = 'X'\norder = 2\n")
	if err != nil {
		t.Fatal(err)
	}
	e := b.Errors
	if e[0].Spread != Corners || len(e[0].Values) != 2 || !(math.Abs(e[0].Values[0]+2*math.Pi*2e-3) <= 1e-15) || !(math.Abs(e[0].Values[1]-2*math.Pi*1e-3) <= 1e-15) {
		t.Errorf("spread %+v", e[0])
	}
	if e[1].Noise == nil || e[1].Name != "amplitude noise" || !(math.Abs(e[1].Noise.Variance()/1e-4-1) <= 1e-9) {
		t.Errorf("noise %+v", e[1])
	}
	if e[0].Order != 1 || e[2].Order != 2 {
		t.Errorf("orders %d, %d", e[0].Order, e[2].Order)
	}
	for _, c := range []struct{ shift, rest, want string }{
		{"", "amplitude = 'a'\nquadrature = 'I'\n" + noise, "error[0].noise: found noise of one quadrature"},
		{"shift = '200 kHz'\n", "amplitude = 'a'\n" + noise, "which shifts what it drives"},
		{"", "any = 'all'\nnoise = { form = 'white', sigma = '1 kHz', high = '1 MHz' }\n", "error[0].noise: found noise beside any"},
		{"", "detuning = 'q1'\nsize = '1 MHz'\nnoise = { form = 'white', sigma = '1 kHz', high = '1 MHz' }\n", "error[0].size: found a size beside noise"},
		{"", "detuning = 'q1'\nnoise = { form = 'trace', file = '../n.csv' }\n", "allowed: the name of a .csv file that lies beside the brief"},
		{"", "detuning = 'q1'\nvalues = ['1 MHz']\n", "error[0].values: found values without a spread"},
		{"", "detuning = 'q1'\nspread = 'average'\nvalues = []\n", "error[0].values: found no value"},
		{"", "detuning = 'q1'\nspread = 'average'\norder = 2\n", "error[0].order: found order = 2 beside a spread"},
		{"", "any = 'all'\nspread = 'average'\n", "error[0].spread: found a spread beside any"},
	} {
		if _, err := load(c.shift, c.rest); err == nil || !strings.Contains(err.Error(), c.want) || strings.Contains(err.Error(), "\n") {
			t.Errorf("%s\ngot  %v\nwant %s", c.rest, err, c.want)
		}
	}
}
