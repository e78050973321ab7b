//go:build !amd64 || race

package multigrid

func relaxFast(x, b []float32, coef, nb [][]float32, first int) int { return 0 }
func residualFast(r, x, b, w []float32, coef, nb [][]float32) int   { return 0 }
func pairSumFast(dst, a, b []float32) int                           { return 0 }
func spreadFast(f, t []float32) int                                 { return 0 }
func blendFast(t, a, b []float32, u, w float32) int                 { return 0 }
func relaxZeroFast(x, b []float32, first int) int                   { return 0 }
func normaliseFast(dst []float32, v, w []float64) int               { return 0 }
