package working

import (
	"encoding/json"
	"strings"
	"testing"
)

func TestAppendJSONString(t *testing.T) {
	tests := []struct{ text, want string }{
		{"", `""`},
		{"plain", `"plain"`},
		{`a "quoted" \ path`, `"a \"quoted\" \\ path"`},
		{"\b\t\n\f\r", `"\b\t\n\f\r"`},
		{"\x00\x1f", `"\u0000\u001f"`},
		{"−21 °C, 6 km; <b>&", `"−21 °C, 6 km; <b>&"`},
		{"a\xffb\xc3", "\"a\uFFFDb\uFFFD\""},
		{"a real \uFFFD", "\"a real \uFFFD\""},
	}
	for _, tt := range tests {
		if got := string(AppendJSONString([]byte("x"), tt.text)); got != "x"+tt.want {
			t.Errorf("AppendJSONString(x, %q) = %s, want x%s", tt.text, got, tt.want)
		}
	}
}

// FuzzAppendJSONString holds the appender against encoding/json, which reads it back.
func FuzzAppendJSONString(f *testing.F) {
	f.Add("plain")
	f.Add("\x00\"\\/\u2028\xff")
	f.Fuzz(func(t *testing.T, s string) {
		var back string
		if err := json.Unmarshal(AppendJSONString(nil, s), &back); err != nil {
			t.Fatal(err)
		}
		var want strings.Builder
		for _, r := range s { // ranging replaces each bad byte by U+FFFD, as the appender promises
			want.WriteRune(r)
		}
		if back != want.String() {
			t.Errorf("%q came back as %q", s, back)
		}
	})
}
