package page

import (
	"context"
	"encoding/json"
	"io"
	"net/http"
	"net/http/httptest"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"

	"nightwright/cmd/nightwright/work"
)

const testKey = "0123456789abcdef"

// desk is a server with a plan of the small survey, and what its folder holds.
type desk struct {
	*httptest.Server
	t   *testing.T
	s   *Server
	dir string
}

// newDesk plans the small survey, with texts replaced, each old one followed by
// its new one, and serves it.
func newDesk(t *testing.T, pairs ...string) *desk {
	t.Helper()
	dir := filepath.Join(t.TempDir(), "small")
	if err := os.CopyFS(dir, os.DirFS(filepath.Join("..", "testdata", "small"))); err != nil {
		t.Fatal(err)
	}
	for _, name := range []string{"survey.yaml", "fields.csv"} {
		file := filepath.Join(dir, name)
		text, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(file, []byte(strings.NewReplacer(pairs...).Replace(string(text))), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	s, err := work.ReadSurvey(dir)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := work.Plan(context.Background(), s, work.PlanAsk{Effort: "quick"}, work.Options{Workers: 2, Version: "test"}); err != nil {
		t.Fatal(err)
	}
	srv, err := New(context.Background(), Config{Survey: dir, Workers: 2, Version: "test", Key: testKey, Now: time.Now})
	if err != nil {
		t.Fatal(err)
	}
	d := &desk{httptest.NewServer(srv.Handler()), t, srv, dir}
	t.Cleanup(func() {
		d.Server.Close()
		srv.Close()
	})
	return d
}

// ask sends a request; head holds names and values of its header in turn.
func (d *desk) ask(method, path, body string, head ...string) (int, http.Header, string) {
	d.t.Helper()
	r, err := http.NewRequest(method, d.URL+path, strings.NewReader(body))
	if err != nil {
		d.t.Fatal(err)
	}
	for k := 0; k+1 < len(head); k += 2 {
		if head[k] == "Host" {
			r.Host = head[k+1]
			continue
		}
		r.Header.Set(head[k], head[k+1])
	}
	res, err := http.DefaultClient.Do(r)
	if err != nil {
		d.t.Fatal(err)
	}
	defer res.Body.Close()
	text, err := io.ReadAll(res.Body)
	if err != nil {
		d.t.Fatal(err)
	}
	return res.StatusCode, res.Header, string(text)
}

// get fetches JSON.
func (d *desk) get(path string, into any) {
	d.t.Helper()
	code, _, text := d.ask("GET", path, "")
	if code != http.StatusOK {
		d.t.Fatalf("GET %s: %d: %s", path, code, text)
	}
	if err := json.Unmarshal([]byte(text), into); err != nil {
		d.t.Fatalf("GET %s: %v", path, err)
	}
}

// change sends a change with the key.
func (d *desk) change(method, path, body string) (int, string) {
	d.t.Helper()
	code, _, text := d.ask(method, path, body, KeyHeader, testKey, "Content-Type", "application/json")
	return code, text
}

// files reads every file of the survey folder.
func (d *desk) files() map[string]string {
	d.t.Helper()
	out := map[string]string{}
	err := filepath.WalkDir(d.dir, func(p string, e os.DirEntry, err error) error {
		if err != nil || e.IsDir() {
			return err
		}
		text, err := os.ReadFile(p)
		out[p] = string(text)
		return err
	})
	if err != nil {
		d.t.Fatal(err)
	}
	return out
}

// run waits for a job to end.
func (d *desk) run(body string) jobState {
	d.t.Helper()
	code, text := d.change("POST", "/api/trial", body)
	var j jobState
	if err := json.Unmarshal([]byte(text), &j); err != nil || code != http.StatusAccepted {
		d.t.Fatalf("POST /api/trial: %d: %s", code, text)
	}
	_, _, stream := d.ask("GET", "/api/jobs/"+itoa(j.ID)+"/events", "")
	parts := strings.Split(strings.TrimSpace(stream), "\n\n")
	last := parts[len(parts)-1]
	if !strings.HasPrefix(last, "event: end\ndata: ") {
		d.t.Fatalf("the stream ends with %q", last)
	}
	if err := json.Unmarshal([]byte(strings.TrimPrefix(last, "event: end\ndata: ")), &j); err != nil {
		d.t.Fatal(err)
	}
	return j
}

func itoa(n int) string { b, _ := json.Marshal(n); return string(b) }

// lose records a loss beside the server, as another program would.
func lose(t *testing.T, d *desk, telescope string) {
	t.Helper()
	s, err := work.ReadSurvey(d.dir)
	if err != nil {
		t.Fatal(err)
	}
	if _, _, err := work.Lose(context.Background(), s, work.LoseAsk{Telescope: telescope, From: "2027-03-10", To: "2027-03-10", Cause: "technical"}, work.Options{}); err != nil {
		t.Fatal(err)
	}
}
