package page

import (
	"crypto/subtle"
	"encoding/json"
	"net"
	"net/http"
	"net/url"
	"slices"
	"strings"
	"time"
)

const (
	maxBody    = 64 << 10 // bytes of a request's body
	maxURL     = 8 << 10  // bytes of a request's address
	maxAtOnce  = 64       // requests that are worked on at once; streams apart
	maxStreams = 32       // progress streams at once
	waitInLine = 10 * time.Second
)

// policy is what the page may load and do: its own files alone.
const policy = "default-src 'none'; script-src 'self'; style-src 'self'; img-src 'self' data:; connect-src 'self'; form-action 'none'; base-uri 'none'; frame-ancestors 'none'"

// paperPolicy is that of reports and sheets: their own style, no scripts.
const paperPolicy = "default-src 'none'; style-src 'unsafe-inline'; img-src data:; form-action 'none'; base-uri 'none'; frame-ancestors 'none'"

// KeyHeader carries the key that allows changes.
const KeyHeader = "X-Nightwright-Key"

// guard stands before every handler: whom it lets in, and how many at once.
func (s *Server) guard(next http.Handler) http.Handler {
	line := make(chan struct{}, maxAtOnce)
	streams := make(chan struct{}, maxStreams)
	return http.HandlerFunc(func(w http.ResponseWriter, r *http.Request) {
		h := w.Header()
		h.Set("Content-Security-Policy", policy)
		h.Set("X-Content-Type-Options", "nosniff")
		h.Set("X-Frame-Options", "DENY")
		h.Set("Referrer-Policy", "no-referrer")
		h.Set("Cross-Origin-Opener-Policy", "same-origin")
		h.Set("Cross-Origin-Resource-Policy", "same-origin")
		h.Set("Cache-Control", "no-store")
		if !s.knownHost(r.Host) {
			refuse(w, http.StatusMisdirectedRequest, "this server answers to its own address alone; open the address that 'nightwright serve' printed")
			return
		}
		if o := r.Header.Get("Origin"); o != "" && !s.ownOrigin(o, r.Host) {
			refuse(w, http.StatusForbidden, "another page may not ask this server")
			return
		}
		if site := r.Header.Get("Sec-Fetch-Site"); site == "cross-site" && !(r.Method == http.MethodGet && r.URL.Path == "/") {
			refuse(w, http.StatusForbidden, "another page may not ask this server")
			return
		}
		if len(r.RequestURI) > maxURL {
			refuse(w, http.StatusRequestURITooLong, "the address is too long; want at most 8 kB")
			return
		}
		if r.Method != http.MethodGet && r.Method != http.MethodHead && !s.mayChange(r) {
			refuse(w, http.StatusForbidden, "a change wants the key in the header "+KeyHeader+"; open the whole address that 'nightwright serve' printed")
			return
		}
		gate := line
		if strings.HasSuffix(r.URL.Path, "/events") {
			gate = streams
		}
		wait := time.NewTimer(waitInLine)
		defer wait.Stop()
		select {
		case gate <- struct{}{}:
			defer func() { <-gate }()
		case <-r.Context().Done():
			return
		case <-wait.C:
			h.Set("Retry-After", "5")
			refuse(w, http.StatusServiceUnavailable, "too many requests at once; try again in a moment")
			return
		}
		r.Body = http.MaxBytesReader(w, r.Body, maxBody)
		next.ServeHTTP(w, r)
	})
}

// knownHost is true for the names by which this server may be called. A page
// elsewhere that points its own name at this machine is turned away here.
func (s *Server) knownHost(host string) bool {
	name := host
	if h, _, err := net.SplitHostPort(host); err == nil {
		name = h
	}
	name = strings.ToLower(strings.Trim(name, "[]"))
	return slices.Contains([]string{"127.0.0.1", "localhost", "::1"}, name) || slices.Contains(s.cfg.Hosts, name)
}

func (s *Server) ownOrigin(origin, host string) bool {
	u, err := url.Parse(origin)
	return err == nil && u.Scheme == "http" && u.Host == host
}

func (s *Server) mayChange(r *http.Request) bool {
	return s.cfg.Key != "" && subtle.ConstantTimeCompare([]byte(r.Header.Get(KeyHeader)), []byte(s.cfg.Key)) == 1
}

// refuse answers with what is wrong, as JSON.
func refuse(w http.ResponseWriter, code int, what string) {
	w.Header().Set("Content-Type", "application/json")
	w.WriteHeader(code)
	_ = json.NewEncoder(w).Encode(map[string]string{"error": what}) // the reader may be gone
}
