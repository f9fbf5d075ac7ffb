package server

import (
	"encoding/hex"
	"fmt"
	"net/http"
	"strconv"
	"strings"

	"rimeline/server/record"
)

// entityTags are what an If-Match or If-None-Match header lists (RFC 9110, 8.8.3).
type entityTags struct {
	any    bool     // "*"
	strong []string // with their quotes
	weak   []string // without their W/
}

// readTags reads the values of a header. No value is no tag.
func readTags(values []string) (t entityTags, err error) {
	rest := strings.TrimSpace(strings.Join(values, ","))
	if rest == "*" {
		return entityTags{any: true}, nil
	}
	for rest != "" {
		if rest[0] == ',' || rest[0] == ' ' || rest[0] == '\t' { // empty elements of a list count for nothing
			rest = rest[1:]
			continue
		}
		opaque, isWeak := strings.CutPrefix(rest, "W/")
		end := strings.IndexByte(strings.TrimPrefix(opaque, `"`), '"')
		if !strings.HasPrefix(opaque, `"`) || end < 0 {
			return t, fmt.Errorf("%q is no entity tag", rest)
		}
		tag := opaque[:end+2]
		rest = strings.TrimLeft(opaque[end+2:], " \t")
		if rest != "" && rest[0] != ',' {
			return t, fmt.Errorf("%q stands behind the entity tag %s", rest, tag)
		}
		if isWeak {
			t.weak = append(t.weak, tag)
		} else {
			t.strong = append(t.strong, tag)
		}
	}
	return t, nil
}

// requireMatch returns the tags of If-Match, without which nothing is overwritten.
func requireMatch(r *http.Request) (entityTags, error) {
	match, err := readTags(r.Header.Values("If-Match"))
	if err != nil {
		return match, badRequest(`If-Match takes entity tags in double quotes, as they stand in the ETag of an answer, or *.`, err)
	}
	if !match.any && len(match.strong)+len(match.weak) == 0 {
		return match, &statusError{
			status: http.StatusPreconditionRequired,
			message: "If-Match is missing. Fetch what is there, and send its ETag as If-Match, " +
				"so that what somebody else saved meanwhile is not overwritten. * overwrites whatever is there.",
		}
	}
	return match, nil
}

// unchanged reports whether If-None-Match says that the client has what tag names. A
// header that cannot be read says nothing.
func unchanged(r *http.Request, tag string) bool {
	known, err := readTags(r.Header.Values("If-None-Match"))
	if err != nil {
		return false
	}
	for _, t := range append(known.strong, known.weak...) {
		if t == tag {
			return true
		}
	}
	return known.any
}

// revisionTag is the entity tag of a revision, which never changes.
func revisionTag(number int, sha256 [32]byte) string {
	return fmt.Sprintf(`"%d-%x"`, number, sha256)
}

// archivedMark ends the entity tag of what is archived: its representation says so.
const archivedMark = `-archived"`

// designTag is the entity tag of a design: its newest revision, and whether it is
// archived.
func designTag(d record.Design, sha256 [32]byte) string {
	return withArchived(revisionTag(d.Revision, sha256), d.ArchivedAt != nil)
}

// equipmentTag is the entity tag of equipment.
func equipmentTag(e record.Equipment) string {
	return withArchived(fmt.Sprintf(`"%d"`, e.Version), e.ArchivedAt != nil)
}

func withArchived(tag string, archived bool) string {
	if archived {
		return strings.TrimSuffix(tag, `"`) + archivedMark
	}
	return tag
}

// namedRevision reads a tag that [designTag] wrote.
func namedRevision(tag string) (number int, sha256 [32]byte, archived, ok bool) {
	plain, archived := strings.CutSuffix(tag, archivedMark)
	before, sum, _ := strings.Cut(strings.Trim(plain, `"`), "-")
	number, err := strconv.Atoi(before)
	n, err2 := hex.Decode(sha256[:], []byte(sum[:min(len(sum), 64)]))
	ok = err == nil && err2 == nil && n == len(sha256) && withArchived(revisionTag(number, sha256), archived) == tag
	return number, sha256, archived, ok
}
