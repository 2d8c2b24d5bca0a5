//! The model: quantities in, one number a row out.

use crate::abscissa::{Abscissa, ShellTable};
use crate::error::ModelError;
use crate::grid::WavenumberGrid;
use crate::kernels::{Integrals, Kernels, STENCIL, STEP, dot, slope};
use crate::layout::{Layout, slot};
use crate::rows::{Pair, Row, Space};
use crate::setup::ModelSetup;
use crate::state::BinState;
use crate::terms::{Component, MOST, components, weights};
use crate::tracer::Tracer;
use crate::workspace::{Workspace, damped_spectrum, linear_power};
use nalgebra::DMatrix;
use oddwell_cosmology::GrowthState;

/// One redshift of one bin.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Node {
    pub(crate) bin: usize,
    pub(crate) redshift: f64,
    weight: f64,
}

/// One multipole of one pair in one bin: the rows that share coefficients.
#[derive(Clone, Debug)]
struct Block {
    bin: usize,
    pair: Pair,
    multipole: u8,
    space: Space,
    /// Its first coefficient.
    start: usize,
    components: &'static [Component],
}

/// Where a row finds its numbers.
#[derive(Clone, Debug)]
struct RowPlan {
    block: usize,
    abscissa: usize,
    /// Index of each component's integral among the kernel values.
    kernels: Vec<usize>,
}

/// A model of all rows of a study.
///
/// Built once; each thread brings a [`Workspace`]. The quantities are one flat vector whose slots the [`Layout`] names.
/// Where [`Model::has_kernels`], `predict = kernels × coefficients`, and the kernels stay as they are as long as no slot
/// for which [`Layout::changes_kernels`] moves.
#[derive(Debug)]
pub struct Model {
    setup: ModelSetup,
    layout: Layout,
    nodes: Vec<Node>,
    nodes_of_bin: Vec<std::ops::Range<usize>>,
    blocks: Vec<Block>,
    plans: Vec<RowPlan>,
    coefficients: usize,
    grid: WavenumberGrid,
    tables: Vec<Option<ShellTable>>,
    points: Vec<Vec<(f64, f64, usize)>>,
    fourier_wavenumbers: Vec<f64>,
    kinds: Vec<(usize, Component)>,
}

fn position<T: PartialEq>(list: &mut Vec<T>, item: T) -> usize {
    list.iter().position(|known| *known == item).unwrap_or_else(|| {
        list.push(item);
        list.len() - 1
    })
}

impl Model {
    /// Lays out the quantities and tabulates the Bessel functions of every shell (tens of milliseconds for tens of
    /// shells).
    ///
    /// # Errors
    /// [`ModelError::Setup`] where a row has a multipole above 4, a position or edges that aren't above 0 and in order,
    /// or a bin that isn't there; where a bin has no node, or a redshift that isn't above 0; where separations are asked
    /// for with a damping below 0; and where `growth_index` or given growth meets a departure that matter feels.
    pub fn new(setup: ModelSetup) -> Result<Model, ModelError> {
        check(&setup)?;
        let layout = Layout::new(&setup.bins, setup.departure);
        let mut nodes = Vec::new();
        let mut nodes_of_bin = Vec::new();
        for (bin, definition) in setup.bins.iter().enumerate() {
            let start = nodes.len();
            nodes.extend(definition.nodes.iter().map(|&(redshift, weight)| Node { bin, redshift, weight }));
            nodes_of_bin.push(start..nodes.len());
        }
        let (mut blocks, mut abscissae, mut kinds) = (Vec::<Block>::new(), Vec::new(), Vec::new());
        let mut plans = Vec::with_capacity(setup.rows.len());
        let mut coefficients = 0;
        for row in &setup.rows {
            let key = (row.bin, row.pair, row.multipole, row.space);
            let known = blocks.iter().position(|b| (b.bin, b.pair, b.multipole, b.space) == key);
            let block = known.unwrap_or_else(|| {
                let components = components(row.space, row.multipole);
                let Row { bin, pair, multipole, space, .. } = *row;
                blocks.push(Block { bin, pair, multipole, space, start: coefficients, components });
                coefficients += components.len();
                blocks.len() - 1
            });
            let abscissa = position(&mut abscissae, Abscissa::of(row));
            let kernels = blocks[block].components.iter();
            let kernels = kernels.map(|&component| position(&mut kinds, (abscissa, component))).collect();
            plans.push(RowPlan { block, abscissa, kernels });
        }
        let separations = abscissae.iter().filter(|a| a.space == Space::Separation);
        let largest = separations.map(Abscissa::end).fold(0.0, f64::max);
        let grid = if largest > 0.0 {
            WavenumberGrid::new(largest, setup.smallest_damping)
        } else {
            WavenumberGrid { wavenumbers: Vec::new(), weights: Vec::new() }
        };
        let tables = abscissae
            .iter()
            .map(|abscissa| (abscissa.space == Space::Separation).then(|| ShellTable::new(abscissa, &grid)))
            .collect();
        let mut fourier_wavenumbers = Vec::new();
        let points = abscissae
            .iter()
            .map(|abscissa| {
                if abscissa.space == Space::Separation {
                    return Vec::new();
                }
                let wavenumbers = abscissa.wavenumbers().into_iter();
                wavenumbers
                    .map(|(k, weight)| {
                        let start = fourier_wavenumbers.len();
                        fourier_wavenumbers.extend(STENCIL.map(|step| k * (1.0 + STEP * step)));
                        (k, weight, start)
                    })
                    .collect()
            })
            .collect();
        Ok(Model {
            setup,
            layout,
            nodes,
            nodes_of_bin,
            blocks,
            plans,
            coefficients,
            grid,
            tables,
            points,
            fourier_wavenumbers,
            kinds,
        })
    }

    /// Where each quantity stands.
    #[must_use]
    pub fn layout(&self) -> &Layout {
        &self.layout
    }

    /// What it was built from.
    #[must_use]
    pub fn setup(&self) -> &ModelSetup {
        &self.setup
    }

    /// How many coefficients [`Model::coefficients`] writes.
    #[must_use]
    pub fn coefficient_count(&self) -> usize {
        self.coefficients
    }

    /// Whether the prediction is kernels × coefficients: not where growth or the departure depends on scale.
    #[must_use]
    pub fn has_kernels(&self) -> bool {
        !self.setup.departure.scale_dependent()
    }

    pub(crate) fn nodes(&self) -> &[Node] {
        &self.nodes
    }

    pub(crate) fn grid_wavenumbers(&self) -> &[f64] {
        &self.grid.wavenumbers
    }

    pub(crate) fn fourier_wavenumbers(&self) -> &[f64] {
        &self.fourier_wavenumbers
    }

    pub(crate) fn kernel_kinds(&self) -> &[(usize, Component)] {
        &self.kinds
    }

    pub(crate) fn integrals(&self, abscissa: usize) -> Integrals<'_> {
        Integrals { table: self.tables[abscissa].as_ref(), points: &self.points[abscissa] }
    }

    /// The state of a bin at its node `within` and wavenumber `k` (h/Mpc; only scale-dependent shapes look at it).
    ///
    /// # Errors
    /// [`ModelError`] where the background, growth or departure has no value.
    pub fn bin_state(
        &self,
        values: &[f64],
        workspace: &mut Workspace,
        bin: usize,
        within: usize,
        k: f64,
    ) -> Result<BinState, ModelError> {
        workspace.prepare_growth(self, values)?;
        self.check_departure(values)?;
        Ok(self.state(values, workspace, self.nodes_of_bin[bin].start + within, k))
    }

    fn check_departure(&self, values: &[f64]) -> Result<(), ModelError> {
        let count = self.setup.departure.parameters().len();
        for bin in 0..self.setup.bins.len() {
            let start = self.layout.departure(bin);
            self.setup.departure.check(&values[start..start + count])?;
        }
        Ok(())
    }

    fn state(&self, values: &[f64], workspace: &Workspace, node: usize, k: f64) -> BinState {
        let bin = self.nodes[node].bin;
        let start = self.layout.bin(bin);
        let epoch = workspace.epochs[node];
        let mut growth = workspace.growth.at(node, k);
        if self.setup.bins[bin].growth_given {
            growth = GrowthState {
                rate: values[start + slot::GROWTH_RATE],
                rate_slope: values[start + slot::GROWTH_SLOPE],
                ..growth
            };
        }
        let time_distortion = match workspace.background {
            Some(background) if self.setup.felt_by.reaches_light() => {
                let first = self.layout.departure(bin);
                let parameters = &values[first..first + self.setup.departure.parameters().len()];
                1.0 + self.setup.departure.tau(parameters, &background, epoch.scale_factor, k)
            }
            _ => 1.0,
        };
        let (first, second) = Tracer::pair(values, start);
        BinState {
            epoch,
            growth,
            time_distortion,
            first,
            second,
            offset: values[start + slot::OFFSET],
            sight_line: self.setup.bins[bin].sight_line,
        }
    }

    /// The block's weights of P(k, σ8 = 1), averaged over the bin's redshift nodes.
    fn block_weights(&self, values: &[f64], workspace: &Workspace, block: &Block, k: f64) -> [f64; MOST] {
        let sigma8 = values[slot::SIGMA8];
        let mut sum = [0.0; MOST];
        for node in self.nodes_of_bin[block.bin].clone() {
            let state = self.state(values, workspace, node, k);
            let pair = state.pair(block.pair, &self.setup.effects);
            let amplitude = self.nodes[node].weight * (state.growth.growth * sigma8).powi(2);
            let weights = weights(block.space, block.multipole, &pair, &self.setup.effects);
            for (total, weight) in sum.iter_mut().zip(weights) {
                *total += amplitude * weight;
            }
        }
        sum
    }

    /// The short vector that multiplies [`Model::kernels`]: `out` has [`Model::coefficient_count`] entries.
    ///
    /// # Errors
    /// [`ModelError`] where the background, growth or departure has no value, or a coefficient isn't finite.
    pub fn coefficients(
        &self,
        values: &[f64],
        workspace: &mut Workspace,
        out: &mut [f64],
    ) -> Result<(), ModelError> {
        workspace.prepare_growth(self, values)?;
        self.check_departure(values)?;
        for block in &self.blocks {
            let weights = self.block_weights(values, workspace, block, 0.0);
            let part = &mut out[block.start..block.start + block.components.len()];
            part.copy_from_slice(&weights[..block.components.len()]);
            if let Some(&value) = part.iter().find(|value| !value.is_finite()) {
                return Err(self.not_finite("coefficient", block.bin, value));
            }
        }
        Ok(())
    }

    fn not_finite(&self, term: &'static str, bin: usize, value: f64) -> ModelError {
        ModelError::NotFinite { term, bin: self.setup.bins[bin].path(), value }
    }

    /// The kernels for these quantities (only those for which [`Layout::changes_kernels`] matter). Rows × coefficients.
    ///
    /// # Errors
    /// [`ModelError`] where the spectrum has no value.
    pub fn kernels(&self, values: &[f64], workspace: &mut Workspace) -> Result<Kernels, ModelError> {
        workspace.prepare_kernels(self, values)?;
        let mut matrix = DMatrix::zeros(self.plans.len(), self.coefficients);
        for (row, plan) in self.plans.iter().enumerate() {
            let start = self.blocks[plan.block].start;
            for (index, &kernel) in plan.kernels.iter().enumerate() {
                matrix[(row, start + index)] = workspace.kernels[kernel];
            }
        }
        Ok(Kernels { matrix })
    }

    /// The prediction, one number a row: dimensionless in separation, (Mpc/h)³ in Fourier space.
    ///
    /// # Errors
    /// [`ModelError`] where the background, growth, spectrum or departure has no value, or a number isn't finite.
    pub fn predict(
        &self,
        values: &[f64],
        workspace: &mut Workspace,
        out: &mut [f64],
    ) -> Result<(), ModelError> {
        if !self.has_kernels() {
            return self.predict_by_integration(values, workspace, out);
        }
        workspace.prepare_growth(self, values)?;
        workspace.prepare_kernels(self, values)?;
        self.check_departure(values)?;
        let blocks: Vec<[f64; MOST]> =
            self.blocks.iter().map(|block| self.block_weights(values, workspace, block, 0.0)).collect();
        for (value, plan) in out.iter_mut().zip(&self.plans) {
            let kernels = plan.kernels.iter().map(|&kernel| workspace.kernels[kernel]);
            *value = kernels.zip(&blocks[plan.block]).map(|(kernel, weight)| kernel * weight).sum();
        }
        self.check_finite(out)
    }

    /// The same prediction with every coefficient inside its k integral, as a function of k: the way for growth and
    /// departures that depend on scale, and the check of the short way where they don't.
    ///
    /// # Errors
    /// As [`Model::predict`].
    pub fn predict_by_integration(
        &self,
        values: &[f64],
        workspace: &mut Workspace,
        out: &mut [f64],
    ) -> Result<(), ModelError> {
        workspace.prepare_growth(self, values)?;
        workspace.prepare_spectra(self, values)?;
        self.check_departure(values)?;
        for (index, block) in self.blocks.iter().enumerate() {
            let rows = self.plans.iter().zip(out.iter_mut()).filter(|(plan, _)| plan.block == index);
            if block.space == Space::Separation {
                let integrands = self.separation_integrands(values, workspace, block);
                for (plan, value) in rows {
                    *value = 0.0;
                    let Some(table) = &self.tables[plan.abscissa] else {
                        continue;
                    };
                    for (component, integrand) in block.components.iter().zip(&integrands) {
                        if let Component::Transform { separation, order, .. } = *component {
                            *value += dot(integrand, table.get(separation, order));
                        }
                    }
                }
            } else {
                for (plan, value) in rows {
                    let points = self.points[plan.abscissa].iter();
                    *value = points
                        .map(|&(k, weight, start)| {
                            weight * self.fourier_value(values, workspace, block, k, start)
                        })
                        .sum();
                }
            }
        }
        self.check_finite(out)
    }

    fn separation_integrands(
        &self,
        values: &[f64],
        workspace: &Workspace,
        block: &Block,
    ) -> [Vec<f64>; MOST] {
        let mut integrands: [Vec<f64>; MOST] = Default::default();
        for (&k, &power) in self.grid.wavenumbers.iter().zip(&workspace.spectra.grid) {
            let weights = self.block_weights(values, workspace, block, k);
            for ((component, integrand), weight) in block.components.iter().zip(&mut integrands).zip(weights)
            {
                if let Component::Transform { wavenumber, .. } = *component {
                    integrand.push(weight * k.powi(wavenumber) * power);
                }
            }
        }
        integrands
    }

    fn fourier_value(
        &self,
        values: &[f64],
        workspace: &Workspace,
        block: &Block,
        k: f64,
        start: usize,
    ) -> f64 {
        let power = &workspace.spectra.fourier[start..start + STENCIL.len()];
        let weights = self.block_weights(values, workspace, block, k);
        let mut sum = 0.0;
        for (index, component) in block.components.iter().enumerate() {
            sum += match *component {
                Component::Power { wavenumber } => weights[index] * k.powi(wavenumber) * power[0],
                // The derivative acts on weight × P.
                Component::Slope => {
                    let products = std::array::from_fn::<f64, 5, _>(|i| {
                        let beside = k * (1.0 + STEP * STENCIL[i]);
                        self.block_weights(values, workspace, block, beside)[index] * power[i]
                    });
                    slope(&products, k)
                }
                Component::Transform { .. } => 0.0,
            };
        }
        sum
    }

    /// The damped linear spectrum in general relativity today at any wavenumbers, (Mpc/h)³.
    ///
    /// # Errors
    /// [`ModelError::Cosmology`] where the spectrum has no value.
    pub fn spectrum(&self, values: &[f64], wavenumbers: &[f64]) -> Result<Vec<f64>, ModelError> {
        let power = linear_power(self, values, values[slot::SIGMA8])?;
        damped_spectrum(&power, values[slot::DAMPING], wavenumbers)
    }

    fn check_finite(&self, out: &[f64]) -> Result<(), ModelError> {
        match out.iter().zip(&self.plans).find(|(value, _)| !value.is_finite()) {
            Some((&value, plan)) => Err(self.not_finite("prediction", self.blocks[plan.block].bin, value)),
            None => Ok(()),
        }
    }
}

fn check(setup: &ModelSetup) -> Result<(), ModelError> {
    let fail = |what: String, value: String, rule: &'static str, way_out: &'static str| {
        Err(ModelError::Setup { what, value, rule, way_out })
    };
    for bin in &setup.bins {
        if bin.nodes.is_empty() {
            return fail(bin.path(), "no redshift".into(), "a bin needs a redshift", "give `redshift`");
        }
        for &(redshift, _) in &bin.nodes {
            if !(redshift > 0.0 && redshift.is_finite()) {
                let what = format!("{}.redshift", bin.path());
                return fail(
                    what,
                    redshift.to_string(),
                    "must be above 0",
                    "give the redshift, not a scale factor",
                );
            }
        }
        if bin.growth_given && (setup.felt_by.reaches_matter() && !setup.departure.parameters().is_empty()) {
            let what = format!("{}.growth_rate", bin.path());
            let rule = "given growth goes only with a departure felt by light";
            return fail(what, "given".into(), rule, "remove it, or let light alone feel the departure");
        }
    }
    if setup.growth_index && setup.felt_by.reaches_matter() && !setup.departure.parameters().is_empty() {
        let rule = "a growth index goes only with a departure felt by light";
        let way_out = "remove it, or let light alone feel the departure";
        return fail("prediction.growth_index".into(), "given".into(), rule, way_out);
    }
    if !(setup.smallest_damping >= 0.0 && setup.smallest_damping.is_finite()) {
        let value = setup.smallest_damping.to_string();
        return fail(
            "prediction.damping".into(),
            value,
            "must be 0 or above, in Mpc/h",
            "give 0.5 if in doubt",
        );
    }
    for (index, row) in setup.rows.iter().enumerate() {
        let what = format!("row {}", index + 1);
        if row.bin >= setup.bins.len() {
            return fail(what, format!("bin {}", row.bin), "its bin must exist", "give the index of a bin");
        }
        if row.multipole > 4 {
            return fail(what, format!("multipole {}", row.multipole), "must be 0 to 4", "remove the row");
        }
        let (low, high) = row.edges.unwrap_or((0.0, f64::MAX));
        if !(row.at > 0.0 && row.at.is_finite() && low >= 0.0 && low < high) {
            let value = format!("{} in {low}–{high}", row.at);
            return fail(what, value, "positions are above 0 and edges in order", "correct the table");
        }
    }
    Ok(())
}
