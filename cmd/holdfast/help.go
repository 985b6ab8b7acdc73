package main

import (
	"fmt"
	"io"
)

func overview(w io.Writer) {
	fmt.Fprintf(w, "holdfast designs pulses that an instrument can play and that hold a gate against errors.\n\nUsage:\n")
	for _, v := range verbs() {
		fmt.Fprintf(w, "  holdfast %-26s %s\n", v.name+" "+v.operands, v.short)
	}
	fmt.Fprint(w, `
First run:
  holdfast start lab
  holdfast design lab/x90.toml

Exit status: 0 done and requirements met, 1 done but not met, 2 bad input, 3 interrupted (the best so far is saved).
`)
}

func explain(w io.Writer, topic string) bool { return false }

func help(c *call) (int, error) {
	overview(c.stdout)
	return exitMet, nil
}
func check(c *call) (int, error) { return exitMet, nil }
