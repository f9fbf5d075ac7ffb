package design

import (
	"os"
	"testing"
)

func example(t testing.TB) []byte {
	t.Helper()
	text, err := os.ReadFile("testdata/example-design.json")
	if err != nil {
		t.Fatal(err)
	}
	return text
}

func TestTmp(t *testing.T) {
	d := Read(example(t))
	if d.Design == nil {
		t.Fatal(d.Faults)
	}
	t.Logf("%s", AppendJSON(nil, d.Design))
	for _, s := range []string{``, `{`, `{}`, `{"format":3,"Title":"x","title":"y","title":"z"}`, "{}{}", "{\"a\":NaN}", `[1,]`, "{\n \"a\":012}"} {
		for k, d := range ReadAll([]byte(s)) {
			t.Logf("%s %v %s", s, d.Malformed, AppendRefusal(nil, k+1, d.Faults))
		}
	}
}

func BenchmarkRead(b *testing.B) {
	text := example(b)
	b.SetBytes(int64(len(text)))
	b.ReportAllocs()
	for b.Loop() {
		if d := Read(text); d.Design == nil {
			b.Fatal(d.Faults)
		}
	}
}

func BenchmarkAppendJSON(b *testing.B) {
	d := Read(example(b)).Design
	var dst []byte
	b.ReportAllocs()
	for b.Loop() {
		dst = AppendJSON(dst[:0], d)
	}
}
