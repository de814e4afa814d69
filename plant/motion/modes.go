package motion

import "math"

// modes are the eigenvalues of the motion in units of ω₀: -half ± i·split when
// underdamped, -half ± split when not. Times that its methods take are in
// units of 1/ω₀.
type modes struct {
	half       float64 // Γ/(2ω₀)
	split      float64 // √|1 - half²|
	slow       float64 // rate at which the slower mode decays
	fast       float64 // modulus of the larger eigenvalue
	overdamped bool    // or critically damped
}

func (o Oscillator) modes() modes {
	requirePositive(o.Quality, "Quality")
	q := o.Quality
	m := modes{half: 0.5 / q, overdamped: q <= 0.5}
	// 2q - 1 is exact near q = 1/2, where 1 - half² would lose its digits.
	m.split = math.Sqrt(math.Abs(2*q-1)*(2*q+1)) / (2 * q)
	if m.overdamped {
		m.fast = m.half + m.split
		m.slow = 1 / m.fast // = half - split
	} else {
		m.fast = 1
		m.slow = m.half
	}
	return m
}

// short is the step, in units of 1/fast, up to which differences that vanish
// with the step are got by integrating their positive derivatives.
const short = 3

// flow is the propagator for a step t in units of 1/ω₀.
type flow struct {
	xx, xv, vv float64 // vx = -xv
}

func (m modes) flow(t float64) flow {
	if m.overdamped {
		slow := math.Exp(-m.slow * t)
		xv := slow * t
		if m.split > 0 {
			xv = -slow * math.Expm1(-2*m.split*t) / (2 * m.split)
		}
		return flow{xx: slow + m.slow*xv, xv: xv, vv: math.Exp(-m.fast*t) - m.slow*xv}
	}
	decay := math.Exp(-m.half * t)
	sin, cos := math.Sincos(m.split * t)
	xv := decay * sin / m.split
	return flow{xx: decay*cos + m.half*xv, xv: xv, vv: decay*cos - m.half*xv}
}

// stepResponse returns 1 - xx of the propagator f for the step t.
func (m modes) stepResponse(t float64, f flow) float64 {
	if m.fast*t <= short {
		var sum float64
		for i, node := range gauss.node {
			sum += gauss.weight[i] * m.flow(node*t).xv
		}
		return sum * t
	}
	if m.overdamped {
		return -math.Expm1(-m.slow*t) - m.slow*f.xv
	}
	// After a whole number of periods nearly nothing is left of 1 - xx.
	sin := math.Sin(m.split * t / 2)
	return -math.Expm1(-m.half*t) + 2*math.Exp(-m.half*t)*sin*sin - m.half*f.xv
}

// noise is the covariance that the thermal force adds over a step, in units of
// k_B·T/k and 1/ω₀.
type noise struct {
	xx, xv, vv float64
}

func (m modes) noise(t float64) noise {
	f := m.flow(t)
	c := noise{xv: 2 * m.half * f.xv * f.xv}
	if m.fast*t <= short {
		for i, node := range gauss.node {
			g := m.flow(node * t)
			c.xx += gauss.weight[i] * g.xv * g.xv
			c.vv += gauss.weight[i] * g.vv * g.vv
		}
		c.xx *= 4 * m.half * t
		c.vv *= 4 * m.half * t
		return c
	}
	switch {
	case m.slow*t > 0.5: // so far relaxed that the difference is no small one
		c.xx = 1 - f.xx*f.xx - f.xv*f.xv
	case m.overdamped: // and split > 1
		c.xx = m.half / (m.split * m.split) *
			(-math.Expm1(-2*m.slow*t)/(2*m.slow) +
				math.Expm1(-2*m.half*t)/m.half -
				math.Expm1(-2*m.fast*t)/(2*m.fast))
	default: // half < 1/6
		decay := math.Exp(-2 * m.half * t)
		sin, cos := math.Sincos(2 * m.split * t)
		c.xx = (-math.Expm1(-2*m.half*t) -
			m.half*m.half*(1-decay*cos) -
			m.half*m.split*decay*sin) / (m.split * m.split)
	}
	c.vv = c.xx + 2*m.half*f.xv*(f.xx+f.vv) // vv - xx = Φ_xx² - Φ_vv²
	return c
}
