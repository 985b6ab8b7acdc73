package design

import (
	"bytes"
	"fmt"
	"io"
	"math"
	"path/filepath"

	"github.com/BurntSushi/toml"

	"holdfast/hardware"
)

// A Record is pulse.toml: what was wanted, how the pulse was found, what it
// claims, and the [model] from which an outsider recomputes it. Numbers in
// [model] and [claim] are plain and carry their unit in the key's name.
type Record struct {
	Format      int             `toml:"format"`
	Pulse       PulseFacts      `toml:"pulse"`
	Basis       BasisFacts      `toml:"basis"`
	Search      SearchFacts     `toml:"search"`
	Require     RequireFacts    `toml:"require"`
	Decoherence []DecayFacts    `toml:"decoherence,omitempty"`
	Provenance  ProvenanceFacts `toml:"provenance"`
	Claim       Claim           `toml:"claim"`
	Model       Model           `toml:"model"`
	Headroom    []Headroom      `toml:"headroom"`
	Files       []File          `toml:"file"`
}

// PulseFacts say what the pulse is.
type PulseFacts struct {
	Name   string   `toml:"name"`
	Target string   `toml:"target"` // "X90 on q1"
	Span   string   `toml:"span"`
	Held   []string `toml:"held"` // names of the errors it is held against
	// HeldByDefault is true when the brief named no error.
	HeldByDefault bool         `toml:"held_by_default"`
	Status        string       `toml:"status"` // a Status in words
	Phases        []PhaseFacts `toml:"phase,omitempty"`
	Delays        []DelayFacts `toml:"delay,omitempty"`
}

// DelayFacts say that a channel's first sample has to leave some sample periods
// after the trigger, so that channels of unlike delay arrive together.
type DelayFacts struct {
	Channel string `toml:"channel"`
	Samples int    `toml:"samples"`
}

// PhaseFacts are the same gate emitted turned by an angle about Z: its axis is
// turned in the XY plane.
type PhaseFacts struct {
	Angle      float64  `toml:"angle_deg"`
	Files      []string `toml:"files"`
	Infidelity float64  `toml:"infidelity"` // of the codes, to the target turned likewise, for the stated ends
	Kept       bool     `toml:"limits_kept"`
}

// BasisFacts give the coefficients: samples = basis times coefficients.
type BasisFacts struct {
	Family  string    `toml:"family"`
	PerQuad int       `toml:"coefficients_per_quadrature"`
	Band    string    `toml:"band,omitempty"`
	I       []float64 `toml:"i"`
	Q       []float64 `toml:"q"`
	// More are those of the channels after the first.
	More []MoreBasis `toml:"channel,omitempty"`
}

// MoreBasis are the coefficients of one more channel; a baseband one has no Q.
type MoreBasis struct {
	Channel string    `toml:"name"`
	Family  string    `toml:"family"`
	I       []float64 `toml:"i"`
	Q       []float64 `toml:"q,omitempty"`
}

// SearchFacts tell how the coefficients were found.
type SearchFacts struct {
	Seed        uint64  `toml:"seed"`
	Starts      int     `toml:"starts_allowed"`
	Tried       int     `toml:"starts_tried"`
	Successes   int     `toml:"successes"`
	Winner      int     `toml:"winning_start"`
	Evaluations int     `toml:"evaluations"`
	Equations   int     `toml:"equations"`
	Solver      string  `toml:"solver"` // "Gauss-Newton", or "quasi-Newton" where residuals are many
	Refined     bool    `toml:"refined"`
	Miss        float64 `toml:"sum_of_squared_residuals"`
	Before      float64 `toml:"infidelity_before_rounding"`
}

// RequireFacts are the brief's [require].
type RequireFacts struct {
	Infidelity     float64       `toml:"infidelity"`
	Susceptibility float64       `toml:"susceptibility"`
	Margins        []MarginFacts `toml:"margin,omitempty"`
}

// MarginFacts are one [[require.margin]]; all but one of the sizes are zero and
// absent.
type MarginFacts struct {
	Error string  `toml:"error"`
	Rate  float64 `toml:"size_rad_per_ns,omitzero"`
	Share float64 `toml:"size_share,omitzero"`
	Angle float64 `toml:"size_rad,omitzero"`
}

// DecayFacts are a site's times; absent where not stated.
type DecayFacts struct {
	Site string  `toml:"site"`
	T1   float64 `toml:"t1_ns,omitzero"`
	T2   float64 `toml:"t2_ns,omitzero"`
}

// ProvenanceFacts say what made the pulse, without date, host or path.
type ProvenanceFacts struct {
	Program    string `toml:"program"`
	Version    string `toml:"version"`
	Instrument string `toml:"instrument"`
	Device     string `toml:"device"`
	Site       string `toml:"site"`
	Channel    string `toml:"channel"`
}

// Claim is what the record says of the rounded codes.
type Claim struct {
	Infidelity          float64  `toml:"infidelity"`
	InfidelityOtherEnds float64  `toml:"infidelity_other_ends"`
	Leakage             float64  `toml:"leakage"`
	TailAngle           *float64 `toml:"tail_angle_rad,omitempty"` // of a spin
}

// Headroom is one limit of the instrument on the rounded codes.
type Headroom struct {
	Channel string  `toml:"channel"`
	Limit   string  `toml:"limit"`
	Unit    string  `toml:"unit"`
	Found   float64 `toml:"found"`
	Allowed float64 `toml:"allowed"`
	Share   float64 `toml:"headroom"`
	Kept    bool    `toml:"kept"`
}

// File is the hash of one file of the folder.
type File struct {
	Name   string `toml:"name"`
	SHA256 string `toml:"sha256"`
}

// Complex is [re, im] in the record.
type Complex [2]float64

// Model is [model], which an outsider reads.
type Model struct {
	SamplePeriod float64        `toml:"sample_period_ns"`
	Samples      int            `toml:"samples"`
	Bits         int            `toml:"bits"`
	Ends         string         `toml:"ends"`
	WindowStart  float64        `toml:"window_start_ns"`
	Dim          int            `toml:"dim"`
	CodeSpace    []int          `toml:"code_space"`
	Static       [][]Complex    `toml:"static_rad_per_ns"`
	Target       [][]Complex    `toml:"target,omitempty"` // absent where states go to states
	FreeZBefore  []float64      `toml:"free_z_before"`
	FreeZAfter   []float64      `toml:"free_z_after"`
	Channels     []ModelChannel `toml:"channel"`
	Errors       []ModelError   `toml:"error"`

	Sites       []int           `toml:"sites,omitempty"` // levels of each; absent for one
	From        [][]Complex     `toml:"from,omitempty"`
	To          [][]Complex     `toml:"to,omitempty"`
	LocalBefore [][][]Complex   `toml:"local_before,omitempty"`
	LocalAfter  [][][]Complex   `toml:"local_after,omitempty"`
	Rotating    []ModelRotating `toml:"rotating,omitempty"`
	Dropped     []ModelRotating `toml:"dropped,omitempty"`
}

// ModelRotating is H += cos(w (t - window_start)) cosine + sin(w (t - window_start)) sine.
type ModelRotating struct {
	Frequency float64     `toml:"frequency_rad_per_ns"`
	Cosine    [][]Complex `toml:"cosine"`
	Sine      [][]Complex `toml:"sine"`
}

// ModelPath is crosstalk to a site of another frame.
type ModelPath struct {
	Frequency float64       `toml:"frequency_rad_per_ns"`
	Operators [][][]Complex `toml:"operators"`
}

// ModelChannel is one [[model.channel]]. A limit that the instrument does not
// have is nil and absent.
type ModelChannel struct {
	Name      string  `toml:"name"`
	Kind      string  `toml:"kind"`
	Codes     string  `toml:"codes"`
	Exact     string  `toml:"samples_before_rounding"`
	FullScale float64 `toml:"full_scale_rad_per_ns"`
	Delay     float64 `toml:"delay_ns"`
	LineModel
	Operators  [][][]Complex `toml:"operators"`
	MaxShare   float64       `toml:"max_share"`
	MaxSlew    *float64      `toml:"max_slew_per_sample,omitempty"`
	GuardLead  int           `toml:"guard_lead"`
	GuardTrail int           `toml:"guard_trail"`
	RingOut    *float64      `toml:"ring_out_share,omitempty"`

	Envelope      string       `toml:"envelope,omitempty"` // "box", or absent for the disc
	RMS           *float64     `toml:"rms_share,omitempty"`
	RMSSamples    int          `toml:"rms_samples,omitzero"`
	OutOfBand     *float64     `toml:"out_of_band_share,omitempty"`
	Band          *float64     `toml:"band_ghz,omitempty"`
	RingOutTail   *float64     `toml:"ring_out_tail_share,omitempty"`
	RingOutFast   *float64     `toml:"ring_out_fast_ns,omitempty"`
	ZeroMean      bool         `toml:"zero_mean,omitempty"`
	Compression   [][2]float64 `toml:"compression,omitempty"`
	Shift         *float64     `toml:"shift_rad_per_ns,omitempty"`
	ShiftOperator [][]Complex  `toml:"shift_operator,omitempty"`
	Paths         []ModelPath  `toml:"path,omitempty"`
	// Of a bias that is no straight one, H += rate(s) operators[0] with s = Re u / FullScale: FullScale (c_1 s + c_2 s² + ...), or of a loop
	// the change of highest (cos²(πf) + asymmetry² sin²(πf))^(1/4) with f = bias + full scale s flux quanta; the loop's
	// operator has the sign of a detuning.
	MapPolynomial []float64 `toml:"map_polynomial,omitempty"`
	MapLoop       []float64 `toml:"map_loop,omitempty"` // highest in rad/ns, bias, full scale, asymmetry
}

// LineModel are the poles of a line: G(s) = direct + sum residue/(s - pole)^power.
type LineModel struct {
	Direct   Complex   `toml:"direct"`
	Poles    []Complex `toml:"poles_per_ns"`
	Powers   []int     `toml:"powers"`
	Residues []Complex `toml:"residues"`
}

// ModelError is one [[model.error]].
type ModelError struct {
	Name           string      `toml:"name"`
	Held           bool        `toml:"held"`
	Kind           string      `toml:"kind"`
	Operator       [][]Complex `toml:"operator,omitempty"`
	Channels       []string    `toml:"channels,omitempty"`
	Quadrature     string      `toml:"quadrature,omitempty"` // "I" or "Q" of an amplitude error of one
	Channel        string      `toml:"channel,omitempty"`    // of kind "line"
	*LineModel                 // of kind "line": what u gains per lambda, over full scale
	Susceptibility float64     `toml:"susceptibility"`

	// Of kind "any" in a register, and of kind "crosstalk".
	Operators [][][]Complex `toml:"operators,omitempty"`
	Names     []string      `toml:"names,omitempty"`
	Weights   []float64     `toml:"weights,omitempty"`
	Leaks     bool          `toml:"leak,omitempty"`
	Leak      *float64      `toml:"leak_susceptibility,omitempty"` // where there are levels outside the code space

	Order int `toml:"order,omitzero"` // 2 where the second order is cancelled too
	// Of an error that is held over a spread of its sizes: these, their weights, and the mean
	// infidelity over them, or the worst.
	Spread           string    `toml:"spread,omitempty"`
	SpreadValues     []float64 `toml:"spread_values,omitempty"`
	SpreadShares     []float64 `toml:"spread_shares,omitempty"`
	SpreadInfidelity *float64  `toml:"spread_infidelity,omitempty"`
	// Of an error that fluctuates: the quadrature over its spectrum, and what it adds to the
	// infidelity to first order in it.
	NoiseFrequencies []float64 `toml:"noise_frequencies_rad_per_ns,omitempty"`
	NoiseWeights     []float64 `toml:"noise_weights,omitempty"`
	NoiseInfidelity  *float64  `toml:"noise_infidelity,omitempty"`
}

// finite returns nil for a limit that is not there.
func finite(v float64) *float64 {
	if math.IsInf(v, 0) {
		return nil
	}
	return &v
}

const recordHead = `# The record of one pulse, written by holdfast. [model] and the waveform files are all that is needed to
# recompute the gate: times in ns, rates in rad/ns, matrices as rows of [re, im].
`

// TurnedMet says whether every waveform that was turned keeps the limits and the
// required infidelity; true when there is none.
func (r *Record) TurnedMet() bool {
	for _, p := range r.Pulse.Phases {
		if !p.Kept || !(p.Infidelity <= r.Require.Infidelity) {
			return false
		}
	}
	return true
}

// Encode writes the record as TOML.
func (r *Record) Encode(w io.Writer) error {
	var b bytes.Buffer
	b.WriteString(recordHead)
	e := toml.NewEncoder(&b)
	e.Indent = ""
	if err := e.Encode(r); err != nil {
		return fmt.Errorf("%s: %w", hardware.RecordName, err)
	}
	_, err := w.Write(b.Bytes())
	return err
}

// ReadRecord reads what a pulse folder's record tells of the design. It does not
// judge it: replay.Open checks the record strictly, and comes first.
func ReadRecord(dir string) (*Record, error) {
	path := filepath.Join(dir, hardware.RecordName)
	r := new(Record)
	if _, err := toml.DecodeFile(path, r); err != nil {
		return nil, fmt.Errorf("%s: %w", path, err)
	}
	return r, nil
}
