package page

import (
	"bytes"
	"encoding/xml"
	"errors"
	"fmt"
	"io"
	"strings"
)

// mathElements are the elements of MathML Core, without those that carry other markup.
var mathElements = words(`mi mn mo mtext mspace mrow mfrac msqrt mroot mstyle merror mpadded mphantom msub msup
 msubsup munder mover munderover mmultiscripts mprescripts mtable mtr mtd`)

// mathAttributes are the attributes that change how a formula looks, and nothing else.
var mathAttributes = words(`class mathvariant form fence separator stretchy symmetric largeop movablelimits accent
 accentunder displaystyle scriptlevel lspace rspace width height depth linethickness minsize maxsize
 columnspan rowspan dir`)

func words(s string) map[string]bool {
	m := map[string]bool{}
	for _, w := range strings.Fields(s) {
		m[w] = true
	}
	return m
}

// checkMathML tells what is wrong with a formula.
func checkMathML(m MathML) error {
	if m == "" {
		return errors.New("the formula is empty")
	}
	depth := 0
	return scan([]byte(m), func(t xml.Token) error {
		switch e := t.(type) {
		case xml.StartElement:
			depth++
			if !mathElements[e.Name.Local] || e.Name.Space != "" {
				return fmt.Errorf("<%s> does not belong in a formula", e.Name.Local)
			}
			for _, a := range e.Attr {
				if !mathAttributes[a.Name.Local] || a.Name.Space != "" {
					return fmt.Errorf("the attribute %s does not belong in a formula", a.Name.Local)
				}
			}
		case xml.EndElement:
			depth--
		case xml.CharData:
			if depth == 0 && len(bytes.TrimSpace(e)) > 0 {
				return fmt.Errorf("the text %q stands outside of an element", bytes.TrimSpace(e))
			}
		case xml.ProcInst:
			return errors.New("only elements and text belong in a formula")
		}
		return nil
	})
}

// checkSVG tells what is wrong with a drawing, or returns its label and its size.
func checkSVG(svg []byte) (label string, width, height float64, err error) {
	first := true
	err = scan(svg, func(t xml.Token) error {
		e, ok := t.(xml.StartElement)
		if !ok {
			return nil
		}
		name := strings.ToLower(e.Name.Local)
		if first && name != "svg" {
			return fmt.Errorf("it begins with <%s>", e.Name.Local)
		}
		switch name {
		case "script", "foreignobject", "iframe", "style", "animate", "set", "handler", "a":
			return fmt.Errorf("<%s> does not belong in a figure", e.Name.Local)
		}
		for _, a := range e.Attr {
			key := strings.ToLower(a.Name.Local)
			value := strings.TrimSpace(a.Value)
			switch {
			case strings.HasPrefix(key, "on"):
				return fmt.Errorf("the attribute %s could run a script", a.Name.Local)
			case (key == "href" || key == "src") && !strings.HasPrefix(value, "data:image/png;base64,") && !strings.HasPrefix(value, "#"):
				return fmt.Errorf("%s=%.40q would load something", a.Name.Local, value)
			case strings.Contains(strings.ToLower(value), "url(") && !strings.Contains(value, "url(#"):
				return fmt.Errorf("%s=%.40q would load something", a.Name.Local, value)
			}
			if first && key == "aria-label" {
				label = a.Value
			}
			if first && key == "viewbox" {
				var x, y float64
				if n, _ := fmt.Sscan(strings.ReplaceAll(value, ",", " "), &x, &y, &width, &height); n != 4 || !(width > 0) || !(height > 0) {
					return fmt.Errorf("its viewBox is %q", value)
				}
			}
		}
		first = false
		return nil
	})
	if err == nil && width == 0 {
		err = errors.New("it has no viewBox")
	}
	return label, width, height, err
}

// scan reads XML and hands its tokens on. Comments, CDATA sections and document types, which XML and HTML do not
// read alike, are refused.
func scan(data []byte, f func(xml.Token) error) error {
	if bytes.Contains(data, []byte("<!")) {
		return errors.New("comments, CDATA sections and document types cannot stand in a page")
	}
	d := xml.NewDecoder(bytes.NewReader(data))
	for {
		t, err := d.RawToken()
		if errors.Is(err, io.EOF) {
			return balanced(data)
		}
		if err != nil {
			return fmt.Errorf("it is not well-formed: %w", err)
		}
		if err := f(t); err != nil {
			return err
		}
	}
}

// balanced tells whether every element is closed, which raw tokens do not.
func balanced(data []byte) error {
	d := xml.NewDecoder(io.MultiReader(strings.NewReader("<x>"), bytes.NewReader(withoutProlog(data)), strings.NewReader("</x>")))
	depth := 0
	for {
		t, err := d.Token()
		if errors.Is(err, io.EOF) {
			return nil
		}
		if err != nil {
			return fmt.Errorf("it is not well-formed: %w", err)
		}
		switch t.(type) {
		case xml.StartElement:
			depth++
		case xml.EndElement:
			depth--
			if depth == 0 && d.InputOffset() != int64(len(withoutProlog(data))+len("<x></x>")) {
				return errors.New("it is not well-formed: an element ends that did not begin")
			}
		}
	}
}

// withoutProlog drops the XML declaration, which cannot stand inside a page.
func withoutProlog(svg []byte) []byte {
	s := bytes.TrimSpace(svg)
	if bytes.HasPrefix(s, []byte("<?xml")) {
		if i := bytes.Index(s, []byte("?>")); i >= 0 {
			s = bytes.TrimSpace(s[i+2:])
		}
	}
	return s
}
