package tables

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path"
	"path/filepath"
	"slices"
	"strings"
)

// PlanTables is a plan folder in memory.
type PlanTables struct {
	Summary Summary
	Visits  []VisitRow
	Fields  []FieldRow
	Demands []DemandRow
	Nights  []NightRow
	Prices  []PriceRow
	Changes []ChangeRow // of a re-plan; nil: no such table
}

// SurveyFile is a file of the survey that a plan was made from.
type SurveyFile struct {
	Name string // relative to the survey folder, with slashes
	Data []byte
}

const (
	summaryName = "plan.json"
	surveyDir   = "survey"
	suffix      = ".parquet"
	// maxSummary bounds plan.json, whose size goes with the number of
	// programs, telescopes and files only.
	maxSummary = 64 << 20
)

// part is one table of a plan folder, its row type hidden.
type part struct {
	name   string
	must   bool // in every plan
	has    bool
	encode func() ([]byte, error)
	decode func(name string, data []byte) (rows int, err error)
}

func partOf[T any](t Table[T], rows *[]T, must bool) part {
	return part{
		name: t.Name, must: must, has: must || *rows != nil,
		encode: func() ([]byte, error) { return t.Encode(*rows) },
		decode: func(name string, data []byte) (int, error) {
			got, err := t.Decode(name, data)
			if got == nil {
				got = []T{}
			}
			*rows = got
			return len(got), err
		},
	}
}

// parts lists the tables of a plan folder in the order of plan.json.
func (p *PlanTables) parts() []part {
	return []part{
		partOf(Visits, &p.Visits, true),
		partOf(Fields, &p.Fields, true),
		partOf(Demands, &p.Demands, true),
		partOf(Nights, &p.Nights, true),
		partOf(Prices, &p.Prices, true),
		partOf(Changes, &p.Changes, false),
	}
}

func (p *PlanTables) rows() []int {
	return []int{len(p.Visits), len(p.Fields), len(p.Demands), len(p.Nights), len(p.Prices), len(p.Changes)}
}

// WriteFolder writes a plan folder: its tables, the survey's files under
// survey/, and plan.json with the checksums of both, which it also sets in
// pt.Summary. The folder appears whole: until then the one that stood there
// stays, and what is no plan folder is never replaced.
func WriteFolder(dir string, pt *PlanTables, files []SurveyFile) error {
	dir = filepath.Clean(dir)
	exists, err := replaceable(dir)
	if err != nil {
		return err
	}
	if err := checkNames(files); err != nil {
		return err
	}
	parent := filepath.Dir(dir)
	fresh, err := os.MkdirTemp(parent, "."+filepath.Base(dir)+".new-")
	if err != nil {
		return fmt.Errorf("plan folder: %w", err)
	}
	defer os.RemoveAll(fresh)
	if err := fill(fresh, pt, files); err != nil {
		return err
	}
	if err := os.Chmod(fresh, 0o755); err != nil {
		return fmt.Errorf("plan folder: %w", err)
	}
	if err := install(fresh, dir, exists); err != nil {
		return fmt.Errorf("%s: the plan folder can't be put in its place: %w", dir, err)
	}
	return syncDir(parent)
}

// replaceable reports whether a folder stands at dir, and errs when it is
// something that must not be replaced.
func replaceable(dir string) (exists bool, err error) {
	info, err := os.Lstat(dir)
	if errors.Is(err, fs.ErrNotExist) {
		return false, nil
	}
	if err != nil {
		return false, err
	}
	if !info.IsDir() {
		return false, fmt.Errorf("%s: it is no folder; want a new name or a plan folder to replace", dir)
	}
	entries, err := os.ReadDir(dir)
	if err != nil {
		return false, err
	}
	if len(entries) == 0 {
		return true, nil
	}
	text, err := readBounded(filepath.Join(dir, summaryName), maxSummary)
	if err != nil || !looksLikeSummary(text) {
		return false, fmt.Errorf("%s: it is no plan folder and is left as it is; want a new name, an empty folder or a plan folder to replace", dir)
	}
	return true, nil
}

// looksLikeSummary is kind enough to let a damaged plan be replaced.
func looksLikeSummary(text []byte) bool {
	return strings.Contains(string(text[:min(len(text), 512)]), `"kind": "`+SummaryKind+`"`)
}

// checkNames refuses names of survey files that would lie elsewhere.
func checkNames(files []SurveyFile) error {
	seen := map[string]bool{}
	for _, f := range files {
		if !localName(f.Name) {
			return fmt.Errorf("survey file %q: want a name inside the survey folder", f.Name)
		}
		if seen[f.Name] {
			return fmt.Errorf("survey file %q: it is listed twice; want each once", f.Name)
		}
		seen[f.Name] = true
	}
	return nil
}

func localName(name string) bool {
	return name == path.Clean(name) && name != "." && filepath.IsLocal(filepath.FromSlash(name)) && !strings.Contains(name, `\`)
}

// fill writes all files of a plan folder, and flushes them to the disk.
func fill(dir string, pt *PlanTables, files []SurveyFile) error {
	s := &pt.Summary
	s.Files, s.Tables = []FileSum{}, []TableSum{}
	for _, f := range files {
		s.Files = append(s.Files, FileSum{f.Name, int64(len(f.Data)), hexSum(f.Data)})
	}
	slices.SortFunc(s.Files, func(a, b FileSum) int { return strings.Compare(a.Name, b.Name) })
	dirs := []string{dir, filepath.Join(dir, surveyDir)}
	if err := os.Mkdir(dirs[1], 0o755); err != nil {
		return err
	}
	for _, f := range files {
		at := filepath.Join(dir, surveyDir, filepath.FromSlash(f.Name))
		for up := filepath.Dir(at); !slices.Contains(dirs, up); up = filepath.Dir(up) {
			dirs = append(dirs, up)
		}
		if err := os.MkdirAll(filepath.Dir(at), 0o755); err != nil {
			return err
		}
		if err := writeSynced(at, f.Data); err != nil {
			return err
		}
	}
	rows := pt.rows()
	for i, p := range pt.parts() {
		if !p.has {
			continue
		}
		data, err := p.encode()
		if err != nil {
			return err
		}
		s.Tables = append(s.Tables, TableSum{p.name + suffix, int64(rows[i]), int64(len(data)), hexSum(data)})
		if err := writeSynced(filepath.Join(dir, p.name+suffix), data); err != nil {
			return err
		}
	}
	text, err := s.Encode()
	if err != nil {
		return err
	}
	if err := writeSynced(filepath.Join(dir, summaryName), text); err != nil {
		return err
	}
	slices.Reverse(dirs)
	for _, d := range dirs {
		if err := syncDir(d); err != nil {
			return err
		}
	}
	return nil
}

func writeSynced(name string, data []byte) error {
	f, err := os.OpenFile(name, os.O_WRONLY|os.O_CREATE|os.O_EXCL, 0o644)
	if err != nil {
		return err
	}
	_, err = f.Write(data)
	return errors.Join(err, f.Sync(), f.Close())
}

// install puts the fresh folder in the place of dir.
func install(fresh, dir string, exists bool) error {
	old := asideName(dir)
	if !exists {
		if err := os.Rename(fresh, dir); err != nil {
			return err
		}
		return os.RemoveAll(old) // left by a replacement that was cut short
	}
	if err := os.RemoveAll(old); err != nil {
		return err
	}
	if err := swap(fresh, dir); err == nil {
		return os.RemoveAll(fresh) // the old one now
	}
	// No exchange in one step here: ReadFolder looks under the aside name
	// when it finds none in place.
	if err := os.Rename(dir, old); err != nil {
		return err
	}
	if err := os.Rename(fresh, dir); err != nil {
		return errors.Join(err, os.Rename(old, dir))
	}
	return os.RemoveAll(old)
}

// swap is exchange; tests put in one that fails.
var swap = exchange

// asideName is where the old folder stands for the moment between two renames.
func asideName(dir string) string {
	return filepath.Join(filepath.Dir(dir), "."+filepath.Base(dir)+".old")
}
