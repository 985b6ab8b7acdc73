package datasheet

import (
	"math"
	"strconv"
)

// An axis maps values onto a length. A logarithmic axis needs lo > 0.
type axis struct {
	lo, hi float64
	log    bool
	label  string // with its unit
}

// share returns where v lies on the axis, 0 at lo and 1 at hi. It is not
// confined to that: what leaves the axis is clipped by the plot. Values that a
// logarithmic axis cannot show, zero and below, lie far under its low end.
func (a axis) share(v float64) float64 {
	if !a.log {
		const far = 1e6 // axis lengths, so that clipping meets no infinities
		return math.Max(-far, math.Min(far, (v-a.lo)/(a.hi-a.lo)))
	}
	const under = -10 // axis lengths
	if v <= 0 {
		return under
	}
	l := math.Log10(a.lo)
	return math.Max(under, (math.Log10(v)-l)/(math.Log10(a.hi)-l))
}

// valid reports whether the axis can be drawn.
func (a axis) valid() bool {
	return finite(a.lo) && finite(a.hi) && a.lo < a.hi && (!a.log || a.lo > 0) && finite(a.hi-a.lo)
}

// A tick is one marked value.
type tick struct {
	at    float64
	label string
}

// ticks returns between about half of and not more than `most` marked values
// inside the axis: on a linear one steps of 1, 2 or 5 times a power of ten, on a
// logarithmic one whole decades (every second, third ... where there are many).
func (a axis) ticks(most int) []tick {
	if !a.valid() || most < 2 {
		return nil
	}
	if a.log {
		return a.decades(most)
	}
	step := niceStep((a.hi - a.lo) / float64(most-1))
	first := math.Ceil(a.lo/step - 1e-9)
	last := math.Floor(a.hi/step + 1e-9)
	if !(math.Abs(first) < 1e12 && math.Abs(last) < 1e12) { // a range far narrower than its distance from zero
		return nil
	}
	places := max(0, -int(math.Floor(math.Log10(step)+1e-9)))
	var t []tick
	for k := first; k <= last; k++ {
		v := k * step
		if k == 0 {
			v = 0 // not -0
		}
		t = append(t, tick{v, typographic(strconv.FormatFloat(v, 'f', places, 64))})
	}
	return t
}

// niceStep returns the smallest of 1, 2 and 5 times a power of ten that is at
// least v, for v > 0.
func niceStep(v float64) float64 {
	e := math.Floor(math.Log10(v))
	unit := math.Pow(10, e)
	for _, m := range [...]float64{1, 2, 5} {
		if m*unit >= v*(1-1e-9) {
			return m * unit
		}
	}
	return 10 * unit
}

func (a axis) decades(most int) []tick {
	lo := int(math.Ceil(math.Log10(a.lo) - 1e-9))
	hi := int(math.Floor(math.Log10(a.hi) + 1e-9))
	if hi < lo {
		return nil
	}
	every := 1
	for (hi-lo)/every+1 > most {
		every++
	}
	var t []tick
	for e := hi; e >= lo; e -= every {
		label := "1"
		if e != 0 {
			label = "1e" + strconv.Itoa(e)
		}
		t = append(t, tick{math.Pow10(e), label})
	}
	for i, j := 0, len(t)-1; i < j; i, j = i+1, j-1 {
		t[i], t[j] = t[j], t[i]
	}
	return t
}
