package tests

import (
	"encoding/json"
	"fmt"
	"strings"
	"testing"

	"rimeline/sizing"
	"rimeline/sizing/design"
)

// The result of the engine as its JSON states it. Everything in the tests of this
// package is read back from that text, never from the engine's own types.
type (
	result struct {
		Format    string
		Verdict   string
		Limits    []limitsRow
		Strings   []stringsRow
		Checks    []check
		Questions []question
	}
	limitsRow struct {
		Plane, Inverter, Tracker string

		Ceiling         number `json:"voltage_ceiling_v"`
		CeilingFrom     string `json:"voltage_ceiling_from"`
		VocCold         number `json:"module_voc_cold_v"`
		VmpHot          number `json:"module_vmp_hot_v"`
		MaxModules      number `json:"max_modules"`
		MinModules      number `json:"min_modules"`
		MinModulesStart number `json:"min_modules_start"`
		MaxStrings      number `json:"max_strings"`
		MaxStringsFrom  string `json:"max_strings_from"`
	}
	stringsRow struct {
		Inverter, Tracker, Plane string
		Unit                     number
		ModulesInSeries          number `json:"modules_in_series"`
		StringsInParallel        number `json:"strings_in_parallel"`
		VocCold                  number `json:"voc_cold_v"`
		VmpSTC                   number `json:"vmp_stc_v"`
		VmpHot                   number `json:"vmp_hot_v"`
		MaxCurrent               number `json:"max_current_a"`
		Verdict                  string
	}
	check struct {
		ID        string
		About     about
		Verdict   string
		Value     number
		Limit     number
		Unit      string
		ReachedAt number `json:"reached_at_c"`
	}
	question struct {
		Pointer, Asked, Why string
		Unsafe              bool
	}
	about struct {
		String                   *int
		Inverter, Tracker, Plane string
		Unit                     number
	}
)

// place is the key under which the check is compared.
func (a about) place() place {
	switch {
	case a.String != nil:
		return entryPlace(*a.String)
	case a.Plane != "":
		return planePlace(a.Plane)
	case a.Tracker != "":
		return trackerPlace(a.Inverter, a.Unit.text, a.Tracker)
	case a.Inverter != "":
		return unitPlace(a.Inverter, a.Unit.text)
	}
	return designPlace
}

// at is the name of one check in a result.
func (c check) at() string { return c.ID + " about " + string(c.About.place()) }

// sizeText sizes the one design of a text and returns the JSON of its result.
func sizeText(text []byte) ([]byte, error) {
	docs := design.ReadAll(text)
	if len(docs) != 1 {
		return nil, fmt.Errorf("read %d documents, want 1", len(docs))
	}
	if len(docs[0].Faults) > 0 {
		var all []string
		for _, f := range docs[0].Faults {
			all = append(all, fmt.Sprintf("%s: found %s, expected %s", f.Pointer, f.Found, f.Expected))
		}
		return nil, refusal(strings.Join(all, "; "))
	}
	return sizing.Size(docs[0].Design).AppendJSON(nil), nil
}

// refusal is the error of a design that the reader does not accept.
type refusal string

func (r refusal) Error() string { return "refused: " + string(r) }

// sized sizes a text into v, a [result] or another view of its JSON.
func sized(text []byte, v any) error {
	out, err := sizeText(text)
	if err != nil {
		return err
	}
	return json.Unmarshal(out, v)
}

// mustSize is sized for a design that must be accepted.
func mustSize[T any](t testing.TB, text []byte) T {
	t.Helper()
	var v T
	if err := sized(text, &v); err != nil {
		t.Fatalf("%v\n%s", err, text)
	}
	return v
}
