// Package drawing holds one model of a drawing in millimetres, its writer for SVG,
// a placement of labels in which no two overlap, and the drawings of the service.
//
// It knows lines, shapes and text, and how wide a text may be. It must not judge
// and must not print a number of its own: every label arrives as finished text.
// Binary floating point is allowed here and nowhere else, because a place on paper
// is no engineering value.
package drawing

import "math"

// Drawing is a picture in millimetres. The origin is the top left corner, y points down.
type Drawing struct {
	WidthMM, HeightMM float64
	Title             string // what it is, in a few words
	Desc              string // what it shows, in sentences
	Items             []Item // painted in this order
}

// Item is a [Path], [Area], [Dot] or [Text].
type Item interface {
	appendSVG(dst []byte) []byte
}

// Point is a place on a drawing.
type Point struct{ X, Y float64 }

// Box is an upright rectangle from its top left to its bottom right corner.
type Box struct{ Min, Max Point }

// Overlaps reports whether two boxes share more than an edge.
func (b Box) Overlaps(o Box) bool {
	return b.Min.X < o.Max.X && o.Min.X < b.Max.X && b.Min.Y < o.Max.Y && o.Min.Y < b.Max.Y
}

// Contains reports whether o lies inside b.
func (b Box) Contains(o Box) bool {
	return b.Min.X <= o.Min.X && o.Max.X <= b.Max.X && b.Min.Y <= o.Min.Y && o.Max.Y <= b.Max.Y
}

// grown returns the box with a margin on every side.
func (b Box) grown(margin float64) Box {
	return Box{Point{b.Min.X - margin, b.Min.Y - margin}, Point{b.Max.X + margin, b.Max.Y + margin}}
}

// crosses reports whether the segment from p to q has a point inside the box.
func (b Box) crosses(p, q Point) bool {
	if max(p.X, q.X) <= b.Min.X || b.Max.X <= min(p.X, q.X) || max(p.Y, q.Y) <= b.Min.Y || b.Max.Y <= min(p.Y, q.Y) {
		return false
	}
	if p.X == q.X || p.Y == q.Y {
		return true
	}
	// It crosses unless all four corners lie on one side of the line through p and q.
	side := func(x, y float64) float64 { return (q.X-p.X)*(y-p.Y) - (q.Y-p.Y)*(x-p.X) }
	s1, s2, s3, s4 := side(b.Min.X, b.Min.Y), side(b.Max.X, b.Min.Y), side(b.Min.X, b.Max.Y), side(b.Max.X, b.Max.Y)
	return !(s1 >= 0 && s2 >= 0 && s3 >= 0 && s4 >= 0 || s1 <= 0 && s2 <= 0 && s3 <= 0 && s4 <= 0)
}

// Pen is how a line is drawn. Lines are told apart by weight and dash, never by colour alone.
type Pen struct {
	WidthMM float64
	Shade   float64   // of its ink, from 0, paper, to 1
	DashMM  []float64 // lengths of dash and gap; none is a solid line
	Round   bool      // round ends: with a dash of nearly no length, dots
}

// Path is one or more polylines drawn with one pen.
type Path struct {
	Role  string // what it shows; a page may colour by it
	Pen   Pen
	Lines [][]Point
}

// Area is a rectangle filled with a shade of ink from 0, paper, to 1.
type Area struct {
	Role  string
	Box   Box
	Shade float64
}

// Dot is a disc, or a ring filled with paper.
type Dot struct {
	Role     string
	At       Point
	RadiusMM float64
	Ring     bool
}

// Anchor says which end of a text is given.
type Anchor uint8

const (
	Start Anchor = iota
	Middle
	End
)

// Text is one or more lines of text.
type Text struct {
	Role   string
	At     Point // on the base line of the first line
	Anchor Anchor
	SizeMM float64 // of the font; lines are leading × this apart
	Bold   bool
	Lines  []string
}

// Fractions of the font's size that a line of text reaches above and below its
// base line, and the distance of two base lines. DejaVu Sans, the tallest of the
// sans fonts in common use, has accents up to 0.93; its letters end at 0.76 and −0.24.
const (
	ascent  = 0.80
	descent = 0.24
	leading = 1.18
)

// Box returns the room that the text may take, whatever sans font draws it.
func (t Text) Box() Box {
	width := 0.0
	for _, line := range t.Lines {
		width = max(width, textWidth(line, t.SizeMM, t.Bold))
	}
	left := t.At.X
	switch t.Anchor {
	case Middle:
		left -= width / 2
	case End:
		left -= width
	}
	top := t.At.Y - ascent*t.SizeMM
	return Box{Point{left, top}, Point{left + width, top + textHeight(len(t.Lines), t.SizeMM)}}
}

func textHeight(lines int, size float64) float64 {
	return size * (ascent + descent + leading*float64(lines-1))
}

// hatch returns parallel lines at 45° that fill a box.
func hatch(b Box, spacing float64) [][]Point {
	var lines [][]Point
	height := b.Max.Y - b.Min.Y
	for x := math.Ceil((b.Min.X-height)/spacing) * spacing; x < b.Max.X; x += spacing {
		// The line rises from (x, bottom) to (x + height, top); cut it to the box.
		low, high := max(x, b.Min.X), min(x+height, b.Max.X)
		if low < high {
			lines = append(lines, []Point{{low, b.Max.Y - (low - x)}, {high, b.Max.Y - (high - x)}})
		}
	}
	return lines
}
