package main

import (
	"bufio"
	"bytes"
	"context"
	"encoding/json"
	"io"
	"net/http"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// TestServeAnswersAndEnds: the command prints where the page is, answers there
// with the key it printed, and ends cleanly when it is interrupted.
func TestServeAnswersAndEnds(t *testing.T) {
	t.Setenv("XDG_CONFIG_HOME", t.TempDir())
	dir := filepath.Join(t.TempDir(), "s")
	if err := os.CopyFS(dir, os.DirFS(filepath.Join("testdata", "small"))); err != nil {
		t.Fatal(err)
	}
	session(t, exitInput, "serve", dir, "--port", "0") // there is no plan yet
	session(t, exitDone, "plan", dir, "--quiet", "--effort", "quick")
	ctx, stop := context.WithCancel(t.Context())
	out, in := io.Pipe()
	var msg bytes.Buffer
	code := make(chan int, 1)
	go func() {
		code <- run(ctx, []string{"serve", dir, "--port", "0", "--json"}, strings.NewReader(""), in, &msg)
	}()
	var where struct{ Address, Key, Page string }
	if err := json.NewDecoder(bufio.NewReader(out)).Decode(&where); err != nil {
		t.Fatal(err)
	}
	if !strings.HasPrefix(where.Address, "http://127.0.0.1:") || where.Page != where.Address+"#key="+where.Key || len(where.Key) < 32 {
		t.Errorf("%+v", where)
	}
	res, err := http.Get(where.Address)
	if err != nil {
		t.Fatal(err)
	}
	text, err := io.ReadAll(res.Body)
	res.Body.Close()
	if err != nil || res.StatusCode != http.StatusOK || !bytes.Contains(text, []byte("<title>Night desk")) || bytes.Contains(text, []byte(where.Key)) {
		t.Errorf("%d %v %s", res.StatusCode, err, text)
	}
	session(t, exitInput, "serve", dir, "--port", strings.TrimSuffix(where.Address[strings.LastIndex(where.Address, ":")+1:], "/"))
	stop()
	if c := <-code; c != exitDone {
		t.Errorf("exit %d: %s", c, msg.String())
	}
}

// TestServeFlags: what can't be listened on is said in words.
func TestServeFlags(t *testing.T) {
	for want, args := range map[string][]string{
		"want 0 to 65535":         {"--port", "70000"},
		"want an address of this": {"--listen", "everywhere"},
		"want a survey folder":    {"--port", "0"},
	} {
		_, msg := session(t, exitInput, append([]string{"serve", filepath.Join(t.TempDir(), "none")}, args...)...)
		if !strings.Contains(msg, want) {
			t.Errorf("%v: %q; want %q in it", args, msg, want)
		}
	}
}
