package diagnostic

import (
	"errors"
	"strings"
	"testing"
)

func TestNearest(t *testing.T) {
	for _, c := range []struct {
		name       string
		candidates []string
		want       string
	}{
		{"thta", []string{"x", "theta", "beta"}, "theta"},
		{"tehta", []string{"beta", "theta"}, "theta"},
		{"x", []string{"y", "z"}, ""},
		{"X", []string{"y", "x"}, "x"},
		{"postive", []string{"positive", "negative"}, "positive"},
		{"gamma2", []string{"alpha"}, ""},
		{"κ", []string{"Κ"}, "Κ"},
		{"xx", []string{"x"}, "x"},
		{"", []string{"x"}, ""},
	} {
		if got := Nearest(c.name, c.candidates); got != c.want {
			t.Errorf("Nearest(%q, %q) = %q, want %q", c.name, c.candidates, got, c.want)
		}
	}
}

func TestErrorInFull(t *testing.T) {
	d := &Diagnostic{File: "m.ito", Position: Position{2, 8, 4}, Code: UndeclaredName,
		Message: `the name "thta" is not declared`, Nearest: "theta", Text: "dx\t= ω*(thta) dt"}
	want := "m.ito:2:8: the name \"thta\" is not declared [undeclared-name]\n" +
		"    dx = ω*(thta) dt\n" +
		"           ^^^^\n" +
		"    did you mean \"theta\"?"
	if got := d.Error(); got != want {
		t.Errorf("got\n%s\nwant\n%s", got, want)
	}
	if got, want := d.Summary(), `the name "thta" is not declared; did you mean "theta"?`; got != want {
		t.Errorf("summary %q, want %q", got, want)
	}
}

func TestLongLineIsCutAroundTheCaret(t *testing.T) {
	text := strings.Repeat("a + ", 500) + "thta" + strings.Repeat(" + b", 500)
	d := &Diagnostic{File: "m.ito", Position: Position{1, 2001, 4}, Code: UndeclaredName, Message: "m", Text: text}
	lines := strings.Split(d.Error(), "\n")
	at := strings.Index(lines[2], "^^^^")
	if n := len([]rune(lines[1])); n > 110 {
		t.Errorf("quoted line has %d characters", n)
	}
	if got := string([]rune(lines[1])[at : at+4]); got != "thta" {
		t.Errorf("the caret points at %q", got)
	}
}

func TestListSortsAndDropsRepeats(t *testing.T) {
	at := func(file string, line, col int, msg string) *Diagnostic {
		return &Diagnostic{File: file, Position: Position{line, col, 1}, Code: Syntax, Message: msg}
	}
	l := List{at("m", 3, 1, "c"), at("m", 1, 5, "b"), at("--set", 1, 1, "s"), at("m", 1, 2, "a"), at("m", 1, 5, "b")}
	l.Sort()
	var got []string
	for _, d := range l {
		got = append(got, d.Message)
	}
	if s := strings.Join(got, " "); s != "a b c s" {
		t.Errorf("order %q", s)
	}
	var d *Diagnostic
	if !errors.As(l.Err(), &d) || d.Message != "a" {
		t.Errorf("errors.As gives %v", d)
	}
	if (List{}).Err() != nil {
		t.Error("an empty list is an error")
	}
}

func TestKindsAreDistinct(t *testing.T) {
	seen := map[Code]bool{}
	for _, k := range Kinds() {
		if seen[k.Code] {
			t.Errorf("code %q twice", k.Code)
		}
		seen[k.Code] = true
		if k.Sentence == "" || k.Example == "" {
			t.Errorf("code %q lacks its sentence or its example", k.Code)
		}
	}
}
