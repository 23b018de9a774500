// Package notify turns flags into words and sees to it that they arrive: which channel takes what, what a message says, and the
// sending loop over the outbox.
//
// A notice is one message to one channel. A channel is where notices go: a chat, the console. The outbox holds notices from the
// step that made them until they are sent or have failed for good.
package notify
