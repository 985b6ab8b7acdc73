// Package robust turns error classes into residual vectors: how far a gate is
// from its target, and how much of each error survives it, with the exact
// Jacobian through line and basis. design gives it the response of the line to
// every coefficient; solve drives it.
//
// The symbols are those of package dynamics. For an error λV with V = v·σ, the
// time-averaged toggled error is A/T, A = ∫ Rᵀ v dt over the gate's window of
// length T; with M the 3x3 matrix of all three directions the rms share of a
// random static error that survives is ||M/T||_F/√3 (Phys. Rev. Lett. 132,
// 193801 (2024)). Susceptibilities are dimensionless, 0 to 1.
package robust
