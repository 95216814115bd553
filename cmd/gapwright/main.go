// Command gapwright turns the solution of a resonant tank into a transformer
// and a resonant inductor that a prototype shop can wind.
package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"syscall"

	"github.com/spf13/cobra"
	"golang.org/x/term"
)

// Exit codes, as promised by the help text of every command.
const (
	exitDone        = 0
	exitLimitMissed = 1
	exitUsage       = 2
	exitInput       = 3
	exitFiles       = 4
	exitInterrupted = 130
)

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	context.AfterFunc(ctx, stop) // a second interrupt kills at once
	os.Exit(run(ctx, os.Args[1:], osEnvironment()))
}

// environment is what a command may know of the world around it. Tests build
// their own; nothing below main reads os.Stdin, os.Stdout or os.Getenv.
type environment struct {
	stdin          io.Reader
	stdout, stderr io.Writer
	utf8           bool // stdout is a terminal that shows UTF-8 signs (µ, Ω, °)
	progress       bool // stderr is a terminal: progress lines are welcome
	width          int  // columns of the terminal behind stdout, 100 when there is none
}

func osEnvironment() environment {
	e := environment{stdin: os.Stdin, stdout: os.Stdout, stderr: os.Stderr, width: 100}
	if fd := int(os.Stdout.Fd()); term.IsTerminal(fd) {
		e.utf8 = localeIsUTF8(os.Getenv)
		if w, _, err := term.GetSize(fd); err == nil && w > 0 {
			e.width = w
		}
	}
	e.progress = term.IsTerminal(int(os.Stderr.Fd()))
	return e
}

// failure carries an exit code other than "input invalid" up to run.
type failure struct {
	code int
	err  error // nil: everything worth saying is on stdout already
}

func (f failure) Error() string {
	if f.err == nil {
		return fmt.Sprintf("exit code %d", f.code)
	}
	return f.err.Error()
}

func (f failure) Unwrap() error { return f.err }

// run is the whole program with everything injected. It returns the exit code.
func run(ctx context.Context, args []string, env environment) int {
	started := false
	root := newRootCommand(env, func() { started = true })
	root.SetArgs(args)
	err := root.ExecuteContext(ctx)
	if errors.Is(ctx.Err(), context.Canceled) && err != nil {
		fmt.Fprintln(env.stderr, "gapwright: interrupted")
		return exitInterrupted
	}
	if err == nil {
		return exitDone
	}
	code := exitInput
	if !started {
		// cobra reports wrong flags, arguments and flag groups before any RunE.
		code = exitUsage
	}
	if f, ok := errors.AsType[failure](err); ok {
		code = f.code
		if f.err == nil {
			return code
		}
	}
	printErrors(env.stderr, err)
	if code == exitUsage {
		fmt.Fprintln(env.stderr, "run 'gapwright --help' or 'gapwright COMMAND --help' for the usage")
	}
	return code
}

// printErrors writes one line per error: input errors carry file:line:column
// themselves and stand alone, so that an editor can jump to them; all others
// are introduced by the program's name.
func printErrors(w io.Writer, err error) {
	if many, ok := err.(interface{ Unwrap() []error }); ok {
		for _, e := range many.Unwrap() {
			printErrors(w, e)
		}
		return
	}
	if located, ok := errors.AsType[interface {
		error
		Position() (file string, line, column int)
	}](err); ok {
		fmt.Fprintln(w, located)
		return
	}
	fmt.Fprintf(w, "gapwright: %v\n", err)
}

// markStarted wraps every RunE below c so that run can tell a usage error from
// an error of the work itself.
func markStarted(c *cobra.Command, started func()) {
	if inner := c.RunE; inner != nil {
		c.RunE = func(cmd *cobra.Command, args []string) error {
			started()
			return inner(cmd, args)
		}
	}
	for _, sub := range c.Commands() {
		markStarted(sub, started)
	}
}
