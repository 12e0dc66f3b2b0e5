//! From the arrivals of a visit to the sources told: combining, solving, and the document.

use arcstead_solver::{self as solver, Arrivals, Combined, Fix, SolveError, combine, consensus};
use nalgebra::{DVector, Matrix3};
use rayon::prelude::*;

use crate::arrivals_table::CaptureArrivals;
use crate::cautions;
use crate::documents::{
    Alternative, AntennaResult, AssetProbability, Bearing, CaptureCounts, Document, Ellipse, Fit, Flag,
    LocateDocument, Region, RejectedCapture, SourceResult, Statement, Verdict,
};
use crate::provenance::head;
use crate::site::Site;
use crate::visit::{TimedVisit, VisitError, Watch, pool};

/// How sources are told.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LocateOptions {
    /// Probability that the regions hold the source, between 0 and 1 (default 0.95).
    pub confidence: f64,
    /// Whether every capture is solved by itself (default false).
    pub each: bool,
    /// Threads that solve captures by themselves (default 0: one for each processor). The result does not depend on it.
    pub threads: usize,
}

impl Default for LocateOptions {
    fn default() -> Self {
        Self { confidence: 0.95, each: false, threads: 0 }
    }
}

/// Fewest captures that make a source when they are the smaller part of a visit: two may agree by chance.
const FEWEST_AGREEING: usize = 3;

/// Scatter of the captures over the scatter stated (as variances) from which nothing is stated: sigmas are wrong by a half,
/// or two sources near each other take turns, and the middle between them is nobody's place.
const SCATTERED: f64 = 2.25;

/// A capture with enough arrivals to be solved.
struct Usable<'t> {
    capture: &'t CaptureArrivals,
    arrivals: Arrivals,
}

/// What became of the captures, as it grows.
#[derive(Default)]
struct Told {
    counts: CaptureCounts,
    sources: Vec<SourceResult>,
    cautions: Vec<String>,
}

/// Tells the source of a visit: the largest set of captures that agree with each other, combined and solved. What does not
/// agree is counted as stray. With [`LocateOptions::each`] every capture is a source of its own.
///
/// No pulse, or no place that explains the arrivals, is a result: a document without sources.
///
/// `watch` is told of every capture solved by itself, and may stop that.
///
/// # Errors
/// [`VisitError::SeveralStances`] when the captures were not all taken from one stance, [`VisitError::Threads`] when the
/// threads cannot be started.
pub fn locate(
    site: &Site,
    visit: &TimedVisit,
    options: &LocateOptions,
    watch: &impl Watch,
) -> Result<LocateDocument, VisitError> {
    let stance = visit.stance()?;
    let geometry = site.geometry_of_stance(stance).unwrap_or_else(|| site.geometry.clone());
    let mut told = Told::default();
    told.counts.read = visit.arrivals.len();
    told.counts.rejected.clone_from(&visit.unreadable);

    let mut usable = Vec::new();
    for capture in &visit.arrivals {
        match usable_arrivals(&geometry, capture) {
            Ok(arrivals) => usable.push(Usable { capture, arrivals }),
            Err(reason) => reject(&mut told, capture, reason),
        }
    }
    let mut incomplete = visit.incomplete;
    if options.each {
        let solved = each(&geometry, &usable, options, watch)?;
        for (one, fix) in usable.iter().zip(solved) {
            match fix {
                Some(Ok(fix)) => {
                    told.sources.push(source(site, &geometry, &[one], &fix));
                    told.counts.used += 1;
                }
                Some(Err(error)) => reject(&mut told, one.capture, error.to_string()),
                None => incomplete = true,
            }
        }
        told.cautions.extend(cautions::of_each(&told.sources));
    } else {
        combined_source(site, &geometry, &usable, options, &mut told);
    }
    if told.sources.is_empty() {
        told.cautions.extend(cautions::of_channels(site, &visit.arrivals.iter().collect::<Vec<_>>()));
    }
    told.cautions.extend(cautions::of_missed(site, &visit.arrivals, told.counts.used));
    told.cautions.extend(visit.timing.and_then(|timing| cautions::of_band(site, &timing)));
    told.cautions.extend(cautions::of_every_result());
    let mut head = head(LocateDocument::SCHEMA, site, visit);
    head.options.insert("confidence".into(), options.confidence.into());
    head.options.insert("each".into(), options.each.into());
    Ok(LocateDocument {
        head,
        incomplete,
        captures: told.counts,
        sources: told.sources,
        cautions: told.cautions,
    })
}

/// Solves every capture by itself, in parallel; none for those that were not begun when the watch said stop.
fn each(
    geometry: &solver::Site,
    usable: &[Usable<'_>],
    options: &LocateOptions,
    watch: &impl Watch,
) -> Result<Vec<Option<Result<Fix, SolveError>>>, VisitError> {
    let solve = |one: &Usable<'_>| {
        if watch.stop() {
            return None;
        }
        let fix = solver::locate(geometry, &one.arrivals, options.confidence);
        watch.capture_done();
        Some(fix)
    };
    Ok(pool(options.threads)?.install(|| usable.par_iter().with_max_len(1).map(solve).collect()))
}

fn reject(told: &mut Told, capture: &CaptureArrivals, reason: String) {
    told.counts.rejected.push(RejectedCapture { capture: capture.capture.clone(), reason });
}

/// The arrivals of a capture, or why it cannot be solved.
fn usable_arrivals(geometry: &solver::Site, capture: &CaptureArrivals) -> Result<Arrivals, String> {
    let received: Vec<usize> =
        (0..capture.antennas.len()).filter(|&row| capture.antennas[row].arrival_s.is_some()).collect();
    let needed = geometry.search.unknowns() + 1;
    if received.is_empty() {
        return Err("no pulse above the noise".into());
    }
    if received.len() < needed {
        return Err(format!(
            "pulse on {} of {} antennas; a place needs at least {needed}",
            received.len(),
            geometry.antennas.len()
        ));
    }
    Ok(Arrivals {
        antennas: received.iter().map(|&row| capture.antennas[row].antenna).collect(),
        times_s: DVector::from_iterator(
            received.len(),
            received.iter().filter_map(|&row| capture.antennas[row].arrival_s),
        ),
        random_covariance_s2: capture.covariance_s2.select_rows(&received).select_columns(&received),
    })
}

/// Solves the largest set of captures that agree, and tells what it finds.
fn combined_source(
    site: &Site,
    geometry: &solver::Site,
    usable: &[Usable<'_>],
    options: &LocateOptions,
    told: &mut Told,
) {
    let agreed = consensus(&usable.iter().map(|one| &one.arrivals).collect::<Vec<_>>());
    let members: Vec<&Usable<'_>> = agreed.members.iter().map(|&index| &usable[index]).collect();
    let enough = members.len() >= FEWEST_AGREEING || 2 * members.len() > usable.len();
    let whole = combine(&members.iter().map(|member| &member.arrivals).collect::<Vec<_>>());
    let (Some(whole), true) = (whole, enough) else {
        told.counts.stray = usable.len();
        told.cautions.extend(cautions::of_no_agreement(usable.len()));
        return;
    };
    match solver::locate(geometry, &whole.arrivals, options.confidence) {
        Ok(fix) => {
            told.counts.used = members.len();
            told.counts.stray = usable.len() - members.len();
            let mut source = source(site, geometry, &members, &fix);
            if is_scattered(geometry, &whole) {
                source.verdict.statement = Statement::CannotTell;
                source.verdict.assets.clear();
                source.flags.push(Flag::Scattered);
            }
            let captures: Vec<&CaptureArrivals> = members.iter().map(|member| member.capture).collect();
            told.cautions.extend(cautions::of_source(site, &source, &fix, &whole, &captures));
            told.cautions.extend(cautions::of_strays(told.counts.stray, usable.len()));
            told.sources.push(source);
        }
        Err(error) => {
            told.counts.stray = usable.len();
            told.cautions.push(no_place(site, geometry, &whole, members.len(), &error));
        }
    }
}

/// Whether the captures scatter far beyond their sigmas, by more than delays, responses and survey leave open anyway: scatter of
/// picoseconds about strong pulses hides no second source.
fn is_scattered(geometry: &solver::Site, whole: &Combined) -> bool {
    let speed = geometry.air.speed_m_per_s;
    let systematic_s2: f64 = whole
        .arrivals
        .antennas
        .iter()
        .map(|&index| {
            let antenna = &geometry.antennas[index];
            let survey_m2 = antenna.position_sigma.variance_range_m2().1;
            antenna.chain_variance_s2() + survey_m2 / (speed * speed)
        })
        .sum();
    // The combined covariance is that of one capture over their number, and holds the scatter already.
    let scatter_s2 = whole.arrivals.random_covariance_s2.trace() * whole.captures as f64;
    whole.enlargement > SCATTERED && scatter_s2 > systematic_s2
}

/// Why captures that agree with each other fit no place.
fn no_place(
    site: &Site,
    geometry: &solver::Site,
    whole: &Combined,
    captures: usize,
    error: &SolveError,
) -> String {
    let (_, impossible) = solver::set_aside(geometry, &whole.arrivals);
    let reasons: Vec<String> = impossible.iter().map(|delay| cautions::of_impossible(site, delay)).collect();
    if reasons.is_empty() {
        format!("{captures} captures agree with each other, but no place can be computed: {error}")
    } else {
        format!(
            "{captures} captures agree with each other, but no place can be computed: {error}. {}",
            reasons.join(" ")
        )
    }
}

/// One source of the document.
fn source(site: &Site, geometry: &solver::Site, members: &[&Usable<'_>], fix: &Fix) -> SourceResult {
    let plane = geometry.search.is_plane();
    let matrix = |m: Matrix3<f64>| std::array::from_fn(|i| std::array::from_fn(|j| m[(i, j)]));
    let times = members.iter().filter_map(|member| member.capture.time);
    let names = |indices: &[usize]| indices.iter().map(|&a| geometry.assets[a].name.clone()).collect();
    SourceResult {
        captures: members.len(),
        position_m: fix.position_m.into(),
        covariance_m2: fix.covariance.map(|c| matrix(c.total_m2())),
        random_covariance_m2: fix.covariance.map(|c| matrix(c.random_m2)),
        systematic_covariance_m2: fix.covariance.map(|c| matrix(c.systematic_m2)),
        ellipse: fix.ellipse.map(|ellipse| Ellipse {
            confidence: ellipse.confidence,
            semi_major_m: ellipse.semi_major_m,
            semi_minor_m: ellipse.semi_minor_m,
            azimuth_deg: ellipse.azimuth_deg,
        }),
        region: Region {
            confidence: fix.region.confidence,
            volume_m3: (!plane).then_some(fix.region.measure),
            area_m2: plane.then_some(fix.region.measure),
            min_m: fix.region.min_m.into(),
            max_m: fix.region.max_m.into(),
            bounded: fix.region.bounded,
        },
        bearing: Bearing {
            from_m: fix.bearing.from_m.into(),
            azimuth_deg: fix.bearing.azimuth_deg,
            elevation_deg: fix.bearing.elevation_deg,
            azimuth_sigma_deg: Some(fix.bearing.azimuth_sigma_deg),
            elevation_sigma_deg: (!plane).then_some(fix.bearing.elevation_sigma_deg),
            range_m: Some(fix.bearing.range_m.into()),
        },
        fit: Fit {
            chi_square: fix.fit.chi_square,
            degrees_of_freedom: fix.fit.degrees_of_freedom,
            p_value: fix.fit.p_value,
        },
        antennas: antennas(site, geometry, members, fix),
        verdict: Verdict {
            statement: statement(fix.verdict.statement),
            assets: names(&fix.verdict.named),
            probability: fix.verdict.probability,
        },
        assets: fix
            .verdict
            .assets
            .iter()
            .map(|&(asset, probability)| AssetProbability {
                name: geometry.assets[asset].name.clone(),
                probability,
            })
            .collect(),
        elsewhere_probability: fix.verdict.elsewhere,
        alternatives: fix
            .modes
            .iter()
            .skip(1)
            .map(|mode| Alternative {
                position_m: mode.minimum.position_m.into(),
                probability: mode.probability,
            })
            .collect(),
        flags: fix.flags.iter().map(|&flag| flag_name(flag)).collect(),
        stances: vec![
            members.first().map_or(crate::site::MAIN_STANCE.into(), |member| member.capture.stance.clone()),
        ],
        first: times.clone().min(),
        last: times.max(),
        members: members.iter().map(|member| member.capture.capture.clone()).collect(),
    }
}

/// One row for every antenna of the site, heard or not.
fn antennas(site: &Site, geometry: &solver::Site, members: &[&Usable<'_>], fix: &Fix) -> Vec<AntennaResult> {
    site.geometry
        .antennas
        .iter()
        .enumerate()
        .map(|(index, antenna)| {
            let fitted = fix.antennas.iter().find(|fit| fit.antenna == index);
            let mut snr: Vec<f64> = members
                .iter()
                .flat_map(|member| &member.capture.antennas)
                .filter(|row| row.antenna == index)
                .filter_map(|row| row.snr_db)
                .collect();
            snr.sort_by(f64::total_cmp);
            AntennaResult {
                name: antenna.name.clone(),
                used: fitted.is_some_and(|fit| fit.used),
                residual_ns: fitted.map(|fit| fit.residual_s * 1e9),
                sigma_ns: fitted.map(|fit| fit.sigma_s * 1e9),
                snr_db: snr.get(snr.len() / 2).copied(),
                line_of_sight: fitted.map_or_else(
                    || {
                        let at_m = geometry.antennas[index].position_m;
                        !geometry.obstacles.iter().any(|o| o.blocks(&at_m, &fix.position_m))
                    },
                    |fit| fit.line_of_sight,
                ),
            }
        })
        .collect()
}

fn statement(statement: solver::Statement) -> Statement {
    match statement {
        solver::Statement::One => Statement::One,
        solver::Statement::OneOf => Statement::OneOf,
        solver::Statement::Elsewhere => Statement::Elsewhere,
        solver::Statement::CannotTell => Statement::CannotTell,
    }
}

fn flag_name(flag: solver::Flag) -> Flag {
    match flag {
        solver::Flag::FewAntennas => Flag::FewAntennas,
        solver::Flag::RangeUndetermined => Flag::RangeUndetermined,
        solver::Flag::MirrorAmbiguity => Flag::MirrorAmbiguity,
        solver::Flag::AntennaLate => Flag::AntennaLate,
        solver::Flag::AntennaEarly => Flag::AntennaEarly,
        solver::Flag::PoorFit => Flag::PoorFit,
        solver::Flag::Hidden => Flag::Hidden,
        solver::Flag::RegionTouchesSearchEdge => Flag::RegionTouchesSearchEdge,
        // A flag of the solver this document has no name for would be the worst kind to lose: it is told as the gravest.
        _ => Flag::PoorFit,
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::documents::Document;
    use crate::visit::Unwatched;
    use arcstead_core::ChannelFlags;
    use nalgebra::{DMatrix, Vector3};

    use crate::arrivals_table::AntennaArrival;

    /// Five antennas about a yard with three posts in a row; invented.
    fn site() -> Site {
        let mut text = "schema = 1\n[site]\nname = \"Test Yard\"\n".to_owned();
        let places =
            [[0.0, 0.0, 2.0], [16.0, 1.0, 4.5], [15.0, 14.0, 1.5], [1.0, 13.0, 5.0], [8.0, -3.0, 3.0]];
        for (index, [x, y, z]) in places.into_iter().enumerate() {
            let number = index + 1;
            text += &format!(
                "[[antenna]]\nname = \"A{number}\"\nchannel = {number}\nposition_m = [{x}, {y}, {z}]\n"
            );
        }
        for (name, x) in [("A", 6.0), ("B", 6.6), ("C", 7.2)] {
            text += &format!(
                "[[asset]]\nname = \"Post {name}\"\nfrom_m = [{x}, 7.0, 3.0]\nto_m = [{x}, 7.0, 5.0]\nradius_m = 0.1\n"
            );
        }
        Site::parse(&text, "site.toml").unwrap()
    }

    /// Captures of sources at these places, `sigma_s` stated, errors of it from a fixed list.
    fn visit(site: &Site, sources: &[Vector3<f64>], sigma_s: f64) -> TimedVisit {
        let mut state = 9_u64;
        let mut error = || {
            // Near enough to a normal number (a linear congruential generator; from memory).
            (0..12)
                .map(|_| {
                    state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
                    (state >> 40) as f64 / f64::from(1 << 24) - 0.5
                })
                .sum::<f64>()
        };
        let antennas = &site.geometry.antennas;
        let arrivals: Vec<CaptureArrivals> = sources
            .iter()
            .enumerate()
            .map(|(number, source_m)| CaptureArrivals {
                capture: format!("shot_{number}"),
                time: None,
                stance: crate::site::MAIN_STANCE.into(),
                antennas: (0..antennas.len())
                    .map(|antenna| {
                        let way_m = (antennas[antenna].position_m - source_m).norm();
                        AntennaArrival {
                            antenna,
                            arrival_s: Some(way_m / site.geometry.air.speed_m_per_s + sigma_s * error()),
                            sigma_s: Some(sigma_s),
                            snr_db: None,
                            flags: ChannelFlags::default(),
                        }
                    })
                    .collect(),
                covariance_s2: DMatrix::identity(antennas.len(), antennas.len()) * sigma_s.powi(2),
            })
            .collect();
        TimedVisit { captures: arrivals.len(), arrivals, ..TimedVisit::default() }
    }

    fn told(visit: &TimedVisit, site: &Site) -> LocateDocument {
        let document = locate(site, visit, &LocateOptions::default(), &Unwatched).unwrap();
        document.to_json().unwrap();
        document
    }

    const POST_A: Vector3<f64> = Vector3::new(6.0, 7.0, 4.0);
    const POST_C: Vector3<f64> = Vector3::new(7.2, 7.0, 4.0);

    #[test]
    fn one_source_is_named() {
        let site = site();
        let document = told(&visit(&site, &[POST_A; 20], 1e-10), &site);
        assert_eq!(document.sources[0].verdict.assets, ["Post A"]);
        assert!(!document.sources[0].flags.contains(&Flag::Scattered));
    }

    #[test]
    fn of_two_sources_in_turn_the_silent_post_between_them_is_never_named() {
        let site = site();
        let turns: Vec<_> = (0..40).map(|k| if k % 2 == 0 { POST_A } else { POST_C }).collect();
        for sigma_s in [1e-10, 3e-10, 6e-10, 1e-9] {
            let document = told(&visit(&site, &turns, sigma_s), &site);
            let source = &document.sources[0];
            assert_ne!(source.verdict.assets, ["Post B"], "{sigma_s}: {:?}", source.flags);
            let strays = document.captures.stray;
            assert!(strays > 10 || source.flags.contains(&Flag::Scattered), "{sigma_s}: {strays} strays");
        }
    }

    #[test]
    fn scatter_that_hides_nothing_is_no_reason_to_be_silent() {
        // Picoseconds stated, ten times as many found: still nothing beside delays of 100 ps.
        let site = site();
        let mut visit = visit(&site, &[POST_A; 20], 2e-11);
        for capture in &mut visit.arrivals {
            capture.covariance_s2 /= 100.0;
            capture.antennas.iter_mut().for_each(|row| row.sigma_s = Some(2e-12));
        }
        let document = told(&visit, &site);
        assert_eq!(document.sources[0].verdict.assets, ["Post A"]);
    }

    #[test]
    fn two_captures_that_disagree_name_nobody() {
        let site = site();
        let document = told(&visit(&site, &[POST_A, POST_C + Vector3::new(3.0, 0.0, 0.0)], 1e-10), &site);
        assert!(document.sources.is_empty());
        assert_eq!(document.captures.stray, 2);
    }

    #[test]
    fn too_few_arrivals_are_told_with_what_is_missing() {
        let site = site();
        let mut visit = visit(&site, &[POST_A; 2], 1e-10);
        for row in visit.arrivals[1].antennas.iter_mut().take(3) {
            (row.arrival_s, row.sigma_s) = (None, None);
        }
        let document = told(&visit, &site);
        assert_eq!(document.sources[0].captures, 1);
        assert_eq!(
            document.captures.rejected[0].reason,
            "pulse on 2 of 5 antennas; a place needs at least 4"
        );
    }
}
