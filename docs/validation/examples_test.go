package validation

import (
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// refusedExamples are the shipped models that rightly have no limit.
var refusedExamples = map[string]string{
	"current":  "uncentred",
	"twowells": "not-ergodic",
}

// TestExamples derives every shipped example: its claims hold, or it is
// refused for the right reason.
func TestExamples(t *testing.T) {
	files, err := filepath.Glob("../examples/*.ito")
	if err != nil {
		t.Fatal(err)
	}
	if len(files) < 10 {
		t.Fatalf("%d examples", len(files))
	}
	for _, file := range files {
		id := strings.TrimSuffix(filepath.Base(file), ".ito")
		t.Run(id, func(t *testing.T) {
			b, err := os.ReadFile(file)
			if err != nil {
				t.Fatal(err)
			}
			f, err := derive(file, string(b), nil, nil)
			if err != nil {
				t.Fatal(err)
			}
			if len(f.result.System.Starts) == 0 || f.result.System.Title == "" {
				t.Error("an example has a title and initial values")
			}
			if reason := refusedExamples[id]; reason != "" {
				if f.Refused == nil || f.Refused.Reason != reason {
					t.Errorf("not refused as %s", reason)
				}
				return
			}
			if f.Refused != nil {
				t.Fatalf("refused: %s", f.Refused.Reason)
			}
			if len(f.Claims) < 3 {
				t.Errorf("%d claims", len(f.Claims))
			}
			for _, c := range f.Claims {
				if c.Verdict != "proven" && (f.Exact || c.Verdict != "agrees") {
					t.Errorf("claim %s is %s: %s", c.Claim, c.Verdict, c.Reason)
				}
			}
			for _, c := range f.Certificates {
				if c.Status == "failed" {
					t.Errorf("certificate %s: %s", c.What, c.Detail)
				}
			}
		})
	}
}
