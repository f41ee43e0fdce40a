package ledger

import (
	"context"
	"database/sql"
	"math"
)

// writer puts rows into the tables, names first.
type writer struct {
	ctx         context.Context
	find, name  *sql.Stmt
	shot, stray *sql.Stmt
	ids         map[string]int64
}

const (
	sqlName = "INSERT INTO names (name) VALUES (?)"
	sqlFind = "SELECT id FROM names WHERE name = ?"
	sqlShot = `INSERT INTO exposures (entry, row, what, replaces, telescope, start_utc, end_utc, night, site, field, program, demand, filter, quality, set_id, visit, unmatched, why)
VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)`
	sqlLoss = "INSERT INTO losses (entry, row, what, site, telescope, start_utc, end_utc, cause, why) VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?)"
)

// write puts a recording into the ledger.
func (c *recording) write(ctx context.Context, tx *sql.Tx, kind string, e Entry) error {
	entry, err := c.l.enter(ctx, tx, kind, e)
	if err != nil {
		return c.l.explain(err)
	}
	c.Entry = entry
	w := &writer{ctx: ctx, ids: map[string]int64{}}
	for _, s := range []struct {
		to   **sql.Stmt
		text string
	}{{&w.find, sqlFind}, {&w.name, sqlName}, {&w.shot, sqlShot}, {&w.stray, sqlLoss}} {
		if *s.to, err = tx.PrepareContext(ctx, s.text); err != nil {
			return c.l.explain(err)
		}
		defer (*s.to).Close()
	}
	for _, r := range c.new {
		if r.before != nil {
			r.replaces = r.before.ID
		}
		if err := w.exposure(entry, r); err != nil {
			return c.l.explain(err)
		}
	}
	for _, l := range c.gone {
		if err := w.loss(entry, l); err != nil {
			return c.l.explain(err)
		}
	}
	return nil
}

// id returns the number of a name, making it where it is new.
func (w *writer) id(name string) (int64, error) {
	if id, ok := w.ids[name]; ok {
		return id, nil
	}
	var id int64
	err := w.find.QueryRowContext(w.ctx, name).Scan(&id)
	if err == sql.ErrNoRows {
		var r sql.Result
		if r, err = w.name.ExecContext(w.ctx, name); err == nil {
			id, err = r.LastInsertId()
		}
	}
	if err != nil {
		return 0, err
	}
	w.ids[name] = id
	return id, nil
}

func (w *writer) exposure(entry int64, r *record) error {
	var ids [6]int64
	for i, n := range []string{r.Telescope, r.Site, r.Field, r.Program, r.Demand, r.Filter} {
		var err error
		if ids[i], err = w.id(n); err != nil {
			return err
		}
	}
	quality := any(r.Quality)
	if math.IsNaN(r.Quality) {
		quality = nil
	}
	res, err := w.shot.ExecContext(w.ctx, entry, r.Row, string(r.what), orNull(r.replaces), ids[0], r.Start, r.End, int64(r.Night),
		ids[1], ids[2], ids[3], ids[4], ids[5], quality, orNull(r.Set), orNull(r.Visit), r.Unmatched, r.why)
	if err != nil {
		return err
	}
	r.ID, err = res.LastInsertId()
	return err
}

func (w *writer) loss(entry int64, l *Loss) error {
	site, err := w.id(l.Site)
	if err != nil {
		return err
	}
	telescope := int64(0)
	if l.Telescope != "" {
		if telescope, err = w.id(l.Telescope); err != nil {
			return err
		}
	}
	_, err = w.stray.ExecContext(w.ctx, entry, l.Row, string(l.What), site, orNull(telescope), l.Start, l.End, l.Cause, l.Why)
	return err
}

// orNull turns 0, which stands for none, into null.
func orNull(n int64) any {
	if n == 0 {
		return nil
	}
	return n
}

const selectShots = `SELECT e.id, n.source, e.row, e.what, e.replaces, e.start_utc, e.end_utc, e.night, e.quality, e.set_id, e.visit, e.unmatched, e.why,
 f.name, p.name, d.name, b.name, s.name, t.name, EXISTS (SELECT 1 FROM exposures r WHERE r.replaces = e.id)
FROM exposures e JOIN entries n ON n.entry = e.entry
JOIN names f ON f.id = e.field JOIN names p ON p.id = e.program JOIN names d ON d.id = e.demand
JOIN names b ON b.id = e.filter JOIN names s ON s.id = e.site JOIN names t ON t.id = e.telescope
WHERE `

// records reads records of the history by id, replaced and withdrawn ones
// among them.
func (l *Ledger) records(ctx context.Context, q asker, where string, args ...any) ([]*record, error) {
	rows, err := q.QueryContext(ctx, selectShots+where+" ORDER BY e.id", args...)
	if err != nil {
		return nil, l.explain(err)
	}
	defer rows.Close()
	var out []*record
	for rows.Next() {
		r := &record{}
		var what string
		var quality sql.NullFloat64
		var replaces, set, visit sql.NullInt64
		if err := rows.Scan(&r.ID, &r.Source, &r.Row, &what, &replaces, &r.Start, &r.End, &r.Night, &quality, &set, &visit, &r.Unmatched, &r.why,
			&r.Field, &r.Program, &r.Demand, &r.Filter, &r.Site, &r.Telescope, &r.replaced); err != nil {
			return nil, l.explain(err)
		}
		r.what, r.replaces, r.Set, r.Visit, r.Quality = What(what), replaces.Int64, set.Int64, visit.Int64, math.NaN()
		if quality.Valid {
			r.Quality = quality.Float64
		}
		out = append(out, r)
	}
	return out, l.explain(rows.Err())
}

// losses reads the rows about time up to an entry, in their order.
func (l *Ledger) losses(ctx context.Context, q asker, upTo int64) ([]Loss, error) {
	rows, err := q.QueryContext(ctx, `SELECT x.entry, n.source, x.row, x.what, s.name, coalesce(t.name, ''), x.start_utc, x.end_utc, x.cause, x.why
FROM losses x JOIN entries n ON n.entry = x.entry JOIN names s ON s.id = x.site LEFT JOIN names t ON t.id = x.telescope
WHERE x.entry <= ? ORDER BY x.id`, upTo)
	if err != nil {
		return nil, l.explain(err)
	}
	defer rows.Close()
	var out []Loss
	for rows.Next() {
		var x Loss
		var what string
		if err := rows.Scan(&x.Entry, &x.Source, &x.Row, &what, &x.Site, &x.Telescope, &x.Start, &x.End, &x.Cause, &x.Why); err != nil {
			return nil, l.explain(err)
		}
		x.What = What(what)
		out = append(out, x)
	}
	return out, l.explain(rows.Err())
}
