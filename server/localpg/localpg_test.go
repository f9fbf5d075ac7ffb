package localpg

import (
	"strings"
	"testing"
)

func TestDefaultDir(t *testing.T) {
	for _, c := range []struct {
		name string
		uid  int
		env  map[string]string
		want string
	}{
		{"root", 0, map[string]string{"HOME": "/h", "XDG_DATA_HOME": "/x"}, "/var/lib/rimeline"},
		{"a user", 1000, map[string]string{"HOME": "/h"}, "/h/.local/share/rimeline"},
		{"a user with a place for data", 1000, map[string]string{"HOME": "/h", "XDG_DATA_HOME": "/x"}, "/x/rimeline"},
		{"a relative place is ignored", 1000, map[string]string{"HOME": "/h", "XDG_DATA_HOME": "x"}, "/h/.local/share/rimeline"},
		{"no home", 1000, nil, ""},
		{"a relative home", 1000, map[string]string{"HOME": "h"}, ""},
	} {
		got, err := DefaultDir(c.uid, func(name string) string { return c.env[name] })
		if got != c.want || (err == nil) != (c.want != "") {
			t.Errorf("%s: DefaultDir = %q, %v, want %q", c.name, got, err, c.want)
		}
		if err != nil && !strings.Contains(err.Error(), "HOME") {
			t.Errorf("%s: the error does not name the variable to set: %v", c.name, err)
		}
	}
}
