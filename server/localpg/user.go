//go:build unix

package localpg

import (
	"errors"
	"fmt"
	"io/fs"
	"os"
	"os/user"
	"path/filepath"
	"strconv"
	"syscall"
)

// serverUser is the user that PostgreSQL runs as. It refuses to run as root.
type serverUser struct {
	name     string
	uid, gid uint32
	dropped  bool // it is another user than that of this process, which is root
}

// chooseUser decides as whom PostgreSQL runs. Root drops to the owner of the data, or
// where there are none yet to the user made for PostgreSQL, or else to the one with no
// rights. Everybody else stays who they are.
func chooseUser(data string) (serverUser, error) {
	owner, err := ownerOf(data)
	if err != nil && !errors.Is(err, fs.ErrNotExist) {
		return serverUser{}, err
	}
	made := err == nil
	me := uint32(os.Geteuid())
	switch {
	case me != 0 && made && owner != me:
		return serverUser{}, fmt.Errorf("the data in %s belong to the user %s: start Rimeline as that user, or choose another directory", data, userName(owner))
	case me != 0:
		return serverUser{name: userName(me), uid: me, gid: uint32(os.Getegid())}, nil
	case made && owner == 0:
		return serverUser{}, fmt.Errorf("the data in %s belong to root, as whom PostgreSQL does not run: give them to another user (chown -R postgres %s)", data, data)
	case made:
		return lookUp(user.LookupId(strconv.Itoa(int(owner))))
	}
	for _, name := range []string{"postgres", "_postgres", "nobody"} {
		if u, err := lookUp(user.Lookup(name)); err == nil && u.uid != 0 {
			return u, nil
		}
	}
	return serverUser{}, errors.New("PostgreSQL does not run as root, and there is neither a user postgres nor a user nobody to run it as")
}

// lookUp makes a serverUser to drop to out of what the system says of it.
func lookUp(u *user.User, err error) (serverUser, error) {
	if err != nil {
		return serverUser{}, err
	}
	uid, err := strconv.ParseUint(u.Uid, 10, 32)
	if err != nil {
		return serverUser{}, fmt.Errorf("the id of the user %s: %w", u.Username, err)
	}
	gid, err := strconv.ParseUint(u.Gid, 10, 32)
	if err != nil {
		return serverUser{}, fmt.Errorf("the group of the user %s: %w", u.Username, err)
	}
	return serverUser{name: u.Username, uid: uint32(uid), gid: uint32(gid), dropped: true}, nil
}

// own gives a directory to the user.
func (u serverUser) own(dir string) error {
	if !u.dropped {
		return nil
	}
	return os.Chown(dir, int(u.uid), int(u.gid))
}

// credential is what a process of the user is started with; nil leaves all as it is.
func (u serverUser) credential() *syscall.Credential {
	if !u.dropped {
		return nil
	}
	return &syscall.Credential{Uid: u.uid, Gid: u.gid}
}

// closedParent finds the first directory on the way to a path that the user may not go
// through, by the mode of each. It explains a refusal; it does not foresee one, since
// there are access lists too. "" is none.
func (u serverUser) closedParent(path string) string {
	var closed string
	for dir := path; ; dir = filepath.Dir(dir) {
		if info, err := os.Stat(dir); err == nil && info.IsDir() && !u.mayEnter(info) {
			closed = dir
		}
		if dir == filepath.Dir(dir) {
			return closed
		}
	}
}

func (u serverUser) mayEnter(dir fs.FileInfo) bool {
	stat, ok := dir.Sys().(*syscall.Stat_t)
	if !ok {
		return true
	}
	switch mode := dir.Mode(); {
	case stat.Uid == u.uid:
		return mode&0o100 != 0
	case stat.Gid == u.gid:
		return mode&0o010 != 0
	default:
		return mode&0o001 != 0
	}
}

// ownerOf is the id of the user whom a file belongs to.
func ownerOf(path string) (uint32, error) {
	info, err := os.Stat(path)
	if err != nil {
		return 0, err
	}
	stat, ok := info.Sys().(*syscall.Stat_t)
	if !ok {
		return 0, fmt.Errorf("the owner of %s cannot be read", path)
	}
	return stat.Uid, nil
}

// userName is the name of a user, or the id where there is no name.
func userName(uid uint32) string {
	id := strconv.FormatUint(uint64(uid), 10)
	if u, err := user.LookupId(id); err == nil {
		return u.Username
	}
	return id
}

// ownerHint adds to a refusal whom the directory belongs to.
func ownerHint(dir string, err error) string {
	owner, statErr := ownerOf(dir)
	if statErr != nil || !errors.Is(err, fs.ErrPermission) || owner == uint32(os.Geteuid()) {
		return ""
	}
	return fmt.Sprintf(" (it belongs to the user %s: start Rimeline as that user, or choose another directory)", userName(owner))
}
