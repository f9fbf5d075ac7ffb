package server

import (
	"context"
	"errors"
	"net/http"
	"time"

	"rimeline/server/record"
	"rimeline/views"
)

// showStart shows the first page. What is saved belongs to it, but it is of use
// without: a database that does not answer at once is not waited for.
func (s *Server) showStart(w http.ResponseWriter, r *http.Request) error {
	base := listBase("Size strings of rooftop PV arrays", "/")
	p := views.StartPage{Base: base, Cautions: standingCautions}
	ctx, cancel := context.WithTimeout(r.Context(), patience)
	defer cancel()
	recent, drafts, err := s.savedLast(ctx)
	switch {
	case err == nil:
		p.Saving = "No account is needed. Designs are saved at this service, and whoever reaches it can open them."
		p.Recent, p.Drafts = designRows(recent, time.Now()), draftLinks(drafts, time.Now())
	case errors.Is(err, ErrNothingSaved):
		p.Saving = "No account is needed, and nothing is kept on the server, which was started without a database: save a design as a file to keep it."
	case errors.Is(err, ErrStarting):
		p.Saving = "No account is needed. What is saved here can be reached in a moment, when the database has started; sizing works already."
	default:
		s.log.WarnContext(r.Context(), "the first page goes without what is saved", "request_id", visitOf(r).requestID, "error", err)
		p.Saving = "No account is needed. What is saved here cannot be reached at the moment, because the database does not answer; sizing works, and a design can be kept as a file."
	}
	return s.render(w, r, http.StatusOK, views.Start(p))
}

// savedLast returns the designs and the drafts that were saved last.
func (s *Server) savedLast(ctx context.Context) ([]record.Design, []record.Draft, error) {
	saved, err := s.saving()
	if err != nil {
		return nil, nil, err
	}
	recent, err := saved.Designs(ctx, record.Listing{Limit: recentDesigns})
	if err != nil {
		return nil, nil, err
	}
	drafts, err := saved.DraftsOf(ctx, "", recentDrafts)
	return recent.Designs, drafts, err
}

// standingCautions are what anyone who wires an array must know, whatever a
// calculation says.
var standingCautions = []views.Caution{
	{Title: "Daylight cannot be switched off.", Text: "A string is live whenever light falls on it. Opening the inverter or its switch does not make the conductors on the roof dead."},
	{Title: "Cold, bright mornings give the highest voltage.", Text: "Never add a module on site: one too many can destroy the inverter on the first cold morning."},
	{Title: "Measure before connecting.", Text: "Polarity and open-circuit voltage of every string, with a meter rated for the maximum system voltage."},
	{Title: "Never open a connector or a fuse under load.", Text: "A DC arc does not put itself out. Isolate, then prove zero current with a clamp meter."},
	{Title: "Qualified persons only.", Text: "The local code and the authority having jurisdiction decide, and the equipment's instructions are part of its listing."},
	{Title: "A calculation is not an inspection.", Text: "This service works from what is typed. It says what it did not check, and it does not size conductors yet."},
}
