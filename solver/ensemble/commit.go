package ensemble

// commit adds the finished block to the tally.
func (r *runner) commit(t *Tally) error {
	done, err := unite(t.Done, []Interval{{r.first + uint64(r.lo), r.first + uint64(r.hi)}})
	if err != nil {
		return err
	}
	t.Done = done
	x := make([]float64, r.p.observe.Outputs())
	for at := range t.Times {
		tt := &t.Times[at]
		index := r.histogramIndices(tt.Cells)
		for lane := r.lo; lane < r.hi; lane++ {
			if r.status[lane] == blownUp {
				continue
			}
			for i := range x {
				x[i] = r.record[at][i][lane]
			}
			tt.add(x)
			addToHistograms(tt.Cells, index, x)
		}
	}
	r.commitExits(t)
	for i := range r.leaves {
		t.Leaves[i].Steps += r.leaves[i].Steps
		t.Leaves[i].Of += r.leaves[i].Of
	}
	for lane := r.lo; lane < r.hi; lane++ {
		if r.status[lane] == blownUp {
			t.BlowUp++
		}
	}
	if r.long != nil {
		r.long.commit(r, t.Long)
	}
	t.addEvents(r.events)
	return nil
}

func (r *runner) commitExits(t *Tally) {
	for lane := r.lo; lane < r.hi && len(t.Exits) > 0; lane++ {
		switch r.status[lane] {
		case alive:
			for i := range t.Exits {
				t.Exits[i].Alive++
			}
		case exitLower, exitUpper:
			e := &t.Exits[r.exitVar[lane]]
			if r.status[lane] == exitLower {
				e.Lower++
			} else {
				e.Upper++
			}
			e.Time.Add(r.exitTime[lane])
			e.Square.AddProduct(r.exitTime[lane], r.exitTime[lane])
		}
	}
}

// histogramIndices returns for each histogram the numbers of its observables.
func (r *runner) histogramIndices(cells []Histogram) [][]int {
	names := r.p.m.ObservableNames()
	index := make([][]int, len(cells))
	for i := range cells {
		for _, want := range cells[i].Spec.Observables {
			for k, name := range names {
				if name == want {
					index[i] = append(index[i], k)
					break
				}
			}
		}
	}
	return index
}

func addToHistograms(cells []Histogram, index [][]int, x []float64) {
	for i := range cells {
		switch q := index[i]; len(q) {
		case 1:
			cells[i].add(x[q[0]])
		case 2:
			cells[i].add(x[q[0]], x[q[1]])
		}
	}
}
