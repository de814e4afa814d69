package theory

import (
	"math"
	"math/rand/v2"
)

// A simulated is what a simulation of the loop measured, with standard
// errors from blocks; rates in both directions.
type simulated struct {
	temperature, temperatureErr float64 // 1 + Q·P, from the work at the actuations
	switches, switchesErr       float64
	settled, settledErr         float64 // stayed for 2π after the actuation
	upper, upperErr             float64
}

// A jump is the exact propagator over some ticks, with the Cholesky factor
// of its noise covariance.
type jump struct {
	ticks          int
	xx, xv, vx, vv float64
	l11, l21, l22  float64
	length, spread float64
}

// newJump takes the closed form of S. F. Nørrelykke and H. Flyvbjerg, Phys.
// Rev. E 83, 041103 (2011), in reduced units.
func newJump(quality, dt float64, ticks int) jump {
	t, g := dt*float64(ticks), 1/quality
	e := math.Exp(-g * t / 2)
	var cc, ss float64
	if d := 1 - g*g/4; d > 0 {
		w := math.Sqrt(d)
		cc, ss = math.Cos(w*t), math.Sin(w*t)/w
	} else {
		k := math.Sqrt(-d)
		cc, ss = math.Cosh(k*t), math.Sinh(k*t)/k
	}
	j := jump{ticks: ticks, xx: e * (cc + g/2*ss), xv: e * ss, vx: -e * ss, vv: e * (cc - g/2*ss), length: t}
	cxx, cvv, cxv := 1-j.xx*j.xx-j.xv*j.xv, 1-j.vv*j.vv-j.xv*j.xv, g*j.xv*j.xv
	j.l11 = math.Sqrt(cxx)
	j.l21 = cxv / j.l11
	j.l22 = math.Sqrt(cvv - j.l21*j.l21)
	j.spread = 6 * math.Sqrt(2*g*t)
	return j
}

// simulate runs the sampled loop on the thermally driven oscillator, the
// actuation `latency` ticks after its sample, for the given time in 1/ω₀.
// Far from the threshold, and without sensor noise, it skips ticks in one
// exact step: the path cannot reach the threshold within it at six standard
// deviations of the noise on amplitude and position.
func simulate(c Case, latency int, length float64, seed uint64) simulated {
	const blocks = 40
	src := rand.New(rand.NewPCG(seed, 0x7468656f7279))
	a := math.Sqrt(2 * c.Barrier)
	var jumps []jump
	for n := 1; float64(n)*c.Tick < 4 && n <= 256; n *= 2 {
		jumps = append(jumps, newJump(c.Quality, c.Tick, n))
	}
	level, side := 1, 1
	y, v := src.NormFloat64(), src.NormFloat64()
	queue := make([]int, latency+1)
	for i := range queue {
		queue[i] = 1
	}
	head, quiet := 0, latency+1
	per := int(length / c.Tick / blocks)
	var works, counts, settles, ups [blocks]float64
	var sinceSwitch float64
	settledSide := 1
	for block := -2; block < blocks; block++ {
		var work float64
		count, settled, up := 0, 0, 0
		for done := 0; done < per; {
			reading := y + float64(side)*a - c.Offset
			if c.Noise > 0 {
				reading += c.Noise * src.NormFloat64()
			}
			was := level
			if reading > c.HalfBand {
				level = 1
			} else if reading < -c.HalfBand {
				level = -1
			}
			quiet++
			if level != was {
				quiet = 0
			}
			queue[head] = level
			head = (head + 1) % len(queue)
			if act := queue[head]; act != side {
				x := y + float64(side)*a
				side = act
				y = x - float64(side)*a
				work -= 2 * a * float64(side) * (x - c.Offset)
				count++
				sinceSwitch = 0
			}
			j := jumps[0]
			if quiet > latency && c.Noise == 0 {
				room := a - float64(side)*c.Offset + c.HalfBand + float64(side)*y
				amplitude := math.Sqrt(y*y + v*v)
				for k := len(jumps) - 1; k > 0; k-- {
					if n := &jumps[k]; room > math.Min(amplitude*n.length, amplitude+float64(side)*y)+n.spread*(1+n.length) {
						j = *n
						break
					}
				}
				for range len(queue) * min(1, j.ticks-1) {
					queue[head] = level
					head = (head + 1) % len(queue)
				}
				quiet += j.ticks - 1
			}
			g1, g2 := src.NormFloat64(), src.NormFloat64()
			y, v = j.xx*y+j.xv*v+j.l11*g1, j.vx*y+j.vv*v+j.l21*g1+j.l22*g2
			done += j.ticks
			if side > 0 {
				up += j.ticks
			}
			sinceSwitch += j.length
			if side != settledSide && sinceSwitch >= 2*math.Pi {
				settledSide = side
				settled++
			}
		}
		if block >= 0 {
			t := float64(per) * c.Tick
			works[block], counts[block], settles[block], ups[block] = work/t, float64(count)/t, float64(settled)/t, float64(up)/float64(per)
		}
	}
	var s simulated
	var p, pErr float64
	p, pErr = meanAndError(works[:])
	s.temperature, s.temperatureErr = 1+c.Quality*p, c.Quality*pErr
	s.switches, s.switchesErr = meanAndError(counts[:])
	s.settled, s.settledErr = meanAndError(settles[:])
	s.upper, s.upperErr = meanAndError(ups[:])
	return s
}

func meanAndError(x []float64) (mean, err float64) {
	for _, v := range x {
		mean += v / float64(len(x))
	}
	for _, v := range x {
		err += (v - mean) * (v - mean)
	}
	return mean, math.Sqrt(err / float64(len(x)*(len(x)-1)))
}
