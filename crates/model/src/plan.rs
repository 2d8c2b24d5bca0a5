//! Which numbers make up which row: worked out once, so that a prediction looks nothing up.
//!
//! A *group* is one multipole of one pair in one bin: its coefficients are the weights of its components. Rows of the
//! same group share coefficients. Where a bin's redshift nodes see the same k integrals, a group stands for their
//! average; where the bin is remapped they don't (each node stretches by its own α), there is a group a node, and a row
//! draws on the groups of all multipoles of its own parity.

use crate::abscissa::Abscissa;
use crate::functionals::Reading;
use crate::remapping::stretch_power;
use crate::rows::{Pair, Row, Space};
use crate::setup::BinSetup;
use crate::terms::{Component, Readout, components};
use std::collections::HashMap;
use std::hash::Hash;
use std::ops::Range;

/// One redshift of one bin.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Node {
    pub(crate) bin: usize,
    pub(crate) redshift: f64,
    pub(crate) weight: f64,
}

/// One multipole of one pair in one bin, or at one node of it.
#[derive(Clone, Debug)]
pub(crate) struct Group {
    pub(crate) bin: usize,
    pub(crate) pair: Pair,
    pub(crate) multipole: u8,
    pub(crate) space: Space,
    /// The node, where the bin is remapped.
    node: Option<usize>,
    /// Its first coefficient.
    pub(crate) start: usize,
    pub(crate) components: &'static [Component],
}

/// One node and what is predicted there.
#[derive(Clone, Debug)]
pub(crate) struct Station {
    pub(crate) node: usize,
    /// Pairs, each with its groups.
    pub(crate) pairs: Vec<(Pair, Vec<usize>)>,
}

/// A node and space that is remapped.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(crate) struct Warp {
    pub(crate) node: usize,
    pub(crate) space: Space,
}

/// What remapping does to one component: which multipole it is of, which it ends up in, with which power of q.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(crate) struct Stretched {
    pub(crate) warp: usize,
    pub(crate) to: usize,
    pub(crate) from: usize,
    pub(crate) power: i32,
}

/// A function of k at the knots: k^wavenumber times the spectrum, remapped or not.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(crate) struct Vector {
    pub(crate) wavenumber: i32,
    pub(crate) stretched: Option<Stretched>,
}

/// A part of a [`Combination`]: coefficient (as a function of k), power of k, and what remapping does to it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(crate) struct Part {
    pub(crate) coefficient: usize,
    pub(crate) vector: Vector,
}

/// Components that rows take in the same way, so that they are added up before.
#[derive(Clone, Debug, Default)]
pub(crate) struct Combination {
    pub(crate) parts: Vec<Part>,
    /// Rows and the functional that each applies.
    pub(crate) rows: Vec<(usize, usize)>,
}

/// Everything that depends on the setup alone.
#[derive(Clone, Debug)]
pub(crate) struct Plan {
    pub(crate) nodes: Vec<Node>,
    pub(crate) nodes_of_bin: Vec<Range<usize>>,
    pub(crate) groups: Vec<Group>,
    pub(crate) stations: Vec<Station>,
    pub(crate) coefficients: usize,
    pub(crate) abscissae: Vec<Abscissa>,
    pub(crate) readings: Vec<Reading>,
    pub(crate) warps: Vec<Warp>,
    pub(crate) vectors: Vec<Vector>,
    /// Functional and vector of each kernel.
    pub(crate) kernels: Vec<(usize, usize)>,
    /// Coefficients and kernels of all rows, row after row.
    pub(crate) links: Vec<(usize, usize)>,
    pub(crate) links_of_row: Vec<Range<usize>>,
    pub(crate) combinations: Vec<Combination>,
    /// By coefficient: the power of k of its component, and (where remapped) the combinations it is part of.
    pub(crate) wavenumbers: Vec<i32>,
    pub(crate) uses: Vec<Vec<(usize, Stretched)>>,
    pub(crate) coefficients_of_warp: Vec<Vec<usize>>,
}

/// A list without duplicates.
#[derive(Clone, Debug)]
struct Set<T> {
    items: Vec<T>,
    known: HashMap<T, usize>,
}

impl<T: Clone + Eq + Hash> Set<T> {
    fn new() -> Set<T> {
        Set { items: Vec::new(), known: HashMap::new() }
    }

    fn position(&mut self, item: T) -> usize {
        *self.known.entry(item).or_insert_with_key(|item| {
            self.items.push(item.clone());
            self.items.len() - 1
        })
    }
}

/// An abscissa as something that can be looked up.
type AbscissaKey = (Space, u64, Option<(u64, u64)>);
type GroupKey = (usize, Pair, u8, Space, Option<usize>);
/// Group or (where remapped) warp, pair and multipole that it ends up in; and the readout.
type CombinationKey = (usize, Option<(Pair, u8)>, Readout);

impl Plan {
    pub(crate) fn new(bins: &[BinSetup], rows: &[Row]) -> Plan {
        let (mut nodes, mut nodes_of_bin) = (Vec::new(), Vec::new());
        for (bin, definition) in bins.iter().enumerate() {
            let start = nodes.len();
            nodes.extend(definition.nodes.iter().map(|&(redshift, weight)| Node { bin, redshift, weight }));
            nodes_of_bin.push(start..nodes.len());
        }
        let mut builder = Builder {
            abscissae: Vec::new(),
            abscissa_keys: Set::new(),
            groups: Vec::new(),
            group_keys: HashMap::new(),
            coefficients: 0,
            readings: Set::new(),
            warps: Set::new(),
            vectors: Set::new(),
            kernels: Set::new(),
            links: Vec::new(),
            combination_keys: Set::new(),
            combinations: Vec::new(),
        };
        let mut links_of_row = Vec::with_capacity(rows.len());
        for (index, row) in rows.iter().enumerate() {
            let start = builder.links.len();
            if bins[row.bin].fiducial.is_none() {
                builder.add(index, row, row.multipole, None);
            } else {
                for node in nodes_of_bin[row.bin].clone() {
                    for multipole in (row.multipole % 2..=4).step_by(2) {
                        builder.add(index, row, multipole, Some(node));
                    }
                }
            }
            links_of_row.push(start..builder.links.len());
        }
        let stations = stations(&nodes, &builder.groups);
        let components = builder.groups.iter().flat_map(|group| group.components);
        let wavenumbers = components.map(|component| component.wavenumber()).collect();
        let mut uses = vec![Vec::new(); builder.coefficients];
        let mut coefficients_of_warp = vec![Vec::new(); builder.warps.items.len()];
        for (index, combination) in builder.combinations.iter().enumerate() {
            for part in &combination.parts {
                if let Some(stretched) = part.vector.stretched {
                    uses[part.coefficient].push((index, stretched));
                    let list: &mut Vec<usize> = &mut coefficients_of_warp[stretched.warp];
                    if !list.contains(&part.coefficient) {
                        list.push(part.coefficient);
                    }
                }
            }
        }
        let readings = builder.readings.items.into_iter();
        let (kernels, links) = sorted(&builder.kernels.items, &builder.links);
        Plan {
            nodes,
            nodes_of_bin,
            stations,
            groups: builder.groups,
            coefficients: builder.coefficients,
            abscissae: builder.abscissae,
            readings: readings.map(|(abscissa, readout)| Reading { abscissa, readout }).collect(),
            warps: builder.warps.items,
            vectors: builder.vectors.items,
            kernels,
            links,
            links_of_row,
            combinations: builder.combinations,
            wavenumbers,
            uses,
            coefficients_of_warp,
        }
    }
}

/// Kernels by functional, so that its weights are still at hand for the next; and the links to them.
fn sorted(kernels: &[Pairing], links: &[Pairing]) -> (Vec<Pairing>, Vec<Pairing>) {
    let mut order: Vec<usize> = (0..kernels.len()).collect();
    order.sort_by_key(|&kernel| kernels[kernel]);
    let mut place = vec![0; kernels.len()];
    for (now, &before) in order.iter().enumerate() {
        place[before] = now;
    }
    let links = links.iter().map(|&(coefficient, kernel)| (coefficient, place[kernel])).collect();
    (order.into_iter().map(|kernel| kernels[kernel]).collect(), links)
}

/// Two indices that belong together.
type Pairing = (usize, usize);

struct Builder {
    abscissae: Vec<Abscissa>,
    abscissa_keys: Set<AbscissaKey>,
    groups: Vec<Group>,
    group_keys: HashMap<GroupKey, usize>,
    coefficients: usize,
    readings: Set<(usize, Readout)>,
    warps: Set<Warp>,
    vectors: Set<Vector>,
    kernels: Set<(usize, usize)>,
    links: Vec<(usize, usize)>,
    combination_keys: Set<CombinationKey>,
    combinations: Vec<Combination>,
}

impl Builder {
    /// Links a row to multipole `from` (its own, or where `node` is remapped one of its parity).
    fn add(&mut self, index: usize, row: &Row, from: u8, node: Option<usize>) {
        let group = self.group(row, from, node);
        let abscissa = self.abscissa(row);
        let warp = node.map(|node| self.warps.position(Warp { node, space: row.space }));
        let Group { start, components, .. } = self.groups[group];
        for (offset, &component) in components.iter().enumerate() {
            let stretched = warp.map(|warp| Stretched {
                warp,
                to: usize::from(row.multipole),
                from: usize::from(from),
                power: stretch_power(component),
            });
            let vector = Vector { wavenumber: component.wavenumber(), stretched };
            let functional = self.readings.position((abscissa, component.readout()));
            let vector_index = self.vectors.position(vector);
            let kernel = self.kernels.position((functional, vector_index));
            let coefficient = start + offset;
            self.links.push((coefficient, kernel));

            let owner = warp.unwrap_or(group);
            let end = warp.map(|_| (row.pair, row.multipole));
            let key = self.combination_keys.position((owner, end, component.readout()));
            if key == self.combinations.len() {
                self.combinations.push(Combination::default());
            }
            let Combination { parts, rows } = &mut self.combinations[key];
            let part = Part { coefficient, vector };
            if !parts.contains(&part) {
                parts.push(part);
            }
            // Rows come one after the other: a row that is in the list is its last entry.
            if rows.last().is_none_or(|(last, _)| *last != index) {
                rows.push((index, functional));
            }
        }
    }

    fn group(&mut self, row: &Row, multipole: u8, node: Option<usize>) -> usize {
        let Row { bin, pair, space, .. } = *row;
        *self.group_keys.entry((bin, pair, multipole, space, node)).or_insert_with(|| {
            let components = components(space, multipole);
            let start = self.coefficients;
            self.groups.push(Group { bin, pair, multipole, space, node, start, components });
            self.coefficients += components.len();
            self.groups.len() - 1
        })
    }

    fn abscissa(&mut self, row: &Row) -> usize {
        let edges = row.edges.map(|(low, high)| (low.to_bits(), high.to_bits()));
        let index = self.abscissa_keys.position((row.space, row.at.to_bits(), edges));
        if index == self.abscissae.len() {
            self.abscissae.push(Abscissa::of(row));
        }
        index
    }
}

fn stations(nodes: &[Node], groups: &[Group]) -> Vec<Station> {
    let at_node = |index: usize, node: &Node| {
        let here = |group: &Group| group.bin == node.bin && group.node.is_none_or(|only| only == index);
        let of_pair = |pair: Pair| -> Vec<usize> {
            (0..groups.len()).filter(|&group| here(&groups[group]) && groups[group].pair == pair).collect()
        };
        let pairs = Pair::ALL.into_iter().map(|pair| (pair, of_pair(pair)));
        Station { node: index, pairs: pairs.filter(|(_, groups)| !groups.is_empty()).collect() }
    };
    let stations = nodes.iter().enumerate().map(|(index, node)| at_node(index, node));
    stations.filter(|station| !station.pairs.is_empty()).collect()
}
