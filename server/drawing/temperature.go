package drawing

import (
	"cmp"
	"math"
	"slices"
	"strconv"
	"strings"
)

// TemperatureChart is what one tracker's strings do between the coldest morning
// and the hottest roof: voltage against cell temperature. Texts are finished.
type TemperatureChart struct {
	Title, Desc string
	Marks       []TemperatureMark // in order of importance
	Ceiling     Level
	Windows     []Window // a later one lies inside an earlier one
	Levels      []Level  // further single limits, such as the start voltage
	Lines       []VoltageLine
	Meets       []Meeting
}

// TemperatureMark is a temperature of the site, marked over the whole height.
type TemperatureMark struct {
	AtC  float64
	Text []string // below the axis: a name, °C, °F
	Fine bool     // it helps to read and is left out where there is no room
}

// Level is a voltage with a name.
type Level struct {
	V    float64
	Text string
}

// Window is a range of voltage with a name at each of its limits, and one for the
// whole of it where room is scarce.
type Window struct {
	Min, Max Level
	Text     string
}

// LineKind tells how a line is drawn.
type LineKind uint8

const (
	OpenCircuit LineKind = iota // solid, with discs
	Operating                   // dashed, with rings
)

// VoltageLine is the voltage of equal strings through the points that the engine
// computed, in order of temperature.
type VoltageLine struct {
	Kind   LineKind
	Text   string
	Short  string // where room is scarce
	Points []VoltagePoint
	// BetweenRows says that the points are right and the way between them is not a
	// straight line, as with a factor read from a table.
	BetweenRows bool
	// Beyond continues the line, finely, to a point colder than any morning expected,
	// at which it meets the ceiling; nil for none.
	Beyond *VoltagePoint
}

// VoltagePoint is a computed point. Text is its value, "" for none.
type VoltagePoint struct {
	AtC, V float64
	Text   string
}

// Meeting is the temperature at which a string would meet the ceiling.
type Meeting struct {
	AtC  float64
	Text string
}

// layout is the size of a chart and of what is in it, in millimetres.
type layout struct {
	width, height     float64
	size              float64 // of the text
	left, bottom, top float64
	limitsBeside      bool // the limits' names stand right of the plot, not in it
}

var (
	wideLayout   = layout{width: 156, height: 92, size: 3.25, left: 12, bottom: 15.2, top: 1.5, limitsBeside: true}
	narrowLayout = layout{width: 92, height: 108, size: 3.5, left: 2.5, bottom: 16, top: 1.5}
)

// Wide draws the chart for a page or a sheet of paper.
func (c *TemperatureChart) Wide() *Drawing { return c.draw(wideLayout) }

// Narrow draws the chart for a phone held upright.
func (c *TemperatureChart) Narrow() *Drawing { return c.draw(narrowLayout) }

// Pens and shades. The heaviest line is the one that must not be crossed.
var (
	ceilingPen     = Pen{WidthMM: 0.9, Shade: 1}
	hatchPen       = Pen{WidthMM: 0.16, Shade: 0.8}
	openCircuitPen = Pen{WidthMM: 0.5, Shade: 1}
	operatingPen   = Pen{WidthMM: 0.5, Shade: 1, DashMM: []float64{2, 1.1}}
	beyondPen      = Pen{WidthMM: 0.4, Shade: 1, DashMM: []float64{0.05, 1}, Round: true}
	meetingPen     = Pen{WidthMM: 0.45, Shade: 1}
	windowPen      = Pen{WidthMM: 0.2, Shade: 0.5}
	levelPen       = Pen{WidthMM: 0.25, Shade: 0.8, DashMM: []float64{0.7, 0.7}}
	hairPen        = Pen{WidthMM: 0.18, Shade: 0.6}
	finePen        = Pen{WidthMM: 0.16, Shade: 0.3}
	leaderPen      = Pen{WidthMM: 0.16, Shade: 0.6}
)

const (
	windowShade  = 0.055
	hatchSpacing = 1.7
	pointRadius  = 0.75
)

// chartDraft is a chart while it is drawn.
type chartDraft struct {
	layout
	*TemperatureChart
	plot               Box
	lowC, highC, highV float64
	levels             []Level // the horizontal limits that are drawn, apart from the ceiling
	items              []Item
	texts              []Item // painted last
	placer             placer
}

func (c *TemperatureChart) draw(l layout) *Drawing {
	d := &chartDraft{layout: l, TemperatureChart: c}
	d.scale()
	d.drawWindows()
	d.drawCeiling()
	d.drawMarks()
	d.drawLines()
	d.nameLimits()
	d.nameMeetings()
	d.nameLines()
	return &Drawing{WidthMM: l.width, HeightMM: l.height, Title: c.Title, Desc: c.Desc, Items: append(d.items, d.texts...)}
}

// scale finds the plot's place and the range of both axes. Voltage begins at 0.
func (d *chartDraft) scale() {
	d.lowC, d.highC, d.highV = math.Inf(1), math.Inf(-1), d.Ceiling.V
	see := func(at, v float64) {
		d.lowC, d.highC, d.highV = min(d.lowC, at), max(d.highC, at), max(d.highV, v)
	}
	for _, m := range d.Marks {
		if !m.Fine {
			see(m.AtC, 0)
		}
	}
	for _, m := range d.Meets {
		see(m.AtC, 0)
	}
	for _, line := range d.TemperatureChart.Lines {
		for _, p := range line.Points {
			see(p.AtC, p.V)
		}
		if line.Beyond != nil {
			see(line.Beyond.AtC, line.Beyond.V)
		}
	}
	d.widen()
	margin := max((d.highC-d.lowC)*0.035, 0.5)
	d.lowC, d.highC = d.lowC-margin, d.highC+margin
	d.highV *= 1.07
	right := 2.5
	if d.limitsBeside {
		right = d.limitsColumn() + limitsGap + 0.5
	}
	d.plot = Box{Point{d.left, d.top}, Point{d.width - right, d.height - d.bottom}}
}

// farthestLimit is how far above everything else, as a multiple, a limit may lie to
// be drawn; a farther one would press all else to the ground.
const farthestLimit = 1.6

// widen makes room for limits above the ceiling and the lines, and leaves out those too far away.
func (d *chartDraft) widen() {
	most := d.highV * farthestLimit
	for _, l := range d.Levels {
		if l.V <= most {
			d.highV = max(d.highV, l.V)
			d.levels = append(d.levels, l)
		}
	}
	for _, w := range d.Windows {
		for _, l := range []Level{w.Max, w.Min} {
			if l.V <= most {
				d.highV = max(d.highV, l.V)
				d.levels = append(d.levels, l)
			}
		}
	}
}

func (d *chartDraft) x(atC float64) float64 {
	return d.plot.Min.X + (atC-d.lowC)/(d.highC-d.lowC)*(d.plot.Max.X-d.plot.Min.X)
}

func (d *chartDraft) y(v float64) float64 {
	return d.plot.Max.Y - v/d.highV*(d.plot.Max.Y-d.plot.Min.Y)
}

func (d *chartDraft) across(v float64) []Point {
	return []Point{{d.plot.Min.X, d.y(v)}, {d.plot.Max.X, d.y(v)}}
}

func (d *chartDraft) add(items ...Item) { d.items = append(d.items, items...) }

func (d *chartDraft) drawWindows() {
	for _, w := range d.Windows {
		top, bottom := min(w.Max.V, d.highV), min(w.Min.V, d.highV)
		d.add(Area{"window", Box{Point{d.plot.Min.X, d.y(top)}, Point{d.plot.Max.X, d.y(bottom)}}, windowShade})
		d.drawLevel(windowPen, w.Max)
		d.drawLevel(windowPen, w.Min)
	}
	for _, l := range d.Levels {
		d.drawLevel(levelPen, l)
	}
	// The axes.
	d.add(Path{"axis", hairPen, [][]Point{{{d.plot.Min.X, d.plot.Min.Y}, {d.plot.Min.X, d.plot.Max.Y}, {d.plot.Max.X, d.plot.Max.Y}}}})
	if d.limitsBeside {
		d.drawVoltAxis()
	}
}

func (d *chartDraft) drawLevel(pen Pen, l Level) {
	if !slices.Contains(d.levels, l) {
		return
	}
	line := d.across(l.V)
	d.add(Path{"limit", pen, [][]Point{line}})
	d.placer.addInk(line, hairCost)
}

// drawVoltAxis numbers the voltage axis in round steps.
func (d *chartDraft) drawVoltAxis() {
	step := roundStep(d.highV / 6)
	for v := 0.0; v <= d.highV; v += step {
		y := d.y(v)
		d.add(Path{"axis", hairPen, [][]Point{{{d.plot.Min.X - 1, y}, {d.plot.Min.X, y}}}})
		number := strconv.FormatFloat(v, 'f', -1, 64)
		if v+step > d.highV {
			number += "\u00a0V"
		}
		text := Text{Role: "axis", At: Point{d.plot.Min.X - 1.6, y + 0.36*d.size}, Anchor: End, SizeMM: d.size * 0.9, Lines: []string{number}}
		if box := text.Box(); box.Min.X >= 0 && box.Min.Y >= 0 {
			d.write(text)
		}
	}
}

// roundStep returns the least of 1, 2, 2.5 and 5 times a power of ten that is not below x.
func roundStep(x float64) float64 {
	power := math.Pow(10, math.Floor(math.Log10(x)))
	for _, m := range []float64{1, 2, 2.5, 5} {
		if m*power >= x {
			return m * power
		}
	}
	return 10 * power
}

func (d *chartDraft) drawCeiling() {
	y := d.y(d.Ceiling.V)
	forbidden := Box{d.plot.Min, Point{d.plot.Max.X, y}}
	d.add(Path{"forbidden", hatchPen, hatch(forbidden, hatchSpacing)},
		Path{"ceiling", ceilingPen, [][]Point{d.across(d.Ceiling.V)}})
	d.placer.addInk(d.across(d.Ceiling.V), lineCost)
	d.placer.taken = append(d.placer.taken, forbidden)
}

func (d *chartDraft) drawMarks() {
	for _, m := range d.Marks {
		if m.Fine && (m.AtC < d.lowC || m.AtC > d.highC) {
			continue
		}
		x := d.x(m.AtC)
		text := Text{Role: "axis", At: Point{x, d.plot.Max.Y + 1.4 + d.size}, Anchor: Middle, SizeMM: d.size, Lines: m.Text}
		box := text.Box()
		text.At.X += max(0, 0.5-box.Min.X) - max(0, box.Max.X-(d.width-0.5))
		if d.isFree(text) {
			d.write(text)
		} else if m.Fine {
			continue
		}
		line := []Point{{x, d.plot.Min.Y}, {x, d.plot.Max.Y + 1}}
		pen := hairPen
		if m.Fine {
			pen = finePen
		}
		d.add(Path{"mark", pen, [][]Point{line}})
		d.placer.addInk(line, hairCost)
	}
}

func (d *chartDraft) drawLines() {
	for _, line := range d.TemperatureChart.Lines {
		points := d.points(line.Points)
		role, pen := "open-circuit", openCircuitPen
		if line.Kind == Operating {
			role, pen = "operating", operatingPen
		}
		if line.BetweenRows {
			pen = beyondPen
		}
		if line.Beyond != nil {
			further := []Point{{d.x(line.Beyond.AtC), d.y(line.Beyond.V)}, points[0]}
			d.add(Path{role, beyondPen, [][]Point{further}})
			d.placer.addInk(further, lineCost)
		}
		d.add(Path{role, pen, [][]Point{points}})
		d.placer.addInk(points, lineCost)
		for _, p := range points {
			d.add(Dot{role, p, pointRadius, line.Kind == Operating})
		}
	}
}

func (d *chartDraft) points(of []VoltagePoint) []Point {
	points := make([]Point, len(of))
	for i, p := range of {
		points[i] = Point{d.x(p.AtC), d.y(p.V)}
	}
	return points
}

// limits returns the names of all horizontal limits, the highest first.
func (d *chartDraft) limits() []Level {
	all := append([]Level{d.Ceiling}, d.levels...)
	slices.SortStableFunc(all, func(a, b Level) int { return cmp.Compare(b.V, a.V) })
	return all
}

const (
	limitsGap       = 4.5  // mm between the plot and the names beside it, for a joining line
	widestLimits    = 46.0 // mm that the names may take
	narrowestLimits = 12.0
)

// limitsColumn returns the width of the limits' names beside the plot.
func (d *chartDraft) limitsColumn() float64 {
	width := narrowestLimits
	for _, l := range d.limits() {
		width = max(width, textWidth(l.Text, d.size, l == d.Ceiling))
	}
	return min(width, widestLimits)
}

func (d *chartDraft) nameLimits() {
	if d.limitsBeside {
		d.nameLimitsBeside()
		return
	}
	name := func(l Level, edges ...float64) {
		var near []Point
		for _, v := range edges {
			if v > d.highV {
				continue
			}
			y := d.y(v)
			near = append(near, Point{d.plot.Max.X - 16, y}, Point{d.plot.Max.X - 32, y}, Point{d.plot.Min.X + 16, y}, Point{d.plot.Min.X + 32, y})
		}
		if near != nil {
			d.name(label{text: d.limitText(l), near: near, within: d.plot, leader: true})
		}
	}
	name(d.Ceiling, d.Ceiling.V)
	for _, w := range d.Windows {
		name(Level{w.Max.V, w.Text}, w.Max.V, w.Min.V)
	}
	for _, l := range d.Levels {
		name(l, l.V)
	}
}

func (d *chartDraft) limitText(l Level) Text {
	return Text{Role: "limit", SizeMM: d.size, Bold: l == d.Ceiling, Lines: []string{shortened(l.Text, widestLimits, d.size, l == d.Ceiling)}}
}

// nameLimitsBeside writes the names in a column right of the plot, each as near to
// its line as the others let it.
func (d *chartDraft) nameLimitsBeside() {
	limits := d.limits()
	height := textHeight(1, d.size) + 2*labelMargin/3
	tops := make([]float64, len(limits))
	for i, l := range limits {
		tops[i] = d.y(l.V) - height/2
	}
	if !stack(tops, height, 0, d.height-d.bottom) {
		return
	}
	for i, l := range limits {
		text := d.limitText(l)
		text.At = Point{d.plot.Max.X + limitsGap, tops[i] + ascent*d.size}
		d.write(text)
		from, to := d.y(l.V), tops[i]+height/2
		d.add(Path{"leader", leaderPen, [][]Point{{{d.plot.Max.X, from}, {d.plot.Max.X + 1, from}, {d.plot.Max.X + limitsGap - 1.6, to}, {d.plot.Max.X + limitsGap - 0.6, to}}}})
	}
}

func (d *chartDraft) nameMeetings() {
	for _, m := range d.Meets {
		at := Point{d.x(m.AtC), d.y(d.Ceiling.V)}
		d.add(Path{"meeting", meetingPen, [][]Point{{{at.X - 1.1, at.Y - 1.1}, {at.X + 1.1, at.Y + 1.1}}, {{at.X - 1.1, at.Y + 1.1}, {at.X + 1.1, at.Y - 1.1}}}})
		d.name(label{text: Text{Role: "meeting", SizeMM: d.size, Lines: d.broken(m.Text)}, near: []Point{at}, within: d.plot, leader: true})
	}
}

// nameLines writes the value at the ends of every line, then the name of each.
func (d *chartDraft) nameLines() {
	for _, line := range d.TemperatureChart.Lines {
		points := d.points(line.Points)
		for i, p := range line.Points {
			if p.Text != "" {
				text := Text{Role: "value", SizeMM: d.size, Lines: []string{shortened(p.Text, widestLimits, d.size, false)}}
				d.name(label{text: text, near: points[i : i+1], within: d.plot, leader: true})
			}
		}
	}
	for _, line := range d.TemperatureChart.Lines {
		name := line.Text
		if !d.limitsBeside {
			name = line.Short
		}
		text := Text{Role: "name", SizeMM: d.size, Lines: d.broken(name)}
		d.name(label{text: text, near: along(d.points(line.Points)), within: d.plot, leader: true})
	}
}

// along returns places along a line by which its name may stand, the middle first.
func along(points []Point) []Point {
	first, last := points[0], points[len(points)-1]
	places := make([]Point, 0, 7)
	for _, share := range []float64{0.5, 0.38, 0.62, 0.26, 0.74, 0.15, 0.85} {
		x := first.X + share*(last.X-first.X)
		for i := 1; i < len(points); i++ {
			p, q := points[i-1], points[i]
			if x <= q.X && q.X > p.X {
				places = append(places, Point{x, p.Y + (x-p.X)/(q.X-p.X)*(q.Y-p.Y)})
				break
			}
		}
	}
	if len(places) == 0 {
		places = append(places, first)
	}
	return places
}

func (d *chartDraft) name(l label) {
	out, ok := d.placer.place(l)
	if !ok {
		return
	}
	d.texts = append(d.texts, out.text)
	if out.leader != nil {
		d.add(Path{"leader", leaderPen, [][]Point{out.leader}})
	}
}

func (d *chartDraft) isFree(t Text) bool {
	box := t.Box()
	return !d.placer.isTaken(box) && Box{Max: Point{d.width, d.height}}.Contains(box)
}

// write puts a text whose place is known, if it is free.
func (d *chartDraft) write(t Text) {
	if d.isFree(t) {
		d.placer.taken = append(d.placer.taken, t.Box().grown(labelMargin/3))
		d.texts = append(d.texts, t)
	}
}

// broken returns a text as one line, or as several where it is wider than half the plot.
func (d *chartDraft) broken(text string) []string {
	room := (d.plot.Max.X - d.plot.Min.X) * 0.55
	var lines []string
	line := ""
	for word := range strings.SplitSeq(text, " ") {
		switch longer := strings.TrimSpace(line + " " + word); {
		case line == "" || textWidth(longer, d.size, false) <= room:
			line = longer
		default:
			lines = append(lines, line)
			line = word
		}
	}
	lines = append(lines, line)
	if most := 3; len(lines) > most {
		lines = append(lines[:most-1], lines[most-1]+"…")
	}
	for i := range lines {
		lines[i] = shortened(lines[i], room*1.2, d.size, false)
	}
	return lines
}

// shortened cuts a text that is wider than room, and says so by an ellipsis.
func shortened(text string, room, size float64, bold bool) string {
	if textWidth(text, size, bold) <= room {
		return text
	}
	runes := []rune(text)
	for len(runes) > 0 && textWidth(string(runes)+"…", size, bold) > room {
		runes = runes[:len(runes)-1]
	}
	return string(runes) + "…"
}
