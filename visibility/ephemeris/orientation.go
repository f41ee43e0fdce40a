package ephemeris

// Orientation says how UT1 follows from UTC.
type Orientation struct {
	DUT1 float64 // UT1-UTC, s, constant; used when Table is empty
	// Table holds daily values from an IERS finals2000A file, ascending in
	// MJD; between rows UT1-TAI is interpolated linearly.
	Table []DUT1Row
}

// DUT1Row is one day of an IERS table.
type DUT1Row struct {
	MJD  float64 // UTC, d
	DUT1 float64 // UT1-UTC, s
}
