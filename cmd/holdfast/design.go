package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"strings"
	"time"

	"holdfast/design"
	"holdfast/design/brief"
	"holdfast/design/datasheet"
	"holdfast/design/device"
	"holdfast/design/replay"
	"holdfast/hardware"
)

const datasheetFile = "datasheet.html"

// designPulse designs into a part folder, replays there, writes the datasheet
// and only then gives the folder its name.
func designPulse(c *call) (int, error) {
	f := c.flags()
	out := f.String("out", "", "the pulse folder to make; default: the brief's name, here")
	force := f.Bool("force", false, "keep an existing folder as NAME.before-N")
	operands, err := c.parse(f, 1, 1)
	if err != nil {
		return exitBadInput, err
	}
	b, p, d, err := brief.LoadAll(operands[0])
	if err != nil {
		return exitBadInput, err
	}
	in := design.Inputs{Brief: b, Profile: p, Device: d, Version: version}
	sources, err := design.ReadSources(in)
	if err != nil {
		return exitBadInput, err
	}
	if *out == "" {
		*out = folderName(b.Name)
	}
	stage, err := hardware.NewStaging(*out, *force)
	if err != nil {
		return exitBadInput, err
	}
	defer stage.Discard()
	if b.Defaulted && !c.json {
		names := make([]string, len(b.Errors))
		for i, e := range b.Errors {
			names[i] = e.Name
		}
		last := len(names) - 1
		fmt.Fprintf(c.stdout, "The brief names no [[error]]: held against %s and %s.\n", strings.Join(names[:last], ", "), names[last])
	}

	show := newProgress(c.stderr)
	pulse, err := design.Run(c.ctx, in, show.report)
	show.end()
	if err != nil {
		return exitBadInput, fmt.Errorf("%s: %w", b.File, err)
	}
	if err := pulse.Write(stage.Dir(), sources); err != nil {
		return exitBadInput, err
	}
	folder, err := replay.Open(stage.Dir())
	if err != nil {
		return exitBadInput, fmt.Errorf("replay refuses what design wrote, a fault of the program: %w", err)
	}
	// An interrupt must not lose what was found: without a verdict the folder is
	// still whole, and replay can judge it at another time.
	ctx := c.after()
	show.note("replay")
	sheet, verdict, err := judged(ctx, in, &pulse.Record, folder)
	show.end()
	if err != nil {
		if ctx.Err() == nil {
			return exitBadInput, err
		}
		if err := stage.Commit(); err != nil {
			return exitBadInput, err
		}
		fmt.Fprintf(c.stderr, "holdfast: interrupted before the verdict; %s holds the pulse, and 'holdfast replay %s' judges it\n", *out, *out)
		return exitInterrupted, nil
	}
	if err := writeSheet(filepath.Join(stage.Dir(), datasheetFile), sheet); err != nil {
		return exitBadInput, err
	}
	if err := stage.Commit(); err != nil {
		return exitBadInput, err
	}
	status := pulseStatus(&pulse.Record, verdict)
	if c.json {
		return status, c.emit(pulseFormOf(*out, filepath.Join(*out, datasheetFile), status, &pulse.Record, sheet))
	}
	if err := datasheet.Text(c.stdout, sheet); err != nil {
		return exitBadInput, err
	}
	printPlayback(c.stdout, &pulse.Record, d)
	fmt.Fprintf(c.stdout, "\nsearch:    %s\n", pulse.Summary())
	fmt.Fprintf(c.stdout, "pulse:     %s\n", *out)
	fmt.Fprintf(c.stdout, "datasheet: %s\n", filepath.Join(*out, datasheetFile))
	return status, nil
}

// judged replays a folder and gathers its sheet.
func judged(ctx context.Context, in design.Inputs, r *design.Record, f *replay.Folder) (*datasheet.Sheet, *replay.Verdict, error) {
	v, err := replay.Judge(ctx, f)
	if err != nil {
		return nil, nil, err
	}
	s, err := newSheet(ctx, in, r, f, v)
	return s, v, err
}

// pulseStatus is the exit status that a pulse deserves.
func pulseStatus(r *design.Record, v *replay.Verdict) int {
	switch {
	case r.Pulse.Status == string(design.Interrupted):
		return exitInterrupted
	case r.Pulse.Status != string(design.Found) || !v.Met() || !r.TurnedMet():
		return exitMissed
	}
	return exitMet
}

// printPlayback says what whoever plays the pulse must know besides the samples.
func printPlayback(w io.Writer, r *design.Record, d *device.Device) {
	list := playback(r, d)
	if len(list) == 0 {
		return
	}
	fmt.Fprintln(w)
	for _, f := range list {
		fmt.Fprintf(w, "%s: %s\n", f.Name, f.Value)
	}
}

// A note is a fact about playback; site is whose it is, of a device of several.
type note struct {
	fact
	site string
}

// playback lists delays between channels, the angles or rotations to track, and the waveforms
// that were turned.
func playback(r *design.Record, d *device.Device) (list []note) {
	add := func(name, value string) { list = append(list, note{fact: fact{name, value}}) }
	for _, d := range r.Pulse.Delays {
		add(fmt.Sprintf("channel %q", d.Channel), fmt.Sprintf("starts %d samples after the trigger, to arrive with the others", d.Samples))
	}
	several := len(d.Sites) > 1
	for _, t := range turns(r, d) {
		side := "before"
		if t.after {
			side = "after"
		}
		if !several {
			add("turn about Z "+side+" the gate", t.words+", to be tracked in software: exp(-i angle Z/2)")
			continue
		}
		name := d.Sites[t.site].Name
		list = append(list, note{fact{fmt.Sprintf("turn of %s %s the gate", name, side), t.words}, name})
	}
	for _, p := range r.Pulse.Phases {
		kept := "every limit kept"
		if !p.Kept {
			kept = "a LIMIT IS BROKEN"
		}
		add(fmt.Sprintf("turned by %.6g deg", p.Angle), fmt.Sprintf("infidelity %s, %s; %s", smallFigure(p.Infidelity), kept, strings.Join(p.Files, ", ")))
	}
	return list
}

// A turn is a rotation of one site that belongs to the gate and is not in the samples.
type turn struct {
	site  int
	after bool
	words string
}

// turns lists those of a record: free turns about Z, or free rotations.
func turns(r *design.Record, d *device.Device) (list []turn) {
	for side, angles := range [][]float64{r.Model.FreeZBefore, r.Model.FreeZAfter} {
		for i, a := range angles {
			words := fmt.Sprintf("%.6f rad (%.4f deg)", a, a*180/math.Pi)
			if len(d.Sites) > 1 {
				words = fmt.Sprintf("%.6f rad = %.4f deg about Z", math.Round(a*1e6)/1e6+0, math.Round(a*180/math.Pi*1e4)/1e4+0) // 0 and not -0
			}
			if i < len(d.Sites) {
				list = append(list, turn{i, side == 1, words})
			}
		}
	}
	for side, rotations := range [][][][]design.Complex{r.Model.LocalBefore, r.Model.LocalAfter} {
		for i, rows := range rotations {
			m := make([][]complex128, len(rows))
			for k, row := range rows {
				for _, z := range row {
					m[k] = append(m[k], complex(z[0], z[1]))
				}
			}
			axis, angle, _, ok := device.AxisAngle(device.FromRows(m))
			if i >= len(d.Sites) || !ok {
				continue
			}
			words := "none"
			if angle != 0 {
				words = strings.ReplaceAll(fmt.Sprintf("%.6f rad = %.4f deg about %.6f X + %.6f Y + %.6f Z", angle, angle*180/math.Pi, axis[0], axis[1], axis[2]), "+ -", "- ")
			}
			list = append(list, turn{i, side == 1, words})
		}
	}
	return list
}

func writeSheet(path string, s *datasheet.Sheet) error {
	out, err := os.OpenFile(path, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o666)
	if err != nil {
		return err
	}
	return errors.Join(datasheet.Write(out, s), out.Close())
}

// folderName makes a folder's name of a pulse's: separators and leading dots
// would lead elsewhere.
func folderName(name string) string {
	name = strings.Map(func(r rune) rune {
		if r == '/' || r == '\\' || r < ' ' {
			return '-'
		}
		return r
	}, name)
	if name = strings.TrimLeft(name, "."); name == "" {
		return "pulse"
	}
	return name
}

// progress shows one line on a terminal and keeps quiet elsewhere.
type progress struct {
	w     io.Writer
	on    bool
	begun time.Time
	wide  int
}

func newProgress(w io.Writer) *progress {
	return &progress{w: w, on: terminal(w), begun: time.Now()}
}

func (p *progress) report(r design.Progress) {
	if !p.on {
		return
	}
	line := ""
	switch r.Stage {
	case "search":
		line = fmt.Sprintf("search: start %d of up to %d, %d at a zero, best miss %.2g", r.Done, r.Of, r.Successes, r.Best)
		if r.Done == 0 {
			line = fmt.Sprintf("search: up to %d starts, at most about %s", r.Of, seconds(r.Expected))
		}
	default:
		line = fmt.Sprintf("%s: %d of %d", r.Stage, r.Done, r.Of)
	}
	line += ", " + seconds(time.Since(p.begun))
	pad := max(0, p.wide-len(line))
	p.wide = len(line)
	fmt.Fprintf(p.w, "\r%s%s", line, strings.Repeat(" ", pad))
}

// note says that another stage has begun.
func (p *progress) note(stage string) { p.report(design.Progress{Stage: stage, Done: 0, Of: 1}) }

func seconds(d time.Duration) string { return fmt.Sprintf("%.1f s", d.Seconds()) }

func (p *progress) end() {
	if p.on && p.wide > 0 {
		fmt.Fprintf(p.w, "\r%s\r", strings.Repeat(" ", p.wide))
	}
}
