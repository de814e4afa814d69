package effect

import (
	"fmt"
	"math"

	"brinkwell/controller/trace"
)

// lagged keeps squared differences of measured positions over a lag and over
// twice the lag, from which the kinetic temperature follows without the
// sensor's white noise: it adds 2·s² to both.
type lagged struct {
	ticks    int64 // the lag
	seconds  float64
	reason   string // why these positions cannot show the velocity
	previous [2]float64
	filled   int
}

// newLagged takes a lag of a sixteenth of a period, or a quarter of the time in
// which the velocity of a damped resonator relaxes, in whole ticks.
func newLagged(r Reference) lagged {
	relax := 1 / r.Oscillator.Damping()
	lag := math.Min(2*math.Pi/r.Oscillator.Omega0/16, relax/4)
	l := lagged{ticks: max(1, int64(math.Round(lag*r.Rate)))}
	l.seconds = float64(l.ticks) / r.Rate
	if l.seconds > relax {
		l.reason = fmt.Sprintf("the velocity relaxes in %.3g s and a tick takes %.3g s: positions sampled so do not show it; a rate above %.3g Hz would",
			relax, 1/r.Rate, 2/relax)
	}
	return l
}

func (l *lagged) add(start int64, samples []trace.Sample, row []float64) {
	first := ((-start)%l.ticks + l.ticks) % l.ticks // ticks before the start count below 0
	for i := first; i < int64(len(samples)); i += l.ticks {
		x := samples[i].Measured
		if math.IsNaN(x) { // lost
			l.filled = 0
			continue
		}
		if l.filled == 2 {
			d1, d2 := x-l.previous[1], x-l.previous[0]
			row[sumPairs]++
			row[sumDiff1] += d1 * d1
			row[sumDiff2] += d2 * d2
		} else {
			l.filled++
		}
		l.previous[0], l.previous[1] = l.previous[1], x
	}
}

// temperature returns the kinetic temperature over the bath's from the mean
// squared differences, m²: the exact correlation ρ of a thermal oscillator
// gives <(x(t)-x(0))²> = 2·(kT/k)·(1-ρ(t)) + 2·s², and the difference of the
// two lags is free of s. Noise of a limited bandwidth f_c correlates, as
// e^{-2π·f_c·t}, and what that leaves of it is taken off.
func (l *lagged) temperature(r Reference, diff1, diff2 float64) float64 {
	o := r.Oscillator
	if r.SensorCorner > 0 {
		decay := math.Exp(-2 * math.Pi * r.SensorCorner * l.seconds)
		diff2 -= 2 * r.SensorNoise * r.SensorNoise * decay * (1 - decay)
	}
	return (diff2 - diff1) / (2 * o.KT / o.Stiffness * (o.Correlation(l.seconds) - o.Correlation(2*l.seconds)))
}
