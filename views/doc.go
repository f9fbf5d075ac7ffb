// Package views is the pages: templ components and the structs they are filled
// from. It holds markup and words that never change; a page struct carries finished
// strings and ready components.
//
// It must not know a design, a result, a number or a time: what reaches it has been
// made text by server/display or by the page builders in server.
package views
