package effect

import (
	"math"
	"math/rand/v2"
	"reflect"
	"strings"
	"testing"

	"brinkwell/controller/estimate"
	"brinkwell/controller/trace"
	"brinkwell/plant/motion"
)

// deliver cuts a trace into blocks and gives them to an observer, each event in
// the block in which it becomes known.
func deliver(t *testing.T, o *Observer, initial trace.Level, samples []trace.Sample, events []trace.Event, size int) {
	t.Helper()
	for start := 0; start < len(samples); start += size {
		end := min(start+size, len(samples))
		k := 0
		for k < len(events) && events[k].Tick < int64(end)-1 {
			k++
		}
		b := trace.Block{Start: int64(start), Initial: initial, Truth: true, Samples: samples[start:end], Events: events[:k]}
		if err := o.Take(&b); err != nil {
			t.Fatal(err)
		}
		if k > 0 {
			initial = events[k-1].Level
		}
		events = events[k:]
	}
}

// still is a trace that rests at a position.
func still(n int, x float64) []trace.Sample {
	samples := make([]trace.Sample, n)
	for i := range samples {
		samples[i] = trace.Sample{Measured: x, Position: x}
	}
	return samples
}

// Settled transitions and dwell times of a hand-made sequence. One period is
// 2π, 125.66 ticks of 0.05: the excursion of 100 ticks is not one, that of 200
// is.
func TestSettled(t *testing.T) {
	r := unit(4, 0)
	o := newObserver(t, r)
	events := []trace.Event{
		{Decided: 1000, Tick: 1000, Level: trace.Upper},
		{Decided: 1100, Tick: 1100, Level: trace.Lower}, // back within a period
		{Decided: 2000, Tick: 2000, Offset: 0.025, Level: trace.Upper},
		{Decided: 2200, Tick: 2200, Level: trace.Lower},
		{Decided: 4950, Tick: 4950, Level: trace.Upper}, // the end comes before a period is over
	}
	deliver(t, o, trace.Lower, still(5000, 1), events, 512)
	got := o.Result().Crossings
	if got.Count != 5 || got.SettledCount != 2 {
		t.Errorf("%d actuations, %d settled, want 5 and 2", got.Count, got.SettledCount)
	}
	row := append([]float64(nil), estimate.Totals(o.batches.Rows())...)
	o.transitions.finish(row)
	for _, tt := range []struct {
		name string
		sum  int
		want float64
	}{
		{"departures from the lower well", sumSettled + int(trace.Lower), 1},
		{"departures from the upper well", sumSettled + int(trace.Upper), 1},
		// Until 2000.5 ticks, and from 2200 to the end, which cuts it off.
		{"time in the lower well", sumDwell + int(trace.Lower), (2000.5 + 2800) / 20},
		{"time in the upper well", sumDwell + int(trace.Upper), 199.5 / 20},
		{"raw departures from the lower level", sumRaw + int(trace.Lower), 3},
		{"raw time on the upper level", sumRawDwell + int(trace.Upper), (100 + 199.5 + 50) / 20},
	} {
		if got := row[tt.sum]; !(math.Abs(got-tt.want) < 1e-9) {
			t.Errorf("%s: %v, want %v", tt.name, got, tt.want)
		}
	}
}

// Overshoot, its measured counterpart, energy, latency and power of actuations
// between ticks, cut into blocks of every size: an event may fall between two
// blocks.
func TestActuations(t *testing.T) {
	r := unit(4, 0.2)
	const n = 40000
	var events []trace.Event
	var over, seen, work float64
	for k := range int64(20) {
		e := trace.Event{Decided: 20000 + 512*k - 3, Tick: 20000 + 512*k - 1, Offset: 0.25 / r.Rate, Level: trace.Level(k+1) % 2}
		e.Position = 0.2 + 0.01*float64(k*k)
		e.Measured = e.Position + 0.3*float64(k)
		e.Work = 0.7 * float64(k)
		over += e.Level.Sign() * 0.01 * float64(k*k)
		seen += e.Level.Sign() * (0.01*float64(k*k) + 0.3*float64(k))
		work += e.Work
		events = append(events, e)
	}
	samples := still(n, 1)
	for _, size := range []int{1, 7, 512, 1024} {
		o := newObserver(t, r)
		deliver(t, o, trace.Lower, samples, events, size)
		latency := o.Result().Crossings.Latency.Mean
		c := make([]float64, crossingQuantities)
		o.crossingsOf(c, estimate.Totals(o.batches.Rows()))
		for _, tt := range []struct {
			name      string
			got, want float64
		}{
			{"overshoot", c[overshoot], over / 20},
			{"measured overshoot", c[seenOvershoot], seen / 20},
			{"energy", c[energy], work / 20},
			{"power", c[power], work / (n / r.Rate)},
			{"latency", latency, 2.25 / r.Rate},
		} {
			if !(math.Abs(tt.got-tt.want) < 1e-9) {
				t.Errorf("blocks of %d: %s = %v, want %v", size, tt.name, tt.got, tt.want)
			}
		}
	}
}

// The result does not depend on how the run was cut into blocks, but for the
// order of additions.
func TestBlocksDoNotMatter(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	r := unit(1, 0)
	samples := make([]trace.Sample, 30000)
	for i := range samples {
		x := rng.NormFloat64() * 1.5
		samples[i] = trace.Sample{Position: x, Velocity: rng.NormFloat64(), Measured: x + 0.1*rng.NormFloat64()}
	}
	var want Result
	for i, size := range []int{1024, 1, 333, 4096} {
		o := newObserver(t, r)
		deliver(t, o, trace.Lower, samples, nil, size)
		got := o.Result()
		if i == 0 {
			want = got
			continue
		}
		a, b := got.Realised, want.Realised
		for _, pair := range [][2]estimate.Value{
			{a.Barrier, b.Barrier},
			{a.WidthTemperature, b.WidthTemperature},
			{a.KineticTemperature, b.KineticTemperature},
			{got.Measured.KineticTemperature, want.Measured.KineticTemperature},
		} {
			if !(math.Abs(pair[0].Low-pair[1].Low) <= 1e-9*math.Abs(pair[1].Low)) {
				t.Errorf("blocks of %d: %v, want %v", size, pair[0], pair[1])
			}
		}
	}
}

// A run that knows nothing says so, with a reason everywhere and no number.
func TestNothingToEstimate(t *testing.T) {
	o := newObserver(t, unit(4, 0))
	deliver(t, o, trace.Lower, still(3000, -2.8), nil, 1024)
	r := o.Result()
	for i := range reflect.TypeFor[Landscape]().NumField() {
		v, ok := reflect.ValueOf(r.Realised).Field(i).Interface().(estimate.Value)
		if ok && !v.Known() && v.Reason == "" {
			t.Errorf("%s has neither a value nor a reason", reflect.TypeFor[Landscape]().Field(i).Name)
		}
	}
	if r.Realised.Barrier.Known() {
		t.Errorf("the barrier of a run that never moved is %v", r.Realised.Barrier)
	}
	if !strings.Contains(r.Crossings.MeanDwell.Reason, "0 departures") {
		t.Errorf("mean dwell: %q, want the number of departures", r.Crossings.MeanDwell.Reason)
	}
}

// One well alone: its parabola gives the barrier, and the rest says why not.
func TestOneWellAlone(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	r := unit(18, 0)
	samples := make([]trace.Sample, 200000)
	for i := range samples {
		x := -r.HalfDistance + rng.NormFloat64()
		samples[i] = trace.Sample{Position: x, Velocity: rng.NormFloat64(), Measured: x}
	}
	o := newObserver(t, r)
	deliver(t, o, trace.Lower, samples, nil, 1024)
	l := o.Result().Realised
	if !l.BarrierFromParabolas.Holds(18) || l.BarrierFromParabolas.Half() > 0.5 {
		t.Errorf("barrier from the parabola %v, want 18", l.BarrierFromParabolas)
	}
	for name, v := range map[string]estimate.Value{"barrier": l.Barrier, "distance": l.Distance, "tilt": l.Tilt} {
		if v.Known() {
			t.Errorf("%s is %v with one well visited", name, v)
		}
	}
}

func TestBadReference(t *testing.T) {
	good := unit(4, 0)
	for name, spoil := range map[string]func(*Reference){
		"rate":          func(r *Reference) { r.Rate = 0 },
		"quality":       func(r *Reference) { r.Oscillator.Quality = math.NaN() },
		"half distance": func(r *Reference) { r.HalfDistance = -1 },
		"noise":         func(r *Reference) { r.SensorNoise = math.Inf(1) },
	} {
		r := good
		spoil(&r)
		if _, err := New(r); err == nil || !strings.Contains(err.Error(), name) {
			t.Errorf("a bad %s gives %v, want an error that names it", name, err)
		}
	}
}

// An overdamped resonator's velocity relaxes within a tick: positions cannot
// show it, and the reason names the rate that would.
func TestVelocityOutOfSight(t *testing.T) {
	r := unit(2, 0)
	r.Oscillator = motion.Oscillator{Omega0: 1, Quality: 0.01, Stiffness: 1, KT: 1}
	o := newObserver(t, r)
	deliver(t, o, trace.Lower, still(30000, 1), nil, 1024)
	if reason := o.Result().Measured.KineticTemperature.Reason; !strings.Contains(reason, "a rate above 200 Hz") {
		t.Errorf("reason %q, want the rate that would do", reason)
	}
}
