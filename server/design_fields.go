package server

// inquiry is how one field of the form is asked for.
type inquiry struct {
	name    string // the last part of its JSON Pointer
	label   string
	symbol  string // as datasheets print it
	hint    string
	width   string      // CSS class; "" is w2, a third of the row
	choices [][2]string // value and words, for what is chosen from a list
	long    bool        // several lines
	asked   bool        // the engine may have a question about it
	may     bool        // it may be left empty, and stands among those that may not
}

var (
	rulebookChoices = [][2]string{
		{"", "Choose the edition"},
		{"nec-2017", "NEC 2017"},
		{"nec-2020", "NEC 2020"},
		{"nec-2023", "NEC 2023"},
		{"nec-2026", "NEC 2026"},
		{"iec-62548-1", "IEC 62548-1"},
	}
	structureChoices = [][2]string{
		{"", "Choose the place"},
		{"one-or-two-family-dwelling", "A one- or two-family dwelling"},
		{"other-building", "Another building"},
		{"ground-mounted", "No building at all: ground-mounted"},
	}
	coldestChoices = [][2]string{
		{"", "Choose the statistic"},
		{"annual-extreme-mean-minimum", "Mean of the yearly extremes"},
		{"record-low", "Record low"},
		{"authority-required", "Required by the authority"},
		{"other", "Another one"},
	}
	hottestChoices = [][2]string{
		{"", "Choose the statistic"},
		{"record-high", "Record high"},
		{"cooling-2-percent", "2 % cooling design"},
		{"cooling-0.4-percent", "0.4 % cooling design"},
		{"authority-required", "Required by the authority"},
		{"other", "Another one"},
	}
	technologyChoices = [][2]string{
		{"", "Choose the cells"},
		{"mono-si", "Monocrystalline silicon"},
		{"multi-si", "Multicrystalline silicon"},
		{"cdte", "Cadmium telluride (thin film)"},
		{"cigs", "CIGS (thin film)"},
		{"other", "Another technology"},
	}
	methodChoices = [][2]string{
		{"coefficient", "Datasheet coefficient"},
		{"table", "Table of the code"},
	}
	basisChoices = [][2]string{
		{"maximum", "Isc with gain × 1.25"},
		{"rated", "Isc with gain, as rated"},
	}
	powerChoices = [][2]string{
		{"", "A limit"},
		{"limit", "A limit"},
		{"advice", "Advice only"},
	}
)

var (
	titleInquiry = inquiry{name: "title", label: "Title of the design", width: "w6"}

	siteInquiries = []inquiry{
		{name: "name", label: "Site", width: "w3"},
		{name: "structure", label: "Where DC circuits run", width: "w3", choices: structureChoices,
			hint: "The strictest place that any of them is on or in, the inverter's wall included."},
		{name: "coldest_c", label: "Coldest air temperature", width: "w3",
			hint: "At first light, without load, the cell is as cold as the air."},
		{name: "coldest_basis", label: "Which statistic of cold", width: "w3", choices: coldestChoices,
			hint: "The NEC points to the mean of the yearly extremes (ASHRAE); a record low is colder."},
		{name: "hottest_c", label: "Hottest air temperature", width: "w3"},
		{name: "hottest_basis", label: "Which statistic of heat", width: "w3", choices: hottestChoices},
		{name: "station", label: "Weather station", may: true, width: "w4", hint: "Name and distance; it may lie lower than the roof."},
		{name: "elevation_m", label: "Elevation", may: true},
	}
	codeInquiries = []inquiry{
		{name: "rulebook", label: "Code edition in force", width: "w2", choices: rulebookChoices,
			hint: "The one the authority enforces here."},
		{name: "voltage_method", label: "Cold voltage", width: "w2", choices: methodChoices,
			hint: "The other is worked out beside it."},
		{name: "short_circuit_basis", label: "Compared with Isc limits", width: "w2", choices: basisChoices,
			hint: "× 1.25 is the stricter one."},
	}

	moduleInquiries = []inquiry{
		{name: "maker", label: "Maker", may: true},
		{name: "model", label: "Model and bin", may: true},
		{name: "technology", label: "Cells", choices: technologyChoices},
		{name: "pmax_w", label: "Rated power", symbol: "Pmax", asked: true},
		{name: "voc_v", label: "Open-circuit voltage", symbol: "Voc", asked: true},
		{name: "isc_a", label: "Short-circuit current", symbol: "Isc"},
		{name: "vmp_v", label: "Voltage at max. power", symbol: "Vmp"},
		{name: "imp_a", label: "Current at max. power", symbol: "Imp"},
		{name: "max_system_voltage_v", label: "Max. system voltage"},
		{name: "voc_temp_coeff", label: "Temperature coefficient of Voc", symbol: "β", width: "w3", asked: true,
			hint: "Negative. Take the unit from the datasheet."},
		{name: "pmax_temp_coeff", label: "Temperature coefficient of Pmax", may: true, symbol: "γ", width: "w3",
			hint: "Negative. Stands in where none is stated for Vmp."},
		{name: "isc_temp_coeff", label: "Temperature coefficient of Isc", may: true, symbol: "α", width: "w3", asked: true, hint: "Positive, as a rule."},
		{name: "max_series_fuse_a", label: "Max. series fuse", may: true, width: "w3",
			hint: "Without it back-feed cannot be confirmed."},
	}
	moduleMore = []inquiry{
		{name: "vmp_temp_coeff", label: "Temperature coefficient of Vmp", width: "w4", hint: "Seldom printed; negative."},
		{name: "cells_in_series", label: "Cells in series"},
		{name: "isc_marked_max_a", label: "Highest marked Isc", hint: "Bifacial conditions included."},
		{name: "bifaciality", label: "Bifaciality", hint: "As a fraction, such as 0.7."},
		{name: "noct_c", label: "NOCT"},
		{name: "length_mm", label: "Length", asked: true},
		{name: "width_mm", label: "Width"},
	}

	inverterInquiries = []inquiry{
		{name: "maker", label: "Maker", may: true},
		{name: "model", label: "Model", may: true},
		{name: "quantity", label: "How many of them"},
		{name: "max_dc_voltage_v", label: "Max. DC voltage", hint: "The absolute one, not the MPPT window's."},
		{name: "start_voltage_v", label: "Start voltage", may: true},
	}
	inverterMore = []inquiry{
		{name: "max_dc_power_w", label: "Max. DC power"},
		{name: "max_dc_power_is", label: "It is", choices: powerChoices},
		{name: "ac_rated_w", label: "Rated AC power"},
		{name: "back_feed_a", label: "Back-feed into the array", hint: "From the inverter; 0 where it is prevented."},
	}
	trackerInquiries = []inquiry{
		{name: "mppt_min_v", label: "MPPT window from"},
		{name: "mppt_max_v", label: "MPPT window to"},
		{name: "inputs", label: "Inputs", hint: "Strings that can be landed."},
		{name: "max_input_current_a", label: "Max. input current", hint: "In operation; beyond it clips."},
		{name: "max_short_circuit_current_a", label: "Max. short-circuit current", width: "w4",
			hint: "Leave empty if the datasheet does not state it: the check then says unconfirmed."},
	}
	trackerMore = []inquiry{
		{name: "full_power_min_v", label: "Full power from"},
		{name: "full_power_max_v", label: "Full power to"},
		{name: "string_fuse_a", label: "Fuse in each string", hint: "Built in or fitted."},
		{name: "max_input_current_per_input_a", label: "Max. current of one input", width: "w3"},
		{name: "max_short_circuit_current_per_input_a", label: "Max. short-circuit current of one input", width: "w3"},
	}

	planeInquiries = []inquiry{
		{name: "id", label: "Name of the plane"},
		{name: "positions", label: "Places for modules"},
		{name: "hot_cell_rise_c", label: "Cell above air when hot", hint: "20 to 35 °C on roofs, by the mounting."},
		{name: "tilt_deg", label: "Tilt", may: true},
		{name: "azimuth_deg", label: "Azimuth", may: true, hint: "From north, clockwise."},
		{name: "current_gain_pct", label: "Current gain", may: true, hint: "Bifacial or snow, onto Isc and Imp."},
	}
	planeModule = inquiry{name: "module", label: "Module", width: "w6"}

	allowanceInquiries = []inquiry{
		{name: "hot_voltage_pct", label: "Off the hot voltage", hint: "Ageing, mismatch, wire. Empty is 0."},
		{name: "cold_voltage_pct", label: "Onto the cold voltage", hint: "Its own line in the working. Empty is 0."},
		{name: "headroom_c", label: "Caution within", hint: "Of the coldest temperature. Empty is 3 °C."},
	}
	otherLimitInquiries = []inquiry{
		{name: "name", label: "Part"},
		{name: "max_voltage_v", label: "Max. voltage"},
		{name: "source", label: "Where it is stated"},
	}
	jobInquiries = []inquiry{
		{name: "client", label: "Client", width: "w3"},
		{name: "address", label: "Address", width: "w3"},
		{name: "authority", label: "Authority having jurisdiction", width: "w3"},
		{name: "permit_number", label: "Permit number", width: "w3"},
		{name: "preparer", label: "Prepared by", width: "w3"},
		{name: "licence", label: "Licence", width: "w3"},
		{name: "note", label: "Note", width: "w6", long: true},
	}
)
