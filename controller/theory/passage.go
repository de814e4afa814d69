package theory

import (
	"math"
	"math/rand/v2"
)

// A passage is the sampled loop near its threshold: it follows a resonator
// from the moment it comes near the switching point until it leaves outward
// with nothing left in the delay line. The bath kicks the velocity at every
// tick, which decides who turns back; the heat of these kicks is left out of
// the energy, as the diffusion over the arc has it already.
type passage struct {
	a, offset, band float64
	margin          float64 // distance before the switching point at which noise may switch
	tick            float64
	whole           int     // ticks from a decision to its actuation,
	part            float64 // and the rest, as a fraction of a tick
	cos1, sin1      float64 // rotation by part·tick
	cos2, sin2      float64 // rotation by the remainder of the tick
	noise           float64 // standard deviation of a sample's
	damp, kick      float64 // of the velocity in a tick
	normals         []float64
	queue           []int8 // the last whole+1 decisions
}

// An outcome is what one passage did.
type outcome struct {
	side     int     // after it
	energy   float64 // above that side's bottom
	switches int
	overshot float64 // Σ s·(x-x0) over the actuations, σ
	duration float64 // from outer turning point to outer turning point
	after    float64 // of this, spent on the side that it left to
	stuck    bool    // never left: the loop oscillates by itself
}

const (
	passageTicks  = 20000 // after which a passage counts as stuck
	noiseReach    = 5     // standard deviations of noise that are followed; beyond: 3e-7 a sample
	normalsLength = 1 << 16
)

// newPassage needs Delay ≥ Tick/2 - 1e-9.
func newPassage(c Case) *passage {
	p := &passage{
		a: c.Well().Centre(), offset: c.Offset, band: c.HalfBand,
		margin: noiseReach * c.Noise, tick: c.Tick,
	}
	// Without noise a fine tick only spreads the delay by ±tick/2, and a
	// coarser one costs less.
	if c.Noise == 0 && p.tick < 0.01 {
		p.tick = math.Max(p.tick, math.Min(0.01, 2*c.Delay))
	}
	latency := math.Max(0, c.Delay-p.tick/2) / p.tick
	p.whole = int(math.Floor(latency + 1e-9))
	p.part = math.Max(0, latency-float64(p.whole))
	p.sin1, p.cos1 = math.Sincos(p.part * p.tick)
	p.sin2, p.cos2 = math.Sincos((1 - p.part) * p.tick)
	p.queue = make([]int8, p.whole+1)
	p.noise = c.Noise
	p.damp = math.Exp(-p.tick / c.Quality)
	p.kick = math.Sqrt(-math.Expm1(-2 * p.tick / c.Quality))
	// A fixed table: the same noise for every energy keeps the result smooth
	// in it, and reproducible.
	src := rand.New(rand.NewPCG(0x70617373, 0x616765))
	p.normals = make([]float64, normalsLength)
	for i := range p.normals {
		p.normals[i] = src.NormFloat64()
	}
	return p
}

// reach is the distance from a side's centre at which a passage begins.
func (p *passage) reach(side int) float64 {
	return p.a - float64(side)*p.offset + p.band - p.margin
}

// run follows the resonator that arrives in the parabola of side with the
// given energy, phase·tick before the next sample; n picks the noise.
func (p *passage) run(side int, energy, phase float64, n int) outcome {
	s, reach := float64(side), p.reach(side)
	if 2*energy <= reach*reach {
		return outcome{side: side, energy: energy, duration: 2 * math.Pi}
	}
	o, mirror := outcome{side: side}, s // noise mirrored with the side keeps the wells alike
	amplitude := math.Sqrt(2 * energy)
	o.duration = math.Acos(-reach / amplitude)
	y, v := -s*reach, -s*math.Sqrt(2*energy-reach*reach) // about the centre in force
	sin, cos := math.Sincos(phase * p.tick)
	y, v = y*cos+v*sin, v*cos-y*sin
	o.duration += phase * p.tick
	level, head, pending := int8(side), 0, 0
	for i := range p.queue {
		p.queue[i] = level
	}
	for range passageTicks {
		reading := y + s*p.a - p.offset
		if p.noise > 0 {
			reading += mirror * p.noise * p.normals[n&(normalsLength-1)]
			n++
		}
		was := level
		if reading > p.band {
			level = 1
		} else if reading < -p.band {
			level = -1
		}
		pending--
		if level != was {
			pending = p.whole
		}
		p.queue[head] = level
		head++
		if head == len(p.queue) {
			head = 0
		}
		if p.part > 0 {
			y, v = y*p.cos1+v*p.sin1, v*p.cos1-y*p.sin1
			o.duration += p.part * p.tick
		}
		if act := int(p.queue[head]); act != o.side {
			// The oldest decision in the line acts now.
			x := y + s*p.a
			s, o.side = float64(act), act
			y = x - s*p.a
			o.switches++
			o.overshot += s * (x - p.offset)
		}
		if pending <= 0 && int(level) == o.side && s*v > 0 && s*y > -p.reach(o.side) {
			o.energy = energy - 2*p.a*o.overshot
			if o.side != side { // the bottoms differ by the tilt
				o.energy += 2 * p.a * float64(side) * p.offset
			}
			o.energy = math.Max(0, o.energy)
			o.after = math.Atan2(s*v, s*y)
			o.duration += o.after
			return o
		}
		y, v = y*p.cos2+v*p.sin2, v*p.cos2-y*p.sin2
		v = v*p.damp + mirror*p.kick*p.normals[n&(normalsLength-1)]
		n++
		o.duration += (1 - p.part) * p.tick
	}
	o.energy, o.stuck = (y*y+v*v)/2, true
	return o
}
