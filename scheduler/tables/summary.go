package tables

import (
	"bytes"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"errors"
	"fmt"
	"io"
)

// Summary is plan.json. The order of its members is that of the file. Hours
// are telescope hours: each telescope's night counts for itself.
type Summary struct {
	SchemaVersion string `json:"schema_version"`
	Kind          string `json:"kind"`            // SummaryKind
	Program       string `json:"program_version"` // set by the caller of Build
	Survey        string `json:"survey"`
	FirstNight    string `json:"first_night"`
	LastNight     string `json:"last_night"`
	Seed          uint64 `json:"seed"`
	Effort        string `json:"effort"`
	Status        string `json:"status"`
	Score
	Ceiling float64 `json:"ceiling"`
	Gap     float64 `json:"gap"` // (ceiling - coverage) / ceiling
	// Expected bounds the mean coverage of every way of acting under the expected
	// weather; only plans for it have it.
	Expected   float64            `json:"expected_ceiling,omitempty"`
	Replan     *Replan            `json:"replan,omitempty"`
	Hours      Hours              `json:"hours"`
	Programs   []ProgramSummary   `json:"programs"`
	Sites      []SiteSummary      `json:"sites"`
	Telescopes []TelescopeSummary `json:"telescopes"`
	GapParts   []GapPart          `json:"gap_parts,omitempty"` // they sum to ceiling - coverage
	Search     []Counter          `json:"search"`              // what the search counted
	Files      []FileSum          `json:"survey_files"`
	Tables     []TableSum         `json:"tables"`
	// Checksum is the SHA-256 of this file with an empty checksum.
	Checksum string `json:"checksum"`
}

// Score is what a plan earns.
type Score struct {
	Coverage       float64 `json:"coverage"` // C, 0..1
	VisitsGot      int64   `json:"visits_got"`
	VisitsWanted   int64   `json:"visits_wanted"`
	FieldsFinished int64   `json:"fields_finished"`
	FieldsWanted   int64   `json:"fields_wanted"`
}

// Replan says how a plan came out of an earlier one. Visits are counted by what
// happened to them; sets count once.
type Replan struct {
	Now           string  `json:"now"` // UTC: nothing is planned before
	HoldHours     float64 `json:"hold_hours"`
	Stability     float64 `json:"stability"`
	From          string  `json:"from_sha256"`     // of the earlier plan's plan.json
	CeilingHeld   float64 `json:"ceiling_held"`    // of all plans that keep the hold too
	Before        float64 `json:"coverage_before"` // of what was done and what could stay
	VisitsDone    int     `json:"visits_done"`
	VisitsHeld    int     `json:"visits_held"`
	VisitsKept    int     `json:"visits_kept"`
	VisitsLost    int     `json:"visits_lost"`
	VisitsMoved   int     `json:"visits_moved"`   // to another telescope or night
	VisitsDropped int     `json:"visits_dropped"` // they made room
	VisitsNew     int     `json:"visits_new"`
	CreditLost    float64 `json:"credit_lost"` // coverage that the lost visits were worth
	CreditWon     float64 `json:"credit_won"`  // coverage won back
}

// Hours is time of telescopes, h.
type Hours struct {
	Dark     float64 `json:"dark"` // Sun below -18 deg
	Open     float64 `json:"open"`
	Used     float64 `json:"used"`     // exposures and the gaps they need
	Exposure float64 `json:"exposure"` // exposures alone
}

func (h *Hours) add(r *NightRow) {
	h.Dark += r.DarkHours
	h.Open += r.OpenHours
	h.Used += r.UsedHours
	h.Exposure += r.ExposureHours
}

// ProgramSummary is one program's outcome. Its coverage is that of a survey
// which had this program alone.
type ProgramSummary struct {
	Program string  `json:"program"`
	Weight  float64 `json:"weight"`
	Score
	ExposureHours float64 `json:"exposure_hours"`
	Share         float64 `json:"share"` // of all exposure time, 0..1
	ShareMin      float64 `json:"share_min"`
	ShareMax      float64 `json:"share_max"`
	ShareBreach   float64 `json:"share_breach"` // 0 when the bounds hold to within one visit
	ShareWhy      string  `json:"share_why"`
}

// SiteSummary is one site's outcome; a set counts as one visit.
type SiteSummary struct {
	Site   string `json:"site"`
	Visits int64  `json:"visits"`
	Hours  Hours  `json:"hours"`
}

// TelescopeSummary is one telescope's outcome.
type TelescopeSummary struct {
	Telescope string `json:"telescope"`
	Site      string `json:"site"`
	Visits    int64  `json:"visits"`
	Hours     Hours  `json:"hours"`
}

// GapPart is one part of what lies between the ceiling and the plan: slews,
// filter_changes, idle, moment (better moments of the visits' own nights), choice
// (nights and fields, the search, and how far the ceiling is too high).
type GapPart struct {
	Name     string  `json:"name"`
	Coverage float64 `json:"coverage"`
}

// Counter is one named count.
type Counter struct {
	Name  string `json:"name"`
	Value int64  `json:"value"`
}

// FileSum identifies a file of the survey.
type FileSum struct {
	Name   string `json:"name"` // relative to the survey folder, with slashes
	Bytes  int64  `json:"bytes"`
	SHA256 string `json:"sha256"` // lower-case hexadecimal
}

// TableSum identifies a table of the plan folder.
type TableSum struct {
	Name   string `json:"name"` // file name
	Rows   int64  `json:"rows"`
	Bytes  int64  `json:"bytes"`
	SHA256 string `json:"sha256"`
}

// SummaryKind marks a plan folder's plan.json.
const SummaryKind = "nightwright plan"

// Encode returns the text of plan.json, with its checksum set. Numbers stand
// in the shortest form that reads back as the same float64.
func (s Summary) Encode() ([]byte, error) {
	s.SchemaVersion, s.Kind, s.Checksum = SchemaVersion, SummaryKind, ""
	text, err := s.text()
	if err != nil {
		return nil, err
	}
	s.Checksum = hexSum(text)
	return s.text()
}

func (s *Summary) text() ([]byte, error) {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	if err := e.Encode(s); err != nil {
		return nil, fmt.Errorf("plan.json: %w", err)
	}
	return b.Bytes(), nil
}

// DecodeSummary reads plan.json, and refuses any text that Encode doesn't
// give: unknown or missing names, another order, a changed byte. name stands
// in errors.
func DecodeSummary(name string, text []byte) (*Summary, error) {
	var head struct {
		SchemaVersion string `json:"schema_version"`
		Kind          string `json:"kind"`
	}
	if err := json.Unmarshal(text, &head); err != nil {
		return nil, fmt.Errorf("%s: it is no JSON (%w); want a plan's summary", name, err)
	}
	if head.Kind != SummaryKind {
		return nil, fmt.Errorf("%s: its kind is %q; want %q", name, head.Kind, SummaryKind)
	}
	if head.SchemaVersion != SchemaVersion {
		return nil, fmt.Errorf("%s: its schema_version is %q; want %q, as this version of the program writes", name, head.SchemaVersion, SchemaVersion)
	}
	s := new(Summary)
	d := json.NewDecoder(bytes.NewReader(text))
	d.DisallowUnknownFields()
	if err := d.Decode(s); err != nil {
		return nil, fmt.Errorf("%s: %w; want the summary as it was written", name, err)
	}
	if _, err := d.Token(); !errors.Is(err, io.EOF) {
		return nil, fmt.Errorf("%s: something follows the summary; want the file as it was written", name)
	}
	again, err := s.Encode()
	if err != nil {
		return nil, fmt.Errorf("%s: %w", name, err)
	}
	if !bytes.Equal(again, text) {
		return nil, fmt.Errorf("%s: it was changed since it was written, or a name is missing; want the file as it was written", name)
	}
	return s, nil
}

func hexSum(data []byte) string {
	sum := sha256.Sum256(data)
	return hex.EncodeToString(sum[:])
}
