//! The model: quantities in, one number a row out.

use crate::check::check;
use crate::error::ModelError;
use crate::functionals::{Functionals, dot, variance};
use crate::growth::GrowthTable;
use crate::kernels::Kernels;
use crate::knots::Knots;
use crate::layout::{Layout, slot};
use crate::plan::Plan;
use crate::remapping::{LARGEST_STRETCH, Stretch};
use crate::rows::Space;
use crate::setup::{Effects, ModelSetup};
use crate::spectrum::SpectrumValues;
use crate::state::BinState;
use crate::workspace::Workspace;
use nalgebra::DMatrix;
use oddwell_cosmology::{Epoch, GrowthSolver, PowerShape, RawPower, Wavenumbers};

/// Below this wavenumber (h/Mpc) nothing reaches the separations that surveys measure: the integrands fall at least as
/// k², and the part left out is below 1e-7 of ⟦P/k²⟧ at 200 Mpc/h, less of all others.
pub(crate) const SMALLEST: f64 = 1e-4;
/// Where damping is small, integrals end here: linear theory says nothing there, and the part left out is below the
/// damping's own effect.
const LARGEST: f64 = 40.0;
/// k·damping at the upper end: the integrand has fallen by e^(−4.3²) = 1e-8.
const DAMPED: f64 = 4.3;

/// A model of all rows of a study.
///
/// Built once; each thread brings a [`Workspace`]. The quantities are one flat vector whose slots the [`Layout`] names.
/// Where [`Model::has_kernels`], `predict = kernels × coefficients`, and the kernels stay as they are as long as no slot
/// for which [`Layout::changes_kernels`] moves.
///
/// Accuracy, for separations of 10 to 250 Mpc/h, against the same integrals done directly on a far finer grid: 5e-8 of each
/// even multipole's largest value and 5e-7 of each odd one's for backgrounds around ours, growth that depends on scale
/// included, and 1e-6 for half or twice its matter.
#[derive(Debug)]
pub struct Model {
    setup: ModelSetup,
    layout: Layout,
    plan: Plan,
    /// The fiducial background at each node that is remapped.
    fiducial: Vec<Option<Epoch>>,
    knots: Knots,
    functionals: Functionals,
    /// Weights of the knots that give σ8² of the undamped shape; a table has its own σ8², which never changes.
    variance: Variance,
    growth_solver: GrowthSolver,
    growth_table: Option<GrowthTable>,
}

#[derive(Debug)]
enum Variance {
    Weights(Vec<f64>),
    Fixed(f64),
}

/// Where k integrals over separations end, h/Mpc.
pub(crate) fn end_of_integrals(damping: f64) -> f64 {
    (DAMPED / damping).min(LARGEST)
}

/// The wavenumbers (h/Mpc) that a model needs.
#[derive(Clone, Copy, Debug)]
struct Reach {
    /// Where knots begin and end.
    low: f64,
    high: f64,
    /// Where integrals over separations end.
    end: f64,
    /// Where rows in Fourier space stand, whose odd multipoles take dP/dk.
    slopes: Option<(f64, f64)>,
}

impl Reach {
    fn new(setup: &ModelSetup, plan: &Plan) -> Reach {
        let separations = plan.abscissae.iter().any(|abscissa| abscissa.space == Space::Separation);
        let end = end_of_integrals(setup.smallest_damping);
        let remapped = setup.bins.iter().any(|bin| bin.fiducial.is_some());
        // A table must reach no farther than it has to; else the knots are the same whether or not there is a fiducial.
        let table = matches!(setup.power, PowerShape::Table(_));
        let stretch = if remapped || !table { LARGEST_STRETCH } else { 1.0 };
        let fourier = plan.abscissae.iter().filter(|abscissa| abscissa.space == Space::Fourier);
        let slopes = fourier.fold(None, |range: Option<(f64, f64)>, abscissa| {
            let (low, high) = (abscissa.start() / stretch, abscissa.end() * stretch);
            Some(range.map_or((low, high), |(from, to)| (from.min(low), to.max(high))))
        });
        // One wavenumber is no panel yet.
        let slopes =
            slopes.map(|(low, high)| if low < high { (low, high) } else { (0.99 * low, 1.01 * high) });
        // A table has no tail for σ8.
        let (low, high) = match slopes {
            Some(range) if table && !separations => range,
            Some((low, high)) => (low.min(SMALLEST), high.max(end)),
            None => (SMALLEST, end),
        };
        Reach { low, high, end, slopes }
    }
}

impl Model {
    /// Lays out the quantities and works out what turns a spectrum into each row (tens of milliseconds for tens of
    /// shells).
    ///
    /// # Errors
    /// [`ModelError::Setup`] where a row has a multipole above 4, a position or edges that aren't above 0 and in order,
    /// or a bin that isn't there; where a bin has no node, or a redshift that isn't above 0; where separations are asked
    /// for with a damping below 0; and where `growth_index` or given growth meets a departure that matter feels.
    /// [`ModelError::Cosmology`] where a fiducial background has no past at a bin's redshift.
    pub fn new(setup: ModelSetup) -> Result<Model, ModelError> {
        check(&setup)?;
        let layout = Layout::new(&setup.bins, setup.departure);
        let plan = Plan::new(&setup.bins, &setup.rows);
        let fiducial = plan
            .nodes
            .iter()
            .map(|node| {
                setup.bins[node.bin].fiducial.map(|background| background.epoch(node.redshift)).transpose()
            })
            .collect::<Result<_, _>>()?;
        let Reach { low, high, end, slopes } = Reach::new(&setup, &plan);
        let knots = Knots::new(&setup.power, (low, high), &[SMALLEST, end], slopes)?;
        let functionals = Functionals::new(&knots, &plan.abscissae, &plan.readings, end);
        let variance = match &setup.power {
            // A table looks at none of these numbers.
            PowerShape::Table(_) => {
                Variance::Fixed(RawPower::new(&setup.power, 0.3, 0.05, 0.7, 1.0)?.variance())
            }
            _ => Variance::Weights(variance(&knots)),
        };
        let scale_factors: Vec<f64> = plan.nodes.iter().map(|node| 1.0 / (1.0 + node.redshift)).collect();
        let growth_solver = GrowthSolver::new(&scale_factors)?;
        let scale_dependent = setup.departure.scale_dependent() && setup.felt_by.reaches_matter();
        let growth_table = scale_dependent.then(|| GrowthTable::new(&knots)).transpose()?;
        Ok(Model { setup, layout, plan, fiducial, knots, functionals, variance, growth_solver, growth_table })
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
        self.plan.coefficients
    }

    /// Whether the prediction is kernels × coefficients: not where growth or the departure depends on scale.
    #[must_use]
    pub fn has_kernels(&self) -> bool {
        !self.setup.departure.scale_dependent()
    }

    pub(crate) fn plan(&self) -> &Plan {
        &self.plan
    }

    pub(crate) fn fiducial(&self) -> &[Option<Epoch>] {
        &self.fiducial
    }

    pub(crate) fn knots(&self) -> &Knots {
        &self.knots
    }

    pub(crate) fn functionals(&self) -> &Functionals {
        &self.functionals
    }

    pub(crate) fn growth_solver(&self) -> &GrowthSolver {
        &self.growth_solver
    }

    pub(crate) fn growth_table(&self) -> Option<&GrowthTable> {
        self.growth_table.as_ref()
    }

    /// Refuses stretches beyond the range of the knots: separations integrate over all wavenumbers, but Fourier rows
    /// would read beyond the end.
    pub(crate) fn check_stretches(&self, stretches: &[Option<Stretch>]) -> Result<(), ModelError> {
        for warp in self.plan.warps.iter().filter(|warp| warp.space == Space::Fourier) {
            match stretches[warp.node] {
                Some(stretch) if !stretch.is_tabulated() => {
                    return Err(ModelError::Remapping {
                        bin: self.setup.bins[self.plan.nodes[warp.node].bin].path(),
                        along: stretch.along,
                        across: stretch.across,
                        limit: LARGEST_STRETCH,
                    });
                }
                _ => {}
            }
        }
        Ok(())
    }

    /// The spectrum for σ8 = 1 at the knots.
    pub(crate) fn fill_spectrum(
        &self,
        values: &[f64],
        smooth: &mut Vec<f64>,
        out: &mut Vec<f64>,
    ) -> Result<(), ModelError> {
        let variance = |_: &RawPower, spectrum: &[f64]| match &self.variance {
            Variance::Weights(weights) => dot(weights, spectrum),
            Variance::Fixed(variance) => *variance,
        };
        let wavenumbers = self.knots.wavenumbers();
        SpectrumValues::read(values).fill(&self.setup.power, wavenumbers, variance, smooth, out)
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
        let node = self.plan.nodes_of_bin[bin].start + within;
        let growth = workspace.growth.at(node, k, self.growth_table());
        let distortion = self.time_distortion(values, workspace, node, k);
        Ok(self.state(values, workspace, node, growth, distortion))
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
        self.fill_coefficients(values, workspace, &self.setup.effects, out)
    }

    pub(crate) fn not_finite(&self, term: &'static str, bin: usize, value: f64) -> ModelError {
        ModelError::NotFinite { term, bin: self.setup.bins[bin].path(), value }
    }

    /// The kernels for these quantities (only those for which [`Layout::changes_kernels`] matter). Rows × coefficients.
    ///
    /// # Errors
    /// [`ModelError`] where the spectrum (or, where a bin is remapped, the background) has no value.
    pub fn kernels(&self, values: &[f64], workspace: &mut Workspace) -> Result<Kernels, ModelError> {
        if !self.plan.warps.is_empty() {
            workspace.prepare_growth(self, values)?;
        }
        workspace.prepare_kernels(self, values)?;
        let mut matrix = DMatrix::zeros(self.setup.rows.len(), self.plan.coefficients);
        for (row, links) in self.plan.links_of_row.iter().enumerate() {
            for &(coefficient, kernel) in &self.plan.links[links.clone()] {
                matrix[(row, coefficient)] = workspace.kernels[kernel];
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
        self.predict_effects(values, workspace, &self.setup.effects, out)
    }

    /// [`Model::predict`] for other effects than the setup's.
    pub(crate) fn predict_effects(
        &self,
        values: &[f64],
        workspace: &mut Workspace,
        effects: &Effects,
        out: &mut [f64],
    ) -> Result<(), ModelError> {
        workspace.prepare_growth(self, values)?;
        if !self.has_kernels() {
            workspace.prepare_spectrum(self, values)?;
            self.integrate(values, workspace, effects, out)?;
            return self.check_finite(out);
        }
        workspace.prepare_kernels(self, values)?;
        let mut coefficients = std::mem::take(&mut workspace.buffers.coefficients);
        coefficients.resize(self.plan.coefficients, 0.0);
        let result = self.fill_coefficients(values, workspace, effects, &mut coefficients);
        if result.is_ok() {
            for (value, links) in out.iter_mut().zip(&self.plan.links_of_row) {
                let links = self.plan.links[links.clone()].iter();
                *value = links.map(|&(of, kernel)| coefficients[of] * workspace.kernels[kernel]).sum();
            }
        }
        workspace.buffers.coefficients = coefficients;
        result?;
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
        workspace.prepare_spectrum(self, values)?;
        self.integrate(values, workspace, &self.setup.effects, out)?;
        self.check_finite(out)
    }

    /// The linear spectrum in general relativity today at any wavenumbers, damped and smeared as in a prediction, (Mpc/h)³.
    ///
    /// # Errors
    /// [`ModelError::Cosmology`] where the spectrum has no value.
    pub fn spectrum(&self, values: &[f64], wavenumbers: &[f64]) -> Result<Vec<f64>, ModelError> {
        let wavenumbers = Wavenumbers::new(wavenumbers.to_vec())?;
        let sigma8 = values[slot::SIGMA8];
        let variance = |raw: &RawPower, _: &[f64]| raw.variance() / (sigma8 * sigma8);
        let (mut smooth, mut out) = (Vec::new(), Vec::new());
        SpectrumValues::read(values).fill(
            &self.setup.power,
            &wavenumbers,
            variance,
            &mut smooth,
            &mut out,
        )?;
        Ok(out)
    }

    fn check_finite(&self, out: &[f64]) -> Result<(), ModelError> {
        match out.iter().zip(&self.setup.rows).find(|(value, _)| !value.is_finite()) {
            Some((&value, row)) => Err(self.not_finite("prediction", row.bin, value)),
            None => Ok(()),
        }
    }
}
