// Package hardware knows what an instrument and its lines can do: it reads the hardware profile, says which samples
// are playable, turns samples into converter codes, judges codes, and keeps the files of a pulse folder.
//
// It stands between the samples (package shape makes them) and the line (package filter, one Line per channel), on
// top of package quantity, which reads the units. Start with Load; then Profile.Playable gives the limits as rows and
// a disc for a solver, and Profile.CheckSamples and Profile.CheckCodes judge a finished pulse by other means. Package
// design multiplies the rows by a basis; design/replay reads the folders.
//
// # Units
//
// Times are in ns, frequencies in GHz and cyclic, the full scale in rad/ns, levels in V. A sample is x = x_I + i x_Q in
// shares of full scale, and limits are shares too. LSB = 2^-(bits-1) is the share that one code stands for.
//
// # Time
//
// Sample k leaves the converter during [k h, (k+1) h), h the sample period; outside the span the output is zero. At the
// device the span is the window that begins at Profile.Start. Limits on what arrives count from there: the span ends n h later,
// and ring-out is whatever arrives after that.
package hardware
