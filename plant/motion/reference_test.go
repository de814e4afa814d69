package motion_test

import (
	"math"
	"math/big"
)

// The reference of these tests: the block exponential of C. F. Van Loan, IEEE
// Trans. Automat. Contr. 23, 395 (1978) (method from memory),
//
//	exp [A  W; 0  -Aᵀ]t = [Φ  Ψ; 0  Φ⁻ᵀ],  C = Ψ·Φᵀ,
//
// for A = [0 1; -1 -1/Q], W = diag(0, 2/Q), the oscillator with m = k = k_B·T = 1.
// It is evaluated as a Taylor series for t/2ⁿ and doubled n times by
// Φ(2s) = Φ(s)² and C(2s) = C(s) + Φ(s)·C(s)·Φ(s)ᵀ.

// precision, in bits, leaves some 80 digits after the cancellation in the
// series, which is of order (2^-20)³ at the shortest step, and the doublings.
const precision = 400

type matrix [][]*big.Float

func number(x float64) *big.Float { return new(big.Float).SetPrec(precision).SetFloat64(x) }

func square(n int) matrix {
	m := make(matrix, n)
	for i := range m {
		m[i] = make([]*big.Float, n)
		for j := range m[i] {
			m[i][j] = number(0)
		}
	}
	return m
}

func (a matrix) plus(b matrix) matrix {
	sum := square(len(a))
	for i := range a {
		for j := range a {
			sum[i][j].Add(a[i][j], b[i][j])
		}
	}
	return sum
}

func (a matrix) times(b matrix) matrix {
	product, term := square(len(a)), number(0)
	for i := range a {
		for j := range a {
			for k := range a {
				product[i][j].Add(product[i][j], term.Mul(a[i][k], b[k][j]))
			}
		}
	}
	return product
}

func (a matrix) over(x *big.Float) matrix {
	quotient := square(len(a))
	for i := range a {
		for j := range a {
			quotient[i][j].Quo(a[i][j], x)
		}
	}
	return quotient
}

func (a matrix) transposed() matrix {
	b := square(len(a))
	for i := range a {
		for j := range a {
			b[j][i] = a[i][j]
		}
	}
	return b
}

// block returns the top or bottom right or left 2×2 block.
func (a matrix) block(row, column int) matrix {
	b := square(2)
	for i := range b {
		for j := range b {
			b[i][j] = a[row+i][column+j]
		}
	}
	return b
}

// exact returns Φ and C over a step of t for m = k = k_B·T = 1.
func exact(quality, t float64) (phi, c matrix) {
	damping := number(1)
	damping.Quo(damping, number(quality))

	m := square(4)
	m[0][1].SetInt64(1)
	m[1][0].SetInt64(-1)
	m[1][1].Neg(damping)
	m[1][3].Mul(damping, number(2))
	m[2][3].SetInt64(1)
	m[3][2].SetInt64(-1)
	m[3][3].Set(damping)

	doublings := max(0, int(math.Ceil(math.Log2(t*max(1, 1/quality))))+8)
	step := number(t)
	step.SetMantExp(step, -doublings)
	for i := range m {
		for j := range m {
			m[i][j].Mul(m[i][j], step)
		}
	}

	sum, term := square(4), square(4)
	for i := range sum {
		sum[i][i].SetInt64(1)
		term[i][i].SetInt64(1)
	}
	for n := 1; n <= 40; n++ { // (2^-7)^40/40! = 2^-440: the norm is at most 2^-7
		term = term.times(m).over(number(float64(n)))
		sum = sum.plus(term)
	}
	phi = sum.block(0, 0)
	c = sum.block(0, 2).times(phi.transposed())
	for range doublings {
		c = c.plus(phi.times(c).times(phi.transposed()))
		phi = phi.times(phi)
	}
	return phi, c
}

// deviation returns |got - want|/|scale|.
func deviation(got float64, want, scale *big.Float) float64 {
	d := number(got)
	d.Sub(d, want)
	ratio, _ := d.Quo(d, scale).Float64()
	return math.Abs(ratio)
}

// determinant returns that of a symmetric 2×2 matrix.
func (a matrix) determinant() *big.Float {
	left, right := number(0), number(0)
	left.Mul(a[0][0], a[1][1])
	right.Mul(a[0][1], a[1][0])
	return left.Sub(left, right)
}
