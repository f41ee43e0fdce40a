package formats

// VisibilityRow is one stretch of time in which a position can be observed.
// Instants are UTC Unix microseconds, angles degrees.
type VisibilityRow struct {
	ValidUntil                   int64
	Start, Stop                  int64
	ElevationMin, ElevationMax   float64
	MoonSeparationMin, MoonSepMx float64
	Facility                     string
}

// visibilityColumns follow the object visibility draft (ObjVisSAP, working
// draft of 2020-09-30); instants are doubles where it says float, which can't
// hold a modified Julian date to better than minutes.
var visibilityColumns = []Column{
	{Name: "t_validity", Kind: Real, Unit: "d", UCD: "time.validity", Utype: "Char.TimeAxis.Coverage.Time", Time: true, About: "Until when the rules are known: the end of the survey's period, MJD"},
	{Name: "t_start", Kind: Real, Unit: "d", UCD: "time.start", Utype: "Char.TimeAxis.Coverage.Bounds.Limits.StartTime", Time: true, About: "Start of the window, MJD"},
	{Name: "t_stop", Kind: Real, Unit: "d", UCD: "time.end", Utype: "Char.TimeAxis.Coverage.Bounds.Limits.StopTime", Time: true, About: "End of the window, MJD"},
	{Name: "t_visibility", Kind: Real, Unit: "s", UCD: "time.duration", Utype: "Char.TimeAxis.Coverage.Support.Extent", About: "Length of the window"},
	{Name: "elevation_min", Kind: Real, Unit: "deg", UCD: "pos.az.alt;stat.min", About: "Least airless altitude in the window, sampled every 5 min"},
	{Name: "elevation_max", Kind: Real, Unit: "deg", UCD: "pos.az.alt;stat.max", About: "Greatest airless altitude in the window"},
	{Name: "moon_sep_min", Kind: Real, Unit: "deg", UCD: "pos.angDistance;stat.min", About: "Least distance from the Moon in the window"},
	{Name: "moon_sep_max", Kind: Real, Unit: "deg", UCD: "pos.angDistance;stat.max", About: "Greatest distance from the Moon in the window"},
	{Name: "facility", UCD: "meta.id;instr.tel", Utype: "Provenance.ObsConfig.Facility.name", About: "Site, and the telescope after a slash"},
}

// Visibility makes the table of an object visibility query.
func Visibility(rows []VisibilityRow) Table {
	t := Table{Name: "visibility", About: "When a position can be observed", Columns: visibilityColumns}
	for i := range rows {
		r := &rows[i]
		t.Rows = append(t.Rows, []any{
			MJD(r.ValidUntil), MJD(r.Start), MJD(r.Stop), float64(r.Stop-r.Start) / 1e6, r.ElevationMin, r.ElevationMax, r.MoonSeparationMin, r.MoonSepMx, r.Facility,
		})
	}
	return t
}
