package display

import (
	"cmp"
	"math"
	"slices"
	"strconv"
	"strings"

	"rimeline/server/drawing"
	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
	"rimeline/views"
)

// chart is one temperature chart before it is drawn, with what is needed to find
// equal ones.
type chart struct {
	terminals []terminal
	drawing   drawing.TemperatureChart
	view      views.Chart
}

// charts draws a chart for each tracker in use; trackers that carry the same are
// drawn once. Where nothing is strung yet it draws what fits.
func (c *composer) charts(fittings []fitting) []views.Chart {
	var all []chart
	if len(c.d.Strings) == 0 {
		for _, f := range fittings {
			if _, _, ok := c.fewest(f.row); ok && f.row.MaxModules > 0 {
				all = append(all, c.fittingChart(f))
			}
		}
	}
	for _, t := range c.inUse() {
		all = append(all, c.trackerChart(t))
	}
	all = mergeCharts(all)
	var out []views.Chart
	for i := range all {
		if len(c.d.Strings) > 0 {
			all[i].view.Of = capital(c.terminals(all[i].terminals))
		}
		all[i].drawing.Title = all[i].view.Of + ": voltage against cell temperature"
		all[i].drawing.Desc = all[i].view.Says
		id := "chart-" + strconv.Itoa(i+1)
		all[i].view.Wide = all[i].drawing.Wide().SVG(id)
		all[i].view.Narrow = all[i].drawing.Narrow().SVG(id + "-narrow")
		out = append(out, all[i].view)
	}
	return out
}

// inUse returns the trackers that strings are on, in the design's order.
func (c *composer) inUse() []terminal {
	var all []terminal
	order := map[terminal][2]int{}
	for _, s := range c.d.Strings {
		t := terminal{s.Inverter, s.Unit, s.Tracker}
		if _, known := order[t]; known {
			continue
		}
		_, k := c.trackerByID(s.Inverter, s.Tracker)
		order[t] = [2]int{slices.IndexFunc(c.d.Inverters, func(v design.Inverter) bool { return v.ID == s.Inverter }), k}
		all = append(all, t)
	}
	slices.SortFunc(all, func(a, b terminal) int {
		return cmp.Or(cmp.Compare(order[a][0], order[b][0]), cmp.Compare(a.unit, b.unit), cmp.Compare(order[a][1], order[b][1]))
	})
	return all
}

func mergeCharts(all []chart) []chart {
	var merged []chart
	for _, ch := range all {
		j := slices.IndexFunc(merged, func(m chart) bool {
			return m.view.Of == ch.view.Of && m.view.Says == ch.view.Says &&
				slices.Equal(m.view.Lines, ch.view.Lines) && slices.Equal(m.view.Levels, ch.view.Levels)
		})
		if j < 0 {
			merged = append(merged, ch)
			continue
		}
		merged[j].terminals = append(merged[j].terminals, ch.terminals...)
	}
	return merged
}

// place is a number's place on a drawing; it is never judged.
func place(x quantity.Exact) float64 {
	f, _ := x.Rat().Float64()
	return f
}

const stcC = 25

// frame makes a chart with the temperatures of the site and the limits of a tracker.
func (c *composer) frame(row *sizing.Limit, hotCell quantity.Exact) chart {
	var ch chart
	d := &ch.drawing
	cold := c.d.Site.Coldest.Celsius()
	d.Marks = []drawing.TemperatureMark{
		{AtC: place(cold), Text: []string{"coldest", celsius(cold, quantity.Nearest), fahrenheit(cold, quantity.Nearest)}},
		{AtC: place(hotCell), Text: []string{"hottest cell", celsius(hotCell, quantity.Nearest), fahrenheit(hotCell, quantity.Nearest)}},
		{AtC: stcC, Text: []string{"STC", "25" + nbsp + "°C", "77" + nbsp + "°F"}, Fine: true},
	}
	ch.view.Cold = "Coldest, " + degrees(cold, quantity.Nearest)
	ch.view.STC = "STC, 25" + nbsp + "°C (77" + nbsp + "°F)"
	ch.view.Hot = "Hottest cell, " + degrees(hotCell, quantity.Nearest)
	level := func(name string, x quantity.Exact) drawing.Level {
		ch.view.Levels = append(ch.view.Levels, views.ChartLevel{Name: name, Value: statedIn(x, "V")})
		return drawing.Level{V: place(x), Text: name + " " + statedIn(x, "V")}
	}
	d.Ceiling = level("ceiling", row.VoltageCeilingV)
	if t, _ := c.trackerByID(row.Inverter, row.Tracker); t != nil {
		d.Windows = append(d.Windows, drawing.Window{
			Max: level("MPPT maximum", t.MPPTMaxV), Min: level("MPPT minimum", t.MPPTMinV),
			Text: "MPPT " + stated(t.MPPTMinV) + " to " + statedIn(t.MPPTMaxV, "V"),
		})
		if t.FullPowerMinV != nil && t.FullPowerMaxV != nil {
			d.Windows = append(d.Windows, drawing.Window{
				Max: level("full power to", *t.FullPowerMaxV), Min: level("full power from", *t.FullPowerMinV),
				Text: "full power " + stated(*t.FullPowerMinV) + " to " + statedIn(*t.FullPowerMaxV, "V"),
			})
		} else if t.FullPowerMinV != nil {
			d.Levels = append(d.Levels, level("full power from", *t.FullPowerMinV))
		} else if t.FullPowerMaxV != nil {
			d.Levels = append(d.Levels, level("full power to", *t.FullPowerMaxV))
		}
	}
	if v := c.inverterByID(row.Inverter); v != nil && v.StartVoltageV != nil {
		d.Levels = append(d.Levels, level("start", *v.StartVoltageV))
	}
	return ch
}

// trackerChart draws what is wired on a tracker.
func (c *composer) trackerChart(t terminal) chart {
	var entries []int
	for i, s := range c.d.Strings {
		if (terminal{s.Inverter, s.Unit, s.Tracker}) == t {
			entries = append(entries, i)
		}
	}
	row := c.limitOfString(entries[0])
	hottest := c.cellHot(entries[0])
	for _, i := range entries {
		hottest = quantity.Max(hottest, c.cellHot(i))
		if other := c.limitOfString(i); other.VoltageCeilingV.Less(row.VoltageCeilingV) {
			row = other
		}
	}
	ch := c.frame(row, hottest)
	ch.terminals = []terminal{t}
	lines := c.distinctLines(entries)
	for _, group := range lines {
		c.addString(&ch, group, len(lines) > 1)
	}
	ch.view.Says = c.chartSays(&ch)
	return ch
}

// distinctLines groups strings entries that have the same lines.
func (c *composer) distinctLines(entries []int) [][]int {
	var groups [][]int
	for _, i := range entries {
		j := slices.IndexFunc(groups, func(g []int) bool {
			a, b := &c.r.Strings[i], &c.r.Strings[g[0]]
			return a.ModulesInSeries == b.ModulesInSeries && a.VocColdV.Equal(b.VocColdV) &&
				a.VmpSTCV.Equal(b.VmpSTCV) && a.VmpHotV.Equal(b.VmpHotV) && c.cellHot(i).Equal(c.cellHot(g[0]))
		})
		if j < 0 {
			groups = append(groups, []int{i})
		} else {
			groups[j] = append(groups[j], i)
		}
	}
	return groups
}

// cellHot returns the hottest cell of a strings entry's plane, °C, as the engine states it.
func (c *composer) cellHot(i int) quantity.Exact {
	return c.hottestCell(c.planeOfString(i))
}

func (c *composer) hottestCell(p *design.Plane) quantity.Exact {
	return c.d.Site.Hottest.Celsius().Add(p.HotCellRise.Celsius())
}

// addString adds the two lines of equal strings entries.
func (c *composer) addString(ch *chart, entries []int, several bool) {
	s := &c.r.Strings[entries[0]]
	what := strconv.FormatInt(s.ModulesInSeries, 10) + " in series"
	short := strconv.FormatInt(s.ModulesInSeries, 10)
	if several {
		var planes []string
		for _, i := range entries {
			if p := c.d.Strings[i].Plane; !slices.Contains(planes, p) {
				planes = append(planes, p)
			}
		}
		what += " (" + list(planes) + ")"
		short += " " + list(planes)
	}
	cold, hot := c.d.Site.Coldest.Celsius(), c.cellHot(entries[0])
	ceiling := c.checkOf("voltage-ceiling", entries[0])

	voc := drawing.VoltageLine{Kind: drawing.OpenCircuit, Text: what + ", open circuit", Short: short + " open circuit", BetweenRows: c.byTable()}
	voc.Points = points(
		drawing.VoltagePoint{AtC: place(cold), V: place(s.VocColdV), Text: stringVolts(s.VocColdV, quantity.Up)},
		drawing.VoltagePoint{AtC: stcC, V: place(s.VocSTCV)},
		drawing.VoltagePoint{AtC: place(hot), V: place(s.VocHotV)})
	vocView := views.ChartLine{
		Name: capital(what) + ", open circuit", Cold: stringVolts(s.VocColdV, quantity.Up),
		STC: stringVolts(s.VocSTCV, quantity.Nearest), Hot: stringVolts(s.VocHotV, quantity.Down),
	}
	if ceiling != nil && ceiling.ReachedAtC != nil && !c.byTable() {
		c.addMeeting(ch, &voc, what, *ceiling.ReachedAtC, ceiling.Limit)
	}

	vmp := drawing.VoltageLine{Kind: drawing.Operating, Text: what + ", operating", Short: short + " operating"}
	vmp.Points = points(
		drawing.VoltagePoint{AtC: stcC, V: place(s.VmpSTCV)},
		drawing.VoltagePoint{AtC: place(hot), V: place(s.VmpHotV), Text: stringVolts(s.VmpHotV, quantity.Down)})
	vmpView := views.ChartLine{Name: capital(what) + ", operating", STC: stringVolts(s.VmpSTCV, quantity.Nearest), Hot: stringVolts(s.VmpHotV, quantity.Down)}
	if upper := c.checkOf("cold-upper", entries[0]); upper != nil && upper.Value != nil {
		vmp.Points = points(append(vmp.Points, drawing.VoltagePoint{AtC: place(cold), V: place(*upper.Value)})...)
		vmpView.Cold = stringVolts(*upper.Value, quantity.Up)
	}
	ch.drawing.Lines = append(ch.drawing.Lines, voc, vmp)
	ch.view.Lines = append(ch.view.Lines, vocView, vmpView)
}

// farthestMeeting is how much colder than the coldest a meeting with the ceiling may
// be to be drawn; beyond it the drawing would be mostly of weather that never comes.
const farthestMeeting = 30.0

// addMeeting marks the temperature at which a string would meet the ceiling.
func (c *composer) addMeeting(ch *chart, line *drawing.VoltageLine, what string, at quantity.Exact, ceiling *quantity.Exact) {
	cold := place(c.d.Site.Coldest.Celsius())
	if ceiling == nil || place(at) < cold-farthestMeeting || place(at) > line.Points[len(line.Points)-1].AtC {
		return
	}
	verb := " would meet the ceiling at "
	if place(at) >= cold {
		verb = " meet the ceiling at "
	} else {
		line.Beyond = &drawing.VoltagePoint{AtC: place(at), V: place(*ceiling)}
	}
	number, _, _ := strings.Cut(what, " ")
	ch.drawing.Meets = append(ch.drawing.Meets, drawing.Meeting{AtC: place(at), Text: number + verb + celsius(at, quantity.Up)})
}

// points puts points in the order of temperature; of two at one temperature the first stays.
func points(of ...drawing.VoltagePoint) []drawing.VoltagePoint {
	slices.SortStableFunc(of, func(a, b drawing.VoltagePoint) int {
		switch {
		case a.AtC < b.AtC:
			return -1
		case a.AtC > b.AtC:
			return 1
		}
		return 0
	})
	return slices.CompactFunc(of, func(a, b drawing.VoltagePoint) bool { return math.Abs(a.AtC-b.AtC) < 1e-9 })
}

func (c *composer) checkOf(id string, entry int) *working.Check {
	for i := range c.r.Checks {
		if k := &c.r.Checks[i]; k.ID == id && k.About.String == entry {
			return k
		}
	}
	return nil
}

// fittingChart draws the longest and the shortest string that fit, where nothing is strung.
func (c *composer) fittingChart(f fitting) chart {
	row := f.row
	p := c.planeByID(row.Plane)
	m := c.d.Module(p.Module)
	hot := c.hottestCell(p)
	ch := c.frame(row, hot)
	ch.view.Of = f.fit.Where
	ch.terminals = f.terminals
	cold := c.d.Site.Coldest.Celsius()
	longest := strconv.FormatInt(row.MaxModules, 10)
	n := float64(row.MaxModules)
	voc := drawing.VoltageLine{Kind: drawing.OpenCircuit, Text: longest + " in series, open circuit", Short: longest + " open circuit", BetweenRows: c.byTable()}
	voc.Points = points(
		drawing.VoltagePoint{AtC: place(cold), V: n * place(row.ModuleVocColdV)},
		drawing.VoltagePoint{AtC: stcC, V: n * place(m.VocV)})
	for _, step := range row.Steps {
		if step.Symbol == "Voc,hot" {
			voc.Points = points(append(voc.Points, drawing.VoltagePoint{AtC: place(hot), V: n * place(step.Value)})...)
		}
	}
	if row.ReachedAtC != nil && !c.byTable() {
		c.addMeeting(&ch, &voc, longest+" in series", *row.ReachedAtC, &row.VoltageCeilingV)
	}
	low, _, _ := c.fewest(row)
	shortest := strconv.FormatInt(low, 10)
	vmp := drawing.VoltageLine{Kind: drawing.Operating, Text: shortest + " in series, operating", Short: shortest + " operating"}
	vmp.Points = points(
		drawing.VoltagePoint{AtC: stcC, V: float64(low) * place(m.VmpV)},
		drawing.VoltagePoint{AtC: place(hot), V: float64(low) * place(row.ModuleVmpHotV)})
	ch.drawing.Lines = []drawing.VoltageLine{voc, vmp}
	ch.view.Lines = []views.ChartLine{
		{Name: "One module, open circuit", Cold: moduleVolts(row.ModuleVocColdV, quantity.Up), STC: statedIn(m.VocV, "V")},
		{Name: "One module, operating", STC: statedIn(m.VmpV, "V"), Hot: moduleVolts(row.ModuleVmpHotV, quantity.Down)},
	}
	ch.view.Says = "The longest string that fits stays under the ceiling on the coldest morning; the shortest stays in the tracker's window on the hottest roof."
	return ch
}

// chartSays tells the drawing in a sentence.
func (c *composer) chartSays(ch *chart) string {
	lowest, highest := "", ""
	for _, l := range ch.view.Lines {
		if strings.HasSuffix(l.Name, "open circuit") {
			highest = joinNonEmpty(highest, l.Cold)
		} else {
			lowest = joinNonEmpty(lowest, l.Hot)
		}
	}
	s := "Voltage falls as the cells warm: from " + highest + " open-circuit on the coldest morning to " + lowest + " operating in the hottest cells. The ceiling is " + ch.view.Levels[0].Value
	if len(ch.drawing.Windows) > 0 {
		s += ", the tracker's window " + ch.drawing.Windows[0].Text[len("MPPT "):]
	}
	return s + "."
}

func joinNonEmpty(a, b string) string {
	if a == "" {
		return b
	}
	return a + " and " + b
}
