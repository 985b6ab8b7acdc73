package main

import (
	"embed"
	"fmt"
	"os"
	"path/filepath"

	"holdfast/hardware"
)

// The starter files are those of the demonstration in testdata/skerry, byte for
// byte (a test says so): embedding does not reach there.
//
//go:embed starter/*.toml
var starter embed.FS

// An example is some of the starter files, in the order in which they are told.
type example []struct{ name, says string }

// oneSpin and twoSpins are the examples; the last file of each is the brief.
var (
	oneSpin = example{
		{"rack-b.toml", "what the instrument and its line can do"},
		{"skerry.toml", "what is driven"},
		{"x90.toml", "which gate, in what time, held against what"},
	}
	twoSpins = example{
		{"rack-b-pair.toml", "what the instrument and its lines can do"},
		{"skerry-pair.toml", "what is driven, and what couples it"},
		{"sqrt-iswap.toml", "which gate of the two, in what time"},
	}
)

// start writes an example into a new folder.
func start(c *call) (int, error) {
	f := c.flags()
	pair := f.Bool("pair", false, "an example of two spins")
	operands, err := c.parse(f, 1, 1)
	if err != nil {
		return exitBadInput, err
	}
	dir, files := operands[0], oneSpin
	if *pair {
		files = twoSpins
	}
	stage, err := hardware.NewStaging(dir, false)
	if err != nil {
		return exitBadInput, err
	}
	defer stage.Discard()
	form := startForm{Format: jsonFormat, Folder: dir}
	for _, e := range files {
		data, err := starter.ReadFile("starter/" + e.name)
		if err != nil {
			return exitBadInput, err
		}
		if err := os.WriteFile(filepath.Join(stage.Dir(), e.name), data, 0o666); err != nil {
			return exitBadInput, err
		}
		form.Files = append(form.Files, e.name)
	}
	if err := stage.Commit(); err != nil {
		return exitBadInput, err
	}
	if c.json {
		return exitMet, c.emit(form)
	}
	fmt.Fprintf(c.stdout, "%s holds an invented example to change into yours:\n", dir)
	wide := 0
	for _, e := range files {
		wide = max(wide, len(e.name))
	}
	for _, e := range files {
		fmt.Fprintf(c.stdout, "  %-*s   %s\n", wide, e.name, e.says)
	}
	fmt.Fprintf(c.stdout, "Next: holdfast check %s, then holdfast design %s\n",
		filepath.Join(dir, "*.toml"), filepath.Join(dir, files[len(files)-1].name))
	return exitMet, nil
}

// startForm is what start -json prints.
type startForm struct {
	Format int      `json:"format"`
	Folder string   `json:"folder"`
	Files  []string `json:"files"`
}
