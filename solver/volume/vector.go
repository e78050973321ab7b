package volume

import (
	"unsafe"
)

// hugePage is the size of the large pages that long vectors ask for.
const hugePage = 2 << 20

// Float32s allocates a zero vector of single precision, on large pages where
// the system has them.
func Float32s(n int) []float32 {
	v := make([]float32, n)
	if n*4 >= 2*hugePage {
		adviseHuge(unsafe.Pointer(&v[0]), n*4)
	}
	return v
}

// Float64s allocates a zero vector of double precision likewise.
func Float64s(n int) []float64 {
	v := make([]float64, n)
	if n*8 >= 2*hugePage {
		adviseHuge(unsafe.Pointer(&v[0]), n*8)
	}
	return v
}

// Block32 allocates count vectors of length n in one piece, which large pages
// cover better than many.
func Block32(count, n int) [][]float32 {
	all := Float32s(count * n)
	v := make([][]float32, count)
	for i := range v {
		v[i] = all[i*n : (i+1)*n : (i+1)*n]
	}
	return v
}

// Block64 is Block32 in double precision.
func Block64(count, n int) [][]float64 {
	all := Float64s(count * n)
	v := make([][]float64, count)
	for i := range v {
		v[i] = all[i*n : (i+1)*n : (i+1)*n]
	}
	return v
}
