package trial

import (
	"context"
	"runtime"
	"sync"

	"brinkwell/controller/effect"
	"brinkwell/controller/estimate"
)

// A Comparison is several benches side by side.
type Comparison struct {
	Reports     []Report     `json:"reports"`
	Differences []Difference `json:"differences"` // of each report after the first, less the first
}

// A Difference is what one bench shows more than the first. Where the runs
// have the same ticks they share their random numbers, and the interval is that
// of the difference, not of two independent runs.
type Difference struct {
	Paired               bool           `json:"paired"`
	Barrier              estimate.Value `json:"barrier_kT"`
	BarrierLower         estimate.Value `json:"barrier_lower_kT"`
	BarrierUpper         estimate.Value `json:"barrier_upper_kT"`
	BarrierFromParabolas estimate.Value `json:"barrier_from_parabolas_kT"`
	Distance             estimate.Value `json:"distance_m"`
	Stiffness            estimate.Value `json:"stiffness_N_per_m"`
	Tilt                 estimate.Value `json:"tilt_kT"`
	KineticTemperature   estimate.Value `json:"kinetic_temperature_ratio"`
	TemperatureFromPower estimate.Value `json:"temperature_ratio_from_power"`
	WidthTemperature     estimate.Value `json:"width_temperature_ratio"`
	MeanAbsPosition      estimate.Value `json:"mean_abs_position_m"`
	DensityAtThreshold   estimate.Value `json:"density_at_threshold_per_m"`
	UpperShare           estimate.Value `json:"upper_share"`
	Rate                 estimate.Value `json:"rate_per_s"`
	SettledRate          estimate.Value `json:"settled_rate_per_s"`
	MeanDwell            estimate.Value `json:"mean_dwell_s"`
	Overshoot            estimate.Value `json:"overshoot_m"`
	Energy               estimate.Value `json:"energy_kT"`
	Power                estimate.Value `json:"power_kT_per_s"`
	ChatterFraction      estimate.Value `json:"chatter_fraction"`
}

// Compare runs benches, as many at once as there are processors, and compares
// each with the first. progress is told of all of them together. When ctx ends
// every bench reports what there is.
func Compare(ctx context.Context, configs []Config, progress Progress) (Comparison, error) {
	trials := make([]*Trial, len(configs))
	for i, c := range configs {
		var err error
		if trials[i], err = New(c); err != nil {
			return Comparison{}, err
		}
	}
	reports, errs := make([]Report, len(trials)), make([]error, len(trials))
	together := newTogether(trials, progress)
	slots := make(chan struct{}, runtime.GOMAXPROCS(0))
	var wg sync.WaitGroup
	for i, t := range trials {
		wg.Go(func() {
			slots <- struct{}{}
			defer func() { <-slots }()
			reports[i], errs[i] = t.Run(ctx, together.of(i))
		})
	}
	wg.Wait()
	for _, err := range errs {
		if err != nil {
			return Comparison{}, err
		}
	}
	c := Comparison{Reports: reports, Differences: []Difference{}}
	for _, t := range trials[1:] {
		c.Differences = append(c.Differences, difference(effect.Differences(trials[0].observer, t.observer)))
	}
	return c, nil
}

func difference(d effect.Difference) Difference {
	l, c := d.Realised, d.Crossings
	return Difference{
		Paired: d.Paired, Barrier: l.Barrier, BarrierLower: l.Barriers[0], BarrierUpper: l.Barriers[1],
		BarrierFromParabolas: l.BarrierFromParabolas, Distance: l.Distance, Stiffness: l.Stiffness, Tilt: l.Tilt,
		KineticTemperature: l.KineticTemperature, TemperatureFromPower: d.Identity.FromPower, WidthTemperature: l.WidthTemperature,
		MeanAbsPosition: l.MeanAbsPosition, DensityAtThreshold: l.DensityAtThreshold, UpperShare: l.UpperShare,
		Rate: c.Rate, SettledRate: c.SettledRate, MeanDwell: c.MeanDwell, Overshoot: c.Overshoot,
		Energy: c.Energy, Power: c.Power, ChatterFraction: c.ChatterFraction,
	}
}

// together adds up the progress of benches that run at once.
type together struct {
	mu    sync.Mutex
	done  []int64
	total int64
	tell  Progress
}

func newTogether(trials []*Trial, tell Progress) *together {
	g := &together{done: make([]int64, len(trials)), tell: tell}
	for _, t := range trials {
		g.total += t.config.warmUpTicks() + t.config.Ticks()
	}
	return g
}

func (g *together) of(i int) Progress {
	if g.tell == nil {
		return nil
	}
	return func(done, _ int64) {
		g.mu.Lock()
		defer g.mu.Unlock()
		g.done[i] = done
		sum := int64(0)
		for _, n := range g.done {
			sum += n
		}
		g.tell(sum, g.total)
	}
}
