package controller_test

import (
	"fmt"
	"math"
	"testing"
)

// What delay, dead band and sensor noise do, against an independent simulation
// of the same sampled loop (another program in another language: the exact
// propagator of S. F. Nørrelykke and H. Flyvbjerg, Phys. Rev. E 83, 041103
// (2011), 4,000 trajectories at a fixed tick), which gave ⟨v²⟩ with its error
// and the others to the digits shown. Their errors are taken from this run's,
// for the length of that one: ⟨v²⟩ of a record T scatters as √(2/(Γ·T)), which
// gives T from the error stated.
func TestImperfectLoop(t *testing.T) {
	if testing.Short() {
		t.Skip("statistical")
	}
	for i, c := range []struct {
		quality, dt        float64
		latency            float64 // ticks
		band, noise        float64
		velocity, error    float64 // <v²>
		power              float64 // 1 + Q·P
		abs, square, rates float64
	}{
		{1, 0.02, 1, 0, 0, 0.9956, 0.0011, 0.9968, 2.0526, 5.1002, 0.02242},
		{10, 0.01, 0, 0, 0, 0.9958, 0.0029, 0.9946, 2.0543, 5.1045, 0.02193},
		{10, 0.01, 1, 0, 0, 0.9861, 0.0035, 0.9841, 2.0522, 5.0904, 0.02168},
		{10, 0.02, 1, 0, 0, 0.9700, 0.0028, 0.9701, 2.0488, 5.0678, 0.02106},
		{10, 0.02, 0, 0.1, 0, 0.9300, 0.0027, 0.9299, 2.0372, 5.0038, 0.01568},
		{10, 0.02, 0, 0, 0.1, 0.9907, 0.0029, 0.9899, 2.0512, 5.0914, 0.19622},
	} {
		t.Run(fmt.Sprintf("Q=%g/dt=%g/latency=%g/band=%g/noise=%g", c.quality, c.dt, c.latency, c.band, c.noise), func(t *testing.T) {
			t.Parallel()
			b := bench{
				quality: c.quality, barrier: 2, dt: c.dt, latency: c.latency,
				band: c.band, noise: c.noise, seed: uint64(30 + i),
			}
			m, ticks := newMeter(b, 20e6)
			b.run(t, ticks, m)
			length := float64(ticks) * c.dt
			there := 2 * c.quality / (c.error * c.error) // length of the other simulation
			ratio := math.Sqrt(length / there)
			check := func(name string, got, se, want, rounding float64) {
				t.Helper()
				near(t, name, got, se, want, math.Hypot(se*ratio, rounding))
			}
			velocity, velocitySE := m.of(sumVelocity)
			near(t, "<v²>", velocity, velocitySE, c.velocity, c.error)
			work, workSE := m.of(sumWork)
			q := c.quality / c.dt
			check("1 + Q·P", 1+q*work, q*workSE, c.power, 0.3e-4)
			abs, absSE := m.of(sumAbs)
			check("<|x|>", abs, absSE, c.abs, 0.3e-4)
			square, squareSE := m.of(sumSquare)
			check("<x²>", square, squareSE, c.square, 0.3e-4)
			events, eventsSE := m.of(sumEvents)
			check("switches per time", events/c.dt, eventsSE/c.dt, c.rates, 0.3e-5)

			// The energy balance of the loop and the bath, exact in the mean
			// whatever the loop does: m⟨v²⟩/kT - 1 = P/(Γ·kT) (derived).
			balance, balanceSE := m.mean(func(row *[sumAll]float64) float64 {
				return row[sumVelocity] - float64(m.blocks*blockTicks) - q*row[sumWork]
			})
			near(t, "balance of energy", balance, balanceSE, 0, 0)
		})
	}
}
