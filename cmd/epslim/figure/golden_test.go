package figure

import (
	"bytes"
	"crypto/sha256"
	"encoding/base64"
	"fmt"
	"image/png"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

var dataURI = regexp.MustCompile(`data:image/png;base64,([A-Za-z0-9+/=]*)`)

// withoutCompression replaces each embedded image by its size and a hash of its pixels, so that golden files
// do not depend on the compressor of the Go release.
func withoutCompression(t *testing.T, svg []byte) []byte {
	t.Helper()
	return dataURI.ReplaceAllFunc(svg, func(uri []byte) []byte {
		raw, err := base64.StdEncoding.DecodeString(string(dataURI.FindSubmatch(uri)[1]))
		if err != nil {
			t.Fatal(err)
		}
		img, err := png.Decode(bytes.NewReader(raw))
		if err != nil {
			t.Fatal(err)
		}
		h := sha256.New()
		b := img.Bounds()
		for y := b.Min.Y; y < b.Max.Y; y++ {
			for x := b.Min.X; x < b.Max.X; x++ {
				r, g, bl, _ := img.At(x, y).RGBA()
				fmt.Fprintf(h, "%02x%02x%02x", r>>8, g>>8, bl>>8)
			}
		}
		return fmt.Appendf(nil, "png %dx%d sha256 %x", b.Dx(), b.Dy(), h.Sum(nil)[:8])
	})
}

// TestGolden compares SVG, pgfplots and small CSV files with those under testdata; -update rewrites them.
func TestGolden(t *testing.T) {
	for _, e := range examples() {
		t.Run(e.name, func(t *testing.T) {
			p := e.plot()
			svg, err := p.SVG()
			if err != nil {
				t.Fatal(err)
			}
			compareGolden(t, e.name+".svg", withoutCompression(t, svg))
			files, err := p.TeX(e.name)
			if err != nil {
				t.Fatal(err)
			}
			for _, f := range files {
				if strings.HasSuffix(f.Name, ".tex") || strings.HasSuffix(f.Name, ".csv") && len(f.Data) < 12000 {
					compareGolden(t, f.Name, f.Data)
				}
			}
		})
	}
}

func compareGolden(t *testing.T, name string, got []byte) {
	t.Helper()
	path := filepath.Join("testdata", name)
	if *update {
		if err := os.MkdirAll("testdata", 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(path, got, 0o644); err != nil {
			t.Fatal(err)
		}
		return
	}
	want, err := os.ReadFile(path)
	if err != nil {
		t.Fatalf("%v; run the test with -update and look at the figure with -gallery", err)
	}
	if bytes.Equal(got, want) {
		return
	}
	g, w := strings.Split(string(got), "\n"), strings.Split(string(want), "\n")
	for i := range min(len(g), len(w)) {
		if g[i] != w[i] {
			t.Fatalf("%s differs at line %d:\n got %.300s\nwant %.300s", name, i+1, g[i], w[i])
		}
	}
	t.Fatalf("%s has %d lines, want %d", name, len(g), len(w))
}

// TestSameBytes draws a figure of each kind twice.
func TestSameBytes(t *testing.T) {
	for _, e := range examples() {
		p := e.plot()
		p.DPI = 72
		a, err := p.Files("f")
		if err != nil {
			t.Fatalf("%s: %v", e.name, err)
		}
		p = e.plot()
		p.DPI = 72
		b, err := p.Files("f")
		if err != nil {
			t.Fatalf("%s: %v", e.name, err)
		}
		if len(a) != len(b) {
			t.Fatalf("%s: %d files, then %d", e.name, len(a), len(b))
		}
		for i := range a {
			if a[i].Name != b[i].Name || !bytes.Equal(a[i].Data, b[i].Data) {
				t.Errorf("%s: %s differs between two runs", e.name, a[i].Name)
			}
		}
	}
}
