// Package solve is the constrained least-squares solver: it finds coefficients
// c with small |r(c)|² strictly inside a convex set, from many independent
// starts. It knows vectors, not physics; design hands it residuals and a Set.
//
// The method is an interior-point Gauss-Newton iteration. With Jacobian J, the
// logarithmic barrier φ of the set (gradient g, Hessian B) and n constraints,
//
//	(JᵀJ + (µ + λ|r|²) B) p = -(Jᵀ r + µ g),   µ <= κ|r|²/n,
//
// the step is cut to 0.95 of the way to the boundary and accepted by Armijo's
// rule on |r|²/2 + µφ. No point outside the set is ever evaluated.
// See Nocedal and Wright 2006, Numerical Optimization, chapters 10 and 19, for
// the parts; the coupling of µ and λ to |r|² was chosen by measurement.
package solve
