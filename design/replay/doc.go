// Package replay is the witness: it reads a pulse folder back and recomputes by its own means what the pulse does.
//
// It stands after the whole design path and shares no numerics with it. From the integer codes and the plain numbers of
// [model] in pulse.toml it integrates the state of every line,
//
//	z' = p z + r x        (a chain of such equations for a pole of higher power)
//
// together with U' = -i H U as Taylor series in time, restarted at every sample edge, with the length and order of every step chosen from
// a bound of the remainder (see plan.go). What a drive's power does to the device has the Taylor series of |u|^2; the error of a line's parameter is
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
//	U0(Ts - T_end)' U(Ts <- t0) U0(start - t0)'
//
// with U0 the static evolution, t0 the earliest arrival and Ts the time from which less than 1e-12 rad are still to come. Every
// error, an amplitude error too, acts from the window's start to its end only, whatever the ends.
//
// Free Z angles count in every figure: a gate is D_after U D_before, and pulses in a row are each turned by what the angles of those before it
// add up to, as a lab that tracks them in software plays them.
//
// The trace of a Hamiltonian turns only the global phase and is dropped everywhere.
package replay
