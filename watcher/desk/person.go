package desk

import (
	"os/user"
	"strconv"
	"strings"

	"strayd/rules"
)

// PersonOf is the user of a uid, with the name that the system has for it. A name that could be taken for something else is left out.
func PersonOf(uid int) rules.Person {
	p := rules.Person{UID: uid}
	if u, err := user.LookupId(strconv.Itoa(uid)); err == nil && plainName(u.Username) {
		p.Name = u.Username
	}
	return p
}

// PersonNamed is the user of a name, as the system has it; ok is false where it has none.
func PersonNamed(name string) (p rules.Person, ok bool) {
	if !plainName(name) {
		return p, false
	}
	u, err := user.Lookup(name)
	if err != nil {
		return p, false
	}
	uid, err := strconv.Atoi(u.Uid)
	return rules.Person{UID: uid, Name: u.Username}, err == nil && plainName(u.Username)
}

// plainName says that a name has only what names of users have: no blank, no bracket, no control character.
func plainName(name string) bool {
	return name != "" && strings.IndexFunc(name, func(r rune) bool {
		plain := r >= 'a' && r <= 'z' || r >= 'A' && r <= 'Z' || r >= '0' && r <= '9' || strings.ContainsRune(`._-@\+$`, r)
		return !plain
	}) < 0
}
