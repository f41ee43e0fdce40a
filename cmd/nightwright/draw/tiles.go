package draw

import "fmt"

// Tile is a field of a pattern: a circle, or a rectangle with north up where
// it has a width.
type Tile struct {
	RA, Dec       float64 // ICRS, rad
	Radius        float64 // rad
	Width, Height float64 // rad
	Kind          int     // index of its kind
}

// Tiles draws a pattern of fields on an equal-area map of the whole sky, a
// colour for each kind.
func Tiles(name, title string, kinds []string, tiles []Tile, about string) *Canvas {
	c := New(name, title, 1000, 580)
	f := skyFrame{505, 282, 232}
	c.Text(505, 28, Clip(title, 70), Type{Size: 17, Anchor: Middle, Bold: true})
	c.skyGround(f)
	var keys []Key
	for k, kind := range kinds {
		n := 0
		for i := range tiles {
			if t := &tiles[i]; t.Kind == k {
				c.tile(f, t)
				n++
			}
		}
		keys = append(keys, Key{Style{Fill: Series(k), Opacity: 0.45}, fmt.Sprintf("%s (%d)", Clip(kind, 28), n), false})
	}
	c.skyLines(f)
	keys = append(keys, Key{Style{Stroke: Text, Width: 1.3, Dash: "7 4"}, "ecliptic", true}, Key{Style{Stroke: Text, Width: 1.5, Dash: "0.1 4"}, "galactic plane", true})
	y := c.legend(60, 546, 900, keys)
	c.Text(60, y+12, about+". Equal-area map, ICRS; right ascension grows to the left.", Type{Size: 11, Ink: Soft})
	c.Grow(y + 26)
	c.Alt = fmt.Sprintf("Map of the whole sky: %s, of %d kinds.", about, len(kinds))
	return c
}

func (c *Canvas) tile(f skyFrame, t *Tile) {
	style := Style{Fill: Series(t.Kind), Stroke: Series(t.Kind), Width: 0.4, Opacity: 0.45}
	px := max(t.Radius, t.Width/2, t.Height/2) * f.scale * 1.414
	if px > 2.5 { // large enough to be told apart
		style = Style{Fill: Series(t.Kind), Stroke: Paper, Width: 0.7, Opacity: 0.6}
	}
	var rings [][]spot
	if t.Width > 0 {
		rings = boxOutlines(t.RA, t.Dec, t.Width, t.Height, min(max(2, int(px/4)), 24))
	} else {
		rings = capOutlines(t.RA, t.Dec, max(t.Radius, 0.7/(f.scale*1.414)), min(max(8, int(2.6*px)), 48))
	}
	for _, ring := range rings {
		c.Polygon(f.points(ring), style)
	}
}
