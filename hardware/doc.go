// Package hardware knows what an instrument and its lines can do: it reads the hardware profile, says which samples
// are playable, turns samples into converter codes, judges codes, and keeps the files of a pulse folder.
//
// It stands between the samples (package shape makes them) and the line (package filter, one Line per channel), on
// top of package quantity, which reads the units. Start with Load; then Profile.Playable gives the limits as rows, balls and
// a disc or a box for a solver, Profile.Codes turns samples into codes, and Profile.CheckSamples and Profile.CheckCodes judge a finished
// pulse by other means. Channel.Parameters say what the line does when it is not quite what the profile says. Package
// design multiplies the rows by a basis; design/replay reads the folders.
//
// # Units
//
// Times are in ns, frequencies in GHz and cyclic, the full scale in rad/ns, levels in V. A sample is x = x_I + i x_Q in
// shares of full scale, and limits are shares too; of a baseband channel it is real. LSB = 2^-(bits-1) is the share that one
// code stands for.
//
// Where a drive compresses, samples are what it reaches, y = Compression.Reached(x) of what the converter puts out; everything behind
// it is linear in y, and codes are made of x.
//
// # Time
//
// Sample k leaves the converter during [k h, (k+1) h), h the sample period; outside the span the output is zero. At the
// device the span is the window that begins at Profile.Start, to which channels of unlike delay are brought by whole samples. Limits
// on what arrives count from there: the span ends n h later, and ring-out is whatever arrives after that.
package hardware
