package volume

// TypicalRate returns an estimate of the rate at which the slowest smooth mode
// decays: the smallest over the axes of the mean rate at which a cell exchanges
// probability along the axis, divided by the square of the number of cells.
func (m *Operator) TypicalRate() float64 {
	l := &m.Layout
	best := 0.0
	for d := 0; d < m.Grid.Dim(); d++ {
		n := float64(m.Grid.Axis(d).Cells())
		if n < 2 {
			continue
		}
		var sum float64
		for r := 0; r < l.Rows; r++ {
			for i := 0; i < l.Nx; i++ {
				k := l.Row(r) + i
				sum += (m.Links[d].Out[k] + m.Links[d].Back[k]) / (m.rowVolume[r] * m.width[i])
			}
		}
		rate := sum / float64(m.Grid.Cells()) / (n * n)
		if best == 0 || rate < best && rate > 0 {
			best = rate
		}
	}
	if best == 0 {
		return 1
	}
	return best
}
