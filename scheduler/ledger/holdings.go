package ledger

import (
	"cmp"
	"context"
	"database/sql"
	"fmt"
	"math"
	"slices"

	"nightwright/constraints/survey"
	"nightwright/visibility"
)

// Done returns every exposure that was done, as it holds now: corrected ones
// as corrected, withdrawn ones not at all, unmatched ones with their reason. They
// are ordered by start and telescope.
func (l *Ledger) Done(ctx context.Context) ([]Exposure, error) {
	return l.done(ctx, nil, Now)
}

// fewRows is up to how many exposures a ledger is read whole; a larger one is
// asked field by field.
const fewRows = 50_000

// DoneFor returns those exposures of Done that are of fields of the survey, as
// they stood after an entry (Now: as they stand now). Its time goes with their
// number, not with that of the whole ledger.
func (l *Ledger) DoneFor(ctx context.Context, sv *survey.Survey, upTo int64) ([]Exposure, error) {
	if l.empty() {
		return nil, nil
	}
	var n sql.NullInt64
	if err := l.db.QueryRowContext(ctx, "SELECT max(id) FROM exposures").Scan(&n); err != nil {
		return nil, l.explain(err)
	}
	if n.Int64 > fewRows {
		return l.done(ctx, sv, upTo)
	}
	fields := make(map[string]bool, len(sv.Fields))
	for i := range sv.Fields {
		fields[sv.Fields[i].Name] = true
	}
	all, err := l.done(ctx, nil, upTo)
	return slices.DeleteFunc(all, func(e Exposure) bool { return !fields[e.Field] }), err
}

const selectDone = `SELECT e.id, e.entry, e.row, e.field, e.program, e.demand, e.filter, e.site, e.telescope, e.night, e.start_utc, e.end_utc,
 e.quality, e.set_id, e.visit, e.unmatched FROM exposures e
WHERE e.entry <= ?1 AND e.what <> 'withdraw' AND NOT EXISTS (SELECT 1 FROM exposures r WHERE r.replaces = e.id AND r.entry <= ?1)`

// done reads all exposures up to an entry, or with a survey those of its fields.
func (l *Ledger) done(ctx context.Context, sv *survey.Survey, upTo int64) ([]Exposure, error) {
	if l.empty() {
		return nil, nil
	}
	// One transaction: what is read belongs together, whatever others write.
	tx, err := l.db.BeginTx(ctx, &sql.TxOptions{ReadOnly: true})
	if err != nil {
		return nil, l.explain(err)
	}
	defer tx.Rollback()
	names, err := l.table(ctx, tx, "SELECT id, name FROM names")
	if err != nil {
		return nil, err
	}
	sources, err := l.table(ctx, tx, "SELECT entry, source FROM entries")
	if err != nil {
		return nil, err
	}
	var out []Exposure
	if sv == nil {
		out, err = l.scan(ctx, tx, out, names, sources, selectDone, upTo)
	} else {
		ids := make(map[string]int64, len(names))
		for id, n := range names {
			ids[n] = id
		}
		var stmt *sql.Stmt
		if stmt, err = tx.PrepareContext(ctx, selectDone+" AND e.field = ?2"); err != nil {
			return nil, l.explain(err)
		}
		defer stmt.Close()
		for i := 0; i < len(sv.Fields) && err == nil; i++ {
			if id, ok := ids[sv.Fields[i].Name]; ok {
				out, err = l.scanWith(stmt.QueryContext, ctx, out, names, sources, upTo, id)
			}
		}
	}
	if err != nil {
		return nil, err
	}
	slices.SortFunc(out, func(a, b Exposure) int {
		return cmp.Or(cmp.Compare(a.Start, b.Start), cmp.Compare(a.Telescope, b.Telescope), cmp.Compare(a.ID, b.ID))
	})
	return out, nil
}

// table reads numbered texts.
func (l *Ledger) table(ctx context.Context, q asker, query string) (map[int64]string, error) {
	rows, err := q.QueryContext(ctx, query)
	if err != nil {
		return nil, l.explain(err)
	}
	defer rows.Close()
	out := map[int64]string{}
	for rows.Next() {
		var id int64
		var text string
		if err := rows.Scan(&id, &text); err != nil {
			return nil, l.explain(err)
		}
		out[id] = text
	}
	return out, l.explain(rows.Err())
}

func (l *Ledger) scan(ctx context.Context, q asker, out []Exposure, names, sources map[int64]string, query string, upTo int64) ([]Exposure, error) {
	return l.scanWith(func(ctx context.Context, args ...any) (*sql.Rows, error) { return q.QueryContext(ctx, query, args...) }, ctx, out, names, sources, upTo)
}

// scanWith appends the exposures of one query.
func (l *Ledger) scanWith(query func(context.Context, ...any) (*sql.Rows, error), ctx context.Context, out []Exposure, names, sources map[int64]string, args ...any) ([]Exposure, error) {
	rows, err := query(ctx, args...)
	if err != nil {
		return nil, l.explain(err)
	}
	defer rows.Close()
	var entry int64
	var field, program, demand, filter, site, telescope int64
	var quality sql.NullFloat64
	var set, visit sql.NullInt64
	for rows.Next() {
		var e Exposure
		if err := rows.Scan(&e.ID, &entry, &e.Row, &field, &program, &demand, &filter, &site, &telescope, &e.Night, &e.Start, &e.End,
			&quality, &set, &visit, &e.Unmatched); err != nil {
			return nil, l.explain(err)
		}
		e.Source, e.Set, e.Visit, e.Quality = sources[entry], set.Int64, visit.Int64, math.NaN()
		if quality.Valid {
			e.Quality = quality.Float64
		}
		e.Field, e.Program, e.Demand, e.Filter, e.Site, e.Telescope = names[field], names[program], names[demand], names[filter], names[site], names[telescope]
		out = append(out, e)
	}
	return out, l.explain(rows.Err())
}

// Now stands for the last entry, whichever it is.
const Now int64 = math.MaxInt64

// LossRows returns the rows about time up to an entry (Now: all), in the order
// in which they were made.
func (l *Ledger) LossRows(ctx context.Context, upTo int64) ([]Loss, error) {
	if l.empty() {
		return nil, nil
	}
	return l.losses(ctx, l.db, upTo)
}

// Losses returns the lost time of each telescope of a survey as it stood after
// an entry (Now: as it stands now), for constraints.NewCalendar: ascending and
// disjoint, UTC Unix seconds. nil: no time was lost.
func (l *Ledger) Losses(ctx context.Context, sv *survey.Survey, upTo int64) ([][]visibility.Interval, error) {
	rows, err := l.LossRows(ctx, upTo)
	if err != nil || len(rows) == 0 {
		return nil, err
	}
	return Intervals(LostTime(sv, rows)), nil
}

// PlanMade is a plan that was made.
type PlanMade struct {
	Entry    int64
	SHA256   string // of its plan.json
	Path     string // of its folder, from the survey's where it lies within
	Coverage float64
	Ceiling  float64
	MadeFor  string // sha256 over the survey's files
	Knew     int64  // the last entry that it took into account; 0: none
}

// AddPlan records a plan that was made.
func (l *Ledger) AddPlan(ctx context.Context, p PlanMade, e Entry) error {
	return l.change(ctx, e.Program, func(tx *sql.Tx) error {
		entry, err := l.enter(ctx, tx, "plan", e)
		if err != nil {
			return err
		}
		_, err = tx.ExecContext(ctx, "INSERT INTO plans (entry, sha256, path, coverage, ceiling, made_for, knew) VALUES (?, ?, ?, ?, ?, ?, ?)",
			entry, p.SHA256, p.Path, p.Coverage, p.Ceiling, p.MadeFor, p.Knew)
		return l.explain(err)
	})
}

// Plans returns the plans made, in their order.
func (l *Ledger) Plans(ctx context.Context) ([]PlanMade, error) {
	if l.form < 2 { // older files have no plans
		return nil, nil
	}
	rows, err := l.db.QueryContext(ctx, "SELECT entry, sha256, path, coverage, ceiling, made_for, knew FROM plans ORDER BY id")
	if err != nil {
		return nil, l.explain(err)
	}
	defer rows.Close()
	var out []PlanMade
	for rows.Next() {
		var p PlanMade
		if err := rows.Scan(&p.Entry, &p.SHA256, &p.Path, &p.Coverage, &p.Ceiling, &p.MadeFor, &p.Knew); err != nil {
			return nil, l.explain(err)
		}
		out = append(out, p)
	}
	return out, l.explain(rows.Err())
}

// Check asks SQLite whether the file is sound, foreign keys included. It reads
// all of it.
func (l *Ledger) Check(ctx context.Context) error {
	if l.empty() {
		return nil
	}
	var said string
	if err := l.db.QueryRowContext(ctx, "PRAGMA integrity_check(1)").Scan(&said); err != nil {
		return l.explain(err)
	}
	if said != "ok" {
		return &FileError{l.path, "it is damaged: " + said, "want the file as it was written; bring it back from a copy"}
	}
	var table string
	err := l.db.QueryRowContext(ctx, "SELECT \"table\" FROM pragma_foreign_key_check LIMIT 1").Scan(&table)
	if err == sql.ErrNoRows {
		return nil
	}
	if err != nil {
		return l.explain(err)
	}
	return &FileError{l.path, fmt.Sprintf("rows of its table %s point at rows that aren't there", table), "want the file as it was written; bring it back from a copy"}
}
