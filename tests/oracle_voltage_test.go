package tests

import "math/big"

// circuit is one plane's module seen from one tracker: what a string of it is worth.
type circuit struct {
	d        *oracleDesign
	module   *oracleModule
	plane    *oraclePlane
	inverter *oracleInverter
	tracker  *oracleTracker
}

// cellC is the cell temperature at the hot design point.
func (c *circuit) cellC() *big.Rat {
	return plus(c.d.Site.Hottest.Rat, c.plane.HotCellRise.Rat)
}

func (c *circuit) crystalline() bool {
	return c.module.Technology == "mono-si" || c.module.Technology == "multi-si"
}

// The rows of NEC Table 690.7(A): each reaches from its lower bound up to the
// bound of the row before it. At 25 °C and above the factor is 1.
var coldRows = []struct{ lowerBoundC, factor *big.Rat }{
	{rat("25"), rat("1.00")},
	{rat("20"), rat("1.02")}, {rat("15"), rat("1.04")}, {rat("10"), rat("1.06")}, {rat("5"), rat("1.08")},
	{rat("0"), rat("1.10")}, {rat("-5"), rat("1.12")}, {rat("-10"), rat("1.14")}, {rat("-15"), rat("1.16")},
	{rat("-20"), rat("1.18")}, {rat("-25"), rat("1.20")}, {rat("-30"), rat("1.21")}, {rat("-35"), rat("1.23")},
	{rat("-40"), rat("1.25")},
}

// vocColdBy is one module's cold open-circuit voltage by a method, nil where the
// method cannot be had: the table is for crystalline silicon down to −40 °C.
func (c *circuit) vocColdBy(method string) *big.Rat {
	coldest := c.d.Site.Coldest.Rat
	var voc *big.Rat
	switch method {
	case "coefficient":
		slope := c.module.VocCoeff.perC(c.module.Voc.Rat)
		voc = larger(c.module.Voc.Rat, plus(c.module.Voc.Rat, times(slope, minus(coldest, stcC))))
	case "table":
		if !c.crystalline() {
			return nil
		}
		for _, row := range coldRows {
			if !exceeds(row.lowerBoundC, coldest) {
				voc = times(c.module.Voc.Rat, row.factor)
				break
			}
		}
	}
	if voc == nil {
		return nil
	}
	return onTop(voc, c.d.Allowances.ColdVoltage.orElse("0"))
}

func (c *circuit) method() string {
	if c.d.VoltageMethod == "" {
		return "coefficient"
	}
	return c.d.VoltageMethod
}

func (c *circuit) vocCold() *big.Rat { return c.vocColdBy(c.method()) }

func (c *circuit) otherVocCold() *big.Rat {
	if c.method() == "table" {
		return c.vocColdBy("coefficient")
	}
	return c.vocColdBy("table")
}

// ceilingMet is the temperature at which n modules would meet the ceiling by the
// method chosen; by table the lower bound of the last row that fits, nil where
// every row fits or none does (then noneFits).
func (c *circuit) ceilingMet(n, ceiling *big.Rat) (at *big.Rat, noneFits bool) {
	cold := c.d.Allowances.ColdVoltage.orElse("0")
	if c.method() == "coefficient" {
		slope := c.module.VocCoeff.perC(c.module.Voc.Rat)
		each := over(ceiling, onTop(n, cold))
		return plus(stcC, over(minus(each, c.module.Voc.Rat), slope)), false
	}
	for i, row := range coldRows {
		if exceeds(times(n, onTop(times(c.module.Voc.Rat, row.factor), cold)), ceiling) {
			if i == 0 {
				return nil, true
			}
			return coldRows[i-1].lowerBoundC, false
		}
	}
	return nil, false
}

// ceiling is the lowest voltage limit and where it comes from.
func (c *circuit) ceiling() (v *big.Rat, from string) {
	v, from = c.inverter.MaxDCVoltage.Rat, "inverter"
	lower := func(x *big.Rat, name string) {
		if exceeds(v, x) {
			v, from = x, name
		}
	}
	lower(c.module.MaxSystemVoltage.Rat, "module")
	if c.d.Rulebook != "iec-62548-1" {
		lower(map[string]*big.Rat{
			"one-or-two-family-dwelling": rat("600"),
			"other-building":             rat("1000"),
			"ground-mounted":             rat("1500"),
		}[c.d.Site.Structure], "structure")
	}
	for _, o := range c.d.OtherLimits {
		lower(o.MaxVoltage.Rat, o.Name)
	}
	return v, from
}

// operatingSlope is the slope of the operating voltage in V/°C, and whether it
// stands in for a coefficient that the datasheet does not state.
func (c *circuit) operatingSlope() (vPerC *big.Rat, standIn bool) {
	m := c.module
	switch {
	case m.VmpCoeff.stated():
		return m.VmpCoeff.perC(m.Vmp.Rat), false
	case m.PmaxCoeff.stated():
		return over(times(m.PmaxCoeff.percent(m.Pmax.Rat), m.Vmp.Rat), hundred), true
	default:
		return m.VocCoeff.perC(m.Voc.Rat), true
	}
}

// operatingAt is one module's operating voltage at a cell temperature.
func (c *circuit) operatingAt(cellC *big.Rat) *big.Rat {
	slope, _ := c.operatingSlope()
	return plus(c.module.Vmp.Rat, times(slope, minus(cellC, stcC)))
}

func (c *circuit) lessHotAllowance(v *big.Rat) *big.Rat {
	return onTop(v, new(big.Rat).Neg(c.d.Allowances.HotVoltage.orElse("0")))
}

func (c *circuit) vmpHot() *big.Rat { return c.lessHotAllowance(c.operatingAt(c.cellC())) }

// vmpHotSteeper is the second value that a minimum must meet where the slope is a
// stand-in: steeper by the current coefficient. nil where there is none.
func (c *circuit) vmpHotSteeper() *big.Rat {
	slope, standIn := c.operatingSlope()
	if !standIn || !exceeds(c.cellC(), stcC) {
		return nil
	}
	alpha := rat("0.05") // %/°C
	if c.module.IscCoeff.stated() {
		alpha = larger(zero, c.module.IscCoeff.percent(c.module.Isc.Rat))
	}
	slope = minus(slope, over(times(alpha, c.module.Vmp.Rat), hundred))
	return c.lessHotAllowance(plus(c.module.Vmp.Rat, times(slope, minus(c.cellC(), stcC))))
}

// vocHot is one module's open-circuit voltage at the hot cell temperature.
func (c *circuit) vocHot() *big.Rat {
	slope := c.module.VocCoeff.perC(c.module.Voc.Rat)
	return plus(c.module.Voc.Rat, times(slope, minus(c.cellC(), stcC)))
}

// iscWithGain is one string's short-circuit current with the plane's gain, or the
// marked maximum where that is greater.
func (c *circuit) iscWithGain() *big.Rat {
	isc := onTop(c.module.Isc.Rat, c.plane.CurrentGain.orElse("0"))
	if c.module.IscMarkedMax.Rat != nil {
		isc = larger(isc, c.module.IscMarkedMax.Rat)
	}
	return isc
}

func (c *circuit) impWithGain() *big.Rat {
	return onTop(c.module.Imp.Rat, c.plane.CurrentGain.orElse("0"))
}

var (
	maximumFactor = rat("1.25")   // irradiance above 1000 W/m²: maximum current
	fuseFactor    = rat("1.5625") // 1.25 × 1.25: least fuse rating
)

func (c *circuit) iscMaximum() *big.Rat { return times(c.iscWithGain(), maximumFactor) }

// iscByBasis is one string's current as it is held against a tracker's short-circuit limit.
func (c *circuit) iscByBasis() *big.Rat {
	if c.d.ShortCircuitBasis == "rated" {
		return c.iscWithGain()
	}
	return c.iscMaximum()
}

// limits is the row of limits[] for this plane and tracker.
func (c *circuit) limits() oracleLimits {
	row := oracleLimits{plane: c.plane.ID, inverter: c.inverter.ID, tracker: c.tracker.ID}
	row.ceiling, row.ceilingFrom = c.ceiling()
	row.vocCold, row.vmpHot = c.vocCold(), c.vmpHot()
	row.maxModules = roundDown(over(row.ceiling, row.vocCold))
	if positive(row.vmpHot) {
		row.minModules = roundUp(over(c.tracker.MPPTMin.Rat, row.vmpHot))
	}
	if start, hot := c.inverter.StartVoltage.Rat, c.vocHot(); start != nil && positive(hot) {
		row.minStart = roundUp(over(start, hot))
	}

	row.maxString, row.maxStringsFrom = c.tracker.Inputs.Rat, "inputs"
	each := c.iscByBasis()
	if limit := c.tracker.MaxShortCircuit.Rat; limit == nil {
		row.maxStringsFrom = "inputs-unconfirmed"
	} else if most := roundDown(over(limit, each)); exceeds(row.maxString, most) {
		row.maxString, row.maxStringsFrom = most, "short-circuit"
	}
	if limit := c.tracker.MaxShortCircuitAnInput.Rat; limit != nil && exceeds(each, limit) {
		row.maxString, row.maxStringsFrom = zero, "short-circuit"
	}
	return row
}
