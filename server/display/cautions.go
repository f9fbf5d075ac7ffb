package display

import (
	"strings"

	"rimeline/sizing/design"
	"rimeline/views"
)

// The standing cautions. The few of answerCautions stand beside every answer; the
// sheet has all.
var answerCautions = []views.Caution{
	{Title: "Live in daylight.", Text: "A string is live whenever light falls on it. Switching the inverter off does not change that."},
	{Title: "Never add a module on site.", Text: "The highest voltage comes on a cold bright morning, long after the work. A string over its ceiling can destroy the inverter and hurt people."},
	{Title: "Measure before connecting.", Text: "Check polarity and open-circuit voltage of every string, with a meter and leads rated for it."},
}

var sheetCautions = append(append([]views.Caution{}, answerCautions...),
	views.Caution{Title: "Never open a DC connector or fuse under load.", Text: "A direct-current arc does not go out by itself. Isolate, then prove with a clamp meter that no current flows."},
	views.Caution{Title: "Shock, arc flash and falls.", Text: "Work only with the protection that the task calls for; not on a wet, iced or windy roof, and well away from overhead lines."},
	views.Caution{Title: "Qualified persons only.", Text: "Licences and stamped plans are required where the law says so. Follow the instructions of every part: they are a condition of its listing."},
	views.Caution{Title: "The local code and the authority having jurisdiction decide.", Text: "Editions and amendments differ from place to place."},
	views.Caution{Title: "Calculated from what was typed.", Text: "Rimeline has seen neither the roof nor the datasheets. It does not inspect, certify or take the place of a qualified designer's judgement."},
)

// usualParts are the kinds of rated part that a DC circuit usually has, with words
// by which one of them is recognised among the stated limits.
var usualParts = []struct {
	name  string
	marks []string
}{
	{"connectors", []string{"connector", "plug"}},
	{"cable", []string{"cable", "wire", "conductor"}},
	{"switch", []string{"switch", "disconnect", "isolator"}},
	{"combiner", []string{"combiner", "junction"}},
	{"fuses", []string{"fuse"}},
	{"shutdown devices", []string{"shutdown", "rsd"}},
}

// uncheckedParts returns the usual parts whose voltage rating the design does not state.
func uncheckedParts(d *design.Design) []string {
	var names []string
	for _, part := range usualParts {
		if !statesLimitOf(d, part.marks) {
			names = append(names, part.name)
		}
	}
	return names
}

func statesLimitOf(d *design.Design, marks []string) bool {
	for _, o := range d.OtherLimits {
		name := strings.ToLower(o.Name)
		for _, m := range marks {
			if strings.Contains(name, m) {
				return true
			}
		}
	}
	return false
}

// notChecked returns what no check covers, a sentence each.
func notChecked(d *design.Design) []string {
	var words []string
	if parts := uncheckedParts(d); len(parts) > 0 {
		words = append(words, "Voltage rating of "+list(parts)+": not stated, not checked.")
	}
	return append(words,
		"Conductors: size, ampacity, their own protection and voltage drop. A circuit that its modules let go without a fuse may still need one for its conductors.",
		"Fuses and switches in a combiner; rapid shutdown; grounding, surge and arc-fault protection; the AC side.",
		"Shade, structure, wind and snow, access and fire setbacks.",
	)
}

// coldest tells what the coldest temperature is and what the other statistic would mean.
func coldest(d *design.Design) []string {
	at := statedDegrees(d.Site.Coldest)
	station := ""
	if d.Site.Station != "" {
		station = " at " + d.Site.Station
	}
	const share = "In a run of winters whose coldest hours scatter as extremes usually do (Gumbel's distribution), about 43" + nbsp + "% go below the mean"
	switch d.Site.ColdestBasis {
	case design.ColdestRecordLow:
		return []string{
			at + " is stated as the record low" + station + ": the coldest that was ever written down there.",
			"The other usual statistic, the annual extreme mean minimum, is warmer and may permit a longer string: it is the mean of each winter's coldest hour. " + share + ", in an hour with little sun. A record, too, can be broken.",
		}
	case design.ColdestMeanMinimum:
		words := at + " is stated as the annual extreme mean minimum" + station + ": the mean of each winter's coldest hour."
		if isNEC(d) {
			words = strings.TrimSuffix(words, ".") + ", which a note to NEC" + nbsp + "690.7 names as one source."
		}
		return []string{
			words,
			share + ". Little sun falls in that hour, which is why many accept it. The record low is colder and may permit fewer modules: look at how far below the coldest the ceiling is met.",
		}
	case design.BasisAuthority:
		return []string{at + " is stated as what the authority requires" + station + ". Whether it is a record or a mean of extremes is for the authority to say; a mean is undercut in about 43" + nbsp + "% of winters."}
	}
	return []string{
		at + " is stated" + station + " without a named statistic. It should be the record low or the annual extreme mean minimum; an average winter low is far too warm.",
	}
}
