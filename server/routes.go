package server

import (
	"net/http"

	"github.com/go-chi/chi/v5"
	"github.com/go-chi/chi/v5/middleware"
)

// routes is every route of the site, and what each request passes on its way.
// GET changes nothing: the guard against cross-site requests rests on it.
func (s *Server) routes() chi.Router {
	r := chi.NewRouter()
	r.Use(s.logRequests, s.recoverPanic, securityHeaders, s.onlyOwnHosts, s.onlySameOrigin, middleware.GetHead)
	r.NotFound(s.handle(func(http.ResponseWriter, *http.Request) error { return errNotFound }))
	r.MethodNotAllowed(s.handle(methodNotAllowed(r)))

	r.Get("/healthz", s.handle(s.health))
	r.Get("/readyz", s.handle(s.ready))
	r.With(compress).Get("/static/{file}", s.handle(s.staticFile))

	r.Group(func(r chi.Router) {
		r.Use(s.readBody, s.takePlace, compress)

		r.Get("/", s.handle(s.showStart))
		r.Get("/design", s.handle(s.showDesign))
		r.Get("/example", s.handle(s.showExample))
		r.Post("/design", s.handle(s.sizeDesign))          // the whole page, with the answer
		r.Post("/design/answer", s.handle(s.renewAnswer))  // the answer alone, for the script
		r.Post("/design/working", s.handle(s.showWorking)) // the whole arithmetic
		r.Post("/design/sheet", s.handle(s.showSheet))     // the stringing sheet
		r.Post("/design/file", s.handle(s.saveFile))       // the design as a file to keep
		r.Post("/design/open", s.handle(s.openFile))       // such a file, back into the form
		r.Post("/design/swap", s.handle(s.showSwap))       // beside itself with something else in it

		r.Get("/designs", s.handle(s.withSaving(s.showDesigns)))
		r.Post("/designs", s.handle(s.saveDesign)) // the form, as a design or its next revision
		r.Get("/designs/{id}", s.handle(s.withSaving(s.showSaved)))
		r.Post("/designs/{id}/archive", s.handle(s.withSaving(s.archiveDesign)))
		r.Post("/designs/{id}/restore", s.handle(s.withSaving(s.restoreDesign)))
		r.Post("/designs/{id}/duplicate", s.handle(s.withSaving(s.duplicateDesign)))
		r.Get("/designs/{id}/revisions", s.handle(s.withSaving(s.showRevisions)))
		r.Get("/designs/{id}/revisions/{n}", s.handle(s.withSaving(s.showRevision)))
		r.Get("/designs/{id}/compare", s.handle(s.withSaving(s.compareRevisions)))
		r.Post("/drafts", s.handle(s.keepDraft)) // the form as it stands, for the script and for a button
		r.Get("/drafts/{id}", s.handle(s.withSaving(s.showDraft)))
		r.Post("/drafts/{id}/discard", s.handle(s.withSaving(s.discardDraft)))

		r.Get("/equipment", s.handle(s.withSaving(s.showEquipmentList)))
		r.Get("/equipment/new", s.handle(s.showNewEquipment))
		r.Post("/equipment", s.handle(s.addEquipment))
		r.Get("/equipment/{id}", s.handle(s.withSaving(s.showEquipment)))
		r.Post("/equipment/{id}", s.handle(s.reviseEquipment))
		r.Post("/equipment/{id}/duplicate", s.handle(s.duplicateEquipment)) // the form of a new one; keeps nothing
		r.Post("/equipment/{id}/archive", s.handle(s.withSaving(s.archiveEquipment)))
		r.Post("/equipment/{id}/restore", s.handle(s.withSaving(s.restoreEquipment)))

		r.Get("/api/openapi.json", s.handle(s.apiDescription))
		r.Post("/api/v1/size", s.handle(s.apiSize))

		r.Get("/api/v1/designs", s.handle(s.withSaving(s.apiDesigns)))
		r.Post("/api/v1/designs", s.handle(s.withSaving(s.apiAddDesign)))
		r.Get("/api/v1/designs/{id}", s.handle(s.withSaving(s.apiDesign)))
		r.Put("/api/v1/designs/{id}", s.handle(s.withSaving(s.apiReviseDesign)))
		r.Delete("/api/v1/designs/{id}", s.handle(s.withSaving(s.apiArchiveDesign)))
		r.Post("/api/v1/designs/{id}/restore", s.handle(s.withSaving(s.apiRestoreDesign)))
		r.Get("/api/v1/designs/{id}/revisions", s.handle(s.withSaving(s.apiRevisions)))
		r.Get("/api/v1/designs/{id}/revisions/{n}", s.handle(s.withSaving(s.apiRevision)))

		r.Get("/api/v1/equipment", s.handle(s.withSaving(s.apiEquipmentList)))
		r.Post("/api/v1/equipment", s.handle(s.withSaving(s.apiAddEquipment)))
		r.Get("/api/v1/equipment/{id}", s.handle(s.withSaving(s.apiEquipment)))
		r.Put("/api/v1/equipment/{id}", s.handle(s.withSaving(s.apiReviseEquipment)))
		r.Delete("/api/v1/equipment/{id}", s.handle(s.withSaving(s.apiArchiveEquipment)))
		r.Post("/api/v1/equipment/{id}/restore", s.handle(s.withSaving(s.apiRestoreEquipment)))
	})
	return r
}
