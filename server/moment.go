package server

import (
	"fmt"
	"time"

	"rimeline/views"
)

// moment tells an instant to someone who reads the page now.
func moment(at, now time.Time) views.Moment {
	at, now = at.UTC(), now.UTC()
	clock := "15:04 UTC"
	if at.Format(time.DateOnly) != now.Format(time.DateOnly) {
		clock = "2006-01-02 15:04 UTC"
	}
	return views.Moment{At: at.Format(time.RFC3339), Clock: at.Format(clock), Age: age(now.Sub(at), at)}
}

// age says how long ago something was. The clocks of the database and of this machine
// may differ a little, so that it may seem to be to come.
func age(ago time.Duration, at time.Time) string {
	switch {
	case ago < 45*time.Second:
		return "just now"
	case ago < 90*time.Minute:
		return agoIn(ago, time.Minute, "minute")
	case ago < 36*time.Hour:
		return agoIn(ago, time.Hour, "hour")
	case ago < 45*24*time.Hour:
		return agoIn(ago, 24*time.Hour, "day")
	}
	return "on " + at.Format(time.DateOnly)
}

func agoIn(ago, unit time.Duration, name string) string {
	return fmt.Sprintf("%s ago", counted(max(1, int(ago.Round(unit)/unit)), name))
}
