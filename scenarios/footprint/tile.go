package footprint

import (
	"context"
	"fmt"
	"math"

	"nightwright/visibility/ephemeris"
)

// MaxFields is the most fields a tiling may have, as in a survey.
const MaxFields = 1_000_000

// Tiling says how a region is cut into fields.
type Tiling struct {
	Diameter float64 // of a circular field, rad; 0 for a rectangle
	// Width and Height of a rectangular field with north up, rad; 0 for a circle.
	Width, Height float64
	// Overlap, 0 to below 1, makes the pattern for fields smaller by that part
	// than they are; 0 leaves no more overlap than the pattern needs.
	Overlap float64
	Dithers int     // copies of the pattern, 1 or more
	Step    float64 // how far the further copies are moved, rad
	Prefix  string  // before the number in a field's name
	Weights []WeightCircle
}

// WeightCircle multiplies the weight of the fields whose centre it holds.
type WeightCircle struct {
	Circle
	Weight float64
}

// Field is one field of a tiling. Angles are rad.
type Field struct {
	Name    string
	RA, Dec float64
	Centre  ephemeris.Vec
	Program string
	Weight  float64
	Dither  int // 0: the pattern itself
}

// LeastPerArea is the least that circles of equal size can cover a plane
// with: their area over the plane's (Kershner 1939, Am. J. Math. 61, 665).
const LeastPerArea = 1.2091995761561452 // 2 pi / (3 sqrt 3)

// Fields cuts a region into fields, sorted from south to north and east,
// dither after dither. The fields of dither 0 leave no gap: every point of
// the region lies in one of them, and none of those on the region's edge is
// there for nothing. Those of the further dithers are moved by Step towards
// directions spread evenly round the compass (seen from each field's north;
// near a pole, where norths turn quickly, a copy alone may have gaps). The
// error says what can't be done; it is ctx's when that ends.
func (t Tiling) Fields(ctx context.Context, r *Region) ([]Field, error) {
	rows, err := t.rows()
	if err != nil {
		return nil, err
	}
	reach := t.reach()
	var base []Field
	for _, row := range rows {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		for k := range row.count {
			ra := 2 * math.Pi * (float64(k) + row.shift) / float64(row.count)
			c := Circle{Direction(ra, row.dec), reach}
			if !r.meets(c, 5) {
				continue
			}
			f := Field{RA: ra, Dec: row.dec, Centre: c.Centre}
			f.Program, f.Weight = r.claim(c)
			if base = append(base, f); len(base)*max(1, t.Dithers) > MaxFields {
				return nil, fmt.Errorf("the region takes more than %d fields of %s; want larger fields, fewer dithers or a smaller region", MaxFields, t.size())
			}
		}
	}
	if base, err = t.pruned(ctx, base, r); err != nil {
		return nil, err
	}
	return t.dithered(base), nil
}

// rows are those of the whole sky.
func (t *Tiling) rows() ([]ring, error) {
	keep := 1 - t.Overlap
	if at := 4 * math.Pi / t.FieldArea() / keep / keep; at > 1e9 {
		return nil, fmt.Errorf("fields of %s are too small to cover the sky with; want larger ones", t.size())
	}
	if t.Width > 0 {
		if rows := rectSky(t.Width*keep, t.Height*keep); rows != nil {
			return rows, nil
		}
		return nil, fmt.Errorf("fields of %s can't be laid in rows; want less than 90 deg a side", t.size())
	}
	if rows := wholeSky(t.Diameter / 2 * keep); rows != nil {
		return rows, nil
	}
	return nil, fmt.Errorf("fields of %s can't be laid in rows; want up to 160 deg", t.size())
}

// FieldArea is the area of one field, sr.
func (t *Tiling) FieldArea() float64 {
	if t.Width > 0 {
		return RectArea(t.Width, t.Height)
	}
	return Cap{Radius: t.Diameter / 2}.Area()
}

// size writes how large a field is.
func (t *Tiling) size() string {
	if t.Width > 0 {
		return fmt.Sprintf("%.3g x %.3g deg", t.Width*180/math.Pi, t.Height*180/math.Pi)
	}
	return fmt.Sprintf("%.3g deg", t.Diameter*180/math.Pi)
}

// claim returns program and weight of a field: those of the part that its
// centre lies in, else of the heaviest that it reaches.
func (r *Region) claim(c Circle) (program string, weight float64) {
	best := r.PartAt(c.Centre)
	if best < 0 {
		for i := range r.Parts {
			if (best < 0 || r.Parts[i].Weight > r.Parts[best].Weight) && r.Parts[i].Shape.Place(c.Centre, c.Radius) != Apart {
				best = i
			}
		}
	}
	if best < 0 { // only a rounding away from its part
		best = 0
	}
	return r.Parts[best].Program, r.Parts[best].Weight
}

// dithered makes the copies and gives every field its name and final weight.
func (t Tiling) dithered(base []Field) []Field {
	n := max(1, t.Dithers)
	all := make([]Field, 0, n*len(base))
	width := max(4, len(fmt.Sprint(len(base))))
	for d := range n {
		for i, f := range base {
			f.Dither = d
			f.Name = fmt.Sprintf("%s%0*d", t.Prefix, width, i+1)
			if n > 1 {
				f.Name += fmt.Sprintf("-%d", d+1)
			}
			if d > 0 {
				f.Centre = moved(f.Centre, t.Step, 2*math.Pi*float64(d-1)/float64(n-1))
				f.RA, f.Dec = Angles(f.Centre)
			}
			for _, w := range t.Weights {
				if separation(w.Centre, f.Centre) <= w.Radius {
					f.Weight *= w.Weight
				}
			}
			all = append(all, f)
		}
	}
	return all
}

// moved goes a step (rad) from v towards a compass direction (from north to
// east, rad).
func moved(v ephemeris.Vec, step, towards float64) ephemeris.Vec {
	e := perpendicular(v)
	n := v.Cross(e)
	ss, cs := math.Sincos(step)
	st, ct := math.Sincos(towards)
	return v.Scale(cs).Add(n.Scale(ss * ct)).Add(e.Scale(ss * st)).Unit()
}
