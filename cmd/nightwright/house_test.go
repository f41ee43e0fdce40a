package main

import (
	"fmt"
	"go/ast"
	"go/parser"
	"go/token"
	"io/fs"
	"os"
	"path/filepath"
	"regexp"
	"slices"
	"strconv"
	"strings"
	"testing"
)

// The house rules, run as a test. Each breach says what to do instead. What
// the rules are for stands in DEVELOPERS.md.

const (
	maxFileLines = 400
	maxFuncLines = 100
	requireAll   = "NIGHTWRIGHT_REQUIRE_ALL"
)

// rooms lists the top folders from the bottom of the house to its top; a room
// imports from itself and from those before it.
var rooms = []string{"visibility", "constraints", "scheduler", "scenarios", "cmd"}

// lower lists packages that stand below the others of their room.
var lower = map[string][]string{
	"visibility/ephemeris": {"visibility"},
	"constraints/survey":   {"constraints", "constraints/mount"},
	"scheduler/model":      {"scheduler", "scheduler/dual", "scheduler/search", "scheduler/night", "scheduler/audit", "scheduler/tables"},
	"scheduler/audit":      {"scheduler", "scheduler/dual", "scheduler/search", "scheduler/night"},
}

// auditBans are the fast ways the judge may not take: it recomputes.
var auditBans = map[string]string{
	"visibility.NewSky":      "visibility.Exact",
	"constraints.NewWindows": "the rules' own predicates",
	"mount.Gap":              "the audit's own plain slew",
}

// source is one parsed Go file of the tree.
type source struct {
	path    string // slash path from the top of the tree
	dir     string
	test    bool
	made    bool // generated
	lines   int
	file    *ast.File
	imports map[string]string // local name -> path
}

func readTree(t *testing.T) (*token.FileSet, []*source) {
	t.Helper()
	top := filepath.Join("..", "..")
	fset := token.NewFileSet()
	var all []*source
	err := filepath.WalkDir(top, func(p string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		name := d.Name()
		if d.IsDir() && p != top && (strings.HasPrefix(name, ".") || name == "testdata" || name == "node_modules") {
			return filepath.SkipDir
		}
		if d.IsDir() || !strings.HasSuffix(name, ".go") {
			return nil
		}
		text, err := os.ReadFile(p)
		if err != nil {
			return err
		}
		f, err := parser.ParseFile(fset, p, text, parser.ParseComments)
		if err != nil {
			return err
		}
		rel, err := filepath.Rel(top, p)
		if err != nil {
			return err
		}
		s := &source{
			path: filepath.ToSlash(rel), dir: filepath.ToSlash(filepath.Dir(rel)), test: strings.HasSuffix(name, "_test.go"),
			made: ast.IsGenerated(f), lines: strings.Count(string(text), "\n"), file: f, imports: map[string]string{},
		}
		for _, im := range f.Imports {
			path, _ := strconv.Unquote(im.Path.Value)
			local := path[strings.LastIndex(path, "/")+1:]
			if im.Name != nil {
				local = im.Name.Name
			}
			s.imports[local] = path
		}
		all = append(all, s)
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	if len(all) < 20 {
		t.Fatalf("only %d Go files found under %s; the walk is broken", len(all), top)
	}
	return fset, all
}

// selectors calls f for each use of pkg.Name in the file, pkg being an import.
func (s *source) selectors(f func(path, name string, pos token.Pos)) {
	ast.Inspect(s.file, func(n ast.Node) bool {
		if sel, ok := n.(*ast.SelectorExpr); ok {
			if id, ok := sel.X.(*ast.Ident); ok && id.Obj == nil {
				if path, ok := s.imports[id.Name]; ok {
					f(path, sel.Sel.Name, sel.Pos())
				}
			}
		}
		return true
	})
}

func TestHouseImportDirection(t *testing.T) {
	_, all := readTree(t)
	for _, s := range all {
		if s.test { // a test may fetch a real survey from above
			continue
		}
		if bad := importBreach(s.dir, s.imports); bad != "" {
			t.Errorf("%s: %s", s.path, bad)
		}
	}
}

// importBreach says what is wrong with the imports of a package, or "".
func importBreach(dir string, imports map[string]string) string {
	rank := slices.Index(rooms, strings.Split(dir, "/")[0])
	if rank < 0 {
		return fmt.Sprintf("stands outside the rooms %v; move it into one of them", rooms)
	}
	var bad []string
	for _, path := range imports {
		rel, ok := strings.CutPrefix(path, "nightwright/")
		if !ok {
			continue
		}
		if other := slices.Index(rooms, strings.Split(rel, "/")[0]); other > rank {
			bad = append(bad, fmt.Sprintf("imports %s, which stands above it; move what both need down, or hand it in as an argument", rel))
		}
		if slices.Contains(lower[dir], rel) {
			bad = append(bad, fmt.Sprintf("imports %s, which it must not know; hand in what it needs as an argument", rel))
		}
	}
	slices.Sort(bad)
	return strings.Join(bad, "; ")
}

func TestHouseCorePackagesAreSilent(t *testing.T) {
	bans := map[string]string{
		"time.Now": "take the instant as an argument", "time.Since": "measure in cmd", "time.Until": "measure in cmd",
		"fmt.Print": "return the value, or take an io.Writer", "fmt.Printf": "return the value, or take an io.Writer", "fmt.Println": "return the value, or take an io.Writer",
		"os.Exit": "return an error", "os.Getenv": "take a setting as an argument", "os.LookupEnv": "take a setting as an argument", "os.Environ": "take a setting as an argument",
		"os.Stdout": "take an io.Writer", "os.Stderr": "take an io.Writer", "os.Stdin": "take an io.Reader",
	}
	fset, all := readTree(t)
	exits := map[string]int{} // by folder
	for _, s := range all {
		if s.test {
			continue
		}
		inCmd := strings.HasPrefix(s.dir, "cmd")
		if s.imports["log"] == "log" {
			t.Errorf("%s: imports log; return an error or report through the progress callback", s.path)
		}
		s.selectors(func(path, name string, pos token.Pos) {
			full := path + "." + name
			if full == "os.Exit" && inCmd {
				if exits[s.dir]++; !strings.HasSuffix(s.path, "/main.go") || exits[s.dir] > 1 {
					t.Errorf("%s: os.Exit; return an error, the one exit is in main of main.go", fset.Position(pos))
				}
			}
			if instead, ok := bans[full]; ok && !inCmd {
				t.Errorf("%s: %s outside cmd; %s", fset.Position(pos), full, instead)
			}
			if instead, ok := auditBans[path[strings.LastIndex(path, "/")+1:]+"."+name]; ok && s.dir == "scheduler/audit" {
				t.Errorf("%s: the audit uses %s; use %s", fset.Position(pos), name, instead)
			}
		})
	}
	if n := exits["cmd/nightwright"]; n != 1 {
		t.Errorf("os.Exit is called %d times in cmd/nightwright; want once", n)
	}
}

func TestHouseImports(t *testing.T) {
	_, all := readTree(t)
	mods := readAllowed(t)
	for _, s := range all {
		for _, path := range s.imports {
			switch {
			case path == "math/rand":
				t.Errorf("%s: imports math/rand; use math/rand/v2 with rand.NewPCG(seed, stream)", s.path)
			case strings.HasPrefix(path, "github.com/parquet-go/") && s.dir != "scheduler/tables":
				t.Errorf("%s: imports the Parquet library; use scheduler/tables, the one room that knows it", s.path)
			case strings.HasPrefix(path, "modernc.org/sqlite") && s.dir != "scheduler/ledger":
				t.Errorf("%s: imports SQLite; use scheduler/ledger, the one room that knows it", s.path)
			case path == "C":
				t.Errorf("%s: imports C; the program builds with CGO_ENABLED=0", s.path)
			}
			if first := strings.Split(path, "/")[0]; strings.Contains(first, ".") && !slices.ContainsFunc(mods, func(m string) bool {
				return path == m || strings.HasPrefix(path, m+"/")
			}) {
				t.Errorf("%s: imports %s, which is on no line of testdata/modules.txt; do without it, or add its licence and the reason there", s.path, path)
			}
		}
	}
}

// readAllowed reads testdata/modules.txt and checks go.mod against it both ways.
func readAllowed(t *testing.T) []string {
	t.Helper()
	text, err := os.ReadFile(filepath.Join("testdata", "modules.txt"))
	if err != nil {
		t.Fatal(err)
	}
	licences := []string{"MIT", "BSD-2-Clause", "BSD-3-Clause", "Apache-2.0", "ISC", "MPL-2.0", "Unlicense"}
	var allowed []string
	for i, line := range strings.Split(string(text), "\n") {
		if line = strings.TrimSpace(line); line == "" || strings.HasPrefix(line, "#") {
			continue
		}
		part := strings.SplitN(line, "\t", 3)
		if len(part) != 3 || len(part[2]) < 10 || !slices.Contains(licences, part[1]) {
			t.Errorf("testdata/modules.txt:%d: %q; want module, licence (one of %v) and reason, with a tab between", i+1, line, licences)
			continue
		}
		allowed = append(allowed, part[0])
	}
	mod, err := os.ReadFile(filepath.Join("..", "..", "go.mod"))
	if err != nil {
		t.Fatal(err)
	}
	var required []string
	for _, m := range regexp.MustCompile(`(?m)^(?:require)?\s+(\S+) v\S+`).FindAllStringSubmatch(string(mod), -1) {
		required = append(required, m[1])
		if !slices.Contains(allowed, m[1]) {
			t.Errorf("go.mod requires %s, which is on no line of testdata/modules.txt; do without it, or add its licence and the reason there", m[1])
		}
	}
	for _, m := range allowed {
		if !slices.Contains(required, m) {
			t.Errorf("testdata/modules.txt lists %s, which go.mod doesn't require; take the line out", m)
		}
	}
	return allowed
}

func TestHouseSizes(t *testing.T) {
	fset, all := readTree(t)
	for _, s := range all {
		if s.made {
			continue
		}
		if s.lines > maxFileLines {
			t.Errorf("%s: %d lines; split it by subject, the most is %d", s.path, s.lines, maxFileLines)
		}
		for _, d := range s.file.Decls {
			if f, ok := d.(*ast.FuncDecl); ok && !s.test {
				if n := fset.Position(f.End()).Line - fset.Position(f.Pos()).Line + 1; n > maxFuncLines {
					t.Errorf("%s: %s has %d lines; split it, the most is %d", fset.Position(f.Pos()), f.Name.Name, n, maxFuncLines)
				}
			}
		}
	}
}

func TestHouseSkipsFailWhenAllIsRequired(t *testing.T) {
	fset, all := readTree(t)
	for _, s := range all {
		for _, d := range s.file.Decls {
			f, ok := d.(*ast.FuncDecl)
			if !ok || !s.test {
				continue
			}
			var skip token.Pos
			guarded := false
			ast.Inspect(f, func(n ast.Node) bool {
				switch n := n.(type) {
				case *ast.SelectorExpr:
					if slices.Contains([]string{"Skip", "Skipf", "SkipNow"}, n.Sel.Name) {
						skip = n.Pos()
					}
				case *ast.BasicLit:
					// Alone, as a variable that is read: named in a reason it asks nothing.
					guarded = guarded || n.Value == strconv.Quote(requireAll)
				case *ast.Ident:
					guarded = guarded || n.Name == "requireAll"
				}
				return true
			})
			if skip.IsValid() && !guarded {
				t.Errorf("%s: %s skips without asking %s in the same function; fail when it is 1", fset.Position(skip), f.Name.Name, requireAll)
			}
		}
	}
}
