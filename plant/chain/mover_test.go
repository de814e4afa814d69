package chain

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"

	"brinkwell/plant/motion"
	"brinkwell/plant/resonator"
	"brinkwell/plant/variate"
)

func reduced(quality, kT float64) motion.Oscillator {
	return motion.Oscillator{Omega0: 1, Quality: quality, Stiffness: 1, KT: kT}
}

func newMover(t *testing.T, c MoverConfig) *Mover {
	t.Helper()
	c.Own, c.Within = variate.NewNormal(1, 1), variate.NewNormal(1, 2)
	m, err := NewMover(c)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

// Without poles a Mover is the resonator itself: the same kicks move both
// alike, through targets that move within ticks.
func TestMoverIsTheResonator(t *testing.T) {
	for _, quality := range []float64{0.02, 0.5, 10, 1000} {
		const dt, offset = 0.1, 0.03
		o := reduced(quality, 1)
		m := newMover(t, MoverConfig{Oscillator: o, Tick: dt, Offset: offset})
		r, err := resonator.New(o, dt)
		if err != nil {
			t.Fatal(err)
		}
		m.Set(0.3, -0.2, 1, 0)
		r.Set(0.3, -0.2, 1)
		split, within := r.Split(offset), variate.NewNormal(1, 2)
		a, b := resonator.NewBath(o, dt, variate.NewNormal(2, 0)), resonator.NewBath(o, dt, variate.NewNormal(2, 0))
		at, work := make([]float64, 2), make([]float64, 3)
		for tick := range 2000 {
			m.Begin()
			if tick%7 == 3 {
				target := float64(tick%5) - 2
				was := r.Position()
				m.MoveAt(offset, target)
				m.End(a.Next(), at, work)
				if x := r.StepMoving(b.Next(), &split, target, within); !(math.Abs(x-at[0]) < 1e-11) {
					t.Fatalf("Q = %v: at %v within the tick from %v, want %v", quality, at[0], was, x)
				}
			} else {
				m.End(a.Next(), at, work)
				r.Step(b.Next())
			}
			// Two thousand steps of rounding.
			if !(math.Abs(m.Position()-r.Position()) < 1e-11 && math.Abs(m.Velocity()-r.Velocity()) < 1e-10) {
				t.Fatalf("Q = %v, tick %d: %v, %v, want %v, %v", quality, tick, m.Position(), m.Velocity(), r.Position(), r.Velocity())
			}
		}
	}
}

// run moves a noise-free Mover's target from 0 to 1 at a time and returns the
// position and the reading at an end.
func run(t *testing.T, quality float64, p Poles, dt, when, end float64) (x, seen float64) {
	t.Helper()
	m := newMover(t, MoverConfig{Oscillator: reduced(quality, 0), Poles: p, Tick: dt, Anywhere: true})
	m.Set(0, 0, 0, 0)
	at, work := make([]float64, 2), make([]float64, 3)
	for tick := range int(math.Round(end / dt)) {
		m.Begin()
		if k := int(when / dt); k == tick {
			m.MoveAt(when-float64(tick)*dt, 1)
		}
		m.End(&resonator.Kick{}, at, work)
	}
	return m.Position(), m.Seen()
}

// stepResponse is the position of the oscillator a time after its centre's
// target moved to 1, the centre following with a lag τ: partial fractions of
// 1/[s·(s² + s/Q + 1)·(1 + s·τ)], by Laplace's transform.
func stepResponse(quality, tau, time float64) float64 {
	disc := complex(1/(4*quality*quality)-1, 0)
	root := sqrt(disc)
	p := []complex128{complex(-1/(2*quality), 0) + root, complex(-1/(2*quality), 0) - root, complex(-1/tau, 0)}
	sum := complex(1, 0)
	for i := range p {
		residue := complex(1/tau, 0) / p[i]
		for j := range p {
			if j != i {
				residue /= p[i] - p[j]
			}
		}
		sum += residue * exp(p[i]*complex(time, 0))
	}
	return real(sum)
}

func TestLagAgainstClosedForm(t *testing.T) {
	for _, tt := range []struct{ quality, tau float64 }{
		{35, 0.08},
		{35, 0.001},
		{35, 30},
		{0.3, 0.5},
		{0.7, 1.7},
		{10, 1},
		{0.3, 3.0000001}, // all but the root that the overdamped resonator has at 1/3
	} {
		for _, end := range []float64{0.4, 2, 9} {
			x, _ := run(t, tt.quality, Poles{Lag: tt.tau}, 0.1, 0.137, end)
			want := stepResponse(tt.quality, tt.tau, end-0.137)
			// The table of instants is good to 1e-7·(1 + (tick/lag)²).
			if tol := 2e-7 * (1 + math.Pow(0.1/tt.tau, 2)); !(math.Abs(x-want) < tol) {
				t.Errorf("Q = %v, lag %v, after %v: %v, want %v within %.1g", tt.quality, tt.tau, end, x, want, tol)
			}
		}
	}
}

// A fast resonator's reading behind a low-pass and a high-pass follows
// e^{-w_h·t} once everything else is over; a low-pass alone settles at the
// position.
func TestSensorPolesSettle(t *testing.T) {
	x, seen := run(t, 0.7, Poles{Bandwidth: 0.5 / (2 * math.Pi)}, 0.1, 0, 60)
	if !(math.Abs(x-1) < 1e-9 && math.Abs(seen-1) < 1e-9) {
		t.Errorf("settled at %v, read as %v, want 1 and 1", x, seen)
	}
	const high = 0.01
	_, a := run(t, 0.7, Poles{HighPass: high / (2 * math.Pi)}, 0.1, 0, 60)
	_, b := run(t, 0.7, Poles{HighPass: high / (2 * math.Pi)}, 0.1, 0, 160)
	if got, want := math.Log(a/b)/100, high; !(math.Abs(got-want) < 1e-9) {
		t.Errorf("the step decays at %v, want %v", got, want)
	}
}

// The stationary variance behind a low-pass is kT/k·b·(b+Γ)/(b·(b+Γ)+omega0²),
// b = 2π·f_b (from the moment equations of oscillator and pole); found here as
// the fixed point of C = Φ·S·Φᵀ + noise for the joint system, whatever the tick.
func TestLowPassVariance(t *testing.T) {
	for _, quality := range []float64{0.1, 1, 35} {
		for _, b := range []float64{0.1, 1, 30, 1000} {
			for _, dt := range []float64{0.01, 0.3, 3} {
				s := newSystem(reduced(quality, 1), Poles{Bandwidth: b / (2 * math.Pi)})
				phi, c := s.flow(dt), s.noise(dt)
				n := len(s.index)
				// vec(S) = (1 - Φ⊗Φ)⁻¹·vec(C)
				left, right := mat.NewDense(n*n, n*n, nil), mat.NewVecDense(n*n, nil)
				for i, p := range s.index {
					for j, q := range s.index {
						right.SetVec(i*n+j, c[p][q])
						for k, u := range s.index {
							for l, v := range s.index {
								v := -phi[p][u] * phi[q][v]
								if i == k && j == l {
									v++
								}
								left.Set(i*n+j, k*n+l, v)
							}
						}
					}
				}
				var all mat.VecDense
				if err := all.SolveVec(left, right); err != nil {
					t.Fatal(err)
				}
				gamma := 1 / quality
				want := b * (b + gamma) / (b*(b+gamma) + 1)
				// The solver loses what a short tick's 1 - Φ⊗Φ cancels.
				if got := all.AtVec(2*n + 2); !(math.Abs(got-want) < 1e-9*want/dt) {
					t.Errorf("Q = %v, b = %v, tick %v: variance %v, want %v", quality, b, dt, got, want)
				}
				if got := all.AtVec(0); !(math.Abs(got-1) < 1e-9/dt) {
					t.Errorf("Q = %v, b = %v, tick %v: the resonator's own variance %v, want 1", quality, b, dt, got)
				}
			}
		}
	}
}

// With hardly any damping and no noise the energy, kinetic and potential,
// changes by just the work that is reported, tick by tick, while targets move
// anywhere: U = k·(x-c)²/2 - k·(x0-c)²/2 is continuous at x0 for any centre c.
func TestWorkClosesTheEnergy(t *testing.T) {
	const dt, x0 = 0.05, 0.3
	for _, tt := range []struct{ ticks, tol float64 }{
		// The path within a tick is taken for a cubic. A centre that all but jumps
		// by 2 bends it: off by up to 2·dt²/32 where the work is 2 a length, 3e-4.
		// The slower the centre, the smoother the path; damping takes 1e-7.
		{0.01, 3e-4}, {0.3, 3e-5}, {1, 1e-5}, {10, 3e-7}, {100, 3e-7},
	} {
		ticks := tt.ticks
		m := newMover(t, MoverConfig{
			Oscillator: motion.Oscillator{Omega0: 1, Quality: 1e6, Stiffness: 1, KT: 0},
			Poles:      Poles{Lag: ticks * dt}, Tick: dt, Threshold: x0, Anywhere: true,
		})
		m.Set(0.4, 0.7, -1, 0)
		energy := func() float64 {
			x, v := m.Position(), m.Velocity()
			c := m.target + m.z[stateLag]
			return v*v/2 + (x-c)*(x-c)/2 - (x0-c)*(x0-c)/2
		}
		at, work := make([]float64, 3), make([]float64, 4)
		worst, done := 0.0, 0.0
		for tick := range 3000 {
			before := energy()
			m.Begin()
			clear(work)
			if tick%37 == 5 {
				m.MoveAt(0.013, 1)
			}
			if tick%37 == 20 {
				m.MoveAt(0.04, -1)
			}
			m.End(&resonator.Kick{}, at, work)
			sum := work[0] + work[1]
			worst = math.Max(worst, math.Abs(energy()-before-sum))
			done = math.Max(done, math.Abs(sum))
		}
		if !(worst < tt.tol && done > 0.01) {
			t.Errorf("lag of %v ticks: the energy is off by %.2g of a work of %.2g in a tick", ticks, worst, done)
		}
	}
}

func TestMoverDoesNotAllocate(t *testing.T) {
	m := newMover(t, MoverConfig{Oscillator: reduced(10, 1), Poles: Poles{Lag: 0.1, Bandwidth: 3, HighPass: 0.01}, Tick: 0.1, Anywhere: true})
	at, work := make([]float64, 2), make([]float64, 3)
	if a := testing.AllocsPerRun(100, func() {
		m.Begin()
		m.MoveAt(0.05, -m.target+1)
		m.End(&resonator.Kick{X: 0.1, V: 0.1}, at, work)
	}); a != 0 {
		t.Errorf("%v allocations a tick", a)
	}
}
