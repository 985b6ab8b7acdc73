// Package dynamics holds the hot loops: propagators, toggled integrals and
// their exact derivatives, on plain arrays. It knows nothing of pulses, lines
// or files; robust turns its numbers into residuals.
//
// Spin is one spin, in quaternions; Levels is any closed system of 2 to 64 levels, in
// complex matrices, and equals Spin on two. Cost is the piecewise-constant problem
// by which kernels of this sort are compared (testdata/kernel).
//
// Conventions of Spin, quoted by its functions:
//
//   - time in ns, fields in rad/ns; a spin obeys dU/dt = -i H U with
//     H = (Ωx X + Ωy Y + Ωz Z)/2;
//   - a unit quaternion q = (q0, q) stands for U = q0 - i q·σ, so products of
//     quaternions are products of unitaries in the same order;
//   - R is the rotation matrix of U: U (v·σ) U' = (R v)·σ, so an error v·σ seen
//     from the toggling frame is (Rᵀ v)·σ;
//   - [w]x is the matrix of the cross product, [w]x v = w × v.
//
// Each step is integrated by the fourth-order Magnus expansion on its two
// Gauss-Legendre nodes a (earlier) and b, with the rotation vector
//
//	w = h (a+b)/2 - (√3/12) h² a×b
//
// (Blanes, Casas, Oteo, Ros 2009, Phys. Rep. 470, 151). The toggled integral
// of a step has the same order only with a correction of its own, written in
// the frame of the middle of the step,
//
//	m = h G(w) + R(w/2)ᵀ [d]x,   d = (√3/12) h² (b - a),   G(w) = ∫₀¹ R(s w)ᵀ ds;
//
// without it the susceptibility stays second order in the step.
package dynamics
