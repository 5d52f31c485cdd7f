//! Every kind of finding by meaning: its name, what it says, why it matters, what to do.
//!
//! One table. `gradeline explain CODE`, the hints in the `findings` layer and `docs/findings.md` are made from it.

use super::Severity;

/// Whether a finding is about the map or about the water. The point of the program is to tell the two apart.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum About {
    /// The drawing or its attributes.
    Map,
    /// Pressure, velocity, fire flow.
    Water,
}

impl About {
    /// The word that is written.
    pub fn word(self) -> &'static str {
        match self {
            About::Map => "map",
            About::Water => "water",
        }
    }
}

/// What there is to say about a code.
#[derive(Clone, Copy, Debug)]
pub struct CodeText {
    /// The name it is written and asked for by: lower case, words joined by hyphens.
    pub name: &'static str,
    /// Map or water.
    pub about: About,
    /// The severity it has unless grading or the check sets another.
    pub usual_severity: Severity,
    /// What it means.
    pub means: &'static str,
    /// Why it matters.
    pub matters: &'static str,
    /// What to do.
    pub todo: &'static str,
}

macro_rules! codes {
    ($($variant:ident $name:literal $about:ident $severity:ident $means:literal $matters:literal $todo:literal)*) => {
        /// A kind of finding.
        #[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
        pub enum Code {
            $(#[doc = $means] $variant,)*
        }

        impl Code {
            /// Every code, in the order of the table.
            pub const ALL: &'static [Code] = &[$(Code::$variant,)*];

            /// What there is to say about it.
            pub fn text(self) -> &'static CodeText {
                match self {
                    $(Code::$variant => &CodeText {
                        name: $name,
                        about: About::$about,
                        usual_severity: Severity::$severity,
                        means: $means,
                        matters: $matters,
                        todo: $todo,
                    },)*
                }
            }
        }
    };
}

codes! {
    // ---- reading -----------------------------------------------------------------------------------------------
    GeometryMissing "geometry-missing" Map Warning
        "A row has no geometry, or an empty one."
        "What is not drawn is not calculated: the water it carries is missing from the answer."
        "Draw it, or mark the row as abandoned and leave it out with `leave_out`."
    GeometryOnePoint "geometry-one-point" Map Warning
        "A main is drawn with a single vertex."
        "It has no length and no second end, so it connects nothing."
        "Redraw the main, or delete the row."
    GeometryZeroLength "geometry-zero-length" Map Warning
        "A main's vertices all lie on one spot."
        "It has no length, so it carries no head loss and connects nothing."
        "Redraw the main, or delete the row."
    GeometryNotFinite "geometry-not-finite" Map Serious
        "A coordinate is not a number, or is infinite."
        "The feature lies nowhere; it is left out."
        "Redraw the feature; look for a failed conversion or projection."
    GeometryOtherType "geometry-other-type" Map Warning
        "A feature has a geometry that its layer cannot use, such as a point among the mains."
        "It is left out of the calculation."
        "Move it to a layer of its own, or delete it."
    EncodingDoubtful "encoding-doubtful" Map Note
        "The text of an attribute table has letters that fit no stated encoding."
        "Ids or names may be misread."
        "Add a .cpg file that names the encoding beside the .dbf."
    CrsAssumed "crs-assumed" Map Warning
        "A layer does not say which coordinate reference system it is in."
        "Lengths may be in another unit than assumed, and layers may not lie on one another."
        "Add the .prj file, or the layer's `crs` member."
    ColumnRenamed "column-renamed" Map Note
        "The user's layer already has a column with the name of one of ours, so ours has another name."
        "A map that was coloured by that column still shows the old values."
        "Nothing, or remove the earlier result columns before the run."
    FormatHoldsLess "format-holds-less" Map Note
        "The format that a layer is written in cannot hold all that its source holds."
        "The written layer lacks it, or has it shortened; the source is untouched."
        "Write in the source's own format to keep everything."
    // ---- attributes --------------------------------------------------------------------------------------------
    IdMissing "id-missing" Map Note
        "A feature has no id."
        "It can be named only by its row."
        "Give it an id."
    IdRepeated "id-repeated" Map Warning
        "Several features carry the same id."
        "A result or a field note cannot be traced to one of them."
        "Give each its own id."
    ValueUnreadable "value-unreadable" Map Warning
        "An attribute holds something that cannot be read as what its column should hold."
        "The value is treated as missing."
        "Correct the attribute."
    DiameterMissing "diameter-missing" Map Warning
        "A main has no diameter, or a filler such as 0 or 999."
        "An assumed diameter decides how much water gets past this main; everything computed downstream rests on it."
        "Look the diameter up in the records, or measure it."
    DiameterImpossible "diameter-impossible" Map Warning
        "A main's diameter is outside what water mains are made in."
        "It cannot be right as it stands: most often the unit is another than stated."
        "Check the unit of the column and the value of this row."
    DiameterUnitWrong "diameter-unit-wrong" Map Serious
        "The diameters of a layer do not fit the unit that was stated or inferred: most are no size of a water main in it."
        "Every head loss would be wrong by orders of magnitude: nothing is calculated until the unit is settled."
        "State in the study the unit that the column is really in: `mm`, `in` or `m`, as in `diameter = { column = \"DIAM\", unit = \"mm\" }`."
    FrictionValueImpossible "friction-value-impossible" Map Warning
        "A C-factor or roughness is outside the range met in practice."
        "Head loss along the main would be wrong; the value is treated as missing."
        "Check the column, or remove the value so that material and age decide."
    MaterialUnknown "material-unknown" Map Note
        "A main's material is not in the table of materials."
        "Its C-factor or roughness is the study's default."
        "Spell the material as the table does, or give the C-factor in a column."
    YearImpossible "year-impossible" Map Note
        "A year of laying lies in the future or before piped water."
        "The main's age is treated as unknown."
        "Correct the year."
    LengthDisagrees "length-disagrees" Map Warning
        "A stored length differs from the drawn one by more than a tenth."
        "One of the two is wrong: the unit, the drawing, or a main that was cut or extended since."
        "Look at the drawing; choose which length counts with `length_from`."
    DemandNegative "demand-negative" Map Warning
        "A demand is below zero."
        "It would feed water into the network; it is treated as zero."
        "Correct the value; a well belongs among the sources."
    DemandMissing "demand-missing" Map Note
        "Customers or nodes have no demand."
        "They draw nothing in the calculation: pressures are shown too high where they do draw."
        "Fill in the demand, or 0 where nothing is drawn."
    ElevationDoubtful "elevation-doubtful" Map Warning
        "An elevation stands far outside those of its neighbours."
        "Pressure is head less elevation: a wrong elevation is a wrong pressure, metre for metre."
        "Check the unit and the value against the ground."
    ElevationMissing "elevation-missing" Map Note
        "A node point has no elevation."
        "It takes one interpolated along the mains, where there are known ones to go by."
        "Add the elevation, for example from a ground model."
    MainsLeftOut "mains-left-out" Map Note
        "Mains are left out by a rule of the study."
        "They carry no water in the calculation."
        "Check that the rule means what it leaves out."
    PointsLeftOut "points-left-out" Map Note
        "Nodes, hydrants, customers or valves are left out by a rule of the study."
        "Their demands and heads are missing from the calculation, and nothing is said about them."
        "Check that the rule means what it leaves out."
    LeaveOutIdle "leave-out-idle" Map Warning
        "A rule of the study leaves out nothing: no row has the value it names."
        "What was meant to be left out is calculated with the rest."
        "Spell the value as the layer does; the values that it has are listed."
    // ---- topology ----------------------------------------------------------------------------------------------
    MultipartMerged "multipart-merged" Map Note
        "A main of several parts was put together where the parts touch."
        "Nothing is lost; the row is one main."
        "Nothing, or merge the parts in the map."
    MultipartApart "multipart-apart" Map Warning
        "A main is drawn in several parts that do not touch."
        "Each part is calculated by itself; the gap between them carries no water."
        "Close the gap, or make each part a row of its own."
    SelfLoop "self-loop" Map Warning
        "Both ends of a main lie on the same spot."
        "A closed ring that is joined at one place only carries no water."
        "Check whether one end belongs elsewhere."
    DuplicateMain "duplicate-main" Map Warning
        "Two mains lie on one another and agree in diameter, year and zone."
        "Counted twice, the main would carry twice the water; one is left out."
        "Delete one of the two rows."
    DuplicateDiffers "duplicate-differs" Map Serious
        "Two mains lie on one another and differ in diameter, year or zone."
        "Only one can be right, or the old one was never marked abandoned; the smaller is calculated."
        "Find out which one is in use and mark the other."
    MainsOverlap "mains-overlap" Map Warning
        "Two mains lie on one another over a part of their length."
        "One of them is drawn too far, or the same main is in the map twice in other pieces; both were calculated."
        "See where each main really ends and correct the drawing."
    EndJoined "end-joined" Map Note
        "Two ends that do not quite meet were joined, being within the tolerance."
        "Joined is the likelier reading; if they are really apart, water is shown where none flows."
        "Close the gap in the map, or move the end away if the two do not connect."
    EndJoinedToMiddle "end-joined-to-middle" Map Note
        "An end that does not quite reach a main was joined to it, being within the tolerance."
        "Joined is the likelier reading; if they are really apart, water is shown where none flows."
        "Close the gap in the map, or move the end away if the two do not connect."
    Overshoot "overshoot" Map Note
        "A main runs past the main it meets by less than the tolerance; it was joined there and the tail left out."
        "Without the join the two would pass each other."
        "Trim the tail in the map."
    NearMiss "near-miss" Map Warning
        "A free end stops just outside the tolerance of another main."
        "If they are really connected, the network is missing a feed: pressure and fire flow are shown too low."
        "Zoom in: join them in the map if they connect, or leave them if they do not."
    CrossingNotJoined "crossing-not-joined" Map Warning
        "Two mains cross without a shared end; they are not joined."
        "Mains cross at different depths as a rule; if these do connect, a loop is missing."
        "Check for a cross fitting or valves at the spot; split the mains there if they connect."
    ShortMain "short-main" Map Note
        "A main is shorter than the tolerance; its ends were kept apart."
        "A larger tolerance would swallow mains like it."
        "Nothing."
    ZonesKeptApart "zones-kept-apart" Map Warning
        "Mains of two pressure zones touch with no valve or pump drawn, and were kept apart."
        "Joined, the two zones would share one pressure; apart, a real connection may be missing."
        "Draw the zone valve, correct the zone, or set `zones = \"ignore\"`."
    Island "island" Map Warning
        "A part of the network has no source."
        "Nothing in it can be calculated; it stays untested."
        "Look for the missing join or the missing source; the nearest other main is named."
    // ---- points on mains ---------------------------------------------------------------------------------------
    HydrantOffMain "hydrant-off-main" Map Warning
        "No fitting main lies within reach of a hydrant."
        "Its fire flow cannot be calculated."
        "Draw the lateral, move the hydrant, or raise `reach_m`."
    HydrantBetweenMains "hydrant-between-mains" Map Warning
        "Two mains of different size lie about equally near a hydrant; the smaller was taken."
        "The flow it can give depends on which main feeds it."
        "Draw the hydrant's lateral."
    CustomerOffMain "customer-off-main" Map Warning
        "No fitting main lies within reach of a customer."
        "The customer's demand is missing from the calculation."
        "Check the customer's place, or raise `reach_m`."
    ValveOffMain "valve-off-main" Map Warning
        "No fitting main lies within reach of a valve."
        "If it is closed, water is shown where none flows."
        "Move the valve onto its main, name the main in a column, or raise `reach_m`."
    ValveOnNode "valve-on-node" Map Serious
        "A closed valve stands where three or more mains meet, and does not say which one, or which side of one, it shuts."
        "Each choice gives another network; none was made, and the valve shuts nothing."
        "Name the main in the valve's `main` column, or move the valve onto it."
    ValveClosed "valve-closed" Map Note
        "A closed valve cuts a main: no water passes there."
        "A valve left shut after work is a common cause of low pressure and poor fire flow."
        "Check in the field that it is meant to be shut."
    ValveMainUnknown "valve-main-unknown" Map Warning
        "A valve names a main that is not in the map, or not within reach."
        "The valve was put on the nearest fitting main instead."
        "Correct the main's id."
    ValveStatusUnknown "valve-status-unknown" Map Note
        "A valve has no status, or one that is neither open nor closed in words the program knows."
        "A zone valve is taken as closed, any other as open: either may be wrong."
        "Write `open` or `closed`."
    NodeOffMain "node-off-main" Map Warning
        "A node point with a demand or a known head lies on no main."
        "Its demand or head is missing from the calculation."
        "Move the point onto its main."
    HeadsDisagree "heads-disagree" Map Warning
        "Two known heads stand on one node and differ."
        "A node has one head; the first one read counts."
        "Remove one of the two."
    ElevationUnknown "elevation-unknown" Map Warning
        "A part of the network has no known elevation to go by."
        "Pressure there cannot be calculated; it stays untested."
        "Add elevations for some of its nodes."
    // ---- water -------------------------------------------------------------------------------------------------
    PressureLow "pressure-low" Water Warning
        "Pressure is below the limit where customers draw or hydrants stand."
        "Taps run weakly, and below zero the ground water can get in."
        "See which mains take the head on the way; check their diameter and whether a valve is shut."
    CannotBeSupplied "cannot-be-supplied" Water Serious
        "At the stated demand the pressure would be below zero."
        "The demand cannot be met: the computed pressures there are not real, but say that the network is too weak."
        "Check demand, elevation and source head first; then the mains on the way."
    PressureHigh "pressure-high" Water Note
        "Pressure is above the limit when nobody draws."
        "Fittings leak and burst; plumbing needs a regulator."
        "Check the pressure class of the mains and whether houses have regulators."
    VelocityHigh "velocity-high" Water Note
        "Water runs faster than the limit."
        "Head loss and surge grow with velocity."
        "Check the diameter; a larger main or a second feed lowers it."
    GradientHigh "gradient-high" Water Note
        "Head is lost faster along a main than the limit."
        "This main is what takes the pressure from those behind it."
        "Check the diameter and C-factor; a larger main or a second feed lowers it."
    FireFlowShort "fire-flow-short" Water Warning
        "A hydrant cannot give its needed fire flow at the residual limit."
        "The water to fight a fire is not there."
        "Look at what limits it: its own main, a place elsewhere, or a fault of the map."
    FireNotRun "fire-not-run" Water Note
        "Fire flow was not calculated: the study names no fire case, or there is no needed flow."
        "Nothing is said about any hydrant."
        "Add `[fire]` with `case` and `needed_lps`, or a `needed_flow` column."
    FireCaseNotPeak "fire-case-not-peak" Water Warning
        "The fire case draws no more than an average day."
        "Fire flow is judged together with a high demand, as a rule the maximum day; at average demand it looks better than it is."
        "Name the maximum day as the fire case."
    AlreadyLow "already-low" Water Warning
        "Places that customers draw at are below the limit for fire flow even with no hydrant open."
        "They are left out when looking for what a hydrant may take from others, since they would stop every hydrant."
        "Settle the low pressure first."
    CaseNotProved "case-not-proved" Water Serious
        "The hydraulics of a case did not settle to the tolerance."
        "The case has no result; nothing of it is written."
        "Look at the elements named: a wrong diameter or length is the usual cause."
    NoSource "no-source" Water Serious
        "No node of the map has a known head, and the study names no source."
        "There is nothing to calculate from: everything stays untested."
        "Give the head of a source: `[[source]]` in the study, or a `head` column of the nodes."
    NoDemand "no-demand" Water Warning
        "No demand was read for a part of the network, or for all of it."
        "Without draw there is no head loss: pressures look like those of a network at rest."
        "Add demands to nodes or customers."
}

impl Code {
    /// The code of that name, whatever its case; `None` if there is none.
    pub fn by_name(name: &str) -> Option<Code> {
        let wanted = name.trim().to_lowercase();
        Code::ALL.iter().copied().find(|code| code.text().name == wanted)
    }
}
