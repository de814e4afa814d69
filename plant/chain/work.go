package chain

import (
	"math"

	"gonum.org/v1/gonum/integrate/quad"
)

// work integrates what a lagging centre does to the resonator. With the
// potential continuous at x0 whatever the centre c, dU/dc = -k·(x - x0), and
// with the centre's distance e from its target, c′ = -e/τ, the work of a tick
// is k·∫(x - x0)·e/τ dt. The path is the cubic through position and velocity
// at both ends of the tick (Hermite's), e an exponential; what the thermal
// force adds within the tick averages out over the actuations.
type work struct {
	ratio  float64    // tick over lag
	whole  [5]float64 // of a tick: weights of x, v·dt at the start and at the end, and of -x0
	nodes  []float64  // on [0, 1]
	weight []float64
}

// Beyond so many lags nothing is left to integrate.
const spent = 40

func newWork(ratio float64) work {
	const points = 24
	w := work{ratio: ratio, nodes: make([]float64, points), weight: make([]float64, points)}
	quad.Legendre{}.FixedLocations(w.nodes, w.weight, 0, 1)
	w.whole = w.part(0, 1)
	return w
}

// part returns the weights of the integral from s to t, in ticks, for e = 1 at
// s.
func (w *work) part(s, t float64) (sum [5]float64) {
	t = math.Min(t, s+spent/w.ratio)
	for i, node := range w.nodes {
		u := s + (t-s)*node
		p := w.weight[i] * (t - s) * w.ratio * math.Exp(-(u-s)*w.ratio)
		u2, u3 := u*u, u*u*u
		sum[0] += p * (1 - 3*u2 + 2*u3)
		sum[1] += p * (u - 2*u2 + u3)
		sum[2] += p * (3*u2 - 2*u3)
		sum[3] += p * (u3 - u2)
		sum[4] += p
	}
	return sum
}

// endWork computes the work of the tick that ends.
func (m *Mover) endWork(at, out []float64) {
	if !m.lagging {
		for i := range m.moves {
			out[i] = -m.stiffness * (at[i] - m.threshold) * m.moves[i].by
		}
		return
	}
	e := m.before[stateLag]
	if len(m.moves) == 0 {
		out[0] = m.span(&m.work.whole, e)
		return
	}
	from := 0.0
	for i := range len(m.moves) + 1 {
		to := 1.0
		if i < len(m.moves) {
			to = m.moves[i].offset / m.dt
		}
		part := m.work.part(from, to)
		out[i] = m.span(&part, e)
		if i < len(m.moves) {
			e = e*math.Exp(-(to-from)*m.work.ratio) - m.moves[i].by
		}
		from = to
	}
}

// span returns the work over a span whose weights are given, for a lag e at
// its start, J.
func (m *Mover) span(w *[5]float64, e float64) float64 {
	if e == 0 {
		return 0
	}
	old := m.target
	for i := range m.moves {
		old -= m.moves[i].by
	}
	x := w[0]*(old+m.before[stateU]) + w[1]*m.before[stateV]*m.dt + w[2]*m.Position() + w[3]*m.z[stateV]*m.dt
	return m.stiffness * e * (x - m.threshold*w[4])
}

// Unsettled reports whether the centre is still on its way by more than a
// billionth of a distance, in metres.
func (m *Mover) Unsettled(distance float64) bool {
	return m.lagging && math.Abs(m.z[stateLag]) > 1e-9*distance
}
