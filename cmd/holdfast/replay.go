package main

import (
	"fmt"
	"path/filepath"

	"holdfast/design"
	"holdfast/design/brief"
	"holdfast/design/datasheet"
	"holdfast/design/device"
	"holdfast/design/replay"
	"holdfast/hardware"
)

// mostDifferences is how many differences between record and inputs are told: a
// few show what happened.
const mostDifferences = 5

// replayPulse judges a pulse folder from what stands in it.
func replayPulse(c *call) (int, error) {
	f := c.flags()
	page := f.String("datasheet", "", "also write a new datasheet to this file")
	operands, err := c.parse(f, 1, 1)
	if err != nil {
		return exitBadInput, err
	}
	dir := operands[0]
	folder, err := replay.Open(dir)
	if err != nil {
		return exitBadInput, err
	}
	verdict, err := replay.Judge(c.ctx, folder)
	if err != nil {
		if c.ctx.Err() != nil {
			return exitInterrupted, fmt.Errorf("%s: interrupted", dir)
		}
		return exitBadInput, fmt.Errorf("%s: %w", dir, err)
	}
	record, err := design.ReadRecord(dir)
	if err != nil {
		return exitBadInput, err
	}
	in, err := folderInputs(dir)
	if err != nil {
		return exitBadInput, err
	}
	sheet, err := newSheet(c.ctx, in, record, folder, verdict)
	if err != nil {
		return exitBadInput, err
	}
	if *page != "" {
		if err := writeSheet(*page, sheet); err != nil {
			return exitBadInput, err
		}
	}
	status := exitMet
	if pulseStatus(record, verdict) != exitMet { // an interrupted design is not interrupted again
		status = exitMissed
	}
	if c.json {
		return status, c.emit(pulseFormOf(dir, *page, status, record, sheet))
	}
	if err := datasheet.Text(c.stdout, sheet); err != nil {
		return exitBadInput, err
	}
	printPlayback(c.stdout, record, in.Device)
	for i, d := range verdict.Inputs {
		if i == mostDifferences {
			fmt.Fprintf(c.stdout, "... and %d more\n", len(verdict.Inputs)-i)
			break
		}
		fmt.Fprintf(c.stdout, "model.%s: the record says %s, inputs/ give %s\n", d.Key, d.Recorded, d.Rebuilt)
	}
	return status, nil
}

// folderInputs loads the copies of the inputs that a pulse folder keeps.
func folderInputs(dir string) (in design.Inputs, err error) {
	at := func(name string) string { return filepath.Join(dir, "inputs", name) }
	if in.Brief, err = brief.Load(at("brief.toml")); err != nil {
		return in, err
	}
	if in.Profile, err = hardware.Load(at("profile.toml")); err != nil {
		return in, err
	}
	in.Device, err = device.Load(at("device.toml"))
	return in, err
}
