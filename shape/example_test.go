package shape_test

import (
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
