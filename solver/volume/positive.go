package volume

// tailLevel is the fraction of the largest density below which values found by
// an iteration in floating point are rounding noise.
const tailLevel = 1e-15

// tailSweeps is the number of symmetric Gauss-Seidel sweeps over the tail.
const tailSweeps = 4

// Positive makes the far tail of a stationary density positive. When some cell
// holds a value that rounding left at or below zero, all cells below 1e-15 of
// the largest value are computed again from their neighbours, p_k = sum of
// inflows / rate of outflow, by Gauss-Seidel sweeps, which for an M-matrix add and
// multiply non-negative numbers only. The other cells are not touched. It
// returns the number of cells it set.
func Positive(m *Operator, p []float64) int {
	l := &m.Layout
	big, bad := 0.0, false
	for r := 0; r < l.Rows; r++ {
		for _, v := range p[l.Row(r):][:l.Nx] {
			big = max(big, v)
			bad = bad || !(v > 0)
		}
	}
	if !bad {
		return 0
	}
	var tail []int32
	for r := 0; r < l.Rows; r++ {
		s := l.Row(r)
		for i := 0; i < l.Nx; i++ {
			if p[s+i] < tailLevel*big {
				p[s+i] = max(p[s+i], 0)
				tail = append(tail, int32(r*l.Nx+i))
			}
		}
		l.Wrap(p, r)
	}
	for sweep := 0; sweep < tailSweeps; sweep++ {
		for q := range tail {
			m.balance(p, int(tail[q]))
		}
		for q := len(tail) - 1; q >= 0; q-- {
			m.balance(p, int(tail[q]))
		}
	}
	return len(tail)
}

// balance sets cell k so that what flows in flows out.
func (m *Operator) balance(p []float64, k int) {
	l := &m.Layout
	r, i := k/l.Nx, k%l.Nx
	at := l.Row(r) + i
	var in, out float64
	for li := range m.Links {
		link := &m.Links[li]
		u := l.Row(int(m.up[li][r])) + i + link.Step[0]
		d := l.Row(int(m.down[li][r])) + i - link.Step[0]
		in += link.Back[at]*p[u] + link.Out[d]*p[d]
		out += link.Out[at] + link.Back[d]
	}
	if out > 0 {
		p[at] = in / out
	}
	if l.PeriodicX && (i < l.Ghost || i >= l.Nx-l.Ghost) {
		l.Wrap(p, r)
	}
}
