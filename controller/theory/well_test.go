package theory

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/stat/distuv"
)

// within fails for NaN.
func within(got, want, tol float64) bool { return math.Abs(got-want) <= tol*math.Abs(want) }

// Against the integrals themselves, by Gauss-Legendre panels.
func TestWellIntegrals(t *testing.T) {
	for _, w := range []Well{{3, 0}, {3, 0.3}, {0.5, -0.2}, {8, 1}} {
		for _, temp := range []float64{1, 0.6, 1.3} {
			a := w.Centre()
			u := func(x float64) float64 { // 0 at the threshold
				d, c := x-a, a-w.Offset
				if x < w.Offset {
					d, c = x+a, a+w.Offset
				}
				return (d*d - c*c) / 2 / temp
			}
			integral := func(f func(float64) float64) (lower, upper float64) {
				g := func(x float64) float64 { return f(x) * math.Exp(-u(x)) }
				return panels(g, -a-14, w.Offset, 0.25), panels(g, w.Offset, a+14, 0.25)
			}
			zl, zu := integral(func(float64) float64 { return 1 })
			al, au := integral(func(x float64) float64 { return math.Abs(x - w.Offset) })
			sl, su := integral(func(x float64) float64 { return x * x })
			hl, hu := w.Halves(temp)
			z := zl + zu
			for _, c := range []struct {
				name      string
				got, want float64
			}{
				{"lower half", hl, zl},
				{"upper half", hu, zu},
				{"occupation", w.UpperOccupation(temp), zu / z},
				{"density", w.ThresholdDensity(temp), 1 / z},
				{"mean abs", w.MeanAbs(temp), (al + au) / z},
				{"mean square", w.MeanSquare(temp), (sl + su) / z},
			} {
				if !within(c.got, c.want, 1e-11) { // rounding of both
					t.Errorf("%+v at T ratio %g: %s %v, want %v", w, temp, c.name, c.got, c.want)
				}
			}
		}
	}
}

func TestWellSymmetric(t *testing.T) {
	// ⟨|x|⟩ = a + φ(a)/Φ(a), ⟨x²⟩ = 1 + a² + a·φ(a)/Φ(a) for truncated
	// normals, with gonum's φ and Φ.
	n, w := distuv.UnitNormal, Well{Barrier: 2}
	ratio := n.Prob(2) / n.CDF(2)
	if got := w.MeanAbs(1); !within(got, 2+ratio, 1e-13) {
		t.Errorf("MeanAbs %v", got)
	}
	if got := w.MeanSquare(1); !within(got, 5+2*ratio, 1e-13) {
		t.Errorf("MeanSquare %v", got)
	}
	// Rice's rate from the closed form 2·√(kT/2πm)·e^{-b}/2Z, evaluated by
	// hand to four digits.
	for b, want := range map[float64]float64{2: 0.02204, 5: 0.001073} {
		if got := (Well{Barrier: b}).RiceRate(1); !within(got, want, 5e-4) {
			t.Errorf("RiceRate at %g kT %v, want %v", b, got, want)
		}
	}
	low, up := w.TransitionState(1)
	// (1/2π)·2e^{-b}/(1+erf√b).
	want := math.Exp(-2) / math.Pi / (1 + math.Erf(math.Sqrt2))
	if !within(low, want, 1e-13) || !within(up, want, 1e-13) {
		t.Errorf("TransitionState %v, %v, want %v", low, up, want)
	}
	if l, u := (Well{Barrier: 2, Offset: 0.1}).Barriers(); !within(l, 2.205, 1e-14) || !within(u, 1.805, 1e-14) {
		t.Errorf("Barriers %v %v, want (2±0.1)²/2", l, u)
	}
}

func TestBandRate(t *testing.T) {
	w := Well{Barrier: 2, Offset: 0.2}
	for _, temp := range []float64{0.7, 1} {
		if got, want := w.BandRate(temp, 0), w.RiceRate(temp); !within(got, want, 1e-12) {
			t.Errorf("BandRate without band %v, Rice %v", got, want)
		}
	}
	// Equal wells: e^{-b(1+h/a)²}/[π(1+erf√b)].
	want := math.Exp(-2.1*2.1/2) / math.Pi / (1 + math.Erf(math.Sqrt2))
	if got := (Well{Barrier: 2}).BandRate(1, 0.1); !within(got, want, 1e-12) {
		t.Errorf("BandRate %v, want %v", got, want)
	}
}

func TestSampledCrossing(t *testing.T) {
	// A harmonic oscillator of Q = 10 sampled every 0.05/ω₀ and 0.5/ω₀:
	// crossings per time 0.318045 and 0.315635, against Rice's 1/π; a
	// six-digit Monte-Carlo-checked evaluation of the same formula.
	for dt, want := range map[float64]float64{0.05: 0.318045, 0.5: 0.315635} {
		wd := math.Sqrt(1 - 0.0025)
		rho := math.Exp(-dt/20) * (math.Cos(wd*dt) + math.Sin(wd*dt)/(20*wd))
		if got := SampledCrossing(rho) / dt; !within(got, want, 2e-6) {
			t.Errorf("dt %g: %v, want %v", dt, got, want)
		}
	}
}
