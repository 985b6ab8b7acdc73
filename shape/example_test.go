package shape_test

import (
	"errors"
	"fmt"
	"math"

	"holdfast/shape"
)

// A span of 64 samples of 1 ns, the last 4 held at zero, and a band of 100 MHz.
func ExampleSlepian() {
	basis, err := shape.Slepian(64, 0, 4, 0.1, 0)
	if err != nil {
		fmt.Println(err)
		return
	}
	inside, outside, err := basis.Concentration(0.1)
	if err != nil {
		fmt.Println(err)
		return
	}
	last := basis.Count - 1
	fmt.Printf("%d coefficients\n", basis.Count)
	fmt.Printf("outside the band: first %.2g, last %.2g\n", outside[0], outside[last])
	fmt.Printf("inside the band: last %.4f\n", inside[last])
	// Output:
	// 11 coefficients
	// outside the band: first 7e-16, last 0.075
	// inside the band: last 0.9255
}

// A quarter turn at a full scale of 40 MHz and 1 GS/s, amplitude up to 95 %,
// slew up to 25 % a sample.
func ExampleRampedSquare() {
	area := (math.Pi / 2) / (2 * math.Pi * 0.04)
	fmt.Printf("%.5f\n", shape.RampedSquare(area, 0.95, 0.25))
	// Output:
	// [0.22321 0.44643 0.66964 0.89286 0.89286 0.89286 0.89286 0.66964 0.44643 0.22321]
}

func ExampleSCROFULOUS() {
	segments, err := shape.SCROFULOUS(math.Pi / 2)
	if err != nil {
		fmt.Println(err)
		return
	}
	for _, s := range segments {
		fmt.Printf("%.1f deg at %.1f deg\n", s.Angle*180/math.Pi, s.Phase*180/math.Pi)
	}
	// Output:
	// 115.2 deg at 62.0 deg
	// 180.0 deg at -79.4 deg
	// 115.2 deg at 62.0 deg
}

// What normal coefficients leave outside the band, and the steps from zero
// that they ask for: the same span as a plain and as a tapered series, and as splines.
func ExampleBasis_OutOfBand() {
	fourier, err1 := shape.Fourier(112, 0, 4, 0.1, 0)
	tapered, err2 := shape.TaperedFourier(112, 0, 4, 0.1, 0)
	spline, err3 := shape.BSpline(112, 0, 4, 0.1, 0, 0)
	if err := errors.Join(err1, err2, err3); err != nil {
		fmt.Println(err)
		return
	}
	for _, b := range []*shape.Basis{fourier, tapered, spline} {
		e, err := b.OutOfBand(0.1)
		if err != nil {
			fmt.Println(err)
			return
		}
		var mean, first float64
		for j := range b.Count {
			mean += e[j*b.Count+j] / float64(b.Count)
			first = math.Hypot(first, b.Column(j)[0])
		}
		fmt.Printf("%s: %d coefficients, %.2f %% outside, first sample %.2f\n", b.Family, b.Count, 100*mean, first)
	}
	// Output:
	// fourier: 20 coefficients, 0.67 % outside, first sample 0.20
	// tapered-fourier: 19 coefficients, 0.20 % outside, first sample 0.03
	// b-spline: 20 coefficients, 3.02 % outside, first sample 0.05
}

// An AC-coupled line passes sequences of zero mean.
func ExampleZeroMean() {
	all, err := shape.Slepian(64, 0, 4, 0.1, 0)
	if err != nil {
		fmt.Println(err)
		return
	}
	basis, err := shape.ZeroMean(all)
	if err != nil {
		fmt.Println(err)
		return
	}
	var sum float64
	for _, x := range basis.Apply([]float64{3, 1, 4, 1, 5, 9, 2, 6, 5, 3}, nil) {
		sum += x
	}
	fmt.Printf("%d of %d coefficients, sum under 1e-13: %v\n", basis.Count, all.Count, math.Abs(sum) < 1e-13)
	// Output:
	// 10 of 11 coefficients, sum under 1e-13: true
}

// The raised cosine of a half turn, 40 MHz and 1 GS/s, on a ladder of -200 MHz.
func ExampleDerivativeCorrection() {
	turn, anharmonicity := 2*math.Pi*0.04, -2*math.Pi*0.2
	x := shape.RaisedCosine(math.Pi/turn, 0.95, 0.25)
	_, quadrature, err := shape.DerivativeCorrection(x, turn, anharmonicity)
	if err != nil {
		fmt.Println(err)
		return
	}
	fmt.Printf("%d samples\n%.3f\n%.3f\n", len(x), x[:5], quadrature[:5])
	// Output:
	// 27 samples
	// [0.003 0.028 0.076 0.145 0.231]
	// [0.006 0.015 0.023 0.031 0.037]
}
