package figure

import (
	"flag"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"testing"
)

var (
	update  = flag.Bool("update", false, "rewrite the golden files")
	gallery = flag.String("gallery", "", "write every figure of the gallery, in all forms, into this folder")
)

// example is a figure of the gallery: one of each kind and of each awkward case.
type example struct {
	name string
	plot func() *Plot
}

var testMeta = []Field{
	{"version", "0.1"},
	{"model_sha256", "9f86d081884c7d659a2feaa0c55ad015a3bf4f1b2b0b822cd15d6c15b0f00a08"},
	{"command", `epslim density "gel <crawler>.ito" --set D=0.8 -- & more`},
}

func settings(alt string) Settings { return Settings{Alt: alt, Meta: testMeta} }

func sampled(n int, a, b float64, f func(float64) float64) (x, y []float64) {
	for i := range n {
		t := a + (b-a)*float64(i)/float64(n-1)
		x, y = append(x, t), append(y, f(t))
	}
	return x, y
}

func onGrid(xe, ye []float64, f func(x, y float64) float64) []float64 {
	var out []float64
	for _, y := range CellCentres(ye) {
		for _, x := range CellCentres(xe) {
			out = append(out, f(x, y))
		}
	}
	return out
}

func speed(x, y float64) float64 {
	return 1 + 0.4*math.Sin(2*math.Pi*x)*math.Cos(2*math.Pi*y)
}

func rotation(xe, ye []float64, style FieldStyle) *VectorField {
	f := &VectorField{X: CellCentres(xe), Y: CellCentres(ye), Style: style, Label: "current $J$"}
	gauss := func(x, y float64) float64 { return math.Exp(-(x*x + y*y) / 2) }
	f.U = onGrid(xe, ye, func(x, y float64) float64 { return -y * gauss(x, y) })
	f.V = onGrid(xe, ye, func(x, y float64) float64 { return x * gauss(x, y) })
	return f
}

// walk is a random walk with a fixed seed.
func walk(n int, x, y, step float64, seed uint64) Path {
	r := rand.New(rand.NewPCG(seed, 1))
	p := Path{}
	for range n {
		p.X, p.Y = append(p.X, x), append(p.Y, y)
		x, y = x+step*r.NormFloat64(), y+step*r.NormFloat64()
	}
	return p
}

func examples() []example {
	return []example{
		{"line", lineExample}, {"band", bandExample}, {"angles", anglesExample}, {"map", mapExample},
		{"arrows", arrowsExample}, {"streamlines", streamlinesExample}, {"difference", differenceExample},
		{"uneven", unevenExample}, {"paths", pathsExample}, {"paths-plain", plainPathsExample},
		{"histogram", histogramExample}, {"grid-convergence", gridExample}, {"eps-convergence", epsExample},
		{"empty", func() *Plot { return &Plot{Settings: settings(""), X: Axis{Label: "$x$"}, Y: Axis{Label: "$y$"}} }},
		{"one-point", onePointExample}, {"constant", constantExample}, {"log-map", logMapExample},
		{"many-series", manyExample}, {"extremes", extremesExample},
	}
}

func lineExample() *Plot {
	x, closed := sampled(201, 0, 1, func(t float64) float64 { return 1 / speed(t, 0) * 0.9165 })
	xg, grid := sampled(32, 1./64, 63./64, func(t float64) float64 { return 1 / speed(t, 0) * 0.92 })
	return DensityLine(DensityLineData{XLabel: "position $x$ (mm)", YLabel: "stationary density $p_s(x)$", Curves: []Series{
		{Label: "closed form $1/v(x)$", X: x, Y: closed}, {Label: "grid, 32 cells", X: xg, Y: grid, Marks: PointsOnly}}},
		settings("The density is largest where the gel crawlers are slow."))
}

func bandExample() *Plot {
	p := &Plot{Settings: Settings{Width: FullWidth, Meta: testMeta, Alt: "All means relax to the same value."},
		X: Axis{Label: "time $t$"}, Y: Axis{Label: `mean $\langle x_t \rangle$`}}
	for k, name := range []string{`limit $\varepsilon \to 0$`, `$\varepsilon = 0.1$`, `$\varepsilon = 0.2$`, `$\varepsilon = 0.4$`} {
		s := Series{Label: name}
		s.X, s.Y = sampled(101, 0, 5, func(t float64) float64 { return math.Exp(-t) + 0.06*float64(k)*math.Sin(2*t) })
		for _, y := range s.Y {
			s.Low, s.High = append(s.Low, y-0.03), append(s.High, y+0.03)
		}
		p.Series = append(p.Series, s)
	}
	return p
}

func anglesExample() *Plot {
	s := Series{Label: `$\rho(\theta)$`}
	s.X, s.Y = sampled(200, 0, 2*math.Pi, func(t float64) float64 { return math.Exp(2*math.Cos(t)) / 14.32 })
	flat := Series{Label: "uniform", X: []float64{0, 2 * math.Pi}, Y: []float64{0.159, 0.159}, Marks: LineOnly}
	return DensityLine(DensityLineData{XLabel: `heading $\theta$`, YLabel: `invariant density $\rho(\theta)$`, X: Axis{Pi: true},
		Curves: []Series{s, flat}}, settings("Headings gather around zero."))
}

func mapExample() *Plot {
	xe, ye := UniformEdges(0, 1, 24), UniformEdges(0, 1, 24)
	return DensityMap(DensityMapData{XLabel: "$x$ (mm)", YLabel: "$y$ (mm)", Quantity: "stationary density $p_s(x, y)$",
		XEdges: xe, YEdges: ye, Density: onGrid(xe, ye, func(x, y float64) float64 { return 0.9 / speed(x, y) })},
		settings("Gel crawlers gather in the two places where they are slow."))
}

func gaussMap(n int) DensityMapData {
	xe, ye := UniformEdges(-3, 3, n), UniformEdges(-2, 2, 2*n/3)
	return DensityMapData{XLabel: "$x$", YLabel: "$y$", Quantity: "$p_s$", XEdges: xe, YEdges: ye,
		Density: onGrid(xe, ye, func(x, y float64) float64 { return math.Exp(-(x*x+y*y)/2) / (2 * math.Pi) })}
}

func arrowsExample() *Plot {
	d := gaussMap(48)
	d.Current = rotation(d.XEdges, d.YEdges, Arrows)
	return DensityMap(d, settings("The current turns anticlockwise about the origin."))
}

func streamlinesExample() *Plot {
	d := gaussMap(48)
	d.Map = Cividis
	d.Current = rotation(d.XEdges, d.YEdges, Streamlines)
	return DensityMap(d, Settings{Width: FullWidth, Alt: "The current turns anticlockwise about the origin.", Meta: testMeta})
}

func differenceExample() *Plot {
	d := gaussMap(24)
	d.Quantity = "grid − closed form"
	d.Density = onGrid(d.XEdges, d.YEdges, func(x, y float64) float64 {
		return 3e-6 * math.Sin(2*x) * math.Exp(-(x*x+y*y)/3)
	})
	return DifferenceMap(d, settings("The error changes sign between the two sides and is below 2e-6."))
}

func unevenExample() *Plot {
	xe, ye := []float64{0}, []float64{0}
	for k := range 12 {
		xe = append(xe, xe[k]+0.02*math.Pow(1.3, float64(k)))
		ye = append(ye, ye[k]+0.02*math.Pow(1.2, float64(k)))
	}
	return DensityMap(DensityMapData{XLabel: "$x$", YLabel: "$y$", XEdges: xe, YEdges: ye,
		Density: onGrid(xe, ye, func(x, y float64) float64 { return math.Exp(-2*x - 3*y) })}, settings("Cells grow away from the origin."))
}

func pathsExample() *Plot {
	xe := UniformEdges(0, 1, 32)
	a, b, c := walk(500, 0.5, 0.5, 0.02, 1), walk(500, 0.2, 0.8, 0.02, 2), walk(500, 0.8, 0.3, 0.02, 3)
	a.Label, b.Label, c.Label = "path 1", "path 2", "path 3"
	return DensityMap(DensityMapData{XLabel: "$x$", YLabel: "$y$", Quantity: "$p_s(x, y)$", XEdges: xe, YEdges: xe,
		X: Axis{Periodic: true}, Y: Axis{Periodic: true}, Paths: []Path{a, b, c},
		Density: onGrid(xe, xe, func(x, y float64) float64 { return 0.9 / speed(x, y) })}, settings("Three walks stay longer where the density is large."))
}

func plainPathsExample() *Plot {
	p := &Plot{Settings: settings("Two paths against time."), X: Axis{Label: "$t$"}, Y: Axis{Label: "$x_t$"}}
	for k := range 2 {
		w := walk(400, 0, 0, 0.07, uint64(k+5))
		for i := range w.X {
			w.X[i] = float64(i) / 50
		}
		w.Label = []string{`full system, $\varepsilon = 0.05$`, "limit"}[k]
		p.Paths = append(p.Paths, w)
	}
	return p
}

func histogramExample() *Plot {
	r := rand.New(rand.NewPCG(7, 7))
	h := Histogram{Label: `ensemble, $\varepsilon = 0.05$`, Edges: UniformEdges(-3.5, 3.5, 28), Counts: make([]float64, 28), ErrorBars: true}
	for range 3000 {
		if k := int(math.Floor((r.NormFloat64() + 3.5) * 4)); k >= 0 && k < 28 {
			h.Counts[k]++
		}
	}
	c := Series{Label: "limit"}
	c.X, c.Y = sampled(141, -3.5, 3.5, func(t float64) float64 { return math.Exp(-t*t/2) / math.Sqrt(2*math.Pi) })
	return HistogramAgainst(HistogramData{XLabel: "$x$", Histograms: []Histogram{h}, Curves: []Series{c}},
		settings("The ensemble follows the limit within its error bars."))
}

func gridExample() *Plot {
	e := func(a, k float64) GridErrors {
		g := GridErrors{Cells: []float64{16, 32, 64, 128, 256, 512}}
		for _, n := range g.Cells {
			g.Error = append(g.Error, a*math.Pow(n, -k)*(1+3/n))
		}
		return g
	}
	a, b := e(3, 2), e(0.8, 1)
	a.Label, b.Label = "fitted fluxes", "upwind fluxes"
	return GridConvergence(GridConvergenceData{ErrorLabel: "$L^1$ error of $p_s$", Errors: []GridErrors{a, b}, Orders: []float64{1, 2}},
		settings("The fitted fluxes are of second order, the upwind fluxes of first order."))
}

func epsExample() *Plot {
	o := EpsErrors{Label: "mean of $x$", Eps: []float64{0.4, 0.2, 0.1, 0.05}, Error: []float64{0.21, 0.1, 0.052, 0.024}}
	o.Low, o.High = []float64{0.19, 0.085, 0.036, 0.004}, []float64{0.23, 0.115, 0.068, 0.044}
	q := EpsErrors{Label: "variance of $x$", Eps: o.Eps, Error: []float64{0.5, 0.13, 0.034, 0.012}, Band: true,
		Low: []float64{0.4, 0.11, 0.02, -0.004}, High: []float64{0.6, 0.15, 0.05, 0.028}}
	return EpsConvergence(EpsConvergenceData{Observed: []EpsErrors{o, q}, NoiseFloor: 0.015, Orders: []float64{1, 2}},
		settings("The mean converges with slope one and the variance with slope two, down to the noise floor."))
}

func onePointExample() *Plot {
	return &Plot{Settings: settings(""), X: Axis{Label: "$x$"}, Y: Axis{Label: "$y$"}, Series: []Series{
		{Label: "one point", X: []float64{2}, Y: []float64{5}, Low: []float64{4}, High: []float64{6.5}}, {Label: "none"}}}
}

func constantExample() *Plot {
	xe := UniformEdges(0, 2, 8)
	zero := make([]float64, 64)
	return DensityMap(DensityMapData{XLabel: "$x$", YLabel: `angle $\theta$`, XEdges: xe, YEdges: UniformEdges(0, 2*math.Pi, 8), Y: Axis{Pi: true},
		Density: onGrid(xe, xe, func(x, y float64) float64 { return 0.5 }),
		Current: &VectorField{X: CellCentres(xe), Y: CellCentres(UniformEdges(0, 2*math.Pi, 8)), U: zero, V: zero, Label: "current"}}, settings(""))
}

func logMapExample() *Plot {
	d := gaussMap(36)
	d.Log = true
	d.Density = onGrid(d.XEdges, d.YEdges, func(x, y float64) float64 { return math.Exp(-x*x - y*y) })
	return DensityMap(d, settings("Colours are logarithmic."))
}

func manyExample() *Plot {
	p := &Plot{Settings: Settings{Width: FullWidth, Height: 8}, X: Axis{Label: "$x$"}, Y: Axis{Label: "$y_k(x)$"}}
	for k := range 10 {
		s := Series{Label: "$k = " + string(rune('0'+k)) + "$"}
		s.X, s.Y = sampled(60, 0, 1, func(t float64) float64 { return math.Sin(3*t+0.3*float64(k)) + 0.1*float64(k) })
		p.Series = append(p.Series, s)
	}
	return p
}

func extremesExample() *Plot {
	return &Plot{Settings: settings(""), X: Axis{Label: `$D_{\mathrm{eff}}^2 / (2\pi)$`}, Y: Axis{Label: Plain(`100% <b>\bad & $5 ∇∝∈ε_θ`)},
		Series: []Series{{Label: `a & b < c`, X: []float64{-2.5e-7, 1e-7, 3.1e-7}, Y: []float64{1.2e8, -3.4e8, 2e8}},
			{Label: "$\\mathrm{日本}_{é} + ϕ$", X: []float64{0, 2e-7}, Y: []float64{1e8, 0}}}}
}

// TestGallery writes the gallery when asked to; looking at it is part of changing this package.
func TestGallery(t *testing.T) {
	if *gallery == "" {
		t.Skip("no -gallery folder given")
	}
	for _, e := range examples() {
		files, err := e.plot().Files(e.name)
		if err != nil {
			t.Fatalf("%s: %v", e.name, err)
		}
		for _, f := range files {
			if err := os.WriteFile(filepath.Join(*gallery, f.Name), f.Data, 0o644); err != nil {
				t.Fatal(err)
			}
		}
	}
}
