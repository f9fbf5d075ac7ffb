package quantity

import (
	"errors"
	"strings"
	"testing"
)

func TestTyped(t *testing.T) {
	tests := []struct{ typed, number, unit string }{
		{"−0.27", "-0.27", ""},   // U+2212
		{"–0.27", "-0.27", ""},   // en dash
		{"‑0.27", "-0.27", ""},   // no-break hyphen
		{"-0,27", "-0.27", ""},   // a decimal comma
		{"-0,270", "-0.270", ""}, // no thousand begins with 0
		{"0,048", "0.048", ""},
		{"49,5", "49.5", ""},
		{"37,3200", "37.3200", ""},
		{"1234,567", "1234.567", ""}, // four digits are no first group of thousands
		{"9.435", "9.435", ""},       // a point is the decimal point, always
		{"1.000", "1.000", ""},
		{"49.5V", "49.5", "V"},
		{"49.5 V", "49.5", "V"},
		{"49.5\u00a0V", "49.5", "V"},
		{"\u200e−0.27\u2009%/°C\u200b ", "-0.27", "%/°C"},
		{"− 0.27 % / K", "-0.27", "%/K"},
		{"-0.29%/ºC", "-0.29", "%/°C"}, // the ordinal sign of some keyboards
		{"7℉", "7", "°F"},
		{"\t+12.0\r\n", "12.0", ""},
		{"1\u202f000", "1000", ""}, // thin and no-break spaces set thousands apart
		{"12\u00a0000,5 W", "12000.5", "W"},
		{".5", "0.5", ""},
		{"-,5", "-0.5", ""},
		{"007", "7", ""},
		{"-0", "-0", ""},
		{"1e3", "1e3", ""},
		{"1.5E+3 W", "1.5e3", "W"},
		{"1e−3", "1e-3", ""},
		{"5 mV/°C", "5", "mV/°C"},
	}
	for _, tt := range tests {
		got, err := Typed(tt.typed)
		if err != nil {
			t.Errorf("Typed(%q): %v", tt.typed, err)
			continue
		}
		want, err := Parse(tt.number)
		if err != nil {
			t.Fatal(err)
		}
		if got.Number != tt.number || got.Unit != tt.unit || !got.Value.Equal(want) {
			t.Errorf("Typed(%q) = %v %q %q, want %q %q", tt.typed, got.Value, got.Number, got.Unit, tt.number, tt.unit)
		}
	}
}

func TestTyped_Refused(t *testing.T) {
	tests := []struct{ typed, says string }{
		{"1,000", "it could be 1000 or 1.000"},
		{"-37,320 V", "it could be -37320 or -37.320"},
		{"1.000,5", "write 1000.5 if that is meant"},
		{"1,000.5", "write 1000.5 if that is meant"},
		{"1,234,567", "without , between the digits: 1234567"},
		{"1.234.567", "without . between the digits: 1234567"},
		{"1'000", "without ' between the digits: 1000"},
		{"1 000", "it could be 1000, or two numbers"},
		{"-37 320", "it could be -37320, or two numbers"},
		{"1\u202f00", "1 and 00 do not make one number"},
		{"1234\u202f000", "do not make one number"},
		{"1,00,000", "cannot both be decimal signs"},
		{"12,5.", "cannot both be decimal signs"},
		{"12.", "a digit is missing"},
		{"12..5", "a digit is missing"},
		{"abc", "no number"},
		{"V 49.5", "no number"},
		{"-", "no number"},
		{".", "no number"},
		{"½", "no number"},
		{"NaN", "no number"},
		{"—5", "a long dash is no minus"},
		{"\u00ad5", "soft hyphen"},
		{"--5", "more than one sign"},
		{"+−5", "more than one sign"},
		{"±5", "no single number"},
		{"\u202e5-", "no number"}, // right-to-left override: seen as -5
		{"45 ± 2 °C", "no unit"},
		{"5-6", "no unit"},
		{"1/2", "more than one number"},
		{"13.95 410", "more than one number"},
		{"7 °F (−14 °C)", "no unit"},
		{"1e31", ErrTooLong.Error()},
		{strings.Repeat("9", 41), ErrTooLong.Error()},
		{"1" + strings.Repeat("\u202f000", 100_000), ErrTooLong.Error()},
	}
	for _, tt := range tests {
		got, err := Typed(tt.typed)
		if err == nil || !strings.Contains(err.Error(), tt.says) {
			t.Errorf("Typed(%.40q) = %q, %v, want an error with %q", tt.typed, got.Number, err, tt.says)
		}
	}
}

func TestTyped_Blank(t *testing.T) {
	for _, text := range []string{"", "  ", "\u00a0\t", "\u200b\ufeff"} {
		if _, err := Typed(text); err != ErrBlank {
			t.Errorf("Typed(%q): %v, want ErrBlank", text, err)
		}
	}
}

// Each reading that an ambiguous text is offered must itself be read one way only.
func TestTyped_ReadingsAreClear(t *testing.T) {
	for _, text := range []string{"1,000", "12,345", "-999,001 V"} {
		_, err := Typed(text)
		var ambiguous *AmbiguousError
		if !errors.As(err, &ambiguous) {
			t.Fatalf("Typed(%q): %v, want an AmbiguousError", text, err)
		}
		a, errA := Typed(ambiguous.Readings[0])
		b, errB := Typed(ambiguous.Readings[1])
		if errA != nil || errB != nil || a.Value.Equal(b.Value) {
			t.Errorf("Typed(%q) offers %q (%v) and %q (%v)", text, ambiguous.Readings[0], errA, ambiguous.Readings[1], errB)
		}
	}
}

// FuzzTyped: whatever is typed, what comes back is a JSON number of the same
// value, its digits are those typed in their order, and it is negative only if a
// minus was typed.
func FuzzTyped(f *testing.F) {
	for _, s := range []string{"−0.27 %/°C", "-0,27", "1,000", "1\u202f000,5", "49.5V", "1e−3", "± 5", "\u00ad5", ".5", "\xff1"} {
		f.Add(s)
	}
	f.Fuzz(func(t *testing.T, text string) {
		got, err := Typed(text)
		if err != nil {
			return
		}
		value, err := Parse(got.Number)
		if err != nil || !value.Equal(got.Value) {
			t.Fatalf("Typed(%q) = %v and %q: %v", text, got.Value, got.Number, err)
		}
		if got, want := strings.TrimLeft(onlyDigits(got.Number), "0"), strings.TrimLeft(onlyDigits(text), "0"); got != want {
			t.Fatalf("Typed(%q) has the digits %q, want %q", text, got, want)
		}
		if mantissa, _, _ := strings.Cut(got.Number, "e"); strings.HasPrefix(mantissa, "-") != startsWithMinus(text) {
			t.Fatalf("Typed(%q) = %q: the sign is not the one typed", text, got.Number)
		}
		again, err := Typed(got.Number + got.Unit)
		if err != nil || again != (Reading{again.Value, got.Number, got.Unit}) || !again.Value.Equal(got.Value) {
			t.Fatalf("Typed(%q) = %q %q, read again %q %q, %v", text, got.Number, got.Unit, again.Number, again.Unit, err)
		}
	})
}

func onlyDigits(s string) string {
	return strings.Map(func(r rune) rune {
		if '0' <= r && r <= '9' {
			return r
		}
		return -1
	}, s)
}

// startsWithMinus reports whether one of the minus signs stands before the first digit or decimal sign.
func startsWithMinus(s string) bool {
	for _, r := range s {
		switch {
		case strings.ContainsRune("-−–‐‑‒﹣－", r):
			return true
		case '0' <= r && r <= '9' || r == '.' || r == ',':
			return false
		}
	}
	return false
}

func BenchmarkTyped(b *testing.B) {
	b.ReportAllocs()
	for b.Loop() {
		if _, err := Typed("−0.27 %/°C"); err != nil {
			b.Fatal(err)
		}
	}
}
