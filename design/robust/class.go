package robust

import (
	"fmt"
	"math"
	"slices"

	"holdfast/design/dynamics"
)

// A Node is a frequency, rad/ns, of a quadrature over the spectrum of a noise, and its
// weight, in units of λ squared.
type Node struct{ Frequency, Weight float64 }

// Kind tells the sorts of errors apart.
type Kind int

// The sorts.
const (
	Static    Kind = iota // H += λ V·σ, V constant
	Amplitude             // what arrives at the device is scaled by 1+λ
	Any                   // every static error: all three directions
	Mixed                 // the controls u become u + λ Mix u: one quadrature, a skew angle, crosstalk
	Line                  // a parameter of a line: the controls become u + λ v, v the response of a line of its own
)

// A Class is a set of errors to be held against.
type Class struct {
	Name   string
	Kind   Kind
	Vector dynamics.Vec // kind Static: V, any length but zero
	// Operators are, for more levels than a spin's, the V of kind Static, one, and of
	// kind Any; H += λ V. Factors are the sizes that they have beside each other,
	// of root mean square 1; nil for ones.
	Operators [][]complex128
	Factors   []float64
	// Leak asks of kind Any, for what couples the code space to the rest, that the first
	// order move nothing out of it.
	Leak   bool
	Mix    [][]float64 // kind Mixed: row by control that is moved, column by control that moves it
	Weight float64     // of its residuals; the gate itself has 1
	// Order is how far the error is to be cancelled: 1, the zero value's meaning too, or
	// 2, whereafter the infidelity begins with the sixth power of the error.
	Order int
	// Values are sizes of the error, as Size, over which the exact infidelity is to be low,
	// in the place of any order; Shares are their weights, of sum 1.
	Values, Shares []float64
	// Worst says that it is the largest infidelity over Values that counts.
	Worst bool
	// Noise lets the error, of kind Static or Amplitude, fluctuate in the place of being held
	// to an order: what it leaves of 1 - F_pro is the sum over nodes of Weight times the filter function at Frequency,
	// || ∫ V_I e^{iwt} dt ||²/d (Green, Sastrawan, Uys, Biercuk 2013, New J. Phys. 15, 095004). Known to LevelsGate alone.
	Noise []Node
	// Size is the largest error that the refinement looks at: of a spin's static errors the length of the
	// field it adds in rad/ns (a detuning of 1 MHz is 2π 1e-3), else λ. Zero keeps the class out of the refinement.
	Size float64
	// OneSided leaves the opposite directions of kind Any out of the ensemble: half
	// the work while the second order, which is even in the error, rules.
	OneSided bool
}

// borne says whether an error of the kind rides on the controls.
func (k Kind) borne() bool { return k == Amplitude || k == Mixed || k == Line }

// heldWeight is the weight of what the first order leaves.
func (c *Class) heldWeight() float64 {
	if c.Values != nil || c.Noise != nil {
		return 0
	}
	return c.Weight
}

// at is the error of a size, of a class of one error.
func (c *Class) at(size float64) member {
	switch c.Kind {
	case Static:
		return member{offset: scaled(unit(c.Vector), size), scale: 1}
	case Amplitude:
		return member{scale: 1 + size}
	}
	return member{scale: 1, lambda: size}
}

// spread lists the errors of Values, each with the root of its share as the weight of its residuals.
func (c *Class) spread() (list []member, factors []float64) {
	for i, x := range c.Values {
		list, factors = append(list, c.at(x)), append(factors, c.Weight*math.Sqrt(c.Shares[i]))
	}
	return list, factors
}

// member is one finite error of an ensemble: a field that is added, and a scale
// or, for the other errors that ride on the controls, a λ.
type member struct {
	offset dynamics.Vec // rad/ns
	scale  float64
	lambda float64
}

// The second order in an error λV is what second differences of exact gates leave, the
// third and higher orders extrapolated away: with x the angle that λ turns at most, and
// D(x) = ( m(x) + m(-x) - 2 m(0) ) / 2x² of the residuals m, it is (4 D(x/2) - D(x))/3,
// wrong by some x⁴/100 and by the rounding of m over x².
const secondAngle = 0.1 // x, rad

// secondPoints are the errors of the differences, in units of x.
var secondPoints = [4]float64{1, -1, 0.5, -0.5}

// secondDifference combines them, gates first to first+3, with the nominal gate.
func secondDifference(first int, weight float64) blend {
	const f = 1 / (secondAngle * secondAngle)
	b := blend{gates: []int{0}, factors: []float64{-5 * f * weight}}
	for i, c := range [4]float64{-1. / 6, -1. / 6, 8. / 3, 8. / 3} {
		b.gates, b.factors = append(b.gates, first+i), append(b.factors, c*f*weight)
	}
	return b
}

// ways lists the directions of the second order of a spin's class, each a finite error
// of x times its argument in a window of span ns with controls of rate full: of all
// static errors also the pairs, as the order is quadratic in the error.
func (c Class) ways(span, full float64) (list []func(f float64) member) {
	x := secondAngle
	switch c.Kind {
	case Static, Any:
		vectors := []dynamics.Vec{unit(c.Vector)}
		if c.Kind == Any {
			h := math.Sqrt2 / 2
			vectors = []dynamics.Vec{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}, {h, h, 0}, {h, 0, h}, {0, h, h}}
		}
		for _, v := range vectors {
			list = append(list, func(f float64) member { return member{offset: scaled(v, f*x/span), scale: 1} })
		}
	case Amplitude:
		list = append(list, func(f float64) member { return member{scale: 1 + f*x/(span*full)} })
	default:
		list = append(list, func(f float64) member { return member{scale: 1, lambda: f * x / (span * full)} })
	}
	return list
}

// ensemble returns the finite errors of a class: both signs of its size, or for
// Any its size along the Directions; none of a class that has Values of its own.
func (c Class) ensemble() []member {
	if c.Size == 0 || c.Values != nil || c.Noise != nil {
		return nil
	}
	switch c.Kind {
	case Static:
		v := unit(c.Vector)
		return []member{{offset: scaled(v, c.Size), scale: 1}, {offset: scaled(v, -c.Size), scale: 1}}
	case Amplitude:
		return []member{{scale: 1 + c.Size}, {scale: 1 - c.Size}}
	case Mixed, Line:
		return []member{{scale: 1, lambda: c.Size}, {scale: 1, lambda: -c.Size}}
	}
	along := Directions()
	if c.OneSided {
		along = half()
	}
	var list []member
	for _, d := range along {
		list = append(list, member{offset: scaled(d, c.Size), scale: 1})
	}
	return list
}

// Directions returns 14 unit vectors spread over the sphere: the six along the
// axes and the eight along the diagonals, each followed by its opposite.
func Directions() []dynamics.Vec {
	var list []dynamics.Vec
	for _, v := range half() {
		list = append(list, v, scaled(v, -1))
	}
	return list
}

func half() []dynamics.Vec {
	r := 1 / math.Sqrt(3)
	return []dynamics.Vec{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}, {r, r, r}, {r, r, -r}, {r, -r, r}, {r, -r, -r}}
}

func unit(v dynamics.Vec) dynamics.Vec {
	return scaled(v, 1/math.Sqrt(v[0]*v[0]+v[1]*v[1]+v[2]*v[2]))
}

func scaled(v dynamics.Vec, f float64) dynamics.Vec {
	return dynamics.Vec{f * v[0], f * v[1], f * v[2]}
}

// inWords writes a direction, which is as good as its opposite, such as
// "0.83 X + 0.41 Y": the largest component is positive, those under 0.05, and all but
// the six largest, are left out.
func inWords(v []float64, names []string) string {
	sizes := make([]float64, len(v))
	lead := 0
	for i, x := range v {
		if sizes[i] = math.Abs(x); sizes[i] > math.Abs(v[lead]) {
			lead = i
		}
	}
	sign := math.Copysign(1, v[lead])
	slices.Sort(sizes)
	least := math.Max(0.05, sizes[max(0, len(sizes)-6)])
	text := ""
	for i, x := range v {
		if x *= sign; math.Abs(x) < least {
			continue
		}
		switch {
		case text == "" && x < 0:
			text = "-"
		case text != "" && x < 0:
			text += " - "
		case text != "":
			text += " + "
		}
		text += fmt.Sprintf("%.2f %s", math.Abs(x), names[i])
	}
	return text
}
