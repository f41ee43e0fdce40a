package page

import (
	"encoding/json"
	"fmt"
	"net/http"
	"strings"
	"testing"
)

const lossOfC1 = `{"losses":[{"telescope":"C1","from":"2027-03-09","to":"2027-03-09","cause":"weather","why":"cloud <b>"}],"now":"2027-03-08T12:00:00Z","hold_hours":0,"stability":0.5}`

// TestTrial goes the whole way: mark, plan again, look, throw away; again, accept.
func TestTrial(t *testing.T) {
	d := newDesk(t)
	before := d.files()
	if j := d.run(lossOfC1); j.State != "done" {
		t.Fatalf("the job: %+v", j)
	}
	if after := d.files(); fmt.Sprint(before) != fmt.Sprint(after) {
		t.Fatal("something was written before it was accepted")
	}
	var trial trialJSON
	d.get("/api/trial", &trial)
	var old, now nightJSON
	d.get("/api/nights/2027-03-09", &old)
	d.get("/api/nights/2027-03-09?plan=trial", &now)
	if len(old.Lanes[0].Visits) == 0 || len(now.Lanes[0].Visits) != 0 {
		t.Errorf("C1 has %d exposures, on trial %d; want some, and none in the lost night", len(old.Lanes[0].Visits), len(now.Lanes[0].Visits))
	}
	if trial.After.Coverage > trial.Before.Coverage || trial.Counts["moved"]+trial.Counts["dropped"]+trial.Counts["new"]+trial.Counts["lost"] == 0 {
		t.Errorf("the trial: %+v", trial)
	}
	if code, text := d.change("DELETE", "/api/trial", ""); code != 200 {
		t.Fatalf("throw away: %d %s", code, text)
	}
	if code, _, _ := d.ask("GET", "/api/trial", ""); code != http.StatusNotFound {
		t.Errorf("thrown away, and still there: %d", code)
	}
	if code, _, _ := d.ask("GET", "/api/nights/2027-03-09?plan=trial", ""); code != http.StatusNotFound {
		t.Errorf("a plan that was thrown away is shown: %d", code)
	}
	if fmt.Sprint(before) != fmt.Sprint(d.files()) {
		t.Error("throwing away wrote something")
	}

	// Without an instant, and with the clock outside the period, it is all of it.
	if j := d.run(`{"losses":[{"telescope":"C1","from":"2027-03-09","to":"2027-03-09","cause":"weather"}]}`); j.State != "done" {
		t.Fatalf("the job: %+v", j)
	}
	d.get("/api/trial", &trial)
	if trial.Now != "2027-03-07T00:00:00Z" {
		t.Errorf("planned from %s; want the period's begin", trial.Now)
	}
	if code, text := d.change("POST", "/api/trial/accept", `{"checksum":"another"}`); code != http.StatusConflict {
		t.Errorf("another plan's checksum: %d %s", code, text)
	}
	body, _ := json.Marshal(acceptJSON{trial.Checksum})
	if code, text := d.change("POST", "/api/trial/accept", string(body)); code != 200 {
		t.Fatalf("accept: %d %s", code, text)
	}
	var sv surveyJSON
	d.get("/api/survey", &sv)
	if sv.Plan.Checksum != trial.Checksum || sv.Trial != nil {
		t.Errorf("accepted %s; the page has %s, trial %v", trial.Checksum, sv.Plan.Checksum, sv.Trial)
	}
	d.get("/api/nights/2027-03-09", &old)
	if len(old.Lanes[0].Visits) != 0 || len(old.Lanes[0].Lost) != 1 || old.Lanes[0].Lost[0].Cause != "weather" {
		t.Errorf("after: %d exposures, lost %+v", len(old.Lanes[0].Visits), old.Lanes[0].Lost)
	}
	if code, _, text := d.ask("GET", "/sheet?telescope=S1&night=2027-03-09&form=txt", ""); code != 200 {
		t.Errorf("a sheet of the new plan: %d %s", code, text)
	}
}

// TestTrialRefusals: what can't be is told at once, and starts nothing.
func TestTrialRefusals(t *testing.T) {
	d := newDesk(t)
	tests := []struct{ body, want string }{
		{`{"losses":[{"from":"2027-03-09","to":"2027-03-09","cause":"weather"}]}`, "one of site and telescope"},
		{`{"losses":[{"telescope":"C1","site":"Salt Mesa","from":"2027-03-09","to":"2027-03-09","cause":"weather"}]}`, "one of site and telescope"},
		{`{"losses":[{"telescope":"Q9","from":"2027-03-09","to":"2027-03-09","cause":"weather"}]}`, "there is no telescope"},
		{`{"losses":[{"telescope":"C1","from":"2027-03-09","to":"2027-03-09","cause":"dragons"}]}`, "dragons"},
		{`{"losses":[{"telescope":"C1","from":"2027-03-09","to":"2027-03-09","cause":"weather","why":"` + strings.Repeat("x", 501) + `"}]}`, "500"},
		{`{"losses":[],"hold_hours":-1}`, "hold_hours"},
		{`{"losses":[],"stability":7}`, "stability"},
		{`{"losses":[],"now":"yesterday"}`, "yesterday"},
		{`{"losses":[` + strings.Repeat(`{"telescope":"C1","from":"a","to":"b","cause":"weather"},`, 200) + `{"telescope":"C1","from":"a","to":"b","cause":"weather"}]}`, "200"},
	}
	for _, tt := range tests {
		code, text := d.change("POST", "/api/trial", tt.body)
		if code < 400 || code >= 500 || !strings.Contains(text, tt.want) {
			t.Errorf("%.80s: %d %s; want %q", tt.body, code, text, tt.want)
		}
	}
	if j := d.run(`{"losses":[{"telescope":"C1","from":"2027-03-10","to":"2027-03-09","cause":"weather"}]}`); j.State != "failed" || !strings.Contains(j.Error, "not after") {
		t.Errorf("an end before its start: %+v", j)
	}
}

// TestTrialMeetsChange: what changed on disk meanwhile isn't overwritten.
func TestTrialMeetsChange(t *testing.T) {
	d := newDesk(t)
	d.run(lossOfC1)
	var trial trialJSON
	d.get("/api/trial", &trial)
	lose(t, d, "S1")
	body, _ := json.Marshal(acceptJSON{trial.Checksum})
	before := d.files()
	if code, text := d.change("POST", "/api/trial/accept", string(body)); code != http.StatusConflict || !strings.Contains(text, "the ledger changed") {
		t.Errorf("%d %s; want a conflict", code, text)
	}
	if fmt.Sprint(before) != fmt.Sprint(d.files()) {
		t.Error("a refused plan wrote something")
	}
}

// TestCancel: work that goes on can be ended, and nothing of it stays.
func TestCancel(t *testing.T) {
	d := newDesk(t, "2027-03-11", "2027-04-20")
	before := d.files()
	code, text := d.change("POST", "/api/trial", lossOfC1)
	if code != http.StatusAccepted {
		t.Fatalf("%d %s", code, text)
	}
	if code, text := d.change("POST", "/api/trial", lossOfC1); code != http.StatusConflict && code != http.StatusAccepted {
		t.Errorf("a second one beside it: %d %s", code, text)
	}
	var j jobState
	if err := json.Unmarshal([]byte(text), &j); err != nil {
		t.Fatal(err)
	}
	if code, text := d.change("DELETE", "/api/jobs/"+itoa(j.ID), ""); code != 200 || !strings.Contains(text, `"cancelled"`) && !strings.Contains(text, `"done"`) {
		t.Errorf("cancel: %d %s", code, text)
	}
	if fmt.Sprint(before) != fmt.Sprint(d.files()) {
		t.Error("cancelled work wrote something")
	}
	if code, _ := d.change("DELETE", "/api/jobs/99", ""); code != http.StatusNotFound {
		t.Errorf("a job that isn't: %d", code)
	}
}
