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

// start writes the starter files into a new folder.
func start(c *call) (int, error) {
	operands, err := c.parse(c.flags(), 1, 1)
	if err != nil {
		return exitBadInput, err
	}
	dir := operands[0]
	stage, err := hardware.NewStaging(dir, false)
	if err != nil {
		return exitBadInput, err
	}
	defer stage.Discard()
	entries, err := starter.ReadDir("starter")
	if err != nil {
		return exitBadInput, err
	}
	for _, e := range entries {
		data, err := starter.ReadFile("starter/" + e.Name())
		if err != nil {
			return exitBadInput, err
		}
		if err := os.WriteFile(filepath.Join(stage.Dir(), e.Name()), data, 0o666); err != nil {
			return exitBadInput, err
		}
	}
	if err := stage.Commit(); err != nil {
		return exitBadInput, err
	}
	if c.json {
		form := startForm{Format: jsonFormat, Folder: dir}
		for _, e := range entries {
			form.Files = append(form.Files, e.Name())
		}
		return exitMet, c.emit(form)
	}
	fmt.Fprintf(c.stdout, "%s holds an invented example to change into yours:\n", dir)
	fmt.Fprintf(c.stdout, "  rack-b.toml   what the instrument and its line can do\n")
	fmt.Fprintf(c.stdout, "  skerry.toml   what is driven\n")
	fmt.Fprintf(c.stdout, "  x90.toml      which gate, in what time, held against what\n")
	fmt.Fprintf(c.stdout, "Next: holdfast check %s, then holdfast design %s\n",
		filepath.Join(dir, "*.toml"), filepath.Join(dir, "x90.toml"))
	return exitMet, nil
}

// startForm is what start -json prints.
type startForm struct {
	Format int      `json:"format"`
	Folder string   `json:"folder"`
	Files  []string `json:"files"`
}
