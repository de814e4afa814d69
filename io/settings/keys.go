package settings

import (
	"fmt"
	"math"
	"reflect"
	"slices"
	"strconv"
	"strings"
)

// A key is one row of the table that drives the built-in values, the range
// checks, the names that are known and the comments of WriteTOML. A new key is
// one row here and one field of Settings, whose type says the dimension.
type key struct {
	name  string // section.name
	value string // of the built-in demo, written as for Sources.Set; "": none
	unit  string // of a bare number, for messages; "": none
	span  span
	words []string               // that a Choice may be
	twin  string                 // the key that says the same thing in another way
	said  func(Settings) float64 // for a key with a twin: its value, whichever was stated
	doc   string                 // for the users, in lines
}

var keys = []key{
	{
		name: "resonator.frequency", value: "6.5 kHz", span: within(1e-3, 1e10),
		doc: "Resonance frequency at zero volts, omega0/(2·pi).",
	},
	{
		name: "resonator.stiffness", value: "0.08 N/m", span: within(1e-12, 1e9),
		doc: "Stiffness k at zero volts.",
	},
	{
		name: "resonator.quality", value: "35", span: within(1e-3, 1e6),
		doc: "Quality factor at zero volts: the damping rate is omega0/quality. Below 1/2 the resonator is overdamped.",
	},
	{
		name: "resonator.temperature", value: "293.15 K", span: within(1e-6, 1e5),
		doc: "Temperature T of the bath.",
	},
	{
		name: "wells.barrier", value: "4", unit: "kT", span: within(minBarrier, maxBarrier),
		twin: "wells.distance", said: Settings.BarrierKT,
		doc: "Barrier without tilt, k·x1²/2, in units of kB·T; x1 is half the distance from well to well.\n" +
			"State barrier or distance, not both.",
	},
	{
		name: "wells.distance", span: above(0),
		twin: "wells.barrier", said: Settings.DistanceM,
		doc: "Distance from well to well, 2·x1.",
	},
	{
		name: "wells.tilt", value: "0", unit: "kT", span: within(-math.MaxFloat64, math.MaxFloat64),
		twin: "loop.threshold", said: Settings.TiltKT,
		doc: "Energy of the upper well (the one at positive positions) less that of the lower, in units of kB·T;\n" +
			"positive: the upper well is higher. A tilt is made by moving the threshold to x0: tilt = 2·k·x1·x0.\n" +
			"State tilt or loop.threshold, not both.",
	},
	{
		name: "loop.rate", value: "1 MHz", span: upTo(1e12),
		doc: "Rate of the loop: once a tick a position is sampled and a level decided. At least 6 ticks,\n" +
			"better 30, in the resonator's period (below quality 1/2: in its relaxation time, 1/(quality·omega0)).",
	},
	{
		name: "loop.threshold", span: within(-math.MaxFloat64, math.MaxFloat64),
		twin: "wells.tilt", said: Settings.ThresholdM,
		doc: "Threshold x0 of the comparator, relative to the midpoint between the wells. |threshold| + half_band\n" +
			"must be below half the well distance.",
	},
	{
		name: "loop.half_band", value: "0.02 nm", span: atLeast(0),
		doc: "Half the width of the comparator's dead band. The level goes up strictly above threshold + half_band,\n" +
			"down strictly below threshold - half_band, and holds otherwise. Zero: none.",
	},
	{
		name: "loop.latency", value: "1 us", span: atLeast(0),
		doc: "A level acts this long after the instant at which its position was sampled (zero: at that instant).\n" +
			"It need not be a whole number of ticks. Above 1/8 of the resonator's period (below quality 1/2: of its\n" +
			"relaxation time) the loop may self-oscillate, and only --beyond-range allows it.",
	},
	{
		name: "loop.jitter", value: "0 s", span: atLeast(0),
		doc: "Standard deviation of the latency about its mean, actuation by actuation. Zero: none.",
	},
	{
		name: "loop.jitter_shape", value: "normal", words: []string{"uniform", "normal", "exponential"},
		doc: "Distribution of the jitter, cut so that the latency stays positive. uniform: within sqrt(3)·jitter on\n" +
			"either side; exponential: from latency - jitter on, with a tail to long ones. An actuation never\n" +
			"overtakes the one before it.",
	},
	{
		name: "loop.lost_ticks", value: "0", span: probability(),
		doc: "Probability that a tick has no sample and decides nothing. Zero: none.",
	},
	{
		name: "loop.hold_off", value: "0 s", span: atLeast(0),
		doc: "After a new level was decided no other is for this long, rounded up to whole ticks. Zero: none.",
	},
	{
		name: "loop.keep_threshold", value: "off", words: []string{"off", "midpoint"},
		doc: "midpoint: the threshold slowly follows the mean of the two mean positions, one for each level, so that\n" +
			"a drift of the sensor's zero does not tilt the wells; a wanted tilt is kept. off: it stays.",
	},
	{
		name: "sensor.noise", value: "30 fm/rtHz", span: atLeast(0),
		doc: "Noise of the measured position, a one-sided density: without a bandwidth the standard deviation\n" +
			"of each sample is noise·sqrt(rate/2), with one noise·sqrt(pi/2·bandwidth). Zero: none.",
	},
	{
		name: "sensor.bandwidth", value: "0 Hz", span: atLeast(0),
		doc: "Corner frequency of the sensor's low-pass, one pole, for motion and noise. Zero: none.",
	},
	{
		name: "sensor.high_pass", value: "0 Hz", span: atLeast(0),
		doc: "Corner frequency of an AC coupling, one pole, behind the low-pass: the reading's zero then wanders with\n" +
			"the time spent in either well. Zero: none, DC coupled.",
	},
	{
		name: "sensor.bits", value: "0", span: within(0, 48),
		doc: "Resolution of the converter, codes from -2^(bits-1) to 2^(bits-1)-1. Zero: continuous.",
	},
	{
		name: "sensor.range", value: "0 m", span: atLeast(0),
		doc: "The converter converts from -range to +range and clips what lies beyond. Zero: unlimited.",
	},
	{
		name: "sensor.offset", value: "0 m", span: within(-math.MaxFloat64, math.MaxFloat64),
		doc: "Constant error of the reading.",
	},
	{
		name: "sensor.drift", value: "0 m/s", span: within(-math.MaxFloat64, math.MaxFloat64),
		doc: "Speed at which the offset grows, from the start of the measured run on.",
	},
	{
		name: "sensor.gain_error", value: "0", span: span{-1, 10, true},
		doc: "Relative error of the reading's scale: it is 1 + gain_error times the position.",
	},
	{
		name: "sensor.sense", value: "1", span: within(-1, 1),
		doc: "Which way the reading goes: 1 with the position; -1 against it, as with a sensor wired the wrong way round.",
	},
	{
		name: "sensor.sticks", value: "0", span: probability(),
		doc: "Probability that a sample repeats the reading before it. Zero: none.",
	},
	{
		name: "sensor.hum_amplitude", value: "0 m", span: atLeast(0),
		doc: "Amplitude of mains hum in the position signal, ahead of the sensor's poles. Zero: none.",
	},
	{
		name: "sensor.hum_frequency", value: "50 Hz", span: above(0),
		doc: "Frequency of the hum.",
	},
	{
		name: "output.lag", value: "0 s", span: atLeast(0),
		doc: "Time constant, one pole, with which the force follows a new level, such as an amplifier's. Zero: at once.",
	},
	{
		name: "run.duration", value: "60 s", span: above(0),
		doc: "Length of the run, rounded to whole ticks; excludes warm_up.",
	},
	{
		name: "run.warm_up", span: atLeast(0),
		doc: "Time before the run that is not measured. Where it is not stated: 20·max(quality, 1/quality)/omega0.",
	},
	{
		name: "run.seed", value: "1", span: atLeast(0),
		doc: "Seed of all randomness: the same program, settings and seed give the same result.",
	},
	{
		name: "tolerance.barrier", value: "0.1", span: upTo(10),
		doc: "How far the realised barrier may be from the asked one, relative to it.",
	},
	{
		name: "tolerance.temperature", value: "0.05", span: upTo(10),
		doc: "How far the realised temperature may be from that of the bath, relative to it.",
	},
}

// Limits of the barrier, in kT, however it is stated.
const (
	minBarrier = 0.1
	maxBarrier = 100
)

// A span is a range of allowed values, in SI.
type span struct {
	low, high float64
	open      bool // low itself is not allowed
}

func within(low, high float64) span { return span{low, high, false} }
func atLeast(low float64) span      { return span{low, math.MaxFloat64, false} }
func above(low float64) span        { return span{low, math.MaxFloat64, true} }
func probability() span             { return span{0, math.Nextafter(1, 0), false} }
func upTo(high float64) span        { return span{0, high, true} }

func (s span) contains(v float64) bool {
	return v >= s.low && v <= s.high && (!s.open || v > s.low)
}

// allowed says what the key's values may be.
func (k key) allowed() string {
	if k.words == nil {
		return k.span.describe(k.format)
	}
	quoted := make([]string, len(k.words))
	for i, w := range k.words {
		quoted[i] = strconv.Quote(w)
	}
	return strings.Join(quoted, " or ")
}

// describe says what a span allows; format writes its ends.
func (s span) describe(format func(float64) string) string {
	if s == probability() {
		return "at least 0 and below 1"
	}
	text := "at least " + format(s.low)
	if s.open {
		text = "above " + format(s.low)
	}
	switch {
	case s.high == math.MaxFloat64 && s.low == -math.MaxFloat64:
		return "any finite value"
	case s.high == math.MaxFloat64:
		return text
	case s.open:
		return text + " and at most " + format(s.high)
	}
	return format(s.low) + " to " + format(s.high)
}

// lookup returns the row of a key, or nil.
func lookup(name string) *key {
	i := slices.IndexFunc(keys, func(k key) bool { return k.name == name })
	if i < 0 {
		return nil
	}
	return &keys[i]
}

// names returns the known keys.
func names() []string {
	list := make([]string, len(keys))
	for i, k := range keys {
		list[i] = k.name
	}
	return list
}

// sections returns the known sections, in the order of the table.
func sections() []string {
	var list []string
	for _, k := range keys {
		if section, _ := k.split(); !slices.Contains(list, section) {
			list = append(list, section)
		}
	}
	return list
}

// split returns the section of a key and its name there.
func (k key) split() (section, name string) {
	section, name, _ = strings.Cut(k.name, ".")
	return section, name
}

// field returns the field of s that holds the key. It panics if there is none:
// the table and the type Settings must agree.
func (k key) field(s *Settings) reflect.Value {
	v := reflect.ValueOf(s).Elem()
	for name := range strings.SplitSeq(k.name, ".") {
		i := slices.IndexFunc(reflect.VisibleFields(v.Type()), func(f reflect.StructField) bool {
			return f.Tag.Get("mapstructure") == name
		})
		if i < 0 {
			panic(fmt.Sprintf("settings: no field for the key %s", k.name))
		}
		v = v.Field(i)
	}
	return v
}

// quantity returns the dimension of the key's values, nil for bare numbers.
func (k key) quantity() *dimension {
	t := k.field(new(Settings)).Type()
	if t.Kind() == reflect.Pointer {
		t = t.Elem()
	}
	if q, ok := reflect.Zero(t).Interface().(interface{ dimension() *dimension }); ok {
		return q.dimension()
	}
	return nil
}
