//! What `locate` asks of a site beyond a file without mistakes.

use nalgebra::Vector3;

use super::contents::{MAIN_STANCE, Site};
use super::mistake::{Mistake, MistakeKind, SiteError};

/// Antennas nearer to each other than this stand at the same place, in metres: no survey parts them.
const SAME_PLACE_M: f64 = 1e-3;

impl Site {
    /// Whether a position can be looked for: enough antennas (one more than unknown coordinates), no two at the same
    /// place, none inside an obstacle or a keep-out, in every stance, and none without a position; every asset in the
    /// search box and none inside an obstacle.
    ///
    /// # Errors
    /// [`SiteError::Mistakes`] with everything that stands in the way.
    pub fn ready_to_locate(&self) -> Result<(), SiteError> {
        let mut mistakes = Vec::new();
        let mut report = |(line, column): (usize, usize), kind| mistakes.push(Mistake { line, column, kind });
        let antennas = &self.geometry.antennas;
        let unknowns = self.geometry.search.unknowns();
        if antennas.len() <= unknowns {
            let place = self.places.antennas.last().copied().unwrap_or((1, 1));
            report(
                place,
                MistakeKind::TooFewAntennas { found: antennas.len(), unknowns, needed: unknowns + 1 },
            );
        }
        let main = (MAIN_STANCE, antennas.iter().map(|antenna| antenna.position_m).collect::<Vec<_>>());
        let others = self.stances.iter().map(|stance| (stance.name.as_str(), stance.positions_m.clone()));
        for (number, (stance, positions_m)) in std::iter::once(main).chain(others).enumerate() {
            // A mistake of the main stance stands at its antenna, one of another stance at that stance.
            let place = |antenna: usize| match number {
                0 => self.places.antennas[antenna],
                _ => self.places.stances[number - 1],
            };
            for (index, position_m) in positions_m.iter().enumerate() {
                let antenna = &antennas[index].name;
                if number == 0 && self.free_antennas.contains(&index) {
                    let (table, expected) =
                        (format!("[[antenna]] `{antenna}`"), "a place [x, y, z] in metres");
                    report(place(index), MistakeKind::Missing { table, key: "position_m", expected });
                    continue;
                }
                for earlier in
                    (0..index).filter(|earlier| number > 0 || !self.free_antennas.contains(earlier))
                {
                    if (positions_m[earlier] - position_m).norm() < SAME_PLACE_M {
                        let (stance, first) = (stance.to_owned(), antennas[earlier].name.clone());
                        let second = antenna.clone();
                        report(place(index), MistakeKind::CoincidentAntennas { stance, first, second });
                    }
                }
                for obstacle in
                    self.geometry.obstacles.iter().filter(|obstacle| obstacle.contains(position_m))
                {
                    let (stance, antenna) = (stance.to_owned(), antenna.clone());
                    let obstacle = obstacle.name.clone();
                    report(place(index), MistakeKind::InsideObstacle { stance, antenna, obstacle });
                }
                for keep_out in self.keep_outs.iter().filter(|keep_out| keep_out.contains(position_m)) {
                    let (stance, antenna) = (stance.to_owned(), antenna.clone());
                    let keep_out = keep_out.name.clone();
                    report(place(index), MistakeKind::InsideKeepOut { stance, antenna, keep_out });
                }
            }
        }
        for (asset, &place) in self.geometry.assets.iter().zip(&self.places.assets) {
            let search = &self.geometry.search;
            // On a plane the height of an asset is its own affair.
            let held = |point_m: &Vector3<f64>| {
                (0..search.unknowns())
                    .all(|axis| (search.min_m[axis]..=search.max_m[axis]).contains(&point_m[axis]))
            };
            if !held(&asset.from_m) || !held(&asset.to_m) {
                report(place, MistakeKind::AssetOutsideSearch { asset: asset.name.clone() });
            }
            let (from_m, to_m) = (&asset.from_m, &asset.to_m);
            let within = self.geometry.obstacles.iter().find(|o| o.contains(from_m) && o.contains(to_m));
            if let Some(obstacle) = within {
                let (asset, obstacle) = (asset.name.clone(), obstacle.name.clone());
                report(place, MistakeKind::AssetInsideObstacle { asset, obstacle });
            }
        }
        if mistakes.is_empty() {
            return Ok(());
        }
        mistakes.sort_by_key(|mistake| (mistake.line, mistake.column));
        Err(SiteError::Mistakes { path: self.path.clone(), mistakes })
    }
}
