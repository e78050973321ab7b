package syntax

import (
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

var update = flag.Bool("update", false, "rewrite the golden files")

func TestFormatGolden(t *testing.T) {
	files, err := filepath.Glob("testdata/format/*.ito")
	if err != nil || len(files) == 0 {
		t.Fatal("no files", err)
	}
	for _, file := range files {
		src, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		got, err := Format(filepath.Base(file), src, Limits{})
		if err != nil {
			t.Errorf("%s: %v", file, err)
			continue
		}
		golden := strings.TrimSuffix(file, ".ito") + ".golden"
		if *update {
			if err := os.WriteFile(golden, got, 0o644); err != nil {
				t.Fatal(err)
			}
		}
		want, err := os.ReadFile(golden)
		if err != nil {
			t.Fatal(err)
		}
		if string(got) != string(want) {
			t.Errorf("%s: got\n%s\nwant\n%s", file, got, want)
		}
		checkFormat(t, src)
	}
}

// checkFormat asserts what Format promises: the same statements, the same
// comments, and nothing left to change.
func checkFormat(t *testing.T, src []byte) {
	t.Helper()
	before, errs := Parse("model", src, Limits{})
	if len(errs) > 0 {
		return
	}
	text, err := Format("model", src, Limits{})
	if err != nil {
		t.Fatalf("formatting\n%s\nfails: %v", src, err)
	}
	after, errs := Parse("model", text, Limits{})
	if len(errs) > 0 {
		t.Fatalf("the formatted text of\n%q\nis\n%q\nand has errors:\n%v", src, text, errs)
	}
	if len(before.Statements) != len(after.Statements) {
		t.Fatalf("%q: %d statements become %d in %q", src, len(before.Statements), len(after.Statements), text)
	}
	for i := range before.Statements {
		a, b := describe(before.Statements[i]), describe(after.Statements[i])
		if a != b {
			t.Fatalf("%q: statement\n%s\nbecomes\n%s", src, a, b)
		}
	}
	if a, b := comments(before), comments(after); a != b {
		t.Fatalf("%q: comments\n%s\nbecome\n%s", src, a, b)
	}
	again, err := Format("model", text, Limits{})
	if err != nil || string(again) != string(text) {
		t.Fatalf("formatting twice: %v\n%q\nthen\n%q", err, text, again)
	}
}

func comments(f *File) string {
	var list []string
	for _, it := range f.items {
		if it.comment != "" {
			list = append(list, it.comment)
		}
		for _, tok := range it.tokens {
			list = append(list, tok.above...)
			if tok.comment != "" {
				list = append(list, tok.comment)
			}
		}
	}
	return strings.Join(list, "\n")
}

// describe writes a statement without its places.
func describe(s Statement) string {
	names := func(list []*Name) string {
		var b strings.Builder
		for _, n := range list {
			b.WriteString(n.Name + " ")
		}
		return b.String()
	}
	text := func(e Expr) string {
		if e == nil {
			return "-"
		}
		return e.String()
	}
	word := func(n *Name) string {
		if n == nil {
			return "-"
		}
		return n.Name
	}
	bounds := func(b *Bounds) string {
		if b == nil {
			return "-"
		}
		return "[" + text(b.A) + ", " + text(b.B) + "]"
	}
	switch s := s.(type) {
	case *Title:
		return "title " + s.Text
	case *Small:
		return "small " + s.Name.Name
	case *Calculus:
		return "calculus " + s.Name.Name
	case *Variable:
		kind := "fast "
		if s.Slow {
			kind = "slow "
		}
		return kind + names(s.Names) + s.Domain.Kind.String() + " " + bounds(s.Domain.Interval) + " window " + bounds(s.Domain.Window)
	case *Param:
		return "param " + s.Name.Name + " " + text(s.Value) + " " + word(s.Assumption)
	case *Function:
		return "function " + s.Name.Name + " of " + names(s.Args) + text(s.Body) + " " + word(s.Assumption)
	case *Let:
		return "let " + s.Name.Name + " " + text(s.Value)
	case *Equation:
		return "equation " + s.Variable + " " + text(s.Right)
	case *Claim:
		return "claim " + s.Kind.String() + " " + names(s.Names) + itoa(s.Index) + " " + text(s.Left) + " " + text(s.Right)
	case *Assign:
		if s.Observe {
			return "observe " + s.Name.Name + " " + text(s.Value)
		}
		return "start " + s.Name.Name + " " + text(s.Value)
	case *Latex:
		return "latex " + s.Name.Name + " " + s.Text
	}
	return "unknown statement"
}

// parseLet parses one expression, in a model with variables x and theta.
func parseLet(t *testing.T, text string) Expr {
	t.Helper()
	f, errs := Parse("model", []byte("slow x\nfast theta\nlet q = "+text), Limits{})
	if len(errs) > 0 {
		t.Fatalf("%s: %v", text, errs)
	}
	return f.Statements[2].(*Let).Value
}

func TestExpressionStructure(t *testing.T) {
	for _, c := range []struct{ text, want string }{
		{"-x^2", "-(x^2)"},
		{"2^3^2", "2^(3^2)"},
		{"2**3**2", "2^(3^2)"},
		{"a/b*c", "(a/b)*c"},
		{"a - b - c", "(a - b) - c"},
		{"x^-1", "x^(-1)"},
		{"2^-x^2", "2^(-(x^2))"},
		{"-a*b", "(-a)*b"},
		{"a*-b", "a*(-b)"},
		{"a - -b", "a - (-b)"},
		{"θ_1*Γ₂", "(θ_1)*(Γ₂)"},
		{"sum + abs(let) - not/in*or", "(sum + abs(let)) - ((not/in)*or)"},
		{"len(true, nil)", "len((true), (nil))"},
		{"n12 + 12", "n12 + 12"},
		{"v(x + 1, y)^2", "(v(x + 1, y))^2"},
	} {
		a, b := parseLet(t, c.text), parseLet(t, c.want)
		if !Same(a, b) {
			t.Errorf("%s is read as %s, want %s", c.text, a, b)
		}
		if again := parseLet(t, a.String()); !Same(a, again) {
			t.Errorf("%s prints as %s, which reads as %s", c.text, a, again)
		}
	}
}

func TestPrintedForm(t *testing.T) {
	for _, c := range []struct{ text, want string }{
		{"((a)+(b))", "a + b"},
		{"(a*b)/(c*d)", "a*b/(c*d)"},
		{"a-(b-c)", "a - (b - c)"},
		{"(a^b)^c", "(a^b)^c"},
		{"a^(b^c)", "a^b^c"},
		{"(-a)^2", "(-a)^2"},
		{"-(a+b)", "-(a + b)"},
		{"f( x ,y )", "f(x, y)"},
		{"1.50e-3", "1.50e-3"},
	} {
		if got := parseLet(t, c.text).String(); got != c.want {
			t.Errorf("%s prints as %s, want %s", c.text, got, c.want)
		}
	}
}

func TestDecimalsAreExact(t *testing.T) {
	for _, c := range []struct{ text, want string }{
		{"0.1", "1/10"},
		{".5", "1/2"},
		{"2.", "2"},
		{"1.25e-3", "1/800"},
		{"6.02E+3", "6020"},
		{"123456789012345678901234567890", "123456789012345678901234567890"},
		{"0.10000000000000000000000000000000001", "10000000000000000000000000000000001/100000000000000000000000000000000000"},
		{"007", "7"},
	} {
		if got := parseLet(t, c.text).(*Number).Value.RatString(); got != c.want {
			t.Errorf("%s has the value %s, want %s", c.text, got, c.want)
		}
	}
}

func TestDifferentials(t *testing.T) {
	for _, c := range []struct{ text, want string }{
		{"v*cos(theta)/eps dt", "((v*cos(theta))/eps)*dt"},
		{"1/eps dW1", "(1/eps)*dW1"},
		{"sqrt(2*D)/eps*(b dW3 - c dW2)", "(sqrt(2*D)/eps)*(b*dW3 - c*dW2)"},
		{"c*(a dt + b dW1)", "c*(a*dt + b*dW1)"},
		{"(a + b) dt", "(a + b)*dt"},
		{"dt", "dt"},
		{"-dt - dW1", "(-dt) - dW1"},
		{"2dt", "2*dt"},
		{"2.5e3dt", "2.5e3*dt"},
		{"a^2 dt", "(a^2)*dt"},
		{"x^-1 dt", "(x^(-1))*dt"},
		{"dt/eps", "dt/eps"},
		{"a dWwind", "a*dWwind"},
		{"a dx", "a*dx"},
		{"a dy", ""},
		{"dt x", ""},
		{"a dt dW1", "(a*dt)*dW1"},
	} {
		parse := func(text string) (Expr, error) {
			f, errs := Parse("model", []byte("slow x\ndx = "+text), Limits{})
			if len(errs) > 0 {
				return nil, errs
			}
			return f.Statements[1].(*Equation).Right, nil
		}
		a, err := parse(c.text)
		if c.want == "" {
			if err == nil {
				t.Errorf("%s is read as %s", c.text, a)
			}
			continue
		}
		b, _ := parse(c.want)
		if err != nil || !Same(a, b) {
			t.Errorf("%s is read as %v, want %s (%v)", c.text, a, c.want, err)
			continue
		}
		if again, err := parse(a.String()); err != nil || !Same(a, again) {
			t.Errorf("%s prints as %s", c.text, a)
		}
	}
}

// TestPlaces checks that every node knows exactly which part of the text it is.
func TestPlaces(t *testing.T) {
	const text = "slow x\ndx = ω*((x + 1))^2/(2*D) dt \\\n  - sqrt( (x) )*(θ2 dW1)"
	f, errs := Parse("model", []byte(text), Limits{})
	if len(errs) > 0 {
		t.Fatal(errs)
	}
	var got []string
	Walk(f.Statements[1].(*Equation).Right, func(e Expr) bool {
		s := e.extent()
		line := []rune(f.Source.Line(s.At.Line))
		first := string(line[s.At.Column-1 : s.At.Column-1+s.At.Length])
		whole := f.Source.Text[s.Start:s.End]
		if !strings.HasPrefix(whole, first) {
			t.Errorf("%s: bytes %q, columns %q", e, whole, first)
		}
		got = append(got, whole)
		return true
	})
	want := []string{
		"ω*((x + 1))^2/(2*D) dt \\\n  - sqrt( (x) )*(θ2 dW1)",
		"ω*((x + 1))^2/(2*D) dt", "ω*((x + 1))^2/(2*D)", "ω*((x + 1))^2", "ω", "((x + 1))^2", "x + 1", "x", "1", "2", "2*D", "2", "D", "dt",
		"sqrt( (x) )*(θ2 dW1)", "sqrt( (x) )", "sqrt", "x", "θ2 dW1", "θ2", "dW1",
	}
	if strings.Join(got, "|") != strings.Join(want, "|") {
		t.Errorf("got  %q\nwant %q", got, want)
	}
}

func TestAssignments(t *testing.T) {
	list, _, errs := ParseAssignments("--set", "D = 1.5, v(x, y)=f(x, 2)+1,q=-pi", Limits{})
	if len(errs) > 0 {
		t.Fatal(errs)
	}
	var got []string
	for _, a := range list {
		got = append(got, a.Name.Name+":"+itoa(len(a.Args))+":"+a.Value.String()+":"+a.Text)
	}
	if s := strings.Join(got, ";"); s != "D:0:1.5:1.5;v:2:f(x, 2) + 1:f(x, 2)+1;q:0:-pi:-pi" {
		t.Error(s)
	}
	for _, c := range []struct{ text, want string }{
		{"", "--set:1:1: the text is empty [syntax]"},
		{"D", "--set:1:2: the name D is given no value [syntax]"},
		{"D=", "--set:1:3: the expression is missing [syntax]"},
		{"D=1,", "--set:1:5: the text ends after \",\" [syntax]"},
		{"D=1 2", "--set:1:5: unexpected \"2\" after \"1\" [syntax]"},
		{"v(x+1)=2", "--set:1:4: the arguments of v are names in parentheses [syntax]"},
		{"D=(1", "--set:1:3: the bracket \"(\" is never closed [bracket]"},
		{"D=1\nE=2", "--set:2:1: the assignment does not end on its line [syntax]"},
	} {
		_, _, errs := ParseAssignments("--set", c.text, Limits{})
		if len(errs) != 1 || errs[0].Headline() != c.want {
			t.Errorf("%q: %v, want %s", c.text, errs, c.want)
		}
	}
}

func TestLimits(t *testing.T) {
	head := "slow x\nlet q = "
	for _, c := range []struct {
		name   string
		text   string
		limits Limits
		want   string
	}{
		{"size", strings.Repeat("# padding\n", 1_048_577), Limits{}, "model:1:1: the file has 10 MiB; a model file has at most 1 MiB [too-large]"},
		{"small size", "slow x", Limits{Bytes: 5}, "model:1:1: the file has 6 bytes; a model file has at most 5 bytes [too-large]"},
		{"line", "slow x\n# " + strings.Repeat("é", 20_000), Limits{}, "model:2:20001: the line has more than 20000 characters [line-too-long]"},
		{"statements", strings.Repeat("let q = 1\n", 2001), Limits{}, "model:2001:1: the file has more than 2000 statements [too-many-statements]"},
		{"brackets", head + strings.Repeat("(", 101) + "1" + strings.Repeat(")", 101), Limits{}, "model:2:109: brackets nest more than 100 deep [nested-too-deep]"},
		{"signs", head + strings.Repeat("-", 101) + "1", Limits{}, "model:2:109: signs and powers nest more than 100 deep [nested-too-deep]"},
		{"powers", head + strings.Repeat("2^", 101) + "1", Limits{}, "model:2:210: signs and powers nest more than 100 deep [nested-too-deep]"},
		{"terms", head + strings.Repeat("1+", 3001) + "1", Limits{}, "model:2:9: the expression has more than 6000 names, numbers and signs [statement-too-long]"},
		{"digits", head + strings.Repeat("1", 1001), Limits{}, "model:2:9: the number is out of bounds [bad-number]"},
		{"exponent", head + "1e999999999999", Limits{}, "model:2:9: the number is out of bounds [bad-number]"},
		{"encoding", "slow x\nlet é = 1 \xe9 2", Limits{}, "model:2:11: the text is not UTF-8: byte 0xe9 is no character [not-utf8]"},
		{"control", "let q = \x00", Limits{}, "model:1:9: the character U+0000 has no meaning here [bad-character]"},
		{"beyond", "let q = \U000e0001", Limits{}, "model:1:9: the character U+E0001 has no meaning here [bad-character]"},
		{"empty", "", Limits{}, "model:1:1: the file holds no statement [empty]"},
		{"comments", "# nothing\n\n", Limits{}, "model:1:1: the file holds no statement [empty]"},
	} {
		_, errs := Parse("model", []byte(c.text), c.limits)
		if len(errs) != 1 || errs[0].Headline() != c.want {
			t.Errorf("%s: got %v\nwant %s", c.name, errs, c.want)
		}
	}
	deep := head + strings.Repeat("(", 100) + "1" + strings.Repeat(")", 100)
	long := head + strings.Repeat("1+", 2999) + "1"
	for _, text := range []string{deep, long} {
		if _, errs := Parse("model", []byte(text), Limits{}); len(errs) > 0 {
			t.Errorf("within the limits: %v", errs)
		}
	}
}

func TestLineEndsAndByteOrderMark(t *testing.T) {
	f, errs := Parse("model", []byte("\ufeffslow x\r\nlet q = (1 +\r\n 2)\r\n"), Limits{})
	if len(errs) > 0 || len(f.Statements) != 2 {
		t.Fatal(errs, f)
	}
}
