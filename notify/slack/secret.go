package slack

import (
	"errors"
	"fmt"
	"io/fs"
	"log/slog"
	"os"
	"path/filepath"
	"strings"
)

// Secret is a token that no way of printing shows. It is kept behind a function, since printing a struct that holds it would
// otherwise reach its text without asking its methods.
type Secret struct{ get func() string }

const hidden = "***"

// NewSecret hides a text.
func NewSecret(text string) Secret { return Secret{func() string { return text }} }

func (s Secret) reveal() string {
	if s.get == nil {
		return ""
	}
	return s.get()
}

// Empty says that there is no token.
func (s Secret) Empty() bool { return s.reveal() == "" }

// String is the same for every secret, as are the other ways to print one.
func (s Secret) String() string { return hidden }

// GoString is for %#v.
func (s Secret) GoString() string { return hidden }

// Format is for every other verb.
func (s Secret) Format(f fmt.State, _ rune) { _, _ = f.Write([]byte(hidden)) }

// MarshalText is for JSON and the like.
func (s Secret) MarshalText() ([]byte, error) { return []byte(hidden), nil }

// LogValue is for structured logs.
func (s Secret) LogValue() slog.Value { return slog.StringValue(hidden) }

// ErrNoToken: no token is to be found anywhere.
var ErrNoToken = errors.New("no token for the chat: none in the credentials folder (slack_token), STRAYD_SLACK_TOKEN_FILE or STRAYD_SLACK_TOKEN")

// FindToken looks for the token in the service manager's credentials folder, then in the file that STRAYD_SLACK_TOKEN_FILE names,
// then in STRAYD_SLACK_TOKEN. A file that others than its owner may read is refused. ErrNoToken when there is none.
func FindToken(getenv func(string) string) (Secret, error) {
	if dir := getenv("CREDENTIALS_DIRECTORY"); dir != "" {
		s, err := readToken(filepath.Join(dir, "slack_token"), true)
		if !errors.Is(err, fs.ErrNotExist) {
			return s, err
		}
	}
	if file := getenv("STRAYD_SLACK_TOKEN_FILE"); file != "" {
		return readToken(file, false)
	}
	if text := getenv("STRAYD_SLACK_TOKEN"); text != "" {
		return checkToken("STRAYD_SLACK_TOKEN", text)
	}
	return Secret{}, ErrNoToken
}

// tokenMost is the longest file that is read for a token, in bytes.
const tokenMost = 4096

func readToken(file string, credential bool) (Secret, error) {
	info, err := os.Stat(file)
	if err != nil {
		return Secret{}, fmt.Errorf("token for the chat: %w", err)
	}
	if !info.Mode().IsRegular() || info.Size() > tokenMost {
		return Secret{}, fmt.Errorf("token for the chat: %s is not a regular file of at most %d bytes", file, tokenMost)
	}
	if bits := info.Mode().Perm() & othersMay(info, credential); bits != 0 {
		return Secret{}, fmt.Errorf("token for the chat: %s may be read by others than its owner (mode %04o, need 0600 or less)", file, info.Mode().Perm())
	}
	text, err := os.ReadFile(file)
	if err != nil {
		return Secret{}, fmt.Errorf("token for the chat: %w", err)
	}
	return checkToken(file, string(text))
}

// checkToken takes the line ending off and refuses what cannot be a token, without quoting it.
func checkToken(place, text string) (Secret, error) {
	text = strings.TrimRight(text, "\r\n")
	if text == "" {
		return Secret{}, fmt.Errorf("token for the chat: %s is empty", place)
	}
	for _, b := range []byte(text) {
		if b <= ' ' || b > '~' {
			return Secret{}, fmt.Errorf("token for the chat: %s holds a character that no token has, such as a space", place)
		}
	}
	return NewSecret(text), nil
}
