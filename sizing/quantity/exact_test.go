package quantity

import (
	"math"
	"math/big"
	"math/rand/v2"
	"testing"
)

// samples returns n numbers of every make: small, fractions that are not in lowest
// terms, at the edge of two machine words, beyond it, and the zero value. Each
// comes with its value by math/big, found another way.
func samples(n int) []sample {
	r := rand.New(rand.NewPCG(1, 2))
	edge := []int64{0, 1, -1, 2, 9, 10, 1 << 31, 1 << 32, math.MaxInt64, math.MaxInt64 - 1, -math.MaxInt64, math.MaxInt64 / 2, 1e18, -1e18, 3037000499, 3037000500}
	whole := func() int64 {
		switch r.IntN(4) {
		case 0:
			return edge[r.IntN(len(edge))]
		case 1:
			return r.Int64N(2001) - 1000
		case 2:
			return r.Int64N(1e12) - 5e11
		}
		return r.Int64() - r.Int64()
	}
	list := []sample{
		{Exact{}, new(big.Rat)},
		{Int(math.MinInt64), new(big.Rat).SetInt64(math.MinInt64)},
		{Int(math.MaxInt64), new(big.Rat).SetInt64(math.MaxInt64)},
		{Exact{num: 0, den: 7}, new(big.Rat)},
		{Exact{num: 120, den: 10}, big.NewRat(12, 1)},
	}
	for len(list) < n {
		num, den := whole(), whole()
		if den == 0 || num == math.MinInt64 || den == math.MinInt64 {
			continue
		}
		want := big.NewRat(num, den)
		switch r.IntN(3) {
		case 0: // as it stands, perhaps not in lowest terms
			if den < 0 {
				num, den = -num, -den
			}
			list = append(list, sample{Exact{num: num, den: den}, want})
		case 1:
			list = append(list, sample{Ratio(num, den), want})
		case 2: // beyond two words
			factor := big.NewRat(r.Int64(), 1+r.Int64N(1000))
			want.Mul(want, factor)
			list = append(list, sample{FromRat(want), want})
		}
	}
	return list
}

type sample struct {
	x    Exact
	want *big.Rat
}

func TestArithmetic(t *testing.T) {
	list := samples(200)
	check := func(op string, a, b sample, got Exact, want *big.Rat) {
		t.Helper()
		if got.Rat().Cmp(want) != 0 {
			t.Fatalf("%v %s %v = %v, want %v", a.want, op, b.want, got.Rat(), want)
		}
		if got.big == nil && (got.d() <= 0 || got.num == minInt64) {
			t.Fatalf("%v %s %v = %#v, which breaks the promise of two words", a.want, op, b.want, got)
		}
	}
	for _, a := range list {
		for _, b := range list {
			check("+", a, b, a.x.Add(b.x), new(big.Rat).Add(a.want, b.want))
			check("−", a, b, a.x.Sub(b.x), new(big.Rat).Sub(a.want, b.want))
			check("×", a, b, a.x.Mul(b.x), new(big.Rat).Mul(a.want, b.want))
			if b.want.Sign() != 0 {
				check("÷", a, b, a.x.Quo(b.x), new(big.Rat).Quo(a.want, b.want))
			}
			order := a.want.Cmp(b.want)
			if got := a.x.Cmp(b.x); got != order {
				t.Fatalf("%v Cmp %v = %d, want %d", a.want, b.want, got, order)
			}
			if a.x.Less(b.x) != (order < 0) || a.x.Equal(b.x) != (order == 0) {
				t.Fatalf("%v and %v: Less and Equal disagree with Cmp", a.want, b.want)
			}
			greater, lesser := a.want, b.want
			if order < 0 {
				greater, lesser = lesser, greater
			}
			check("Max", a, b, Max(a.x, b.x), greater)
			check("Min", a, b, Min(a.x, b.x), lesser)
		}
	}
}

func TestOneNumber(t *testing.T) {
	one := big.NewInt(1)
	for _, a := range samples(2000) {
		equal := func(op string, got Exact, want *big.Rat) {
			t.Helper()
			if got.Rat().Cmp(want) != 0 {
				t.Fatalf("%s %v = %v, want %v", op, a.want, got.Rat(), want)
			}
		}
		equal("Neg", a.x.Neg(), new(big.Rat).Neg(a.want))
		equal("Abs", a.x.Abs(), new(big.Rat).Abs(a.want))
		equal("FromRat", FromRat(a.want), a.want)
		// x − 1 < ⌊x⌋ ≤ x ≤ ⌈x⌉ < x + 1, all of them whole
		floor, ceil := a.x.Floor().Rat(), a.x.Ceil().Rat()
		if !floor.IsInt() || floor.Cmp(a.want) > 0 || new(big.Rat).Sub(a.want, floor).Cmp(new(big.Rat).SetInt(one)) >= 0 {
			t.Fatalf("Floor %v = %v", a.want, floor)
		}
		if !ceil.IsInt() || ceil.Cmp(a.want) < 0 || new(big.Rat).Sub(ceil, a.want).Cmp(new(big.Rat).SetInt(one)) >= 0 {
			t.Fatalf("Ceil %v = %v", a.want, ceil)
		}
		if a.x.Sign() != a.want.Sign() || a.x.IsZero() != (a.want.Sign() == 0) || a.x.IsWhole() != a.want.IsInt() {
			t.Fatalf("Sign, IsZero or IsWhole of %v is wrong", a.want)
		}
		n, ok := a.x.Int64()
		if fits := a.want.IsInt() && a.want.Num().IsInt64(); ok != fits || ok && n != a.want.Num().Int64() {
			t.Fatalf("Int64 of %v = %d, %v", a.want, n, ok)
		}
	}
}

// Immutability: what Rat returns and FromRat takes is the caller's own.
func TestRatIsACopy(t *testing.T) {
	r, _ := new(big.Rat).SetString("123456789012345678901234567890")
	x := FromRat(r)
	r.SetInt64(1)
	x.Rat().SetInt64(2)
	if got := x.String(); got != "123456789012345678901234567890" {
		t.Errorf("the number changed to %s", got)
	}
}

func TestDivisionByZeroPanics(t *testing.T) {
	for name, divide := range map[string]func(){
		"Quo":              func() { Int(1).Quo(Exact{}) },
		"Ratio":            func() { Ratio(1, 0) },
		"an unreduced one": func() { Int(1).Quo(Exact{num: 0, den: 7}) },
	} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("%s by 0 did not panic", name)
				}
			}()
			divide()
		}()
	}
}

// The sums of a design cost no allocation while they fit into two words.
func TestSmallNumbersDoNotAllocate(t *testing.T) {
	voc, beta, cold := parsed("37.32"), parsed("-0.27"), Int(-21)
	buffer := make([]byte, 0, 64)
	allocations := testing.AllocsPerRun(100, func() {
		factor := Int(1).Add(beta.Quo(Int(100)).Mul(cold.Sub(Int(25))))
		v := voc.Mul(factor).Mul(Int(23))
		if Int(1000).Less(v) {
			t.Error("23 modules exceed 1000 V")
		}
		buffer = v.AppendJSON(buffer[:0])
	})
	if allocations != 0 {
		t.Errorf("%v allocations, want none", allocations)
	}
	// 37.32 × (1 + (−0.27 ÷ 100) × (−21 − 25)) × 23, by hand: 37.32 × 1.1242 × 23 = 964.968312
	if got := string(buffer); got != "964.968312" {
		t.Errorf("got %s, want 964.968312", got)
	}
}

func parsed(text string) Exact {
	x, err := Parse(text)
	if err != nil {
		panic(err)
	}
	return x
}

func BenchmarkColdVoltage(b *testing.B) {
	voc, beta, cold := parsed("37.32"), parsed("-0.27"), Int(-21)
	b.ReportAllocs()
	for b.Loop() {
		if v := voc.Mul(Int(1).Add(beta.Quo(Int(100)).Mul(cold.Sub(Int(25))))); Int(1000).Less(v) {
			b.Fatal(v)
		}
	}
}
