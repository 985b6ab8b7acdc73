package main

import (
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"text/tabwriter"

	"holdfast/design"
	"holdfast/design/device"
	"holdfast/hardware"
	"holdfast/hardware/quantity"
)

// cardFile is the table in a card's folder.
const cardFile = "card.txt"

// card writes three sequences and says what a bench reads with each way of wiring it.
func card(c *call) (int, error) {
	f := c.flags()
	out := f.String("out", "card", "the folder to make")
	force := f.Bool("force", false, "keep an existing folder as NAME.before-N")
	detuning := f.String("detuning", "", "between carrier and transition; default: of the channel's full scale")
	channel := f.String("channel", "", "the drive whose card it is; default: the only one, of one site the first")
	operands, err := c.parse(f, 2, 2)
	if err != nil {
		return exitBadInput, err
	}
	p, err := hardware.Load(operands[0])
	if err != nil {
		return exitBadInput, err
	}
	d, err := device.Load(operands[1])
	if err != nil {
		return exitBadInput, err
	}
	b, err := newBench(p, d, *channel)
	if err != nil {
		return exitBadInput, err
	}
	if *detuning == "" {
		b.detuning, err = b.usual()
	} else if b.detuning, err = quantity.Parse(*detuning, quantity.Frequency); err != nil {
		err = fmt.Errorf("-detuning: %w", err)
	} else if !(b.detuning > 0) {
		err = fmt.Errorf("-detuning: found %q; allowed: above 0", *detuning)
	}
	if err != nil {
		return exitBadInput, err
	}
	sequences, err := b.sequences()
	if err != nil {
		return exitBadInput, err
	}
	stage, err := hardware.NewStaging(*out, *force)
	if err != nil {
		return exitBadInput, err
	}
	defer stage.Discard()
	table, err := b.predict(c.ctx, sequences)
	if err != nil {
		if c.ctx.Err() != nil {
			return exitInterrupted, fmt.Errorf("card: interrupted; nothing is written")
		}
		return exitBadInput, err
	}
	rest, err := b.alone(c.ctx, sequences, table.table)
	if err != nil {
		if c.ctx.Err() != nil {
			return exitInterrupted, fmt.Errorf("card: interrupted; nothing is written")
		}
		return exitBadInput, err
	}
	k := &conventionCard{bench: b, predictions: table, sequences: sequences, rest: rest}
	if err := k.write(stage.Dir(), operands); err != nil {
		return exitBadInput, err
	}
	if err := stage.Commit(); err != nil {
		return exitBadInput, err
	}
	if c.json {
		return exitMet, c.emit(k.form(*out))
	}
	if err := k.print(c.stdout); err != nil {
		return exitBadInput, err
	}
	fmt.Fprintf(c.stdout, "\ncard: %s\n", *out)
	return exitMet, nil
}

// A conventionCard is all that the card says.
type conventionCard struct {
	*bench
	*predictions
	sequences []sequence
	files     [][]string // of each sequence
	rest      float64    // how far the rest of the device moves a population
}

// write fills the folder.
func (k *conventionCard) write(dir string, inputs []string) error {
	for _, q := range k.sequences {
		names, err := design.WriteWaveform(dir, q.name, k.profile, k.channel, q.codes)
		if err != nil {
			return err
		}
		k.files = append(k.files, names)
	}
	if err := os.Mkdir(filepath.Join(dir, "inputs"), 0o777); err != nil {
		return err
	}
	for i, name := range []string{"profile.toml", "device.toml"} {
		data, err := os.ReadFile(inputs[i])
		if err != nil {
			return err
		}
		if err := os.WriteFile(filepath.Join(dir, "inputs", name), data, 0o666); err != nil {
			return err
		}
	}
	var text strings.Builder
	if err := k.print(&text); err != nil {
		return err
	}
	return os.WriteFile(filepath.Join(dir, cardFile), []byte(text.String()), 0o666)
}

func cables(swapped bool) string {
	if swapped {
		return "exchanged"
	}
	return "straight"
}

func side(above bool) string {
	if above {
		return "above"
	}
	return "below"
}

// carrierAt says where to put the carrier, GHz; 0 when the transition is not stated.
func (k *conventionCard) carrierAt() float64 {
	if f := k.site().Frequency; f > k.detuning {
		return f - k.detuning
	}
	return 0
}

// span of sequence i, ns.
func (k *conventionCard) span(i int) float64 {
	return float64(len(k.sequences[i].codes)/2) * k.profile.SamplePeriod
}

func (k *conventionCard) print(w io.Writer) error {
	ch, site := &k.profile.Channels[k.channel], k.site()
	fmt.Fprintf(w, "Convention card: channel %q of %q drives site %q of %q\n\n", ch.Name, k.profile.Name, site.Name, k.device.Name)
	carrier := "its frequency is not stated in the device file"
	if f := k.carrierAt(); f > 0 {
		carrier = fmt.Sprintf("%.10g GHz for a transition at %.10g GHz", f, site.Frequency)
	}
	fmt.Fprintf(w, "  %s\n\n", wrap(fmt.Sprintf("Set the carrier %s below the transition (%s). For each sequence: prepare |0>, play it once, measure; repeat, and note the share of |1>. "+
		"Then switch the outputs off, take the cable off the mixer's Q input, terminate that input, switch on, and play the first once more.",
		quantity.Format(k.detuning, quantity.Frequency), carrier), 106, 2))
	var facts []fact
	for i, q := range k.sequences {
		facts = append(facts, fact{q.name, fmt.Sprintf("%s; %s with the silence that ring-out wants", q.says, quantity.Format(k.span(i), quantity.Time))})
	}
	printFacts(w, facts)

	fmt.Fprintf(w, "\nPopulations of |1> to expect, through the line, without decoherence:\n\n")
	rows := slices.Clone(k.table)
	slices.SortStableFunc(rows, func(a, b prediction) int { return strings.Compare(a.group, b.group) })
	t := tabwriter.NewWriter(w, 0, 0, 2, ' ', 0)
	fmt.Fprintf(t, "  group\tmixing\tcables\t|0>\tcarrier\t1\t2\t3\t1, Q terminated\n")
	line := func(group, mixing, cables, zero, carrier string, p [4]float64, note string) {
		fmt.Fprintf(t, "  %s\t%s\t%s\t%s\t%s\t%.3f\t%.3f\t%.3f\t%.3f%s\n", group, mixing, cables, zero, carrier, p[0], p[1], p[2], p[3], note)
	}
	for _, r := range rows {
		note := ""
		if r.signs == k.stated() {
			note = "  the files"
		}
		line(r.group, string(r.mixing), cables(r.swapped), r.zero, side(r.above), r.populations, note)
	}
	line("-", "any", "straight", "any", "on it", k.unmoved, "  the carrier was not moved")
	if err := t.Flush(); err != nil {
		return err
	}
	if n := len(k.device.Sites); n > 1 {
		fmt.Fprintf(w, "\n  %s\n", wrap(fmt.Sprintf("This is the table of site %q by itself, with all %d sites in |0> first. What couples it to the others, and crosstalk, move the row of the files by at most %.3f.",
			site.Name, n, k.rest), 106, 2))
	}
	fmt.Fprintf(w, "\n  Any two groups differ by at least %.2f in one of the columns. What fits calls for:\n", k.distance)
	facts = nil
	for _, group := range k.groups() {
		facts = append(facts, fact{group, k.remedy(group)})
	}
	printFacts(w, facts)
	if k.within > 0.001 {
		fmt.Fprintf(w, "  (An asymmetric line, or the shift that the drive itself causes, keeps rows of a group up to %.3f apart.)\n", k.within)
	}
	fmt.Fprintf(w, "\n  %s\n\n", wrap("The rows of a group read alike in every sequence of this drive, not only in these: mixing and side of the carrier turned together, "+
		"or the energy of |0> turned, mirror the drive and the detuning at once, and no population after |0> shows a mirror. Any row of the group that fits may "+
		"stand in the files. The side of the carrier is read off its source; the energy of |0> shows in relaxation, which ends in the lower one.", 106, 2))
	var warn []string
	if t2 := site.T2; t2 > 0 {
		for i := range k.sequences {
			if k.span(i) > t2/10 {
				warn = append(warn, fmt.Sprintf("Sequence %s lasts %s, not short against T2, %s: populations come out nearer to one half. A larger -detuning makes it shorter.",
					k.sequences[i].name, quantity.Format(k.span(i), quantity.Time), quantity.Format(t2, quantity.Time)))
			}
		}
	}
	printCautions(w, append(warn, cautions(k.profile, k.channel)...))
	return nil
}

// groups names them in the order of their first row.
func (k *conventionCard) groups() []string {
	var names []string
	for _, r := range k.table {
		if !slices.Contains(names, r.group) {
			names = append(names, r.group)
		}
	}
	slices.Sort(names)
	return names
}

// remedy says what to change for a group: its row with the fewest differences from what is stated. A carrier that is not where it was
// asked for and another energy of |0> count double, for the one is read off a source, and the other is not seen.
func (k *conventionCard) remedy(group string) string {
	stated := k.stated()
	best, least := "", math.MaxInt
	for _, r := range k.table {
		if r.group != group {
			continue
		}
		var todo []string
		cost := 0
		add := func(wrong bool, weight int, words string) {
			if wrong {
				todo = append(todo, words)
				cost += weight
			}
		}
		add(r.swapped, 1, "exchange the cables of I and Q")
		add(r.mixing != stated.mixing, 1, fmt.Sprintf("write mixing = %q in the profile", r.mixing))
		add(r.above, 2, "put the carrier below the transition")
		add(r.zero != stated.zero, 2, fmt.Sprintf("write zero = %q in the device file", r.zero))
		if cost < least {
			best, least = strings.Join(todo, ", and "), cost
		}
	}
	if least == 0 {
		return "nothing: the bench is as the files say"
	}
	return best
}

// The form that -json prints.
type (
	cardForm struct {
		Format           int            `json:"format"`
		Folder           string         `json:"folder"`
		Channel          string         `json:"channel"`
		Site             string         `json:"site"`
		Detuning         number         `json:"carrier_below_transition_mhz"`
		Carrier          number         `json:"carrier_ghz"`
		Sequences        []sequenceForm `json:"sequences"`
		Combinations     []signsForm    `json:"combinations"`
		Unmoved          []number       `json:"carrier_not_moved_populations"`
		SmallestDistance number         `json:"smallest_distance"`
		Remedies         []remedyForm   `json:"groups"`
		Cautions         []string       `json:"cautions"`
		Rest             *number        `json:"moved_by_other_sites,omitempty"` // of several sites
	}
	sequenceForm struct {
		Name    string   `json:"name"`
		Says    string   `json:"says"`
		Span    number   `json:"span_ns"`
		Samples int      `json:"samples"`
		Files   []string `json:"files"`
	}
	signsForm struct {
		Group       string   `json:"group"`
		Mixing      string   `json:"mixing"`
		Cables      string   `json:"cables"`
		Zero        string   `json:"zero"`
		Carrier     string   `json:"carrier"`
		Stated      bool     `json:"stated"`
		Populations []number `json:"populations"`
	}
	remedyForm struct {
		Group  string `json:"group"`
		Remedy string `json:"remedy"`
	}
)

func (k *conventionCard) form(folder string) cardForm {
	v := cardForm{
		Format: jsonFormat, Folder: folder, Channel: k.profile.Channels[k.channel].Name, Site: k.site().Name,
		Detuning: number(1e3 * k.detuning), Carrier: unless(k.carrierAt(), 0), Unmoved: numbers(k.unmoved[:]), SmallestDistance: number(k.distance),
		Cautions: cautions(k.profile, k.channel),
	}
	if rest := number(k.rest); len(k.device.Sites) > 1 {
		v.Rest = &rest
	}
	for i, q := range k.sequences {
		v.Sequences = append(v.Sequences, sequenceForm{q.name, q.says, number(k.span(i)), len(q.codes) / 2, k.files[i]})
	}
	for _, r := range k.table {
		v.Combinations = append(v.Combinations, signsForm{r.group, string(r.mixing), cables(r.swapped), r.zero, side(r.above), r.signs == k.stated(), numbers(r.populations[:])})
	}
	for _, group := range k.groups() {
		v.Remedies = append(v.Remedies, remedyForm{group, k.remedy(group)})
	}
	return v
}
