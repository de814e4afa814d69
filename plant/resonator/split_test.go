package resonator_test

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"

	"brinkwell/plant/motion"
	"brinkwell/plant/resonator"
	"brinkwell/plant/variate"
)

// Instants within a tick, as parts of it.
var instants = []float64{0, 0.001, 0.25, 0.5, 0.9, 0.999}

// Without noise the centre's move in mid-tick gives the textbook's damped
// motion about the old centre, then about the new one.
func TestStepMovingWithoutNoise(t *testing.T) {
	for _, quality := range []float64{0.02, 0.3, 0.5, 10, 1000} {
		for _, dt := range []float64{0.04, 1.7} {
			for _, part := range instants {
				o := paddle(quality)
				length, speed, time := units(o)
				o.KT = 0
				r := newResonator(t, o, dt*time)
				bath := resonator.NewBath(o, dt*time, variate.NewNormal(1, 0))
				s := r.Split(part * dt * time)
				r.Set(0.4*length, -1.3*speed, -2*length)
				at := r.StepMoving(bath.Next(), &s, 2.5*length, variate.NewNormal(1, 1)) / length

				x, v := damped(quality, 2.4, -1.3, part*dt)
				wantAt := x - 2
				x, v = damped(quality, wantAt-2.5, v, (1-part)*dt)
				x += 2.5
				// A few roundings of numbers of order 5, and for Q = 0.02 the
				// reference's difference of hyperbolic functions.
				const tol = 2e-14
				for _, d := range []float64{at - wantAt, r.Position()/length - x, r.Velocity()/speed - v} {
					if !(math.Abs(d) < tol) {
						t.Errorf("Q = %g, dt = %g, instant %g: position at the instant and state after off by %.2g, %.2g, %.2g, want < %g",
							quality, dt, part, at-wantAt, r.Position()/length-x, r.Velocity()/speed-v, tol)
						break
					}
				}
			}
		}
	}
}

// The same against a thousand tiny steps to the instant and a thousand on.
func TestStepMovingIsManyTinySteps(t *testing.T) {
	for _, quality := range []float64{0.1, 0.5, 10} {
		o := paddle(quality)
		length, speed, time := units(o)
		o.KT = 0
		const dt, part, steps = 0.3, 0.37, 1000
		r := newResonator(t, o, dt*time)
		s := r.Split(part * dt * time)
		r.Set(-1.8*length, 0.9*speed, -2*length)
		at := r.StepMoving(new(resonator.Kick), &s, 2*length, variate.NewNormal(1, 1))

		before := newResonator(t, o, part*dt*time/steps)
		before.Set(-1.8*length, 0.9*speed, -2*length)
		after := newResonator(t, o, (1-part)*dt*time/steps)
		for range steps {
			before.Step(new(resonator.Kick))
		}
		after.Set(before.Position(), before.Velocity(), 2*length)
		for range steps {
			after.Step(new(resonator.Kick))
		}
		// A thousand roundings that do not all go one way, of a state of order 4.
		const tol = 1e-12
		for _, d := range []float64{
			(at - before.Position()) / length,
			(r.Position() - after.Position()) / length,
			(r.Velocity() - after.Velocity()) / speed,
		} {
			if !(math.Abs(d) < tol) {
				t.Errorf("Q = %g: off by %.2g from tiny steps, want < %g", quality, d, tol)
			}
		}
	}
}

// Two runs of one bath differ only by what was done to them: the centre that
// does not move leaves the tick as it is, to the bit, and one that moves adds
// its response whatever the kick.
func TestStepMovingKeepsTheKick(t *testing.T) {
	for _, quality := range []float64{0.1, 0.5, 35} {
		o := paddle(quality)
		length, speed, time := units(o)
		const dt, part = 0.2, 0.3
		kicks := resonator.NewBath(o, dt*time, variate.NewNormal(5, 0))
		within := variate.NewNormal(5, 1)
		plain, still, moved := newResonator(t, o, dt*time), newResonator(t, o, dt*time), newResonator(t, o, dt*time)
		s := plain.Split(part * dt * time)
		dx, dv := damped(quality, -1, 0, (1-part)*dt)
		dx++ // response to a centre moved by 1
		for i := range 1000 {
			n := *kicks.Next()
			moved.Set(plain.Position(), plain.Velocity(), -2*length)
			if i == 0 {
				for _, r := range []*resonator.Resonator{plain, still, moved} {
					r.Set(-1.5*length, 0.2*speed, -2*length)
				}
			}
			plain.Step(&n)
			still.StepMoving(&n, &s, -2*length, within)
			moved.StepMoving(&n, &s, 2*length, within)
			if plain.Position() != still.Position() || plain.Velocity() != still.Velocity() {
				t.Fatalf("Q = %g, tick %d: a centre that does not move changed the tick", quality, i)
			}
			x := (moved.Position()-plain.Position())/length - 4*dx
			v := (moved.Velocity()-plain.Velocity())/speed - 4*dv
			// A few roundings of numbers of order 4.
			if !(math.Abs(x) < 1e-14 && math.Abs(v) < 1e-14) {
				t.Fatalf("Q = %g, tick %d: the moved centre's response is off by %.2g σ, %.2g thermal velocities", quality, i, x, v)
			}
		}
	}
}

// jointCovariance is that of the noise in the position at an instant and in
// position and velocity at the tick's end, in thermal units, for the exact
// propagator of S. F. Nørrelykke and H. Flyvbjerg, Phys. Rev. E 83, 041103
// (2011): with η the noise up to the instant, that at the end is Φ·η and the
// independent noise of the rest.
func jointCovariance(o motion.Oscillator, to, rest float64) *mat.SymDense {
	length, speed, _ := units(o)
	eta, phi, rho := o.Noise(to), o.Propagate(rest), o.Noise(rest)
	atX := eta.XX*phi.XX + eta.XV*phi.XV
	atV := eta.XX*phi.VX + eta.XV*phi.VV
	endXX := phi.XX*phi.XX*eta.XX + 2*phi.XX*phi.XV*eta.XV + phi.XV*phi.XV*eta.VV + rho.XX
	endXV := phi.XX*phi.VX*eta.XX + (phi.XX*phi.VV+phi.XV*phi.VX)*eta.XV + phi.XV*phi.VV*eta.VV + rho.XV
	endVV := phi.VX*phi.VX*eta.XX + 2*phi.VX*phi.VV*eta.XV + phi.VV*phi.VV*eta.VV + rho.VV
	xx, xv, vv := length*length, length*speed, speed*speed
	return mat.NewSymDense(3, []float64{
		eta.XX / xx, atX / xx, atV / xv,
		atX / xx, endXX / xx, endXV / xv,
		atV / xv, endXV / xv, endVV / vv,
	})
}

// The joint distribution of the position at the instant and the state at the
// tick's end, whitened by the exact covariance: so that the small spread that
// the end leaves to an instant just before it is tested as well as the large.
// 60 cases of nine numbers within 4 standard errors: one table in 30 would miss.
func TestStepMovingCovariance(t *testing.T) {
	if testing.Short() {
		t.Skip("statistical")
	}
	seed := uint64(0)
	for _, quality := range []float64{0.02, 0.3, 0.5, 10, 1e4} {
		for _, dt := range []float64{0.04, 1.7} {
			for _, part := range []float64{0.01, 0.25, 0.5, 0.75, 0.9, 0.99} {
				seed++
				t.Run(fmt.Sprintf("Q=%g/dt=%g/instant=%g", quality, dt, part), func(t *testing.T) {
					whitened(t, quality, dt, part, seed)
				})
			}
		}
	}
}

func whitened(t *testing.T, quality, dt, part float64, seed uint64) {
	const draws = 40_000
	o := paddle(quality)
	length, speed, time := units(o)
	var chol mat.Cholesky
	if !chol.Factorize(jointCovariance(o, part*dt*time, (1-part)*dt*time)) {
		t.Fatal("the exact covariance is not positive definite in floating point")
	}
	var lower mat.TriDense
	chol.LTo(&lower)

	x, v := damped(quality, 2.4, -1.3, part*dt)
	at := x - 2
	x, v = damped(quality, at-2, v, (1-part)*dt)
	x += 2

	r := newResonator(t, o, dt*time)
	s := r.Split(part * dt * time)
	bath := resonator.NewBath(o, dt*time, variate.NewNormal(seed, 0))
	within := variate.NewNormal(seed, 1)
	var sum [3]float64
	var squares [3][3]float64
	for range draws {
		r.Set(0.4*length, -1.3*speed, -2*length)
		y := [3]float64{r.StepMoving(bath.Next(), &s, 2*length, within)/length - at}
		y[1], y[2] = r.Position()/length-x, r.Velocity()/speed-v
		for i := range y {
			for j := range i {
				y[i] -= lower.At(i, j) * y[j]
			}
			y[i] /= lower.At(i, i)
			sum[i] += y[i]
			for j := range i + 1 {
				squares[i][j] += y[i] * y[j]
			}
		}
	}
	root := math.Sqrt(draws)
	for i := range sum {
		if z := sum[i] / root; !(math.Abs(z) < 4) {
			t.Errorf("mean of component %d is off by %.1f standard errors", i, z)
		}
		for j := range i + 1 {
			want, variance := 0.0, 1.0
			if i == j {
				want, variance = 1, 2
			}
			if z := (squares[i][j]/draws - want) * root / math.Sqrt(variance); !(math.Abs(z) < 4) {
				t.Errorf("covariance of components %d and %d is %.4f of the exact, want %g: off by %.1f standard errors",
					i, j, squares[i][j]/draws, want, z)
			}
		}
	}
}

func TestSplitOutsideItsTickPanics(t *testing.T) {
	o := paddle(10)
	r := newResonator(t, o, 1e-6)
	for _, offset := range []float64{-1e-9, 1e-6, 2e-6, math.NaN()} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("Split(%g) of a tick of 1e-6 s did not panic", offset)
				}
			}()
			r.Split(offset)
		}()
	}
}

func BenchmarkStepMoving(b *testing.B) {
	o := paddle(35)
	_, _, time := units(o)
	r := newResonator(b, o, 0.04*time)
	bath := resonator.NewBath(o, 0.04*time, variate.NewNormal(1, 0))
	within := variate.NewNormal(1, 1)
	s := r.Split(0.01 * time)
	b.ReportAllocs()
	for b.Loop() {
		r.StepMoving(bath.Next(), &s, 1e-10, within)
	}
}
