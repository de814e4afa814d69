package resonator_test

import (
	"math"
	"testing"

	"brinkwell/plant/motion"
	"brinkwell/plant/resonator"
	"brinkwell/plant/variate"
)

// paddle is an oscillator in SI units, far from 1, so that a mass or a
// frequency left out shows. Times below are in 1/ω₀, lengths in σ, energies in
// kT.
func paddle(quality float64) motion.Oscillator {
	return motion.Oscillator{Omega0: 2 * math.Pi * 6500, Quality: quality, Stiffness: 0.08, KT: 4.0474e-21}
}

// units are σ in m, the thermal velocity in m/s and 1/ω₀ in s.
func units(o motion.Oscillator) (length, speed, time float64) {
	length = math.Sqrt(o.KT / o.Stiffness)
	return length, length * o.Omega0, 1 / o.Omega0
}

func newResonator(t testing.TB, o motion.Oscillator, dt float64) *resonator.Resonator {
	t.Helper()
	r, err := resonator.New(o, dt)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// damped is the textbook motion of m·x″ + m·Γ·x′ + k·x = 0 from (x, v), with
// ω₀ = 1 and Γ = 1/Q (L. D. Landau and E. M. Lifshitz, Mechanics, § 25; from
// memory): written from the initial values, not as a propagator.
func damped(quality, x, v, t float64) (xt, vt float64) {
	g := 1 / (2 * quality)
	e := math.Exp(-g * t)
	b := v + g*x
	switch {
	case g < 1:
		w := math.Sqrt(1 - g*g)
		s, c := math.Sincos(w * t)
		xt = e * (x*c + b/w*s)
		vt = e*(b*c-x*w*s) - g*xt
	case g > 1:
		w := math.Sqrt(g*g - 1)
		slow, fast := math.Exp(-t/(g+w))/2, math.Exp(-(g+w)*t)/2 // 1/(g+w) = g-w
		xt = x*(slow+fast) + b/w*(slow-fast)
		vt = b*(slow+fast) + x*w*(slow-fast) - g*xt
	default:
		xt = e * (x + b*t)
		vt = e*b - g*xt
	}
	return xt, vt
}

func TestNewRefusesBadTicks(t *testing.T) {
	for _, dt := range []float64{0, -1e-6, math.Inf(1), math.NaN()} {
		if r, err := resonator.New(paddle(10), dt); err == nil || r != nil {
			t.Errorf("New with a tick of %g s: %v, %v, want an error", dt, r, err)
		}
	}
}

func TestMoveKeepsPositionAndVelocity(t *testing.T) {
	length, speed, time := units(paddle(10))
	r := newResonator(t, paddle(10), 0.05*time)
	r.Set(1.25*length, -0.5*speed, -2*length)
	for _, centre := range []float64{2, -2, 0.3, 0.3} {
		r.Move(centre * length)
		// A sum and a difference of the size of σ: a few roundings.
		if x := r.Position(); !(math.Abs(x-1.25*length) <= 4e-16*4*length) {
			t.Errorf("moving the centre to %g σ moved the resonator to %g σ, want 1.25", centre, x/length)
		}
		if v := r.Velocity(); v != -0.5*speed {
			t.Errorf("moving the centre changed the velocity to %g of thermal, want -0.5", v/speed)
		}
	}
}

// Without noise the ticks follow the textbook's damped motion.
func TestStepFollowsDampedMotion(t *testing.T) {
	for _, quality := range []float64{0.02, 0.3, 0.5, 0.7, 10, 1000} {
		o := paddle(quality)
		length, speed, time := units(o)
		o.KT = 0
		const dt = 0.05
		r := newResonator(t, o, dt*time)
		bath := resonator.NewBath(o, dt*time, variate.NewNormal(1, 0))
		r.Set(1.5*length, 0.7*speed, 0.5*length)
		for i := 1; i <= 400; i++ {
			r.Step(bath.Next())
			x, v := damped(quality, 1, 0.7, dt*float64(i))
			x += 0.5
			// 400 roundings of numbers of order 1; the reference's own phase 20.
			const tol = 1e-13
			if dx, dv := r.Position()/length-x, r.Velocity()/speed-v; !(math.Abs(dx) < tol && math.Abs(dv) < tol) {
				t.Fatalf("Q = %g, tick %d: off by %.2g σ and %.2g thermal velocities, want < %g", quality, i, dx, dv, tol)
			}
		}
	}
}

func TestTicksDoNotAllocate(t *testing.T) {
	o := paddle(35)
	_, _, time := units(o)
	r := newResonator(t, o, 0.04*time)
	bath := resonator.NewBath(o, 0.04*time, variate.NewNormal(1, 0))
	within := variate.NewNormal(1, 1)
	s := r.Split(0.01 * time)
	if a := testing.AllocsPerRun(5000, func() {
		r.Step(bath.Next())
		r.StepMoving(bath.Next(), &s, 1e-10, within)
	}); a != 0 {
		t.Errorf("%v allocations a tick, want 0", a)
	}
}

func BenchmarkStep(b *testing.B) {
	o := paddle(35)
	_, _, time := units(o)
	r := newResonator(b, o, 0.04*time)
	bath := resonator.NewBath(o, 0.04*time, variate.NewNormal(1, 0))
	b.ReportAllocs()
	for b.Loop() {
		r.Step(bath.Next())
	}
}
