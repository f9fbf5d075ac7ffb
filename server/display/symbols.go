package display

import (
	"strings"
	"unicode"

	"rimeline/sizing/working"
	"rimeline/views"
)

// symbols explain every symbol of the working, in the order in which a reader meets them.
var symbols = []views.Symbol{
	{Symbol: "Tcold", Meaning: "coldest temperature of the site, °C; cells are as cold as the air at first light"},
	{Symbol: "Tcold,F", Meaning: "the same as stated, °F"},
	{Symbol: "Thot", Meaning: "hottest air temperature of the site, °C"},
	{Symbol: "Thot,F", Meaning: "the same as stated, °F"},
	{Symbol: "rise", Meaning: "how much hotter than the air a cell of the plane gets, °C"},
	{Symbol: "rise,F", Meaning: "the same as stated, °F"},
	{Symbol: "Tcell", Meaning: "cell temperature on the hottest roof, °C"},
	{Symbol: "Pmax", Meaning: "module's power at STC, W"},
	{Symbol: "Voc", Meaning: "module's open-circuit voltage at STC, V"},
	{Symbol: "Isc", Meaning: "module's short-circuit current at STC, A"},
	{Symbol: "Vmp", Meaning: "module's operating voltage at STC, V"},
	{Symbol: "Imp", Meaning: "module's operating current at STC, A"},
	{Symbol: "βVoc", Meaning: "temperature coefficient of Voc, in the unit in which it is stated"},
	{Symbol: "βVmp", Meaning: "temperature coefficient of Vmp"},
	{Symbol: "γPmax", Meaning: "temperature coefficient of Pmax"},
	{Symbol: "αIsc", Meaning: "temperature coefficient of Isc"},
	{Symbol: "α", Meaning: "current coefficient used where none is stated, %/°C"},
	{Symbol: "Fcold", Meaning: "factor of the cold-voltage table's row"},
	{Symbol: "acold", Meaning: "allowance onto the cold voltage, %"},
	{Symbol: "ahot", Meaning: "allowance off the hot operating voltage, %"},
	{Symbol: "Vceiling", Meaning: "the lowest of the limits under which the cold voltage must stay, V"},
	{Symbol: "Vinverter,max", Meaning: "inverter's maximum DC voltage, V"},
	{Symbol: "Vmodule,max", Meaning: "module's maximum system voltage, V"},
	{Symbol: "Vstructure,max", Meaning: "the code's limit on or in the structure, V"},
	{Symbol: "Vother,#", Meaning: "limit of other rated part #, V"},
	{Symbol: "Voc,Tcold", Meaning: "one module's open-circuit voltage on the coldest morning before the allowance, V"},
	{Symbol: "Voc,cold", Meaning: "one module's open-circuit voltage on the coldest morning, V"},
	{Symbol: "Vcold", Meaning: "the string's open-circuit voltage on the coldest morning, V"},
	{Symbol: "Vcold#", Meaning: "the same of strings entry S#, V"},
	{Symbol: "Vcold,other", Meaning: "the same by the method that was not chosen, V"},
	{Symbol: "ΔVcold", Meaning: "how far the cold voltages of strings in parallel lie apart, V"},
	{Symbol: "Tceiling", Meaning: "temperature at which the string meets the ceiling, °C"},
	{Symbol: "headroom", Meaning: "how much colder than the coldest that is, or is asked to be, °C"},
	{Symbol: "headroom,F", Meaning: "the same as stated, °F"},
	{Symbol: "Vmp,Tcell", Meaning: "one module's operating voltage in the hottest cells before the allowance, V"},
	{Symbol: "Vmp,hot", Meaning: "one module's operating voltage in the hottest cells, V"},
	{Symbol: "Vhot", Meaning: "the string's operating voltage in the hottest cells, V"},
	{Symbol: "Vhot,steeper", Meaning: "the same with the current coefficient counted into the slope, V"},
	{Symbol: "Voc,hot", Meaning: "one module's open-circuit voltage in the hottest cells, V"},
	{Symbol: "Voc,hot,string", Meaning: "the string's open-circuit voltage in the hottest cells, V"},
	{Symbol: "Vmp,cold", Meaning: "one module's operating voltage on the coldest morning, V"},
	{Symbol: "Vmp,cold,string", Meaning: "the string's operating voltage on the coldest morning, V"},
	{Symbol: "Vmppt,min", Meaning: "lower limit of the tracker's window, V"},
	{Symbol: "Vmppt,max", Meaning: "upper limit of the tracker's window, V"},
	{Symbol: "Vstart", Meaning: "voltage at which the inverter starts, V"},
	{Symbol: "n, n#", Meaning: "modules in series; of strings entry S#"},
	{Symbol: "nmax", Meaning: "the most modules whose cold voltage does not exceed the ceiling"},
	{Symbol: "nmin", Meaning: "the fewest modules whose hot voltage reaches the window"},
	{Symbol: "s, s#", Meaning: "strings in parallel; of strings entry S#"},
	{Symbol: "Σs", Meaning: "strings on the tracker"},
	{Symbol: "inputs", Meaning: "strings that can be landed on the tracker"},
	{Symbol: "gain", Meaning: "gain of current on the plane, %"},
	{Symbol: "Isc,marked", Meaning: "the highest short-circuit current marked on the module, A"},
	{Symbol: "Isc,gain", Meaning: "short-circuit current of one string with the gain, A"},
	{Symbol: "Imp,gain", Meaning: "operating current of one string with the gain, A"},
	{Symbol: "ΣImp", Meaning: "operating current of all strings on the tracker, A"},
	{Symbol: "ΣIsc", Meaning: "short-circuit current of all strings on the tracker by the chosen basis, A"},
	{Symbol: "ΣImax", Meaning: "the same × 1.25, A"},
	{Symbol: "Imp#", Meaning: "operating current of strings entry S#, A"},
	{Symbol: "Isc#", Meaning: "short-circuit current of strings entry S# by the chosen basis, A"},
	{Symbol: "Imax#", Meaning: "the same × 1.25, A"},
	{Symbol: "Iback", Meaning: "current that the inverter can feed back, A"},
	{Symbol: "Iback-feed", Meaning: "current that can flow backwards into one failed string, A"},
	{Symbol: "Ifuse,min", Meaning: "the least rating of a string fuse, A"},
	{Symbol: "modules#", Meaning: "modules of strings entry S#"},
	{Symbol: "Σmodules", Meaning: "modules strung on the plane"},
	{Symbol: "positions", Meaning: "places for modules on the plane"},
	{Symbol: "left over", Meaning: "places that stay empty"},
	{Symbol: "P#", Meaning: "power at STC of the modules of strings entry S#, W"},
	{Symbol: "ΣP", Meaning: "power at STC of all modules on the inverter, W"},
	{Symbol: ofModule, Meaning: "of the design's module number #"},
	{Symbol: ofPlane, Meaning: "of the design's plane number #"},
}

// Ends of symbols that tell modules and planes apart where a design has several.
const (
	ofModule = "…,m#"
	ofPlane  = "…,p#"
)

// symbolsIn explains the symbols that occur in steps.
func symbolsIn(all ...[]working.Step) []views.Symbol {
	used := map[string]bool{}
	for _, steps := range all {
		for _, s := range steps {
			mark(used, s.Symbol)
			for word := range strings.SplitSeq(s.Expression, " ") {
				mark(used, bare(word))
			}
		}
	}
	var found []views.Symbol
	for _, s := range symbols {
		if used[s.Symbol] {
			found = append(found, s)
		}
	}
	return found
}

func mark(used map[string]bool, symbol string) {
	for _, s := range explanations(symbol) {
		used[s] = true
	}
}

// bare returns a word of an expression without the brackets and commas around it.
func bare(word string) string {
	for {
		was := word
		for _, mark := range []string{"(", "⌊", "⌈", "min(", "max("} {
			word = strings.TrimPrefix(word, mark)
		}
		word = strings.TrimRight(word, ",⌋⌉")
		if strings.HasSuffix(word, ")") && strings.Count(word, "(") < strings.Count(word, ")") {
			word = strings.TrimSuffix(word, ")")
		}
		if word == was {
			return word
		}
	}
}

// explanations returns under which symbols of the list a symbol is explained: Imp2
// under Imp#, Voc,m2 under Voc and …,m#.
func explanations(symbol string) []string {
	var under []string
	for _, end := range []string{ofModule, ofPlane} {
		mark := strings.TrimSuffix(strings.TrimPrefix(end, "…"), "#")
		if cut := withoutNumber(symbol); cut != symbol && strings.HasSuffix(cut, mark) {
			under = append(under, end)
			symbol = strings.TrimSuffix(cut, mark)
		}
	}
	cut := withoutNumber(symbol)
	for _, listed := range []string{symbol, cut + "#", cut + ", " + cut + "#"} {
		if explains(listed) {
			return append(under, listed)
		}
	}
	return nil
}

func withoutNumber(symbol string) string { return strings.TrimRightFunc(symbol, unicode.IsDigit) }

// unnumbered writes a formula without the numbers of strings entries: n for n2. It
// is used where the subject names the entry.
func unnumbered(formula string) string {
	words := strings.Split(formula, " ")
	for i, word := range words {
		symbol := bare(word)
		if cut := withoutNumber(symbol); cut == "n" || cut == "s" {
			words[i] = strings.Replace(word, symbol, cut, 1)
		}
	}
	return strings.Join(words, " ")
}

func explains(symbol string) bool {
	for _, s := range symbols {
		if s.Symbol == symbol {
			return true
		}
	}
	return false
}
