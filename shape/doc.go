// Package shape turns coefficients into samples: bases of sample sequences,
// textbook envelopes and composite sequences.
//
// It stands at the head of the chain from coefficients to gate. What it makes
// is judged by package hardware (may the instrument play it?) and carried on
// by package filter (what arrives at the device?); it imports neither. Use a
// [Basis] to search for a pulse, and [RampedSquare], [RaisedCosine], [Gaussian] with
// its [DerivativeCorrection] and the composite sequences ([CORPSE] and its
// companions) to compare with one.
//
// Of the bases, [Slepian] keeps most of its energy in the band for its number of
// columns; [TaperedFourier] starts and ends most softly for the energy that
// it leaks; [Fourier] is the simplest; [BSpline] is local in time until it is made
// orthonormal, and leaks most; [Samples] is for instruments that limit nothing.
// The figures stand with each. [ZeroMean] restricts any of them to sequences without a
// mean, and [Basis.OutOfBand] is the energy outside the band as a limit.
//
// # Conventions
//
// Samples are shares of full scale, one per sample period; time is counted in
// samples and frequency in cycles per sample, so that nothing here knows the
// sample period. Outside the returned sequence the output is zero. An area is
// a plain sum of samples: a quadrature channel whose full scale is O rad/ns,
// sampled every h ns, turns a resonant spin by O h times the area. Angles and
// phases are in radians; a phase turns the drive from X towards Y.
//
// A span of N samples may begin and end with guard samples, which every
// column of a basis leaves at zero; the rest are its free samples.
package shape
