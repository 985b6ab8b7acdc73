package device

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"holdfast/hardware/quantity"
)

// Device is what is driven, as its file describes it.
type Device struct {
	File      string // as the caller of Load named it
	Name      string
	Sites     []Site
	Couplings []Coupling
	Drives    []Drive
	Biases    []Bias
	Crosstalk []Crosstalk
}

// Site is one spin, or one ladder of levels.
type Site struct {
	Name      string
	Kind      string  // Spin or Ladder; empty: Spin of two levels, Ladder of more
	Levels    int     // 2 to 16
	Code      [2]int  // the levels of the code space, the first of them |0>; both 0: 0 and 1
	Zero      string  // Lower or Upper: which of the two energies |0> has; of a spin of more levels, which end of them level 0 has
	Frequency float64 // of the transition, GHz, cyclic; 0 when not stated
	T1, T2    float64 // ns; 0 when not stated; T2 <= 2 T1 where both are
	Detuning  float64 // static, of the transition from the frame of the drive, rad/ns, positive above it: H0 = Detuning Z/2 when |0> is Upper, -Detuning Z/2 when it is Lower
	// Anharmonicity of a ladder, rad/ns: by how much the 1-2 transition lies above the 0-1 one; of no effect on two levels.
	Anharmonicity float64
	Higher        []float64 // of a ladder, rad/ns: level n lies C(n, 3) Higher[0] + C(n, 4) Higher[1] + ... higher still
	Quadratic     float64   // of a spin s of more than two levels, rad/ns: H0 += Quadratic (Sz^2 - s(s+1)/3)
}

// The kinds of Site.
const (
	Spin   = "spin"
	Ladder = "ladder"
)

// The energies that |0> may have.
const (
	Lower = "lower"
	Upper = "upper"
)

// Coupling says what sites do to one another, all the time.
type Coupling struct {
	Kind         string   // Product, Exchange, Heisenberg, Dipolar or Dispersive
	Sites        []string // two, each once; of a Product two or more, in the order of the device
	Axes         []string // of a Product: X, Y or Z of each of Sites
	Strength     float64  // rad/ns
	RotatingWave bool     // what turns in the frames of the sites is left out
}

// The kinds of Coupling, with J its strength and S = (X, Y, Z)/2 of each site.
const (
	Product    = "product"    // J/2 times the product of the sites' X, Y or Z
	Exchange   = "exchange"   // J (a b' + a' b), a and b what takes a quantum of energy out: of spins with the same Zero J (X X + Y Y)/2
	Heisenberg = "heisenberg" // J S.S
	Dipolar    = "dipolar"    // J (3 Sz Sz - S.S), the part that magnetic dipoles with a common frame keep
	Dispersive = "dispersive" // J n n, n the number of the level above the ground state
)

// Drive says which channel of the hardware profile drives which site.
type Drive struct {
	Site, Channel string
	Line          int // of the channel's key in the device file, for messages
}

// Bias says which baseband channel of the hardware profile turns which site about which axis: H += u O/2, with u what arrives and O the Axis;
// or, with a map, Rate in the place of u.
type Bias struct {
	Site, Channel string
	Axis          string // X, Y or Z
	Line          int    // of the channel's key in the device file, for messages
	// One of these at most: a map of what arrives to the rate that it drives; see Rate. Both nil: a straight one.
	Polynomial []float64 // c_1, c_2, ..., plain numbers
	Loop       *Loop
}

// Crosstalk says how much of a channel reaches a site that it is not meant for: there Share e^{i Phase} u stands in the place of u.
type Crosstalk struct {
	Channel, Site string
	Share         float64 // of 1
	Phase         float64 // rad; 0 for a baseband channel
}

// The ranges of a device's figures, in the units of quantity.Parse.
const (
	lowestFrequency, highestFrequency = 1e-9, 1e4 // 1 Hz to 10 THz
	shortestLife, longestLife         = 1, 1e15   // 1 ns to 1e6 s
	largestDetuning                   = 1         // 1 GHz; of anharmonicities and couplings too
	largestShare                      = 10        // of crosstalk
	mostSites                         = 6
	mostLevels                        = 16
	mostDim                           = 64
	mostCouplings                     = 64
	mostChannels                      = 16
	mostCrosstalk                     = mostChannels * (mostSites - 1)
)

// Load reads a device file. Errors are an *quantity.Error: one sentence with file, line and key.
//
//	format = 1
//	name = "..."
//	[[site]]                  # 1 to 6, of 64 levels at most in their product
//	name = "q1"
//	levels = 2                # 2 to 16; default 2
//	kind = "spin"             # or "ladder"; default "spin" for two levels, "ladder" for more
//	code = [0, 1]             # which levels are the code space, |0> first; default [0, 1]
//	zero = "lower"            # or "upper": which energy |0> has; default "lower"
//	frequency = "5.1 GHz"     # optional
//	detuning = "0 Hz"         # static, of the transition from the frame of the drive; default 0
//	anharmonicity = "-220 MHz" # of a ladder of more than two levels: 1-2 transition less 0-1
//	higher = ["3 MHz"]        # of a ladder: level n lies C(n,3) higher[0] + C(n,4) higher[1] + ... higher; default none
//	quadratic = "1 MHz"       # of a spin of more than two levels: quadratic (Sz^2 - s(s+1)/3); default 0
//	T1 = "80 us"              # optional
//	T2 = "60 us"              # optional; at most 2 T1
//	[[drive]]                 # drives and biases: 1 to 16, a channel once
//	site = "q1"
//	channel = "q1 drive"      # a quadrature channel of the hardware profile
//	[[bias]]
//	site = "q1"
//	channel = "q1 flux"       # a baseband channel of the hardware profile
//	axis = "Z"                # or "X", "Y"; default "Z"
//	polynomial = [1, 0.2]     # H += full scale (c1 s + c2 s^2 + ...) axis/2, s the share of full scale that arrives: 1 to 8 numbers, -10 to 10; default [1]
//	loop = { highest = "5.2 GHz", bias = 0.23, full_scale = 0.15, asymmetry = 0.1 } # or a loop of two junctions, about Z; see Loop
//	[[coupling]]              # up to 64
//	on = { q1 = "Z", q2 = "Z" } # H += strength times half the product; two sites or more; or kind and between
//	kind = "exchange"         # or "heisenberg", "dipolar", "dispersive"; see Exchange and the others
//	between = ["q1", "q2"]
//	strength = "5 MHz"
//	rotating_wave = true      # leave out what turns in the sites' frames; needs their frequencies; default false
//	[[crosstalk]]             # up to 80
//	channel = "q1 drive"      # of a drive, or of a bias without polynomial or loop
//	site = "q2"
//	share = "3 %"             # of what it does to its own site; -1000 % to 1000 %
//	phase = "40 deg"          # of a quadrature channel; default 0
func Load(path string) (*Device, error) {
	doc, err := quantity.ReadFile(path)
	if err != nil {
		return nil, err
	}
	return read(doc)
}

// read makes the device of a document.
func read(doc *quantity.Document) (*Device, error) {
	root := doc.Root()
	root.Int("format", 1, 1)
	d := &Device{File: doc.File(), Name: root.Text("name")}
	dim := 1
	for _, t := range root.Tables("site", mostSites) {
		s := readSite(t)
		if _, twice := d.Site(s.Name); twice {
			t.Fail("name", "found %q a second time; allowed: a name of its own for each site", s.Name)
		}
		if dim *= s.Levels; dim > mostDim {
			t.Fail("levels", "found %d levels, %d with those of the sites before it; allowed: at most %d, in the product over the sites", s.Levels, dim, mostDim)
		}
		d.Sites = append(d.Sites, s)
	}
	if len(d.Sites) == 0 {
		root.Fail("site", "found none; allowed: 1 to %d [[site]], each with its name", mostSites)
	}
	for _, t := range root.Tables("drive", mostChannels) {
		o := Drive{Site: t.Text("site"), Channel: t.Text("channel"), Line: t.Line("channel")}
		d.checkSite(t, "site", o.Site)
		d.checkChannel(t, "drive", o.Channel)
		d.Drives = append(d.Drives, o)
	}
	for _, t := range root.Tables("bias", mostChannels) {
		o := Bias{Site: t.Text("site"), Channel: t.Text("channel"), Axis: t.Choice("axis", OperatorNames(), "Z"), Line: t.Line("channel")}
		d.checkSite(t, "site", o.Site)
		d.checkChannel(t, "bias", o.Channel)
		readMap(t, &o)
		d.Biases = append(d.Biases, o)
	}
	switch n := len(d.Drives) + len(d.Biases); {
	case n == 0:
		root.Fail("drive", "found none, and no bias; allowed: a [[drive]], which names the site and the channel that drives it, or a [[bias]]")
	case n > mostChannels:
		root.Fail("bias", "found %d, and %d drives; allowed: at most %d together", len(d.Biases), len(d.Drives), mostChannels)
	}
	for _, t := range root.Tables("coupling", mostCouplings) {
		d.Couplings = append(d.Couplings, d.readCoupling(t))
	}
	for _, t := range root.Tables("crosstalk", mostCrosstalk) {
		d.Crosstalk = append(d.Crosstalk, d.readCrosstalk(t))
	}
	if err := doc.Err(); err != nil {
		return nil, err
	}
	return d, nil
}

func readSite(t *quantity.Table) Site {
	energy := func(key string, def ...float64) float64 {
		return 2 * math.Pi * t.Quantity(key, quantity.Frequency, -largestDetuning, largestDetuning, def...)
	}
	s := Site{
		Name:      t.Text("name"),
		Levels:    t.Int("levels", 2, mostLevels, 2),
		Zero:      t.Choice("zero", []string{Lower, Upper}, Lower),
		Frequency: t.Quantity("frequency", quantity.Frequency, lowestFrequency, highestFrequency, 0),
		T1:        t.Quantity("T1", quantity.Time, shortestLife, longestLife, 0),
		T2:        t.Quantity("T2", quantity.Time, shortestLife, longestLife, 0),
		Detuning:  energy("detuning", 0),
	}
	kind := Spin
	if s.Levels > 2 {
		kind = Ladder
	}
	s.Kind = t.Choice("kind", []string{Spin, Ladder}, kind)
	// On two levels none of these has an effect, so that a file need not change with the levels.
	foreign := func(keys ...string) {
		for _, key := range keys {
			if t.Has(key) {
				t.Fail(key, "found it on a %s of %d levels; allowed: anharmonicity and higher on a ladder, quadratic on a spin", s.Kind, s.Levels)
			}
		}
	}
	switch {
	case s.Levels == 2:
		s.Anharmonicity, s.Quadratic = energy("anharmonicity", 0), energy("quadratic", 0)
	case s.Kind == Spin:
		foreign("anharmonicity", "higher")
		s.Quadratic = energy("quadratic", 0)
	case t.Has("kind") && !t.Has("anharmonicity"): // the loader's own complaint, so that one about the kind goes first
		t.Fail("anharmonicity", "found nothing; allowed: a frequency, of a ladder of more than two levels")
		foreign("quadratic")
	default:
		s.Anharmonicity = energy("anharmonicity")
		foreign("quadratic")
	}
	if t.Has("higher") && (s.Levels == 2 || s.Kind == Ladder) {
		for _, f := range t.Quantities("higher", mostLevels-3, quantity.Frequency, -largestDetuning, largestDetuning) {
			s.Higher = append(s.Higher, 2*math.Pi*f)
		}
	}
	if s.Kind == Ladder && s.Zero == Upper {
		if s.Levels > 2 {
			t.Fail("zero", "found \"upper\"; allowed: \"lower\" for more than two levels, the ladder stands on |0>")
		} else {
			t.Fail("zero", "found \"upper\"; allowed: \"lower\" for a ladder, it stands on |0>")
		}
	}
	s.Code = readCode(t, s.Levels)
	if s.T1 > 0 && s.T2 > 2*s.T1 {
		t.Fail("T2", "found %s; allowed: at most twice T1, %s", quantity.Format(s.T2, quantity.Time), quantity.Format(2*s.T1, quantity.Time))
	}
	return s
}

// readCode gives the levels of a site's code space.
func readCode(t *quantity.Table, levels int) [2]int {
	code := [2]int{0, 1}
	if !t.Has("code") {
		return code
	}
	list := t.Numbers("code", 2, 0, float64(levels-1))
	if list == nil {
		return code
	}
	if len(list) != 2 || list[0] != math.Trunc(list[0]) || list[1] != math.Trunc(list[1]) || list[0] == list[1] {
		t.Fail("code", "found [%s]; allowed: two levels, whole numbers from 0 to %d, as in [0, 1]", strings.Join(strings.Fields(strings.Trim(fmt.Sprint(list), "[]")), ", "), levels-1)
		return code
	}
	if levels == 2 && list[0] != 0 {
		t.Fail("code", "found [1, 0]; allowed: [0, 1] for two levels (zero says which energy |0> has)")
		return code
	}
	return [2]int{int(list[0]), int(list[1])}
}

// checkChannel complains of a channel that a drive or a bias before has; kind says which of the two asks.
func (d *Device) checkChannel(t *quantity.Table, kind, channel string) {
	where := ""
	for _, o := range d.Drives {
		if o.Channel == channel {
			if where = ", which a [[drive]] has"; kind == "drive" {
				where = " in a second [[drive]]"
			}
		}
	}
	for _, o := range d.Biases {
		if o.Channel == channel {
			where = " in a second [[bias]]"
		}
	}
	if where != "" {
		t.Fail("channel", "found %q%s; allowed: a channel of its own", channel, where)
	}
}

// checkSite complains of a site that the device does not have; ok is false for one.
func (d *Device) checkSite(t *quantity.Table, key, name string) (site int, ok bool) {
	if site, ok = d.Site(name); !ok && len(d.Sites) > 0 {
		t.Fail(key, "found %q; allowed: a site of this device, %s", name, d.siteNames())
	}
	return site, ok
}

// siteNames lists the names of the sites for messages.
func (d *Device) siteNames() string {
	var names []string
	for _, s := range d.Sites {
		names = append(names, s.Name)
	}
	return quoted(names)
}

// quoted lists names as a file does.
func quoted(names []string) string {
	list := make([]string, len(names))
	for i, n := range names {
		list[i] = fmt.Sprintf("%q", n)
	}
	return strings.Join(list, ", ")
}

func (d *Device) readCoupling(t *quantity.Table) Coupling {
	c := Coupling{
		Strength:     2 * math.Pi * t.Quantity("strength", quantity.Frequency, -largestDetuning, largestDetuning),
		RotatingWave: t.Bool("rotating_wave", false),
	}
	switch {
	case t.Has("on") && (t.Has("kind") || t.Has("between")):
		t.Fail("on", "found on beside kind or between; allowed: on alone, or kind with between")
		return c
	case t.Has("on"):
		c.Kind = Product
		on := t.Table("on")
		for _, s := range d.Sites {
			if on.Has(s.Name) {
				c.Sites = append(c.Sites, s.Name)
				c.Axes = append(c.Axes, on.Choice(s.Name, OperatorNames()))
			}
		}
		if len(c.Sites) < 2 {
			on.Fail("", "found %d of the sites; allowed: two or more of %s, each with X, Y or Z, as in { q1 = \"Z\", q2 = \"Z\" }", len(c.Sites), d.siteNames())
			return c
		}
	case t.Has("kind") || t.Has("between"):
		c.Kind = t.Choice("kind", []string{Exchange, Heisenberg, Dipolar, Dispersive})
		c.Sites = t.Texts("between", 2)
		if c.Sites == nil {
			return c
		}
		if len(c.Sites) != 2 || c.Sites[0] == c.Sites[1] {
			t.Fail("between", "found [%s]; allowed: two sites of this device, as in [\"q1\", \"q2\"]", quoted(c.Sites))
			return c
		}
		for _, name := range c.Sites {
			if _, ok := d.checkSite(t, "between", name); !ok {
				return c
			}
		}
	default:
		t.Fail("", "found neither on nor kind; allowed: on, as in { q1 = \"Z\", q2 = \"Z\" }, or kind with between")
		return c
	}
	var with, without []string
	for _, name := range c.Sites {
		if s, _ := d.Site(name); d.Sites[s].Frequency > 0 {
			with = append(with, name)
		} else {
			without = append(without, name)
		}
	}
	switch {
	case len(with) > 0 && len(without) > 0:
		t.Fail("", "found a frequency for %q and none for %q; allowed: a frequency for each site of a coupling, or for none (the coupling then is what it is in their frames)", with[0], without[0])
	case c.RotatingWave && len(with) == 0:
		t.Fail("rotating_wave", "found true for sites without a frequency; allowed: true where each of them states its frequency, for otherwise nothing turns")
	}
	return c
}

func (d *Device) readCrosstalk(t *quantity.Table) Crosstalk {
	c := Crosstalk{
		Channel: t.Text("channel"),
		Site:    t.Text("site"),
		Share:   t.Quantity("share", quantity.Ratio, -largestShare, largestShare),
		Phase:   t.Quantity("phase", quantity.Angle, -2*math.Pi, 2*math.Pi, 0),
	}
	own, drive, ok := d.aim(c.Channel)
	if !ok {
		var names []string
		for _, name := range d.Channels() {
			names = append(names, fmt.Sprintf("%q", name))
		}
		if len(names) > 0 {
			t.Fail("channel", "found %q; allowed: a channel of a [[drive]] or a [[bias]], %s", c.Channel, strings.Join(names, ", "))
		}
		return c
	}
	site, ok := d.checkSite(t, "site", c.Site)
	switch {
	case !ok:
	case site == own:
		t.Fail("site", "found %q, the site that %q is meant for; allowed: another site", c.Site, c.Channel)
	case slices.ContainsFunc(d.Crosstalk, func(o Crosstalk) bool { return o.Channel == c.Channel && o.Site == c.Site }):
		t.Fail("site", "found %q a second time for %q; allowed: each site once for a channel", c.Site, c.Channel)
	case d.Map(c.Channel) != nil:
		t.Fail("channel", "found %q, whose bias has a polynomial or a loop; allowed: a channel without (what reaches another site has a map of its own)", c.Channel)
	case drive < 0 && c.Phase != 0:
		t.Fail("phase", "found %s for %q, a bias; allowed: no phase, as it has no carrier (a share may be negative)", quantity.Format(c.Phase, quantity.Angle), c.Channel)
	case drive >= 0 && (d.Sites[site].Frequency > 0) != (d.Sites[own].Frequency > 0):
		t.Fail("", "found a frequency for one of %q and %q only; allowed: a frequency for both, or for neither (the field then turns with both)", d.Sites[own].Name, c.Site)
	}
	return c
}

// Dim gives the dimension of the device's space, the product of the levels of its sites.
func (d *Device) Dim() int {
	dim := 1
	for _, s := range d.Sites {
		dim *= s.Levels
	}
	return dim
}

// Levels gives the number of levels of each site.
func (d *Device) Levels() []int {
	levels := make([]int, len(d.Sites))
	for i, s := range d.Sites {
		levels[i] = s.Levels
	}
	return levels
}

// Site finds a site by its name.
func (d *Device) Site(name string) (site int, ok bool) {
	site = slices.IndexFunc(d.Sites, func(s Site) bool { return s.Name == name })
	return max(site, 0), site >= 0
}

// CodeSpace gives the basis states of the device that are code states: 2^n of them for n sites, in the order 0...00, 0...01, 0...10, ... of the
// sites' code states, the first site slowest.
func (d *Device) CodeSpace() []int {
	states := []int{0}
	for _, s := range d.Sites {
		code := s.code()
		next := make([]int, 0, 2*len(states))
		for _, b := range states {
			next = append(next, b*s.Levels+code[0], b*s.Levels+code[1])
		}
		states = next
	}
	return states
}

func (s *Site) code() [2]int {
	if s.Code == [2]int{} {
		return [2]int{0, 1}
	}
	return s.Code
}

// ladder reports whether operators and energies are those of a ladder. Two levels are those of a spin in any case.
func (s *Site) ladder() bool { return s.Levels > 2 && s.Kind != Spin }

// number gives the number of a level above the ground state.
func (s *Site) number(level int) int {
	if s.Zero == Upper {
		return s.Levels - 1 - level
	}
	return level
}

// frame gives how fast the site's frame turns, rad/ns; 0 for a site that states no frequency.
func (s *Site) frame() float64 {
	if s.Frequency == 0 {
		return 0
	}
	return 2*math.Pi*s.Frequency - s.Detuning
}

// Offset gives the factor of Z/2 in H0, rad/ns: the detuning with the sign that Zero gives it.
func (s *Site) Offset() float64 {
	if s.Zero == Lower {
		return 0 - s.Detuning // 0 and not -0
	}
	return s.Detuning
}

// static gives the site's own Hamiltonian without drives and errors; see Device.Static.
func (s *Site) static() Matrix {
	m := Zero(s.Levels)
	switch {
	case s.Levels == 2:
		z, _ := Operator("Z")
		return z.Scale(complex(s.Offset()/2, 0))
	case s.ladder():
		for n := range s.Levels {
			e := float64(n)*s.Detuning + float64(n*(n-1))/2*s.Anharmonicity
			choose := float64(n*(n-1)) / 2
			for i, h := range s.Higher {
				choose *= float64(n-2-i) / float64(i+3) // C(n, i+3); 0 from n < i+3 on
				e += choose * h
			}
			m.Data[n*s.Levels+n] = complex(e, 0)
		}
	default:
		for k := range s.Levels {
			z := float64(s.Levels-1)/2 - float64(k) // of Sz: s first
			e := s.Offset()*z + s.Quadratic*(z*z-float64(s.Levels*s.Levels-1)/12)
			m.Data[k*s.Levels+k] = complex(e, 0)
		}
	}
	return m
}

// Static gives the Hamiltonian without drives and errors, rad/ns, of the whole device: of each site, and of the couplings what does not turn
// in the sites' frames.
//
// Of two levels the energies are w/2 and -w/2 with w the transition, and |0> is the +1 state of Z: in a frame that turns with the drive a
// transition above it by Detuning leaves Detuning Z/2 when |0> has the upper energy, and -Detuning Z/2 when it has the lower. A ladder has
//
//	E_n = Detuning n + Anharmonicity C(n, 2) + Higher[0] C(n, 3) + ...
//
// and a spin s of more levels, with level 0 the state m = s, the same sign times Detuning Sz, and Quadratic (Sz^2 - s(s+1)/3).
func (d *Device) Static() Matrix {
	if len(d.Sites) == 1 {
		return d.Sites[0].static()
	}
	m, _, _ := d.frames()
	for i := range d.Sites {
		m = m.Add(1, d.Embed(map[int]Matrix{i: d.Sites[i].static()}))
	}
	return m
}

// Channels lists the channels that act on the device: of the drives in the order of the file, then of the biases.
func (d *Device) Channels() []string {
	var names []string
	for _, o := range d.Drives {
		names = append(names, o.Channel)
	}
	for _, o := range d.Biases {
		names = append(names, o.Channel)
	}
	return names
}
