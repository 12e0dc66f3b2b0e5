//! From arrivals to everything that is told about a source: position, region, bearing, fit, verdict, flags.

use nalgebra::Vector3;

use crate::arrivals::Arrivals;
use crate::branch_and_bound::{Cell, search};
use crate::closed_form;
use crate::covariance::{Covariance, Ellipse, chi_square_exceedance, covariance};
use crate::error::SolveError;
use crate::impossible::{ImpossibleDelay, set_aside};
use crate::least_squares::{Ended, Minimum, refine};
use crate::likelihood::{Evaluator, Likelihood};
use crate::modes::{self, Mode};
use crate::region::{self, Bearing, Region};
use crate::site::Site;
use crate::verdict::{POOR_FIT, Statement, Verdict, verdict};

/// What is told about a source.
#[derive(Debug, Clone, PartialEq)]
pub struct Fix {
    /// Best point of the mode with most posterior mass, in metres.
    pub position_m: Vector3<f64>,
    /// How the search for that point ended.
    pub ended: Ended,
    /// Covariance about it; none where the geometry leaves a direction undetermined.
    pub covariance: Option<Covariance>,
    /// Ellipse in plan of that covariance.
    pub ellipse: Option<Ellipse>,
    /// Highest-posterior-density region in the search box.
    pub region: Region,
    /// Direction and range interval from the array's centre.
    pub bearing: Bearing,
    /// How well the place explains the arrivals.
    pub fit: Fit,
    /// The arrivals used, and those set aside.
    pub antennas: Vec<AntennaFit>,
    /// Arrivals set aside because no place can cause them.
    pub set_aside: Vec<ImpossibleDelay>,
    /// Separate answers, most probable first; the first is the one told as position.
    pub modes: Vec<Mode>,
    /// Which asset it is.
    pub verdict: Verdict,
    /// What the reader must know before believing it, in a fixed order.
    pub flags: Vec<Flag>,
    /// Whether the search was refined as far as it should be; if not, region and probabilities are coarse.
    pub resolved: bool,
}

/// How well a place explains the arrivals.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Fit {
    /// Chi-square of the residuals at the position, of the antennas that see it.
    pub chi_square: f64,
    /// Antennas that see the position - 1 - unknown coordinates; zero when they are fewer.
    pub degrees_of_freedom: usize,
    /// Probability of a greater chi-square by chance; none without degrees of freedom.
    pub p_value: Option<f64>,
    /// Antennas used whose line to the position is clear: only their arrivals are known to be direct.
    pub direct: usize,
}

impl Fit {
    /// Whether the fit is too poor to believe: p below [`POOR_FIT`]. Without degrees of freedom a place that explains the
    /// arrivals has a chi-square of zero; one that is forced to the edge of the search has not, and is judged as if
    /// it had one.
    #[must_use]
    pub fn is_poor(&self) -> bool {
        let p = self.p_value.or_else(|| chi_square_exceedance(1, self.chi_square));
        p.is_some_and(|p| p < POOR_FIT)
    }
}

/// One antenna's part in a fix.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct AntennaFit {
    /// Index into the antennas of the site.
    pub antenna: usize,
    /// Whether its arrival was used.
    pub used: bool,
    /// Arrival minus what the position predicts, in seconds; for an arrival set aside, against the position found
    /// without it.
    pub residual_s: f64,
    /// Total sigma of the arrival, in seconds.
    pub sigma_s: f64,
    /// Whether the line from the position is clear.
    pub line_of_sight: bool,
}

/// What the reader must know before believing a fix.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
#[non_exhaustive]
pub enum Flag {
    /// As many unknowns as arrivals that came straight: none of them can be checked.
    FewAntennas,
    /// The direction is known, the range is not.
    RangeUndetermined,
    /// Another mode holds 0.05 or more.
    MirrorAmbiguity,
    /// The arrivals do not fit any place (p < 0.001).
    PoorFit,
    /// An arrival later than any place can cause was set aside.
    AntennaLate,
    /// An arrival earlier than any place can cause was set aside; propagation cannot do that.
    AntennaEarly,
    /// The region touches the edge of the search box.
    RegionTouchesSearchEdge,
    /// Fewer antennas than unknowns + 1 see the position, or it is on no asset and not all antennas see it: it rests on
    /// arrivals that are late by unknown amounts, and such a place explains almost anything.
    Hidden,
}

/// Share of another mode from which the answer counts as ambiguous.
pub const AMBIGUOUS: f64 = 0.05;

/// Locates the source of `arrivals` on `site`, with regions at `confidence` (0-1).
///
/// # Errors
/// [`SolveError`] when the arrivals do not fit the site, are too few (after impossible ones are set aside), or are not
/// finite, and when a number of the site or the confidence is out of its range.
pub fn locate(site: &Site, arrivals: &Arrivals, confidence: f64) -> Result<Fix, SolveError> {
    arrivals.check(site)?;
    site.check()?;
    if !(confidence > 0.0 && confidence < 1.0) {
        return Err(SolveError::Site {
            what: "the confidence",
            found: confidence,
            expected: "between 0 and 1",
        });
    }
    let unknowns = site.search.unknowns();
    let (used, impossible) = set_aside(site, arrivals);
    let received = used.antennas.len();
    if received < unknowns + 1 {
        return Err(SolveError::TooFewArrivals { received, unknowns, needed: unknowns + 1 });
    }
    let likelihood = Likelihood::new(site, &used)?;
    let mut evaluator = Evaluator::new(&likelihood);

    let starts = starts(&mut evaluator, site)?;
    let known_best = starts.iter().map(|start| start.value.minus_two_ln).fold(f64::INFINITY, f64::min);
    let everywhere = search(&mut evaluator, &site.search, known_best)?;
    let (modes, owner) = modes::find(&mut evaluator, &site.search, &everywhere.cells, starts)?;
    let Some(first) = modes.first() else { return Err(SolveError::SearchBox) };
    let best = first.minimum.clone();

    let region =
        region::highest_density(&everywhere.cells, &site.search, confidence).ok_or(SolveError::SearchBox)?;
    let main: Vec<Cell> =
        everywhere.cells.iter().zip(&owner).filter(|(_, mode)| **mode == 0).map(|(cell, _)| *cell).collect();
    let bearing = region::bearing(&main, &site.search, likelihood.array_centre_m(), confidence)
        .ok_or(SolveError::SearchBox)?;
    let covariance = covariance(&mut evaluator, &best.position_m, unknowns)?;
    let fit = fit(site, &used, &likelihood, &best)?;
    // A place that rests on arrivals late by unknown amounts explains almost anything: a wrong cable too.
    let rests_on_late = fit.direct < unknowns + 1;
    let mut verdict = verdict(&mut evaluator, site, &everywhere, !fit.is_poor() && !rests_on_late)?;
    let nothing_but_hidden = verdict.statement == Statement::Elsewhere && fit.direct < received;
    // Arrivals that nothing checks lead to some place or other: on no asset, as a rule, when one of them is wrong.
    let unchecked = verdict.statement == Statement::Elsewhere && fit.degrees_of_freedom == 0;
    if nothing_but_hidden || unchecked {
        verdict.statement = Statement::CannotTell;
    }
    let mut flags = flags(&likelihood, &fit, &bearing, &modes, &region, &impossible);
    if rests_on_late || nothing_but_hidden {
        flags.push(Flag::Hidden);
    }
    Ok(Fix {
        position_m: best.position_m,
        ended: best.ended,
        covariance,
        ellipse: covariance.map(|covariance| Ellipse::in_plan(&covariance.total_m2(), confidence)),
        region,
        bearing,
        fit,
        antennas: antenna_fits(site, arrivals, &mut evaluator, &used, &best.position_m)?,
        set_aside: impossible,
        modes,
        verdict,
        flags,
        resolved: everywhere.resolved,
    })
}

/// How well the place explains the arrivals that came straight. One that came round an obstacle checks nothing.
fn fit(site: &Site, used: &Arrivals, likelihood: &Likelihood, best: &Minimum) -> Result<Fit, SolveError> {
    let clear: Vec<bool> =
        (0..likelihood.len()).map(|index| likelihood.line_of_sight(index, &best.position_m)).collect();
    let direct = clear.iter().filter(|clear| **clear).count();
    let degrees_of_freedom = direct.saturating_sub(1 + site.search.unknowns());
    let chi_square = if direct < used.antennas.len() && direct >= 2 {
        let straight = Likelihood::new(site, &used.only(|place| clear[place]))?;
        Evaluator::new(&straight).at(&best.position_m)?.chi_square
    } else {
        best.value.chi_square
    };
    Ok(Fit {
        chi_square,
        degrees_of_freedom,
        p_value: chi_square_exceedance(degrees_of_freedom, chi_square),
        direct,
    })
}

/// Minima reached from the algebraic roots and from the middle of the search box.
fn starts(evaluator: &mut Evaluator<'_>, site: &Site) -> Result<Vec<Minimum>, SolveError> {
    let likelihood = evaluator.likelihood();
    let height_m = site.search.is_plane().then_some(site.search.min_m.z);
    let mut starts_m: Vec<Vector3<f64>> =
        closed_form::roots(likelihood.positions_m(), likelihood.ranges_m(), height_m)
            .iter()
            .map(|root| root.position_m)
            .collect();
    starts_m.push((site.search.min_m + site.search.max_m) / 2.0);
    starts_m.iter().map(|start_m| refine(evaluator, &site.search, start_m)).collect()
}

fn flags(
    likelihood: &Likelihood,
    fit: &Fit,
    bearing: &Bearing,
    modes: &[Mode],
    region: &Region,
    impossible: &[ImpossibleDelay],
) -> Vec<Flag> {
    let (near_m, far_m) = bearing.range_m;
    // About a source among the antennas the ratio of ranges from their centre says nothing.
    let array_m = likelihood
        .positions_m()
        .iter()
        .map(|position| (position - bearing.from_m).norm())
        .fold(0.0, f64::max);
    let outside = far_m > array_m;
    let range_undetermined =
        outside && (far_m > 2.0 * near_m || (bearing.range_reaches_edge && far_m > 1.2 * near_m));
    [
        (fit.degrees_of_freedom == 0, Flag::FewAntennas),
        (range_undetermined, Flag::RangeUndetermined),
        (modes.iter().skip(1).any(|mode| mode.probability >= AMBIGUOUS), Flag::MirrorAmbiguity),
        (fit.is_poor(), Flag::PoorFit),
        (impossible.iter().any(|delay| delay.delay_s > 0.0), Flag::AntennaLate),
        (impossible.iter().any(|delay| delay.delay_s < 0.0), Flag::AntennaEarly),
        (!region.bounded, Flag::RegionTouchesSearchEdge),
    ]
    .into_iter()
    .filter_map(|(holds, flag)| holds.then_some(flag))
    .collect()
}

fn antenna_fits(
    site: &Site,
    arrivals: &Arrivals,
    evaluator: &mut Evaluator<'_>,
    used: &Arrivals,
    position_m: &Vector3<f64>,
) -> Result<Vec<AntennaFit>, SolveError> {
    // Residuals of all arrivals against the emission time of those used.
    let speed = site.air.speed_m_per_s;
    let likelihood = evaluator.likelihood();
    let residuals_m = evaluator.residuals_m(position_m)?;
    let systematic_m2 = likelihood.systematic_variances_m2(position_m);
    let way_m = |index: usize| (site.antennas[index].position_m - position_m).norm();
    // From an antenna whose arrival came straight, where there is one.
    let seen = (0..likelihood.len()).find(|&index| likelihood.line_of_sight(index, position_m)).unwrap_or(0);
    let emission_s = used.times_s[seen] - way_m(used.antennas[seen]) / speed - residuals_m[seen] / speed;
    let everyone = Likelihood::new(site, arrivals)?;
    let everyones_m2 = everyone.systematic_variances_m2(position_m);
    Ok(arrivals
        .antennas
        .iter()
        .enumerate()
        .map(|(place, &antenna)| {
            let random_s2 = arrivals.random_covariance_s2[(place, place)];
            let as_used = used.antennas.iter().position(|&other| other == antenna);
            let (residual_s, systematic) = match as_used {
                Some(k) => (residuals_m[k] / speed, systematic_m2[k]),
                None => (arrivals.times_s[place] - way_m(antenna) / speed - emission_s, everyones_m2[place]),
            };
            AntennaFit {
                antenna,
                used: as_used.is_some(),
                residual_s,
                sigma_s: (random_s2 + systematic / (speed * speed)).sqrt(),
                line_of_sight: everyone.line_of_sight(place, position_m),
            }
        })
        .collect())
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::site::{Air, Antenna, PositionSigma, Priors, SearchBox};

    const SPEED: f64 = 3e8;

    fn site(places: &[[f64; 3]], min: [f64; 3], max: [f64; 3]) -> Site {
        Site {
            antennas: places
                .iter()
                .map(|&position| Antenna {
                    name: format!("{position:?}"),
                    position_m: position.into(),
                    position_sigma: PositionSigma::Isotropic(0.03),
                    delay_sigma_s: 1e-10,
                    response_sigma_s: 5e-11,
                })
                .collect(),
            assets: vec![],
            obstacles: vec![],
            air: Air { speed_m_per_s: SPEED },
            search: SearchBox { min_m: min.into(), max_m: max.into() },
            priors: Priors::default(),
        }
    }

    const SPREAD: [[f64; 3]; 6] = [
        [0.0, 0.0, 1.0],
        [16.0, 1.0, 8.0],
        [15.0, 14.0, 1.5],
        [1.0, 13.0, 9.0],
        [8.0, -3.0, 5.0],
        [9.0, 18.0, 1.0],
    ];

    fn times(site: &Site, source: [f64; 3]) -> Vec<f64> {
        let source = Vector3::from(source);
        site.antennas.iter().map(|a| (a.position_m - source).norm() / SPEED).collect()
    }

    fn fix(site: &Site, times: &[f64]) -> Fix {
        locate(site, &Arrivals::independent(times, &vec![3e-11; times.len()]), 0.95).unwrap()
    }

    #[test]
    fn a_good_geometry_raises_no_flag() {
        let site = site(&SPREAD, [-5.0, -8.0, 0.0], [22.0, 22.0, 12.0]);
        let fix = fix(&site, &times(&site, [7.0, 6.0, 5.0]));
        assert_eq!(fix.flags, []);
        assert!((fix.position_m - Vector3::new(7.0, 6.0, 5.0)).norm() < 1e-4);
        assert_eq!((fix.fit.degrees_of_freedom, fix.modes.len()), (2, 1));
        assert!(fix.resolved && fix.region.bounded && fix.ended == Ended::Converged);
        let covariance = fix.covariance.unwrap();
        assert!((covariance.total_m2() - covariance.random_m2 - covariance.systematic_m2).norm() < 1e-15);
    }

    #[test]
    fn four_antennas_check_nothing() {
        let site = site(&SPREAD[..4], [-5.0, -8.0, 0.0], [22.0, 22.0, 12.0]);
        let fix = fix(&site, &times(&site, [7.0, 6.0, 5.0]));
        assert!(fix.flags.contains(&Flag::FewAntennas));
        assert_eq!((fix.fit.degrees_of_freedom, fix.fit.p_value), (0, None));
    }

    #[test]
    fn a_small_array_sees_a_bearing_and_no_range() {
        let square = [[0.0, 0.0, 2.0], [4.0, 0.0, 3.0], [4.0, 4.0, 1.0], [0.0, 4.0, 2.5], [2.0, 2.0, 4.0]];
        let site = site(&square, [-60.0, -10.0, 0.0], [60.0, 90.0, 30.0]);
        let far = fix(&site, &times(&site, [5.0, 40.0, 12.0]));
        assert!(far.flags.contains(&Flag::RangeUndetermined), "{:?}", far.bearing);
        // Seen from the centre (2, 2, 2.5): 3 m east, 38 m north, 9.5 m up.
        assert!((far.bearing.azimuth_deg - 3.0_f64.atan2(38.0).to_degrees()).abs() < 1.5);
        assert!(far.bearing.azimuth_sigma_deg > 0.1 && far.bearing.azimuth_sigma_deg < 3.0);
        // Inside the array its range from the centre spans 2:1 for no interesting reason.
        let near = fix(&site, &times(&site, [2.2, 2.1, 2.6]));
        assert!(!near.flags.contains(&Flag::RangeUndetermined), "{:?}", near.bearing);
    }

    #[test]
    fn a_flat_array_has_a_mirror() {
        let flat: Vec<[f64; 3]> = SPREAD.iter().map(|p| [p[0], p[1], 3.0]).collect();
        let site = site(&flat, [-5.0, -8.0, -6.0], [22.0, 22.0, 12.0]);
        let fix = fix(&site, &times(&site, [7.0, 6.0, 8.0]));
        assert!(fix.flags.contains(&Flag::MirrorAmbiguity));
        let mut heights: Vec<f64> = fix.modes.iter().map(|mode| mode.minimum.position_m.z).collect();
        heights.sort_by(f64::total_cmp);
        assert!((heights[0] + 2.0).abs() < 0.01 && (heights[1] - 8.0).abs() < 0.01, "{heights:?}");
        assert!((fix.modes[0].probability - 0.5).abs() < 0.05);
    }

    #[test]
    fn times_that_fit_no_place_are_told_and_name_nobody() {
        let mut site = site(&SPREAD, [-5.0, -8.0, 0.0], [22.0, 22.0, 12.0]);
        site.assets = vec![crate::site::Asset {
            name: "post".into(),
            kind: String::new(),
            from_m: Vector3::new(7.0, 6.0, 4.0),
            to_m: Vector3::new(7.0, 6.0, 6.0),
            radius_m: 0.3,
            weight: 1.0,
        }];
        let mut times = times(&site, [7.0, 6.0, 5.0]);
        times[2] += 3e-9;
        let fix = fix(&site, &times);
        assert!(fix.flags.contains(&Flag::PoorFit));
        assert_eq!(fix.verdict.statement, crate::verdict::Statement::CannotTell);
        assert!(fix.verdict.named.is_empty());
    }

    #[test]
    fn an_impossible_arrival_is_set_aside_with_its_reason() {
        let site = site(&SPREAD, [-5.0, -8.0, 0.0], [22.0, 22.0, 12.0]);
        for (shift_s, flag) in [(200e-9, Flag::AntennaLate), (-200e-9, Flag::AntennaEarly)] {
            let mut times = times(&site, [7.0, 6.0, 5.0]);
            times[3] += shift_s;
            let fix = fix(&site, &times);
            assert!(fix.flags.contains(&flag));
            assert_eq!(fix.set_aside.iter().map(|delay| delay.antenna).collect::<Vec<_>>(), [3]);
            assert!((fix.position_m - Vector3::new(7.0, 6.0, 5.0)).norm() < 1e-3);
            let aside = fix.antennas.iter().find(|antenna| antenna.antenna == 3).unwrap();
            assert!(!aside.used && (aside.residual_s - shift_s).abs() < 1e-11);
        }
    }

    #[test]
    fn a_source_outside_the_box_touches_its_edge() {
        let site = site(&SPREAD, [-5.0, -8.0, 0.0], [22.0, 22.0, 12.0]);
        let fix = fix(&site, &times(&site, [24.0, 6.0, 5.0]));
        assert!(fix.flags.contains(&Flag::RegionTouchesSearchEdge) && !fix.region.bounded);
        assert!(site.search.contains(&fix.position_m));
    }

    #[test]
    fn on_a_plane_the_height_is_given() {
        let site = site(&SPREAD[..4], [-5.0, -8.0, 6.0], [22.0, 22.0, 6.0]);
        let fix = fix(&site, &times(&site, [7.0, 6.0, 6.0]));
        assert!((fix.position_m - Vector3::new(7.0, 6.0, 6.0)).norm() < 1e-4);
        assert_eq!(fix.fit.degrees_of_freedom, 1);
        assert!(fix.covariance.unwrap().total_m2()[(2, 2)].abs() < 1e-15);
        assert!(!fix.flags.contains(&Flag::RegionTouchesSearchEdge));
    }

    #[test]
    fn degenerate_input_gives_a_result_or_says_why_not() {
        let good = site(&SPREAD, [-5.0, -8.0, 0.0], [22.0, 22.0, 12.0]);
        let arrivals = Arrivals::independent(&times(&good, [7.0, 6.0, 5.0]), &[3e-11; 6]);
        // On an antenna; all arrivals equal; far coordinates; 64 antennas.
        let on_antenna = Vector3::from(SPREAD[1]);
        let found = fix(&good, &times(&good, SPREAD[1]));
        assert!((found.position_m - on_antenna).norm() < 0.05);
        assert!(fix(&good, &[1e-6; 6]).position_m.iter().all(|value| value.is_finite()));
        let offset = Vector3::new(1e7, -1e7, 0.0);
        let mut remote = good.clone();
        remote.antennas.iter_mut().for_each(|antenna| antenna.position_m += offset);
        remote.search = SearchBox { min_m: good.search.min_m + offset, max_m: good.search.max_m + offset };
        let found = locate(&remote, &arrivals, 0.95).unwrap();
        assert!((found.position_m - offset - Vector3::new(7.0, 6.0, 5.0)).norm() < 1e-3);
        let many: Vec<[f64; 3]> =
            (0..64).map(|i| [f64::from(i % 8) * 3.0, f64::from(i / 8) * 3.0, f64::from(i * i % 7)]).collect();
        let many = site(&many, [-5.0, -5.0, 0.0], [30.0, 30.0, 12.0]);
        let found = fix(&many, &times(&many, [7.0, 6.0, 5.0]));
        assert!((found.position_m - Vector3::new(7.0, 6.0, 5.0)).norm() < 1e-3);

        let refused = |site: &Site, arrivals: &Arrivals| locate(site, arrivals, 0.95).unwrap_err();
        let few = arrivals.only(|place| place < 3);
        assert_eq!(refused(&good, &few), SolveError::TooFewArrivals { received: 3, unknowns: 3, needed: 4 });
        let mut nan = arrivals.clone();
        nan.times_s[1] = f64::NAN;
        assert!(matches!(refused(&good, &nan), SolveError::NotFinite { .. }));
        let mut twice = arrivals.clone();
        twice.antennas[1] = 0;
        assert!(matches!(refused(&good, &twice), SolveError::AntennaIndex { index: 0, .. }));
        let one_place = site(&[[1.0, 2.0, 3.0]; 4], [-5.0; 3], [9.0; 3]);
        let equal = Arrivals::independent(&[1e-9; 4], &[3e-11; 4]);
        assert_eq!(refused(&one_place, &equal), SolveError::CoincidentAntennas);
        let mut indefinite = arrivals;
        indefinite.random_covariance_s2[(0, 1)] = 1e-18;
        indefinite.random_covariance_s2[(1, 0)] = 1e-18;
        assert_eq!(refused(&good, &indefinite), SolveError::Covariance);
    }

    /// The relay house of a bay, with a source in front of it: a delay wrong by nanoseconds must not be explained by a
    /// place behind or inside the house, which hears late and therefore explains anything.
    #[test]
    fn a_hidden_place_explains_no_wrong_cable() {
        let mut site = site(&SPREAD, [-5.0, -8.0, 0.0], [22.0, 22.0, 12.0]);
        let corner = nalgebra::Vector2::new;
        site.obstacles = vec![crate::obstacle::Obstacle {
            name: "house".into(),
            footprint_m: vec![corner(9.0, 8.0), corner(13.0, 8.0), corner(13.0, 12.0), corner(9.0, 12.0)],
            base_m: 0.0,
            top_m: 3.2,
        }];
        let right = times(&site, [12.5, 4.0, 7.0]);
        assert_eq!(fix(&site, &right).flags, []);
        for antenna in 0..6 {
            for shift_s in [-5e-9, 5e-9] {
                let mut wrong = right.clone();
                wrong[antenna] += shift_s;
                let fix = fix(&site, &wrong);
                let told = fix.flags.contains(&Flag::PoorFit) || fix.flags.contains(&Flag::Hidden);
                assert!(told, "{antenna} {shift_s}: {:?} at {:?}", fix, fix.position_m);
                assert_eq!(fix.verdict.statement, Statement::CannotTell, "{antenna} {shift_s}");
            }
        }
    }

    #[test]
    fn without_degrees_of_freedom_a_forced_place_is_a_poor_fit() {
        // The source is far outside the box: the best place in it does not explain the arrivals.
        let site = site(&SPREAD[..4], [-5.0, -8.0, 0.0], [22.0, 22.0, 12.0]);
        let fix = fix(&site, &times(&site, [90.0, 60.0, 5.0]));
        assert!(fix.flags.contains(&Flag::PoorFit), "{:?} {:?}", fix.flags, fix.fit);
        assert_eq!(fix.verdict.statement, Statement::CannotTell);
    }
}
