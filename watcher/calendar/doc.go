// Package calendar turns the text of a calendar, as the configuration and the register write it, into the business days that it means.
//
// A calendar is made of parts joined by +: a week (weekdays, daily, or two days such as sun-thu), a nation's code (GB, DE, DE-BY, CH-ZH,
// US; ECB for the days of the euro's payment system), and files of days. A day is a business day when it is one under every part; a file
// may open days besides.
//
// National calendars are public and bank holidays as the library knows them, computed for FirstYear to LastYear: those of an exchange
// differ, and what a government adds later comes only with a newer library. A file beside the nation's code adds or opens days.
package calendar
