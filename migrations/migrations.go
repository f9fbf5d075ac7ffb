// Package migrations is the steps that make the database what this version of the
// program needs: numbered SQL files, applied once, in order, forward only. A mistake
// in one that was released is mended by the next.
//
// It knows nothing of who runs them; server/store does. schema.sql is what they come
// to, for people to read; a test compares it with a dump.
package migrations

import "embed"

// FS holds the numbered files.
//
//go:embed [0-9]*.sql
var FS embed.FS
