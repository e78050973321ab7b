package figure

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"hash/crc32"
	"image"
	"image/color"
	"image/draw"
	"image/png"
	"math"

	"golang.org/x/image/vector"
)

// maxPixels bounds the pixels of a PNG.
const maxPixels = 1 << 27

// png writes the scene as an image with at least the given resolution.
func (s *scene) png(dpi float64) ([]byte, error) {
	scale := s.pixelsPerPoint(dpi)
	w, h := math.Round(s.width*scale), math.Round(s.height*scale)
	if w*h > maxPixels {
		return nil, &DataError{"settings resolution", -1, fmt.Sprintf("an image of %.0f by %.0f pixels is too large", w, h)}
	}
	r := &raster{face: s.face, scale: scale, img: image.NewRGBA(image.Rect(0, 0, int(w), int(h)))}
	if s.rasterColumns > 0 { // move everything by a part of a pixel, so that the cells begin at a pixel
		r.dx = math.Round(s.rasterBox.left*scale) - s.rasterBox.left*scale
		r.dy = math.Round(s.rasterBox.top*scale) - s.rasterBox.top*scale
	}
	draw.Draw(r.img, r.img.Bounds(), image.White, image.Point{}, draw.Src)
	for i := range s.shapes {
		r.draw(&s.shapes[i])
	}
	var b bytes.Buffer
	if err := png.Encode(&b, r.img); err != nil {
		return nil, fmt.Errorf("figure: writing a PNG: %w", err)
	}
	return withText(b.Bytes(), scale*72, append([]Field{{"Title", s.title}, {"Description", s.alt}}, s.meta...)), nil
}

// pixelsPerPoint is at least dpi/72; with a heat map such that a cell is a whole number of pixels wide.
func (s *scene) pixelsPerPoint(dpi float64) float64 {
	scale := dpi / 72
	if s.rasterColumns > 0 {
		n := float64(s.rasterColumns)
		w := s.rasterBox.width()
		scale = math.Ceil(w*scale/n-1e-9) * n / w
	}
	return scale
}

// raster draws shapes into an image.
type raster struct {
	face   *typeface
	scale  float64
	dx, dy float64
	img    *image.RGBA
	z      vector.Rasterizer
}

func (r *raster) at(p point) point { return point{p.x*r.scale + r.dx, p.y*r.scale + r.dy} }

func (r *raster) draw(sh *shape) {
	switch sh.kind {
	case shapeLine:
		r.fill(polygonOutlines(strokePolygons(sh.lines, sh.closed, sh.pen.width, sh.pen.dash)), sh.pen.colour, 1)
	case shapeFill:
		r.fill(polygonOutlines(sh.lines), sh.fill, sh.alpha)
	case shapeText:
		sh.outlines(r.face, func(o []outline) { r.fill(o, sh.fill, 1) })
	case shapeImage:
		r.pixels(sh)
	case shapeCells:
		for _, c := range sh.lines {
			a, b := r.at(c[0]), r.at(c[2])
			rect := image.Rect(int(math.Round(a.x)), int(math.Round(a.y)), int(math.Round(b.x)), int(math.Round(b.y)))
			draw.Draw(r.img, rect, image.NewUniform(sh.fill.rgba(1)), image.Point{}, draw.Src)
		}
	}
}

func polygonOutlines(polys [][]point) []outline {
	var out []outline
	for _, poly := range polys {
		for i, p := range poly {
			op := byte('L')
			if i == 0 {
				op = 'M'
			}
			out = append(out, outline{op: op, p: p})
		}
	}
	return out
}

func (c colour) rgba(alpha float64) color.NRGBA {
	return color.NRGBA{c.r, c.g, c.b, uint8(math.Round(alpha * 255))}
}

// fill fills a path with the non-zero winding rule; only the part of the image that it covers is visited.
func (r *raster) fill(path []outline, c colour, alpha float64) {
	lo, hi := point{math.Inf(1), math.Inf(1)}, point{math.Inf(-1), math.Inf(-1)}
	for _, o := range path {
		for i, p := range []point{r.at(o.p), r.at(o.q)} {
			if i == 1 && o.op != 'Q' {
				continue
			}
			lo = point{math.Min(lo.x, p.x), math.Min(lo.y, p.y)}
			hi = point{math.Max(hi.x, p.x), math.Max(hi.y, p.y)}
		}
	}
	if !(lo.x <= hi.x) {
		return
	}
	b := image.Rect(int(math.Floor(lo.x)), int(math.Floor(lo.y)), int(math.Ceil(hi.x))+1, int(math.Ceil(hi.y))+1).Intersect(r.img.Bounds())
	if b.Empty() {
		return
	}
	r.z.Reset(b.Dx(), b.Dy())
	for i, o := range path {
		p, q := r.at(o.p), r.at(o.q)
		px, py := float32(p.x-float64(b.Min.X)), float32(p.y-float64(b.Min.Y))
		switch o.op {
		case 'M':
			if i > 0 {
				r.z.ClosePath()
			}
			r.z.MoveTo(px, py)
		case 'L':
			r.z.LineTo(px, py)
		case 'Q':
			r.z.QuadTo(px, py, float32(q.x-float64(b.Min.X)), float32(q.y-float64(b.Min.Y)))
		}
	}
	r.z.ClosePath()
	r.z.Draw(r.img, b, image.NewUniform(c.rgba(alpha)), image.Point{})
}

// pixels draws each pixel of an image as a rectangle between rounded boundaries.
func (r *raster) pixels(sh *shape) {
	a, b := r.at(point{sh.box.left, sh.box.top}), r.at(point{sh.box.right, sh.box.bottom})
	nx, ny := sh.image.Rect.Dx(), sh.image.Rect.Dy()
	x0, x1, y0, y1 := math.Round(a.x), math.Round(b.x), math.Round(a.y), math.Round(b.y)
	colours := make([]color.RGBA, len(sh.image.Palette))
	for i, c := range sh.image.Palette {
		colours[i], _ = c.(color.RGBA)
	}
	for y := int(y0); y < int(y1); y++ {
		j := min(ny-1, int((float64(y)+0.5-y0)/(y1-y0)*float64(ny)))
		for x := int(x0); x < int(x1); x++ {
			i := min(nx-1, int((float64(x)+0.5-x0)/(x1-x0)*float64(nx)))
			r.img.SetRGBA(x, y, colours[sh.image.Pix[j*sh.image.Stride+i]])
		}
	}
}

// withText adds the resolution and texts to a PNG, behind its first chunk (PNG specification, second
// edition, 11.3.4.5 and 11.3.5.3).
func withText(data []byte, dpi float64, fields []Field) []byte {
	const header = 8 + 25 // signature and IHDR
	var b bytes.Buffer
	b.Write(data[:header])
	var phys [9]byte
	perMetre := uint32(math.Round(dpi / 0.0254))
	binary.BigEndian.PutUint32(phys[0:], perMetre)
	binary.BigEndian.PutUint32(phys[4:], perMetre)
	phys[8] = 1
	chunk(&b, "pHYs", phys[:])
	for _, f := range fields {
		text := append([]byte(keyword(f.Name)), 0, 0, 0, 0, 0) // uncompressed, no language, no translation
		chunk(&b, "iTXt", append(text, bytes.ToValidUTF8([]byte(f.Value), []byte("\uFFFD"))...))
	}
	b.Write(data[header:])
	return b.Bytes()
}

// keyword keeps what a PNG allows in the name of a text: at most 79 printable ASCII characters.
func keyword(s string) string {
	out := make([]byte, 0, len(s))
	for i := 0; i < len(s) && len(out) < 79; i++ {
		if c := s[i]; c >= ' ' && c < 0x7f && !(c == ' ' && len(out) == 0) {
			out = append(out, c)
		}
	}
	if len(out) == 0 {
		return "Comment"
	}
	return string(out)
}

func chunk(b *bytes.Buffer, kind string, data []byte) {
	var n [4]byte
	binary.BigEndian.PutUint32(n[:], uint32(len(data)))
	b.Write(n[:])
	body := append([]byte(kind), data...)
	b.Write(body)
	binary.BigEndian.PutUint32(n[:], crc32.ChecksumIEEE(body))
	b.Write(n[:])
}
