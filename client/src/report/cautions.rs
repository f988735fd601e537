//! What every report says of itself.

/// What the program is not, in one paragraph; closes the help text too.
pub(crate) const FULL: &str = "\
A planning aid: it gives no clearances and replaces no controller, no flight-plan acceptance and no \
local procedure. Minima and capacities are yours to set, under local rules and licensed practice. \
Left out: water vapour, NOx and aerosol effects, speed control, lateral changes, climb performance \
near the ceiling.";

/// What a count of losses means, beside every one.
pub(crate) const LOSSES: &str = "\
A day ahead, times are uncertain by minutes: losses at nominal times speak of the timetable, not of \
the day.";
