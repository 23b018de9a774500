package slack

import "strayd/notify"

// Token is where the token of the workspace is looked for.
func Token() notify.Credential {
	return notify.Credential{What: "token for the chat", File: "slack_token", Variable: "STRAYD_SLACK_TOKEN"}
}
