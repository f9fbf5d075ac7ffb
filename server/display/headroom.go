package display

import "rimeline/sizing/quantity"

// muchHeadroomC is the headroom, in °C, above which a list gives no number: it would
// be a temperature that no site has ever had, or one below absolute zero.
const muchHeadroomC = 100

// Headroom tells a least headroom as lists show it, rounded down; "" where none is known.
func Headroom(c *quantity.Exact) string {
	switch {
	case c == nil:
		return ""
	case c.Cmp(quantity.Int(muchHeadroomC)) > 0:
		return "over " + withUnit("100", "°C")
	}
	return celsius(*c, quantity.Down)
}
