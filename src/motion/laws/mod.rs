//! Laws of loss, each fitted to the record, and which of them the record rules out.
//!
//! To add a law: a file here, and a row in [`LAWS`].

mod dry;
mod none;
mod viscous;

use super::least_squares::LeastSquaresError;
use super::noise::STRUCTURED_LAG1;
use super::readings::Readings;
use super::sinusoid::Sinusoid;
use crate::stats::f_upper;
use crate::uncertainty::prefixed;

/// A law is ruled out by the nested test where its misfit would be so large by chance less often than this, as a 95 % interval rules out.
const SIGNIFICANCE: f64 = 0.05;
/// A law is ruled out by AICc where another one's is lower by more than this: its relative likelihood is then below e⁻⁵ = 0.7 %.
const AICC_MARGIN: f64 = 10.0;

/// A law is ruled out where its residuals are no noise and lie near ω. This is the variance enlargement there, over the readings in a
/// cycle, from which they do: a third is reached where all lie there.
const NEAR_OMEGA_SHARE: f64 = 1.0 / 6.0;

/// The laws tried, the simplest first.
const LAWS: [Law; 3] = [none::LAW, viscous::LAW, dry::LAW];

/// A law of loss: how it is called, which law contains it, and how it is fitted.
#[derive(Debug)]
pub(super) struct Law {
    key: &'static str,
    /// In the middle of a sentence: `without loss`.
    described: &'static str,
    /// Key of the law that becomes this one where one of its parameters is held.
    nested_in: Option<&'static str>,
    fit: fn(&Weighted) -> Result<LawFit, LeastSquaresError>,
}

/// What a law is fitted to.
#[derive(Debug)]
pub(super) struct Weighted<'a> {
    pub(super) readings: &'a Readings,
    /// 1/σ of each reading, m⁻¹.
    pub(super) weight_per_m: &'a [f64],
    /// The damped sinusoid found, where every law starts.
    pub(super) start: Sinusoid,
    /// Factor by which variances grow for autocorrelation.
    pub(super) enlargement: f64,
    /// Degrees of freedom of the enlarged variance.
    pub(super) degrees_of_freedom: f64,
}

/// A law's best fit.
#[derive(Debug)]
pub(super) struct LawFit {
    /// Name, value, standard uncertainty (None where held), UCUM unit.
    parameters: Vec<(&'static str, f64, Option<f64>, &'static str)>,
    sum_of_squares: f64,
    n_free: usize,
    /// Variance enlargement of this law's own residuals.
    enlargement: f64,
    /// Lag-1 autocorrelation of this law's own residuals.
    autocorrelation_lag1: f64,
}

/// One law of loss, fitted to the record.
#[derive(Clone, Debug, PartialEq)]
pub struct LawTrial {
    /// Key: `none`, `viscous`, `dry`
    pub law: &'static str,
    /// Name, value, standard uncertainty (None where held), UCUM unit.
    pub parameters: Vec<(&'static str, f64, Option<f64>, &'static str)>,
    /// Weighted residual rms, in m.
    pub rms_m: f64,
    /// AICc with the effective number of observations.
    pub aicc: f64,
    /// True where the nested test or AICc rules the law out.
    pub excluded: bool,
    /// Why, with the figures, in one sentence.
    pub reason: String,
}

/// Fits every law and says which are ruled out: one that is nested in another by the F test at 5 %, any by AICc.
///
/// F = [(SS₁ − SS₂)/(p₂ − p₁)]/(enlargement·SS₂/(n − p₂)); AICc = n′ ln(SS/n) + 2k + 2k(k + 1)/(n′ − k − 1), with n′ = n/enlargement and k = p + 1.
/// AICc takes the smallest enlargement of all laws: what a wrong law leaves over looks like correlated noise and would shield it.
/// A law that finds no minimum is left out.
///
/// # Source
/// [Hurvich and Tsai 1989](crate::sources::HurvichTsai89) for AICc.
pub(super) fn trials(weighted: &Weighted) -> Vec<LawTrial> {
    let fits: Vec<(&Law, LawFit)> = LAWS
        .iter()
        .filter_map(|law| Some((law, (law.fit)(weighted).ok()?)))
        .collect();
    let enlargement = fits
        .iter()
        .map(|(_, fit)| fit.enlargement)
        .fold(weighted.enlargement, f64::min);
    let n_effective = weighted.readings.len() as f64 / enlargement;
    let lowest = fits
        .iter()
        .map(|(_, fit)| aicc(fit, weighted, n_effective))
        .fold(f64::INFINITY, f64::min);
    let trial = |(law, fit): &(&Law, LawFit)| {
        let container = fits
            .iter()
            .find(|(other, _)| law.nested_in == Some(other.key));
        let aicc = aicc(fit, weighted, n_effective);
        let (excluded, reason) = judge(
            law,
            fit,
            container.map(|(law, fit)| (*law, fit)),
            aicc - lowest,
            weighted,
        );
        LawTrial {
            law: law.key,
            parameters: fit.parameters.clone(),
            rms_m: rms_m(fit, weighted),
            aicc,
            excluded,
            reason,
        }
    };
    fits.iter().map(trial).collect()
}

fn judge(
    law: &Law,
    fit: &LawFit,
    container: Option<(&Law, &LawFit)>,
    above_lowest: f64,
    weighted: &Weighted,
) -> (bool, String) {
    let structured = fit.autocorrelation_lag1 > STRUCTURED_LAG1
        && fit.enlargement > NEAR_OMEGA_SHARE * readings_per_cycle(weighted);
    let by_aicc = above_lowest > AICC_MARGIN || structured;
    let verdict = |excluded: bool| {
        if excluded {
            "ruled out"
        } else {
            "not ruled out"
        }
    };
    if let Some((wider, wider_fit)) = container {
        let extra = (wider_fit.n_free - fit.n_free) as f64;
        let variance = weighted.enlargement * wider_fit.sum_of_squares
            / (weighted.readings.len() - wider_fit.n_free) as f64;
        let f = if variance > 0.0 {
            (fit.sum_of_squares - wider_fit.sum_of_squares).max(0.0) / extra / variance
        } else {
            0.0
        };
        let p = f_upper(f, extra, weighted.degrees_of_freedom);
        let excluded = p < SIGNIFICANCE || by_aicc;
        let chance = if p < 1e-4 {
            "p < 0.0001".to_owned()
        } else {
            format!("p = {p:.4}")
        };
        let reason = format!(
            "Motion {} leaves {} rms, motion {} {} ({chance}), so it is {}.",
            law.described,
            prefixed(rms_m(fit, weighted), "m", 2),
            wider.described,
            prefixed(rms_m(wider_fit, weighted), "m", 2),
            verdict(excluded),
        );
        return (excluded, reason);
    }
    let left = prefixed(rms_m(fit, weighted), "m", 2);
    let criterion = if structured {
        format!(
            "that is no noise (lag-1 autocorrelation {:.2}, limit {STRUCTURED_LAG1})",
            fit.autocorrelation_lag1
        )
    } else if above_lowest > 0.0 {
        format!("its AICc lies {above_lowest:.1} above the lowest (limit {AICC_MARGIN})")
    } else {
        "its AICc is the lowest".to_owned()
    };
    let reason = format!(
        "Motion {} leaves {left} rms; {criterion}, so it is {}.",
        law.described,
        verdict(by_aicc)
    );
    (by_aicc, reason)
}

fn readings_per_cycle(weighted: &Weighted) -> f64 {
    std::f64::consts::TAU / weighted.start.omega_rad_per_s / weighted.readings.interval_s()
}

/// √(Σ w²r²/Σ w²).
fn rms_m(fit: &LawFit, weighted: &Weighted) -> f64 {
    (fit.sum_of_squares / weighted.weight_per_m.iter().map(|w| w * w).sum::<f64>()).sqrt()
}

fn aicc(fit: &LawFit, weighted: &Weighted, n_effective: f64) -> f64 {
    let n = weighted.readings.len() as f64;
    let k = fit.n_free as f64 + 1.0;
    // Where hardly more effective readings than parameters are left the correction has no meaning; 1 keeps it finite and large.
    let room = (n_effective - k - 1.0).max(1.0);
    // A fit without residuals would have −∞: the smallest positive number stands for what rounding hides.
    n_effective * (fit.sum_of_squares / n).max(f64::MIN_POSITIVE).ln()
        + 2.0 * k
        + 2.0 * k * (k + 1.0) / room
}
