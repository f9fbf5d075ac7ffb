package display

import (
	"io"
	"testing"

	"rimeline/sizing"
	"rimeline/views"
)

func BenchmarkAnswer(b *testing.B) {
	for _, test := range []struct{ name, file string }{{"example", exampleFile}} {
		d := readDesign(b, test.file)
		r := sizing.Size(d)
		b.Run(test.name, func(b *testing.B) {
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
