// Package design puts the rooms together: from a brief, a hardware profile and
// a device to the samples of one pulse and the record of what it claims.
//
// It multiplies the playable set of package hardware by a basis of package
// shape, gives package solve the residuals of package robust, and rounds what
// comes back to codes. Run does it; Pulse.Write fills a pulse folder, which
// package replay then judges by its own means.
//
// Times are in ns, rates in rad/ns, samples in shares of full scale; infidelity
// is the average gate infidelity.
package design
