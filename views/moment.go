package views

// Moment is an instant as pages show it. Its words are those of UTC, or an age: where
// scripts run, the times of day become the reader's own.
type Moment struct {
	At    string // RFC 3339
	Clock string // "14:02 UTC", with the date before it where that is another day
	Age   string // "3 hours ago"
}
