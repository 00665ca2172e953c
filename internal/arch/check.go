package arch

import (
	"fmt"
	"go/ast"
	"go/parser"
	"go/token"
	"io/fs"
	"path"
	"slices"
	"strconv"
	"strings"
)

const modulePath = "rundle"

// A source is a parsed Go file of the module.
type source struct {
	path    string // within the module, with slashes
	imports []string
	starts  []int // lines of go statements
}

func (s source) pkg() string  { return path.Dir(s.path) }
func (s source) isTest() bool { return strings.HasSuffix(s.path, "_test.go") }

// read parses all Go files of the module. Folders that the go command ignores
// and folders with a go.mod of their own are left out.
func read(root fs.FS) ([]source, error) {
	var out []source
	err := fs.WalkDir(root, ".", func(name string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		if d.IsDir() {
			base := path.Base(name)
			if name != "." && (base[0] == '.' || base[0] == '_' || base == "testdata" || owns(root, name)) {
				return fs.SkipDir
			}
			return nil
		}
		if !strings.HasSuffix(name, ".go") {
			return nil
		}
		s, err := parse(root, name)
		out = append(out, s)
		return err
	})
	return out, err
}

// owns tells whether a folder is the root of another module.
func owns(root fs.FS, dir string) bool {
	_, err := fs.Stat(root, path.Join(dir, "go.mod"))
	return err == nil
}

func parse(root fs.FS, name string) (source, error) {
	text, err := fs.ReadFile(root, name)
	if err != nil {
		return source{}, err
	}
	set := token.NewFileSet()
	file, err := parser.ParseFile(set, name, text, 0)
	if err != nil {
		return source{}, err
	}
	s := source{path: name}
	for _, spec := range file.Imports {
		target, err := strconv.Unquote(spec.Path.Value)
		if err != nil {
			return source{}, err
		}
		s.imports = append(s.imports, target)
	}
	ast.Inspect(file, func(n ast.Node) bool {
		if g, ok := n.(*ast.GoStmt); ok {
			s.starts = append(s.starts, set.Position(g.Pos()).Line)
		}
		return true
	})
	return s, nil
}

// check returns what breaks the rules, one line each.
func check(sources []source) []string {
	var wrong []string
	for _, s := range sources {
		if layer(s.pkg()) < 0 {
			wrong = append(wrong, fmt.Sprintf("%s: package %q stands in no layer", s.path, s.pkg()))
			continue
		}
		for _, target := range s.imports {
			if fault := s.fault(target); fault != "" {
				wrong = append(wrong, fmt.Sprintf("%s: imports %q: %s", s.path, target, fault))
			}
		}
		if s.isTest() || !slices.Contains(core, s.pkg()) || slices.Contains(starters, s.pkg()) {
			continue
		}
		for _, line := range s.starts {
			wrong = append(wrong, fmt.Sprintf("%s:%d: starts a goroutine: only %v may", s.path, line, starters))
		}
	}
	return wrong
}

// layer returns the position of a package in the table, -1 if it has none.
func layer(pkg string) int {
	return slices.IndexFunc(layers, func(line []string) bool {
		return slices.ContainsFunc(line, func(entry string) bool {
			below, all := strings.CutSuffix(entry, "/...")
			return pkg == below || all && strings.HasPrefix(pkg, below+"/")
		})
	})
}

func (s source) fault(target string) string {
	within, ours := strings.CutPrefix(target, modulePath+"/")
	switch {
	case ours || target == modulePath:
		return s.inner(within)
	case s.isTest() || !slices.Contains(core, s.pkg()) || !strings.Contains(strings.Split(target, "/")[0], "."):
		return ""
	case belongs(target, netlibModule):
		if s.pkg() != netlibPackage {
			return "only " + netlibPackage + " may"
		}
		return ""
	case slices.ContainsFunc(coreModules, func(m string) bool { return belongs(target, m) }):
		return ""
	}
	return fmt.Sprintf("the core depends on the standard library and %v alone", coreModules)
}

func belongs(target, module string) bool {
	return target == module || strings.HasPrefix(target, module+"/")
}

// inner judges an import within the module.
func (s source) inner(target string) string {
	from, to := layer(s.pkg()), layer(target)
	switch {
	case slices.Contains(testOnly, target):
		if s.isTest() || slices.Contains(judges, s.pkg()) {
			return ""
		}
		return "only test files may"
	case to < 0:
		return "it stands in no layer"
	case s.pkg() == target: // an external test of the package
		return ""
	case to <= from:
		return "it lies above or beside"
	}
	return ""
}

// strangers returns the entries of the root that do not belong there. ignored
// are the patterns of .gitignore.
func strangers(entries []fs.DirEntry, ignored []string) []string {
	var out []string
	for _, e := range entries {
		name := e.Name()
		if name[0] == '.' || slices.Contains(topLevel, name) {
			continue
		}
		if slices.ContainsFunc(ignored, func(pattern string) bool {
			ok, err := path.Match(strings.Trim(pattern, "/"), name)
			return ok && err == nil
		}) {
			continue
		}
		out = append(out, name)
	}
	return out
}
