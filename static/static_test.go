package static

import (
	"crypto/sha256"
	"encoding/hex"
	"strings"
	"testing"
)

// TestAddresses: every file has an address under which its own content is found, and
// the address changes with the content.
func TestAddresses(t *testing.T) {
	if len(addresses) == 0 {
		t.Fatal("no file is offered")
	}
	for name, url := range addresses {
		last, ok := strings.CutPrefix(URL(name), "/static/")
		if !ok {
			t.Errorf("URL(%q) = %q, want it below /static/", name, url)
		}
		f, ok := Open(last)
		if !ok {
			t.Errorf("Open(%q) finds nothing", last)
			continue
		}
		sum := sha256.Sum256(f.Content)
		if !strings.Contains(last, hex.EncodeToString(sum[:6])) {
			t.Errorf("%s: the address %q does not hold the hash of the content", name, last)
		}
		if f.ContentType == "" {
			t.Errorf("%s has no content type", name)
		}
	}
}

func TestOpen_OnlyWhatIsOffered(t *testing.T) {
	for _, name := range []string{"static.go", "static_test.go", "", "..", "rimeline.css"} {
		if _, ok := Open(name); ok {
			t.Errorf("Open(%q) finds a file: only hashed addresses of known kinds are offered", name)
		}
	}
}

func TestURL_Unknown(t *testing.T) {
	defer func() {
		if recover() == nil {
			t.Error("URL of a file that is not there returned: a page would go without its style")
		}
	}()
	URL("no-such-file.css")
}
