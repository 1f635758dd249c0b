package capability_test

import (
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

var rewrite = flag.Bool("rewrite", false, "write what plans print into testdata/plan; review the difference like code")

// TestPlanGoldens plans every task in testdata/plan and compares what is printed with what its file expects.
func TestPlanGoldens(t *testing.T) {
	files, err := filepath.Glob("testdata/plan/*.txt")
	if err != nil || len(files) < 10 {
		t.Fatalf("%d tasks found, error %v", len(files), err)
	}
	for _, file := range files {
		t.Run(strings.TrimSuffix(filepath.Base(file), ".txt"), func(t *testing.T) {
			raw, err := os.ReadFile(file)
			if err != nil {
				t.Fatal(err)
			}
			task, want, ok := strings.Cut(string(raw), "expect=\n")
			if !ok || !strings.HasPrefix(task, "# ") {
				t.Fatal("a task starts with a comment that says what to look at, and has a line 'expect='")
			}
			p := &planFile{}
			if err := p.read(task); err != nil {
				t.Fatal(err)
			}
			got := ""
			for _, x := range p.plan() {
				got += x.String()
				if x.Route != nil {
					checkRoute(t, x.Route, p.rules)
				}
			}
			if lines := strings.Count(got, "\n"); lines > 25 {
				t.Errorf("%d lines are printed, which nobody reviews", lines)
			}
			if *rewrite {
				if err := os.WriteFile(file, []byte(task+"expect=\n"+got), 0o644); err != nil {
					t.Fatal(err)
				}
				return
			}
			if got != want {
				t.Errorf("printed:\n%s\nexpected:\n%s", got, want)
			}
		})
	}
}
