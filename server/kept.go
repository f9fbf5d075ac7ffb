package server

import (
	"context"

	"rimeline/server/record"
)

// keptEquipment is the equipment that a page offers to pick from, as it is called in
// a list.
type keptEquipment struct {
	modules, inverters []pieceChoice
	more               bool // there is more than a page offers
}

type pieceChoice struct {
	id   record.ID
	name string
}

// mostOffered is how many pieces of a kind a page offers; a longer list is searched on
// its own page.
const mostOffered = 200

// keptNow returns the equipment in use, or why it cannot be had in the time that a page
// of a design can wait. Nothing is kept where nothing is saved.
func (s *Server) keptNow(ctx context.Context) (keptEquipment, error) {
	saved, err := s.saving()
	if err != nil {
		return keptEquipment{}, err
	}
	ctx, cancel := context.WithTimeout(ctx, patience)
	defer cancel()
	var kept keptEquipment
	for kind, list := range map[record.Kind]*[]pieceChoice{record.KindModule: &kept.modules, record.KindInverter: &kept.inverters} {
		page, err := saved.EquipmentList(ctx, record.EquipmentListing{Kind: kind, Limit: mostOffered})
		if err != nil {
			return keptEquipment{}, err
		}
		kept.more = kept.more || page.Next != ""
		for _, e := range page.Equipment {
			*list = append(*list, pieceChoice{e.ID, pieceName(e.Maker, e.Model)})
		}
	}
	return kept, nil
}

// pieceName is what a module or an inverter is called in a list, by its model first.
func pieceName(maker, model string) string {
	switch {
	case model == "":
		return maker
	case maker == "":
		return model
	}
	return model + ", " + maker
}

// offered are pieces as choices of a list.
func offered(pieces []pieceChoice, none string) [][2]string {
	choices := [][2]string{{"", none}}
	for _, p := range pieces {
		choices = append(choices, [2]string{string(p.id), p.name})
	}
	return choices
}
