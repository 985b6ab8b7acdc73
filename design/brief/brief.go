package brief

import (
	"bytes"
	"math"
	"os"
	"path/filepath"
	"strings"

	"github.com/BurntSushi/toml"

	"holdfast/design/device"
	"holdfast/design/noise"
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
type lines struct {
	span, site, from, to, upTo, coefficients, hold, profile, device int   // site: of the key that names the sites
	margins                                                         []int // of each margin's error
}

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

// Target is what is wanted: a gate on one site, exp(-i Angle/2 (Axis.sigma)), a gate on several, or states that become others. Sites of the device that
// it does not name are to be left alone.
type Target struct {
	Site   string        // of a gate on one site; else empty
	Sites  []string      // on which the gate acts, the first slowest in Matrix; nil for states
	Label  string        // for people: the name of the gate, the rotation in words, "matrix", "00 to 11", ...
	Matrix device.Matrix // of the gate, on the code levels of Sites, 2^n by 2^n; N = 0 for states
	Angle  float64       // rad; of a gate on one site
	Axis   [3]float64    // of length 1; of a gate on one site
	FreeZ  string        // NoFreeZ, Before, After or Both: where rotations about Z of every site cost nothing
	Local  bool          // any rotations of single sites before and after cost nothing
	// Whole is Matrix with the identity on all other sites, on the code space of the device: device.CodeSpace has its order. Complete fills
	// it in; N = 0 for states.
	Whole device.Matrix
	// From and To are as many orthonormal vectors on the code space of the device each: what is in the span of From at the start is to be in that of To at
	// the end, whichever of its vectors. Complete fills them in; nil for a gate.
	From, To [][]complex128

	named    string // the key that names the sites: site, sites or gates
	from, to state
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
	Name string
	Kind string // Static, Amplitude, Any, Line, Skew, Offset or Crosstalk
	// Members are the operators of kinds Static (one) and Any (all of the class). Complete fills them in.
	Members []Member
	// Operator of kind Static is what is meant on two levels of one site, 2 by 2, traceless and Hermitian; N = 0 where that is not all that is meant.
	Operator device.Matrix
	Scope    string // of kind Any: All, OneBody, TwoBody, "on q1, q2", Leakage, Learned, or Some of them where the brief leaves some out
	Leak     bool   // of kind Any: the operators couple the code space to the levels outside it, and to be cancelled is that coupling
	// Channels are those of kind Amplitude (in a defaulted brief Complete fills them in), and the one of kind Line, Skew, Offset or Crosstalk.
	Channels   []string
	Site       string          // of kind Crosstalk: that the channel reaches
	Reach      []device.Matrix // of kind Crosstalk: H += lambda (Re u Reach[0] + Im u Reach[1]), of a baseband channel lambda u Reach[0]. Complete fills them in
	Rates      string          // of kind Any: the file of the learned rates as written, beside the brief; else empty
	RatesPath  string          // the same from the working folder
	Parameter  string          // of kind Line: a name of hardware.Parameter
	Quadrature string          // of kind Amplitude, "I", "Q", or empty for both; of kind Offset, "I" or "Q" ("I" for a baseband channel)
	// Size is in rad/ns of kinds Static and Any (defaults 3 MHz and 1 MHz, for slow drives less: Complete), a share of kinds Amplitude (3 %),
	// Line (what the profile says, else 5 %), Offset (0.1 % of full scale) and Crosstalk (1 %), rad of kind Skew (1 deg).
	Size   float64
	Weight float64 // relative to the gate itself, default 1
	Order  int     // 1 or 2: to which power of the error the gate is to be left alone; 0 means 1
	// Spread asks for a small exact infidelity over sizes of the error in the place of an order: Average, over a normal distribution of which Size is the
	// standard deviation, or over Values; or Corners, the worst of them, which are -Size, 0 and Size unless the brief has Values. Empty: none.
	Spread string
	Values []float64 // as Size, either sign

	// Noise lets a static or an amplitude error fluctuate: Operator or the channels' amplitude times lambda(t) of that spectrum, in rad/ns or without unit.
	Noise *noise.Spectrum

	lineOrder                     int    // of the key
	key, on                       string // which key made it, and the site or channel that key names; for Complete
	index                         int    // in the file; -1: not in it
	line                          int    // of the key
	lineParameter, lineQuadrature int    // of these keys
	unsized                       bool   // the default size may give way to what the profile makes of it
	expanded                      bool   // one of the two that stand for both quadratures

	site    string        // that the key of that name names; empty: the target's
	siteAt  place         // of that key
	matrix  device.Matrix // as written, of 2 levels or of all
	product product       // of on
	scope   string        // of any, as written
	within  []string      // the sites of any = "on ..."
	except  []product
	ratesAt place
}

// A Member is one operator of an error.
type Member struct {
	Name string // of Any: a letter a site, "ZX" or "1Z", where all sites have two levels, else as "q1 Re 0-1, q2 X"; of Static the error's name
	// Operator is Hermitian, of the whole device: H += lambda Operator, lambda in rad/ns. It is traceless but for what X, Y or Z of a ladder may have, an
	// energy common to all levels. Of Any each has the Frobenius norm sqrt(d)/2, as half a product of Pauli matrices has.
	Operator device.Matrix
	Weight   float64 // above 0; root mean square 1 over the members, and 1 each unless learned rates say otherwise
}

// place is where a key stands.
type place struct{ line int }

// The kinds of Error.
const (
	Static    = "static"    // one operator, constant in time
	Amplitude = "amplitude" // what channels deliver, or one quadrature of it, scaled
	Any       = "any"       // every traceless static operator
	Line      = "line"      // one parameter of a channel's line, off by a share of itself
	Skew      = "skew"      // quadratures that are not at right angles: u_I += -lambda u_Q, lambda in rad
	Offset    = "offset"    // a constant at the converter, a share of full scale
	Crosstalk = "crosstalk" // a share of a channel that reaches another site
)

// The ways of Error.Spread.
const (
	Average = "average"
	Corners = "worst"
)

// The scopes of kind Any. "on q1, q2" is every operator of these sites.
const (
	All     = "all"      // every traceless operator
	OneBody = "one-body" // of a single site
	TwoBody = "two-body" // products over two sites
	Leakage = "leakage"  // between the code space and the other levels
	Learned = "rates"    // those with a rate above 0 in the file, of the class that the brief names
	Some    = "some"     // what except leaves of All
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
	mostSites                 = 6
	mostDim                   = 64
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
	defaultCrosstalk          = 0.01
	mostValues                = 32 // of a spread
	mostSecond                = 16 // operators of a class of which the second order is followed: the pairs count too
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
//	site = "q1"                      # or sites = ["q1", "q2"], in the order of the gate; other sites are to be left alone
//	gate = "X90"                     # of two sites one of device.Gate2Names; of any number "identity"
//	                                 # or axis = [1, 0, 0] and angle = "90 deg", of one site
//	                                 # or matrix, unitary, on the code levels of the sites
//	                                 # or gates = { q1 = "X90", q2 = "identity" }, which names the sites
//	                                 # or controlled = "X90", on the last of the sites when all others are |1>: of X90, Z180, ... the rotation
//	                                 #    exp(-i angle/2 n.sigma) with its phase, of H, S = diag(1, i) and T the matrices of these names
//	                                 # or from = "00" and to = "11", states of all sites of the device: a label, 2^n numbers, a list of labels, "GHZ" or "W"
//	free_z = "none"                  # or "before", "after", "both"; of every site; not beside from | "none"
//	up_to = "local rotations"        # any rotations of single sites before and after are free; of a gate, two sites or more | absent
//	[basis]
//	family = "slepian"               # "fourier", "tapered", "b-spline", "samples", "best" | "slepian"
//	coefficients = 20                #                                  | from band and span
//	degree = 3                       # of "b-spline", 1 to 5            | 3
//	[[error]]                        # none and no hold: detuning, amplitude and any static error; of several sites amplitude and any one-body error
//	detuning = "q1"                  # or amplitude = "q1 drive", operator = "X", matrix (of all levels; of one ladder also 2 by 2),
//	                                 # on = { q1 = "Z", q2 = "X" } (half the product), collective = "Z" (the sum of the halves),
//	                                 # any = "all", "one-body", "two-body", "leakage" or "on q1, q2",
//	                                 # line = "q1 drive" with parameter, quadrature_angle = "q1 drive", offset = "q1 drive",
//	                                 # crosstalk = "q1 drive" with site
//	site = "q2"                      # of operator                      | the target's, or the device's, only one
//	except = [{ q1 = "Z" }]          # of any: half products that it leaves out | none
//	rates = "rates.csv"              # of any: learned Pauli rates, beside the brief; columns pauli and rate, a letter I, X, Y or Z a site | all alike
//	parameter = "lowpass[0].corner"  # of the line, as hardware.Parameter names it
//	quadrature = "I"                 # or "Q", with amplitude or offset | both; offsets as two errors, "... I" and "... Q"
//	name = "..."                     #                                  | "detuning", "amplitude", "X", "X on q2", "matrix", "ZX on q1, q2", "collective Z",
//	                                 #                                    "any static error", "any one-body error", "any error on q1, q2", "any leakage",
//	                                 #                                    "any learned error", "amplitude I", "q1 drive lowpass[0].corner",
//	                                 #                                    "quadrature angle", "offset I", "q1 drive on q2"
//	size = "3 MHz"                   # "3 %", "1 deg" by kind           | 3 MHz or 7.5 % of the fastest drive's full scale, whichever is less, 3 %,
//	                                 #                                    1 MHz or 2.5 % for any, known_to or 5 % of a line, 1 deg, 0.1 % of an offset,
//	                                 #                                    1 % of crosstalk
//	weight = 1                       #                                  | 1
//	order = 1                        # or 2: cancel the error's square too; not with more than 16 operators | 1
//	spread = "average"               # or "worst": lower the exact infidelity over sizes of the error instead; not with any | absent
//	noise = { form = "lorentzian", sigma = "50 kHz", correlation_time = "2 us" } # the error fluctuates: see noise.Read; beside an amplitude or one operator | absent
//	values = ["-1 MHz", "1 MHz"]     # of the spread, up to 32; else a normal distribution of standard deviation size, or -size, 0, size
//	[require]
//	infidelity = 1e-4                #                                  | 1e-4
//	susceptibility = 1e-3            #                                  | 1e-3
//	[[require.margin]]
//	error = "detuning"               # an error above that is not any; of one spin also detuning, amplitude, X, Y and Z
//	size = "1 MHz"
func Load(path string) (*Brief, error) {
	doc, err := quantity.ReadFile(path)
	if err != nil {
		return nil, err
	}
	data, err := os.ReadFile(path)
	if err != nil {
		return nil, &quantity.Error{File: path, Found: "a file that cannot be read twice: " + err.Error(), Allowed: "a brief"}
	}
	b, err := read(doc, valuesOf(data))
	if err != nil && !doc.Root().Has("target") {
		if other, wrong := mistaken(path, BriefFile); wrong {
			return nil, &quantity.Error{File: path, Found: "what looks like a " + string(other), Allowed: "a brief, which has a [target] and names a profile and a device"}
		}
	}
	return b, err
}

// valuesOf gives what stands in a brief as plain values: the tables whose keys are names of sites, and the values that may be of
// several types, are looked at there before the document is asked. A text that is no TOML gives none, and the document says why.
func valuesOf(data []byte) map[string]any {
	var values map[string]any
	if _, err := toml.Decode(string(bytes.TrimPrefix(data, []byte("\xef\xbb\xbf"))), &values); err != nil {
		return nil
	}
	return values
}

// tableOf gives a plain value as a table; nil when it is none.
func tableOf(v any) map[string]any {
	m, _ := v.(map[string]any)
	return m
}

// tablesOf gives a plain value as a list of tables, as quantity.Table.Tables does.
func tablesOf(v any) []map[string]any {
	switch v := v.(type) {
	case map[string]any:
		return []map[string]any{v}
	case []map[string]any:
		return v
	case []any:
		list := make([]map[string]any, len(v))
		for i := range v {
			list[i] = tableOf(v[i])
		}
		return list
	}
	return nil
}

// read makes the brief of a document; values are what stands in it.
func read(doc *quantity.Document, values map[string]any) (*Brief, error) {
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
	b.Target = readTarget(root.Table("target"), tableOf(values["target"]))
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
	target := root.Table("target")
	b.lines = lines{
		span: root.Line("span"), site: target.Line(b.Target.named), from: target.Line("from"), to: target.Line("to"),
		upTo: target.Line("up_to"), coefficients: basis.Line("coefficients"), hold: root.Line("hold"), profile: root.Line("profile"), device: root.Line("device"),
	}
	b.readErrors(root, tablesOf(values["error"]))
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

func (b *Brief) readRequire(t *quantity.Table) {
	b.Require = Require{
		Infidelity:     t.Number("infidelity", 1e-12, 1, 1e-4),
		Susceptibility: t.Number("susceptibility", 1e-9, 1, 1e-3),
	}
	// What a margin may be of: the five that replay always looks at where there is one spin (Complete sees to that), and the brief's own of one parameter.
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
		case Amplitude, Line, Offset, Crosstalk:
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
		b.lines.margins = append(b.lines.margins, m.Line("error"))
		b.Require.Margins = append(b.Require.Margins, margin)
	}
}
