//! Gradeline checks a water utility's *mapped* network: it reads pipe and node layers, works out which mains really
//! connect, solves the steady-state hydraulics by the global gradient method, and writes pressure, velocity and
//! fire-flow results back onto the same map features.
//!
//! The way the data goes, and the type each stage hands on:
//!
//! ```text
//! files ─► LayerSet ─► Checked<Assets> ─► Checked<PipeMap> ─► Checked<Network> ─► State per case ─► Screened ─► layers written
//!          layers      assets             topology            network             hydraulics        screening   report
//! ```
//!
//! 1. [`layers`] reads files into packed coordinates and the columns asked for; it knows formats and reference systems.
//! 2. [`assets`] turns columns into mains, nodes, hydrants, customers and valves with SI values, each with its basis.
//! 3. [`topology`] cleans the drawing by a visible list of named steps and says which mains connect, where and why.
//! 4. [`network`] gives every part a length, bore and friction, every node an elevation and a demand.
//! 5. [`hydraulics`] solves one condition of the network; it sees no coordinate, no file and no unit but SI.
//! 6. [`screening`] holds the results against limits and judges every hydrant; it grades all findings.
//! 7. [`calculation`] is stages 3 to 6 without files: assets in, calculation out.
//! 8. [`report`] puts results onto the user's features and writes layers and a summary, all or nothing.
//! 9. [`study`] reads the study file and runs the whole job: read, calculate, write.
//!
//! A room may use only the rooms above it in this list (and [`units`], [`finding`] and [`watch`], which all may use); a test reads
//! the source and enforces it. Bad map data is never an abort: it becomes a [`finding::Finding`] on the user's own feature.

pub mod assets;
pub mod calculation;
pub mod finding;
pub mod hydraulics;
pub mod layers;
pub mod network;
pub mod report;
pub mod screening;
pub mod study;
pub mod topology;
pub mod units;
pub mod watch;
