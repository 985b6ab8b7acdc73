// Package filter describes a line, everything between a converter and the
// device, as a sum of poles, and computes exactly what arrives when the
// converter holds each sample for one period.
//
// It stands between the samples (package shape makes them, package hardware
// limits them) and the propagators, which ask a [Line] for the control field at
// any time. It imports nothing else of this module. Start with a family, join
// sections with [Cascade], and use [Line.Held] and [Line.HeldTranspose]. What an
// error of a line's parameter does to the field is again the field of a line.
//
//	low-pass            SinglePole, Bessel, Butterworth, CriticallyDamped, GaussianLike
//	no steady gain      ACCoupling, HighPass
//	settling, delay     Tails, Delay, Allpass, FractionalDelay
//	complex baseband    Resonator, Resonance, Mirror, Line.UnitGain
//	derivatives         Line.CornerSlope, Line.DelaySlope, TailSlopes, ResonatorSlopes,
//	                    ResonanceSlopes, CascadeSlope, Sum
//
// # Units
//
// Times are in ns, poles and angular frequencies in rad/ns (1/ns), cyclic
// frequencies (corners) in GHz. Samples and responses carry the unit of the
// samples, as a rule a share of full scale; a quadrature pair is x_I + i x_Q.
//
// # The line
//
//	G(s) = e^{-s Delay} ( g0 + sum r_{p,m} / (s - p)^m ),   Re p < 0, 1 <= m <= MaxPower
//
// Powers above one occur only where poles coincide. A real line lists its
// conjugate poles too; a complex line (an asymmetric response around the
// carrier, which turns I into Q) need not.
//
// # The held response
//
// With x[k] held over [k h, (k+1) h) and nothing after the last sample, the
// state of a pole obeys, inside a sample and without approximation,
//
//	z_p(t+s) = e^{p s} z_p(t) + r_p x[k] (e^{p s} - 1)/p,   u = g0 x + sum_p z_p,
//
// and for a repeated pole the chain z_m' = p z_m + a z_{m-1}, z_0 = x, with
// a = -Re p:
//
//	z_m(t+s) = e^{p s} sum_{j<m} (a s)^j/j! z_{m-j}(t) + x[k] a^m Q_m(s),
//	Q_m(s)   = int_0^s v^{m-1}/(m-1)! e^{p v} dv = s^m e^{p s} phi_m(-p s),
//	phi_m(w) = sum_k w^k/(m+k)!.
//
// The scaling by a keeps every state within the largest sample. The forms with
// phi (for m = 1 with expm1) lose nothing when |p| s is small. The steady gain is
//
//	G(0) = g0 + sum r_{p,m}/(-p)^m,
//
// and the component at w of the continuous output is that of the samples times
// G(iw) sinc(f h) e^{-iwh/2}, with sinc x = sin(pi x)/(pi x) and w = 2 pi f.
// The map from x to u is linear; its adjoint runs the same recurrence backwards
// at the same cost.
//
// Times given to Held, HeldTranspose, Weights, Remaining and Step are measured
// from arrival: the pure delay is not in them. On a sample edge, where a direct
// gain makes the field jump, the new sample is already held; a time that falls
// short of an edge by less than 1e-9 h counts as on it in this respect.
package filter
