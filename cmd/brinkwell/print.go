package main

import (
	"bytes"
	"fmt"
	"io"
	"math"
	"os"
	"text/tabwriter"

	"brinkwell/controller/estimate"
	"brinkwell/controller/trial"
	"brinkwell/io/draw"
)

// printReport prints a report for a person.
func printReport(w io.Writer, r trial.Report, terminal bool) error {
	var b bytes.Buffer
	if r.Interrupted {
		fmt.Fprintf(&b, "note: interrupted; this is what was measured until then\n\n")
	}
	fmt.Fprintf(&b, "The double well that this loop makes: %s measured at %s, %d ticks, seed %d\n",
		quantity(r.Loop.MeasuredSeconds, "s"), quantity(r.Loop.Rate, "Hz"), r.Ticks, r.Seed)
	if r.Ticks == 0 {
		fmt.Fprintf(&b, "Nothing was measured.\n")
		_, err := w.Write(b.Bytes())
		return err
	}
	fmt.Fprintf(&b, "Intervals are 95 %%. Energies are in kT of the bath, %s.\n\n", quantity(r.Asked.Temperature, "K"))
	printLandscape(&b, r)
	printCrossings(&b, r)
	printChecks(&b, r)
	b.WriteString(landscapePlot(r, terminal && os.Getenv("NO_COLOR") == ""))
	printVerdict(&b, r)
	_, err := w.Write(b.Bytes())
	return err
}

// table starts a table with right-hand padding between its columns.
func table(w io.Writer) *tabwriter.Writer { return tabwriter.NewWriter(w, 0, 0, 3, ' ', 0) }

func printLandscape(w io.Writer, r trial.Report) {
	a, t, s := r.Asked, r.Realised, r.Measured.Landscape
	tw := table(w)
	fmt.Fprintf(tw, "potential\tasked\trealised\tas the sensor sees it\n")
	row := func(name string, asked float64, unit string, realised, seen estimate.Value) {
		fmt.Fprintf(tw, "  %s\t%s\t%s\t%s\n", name, quantity(asked, unit), interval(realised, unit), interval(seen, unit))
	}
	row("barrier", a.Barrier, "kT", t.Barrier, s.Barrier)
	row("  from the parabolas", a.Barrier, "kT", t.BarrierFromParabolas, s.BarrierFromParabolas)
	row("  out of the lower well", a.BarrierLower, "kT", t.BarrierLower, s.BarrierLower)
	row("  out of the upper well", a.BarrierUpper, "kT", t.BarrierUpper, s.BarrierUpper)
	row("tilt", a.Tilt, "kT", t.Tilt, s.Tilt)
	row("distance", a.Distance, "m", t.Distance, s.Distance)
	row("stiffness, lower well", a.Stiffness, "N/m", t.StiffnessLower, s.StiffnessLower)
	row("stiffness, upper well", a.Stiffness, "N/m", t.StiffnessUpper, s.StiffnessUpper)
	row("temperature / bath, kinetic", 1, "", t.KineticTemperature, s.KineticTemperature)
	row("temperature / bath, width", 1, "", t.WidthTemperature, s.WidthTemperature)
	row("mean |x - threshold|", a.MeanAbsPosition, "m", t.MeanAbsPosition, s.MeanAbsPosition)
	row("density at the threshold", a.DensityAtThreshold, "1/m", t.DensityAtThreshold, s.DensityAtThreshold)
	row("share above the threshold", a.UpperShare, "", t.UpperShare, s.UpperShare)
	tw.Flush()
	fmt.Fprintln(w)
	reasons(w, []named{
		{"barrier", t.Barrier},
		{"tilt", t.Tilt},
		{"distance", t.Distance},
		{"kinetic temperature", t.KineticTemperature},
		{"kinetic temperature as the sensor sees it", s.KineticTemperature},
		{"width temperature", t.WidthTemperature},
	})
}

func printCrossings(w io.Writer, r trial.Report) {
	c, p := r.Crossings, r.Predicted
	tw := table(w)
	fmt.Fprintf(tw, "crossings\tmeasured\texpected\n")
	row := func(name string, v estimate.Value, expected float64, inside bool, unit string) {
		fmt.Fprintf(tw, "  %s\t%s\t%s\n", name, interval(v, unit), expectation(expected, inside, unit))
	}
	inside, rates := p.InsideRange, p.InsideRange && p.RatesInsideRange
	fmt.Fprintf(tw, "  actuations of a new level\t%d\t%s\n", c.Count, expectation(math.Round(p.Count), inside, ""))
	row("  rate", c.Rate, p.Rate, inside, "1/s")
	row("settled transitions, rate", c.SettledRate, p.SettledRate, rates, "1/s")
	row("mean dwell, lower well", c.MeanDwellLower, p.MeanDwellLower, rates, "s")
	row("mean dwell, upper well", c.MeanDwellUpper, p.MeanDwellUpper, rates, "s")
	row("chatter, share of actuations", c.ChatterFraction, p.ChatterFraction, rates, "")
	row("overshoot", c.Overshoot, p.Overshoot, inside, "m")
	row("energy per crossing", c.Energy, p.Energy, inside, "kT")
	row("power of the loop", c.Power, p.Power, inside, "kT/s")
	row("temperature / bath, kinetic", r.Realised.KineticTemperature, p.KineticTemperature, inside, "")
	tw.Flush()
	for _, why := range p.OutsideBecause {
		fmt.Fprintf(w, "  no expectation: %s\n", why)
	}
	if inside {
		for _, why := range p.RatesOutside {
			fmt.Fprintf(w, "  no expectation of settled transitions: %s\n", why)
		}
	}
	fmt.Fprintln(w)
	reasons(w, []named{
		{"settled rate", c.SettledRate},
		{"dwell in the lower well", c.MeanDwellLower},
		{"dwell in the upper well", c.MeanDwellUpper},
		{"overshoot", c.Overshoot},
		{"power of the loop", c.Power},
	})
}

func printChecks(w io.Writer, r trial.Report) {
	i := r.Checks.StationaryIdentity
	fmt.Fprintf(w, "check: T_kin/T = 1 + Q·P/(omega0·kT) in a stationary state: ")
	if !i.Difference.Known() {
		fmt.Fprintf(w, "cannot be checked: %s\n", i.Difference.Reason)
	} else {
		if i.Kinetic.Known() && i.FromPower.Known() {
			fmt.Fprintf(w, "%s and %s, ", interval(i.Kinetic, ""), interval(i.FromPower, ""))
		}
		verdict := "holds"
		if !i.Holds {
			verdict = "does NOT hold: do not trust this run"
		}
		fmt.Fprintf(w, "apart by %s (%.1f standard errors): %s\n", interval(i.Difference, ""), math.Abs(i.Sigmas), verdict)
	}
	realised := "none realised, no actuation"
	if r.Loop.LatencyMean != nil {
		realised = quantity(*r.Loop.LatencyMean, "s") + " realised on average"
		if max := *r.Loop.LatencyMax; max > *r.Loop.LatencyMean*1.001 {
			realised += fmt.Sprintf(" (half below %s, 99 %% below %s, longest %s)",
				quantity(*r.Loop.LatencyMedian, "s"), quantity(*r.Loop.LatencyP99, "s"), quantity(max, "s"))
		}
	}
	fmt.Fprintf(w, "loop: latency %s asked, %s; %.3g ticks a second of wall time\n",
		quantity(r.Loop.LatencyAsked, "s"), realised, r.Loop.TicksPerWallSecond)
	if t := r.Loop.ThresholdTravel; t != nil {
		fmt.Fprintf(w, "threshold: kept, now %s from what was asked, between %s and %s on the way; frozen for %.2g %% of the time",
			quantity(t.Present, "m"), quantity(t.Lowest, "m"), quantity(t.Highest, "m"), 100*t.Frozen)
		if t.Bounded {
			fmt.Fprint(w, "; its bound was reached")
		}
		fmt.Fprintln(w)
	}
	fmt.Fprintln(w)
}

func printVerdict(w io.Writer, r trial.Report) {
	v := r.Verdict
	fmt.Fprintf(w, "\nbarrier, from the %s: %s\n", v.Barrier.From, v.Barrier)
	fmt.Fprintf(w, "temperature, from the %s: %s\n", v.Temperature.From, v.Temperature)
	switch {
	case v.Passes:
		fmt.Fprintln(w, "verdict: the potential is within its tolerance")
	case v.Barrier.Judged && v.Temperature.Judged:
		fmt.Fprintln(w, "verdict: the potential is NOT within its tolerance")
	default:
		fmt.Fprintln(w, "verdict: the potential is NOT shown to be within its tolerance")
	}
}

// A named estimate, for saying why there is none.
type named struct {
	name  string
	value estimate.Value
}

// reasons says why estimates are missing, each reason once.
func reasons(w io.Writer, values []named) {
	said := map[string]bool{}
	for _, n := range values {
		if !n.value.Known() && !said[n.value.Reason] {
			said[n.value.Reason] = true
			fmt.Fprintf(w, "  no estimate of the %s: %s\n", n.name, n.value.Reason)
		}
	}
	if len(said) > 0 {
		fmt.Fprintln(w)
	}
}

// landscapePlot draws asked and realised potential with characters.
func landscapePlot(r trial.Report, color bool) string {
	points := r.Realised.Curve
	if len(points) < 2 {
		return ""
	}
	asked := draw.Curve{Name: "asked", Energy: make([]float64, len(points))}
	realised := draw.Curve{Name: "realised", Energy: make([]float64, len(points))}
	for i, p := range points {
		asked.Energy[i], realised.Energy[i] = p.Asked, math.NaN()
		if p.Energy.Known() {
			realised.Energy[i] = p.Energy.Value
		}
	}
	return draw.TerminalPlot{
		Left:    points[0].Position,
		Right:   points[len(points)-1].Position,
		Ceiling: math.Max(r.Asked.BarrierLower, r.Asked.BarrierUpper) * 1.5,
		Width:   64,
		Height:  14,
		Color:   color,
	}.Landscape(asked, realised)
}
