//! Areas: places of one kind that hang together, so that one trouble gives one finding and not two hundred.

use petgraph::unionfind::UnionFind;

use crate::topology::PipeMap;

/// Groups the marked nodes by the parts that run between two of them. Groups and their members are in rising order.
pub(super) fn areas(map: &PipeMap, marked: &[bool]) -> Vec<Vec<usize>> {
    let mut groups = UnionFind::<u32>::new(marked.len());
    for part in &map.parts {
        if marked[part.from as usize] && marked[part.to as usize] {
            groups.union(part.from, part.to);
        }
    }
    let mut by_first: Vec<Vec<usize>> = vec![Vec::new(); marked.len()];
    for node in (0..marked.len()).filter(|node| marked[*node]) {
        by_first[groups.find(node as u32) as usize].push(node);
    }
    let mut found: Vec<Vec<usize>> = by_first.into_iter().filter(|members| !members.is_empty()).collect();
    found.sort_by_key(|members| members[0]);
    found
}
