package figure

import (
	"bytes"
	"encoding/base64"
	"encoding/json"
	"fmt"
	"image"
	"image/png"
	"math"
	"strconv"
	"strings"
)

// fontStack names fonts of the same metrics as the ones that the layout was made with.
const fontStack = "Liberation Sans, Arimo, Arial, Helvetica, sans-serif"

// svg writes the scene. The document has no identifiers, so several can stand in one HTML page, and
// shapes whose colour has a role have a class made of it and of -line or -fill.
func (s *scene) svg() []byte {
	var b bytes.Buffer
	fmt.Fprintf(&b, `<svg xmlns="http://www.w3.org/2000/svg" version="1.1" class="figure" role="img" aria-label="%s" `+
		`width="%spt" height="%spt" viewBox="0 0 %s %s" font-family="%s" fill="none" stroke-linejoin="round">`+"\n",
		escapeXML(s.alt), num(s.width), num(s.height), num(s.width), num(s.height), fontStack)
	fmt.Fprintf(&b, "<title>%s</title>\n<desc>%s</desc>\n", escapeXML(s.title), escapeXML(s.alt))
	if len(s.meta) > 0 {
		fmt.Fprintf(&b, "<metadata>%s</metadata>\n", escapeXML(metaJSON(s.meta)))
	}
	for i := range s.shapes {
		s.shapes[i].svg(&b)
	}
	b.WriteString("</svg>\n")
	return b.Bytes()
}

func (sh *shape) svg(b *bytes.Buffer) {
	switch sh.kind {
	case shapeBegin:
		fmt.Fprintf(b, `<g class="%s"`, sh.class)
		if sh.name != "" {
			fmt.Fprintf(b, ` data-name="%s"`, escapeXML(sh.name))
		}
		b.WriteString(">\n")
	case shapeEnd:
		b.WriteString("</g>\n")
	case shapeLine:
		fmt.Fprintf(b, `<path%s stroke="%s" stroke-width="%s"`, class(sh.pen.colour, "line"), sh.pen.colour.hex(), num(sh.pen.width))
		if len(sh.pen.dash) > 0 {
			ds := make([]string, len(sh.pen.dash))
			for i, v := range sh.pen.dash {
				ds[i] = num(v)
			}
			fmt.Fprintf(b, ` stroke-dasharray="%s"`, strings.Join(ds, " "))
		}
		fmt.Fprintf(b, ` d="%s"/>`+"\n", pathData(sh.lines, sh.closed))
	case shapeFill:
		fmt.Fprintf(b, `<path%s fill="%s"`, class(sh.fill, "fill"), sh.fill.hex())
		if sh.alpha < 1 {
			fmt.Fprintf(b, ` fill-opacity="%s"`, num(sh.alpha))
		}
		fmt.Fprintf(b, ` d="%s"/>`+"\n", pathData(sh.lines, true))
	case shapeCells:
		fmt.Fprintf(b, `<path fill="%s" shape-rendering="crispEdges" d="%s"/>`+"\n", sh.fill.hex(), pathData(sh.lines, true))
	case shapeText:
		sh.svgText(b)
	case shapeImage:
		// Browsers show the pixels as they are, but some converters smooth them whatever the attributes
		// say; there only the outermost part of each magnified pixel suffers.
		fmt.Fprintf(b, `<image x="%s" y="%s" width="%s" height="%s" preserveAspectRatio="none" image-rendering="pixelated" `+
			`style="image-rendering:pixelated" href="data:image/png;base64,%s"/>`+"\n",
			num(sh.box.left), num(sh.box.top), num(sh.box.width()), num(sh.box.height()), encodeImage(magnified(sh.image)))
	}
}

func class(c colour, use string) string {
	if c.role == "" {
		return ""
	}
	return fmt.Sprintf(` class="%s-%s"`, c.role, use)
}

// magnified repeats each pixel of a small image, in both directions the same number of times.
func magnified(img *image.Paletted) *image.Paletted {
	nx, ny := img.Rect.Dx(), img.Rect.Dy()
	k := min(16, 600/max(nx, ny))
	if k < 2 {
		return img
	}
	out := image.NewPaletted(image.Rect(0, 0, k*nx, k*ny), img.Palette)
	for y := range k * ny {
		for x := range k * nx {
			out.Pix[y*out.Stride+x] = img.Pix[y/k*img.Stride+x/k]
		}
	}
	return out
}

// encodeImage is a PNG in base 64. Writing into memory does not fail.
func encodeImage(img *image.Paletted) string {
	var b bytes.Buffer
	e := png.Encoder{CompressionLevel: png.BestCompression}
	if err := e.Encode(&b, img); err != nil {
		return ""
	}
	return base64.StdEncoding.EncodeToString(b.Bytes())
}

// svgText writes a label; scripts are shifted spans, and the anchor does the rest, so that a font of
// other metrics does not tear it apart.
func (sh *shape) svgText(b *bytes.Buffer) {
	anchor := [...]string{"start", "middle", "end"}[sh.anchor]
	fmt.Fprintf(b, `<text%s fill="%s" font-size="%s" text-anchor="%s" xml:space="preserve"`,
		class(sh.fill, "fill"), sh.fill.hex(), num(sh.size), anchor)
	if sh.upwards {
		fmt.Fprintf(b, ` transform="translate(%s %s) rotate(-90)">`, num(sh.at.x), num(sh.at.y))
	} else {
		fmt.Fprintf(b, ` x="%s" y="%s">`, num(sh.at.x), num(sh.at.y))
	}
	x, y := 0.0, 0.0 // where the text stands, in units of its size
	for _, r := range sh.runs {
		var attr string
		if r.italic {
			attr += ` font-style="italic"`
		}
		if r.script != 0 {
			attr += fmt.Sprintf(` font-size="%s"`, num(sh.size*r.scale))
		}
		if dy := r.y - y; dy != 0 {
			attr += fmt.Sprintf(` dy="%s"`, num(dy*sh.size))
		}
		if dx := r.x - x; math.Abs(dx) > 1e-9 { // scripts above each other
			attr += fmt.Sprintf(` dx="%s"`, num(dx*sh.size))
		}
		x, y = r.x+r.width, r.y
		if attr == "" {
			b.WriteString(escapeXML(r.text))
			continue
		}
		fmt.Fprintf(b, "<tspan%s>%s</tspan>", attr, escapeXML(r.text))
	}
	b.WriteString("</text>\n")
}

// pathData writes polylines with absolute coordinates.
func pathData(lines [][]point, closed bool) string {
	var b strings.Builder
	for _, l := range lines {
		for i, p := range l {
			if i == 0 {
				b.WriteByte('M')
			} else {
				b.WriteByte('L')
			}
			b.WriteString(num(p.x))
			b.WriteByte(' ')
			b.WriteString(num(p.y))
		}
		if closed {
			b.WriteByte('Z')
		}
	}
	return b.String()
}

// num is a number with at most two decimals, a resolution of 4 micrometres.
func num(v float64) string {
	s := strconv.FormatFloat(math.Round(v*100)/100, 'f', 2, 64)
	s = strings.TrimRight(strings.TrimRight(s, "0"), ".")
	if s == "-0" {
		return "0"
	}
	return s
}

// escapeXML escapes a text for content and for attributes in double quotes; characters that XML does
// not allow become the replacement character.
func escapeXML(s string) string {
	var b strings.Builder
	for _, c := range s {
		switch {
		case c == '&':
			b.WriteString("&amp;")
		case c == '<':
			b.WriteString("&lt;")
		case c == '>':
			b.WriteString("&gt;")
		case c == '"':
			b.WriteString("&quot;")
		case c == '\n' || c == '\t':
			b.WriteRune(c)
		case c < ' ' || c == 0xfffe || c == 0xffff || c >= 0x7f && c <= 0x9f:
			b.WriteRune('\uFFFD')
		default:
			b.WriteRune(c)
		}
	}
	return b.String()
}

// metaJSON is the metadata as a JSON object on one line, in the given order.
func metaJSON(meta []Field) string {
	var b strings.Builder
	b.WriteByte('{')
	for i, f := range meta {
		if i > 0 {
			b.WriteString(", ")
		}
		b.WriteString(quoteJSON(f.Name) + ": " + quoteJSON(f.Value))
	}
	b.WriteByte('}')
	return b.String()
}

func quoteJSON(s string) string {
	var b bytes.Buffer
	e := json.NewEncoder(&b)
	e.SetEscapeHTML(false)
	if err := e.Encode(s); err != nil { // a string can always be encoded
		return `""`
	}
	return strings.TrimSuffix(b.String(), "\n")
}
