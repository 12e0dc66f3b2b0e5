//! The captures of a visit that tell of one and the same source.
//!
//! Captures of one source agree in their delays to within their covariances, whatever the systematic errors,
//! because those are the same in each. The largest set that agrees is the source; the rest is stray.

use crate::arrivals::Arrivals;
use crate::combine::{combine, disagreement};
use crate::covariance::chi_square_quantile;

/// Captures sorted into those of one source and the rest.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Consensus {
    /// Indices of the captures that agree, ascending.
    pub members: Vec<usize>,
    /// Indices of the others, ascending.
    pub strays: Vec<usize>,
}

/// A capture of the source lies outside with this probability, once its sigma is right.
const MISSED: f64 = 1e-4;
/// Captures whose sigmas are too small by up to this factor still find each other, once too few do at their own sigmas.
const SIGMA_SLACK: f64 = 3.0;
/// Share of the captures that must agree at their own sigmas: with less, the sigmas are taken to be too small. Sources that
/// take turns hold more each, unless there are more than three.
const HONEST_SHARE: f64 = 0.3;
/// Captures tried as the seed of the set; spread over the visit.
const SEEDS: usize = 64;
const ROUNDS: usize = 20;

/// Finds the largest set of captures that agree. Captures with fewer than three arrivals cannot be told apart and are
/// never members.
#[must_use]
pub fn consensus(captures: &[&Arrivals]) -> Consensus {
    let usable: Vec<usize> = (0..captures.len()).filter(|&k| captures[k].antennas.len() >= 3).collect();
    let most = captures.iter().map(|capture| capture.antennas.len()).max().unwrap_or(0);
    let limits: Vec<f64> = (0..most).map(|degrees| chi_square_quantile(degrees, 1.0 - MISSED)).collect();
    let near = |reference: &Arrivals, k: usize, slack: f64| {
        disagreement(reference, captures[k])
            .is_some_and(|(distance, degrees)| degrees >= 2 && distance <= slack * limits[degrees])
    };
    let step = usable.len().div_ceil(SEEDS).max(1);
    let largest_around_a_seed = |slack: f64| {
        let mut largest: Vec<usize> = Vec::new();
        for &seed in usable.iter().step_by(step) {
            let around: Vec<usize> =
                usable.iter().copied().filter(|&k| near(captures[seed], k, slack)).collect();
            if around.len() > largest.len() {
                largest = around;
            }
            // A set that holds more than half is the one to begin from; the rounds below find the rest of it.
            if 2 * largest.len() > usable.len() {
                break;
            }
        }
        largest
    };
    // At their own sigmas first: two sources near each other would melt into one between them at any slack.
    let mut members = largest_around_a_seed(1.0);
    if (members.len() as f64) < HONEST_SHARE * usable.len() as f64 {
        members = largest_around_a_seed(SIGMA_SLACK.powi(2));
    }
    for _ in 0..ROUNDS {
        let chosen: Vec<&Arrivals> = members.iter().map(|&k| captures[k]).collect();
        let Some(whole) = combine(&chosen) else { break };
        let slack = whole.enlargement.min(SIGMA_SLACK.powi(2));
        let next: Vec<usize> = usable.iter().copied().filter(|&k| near(&whole.arrivals, k, slack)).collect();
        if next == members || next.is_empty() {
            break;
        }
        members = next;
    }
    let strays = (0..captures.len()).filter(|k| members.binary_search(k).is_err()).collect();
    Consensus { members, strays }
}

#[cfg(test)]
mod tests {
    use super::*;
    use rand::SeedableRng;
    use rand_chacha::ChaCha8Rng;
    use rand_distr::{Distribution, StandardNormal};

    fn visit(of_each: &[(usize, [f64; 4])], true_over_stated: f64) -> Vec<Arrivals> {
        let mut rng = ChaCha8Rng::seed_from_u64(8);
        let sigma_s = 5e-11;
        of_each
            .iter()
            .flat_map(|&(count, times_ns)| std::iter::repeat_n(times_ns, count))
            .map(|times_ns| {
                let times = times_ns.map(|time| {
                    let error: f64 = StandardNormal.sample(&mut rng);
                    time * 1e-9 + true_over_stated * sigma_s * error
                });
                Arrivals::independent(&times, &[sigma_s; 4])
            })
            .collect()
    }

    #[test]
    fn one_source_is_one_set_even_with_sigmas_too_small() {
        for ratio in [1.0, 2.0] {
            let all = visit(&[(300, [0.0, 5.0, 9.0, 2.0])], ratio);
            let found = consensus(&all.iter().collect::<Vec<_>>());
            assert!(found.strays.len() <= 4, "{} strays at ratio {ratio}", found.strays.len());
        }
    }

    #[test]
    fn what_does_not_agree_is_stray() {
        let all =
            visit(&[(30, [0.0, 5.0, 9.0, 2.0]), (10, [0.0, 1.0, 3.0, 2.0]), (1, [7.0, 0.0, 30.0, 2.0])], 1.0);
        let found = consensus(&all.iter().collect::<Vec<_>>());
        assert_eq!(found.members, (0..30).collect::<Vec<_>>());
        assert_eq!(found.strays.len(), 11);
    }

    #[test]
    fn sources_that_take_turns_do_not_melt() {
        // Twenty sigmas apart, equally many captures: within three times their sigmas of a place between them.
        let all = visit(&[(20, [0.0, 5.0, 9.0, 2.0]), (20, [0.0, 5.4, 8.8, 2.3])], 1.0);
        let found = consensus(&all.iter().collect::<Vec<_>>());
        assert!(found.members.len() >= 18 && found.members.len() <= 20, "{:?}", found.members);
        let first = found.members[0] < 20;
        assert!(found.members.iter().all(|&k| (k < 20) == first), "{:?}", found.members);
    }

    #[test]
    fn nothing_gives_nothing() {
        assert_eq!(consensus(&[]), Consensus::default());
        let lonely = Arrivals::independent(&[0.0, 1e-9], &[1e-11; 2]);
        assert_eq!(consensus(&[&lonely]), Consensus { members: vec![], strays: vec![0] });
    }
}
