package starter

import (
	"bytes"
	"fmt"
	"math"
	"math/rand/v2"
)

// position is a place on the sky, degrees, ICRS.
type position struct{ ra, dec float64 }

// patch is a part of the sky: bounds in declination and right ascension.
type patch struct {
	decFrom, decTo float64 // degrees
	raFrom, raTo   float64 // degrees; raTo may pass 360
}

// even lays n positions over a patch, each with the same area about it: steps
// of the golden ratio along right ascension, equal steps in sin dec.
func even(n int, p patch) []position {
	const golden = 0.6180339887498949 // (sqrt 5 - 1) / 2
	low, high := math.Sin(p.decFrom*degree), math.Sin(p.decTo*degree)
	all := make([]position, n)
	for i := range all {
		z := low + (high-low)*(float64(i)+0.5)/float64(n)
		turn := math.Mod(float64(i)*golden, 1)
		all[i] = position{math.Mod(p.raFrom+turn*(p.raTo-p.raFrom), 360), math.Asin(z) / degree}
	}
	return all
}

// scattered draws a position from a patch, equal areas equally likely.
func scattered(r *rand.Rand, p patch) position {
	low, high := math.Sin(p.decFrom*degree), math.Sin(p.decTo*degree)
	z := low + (high-low)*r.Float64()
	return position{math.Mod(p.raFrom+r.Float64()*(p.raTo-p.raFrom), 360), math.Asin(z) / degree}
}

// ecliptic draws a position within a latitude (degrees) of the ecliptic and
// inside a patch, for what moves there.
func ecliptic(r *rand.Rand, latitude float64, p patch) position {
	const obliquity = 23.4393 * degree
	for {
		l := 2 * math.Pi * r.Float64()
		b := math.Asin(math.Sin(latitude*degree) * (2*r.Float64() - 1))
		x, y, z := math.Cos(b)*math.Cos(l), math.Cos(b)*math.Sin(l), math.Sin(b)
		y, z = y*math.Cos(obliquity)-z*math.Sin(obliquity), y*math.Sin(obliquity)+z*math.Cos(obliquity)
		q := position{math.Mod(math.Atan2(y, x)/degree+360, 360), math.Asin(z) / degree}
		if turn := math.Mod(q.ra-p.raFrom+720, 360); turn <= p.raTo-p.raFrom && q.dec >= p.decFrom && q.dec <= p.decTo {
			return q
		}
	}
}

// clusters draws n positions in groups of equal size, each within a radius
// (degrees) of its own centre in the patch.
func clusters(r *rand.Rand, n, size int, radius float64, p patch) []position {
	var all []position
	var centre position
	for len(all) < n {
		if len(all)%size == 0 {
			centre = scattered(r, p)
		}
		turn := 2 * math.Pi * r.Float64()
		off := radius * math.Sqrt(r.Float64())
		dec := centre.dec + off*math.Cos(turn)
		if dec < p.decFrom || dec > p.decTo {
			continue
		}
		ra := centre.ra + off*math.Sin(turn)/math.Cos(dec*degree)
		all = append(all, position{math.Mod(ra+360, 360), dec})
	}
	return all
}

// tier draws a field's weight: half have 1, three in ten 2, the rest 4.
func tier(r *rand.Rand) int {
	switch u := r.Float64(); {
	case u < 0.5:
		return 1
	case u < 0.8:
		return 2
	}
	return 4
}

// fieldRows writes a program's fields as lines of a field list.
func fieldRows(out *bytes.Buffer, r *rand.Rand, prefix, program string, tile float64, at []position) {
	for i, p := range at {
		// A right ascension must not round up to 360.
		ra := fmt.Sprintf("%.4f", p.ra)
		if ra == "360.0000" {
			ra = "0.0000"
		}
		fmt.Fprintf(out, "%s%04d,%s,%.4f,%s,%d,%g\n", prefix, i+1, ra, p.dec, program, tier(r), tile)
	}
}

const fieldHeader = "field,ra_deg,dec_deg,program,weight,tile_deg\n"

// demoFields are some 300 fields for March: most of them face the night, a
// few stand near the Sun or too far north for two of the sites.
func demoFields() []byte {
	r := rand.New(rand.NewPCG(20270301, 1))
	var out bytes.Buffer
	out.WriteString(fieldHeader)
	fieldRows(&out, r, "W", "wide", 1.5, even(220, patch{-70, 55, 90, 300}))
	var moving []position
	for range 80 {
		moving = append(moving, ecliptic(r, 12, patch{-40, 40, 75, 280}))
	}
	fieldRows(&out, r, "M", "movers", 1.5, moving)
	return out.Bytes()
}

// seasonFields are the 6,000 fields of the season between declinations -75
// and +60: an even cover, crowded groups, and a belt along the ecliptic.
func seasonFields() []byte {
	r := rand.New(rand.NewPCG(20270201, 1))
	sky := patch{-75, 60, 0, 360}
	var out bytes.Buffer
	out.WriteString(fieldHeader)
	fieldRows(&out, r, "W", "wide", 1.5, even(4080, sky))
	fieldRows(&out, r, "D", "deep", 1.5, clusters(r, 480, 24, 6, sky))
	var moving []position
	for range 1440 {
		moving = append(moving, ecliptic(r, 25, sky))
	}
	fieldRows(&out, r, "M", "movers", 1.5, moving)
	return out.Bytes()
}
