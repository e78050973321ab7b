package syntax

import (
	"strings"

	"epslim/generator/ito/diagnostic"
)

// Assignment is NAME = EXPR or NAME(ARGS) = EXPR in the text of an option.
type Assignment struct {
	Name  *Name
	Args  []*Name // nil when there were no parentheses
	Value Expr
	Text  string // the value as it was typed
}

// ParseAssignments reads the text of an option: assignments separated by
// commas, such as "D=1.5", "v(x,y)=1+x^2" or "x=0.3,y=0.2". The name of the
// option is what errors carry as the name of the file. The Source is that of
// the text, for further errors about it.
func ParseAssignments(option, text string, limits Limits) ([]Assignment, *Source, diagnostic.List) {
	limits = limits.withDefaults()
	if d := checkText(option, []byte(text), limits); d != nil {
		return nil, nil, diagnostic.List{d}
	}
	src := newSource(option, strings.TrimRight(text, "\r\n"))
	var errs diagnostic.List
	l := lexer{src: src, limits: limits, errs: &errs}
	l.run()
	s := statementParser{src: src, limits: limits, errs: &errs}
	var tokens []token
	for _, it := range l.items {
		if len(tokens) > 0 && len(it.tokens) > 0 {
			s.fail(it.tokens[0].at, diagnostic.Syntax, "the assignment does not end on its line", "", "")
		}
		tokens = append(tokens, it.tokens...)
	}
	if len(errs) > 0 {
		return nil, src, errs
	}
	if len(tokens) == 0 {
		return nil, src, diagnostic.List{src.expected(Position{Line: 1, Column: 1}, "the text is empty", assignmentForm)}
	}
	s.tokens = tokens
	var list []Assignment
	for s.pos = 0; s.more(); {
		a, ok := s.assignment()
		if !ok {
			return nil, src, errs
		}
		list = append(list, a)
		if s.more() {
			if s.pos++; !s.more() {
				return nil, src, diagnostic.List{src.expected(s.place(), "the text ends after \",\"", assignmentForm)}
			}
		}
	}
	return list, src, nil
}

const assignmentForm = "NAME=VALUE, or several separated by commas"

func (s *Source) expected(at Position, message, expected string) *diagnostic.Diagnostic {
	d := s.Diagnostic(at, diagnostic.Syntax, message)
	d.Expected = expected
	return d
}

// assignment reads one assignment and stops before the comma after it.
func (s *statementParser) assignment() (a Assignment, ok bool) {
	stop := func(at Position, message string) (Assignment, bool) {
		s.fail(at, diagnostic.Syntax, message, assignmentForm, "")
		return a, false
	}
	if s.look().kind != tokenName {
		return stop(s.place(), "unexpected "+s.look().describe())
	}
	a.Name = s.nameOf(s.pos)
	s.pos++
	if s.look().is(tokenOpen, "(") {
		s.pos++
		a.Args = []*Name{}
		for s.look().kind == tokenName {
			a.Args = append(a.Args, s.nameOf(s.pos))
			s.pos++
			if s.look().kind != tokenComma {
				break
			}
			s.pos++
		}
		if !s.look().is(tokenClose, ")") {
			return stop(s.place(), "the arguments of "+a.Name.Name+" are names in parentheses")
		}
		s.pos++
	}
	if s.look().kind != tokenEquals {
		return stop(s.place(), "the name "+a.Name.Name+" is given no value")
	}
	s.pos++
	to := s.find(tokenComma)
	if to < 0 {
		to = len(s.tokens)
	}
	from := s.pos
	if a.Value = s.expression(to); a.Value == nil {
		return a, false
	}
	a.Text = s.src.Text[s.tokens[from].start:s.tokens[to-1].end]
	return a, true
}
