package server

import (
	"context"
	"errors"
	"fmt"
	"net/http"
	"time"

	"rimeline/server/record"
	"rimeline/views"
)

// patience is how long a page of a design waits to learn whether saving works. It is
// of use without.
const patience = 500 * time.Millisecond

// keeping is what the page of a form says of where it is kept. away is why nothing can
// be saved at the moment, nil if it can.
func keeping(o origin, away error) views.Keeping {
	k := views.Keeping{
		Origin: o.fields(), Note: o.note,
		Autosave: !errors.Is(away, ErrNothingSaved), Away: awayWords(away),
	}
	if o.design != "" {
		k.Saved = &views.SavedAs{Design: string(o.design), Says: fmt.Sprintf("Made from revision %d. ", o.base)}
	}
	return k
}

// awayWords says in sentences why nothing can be saved and what to do, "" if it can.
func awayWords(err error) string {
	switch {
	case err == nil:
		return ""
	case errors.Is(err, ErrStarting):
		return "Saving is still starting. Sizing works already; check the design again in a moment to save it."
	case errors.Is(err, ErrNothingSaved):
		return "Designs are not saved here: the service was started without a database, and says when it starts how to have one. " +
			"Sizing works; keep this design as a file."
	}
	return "The database does not answer, so nothing can be saved at the moment. Sizing goes on: " +
		"check the design again in a moment to save it, or keep it as a file."
}

// designPage is the page of a form with what it says of where it is kept.
func (s *Server) designPage(r *http.Request, base views.Base, j judged, m marking, o origin) views.DesignPage {
	ctx, cancel := context.WithTimeout(r.Context(), patience)
	defer cancel()
	err := s.savingWorks(ctx)
	if err != nil && !errors.Is(err, record.ErrUnavailable) {
		s.log.WarnContext(r.Context(), "saving does not work", "request_id", visitOf(r).requestID, "error", err)
	}
	p := newDesignPage(base, j, m)
	p.Keeping = keeping(o, err)
	if err == nil {
		s.offerKept(r, &p)
	}
	return p
}

// keptPage is the same for a form that the database has just given or taken.
func (s *Server) keptPage(r *http.Request, base views.Base, j judged, m marking, o origin) views.DesignPage {
	p := newDesignPage(base, j, m)
	p.Keeping = keeping(o, nil)
	s.offerKept(r, &p)
	return p
}
