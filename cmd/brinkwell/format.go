package main

import (
	"fmt"
	"math"
	"strings"

	"brinkwell/controller/estimate"
)

// prefixed units take an SI prefix when printed, 1/m an inverse one; the
// others do not.
var prefixed = map[string]bool{"m": true, "s": true, "N/m": true, "Hz": true, "1/m": true}

var prefixes = []struct {
	factor float64
	symbol string
}{{1e-15, "f"}, {1e-12, "p"}, {1e-9, "n"}, {1e-6, "µ"}, {1e-3, "m"}, {1, ""}, {1e3, "k"}, {1e6, "M"}, {1e9, "G"}}

// scaled returns the factor and the unit in which a value reads well.
func scaled(value float64, unit string) (factor float64, name string) {
	factor = 1
	if !prefixed[unit] || value == 0 {
		return factor, unit
	}
	name = unit
	base, inverse := strings.CutPrefix(unit, "1/")
	for _, p := range prefixes {
		switch size := math.Abs(value) * (1 + 1e-9); {
		case inverse && size*p.factor >= 1:
			return 1 / p.factor, "1/" + p.symbol + base
		case !inverse && size >= p.factor:
			factor, name = p.factor, p.symbol+unit
		}
	}
	return factor, name
}

// quantity prints a number with its unit, to five digits.
func quantity(value float64, unit string) string {
	factor, name := scaled(value, unit)
	return strings.TrimSuffix(fmt.Sprintf("%.5g %s", value/factor, name), " ")
}

// interval prints an estimate with its 95 % interval: value ± half, or the
// ends of an interval that is lopsided, to two digits of the half. An estimate
// that there is not is a dash; its reason is said elsewhere.
func interval(v estimate.Value, unit string) string {
	if !v.Known() {
		return "—"
	}
	factor, name := scaled(math.Max(math.Abs(v.Value), v.Half()), unit)
	half := v.Half() / factor
	decimals := 3
	if half > 0 {
		decimals = max(0, 1-int(math.Floor(math.Log10(half))))
	}
	up, down := v.High-v.Value, v.Value-v.Low
	if math.Abs(up-down) > 0.1*v.Half() {
		return strings.TrimSuffix(fmt.Sprintf("%.*f (%.*f … %.*f) %s", decimals, v.Value/factor,
			decimals, v.Low/factor, decimals, v.High/factor, name), " ")
	}
	return strings.TrimSuffix(fmt.Sprintf("%.*f ± %.*f %s", decimals, v.Value/factor, decimals, half, name), " ")
}

// expectation prints what theory expects, or a dash outside its range.
func expectation(value float64, inside bool, unit string) string {
	if !inside {
		return "—"
	}
	factor, name := scaled(value, unit)
	return strings.TrimSuffix(fmt.Sprintf("%.4g %s", value/factor, name), " ")
}
