package ensemble

// longRunner accumulates averages along the paths of one block.
type longRunner struct {
	p        *plan
	perBatch uint64
	samples  uint64      // taken so far in the block
	sum      [][]float64 // of the running batch, for each observable
	square   [][]float64 // of the squares, over the whole path
	batch    [][][]float64
	cells    []Histogram
	index    [][]int
}

func newLongRunner(p *plan) *longRunner {
	n := p.observe.Outputs()
	l := &longRunner{p: p, perBatch: p.samples() / uint64(p.s.LongTime.batches()), sum: rows(n), square: rows(n)}
	for range p.s.LongTime.batches() {
		l.batch = append(l.batch, rows(n))
	}
	return l
}

func (l *longRunner) start() {
	l.samples = 0
	for i := range l.sum {
		clear(l.sum[i])
		clear(l.square[i])
	}
	l.cells = nil
	for _, h := range l.p.s.LongTime.Histograms {
		l.cells = append(l.cells, newHistogram(h))
	}
}

// sample is called after step k of segment g and takes a sample where one is due.
// Samples beyond a whole number of batches are not taken.
func (r *runner) sample(g segment, before, k uint64) error {
	l := r.long
	step := before + k + 1
	every := uint64(r.p.s.LongTime.every())
	if step <= r.p.burn || (step-r.p.burn)%every != 0 || l.samples >= l.perBatch*uint64(len(l.batch)) {
		return nil
	}
	r.wrapState(g.stepper)
	if err := r.observe(g.at(k+1), r.values); err != nil {
		return err
	}
	for i, v := range r.values {
		sum, square := l.sum[i], l.square[i]
		for lane, x := range v {
			sum[lane] += x
			square[lane] += float64(x * x)
		}
	}
	if len(l.cells) > 0 {
		r.sampleHistograms()
	}
	l.samples++
	if l.samples%l.perBatch == 0 {
		b := l.batch[l.samples/l.perBatch-1]
		for i := range l.sum {
			for lane, x := range l.sum[i] {
				b[i][lane] = x / float64(l.perBatch)
			}
			clear(l.sum[i])
		}
	}
	return nil
}

func (r *runner) sampleHistograms() {
	l := r.long
	if l.index == nil {
		l.index = r.histogramIndices(l.cells)
	}
	x := make([]float64, len(r.values))
	for lane := r.lo; lane < r.hi; lane++ {
		if r.status[lane] == blownUp {
			continue
		}
		for i := range x {
			x[i] = r.values[i][lane]
		}
		addToHistograms(l.cells, l.index, x)
	}
}

func (l *longRunner) commit(r *runner, t *LongTally) {
	n := len(l.sum)
	total := float64(l.perBatch) * float64(len(l.batch))
	mean := make([]float64, n)
	for lane := r.lo; lane < r.hi; lane++ {
		if r.status[lane] == blownUp {
			continue
		}
		t.Count++
		for i := range n {
			var sum, squares float64
			for _, b := range l.batch {
				x := b[i][lane]
				sum += x
				squares += float64(x * x)
			}
			mean[i] = sum / float64(len(l.batch))
			t.Mean[i].Add(mean[i])
			t.Square[i].Add(l.square[i][lane] / total)
			t.BatchSq[i].Add(squares / float64(len(l.batch)))
		}
		k := 0
		for i := range n {
			for _, y := range mean[i:] {
				t.Products[k].AddProduct(mean[i], y)
				k++
			}
		}
	}
	for i := range l.cells {
		t.Cells[i].merge(&l.cells[i])
	}
}
