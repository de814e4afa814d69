// Package estimate turns sums over a run into values with 95 % intervals that
// account for autocorrelation.
//
// It is a leaf: it knows nothing of loops or resonators and imports nothing of
// ours. What a value is an estimate of, its caller says.
package estimate

import (
	"encoding/json"
	"fmt"
	"math"
	"sync"

	"gonum.org/v1/gonum/stat/distuv"
)

// Confidence is the level of every interval.
const Confidence = 0.95

// A Value is an estimate with its 95 % interval, or the reason why there is
// none. The zero Value is an estimate of exactly 0; use Unknown for "none".
type Value struct {
	Value     float64
	Low, High float64 // 95 % interval

	Reason string // why there is no estimate; empty where there is one
}

// Unknown is the absence of an estimate, for a reason.
func Unknown(format string, args ...any) Value {
	return Value{Reason: fmt.Sprintf(format, args...)}
}

// Known reports whether there is an estimate.
func (v Value) Known() bool { return v.Reason == "" }

// Half is half the width of the interval.
func (v Value) Half() float64 { return (v.High - v.Low) / 2 }

// Holds reports whether the interval contains x. An unknown value holds
// nothing.
func (v Value) Holds(x float64) bool { return v.Known() && v.Low <= x && x <= v.High }

// Scale returns the estimate of factor times the quantity.
func (v Value) Scale(factor float64) Value {
	v.Value *= factor
	v.Low, v.High = v.Low*factor, v.High*factor
	if factor < 0 {
		v.Low, v.High = v.High, v.Low
	}
	return v
}

// Affine returns the estimate of offset + factor times the quantity.
func (v Value) Affine(offset, factor float64) Value {
	v = v.Scale(factor)
	v.Value, v.Low, v.High = v.Value+offset, v.Low+offset, v.High+offset
	return v
}

// normal returns value ± t·se, t the quantile of Student's distribution with
// dof degrees of freedom.
func normal(value, se, dof float64) Value {
	if math.IsNaN(value) || math.IsInf(value, 0) || math.IsNaN(se) || math.IsInf(se, 0) {
		return Unknown("the run is too short for an interval")
	}
	t := student(dof)
	return Value{Value: value, Low: value - t*se, High: value + t*se}
}

// students remembers the quantiles, which take longer than all else of an
// interval and depend on the number of blocks alone.
var students sync.Map // dof -> quantile, both float64

func student(dof float64) float64 {
	if t, found := students.Load(dof); found {
		return t.(float64)
	}
	t := distuv.StudentsT{Mu: 0, Sigma: 1, Nu: dof}.Quantile((1 + Confidence) / 2)
	students.Store(dof, t)
	return t
}

// Poisson returns the estimate of a mean number of independent events from
// one count of them, with the exact interval of F. Garwood, Biometrika 28, 437
// (1936). It panics if count is negative.
func Poisson(count int64) Value {
	if count < 0 {
		panic("estimate: negative count")
	}
	n := float64(count)
	quantile := func(p, shape float64) float64 {
		return distuv.Gamma{Alpha: shape, Beta: 1}.Quantile(p)
	}
	v := Value{Value: n, High: quantile((1+Confidence)/2, n+1)}
	if count > 0 {
		v.Low = quantile((1-Confidence)/2, n)
	}
	return v
}

// Widest returns v with its interval widened, where necessary, to cover w's.
func (v Value) Widest(w Value) Value {
	if v.Known() && w.Known() {
		v.Low, v.High = math.Min(v.Low, w.Low), math.Max(v.High, w.High)
	}
	return v
}

type valueJSON struct {
	Value  *float64 `json:"value"`
	Low    *float64 `json:"low"`
	High   *float64 `json:"high"`
	Reason string   `json:"reason,omitempty"`
}

// MarshalJSON writes {"value":…,"low":…,"high":…}; where there is no estimate
// the three are null and "reason" says why.
func (v Value) MarshalJSON() ([]byte, error) {
	if !v.Known() {
		return json.Marshal(valueJSON{Reason: v.Reason})
	}
	return json.Marshal(valueJSON{Value: &v.Value, Low: &v.Low, High: &v.High})
}

// UnmarshalJSON reads what MarshalJSON writes.
func (v *Value) UnmarshalJSON(data []byte) error {
	var j valueJSON
	if err := json.Unmarshal(data, &j); err != nil {
		return err
	}
	*v = Value{Reason: j.Reason}
	if j.Value != nil && j.Low != nil && j.High != nil {
		v.Value, v.Low, v.High = *j.Value, *j.Low, *j.High
	} else if j.Reason == "" {
		return fmt.Errorf("estimate: neither a value with its interval nor a reason in %s", data)
	}
	return nil
}
