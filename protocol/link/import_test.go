package link_test

import (
	"go/ast"
	"go/parser"
	"go/token"
	"io/fs"
	"path/filepath"
	"strings"
	"testing"
)

// TestOnlyThisPackageDials reads every source file of the program: the Modbus client is imported, and a connection dialled,
// in this package and nowhere else. Tests and the devices that tests play are no part of the program.
func TestOnlyThisPackageDials(t *testing.T) {
	root := filepath.Join("..", "..")
	files := 0
	err := filepath.WalkDir(root, func(path string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		in := filepath.ToSlash(filepath.Dir(path))
		if d.IsDir() {
			if strings.HasPrefix(d.Name(), ".") && path != root && d.Name() != ".." {
				return filepath.SkipDir
			}
			return nil
		}
		if !strings.HasSuffix(path, ".go") || strings.HasSuffix(path, "_test.go") || in == "../../protocol/link" ||
			in == "../../protocol/link/linktest" {
			return nil
		}
		files++
		file, err := parser.ParseFile(token.NewFileSet(), path, nil, 0)
		if err != nil {
			return err
		}
		netNames := map[string]bool{}
		for _, i := range file.Imports {
			name := strings.Trim(i.Path.Value, `"`)
			switch {
			case strings.HasPrefix(name, "github.com/goburrow/"):
				t.Errorf("%s imports %s, which only protocol/link may", path, name)
			case name == "net/http" || name == "net/rpc" || name == "crypto/tls" || name == "golang.org/x/net":
				t.Errorf("%s imports %s, which can dial", path, name)
			case name == "net":
				netNames["net"] = true
				if i.Name != nil {
					netNames[i.Name.Name] = true
				}
			}
		}
		ast.Inspect(file, func(n ast.Node) bool {
			s, ok := n.(*ast.SelectorExpr)
			if !ok {
				return true
			}
			x, ok := s.X.(*ast.Ident)
			if ok && netNames[x.Name] && strings.HasPrefix(s.Sel.Name, "Dial") && !isAgent(path) {
				t.Errorf("%s uses %s.%s, which only protocol/link may", path, x.Name, s.Sel.Name)
			}
			return true
		})
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	if files < 20 {
		t.Errorf("%d source files read, want the whole program", files)
	}
}

// isAgent tells the files that may speak to the SSH agent over its local socket, which is no device.
func isAgent(path string) bool {
	return strings.HasPrefix(filepath.ToSlash(path), "../../commission/signing/agent")
}
