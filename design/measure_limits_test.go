//go:build measure

package design

import (
	"fmt"
	"maps"
	"math/rand/v2"
	"slices"
	"testing"
)

// TestMeasureIterates is TestNoIterateBreaksALimit for 10^5 points:
//
//	go test -tags measure -run MeasureIterates -v -timeout 1h ./design
//
// It prints how many points were judged and, for every limit, the least headroom
// met: of the profile's own limit, which the reserves keep above zero.
func TestMeasureIterates(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 2))
	const wanted = 100_000
	seen, profiles, empty := 0, 0, 0
	worst := map[string]float64{}
	for seen < wanted {
		tr := drawTrial(t, rng)
		j, err := tr.judged(t, 4, 40)
		if err != nil {
			empty++
			continue
		}
		profiles++
		for _, p := range j.problems {
			t.Errorf("%s: %s", tr.words, p)
		}
		for limit, room := range j.worst {
			if least, ok := worst[limit]; !ok || room < least {
				worst[limit] = room
			}
		}
		seen += j.seen
	}
	fmt.Printf("%d points of %d profiles (%d more can play nothing); least headroom:\n", seen, profiles, empty)
	for _, limit := range slices.Sorted(maps.Keys(worst)) {
		fmt.Printf("  %-27s %.3g\n", limit, worst[limit])
	}
}
