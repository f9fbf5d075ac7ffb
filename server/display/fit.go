package display

import (
	"slices"
	"strconv"
	"strings"

	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/views"
)

// fitting is limits rows that say the same of several planes and trackers.
type fitting struct {
	fit       views.Fit
	row       *sizing.Limit
	planes    []string
	terminals []terminal
}

// fittings tells every limits row. Trackers of one inverter that say the same of a
// plane are told once, and then planes that say the same of the same trackers.
func (c *composer) fittings() []fitting {
	type key struct{ plane, inverter, text string }
	var all []fitting
	at := map[key]int{}
	for i := range c.r.Limits {
		row := &c.r.Limits[i]
		f := fitting{fit: c.fit(row), row: row, planes: []string{row.Plane}}
		k := key{row.Plane, row.Inverter, fitText(f.fit, row)}
		j, known := at[k]
		if !known {
			j = len(all)
			at[k] = j
			all = append(all, f)
		}
		all[j].terminals = append(all[j].terminals, terminal{inverter: row.Inverter, tracker: row.Tracker})
	}
	var merged []fitting
	for _, f := range all {
		j := slices.IndexFunc(merged, func(m fitting) bool {
			return fitText(m.fit, m.row) == fitText(f.fit, f.row) && slices.Equal(m.terminals, f.terminals)
		})
		if j < 0 {
			merged = append(merged, f)
			continue
		}
		merged[j].planes = append(merged[j].planes, f.planes...)
	}
	for i := range merged {
		merged[i].fit.Where = c.where(merged[i])
	}
	return merged
}

// fitText is everything a fit says, and the working behind it.
func fitText(f views.Fit, row *sizing.Limit) string {
	var b strings.Builder
	b.WriteString(f.Range)
	for _, s := range f.Reasons {
		b.WriteString("\x00" + s)
	}
	for _, s := range row.Steps {
		b.WriteString("\x00" + s.Symbol + s.WithNumbers)
	}
	return b.String()
}

// where names planes and trackers: "South plane on tracker t1", "South and west
// planes on trackers t1 and t2".
func (c *composer) where(f fitting) string {
	planes := c.plane(f.planes[0])
	if len(f.planes) > 1 {
		words := slices.Clone(f.planes)
		if slices.IndexFunc(f.planes, func(id string) bool { return !isWord(id) }) < 0 {
			planes = list(words) + " planes"
		} else {
			for i, id := range words {
				words[i] = c.plane(id)
			}
			planes = list(words)
		}
	}
	ids := make([]string, len(f.terminals))
	for i, t := range f.terminals {
		ids[i] = t.tracker
	}
	return capital(planes) + " on " + c.anyOf(f.row.Inverter, ids) + c.ofEach(f.row.Inverter)
}

// anyOf names trackers of which a string takes one: "tracker t1 or t2", "each
// tracker, t1 to t12".
func (c *composer) anyOf(inverter string, ids []string) string {
	words := c.trackerRange(inverter, ids)
	several, is := strings.CutPrefix(words, "trackers ")
	switch {
	case !is:
		return words
	case strings.Contains(several, " to "):
		return "each tracker, " + several + ","
	}
	return "tracker " + strings.Replace(several, " and ", " or ", 1)
}

// ofEach tells of which inverters where that needs saying.
func (c *composer) ofEach(inverter string) string {
	v := c.inverterByID(inverter)
	switch {
	case v != nil && v.Quantity > 1 && c.severalI:
		return " of each of the " + strconv.FormatInt(v.Quantity, 10) + nbsp + c.inverter(inverter)
	case v != nil && v.Quantity > 1:
		return " of each of the " + counted(v.Quantity, "inverter", "inverters")
	case c.severalI:
		return " of " + c.inverter(inverter)
	}
	return ""
}

// fit tells one limits row.
func (c *composer) fit(row *sizing.Limit) views.Fit {
	f := views.Fit{Range: c.rangeOf(row)}
	f.Reasons = append(f.Reasons, c.ceilingSentence(row))
	if s := c.fewestSentence(row); s != "" {
		f.Reasons = append(f.Reasons, s)
	}
	if s := c.stringsSentence(row); s != "" {
		f.Reasons = append(f.Reasons, s)
	}
	for _, s := range c.doubts(row) {
		f.Open = true
		f.Reasons = append(f.Reasons, s)
	}
	return f
}

// fewest returns the greater of the two minima, and whether the start sets it; ok is
// false where no number of modules reaches the window or the start voltage.
func (c *composer) fewest(row *sizing.Limit) (n int64, byStart, ok bool) {
	if v := c.inverterByID(row.Inverter); v != nil && v.StartVoltageV != nil && row.MinModulesStart == nil {
		return 0, true, false
	}
	if row.MinModules == nil {
		return 0, false, false
	}
	n = *row.MinModules
	if row.MinModulesStart != nil && *row.MinModulesStart > n {
		return *row.MinModulesStart, true, true
	}
	return n, false, true
}

// rangeOf tells how many modules in series and how many strings.
func (c *composer) rangeOf(row *sizing.Limit) string {
	low, _, ok := c.fewest(row)
	switch {
	case !ok || row.MaxModules == 0 || low > row.MaxModules:
		return "no number of modules in series fits"
	case row.MaxStrings == 0:
		return span(low, row.MaxModules) + " in series, but no string"
	}
	return span(low, row.MaxModules) + " in series, up to " + countStrings(row.MaxStrings)
}

func span(low, high int64) string {
	if low == high {
		return "exactly " + countModules(low)
	}
	return strconv.FormatInt(low, 10) + " to " + countModules(high)
}

// ceilingName is what a limit of the ceiling is called in a sentence.
func (c *composer) ceilingName(from string) string {
	if from != "structure" {
		return from
	}
	switch c.d.Site.Structure {
	case design.StructureDwelling:
		return "dwelling"
	case design.StructureGround:
		return "ground mounting"
	}
	return "building"
}

// ceilingSentence tells the ceiling, whose it is and where it would be met.
func (c *composer) ceilingSentence(row *sizing.Limit) string {
	var names []string
	for _, e := range row.Ceiling {
		if e.Governs {
			names = append(names, c.ceilingName(e.From))
		}
	}
	whose := ""
	switch {
	case len(names) == 1:
		whose = " (of the " + names[0] + ")"
	case len(names) > 1:
		whose = " (" + list(names) + " alike)"
	}
	s := "The ceiling is " + statedIn(row.VoltageCeilingV, "V") + whose
	switch {
	case row.MaxModules == 0:
		return s + "; a single module exceeds it at the coldest."
	case row.ReachedAtC == nil && c.byTable():
		return s + "; " + countModules(row.MaxModules) + " keep under it by the table."
	case row.ReachedAtC == nil:
		return s + "; " + countModules(row.MaxModules) + " would meet it only below " + wholeDegrees(-60) + "."
	case row.MaxModules == 1:
		return s + "; 1" + nbsp + "module " + c.reachedWords(*row.ReachedAtC) + "."
	}
	return s + "; " + countModules(row.MaxModules) + " " + c.reachedByMany(*row.ReachedAtC) + "."
}

func (c *composer) reachedByMany(at quantity.Exact) string {
	words := c.reachedWords(at)
	for _, verb := range []string{"keeps ", "meets "} {
		if rest, found := strings.CutPrefix(words, verb); found {
			return verb[:len(verb)-2] + " " + rest
		}
	}
	return words
}

// fewestSentence tells what sets the lower end of the range.
func (c *composer) fewestSentence(row *sizing.Limit) string {
	low, byStart, ok := c.fewest(row)
	t, _ := c.trackerByID(row.Inverter, row.Tracker)
	v := c.inverterByID(row.Inverter)
	if t == nil || v == nil {
		return ""
	}
	if !ok {
		return "On the hottest roof a module's voltage is not above zero, so no string reaches the tracker's window or starts the inverter."
	}
	short := "leave the tracker's window, " + statedIn(t.MPPTMinV, "V") + ", on the hottest roof"
	if byStart && v.StartVoltageV != nil {
		short = "not start a hot inverter, which takes " + statedIn(*v.StartVoltageV, "V")
	}
	if low > row.MaxModules {
		return "At least " + countModules(low) + " are needed, or the string would " + short + "; at most " + strconv.FormatInt(row.MaxModules, 10) + " stay under the ceiling."
	}
	if low <= 1 {
		return ""
	}
	return "Fewer than " + strconv.FormatInt(low, 10) + " would " + short + "."
}

// stringsSentence tells what sets the number of strings where it is not the inputs alone.
func (c *composer) stringsSentence(row *sizing.Limit) string {
	t, _ := c.trackerByID(row.Inverter, row.Tracker)
	if t == nil {
		return ""
	}
	switch {
	case row.MaxStringsFrom == "short-circuit" && row.MaxStrings == 0:
		return "A single string's short-circuit current is more than the tracker or one of its inputs withstands."
	case row.MaxStringsFrom == "short-circuit" && t.MaxShortCircuitA != nil:
		return "The tracker's short-circuit limit, " + statedIn(*t.MaxShortCircuitA, "A") + ", permits fewer strings than its " + counted(t.Inputs, "input", "inputs") + "."
	}
	return ""
}

// doubts tells what keeps a row from being confirmed.
func (c *composer) doubts(row *sizing.Limit) []string {
	var words []string
	if row.MaxStringsFrom == "inputs-unconfirmed" {
		words = append(words, "The number of strings is unconfirmed: the tracker's short-circuit limit is not stated, so only its inputs are counted.")
	}
	if c.d.VoltageMethod == design.MethodWeather {
		words = append(words, "Unconfirmed: the cold voltage is by the weather method.")
	}
	p := c.planeByID(row.Plane)
	if p == nil {
		return words
	}
	for i := range c.d.Modules {
		if c.d.Modules[i].ID != p.Module {
			continue
		}
		var asked []string
		for _, q := range c.r.Questions {
			if name := c.call(q.Pointer); q.Unsafe && strings.HasPrefix(q.Pointer, "/modules/"+strconv.Itoa(i)+"/") && !slices.Contains(asked, name) {
				asked = append(asked, name)
			}
		}
		if len(asked) > 0 {
			words = append(words, "Unconfirmed while the question about "+list(asked)+" is open.")
		}
	}
	return words
}
