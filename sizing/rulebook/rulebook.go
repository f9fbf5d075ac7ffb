// Package rulebook holds the editions of the codes as data: ceilings, cold-voltage
// factors, current factors and standard ratings, each entry with its clause and
// where its value was read.
//
// It knows what the codes say and nothing of designs: no rule is applied here.
// A new edition is a new [Book] value.
package rulebook

import "rimeline/sizing/quantity"

// Book is one edition.
type Book struct {
	ID, Name string

	// Ceilings are the highest voltages permitted by the kind of structure, by the
	// words of the design document; empty where the code sets none.
	Ceilings []Ceiling

	ColdCoefficient Clause // cold voltage by the maker's coefficient
	ColdTable       Clause // cold voltage by the table of factors
	ColdFactors     []ColdFactor

	// CurrentFactor is what turns short-circuit current at STC into the maximum
	// circuit current: irradiance above 1000 W/m².
	CurrentFactor Factor
	// FuseFactor is the least rating of an overcurrent device over short-circuit current.
	FuseFactor Factor
	// StandardRatings are the overcurrent device ratings in A, ascending.
	StandardRatings []int64
	RatingsClause   Clause
	FuseRequired    Clause // when strings in parallel need overcurrent devices

	// HighestMarkedIsc is true where the code names the highest marked short-circuit
	// current of a module, bifacial conditions included, as the one to use.
	HighestMarkedIsc bool
	MarkedIsc        Clause
	Instructions     Clause // equipment is used by its instructions
}

// Clause says where a rule stands and where we read it.
type Clause struct {
	Cite   string // as printed: "NEC 690.7(A)(1)"
	Source string // publication, "common practice" or "from memory"
}

// Ceiling is the highest DC voltage on or in one kind of structure.
type Ceiling struct {
	Structure string // the document's word
	MaxV      int64
	Clause    Clause
}

// Factor is a multiplier with its clause.
type Factor struct {
	Value  quantity.Exact
	Clause Clause
}

// ColdFactor is a row of the table of cold-voltage factors for crystalline silicon:
// it holds from its lower bound up to the next row's. The printed rows are in whole
// degrees; the rows meet without gaps, and a temperature between two printed rows
// takes the colder one.
type ColdFactor struct {
	LowerC int64 // the coldest temperature of the row, °C
	Factor quantity.Exact
}

// Ceiling returns the ceiling for a structure, false where the code sets none.
func (b *Book) Ceiling(structure string) (Ceiling, bool) {
	for _, c := range b.Ceilings {
		if c.Structure == structure {
			return c, true
		}
	}
	return Ceiling{}, false
}

// ColdFactorAt returns the row for a temperature; false below the last row, where
// the table is silent.
func (b *Book) ColdFactorAt(c quantity.Exact) (ColdFactor, bool) {
	for _, row := range b.ColdFactors {
		if quantity.Int(row.LowerC).Cmp(c) <= 0 {
			return row, true
		}
	}
	return ColdFactor{}, false
}

// SmallestRatingFrom returns the smallest standard rating that is not below a, in
// A; false where a is above the largest.
func (b *Book) SmallestRatingFrom(a quantity.Exact) (quantity.Exact, bool) {
	for _, r := range b.StandardRatings {
		if x := quantity.Int(r); a.Cmp(x) <= 0 {
			return x, true
		}
	}
	return quantity.Exact{}, false
}

// LargestRatingTo returns the largest standard rating that is not above a, in A;
// false where a is below the smallest.
func (b *Book) LargestRatingTo(a quantity.Exact) (largest quantity.Exact, ok bool) {
	for _, r := range b.StandardRatings {
		x := quantity.Int(r)
		if a.Less(x) {
			break
		}
		largest, ok = x, true
	}
	return largest, ok
}

// Find returns the edition with the id; nil if there is none.
func Find(id string) *Book {
	for _, b := range books {
		if b.ID == id {
			return b
		}
	}
	return nil
}

// All returns every edition, oldest first, the code family by family.
func All() []*Book { return books }
