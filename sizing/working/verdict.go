package working

import "fmt"

// Verdict is the outcome of a check. The order of the constants is from best to
// worst, so that the worst of several is their maximum.
type Verdict uint8

const (
	Within      Verdict = iota // judged, and fits
	Caution                    // fits, but someone must decide
	Unconfirmed                // an input that the check needs is missing, doubtful or outside a rule's validity
	Outside                    // a limit is broken
)

var verdictWords = [...]string{"within", "caution", "unconfirmed", "outside"}

func (v Verdict) String() string {
	if int(v) < len(verdictWords) {
		return verdictWords[v]
	}
	return fmt.Sprintf("Verdict(%d)", uint8(v))
}

// Worst returns the worst of the verdicts, [Within] if there are none.
func Worst(verdicts ...Verdict) Verdict {
	worst := Within
	for _, v := range verdicts {
		worst = max(worst, v)
	}
	return worst
}
