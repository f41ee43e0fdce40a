package page

import "net/http"

var whichPlan = param{"plan", "current, or trial: the plan that waits to be accepted", false}

// routes are all addresses but the page's own files.
func routes() []route {
	const js = "application/json"
	return []route{
		{"GET", "/api/survey", "The survey, its sites and telescopes, and what its plan reaches", nil, "", js, false, getSurvey},
		{"GET", "/api/nights", "Every night of every telescope: open and used hours, price, visits; the Moon", []param{whichPlan}, "", js, false, getNights},
		{"GET", "/api/nights/{night}", "One night: exposures, open and lost time of each telescope, Sun and Moon, and where the fields are", []param{whichPlan}, "", js, false, getNight},
		{"GET", "/api/fields", "All fields with what they get", []param{whichPlan}, "", js, false, getFields},
		{"GET", "/api/field", "One field's story: its visits, and what limits it", []param{{"name", "the field's name", true}, whichPlan}, "", js, false, getField},
		{"GET", "/api/explain", "Why a field is where it is, or isn't", []param{{"name", "the field's name", true}, whichPlan}, "", js, false, getExplain},
		{"GET", "/api/explain/{night}", "Why a telescope's night looks as it does", []param{{"telescope", "its name", true}, whichPlan}, "", js, false, getExplainNight},
		{"GET", "/api/jobs/{id}", "How far long work is", nil, "", js, false, jobOf},
		{"GET", "/api/jobs/{id}/events", "The same as server-sent events, until the work ends", nil, "", "text/event-stream", false, jobEvents},
		{"DELETE", "/api/jobs/{id}", "Cancel long work", nil, "", js, true, cancelJob},
		{"POST", "/api/trial", "Plan again with marks of lost time; nothing is written", nil, "TrialAsk", js, true, postTrial},
		{"GET", "/api/trial", "What the plan that waits to be accepted would change", nil, "", js, false, getTrial},
		{"DELETE", "/api/trial", "Throw the waiting plan away", nil, "", js, true, deleteTrial},
		{"POST", "/api/trial/accept", "Record the losses and put the waiting plan in the old one's place", nil, "Accept", js, true, postAccept},
		{"GET", "/sheet", "One telescope's list for one night", []param{{"telescope", "its name", true}, {"night", "YYYY-MM-DD", true}, {"form", "html (default), txt or csv", false}}, "", "text/html", false, getSheet},
		{"GET", "/report", "The report of the plan", []param{{"night", "the night that is drawn", false}}, "", "text/html", false, getReport},
		{"GET", "/vis", "Object visibility (ObjVisSAP draft) as VOTable", []param{{"POS", "ra,dec in degrees, ICRS", true}, {"TIME", "tmin/tmax, modified Julian dates, UTC", true}, {"VIS_MIN", "least length of a window, s", false}, {"FACILITY", "a site or a telescope", false}, {"PROGRAM", "whose rules hold; the first unless given", false}, {"MAXREC", "most rows", false}, {"RESPONSEFORMAT", "votable", false}}, "", votableKind, false, getVisible},
		{"GET", "/obsplan", "The planned observations (ObsLocTAP 1.0, ivoa.obsplan) as VOTable", []param{{"TIME", "tmin/tmax, modified Julian dates, UTC", false}, {"FACILITY", "a site or a telescope", false}, {"MAXREC", "most rows", false}, {"RESPONSEFORMAT", "votable", false}, whichPlan}, "", votableKind, false, getObsPlan},
		{"GET", "/openapi.json", "This description", nil, "", js, false, getDescription},
	}
}

// getDescription writes the API as OpenAPI 3.1.0.
func getDescription(s *Server, w http.ResponseWriter, r *http.Request) error {
	return sendJSON(w, r, s.description())
}

type object = map[string]any

func (s *Server) description() object {
	paths := object{}
	for _, rt := range routes() {
		op := object{"summary": rt.About, "responses": object{
			"200":     object{"description": "done", "content": object{rt.Answer: object{}}},
			"default": object{"description": "what is wrong", "content": object{"application/json": object{"schema": object{"$ref": "#/components/schemas/Error"}}}},
		}}
		if rt.Path == "/api/trial" && rt.Method == "POST" {
			op["responses"].(object)["202"] = object{"description": "begun; Location names the job", "content": object{rt.Answer: object{}}}
			delete(op["responses"].(object), "200")
		}
		var in []any
		for _, name := range []string{"night", "id"} {
			if hasPart(rt.Path, name) {
				in = append(in, object{"name": name, "in": "path", "required": true, "schema": object{"type": "string"}})
			}
		}
		for _, p := range rt.Query {
			in = append(in, object{"name": p.Name, "in": "query", "required": p.Must, "description": p.About, "schema": object{"type": "string"}})
		}
		if in != nil {
			op["parameters"] = in
		}
		if rt.Body != "" {
			op["requestBody"] = object{"required": true, "content": object{"application/json": object{"schema": object{"$ref": "#/components/schemas/" + rt.Body}}}}
		}
		if rt.Change {
			op["security"] = []any{object{"key": []any{}}}
		}
		path, ok := paths[rt.Path].(object)
		if !ok {
			path = object{}
			paths[rt.Path] = path
		}
		path[lower(rt.Method)] = op
	}
	return object{
		"openapi": "3.1.0",
		"info":    object{"title": "nightwright planning page", "version": s.cfg.Version, "description": "Instants are UTC Unix seconds unless they are text. Changes want the key that 'nightwright serve' printed."},
		"paths":   paths,
		"components": object{
			"securitySchemes": object{"key": object{"type": "apiKey", "in": "header", "name": KeyHeader}},
			"schemas":         schemas(),
		},
	}
}

func hasPart(path, name string) bool {
	for k := 0; k+len(name)+2 <= len(path); k++ {
		if path[k:k+len(name)+2] == "{"+name+"}" {
			return true
		}
	}
	return false
}

func lower(method string) string {
	b := []byte(method)
	for i := range b {
		b[i] |= 0x20
	}
	return string(b)
}

// schemas describe the bodies.
func schemas() object {
	text, number := object{"type": "string"}, object{"type": "number"}
	return object{
		"Error": object{"type": "object", "required": []any{"error"}, "properties": object{"error": text}},
		"Loss": object{"type": "object", "required": []any{"from", "to", "cause"}, "additionalProperties": false, "properties": object{
			"site": text, "telescope": text, "from": object{"type": "string", "description": "UTC such as 2027-02-01T03:00:00Z, or a night"}, "to": text,
			"cause": text, "why": object{"type": "string", "maxLength": 500},
		}},
		"TrialAsk": object{"type": "object", "required": []any{"losses"}, "additionalProperties": false, "properties": object{
			"losses":     object{"type": "array", "maxItems": maxMarks, "items": object{"$ref": "#/components/schemas/Loss"}},
			"now":        object{"type": "string", "description": "instant before which nothing is planned"},
			"hold_hours": number, "stability": object{"type": "number", "minimum": 0, "maximum": 1},
		}},
		"Accept": object{"type": "object", "required": []any{"checksum"}, "additionalProperties": false, "properties": object{
			"checksum": object{"type": "string", "description": "of the trial, as it was shown"},
		}},
	}
}
