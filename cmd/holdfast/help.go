package main

import (
	"fmt"
	"io"
	"strings"
)

func overview(w io.Writer) {
	fmt.Fprintf(w, "holdfast designs pulses that an instrument can play and that hold a gate against errors.\n\nUsage:\n")
	for _, v := range verbs() {
		fmt.Fprintf(w, "  holdfast %-26s %s\n", v.name+" "+v.operands, v.short)
	}
	fmt.Fprint(w, `
First run:
  holdfast start lab
  holdfast check lab/*.toml
  holdfast design lab/x90.toml

Exit status: 0 done and requirements met, 1 done but not met, 2 bad input, 3 interrupted (the best so far is saved).
`)
}

// help explains a verb or a file.
func help(c *call) (int, error) {
	operands, err := c.parse(c.flags(), 0, 1)
	if err != nil {
		return exitBadInput, err
	}
	if len(operands) == 0 {
		overview(c.stdout)
		return exitMet, nil
	}
	if !explain(c.stdout, operands[0]) {
		var files []string
		for _, f := range fileHelps() {
			files = append(files, f.topic)
		}
		return exitBadInput, fmt.Errorf("help: found the topic %q; allowed: %s, %s", operands[0], verbNames(), strings.Join(files, ", "))
	}
	return exitMet, nil
}

// explain writes the help of a verb or of a file, and says whether there is one.
func explain(w io.Writer, topic string) bool {
	for _, v := range verbs() {
		if v.name == topic {
			fmt.Fprintf(w, "Usage: holdfast %s\n\n%s", strings.TrimSpace(v.name+" "+v.flags+" "+v.operands), verbHelp(topic))
			return true
		}
	}
	for _, f := range fileHelps() {
		if f.topic == topic {
			f.write(w)
			return true
		}
	}
	return false
}

// verbHelp is what a verb does, its flags and its exit statuses.
func verbHelp(name string) string {
	switch name {
	case "start":
		return `Makes the folder DIR with an invented example: rack-b.toml (hardware profile), skerry.toml (device) and
x90.toml (brief), each with comments, to be changed into yours. DIR must not exist yet.

Exit status: 0 done, 2 bad input.
`
	case "check":
		return `Reads each FILE strictly, tells by its tables whether it is a profile, a device or a brief, and says what it means:
  profile   sign of the mixer and frame, limits, what the line does to a step, the window at the device, the
            coefficients that each span carries and what they are enough for, cautions
  device    which energy |0> has, what drives it, what relaxation costs
  brief     the profile and the device that it names are read too: gate, span, what it is held against,
            equations against coefficients, requirements
Lines that begin with ! want your attention.

Exit status: 0 all files are in order, 2 a file is not (one line on stderr for each).
`
	case "design":
		return `Designs the pulse that BRIEF asks for, on the profile and the device that it names. Writes a pulse folder with
the samples, the record and copies of the three inputs ('holdfast help pulse'), recomputes it from those files by
other means, and writes a datasheet into it: one HTML file, to be opened in a browser. The result is printed too.
The folder gets its name only when all of it is written. The same inputs give the same files.

  -out FOLDER   the folder to make; without it the brief's name, in the working folder
  -force        when the folder exists: rename the old one to FOLDER.before-N (without -force it is refused)

Flags may stand before or after the operand. An interrupt (Ctrl-C) ends the search and saves the best so far; a
second one ends the program at once and saves nothing.

Exit status: 0 found, and every requirement and limit is kept; 1 not found, or not kept (the folder is written and
says so); 2 bad input, nothing is written; 3 interrupted, the best so far is saved.
`
	case "replay":
		return `Reads the pulse folder PULSE back and recomputes everything from its codes and its [model], by other means than
design: limits, infidelity, how much of each error survives, how large each error may grow, and whether the record
and the copies of the inputs agree with that. Writes nothing unless asked.

  -datasheet FILE   also write a new datasheet to FILE, which must not exist yet

Flags may stand before or after the operand.

Exit status: 0 found, and every requirement, limit and the record are borne out; 1 not; 2 the folder cannot be read,
or a file was changed since it was written; 3 interrupted.
`
	case "help":
		return `Explains a verb, or every key of a file: profile, device, brief, pulse. Without an operand, lists the verbs.
`
	}
	return `Prints the version of the program.
`
}

// A fileHelp explains a kind of file, key by key.
type fileHelp struct {
	topic, head string
	keys        []key
	foot        string
}

// A key is one key of a file. path is its tables and its name, [] after a table
// that may be repeated.
type key struct {
	path    string
	example string // as it is written in TOML
	limits  string // what is allowed, in the words of the loader's messages
	absent  string // what its absence means; must: the key is required
	says    string
}

// must marks a key that is required wherever its table stands.
const must = "required"

// write prints the keys by table.
func (f fileHelp) write(w io.Writer) {
	fmt.Fprintf(w, "%s\n", f.head)
	table := "none yet"
	for _, k := range f.keys {
		at, name := "", k.path
		if i := strings.LastIndexByte(k.path, '.'); i >= 0 {
			at, name = k.path[:i], k.path[i+1:]
		}
		if at != table {
			table = at
			fmt.Fprintf(w, "\n%s\n", header(at))
		}
		fmt.Fprintf(w, "  %s = %s\n", name, k.example)
		line := k.limits
		switch {
		case k.absent == "":
		case line == "":
			line = "(when absent: " + k.absent + ")"
		case k.absent == must:
			line += " (required)"
		default:
			line += " (when absent: " + k.absent + ")"
		}
		if line != "" {
			fmt.Fprintf(w, "      %s\n", wrap(line, 104, 6))
		}
		fmt.Fprintf(w, "      %s\n", wrap(k.says, 104, 6))
	}
	if f.foot != "" {
		fmt.Fprintf(w, "\n%s", f.foot)
	}
}

// header writes the path of a table as TOML does: channel[].line is
// [channel.line] below the last [[channel]], instrument is [instrument].
func header(path string) string {
	if path == "" {
		return "At the top of the file"
	}
	plain := strings.ReplaceAll(path, "[]", "")
	if strings.HasSuffix(path, "[]") {
		return "[[" + plain + "]]"
	}
	return "[" + plain + "]"
}

func fileHelps() []fileHelp {
	return []fileHelp{
		{"profile", profileHead, profileKeys(), ""},
		{"device", deviceHead, deviceKeys(), ""},
		{"brief", briefHead, briefKeys(), briefFoot},
		{"pulse", pulseHead, pulseKeys(), pulseFoot},
	}
}

const units = `Quantities are texts with their unit ("40 MHz", "112 ns", "1.5 %"); a bare number is refused where a unit belongs.
Units: s ms us ns ps; Hz kHz MHz GHz (cyclic); S/s kS/s MS/s GS/s; % ppm; %/sample; V mV uV; bit; deg rad.
Keys are case-sensitive, and unknown ones are refused.`

const profileHead = `A hardware profile is a TOML file that says what an instrument and its lines can do.

` + units + ` Shares are shares of full scale.`

func profileKeys() []key {
	return []key{
		{"format", "1", "1, and nothing else", must, "of this file"},
		{"instrument.name", `"rack B, position 3"`, "a text in quotes", must, "for people"},
		{"instrument.sample_rate", `"1 GS/s"`, "1 MS/s to 100 GS/s", must, "each sample is held until the next"},
		{"instrument.resolution", `"14 bit"`, "2 bit to 16 bit", must, "codes go from -2^(bits-1) to 2^(bits-1)-1; full scale is 2^(bits-1)"},
		{"instrument.block", "8", "1 to 4096", "1", "samples; the length of a waveform is a multiple of it"},
		{"instrument.shortest", "8", "1 to 65536", "one block", "samples; the shortest waveform"},
		{"instrument.longest", "65536", "1 to 65536", "65536", "samples; the longest waveform"},
		{"channel[].name", `"q1 drive"`, "a text in quotes", must, "by which device and brief name it; one [[channel]] for each output, 1 to 64 of them"},
		{"channel[].kind", `"quadrature"`, `"quadrature"`, must, "a pair of converters, I and Q, that feed one mixer"},
		{"channel[].mixing", `"I cos - Q sin"`, `"I cos - Q sin" or "I cos + Q sin"`, must, "what leaves the mixer: which carrier Q multiplies"},
		{"channel[].carrier", `"5.1 GHz"`, "1 Hz to 10000 GHz", "not stated", "of the mixer; for messages only"},
		{"channel[].full_scale", `"40 MHz"`, "1 Hz to 100 GHz", must, "steady Rabi frequency at full code: 40 MHz turns a spin once in 25 ns"},
		{"channel[].full_scale_level", `"0.5 V"`, "1 uV to 1000 V", "not stated", "what the connector then puts out; for the cautions"},
		{"channel[].amplitude_limit", `"95 %"`, "0.01 % to 100 %", "100 %", "of the length of (I, Q)"},
		{"channel[].slew_limit", `"25 %/sample"`, "0.01 %/sample to 200 %/sample", "no limit", "of the step between neighbours in I and in Q, those from and to zero included"},
		{"channel[].band", `"100 MHz"`, "1 kHz to half the sample rate", "no limit, one coefficient for each free sample", "the spectrum of the samples is to lie within this distance of the carrier"},
		{"channel[].latency", `"0 ns"`, "0 ns to 1 ms", "0 ns", "from trigger to converter output"},
		{"channel[].guard.lead", "0", "0 to 65536", "0", "samples held at zero at the start of a span"},
		{"channel[].guard.trail", "4", "0 to 65536", "0", "samples held at zero at its end"},
		{"channel[].ring_out.limit", `"0.1 %"`, "1 ppm to 100 %", must, "of what arrives in I and in Q at every instant after the span; no [channel.ring_out]: no limit"},
		{"channel[].ring_out.fast", `"8 ns"`, "0 ns to 1 s", "8 samples", "the first part after the span, told apart from the slow rest"},
		{"channel[].line.delay", `"3.2 ns"`, "0 ns to 1 ms", "0 ns", "pure delay between converter and device; no [channel.line]: straight through"},
		{"channel[].line.lowpass[].family", `"bessel"`, `"bessel" or "single-pole"`, must, "one table or a list of up to 4, in series"},
		{"channel[].line.lowpass[].order", "2", "a whole number, 1 to 8", "required for bessel, refused for single-pole", "of the Bessel low-pass"},
		{"channel[].line.lowpass[].corner", `"200 MHz"`, "1 kHz to 1000 GHz", must, "where 3.01 dB are lost"},
		{"channel[].line.lowpass[].known_to", `"5 %"`, "0 % to 100 %", "not stated", "how well the corner is known"},
		{"channel[].line.tails[].amplitude", `"-1.5 %"`, "-50 % to 50 %", must, "a step first arrives short (-) or long (+) by this much; up to 8 tails"},
		{"channel[].line.tails[].time", `"30 ns"`, "10 ps to 1 s", must, "time constant with which it settles"},
		{"channel[].line.tails[].known_to", `"20 %"`, "0 % to 100 %", "not stated", "how well amplitude and time are known"},
	}
}

const deviceHead = `A device file is a TOML file that says what is driven. This version plays one spin: one site, one drive.

` + units

func deviceKeys() []key {
	return []key{
		{"format", "1", "1, and nothing else", must, "of this file"},
		{"name", `"Skerry"`, "a text in quotes", must, "of the device, for people"},
		{"site[].name", `"q1"`, "a text in quotes", must, "by which drive and brief name the spin"},
		{"site[].levels", "2", "a whole number, 2 to 16", "2", "this version plays 2"},
		{"site[].zero", `"lower"`, `"lower" or "upper"`, `"lower"`, "which of the two energies |0> has, the +1 state of Z; with the profile's mixing it settles whether Q turns about +Y or -Y"},
		{"site[].frequency", `"5.1 GHz"`, "1 Hz to 10000 GHz", "not stated", "of the transition; for messages only"},
		{"site[].detuning", `"0 Hz"`, "-1 GHz to 1 GHz", "0 Hz", "of the transition from the frame of the drive, constant: H0 = 2 pi f Z/2"},
		{"site[].T1", `"60 us"`, "1 ns to 1e+06 s", "not stated", "relaxation; for the cost of decoherence, T/6 (1/T1 + 2/T2)"},
		{"site[].T2", `"40 us"`, "1 ns to 1e+06 s", "not stated", "coherence; at most 2 T1"},
		{"drive[].site", `"q1"`, "a text in quotes", must, "which site is driven"},
		{"drive[].channel", `"q1 drive"`, "a text in quotes", must, "by which channel of the hardware profile"},
	}
}

const briefHead = `A brief is a TOML file that says which gate is wanted, in what time, held against what, and what it must reach.

` + units

func briefKeys() []key {
	const size = "1 Hz to 1 GHz"
	return []key{
		{"format", "1", "1, and nothing else", must, "of this file"},
		{"name", `"x90-any"`, "a text in quotes", must, "of the pulse; also of its folder, unless -out says otherwise"},
		{"profile", `"rack-b.toml"`, "a text in quotes", must, "the hardware profile, from the folder of the brief"},
		{"device", `"skerry.toml"`, "a text in quotes", must, "the device, from the folder of the brief"},
		{"span", `"112 ns"`, "1 ps to 1 s", must, "the time the gate may take, guard samples included: whole blocks of samples"},
		{"ends", `"settled"`, `"settled" or "window"`, `"settled"`, "which gate is designed and required: with what still arrives after the span, or without"},
		{"hold", `"nothing"`, `"nothing"`, "held against the errors below", "hold the gate against no error; there is no other value, and no [[error]] beside it"},
		{"seed", "1", "0 to 9223372036854775807", "1", "of the random starts: the same seed gives the same pulse"},
		{"starts", "60", "1 to 100000", "60", "how many starts the search may take"},
		{"refine", "true", "true or false", "true", "after the first order has vanished, lower what errors of the given sizes do"},
		{"target.site", `"q1"`, "a text in quotes", must, "of the device"},
		{"target.gate", `"X90"`, `"X90", "-X90", "X180", "Y90", "-Y90", "Y180", "Z90", "Z180", "H", "S", "T" or "identity"`, "axis and angle, or matrix", "the gate by its name"},
		{"target.axis", "[1, 0, 0]", "an array of at most 3 numbers", "gate or matrix", "of a rotation exp(-i angle/2 n.(X,Y,Z)); any length but 0"},
		{"target.angle", `"90 deg"`, "-720 deg to 720 deg", "required beside axis", "of that rotation"},
		{"target.matrix", "[[1, 0], [0, [0, 1]]]", "a square matrix of at most 2 rows", "gate, or axis and angle", "unitary, rows of numbers or [re, im]; the global phase has no meaning"},
		{"basis.family", `"slepian"`, `"slepian" or "samples"`, `"slepian"`, "of what the samples are made: band-limited sequences, or one coefficient for each free sample"},
		{"basis.coefficients", "20", "1 to 65536", "as many as band and span carry", "per quadrature, of family slepian"},
		{"error[].detuning", `"q1"`, "a text in quotes", "another of the five", "a site: H += 2 pi f Z/2"},
		{"error[].amplitude", `"q1 drive"`, "a text in quotes", "another of the five", "a channel: what it delivers is scaled by 1 + size"},
		{"error[].operator", `"X"`, `"X", "Y" or "Z"`, "another of the five", "H += 2 pi f X/2, and so for Y and Z"},
		{"error[].matrix", "[[0, [0, -0.5]], [[0, 0.5], 0]]", "a square matrix of at most 2 rows", "another of the five", "H += 2 pi f M; Hermitian and traceless, rows of numbers or [re, im]"},
		{"error[].any", `"all"`, `"all"`, "another of the five", "any static error: H += 2 pi f n.(X,Y,Z)/2 with a direction n that nobody knows"},
		{"error[].name", `"slow field"`, "a text in quotes", `"detuning", "amplitude", "X", "Y", "Z", "matrix" or "any static error"`, "of the error; each its own"},
		{"error[].size", `"3 MHz"`, size, `"3 MHz"; "3 %" for an amplitude, of 1 ppm to 50 %; "1 MHz" for any`, "how large it may be, for the refinement: f is the rotation frequency that the error causes"},
		{"error[].weight", "1", "a number, 1e-06 to 1e+06", "1", "relative to the gate itself"},
		{"require.infidelity", "1e-4", "a number, 1e-12 to 1", "1e-4", "average gate infidelity for the stated ends, at most"},
		{"require.susceptibility", "1e-3", "a number, 1e-09 to 1", "1e-3", "the share of each held error that may survive the gate"},
		{"require.margin[].error", `"detuning"`, `"detuning", "amplitude", "X", "Y"`, must, "detuning, amplitude, X, Y, Z or the name of an [[error]] (not of kind any)"},
		{"require.margin[].size", `"0.3 MHz"`, size, must, "up to this size of the error, either sign, the infidelity above must hold; a share for an amplitude, 1 ppm to 50 %"},
	}
}

const briefFoot = `A brief without [[error]] and without hold is held against detuning, amplitude and any static error. There may be
16 [[error]] and 16 [[require.margin]].
`

const pulseHead = `A pulse is a folder:

  pulse.toml        the record, explained below
  CHANNEL.npy       the codes to play: NPY, int16, shape (samples, 2): I and Q
  CHANNEL-exact.npy the samples before rounding: NPY, float64, shares of full scale
  inputs/           copies of profile.toml, device.toml and brief.toml
  datasheet.html    for people

Numbers in pulse.toml are plain, with the unit in the key's name or below; matrices are rows of [re, im]. The program
writes it, and replay refuses a folder of which a file was changed. [model] and the waveform files are all that is
needed to recompute the gate:

  dU/dt = -i H U,  H = static + sum over channels of full_scale (u_I operators[0] + u_Q operators[1]),
  u_I + i u_Q: what the held samples x = (I + i Q) / 2^(bits-1) become behind
  G(s) = e^(-s delay) (direct + sum residue/(s - pole)^power)`

func pulseKeys() []key {
	const share = "share of full scale"
	return []key{
		{"format", "1", "", "", "of this file"},
		{"pulse.name", `"x90-any"`, "", "", "the brief's"},
		{"pulse.target", `"X90 on q1"`, "", "", "the gate in words"},
		{"pulse.span", `"112 ns"`, "", "", "guard samples included"},
		{"pulse.held", `["any static error"]`, "", "", "the errors it is held against"},
		{"pulse.held_by_default", "false", "", "", "true when the brief named no error"},
		{"pulse.status", `"found"`, "", "", `or "not found: the best miss", or "interrupted: the best so far"`},
		{"basis.family", `"slepian"`, "", "", "slepian or samples: samples = basis times coefficients"},
		{"basis.coefficients_per_quadrature", "20", "", "", "their number"},
		{"basis.band", `"100 MHz"`, "", "no limit", "either side of the carrier"},
		{"basis.i", "[0.1, -0.2]", "", "", "the coefficients of I, " + share},
		{"basis.q", "[0.1, -0.2]", "", "", "the coefficients of Q, " + share},
		{"search.seed", "1", "", "", "of the random starts"},
		{"search.starts_allowed", "60", "", "", "by the brief"},
		{"search.starts_tried", "9", "", "", "before enough had succeeded"},
		{"search.successes", "8", "", "", "starts at the end of which the residuals vanished"},
		{"search.winning_start", "6", "", "", "the one that was kept, counted from 0"},
		{"search.evaluations", "1509", "", "", "of residuals and derivatives"},
		{"search.equations", "12", "", "", "residuals that must vanish"},
		{"search.refined", "true", "", "", "whether finite errors were lowered afterwards"},
		{"search.sum_of_squared_residuals", "1e-24", "", "", "what is left of them, before rounding"},
		{"search.infidelity_before_rounding", "1e-24", "", "", "for the stated ends"},
		{"require.infidelity", "1e-4", "", "", "the brief's"},
		{"require.susceptibility", "1e-3", "", "", "the brief's"},
		{"require.margin[].error", `"detuning"`, "", "", "the brief's"},
		{"require.margin[].size_rad_per_ns", "0.0019", "", "size_share stands there", "2 pi times the brief's frequency"},
		{"require.margin[].size_share", "0.01", "", "size_rad_per_ns stands there", "of an amplitude error"},
		{"decoherence.t1_ns", "60000.0", "", "not stated", "the device's"},
		{"decoherence.t2_ns", "40000.0", "", "not stated", "the device's"},
		{"provenance.program", `"holdfast"`, "", "", "what wrote the folder"},
		{"provenance.version", `"` + version + `"`, "", "", "of the program"},
		{"provenance.instrument", `"rack B, position 3"`, "", "", "the profile's name"},
		{"provenance.device", `"Skerry"`, "", "", "the device's name"},
		{"provenance.site", `"q1"`, "", "", "that is driven"},
		{"provenance.channel", `"q1 drive"`, "", "", "that drives it"},
		{"claim.infidelity", "4.7e-9", "0 to 1", "", "of the rounded codes, for the stated ends"},
		{"claim.infidelity_other_ends", "1.2e-5", "0 to 1", "", "of the same codes for the other ends"},
		{"claim.leakage", "0.0", "0 to 1", "", "out of the code space, for the stated ends"},
		{"claim.tail_angle_rad", "0.0087", "rad", "", "what the ring-out still turns after the window"},
		{"model.sample_period_ns", "1.0", "ns", "", "each sample is held that long"},
		{"model.samples", "112", "", "", "the span, guards included"},
		{"model.bits", "14", "", "", "x = code / 2^(bits-1)"},
		{"model.ends", `"settled"`, "", "", "or \"window\": which gate the figures are of"},
		{"model.window_start_ns", "3.2", "ns", "", "when the device's window begins; it lasts samples * sample_period_ns"},
		{"model.dim", "2", "", "", "of the device's space"},
		{"model.code_space", "[0, 1]", "", "", "basis states of the gate"},
		{"model.static_rad_per_ns", "[[[0.0, 0.0], [0.0, 0.0]], [[0.0, 0.0], [0.0, 0.0]]]", "rad/ns", "", "the Hamiltonian without drive and errors"},
		{"model.target", "[[[0.7, 0.0], [0.0, -0.7]], [[0.0, -0.7], [0.7, 0.0]]]", "", "", "the gate that is wanted, on the code space"},
		{"model.free_z_before", "[]", "rad", "", "rotations about Z that cost nothing, before the gate; empty when there are none"},
		{"model.free_z_after", "[]", "rad", "", "the same after it"},
		{"model.channel[].name", `"q1 drive"`, "", "", "of the profile"},
		{"model.channel[].kind", `"quadrature"`, "", "", "two converters into one mixer"},
		{"model.channel[].codes", `"q1-drive.npy"`, "", "", "the file to play"},
		{"model.channel[].samples_before_rounding", `"q1-drive-exact.npy"`, "", "", "the file of exact samples"},
		{"model.channel[].full_scale_rad_per_ns", "0.2513", "rad/ns", "", "2 pi times the profile's full scale"},
		{"model.channel[].delay_ns", "3.2", "ns", "", "latency and pure delay"},
		{"model.channel[].direct", "[0.0, 0.0]", "", "", "what passes the line at once, [re, im]"},
		{"model.channel[].poles_per_ns", "[[-0.033, 0.0]]", "1/ns", "", "of the line, [re, im]"},
		{"model.channel[].powers", "[1]", "", "", "of (s - pole), one for each pole"},
		{"model.channel[].residues", "[[0.0005, 0.0]]", "1/ns to the power", "", "one for each pole, [re, im]"},
		{"model.channel[].operators", "[[[[0.0, 0.0], [0.5, 0.0]], [[0.5, 0.0], [0.0, 0.0]]]]", "", "", "what I and Q multiply"},
		{"model.channel[].max_share", "0.95", share, "", "limit of the length of (I, Q)"},
		{"model.channel[].max_slew_per_sample", "0.25", share, "no limit", "limit of the step between neighbours"},
		{"model.channel[].guard_lead", "0", "", "", "samples at zero at the start"},
		{"model.channel[].guard_trail", "4", "", "", "samples at zero at the end"},
		{"model.channel[].ring_out_share", "0.001", share, "no limit", "limit of what arrives after the span, in I and in Q"},
		{"model.error[].name", `"detuning"`, "", "", "every held error, and detuning, amplitude, X, Y, Z"},
		{"model.error[].held", "false", "", "", "whether the pulse is held against it"},
		{"model.error[].kind", `"static"`, "", "", `"static": H += lambda operator; "amplitude": u of the channels times 1 + lambda; "any": every traceless operator`},
		{"model.error[].operator", "[[[0.5, 0.0], [0.0, 0.0]], [[0.0, 0.0], [-0.5, 0.0]]]", "", "not of kind static", "for lambda in rad/ns"},
		{"model.error[].channels", `["q1 drive"]`, "", "all channels", "of kind amplitude"},
		{"model.error[].susceptibility", "1.7e-5", "", "", "the share of the error that survives the gate, by the rounded codes"},
		{"headroom[].channel", `"q1 drive"`, "", "", "one [[headroom]] for each limit of a channel"},
		{"headroom[].limit", `"amplitude"`, "", "", "which limit"},
		{"headroom[].unit", `"share of full scale"`, "", "", "of found and allowed"},
		{"headroom[].found", "0.9499", "", "", "on the rounded codes"},
		{"headroom[].allowed", "0.95", "", "", "by the profile"},
		{"headroom[].headroom", "0.0001", "", "", "1 - found/allowed"},
		{"headroom[].kept", "true", "", "", "whether found is within the limit"},
		{"file[].name", `"q1-drive.npy"`, "", "", "every other file but the datasheet"},
		{"file[].sha256", `"9f86d081..."`, "", "", "of its bytes, in hexadecimal"},
	}
}

const pulseFoot = `The settled gate counts what arrives after the window, in the frame of the undriven device; the window's gate leaves
it out. Errors act from the start of the window to its end.
`
