package notify

import (
	"encoding/base64"
	"errors"
	"fmt"
	"io/fs"
	"log/slog"
	"net/url"
	"os"
	"path/filepath"
	"strings"
	"unicode"
	"unicode/utf8"
)

// Secret is a text, such as a token, that no way of printing shows. It is kept behind a function, since printing a struct that holds it would
// otherwise reach its text without asking its methods.
type Secret struct{ get func() string }

const hidden = "***"

// NewSecret hides a text.
func NewSecret(text string) Secret { return Secret{func() string { return text }} }

// Reveal is the text. Whoever asks for it keeps it out of errors and logs.
func (s Secret) Reveal() string {
	if s.get == nil {
		return ""
	}
	return s.get()
}

// Empty says that there is no text.
func (s Secret) Empty() bool { return s.Reveal() == "" }

// Redact takes the secret out of a text, should it ever be in one: as it is, and as addresses and base64 write it.
func (s Secret) Redact(text string) string {
	if s.Empty() {
		return text
	}
	plain := s.Reveal()
	for _, form := range []string{plain, url.QueryEscape(plain), url.PathEscape(plain), base64.StdEncoding.EncodeToString([]byte(plain))} {
		text = strings.ReplaceAll(text, form, hidden)
	}
	return text
}

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

// ErrNoCredential: a credential is to be found nowhere.
var ErrNoCredential = errors.New("none in the places for it")

// Credential is where a secret is looked for.
type Credential struct {
	What     string // in words, such as "token for the chat"
	File     string // its name in the service manager's credentials folder
	Variable string // of the environment; with _FILE after it, that of a file's name
	Phrase   bool   // it may hold spaces and letters beyond ASCII
}

// Find looks in the service manager's credentials folder, then in the file that the variable with _FILE names, then in the variable. A
// file that others than its owner may read is refused. ErrNoCredential when it is nowhere.
func (c Credential) Find(getenv func(string) string) (Secret, error) {
	if dir := getenv("CREDENTIALS_DIRECTORY"); dir != "" {
		s, err := c.read(filepath.Join(dir, c.File), true)
		if !errors.Is(err, fs.ErrNotExist) {
			return s, err
		}
	}
	if file := getenv(c.Variable + "_FILE"); file != "" {
		return c.read(file, false)
	}
	if text := getenv(c.Variable); text != "" {
		return c.check(c.Variable, text)
	}
	return Secret{}, missing{fmt.Sprintf("no %s: none in the credentials folder (%s), %s_FILE or %s", c.What, c.File, c.Variable, c.Variable)}
}

// missing is an ErrNoCredential that says where was looked.
type missing struct{ text string }

func (m missing) Error() string        { return m.text }
func (m missing) Is(target error) bool { return target == ErrNoCredential }

// secretMost is how much of a file is read for a secret, in bytes.
const secretMost = 4096

func (c Credential) read(file string, credential bool) (Secret, error) {
	info, err := os.Stat(file)
	if err != nil {
		return Secret{}, fmt.Errorf("%s: %w", c.What, err)
	}
	if !info.Mode().IsRegular() || info.Size() > secretMost {
		return Secret{}, fmt.Errorf("%s: %s is not a regular file of at most %d bytes", c.What, file, secretMost)
	}
	if bits := info.Mode().Perm() & othersMay(info, credential); bits != 0 {
		return Secret{}, fmt.Errorf("%s: %s may be read by others than its owner (mode %04o, need 0600 or less)", c.What, file, info.Mode().Perm())
	}
	text, err := os.ReadFile(file)
	if err != nil {
		return Secret{}, fmt.Errorf("%s: %w", c.What, err)
	}
	return c.check(file, string(text))
}

// check takes the line ending off and refuses what cannot be the secret, without quoting it.
func (c Credential) check(place, text string) (Secret, error) {
	text = strings.TrimRight(text, "\r\n")
	if text == "" {
		return Secret{}, fmt.Errorf("%s: %s is empty", c.What, place)
	}
	for _, r := range text {
		if c.Phrase && unicode.IsPrint(r) && r != utf8.RuneError {
			continue
		}
		if r <= ' ' || r > '~' {
			return Secret{}, fmt.Errorf("%s: %s holds a character that it cannot have, such as a line break or a space", c.What, place)
		}
	}
	return NewSecret(text), nil
}
