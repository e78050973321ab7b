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
