//! Round steps, the colour scale's end, the steps of potential, and numbers as a reader writes them.

use super::Panel;
use crate::union::Sets;
use rayon::prelude::*;

/// Bins of the area count from which quantiles are read.
const BINS: usize = 4096;

/// What the colours and the equipotentials stand for, common to all panels.
#[derive(Debug, Clone, PartialEq)]
pub struct Scale {
    /// Value of the last colour.
    pub top: f64,
    /// Distance of the ticks.
    pub tick: f64,
    /// The greatest value of all.
    pub peak: f64,
    /// Per panel: its equipotentials; `None` where the potential is the same everywhere.
    pub potentials: Vec<Option<Potentials>>,
}

/// The equipotentials of one panel.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Potentials {
    /// Their step, mV.
    pub step: f64,
    /// First and last number of those drawn.
    pub levels: (i64, i64),
}

impl Scale {
    /// The scales of panels whose lists were checked. `peak` stands for the greatest value, which depends on the mesh.
    pub fn new(panels: &[Panel], peak: Option<f64>) -> Self {
        let values = || panels.iter().flat_map(|p| p.triangles.iter().zip(&p.values).map(move |(t, &v)| (v, sized(p, t))));
        let peak = peak.unwrap_or_else(|| values().fold(0.0f64, |most, (v, _)| most.max(v)));
        let usual = quantile(values(), 0.995).max(0.0);
        let tick = round_step(usual / 5.0);
        // A peak little above the usual top is shown in full: a clipped scale needs a reason.
        let wanted = if peak <= 1.3 * usual { peak.max(usual) } else { usual };
        let top = if wanted > 0.0 { 0.5 * tick * (wanted / (0.5 * tick) - 1e-9).ceil() } else { 1.0 };
        Self { top, tick: if wanted > 0.0 { tick } else { 0.5 }, peak, potentials: potentials(panels) }
    }

    /// True when values lie beyond the last colour.
    pub fn is_clipped(&self) -> bool {
        self.peak > self.top * (1.0 + 1e-9)
    }
}

fn sized(panel: &Panel, triangle: &[u32; 3]) -> f64 {
    let [a, b, c] = triangle.map(|corner| panel.points[corner as usize]);
    0.5 * (b - a).cross(c - a).abs()
}

/// Equipotentials that divide what drops in the metal: the drop over a joint from one piece of metal to another would leave none of them in either.
/// All panels share a step where it leaves each of them some lines.
fn potentials(panels: &[Panel]) -> Vec<Option<Potentials>> {
    let ranges: Vec<Option<(f64, f64, f64)>> = panels.par_iter().map(range).collect();
    let widest = ranges.iter().flatten().map(|r| r.2).fold(0.0, f64::max);
    let of = |&range: &Option<(f64, f64, f64)>| {
        let (low, high, span) = range?;
        let step = round_step(if span >= 0.15 * widest { widest } else { span } / 16.0);
        let level = |v: f64| (v / step).clamp(-1e12, 1e12) as i64;
        // Near a small spot the potential runs away from what the rest of the metal has; a few lines tell that.
        Some(Potentials { step, levels: (level(low) - 8, level(high) + 8) })
    };
    ranges.iter().map(of).collect()
}

/// What the potential of a panel covers, but for the little metal at its extremes, and the most that drops within one piece of metal.
fn range(panel: &Panel) -> Option<(f64, f64, f64)> {
    if panel.potential_mv.is_empty() {
        return None;
    }
    let mut pieces: Vec<Vec<(f64, f64)>> = Vec::new();
    let mut number: Vec<Option<usize>> = vec![None; panel.points.len()];
    let mut sets = Sets::new(panel.points.len());
    for &[a, b, c] in &panel.triangles {
        sets.join(a as usize, b as usize);
        sets.join(b as usize, c as usize);
    }
    for triangle in &panel.triangles {
        let piece = *number[sets.root(triangle[0] as usize)].get_or_insert_with(|| {
            pieces.push(Vec::new());
            pieces.len() - 1
        });
        let sum: f64 = triangle.iter().map(|&corner| panel.potential_mv[corner as usize]).sum();
        pieces[piece].push((sum / 3.0, sized(panel, triangle)));
    }
    let ends = |items: &[(f64, f64)]| (quantile(items.iter().copied(), 0.002), quantile(items.iter().copied(), 0.998));
    let own = pieces.iter().map(|items| ends(items));
    let (low, high, span) =
        own.fold((f64::INFINITY, f64::NEG_INFINITY, 0.0f64), |(l, h, s), (low, high)| (l.min(low), h.max(high), s.max(high - low)));
    (span > 1e-9 * low.abs().max(high.abs())).then_some((low, high, span))
}

/// The value below which this share of the total weight lies, to one part in 4096 of the range; 0 without any weight.
fn quantile(items: impl Iterator<Item = (f64, f64)> + Clone, share: f64) -> f64 {
    let (low, high) = items.clone().fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), (v, _)| (l.min(v), h.max(v)));
    if high <= low {
        return if low.is_finite() { low } else { 0.0 };
    }
    let mut bins = vec![0.0; BINS];
    let per_bin = BINS as f64 / (high - low);
    for (value, weight) in items {
        bins[(((value - low) * per_bin) as usize).min(BINS - 1)] += weight;
    }
    let wanted = share * bins.iter().sum::<f64>();
    let mut sum = 0.0;
    for (number, bin) in bins.iter().enumerate() {
        sum += bin;
        if sum >= wanted {
            return low + (number + 1) as f64 / per_bin;
        }
    }
    high
}

/// The round number 1, 2, 2.5 or 5 times a power of ten next to a step (in ratio); 1 for a step that is not positive.
pub fn round_step(step: f64) -> f64 {
    if step.is_nan() || step <= 0.0 || step.is_infinite() {
        return 1.0;
    }
    let power = 10f64.powi(step.log10().floor() as i32);
    let mantissa = step / power;
    let round = [1.0, 2.0, 2.5, 5.0, 10.0].into_iter().min_by(|a, b| (a / mantissa).ln().abs().total_cmp(&(b / mantissa).ln().abs()));
    round.unwrap_or(1.0) * power
}

/// A multiple of a round step with as many decimals as the step has.
pub fn with_step(value: f64, step: f64) -> String {
    let decimals = (0..9).find(|&d| {
        let scaled = step * 10f64.powi(d);
        (scaled - scaled.round()).abs() < 1e-6 * scaled
    });
    let decimals = decimals.unwrap_or(9) as usize;
    if value.abs() < 1e-6 * step { "0".to_string() } else { format!("{value:.decimals$}").replace('-', "−") }
}

/// Three significant digits.
pub fn three_digits(value: f64) -> String {
    if value.is_nan() || value <= 0.0 {
        return "0".to_string();
    }
    if !(1e-4..1e6).contains(&value) {
        return format!("{value:.2e}");
    }
    let decimals = (2 - value.log10().floor() as i32).max(0) as usize;
    format!("{value:.decimals$}")
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::Point;

    /// Thin slices side by side with these values.
    fn slices(values: &[f64]) -> Panel {
        let mut panel = Panel { values: values.to_vec(), ..Panel::default() };
        for i in 0..values.len() {
            let x = i as f64;
            panel.points.extend([Point::new(x, 0.0), Point::new(x + 1.0, 0.0), Point::new(x, 1.0)]);
            let first = 3 * i as u32;
            panel.triangles.push([first, first + 1, first + 2]);
        }
        panel
    }

    /// A strip whose potential rises evenly over this range.
    fn sloped(from: f64, range: f64) -> Panel {
        let mut panel = Panel::default();
        for i in 0..400 {
            let x = f64::from(i);
            panel.points.extend([Point::new(x, 0.0), Point::new(x, 1.0)]);
            panel.potential_mv.extend([from + range * x / 399.0; 2]);
            if i > 0 {
                let n = 2 * i as u32;
                panel.triangles.extend([[n - 2, n, n - 1], [n, n + 1, n - 1]]);
                panel.values.extend([1.0; 2]);
            }
        }
        panel
    }

    #[test]
    fn steps_are_round_and_numbers_follow_them() {
        assert_eq!([0.9, 1.6, 2.3, 4.0, 8.0, 0.03].map(round_step), [1.0, 2.0, 2.5, 5.0, 10.0, 0.025]);
        assert_eq!([round_step(0.0), round_step(f64::NAN)], [1.0, 1.0]);
        assert_eq!(with_step(7.5, 2.5), "7.5");
        assert_eq!(with_step(0.30000000000000004, 0.1), "0.3");
        assert_eq!([with_step(-0.0, 0.5), with_step(-1.5, 0.5)], ["0", "−1.5"]);
        assert_eq!([three_digits(57.31), three_digits(1234.0), three_digits(0.0456), three_digits(0.0)], ["57.3", "1234", "0.0456", "0"]);
    }

    #[test]
    fn a_lonely_peak_is_clipped_and_a_broad_one_is_not() {
        let mut values: Vec<f64> = (0..1000).map(|i| 20.0 * f64::from(i) / 1000.0).collect();
        values[500] = 300.0;
        let scale = Scale::new(&[slices(&values)], None);
        assert!(scale.is_clipped() && scale.peak == 300.0);
        assert_eq!((scale.top, scale.tick), (20.0, 5.0));
        values[500] = 21.0;
        let scale = Scale::new(&[slices(&values)], None);
        assert!(!scale.is_clipped() && scale.top == 22.5, "{scale:?}");
        // What the mesh makes of a corner is not clipped where the gauge peak is on the scale.
        values[500] = 300.0;
        let scale = Scale::new(&[slices(&values)], Some(19.6));
        assert!(!scale.is_clipped() && scale.top == 20.0, "{scale:?}");
    }

    #[test]
    fn ten_to_twenty_five_equipotentials_cross_the_part() {
        for range in [0.013, 1.0, 3.0, 9.0, 44.0, 78.0, 612.0] {
            let step = Scale::new(&[sloped(5.0, range)], None).potentials[0].unwrap().step;
            assert!((10.0..=25.0).contains(&(range / step)), "{range} {step}");
        }
        let mut level = slices(&[1.0; 10]);
        level.potential_mv = vec![3.0; level.points.len()];
        assert_eq!(Scale::new(&[level], None).potentials, [None]);
    }

    #[test]
    fn equipotentials_divide_what_drops_in_the_metal_and_not_over_a_joint() {
        let joined = |mut a: Panel, b: Panel| {
            let shift = a.points.len() as u32;
            a.points.extend(b.points.iter().map(|p| Point::new(p.x + 500.0, p.y)));
            a.triangles.extend(b.triangles.iter().map(|t| t.map(|c| c + shift)));
            a.potential_mv.extend(b.potential_mv);
            a.values.extend(b.values);
            a
        };
        let step = |panels: &[Panel]| Scale::new(panels, None).potentials.iter().map(|p| p.unwrap().step).collect::<Vec<_>>();
        // Two lugs of 4 mV each, 100 mV apart over a loose joint.
        assert_eq!(step(&[joined(sloped(0.0, 4.0), sloped(100.0, 4.0))]), [0.25]);
        assert_eq!(step(&[sloped(0.0, 16.0), sloped(0.0, 4.0)]), [1.0, 1.0]);
        assert_eq!(step(&[sloped(0.0, 16.0), sloped(0.0, 1.6)]), [1.0, 0.1]);
    }
}
