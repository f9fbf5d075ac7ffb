// Package display makes of a design and its result what people read: numbers with
// their unit and a stated direction of rounding, sentences, page structs.
//
// It knows the trade's words. It must not judge and must not compute an
// engineering value: every number it prints stands in the design or in the
// result. Three things are arithmetic of its own: a unit beside another (°F beside
// °C), the distance between two numbers that the engine gave, and sums of counts.
package display
