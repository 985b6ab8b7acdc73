package brief

import (
	"fmt"
	"maps"
	"math"
	"math/cmplx"
	"slices"
	"strings"

	"holdfast/design/device"
	"holdfast/hardware/quantity"
)

// stateTolerance is how far the length of a state that a person has typed may be from 1. Complete removes what is left.
const stateTolerance = 1e-6

// The states that have names.
const (
	ghzState = "GHZ" // (|0...0> + |1...1>)/sqrt 2
	wState   = "W"   // the even sum of the states with one site in |1>
)

// state is one end of a target of states, as written: labels, a name, or a vector.
type state struct {
	labels []string
	name   string // GHZ or W
	vector []complex128
}

// count gives how many states these are.
func (s *state) count() int { return max(1, len(s.labels)) }

// words says the states for people.
func (s *state) words() string {
	switch {
	case len(s.labels) > 0:
		return strings.Join(s.labels, ", ")
	case s.name != "":
		return s.name
	}
	return "vector"
}

// readTarget reads the target; values are what stands in its table.
func readTarget(t *quantity.Table, values map[string]any) Target {
	target := Target{named: "site"}
	one, several, named, from, to := t.Has("site"), t.Has("sites"), t.Has("gates"), t.Has("from"), t.Has("to")
	states := from || to
	switch {
	case states, named:
		key := "site"
		if several {
			key = "sites"
		}
		if states && (one || several) {
			t.Fail(key, "found %s beside from or to; allowed: these alone, as they are states of all sites of the device", key)
		} else if one || several {
			t.Fail(key, "found %s beside gates; allowed: gates alone, which names the sites", key)
		}
		if named {
			target.named = "gates"
			target.Sites = slices.Sorted(maps.Keys(tableOf(values["gates"])))
		}
	case several:
		target.named = "sites"
		target.Sites = t.Texts("sites", mostSites)
		switch {
		case one:
			t.Fail("sites", "found sites beside site; allowed: one of the two")
		case target.Sites != nil && len(target.Sites) == 0:
			t.Fail("sites", "found no site; allowed: 1 to %d, as in [\"q1\", \"q2\"]", mostSites)
		}
		for i, name := range target.Sites {
			if slices.Contains(target.Sites[:i], name) {
				t.Fail("sites", "found %q a second time; allowed: each site once", name)
			}
		}
	default:
		target.Sites = []string{t.Text("site")}
	}
	if len(target.Sites) == 1 {
		target.Site = target.Sites[0]
	}
	target.FreeZ = t.Choice("free_z", []string{NoFreeZ, Before, After, Both}, NoFreeZ)
	if t.Has("up_to") {
		t.Choice("up_to", []string{"local rotations"})
		target.Local = true
	}
	switch {
	case states && target.Local:
		t.Fail("up_to", "found up_to beside from; allowed: up_to for a gate")
	case states && target.FreeZ != NoFreeZ:
		t.Fail("free_z", "found free_z beside from; allowed: free_z for a gate")
	case target.Local && target.FreeZ != NoFreeZ:
		t.Fail("free_z", "found free_z beside up_to = \"local rotations\"; allowed: one of the two, as the latter frees every rotation of a single site")
	}
	if to && !from {
		t.Fail("to", "found to without from; allowed: both, as in from = \"00\" and to = \"11\"")
	}
	kind := oneOf(t, "gate", "gates", "controlled", "axis", "matrix", "from")
	if t.Has("angle") && !t.Has("axis") {
		t.Fail("angle", "found an angle without an axis; allowed: both, as in axis = [1, 0, 0] and angle = \"90 deg\"")
		return target
	}
	switch kind {
	case "gate":
		target.readGate(t)
	case "gates":
		target.readGates(t)
	case "controlled":
		target.readControlled(t)
	case "axis":
		target.readAxis(t)
	case "matrix":
		target.readMatrix(t)
	case "from":
		target.readStates(t, values)
		return target
	}
	if target.Matrix.N == 0 && len(target.Sites) == 1 {
		target.Matrix = device.Rotation(target.Axis, target.Angle)
	}
	return target
}

// readGate reads the name of a gate, which means a rotation of one site.
func (target *Target) readGate(t *quantity.Table) {
	switch len(target.Sites) {
	case 0: // complained of already
		t.Text("gate")
	case 1:
		target.Label = t.Choice("gate", device.GateNames())
		target.Axis, target.Angle, _ = device.Gate(target.Label)
	case 2:
		target.Label = t.Choice("gate", device.Gate2Names())
		target.Matrix, _ = device.Gate2(target.Label)
	default:
		target.Label = t.Choice("gate", []string{"identity"})
		target.Matrix = device.Identity(1 << len(target.Sites))
	}
}

// readGates reads a gate for each of several sites.
func (target *Target) readGates(t *quantity.Table) {
	gates := t.Table("gates")
	if len(target.Sites) == 0 || len(target.Sites) > mostSites {
		gates.Fail("", "found %d sites; allowed: 1 to %d, as in { q1 = \"X90\", q2 = \"identity\" }", len(target.Sites), mostSites)
		return
	}
	m := device.Identity(1)
	var labels []string
	for _, site := range target.Sites {
		label := gates.Choice(site, device.GateNames())
		axis, angle, _ := device.Gate(label)
		labels = append(labels, label)
		m = device.Kron(m, device.Rotation(axis, angle))
		if len(target.Sites) == 1 {
			target.Axis, target.Angle = axis, angle
		}
	}
	target.Label = strings.Join(labels, ", ")
	target.Matrix = m
}

// readControlled reads a gate on the last site that depends on all others.
func (target *Target) readControlled(t *quantity.Table) {
	name := t.Choice("controlled", device.GateNames())
	if len(target.Sites) < 2 {
		t.Fail("controlled", "found it for one site; allowed: sites, the controls and then the site of the gate, as in [\"q1\", \"q2\"]")
		return
	}
	axis, angle, _ := device.Gate(name)
	target.Label, target.Matrix = "controlled "+name, device.Rotation(axis, angle)
	// On condition the phase has a meaning. These three names are those of matrices, and not of turns.
	switch name {
	case "H", "S", "T":
		target.Matrix = target.Matrix.Scale(cmplx.Rect(1, angle/2))
	}
	for range target.Sites[1:] {
		target.Matrix = device.Controlled(target.Matrix)
	}
}

// readAxis reads a rotation of one site by its axis and its angle.
func (target *Target) readAxis(t *quantity.Table) {
	axis := t.Numbers("axis", 3, -1e6, 1e6)
	target.Angle = t.Quantity("angle", quantity.Angle, -4*math.Pi, 4*math.Pi)
	if len(axis) != 3 {
		t.Fail("axis", "found %d numbers; allowed: the 3 components of the axis, as in [1, 0, 0]", len(axis))
		return
	}
	norm := math.Hypot(math.Hypot(axis[0], axis[1]), axis[2])
	if !(norm >= 1e-6) {
		t.Fail("axis", "found an axis of no length; allowed: 3 components that are not all 0, as in [1, 0, 0]")
		return
	}
	if len(target.Sites) > 1 {
		t.Fail("axis", "found an axis for %d sites; allowed: axis and angle for one site", len(target.Sites))
		return
	}
	for i, v := range axis {
		target.Axis[i] = v/norm + 0 // 0 and not -0
	}
	target.Label = target.Turn()
}

// readMatrix reads a unitary matrix on the code levels of the sites.
func (target *Target) readMatrix(t *quantity.Table) {
	n := 1 << max(len(target.Sites), 1)
	rows := t.Matrix("matrix", n)
	if rows == nil {
		return
	}
	target.Label = "matrix"
	m := device.FromRows(rows)
	const allowed = "allowed: a unitary one, to within %.0e (write the entries with 8 digits or more"
	switch {
	case n == 2:
		axis, angle, defect, ok := device.AxisAngle(m)
		if m.N != 2 {
			t.Fail("matrix", "found %d row; allowed: 2 rows, for a spin", m.N)
		} else if !ok {
			t.Fail("matrix", "found a matrix M with |M'M - 1| = %.2g; "+allowed+", or give axis and angle)", defect, device.UnitaryTolerance)
		}
		target.Axis, target.Angle = axis, angle
	case m.N != n:
		t.Fail("matrix", "found %d rows; allowed: %d rows, 2 for each of the %d sites multiplied together", m.N, n, len(target.Sites))
	default:
		u, defect, ok := device.Unitary(m)
		if !ok {
			t.Fail("matrix", "found a matrix M with |M'M - 1| = %.2g; "+allowed+")", defect, device.UnitaryTolerance)
		}
		target.Matrix = u
	}
}

// readStates reads states that are to become others.
func (target *Target) readStates(t *quantity.Table, values map[string]any) {
	target.from, target.to = readState(t, "from", values["from"]), readState(t, "to", values["to"])
	target.Label = target.from.words() + " to " + target.to.words()
	if f, o := target.from.count(), target.to.count(); f != o {
		t.Fail("to", "found %d where from has %d; allowed: as many states as in from", o, f)
	}
}

// readState reads one end of a target of states; v is what stands there.
func readState(t *quantity.Table, key string, v any) (s state) {
	const words = "allowed: labels of 0 and 1, one for each site, as in \"01\""
	list, isArray := v.([]any)
	isText := false
	if len(list) > 0 {
		_, isText = list[0].(string)
	}
	switch {
	case isArray && len(list) == 0:
		t.Fail(key, "found no state; %s", words)
		return s
	case isText:
		s.labels = t.Texts(key, mostDim)
	case isArray:
		s.vector = t.Complexes(key, mostDim)
		if s.vector == nil {
			return s
		}
		length := 0.0
		for _, c := range s.vector {
			length = math.Hypot(length, cmplx.Abs(c))
		}
		if !(math.Abs(length-1) <= stateTolerance) {
			t.Fail(key, "found a state of length %.8g; allowed: a state of length 1, to within %.0e", length, stateTolerance)
			return s
		}
		for i := range s.vector {
			s.vector[i] /= complex(length, 0)
		}
		return s
	default:
		if s.name = t.Text(key); s.name == ghzState || s.name == wState {
			return s
		}
		s.name, s.labels = "", []string{s.name}
	}
	for i, label := range s.labels {
		switch {
		case strings.Trim(label, "01") != "" || len(label) > mostSites:
			t.Fail(key, "found %q; %s; or %s, %s, or 2^n numbers", label, words, ghzState, wState)
			return s
		case len(label) != len(s.labels[0]):
			t.Fail(key, "found %q beside %q; allowed: labels of one length", label, s.labels[0])
			return s
		case slices.Contains(s.labels[:i], label):
			t.Fail(key, "found %q a second time; allowed: each state once", label)
			return s
		}
	}
	return s
}

// on gives the vectors of the states on the code space of n sites, or says what is wrong.
func (s *state) on(n int) ([][]complex128, *quantity.Error) {
	size := 1 << n
	r := complex(math.Sqrt2/2, 0)
	one := make([]complex128, size)
	switch {
	case s.vector != nil && len(s.vector) != size:
		return nil, &quantity.Error{Found: fmt.Sprintf("%d numbers", len(s.vector)), Allowed: fmt.Sprintf("%d, one for each code state of the %d sites", size, n)}
	case s.vector != nil:
		copy(one, s.vector)
	case s.name != "" && n < 2:
		return nil, &quantity.Error{Found: fmt.Sprintf("%q for one site", s.name), Allowed: "it for two sites or more"}
	case s.name == ghzState:
		one[0], one[size-1] = r, r
	case s.name == wState:
		for i := range n {
			one[1<<i] = complex(1/math.Sqrt(float64(n)), 0)
		}
	default:
		var list [][]complex128
		for _, label := range s.labels {
			if len(label) != n {
				return nil, &quantity.Error{Found: fmt.Sprintf("%q", label), Allowed: fmt.Sprintf("labels of %d digits, a 0 or 1 for each site of the device", n)}
			}
			v := make([]complex128, size)
			at := 0
			for _, c := range label {
				at = 2*at + int(c-'0')
			}
			v[at] = 1
			list = append(list, v)
		}
		if len(list) == size {
			return nil, &quantity.Error{Found: fmt.Sprintf("all %d states", size), Allowed: "fewer, as the span of all of them stays what it is"}
		}
		return list, nil
	}
	return [][]complex128{one}, nil
}

// completeTarget checks the target against the device and fills in what it means for the whole of it.
func (b *Brief) completeTarget(d *device.Device) *quantity.Error {
	t := &b.Target
	fail := func(key string, line int, e *quantity.Error) *quantity.Error {
		e.File, e.Line, e.Key = b.File, line, "target."+key
		return e
	}
	names := siteNames(d)
	var places []int
	for _, name := range t.Sites {
		if e := known(name, names, "a site of "+d.File); e != nil {
			return fail(t.named, b.lines.site, e)
		}
		i, _ := d.Site(name)
		places = append(places, i)
	}
	if t.Local && len(d.Sites) < 2 {
		return fail("up_to", b.lines.upTo, &quantity.Error{Found: "local rotations for a device of one site", Allowed: "them for two sites or more, as of one they are every gate"})
	}
	if t.Sites == nil {
		var fault *quantity.Error
		if t.From, fault = t.from.on(len(d.Sites)); fault != nil {
			return fail("from", b.lines.from, fault)
		}
		if t.To, fault = t.to.on(len(d.Sites)); fault != nil {
			return fail("to", b.lines.to, fault)
		}
		return nil
	}
	t.Whole = spread(t.Matrix, places, len(d.Sites))
	return nil
}

// spread gives a gate on the code levels of some of n sites, its own order of them in places, as a matrix on those of all, with the identity on the
// others.
func spread(m device.Matrix, places []int, n int) device.Matrix {
	if n == 1 {
		return m
	}
	size := 1 << n
	// own gives the index of a code state in m, and what is left of it without the sites of m.
	own := func(state int) (at, rest int) {
		rest = state
		for _, p := range places {
			bit := state >> (n - 1 - p) & 1
			at = 2*at + bit
			rest &^= 1 << (n - 1 - p)
		}
		return at, rest
	}
	whole := device.Zero(size)
	for i := range size {
		ai, ri := own(i)
		for j := range size {
			if aj, rj := own(j); ri == rj {
				whole.Data[i*size+j] = m.At(ai, aj)
			}
		}
	}
	return whole
}

// siteNames lists the names of a device's sites.
func siteNames(d *device.Device) []string {
	names := make([]string, len(d.Sites))
	for i, s := range d.Sites {
		names[i] = s.Name
	}
	return names
}

// Turn says the rotation in words, "no turn" where there is none.
func (t Target) Turn() string {
	if t.Angle == 0 {
		return "no turn"
	}
	return fmt.Sprintf("%s about (%.4g, %.4g, %.4g)", quantity.Format(t.Angle, quantity.Angle), t.Axis[0], t.Axis[1], t.Axis[2])
}
