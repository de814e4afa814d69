package record

import (
	"errors"
	"fmt"
	"maps"
	"math"
	"slices"
	"strconv"
	"strings"
	"time"
	"unicode/utf8"

	"github.com/apache/arrow-go/v18/arrow"

	"brinkwell/controller/trace"
)

// A Header says what a recording is of. It stands in the metadata of both
// streams.
type Header struct {
	Rate     float64                // ticks, 1/s
	Truth    bool                   // whether true positions and velocities are known
	Every    int64                  // which ticks are kept: 1 all, N those that N divides; events are all kept
	Seed     uint64                 // of the simulation; 0 where there is none
	Settings string                 // TOML, as the caller wrote it
	Created  time.Time              // kept in UTC
	Volts    *[trace.Levels]float64 // commanded for each level, V; nil where not known
	Extra    map[string]string      // whatever else is to be kept

	// First and Initial are the Start and the Initial of the first block. A
	// Reader fills them in; Create ignores them.
	First   int64
	Initial trace.Level
}

// Keys of the metadata.
const (
	keyFormat   = "brinkwell_format"
	keyRate     = "rate_Hz"
	keyFirst    = "first_tick"
	keyInitial  = "initial_level"
	keyTruth    = "truth"
	keyEvery    = "keep_every"
	keySeed     = "seed"
	keySettings = "settings_toml"
	keyCreated  = "created"
	keyVolts    = "volts_V" // of all levels, lowest first
	keyExtra    = "extra_"  // prefix
)

func (h Header) validate() error {
	switch {
	case !(h.Rate > 0) || math.IsInf(h.Rate, 0):
		return fmt.Errorf("record: a rate of %g Hz, want a positive number", h.Rate)
	case h.Every < 1:
		return fmt.Errorf("record: every %d ticks, want 1 or more", h.Every)
	case h.Created.Year() < 0 || h.Created.Year() > 9999:
		return fmt.Errorf("record: created in the year %d, want 0 to 9999", h.Created.Year())
	}
	text := len(h.Settings)
	good := utf8.ValidString(h.Settings)
	for k, v := range h.Extra {
		text += len(k) + len(v)
		good = good && utf8.ValidString(k) && utf8.ValidString(v)
	}
	if !good {
		return errors.New("record: settings and extras must be UTF-8")
	}
	if text > maxText {
		return fmt.Errorf("record: settings and extras of %d bytes, at most %d", text, maxText)
	}
	return nil
}

func formatFloat(x float64) string { return strconv.FormatFloat(x, 'g', -1, 64) }

func (h Header) metadata() arrow.Metadata {
	var keys, values []string
	add := func(k, v string) { keys, values = append(keys, k), append(values, v) }
	add(keyFormat, strconv.Itoa(format))
	add(keyRate, formatFloat(h.Rate))
	add(keyFirst, strconv.FormatInt(h.First, 10))
	add(keyInitial, strconv.Itoa(int(h.Initial)))
	add(keyTruth, strconv.FormatBool(h.Truth))
	add(keyEvery, strconv.FormatInt(h.Every, 10))
	add(keySeed, strconv.FormatUint(h.Seed, 10))
	add(keyCreated, h.Created.UTC().Format(time.RFC3339Nano))
	add(keySettings, h.Settings)
	if h.Volts != nil {
		var volts []string
		for _, v := range h.Volts {
			volts = append(volts, formatFloat(v))
		}
		add(keyVolts, strings.Join(volts, " "))
	}
	for _, k := range slices.Sorted(maps.Keys(h.Extra)) {
		add(keyExtra+k, h.Extra[k])
	}
	return arrow.NewMetadata(keys, values)
}

// parseHeader reads the metadata of a stream.
func parseHeader(md arrow.Metadata) (h Header, err error) {
	if v, _ := md.GetValue(keyFormat); v != strconv.Itoa(format) {
		return h, fmt.Errorf("record: the recording's format is %q, this program reads %d", v, format)
	}
	get := func(key string, parse func(string) error) {
		v, ok := md.GetValue(key)
		if err != nil {
			return
		}
		if !ok {
			err = fmt.Errorf("record: the header lacks %s", key)
		} else if wrong := parse(v); wrong != nil {
			err = fmt.Errorf("record: the header's %s: %w", key, wrong)
		}
	}
	get(keyRate, func(v string) (e error) { h.Rate, e = strconv.ParseFloat(v, 64); return })
	get(keyFirst, func(v string) (e error) { h.First, e = strconv.ParseInt(v, 10, 64); return })
	get(keyTruth, func(v string) (e error) { h.Truth, e = strconv.ParseBool(v); return })
	get(keyEvery, func(v string) (e error) { h.Every, e = strconv.ParseInt(v, 10, 64); return })
	get(keySeed, func(v string) (e error) { h.Seed, e = strconv.ParseUint(v, 10, 64); return })
	get(keySettings, func(v string) error { h.Settings = v; return nil })
	get(keyCreated, func(v string) (e error) { h.Created, e = time.Parse(time.RFC3339Nano, v); return })
	get(keyInitial, func(v string) error {
		n, e := strconv.ParseUint(v, 10, 8)
		if h.Initial = trace.Level(n); e == nil && !valid(h.Initial) {
			e = fmt.Errorf("level %d, want below %d", n, trace.Levels)
		}
		return e
	})
	if _, ok := md.GetValue(keyVolts); ok {
		get(keyVolts, func(v string) (e error) { h.Volts, e = parseVolts(v); return })
	}
	if err != nil {
		return h, err
	}
	for i, k := range md.Keys() {
		if name, ok := strings.CutPrefix(k, keyExtra); ok {
			if h.Extra == nil {
				h.Extra = map[string]string{}
			}
			h.Extra[name] = md.Values()[i]
		}
	}
	return h, h.validate()
}

func parseVolts(text string) (*[trace.Levels]float64, error) {
	parts := strings.Fields(text)
	var volts [trace.Levels]float64
	if len(parts) != len(volts) {
		return nil, fmt.Errorf("%d values, want one for each of %d levels", len(parts), len(volts))
	}
	for i, p := range parts {
		var err error
		if volts[i], err = strconv.ParseFloat(p, 64); err != nil {
			return nil, err
		}
	}
	return &volts, nil
}
