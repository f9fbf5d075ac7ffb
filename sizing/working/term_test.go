package working

import (
	"testing"

	"rimeline/sizing/quantity"
)

func input(pointer, now string) *Input { return &Input{Pointer: pointer, Now: number(now)} }

func number(s string) quantity.Exact {
	x, err := quantity.Parse(s)
	if err != nil {
		panic(err)
	}
	return x
}

// Printed lines, worked by hand.
func TestStep(t *testing.T) {
	voc := new(Sheet).Of("Voc", "V", input("/voc", "37.32"))
	beta := new(Sheet).Of("β", "%/°C", input("/beta", "-0.27"))
	cold := new(Sheet).Of("Tcold", "°C", input("/cold", "-21"))
	fahrenheit := new(Sheet).Of("T,F", "°F", input("/cold", "7"))
	celsius := Named("T", "°C", fahrenheit.Minus(Whole(32)).Times(Whole(5)).Over(Whole(9)))
	fifth := Named("T", "°C", new(Sheet).Of("T,F", "°F", input("/cold", "5")).Minus(Whole(32)).Times(Whole(5)).Over(Whole(9)))
	five, three := Whole(5), Whole(3)
	third := Named("q", "", Whole(1).Over(three))

	cases := []struct {
		name                     string
		formula                  *Term
		expression, with, result string
	}{
		{"coefficient", voc.Times(Whole(1).Plus(beta.Over(Whole(100)).Times(cold.Minus(Whole(25))))),
			"Voc × (1 + β ÷ 100 × (Tcold − 25))", "37.32 × (1 + (−0.27) ÷ 100 × ((−21) − 25))", "41.955144"},
		{"a negative number that stands first", cold.Minus(Whole(25)), "Tcold − 25", "−21 − 25", "-46"},
		{"a result without a finite decimal stands as its sum", celsius.Minus(Whole(25)), "T − 25", "(7 − 32) × 5 ÷ 9 − 25", "-38.8888888889"},
		{"a sum in a product", Whole(2).Times(celsius), "2 × T", "2 × (7 − 32) × 5 ÷ 9", "-27.7777777778"},
		{"a quotient below the line", Whole(2).Over(third), "2 ÷ q", "2 ÷ (1 ÷ 3)", "6"},
		{"a quotient taken away", Whole(2).Minus(third), "2 − q", "2 − 1 ÷ 3", "1.66666666667"},
		{"a finite result stands as its value", Whole(2).Times(fifth), "2 × T", "2 × (−15)", "-30"},
		{"a difference taken away", five.Minus(three.Minus(Whole(1))), "5 − (3 − 1)", "5 − (3 − 1)", "3"},
		{"a quotient of a product", five.Over(three.Times(Whole(2))), "5 ÷ (3 × 2)", "5 ÷ (3 × 2)", "0.833333333333"},
		{"the greater", MaxOf(voc, cold), "max(Voc, Tcold)", "max(37.32, (−21))", "37.32"},
		{"the lesser", MinOf(voc, cold), "min(Voc, Tcold)", "min(37.32, (−21))", "-21"},
		{"whole numbers", FloorOf(Whole(1000).Over(voc)), "⌊1000 ÷ Voc⌋", "⌊1000 ÷ 37.32⌋", "26"},
		{"whole numbers upwards", CeilOf(Whole(1000).Over(voc)), "⌈1000 ÷ Voc⌉", "⌈1000 ÷ 37.32⌉", "27"},
		{"a factor of a table", voc.Times(Looked("F", number("1.2"))), "Voc × F", "37.32 × 1.2", "44.784"},
	}
	for _, c := range cases {
		got := Named("x", "V", c.formula).Step()
		if got.Expression != c.expression || got.WithNumbers != c.with || got.Value.String() != c.result {
			t.Errorf("%s:\n got %s = %s = %s\nwant %s = %s = %s", c.name, got.Expression, got.WithNumbers, got.Value, c.expression, c.with, c.result)
		}
	}
}

func TestJudge(t *testing.T) {
	yes, no := Known(true), Known(false)
	cases := []struct {
		name  string
		rules []Rule
		want  Verdict
	}{
		{"no rule", nil, Within},
		{"a rule without conditions always holds", []Rule{{Verdict: Unconfirmed}}, Unconfirmed},
		{"kept", []Rule{{Broken: [2]*Condition{no}, Verdict: Outside}}, Within},
		{"broken", []Rule{{Broken: [2]*Condition{yes}, Verdict: Outside}}, Outside},
		{"one of two", []Rule{{Broken: [2]*Condition{yes, no}, Verdict: Outside}}, Within},
		{"the worst counts", []Rule{{Broken: [2]*Condition{yes}, Verdict: Caution}, {Verdict: Unconfirmed}}, Unconfirmed},
	}
	for _, c := range cases {
		if got, _ := Judge(c.rules); got != c.want {
			t.Errorf("%s: %v, want %v", c.name, got, c.want)
		}
	}
}

// Equal is not broken: the law that every limit rests on.
func TestExceedsAtTheLimit(t *testing.T) {
	for _, c := range []struct {
		left, right string
		broken      bool
	}{
		{"1000", "1000", false},
		{"1000.0000000000000000000000000000000001", "1000", true},
		{"999.9999999999999999999999999999999999", "1000", false},
	} {
		if got := Exceeds(Number(number(c.left)), Number(number(c.right))).Broken(); got != c.broken {
			t.Errorf("%s exceeds %s: %v", c.left, c.right, got)
		}
	}
}

func TestTurns(t *testing.T) {
	// 12 × Voc × (1 + β ÷ 100 × (T − 25)) against 1000, closed forms by hand.
	n := &Input{Pointer: "/n", Now: number("12"), Whole: true}
	voc, beta := input("/voc", "40"), input("/beta", "-0.25")
	cold := input("/cold", "-15")
	cold.Low = new(number("-90"))
	limit := input("/limit", "1000")
	string12 := new(Sheet).Of("n", "", n).Times(new(Sheet).Of("Voc", "V", voc)).Times(Whole(1).Plus(new(Sheet).Of("β", "", beta).Over(Whole(100)).Times(new(Sheet).Of("T", "°C", cold).Minus(Whole(25)))))
	over := Exceeds(string12, new(Sheet).Of("limit", "V", limit))

	// Voc above 60 V is doubtful: nearer than the limit, and it turns to another verdict.
	doubt := Exceeds(new(Sheet).Of("Voc", "V", voc), Whole(60))
	marked, gained := input("/marked", "11"), input("/isc", "10")
	greater := MaxOf(new(Sheet).Of("Isc", "A", gained), new(Sheet).Of("marked", "A", marked))

	cases := []struct {
		name  string
		rules []Rule
		want  map[string]string
	}{
		{"one condition", []Rule{{Broken: [2]*Condition{over}, Verdict: Outside}}, map[string]string{
			"/n":     "23",             // 22 × 44 = 968, 23 × 44 = 1012
			"/voc":   "75.7575757576",  // 1000 ÷ 12 ÷ 1.1
			"/beta":  "-2.70833333333", // (1000 ÷ 480 − 1) × 100 ÷ (−40)
			"/limit": "528",
			// T = 25 + (1000 ÷ 480 − 1) × 100 ÷ (−0.25) is −408.3 °C, colder than any site
		}},
		{"a doubt comes first", []Rule{{Broken: [2]*Condition{over}, Verdict: Outside}, {Broken: [2]*Condition{doubt}, Verdict: Unconfirmed, Doubt: true}},
			map[string]string{"/n": "23", "/voc": "60", "/beta": "-2.70833333333", "/limit": "528"}},
		{"hidden behind what is worse", []Rule{{Broken: [2]*Condition{over}, Verdict: Caution}, {Verdict: Unconfirmed}}, map[string]string{}},
		{"the greater of two", []Rule{{Broken: [2]*Condition{Exceeds(greater, Whole(15))}, Verdict: Outside}},
			map[string]string{"/isc": "15", "/marked": "15"}},
		{"the lower of two cannot turn what the greater breaks", []Rule{{Broken: [2]*Condition{Exceeds(greater, number5())}, Verdict: Outside}},
			map[string]string{}},
		{"the greater alone breaks", []Rule{{Broken: [2]*Condition{Exceeds(greater, Number(number("10.5")))}, Verdict: Outside}},
			map[string]string{"/marked": "10.5"}},
		{"all of several", []Rule{{Broken: [2]*Condition{over, Known(true)}, Verdict: Caution}}, map[string]string{
			"/n": "23", "/voc": "75.7575757576", "/beta": "-2.70833333333", "/limit": "528"}},
	}
	for _, c := range cases {
		turns := Turns(c.rules)
		got := map[string]string{}
		for _, turn := range turns {
			got[turn.Pointer] = turn.At.String()
		}
		if len(got) != len(c.want) {
			t.Errorf("%s: got %v, want %v", c.name, got, c.want)
		}
		for pointer, at := range c.want {
			if got[pointer] != at {
				t.Errorf("%s: %s turns at %q, want %s", c.name, pointer, got[pointer], at)
			}
		}
	}
}

func number5() *Term { return Number(number("5")) }
