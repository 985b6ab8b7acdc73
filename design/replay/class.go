package replay

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"math"
	"math/cmplx"
	"slices"
	"strings"

	"gonum.org/v1/gonum/mat"
)

const (
	perMHz     = 2 * math.Pi * 1e-3 // rad/ns
	perPercent = 0.01
	perDegree  = math.Pi / 180 // rad

	searchEnd   = 50.0 // MHz, % or deg: how far margins are searched
	searchScale = 2    // of the largest full scale: how far margins of static errors are searched, where that is less
)

// fastest gives the largest full scale of the channels, MHz.
func (m *Model) fastest() float64 {
	most := 0.0
	for i := range m.Channels {
		most = math.Max(most, m.Channels[i].FullScale/perMHz)
	}
	return most
}

// farthest gives how far margins of static errors are searched, MHz: no pulse withstands an error of twice the fastest drive, and to integrate long
// pulses under faster errors would cost minutes. A margin that is required is searched for wherever it is within searchEnd.
func (m *Model) farthest(required []Margin) float64 {
	end := math.Inf(1)
	if most := m.fastest(); most > 0 {
		end = searchScale * most
	}
	for _, r := range required {
		if !r.Share && !r.Angle {
			end = math.Max(end, r.Size/perMHz)
		}
	}
	return math.Min(searchEnd, end)
}

// end gives how far margins of errors with this unit are searched, in it.
func (e *engine) end(unit float64) float64 {
	if unit == perMHz {
		return e.farthest
	}
	return searchEnd
}

// unitOf gives the unit of an error's sizes, and the lambda of one of it.
func unitOf(kind string) (name string, lambda float64) {
	switch kind {
	case "amplitude", "line", "crosstalk":
		return "%", perPercent
	case "skew":
		return "deg", perDegree
	}
	return "MHz", perMHz
}

// A study is an error class while it is judged.
type study struct {
	class Class
	one   *probed   // all kinds but any
	all   []*probed // any: along every operator of the class, or along an orthogonal basis of the traceless ones
	names []string  // of all
	sides []*probed // any: the fixed directions besides
	few   []course  // any: of all these the ones that the curve follows; nil for both ways along every one
}

// many says whether a class is judged as one of many operators: all of kind any are but that of one spin without a list.
func (s *study) many(dim int) bool {
	return s.class.Kind == "any" && (dim > 2 || s.class.Operators != nil)
}

// A probed is a probe with what was found along it. Classes that mean the same error share one.
type probed struct {
	*probe
	unit     float64 // lambda for 1 MHz, 1 % or 1 degree
	strength float64 // sqrt(T int |V|^2 dt) of the whole V: how far lambda = 1 turns at most
	turn     float64 // of a static V of more than two levels: another bound of the angle by which it turns, rad
	onCode   float64 // the same of what a gate feels of it: V cut to the code space and made traceless there; of a target of states a share of the whole
	leaking  float64 // the same of what of a static V leads out of the code space

	left   []complex128 // what the gate leaves of onCode to first order, and
	leak   []complex128 // what it leads out of the code space, a row for each level there
	harm   float64      // the infidelity of an error that turns a little
	margin bool         // is to be searched for its own sake
	low    float64
	high   float64
	curve  []Point
}

// classes gives the model's error classes and, for one spin, those that are always judged where the record has none of
// the name: detuning, amplitude, X, Y, Z.
func (m *Model) classes() []Class {
	list := append([]Class(nil), m.Errors...)
	if m.Dim != 2 {
		return list
	}
	half := [][]complex128{{0, 0.5, 0.5, 0}, {0, -0.5i, 0.5i, 0}, {0.5, 0, 0, -0.5}}
	for _, c := range []Class{
		{Name: "detuning", Kind: "static", Operator: half[2]},
		{Name: "amplitude", Kind: "amplitude"},
		{Name: "X", Kind: "static", Operator: half[0]},
		{Name: "Y", Kind: "static", Operator: half[1]},
		{Name: "Z", Kind: "static", Operator: half[2]},
	} {
		if !slices.ContainsFunc(list, func(o Class) bool { return o.Name == c.Name }) {
			list = append(list, c)
		}
	}
	return list
}

// basis gives the d^2-1 traceless operators that span all static errors, each with the Frobenius norm of a spin's Z/2 for
// every two levels, sqrt(d)/2, and their names: products of Pauli operators, halved, where the levels are those of spins,
// and otherwise real and imaginary parts of the transitions and differences of populations.
func basis(n int) (ops [][]complex128, names []string) {
	if n&(n-1) == 0 {
		pauli := map[byte][4]complex128{'1': {1, 0, 0, 1}, 'X': {0, 1, 1, 0}, 'Y': {0, -1i, 1i, 0}, 'Z': {1, 0, 0, -1}}
		names = []string{""}
		for size := 1; size < n; size *= 2 {
			var longer []string
			for _, s := range names {
				for _, c := range "1XYZ" {
					longer = append(longer, s+string(c))
				}
			}
			names = longer
		}
		names = names[1:] // without the identity
		for _, name := range names {
			op := make([]complex128, n*n)
			for i := range n {
				for j := range n {
					v := complex(0.5, 0)
					for s := range len(name) {
						shift := len(name) - 1 - s
						v *= pauli[name[s]][2*(i>>shift&1)+j>>shift&1]
					}
					op[i*n+j] = v
				}
			}
			ops = append(ops, op)
		}
		return ops, names
	}
	f := complex(math.Sqrt(float64(n))/2, 0)
	for i := range n {
		for j := i + 1; j < n; j++ {
			re, im := make([]complex128, n*n), make([]complex128, n*n)
			re[i*n+j], re[j*n+i] = f/math.Sqrt2, f/math.Sqrt2
			im[i*n+j], im[j*n+i] = -1i*f/math.Sqrt2, 1i*f/math.Sqrt2
			ops = append(ops, re, im)
			names = append(names, fmt.Sprintf("Re %d-%d", i, j), fmt.Sprintf("Im %d-%d", i, j))
		}
	}
	for k := 1; k < n; k++ { // diag(1, ..., 1, -k, 0, ...)
		op := make([]complex128, n*n)
		g := f / complex(math.Sqrt(float64(k*(k+1))), 0)
		for i := range k {
			op[i*n+i] = g
		}
		op[k*n+k] = -complex(float64(k), 0) * g
		ops = append(ops, op)
		names = append(names, fmt.Sprintf("level %d", k))
	}
	return ops, names
}

// errors judges every error class for the required ends. Margins are where threshold is first broken. Curves run over
// the values of the error of the same name in like, or, without, over a range of their own.
func (e *engine) errors(ctx context.Context, threshold float64, like []Error) ([]Error, error) {
	var shared []*probed
	find := func(p *probe, kind string) *probed {
		_, unit := unitOf(kind)
		for _, o := range shared {
			if o.unit == unit && o.same(p) {
				return o
			}
		}
		o := &probed{probe: p, unit: unit}
		if p.slope == nil {
			e.weigh(o, e.plans[0])
		}
		shared = append(shared, o)
		return o
	}
	var studies []study
	classes := e.m.classes()
	for i := range classes {
		c := classes[i]
		s := study{class: c}
		switch c.Kind {
		case "static":
			s.one = find(newStatic(c.Operator, e.dim), c.Kind)
		case "amplitude":
			s.one = find(e.newAmplitude(c.Channels, c.Quadrature), c.Kind)
		case "skew":
			s.one = find(e.newSkew(c.Channels), c.Kind)
		case "crosstalk":
			s.one = find(e.newCrosstalk(&classes[i]), c.Kind)
		case "line":
			s.one = find(e.newLineError(&classes[i]), c.Kind)
		case "any":
			ops, names := c.Operators, c.Names
			if ops == nil {
				ops, names = basis(e.dim)
			}
			s.names = names
			for k, op := range ops {
				if c.Weights != nil {
					op = scaled(op, c.Weights[k])
				}
				o := find(newStatic(op, e.dim), c.Kind)
				o.margin = o.margin || !s.many(e.dim)
				s.all = append(s.all, o)
			}
			if !s.many(e.dim) {
				// With the axes these are the fourteen directions from a cube's middle to its faces and corners, up to sign.
				for i := range 4 {
					y, z := float64(1-2*(i&1)), float64(1-i&2)
					op := make([]complex128, 4)
					for k := range op {
						op[k] = (ops[0][k] + complex(y, 0)*ops[1][k] + complex(z, 0)*ops[2][k]) / complex(math.Sqrt(3), 0)
					}
					o := &probed{probe: newStatic(op, 2), unit: perMHz}
					e.weigh(o, nil)
					s.sides = append(s.sides, o)
				}
			}
		}
		if s.one != nil {
			s.one.margin = true
		}
		studies = append(studies, s)
	}
	// Errors of lines bring plans of their own: one after another below, so that memory does not grow with their number.
	shared = slices.DeleteFunc(shared, func(o *probed) bool { return o.slope != nil })
	if err := e.differentiate(ctx, shared); err != nil {
		return nil, err
	}
	nominal, err := e.nominal(ctx)
	if err != nil {
		return nil, err
	}
	shared = slices.DeleteFunc(shared, func(o *probed) bool { return !o.margin })
	if err := e.search(ctx, shared, nominal, threshold, searchEnd); err != nil {
		return nil, err
	}
	var list []Error
	for i := range studies {
		s := &studies[i]
		r := Error{Name: s.class.Name, Kind: s.class.Kind, Held: s.class.Held}
		r.Unit, _ = unitOf(r.Kind)
		if s.one != nil && s.one.slope != nil {
			p, err := e.plan(ctx, s.one.probe, 0, e.dim > 2)
			if err != nil {
				return nil, err
			}
			e.weigh(s.one, p)
			only := []*probed{s.one}
			if err := e.differentiate(ctx, only); err != nil {
				return nil, err
			}
			if err := e.search(ctx, only, nominal, threshold, searchEnd); err != nil {
				return nil, err
			}
		}
		e.leaks(&r, s)
		switch {
		case s.one != nil:
			r.Susceptibility = s.one.share()
			r.Low, r.High = s.one.low, s.one.high
		case s.many(e.dim):
			e.rms(&r, s)
			if err := e.weakest(ctx, &r, s, nominal, threshold, like); err != nil {
				return nil, err
			}
		default:
			e.rms(&r, s)
			end := e.farthest
			for _, o := range s.all {
				end = math.Min(end, math.Min(-o.low, o.high))
			}
			r.High = end
			if end > 0 {
				if err := e.search(ctx, s.sides, nominal, threshold, end); err != nil {
					return nil, err
				}
				for _, o := range s.sides {
					r.High = math.Min(r.High, math.Min(-o.low, o.high))
				}
				if r.High >= e.farthest {
					r.High = math.Inf(1)
				}
			}
			r.Low = -r.High
		}
		if r.Low == 0 {
			r.Low = 0 // not -0
		}
		if r.Curve, err = e.curve(ctx, s, e.curveValues(&r, like)); err != nil {
			return nil, err
		}
		if s.one != nil && s.class.Spread.Way != "" {
			loss, err := e.spread(ctx, &s.class, s.one.probe)
			if err != nil {
				return nil, err
			}
			r.Spread, r.SpreadInfidelity = s.class.Spread.Way, &loss
		}
		if s.one != nil && len(s.class.Noise.Frequencies) > 0 {
			loss, err := e.noise(ctx, &s.class, s.one.strength)
			if err != nil {
				return nil, err
			}
			r.NoiseInfidelity = &loss
		}
		if s.one != nil {
			s.one.plans, s.one.rough = plans{}, plans{}
		}
		list = append(list, r)
	}
	return list, nil
}

func (e *engine) nominal(ctx context.Context) (float64, error) {
	var f [1]float64
	err := e.infidelities(ctx, []gate{{}}, f[:])
	return f[0], err
}

// weigh fills the strengths of a probe; p is a plan of it, and is not needed for a static one.
func (e *engine) weigh(o *probed, p *plan) {
	n, d := e.dim, len(e.m.CodeSpace)
	if e.states > 0 {
		// Of all the ways in which V moves states, those that are felt are a share: k of d states are asked about.
		defer func() { o.onCode = o.strength * math.Sqrt(float64(e.states)/float64(n)) }()
	}
	block := make([]complex128, d*d)
	if o.static != nil {
		o.strength = e.span * frobenius(o.static)
		if n > 2 {
			o.turn = 2 * e.span * o.norm
		}
		cut(block, o.static, n, e.m.CodeSpace)
		o.onCode = e.span * frobenius(block)
		o.leaking = e.span * frobenius(e.m.leaking(o.static))
		return
	}
	// sqrt(T int |sum f_k V_k|^2 dt) with V_k what first order changes of each operator: the integral of the product of two Taylor
	// polynomials term by term.
	var whole, onCode float64
	other := make([]complex128, d*d)
	for k, a := range o.first {
		for l, b := range o.first {
			if a == nil || b == nil || l < k {
				continue
			}
			cut(block, a, n, e.m.CodeSpace)
			cut(other, b, n, e.m.CodeSpace)
			gw, gc := inner(a, b), inner(block, other)
			if gw == 0 && gc == 0 {
				continue
			}
			if l > k {
				gw, gc = 2*gw, 2*gc
			}
			sum := 0.0
			for _, st := range p.steps {
				ua := p.numbers[st.at+k*st.order : st.at+(k+1)*st.order]
				ub := p.numbers[st.at+l*st.order : st.at+(l+1)*st.order]
				for i, v := range ua {
					if v == 0 {
						continue
					}
					for j, w := range ub {
						sum += st.s * v * w / float64(i+j+1)
					}
				}
			}
			whole += gw * sum
			onCode += gc * sum
		}
	}
	o.strength = math.Sqrt(e.span * math.Max(0, whole))
	o.onCode = math.Sqrt(e.span * math.Max(0, onCode))
}

// share is the susceptibility along one probe.
func (o *probed) share() float64 {
	if o.onCode == 0 {
		return 0
	}
	return frobenius(o.left) / o.onCode
}

const (
	// differenceAngle is the largest angle, in rad, by which an error turns the device in a difference. Central differences
	// at 1, 1/2 and 1/4 of it, extrapolated twice, leave an error under (1/8)^2 angle^6/7!, 3e-12, and gates good to 1e-14
	// leave about as much.
	differenceAngle = 0.1
	differences     = 3
	// Of more than two levels, whose gates are costly and rougher, two at a smaller angle leave under (1/4) angle^4/5!, 2e-9; what is wrong with
	// rough gates changes little with the error and goes with the difference.
	roughAngle       = 0.03
	roughDifferences = 2
)

// differentiate finds what first order leaves of every probe: A = i U(0)' dU/dlambda for the required ends, see read.
func (e *engine) differentiate(ctx context.Context, list []*probed) error {
	n, differences := e.dim, differences
	if n > 2 {
		differences = roughDifferences
	}
	each := 2 * differences
	size := n * e.columns
	// Groups keep the memory of many levels in bounds.
	group := max(1, 8_000_000/(each*size))
	var origin []complex128
	if err := e.run(ctx, []gate{{}}, func(l *labour, _ int, u []complex128) {
		origin = append([]complex128(nil), e.ended(l, u)...)
	}); err != nil {
		return err
	}
	for first := 0; first < len(list); first += group {
		part := list[first:min(first+group, len(list))]
		results := make([]complex128, len(part)*each*size)
		gates := make([]gate, 0, len(part)*each)
		for _, o := range part {
			for r := range differences {
				lambda := e.smallest(o) / float64(int(1)<<r)
				gates = append(gates, gate{o.probe, lambda}, gate{o.probe, -lambda})
			}
		}
		harm := make([]float64, len(gates))
		if err := e.carry(ctx, gates, func(l *labour, i int, w []complex128) {
			copy(results[i*size:(i+1)*size], w)
			if i%each < 2 {
				harm[i] = e.figures(l, w).Infidelity
			}
		}); err != nil {
			return err
		}
		slope, left := make([]complex128, size), make([]complex128, size)
		for i, o := range part {
			o.harm = math.Max(harm[i*each], harm[i*each+1])
			table := make([][]complex128, differences)
			for r := range differences {
				at := (i*each + 2*r) * size
				up, down := results[at:at+size], results[at+size:at+2*size]
				f := complex(1/(2*gates[i*each+2*r].lambda), 0)
				for k := range up {
					up[k] = f * (up[k] - down[k])
				}
				table[r] = up
			}
			power := 1.0
			for level := 1; level < differences; level++ { // Richardson: errors in even powers of the step
				power *= 4
				for r := differences - 1; r >= level; r-- {
					for k := range slope {
						table[r][k] += (table[r][k] - table[r-1][k]) / complex(power-1, 0)
					}
				}
			}
			copy(slope, table[differences-1])
			multiplyAdjoint(left, origin, slope, n, n, e.columns)
			for k := range left {
				left[k] *= 1i
			}
			e.read(o, left)
		}
	}
	return nil
}

// read keeps what counts of A, given as what becomes of the first states, Dim x columns: of a gate its block on the code space P, without the trace
// there, of a target of states what leads out of the span Q of the first ones,
//
//	P A P   or   (1 - Q) A Q
//
// and for either what leads out of the code space, (1 - P) A P.
func (e *engine) read(o *probed, a []complex128) {
	d, c := len(e.m.CodeSpace), e.columns
	o.leak = nil
	for _, i := range e.outside {
		o.leak = append(o.leak, a[i*c:(i+1)*c]...)
	}
	if e.states == 0 {
		o.left = make([]complex128, d*d)
		for i, b := range e.m.CodeSpace {
			copy(o.left[i*d:(i+1)*d], a[b*c:(b+1)*c])
		}
		dropTrace(o.left, d)
		return
	}
	k := e.states
	o.left = append([]complex128(nil), e.fromStates(e.labours[0], a)...)
	inside, along, back := make([]complex128, d*k), make([]complex128, k*k), make([]complex128, d*k)
	for i, b := range e.m.CodeSpace {
		copy(inside[i*k:(i+1)*k], o.left[b*k:(b+1)*k])
	}
	multiplyAdjoint(along, e.from, inside, k, d, k)
	multiply(back, e.from, along, d, k, k)
	for i, b := range e.m.CodeSpace {
		for j := range k {
			o.left[b*k+j] -= back[i*k+j]
		}
	}
}

// smallest gives the lambda of the widest difference along a probe.
func (e *engine) smallest(o *probed) float64 {
	angle := differenceAngle
	if e.dim > 2 {
		angle = roughAngle
	}
	if o.strength == 0 {
		return angle
	}
	return angle / o.strength
}

// rms fills the susceptibility of a whole class and the direction that survives most.
func (e *engine) rms(r *Error, s *study) {
	// What is left of each operator, and what would be of one of root mean square strength if nothing were cancelled.
	left := func(o *probed) []complex128 { return o.left }
	whole := func(o *probed) float64 { return o.onCode }
	if s.class.Leak && e.states == 0 {
		left, whole = func(o *probed) []complex128 { return o.leak }, func(o *probed) float64 { return o.leaking }
	}
	sum, of := 0.0, 0.0
	for _, o := range s.all {
		f, w := frobenius(left(o)), whole(o)
		sum += f * f
		of += w * w
	}
	if of == 0 { // nothing of the class is felt
		return
	}
	number := float64(len(s.all))
	one := math.Sqrt(of / number)
	if s.class.Operators == nil && e.states == 0 {
		// The cut, traceless parts of the basis make up every operator of the code space, d^2-1 in number, each
		// as strong as one of the basis.
		d := len(e.m.CodeSpace)
		number, one = float64(d*d-1), s.all[0].strength
	}
	r.Susceptibility = math.Sqrt(sum/number) / one
	// What is left of error sum v_i V_i is sum v_i left_i: the columns, real and imaginary parts one above the other.
	rows := 2 * len(left(s.all[0]))
	a := mat.NewDense(max(rows, len(s.all)), len(s.all), nil)
	for j, o := range s.all {
		for i, z := range left(o) {
			a.Set(2*i, j, real(z)/one)
			a.Set(2*i+1, j, imag(z)/one)
		}
	}
	var svd mat.SVD
	if !svd.Factorize(a, mat.SVDThin) {
		return
	}
	var v mat.Dense
	svd.VTo(&v)
	r.WorstSusceptibility = svd.Values(nil)[0]
	r.Direction = make([]float64, len(s.all))
	for j := range s.all {
		r.Direction[j] = v.At(j, 0)
	}
	r.WorstDirection = words(r.Direction, s.names)
	if s.many(e.dim) {
		r.Members = s.names
	}
}

// leaks fills what a class of errors leads out of the code space, as a share of the whole, root mean square over it, where levels lie outside.
func (e *engine) leaks(r *Error, s *study) {
	r.Leak = s.class.Leak
	if len(e.outside) == 0 {
		return
	}
	list := s.all
	if s.one != nil {
		list = []*probed{s.one}
	}
	sum, of := 0.0, 0.0
	for _, o := range list {
		f := frobenius(o.leak)
		sum += f * f
		of += o.strength * o.strength
	}
	share := 0.0
	if of > 0 {
		share = math.Sqrt(sum / of)
	}
	r.LeakSusceptibility = &share
}

// words says a direction as "0.83 X + 0.41 Y", the first of its largest components positive, and no more than the six largest; r is turned to
// that sign.
func words(r []float64, names []string) string {
	const mostSaid = 6
	most := 0.0
	for _, v := range r {
		most = math.Max(most, math.Abs(v))
	}
	sign := 1.0
	for _, v := range r {
		if math.Abs(v) > 0.99*most {
			sign = math.Copysign(1, v)
			break
		}
	}
	order := make([]int, len(r))
	for i := range r {
		r[i] *= sign
		order[i] = i
	}
	slices.SortStableFunc(order, func(i, j int) int { return cmp.Compare(math.Abs(r[j]), math.Abs(r[i])) })
	order = slices.DeleteFunc(order, func(i int) bool { return math.Abs(r[i]) < 0.005 })
	more := len(order) > mostSaid
	if more {
		order = order[:mostSaid]
	}
	slices.Sort(order)
	var b strings.Builder
	for _, i := range order {
		switch {
		case b.Len() == 0 && r[i] < 0:
			b.WriteString("-")
		case b.Len() > 0 && r[i] < 0:
			b.WriteString(" - ")
		case b.Len() > 0:
			b.WriteString(" + ")
		}
		fmt.Fprintf(&b, "%.2f %s", math.Abs(r[i]), names[i])
	}
	if more {
		b.WriteString(" + ...")
	}
	return b.String()
}

// searchGrid gives the sizes, in the probe's unit, at which a margin is looked for, up to end: a geometric grid from 0.1
// that never strides over more than an eighth of a turn that the error causes at most, and no more than some hundred points.
func (o *probed) searchGrid(end float64) []float64 {
	eighth := math.Inf(1)
	if s := o.strength * o.unit; s > 0 {
		eighth = math.Pi / 4 / (math.Sqrt2 * s)
		if o.turn > 0 {
			eighth = math.Max(eighth, math.Pi/4/(o.turn*o.unit))
		}
	}
	x := math.Min(0.1, eighth/4)
	var grid []float64
	for x < end {
		grid = append(grid, x)
		if len(grid) < 100 {
			x += math.Min(0.3*x, eighth)
		} else {
			x *= 1.3
		}
	}
	return append(grid, end)
}

// A crossing looks along one probe in one direction for the first size at which the infidelity exceeds the
// threshold.
type crossing struct {
	course
	threshold float64
	grid      []float64
	at        int // next of the grid
	lo, hi    float64
	flo, fhi  float64 // log(infidelity/threshold)
	wlo, whi  float64 // the same, as regula falsi weighs them
	side      int     // which end moved last
	tries     int
	ask       float64 // the size that is to be tried next
	done      bool
	found     float64
}

func newCrossing(way course, nominal, threshold float64, grid []float64) crossing {
	c := crossing{course: way, threshold: threshold, grid: grid, ask: grid[0]}
	c.flo = c.level(nominal)
	return c
}

func (c *crossing) level(f float64) float64 {
	l := math.Log(f / c.threshold)
	if math.IsNaN(l) {
		return 700
	}
	return math.Max(-700, math.Min(700, l))
}

func (c *crossing) finish(x float64) { c.done, c.found = true, x }

// learn takes the infidelity at size ask and chooses the next size, or finishes.
func (c *crossing) learn(f float64) {
	l := c.level(f)
	x := c.ask
	switch {
	case c.hi == 0 && l <= 0: // still held: on along the grid
		c.lo, c.flo = x, l
		if c.at++; c.at == len(c.grid) {
			c.finish(math.Inf(1))
			return
		}
		c.ask = c.grid[c.at]
		return
	case c.hi == 0:
		c.hi, c.fhi, c.whi = x, l, l
		c.wlo = c.flo
	case l <= 0:
		c.lo, c.flo, c.wlo = x, l, l
		if c.side < 0 {
			c.whi *= 0.5
		}
		c.side = -1
	default:
		c.hi, c.fhi, c.whi = x, l, l
		if c.side > 0 {
			c.wlo *= 0.5
		}
		c.side = 1
	}
	if c.lo == 0 { // broken at the first size already: look under it
		if c.hi < 1e-9 {
			c.finish(c.hi)
			return
		}
		c.ask = c.hi / 8
		return
	}
	// Regula falsi on the logarithms of both, where power laws are straight, the weight of an end that stays twice halved (Illinois), and a
	// bisection now and then for the rest.
	if c.tries++; c.hi-c.lo <= 1e-9*c.hi || math.Abs(l) < 1e-9 || c.tries > 80 {
		c.finish(x)
		return
	}
	a, b := math.Log(c.lo), math.Log(c.hi)
	y := (a + b) / 2
	if c.tries%6 != 0 {
		y = (a*c.whi - b*c.wlo) / (c.whi - c.wlo)
	}
	c.ask = math.Exp(y)
	if !(c.ask > c.lo && c.ask < c.hi) {
		c.ask = (c.lo + c.hi) / 2
	}
	if !(c.ask > c.lo && c.ask < c.hi) {
		c.finish(c.hi)
	}
}

// search finds the margins of all probes, all of them one step at a time, each as far as its unit goes and no farther than end.
func (e *engine) search(ctx context.Context, list []*probed, nominal, threshold, end float64) error {
	if !(nominal <= threshold) {
		for _, o := range list {
			o.low, o.high = 0, 0
		}
		return nil
	}
	sides := make([]crossing, 0, 2*len(list))
	for _, o := range list {
		grid := o.searchGrid(math.Min(end, e.end(o.unit)))
		for _, sign := range []float64{-1, 1} {
			sides = append(sides, newCrossing(course{o, sign}, nominal, threshold, grid))
		}
	}
	if err := e.cross(ctx, sides); err != nil {
		return err
	}
	for i, o := range list {
		o.low, o.high = -sides[2*i].found, sides[2*i+1].found
	}
	return nil
}

// cross finds every crossing, all of them one step at a time.
func (e *engine) cross(ctx context.Context, sides []crossing) error {
	gates, open, found := make([]gate, 0, len(sides)), make([]int, 0, len(sides)), make([]float64, len(sides))
	for {
		gates, open = gates[:0], open[:0]
		for i := range sides {
			if c := &sides[i]; !c.done {
				gates = append(gates, gate{c.o.probe, c.sign * c.ask * c.o.unit})
				open = append(open, i)
			}
		}
		if len(gates) == 0 {
			break
		}
		if err := e.infidelities(ctx, gates, found); err != nil {
			return err
		}
		for k, i := range open {
			sides[i].learn(found[k])
		}
	}
	return nil
}

// curveValues chooses where the curve of an error is drawn: 61 values both ways, 21 where gates are costly, or 21 sizes for a class without a sign,
// to the round number that lies half as far again as the margin, and no farther than margins are searched.
func (e *engine) curveValues(r *Error, like []Error) []float64 {
	_, unit := unitOf(r.Kind)
	farthest := e.end(unit)
	for _, o := range like {
		if o.Name == r.Name {
			values := make([]float64, len(o.Curve))
			for i, p := range o.Curve {
				values[i] = p.Value
			}
			return values
		}
	}
	widest := math.Max(-r.Low, r.High)
	end := farthest
	if widest == 0 {
		end = farthest / 10 // nothing is withstood: show the surroundings
	} else {
		for _, power := range []float64{1e1, 1, 1e-1, 1e-2, 1e-3, 1e-4, 1e-5, 1e-6} {
			for _, digit := range []float64{5, 2, 1} {
				if round := digit * power; round >= 1.5*widest && round < end {
					end = round
				}
			}
		}
	}
	lowest, highest := -30, 30
	switch {
	case r.Kind == "any": // each of them takes as many gates as there are directions
		lowest, highest = 0, 20
	case e.affordable() < 2*(highest-lowest):
		lowest, highest = -10, 10
	}
	var values []float64
	for i := lowest; i <= highest; i++ {
		values = append(values, end*float64(i)/float64(highest))
	}
	return values
}

// A course is a way along a probe.
type course struct {
	o    *probed
	sign float64
}

// courses lists both ways along every direction of a class.
func (s *study) courses() []course {
	var list []course
	for _, part := range [][]*probed{s.all, s.sides} {
		for _, o := range part {
			list = append(list, course{o, 1}, course{o, -1})
		}
	}
	return list
}

// curve gives the infidelity at the values; for kind any the worst over the fixed directions.
func (e *engine) curve(ctx context.Context, s *study, values []float64) ([]Point, error) {
	same := func(p Point, v float64) bool { return p.Value == v }
	if s.one != nil && slices.EqualFunc(s.one.curve, values, same) {
		return slices.Clone(s.one.curve), nil // another class has drawn it
	}
	list := []course{{s.one, 1}}
	if s.one == nil {
		if list = s.few; list == nil {
			list = s.courses()
		}
	}
	var gates []gate
	ends := make([]int, len(values)) // of each value's gates
	for i, v := range values {
		for k, c := range list {
			if v != 0 || k == 0 {
				gates = append(gates, gate{c.o.probe, c.sign * v * c.o.unit})
			}
		}
		ends[i] = len(gates)
	}
	found := make([]float64, len(gates))
	if err := e.infidelities(ctx, gates, found); err != nil {
		return nil, err
	}
	points := make([]Point, len(values))
	at := 0
	for i, v := range values {
		points[i] = Point{Value: v, Infidelity: slices.Max(found[at:ends[i]])}
		at = ends[i]
	}
	if s.one != nil {
		s.one.curve = points
	}
	return points, nil
}

// turn finds the diagonal generator G of the frame's rotation: the one for which exp(-i phi G) H exp(i phi G) is what H becomes
// when every quadrature channel's samples are multiplied by e^(i phi), that is
//
//	[G, O_I] = i O_Q  and  [G, O_Q] = -i O_I
//
// for every quadrature channel and [G, O] = 0 for the static part, every baseband channel and every shift. For a spin it is Z/2 or -Z/2, as the
// mixer's sign has it.
func (e *engine) turn() ([]float64, error) {
	n := e.dim
	g, known := make([]float64, n), make([]bool, n)
	type need struct {
		op, want []complex128 // [G, op] = i want
		sign     complex128
	}
	var needs []need
	zero := make([]complex128, n*n)
	needs = append(needs, need{e.static, zero, 1})
	for c := range e.drives {
		d := &e.drives[c]
		i := e.controls[d.ops[0]].op
		if d.turned {
			q := e.controls[d.ops[1]].op
			needs = append(needs, need{i, q, 1}, need{q, i, -1})
		} else {
			needs = append(needs, need{i, zero, 1})
		}
		if d.shift != nil {
			needs = append(needs, need{d.shift, zero, 1})
		}
	}
	// Differences of G along the transitions, one connected part after another.
	for first := range n {
		if known[first] {
			continue
		}
		known[first] = true
		for queue := []int{first}; len(queue) > 0; queue = queue[1:] {
			a := queue[0]
			for b := range n {
				if known[b] {
					continue
				}
				for _, q := range needs {
					if v := q.op[a*n+b]; cmplx.Abs(v) > 1e-9 {
						g[b] = g[a] - real(1i*q.sign*q.want[a*n+b]/v)
						known[b] = true
						queue = append(queue, b)
						break
					}
				}
			}
		}
	}
	mean := 0.0
	for _, v := range g {
		mean += v / float64(n)
	}
	for i := range g {
		g[i] -= mean
	}
	for _, q := range needs {
		for a := range n {
			for b := range n {
				if cmplx.Abs(complex(g[a]-g[b], 0)*q.op[a*n+b]-1i*q.sign*q.want[a*n+b]) > 1e-9 {
					return nil, errNoTurn
				}
			}
		}
	}
	return g, nil
}

var errNoTurn = errors.New("no rotation of the frame turns the drive's phase in this model: pulses back to back are judged at one phase only")
