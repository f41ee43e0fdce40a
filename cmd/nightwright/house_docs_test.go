package main

import (
	"go/ast"
	"go/token"
	"regexp"
	"strings"
	"testing"
)

func TestHouseExportedNamesAreDocumented(t *testing.T) {
	fset, all := readTree(t)
	packageDoc := map[string]bool{}
	for _, s := range all {
		if s.test {
			continue
		}
		packageDoc[s.dir] = packageDoc[s.dir] || s.file.Doc != nil
		for _, d := range s.file.Decls {
			for _, bad := range undocumented(d) {
				t.Errorf("%s: %s has no comment; say what it is, its units, its errors", fset.Position(bad.Pos()), bad.Name)
			}
		}
	}
	for dir, ok := range packageDoc {
		if !ok {
			t.Errorf("%s: no package comment; add a doc.go with its purpose, units and what it never does", dir)
		}
	}
}

// undocumented returns the exported names of a declaration without a comment.
func undocumented(d ast.Decl) []*ast.Ident {
	var bad []*ast.Ident
	switch d := d.(type) {
	case *ast.FuncDecl:
		if d.Name.IsExported() && d.Doc == nil && exportedReceiver(d) {
			bad = append(bad, d.Name)
		}
	case *ast.GenDecl:
		for _, spec := range d.Specs {
			switch spec := spec.(type) {
			case *ast.TypeSpec:
				if spec.Name.IsExported() && d.Doc == nil && spec.Doc == nil {
					bad = append(bad, spec.Name)
				}
			case *ast.ValueSpec:
				for _, n := range spec.Names {
					if n.IsExported() && d.Doc == nil && spec.Doc == nil && spec.Comment == nil {
						bad = append(bad, n)
					}
				}
			}
		}
	}
	return bad
}

// exportedReceiver is true for functions and for methods of exported types.
func exportedReceiver(f *ast.FuncDecl) bool {
	if f.Recv == nil {
		return true
	}
	typ := f.Recv.List[0].Type
	for {
		switch x := typ.(type) {
		case *ast.StarExpr:
			typ = x.X
		case *ast.IndexExpr:
			typ = x.X
		case *ast.IndexListExpr:
			typ = x.X
		case *ast.Ident:
			return x.IsExported()
		default:
			return true
		}
	}
}

func TestHouseNothingIsLeftForLater(t *testing.T) {
	fset, all := readTree(t)
	later := regexp.MustCompile(`\b(TO` + `DO|FIX` + `ME|XXX)\b`)
	for _, s := range all {
		for _, group := range s.file.Comments {
			for _, c := range group.List {
				if word := later.FindString(c.Text); word != "" {
					t.Errorf("%s: %s in a comment; do it, or say plainly what the code does not do", fset.Position(c.Pos()), word)
				}
			}
		}
	}
}

// TestHouseRulesBite feeds the rules code that breaks them.
func TestHouseRulesBite(t *testing.T) {
	tests := []struct {
		dir, give string
		want      string
	}{
		{"visibility", "nightwright/constraints", "stands above"},
		{"visibility/ephemeris", "nightwright/visibility", "must not know"},
		{"constraints/survey", "nightwright/constraints/mount", "must not know"},
		{"scheduler/audit", "nightwright/scheduler/search", "must not know"},
		{"scheduler/model", "nightwright/scenarios/surveyfile", "stands above"},
		{"attic", "fmt", "outside the rooms"},
		{"cmd/nightwright", "nightwright/visibility", ""},
		{"scenarios/surveyfile", "nightwright/scheduler/tables", ""},
	}
	for _, tt := range tests {
		got := importBreach(tt.dir, map[string]string{"x": tt.give})
		if (got == "") != (tt.want == "") || !strings.Contains(got, tt.want) {
			t.Errorf("%s importing %s: %q; want %q in it", tt.dir, tt.give, got, tt.want)
		}
	}
	name := ast.NewIdent("Plain")
	if len(undocumented(&ast.GenDecl{Tok: token.TYPE, Specs: []ast.Spec{&ast.TypeSpec{Name: name}}})) != 1 {
		t.Error("a bare exported type is not reported")
	}
}
