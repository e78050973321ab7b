//go:build !amd64 || race

package volume

func fluxFast(y, x []float64, links []linkRow) int { return 0 }
