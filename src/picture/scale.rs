//! Round steps, the colour scale's end, the steps of potential, and numbers as a reader writes them.

use super::Panel;

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
    /// Step of the equipotentials, mV; `None` when the potential is the same everywhere.
    pub potential_step: Option<f64>,
    /// First and last number of the equipotentials drawn.
    pub potential_levels: (i64, i64),
}

impl Scale {
    /// The common scale of panels whose lists were checked.
    pub fn new(panels: &[Panel]) -> Self {
        let sized = |panel: &Panel, triangle: &[u32; 3]| {
            let [a, b, c] = triangle.map(|corner| panel.points[corner as usize]);
            0.5 * (b - a).cross(c - a).abs()
        };
        let values = || panels.iter().flat_map(|p| p.triangles.iter().zip(&p.values).map(move |(t, &v)| (v, sized(p, t))));
        let peak = values().fold(0.0f64, |most, (v, _)| most.max(v));
        let usual = quantile(values(), 0.995).max(0.0);
        let tick = round_step(usual / 5.0);
        // A peak little above the usual top is shown in full: a clipped scale needs a reason.
        let wanted = if peak <= 1.3 * usual { peak } else { usual };
        let top = if wanted > 0.0 { 0.5 * tick * (wanted / (0.5 * tick) - 1e-9).ceil() } else { 1.0 };
        let with_potential = || panels.iter().filter(|p| !p.potential_mv.is_empty());
        let potentials = || {
            with_potential().flat_map(|p| {
                p.triangles.iter().map(move |t| {
                    let sum: f64 = t.iter().map(|&corner| p.potential_mv[corner as usize]).sum();
                    (sum / 3.0, sized(p, t))
                })
            })
        };
        let (low, high) = (quantile(potentials(), 0.002), quantile(potentials(), 0.998));
        let magnitude = low.abs().max(high.abs());
        let step = (high - low > 1e-9 * magnitude).then(|| round_step((high - low) / 16.0));
        let level = |v: f64, step: f64| (v / step).clamp(-1e12, 1e12) as i64;
        // Near a small spot the potential runs away from what the rest of the metal has; a few lines tell that.
        let levels = step.map_or((1, 0), |step| (level(low, step) - 8, level(high, step) + 8));
        Self { top, tick: if wanted > 0.0 { tick } else { 0.5 }, peak, potential_step: step, potential_levels: levels }
    }

    /// True when values lie beyond the last colour.
    pub fn is_clipped(&self) -> bool {
        self.peak > self.top * (1.0 + 1e-9)
    }
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
    let text = format!("{value:.decimals$}");
    // Nobody writes a negative nothing.
    if text.trim_start_matches('-').bytes().all(|b| b == b'0' || b == b'.') { text.trim_start_matches('-').to_string() } else { text }
}

/// Three significant digits.
pub fn three_digits(value: f64) -> String {
    if value.is_nan() || value <= 0.0 {
        return "0".to_string();
    }
    if value >= 1e6 || value < 1e-4 {
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

    #[test]
    fn steps_are_round_and_numbers_follow_them() {
        assert_eq!([0.9, 1.6, 2.3, 4.0, 8.0, 0.03].map(round_step), [1.0, 2.0, 2.5, 5.0, 10.0, 0.025]);
        assert_eq!([round_step(0.0), round_step(f64::NAN)], [1.0, 1.0]);
        assert_eq!(with_step(7.5, 2.5), "7.5");
        assert_eq!(with_step(0.30000000000000004, 0.1), "0.3");
        assert_eq!(with_step(-0.0, 5.0), "0");
        assert_eq!([three_digits(57.31), three_digits(1234.0), three_digits(0.0456), three_digits(0.0)], ["57.3", "1234", "0.0456", "0"]);
    }

    #[test]
    fn a_lonely_peak_is_clipped_and_a_broad_one_is_not() {
        let mut values: Vec<f64> = (0..1000).map(|i| 20.0 * f64::from(i) / 1000.0).collect();
        values[500] = 300.0;
        let scale = Scale::new(&[slices(&values)]);
        assert!(scale.is_clipped() && scale.peak == 300.0);
        assert_eq!((scale.top, scale.tick), (20.0, 5.0));
        values[500] = 21.0;
        let scale = Scale::new(&[slices(&values)]);
        assert!(!scale.is_clipped() && scale.top == 22.5, "{scale:?}");
    }

    #[test]
    fn ten_to_twenty_five_equipotentials_cross_the_part() {
        for range in [0.013, 1.0, 3.0, 9.0, 44.0, 78.0, 612.0] {
            let mut panel = slices(&vec![1.0; 1000]);
            panel.potential_mv = panel.points.iter().map(|p| 5.0 + range * p.x / 1000.0).collect();
            let step = Scale::new(&[panel]).potential_step.unwrap();
            assert!((10.0..=25.0).contains(&(range / step)), "{range} {step}");
        }
        let mut level = slices(&[1.0; 10]);
        level.potential_mv = vec![3.0; level.points.len()];
        assert_eq!(Scale::new(&[level]).potential_step, None);
    }
}
