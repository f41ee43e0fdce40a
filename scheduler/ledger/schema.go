package ledger

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"strconv"
)

// SchemaVersion is the newest form of the file that this package knows; it
// writes no other. It is the number of steps below.
const SchemaVersion = 2

// applicationID marks the file's header as a ledger: "NWLG" in ASCII.
const applicationID = 0x4e574c47

// steps lead from an empty file to version 1, from 1 to 2, and so on. A new
// ledger takes all of them, an old one those it lacks; a step that was
// published is never changed.
var steps = [SchemaVersion]string{
	// Version 1: exposures and losses. Names stand once, so that millions of
	// exposures stay small.
	`
CREATE TABLE about (
  key   TEXT PRIMARY KEY,
  value TEXT NOT NULL
) WITHOUT ROWID;
CREATE TABLE entries (                -- one a command that wrote
  entry     INTEGER PRIMARY KEY,
  kind      TEXT    NOT NULL CHECK (kind IN ('record', 'lose', 'plan')),
  made_utc  INTEGER NOT NULL,         -- Unix microseconds
  source    TEXT    NOT NULL,         -- file as it was named
  sha256    TEXT    NOT NULL,         -- of the file; '' without one
  program   TEXT    NOT NULL          -- version that wrote
);
CREATE TABLE names (
  id   INTEGER PRIMARY KEY,
  name TEXT    NOT NULL UNIQUE
);
CREATE TABLE exposures (
  id        INTEGER PRIMARY KEY,
  entry     INTEGER NOT NULL REFERENCES entries,
  row       INTEGER NOT NULL,         -- line of the source
  what      TEXT    NOT NULL CHECK (what IN ('done', 'correct', 'withdraw')),
  replaces  INTEGER REFERENCES exposures,
  telescope INTEGER NOT NULL REFERENCES names,
  start_utc INTEGER NOT NULL,         -- Unix microseconds
  end_utc   INTEGER NOT NULL CHECK (end_utc > start_utc),
  night     INTEGER NOT NULL,         -- label, days since 1970-01-01
  site      INTEGER NOT NULL REFERENCES names,
  field     INTEGER NOT NULL REFERENCES names,
  program   INTEGER NOT NULL REFERENCES names,
  demand    INTEGER NOT NULL REFERENCES names,
  filter    INTEGER NOT NULL REFERENCES names,
  quality   REAL    CHECK (quality BETWEEN 0 AND 1), -- the telescope's own, or null
  set_id    INTEGER,                  -- of the plan, or null
  visit     INTEGER,                  -- of the plan, or null
  unmatched TEXT    NOT NULL,         -- why it counts for no demand; '' when it does
  why       TEXT    NOT NULL
);
CREATE INDEX exposures_key ON exposures (telescope, start_utc);
CREATE INDEX exposures_field ON exposures (field, start_utc);
CREATE UNIQUE INDEX exposures_replaces ON exposures (replaces) WHERE replaces IS NOT NULL;
CREATE TABLE losses (
  id        INTEGER PRIMARY KEY,
  entry     INTEGER NOT NULL REFERENCES entries,
  row       INTEGER NOT NULL,         -- line of the source; 0 without one
  what      TEXT    NOT NULL CHECK (what IN ('lost', 'regained')),
  site      INTEGER NOT NULL REFERENCES names,
  telescope INTEGER REFERENCES names, -- null: all of the site
  start_utc INTEGER NOT NULL,
  end_utc   INTEGER NOT NULL CHECK (end_utc > start_utc),
  cause     TEXT    NOT NULL CHECK (cause IN ('weather', 'technical', 'people', 'other') OR (cause = '' AND what = 'regained')),
  why       TEXT    NOT NULL
);
CREATE TRIGGER entries_stay    BEFORE DELETE ON entries   BEGIN SELECT RAISE(ABORT, 'nothing in a ledger is deleted'); END;
CREATE TRIGGER names_stay      BEFORE DELETE ON names     BEGIN SELECT RAISE(ABORT, 'nothing in a ledger is deleted'); END;
CREATE TRIGGER exposures_stay  BEFORE DELETE ON exposures BEGIN SELECT RAISE(ABORT, 'nothing in a ledger is deleted'); END;
CREATE TRIGGER losses_stay     BEFORE DELETE ON losses    BEGIN SELECT RAISE(ABORT, 'nothing in a ledger is deleted'); END;
CREATE TRIGGER entries_hold    BEFORE UPDATE ON entries   BEGIN SELECT RAISE(ABORT, 'nothing in a ledger is changed; record a correction'); END;
CREATE TRIGGER names_hold      BEFORE UPDATE ON names     BEGIN SELECT RAISE(ABORT, 'nothing in a ledger is changed; record a correction'); END;
CREATE TRIGGER exposures_hold  BEFORE UPDATE ON exposures BEGIN SELECT RAISE(ABORT, 'nothing in a ledger is changed; record a correction'); END;
CREATE TRIGGER losses_hold     BEFORE UPDATE ON losses    BEGIN SELECT RAISE(ABORT, 'nothing in a ledger is changed; record a correction'); END;
CREATE VIEW done AS                   -- what holds now, for people who look in with other programs
  SELECT e.id, f.name AS field, p.name AS program, d.name AS demand, b.name AS filter, s.name AS site, t.name AS telescope,
         date(e.night * 86400, 'unixepoch') AS night,
         strftime('%Y-%m-%dT%H:%M:%fZ', e.start_utc / 1e6, 'unixepoch') AS start_utc,
         strftime('%Y-%m-%dT%H:%M:%fZ', e.end_utc / 1e6, 'unixepoch') AS end_utc,
         e.quality, e.set_id AS "set", e.visit, e.unmatched, n.source, e.row
  FROM exposures e JOIN entries n ON n.entry = e.entry
  JOIN names f ON f.id = e.field JOIN names p ON p.id = e.program JOIN names d ON d.id = e.demand
  JOIN names b ON b.id = e.filter JOIN names s ON s.id = e.site JOIN names t ON t.id = e.telescope
  WHERE e.what <> 'withdraw' AND NOT EXISTS (SELECT 1 FROM exposures r WHERE r.replaces = e.id);
`,
	// Version 2: the plans made, each with the last entry that it knew of.
	`
CREATE TABLE plans (
  id       INTEGER PRIMARY KEY,
  entry    INTEGER NOT NULL REFERENCES entries,
  sha256   TEXT    NOT NULL,          -- of plan.json
  path     TEXT    NOT NULL,          -- of the folder, from the survey's where it lies within
  coverage REAL    NOT NULL,
  ceiling  REAL    NOT NULL,
  made_for TEXT    NOT NULL,          -- sha256 over the survey's files
  knew     INTEGER NOT NULL           -- the last entry it took into account; 0: none
);
CREATE INDEX plans_sha256 ON plans (sha256);
CREATE TRIGGER plans_stay BEFORE DELETE ON plans BEGIN SELECT RAISE(ABORT, 'nothing in a ledger is deleted'); END;
CREATE TRIGGER plans_hold BEFORE UPDATE ON plans BEGIN SELECT RAISE(ABORT, 'nothing in a ledger is changed; record a correction'); END;
`,
}

// asker is what reads: a connection, or a transaction on it.
type asker interface {
	QueryContext(ctx context.Context, query string, args ...any) (*sql.Rows, error)
	QueryRowContext(ctx context.Context, query string, args ...any) *sql.Row
}

// version finds out which form a file has; 0 is an empty file. It errs when it
// is no ledger, or a newer one.
func (l *Ledger) version(ctx context.Context, q asker) (int, error) {
	var id, objects int
	if err := q.QueryRowContext(ctx, "PRAGMA application_id").Scan(&id); err != nil {
		return 0, l.explain(err)
	}
	if err := q.QueryRowContext(ctx, "SELECT count(*) FROM sqlite_schema").Scan(&objects); err != nil {
		return 0, l.explain(err)
	}
	if id == 0 && objects == 0 {
		return 0, nil
	}
	if id != applicationID {
		return 0, &FileError{l.path, "it is a database, but no ledger", "want the ledger.db that this program wrote"}
	}
	about := map[string]string{}
	rows, err := q.QueryContext(ctx, "SELECT key, value FROM about")
	if err != nil {
		return 0, l.explain(err)
	}
	defer rows.Close()
	for rows.Next() {
		var key, value string
		if err := rows.Scan(&key, &value); err != nil {
			return 0, l.explain(err)
		}
		about[key] = value
	}
	if err := rows.Err(); err != nil {
		return 0, l.explain(err)
	}
	version, err := strconv.Atoi(about["schema_version"])
	if err != nil || version < 1 {
		return 0, &FileError{l.path, fmt.Sprintf("its schema_version is %q", about["schema_version"]), "want a ledger as it was written"}
	}
	if version > SchemaVersion {
		return 0, &FileError{
			l.path, fmt.Sprintf("it was written by nightwright %s and has schema_version %d, newer than the %d that this version knows", about["written_by"], version, SchemaVersion),
			"want nightwright " + about["written_by"] + " or later",
		}
	}
	return version, nil
}

// migrate brings a file to the present form, inside the transaction that is
// about to write.
func (l *Ledger) migrate(ctx context.Context, tx *sql.Tx, program string) error {
	from, err := l.version(ctx, tx)
	if err != nil {
		return err
	}
	if from == SchemaVersion {
		return nil
	}
	for _, step := range steps[from:] {
		if _, err := tx.ExecContext(ctx, step); err != nil {
			return l.explain(err)
		}
	}
	if from == 0 {
		if _, err := tx.ExecContext(ctx, "PRAGMA application_id = "+strconv.Itoa(applicationID)); err != nil {
			return l.explain(err)
		}
	}
	const set = "INSERT INTO about (key, value) VALUES (?, ?) ON CONFLICT (key) DO UPDATE SET value = excluded.value"
	_, err1 := tx.ExecContext(ctx, set, "schema_version", strconv.Itoa(SchemaVersion))
	_, err2 := tx.ExecContext(ctx, set, "written_by", program)
	return l.explain(errors.Join(err1, err2))
}
