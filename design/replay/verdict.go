package replay

import "holdfast/hardware"

// A Verdict is what replay found in a pulse folder. Every figure is computed
// from the integer codes of the folder and the numbers of its [model], never
// from the design path. Times are in ns, angles in rad, rates in rad/ns unless
// a field says otherwise; infidelity is the average gate infidelity on the code
// space, or what Measure says.
type Verdict struct {
	Name string // of the pulse
	Ends string // "settled" or "window": which ends the pulse was designed for and is required to meet

	// Measure says what infidelity means: "gate", "state" (one state to one) or "subspace" (the span of
	// some states to that of as many others, the loss averaged over them).
	Measure string

	Settled Figures // integrated on until the angle still to come is under 1e-12 rad
	Window  Figures // drive before the start and after the end of the window ignored

	// Dropped are the figures for the required ends with the rotating terms that the
	// model leaves out put back; nil when it leaves out none, or when they turn too fast to be integrated,
	// which a warning says.
	Dropped *Figures

	TailAngle float64 // rad that the ring-out still turns after the window
	Pair      Pair    // the same pulse twice, back to back

	// Decoherence is to be added to every coherent infidelity: T/6 (1/T1 + 2/T2) of a spin, see Folder.Decoherence for
	// several sites; zero when the device states no times.
	Decoherence float64

	Limits []Limit // of the instrument, recomputed from the codes
	Errors []Error // declared errors first, then detuning, amplitude, X, Y, Z where undeclared

	// BringUp tells what a bench should read with this pulse.
	BringUp BringUp

	Agreement Agreement    // with the record's [claim]
	Inputs    []Difference // between [model] and the model rebuilt from inputs/; empty when they agree

	Requirements []Requirement // of the brief, judged here
	Warnings     []string      // true but doubtful: one sentence each
}

// Met reports whether every requirement, every limit and the agreement with the
// record hold.
func (v *Verdict) Met() bool {
	for _, r := range v.Requirements {
		if !r.Met {
			return false
		}
	}
	for _, l := range v.Limits {
		if !l.OK {
			return false
		}
	}
	return v.Agreement.OK && len(v.Inputs) == 0
}

// Required returns the figures for the ends that the brief asks for.
func (v *Verdict) Required() Figures {
	if v.Ends == "window" {
		return v.Window
	}
	return v.Settled
}

// Figures are those of one gate.
type Figures struct {
	Infidelity float64 // see Verdict.Measure
	Leakage    float64 // out of the code space, averaged over its states, or over the first ones of a target of states
}

// Pair is the gate played twice without a gap against the square of its
// target: what one pulse's ring-out does to the next, beyond what the record
// of a single gate can show. The second pulse is turned by each of four phases
// (0, 90, 180, 270 degrees) and the worst is kept. Where free Z angles or local rotations cannot be
// followed from one pulse to the next, for a target of states, and where the Hamiltonian turns by itself, it is NaN, and a warning says so.
type Pair struct {
	Infidelity float64
	Phase      float64 // degrees, of the worst
}

// Limit is one reading of one channel against the instrument.
type Limit struct {
	Channel string
	hardware.Reading
}

// Error is what replay found about one error class.
type Error struct {
	Name string
	Held bool
	Kind string // "static", "amplitude", "any", "skew", "line" or "crosstalk", as Class defines them
	Unit string // of Low, High and Curve's Value: "MHz", "%" (amplitude, line and crosstalk) or "deg" (skew)

	// Susceptibility is the share of the error that survives the gate, rms over
	// the class, 0 to 1, from Richardson-extrapolated differences of exact gates. Of a class
	// of leakage (Leak) it is the share of what leads out of the code space.
	Susceptibility float64

	// LeakSusceptibility is what the error leads out of the code space, as a share of the
	// whole error, rms over the class; nil where no levels lie outside.
	LeakSusceptibility *float64
	Leak               bool // a class of leakage

	// Spread is "average" or "worst" where the error is held over sizes of it, and SpreadInfidelity the mean infidelity over them, or
	// the worst. NoiseInfidelity is what the error's noise adds to the infidelity, to first order in its spectrum; nil where it does not fluctuate.
	Spread                            string
	SpreadInfidelity, NoiseInfidelity *float64

	// Low and High are the error sizes, negative and positive, at which the
	// required infidelity is first broken, found by root search; -Inf and +Inf
	// when it holds to the end of the searched range, 0 when it is broken
	// without any error. The range is 50 MHz, 50 % or 50 degrees; of static errors
	// no more than twice the largest full scale, or a margin that is required. For "any" the margin is over the direction found worst
	// of those that were looked at (for a spin without a list of operators the axes, both ways, and the eight directions
	// between them; for all others see Sampled) and Low = -High; a size f means 2 pi f times one operator with its weight, or times
	// a combination of them of length 1: of spins' half products a rotation of one turn a microsecond for 1 MHz.
	Low, High float64

	// Sampled says what Low, High and Curve of a class of many operators were looked for along, such as
	// "the 15 operators of the class, the combination that survives most, 16 fixed combinations, both ways; the curve along the 8 ways that are worst".
	// Empty for one spin's "any" without a list, and for all other kinds.
	Sampled string

	// WorstDirection says which error of the class survives most, such as
	// "0.83 X + 0.41 Y", and WorstSusceptibility how much of it, relative to the operator of root mean square strength.
	// Kind "any" only. Of operators that are weighted it is the combination of the weighted ones.
	WorstDirection      string
	WorstSusceptibility float64
	Direction           []float64 // the same direction as numbers, of length 1: along X, Y, Z for one spin, and along Members of a class of many operators
	Members             []string  // names of the class's operators, of kind "any"; nil for one spin's without a list

	// Curve is the infidelity for the required ends against the size of the
	// error. For "any" sizes have no sign, and each point is the worst over what was looked at.
	Curve []Point
}

// Point is one point of a margin curve.
type Point struct {
	Value      float64 // in the Error's Unit
	Infidelity float64
}

// BringUp lists the populations of |1> that this pulse gives from |0>, with
// the required ends, so that a bench can see that the right pulse plays.
type BringUp struct {
	Amplitude []Population // Value: amplitude scale, 0.9 to 1.1
	Detuning  []Population // Value: detuning in MHz, -5 to 5, or half of the largest full scale either way where that is less
	Repeats   []Population // Value: number of pulses back to back, 1 to 32
}

// Population is the probability of |1> at one setting.
type Population struct {
	Value float64
	One   float64 // 0 to 1
}

// Agreement compares the verdict with the record's [claim], both on the rounded
// codes.
type Agreement struct {
	Infidelity     float64 // largest absolute difference over settled and window
	Susceptibility float64 // largest absolute difference over the errors
	TailAngle      float64 // rad
	OK             bool    // within 1e-9, 1e-5 and 1e-4 rad

	Worst Disagreement // the figure that differs most for what is allowed; without a name when the record claims nothing
}

// Disagreement is one figure as the verdict and the record have it.
type Disagreement struct {
	Figure          string // such as "infidelity, settled" or "susceptibility to detuning"
	Found, Recorded float64
	Allowed         float64 // how far they may be apart
}

// Difference is one number of [model] that inputs/ do not bear out.
type Difference struct {
	Key      string // of [model]
	Recorded string
	Rebuilt  string
}

// Requirement is one line of the brief's [require].
type Requirement struct {
	Name    string // such as "infidelity" or "margin against detuning"
	Unit    string // "" for plain numbers
	Found   float64
	Allowed float64 // an upper limit, except for margins, where it is a lower one
	Margin  bool
	Met     bool
}
