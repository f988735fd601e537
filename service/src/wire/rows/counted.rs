//! Traffic known only as counts.

use rimeshift_engine::day::{BackgroundParts, FlowParts};
use rimeshift_proto::v1;

use super::Receiving;

impl Receiving {
    pub(super) fn background(&mut self, row: v1::Background) {
        let i = self.parts.background.len();
        let path = |field: &str| format!("background[{i}].{field}");
        let from_s = self.required_time(|| path("from"), row.from);
        let until_s = self.required_time(|| path("until"), row.until);
        let aircraft = self.required(|| path("aircraft"), row.aircraft);
        self.parts.background.push(BackgroundParts {
            sector: row.sector,
            from_s,
            until_s,
            aircraft,
            level_ft: row.level_ft,
            entries: row.entries,
        });
    }

    pub(super) fn flow(&mut self, row: v1::Flow) {
        let i = self.parts.flows.len();
        let path = |field: &str| format!("flows[{i}].{field}");
        let from_level_ft = self.required(|| path("from_level_ft"), row.from_level_ft);
        let to_level_ft = self.required(|| path("to_level_ft"), row.to_level_ft);
        let from_s = self.required_time(|| path("from"), row.from);
        let until_s = self.required_time(|| path("until"), row.until);
        let aircraft = self.required(|| path("aircraft"), row.aircraft);
        self.parts.flows.push(FlowParts {
            from_sector: row.from_sector,
            from_level_ft,
            to_sector: row.to_sector,
            to_level_ft,
            from_s,
            until_s,
            aircraft,
        });
    }
}
