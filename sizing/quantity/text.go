package quantity

import (
	"bytes"
	"errors"
	"fmt"
	"math/big"
	"math/bits"
	"strconv"
	"strings"
)

// Limits of a written number. They keep a hostile document from asking for
// gigabytes of digits; no datasheet comes near them.
const (
	MaxDigits   = 40
	MaxExponent = 30
)

// ErrTooLong is returned by [Parse] for a number beyond [MaxDigits] or [MaxExponent].
var ErrTooLong = fmt.Errorf("more than %d digits or an exponent beyond ±%d", MaxDigits, MaxExponent)

// ErrNotNumber is returned by [Parse] for text that is no decimal number.
var ErrNotNumber = errors.New("not a decimal number")

// Parse reads a decimal number as JSON (RFC 8259, section 6) writes it:
// an optional minus, digits without a leading zero, an optional fraction and
// exponent. The value is exact.
func Parse(s string) (Exact, error) {
	i, negative := 0, false
	if i < len(s) && s[i] == '-' {
		negative = true
		i++
	}
	whole := digitRun(s[i:])
	if whole == 0 || whole > 1 && s[i] == '0' {
		return Exact{}, ErrNotNumber
	}
	wholeDigits := s[i : i+whole]
	i += whole
	fraction := ""
	if i < len(s) && s[i] == '.' {
		n := digitRun(s[i+1:])
		if n == 0 {
			return Exact{}, ErrNotNumber
		}
		fraction = s[i+1 : i+1+n]
		i += 1 + n
	}
	exponent := 0
	if i < len(s) && (s[i] == 'e' || s[i] == 'E') {
		e := strings.TrimPrefix(s[i+1:], "+")
		d := strings.TrimPrefix(e, "-")
		if d == "" || digitRun(d) != len(d) || strings.HasPrefix(s[i+1:], "+-") {
			return Exact{}, ErrNotNumber
		}
		n, err := strconv.Atoi(e)
		if err != nil || n > MaxExponent || n < -MaxExponent {
			return Exact{}, ErrTooLong
		}
		exponent = n
		i = len(s)
	}
	if i != len(s) {
		return Exact{}, ErrNotNumber
	}
	if len(wholeDigits)+len(fraction) > MaxDigits {
		return Exact{}, ErrTooLong
	}
	x := scaled(wholeDigits, fraction, exponent)
	if negative {
		x = x.Neg()
	}
	return x, nil
}

func digitRun(s string) int {
	n := 0
	for n < len(s) && '0' <= s[n] && s[n] <= '9' {
		n++
	}
	return n
}

func scaled(whole, fraction string, exponent int) Exact {
	places := len(fraction) - exponent
	if len(whole)+len(fraction) <= 18 && 0 <= places && places <= 18 {
		n, _ := strconv.ParseInt(whole, 10, 64)
		for i := range len(fraction) {
			n = n*10 + int64(fraction[i]-'0')
		}
		return Exact{num: n, den: pow10[places]}
	}
	n, _ := new(big.Int).SetString(whole+fraction, 10)
	r := new(big.Rat).SetInt(n)
	scale := new(big.Rat).SetInt(bigPow10(abs(places)))
	if places >= 0 {
		return fromRat(r.Quo(r, scale))
	}
	return fromRat(r.Mul(r, scale))
}

var pow10 = func() (p [19]int64) {
	p[0] = 1
	for i := 1; i < len(p); i++ {
		p[i] = p[i-1] * 10
	}
	return p
}()

func abs(n int) int {
	if n < 0 {
		return -n
	}
	return n
}

func bigPow10(n int) *big.Int { return new(big.Int).Exp(big.NewInt(10), big.NewInt(int64(n)), nil) }

// Decimal reports the decimal places x needs to be written in full, and whether
// it can be: 1/3 cannot.
func (x Exact) Decimal() (places int, finite bool) {
	if x.big != nil {
		return x.big.FloatPrec()
	}
	places, finite = smallPlaces(x.d())
	if !finite || places > 0 {
		// Unreduced fractions may carry factors that cancel.
		return smallPlaces(x.Reduced().d())
	}
	return places, finite
}

func smallPlaces(d int64) (int, bool) {
	twos := bits.TrailingZeros64(uint64(d))
	d >>= twos
	fives := 0
	for d%5 == 0 {
		d /= 5
		fives++
	}
	return max(twos, fives), d == 1
}

// SignificantDigits is how many digits a number that has no finite decimal is given.
const SignificantDigits = 12

// AppendJSON appends x as a JSON number: a finite decimal in full, any other
// number rounded to [SignificantDigits], halves away from zero.
func (x Exact) AppendJSON(dst []byte) []byte {
	if short, ok, _ := x.appendFinite(dst); ok {
		return short
	}
	x = x.Reduced()
	short, ok, endless := x.appendFinite(dst)
	if ok {
		return short
	}
	if endless {
		if long, ok := x.appendSignificant(dst); ok {
			return long
		}
	}
	places, finite := x.Decimal()
	if !finite {
		places = x.placesFor(SignificantDigits)
	}
	start := len(dst)
	dst = x.appendRounded(dst, places, Nearest, finite)
	if !finite && places > 0 {
		// As in appendSignificant, a rounding to …0 needs no zeros. Rounded up, it may have one digit too many.
		return append(dst[:start], bytes.TrimSuffix(bytes.TrimRight(dst[start:], "0"), []byte("."))...)
	}
	return dst
}

// appendFinite appends a small number whose denominator has no factors but twos and
// fives; ok is false where it has others, which in lowest terms makes the decimal
// endless, or takes more than a machine word. The fraction need not be in lowest
// terms: the zeros that it brings are cut off the end.
func (x Exact) appendFinite(dst []byte) (short []byte, ok, endless bool) {
	if x.big != nil {
		return dst, false, false
	}
	places, finite := smallPlaces(x.d())
	if !finite {
		return dst, false, true
	}
	if places >= len(pow10) {
		return dst, false, false
	}
	n, ok := mul64(x.num, pow10[places])
	if !ok {
		return dst, false, false
	}
	n /= x.d()
	for places > 0 && n%10 == 0 {
		n /= 10
		places--
	}
	return appendPlaced(dst, n < 0, abs64(n), places), true, false
}

// String returns the text of [Exact.AppendJSON].
func (x Exact) String() string { return string(x.AppendJSON(nil)) }

// appendSignificant appends a small number without a finite decimal with
// [SignificantDigits]; ok is false where it takes more than two machine words.
func (x Exact) appendSignificant(dst []byte) (long []byte, ok bool) {
	if x.big != nil {
		return dst, false
	}
	n, d := abs64(x.num), uint64(x.d())
	places := SignificantDigits - 1
	for lead := n / d; lead >= 10; lead /= 10 {
		places--
	}
	if n < d {
		for places++; ; places++ {
			if places > 18 {
				return dst, false
			}
			if hi, lo := bits.Mul64(n, uint64(pow10[places-SignificantDigits+1])); hi > 0 || lo >= d {
				break
			}
		}
	}
	if places < 0 {
		return dst, false
	}
	hi, lo := bits.Mul64(n, uint64(pow10[places]))
	if hi >= d {
		return dst, false
	}
	q, rem := bits.Div64(hi, lo, d)
	if cmpHalf(rem, d) >= 0 {
		q++
	}
	for places > 0 && q%10 == 0 { // the digits that are given are all that is known, but a rounding to …0 needs no zeros
		q /= 10
		places--
	}
	return appendPlaced(dst, x.num < 0, q, places), true
}

// placesFor returns how many decimal places show n significant digits of x; negative to the left of the point.
func (x Exact) placesFor(n int) int {
	if x.IsZero() {
		return 0
	}
	r := x.rat()
	num, den := new(big.Int).Abs(r.Num()), r.Denom()
	// The decimal exponent from the lengths is right or one too large.
	e := len(num.String()) - len(den.String())
	scaledNum, scaledDen := num, den
	if e >= 0 {
		scaledDen = new(big.Int).Mul(den, bigPow10(e))
	} else {
		scaledNum = new(big.Int).Mul(num, bigPow10(-e))
	}
	if scaledNum.Cmp(scaledDen) < 0 {
		e--
	}
	return n - 1 - e
}

// Direction says how a number is rounded when it is shown with fewer digits than it has.
type Direction uint8

const (
	Nearest Direction = iota // halves away from zero
	Up                       // towards +∞: for a maximum, so that none looks lower than it is
	Down                     // towards −∞: for a minimum, so that none looks higher than it is
)

// Fixed returns x with exactly places decimals (0 to 100), rounded in the given
// direction, with an ASCII minus, and whether the text is x itself.
func (x Exact) Fixed(places int, dir Direction) (text string, exact bool) {
	text = string(x.appendRounded(nil, places, dir, false))
	n, finite := x.Decimal()
	return text, finite && n <= places
}

// appendRounded appends x rounded to places decimals; places may be negative. A
// result of −0 is written 0. If known, x is known to need no rounding.
func (x Exact) appendRounded(dst []byte, places int, dir Direction, known bool) []byte {
	if x.big == nil && 0 <= places && places <= 18 {
		d := x.d()
		if n, ok := mul64(x.num, pow10[places]); ok {
			q, rem := n/d, n%d
			if rem != 0 && !known {
				q += step(dir, rem < 0, cmpHalf(abs64(rem), uint64(d)))
			}
			return appendPlaced(dst, q < 0, abs64(q), places)
		}
	}
	r := x.rat()
	n, d := new(big.Int).Set(r.Num()), new(big.Int).Set(r.Denom())
	if places >= 0 {
		n.Mul(n, bigPow10(places))
	} else {
		d.Mul(d, bigPow10(-places))
	}
	q, rem := new(big.Int).QuoRem(n, d, new(big.Int))
	if rem.Sign() != 0 {
		twice := new(big.Int).Abs(rem)
		half := twice.Lsh(twice, 1).Cmp(d)
		q.Add(q, big.NewInt(step(dir, rem.Sign() < 0, half)))
	}
	if places < 0 {
		q.Mul(q, bigPow10(-places))
		places = 0
	}
	return appendDigits(dst, q.Sign() < 0, new(big.Int).Abs(q).Append(nil, 10), places)
}

// step returns what to add to a quotient truncated towards zero.
func step(dir Direction, negative bool, half int) int64 {
	switch {
	case dir == Up && !negative:
		return 1
	case dir == Down && negative:
		return -1
	case dir == Nearest && half >= 0:
		if negative {
			return -1
		}
		return 1
	}
	return 0
}

func cmpHalf(rem, d uint64) int {
	switch other := d - rem; {
	case rem > other:
		return 1
	case rem < other:
		return -1
	}
	return 0
}

// appendPlaced appends digits ÷ 10^places.
func appendPlaced(dst []byte, negative bool, digits uint64, places int) []byte {
	var buf [20]byte
	return appendDigits(dst, negative, strconv.AppendUint(buf[:0], digits, 10), places)
}

func appendDigits(dst []byte, negative bool, digits []byte, places int) []byte {
	if negative {
		dst = append(dst, '-')
	}
	whole := len(digits) - places
	if whole > 0 {
		dst = append(dst, digits[:whole]...)
		digits = digits[whole:]
	} else {
		dst = append(dst, '0')
	}
	if places > 0 {
		dst = append(dst, '.')
		for range -whole {
			dst = append(dst, '0')
		}
		dst = append(dst, digits...)
	}
	return dst
}
