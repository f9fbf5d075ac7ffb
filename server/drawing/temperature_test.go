package drawing

import (
	"encoding/xml"
	"fmt"
	"io"
	"math/rand/v2"
	"strings"
	"testing"
)

// exampleChart is a chart of invented strings: two lengths on one tracker, the longer
// of which would meet the ceiling on a morning colder than any expected.
func exampleChart() *TemperatureChart {
	return &TemperatureChart{
		Title: "Tracker t1", Desc: "Two strings.",
		Marks: []TemperatureMark{
			{AtC: -21, Text: []string{"coldest", "−21.0 °C", "−5.8 °F"}},
			{AtC: 67, Text: []string{"hottest cell", "67.0 °C", "152.6 °F"}},
			{AtC: 25, Text: []string{"STC", "25 °C", "77 °F"}, Fine: true},
		},
		Ceiling: Level{1000, "ceiling 1000 V"},
		Windows: []Window{
			{Level{160, "MPPT minimum 160 V"}, Level{850, "MPPT maximum 850 V"}, "MPPT 160 to 850 V"},
			{Level{380, "full power from 380 V"}, Level{800, "full power to 800 V"}, "full power 380 to 800 V"},
		},
		Levels: []Level{{180, "start 180 V"}},
		Lines: []VoltageLine{
			{Kind: OpenCircuit, Text: "23 in series, open circuit", Short: "23 open circuit",
				Points: []VoltagePoint{{-21, 965, "965.0 V"}, {25, 858, ""}, {67, 761, ""}}, Beyond: &VoltagePoint{AtC: -36.1, V: 1000}},
			{Kind: Operating, Text: "23 in series, operating", Short: "23 operating",
				Points: []VoltagePoint{{-21, 831, ""}, {25, 719, ""}, {67, 598, "597.8 V"}}},
			{Kind: OpenCircuit, Text: "12 in series, open circuit", Short: "12 open circuit",
				Points: []VoltagePoint{{-21, 503, "503.5 V"}, {25, 448, ""}, {67, 397, ""}}},
			{Kind: Operating, Text: "12 in series, operating", Short: "12 operating",
				Points: []VoltagePoint{{-21, 434, ""}, {25, 375, ""}, {67, 312, "311.9 V"}}},
		},
		Meets: []Meeting{{-36.1, "23 would meet the ceiling at −36.1 °C"}},
	}
}

func texts(d *Drawing) []Text {
	var all []Text
	for _, item := range d.Items {
		if t, ok := item.(Text); ok {
			all = append(all, t)
		}
	}
	return all
}

// clash returns the first two labels that overlap, or the first that leaves the drawing.
func clash(d *Drawing) error {
	all := texts(d)
	page := Box{Max: Point{d.WidthMM, d.HeightMM}}
	for i, t := range all {
		if !page.Contains(t.Box()) {
			return fmt.Errorf("label %q leaves the drawing: %v", t.Lines, t.Box())
		}
		for _, u := range all[:i] {
			if t.Box().Overlaps(u.Box()) {
				return fmt.Errorf("labels %q and %q overlap: %v, %v", t.Lines, u.Lines, t.Box(), u.Box())
			}
		}
	}
	return nil
}

// randomChart is a chart of anything a design may come to, likely or not.
func randomChart(r *rand.Rand) *TemperatureChart {
	between := func(low, high float64) float64 { return low + r.Float64()*(high-low) }
	name := func() string {
		words := []string{"full power", "MPPT", "south", "open circuit", "Ω≥漢字", strings.Repeat("long ", r.IntN(12)), "", "WWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWW"}
		return words[r.IntN(len(words))] + fmt.Sprintf(" %.*f V", r.IntN(9), between(0, 2000))
	}
	cold := between(-90, 50)
	hot := cold + between(0, 120)*r.Float64()
	c := &TemperatureChart{Ceiling: Level{between(1, 2000), name()}}
	mark := func(at float64, fine bool) {
		c.Marks = append(c.Marks, TemperatureMark{at, []string{name(), fmt.Sprintf("%.1f °C", at), "°F"}, fine})
	}
	mark(cold, false)
	mark(hot, false)
	mark(25, true)
	for range r.IntN(3) {
		low := between(0, 1500)
		c.Windows = append(c.Windows, Window{Level{low, name()}, Level{low + between(0, 500)*[]float64{1, 1, 1e12}[r.IntN(3)], name()}, name()})
	}
	for range r.IntN(3) {
		c.Levels = append(c.Levels, Level{between(0, 1500) * []float64{1, 1, 1e9}[r.IntN(3)], name()})
	}
	for range r.IntN(9) {
		line := VoltageLine{Kind: LineKind(r.IntN(2)), Text: name(), Short: name(), BetweenRows: r.IntN(4) == 0}
		at, v := cold, between(0, 1800)
		for range 1 + r.IntN(3) {
			line.Points = append(line.Points, VoltagePoint{at, v, name()})
			at, v = at+(hot-at)*r.Float64(), v*between(0.5, 1)
		}
		if r.IntN(3) == 0 {
			line.Beyond = &VoltagePoint{AtC: cold - between(0, 30), V: c.Ceiling.V}
		}
		c.Lines = append(c.Lines, line)
	}
	for range r.IntN(3) {
		c.Meets = append(c.Meets, Meeting{cold - between(-30, 30), name()})
	}
	return c
}

// strayPoint returns a point of a line, area or dot that lies outside the drawing.
func strayPoint(d *Drawing) (Point, bool) {
	page := Box{Max: Point{d.WidthMM, d.HeightMM}}.grown(1e-6)
	var points []Point
	for _, item := range d.Items {
		switch item := item.(type) {
		case Path:
			for _, line := range item.Lines {
				points = append(points, line...)
			}
		case Area:
			points = append(points, item.Box.Min, item.Box.Max)
		case Dot:
			points = append(points, item.At)
		}
	}
	for _, p := range points {
		if !page.Contains(Box{p, p}) {
			return p, true
		}
	}
	return Point{}, false
}

// No two labels overlap and none leaves the drawing, whatever is drawn.
func TestLabelsNeverOverlap(t *testing.T) {
	n := 2500
	if testing.Short() {
		n = 400
	}
	r := rand.New(rand.NewPCG(7, 77))
	for i := range n {
		c := randomChart(r)
		for _, d := range []*Drawing{c.Wide(), c.Narrow()} {
			if err := clash(d); err != nil {
				t.Fatalf("chart %d, %g mm wide: %v", i, d.WidthMM, err)
			}
			if p, out := strayPoint(d); out {
				t.Fatalf("chart %d, %g mm wide: a line goes to %v, outside the drawing", i, d.WidthMM, p)
			}
		}
	}
}

// A chart as designs have them says everything: no label is left out for want of room.
func TestEveryLabelOfAnOrdinaryChartIsPlaced(t *testing.T) {
	c := exampleChart()
	for _, test := range []struct {
		name string
		d    *Drawing
		want []string
	}{
		{"wide", c.Wide(), []string{
			"ceiling 1000 V", "MPPT minimum 160 V", "MPPT maximum 850 V", "full power from 380 V", "full power to 800 V", "start 180 V",
			"23 in series, open circuit", "23 in series, operating", "12 in series, open circuit", "12 in series, operating",
			"965.0 V", "597.8 V", "503.5 V", "311.9 V", "23 would meet the ceiling at −36.1 °C", "coldest −21.0 °C −5.8 °F", "hottest cell 67.0 °C 152.6 °F", "STC 25 °C 77 °F"}},
		{"narrow", c.Narrow(), []string{
			"ceiling 1000 V", "MPPT 160 to 850 V", "full power 380 to 800 V", "start 180 V",
			"23 open circuit", "23 operating", "12 open circuit", "12 operating",
			"965.0 V", "597.8 V", "503.5 V", "311.9 V", "23 would meet the ceiling at −36.1 °C", "coldest −21.0 °C −5.8 °F", "hottest cell 67.0 °C 152.6 °F", "STC 25 °C 77 °F"}},
	} {
		said := map[string]bool{}
		for _, text := range texts(test.d) {
			said[strings.Join(text.Lines, " ")] = true
		}
		for _, want := range test.want {
			if !said[want] {
				t.Errorf("%s: no label %q", test.name, want)
			}
		}
		if err := clash(test.d); err != nil {
			t.Errorf("%s: %v", test.name, err)
		}
	}
}

// Every computed point lies where its numbers say: a hotter one further right, a
// higher voltage further up, and what exceeds the ceiling is in the hatch.
func TestPointsLieInOrder(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 5))
	for range 500 {
		c := randomChart(r)
		d := &chartDraft{layout: wideLayout, TemperatureChart: c}
		d.scale()
		for _, line := range c.Lines {
			for i, p := range d.points(line.Points) {
				if !d.plot.grown(1e-9).Contains(Box{p, p}) {
					t.Fatalf("point %v of %+v lies outside the plot %v", p, line.Points[i], d.plot)
				}
				if (line.Points[i].V > c.Ceiling.V) != (p.Y < d.y(c.Ceiling.V)) {
					t.Fatalf("%g V and a ceiling of %g V: drawn at %g and %g mm", line.Points[i].V, c.Ceiling.V, p.Y, d.y(c.Ceiling.V))
				}
			}
		}
	}
}

func TestSVGIsWellFormed(t *testing.T) {
	c := exampleChart()
	c.Title = `Tracker "t1" <south> & west's`
	c.Lines[0].Text = "<b>&\"'"
	svg := c.Wide().SVG("c1")
	if strings.Contains(svg, "<b>") {
		t.Error("a label's markup is not escaped")
	}
	for _, want := range []string{`role="img"`, `aria-labelledby="c1-title"`, `aria-describedby="c1-desc"`, `<desc id="c1-desc">Two strings.</desc>`} {
		if !strings.Contains(svg, want) {
			t.Errorf("no %s", want)
		}
	}
	// A page's content policy forbids styles in attributes.
	if strings.Contains(svg, "style=") {
		t.Error("the drawing has a style attribute")
	}
	decoder := xml.NewDecoder(strings.NewReader(svg))
	for {
		_, err := decoder.Token()
		if err == io.EOF {
			break
		}
		if err != nil {
			t.Fatalf("not XML: %v", err)
		}
	}
	if again := c.Wide().SVG("c1"); again != svg {
		t.Error("the same chart drawn twice differs")
	}
}

// Strings are told apart by weight and dash, not by colour: the drawing names none.
func TestNoColour(t *testing.T) {
	svg := exampleChart().Wide().SVG("c")
	for part := range strings.SplitSeq(svg, `"`) {
		if strings.HasPrefix(part, "#") && part != "#fff" || strings.HasPrefix(part, "rgb") {
			t.Errorf("colour %s", part)
		}
	}
	c := exampleChart()
	open, operating := openCircuitPen, operatingPen
	if len(open.DashMM) != 0 || len(operating.DashMM) == 0 || ceilingPen.WidthMM <= open.WidthMM {
		t.Errorf("pens of %s do not differ by dash and weight", c.Title)
	}
}

func BenchmarkChart(b *testing.B) {
	c := exampleChart()
	b.ReportAllocs()
	for b.Loop() {
		c.Wide().SVG("a")
		c.Narrow().SVG("b")
	}
}
