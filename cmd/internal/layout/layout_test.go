package layout

import (
	"go/parser"
	"go/token"
	"io/fs"
	"os"
	"path"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
)

const (
	module = "rowstead"
	root   = "../../.."
)

// read parses the imports of every Go file of the module that is not a test,
// whatever its build tags. A folder with its own go.mod is another module and is
// left out.
func read(t *testing.T) Imports {
	t.Helper()
	packages := Imports{}
	err := filepath.WalkDir(root, func(name string, e fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		if e.IsDir() {
			_, other := os.Stat(filepath.Join(name, "go.mod"))
			base := e.Name()
			if name != root && (other == nil || strings.HasPrefix(base, ".") || strings.HasPrefix(base, "_") || base == "testdata") {
				return fs.SkipDir
			}
			return nil
		}
		if !strings.HasSuffix(name, ".go") || strings.HasSuffix(name, "_test.go") {
			return nil
		}
		file, err := parser.ParseFile(token.NewFileSet(), name, nil, parser.ImportsOnly)
		if err != nil {
			return err
		}
		folder, err := filepath.Rel(root, filepath.Dir(name))
		if err != nil {
			return err
		}
		pkg := filepath.ToSlash(folder)
		packages[pkg] = append(packages[pkg], []string{}...)
		for _, spec := range file.Imports {
			target, err := strconv.Unquote(spec.Path.Value)
			if err != nil {
				return err
			}
			if rest, ours := strings.CutPrefix(target, module+"/"); ours && !slices.Contains(packages[pkg], rest) {
				packages[pkg] = append(packages[pkg], rest)
			}
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	return packages
}

func TestImportDirections(t *testing.T) {
	packages := read(t)
	if len(packages) < 10 {
		t.Fatalf("only %d packages found below %s", len(packages), root)
	}
	for _, breach := range packages.Breaches() {
		t.Error(breach)
	}
}

// Folders at the top are fixed.
func TestTopLevel(t *testing.T) {
	entries, err := os.ReadDir(root)
	if err != nil {
		t.Fatal(err)
	}
	want := strings.Fields("cmd proto coordinator worker partition sketch testdata go.mod go.sum README.md DEVELOPERS.md LICENSE")
	for _, e := range entries {
		if name := e.Name(); !strings.HasPrefix(name, ".") && !slices.Contains(want, name) && tracked(name) {
			t.Errorf("%s does not belong at the top", name)
		}
	}
}

// tracked leaves out what a person builds, profiles or solves there (.gitignore).
func tracked(name string) bool {
	if name == module {
		return false
	}
	for _, pattern := range []string{"*.test", "*.prof", "*.out", "*.exe", "*.mtx"} {
		if match, _ := path.Match(pattern, name); match {
			return false
		}
	}
	return true
}

// The rules find what they are for.
func TestBreaches(t *testing.T) {
	got := Imports{
		"worker":               {"coordinator/method", "worker/kernel"},
		"coordinator":          {"coordinator/inproc", "coordinator/method", "partition/matfile"},
		"coordinator/method":   {"worker"},
		"partition":            {"partition/csr"},
		"newcomer":             nil,
		"cmd/rowstead":         {"coordinator/inproc", "worker"},
		"worker/kernel":        {"worker/kernel/internal/a"},
		"sketch/internal/bits": {"sketch", "worker"},
	}.Breaches()
	want := []string{
		"coordinator imports coordinator/inproc", "coordinator/method imports worker", "newcomer has no rule",
		"partition imports partition/csr", "sketch/internal/bits imports worker", "worker imports coordinator/method",
	}
	if !slices.Equal(got, want) {
		t.Errorf("got %q, want %q", got, want)
	}
}
