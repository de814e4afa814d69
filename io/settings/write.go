package settings

import (
	"fmt"
	"io"
	"math"
	"reflect"
	"strconv"
	"strings"
)

const header = `# Settings of brinkwell. A number with a unit is in quotes: "6.5 kHz", "4.99e-06 s"; prefixes are
# y z a f p n u m k M G T. Other numbers are bare. What a file does not state is as in the built-in demo;
# the environment (BRINKWELL_SET_RESONATOR_QUALITY=50) wins over the file, and --set over both.
`

// WriteTOML writes s as a file, each key below its meaning. Loading the file
// gives s again, to the last bit (with Sources.BeyondRange where s needed it).
// Of two keys that say the same thing, the one that was stated is written, and
// the other as a comment.
func (s Settings) WriteTOML(w io.Writer) error {
	var b strings.Builder
	b.WriteString(header)
	section := ""
	for _, k := range keys {
		in, name := k.split()
		if in != section {
			section = in
			fmt.Fprintf(&b, "\n[%s]\n", section)
		}
		for line := range strings.Lines(k.doc) {
			b.WriteString("# " + strings.TrimSuffix(line, "\n") + "\n")
		}
		fmt.Fprintf(&b, "# Allowed: %s.\n", k.allowed())
		field := k.field(&s)
		if field.Kind() == reflect.Pointer && field.IsNil() {
			fmt.Fprintf(&b, "# Here %s is the same as %s = %s\n", s.show(k.twin), name, k.brief(k.said(s)))
			continue
		}
		fmt.Fprintf(&b, "%s = %s\n", name, literal(field))
	}
	if _, err := io.WriteString(w, b.String()); err != nil {
		return fmt.Errorf("settings: %w", err)
	}
	return nil
}

// brief writes a value of the key as in a file, in four significant digits.
func (k key) brief(v float64) string {
	if d := k.quantity(); d != nil {
		return strconv.Quote(brief(d, v))
	}
	return bareText(fourDigits(v))
}

// literal writes the value of a field as in a TOML file.
func literal(v reflect.Value) string {
	v = reflect.Indirect(v)
	if q, ok := v.Interface().(interface{ dimension() *dimension }); ok {
		return strconv.Quote(q.dimension().format(v.Float()))
	}
	if v.Kind() == reflect.String {
		return strconv.Quote(v.String())
	}
	if v.CanInt() {
		return strconv.FormatInt(v.Int(), 10)
	}
	return bareText(v.Float())
}

// bareText writes a number without a unit: in plain digits where they are few,
// and never so that TOML would take a large one for an integer out of its range.
func bareText(v float64) string {
	if a := math.Abs(v); v == 0 || (a >= 1e-4 && a < 1e15) {
		return strconv.FormatFloat(v, 'f', -1, 64)
	}
	return strconv.FormatFloat(v, 'e', -1, 64)
}
