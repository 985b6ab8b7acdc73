package shape

import (
	"fmt"
	"math"
)

// References of this file:
//
//	[motzoi] F. Motzoi, J. M. Gambetta, P. Rebentrost, F. K. Wilhelm, Simple
//	         pulses for elimination of leakage in weakly nonlinear qubits, Phys. Rev.
//	         Lett. 103, 110501 (2009).

// DerivativeCorrection returns the two quadratures that keep the envelope x from
// exciting the next level of an anharmonic ladder, to first order and with a carrier of
// fixed frequency ([motzoi]): with O = turn x,
//
//	O_x = O,  O_y = -O'/(2 a),
//
// for the drive (O_x (b + b') + O_y i (b' - b))/2 of a ladder with lowering
// operator b and static part a n (n-1)/2. It cancels most of the phase error that
// the level shift makes, where [FullDerivativeCorrection] cancels the leakage as well.
//
// x holds shares of full scale, one per sample period; turn is the full-scale rate
// times the period and anharmonicity is a times the period, both in rad per
// sample, turn positive and anharmonicity not zero; of a transmon-like ladder a
// is negative. The derivative is the central difference per sample, with zero outside x; for an
// envelope that is smooth and starts and ends at zero it is off by a sixth
// of the third derivative.
// Neither quadrature is checked against amplitude or slew. Anything that is not
// finite, no samples or more than MaxSamples, is an error.
//
// A drive whose Y acts as -Y (see the mixing sign of the instrument) takes -quadrature.
func DerivativeCorrection(x []float64, turn, anharmonicity float64) (inPhase, quadrature []float64, err error) {
	if err := checkCorrection(x, turn, anharmonicity); err != nil {
		return nil, nil, err
	}
	inPhase = append(inPhase, x...)
	return inPhase, derivative(x, -1/(2*anharmonicity)), nil
}

// FullDerivativeCorrection returns the full correction of first order ([motzoi]),
// which shifts the carrier as well: with O = turn x,
//
//	O_x = O - O^3/(4 a^2),  O_y = -O'/a,  H gains d n with d = -O^2/(2 a).
//
// inPhase and quadrature are shares of full scale; detuning is d in rad per sample, to
// be played as frequency or, as the angle sum of d so far by which the phase of
// the drive advances, by turning (inPhase + i quadrature) by it; what angle remains at the end
// is a rotation about Z left to the frame. d n is opposite in sign to d Z/2.
//
// Arguments and errors are those of [DerivativeCorrection].
func FullDerivativeCorrection(x []float64, turn, anharmonicity float64) (inPhase, quadrature, detuning []float64, err error) {
	if err := checkCorrection(x, turn, anharmonicity); err != nil {
		return nil, nil, nil, err
	}
	inPhase, detuning = make([]float64, len(x)), make([]float64, len(x))
	for k, v := range x {
		ratio := turn * v / anharmonicity
		inPhase[k] = v * (1 - ratio*ratio/4)
		detuning[k] = -turn * v * ratio / 2
	}
	return inPhase, derivative(x, -1/anharmonicity), detuning, nil
}

// derivative is the central difference of x per sample, times factor.
func derivative(x []float64, factor float64) []float64 {
	d := make([]float64, len(x))
	for k := range x {
		var before, after float64
		if k > 0 {
			before = x[k-1]
		}
		if k+1 < len(x) {
			after = x[k+1]
		}
		d[k] = factor * (after - before) / 2
	}
	return d
}

// checkCorrection refuses what has no correction.
func checkCorrection(x []float64, turn, anharmonicity float64) error {
	if _, err := freeSamples(len(x), 0, 0); err != nil {
		return err
	}
	for k, v := range x {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return fmt.Errorf("shape: sample %d is %v; allowed: finite samples", k, v)
		}
	}
	switch {
	case !(turn > 0) || math.IsInf(turn, 0):
		return fmt.Errorf("shape: a full scale of %v rad per sample; allowed: over 0 and finite", turn)
	case !(math.Abs(anharmonicity) > 0) || math.IsInf(anharmonicity, 0):
		return fmt.Errorf("shape: an anharmonicity of %v rad per sample; allowed: finite and not 0", anharmonicity)
	}
	return nil
}
