//! What must hold after every cleaning step, whatever was drawn. Checked in debug builds and tests: a failure is a bug of
//! ours, never of the data.

use super::PipeMap;
use super::cleaning::Work;

/// Checks what must hold after a step.
pub(super) fn check(work: &Work, step: &str) {
    for (line, clean) in work.lines.list.iter().enumerate() {
        assert!(
            clean.vertices.len() >= 2,
            "after {step}: line {line} has a single vertex"
        );
        assert!(
            clean.length_m > 0.0 && clean.length_m.is_finite(),
            "after {step}: line {line} has no length"
        );
        assert!(
            clean.vertices.windows(2).all(|pair| pair[0] != pair[1]),
            "after {step}: line {line} repeats a vertex"
        );
    }
    for middle in &work.web.middles {
        let length_m = work.lines.length_m(middle.line);
        assert!(
            (0.0..=length_m).contains(&middle.s),
            "after {step}: something meets a line beyond its end"
        );
    }
    for (line, stops) in work.cuts.stops.iter().enumerate() {
        assert!(
            stops.windows(2).all(|pair| pair[0].s < pair[1].s),
            "after {step}: the cuts of line {line} do not rise along it"
        );
    }
    check_map(&work.map, step);
}

/// Checks the parts and nodes.
pub(super) fn check_map(map: &PipeMap, step: &str) {
    let nodes = map.nodes.len() as u32;
    for (index, part) in map.parts.iter().enumerate() {
        assert!(part.from != part.to, "after {step}: part {index} ends where it starts");
        assert!(
            part.from < nodes && part.to < nodes,
            "after {step}: part {index} has no node"
        );
        assert!(part.end_m > part.start_m, "after {step}: part {index} has no length");
    }
    for pair in map.parts.windows(2) {
        let (a, b) = (&pair[0], &pair[1]);
        assert!(
            a.line <= b.line && a.main <= b.main,
            "after {step}: parts of a main do not stand together"
        );
        assert!(
            a.line != b.line || a.end_m <= b.start_m,
            "after {step}: parts of a line overlap"
        );
    }
    assert!(
        map.piece_of_node
            .iter()
            .all(|&piece| (piece as usize) < map.piece_length_m.len()),
        "after {step}: a node belongs to no piece"
    );
    assert!(
        map.piece_length_m.windows(2).all(|pair| pair[0] >= pair[1]),
        "after {step}: the pieces are not in order"
    );
}
