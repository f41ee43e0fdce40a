package surveyfile

import (
	"os"
	"path/filepath"
	"strings"
	"testing"

	"nightwright/scenarios/starter"
)

// weatherSurvey is the demo with another line of weather for its first site.
func weatherSurvey(t *testing.T, line string) string {
	t.Helper()
	files, err := starter.Files("demo", 0)
	if err != nil {
		t.Fatal(err)
	}
	text := string(files["survey.yaml"])
	at := strings.Index(text, "    weather: {")
	end := at + strings.IndexByte(text[at:], '\n')
	dir := t.TempDir()
	for name, data := range map[string]string{"survey.yaml": text[:at] + "    weather: " + line + text[end:], "fields.csv": string(files["fields.csv"])} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(data), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	return dir
}

const twelve = "clear: [0.5, 0.5, 0.5, 0.5, 0.5, 0.5, 0.5, 0.5, 0.5, 0.5, 0.5, 1]"

func TestWeatherKeys(t *testing.T) {
	sv, _, issues := Load(weatherSurvey(t, "{"+twelve+", persistence: 10h, region: west, correlation: 0.4, levels: [{share: 0.2, extinction_mag: 0.3}, {share: 0.3, seeing: 1.3}]}"))
	if sv == nil {
		t.Fatal(issues)
	}
	s := &sv.Sites[0]
	if s.Region != "west" || s.Correlation != 0.4 || s.Persistence != 36000 || s.LevelPersistence != 10800 || s.Clear[11] != 1 {
		t.Errorf("%+v", s)
	}
	if len(s.Levels) != 2 || s.Levels[0].Extinction != 0.3 || s.Levels[0].Seeing != 1 || s.Levels[1].Seeing != 1.3 || s.Levels[1].Share != 0.3 {
		t.Errorf("levels %+v", s.Levels)
	}
}

func TestBadWeather(t *testing.T) {
	tests := []struct{ line, want string }{
		{"{" + twelve + ", persistence: 0s}", "persistence"},
		{"{" + strings.Replace(twelve, "0.5, ", "", 1) + ", persistence: 10h}", "clear has 11 values; want 12 numbers from 0 to 1"},
		{"{" + strings.Replace(twelve, "0.5", "-0.1", 1) + ", persistence: 10h}", "clear of January"},
		{"{" + twelve + ", persistence: 10h, correlation: 0.5}", "the correlation has no region to be with"},
		{"{" + twelve + ", persistence: 10h, region: west, correlation: 1.5}", "correlation is 1.5"},
		{"{" + twelve + ", persistence: 10h, levels: [{share: 0.7}, {share: 0.6}]}", "the shares of the levels add up to 1.3; want 1 at most"},
		{"{" + twelve + ", persistence: 10h, levels: [{share: 0.7, seeing: 0.5}]}", "seeing is 0.5"},
		{"{" + twelve + ", persistence: 10h, levels: [{share: 0.7, cloud: 1}]}", `unknown key "cloud"`},
	}
	for _, tt := range tests {
		sv, _, issues := Load(weatherSurvey(t, tt.line))
		var all []string
		for _, i := range issues {
			all = append(all, i.String())
		}
		if text := strings.Join(all, "\n"); sv != nil || !strings.Contains(text, tt.want) || !strings.Contains(text, "survey.yaml:") {
			t.Errorf("%s: %s\nwant %q in it", tt.line, text, tt.want)
		}
	}
}
