package figure

import (
	"image"
	"math"
)

// point is a place in the figure, in points from the top left corner, or a vector.
type point struct{ x, y float64 }

func (p point) add(q point) point            { return point{p.x + q.x, p.y + q.y} }
func (p point) sub(q point) point            { return point{p.x - q.x, p.y - q.y} }
func (p point) times(a float64) point        { return point{p.x * a, p.y * a} }
func (p point) norm() float64                { return math.Hypot(p.x, p.y) }
func (p point) cross(q point) float64        { return p.x*q.y - p.y*q.x }
func (p point) near(q point, d float64) bool { return p.sub(q).norm() <= d }

// rect is a rectangle with left <= right and top <= bottom.
type rect struct{ left, top, right, bottom float64 }

func (r rect) width() float64  { return r.right - r.left }
func (r rect) height() float64 { return r.bottom - r.top }
func (r rect) contains(p point) bool {
	return p.x >= r.left && p.x <= r.right && p.y >= r.top && p.y <= r.bottom
}
func (r rect) grow(d float64) rect {
	return rect{r.left - d, r.top - d, r.right + d, r.bottom + d}
}
func (r rect) corners() []point {
	return []point{{r.left, r.top}, {r.right, r.top}, {r.right, r.bottom}, {r.left, r.bottom}}
}

// colour is an opaque sRGB colour with the role it plays, if any: a page with a dark background may redraw
// the shapes of a role, which is part of the name of their class in an SVG.
type colour struct {
	r, g, b uint8
	role    string
}

const (
	inkRole   = "ink"
	paperRole = "paper"
	softRole  = "soft" // reference lines
	blueRole  = "blue" // the one line colour that is dim on a dark page
)

var (
	black = colour{0, 0, 0, inkRole}
	white = colour{255, 255, 255, paperRole}
	grey  = colour{0x66, 0x66, 0x66, softRole}
)

// pen is how a line is drawn.
type pen struct {
	colour colour
	width  float64
	dash   []float64 // lengths of ink and gap in points; none for a solid line
}

// anchors of a text.
const (
	anchorStart = iota
	anchorMiddle
	anchorEnd
)

// shape is one item of a scene; exactly one of the groups of fields is used, by kind.
type shape struct {
	kind shapeKind

	lines  [][]point // shapeLine, shapeFill
	closed bool      // shapeLine
	pen    pen       // shapeLine
	fill   colour    // shapeFill, shapeText
	alpha  float64   // shapeFill, shapeLine

	runs    []placed // shapeText
	at      point
	size    float64
	upwards bool // the text reads from bottom to top
	width   float64
	anchor  int

	box   rect // shapeImage: the image fills the box, each pixel a rectangle
	image *image.Paletted

	class, name string // shapeBegin
}

type shapeKind int

const (
	shapeLine shapeKind = iota
	shapeFill
	shapeText
	shapeImage
	shapeCells // shapeImage with boundaries between the pixels that are not equidistant
	shapeBegin
	shapeEnd
)

// scene is the list of shapes that all writers draw, first to last.
type scene struct {
	width, height float64
	shapes        []shape
	face          *typeface
	// rasterColumns is the number of cells across rasterBox, for the resolution of a PNG.
	rasterColumns int
	rasterBox     rect
	title, alt    string
	meta          []Field
}

func (s *scene) begin(class, name string) {
	s.shapes = append(s.shapes, shape{kind: shapeBegin, class: class, name: name})
}

func (s *scene) end() { s.shapes = append(s.shapes, shape{kind: shapeEnd}) }

func (s *scene) line(lines [][]point, closed bool, p pen) {
	if len(lines) > 0 {
		s.shapes = append(s.shapes, shape{kind: shapeLine, lines: lines, closed: closed, pen: p, alpha: 1})
	}
}

func (s *scene) segment(a, b point, p pen) { s.line([][]point{{a, b}}, false, p) }

func (s *scene) polygon(lines [][]point, c colour, alpha float64) {
	if len(lines) > 0 {
		s.shapes = append(s.shapes, shape{kind: shapeFill, lines: lines, fill: c, alpha: alpha})
	}
}

func (s *scene) text(at point, runs []run, size float64, anchor int, c colour) {
	s.addText(at, runs, size, anchor, c, false)
}

// textUpwards sets a text that reads from bottom to top.
func (s *scene) textUpwards(at point, runs []run, size float64, anchor int, c colour) {
	s.addText(at, runs, size, anchor, c, true)
}

func (s *scene) addText(at point, runs []run, size float64, anchor int, c colour, upwards bool) {
	pl, w := s.face.place(runs)
	if len(pl) > 0 {
		s.shapes = append(s.shapes, shape{kind: shapeText, runs: pl, at: at, size: size, anchor: anchor,
			fill: c, alpha: 1, width: w * size, upwards: upwards})
	}
}

// start is the place of the first character's baseline of a text.
func (sh *shape) start() point {
	back := 0.0
	switch sh.anchor {
	case anchorMiddle:
		back = sh.width / 2
	case anchorEnd:
		back = sh.width
	}
	if sh.upwards {
		return point{sh.at.x, sh.at.y + back}
	}
	return point{sh.at.x - back, sh.at.y}
}

// outlines calls draw with the outline of each character of a text, in points.
func (sh *shape) outlines(t *typeface, draw func([]outline)) {
	o := sh.start()
	to := func(x, y float64) point {
		if sh.upwards {
			return point{o.x + y, o.y - x}
		}
		return point{o.x + x, o.y + y}
	}
	for _, r := range sh.runs {
		x := r.x
		for _, c := range r.text {
			adv, shape := t.glyph(c, r.italic)
			out := make([]outline, len(shape))
			for i, s := range shape {
				out[i] = outline{s.op,
					to((x+s.p.x*r.scale)*sh.size, (r.y+s.p.y*r.scale)*sh.size),
					to((x+s.q.x*r.scale)*sh.size, (r.y+s.q.y*r.scale)*sh.size)}
			}
			draw(out)
			x += adv * r.scale
		}
	}
}
