package server

import (
	"context"
	"crypto/sha256"
	"errors"
	"fmt"
	"net/http"
	"strings"

	"rimeline/server/record"
)

// longestKey is how long an Idempotency-Key may be.
const longestKey = 200

// requestKey returns the Idempotency-Key of a request, "" where it has none. It may
// stand in quotes, as the draft standard wants it, or without, as most clients send it.
func requestKey(r *http.Request) (string, error) {
	values := r.Header.Values("Idempotency-Key")
	if len(values) == 0 {
		return "", nil
	}
	key := values[0]
	if inside, ok := strings.CutPrefix(key, `"`); ok && len(inside) > 0 {
		key = strings.TrimSuffix(inside, `"`)
	}
	strange := func(c rune) bool { return c < ' ' || c > '~' || c == '"' || c == '\\' }
	if len(values) > 1 || key == "" || len(key) > longestKey || strings.ContainsFunc(key, strange) {
		return "", badRequest(fmt.Sprintf("Idempotency-Key is one text of 1 to %d printable ASCII characters, such as a random UUID.", longestKey), nil)
	}
	return key, nil
}

// once answers a request with what do makes. With an Idempotency-Key, the first
// success is kept and answers every repetition; what is refused or fails is not kept,
// so that it can be mended and sent again. do must save under the key it is given: a
// repetition after a crash between the save and the keeping of its answer does it
// again.
func (s *Server) once(w http.ResponseWriter, r *http.Request, saved Saving, do func(ctx context.Context, key string) (record.Answer, error)) error {
	key, err := requestKey(r)
	if err != nil {
		return err
	}
	// What was asked is done though the asker may not wait for the answer; each call of
	// the store has its own limit of time.
	ctx := context.WithoutCancel(r.Context())
	if key == "" {
		answer, err := do(ctx, "")
		if err != nil {
			return err
		}
		sendAnswer(w, answer)
		return nil
	}
	actor := actorOf(r)
	key = "api " + key // the pages make keys of their own
	working := actor.ID + "\n" + key
	if _, taken := s.underWay.LoadOrStore(working, true); taken {
		return &statusError{
			status:  http.StatusConflict,
			message: "The first request with this Idempotency-Key is still being worked on. Ask again in a moment; it is done once.",
			header:  map[string]string{"Retry-After": "1"},
		}
	}
	defer s.underWay.Delete(working)
	answer, repeated, err := saved.Remember(ctx, actor, key, requestHash(r),
		func(ctx context.Context) (record.Answer, error) { return do(ctx, key) })
	if errors.Is(err, record.ErrConflict) {
		return &statusError{
			status: http.StatusUnprocessableEntity,
			message: "This Idempotency-Key was used before for another request: another address, If-Match or body. " +
				"Nothing was changed. Send this one with a key of its own.",
			cause: err,
		}
	}
	if err != nil {
		return err
	}
	if repeated {
		w.Header().Set("Idempotency-Replayed", "true")
	}
	sendAnswer(w, answer)
	return nil
}

// requestHash is what makes two requests with the same key the same one.
func requestHash(r *http.Request) [32]byte {
	h := sha256.New()
	for _, part := range []string{r.Method, r.URL.EscapedPath(), r.URL.RawQuery, strings.Join(r.Header.Values("If-Match"), ",")} {
		fmt.Fprintf(h, "%d:%s", len(part), part)
	}
	h.Write(visitOf(r).body)
	return [32]byte(h.Sum(nil))
}

func sendAnswer(w http.ResponseWriter, a record.Answer) {
	for name, value := range a.Header {
		w.Header().Set(name, value)
	}
	w.WriteHeader(a.Status)
	_, _ = w.Write(a.Body)
}
