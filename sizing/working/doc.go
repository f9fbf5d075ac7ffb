// Package working holds the shown work: the terms a formula is made of, the steps
// that print it, the checks that rest on it, their verdicts, and the input values
// at which a verdict turns.
//
// A formula exists once, as a tree of [Term]. Its value, its text in symbols, its
// text with the numbers put in, the inputs it rests on and the turning points are
// all read off that one tree, so the printed working cannot disagree with the
// number.
//
// The package knows arithmetic and nothing of photovoltaics: no code, no clause,
// no limit stands here.
package working
