package rulebook

import (
	"testing"

	"rimeline/sizing/quantity"
)

func decimal(t *testing.T, s string) quantity.Exact {
	t.Helper()
	x, err := quantity.Parse(s)
	if err != nil {
		t.Fatal(err)
	}
	return x
}

// The rows as the handbook tables print them. Source: NEC Table 690.7(A); rows at
// 9 °C and colder as in a DC device maker's manual, warmer rows from memory.
func TestColdFactorAt(t *testing.T) {
	cases := []struct{ celsius, want string }{
		{"60", "1"}, {"25", "1"},
		{"24.999", "1.02"}, {"24.5", "1.02"}, {"24", "1.02"}, {"20", "1.02"},
		{"19.9", "1.04"}, {"19", "1.04"}, {"15", "1.04"},
		{"14", "1.06"}, {"10", "1.06"},
		{"9", "1.08"}, {"5", "1.08"},
		{"4", "1.1"}, {"0", "1.1"},
		{"-0.1", "1.12"}, {"-1", "1.12"}, {"-5", "1.12"},
		{"-5.4", "1.14"}, {"-6", "1.14"}, {"-10", "1.14"},
		{"-11", "1.16"}, {"-15", "1.16"},
		{"-16", "1.18"}, {"-20", "1.18"},
		{"-20.5", "1.2"}, {"-21", "1.2"}, {"-25", "1.2"},
		{"-26", "1.21"}, {"-30", "1.21"},
		{"-31", "1.23"}, {"-35", "1.23"},
		{"-36", "1.25"}, {"-40", "1.25"},
	}
	for _, b := range All() {
		for _, c := range cases {
			row, ok := b.ColdFactorAt(decimal(t, c.celsius))
			if !ok || row.Factor.String() != c.want {
				t.Errorf("%s: factor at %s °C = %v (%v), want %s", b.ID, c.celsius, row.Factor, ok, c.want)
			}
		}
		if row, ok := b.ColdFactorAt(decimal(t, "-40.0001")); ok {
			t.Errorf("%s: the table answers %v below −40 °C, where it is silent", b.ID, row.Factor)
		}
	}
}

// A changed digit shows as a changed sum: 14 factors, 1.00 to 1.25, added by hand: 6.30 + 5.80 + 3.69 = 15.79.
func TestTableSums(t *testing.T) {
	for _, b := range All() {
		sum := quantity.Int(0)
		previous := ColdFactor{LowerC: 26, Factor: quantity.Ratio(99, 100)}
		for _, row := range b.ColdFactors {
			if row.LowerC >= previous.LowerC || row.Factor.Cmp(previous.Factor) <= 0 {
				t.Errorf("%s: row %d °C does not follow %d °C with a greater factor", b.ID, row.LowerC, previous.LowerC)
			}
			sum, previous = sum.Add(row.Factor), row
		}
		if got := sum.String(); got != "15.79" {
			t.Errorf("%s: the factors add to %s, want 15.79", b.ID, got)
		}
		total := int64(0)
		for i, r := range b.StandardRatings {
			if i > 0 && r <= b.StandardRatings[i-1] {
				t.Errorf("%s: rating %d A does not follow %d A", b.ID, r, b.StandardRatings[i-1])
			}
			total += r
		}
		// NEC 240.6(A), from memory. By hand: 20 (1 to 10 A) + 660 (15 to 100) + 1235 (110 to 250)
		// + 3201 (300 to 601) + 27800 (700 to 6000).
		if total != 32916 {
			t.Errorf("%s: the standard ratings add to %d A", b.ID, total)
		}
	}
}

func TestCeilings(t *testing.T) {
	// Source: NEC 690.7; R. Mayfield, North American Clean Energy, 15 Nov 2022.
	want := map[string]int64{"one-or-two-family-dwelling": 600, "other-building": 1000, "ground-mounted": 1500}
	for _, b := range All() {
		for structure, maxV := range want {
			c, ok := b.Ceiling(structure)
			switch {
			case b.ID == "iec-62548-1" && ok:
				t.Errorf("%s sets a ceiling of its own, %d V", b.ID, c.MaxV)
			case b.ID != "iec-62548-1" && c.MaxV != maxV:
				t.Errorf("%s: %s = %d V, want %d V", b.ID, structure, c.MaxV, maxV)
			}
		}
	}
}

func TestRatings(t *testing.T) {
	b := Find("nec-2023")
	cases := []struct{ ampere, up, down string }{
		{"14.375", "15", "10"}, // 1.5625 × 9.2 A: an equipment maker's manual, p. 39, rounds to 14.4 A
		{"19.1875", "20", "15"},
		{"20", "20", "20"},
		{"20.0001", "25", "20"},
		{"0.5", "1", ""},
		{"6001", "", "6000"},
	}
	for _, c := range cases {
		up, okUp := b.SmallestRatingFrom(decimal(t, c.ampere))
		down, okDown := b.LargestRatingTo(decimal(t, c.ampere))
		if okUp != (c.up != "") || okUp && up.String() != c.up || okDown != (c.down != "") || okDown && down.String() != c.down {
			t.Errorf("%s A: next up %v (%v), next down %v (%v), want %q and %q", c.ampere, up, okUp, down, okDown, c.up, c.down)
		}
	}
}

func TestEveryClauseHasItsSource(t *testing.T) {
	for _, b := range All() {
		clauses := []Clause{b.ColdCoefficient, b.ColdTable, b.CurrentFactor.Clause, b.FuseFactor.Clause, b.RatingsClause, b.FuseRequired, b.MarkedIsc, b.Instructions}
		for _, c := range b.Ceilings {
			clauses = append(clauses, c.Clause)
		}
		for _, c := range clauses {
			if c.Cite == "" || c.Source == "" {
				t.Errorf("%s: a clause without its cite or source: %+v", b.ID, c)
			}
		}
	}
	if Find("nec-2014") != nil {
		t.Error("an edition that is not here was found")
	}
}
