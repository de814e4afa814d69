package effect

import (
	"math"
	"math/rand/v2"
	"testing"

	"brinkwell/controller/trace"
)

func newAlbum(t *testing.T, r Reference) *Album {
	t.Helper()
	a, err := NewAlbum(r)
	if err != nil {
		t.Fatal(err)
	}
	return a
}

// White noise of standard deviation s sampled at a rate has the one-sided
// density 2·s²/rate, and the density's integral is the variance of whatever
// was sampled (Parseval): a sine of amplitude A adds A²/2.
func TestSpectrum(t *testing.T) {
	r := unit(4, 0)
	a := newAlbum(t, r)
	rng := rand.New(rand.NewPCG(1, 2))
	const s, amplitude, size = 0.7, 0.5, 1 << 20
	samples := make([]trace.Sample, size)
	for i := range samples {
		samples[i].Measured = s*rng.NormFloat64() + amplitude*math.Sin(2*math.Pi*3.21*float64(i)/r.Rate)
	}
	for start := 0; start < size; start += 1024 {
		if err := a.Take(&trace.Block{Start: int64(start), Truth: true, Samples: samples[start : start+1024]}); err != nil {
			t.Fatal(err)
		}
	}
	p := a.Pictures()
	df := p.Frequency[1] - p.Frequency[0]
	var floor, bins, all float64
	for i, f := range p.Frequency {
		all += p.Spectrum[i] * df
		if math.Abs(f-3.21) > 5*df {
			floor += p.Spectrum[i]
			bins++
		}
	}
	// A mean over bins × segments of exponentials; Hann's overlapping segments
	// are worth 1.9/2 of independent ones, its bins 2/3.
	n := bins * 2 / 3 * float64(p.Segments) / 1.1
	want := 2 * s * s / r.Rate
	if got := floor / bins; !(math.Abs(got-want) < 3.5*want/math.Sqrt(n)) {
		t.Errorf("white floor %v, want %v within %v", got, want, 3.5*want/math.Sqrt(n))
	}
	// Two bins at the ends, of thousands, are left out.
	if want := s*s + amplitude*amplitude/2; !(math.Abs(all-want) < 5e-3*want) {
		t.Errorf("the spectrum integrates to %v, want %v", all, want)
	}
}

// The stretch is of consecutive ticks about the first actuation that has half
// a stretch before it.
func TestStretch(t *testing.T) {
	r := unit(4, 0)
	a := newAlbum(t, r)
	samples := make([]trace.Sample, 20480)
	for i := range samples {
		samples[i].Position = float64(i)
	}
	events := map[int]trace.Event{
		1024:  {Tick: 1100, Level: trace.Upper}, // too early
		10240: {Tick: 10300, Level: trace.Lower},
		15360: {Tick: 15400, Level: trace.Upper},
	}
	for start := 0; start < len(samples); start += 1024 {
		b := trace.Block{Start: int64(start), Truth: true, Samples: samples[start : start+1024]}
		if e, found := events[start]; found {
			b.Events = []trace.Event{e}
		}
		if err := a.Take(&b); err != nil {
			t.Fatal(err)
		}
	}
	p := a.Pictures()
	n := int64(len(p.Stretch))
	if n != int64(stretchPeriods*2*math.Pi*r.Rate) {
		t.Fatalf("%d ticks, want %d periods", n, stretchPeriods)
	}
	for i, s := range p.Stretch {
		if s.Position != float64(p.Start+int64(i)) {
			t.Fatalf("sample %d is tick %v, want %d", i, s.Position, p.Start+int64(i))
		}
	}
	if middle := p.Start + n/2; !(math.Abs(float64(middle-10300)) <= 1) {
		t.Errorf("its middle is tick %d, want the actuation's, 10300", middle)
	}
}

// Every settled dwell and every overshoot is in a bin of the picture.
func TestDistributions(t *testing.T) {
	r := unit(4, 0)
	a := newAlbum(t, r)
	b := trace.Block{Truth: true, Samples: make([]trace.Sample, 1)}
	var want [trace.Levels]int64
	tick := int64(0)
	rng := rand.New(rand.NewPCG(3, 4))
	for i := range 1000 {
		tick += 200 + int64(1000*rng.ExpFloat64()) // longer than a period, 126 ticks
		level := trace.Level(i+1) % 2
		b.Events = append(b.Events, trace.Event{Tick: tick, Level: level, Position: level.Sign() * 0.3 * rng.NormFloat64()})
		if i > 0 { // the last actuation's settling is not seen
			want[1-trace.Level(i)%2]++
		}
	}
	if err := a.Take(&b); err != nil {
		t.Fatal(err)
	}
	p := a.Pictures()
	var dwells [trace.Levels]int64
	for level, bins := range p.Dwells {
		for i, bin := range bins {
			dwells[level] += bin.Count
			if i > 0 && bin.From != bins[i-1].To {
				t.Errorf("dwell bins %d and %d do not meet", i-1, i)
			}
		}
	}
	if dwells[0]+dwells[1] != want[0]+want[1] || dwells[0] < 499 || dwells[1] < 499 {
		t.Errorf("%v settled dwells in the picture, want %d together", dwells, want[0]+want[1])
	}
	over := p.Beyond
	for _, bin := range p.Overshoots {
		over += bin.Count
	}
	if over != 1000 {
		t.Errorf("%d overshoots in the picture, want 1000", over)
	}
}
