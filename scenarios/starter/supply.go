package starter

import "math"

const degree = math.Pi / 180

// sunDeclination returns the Sun's declination, rad, on a day counted from
// 2000-01-01 12:00 UT. Error below 0.02 degrees from 1950 to 2050: the low
// precision formula of the Astronomical Almanac, section C (from memory).
func sunDeclination(day float64) float64 {
	anomaly := (357.528 + 0.9856003*day) * degree
	longitude := (280.460+0.9856474*day)*degree + 1.915*degree*math.Sin(anomaly) + 0.020*degree*math.Sin(2*anomaly)
	obliquity := (23.439 - 0.0000004*day) * degree
	return math.Asin(math.Sin(obliquity) * math.Sin(longitude))
}

// openHours returns how long the Sun stays below an altitude (rad) in one
// night at a latitude (rad), to a few minutes; it serves to size demand.
func openHours(latitude, limit, day float64) float64 {
	dec := sunDeclination(day)
	c := (math.Sin(limit) - math.Sin(latitude)*math.Sin(dec)) / (math.Cos(latitude) * math.Cos(dec))
	return 24 * (1 - math.Acos(max(-1, min(1, c)))/math.Pi)
}

// epochDay is 2000-01-01 as days since 1970-01-01.
const epochDay = 10957

// plainSite is what the supply of open time needs to know of a site, degrees.
type plainSite struct{ latitude, longitude float64 }

// supply sums the open time (s) of one telescope a site over some nights,
// less the standards' quarter of an hour and three minutes of focus every two
// hours. The first day counts from 2000-01-01.
func supply(sites []plainSite, first, nights int, sunLimit float64) float64 {
	var hours float64
	for _, s := range sites {
		for i := range nights {
			midnight := float64(first+i) + 0.5 - s.longitude/360
			open := openHours(s.latitude*degree, sunLimit*degree, midnight)
			if open > 0 {
				hours += max(0, open-0.25-0.05*math.Floor(open/2))
			}
		}
	}
	return hours * 3600
}

// SeasonSupply is the open time of the season starter, s, that its demand is
// a multiple of: all hours with the Sun below -15 degrees less what is
// reserved, to one part in a hundred.
func SeasonSupply() float64 {
	const firstDay = 9893 // 2027-02-01 from 2000-01-01
	return supply([]plainSite{
		{33.2, -106.8}, {-26.3, -67.9}, {-23.4, 17.2}, {28.7, -16.9}, {31.9, 78.3}, {-30.7, 127.6},
	}, firstDay, 182, -15)
}
