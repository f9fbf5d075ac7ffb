//go:build unix && !linux

package localpg

import (
	"bytes"
	"fmt"
	"os/exec"
	"strconv"
	"syscall"
)

// dieWithUs does nothing: this system has no such signal. A server that is left behind
// is ended by the next start.
func dieWithUs(*syscall.SysProcAttr, syscall.Signal) {}

// serversOn lists the postmasters that were started on our data, by their command
// lines. Processes that a dead postmaster left cannot be told by theirs; PostgreSQL
// itself refuses to start while there are any, and we try again.
func serversOn(p place) ([]serverProcess, error) {
	out, err := exec.Command("ps", "-axww", "-o", "pid=,command=").Output()
	if err != nil {
		return nil, fmt.Errorf("ps: %w", err)
	}
	var found []serverProcess
	for line := range bytes.Lines(out) {
		number, command, ok := bytes.Cut(bytes.TrimSpace(line), []byte(" "))
		pid, err := strconv.Atoi(string(number))
		if !ok || err != nil || !bytes.Contains(command, []byte("-D "+p.data+" ")) {
			continue
		}
		found = append(found, serverProcess{pid, kindOf(bytes.TrimSpace(command), p)})
	}
	return found, nil
}

// mayServe reports whether a process, which is not among those of serversOn, could yet
// be a server on our data: an administrator may have started one with another spelling
// of the directory.
func mayServe(pid int) bool {
	out, err := exec.Command("ps", "-p", strconv.Itoa(pid), "-o", "stat=", "-o", "comm=").Output()
	ended := bytes.HasPrefix(bytes.TrimSpace(out), []byte("Z")) // its parent has not asked how
	return err == nil && !ended && bytes.Contains(out, []byte("postgres"))
}
