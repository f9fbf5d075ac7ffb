package display

import (
	"math/rand/v2"
	"strings"
	"testing"

	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
)

func exact(tb testing.TB, s string) quantity.Exact {
	tb.Helper()
	x, err := quantity.Parse(s)
	if err != nil {
		tb.Fatalf("%q: %v", s, err)
	}
	return x
}

func TestNumbers(t *testing.T) {
	x := func(s string) quantity.Exact { return exact(t, s) }
	for _, test := range []struct{ name, got, want string }{
		{"a maximum is rounded up", stringVolts(x("503.41"), quantity.Up), "503.5 V"},
		{"by the last digit there is", stringVolts(x("503.4000000001"), quantity.Up), "503.5 V"},
		{"what needs no rounding is not rounded", stringVolts(x("503.4"), quantity.Up), "503.4 V"},
		{"a minimum is rounded down", stringVolts(x("311.99"), quantity.Down), "311.9 V"},
		{"down is down below zero too", stringVolts(x("-0.01"), quantity.Down), "−0.1 V"},
		{"one module has two places", moduleVolts(x("41.955144"), quantity.Up), "41.96 V"},
		{"amperes have two places", amperes(x("34.875"), quantity.Up), "34.88 A"},
		{"a temperature has °F beside it", degrees(x("-36.08"), quantity.Up), "−36.0 °C (−32.9 °F)"}, // −36.08 × 1.8 + 32 = −32.944
		{"−40 is −40", wholeDegrees(-40), "−40 °C (−40 °F)"},
		{"−60 °C", wholeDegrees(-60), "−60 °C (−76 °F)"},
		{"a difference has no 32 in it", degreesApart(x("15.08"), quantity.Down), "15.0 °C (27.1 °F)"}, // 15.08 × 1.8 = 27.144
		{"as stated, every digit", statedIn(x("26.0450"), "A"), "26.045 A"},
		{"an angle", statedIn(x("30"), "°"), "30°"},
		{"no unit", statedIn(x("12"), ""), "12"},
		{"stated in °C", statedDegrees(design.Temperature{Value: x("-21")}), "−21 °C (−5.8 °F)"},
		{"stated in °F", statedDegrees(design.Temperature{Value: x("-6"), Fahrenheit: true}), "−6 °F (−21.1 °C)"}, // −38 × 5 ÷ 9 = −21.11
		{"a difference stated in °F", statedDifference(design.Difference{Value: x("54"), Fahrenheit: true}), "54 °F (30.0 °C)"},
		{"one", countModules(1), "1 module"},
		{"none", countStrings(0), "0 strings"},
		{"kilowatts keep the watt", kilowatts(x("15170")), "15.170 kW"},
		{"a list of one", list([]string{"a"}), "a"},
		{"a list of three", list([]string{"a", "b", "c"}), "a, b and c"},
		{"a capital", capital("south plane"), "South plane"},
		{"no capital where there is none", capital("βVoc"), "βVoc"},
	} {
		want := strings.NewReplacer(" V", nbsp+"V", " A", nbsp+"A", " °", nbsp+"°", " kW", nbsp+"kW", "1 module", "1"+nbsp+"module", "0 strings", "0"+nbsp+"strings").Replace(test.want)
		if test.got != want {
			t.Errorf("%s: %q, want %q", test.name, test.got, want)
		}
	}
}

// No shown number looks safer than the number is.
func TestRoundingNeverFlatters(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	for range 20_000 {
		x := quantity.Ratio(r.Int64N(2_000_000)-1_000_000, 1+r.Int64N(100_000))
		places := r.IntN(4)
		up := exact(t, strings.ReplaceAll(shown(x, places, quantity.Up), minus, "-"))
		down := exact(t, strings.ReplaceAll(shown(x, places, quantity.Down), minus, "-"))
		if up.Less(x) || x.Less(down) {
			t.Fatalf("%s with %d places is shown as %s up and %s down", x, places, up, down)
		}
	}
}
