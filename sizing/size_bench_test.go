package sizing_test

import (
	"os"
	"strings"
	"testing"

	"rimeline/sizing"
	"rimeline/sizing/design"
)

func exampleDesign(tb testing.TB) *design.Design {
	tb.Helper()
	text, err := os.ReadFile("design/testdata/example-design.json")
	if err != nil {
		tb.Fatal(err)
	}
	return mustRead(tb, text)
}

func mustRead(tb testing.TB, text []byte) *design.Design {
	tb.Helper()
	doc := design.Read(text)
	if doc.Design == nil {
		tb.Fatalf("the design is refused: %v", doc.Faults)
	}
	return doc.Design
}

// wideDesign has 4 inverters with 3 trackers each and 40 strings entries on four planes.
func wideDesign(tb testing.TB) *design.Design {
	tb.Helper()
	d := exampleDesign(tb)
	inverter, plane := d.Inverters[0], d.Planes[0]
	third := inverter.Trackers[0]
	third.ID = "t3"
	inverter.Trackers = append(inverter.Trackers[:2:2], third)
	d.Inverters, d.Planes, d.Strings = nil, nil, nil
	for i := range 4 {
		v, p := inverter, plane
		v.ID, p.ID = "i"+strings.Repeat("i", i), "p"+strings.Repeat("p", i)
		d.Inverters, d.Planes = append(d.Inverters, v), append(d.Planes, p)
	}
	for i := range 40 {
		d.Strings = append(d.Strings, design.StringEntry{
			Inverter: d.Inverters[i%4].ID, Unit: 1, Tracker: []string{"t1", "t2", "t3"}[i/4%3], Plane: d.Planes[i/10].ID,
			ModulesInSeries: int64(12 + i%3), StringsInParallel: 1,
		})
	}
	return d
}

func BenchmarkSize(b *testing.B) {
	for name, d := range map[string]*design.Design{"example": exampleDesign(b), "wide": wideDesign(b)} {
		b.Run(name, func(b *testing.B) {
			b.ReportAllocs()
			for b.Loop() {
				sizing.Size(d)
			}
		})
	}
}

func BenchmarkAppendJSON(b *testing.B) {
	r := sizing.Size(exampleDesign(b))
	var dst []byte
	b.ReportAllocs()
	for b.Loop() {
		dst = r.AppendJSON(dst[:0])
	}
	b.SetBytes(int64(len(dst)))
}
