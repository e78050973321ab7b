package syntax

import "epslim/generator/ito/diagnostic"

var (
	shapeWords = []string{"line", "halfline", "circle", "sphere"}
	wallWords  = []string{"reflecting", "periodic", "absorbing"}
)

// variable reads the rest of a slow or fast statement. A domain that cannot be
// read is reported; the variable is declared all the same.
func (s *statementParser) variable(slow bool) Statement {
	st := &Variable{Slow: slow}
	if s.look().is(tokenOpen, "(") {
		st.Names = s.names()
		if len(st.Names) != 3 && !s.bad {
			s.fail(s.tokens[1].at, diagnostic.Syntax, "a point on the sphere has three components, not "+itoa(len(st.Names)), "fast (a, b, c) on sphere", "")
		}
		if slow {
			s.fail(s.tokens[0].at, diagnostic.WrongVariable, "the components of a point on the sphere are fast variables", "fast (a, b, c) on sphere", "")
		}
	} else if n := s.name("the name of a variable"); n != nil {
		st.Names = append(st.Names, n)
		if s.look().kind == tokenComma {
			s.fail(s.place(), diagnostic.Syntax, "one statement declares one variable", "a statement for each variable", "")
		}
	}
	if len(st.Names) == 0 {
		return nil
	}
	st.Domain = s.domain(len(st.Names) > 1)
	st.Domain.Understood = !s.bad
	return st
}

// domain reads a DOMAIN to the end of the statement.
func (s *statementParser) domain(triple bool) (d Domain) {
	if triple {
		d.Kind = Sphere
	}
	if s.bad || !s.more() && !triple {
		return d
	}
	word := s.look()
	d.At = s.place()
	switch {
	case word.is(tokenName, "on"):
		s.pos++
		s.shape(&d, triple)
	case word.is(tokenName, "in") && !triple:
		s.pos++
		d.Interval = s.bounds()
		s.wall(&d)
	case triple:
		s.unexpected("\"on sphere\"")
	case word.kind == tokenName:
		s.fail(word.at, diagnostic.Syntax, "unexpected "+word.describe()+" in a \""+s.tokens[0].text+"\" statement",
			"a domain: \"on line\", \"on halfline\", \"on circle\" or \"in [A, B] ...\"", diagnostic.Nearest(word.text, []string{"on", "in"}))
	default:
		s.unexpected("a domain: \"on line\", \"on halfline\", \"on circle\" or \"in [A, B] ...\"")
	}
	s.end()
	return d
}

// shape reads what follows "on".
func (s *statementParser) shape(d *Domain, triple bool) {
	const expected = "line, halfline or circle"
	n := s.name(expected)
	if n == nil {
		return
	}
	d.At = n.At
	switch n.Name {
	case "line":
		d.Kind = Line
	case "halfline":
		d.Kind = HalfLine
	case "circle":
		d.Kind = Circle
	case "sphere":
		d.Kind = Sphere
	default:
		s.fail(n.At, diagnostic.UnknownWord, "\""+n.Name+"\" is no domain", expected, diagnostic.Nearest(n.Name, shapeWords))
		return
	}
	if triple != (d.Kind == Sphere) {
		s.fail(n.At, diagnostic.Syntax, "a point on the sphere has three components, given together", "fast (a, b, c) on sphere", "")
		return
	}
	if s.look().kind == tokenName {
		w := s.look()
		if w.text != "window" {
			s.fail(w.at, diagnostic.UnknownWord, "unexpected "+w.describe()+" after the domain", "\"window [A, B]\" or the end of the line",
				diagnostic.Nearest(w.text, []string{"window"}))
			return
		}
		if d.Kind != Line && d.Kind != HalfLine {
			s.fail(w.at, diagnostic.Syntax, "only unbounded domains have a window", "the end of the line", "")
			return
		}
		s.pos++
		d.Window = s.bounds()
	}
}

// wall reads the word after an interval.
func (s *statementParser) wall(d *Domain) {
	const expected = "reflecting, periodic or absorbing"
	if s.bad {
		return
	}
	n := s.name(expected)
	if n == nil {
		return
	}
	d.At = n.At
	switch n.Name {
	case "reflecting":
		d.Kind = Reflecting
	case "periodic":
		d.Kind = Periodic
	case "absorbing":
		d.Kind = Absorbing
	default:
		s.fail(n.At, diagnostic.UnknownWord, "\""+n.Name+"\" says nothing about the ends of an interval", expected, diagnostic.Nearest(n.Name, wallWords))
	}
}

// bounds reads `[A, B]`.
func (s *statementParser) bounds() *Bounds {
	open := s.pos
	if !s.look().is(tokenOpen, "[") {
		s.unexpected("an interval [A, B]")
		return nil
	}
	closer := s.tokens[open].partner
	if closer < 0 {
		s.bad = true // reported when the brackets were matched
		return nil
	}
	s.pos++
	comma := s.find(tokenComma)
	if comma < 0 || comma > closer {
		s.fail(s.tokens[open].at, diagnostic.Syntax, "the interval has one bound", "an interval [A, B]", "")
		return nil
	}
	b := &Bounds{Span: spanOf(s.src, s.tokens, open, closer)}
	b.A = s.expression(comma)
	s.pos = comma + 1
	b.B = s.expression(closer)
	s.pos = closer + 1
	return b
}
