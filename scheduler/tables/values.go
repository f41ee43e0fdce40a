package tables

import (
	"errors"
	"fmt"
	"io"
	"reflect"
	"strings"

	"github.com/parquet-go/parquet-go"
)

var errRowCount = errors.New("the row count is wrong")

// eachValue hands on every value of a column chunk of a flat file. The row
// reader of the library can go round in circles on damaged bytes; here each
// turn takes a page of the file.
func eachValue(chunk parquet.ColumnChunk, f func(parquet.Value) error) error {
	pages := chunk.Pages()
	defer pages.Close()
	var buffer [256]parquet.Value
	for {
		page, err := pages.ReadPage()
		if errors.Is(err, io.EOF) {
			return nil
		}
		if err != nil {
			return err
		}
		values := page.Values()
		for {
			k, err := values.ReadValues(buffer[:])
			for _, v := range buffer[:k] {
				if err := f(v); err != nil {
					return err
				}
			}
			if errors.Is(err, io.EOF) {
				break
			}
			if err != nil {
				return err
			}
			if k == 0 {
				return errors.New("a page ends early")
			}
		}
		parquet.Release(page)
	}
}

// readRows fills rows column by column. The schema must have been checked.
func readRows[T any](f *parquet.File, n int) ([]T, error) {
	var rows []T // grows with what is really there, not with what is claimed
	slice := reflect.ValueOf(&rows).Elem()
	done := 0
	for _, g := range f.RowGroups() {
		size := int(g.NumRows())
		if size < 0 || size > n-done {
			return nil, errRowCount
		}
		for k, chunk := range g.ColumnChunks() {
			set, err := setterOf(slice.Type().Elem().Field(k).Type)
			if err != nil {
				return nil, err
			}
			at := done
			err = eachValue(chunk, func(v parquet.Value) error {
				if at == done+size {
					return errRowCount
				}
				if at == len(rows) {
					rows = append(rows, *new(T))
				}
				if !v.IsNull() {
					set(slice.Index(at).Field(k), v)
				}
				at++
				return nil
			})
			if err != nil {
				return nil, err
			}
			if at != done+size {
				return nil, fmt.Errorf("column %d has %d values of %d", k+1, at-done, size)
			}
		}
		done += size
	}
	if done != n {
		return nil, errRowCount
	}
	return rows, nil
}

// setterOf returns how a member of a row takes a value.
func setterOf(t reflect.Type) (func(reflect.Value, parquet.Value), error) {
	switch t.Kind() {
	case reflect.Pointer:
		set, err := setterOf(t.Elem())
		return func(m reflect.Value, v parquet.Value) {
			p := reflect.New(t.Elem())
			set(p.Elem(), v)
			m.Set(p)
		}, err
	case reflect.Int64:
		return func(m reflect.Value, v parquet.Value) { m.SetInt(v.Int64()) }, nil
	case reflect.Int32:
		return func(m reflect.Value, v parquet.Value) { m.SetInt(int64(v.Int32())) }, nil
	case reflect.Float64:
		return func(m reflect.Value, v parquet.Value) { m.SetFloat(v.Double()) }, nil
	case reflect.Bool:
		return func(m reflect.Value, v parquet.Value) { m.SetBool(v.Boolean()) }, nil
	case reflect.String:
		// Equal words of a column share their bytes.
		words := map[string]string{}
		return func(m reflect.Value, v parquet.Value) {
			b := v.ByteArray()
			word, ok := words[string(b)]
			if !ok {
				word = strings.Clone(string(b))
				words[word] = word
			}
			m.SetString(word)
		}, nil
	}
	return nil, fmt.Errorf("tables: no column of type %s", t)
}
