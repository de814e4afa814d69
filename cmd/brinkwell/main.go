// Command brinkwell is the working tool for benches that make a virtual double
// well by feedback. Each command has a file of its own here: flags in, a
// package called, a result printed.
package main

import (
	"errors"
	"fmt"
	"io"
	"os"

	"github.com/spf13/cobra"
)

// Exit codes, the same for every command.
const (
	exitDone      = 0
	exitTolerance = 1 // done, but a stated tolerance is not met
	exitUsage     = 2 // bad usage or settings
	exitFailed    = 3 // the run itself failed
	exitWrite     = 4 // could not write what was asked
)

// An exitError is an error that chooses the exit code. Without an inner error
// there is nothing left to say.
type exitError struct {
	code int
	err  error
}

func (e *exitError) Error() string {
	if e.err == nil {
		return fmt.Sprintf("exit %d", e.code)
	}
	return e.err.Error()
}

func (e *exitError) Unwrap() error { return e.err }

// A shell is what a command may touch of the world outside.
type shell struct {
	out, err io.Writer
	environ  []string
}

func main() {
	sh := shell{out: os.Stdout, err: os.Stderr, environ: os.Environ()}
	os.Exit(run(sh, os.Args[1:]))
}

// run runs one command line and returns its exit code.
func run(sh shell, args []string) int {
	root := &cobra.Command{
		Use:   "brinkwell",
		Short: "work with a double well that a feedback loop makes",
		Long: `brinkwell is a working tool for benches that make a virtual double well by
feedback: a resonator's position is measured at a fixed rate, compared with a
threshold, and one of two levels is applied, so that it feels the parabola of
the side it is on. It states what potential that loop really makes.

Exit codes: 0 done; 1 done, but a stated tolerance is not met; 2 bad usage or
settings; 3 the run failed; 4 could not write what was asked.`,
		SilenceErrors: true,
		SilenceUsage:  true,
		Args:          cobra.NoArgs,
		RunE:          func(c *cobra.Command, _ []string) error { return c.Help() },
	}
	root.CompletionOptions.DisableDefaultCmd = true
	root.SetOut(sh.out)
	root.SetErr(sh.err)
	root.SetArgs(args)
	root.AddCommand(benchCommand(sh))

	err := root.Execute()
	if err == nil {
		return exitDone
	}
	var e *exitError
	if !errors.As(err, &e) { // cobra's own: an unknown command or flag
		fmt.Fprintf(sh.err, "brinkwell: %v\nrun 'brinkwell --help' or 'brinkwell COMMAND --help' for what there is\n", err)
		return exitUsage
	}
	if e.err != nil {
		fmt.Fprintf(sh.err, "brinkwell: %v\n", e.err)
	}
	return e.code
}
