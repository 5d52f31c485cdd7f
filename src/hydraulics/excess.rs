//! A factorisation of conductance matrices that never subtracts.
//!
//! Eliminating a node of a network joins its neighbours by new conductances and passes its tie to known heads on to them
//! (the star-mesh transformation). Every one of these numbers is a sum of products of numbers above zero. A Cholesky
//! factorisation computes the same thing, but keeps each row's diagonal in place of its excess, the part of the diagonal
//! that ties it to known heads, and finds each pivot by subtraction; with conductances 12 decades apart nothing right may
//! be left of it. Kept as excess, every pivot is right to a few roundings whatever the conductances are (known for
//! diagonally dominant M-matrices: Alfa, Xue & Ye 2002, Math. Comp. 71:217-236, from memory).

use super::linear::{Analysis, Factor};

/// The numbers of one factor L D L'.
pub(super) struct Excess<'a> {
    analysis: &'a Analysis,
    /// Conductance between a node and each later neighbour at the time it is eliminated: -d l.
    between: Vec<f64>,
    /// The same over the pivot: -l.
    share: Vec<f64>,
    /// One over each pivot; zero where there is none.
    over_pivot: Vec<f64>,
    /// What ties each node to known heads when it is eliminated.
    tie: Vec<f64>,
    /// The column being made, spread out by row.
    spread: Vec<f64>,
}

impl<'a> Excess<'a> {
    pub(super) fn new(analysis: &'a Analysis) -> Self {
        Self {
            analysis,
            between: vec![0.0; analysis.row.len()],
            share: vec![0.0; analysis.row.len()],
            over_pivot: vec![0.0; analysis.nodes],
            tie: vec![0.0; analysis.nodes],
            spread: vec![0.0; analysis.nodes],
        }
    }
}

impl Factor for Excess<'_> {
    fn refactor(&mut self, conductance: &[f64], excess: &[f64]) -> bool {
        let Analysis {
            column_start,
            row,
            pair_at,
            row_start,
            row_entry,
            ..
        } = self.analysis;
        self.between.fill(0.0);
        for (&at, &g) in pair_at.iter().zip(conductance) {
            self.between[at as usize] = g;
        }
        let mut sound = true;
        for node in 0..self.analysis.nodes {
            let column = column_start[node] as usize..column_start[node + 1] as usize;
            let rows = &row[column.clone()];
            for (&row, &g) in rows.iter().zip(&self.between[column.clone()]) {
                self.spread[row as usize] = g;
            }
            let mut tie = excess[node];
            let earlier = &row_entry[row_start[node] as usize..row_start[node + 1] as usize];
            for &(from, at) in earlier {
                let share = self.share[at as usize];
                tie += share * self.tie[from as usize];
                let rest = at as usize + 1..column_start[from as usize + 1] as usize;
                for (&row, &g) in row[rest.clone()].iter().zip(&self.between[rest]) {
                    self.spread[row as usize] += share * g;
                }
            }
            self.tie[node] = tie;
            let mut pivot = tie;
            for (&row, g) in rows.iter().zip(&mut self.between[column.clone()]) {
                *g = self.spread[row as usize];
                pivot += *g;
            }
            let good = pivot > 0.0 && pivot.is_finite();
            sound &= good;
            let over = if good { 1.0 / pivot } else { 0.0 };
            self.over_pivot[node] = over;
            for (share, &g) in self.share[column.clone()].iter_mut().zip(&self.between[column]) {
                *share = g * over;
            }
        }
        sound
    }

    fn solve(&self, rhs: &mut [f64]) {
        let Analysis { column_start, row, .. } = self.analysis;
        for node in 0..rhs.len() {
            let column = column_start[node] as usize..column_start[node + 1] as usize;
            let here = rhs[node];
            if here != 0.0 {
                for (&row, &share) in row[column.clone()].iter().zip(&self.share[column]) {
                    rhs[row as usize] += share * here;
                }
            }
        }
        for node in (0..rhs.len()).rev() {
            let column = column_start[node] as usize..column_start[node + 1] as usize;
            let mut here = rhs[node] * self.over_pivot[node];
            for (&row, &share) in row[column.clone()].iter().zip(&self.share[column]) {
                here += share * rhs[row as usize];
            }
            rhs[node] = here;
        }
    }
}
