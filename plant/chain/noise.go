package chain

import (
	"math"

	"brinkwell/plant/variate"
)

// Noise is a sensor's white noise behind its poles, sampled once a tick:
// exactly, for a low-pass, as the stationary process
//
//	y′ = ω_b·(n - y),  w′ = ω_h·(y - w),
//
// whose sample is y - w. It must be made by NewNoise and must not be used by
// two goroutines at once.
type Noise struct {
	normal *variate.Normal
	buffer []float64
	next   int

	sd       float64 // white: of a sample, m
	low      bool
	high     bool
	y, w     float64
	yy       float64 // propagator
	wy, ww   float64
	lyy      float64 // Cholesky factor of a tick's noise
	lwy, lww float64
}

const noiseDrawn = 512

// NewNoise makes the noise of a sensor, started in its stationary state. With
// a high-pass alone the samples stay white: what the high-pass remembers of
// them is less by the square root of its frequency over the rate, and is left
// out.
func NewNoise(c SensorConfig, normal *variate.Normal) *Noise {
	n := &Noise{normal: normal, buffer: make([]float64, noiseDrawn), next: noiseDrawn}
	if c.Bandwidth == 0 {
		n.sd = c.NoiseSD()
		return n
	}
	n.low, n.high = true, c.HighPass > 0
	b, h, t := 2*math.Pi*c.Bandwidth, 2*math.Pi*c.HighPass, 1/c.Rate
	n.yy, n.ww = math.Exp(-b*t), math.Exp(-h*t)
	// Stationary covariance: <yy> = S·ω_b/4, <wy> = <yy>·ω_h/(ω_b+ω_h), <ww> = <wy>.
	syy := c.Density * c.Density * b / 4
	swy := syy * h / (b + h)
	n.wy = h * t // the limit of equal poles
	if b != h {
		n.wy = h * (n.ww - n.yy) / (b - h)
	} else {
		n.wy *= n.yy
	}
	// A tick's noise keeps the stationary state: C = S - Φ·S·Φᵀ.
	cyy := -syy * math.Expm1(-2*b*t)
	cwy := swy - n.yy*(n.wy*syy+n.ww*swy)
	cww := swy - (n.wy*n.wy*syy + 2*n.wy*n.ww*swy + n.ww*n.ww*swy)
	n.lyy = math.Sqrt(cyy)
	if n.lyy > 0 {
		n.lwy = cwy / n.lyy
	}
	n.lww = math.Sqrt(math.Max(0, cww-n.lwy*n.lwy))
	g, f := normal.Next(), normal.Next()
	n.y = math.Sqrt(syy) * g
	if syy > 0 {
		n.w = swy/math.Sqrt(syy)*g + math.Sqrt(math.Max(0, swy-swy*swy/syy))*f
	}
	return n
}

// Next returns the noise of the next sample, m. It does not allocate.
func (n *Noise) Next() float64 {
	if !n.low {
		return n.sd * n.draw()
	}
	sample := n.y
	if n.high {
		sample -= n.w
		g := n.draw()
		n.w = n.wy*n.y + n.ww*n.w + n.lwy*g + n.lww*n.draw()
		n.y = n.yy*n.y + n.lyy*g
		return sample
	}
	n.y = n.yy*n.y + n.lyy*n.draw()
	return sample
}

func (n *Noise) draw() float64 {
	if n.next == len(n.buffer) {
		n.normal.Fill(n.buffer)
		n.next = 0
	}
	v := n.buffer[n.next]
	n.next++
	return v
}
