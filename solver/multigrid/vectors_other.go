//go:build !amd64 || race

package multigrid

func scaleDotsFast(y, inv, a, b []float64, sums *[12]float64) int                    { return 0 }
func subtractFast(r, v, h []float64, alpha float64, sums *[8]float64) int            { return 0 }
func stepFast(x, a, c, r, t, p, v []float64, coef *[3]float64, sums *[8]float64) int { return 0 }
func narrowFast(dst []float32, src []float64, scale float64) int                     { return 0 }
func widenFast(dst []float64, src []float32, scale float64) int                      { return 0 }
