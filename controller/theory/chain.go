package theory

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// A chainResult is the stationary state of the pass-to-pass chain, per unit
// time 1/ω₀.
type chainResult struct {
	power    float64 // kT
	switches float64 // both directions
	settled  float64 // both directions
	escape   float64 // well to well: half the slowest decay rate
	upper    float64 // share of the time on the upper side
	top      float64 // share of passes in the highest cells: is the grid high enough?
	stuck    bool
}

// A landing is where one cell's passages end.
type landing struct {
	to    []int     // states
	share []float64 // of the passages
	same  []bool    // on the side it came from
	time  float64   // mean duration
	count float64   // mean number of switches
	over  float64   // mean Σ s·(x-x0)
	upper float64   // mean time on the upper side
}

// solveChain finds the stationary state of the resonator's energy from one
// outer turning point to the next. Its states are (side, energy). One pass
// is the bath's energy diffusion over the arc, then the sampled loop near
// the threshold, followed for a spread of tick phases and energies in each
// cell. It costs some milliseconds (see the benchmark).
func solveChain(c Case) chainResult {
	p := newPassage(c)
	sides := [2]int{-1, 1}
	var grids [2]grid
	var baths [2][]float64
	for k, s := range sides {
		d := p.a - float64(s)*c.Offset
		reach := (d + c.HalfBand) * (d + c.HalfBand) / 2
		// The layer below the switching point that escape empties is
		// √(2J/Q) wide.
		fine := math.Min(0.04, 0.25*math.Sqrt(4*math.Pi*reach/c.Quality))
		grids[k] = newGrid(reach, fine)
		baths[k] = grids[k].bath(c.Quality, d, reach)
	}
	first := [2]int{0, len(grids[0].mid)}
	size := first[1] + len(grids[1].mid)
	land := make([]landing, 0, size)
	res := chainResult{}
	for k, s := range sides {
		for i := range grids[k].mid {
			land = append(land, landCell(p, grids, first, s, k, i, &res.stuck))
		}
	}
	ch := &passChain{size: size, first: first, baths: baths, land: land}
	ch.stationary(&res, p.a)
	if !res.stuck {
		ch.settle(&res)
		ch.slowest(&res)
	}
	for k := range sides {
		n := len(grids[k].mid)
		for i := n - 2; i < n; i++ {
			res.top += ch.arrive[first[k]+i] / sum(ch.arrive)
		}
	}
	return res
}

// landCell follows the passages that start in cell i of side sides[k].
func landCell(p *passage, grids [2]grid, first [2]int, s, k, i int, stuck *bool) landing {
	samples := 64
	if p.noise > 0 { // fewer where the many ticks of a passage average by themselves
		samples = int(max(48, min(96, 96*p.tick/0.01)))
	}
	g := grids[k]
	if reach := p.reach(s); 2*g.edges[i+1] <= reach*reach {
		return landing{to: []int{first[k] + i}, share: []float64{1}, same: []bool{true}, time: 2 * math.Pi, upper: 2 * math.Pi * float64(k)}
	}
	var l landing
	weight := 1 / float64(samples)
	lo, span := g.edges[i], -math.Expm1(g.edges[i]-g.edges[i+1])
	for n := range samples {
		// Energies by Boltzmann weight, phases by the golden section: a
		// low-discrepancy pair.
		u := (float64(n) + 0.5) * weight
		_, phase := math.Modf(0.5 + float64(n)*(math.Phi-1))
		o := p.run(s, lo-math.Log1p(-u*span), phase, n*5003+i*613)
		*stuck = *stuck || o.stuck
		side := 0
		if o.side > 0 {
			side = 1
		}
		l.add(first[side]+grids[side].cell(o.energy), side == k, weight)
		l.time += weight * o.duration
		if s > 0 {
			l.upper += weight * (o.duration - o.after)
		}
		if o.side > 0 {
			l.upper += weight * o.after
		}
		l.count += weight * float64(o.switches)
		l.over += weight * o.overshot
	}
	return l
}

func (l *landing) add(to int, same bool, share float64) {
	for i, t := range l.to {
		if t == to {
			l.share[i] += share
			return
		}
	}
	l.to, l.share, l.same = append(l.to, to), append(l.share, share), append(l.same, same)
}

// A passChain is the assembled chain.
type passChain struct {
	size   int
	first  [2]int
	baths  [2][]float64
	land   []landing
	lu     mat.LU    // of 1 - M, its row 0 replaced by the mean durations
	time   []float64 // mean duration of a pass, by starting state
	start  []float64 // stationary passes per unit time, by starting state
	arrive []float64 // the same by state on arrival at the threshold
}

// each calls f for every arrival i with its probabilities from the starts j0, j0+1, …
func (ch *passChain) each(f func(i int, starts []float64, j0 int)) {
	for k, b := range ch.baths {
		n := ch.size - ch.first[1]
		if k == 0 {
			n = ch.first[1]
		}
		for i := range n {
			f(ch.first[k]+i, b[i*n:(i+1)*n], ch.first[k])
		}
	}
}

func (ch *passChain) stationary(res *chainResult, a float64) {
	n := ch.size
	m := mat.NewDense(n, n, nil)
	raw := m.RawMatrix().Data
	ch.time = make([]float64, n)
	ch.each(func(i int, starts []float64, j0 int) {
		l := &ch.land[i]
		for t, to := range l.to {
			row := raw[to*n+j0 : to*n+j0+len(starts)]
			for j, p := range starts {
				row[j] -= l.share[t] * p
			}
		}
		for j, p := range starts {
			ch.time[j0+j] += p * l.time
		}
	})
	for i := range n {
		raw[i*n+i]++
	}
	copy(raw[:n], ch.time)
	ch.lu.Factorize(m)
	ch.start = ch.solve(func(b []float64) { b[0] = 1 })
	ch.arrive = make([]float64, n)
	ch.each(func(i int, starts []float64, j0 int) {
		for j, p := range starts {
			ch.arrive[i] += p * ch.start[j0+j]
		}
	})
	for i, f := range ch.arrive {
		res.switches += f * ch.land[i].count
		res.upper += f * ch.land[i].upper
		res.power -= 2 * a * f * ch.land[i].over
	}
}

func (ch *passChain) solve(fill func([]float64)) []float64 {
	b := make([]float64, ch.size)
	fill(b)
	x := mat.NewVecDense(ch.size, nil)
	// A condition number is all that can be reported; the checks against
	// exact rates are what bounds the error.
	_ = ch.lu.SolveVecTo(x, false, mat.NewVecDense(ch.size, b))
	return x.RawVector().Data
}

// settle counts settled transitions: a pass that ends on the side where it
// began, and so spent a period there, after the last such pass was on the
// other side.
func (ch *passChain) settle(res *chainResult) {
	n := ch.size
	// h: the probability, by starting state, that the next such pass is on
	// the upper side.
	m := mat.NewDense(n, n, nil)
	raw := m.RawMatrix().Data
	b := make([]float64, n)
	ch.each(func(i int, starts []float64, j0 int) {
		l := &ch.land[i]
		for t, to := range l.to {
			for j, p := range starts {
				switch {
				case !l.same[t]:
					raw[(j0+j)*n+to] -= l.share[t] * p
				case i >= ch.first[1]:
					b[j0+j] += l.share[t] * p
				}
			}
		}
	})
	for i := range n {
		raw[i*n+i]++
	}
	h := mat.NewVecDense(n, nil)
	_ = h.SolveVec(m, mat.NewVecDense(n, b)) // as in solve
	for i, f := range ch.arrive {
		l := &ch.land[i]
		for t, to := range l.to {
			other := h.AtVec(to)
			if i >= ch.first[1] {
				other = 1 - other
			}
			if l.same[t] {
				res.settled += f * l.share[t] * other
			}
		}
	}
}

// slowest finds the slowest decay rate λ by inverse iteration on
// (1 - M)·g = λ·t∘g, to first order in λ·t; the sum of the two escape rates.
func (ch *passChain) slowest(res *chainResult) {
	g := make([]float64, ch.size)
	for j := range g {
		g[j] = ch.start[j]
		if j < ch.first[1] {
			g[j] = -g[j]
		}
	}
	var lambda float64
	for range 12 {
		var total float64
		for j, t := range ch.time {
			total += t * g[j]
		}
		var was float64
		next := ch.solve(func(b []float64) {
			for j, t := range ch.time {
				g[j] -= total * ch.start[j]
				b[j] = t * g[j]
				was += math.Abs(b[j])
			}
			b[0] = 0
		})
		var now float64
		for j, t := range ch.time {
			now += math.Abs(t * next[j])
		}
		lambda = was / now
		for j := range next {
			g[j] = next[j] / now
		}
	}
	res.escape = lambda / 2
}

func sum(x []float64) float64 {
	var s float64
	for _, v := range x {
		s += v
	}
	return s
}
