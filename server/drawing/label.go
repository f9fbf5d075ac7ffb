package drawing

import (
	"cmp"
	"math"
	"slices"
)

// widths are the advance widths of the printable ASCII characters in thousandths
// of the font's size: for each the wider of DejaVu Sans 2.37 and Liberation Sans
// 2.1, as a browser measures them. DejaVu is the widest sans font in common use
// as a system's own, so a text takes no more room than this on any reader's screen.
var widths = [...]uint16{
	318, 401, 460, 838, 636, 950, 780, 275, 390, 390, 500, 838, 318, 361, 318, 337,
	636, 636, 636, 636, 636, 636, 636, 636, 636, 636, 337, 337, 838, 838, 838, 556,
	1015, 684, 686, 722, 770, 667, 611, 778, 752, 295, 500, 667, 557, 863, 748, 787,
	667, 787, 722, 667, 611, 732, 684, 989, 685, 667, 685, 390, 337, 390, 838, 556,
	500, 613, 635, 550, 635, 615, 352, 635, 634, 278, 278, 579, 278, 974, 634, 612,
	635, 635, 411, 521, 392, 634, 592, 818, 592, 592, 525, 636, 337, 636, 838,
}

// Widths of the other characters that labels are made of; any further one counts a
// full em, as wide as a character of a script without narrow ones.
var otherWidths = map[rune]uint16{'\u00a0': 318, '°': 500, '−': 838, '–': 556, '’': 318, '·': 318, '×': 838, '÷': 838}

const (
	fullEm      = 1000
	boldFactor  = 1.13 // DejaVu Sans Bold against its regular, digits and letters
	labelMargin = 0.5  // mm kept free around a label
)

// textWidth returns the most room in millimetres that a line of text takes.
func textWidth(s string, size float64, bold bool) float64 {
	sum := 0
	for _, r := range s {
		switch other, known := otherWidths[r]; {
		case ' ' <= r && int(r-' ') < len(widths):
			sum += int(widths[r-' '])
		case known:
			sum += int(other)
		default:
			sum += fullEm
		}
	}
	width := float64(sum) / 1000 * size
	if bold {
		width *= boldFactor
	}
	return width
}

// label is a text that looks for its place.
type label struct {
	text   Text    // At and Anchor are found
	near   []Point // it may stand by any of these; the first is liked best
	within Box     // it must not leave this
	leader bool    // joined by a fine line to its point where it stands away from it
}

// placed is a label in its place.
type placed struct {
	text   Text
	leader []Point // nil where none is needed
}

// placer puts labels one after another; each takes the best place left. Two never
// overlap and none leaves its box.
type placer struct {
	taken []Box // by labels
	ink   []ink // lines that a label had better not cover
}

// ink is a straight line on the drawing, and what it costs to cover it.
type ink struct {
	from, to Point
	cost     float64
}

func (p *placer) addInk(line []Point, cost float64) {
	for i := 1; i < len(line); i++ {
		p.ink = append(p.ink, ink{line[i-1], line[i], cost})
	}
}

// Costs of a place, in millimetres of distance that one would accept to avoid it.
const (
	hairCost   = 9.0  // a hairline under a label
	lineCost   = 26.0 // a line that the drawing is about
	choiceCost = 1.5  // for each point that is liked less
	leaderFrom = 3.2  // mm from its point, beyond which a label needs a leader
)

// offset is where a label stands in relation to its point.
type offset struct {
	dx, dy   float64 // of the nearest edge of the label's box
	anchor   Anchor
	distance float64 // from the point
}

// beside is how far a label above or below its point keeps from the upright through it, in millimetres.
const beside = 0.8

// offsets are the places that are tried around a point, near ones first.
var offsets = func() (all []offset) {
	for _, away := range []float64{1.0, 2.6, 4.6, 7, 10, 14, 19, 25, 32, 40, 50, 62} {
		for _, o := range []offset{
			{dy: -away, anchor: Middle}, {dy: away, anchor: Middle},
			{dx: beside, dy: -away, anchor: Start}, {dx: beside, dy: away, anchor: Start},
			{dx: -beside, dy: -away, anchor: End}, {dx: -beside, dy: away, anchor: End},
			{dx: away, anchor: Start}, {dx: -away, anchor: End},
			{dx: away, dy: -away, anchor: Start}, {dx: -away, dy: -away, anchor: End},
			{dx: away, dy: away, anchor: Start}, {dx: -away, dy: away, anchor: End},
		} {
			o.distance = math.Hypot(o.dx, o.dy)
			all = append(all, o)
		}
	}
	slices.SortStableFunc(all, func(a, b offset) int { return cmp.Compare(a.distance, b.distance) })
	return all
}()

// place finds the best free place for the label and takes it. It reports false
// where there is none.
func (p *placer) place(l label) (placed, bool) {
	width := l.text.Box().Max.X - l.text.Box().Min.X
	height := textHeight(len(l.text.Lines), l.text.SizeMM)
	best, bestCost, bestNear := Box{}, math.Inf(1), Point{}
	for i, near := range l.near {
		for _, o := range offsets {
			cost := o.distance + choiceCost*float64(i)
			if cost >= bestCost {
				break
			}
			box := o.box(near, width, height)
			if !l.within.Contains(box) || p.isTaken(box) {
				continue
			}
			if cost += p.inkUnder(box, bestCost-cost); cost < bestCost {
				best, bestCost, bestNear = box, cost, near
			}
		}
	}
	if math.IsInf(bestCost, 1) && !p.anywhere(l.within, width, height, l.near[0], &best) {
		return placed{}, false
	}
	if math.IsInf(bestCost, 1) {
		bestNear = l.near[0]
	}
	p.taken = append(p.taken, best.grown(labelMargin))
	l.text.At = Point{best.Min.X, best.Min.Y + ascent*l.text.SizeMM}
	l.text.Anchor = Start
	out := placed{text: l.text}
	if end, distance := best.nearest(bestNear); l.leader && distance > leaderFrom {
		out.leader = []Point{bestNear, end}
		p.addInk(out.leader, hairCost)
	}
	return out, true
}

func (o offset) box(near Point, width, height float64) Box {
	left := near.X + o.dx
	switch {
	case o.anchor == End:
		left = near.X + o.dx - width
	case o.anchor == Middle:
		left = near.X - width/2
	}
	top := near.Y + o.dy
	switch {
	case o.dy < 0:
		top -= height
	case o.dy == 0:
		top -= height / 2
	}
	return Box{Point{left, top}, Point{left + width, top + height}}
}

func (p *placer) isTaken(b Box) bool {
	for _, t := range p.taken {
		if t.Overlaps(b) {
			return true
		}
	}
	return false
}

// inkUnder returns the cost of the lines under a box; it stops counting at the limit.
func (p *placer) inkUnder(b Box, limit float64) float64 {
	cost := 0.0
	for _, s := range p.ink {
		if b.crosses(s.from, s.to) {
			if cost += s.cost; cost >= limit {
				break
			}
		}
	}
	return cost
}

// anywhere looks for any free place, the one nearest to the point.
func (p *placer) anywhere(within Box, width, height float64, near Point, best *Box) bool {
	bestDistance := math.Inf(1)
	for top := within.Min.Y; top+height <= within.Max.Y; top += 1 {
		for left := within.Min.X; left+width <= within.Max.X; left += 2 {
			b := Box{Point{left, top}, Point{left + width, top + height}}
			if _, d := b.nearest(near); d < bestDistance && !p.isTaken(b) {
				*best, bestDistance = b, d
			}
		}
	}
	return !math.IsInf(bestDistance, 1)
}

// nearest returns the point of the box's edge nearest to a point outside, and its distance.
func (b Box) nearest(to Point) (Point, float64) {
	at := Point{min(max(to.X, b.Min.X), b.Max.X), min(max(to.Y, b.Min.Y), b.Max.Y)}
	return at, math.Hypot(at.X-to.X, at.Y-to.Y)
}

// stack moves the tops of boxes of equal height apart until none overlaps, each as
// little as it can, and keeps them between low and high. tops must be sorted. It
// reports false where they do not fit.
func stack(tops []float64, height, low, high float64) bool {
	if float64(len(tops))*height > high-low {
		return false
	}
	at := low
	for i := range tops {
		tops[i] = max(tops[i], at)
		at = tops[i] + height
	}
	at = high - height
	for i := len(tops) - 1; i >= 0; i-- {
		tops[i] = min(tops[i], at)
		at = tops[i] - height
	}
	return true
}
