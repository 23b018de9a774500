// Package notify turns flags into words and sees to it that they arrive: which channel takes what, what a message says, and the
// sending loop over the outbox.
//
// A notice is one message to one channel. A channel is where notices go: a chat, the console. The outbox holds notices from the
// step that made them until they are sent or have failed for good. A Teller makes notices, a Sender delivers them.
//
// Traps. A notice is marked as sending before the call, so that a crash leaves a trace; what such a trace means is asked of the
// channel, and where the channel cannot say, the notice is sent again and says "(possible repeat)". Lines hold text from other
// people's files: a Teller makes it safe to print, but only the channel knows what is markup there and escapes it. The queue of a
// channel is strictly first in, first out, so the notice at its head holds up the ones behind it until it is sent or has failed.
package notify
