//! Which asset it is, how sure, and what else it could be.
//!
//! Hypotheses: the source is on asset a, its place uniform in the asset's capsule; or elsewhere, uniform in the search
//! box. Each has its prior and the likelihood averaged over its body.

use crate::branch_and_bound::{Search, search};
use crate::covariance::chi_square_quantile;
use crate::domain::{Capsule, Domain};
use crate::error::SolveError;
use crate::likelihood::Evaluator;
use crate::site::Site;

/// What can be said.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Statement {
    /// One asset holds at least [`SURE`].
    One,
    /// At most three assets hold [`NEARLY_ALL`] together.
    OneOf,
    /// The source is on none of the assets, with at least [`SURE`].
    Elsewhere,
    /// Nothing of the kind, or the fit is too poor to believe any of it.
    CannotTell,
}

/// Probability from which one hypothesis is named alone.
pub const SURE: f64 = 0.8;
/// Probability from which a few assets are named together.
pub const NEARLY_ALL: f64 = 0.95;
/// Assets that are named together at most.
pub const MOST_NAMED: usize = 3;
/// A fit less probable than this is not believed.
pub const POOR_FIT: f64 = 0.001;

/// The verdict over assets and elsewhere.
#[derive(Debug, Clone, PartialEq)]
pub struct Verdict {
    /// What can be said.
    pub statement: Statement,
    /// The assets named by the statement, most probable first (indices into the assets of the site).
    pub named: Vec<usize>,
    /// Probability that the statement is right: of the assets named together, or of elsewhere; of the most probable
    /// hypothesis when nothing can be told.
    pub probability: f64,
    /// Every asset with its probability, most probable first.
    pub assets: Vec<(usize, f64)>,
    /// Probability that the source is on none of them.
    pub elsewhere: f64,
}

/// Weighs the hypotheses. `everywhere` is the search over the search box; where the fit is not `believed`, nothing is
/// stated.
///
/// # Errors
/// [`SolveError`] when an asset's place is not finite.
pub(crate) fn verdict(
    evaluator: &mut Evaluator<'_>,
    site: &Site,
    everywhere: &Search,
    believed: bool,
) -> Result<Verdict, SolveError> {
    let weights: f64 = site.assets.iter().map(|asset| asset.weight).sum();
    let elsewhere_prior = if site.assets.is_empty() { 1.0 } else { site.priors.elsewhere };
    let elsewhere = everywhere
        .ln_mass()
        .map_or(f64::NEG_INFINITY, |mass| elsewhere_prior.ln() + mass - site.search.measure().ln());
    // No asset has a greater share than its best place would give it. Places that stay beyond the margin of the greatest
    // share so far add nothing worth a digit. (That share, not the best place, is the measure: a narrow peak elsewhere
    // is thinned by the whole search box.)
    let mut ceiling = -2.0 * elsewhere;
    let mut shares = Vec::with_capacity(site.assets.len());
    let mut least = Vec::with_capacity(site.assets.len());
    for asset in &site.assets {
        let capsule = Capsule::of(asset);
        let inside = search(evaluator, &capsule, ceiling)?;
        let prior = (1.0 - elsewhere_prior) * asset.weight / weights;
        let ln_share =
            inside.ln_mass().map_or(f64::NEG_INFINITY, |mass| prior.ln() + mass - capsule.measure().ln());
        ceiling = ceiling.min(-2.0 * ln_share);
        least.push(inside.least());
        shares.push(ln_share);
    }
    let greatest = shares.iter().copied().fold(elsewhere, f64::max);
    if greatest == f64::NEG_INFINITY {
        // No hypothesis explains anything: nothing to tell them apart by but the priors.
        shares = site.assets.iter().map(|a| ((1.0 - elsewhere_prior) * a.weight / weights).ln()).collect();
        return Ok(state(&shares, elsewhere_prior.ln(), false));
    }
    // With little prior for elsewhere an asset may win that the arrivals refute: its best place is as poor as a poor fit.
    let refuted = everywhere.least() + chi_square_quantile(site.search.unknowns(), 1.0 - POOR_FIT);
    let mut verdict = state(&shares, elsewhere, believed);
    if !verdict.named.is_empty() && verdict.named.iter().all(|&asset| least[asset] > refuted) {
        verdict.statement = Statement::CannotTell;
        verdict.named.clear();
    }
    Ok(verdict)
}

/// Turns the logarithms of the shares into probabilities and a statement.
fn state(ln_shares: &[f64], ln_elsewhere: f64, believed: bool) -> Verdict {
    let greatest = ln_shares.iter().copied().fold(ln_elsewhere, f64::max);
    let total: f64 = ln_shares.iter().chain([&ln_elsewhere]).map(|share| (share - greatest).exp()).sum();
    let probability = |share: f64| (share - greatest).exp() / total;
    let mut assets: Vec<(usize, f64)> = ln_shares.iter().map(|&s| probability(s)).enumerate().collect();
    assets.sort_by(|a, b| b.1.total_cmp(&a.1).then(a.0.cmp(&b.0)));
    let elsewhere = probability(ln_elsewhere);
    let leading = assets.first().map_or(0.0, |first| first.1);
    let together = (1..=MOST_NAMED.min(assets.len()))
        .map(|count| (count, assets[..count].iter().map(|asset| asset.1).sum::<f64>()))
        .find(|(_, sum)| *sum >= NEARLY_ALL);
    let (statement, named, probability) = if !believed {
        (Statement::CannotTell, 0, leading.max(elsewhere))
    } else if leading >= SURE {
        (Statement::One, 1, leading)
    } else if elsewhere >= SURE {
        (Statement::Elsewhere, 0, elsewhere)
    } else if let Some((count, sum)) = together {
        (Statement::OneOf, count, sum)
    } else {
        (Statement::CannotTell, 0, leading.max(elsewhere))
    };
    let named = assets[..named].iter().map(|asset| asset.0).collect();
    Verdict { statement, named, probability, assets, elsewhere }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn of(probabilities: &[f64], elsewhere: f64, believed: bool) -> Verdict {
        let shares: Vec<f64> = probabilities.iter().map(|p| p.ln() - 700.0).collect();
        state(&shares, elsewhere.ln() - 700.0, believed)
    }

    #[test]
    fn says_one_only_when_one_is_sure() {
        assert_eq!(of(&[0.1, 0.85, 0.02], 0.03, true).statement, Statement::One);
        assert_eq!(of(&[0.1, 0.85, 0.02], 0.03, true).named, [1]);
        let pair = of(&[0.5, 0.47, 0.01], 0.02, true);
        assert_eq!((pair.statement, pair.named), (Statement::OneOf, vec![0, 1]));
        assert_eq!(of(&[0.4, 0.3, 0.2, 0.08], 0.02, true).statement, Statement::CannotTell);
        assert_eq!(of(&[0.05, 0.05], 0.9, true).statement, Statement::Elsewhere);
    }

    #[test]
    fn believes_no_poor_fit() {
        let verdict = of(&[0.99, 0.005], 0.005, false);
        assert_eq!(verdict.statement, Statement::CannotTell);
        assert!(verdict.named.is_empty());
    }

    #[test]
    fn probabilities_sum_to_one_however_small_the_likelihood() {
        let verdict = of(&[0.2, 0.3, 0.1], 0.4, true);
        let sum: f64 = verdict.assets.iter().map(|asset| asset.1).sum::<f64>() + verdict.elsewhere;
        assert!((sum - 1.0).abs() < 1e-12);
        assert_eq!(verdict.assets[0].0, 1);
    }
}
