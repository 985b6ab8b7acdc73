package main

import (
	"encoding/json"
	"math"
	"strconv"
)

// jsonFormat is the number of the form that -json prints, as the key format carries it. A key that is taken away or
// changes its meaning takes the next number; one that is added does not.
const jsonFormat = 1

// A number is a float64 that JSON can carry: whole, and null where it is not finite.
type number float64

// MarshalJSON gives the fewest digits that read back as the same float64.
func (n number) MarshalJSON() ([]byte, error) {
	v := float64(n)
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return []byte("null"), nil
	}
	return strconv.AppendFloat(nil, v, 'g', -1, 64), nil
}

// unless gives null for a value of which none says that the file is silent.
func unless(v, none float64) number {
	if v == none {
		return number(math.NaN())
	}
	return number(v)
}

// numbers makes a list that is never null.
func numbers(list []float64) []number {
	out := make([]number, len(list))
	for i, v := range list {
		out[i] = number(v)
	}
	return out
}

// list makes an empty list of a missing one, so that it is [] and not null.
func list[T any](l []T) []T {
	if l == nil {
		return []T{}
	}
	return l
}

// emit prints one JSON object, keys in the order of the struct.
func (c *call) emit(v any) error {
	e := json.NewEncoder(c.stdout)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	return e.Encode(v)
}
