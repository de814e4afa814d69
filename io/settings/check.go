package settings

import (
	"errors"
	"fmt"
	"math"
	"strconv"
)

const (
	minTicks     = 6      // in the characteristic time; fewer do not resolve the motion
	advisedTicks = 30     // in the characteristic time
	maxLatency   = 1. / 8 // of the characteristic time
	maxRun       = 1e15   // ticks; below 2^53, so that a float64 counts them exactly
)

// check finds settings that contradict each other. It expects every value to be
// in its own range.
func (s Settings) check(beyondRange bool) error {
	wrong := []error{s.checkWells(), s.checkRate(), s.checkRun(), s.checkSensor()}
	if !beyondRange {
		wrong = append(wrong, s.checkLatency())
	}
	return errors.Join(wrong...)
}

func (s Settings) checkWells() error {
	x1 := s.HalfDistance()
	if b := s.BarrierKT(); !within(minBarrier, maxBarrier).contains(b) {
		return problemf("%s: with %s and %s this is a barrier of %.4g kT; allowed: %g to %g kT, a distance of %s to %s",
			s.show("wells.distance"), s.show("resonator.stiffness"), s.show("resonator.temperature"), b,
			float64(minBarrier), float64(maxBarrier), s.distanceFor(minBarrier), s.distanceFor(maxBarrier))
	}
	x0, band := math.Abs(s.ThresholdM()), float64(s.Loop.HalfBand)
	if x0+band < x1 {
		return nil
	}
	name := "loop.threshold"
	if s.Wells.Tilt != nil {
		name = "wells.tilt"
	}
	return problemf("%s with %s: the loop would switch up to %s from the midpoint, and the wells are at %s; "+
		"allowed: |threshold| + half_band below half the well distance (for the tilt alone: |tilt| below 4·barrier, %.4g kT)",
		s.show(name), s.show("loop.half_band"), brief(&length, x0+band), brief(&length, x1), 4*s.BarrierKT())
}

// distanceFor writes the distance of wells with the given barrier, in kT.
func (s Settings) distanceFor(barrier float64) string {
	return brief(&length, 2*math.Sqrt(2*barrier*s.KT()/float64(s.Resonator.Stiffness)))
}

func (s Settings) checkRate() error {
	per, name := s.characteristic()
	if float64(s.Loop.Rate) >= minTicks*per {
		return nil
	}
	return problemf("%s: only %.3g ticks in the resonator's %s, %s; at least %d are needed, a rate of %s or more",
		s.show("loop.rate"), float64(s.Loop.Rate)/per, name, brief(&duration, 1/per), minTicks, atLeastRate(minTicks*per))
}

func (s Settings) checkSensor() error {
	var wrong []error
	if s.Sensor.Sense == 0 {
		wrong = append(wrong, problemf("%s: allowed: 1 or -1", s.show("sensor.sense")))
	}
	if s.Sensor.Bits > 0 && s.Sensor.Range == 0 {
		wrong = append(wrong, problemf("%s needs a sensor.range: the converter's step is 2·range/2^bits", s.show("sensor.bits")))
	}
	if low, high := s.Sensor.Bandwidth, s.Sensor.HighPass; low > 0 && high >= low {
		wrong = append(wrong, problemf("%s with %s: nothing passes; the high-pass must lie below the bandwidth",
			s.show("sensor.high_pass"), s.show("sensor.bandwidth")))
	}
	return errors.Join(wrong...)
}

// lateness is the latency with the lags of sensor and output.
func (s Settings) lateness() Second {
	late := s.Loop.Latency + s.Output.Lag
	if b := s.Sensor.Bandwidth; b > 0 {
		late += Second(1 / (2 * math.Pi * float64(b)))
	}
	return late
}

func (s Settings) checkLatency() error {
	if !s.late() {
		return nil
	}
	per, name := s.characteristic()
	return problemf("%s: above 1/8 of the resonator's %s, %s, where the loop may self-oscillate; --beyond-range allows it",
		s.showLateness(), name, brief(&duration, maxLatency/per))
}

// late reports whether the latency is beyond the range of the small-latency theory.
func (s Settings) late() bool {
	per, _ := s.characteristic()
	return !(float64(s.lateness())*per <= maxLatency)
}

func (s Settings) checkRun() error {
	var wrong []error
	if n := math.Round(s.ticks(s.Run.Duration)); !(n >= 1 && n <= maxRun) {
		wrong = append(wrong, problemf("%s: %.4g ticks at %s; allowed: 1 to %g ticks",
			s.show("run.duration"), s.ticks(s.Run.Duration), s.show("loop.rate"), float64(maxRun)))
	}
	if n := s.ticks(s.Run.WarmUp); !(n <= maxRun) {
		wrong = append(wrong, problemf("%s: %.4g ticks at %s; allowed: at most %g ticks",
			s.show("run.warm_up"), n, s.show("loop.rate"), float64(maxRun)))
	}
	return errors.Join(wrong...)
}

// Warnings returns what is allowed but doubtful, a sentence each.
func (s Settings) Warnings() []string {
	var list []string
	per, name := s.characteristic()
	if !(float64(s.Loop.Rate) >= advisedTicks*per) {
		list = append(list, fmt.Sprintf("%s: only %.3g ticks in the resonator's %s, %s; %d are advised, a rate of %s or more",
			s.show("loop.rate"), float64(s.Loop.Rate)/per, name, brief(&duration, 1/per), advisedTicks,
			atLeastRate(advisedTicks*per)))
	}
	if s.late() {
		list = append(list, fmt.Sprintf("%s: above 1/8 of the resonator's %s, %s: the loop may self-oscillate",
			s.showLateness(), name, brief(&duration, maxLatency/per)))
	}
	return list
}

// showLateness writes the latency, and with it the lags where there are any.
func (s Settings) showLateness() string {
	text := s.show("loop.latency")
	if late := s.lateness(); late != s.Loop.Latency {
		text += ", " + brief(&duration, float64(late)) + " with the lags of sensor and output"
	}
	return text
}

// show writes a key with its value in s, as in a file.
func (s Settings) show(name string) string {
	return name + " = " + literal(lookup(name).field(&s))
}

// brief writes a quantity in four significant digits.
func brief(d *dimension, v float64) string { return d.format(fourDigits(v)) }

// fourDigits rounds v to four significant digits.
func fourDigits(v float64) float64 {
	r, _ := strconv.ParseFloat(strconv.FormatFloat(v, 'e', 3, 64), 64) // cannot fail: FormatFloat wrote it
	return r
}

// atLeastRate writes a rate of four digits that is not below v, in Hz.
func atLeastRate(v float64) string {
	r := fourDigits(v)
	if r < v {
		r = fourDigits(v * 1.001) // rounding takes at most half of what this adds
	}
	return frequency.format(r)
}
