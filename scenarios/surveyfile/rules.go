package surveyfile

import (
	"math"

	"go.yaml.in/yaml/v3"

	"nightwright/constraints/survey"
)

// ruleSpec ties a rule's key in the file to the rule.
type ruleSpec struct {
	rule  survey.Rule
	key   string
	in    span    // of the file's value
	scale float64 // from the file's unit to the survey's
	none  float64 // what "none" stands for, survey's unit; 0: "none" is not allowed
}

var ruleSpecs = []ruleSpec{
	{survey.RuleAltitudeMin, "altitude_min_deg", span{low: 0, high: 90, openHigh: true, unit: " degrees"}, degree, 0},
	{survey.RuleAirmassMax, "airmass_max", span{low: 1, high: 40}, 1, math.Inf(1)},
	{survey.RuleSunAltitudeMax, "sun_altitude_max_deg", span{low: -90, high: -5, unit: " degrees"}, degree, 0},
	{survey.RuleMoonSeparationMin, "moon_separation_min_deg", span{low: 0, high: 180, unit: " degrees"}, degree, 0},
	{survey.RuleMoonIlluminationMax, "moon_illumination_max", span{low: 0, high: 1}, 1, 0},
	{survey.RuleHourAngleMax, "hour_angle_max_h", span{low: 0, high: 12, openLow: true, unit: " hours"}, 15 * degree, math.Inf(1)},
	{survey.RuleMinQuality, "min_quality", span{low: 0, high: 1}, 1, 0},
}

// override is one rule set anew.
type override struct {
	rule  survey.Rule
	value float64 // survey's unit
}

// apply sets each override in turn.
func apply(rules survey.Rules, overrides []override) survey.Rules {
	for _, o := range overrides {
		switch o.rule {
		case survey.RuleAltitudeMin:
			rules.AltitudeMin = o.value
		case survey.RuleAirmassMax:
			rules.AirmassMax = o.value
		case survey.RuleSunAltitudeMax:
			rules.SunAltitudeMax = o.value
		case survey.RuleMoonSeparationMin:
			rules.MoonSeparationMin = o.value
		case survey.RuleMoonIlluminationMax:
			rules.MoonIlluminationMax = o.value
		case survey.RuleHourAngleMax:
			rules.HourAngleMax = o.value
		case survey.RuleMinQuality:
			rules.MinQuality = o.value
		}
	}
	return rules
}

// rules reads the rules that a group of keys sets, or has by default.
func (m *mapping) rules() []override {
	var set []override
	for _, s := range ruleSpecs {
		if v, ok := m.number(s.key, s.in); ok {
			set = append(set, override{s.rule, v * s.scale})
		} else if n := m.values[s.key]; s.none != 0 && (n == nil && m.spec(s.key).Default == "none" && m.path == "rules" || n != nil && saysNone(n)) {
			set = append(set, override{s.rule, s.none})
		}
	}
	return set
}

// baseRules are the survey's own, over the defaults.
func (l *loader) baseRules(m *mapping) survey.Rules {
	return apply(survey.Rules{}, m.group("rules", "rules").rules())
}

// overrides reads the rules key of a program or demand.
func (m *mapping) overrides() []override {
	return m.group("rules", m.path+".rules").rules()
}

func saysNone(n *yaml.Node) bool { return n.Kind == yaml.ScalarNode && isNone(n.Value) }
