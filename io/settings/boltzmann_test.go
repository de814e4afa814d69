package settings

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/unit/constant"
)

// k_B is exact since the SI of 2019: CODATA 2018's table, as gonum carries it,
// and kT at 300 K to the seven digits 4.141947e-21 J that follow from it.
func TestBoltzmann(t *testing.T) {
	if boltzmann != float64(constant.Boltzmann) {
		t.Errorf("k_B = %v, want %v", boltzmann, float64(constant.Boltzmann))
	}
	s := mustLoad(t, "", Sources{Set: []string{"resonator.temperature=300 K"}})
	if !(math.Abs(s.KT()-4.141947e-21) <= 0.5e-27) {
		t.Errorf("kT at 300 K = %v J, want 4.141947e-21 J", s.KT())
	}
}
