package main

import (
	"strings"
)

const jsonHead = `With -json a verb prints one JSON object to stdout instead of text; progress and errors still go to stderr, and the exit
status is the same. A verb that ends with status 2 prints no object (check does, and says in it what is wrong).

Keys come in a fixed order and carry their unit: ns, mhz, ghz (cyclic), rad, deg, v, samples; a share is a share of full
scale or a plain ratio. Numbers have as many digits as reading them back takes; one that is not stated, or not finite
(a limit that is not there, a margin without end), is null. Lists are never null. [] after a key marks a list.

"format" is 1: it changes when a key goes or changes its meaning. Keys may be added without that.`

// A jsonKey is one key of what a verb prints.
type jsonKey struct{ path, says string }

// A jsonVerb lists the keys of what one verb prints, or two.
type jsonVerb struct {
	verbs string
	keys  []jsonKey
}

func jsonKeys() []jsonVerb {
	format := jsonKey{"format", "1"}
	return []jsonVerb{
		{"start", []jsonKey{
			format,
			{"folder", "that was made"},
			{"files[]", "in it"},
		}},
		{"check", []jsonKey{
			format,
			{"files[].file", "as it was named; one entry for each, in that order"},
			{"files[].kind", "profile, device or brief; absent when it cannot be told"},
			{"files[].error", "the sentence on stderr; absent when the file is in order"},
			{"files[].profile.name", "of the instrument; profile stands there for a profile"},
			{"files[].profile.sample_period_ns", "each sample is held that long"},
			{"files[].profile.resolution_bit", "of a converter"},
			{"files[].profile.block_samples", "lengths are multiples of it"},
			{"files[].profile.shortest_samples", "the shortest waveform"},
			{"files[].profile.longest_samples", "the longest waveform"},
			{"files[].profile.channels[].name", "of the channel"},
			{"files[].profile.channels[].kind", "of the channel"},
			{"files[].profile.channels[].mixing", "what leaves the mixer; empty without one"},
			{"files[].profile.channels[].carrier_ghz", "of the mixer"},
			{"files[].profile.channels[].full_scale_mhz", "steady Rabi frequency at full code"},
			{"files[].profile.channels[].full_scale_level_v", "at the connector"},
			{"files[].profile.channels[].envelope", "disc or box; empty for baseband"},
			{"files[].profile.channels[].amplitude_limit_share", "of the length of (I, Q), or of I and Q apart"},
			{"files[].profile.channels[].slew_limit_share_per_sample", "in I and in Q"},
			{"files[].profile.channels[].rms_limit_share", "over the span"},
			{"files[].profile.channels[].rms_period_ns", "over this time instead, where it is longer"},
			{"files[].profile.channels[].band_mhz", "either side of the carrier"},
			{"files[].profile.channels[].out_of_band_share", "rms over the span"},
			{"files[].profile.channels[].zero_mean", "the samples of a span sum to zero"},
			{"files[].profile.channels[].guard_lead_samples", "held at zero before"},
			{"files[].profile.channels[].guard_trail_samples", "held at zero after"},
			{"files[].profile.channels[].ring_out_limit_share", "at every instant after the span"},
			{"files[].profile.channels[].ring_out_fast_ns", "its first part"},
			{"files[].profile.channels[].ring_out_tail_share", "after that part"},
			{"files[].profile.channels[].compression_shares[][]", "pairs: at the converter, reached"},
			{"files[].profile.channels[].shift_mhz", "of the transition at steady full scale"},
			{"files[].profile.channels[].delayed_samples", "for the sake of slower channels"},
			{"files[].profile.channels[].window_start_ns", "at the device, after the trigger"},
			{"files[].profile.channels[].line[]", "a sentence for each section"},
			{"files[].profile.channels[].line_steady_gain", "for a steady drive"},
			{"files[].profile.channels[].line_corner_mhz", "where 3.01 dB are lost"},
			{"files[].profile.channels[].line_transition_time_ns", "10-90 % of a step"},
			{"files[].profile.channels[].line_overshoot_share", "of a step"},
			{"files[].profile.channels[].line_settling_1_percent_ns", "of a step"},
			{"files[].profile.channels[].line_settling_0_1_percent_ns", "of a step"},
			{"files[].profile.channels[].line_group_delay_ns", "beyond the pure delay"},
			{"files[].profile.channels[].spans[].span_ns", "a span"},
			{"files[].profile.channels[].spans[].samples", "in it"},
			{"files[].profile.channels[].spans[].coefficients_per_quadrature", "that it carries"},
			{"files[].profile.channels[].spans[].equations", "for which they are enough"},
			{"files[].profile.channels[].spans[].enough_for", "the same in words"},
			{"files[].profile.channels[].cautions[]", "to be heeded before a cable is connected"},
			{"files[].device.name", "of the device; device stands there for a device"},
			{"files[].device.sites[].name", "of the site"},
			{"files[].device.sites[].levels", "their number"},
			{"files[].device.sites[].zero", "upper or lower: which energy |0> has"},
			{"files[].device.sites[].frequency_ghz", "of the transition"},
			{"files[].device.sites[].detuning_mhz", "constant: H0 = 2 pi f Z/2"},
			{"files[].device.sites[].t1_ns", "relaxation"},
			{"files[].device.sites[].t2_ns", "coherence"},
			{"files[].device.sites[].channels[]", "that drive or bias it"},
			{"files[].device.sites[].kind", "spin or ladder; this and the next four of a site of more than two levels"},
			{"files[].device.sites[].code_levels[]", "|0> and |1>"},
			{"files[].device.sites[].anharmonicity_mhz", "of a ladder"},
			{"files[].device.sites[].higher_mhz[]", "of a ladder; absent when there are none"},
			{"files[].device.sites[].quadratic_mhz", "of a spin"},
			{"files[].device.levels", "in the product of the sites; this and all below of several sites"},
			{"files[].device.code_states", "of these"},
			{"files[].device.decoherence_infidelity_per_100_ns", "of all sites together"},
			{"files[].device.couplings[].kind", "product, exchange, heisenberg, dipolar or dispersive"},
			{"files[].device.couplings[].sites[]", "that it couples"},
			{"files[].device.couplings[].axes[]", "of a product: X, Y or Z of each; absent for others"},
			{"files[].device.couplings[].strength_mhz", "cyclic"},
			{"files[].device.couplings[].stands_still", "some of it does, in the frames of the sites"},
			{"files[].device.couplings[].turning_mhz[]", "at which some of it turns there"},
			{"files[].device.couplings[].left_out_mhz[]", "the same, which rotating_wave leaves out"},
			{"files[].device.crosstalk[].channel", "that reaches another site too"},
			{"files[].device.crosstalk[].site", "that other site"},
			{"files[].device.crosstalk[].share", "of what the channel does to its own"},
			{"files[].device.crosstalk[].phase_deg", "of that share"},
			{"files[].device.crosstalk[].turning_mhz", "in the frame of that site; 0 where it stands still"},
			{"files[].brief.name", "of the pulse; brief stands there for a brief"},
			{"files[].brief.profile", "its file"},
			{"files[].brief.device", "its file"},
			{"files[].brief.site", "of the gate; empty for several, and for states"},
			{"files[].brief.gate", "in words, or the states"},
			{"files[].brief.angle_rad", "of the rotation; null for other than one site"},
			{"files[].brief.axis[]", "of the rotation, along X, Y, Z; empty for other than one site"},
			{"files[].brief.span_ns", "guards included"},
			{"files[].brief.samples", "in the span"},
			{"files[].brief.free_samples", "that are not guards"},
			{"files[].brief.ends", "settled or window"},
			{"files[].brief.held[].name", "of an error"},
			{"files[].brief.held[].kind", "of an error, as in [[model.error]]"},
			{"files[].brief.held[].size_mhz", "rotation frequency; null where another size stands"},
			{"files[].brief.held[].size_share", "null where another size stands"},
			{"files[].brief.held[].size_rad", "null where another size stands"},
			{"files[].brief.held[].weight", "relative to the gate"},
			{"files[].brief.held[].operators", "of a class, in number; absent for one spin and for single errors"},
			{"files[].brief.held_by_default", "the brief names no error"},
			{"files[].brief.equations", "of gate and errors"},
			{"files[].brief.independent_equations", "without those that follow from others"},
			{"files[].brief.basis_family", "that a design uses"},
			{"files[].brief.coefficients_per_quadrature", "that it uses"},
			{"files[].brief.coefficients", "of all quadratures and channels"},
			{"files[].brief.required_infidelity", "at most"},
			{"files[].brief.required_susceptibility", "at most, of each held error"},
			{"files[].brief.required_margins[].error", "its name"},
			{"files[].brief.required_margins[].size_mhz", "null where another size stands"},
			{"files[].brief.required_margins[].size_share", "null where another size stands"},
			{"files[].brief.required_margins[].size_rad", "null where another size stands"},
			{"files[].brief.seed", "of the random starts"},
			{"files[].brief.starts", "at most"},
			{"files[].brief.refine", "whether finite errors are lowered afterwards"},
			{"files[].brief.decoherence_infidelity", "to be added in this span"},
			{"files[].brief.warnings[]", "sentences that want attention"},
			{"files[].brief.sites[]", "on which the gate acts; this and the next three of a device of several sites, or of states"},
			{"files[].brief.free_z", "none, before, after or both"},
			{"files[].brief.up_to_local_rotations", "true; absent when not"},
			{"files[].brief.states", "how many become others; absent for a gate"},
		}},
		{"design, replay", []jsonKey{
			format,
			{"folder", "of the pulse"},
			{"datasheet", "the page that was written; null when none was"},
			{"name", "of the pulse"},
			{"target", "the gate in words"},
			{"status", "how the search ended, as in [pulse]"},
			{"met", "found, and every requirement and limit is kept"},
			{"held[]", "names of the errors it is held against"},
			{"held_by_default", "the brief named no error"},
			{"search.seed", "these as in [search]"},
			{"search.starts_allowed", ""},
			{"search.starts_tried", ""},
			{"search.successes", ""},
			{"search.winning_start", ""},
			{"search.evaluations", ""},
			{"search.sum_of_squared_residuals", ""},
			{"search.infidelity_before_rounding", ""},
			{"files[]", "of the folder, but for the record and the datasheet"},
			{"rivals[].name", "a textbook pulse on the same line"},
			{"rivals[].span_ns", "that it takes"},
			{"rivals[].infidelity", "for the stated ends"},
			{"rivals[].pair_infidelity", "twice without a gap"},
			{"rivals[].ring_out_share", "the largest after its span"},
			{"rivals[].breaks_ring_out", "more than the instrument allows"},
			{"rivals_left_out", "why there are none, of several sites or states; else absent"},
			{"verdict.format", "1, of the verdict"},
			{"verdict.name", "of the pulse"},
			{"verdict.ends", "settled or window: the required one of the two below"},
			{"verdict.met", "every requirement and limit, and the record agrees"},
			{"verdict.measure", "state or subspace: what infidelity is of; absent for the average of a gate"},
			{"verdict.settled.infidelity", "with what arrives after the window"},
			{"verdict.settled.leakage", ""},
			{"verdict.window.infidelity", "without it"},
			{"verdict.window.leakage", ""},
			{"verdict.dropped.infidelity", "for the stated ends, with the rotating terms put back that the model leaves out; absent when it leaves out none"},
			{"verdict.dropped.leakage", "the same"},
			{"verdict.tail_angle_rad", "that the ring-out still turns"},
			{"verdict.pair.infidelity", "twice without a gap, the worst of four phases"},
			{"verdict.pair.phase_deg", "that phase"},
			{"verdict.decoherence", "to be added to every infidelity"},
			{"verdict.limits[].channel", "of a limit"},
			{"verdict.limits[].limit", "its name"},
			{"verdict.limits[].unit", "of found and allowed"},
			{"verdict.limits[].found", "in the codes"},
			{"verdict.limits[].allowed", "at most"},
			{"verdict.limits[].headroom", "1 - found/allowed"},
			{"verdict.limits[].ok", "kept"},
			{"verdict.errors[].name", "of an error"},
			{"verdict.errors[].kind", "as in [[model.error]]"},
			{"verdict.errors[].held", "the pulse is held against it"},
			{"verdict.errors[].unit", "of low, high and value: MHz, % or deg"},
			{"verdict.errors[].susceptibility", "the share of it that survives"},
			{"verdict.errors[].leak_susceptibility", "the share of it that leads out of the code space; absent without other levels"},
			{"verdict.errors[].leak", "true of a class of leakage, of which that is not to survive; else absent"},
			{"verdict.errors[].low", "where the required infidelity is first broken, looked for up to 50 MHz, % or deg, of static errors up to twice the largest full scale; null: nowhere"},
			{"verdict.errors[].high", "the same for positive sizes"},
			{"verdict.errors[].worst_direction", "of any static error, in words"},
			{"verdict.errors[].worst_susceptibility", "in that direction"},
			{"verdict.errors[].direction[]", "the same along X, Y, Z, or along members"},
			{"verdict.errors[].members[]", "names of the operators of a class; absent for one spin's"},
			{"verdict.errors[].sampled", "what low, high and curve of it were looked for along; absent for one spin's"},
			{"verdict.errors[].curve[].value", "a size"},
			{"verdict.errors[].curve[].infidelity", "at it"},
			{"verdict.bring_up.amplitude[].scale", "of the drive"},
			{"verdict.bring_up.amplitude[].one", "population of |1> from |0>"},
			{"verdict.bring_up.detuning[].mhz", "of the carrier; up to 5, or half of the largest full scale"},
			{"verdict.bring_up.detuning[].one", "population of |1> from |0>"},
			{"verdict.bring_up.repeats[].pulses", "back to back"},
			{"verdict.bring_up.repeats[].one", "population of |1> from |0>"},
			{"verdict.agreement.infidelity", "largest difference from the record"},
			{"verdict.agreement.susceptibility", "largest difference from the record"},
			{"verdict.agreement.tail_angle_rad", "difference from the record"},
			{"verdict.agreement.ok", "small enough"},
			{"verdict.agreement.worst.figure", "that differs most for what is allowed; empty when the record claims nothing"},
			{"verdict.agreement.worst.found", "by replay"},
			{"verdict.agreement.worst.recorded", "as the record has it"},
			{"verdict.agreement.worst.allowed", "how far they may be apart"},
			{"verdict.inputs[].key", "a number of [model] that inputs/ do not bear out"},
			{"verdict.inputs[].recorded", "as it stands there"},
			{"verdict.inputs[].rebuilt", "from inputs/"},
			{"verdict.requirements[].name", "of the brief"},
			{"verdict.requirements[].unit", "of found and allowed"},
			{"verdict.requirements[].found", ""},
			{"verdict.requirements[].allowed", "at most, or for a margin at least"},
			{"verdict.requirements[].margin", "is it a margin?"},
			{"verdict.requirements[].met", ""},
			{"verdict.warnings[]", "sentences"},
		}},
		{"card", []jsonKey{
			format,
			{"folder", "that was made"},
			{"channel", "that drives"},
			{"site", "that is driven"},
			{"carrier_below_transition_mhz", "where the carrier is asked for"},
			{"carrier_ghz", "the same, where the device states the transition"},
			{"sequences[].name", "the files begin with it"},
			{"sequences[].says", "what it does"},
			{"sequences[].span_ns", "its length"},
			{"sequences[].samples", "its length"},
			{"sequences[].files[]", "in the folder"},
			{"combinations[].group", "a letter; those of one group read alike"},
			{"combinations[].mixing", "what leaves the mixer"},
			{"combinations[].cables", "straight or exchanged"},
			{"combinations[].zero", "upper or lower: which energy |0> has"},
			{"combinations[].carrier", "below or above the transition"},
			{"combinations[].stated", "it is what the files say and the card asks for"},
			{"combinations[].populations[]", "of |1>: of the three sequences, and of the first with the mixer's Q input terminated"},
			{"carrier_not_moved_populations[]", "the same when the carrier is on the transition"},
			{"smallest_distance", "of two groups: the largest difference in one population"},
			{"groups[].group", "a letter"},
			{"groups[].remedy", "what to change when it fits"},
			{"cautions[]", "to be heeded before a cable is connected"},
			{"moved_by_other_sites", "of several sites: how far couplings and crosstalk move a population of the stated row; else absent"},
		}},
		{"help", []jsonKey{
			format,
			{"verbs[].name", "without a topic"},
			{"verbs[].usage", ""},
			{"verbs[].says", ""},
			{"topics[]", "files that can be explained"},
			{"topic", "that was asked for"},
			{"usage", "of a verb"},
			{"text", "what is said of it"},
			{"keys[].path", "of a file's key, [] after a list; of topic json the verb comes first"},
			{"keys[].example", "as it is written in the file"},
			{"keys[].allowed", "values"},
			{"keys[].absent", "what its absence means"},
			{"keys[].required", "wherever its table stands"},
			{"keys[].says", "what it is"},
		}},
		{"version", []jsonKey{
			format,
			{"program", "holdfast"},
			{"version", "of it"},
		}},
	}
}

// jsonText lists the keys as a tree: a key below another is indented.
func jsonText() string {
	var b strings.Builder
	for i, v := range jsonKeys() {
		if i > 0 {
			b.WriteByte('\n')
		}
		b.WriteString(v.verbs + "\n")
		var facts []fact
		var above []string
		for _, k := range v.keys {
			parts := strings.Split(k.path, ".")
			same := 0
			for same < len(above) && same < len(parts)-1 && above[same] == parts[same] {
				same++
			}
			for ; same < len(parts)-1; same++ {
				facts = append(facts, fact{strings.Repeat("  ", same) + parts[same], ""})
			}
			above = parts[:len(parts)-1]
			facts = append(facts, fact{strings.Repeat("  ", len(above)) + parts[len(parts)-1], k.says})
		}
		var table strings.Builder
		printFacts(&table, facts)
		for line := range strings.Lines(table.String()) {
			b.WriteString(strings.TrimRight(line, " \n") + "\n")
		}
	}
	return b.String()
}
