package surveyfile

// orientation reads how UT1 follows from UTC.
func (l *loader) orientation(m *mapping) {
	o := m.group("earth_orientation", "earth_orientation")
	l.sv.Orientation.DUT1, _ = o.number("dut1_s", span{low: -1, high: 1, unit: " s"})
}
