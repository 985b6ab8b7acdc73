package shape

import (
	"encoding/json"
	"os"
	"strconv"
	"testing"
)

// reference is what testdata/shape/reference.py printed: general libraries
// (their versions stand in MadeWith) and 60-digit arithmetic.
type reference struct {
	MadeWith  string `json:"made_with"`
	Sequences []struct {
		N       int
		W       float64
		Columns [][]float64
		Ratios  []float64
	}
	Concentration []struct {
		N       int
		W       float64
		Outside []decimal
	}
	Composite []struct {
		Name           string
		Degrees        float64
		Segments       [][2]float64
		AmplitudeOrder int `json:"amplitude_order"`
		Amplitude      float64
		DetuningOrder  int `json:"detuning_order"`
		Detuning       float64
	}
}

// decimal is a number written as text, because it has more digits than JSON readers promise.
type decimal float64

func (d *decimal) UnmarshalText(text []byte) error {
	v, err := strconv.ParseFloat(string(text), 64)
	*d = decimal(v)
	return err
}

func readReference(t *testing.T) *reference {
	t.Helper()
	data, err := os.ReadFile("../testdata/shape/reference.json")
	if err != nil {
		t.Fatal(err)
	}
	var r reference
	if err := json.Unmarshal(data, &r); err != nil {
		t.Fatal(err)
	}
	if len(r.Sequences) == 0 || len(r.Concentration) == 0 || len(r.Composite) == 0 {
		t.Fatal("reference.json lacks a part")
	}
	return &r
}
