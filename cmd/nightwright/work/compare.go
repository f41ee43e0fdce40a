package work

import (
	"bytes"
	"context"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"fmt"
	"path/filepath"
	"strings"

	"github.com/google/renameio/v2"

	"nightwright/constraints/survey"
	"nightwright/scenarios/seasons"
	"nightwright/scheduler/ledger"
	"nightwright/scheduler/tables"
)

// CompareAsk is what a comparison of networks is asked for.
type CompareAsk struct {
	SeasonsAsk
	Choose    int  // sites to choose; 0: the networks of the survey, or every removal
	NoShapley bool // leave the sites' shares out: they take 2^sites runs
}

// maxSites bounds the sites of a comparison: sets of them are bits.
const maxSites = 60

// networks are what the survey lists, or all sites and every removal of one.
func (s *Survey) networks() []survey.Network {
	if len(s.Networks) > 0 {
		return s.Networks
	}
	all := survey.Network{Name: "all sites"}
	for i := range s.Sites {
		all.Sites = append(all.Sites, i)
	}
	out := []survey.Network{all}
	for i := range s.Sites {
		n := survey.Network{Name: "without " + s.Sites[i].Name}
		for k := range s.Sites {
			if k != i {
				n.Sites = append(n.Sites, k)
			}
		}
		if len(n.Sites) > 0 {
			out = append(out, n)
		}
	}
	return out
}

// Compare plays networks of sites against each other under the same skies.
// With Choose and too many sets of that size it chooses greedily, and greed
// says how far from the best that may be.
func Compare(ctx context.Context, s *Survey, ask CompareAsk, o Options) (r *SeasonsResult, greed *seasons.Greed, err error) {
	if n := len(s.Sites); n > maxSites {
		return nil, nil, Inputf("the survey has %d sites; compare takes %d at most", n, maxSites)
	}
	if ask.Choose < 0 || ask.Choose > len(s.Sites) {
		return nil, nil, Inputf("--choose is %d; want 1 to %d, the number of sites", ask.Choose, len(s.Sites))
	}
	if _, err := s.TakeLosses(ctx, ledger.Now); err != nil {
		return nil, nil, err
	}
	networks, words := s.networks(), "listed"
	exact := true
	if ask.Choose > 0 {
		networks, exact = seasons.Choices(s.Survey, ask.Choose)
		words = fmt.Sprintf("choose-%d", ask.Choose)
	}
	if !exact && ask.Shard != "" {
		return nil, nil, Inputf("--choose %d of %d sites is made step by step and can't be cut into shards; leave --shard out", ask.Choose, len(s.Sites))
	}
	asked, err := ask.asked(s, o, "compare", "networks="+words, fmt.Sprintf("shapley=%v", !ask.NoShapley))
	if err != nil {
		return nil, nil, err
	}
	r, err = s.play(ctx, &ask.SeasonsAsk, &asked, "comparison", o, func(st *seasons.Stage) ([]tables.PartRow, error) {
		in := seasons.CompareAsk{Asked: asked, Networks: networks, Shapley: !ask.NoShapley}
		if !exact {
			var err error
			if greed, err = seasons.Greedy(ctx, st, in, ask.Choose); err != nil {
				return nil, err
			}
			in.Networks = greed.Networks[len(greed.Networks)-1:]
		}
		return seasons.Compare(ctx, st, in)
	})
	return r, greed, err
}

// join works up parts and writes the tables of a forecast or a comparison:
// each file appears whole, the JSON with the others' checksums last.
func (r *SeasonsResult) join(run string, rows []tables.PartRow) error {
	kind, _, _ := strings.Cut(run, "; ")
	switch kind {
	case "forecast":
		t, err := seasons.JoinForecast(run, rows)
		if err != nil {
			return err
		}
		r.Forecast = t
		w := resultWriter{dir: r.Folder}
		writeResult(&w, tables.Seasons, t.Seasons)
		writeResult(&w, tables.Bands, t.Bands)
		writeResult(&w, tables.Chances, t.Chances)
		return w.finish("forecast.json", struct {
			seasons.ForecastSummary
			Tables []tables.TableSum `json:"tables"`
		}{t.Summary, w.sums})
	case "compare":
		t, err := seasons.JoinCompare(run, rows)
		if err != nil {
			return err
		}
		r.Compare = t
		w := resultWriter{dir: r.Folder}
		writeResult(&w, tables.Networks, t.Networks)
		writeResult(&w, tables.Pairs, t.Pairs)
		writeResult(&w, tables.Worths, t.Worths)
		writeResult(&w, tables.Strengths, t.Strengths)
		return w.finish("compare.json", struct {
			seasons.CompareSummary
			Tables []tables.TableSum `json:"tables"`
		}{t.Summary, w.sums})
	}
	return Inputf("the parts are of a %q; want those of a forecast or a comparison", kind)
}

// resultWriter writes tables into a folder and keeps their checksums.
type resultWriter struct {
	dir  string
	sums []tables.TableSum
	err  error
}

func writeResult[T any](w *resultWriter, t tables.Table[T], rows []T) {
	if w.err != nil {
		return
	}
	data, err := t.Encode(rows)
	if err == nil {
		err = renameio.WriteFile(filepath.Join(w.dir, t.Name+".parquet"), data, 0o644)
	}
	w.err = err
	sum := sha256.Sum256(data)
	w.sums = append(w.sums, tables.TableSum{Name: t.Name + ".parquet", Rows: int64(len(rows)), Bytes: int64(len(data)), SHA256: hex.EncodeToString(sum[:])})
}

func (w *resultWriter) finish(name string, v any) error {
	if w.err != nil {
		return w.err
	}
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	if err := e.Encode(v); err != nil {
		return fmt.Errorf("%s: %w", name, err)
	}
	return renameio.WriteFile(filepath.Join(w.dir, name), b.Bytes(), 0o644)
}
