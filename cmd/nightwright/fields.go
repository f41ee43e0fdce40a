package main

import (
	"strconv"

	"github.com/spf13/cobra"

	"nightwright/cmd/nightwright/work"
)

func (a *app) fieldsCommand() *cobra.Command {
	var o work.FieldsOptions
	var overlap, step float64
	var dithers int
	c := a.command("fields REGION", 0, &cobra.Command{
		Short: "from a footprint on the sky to a field list",
		Long: `Cuts a region of the sky into fields that leave no gap, circles or rectangles,
and writes the list as a survey reads it. REGION is a region file (YAML), or a
MOC alone (.moc, .json, .txt). All angles are degrees, positions ICRS:

  region: Ember belt
  field_of_view_deg: 1.5          # diameter, or {width: 2, height: 1.5}
  overlap: 0.05                   # more overlap than the pattern has of itself
  program: wide                   # of parts without their own
  dithers: {count: 3, step_deg: 0.3}
  weights: weights.csv            # ra_deg,dec_deg,radius_deg,weight: a factor
  parts:                          # the region is all of them together
    - band: {dec_deg: [-30, 10]}
    - box: {ra_deg: [350, 20], dec_deg: [20, 35]}      # eastwards, over 0
    - circle: {ra_deg: 150, dec_deg: 42, radius_deg: 3}
      weight: 4
      program: deep
    - polygon: [[10, 40], [20, 40], [15, 50]]          # great circles between
    - strip: {along: ecliptic, latitude_deg: [-5, 5], longitude_deg: [300, 20]}
    - moc: patch.moc                                   # beside the region file
    - sky: all
  exclude:
    - strip: {along: galaxy, latitude_deg: [-10, 10]}

A field belongs to the part that holds its centre; of several, to the heaviest.
Fields stand in rows of one declination, from the equator to the poles, wherever
the region lies: circles staggered, rectangles edge to edge with north up. Those
on the region's edge that others do for are left out. --overlap 0.1 makes the
pattern for fields a tenth smaller than they are. With dithers the first copy
leaves no gap; the others are moved, each in a direction of its own.`,
		Example: `  nightwright fields belt.yaml --out mysurvey/fields.csv --map belt.svg
  nightwright fields footprint.moc --field-of-view 1.5 --program wide
  nightwright fields belt.yaml --field-of-view 2x1.5 --out fields.csv`,
	}, func(cmd *cobra.Command, args []string) error {
		given := cmd.Flags().Changed
		if given("overlap") {
			o.Overlap = &overlap
		}
		if given("dithers") {
			o.Dithers = &dithers
		}
		if given("dither-step") {
			o.DitherStep = &step
		}
		r, err := work.Fields(cmd.Context(), args[0], o, a.options())
		if err != nil {
			return err
		}
		if a.asJSON {
			return a.json(r)
		}
		return a.tellFields(r)
	})
	c.Flags().StringVar(&o.Out, "out", "fields.csv", "write the field list to this `FILE`")
	c.Flags().StringVar(&o.Map, "map", "", "draw the fields on the sky, to this SVG `FILE`")
	c.Flags().StringVar(&o.FieldOfView, "field-of-view", "", "how large a field is, `DEG`: a diameter, or WIDTHxHEIGHT")
	c.Flags().Float64Var(&overlap, "overlap", 0, "`PART` of the diameter by which fields overlap more than they need, 0 to 0.9")
	c.Flags().IntVar(&dithers, "dithers", 1, "`N` copies of the pattern, all but the first moved")
	c.Flags().Float64Var(&step, "dither-step", 0, "how far the copies are moved, `DEG` (default a quarter of a field)")
	c.Flags().StringVar(&o.Program, "program", "", "`NAME` of the program of parts without one (default wide)")
	c.Flags().StringVar(&o.Prefix, "prefix", "", "`TEXT` before the number in a field's name (default F)")
	return c
}

func (a *app) tellFields(r *work.FieldsResult) error {
	p := a.printer()
	name := r.Region
	if name == "" {
		name = "Region"
	}
	p.line("%s", p.bold(name))
	p.line("")
	number := func(x float64, digits int) string { return strconv.FormatFloat(x, 'f', digits, 64) }
	p.line("  region   %s deg2, %s %% of the sky", number(r.Area, 2), number(100*r.Area/41252.96124941927, 2))
	size := number(r.FieldOfView, 3)
	if r.Width > 0 {
		size = number(r.Width, 3) + " x " + number(r.Height, 3)
	}
	p.line("  fields   %s of %s deg (%s deg2 each)", thousands(r.Fields), size, number(r.FieldArea, 3))
	if r.Dithers > 1 {
		p.line("  dithers  %d, %s fields each", r.Dithers, thousands(r.Fields/r.Dithers))
	}
	p.line("  overlap  %s fields for every point of the region; %s is the least that", number(r.PerPoint, 3), number(r.Least, 3))
	p.line("           leaves no gap in a plane without edges")
	if len(r.Programs) > 1 {
		l := newList("<program", "fields", "weight")
		for _, x := range r.Programs {
			l.add(clip(x.Program, 40), thousands(x.Fields), strconv.FormatFloat(x.Weight, 'g', 6, 64))
		}
		p.line("")
		p.table(l)
	}
	p.line("")
	for _, f := range []string{r.Out, r.Map} {
		if f != "" {
			p.line("wrote %s", f)
		}
	}
	return p.flush()
}
