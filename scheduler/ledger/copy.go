package ledger

import (
	"context"
	"fmt"
)

// CopyTo writes the ledger as it stands now to a new file, which must not be
// there yet. Writers may go on meanwhile: the copy has all of an entry or none
// of it. A ledger without a file leaves none.
func (l *Ledger) CopyTo(ctx context.Context, path string) error {
	if l.db == nil || l.form == 0 {
		return nil
	}
	if _, err := l.db.ExecContext(ctx, `VACUUM INTO ?`, path); err != nil {
		return fmt.Errorf("copy to %s: %w", path, l.explain(err))
	}
	return nil
}
