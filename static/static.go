// Package static holds the style sheets, scripts and pictures of the site, as they
// are sent. Each has an address that holds a hash of its content, so that a browser
// may keep it for ever and still gets a new one at once. The package knows files
// and nothing of who sends or uses them.
package static

import (
	"crypto/sha256"
	"embed"
	"encoding/hex"
	"fmt"
	"path"
	"strings"
)

// Pictures for the README stay out of the program.
//
//go:embed *.css *.js *.svg *.txt
var embedded embed.FS

// types are the kinds of file that are sent, by the ending of the name. They stand
// here because a table of the machine would make answers differ between machines.
var types = map[string]string{
	".css": "text/css; charset=utf-8",
	".js":  "text/javascript; charset=utf-8",
	".svg": "image/svg+xml",
	".txt": "text/plain; charset=utf-8", // licences
}

// File is one file as it is sent.
type File struct {
	Content     []byte
	ContentType string
}

// offered is the files by the last part of their address; addresses is the whole
// address by the name of the file. Both are made once and then only read.
var offered, addresses = load()

func load() (map[string]File, map[string]string) {
	entries, err := embedded.ReadDir(".")
	if err != nil {
		panic(err) // the root of what is embedded is always there
	}
	files, urls := map[string]File{}, map[string]string{}
	for _, entry := range entries {
		ext := path.Ext(entry.Name())
		contentType, ok := types[ext]
		if !ok {
			panic(fmt.Sprintf("static: %s has no content type", entry.Name()))
		}
		content, err := embedded.ReadFile(entry.Name())
		if err != nil {
			panic(err)
		}
		sum := sha256.Sum256(content)
		hashed := strings.TrimSuffix(entry.Name(), ext) + "." + hex.EncodeToString(sum[:6]) + ext
		files[hashed] = File{Content: content, ContentType: contentType}
		urls[entry.Name()] = "/static/" + hashed
	}
	return files, urls
}

// URL returns the address of a file by its name in this folder: "rimeline.css". It
// panics where there is none, since the page would go without its style or script.
func URL(name string) string {
	url, ok := addresses[name]
	if !ok {
		panic(fmt.Sprintf("static: no file %q", name))
	}
	return url
}

// Open returns the file whose address ends in hashed.
func Open(hashed string) (File, bool) {
	f, ok := offered[hashed]
	return f, ok
}
