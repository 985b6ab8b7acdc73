package robust

import (
	"fmt"
	"math"

	"holdfast/design/dynamics"
)

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
	// Operator is V of kind Static for more levels than two, where Vector is (0, 0, 1):
	// its length and sign along Operator are all that is asked of it.
	Operator []complex128
	Mix      [][]float64 // kind Mixed: row by control that is moved, column by control that moves it
	Weight   float64     // of its residuals; the gate itself has 1
	// Size is the largest error that the refinement looks at: the length of the
	// field it adds in rad/ns (a detuning of 1 MHz is 2π 1e-3), or λ for errors of
	// the controls. Zero keeps the class out of the refinement.
	Size float64
	// OneSided leaves the opposite directions of kind Any out of the ensemble: half
	// the work while the second order, which is even in the error, rules.
	OneSided bool
}

// borne says whether an error of the kind rides on the controls.
func (k Kind) borne() bool { return k == Amplitude || k == Mixed || k == Line }

// member is one finite error of an ensemble: a field that is added, and a scale
// or, for the other errors that ride on the controls, a λ.
type member struct {
	offset dynamics.Vec // rad/ns
	scale  float64
	lambda float64
}

// ensemble returns the finite errors of a class: both signs of its size, or for
// Any its size along the Directions.
func (c Class) ensemble() []member {
	if c.Size == 0 {
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
// "0.83 X + 0.41 Y": the largest component is positive, those under 0.05 are
// left out.
func inWords(v dynamics.Vec) string {
	lead := 0
	for i := range v {
		if math.Abs(v[i]) > math.Abs(v[lead]) {
			lead = i
		}
	}
	if v[lead] < 0 {
		v = scaled(v, -1)
	}
	text := ""
	for i, x := range v {
		if math.Abs(x) < 0.05 {
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
		text += fmt.Sprintf("%.2f %c", math.Abs(x), "XYZ"[i])
	}
	return text
}
