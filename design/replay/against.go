package replay

import "context"

// Against gives the infidelity for the required ends with each of the given
// static errors added to the Hamiltonian inside the window: Hermitian Dim x Dim
// matrices, row-major, rad/ns.
func (m *Model) Against(ctx context.Context, fields [][]complex128) ([]float64, error) {
	e, err := newEngine(ctx, m)
	if err != nil {
		return nil, err
	}
	gates := make([]gate, len(fields))
	for i, f := range fields {
		gates[i] = gate{newStatic(f, m.Dim), 1}
	}
	dst := make([]float64, len(fields))
	return dst, e.infidelities(ctx, gates, dst)
}
