package validation

import (
	"context"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"
	"unicode/utf8"
)

// pages hold commands and what they print. Before such a block stands a line
//
//	<!-- run: COMMAND; status: N; show: Section, Section -->
//
// COMMAND is run by the shell in the root of the module with the program on the
// path. The block after it holds the output, or the named sections of it; the
// flag -update writes it anew.
var pages = []string{"../../README.md", "../guide.md", "../model-format.md", "../json.md"}

var runLine = regexp.MustCompile(`^<!-- run: (.*?)(?:; status: (\d+))?(?:; show: (.*?))? -->$`)

// TestPages runs every command of the documentation.
func TestPages(t *testing.T) {
	bin := build(t)
	blocks := 0
	for _, page := range pages {
		b, err := os.ReadFile(page)
		if err != nil {
			t.Fatal(err)
		}
		lines := strings.Split(string(b), "\n")
		var out []string
		for i := 0; i < len(lines); i++ {
			out = append(out, lines[i])
			m := runLine.FindStringSubmatch(lines[i])
			if m == nil {
				continue
			}
			begin := i + 1
			for begin < len(lines) && !strings.HasPrefix(lines[begin], "```") {
				begin++
			}
			end := begin + 1
			for end < len(lines) && lines[end] != "```" {
				end++
			}
			if end >= len(lines) {
				t.Fatalf("%s:%d: no block follows", page, i+1)
			}
			blocks++
			got := runShell(t, bin, m[1], m[2], m[3])
			want := strings.Join(lines[begin+1:end], "\n")
			if !*update && got != want {
				t.Errorf("%s:%d: `%s` prints something else; write the page anew with go test ./docs/validation -run TestPages -update\n%s", page, i+1, m[1], got)
			}
			out = append(out, lines[i+1:begin+1]...)
			out = append(out, got, "```")
			i = end
		}
		if *update {
			if err := os.WriteFile(page, []byte(strings.Join(out, "\n")), 0o644); err != nil {
				t.Fatal(err)
			}
		}
	}
	if blocks < 5 {
		t.Errorf("%d blocks of output in the documentation", blocks)
	}
}

// build compiles the program into a folder of the test.
func build(t *testing.T) string {
	t.Helper()
	bin := t.TempDir()
	c := exec.Command("go", "build", "-o", filepath.Join(bin, "epslim"), "./cmd/epslim")
	c.Dir = "../.."
	if out, err := c.CombinedOutput(); err != nil {
		t.Fatalf("%v\n%s", err, out)
	}
	return bin
}

// runShell gives what a command prints, standard error after standard output.
func runShell(t *testing.T, bin, command, status, show string) string {
	t.Helper()
	ctx, cancel := context.WithTimeout(context.Background(), timeLimit)
	defer cancel()
	c := exec.CommandContext(ctx, "sh", "-c", command)
	c.Dir = "../.."
	c.Env = append(os.Environ(), "PATH="+bin+":"+os.Getenv("PATH"), "NO_COLOR=1")
	var stdout, stderr strings.Builder
	c.Stdout, c.Stderr = &stdout, &stderr
	err := c.Run()
	code, _ := strconv.Atoi(status)
	if got := c.ProcessState.ExitCode(); got != code {
		t.Errorf("`%s` ends with status %d (%v), want %d", command, got, err, code)
	}
	text := stdout.String() + stderr.String()
	if show != "" {
		text = sections(t, command, text, strings.Split(show, ", "))
	}
	return strings.Trim(text, "\n")
}

// sections picks parts of a text output by their headings: lines that are not
// indented and whose next line is.
func sections(t *testing.T, command, text string, names []string) string {
	t.Helper()
	lines := strings.Split(text, "\n")
	var out []string
	for _, name := range names {
		begin := -1
		for i, l := range lines {
			if l == name {
				begin = i
			}
		}
		if begin < 0 {
			t.Errorf("`%s` prints no section %q", command, name)
			continue
		}
		end := begin + 1
		for end < len(lines) && (lines[end] == "" || strings.HasPrefix(lines[end], " ")) {
			end++
		}
		out = append(out, strings.TrimRight(strings.Join(lines[begin:end], "\n"), "\n"))
	}
	return strings.Join(out, "\n\n")
}

// TestPagesWidth keeps the output blocks readable on a page.
func TestPagesWidth(t *testing.T) {
	for _, page := range pages {
		b, err := os.ReadFile(page)
		if err != nil {
			t.Fatal(err)
		}
		for i, l := range strings.Split(string(b), "\n") {
			if n := utf8.RuneCountInString(l); n > 140 && !strings.HasPrefix(l, "|") && !strings.HasPrefix(l, "<!--") {
				t.Errorf("%s:%d: %d characters", page, i+1, n)
			}
		}
	}
}

// TestLinks follows the links between the pages.
func TestLinks(t *testing.T) {
	link := regexp.MustCompile(`\]\(([^)#]+)(#[^)]*)?\)`)
	files, err := filepath.Glob("../*.md")
	if err != nil {
		t.Fatal(err)
	}
	n := 0
	for _, page := range append(files, "../../README.md", "../../DEVELOPERS.md") {
		b, err := os.ReadFile(page)
		if err != nil {
			t.Fatal(err)
		}
		for _, m := range link.FindAllStringSubmatch(string(b), -1) {
			if strings.Contains(m[1], "://") || strings.HasPrefix(filepath.Base(page), "validation") {
				continue
			}
			n++
			if _, err := os.Stat(filepath.Join(filepath.Dir(page), m[1])); err != nil {
				t.Errorf("%s: %v", page, err)
			}
		}
	}
	if n < 10 {
		t.Errorf("%d links", n)
	}
}

// TestKeys looks for every member of the machine-readable result in the page that
// describes it.
func TestKeys(t *testing.T) {
	page, err := os.ReadFile("../json.md")
	if err != nil {
		t.Fatal(err)
	}
	key := regexp.MustCompile(`(?m)^ *"([a-z0-9_]+)":`)
	bin := build(t)
	for _, command := range []string{
		"epslim derive docs/examples/handed.ito --format json --at x=0.1,y=0.2",
		"epslim derive docs/examples/current.ito --format json || true",
		"epslim derive docs/examples/current.ito --moving-frame --format json",
		"epslim derive docs/examples/patient.ito --order 2 --format json",
		`printf 'slow x\nfast theta on circle\ndx = cos(theta) dt\ndtheta = -sin(theta)/eps dt + 1/sqrt(eps) dW1\n' | epslim derive - --format json`,
	} {
		for _, m := range key.FindAllStringSubmatch(runShell(t, bin, command, "0", ""), -1) {
			// names of variables and parameters are no members of the format
			if len(m[1]) <= 2 || m[1] == "omega" || m[1] == "lambda" {
				continue
			}
			if !strings.Contains(string(page), fmt.Sprintf("%q", m[1])) && !strings.Contains(string(page), "`"+m[1]+"`") {
				t.Errorf("docs/json.md does not describe %q", m[1])
			}
		}
	}
}
