//! Files to a [`Record`]: the site's measured power series on one clock, with the list of what is wrong with it.
//!
//! [`read`] is the stage's door. Nothing is repaired in silence: whatever does not fit is left out and listed as a
//! [`Finding`] with its rows and the remedy chosen.

mod archive;
mod clock;
mod decode;
mod dialect;
mod fill;
mod grid;
mod made;
mod nem12;
mod number;
mod quality;
mod read;
mod roles;
mod rows;
mod scan;
mod series;
mod settle;
mod shape;
mod sheets;
mod source;
mod stamp;
#[cfg(test)]
mod tests;
mod timing;
mod unit;
mod usage_xml;
mod words;
#[cfg(feature = "sheets")]
mod workbook;
mod zone;

pub use clock::{Civil, Clock, Zone};
pub use read::{Reader, read};
pub use series::Series;
pub use sheets::WorkbookSheet;
#[cfg(not(target_arch = "wasm32"))]
pub use source::Disk;
pub use source::{Memory, Source, site_name, site_of};
#[cfg(feature = "sheets")]
pub use workbook::workbook_sheets;

use serde::{Deserialize, Serialize};

/// A site's measured power series on one clock.
#[derive(Debug, Clone, PartialEq)]
pub struct Record {
    /// Name of the site: the file's or folder's name without its ending.
    pub site: String,
    /// The clock that all series share.
    pub clock: Clock,
    /// Supply (power available, kW, average of the interval); none if no column has that role.
    pub supply_kw: Option<Series>,
    /// Demand (power wanted, kW, average of the interval); none if no column has that role.
    pub demand_kw: Option<Series>,
    /// Net power (kW, positive = surplus) where the file gives it as such; none where it follows from supply and demand.
    pub net_kw: Option<Series>,
    /// Power (kW, average of the interval) that is both surplus and deficit within an interval, for intervals in which net
    /// power changes its sign between two samples: interval and power, in order. Empty for averages of intervals.
    pub hidden_kw: Vec<(usize, f64)>,
    /// Columns that a duty names by header, in kW or as they stand in the file.
    pub extras: Vec<Extra>,
    /// What was found wrong or doubtful, in the order of the rows.
    pub findings: Vec<Finding>,
    /// How the files were read, and why.
    pub reading: Reading,
    /// Number of intervals whose net power was filled by a remedy, not measured.
    pub filled: usize,
}

/// A further column on the record's clock.
#[derive(Debug, Clone, PartialEq)]
pub struct Extra {
    /// Its header as in the file.
    pub header: String,
    /// What it stands for.
    pub role: Role,
    /// Its values: kW for powers, otherwise as in the file.
    pub values: Series,
}

impl Record {
    /// Net power of interval `i` (kW, positive = surplus), none where a column it needs is missing.
    ///
    /// With only a demand column net power is minus the demand, with only a supply column it is the supply.
    pub fn net_kw(&self, i: usize) -> Option<f64> {
        match (&self.net_kw, &self.supply_kw, &self.demand_kw) {
            (Some(net), _, _) => net.get(i),
            (None, Some(supply), Some(demand)) => Some(supply.get(i)? - demand.get(i)?),
            (None, Some(supply), None) => supply.get(i),
            (None, None, Some(demand)) => demand.get(i).map(|demand| 0.0 - demand),
            (None, None, None) => None,
        }
    }

    /// Whether there is a net power at all: the files may hold only a column that a duty names.
    pub fn has_net(&self) -> bool {
        self.net_kw.is_some() || self.supply_kw.is_some() || self.demand_kw.is_some()
    }

    /// Length of an interval in hours.
    pub fn step_h(&self) -> f64 {
        self.clock.step_s() / 3600.0
    }

    /// The extra column with this header, compared without regard to case and outer spaces.
    pub fn extra(&self, header: &str) -> Option<&Extra> {
        self.extras.iter().find(|extra| extra.header.trim().to_lowercase() == header.trim().to_lowercase())
    }
}

/// What a column stands for (see the case file's `record.roles`).
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord, Serialize, Deserialize)]
#[cfg_attr(feature = "terminal", derive(schemars::JsonSchema))]
#[serde(rename_all = "snake_case")]
pub enum Role {
    /// Date and time together.
    Time,
    /// The date alone.
    Date,
    /// The time of day alone.
    Clock,
    /// Power available.
    Supply,
    /// Power wanted.
    Demand,
    /// Net power, positive when drawn from the grid (a deficit).
    NetImport,
    /// Net power, positive when fed to the grid (a surplus).
    NetExport,
    /// Drawn from the grid, never negative.
    Import,
    /// Fed to the grid, never negative.
    Export,
    /// Generated on the site, beside import and export.
    Generation,
    /// Charging of a store that is there already.
    StoreCharge,
    /// Discharging of a store that is there already.
    StoreDischarge,
    /// Reactive power.
    Reactive,
    /// Price of energy.
    Price,
    /// Grid frequency.
    Frequency,
    /// Critical demand.
    Critical,
    /// Scheduled output.
    Schedule,
    /// Power asked of the store.
    Asked,
    /// A quality mark of the row.
    Quality,
    /// Not used.
    Ignore,
}

/// How the files of a record were read.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct Reading {
    /// One entry for each file, in the order given.
    pub files: Vec<FileReading>,
    /// What was made of the stamps, in words ("the stamp marks the interval's start; no zone is stated").
    pub clock_note: String,
}

/// How one file was read: what a person checks before trusting anything else.
#[derive(Debug, Clone, Default, PartialEq, Serialize, Deserialize)]
pub struct FileReading {
    /// The file's name.
    pub name: String,
    /// Encoding and container in words ("UTF-8 with byte order mark, gzip").
    pub container: String,
    /// The sheets of a workbook by name, the one that was read first; empty for other files.
    #[serde(default)]
    pub sheets: Vec<String>,
    /// Cell separator: one of `,` `;` tab `|`.
    pub separator: char,
    /// Decimal mark: point or comma.
    pub decimal: char,
    /// Thousands mark, if one was seen.
    pub thousands: Option<char>,
    /// Row of the headers, from 1; none if the table has none.
    pub header_row: Option<u64>,
    /// Row of the units, from 1, if there is one.
    pub unit_row: Option<u64>,
    /// First row of values, from 1.
    pub first_row: u64,
    /// The order of the stamps in words ("year first", "day first", "month first").
    pub stamps: String,
    /// Why that order was taken.
    pub stamps_why: String,
    /// The columns, in the file's order.
    pub columns: Vec<ColumnReading>,
    /// The first rows of values as they stand in the file: row number and cells.
    pub sample: Vec<(u64, Vec<String>)>,
}

/// How one column was read.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct ColumnReading {
    /// Header as in the file, or "column 3" where there is none.
    pub header: String,
    /// The role taken.
    pub role: Role,
    /// The unit taken, as written for people ("kW", "kWh"), empty where there is none.
    pub unit: String,
    /// Why role and unit were taken, in words.
    pub why: String,
}

/// One entry of the audit: something wrong or doubtful in the record, and the remedy chosen.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Finding {
    /// What kind of finding.
    pub kind: FindingKind,
    /// How many rows or intervals.
    pub count: u64,
    /// First row concerned, from 1 as in the file; none where it is not about rows.
    pub first_row: Option<u64>,
    /// The file, where there are several.
    pub file: String,
    /// The remedy chosen, in words ("left out", "first kept").
    pub remedy: String,
    /// The finding as a sentence.
    pub text: String,
    /// Whether figures depend on the remedy (a note otherwise).
    pub changes_figures: bool,
}

/// The kinds of findings.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "snake_case")]
pub enum FindingKind {
    /// Intervals with no row, or with an empty cell.
    Gap,
    /// Rows with a stamp that was there before and the same values.
    Repeat,
    /// Rows with a stamp that was there before and other values.
    Conflict,
    /// Rows not in the order of time.
    Disorder,
    /// Cells that should hold a number and do not, or a stamp and do not.
    Text,
    /// A long run of one value.
    Stuck,
    /// Values far outside the rest.
    Outlier,
    /// Negative supply or demand.
    Negative,
    /// Solar supply at night.
    NightSupply,
    /// A plateau at a rating or limit.
    Clipped,
    /// A jump of scale.
    Jump,
    /// Rows off the regular step.
    MixedSteps,
    /// Traces of a change to or from summer time.
    ClockChange,
    /// The reading of the stamps is a guess, or they carry no date.
    StampDoubt,
    /// The unit is a guess.
    UnitDoubt,
    /// The sign convention is a guess.
    SignDoubt,
    /// Values filled by a remedy.
    Filled,
    /// Rows or columns not used.
    Ignored,
    /// Stamps of a typical year.
    TypicalYear,
    /// Supply and demand netted before they were recorded.
    Netted,
    /// Readings that their file marks as estimated or missing.
    Quality,
    /// Three phases added up, with the largest share.
    Phases,
    /// A meter reading that turned over, was reset, or stepped over missing readings.
    Register,
}
