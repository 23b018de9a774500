package main

import (
	"errors"
	"fmt"
	"slices"
	"strconv"
	"strings"

	"github.com/spf13/cobra"

	"strayd/config"
	"strayd/notify"
	"strayd/rules"
	"strayd/watcher/ledger"
)

const noticeColumns = "number,made,channel,kind,refs,date,state,attempts,next,ended,receipt,repeat,error,first_line"

func (a *app) noticesCommand() *cobra.Command {
	var format, state, channel string
	cmd := &cobra.Command{
		Use:   "notices",
		Short: "What was sent, waits or failed for good; send again",
		Long: `Lists the notices of the outbox, oldest first; a failed or sent one can be sent again.
States: ` + joinWords(rules.NoticeStates) + `.`,
		Example: "  strayd notices --state failed\n  strayd notices again 12 13",
		Args:    cobra.NoArgs,
		RunE: func(*cobra.Command, []string) error {
			if err := checkFormat(format); err != nil {
				return err
			}
			return a.notices(format, state, channel)
		},
	}
	cmd.Flags().StringVar(&format, "format", "table", "table, csv or json")
	cmd.Flags().StringVar(&state, "state", "", "in this `STATE`")
	cmd.Flags().StringVar(&channel, "channel", "", "to this `CHANNEL`")
	cmd.AddCommand(beside(&cobra.Command{
		Use:     "again NUMBER...",
		Short:   "Send notices again",
		Example: "  strayd notices again 12 13",
		Args:    cobra.MinimumNArgs(1),
		RunE:    func(_ *cobra.Command, args []string) error { return a.noticesAgain(args) },
	}))
	return beside(cmd)
}

func (a *app) notices(format, state, channel string) error {
	return a.withLedger(ledger.ReadOnly, func(_ *config.Config, l *ledger.Ledger) error {
		takes := func(n *rules.Notice) bool {
			return (state == "" || state == string(n.State)) && (channel == "" || channel == n.Channel)
		}
		if format == "table" {
			return a.noticeTable(l, takes)
		}
		list, err := newListing(a.out, format, noticeColumns)
		if err != nil {
			return err
		}
		var rowErr error
		err = l.Notices(func(n rules.Notice) bool {
			if takes(&n) {
				rowErr = list.row(noticeCells(&n)...)
			}
			return rowErr == nil
		})
		return firstError(err, rowErr, list.end())
	})
}

func noticeCells(n *rules.Notice) []cell {
	var refs []string
	for _, r := range n.Refs {
		refs = append(refs, strconv.FormatUint(r, 10))
	}
	repeat := cell{"false", "false"}
	if n.Repeat {
		repeat = cell{"true", "true"}
	}
	return []cell{integer(n.Number), moment(n.Made), text(n.Channel), text(string(n.Kind)), text(strings.Join(refs, " ")), date(n.Date),
		text(string(n.State)), integer(n.Attempts), moment(n.Next), moment(n.Ended), text(n.Receipt), repeat, text(n.Error), text(firstLine(n))}
}

func firstLine(n *rules.Notice) string {
	if len(n.Lines) == 0 {
		return ""
	}
	return n.Lines[0]
}

func (a *app) noticeTable(l *ledger.Ledger, takes func(*rules.Notice) bool) error {
	w, count := columns(a.out), 0
	err := l.Notices(func(n rules.Notice) bool {
		if !takes(&n) {
			return true
		}
		if count++; count == 1 {
			fields(w, "number", "made", "channel", "state", "attempts", "first line")
		}
		line := firstLine(&n)
		if n.Error != "" {
			line += " [" + n.Error + "]"
		}
		fields(w, fmt.Sprint(n.Number), n.Made.UTC().Format("2006-01-02 15:04 MST"), printable(n.Channel), string(n.State), fmt.Sprint(n.Attempts), printable(line))
		return true
	})
	if err := firstError(err, w.Flush()); err != nil {
		return err
	}
	if count == 0 {
		fmt.Fprintln(a.out, "No notice.")
	}
	return nil
}

// noticesAgain puts notices back into the queue.
func (a *app) noticesAgain(args []string) error {
	now, err := a.now()
	if err != nil {
		return err
	}
	return a.withLedger(ledger.ReadWrite, func(c *config.Config, l *ledger.Ledger) error {
		for _, arg := range args {
			number, err := strconv.ParseUint(arg, 10, 64)
			if err != nil {
				return usagef("%q is not the number of a notice", arg)
			}
			v, err := l.Read()
			if err != nil {
				return err
			}
			n, ok, err := v.Notice(number)
			if err = errors.Join(err, v.Close()); err != nil {
				return err
			}
			switch {
			case !ok:
				return fmt.Errorf("no notice has the number %d; `strayd notices` lists them", number)
			case n.State == rules.NoticeWaiting || n.State == rules.NoticeSending:
				return fmt.Errorf("notice %d is %s already", number, n.State)
			case !slices.ContainsFunc(c.Channels, func(ch rules.Channel) bool { return ch.Name == n.Channel }):
				return fmt.Errorf("notice %d is for channel %s, which the configuration does not have", number, n.Channel)
			}
			if err := l.Mark(notify.Again(n, now)); err != nil {
				return err
			}
			fmt.Fprintf(a.out, "Notice %d waits for channel %s again.\n", number, n.Channel)
		}
		if a.held != nil {
			a.held.inForce().post.Wake()
		}
		return nil
	})
}
