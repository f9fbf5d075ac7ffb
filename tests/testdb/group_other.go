//go:build !unix

package testdb

import "os/exec"

func inOwnGroup(*exec.Cmd) {}
