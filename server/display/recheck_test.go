package display

import (
	"bytes"
	"os"
	"testing"

	"rimeline/sizing"
	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
)

func TestResultChanges(t *testing.T) {
	t.Parallel()
	text, err := os.ReadFile("../../sizing/design/testdata/example-design.json")
	if err != nil {
		t.Fatal(err)
	}
	d := design.Read(text).Design
	r := sizing.Size(d)
	now := r.AppendJSON(nil)
	edit := func(from, to string) []byte {
		t.Helper()
		if !bytes.Contains(now, []byte(from)) {
			t.Fatalf("the result has no %s", from)
		}
		return bytes.Replace(now, []byte(from), []byte(to), 1)
	}
	for _, tc := range []struct {
		name  string
		saved []byte
		want  int // checks that differ
	}{
		{"the same", now, 0},
		{"the working written otherwise", edit(`"expression":"`, `"expression":"once `), 0},
		{"a limit", edit(`"limit":1000,`, `"limit":600,`), 1},
		{"a check that was not made then", edit(`"id":"voltage-ceiling"`, `"id":"of-the-past"`), 2}, // and one that is not made now
		{"nothing that can be read", []byte("{"), len(r.Checks)},
	} {
		_, after, groups := ResultChanges(tc.saved, d, r)
		n := 0
		for _, g := range groups {
			n += len(g.Rows)
			for _, row := range g.Rows {
				if g.Of == "" || row.Name == "" || row.Before == row.After {
					t.Errorf("%s: %s: %+v", tc.name, g.Of, row)
				}
			}
		}
		if n != tc.want {
			t.Errorf("%s: %d checks differ, want %d: %+v", tc.name, n, tc.want, groups)
		}
		if string(after.Verdict) != r.Verdict.String() {
			t.Errorf("%s: the verdict of today is %s", tc.name, after.Verdict)
		}
	}
}

func TestHeadroom(t *testing.T) {
	t.Parallel()
	for text, want := range map[string]string{
		"0": "0.0 °C", "7.39": "7.3 °C", "-0.01": "−0.1 °C", "-53.62": "−53.7 °C", "100": "100.0 °C", "100.01": "over 100 °C", "347": "over 100 °C",
	} {
		x, err := quantity.Parse(text)
		if err != nil {
			t.Fatal(err)
		}
		if got := Headroom(&x); got != want && got != string(bytes.ReplaceAll([]byte(want), []byte(" °"), []byte(nbsp+"°"))) {
			t.Errorf("Headroom(%s) = %q, want %q", text, got, want)
		}
	}
	if got := Headroom(nil); got != "" {
		t.Errorf("Headroom(nil) = %q", got)
	}
}
