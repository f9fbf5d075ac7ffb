package record

import (
	"fmt"
	"strings"

	"rimeline/sizing/design"
)

// ReadEquipment reads a module or an inverter as it stands in a design, but without
// its id, which the design gives it, and with a model, by which it is found again. It
// returns the equipment with its canonical document, maker and model, or every reason
// why it is refused; their pointers are those inside the document.
func ReadEquipment(kind Kind, document []byte) (Equipment, design.Faults) {
	e := Equipment{Kind: kind}
	var faults design.Faults
	switch kind {
	case KindModule:
		var m *design.Module
		if m, faults = design.ReadModule(document); m != nil {
			e.Maker, e.Model, e.Document = m.Maker, m.Model, design.AppendModule(nil, m)
		}
	case KindInverter:
		var v *design.Inverter
		if v, faults = design.ReadInverter(document); v != nil {
			e.Maker, e.Model, e.Document = v.Maker, v.Model, design.AppendInverter(nil, v)
		}
	default:
		faults = design.Faults{{Found: fmt.Sprintf("%q", kind), Expected: "module or inverter", Detail: "Equipment is a module or an inverter."}}
	}
	if faults != nil {
		return Equipment{}, withoutID(faults)
	}
	if strings.TrimSpace(e.Model) == "" {
		return Equipment{}, design.Faults{{
			Pointer: "/model", Found: "no model", Expected: "the model's name, as its datasheet has it",
			Detail: "What is kept is found again by its model; enter it.",
		}}
	}
	return e, nil
}

// withoutID says of an id why it has no place in what is kept.
func withoutID(faults design.Faults) design.Faults {
	for i, f := range faults {
		if strings.EqualFold(f.Pointer, "/id") {
			faults[i].Found, faults[i].Expected = "an id", "no id"
			faults[i].Detail = "What is kept has no id of this kind: each design that it is copied into gives it one."
		}
	}
	return faults
}
