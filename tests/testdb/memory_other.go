//go:build !linux

package testdb

// memory is the usual directory for temporary files; this system has none in memory.
func memory() string { return "" }
