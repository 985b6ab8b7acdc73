package main

import (
	"context"
	"fmt"
	"math"

	"holdfast/design/replay"
)

// aloneWithin is how far the rest of a device may move a population of the card, whose table is that of the driven site alone: well below what keeps the groups
// apart.
const aloneWithin = 0.02

// alone plays the sequences, with the signs of the files, on the whole device with every site in |0> first, and gives how far the populations of the driven
// site then are from those that it has alone. It is zero for a device of one site.
func (b *bench) alone(ctx context.Context, list []sequence, table []prediction) (float64, error) {
	if len(b.device.Sites) == 1 {
		return 0, nil
	}
	worst := 0.0
	for i, want := range table[0].populations { // of the files' signs
		m, err := b.whole(list[i%3].codes, i == 3)
		if err != nil {
			return 0, err
		}
		found, err := b.excited(ctx, m)
		if err != nil {
			return 0, err
		}
		worst = math.Max(worst, math.Abs(found-want))
	}
	if worst > aloneWithin {
		return worst, fmt.Errorf("%s: channel %q: found couplings or crosstalk that move the populations of %s by up to %.2g; allowed: up to %g, as the card is that of a site by itself "+
			"(give it a device file in which the site stands alone, and see to that on the bench)", b.device.File, b.profile.Channels[b.channel].Name, b.site().Name, worst, aloneWithin)
	}
	return worst, nil
}

// whole is the bench as the files say with the whole device, the carrier below the transition, while codes play on the one channel.
func (b *bench) whole(codes []int16, terminated bool) (*replay.Model, error) {
	own, err := b.model(b.stated(), b.detuning, codes, terminated)
	if err != nil {
		return nil, err
	}
	d := *b.device
	d.Sites = append(d.Sites[:0:0], d.Sites...)
	shift := 2*math.Pi*b.detuning - b.site().Detuning // of all frames, which leaves the sites as far apart as they are
	for i := range d.Sites {
		d.Sites[i].Detuning += shift
	}
	m := *own
	m.Dim, m.Sites, m.CodeSpace, m.Static = d.Dim(), d.Levels(), d.CodeSpace(), d.Static().Data
	for _, r := range d.Rotating() {
		m.Rotating = append(m.Rotating, replay.Rotating{Frequency: r.Frequency, Cosine: r.Cosine.Data, Sine: r.Sine.Data})
	}
	c := own.Channels[0]
	c.Operators, c.Paths = nil, nil
	for i, p := range d.Paths(c.Name, string(b.profile.Channels[b.channel].Mixing)) {
		var ops [][]complex128
		for _, o := range p.Operators {
			ops = append(ops, o.Data)
		}
		if i == 0 {
			c.Operators = ops
		} else {
			c.Paths = append(c.Paths, replay.Path{Frequency: p.Frequency, Operators: ops})
		}
	}
	if c.Shift != 0 {
		c.ShiftOperator = d.ShiftOperator(c.Name).Data
	}
	m.Channels, m.Target = []replay.Channel{c}, nil
	return &m, nil
}

// excited gives the population of |1> of the driven site after all were in |0>: the sum over the code states of the others.
func (b *bench) excited(ctx context.Context, m *replay.Model) (float64, error) {
	states := len(m.CodeSpace)
	basis := func(i int) [][]complex128 {
		v := make([]complex128, states)
		v[i] = 1
		return [][]complex128{v}
	}
	site, _ := b.device.Site(b.site().Name)
	bit := states >> (site + 1)
	sum := 0.0
	for i := range states {
		if i&bit == 0 {
			continue
		}
		m.From, m.To = basis(0), basis(i)
		if err := m.Validate(); err != nil {
			return 0, err
		}
		f, _, _, err := m.Figures(ctx)
		if err != nil {
			return 0, err
		}
		sum += 1 - f.Infidelity
	}
	return sum, nil
}
