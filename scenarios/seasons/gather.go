package seasons

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"nightwright/scheduler/tables"
)

// PartName is the file name of a shard.
func PartName(shard, shards int) string {
	return fmt.Sprintf("part-%03d-of-%03d.parquet", shard, shards)
}

// GatherError lists what is wrong with the parts in a folder.
type GatherError struct{ Faults []string }

// Error joins the faults.
func (e *GatherError) Error() string { return strings.Join(e.Faults, "\n") }

// HasPart reports whether a whole part of this run and shard stands at path. A
// part that is damaged or another run's doesn't count; why then says so.
func HasPart(path string, ask *Asked) (ok bool, why string) {
	rows, err := tables.Parts.ReadFile(path)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return false, ""
	case err != nil:
		return false, err.Error()
	case len(rows) == 0:
		return false, path + ": it is empty"
	case rows[0].Run != ask.Run:
		return false, path + ": " + difference(rows[0].Run, ask.Run)
	case rows[0].Shard != int64(ask.Shard) || rows[0].Shards != int64(ask.Shards):
		return false, fmt.Sprintf("%s: it holds shard %d/%d", path, rows[0].Shard, rows[0].Shards)
	}
	return true, ""
}

// ReadParts reads all parts in a folder and returns what they were asked for
// and their rows. Parts that are missing, there twice, damaged, or of another
// run are refused by name, all at once, in a GatherError.
func ReadParts(dir string) (run string, rows []tables.PartRow, err error) {
	entries, err := os.ReadDir(dir)
	if err != nil {
		return "", nil, &GatherError{[]string{fmt.Sprintf("%v; want a folder with the parts of a forecast or a comparison", err)}}
	}
	type part struct {
		name string
		rows []tables.PartRow
	}
	var parts []part
	var faults []string
	for _, e := range entries {
		if !strings.HasPrefix(e.Name(), "part-") || !strings.HasSuffix(e.Name(), ".parquet") {
			continue
		}
		name := filepath.Join(dir, e.Name())
		got, err := tables.Parts.ReadFile(name)
		if err == nil && len(got) == 0 {
			err = fmt.Errorf("%s: it is empty; want a part as it was written", name)
		}
		if err != nil {
			faults = append(faults, fmt.Sprintf("%v; take it away and run its shard again", err))
			continue
		}
		parts = append(parts, part{name, got})
	}
	if len(parts) == 0 && len(faults) == 0 {
		return "", nil, &GatherError{[]string{fmt.Sprintf("%s: there is no part in it; want files such as %s, as --shard writes them", dir, PartName(1, 16))}}
	}
	if len(parts) == 0 {
		return "", nil, &GatherError{faults}
	}
	// The run that most parts belong to; the first of equals.
	counts, main := map[string]int{}, 0
	for i := range parts {
		counts[runKey(&parts[i].rows[0])]++
	}
	for i := range parts {
		if counts[runKey(&parts[i].rows[0])] > counts[runKey(&parts[main].rows[0])] {
			main = i
		}
	}
	run, shards := parts[main].rows[0].Run, int(parts[main].rows[0].Shards)
	have := make([]string, shards+1)
	for _, p := range parts {
		r := &p.rows[0]
		switch k := int(r.Shard); {
		case r.Run != run:
			faults = append(faults, fmt.Sprintf("%s: it is no part of this run: %s; take it away", p.name, difference(r.Run, run)))
		case int(r.Shards) != shards:
			faults = append(faults, fmt.Sprintf("%s: it is one of %d shards, the others are of %d; take it away", p.name, r.Shards, shards))
		case k < 1 || k > shards:
			faults = append(faults, fmt.Sprintf("%s: it is shard %d of %d; take it away", p.name, k, shards))
		case have[k] != "":
			faults = append(faults, fmt.Sprintf("%s: it is shard %d/%d, as %s is; take one away", p.name, k, shards, filepath.Base(have[k])))
		default:
			have[k] = p.name
			rows = append(rows, p.rows...)
		}
	}
	for k := 1; k <= shards; k++ {
		if have[k] == "" {
			faults = append(faults, fmt.Sprintf("%s: it is missing; run shard %d/%d", filepath.Join(dir, PartName(k, shards)), k, shards))
		}
	}
	if len(faults) > 0 {
		return "", nil, &GatherError{faults}
	}
	return run, rows, nil
}

func runKey(r *tables.PartRow) string { return fmt.Sprintf("%s|%d", r.Run, r.Shards) }

// difference says in which of their words two runs differ. A run is words of
// the form name=value with "; " between.
func difference(got, want string) string {
	a, b := strings.Split(got, "; "), strings.Split(want, "; ")
	var out []string
	for i := range max(len(a), len(b)) {
		switch {
		case i >= len(a):
			out = append(out, "it has no "+b[i])
		case i >= len(b):
			out = append(out, "it has "+a[i])
		case a[i] != b[i]:
			out = append(out, fmt.Sprintf("it has %s, not %s", a[i], b[i]))
		}
	}
	return strings.Join(slices.Compact(out), ", ")
}
