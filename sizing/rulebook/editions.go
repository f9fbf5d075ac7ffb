package rulebook

import "rimeline/sizing/quantity"

// Where the values below were read.
const (
	fromMemory  = "from memory"
	ceilings23  = "R. Mayfield, Get ready for NEC 2023, North American Clean Energy, 15 Nov 2022; earlier editions: \"still limited\" there"
	threeWays   = "summary of the 2014 to 2017 change of 690.7, electricallicenserenewal.com; wording of later editions from memory"
	coldTable   = "rows at 9 °C and colder: the cold-factor table in a DC device maker's installation manual; 1.02 to 1.06 from memory, in agreement with the span 1.02 to 1.25 of UTE C 15-712-1"
	factor125   = "EC&M, NEC guidelines for photovoltaic systems, Article 690 (2017 NEC)"
	factor156   = "EC&M, Article 690 part 3"
	bifacial26  = "Calculating bifacial PV circuit max current in the 2026 NEC, solartechcollective.com"
	wilesFuse   = "J. Wiles, Overcurrent protection and disconnect oddities (2017 NEC), IAEI Magazine, 20 Feb 2018; the two conditions from memory"
	fuses2020   = "Updates to NEC 2020 that solar installers need to know, Solar Power World, 2021"
	indianFuses = "IS/IEC 62548 as applied in Selection and sizing of solar DC fuses, solarsaarthi.com"
)

// coldFactors is NEC Table 690.7(A); IEC 62548 gives the same numbers. 25 °C and
// above is 1.00: no correction.
var coldFactors = []ColdFactor{
	{25, quantity.Ratio(100, 100)},
	{20, quantity.Ratio(102, 100)},
	{15, quantity.Ratio(104, 100)},
	{10, quantity.Ratio(106, 100)},
	{5, quantity.Ratio(108, 100)},
	{0, quantity.Ratio(110, 100)},
	{-5, quantity.Ratio(112, 100)},
	{-10, quantity.Ratio(114, 100)},
	{-15, quantity.Ratio(116, 100)},
	{-20, quantity.Ratio(118, 100)},
	{-25, quantity.Ratio(120, 100)},
	{-30, quantity.Ratio(121, 100)},
	{-35, quantity.Ratio(123, 100)},
	{-40, quantity.Ratio(125, 100)},
}

// standardRatings is NEC 240.6(A) with the additional fuse ratings 1, 3, 6, 10 and
// 601 A. From memory.
var standardRatings = []int64{
	1, 3, 6, 10, 15, 20, 25, 30, 35, 40, 45, 50, 60, 70, 80, 90, 100, 110, 125, 150, 175, 200, 225, 250,
	300, 350, 400, 450, 500, 600, 601, 700, 800, 1000, 1200, 1600, 2000, 2500, 3000, 4000, 5000, 6000,
}

// nec returns what the editions 2017 to 2026 have in common.
func nec(year string, ceilings, fuseRequired string) *Book {
	cite := func(section, source string) Clause { return Clause{"NEC " + year + " " + section, source} }
	return &Book{
		ID:   "nec-" + year,
		Name: "NEC " + year,
		Ceilings: []Ceiling{
			{"one-or-two-family-dwelling", 600, cite("690.7", ceilings)},
			{"other-building", 1000, cite("690.7", ceilings)},
			{"ground-mounted", 1500, cite("690.7", ceilings)},
		},
		ColdCoefficient: cite("690.7(A)(1)", threeWays),
		ColdTable:       cite("690.7(A)(2), Table 690.7(A)", coldTable),
		ColdFactors:     coldFactors,
		CurrentFactor:   Factor{quantity.Ratio(125, 100), cite("690.8(A)(1)", factor125)},
		FuseFactor:      Factor{quantity.Ratio(15625, 10000), cite("690.9(B)", factor156)},
		StandardRatings: standardRatings,
		RatingsClause:   cite("240.6(A)", fromMemory),
		FuseRequired:    cite("690.9(A)", fuseRequired),
		MarkedIsc:       cite("690.8(A)(1)", factor125),
		Instructions:    cite("110.3(B)", fromMemory),
	}
}

var books = []*Book{
	nec("2017", ceilings23, wilesFuse),
	nec("2020", ceilings23, fuses2020),
	nec("2023", ceilings23, fuses2020),
	nec2026(),
	{
		ID:              "iec-62548-1",
		Name:            "IEC 62548-1",
		ColdCoefficient: Clause{"IEC 62548-1, maximum array voltage", fromMemory},
		ColdTable:       Clause{"IEC 62548-1, cold-voltage factors for crystalline silicon", fromMemory},
		ColdFactors:     coldFactors,
		CurrentFactor:   Factor{quantity.Ratio(125, 100), Clause{"IEC 62548-1, ISC MAX", fromMemory}},
		// Stricter than the standard's own 1.5: the same test stands under every rulebook.
		FuseFactor:      Factor{quantity.Ratio(15625, 10000), Clause{"IEC 62548-1, string overcurrent protection", indianFuses}},
		StandardRatings: standardRatings,
		RatingsClause:   Clause{"standard fuse ratings (NEC 240.6(A))", fromMemory},
		FuseRequired:    Clause{"IEC 62548-1, string overcurrent protection", indianFuses},
		MarkedIsc:       Clause{"IEC 62548-1, ISC MAX", fromMemory},
		Instructions:    Clause{"the equipment's instructions", "common practice"},
	},
}

func nec2026() *Book {
	b := nec("2026", fromMemory, fromMemory)
	b.HighestMarkedIsc = true
	b.MarkedIsc = Clause{"NEC 2026 690.8(A)(1)(a)", bifacial26}
	return b
}
