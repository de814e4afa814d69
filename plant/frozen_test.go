package plant_test

import (
	"fmt"
	"math"
	"runtime"
	"strings"
	"testing"

	"brinkwell/controller/trace"
)

// A frozen sample of a run, in SI units.
type frozen struct {
	tick                         int64
	measured, position, velocity float64
}

// One run of config, frozen: a change here means that every seed's recordings
// and reports change. If that is meant (another generator, another order of
// draws), take the lines that the failure prints, and say so in the change's
// message; the other tests of this package must have passed before.
var (
	frozenSamples = []frozen{
		{0, 3.2659737598456747e-10, 3.27405897208574e-10, -1.1425751859404588e-05},
		{1, 3.2206565566017e-10, 3.1611600832779323e-10, -1.1043437234219065e-05},
		{4999, 8.209706800156252e-10, 8.289428179673295e-10, 9.74727827114235e-06},
		{9998, 2.5478078574181346e-10, 2.6248805142270034e-10, -1.4997024384522446e-05},
		{14997, -6.551652784075618e-10, -6.495668304621306e-10, -7.312641321494142e-06},
		{19996, -1.5904831966420794e-10, -1.726137293102892e-10, -3.1216057494601874e-06},
	}
	frozenEvents = []trace.Event{
		{Decided: 503, Tick: 505, Offset: 5e-07, Level: 0, Position: -1.2016292747390104e-12},
		{Decided: 504, Tick: 506, Offset: 5e-07, Level: 1, Position: -1.727090496904835e-12},
		{Decided: 4792, Tick: 4794, Offset: 5e-07, Level: 0, Position: -6.763861104036231e-14},
		{Decided: 11706, Tick: 11708, Offset: 5e-07, Level: 0, Position: -2.250171946685698e-11},
	}
)

func TestFrozenRun(t *testing.T) {
	if runtime.GOARCH != "amd64" {
		t.Skip("other processors fuse multiplications and additions, and round otherwise")
	}
	const ticks = 20_000
	p := newPlant(t, config())
	var samples []frozen
	closed(t, p, 0, ticks, func(tick int64, s *trace.Sample) {
		if tick%4999 == 0 || tick == 1 {
			samples = append(samples, frozen{tick, s.Measured, s.Position, s.Velocity})
		}
	})
	all := p.Acted(nil)
	if len(all) < 8 {
		t.Fatalf("only %d events", len(all))
	}
	events := []trace.Event{all[0], all[1], all[len(all)/2], all[len(all)-1]}

	same := len(samples) == len(frozenSamples) && len(events) == len(frozenEvents)
	// 1e-12 leaves room for the last digits of another version's functions.
	near := func(a, b float64) bool { return math.Abs(a-b) <= 1e-12*math.Abs(b) }
	for i := 0; same && i < len(samples); i++ {
		a, b := samples[i], frozenSamples[i]
		same = a.tick == b.tick && near(a.measured, b.measured) && near(a.position, b.position) && near(a.velocity, b.velocity)
	}
	for i := 0; same && i < len(events); i++ {
		a, b := events[i], frozenEvents[i]
		same = a.Decided == b.Decided && a.Tick == b.Tick && a.Level == b.Level && near(a.Offset, b.Offset) && near(a.Position, b.Position)
	}
	if same {
		return
	}
	var out strings.Builder
	for _, s := range samples {
		fmt.Fprintf(&out, "\t\t{%d, %v, %v, %v},\n", s.tick, s.measured, s.position, s.velocity)
	}
	out.WriteString("\n")
	for _, e := range events {
		fmt.Fprintf(&out, "\t\t{Decided: %d, Tick: %d, Offset: %v, Level: %d, Position: %v},\n", e.Decided, e.Tick, e.Offset, e.Level, e.Position)
	}
	t.Errorf("the run of seed 1 has changed; it is now\n%s", out.String())
}
