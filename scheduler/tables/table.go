package tables

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"io"
	"os"
	"slices"

	"github.com/google/renameio/v2"
	"github.com/parquet-go/parquet-go"
	"github.com/parquet-go/parquet-go/compress/zstd"
)

// Table is one kind of table: its name (the file's, without the suffix) and
// the order of its rows. T is a row type of this package.
type Table[T any] struct {
	Name    string
	Order   []string // columns that Less compares, in turn
	Compare func(a, b *T) int
}

// versionKey is the metadata key of SchemaVersion.
const versionKey = "schema_version"

// Sort puts rows into the table's order; rows that compare equal keep theirs.
func (t Table[T]) Sort(rows []T) {
	slices.SortStableFunc(rows, func(a, b T) int { return t.Compare(&a, &b) })
}

func (t Table[T]) sorted(rows []T) []T {
	if slices.IsSortedFunc(rows, func(a, b T) int { return t.Compare(&a, &b) }) {
		return rows
	}
	rows = slices.Clone(rows)
	t.Sort(rows)
	return rows
}

// Write writes the rows as Parquet, in the table's order: zstd, the schema's
// version as metadata, and nothing that depends on when or where.
func (t Table[T]) Write(w io.Writer, rows []T) error {
	order := make([]parquet.SortingColumn, len(t.Order))
	for i, c := range t.Order {
		order[i] = parquet.Ascending(c)
	}
	pw := parquet.NewGenericWriter[T](w,
		parquet.NewSchema(t.Name, parquet.SchemaOf(new(T))),
		parquet.Compression(&zstd.Codec{Level: zstd.SpeedDefault, Concurrency: 1}),
		parquet.KeyValueMetadata(versionKey, SchemaVersion),
		parquet.CreatedBy("nightwright", SchemaVersion, ""),
		parquet.MaxRowsPerRowGroup(rowsPerGroup),
		parquet.SortingWriterConfig(parquet.SortingColumns(order...)),
	)
	for rows := t.sorted(rows); len(rows) > 0; {
		n := min(len(rows), writeChunk)
		if _, err := pw.Write(rows[:n]); err != nil {
			return fmt.Errorf("%s: %w", t.Name, err)
		}
		rows = rows[n:]
	}
	if err := pw.Close(); err != nil {
		return fmt.Errorf("%s: %w", t.Name, err)
	}
	return nil
}

const (
	rowsPerGroup = 1 << 20
	writeChunk   = 4096
)

// Encode returns what Write writes.
func (t Table[T]) Encode(rows []T) ([]byte, error) {
	var b bytes.Buffer
	if err := t.Write(&b, rows); err != nil {
		return nil, err
	}
	return b.Bytes(), nil
}

// WriteFile writes the rows as a Parquet file; until it is whole, what stood
// at path before stays.
func (t Table[T]) WriteFile(path string, rows []T) error {
	data, err := t.Encode(rows)
	if err != nil {
		return err
	}
	return renameio.WriteFile(path, data, 0o644)
}

// Decode reads a Parquet table of exactly this schema. name stands in errors.
// Damaged bytes give an error or, where they hit a value alone, other values:
// whoever needs certainty compares a checksum first, as ReadFolder does.
func (t Table[T]) Decode(name string, data []byte) (rows []T, err error) {
	defer recoverDamage(name, &err)
	f, err := openParquet(name, bytes.NewReader(data), int64(len(data)))
	if err != nil {
		return nil, err
	}
	if err := checkSchema(name, f, parquet.SchemaOf(new(T))); err != nil {
		return nil, err
	}
	n := f.NumRows()
	if n < 0 || n > int64(len(data))*maxRowsPerByte {
		return nil, fmt.Errorf("%s: it claims %d rows in %d bytes; want a whole file", name, n, len(data))
	}
	rows, err = readRows[T](f, int(n))
	if err != nil {
		return nil, damaged(name, err)
	}
	return rows, nil
}

// maxRowsPerByte bounds what a file may claim: constant columns compress to
// next to nothing.
const maxRowsPerByte = 1 << 12

// ReadFile is Decode on a file.
func (t Table[T]) ReadFile(path string) ([]T, error) {
	data, err := os.ReadFile(path)
	if err != nil {
		return nil, err
	}
	return t.Decode(path, data)
}

// openParquet opens a Parquet file of any schema.
func openParquet(name string, r io.ReaderAt, size int64) (*parquet.File, error) {
	if err := checkFrame(r, size); err != nil {
		return nil, fmt.Errorf("%s: it can't be read as Parquet (%w); want a whole Parquet file", name, err)
	}
	f, err := parquet.OpenFile(r, size, parquet.SkipPageIndex(true), parquet.SkipBloomFilters(true))
	if err != nil {
		return nil, fmt.Errorf("%s: it can't be read as Parquet (%w); want a whole Parquet file", name, err)
	}
	return f, nil
}

// checkFrame looks at the marks at both ends of a Parquet file and at the
// length of its footer, which the library would take at its word.
func checkFrame(r io.ReaderAt, size int64) error {
	const mark = "PAR1"
	if size < 12 {
		return fmt.Errorf("%d bytes are too few", size)
	}
	var head [4]byte
	var tail [8]byte
	if _, err := r.ReadAt(head[:], 0); err != nil {
		return err
	}
	if _, err := r.ReadAt(tail[:], size-8); err != nil && err != io.EOF {
		return err
	}
	if string(head[:]) != mark || string(tail[4:]) != mark {
		return fmt.Errorf("the mark %s is missing at an end", mark)
	}
	if footer := int64(binary.LittleEndian.Uint32(tail[:4])); footer > size-12 {
		return fmt.Errorf("its footer would have %d bytes", footer)
	}
	return nil
}

// checkSchema compares a file column by column with what is wanted.
func checkSchema(name string, f *parquet.File, want *parquet.Schema) error {
	if v, ok := f.Lookup(versionKey); !ok || v != SchemaVersion {
		if !ok {
			return fmt.Errorf("%s: it has no %s; want a table that this program wrote", name, versionKey)
		}
		return fmt.Errorf("%s: its %s is %q; want %q, as this version of the program writes", name, versionKey, v, SchemaVersion)
	}
	got, wanted := f.Schema().Fields(), want.Fields()
	for i, w := range wanted {
		if i >= len(got) {
			return fmt.Errorf("%s: column %d is missing; want %s", name, i+1, columnText(w))
		}
		if g := got[i]; columnText(g) != columnText(w) {
			return fmt.Errorf("%s: column %d is %s; want %s", name, i+1, columnText(g), columnText(w))
		}
	}
	if len(got) > len(wanted) {
		return fmt.Errorf("%s: column %d is %s; want %d columns only", name, len(wanted)+1, columnText(got[len(wanted)]), len(wanted))
	}
	return nil
}

// columnText writes a column as one line of a schema.
func columnText(f parquet.Field) string {
	kind := "required"
	if f.Optional() {
		kind = "optional"
	} else if f.Repeated() {
		kind = "repeated"
	}
	if !f.Leaf() {
		return fmt.Sprintf("%s %s group", f.Name(), kind)
	}
	return fmt.Sprintf("%s %s %s", f.Name(), kind, f.Type())
}

func damaged(name string, err error) error {
	return fmt.Errorf("%s: it is damaged (%w); want the file as it was written", name, err)
}

// recoverDamage turns a panic of the Parquet library, which bad bytes can
// provoke, into an error.
func recoverDamage(name string, err *error) {
	if p := recover(); p != nil {
		*err = damaged(name, fmt.Errorf("%v", p))
	}
}
