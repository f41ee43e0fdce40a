package work

import (
	"context"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"time"

	"github.com/google/renameio/v2"

	"nightwright/constraints/survey"
	"nightwright/scheduler/sheet"
	"nightwright/scheduler/tables"
)

// Sheet makes the list of one telescope for one night. Local times are those
// of the site's time zone.
func Sheet(ctx context.Context, s *Survey, pt *tables.PlanTables, telescope, night string, o Options) (*sheet.Sheet, error) {
	if name := pt.Summary.Survey; name != s.Name {
		return nil, Inputf("the plan is of the survey %q, not of %q; want the survey it was made from", name, s.Name)
	}
	t, err := s.TelescopeID(telescope)
	if err != nil {
		return nil, err
	}
	n, err := s.NightIndex(night)
	if err != nil {
		return nil, err
	}
	if err := s.TakeLossesOf(ctx, pt); err != nil {
		return nil, err
	}
	if err := s.OpenCalendar(ctx, o); err != nil {
		return nil, err
	}
	zone, err := time.LoadLocation(s.Sites[s.Telescopes[t].Site].TimeZone)
	if err != nil {
		return nil, Inputf("time zone of %s: %v; want an IANA name such as Etc/GMT+7", s.Sites[s.Telescopes[t].Site].Name, err)
	}
	list, err := sheet.Build(s.Survey, s.Exact, s.Calendar, pt, sheet.Ask{Telescope: telescope, Night: s.FirstNight + survey.Day(n), Zone: zone})
	if err != nil {
		return nil, &InputError{What: err.Error()}
	}
	list.Reserve, err = sheet.Reserve(ctx, s.Survey, s.Exact, s.Losses, pt, sheet.Ask{Telescope: telescope, Night: s.FirstNight + survey.Day(n)}, reserveLines, max(1, o.Workers))
	if err != nil {
		return nil, err
	}
	return list, nil
}

// reserveLines is how many entries a sheet's reserve list has at most.
const reserveLines = 10

// SheetForms lists the forms of a sheet, by the suffix of their files.
func SheetForms() []string { return []string{"txt", "csv", "html"} }

// WriteSheet writes a sheet to a file in the form of its suffix.
func WriteSheet(list *sheet.Sheet, path string) error {
	write := list.WriteText
	switch filepath.Ext(path) {
	case ".txt":
	case ".csv":
		write = list.WriteCSV
	case ".html":
		write = list.WriteHTML
	default:
		return Inputf("%s: a sheet is .txt, .csv or .html; give a name that ends so", path)
	}
	f, err := renameio.NewPendingFile(path, renameio.WithPermissions(0o644))
	if err != nil {
		return err
	}
	defer f.Cleanup()
	if err := write(f); err != nil {
		return err
	}
	return f.CloseAtomicallyReplace()
}

// FirstSheets writes the sheet of each telescope's first night with a visit
// into a folder, in every form, and returns the names of the text files. A
// telescope without visits has none.
func FirstSheets(ctx context.Context, s *Survey, pt *tables.PlanTables, dir string, o Options) ([]string, error) {
	if err := os.MkdirAll(dir, 0o755); err != nil {
		return nil, err
	}
	var out []string
	for t := range s.Telescopes {
		name := s.Telescopes[t].Name
		night := int32(math.MaxInt32)
		for i := range pt.Visits {
			if v := &pt.Visits[i]; v.Telescope == name {
				night = min(night, v.Night)
			}
		}
		if night == math.MaxInt32 {
			continue
		}
		o.tell("sheets", t, len(s.Telescopes))
		list, err := Sheet(ctx, s, pt, name, tables.Date(night), o)
		if err != nil {
			return nil, err
		}
		for _, form := range SheetForms() {
			file := filepath.Join(dir, fmt.Sprintf("%s-%s.%s", fileName(name), tables.Date(night), form))
			if err := WriteSheet(list, file); err != nil {
				return nil, err
			}
			if form == "txt" {
				out = append(out, file)
			}
		}
	}
	o.tell("sheets", 1, 1)
	return out, ctx.Err()
}

// fileName makes a telescope's name fit for a file.
func fileName(name string) string {
	out := []rune(name)
	for i, r := range out {
		if r == '/' || r == '\\' || r == ' ' || r == ':' || r < ' ' {
			out[i] = '-'
		}
	}
	return string(out)
}
