package page

import (
	"bytes"
	"errors"
	"fmt"
	"math"
	"net/http"
	"net/url"
	"strconv"
	"strings"

	"nightwright/cmd/nightwright/work"
	"nightwright/scenarios/formats"
)

const (
	votableKind = "application/x-votable+xml"
	mjdEpoch    = 40587.0 // MJD of 1970-01-01
	maxRows     = 1_000_000
	maxVisible  = 400.0 // d, the longest time of a visibility query
)

// getVisible answers an object visibility query (ObjVisSAP, working draft of
// 2020-09-30): POS=ra,dec&TIME=mjd/mjd. Faults are told in a VOTable, as DALI
// 1.1 (section 4.2) wants.
func getVisible(s *Server, w http.ResponseWriter, r *http.Request) error {
	v, err := s.books.view(r.Context())
	if err != nil {
		return err
	}
	q, err := params(r.URL.Query())
	if err == nil {
		err = q.only("POS", "TIME", "VIS_MIN", "MAXREC", "FACILITY", "PROGRAM", "RESPONSEFORMAT")
	}
	var ask work.VisibleAsk
	most := maxRows
	if err == nil {
		ask, most, err = q.visible(float64(s.cfg.Now().UnixMicro()) / 1e6)
	}
	var rows []formats.VisibilityRow
	if err == nil && most > 0 {
		sv, serr := s.books.sheets(r.Context(), v)
		if serr != nil {
			return serr
		}
		rows, err = work.Visible(r.Context(), sv, ask, work.Options{Workers: s.cfg.Workers})
	}
	d := formats.Document{About: "Object visibility for the survey " + v.Name, Table: formats.Visibility(nil)}
	if err == nil {
		d.Infos = append(d.Infos, formats.Info{Name: "T_MAX_HARD_LIMIT", Value: strconv.FormatFloat((v.LastNight+2).Unix()/86400+mjdEpoch, 'f', -1, 64)})
		over := len(rows) > most
		d.Table = formats.Visibility(rows[:min(len(rows), most)])
		return votable(w, r, d, nil, over)
	}
	return votable(w, r, d, err, false)
}

// getObsPlan answers with the planned observations (ObsLocTAP 1.0).
func getObsPlan(s *Server, w http.ResponseWriter, r *http.Request) error {
	v, err := s.pick(r)
	if err != nil {
		return err
	}
	stamp, ok := formats.DefaultStamp(v.plan)
	if !ok {
		return fmt.Errorf("the plan has no first night")
	}
	q, err := params(r.URL.Query())
	if err == nil {
		err = q.only("TIME", "MAXREC", "FACILITY", "RESPONSEFORMAT", "PLAN")
	}
	most, from, to := maxRows, math.Inf(-1), math.Inf(1)
	if err == nil {
		most, err = q.most()
	}
	if err == nil && q["TIME"] != "" {
		from, to, err = q.span(math.Inf(-1))
	}
	pt := *v.plan
	pt.Visits = nil
	if err == nil {
		for i := range v.plan.Visits {
			x := &v.plan.Visits[i]
			site := q["FACILITY"]
			if float64(x.End)/1e6 > from && float64(x.Start)/1e6 < to && (site == "" || strings.EqualFold(site, x.Site) || strings.EqualFold(site, x.Telescope)) {
				pt.Visits = append(pt.Visits, *x)
			}
		}
	}
	over := len(pt.Visits) > most
	pt.Visits = pt.Visits[:min(len(pt.Visits), most)]
	d := formats.Document{About: "Planned observations, ObsLocTAP 1.0", Infos: formats.Infos(v.plan), Table: formats.ObsPlan(formats.Plan{Tables: &pt, Survey: v.Survey.Survey, Stamp: stamp})}
	return votable(w, r, d, err, over)
}

// votable answers with a document; its status follows DALI 1.1, section 4.4.
func votable(w http.ResponseWriter, r *http.Request, d formats.Document, err error, over bool) error {
	var input *work.InputError
	var status *statusError
	answer := formats.Info{Name: "QUERY_STATUS", Value: "OK"}
	code := http.StatusOK
	switch {
	case errors.As(err, &input):
		answer.Value, code = "ERROR", http.StatusBadRequest
		d.About = strings.TrimPrefix(input.Error(), "nightwright: ")
	case errors.As(err, &status):
		answer.Value, code = "ERROR", http.StatusBadRequest
		d.About = status.what
	case err != nil:
		return err
	}
	d.Infos = append([]formats.Info{answer}, d.Infos...)
	if over {
		d.After = append(d.After, formats.Info{Name: "QUERY_STATUS", Value: "OVERFLOW"})
	}
	var b bytes.Buffer
	if err := formats.WriteVOTable(&b, d); err != nil {
		return err
	}
	w.Header().Set("Content-Type", votableKind)
	if code != http.StatusOK {
		w.WriteHeader(code)
		_, _ = w.Write(b.Bytes()) // the reader may be gone
		return nil
	}
	send(w, r, votableKind, b.Bytes())
	return nil
}

// query is a DALI query: names in capitals, each once.
type query map[string]string

func params(in url.Values) (query, error) {
	q := query{}
	for name, values := range in {
		up := strings.ToUpper(name)
		if _, twice := q[up]; twice || len(values) != 1 {
			return nil, wrong(up + " stands more than once")
		}
		q[up] = values[0]
	}
	if f := q["RESPONSEFORMAT"]; f != "" && f != "votable" && f != votableKind && f != "text/xml" {
		return nil, wrong("RESPONSEFORMAT is " + strconv.Quote(f) + "; want votable")
	}
	return q, nil
}

func (q query) only(names ...string) error {
	known := " " + strings.Join(names, " ") + " "
	for name := range q {
		if !strings.Contains(known, " "+name+" ") {
			return wrong("there is no parameter " + strconv.Quote(name) + "; there are" + strings.TrimRight(known, " "))
		}
	}
	return nil
}

func (q query) most() (int, error) {
	if q["MAXREC"] == "" {
		return maxRows, nil
	}
	n, err := strconv.Atoi(q["MAXREC"])
	if err != nil || n < 0 {
		return 0, wrong("MAXREC is " + strconv.Quote(q["MAXREC"]) + "; want a number of rows, 0 or more")
	}
	return min(n, maxRows), nil
}

// number reads a finite decimal number.
func number(text string) (float64, bool) {
	x, err := strconv.ParseFloat(strings.TrimSpace(text), 64)
	return x, err == nil && !math.IsInf(x, 0) && !math.IsNaN(x)
}

// span reads TIME as UTC Unix seconds; open ends are now and the end of time.
func (q query) span(now float64) (from, to float64, err error) {
	a, b, ok := strings.Cut(q["TIME"], "/")
	bad := wrong("TIME is " + strconv.Quote(q["TIME"]) + "; want tmin/tmax, modified Julian dates in UTC, such as 61466.0/61467.5")
	if !ok {
		return 0, 0, bad
	}
	from, to = now, math.Inf(1)
	for _, end := range []struct {
		text string
		into *float64
	}{{a, &from}, {b, &to}} {
		if end.text == "" {
			continue
		}
		mjd, ok := number(end.text)
		if !ok {
			return 0, 0, bad
		}
		*end.into = (mjd - mjdEpoch) * 86400
	}
	if !(to > from) {
		return 0, 0, bad
	}
	return from, to, nil
}

// visible reads a visibility query.
func (q query) visible(now float64) (ask work.VisibleAsk, most int, err error) {
	if most, err = q.most(); err != nil {
		return ask, 0, err
	}
	ra, dec, ok := strings.Cut(q["POS"], ",")
	ok1, ok2 := false, false
	ask.RA, ok1 = number(ra)
	ask.Dec, ok2 = number(dec)
	if !ok || !ok1 || !ok2 || ask.RA < 0 || ask.RA >= 360 || ask.Dec < -90 || ask.Dec > 90 {
		return ask, 0, wrong("POS is " + strconv.Quote(q["POS"]) + "; want ra,dec in degrees, ICRS, such as 150.1,2.2")
	}
	if q["TIME"] == "" {
		return ask, 0, wrong("TIME is missing; want tmin/tmax, modified Julian dates in UTC")
	}
	if ask.From, ask.To, err = q.span(now); err != nil {
		return ask, 0, err
	}
	if ask.To-ask.From > maxVisible*86400 {
		ask.To = ask.From + maxVisible*86400
	}
	if q["VIS_MIN"] != "" {
		if ask.Shortest, ok = number(q["VIS_MIN"]); !ok || ask.Shortest < 0 {
			return ask, 0, wrong("VIS_MIN is " + strconv.Quote(q["VIS_MIN"]) + "; want seconds")
		}
	}
	ask.Facility, ask.Program = q["FACILITY"], q["PROGRAM"]
	return ask, most, nil
}
