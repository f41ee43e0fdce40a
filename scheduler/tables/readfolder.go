package tables

import (
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
)

// ReadFolder reads a plan folder and verifies it: the summary's checksum, the
// SHA-256 and size of every table and survey file, every schema, the row
// counts, and that exactly the tables of a plan are listed.
func ReadFolder(dir string) (*PlanTables, error) {
	dir, err := standing(dir)
	if err != nil {
		return nil, err
	}
	name := filepath.Join(dir, summaryName)
	text, err := readBounded(name, maxSummary)
	if errors.Is(err, fs.ErrNotExist) {
		return nil, fmt.Errorf("%s: there is no %s in it; want a plan folder", dir, summaryName)
	}
	if err != nil {
		return nil, err
	}
	s, err := DecodeSummary(name, text)
	if err != nil {
		return nil, err
	}
	// All checksums first: damaged bytes never reach the Parquet library.
	files, err := readTables(dir, s)
	if err != nil {
		return nil, err
	}
	if _, err := readSurvey(dir, s); err != nil {
		return nil, err
	}
	pt := &PlanTables{Summary: *s}
	for _, part := range pt.parts() {
		f, ok := files[part.name]
		if !ok {
			continue
		}
		rows, err := part.decode(f.name, f.data)
		if err != nil {
			return nil, err
		}
		if int64(rows) != f.rows {
			return nil, fmt.Errorf("%s: it has %d rows; want %d, as %s says", f.name, rows, f.rows, summaryName)
		}
	}
	return pt, nil
}

// standing returns where the folder is: in its place, or aside when a
// replacement was cut short between two renames.
func standing(dir string) (string, error) {
	dir = filepath.Clean(dir)
	info, err := os.Stat(dir)
	if errors.Is(err, fs.ErrNotExist) {
		if aside := asideName(dir); isDir(aside) {
			return aside, nil
		}
		return "", fmt.Errorf("%s: there is no such folder; want a plan folder", dir)
	}
	if err == nil && !info.IsDir() {
		err = fmt.Errorf("%s: it is no folder; want a plan folder", dir)
	}
	return dir, err
}

func isDir(name string) bool {
	info, err := os.Stat(name)
	return err == nil && info.IsDir()
}

// tableFile is a table's file, verified but not yet decoded.
type tableFile struct {
	name string
	data []byte
	rows int64 // as the summary says
}

// readTables reads the tables that a summary lists, which must be those of a
// plan in their order.
func readTables(dir string, s *Summary) (map[string]tableFile, error) {
	listed, files := s.Tables, map[string]tableFile{}
	for _, part := range new(PlanTables).parts() {
		file := part.name + suffix
		if len(listed) == 0 || listed[0].Name != file {
			if part.must {
				return nil, fmt.Errorf("%s: table %s is not listed in its turn; want all tables of a plan", filepath.Join(dir, summaryName), file)
			}
			continue
		}
		name := filepath.Join(dir, file)
		data, err := readSummed(name, listed[0].Bytes, listed[0].SHA256)
		if err != nil {
			return nil, err
		}
		files[part.name] = tableFile{name, data, listed[0].Rows}
		listed = listed[1:]
	}
	if len(listed) > 0 {
		return nil, fmt.Errorf("%s: it lists %q, which is no table of a plan; want the file as it was written", filepath.Join(dir, summaryName), listed[0].Name)
	}
	return files, nil
}

// ReadSurvey returns the survey files that a plan folder keeps, verified.
func ReadSurvey(dir string) ([]SurveyFile, error) {
	dir, err := standing(dir)
	if err != nil {
		return nil, err
	}
	name := filepath.Join(dir, summaryName)
	text, err := readBounded(name, maxSummary)
	if err != nil {
		return nil, err
	}
	s, err := DecodeSummary(name, text)
	if err != nil {
		return nil, err
	}
	return readSurvey(dir, s)
}

func readSurvey(dir string, s *Summary) ([]SurveyFile, error) {
	files := []SurveyFile{}
	for _, f := range s.Files {
		if !localName(f.Name) {
			return nil, fmt.Errorf("%s: survey file %q; want a name inside the survey folder", filepath.Join(dir, summaryName), f.Name)
		}
		data, err := readSummed(filepath.Join(dir, surveyDir, filepath.FromSlash(f.Name)), f.Bytes, f.SHA256)
		if err != nil {
			return nil, err
		}
		files = append(files, SurveyFile{f.Name, data})
	}
	return files, nil
}

// readSummed reads a file of a known size and checksum.
func readSummed(name string, size int64, sum string) ([]byte, error) {
	data, err := readBounded(name, size)
	if errors.Is(err, fs.ErrNotExist) {
		return nil, fmt.Errorf("%s: it is missing; want the plan folder as it was written", name)
	}
	if err != nil {
		return nil, err
	}
	if int64(len(data)) != size {
		return nil, fmt.Errorf("%s: it has %d bytes; want %d, as %s says", name, len(data), size, summaryName)
	}
	if got := hexSum(data); got != sum {
		return nil, fmt.Errorf("%s: it was changed since it was written (its SHA-256 is %s); want %s, as %s says", name, got, sum, summaryName)
	}
	return data, nil
}

// readBounded reads a regular file of at most limit bytes.
func readBounded(name string, limit int64) ([]byte, error) {
	f, err := os.Open(name)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	info, err := f.Stat()
	if err != nil {
		return nil, err
	}
	if !info.Mode().IsRegular() {
		return nil, fmt.Errorf("%s: it is no file; want the plan folder as it was written", name)
	}
	if info.Size() > limit {
		return nil, fmt.Errorf("%s: it has %d bytes; want at most %d", name, info.Size(), limit)
	}
	data := make([]byte, info.Size())
	_, err = io.ReadFull(f, data)
	return data, err
}
