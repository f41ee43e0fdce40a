package starter

import (
	"bytes"
	_ "embed" // the templates
	"errors"
	"fmt"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"strings"
	"text/template"
)

//go:embed demo.yaml.tmpl
var demoText string

//go:embed season.yaml.tmpl
var seasonText string

// kind is one starter.
type kind struct {
	name   string
	text   string  // template of survey.yaml
	demand float64 // what the visits in the template ask for, as a part of the supply
	fields func() []byte
}

var kinds = []kind{
	{"demo", demoText, 1, demoFields},
	{"season", seasonText, 1.5, seasonFields},
}

// Names lists the starters.
func Names() []string {
	var names []string
	for _, k := range kinds {
		names = append(names, k.name)
	}
	return names
}

// maxDemand is the greatest demand, in supplies of open time.
const maxDemand = 100

// Files makes a starter's files by name. The demand is the time its visits
// take, as a multiple of the open time there is; 0 asks for the starter's
// own. Visits are whole numbers, so it is met to a few parts in a hundred.
func Files(like string, demand float64) (map[string][]byte, error) {
	for _, k := range kinds {
		if k.name != like {
			continue
		}
		if demand == 0 {
			demand = k.demand
		}
		if math.IsNaN(demand) || demand <= 0 || demand > maxDemand {
			return nil, fmt.Errorf("the demand is %g; want more than 0 and at most %d", demand, maxDemand)
		}
		visits := func(own int) int {
			return max(1, int(math.Round(float64(own)*demand/k.demand)))
		}
		t, err := template.New(like).Funcs(template.FuncMap{
			"visits": visits,
			"demand": func() float64 { return demand },
		}).Parse(k.text)
		if err != nil {
			return nil, fmt.Errorf("template of %s: %w", like, err)
		}
		var text bytes.Buffer
		if err := t.Execute(&text, nil); err != nil {
			return nil, fmt.Errorf("template of %s: %w", like, err)
		}
		return map[string][]byte{"survey.yaml": text.Bytes(), "fields.csv": k.fields()}, nil
	}
	return nil, fmt.Errorf("there is no starter %q; want one of %s", like, strings.Join(Names(), ", "))
}

// Write writes a starter into dir, which must be new or empty: either the
// whole survey stands there afterwards, or nothing does. Demand is as in
// Files.
func Write(dir, like string, demand float64) error {
	files, err := Files(like, demand)
	if err != nil {
		return err
	}
	dir, err = filepath.Abs(dir)
	if err != nil {
		return err
	}
	if err := free(dir); err != nil {
		return err
	}
	if err := os.MkdirAll(filepath.Dir(dir), 0o755); err != nil {
		return err
	}
	beside, err := os.MkdirTemp(filepath.Dir(dir), "."+filepath.Base(dir)+"-")
	if err != nil {
		return err
	}
	defer os.RemoveAll(beside) // gone already when all went well
	if err := os.Chmod(beside, 0o755); err != nil {
		return err
	}
	for _, name := range []string{"survey.yaml", "fields.csv"} {
		if err := os.WriteFile(filepath.Join(beside, name), files[name], 0o644); err != nil {
			return err
		}
	}
	// An empty folder is in the way of the rename; one that has filled up
	// meanwhile stays, and Remove fails.
	if err := os.Remove(dir); err != nil && !errors.Is(err, fs.ErrNotExist) {
		return err
	}
	return os.Rename(beside, dir)
}

// free tells what stands in the way at dir.
func free(dir string) error {
	entries, err := os.ReadDir(dir)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return nil
	case err != nil:
		return err
	case len(entries) > 0:
		return fmt.Errorf("the folder %s is not empty; want a new or an empty folder", dir)
	}
	return nil
}
