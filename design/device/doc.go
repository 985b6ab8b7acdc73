// Package device describes what is driven: its sites, their levels, what couples them, which channel drives which site, and the operators
// that follow, as matrices.
//
// It sits between the device file (TOML, read through package hardware/quantity) and the rooms that compute: design takes
// its static, turning and driven operators, design/brief its named operators and gates. It knows neither instrument nor pulse.
//
// # Conventions
//
// Planck's constant over 2 pi is 1; times are in ns, Hamiltonians in rad/ns. The basis states of a device are products of its sites' levels, the
// first site slowest. On two levels |0> is the +1 state of Z, whichever energy it has. X, Y and Z of a site are the Pauli matrices on two levels,
// a + a', i(a' - a) and -2n on an anharmonic ladder, and 2Sx, 2Sy, 2Sz on a spin s of more levels, the first of them m = s.
//
// A two-quadrature drive acts on its site as (u_I X + u_Q Y)/2 or (u_I X - u_Q Y)/2, by the rule at Device.Operators; a static detuning delta as delta Z/2, a
// bias as u X/2, u Y/2 or u Z/2 by its axis, or with Bias.Rate, a function of u, in the place of u, the shift that a drive causes as kappa |u|^2 Z/2, and a coupling as Coupling says, of a product half of it. A gate on one site
// is a rotation exp(-i angle/2 (n.sigma)) about a unit axis n; its global phase has no meaning.
//
// # Frames
//
// A site that states its frequency is seen from a frame that turns with its drive, at frequency less detuning: exp(i F t) with F that rate times the number of
// the level above the ground state, and t = 0 at the start of the gate's window. What a coupling or crosstalk does between sites whose frames
// turn differently turns at the difference: Device.Static has what stands still, Device.Rotating what turns, Device.Dropped what the file says to leave out, and
// Device.Paths the ways of a channel. Sites without a frequency are as the file states them, in whatever frames those are.
package device
