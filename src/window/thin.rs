//! Thins a curve to what its plot can show: at most one point per pixel column, extremes kept.
//!
//! *Rule.* A curve with no more points than columns stays as it is. A denser one is cut into lots four columns wide, and of each
//! lot the first point, the extremes and the last stay, so a spike between two columns is still drawn to its height.

use eframe::egui::Pos2;

/// Points kept of a lot, and its width in columns.
const LOT: f32 = 4.0;

/// Thins points with rising x to one per column of the given width [points].
pub(super) fn thin(points: Vec<Pos2>, column: f32) -> Vec<Pos2> {
    let (Some(first), Some(last)) = (points.first(), points.last()) else { return points };
    let columns = ((last.x - first.x) / column).max(1.0);
    if points.len() as f32 <= columns + 1.0 {
        return points;
    }
    let origin = first.x;
    let lot_of = |point: &Pos2| ((point.x - origin) / (LOT * column)).floor();
    let mut kept: Vec<Pos2> = Vec::with_capacity(points.len().min(4096));
    for lot in points.chunk_by(|one, other| lot_of(one).total_cmp(&lot_of(other)).is_eq()) {
        let (Some(first), Some(last)) = (lot.first(), lot.last()) else { continue };
        let least = lot.iter().min_by(|one, other| one.y.total_cmp(&other.y)).unwrap_or(first);
        let greatest = lot.iter().max_by(|one, other| one.y.total_cmp(&other.y)).unwrap_or(first);
        let (one, two) = if least.x <= greatest.x { (least, greatest) } else { (greatest, least) };
        for point in [first, one, two, last] {
            if kept.last() != Some(point) {
                kept.push(*point);
            }
        }
    }
    kept
}

#[cfg(test)]
mod tests {
    use super::*;
    use eframe::egui::pos2;

    /// A resonance drawn with ever more points, at 1 and at 2 pixels a point: never more points than columns, peak kept.
    #[test]
    fn at_most_one_point_per_pixel_column_with_the_extremes_kept() {
        let width = 640.0_f32;
        for count in [2_u16, 100, 640, 641, 1_000, 5_000, 60_000] {
            for pixels_per_point in [0.8, 1.0, 2.0] {
                let at = |k: u16| {
                    let x = width * f32::from(k) / f32::from(count - 1);
                    pos2(x, 100.0 - 80.0 / (1.0 + ((x - 300.0) / 0.7).powi(2)))
                };
                let points: Vec<Pos2> = (0..count).map(at).collect();
                let top = |points: &[Pos2]| points.iter().map(|point| point.y).fold(f32::INFINITY, f32::min);
                let (before, ends) = (top(&points), (points[0], points[points.len() - 1]));
                let kept = thin(points, 1.0 / pixels_per_point);
                // One more for the far end of the last column.
                assert!(kept.len() as f32 <= width * pixels_per_point + 4.0, "{} of {count}", kept.len());
                assert!((top(&kept) - before).abs() < f32::EPSILON);
                assert_eq!((kept[0], kept[kept.len() - 1]), ends);
                assert!(kept.windows(2).all(|pair| pair[0].x <= pair[1].x));
            }
        }
    }

    #[test]
    fn a_sparse_curve_keeps_every_point() {
        let points: Vec<Pos2> = (0..50_u8).map(|k| pos2(f32::from(k) * 10.0, f32::from(k * 5 % 7))).collect();
        assert_eq!(thin(points.clone(), 1.0), points);
    }
}
