package figure

import (
	"fmt"
	"math"

	"codeberg.org/go-fonts/liberation/liberationsansitalic"
	"codeberg.org/go-fonts/liberation/liberationsansregular"
	"golang.org/x/image/font"
	"golang.org/x/image/font/sfnt"
	"golang.org/x/image/math/fixed"
)

// Shape of sub- and superscripts, in units of the size of the text.
const (
	scriptSize = 0.70
	scriptDrop = 0.18 // a subscript's baseline is this far below the line
	scriptRise = 0.38 // a superscript's is this far above
)

// typeface measures text and gives its outlines. It is made for one rendering and is not safe for
// concurrent use.
type typeface struct {
	regular, italic *sfnt.Font
	buf             sfnt.Buffer
}

func newTypeface() (*typeface, error) {
	r, err := sfnt.Parse(liberationsansregular.TTF)
	if err != nil {
		return nil, fmt.Errorf("figure: reading the font: %w", err)
	}
	i, err := sfnt.Parse(liberationsansitalic.TTF)
	if err != nil {
		return nil, fmt.Errorf("figure: reading the italic font: %w", err)
	}
	return &typeface{regular: r, italic: i}, nil
}

// outline is a closed shape in units of the size of the text: op is 'M', 'L' or 'Q', the last with
// its control point first.
type outline struct {
	op   byte
	p, q point
}

func (t *typeface) font(italic bool) *sfnt.Font {
	if italic {
		return t.italic
	}
	return t.regular
}

// substitute replaces a character that the font lacks by one that looks like it.
func substitute(c rune) rune {
	switch c {
	case '∼':
		return '~'
	case '⋅':
		return '·'
	case '⋯':
		return '…'
	case '∗':
		return '*'
	case '⁻':
		return '−'
	case 'ℒ':
		return 'L'
	case '\u2009', '\u2005':
		return ' '
	}
	return c
}

// glyph returns the advance and the outline of one character, in units of the text size.
func (t *typeface) glyph(c rune, italic bool) (advance float64, shape []outline) {
	if s, adv, ok := drawnGlyph(t, c); ok {
		return adv, s
	}
	narrow := 1.0
	if c == '\u2009' || c == '\u2005' { // a space is 0.28 em, a thin one a sixth of an em
		narrow = 0.6
	}
	if c == 'ℒ' {
		italic = true
	}
	c = substitute(c)
	f := t.font(italic)
	em := fixed.Int26_6(f.UnitsPerEm()) << 6
	scale := 1 / float64(em)
	i, err := f.GlyphIndex(&t.buf, c)
	if err != nil {
		i = 0 // drawn as the font's box for a character it does not have
	}
	a, err := f.GlyphAdvance(&t.buf, i, em, font.HintingNone)
	if err != nil {
		return 0.5, nil
	}
	segs, err := f.LoadGlyph(&t.buf, i, em, nil)
	if err != nil {
		return float64(a) * scale * narrow, nil
	}
	at := func(p fixed.Point26_6) point { return point{float64(p.X) * scale, float64(p.Y) * scale} }
	for _, s := range segs {
		switch s.Op {
		case sfnt.SegmentOpMoveTo:
			shape = append(shape, outline{op: 'M', p: at(s.Args[0])})
		case sfnt.SegmentOpLineTo:
			shape = append(shape, outline{op: 'L', p: at(s.Args[0])})
		case sfnt.SegmentOpQuadTo:
			shape = append(shape, outline{op: 'Q', p: at(s.Args[0]), q: at(s.Args[1])})
		}
	}
	return float64(a) * scale * narrow, shape
}

// drawnGlyph has the mathematical characters that the font lacks altogether, as strokes.
func drawnGlyph(t *typeface, c rune) (shape []outline, advance float64, ok bool) {
	const pen = 0.065
	switch c {
	case '⟨':
		return strokeOutline([][]point{{{0.27, -0.76}, {0.09, -0.28}, {0.27, 0.20}}}, pen), 0.35, true
	case '⟩':
		return strokeOutline([][]point{{{0.08, -0.76}, {0.26, -0.28}, {0.08, 0.20}}}, pen), 0.35, true
	case '∇':
		return strokeOutline([][]point{{{0.06, -0.66}, {0.60, -0.66}, {0.33, -0.04}, {0.06, -0.66}}}, pen), 0.66, true
	case '∝':
		return strokeOutline([][]point{{{0.60, -0.42}, {0.50, -0.41}, {0.40, -0.35}, {0.30, -0.20}, {0.22, -0.14},
			{0.13, -0.14}, {0.07, -0.20}, {0.06, -0.27}, {0.07, -0.34}, {0.13, -0.41}, {0.22, -0.41}, {0.30, -0.35},
			{0.40, -0.20}, {0.50, -0.14}, {0.60, -0.13}}}, pen), 0.66, true
	case '∈':
		return strokeOutline([][]point{{{0.50, -0.52}, {0.28, -0.52}, {0.14, -0.44}, {0.08, -0.28}, {0.14, -0.12},
			{0.28, -0.04}, {0.50, -0.04}}, {{0.08, -0.28}, {0.50, -0.28}}}, pen), 0.58, true
	}
	return nil, 0, false
}

func strokeOutline(lines [][]point, width float64) []outline {
	var shape []outline
	for _, poly := range strokePolygons(lines, false, width, nil) {
		for i, p := range poly {
			op := byte('L')
			if i == 0 {
				op = 'M'
			}
			shape = append(shape, outline{op: op, p: p})
		}
	}
	return shape
}

// placed is one run with its place relative to the start of the label, in units of the text size.
type placed struct {
	run
	x, y, scale, width float64
}

// place sets runs one after the other and returns the width of the whole. A subscript and a superscript of
// one base stand above each other.
func (t *typeface) place(runs []run) (out []placed, width float64) {
	for i, r := range runs {
		p := placed{run: r, x: width, scale: 1}
		switch r.script {
		case -1:
			p.y, p.scale = scriptDrop, scriptSize
		case 1:
			p.y, p.scale = -scriptRise, scriptSize
		}
		if i > 0 && r.script*runs[i-1].script == -1 {
			p.x = out[i-1].x
		}
		for _, c := range r.text {
			a, _ := t.glyph(c, r.italic)
			p.width += a * p.scale
		}
		width = math.Max(width, p.x+p.width)
		out = append(out, p)
	}
	return out, width
}

// width is the width of a label in points.
func (t *typeface) width(runs []run, size float64) float64 {
	_, w := t.place(runs)
	return w * size
}
