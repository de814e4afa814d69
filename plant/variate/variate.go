// Package variate draws standard normal variates, fast and reproducibly.
//
// It exists because the closed loop needs three of them a tick and the
// standard library's take 6 ns each, a quarter of the time that one tick may
// have; these take about a third of that. It knows no physics and imports
// nothing of ours.
package variate

import (
	"math"
	"math/bits"
	"math/rand/v2"
)

// layers is the number of ziggurat strips of equal area; ten random bits
// choose one. More strips mean fewer draws near the curve, which are slow, and
// larger tables: 1,024 are fastest here.
const layers = 1024

// mantissa is the scale of the signed 53-bit integers that are compared with
// the strips.
const mantissa = 1 << 52

var (
	edge   float64             // where the tail begins
	inside [layers]int64       // |integer| below this: surely under the curve
	scale  [layers]float64     // from the integer to the abscissa
	height [layers + 1]float64 // exp(-x²/2) at the strips' borders
)

func density(x float64) float64 { return math.Exp(-x * x / 2) }

// strips returns the borders of strips of equal area whose tail begins at
// edge, outermost first: the base strip's is that of a rectangle that holds
// the tail's area too. The last one is where the top strip should close, 0;
// it is not a number where the strips overshoot the summit.
func strips(edge float64) (borders [layers + 1]float64) {
	area := edge*density(edge) + math.Sqrt(math.Pi/2)*math.Erfc(edge/math.Sqrt2)
	borders[0], borders[1] = area/density(edge), edge
	for i := 1; i < layers; i++ {
		borders[i+1] = math.Sqrt(-2 * math.Log(area/borders[i]+density(borders[i])))
	}
	return borders
}

func init() {
	// The edge is where the strips just close: bisection to the last bit.
	low, high := 3.0, 5.0 // too small a tail overshoots, too large a one leaves room
	for range 60 {
		edge = (low + high) / 2
		if math.IsNaN(strips(edge)[layers]) {
			low = edge
		} else {
			high = edge
		}
	}
	edge = high
	borders := strips(edge)
	borders[layers] = 0
	for i := range layers {
		scale[i] = borders[i] / mantissa
		inside[i] = int64(borders[i+1] / borders[i] * mantissa)
		height[i] = density(borders[i])
	}
	height[layers] = 1
}

// A Normal is a stream of standard normal variates. It must be made by
// NewNormal and must not be used by two goroutines at once.
//
// The uniform bits come from the xoshiro256++ generator (D. Blackman and
// S. Vigna, ACM Trans. Math. Softw. 47(4), 36 (2021)), the normals from the
// ziggurat of Marsaglia and Tsang with the strip, the sign and the abscissa
// taken from separate bits.
type Normal struct {
	s [4]uint64
}

// NewNormal returns the stream numbered stream of a seed. Streams of one seed
// are independent for every practical purpose.
func NewNormal(seed, stream uint64) *Normal {
	src := rand.NewPCG(seed, stream)
	n := new(Normal)
	for i := range n.s {
		n.s[i] = src.Uint64()
	}
	if n.s == [4]uint64{} {
		n.s[0] = 1 // the one state that xoshiro cannot leave
	}
	return n
}

// Uint64 returns 64 uniform bits.
func (n *Normal) Uint64() uint64 {
	var r uint64
	r, n.s[0], n.s[1], n.s[2], n.s[3] = next(n.s[0], n.s[1], n.s[2], n.s[3])
	return r
}

// Float64 returns a uniform variate in (0, 1), neither end included.
func (n *Normal) Float64() float64 {
	return (float64(n.Uint64()>>12) + 0.5) / (1 << 52)
}

// Next returns one standard normal variate.
func (n *Normal) Next() float64 {
	var one [1]float64
	n.Fill(one[:])
	return one[0]
}

// Fill fills dst with standard normal variates. It does not allocate.
func (n *Normal) Fill(dst []float64) {
	// The state stays in registers for the whole slice; that is most of the
	// gain over drawing one at a time.
	s0, s1, s2, s3 := n.s[0], n.s[1], n.s[2], n.s[3]
	for k := range dst {
		var r uint64
		r, s0, s1, s2, s3 = next(s0, s1, s2, s3)
		strip := r % layers
		whole := int64(r) >> 11 // 53 bits with their sign; the strip's are gone
		x := float64(whole) * scale[strip]
		sign := whole >> 63
		if whole^sign >= inside[strip] {
			n.s = [4]uint64{s0, s1, s2, s3}
			x = n.border(strip, x)
			s0, s1, s2, s3 = n.s[0], n.s[1], n.s[2], n.s[3]
		}
		dst[k] = x
	}
	n.s = [4]uint64{s0, s1, s2, s3}
}

// border settles a draw x that fell outside the sure part of its strip.
func (n *Normal) border(strip uint64, x float64) float64 {
	for {
		if strip == 0 {
			return math.Copysign(n.tail(), x)
		}
		low, high := height[strip], height[strip+1]
		if low+n.Float64()*(high-low) < math.Exp(-x*x/2) {
			return x
		}
		r := n.Uint64()
		strip = r % layers
		whole := int64(r) >> 11
		x = float64(whole) * scale[strip]
		if whole^(whole>>63) < inside[strip] {
			return x
		}
	}
}

// tail draws from the tail beyond edge: Marsaglia's method of 1964.
func (n *Normal) tail() float64 {
	for {
		x := -math.Log(n.Float64()) / edge
		y := -math.Log(n.Float64())
		if 2*y > x*x {
			return edge + x
		}
	}
}

// next is one turn of xoshiro256++.
func next(s0, s1, s2, s3 uint64) (r, t0, t1, t2, t3 uint64) {
	r = bits.RotateLeft64(s0+s3, 23) + s0
	t := s1 << 17
	s2 ^= s0
	s3 ^= s1
	s1 ^= s2
	s0 ^= s3
	s2 ^= t
	return r, s0, s1, s2, bits.RotateLeft64(s3, 45)
}
