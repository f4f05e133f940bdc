package store

import (
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"sync"
)

// opened counts the registers that this process has open, by place. A POSIX lock belongs to the process:
// where a file that the engine has open is opened a second time by other means and closed, the engine's
// locks are gone, and another process takes the register for one that nobody has open.
var opened = places{count: map[string]int{}}

type places struct {
	mu    sync.Mutex
	count map[string]int
}

// add counts a place. Where it was not open before, check must allow it; nobody opens it meanwhile.
func (p *places) add(key string, check func() error) error {
	p.mu.Lock()
	defer p.mu.Unlock()
	if p.count[key] == 0 {
		if err := check(); err != nil {
			return err
		}
	}
	p.count[key]++
	return nil
}

func (p *places) remove(key string) {
	p.mu.Lock()
	defer p.mu.Unlock()
	if p.count[key]--; p.count[key] <= 0 {
		delete(p.count, key)
	}
}

func (p *places) has(key string) bool {
	p.mu.Lock()
	defer p.mu.Unlock()
	return p.count[key] > 0
}

// place is one name for a file, however it is reached. The file need not be there.
func place(path string) string {
	abs, err := filepath.Abs(path)
	if err != nil {
		return filepath.Clean(path)
	}
	if real, err := filepath.EvalSymlinks(abs); err == nil {
		return real
	}
	// The nearest folder that is there, for what is still to be made.
	dir, rest := filepath.Split(abs)
	for dir = filepath.Clean(dir); ; {
		if real, err := filepath.EvalSymlinks(dir); err == nil {
			return filepath.Join(real, rest)
		}
		up := filepath.Dir(dir)
		if up == dir {
			return abs
		}
		rest = filepath.Join(filepath.Base(dir), rest)
		dir = up
	}
}

func (e *sqliteFile) warnings() []string {
	at := place(e.path)
	if strings.HasPrefix(at, `\\`) {
		return []string{shareWarning(e.path, "a server's folder")}
	}
	mounts, err := os.ReadFile("/proc/mounts")
	if err != nil {
		return nil // no such list on this system
	}
	if kind, where := networkMount(string(mounts), at); kind != "" {
		return []string{shareWarning(e.path, kind+" at "+where)}
	}
	return nil
}

func shareWarning(path, what string) string {
	return fmt.Sprintf("%s lies on a network share (%s): two computers that write to it at once may damage it; keep the register on a disk of this computer and share backups", path, what)
}

// networkKinds are file systems of other computers, as /proc/mounts names them (from memory).
var networkKinds = []string{
	"nfs", "nfs4", "cifs", "smb3", "smbfs", "9p", "afs", "ncpfs", "ceph", "glusterfs", "lustre", "beegfs",
	"fuse.sshfs", "fuse.glusterfs", "fuse.ceph", "fuse.rclone", "fuse.davfs", "fuse.gvfsd-fuse", "davfs",
}

// networkMount says which network file system of the list of mounts a path lies on; "" where on none.
func networkMount(mounts, path string) (kind, where string) {
	for _, line := range strings.Split(mounts, "\n") {
		f := strings.Fields(line)
		if len(f) < 3 {
			continue
		}
		at := strings.NewReplacer(`\040`, " ", `\011`, "\t", `\134`, `\`).Replace(f[1])
		inside := path == at || strings.HasPrefix(path, strings.TrimSuffix(at, "/")+"/")
		if inside && len(at) >= len(where) {
			where, kind = at, f[2]
		}
	}
	if !slices.Contains(networkKinds, kind) {
		return "", ""
	}
	return kind, where
}
