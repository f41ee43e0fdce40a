package main

import (
	"path/filepath"
	"strings"

	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
	"nightwright/scheduler/tables"
)

func (a *app) almanacCommand() *cobra.Command {
	var f tableFlags
	var sites []string
	c := a.command("almanac SURVEY", 0, &cobra.Command{
		Short: "Sun, twilights and Moon, a row per site and night",
		Long: `Writes a row per site and night: sunset, the three twilights, sunrise, moonrise,
moonset, the Moon's illuminated part at mid-night, and the hours with the Sun
under -18 degrees. Instants are UTC; what doesn't happen in a night is left out.

Sunset is the Sun's centre at -50', moonset the Moon's upper limb at -34'
(refraction at the horizon, common practice); no dip for the site's height.`,
		Example: `  nightwright almanac mysurvey
  nightwright almanac mysurvey --site "Cinder Ridge" --csv
  nightwright almanac mysurvey --out almanac.parquet`,
	}, func(cmd *cobra.Command, args []string) error {
		s, err := a.knownSurvey(args[0])
		if err != nil {
			return err
		}
		rows, err := work.Almanac(cmd.Context(), s, sites, a.options())
		if err != nil {
			return err
		}
		return show(a, tables.Almanac, rows, f)
	})
	a.tableFlags(c, &f)
	c.Flags().StringArrayVar(&sites, "site", nil, "only the site `NAME`; may be repeated")
	return c
}

// tableFlags adds the flags of a command that writes a table.
func (a *app) tableFlags(c *cobra.Command, f *tableFlags) {
	c.Flags().StringVar(&f.out, "out", "", "write to this `FILE`, as Parquet, or as CSV when it ends in .csv")
	c.Flags().BoolVar(&f.asCSV, "csv", false, "write CSV")
	c.PreRunE = func(*cobra.Command, []string) error {
		if f.asCSV && strings.EqualFold(filepath.Ext(f.out), ".parquet") {
			return work.Inputf("--csv and --out %s ask for two forms; want --out FILE.csv, or no --csv", f.out)
		}
		return nil
	}
}

// survey reads a survey and tells its warnings.
func (a *app) survey(path string) (*work.Survey, error) {
	s, err := a.knownSurvey(path)
	if err != nil {
		return nil, err
	}
	for _, w := range s.AllWarnings() {
		a.note("%s", w)
	}
	return s, nil
}

// knownSurvey reads a survey for a command that is run again and again, and
// leaves the warnings about its files to those that look at it as a whole.
func (a *app) knownSurvey(path string) (*work.Survey, error) {
	s, err := work.ReadSurvey(path)
	if err != nil {
		return nil, err
	}
	if w := s.LeapWarning(); w != "" {
		a.note("warning: %s", w)
	}
	return s, nil
}
