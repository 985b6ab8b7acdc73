// Package noise describes classical stationary noise by its spectrum, and turns "the error that this noise makes in a gate of
// length T" into a short sum over frequencies.
//
// It sits beside design/brief: Read takes a spectrum from a table of a TOML file, Nodes gives the frequencies and weights at which a filter
// function is to be taken. The filter function itself comes from whoever propagates the gate. The package reads files, and knows neither
// devices nor pulses.
//
// # Conventions
//
// The noise is a real lambda(t) of mean zero, with the two-sided power spectral density S(w), w in rad/ns:
//
//	<lambda(0) lambda(t)> = (1/2pi) int_-inf^inf S(w) e^{iwt} dw        <lambda^2> = (1/2pi) int_-inf^inf S(w) dw
//
// Detuning noise has lambda in rad/ns and S in rad^2/ns; noise of an amplitude, relative to the amplitude, has lambda = 1 for 100 % and S in
// ns. S is even, so that a density over positive cyclic frequencies alone (one-sided) is twice as large as the two-sided one of the
// same noise: with nu = lambda/2pi in Hz, and S_nu its one-sided density in Hz^2/Hz,
//
//	S(2 pi f) = (2 pi 1e-9)^2 1e9 S_nu(f)/2
//
// To first order in S, noise H += lambda(t) V(t) of a gate of length T leaves, with V_I the traceless part of V in the frame of the
// undisturbed gate and d the dimension,
//
//	1 - F_pro = (1/2pi) int_-inf^inf S(w) F(w) dw,    F(w) = || int_0^T V_I(t) e^{iwt} dt ||_F^2 / d
//
// (Green, Sastrawan, Uys, Biercuk 2013, New J. Phys. 15, 095004).
//
// # The sum
//
// F is the Fourier transform of a function that lives on [-T, T]. It is therefore an even entire function of exponential type T, smooth on
// the scale 1/T however rough S is, so that a Gauss quadrature of which the weight function is S itself (Golub and Welsch 1969, Math. Comput. 23,
// 221) needs few nodes: in the long run pi/2 for each period 2 pi/T of F. Nodes gives
//
//   - one node for all of S below 0.1/T, at the root mean square frequency there: exact for F = a + b w^2;
//   - panels of up to 32 Gauss nodes for the measure S dw, up to 2.8 n/T, the first panel in the variable w^2;
//   - no node above: F falls there as 1/w^2 or faster, as V_I jumps at the ends of the gate at worst, and the upper half of the nodes takes on what S has
//     above with the mean of w^2 F over that half. Rule.Remainder bounds what that can cost.
//
// Where S ends before the nodes run out, fewer are given, as many as leave nothing to gain.
package noise
