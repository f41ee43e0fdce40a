package surveyfile

import (
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
	"hash"
	"io"
	"os"
	"path/filepath"
)

// Source lists the files a survey was read from.
type Source struct {
	Root  string // the survey folder
	Files []SourceFile
}

// SourceFile is one file, as it was read.
type SourceFile struct {
	Name   string // relative to the folder, with slashes
	Bytes  int64
	SHA256 string // lower-case hexadecimal
}

// folder opens files inside the survey folder, and no others, and keeps
// account of them.
type folder struct {
	root   *os.Root
	source Source
}

var errOutside = errors.New("it lies outside the survey's folder")

// open opens a file by its relative name. Names and links that lead out of
// the folder are refused.
func (f *folder) open(name string, limit int64) (*sourceReader, error) {
	if !filepath.IsLocal(name) {
		return nil, errOutside
	}
	file, err := f.root.Open(name)
	if err != nil {
		return nil, err
	}
	info, err := file.Stat()
	if err == nil && !info.Mode().IsRegular() {
		err = errors.New("it is no file")
	}
	if err == nil && info.Size() > limit {
		err = fmt.Errorf("it has %d bytes, more than the limit of %d", info.Size(), limit)
	}
	if err != nil {
		file.Close()
		return nil, err
	}
	return &sourceReader{file: file, name: name, left: limit, sum: sha256.New()}, nil
}

// read returns a whole file.
func (f *folder) read(name string, limit int64) ([]byte, error) {
	r, err := f.open(name, limit)
	if err != nil {
		return nil, err
	}
	defer r.file.Close()
	text, err := io.ReadAll(r)
	if err != nil {
		return nil, err
	}
	return text, f.done(r)
}

// done notes a file that was read, reading what is left of it.
func (f *folder) done(r *sourceReader) error {
	if _, err := io.Copy(io.Discard, r); err != nil {
		return err
	}
	f.source.Files = append(f.source.Files, SourceFile{
		Name:   filepath.ToSlash(filepath.Clean(r.name)),
		Bytes:  r.bytes,
		SHA256: hex.EncodeToString(r.sum.Sum(nil)),
	})
	return nil
}

// sourceReader sums up what is read through it, and stops at its limit even
// if the file has grown meanwhile.
type sourceReader struct {
	file  *os.File
	name  string
	left  int64
	bytes int64
	sum   hash.Hash
}

func (r *sourceReader) Read(p []byte) (int, error) {
	n, err := r.file.Read(p)
	r.sum.Write(p[:n])
	r.bytes += int64(n)
	if r.left -= int64(n); r.left < 0 {
		return n, errors.New("it is larger than the limit")
	}
	return n, err
}
