package estimate

import (
	"encoding/json"
	"math"
	"strings"
	"testing"
)

func within(got, want, tol float64) bool { return math.Abs(got-want) <= tol }

// F. Garwood, Biometrika 28, 437 (1936), table of 95 % limits (from memory),
// to the digits printed there.
func TestPoisson(t *testing.T) {
	for _, tt := range []struct {
		count     int64
		low, high float64
		tol       float64
	}{
		{0, 0, 3.689, 5e-4},
		{1, 0.0253, 5.572, 5e-4},
		{2, 0.242, 7.225, 5e-4},
		{10, 4.795, 18.390, 1e-3},
		{50, 37.11, 65.92, 1e-2},
	} {
		v := Poisson(tt.count)
		if !(v.Value == float64(tt.count) && within(v.Low, tt.low, tt.tol) && within(v.High, tt.high, tt.tol)) {
			t.Errorf("Poisson(%d) = %v (%v, %v), want (%v, %v)", tt.count, v.Value, v.Low, v.High, tt.low, tt.high)
		}
	}
}

func TestScaleKeepsTheOrder(t *testing.T) {
	v := Value{Value: 2, Low: 1, High: 4}
	if got, want := v.Scale(-2), (Value{Value: -4, Low: -8, High: -2}); got != want {
		t.Errorf("Scale(-2) = %v, want %v", got, want)
	}
	if got, want := v.Affine(1, 0.5), (Value{Value: 2, Low: 1.5, High: 3}); got != want {
		t.Errorf("Affine(1, 0.5) = %v, want %v", got, want)
	}
}

func TestJSON(t *testing.T) {
	for _, tt := range []struct {
		value Value
		want  string
	}{
		{Value{Value: 1, Low: 0.5, High: 1.5}, `{"value":1,"low":0.5,"high":1.5}`},
		{Unknown("only %d crossings", 3), `{"value":null,"low":null,"high":null,"reason":"only 3 crossings"}`},
	} {
		data, err := json.Marshal(tt.value)
		if err != nil || string(data) != tt.want {
			t.Errorf("Marshal = %s, %v, want %s", data, err, tt.want)
		}
		var back Value
		if err := json.Unmarshal(data, &back); err != nil || back != tt.value {
			t.Errorf("Unmarshal(%s) = %v, %v, want %v", data, back, err, tt.value)
		}
	}
	var v Value
	if err := json.Unmarshal([]byte(`{"value":1}`), &v); err == nil || !strings.Contains(err.Error(), "reason") {
		t.Errorf("a value without its interval gives %v, want an error", err)
	}
}

func TestUnknownHoldsNothing(t *testing.T) {
	if Unknown("why").Holds(0) {
		t.Error("an unknown value holds 0")
	}
}
