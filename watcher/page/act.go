package page

import (
	"net/http"
	"slices"
	"strconv"
	"strings"
	"time"

	"strayd/rules"
	"strayd/watcher"
)

// typed is what somebody put into the form.
type typed struct {
	Refs       []uint64
	Deed       rules.Deed
	Conclusion rules.Conclusion
	Value      string
	Reason     rules.Reason
	Note       string
	Override   string
	Until      string
}

// actTime is how long a deed may take: it waits for the pass under way.
const actTime = 5 * time.Minute

// act carries out what a form says, by the command line that says the same.
func (p *Page) act(v *visit) error {
	v.mayTake(actTime)
	if err := v.ownForm(); err != nil {
		return err
	}
	t, err := typedIn(v.r)
	if err != nil {
		return err
	}
	args, err := p.args(&t)
	if err != nil {
		return err
	}
	ok, text := p.src.Do(v.r.Context(), v.desk.who, args)
	said := &Outcome{OK: ok, Lines: strings.Split(strings.TrimRight(text, "\n"), "\n")}
	if ok {
		v.desk.say(said)
		http.Redirect(v.w, v.r, v.desk.path+"/"+placeOf(t.Refs), http.StatusSeeOther)
		return nil
	}
	if len(t.Refs) == 1 || v.r.PostForm.Get("at") != "" {
		at, err := strconv.ParseUint(v.r.PostForm.Get("at"), 10, 64)
		if err != nil {
			at = t.Refs[0]
		}
		return p.flagPage(v, http.StatusUnprocessableEntity, at, t, said)
	}
	return p.flagsPage(v, http.StatusUnprocessableEntity, t.Refs, t, said)
}

// placeOf is where the flags of a deed are seen afterwards.
func placeOf(refs []uint64) string {
	if len(refs) == 1 {
		return "flag?ref=" + strconv.FormatUint(refs[0], 10)
	}
	return "flags?ref=" + strings.Join(texts(refs), ",")
}

func texts(refs []uint64) (out []string) {
	for _, r := range refs {
		out = append(out, strconv.FormatUint(r, 10))
	}
	return out
}

// typedIn reads the form. Words that the form does not offer are refused here, whatever the command would say of them.
func typedIn(r *http.Request) (t typed, err error) {
	if t.Refs, err = refsOf(r.PostForm["ref"]); err != nil {
		return t, err
	}
	line := func(name string) string { return strings.Join(strings.Fields(r.PostForm.Get(name)), " ") }
	t.Deed, t.Conclusion, t.Reason = rules.Deed(line("deed")), rules.Conclusion(line("conclusion")), rules.Reason(line("reason"))
	t.Value, t.Note, t.Override, t.Until = line("value"), line("note"), line("override"), line("until")
	switch {
	case len(t.Refs) == 0:
		return t, refusal{http.StatusBadRequest, "no flag is chosen"}
	case !slices.Contains(rules.Deeds, t.Deed):
		return t, refusal{http.StatusBadRequest, "the form does not say what to do"}
	case t.Conclusion != "" && !slices.Contains(rules.Conclusions, t.Conclusion), t.Reason != "" && !slices.Contains(rules.Reasons, t.Reason):
		return t, refusal{http.StatusBadRequest, "the form says what no form of this page offers"}
	}
	return t, nil
}

// args is the command line of a deed. What people typed stands behind an equals sign or two hyphens, so that it is never taken for an option.
func (p *Page) args(t *typed) ([]string, error) {
	if t.Deed == rules.Accept {
		return p.acceptArgs(t)
	}
	args := append([]string{string(t.Deed)}, texts(t.Refs)...)
	switch t.Deed {
	case rules.Decide:
		word := string(t.Conclusion)
		if t.Conclusion == rules.Corrected {
			word += "=" + t.Value
		}
		if word != "" {
			args = append(args, word)
		}
		args = option(args, "override", t.Override)
	case rules.Waive:
		args = option(args, "until", t.Until)
	}
	if t.Deed == rules.Decide {
		args = option(args, "reason", string(t.Reason))
	}
	return option(args, "note", t.Note), nil
}

func option(args []string, name, value string) []string {
	if value == "" {
		return args
	}
	return append(args, "--"+name+"="+value)
}

// acceptArgs is the command line that releases the file of a flag.
func (p *Page) acceptArgs(t *typed) (args []string, err error) {
	if len(t.Refs) != 1 {
		return nil, refusal{http.StatusBadRequest, "files are released one by one"}
	}
	err = p.reading(func(view watcher.View) error {
		f, ok, err := view.Flag(t.Refs[0])
		switch {
		case err != nil:
			return err
		case !ok || f.Kind != rules.KindRefused:
			return refusal{http.StatusBadRequest, "that is no flag of a refused file"}
		}
		args = append(option([]string{"accept"}, "note", t.Note), "--", f.File)
		return nil
	})
	return args, err
}
