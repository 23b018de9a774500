package schedule

import (
	"strings"
	"testing"
	"time"
)

func TestBadSpecs(t *testing.T) {
	tests := []struct{ spec, want string }{
		// nothing, or too much
		{"", `empty schedule: write five fields, such as 0 18 * * mon-fri`},
		{"  \t", `empty schedule: write five fields, such as 0 18 * * mon-fri`},
		{"0 9 * *", `"0 9 * *" has 4 fields: write 5, minute, hour, day of month, month, day of week`},
		{"0 0 9 * * *", `"0 0 9 * * *" has 6 fields: seconds and years are not taken, write minute, hour, day of month, month, day of week`},
		// time zones: the library panics on the first two and silently takes UTC for the third
		{"TZ=UTC", `"TZ=UTC" sets a time zone: use the timezone key`},
		{"CRON_TZ=0", `"CRON_TZ=0" sets a time zone: use the timezone key`},
		{"TZ= 0 9 * * *", `"TZ= 0 9 * * *" sets a time zone: use the timezone key`},
		{"CRON_TZ=Asia/Tokyo\t0 9 * * *", `"CRON_TZ=Asia/Tokyo\t0 9 * * *" sets a time zone: use the timezone key`},
		// never
		{"0 9 30 2 *", `"0 9 30 2 *" never runs: no month that it names has such a day`},
		{"0 9 31 4,6,9,11 *", `"0 9 31 4,6,9,11 *" never runs: no month that it names has such a day`},
		// lists and ranges that the library would read in another sense
		{"0 9 , * *", `day of month ",": empty list element`},
		{"0,,30 9 * * *", `minute "0,,30": empty list element`},
		{"0 9, * * *", `hour "9,": empty list element`},
		{"*-5 9 * * *", `minute "*-5": "*-5" mixes * with a range: write the first and the last value`},
		{"0 9 ?-3 * *", `day of month "?-3": "?-3" mixes ? with a range: write the first and the last value`},
		{"0 9 * * fri-mon", `day of week "fri-mon": range "fri-mon" runs backwards: write it as two, joined by a comma`},
		{"0 9 * * 7", `day of week "7": 7 is not a day of the week here: Sunday is 0 or sun`},
		{"0 9 * * 1-7", `day of week "1-7": 7 is not a day of the week here: Sunday is 0 or sun`},
		{"0 9 * * fr", `day of week "fr": "fr" is not a number from 0 to 6 nor one of sun mon tue wed thu fri sat`},
		{"0 9 L * *", `day of month "L": "L" is not a number from 1 to 31`},
		{"0 9 * un *", `month "un": "un" is not a number from 1 to 12 nor one of jan feb mar apr may jun jul aug sep oct nov dec`},
		{"60 9 * * *", `minute "60": 60 is not from 0 to 59`},
		{"0 24 * * *", `hour "24": 24 is not from 0 to 23`},
		{"0 9 0 * *", `day of month "0": 0 is not from 1 to 31`},
		{"-5 9 * * *", `minute "-5": "" is not a number from 0 to 59`},
		{"+5 9 * * *", `minute "+5": "+5" is not a number from 0 to 59`},
		{"1-2-3 9 * * *", `minute "1-2-3": "2-3" is not a number from 0 to 59`},
		// steps
		{"*/0 9 * * *", `minute "*/0": step "0" is not a whole number from 1 to 59`},
		{"*/90 9 * * *", `minute "*/90": step "90" is not a whole number from 1 to 59`},
		{"*/5/5 9 * * *", `minute "*/5/5": step "5/5" is not a whole number from 1 to 59`},
		{"*/ 9 * * *", `minute "*/": step "" is not a whole number from 1 to 59`},
		// words
		{"@Daily", `"@Daily" is written in small letters: @daily`},
		{"@reboot", `"@reboot" is not known: write five fields, @every with a duration, or one of ` + strings.Join(descriptors, ", ")},
		{"@every", `@every "" is not a duration: write hours and minutes, such as 90m or 24h`},
		{"@every 1d", `@every "1d" is not a duration: write hours and minutes, such as 90m or 24h`},
		{"@every -5m", `@every -5m is under the shortest interval, 1m`},
		{"@every 500ms", `@every 500ms is under the shortest interval, 1m`},
		{"@every 59s", `@every 59s is under the shortest interval, 1m`},
		{"@every 90.5s", `@every 90.5s has a part of a second`},
		{"@everyday", `"@everyday" is not known: write five fields, @every with a duration, or one of ` + strings.Join(descriptors, ", ")},
	}
	for _, tt := range tests {
		err := Check(tt.spec)
		if err == nil {
			t.Errorf("Check(%q) takes it, want %s", tt.spec, tt.want)
		} else if err.Error() != tt.want {
			t.Errorf("Check(%q)\n got %s\nwant %s", tt.spec, err, tt.want)
		}
	}
}

func TestWarning(t *testing.T) {
	tests := []struct {
		spec string
		want bool
	}{
		{"0 9 1 * mon", true},
		{"0 9 */2 * mon", true}, // */2 counts as restricted
		{"0 9 1 * *", false},
		{"0 9 * * mon", false},
		{"0 9 */1 * mon", false},
		{"0 9 ? * mon", false},
		{"@monthly", false},
		{"@every 2h", false},
	}
	for _, tt := range tests {
		if got := parse(t, tt.spec, nil).Warning() != ""; got != tt.want {
			t.Errorf("%q warns: %v, want %v", tt.spec, got, tt.want)
		}
	}
}

// Days of 2026 read off a printed calendar: 1 June is a Monday.
func TestUpcoming(t *testing.T) {
	from := time.Date(2026, 6, 5, 20, 50, 30, 0, time.UTC)
	check := func(spec string, want ...string) {
		t.Helper()
		runs := parse(t, spec, time.UTC).Upcoming(from, len(want))
		var got []string
		for _, r := range runs {
			got = append(got, r.Format("Mon 02 15:04"))
		}
		if strings.Join(got, ", ") != strings.Join(want, ", ") {
			t.Errorf("%q: %s, want %s", spec, got, want)
		}
	}
	check("*/10 17-20 * * mon-fri", "Mon 08 17:00", "Mon 08 17:10", "Mon 08 17:20")
	check("0 7 * * MON", "Mon 08 07:00", "Mon 15 07:00")
	check("5/20 21 * * *", "Fri 05 21:05", "Fri 05 21:25", "Fri 05 21:45", "Sat 06 21:05")
	check("0 9 8 * tue", "Mon 08 09:00", "Tue 09 09:00", "Tue 16 09:00")
	check("@every 1h", "Fri 05 21:00", "Fri 05 22:00")
}

func TestZeroScheduleNeverRuns(t *testing.T) {
	if got := (Schedule{}).Next(time.Date(2026, 1, 1, 0, 0, 0, 0, time.UTC)); !got.IsZero() {
		t.Errorf("runs at %s", got)
	}
	if got := (Schedule{}).Upcoming(time.Time{}, 3); got != nil {
		t.Errorf("runs at %s", got)
	}
}

// Whatever is taken has runs, each after the one before it and on a whole second.
func FuzzParse(f *testing.F) {
	for _, s := range []string{"*/10 17-20 * * mon-fri", "@every 90m", "0 9 29 2 *", "TZ=UTC", "0 9 , * *", "?/2 * 1-3/2 jan sun"} {
		f.Add(s)
	}
	from := time.Date(2026, 3, 29, 0, 30, 0, 0, time.UTC)
	london := zone(f, "Europe/London")
	f.Fuzz(func(t *testing.T, spec string) {
		s, err := Parse(spec, london)
		if err != nil {
			return
		}
		last := from
		for _, run := range s.Upcoming(from, 5) {
			if !run.After(last) || run.Nanosecond() != 0 {
				t.Fatalf("%q: %s follows %s", spec, run, last)
			}
			last = run
		}
		if last.Equal(from) {
			t.Fatalf("%q never runs", spec)
		}
	})
}
