package work

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"os"
	"path/filepath"
	"strings"

	"nightwright/constraints"
	"nightwright/constraints/survey"
	"nightwright/scenarios/surveyfile"
	"nightwright/visibility"
	"nightwright/visibility/ephemeris"
)

// Survey is a survey that was read, with the sky over it as far as a job
// needs it.
type Survey struct {
	*survey.Survey
	Path     string // as it was named
	Source   *surveyfile.Source
	Warnings []surveyfile.Issue

	Clock    *ephemeris.Clock
	Exact    *visibility.Exact
	Calendar *constraints.Calendar // after OpenCalendar
	Sky      *visibility.Sky       // after OpenWindows
	Windows  *constraints.Windows  // after OpenWindows

	Losses      [][]visibility.Interval // of each telescope, after TakeLosses; UTC, Unix s
	lossesTaken bool
	lossesUpTo  int64
}

// ReadSurvey reads a survey folder or file. A survey with faults is an
// InputError that lists them all.
func ReadSurvey(path string) (*Survey, error) {
	sv, source, issues := surveyfile.Load(path)
	if sv == nil {
		return nil, &InputError{Issues: issues}
	}
	s := &Survey{Survey: sv, Path: path, Source: source, Warnings: issues}
	s.Clock = ephemeris.NewClock(sv.LeapSeconds, sv.Orientation)
	s.Exact = visibility.NewExact(s.Clock)
	return s, nil
}

// LeapWarning says when the leap-second table ends before the survey does,
// and is "" when it doesn't. Times after that are off by the leap seconds that
// were announced since.
func (s *Survey) LeapWarning() string {
	expires := s.Clock.LeapExpires()
	if end := (s.LastNight + 2).Unix(); end <= expires {
		return ""
	}
	day := survey.Day(int64(expires) / 86400)
	return fmt.Sprintf("the leap-second table is good until %s, the survey runs to %s; a leap second announced since would shift pointings by 15\"", day, s.LastNight)
}

// OpenCalendar works out the nights and open times, less the losses that were
// taken before.
func (s *Survey) OpenCalendar(ctx context.Context, o Options) error {
	if s.Calendar == nil {
		o.tell("nights", 0, 1)
		s.Calendar = constraints.NewCalendar(s.Survey, s.Exact, s.Losses)
		o.tell("nights", 1, 1)
	}
	return ctx.Err()
}

// OpenWindows works out when each field may be observed.
func (s *Survey) OpenWindows(ctx context.Context, o Options) error {
	if err := s.OpenCalendar(ctx, o); err != nil || s.Windows != nil {
		return err
	}
	o.tell("sky", 0, 1)
	s.Sky = constraints.Tables(s.Survey, s.Exact, o.Workers)
	if err := ctx.Err(); err != nil {
		return err
	}
	o.tell("windows", 0, 1)
	key := constraints.WindowsKey(s.Survey, s.Sky, s.Calendar)
	if s.Windows = s.storedWindows(key, o); s.Windows != nil {
		o.tell("windows", 1, 1)
		return ctx.Err()
	}
	w, err := constraints.NewWindows(ctx, s.Survey, s.Sky, s.Calendar, o.Workers)
	if err != nil {
		return err
	}
	s.Windows = w
	s.storeWindows(key)
	o.tell("windows", 1, 1)
	return ctx.Err()
}

// Folder is the survey's folder.
func (s *Survey) Folder() string { return s.Source.Root }

// file reads one of the survey's files again, and errs when it has changed
// since the survey was read.
func (s *Survey) file(f surveyfile.SourceFile) ([]byte, error) {
	text, err := os.ReadFile(filepath.Join(s.Source.Root, filepath.FromSlash(f.Name)))
	if err != nil {
		return nil, err
	}
	sum := sha256.Sum256(text)
	if hex.EncodeToString(sum[:]) != f.SHA256 {
		return nil, Inputf("%s changed while it was being planned; plan again", f.Name)
	}
	return text, nil
}

// SiteID finds a site by name.
func (s *Survey) SiteID(name string) (int, error) {
	names := make([]string, len(s.Sites))
	for i := range s.Sites {
		names[i] = s.Sites[i].Name
	}
	return find("site", name, names)
}

// TelescopeID finds a telescope by name.
func (s *Survey) TelescopeID(name string) (int, error) {
	names := make([]string, len(s.Telescopes))
	for i := range s.Telescopes {
		names[i] = s.Telescopes[i].Name
	}
	return find("telescope", name, names)
}

// FieldID finds a field by name.
func (s *Survey) FieldID(name string) (int, error) {
	names := make([]string, len(s.Fields))
	for i := range s.Fields {
		names[i] = s.Fields[i].Name
	}
	return find("field", name, names)
}

// FilterID finds a filter by name.
func (s *Survey) FilterID(name string) (int, error) {
	names := make([]string, len(s.Filters))
	for i := range s.Filters {
		names[i] = s.Filters[i].Name
	}
	return find("filter", name, names)
}

// find returns the index of a name; what it says of a name that is not there
// lists those that are, or the first of them.
func find(kind, name string, names []string) (int, error) {
	for i, n := range names {
		if n == name {
			return i, nil
		}
	}
	const shown = 8
	for _, n := range names {
		if strings.EqualFold(n, name) {
			return 0, Inputf("there is no %s %q; did you mean %q?", kind, name, n)
		}
	}
	if len(names) > shown {
		return 0, Inputf("there is no %s %q; there are %s and %d more", kind, name, strings.Join(names[:shown], ", "), len(names)-shown)
	}
	return 0, Inputf("there is no %s %q; there are %s", kind, name, strings.Join(names, ", "))
}
