// Package slack posts notices to chat channels of a Slack workspace. It is the only door to slack-go.
//
// A Service is one workspace reached with one token; a Channel is one channel there, by its id, as a notify.Channel.
//
// Traps. The library takes an answer of {} or {"ok":false} for a success, so a post has succeeded only when it gives back a channel
// and a time stamp. Its ready-made retries would post a message whose answer was lost once more, so there are none here. Its errors
// may hold the address called, so only their cause is passed on. Every text is escaped before it is cut, and never cut within an
// escape. The metadata of a message can be read by anyone in the workspace: it holds a number and a hash.
package slack
