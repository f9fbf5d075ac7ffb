package localpg

import (
	"bytes"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"
)

// dieWithUs has the system send a signal to the program when this process ends,
// however it ends.
func dieWithUs(attr *syscall.SysProcAttr, signal syscall.Signal) { attr.Pdeathsig = signal }

// serversOn lists the processes of PostgreSQL that work on our data: those of that
// program that stand in that directory, as PostgreSQL's do. The directory is compared
// by its identity and not by its name, which another container may use as well.
func serversOn(p place) ([]serverProcess, error) {
	data, err := os.Stat(p.data)
	if os.IsNotExist(err) {
		return nil, nil
	}
	if err != nil {
		return nil, err
	}
	all, err := os.ReadDir("/proc")
	if err != nil {
		return nil, err
	}
	var found []serverProcess
	for _, entry := range all {
		pid, err := strconv.Atoi(entry.Name())
		if err != nil {
			continue
		}
		proc := filepath.Join("/proc", entry.Name())
		// What cannot be read belongs to another user, or has just ended.
		exe, err := os.Readlink(filepath.Join(proc, "exe"))
		if err != nil || filepath.Base(strings.TrimSuffix(exe, " (deleted)")) != "postgres" {
			continue
		}
		cwd, err := os.Stat(filepath.Join(proc, "cwd"))
		if err != nil || !os.SameFile(cwd, data) {
			continue
		}
		line, err := os.ReadFile(filepath.Join(proc, "cmdline"))
		if err != nil || len(line) == 0 {
			continue
		}
		found = append(found, serverProcess{pid, kindOf(bytes.ReplaceAll(line, []byte{0}, []byte(" ")), p)})
	}
	return found, nil
}

// mayServe reports whether a process, which is not among those of serversOn, could yet
// be a server on our data. None could: that list has all that the user of the data runs.
func mayServe(int) bool { return false }
