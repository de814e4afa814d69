package settings

import (
	"errors"
	"math"
	"reflect"
	"slices"
	"strconv"
	"strings"

	"github.com/go-viper/mapstructure/v2"
	"github.com/spf13/viper"
)

// Sources are the layers of settings over the built-in demo; each wins over
// those before it. The zero value gives the demo itself.
type Sources struct {
	File    string   // path of a TOML file; "": none
	Text    string   // content of a file that is not on disk, called File in errors; "": File is read
	Environ []string // NAME=VALUE, as os.Environ gives; BRINKWELL_SET_LOOP_HALF_BAND sets loop.half_band
	Set     []string // key=value, the value unquoted

	// BeyondRange allows a latency at which the loop may self-oscillate.
	BeyondRange bool
}

// Load reads, merges and checks the layers. Its error holds every problem that
// it found, a line each, with the key, the value, the source, and what would be
// right. Keys without a value in any layer are resolved as their comments say.
func Load(src Sources) (Settings, error) {
	var data []byte
	if src.Text != "" {
		data = []byte(src.Text)
	} else if src.File != "" {
		var err error
		if data, err = readFile(src.File); err != nil {
			return Settings{}, err
		}
	}
	return load(data, src)
}

// load is Load with the file's content in data.
func load(data []byte, src Sources) (Settings, error) {
	file, wrong := fromFile(src.File, data)
	environment, more := fromEnvironment(src.Environ)
	wrong = append(wrong, more...)
	assigned, more := fromAssignments(src.Set)
	wrong = append(wrong, more...)
	layers := []layer{builtIn(), file, environment, assigned}
	wrong = append(wrong, resolveTwins(layers)...)

	v := viper.New()
	for _, k := range keys {
		// A key must have a default for viper to know it, be it nil.
		if e, found := layers[0][k.name]; found {
			v.SetDefault(k.name, e)
		} else {
			v.SetDefault(k.name, nil)
		}
	}
	for _, l := range layers[1:] {
		for name, e := range l {
			v.Set(name, e)
		}
	}
	var s Settings
	if err := v.UnmarshalExact(&s, viper.DecodeHook(decode), strictly); err != nil {
		wrong = append(wrong, problems(err)...)
	}
	if len(wrong) > 0 {
		return Settings{}, errors.Join(wrong...)
	}
	if !v.IsSet("run.warm_up") {
		s.Run.WarmUp = s.defaultWarmUp()
	}
	if err := s.check(src.BeyondRange); err != nil {
		return Settings{}, err
	}
	return s, nil
}

// strictly turns off what a decoder would forgive where the hook let a value pass.
func strictly(c *mapstructure.DecoderConfig) {
	c.WeaklyTypedInput = false
	c.MatchName = func(key, field string) bool { return key == field }
}

// problems returns the problems in a tree of errors, which the decoder keeps in
// the order of the fields; where it has none, the error itself.
func problems(err error) []error {
	var found []error
	var walk func(error)
	walk = func(err error) {
		switch e := err.(type) {
		case problem:
			found = append(found, e)
		case interface{ Unwrap() error }:
			walk(e.Unwrap())
		case interface{ Unwrap() []error }:
			for _, inner := range e.Unwrap() {
				walk(inner)
			}
		}
	}
	walk(err)
	if len(found) == 0 {
		return []error{problemf("%v", err)}
	}
	return found
}

// decode is the hook that turns an entry into the type of its field, checks
// its range, and leaves everything else alone.
func decode(_, to reflect.Type, data any) (any, error) {
	e, ok := data.(entry)
	if !ok || to.Kind() == reflect.Pointer {
		return data, nil // the decoder comes back with what a pointer points to
	}
	if to == reflect.TypeFor[Count]() {
		n, err := e.count()
		if err != nil {
			return nil, err
		}
		return n, e.inRange(float64(n))
	}
	if to == reflect.TypeFor[Choice]() {
		return e.choice()
	}
	read := e.bare
	if e.key.quantity() != nil {
		read = e.quantity
	}
	v, err := read()
	if err != nil {
		return nil, err
	}
	return reflect.ValueOf(v).Convert(to).Interface(), e.inRange(v)
}

// quantity reads a value with a unit, in SI.
func (e entry) quantity() (float64, error) {
	d := e.key.quantity()
	var stated string
	switch v := e.value.(type) {
	case text:
		if strings.ContainsAny(string(v), `"'`) {
			return 0, e.wrong("leave the quotes out, as in %s", d.example)
		}
		stated = string(v)
	case string:
		stated = v
	case int64, float64:
		return 0, e.wrong("%s needs a unit, such as %q", d.noun, d.example)
	default:
		return 0, e.wrong("%s is needed, such as %q", d.noun, d.example)
	}
	v, err := d.parse(stated)
	if err != nil {
		return 0, e.wrong("%v", err)
	}
	return v, nil
}

// bare reads a number without a unit.
func (e entry) bare() (float64, error) {
	switch v := e.value.(type) {
	case int64:
		return float64(v), nil
	case float64:
		if v == 0 {
			v = 0 // drops the sign of -0
		}
		return v, nil
	case text:
		number, err := parseDecimal(string(v), 1, 0)
		if err != nil {
			return 0, e.wrong("%v; a number%s is needed, without unit or quotes", err, e.key.inUnit())
		}
		return number, nil
	}
	return 0, e.wrong("a number%s is needed, without unit or quotes", e.key.inUnit())
}

// choice reads one of the key's words.
func (e entry) choice() (Choice, error) {
	var stated string
	switch v := e.value.(type) {
	case text:
		stated = string(v)
	case string:
		stated = v
	default:
		return "", e.wrong("a word is needed; allowed: %s", e.key.allowed())
	}
	if !slices.Contains(e.key.words, stated) {
		return "", e.wrong("unknown word; allowed: %s; the nearest is %q", e.key.allowed(), nearest(stated, e.key.words))
	}
	return Choice(stated), nil
}

// inUnit names the unit that a bare number counts in, if any.
func (k key) inUnit() string {
	if k.unit == "" {
		return ""
	}
	return " in " + k.unit
}

// count reads a whole number.
func (e entry) count() (Count, error) {
	switch v := e.value.(type) {
	case int64:
		return Count(v), nil
	case text:
		// ParseInt would read 010 as ten; a user may mean eight.
		if decimal.FindString(string(v)) != string(v) {
			break
		}
		if n, err := strconv.ParseInt(string(v), 10, 64); err == nil {
			return Count(n), nil
		}
	}
	return 0, e.wrong("a whole number of at most %d is needed, in plain digits", math.MaxInt64)
}

// inRange checks the value that e was read as.
func (e entry) inRange(v float64) error {
	if e.key.span.contains(v) {
		return nil
	}
	return e.wrong("out of range; allowed: %s", e.key.allowed())
}

// format writes a value of the key with its unit.
func (k key) format(v float64) string {
	if d := k.quantity(); d != nil {
		return d.format(v)
	}
	return strings.TrimSpace(bareText(v) + " " + k.unit)
}
