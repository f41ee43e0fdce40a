package formats

import (
	"math"
	"strconv"

	"nightwright/constraints/survey"
	"nightwright/scenarios/footprint"
	"nightwright/scheduler/tables"
)

// Plan is what the writers of this package need to know.
type Plan struct {
	Tables *tables.PlanTables
	Survey *survey.Survey // that the plan was made from
	// Stamp, UTC Unix microseconds, stands where a format wants to know when
	// a thing was written down.
	Stamp int64
}

// DefaultStamp is the stamp for a plan when the caller has none: 00:00 UTC of
// its first night's date, so that the same plan gives the same bytes. It is
// not ok when the plan's summary has no such date.
func DefaultStamp(pt *tables.PlanTables) (micros int64, ok bool) {
	day, err := survey.ParseDay(pt.Summary.FirstNight)
	return int64(day) * 86400 * 1e6, err == nil
}

// Infos say where a file comes from.
func Infos(pt *tables.PlanTables) []Info {
	s := &pt.Summary
	return []Info{
		{"survey", s.Survey}, {"first_night", s.FirstNight}, {"last_night", s.LastNight},
		{"seed", strconv.FormatUint(s.Seed, 10)}, {"plan_checksum", s.Checksum}, {"program_version", s.Program},
	}
}

// viewDiameter is the diameter, rad, of the smallest circle around a field of
// view.
func viewDiameter(v survey.FieldOfView) float64 {
	if v.Width > 0 {
		return math.Hypot(v.Width, v.Height)
	}
	return v.Diameter
}

// obsPlanColumns are the columns of ObsLocTAP 1.0, table ivoa.obsplan.
var obsPlanColumns = []Column{
	{Name: "t_planning", Kind: Real, Unit: "d", Time: true, About: "When the row was last changed in the plan, MJD"},
	{Name: "target_name", UCD: "meta.id;src", Utype: "Target.name", About: "Field"},
	{Name: "obs_id", UCD: "meta.id", Utype: "DataID.observationID", About: "Number of the exposure, kept through re-plans"},
	{Name: "obs_collection", UCD: "meta.id", Utype: "DataID.collection", About: "Survey"},
	{Name: "s_ra", Kind: Real, Unit: "deg", UCD: "pos.eq.ra", Utype: "Char.SpatialAxis.Coverage.Location.Coord.Position2D.Value2.C1", About: "Right ascension, ICRS"},
	{Name: "s_dec", Kind: Real, Unit: "deg", UCD: "pos.eq.dec", Utype: "Char.SpatialAxis.Coverage.Location.Coord.Position2D.Value2.C2", About: "Declination, ICRS"},
	{Name: "s_fov", Kind: Real, Unit: "deg", UCD: "phys.angSize;instr.fov", Utype: "Char.SpatialAxis.Coverage.Bounds.Extent.diameter", About: "Diameter of the circle around the telescope's field of view"},
	{Name: "s_region", Kind: Ring, Unit: "deg", UCD: "pos.outline;obs.field", Utype: "Char.SpatialAxis.Coverage.Support.Area", About: "Circle around the field of view, whose position angle a plan doesn't fix"},
	{Name: "s_resolution", Kind: Real, Unit: "arcsec", UCD: "pos.angResolution", Utype: "Char.SpatialAxis.Resolution.Refval.value", About: "Not known to a plan"},
	{Name: "t_min", Kind: Real, Unit: "d", UCD: "time.start;obs.exposure", Utype: "Char.TimeAxis.Coverage.Bounds.Limits.StartTime", Time: true, About: "Start of the exposure, MJD"},
	{Name: "t_max", Kind: Real, Unit: "d", UCD: "time.end;obs.exposure", Utype: "Char.TimeAxis.Coverage.Bounds.Limits.StopTime", Time: true, About: "End of the exposure, MJD"},
	{Name: "t_exptime", Kind: Real, Unit: "s", UCD: "time.duration;obs.exposure", Utype: "Char.TimeAxis.Coverage.Support.Extent", About: "Exposure time"},
	{Name: "t_resolution", Kind: Real, Unit: "s", UCD: "time.resolution", Utype: "Char.TimeAxis.Resolution.Refval.value", About: "One exposure: its length"},
	{Name: "em_min", Kind: Real, Unit: "m", UCD: "em.wl;stat.min", Utype: "Char.SpectralAxis.Coverage.Bounds.Limits.LoLimit", About: "Not known to a plan, whose filters have names and no wavelengths"},
	{Name: "em_max", Kind: Real, Unit: "m", UCD: "em.wl;stat.max", Utype: "Char.SpectralAxis.Coverage.Bounds.Limits.HiLimit", About: "Not known to a plan"},
	{Name: "em_res_power", Kind: Real, UCD: "spect.resolution", Utype: "Char.SpectralAxis.Resolution.ResolPower.refVal", About: "Not known to a plan"},
	{Name: "o_ucd", UCD: "meta.ucd", Utype: "Char.ObservableAxis.ucd", About: "Not known to a plan"},
	{Name: "pol_states", UCD: "meta.code;phys.polarization", Utype: "Char.PolarizationAxis.stateList", About: "Not known to a plan"},
	{Name: "pol_xel", Kind: Integer, UCD: "meta.number", Utype: "Char.PolarizationAxis.numBins", About: "Not known to a plan"},
	{Name: "facility_name", UCD: "meta.id;instr.tel", Utype: "Provenance.ObsConfig.Facility.name", About: "Site"},
	{Name: "instrument_name", UCD: "meta.id;instr", Utype: "Provenance.ObsConfig.Instrument.name", About: "Telescope, and the filter after a slash"},
	{Name: "t_plan_exptime", Kind: Real, Unit: "s", UCD: "time.duration;obs.exposure", Utype: "Char.TimeAxis.Coverage.Support.Extent", About: "Planned exposure time"},
	{Name: "category", About: "Fixed: the plan gives the time"},
	{Name: "priority", Kind: Integer, About: "2: done, or held; 1: planned, one of a set; 0: planned, alone"},
	{Name: "execution_status", About: "Planned: a re-plan may move it; Scheduled: held; Performed: done"},
	{Name: "tracking_type", About: "Sidereal"},
}

// ObsPlan makes the planned-observation table of ObsLocTAP 1.0: its 26
// columns, a row an exposure. t_planning is the plan's stamp in every row: a
// plan doesn't keep when each row was last touched. What a plan doesn't know
// (resolutions, wavelengths, polarisation) is null.
func ObsPlan(p Plan) Table {
	t := Table{
		Name: "ivoa.obsplan", Utype: "ivo://ivoa.net/std/obsloctap#table-1.0",
		About: "Planned, scheduled and performed observations", Columns: obsPlanColumns,
	}
	views := map[string]float64{}
	for i := range p.Survey.Telescopes {
		views[p.Survey.Telescopes[i].Name] = degrees(viewDiameter(p.Survey.Telescopes[i].FieldOfView))
	}
	stamp := MJD(p.Stamp)
	rows := append([]tables.VisitRow(nil), p.Tables.Visits...)
	tables.Visits.Sort(rows)
	for i := range rows {
		v := &rows[i]
		status, priority := "Planned", int64(0)
		switch {
		case v.State == "done":
			status, priority = "Performed", 2
		case v.State == "held":
			status, priority = "Scheduled", 2
		case v.Set != 0:
			priority = 1
		}
		var view, outline any
		if d := views[v.Telescope]; d > 0 {
			view, outline = d, []float64{v.RA, v.Dec, d / 2}
		}
		t.Rows = append(t.Rows, []any{
			stamp, v.Field, strconv.FormatInt(v.Visit, 10), p.Tables.Summary.Survey, v.RA, v.Dec, view, outline, nil,
			MJD(v.Start), MJD(v.End), v.Exposure, v.Exposure, nil, nil, nil, nil, nil, nil,
			v.Site, v.Telescope + "/" + v.Filter, v.Exposure, "Fixed", priority, status, "Sidereal",
		})
	}
	return t
}

// Coverage is the sky that the plan's exposures see, as a map whose cells are
// an eighth of the smallest field or finer: each exposure its field's tile
// where the survey gives one, else the circle that fits into its telescope's
// field of view.
func Coverage(p Plan) footprint.MOC {
	views, tiles := map[string]float64{}, map[string]float64{}
	for i := range p.Survey.Telescopes {
		v := p.Survey.Telescopes[i].FieldOfView
		if views[p.Survey.Telescopes[i].Name] = v.Diameter; v.Width > 0 {
			views[p.Survey.Telescopes[i].Name] = min(v.Width, v.Height)
		}
	}
	for i := range p.Survey.Fields {
		tiles[p.Survey.Fields[i].Name] = p.Survey.Fields[i].Tile
	}
	type key struct {
		ra, dec, diameter float64
	}
	seen := map[key]bool{}
	var circles []footprint.Circle
	for i := range p.Tables.Visits {
		v := &p.Tables.Visits[i]
		d := tiles[v.Field]
		if d == 0 {
			d = views[v.Telescope]
		}
		k := key{v.RA, v.Dec, d}
		if d > 0 && !seen[k] {
			seen[k] = true
			circles = append(circles, footprint.Circle{Centre: footprint.Direction(v.RA*math.Pi/180, v.Dec*math.Pi/180), Radius: d / 2})
		}
	}
	return footprint.Coverage(circles)
}

func degrees(rad float64) float64 { return math.Round(rad*180/math.Pi*1e12) / 1e12 }
