package footprint

import (
	"errors"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"

	"go.yaml.in/yaml/v3"

	"nightwright/scenarios/surveyfile"
)

const (
	// MaxRegionBytes is the longest region file that is read.
	MaxRegionBytes = 4 << 20
	maxParts       = 1000
	degree         = math.Pi / 180
)

// Plan is what a region file asks for: the region, and how to cut it. What
// the file leaves out is 0, and is for the caller to fill in.
type Plan struct {
	Name string
	Region
	Tiling
	Program string // for parts without their own
}

// Load reads a region file: YAML, or a MOC alone (.moc, .json, .txt), whose
// region it is. A file that it names must lie in its folder or below. The
// plan is nil when there is a fault.
func Load(path string) (*Plan, []surveyfile.Issue) {
	dir, name := filepath.Split(path)
	if dir == "" {
		dir = "."
	}
	r := &reader{file: path}
	root, err := os.OpenRoot(dir)
	if err != nil {
		r.fault(nil, fmt.Sprintf("the folder %s can't be opened: %v", dir, bare(err)), wantRegion)
		return nil, r.issues
	}
	defer root.Close()
	r.open = func(name string, limit int64) ([]byte, error) { return readIn(root, name, limit) }
	limit := int64(MaxRegionBytes)
	switch strings.ToLower(filepath.Ext(name)) {
	case ".moc", ".json", ".txt", ".fits":
		limit = MaxMOCBytes
	}
	text, err := r.open(name, limit)
	if err != nil {
		r.fault(nil, fmt.Sprintf("it can't be read: %v", bare(err)), wantRegion)
		return nil, r.issues
	}
	if limit == MaxMOCBytes {
		m, err := ParseMOC(path, text)
		if err == nil && m.Empty() {
			err = surveyfile.Issue{File: path, Line: 1, What: "the map has no cells", Want: wantMOC}
		}
		var issue surveyfile.Issue
		if errors.As(err, &issue) {
			return nil, []surveyfile.Issue{issue}
		}
		return &Plan{Name: strings.TrimSuffix(name, filepath.Ext(name)), Region: Region{Parts: []Part{{Name: name, Line: 1, Weight: 1, Shape: Map{m}}}}}, nil
	}
	return r.parse(text)
}

// Parse reads the text of a region file; open reads a file that it names. It
// is Load for those who have no folder.
func Parse(file string, text []byte, open func(name string, limit int64) ([]byte, error)) (*Plan, []surveyfile.Issue) {
	r := &reader{file: file, open: open}
	return r.parse(text)
}

// readIn reads a file below a folder.
func readIn(root *os.Root, name string, limit int64) ([]byte, error) {
	if !filepath.IsLocal(name) {
		return nil, errors.New("it lies outside the region file's folder")
	}
	f, err := root.Open(name)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	if info, err := f.Stat(); err != nil {
		return nil, err
	} else if !info.Mode().IsRegular() {
		return nil, errors.New("it is no plain file")
	}
	text, err := io.ReadAll(io.LimitReader(f, limit+1))
	if err == nil && int64(len(text)) > limit {
		err = fmt.Errorf("it has more than %d bytes", limit)
	}
	return text, err
}

// bare takes operation and path from a file error; the message names them.
func bare(err error) error {
	var p *os.PathError
	if errors.As(err, &p) {
		return p.Err
	}
	return err
}

const wantRegion = "want a region file such as 'nightwright fields --help' shows, or a MOC"

// reader reads one region file.
type reader struct {
	file   string
	open   func(name string, limit int64) ([]byte, error)
	issues []surveyfile.Issue
}

func (r *reader) fault(at *yaml.Node, what, want string) {
	i := surveyfile.Issue{File: r.file, Line: 1, What: what, Want: want}
	if at != nil {
		i.Line, i.Col = max(1, at.Line), at.Column
	}
	r.issues = append(r.issues, i)
}

var yamlLine = regexp.MustCompile(`^yaml: line (\d+): `)

func (r *reader) parse(text []byte) (*Plan, []surveyfile.Issue) {
	var doc yaml.Node
	err := func() (err error) {
		// The library has panicked on odd bytes before.
		defer func() {
			if p := recover(); p != nil {
				err = fmt.Errorf("yaml: %v", p)
			}
		}()
		return yaml.Unmarshal(text, &doc)
	}()
	if err != nil {
		at := &yaml.Node{Line: 1}
		what := err.Error()
		if m := yamlLine.FindStringSubmatch(what); m != nil {
			at.Line, _ = strconv.Atoi(m[1])
			what = what[len(m[0]):]
		}
		r.fault(at, "it is not YAML here: "+clip(strings.TrimPrefix(what, "yaml: ")), "want keys and values, indented by spaces, with lists in [] or after -")
		return nil, r.issues
	}
	if len(doc.Content) == 0 {
		r.fault(nil, "the file is empty", "want the key parts with at least one part of the sky")
		return nil, r.issues
	}
	p := r.plan(doc.Content[0])
	if len(r.issues) > 0 {
		return nil, r.issues
	}
	return p, nil
}

// topKeys are the keys of a region file.
var topKeys = []string{"region", "field_of_view_deg", "overlap", "program", "prefix", "dithers", "weights", "parts", "exclude"}

func (r *reader) plan(top *yaml.Node) *Plan {
	m := r.keys(top, "the file", topKeys)
	if m == nil {
		return nil
	}
	p := &Plan{}
	p.Name, _ = r.name(m, "region")
	p.Program, _ = r.name(m, "program")
	p.Prefix, _ = r.name(m, "prefix")
	r.view(m, &p.Tiling)
	p.Overlap = r.number(m, "overlap", 0, 0.9, 0)
	if n := m.at["dithers"]; n != nil {
		if d := r.keys(n, "dithers", []string{"count", "step_deg"}); d != nil {
			count := r.number(d, "count", 1, 100, 1)
			if count != math.Trunc(count) {
				r.fault(d.at["count"], fmt.Sprintf("count is %g", count), "want a whole number")
			}
			p.Dithers, p.Step = int(count), degree*r.number(d, "step_deg", 0, 90, 0)
			if p.Dithers > 1 && p.Step == 0 {
				r.fault(n, "the dithers have no step_deg", "want how far to move, such as step_deg: 0.2")
			}
		}
	}
	if n := m.at["weights"]; n != nil {
		p.Weights = r.weights(n)
	}
	p.Parts = r.parts(m, "parts")
	p.Exclude = r.parts(m, "exclude")
	if n := m.at["parts"]; n == nil {
		r.fault(top, "the file has no parts", "want the key parts with at least one part of the sky")
	} else if len(p.Parts) == 0 && len(r.issues) == 0 {
		r.fault(n, "the region is empty: parts has no part", "want at least one")
	}
	if len(r.issues) == 0 && len(p.Exclude) > 0 && p.Nothing() {
		r.fault(m.at["exclude"], "the region is empty: the exclusions leave nothing of its parts", "want a part of the sky that remains")
	}
	for i := range p.Parts {
		if p.Parts[i].Program == "" {
			p.Parts[i].Program = p.Program
		}
	}
	return p
}

// view reads how large a field is: a diameter, or width and height.
func (r *reader) view(m *group, t *Tiling) {
	const key = "field_of_view_deg"
	n := m.at[key]
	if n == nil {
		return
	}
	if resolve(n).Kind != yaml.MappingNode {
		t.Diameter = degree * r.number(m, key, 0.001, 160, 0)
		return
	}
	if g := r.keys(n, key, []string{"width", "height"}); g != nil {
		t.Width, t.Height = degree*r.need(g, "width", 0.001, 89), degree*r.need(g, "height", 0.001, 89)
	}
}
