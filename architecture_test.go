// Package towpath has no code of its own: this test holds the directions in which its folders may import each other.
package towpath

import (
	"go/parser"
	"go/token"
	"io/fs"
	"path"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"testing"
)

// layers lists the top-level folders from the ground up: a folder imports itself and folders before it.
// proto is generated code that imports nothing of ours.
var layers = []string{"proto", "model", "capability", "bridges", "backends", "broker", "cmd"}

// forbidden lists what the order alone would allow.
var forbidden = []struct{ from, to, why string }{
	{"model", "proto", "the wire contract is the broker's affair"},
	{"capability", "proto", "the wire contract is the broker's affair"},
	{"bridges", "proto", "the wire contract is the broker's affair"},
	{"backends", "proto", "the wire contract is the broker's affair"},
	{"backends", "bridges", "a driver takes what its sheet says and rewrites nothing"},
	{"capability", "model/check", "the planner knows sizes only"},
	{"bridges", "model/check", "a bridge does not grade itself"},
	{"model/check", "model/modeltest", "the examiner has its own arithmetic"},
}

// testOnly lists packages that only tests, and packages for tests, may import.
var testOnly = []string{"model/modeltest", "bridges/bridgetest", "backends/backendtest", "backends/fake", "broker/store/storetest"}

func TestImportDirections(t *testing.T) {
	seen := 0
	err := filepath.WalkDir(".", func(file string, d fs.DirEntry, err error) error {
		if err != nil {
			return err
		}
		if d.IsDir() && (d.Name() == "node_modules" || d.Name() == ".git" || d.Name() == "testdata") {
			return fs.SkipDir
		}
		if !strings.HasSuffix(file, ".go") || !strings.Contains(file, "/") {
			return nil
		}
		from := path.Dir(filepath.ToSlash(file))
		parsed, err := parser.ParseFile(token.NewFileSet(), file, nil, parser.ImportsOnly)
		if err != nil {
			return err
		}
		for _, spec := range parsed.Imports {
			full, _ := strconv.Unquote(spec.Path.Value)
			to, ours := strings.CutPrefix(full, "towpath/")
			if !ours {
				continue
			}
			seen++
			if why := refuse(from, to, strings.HasSuffix(file, "_test.go")); why != "" {
				t.Errorf("%s imports %s: %s", file, full, why)
			}
		}
		return nil
	})
	if err != nil {
		t.Fatal(err)
	}
	if seen < 50 {
		t.Fatalf("only %d imports between our own packages seen: the test looks in the wrong place", seen)
	}
}

// refuse says why a package must not import another, or "" when it may.
func refuse(from, to string, test bool) string {
	forTests := test || slices.ContainsFunc(testOnly, func(p string) bool { return within(from, p) })
	if !forTests && slices.ContainsFunc(testOnly, func(p string) bool { return within(to, p) }) {
		return "only tests may"
	}
	if forTests {
		// Tests, and packages for tests, may look at everything in their layer and below.
		if layer(to) > layer(from) {
			return "tests import downwards, too"
		}
		return ""
	}
	for _, f := range forbidden {
		if within(from, f.from) && within(to, f.to) && !within(from, f.to) {
			return f.why
		}
	}
	if layer(to) < 0 {
		return "the folder has no place in the order of layers"
	}
	if layer(to) > layer(from) {
		return "imports run " + strings.Join(layers, " <- ")
	}
	return ""
}

func within(pkg, folder string) bool { return pkg == folder || strings.HasPrefix(pkg, folder+"/") }

func layer(pkg string) int {
	top, _, _ := strings.Cut(pkg, "/")
	return slices.Index(layers, top)
}

func TestRefusalsAreNoticed(t *testing.T) {
	for _, c := range []struct {
		from, to string
		test     bool
		ok       bool
	}{
		{"broker", "bridges", false, true},
		{"bridges", "broker", false, false},
		{"backends/csdp", "bridges", false, false},
		{"model/check", "bridges", false, false},
		{"model/check", "backends", false, false},
		{"model", "proto/towpath/v1", false, false},
		{"broker/wire", "proto/towpath/v1", false, true},
		{"broker", "backends/fake", false, false},
		{"broker", "backends/fake", true, true},
		{"bridges", "backends/interior", true, false},
		{"bridges/bridgetest", "bridges", false, true},
		{"bridges/bridgetest", "model/check", false, true},
		{"bridges/bridgetest", "backends/interior", false, false},
	} {
		if why := refuse(c.from, c.to, c.test); (why == "") != c.ok {
			t.Errorf("%s imports %s (test: %v): %q", c.from, c.to, c.test, why)
		}
	}
}
