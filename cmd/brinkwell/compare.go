package main

import (
	"context"
	"fmt"
	"io"
	"strings"

	"brinkwell/controller/estimate"
	"brinkwell/controller/trial"
	"brinkwell/io/settings"
)

// A comparison is what --compare writes as JSON.
type comparison struct {
	Key    string   `json:"key"`
	Values []string `json:"values"`
	trial.Comparison
}

// parseCompare reads KEY=V1,V2,… .
func parseCompare(text string) (key string, values []string, err error) {
	key, list, found := strings.Cut(text, "=")
	if values = strings.Split(list, ","); !found || len(values) < 2 {
		return "", nil, fmt.Errorf("--compare %q: want KEY=V1,V2,… with two values or more, such as loop.latency=1us,3us", text)
	}
	return key, values, nil
}

// compareBench runs the same bench at several values of one key.
func compareBench(ctx context.Context, sh shell, src settings.Sources, f benchFlags) error {
	key, values, err := parseCompare(f.compare)
	if err != nil {
		return &exitError{exitUsage, err}
	}
	all := make([]settings.Settings, len(values))
	configs := make([]trial.Config, len(values))
	for i, v := range values {
		one := src
		one.Set = append(append([]string{}, src.Set...), key+"="+v)
		if all[i], err = settings.Load(one); err != nil {
			return &exitError{exitUsage, err}
		}
		configs[i] = trialConfig(all[i])
	}
	progress, finish := terminalProgress(sh.err)
	c, err := trial.Compare(ctx, configs, progress)
	finish()
	if err != nil {
		return &exitError{exitFailed, err}
	}
	passes := true
	for i := range c.Reports {
		r := &c.Reports[i]
		if r.Settings, err = settingsTable(all[i]); err != nil {
			return &exitError{exitFailed, err}
		}
		r.Notes = append(all[i].Warnings(), r.Notes...)
		for _, n := range r.Notes {
			fmt.Fprintf(sh.err, "note: %s = %s: %s\n", key, values[i], n)
		}
		passes = passes && (r.Verdict.Passes || r.Interrupted)
	}
	text := sh.out
	if f.json == "-" {
		text = sh.err
	}
	printed := printComparison(text, key, values, c)
	if f.json != "" {
		if err := writeJSON(sh.out, f.json, comparison{key, values, c}); err != nil {
			return &exitError{exitWrite, err}
		}
	}
	switch {
	case printed != nil:
		return &exitError{exitWrite, fmt.Errorf("printing the comparison: %w", printed)}
	case !passes:
		return &exitError{code: exitTolerance}
	}
	return nil
}

// comparedRows are the quantities that a comparison shows.
var comparedRows = []struct {
	name, unit string
	of         func(r trial.Report) estimate.Value
	difference func(d trial.Difference) estimate.Value
}{
	{"barrier", "kT", func(r trial.Report) estimate.Value { return r.Realised.Barrier }, func(d trial.Difference) estimate.Value { return d.Barrier }},
	{"barrier, from the parabolas", "kT", func(r trial.Report) estimate.Value { return r.Realised.BarrierFromParabolas }, func(d trial.Difference) estimate.Value { return d.BarrierFromParabolas }},
	{"tilt", "kT", func(r trial.Report) estimate.Value { return r.Realised.Tilt }, func(d trial.Difference) estimate.Value { return d.Tilt }},
	{"distance", "m", func(r trial.Report) estimate.Value { return r.Realised.Distance }, func(d trial.Difference) estimate.Value { return d.Distance }},
	{"stiffness", "N/m", func(r trial.Report) estimate.Value { return r.Realised.Stiffness }, func(d trial.Difference) estimate.Value { return d.Stiffness }},
	{"temperature / bath, kinetic", "", func(r trial.Report) estimate.Value { return r.Realised.KineticTemperature }, func(d trial.Difference) estimate.Value { return d.KineticTemperature }},
	{"temperature / bath, from the power", "", func(r trial.Report) estimate.Value { return r.Checks.StationaryIdentity.FromPower }, func(d trial.Difference) estimate.Value { return d.TemperatureFromPower }},
	{"temperature / bath, width", "", func(r trial.Report) estimate.Value { return r.Realised.WidthTemperature }, func(d trial.Difference) estimate.Value { return d.WidthTemperature }},
	{"share above the threshold", "", func(r trial.Report) estimate.Value { return r.Realised.UpperShare }, func(d trial.Difference) estimate.Value { return d.UpperShare }},
	{"actuations, rate", "1/s", func(r trial.Report) estimate.Value { return r.Crossings.Rate }, func(d trial.Difference) estimate.Value { return d.Rate }},
	{"settled transitions, rate", "1/s", func(r trial.Report) estimate.Value { return r.Crossings.SettledRate }, func(d trial.Difference) estimate.Value { return d.SettledRate }},
	{"mean dwell", "s", func(r trial.Report) estimate.Value { return r.Crossings.MeanDwell }, func(d trial.Difference) estimate.Value { return d.MeanDwell }},
	{"chatter, share of actuations", "", func(r trial.Report) estimate.Value { return r.Crossings.ChatterFraction }, func(d trial.Difference) estimate.Value { return d.ChatterFraction }},
	{"overshoot", "m", func(r trial.Report) estimate.Value { return r.Crossings.Overshoot }, func(d trial.Difference) estimate.Value { return d.Overshoot }},
	{"energy per crossing", "kT", func(r trial.Report) estimate.Value { return r.Crossings.Energy }, func(d trial.Difference) estimate.Value { return d.Energy }},
	{"power of the loop", "kT/s", func(r trial.Report) estimate.Value { return r.Crossings.Power }, func(d trial.Difference) estimate.Value { return d.Power }},
}

// printComparison prints the benches side by side, and below that how each
// differs from the first.
func printComparison(w io.Writer, key string, values []string, c trial.Comparison) error {
	var b strings.Builder
	first := c.Reports[0]
	fmt.Fprintf(&b, "The same bench at several values of %s: %s measured at %s each, seed %d\n", key,
		quantity(first.Loop.MeasuredSeconds, "s"), quantity(first.Loop.Rate, "Hz"), first.Seed)
	for i, r := range c.Reports {
		if r.Interrupted {
			fmt.Fprintf(&b, "note: %s = %s was interrupted after %d ticks\n", key, values[i], r.Ticks)
		}
	}
	b.WriteString("Intervals are 95 %. Energies are in kT of the bath.\n\n")
	tw := table(&b)
	fmt.Fprintf(tw, "realised\t%s\n", strings.Join(values, "\t"))
	for _, row := range comparedRows {
		fmt.Fprintf(tw, "  %s", row.name)
		for _, r := range c.Reports {
			fmt.Fprintf(tw, "\t%s", interval(row.of(r), row.unit))
		}
		fmt.Fprintln(tw)
	}
	fmt.Fprint(tw, "  verdict")
	for _, r := range c.Reports {
		word := "within tolerance"
		if !r.Verdict.Passes {
			word = "NOT within tolerance"
		}
		fmt.Fprintf(tw, "\t%s", word)
	}
	fmt.Fprintln(tw)
	tw.Flush()

	fmt.Fprintf(&b, "\nDifferences from %s = %s", key, values[0])
	paired := true
	for _, d := range c.Differences {
		paired = paired && d.Paired
	}
	if paired {
		b.WriteString(", with the same random numbers: the intervals are those of the differences")
	}
	b.WriteString("; * marks those that exclude 0\n\n")
	tw = table(&b)
	fmt.Fprintf(tw, "difference\t%s\n", strings.Join(values[1:], "\t"))
	for _, row := range comparedRows {
		fmt.Fprintf(tw, "  %s", row.name)
		for _, d := range c.Differences {
			v := row.difference(d)
			mark := ""
			if v.Known() && !v.Holds(0) {
				mark = " *"
			}
			fmt.Fprintf(tw, "\t%s%s", interval(v, row.unit), mark)
		}
		fmt.Fprintln(tw)
	}
	tw.Flush()
	_, err := io.WriteString(w, b.String())
	return err
}
