package density

import (
	"archive/zip"
	"bytes"
	"encoding/binary"
	"io"
	"math"
	"strings"
	"testing"

	"epslim/solver/grid"
	"epslim/solver/volume"
)

func TestWriters(t *testing.T) {
	g := box(t, grid.Reflecting, 0, 1, 4, 3)
	r, err := Stationary(bg, g, volume.Func(crawler), Settings{})
	if err != nil {
		t.Fatal(err)
	}
	cols := r.Columns(r.Current(), nil)
	var one, two bytes.Buffer
	if err := WriteCSV(&one, "first line\nsecond", r, cols); err != nil {
		t.Fatal(err)
	}
	lines := strings.Split(strings.TrimSpace(one.String()), "\n")
	if len(lines) != 3+12 || lines[0] != "# first line" || lines[2] != "x,y,p,J_x,J_y" || !strings.HasPrefix(lines[3], "0.125,0.16666666666666666,") {
		t.Errorf("CSV:\n%s", one.String())
	}
	one.Reset()
	for _, b := range []*bytes.Buffer{&one, &two} {
		if err := WriteNPZ(b, map[string]string{"model": "gel crawler \u03b5"}, r, cols); err != nil {
			t.Fatal(err)
		}
	}
	if !bytes.Equal(one.Bytes(), two.Bytes()) {
		t.Error("two archives of the same result differ")
	}
	z, err := zip.NewReader(bytes.NewReader(one.Bytes()), int64(one.Len()))
	if err != nil {
		t.Fatal(err)
	}
	files := map[string][]byte{}
	for _, f := range z.File {
		rc, err := f.Open()
		if err != nil {
			t.Fatal(err)
		}
		if files[f.Name], err = io.ReadAll(rc); err != nil {
			t.Fatal(err)
		}
	}
	p := files["p.npy"]
	size := int(binary.LittleEndian.Uint16(p[8:]))
	head := string(p[10 : 10+size])
	if (10+size)%64 != 0 || !strings.Contains(head, "'shape': (3, 4)") || !strings.Contains(head, "'<f8'") || !strings.HasSuffix(head, "\n") {
		t.Errorf("header %q", head)
	}
	for k, want := range r.P {
		if got := math.Float64frombits(binary.LittleEndian.Uint64(p[10+size+8*k:])); got != want {
			t.Fatalf("value %d is %v, want %v", k, got, want)
		}
	}
	if len(files["edges_x.npy"]) == 0 || !strings.Contains(string(files["meta.npy"]), "'<U25'") {
		t.Errorf("archive has %d files, meta %q", len(files), files["meta.npy"][:64])
	}
}

// The window of an Ornstein-Uhlenbeck process about 30 with standard deviation
// 0.1 is found from a bad guess; of a Gamma law on the half line; and Brownian
// motion has none.
func TestWindows(t *testing.T) {
	inf := math.Inf(1)
	far := volume.Func(func(x, f, a []float64) { f[0], a[0] = 30-x[0], 0.02 })
	w, err := Windows(bg, far, []Range{{Name: "x", Lo: -inf, Hi: inf}}, [][2]float64{{-1, 1}}, 64, Settings{})
	if err != nil {
		t.Fatal(err)
	}
	if !(w[0].Lo < 29.5 && w[0].Lo > 27 && w[0].Hi > 30.5 && w[0].Hi < 33) {
		t.Errorf("window %+v", w[0])
	}
	root := volume.Func(func(x, f, a []float64) { f[0], a[0] = 1-x[0], 0.5*x[0] })
	w, err = Windows(bg, root, []Range{{Name: "x", Lo: 0, Hi: inf}}, [][2]float64{{0, 1}}, 64, Settings{})
	if err != nil {
		t.Fatal(err)
	}
	if w[0].Lo != 0 || !(w[0].Hi > 3 && w[0].Hi < 15) {
		t.Errorf("window %+v", w[0])
	}
	free := volume.Func(func(x, f, a []float64) { a[0] = 1 })
	if _, err = Windows(bg, free, []Range{{Name: "x", Lo: -inf, Hi: inf}}, [][2]float64{{-1, 1}}, 64, Settings{}); err == nil || !strings.Contains(err.Error(), "x") {
		t.Errorf("Brownian motion: %v", err)
	}
}

// Zero noise along an axis, transient cells, and coefficients from a table.
func TestDegenerate(t *testing.T) {
	// y is pushed down to the wall without noise: all mass ends in the lowest row,
	// the others are transient.
	fall := volume.Func(func(x, f, a []float64) { f[1], a[0] = -1, 1 })
	for _, m := range []Method{Direct, Multigrid} {
		r, err := Stationary(bg, box(t, grid.Reflecting, 0, 1, 20, 20), fall, Settings{Method: m})
		if err != nil {
			t.Fatal(err)
		}
		if r.Transient != 380 || !strings.Contains(r.Operator.Report.String(), "no noise along y") {
			t.Errorf("%v: %d transient cells, report %q", m, r.Transient, r.Operator.Report.String())
		}
		if v := r.Marginal(1); math.Abs(v[0]*0.05-1) > 1e-12 {
			t.Errorf("%v: mass in the lowest row %g", m, v[0]*0.05)
		}
	}
	// An Ornstein-Uhlenbeck process tabulated on a coarse mesh is linear, hence exact.
	nodes := []float64{-6, 0, 6}
	tab, err := volume.NewTabulated([][]float64{nodes}, [][]float64{{6, 0, -6}}, [][]float64{{2, 2, 2}})
	if err != nil {
		t.Fatal(err)
	}
	g := box(t, grid.Reflecting, -6, 6, 100)
	a, err := Stationary(bg, g, tab, Settings{})
	if err != nil {
		t.Fatal(err)
	}
	b, err := Stationary(bg, g, volume.Func(ou), Settings{})
	if err != nil {
		t.Fatal(err)
	}
	for k := range a.P {
		if math.Abs(a.P[k]-b.P[k]) > 1e-13 {
			t.Fatalf("tabulated %g, formula %g", a.P[k], b.P[k])
		}
	}
	// Square-root diffusion reaching zero at the wall: the Gamma law with shape 2
	// (f = k(1-x), A = s x has shape 2k/s and rate 2k/s; Cox, Ingersoll and Ross,
	// Econometrica 53 (1985) 385-407, eq. 20).
	root := volume.Func(func(x, f, a []float64) { f[0], a[0] = 1-x[0], x[0] })
	r, err := Stationary(bg, box(t, grid.Reflecting, 0, 12, 1200), root, Settings{})
	if err != nil {
		t.Fatal(err)
	}
	d, err := r.Compare(PointFormula(func(x []float64) float64 { return x[0] * math.Exp(-2*x[0]) }))
	if err != nil {
		t.Fatal(err)
	}
	if d.L1 > 1e-3 {
		t.Errorf("Gamma law: L1 distance %g", d.L1)
	}
}
