package ensemble

import (
	"context"
	"math"

	"epslim/solver/kernel"
)

const block = kernel.BlockSize

// window is the number of steps between checks of the state: when a path has
// left the finite numbers the window is repeated step by step.
const window = 64

// lane states
const (
	alive uint8 = iota
	exitLower
	exitUpper
	blownUp
)

// runner simulates one block at a time for one worker.
type runner struct {
	p       *plan
	random  kernel.Random
	stream  kernel.Stream
	aux     kernel.Stream // of the exits within a step
	state   [][]float64
	next    [][]float64
	extra   [][]float64 // outputs after the state
	noise   [][]float64
	uniform []float64
	saved   [][]float64
	in, out [][]float64
	time    []float64
	scratch map[*kernel.Program]*kernel.Scratch
	values  [][]float64 // observables of the moment

	lo, hi   int // the lanes that count
	status   [block]uint8
	exitTime [block]float64
	exitVar  [block]int
	stopped  []int // lanes that have exited
	frozen   [][]float64
	leaves   []LeaveTally
	events   []Event
	first    uint64 // path of lane 0
	record   [][][]float64
	long     *longRunner
}

func row(buf []float64, i int) []float64 {
	const stride = block + 136
	return buf[i*stride : i*stride+block : i*stride+block]
}

func rows(n int) [][]float64 {
	buf := kernel.AlignedRow(n * (block + 136))
	r := make([][]float64, n)
	for i := range r {
		r[i] = row(buf, i)
	}
	return r
}

func newRunner(p *plan) *runner {
	d := len(p.m.Variables)
	r := &runner{p: p, random: kernel.NewRandomFor(p.s.implementation()), scratch: map[*kernel.Program]*kernel.Scratch{}}
	noise, extra := 0, 0
	for _, g := range p.segments {
		noise = max(noise, len(g.stepper.rows))
		extra = max(extra, g.stepper.program.Outputs()-d)
	}
	all := rows(3*d + extra + noise + p.observe.Outputs() + 1)
	take := func(n int) [][]float64 {
		x := all[:n:n]
		all = all[n:]
		return x
	}
	r.state, r.next, r.extra, r.noise = take(d), take(d), take(extra), take(noise)
	r.saved, r.values, r.uniform = take(d), take(p.observe.Outputs()), all[0]
	r.time = make([]float64, 1)
	r.leaves = newTally(p.m, p.s).Leaves
	for range p.s.times() {
		r.record = append(r.record, rows(p.observe.Outputs()))
	}
	if len(p.segments[0].stepper.absorb) > 0 {
		r.frozen = rows(d)
	}
	if p.s.LongTime != nil {
		r.long = newLongRunner(p)
	}
	return r
}

func (r *runner) scratchFor(p *kernel.Program) *kernel.Scratch {
	s, ok := r.scratch[p]
	if !ok {
		s = p.NewScratchFor(r.p.s.implementation())
		r.scratch[p] = s
	}
	return s
}

// start puts all paths of block number at their start.
func (r *runner) start(number uint64, lo, hi int) {
	r.stream = kernel.NewStream(r.p.s.Seed, number)
	r.aux = kernel.NewStream(r.p.s.Seed, number|1<<63)
	r.first, r.lo, r.hi = number*block, lo, hi
	for i, v := range r.p.m.Variables {
		for k := range r.state[i] {
			r.state[i][k] = v.Start
		}
	}
	r.status = [block]uint8{}
	r.stopped = r.stopped[:0]
	r.events = nil
	for i := range r.leaves {
		r.leaves[i].Steps, r.leaves[i].Of = 0, 0
	}
	if r.long != nil {
		r.long.start()
	}
}

// run simulates a block and records the observables at the observation times.
// It returns early, with the error of the context, when that is done.
func (r *runner) run(ctx context.Context, number uint64, lo, hi int) error {
	r.start(number, lo, hi)
	at := 0
	var step uint64
	for _, g := range r.p.segments {
		if err := r.segment(ctx, g, step); err != nil {
			return err
		}
		step += g.steps
		if g.observed {
			if err := r.observe(g.to, r.record[at]); err != nil {
				return err
			}
			at++
		}
	}
	return nil
}

func (r *runner) segment(ctx context.Context, g segment, before uint64) error {
	careful := r.long != nil || len(g.stepper.absorb) > 0
	for done := uint64(0); done < g.steps; {
		if err := ctx.Err(); err != nil {
			return err
		}
		n := min(window, g.steps-done)
		if !careful {
			if err := r.fastWindow(g, done, n); err != nil {
				return err
			}
		} else {
			for k := range n {
				if err := r.carefulStep(g, done+k); err != nil {
					return err
				}
				if r.long != nil {
					if err := r.sample(g, before, done+k); err != nil {
						return err
					}
				}
			}
		}
		r.wrapState(g.stepper)
		done += n
	}
	return nil
}

// fastWindow makes n steps, looks at the result, and repeats them carefully when
// a path has left the finite numbers.
func (r *runner) fastWindow(g segment, done, n uint64) error {
	for i := range r.state {
		copy(r.saved[i], r.state[i])
	}
	stream := r.stream
	leaves := append([]LeaveTally(nil), r.leaves...)
	for k := range n {
		if err := r.step(g, done+k); err != nil {
			return err
		}
	}
	if r.finite() {
		return nil
	}
	for i := range r.state {
		copy(r.state[i], r.saved[i])
	}
	r.stream = stream
	copy(r.leaves, leaves)
	for k := range n {
		if err := r.carefulStep(g, done+k); err != nil {
			return err
		}
	}
	return nil
}

func (r *runner) finite() bool {
	for _, x := range r.state {
		if r.random.Outside(x, -math.MaxFloat64, math.MaxFloat64) != 0 {
			return false
		}
	}
	return true
}

// fill draws the rows of random numbers of one step.
func (r *runner) fill(st *stepper) {
	for i, q := range st.rows {
		if q.kind == rowNormal {
			r.random.Normals(&r.stream, r.noise[i])
		} else {
			r.random.Uniforms(&r.stream, r.noise[i])
		}
	}
}

// step makes step number k of the segment.
func (r *runner) step(g segment, k uint64) error {
	r.fill(g.stepper)
	return r.move(g, k)
}

// move evaluates the step with the random numbers in r.noise.
func (r *runner) move(g segment, k uint64) error {
	st := g.stepper
	d := len(r.state)
	r.time[0] = g.at(k)
	r.in = r.in[:0]
	for _, i := range st.order {
		switch {
		case i < d:
			r.in = append(r.in, r.state[i])
		case i == d:
			r.in = append(r.in, r.time)
		default:
			r.in = append(r.in, r.noise[i-d-1])
		}
	}
	r.out = append(append(r.out[:0], r.next...), r.extra[:st.program.Outputs()-d]...)
	if err := st.program.Eval(r.scratchFor(st.program), r.in, r.out, block); err != nil {
		return err
	}
	r.state, r.next = r.next, r.state
	for i, q := range st.reflect {
		l := &r.leaves[i]
		l.Steps += r.countLeft(r.extra[i], q)
		l.Of += uint64(r.hi - r.lo)
	}
	return nil
}

// countLeft counts the lanes that count and were reflected.
func (r *runner) countLeft(raw []float64, q reflection) uint64 {
	n := r.random.Outside(raw, q.lo, q.hi)
	if n == 0 || r.lo == 0 && r.hi == block {
		return uint64(n)
	}
	n = 0
	for _, x := range raw[r.lo:r.hi] {
		if !(x >= q.lo && x <= q.hi) {
			n++
		}
	}
	return uint64(n)
}

// carefulStep makes a step, stops paths at absorbing ends and removes paths that
// are not finite.
func (r *runner) carefulStep(g segment, k uint64) error {
	if err := r.step(g, k); err != nil {
		return err
	}
	st := g.stepper
	t := g.at(k)
	if !r.finite() {
		r.removeBlownUp(t, st.h)
	}
	if len(st.absorb) > 0 {
		r.absorb(st, t)
	}
	return nil
}

// removeBlownUp marks the lanes that are not finite; r.next holds the state
// before the step. Such a lane is put back to its start and simulated on without
// being counted.
func (r *runner) removeBlownUp(t, h float64) {
	d := len(r.state)
	x := make([]float64, d)
	for lane := range block {
		for i := range x {
			x[i] = r.state[i][lane]
		}
		if finite(x) {
			continue
		}
		if r.status[lane] == alive {
			r.status[lane] = blownUp
			if lane >= r.lo && lane < r.hi {
				for i := range x {
					x[i] = r.next[i][lane]
				}
				r.events = append(r.events, Event{r.first + uint64(lane), r.p.s.Seed, t, append([]float64(nil), x...), h})
			}
		}
		for i, v := range r.p.m.Variables {
			r.state[i][lane] = v.Start
		}
	}
}

// absorb stops the lanes that have met an absorbing end during the step from t
// on. A path that is inside at both ends of the step has met an end in between
// with the probability exp(-2 a b/(sigma^2 h)) of a Brownian bridge, a and b
// being its distances from that end (E. Gobet, Stoch. Proc. Appl. 87 (2000)
// 167-197). The exit time is placed in the middle of the step.
func (r *runner) absorb(st *stepper, t float64) {
	for _, lane := range r.stopped {
		for i := range r.state {
			r.state[i][lane] = r.frozen[i][lane]
		}
	}
	for n, q := range st.absorb {
		r.random.Uniforms(&r.aux, r.uniform)
		before, after := r.next[q.variable], r.state[q.variable]
		variance := r.extra[len(st.reflect)+n]
		for lane := range block {
			if r.status[lane] != alive {
				continue
			}
			side := exitSide(before[lane]-q.lo, after[lane]-q.lo, q.hi-before[lane], q.hi-after[lane], variance[lane]*st.h, r.uniform[lane])
			if side == alive {
				continue
			}
			r.status[lane], r.exitTime[lane], r.exitVar[lane] = side, t+st.h/2, n
			r.stopped = append(r.stopped, lane)
			end := q.lo
			if side == exitUpper {
				end = q.hi
			}
			for i := range r.state {
				r.frozen[i][lane] = r.state[i][lane]
			}
			r.frozen[q.variable][lane] = end
			r.state[q.variable][lane] = end
		}
	}
}

// exitSide decides whether a step has met an end: a0, a1 are the distances from
// the lower end before and after it, b0, b1 those from the upper end.
func exitSide(a0, a1, b0, b1, variance, u float64) uint8 {
	switch {
	case a1 <= 0:
		return exitLower
	case b1 <= 0:
		return exitUpper
	case variance <= 0:
		return alive
	}
	lower, upper := 2*a0*a1/variance, 2*b0*b1/variance
	if min(lower, upper) > 40 {
		return alive
	}
	p, q := kernel.Exp(-lower), kernel.Exp(-upper)
	switch {
	case u < p:
		return exitLower
	case u < p+q:
		return exitUpper
	}
	return alive
}

// wrapState brings the periodic variables back to their domain.
func (r *runner) wrapState(st *stepper) {
	for _, w := range st.wrap {
		hi := w.lo + w.length
		for k, x := range r.state[w.variable] {
			if x >= w.lo && x < hi {
				continue
			}
			y := x - float64(w.length*math.Floor((x-w.lo)/w.length)) // not fused
			if !(y >= w.lo && y < hi) {
				y = w.lo
			}
			r.state[w.variable][k] = y
		}
	}
}

// observe evaluates the observables of all lanes at time t.
func (r *runner) observe(t float64, values [][]float64) error {
	d := len(r.state)
	r.time[0] = t
	r.in = r.in[:0]
	for _, i := range r.p.order {
		if i < d {
			r.in = append(r.in, r.state[i])
		} else {
			r.in = append(r.in, r.time)
		}
	}
	return r.p.observe.Eval(r.scratchFor(r.p.observe), r.in, values, block)
}

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
