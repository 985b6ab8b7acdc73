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

  -pair   an example of two coupled spins instead: rack-b-pair.toml, skerry-pair.toml and sqrt-iswap.toml
  -json   print one JSON object instead of text ('help json')

Exit status: 0 done, 2 bad input.
`
	case "check":
		return `Reads each FILE strictly, tells by its tables whether it is a profile, a device or a brief, and says what it means:
  profile   sign of the mixer and frame, limits, what the line does to a step, the window at the device, the
            coefficients that each span carries and what they are enough for, cautions
  device    which energy |0> has, what drives it, what relaxation costs; of several sites also what couples them, and
            what of that turns in their frames
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
		return `Writes the convention card of a bench into a folder: three short sequences for a channel with a mixer that
DEVICE names, and card.txt, a table of the populations that they give through the line of PROFILE for each of 16 ways
in which signs can be wrong: mixing, cables of I and Q, energy of |0>, side of the carrier. One run on the bench tells
which group of rows it is; what no population can tell stands in one group, and the card says so. Nothing is designed.
The card is that of one site by itself; of a device of several it is refused where what couples them, or crosstalk,
would move a population by more than 0.02.

  -out FOLDER     the folder to make; without it card, in the working folder
  -force          when the folder exists: rename the old one to FOLDER.before-N (without -force it is refused)
  -channel NAME   the drive whose card it is; without it the first of a device of one site, or the only one
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
		{"device", deviceHead, deviceKeys(), deviceFoot},
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

const deviceHead = `A device file is a TOML file that says what is driven: 1 to 6 sites, spins or ladders of levels, of at most 64 levels in
their product; what couples them, up to 64 couplings; and the channels that act on them, 1 to 16 drives and biases, each
channel once, with what they do to sites that they are not meant for.

` + units

func deviceKeys() []key {
	return []key{
		{"format", "1", "1, and nothing else", must, "of this file"},
		{"name", `"Skerry"`, "a text in quotes", must, "of the device, for people"},
		{"site[].name", `"q1"`, "a text in quotes", must, "by which all else names the site"},
		{"site[].kind", `"spin"`, `"spin" or "ladder"`, `"spin" of 2 levels, "ladder" of more`, "what X, Y and Z mean: Pauli matrices on 2 levels; twice the operators Sx, Sy, Sz on a spin of more, whose level 0 is m = s; and a + a', i(a' - a) and -2n on an anharmonic ladder, which stands on |0>"},
		{"site[].levels", "2", "a whole number, 2 to 16", "2", "how many the model keeps"},
		{"site[].code", "[0, 1]", "an array of at most 2 numbers", "[0, 1]", "the two levels of the code space, the first of them |0>"},
		{"site[].zero", `"lower"`, `"lower" or "upper"`, `"lower"`, "which of the two energies |0> has, the +1 state of Z; with the profile's mixing it settles whether Q turns about +Y or -Y"},
		{"site[].frequency", `"5.1 GHz"`, "1 Hz to 10000 GHz", "not stated", "of the transition; of one site for messages only, of several it says how couplings and crosstalk turn, see below"},
		{"site[].detuning", `"0 Hz"`, "-1 GHz to 1 GHz", "0 Hz", "of the transition from the frame of the drive, positive above it, constant: H0 = 2 pi f Z/2 when |0> has the upper energy, -2 pi f Z/2 when it has the lower"},
		{"site[].anharmonicity", `"-220 MHz"`, "-1 GHz to 1 GHz", "must be given for a ladder of more than 2 levels", "of a ladder: by how much the 1-2 transition lies above the 0-1 one; of no effect for 2 levels"},
		{"site[].higher", `["3 MHz"]`, "an array of at most 13 texts", "none", "of a ladder: level n lies by C(n,3) times the first, C(n,4) times the second, ... of these higher than the anharmonicity alone puts it"},
		{"site[].quadratic", `"1 MHz"`, "-1 GHz to 1 GHz", "0 Hz", "of a spin of more than 2 levels: H0 += 2 pi f (Sz^2 - s(s+1)/3)"},
		{"site[].T1", `"60 us"`, "1 ns to 1e+06 s", "not stated", "relaxation; for the cost of decoherence, T/6 (1/T1 + 2/T2)"},
		{"site[].T2", `"40 us"`, "1 ns to 1e+06 s", "not stated", "coherence; at most 2 T1"},
		{"drive[].site", `"q1"`, "a text in quotes", must, "which site is driven"},
		{"drive[].channel", `"q1 drive"`, "a text in quotes", must, "by which quadrature channel of the hardware profile"},
		{"bias[].site", `"q1"`, "a text in quotes", must, "which site is turned: H += u O/2 with u what arrives, in rad/ns"},
		{"bias[].channel", `"q1 flux"`, "a text in quotes", must, "by which baseband channel of the hardware profile; its own for each"},
		{"bias[].axis", `"Z"`, `"X", "Y" or "Z"`, `"Z"`, "the operator O"},
		{"bias[].polynomial", "[1, 0.2]", "an array of at most 8 numbers", "[1]", "c1, c2, ...: full scale times c1 s + c2 s^2 + ... stands in the place of u, s the share of full scale that arrives; -10 to 10 each"},
		{"bias[].loop.highest", `"5.2 GHz"`, "1 MHz to 1000 GHz", must, "the bias is the flux through a loop of two junctions, which tunes the transition, about Z: this is its frequency without flux. At F flux quanta it is so much times (cos^2(pi F) + asymmetry^2 sin^2(pi F))^(1/4), and its change from rest stands in the place of u"},
		{"bias[].loop.bias", "0.23", "a number, -1 to 1", "0", "F at rest, in flux quanta"},
		{"bias[].loop.full_scale", "0.15", "a number, -1 to 1", must, "what full scale adds to F"},
		{"bias[].loop.asymmetry", "0.1", "a number, 0 to 1", "0", "of the junctions, their difference over their sum; at least 0.01 where F comes near half a quantum"},
		{"coupling[].on", `{ q1 = "Z", q2 = "Z" }`, "a table", "kind and between", "X, Y or Z of two sites or more: H += 2 pi f P/2 with P their product"},
		{"coupling[].kind", `"exchange"`, `"exchange", "heisenberg", "dipolar" or "dispersive"`, "on", "of two sites, with J = 2 pi f: exchange J (a b' + a' b), of spins J (X X + Y Y)/2; heisenberg J S.S, S = (X, Y, Z)/2; dipolar J (3 Sz Sz - S.S); dispersive J n n, n the number of the level above the ground state (a cross-Kerr shift)"},
		{"coupling[].between", `["q1", "q2"]`, "an array of at most 2 texts in quotes", "required beside kind", "the two sites"},
		{"coupling[].strength", `"5 MHz"`, "-1 GHz to 1 GHz", must, "f"},
		{"coupling[].rotating_wave", "true", "true or false", "false", "leave out of the model whatever of it turns in the frames of the sites, which then state their frequencies; the record keeps what is left out, and replay says what that costs"},
		{"crosstalk[].channel", `"q1 drive"`, "a text in quotes", must, "a channel of a [[drive]], or of a [[bias]] without polynomial and loop"},
		{"crosstalk[].site", `"q2"`, "a text in quotes", must, "another site, which it reaches too"},
		{"crosstalk[].share", `"3 %"`, "-1000 % to 1000 %", must, "how much of it: there share e^(i phase) u stands in the place of u"},
		{"crosstalk[].phase", `"40 deg"`, "-360 deg to 360 deg", "0 deg", "of that share; a bias has none"},
	}
}

const deviceFoot = `Sites that state no frequency are seen from frames that turn alike: couplings and crosstalk between them stand still, as
they are written. Sites that do are each seen from a frame of their own, which turns with its drive, at frequency less
detuning, from the start of the gate's window on. What couples sites of unlike frames turns in them, an exchange at the
difference, and so does crosstalk onto a site of another frame. A coupling needs the frequencies of all its sites, or of
none.
`

const briefHead = `A brief is a TOML file that says which gate is wanted, in what time, held against what, and what it must reach.

` + units

// oneSiteGates and twoSiteGates are the gates that have names.
const (
	oneSiteGates = `"X90", "-X90", "X180", "Y90", "-Y90", "Y180", "Z90", "Z180", "H", "S", "T" or "identity"`
	twoSiteGates = `"CNOT", "CZ", "SWAP", "iSWAP", "sqrt-iSWAP", "sqrt-SWAP" or "identity"`
)

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
		{"target.site", `"q1"`, "a text in quotes", "required, unless sites, gates, or from and to stand there", "of the device, on which the gate acts; all other sites are to be left alone"},
		{"target.sites", `["q1", "q2"]`, "an array of at most 6 texts in quotes", "site, gates, or from and to", "on which the gate acts, in its order: the first is the slowest in a matrix"},
		{"target.gate", `"X90"`, oneSiteGates, "another of the six", "the gate by its name; of two sites " + twoSiteGates + ", of more \"identity\". CNOT turns the second site when the first is |1>, iSWAP is exp(i pi/4 (XX + YY)), sqrt-iSWAP its root"},
		{"target.gates", `{ q1 = "X90", q2 = "identity" }`, "a table", "another of the six", "a gate of one site for each of several, which it names"},
		{"target.controlled", `"X90"`, oneSiteGates, "another of the six", "this gate on the last of sites when all others are |1>: of X90, Z180 and the like the rotation by that angle, with its phase, of H, S and T the matrices of these names"},
		{"target.axis", "[1, 0, 0]", "an array of at most 3 numbers", "another of the six", "of a rotation exp(-i angle/2 n.(X,Y,Z)) of one site; any length but 0"},
		{"target.angle", `"90 deg"`, "-720 deg to 720 deg", "required beside axis", "of that rotation"},
		{"target.matrix", "[[1, 0], [0, [0, 1]]]", "a square matrix of at most 2 rows", "another of the six", "unitary, on the code levels of the sites, 2^n rows for n of them; rows of numbers or [re, im]; the global phase has no meaning"},
		{"target.from", `"00"`, "a text in quotes", "another of the six", "states of all sites of the device that are to become those of to: a label of code states, a list of labels, \"GHZ\", \"W\", or 2^n numbers or [re, im] of length 1. Of several their span is to become that of the others, in whatever way"},
		{"target.to", `"11"`, "a text in quotes", "required beside from", "what they become, as many"},
		{"target.free_z", `"none"`, `"none", "before", "after" or "both"`, `"none"`, "where rotations about Z, of every site of the device, cost nothing, because phases are tracked in software: the design chooses them and the record names them; of gates"},
		{"target.up_to", `"local rotations"`, `"local rotations"`, "the gate itself is wanted", "every rotation of a single site, before and after, costs nothing: the design chooses them and the record names them; of gates on a device of two sites or more, without free_z"},
		{"basis.family", `"slepian"`, `"slepian", "fourier", "tapered", "b-spline", "samples" or "best"`, `"slepian"`, "of what the samples are made: band-limited sequences, sines, sines with soft ends, splines, one coefficient for each free sample, or the best of slepian, fourier and b-spline"},
		{"basis.coefficients", "20", "1 to 65536", "as many as band and span carry", "per quadrature; refused for family samples"},
		{"basis.degree", "3", "1 to 5", "3", "of the splines; other families have none"},
		{"error[].detuning", `"q1"`, "a text in quotes", "another of the eleven", "a site: H += 2 pi f Z/2"},
		{"error[].amplitude", `"q1 drive"`, "a text in quotes", "another of the eleven", "a channel: what it delivers is scaled by 1 + size"},
		{"error[].operator", `"X"`, `"X", "Y" or "Z"`, "another of the eleven", "H += 2 pi f X/2, and so for Y and Z, of one site"},
		{"error[].on", `{ q1 = "Z", q2 = "X" }`, "a table", "another of the eleven", "X, Y or Z of one site or more: H += 2 pi f P/2 with P their product"},
		{"error[].collective", `"Z"`, `"X", "Y" or "Z"`, "another of the eleven", "the same of every site: H += 2 pi f times the sum of Z/2 over all sites"},
		{"error[].matrix", "[[0, [0, -0.5]], [[0, 0.5], 0]]", "a square matrix of at most 64 rows", "another of the eleven", "H += 2 pi f M; Hermitian and traceless, of the whole device (of one site of more levels also 2 by 2), rows of numbers or [re, im]"},
		{"error[].any", `"all"`, "a text in quotes", "another of the eleven", "static errors of which nobody knows which: \"all\" of them, the \"one-body\" or the \"two-body\" ones (products over two sites), those \"on q1, q2\", or \"leakage\" (between the code space and other levels); H += 2 pi f times a sum of c P/2 with products P of X, Y and Z, the squares of all c together 1. Where a site has more levels, operators of the same norm stand for P/2"},
		{"error[].line", `"q1 drive"`, "a text in quotes", "another of the eleven", "a channel: its line is not quite what the profile says, by one parameter"},
		{"error[].parameter", `"lowpass[0].corner"`, "a text in quotes", "required beside line", "which: lowpass[0].corner, tails[0].amplitude, tails[0].time, resonance[0].offset, .half_width, .depth, ac_coupling, allpass or delay, counted from 0"},
		{"error[].quadrature_angle", `"q1 drive"`, "a text in quotes", "another of the eleven", "a channel: I and Q are not at right angles, u_I += -size u_Q"},
		{"error[].offset", `"q1 drive"`, "a text in quotes", "another of the eleven", "a channel: a constant at the converter"},
		{"error[].crosstalk", `"q1 drive"`, "a text in quotes", "another of the eleven", "a channel: size of it reaches another site too, one whose frame turns as its own"},
		{"error[].quadrature", `"I"`, `"I" or "Q"`, "both; offsets as two errors, named with I and Q at the end", "of an amplitude or an offset: that quadrature alone"},
		{"error[].site", `"q2"`, "a text in quotes", "required beside crosstalk; of an operator the target's, or the device's, only one", "of crosstalk the site that is reached, of an operator its own"},
		{"error[].except", `[{ q1 = "Z" }]`, "a list of tables", "none", "of any: the products that it leaves out, of sites of 2 levels"},
		{"error[].rates", `"rates.csv"`, "a text in quotes", "all operators alike", "of any, for sites of 2 levels: learned Pauli rates, a CSV file beside the brief with the header pauli,rate and rows such as IZ,2.5e-4, a letter I, X, Y or Z a site; or pauli,sigma with standard deviations, of which the squares are rates. An operator weighs as the root of its rate; those of the class without one are left out, rows outside the class are passed over"},
		{"error[].name", `"slow field"`, "a text in quotes", `"detuning", "amplitude", "X", "X on q2", "ZX on q1, q2", "collective Z", "matrix", "any static error", "any one-body error", "any two-body error", "any error on q1, q2", "any leakage", "any learned error", "amplitude I", "offset I", "quadrature angle", "q1 drive on q2", or channel and parameter`, "of the error; each its own"},
		{"error[].size", `"3 MHz"`, size, `"3 MHz", or 7.5 % of the fastest drive's full scale where that is less; "3 %" for an amplitude; "1 MHz" or 2.5 % for any; known_to or "5 %" for a line; "0.1 %" of full scale for an offset; "1 %" for crosstalk; "1 deg" for an angle`, "how large it may be, for the refinement: f is the rotation frequency that the error causes; shares are 1 ppm to 50 %, angles up to 30 deg"},
		{"error[].weight", "1", "a number, 1e-06 to 1e+06", "1", "relative to the gate itself"},
		{"error[].order", "1", "a whole number, 1 to 2", "1", "how far the error is cancelled: 2 asks for its square too; of at most 16 operators"},
		{"error[].spread", `"average"`, `"average" or "worst"`, "the error is cancelled", "lower the exact infidelity over sizes of the error instead: its average over a normal distribution of which size is the standard deviation, or the worst of -size, 0 and size; not of any"},
		{"error[].values", `["-1 MHz", "1 MHz"]`, "an array of at most 32 texts", "the sizes that spread names", "of a spread: over these sizes, of either sign"},
		{"error[].noise.form", `"lorentzian"`, `"white", "power-law", "lorentzian", "table" or "trace"`, must, "the error fluctuates, and what that adds to the infidelity is lowered in the place of size; of an amplitude or an error of one operator. White and power-law noise lie between low and high; a table has densities, a trace values in time"},
		{"error[].noise.sigma", `"50 kHz"`, "1e-06 Hz to 100 GHz", "required but for table and trace", "root mean square over the whole band: a rotation frequency; of an amplitude a share, up to 100 %"},
		{"error[].noise.exponent", "1", "a number, -4 to 4", "required beside power-law", "a: the density falls as 1/f^a"},
		{"error[].noise.low", `"1 kHz"`, "1e-09 Hz to 1000 GHz", "required beside power-law; of white noise 0 Hz", "where the band begins"},
		{"error[].noise.high", `"1 MHz"`, "1e-09 Hz to 1000 GHz", "required beside white and power-law", "where it ends"},
		{"error[].noise.correlation_time", `"2 us"`, "1 ps to 1e+06 s", "required beside lorentzian", "the correlations fall as exp(-|t|/T)"},
		{"error[].noise.file", `"noise.csv"`, "a text in quotes", "required beside table and trace", "a CSV file beside the brief; its header is frequency_hz,psd_hz2_per_hz or time_s,value_hz, of an amplitude frequency_hz,psd_per_hz or time_s,value"},
		{"error[].noise.sided", `"one"`, `"one" or "two"`, "required beside table", "of the densities: over positive frequencies alone, or half as large over both signs"},
		{"error[].noise.segment", "64", "a whole number, 32 to 524288", "from the length", "of a trace: samples of the pieces of which the spectra are averaged, a power of two"},
		{"require.infidelity", "1e-4", "a number, 1e-12 to 1", "1e-4", "average gate infidelity for the stated ends, at most; of states the share that is lost of them"},
		{"require.susceptibility", "1e-3", "a number, 1e-09 to 1", "1e-3", "the share of each held error that may survive the gate"},
		{"require.margin[].error", `"detuning"`, `"detuning", "amplitude", "X", "Y"`, must, "the name of an [[error]] that is not of any; of one spin also detuning, amplitude, X, Y or Z"},
		{"require.margin[].size", `"0.3 MHz"`, size, must, "up to this size of the error, either sign, the infidelity above must hold; a share for an amplitude, a line, an offset or crosstalk, 1 ppm to 50 %; an angle for an angle"},
	}
}

const briefFoot = `A brief without [[error]] and without hold is held against detuning, amplitude and any static error, on a device of
several sites against amplitude and any one-body error. There may be 16 [[error]] and 16 [[require.margin]]. Margins are
searched up to 50 MHz, 50 % and 50 degrees; of static errors no farther than twice the largest full scale, unless a
margin beyond is required.
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
  inputs/           copies of profile.toml, device.toml and brief.toml, and of the files of rates and noise that the
                    brief names
  datasheet.html    for people

Numbers in pulse.toml are plain, with the unit in the key's name or below; matrices are rows of [re, im]. The program
writes it, and replay refuses a folder of which a file was changed. [model] and the waveform files are all that is
needed to recompute the gate:

  dU/dt = -i H U,  H = static + sum over channels of full_scale (u_I operators[0] + u_Q operators[1])
                       + sum over rotating of cos(w t) cosine + sin(w t) sine,  t = 0 at window_start_ns,
  u_I + i u_Q: what y, held for one period a sample, becomes behind
  G(s) = e^(-s delay) (direct + sum residue/(s - pole)^power),
  y = x/|x| f(|x|) with the compression table f, else y = x, and x = (I + i Q) / 2^(bits-1)`

func pulseKeys() []key {
	const share = "share of full scale"
	return []key{
		{"format", "1", "", "", "of this file"},
		{"pulse.name", `"x90-any"`, "", "", "the brief's"},
		{"pulse.target", `"X90 on q1"`, "", "", "the gate, or the states, in words"},
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
		{"search.solver", "\"Gauss-Newton\"", "", "", "or \"quasi-Newton\", where residuals are so many that their derivatives cost more than they save"},
		{"search.refined", "true", "", "", "whether finite errors were lowered afterwards"},
		{"search.sum_of_squared_residuals", "1e-24", "", "", "what is left of them, before rounding"},
		{"search.infidelity_before_rounding", "1e-24", "", "", "for the stated ends"},
		{"require.infidelity", "1e-4", "", "", "the brief's"},
		{"require.susceptibility", "1e-3", "", "", "the brief's"},
		{"require.margin[].error", `"detuning"`, "", "", "the brief's"},
		{"require.margin[].size_rad_per_ns", "0.0019", "", "another size stands there", "2 pi times the brief's frequency"},
		{"require.margin[].size_share", "0.01", "", "another size stands there", "of an amplitude, a line's parameter or an offset"},
		{"require.margin[].size_rad", "0.0175", "rad", "another size stands there", "of a quadrature angle"},
		{"decoherence[].site", `"q1"`, "", "", "that states times, one [[decoherence]] for each"},
		{"decoherence[].t1_ns", "60000.0", "", "not stated", "the device's"},
		{"decoherence[].t2_ns", "40000.0", "", "not stated", "the device's"},
		{"provenance.program", `"holdfast"`, "", "", "what wrote the folder"},
		{"provenance.version", `"` + version + `"`, "", "", "of the program"},
		{"provenance.instrument", `"rack B, position 3"`, "", "", "the profile's name"},
		{"provenance.device", `"Skerry"`, "", "", "the device's name"},
		{"provenance.site", `"q1"`, "", "", "of the gate, or its sites"},
		{"provenance.channel", `"q1 drive"`, "", "", "the first that plays"},
		{"claim.infidelity", "4.7e-9", "0 to 1", "", "of the rounded codes, for the stated ends"},
		{"claim.infidelity_other_ends", "1.2e-5", "0 to 1", "", "of the same codes for the other ends"},
		{"claim.leakage", "0.0", "0 to 1", "", "out of the code space, for the stated ends"},
		{"claim.tail_angle_rad", "0.0087", "rad", "the device is more than one spin", "what the ring-out still turns after the window"},
		{"model.sample_period_ns", "1.0", "ns", "", "each sample is held that long"},
		{"model.samples", "112", "", "", "the span, guards included"},
		{"model.bits", "14", "", "", "x = code / 2^(bits-1)"},
		{"model.ends", `"settled"`, "", "", "or \"window\": which gate the figures are of"},
		{"model.window_start_ns", "3.2", "ns", "", "when the device's window begins; it lasts samples * sample_period_ns"},
		{"model.dim", "2", "", "", "of the device's space"},
		{"model.code_space", "[0, 1]", "", "", "basis states of the gate"},
		{"model.static_rad_per_ns", "[[[0.0, 0.0], [0.0, 0.0]], [[0.0, 0.0], [0.0, 0.0]]]", "rad/ns", "", "the Hamiltonian without drive and errors"},
		{"model.target", "[[[0.7, 0.0], [0.0, -0.7]], [[0.0, -0.7], [0.7, 0.0]]]", "", "states become others", "the gate that is wanted, on the code space"},
		{"model.sites", "[2, 2]", "", "one site", "levels of each site; the first is the slowest in a basis state's number"},
		{"model.from", "[[[1.0, 0.0], [0.0, 0.0], [0.0, 0.0], [0.0, 0.0]]]", "", "a gate is wanted", "states on the code space, the span of which is to become that of to"},
		{"model.to", "[[[0.0, 0.0], [0.0, 0.0], [0.0, 0.0], [1.0, 0.0]]]", "", "a gate is wanted", "as many others"},
		{"model.free_z_before", "[]", "rad", "", "rotations about Z that cost nothing, before the gate, of each site; empty when there are none"},
		{"model.free_z_after", "[]", "rad", "", "the same after it"},
		{"model.local_before", "[[[[1.0, 0.0], [0.0, 0.0]], [[0.0, 0.0], [1.0, 0.0]]]]", "", "not up to local rotations", "rotations of each site that cost nothing, before the gate: the gate M counts as (product of local_after) M (product of local_before)"},
		{"model.local_after", "[[[[1.0, 0.0], [0.0, 0.0]], [[0.0, 0.0], [1.0, 0.0]]]]", "", "not up to local rotations", "the same after it"},
		{"model.rotating[].frequency_rad_per_ns", "0.63", "rad/ns", "nothing turns by itself", "w: H += cos(w t) cosine + sin(w t) sine, t from window_start_ns on, before it negative"},
		{"model.rotating[].cosine", "[[[0.0, 0.0], [0.0157, 0.0]], [[0.0157, 0.0], [0.0, 0.0]]]", "rad/ns", "", "of the whole device"},
		{"model.rotating[].sine", "[[[0.0, 0.0], [0.0, 0.0157]], [[0.0, -0.0157], [0.0, 0.0]]]", "rad/ns", "", "the same"},
		{"model.dropped[].frequency_rad_per_ns", "63.8", "rad/ns", "nothing is left out", "w of what turns and is left out of the model, for rotating_wave = true"},
		{"model.dropped[].cosine", "[[[0.0, 0.0], [0.0157, 0.0]], [[0.0157, 0.0], [0.0, 0.0]]]", "rad/ns", "", "as in rotating"},
		{"model.dropped[].sine", "[[[0.0, 0.0], [0.0, 0.0157]], [[0.0, -0.0157], [0.0, 0.0]]]", "rad/ns", "", "as in rotating"},
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
		{"model.channel[].map_polynomial", "[1.0, 0.2]", "", "u itself", "of a bias: full_scale (c1 s + c2 s^2 + ...) in the place of u, s = u/full_scale as it arrives"},
		{"model.channel[].map_loop", "[32.67, 0.23, 0.15, 0.1]", "rad/ns, flux quanta", "u itself", "of a bias by flux: highest w, bias, full scale and asymmetry a; w (g(bias + full scale s) - g(bias)) in the place of u, g(F) = (cos^2(pi F) + a^2 sin^2(pi F))^(1/4)"},
		{"model.channel[].path[].frequency_rad_per_ns", "0.63", "rad/ns", "no crosstalk turns", "w: u e^(-i w t), t from window_start_ns on, drives these operators too"},
		{"model.channel[].path[].operators", "[[[[0.0, 0.0], [0.015, 0.0]], [[0.015, 0.0], [0.0, 0.0]]]]", "", "", "what its real and its imaginary part multiply"},
		{"model.error[].name", `"detuning"`, "", "", "every held error, and of one spin detuning, amplitude, X, Y, Z"},
		{"model.error[].held", "false", "", "", "whether the pulse is held against it"},
		{"model.error[].kind", `"static"`, "", "", `"static": H += lambda operator; "amplitude": u of the channels times 1 + lambda; "any": H += lambda times a sum of c weight operator, the squares of all c together 1; "skew": u_I += -lambda u_Q of the channels; "line": u += lambda full_scale times what x becomes behind a line; "crosstalk": lambda u of the channel drives operators`},
		{"model.error[].operator", "[[[0.5, 0.0], [0.0, 0.0]], [[0.0, 0.0], [-0.5, 0.0]]]", "", "not of kind static", "for lambda in rad/ns"},
		{"model.error[].channels", `["q1 drive"]`, "", "all channels", "of kind amplitude"},
		{"model.error[].quadrature", `"I"`, "", "both", "of kind amplitude: the one that is scaled"},
		{"model.error[].channel", `"q1 drive"`, "", "not of kind line or crosstalk", "whose line is not quite what it should be, or which reaches another site"},
		{"model.error[].direct", "[0.0, 0.0]", "", "not of kind line", "these four: the line through which lambda full_scale x adds to u, with the delay of the channel"},
		{"model.error[].poles_per_ns", "[[-0.033, 0.0]]", "1/ns", "not of kind line", "of that line, [re, im]"},
		{"model.error[].powers", "[1]", "", "not of kind line", "of (s - pole), one for each pole"},
		{"model.error[].residues", "[[0.0005, 0.0]]", "1/ns to the power", "not of kind line", "one for each pole, [re, im]"},
		{"model.error[].operators", "[[[[0.5, 0.0], [0.0, 0.0]], [[0.0, 0.0], [-0.5, 0.0]]]]", "", "of kind any every traceless operator, sqrt(dim)/2 the norm of each; not of other kinds", "of kind any for lambda in rad/ns; of kind crosstalk what u_I and u_Q multiply"},
		{"model.error[].names", `["ZX"]`, "", "as operators", "of kind any: a letter a site, 1 for none, or in words"},
		{"model.error[].weights", "[1.0]", "", "as operators", "of kind any, root mean square 1"},
		{"model.error[].leak", "true", "", "false", "the operators couple the code space to other levels, and that is what is not to survive"},
		{"model.error[].leak_susceptibility", "2.1e-3", "", "no levels lie outside the code space", "the share of the error that leads out of the code space"},
		{"model.error[].order", "2", "", "1", "up to which power the error is cancelled"},
		{"model.error[].spread", `"average"`, "", "the error is cancelled", "or \"worst\": what was lowered over spread_values"},
		{"model.error[].spread_values", "[-0.0063, 0.0063]", "as lambda", "no spread", "sizes of the error"},
		{"model.error[].spread_shares", "[0.5, 0.5]", "", "no spread", "their weights; of the worst all alike"},
		{"model.error[].spread_infidelity", "2.1e-6", "0 to 1", "no spread", "the average over them, or the worst, by the rounded codes"},
		{"model.error[].noise_frequencies_rad_per_ns", "[0.0, 0.01]", "rad/ns", "the error does not fluctuate", "nodes of a sum over its spectrum"},
		{"model.error[].noise_weights", "[1e-9, 2e-9]", "lambda squared", "the error does not fluctuate", "their weights"},
		{"model.error[].noise_infidelity", "3.4e-7", "0 to 1", "the error does not fluctuate", "what the noise adds to the infidelity, to first order in its spectrum"},
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
