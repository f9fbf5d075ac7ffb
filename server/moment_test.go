package server

import (
	"testing"
	"time"

	"rimeline/views"
)

func TestMoment(t *testing.T) {
	t.Parallel()
	now := time.Date(2026, 8, 2, 0, 30, 0, 0, time.UTC)
	for _, tc := range []struct {
		ago        time.Duration
		clock, age string
	}{
		{-3 * time.Minute, "00:33 UTC", "just now"}, // the other clock is ahead
		{0, "00:30 UTC", "just now"},
		{44 * time.Second, "00:29 UTC", "just now"},
		{46 * time.Second, "00:29 UTC", "1 minute ago"},
		{29 * time.Minute, "00:01 UTC", "29 minutes ago"},
		{31 * time.Minute, "2026-08-01 23:59 UTC", "31 minutes ago"},
		{89 * time.Minute, "2026-08-01 23:01 UTC", "89 minutes ago"},
		{100 * time.Minute, "2026-08-01 22:50 UTC", "2 hours ago"},
		{35 * time.Hour, "2026-07-31 13:30 UTC", "35 hours ago"},
		{37 * time.Hour, "2026-07-31 11:30 UTC", "2 days ago"},
		{44 * 24 * time.Hour, "2026-06-19 00:30 UTC", "44 days ago"},
		{46 * 24 * time.Hour, "2026-06-17 00:30 UTC", "on 2026-06-17"},
	} {
		at := now.Add(-tc.ago)
		want := views.Moment{At: at.Format("2006-01-02T15:04:05Z"), Clock: tc.clock, Age: tc.age}
		if got := moment(at.In(time.FixedZone("", 5*3600)), now.In(time.FixedZone("", -7*3600))); got != want {
			t.Errorf("%s ago: %+v, want %+v", tc.ago, got, want)
		}
	}
}
