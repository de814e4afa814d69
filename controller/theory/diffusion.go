package theory

import "math"

// A grid divides the energies of one side into cells, finest at the energy
// that reaches the switching point.
type grid struct {
	edges  []float64 // len(mid)+1, from 0
	mid    []float64 // mean energy of the Boltzmann distribution in the cell
	weight []float64 // its probability, ∫e^{-E}dE over the cell
}

const (
	gridTop    = 14.0 // kT above the switching point
	gridGrowth = 1.09 // from cell to cell
)

// newGrid makes a grid about the energy that reaches the switching point.
func newGrid(reach, fine float64) grid {
	below := oneSided(reach, fine)
	above := oneSided(gridTop, fine)
	g := grid{}
	for i := len(below) - 1; i >= 0; i-- {
		g.edges = append(g.edges, reach-below[i])
	}
	g.edges[0] = 0
	for _, d := range above[1:] {
		g.edges = append(g.edges, reach+d)
	}
	for i, lo := range g.edges[:len(g.edges)-1] {
		d := g.edges[i+1] - lo
		q := -math.Expm1(-d)
		g.weight = append(g.weight, math.Exp(-lo)*q)
		g.mid = append(g.mid, lo+1-d*math.Exp(-d)/q)
	}
	return g
}

// oneSided returns 0, and growing steps up to span exactly.
func oneSided(span, fine float64) []float64 {
	n := math.Ceil(math.Log1p(span*(gridGrowth-1)/fine) / math.Log(gridGrowth))
	first := span * (gridGrowth - 1) / (math.Pow(gridGrowth, n) - 1)
	at := []float64{0}
	for k := 1.0; k <= n; k++ {
		at = append(at, first*(math.Pow(gridGrowth, k)-1)/(gridGrowth-1))
	}
	return at
}

// cell returns the index of the cell that holds e; the last one holds all above.
func (g grid) cell(e float64) int {
	lo, hi := 0, len(g.mid)-1
	for lo < hi {
		m := (lo + hi + 1) / 2
		if g.edges[m] <= e {
			lo = m
		} else {
			hi = m - 1
		}
	}
	return lo
}

// arc returns the duration and the action ∮v²dt of one pass of energy e:
// of the full ellipse below reach, of the ellipse cut at distance d from its
// centre above.
func arc(e, d, reach float64) (duration, action float64) {
	if e <= reach || 2*e <= d*d {
		return 2 * math.Pi, 2 * math.Pi * e
	}
	cut := math.Acos(d / math.Sqrt(2*e))
	duration = 2 * (math.Pi - cut)
	return duration, e * (duration + math.Sin(2*cut))
}

// bath returns the transition probabilities of the energy over one pass,
// column-stochastic, row-major: exp(L) of the energy diffusion
//
//	L f = ∂/∂E [J(E)/Q · (f + ∂f/∂E)],  J = ∮v²dt,
//
// (H. A. Kramers, Physica 7, 284 (1940)), which keeps e^{-E} whatever J is.
// Where J = 2πE it is exactly the noncentral chi-square kernel of a damped
// rotation by one period, r² = e^{-2π/Q}, at any Q. Steps are of second
// order and damp fast modes.
func (g grid) bath(quality, d, reach float64) []float64 {
	const (
		steps = 8
		gamma = 1 - 1/math.Sqrt2
		c1    = (1 - gamma) / gamma
		c2    = -(1 - 2*gamma) / gamma
	)
	n := len(g.mid)
	// Rates up and down across each inner edge; their ratio keeps weight.
	up, down := make([]float64, n), make([]float64, n)
	for i := range n - 1 {
		e := g.edges[i+1]
		_, action := arc(e, d, reach)
		flow := action / quality * math.Exp(-e) / (g.mid[i+1] - g.mid[i])
		up[i], down[i+1] = flow/g.weight[i], flow/g.weight[i+1]
	}
	h := gamma / steps
	// Thomas factors of 1 - h·L; column j of L loses up[j]+down[j].
	pivot, lower := make([]float64, n), make([]float64, n)
	for i := range n {
		pivot[i] = 1 + h*(up[i]+down[i])
		if i > 0 {
			lower[i] = -h * up[i-1] / pivot[i-1]
			pivot[i] -= lower[i] * (-h * down[i])
		}
	}
	k, y := make([]float64, n*n), make([]float64, n*n)
	for i := range n {
		k[i*n+i] = 1
	}
	solve := func(m []float64) {
		for i := 1; i < n; i++ {
			row, prev, f := m[i*n:(i+1)*n], m[(i-1)*n:i*n], lower[i]
			for j := range row {
				row[j] -= f * prev[j]
			}
		}
		for i := n - 1; i >= 0; i-- {
			row, inv := m[i*n:(i+1)*n], 1/pivot[i]
			if i == n-1 {
				for j := range row {
					row[j] *= inv
				}
				continue
			}
			next, f := m[(i+1)*n:(i+2)*n], h*down[i+1]
			for j := range row {
				row[j] = (row[j] + f*next[j]) * inv
			}
		}
	}
	for range steps {
		solve(k)
		copy(y, k)
		solve(y)
		for i := range k {
			k[i] = c1*y[i] + c2*k[i]
		}
	}
	return k
}
