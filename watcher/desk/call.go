package desk

import (
	"bufio"
	"context"
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"net"
	"time"

	"strayd/rules"
)

// Call is one command line to be carried out.
type Call struct {
	Version  int          // of this protocol
	Args     []string     // without the program's name
	Dir      string       // the caller's folder
	Settings string       // hash of the caller's configuration
	Who      rules.Person // set by the server from the socket's peer
}

// protocol is the version of the calls that this program makes and takes.
const protocol = 2

// reply is what comes back, one JSON line each: output in pieces, then the end.
type reply struct {
	Out  []byte `json:"out,omitempty"`
	Err  []byte `json:"err,omitempty"`
	End  bool   `json:"end,omitempty"`
	Exit int    `json:"exit,omitempty"`
}

// ErrNobody says that no daemon listens.
var ErrNobody = errors.New("no daemon is running")

// dialTime is how long a daemon may take to pick up.
const dialTime = 2 * time.Second

// Do hands a call to the daemon of a ledger and copies its output. The error is ErrNobody when none is running.
func Do(ctx context.Context, ledger string, call Call, stdout, stderr io.Writer) (exit int, err error) {
	path, ok := Path(ledger)
	if !ok {
		return 0, ErrNobody
	}
	dialer := net.Dialer{Timeout: dialTime}
	conn, err := dialer.DialContext(ctx, "unix", path)
	if err != nil {
		return 0, fmt.Errorf("%w: %w", ErrNobody, err)
	}
	defer conn.Close()
	stop := context.AfterFunc(ctx, func() { conn.Close() })
	defer stop()
	call.Version = protocol
	if err := json.NewEncoder(conn).Encode(call); err != nil {
		return 0, fmt.Errorf("the daemon does not take the command: %w", err)
	}
	return copyReplies(conn, stdout, stderr)
}

func copyReplies(conn io.Reader, stdout, stderr io.Writer) (int, error) {
	replies := json.NewDecoder(bufio.NewReader(conn))
	for {
		var r reply
		if err := replies.Decode(&r); err != nil {
			return 0, fmt.Errorf("the daemon ended before it answered: %w", err)
		}
		if _, err := stdout.Write(r.Out); err != nil {
			return 0, err
		}
		if _, err := stderr.Write(r.Err); err != nil {
			return 0, err
		}
		if r.End {
			return r.Exit, nil
		}
	}
}
