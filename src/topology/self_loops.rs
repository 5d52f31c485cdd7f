//! Mains that end where they start. A ring that other mains tie into along its way carries water and is only noted; one
//! that is tied in at one place carries none. Both are kept, since customers and hydrants may stand on them; only a ring
//! shorter than the tolerance is left out.

use super::cleaning::Work;
use super::lines::End;
use crate::finding::{Code, Finding, Sentence, Severity};
use crate::units::Quantity;

/// Says which mains end where they start. Counts them.
pub(super) fn find(work: &mut Work) -> u32 {
    let mut count = 0;
    for line in 0..work.lines.len() as u32 {
        let spot = |last| work.web.spot_of_end[End::new(line, last).at()];
        let trimmed = |last| work.web.trimmed[End::new(line, last).at()].is_some();
        if trimmed(false) || trimmed(true) || !work.web.same(spot(false), spot(true)) {
            continue;
        }
        count += 1;
        let (start, length_m) = (spot(false), work.lines.length_m(line));
        let carries = work.web.middles_of_line(line).any(|m| !work.web.same(m.spot, start));
        let left_out = length_m <= work.settings.tolerance_m;
        let feature = work.feature_of_line(line);
        let said = match (left_out, carries) {
            (true, _) => " ends where it starts and is shorter than the tolerance; it was left out",
            (false, true) => " is a ring: it ends where it starts, and other mains tie into it on the way",
            (false, false) => " ends where it starts and nothing else ties into it: it carries no water through",
        };
        let finding = Finding::new(Code::SelfLoop, Sentence::new().feature(feature).text(said))
            .on(feature)
            .at(work.web.at[start as usize])
            .measured(length_m, Quantity::Length);
        work.findings.push(if carries && !left_out {
            finding.severity(Severity::Note)
        } else {
            finding
        });
    }
    count
}
