package design

import (
	"fmt"
	"os"
	"reflect"
	"slices"
	"strings"
	"testing"

	"rimeline/sizing/quantity"
)

func example(t testing.TB) []byte {
	t.Helper()
	text, err := os.ReadFile("testdata/example-design.json")
	if err != nil {
		t.Fatal(err)
	}
	return text
}

func TestRead_Malformed(t *testing.T) {
	tests := []struct{ name, text, found, expected, detail string }{
		{"empty", "", "nothing", "a design", "The input is empty"},
		{"only white space", " \n\t\x1e\r\n", "nothing", "a design", "The input is empty"},
		{"only a byte order mark", "\uFEFF", "nothing", "a design", "The input is empty"},
		{"UTF-16", "\xff\xfe{\x00}\x00", "text in UTF-16", "text in UTF-8", "Save the file with the encoding UTF-8"},
		{"cut off", `{"a": [1, 2`, "the end of the text", "a comma or ]", "Line 1, column 12:"},
		{"cut off in a text", `{"a": "b`, "the end of the text", "a closing quote", "Line 1, column 9:"},
		{"cut off in a name", `{"a`, "the end of the text", "a closing quote", ""},
		{"cut off after a colon", `{"a":`, "the end of the text", "a value", ""},
		{"cut off after a backslash", `{"a": "b\`, "the end of the text", "after a backslash", ""},
		{"cut off in an escape", `{"a": "\u12`, "the end of the text", "four hexadecimal digits", ""},
		{"cut off in a number", `{"a": -`, "the end of the text", "a digit", ""},
		{"line and column", "{\n  \"ü\": 1,\n  \"é\": x\n}", "x", "a value", "Line 3, column 8: found x where a value is expected."},
		{"lines of Windows", "{\r\n\"a\" 1}", "1", "a colon", "Line 2, column 5:"},
		{"comma before }", `{"a": 1,}`, "}", "a field name in double quotes", "No comma stands before a closing bracket."},
		{"comma before ]", `[1,]`, "]", "a value", "No comma stands before a closing bracket."},
		{"no comma", `{"a": 1 "b": 2}`, `"`, "a comma or }", ""},
		{"no comma in a list", `[1 2]`, "2", "a comma or ]", ""},
		{"two commas", `[1,,2]`, ",", "a value", ""},
		{"single quotes", `{'a': 1}`, "'", "a field name in double quotes", ""},
		{"single quotes for a value", `{"a": 'b'}`, "'", "a value", "straight double quotes"},
		{"curly quotes", `{"a": “b”}`, "“", "a value", "straight double quotes"},
		{"bare word", `{"a": mono-si}`, "mono", "a value", "A text stands in double quotes."},
		{"bare name", `{a: 1}`, "a", "a field name in double quotes", ""},
		{"not a number", `{"a": NaN}`, "NaN", "a value", "Leave a field out"},
		{"infinity", `{"a": Infinity}`, "Infinity", "a value", "Leave a field out"},
		{"minus infinity", `{"a": -Infinity}`, "Infinity", "a digit", ""},
		{"True", `{"a": True}`, "True", "a value", ""},
		{"nullify", `{"a": nullify}`, "nullify", "a value", ""},
		{"comment", "{\"a\": 1, // one\n}", "/", "a field name", ""},
		{"comment for a value", "{\"a\": /* one */ 1}", "/", "a value", "JSON has no comments."},
		{"plus", `{"a": +1}`, "+", "a value", "A plus sign is not written."},
		{"true minus", `{"a": −1}`, "−", "a value", "the character - of the keyboard"},
		{"leading point", `{"a": .5}`, ".", "a value", "A zero stands before the decimal point."},
		{"trailing point", `{"a": 5.}`, "}", "a digit after the decimal point", ""},
		{"leading zero", `{"a": 012}`, "0", "a number without a leading zero", "Line 1, column 7:"},
		{"exponent without digits", `{"a": 1e+}`, "}", "a digit of the exponent", ""},
		{"decimal comma", `{"a": 1,5}`, "5", "a field name in double quotes", ""},
		{"hexadecimal", `{"a": 0x10}`, "x", "a comma or }", ""},
		{"line end in a text", "{\"a\": \"b\nc\"}", "the end of the line", "a closing quote", `is written \n`},
		{"tab in a text", "{\"a\": \"b\tc\"}", "a tab", "a closing quote", ""},
		{"control character", "{\"a\": \"b\x01c\"}", "the character U+0001", "a closing quote", ""},
		{"unknown escape", `{"a": "\x41"}`, "x", "after a backslash", `A backslash itself is written \\`},
		{"escape of three digits", `{"a": "\u12g4"}`, "g", "four hexadecimal digits", ""},
		{"half a pair", `{"a": "\ud83d"}`, `\`, "a whole character", "Half of a surrogate pair"},
		{"second half first", `{"a": "\ude00\ud83d"}`, `\`, "a whole character", ""},
		{"half a pair and a letter", `{"a": "\ud83d\u0041"}`, `\`, "a whole character", ""},
		{"not UTF-8", "{\"a\": \"b\xff\"}", "the byte FF, which is not UTF-8", "text in UTF-8", ""},
		{"overlong UTF-8", "{\"a\": \"\xc0\xaf\"}", "the byte C0", "text in UTF-8", ""},
		{"surrogate in UTF-8", "{\"a\": \"\xed\xa0\x80\"}", "the byte ED", "text in UTF-8", ""},
		{"not UTF-8 outside a text", "{\xff}", "the byte FF", "a field name", ""},
		{"no-break space outside a text", "{\u00a0}", "the character U+00A0", "a field name", ""},
		{"record separator inside", "{\x1e}", "the character U+001E", "a field name", ""},
		{"33 levels", strings.Repeat("[", 33) + strings.Repeat("]", 33), "[", "no more than 32", "Line 1, column 33: there may be no more than 32 objects and lists inside each other."},
		{"a million levels", strings.Repeat(`{"a":`, 1_000_000), "{", "no more than 32", ""},
		{"a closing bracket", `}`, "}", "a value", ""},
		{"a second design", `{} {}`, "{", "the end of the text", "One design is read here."},
		{"more after it", `{}]`, "]", "the end of the text", ""},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			read := Read([]byte(tt.text))
			if !read.Malformed || read.Design != nil || len(read.Faults) != 1 {
				t.Fatalf("malformed %v, %d faults: %v", read.Malformed, len(read.Faults), read.Faults)
			}
			got := read.Faults[0]
			if got.Pointer != "" || !strings.HasPrefix(got.Found, tt.found) || !strings.Contains(got.Expected, tt.expected) || !strings.Contains(got.Detail, tt.detail) {
				t.Errorf("got %q", got)
			}
		})
	}
}

// Well formed, but no object: the grammar is left alone, the design is refused.
func TestRead_NotAnObject(t *testing.T) {
	for text, found := range map[string]string{`12`: "12", `-0.5`: "−0.5", `"a"`: `"a"`, `null`: "null", `true`: "true", `false`: "false", `[]`: "an empty list", `[{}]`: "a list"} {
		read := Read([]byte(text))
		if read.Malformed || len(read.Faults) != 1 || read.Faults[0].Pointer != "" || read.Faults[0].Found != found || read.Faults[0].Expected != "an object" {
			t.Errorf("Read(%s) = %v, malformed %v", text, read.Faults, read.Malformed)
		}
	}
}

func TestReadAll(t *testing.T) {
	good := strings.TrimSpace(string(example(t)))
	const accepted, refused, broken = "accepted", "refused", "malformed"
	tests := []struct {
		name, input string
		want        []string
	}{
		{"one", good, []string{accepted}},
		{"a byte order mark before it", "\uFEFF" + good, []string{accepted}},
		{"empty", "", []string{broken}},
		{"two by a line end", good + "\n" + good, []string{accepted, accepted}},
		{"two by a space, a refused one between", good + " {} " + good, []string{accepted, refused, accepted}},
		{"record separators", "\x1e" + good + "\n\x1e" + good + "\n", []string{accepted, accepted}},
		{"record separators that separate nothing", "\x1e\x1e" + good + "\x1e\n\x1e", []string{accepted}},
		{"record separator alone between them", good + "\x1e" + good, []string{accepted, accepted}},
		{"nothing between them", good + good, []string{accepted, broken}},
		{"malformed ends the reading", good + "\n{,}\n" + good, []string{accepted, broken}},
		{"a byte order mark between", good + "\n\uFEFF" + good, []string{accepted, broken}},
		{"bad UTF-8 in the second", good + "\n{\"a\": \"\xff\"}", []string{accepted, broken}},
		{"numbers", "1 2\n3", []string{refused, refused, refused}},
	}
	for _, tt := range tests {
		t.Run(tt.name, func(t *testing.T) {
			var got []string
			for _, d := range ReadAll([]byte(tt.input)) {
				switch {
				case d.Design != nil && d.Faults == nil && !d.Malformed:
					got = append(got, accepted)
				case d.Design == nil && d.Faults != nil && !d.Malformed:
					got = append(got, refused)
				case d.Design == nil && len(d.Faults) == 1 && d.Malformed:
					got = append(got, broken)
				default:
					t.Fatalf("neither accepted nor refused: %+v", d)
				}
			}
			if !slices.Equal(got, tt.want) {
				t.Errorf("got %v, want %v", got, tt.want)
			}
		})
	}
}

// The design keeps its own copy of the text.
func TestReadAll_InputIsTheCallersOwn(t *testing.T) {
	input := example(t)
	d := Read(input).Design
	for i := range input {
		input[i] = 'x'
	}
	if d.Title != "Larkspur Mill workshop, south and west planes" || d.Modules[0].VocV.String() != "37.32" {
		t.Errorf("the design changed with the input: %q", d.Title)
	}
}

func TestRead_Values(t *testing.T) {
	d := Read(edited(t,
		edit{"/site/coldest_c", `{"value": 7, "unit": "°F"}`},
		edit{"/site/hottest_c", `{"value": 37, "unit": "°C"}`},
		edit{"/planes/0/hot_cell_rise_c", `{"value": 54, "unit": "°F"}`},
		edit{"/allowances/headroom_c", `{"value": 9, "unit": "°F"}`},
		edit{"/modules/0/voc_temp_coeff", `{"value": -100.764, "unit": "mV/K"}`},
		edit{"/inverters/0/quantity", ""},
		edit{"/voltage_method", ""},
		edit{"/title", `"\u00e9\ud83d\ude00\n\/"`},
	)).Design
	if d == nil {
		t.Fatal("refused")
	}
	m := &d.Modules[0]
	for _, tt := range []struct {
		name, want string
		got        any
	}{
		{"coldest", "-13.8888888889", d.Site.Coldest.Celsius()}, // (7 − 32) × 5 ÷ 9
		{"hottest", "37", d.Site.Hottest.Celsius()},
		{"rise", "30", d.Planes[0].HotCellRise.Celsius()},
		{"headroom", "5", d.Allowances.HeadroomC.Celsius()},
		{"Voc coefficient in V/°C", "-0.100764", m.VocCoeff.PerC(m.VocV)},
		{"Voc coefficient in %/°C", "-0.27", m.VocCoeff.PercentOf(m.VocV)}, // −0.100764 V/°C of 37.32 V
		{"Voc coefficient's unit", "mV/K", m.VocCoeff.UnitText},
		{"Pmax coefficient in W/°C", "-1.394", m.PmaxCoeff.PerC(m.PmaxW)},
		{"NOCT", "45", m.NOCT.Celsius()},
		{"quantity", "1", d.Inverters[0].Quantity},
		{"kind of the DC power", "limit", d.Inverters[0].MaxDCPowerIs},
		{"method", "coefficient", d.VoltageMethod},
		{"title", "é😀\n/", d.Title},
		{"places", "13", d.Planes[1].Positions},
		{"gain", "0", d.Planes[0].CurrentGainPct},
		{"short-circuit limit of an input", "<nil>", d.Inverters[0].Trackers[0].MaxShortCircuitPerInputA},
	} {
		if got := fmt.Sprint(tt.got); got != tt.want {
			t.Errorf("%s = %s, want %s", tt.name, got, tt.want)
		}
	}
}

// The schema and the writer know the same fields: each field of the struct of a
// full design is filled. A field that one of them forgot shows here.
func TestRead_FillsEveryField(t *testing.T) {
	d := Read(full(t)).Design
	if d == nil {
		t.Fatalf("refused: %s", AppendFaults(nil, Read(full(t)).Faults))
	}
	var look func(path string, v reflect.Value)
	look = func(path string, v reflect.Value) {
		switch {
		case v.Kind() == reflect.Slice && v.Len() == 0, v.Kind() == reflect.Pointer && v.IsNil(), v.Kind() == reflect.String && v.Len() == 0:
			t.Errorf("%s is not filled", path)
		case v.Kind() == reflect.Pointer:
			look(path, v.Elem())
		case v.Kind() == reflect.Slice:
			look(path, v.Index(0))
		case v.Type() == reflect.TypeFor[quantity.Exact]():
			if v.Interface().(quantity.Exact).IsZero() {
				t.Errorf("%s is 0", path)
			}
		case v.Kind() == reflect.Int64 && v.Int() == 0:
			t.Errorf("%s is 0", path)
		case v.Kind() == reflect.Struct:
			for i := range v.NumField() {
				look(path+"."+v.Type().Field(i).Name, v.Field(i))
			}
		}
	}
	look("Design", reflect.ValueOf(*d))
}

// full returns a document with every field of the format.
func full(t testing.TB) []byte {
	t.Helper()
	text, err := os.ReadFile("testdata/full-design.json")
	if err != nil {
		t.Fatal(err)
	}
	return text
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
