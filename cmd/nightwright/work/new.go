package work

import (
	"os"
	"path/filepath"
	"strings"

	"nightwright/scenarios/starter"
)

// NewResult says what New wrote.
type NewResult struct {
	Folder string   `json:"folder"`
	Like   string   `json:"like"`
	Demand float64  `json:"demand,omitempty"` // 0: the starter's own
	Files  []string `json:"files"`
}

// New writes a starter survey into a folder that is new or empty. demand is
// the time its visits take as a multiple of the open time; 0 leaves the
// starter's own.
func New(dir, like string, demand float64) (*NewResult, error) {
	if _, err := starter.Files(like, demand); err != nil {
		return nil, &InputError{What: err.Error()}
	}
	if what := occupied(dir); what != "" {
		return nil, Inputf("%s %s; give a folder that is new or empty", dir, what)
	}
	if err := starter.Write(dir, like, demand); err != nil {
		return nil, err
	}
	return &NewResult{Folder: dir, Like: like, Demand: demand, Files: []string{"survey.yaml", "fields.csv"}}, nil
}

// LikeNames lists the starters with "or" before the last.
func LikeNames() string { return strings.Join(starter.Names(), " or ") }

// occupied says why nothing new can be written into a folder, "" when it can.
func occupied(dir string) string {
	info, err := os.Stat(dir)
	if err != nil {
		return ""
	}
	if !info.IsDir() {
		return "is a file"
	}
	entries, err := os.ReadDir(dir)
	if err != nil {
		return "can't be read"
	}
	if len(entries) > 0 {
		return "already holds " + filepath.Base(entries[0].Name())
	}
	return ""
}
