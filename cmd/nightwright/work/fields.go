package work

import (
	"bytes"
	"context"
	"encoding/csv"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"github.com/google/renameio/v2"

	"nightwright/cmd/nightwright/draw"
	"nightwright/scenarios/footprint"
)

// FieldsOptions say how to cut a region; what is not set is the region
// file's, then the default.
type FieldsOptions struct {
	FieldOfView string   // deg: a diameter, or width x height such as 2x1.5; "": the file's
	Overlap     *float64 // 0 to below 1
	Dithers     *int
	DitherStep  *float64 // deg
	Program     string
	Prefix      string
	Out         string // the field list; "" writes none
	Map         string // an SVG picture; "" writes none
}

// FieldsResult is what came of it. Areas are square degrees.
type FieldsResult struct {
	Region      string           `json:"region"`
	Area        float64          `json:"area_deg2"`         // of the region
	FieldOfView float64          `json:"field_of_view_deg"` // diameter; 0 for rectangles
	Width       float64          `json:"field_width_deg"`   // of rectangles, else 0
	Height      float64          `json:"field_height_deg"`
	Overlap     float64          `json:"overlap"`
	Dithers     int              `json:"dithers"`
	Fields      int              `json:"fields"`
	FieldArea   float64          `json:"field_area_deg2"`  // of one field
	PerPoint    float64          `json:"fields_per_point"` // area of the fields of one dither over the region's
	Least       float64          `json:"least_per_point"`  // that circles, or rectangles, can do with in a plane
	Programs    []FieldsByOrigin `json:"programs"`
	Out         string           `json:"out"`
	Map         string           `json:"map"`
}

// FieldsByOrigin counts the fields of a program.
type FieldsByOrigin struct {
	Program string  `json:"program"`
	Fields  int     `json:"fields"`
	Weight  float64 `json:"weight_sum"`
}

// Fields cuts the region of a region file into fields and writes the list.
func Fields(ctx context.Context, path string, o FieldsOptions, opt Options) (*FieldsResult, error) {
	p, issues := footprint.Load(path)
	if p == nil {
		return nil, &InputError{Issues: issues, Of: "region"}
	}
	if err := o.fill(p); err != nil {
		return nil, err
	}
	opt.tell("tiling", 0, 1)
	fields, err := p.Fields(ctx, &p.Region)
	if err != nil {
		if ctx.Err() != nil {
			return nil, ctx.Err()
		}
		return nil, &InputError{What: err.Error()}
	}
	opt.tell("tiling", 1, 1)
	const square = 180 / math.Pi * 180 / math.Pi
	r := &FieldsResult{
		Region: p.Name, Area: p.Area() * square, FieldOfView: p.Diameter * 180 / math.Pi, Width: p.Width * 180 / math.Pi, Height: p.Height * 180 / math.Pi, Overlap: p.Overlap, Dithers: p.Dithers,
		Fields: len(fields), FieldArea: p.FieldArea() * square, Least: footprint.LeastPerArea, Out: o.Out, Map: o.Map,
	}
	if p.Width > 0 {
		r.Least = 1 // rectangles tile a plane
	}
	r.PerPoint = r.FieldArea * float64(len(fields)/p.Dithers) / r.Area
	at := map[string]int{}
	for i := range fields {
		k, ok := at[fields[i].Program]
		if !ok {
			k = len(r.Programs)
			at[fields[i].Program] = k
			r.Programs = append(r.Programs, FieldsByOrigin{Program: fields[i].Program})
		}
		r.Programs[k].Fields++
		r.Programs[k].Weight += fields[i].Weight
	}
	if o.Out != "" {
		text, err := fieldList(fields, tileOf(p))
		if err != nil {
			return nil, err
		}
		if err := renameio.WriteFile(o.Out, text, 0o644); err != nil {
			return nil, err
		}
	}
	if o.Map != "" {
		if err := renameio.WriteFile(o.Map, fieldsMap(p, fields), 0o644); err != nil {
			return nil, err
		}
	}
	return r, nil
}

// fill puts what the options say over what the region file does, and checks
// both together.
func (o *FieldsOptions) fill(p *footprint.Plan) error {
	const degree = math.Pi / 180
	if o.FieldOfView != "" {
		if err := setView(o.FieldOfView, &p.Tiling); err != nil {
			return err
		}
	}
	if p.Diameter == 0 && p.Width == 0 {
		return Inputf("neither the region file nor --field-of-view says how large a field is; want such as --field-of-view 1.5")
	}
	if v := o.Overlap; v != nil {
		if !(*v >= 0 && *v <= 0.9) {
			return Inputf("--overlap is %g; want 0 to 0.9", *v)
		}
		p.Overlap = *v
	}
	if v := o.Dithers; v != nil {
		if *v < 1 || *v > 100 {
			return Inputf("--dithers is %d; want 1 to 100", *v)
		}
		p.Dithers = *v
	}
	p.Dithers = max(1, p.Dithers)
	if v := o.DitherStep; v != nil {
		if !(*v > 0 && *v <= 90) {
			return Inputf("--dither-step is %g; want more than 0 and at most 90 degrees", *v)
		}
		p.Step = *v * degree
	}
	if p.Dithers > 1 && p.Step == 0 {
		p.Step = p.Diameter / 4
	}
	if o.Prefix != "" {
		p.Prefix = o.Prefix
	}
	if p.Prefix == "" {
		p.Prefix = "F"
	}
	if o.Program == "" {
		o.Program = "wide"
	}
	for i := range p.Parts {
		if p.Parts[i].Program == "" {
			p.Parts[i].Program = o.Program
		}
	}
	return nil
}

// fieldList writes the fields as a survey reads them: degrees to 1e-7 (0.4
// milliarcseconds), the field's diameter as its tile.
func fieldList(fields []footprint.Field, diameter float64) ([]byte, error) {
	var b bytes.Buffer
	w := csv.NewWriter(&b)
	if err := w.Write([]string{"field", "ra_deg", "dec_deg", "program", "weight", "tile_deg"}); err != nil {
		return nil, err
	}
	number := func(x float64) string { return strconv.FormatFloat(math.Round(x*1e7)/1e7, 'f', -1, 64) }
	for i := range fields {
		f := &fields[i]
		ra := number(f.RA * 180 / math.Pi)
		if ra == "360" {
			ra = "0"
		}
		dec := number(f.Dec * 180 / math.Pi)
		if dec == "-0" {
			dec = "0"
		}
		if err := w.Write([]string{f.Name, ra, dec, f.Program, fmt.Sprintf("%g", f.Weight), number(diameter * 180 / math.Pi)}); err != nil {
			return nil, err
		}
	}
	w.Flush()
	return b.Bytes(), w.Error()
}

// setView reads a field of view: a diameter, or width x height, deg.
func setView(text string, t *footprint.Tiling) error {
	const degree = math.Pi / 180
	a, b, box := strings.Cut(strings.ToLower(text), "x")
	number := func(text string, most float64) (float64, bool) {
		v, err := strconv.ParseFloat(strings.TrimSpace(text), 64)
		return v * degree, err == nil && v >= 0.001 && v <= most
	}
	if !box {
		d, ok := number(a, 160)
		if !ok {
			return Inputf("--field-of-view is %s; want 0.001 to 160 degrees, or WIDTHxHEIGHT such as 2x1.5", text)
		}
		t.Diameter, t.Width, t.Height = d, 0, 0
		return nil
	}
	w, ok1 := number(a, 89)
	h, ok2 := number(b, 89)
	if !ok1 || !ok2 {
		return Inputf("--field-of-view is %s; want a width and a height of 0.001 to 89 degrees, such as 2x1.5", text)
	}
	t.Diameter, t.Width, t.Height = 0, w, h
	return nil
}

// tileOf is the diameter of the circle that a telescope must see to take a
// field, rad: of a rectangle the one that fits into it.
func tileOf(p *footprint.Plan) float64 {
	if p.Width > 0 {
		return min(p.Width, p.Height)
	}
	return p.Diameter
}

// fieldsMap draws the fields on the sky.
func fieldsMap(p *footprint.Plan, fields []footprint.Field) []byte {
	var programs []string
	tiles := make([]draw.Tile, len(fields))
	for i := range fields {
		f := &fields[i]
		k := slices.Index(programs, f.Program)
		if k < 0 {
			k = len(programs)
			programs = append(programs, f.Program)
		}
		tiles[i] = draw.Tile{RA: f.RA, Dec: f.Dec, Radius: p.Diameter / 2, Width: p.Width, Height: p.Height, Kind: k}
	}
	size := fmt.Sprintf("%.3g deg", p.Diameter*180/math.Pi)
	if p.Width > 0 {
		size = fmt.Sprintf("%.3g by %.3g deg", p.Width*180/math.Pi, p.Height*180/math.Pi)
	}
	return draw.Tiles("fields", p.Name, programs, tiles, fmt.Sprintf("%d fields of %s", len(fields), size)).SVG()
}
