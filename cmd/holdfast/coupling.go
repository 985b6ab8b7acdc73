package main

import (
	"fmt"
	"math"
	"strings"

	"holdfast/design/device"
	"holdfast/hardware/quantity"
)

// siteFacts says what a site is: of two levels which energy |0> has, where the transition lies and how far from the drive; of more also what the levels are.
func siteFacts(d *device.Device, site int) []fact {
	s := d.Sites[site]
	list := []fact{{"|0>", fmt.Sprintf("the %s of the two energies, and the +1 state of Z", s.Zero)}}
	if s.Levels > 2 {
		end := "lowest"
		if s.Zero == device.Upper {
			end = "highest"
		}
		list[0] = fact{"|0>, |1>", fmt.Sprintf("levels %d and %d; level 0 has the %s energy", s.Code[0], s.Code[1], end)}
		list = append(list, fact{s.Kind, levelsInWords(&s)})
	}
	return append(list, fact{"transition", stated(s.Frequency, quantity.Frequency)}, fact{"detuning", detuningInWords(s)})
}

// levelsInWords says what the energies of more than two levels are, beside the detuning.
func levelsInWords(s *device.Site) string {
	if s.Kind == device.Spin {
		spin := fmt.Sprint((s.Levels - 1) / 2)
		if s.Levels%2 == 0 {
			spin = fmt.Sprintf("%d/2", s.Levels-1)
		}
		words := "s = " + spin + ", level 0 is m = +s"
		if s.Quadratic != 0 {
			words += fmt.Sprintf("; and %s (Sz^2 - s(s+1)/3)", rateInWords(s.Quadratic))
		}
		return words
	}
	words := fmt.Sprintf("the 1-2 transition lies %s %s the 0-1 one", rateInWords(math.Abs(s.Anharmonicity)), map[bool]string{true: "below", false: "above"}[s.Anharmonicity < 0])
	for i, h := range s.Higher {
		words += fmt.Sprintf(", and level n C(n,%d) %s higher", i+3, rateInWords(h))
	}
	return words
}

// mapInWords says by what a bias turns its site where that is not in proportion to what arrives.
func mapInWords(b *device.Bias) string {
	switch {
	case b.Loop != nil:
		return fmt.Sprintf(", by the flux through a loop: %s without flux, %.4g quanta at rest, full scale adds %.4g, asymmetry %.4g", rateInWords(b.Loop.Highest), b.Loop.Bias, b.Loop.FullScale, b.Loop.Asymmetry)
	case b.Polynomial != nil:
		var terms []string
		for i, c := range b.Polynomial {
			power := "s"
			if i > 0 {
				power = fmt.Sprintf("s^%d", i+1)
			}
			terms = append(terms, fmt.Sprintf("%.4g %s", c, power))
		}
		return ", by full scale times " + strings.ReplaceAll(strings.Join(terms, " + "), "+ -", "- ") + ", s the share that arrives"
	}
	return ""
}

// rateInWords writes a rate in rad/ns as a frequency.
func rateInWords(rate float64) string { return quantity.Format(rate/(2*math.Pi), quantity.Frequency) }

// A framing is what the frames of the sites make of a coupling.
type framing struct {
	still            bool // some of it stands still
	turning, dropped []device.Rotating
}

// framed gives that of one of a device's couplings.
func framed(d *device.Device, coupling int) framing {
	one, none := *d, *d
	one.Couplings, none.Couplings = d.Couplings[coupling:coupling+1], nil
	rest := one.Static().Add(-1, none.Static())
	return framing{rest.Norm() > 0, one.Rotating(), one.Dropped()}
}

// formulas of the couplings of two sites.
var formulas = map[string]string{
	device.Exchange:   "J (a b' + a' b), of spins J (X X + Y Y)/2",
	device.Heisenberg: "J S.S with S = (X, Y, Z)/2",
	device.Dipolar:    "J (3 Sz Sz - S.S)",
	device.Dispersive: "J n n, n the level above the ground state",
}

// couplingFacts says of every coupling what it does, how strongly, and what of it turns in the frames of its sites.
func couplingFacts(d *device.Device) (list []fact) {
	for i := range d.Couplings {
		c := &d.Couplings[i]
		words, formula := c.Kind, formulas[c.Kind]
		if c.Kind == device.Product {
			words = strings.Join(c.Axes, " ")
			formula = "J " + words + "/2"
		}
		list = append(list, fact{strings.Join(c.Sites, ", "), fmt.Sprintf("%s, %s: %s; %s", words, rateInWords(c.Strength), formula, framed(d, i).words(d, c))})
	}
	return list
}

func (f framing) words(d *device.Device, c *device.Coupling) string {
	if s, _ := d.Site(c.Sites[0]); d.Sites[s].Frequency == 0 {
		return "stands still, as these sites state no frequency"
	}
	var parts []string
	if f.still {
		parts = append(parts, "stands still")
	}
	if len(f.turning) > 0 {
		parts = append(parts, "turns at "+frequenciesInWords(f.turning))
	}
	if len(f.dropped) > 0 {
		parts = append(parts, "is left out where it turns, at "+frequenciesInWords(f.dropped))
	}
	if len(parts) == 0 {
		return "does nothing"
	}
	return strings.Join(parts, " and ") + ", in the frames of these sites"
}

// frequenciesInWords lists those of some turning terms, of more than three the first and the last.
func frequenciesInWords(terms []device.Rotating) string {
	var words []string
	for _, r := range terms {
		words = append(words, rateInWords(r.Frequency))
	}
	if n := len(words); n > 3 {
		return fmt.Sprintf("%d frequencies from %s to %s", n, words[0], words[n-1])
	}
	return strings.Join(words, ", ")
}

// crosstalkTurns gives how fast what a channel does to a site that it is not meant for turns there, rad/ns; the sign hangs on the mixer.
func crosstalkTurns(d *device.Device, c *device.Crosstalk) float64 {
	site, _ := d.Site(c.Site)
	return math.Abs(d.Reach(c.Channel, site, "").Frequency)
}

// crosstalkFacts says how much of a channel reaches sites that it is not meant for.
func crosstalkFacts(d *device.Device) (list []fact) {
	for i := range d.Crosstalk {
		c := &d.Crosstalk[i]
		own, drives := d.Aim(c.Channel)
		words := fmt.Sprintf("%s of what it does to %s", quantity.Format(c.Share, quantity.Ratio), d.Sites[own].Name)
		if drives && c.Phase != 0 {
			words += ", at " + quantity.Format(c.Phase, quantity.Angle)
		}
		if f := crosstalkTurns(d, c); f > 0 {
			words += fmt.Sprintf("; turns at %s in the frame of %s", rateInWords(f), c.Site)
		}
		list = append(list, fact{fmt.Sprintf("%q on %s", c.Channel, c.Site), words})
	}
	return list
}
