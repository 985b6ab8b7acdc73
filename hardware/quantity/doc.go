// Package quantity reads numbers that carry their unit ("40 MHz", "25 %/sample") and the TOML files they stand in, so
// that every complaint names the file, the line, the key, what was found and what is allowed.
//
// It sits under every loader: package hardware reads the profile with it, design/device the device, design/brief the
// brief, design/replay the record. It knows nothing of what the keys mean.
//
// # Units
//
// Parse turns text into one base unit per Kind, and Format turns it back for people:
//
//	Kind        base unit     accepted units
//	Time        ns            s, ms, us, µs, ns, ps
//	Frequency   GHz, cyclic   Hz, kHz, MHz, GHz
//	SampleRate  GS/s          S/s, kS/s, MS/s, GS/s
//	Ratio       1             %, ppm
//	PerSample   1/sample      %/sample
//	Voltage     V             V, mV, uV, µV
//	Bits        bit           bit
//	Angle       rad           rad, deg
//
// # Documents
//
// A Document is one TOML file. Loaders ask its root Table for keys, one after the other, without looking at errors;
// an accessor that meets a mistake records it and returns a harmless value. Document.Err, called last, gives the one
// sentence that the user should see, and refuses every key that nobody asked for. Keys are case-sensitive.
package quantity
