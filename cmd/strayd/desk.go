package main

import (
	"bytes"
	"cmp"
	"context"
	"crypto/subtle"
	"errors"
	"fmt"
	"html"
	"net"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"time"

	"github.com/spf13/cobra"
	"golang.org/x/term"

	"strayd/config"
	"strayd/notify"
	"strayd/rules"
	"strayd/watcher/desk"
	"strayd/watcher/health"
	"strayd/watcher/page"
)

func (a *app) deskCommand() *cobra.Command {
	var only bool
	cmd := &cobra.Command{
		Use:   "desk",
		Short: "Open the desk's page as the person who runs this",
		Long: `Asks the running daemon for a link to its page and opens it in a browser where there is a display. The link is for the user of the
operating system who asked, is good for two minutes and for one use, and needs no password. What is decided on the page is what the commands
acknowledge, decide, waive, sign-off and accept do, by that person.

The page is served on this machine alone. From another one, forward the port that the link names:
ssh -L PORT:127.0.0.1:PORT MACHINE.`,
		Example: "  strayd desk\n  strayd desk --print",
		Args:    takes(0, 0),
		RunE:    func(*cobra.Command, []string) error { return a.openDesk(only) },
	}
	cmd.Flags().BoolVar(&only, "print", false, "print the link and open no browser")
	return cmd
}

// openDesk prints a link, in the daemon; beside it, it has the daemon make one.
func (a *app) openDesk(only bool) error {
	if a.held != nil {
		return a.inviteToDesk()
	}
	out := a.out
	var said bytes.Buffer
	a.out = &said
	done, err := a.callDaemon()
	a.out = out
	switch {
	case err != nil:
		return err
	case !done:
		c, err := a.load()
		if err != nil {
			return err
		}
		return fmt.Errorf("no daemon of the ledger %s is running: the page is the daemon's; begin with `strayd run`", c.Ledger)
	}
	fmt.Fprint(a.out, said.String())
	link, _, _ := strings.Cut(said.String(), "\n")
	if only || !term.IsTerminal(int(os.Stdout.Fd())) || !hasDisplay() {
		return nil
	}
	if err := browse(a.ctx, link); err != nil {
		fmt.Fprintf(a.err, "note: no browser could be opened (%v): open the link yourself\n", err)
	}
	return nil
}

func (a *app) inviteToDesk() error {
	link, through, err := a.held.invite(a.person())
	if err != nil {
		return err
	}
	fmt.Fprintln(a.out, link)
	if through != "" {
		fmt.Fprintln(a.out, "or", through)
	}
	fmt.Fprintf(a.err, "note: for %s, good for %s and for one use\n", a.person(), page.LinkTime())
	return nil
}

func hasDisplay() bool { return cmp.Or(os.Getenv("DISPLAY"), os.Getenv("WAYLAND_DISPLAY")) != "" }

// browse opens a link in a browser by way of a file that only this user can read: every user of a machine sees the command lines of all
// programs.
func browse(ctx context.Context, link string) error {
	file := filepath.Join(cmp.Or(os.Getenv("XDG_RUNTIME_DIR"), os.TempDir()), fmt.Sprintf("strayd-desk-%d.html", os.Getuid()))
	text := fmt.Sprintf("<!DOCTYPE html><meta charset=\"utf-8\"><meta name=\"referrer\" content=\"no-referrer\"><title>strayd</title>"+
		"<meta http-equiv=\"refresh\" content=\"0; url=%[1]s\"><a href=\"%[1]s\">To the desk</a>\n", html.EscapeString(link))
	if err := os.Remove(file); err != nil && !errors.Is(err, os.ErrNotExist) {
		return err
	}
	f, err := os.OpenFile(file, os.O_CREATE|os.O_EXCL|os.O_WRONLY, 0o600)
	if err != nil {
		return err
	}
	_, err = f.WriteString(text)
	if err = errors.Join(err, f.Close()); err != nil {
		return err
	}
	return exec.CommandContext(ctx, "xdg-open", file).Run()
}

// deskPage is the daemon's page once somebody asked for it, or from the start where the configuration names its address.
type deskPage struct {
	mu   sync.Mutex
	page *page.Page
	now  func() time.Time // nil for the clock
	at   net.Addr
	stop context.CancelFunc
	done chan struct{}
}

// anyPort is where the page is served when the configuration names no address: on a free port, from the first link on.
const anyPort = "127.0.0.1:0"

// openPage begins to serve the page, if that is not done yet.
func (d *daemon) openPage(addr string) error {
	p := &d.desk
	p.mu.Lock()
	defer p.mu.Unlock()
	if p.page != nil {
		return nil
	}
	made, err := page.New(d.pageSources())
	if err != nil {
		return err
	}
	l, err := health.Listen(addr)
	if err != nil {
		return fmt.Errorf("desk page: %w", err)
	}
	ctx, stop := context.WithCancel(context.Background())
	p.page, p.at, p.stop, p.done = made, l.Addr(), stop, make(chan struct{})
	go func() {
		defer close(p.done)
		if err := health.Serve(ctx, l, made.Handler(), d.log); err != nil {
			d.log.Error("the desk page ended", "error", err)
		}
	}()
	d.log.Info("desk page", "address", l.Addr().String())
	return nil
}

// close ends the page.
func (p *deskPage) close() {
	p.mu.Lock()
	defer p.mu.Unlock()
	if p.page != nil {
		p.stop()
		<-p.done
	}
}

// invite makes a link for the person who asked; through is the same one by way of the proxy, "" without one.
func (d *daemon) invite(who rules.Person) (link, through string, err error) {
	c := d.inForce().config
	if err := d.openPage(cmp.Or(c.Page.Listen, anyPort)); err != nil {
		return "", "", err
	}
	path := d.desk.page.Invite(who)
	if c.Page.Host != "" {
		through = "https://" + c.Page.Host + path
	}
	return "http://" + d.desk.at.String() + path, through, nil
}

// pageProxy is the reverse proxy that is believed when it names who asks.
type pageProxy struct {
	host, identity string
	secret         notify.Secret
}

// proxyHeader is where the proxy says its secret. Without one, every user of the machine could name whom they like.
const proxyHeader = "Strayd-Proxy-Secret"

// leastSecret is how many characters the secret has at least.
const leastSecret = 16

// openProxy finds the secret of the proxy that the configuration names; nil where it names none.
func openProxy(c *config.Config) (*pageProxy, error) {
	if c.Page.Identity == "" {
		return nil, nil
	}
	credential := notify.Credential{What: "secret of the page's proxy", File: "page_secret", Variable: "STRAYD_PAGE_SECRET"}
	secret, err := credential.Find(os.Getenv)
	if err == nil && len(secret.Reveal()) < leastSecret {
		err = fmt.Errorf("the %s has %d characters, fewer than %d", credential.What, len(secret.Reveal()), leastSecret)
	}
	if err != nil {
		return nil, fmt.Errorf("page.identity: %w", err)
	}
	return &pageProxy{c.Page.Host, c.Page.Identity, secret}, nil
}

// vouches says for whom a request of the proxy is. What comes under another host, or without the secret, is not the proxy's.
func (p *pageProxy) vouches(r page.Asked) (who rules.Person, ok bool) {
	if p == nil || !sameHost(r.Host, p.host) || subtle.ConstantTimeCompare([]byte(r.Header(proxyHeader)), []byte(p.secret.Reveal())) != 1 {
		return who, false
	}
	return desk.PersonNamed(r.Header(p.identity))
}

// sameHost compares a Host, with or without a port, with a name.
func sameHost(hostport, name string) bool {
	host, _, err := net.SplitHostPort(hostport)
	if err != nil {
		host = hostport
	}
	return name != "" && strings.EqualFold(host, name)
}
