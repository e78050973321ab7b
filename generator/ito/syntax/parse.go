package syntax

import (
	"strings"

	"epslim/generator/ito/diagnostic"
)

// File is a model file as a list of statements.
type File struct {
	Source     *Source
	Statements []Statement

	items []item // with comments and empty lines, for Format
}

// Parse reads the text of a model file. The file it returns holds every
// statement whose keyword was understood, also when there are errors; it is nil
// only when the text as a whole was refused (size, encoding). The errors, in the
// order of their places, are nil when there are none.
func Parse(name string, src []byte, limits Limits) (*File, diagnostic.List) {
	limits = limits.withDefaults()
	if d := checkText(name, src, limits); d != nil {
		return nil, diagnostic.List{d}
	}
	f := &File{Source: newSource(name, string(src))}
	var errs diagnostic.List
	l := lexer{src: f.Source, limits: limits, errs: &errs}
	l.run()
	f.items = l.items
	s := statementParser{src: f.Source, limits: limits, errs: &errs, variables: variableNames(l.items)}
	for i := range f.items {
		if it := &f.items[i]; len(it.tokens) > 0 {
			if st := s.statement(it); st != nil {
				f.Statements = append(f.Statements, st)
			}
		}
	}
	if len(f.Statements) == 0 && len(errs) == 0 {
		errs = append(errs, f.Source.Diagnostic(Position{Line: 1, Column: 1}, diagnostic.Empty,
			"the file holds no statement"))
	}
	errs.Sort()
	return f, errs
}

// variableNames collects the names of declared variables before anything is
// parsed: what is a differential depends on them.
func variableNames(items []item) map[string]bool {
	names := map[string]bool{}
	for _, it := range items {
		if len(it.tokens) < 2 || it.tokens[0].kind != tokenName || it.tokens[0].text != "slow" && it.tokens[0].text != "fast" {
			continue
		}
		if t := it.tokens[1]; t.kind == tokenName {
			names[t.text] = true
			continue
		}
		for _, t := range it.tokens[1:] {
			if t.kind == tokenClose {
				break
			}
			if t.kind == tokenName {
				names[t.text] = true
			}
		}
	}
	return names
}

// statementParser parses the tokens of one statement at a time.
type statementParser struct {
	src       *Source
	limits    Limits
	errs      *diagnostic.List
	variables map[string]bool

	tokens []token
	pos    int
	bad    bool
}

func (s *statementParser) fail(at Position, code diagnostic.Code, message, expected, nearest string) {
	if !s.bad {
		d := s.src.Diagnostic(at, code, message)
		d.Expected, d.Nearest = expected, nearest
		*s.errs = append(*s.errs, d)
	}
	s.bad = true
}

func (s *statementParser) isDifferential(name string) bool {
	return isDifferentialWord(name) || strings.HasPrefix(name, "d") && s.variables[name[1:]]
}

// more tells whether there is a token left.
func (s *statementParser) more() bool { return s.pos < len(s.tokens) }

// look returns the next token, or a token of no kind at the end.
func (s *statementParser) look() *token {
	if s.more() {
		return &s.tokens[s.pos]
	}
	return &token{kind: 255}
}

// place is where the next token stands, or the end of the statement.
func (s *statementParser) place() Position {
	if s.more() {
		return s.tokens[s.pos].at
	}
	at := s.tokens[len(s.tokens)-1].at
	at.Column += at.Length
	at.Length = 1
	return at
}

// unexpected reports the next token.
func (s *statementParser) unexpected(expected string) {
	if s.more() {
		s.fail(s.place(), diagnostic.Syntax, "unexpected "+s.look().describe()+" in a \""+s.tokens[0].text+"\" statement", expected, "")
	} else {
		s.fail(s.place(), diagnostic.Syntax, "the \""+s.tokens[0].text+"\" statement ends too early", expected, "")
	}
}

func (s *statementParser) nameOf(i int) *Name {
	return &Name{Span: spanOf(s.src, s.tokens, i, i), Name: s.tokens[i].text}
}

// name reads a name, or reports what stands in its place and returns nil.
func (s *statementParser) name(expected string) *Name {
	if s.look().kind != tokenName {
		s.unexpected(expected)
		return nil
	}
	s.pos++
	return s.nameOf(s.pos - 1)
}

// equals reads an equals sign.
func (s *statementParser) equals() bool {
	if s.look().kind != tokenEquals {
		s.unexpected("\"=\"")
		return false
	}
	s.pos++
	return true
}

// end reports what is left.
func (s *statementParser) end() {
	if s.more() && !s.bad {
		s.unexpected("the end of the line")
	}
}

// expression reads tokens[pos:to] as an expression.
func (s *statementParser) expression(to int) Expr {
	at := s.place()
	if s.bad {
		return nil
	}
	p := expression{src: s.src, limits: s.limits, tokens: s.tokens, from: s.pos, to: to, isDifferential: s.isDifferential}
	e, d := p.parse(at)
	if d != nil {
		s.bad = true
		*s.errs = append(*s.errs, d)
	}
	s.pos = to
	return e
}

// find returns the index of the first token of a kind outside brackets at or
// after pos, or -1.
func (s *statementParser) find(kind tokenKind) int {
	for i := s.pos; i < len(s.tokens); i++ {
		t := &s.tokens[i]
		if t.kind == kind {
			return i
		}
		if t.kind == tokenOpen && t.partner > i {
			i = t.partner
		}
	}
	return -1
}

// statement parses one statement; it returns nil when the keyword is unknown.
func (s *statementParser) statement(it *item) Statement {
	s.tokens, s.pos, s.bad = it.tokens, 1, it.bad
	st := s.dispatch()
	if st == nil {
		return nil
	}
	c := st.base()
	c.Span = spanOf(s.src, s.tokens, 0, len(s.tokens)-1)
	c.text = s.src.Text[c.Start:c.End]
	c.bad = s.bad
	return st
}

func (s *statementParser) dispatch() Statement {
	first := &s.tokens[0]
	if first.kind != tokenName {
		s.fail(first.at, diagnostic.UnknownKeyword, "a line starts with "+first.describe(), "a statement: "+keywordList(), "")
		return nil
	}
	if len(s.tokens) > 1 && s.tokens[1].kind == tokenEquals {
		return s.equation()
	}
	word := first.text
	if !isKeyword(word) {
		near := diagnostic.Nearest(word, keywords)
		s.fail(first.at, diagnostic.UnknownKeyword, "\""+word+"\" starts no statement", "a statement: "+keywordList(), near)
		if near == "" {
			return nil
		}
		// Go on as if it had been typed right, so that its names are known.
		word = near
	}
	switch word {
	case "title":
		return s.title()
	case "small":
		st := &Small{Name: s.name("the name of the small parameter")}
		s.end()
		return orNil(st, st.Name != nil)
	case "calculus":
		return s.calculus()
	case "slow", "fast":
		return s.variable(word == "slow")
	case "param":
		return s.param()
	case "function":
		return s.function()
	case "let":
		st := &Let{Name: s.name("a name")}
		st.Value = s.definition()
		return orNil(st, st.Name != nil)
	case "claim":
		return s.claim()
	case "start", "observe":
		st := &Assign{Observe: word == "observe", Name: s.name("a name")}
		st.Value = s.definition()
		return orNil(st, st.Name != nil)
	}
	return s.latex()
}

// orNil drops a statement that nothing could be read of.
func orNil(st Statement, ok bool) Statement {
	if ok {
		return st
	}
	return nil
}

func keywordList() string {
	return strings.Join(keywords, ", ") + ", or an equation such as dx = ..."
}

// definition reads `= EXPR` to the end.
func (s *statementParser) definition() Expr {
	if s.bad || !s.equals() {
		return nil
	}
	return s.expression(len(s.tokens))
}

func (s *statementParser) title() Statement {
	if s.look().kind != tokenString {
		s.unexpected("a text in quotes")
		return nil
	}
	s.pos++
	st := &Title{Text: s.tokens[1].text}
	s.end()
	return st
}

func (s *statementParser) calculus() Statement {
	words := []string{"ito", "stratonovich"}
	n := s.name("ito or stratonovich")
	if n == nil {
		return nil
	}
	if n.Name != "ito" && n.Name != "stratonovich" {
		s.fail(n.At, diagnostic.UnknownWord, "\""+n.Name+"\" is no calculus", "ito or stratonovich", diagnostic.Nearest(n.Name, words))
	}
	s.end()
	return &Calculus{Name: n}
}

func (s *statementParser) equation() Statement {
	first := &s.tokens[0]
	st := &Equation{Name: s.nameOf(0), Variable: strings.TrimPrefix(first.text, "d")}
	if isKeyword(first.text) {
		s.fail(s.tokens[1].at, diagnostic.Syntax, "unexpected \"=\" in a \""+first.text+"\" statement", "a name after \""+first.text+"\"", "")
		return nil
	}
	if first.text == "d" || !strings.HasPrefix(first.text, "d") || first.text == "dt" && !s.variables["t"] {
		s.fail(first.at, diagnostic.UnknownKeyword, "\""+first.text+" = ...\" is no statement",
			"an equation for a differential, such as dx = ..., or \"let "+first.text+" = ...\"", "")
		return nil
	}
	s.pos = 1
	st.Right = s.definition()
	return st
}

func (s *statementParser) param() Statement {
	st := &Param{Name: s.name("the name of a parameter")}
	if st.Name == nil {
		return nil
	}
	st.Value, st.Assumption = s.valueAndAssumption()
	return st
}

// valueAndAssumption reads `[= EXPR] [ASSUMPTION]` to the end.
func (s *statementParser) valueAndAssumption() (value Expr, assumption *Name) {
	to := len(s.tokens)
	if s.bad {
		return nil, nil
	}
	if s.more() {
		// A last word that no operator ties to what precedes it is an assumption.
		last, before := &s.tokens[to-1], &s.tokens[to-2]
		ties := before.kind == tokenOperator || before.kind == tokenOpen || before.kind == tokenComma || before.kind == tokenEquals
		if last.kind == tokenName && !ties && !s.isDifferential(last.text) {
			assumption = s.nameOf(to - 1)
			to--
			if !isAssumption(last.text) {
				s.fail(last.at, diagnostic.UnknownWord, "\""+last.text+"\" is no assumption",
					strings.Join(assumptionWords, ", "), diagnostic.Nearest(last.text, assumptionWords))
				s.bad = false // the rest of the statement is sound
				defer func() { s.bad = true }()
				assumption = nil
			}
		}
	}
	if s.pos < to {
		if !s.equals() {
			return nil, assumption
		}
		value = s.expression(to)
	}
	return value, assumption
}

func (s *statementParser) function() Statement {
	st := &Function{Name: s.name("the name of a function")}
	if st.Name == nil {
		return nil
	}
	if !s.look().is(tokenOpen, "(") {
		s.unexpected("the arguments of the function in parentheses, such as " + st.Name.Name + "(x)")
		return st
	}
	st.Args = s.names()
	st.Body, st.Assumption = s.valueAndAssumption()
	return st
}

// names reads `(NAME, ...)`.
func (s *statementParser) names() (list []*Name) {
	s.pos++
	for {
		n := s.name("a name")
		if n == nil {
			return list
		}
		list = append(list, n)
		switch t := s.look(); {
		case t.kind == tokenComma:
			s.pos++
		case t.is(tokenClose, ")"):
			s.pos++
			return list
		default:
			s.unexpected("\",\" or \")\"")
			return list
		}
	}
}

func (s *statementParser) claim() Statement {
	word := s.name("what the claim is about: " + strings.Join(claimWords[:], ", "))
	if word == nil {
		return nil
	}
	st := &Claim{Kind: 255}
	for k, w := range claimWords {
		if w == word.Name {
			st.Kind = ClaimKind(k)
		}
	}
	count := 0
	switch st.Kind {
	case ClaimDrift, ClaimCorrector, ClaimNoise:
		count = 1
	case ClaimDiffusion:
		count = 2
	case ClaimMean:
		to := s.find(tokenEquals)
		if to < 0 {
			s.fail(s.tokens[len(s.tokens)-1].at, diagnostic.Syntax, "the claim has no \"=\"", "claim mean EXPR = EXPR", "")
			return st
		}
		st.Left = s.expression(to)
	case ClaimDensity, ClaimInvariant:
	default:
		s.fail(word.At, diagnostic.UnknownWord, "\""+word.Name+"\" is nothing that can be claimed",
			strings.Join(claimWords[:], ", "), diagnostic.Nearest(word.Name, claimWords[:]))
		return nil
	}
	for i := 0; i < count && !s.bad; i++ {
		if n := s.name("the name of a slow variable"); n != nil {
			st.Names = append(st.Names, n)
		}
	}
	if st.Kind == ClaimNoise && !s.bad {
		s.column(st)
	}
	st.Right = s.definition()
	return st
}

// column reads the number of a column of the noise factor.
func (s *statementParser) column(st *Claim) {
	t := s.look()
	if t.kind == tokenNumber && len(t.text) < 4 {
		for _, c := range t.text {
			if c < '0' || c > '9' {
				st.Index = 0
				break
			}
			st.Index = 10*st.Index + int(c-'0')
		}
	}
	if st.Index == 0 {
		s.unexpected("the number of a column of the noise factor, from 1")
		return
	}
	s.pos++
}

func (s *statementParser) latex() Statement {
	st := &Latex{Name: s.name("the name of a symbol")}
	if st.Name == nil || !s.equals() {
		return nil
	}
	if s.look().kind != tokenString {
		s.unexpected("a text in quotes")
		return nil
	}
	st.Text = s.look().text
	s.pos++
	s.end()
	return st
}
