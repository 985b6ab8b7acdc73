package device

import (
	"fmt"
	"math"
	"strings"

	"holdfast/hardware/quantity"
)

// Device is what is driven, as its file describes it.
type Device struct {
	File   string // as the caller of Load named it
	Name   string
	Sites  []Site
	Drives []Drive
	Biases []Bias
}

// Site is one spin, or one ladder of more levels.
type Site struct {
	Name      string
	Levels    int     // 2, a spin, or more, an anharmonic ladder
	Zero      string  // Lower or Upper: which of the two energies |0> has
	Frequency float64 // of the transition, GHz, cyclic; 0 when not stated
	T1, T2    float64 // ns; 0 when not stated; T2 <= 2 T1 where both are
	Detuning  float64 // static, of the transition from the frame of the drive, rad/ns, positive above it: H0 = Detuning Z/2 when |0> is Upper, -Detuning Z/2 when it is Lower
	// Anharmonicity of a ladder, rad/ns: by how much the 1-2 transition lies above the 0-1 one; of no effect on two levels.
	Anharmonicity float64
}

// The energies that |0> may have.
const (
	Lower = "lower"
	Upper = "upper"
)

// Drive says which channel of the hardware profile drives which site.
type Drive struct {
	Site, Channel string
	Line          int // of the channel's key in the device file, for messages
}

// Bias says which baseband channel of the hardware profile turns which site about which axis: H += u O/2, with u what arrives and O the Axis.
type Bias struct {
	Site, Channel string
	Axis          string // X, Y or Z
	Line          int    // of the channel's key in the device file, for messages
}

// The ranges of a site's figures, in the units of quantity.Parse.
const (
	lowestFrequency, highestFrequency = 1e-9, 1e4 // 1 Hz to 10 THz
	shortestLife, longestLife         = 1, 1e15   // 1 ns to 1e6 s
	largestDetuning                   = 1         // 1 GHz
	mostEntries                       = 64        // of one list, before the loader looks at it
	mostBiases                        = 8
	mostLevels                        = 8
)

// oneSpin says what this version leaves out.
const oneSpin = "this version plays one site"

// Load reads a device file. Errors are an *quantity.Error: one sentence with file, line and key.
//
//	format = 1
//	name = "..."
//	[[site]]
//	name = "q1"
//	levels = 2                # 2 to 8; default 2
//	anharmonicity = "-220 MHz" # of a ladder of more than two levels: 1-2 transition less 0-1
//	zero = "lower"            # or "upper": which energy |0> has; default "lower"
//	frequency = "5.1 GHz"     # optional
//	detuning = "0 Hz"         # static, of the transition from the frame of the drive; default 0
//	T1 = "80 us"              # optional
//	T2 = "60 us"              # optional; at most 2 T1
//	[[drive]]
//	site = "q1"
//	channel = "q1 drive"      # a quadrature channel of the hardware profile
//	[[bias]]                  # up to 8; at least one drive or bias
//	site = "q1"
//	channel = "q1 flux"       # a baseband channel of the hardware profile; its own for each
//	axis = "Z"                # or "X", "Y"; default "Z"
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
	for i, t := range root.Tables("site", mostEntries) {
		d.Sites = append(d.Sites, readSite(t))
		if i == 1 {
			t.Fail("", "found a second site; allowed: one [[site]] (%s)", oneSpin)
		}
	}
	if len(d.Sites) == 0 {
		root.Fail("site", "found none; allowed: one [[site]] (%s)", oneSpin)
	}
	for i, t := range root.Tables("drive", mostEntries) {
		d.Drives = append(d.Drives, readDrive(t, d.Sites))
		if i == 1 {
			t.Fail("", "found a second drive; allowed: one [[drive]] (%s)", oneSpin)
		}
	}
	for _, t := range root.Tables("bias", mostBiases) {
		d.Biases = append(d.Biases, readBias(t, d))
	}
	if len(d.Drives)+len(d.Biases) == 0 {
		root.Fail("drive", "found none, and no bias; allowed: one [[drive]], which names the site and the channel that drives it, or a [[bias]] (%s)", oneSpin)
	}
	if err := doc.Err(); err != nil {
		return nil, err
	}
	return d, nil
}

func readSite(t *quantity.Table) Site {
	s := Site{
		Name:      t.Text("name"),
		Levels:    t.Int("levels", 2, mostLevels, 2),
		Zero:      t.Choice("zero", []string{Lower, Upper}, Lower),
		Frequency: t.Quantity("frequency", quantity.Frequency, lowestFrequency, highestFrequency, 0),
		T1:        t.Quantity("T1", quantity.Time, shortestLife, longestLife, 0),
		T2:        t.Quantity("T2", quantity.Time, shortestLife, longestLife, 0),
		Detuning:  2 * math.Pi * t.Quantity("detuning", quantity.Frequency, -largestDetuning, largestDetuning, 0),
	}
	if s.Levels > 2 {
		s.Anharmonicity = 2 * math.Pi * t.Quantity("anharmonicity", quantity.Frequency, -largestDetuning, largestDetuning)
		if s.Zero == Upper {
			t.Fail("zero", "found \"upper\"; allowed: \"lower\" for more than two levels, the ladder stands on |0>")
		}
	} else { // of no effect, so that a file need not change with the levels
		s.Anharmonicity = 2 * math.Pi * t.Quantity("anharmonicity", quantity.Frequency, -largestDetuning, largestDetuning, 0)
	}
	if s.T1 > 0 && s.T2 > 2*s.T1 {
		t.Fail("T2", "found %s; allowed: at most twice T1, %s", quantity.Format(s.T2, quantity.Time), quantity.Format(2*s.T1, quantity.Time))
	}
	return s
}

func readDrive(t *quantity.Table, sites []Site) Drive {
	d := Drive{Site: t.Text("site"), Channel: t.Text("channel"), Line: t.Line("channel")}
	checkSite(t, d.Site, sites)
	return d
}

func readBias(t *quantity.Table, d *Device) Bias {
	b := Bias{Site: t.Text("site"), Channel: t.Text("channel"), Axis: t.Choice("axis", OperatorNames(), "Z"), Line: t.Line("channel")}
	checkSite(t, b.Site, d.Sites)
	for _, o := range d.Drives {
		if o.Channel == b.Channel {
			t.Fail("channel", "found %q, which a [[drive]] has; allowed: a channel of its own", b.Channel)
		}
	}
	for _, o := range d.Biases {
		if o.Channel == b.Channel {
			t.Fail("channel", "found %q in a second [[bias]]; allowed: a channel of its own", b.Channel)
		}
	}
	return b
}

// checkSite complains of a site that the device does not have.
func checkSite(t *quantity.Table, name string, sites []Site) {
	var names []string
	for _, s := range sites {
		if s.Name == name {
			return
		}
		names = append(names, fmt.Sprintf("%q", s.Name))
	}
	if len(names) > 0 {
		t.Fail("site", "found %q; allowed: a site of this device, %s", name, strings.Join(names, ", "))
	}
}

// Dim gives the dimension of the device's space, the product of the levels of its sites.
func (d *Device) Dim() int {
	dim := 1
	for _, s := range d.Sites {
		dim *= s.Levels
	}
	return dim
}

// Static gives the Hamiltonian without drives and errors, rad/ns, of the one site. Of two levels the energies are w/2 and -w/2 with w
// the transition, and |0> is the +1 state of Z: in a frame that turns with the drive a transition above it by Detuning leaves Detuning Z/2
// when |0> has the upper energy, and -Detuning Z/2 when it has the lower. A ladder of more has Detuning n + Anharmonicity n(n-1)/2.
func (d *Device) Static() Matrix {
	s := &d.Sites[0]
	if s.Levels == 2 {
		z, _ := Operator("Z")
		return z.Scale(complex(s.Offset()/2, 0))
	}
	m := Zero(s.Levels)
	for n := range s.Levels {
		m.Data[n*s.Levels+n] = complex(float64(n)*s.Detuning+float64(n*(n-1))/2*s.Anharmonicity, 0)
	}
	return m
}

// Lift gives what an operator x X + y Y + z Z, given on two levels, means on the site: itself on two levels, and on a ladder
//
//	x (a + a') + y i(a' - a) - 2 z n,
//
// with a the lowering operator and n the number of the level: the 0-1 block is the operator itself, up to its trace.
func (d *Device) Lift(m Matrix) Matrix {
	levels := d.Sites[0].Levels
	if levels == 2 {
		return m
	}
	l := Zero(levels)
	z := real(m.At(0, 0)-m.At(1, 1)) / 2
	for n := range levels {
		l.Data[n*levels+n] = complex(-2*z*float64(n), 0)
		if n+1 < levels {
			r := complex(math.Sqrt(float64(n+1)), 0)
			l.Data[n*levels+n+1], l.Data[(n+1)*levels+n] = r*m.At(0, 1), r*m.At(1, 0)
		}
	}
	return l
}

// Offset gives the factor of Z/2 in H0, rad/ns: the detuning with the sign that Zero gives it.
func (s *Site) Offset() float64 {
	if s.Zero == Lower {
		return 0 - s.Detuning // 0 and not -0
	}
	return s.Detuning
}

// BiasOperator gives what bias number bias multiplies, so that H += u times it: half the operator of its axis.
func (d *Device) BiasOperator(bias int) Matrix {
	o, _ := Operator(d.Biases[bias].Axis)
	return d.Lift(o.Scale(0.5))
}

// ShiftOperator gives what a drive-induced shift of a site multiplies, Z/2 whichever energy |0> has: H += kappa |u|^2 Z/2 with kappa in
// rad/ns, of the profile, and u in shares of full scale.
func (d *Device) ShiftOperator() Matrix {
	z, _ := Operator("Z")
	return d.Lift(z.Scale(0.5))
}

// Operators gives what the two quadratures of drive number drive multiply, so that H += u_I ops[0] + u_Q ops[1]: X/2, and Y/2 with a
// sign, lifted to the site's levels. Mixing is that of its channel in the hardware profile.
//
// With +Y/2, u = u_I + i u_Q multiplies |1><0|/2. If |0> is the lower state that raises the energy by w and goes with e^{-iwt}: the carrier
// is Re[u e^{-iwt}] = I cos wt + Q sin wt. If |0> is the upper one it goes with e^{+iwt}, and the carrier is I cos wt - Q sin wt. With the
// other mixing the field turns the other way, and Q acts by -Y/2.
func (d *Device) Operators(drive int, mixing string) [2]Matrix {
	x, _ := Operator("X")
	y, _ := Operator("Y")
	zero := Lower
	for _, s := range d.Sites {
		if s.Name == d.Drives[drive].Site {
			zero = s.Zero
		}
	}
	sign := complex128(-1)
	if (mixing == "I cos + Q sin") == (zero == Lower) {
		sign = 1
	}
	return [2]Matrix{d.Lift(x.Scale(0.5)), d.Lift(y.Scale(sign * 0.5))}
}
