package footprint

import (
	"errors"
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strconv"
	"strings"

	"go.yaml.in/yaml/v3"

	"nightwright/scenarios/surveyfile"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// group is a mapping's values by key.
type group struct {
	node *yaml.Node
	at   map[string]*yaml.Node
}

func resolve(n *yaml.Node) *yaml.Node {
	for n.Kind == yaml.AliasNode && n.Alias != nil {
		n = n.Alias
	}
	return n
}

// show says what stands at a node.
func show(n *yaml.Node) string {
	switch {
	case n.Kind == yaml.MappingNode:
		return "a group of keys"
	case n.Kind == yaml.SequenceNode:
		return "a list"
	case n.Tag == "!!null":
		return "empty"
	}
	return strconv.Quote(clip(n.Value))
}

// keys reads a group of keys; nil when it is none. Empty values are left out.
func (r *reader) keys(n *yaml.Node, title string, known []string) *group {
	n = resolve(n)
	if n.Kind != yaml.MappingNode {
		r.fault(n, title+" is "+show(n), "want its keys: "+strings.Join(known, ", "))
		return nil
	}
	g := &group{n, map[string]*yaml.Node{}}
	for i := 0; i+1 < len(n.Content); i += 2 {
		key, value := n.Content[i], resolve(n.Content[i+1])
		word := strings.ToLower(key.Value)
		switch {
		case key.Kind != yaml.ScalarNode || !slices.Contains(known, word):
			r.fault(key, fmt.Sprintf("unknown key %s in %s", show(key), title), "known keys here: "+strings.Join(known, ", "))
		case g.at[word] != nil:
			r.fault(key, fmt.Sprintf("the key %s is there twice", word), "keep one of them")
		case value.Kind == yaml.ScalarNode && value.Tag == "!!null":
			r.fault(value, word+" is empty", "want a value, or leave the key out")
		default:
			g.at[word] = value
		}
	}
	return g
}

// name reads a text without signs that field lists can't hold.
func (r *reader) name(g *group, key string) (string, bool) {
	n := g.at[key]
	if n == nil {
		return "", false
	}
	bad := func(c rune) bool { return c < ' ' || c == 0x7f || c == ';' || c == '\uFFFD' }
	if n.Kind != yaml.ScalarNode || n.Value == "" || len(n.Value) > 100 || strings.TrimSpace(n.Value) != n.Value || strings.ContainsFunc(n.Value, bad) {
		r.fault(n, key+" is "+show(n), "want a name of at most 100 bytes, no semicolon, no spaces around it")
		return "", false
	}
	return n.Value, true
}

func (r *reader) number(g *group, key string, low, high, missing float64) float64 {
	n := g.at[key]
	if n == nil {
		return missing
	}
	return r.scalar(n, key, low, high)
}

func (r *reader) scalar(n *yaml.Node, key string, low, high float64) float64 {
	want := fmt.Sprintf("want %g to %g", low, high)
	if n = resolve(n); n.Kind != yaml.ScalarNode {
		r.fault(n, key+" is "+show(n), want)
		return low
	}
	v, err := strconv.ParseFloat(strings.TrimSpace(n.Value), 64)
	if err != nil || !(v >= low && v <= high) {
		r.fault(n, fmt.Sprintf("%s is %s", key, show(n)), want)
		return low
	}
	return v
}

// need is number for a key that must be there.
func (r *reader) need(g *group, key string, low, high float64) float64 {
	if g.at[key] == nil {
		r.fault(g.node, key+" is missing", fmt.Sprintf("want it, %g to %g", low, high))
		return low
	}
	return r.number(g, key, low, high, low)
}

// pair reads [from, to].
func (r *reader) pair(g *group, key string, low, high float64) (a, b float64, ok bool) {
	n := g.at[key]
	if n == nil {
		return 0, 0, false
	}
	if n.Kind != yaml.SequenceNode || len(n.Content) != 2 {
		r.fault(n, key+" is "+show(n), fmt.Sprintf("want two numbers in [], each %g to %g", low, high))
		return 0, 0, false
	}
	before := len(r.issues)
	a, b = r.scalar(n.Content[0], key, low, high), r.scalar(n.Content[1], key, low, high)
	return a, b, len(r.issues) == before
}

// latitudes reads two latitudes, the southern first.
func (r *reader) latitudes(g *group, key string, need bool) (south, north float64, ok bool) {
	if g.at[key] == nil {
		if need {
			r.fault(g.node, key+" is missing", "want two numbers in [], the southern one first")
			return 0, 0, false
		}
		return -90, 90, true
	}
	south, north, ok = r.pair(g, key, -90, 90)
	if ok && south >= north {
		r.fault(g.at[key], fmt.Sprintf("%s [%g, %g] holds nothing", key, south, north), "want the southern one first, and two that differ")
		ok = false
	}
	return south, north, ok
}

// longitudes reads two longitudes going east; west and width in degrees.
func (r *reader) longitudes(g *group, key string, need bool) (west, width float64, ok bool) {
	if g.at[key] == nil {
		if need {
			r.fault(g.node, key+" is missing", "want two numbers in [], going east from the first to the second")
			return 0, 0, false
		}
		return 0, 360, true
	}
	a, b, ok := r.pair(g, key, -360, 360)
	if !ok {
		return 0, 0, false
	}
	switch width = b - a; {
	case width == 0 || width > 360 || width <= -360:
		r.fault(g.at[key], fmt.Sprintf("%s [%g, %g] holds nothing, or more than the whole way round", key, a, b), "want two that differ, going east from the first to the second; [0, 360] is all")
		return 0, 0, false
	case width < 0:
		width += 360
	}
	return a, width, true
}

var (
	shapeKeys = []string{"sky", "band", "box", "circle", "polygon", "strip", "moc"}
	partKeys  = append([]string{"name", "weight", "program"}, shapeKeys...)
)

func (r *reader) parts(m *group, key string) []Part {
	n := m.at[key]
	if n == nil {
		return nil
	}
	if n.Kind != yaml.SequenceNode {
		r.fault(n, key+" is "+show(n), "want a list, each item after a dash")
		return nil
	}
	if len(n.Content) > maxParts {
		r.fault(n, fmt.Sprintf("%s has %d items", key, len(n.Content)), fmt.Sprintf("want at most %d", maxParts))
		return nil
	}
	var out []Part
	for i, item := range n.Content {
		item = resolve(item)
		title := fmt.Sprintf("item %d of %s", i+1, key)
		g := r.keys(item, title, partKeys)
		if g == nil {
			continue
		}
		p := Part{Name: title, Line: item.Line, Weight: 1}
		if name, ok := r.name(g, "name"); ok {
			p.Name = name
		}
		p.Program, _ = r.name(g, "program")
		p.Weight = r.number(g, "weight", 0, 1e9, 1)
		if key == "exclude" && (g.at["weight"] != nil || g.at["program"] != nil) {
			r.fault(item, title+" has a weight or a program", "want them in parts alone")
		}
		var have []string
		for _, k := range shapeKeys {
			if g.at[k] != nil {
				have = append(have, k)
			}
		}
		if len(have) != 1 {
			r.fault(item, fmt.Sprintf("%s has %d shapes", title, len(have)), "want one of "+strings.Join(shapeKeys, ", "))
			continue
		}
		if p.Shape = r.shape(have[0], g.at[have[0]]); p.Shape != nil {
			out = append(out, p)
		}
	}
	return out
}

// shape reads a part's shape; nil after a fault.
func (r *reader) shape(kind string, n *yaml.Node) Shape {
	before := len(r.issues)
	var s Shape
	switch kind {
	case "sky":
		if n.Kind != yaml.ScalarNode || !strings.EqualFold(n.Value, "all") {
			r.fault(n, "sky is "+show(n), "want sky: all")
		}
		s = NewZone(visibility.Equatorial, -math.Pi/2, math.Pi/2, 0, 2*math.Pi)
	case "band":
		if g := r.keys(n, kind, []string{"dec_deg"}); g != nil {
			s = r.zone(g, visibility.Equatorial, "dec_deg", "", true, false)
		}
	case "box":
		if g := r.keys(n, kind, []string{"ra_deg", "dec_deg"}); g != nil {
			s = r.zone(g, visibility.Equatorial, "dec_deg", "ra_deg", true, true)
		}
	case "strip":
		if g := r.keys(n, kind, []string{"along", "latitude_deg", "longitude_deg"}); g != nil {
			system := visibility.Ecliptic
			switch a := g.at["along"]; {
			case a != nil && strings.EqualFold(a.Value, "galaxy"):
				system = visibility.Galactic
			case a == nil || !strings.EqualFold(a.Value, "ecliptic"):
				at := g.node
				if a != nil {
					at = a
				}
				r.fault(at, "the strip doesn't say along what", "want along: ecliptic or along: galaxy (the galactic plane)")
			}
			s = r.zone(g, system, "latitude_deg", "longitude_deg", true, false)
		}
	case "circle":
		if g := r.keys(n, kind, []string{"ra_deg", "dec_deg", "radius_deg"}); g != nil {
			ra, dec := r.need(g, "ra_deg", -360, 360), r.need(g, "dec_deg", -90, 90)
			radius := r.need(g, "radius_deg", 0, 180)
			if radius == 0 && len(r.issues) == before {
				r.fault(n, "the circle's radius is 0", "want more than 0")
			}
			s = Cap{Direction(ra*degree, dec*degree), radius * degree}
		}
	case "polygon":
		s = r.polygon(n)
	case "moc":
		s = r.moc(n)
	}
	if len(r.issues) > before {
		return nil
	}
	return s
}

func (r *reader) zone(g *group, system visibility.Coordinates, lat, lon string, needLat, needLon bool) Shape {
	south, north, ok := r.latitudes(g, lat, needLat)
	west, width, ok2 := 0.0, 360.0, true
	if lon != "" {
		west, width, ok2 = r.longitudes(g, lon, needLon)
	}
	if !ok || !ok2 {
		return nil
	}
	return NewZone(system, south*degree, north*degree, west*degree, width*degree)
}

func (r *reader) polygon(n *yaml.Node) Shape {
	const want = "want corners such as [[10, 0], [20, 0], [15, 8]]: right ascension and declination in degrees"
	if n.Kind != yaml.SequenceNode {
		r.fault(n, "polygon is "+show(n), want)
		return nil
	}
	before := len(r.issues)
	var at []ephemeris.Vec
	for i, c := range n.Content {
		if len(at) > MaxVertices {
			break // NewPolygon tells
		}
		c = resolve(c)
		if c.Kind != yaml.SequenceNode || len(c.Content) != 2 {
			r.fault(c, fmt.Sprintf("corner %d of the polygon is %s", i+1, show(c)), want)
			return nil
		}
		ra := r.scalar(c.Content[0], "a corner's right ascension", -360, 360)
		dec := r.scalar(c.Content[1], "a corner's declination", -90, 90)
		at = append(at, Direction(ra*degree, dec*degree))
	}
	if len(r.issues) > before {
		return nil
	}
	p, err := NewPolygon(at)
	if err != nil {
		what, want, _ := strings.Cut(err.Error(), "; ")
		r.fault(n, what, want)
		return nil
	}
	return p
}

func (r *reader) moc(n *yaml.Node) Shape {
	if n.Kind != yaml.ScalarNode {
		r.fault(n, "moc is "+show(n), "want the name of a MOC file in the region file's folder")
		return nil
	}
	text, err := r.open(n.Value, MaxMOCBytes)
	if err != nil {
		r.fault(n, fmt.Sprintf("the map %q can't be read: %v", clip(n.Value), bare(err)), "want a MOC file in the region file's folder")
		return nil
	}
	m, err := ParseMOC(filepath.Join(filepath.Dir(r.file), n.Value), text)
	var issue surveyfile.Issue
	if errors.As(err, &issue) {
		r.issues = append(r.issues, issue)
		return nil
	}
	if m.Empty() {
		r.fault(n, fmt.Sprintf("the map %q is empty", clip(n.Value)), "want one with cells")
		return nil
	}
	return Map{m}
}
