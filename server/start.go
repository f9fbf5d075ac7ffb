package server

import (
	"net/http"

	"rimeline/views"
)

// showStart shows the first page.
func (s *Server) showStart(w http.ResponseWriter, r *http.Request) error {
	base := newBase("Size strings of rooftop PV arrays", "/")
	base.Styles, base.Scripts = base.Styles[:1], nil // nothing on it needs more
	return s.render(w, r, http.StatusOK, views.Start(views.StartPage{Base: base, Cautions: standingCautions}))
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
