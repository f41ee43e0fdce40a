package page

import (
	"bytes"
	"compress/gzip"
	"context"
	"embed"
	"encoding/json"
	"errors"
	"io/fs"
	"net"
	"net/http"
	"path"
	"strings"
	"sync"
	"time"

	"nightwright/cmd/nightwright/draw"
	"nightwright/cmd/nightwright/work"
)

//go:embed assets
var assetFiles embed.FS

// Config is what a server is made from.
type Config struct {
	Survey  string // folder or file
	Plan    string // folder; "": plan in the survey folder
	Workers int
	Version string
	Key     string           // allows changes; "": none are
	Hosts   []string         // names, besides this machine's own, by which it may be called
	Now     func() time.Time // the clock
	Wait    time.Duration    // how long a request's head may take, and a quarter of what its body may; 0: 5 s
}

// Server is the planning page.
type Server struct {
	cfg   Config
	books books
	jobs  jobs

	tryMu sync.Mutex
	try   *attempt // the plan that waits to be accepted; nil: none
}

// New reads the survey and its plan, so that the first view is quick. What is
// wrong with either is a *work.InputError.
func New(ctx context.Context, cfg Config) (*Server, error) {
	s := &Server{cfg: cfg}
	s.books.cfg = &s.cfg
	s.jobs.now = cfg.Now
	if _, err := s.books.view(ctx); err != nil {
		return nil, err
	}
	return s, nil
}

// Close ends the work that is going on and drops what wasn't accepted.
func (s *Server) Close() {
	s.jobs.close()
	s.tryMu.Lock()
	defer s.tryMu.Unlock()
	s.drop()
}

// route is an address of the API; the description is made of these.
type route struct {
	Method, Path, About string
	Query               []param
	Body                string // name of the schema of the body; "" for none
	Answer              string // media type
	Change              bool
	handle              func(s *Server, w http.ResponseWriter, r *http.Request) error
}

type param struct {
	Name, About string
	Must        bool
}

// Handler answers all requests.
func (s *Server) Handler() http.Handler {
	mux := http.NewServeMux()
	for _, rt := range routes() {
		mux.HandleFunc(rt.Method+" "+rt.Path, func(w http.ResponseWriter, r *http.Request) {
			s.answer(w, r, func() error { return rt.handle(s, w, r) })
		})
	}
	mux.HandleFunc("GET /{$}", func(w http.ResponseWriter, r *http.Request) { s.asset(w, r, "page.html") })
	mux.HandleFunc("GET /page/{name}", func(w http.ResponseWriter, r *http.Request) { s.asset(w, r, r.PathValue("name")) })
	mux.HandleFunc("/", func(w http.ResponseWriter, r *http.Request) {
		refuse(w, http.StatusNotFound, "there is nothing at this address; /openapi.json lists what there is")
	})
	return s.guard(mux)
}

// answer runs a handler and tells what went wrong without telling more than
// the user's own files: faults of input in words, all else as such.
func (s *Server) answer(w http.ResponseWriter, r *http.Request, do func() error) {
	err := do()
	var input *work.InputError
	var large *http.MaxBytesError
	var status *statusError
	switch {
	case err == nil:
	case errors.As(err, &status):
		refuse(w, status.code, status.what)
	case errors.As(err, &large):
		refuse(w, http.StatusRequestEntityTooLarge, "the body is too large; want at most 64 kB")
	case errors.As(err, &input):
		refuse(w, http.StatusUnprocessableEntity, strings.TrimPrefix(input.Error(), "nightwright: "))
	default:
		refuse(w, http.StatusInternalServerError, err.Error())
	}
}

// statusError is an answer with its code.
type statusError struct {
	code int
	what string
}

func (e *statusError) Error() string { return e.what }

func wrong(what string) error { return &statusError{http.StatusBadRequest, what} }

// asset serves one of the page's own files; names outside the embedded folder
// don't exist.
func (s *Server) asset(w http.ResponseWriter, r *http.Request, name string) {
	kinds := map[string]string{".html": "text/html; charset=utf-8", ".css": "text/css; charset=utf-8", ".js": "text/javascript; charset=utf-8", ".svg": "image/svg+xml"}
	kind, ok := kinds[path.Ext(name)]
	if name == "inks.css" {
		send(w, r, kind, []byte(draw.StyleSheet()))
		return
	}
	text, err := fs.ReadFile(assetFiles, "assets/"+name)
	if err != nil || !ok || strings.ContainsAny(name, "/\\") {
		refuse(w, http.StatusNotFound, "there is no such file")
		return
	}
	send(w, r, kind, text)
}

// send writes a body, packed where the reader takes that.
func send(w http.ResponseWriter, r *http.Request, kind string, text []byte) {
	w.Header().Set("Content-Type", kind)
	w.Header().Add("Vary", "Accept-Encoding")
	if len(text) > 1500 && strings.Contains(r.Header.Get("Accept-Encoding"), "gzip") {
		w.Header().Set("Content-Encoding", "gzip")
		z, _ := gzip.NewWriterLevel(w, gzip.BestSpeed)
		_, _ = z.Write(text) // the reader may be gone
		_ = z.Close()
		return
	}
	_, _ = w.Write(text)
}

// sendJSON writes a value as JSON.
func sendJSON(w http.ResponseWriter, r *http.Request, v any) error {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(true)
	if err := e.Encode(v); err != nil {
		return err
	}
	send(w, r, "application/json", b.Bytes())
	return nil
}

// readJSON reads a request's body strictly: one value, no unknown members.
func readJSON(r *http.Request, v any) error {
	if kind, _, _ := strings.Cut(r.Header.Get("Content-Type"), ";"); strings.TrimSpace(kind) != "application/json" {
		return &statusError{http.StatusUnsupportedMediaType, "the body's type must be application/json"}
	}
	d := json.NewDecoder(r.Body)
	d.DisallowUnknownFields()
	if err := d.Decode(v); err != nil {
		var large *http.MaxBytesError
		if errors.As(err, &large) {
			return err
		}
		return wrong("the body is not as described in /openapi.json: " + err.Error())
	}
	if d.More() {
		return wrong("something follows the body's JSON")
	}
	return nil
}

// Serve answers on a listener until the context ends.
func (s *Server) Serve(ctx context.Context, l net.Listener) error {
	wait := s.cfg.Wait
	if wait == 0 {
		wait = 5 * time.Second
	}
	srv := &http.Server{
		Handler: s.Handler(), ReadHeaderTimeout: wait, ReadTimeout: 4 * wait, IdleTimeout: 12 * wait,
		MaxHeaderBytes: 16 << 10, BaseContext: func(net.Listener) context.Context { return ctx },
	}
	stop := context.AfterFunc(ctx, func() {
		s.jobs.close()
		end, cancel := context.WithTimeout(context.Background(), 3*time.Second)
		defer cancel()
		if srv.Shutdown(end) != nil {
			_ = srv.Close()
		}
	})
	defer stop()
	err := srv.Serve(&limited{Listener: l, open: make(chan struct{}, maxConns)})
	s.Close()
	if errors.Is(err, http.ErrServerClosed) {
		return nil
	}
	return err
}

// maxConns is how many connections are open at once; more wait in the
// system's queue.
const maxConns = 256

// limited is a listener that holds so many connections at most.
type limited struct {
	net.Listener
	open chan struct{}
}

// Accept waits for a connection and for room for it.
func (l *limited) Accept() (net.Conn, error) {
	l.open <- struct{}{}
	c, err := l.Listener.Accept()
	if err != nil {
		<-l.open
		return nil, err
	}
	return &counted{Conn: c, done: sync.OnceFunc(func() { <-l.open })}, nil
}

type counted struct {
	net.Conn
	done func()
}

// Close closes the connection and makes room.
func (c *counted) Close() error {
	defer c.done()
	return c.Conn.Close()
}
