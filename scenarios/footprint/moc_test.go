package footprint

import (
	"encoding/json"
	"math"
	"math/rand/v2"
	"slices"
	"strings"
	"testing"
)

// TestMOCText: the examples of MOC 2.0 (IVOA recommendation of 2022-07-27),
// ASCII and JSON forms of one map.
func TestMOCText(t *testing.T) {
	const ascii = "1/1-2 4 2/12-14 21 23 25 8/\n"
	const js = `{"1":[1,2,4],"2":[12,13,14,21,23,25],"8":[]}` + "\n"
	for _, text := range []string{ascii, "1/1 2 4 2/12-14 21 23 25 8/", "s1/1\r\n2 4 2/12 13\n14 21 23 25 8/", "s 1/ 1 2 4 2/12-14 21 23 25 8/", js, `{"s":` + js + `}`} {
		m, err := ParseMOC("x.moc", []byte(text))
		if err != nil {
			t.Errorf("%q: %v", text, err)
			continue
		}
		if got := string(m.ASCII()); got != ascii {
			t.Errorf("%q in ASCII is %q, want %q", text, got, ascii)
		}
		if got := string(m.JSON()); got != js {
			t.Errorf("%q in JSON is %q, want %q", text, got, js)
		}
		if want := 3*CellArea(1) + 6*CellArea(2); math.Abs(m.Area()-want) > 1e-12 {
			t.Errorf("area %g, want %g", m.Area(), want)
		}
	}
}

func TestMOCIsCanonical(t *testing.T) {
	for _, tt := range []struct{ give, want string }{
		{"1/0-3", "0/0 1/\n"},           // four siblings are their parent
		{"2/5 1/1 2/4 2/7", "1/1 2/\n"}, // overlaps, and out of order
		{"0/0-11", "0/0-11\n"},
		{"3/", "3/\n"},
		{"29/3458764513820540927", "29/3458764513820540927\n"}, // the last cell of all
		{"29/0-3", "28/0 29/\n"},
	} {
		m, err := ParseMOC("x", []byte(tt.give))
		if err != nil {
			t.Errorf("%q: %v", tt.give, err)
		} else if got := string(m.ASCII()); got != tt.want {
			t.Errorf("%q is %q, want %q", tt.give, got, tt.want)
		}
	}
}

func TestBadMOCs(t *testing.T) {
	for _, tt := range []struct{ give, want string }{
		{"", "m:1: the map is empty; want a MOC in ASCII"},
		{" \n\t", "m:1: the map is empty"},
		{"5 6", `m:1: "5" stands before any order`},
		{"1/1\n2/1 48000", "m:2: the cell 48000 is not in order 2; want 0 to 191"},
		{"1/1\n\n30/1", `m:3: "30" is no order`},
		{"1/5-4", "m:1: the range 5-4 is reversed"},
		{"1/1,2", `m:1: "1,2" is no cell; want cells such as 12 or 12-14, with blanks between`},
		{"1/-4", `m:1: "-4" is no cell`},
		{"1/+4", `m:1: "+4" is no cell`},
		{"x/4", `m:1: "x" is no order`},
		{"t29/5", "m:1: it is a map of times"},
		{"s", "m:1: the map has no order"},
		{"SIMPLE  =  T", "m:1: it is a FITS file"},
		{"{}", "m:1: the map has no order"},
		{`{"1":[1,2}`, "m:1: it is no JSON here"},
		{"{\n\"1\":[1,\n99]}", "m:3: the cell 99 is not in order 1"},
		{`{"1":[1.5]}`, "m:1: 1.5 is no cell"},
		{`{"1":["a"]}`, "m:1: a is no cell"},
		{`{"1":7}`, "m:1: order 1 has 7; want a list of cells"},
		{`{"one":[7]}`, `m:1: "one" is no order`},
		{`{"t":{"1":[7]}}`, `m:1: "t" is no order`},
		{`{"1":[7]} 5`, "m:1: something follows the map"},
		{`{"s":[1]}`, "m:1: [ stands where orders should"},
	} {
		_, err := ParseMOC("m", []byte(tt.give))
		if err == nil || !strings.HasPrefix(err.Error(), tt.want) {
			t.Errorf("%q: %v; want %q", tt.give, err, tt.want)
		}
	}
}

func TestMOCSets(t *testing.T) {
	rng := rand.New(rand.NewPCG(6, 1))
	random := func() (MOC, []Cell) {
		var cells []Cell
		for range 40 {
			o := rng.IntN(5)
			cells = append(cells, Cell{o, rng.Int64N(CellCount(o))})
		}
		return NewMOC(5, cells), cells
	}
	for range 20 {
		a, cells := random()
		b, _ := random()
		u := a.Union(b)
		for range 300 {
			v := randomDirection(rng)
			in := slices.ContainsFunc(cells, func(c Cell) bool { return CellAt(c.Order, v) == c })
			if a.Holds(v) != in {
				t.Fatalf("a map of cells holds a direction: %v; one of its cells does: %v", a.Holds(v), in)
			}
			if u.Holds(v) != (a.Holds(v) || b.Holds(v)) {
				t.Fatal("a union holds what neither map does, or misses what one does")
			}
		}
		again := NewMOC(5, u.Cells())
		if !slices.Equal(again.spans, u.spans) {
			t.Fatal("a map made of a map's cells is another map")
		}
		var orders map[string][]int64
		if err := json.Unmarshal(u.JSON(), &orders); err != nil {
			t.Fatal(err)
		}
		n := 0
		for _, list := range orders {
			n += len(list)
		}
		if n != len(u.Cells()) {
			t.Fatalf("%d cells in JSON, %d in the map", n, len(u.Cells()))
		}
	}
	deep := NewMOC(3, []Cell{{6, 12345}})
	if got := deep.Cells(); len(got) != 1 || got[0] != (Cell{3, 12345 / 64}) {
		t.Errorf("a cell deeper than the map counts as %v", got)
	}
}

func TestCoverageArea(t *testing.T) {
	// One circle: 2 pi (1 - cos r). Two at a distance: twice that.
	r := 1.5 * degree
	one := Circle{Direction(1, 0.4), r}
	cap := 2 * math.Pi * (1 - math.Cos(r))
	m := Coverage([]Circle{one})
	if d := m.Area()/cap - 1; math.Abs(d) > 0.01 {
		t.Errorf("the area of one circle is %.2f %% off", 100*d)
	}
	two := Coverage([]Circle{one, {Direction(1, -0.4), r}, one})
	if d := two.Area()/(2*cap) - 1; math.Abs(d) > 0.01 {
		t.Errorf("the area of two circles is %.2f %% off", 100*d)
	}
	if CellSize(m.Order()) > r/4 || CellSize(m.Order()) < r/8.1 {
		t.Errorf("order %d has cells of %.3g deg for circles of %g", m.Order(), CellSize(m.Order())/degree, 2*r/degree)
	}
	if o := Coverage([]Circle{{one.Centre, 1e-6}}).Order(); o != 12 {
		t.Errorf("a tiny circle has order %d, want 12", o)
	}
}

func FuzzMOC(f *testing.F) {
	for _, s := range []string{"1/1 2 4 2/12-14 21 23 25 8/", `{"1":[1,2,4],"8":[]}`, `{"s":{"0":[1]}}`, "s0/0-11", "t1/1", "29/3458764513820540927", "{", "1/", "\xff/1"} {
		f.Add([]byte(s))
	}
	f.Fuzz(func(t *testing.T, text []byte) {
		m, err := ParseMOC("m", text)
		if err != nil {
			if !strings.HasPrefix(err.Error(), "m:") {
				t.Fatalf("%q has no place", err)
			}
			return
		}
		if len(m.Cells()) > 1<<16 {
			return
		}
		a, err := ParseMOC("a", m.ASCII())
		if err != nil {
			t.Fatal(err)
		}
		j, err := ParseMOC("j", m.JSON())
		if err != nil {
			t.Fatal(err)
		}
		if !slices.Equal(a.spans, m.spans) || !slices.Equal(j.spans, m.spans) || a.order != m.order || j.order != m.order {
			t.Fatalf("%q comes back as %q and %q", m.ASCII(), a.ASCII(), j.ASCII())
		}
	})
}
