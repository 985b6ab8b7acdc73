package design

import (
	"math"

	"holdfast/design/device"
	"holdfast/design/robust"
	"holdfast/hardware"
)

// flat is the share of its steepest slope under which a map is flat.
const flat = 1e-9

// curve gives a bias's map of what arrives to the rate that it drives, in units of full, its
// steepest slope over what the channel may play, rad/ns: value and slope of a playable share are of size 1 at most.
func curve(b *device.Bias, ch *hardware.Channel) (full float64, of robust.Map) {
	const points = 1000 // on either side
	for i := range 2*points + 1 {
		_, slope, _ := b.Rate(ch.AmplitudeLimit*float64(i-points)/points, ch.FullScale)
		full = math.Max(full, math.Abs(slope))
	}
	return full, func(s float64) (value, slope, curvature float64) {
		value, slope, curvature = b.Rate(s, ch.FullScale)
		return value / full, slope / full, curvature / full
	}
}

// curves gives the maps of all controls of channels, nil for straight ones; nil where all are.
func curves(d []driven) (list []robust.Map) {
	some := false
	for _, x := range d {
		for range x.operators {
			list = append(list, x.curve)
		}
		for _, p := range x.paths {
			list = append(list, make([]robust.Map, len(p.operators))...)
		}
		some = some || x.curve != nil
	}
	if !some {
		return nil
	}
	return list
}

// atRest is what a small share that arrives adds to the rate of a channel, per share, rad/ns; negative where its map falls.
func atRest(in Inputs, ch *hardware.Channel) float64 {
	if b := in.Device.Map(ch.Name); b != nil {
		_, slope, _ := b.Rate(0, ch.FullScale)
		return slope
	}
	return ch.FullScale
}
