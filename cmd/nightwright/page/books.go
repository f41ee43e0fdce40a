package page

import (
	"context"
	"fmt"
	"os"
	"path/filepath"
	"sync"

	"nightwright/cmd/nightwright/work"
	"nightwright/constraints/survey"
	"nightwright/scheduler/tables"
)

// books keeps the survey and the plan in memory, and reads them again when
// their files change.
type books struct {
	cfg *Config

	mu    sync.Mutex
	mark  string
	last  *view
	sheet *work.Survey // with the losses that the plan knew of; nil until a sheet is asked for
}

// view is a survey with a plan, as they were read; but for
// windows, which are opened late, it never changes.
type view struct {
	*work.Survey
	plan    *tables.PlanTables
	planDir string
	mark    string // of the files it was read from
	rows    []*tables.FieldRow
	fieldID map[string]int
	nights  [][][]int32 // visits, by telescope and night
	fields  [][]int32   // visits, by field

	windowsMu sync.Mutex // for the survey's sky and windows, which are opened late
}

// planDir is where the plan is.
func (c *Config) planDir(s *work.Survey) string {
	if c.Plan != "" {
		return c.Plan
	}
	return filepath.Join(s.Folder(), "plan")
}

// stamp tells one state of the files from another.
func stamp(files ...string) string {
	out := ""
	for _, f := range files {
		info, err := os.Stat(f)
		if err != nil {
			out += "-;"
			continue
		}
		out += fmt.Sprintf("%d %d;", info.Size(), info.ModTime().UnixNano())
	}
	return out
}

func (b *books) files() []string {
	if b.last == nil {
		return nil
	}
	out := []string{filepath.Join(b.last.planDir, "plan.json")}
	for _, f := range b.last.Source.Files {
		out = append(out, filepath.Join(b.last.Source.Root, filepath.FromSlash(f.Name)))
	}
	return out
}

// view returns the survey and its plan as they are on disk.
func (b *books) view(ctx context.Context) (*view, error) {
	b.mu.Lock()
	defer b.mu.Unlock()
	if b.last != nil && stamp(b.files()...) == b.mark {
		return b.last, nil
	}
	s, err := work.ReadSurvey(b.cfg.Survey)
	if err != nil {
		return nil, err
	}
	// Lost time is drawn over the open time, so the calendar here has none.
	if err := s.OpenCalendar(ctx, work.Options{}); err != nil {
		return nil, err
	}
	dir := b.cfg.planDir(s)
	pt, err := work.ReadPlan(dir)
	if err != nil {
		return nil, err
	}
	v, err := newView(s, pt, dir)
	if err != nil {
		return nil, err
	}
	b.last, b.sheet = v, nil
	b.mark = stamp(b.files()...)
	v.mark = b.mark
	return v, nil
}

// newView indexes a plan.
func newView(s *work.Survey, pt *tables.PlanTables, dir string) (*view, error) {
	if changed := s.Changed(pt); pt.Summary.Survey != s.Name || len(changed) > 0 {
		return nil, work.Inputf("the plan in %s was made from another state of the survey (%v differ); run 'nightwright plan %s' first", dir, changed, s.Path)
	}
	v := &view{Survey: s, plan: pt, planDir: dir, fieldID: map[string]int{}}
	for i := range s.Fields {
		v.fieldID[s.Fields[i].Name] = i
	}
	v.rows = make([]*tables.FieldRow, len(s.Fields))
	for i := range pt.Fields {
		id, ok := v.fieldID[pt.Fields[i].Field]
		if !ok {
			return nil, work.Inputf("the plan in %s has a field %q that the survey hasn't; plan again", dir, pt.Fields[i].Field)
		}
		v.rows[id] = &pt.Fields[i]
	}
	telescopes := map[string]int{}
	v.nights = make([][][]int32, len(s.Telescopes))
	for t := range s.Telescopes {
		telescopes[s.Telescopes[t].Name] = t
		v.nights[t] = make([][]int32, s.Nights())
	}
	v.fields = make([][]int32, len(s.Fields))
	for i := range pt.Visits {
		r := &pt.Visits[i]
		f, known := v.fieldID[r.Field]
		t, ok := telescopes[r.Telescope]
		n := int(r.Night) - int(s.FirstNight)
		if !known || !ok || v.rows[f] == nil {
			return nil, work.Inputf("the plan in %s has a visit of %q on %q that the survey hasn't; plan again", dir, r.Field, r.Telescope)
		}
		v.fields[f] = append(v.fields[f], int32(i))
		if n >= 0 && n < s.Nights() { // what was done before the period has no night here
			v.nights[t][n] = append(v.nights[t][n], int32(i))
		}
	}
	return v, nil
}

// openWindows works out when fields may be observed, once for a view: it takes
// a while, and only planning again and stories want it.
func (v *view) openWindows(ctx context.Context, o work.Options) error {
	v.windowsMu.Lock()
	defer v.windowsMu.Unlock()
	return v.OpenWindows(ctx, o)
}

// night reads a night's label.
func (v *view) night(label string) (int, error) {
	day, err := survey.ParseDay(label)
	if err != nil || day < v.FirstNight || day > v.LastNight {
		return 0, wrong(fmt.Sprintf("there is no night %q; want one from %s to %s", label, v.FirstNight, v.LastNight))
	}
	return int(day - v.FirstNight), nil
}

// sheets returns the survey with the losses that the plan knew of, as sheets
// need it.
func (b *books) sheets(ctx context.Context, v *view) (*work.Survey, error) {
	b.mu.Lock()
	defer b.mu.Unlock()
	if b.sheet != nil && b.last == v {
		return b.sheet, nil
	}
	s, err := work.ReadSurvey(b.cfg.Survey)
	if err != nil {
		return nil, err
	}
	if err := s.TakeLossesOf(ctx, v.plan); err != nil {
		return nil, err
	}
	if err := s.OpenCalendar(ctx, work.Options{}); err != nil {
		return nil, err
	}
	if b.last == v {
		b.sheet = s
	}
	return s, nil
}
