package brief

import (
	"encoding/csv"
	"errors"
	"fmt"
	"io"
	"maps"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strconv"
	"strings"

	"holdfast/design/device"
	"holdfast/hardware/quantity"
)

// The limits of classes of static errors.
const (
	mostExcepts       = 64
	mostMemberEntries = 1 << 22 // of all matrices of a class: 64 MiB
	ratesBytes        = 1 << 20
	largestRate       = 1e12
)

// anyNames are the names of errors of kind Any unless the brief gives others.
var anyNames = map[string]string{
	All: "any static error", OneBody: "any one-body error", TwoBody: "any two-body error", Leakage: "any leakage", Learned: "any learned error",
}

// product is a product of X, Y or Z of some sites.
type product struct {
	sites, axes []string
	line        int
}

func (p product) String() string {
	return strings.Join(p.axes, "") + " on " + strings.Join(p.sites, ", ")
}

// readProduct reads a product from a table such as { q1 = "Z", q2 = "X" }; values are what stands there.
func readProduct(t *quantity.Table, values map[string]any) product {
	p := product{sites: slices.Sorted(maps.Keys(values))}
	if len(p.sites) == 0 || len(p.sites) > mostSites {
		t.Fail("", "found %d sites; allowed: 1 to %d, each with X, Y or Z, as in { q1 = \"Z\", q2 = \"X\" }", len(p.sites), mostSites)
		return product{}
	}
	for _, site := range p.sites {
		p.axes = append(p.axes, t.Choice(site, device.OperatorNames()))
		p.line = t.Line(site)
	}
	return p
}

// readAny reads a class of static errors and gives the name that it has by nature.
func (e *Error) readAny(t *quantity.Table, values map[string]any) string {
	e.scope = t.Text("any")
	names, on := strings.CutPrefix(e.scope, "on ")
	switch {
	case on:
		for name := range strings.SplitSeq(names, ",") {
			if name = strings.TrimSpace(name); name == "" || slices.Contains(e.within, name) || len(e.within) == mostSites {
				t.Fail("any", "found %q; allowed: 1 to %d sites, each once, as in \"on q1, q2\"", e.scope, mostSites)
				break
			}
			e.within = append(e.within, name)
		}
		e.scope = "on " + strings.Join(e.within, ", ")
	case e.scope != "" && !slices.Contains([]string{All, OneBody, TwoBody, Leakage}, e.scope):
		t.Fail("any", "found %q; allowed: %q, %q, %q, %q or sites, as in \"on q1, q2\"", e.scope, All, OneBody, TwoBody, Leakage)
	}
	e.Scope, e.Leak = e.scope, e.scope == Leakage
	listed := tablesOf(values["except"])
	for i, x := range t.Tables("except", mostExcepts) {
		var v map[string]any
		if i < len(listed) {
			v = listed[i]
		}
		e.except = append(e.except, readProduct(x, v))
	}
	if len(e.except) > 0 && e.scope == All {
		e.Scope = Some
	}
	if e.Leak && t.Has("except") {
		t.Fail("except", "found it beside any = %q; allowed: except beside the other classes, whose operators are products", Leakage)
	}
	if t.Has("rates") {
		e.Rates = t.Text("rates")
		e.ratesAt.line = t.Line("rates")
		switch {
		case e.Leak:
			t.Fail("rates", "found it beside any = %q; allowed: rates beside the other classes, of sites with two levels", Leakage)
		case e.Rates != "" && (strings.ContainsAny(e.Rates, `/\:`) || !strings.EqualFold(filepath.Ext(e.Rates), ".csv") || len(e.Rates) == len(".csv")):
			t.Fail("rates", "found %q; allowed: the name of a .csv file that lies beside the brief, such as \"rates.csv\"", e.Rates)
		}
		e.Scope = Learned
		return anyNames[Learned]
	}
	if on {
		return "any error " + e.scope
	}
	return anyNames[e.scope]
}

// fill makes the members of a class of static errors. A complaint without a key is about the key any.
func (e *Error) fill(d *device.Device) *quantity.Error {
	e.Members = nil
	names := siteNames(d)
	for _, site := range e.within {
		if fault := known(site, names, "sites of "+d.File); fault != nil {
			return fault
		}
	}
	if e.scope == Leakage {
		return e.leaks(d)
	}
	picks := e.picks(d)
	if len(picks) == 0 { // of two-body errors of one site
		return &quantity.Error{Found: fmt.Sprintf("%q for a device of %d site", e.scope, len(d.Sites)), Allowed: "a class that has an operator there"}
	}
	picks, fault := e.leaveOut(picks, d)
	if fault != nil {
		return fault
	}
	picks, weights, fault := e.weigh(picks, d)
	if fault != nil {
		return fault
	}
	if fault := tooMany(len(picks), d.Dim()); fault != nil {
		return fault
	}
	bases, labels := make([][]device.Matrix, len(d.Sites)), make([][]string, len(d.Sites))
	for s := range d.Sites {
		bases[s], labels[s] = d.Basis(s)
	}
	spins := allSpins(d)
	for i, p := range picks {
		ops := map[int]device.Matrix{}
		var words []string
		letters := ""
		for s, k := range p {
			if k == 0 {
				letters += "1"
				continue
			}
			ops[s] = bases[s][k-1]
			letters += labels[s][k-1]
			words = append(words, d.Sites[s].Name+" "+labels[s][k-1])
		}
		m := Member{Name: letters, Operator: d.Embed(ops).Scale(0.5), Weight: weights[i]}
		if !spins {
			m.Name = strings.Join(words, ", ")
		}
		e.Members = append(e.Members, m)
	}
	return nil
}

// allSpins reports whether every site has two levels.
func allSpins(d *device.Device) bool {
	return !slices.ContainsFunc(d.Sites, func(s device.Site) bool { return s.Levels != 2 })
}

// tooMany complains of a class of so many operators that they do not fit.
func tooMany(count, dim int) *quantity.Error {
	if most := mostMemberEntries / (dim * dim); count > most {
		return &quantity.Error{Found: fmt.Sprintf("%d operators of %d levels", count, dim), Allowed: fmt.Sprintf("at most %d (a smaller class, such as \"one-body\", \"two-body\" or \"on q1, q2\")", most)}
	}
	return nil
}

// A pick says of each site which operator of its basis stands in a product, from 1; 0 for none.
type pick []int

// picks lists the products of a class, the last site fastest, without the identity.
func (e *Error) picks(d *device.Device) []pick {
	var list []pick
	n := len(d.Sites)
	for p := make(pick, n); ; {
		s := n - 1
		for ; s >= 0; s-- { // count on
			if p[s]++; p[s] < d.Sites[s].Levels*d.Sites[s].Levels {
				break
			}
			p[s] = 0
		}
		if s < 0 {
			return list
		}
		bodies, inside := 0, true
		for s, k := range p {
			if k > 0 {
				bodies++
				inside = inside && slices.Contains(e.within, d.Sites[s].Name)
			}
		}
		if e.scope == All || e.scope == OneBody && bodies == 1 || e.scope == TwoBody && bodies == 2 || len(e.within) > 0 && inside {
			list = append(list, slices.Clone(p))
		}
	}
}

// leaveOut takes the products of except out of a class.
func (e *Error) leaveOut(picks []pick, d *device.Device) ([]pick, *quantity.Error) {
	names := siteNames(d)
	for i, x := range e.except {
		fail := func(fault *quantity.Error) *quantity.Error {
			fault.Line, fault.Key = x.line, fmt.Sprintf("except[%d]", i)
			return fault
		}
		out := make(pick, len(d.Sites))
		for k, site := range x.sites {
			if fault := known(site, names, "sites of "+d.File); fault != nil {
				return nil, fail(fault)
			}
			s, _ := d.Site(site)
			if d.Sites[s].Levels != 2 {
				return nil, fail(&quantity.Error{Found: fmt.Sprintf("%q, a site of %d levels", site, d.Sites[s].Levels), Allowed: "sites of two levels"})
			}
			out[s] = 1 + slices.Index(device.OperatorNames(), x.axes[k])
		}
		at := slices.IndexFunc(picks, func(p pick) bool { return slices.Equal(p, out) })
		if at < 0 {
			return nil, fail(&quantity.Error{Found: x.String() + ", which is not of the class, or out of it already", Allowed: "an operator of the class, once"})
		}
		picks = slices.Delete(picks, at, at+1)
	}
	if len(picks) == 0 {
		return nil, &quantity.Error{Found: fmt.Sprintf("%q, of which except leaves nothing", e.scope), Allowed: "a class that keeps an operator"}
	}
	return picks, nil
}

// weigh gives the weights of the members, and leaves out those that have none.
func (e *Error) weigh(picks []pick, d *device.Device) ([]pick, []float64, *quantity.Error) {
	weights := make([]float64, len(picks))
	if e.Rates == "" {
		for i := range weights {
			weights[i] = 1
		}
		return picks, weights, nil
	}
	fail := func(found, allowed string) *quantity.Error {
		return &quantity.Error{Line: e.ratesAt.line, Key: "rates", Found: found, Allowed: allowed}
	}
	if !allSpins(d) {
		return nil, nil, fail("rates for a device with a site of more than two levels", "rates for sites of two levels")
	}
	rates, fault := readRates(e.RatesPath, len(d.Sites))
	if fault != nil {
		if fault.Line == 0 { // the file itself
			return nil, nil, fail(fmt.Sprintf("%q, and at %s %s", e.Rates, e.RatesPath, fault.Found), fault.Allowed)
		}
		return nil, nil, fault
	}
	var kept []pick
	weights = weights[:0]
	for _, p := range picks {
		letters := make([]byte, len(p))
		for s, k := range p {
			letters[s] = "IXYZ"[k]
		}
		if r := rates[string(letters)]; r > 0 {
			kept, weights = append(kept, p), append(weights, r)
		}
	}
	if len(kept) == 0 {
		return nil, nil, fail(fmt.Sprintf("%q, which has no rate above 0 for an operator of the class", e.Rates), "a rate above 0 for one of them at least")
	}
	mean := 0.0
	for _, r := range weights {
		mean += r / float64(len(weights))
	}
	for i, r := range weights {
		weights[i] = math.Sqrt(r) / math.Sqrt(mean)
	}
	return kept, weights, nil
}

// readRates reads learned Pauli rates: a table of comma-separated values with the header pauli,rate, and in each row a letter I, X, Y or Z for each
// site and a rate of 0 or more; or, with the header pauli,sigma, a standard deviation, of which the square is the rate. A complaint of line 0 is about the file itself.
func readRates(path string, sites int) (map[string]float64, *quantity.Error) {
	f, err := os.Open(path)
	switch {
	case errors.Is(err, os.ErrNotExist):
		return nil, &quantity.Error{Found: "no such file", Allowed: "a file of rates, beside the brief"}
	case err != nil:
		return nil, &quantity.Error{Found: "an error of the system: " + err.Error(), Allowed: "a file of rates, beside the brief"}
	}
	defer f.Close() // read only: nothing can be lost
	const allowed = "a file of rates of at most 1 MiB"
	if info, err := f.Stat(); err != nil || !info.Mode().IsRegular() {
		return nil, &quantity.Error{Found: "something that is not a regular file", Allowed: allowed}
	}
	data, err := io.ReadAll(io.LimitReader(f, ratesBytes+1))
	if err != nil {
		return nil, &quantity.Error{Found: "an error of the system: " + err.Error(), Allowed: allowed}
	}
	if len(data) > ratesBytes {
		return nil, &quantity.Error{Found: "a larger file", Allowed: allowed}
	}
	return parseRates(path, string(data), sites)
}

// parseRates reads the text of a file of rates.
func parseRates(path, text string, sites int) (map[string]float64, *quantity.Error) {
	r := csv.NewReader(strings.NewReader(strings.TrimPrefix(text, "\ufeff")))
	r.FieldsPerRecord, r.TrimLeadingSpace = -1, true
	rates := map[string]float64{}
	squared := false // standard deviations, of which the squares are what rates are
	for first := true; ; first = false {
		row, err := r.Read()
		line := 1
		if len(row) > 0 {
			line, _ = r.FieldPos(0)
		}
		fail := func(key, allowed, format string, args ...any) *quantity.Error {
			return &quantity.Error{File: path, Line: line, Key: key, Found: fmt.Sprintf(format, args...), Allowed: allowed}
		}
		switch bad := (*csv.ParseError)(nil); {
		case errors.Is(err, io.EOF) && first:
			return nil, fail("", "the header pauli,rate or pauli,sigma and a row for each operator", "an empty file")
		case errors.Is(err, io.EOF):
			return rates, nil
		case errors.As(err, &bad):
			line = bad.Line
			return nil, fail("", "comma-separated values", "text that is none: %v", bad.Err)
		case err != nil:
			return nil, fail("", "comma-separated values", "text that cannot be read: %v", err)
		}
		for i := range row {
			row[i] = strings.TrimSpace(row[i])
		}
		if first {
			if squared = slices.Equal(row, []string{"pauli", "sigma"}); !squared && !slices.Equal(row, []string{"pauli", "rate"}) {
				return nil, fail("", "pauli,rate or pauli,sigma", "the header %q", clipped(strings.Join(row, ",")))
			}
			continue
		}
		if len(row) != 2 {
			return nil, fail("", "two, an operator and its rate", "%d columns", len(row))
		}
		if len(row[0]) != sites || strings.Trim(row[0], "IXYZ") != "" {
			return nil, fail("pauli", fmt.Sprintf("%d letters I, X, Y or Z, one for each site of the device", sites), "%q", clipped(row[0]))
		}
		if _, twice := rates[row[0]]; twice {
			return nil, fail("pauli", "each operator once", "%q a second time", row[0])
		}
		v, err := strconv.ParseFloat(row[1], 64)
		if err != nil || !(v >= 0 && v <= largestRate) {
			return nil, fail("rate", fmt.Sprintf("a number, 0 to %g", largestRate), "%q", clipped(row[1]))
		}
		if squared {
			v *= v
		}
		rates[row[0]] = v
	}
}

// clipped cuts a user's text to what a message repeats of it.
func clipped(s string) string {
	const most = 60
	if len(s) > most {
		return strings.ToValidUTF8(s[:most], "") + "..."
	}
	return s
}

// leaks makes the members of the class that couples the code space to the levels outside it.
func (e *Error) leaks(d *device.Device) *quantity.Error {
	dim, code := d.Dim(), d.CodeSpace()
	var rest []int
	for i := range dim {
		if !slices.Contains(code, i) {
			rest = append(rest, i)
		}
	}
	if len(rest) == 0 {
		return &quantity.Error{Found: fmt.Sprintf("%q for a device without levels outside the code space", Leakage), Allowed: "it where a site has more than two levels"}
	}
	if fault := tooMany(2*len(code)*len(rest), dim); fault != nil {
		return fault
	}
	f := complex(math.Sqrt(float64(dim))/2, 0)
	where := ""
	if len(d.Sites) == 1 {
		where = d.Sites[0].Name + " "
	}
	for _, i := range slices.Sorted(slices.Values(code)) {
		for _, j := range rest {
			re, im := device.Transition(dim, min(i, j), max(i, j))
			name := levelsOf(d, min(i, j)) + "-" + levelsOf(d, max(i, j))
			e.Members = append(e.Members, Member{where + "Re " + name, re.Scale(f), 1}, Member{where + "Im " + name, im.Scale(f), 1})
		}
	}
	return nil
}

// levelsOf says a basis state by the levels of its sites: "02", or "0.12" where a site has more than ten.
func levelsOf(d *device.Device, state int) string {
	words := make([]string, len(d.Sites))
	separator := ""
	for s := len(d.Sites) - 1; s >= 0; s-- {
		n := d.Sites[s].Levels
		words[s] = strconv.Itoa(state % n)
		state /= n
		if n > 10 {
			separator = "."
		}
	}
	return strings.Join(words, separator)
}
