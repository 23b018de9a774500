// Package page is the desk's page: what people do about flags, in a browser on this machine.
//
// A link is an address with a one-time token, made for one person, whom the control socket's peer or the caller named; it lives for two
// minutes. Opening it shows whose it is; taking it up gives the browser a desk: a path that nobody else knows and a cookie for that path
// alone, for that person, for ten hours. A deed on the page is the same command line that the person could have typed.
//
// # Traps
//
// Loopback is open to every user of the machine, and a browser sends a cookie to every port of a host: hence the path of its own, which no
// other listener learns, since nothing is sent as a referrer. A token or a cookie must never reach a log or an error. What is shown comes from
// other people's files: templates escape it, and Safe takes out what would turn the text around. A View serves one request and ends with it.
package page
