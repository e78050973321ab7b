package figure

import (
	"flag"
	"image"
	"image/png"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
	"strings"
	"testing"
)

// These tests look at the files with the programs of others. Each is skipped, with a line that says so, only when
// its program is not installed.

var allLaTeX = flag.Bool("latex", false, "set every figure of the gallery with pdflatex, and not only six")

func program(t *testing.T, names ...string) string {
	t.Helper()
	for _, n := range names {
		if p, err := exec.LookPath(n); err == nil {
			return p
		}
	}
	t.Skipf("none of %v is installed: this check is not made", names)
	return ""
}

func readPNG(t *testing.T, path string) image.Image {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	img, err := png.Decode(f)
	if err != nil {
		t.Fatal(err)
	}
	return img
}

// writeSVG writes a figure into a folder of its own, stretched to a whole number of pixels a point.
func writeSVG(t *testing.T, p *Plot) (path string, d *drawing) {
	t.Helper()
	d, err := p.prepare()
	if err != nil {
		t.Fatal(err)
	}
	svg, err := p.SVG()
	if err != nil {
		t.Fatal(err)
	}
	path = filepath.Join(t.TempDir(), "figure.svg")
	if err := os.WriteFile(path, svg, 0o644); err != nil {
		t.Fatal(err)
	}
	return path, d
}

// crop is the part of an image that shows the figure.
func crop(img image.Image, w, h float64) image.Image {
	type subImager interface {
		SubImage(image.Rectangle) image.Image
	}
	s, ok := img.(subImager)
	if !ok {
		return img
	}
	return s.SubImage(image.Rect(0, 0, int(w+0.5), int(h+0.5)))
}

func TestCellsInABrowser(t *testing.T) {
	browser := program(t, "chromium", "chromium-browser", "google-chrome")
	path, d := writeSVG(t, checkered(18, 12))
	const scale = 4.0
	html := strings.TrimSuffix(path, ".svg") + ".html"
	w, h := d.s.width*scale, d.s.height*scale
	body := `<body style="margin:0"><img src="figure.svg" style="width:` + strconv.FormatFloat(w, 'f', 3, 64) + `px"></body>`
	if err := os.WriteFile(html, []byte(body), 0o644); err != nil {
		t.Fatal(err)
	}
	shot := html + ".png"
	c := exec.Command(browser, "--headless", "--no-sandbox", "--disable-gpu", "--hide-scrollbars", "--force-color-profile=srgb",
		"--user-data-dir="+t.TempDir(), "--window-size="+strconv.Itoa(int(w)+40)+","+strconv.Itoa(int(h)+140), "--screenshot="+shot, "file://"+html)
	if out, err := c.CombinedOutput(); err != nil {
		t.Fatalf("%v\n%s", err, out)
	}
	cellsIn(t, crop(readPNG(t, shot), w, h), d, 3)
}

func TestCellsInAConverter(t *testing.T) {
	convert := program(t, "rsvg-convert")
	path, d := writeSVG(t, checkered(18, 12))
	out := path + ".png"
	if o, err := exec.Command(convert, "--zoom", "4", "-o", out, path).CombinedOutput(); err != nil {
		t.Fatalf("%v\n%s", err, o)
	}
	cellsIn(t, readPNG(t, out), d, 5) // of 45 pixels a cell
}

func TestCellsInAPDF(t *testing.T) {
	convert := program(t, "pdftoppm")
	p := checkered(18, 12)
	d, err := p.prepare()
	if err != nil {
		t.Fatal(err)
	}
	pdf, err := p.PDF()
	if err != nil {
		t.Fatal(err)
	}
	base := filepath.Join(t.TempDir(), "figure")
	if err := os.WriteFile(base+".pdf", pdf, 0o644); err != nil {
		t.Fatal(err)
	}
	out, err := exec.Command(convert, "-png", "-r", "288", "-singlefile", base+".pdf", base).CombinedOutput()
	if err != nil || len(out) > 0 { // it reports faults of the file on standard error
		t.Fatalf("%v\n%s", err, out)
	}
	cellsIn(t, readPNG(t, base+".png"), d, 4)
}

// TestLaTeXCompiles sets the pgfplots files of several kinds in one article, without an error, a warning or an overfull box.
func TestLaTeXCompiles(t *testing.T) {
	latex := program(t, "pdflatex")
	if err := exec.Command("kpsewhich", "pgfplots.sty").Run(); err != nil {
		t.Skip("pgfplots is not installed: this check is not made")
	}
	dir := t.TempDir()
	var doc strings.Builder
	doc.WriteString("\\documentclass{article}\n\\usepackage[T1]{fontenc}\n\\usepackage{pgfplots}\\pgfplotsset{compat=1.18}\\usepgfplotslibrary{fillbetween}\n" +
		"\\begin{document}\\noindent\n")
	for _, e := range examples() {
		switch e.name {
		case "line", "histogram", "eps-convergence", "difference", "uneven", "extremes":
		default: // -latex sets the whole gallery, which takes a while
			if !*allLaTeX {
				continue
			}
		}
		files, err := e.plot().TeX(e.name)
		if err != nil {
			t.Fatalf("%s: %v", e.name, err)
		}
		for _, f := range files {
			if err := os.WriteFile(filepath.Join(dir, f.Name), f.Data, 0o644); err != nil {
				t.Fatal(err)
			}
		}
		// A figure is 17 cm wide at most, the text of this class is narrower.
		doc.WriteString("\\makebox[0pt][l]{\\input{" + e.name + "}}\\par\n")
	}
	doc.WriteString("\\end{document}\n")
	if err := os.WriteFile(filepath.Join(dir, "all.tex"), []byte(doc.String()), 0o644); err != nil {
		t.Fatal(err)
	}
	c := exec.Command(latex, "-interaction=nonstopmode", "-halt-on-error", "all.tex")
	c.Dir = dir
	out, err := c.CombinedOutput()
	log := string(out)
	if err != nil {
		t.Fatalf("%v\n%s", err, log[max(0, len(log)-3000):])
	}
	for _, bad := range []string{"Warning", "Overfull", "Underfull", "Missing character"} {
		if i := strings.Index(log, bad); i >= 0 {
			t.Errorf("pdflatex says: %.300s", log[i:])
		}
	}
}
