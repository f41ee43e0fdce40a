package main

import (
	"fmt"
	"strconv"
	"strings"

	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
)

// shownCases is how many cases of one kind a summary lists.
const shownCases = 8

func (a *app) checkCommand() *cobra.Command {
	var all bool
	c := a.command("check SURVEY", 0, &cobra.Command{
		Short: "validate a survey; demand against supply; what can't be done",
		Long: `Reads the survey and tells every fault at once, each with file and line. When
there is none: the hours each site has, what is asked for against what there is
by right ascension and month, what each rule takes away, the demands no window
opens for with the rule that shuts them, the fields that can't be finished by
any plan, and the values that hold for what the survey leaves out.

Each field is looked at as if it were alone: what is called impossible is
impossible for every plan.`,
		Example: `  nightwright check mysurvey
  nightwright check mysurvey --all
  nightwright check mysurvey --json`,
	}, func(cmd *cobra.Command, args []string) error {
		s, err := a.survey(args[0])
		if err != nil {
			return err
		}
		if m := s.MemoryNote(); m != "" {
			a.note("%s", m)
		}
		r, err := work.Check(cmd.Context(), s, a.options())
		if err != nil {
			return err
		}
		a.endProgress()
		if a.asJSON {
			return a.json(r)
		}
		p := a.printer()
		p.check(r, s.Path, all)
		return p.flush()
	})
	c.Flags().BoolVar(&all, "all", false, "list every demand that can't be done, not the first "+strconv.Itoa(shownCases))
	return c
}

func (p *printer) check(r *work.CheckResult, path string, all bool) {
	p.line("%s: no fault. %s, %s to %s", p.bold(r.Survey), count(r.Nights, "night"), r.FirstNight, r.LastNight)
	p.line("%s want %s", count(r.Fields, "field"), count(r.VisitsWanted, "visit"))
	p.line("%s h of telescope time are asked, %s h are open%s", hours(r.HoursAsked), hours(r.HoursOpen), times(r.HoursAsked, r.HoursOpen))

	p.head("Hours of each telescope (open: the Sun low enough, less closures and reserves)")
	l := newList("<site", "<telescope", "dark h", "open h", "to plan h")
	for _, t := range r.Telescopes {
		l.add(clip(t.Site, 24), clip(t.Telescope, 16), hours(t.Dark), hours(t.Open), hours(t.Free))
	}
	p.table(l)

	p.head("Right ascension: hours asked, and hours in which such a field can be seen")
	l = newList("RA h", "asked h", "seen h", "asked/seen", "open with it on the meridian h")
	for _, b := range r.Ascension {
		l.add(fmt.Sprintf("%2d-%2d", b.From, b.To), hours(b.Asked), hours(b.Seen), ratio(b.Asked, b.Seen), hours(b.Open))
	}
	p.table(l)

	p.head("Months (what is asked is spread over the time it can be seen in)")
	l = newList("<month", "asked h", "open h", "asked/open")
	for _, m := range r.Months {
		l.add(m.Month, hours(m.Asked), hours(m.Open), ratio(m.Asked, m.Open))
	}
	p.table(l)

	p.head("What the rules take away, of the time with the field up and the Sun low enough")
	l = newList("<rule", "broken", "taken in turn")
	for _, x := range r.Rules {
		l.add(x.Rule, percent(x.Takes, 1), percent(x.InOrder, 1))
	}
	l.add("left", "", percent(r.Usable, 1))
	p.table(l)

	p.impossible(r, path, all)

	p.defaults(r.Defaults, all)

	p.line("")
	p.line("Next: nightwright plan %s", quote(path))
}

// defaults lists what holds for keys that a survey leaves out: in two columns,
// or with what they mean.
func (p *printer) defaults(d []work.CheckDefault, all bool) {
	if all {
		p.head("What holds where the survey says nothing")
		l := newList("<key", "<default", "<meaning")
		for _, x := range d {
			l.add(x.Key, x.Default, x.About)
		}
		p.table(l)
		return
	}
	p.head("What holds where the survey says nothing (--all tells what it means)")
	half := (len(d) + 1) / 2
	for i := range half {
		right := ""
		if i+half < len(d) {
			right = setting(d[i+half])
		}
		p.line("  %-38s  %s", setting(d[i]), right)
	}
}

// setting writes a default as "key: value", without the groups it stands in
// when that would be too long.
func setting(d work.CheckDefault) string {
	key := d.Key
	for len(key)+len(d.Default) > 36 {
		_, inner, ok := strings.Cut(key, ".")
		if !ok {
			break
		}
		key = inner
	}
	return clip(key+": "+d.Default, 38)
}

// impossible lists what no plan can do.
func (p *printer) impossible(r *work.CheckResult, path string, all bool) {
	if len(r.Shut) == 0 && len(r.Short) == 0 {
		p.head("Every field can be finished, as far as its own windows go")
		return
	}
	p.head("%s can't be finished by any plan", count(r.FieldsShort, "field"))
	most := shownCases
	if all {
		most = len(r.Shut) + len(r.Short)
	}
	if n := len(r.Shut); n > 0 {
		p.line("  No window opens for %s:", count(n, "demand"))
		l := newList("<field", "<demand", "<what shuts it")
		for _, x := range r.Shut[:min(n, most)] {
			l.add(clip(x.Field, 24), clip(x.Demand, 16), x.Limit)
		}
		p.table(l)
		p.more(n-most, path)
	}
	if n := len(r.Short); n > 0 {
		p.line("  Windows too short for all visits of %s:", count(n, "demand"))
		l := newList("<field", "<demand", "wanted", "at most", "<by")
		for _, x := range r.Short[:min(n, most)] {
			l.add(clip(x.Field, 24), clip(x.Demand, 16), strconv.Itoa(x.Wanted), strconv.Itoa(x.Most), x.Limit)
		}
		p.table(l)
		p.more(n-most, path)
	}
}

func (p *printer) more(n int, path string) {
	if n > 0 {
		p.line("  and %s more: nightwright check %s --all", thousands(n), quote(path))
	}
}

// times writes how often one number holds another, in brackets.
func times(part, whole float64) string {
	if whole == 0 {
		return ""
	}
	return fmt.Sprintf(" (%.2f times that)", part/whole)
}

func ratio(part, whole float64) string {
	if whole == 0 {
		if part == 0 {
			return "-"
		}
		return "never"
	}
	return strconv.FormatFloat(part/whole, 'f', 2, 64)
}
