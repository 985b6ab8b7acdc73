package replay

import (
	"errors"
	"fmt"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"github.com/BurntSushi/toml"

	"holdfast/hardware"
	"holdfast/hardware/quantity"
)

// A Folder is a pulse folder, read and checked: every file is what the record's hashes say.
type Folder struct {
	Dir    string
	Name   string // of the pulse
	Model  *Model
	Claim  Claim
	Decay  []Decay // of the sites that state times
	T1, T2 float64 // ns, of a model of one site; 0 when the record states none

	Require Require

	files hardware.Manifest // with a hash
}

// A Decay is what the record says of how long one site stays as it is.
type Decay struct {
	Site   string
	T1, T2 float64 // ns; 0 when the record states none
}

// A Claim is what the record says of its rounded codes. What the record leaves out is NaN.
type Claim struct {
	Infidelity          float64 // for the stated ends
	InfidelityOtherEnds float64
	Leakage             float64
	TailAngle           float64 // rad
}

// Require is what the record says the brief requires.
type Require struct {
	Infidelity     float64
	Susceptibility float64 // of every held class
	Margins        []Margin
}

// A Margin is a size of one error that must be withstood, either sign.
type Margin struct {
	Error string
	Size  float64 // rad/ns, a share where Share is true, or rad where Angle is
	Share bool
	Angle bool
}

// The names of the three files that a pulse was designed from, below inputs/.
const (
	inputsDir   = "inputs/"
	profileFile = inputsDir + "profile.toml"
	deviceFile  = inputsDir + "device.toml"
	briefFile   = inputsDir + "brief.toml"
)

// Open reads a pulse folder: the record strictly, every listed file against its hash, the codes, and everything against
// everything. An error is one sentence with the file and, in the record, line and key. Unknown keys are refused where they could
// change a figure ([model], [claim], [require], [decoherence], [[file]]); what the design tells of itself elsewhere is not read.
func Open(dir string) (*Folder, error) {
	const allowed = "a pulse folder, which 'holdfast design BRIEF' makes"
	info, err := os.Stat(dir)
	if errors.Is(err, fs.ErrNotExist) {
		return nil, fmt.Errorf("%s: found no such folder; allowed: %s", dir, allowed)
	}
	if err != nil {
		return nil, fmt.Errorf("%s: %w", dir, cause(err))
	}
	if !info.IsDir() {
		return nil, fmt.Errorf("%s: found a file; allowed: %s", dir, allowed)
	}
	path := filepath.Join(dir, hardware.RecordName)
	if _, err := os.Stat(path); errors.Is(err, fs.ErrNotExist) {
		return nil, fmt.Errorf("%s: found a folder without %s; allowed: %s", dir, hardware.RecordName, allowed)
	}
	doc, err := quantity.ReadRecord(path)
	if err != nil {
		return nil, err
	}
	f := &Folder{Dir: dir}
	if f.Name, err = pulseName(path); err != nil {
		return nil, err
	}
	root := doc.Root()
	root.Int("format", 1, 1)
	for _, key := range []string{"pulse", "basis", "search", "headroom", "provenance"} {
		root.Has(key)
	}
	var list hardware.Manifest
	for _, t := range root.Tables("file", 1000) {
		list = append(list, hardware.FileHash{Name: t.Text("name"), SHA256: t.Text("sha256")})
	}
	f.readRequire(root.Table("require"))
	f.readDecay(root)
	claim := root.Table("claim")
	nan := math.NaN()
	f.Claim = Claim{
		Infidelity:          claim.Number("infidelity", 0, 1),
		InfidelityOtherEnds: claim.Number("infidelity_other_ends", 0, 1, nan),
		Leakage:             claim.Number("leakage", 0, 1, nan),
		TailAngle:           claim.Number("tail_angle_rad", 0, 1e6, nan),
	}
	m, codes, exact := readModel(root.Table("model"), path)
	f.Model = m
	if err := doc.Err(); err != nil {
		return nil, err
	}
	for i, d := range f.Decay {
		switch {
		case len(m.Sites) == 0 && i == 0:
			f.T1, f.T2 = d.T1, d.T2
		case d.Site == "" || i >= max(1, len(m.Sites)):
			return nil, &quantity.Error{File: path, Line: root.Line("decoherence"), Key: "decoherence", Found: fmt.Sprintf("%d tables, number %d of site %q", len(f.Decay), i, d.Site),
				Allowed: "one for each site, with its name"}
		}
	}
	if len(list) == 0 {
		return nil, &quantity.Error{File: path, Key: "file", Found: "nothing", Allowed: "[[file]] with name and sha256 for every other file of the folder"}
	}
	if err := list.Verify(dir); err != nil {
		return nil, err
	}
	f.files = list
	needed := []string{profileFile, deviceFile, briefFile}
	for c := range m.Channels {
		needed = append(needed, codes[c])
		if exact[c] != "" {
			needed = append(needed, exact[c])
		}
	}
	for _, name := range needed {
		if !list.Has(name) {
			return nil, &quantity.Error{File: path, Key: "file", Found: fmt.Sprintf("no hash of %.80q", name), Allowed: "[[file]] with name and sha256 for every other file of the folder"}
		}
	}
	for c := range m.Channels {
		if err := m.Channels[c].load(dir, codes[c], exact[c], m.Samples, m.Bits); err != nil {
			return nil, err
		}
	}
	if fault := m.validate(); fault != nil { // the samples; all else has been validated with line numbers
		return nil, &quantity.Error{File: path, Key: "model." + fault.key, Found: fault.found, Allowed: fault.allowed}
	}
	return f, nil
}

// pulseName reads what the record calls the pulse, without minding what else [pulse] holds.
func pulseName(path string) (string, error) {
	doc, err := quantity.ReadRecord(path)
	if err != nil {
		return "", err
	}
	root := doc.Root()
	if !root.Has("pulse") {
		return "", &quantity.Error{File: path, Key: "pulse", Found: "nothing", Allowed: "a table [pulse] with the pulse's name"}
	}
	name := root.Table("pulse").Text("name")
	if e := (*quantity.Error)(nil); errors.As(doc.Err(), &e) && strings.HasPrefix(e.Key, "pulse") && e.Found != "an unknown key" {
		return "", e
	}
	return name, nil
}

func (f *Folder) readRequire(t *quantity.Table) {
	f.Require.Infidelity = t.Number("infidelity", 1e-15, 1)
	f.Require.Susceptibility = t.Number("susceptibility", 1e-15, 1)
	for _, m := range t.Tables("margin", 64) {
		r := Margin{Error: m.Text("error")}
		switch rate, share, angle := m.Has("size_rad_per_ns"), m.Has("size_share"), m.Has("size_rad"); {
		case share && (rate || angle), angle && rate:
			m.Fail("size_share", "found sizes of more than one unit; allowed: one of size_rad_per_ns, size_share and size_rad")
		case share:
			r.Size, r.Share = m.Number("size_share", 1e-12, 1), true
		case angle:
			r.Size, r.Angle = m.Number("size_rad", 1e-12, 10), true
		default:
			r.Size = m.Number("size_rad_per_ns", 1e-12, 1e6)
		}
		f.Require.Margins = append(f.Require.Margins, r)
	}
}

// readDecay reads [[decoherence]], one for each site that states times. A record of one site need not name it.
func (f *Folder) readDecay(root *quantity.Table) {
	if !root.Has("decoherence") {
		return
	}
	for _, t := range root.Tables("decoherence", maxSites) {
		d := Decay{Site: t.Text("site", ""), T1: t.Number("t1_ns", 1e-3, 1e18, 0), T2: t.Number("t2_ns", 1e-3, 1e18, 0)}
		if slices.ContainsFunc(f.Decay, func(o Decay) bool { return o.Site == d.Site }) {
			t.Fail("site", "found %q again; allowed: one [[decoherence]] for each site", d.Site)
		}
		f.Decay = append(f.Decay, d)
	}
}

// whole reads a whole number of an array of numbers.
func wholes(t *quantity.Table, key string, most int, lo, hi float64) []int {
	numbers := t.Numbers(key, most, lo, hi)
	list := make([]int, 0, len(numbers))
	for _, v := range numbers {
		if v != math.Trunc(v) {
			t.Fail(key, "found %v; allowed: whole numbers", v)
			return nil
		}
		list = append(list, int(v))
	}
	return list
}

func flat(rows [][]complex128) []complex128 {
	var m []complex128
	for _, row := range rows {
		m = append(m, row...)
	}
	return m
}

// readModel reads [model] of the record at path and gives the names of the waveform files of each channel, before rounding "" where there is none.
// Whatever makes no sense is recorded as a mistake with its line.
func readModel(t *quantity.Table, path string) (m *Model, codes, exact []string) {
	// Every table below [model] under what its keys begin with in a fault.
	below := map[string]*quantity.Table{}
	tables := func(up *quantity.Table, prefix, key string, most int) []*quantity.Table {
		list := up.Tables(key, most)
		for i, t := range list {
			below[fmt.Sprintf("%s%s[%d].", prefix, key, i)] = t
		}
		return list
	}
	m = &Model{
		SamplePeriod: t.Number("sample_period_ns", 1e-6, 1e6),
		Samples:      t.Int("samples", 1, maxSamples),
		Bits:         t.Int("bits", 2, 16),
		Ends:         t.Choice("ends", []string{"settled", "window"}),
		WindowStart:  t.Number("window_start_ns", -1e9, 1e9),
		Dim:          t.Int("dim", 2, maxDim),
	}
	m.CodeSpace = wholes(t, "code_space", maxDim, 0, maxDim-1)
	if t.Has("sites") {
		m.Sites = wholes(t, "sites", maxSites, 2, maxLevels)
	}
	m.Static = flat(t.Matrix("static_rad_per_ns", maxDim))
	if from, to := t.Has("from"), t.Has("to"); !from && !to {
		m.Target = flat(t.Matrix("target", maxDim))
	} else {
		m.From, m.To = readStates(t, path)
		if t.Has("target") {
			m.Target = flat(t.Matrix("target", maxDim))
		}
	}
	for _, r := range []struct {
		key string
		dst *[]Rotating
	}{{"rotating", &m.Rotating}, {"dropped", &m.Dropped}} {
		for _, rt := range tables(t, "", r.key, maxRotating) {
			*r.dst = append(*r.dst, Rotating{
				Frequency: rt.Number("frequency_rad_per_ns", -maxTurn, maxTurn),
				Cosine:    flat(rt.Matrix("cosine", maxDim)),
				Sine:      flat(rt.Matrix("sine", maxDim)),
			})
		}
	}
	if before, after := t.Has("local_before"), t.Has("local_after"); before || after {
		m.LocalBefore, m.LocalAfter = matrices(t, "local_before", maxSites, 2), matrices(t, "local_after", maxSites, 2)
	}
	for _, z := range []struct {
		key string
		dst *[]float64
	}{{"free_z_before", &m.FreeZBefore}, {"free_z_after", &m.FreeZAfter}} {
		if t.Has(z.key) {
			*z.dst = t.Numbers(z.key, 6, -1e6, 1e6)
		}
	}
	inf := math.Inf(1)
	for i, ct := range tables(t, "", "channel", maxChannels) {
		c := Channel{
			Name:       ct.Text("name"),
			Kind:       ct.Choice("kind", []string{"quadrature", "baseband"}),
			FullScale:  ct.Number("full_scale_rad_per_ns", 1e-12, 1e4),
			Delay:      ct.Number("delay_ns", -1e9, 1e9),
			MaxShare:   ct.Number("max_share", 1e-12, 1, inf),
			MaxSlew:    ct.Number("max_slew_per_sample", 1e-12, 2, inf),
			GuardLead:  ct.Int("guard_lead", 0, maxSamples, 0),
			GuardTrail: ct.Int("guard_trail", 0, maxSamples, 0),
			RingOut:    ct.Number("ring_out_share", 1e-12, 1e6, inf),
			RMS:        ct.Number("rms_share", 1e-12, 1e3, 0),
			RMSSamples: ct.Number("rms_samples", 1, 1e15, 0),
			OutOfBand:  ct.Number("out_of_band_share", 1e-12, 1e3, 0),
			Band:       ct.Number("band_ghz", 1e-12, 1e6, 0),
			ZeroMean:   ct.Bool("zero_mean", false),
			Samples:    make([]complex128, m.Samples), // until the codes are read
		}
		if ct.Has("envelope") {
			c.Box = ct.Choice("envelope", []string{"disc", "box"}) == "box"
		}
		// Without a budget of its own the tail has that of the rest.
		if tail, fast := ct.Has("ring_out_tail_share"), ct.Has("ring_out_fast_ns"); tail || fast {
			c.RingOutFast = ct.Number("ring_out_fast_ns", 0, 1e12)
			if tail {
				c.RingOutTail = ct.Number("ring_out_tail_share", 1e-12, 1e6)
			} else if !math.IsInf(c.RingOut, 1) {
				c.RingOutTail = c.RingOut
			}
		}
		if ct.Has("map_polynomial") {
			c.MapPolynomial = ct.Numbers("map_polynomial", maxPowers, -maxPower1, maxPower1)
		}
		if ct.Has("map_loop") {
			c.MapLoop = ct.Numbers("map_loop", 4, -1e4, 1e4)
		}
		if ct.Has("compression") {
			for _, z := range ct.Complexes("compression", maxKnees) { // pairs of numbers, like complex ones
				c.Compression = append(c.Compression, Knee{real(z), imag(z)})
			}
		}
		if shift, op := ct.Has("shift_rad_per_ns"), ct.Has("shift_operator"); shift || op {
			c.Shift = ct.Number("shift_rad_per_ns", -1e4, 1e4)
			c.ShiftOperator = flat(ct.Matrix("shift_operator", maxDim))
		}
		c.Direct, c.Poles, c.Powers, c.Residues = readLine(ct)
		c.Operators = matrices(ct, "operators", 2, maxDim)
		for _, pt := range tables(ct, fmt.Sprintf("channel[%d].", i), "path", maxPaths) {
			c.Paths = append(c.Paths, Path{
				Frequency: pt.Number("frequency_rad_per_ns", -maxTurn, maxTurn),
				Operators: matrices(pt, "operators", 2, maxDim),
			})
		}
		codes = append(codes, ct.Text("codes"))
		exact = append(exact, ct.Text("samples_before_rounding", ""))
		m.Channels = append(m.Channels, c)
	}
	for _, et := range tables(t, "", "error", maxErrors) {
		c := Class{
			Name: et.Text("name"),
			Held: et.Bool("held", false),
			Kind: et.Choice("kind", []string{"static", "amplitude", "any", "skew", "line", "crosstalk"}, ""), // validate misses it; nothing else is then asked for
		}
		if c.claimed = et.Has("susceptibility"); c.claimed {
			c.Susceptibility = et.Number("susceptibility", 0, 1e6)
		}
		if c.claimedLeak = et.Has("leak_susceptibility"); c.claimedLeak {
			c.LeakSusceptibility = et.Number("leak_susceptibility", 0, 1e6)
		}
		et.Int("order", 1, 2, 1) // for people
		if et.Has("spread") {
			c.Spread = Spread{et.Text("spread"), et.Numbers("spread_values", maxSpread, -1e4, 1e4), et.Numbers("spread_shares", maxSpread, 0, 1)}
			if c.claimedSpread = et.Has("spread_infidelity"); c.claimedSpread {
				c.SpreadInfidelity = et.Number("spread_infidelity", 0, 1)
			}
		}
		if et.Has("noise_frequencies_rad_per_ns") {
			c.Noise = Noise{et.Numbers("noise_frequencies_rad_per_ns", maxNodes, 0, maxTurn), et.Numbers("noise_weights", maxNodes, 0, 1e8)}
			if c.claimedNoise = et.Has("noise_infidelity"); c.claimedNoise {
				c.NoiseInfidelity = et.Number("noise_infidelity", 0, 1e6)
			}
		}
		if c.Kind == "static" {
			c.Operator = flat(et.Matrix("operator", maxDim))
		}
		if (c.Kind == "amplitude" || c.Kind == "skew") && et.Has("channels") {
			c.Channels = et.Texts("channels", maxChannels)
		}
		if c.Kind == "amplitude" && et.Has("quadrature") {
			c.Quadrature = et.Choice("quadrature", []string{"I", "Q"})
		}
		if c.Kind == "line" {
			c.Channels = []string{et.Text("channel")}
			c.Direct, c.Poles, c.Powers, c.Residues = readLine(et)
		}
		if c.Kind == "crosstalk" {
			c.Channels = []string{et.Text("channel")}
			c.Operators = matrices(et, "operators", 2, maxDim)
		}
		if c.Kind == "any" {
			c.Leak = et.Bool("leak", false)
			if ops, names, weights := et.Has("operators"), et.Has("names"), et.Has("weights"); ops || names || weights {
				c.Operators = matrices(et, "operators", maxMembers, maxDim)
				c.Names = et.Texts("names", maxMembers)
				c.Weights = et.Numbers("weights", maxMembers, 0, 1e6)
			}
		}
		m.Errors = append(m.Errors, c)
	}
	if fault := m.validate(); fault != nil {
		// Where the key stands; element numbers are not keys.
		at, key, longest := t, fault.key, ""
		for prefix, table := range below {
			if rest, ok := strings.CutPrefix(fault.key, prefix); ok && len(prefix) > len(longest) {
				at, key, longest = table, rest, prefix
			}
		}
		key, _, _ = strings.Cut(key, "[")
		at.Fail(key, "found %s; allowed: %s", fault.found, fault.allowed)
	}
	return m, codes, exact
}

// matrices reads so many square matrices at most.
func matrices(t *quantity.Table, key string, count, most int) [][]complex128 {
	var list [][]complex128
	for _, m := range t.Matrices(key, count, most) {
		list = append(list, flat(m))
	}
	return list
}

// readStates reads from and to, lists of vectors, from the file itself: the strict tables have lists of square matrices and of numbers only. What it cannot
// read is recorded as a mistake.
func readStates(t *quantity.Table, path string) (from, to [][]complex128) {
	var record struct {
		Model struct{ From, To any }
	}
	if _, err := toml.DecodeFile(path, &record); err != nil {
		t.Fail("from", "found what cannot be read again: %v", err)
		return nil, nil
	}
	read := func(key string, v any) [][]complex128 {
		const allowed = "a list of vectors, each a list of numbers or [re, im]"
		list, ok := v.([]any)
		if !ok || len(list) > maxDim {
			t.Fail(key, "found something else; allowed: %s, at most %d", allowed, maxDim)
			return nil
		}
		vectors := make([][]complex128, len(list))
		for i, v := range list {
			entries, ok := v.([]any)
			if !ok || len(entries) > maxDim {
				t.Fail(key, "found something else as vector %d; allowed: %s, at most %d", i, allowed, maxDim)
				return nil
			}
			for k, v := range entries {
				z, ok := complexNumber(v)
				if !ok {
					t.Fail(key, "found something else as entry %d of vector %d; allowed: %s", k, i, allowed)
					return nil
				}
				vectors[i] = append(vectors[i], z)
			}
		}
		return vectors
	}
	return read("from", record.Model.From), read("to", record.Model.To)
}

// complexNumber gives a number or a pair [re, im] of at most 1e6.
func complexNumber(v any) (complex128, bool) {
	pair, ok := v.([]any)
	if !ok {
		pair = []any{v, 0.0}
	}
	if len(pair) != 2 {
		return 0, false
	}
	var parts [2]float64
	for i, v := range pair {
		switch v := v.(type) {
		case float64:
			parts[i] = v
		case int64:
			parts[i] = float64(v)
		default:
			return 0, false
		}
		if !(math.Abs(parts[i]) <= 1e6) {
			return 0, false
		}
	}
	return complex(parts[0], parts[1]), true
}

// readLine reads the keys of a line, or of a line's slope. One without poles may leave out all three lists.
func readLine(t *quantity.Table) (direct complex128, poles []complex128, powers []int, residues []complex128) {
	if a, b, c := t.Has("poles_per_ns"), t.Has("powers"), t.Has("residues"); a || b || c {
		poles = t.Complexes("poles_per_ns", maxPoles)
		powers = wholes(t, "powers", maxPoles, 1, maxPower)
		residues = t.Complexes("residues", maxPoles)
	}
	d := t.Numbers("direct", 2, -1e9, 1e9)
	if len(d) == 2 {
		direct = complex(d[0], d[1])
	} else if d != nil {
		t.Fail("direct", "found %d numbers; allowed: [re, im]", len(d))
	}
	return direct, poles, powers, residues
}

// load reads the channel's waveform files.
func (c *Channel) load(dir, codes, exact string, samples, bits int) error {
	columns := len(c.Operators)
	path := filepath.Join(dir, filepath.FromSlash(codes))
	raw, _, err := hardware.ReadNPY[int16](path, samples, columns)
	if err != nil {
		return err
	}
	full := 1 << (bits - 1)
	for k, v := range raw {
		if int(v) < -full || int(v) >= full {
			return fmt.Errorf("%s: sample %d has code %d; a converter of %d bit has %d to %d", path, k/columns, v, bits, -full, full-1)
		}
	}
	c.Codes = raw
	c.Samples = pairUp(raw, columns, 1/float64(full))
	if exact == "" {
		return nil
	}
	path = filepath.Join(dir, filepath.FromSlash(exact))
	before, _, err := hardware.ReadNPY[float64](path, samples, columns)
	if err != nil {
		return err
	}
	for k, v := range before {
		if !(math.Abs(v) <= 1e6) {
			return fmt.Errorf("%s: sample %d is %v; allowed: shares of full scale", path, k/columns, v)
		}
	}
	c.Exact = pairUp(before, columns, 1)
	return nil
}

// pairUp makes x_I + i x_Q, or x, of rows of one or two numbers.
func pairUp[T int16 | float64](raw []T, columns int, unit float64) []complex128 {
	x := make([]complex128, len(raw)/columns)
	for k := range x {
		im := 0.0
		if columns == 2 {
			im = float64(raw[2*k+1]) * unit
		}
		x[k] = complex(float64(raw[columns*k])*unit, im)
	}
	return x
}

// cause drops the operation and the path from a file error.
func cause(err error) error {
	if pe := (*os.PathError)(nil); errors.As(err, &pe) {
		return pe.Err
	}
	return err
}
