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
		if c.json {
			return exitMet, c.emit(helpFormOf())
		}
		overview(c.stdout)
		return exitMet, nil
	}
	w := c.stdout
	if c.json {
		w = io.Discard
	}
	if !explain(w, operands[0]) {
		var files []string
		for _, f := range fileHelps() {
			files = append(files, f.topic)
		}
		return exitBadInput, fmt.Errorf("help: found the topic %q; allowed: %s, %s", operands[0], verbNames(), strings.Join(files, ", "))
	}
	if c.json {
		return exitMet, c.emit(topicFormOf(operands[0]))
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

  -json   print one JSON object instead of text ('help json')

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

  -json   print one JSON object instead of text ('help json')

Exit status: 0 all files are in order, 2 a file is not (one line on stderr for each).
`
	case "design":
		return `Designs the pulse that BRIEF asks for, on the profile and the device that it names. Writes a pulse folder with
the samples, the record and copies of the three inputs ('holdfast help pulse'), recomputes it from those files by
other means, and writes a datasheet into it: one HTML file, to be opened in a browser. The result is printed too.
The folder gets its name only when all of it is written. The same inputs give the same files.

  -out FOLDER   the folder to make; without it the brief's name, in the working folder
  -force        when the folder exists: rename the old one to FOLDER.before-N (without -force it is refused)
  -json         print one JSON object instead of text ('help json')

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
  -json             print one JSON object instead of text ('help json')

Flags may stand before or after the operand.

Exit status: 0 found, and every requirement, limit and the record are borne out; 1 not; 2 the folder cannot be read,
or a file was changed since it was written; 3 interrupted.
`
	case "card":
		return `Writes the convention card of a bench into a folder: three short sequences for the first channel with a mixer that
DEVICE names, and card.txt, a table of the populations that they give through the line of PROFILE for each of 16 ways
in which signs can be wrong: mixing, cables of I and Q, energy of |0>, side of the carrier. One run on the bench tells
which group of rows it is; what no population can tell stands in one group, and the card says so. Nothing is designed.

  -out FOLDER     the folder to make; without it card, in the working folder
  -force          when the folder exists: rename the old one to FOLDER.before-N (without -force it is refused)
  -detuning "F"   how far the carrier will lie below the transition ("2 MHz"); without it 1/16 of full scale or less
  -json           print one JSON object instead of text ('help json')

  card.txt    the table
  1-turn.npy, 2-plus.npy, 3-minus.npy
              the sequences; beside each the same as .csv, .int16 and -arrives.npy, as in a pulse folder ('help pulse')
  inputs/     copies of profile and device

Exit status: 0 done, 2 bad input, 3 interrupted; with 2 and 3 nothing is written.
`
	case "help":
		return `Explains a verb, or every key of a file: profile, device, brief, pulse, and of what -json prints: json. Without an
operand, lists the verbs.

  -json   print one JSON object instead of text ('help json')
`
	}
	return `Prints the version of the program.

  -json   print one JSON object instead of text ('help json')
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

// jsonTopic explains what -json prints.
const jsonTopic = "json"

func fileHelps() []fileHelp {
	return []fileHelp{
		{"profile", profileHead, profileKeys(), ""},
		{"device", deviceHead, deviceKeys(), ""},
		{"brief", briefHead, briefKeys(), briefFoot},
		{"pulse", pulseHead, pulseKeys(), pulseFoot},
		{jsonTopic, jsonHead, nil, jsonText()},
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
		{"instrument.align", `"delay"`, `"delay" or "none"`, `"delay"`, "whether channels with shorter lines are delayed by whole samples, so that all windows at the device begin within half a sample of the latest"},
		{"channel[].name", `"q1 drive"`, "a text in quotes", must, "by which device and brief name it; one [[channel]] for each output, 1 to 64 of them"},
		{"channel[].kind", `"quadrature"`, `"quadrature" or "baseband"`, must, "a pair of converters, I and Q, that feed one mixer; or one converter without a carrier, which has neither mixing, carrier, envelope nor resonance"},
		{"channel[].mixing", `"I cos - Q sin"`, `"I cos - Q sin" or "I cos + Q sin"`, "required for quadrature, refused for baseband", "what leaves the mixer: which carrier Q multiplies"},
		{"channel[].carrier", `"5.1 GHz"`, "1 Hz to 10000 GHz", "not stated", "of the mixer; for messages only"},
		{"channel[].full_scale", `"40 MHz"`, "1 Hz to 100 GHz", must, "steady Rabi frequency at full code: 40 MHz turns a spin once in 25 ns; of a baseband channel the frequency by which it turns the device; with a compression that of a drive which does not compress"},
		{"channel[].full_scale_level", `"0.5 V"`, "1 uV to 1000 V", "not stated", "what the connector then puts out; for the cautions"},
		{"channel[].envelope", `"disc"`, `"disc" or "box"`, `"disc"`, "what amplitude_limit limits: the length of (I, Q), or I and Q apart"},
		{"channel[].amplitude_limit", `"95 %"`, "0.01 % to 100 %", "100 %", "of the length of (I, Q), or of I and Q apart; of the one output of a baseband channel"},
		{"channel[].slew_limit", `"25 %/sample"`, "0.01 %/sample to 200 %/sample", "no limit", "of the step between neighbours in I and in Q, those from and to zero included"},
		{"channel[].rms_limit", `"60 %"`, "0.01 % to 100 %", "required beside rms_period, else no limit", "of the root of the mean square of the length of (I, Q) over the span, behind the compression"},
		{"channel[].rms_period", `"1 us"`, "1 ps to 1000 s", "the span", "the mean is over this time where it is longer than the span: one pulse is played in each such period"},
		{"channel[].band", `"100 MHz"`, "1 kHz to half the sample rate", "required beside out_of_band, else no limit and one coefficient for each free sample", "the spectrum of the samples is to lie within this distance of the carrier (baseband: of zero)"},
		{"channel[].out_of_band", `"0.1 %"`, "1 ppm to 100 %", "no limit but the basis", "of the rms over the span of that part of the samples, behind the compression, which lies outside the band"},
		{"channel[].zero_mean", "true", "true or false", "false", "the samples of a span must sum to zero, in I and in Q: for lines with an AC coupling"},
		{"channel[].latency", `"0 ns"`, "0 ns to 1 ms", "0 ns", "from trigger to converter output"},
		{"channel[].guard.lead", "0", "0 to 65536", "0", "samples held at zero at the start of a span"},
		{"channel[].guard.trail", "4", "0 to 65536", "0", "samples held at zero at its end"},
		{"channel[].ring_out.limit", `"0.1 %"`, "1 ppm to 100 %", must, "of what arrives in I and in Q at every instant after the span; no [channel.ring_out]: no limit"},
		{"channel[].ring_out.fast", `"8 ns"`, "0 ns to 1 s", "8 samples", "the first part after the span, told apart from the slow rest"},
		{"channel[].ring_out.tail", `"0.05 %"`, "1 ppm to 100 %", "the same as limit", "what counts instead of limit at every instant after that first part"},
		{"channel[].compression", `[["0 %", "0 %"], ["50 %", "49 %"], ["100 %", "95 %"]]`, "an array of at most 64 pairs of texts", "none", "share at the converter, share of full scale reached: from 0 to 100 % at the converter, both rising, linear between, on the length of (I, Q); undone before codes; not with a box"},
		{"channel[].shift", `"12 kHz"`, "-1 GHz to 1 GHz", "0 Hz", "what the drive does to the device by its power: at steady full scale H += 2 pi f Z/2, with |0> the +1 state of Z, else in proportion to the power"},
		{"channel[].line.delay", `"3.2 ns"`, "0 ns to 1 ms", "required beside delay_known_to, else 0 ns", "pure delay between converter and device; no [channel.line]: straight through"},
		{"channel[].line.delay_known_to", `"1 %"`, "0 % to 100 %", "not stated", "how well the delay is known, relative to itself"},
		{"channel[].line.lowpass[].family", `"bessel"`, `"single-pole", "bessel", "butterworth", "critical" or "gaussian"`, must, "one table or a list of up to 4, in series; critical is critically damped, gaussian near to a Gaussian"},
		{"channel[].line.lowpass[].order", "2", "a whole number, 1 to 8", "required for all but single-pole, refused there", "of the low-pass"},
		{"channel[].line.lowpass[].corner", `"200 MHz"`, "1 kHz to 1000 GHz", must, "where 3.01 dB are lost"},
		{"channel[].line.lowpass[].known_to", `"5 %"`, "0 % to 100 %", "not stated", "how well the corner is known"},
		{"channel[].line.allpass", `"0.4 ns"`, "1 ps to 1 us", "required beside allpass_known_to, else none", "a first-order allpass (1 - s T/2)/(1 + s T/2) that delays slow signals by T"},
		{"channel[].line.allpass_known_to", `"10 %"`, "0 % to 100 %", "not stated", "how well that time is known"},
		{"channel[].line.ac_coupling", `"1 ms"`, "1 ns to 1000 s", "required beside ac_coupling_known_to, else none", "time constant T of a coupling capacitor, s T/(1 + s T): nothing steady passes"},
		{"channel[].line.ac_coupling_known_to", `"20 %"`, "0 % to 100 %", "not stated", "how well that time is known"},
		{"channel[].line.resonance[].offset", `"60 MHz"`, "-1000 GHz to 1000 GHz", must, "a dip in what the line passes, this far above the carrier in true frequency, on the side that mixing makes of it; divided by what it passes at the carrier; up to 4"},
		{"channel[].line.resonance[].half_width", `"8 MHz"`, "1 kHz to 1000 GHz", must, "half its full width between the points where half of it is left"},
		{"channel[].line.resonance[].depth", `"15 %"`, "-1000 % to 100 %", must, "the share that is missing in its middle; negative: a peak"},
		{"channel[].line.resonance[].known_to", `"30 %"`, "0 % to 100 %", "not stated", "how well these three are known, relative to themselves"},
		{"channel[].line.tails[].amplitude", `"-1.5 %"`, "-50 % to 50 %", must, "a step first arrives short (-) or long (+) by this much; up to 8 tails"},
		{"channel[].line.tails[].time", `"30 ns"`, "10 ps to 1 s", must, "time constant with which it settles"},
		{"channel[].line.tails[].known_to", `"20 %"`, "0 % to 100 %", "not stated", "how well amplitude and time are known"},
	}
}

const deviceHead = `A device file is a TOML file that says what is driven. This version plays one spin: one site, at most one
drive, up to 8 biases, and at least one of them.

` + units

func deviceKeys() []key {
	return []key{
		{"format", "1", "1, and nothing else", must, "of this file"},
		{"name", `"Skerry"`, "a text in quotes", must, "of the device, for people"},
		{"site[].name", `"q1"`, "a text in quotes", must, "by which drive and brief name the spin"},
		{"site[].levels", "2", "a whole number, 2 to 8", "2", "2 is a spin, more an anharmonic ladder whose two lowest levels are the code space"},
		{"site[].anharmonicity", `"-220 MHz"`, "-1 GHz to 1 GHz", "must be given for more than 2 levels", "of a ladder: by how much the 1-2 transition lies above the 0-1 one; of no effect for 2 levels"},
		{"site[].zero", `"lower"`, `"lower" or "upper"`, `"lower"`, "which of the two energies |0> has, the +1 state of Z; with the profile's mixing it settles whether Q turns about +Y or -Y"},
		{"site[].frequency", `"5.1 GHz"`, "1 Hz to 10000 GHz", "not stated", "of the transition; for messages only"},
		{"site[].detuning", `"0 Hz"`, "-1 GHz to 1 GHz", "0 Hz", "of the transition from the frame of the drive, positive above it, constant: H0 = 2 pi f Z/2 when |0> has the upper energy, -2 pi f Z/2 when it has the lower"},
		{"site[].T1", `"60 us"`, "1 ns to 1e+06 s", "not stated", "relaxation; for the cost of decoherence, T/6 (1/T1 + 2/T2)"},
		{"site[].T2", `"40 us"`, "1 ns to 1e+06 s", "not stated", "coherence; at most 2 T1"},
		{"drive[].site", `"q1"`, "a text in quotes", must, "which site is driven"},
		{"drive[].channel", `"q1 drive"`, "a text in quotes", must, "by which quadrature channel of the hardware profile"},
		{"bias[].site", `"q1"`, "a text in quotes", must, "which site is turned: H += u O/2 with u what arrives, in rad/ns"},
		{"bias[].channel", `"q1 flux"`, "a text in quotes", must, "by which baseband channel of the hardware profile; its own for each"},
		{"bias[].axis", `"Z"`, `"X", "Y" or "Z"`, `"Z"`, "the operator O"},
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
		{"phase_by", `"samples"`, `"instrument" or "samples"`, `"instrument", and "samples" beside phases`, "who turns the axis of the gate about Z: the instrument its one waveform, or the program, with a waveform for each of the phases"},
		{"phases", `["0 deg", "90 deg"]`, "an array of at most 64 texts", "required beside phase_by = \"samples\"", "the angles by which the gate is turned"},
		{"hold", `"nothing"`, `"nothing" or "profile"`, "held against the errors below", "hold the gate against no error, with no [[error]] beside it; or against every parameter of the lines for which the profile has a known_to, beside any [[error]]"},
		{"seed", "1", "0 to 9223372036854775807", "1", "of the random starts: the same seed gives the same pulse"},
		{"starts", "60", "1 to 100000", "60", "how many starts the search may take"},
		{"refine", "true", "true or false", "true", "after the first order has vanished, lower what errors of the given sizes do"},
		{"target.site", `"q1"`, "a text in quotes", must, "of the device"},
		{"target.gate", `"X90"`, `"X90", "-X90", "X180", "Y90", "-Y90", "Y180", "Z90", "Z180", "H", "S", "T" or "identity"`, "axis and angle, or matrix", "the gate by its name"},
		{"target.free_z", `"none"`, `"none", "before", "after" or "both"`, `"none"`, "where rotations about Z cost nothing, because phases are tracked in software: the design chooses them and the record names them"},
		{"target.axis", "[1, 0, 0]", "an array of at most 3 numbers", "gate or matrix", "of a rotation exp(-i angle/2 n.(X,Y,Z)); any length but 0"},
		{"target.angle", `"90 deg"`, "-720 deg to 720 deg", "required beside axis", "of that rotation"},
		{"target.matrix", "[[1, 0], [0, [0, 1]]]", "a square matrix of at most 2 rows", "gate, or axis and angle", "unitary, rows of numbers or [re, im]; the global phase has no meaning"},
		{"basis.family", `"slepian"`, `"slepian", "fourier", "tapered", "b-spline", "samples" or "best"`, `"slepian"`, "of what the samples are made: band-limited sequences, sines, sines with soft ends, splines, one coefficient for each free sample, or the best of slepian, fourier and b-spline"},
		{"basis.coefficients", "20", "1 to 65536", "as many as band and span carry", "per quadrature; refused for family samples"},
		{"basis.degree", "3", "1 to 5", "3", "of the splines; other families have none"},
		{"error[].detuning", `"q1"`, "a text in quotes", "another of the eight", "a site: H += 2 pi f Z/2"},
		{"error[].amplitude", `"q1 drive"`, "a text in quotes", "another of the eight", "a channel: what it delivers is scaled by 1 + size"},
		{"error[].operator", `"X"`, `"X", "Y" or "Z"`, "another of the eight", "H += 2 pi f X/2, and so for Y and Z"},
		{"error[].matrix", "[[0, [0, -0.5]], [[0, 0.5], 0]]", "a square matrix of at most 2 rows", "another of the eight", "H += 2 pi f M; Hermitian and traceless, rows of numbers or [re, im]"},
		{"error[].any", `"all"`, `"all"`, "another of the eight", "any static error: H += 2 pi f n.(X,Y,Z)/2 with a direction n that nobody knows"},
		{"error[].line", `"q1 drive"`, "a text in quotes", "another of the eight", "a channel: its line is not quite what the profile says, by one parameter"},
		{"error[].parameter", `"lowpass[0].corner"`, "a text in quotes", "required beside line", "which: lowpass[0].corner, tails[0].amplitude, tails[0].time, resonance[0].offset, .half_width, .depth, ac_coupling, allpass or delay, counted from 0"},
		{"error[].quadrature_angle", `"q1 drive"`, "a text in quotes", "another of the eight", "a channel: I and Q are not at right angles, u_I += -size u_Q"},
		{"error[].offset", `"q1 drive"`, "a text in quotes", "another of the eight", "a channel: a constant at the converter"},
		{"error[].quadrature", `"I"`, `"I" or "Q"`, "both; offsets as two errors, named with I and Q at the end", "of an amplitude or an offset: that quadrature alone"},
		{"error[].name", `"slow field"`, "a text in quotes", `"detuning", "amplitude", "X", "Y", "Z", "matrix", "any static error", "amplitude I", "offset I", "quadrature angle", or channel and parameter`, "of the error; each its own"},
		{"error[].size", `"3 MHz"`, size, `"3 MHz", or 7.5 % of the fastest drive's full scale where that is less; "3 %" for an amplitude; "1 MHz" or 2.5 % for any; known_to or "5 %" for a line; "0.1 %" of full scale for an offset; "1 deg" for an angle`, "how large it may be, for the refinement: f is the rotation frequency that the error causes; shares are 1 ppm to 50 %, angles up to 30 deg"},
		{"error[].weight", "1", "a number, 1e-06 to 1e+06", "1", "relative to the gate itself"},
		{"require.infidelity", "1e-4", "a number, 1e-12 to 1", "1e-4", "average gate infidelity for the stated ends, at most"},
		{"require.susceptibility", "1e-3", "a number, 1e-09 to 1", "1e-3", "the share of each held error that may survive the gate"},
		{"require.margin[].error", `"detuning"`, `"detuning", "amplitude", "X", "Y"`, must, "detuning, amplitude, X, Y, Z or the name of an [[error]] (not of kind any)"},
		{"require.margin[].size", `"0.3 MHz"`, size, must, "up to this size of the error, either sign, the infidelity above must hold; a share for an amplitude, a line or an offset, 1 ppm to 50 %; an angle for an angle"},
	}
}

const briefFoot = `A brief without [[error]] and without hold is held against detuning, amplitude and any static error. There may be
16 [[error]] and 16 [[require.margin]]. Margins are searched up to 50 MHz, 50 % and 50 degrees; of static errors no
farther than twice the largest full scale, unless a margin beyond is required.
`

const pulseHead = `A pulse is a folder:

  pulse.toml        the record, explained below
  CHANNEL.npy       the codes to play: NPY, int16, shape (samples, 2): I and Q; of a baseband channel (samples, 1)
  CHANNEL.csv       the same as text (RFC 4180): after the header time_ns,code_i,code_q,share_i,share_q one line a
                    sample with its leading edge, codes, shares of full scale; every number reads back exactly
                    (time_ns,code,share of a baseband channel)
  CHANNEL.int16     the same as raw bytes: int16, low byte first, I0 Q0 I1 Q1 ..., nothing else; codes of fewer bits are
                    not shifted up
  CHANNEL-exact.npy the samples before rounding: NPY, float64, shares of full scale
  CHANNEL-arrives.npy
                    what the codes become at the device: NPY, float64, shape (rows, 3): ns after the trigger, then I and
                    Q as Rabi frequency in MHz (u_I and u_Q over 2 pi; of a baseband channel u and zero); 8 rows a
                    sample, from the start of the window to one span after its end
  inputs/           copies of profile.toml, device.toml and brief.toml
  datasheet.html    for people

Numbers in pulse.toml are plain, with the unit in the key's name or below; matrices are rows of [re, im]. The program
writes it, and replay refuses a folder of which a file was changed. [model] and the waveform files are all that is
needed to recompute the gate:

  dU/dt = -i H U,  H = static + sum over channels of full_scale (u_I operators[0] + u_Q operators[1]),
  u_I + i u_Q: what y, held for one period a sample, becomes behind
  G(s) = e^(-s delay) (direct + sum residue/(s - pole)^power),
  y = x/|x| f(|x|) with the compression table f, else y = x, and x = (I + i Q) / 2^(bits-1)`

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
		{"pulse.phase[].angle_deg", "90.0", "", "the brief asks for no phases", "the same gate with its axis turned about Z by this, in files of its own"},
		{"pulse.phase[].files", `["q1-drive-turned-90deg.npy"]`, "", "", "in every format, of each quadrature channel; the codes are the base ones turned in phase by this angle, with the sense in which Q drives, and rounded again"},
		{"pulse.phase[].infidelity", "4.9e-9", "0 to 1", "", "of these codes, to the gate turned likewise, for the stated ends"},
		{"pulse.phase[].limits_kept", "true", "", "", "whether these codes are within every limit"},
		{"pulse.delay[].channel", `"q1 flux"`, "", "no channel has to wait", "a channel that has to start later than the trigger, to arrive with the others"},
		{"pulse.delay[].samples", "5", "", "", "by how many sample periods; delay_ns of [model] counts them in"},
		{"basis.family", `"slepian"`, "", "", "slepian, fourier, tapered-fourier, b-spline or samples: samples = basis times coefficients, of the first channel"},
		{"basis.coefficients_per_quadrature", "20", "", "", "their number"},
		{"basis.band", `"100 MHz"`, "", "no limit", "either side of the carrier"},
		{"basis.i", "[0.1, -0.2]", "", "", "the coefficients of I, " + share},
		{"basis.q", "[0.1, -0.2]", "", "", "the coefficients of Q, " + share},
		{"basis.channel[].name", `"q1 flux"`, "", "one channel plays", "a further channel"},
		{"basis.channel[].family", `"slepian"`, "", "", "of its shapes"},
		{"basis.channel[].i", "[0.1, -0.2]", "", "", "its coefficients"},
		{"basis.channel[].q", "[0.1, -0.2]", "", "a baseband channel has none", "those of its Q"},
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
		{"require.margin[].size_rad_per_ns", "0.0019", "", "another size stands there", "2 pi times the brief's frequency"},
		{"require.margin[].size_share", "0.01", "", "another size stands there", "of an amplitude, a line's parameter or an offset"},
		{"require.margin[].size_rad", "0.0175", "rad", "another size stands there", "of a quadrature angle"},
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
		{"model.channel[].kind", `"quadrature"`, "", "", "two converters into one mixer; or \"baseband\": one converter, one operator, u = Re u"},
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
		{"model.channel[].envelope", `"box"`, "", "max_share limits the length of (I, Q)", "max_share limits I and Q apart"},
		{"model.channel[].rms_share", "0.6", share, "no limit", "limit of the root of sum |y|^2 / max(samples, rms_samples), y what compression leaves of x"},
		{"model.channel[].rms_samples", "1000", "", "those of the span", "of a repetition period"},
		{"model.channel[].out_of_band_share", "0.001", share, "no limit", "limit of the root mean square over the span of y's part outside band_ghz"},
		{"model.channel[].band_ghz", "0.1", "GHz", "not limited", "either side of the carrier, or of zero"},
		{"model.channel[].ring_out_tail_share", "0.0005", share, "ring_out_share", "what limits instead from ring_out_fast_ns on"},
		{"model.channel[].ring_out_fast_ns", "8.0", "ns", "ring_out_share limits for ever", "after the span"},
		{"model.channel[].zero_mean", "true", "", "false", "the samples y must sum to zero, as nearly as codes can"},
		{"model.channel[].compression", "[[0.0, 0.0], [0.5, 0.49], [1.0, 0.95]]", share, "y = x", "share at the converter, share of the rate reached: y = x/|x| f(|x|) enters the line, f straight between the points"},
		{"model.channel[].shift_rad_per_ns", "7.5e-5", "rad/ns", "none", "H += shift |u_I + i u_Q|^2 shift_operator, u in shares as it arrives"},
		{"model.channel[].shift_operator", "[[[0.5, 0.0], [0.0, 0.0]], [[0.0, 0.0], [-0.5, 0.0]]]", "", "no shift", "what it multiplies"},
		{"model.error[].name", `"detuning"`, "", "", "every held error, and detuning, amplitude, X, Y, Z"},
		{"model.error[].held", "false", "", "", "whether the pulse is held against it"},
		{"model.error[].kind", `"static"`, "", "", `"static": H += lambda operator; "amplitude": u of the channels times 1 + lambda; "any": every traceless operator; "skew": u_I += -lambda u_Q of the channels; "line": u += lambda full_scale times what x becomes behind a line`},
		{"model.error[].operator", "[[[0.5, 0.0], [0.0, 0.0]], [[0.0, 0.0], [-0.5, 0.0]]]", "", "not of kind static", "for lambda in rad/ns"},
		{"model.error[].channels", `["q1 drive"]`, "", "all channels", "of kind amplitude"},
		{"model.error[].quadrature", `"I"`, "", "both", "of kind amplitude: the one that is scaled"},
		{"model.error[].channel", `"q1 drive"`, "", "not of kind line", "whose line is not quite what it should be"},
		{"model.error[].direct", "[0.0, 0.0]", "", "not of kind line", "these four: the line through which lambda full_scale x adds to u, with the delay of the channel"},
		{"model.error[].poles_per_ns", "[[-0.033, 0.0]]", "1/ns", "not of kind line", "of that line, [re, im]"},
		{"model.error[].powers", "[1]", "", "not of kind line", "of (s - pole), one for each pole"},
		{"model.error[].residues", "[[0.0005, 0.0]]", "1/ns to the power", "not of kind line", "one for each pole, [re, im]"},
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
