package settings

// The types of the values. The type of a field says its dimension, and so
// which units its text may have; the value is in the SI unit of the name.
type (
	Hertz             float64 // frequency or rate, Hz
	Second            float64 // time, s
	Metre             float64 // length, m
	Kelvin            float64 // temperature, K
	NewtonPerMetre    float64 // stiffness, N/m
	MetrePerRootHertz float64 // one-sided amplitude density of a length, m/rtHz
	MetrePerSecond    float64 // speed, m/s

	Bare   float64 // a number without a unit
	Count  int64   // a whole number
	Choice string  // one of the words that its key allows
)

var (
	frequency    = dimension{"a frequency", "6.5 kHz", []unit{{"Hz", 1}}, 12}
	duration     = dimension{"a time", "4.99e-06 s", []unit{{"s", 1}, {"min", 60}, {"h", 3600}}, 0}
	length       = dimension{"a length", "0.02 nm", []unit{{"m", 1}}, 3}
	temperature  = dimension{"a temperature", "293.15 K", []unit{{"K", 1}}, 0}
	stiffness    = dimension{"a stiffness", "0.08 N/m", []unit{{"N/m", 1}}, 12}
	speed        = dimension{"a speed", "2 pm/s", []unit{{"m/s", 1}}, 3}
	noiseDensity = dimension{"a noise density", "30 fm/rtHz", []unit{{"m/rtHz", 1}, {"m/√Hz", 1}}, 3}
)

func (Hertz) dimension() *dimension             { return &frequency }
func (Second) dimension() *dimension            { return &duration }
func (Metre) dimension() *dimension             { return &length }
func (Kelvin) dimension() *dimension            { return &temperature }
func (NewtonPerMetre) dimension() *dimension    { return &stiffness }
func (MetrePerSecond) dimension() *dimension    { return &speed }
func (MetrePerRootHertz) dimension() *dimension { return &noiseDensity }
