package surveyfile

import (
	"fmt"

	"go.yaml.in/yaml/v3"
)

// names are the names of one kind of thing, by dense id.
type names struct {
	kind, plural string
	list         []string
	lines        []int
	ids          map[string]int
	// unknown says that some name is missing or doubled, or the section could
	// not be read: a name that is not known may be meant, and isn't told.
	unknown bool
}

// add gives the next id to a name, which may be empty after a fault. A name
// that is there already is a fault, and keeps its first meaning.
func (n *names) add(r *reader, at *yaml.Node, name string) {
	id := len(n.list)
	n.list = append(n.list, name)
	n.lines = append(n.lines, at.Line)
	if name == "" {
		n.unknown = true
		return
	}
	if n.ids == nil {
		n.ids = map[string]int{}
	}
	if first, ok := n.ids[name]; ok {
		n.unknown = true
		r.fault(at, fmt.Sprintf("the %s %q is there twice, first on line %d", n.kind, name, n.lines[first]), "give each "+n.kind+" its own name")
		return
	}
	n.ids[name] = id
}

// known lists the names that are not empty.
func (n *names) known() []string {
	var k []string
	for _, s := range n.list {
		if s != "" {
			k = append(k, s)
		}
	}
	return k
}

// find returns the id of a name used at a node, and tells when it is not
// defined.
func (n *names) find(r *reader, at *yaml.Node, name string) (int, bool) {
	if id, ok := n.ids[name]; ok {
		return id, true
	}
	if !n.unknown {
		r.fault(at, fmt.Sprintf("the %s %q is not defined", n.kind, clip(name)), oneOf(name, n.plural, n.known()))
	}
	return 0, false
}

// names reads a list of names of things defined elsewhere; nil when the key is
// left out. A name that is there twice is a fault.
func (m *mapping) names(key string, of *names) []int {
	var ids []int
	seen := map[int]bool{}
	for _, n := range m.list(key, "want a list of "+of.plural+" such as ["+example(of)+"]") {
		if n.Kind != yaml.ScalarNode || isNull(n) {
			m.r.fault(n, "an item of "+key+" is "+kindName(n), "want the name of a "+of.kind)
			continue
		}
		id, ok := of.find(m.r, n, n.Value)
		switch {
		case ok && seen[id]:
			m.r.fault(n, fmt.Sprintf("%q is there twice in %s", n.Value, key), "name each "+of.kind+" once")
		case ok:
			seen[id] = true
			ids = append(ids, id)
		}
	}
	if n := m.values[key]; n != nil && n.Kind == yaml.SequenceNode && len(n.Content) == 0 {
		m.r.fault(n, key+" is empty", "want at least one "+of.kind)
	}
	return ids
}

// example is a name to show.
func example(of *names) string {
	if k := of.known(); len(k) > 0 {
		return k[0]
	}
	return of.kind
}
