package main

import (
	"bytes"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strings"

	"github.com/google/renameio/v2"
	"github.com/spf13/cobra"
	"github.com/spf13/pflag"

	"nightwright/cmd/nightwright/work"
)

func (a *app) manualCommand() *cobra.Command {
	return a.command("manual DIR", 0, &cobra.Command{
		Short: "write the manual pages, one for each command",
		Long: `Writes a manual page for the program and one for each command into a folder,
made from the same texts as --help. 'man -l FILE' shows one; in a folder man1
below one of the manual path's, 'man nightwright-plan' finds it.`,
		Example: `  nightwright manual ~/.local/share/man/man1
  man nightwright-plan`,
	}, func(cmd *cobra.Command, args []string) error {
		dir := args[0]
		if info, err := os.Stat(dir); err == nil && !info.IsDir() {
			return work.Inputf("%s is a file; want a folder for the pages", dir)
		}
		if err := os.MkdirAll(dir, 0o755); err != nil {
			return err
		}
		root := cmd.Root()
		var names []string
		for _, c := range append([]*cobra.Command{root}, pagesOf(root)...) {
			name := pageName(c) + ".1"
			if err := renameio.WriteFile(filepath.Join(dir, name), manPage(c), 0o644); err != nil {
				return err
			}
			names = append(names, filepath.Join(dir, name))
		}
		a.endProgress()
		if a.asJSON {
			return a.json(map[string][]string{"pages": names})
		}
		p := a.printer()
		for _, n := range names {
			p.line("%s", n)
		}
		return p.flush()
	})
}

// pagesOf lists the commands below one that have a page, deep ones too.
func pagesOf(c *cobra.Command) []*cobra.Command {
	var out []*cobra.Command
	for _, sub := range c.Commands() {
		if sub.IsAvailableCommand() {
			out = append(out, sub)
			out = append(out, pagesOf(sub)...)
		}
	}
	return out
}

func pageName(c *cobra.Command) string { return strings.ReplaceAll(c.CommandPath(), " ", "-") }

// manPage writes a command's manual page in roff, with the macros of man(7).
// It has no date: the same program gives the same pages.
func manPage(c *cobra.Command) []byte {
	var b bytes.Buffer
	fmt.Fprintf(&b, ".TH %s 1 \"\" \"nightwright %s\" \"nightwright\"\n", roffWord(strings.ToUpper(pageName(c))), roffWord(version()))
	fmt.Fprintf(&b, ".SH NAME\n%s \\- %s\n", roffWord(pageName(c)), roffWord(c.Short))
	b.WriteString(".SH SYNOPSIS\n.nf\n")
	roffLines(&b, synopsis(c))
	b.WriteString(".fi\n.SH DESCRIPTION\n.nf\n")
	roffLines(&b, c.Long)
	b.WriteString(".fi\n")
	if subs := c.Commands(); len(subs) > 0 {
		b.WriteString(".SH COMMANDS\n")
		for _, s := range subs {
			if s.IsAvailableCommand() {
				fmt.Fprintf(&b, ".TP\n.B %s\n%s\n", roffWord(s.Name()), roffWord(s.Short))
			}
		}
	}
	roffFlags(&b, "OPTIONS", c.NonInheritedFlags())
	roffFlags(&b, "OPTIONS OF ALL COMMANDS", c.InheritedFlags())
	if c.Example != "" {
		b.WriteString(".SH EXAMPLES\n.nf\n")
		roffLines(&b, c.Example)
		b.WriteString(".fi\n")
	}
	b.WriteString(".SH EXIT STATUS\n.TP\n.B 0\ndone\n.TP\n.B 1\nthe work failed, or the answer is no\n.TP\n.B 2\nthe input is at fault\n.TP\n.B 130\ninterrupted\n")
	b.WriteString(".SH ENVIRONMENT\n.TP\n.B NIGHTWRIGHT_NAME\nsets the flag \\-\\-name of any command; the command line counts more, the settings file less\n.TP\n.B NO_COLOR\nno colours when it is set\n")
	b.WriteString(".SH SEE ALSO\n")
	var near []string
	if c.HasParent() {
		near = append(near, `.BR nightwright (1)`)
	}
	for _, s := range pagesOf(c.Root()) {
		if s != c {
			near = append(near, fmt.Sprintf(".BR %s (1)", roffWord(pageName(s))))
		}
	}
	b.WriteString(strings.Join(near, "\n") + "\n")
	return b.Bytes()
}

func synopsis(c *cobra.Command) string {
	if c.HasParent() {
		return c.UseLine()
	}
	return c.CommandPath() + " COMMAND [flags]"
}

func roffFlags(b *bytes.Buffer, title string, flags *pflag.FlagSet) {
	if !flags.HasAvailableFlags() {
		return
	}
	fmt.Fprintf(b, ".SH %s\n", title)
	flags.VisitAll(func(f *pflag.Flag) {
		if f.Hidden {
			return
		}
		kind, usage := pflag.UnquoteUsage(f)
		name := "--" + f.Name
		if f.Shorthand != "" {
			name = "-" + f.Shorthand + ", " + name
		}
		if kind != "" {
			name += " " + kind
		}
		switch f.DefValue {
		case "", "false", "0", "[]", "0s":
		default:
			usage += " (default " + f.DefValue + ")"
		}
		fmt.Fprintf(b, ".TP\n.B %s\n%s\n", roffWord(name), roffWord(usage))
	})
}

// roffWord makes one line of text plain in roff.
func roffWord(text string) string {
	text = strings.NewReplacer(`\`, `\e`, "-", `\-`, "\n", " ").Replace(text)
	if strings.HasPrefix(text, ".") || strings.HasPrefix(text, "'") {
		text = `\&` + text
	}
	return text
}

// roffLines writes lines as they are.
func roffLines(w io.Writer, text string) {
	for _, line := range strings.Split(strings.Trim(text, "\n"), "\n") {
		if line == "" {
			fmt.Fprintln(w, ".sp")
			continue
		}
		fmt.Fprintln(w, roffWord(line))
	}
}
