package fastslow

import (
	"context"
	"errors"
	"math"
)

// banded is a matrix with band sub- and superdiagonals, stored by rows with room
// for the fill of row exchanges: entry (i, j) at i*width + j-i+band.
type banded struct {
	n, band, width int
	a              []float64
}

func newBanded(n, band int) *banded {
	w := 3*band + 1
	return &banded{n, band, w, make([]float64, n*w)}
}

func (m *banded) add(i, j int, v float64) { m.a[i*m.width+j-i+m.band] += v }

// pin replaces row i by the unit row.
func (m *banded) pin(i int) {
	clear(m.a[i*m.width:][:m.width])
	m.a[i*m.width+m.band] = 1
}

var errSingular = errors.New("full system: the matrix is singular; is there more than one stationary density, or does the fast process not mix?")

// solve overwrites b by the solution, by elimination with row exchanges (Golub
// and Van Loan, Matrix Computations, 4th ed., algorithm 4.3.1 with pivoting).
func (m *banded) solve(ctx context.Context, b []float64) error {
	n, band, w := m.n, m.band, m.width
	for k := 0; k < n; k++ {
		if k%64 == 0 && ctx.Err() != nil {
			return ctx.Err()
		}
		last := min(k+band, n-1)
		p, best := k, math.Abs(m.a[k*w+band])
		for i := k + 1; i <= last; i++ {
			if v := math.Abs(m.a[i*w+k-i+band]); v > best {
				p, best = i, v
			}
		}
		if !(best > 1e-300) {
			return errSingular
		}
		length := min(2*band+1, n-k)
		top := m.a[k*w+band:][:length]
		if p != k {
			other := m.a[p*w+k-p+band:][:length]
			for j := range top {
				top[j], other[j] = other[j], top[j]
			}
			b[k], b[p] = b[p], b[k]
		}
		for i := k + 1; i <= last; i++ {
			row := m.a[i*w+k-i+band:][:length]
			f := row[0] / top[0]
			if f == 0 {
				continue
			}
			row[0] = 0
			for j := 1; j < length; j++ {
				row[j] -= f * top[j]
			}
			b[i] -= f * b[k]
		}
	}
	for k := n - 1; k >= 0; k-- {
		s := b[k]
		row := m.a[k*w+band:]
		for j := 1; j <= min(2*band, n-1-k); j++ {
			s -= row[j] * b[k+j]
		}
		b[k] = s / row[0]
	}
	return nil
}
