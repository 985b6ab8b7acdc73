package brief

import (
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strings"

	"holdfast/design/device"
	"holdfast/hardware/quantity"
)

// Brief is what is wanted.
type Brief struct {
	File            string // as the caller of Load named it
	Name            string
	Profile, Device string // as written
	ProfilePath     string // the same from the working folder: a relative path starts at the brief's folder
	DevicePath      string
	Target          Target
	Span            float64 // ns
	Basis           Basis
	Ends            string  // Settled or Window: which infidelity is designed for and required
	Errors          []Error // what the pulse is held against
	Defaulted       bool    // the file names no error, so Errors are detuning, amplitude and any static error
	HoldNothing     bool    // hold = "nothing": Errors is empty
	HoldProfile     bool    // hold = "profile": Complete adds every parameter of the driving lines that is known to some share
	Require         Require
	Seed            uint64    // default 1
	Starts          int       // of the search, default 60
	Refine          bool      // default true
	PhaseBy         string    // ByInstrument or BySamples: who turns the gate's axis in the XY plane
	Phases          []float64 // rad, with BySamples: the angles to which the gate is emitted

	lines lines
}

// lines says where keys stand that LoadAll may have to complain of.
type lines struct{ span, site, coefficients, hold, profile, device int }

// Who turns a gate's axis about Z, as frames and phases of a sequence ask.
const (
	ByInstrument = "instrument" // one waveform is emitted; the instrument turns its phase
	BySamples    = "samples"    // one waveform for each of the phases
)

// The ends of a gate: settled counts what arrives after the window too.
const (
	Settled = "settled"
	Window  = "window"
)

// Target is the gate that is wanted, exp(-i Angle/2 (Axis.sigma)) on one site.
type Target struct {
	Site   string
	Label  string // for people: the name of the gate, the rotation in words, or "matrix"
	Matrix device.Matrix
	Angle  float64    // rad
	Axis   [3]float64 // of length 1
	FreeZ  string     // NoFreeZ, Before, After or Both: where rotations about Z cost nothing
}

// Where rotations about Z are free, because phases are tracked in software: the design may choose them.
const (
	NoFreeZ = "none"
	Before  = "before"
	After   = "after"
	Both    = "both"
)

// Basis says of what the samples are made.
type Basis struct {
	Family       string // Slepian, Fourier, Tapered, BSpline, Samples or Best
	Coefficients int    // per quadrature; 0: as many as the band and the span carry
	Degree       int    // of BSpline, 1 to 5, default 3; for other families it means nothing
}

// The families of a basis.
const (
	Slepian = "slepian"
	Fourier = "fourier"  // a sine series
	Tapered = "tapered"  // a sine series that starts and ends softly
	BSpline = "b-spline" // orthonormalised B-splines
	Samples = "samples"  // one coefficient per free sample
	Best    = "best"     // whichever of Slepian, Fourier and BSpline serves best
)

// Error is an error, or a class of them, against which the pulse is held.
type Error struct {
	Name     string
	Kind     string        // Static, Amplitude, Any, Line, Skew or Offset
	Operator device.Matrix // of kind Static: traceless and Hermitian; H += lambda Operator, lambda in rad/ns
	// Channels are those of kind Amplitude (in a defaulted brief Complete fills them in), and the one of kind Line, Skew or Offset.
	Channels   []string
	Parameter  string // of kind Line: a name of hardware.Parameter
	Quadrature string // of kind Amplitude, "I", "Q", or empty for both; of kind Offset, "I" or "Q" ("I" for a baseband channel)
	// Size is in rad/ns of kinds Static and Any (defaults 3 MHz and 1 MHz, for slow drives less: Complete), a share of kinds Amplitude (3 %),
	// Line (what the profile says, else 5 %) and Offset (0.1 % of full scale), rad of kind Skew (1 deg).
	Size   float64
	Weight float64 // relative to the gate itself, default 1

	key, on                       string // which key made it, and the site or channel that key names; for Complete
	index                         int    // in the file; -1: not in it
	line                          int    // of the key
	lineParameter, lineQuadrature int    // of these keys
	unsized                       bool   // the default size may give way to what the profile makes of it
	expanded                      bool   // one of the two that stand for both quadratures
}

// The kinds of Error.
const (
	Static    = "static"    // one operator, constant in time
	Amplitude = "amplitude" // what channels deliver, or one quadrature of it, scaled
	Any       = "any"       // every traceless static operator
	Line      = "line"      // one parameter of a channel's line, off by a share of itself
	Skew      = "skew"      // quadratures that are not at right angles: u_I += -lambda u_Q, lambda in rad
	Offset    = "offset"    // a constant at the converter, a share of full scale
)

// Require says what the finished pulse must reach.
type Require struct {
	Infidelity     float64 // at most, for the stated ends; default 1e-4
	Susceptibility float64 // at most, of each held error; default 1e-3
	Margins        []Margin
}

// Margin asks that the infidelity stay within the requirement up to a size of an error, on both sides of zero.
type Margin struct {
	Error string  // the name of an error of the brief, or detuning, amplitude, X, Y or Z
	Size  float64 // rad/ns, a share, or rad, as Error.Size
}

// The ranges of what a brief may ask.
const (
	shortestSpan, longestSpan = 1e-3, 1e9 // ns
	smallestSize, largestSize = 1e-9, 1   // of errors, GHz: 1 Hz to 1 GHz
	smallestShare, mostShare  = 1e-6, 0.5 // of amplitude errors
	mostErrors, mostMargins   = 16, 16
	mostStarts                = 100_000
	mostCoefficients          = 65536
	largestEntry              = 100   // of an error's matrix
	matrixTolerance           = 1e-9  // of Hermitian and traceless, in units of the largest entry: what typing leaves
	defaultStatic             = 0.003 // GHz
	defaultAny                = 0.001 // GHz
	staticShare               = 0.075 // of the fastest drive's full scale: a default size is no larger; both defaults are these shares of 40 MHz
	anyShare                  = 0.025
	defaultShare              = 0.03
	defaultParameter          = 0.05          // of a line's parameter
	defaultSkew               = math.Pi / 180 // rad
	defaultOffset             = 1e-3          // of full scale
	smallestSkew, largestSkew = 1e-6, math.Pi / 6
	mostPhases                = 64
	samePhase                 = 1e-9 // rad
)

// rate turns a cyclic frequency in GHz into rad/ns.
func rate(f float64) float64 { return 2 * math.Pi * f }

// Load reads a brief. Errors are an *quantity.Error: one sentence with file, line and key. Keys, with defaults after the bar:
//
//	format = 1
//	name = "..."
//	profile = "rack-b.toml"          # beside the brief, or an absolute path
//	device = "skerry.toml"
//	span = "112 ns"
//	ends = "settled"                 # or "window"                      | "settled"
//	hold = "nothing"                 # excludes [[error]]; or "profile": the profile's known_to beside any [[error]] | absent
//	phase_by = "samples"             # or "instrument"                  | "instrument", without phases
//	phases = ["0 deg", "90 deg"]     # up to 64, with "samples" only
//	seed = 1                         #                                  | 1
//	starts = 60                      #                                  | 60
//	refine = true                    #                                  | true
//	[target]
//	site = "q1"
//	gate = "X90"                     # or axis = [1, 0, 0] and angle = "90 deg"; or matrix, unitary
//	free_z = "none"                  # or "before", "after", "both"     | "none"
//	[basis]
//	family = "slepian"               # "fourier", "tapered", "b-spline", "samples", "best" | "slepian"
//	coefficients = 20                #                                  | from band and span
//	degree = 3                       # of "b-spline", 1 to 5            | 3
//	[[error]]                        # none and no hold: detuning, amplitude and any static error
//	detuning = "q1"                  # or amplitude = "q1 drive", operator = "X", matrix, any = "all",
//	                                 # line = "q1 drive" with parameter, quadrature_angle = "q1 drive", offset = "q1 drive"
//	parameter = "lowpass[0].corner"  # of the line, as hardware.Parameter names it
//	quadrature = "I"                 # or "Q", with amplitude or offset | both; offsets as two errors, "... I" and "... Q"
//	name = "..."                     #                                  | "detuning", "amplitude", "X", "matrix", "any static error",
//	                                 #                                    "amplitude I", "q1 drive lowpass[0].corner", "quadrature angle", "offset I"
//	size = "3 MHz"                   # "3 %", "1 deg" by kind           | 3 MHz or 7.5 % of the fastest drive's full scale, whichever is less, 3 %,
//	                                 #                                    1 MHz or 2.5 % for any, known_to or 5 % of a line, 1 deg, 0.1 % of an offset
//	weight = 1                       #                                  | 1
//	[require]
//	infidelity = 1e-4                #                                  | 1e-4
//	susceptibility = 1e-3            #                                  | 1e-3
//	[[require.margin]]
//	error = "detuning"
//	size = "1 MHz"
func Load(path string) (*Brief, error) {
	doc, err := quantity.ReadFile(path)
	if err != nil {
		return nil, err
	}
	b, err := read(doc)
	if err != nil && !doc.Root().Has("target") {
		if other, wrong := mistaken(path, BriefFile); wrong {
			return nil, &quantity.Error{File: path, Found: "what looks like a " + string(other), Allowed: "a brief, which has a [target] and names a profile and a device"}
		}
	}
	return b, err
}

// read makes the brief of a document.
func read(doc *quantity.Document) (*Brief, error) {
	root := doc.Root()
	root.Int("format", 1, 1)
	b := &Brief{
		File:    doc.File(),
		Name:    root.Text("name"),
		Profile: root.Text("profile"),
		Device:  root.Text("device"),
		Span:    root.Quantity("span", quantity.Time, shortestSpan, longestSpan),
		Ends:    root.Choice("ends", []string{Settled, Window}, Settled),
		Seed:    uint64(root.Int("seed", 0, math.MaxInt, 1)),
		Starts:  root.Int("starts", 1, mostStarts, 60),
		Refine:  root.Bool("refine", true),
		PhaseBy: ByInstrument,
	}
	b.ProfilePath, b.DevicePath = b.beside(b.Profile), b.beside(b.Device)
	b.Target = readTarget(root.Table("target"))
	b.readPhases(root)
	basis := root.Table("basis")
	b.Basis = Basis{
		Family:       basis.Choice("family", []string{Slepian, Fourier, Tapered, BSpline, Samples, Best}, Slepian),
		Coefficients: basis.Int("coefficients", 1, mostCoefficients, 0),
		Degree:       basis.Int("degree", 1, 5, 3),
	}
	if b.Basis.Family == Samples && b.Basis.Coefficients > 0 {
		basis.Fail("coefficients", `found %d with family = "samples"; allowed: no number here, as there is one coefficient for each sample`, b.Basis.Coefficients)
	}
	b.lines = lines{root.Line("span"), root.Table("target").Line("site"), basis.Line("coefficients"), root.Line("hold"), root.Line("profile"), root.Line("device")}
	b.readErrors(root)
	b.readRequire(root.Table("require"))
	if err := doc.Err(); err != nil {
		return nil, err
	}
	return b, nil
}

// readPhases reads who turns the gate. Phases alone mean the samples.
func (b *Brief) readPhases(root *quantity.Table) {
	by := ByInstrument
	if root.Has("phases") {
		by = BySamples
	}
	b.PhaseBy = root.Choice("phase_by", []string{ByInstrument, BySamples}, by)
	switch {
	case b.PhaseBy == ByInstrument && by == BySamples:
		root.Fail("phases", `found phases beside phase_by = "instrument"; allowed: phases with phase_by = "samples"`)
		return
	case b.PhaseBy == ByInstrument:
		return
	}
	b.Phases = root.Quantities("phases", mostPhases, quantity.Angle, -4*math.Pi, 4*math.Pi)
	if b.Phases != nil && len(b.Phases) == 0 {
		root.Fail("phases", `found no phase; allowed: 1 to %d, as in ["0 deg", "90 deg"]`, mostPhases)
	}
	for i, a := range b.Phases {
		for _, o := range b.Phases[:i] {
			if math.Abs(math.Remainder(a-o, 2*math.Pi)) <= samePhase {
				root.Fail("phases", "found %s, the same turn as %s; allowed: each turn once", quantity.Format(a, quantity.Angle), quantity.Format(o, quantity.Angle))
			}
		}
	}
}

// beside resolves a path of the brief against the folder of the brief.
func (b *Brief) beside(path string) string {
	if path = filepath.FromSlash(path); filepath.IsAbs(path) {
		return path
	}
	return filepath.Join(filepath.Dir(b.File), path)
}

// oneOf counts which of the keys the table has and complains unless it is one. It gives that key, or nothing.
func oneOf(t *quantity.Table, keys ...string) string {
	var has []string
	for _, key := range keys {
		if t.Has(key) {
			has = append(has, key)
		}
	}
	words := strings.Join(keys[:len(keys)-1], ", ") + " or " + keys[len(keys)-1]
	switch len(has) {
	case 0:
		t.Fail("", "found none of %s; allowed: exactly one of them", words)
	case 1:
		return has[0]
	default:
		t.Fail(has[1], "found %s beside %s; allowed: exactly one of %s", has[1], has[0], words)
	}
	return ""
}

func readTarget(t *quantity.Table) Target {
	target := Target{Site: t.Text("site"), FreeZ: t.Choice("free_z", []string{NoFreeZ, Before, After, Both}, NoFreeZ)}
	if t.Has("angle") && !t.Has("axis") {
		t.Fail("angle", "found an angle without an axis; allowed: both, as in axis = [1, 0, 0] and angle = \"90 deg\"")
		return target
	}
	switch oneOf(t, "gate", "axis", "matrix") {
	case "gate":
		target.Label = t.Choice("gate", device.GateNames())
		target.Axis, target.Angle, _ = device.Gate(target.Label)
		if t.Has("angle") {
			t.Fail("angle", "found an angle beside a named gate; allowed: the name alone, or axis and angle")
		}
	case "axis":
		axis := t.Numbers("axis", 3, -1e6, 1e6)
		target.Angle = t.Quantity("angle", quantity.Angle, -4*math.Pi, 4*math.Pi)
		if len(axis) != 3 {
			t.Fail("axis", "found %d numbers; allowed: the 3 components of the axis, as in [1, 0, 0]", len(axis))
			break
		}
		norm := math.Hypot(math.Hypot(axis[0], axis[1]), axis[2])
		if !(norm >= 1e-6) {
			t.Fail("axis", "found an axis of no length; allowed: 3 components that are not all 0, as in [1, 0, 0]")
			break
		}
		for i, v := range axis {
			target.Axis[i] = v/norm + 0 // 0 and not -0
		}
		target.Label = target.Turn()
	case "matrix":
		rows := t.Matrix("matrix", 2)
		if rows == nil {
			break
		}
		m := device.FromRows(rows)
		axis, angle, defect, ok := device.AxisAngle(m)
		switch {
		case m.N != 2:
			t.Fail("matrix", "found %d row; allowed: 2 rows, for a spin", m.N)
		case !ok:
			t.Fail("matrix", "found a matrix M with |M'M - 1| = %.2g; allowed: a unitary one, to within %.0e (write the entries with 8 digits or more, or give axis and angle)",
				defect, device.UnitaryTolerance)
		}
		target.Axis, target.Angle, target.Label = axis, angle, "matrix"
	}
	target.Matrix = device.Rotation(target.Axis, target.Angle)
	return target
}

// Turn says the rotation in words, "no turn" where there is none.
func (t Target) Turn() string {
	if t.Angle == 0 {
		return "no turn"
	}
	return fmt.Sprintf("%s about (%.4g, %.4g, %.4g)", quantity.Format(t.Angle, quantity.Angle), t.Axis[0], t.Axis[1], t.Axis[2])
}

func (b *Brief) readErrors(root *quantity.Table) {
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
			{Name: "any static error", Kind: Any, Size: rate(defaultAny), Weight: 1, unsized: true},
		}
		return
	}
	for i, t := range tables {
		for _, e := range readError(t) {
			e.index = i
			if slices.ContainsFunc(b.Errors, func(other Error) bool { return other.Name == e.Name }) {
				t.Fail("name", "found a second error called %q; allowed: a name of its own for each error", e.Name)
			}
			b.Errors = append(b.Errors, e)
		}
	}
}

// readError gives the error of one table; two, for I and Q, of an offset without a quadrature.
func readError(t *quantity.Table) []Error {
	e := Error{key: oneOf(t, "detuning", "amplitude", "operator", "matrix", "any", "line", "quadrature_angle", "offset")}
	e.line = t.Line(e.key)
	size := func(f float64) float64 {
		e.unsized = !t.Has("size")
		return rate(t.Quantity("size", quantity.Frequency, smallestSize, largestSize, f))
	}
	share := func(s float64) float64 { return t.Quantity("size", quantity.Ratio, smallestShare, mostShare, s) }
	if t.Has("quadrature") {
		e.lineQuadrature = t.Line("quadrature")
		if e.key == "amplitude" || e.key == "offset" {
			e.Quadrature = t.Choice("quadrature", []string{"I", "Q"})
		} else if e.key != "" {
			t.Fail("quadrature", "found a quadrature beside %s; allowed: only beside amplitude or offset", e.key)
		}
	}
	if t.Has("parameter") && e.key != "line" && e.key != "" {
		t.Fail("parameter", "found a parameter beside %s; allowed: only beside line", e.key)
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
	case "matrix":
		e.Kind, natural, e.Operator, e.Size = Static, "matrix", readOperator(t), size(defaultStatic)
	case "any":
		t.Choice("any", []string{"all"})
		e.Kind, natural, e.Size = Any, "any static error", size(defaultAny)
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
	default: // complained of already; the rest is asked for so that its keys are known
		t.Has("size")
	}
	e.Name = t.Text("name", natural)
	if _, reserved := standard(e.Name); reserved && e.Name != natural {
		t.Fail("name", "found %q for another error; allowed: any name but detuning, amplitude, X, Y and Z, which stand for the errors of these kinds", e.Name)
	}
	e.Weight = t.Number("weight", 1e-6, 1e6, 1)
	if e.Kind != Offset || e.Quadrature != "" {
		return []Error{e}
	}
	i, q := e, e
	i.Name, i.Quadrature, i.expanded = e.Name+" I", "I", true
	q.Name, q.Quadrature, q.expanded = e.Name+" Q", "Q", true
	return []Error{i, q}
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
	rows := t.Matrix("matrix", 2)
	if rows == nil {
		return device.Zero(2)
	}
	m := device.FromRows(rows)
	if m.N != 2 {
		t.Fail("matrix", "found %d row; allowed: 2 rows, for a spin", m.N)
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
		t.Fail("matrix", "found the trace %.6g; %s (subtract %.6g from the diagonal: an energy common to all levels changes nothing)", real(trace), words, real(trace)/2)
	}
	m = m.Add(1, m.Adjoint()).Scale(0.5)
	return m.Add(-m.Trace()/2, device.Identity(2))
}

// entry prints a matrix entry as it is written in the file.
func entry(v complex128) string {
	if imag(v) == 0 {
		return fmt.Sprintf("%.6g", real(v))
	}
	return fmt.Sprintf("[%.6g, %.6g]", real(v), imag(v))
}

func (b *Brief) readRequire(t *quantity.Table) {
	b.Require = Require{
		Infidelity:     t.Number("infidelity", 1e-12, 1, 1e-4),
		Susceptibility: t.Number("susceptibility", 1e-9, 1, 1e-3),
	}
	// What a margin may be of: the five that replay always looks at, and the brief's own of one parameter.
	names := []string{"detuning", "amplitude", "X", "Y", "Z"}
	kinds := map[string]string{}
	for _, name := range names {
		kinds[name], _ = standard(name)
	}
	for _, e := range b.Errors {
		if _, known := kinds[e.Name]; e.Kind != Any && !known {
			names = append(names, e.Name)
			kinds[e.Name] = e.Kind
		}
	}
	seen := map[string]bool{}
	for _, m := range t.Tables("margin", mostMargins) {
		margin := Margin{Error: m.Choice("error", names)}
		switch kinds[margin.Error] {
		case Amplitude, Line, Offset:
			margin.Size = m.Quantity("size", quantity.Ratio, smallestShare, mostShare)
		case Skew:
			margin.Size = m.Quantity("size", quantity.Angle, smallestSkew, largestSkew)
		default:
			margin.Size = rate(m.Quantity("size", quantity.Frequency, smallestSize, largestSize))
		}
		if seen[margin.Error] {
			m.Fail("error", "found a second margin of %q; allowed: one for each error", margin.Error)
		}
		seen[margin.Error] = true
		b.Require.Margins = append(b.Require.Margins, margin)
	}
}
