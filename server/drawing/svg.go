package drawing

import (
	"math"
	"strconv"
	"strings"
)

// SVG returns the drawing as one svg element. Ids inside begin with id, which must
// be an XML name of its own on the page. All ink is currentColor and all paper is
// the class "paper", so that a page can turn both.
func (d *Drawing) SVG(id string) string {
	dst := make([]byte, 0, 8<<10)
	dst = append(dst, `<svg xmlns="http://www.w3.org/2000/svg" class="drawing" role="img" viewBox="0 0 `...)
	dst = appendMM(dst, d.WidthMM)
	dst = append(dst, ' ')
	dst = appendMM(dst, d.HeightMM)
	dst = append(dst, `" aria-labelledby="`+id+`-title" aria-describedby="`+id+`-desc">`...)
	dst = append(dst, `<title id="`+id+`-title">`...)
	dst = appendEscaped(dst, d.Title)
	dst = append(dst, `</title><desc id="`+id+`-desc">`...)
	dst = appendEscaped(dst, d.Desc)
	dst = append(dst, `</desc>`...)
	for _, item := range d.Items {
		dst = item.appendSVG(dst)
	}
	return string(append(dst, `</svg>`...))
}

func (p Path) appendSVG(dst []byte) []byte {
	dst = append(dst, `<path`...)
	dst = appendClass(dst, p.Role)
	dst = append(dst, ` fill="none" stroke="currentColor"`...)
	dst = appendAttribute(dst, "stroke-width", p.Pen.WidthMM)
	if p.Pen.Shade < 1 {
		dst = appendAttribute(dst, "stroke-opacity", p.Pen.Shade)
	}
	if len(p.Pen.DashMM) > 0 {
		dst = append(dst, ` stroke-dasharray="`...)
		for i, length := range p.Pen.DashMM {
			if i > 0 {
				dst = append(dst, ' ')
			}
			dst = appendMM(dst, length)
		}
		dst = append(dst, '"')
	}
	if p.Pen.Round {
		dst = append(dst, ` stroke-linecap="round"`...)
	}
	dst = append(dst, ` stroke-linejoin="round" d="`...)
	for _, line := range p.Lines {
		for i, at := range line {
			letter := byte('L')
			if i == 0 {
				letter = 'M'
			}
			dst = append(dst, letter)
			dst = appendMM(dst, at.X)
			dst = append(dst, ' ')
			dst = appendMM(dst, at.Y)
		}
	}
	return append(dst, `"/>`...)
}

func (a Area) appendSVG(dst []byte) []byte {
	dst = append(dst, `<rect`...)
	dst = appendClass(dst, a.Role)
	dst = append(dst, ` fill="currentColor"`...)
	dst = appendAttribute(dst, "fill-opacity", a.Shade)
	dst = appendAttribute(dst, "x", a.Box.Min.X)
	dst = appendAttribute(dst, "y", a.Box.Min.Y)
	dst = appendAttribute(dst, "width", a.Box.Max.X-a.Box.Min.X)
	dst = appendAttribute(dst, "height", a.Box.Max.Y-a.Box.Min.Y)
	return append(dst, `/>`...)
}

func (d Dot) appendSVG(dst []byte) []byte {
	dst = append(dst, `<circle`...)
	if d.Ring {
		dst = appendClass(dst, d.Role+" ring")
		dst = append(dst, ` fill="#fff" stroke="currentColor"`...)
		dst = appendAttribute(dst, "stroke-width", d.RadiusMM*0.45)
	} else {
		dst = appendClass(dst, d.Role)
		dst = append(dst, ` fill="currentColor"`...)
	}
	dst = appendAttribute(dst, "cx", d.At.X)
	dst = appendAttribute(dst, "cy", d.At.Y)
	dst = appendAttribute(dst, "r", d.RadiusMM)
	return append(dst, `/>`...)
}

func (t Text) appendSVG(dst []byte) []byte {
	for i, line := range t.Lines {
		dst = append(dst, `<text`...)
		dst = appendClass(dst, t.Role)
		dst = append(dst, ` fill="currentColor"`...)
		dst = appendAttribute(dst, "font-size", t.SizeMM)
		if t.Bold {
			dst = append(dst, ` font-weight="700"`...)
		}
		switch t.Anchor {
		case Middle:
			dst = append(dst, ` text-anchor="middle"`...)
		case End:
			dst = append(dst, ` text-anchor="end"`...)
		}
		dst = appendAttribute(dst, "x", t.At.X)
		dst = appendAttribute(dst, "y", t.At.Y+float64(i)*leading*t.SizeMM)
		dst = append(dst, '>')
		dst = appendEscaped(dst, line)
		dst = append(dst, `</text>`...)
	}
	return dst
}

func appendClass(dst []byte, role string) []byte {
	if role == "" {
		return dst
	}
	dst = append(dst, ` class="`...)
	dst = append(dst, role...)
	return append(dst, '"')
}

func appendAttribute(dst []byte, name string, x float64) []byte {
	dst = append(dst, ' ')
	dst = append(dst, name...)
	dst = append(dst, `="`...)
	dst = appendMM(dst, x)
	return append(dst, '"')
}

// appendMM appends a length to a hundredth of a millimetre, which no eye and no printer tells apart.
func appendMM(dst []byte, x float64) []byte {
	hundredths := int64(math.Round(x * 100))
	if hundredths < 0 {
		dst, hundredths = append(dst, '-'), -hundredths
	}
	dst = strconv.AppendInt(dst, hundredths/100, 10)
	tenths, rest := byte(hundredths/10%10), byte(hundredths%10)
	switch {
	case rest != 0:
		dst = append(dst, '.', '0'+tenths, '0'+rest)
	case tenths != 0:
		dst = append(dst, '.', '0'+tenths)
	}
	return dst
}

var escapes = strings.NewReplacer("&", "&amp;", "<", "&lt;", ">", "&gt;", `"`, "&#34;", "'", "&#39;")

func appendEscaped(dst []byte, s string) []byte { return append(dst, escapes.Replace(s)...) }
