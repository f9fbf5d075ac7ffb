package display

import (
	"strings"

	"rimeline/sizing/quantity"
	"rimeline/sizing/working"
)

// reason makes a sentence of the code that says why a verdict is not decided by the
// value alone. An unknown code is still printed.
func (c *composer) reason(k *working.Check, r working.Reason) string {
	switch r.Code {
	case "open-question":
		return "The question about " + c.call(r.Pointer) + " is open; until it is answered this cannot be confirmed."
	case "nothing-strung":
		return "Enter strings to have them judged."
	case "short-circuit-limit-not-stated":
		return "The tracker's short-circuit limit is not stated. Many datasheets leave it out; the manual or the maker has it."
	case "per-input-limit":
		return "One string alone is more than one input takes."
	case "rated-basis":
		return c.ratedBasis(k)
	case "series-fuse-not-stated":
		return "The module's maximum series fuse is not stated; it is printed on the module's label."
	case "string-fuse-too-small":
		return "The stated string fuse is smaller than the least that may be used: it may open in normal service."
	case "string-fuse-above-module":
		return "The stated string fuse is larger than the module's maximum series fuse: it does not protect the module."
	case "fuse-required-none-stated":
		return "A string fuse is required and none is stated."
	case "no-standard-fuse":
		return "No standard fuse lies between the least and the most that may be used. Fewer strings on the tracker is the way out."
	case "not-needed":
		return ""
	case "strings-unequal":
		return "What each string then contributes, and what flows backwards, is not known without their current–voltage curves. Put strings of one length on a tracker."
	case "angle-not-stated":
		return "State tilt and azimuth of every plane on this tracker."
	case "planes-differ":
		return "Equal strings in parallel lose little by it, since their voltages stay close; someone must decide, and the inverter's manual must permit it."
	case "places-left-over":
		return ""
	case "thin-film":
		return "The module is not crystalline silicon: its voltage may be higher in its first weeks of light, and one coefficient may not hold down to the coldest."
	case "elevation-above-2000-m":
		return "The site is above 2000" + nbsp + "m: thin air insulates less, and the inverter's maximum DC voltage may be lower there. Its manual says."
	case "basis-other":
		return "The coldest temperature is of a statistic that is not named. An average winter low is not an extreme."
	case "colder-than-minus-40":
		return "Colder than " + wholeDegrees(-40) + " no table row holds, and a straight coefficient is untested."
	case "other-method-higher":
		return ""
	case "other-method-not-to-be-had":
		return "The table is for crystalline silicon down to " + wholeDegrees(-40) + "."
	case "stand-in-coefficient":
		return c.standIn(k)
	case "start-at-first-light":
		return "At first light a string has about nine tenths of that voltage, which is below the start voltage: the inverter may start late."
	case "gain-not-stated":
		return "State the plane's current gain, or the highest Isc marked on the module."
	}
	s := capital(strings.ReplaceAll(r.Code, "-", " "))
	if r.Pointer != "" {
		s += ": " + c.call(r.Pointer)
	}
	return s + "."
}

func (c *composer) ratedBasis(k *working.Check) string {
	const fits = "Isc itself fits, × 1.25 does not"
	if maximum := stepValue(k, "ΣImax"); maximum != nil && k.Limit != nil {
		return fits + ": " + amperes(*maximum, quantity.Up) + " against " + limitOf(k) + ". Makers and authorities differ on which to compare."
	}
	return fits + ". Makers and authorities differ on which to compare."
}

func (c *composer) standIn(k *working.Check) string {
	const missing = "No Vmp coefficient is stated; what stands in for it is optimistic by about the current coefficient"
	if steeper := stepValue(k, "Vhot,steeper"); steeper != nil {
		return missing + ", with which it comes to " + stringVolts(*steeper, quantity.Down) + "."
	}
	return missing + "."
}
