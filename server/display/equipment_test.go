package display

import (
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"

	"rimeline/sizing/design"
	"rimeline/views"
)

// TestFigures: the example's own numbers, in the columns of a list; ~ is the space of a
// digit, ' that of a point.
func TestFigures(t *testing.T) {
	c := changed(t, variants["two modules"]...)
	differing := changed(t, change{"/inverters/0/trackers/1/inputs", 1}, change{"/inverters/0/trackers/1/mppt_max_v", 800},
		change{"/inverters/0/trackers/1/max_short_circuit_current_a", nil}, change{"/inverters/0/ac_rated_w", nil})
	for name, c := range map[string]struct {
		got  [][]views.EquipmentFigure
		want []string
	}{
		"modules": {ModuleFigures([]*design.Module{&c.d.Modules[0], nil, &c.d.Modules[1]}), []string{
			"410 W|37.32 V|13.95 A|−0.27 %/°C|1000 V",
			"||||",
			"300 W|40'~~ V|9.6~ A|−0.3~ %/°C|1000 V",
		}},
		"inverters": {InverterFigures([]*design.Inverter{&c.d.Inverters[0], &differing.d.Inverters[0]}), []string{
			"1000 V|160 to 850 V|2 × 2|40 A|12000 W",
			"1000 V|160 to 850 V, 160 to 800 V|1 × 2, 1 × 1|40 A, not stated|",
		}},
		"none": {ModuleFigures(nil), nil},
	} {
		var got []string
		for _, row := range c.got {
			var cells []string
			for _, f := range row {
				cells = append(cells, strings.TrimSpace(f.Number+f.Fill+" "+f.Unit))
			}
			got = append(got, strings.NewReplacer(nbsp, " ", digitSpace, "~", pointSpace, "'").Replace(strings.Join(cells, "|")))
		}
		if diff := cmp.Diff(c.want, got); diff != "" {
			t.Errorf("%s (-want +got)\n%s", name, diff)
		}
	}
}
