//! Mains shorter than the tolerance: hydrant laterals and the pieces of valve clusters. Their two ends were kept apart.

use super::cleaning::Work;
use super::lines::End;
use crate::finding::{Code, Finding, Sentence};
use crate::units::Quantity;

/// Says which mains are shorter than the tolerance. Counts them.
pub(super) fn find(work: &mut Work) -> u32 {
    let tolerance_m = work.settings.tolerance_m;
    let mut count = 0;
    for line in 0..work.lines.len() as u32 {
        let length_m = work.lines.length_m(line);
        let spot = |last| work.web.spot_of_end[End::new(line, last).at()];
        if length_m >= tolerance_m || work.web.same(spot(false), spot(true)) {
            continue;
        }
        count += 1;
        let feature = work.feature_of_line(line);
        let message = Sentence::new()
            .feature(feature)
            .text(" is ")
            .number(length_m, Quantity::Length);
        let message = message.text(" long, shorter than the tolerance; its ends were kept apart");
        work.findings.push(
            Finding::new(Code::ShortMain, message)
                .on(feature)
                .at(work.web.at[spot(false) as usize])
                .measured(length_m, Quantity::Length)
                .limit(tolerance_m, "the tolerance"),
        );
    }
    count
}
