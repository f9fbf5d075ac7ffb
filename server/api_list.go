package server

import (
	"errors"
	"fmt"
	"net/http"
	"net/url"
	"slices"
	"strconv"
	"strings"
	"unicode/utf8"

	"rimeline/server/record"
	"rimeline/sizing/working"
)

// query returns the parameters of an address, each given once. One that the address
// does not take is an error: a filter that was misspelt must not answer everything.
func query(r *http.Request, takes ...string) (url.Values, error) {
	values, err := url.ParseQuery(r.URL.RawQuery)
	if err != nil {
		return nil, badRequest("The part of the address behind ? cannot be read.", err)
	}
	for name, given := range values {
		if !slices.Contains(takes, name) {
			return nil, badRequest(fmt.Sprintf("This address does not take the parameter %q. It takes: %s.", name, orNone(takes)), nil)
		}
		if len(given) > 1 {
			return nil, badRequest(fmt.Sprintf("The parameter %s is given %d times; give it once.", name, len(given)), nil)
		}
		if !utf8.ValidString(given[0]) {
			return nil, badRequest(fmt.Sprintf("The parameter %s is not UTF-8.", name), nil)
		}
	}
	return values, nil
}

func orNone(names []string) string {
	if len(names) == 0 {
		return "none"
	}
	return strings.Join(names, ", ")
}

// oneOf refuses a parameter that is none of the words it may be; "" is not given.
func oneOf[T ~string](values url.Values, name string, words ...T) (T, error) {
	given := T(values.Get(name))
	if given == "" && !values.Has(name) || slices.Contains(words, given) {
		return given, nil
	}
	var may []string
	for _, w := range words {
		may = append(may, string(w))
	}
	return "", badRequest(fmt.Sprintf("The parameter %s is %q; it may be %s.", name, given, strings.Join(may, ", ")), nil)
}

// truth reads a parameter that is true or false; not given is false.
func truth(values url.Values, name string) (bool, error) {
	word, err := oneOf(values, name, "true", "false")
	return word == "true", err
}

// longestPage is the most entries that a page of a list has.
const longestPage = 200

// pageSize reads how many entries are asked for; not given is 0, the usual size.
func pageSize(values url.Values) (int, error) {
	if !values.Has("limit") {
		return 0, nil
	}
	n, err := strconv.Atoi(values.Get("limit"))
	if err != nil || n < 1 || n > longestPage {
		return 0, badRequest(fmt.Sprintf("The parameter limit is %q; it is a whole number from 1 to %d.", values.Get("limit"), longestPage), nil)
	}
	return n, nil
}

// designListing reads which designs are asked for.
func designListing(r *http.Request) (ask record.Listing, err error) {
	values, err := query(r, "q", "verdict", "archived", "sort", "reversed", "limit", "cursor")
	if err != nil {
		return ask, err
	}
	ask.Words, ask.Cursor = values.Get("q"), values.Get("cursor")
	verdict, err := oneOf(values, "verdict", working.Outside.String(), working.Unconfirmed.String(), working.Caution.String(), working.Within.String())
	if err != nil {
		return ask, err
	}
	for v := working.Within; v <= working.Outside; v++ {
		if v.String() == verdict {
			ask.Verdict = new(v)
		}
	}
	if ask.Sort, err = oneOf(values, "sort", record.SortUpdated, record.SortTitle, record.SortVerdict, record.SortHeadroom); err != nil {
		return ask, err
	}
	if ask.Archived, err = truth(values, "archived"); err != nil {
		return ask, err
	}
	if ask.Reversed, err = truth(values, "reversed"); err != nil {
		return ask, err
	}
	ask.Limit, err = pageSize(values)
	return ask, err
}

// equipmentListing reads which equipment is asked for.
func equipmentListing(r *http.Request) (ask record.EquipmentListing, err error) {
	values, err := query(r, "q", "kind", "archived", "sort", "reversed", "limit", "cursor")
	if err != nil {
		return ask, err
	}
	ask.Words, ask.Cursor = values.Get("q"), values.Get("cursor")
	if ask.Kind, err = oneOf(values, "kind", record.KindModule, record.KindInverter); err != nil {
		return ask, err
	}
	if ask.Sort, err = oneOf(values, "sort", record.SortName, record.SortUpdated); err != nil {
		return ask, err
	}
	if ask.Archived, err = truth(values, "archived"); err != nil {
		return ask, err
	}
	if ask.Reversed, err = truth(values, "reversed"); err != nil {
		return ask, err
	}
	ask.Limit, err = pageSize(values)
	return ask, err
}

// listError says of a list that cannot be given why: all else was read before, so it
// is the cursor.
func listError(err error) error {
	if errors.Is(err, record.ErrInvalid) {
		return badRequest("The parameter cursor is not one of this list in this order. Begin without it, and follow next and previous as they are.", err)
	}
	return err
}

// apiPage is what the answer of a list says of its page.
type apiPage struct {
	Total    int    `json:"total"`
	More     bool   `json:"more"`
	Next     string `json:"next,omitempty"`
	Previous string `json:"previous,omitempty"`
}

// newAPIPage makes the links to the pages beside the one that was asked for.
func newAPIPage(r *http.Request, total int, more bool, next, previous string) apiPage {
	link := func(cursor string) string {
		if cursor == "" {
			return ""
		}
		values := r.URL.Query()
		values.Set("cursor", cursor)
		return r.URL.EscapedPath() + "?" + values.Encode()
	}
	return apiPage{Total: total, More: more, Next: link(next), Previous: link(previous)}
}
