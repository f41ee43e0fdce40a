package surveyfile

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"

	"go.yaml.in/yaml/v3"
)

// reader gathers what one Load finds.
type reader struct {
	file   string // the survey file as the caller would open it
	issues []Issue
}

// fault notes something wrong at a node.
func (r *reader) fault(at *yaml.Node, what, want string) {
	r.issues = append(r.issues, Issue{File: r.file, Line: max(1, at.Line), Col: max(1, at.Column), What: what, Want: want})
}

// warn notes a suspicion at a node.
func (r *reader) warn(at *yaml.Node, what, want string) {
	r.fault(at, what, want)
	r.issues[len(r.issues)-1].Warning = true
}

// kindName says in plain words what a node is.
func kindName(n *yaml.Node) string {
	switch n.Kind {
	case yaml.MappingNode:
		return "a group of keys"
	case yaml.SequenceNode:
		return "a list"
	case yaml.ScalarNode:
		if isNull(n) {
			return "empty"
		}
		return strconv.Quote(clip(n.Value))
	}
	return "empty"
}

// clip shortens a text for a message.
func clip(s string) string {
	const most = 60
	if r := []rune(s); len(r) > most {
		return string(r[:most]) + "..."
	}
	return s
}

func isNull(n *yaml.Node) bool { return n.Kind == yaml.ScalarNode && n.Tag == "!!null" }

// resolve follows an alias to what it stands for.
func resolve(n *yaml.Node) *yaml.Node {
	for n.Kind == yaml.AliasNode && n.Alias != nil {
		n = n.Alias
	}
	return n
}

// mapping is a group of keys being read against the specs of its path.
type mapping struct {
	r      *reader
	node   *yaml.Node
	path   string
	title  string // for messages
	specs  []Spec
	values map[string]*yaml.Node // by lower-case key; null values are left out
}

// mapping reads the keys of n, and tells of unknown, doubled and missing
// ones. It is nil when n is no mapping.
func (r *reader) mapping(n *yaml.Node, path, name string) *mapping {
	n = resolve(n)
	if n.Kind != yaml.MappingNode {
		r.fault(n, name+" is "+kindName(n), "want its keys: "+strings.Join(keysAt(path), ", "))
		return nil
	}
	m := &mapping{r: r, node: n, path: path, title: name, specs: specsAt(path), values: map[string]*yaml.Node{}}
	seen := map[string]int{}
	for i := 0; i+1 < len(n.Content); i += 2 {
		key, value := n.Content[i], resolve(n.Content[i+1])
		word := strings.ToLower(key.Value)
		spec := m.spec(word)
		switch line, twice := seen[word]; {
		case key.Kind != yaml.ScalarNode:
			r.fault(key, "a key of "+name+" is "+kindName(key), "want one of "+strings.Join(keysAt(path), ", "))
		case twice:
			r.fault(key, fmt.Sprintf("the key %s is there twice, first on line %d", clip(key.Value), line), "keep one of them")
		case spec == nil:
			r.fault(key, fmt.Sprintf("unknown key %q in %s", clip(key.Value), name), unknownKey(word, path))
			seen[word] = key.Line
		default:
			seen[word] = key.Line
			if !isNull(value) {
				m.values[word] = value
			}
		}
	}
	for i := range m.specs {
		if s := &m.specs[i]; s.Need && m.values[s.Key] == nil {
			r.fault(n, fmt.Sprintf("%s has no %s", name, s.Key), fmt.Sprintf("want %s: %s", s.Key, s.About))
		}
	}
	return m
}

// unknownKey says what would be right instead of a key that is not known.
func unknownKey(word, path string) string {
	keys := keysAt(path)
	for _, s := range specs {
		if s.Key == word && s.Path == "" {
			return "it belongs at the top of the file; keys here: " + strings.Join(keys, ", ")
		} else if s.Key == word {
			return fmt.Sprintf("it belongs in %s; keys here: %s", s.Path, strings.Join(keys, ", "))
		}
	}
	if k, ok := nearest(word, keys); ok {
		return fmt.Sprintf("did you mean %q?", k)
	}
	return "known keys here: " + strings.Join(keys, ", ")
}

func keysAt(path string) []string {
	var keys []string
	for _, s := range specsAt(path) {
		keys = append(keys, s.Key)
	}
	return keys
}

func (m *mapping) spec(key string) *Spec {
	for i := range m.specs {
		if m.specs[i].Key == key {
			return &m.specs[i]
		}
	}
	return nil
}

// say names a key for a message. Short keys that stand in many groups get the
// group's name before them.
func (m *mapping) say(key string) string {
	switch key {
	case "min", "max", "from", "to", "at", "every", "takes", "time", "count", "file":
		return m.title + " " + key
	}
	return key
}

// has reports whether the file gives the key a value.
func (m *mapping) has(key string) bool { return m.values[key] != nil }

// at is the node of a key's value, or of the mapping when it is left out.
func (m *mapping) at(key string) *yaml.Node {
	if n := m.values[key]; n != nil {
		return n
	}
	return m.node
}

// text returns a key's scalar as written, or its default. It is not ok when
// neither is there, or the value is no scalar (told), or "none" where none
// is the default.
func (m *mapping) text(key, want string) (string, bool) {
	spec := m.spec(key)
	n := m.values[key]
	if n == nil {
		return spec.Default, spec.Default != "" && spec.Default != "none"
	}
	if n.Kind != yaml.ScalarNode {
		m.r.fault(n, m.say(key)+" is "+kindName(n), want)
		return "", false
	}
	if spec.Default == "none" && isNone(n.Value) {
		return "", false
	}
	return n.Value, true
}

// span is an allowed range of numbers.
type span struct {
	low, high float64
	openLow   bool   // low itself is not allowed
	openHigh  bool   // high itself is not allowed
	unit      string // for messages, with its leading space
}

func (s span) holds(v float64) bool {
	return v >= s.low && v <= s.high && (!s.openLow || v > s.low) && (!s.openHigh || v < s.high)
}

// want says which numbers are right.
func (s span) want(format func(float64) string) string {
	low, high := format(s.low), format(s.high)
	switch {
	case math.IsInf(s.high, 1) && s.openLow:
		return "want more than " + low + s.unit
	case math.IsInf(s.high, 1):
		return "want " + low + s.unit + " or more"
	case s.openLow && s.openHigh:
		return "want more than " + low + " and less than " + high + s.unit
	case s.openLow:
		return "want more than " + low + " and at most " + high + s.unit
	case s.openHigh:
		return "want from " + low + " to below " + high + s.unit
	}
	return "want " + low + " to " + high + s.unit
}

func plain(v float64) string { return strconv.FormatFloat(v, 'f', -1, 64) }

// number reads a key's number.
func (m *mapping) number(key string, in span) (float64, bool) {
	text, ok := m.text(key, in.want(plain))
	if !ok {
		return 0, false
	}
	v, err := parseNumber(text)
	if err == nil && !in.holds(v) {
		m.r.fault(m.at(key), fmt.Sprintf("%s is %s", m.say(key), clip(text)), in.want(plain))
		return 0, false
	}
	if err != nil {
		m.r.fault(m.at(key), fmt.Sprintf("%s: %q %s", m.say(key), clip(text), err), in.want(plain))
		return 0, false
	}
	return v, true
}

// integer reads a key's whole number.
func (m *mapping) integer(key string, low, high int) (int, bool) {
	in := span{low: float64(low), high: float64(high)}
	text, ok := m.text(key, in.want(plain))
	if !ok {
		return 0, false
	}
	v, err := strconv.Atoi(strings.TrimSpace(text))
	if err != nil {
		m.r.fault(m.at(key), fmt.Sprintf("%s: %q is no whole number", m.say(key), clip(text)), in.want(plain))
		return 0, false
	}
	if v < low || v > high {
		m.r.fault(m.at(key), fmt.Sprintf("%s is %d", m.say(key), v), in.want(plain))
		return 0, false
	}
	return v, true
}

// duration reads a key's duration, s.
func (m *mapping) duration(key string, in span) (float64, bool) {
	text, ok := m.text(key, wantDuration)
	if !ok {
		return 0, false
	}
	v, err := parseDuration(text)
	if errors.Is(err, errNegative) {
		m.r.fault(m.at(key), fmt.Sprintf("%s is %s", m.say(key), clip(text)), in.want(formatDuration))
		return 0, false
	}
	if err != nil {
		m.r.fault(m.at(key), fmt.Sprintf("%s: %q %s", m.say(key), clip(text), err), wantDuration)
		return 0, false
	}
	if !in.holds(v) {
		m.r.fault(m.at(key), fmt.Sprintf("%s is %s", m.say(key), clip(text)), in.want(formatDuration))
		return 0, false
	}
	return v, true
}

// word reads a key that must be one of a few words; case does not count.
func (m *mapping) word(key string, words []string) (int, bool) {
	text, ok := m.text(key, "want one of "+strings.Join(words, ", "))
	if !ok {
		return 0, false
	}
	for i, w := range words {
		if strings.EqualFold(text, w) {
			return i, true
		}
	}
	m.r.fault(m.at(key), fmt.Sprintf("%s is %q", m.say(key), clip(text)), "want one of "+strings.Join(words, ", "))
	return 0, false
}

// name reads a key that gives something its name.
func (m *mapping) name(key string) (string, bool) {
	text, ok := m.text(key, "want a name")
	if !ok {
		return "", false
	}
	if fix := badName(text); fix != "" {
		m.r.fault(m.at(key), fmt.Sprintf("%s: %q is no name", m.say(key), clip(text)), fix)
		return "", false
	}
	return text, true
}

// longestName is the limit on names, in bytes.
const longestName = 200

// badName says what a name lacks, or nothing when it will do. The semicolon
// separates names in a field list.
func badName(s string) string {
	switch {
	case s == "":
		return "want at least one letter"
	case len(s) > longestName:
		return fmt.Sprintf("want at most %d bytes", longestName)
	case strings.TrimSpace(s) != s:
		return "want no spaces around it"
	case strings.Contains(s, ";"):
		return "want none with a semicolon, which separates names"
	}
	for _, c := range s {
		if c < ' ' || c == 0x7f || c == '\uFFFD' {
			return "want letters, digits, spaces and signs of UTF-8 only"
		}
	}
	return ""
}

// list returns a key's items; none when it is left out. A value that is no
// list is a fault.
func (m *mapping) list(key, want string) []*yaml.Node {
	n := m.values[key]
	if n == nil {
		return nil
	}
	if n.Kind == yaml.ScalarNode && strings.EqualFold(n.Value, m.spec(key).Default) {
		return nil // "none" or "all", spelt out
	}
	if n.Kind != yaml.SequenceNode {
		m.r.fault(n, key+" is "+kindName(n), want)
		return nil
	}
	items := make([]*yaml.Node, len(n.Content))
	for i := range n.Content {
		items[i] = resolve(n.Content[i])
	}
	return items
}

// isNone reports the word that stands for no limit.
func isNone(s string) bool { return strings.EqualFold(strings.TrimSpace(s), "none") }

// group reads a key's group of keys, none of which must be there; when the
// key is left out, every one has its default.
func (m *mapping) group(key, path string) *mapping {
	if n := m.values[key]; n != nil {
		if g := m.r.mapping(n, path, key); g != nil {
			return g
		}
	}
	empty := &yaml.Node{Kind: yaml.MappingNode, Line: m.node.Line, Column: m.node.Column}
	return m.r.mapping(empty, path, key)
}

// items returns a list that must have at least one item, each a group.
func (m *mapping) items(key, one string) []*yaml.Node {
	items := m.list(key, "want a list of "+key+", each after a dash")
	if n := m.values[key]; n != nil && n.Kind == yaml.SequenceNode && len(items) == 0 {
		m.r.fault(n, key+" is empty", "want at least one "+one)
	}
	return items
}

// label names an item for messages: by its name when it has one, else by
// its place.
func label(kind string, i int, n *yaml.Node) string {
	if n.Kind == yaml.MappingNode {
		for k := 0; k+1 < len(n.Content); k += 2 {
			if v := resolve(n.Content[k+1]); strings.EqualFold(n.Content[k].Value, "name") && v.Kind == yaml.ScalarNode && !isNull(v) {
				return kind + " " + clip(v.Value)
			}
		}
	}
	return fmt.Sprintf("%s %d", kind, i+1)
}
