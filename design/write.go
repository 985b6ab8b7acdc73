package design

import (
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strconv"
	"strings"

	"holdfast/hardware"
)

// inputFiles are the copies of what a pulse was designed from, below inputs/.
var inputFiles = [3]string{"profile.toml", "device.toml", "brief.toml"}

// Sources are the bytes of the three input files, and by name of those that lie beside the brief.
type Sources struct {
	Profile, Device, Brief []byte
	Beside                 map[string][]byte
}

// ReadSources reads the files that the inputs were loaded from.
func ReadSources(in Inputs) (s Sources, err error) {
	s.Beside = map[string][]byte{}
	for _, e := range in.Brief.Errors {
		name := e.Rates
		if e.Noise != nil {
			name = e.Noise.File
		}
		if name == "" {
			continue
		}
		if s.Beside[name], err = os.ReadFile(filepath.Join(filepath.Dir(in.Brief.File), name)); err != nil {
			return s, err
		}
	}
	for _, f := range []struct {
		dst  *[]byte
		path string
	}{{&s.Profile, in.Profile.File}, {&s.Device, in.Device.File}, {&s.Brief, in.Brief.File}} {
		if *f.dst, err = os.ReadFile(f.path); err != nil {
			return s, err
		}
	}
	return s, nil
}

// Write fills dir, an empty folder, with the pulse: the waveform files in every format, inputs/
// and, last, pulse.toml with the hashes of all others. It completes the record.
func (p *Pulse) Write(dir string, s Sources) error {
	if err := os.Mkdir(filepath.Join(dir, "inputs"), 0o777); err != nil {
		return err
	}
	for i, data := range [][]byte{s.Profile, s.Device, s.Brief} {
		if err := os.WriteFile(filepath.Join(dir, "inputs", inputFiles[i]), data, 0o666); err != nil {
			return err
		}
	}
	for name, data := range s.Beside { // brief.Load has seen to it that they are plain names, and end in .csv
		if err := os.WriteFile(filepath.Join(dir, "inputs", name), data, 0o666); err != nil {
			return err
		}
	}
	for i, w := range p.Channels {
		ch := p.Record.Model.Channels[i]
		columns := len(w.Codes) / len(w.Exact) // 2, or 1 for a baseband channel
		exact := make([]float64, 0, len(w.Codes))
		for _, x := range w.Exact {
			if exact = append(exact, real(x)); columns == 2 {
				exact = append(exact, imag(x))
			}
		}
		if err := hardware.WriteNPY(filepath.Join(dir, ch.Exact), len(w.Exact), columns, exact); err != nil {
			return err
		}
		if _, err := WriteWaveform(dir, strings.TrimSuffix(ch.Codes, ".npy"), p.inputs.Profile, w.Channel, w.Codes); err != nil {
			return err
		}
	}
	for i, t := range p.Turned {
		facts := &p.Record.Pulse.Phases[i]
		facts.Files = []string{}
		for k, w := range t.Channels {
			if p.inputs.Profile.Channels[w.Channel].Columns() == 1 {
				continue // a bias does not turn
			}
			stem := fmt.Sprintf("%s-turned-%sdeg", strings.TrimSuffix(p.Record.Model.Channels[k].Codes, ".npy"), strconv.FormatFloat(facts.Angle, 'g', 6, 64))
			names, err := WriteWaveform(dir, stem, p.inputs.Profile, w.Channel, w.Codes)
			if err != nil {
				return err
			}
			facts.Files = append(facts.Files, names...)
		}
	}
	names, err := hardware.ListFiles(dir)
	if err != nil {
		return err
	}
	list, err := hardware.HashFiles(dir, names)
	if err != nil {
		return err
	}
	p.Record.Files = nil
	for _, f := range list {
		p.Record.Files = append(p.Record.Files, File(f))
	}
	out, err := os.OpenFile(filepath.Join(dir, hardware.RecordName), os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o666)
	if err != nil {
		return err
	}
	if err := errors.Join(p.Record.Encode(out), out.Close()); err != nil {
		return fmt.Errorf("%s: %w", hardware.RecordName, err)
	}
	return nil
}

// WriteWaveform writes the interleaved codes of one channel into dir in every format: stem.npy, stem.csv, stem.int16,
// and stem-arrives.npy with what they become at the device. It gives the names of the files. The record's [model] names
// the first; the others are for whoever plays or looks.
func WriteWaveform(dir, stem string, p *hardware.Profile, channel int, codes []int16) (names []string, err error) {
	rows, err := p.Arrival(channel, codes)
	if err != nil {
		return nil, err
	}
	columns := p.Channels[channel].Columns()
	for _, f := range []struct {
		end   string
		write func(path string) error
	}{
		{".npy", func(path string) error { return hardware.WriteNPY(path, len(codes)/columns, columns, codes) }},
		{".csv", func(path string) error { return hardware.WriteCSV(path, p.SamplePeriod, p.Bits, columns, codes) }},
		{".int16", func(path string) error { return hardware.WriteRaw(path, codes) }},
		{"-arrives.npy", func(path string) error { return hardware.WriteArrival(path, rows) }},
	} {
		if err := f.write(filepath.Join(dir, stem+f.end)); err != nil {
			return nil, err
		}
		names = append(names, stem+f.end)
	}
	return names, nil
}

// fileStem makes a file name of a channel's: letters and digits stay, runs of
// everything else become one hyphen.
func fileStem(name string) string {
	var b strings.Builder
	gap := false
	for _, r := range name {
		if r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r >= '0' && r <= '9' || r == '_' {
			if gap && b.Len() > 0 {
				b.WriteByte('-')
			}
			b.WriteRune(r)
			gap = false
		} else {
			gap = true
		}
	}
	if b.Len() == 0 {
		return "channel"
	}
	return b.String()
}
