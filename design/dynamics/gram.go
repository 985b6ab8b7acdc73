package dynamics

// The map of any static error to its toggled integral is a Gram matrix. For
// frames F_q with weights w_q,
//
//	A(V) = sum_q w_q F_q' V F_q = sum_kl V[k,l] S_kl,   S_kl = sum_q w_q F_q[k,:]' F_q[l,:],
//
// with the rows F[k,:], so one d x d block for each entry of V serves every error, at
// d² multiply-adds per block and frame. Only the blocks of entries that some error
// of the class has are kept, S_lk = S_kl' once, and entries whose values agree up to
// a sign in every error share one block (above d = 4). One-body errors on n spins need
// n + 2^(n-1) blocks, all errors d (d+1)/2.
//
// Backwards, the derivative of a function of the A_j by the frames is
//
//	sum_j V_j F Z_j,   row k: sum_l F[l,:] M_kl,   M_kl = sum_j V_j[k,l] Z_j,
//
// where Z_j is its derivative by A_j.
type gram struct {
	k      *kit
	groups []group
	rows   [][]term     // of the backward sum, by k; d = 3 and 4
	s, m   []complex128 // S, one block a group; M and its adjoint, two a group
}

// A group is the entries of V that share one block.
type group struct {
	pairs []pair
	diag  bool
	v     []complex128 // of each error, at an entry with sign 1
	lead  int          // the first error that has it
}

// A pair is the entry (k, l) of V, k <= l.
type pair struct {
	k, l int
	sign float64
}

// A term adds F[from,:] M[block] to a row.
type term struct{ from, block int }

// newGram finds the blocks of the Hermitian errors.
func newGram(k *kit, errors [][]complex128) *gram {
	d := k.d
	g := &gram{k: k, rows: make([][]term, d)}
	for i := range d {
		for j := i; j < d; j++ {
			v := make([]complex128, len(errors))
			any := false
			for e, a := range errors {
				v[e] = a[i*d+j]
				any = any || v[e] != 0
			}
			if !any {
				continue
			}
			g.place(pair{i, j, 1}, v)
		}
	}
	for b, gr := range g.groups {
		if d > 4 {
			break
		}
		for _, p := range gr.pairs {
			g.rows[p.k] = append(g.rows[p.k], term{p.l, 2 * b})
			if !gr.diag {
				g.rows[p.l] = append(g.rows[p.l], term{p.k, 2*b + 1})
			}
		}
	}
	g.s = make([]complex128, len(g.groups)*d*d)
	g.m = make([]complex128, 2*len(g.groups)*d*d)
	return g
}

// place puts an entry into the group it belongs to. At d = 3 and 4 the blocks are
// so small that sharing costs more than it saves.
func (g *gram) place(p pair, v []complex128) {
	diag := p.k == p.l
	if g.k.d > 4 {
		for i := range g.groups {
			gr := &g.groups[i]
			if gr.diag != diag {
				continue
			}
			plus, minus := v[gr.lead] == gr.v[gr.lead], v[gr.lead] == -gr.v[gr.lead]
			for e := 0; e < len(v) && (plus || minus); e++ {
				plus = plus && v[e] == gr.v[e]
				minus = minus && v[e] == -gr.v[e]
			}
			if plus || minus {
				if !plus {
					p.sign = -1
				}
				gr.pairs = append(gr.pairs, p)
				return
			}
		}
	}
	lead := 0
	for v[lead] == 0 {
		lead++
	}
	g.groups = append(g.groups, group{pairs: []pair{p}, diag: diag, v: v, lead: lead})
}

func (g *gram) clear() { clear(g.s) }

// add adds the frames x with weight w and y with weight v; y may be nil.
func (g *gram) add(w float64, x []complex128, v float64, y []complex128) {
	d, dd := g.k.d, g.k.dd
	for b := range g.groups {
		gr := &g.groups[b]
		s := g.s[b*dd : b*dd+dd]
		p := gr.pairs[0]
		switch {
		case y == nil || d != 3 && d != 4:
			g.addTo(s, gr, w, x, x, v, y)
		case d == 4 && gr.diag:
			gramDiag4((*[16]complex128)(s), (*[4]complex128)(x[4*p.k:]), (*[4]complex128)(y[4*p.k:]), w, v)
		case d == 4:
			gram4((*[16]complex128)(s), (*[4]complex128)(x[4*p.k:]), (*[4]complex128)(x[4*p.l:]), (*[4]complex128)(y[4*p.k:]), (*[4]complex128)(y[4*p.l:]), w, v)
		case gr.diag:
			gramDiag3((*[9]complex128)(s), (*[3]complex128)(x[3*p.k:]), (*[3]complex128)(y[3*p.k:]), w, v)
		default:
			gram3((*[9]complex128)(s), (*[3]complex128)(x[3*p.k:]), (*[3]complex128)(x[3*p.l:]), (*[3]complex128)(y[3*p.k:]), (*[3]complex128)(y[3*p.l:]), w, v)
		}
	}
}

// addCross adds w (x† z + z† x): what conjugation by x gains when x moves along z.
func (g *gram) addCross(w float64, x, z []complex128) {
	dd := g.k.dd
	for b := range g.groups {
		gr := &g.groups[b]
		s := g.s[b*dd : b*dd+dd]
		g.addTo(s, gr, w, x, z, 0, nil)
		g.addTo(s, gr, w, z, x, 0, nil)
	}
}

// addTo adds w x[k,:]' z[l,:] over the pairs of the group to its block, and
// v y[k,:]' y[l,:] when y is not nil; of a diagonal one only the upper triangle.
func (g *gram) addTo(s []complex128, gr *group, w float64, x, z []complex128, v float64, y []complex128) {
	d := g.k.d
	pairs := gr.pairs
	for i := range d {
		from := 0
		if gr.diag {
			from = i
		}
		row := s[i*d+from : i*d+d]
		at := 0
		if y == nil {
			for ; at+3 < len(pairs); at += 4 {
				p := pairs[at : at+4]
				add4(row, z[p[0].l*d+from:], z[p[1].l*d+from:], z[p[2].l*d+from:], z[p[3].l*d+from:],
					weigh(w, x, &p[0], d, i), weigh(w, x, &p[1], d, i), weigh(w, x, &p[2], d, i), weigh(w, x, &p[3], d, i))
			}
			for ; at < len(pairs); at++ {
				add1(row, z[pairs[at].l*d+from:], weigh(w, x, &pairs[at], d, i))
			}
			continue
		}
		for ; at+1 < len(pairs); at += 2 {
			p := pairs[at : at+2]
			add4(row, z[p[0].l*d+from:], z[p[1].l*d+from:], y[p[0].l*d+from:], y[p[1].l*d+from:],
				weigh(w, x, &p[0], d, i), weigh(w, x, &p[1], d, i), weigh(v, y, &p[0], d, i), weigh(v, y, &p[1], d, i))
		}
		if at < len(pairs) {
			p := &pairs[at]
			add2(row, z[p.l*d+from:], y[p.l*d+from:], weigh(w, x, p, d, i), weigh(v, y, p, d, i))
		}
	}
}

// weigh returns w sign conj(x[k,i]).
func weigh(w float64, x []complex128, p *pair, d, i int) complex128 {
	v, f := x[p.k*d+i], w*p.sign
	return complex(f*real(v), -f*imag(v))
}

// integral stores A of error e in dst, scaled by f.
func (g *gram) integral(dst []complex128, e int, f float64) {
	d, dd := g.k.d, g.k.dd
	clear(dst)
	for b := range g.groups {
		gr := &g.groups[b]
		v := gr.v[e]
		if v == 0 {
			continue
		}
		s := g.s[b*dd : b*dd+dd]
		add1(dst, s, v)
		if gr.diag { // the upper triangle is all there is: its diagonal would count twice
			for i := range d {
				dst[i*d+i] -= v / 2 * s[i*d+i]
			}
		}
	}
	for i := range d { // X + X'
		dst[i*d+i] = complex(2*f*real(dst[i*d+i]), 0)
		for j := i + 1; j < d; j++ {
			x, y := dst[i*d+j], dst[j*d+i]
			z := complex(f*(real(x)+real(y)), f*(imag(x)-imag(y)))
			dst[i*d+j], dst[j*d+i] = z, conj(z)
		}
	}
}

// pull fills M from the derivatives z by each A.
func (g *gram) pull(z [][]complex128) {
	dd := g.k.dd
	clear(g.m)
	for b := range g.groups {
		gr := &g.groups[b]
		m := g.m[2*b*dd : 2*b*dd+dd]
		for e, v := range gr.v {
			if v != 0 {
				add1(m, z[e], v)
			}
		}
		adjoint(g.m[(2*b+1)*dd:(2*b+2)*dd], m, g.k.d)
	}
}

// back stores the adjoint of f sum_j V_j x Z_j in y.
func (g *gram) back(y, x []complex128, f float64) {
	d, dd := g.k.d, g.k.dd
	switch d {
	case 3:
		for l, terms := range g.rows {
			back3((*[9]complex128)(y), l, x, g.m, terms, f)
		}
		return
	case 4:
		for l, terms := range g.rows {
			back4((*[16]complex128)(y), l, x, g.m, terms, f)
		}
		return
	}
	// block by block, so that one is used often before the next takes its place in
	// the cache
	t := g.k.t
	clear(t)
	for b := range g.groups {
		gr := &g.groups[b]
		up, low := g.m[2*b*dd:2*b*dd+dd], g.m[(2*b+1)*dd:(2*b+2)*dd]
		for _, p := range gr.pairs {
			g.through(t[p.k*d:p.k*d+d], x[p.l*d:p.l*d+d], up, f*p.sign)
			if !gr.diag {
				g.through(t[p.l*d:p.l*d+d], x[p.k*d:p.k*d+d], low, f*p.sign)
			}
		}
	}
	adjoint(y, t, d)
}

// through adds f w M to the row.
func (g *gram) through(row, w, m []complex128, f float64) {
	d := len(row)
	i := 0
	for ; i+3 < d; i += 4 {
		r := m[i*d:]
		add4(row, r, r[d:], r[2*d:], r[3*d:], times(w[i], f), times(w[i+1], f), times(w[i+2], f), times(w[i+3], f))
	}
	for ; i < d; i++ {
		add1(row, m[i*d:], times(w[i], f))
	}
}
