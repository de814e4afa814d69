package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"syscall"
	"time"

	"github.com/pelletier/go-toml/v2"
	"github.com/schollz/progressbar/v3"
	"github.com/spf13/cobra"
	"golang.org/x/term"

	"brinkwell/controller/trace"
	"brinkwell/controller/trial"
	"brinkwell/io/settings"
	"brinkwell/plant/chain"
	"brinkwell/plant/motion"
)

// benchFlags are the flags of bench.
type benchFlags struct {
	set          []string
	json         string
	compare      string
	out          string
	record       string
	reread       string
	showSettings bool
	beyondRange  bool
}

func benchCommand(sh shell) *cobra.Command {
	var f benchFlags
	c := &cobra.Command{
		Use:   "bench [SETTINGS.toml]",
		Short: "close the loop on a simulated resonator and state the potential that it makes",
		Long: `bench closes the threshold-switched loop on a simulated, thermally driven
resonator, in virtual time, and states with 95 % intervals what double well it
made, beside what was asked. Without a settings file it runs the built-in demo.

Settings are layered, later wins: the built-in demo, the file, the environment
(BRINKWELL_SET_RESONATOR_QUALITY=50), --set resonator.quality=50. What each key
means stands in the file that --show-settings prints.

The exit code is 1 when the realised barrier or temperature is outside
[tolerance]. Ctrl-C ends the run with a report of what was measured so far.`,
		Example: `  brinkwell bench
  brinkwell bench --set loop.latency=3us --set resonator.quality=200
  brinkwell bench --show-settings > my-bench.toml
  brinkwell bench my-bench.toml --json report.json`,
		Args: cobra.MaximumNArgs(1),
		RunE: func(_ *cobra.Command, args []string) error {
			file := ""
			if len(args) == 1 {
				file = args[0]
			}
			return bench(sh, file, f)
		},
	}
	c.Flags().StringArrayVar(&f.set, "set", nil, "set one `KEY=VALUE`, such as loop.latency=3us; may be repeated")
	c.Flags().StringVar(&f.json, "json", "", "write the report as JSON to `FILE`; - for standard output, the text then goes to standard error")
	c.Flags().StringVar(&f.out, "out", "", "write report.json, settings.toml and the pictures as SVG and PNG into the folder `DIR`")
	c.Flags().StringVar(&f.record, "record", "off", "what to record into DIR/recording: `off, every=N or full`")
	c.Flags().StringVar(&f.reread, "reread", "", "make the report from the full recording in the folder `DIR`, with its own settings")
	c.Flags().StringVar(&f.compare, "compare", "", "run the same bench at several values of one key, `KEY=V1,V2,...`, and show the differences")
	c.Flags().BoolVar(&f.showSettings, "show-settings", false, "print the resolved settings as a file that can be used again, and run nothing")
	c.Flags().BoolVar(&f.beyondRange, "beyond-range", false, "allow a latency above 1/8 of a period, where the loop may oscillate by itself")
	return c
}

// bench runs one bench and prints its report.
func bench(sh shell, file string, f benchFlags) error {
	if err := f.check(file); err != nil {
		return &exitError{exitUsage, err}
	}
	src := settings.Sources{File: file, Environ: sh.environ, Set: f.set, BeyondRange: f.beyondRange}
	ctx, stop := interruptible()
	defer stop()
	switch {
	case f.showSettings:
		return showSettings(sh, src)
	case f.compare != "":
		return compareBench(ctx, sh, src, f)
	}
	progress, finish := terminalProgress(sh.err)
	var report trial.Report
	var s settings.Settings
	var failed, err error // failed: the report is there, but not all was written
	if f.reread != "" {
		report, s, err = reread(ctx, f, progress)
		finish()
		tellNotes(sh, report.Notes)
	} else {
		report, s, failed, err = runBench(ctx, sh, src, f, progress)
		finish()
	}
	if err != nil {
		return err
	}
	if report.Settings, err = settingsTable(s); err != nil {
		return &exitError{exitFailed, err}
	}
	err = show(sh, f, report, s)
	if failed != nil {
		return &exitError{exitWrite, failed}
	}
	return err
}

// check refuses flags that do not go together.
func (f benchFlags) check(file string) error {
	switch {
	case f.compare != "" && (f.out != "" || f.record != "off" || f.reread != ""):
		return errors.New("--compare shows several benches: it does not go with --out, --record or --reread")
	case f.reread != "" && (file != "" || len(f.set) > 0 || f.record != "off"):
		return errors.New("--reread takes the settings of the recording: it does not go with a settings file, --set or --record")
	}
	return nil
}

func showSettings(sh shell, src settings.Sources) error {
	s, err := settings.Load(src)
	if err != nil {
		return &exitError{exitUsage, err}
	}
	if err := s.WriteTOML(sh.out); err != nil {
		return &exitError{exitWrite, err}
	}
	return nil
}

// runBench simulates, and records where that was asked. failed is what went
// wrong with the recording; the report is there all the same.
func runBench(ctx context.Context, sh shell, src settings.Sources, f benchFlags, progress trial.Progress) (report trial.Report, s settings.Settings, failed, err error) {
	if s, err = settings.Load(src); err != nil {
		return report, s, nil, &exitError{exitUsage, err}
	}
	t, err := trial.New(trialConfig(s))
	if err != nil {
		return report, s, nil, &exitError{exitUsage, err}
	}
	if f.out != "" {
		if err := t.WithPictures(); err != nil {
			return report, s, nil, &exitError{exitUsage, err}
		}
	}
	w, err := startRecording(f, s)
	if err != nil {
		return report, s, nil, err
	}
	warnings := append(s.Warnings(), t.Warnings()...)
	tellNotes(sh, warnings)
	var sinks []trace.Sink
	if w != nil {
		sinks = append(sinks, w)
	}
	report, err = t.Run(ctx, progress, sinks...)
	if w != nil {
		failed = errors.Join(err, w.Close())
		if report.Ticks > 0 { // it is the recording that failed, not the run
			err = nil
		}
	}
	if err != nil {
		return report, s, nil, &exitError{exitFailed, err}
	}
	report.Notes = append(append([]string{}, s.Warnings()...), report.Notes...)
	tellNotes(sh, report.Notes[len(warnings):]) // what only the run showed
	return report, s, failed, nil
}

// tellNotes says what a person should know beside the report.
func tellNotes(sh shell, notes []string) {
	for _, n := range notes {
		fmt.Fprintf(sh.err, "note: %s\n", n)
	}
}

// interruptible returns a context that ends with the first Ctrl-C or SIGTERM;
// the second one ends the program at once.
func interruptible() (ctx context.Context, stop func()) {
	ctx, stop = signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	context.AfterFunc(ctx, stop)
	return ctx, stop
}

// show prints a report and writes it where that was asked.
func show(sh shell, f benchFlags, report trial.Report, s settings.Settings) error {
	text := sh.out
	if f.json == "-" {
		text = sh.err
	}
	printed := printReport(text, report, isTerminal(text))
	if f.json != "" {
		if err := writeJSON(sh.out, f.json, report); err != nil {
			return &exitError{exitWrite, err}
		}
	}
	if f.out != "" {
		if err := writeOut(f.out, report, s); err != nil {
			return &exitError{exitWrite, err}
		}
	}
	switch {
	case printed != nil:
		return &exitError{exitWrite, fmt.Errorf("printing the report: %w", printed)}
	case !report.Verdict.Passes && !report.Interrupted:
		return &exitError{code: exitTolerance}
	}
	return nil
}

// trialConfig hands the settings on as plain values.
func trialConfig(s settings.Settings) trial.Config {
	return trial.Config{
		Oscillator: motion.Oscillator{
			Omega0:    s.Omega0(),
			Quality:   float64(s.Resonator.Quality),
			Stiffness: float64(s.Resonator.Stiffness),
			KT:        s.KT(),
		},
		Temperature:  float64(s.Resonator.Temperature),
		HalfDistance: s.HalfDistance(),
		Threshold:    s.ThresholdM(),
		Rate:         float64(s.Loop.Rate),
		HalfBand:     float64(s.Loop.HalfBand),
		Latency:      float64(s.Loop.Latency),
		Jitter:       float64(s.Loop.Jitter),
		Shape:        chain.Shape(s.Loop.JitterShape),
		LostTicks:    float64(s.Loop.LostTicks),
		HoldOff:      float64(s.Loop.HoldOff),
		KeepMidpoint: s.Loop.KeepThreshold == "midpoint",
		Sensor: chain.SensorConfig{
			Density:      float64(s.Sensor.Noise),
			Bandwidth:    float64(s.Sensor.Bandwidth),
			HighPass:     float64(s.Sensor.HighPass),
			GainError:    float64(s.Sensor.GainError),
			Inverted:     s.Sensor.Sense < 0,
			Offset:       float64(s.Sensor.Offset),
			Drift:        float64(s.Sensor.Drift),
			HumAmplitude: float64(s.Sensor.HumAmplitude),
			HumFrequency: float64(s.Sensor.HumFrequency),
			Converter:    chain.Converter{Bits: int(s.Sensor.Bits), Range: float64(s.Sensor.Range)},
			Sticks:       float64(s.Sensor.Sticks),
		},
		Lag:      float64(s.Output.Lag),
		Duration: float64(s.Run.Duration),
		WarmUp:   float64(s.Run.WarmUp),
		Seed:     uint64(s.Run.Seed),
		Tolerance: trial.Tolerance{
			Barrier:     float64(s.Tolerance.Barrier),
			Temperature: float64(s.Tolerance.Temperature),
		},
	}
}

// settingsTable returns the resolved settings as their file has them.
func settingsTable(s settings.Settings) (map[string]any, error) {
	var file bytes.Buffer
	if err := s.WriteTOML(&file); err != nil {
		return nil, err
	}
	table := map[string]any{}
	return table, toml.Unmarshal(file.Bytes(), &table)
}

// terminalProgress returns a progress bar on a terminal, and nothing
// elsewhere. finish clears it.
func terminalProgress(w io.Writer) (progress trial.Progress, finish func()) {
	if !isTerminal(w) {
		return nil, func() {}
	}
	var bar *progressbar.ProgressBar
	var shown time.Time
	progress = func(done, total int64) {
		if bar == nil {
			bar = progressbar.NewOptions64(total,
				progressbar.OptionSetWriter(w),
				progressbar.OptionSetDescription("bench"),
				progressbar.OptionShowIts(),
				progressbar.OptionSetItsString("ticks"),
				progressbar.OptionSetWidth(30),
				progressbar.OptionClearOnFinish(),
			)
		}
		// A block takes some 20 µs: most of them are not worth a look.
		if now := time.Now(); now.Sub(shown) > 100*time.Millisecond || done == total {
			shown = now
			_ = bar.Set64(done) // a bar that cannot be drawn is no reason to stop
		}
	}
	return progress, func() {
		if bar != nil {
			_ = bar.Clear()
		}
	}
}

func isTerminal(w io.Writer) bool {
	f, ok := w.(*os.File)
	return ok && term.IsTerminal(int(f.Fd()))
}
