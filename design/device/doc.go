// Package device describes what is driven: its sites, their levels, which channel drives which site, and the operators
// that follow, as matrices.
//
// It sits between the device file (TOML, read through package hardware/quantity) and the rooms that compute: design takes
// its static and driven operators, design/brief its named operators and gates. It knows neither instrument nor pulse.
//
// # Conventions
//
// Planck's constant over 2 pi is 1; times are in ns, Hamiltonians in rad/ns. |0> is the +1 state of Z, whichever energy it has.
// A two-quadrature drive on a spin acts as (u_I X + u_Q Y)/2 or (u_I X - u_Q Y)/2, by the rule at Device.Operators; a static
// detuning delta as delta Z/2, a bias as u X/2, u Y/2 or u Z/2 by its axis, and the shift that a drive causes as kappa |u|^2 Z/2. A gate
// is a rotation exp(-i angle/2 (n.sigma)) about a unit axis n; its global phase has no meaning.
//
// This version plays one site, a spin or an anharmonic ladder, with at most one drive, and biases. Files that ask for more are refused
// in a sentence.
package device
