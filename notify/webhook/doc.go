// Package webhook posts notices as signed JSON to an address of the receiver's choice.
//
// A Hook is one address, as a notify.Channel. Each request bears the time of the attempt, a signature over time and body, and the
// identity of the notice, by which the receiver drops repeats. README.md documents the form.
//
// Traps. An address may be a secret of its own, so no error holds more of it than the host. An answer of the receiver may repeat what
// it was sent: the secret is taken out of it. Redirects are not followed. Any answer of 200 to 299 is a success, an empty one too.
package webhook
