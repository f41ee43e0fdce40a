package page

import (
	"bufio"
	"context"
	"fmt"
	"io"
	"net"
	"net/http"
	"strings"
	"sync"
	"testing"
	"time"
)

// TestWhoMayAsk: other names of this machine, other pages, and changes without
// the key are turned away, and told why.
func TestWhoMayAsk(t *testing.T) {
	d := newDesk(t)
	before := d.files()
	tests := []struct {
		what, method, path, body string
		head                     []string
		want                     int
	}{
		{"another name that points here", "GET", "/api/survey", "", []string{"Host", "planner.example:80"}, 421},
		{"an address elsewhere", "GET", "/", "", []string{"Host", "203.0.113.9"}, 421},
		{"an empty name", "GET", "/", "", []string{"Host", " "}, 421},
		{"our own names", "GET", "/api/survey", "", []string{"Host", "localhost:1234"}, 200},
		{"our own names", "GET", "/api/survey", "", []string{"Host", "[::1]:1234"}, 200},
		{"another page", "GET", "/api/survey", "", []string{"Origin", "http://evil.example"}, 403},
		{"another page on another port", "GET", "/api/survey", "", []string{"Origin", "http://127.0.0.1:1"}, 403},
		{"a page without origin", "GET", "/api/survey", "", []string{"Origin", "null"}, 403},
		{"another site's request", "GET", "/api/survey", "", []string{"Sec-Fetch-Site", "cross-site"}, 403},
		{"a link from elsewhere", "GET", "/", "", []string{"Sec-Fetch-Site", "cross-site"}, 200},
		{"a change without the key", "POST", "/api/trial", `{"losses":[]}`, []string{"Content-Type", "application/json"}, 403},
		{"a change with a wrong key", "POST", "/api/trial", `{"losses":[]}`, []string{"Content-Type", "application/json", KeyHeader, "0123456789abcdee"}, 403},
		{"a change with an empty key", "DELETE", "/api/trial", "", []string{KeyHeader, ""}, 403},
		{"the key in the address", "POST", "/api/trial?key=" + testKey, `{"losses":[]}`, []string{"Content-Type", "application/json"}, 403},
		{"a change by another page that has the key", "POST", "/api/trial", `{"losses":[]}`, []string{"Origin", "http://evil.example", KeyHeader, testKey, "Content-Type", "application/json"}, 403},
		{"a form", "POST", "/api/trial", `losses=`, []string{KeyHeader, testKey, "Content-Type", "application/x-www-form-urlencoded"}, 415},
		{"text", "POST", "/api/trial", `{"losses":[]}`, []string{KeyHeader, testKey, "Content-Type", "text/plain"}, 415},
		{"no JSON", "POST", "/api/trial", `{"losses":`, []string{KeyHeader, testKey, "Content-Type", "application/json"}, 400},
		{"an unknown member", "POST", "/api/trial", `{"loses":[]}`, []string{KeyHeader, testKey, "Content-Type", "application/json"}, 400},
		{"two values", "POST", "/api/trial", `{"losses":[]}{}`, []string{KeyHeader, testKey, "Content-Type", "application/json"}, 400},
		{"a change by GET", "GET", "/api/trial/accept", "", []string{KeyHeader, testKey}, 404},
		{"a method that isn't there", "PUT", "/api/survey", "", []string{KeyHeader, testKey}, 404},
		{"a huge body", "POST", "/api/trial", `{"now":"` + strings.Repeat("x", 1<<20) + `"}`, []string{KeyHeader, testKey, "Content-Type", "application/json"}, 413},
		{"a long address", "GET", "/api/field?name=" + strings.Repeat("x", 9000), "", nil, 414},
	}
	for _, tt := range tests {
		code, head, text := d.ask(tt.method, tt.path, tt.body, tt.head...)
		if code != tt.want {
			t.Errorf("%s: %s %.40s: %d, %.200s; want %d", tt.what, tt.method, tt.path, code, text, tt.want)
		}
		if code >= 400 && !strings.Contains(text, `"error"`) {
			t.Errorf("%s: %d without a word: %s", tt.what, code, text)
		}
		if head.Get("Access-Control-Allow-Origin") != "" {
			t.Errorf("%s: other pages are let in", tt.what)
		}
	}
	if after := d.files(); fmt.Sprint(before) != fmt.Sprint(after) {
		t.Error("something was written")
	}
}

// TestPathsStayInside: no address reaches a file that isn't the page's own.
func TestPathsStayInside(t *testing.T) {
	d := newDesk(t)
	for _, path := range []string{
		"/page/../doc.go", "/page/..%2fdoc.go", "/page/%2e%2e/doc.go", "/page/..%5cdoc.go", "/page//etc/passwd", "/page/", "/page", "/survey.yaml", "/ledger.db",
		"/../../etc/passwd", "/%2e%2e/%2e%2e/etc/passwd", "/page/page.html%00", "/assets/page.html", "/.git/config",
		"/sheet?telescope=../../etc&night=2027-03-08", "/sheet?telescope=C1&night=../../x", "/sheet?telescope=C1&night=2027-03-08&form=../x", "/api/nights/..%2f..%2fx", "/api/field?name=../../x", "/api/jobs/../survey/x", "/report?night=../x",
	} {
		c, err := net.Dial("tcp", d.Listener.Addr().String()) // raw: a client would clean the path
		if err != nil {
			t.Fatal(err)
		}
		fmt.Fprintf(c, "GET %s HTTP/1.1\r\nHost: 127.0.0.1\r\nConnection: close\r\n\r\n", path)
		text, _ := io.ReadAll(c)
		c.Close()
		head, body, _ := strings.Cut(string(text), "\r\n\r\n")
		if strings.HasPrefix(head, "HTTP/1.1 200") {
			t.Errorf("%s: %s", path, head)
		}
		for _, leak := range []string{"package page", "root:", "Small Lantern", "SQLite", d.dir} {
			if strings.Contains(body, leak) {
				t.Errorf("%s leaks %q: %s", path, leak, body)
			}
		}
	}
}

// TestHeaders: each answer says what it may load, and isn't kept.
func TestHeaders(t *testing.T) {
	d := newDesk(t)
	for _, path := range []string{"/", "/page/desk.js", "/page/inks.css", "/api/survey", "/nowhere", "/sheet?telescope=C1&night=2027-03-08", "/report", "/openapi.json"} {
		_, head, _ := d.ask("GET", path, "")
		csp := head.Get("Content-Security-Policy")
		if !strings.Contains(csp, "default-src 'none'") || !strings.Contains(csp, "frame-ancestors 'none'") || strings.Contains(csp, "script-src 'unsafe") {
			t.Errorf("%s: policy %q", path, csp)
		}
		for name, want := range map[string]string{"X-Content-Type-Options": "nosniff", "X-Frame-Options": "DENY", "Referrer-Policy": "no-referrer", "Cache-Control": "no-store", "Cross-Origin-Resource-Policy": "same-origin"} {
			if head.Get(name) != want {
				t.Errorf("%s: %s is %q; want %q", path, name, head.Get(name), want)
			}
		}
		if head.Get("Content-Type") == "" {
			t.Errorf("%s has no type", path)
		}
	}
	if _, _, text := d.ask("GET", "/", ""); strings.Contains(text, testKey) {
		t.Error("the page gives the key away")
	}
	for _, rt := range routes() {
		if strings.Contains(rt.Path, "{") || rt.Method != "GET" {
			continue
		}
		if _, _, text := d.ask("GET", rt.Path, ""); strings.Contains(text, testKey) {
			t.Errorf("%s gives the key away", rt.Path)
		}
	}
}

// TestMarkupInNames: names from the survey come back as text.
func TestMarkupInNames(t *testing.T) {
	d := newDesk(t, "Small Lantern", `"<img src=x onerror=alert(1)>"`)
	code, head, text := d.ask("GET", "/api/survey", "")
	if code != 200 || !strings.HasPrefix(head.Get("Content-Type"), "application/json") || strings.Contains(text, "<img") || !strings.Contains(text, `\u003cimg`) {
		t.Errorf("%d %s: %s", code, head.Get("Content-Type"), text)
	}
	for _, path := range []string{"/report", "/sheet?telescope=C1&night=2027-03-08", "/obsplan"} {
		if _, _, text := d.ask("GET", path, ""); strings.Contains(text, "<img src=x") || !strings.Contains(text, "&lt;img") {
			t.Errorf("%s: a name became markup", path)
		}
	}
}

// TestCrowd: thousands of requests at once, and bodies that never come, leave
// the server answering.
func TestCrowd(t *testing.T) {
	d := newDesk(t)
	for range 40 { // bodies that were promised and don't come
		c, err := net.Dial("tcp", d.Listener.Addr().String())
		if err != nil {
			t.Fatal(err)
		}
		defer c.Close()
		fmt.Fprintf(c, "POST /api/trial HTTP/1.1\r\nHost: 127.0.0.1\r\n%s: %s\r\nContent-Type: application/json\r\nContent-Length: 5000\r\n\r\n{", KeyHeader, testKey)
	}
	n := 3000
	if testing.Short() {
		n = 300
	}
	client := &http.Client{Transport: &http.Transport{MaxConnsPerHost: 200}, Timeout: 2 * time.Minute}
	defer client.CloseIdleConnections()
	var wg sync.WaitGroup
	var mu sync.Mutex
	codes := map[int]int{}
	for range n {
		wg.Go(func() {
			res, err := client.Get(d.URL + "/api/survey")
			code := -1
			if err == nil {
				_, _ = io.Copy(io.Discard, res.Body)
				res.Body.Close()
				code = res.StatusCode
			}
			mu.Lock()
			codes[code]++
			mu.Unlock()
		})
	}
	wg.Wait()
	if codes[200]+codes[503] != n || codes[200] == 0 {
		t.Errorf("answers: %v; want %d of 200, or 503 where it was too much", codes, n)
	}
	if code, _, text := d.ask("GET", "/api/survey", ""); code != 200 {
		t.Errorf("after the crowd: %d, %s", code, text)
	}
}

// TestSlowOnesAreLetGo: a head and a body that don't come are not waited for,
// and the server ends when it is told to, with a stream open.
func TestSlowOnesAreLetGo(t *testing.T) {
	d := newDesk(t)
	s, err := New(t.Context(), Config{Survey: d.dir, Workers: 1, Version: "test", Key: testKey, Now: time.Now, Wait: 50 * time.Millisecond})
	if err != nil {
		t.Fatal(err)
	}
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	ctx, stop := context.WithCancel(t.Context())
	ended := make(chan error, 1)
	go func() { ended <- s.Serve(ctx, l) }()
	for what, text := range map[string]string{
		"nothing":     "",
		"half a head": "GET /api/survey HTTP/1.1\r\nHost: 127.0.0.1\r\nX-Slow: ",
		"half a body": "POST /api/trial HTTP/1.1\r\nHost: 127.0.0.1\r\n" + KeyHeader + ": " + testKey + "\r\nContent-Type: application/json\r\nContent-Length: 500\r\n\r\n{",
	} {
		c, err := net.Dial("tcp", l.Addr().String())
		if err != nil {
			t.Fatal(err)
		}
		fmt.Fprint(c, text)
		answer, err := io.ReadAll(c) // ends when the server lets go
		if err != nil || strings.HasPrefix(string(answer), "HTTP/1.1 2") {
			t.Errorf("%s: %v, %q", what, err, answer)
		}
		c.Close()
	}
	stop()
	if err := <-ended; err != nil {
		t.Errorf("the server ended with %v", err)
	}
}

// TestListenerHoldsSoMany: connections beyond the limit wait, and one that is
// closed makes room for one.
func TestListenerHoldsSoMany(t *testing.T) {
	l, err := net.Listen("tcp", "127.0.0.1:0")
	if err != nil {
		t.Fatal(err)
	}
	lim := &limited{Listener: l, open: make(chan struct{}, 2)}
	defer lim.Close()
	got := make(chan net.Conn, 3)
	go func() {
		for {
			c, err := lim.Accept()
			if err != nil {
				return
			}
			got <- c
		}
	}()
	for range 3 {
		c, err := net.Dial("tcp", l.Addr().String())
		if err != nil {
			t.Fatal(err)
		}
		defer c.Close()
		_, _ = bufio.NewWriter(c).WriteString("x")
	}
	first := <-got
	<-got
	select {
	case <-got:
		t.Fatal("a third connection was let in")
	case <-time.After(50 * time.Millisecond):
	}
	first.Close()
	first.Close() // twice: room for one only
	<-got
}
