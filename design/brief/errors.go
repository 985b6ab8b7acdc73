package brief

import (
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strings"

	"holdfast/design/device"
	"holdfast/design/noise"
	"holdfast/hardware/quantity"
)

// readErrors reads the errors; values are what stands in each of their tables.
func (b *Brief) readErrors(root *quantity.Table, values []map[string]any) {
	tables := root.Tables("error", mostErrors)
	if root.Has("hold") {
		hold := root.Choice("hold", []string{"nothing", "profile"})
		b.HoldNothing, b.HoldProfile = hold == "nothing", hold == "profile"
		if b.HoldNothing && len(tables) > 0 {
			tables[0].Fail("", `found an [[error]] beside hold = "nothing"; allowed: one of the two`)
		}
	}
	if len(tables) == 0 && !b.HoldNothing && !b.HoldProfile {
		b.Defaulted = true
		z, _ := device.Operator("Z")
		b.Errors = []Error{
			{Name: "detuning", Kind: Static, Operator: z.Scale(0.5), Size: rate(defaultStatic), Weight: 1, unsized: true},
			{Name: "amplitude", Kind: Amplitude, Size: defaultShare, Weight: 1},
			{Name: anyNames[All], Kind: Any, Scope: All, Size: rate(defaultAny), Weight: 1, unsized: true, scope: All},
		}
		return
	}
	for i, t := range tables {
		var v map[string]any
		if i < len(values) {
			v = values[i]
		}
		for _, e := range b.readError(t, v) {
			e.index = i
			if slices.ContainsFunc(b.Errors, func(other Error) bool { return other.Name == e.Name }) {
				t.Fail("name", "found a second error called %q; allowed: a name of its own for each error", e.Name)
			}
			b.Errors = append(b.Errors, e)
		}
	}
}

// errorKeys are the keys of which each error has one.
var errorKeys = []string{"detuning", "amplitude", "operator", "matrix", "any", "line", "quadrature_angle", "offset", "on", "collective", "crosstalk"}

// besides says beside which of errorKeys a key may stand.
var besides = []struct {
	key, words string
	with       []string
}{
	{"quadrature", "a quadrature", []string{"amplitude", "offset"}},
	{"parameter", "a parameter", []string{"line"}},
	{"site", "a site", []string{"operator", "crosstalk"}},
	{"except", "except", []string{"any"}},
	{"rates", "rates", []string{"any"}},
}

// readError gives the error of one table; two, for I and Q, of an offset without a quadrature. Values are what stands in the table.
func (b *Brief) readError(t *quantity.Table, values map[string]any) []Error {
	e := Error{key: oneOf(t, errorKeys...)}
	e.line = t.Line(e.key)
	size := func(f float64) float64 {
		e.unsized = !t.Has("size")
		return rate(t.Quantity("size", quantity.Frequency, smallestSize, largestSize, f))
	}
	share := func(s float64) float64 { return t.Quantity("size", quantity.Ratio, smallestShare, mostShare, s) }
	for _, k := range besides {
		if t.Has(k.key) && e.key != "" && !slices.Contains(k.with, e.key) {
			t.Fail(k.key, "found %s beside %s; allowed: only beside %s", k.words, e.key, strings.Join(k.with, " or "))
		}
	}
	if t.Has("quadrature") && (e.key == "amplitude" || e.key == "offset") {
		e.lineQuadrature = t.Line("quadrature")
		e.Quadrature = t.Choice("quadrature", []string{"I", "Q"})
	}
	natural := ""
	switch e.key {
	case "detuning":
		z, _ := device.Operator("Z")
		e.Kind, natural, e.on, e.Operator, e.Size = Static, "detuning", t.Text("detuning"), z.Scale(0.5), size(defaultStatic)
	case "amplitude":
		e.Kind, natural, e.on = Amplitude, strings.TrimSpace("amplitude "+e.Quadrature), t.Text("amplitude")
		e.Channels, e.Size = []string{e.on}, share(defaultShare)
	case "operator":
		natural = t.Choice("operator", device.OperatorNames())
		m, _ := device.Operator(natural)
		e.Kind, e.Operator, e.Size = Static, m.Scale(0.5), size(defaultStatic)
		if e.siteAt.line = t.Line("site"); t.Has("site") {
			e.site = t.Text("site")
			natural += " on " + e.site
		}
	case "matrix":
		e.Kind, natural, e.matrix, e.Size = Static, "matrix", readOperator(t), size(defaultStatic)
		if e.matrix.N == 2 {
			e.Operator = e.matrix
		}
	case "on":
		e.Kind, e.product, e.Size = Static, readProduct(t.Table("on"), tableOf(values["on"])), size(defaultStatic)
		natural = e.product.String()
	case "collective":
		axis := t.Choice("collective", device.OperatorNames())
		e.Kind, natural, e.product, e.Size = Static, "collective "+axis, product{axes: []string{axis}}, size(defaultStatic)
	case "any":
		natural = e.readAny(t, values)
		if e.Kind, e.Size = Any, size(defaultAny); e.Rates != "" {
			e.RatesPath = b.beside(e.Rates)
		}
	case "line":
		e.Kind, e.on, e.Parameter = Line, t.Text("line"), t.Text("parameter")
		e.lineParameter = t.Line("parameter")
		natural = lineName(e.on, e.Parameter)
		e.Channels, e.Size, e.unsized = []string{e.on}, share(defaultParameter), !t.Has("size")
	case "quadrature_angle":
		e.Kind, natural, e.on = Skew, "quadrature angle", t.Text("quadrature_angle")
		e.Channels, e.Size = []string{e.on}, t.Quantity("size", quantity.Angle, smallestSkew, largestSkew, defaultSkew)
	case "offset":
		e.Kind, natural, e.on = Offset, strings.TrimSpace("offset "+e.Quadrature), t.Text("offset")
		e.Channels, e.Size = []string{e.on}, share(defaultOffset)
	case "crosstalk":
		e.Kind, e.on, e.Site, e.siteAt.line = Crosstalk, t.Text("crosstalk"), t.Text("site"), t.Line("site")
		natural = e.on + " on " + e.Site
		e.Channels, e.Size = []string{e.on}, share(defaultCrosstalk)
	default: // complained of already; the rest is asked for so that its keys are known
		t.Has("size")
	}
	if t.Has("noise") {
		natural += " noise"
	}
	e.Name = t.Text("name", natural)
	if _, reserved := standard(e.Name); reserved && e.Name != natural {
		t.Fail("name", "found %q for another error; allowed: any name but detuning, amplitude, X, Y and Z, which stand for the errors of these kinds", e.Name)
	}
	e.Weight = t.Number("weight", 1e-6, 1e6, 1)
	e.Order = t.Int("order", 1, 2, 1)
	e.lineOrder = t.Line("order")
	e.readSpread(t)
	b.readNoise(&e, t)
	if e.Kind != Offset || e.Quadrature != "" {
		return []Error{e}
	}
	i, q := e, e
	i.Name, i.Quadrature, i.expanded = e.Name+" I", "I", true
	q.Name, q.Quadrature, q.expanded = e.Name+" Q", "Q", true
	return []Error{i, q}
}

// readNoise reads the spectrum of an error that fluctuates.
func (b *Brief) readNoise(e *Error, t *quantity.Table) {
	if !t.Has("noise") {
		return
	}
	n := t.Table("noise")
	kind := noise.Detuning
	switch e.Kind {
	case Static:
	case Amplitude:
		if kind = noise.Relative; e.Quadrature != "" {
			t.Fail("noise", "found noise of one quadrature; allowed: noise of both")
			return
		}
	default:
		t.Fail("noise", "found noise beside %s; allowed: beside an amplitude or an error of one operator", e.key)
		return
	}
	switch {
	case e.Order == 2, e.Spread != "":
		t.Fail("noise", "found noise beside an order of 2 or a spread; allowed: one of the three")
	case t.Has("size"):
		t.Fail("size", "found a size beside noise; allowed: sigma in its place, among the keys of noise")
	}
	if file := n.Text("file", ""); file != "" && (strings.ContainsAny(file, `/\:`) || !strings.EqualFold(filepath.Ext(file), ".csv") || len(file) == len(".csv")) {
		n.Fail("file", "found %q; allowed: the name of a .csv file that lies beside the brief", file)
		return
	}
	e.Noise = noise.Read(n, filepath.Dir(b.File), kind)
}

// readSpread reads over which values of the error the exact infidelity is to be lowered.
func (e *Error) readSpread(t *quantity.Table) {
	if !t.Has("spread") {
		if t.Has("values") {
			t.Fail("values", `found values without a spread; allowed: both, as in spread = "worst" and values = ["-1 MHz", "1 MHz"]`)
		}
		return
	}
	e.Spread = t.Choice("spread", []string{Average, Corners})
	if e.Kind == Any {
		t.Fail("spread", "found a spread beside any; allowed: beside an error of one parameter")
	}
	if e.Order == 2 {
		t.Fail("order", "found order = 2 beside a spread; allowed: one of the two")
	}
	if !t.Has("values") {
		return
	}
	switch e.Kind {
	case Amplitude, Line, Offset, Crosstalk:
		e.Values = t.Quantities("values", mostValues, quantity.Ratio, -mostShare, mostShare)
	case Skew:
		e.Values = t.Quantities("values", mostValues, quantity.Angle, -largestSkew, largestSkew)
	default:
		e.Values = t.Quantities("values", mostValues, quantity.Frequency, -largestSize, largestSize)
		for i := range e.Values {
			e.Values[i] = rate(e.Values[i])
		}
	}
	if e.Values != nil && len(e.Values) == 0 {
		t.Fail("values", "found no value; allowed: 1 to %d", mostValues)
	}
}

// lineName is the name of an error of a line's parameter, unless the brief gives another.
func lineName(channel, parameter string) string { return channel + " " + parameter }

// standard reports whether name is that of an error of which replay finds the margin whether declared or not, and its kind.
func standard(name string) (kind string, ok bool) {
	switch name {
	case "detuning", "X", "Y", "Z":
		return Static, true
	case "amplitude":
		return Amplitude, true
	}
	return "", false
}

// readOperator gives the matrix of an error, freed of what typing left: Hermitian and traceless to the last digit.
func readOperator(t *quantity.Table) device.Matrix {
	rows := t.Matrix("matrix", mostDim)
	if rows == nil {
		return device.Zero(2)
	}
	m := device.FromRows(rows)
	if m.N < 2 {
		t.Fail("matrix", "found %d row; allowed: 2 rows or more, as many as the device has levels", m.N)
		return device.Zero(2)
	}
	largest := 0.0
	for _, v := range m.Data {
		largest = max(largest, math.Abs(real(v)), math.Abs(imag(v)))
	}
	const words = "allowed: a traceless Hermitian matrix, as in [[0, [0, -0.5]], [[0, 0.5], 0]]"
	trace := m.Trace()
	switch {
	case largest == 0:
		t.Fail("matrix", "found nothing but zeros; %s", words)
	case largest > largestEntry:
		t.Fail("matrix", "found an entry of %.6g; allowed: entries up to %d (the size of the error is another key)", largest, largestEntry)
	case !(m.Add(-1, m.Adjoint()).Norm() <= matrixTolerance*largest):
		for i := range m.N {
			for j := i; j < m.N; j++ {
				if a, b := m.At(i, j), m.At(j, i); math.Hypot(real(a)-real(b), imag(a)+imag(b)) > matrixTolerance*largest/2 {
					t.Fail("matrix", "found %s in row %d, column %d and %s in row %d, column %d, which are not conjugate; %s", entry(a), i, j, entry(b), j, i, words)
					return device.Zero(2)
				}
			}
		}
	case math.Abs(real(trace)) > matrixTolerance*largest:
		t.Fail("matrix", "found the trace %.6g; %s (subtract %.6g from the diagonal: an energy common to all levels changes nothing)", real(trace), words, real(trace)/float64(m.N))
	}
	m = m.Add(1, m.Adjoint()).Scale(0.5)
	return m.Add(-m.Trace()/complex(float64(m.N), 0), device.Identity(m.N))
}

// entry prints a matrix entry as it is written in the file.
func entry(v complex128) string {
	if imag(v) == 0 {
		return fmt.Sprintf("%.6g", real(v))
	}
	return fmt.Sprintf("[%.6g, %.6g]", real(v), imag(v))
}
