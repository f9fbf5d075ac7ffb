package drawing

import (
	"slices"
	"testing"
)

func TestTextWidth(t *testing.T) {
	// Expected: sums of the advance widths of DejaVu Sans in thousandths of an em,
	// read off a browser: 5 0 3 . V are 636 636 636 318 684; ° is 500, − is 838.
	for _, test := range []struct {
		text string
		want float64
	}{
		{"", 0},
		{"503.5 V", 4 * (0.636*4 + 0.318 + 0.318 + 0.684)},
		{"−1 °C", 4 * (0.838 + 0.636 + 0.318 + 0.500 + 0.722)}, // C is wider in Liberation Sans
		{"漢", 4},
	} {
		if got := textWidth(test.text, 4, false); got < test.want-1e-9 || got > test.want+1e-9 {
			t.Errorf("textWidth(%q, 4) = %g mm, want %g", test.text, got, test.want)
		}
	}
	if textWidth("ceiling", 3, true) <= textWidth("ceiling", 3, false) {
		t.Error("bold text is not wider")
	}
}

func TestStack(t *testing.T) {
	for _, test := range []struct {
		name      string
		tops      []float64
		low, high float64
		want      []float64 // nil: does not fit
	}{
		{"apart already", []float64{0, 10, 20}, 0, 30, []float64{0, 10, 20}},
		{"pushed down", []float64{0, 1, 2}, 0, 30, []float64{0, 4, 8}},
		{"pushed up from the end", []float64{20, 27, 28}, 0, 30, []float64{18, 22, 26}},
		{"from above the start", []float64{-5, 3}, 0, 30, []float64{0, 4}},
		{"exactly full", []float64{1, 1, 1}, 0, 12, []float64{0, 4, 8}},
		{"too many", []float64{1, 1, 1}, 0, 11, nil},
		{"none", nil, 0, 1, []float64{}},
	} {
		tops := slices.Clone(test.tops)
		fits := stack(tops, 4, test.low, test.high)
		if fits != (test.want != nil) {
			t.Errorf("%s: fits = %t", test.name, fits)
		} else if fits && !slices.Equal(tops, test.want) && len(tops) > 0 {
			t.Errorf("%s: %v, want %v", test.name, tops, test.want)
		}
	}
}

func TestBoxCrosses(t *testing.T) {
	b := Box{Point{1, 1}, Point{3, 2}}
	for _, test := range []struct {
		p, q Point
		want bool
	}{
		{Point{0, 0}, Point{4, 3}, true},       // through
		{Point{1.5, 1.5}, Point{2, 1.6}, true}, // inside
		{Point{0, 1.5}, Point{4, 1.5}, true},   // level through
		{Point{0, 1}, Point{4, 1}, false},      // along the edge
		{Point{2, 0}, Point{2, 0.9}, false},    // stops short
		{Point{0, 0}, Point{0.5, 5}, false},    // past it
		{Point{3.5, 0}, Point{3.5, 3}, false},
	} {
		if got := b.crosses(test.p, test.q); got != test.want {
			t.Errorf("crosses(%v, %v) = %t, want %t", test.p, test.q, got, test.want)
		}
	}
}

func TestHatchStaysInItsBox(t *testing.T) {
	b := Box{Point{10, 5}, Point{60, 9}}
	lines := hatch(b, 1.7)
	if len(lines) < 25 {
		t.Errorf("%d lines, want a dense hatch", len(lines))
	}
	for _, line := range lines {
		for _, p := range line {
			if !b.grown(1e-9).Contains(Box{p, p}) {
				t.Errorf("%v lies outside %v", p, b)
			}
		}
	}
}
