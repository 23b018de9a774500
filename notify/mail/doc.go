// Package mail sends notices by mail through one server. It is the only door to go-mail.
//
// A Mailer is one server, sender and list of recipients, as a notify.Channel. A mail is plain text; its subject is the notice's first
// line, its Message-ID the notice's identity, so that a repeat is known for one.
//
// Traps. A message has been handed over only when the server answers the end of its data; that answer counts, and no failure after
// it. A lost answer to the end is the only doubtful outcome: whatever fails before it leaves nothing behind (RFC 5321, 4.1.1.4). One
// recipient refused for good refuses the message as a whole: it goes to all or to nobody. The library's own default addresses no
// context once connected, so a cut-off closes the connection.
package mail
