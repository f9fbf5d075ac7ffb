package working

import "unicode/utf8"

const hexDigits = "0123456789abcdef"

// AppendJSONString appends s as a JSON string (RFC 8259, section 7) with as few
// escapes as the grammar allows, so that the same text is always the same bytes.
// A byte that is not UTF-8 becomes U+FFFD.
func AppendJSONString(dst []byte, s string) []byte {
	dst = append(dst, '"')
	done := 0 // s[:done] is written
	for i := 0; i < len(s); {
		c := s[i]
		if c >= utf8.RuneSelf {
			r, size := utf8.DecodeRuneInString(s[i:])
			if r == utf8.RuneError && size == 1 {
				dst = append(append(dst, s[done:i]...), "\uFFFD"...)
				done = i + 1
			}
			i += size
			continue
		}
		if c >= ' ' && c != '"' && c != '\\' {
			i++
			continue
		}
		dst = append(append(dst, s[done:i]...), '\\')
		switch c {
		case '"', '\\':
			dst = append(dst, c)
		case '\b':
			dst = append(dst, 'b')
		case '\t':
			dst = append(dst, 't')
		case '\n':
			dst = append(dst, 'n')
		case '\f':
			dst = append(dst, 'f')
		case '\r':
			dst = append(dst, 'r')
		default:
			dst = append(dst, 'u', '0', '0', hexDigits[c>>4], hexDigits[c&0xF])
		}
		i++
		done = i
	}
	dst = append(dst, s[done:]...)
	return append(dst, '"')
}
