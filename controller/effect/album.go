package effect

import (
	"math"

	hdrhistogram "github.com/HdrHistogram/hdrhistogram-go"
	"gonum.org/v1/gonum/dsp/fourier"
	taper "gonum.org/v1/gonum/dsp/window"

	"brinkwell/controller/trace"
)

// An Album keeps what a report shows as pictures, in constant memory: a
// stretch of the trace around an actuation, the settled dwell times, the
// overshoots and the spectrum of the position. It must be made by NewAlbum and
// must not be used by two goroutines at once.
type Album struct {
	ref         Reference
	stretch     stretch
	transitions transitions
	row         []float64 // for transitions, which book there
	dwells      [trace.Levels]*hdrhistogram.Histogram
	over        []int64
	beyond      int64
	welch       welch
	started     bool
}

const (
	dwellUnit      = 1e-9 // s, to three digits
	longestDwell   = int64(1e15)
	overshootBins  = 160 // of sigma/40, from -sigma on
	overshootStart = -1.0
	overshootStep  = 1.0 / 40
)

// NewAlbum makes an Album.
func NewAlbum(ref Reference) (*Album, error) {
	if err := ref.validate(); err != nil {
		return nil, err
	}
	a := &Album{
		ref: ref, stretch: newStretch(ref), transitions: newTransitions(ref), welch: newWelch(ref),
		row: make([]float64, sumsOfTheRun), over: make([]int64, overshootBins),
	}
	for i := range a.dwells {
		a.dwells[i] = hdrhistogram.New(1, longestDwell, 3)
	}
	return a, nil
}

// Take books a block.
func (a *Album) Take(b *trace.Block) error {
	if !a.started {
		a.started = true
		a.transitions.begin(b.Start, b.Initial)
	}
	a.stretch.take(b)
	a.welch.take(b)
	for i := range b.Events {
		a.event(&b.Events[i])
	}
	return nil
}

func (a *Album) event(e *trace.Event) {
	if e.Tick < a.transitions.start {
		a.transitions.startAs(e.Level)
		return
	}
	clear(a.row)
	a.transitions.add(e, a.row)
	for level := range trace.Levels {
		if a.row[sumSettled+level] > 0 {
			dwell := a.row[sumDwell+level] / dwellUnit
			_ = a.dwells[level].RecordValue(min(int64(dwell), longestDwell)) // in range by min
		}
	}
	position := e.Position
	if !a.stretch.truth {
		position = e.Measured
	}
	over := e.Level.Sign() * (position - a.ref.Threshold) / a.ref.sigma()
	if k := math.Floor((over - overshootStart) / overshootStep); k >= 0 && k < overshootBins {
		a.over[int(k)]++
	} else {
		a.beyond++
	}
}

// A Bin is one bin of a histogram.
type Bin struct {
	From, To float64
	Count    int64
}

// Pictures is what an Album holds, for drawing and for a report.
type Pictures struct {
	Stretch    []trace.Sample // of consecutive ticks
	Start      int64          // tick of its first
	Every      int64          // ticks between them
	Truth      bool
	Dwells     [trace.Levels][]Bin // settled, by the level that was left, s
	Overshoots []Bin               // m
	Beyond     int64               // overshoots outside the bins
	Frequency  []float64           // Hz
	Spectrum   []float64           // one-sided density of the measured position, m²/Hz
	Segments   int                 // averaged for it
}

// dwellBins is the number of bins of a histogram of dwell times.
const dwellBins = 24

// Pictures returns what was taken so far.
func (a *Album) Pictures() Pictures {
	p := Pictures{Stretch: a.stretch.ordered(), Start: a.stretch.first(), Every: a.stretch.every, Truth: a.stretch.truth, Beyond: a.beyond}
	for level, h := range a.dwells {
		p.Dwells[level] = rebin(h)
	}
	for i, n := range a.over {
		from := (overshootStart + float64(i)*overshootStep) * a.ref.sigma()
		p.Overshoots = append(p.Overshoots, Bin{From: from, To: from + overshootStep*a.ref.sigma(), Count: n})
	}
	p.Frequency, p.Spectrum, p.Segments = a.welch.spectrum()
	return p
}

// rebin turns the fine counts of dwell times into even bins up to the longest
// dwell.
func rebin(h *hdrhistogram.Histogram) []Bin {
	if h.TotalCount() == 0 {
		return nil
	}
	width := float64(h.Max()) * (1 + 1e-9) / dwellBins
	bins := make([]Bin, dwellBins)
	for i := range bins {
		bins[i].From, bins[i].To = float64(i)*width*dwellUnit, float64(i+1)*width*dwellUnit
	}
	for _, bar := range h.Distribution() {
		if bar.Count > 0 {
			middle := (float64(bar.From) + float64(bar.To)) / 2
			bins[min(int(middle/width), dwellBins-1)].Count += bar.Count
		}
	}
	return bins
}

// A stretch keeps the ticks around an actuation: half of what it shows before
// it, half after.
type stretch struct {
	ring  []trace.Sample
	every int64
	tick  int64 // of the newest sample
	kept  int64
	left  int64 // to take until it is full, once there was an actuation
	found bool
	truth bool
}

// A stretch is some periods long and at most so many samples.
const (
	stretchPeriods = 24
	stretchSamples = 4000
)

func newStretch(r Reference) stretch {
	ticks := stretchPeriods * 2 * math.Pi / r.Oscillator.Omega0 * r.Rate
	if relax := 24 / r.Oscillator.Quality / r.Oscillator.Omega0 * r.Rate; r.Oscillator.Quality < 0.5 {
		ticks = relax
	}
	every := max(1, int64(math.Ceil(ticks/stretchSamples)))
	n := max(2, int64(ticks)/every)
	return stretch{ring: make([]trace.Sample, n), every: every, left: n / 2}
}

func (s *stretch) take(b *trace.Block) {
	s.truth = b.Truth
	if s.found && s.left == 0 {
		return
	}
	events := b.Events
	for i := range b.Samples {
		tick := b.Start + int64(i)
		if tick%s.every != 0 {
			continue
		}
		if s.found && s.left == 0 {
			return
		}
		s.ring[s.kept%int64(len(s.ring))] = b.Samples[i]
		s.tick = tick
		s.kept++
		if s.found {
			s.left--
		}
		for len(events) > 0 && events[0].Tick <= tick {
			s.found = s.found || s.kept > int64(len(s.ring))/2
			events = events[1:]
		}
	}
}

// ordered returns the samples, oldest first.
func (s *stretch) ordered() []trace.Sample {
	n := int64(len(s.ring))
	if s.kept <= n {
		return append([]trace.Sample(nil), s.ring[:s.kept]...)
	}
	at := s.kept % n
	return append(append([]trace.Sample(nil), s.ring[at:]...), s.ring[:at]...)
}

func (s *stretch) first() int64 {
	return s.tick - (min(s.kept, int64(len(s.ring)))-1)*s.every
}

// welch averages periodograms of the measured position, with Hann's window and
// half overlap (P.D. Welch, IEEE Trans. Audio Electroacoust. 15, 70 (1967)).
type welch struct {
	rate   float64
	fft    *fourier.FFT
	shape  []float64 // the window
	power  float64   // Σ window²
	buffer []float64
	filled int
	sum    []float64
	count  int
	work   []float64
	coeff  []complex128
	x0     float64
}

// A segment has at least so many periods; so many segments are enough.
const (
	segmentPeriods = 64
	segmentsWanted = 512
)

func newWelch(r Reference) welch {
	n := 256
	for float64(n) < segmentPeriods*2*math.Pi/r.Oscillator.Omega0*r.Rate && n < 1<<17 {
		n *= 2
	}
	// Of a symmetric window of n+1 points the first n are the periodic one.
	shape := make([]float64, n+1)
	for i := range shape {
		shape[i] = 1
	}
	shape = taper.Hann(shape)[:n]
	w := welch{
		rate: r.Rate, fft: fourier.NewFFT(n), shape: shape, buffer: make([]float64, n),
		sum: make([]float64, n/2+1), work: make([]float64, n), x0: r.Threshold,
	}
	for _, v := range shape {
		w.power += v * v
	}
	return w
}

func (w *welch) take(b *trace.Block) {
	for i := range b.Samples {
		if w.count >= segmentsWanted {
			return
		}
		x := b.Samples[i].Measured
		if math.IsNaN(x) { // lost: the segment begins anew
			w.filled = 0
			continue
		}
		w.buffer[w.filled] = x - w.x0
		w.filled++
		if w.filled == len(w.buffer) {
			w.segment()
		}
	}
}

func (w *welch) segment() {
	for i, x := range w.buffer {
		w.work[i] = x * w.shape[i]
	}
	w.coeff = w.fft.Coefficients(w.coeff, w.work)
	for i, c := range w.coeff {
		w.sum[i] += real(c)*real(c) + imag(c)*imag(c)
	}
	w.count++
	half := len(w.buffer) / 2
	copy(w.buffer, w.buffer[half:])
	w.filled = half
}

// spectrum returns frequencies, Hz, and the one-sided density there, m²/Hz,
// without the two ends, where a real signal's bins are single.
func (w *welch) spectrum() (f, density []float64, segments int) {
	if w.count == 0 {
		return nil, nil, 0
	}
	n := len(w.buffer)
	for i := 1; i < n/2; i++ {
		f = append(f, float64(i)*w.rate/float64(n))
		density = append(density, 2*w.sum[i]/(w.rate*w.power*float64(w.count)))
	}
	return f, density, w.count
}
