package health

import (
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"
	"time"
)

// readUnit reads a unit file strictly: section, key and the values in order (systemd.syntax(7), without continued lines).
func readUnit(text string) (map[string]map[string][]string, error) {
	all, section := map[string]map[string][]string{}, ""
	for i, line := range strings.Split(text, "\n") {
		name, isSection := strings.CutPrefix(line, "[")
		key, value, isValue := strings.Cut(line, "=")
		switch {
		case line == "" || strings.HasPrefix(line, "#"):
		case strings.TrimSpace(line) != line || strings.HasSuffix(line, `\`):
			return nil, fmt.Errorf("line %d: space around it, or a continued line: %q", i+1, line)
		case isSection && strings.HasSuffix(name, "]"):
			section = strings.TrimSuffix(name, "]")
			all[section] = map[string][]string{}
		case isValue && section != "" && strings.TrimSpace(key) == key && !strings.Contains(value, "#"):
			all[section][key] = append(all[section][key], value)
		default:
			return nil, fmt.Errorf("line %d: neither section nor value: %q", i+1, line)
		}
	}
	return all, nil
}

// The lines of PITFALLS R7.3 and R7.4 and those that the daemon's own promises rest on.
func TestUnitHoldsItsLines(t *testing.T) {
	u, err := readUnit(Unit())
	if err != nil {
		t.Fatal(err)
	}
	for key, want := range map[string]string{
		"Type": "notify", "NotifyAccess": "main", "WatchdogSec": "120", "Restart": "on-failure", "RestartPreventExitStatus": "78 4",
		"ExecStart": "/usr/local/bin/strayd --config /etc/strayd/strayd.yaml run", "ExecReload": "/bin/kill -HUP $MAINPID", "TimeoutStopSec": "30",
		"User": "strayd", "Group": "strayd", "StateDirectory": "strayd", "StateDirectoryMode": "0700", "RuntimeDirectory": "strayd",
		"RuntimeDirectoryMode": "0750", "UMask": "0077", "LoadCredential": "slack_token:/etc/strayd/slack_token", "ProtectSystem": "strict",
		"ProtectHome": "yes", "PrivateTmp": "yes", "PrivateDevices": "yes", "NoNewPrivileges": "yes", "CapabilityBoundingSet": "",
		"RestrictAddressFamilies": "AF_UNIX AF_INET AF_INET6", "RestrictNamespaces": "yes", "LockPersonality": "yes", "MemoryDenyWriteExecute": "yes",
		"SystemCallFilter": "@system-service", "ReadOnlyPaths": "-/srv/strayd/inbox", "MemoryMax": "2G",
	} {
		if got, ok := u["Service"][key]; !ok || len(got) != 1 || got[0] != want {
			t.Errorf("%s is %q, want %q", key, got, want)
		}
	}
	for section, keys := range u {
		for key, values := range keys {
			if len(values) != 1 {
				t.Errorf("[%s] %s is given %d times", section, key, len(values))
			}
		}
	}
	if _, there := u["Service"]["PrivateUsers"]; there {
		t.Error("PrivateUsers hides who is at the control socket")
	}
	if len(u) != 3 || u["Install"]["WantedBy"] == nil || u["Unit"]["Description"] == nil {
		t.Errorf("sections: %v", u)
	}
}

// What the manager grants and what the daemon takes are written in different files.
func TestUnitFitsTheDaemon(t *testing.T) {
	u, _ := readUnit(Unit())
	seconds := func(key string) time.Duration {
		d, err := time.ParseDuration(u["Service"][key][0] + "s")
		if err != nil {
			t.Fatal(err)
		}
		return d
	}
	if got := seconds("WatchdogSec"); got != staleAfter {
		t.Errorf("the watchdog barks after %v, and /alive gives up after %v", got, staleAfter)
	}
	const outbox = 10 * time.Second // PITFALLS R7.2: the time that notices in hand have
	if got := seconds("TimeoutStopSec"); got < 2*(stopTime+outbox) {
		t.Errorf("%v for the stop is not well above %v", got, stopTime+outbox)
	}
}

func TestReaderOfUnitsIsStrict(t *testing.T) {
	for _, bad := range []string{"a=b", "[S]\nword", "[S]\n a=b", "[S]\na=b ", "[S]\na=b \\", "[S]\na =b", "[S", "[S]\na=b # note"} {
		if u, err := readUnit(bad); err == nil {
			t.Errorf("%q is taken as %v", bad, u)
		}
	}
}

// The service manager's own tool reads the unit without a word and finds little exposed.
func TestUnitPassesTheManagersOwnCheck(t *testing.T) {
	tool, err := exec.LookPath("systemd-analyze")
	if err != nil {
		t.Skip("systemd-analyze is not installed")
	}
	program, err := os.Executable() // verify wants the program to be there
	if err != nil {
		t.Fatal(err)
	}
	file := filepath.Join(t.TempDir(), "strayd.service")
	text := strings.Replace(Unit(), "ExecStart=/usr/local/bin/strayd", "ExecStart="+program, 1)
	if err := os.WriteFile(file, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	if out, err := exec.Command(tool, "verify", "--man=no", file).CombinedOutput(); err != nil || len(out) != 0 {
		t.Errorf("verify: %v\n%s", err, out)
	}
	out, err := exec.Command(tool, "--version").Output()
	var version int
	if _, scan := fmt.Sscanf(string(out), "systemd %d", &version); err != nil || scan != nil || version < 250 {
		t.Skipf("systemd-analyze security takes a file from version 250 on, this is %d", version)
	}
	// 2.0 of 10: what is left is the network, which the chat needs, and other users, whom the control socket must tell apart.
	if out, err := exec.Command(tool, "security", "--no-pager", "--offline=true", "--threshold=20", file).CombinedOutput(); err != nil {
		t.Errorf("security: %v\n%s", err, out)
	}
}
