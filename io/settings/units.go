package settings

import (
	"errors"
	"fmt"
	"math"
	"math/big"
	"regexp"
	"slices"
	"strconv"
	"strings"
)

// A Quantity is a number with a dimension, stored in SI: one of the types of
// dimensions.go.
type Quantity interface {
	~float64
	dimension() *dimension
}

// ParseQuantity reads a decimal number and its unit, such as "6.5 kHz",
// "4.99e-06 s" or "30 fm/rtHz". Space between them is optional; prefixes are
// y z a f p n u µ m k M G T, and letter case counts. The prefix is applied to
// the decimal text, so that the result is rounded once: "30 fm/rtHz" is the Go
// literal 30e-15. The error says what is wrong and what would be right.
func ParseQuantity[Q Quantity](text string) (Q, error) {
	var q Q
	v, err := q.dimension().parse(text)
	return Q(v), err
}

// FormatQuantity writes q with a prefix that suits it, in the fewest digits
// that ParseQuantity reads back as exactly q. A q that is not finite is
// written so that ParseQuantity refuses it.
func FormatQuantity[Q Quantity](q Q) string {
	return q.dimension().format(float64(q))
}

// A dimension is what a quantity is of, with the units that it may be given in.
type dimension struct {
	noun    string // with its article, for messages
	example string
	units   []unit // the first is the SI unit, in which values are written
	top     int    // largest power of ten to write as a prefix
}

// A unit is a name for a number of SI units. Only a unit that is 1 in SI takes
// prefixes: "min" is no thousandth of an "in".
type unit struct {
	name string
	inSI int64
}

// A prefix is an SI prefix and its power of ten.
type prefix struct {
	name  string
	power int
}

// The two code points of µ (U+00B5, U+03BC) are written out since they look alike.
var prefixes = []prefix{
	{"y", -24},
	{"z", -21},
	{"a", -18},
	{"f", -15},
	{"p", -12},
	{"n", -9},
	{"u", -6},
	{"\u00b5", -6},
	{"\u03bc", -6},
	{"m", -3},
	{"", 0},
	{"k", 3},
	{"M", 6},
	{"G", 9},
	{"T", 12},
}

// A leading zero is refused: elsewhere it may mean octal.
var decimal = regexp.MustCompile(`^([+-]?(?:(?:0|[1-9][0-9]*)(?:\.[0-9]*)?|\.[0-9]+))(?:[eE]([+-]?[0-9]+))?`)

// maxExponent keeps exponents where they add without overflow; every number
// beyond is out of the range of a float64 unless it is absurdly long.
const maxExponent = 9999

func (d *dimension) parse(text string) (float64, error) {
	text = strings.TrimSpace(text)
	number := decimal.FindString(text)
	if number == "" {
		return 0, fmt.Errorf("%s needs a decimal number and a unit, such as %q", d.noun, d.example)
	}
	name := strings.TrimSpace(text[len(number):])
	if name == "" {
		return 0, fmt.Errorf("%s needs a unit, such as %q", d.noun, d.example)
	}
	factor, power, ok := d.find(name)
	if !ok {
		return 0, fmt.Errorf("%s; write it like %q", d.notAUnit(name), d.example)
	}
	return parseDecimal(number, factor, power)
}

// find returns what a unit's name stands for: factor·10^power SI units.
func (d *dimension) find(name string) (factor int64, power int, ok bool) {
	for _, u := range d.units {
		if name == u.name {
			return u.inSI, 0, true
		}
	}
	for _, u := range d.units {
		head, found := strings.CutSuffix(name, u.name)
		if !found || u.inSI != 1 {
			continue
		}
		for _, p := range prefixes {
			if head == p.name {
				return 1, p.power, true
			}
		}
	}
	return 0, 0, false
}

// notAUnit says that name is no unit of d, and which ones differ from it in
// letter case only.
func (d *dimension) notAUnit(name string) string {
	var alike []string
	for _, u := range d.units {
		for _, p := range prefixes {
			full := p.name + u.name
			if u.inSI != 1 {
				full = u.name
			}
			if strings.EqualFold(name, full) && !slices.Contains(alike, strconv.Quote(full)) {
				alike = append(alike, strconv.Quote(full))
			}
		}
	}
	message := fmt.Sprintf("%q is not a unit for %s", name, d.noun)
	if len(alike) > 0 {
		message += " (letter case counts: " + strings.Join(alike, " or ") + "?)"
	}
	return message
}

// parseDecimal returns number·factor·10^power, rounded once. The number must
// match decimal.
func parseDecimal(number string, factor int64, power int) (float64, error) {
	part := decimal.FindStringSubmatch(number)
	if part == nil || len(part[0]) != len(number) {
		return 0, errors.New("not a decimal number")
	}
	exponent := 0
	if part[2] != "" {
		var err error
		exponent, err = strconv.Atoi(part[2])
		if err != nil || max(exponent, -exponent) > maxExponent {
			return 0, fmt.Errorf("the exponent %s is out of range", part[2])
		}
	}
	shifted := part[1] + "e" + strconv.Itoa(exponent+power)
	v, err := strconv.ParseFloat(shifted, 64)
	if err == nil && factor != 1 {
		r, _ := new(big.Rat).SetString(shifted) // cannot fail: ParseFloat has read it
		v, _ = r.Mul(r, big.NewRat(factor, 1)).Float64()
	}
	if err != nil || math.IsInf(v, 0) {
		return 0, errors.New("the number is too large to be represented")
	}
	if v == 0 {
		if strings.ContainsAny(part[1], "123456789") {
			return 0, errors.New("the number is too small to be told from zero; write 0 for none")
		}
		return 0, nil // drops the sign of -0
	}
	return v, nil
}

func (d *dimension) format(v float64) string {
	name := d.units[0].name
	if v == 0 || math.IsNaN(v) || math.IsInf(v, 0) {
		return strconv.FormatFloat(v, 'g', -1, 64) + " " + name
	}
	// The shortest text that is read back as v, split into digits and exponent:
	// moving its decimal point leaves the number that it stands for as it is.
	mantissa, exp, _ := strings.Cut(strconv.FormatFloat(v, 'e', -1, 64), "e")
	exponent, _ := strconv.Atoi(exp) // cannot fail: FormatFloat wrote it
	power := 3 * int(math.Floor(float64(exponent)/3))
	power = min(max(power, prefixes[0].power), d.top)
	p := slices.IndexFunc(prefixes, func(p prefix) bool { return p.power == power })
	return shiftPoint(mantissa, exponent-power) + " " + prefixes[p].name + name
}

// shiftPoint returns the text of mantissa·10^by, with by as an exponent where
// plain digits would be long. The mantissa has one digit before the point.
func shiftPoint(mantissa string, by int) string {
	if by < 0 || by > 5 {
		return mantissa + "e" + strconv.Itoa(by)
	}
	sign := ""
	if mantissa[0] == '-' {
		sign, mantissa = "-", mantissa[1:]
	}
	digits := strings.Replace(mantissa, ".", "", 1)
	if zeros := by + 1 - len(digits); zeros > 0 {
		digits += strings.Repeat("0", zeros)
	}
	text := sign + digits[:by+1]
	if rest := digits[by+1:]; rest != "" {
		text += "." + rest
	}
	return text
}
