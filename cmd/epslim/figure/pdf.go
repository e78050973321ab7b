package figure

import (
	"bytes"
	"compress/zlib"
	"fmt"
	"image"
	"image/color"
	"unicode/utf16"
)

// pdf writes the scene as a document of one page (ISO 32000-1). Objects: 1 catalogue, 2 pages, 3 page,
// 4 contents, 5 information, 6 graphics states, then the images.
func (s *scene) pdf() ([]byte, error) {
	w := &pdfWriter{scene: s}
	// The page has its origin at the lower left; points are turned over here once.
	fmt.Fprintf(&w.content, "1 0 0 -1 0 %s cm 1 j\n", num(s.height))
	for i := range s.shapes {
		w.shape(&s.shapes[i])
	}
	var xobjects bytes.Buffer
	for i := range w.images {
		fmt.Fprintf(&xobjects, "/I%d %d 0 R ", i, 7+i)
	}
	w.object("<< /Type /Catalog /Pages 2 0 R >>")
	w.object("<< /Type /Pages /Kids [3 0 R] /Count 1 >>")
	w.object(fmt.Sprintf("<< /Type /Page /Parent 2 0 R /MediaBox [0 0 %s %s] /Contents 4 0 R /Resources << /ExtGState 6 0 R /XObject << %s>> >> >>",
		num(s.width), num(s.height), xobjects.String()))
	if err := w.stream("", w.content.Bytes()); err != nil {
		return nil, err
	}
	info := fmt.Sprintf("<< /Title %s /Subject %s", pdfText(s.title), pdfText(s.alt))
	if len(s.meta) > 0 {
		info += " /Keywords " + pdfText(metaJSON(s.meta))
	}
	w.object(info + " >>")
	var states bytes.Buffer
	for i, a := range w.alphas {
		fmt.Fprintf(&states, "/A%d << /ca %s >> ", i, num(a))
	}
	w.object("<< " + states.String() + ">>")
	for _, img := range w.images {
		if err := w.image(img); err != nil {
			return nil, err
		}
	}
	return w.finish(), nil
}

type pdfWriter struct {
	scene   *scene
	content bytes.Buffer
	body    bytes.Buffer
	places  []int // of the objects in body
	images  []*image.Paletted
	alphas  []float64
}

const pdfHeader = "%PDF-1.4\n%\xe2\xe3\xcf\xd3\n"

func (w *pdfWriter) object(text string) {
	w.places = append(w.places, len(pdfHeader)+w.body.Len())
	fmt.Fprintf(&w.body, "%d 0 obj\n%s\nendobj\n", len(w.places), text)
}

func (w *pdfWriter) stream(dict string, data []byte) error {
	var z bytes.Buffer
	c, err := zlib.NewWriterLevel(&z, zlib.BestCompression)
	if err != nil {
		return fmt.Errorf("figure: writing a PDF: %w", err)
	}
	if _, err := c.Write(data); err != nil {
		return fmt.Errorf("figure: writing a PDF: %w", err)
	}
	if err := c.Close(); err != nil {
		return fmt.Errorf("figure: writing a PDF: %w", err)
	}
	w.object(fmt.Sprintf("<< %s /Filter /FlateDecode /Length %d >>\nstream\n%s\nendstream", dict, z.Len(), z.String()))
	return nil
}

func (w *pdfWriter) image(img *image.Paletted) error {
	var lookup bytes.Buffer
	for _, c := range img.Palette {
		rgb, _ := c.(color.RGBA)
		fmt.Fprintf(&lookup, "%02x%02x%02x", rgb.R, rgb.G, rgb.B)
	}
	return w.stream(fmt.Sprintf("/Type /XObject /Subtype /Image /Width %d /Height %d /BitsPerComponent 8 /Interpolate false "+
		"/ColorSpace [/Indexed /DeviceRGB %d <%s>]", img.Rect.Dx(), img.Rect.Dy(), len(img.Palette)-1, lookup.String()), img.Pix)
}

func (w *pdfWriter) finish() []byte {
	var b bytes.Buffer
	b.WriteString(pdfHeader)
	b.Write(w.body.Bytes())
	xref := b.Len()
	fmt.Fprintf(&b, "xref\n0 %d\n0000000000 65535 f \n", len(w.places)+1)
	for _, p := range w.places {
		fmt.Fprintf(&b, "%010d 00000 n \n", p)
	}
	fmt.Fprintf(&b, "trailer\n<< /Size %d /Root 1 0 R /Info 5 0 R >>\nstartxref\n%d\n%%%%EOF\n", len(w.places)+1, xref)
	return b.Bytes()
}

// pdfText is a text string in UTF-16.
func pdfText(s string) string {
	var b bytes.Buffer
	b.WriteString("<FEFF")
	for _, u := range utf16.Encode([]rune(s)) {
		fmt.Fprintf(&b, "%04X", u)
	}
	b.WriteByte('>')
	return b.String()
}

func (w *pdfWriter) shape(sh *shape) {
	c := &w.content
	switch sh.kind {
	case shapeLine:
		fmt.Fprintf(c, "%s RG %s w [", pdfColour(sh.pen.colour), num(sh.pen.width))
		for _, d := range sh.pen.dash {
			fmt.Fprintf(c, "%s ", num(d))
		}
		c.WriteString("] 0 d\n")
		w.lines(sh.lines, sh.closed)
		c.WriteString("S\n")
	case shapeFill, shapeCells:
		w.setAlpha(sh.alpha)
		fmt.Fprintf(c, "%s rg\n", pdfColour(sh.fill))
		w.lines(sh.lines, true)
		c.WriteString("f\n")
		w.setAlpha(1)
	case shapeText:
		fmt.Fprintf(c, "%s rg\n", pdfColour(sh.fill))
		sh.outlines(w.scene.face, w.outline)
	case shapeImage:
		fmt.Fprintf(c, "q %s 0 0 %s %s %s cm /I%d Do Q\n", num(sh.box.width()), num(-sh.box.height()),
			num(sh.box.left), num(sh.box.bottom), len(w.images))
		w.images = append(w.images, sh.image)
	}
}

// setAlpha selects the graphics state for an opacity; the opaque one is only selected to end another.
func (w *pdfWriter) setAlpha(a float64) {
	if a == 1 && len(w.alphas) == 0 {
		return
	}
	for i, b := range w.alphas {
		if a == b {
			fmt.Fprintf(&w.content, "/A%d gs ", i)
			return
		}
	}
	w.alphas = append(w.alphas, a)
	fmt.Fprintf(&w.content, "/A%d gs ", len(w.alphas)-1)
}

func (w *pdfWriter) lines(lines [][]point, closed bool) {
	for _, l := range lines {
		for i, p := range l {
			op := "l"
			if i == 0 {
				op = "m"
			}
			fmt.Fprintf(&w.content, "%s %s %s\n", num(p.x), num(p.y), op)
		}
		if closed && len(l) > 0 {
			w.content.WriteString("h\n")
		}
	}
}

// outline fills a character; quadratic curves become cubic ones.
func (w *pdfWriter) outline(o []outline) {
	if len(o) == 0 {
		return
	}
	c := &w.content
	n := func(v float64) string { return fmt.Sprintf("%.3f", v) }
	var at point
	for _, s := range o {
		switch s.op {
		case 'M':
			fmt.Fprintf(c, "%s %s m\n", n(s.p.x), n(s.p.y))
			at = s.p
		case 'L':
			fmt.Fprintf(c, "%s %s l\n", n(s.p.x), n(s.p.y))
			at = s.p
		case 'Q':
			a := at.add(s.p.sub(at).times(2. / 3))
			b := s.q.add(s.p.sub(s.q).times(2. / 3))
			fmt.Fprintf(c, "%s %s %s %s %s %s c\n", n(a.x), n(a.y), n(b.x), n(b.y), n(s.q.x), n(s.q.y))
			at = s.q
		}
	}
	c.WriteString("f\n")
}

func pdfColour(c colour) string {
	f := func(v uint8) string { return fmt.Sprintf("%.3f", float64(v)/255) }
	return f(c.r) + " " + f(c.g) + " " + f(c.b)
}
