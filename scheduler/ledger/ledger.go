package ledger

import (
	"context"
	"database/sql"
	"errors"
	"fmt"
	"io/fs"
	"net/url"
	"os"
	"path/filepath"
	"strings"
	"time"

	"modernc.org/sqlite"
	sqlite3 "modernc.org/sqlite/lib"
)

// FileName is the ledger's name in a survey folder.
const FileName = "ledger.db"

// Wait is how long a writer waits for another one before it gives up.
const Wait = 15 * time.Second

// Ledger is an open ledger. Its methods may be called from several goroutines;
// they take turns.
type Ledger struct {
	path  string
	db    *sql.DB // nil: the file isn't there yet; it is an empty ledger
	write bool
	form  int // schema version found when it was opened; 0: empty
}

// FileError says what is wrong with the ledger's file, and what would be right.
type FileError struct{ Path, What, Want string }

// Error is "path: what is wrong; what would be right".
func (e *FileError) Error() string { return e.Path + ": " + e.What + "; " + e.Want }

// ErrBusy is in the chain of errors of a writer that waited in vain for
// another one.
var ErrBusy = errors.New("another program is writing the ledger")

// Open opens a ledger to read it. A file that isn't there is an empty ledger,
// and isn't made. A ledger of another kind or of a newer version is a
// *FileError.
//
// Where a process was killed amid its writing, opening first takes back what
// that one had begun; only this needs a folder that can be written to.
func Open(path string) (*Ledger, error) { return open(path, "rw") }

// OpenWriter opens a ledger to read and to write it. The file is made with the
// first entry. Errors are as those of Open.
func OpenWriter(path string) (*Ledger, error) { return open(path, "rwc") }

func open(path, mode string) (*Ledger, error) {
	l := &Ledger{path: path, write: mode == "rwc"}
	info, err := os.Stat(path)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		if !l.write {
			return l, nil
		}
		if info, err := os.Stat(filepath.Dir(path)); err != nil || !info.IsDir() {
			return nil, &FileError{path, "its folder isn't there", "want a survey folder"}
		}
	case err != nil:
		return nil, err
	case !info.Mode().IsRegular():
		return nil, &FileError{path, "it is no file", "want the ledger that this program wrote"}
	}
	abs, err := filepath.Abs(path)
	if err != nil {
		return nil, err
	}
	q := url.Values{"mode": {mode}, "_txlock": {"immediate"}, "_pragma": {
		fmt.Sprintf("busy_timeout(%d)", Wait.Milliseconds()), "foreign_keys(1)", "synchronous(FULL)", "trusted_schema(0)", "cell_size_check(1)",
	}}
	name := filepath.ToSlash(abs)
	if !strings.HasPrefix(name, "/") { // a drive letter
		name = "/" + name
	}
	db, err := sql.Open("sqlite", (&url.URL{Scheme: "file", Path: name, RawQuery: q.Encode()}).String())
	if err != nil {
		return nil, err
	}
	db.SetMaxOpenConns(1) // a writer and a reader of one process would wait for each other
	l.db = db
	if l.form, err = l.version(context.Background(), db); err != nil {
		return nil, errors.Join(err, db.Close())
	}
	return l, nil
}

// Close closes the file.
func (l *Ledger) Close() error {
	if l.db == nil {
		return nil
	}
	return l.db.Close()
}

// Path is the file as it was named.
func (l *Ledger) Path() string { return l.path }

// explain turns SQLite's words into what the user can do about it.
func (l *Ledger) explain(err error) error {
	var e *sqlite.Error
	if !errors.As(err, &e) {
		return err
	}
	code := e.Code() & 0xff
	if !l.write && (code == sqlite3.SQLITE_READONLY || code == sqlite3.SQLITE_CANTOPEN) {
		return fmt.Errorf("%s: it can't be read here: a write to it was cut off and must be taken back first; let 'nightwright ledger' read it once where its folder can be written to", l.path)
	}
	switch code {
	case sqlite3.SQLITE_BUSY, sqlite3.SQLITE_LOCKED:
		return fmt.Errorf("%s: %w; it was waited for %v and nothing was written; try again when that one is done", l.path, ErrBusy, Wait)
	case sqlite3.SQLITE_FULL:
		return fmt.Errorf("%s: the disk is full; nothing was written, what stood before still stands; make room and try again", l.path)
	case sqlite3.SQLITE_READONLY:
		return fmt.Errorf("%s: the file or its folder is read-only; nothing was written; want a folder that can be written to", l.path)
	case sqlite3.SQLITE_CANTOPEN:
		return fmt.Errorf("%s: it can't be opened to write; want a folder that can be written to", l.path)
	case sqlite3.SQLITE_NOTADB, sqlite3.SQLITE_CORRUPT:
		return &FileError{l.path, fmt.Sprintf("it is damaged, or no ledger (%s)", e.Error()), "want the file as it was written; bring it back from a copy"}
	case sqlite3.SQLITE_IOERR:
		return fmt.Errorf("%s: the disk failed (%w); nothing was written", l.path, err)
	}
	return fmt.Errorf("%s: %w", l.path, err)
}

// Entry says who writes: it stands with everything that is written.
type Entry struct {
	Made    time.Time // when
	Source  string    // the file it comes from; "" without one
	SHA256  string    // of that file; "" without one
	Program string    // version of the program
}

// write runs f in one transaction that sees and holds the whole ledger. What f
// returns decides: an error leaves everything as it was.
func (l *Ledger) change(ctx context.Context, program string, f func(tx *sql.Tx) error) error {
	if !l.write {
		return fmt.Errorf("ledger: %s was opened to read only", l.path)
	}
	tx, err := l.db.BeginTx(ctx, nil) // takes the writer's lock at once (_txlock)
	if err != nil {
		return l.explain(err)
	}
	defer tx.Rollback() // of no effect after the commit
	if err := l.migrate(ctx, tx, program); err != nil {
		return err
	}
	if err := f(tx); err != nil {
		return err
	}
	if err := tx.Commit(); err != nil {
		return l.explain(err)
	}
	l.form = SchemaVersion
	return nil
}

// enter makes an entry and returns its number.
func (l *Ledger) enter(ctx context.Context, tx *sql.Tx, kind string, e Entry) (int64, error) {
	r, err := tx.ExecContext(ctx, "INSERT INTO entries (kind, made_utc, source, sha256, program) VALUES (?, ?, ?, ?, ?)",
		kind, e.Made.UnixMicro(), e.Source, e.SHA256, e.Program)
	if err != nil {
		return 0, l.explain(err)
	}
	return r.LastInsertId()
}

// empty reports whether there is nothing to read.
func (l *Ledger) empty() bool { return l.form == 0 }

// Last returns the number of the last entry; 0: the ledger is empty. Entries
// are numbered from 1 in the order in which they were made, and none is ever
// taken away, so the number says what the ledger held.
func (l *Ledger) Last(ctx context.Context) (int64, error) {
	if l.empty() {
		return 0, nil
	}
	var n sql.NullInt64
	err := l.db.QueryRowContext(ctx, "SELECT max(entry) FROM entries").Scan(&n)
	return n.Int64, l.explain(err)
}
