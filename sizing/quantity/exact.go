// Package quantity holds exact numbers: decimals as people and datasheets write
// them, the arithmetic that a voltage check needs, and their way back to text
// with a stated number of places and a stated direction of rounding.
//
// It knows nothing of modules, limits or codes. It must not know binary floating
// point: a limit that is met exactly is met, and one digit beyond it is not,
// which a float64 cannot promise.
package quantity

import (
	"math/big"
	"math/bits"
)

// Exact is a rational number without rounding. The zero value is 0. Values are
// immutable and may be copied and compared with [Exact.Cmp]; == is not equality.
//
// Small numbers, which is nearly all of them, are two machine words and cost no
// allocation; when a result does not fit, it moves to math/big by itself, so no
// operation overflows or loses a digit.
type Exact struct {
	num, den int64    // num/den where big is nil; den 0 stands for 1, so that the zero value is 0
	big      *big.Rat // never changed once set
}

// Int returns the whole number n.
func Int(n int64) Exact {
	if n == minInt64 {
		return Exact{big: new(big.Rat).SetInt64(n)}
	}
	return Exact{num: n, den: 1}
}

// Ratio returns num/den. It panics if den is 0.
func Ratio(num, den int64) Exact {
	return Int(num).Quo(Int(den))
}

// FromRat returns a copy of r.
func FromRat(r *big.Rat) Exact { return fromRat(new(big.Rat).Set(r)) }

// Rat returns x as a new big.Rat.
func (x Exact) Rat() *big.Rat {
	if x.big != nil {
		return new(big.Rat).Set(x.big)
	}
	return big.NewRat(x.num, x.d())
}

const minInt64 = -1 << 63

func (x Exact) d() int64 {
	if x.den == 0 {
		return 1
	}
	return x.den
}

// rat returns x as a big.Rat that the caller must not change.
func (x Exact) rat() *big.Rat {
	if x.big != nil {
		return x.big
	}
	return big.NewRat(x.num, x.d())
}

// fromRat takes ownership of r.
func fromRat(r *big.Rat) Exact {
	if r.Num().IsInt64() && r.Denom().IsInt64() && r.Num().Int64() != minInt64 {
		return Exact{num: r.Num().Int64(), den: r.Denom().Int64()}
	}
	return Exact{big: r}
}

func mul64(a, b int64) (int64, bool) {
	negative := (a < 0) != (b < 0)
	hi, lo := bits.Mul64(abs64(a), abs64(b))
	if hi != 0 || lo >= 1<<63 {
		return 0, false
	}
	if negative {
		return -int64(lo), true
	}
	return int64(lo), true
}

func add64(a, b int64) (int64, bool) {
	c := a + b
	if (c > a) != (b > 0) && b != 0 || c == minInt64 {
		return 0, false
	}
	return c, true
}

func abs64(a int64) uint64 {
	if a < 0 {
		return uint64(-a)
	}
	return uint64(a)
}

func gcd(a, b uint64) uint64 {
	if a == 0 {
		return b
	}
	if b == 0 {
		return a
	}
	shift := bits.TrailingZeros64(a | b)
	a >>= bits.TrailingZeros64(a)
	for b != 0 {
		b >>= bits.TrailingZeros64(b)
		if a > b {
			a, b = b, a
		}
		b -= a
	}
	return a << shift
}

// Reduced returns x in lowest terms. Arithmetic leaves fractions unreduced until
// they no longer fit, because most never need it.
func (x Exact) Reduced() Exact {
	if x.big != nil {
		return x
	}
	d := x.d()
	if g := int64(gcd(abs64(x.num), uint64(d))); g > 1 {
		return Exact{num: x.num / g, den: d / g}
	}
	return Exact{num: x.num, den: d}
}

// Add returns x + y.
func (x Exact) Add(y Exact) Exact {
	if x.big == nil && y.big == nil {
		if z, ok := addSmall(x, y); ok {
			return z
		}
		if z, ok := addSmall(x.Reduced(), y.Reduced()); ok {
			return z
		}
	}
	return fromRat(new(big.Rat).Add(x.rat(), y.rat()))
}

func addSmall(x, y Exact) (Exact, bool) {
	xd, yd := x.d(), y.d()
	if xd == yd {
		n, ok := add64(x.num, y.num)
		return Exact{num: n, den: xd}, ok
	}
	a, okA := mul64(x.num, yd)
	b, okB := mul64(y.num, xd)
	d, okD := mul64(xd, yd)
	if !okA || !okB || !okD {
		return Exact{}, false
	}
	n, ok := add64(a, b)
	return Exact{num: n, den: d}, ok
}

// Neg returns −x.
func (x Exact) Neg() Exact {
	if x.big != nil {
		return fromRat(new(big.Rat).Neg(x.big))
	}
	return Exact{num: -x.num, den: x.den}
}

// Sub returns x − y.
func (x Exact) Sub(y Exact) Exact { return x.Add(y.Neg()) }

// Mul returns x × y.
func (x Exact) Mul(y Exact) Exact {
	if x.big == nil && y.big == nil {
		if z, ok := mulSmall(x, y); ok {
			return z
		}
		if z, ok := mulSmall(x.Reduced(), y.Reduced()); ok {
			return z
		}
	}
	return fromRat(new(big.Rat).Mul(x.rat(), y.rat()))
}

func mulSmall(x, y Exact) (Exact, bool) {
	n, okN := mul64(x.num, y.num)
	d, okD := mul64(x.d(), y.d())
	return Exact{num: n, den: d}, okN && okD
}

// Quo returns x ÷ y. It panics if y is 0.
func (x Exact) Quo(y Exact) Exact { return x.Mul(y.inverse()) }

func (y Exact) inverse() Exact {
	switch {
	case y.Sign() == 0:
		panic("quantity: division by zero")
	case y.big != nil:
		return fromRat(new(big.Rat).Inv(y.big))
	case y.num < 0:
		return Exact{num: -y.d(), den: -y.num}
	}
	return Exact{num: y.d(), den: y.num}
}

// Sign returns −1, 0 or +1.
func (x Exact) Sign() int {
	switch {
	case x.big != nil:
		return x.big.Sign()
	case x.num < 0:
		return -1
	case x.num > 0:
		return 1
	}
	return 0
}

// IsZero reports whether x is 0.
func (x Exact) IsZero() bool { return x.Sign() == 0 }

// Abs returns |x|.
func (x Exact) Abs() Exact {
	if x.Sign() < 0 {
		return x.Neg()
	}
	return x
}

// Cmp returns −1 if x < y, 0 if x = y, +1 if x > y.
func (x Exact) Cmp(y Exact) int {
	if x.big != nil || y.big != nil {
		return x.rat().Cmp(y.rat())
	}
	xs, ys := x.Sign(), y.Sign()
	if xs != ys {
		if xs < ys {
			return -1
		}
		return 1
	}
	if xs == 0 {
		return 0
	}
	ah, al := bits.Mul64(abs64(x.num), uint64(y.d()))
	bh, bl := bits.Mul64(abs64(y.num), uint64(x.d()))
	c := 0
	switch {
	case ah < bh || ah == bh && al < bl:
		c = -1
	case ah > bh || al > bl:
		c = 1
	}
	return c * xs
}

// Less reports whether x < y.
func (x Exact) Less(y Exact) bool { return x.Cmp(y) < 0 }

// Equal reports whether x = y.
func (x Exact) Equal(y Exact) bool { return x.Cmp(y) == 0 }

// Max returns the greater of x and y.
func Max(x, y Exact) Exact {
	if x.Cmp(y) < 0 {
		return y
	}
	return x
}

// Min returns the lesser of x and y.
func Min(x, y Exact) Exact {
	if y.Cmp(x) < 0 {
		return y
	}
	return x
}

// IsWhole reports whether x is a whole number; 12.0 is.
func (x Exact) IsWhole() bool {
	if x.big != nil {
		return x.big.IsInt()
	}
	return x.num%x.d() == 0
}

// Floor returns the greatest whole number that is not above x.
func (x Exact) Floor() Exact {
	if x.big != nil {
		// Euclidean division is floor division for a positive divisor, which a Rat's denominator is.
		return fromRat(new(big.Rat).SetInt(new(big.Int).Div(x.big.Num(), x.big.Denom())))
	}
	q := x.num / x.d()
	if x.num%x.d() < 0 {
		q--
	}
	return Int(q)
}

// Ceil returns the least whole number that is not below x.
func (x Exact) Ceil() Exact { return x.Neg().Floor().Neg() }

// Int64 returns x if it is a whole number that fits, else 0 and false.
func (x Exact) Int64() (int64, bool) {
	if x.big != nil {
		if x.big.IsInt() && x.big.Num().IsInt64() {
			return x.big.Num().Int64(), true
		}
		return 0, false
	}
	if x.num%x.d() != 0 {
		return 0, false
	}
	return x.num / x.d(), true
}
