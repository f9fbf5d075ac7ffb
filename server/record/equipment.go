package record

import (
	"bytes"
	"encoding/json"
	"fmt"
	"strings"

	"rimeline/sizing/design"
)

// bench is a design with everything but one module, or one inverter. What people keep
// is put on it to be read by the one reader there is.
type bench struct {
	before, after string
	list          string // where the piece stands: "/modules/0"
	what          string // "a module"
}

// benchID is the id of what is on the bench.
const benchID = `"id":"kept"`

const (
	benchSite = `{"format":"rimeline-design/1","title":"","rulebook":"iec-62548-1","site":{"name":"","structure":"ground-mounted",` +
		`"coldest_c":0,"coldest_basis":"other","hottest_c":30,"hottest_basis":"other"},`
	benchModule = `"modules":[{"id":"bench","technology":"other","pmax_w":400,"voc_v":50,"isc_a":11,"vmp_v":40,"imp_a":10,` +
		`"voc_temp_coeff":{"value":-0.3,"unit":"%/°C"},"max_system_voltage_v":1000}]`
	benchInverter = `"inverters":[{"id":"bench","max_dc_voltage_v":1000,"trackers":[{"id":"1","mppt_min_v":100,"mppt_max_v":800,"inputs":1,"max_input_current_a":20}]}]`
)

func benchOf(kind Kind) bench {
	plane := func(module string) string {
		return `,"planes":[{"id":"bench","module":"` + module + `","positions":0,"hot_cell_rise_c":0}]}`
	}
	if kind == KindInverter {
		return bench{benchSite + benchModule + `,"inverters":[`, `]` + plane("bench"), "/inverters/0", "an inverter"}
	}
	return bench{benchSite + benchInverter + `,"modules":[`, `]` + plane("kept"), "/modules/0", "a module"}
}

// ReadEquipment reads a module or an inverter as it stands in a design, but without
// its id, which the design gives it. It returns the equipment with its canonical
// document, maker and model, or every reason why it is refused; their pointers are
// those inside the document.
func ReadEquipment(kind Kind, document []byte) (Equipment, design.Faults) {
	if kind != KindModule && kind != KindInverter {
		return Equipment{}, design.Faults{{
			Found: fmt.Sprintf("%q", kind), Expected: "module or inverter", Detail: "Equipment is a module or an inverter.",
		}}
	}
	b := benchOf(kind)
	alone := design.Read(document)
	if alone.Malformed {
		return Equipment{}, alone.Faults
	}
	body, isObject := bytes.CutPrefix(bytes.TrimSpace(bytes.TrimPrefix(document, []byte("\ufeff"))), []byte("{"))
	if !isObject {
		return Equipment{}, design.Faults{{
			Found: "another kind of value", Expected: b.what + ": a JSON object", Detail: "Send " + b.what + " as it stands in a design, without its id.",
		}}
	}
	comma := ","
	if bytes.HasPrefix(bytes.TrimSpace(body), []byte("}")) {
		comma = ""
	}
	doc := design.Read([]byte(b.before + "{" + benchID + comma + string(body) + b.after))
	if doc.Design == nil {
		return Equipment{}, b.faults(doc.Faults)
	}
	e := Equipment{Kind: kind, Document: b.canonical(doc.Design)}
	if kind == KindModule {
		e.Maker, e.Model = doc.Design.Modules[0].Maker, doc.Design.Modules[0].Model
	} else {
		e.Maker, e.Model = doc.Design.Inverters[0].Maker, doc.Design.Inverters[0].Model
	}
	return e, nil
}

// faults returns what is wrong with the piece on the bench, with the pointers that it
// has alone.
func (b bench) faults(found design.Faults) design.Faults {
	var own design.Faults
	for _, f := range found {
		f.Pointer = strings.TrimPrefix(f.Pointer, b.list)
		if strings.EqualFold(f.Pointer, "/id") {
			f = design.Fault{
				Pointer: f.Pointer, Found: "an id", Expected: "no id",
				Detail: "What is kept has no id of this kind: each design that it is copied into gives it one.",
			}
		}
		own = append(own, f)
	}
	return own
}

// canonical returns the piece on the bench as the canonical design has it, without
// its id.
func (b bench) canonical(d *design.Design) []byte {
	var lists struct{ Modules, Inverters []json.RawMessage }
	if err := json.Unmarshal(design.AppendJSON(nil, d), &lists); err != nil {
		panic(err) // a canonical design is JSON
	}
	piece := lists.Modules[0]
	if b.list == "/inverters/0" {
		piece = lists.Inverters[0]
	}
	return append([]byte("{"), bytes.TrimPrefix(piece, []byte("{"+benchID+","))...)
}
