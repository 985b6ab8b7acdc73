// Package replay is the witness: it reads a pulse folder back and recomputes by its own means what the pulse does.
//
// It stands after the whole design path and shares no numerics with it. From the integer codes and the plain numbers of
// [model] in pulse.toml it integrates the state of every line,
//
//	z' = p z + r x        (a chain of such equations for a pole of higher power)
//
// together with U' = -i H U as Taylor series in time, restarted at every sample edge, with the length and order of every step chosen from
// a bound of the remainder (see plan.go). What a drive's power does to the device has the Taylor series of |u|^2; what turns by itself has those of
// cosine and sine, and what a channel drives where it is seen to turn the product of such a series and its own; the error of a line's parameter is
// integrated through a second line, its slope, beside the first. Errors of finite size are simulated as they stand; susceptibilities are
// Richardson-extrapolated differences of such exact gates, never integrals in a toggled frame. No other room's propagator,
// line, constraint row or average is used: packages hardware, design/device and design/brief serve only to read files, and to
// rebuild the model from the folder's inputs/ for comparison.
//
// Open reads a folder, Judge gives the Verdict. A Model can also be asked directly, which is how a datasheet lets a rival pulse be
// judged by the same engine: WithSamples puts other samples on the same line, operators and limits, WithLine the same samples on another line, and
// Figures, Pair, Limits, Judge, Curves and Against work on any Model.
//
// # Conventions
//
// Time is in ns, rates in rad/ns, samples in shares of full scale. The window of the gate lasts from WindowStart for
// Samples sample periods. A figure for window ends ignores what drives the device before and after it. A figure for settled ends is of
//
//	U0(Ts <- T_end)' U(Ts <- t0) U0(start <- t0)'
//
// with U0 that of the undriven device, terms that turn by themselves included and their phases counted from
// the window's start, t0 the earliest arrival and Ts the time from which less than 1e-12 rad are still to come. Every
// error, an amplitude error too, acts from the window's start to its end only, whatever the ends.
//
// With A = int U'VU dt over the window, T its length, P the projector on the code space, d the dimension, cut(M) = PMP without its trace there, and
// for a class of errors the sums over its operators with their weights, susceptibilities are the roots of
//
//	sum |cut(A)|^2 / ( T^2 sum |cut(V)|^2 )                   of a gate
//	sum |(1-P) A P|^2 / ( T^2 sum |(1-P) V P|^2 )             of a gate, for a class of leakage
//	sum |(1-Q) A Q|^2 / ( T^2 sum |V|^2 k/d )                 of states, Q the projector on the k first ones
//	sum |(1-P) A P|^2 / ( T^2 sum |V|^2 )                     what leaks, where there are levels outside the code space
//
// in Frobenius norms, V traceless, and T int |V|^2 dt in the place of T^2 |V|^2 where V depends on time. For settled ends A is seen from where the
// drive begins to arrive.
//
// Gates of more than two levels are integrated to 4e-16 a step where they stand for themselves and to 1e-10 where errors are looked at, which leaves
// susceptibilities good to about 1e-8.
//
// Free Z angles count in every figure: a gate is D_after U D_before, and pulses in a row are each turned by what the angles of those before it
// add up to, as a lab that tracks them in software plays them.
//
// The trace of a Hamiltonian turns only the global phase and is dropped everywhere.
package replay
