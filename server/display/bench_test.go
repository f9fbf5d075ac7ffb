package display

import (
	"io"
	"strconv"
	"testing"

	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/views"
)

// wideDesign is the example with 4 inverters of 3 trackers and 40 strings entries of different lengths.
func wideDesign(tb testing.TB) *design.Design {
	tb.Helper()
	d := readDesign(tb, exampleFile)
	first := d.Inverters[0]
	d.Inverters, d.Strings = nil, nil
	for i := range 4 {
		v := first
		v.ID = "i" + strconv.Itoa(i+1)
		v.Trackers = nil
		for k := range 3 {
			t := first.Trackers[0]
			t.ID = "t" + strconv.Itoa(k+1)
			v.Trackers = append(v.Trackers, t)
		}
		d.Inverters = append(d.Inverters, v)
	}
	for i := range 40 {
		d.Strings = append(d.Strings, design.StringEntry{
			Inverter: "i" + strconv.Itoa(i%4+1), Unit: 1, Tracker: "t" + strconv.Itoa(i/4%3+1), Plane: d.Planes[i%2].ID,
			ModulesInSeries: int64(8 + i%14), StringsInParallel: 1,
		})
	}
	return d
}

func BenchmarkAnswer(b *testing.B) {
	for name, d := range map[string]*design.Design{"example": readDesign(b, exampleFile), "wide": wideDesign(b)} {
		r := sizing.Size(d)
		b.Run(name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				a := NewAnswer(d, r)
				if err := views.AnswerPanel(a).Render(b.Context(), io.Discard); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
