package trial

import (
	"fmt"
	"math"

	"brinkwell/controller/estimate"
)

// A Verdict compares the realised potential with the tolerance.
type Verdict struct {
	Passes      bool      `json:"passes"`
	Barrier     Judgement `json:"barrier"`
	Temperature Judgement `json:"temperature"`
}

// A Judgement is one comparison.
type Judgement struct {
	Asked     float64        `json:"asked"`
	Realised  estimate.Value `json:"realised"`
	From      string         `json:"from"` // which estimate was judged
	Deviation float64        `json:"deviation_relative"`
	Tolerance float64        `json:"tolerance_relative"`
	Judged    bool           `json:"judged"` // whether there was an estimate
	Within    bool           `json:"within"`
	Sure      bool           `json:"sure"` // the whole interval is on one side of the limit
}

func (t Tolerance) judge(a Asked, r Landscape) Verdict {
	barrier, from := r.Barrier, "density at the threshold"
	if !barrier.Known() {
		barrier, from = r.BarrierFromParabolas, "fitted parabolas"
	}
	v := Verdict{
		Barrier:     judge(a.Barrier, barrier, from, t.Barrier),
		Temperature: judge(1, r.KineticTemperature, "velocity", t.Temperature),
	}
	v.Passes = v.Barrier.Within && v.Temperature.Within
	return v
}

func judge(asked float64, realised estimate.Value, from string, tolerance float64) Judgement {
	j := Judgement{Asked: asked, Realised: realised, From: from, Tolerance: tolerance, Judged: realised.Known()}
	if !j.Judged {
		return j
	}
	off := realised.Affine(-1, 1/asked)
	j.Deviation = off.Value
	j.Within = math.Abs(off.Value) <= tolerance
	inside := -tolerance <= off.Low && off.High <= tolerance
	outside := off.Low > tolerance || off.High < -tolerance
	j.Sure = inside || outside
	return j
}

// String says the judgement in words, without a unit of its own.
func (j Judgement) String() string {
	if !j.Judged {
		return "cannot be judged: " + j.Realised.Reason
	}
	relation := "within"
	if !j.Within {
		relation = "NOT within"
	}
	s := fmt.Sprintf("%+.1f %% of what was asked, %s the tolerance of ±%g %%", 100*j.Deviation, relation, 100*j.Tolerance)
	if !j.Sure {
		s += " (the interval reaches across the limit: run longer to be sure)"
	}
	return s
}
