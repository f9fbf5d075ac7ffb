//go:build unix

package testdb

import (
	"os/exec"
	"syscall"
)

func inOwnGroup(cmd *exec.Cmd) { cmd.SysProcAttr = &syscall.SysProcAttr{Setpgid: true} }
