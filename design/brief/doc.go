// Package brief reads what is wanted of a gate: the target, the span, what may go wrong and what is required.
//
// It sits at the entrance of the design: Load reads one brief, LoadAll the brief with the hardware profile and the device that it
// names, checked against each other. Packages design and design/replay go on from there. It computes nothing but the target and the operators
// of errors.
//
// # Sizes of errors
//
// A size is the rotation frequency that the error causes: "1 MHz" turns a spin once a microsecond. So an error of size f adds, in
// rad/ns,
//
//	detuning                    2 pi f Z/2
//	operator "X"                2 pi f X/2, and so for "Y" and "Z"
//	on = { a = "Z", b = "X" }   2 pi f (Z of a times X of b)/2, and so for any sites
//	collective "Z"              2 pi f times the sum of Z/2 over all sites
//	matrix M                    2 pi f M, M as written
//	any                         2 pi f n.(X,Y,Z)/2 for a unit vector n on one spin; of several sites with the half
//	                            products of the class in the place of X/2, Y/2 and Z/2, and of more levels with
//	                            operators of the same norm, sqrt(d)/2 for d levels
//
// with X, Y and Z of a site of more than two levels as package design/device has them. An amplitude error of size s multiplies what the channel's
// line delivers, or one quadrature of it, by 1 + s. A line error of size s makes one parameter of a line 1 + s times what the profile says; a quadrature
// angle of size a adds -a u_Q to u_I; an offset of size s adds s of full scale to what the converter puts out, all the time; crosstalk of size s does to
// another site s of what the channel does to its own.
package brief
