//! Delays that no place can cause.
//!
//! The wave cannot arrive later at one antenna than at another by more than the way between the two takes. A source in
//! line with two antennas reaches that limit, so a delay is impossible only when it exceeds it by more than
//! [`SLACK_SIGMAS`] of its total sigma. Where obstacles stand, an arrival may have come round one: then it must exceed the
//! limit by [`LATE_SCALES`] times the expected excess besides.

use crate::arrivals::Arrivals;
use crate::site::Site;

/// Total sigmas by which a delay may exceed what is possible.
pub const SLACK_SIGMAS: f64 = 4.0;

/// Mean excesses of an arrival round an obstacle by which a delay may exceed what the straight ways allow: an exponential
/// excess is greater once in a thousand.
pub const LATE_SCALES: f64 = 7.0;

/// A delay between two antennas that no place can cause.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ImpossibleDelay {
    /// The antenna set aside because of it (index into the antennas of the site).
    pub antenna: usize,
    /// The antenna it is compared with.
    pub against: usize,
    /// Arrival at `antenna` minus arrival at `against`, in seconds.
    pub delay_s: f64,
    /// The greatest delay possible between the two, in seconds.
    pub limit_s: f64,
    /// Total sigma of the delay, in seconds.
    pub sigma_s: f64,
}

/// Sets aside arrivals until no impossible delay is left: each time the arrival with the most impossible delays, and between
/// equals the later one, because propagation makes arrivals late and never early. Arrivals whose shapes do not fit together
/// are given back as they are.
#[must_use]
pub fn set_aside(site: &Site, arrivals: &Arrivals) -> (Arrivals, Vec<ImpossibleDelay>) {
    let mut kept = arrivals.clone();
    let mut reasons = Vec::new();
    if !arrivals.is_consistent() {
        return (kept, reasons);
    }
    loop {
        let n = kept.antennas.len();
        let found: Vec<(usize, usize, ImpossibleDelay)> = (0..n)
            .flat_map(|i| (0..n).map(move |j| (i, j)))
            .filter_map(|(i, j)| impossible(site, &kept, i, j).map(|delay| (i, j, delay)))
            .collect();
        let count = |place: usize| found.iter().filter(|(i, j, _)| *i == place || *j == place).count();
        if found.is_empty() {
            return (kept, reasons);
        }
        let worst = (0..n)
            .max_by(|&a, &b| count(a).cmp(&count(b)).then(kept.times_s[a].total_cmp(&kept.times_s[b])))
            .unwrap_or(0);
        // Of several, the pair that exceeds its limit most is the reason told.
        let reason = found
            .iter()
            .filter(|(i, j, _)| *i == worst || *j == worst)
            .max_by(|a, b| excess(&a.2).total_cmp(&excess(&b.2)));
        if let Some(&(i, _, delay)) = reason {
            reasons.push(if i == worst {
                delay
            } else {
                ImpossibleDelay {
                    antenna: delay.against,
                    against: delay.antenna,
                    delay_s: -delay.delay_s,
                    ..delay
                }
            });
        }
        kept = kept.only(|place| place != worst);
    }
}

fn excess(delay: &ImpossibleDelay) -> f64 {
    (delay.delay_s.abs() - delay.limit_s) / delay.sigma_s
}

/// Whether arrival i is later than arrival j by more than is possible.
fn impossible(site: &Site, arrivals: &Arrivals, i: usize, j: usize) -> Option<ImpossibleDelay> {
    let speed = site.air.speed_m_per_s;
    let a = site.antennas.get(arrivals.antennas[i])?;
    let b = site.antennas.get(arrivals.antennas[j])?;
    let between = a.position_m - b.position_m;
    let direction = between.try_normalize(0.0)?;
    let round_s = if site.obstacles.is_empty() { 0.0 } else { LATE_SCALES * site.priors.late_scale_s };
    let limit_s = between.norm() / speed + round_s;
    let delay_s = arrivals.times_s[i] - arrivals.times_s[j];
    let covariance = &arrivals.random_covariance_s2;
    let random = covariance[(i, i)] + covariance[(j, j)] - 2.0 * covariance[(i, j)];
    let systematic: f64 = [a, b]
        .iter()
        .map(|antenna| {
            antenna.chain_variance_s2()
                + antenna.position_sigma.variance_along_m2(&direction) / (speed * speed)
        })
        .sum();
    let sigma_s = (random + systematic).sqrt();
    (delay_s > limit_s + SLACK_SIGMAS * sigma_s).then_some(ImpossibleDelay {
        antenna: arrivals.antennas[i],
        against: arrivals.antennas[j],
        delay_s,
        limit_s,
        sigma_s,
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::site::{Air, Antenna, PositionSigma, Priors, SearchBox};
    use nalgebra::Vector3;

    fn site() -> Site {
        let antennas: Vec<Antenna> = [0.0, 2.0, 4.0, 8.0]
            .iter()
            .map(|&x| Antenna {
                name: format!("A{x}"),
                position_m: Vector3::new(x, 0.3 * x * x, 2.0),
                position_sigma: PositionSigma::Isotropic(0.001),
                delay_sigma_s: 1e-12,
                response_sigma_s: 1e-12,
            })
            .collect();
        Site {
            search: SearchBox::around(&antennas, &[]).unwrap(),
            antennas,
            assets: vec![],
            obstacles: vec![],
            air: Air { speed_m_per_s: 299_792_458.0 },
            priors: Priors::default(),
        }
    }

    #[test]
    fn two_antennas_two_metres_apart() {
        // Recomputed from geometry: 2 m / c = 6.67128 ns is the greatest delay there can be.
        let mut site = site();
        site.antennas[1].position_m = Vector3::new(2.0, 0.0, 2.0);
        let at = |delay_ns: f64| {
            let arrivals = Arrivals::independent(&[0.0, delay_ns * 1e-9], &[1e-13; 2]);
            set_aside(&site, &arrivals).1
        };
        assert!(at(6.671).is_empty());
        let reasons = at(6.75);
        assert_eq!((reasons[0].antenna, reasons[0].against), (1, 0), "the later arrival is the one to doubt");
        assert!((reasons[0].limit_s - 6.671_28e-9).abs() < 1e-14);
    }

    #[test]
    fn an_arrival_may_have_come_round_an_obstacle() {
        let mut site = site();
        let arrivals = |late_s: f64| {
            let way_s = (site.antennas[3].position_m - site.antennas[0].position_m).norm() / 299_792_458.0;
            Arrivals::independent(&[0.0, 1e-9, 2e-9, way_s + late_s], &[1e-11; 4])
        };
        let (by_20_ns, by_80_ns) = (arrivals(20e-9), arrivals(80e-9));
        assert_eq!(set_aside(&site, &by_20_ns).1.len(), 1, "in the open it is impossible");
        site.obstacles = vec![crate::obstacle::Obstacle {
            name: "house".into(),
            footprint_m: [(20.0, 0.0), (22.0, 0.0), (22.0, 2.0)]
                .map(|(x, y)| nalgebra::Vector2::new(x, y))
                .to_vec(),
            base_m: 0.0,
            top_m: 3.0,
        }];
        // Ten nanoseconds on average, seven times that once in a thousand.
        assert!(set_aside(&site, &by_20_ns).1.is_empty());
        assert_eq!(set_aside(&site, &by_80_ns).1.len(), 1);
    }

    #[test]
    fn one_arrival_far_off_is_the_one_set_aside() {
        let site = site();
        let source = Vector3::new(3.0, 9.0, 5.0);
        let mut times: Vec<f64> =
            site.antennas.iter().map(|a| (a.position_m - source).norm() / 299_792_458.0).collect();
        assert!(set_aside(&site, &Arrivals::independent(&times, &[1e-11; 4])).1.is_empty());
        for shift in [300e-9, -300e-9] {
            times[2] += shift;
            let (kept, reasons) = set_aside(&site, &Arrivals::independent(&times, &[1e-11; 4]));
            assert_eq!(kept.antennas, [0, 1, 3]);
            assert_eq!(reasons.len(), 1);
            assert_eq!(reasons[0].antenna, 2);
            assert!(reasons[0].delay_s * shift > 0.0);
            times[2] -= shift;
        }
    }
}
