package main

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"strings"
	"syscall"

	"nightwright/cmd/nightwright/work"
)

// The exit codes.
const (
	exitDone        = 0   // done
	exitNo          = 1   // the work failed, or the answer is no
	exitInput       = 2   // the input is at fault
	exitInterrupted = 130 // interrupted; what stood before still stands
)

// errNo ends a command whose answer is no and was told already.
var errNo = errors.New("the answer is no")

// errKept ends an interrupted command that kept what it had and told so.
var errKept = errors.New("interrupted, and kept")

// Run runs the program with the given arguments (without the program's name)
// and returns its exit code. Results go to stdout, progress and messages to
// stderr. An interrupt (Ctrl-C) or a termination signal ends the work cleanly; a
// second one ends the process at once.
func Run(args []string, stdin io.Reader, stdout, stderr io.Writer) int {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	defer stop()
	context.AfterFunc(ctx, stop) // from now on a signal has its usual effect
	return run(ctx, args, stdin, stdout, stderr)
}

func run(ctx context.Context, args []string, stdin io.Reader, stdout, stderr io.Writer) int {
	a := &app{stdin: stdin, stdout: stdout, stderr: stderr}
	root := a.root()
	root.SetArgs(args)
	root.SetIn(stdin)
	root.SetOut(stdout)
	root.SetErr(stderr)
	err := root.ExecuteContext(ctx)
	a.endProgress()
	return a.exit(ctx, err)
}

// exit tells what went wrong and maps it to the exit code.
func (a *app) exit(ctx context.Context, err error) int {
	var fault *work.InputError
	switch {
	case err == nil:
		return exitDone
	case errors.Is(err, errNo):
		return exitNo
	case errors.Is(err, errKept):
		return exitInterrupted
	case ctx.Err() != nil || errors.Is(err, context.Canceled):
		a.say("nightwright: interrupted; nothing was written, what stood before still stands")
		return exitInterrupted
	case errors.As(err, &fault):
		for _, line := range fault.Lines() {
			a.say("%s", line)
		}
		if n := fault.Faults(); n > 0 {
			a.say("nightwright: %s in the %s; nothing was written", count(n, "fault"), cmp.Or(fault.Of, "survey"))
		}
		return exitInput
	case !a.started: // cobra's own: unknown command, flag or argument
		text := strings.TrimSpace(err.Error())
		a.say("nightwright: %s", text)
		if !strings.Contains(text, "--help") {
			a.say("Run 'nightwright --help' for the commands and 'nightwright COMMAND --help' for its flags.")
		}
		return exitInput
	default:
		a.say("nightwright: %s", err)
		return exitNo
	}
}

// say writes one message line to stderr; --quiet doesn't silence it.
func (a *app) say(format string, args ...any) { fmt.Fprintf(a.stderr, format+"\n", args...) }

// note writes a message line to stderr unless --quiet was given.
func (a *app) note(format string, args ...any) {
	if !a.quiet {
		a.say(format, args...)
	}
}

// count writes "1 fault", "2 faults".
func count(n int, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return thousands(n) + " " + noun + "s"
}
