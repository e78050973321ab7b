package figure

import (
	"bytes"
	"encoding/base64"
	"encoding/xml"
	"image"
	"image/color"
	"image/png"
	"io"
	"math"
	"regexp"
	"strconv"
	"strings"
	"testing"
)

// node is an element of a parsed SVG.
type node struct {
	XMLName  xml.Name
	Attrs    []xml.Attr `xml:",any,attr"`
	Text     string     `xml:",chardata"`
	Children []node     `xml:",any"`
}

func (n *node) attr(name string) string {
	for _, a := range n.Attrs {
		if a.Name.Local == name {
			return a.Value
		}
	}
	return ""
}

func (n *node) number(t *testing.T, name string) float64 {
	t.Helper()
	v, err := strconv.ParseFloat(n.attr(name), 64)
	if err != nil {
		t.Fatalf("<%s %s=%q>: %v", n.XMLName.Local, name, n.attr(name), err)
	}
	return v
}

func (n *node) walk(f func(*node)) {
	f(n)
	for i := range n.Children {
		n.Children[i].walk(f)
	}
}

func (n *node) group(t *testing.T, class, name string) *node {
	t.Helper()
	var found *node
	n.walk(func(m *node) {
		if m.XMLName.Local == "g" && m.attr("class") == class && (name == "" || m.attr("data-name") == name) && found == nil {
			found = m
		}
	})
	if found == nil {
		t.Fatalf("no group %q %q", class, name)
	}
	return found
}

// wholeText is the text of a label with its scripts, in order. The tspans are in Children.
func (n *node) wholeText() string {
	s := n.Text
	for i := range n.Children {
		s += n.Children[i].wholeText()
	}
	return s
}

func parseSVG(t *testing.T, p *Plot) *node {
	t.Helper()
	b, err := p.SVG()
	if err != nil {
		t.Fatal(err)
	}
	var n node
	d := xml.NewDecoder(bytes.NewReader(b))
	if err := d.Decode(&n); err != nil {
		t.Fatalf("not XML: %v", err)
	}
	if _, err := d.Token(); err != nil && err != io.EOF {
		t.Fatalf("after the root: %v", err)
	}
	return &n
}

var coordinate = regexp.MustCompile(`-?[0-9.]+`)

// pathPoints are the points of a path with absolute M, L and Z commands.
func pathPoints(t *testing.T, d string) (out []point) {
	t.Helper()
	nums := coordinate.FindAllString(d, -1)
	for i := 0; i+1 < len(nums); i += 2 {
		x, err1 := strconv.ParseFloat(nums[i], 64)
		y, err2 := strconv.ParseFloat(nums[i+1], 64)
		if err1 != nil || err2 != nil {
			t.Fatalf("path %q", d)
		}
		out = append(out, point{x, y})
	}
	return out
}

// readAxis finds, from the drawn ticks and their labels alone, the map from values to places: a straight
// line through (value, place), or (log value, place).
func readAxis(t *testing.T, g *node, across, log bool) func(float64) float64 {
	t.Helper()
	var ticks, values []float64
	var pendingTick float64
	for i := range g.Children {
		c := &g.Children[i]
		switch c.XMLName.Local {
		case "path":
			p := pathPoints(t, c.attr("d"))
			pendingTick = p[0].x
			if !across {
				pendingTick = p[0].y
			}
		case "text":
			text := strings.ReplaceAll(c.wholeText(), "−", "-")
			if rest, ok := strings.CutPrefix(text, "10"); ok && len(c.Children) > 0 {
				text = "1e" + rest
			}
			v, err := strconv.ParseFloat(text, 64)
			if err != nil {
				continue // the label of the axis
			}
			ticks, values = append(ticks, pendingTick), append(values, v)
		}
	}
	if len(values) < 2 {
		t.Fatalf("only %d labelled ticks", len(values))
	}
	f := func(v float64) float64 { return v }
	if log {
		f = math.Log
	}
	n := len(values) - 1
	slope := (ticks[n] - ticks[0]) / (f(values[n]) - f(values[0]))
	at := func(v float64) float64 { return ticks[0] + slope*(f(v)-f(values[0])) }
	for i := range values {
		if math.Abs(at(values[i])-ticks[i]) > 0.011 {
			t.Errorf("the tick %v is at %v, by the others it should be at %v", values[i], ticks[i], at(values[i]))
		}
	}
	return at
}

func TestPointsLandOnTheirAxisPositions(t *testing.T) {
	x := []float64{0.013, 0.1, 0.37, 1.9, 4.2}
	y := []float64{120, 3, 18, 0.7, 55}
	for _, log := range []bool{false, true} {
		for _, width := range []Width{OneColumn, FullWidth} {
			p := &Plot{Settings: Settings{Width: width}, X: Axis{Label: "$x$", Log: log}, Y: Axis{Label: "$y$", Log: log},
				Series: []Series{{Label: "data", X: x, Y: y}}}
			n := parseSVG(t, p)
			atX := readAxis(t, n.group(t, "axis-x", ""), true, log)
			atY := readAxis(t, n.group(t, "axis-y", ""), false, log)
			line := pathPoints(t, n.group(t, "series", "data").Children[0].attr("d"))
			if len(line) != len(x) {
				t.Fatalf("the line has %d points, want %d", len(line), len(x))
			}
			for i, q := range line {
				if math.Abs(q.x-atX(x[i])) > 0.02 || math.Abs(q.y-atY(y[i])) > 0.02 {
					t.Errorf("log=%v: point %d is at (%v, %v), want (%v, %v)", log, i, q.x, q.y, atX(x[i]), atY(y[i]))
				}
			}
		}
	}
}

func TestSVGStructure(t *testing.T) {
	for _, e := range examples() {
		t.Run(e.name, func(t *testing.T) {
			n := parseSVG(t, e.plot())
			if n.XMLName.Local != "svg" || n.attr("role") != "img" || n.attr("aria-label") == "" {
				t.Error("no root with a role and a label")
			}
			if n.Children[0].XMLName.Local != "title" || n.Children[0].Text == "" || n.Children[1].XMLName.Local != "desc" || n.Children[1].Text == "" {
				t.Error("no title and description in front")
			}
			w, h := 0.0, 0.0
			if v := strings.Fields(n.attr("viewBox")); len(v) == 4 {
				w, _ = strconv.ParseFloat(v[2], 64)
				h, _ = strconv.ParseFloat(v[3], 64)
			}
			n.walk(func(m *node) {
				if m.attr("id") != "" {
					t.Errorf("an identifier %q, which clashes when two figures share a page", m.attr("id"))
				}
				if m.XMLName.Local != "path" {
					return
				}
				for _, p := range pathPoints(t, m.attr("d")) {
					if p.x < -0.01 || p.y < -0.01 || p.x > w+0.01 || p.y > h+0.01 {
						t.Fatalf("a point at (%v, %v), outside %v by %v", p.x, p.y, w, h)
					}
				}
			})
		})
	}
}

func frameOf(t *testing.T, n *node) rect {
	t.Helper()
	p := pathPoints(t, n.group(t, "frame", "").Children[0].attr("d"))
	return rect{p[0].x, p[0].y, p[2].x, p[2].y}
}

func TestHeatMapFillsTheFrame(t *testing.T) {
	xe, ye := UniformEdges(-1, 2, 6), UniformEdges(0, 1, 2)
	p := DensityMap(DensityMapData{XLabel: "$x$", YLabel: "$y$", XEdges: xe, YEdges: ye,
		Density: []float64{0, 1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11}}, Settings{})
	n := parseSVG(t, p)
	frame := frameOf(t, n)
	img := n.group(t, "heat-map", "").Children[0]
	if img.attr("preserveAspectRatio") != "none" || img.attr("image-rendering") != "pixelated" {
		t.Error("the image may be letter-boxed or smoothed")
	}
	x, y, w, h := img.number(t, "x"), img.number(t, "y"), img.number(t, "width"), img.number(t, "height")
	for _, d := range []float64{x - frame.left, y - frame.top, x + w - frame.right, y + h - frame.bottom} {
		if math.Abs(d) > 1e-9 {
			t.Errorf("the image (%v, %v, %v, %v) is not the frame %v", x, y, w, h, frame)
		}
	}
	if ratio := frame.width() / frame.height(); math.Abs(ratio-3) > 0.001 {
		t.Errorf("width : height = %v, want 3 as in the units of the axes", ratio)
	}
	raw, err := base64.StdEncoding.DecodeString(strings.TrimPrefix(img.attr("href"), "data:image/png;base64,"))
	if err != nil {
		t.Fatal(err)
	}
	pix, err := png.Decode(bytes.NewReader(raw))
	if err != nil {
		t.Fatal(err)
	}
	k := pix.Bounds().Dx() / 6
	if pix.Bounds().Dx() != 6*k || pix.Bounds().Dy() != 2*k {
		t.Fatalf("the image has %v pixels, want a multiple of 6 by 2", pix.Bounds().Size())
	}
	table := Viridis.table()
	for j := range 2 {
		for i := range 6 {
			v := float64(j*6 + i)
			want := table[min(255, int(v/11*256))]
			if got := color.RGBAModel.Convert(pix.At(i*k+k/2, (1-j)*k)); got != want {
				t.Errorf("cell (%d, %d) is %v, want %v", i, j, got, want)
			}
		}
	}
	atX := readAxis(t, n.group(t, "axis-x", ""), true, false)
	if math.Abs(atX(-1)-x) > 0.02 || math.Abs(atX(2)-(x+w)) > 0.02 {
		t.Errorf("the cells reach from %v to %v, the axis says %v to %v", x, x+w, atX(-1), atX(2))
	}
}

func TestUnevenCellsLandOnTheAxis(t *testing.T) {
	edges := []float64{0, 1, 3, 7}
	p := DensityMap(DensityMapData{XLabel: "$x$", YLabel: "$y$", XEdges: edges, YEdges: []float64{0, 2, 6},
		Density: []float64{0, 1, 2, 3, 4, 5}}, Settings{})
	n := parseSVG(t, p)
	atX := readAxis(t, n.group(t, "axis-x", ""), true, false)
	atY := readAxis(t, n.group(t, "axis-y", ""), false, false)
	cells := n.group(t, "heat-map", "").Children
	if len(cells) != 6 {
		t.Fatalf("%d colours, want 6", len(cells))
	}
	ye := []float64{0, 2, 6}
	for k := range cells {
		q := pathPoints(t, cells[k].attr("d"))
		i, j := k%3, k/3
		for _, d := range []float64{q[0].x - atX(edges[i]), q[2].x - atX(edges[i+1]), q[0].y - atY(ye[j+1]), q[2].y - atY(ye[j])} {
			if math.Abs(d) > 0.02 {
				t.Errorf("cell (%d, %d) is off by %v", i, j, d)
			}
		}
	}
}

// cellsIn checks that an image of the whole figure, scale pixels a point, shows each cell of the checked map in
// its colour right up to its corners, margin pixels inside.
func cellsIn(t *testing.T, img image.Image, d *drawing, margin float64) {
	t.Helper()
	scale := float64(img.Bounds().Dx()) / d.s.width
	cells := d.cells()
	nx, ny := cells.Rect.Dx(), cells.Rect.Dy()
	wrong := 0
	for j := range ny {
		for i := range nx {
			left := (d.box.left + d.box.width()*float64(i)/float64(nx)) * scale
			right := (d.box.left + d.box.width()*float64(i+1)/float64(nx)) * scale
			top := (d.box.top + d.box.height()*float64(j)/float64(ny)) * scale
			bottom := (d.box.top + d.box.height()*float64(j+1)/float64(ny)) * scale
			want, _ := cells.Palette[cells.Pix[j*cells.Stride+i]].(color.RGBA)
			for _, p := range []point{{left + margin, top + margin}, {right - margin, top + margin},
				{left + margin, bottom - margin}, {right - margin, bottom - margin}, {(left + right) / 2, (top + bottom) / 2}} {
				got, _ := color.RGBAModel.Convert(img.At(int(p.x), int(p.y))).(color.RGBA)
				if abs(got.R, want.R) > 2 || abs(got.G, want.G) > 2 || abs(got.B, want.B) > 2 {
					wrong++
					if wrong < 5 {
						t.Errorf("cell (%d, %d) at %v: %v, want %v", i, j, p, got, want)
					}
				}
			}
		}
	}
	if wrong > 0 {
		t.Errorf("%d places of %d have the wrong colour", wrong, 5*nx*ny)
	}
}

func abs(a, b uint8) int { return int(math.Abs(float64(a) - float64(b))) }

// checkered is a map on which neighbours differ strongly, so that smoothing or a shift shows.
func checkered(nx, ny int) *Plot {
	xe, ye := UniformEdges(0, float64(nx), nx), UniformEdges(0, float64(ny), ny)
	v := onGrid(xe, ye, func(x, y float64) float64 { return math.Mod(math.Floor(x)*5+math.Floor(y)*3, 7) })
	return DensityMap(DensityMapData{XLabel: "$x$", YLabel: "$y$", XEdges: xe, YEdges: ye, Density: v}, Settings{})
}

func TestPNGCells(t *testing.T) {
	for _, size := range [][2]int{{9, 6}, {40, 30}, {7, 20}} {
		p := checkered(size[0], size[1])
		d, err := p.prepare()
		if err != nil {
			t.Fatal(err)
		}
		b, err := p.PNG()
		if err != nil {
			t.Fatal(err)
		}
		img, err := png.Decode(bytes.NewReader(b))
		if err != nil {
			t.Fatal(err)
		}
		if dpi := float64(img.Bounds().Dx()) / d.s.width * 72; dpi < 299 {
			t.Errorf("%v dots an inch, want at least 300", dpi)
		}
		// The frame covers a pixel and a half of the outer cells, and everything may be moved by half a pixel.
		cellsIn(t, img, d, 3.5)
	}
}

func TestEachCellHasAPixel(t *testing.T) {
	xe := UniformEdges(0, 1, 1500)
	p := DensityMap(DensityMapData{XEdges: xe, YEdges: UniformEdges(0, 0.4, 600),
		Density: make([]float64, 1500*600)}, Settings{})
	s, err := p.scene()
	if err != nil {
		t.Fatal(err)
	}
	scale := s.pixelsPerPoint(300)
	if px := scale * s.rasterBox.width() / 1500; math.Abs(px-1) > 1e-9 {
		t.Errorf("%v pixels a cell, want 1", px)
	}
}
