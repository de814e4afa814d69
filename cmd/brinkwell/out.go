package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"time"

	"brinkwell/controller/trace"
	"brinkwell/controller/trial"
	"brinkwell/io/draw"
	"brinkwell/io/record"
	"brinkwell/io/settings"
)

// parseRecord reads off | every=N | full as how many ticks share one that is
// kept; 0 is none.
func parseRecord(text string) (every int64, err error) {
	switch number, found := strings.CutPrefix(text, "every="); {
	case text == "off":
		return 0, nil
	case text == "full":
		return 1, nil
	case found:
		if every, err = strconv.ParseInt(number, 10, 64); err == nil && every >= 1 {
			return every, nil
		}
	}
	return 0, fmt.Errorf("--record %q: want off, every=N with a whole number N, or full", text)
}

// startRecording begins a recording in a folder, where one was asked for.
func startRecording(f benchFlags, s settings.Settings) (*record.Writer, error) {
	every, err := parseRecord(f.record)
	switch {
	case err != nil:
		return nil, &exitError{exitUsage, err}
	case every == 0:
		return nil, nil
	case f.out == "":
		return nil, &exitError{exitUsage, errors.New("--record needs --out DIR, where the recording goes")}
	}
	var text bytes.Buffer
	if err := s.WriteTOML(&text); err != nil {
		return nil, &exitError{exitFailed, err}
	}
	w, err := record.Create(filepath.Join(f.out, "recording"), record.Header{
		Rate: float64(s.Loop.Rate), Truth: true, Every: every, Seed: uint64(s.Run.Seed), Settings: text.String(), Created: time.Now(),
	})
	if err != nil {
		return nil, &exitError{exitWrite, err}
	}
	return w, nil
}

// reread makes a report from a recording.
func reread(ctx context.Context, f benchFlags, progress trial.Progress) (report trial.Report, s settings.Settings, err error) {
	r, err := record.Open(f.reread)
	if err != nil {
		return report, s, &exitError{exitFailed, err}
	}
	defer r.Close()
	source := settings.Sources{File: filepath.Join(f.reread, "settings"), Text: r.Header().Settings, BeyondRange: true}
	if s, err = settings.Load(source); err != nil {
		return report, s, &exitError{exitFailed, fmt.Errorf("the recording's settings: %w", err)}
	}
	t, err := trial.New(trialConfig(s))
	if err != nil {
		return report, s, &exitError{exitFailed, err}
	}
	if f.out != "" {
		if err := t.WithPictures(); err != nil {
			return report, s, &exitError{exitFailed, err}
		}
	}
	var summary record.Summary
	report, err = t.Reread(ctx, progress, func(sinks ...trace.Sink) (int64, error) {
		summary, err = r.Replay(ctx, sinks...)
		return summary.Ticks, err
	})
	if err != nil {
		return report, s, &exitError{exitFailed, err}
	}
	if !summary.Complete {
		report.Notes = append(report.Notes, fmt.Sprintf("the recording is incomplete: %s; this is what its first %d ticks show", summary.Cut, summary.Ticks))
	}
	return report, s, nil
}

// writeOut writes a report with its pictures and settings into a folder.
func writeOut(dir string, report trial.Report, s settings.Settings) error {
	if err := os.MkdirAll(dir, 0o777); err != nil {
		return err
	}
	if err := writeJSON(nil, filepath.Join(dir, "report.json"), report); err != nil {
		return err
	}
	var text bytes.Buffer
	if err := s.WriteTOML(&text); err != nil {
		return err
	}
	if err := writeFile(filepath.Join(dir, "settings.toml"), text.Bytes()); err != nil {
		return err
	}
	_, err := draw.Save(dir, report, caption(report))
	return err
}

// caption says below the pictures what bench they are of.
func caption(r trial.Report) string {
	verdict := "within its tolerance"
	if !r.Verdict.Passes {
		verdict = "NOT within its tolerance"
	}
	return fmt.Sprintf("Asked: barrier %.4g kT, tilt %.4g kT, wells %s apart, %s, %s. Loop: %s, latency %s. Measured for %s, seed %d.\n"+
		"Realised: barrier %s, temperature %s of the bath's, power of the loop %s: %s.",
		r.Asked.Barrier, r.Asked.Tilt, quantity(r.Asked.Distance, "m"), quantity(r.Asked.Stiffness, "N/m"), quantity(r.Asked.Temperature, "K"),
		quantity(r.Loop.Rate, "Hz"), quantity(r.Loop.LatencyAsked, "s"), quantity(r.Loop.MeasuredSeconds, "s"), r.Seed,
		interval(r.Realised.Barrier, "kT"), interval(r.Realised.KineticTemperature, ""), interval(r.Crossings.Power, "kT/s"), verdict)
}
