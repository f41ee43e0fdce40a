package main

import (
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
	nouns "nightwright/constraints/survey"
	"nightwright/scheduler/ledger"
)

func (a *app) completionCommand() *cobra.Command {
	shells := []struct {
		name  string
		write func(root *cobra.Command, w io.Writer) error
	}{
		{"bash", func(root *cobra.Command, w io.Writer) error { return root.GenBashCompletionV2(w, true) }},
		{"zsh", func(root *cobra.Command, w io.Writer) error { return root.GenZshCompletion(w) }},
		{"fish", func(root *cobra.Command, w io.Writer) error { return root.GenFishCompletion(w, true) }},
		{"powershell", func(root *cobra.Command, w io.Writer) error { return root.GenPowerShellCompletionWithDesc(w) }},
	}
	var names []string
	for _, s := range shells {
		names = append(names, s.name)
	}
	c := a.command("completion SHELL", 0, &cobra.Command{
		Short:     "write a script that completes commands for a shell",
		ValidArgs: names,
		Long: `Writes a script on stdout with which a shell completes commands, flags and
their values: formats, efforts, causes, and the sites, telescopes and nights of
the survey that the command names. SHELL is bash, zsh, fish or powershell.`,
		Example: `  nightwright completion bash > ~/.nightwright.bash
  source ~/.nightwright.bash
  nightwright completion zsh > "${fpath[1]}/_nightwright"
  nightwright completion fish > ~/.config/fish/completions/nightwright.fish`,
	}, func(cmd *cobra.Command, args []string) error {
		for _, s := range shells {
			if s.name == args[0] {
				return s.write(cmd.Root(), a.stdout)
			}
		}
		return work.Inputf("there is no script for %q; want one of %s", args[0], strings.Join(names, ", "))
	})
	return c
}

// complete completes a flag's value from what a function lists.
func complete(list func(args []string) []string) func(*cobra.Command, []string, string) ([]string, cobra.ShellCompDirective) {
	return func(_ *cobra.Command, args []string, typed string) ([]string, cobra.ShellCompDirective) {
		var out []string
		for _, w := range list(args) {
			if strings.HasPrefix(w, typed) {
				out = append(out, w)
			}
		}
		return out, cobra.ShellCompDirectiveNoFileComp
	}
}

// fixedWords are the values of flags that have a closed list, whatever the
// command.
var fixedWords = map[string]func() []string{
	"effort": work.Efforts,
	"as":     work.ExportFormats,
	"table":  work.ExportNames,
	"cause":  ledger.Causes,
}

// surveyWords are the values of flags that name something of the survey.
var surveyWords = map[string]func(s *work.Survey) []string{
	"telescope": func(s *work.Survey) (out []string) {
		for i := range s.Telescopes {
			out = append(out, s.Telescopes[i].Name)
		}
		return out
	},
	"site": func(s *work.Survey) (out []string) {
		for i := range s.Sites {
			out = append(out, s.Sites[i].Name)
		}
		return out
	},
	"filter": func(s *work.Survey) (out []string) {
		for i := range s.Filters {
			out = append(out, s.Filters[i].Name)
		}
		return out
	},
	"night": func(s *work.Survey) (out []string) {
		for n := range s.Nights() {
			out = append(out, (s.FirstNight + nouns.Day(n)).String())
		}
		return out
	},
}

// surveyNamed reads the survey that a command's first argument names: its
// folder, or a plan folder's copy of it; nil when there is none.
func surveyNamed(args []string) *work.Survey {
	if len(args) == 0 {
		return nil
	}
	for _, path := range []string{args[0], filepath.Join(args[0], "survey")} {
		if _, err := os.Stat(path); err != nil {
			continue
		}
		if s, err := work.ReadSurvey(path); err == nil {
			return s
		}
	}
	return nil
}

// completeFlags makes the flags of all commands complete their values.
func completeFlags(root *cobra.Command) error {
	for _, c := range pagesOf(root) {
		for name, list := range fixedWords {
			if f := c.Flags().Lookup(name); f != nil && f.Value.Type() == "string" {
				if err := c.RegisterFlagCompletionFunc(name, complete(func([]string) []string { return list() })); err != nil {
					return fmt.Errorf("%s --%s: %w", c.Name(), name, err)
				}
			}
		}
		for name, list := range surveyWords {
			if f := c.Flags().Lookup(name); f != nil && f.Value.Type() == "string" {
				err := c.RegisterFlagCompletionFunc(name, complete(func(args []string) []string {
					if s := surveyNamed(args); s != nil {
						return list(s)
					}
					return nil
				}))
				if err != nil {
					return fmt.Errorf("%s --%s: %w", c.Name(), name, err)
				}
			}
		}
	}
	return nil
}
