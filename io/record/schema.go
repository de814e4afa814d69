package record

import "github.com/apache/arrow-go/v18/arrow"

// Columns of samples.arrows.
const (
	colTick = iota
	colMeasured
	colPosition
	colVelocity
	colLevel
	colVolts
)

// Columns of events.arrows.
const (
	evTime = iota
	evTick
	evOffset
	evDecided
	evLevel
	evPosition
	evMeasured
	evWork
	evKnown
)

func field(name string, t arrow.DataType, nullable bool, unit, meaning string) arrow.Field {
	return arrow.Field{
		Name: name, Type: t, Nullable: nullable,
		Metadata: arrow.NewMetadata([]string{"unit", "meaning"}, []string{unit, meaning}),
	}
}

var (
	integer = arrow.PrimitiveTypes.Int64
	real64  = arrow.PrimitiveTypes.Float64
	small   = arrow.PrimitiveTypes.Uint8
)

var sampleFields = []arrow.Field{
	colTick:     field("tick", integer, false, "1", "number of the tick; its time is tick / rate"),
	colMeasured: field("measured_m", real64, false, "m", "position by the sensor; not a number where the tick had none"),
	colPosition: field("position_m", real64, true, "m", "true position; null where not known"),
	colVelocity: field("velocity_m_per_s", real64, true, "m/s", "true velocity; null where not known"),
	colLevel:    field("level", small, false, "1", "level decided from this sample; it acts a latency later"),
	colVolts:    field("volts_V", real64, true, "V", "commanded for that level; null where not known"),
}

var eventFields = []arrow.Field{
	evTime:     field("time_s", real64, false, "s", "of the actuation: tick / rate + offset"),
	evTick:     field("tick", integer, false, "1", "last tick at or before the actuation"),
	evOffset:   field("offset_s", real64, false, "s", "from that tick to the actuation"),
	evDecided:  field("decided_tick", integer, false, "1", "tick whose sample decided it"),
	evLevel:    field("level", small, false, "1", "the new level"),
	evPosition: field("position_m", real64, true, "m", "true position at the actuation; null where not known"),
	evMeasured: field("measured_m", real64, false, "m", "position by the sensor, interpolated to the actuation"),
	evWork:     field("work_J", real64, true, "J", "done on the resonator by it; null where not known"),
	evKnown:    field("known_tick", integer, false, "1", "first tick of the block in which it became known"),
}

// schema gives fields the metadata of a header.
func schema(fields []arrow.Field, h Header) *arrow.Schema {
	md := h.metadata()
	return arrow.NewSchema(fields, &md)
}
