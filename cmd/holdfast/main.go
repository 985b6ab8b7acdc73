// Command holdfast designs pulses that an instrument can play and that hold a
// quantum gate against errors, and proves from the emitted samples what they are
// worth.
//
//	holdfast start DIR       writes a commented profile, device and brief
//	holdfast check FILE...   reads them and says what they mean
//	holdfast design BRIEF    makes a pulse folder with a datasheet
//	holdfast replay PULSE    recomputes a pulse folder by other means
//	holdfast card PROFILE DEVICE  writes sequences that tell how the bench is wired
//	holdfast help [TOPIC]
//	holdfast version
//
// Results go to stdout, progress and errors to stderr. Exit status: 0 done and
// requirements met; 1 done, requirements not met; 2 bad input; 3 interrupted, the
// best so far is saved.
package main

import (
	"context"
	"errors"
	"flag"
	"fmt"
	"io"
	"os"
	"os/signal"
	"strings"
	"syscall"

	"golang.org/x/term"
)

// version of the program, as records carry it.
const version = "0.1.0"

// The exit statuses.
const (
	exitMet         = 0
	exitMissed      = 1
	exitBadInput    = 2
	exitInterrupted = 3
)

func main() {
	signals := make(chan os.Signal, 3)
	signal.Notify(signals, os.Interrupt, syscall.SIGTERM)
	soft, stop := context.WithCancel(context.Background())
	hard, kill := context.WithCancel(context.Background())
	// The first interrupt ends the search and keeps the best so far, the second
	// ends its judgement too, the third the program.
	go func() {
		<-signals
		stop()
		<-signals
		kill()
		<-signals
		os.Exit(exitInterrupted)
	}()
	os.Exit(runUntil(soft, hard, os.Args[1:], os.Stdout, os.Stderr))
}

// A verb is one subcommand. Its run returns the exit status, and an error to
// be printed in one line.
type verb struct {
	name, operands, short string
	flags                 string // as the usage line shows them
	run                   func(c *call) (int, error)
}

// verbs lists the subcommands in the order of the help; a function because help
// is one of them.
func verbs() []verb {
	return []verb{
		{"start", "DIR", "write a commented profile, device and brief into a new folder", "[-pair] [-json]", start},
		{"check", "FILE...", "read profiles, devices, briefs and say what they mean", "[-json]", check},
		{"design", "BRIEF", "design a pulse and write its folder with a datasheet", "[-out FOLDER] [-force] [-json]", designPulse},
		{"replay", "PULSE", "recompute a pulse folder by other means and judge it", "[-datasheet FILE] [-json]", replayPulse},
		{"card", "PROFILE DEVICE", "write three sequences that tell how the bench is wired", "[-out FOLDER] [-force] [-channel NAME] [-detuning F] [-json]", card},
		{"help", "[VERB | TOPIC]", "explain a verb, or one of: profile, device, brief, pulse, json", "[-json]", help},
		{"version", "", "print the version", "[-json]", printVersion},
	}
}

// A call is one run of a verb.
type call struct {
	ctx    context.Context // cancelled by the first interrupt
	hard   context.Context // cancelled by the second
	verb   verb
	args   []string // after the verb
	stdout io.Writer
	stderr io.Writer
	json   bool // print one JSON object instead of text; known after parse
}

// after gives the context for the work that follows a search: the call's own, or,
// when that was cancelled during the search, the one for the second interrupt.
func (c *call) after() context.Context {
	if c.ctx.Err() == nil {
		return c.ctx
	}
	return c.hard
}

// run is the whole program but for the process around it, with one interrupt.
func run(ctx context.Context, args []string, stdout, stderr io.Writer) int {
	return runUntil(ctx, context.WithoutCancel(ctx), args, stdout, stderr)
}

func runUntil(ctx, hard context.Context, args []string, stdout, stderr io.Writer) int {
	if len(args) == 0 {
		overview(stderr)
		return exitBadInput
	}
	name := args[0]
	switch name {
	case "-h", "-help", "--help":
		name = "help"
	case "-version", "--version":
		name = "version"
	}
	for _, v := range verbs() {
		if v.name != name {
			continue
		}
		c := &call{ctx: ctx, hard: hard, verb: v, args: args[1:], stdout: stdout, stderr: stderr}
		status, err := v.run(c)
		if errors.Is(err, flag.ErrHelp) {
			explain(stdout, v.name)
			return exitMet
		}
		if err != nil {
			fmt.Fprintf(stderr, "holdfast: %s\n", oneLine(err))
		}
		return status
	}
	fmt.Fprintf(stderr, "holdfast: found the verb %q; allowed: %s\n", args[0], verbNames())
	return exitBadInput
}

func verbNames() string {
	var names []string
	for _, v := range verbs() {
		names = append(names, v.name)
	}
	return strings.Join(names, ", ")
}

func oneLine(err error) string { return strings.Join(strings.Fields(err.Error()), " ") }

// flags returns a flag set that has what every verb has and keeps quiet: errors are told by parse.
func (c *call) flags() *flag.FlagSet {
	f := flag.NewFlagSet(c.verb.name, flag.ContinueOnError)
	f.SetOutput(io.Discard)
	f.BoolVar(&c.json, "json", false, "print one JSON object instead of text")
	return f
}

// parse reads flags, which may stand before, between and after the operands,
// and checks the number of operands.
func (c *call) parse(f *flag.FlagSet, least, most int) ([]string, error) {
	var operands []string
	rest := c.args
	for {
		if err := f.Parse(rest); err != nil {
			if errors.Is(err, flag.ErrHelp) {
				return nil, err
			}
			return nil, fmt.Errorf("%s: %v; 'holdfast help %s' lists the flags", c.verb.name, err, c.verb.name)
		}
		done := len(rest) - f.NArg()
		if done > 0 && rest[done-1] == "--" {
			operands = append(operands, f.Args()...)
			break
		}
		if f.NArg() == 0 {
			break
		}
		operands = append(operands, f.Arg(0))
		rest = f.Args()[1:]
	}
	if n := len(operands); n < least || n > most {
		return nil, fmt.Errorf("%s: found %d operands; allowed: holdfast %s %s", c.verb.name, n, c.verb.name, c.verb.operands)
	}
	return operands, nil
}

// terminal says whether progress may be shown on w.
func terminal(w io.Writer) bool {
	f, ok := w.(*os.File)
	return ok && term.IsTerminal(int(f.Fd()))
}

func printVersion(c *call) (int, error) {
	if _, err := c.parse(c.flags(), 0, 0); err != nil {
		return exitBadInput, err
	}
	if c.json {
		return exitMet, c.emit(versionForm{Format: jsonFormat, Program: "holdfast", Version: version})
	}
	fmt.Fprintf(c.stdout, "holdfast %s\n", version)
	return exitMet, nil
}

// versionForm is what version -json prints.
type versionForm struct {
	Format  int    `json:"format"`
	Program string `json:"program"`
	Version string `json:"version"`
}
