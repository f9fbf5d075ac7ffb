package quantity

import (
	"errors"
	"fmt"
	"strings"
	"unicode"
	"unicode/utf8"
)

// Reading is a number as a person typed or pasted it, understood.
type Reading struct {
	Value  Exact
	Number string // as JSON writes it: ASCII minus, decimal point; otherwise the digits that were typed
	Unit   string // what was typed after the number, without spaces; "" if nothing was
}

// ErrBlank is returned by [Typed] for a text with nothing to see in it.
var ErrBlank = errors.New("nothing is typed")

// AmbiguousError is returned by [Typed] for a text that different people read
// differently. It must be asked, not guessed.
type AmbiguousError struct {
	Readings [2]string // each so that Typed reads it one way only
}

func (e *AmbiguousError) Error() string {
	return fmt.Sprintf("it could be %s or %s; write one of them", e.Readings[0], e.Readings[1])
}

// Typed reads a number as people type it and paste it from datasheets, with or
// without a unit behind it: "−0.27 %/°C", "-0,27", "49.5V", "+45".
//
//   - The minus may be a hyphen, U+2212 or an en dash; pasted text has all of
//     them. An em dash, which datasheets print for "no value", a soft hyphen, of
//     which nobody can say whether it was a minus, and ± are refused.
//   - A point is the decimal point, always. One comma is a decimal comma, except
//     between one to three digits and exactly three: "1,000" is ambiguous;
//     "0,048" is not, for no thousand begins with 0.
//   - Thousands may be set apart by no-break or thin spaces. Other separators of
//     thousands are refused with the number that they seem to mean, an ordinary
//     space between digits as ambiguous: it may have been two columns of a table.
//   - Characters that cannot be seen are passed over.
//
// Typed never drops or turns a sign. The unit is returned as it was typed, but for
// its spaces and look-alikes of °, % and /; whether it is the right one is for the
// caller to say.
func Typed(text string) (Reading, error) {
	t := typed{rest: visible(text)}
	if t.rest == "" {
		return Reading{}, ErrBlank
	}
	number, err := t.number()
	if err != nil {
		return Reading{}, err
	}
	unit, err := t.unit()
	if err != nil {
		return Reading{}, err
	}
	value, err := Parse(number)
	if err != nil {
		return Reading{}, err
	}
	return Reading{value, number, unit}, nil
}

// groupSpace stands for every space that does not break a line or is narrower
// than a word space: those that typesetters put between thousands.
const groupSpace = '\u202F'

// unseen are the joiners, marks and left-to-right embeddings that come along when
// text is copied. Right-to-left ones are not among them: they change what is seen.
const unseen = "\u200B\u200C\u200D\u200E\u200F\u2060\uFEFF\u202A\u202C\u2066\u2068\u2069\uFE0E\uFE0F"

// visible drops what cannot be seen, makes one kind of each kind of space, and trims.
func visible(text string) string {
	text = strings.Map(func(r rune) rune {
		switch {
		case strings.ContainsRune(unseen, r):
			return -1
		case r == '\u00A0', r == '\u202F', '\u2006' <= r && r <= '\u200A', r == '\u205F':
			return groupSpace
		case unicode.IsSpace(r):
			return ' '
		}
		return r
	}, text)
	return strings.TrimFunc(text, isSpace)
}

func isSpace(r rune) bool { return r == ' ' || r == groupSpace }

// typed is a text being read from the left.
type typed struct{ rest string }

func (t *typed) skipSpaces() { t.rest = strings.TrimLeftFunc(t.rest, isSpace) }

func (t *typed) digits() string {
	n := digitRun(t.rest)
	d := t.rest[:n]
	t.rest = t.rest[n:]
	return d
}

// next returns the next character, and steps over it if it is one of set.
func (t *typed) next(set string) (rune, bool) {
	r, size := utf8.DecodeRuneInString(t.rest)
	if size == 0 || r == utf8.RuneError || !strings.ContainsRune(set, r) {
		return r, false
	}
	t.rest = t.rest[size:]
	return r, true
}

const (
	minuses = "-\u2212\u2013\u2010\u2011\u2012\uFE63\uFF0D" // hyphens, true minus, en dash, figure dash
	marks   = ".,"
	groups  = "'’_·˙"
)

var errNoNumber = errors.New("no number stands at its beginning")

// number returns the number at the beginning as JSON writes it.
func (t *typed) number() (string, error) {
	sign := ""
	if _, plus := t.next("+"); !plus {
		if _, minus := t.next(minuses); minus {
			sign = "-"
		}
	}
	t.skipSpaces()
	switch r, _ := utf8.DecodeRuneInString(t.rest); {
	case strings.ContainsRune("\u2014\u2015", r):
		return "", errors.New("a long dash is no minus sign; type the minus of the keyboard")
	case r == '\u00AD':
		return "", errors.New("it holds a soft hyphen, which may have been a minus; type the sign again")
	case r == '±' || r == '∓':
		return "", errors.New("± is no single number")
	case r == '+' || strings.ContainsRune(minuses, r):
		return "", errors.New("it has more than one sign")
	}
	whole, err := t.whole(sign)
	if err != nil {
		return "", err
	}
	fraction := ""
	if mark, ok := t.next(marks); ok {
		fraction = t.digits()
		if whole == "" && fraction == "" {
			return "", errNoNumber
		}
		if fraction == "" {
			return "", errors.New("a digit is missing after the decimal sign")
		}
		if err := t.checkMark(sign, whole, mark, fraction); err != nil {
			return "", err
		}
		fraction = "." + fraction
	} else if whole == "" {
		return "", errNoNumber
	}
	return sign + withoutLeadingZeros(whole) + fraction + t.exponent(), nil
}

func withoutLeadingZeros(whole string) string {
	if trimmed := strings.TrimLeft(whole, "0"); trimmed != "" {
		return trimmed
	}
	return "0"
}

// whole reads the digits before the decimal sign.
func (t *typed) whole(sign string) (string, error) {
	first := t.digits()
	whole := first
	for whole != "" {
		separator, size := utf8.DecodeRuneInString(t.rest)
		n := 0
		if size > 0 && (isSpace(separator) || strings.ContainsRune(groups, separator)) {
			n = digitRun(t.rest[size:])
		}
		if n == 0 {
			break
		}
		group := t.rest[size : size+n]
		switch {
		case len(whole) > MaxDigits:
			return "", ErrTooLong
		case separator == ' ':
			return "", fmt.Errorf("it could be %s%s%s, or two numbers; write it without the space", sign, whole, group)
		case n != 3 || len(first) > 3 || first[0] == '0':
			return "", fmt.Errorf("%s and %s do not make one number; write it without separators", whole, group)
		case separator != groupSpace:
			return "", fmt.Errorf("write the number without %c between the digits: %s%s%s", separator, sign, whole, group)
		}
		whole += group
		t.rest = t.rest[size+n:]
	}
	return whole, nil
}

// checkMark refuses a decimal sign that may be meant to set thousands apart.
func (t *typed) checkMark(sign, whole string, mark rune, fraction string) error {
	if again, more := t.next(marks); more {
		plain := sign + whole + fraction
		switch rest := t.digits(); {
		case len(fraction) != 3 || rest == "" || len(whole) > 3 || whole == "" || whole[0] == '0':
			return fmt.Errorf("%c and %c cannot both be decimal signs", mark, again)
		case again == mark:
			return fmt.Errorf("write the number without %c between the digits: %s%s", mark, plain, rest)
		default:
			return fmt.Errorf("%c and %c are both in it; write %s.%s if that is meant", mark, again, plain, rest)
		}
	}
	if mark == ',' && len(fraction) == 3 && 1 <= len(whole) && len(whole) <= 3 && whole[0] != '0' {
		return &AmbiguousError{[2]string{sign + whole + fraction, sign + whole + "." + fraction}}
	}
	return nil
}

// exponent reads a power of ten in the form of JSON, "" if none follows.
func (t *typed) exponent() string {
	if t.rest == "" || t.rest[0]|0x20 != 'e' {
		return ""
	}
	after := typed{t.rest[1:]}
	sign := ""
	if _, plus := after.next("+"); !plus {
		if _, minus := after.next(minuses); minus {
			sign = "-"
		}
	}
	digits := after.digits()
	if digits == "" {
		return "" // the beginning of a unit
	}
	t.rest = after.rest
	return "e" + sign + digits
}

var lookAlikes = strings.NewReplacer("℃", "°C", "℉", "°F", "º", "°", "˚", "°", "％", "%", "∕", "/", "⁄", "/", " ", "", string(groupSpace), "")

// unit returns what stands behind the number.
func (t *typed) unit() (string, error) {
	t.skipSpaces()
	unit := lookAlikes.Replace(t.rest)
	for _, r := range unit {
		switch {
		case unicode.IsLetter(r), strings.ContainsRune("%°/²", r):
		case unicode.IsDigit(r):
			return "", errors.New("more than one number stands in it")
		default:
			return "", fmt.Errorf("%q after the number is no unit", t.rest)
		}
	}
	return unit, nil
}
