package quantity

import (
	"errors"
	"math"
	"math/big"
	"regexp"
	"strings"
	"testing"
)

func TestParse(t *testing.T) {
	tests := []struct{ text, want string }{
		{"0", "0"}, {"-0", "0"}, {"0.0", "0"}, {"12.0", "12"}, {"-21.0", "-21"}, {"37.32", "37.32"},
		{"1e3", "1000"}, {"1E+3", "1000"}, {"1.5e-3", "0.0015"}, {"-1e-30", "-0.000000000000000000000000000001"},
		{"1e30", "1000000000000000000000000000000"},
		{"0.000000000000000000000000000000000000001", "0.000000000000000000000000000000000000001"}, // 40 digits
		{strings.Repeat("9", 40), strings.Repeat("9", 40)},
		{"9223372036854775807", "9223372036854775807"},
		{"-9223372036854775808", "-9223372036854775808"},
		{"1e-0000000000000000000000000000000000000000030", "0.000000000000000000000000000001"}, // the exponent is small, if long
	}
	for _, tt := range tests {
		x, err := Parse(tt.text)
		if err != nil || x.String() != tt.want {
			t.Errorf("Parse(%s) = %v, %v, want %s", tt.text, x, err, tt.want)
		}
	}
}

func TestParse_Refused(t *testing.T) {
	tests := []struct {
		text string
		want error
	}{
		{"", ErrNotNumber}, {"-", ErrNotNumber}, {"+1", ErrNotNumber}, {"01", ErrNotNumber}, {"-01", ErrNotNumber},
		{"1.", ErrNotNumber}, {".5", ErrNotNumber}, {"1e", ErrNotNumber}, {"1e+", ErrNotNumber}, {"1e+-1", ErrNotNumber},
		{"1e-+1", ErrNotNumber}, {"1e1.5", ErrNotNumber}, {"1 ", ErrNotNumber}, {" 1", ErrNotNumber}, {"0x10", ErrNotNumber},
		{"NaN", ErrNotNumber}, {"Infinity", ErrNotNumber}, {"1,5", ErrNotNumber}, {"−1", ErrNotNumber}, {"1_000", ErrNotNumber},
		{"1e31", ErrTooLong}, {"1e-31", ErrTooLong}, {"1e99999999999999999999", ErrTooLong},
		{strings.Repeat("9", 41), ErrTooLong}, {"0." + strings.Repeat("0", 40), ErrTooLong},
	}
	for _, tt := range tests {
		if x, err := Parse(tt.text); !errors.Is(err, tt.want) {
			t.Errorf("Parse(%q) = %v, %v, want %v", tt.text, x, err, tt.want)
		}
	}
}

var jsonNumber = regexp.MustCompile(`^-?(0|[1-9][0-9]*)(\.[0-9]+)?([eE][+-]?[0-9]+)?$`)

// FuzzParse holds Parse against the grammar of JSON and against math/big.
func FuzzParse(f *testing.F) {
	for _, s := range []string{"0", "-0.27", "12.0", "1e30", "1E-30", "9223372036854775808", "0.1e1", "01", "1e+-1", strings.Repeat("1", 41)} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, s string) {
		x, err := Parse(s)
		if grammatical := jsonNumber.MatchString(s); grammatical == errors.Is(err, ErrNotNumber) {
			t.Fatalf("Parse(%q): %v; is it a JSON number: %v", s, err, grammatical)
		}
		if err != nil {
			return
		}
		want, ok := new(big.Rat).SetString(s)
		if !ok || x.Rat().Cmp(want) != 0 {
			t.Fatalf("Parse(%q) = %v, want %v", s, x.Rat(), want)
		}
		back, ok := new(big.Rat).SetString(x.String())
		if !ok || back.Cmp(want) != 0 {
			t.Fatalf("Parse(%q) is written %s", s, x)
		}
	})
}

// TestFixed holds the three roundings against their definitions.
func TestFixed(t *testing.T) {
	for _, a := range samples(600) {
		for _, places := range []int{0, 1, 2, 7, 18, 19, 40} {
			unit := new(big.Rat).SetFrac(big.NewInt(1), bigPow10(places))
			half := new(big.Rat).Quo(unit, big.NewRat(2, 1))
			for _, dir := range []Direction{Nearest, Up, Down} {
				text, exact := a.x.Fixed(places, dir)
				got, ok := new(big.Rat).SetString(text)
				_, decimals, _ := strings.Cut(text, ".")
				if !ok || len(decimals) != places || strings.HasPrefix(text, "-") && got.Sign() == 0 {
					t.Fatalf("Fixed(%v, %d, %d) = %s", a.want, places, dir, text)
				}
				if exact != (got.Cmp(a.want) == 0) {
					t.Fatalf("Fixed(%v, %d, %d) = %s, exact: %v", a.want, places, dir, text, exact)
				}
				off := new(big.Rat).Sub(got, a.want) // above 0: rounded up
				size := new(big.Rat).Abs(off)
				wrong := false
				switch dir {
				case Up:
					wrong = off.Sign() < 0 || size.Cmp(unit) >= 0
				case Down:
					wrong = off.Sign() > 0 || size.Cmp(unit) >= 0
				case Nearest:
					wrong = size.Cmp(half) > 0 || size.Cmp(half) == 0 && off.Sign() != a.want.Sign()
				}
				if wrong {
					t.Fatalf("Fixed(%v, %d, %d) = %s, off by %v", a.want, places, dir, text, off)
				}
			}
		}
	}
}

// TestAppendJSON: a finite decimal in full, any other number to 12 significant digits.
func TestAppendJSON(t *testing.T) {
	tests := []struct {
		x    Exact
		want string
	}{
		{Exact{}, "0"},
		{Int(-12), "-12"},
		{Exact{num: 120, den: 10}, "12"},
		{Ratio(1, 3), "0.333333333333"},
		{Ratio(-2, 3), "-0.666666666667"},
		{Ratio(200, 3), "66.6666666667"},
		{Ratio(2, 3_000_000), "0.000000666666666667"},
		{Exact{num: 3, den: 6}, "0.5"}, // not in lowest terms
		{Ratio(1, 1<<40), "0.0000000000009094947017729282379150390625"},
		{Ratio(2_999_999_999_999, 3_000_000_000_000), "1"}, // rounded; the zeros say nothing
		{Ratio(29_999_999_999_999, 3_000_000_000_000), "10"},
		{Ratio(math.MaxInt64-1, math.MaxInt64), "1"}, // the same beyond two words
		{Int(1e18).Quo(Int(3)), "333333333333000000"},
	}
	for _, tt := range tests {
		if got := tt.x.String(); got != tt.want {
			t.Errorf("%v is written %s, want %s", tt.x.Rat(), got, tt.want)
		}
	}
	for _, a := range samples(2000) {
		text := string(a.x.AppendJSON([]byte("x")))[1:]
		got, ok := new(big.Rat).SetString(text)
		if !ok || !jsonNumber.MatchString(text) {
			t.Fatalf("%v is written %s, which is no JSON number", a.want, text)
		}
		if _, finite := a.want.FloatPrec(); finite {
			if got.Cmp(a.want) != 0 {
				t.Fatalf("%v is written %s, which is another number", a.want, text)
			}
			continue
		}
		// Half a unit in the 12th digit is at most 5 × 10⁻¹² of the number.
		off := new(big.Rat).Sub(got, a.want)
		off.Quo(off, a.want).Abs(off)
		if off.Cmp(big.NewRat(5, 1e12)) > 0 {
			t.Fatalf("%v is written %s", a.want, text)
		}
		digits := strings.TrimLeft(onlyDigits(text), "0")
		if strings.Contains(text, ".") && len(digits) > SignificantDigits {
			t.Fatalf("%v is written %s, with %d significant digits", a.want, text, len(digits))
		}
	}
}

func TestDecimal(t *testing.T) {
	for _, a := range samples(2000) {
		places, finite := a.x.Decimal()
		wantPlaces, wantFinite := a.want.FloatPrec()
		if finite != wantFinite || finite && places != wantPlaces {
			t.Fatalf("Decimal of %v = %d, %v, want %d, %v", a.want, places, finite, wantPlaces, wantFinite)
		}
	}
}

func BenchmarkParse(b *testing.B) {
	b.ReportAllocs()
	for b.Loop() {
		if _, err := Parse("-0.27"); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkAppendJSON(b *testing.B) {
	x := parsed("964.968312")
	buffer := make([]byte, 0, 64)
	b.ReportAllocs()
	for b.Loop() {
		buffer = x.AppendJSON(buffer[:0])
	}
}
