package validation

import (
	"context"
	"encoding/json"
	"fmt"
	"os"
	"strconv"
	"strings"
	"time"

	"epslim/cmd/epslim/derivation"
	"epslim/cmd/epslim/present"
	"epslim/generator/ito"
)

// timeLimit bounds one derivation.
const timeLimit = time.Minute

// finding is one run of the program: the machine-readable result, and the
// result behind it.
type finding struct {
	Regime    string
	TimeScale string `json:"time_scale"`
	Method    string
	Exact     bool
	Limit     struct {
		Drift     map[string]*string
		Diffusion map[string]*string
		Terms     map[string][]struct{ Term *string }
	}
	Stationary struct {
		Reversible   *bool
		Density      *string
		Normalizable *bool
		Current      map[string]*string
	}
	Conditions   []string
	Certificates []struct{ What, Status, Detail string }
	Claims       []struct{ Claim, Verdict, Reason string }
	Values       []struct{ Drift, Diffusion map[string]*float64 }
	Refused      *struct {
		Reason string
		Order  float64
		Detail map[string]string
	}

	result *derivation.Result
}

// derive runs the program on a model text.
func derive(name, model string, set, at []string) (*finding, error) {
	ctx, cancel := context.WithTimeout(context.Background(), timeLimit)
	defer cancel()
	sys, err := ito.Parse(name, []byte(model), ito.Options{Set: set})
	if err != nil {
		return nil, err
	}
	res, err := derivation.Run(ctx, sys, derivation.Options{At: at})
	if err != nil {
		return nil, err
	}
	text, err := present.JSON(res, "test")
	if err != nil {
		return nil, err
	}
	f := &finding{result: res}
	if err := json.Unmarshal(text, f); err != nil {
		return nil, fmt.Errorf("the result is no JSON: %w", err)
	}
	return f, nil
}

// entry looks up a diffusion entry under either order of the names.
func entry[T any](m map[string]*T, key string) *T {
	if v, ok := m[key]; ok {
		return v
	}
	a, b, _ := strings.Cut(key, ",")
	return m[b+","+a]
}

func readModel(id string) (string, error) {
	b, err := os.ReadFile("../../generator/ito/testdata/models/" + id + ".ito")
	return string(b), err
}

func number(f float64) string { return strconv.FormatFloat(f, 'g', -1, 64) }

// firstLine shortens an error.
func firstLine(err error) string {
	s, _, _ := strings.Cut(err.Error(), "\n")
	if len(s) > 160 {
		s = s[:160] + "..."
	}
	return s
}
