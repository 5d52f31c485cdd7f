//! The linear equations of one Newton step: their order, their pattern, and two ways to factor them.
//!
//! The matrix is a network's conductance matrix: off the diagonal the negated conductance between two nodes, on the
//! diagonal the sum of a node's conductances to other nodes and to known heads. `faer` orders the nodes (approximate
//! minimum degree) and finds the pattern of the factor, once a network. It is told to stay simplicial: the factor has about
//! five entries a column, and dense blocks only cost time at any size a utility has.
//!
//! The numbers come from [`Excess`], unless the settings ask for `faer`'s own simplicial Cholesky ([`FaerLlt`]), which the
//! tests hold the other against.

use faer::dyn_stack::{MemBuffer, MemStack};
use faer::sparse::linalg::SupernodalThreshold;
use faer::sparse::linalg::amd;
use faer::sparse::linalg::cholesky::{
    CholeskySymbolicParams, LltRef, SymbolicCholesky, SymbolicCholeskyRaw, SymmetricOrdering,
    factorize_symbolic_cholesky,
};
use faer::sparse::{SparseColMatRef, SymbolicSparseColMatRef};
use faer::{Conj, MatMut, Par, Side, Spec};

use super::excess::Excess;

/// Which numbers the factor is made of.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Default)]
pub enum Factoring {
    /// Our own factorisation on the pattern that `faer` finds: no subtraction in it, so that conductances many decades
    /// apart do no harm.
    #[default]
    Excess,
    /// `faer`'s simplicial Cholesky. Loses accuracy where conductances are more than about eight decades apart.
    Faer,
}

/// A conductance matrix that can be refactored with new numbers and solved with.
pub trait Factor: Send {
    /// Factors the matrix that has `conductance` between the pairs of the pattern, in their order, and `excess` at each
    /// node: the sum of its conductances to known heads. Returns whether every pivot is finite and above zero.
    fn refactor(&mut self, conductance: &[f64], excess: &[f64]) -> bool;

    /// Replaces a right-hand side by the solution.
    fn solve(&self, rhs: &mut [f64]);
}

/// The pattern of a conductance matrix and of its factor.
pub struct Analysis {
    /// Nodes.
    pub(super) nodes: usize,
    /// Smaller and larger node of each conductance.
    pairs: Vec<[u32; 2]>,
    triangle: Triangle,
    symbolic: SymbolicCholesky<u32>,
    /// Columns of the factor without their diagonals.
    pub(super) column_start: Vec<u32>,
    /// Rows of the factor's entries, rising within a column.
    pub(super) row: Vec<u32>,
    /// Where each pair of the matrix stands among those entries.
    pub(super) pair_at: Vec<u32>,
    /// Rows of the factor as lists: for each row the entries in it.
    pub(super) row_start: Vec<u32>,
    /// Column of each listed entry, and where it stands among the entries.
    pub(super) row_entry: Vec<(u32, u32)>,
}

impl Analysis {
    /// Analyses a matrix of `nodes` nodes, in the order they are to be eliminated in, with a conductance between each of
    /// `pairs`: smaller index first, sorted, none twice.
    pub fn new(nodes: usize, pairs: &[[u32; 2]]) -> Self {
        let triangle = Triangle::new(nodes, pairs);
        let symbolic = factorize_symbolic_cholesky(
            triangle.pattern(),
            Side::Upper,
            SymmetricOrdering::Identity,
            CholeskySymbolicParams {
                supernodal_flop_ratio_threshold: SupernodalThreshold::FORCE_SIMPLICIAL,
                ..Default::default()
            },
        )
        .expect("a pattern of 32-bit indices fits in memory");
        let SymbolicCholeskyRaw::Simplicial(simplicial) = symbolic.raw() else {
            unreachable!("the factorisation was told to stay simplicial");
        };
        let (column_start, row) = without_diagonal(simplicial.col_ptr(), simplicial.row_idx());
        let pair_at = find_pairs(&column_start, &row, pairs);
        let (row_start, row_entry) = by_row(nodes, &column_start, &row);
        Self {
            nodes,
            pairs: pairs.to_vec(),
            triangle,
            symbolic,
            column_start,
            row,
            pair_at,
            row_start,
            row_entry,
        }
    }

    /// Room for the numbers of one factor.
    pub fn factor(&self, how: Factoring) -> Box<dyn Factor + '_> {
        match how {
            Factoring::Excess => Box::new(Excess::new(self)),
            Factoring::Faer => Box::new(FaerLlt::new(self)),
        }
    }
}

/// An order of elimination that keeps the factor small: `order[k]` is the node eliminated as number k.
///
/// Approximate minimum degree (Amestoy, Davis & Duff 1996) as `faer` has it, in postorder of the elimination tree, so
/// that nodes near in the network stand near in memory too.
pub fn elimination_order(nodes: usize, pairs: &[[u32; 2]]) -> Vec<u32> {
    let triangle = Triangle::new(nodes, pairs);
    let (mut order, mut place) = (vec![0; nodes], vec![0; nodes]);
    let mut room = MemBuffer::new(amd::order_maybe_unsorted_scratch::<u32>(nodes, triangle.row.len()));
    amd::order_maybe_unsorted(
        &mut order,
        &mut place,
        triangle.pattern(),
        amd::Control::default(),
        MemStack::new(&mut room),
    )
    .expect("a pattern of 32-bit indices fits in memory");
    order
}

/// Compressed columns of the upper triangle, each with its diagonal last, and where each pair stands in them.
///
/// Without an order of its own `faer` takes its simplicial pattern from the upper triangle, whichever side it is told.
struct Triangle {
    start: Vec<u32>,
    row: Vec<u32>,
    pair_at: Vec<u32>,
}

impl Triangle {
    fn new(nodes: usize, pairs: &[[u32; 2]]) -> Self {
        let mut start = vec![0; nodes + 1];
        for &[_, column] in pairs {
            start[column as usize + 1] += 1;
        }
        for node in 0..nodes {
            start[node + 1] += start[node] + 1;
        }
        let mut row = vec![0; nodes + pairs.len()];
        let mut next = start.clone();
        let pair_at = pairs.iter().map(|&[lower, column]| {
            let at = next[column as usize];
            next[column as usize] += 1;
            row[at as usize] = lower;
            at
        });
        let pair_at = pair_at.collect();
        for node in 0..nodes {
            row[start[node + 1] as usize - 1] = node as u32;
        }
        Self { start, row, pair_at }
    }

    fn pattern(&self) -> SymbolicSparseColMatRef<'_, u32> {
        let nodes = self.start.len() - 1;
        SymbolicSparseColMatRef::new_checked(nodes, nodes, &self.start, None, &self.row)
    }

    fn diagonal(&self, node: usize) -> usize {
        self.start[node + 1] as usize - 1
    }
}

fn without_diagonal(start: &[u32], row: &[u32]) -> (Vec<u32>, Vec<u32>) {
    let mut new_start = Vec::with_capacity(start.len());
    let mut new_row = Vec::with_capacity(row.len());
    for (column, ends) in start.windows(2).enumerate() {
        new_start.push(new_row.len() as u32);
        let rows = &row[ends[0] as usize..ends[1] as usize];
        new_row.extend(rows.iter().filter(|&&row| row as usize != column));
    }
    new_start.push(new_row.len() as u32);
    (new_start, new_row)
}

fn find_pairs(start: &[u32], row: &[u32], pairs: &[[u32; 2]]) -> Vec<u32> {
    pairs
        .iter()
        .map(|&[column, wanted]| {
            let (from, to) = (start[column as usize], start[column as usize + 1]);
            let within = row[from as usize..to as usize]
                .binary_search(&wanted)
                .expect("the factor has an entry for every pair, in rising order");
            from + within as u32
        })
        .collect()
}

fn by_row(nodes: usize, start: &[u32], row: &[u32]) -> (Vec<u32>, Vec<(u32, u32)>) {
    let mut row_start = vec![0; nodes + 1];
    for &row in row {
        row_start[row as usize + 1] += 1;
    }
    for node in 0..nodes {
        row_start[node + 1] += row_start[node];
    }
    let mut next = row_start.clone();
    let mut entries = vec![(0, 0); row.len()];
    for column in 0..nodes {
        for at in start[column]..start[column + 1] {
            let place = &mut next[row[at as usize] as usize];
            entries[*place as usize] = (column as u32, at);
            *place += 1;
        }
    }
    (row_start, entries)
}

/// `faer`'s simplicial Cholesky factorisation.
struct FaerLlt<'a> {
    analysis: &'a Analysis,
    values: Vec<f64>,
    factor: Vec<f64>,
    room: MemBuffer,
}

impl<'a> FaerLlt<'a> {
    fn new(analysis: &'a Analysis) -> Self {
        let room = analysis
            .symbolic
            .factorize_numeric_llt_scratch::<f64>(Par::Seq, Spec::default());
        Self {
            analysis,
            values: vec![0.0; analysis.triangle.row.len()],
            factor: vec![0.0; analysis.symbolic.len_val()],
            room: MemBuffer::new(room),
        }
    }
}

impl Factor for FaerLlt<'_> {
    fn refactor(&mut self, conductance: &[f64], excess: &[f64]) -> bool {
        let triangle = &self.analysis.triangle;
        for (node, &excess) in excess.iter().enumerate() {
            self.values[triangle.diagonal(node)] = excess;
        }
        let pairs = self.analysis.pairs.iter().zip(&triangle.pair_at);
        for ((&[a, b], &at), &g) in pairs.zip(conductance) {
            self.values[at as usize] = -g;
            self.values[triangle.diagonal(a as usize)] += g;
            self.values[triangle.diagonal(b as usize)] += g;
        }
        let made = self.analysis.symbolic.factorize_numeric_llt(
            &mut self.factor,
            SparseColMatRef::new(triangle.pattern(), &self.values),
            Side::Upper,
            Default::default(),
            Par::Seq,
            MemStack::new(&mut self.room),
            Spec::default(),
        );
        made.is_ok()
    }

    fn solve(&self, rhs: &mut [f64]) {
        let symbolic = &self.analysis.symbolic;
        let mut room = MemBuffer::new(symbolic.solve_in_place_scratch::<f64>(1, Par::Seq));
        let nodes = rhs.len();
        LltRef::new(symbolic, &self.factor).solve_in_place_with_conj(
            Conj::No,
            MatMut::from_column_major_slice_mut(rhs, nodes, 1),
            Par::Seq,
            MemStack::new(&mut room),
        );
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A ladder with a few long ties, numbered without sense.
    fn ladder(rungs: u32) -> (usize, Vec<[u32; 2]>) {
        let nodes = 2 * rungs;
        let name = |node: u32| (node * 7 + 3) % nodes;
        let mut pairs = Vec::new();
        for rung in 0..rungs {
            pairs.push([name(2 * rung), name(2 * rung + 1)]);
            if rung + 1 < rungs {
                pairs.push([name(2 * rung), name(2 * rung + 2)]);
                pairs.push([name(2 * rung + 1), name(2 * rung + 3)]);
            }
            if rung % 5 == 0 {
                pairs.push([name(2 * rung), name((2 * rung + 9) % nodes)]);
            }
        }
        (nodes as usize, sorted(pairs))
    }

    fn sorted(mut pairs: Vec<[u32; 2]>) -> Vec<[u32; 2]> {
        pairs.iter_mut().for_each(|pair| pair.sort_unstable());
        pairs.sort_unstable();
        pairs.dedup();
        pairs
    }

    /// Numbers between 0 and 1, always the same.
    fn numbers(count: usize, seed: u64) -> Vec<f64> {
        let mut state = seed;
        (0..count)
            .map(|_| {
                state = state
                    .wrapping_mul(6_364_136_223_846_793_005)
                    .wrapping_add(1_442_695_040_888_963_407);
                (state >> 11) as f64 / (1u64 << 53) as f64
            })
            .collect()
    }

    fn times(pairs: &[[u32; 2]], conductance: &[f64], excess: &[f64], x: &[f64]) -> Vec<f64> {
        let mut product: Vec<f64> = excess.iter().zip(x).map(|(e, x)| e * x).collect();
        for (&[a, b], g) in pairs.iter().zip(conductance) {
            let flow = g * (x[a as usize] - x[b as usize]);
            product[a as usize] += flow;
            product[b as usize] -= flow;
        }
        product
    }

    #[test]
    fn the_order_is_a_permutation_and_keeps_the_factor_small() {
        let (nodes, pairs) = ladder(50);
        let order = elimination_order(nodes, &pairs);
        let mut place = vec![u32::MAX; nodes];
        for (at, &node) in order.iter().enumerate() {
            place[node as usize] = at as u32;
        }
        assert!(place.iter().all(|&place| place != u32::MAX));
        let renamed = sorted(
            pairs
                .iter()
                .map(|&[a, b]| [place[a as usize], place[b as usize]])
                .collect(),
        );
        let ordered = Analysis::new(nodes, &renamed).row.len();
        let given = Analysis::new(nodes, &pairs).row.len();
        assert!(ordered * 2 < given, "{ordered} entries ordered, {given} as given");
    }

    #[test]
    fn both_factorisations_solve_what_was_multiplied() {
        let (nodes, pairs) = ladder(40);
        let analysis = Analysis::new(nodes, &pairs);
        let conductance: Vec<f64> = numbers(pairs.len(), 1).iter().map(|n| 0.1 + n).collect();
        let mut excess = vec![0.0; nodes];
        excess[5] = 2.0;
        let wanted = numbers(nodes, 2);
        let rhs = times(&pairs, &conductance, &excess, &wanted);
        for how in [Factoring::Excess, Factoring::Faer] {
            let mut factor = analysis.factor(how);
            for _ in 0..2 {
                assert!(factor.refactor(&conductance, &excess));
                let mut found = rhs.clone();
                factor.solve(&mut found);
                for (found, wanted) in found.iter().zip(&wanted) {
                    assert!((found - wanted).abs() < 1e-11, "{how:?}: {found} {wanted}");
                }
            }
        }
    }

    #[test]
    fn conductances_fifteen_decades_apart_do_no_harm() {
        // A chain from one known head: its heads follow in closed form from the flow through each link.
        let nodes = 60;
        let pairs: Vec<[u32; 2]> = (0..nodes as u32 - 1).map(|node| [node, node + 1]).collect();
        let conductance: Vec<f64> = numbers(pairs.len(), 3)
            .iter()
            .map(|n| 10_f64.powf(15.0 * n - 9.0))
            .collect();
        let mut excess = vec![0.0; nodes];
        excess[nodes - 1] = 1e-3;
        // A unit drawn at node 0 flows through every link.
        let mut wanted = vec![0.0; nodes];
        wanted[nodes - 1] = 1.0 / 1e-3;
        for node in (0..nodes - 1).rev() {
            wanted[node] = wanted[node + 1] + 1.0 / conductance[node];
        }
        let worst = |how| {
            let analysis = Analysis::new(nodes, &pairs);
            let mut factor = analysis.factor(how);
            factor.refactor(&conductance, &excess);
            let mut found = vec![0.0; nodes];
            found[0] = 1.0;
            factor.solve(&mut found);
            let errors = found
                .iter()
                .zip(&wanted)
                .map(|(found, wanted)| (found / wanted - 1.0).abs());
            errors.fold(0.0, f64::max)
        };
        assert!(worst(Factoring::Excess) < 1e-13, "{}", worst(Factoring::Excess));
        assert!(
            worst(Factoring::Faer) > 1e-10,
            "if plain Cholesky were as good, our own would not be needed"
        );
    }

    #[test]
    fn a_node_without_any_tie_is_told() {
        let analysis = Analysis::new(3, &[[0, 1]]);
        let mut factor = analysis.factor(Factoring::Excess);
        assert!(!factor.refactor(&[1.0], &[1.0, 0.0, 0.0]));
        let mut rhs = vec![1.0, 0.0, 0.0];
        factor.solve(&mut rhs);
        assert!(rhs.iter().all(|x| x.is_finite()));
    }
}
