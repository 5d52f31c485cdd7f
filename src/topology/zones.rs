//! Contacts of two pressure zones: where mains of two different known zones touch, or would be joined, with no open zone
//! valve drawn there, they are kept apart and it is said. A closed valve at the place explains it, and nothing is said.

use std::collections::HashMap;

use super::cleaning::Work;
use super::geometry::distance_m;
use super::web::Zone;
use super::{Join, JoinKind, ZoneContact};
use crate::assets::{MainKind, Point};
use crate::finding::{Code, Finding, Sentence};

/// Contacts of two zones, each place and pair of zones once.
#[derive(Debug, Default)]
pub(super) struct Contacts {
    all: Vec<Contact>,
    by_cell: HashMap<(i64, i64), Vec<u32>>,
}

#[derive(Clone, Debug)]
struct Contact {
    lines_a: Vec<u32>,
    lines_b: Vec<u32>,
    zones: (Zone, Zone),
    at: Point,
    to: Point,
}

/// Contacts of the same zones nearer than this are one, m.
const ONE_PLACE_M: f64 = 2.0;

impl Work<'_> {
    /// The zone of a line, as far as joining goes.
    pub(super) fn zone_of_line(&self, line: u32) -> Zone {
        let main = &self.assets.mains[self.lines.main(line) as usize];
        match (main.kind, main.zone, self.settings.zones) {
            (MainKind::RawWater, ..) => Zone::RawWater,
            (_, Some(zone), ZoneContact::Apart) => Zone::Known(zone),
            _ => Zone::Unknown,
        }
    }

    /// The name of a zone, for an order that does not depend on rows.
    pub(super) fn zone_name(&self, zone: Zone) -> &str {
        match zone {
            Zone::Known(zone) => self.assets.zones.get(zone as usize).map_or("", String::as_str),
            _ => "",
        }
    }

    /// Whether an open zone valve stands at a place.
    pub(super) fn open_zone_valve_at(&self, at: Point) -> bool {
        let within = self.assets.reach.valves_m.max(self.settings.touch_m);
        self.marks.open_zone_valve(at, within)
    }

    /// The zone of the whole if two were joined at a place; `None` if they are to be kept apart.
    pub(super) fn zone_together(&self, a: Zone, b: Zone, at: Point) -> Option<Zone> {
        match (a, b) {
            (Zone::Known(_), Zone::Known(_)) if a != b => self.open_zone_valve_at(at).then_some(Zone::Several),
            _ => a.with(b),
        }
    }

    /// Remembers that lines of one zone were kept apart from lines of another. The most telling of each come first.
    pub(super) fn keep_apart(&mut self, mut lines_a: Vec<u32>, mut lines_b: Vec<u32>, at: Point, to: Point) {
        // The main of unknown zone that went with one of the two is not what the contact is about.
        for lines in [&mut lines_a, &mut lines_b] {
            lines.sort_by_key(|&line| (self.zone_of_line(line) == Zone::Unknown, self.lines.rank(line)));
        }
        let (Some(&line_a), Some(&line_b)) = (lines_a.first(), lines_b.first()) else {
            return;
        };
        let (mut a, mut b) = (self.zone_of_line(line_a), self.zone_of_line(line_b));
        if a > b {
            std::mem::swap(&mut a, &mut b);
        }
        if a == Zone::RawWater || b == Zone::RawWater || a == b {
            return;
        }
        let cell = |p: Point| ((p[0] / ONE_PLACE_M).floor() as i64, (p[1] / ONE_PLACE_M).floor() as i64);
        let (x, y) = cell(at);
        let contacts = &self.contacts;
        let known = (x - 1..=x + 1)
            .flat_map(|x| (y - 1..=y + 1).map(move |y| (x, y)))
            .filter_map(|cell| contacts.by_cell.get(&cell))
            .flatten()
            .map(|&i| &contacts.all[i as usize])
            .any(|other| other.zones == (a, b) && distance_m(other.at, at) <= ONE_PLACE_M);
        if !known {
            let index = self.contacts.all.len() as u32;
            self.contacts.by_cell.entry((x, y)).or_default().push(index);
            self.contacts.all.push(Contact {
                lines_a,
                lines_b,
                zones: (a, b),
                at,
                to,
            });
        }
    }
}

/// Says which contacts were kept apart. Counts them.
pub(super) fn report(work: &mut Work) -> u32 {
    let contacts = std::mem::take(&mut work.contacts.all);
    for contact in &contacts {
        let (line_a, line_b) = (contact.lines_a[0], contact.lines_b[0]);
        let (main_a, main_b) = (work.lines.main(line_a), work.lines.main(line_b));
        let within = work.assets.reach.valves_m.max(work.settings.touch_m);
        let valve = work.marks.closed_valve(contact.at, within);
        work.map.joins.push(Join {
            kind: JoinKind::ZonesApart,
            main_a,
            main_b,
            at: contact.at,
            to: contact.to,
            distance_m: distance_m(contact.at, contact.to),
            joined: false,
            why: if valve {
                "a closed valve stands between the two zones".into()
            } else {
                "two pressure zones and no valve drawn between them".into()
            },
        });
        if valve {
            continue;
        }
        let (a, b) = (work.zone_of_line(line_a), work.zone_of_line(line_b));
        let message = Sentence::new()
            .feature(work.feature(main_a))
            .text(format!(" of zone {} touches ", work.zone_name(a)))
            .feature(work.feature(main_b))
            .text(format!(" of zone {} and was kept apart from it", work.zone_name(b)));
        let mut finding = Finding::new(Code::ZonesKeptApart, message)
            .on(work.feature(main_a))
            .at(contact.at);
        for &line in contact.lines_b.iter().chain(&contact.lines_a[1..]) {
            let other = work.feature_of_line(line);
            if other != work.feature(main_a) && !finding.others.contains(&other) {
                finding.others.push(other);
            }
        }
        work.findings.push(finding);
    }
    contacts.len() as u32
}
