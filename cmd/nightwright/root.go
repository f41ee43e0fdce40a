package main

import (
	"errors"
	"fmt"
	"io"
	"runtime"
	"runtime/debug"
	"strings"

	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"nightwright/cmd/nightwright/work"
)

// app is one run of the program: its streams and what all commands share.
type app struct {
	stdin          io.Reader
	stdout, stderr io.Writer

	asJSON, quiet bool
	workers       int
	settingsFile  string

	started  bool // a command's own code has begun; errors before that are the command line's
	progress reporter
}

const rootLong = `nightwright plans a sky survey that observes from several sites. It works out
when each field can be seen, gives fields to telescopes and times so that the
weighted coverage is as high as it can get, proves a ceiling that no plan can
exceed, and writes the list for each night.

Exit codes: 0 done; 1 the work failed or the answer is no; 2 the input is at
fault; 130 interrupted.`

const rootExample = `  nightwright demo                       the whole job on a small survey, in seconds
  nightwright new mysurvey               a survey folder to start from
  nightwright check mysurvey             what is in it, and what can't be done
  nightwright plan mysurvey              plan it; the plan goes to mysurvey/plan
  nightwright sheet mysurvey mysurvey/plan --telescope C1 --night 2027-02-01`

func (a *app) root() *cobra.Command {
	root := &cobra.Command{
		Use:           "nightwright",
		Short:         "plans a sky survey that observes from several sites",
		Long:          rootLong,
		Example:       rootExample,
		Version:       version(),
		SilenceUsage:  true,
		SilenceErrors: true,
		Args:          a.unknownCommand,
		RunE:          func(cmd *cobra.Command, _ []string) error { return cmd.Help() },
	}
	root.CompletionOptions.DisableDefaultCmd = true // ours has words of its own
	root.SetHelpCommand(&cobra.Command{Use: "no-help", Hidden: true})
	root.SetFlagErrorFunc(flagFault)
	root.SetVersionTemplate("nightwright {{.Version}}\n")
	flags := root.PersistentFlags()
	flags.BoolVar(&a.asJSON, "json", false, "write the result as JSON on stdout")
	flags.BoolVar(&a.quiet, "quiet", false, "no progress and no notes on stderr")
	flags.IntVar(&a.workers, "workers", runtime.GOMAXPROCS(0), "use `N` threads; the result doesn't depend on it")
	flags.Lookup("workers").DefValue = "all cores"
	flags.StringVar(&a.settingsFile, "settings", "", "settings `FILE` (default nightwright.yaml here, else the one in the user's configuration folder)")
	root.PersistentPreRunE = func(cmd *cobra.Command, _ []string) error {
		if err := a.applySettings(cmd); err != nil {
			return err
		}
		if a.workers < 1 {
			return fmt.Errorf("--workers is %d; want 1 or more", a.workers)
		}
		a.startProgress()
		return nil
	}
	for _, c := range []*cobra.Command{
		a.demoCommand(), a.newCommand(), a.fieldsCommand(), a.checkCommand(), a.almanacCommand(), a.gridCommand(),
		a.planCommand(), a.replanCommand(), a.auditCommand(), a.sheetCommand(), a.explainCommand(), a.recordCommand(), a.loseCommand(), a.ledgerCommand(), a.reportCommand(), a.exportCommand(), a.serveCommand(),
		a.weatherCommand(), a.forecastCommand(), a.compareCommand(), a.gatherCommand(),
		a.completionCommand(), a.manualCommand(),
	} {
		root.AddCommand(c)
	}
	if err := completeFlags(root); err != nil {
		panic("a flag's completion was registered twice: " + err.Error())
	}
	return root
}

// flagFault says what a flag wants in the words of the other messages.
func flagFault(_ *cobra.Command, err error) error {
	var bad *pflag.InvalidValueError
	if !errors.As(err, &bad) {
		return err
	}
	want, ok := map[string]string{
		"uint64": "a whole number, 0 or more", "int": "a whole number", "float64": "a number", "bool": "true or false", "duration": "a time such as 90s, 10m or 2h",
	}[bad.GetFlag().Value.Type()]
	if !ok {
		return err
	}
	return fmt.Errorf("--%s is %q; want %s", bad.GetFlag().Name, bad.GetValue(), want)
}

// unknownCommand refuses what is no command, with what is near to it.
func (a *app) unknownCommand(cmd *cobra.Command, args []string) error {
	if len(args) == 0 {
		return nil
	}
	cmd.SuggestionsMinimumDistance = 2
	var names []string
	for _, c := range cmd.Commands() {
		if c.IsAvailableCommand() {
			names = append(names, c.Name())
		}
	}
	if near := cmd.SuggestionsFor(args[0]); len(near) > 0 {
		return fmt.Errorf("there is no command %q; did you mean %s?", args[0], strings.Join(near, " or "))
	}
	return fmt.Errorf("there is no command %q; the commands are %s", args[0], strings.Join(names, ", "))
}

// command makes a command that takes the named arguments, all of them unless
// optional says how many of the last may be missing.
func (a *app) command(use string, optional int, c *cobra.Command, run func(cmd *cobra.Command, args []string) error) *cobra.Command {
	c.Use = use
	words := strings.Fields(use)
	want := 0
	for _, w := range words[1:] {
		if strings.HasPrefix(w, "--") || strings.HasPrefix(w, "[--") {
			break
		}
		want++
	}
	c.Args = func(cmd *cobra.Command, args []string) error {
		if len(args) < want-optional {
			return fmt.Errorf("%s wants %s and got %s; want: nightwright %s", cmd.Name(), count(want-optional, "argument"), count(len(args), "argument"), use)
		}
		if len(args) > want {
			return fmt.Errorf("%s takes at most %s, %q is one too many; want: nightwright %s", cmd.Name(), count(want, "argument"), args[want], use)
		}
		return nil
	}
	c.RunE = func(cmd *cobra.Command, args []string) error {
		a.started = true
		return run(cmd, args)
	}
	return c
}

// options are what every job takes.
func (a *app) options() work.Options {
	return work.Options{Workers: a.workers, Progress: a.progress.report, Version: version()}
}

// version is the module's version when it was built from one, else "devel".
func version() string {
	if b, ok := debug.ReadBuildInfo(); ok && b.Main.Version != "" && !strings.HasPrefix(b.Main.Version, "(") {
		return strings.TrimSuffix(b.Main.Version, "+dirty")
	}
	return "devel"
}
