package surveyfile

import (
	"fmt"
	"os"
	"path/filepath"
	"strconv"
	"strings"

	"go.yaml.in/yaml/v3"

	"nightwright/constraints/survey"
)

// FileName is the survey file of a survey folder.
const FileName = "survey.yaml"

// Limits on what is read, so that a wrong file is refused and not swallowed.
const (
	// MaxSurveyBytes is the greatest survey file.
	MaxSurveyBytes = 4 << 20
	// MaxFieldBytes is the greatest field list.
	MaxFieldBytes = 512 << 20
	// MaxOrientationBytes is the greatest Earth-orientation file.
	MaxOrientationBytes = 64 << 20
	// MaxFields is the most fields a survey may have.
	MaxFields = 1_000_000
	// MaxNights is the longest period, 20 years.
	MaxNights = 7305
	// maxNodes bounds a survey file with its aliases written out.
	maxNodes = 1_000_000
)

// loader holds one Load's state: the survey as far as it is read, the names
// met so far, and where things stood for the checks that come last.
type loader struct {
	reader
	folder     *folder
	sv         *survey.Survey
	filters    names
	telescopes names
	sites      names
	programs   names
	networks   names
	marks      marks
}

// marks remembers where the parts stood in the file, and whether each was
// read without a fault: a check over several parts runs only on sound ones.
type marks struct {
	period     bool // it is there, and in order
	sites      []mark
	telescopes []mark
	programs   []mark
	demands    [][]demandMark // by program
	rules      survey.Rules
}

type mark struct {
	node     *yaml.Node
	sound    bool
	closures []*yaml.Node // of a site or telescope
}

type demandMark struct {
	mark
	exposures []*yaml.Node
	rules     []override // program's, then the demand's own
}

// Load reads the survey in a folder, or the survey file itself, with every
// file it names. The issues are sorted by file and position. The survey is
// nil when any of them is not a warning; the source is nil when the survey
// file could not be read at all.
func Load(path string) (*survey.Survey, *Source, []Issue) {
	dir, name := path, FileName
	if info, err := os.Stat(path); err != nil || !info.IsDir() {
		dir, name = filepath.Split(path)
	}
	if dir == "" {
		dir = "."
	}
	l := &loader{reader: reader{file: filepath.Join(dir, name)}, sv: &survey.Survey{}}
	start := &yaml.Node{Line: 1, Column: 1}
	root, err := os.OpenRoot(dir)
	if err != nil {
		l.fault(start, fmt.Sprintf("the folder %s can't be opened: %v", dir, reason(err)), "want a survey folder or its "+FileName)
		return nil, nil, l.issues
	}
	defer root.Close()
	l.folder = &folder{root: root, source: Source{Root: dir}}
	text, err := l.folder.read(name, MaxSurveyBytes)
	if err != nil {
		l.fault(start, fmt.Sprintf("it can't be read: %v", reason(err)), "want a survey folder with "+FileName+", or that file")
		return nil, nil, l.issues
	}
	if top := l.parse(text); top != nil {
		l.survey(top)
	}
	sortIssues(l.issues)
	source := &l.folder.source
	if Faults(l.issues) > 0 {
		return nil, source, l.issues
	}
	return l.sv, source, l.issues
}

// survey reads everything under the file's top.
func (l *loader) survey(top *yaml.Node) {
	m := l.mapping(top, "", "the file")
	if m == nil {
		return
	}
	sv := l.sv
	sv.Name, _ = m.name("survey")
	l.period(m)
	if v, ok := m.duration("slot", span{low: 60, high: daySeconds}); ok {
		sv.Slot = v
		if rest := daySeconds / v; rest != float64(int(rest)) {
			l.fault(m.at("slot"), fmt.Sprintf("slot is %s, which does not divide 24 h evenly", formatDuration(v)), "want such as 5m, 10m, 15m or 30m")
		}
	}
	l.seed(m)
	sv.FinishBonus, _ = m.number("finish_bonus", span{low: 0, high: 100})
	l.orientation(m)
	l.readFilters(m)
	l.marks.rules = l.baseRules(m)
	l.readSites(m)
	l.readPrograms(m)
	l.readNetworks(m)
	l.readFields(m)
	l.check()
}

// seed reads the seed, any whole number from 0 to 2^64 - 1.
func (l *loader) seed(m *mapping) {
	const want = "want a whole number from 0 to 18446744073709551615"
	text, ok := m.text("seed", want)
	if !ok {
		return
	}
	v, err := strconv.ParseUint(strings.TrimSpace(text), 10, 64)
	if err != nil {
		l.fault(m.at("seed"), fmt.Sprintf("seed is %q", clip(text)), want)
	}
	l.sv.Seed = v
}

// earliest and latest bound the period: UTC with leap seconds began in 1972,
// and the sky's series are checked to the end of this century.
var (
	earliest, _ = survey.ParseDay("1972-01-01")
	latest, _   = survey.ParseDay("2099-12-31")
)

// period reads the first and last night.
func (l *loader) period(m *mapping) {
	n := m.values["period"]
	if n == nil {
		return
	}
	p := l.mapping(n, "period", "period")
	if p == nil {
		return
	}
	night := func(key string) (survey.Day, bool) {
		const want = "want a date such as 2027-02-01"
		text, ok := p.text(key, want)
		if !ok {
			return 0, false
		}
		day, err := survey.ParseDay(strings.TrimSpace(text))
		if err != nil {
			l.fault(p.at(key), fmt.Sprintf("%s: %q is no date", key, clip(text)), want)
			return 0, false
		}
		if day < earliest || day > latest {
			l.fault(p.at(key), fmt.Sprintf("%s is %s", key, day), fmt.Sprintf("want %s to %s", earliest, latest))
			return 0, false
		}
		return day, true
	}
	first, ok := night("first_night")
	last, ok2 := night("last_night")
	if !ok || !ok2 {
		return
	}
	l.sv.FirstNight, l.sv.LastNight = first, last
	l.marks.period = last >= first
	switch {
	case last < first:
		l.fault(p.at("last_night"), fmt.Sprintf("the period is reversed: last_night %s is before first_night %s", last, first), "want the earlier night first")
	case l.sv.Nights() > MaxNights:
		l.fault(p.at("last_night"), fmt.Sprintf("the period has %d nights", l.sv.Nights()), fmt.Sprintf("want at most %d, 20 years", MaxNights))
	}
}
