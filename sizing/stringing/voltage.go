package stringing

import (
	"rimeline/sizing/design"
	"rimeline/sizing/quantity"
	"rimeline/sizing/rulebook"
	"rimeline/sizing/working"
)

// plane is one roof plane with what a module on it gives.
type plane struct {
	index, module int
	datasheet     *design.Module
	terms         *design.ModuleTerms

	vocCold   *working.Term // V, one module, by the chosen method, with the allowance
	coldSteps []*working.Term
	other     *working.Term // the same by the method not chosen; nil where it cannot be had
	otherMore []*working.Term
	row       *rulebook.ColdFactor // the table's row at the coldest temperature; nil where the table does not hold

	cellHot *working.Term // °C, cell temperature at the hot design point
	vmpHot  *working.Term // V, with the allowance
	vocHot  *working.Term // V
	vmpCold *working.Term // V
	hotStep *working.Term // vmpHot before the allowance; nil where there is none
	slope   slopeOfVmp
	steeper *working.Term // V, hot, with the slope made steeper by the current coefficient; nil unless the slope is a stand-in
	fallsC  *working.Term // V/°C, the Voc coefficient

	// What conditions compare, by the module; the string's count comes on top.
	heldHot, heldSteeper, heldCold held
	colderVoc                      *working.Term // V, by coefficient at the coldest temperature less the wished headroom

	isc, imp *working.Term // A, with current gain, and the highest marked Isc
}

func (a *Array) newPlane(i int) plane {
	d, p := a.Design, &a.Design.Planes[i]
	v := plane{index: i}
	for k := range d.Modules {
		if d.Modules[k].ID == p.Module {
			v.module = k
		}
	}
	v.datasheet, v.terms = &d.Modules[v.module], &a.terms.Modules[v.module]
	a.setCold(&v)
	a.setHot(&v)
	a.setCurrents(&v)
	return v
}

// at25 returns (t − 25), the distance of a temperature from STC.
func at25(t *working.Term) *working.Term { return t.Minus(working.Whole(25)) }

// moved returns a module's rated voltage moved by a coefficient over a distance
// from 25 °C:
//
//	V × (1 + c ÷ 100 × ΔT)  for c in %/°C,  V + c × ΔT  for c in V/°C.
func moved(rated *working.Term, c *design.CoefficientTerm, distance *working.Term) *working.Term {
	if c.Unit == design.PercentPerC {
		return rated.Times(working.Whole(1).Plus(c.Term.Over(working.Whole(100)).Times(distance)))
	}
	return rated.Plus(c.PerC(rated).Times(distance))
}

// setCold finds a module's open-circuit voltage on the coldest morning.
//
// By coefficient, NEC 690.7(A)(1): Voc moved by the maker's coefficient to the
// coldest temperature, never less than at STC. By table, NEC 690.7(A)(2): Voc times
// the factor of the row; crystalline silicon only, down to −40 °C. Both are computed
// wherever both can be had. The linear coefficient is on the safe side of the
// diode model by up to 0.23 % down to −40 °C (De Soto et al. 2006, computed).
func (a *Array) setCold(v *plane) {
	v.fallsC = v.terms.VocCoeff.PerC(v.terms.Voc)
	colder := a.terms.Coldest.Minus(a.terms.Headroom)
	v.colderVoc = times(moved(v.terms.Voc, v.terms.VocCoeff, at25(colder)), a.coldAllowance())
	byCoefficient, coefficientSteps := a.allowed("Voc,cold"+v.terms.Suffix, "Voc,Tcold"+v.terms.Suffix, a.coldByCoefficient(v, a.terms.Coldest))
	var byTable *working.Term
	var tableSteps []*working.Term
	if row, ok := a.Book.ColdFactorAt(a.terms.Coldest.Value()); ok && v.datasheet.CrystallineSilicon() {
		v.row = &row
		byTable, tableSteps = a.allowed("Voc,cold"+v.terms.Suffix, "Voc,Tcold"+v.terms.Suffix, v.coldByRow(row))
	}
	coefficientSteps = append([]*working.Term{a.terms.Coldest}, coefficientSteps...)
	tableSteps = append([]*working.Term{a.terms.Coldest}, tableSteps...)
	if a.byTable() {
		v.vocCold, v.coldSteps, v.other, v.otherMore = byTable, tableSteps, byCoefficient, coefficientSteps
	} else {
		v.vocCold, v.coldSteps, v.other, v.otherMore = byCoefficient, coefficientSteps, byTable, tableSteps
	}
}

func (a *Array) byTable() bool { return a.Design.VoltageMethod == design.MethodTable }

func (a *Array) coldByCoefficient(v *plane, at *working.Term) *working.Term {
	cold := moved(v.terms.Voc, v.terms.VocCoeff, at25(at))
	if at.Value().Less(quantity.Int(25)) {
		return cold
	}
	return working.MaxOf(v.terms.Voc, cold)
}

func (v *plane) coldByRow(row rulebook.ColdFactor) *working.Term {
	return v.terms.Voc.Times(working.Looked("Fcold", row.Factor))
}

// allowed adds the cold allowance to a voltage, as a line of its own where one is stated.
func (a *Array) allowed(symbol, before string, cold *working.Term) (*working.Term, []*working.Term) {
	if a.terms.ColdPct == nil {
		named := working.Named(symbol, "V", cold)
		return named, []*working.Term{named}
	}
	bare := working.Named(before, "V", cold)
	named := working.Named(symbol, "V", bare.Times(a.coldAllowance()))
	return named, []*working.Term{bare, named}
}

// coldAllowance returns 1 + acold ÷ 100; nil where none is stated.
func (a *Array) coldAllowance() *working.Term {
	if a.terms.ColdPct == nil {
		return nil
	}
	return working.Whole(1).Plus(a.terms.ColdPct.Over(working.Whole(100)))
}

// slopeOfVmp is the change of a module's operating voltage per °C, and what it was taken from.
type slopeOfVmp struct {
	perC *working.Term // V/°C

	// scaled ÷ scale is perC. Both are free of division by an input, which conditions
	// need for their turning points; scale is nil for 1.
	scaled, scale *working.Term

	standIn bool // not the maker's own for Vmp
}

// newSlope returns the slope of a module's operating voltage: by the Vmp
// coefficient; if absent by the power coefficient as a percentage, on Vmp; if
// absent too by the Voc coefficient in V/°C, never its percentage. Both stand-ins
// are optimistic by about the current coefficient. Common practice; Voc and Vmp
// move about alike in V/°C (King et al., SAND2004-3535).
func newSlope(m *design.ModuleTerms) slopeOfVmp {
	switch {
	case m.VmpCoeff != nil:
		perC := m.VmpCoeff.PerC(m.Vmp)
		return slopeOfVmp{perC: perC, scaled: perC}
	case m.PmaxCoeff != nil && m.PmaxCoeff.Unit == design.PercentPerC:
		perC := m.PmaxCoeff.PerC(m.Vmp)
		return slopeOfVmp{perC: perC, scaled: perC, standIn: true}
	case m.PmaxCoeff != nil: // W/°C
		perC := m.PmaxCoeff.Term.Over(m.Pmax).Times(m.Vmp)
		return slopeOfVmp{perC: perC, scaled: m.PmaxCoeff.Term.Times(m.Vmp), scale: m.Pmax, standIn: true}
	}
	perC := m.VocCoeff.PerC(m.Voc)
	return slopeOfVmp{perC: perC, scaled: perC, standIn: true}
}

// operating returns one module's operating voltage a distance from 25 °C.
func (v *plane) operating(distance *working.Term) *working.Term {
	vmp, m := v.terms.Vmp, v.terms
	switch {
	case m.VmpCoeff != nil:
		return moved(vmp, m.VmpCoeff, distance)
	case m.PmaxCoeff != nil && m.PmaxCoeff.Unit == design.PercentPerC:
		return moved(vmp, m.PmaxCoeff, distance)
	}
	return vmp.Plus(v.slope.perC.Times(distance))
}

// held is a voltage with the scale that both sides of its comparison are multiplied
// by, so that no input stands below the line; scale is nil for 1.
type held struct{ voltage, scale *working.Term }

// below returns the condition that n × the voltage is below a limit.
func (h held) below(limit, n *working.Term) *working.Condition {
	return working.Exceeds(times(limit, h.scale), n.Times(h.voltage))
}

// exceeds returns the condition that n × the voltage exceeds a limit.
func (h held) exceeds(n, limit *working.Term) *working.Condition {
	return working.Exceeds(n.Times(h.voltage), times(limit, h.scale))
}

// scaledOperating returns (Vmp + slope × distance) × scale.
func scaledOperating(vmp *working.Term, slope slopeOfVmp, distance *working.Term) held {
	return held{times(vmp, slope.scale).Plus(slope.scaled.Times(distance)), slope.scale}
}

// less returns the slope less a loss, scaled by both scales.
func (s slopeOfVmp) less(loss slopeOfVmp) slopeOfVmp {
	scale := s.scale
	if loss.scale != nil {
		scale = times(loss.scale, s.scale)
	}
	return slopeOfVmp{
		perC:   s.perC.Minus(loss.perC),
		scaled: times(s.scaled, loss.scale).Minus(times(loss.scaled, s.scale)),
		scale:  scale,
	}
}

// setHot finds a module's voltages at cell temperature Thot + rise, and its
// operating voltage on the coldest morning. The hot allowance (ageing, mismatch,
// wire) is taken off the hot operating voltage alone.
func (a *Array) setHot(v *plane) {
	v.slope = newSlope(v.terms)
	v.cellHot = working.Named("Tcell", "°C", a.terms.Hottest.Plus(a.terms.Planes[v.index].Rise))
	hot := v.operating(at25(v.cellHot))
	if a.terms.HotPct == nil {
		v.vmpHot = working.Named("Vmp,hot", "V", hot)
	} else {
		v.hotStep = working.Named("Vmp,Tcell", "V", hot)
		v.vmpHot = working.Named("Vmp,hot", "V", v.hotStep.Times(a.hotAllowance()))
	}
	v.vocHot = working.Named("Voc,hot", "V", moved(v.terms.Voc, v.terms.VocCoeff, at25(v.cellHot)))
	v.vmpCold = working.Named("Vmp,cold", "V", v.operating(at25(a.terms.Coldest)))

	v.heldHot = scaledOperating(v.terms.Vmp, v.slope, at25(v.cellHot))
	v.heldHot.voltage = times(v.heldHot.voltage, a.hotAllowance())
	v.heldCold = scaledOperating(v.terms.Vmp, v.slope, at25(a.terms.Coldest))
	if v.slope.standIn {
		slope := v.slope.less(v.currentLoss())
		v.heldSteeper = scaledOperating(v.terms.Vmp, slope, at25(v.cellHot))
		v.heldSteeper.voltage = times(v.heldSteeper.voltage, a.hotAllowance())
		v.steeper = times(v.terms.Vmp.Plus(slope.perC.Times(at25(v.cellHot))), a.hotAllowance())
	}
}

// defaultAlphaPct stands for a current coefficient that is not stated, in %/°C. Common practice for crystalline silicon.
var defaultAlphaPct = quantity.Ratio(5, 100)

// currentLoss returns α × Vmp ÷ 100, the part of the slope that a stand-in leaves
// out: 0.05 %/°C where the current coefficient is not stated, 0 where it is negative.
func (v *plane) currentLoss() slopeOfVmp {
	vmp, c := v.terms.Vmp, v.terms.IscCoeff
	switch {
	case c == nil:
		perC := working.Looked("α", defaultAlphaPct).Times(vmp).Over(working.Whole(100))
		return slopeOfVmp{perC: perC, scaled: perC}
	case c.Term.Value().Sign() < 0:
		return slopeOfVmp{perC: working.Whole(0), scaled: working.Whole(0)}
	case c.IsPercent():
		perC := c.Term.Times(vmp).Over(working.Whole(100))
		return slopeOfVmp{perC: perC, scaled: perC}
	}
	perC := c.PerC(v.terms.Isc)
	return slopeOfVmp{perC: perC.Over(v.terms.Isc).Times(vmp), scaled: perC.Times(vmp), scale: v.terms.Isc}
}

// hotAllowance returns 1 − ahot ÷ 100; nil where none is stated.
func (a *Array) hotAllowance() *working.Term {
	if a.terms.HotPct == nil {
		return nil
	}
	return working.Whole(1).Minus(a.terms.HotPct.Over(working.Whole(100)))
}

// times returns t × u, or t where u is nil, which stands for 1.
func times(t, u *working.Term) *working.Term {
	if u == nil {
		return t
	}
	return t.Times(u)
}

// hotSteps returns the terms whose steps show vmpHot.
func (a *Array) hotSteps(v *plane) []*working.Term {
	return []*working.Term{a.terms.Hottest, a.terms.Planes[v.index].Rise, v.cellHot, v.hotStep, v.vmpHot}
}

// setCurrents finds a module's currents on the plane: Isc and Imp with the plane's
// gain, and for Isc the highest value marked on the module if that is greater.
func (a *Array) setCurrents(v *plane) {
	v.isc, v.imp = v.terms.Isc, v.terms.Imp
	suffix := a.terms.Planes[v.index].Suffix
	if gain := a.terms.Planes[v.index].Gain; gain != nil {
		factor := working.Whole(1).Plus(gain.Over(working.Whole(100)))
		v.isc = working.Named("Isc,gain"+suffix, "A", v.isc.Times(factor))
		v.imp = working.Named("Imp,gain"+suffix, "A", v.imp.Times(factor))
	}
	if marked := v.terms.IscMarked; marked != nil {
		v.isc = working.Named("Isc,gain"+suffix, "A", working.MaxOf(unnamed(v.isc), marked))
	}
}

// unnamed returns the formula of a named term, any other term as it is.
func unnamed(t *working.Term) *working.Term {
	if t.IsNamed() {
		return t.Formula()
	}
	return t
}
