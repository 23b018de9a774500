package desk

import (
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"os"
	"path/filepath"
)

// longestPath is what every system's socket address holds.
const longestPath = 100

// name is the socket's file name: a short hash of the ledger's path.
func name(ledger string) string {
	sum := sha256.Sum256([]byte(ledger))
	return hex.EncodeToString(sum[:6]) + ".sock"
}

// folders are where a socket may lie, the service's own first.
func folders() []string {
	var out []string
	if d := os.Getenv("RUNTIME_DIRECTORY"); d != "" {
		out = append(out, d)
	}
	if d := os.Getenv("XDG_RUNTIME_DIR"); d != "" {
		out = append(out, filepath.Join(d, "strayd"))
	}
	return append(out, "/run/strayd", lastResort())
}

// lastResort is a folder among those for temporary files, which are open to everyone: there may be another user's of its name.
func lastResort() string { return filepath.Join(os.TempDir(), fmt.Sprintf("strayd-%d", os.Getuid())) }

// serverFolder is the folder for a new socket. It is made where it is not there, and must belong to this user alone.
func serverFolder() (string, error) {
	for _, d := range folders() {
		if d == "/run/strayd" && os.Getenv("RUNTIME_DIRECTORY") == "" {
			continue // only the service manager makes that one
		}
		if os.MkdirAll(d, 0o700) != nil {
			continue
		}
		if private(d) {
			return d, nil
		}
	}
	return "", fmt.Errorf("no folder for the control socket: none of %v belongs to this user alone", folders())
}

// Path is where the daemon of a ledger listens, if one does: the first socket that is there. The last resort counts only when it is this
// user's own, or another's daemon could answer in the place of this one's.
func Path(ledger string) (string, bool) {
	for _, d := range folders() {
		p := filepath.Join(d, name(ledger))
		if d == lastResort() && !private(d) {
			continue
		}
		if info, err := os.Lstat(p); err == nil && info.Mode()&os.ModeSocket != 0 {
			return p, true
		}
	}
	return "", false
}
