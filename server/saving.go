package server

import (
	"context"
	"errors"
	"fmt"
	"net/http"

	"rimeline/server/record"
	"rimeline/server/store"
)

// Saving is what the handlers ask of the place where designs are kept. Its methods
// promise what those of [store.Store] do.
type Saving interface {
	savedDesigns
	savedDrafts
	savedEquipment
	keptAnswers

	// Ready reports whether saving works.
	Ready(ctx context.Context) error
}

type savedDesigns interface {
	SaveRevision(ctx context.Context, actor record.Actor, save store.Save) (record.Revision, error)
	Design(ctx context.Context, id record.ID) (record.Design, error)
	Designs(ctx context.Context, ask record.Listing) (record.DesignPage, error)
	Revision(ctx context.Context, id record.ID, number int) (record.Revision, error)
	Revisions(ctx context.Context, id record.ID) ([]record.RevisionSummary, error)
	Archive(ctx context.Context, actor record.Actor, id record.ID) error
	Restore(ctx context.Context, actor record.Actor, id record.ID) error
	Duplicate(ctx context.Context, actor record.Actor, id record.ID, title, request string) (record.Design, error)
}

type savedDrafts interface {
	SaveDraft(ctx context.Context, actor record.Actor, d record.Draft) (record.Draft, error)
	Draft(ctx context.Context, id record.ID) (record.Draft, error)
	DraftsOf(ctx context.Context, design record.ID, limit int) ([]record.Draft, error)
	Drafts(ctx context.Context, limit int) ([]record.Draft, error)
	DiscardDraft(ctx context.Context, actor record.Actor, id record.ID, version int64) error
}

type savedEquipment interface {
	SaveEquipment(ctx context.Context, actor record.Actor, e record.Equipment, request string) (record.Equipment, error)
	Equipment(ctx context.Context, id record.ID) (record.Equipment, error)
	EquipmentList(ctx context.Context, ask record.EquipmentListing) (record.EquipmentPage, error)
	EquipmentNames(ctx context.Context, limit int) ([]record.EquipmentName, error)
	ArchiveEquipment(ctx context.Context, actor record.Actor, id record.ID) error
	RestoreEquipment(ctx context.Context, actor record.Actor, id record.ID) error
	WhereUsed(ctx context.Context, kind record.Kind, maker, model string, limit int) ([]record.Design, error)
	UseCounts(ctx context.Context, pieces []record.Use) ([]int, error)
}

type keptAnswers interface {
	Remember(ctx context.Context, actor record.Actor, key string, request [32]byte,
		do func(context.Context) (record.Answer, error)) (answer record.Answer, repeated bool, err error)
}

// Why there is nowhere to save. All are of the kind [record.ErrUnavailable].
var (
	ErrStarting     = fmt.Errorf("%w: it is still starting", record.ErrUnavailable)
	ErrNothingSaved = fmt.Errorf("%w: the service was started without one", record.ErrUnavailable)
	ErrUnfit        = fmt.Errorf("%w: it cannot be used as it is", record.ErrUnavailable)
)

// saving returns what is saved, or an error of the kind [record.ErrUnavailable].
func (s *Server) saving() (Saving, error) {
	if s.cfg.Saving == nil {
		return nil, ErrNothingSaved
	}
	return s.cfg.Saving()
}

// withSaving makes a handler of one that can do nothing where nothing is saved.
func (s *Server) withSaving(h func(w http.ResponseWriter, r *http.Request, saved Saving) error) handler {
	return func(w http.ResponseWriter, r *http.Request) error {
		saved, err := s.saving()
		if err != nil {
			return err
		}
		return h(w, r, saved)
	}
}

// actorOf returns who sent a request: nobody in particular, as there are no accounts.
func actorOf(*http.Request) record.Actor { return record.Nobody }

// savingFailure says what an error of a kind of server/record is to a visitor, and to
// a program where forProgram is true. It returns nil for any other error.
func savingFailure(err error, forProgram bool) *statusError {
	stale, isStale := errors.AsType[*record.StaleError](err)
	switch {
	case isStale && forProgram:
		return &statusError{
			status: http.StatusPreconditionFailed,
			message: fmt.Sprintf("This was changed meanwhile, and the newest has the number %d. "+
				"Fetch that, carry your change over, and send it with the ETag that you got.", stale.Newest),
			newest: stale.Newest,
		}
	case isStale:
		return &statusError{
			status:  http.StatusConflict,
			heading: "This was changed meanwhile",
			message: fmt.Sprintf("It was saved again after you opened it, and the newest has the number %d. "+
				"Nothing was overwritten. Open the newest and carry your change over.", stale.Newest),
			newest: stale.Newest,
		}
	case errors.Is(err, record.ErrNotFound):
		return &statusError{status: http.StatusNotFound, message: "Nothing is saved at this address."}
	case errors.Is(err, record.ErrInvalid):
		return &statusError{
			status:  http.StatusUnprocessableEntity,
			message: "What was sent cannot be saved as it is, and nothing was changed.",
		}
	case errors.Is(err, record.ErrConflict):
		return &statusError{
			status:  http.StatusConflict,
			message: "The key of this request was used before, for something else. Nothing was changed. Send it again with a new key.",
		}
	case errors.Is(err, record.ErrUnavailable):
		return unavailable(err, forProgram)
	}
	return nil
}

// unavailable says what to do while the database is away.
func unavailable(err error, forProgram bool) *statusError {
	f := &statusError{status: http.StatusServiceUnavailable}
	after := "5" // a connection is tried for 2 s, a recovery takes some more
	switch {
	case errors.Is(err, record.ErrUnknownOutcome):
		f.heading = "It is not known whether that was saved"
		f.message = "The database went away in the instant of saving. Save once more: what was saved already is not saved twice."
		if forProgram {
			f.message = "The database went away in the instant of saving. Send the request again with the same Idempotency-Key: " +
				"it is done once. If it had none, look first whether it was done."
		}
	case errors.Is(err, ErrStarting):
		after = "1"
		f.heading = "Saving is still starting"
		f.message = "What is saved can be reached in a moment. Sizing works already. Nothing was saved; please try again."
	case errors.Is(err, ErrNothingSaved):
		after = "60"
		f.heading = "Nothing is saved here"
		f.message = "This service was started without a database. Sizing works; keep a design as a file. " +
			"When the service starts it says how to have designs saved."
	case errors.Is(err, ErrUnfit):
		after = "60"
		f.heading = "What is saved cannot be reached"
		f.message = "The database cannot be used as it is; the log of the service says why. " +
			"Sizing goes on. Nothing was saved; keep the design as a file."
	default:
		f.heading = "What is saved cannot be reached"
		f.message = "The database does not answer at the moment. Sizing goes on. Nothing was saved; " +
			"please try again in a moment, or keep the design as a file."
	}
	f.header = map[string]string{"Retry-After": after}
	return f
}
