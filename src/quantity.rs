//! Figures as they are printed: three significant digits, and intervals rounded outward so that what is printed still encloses.

/// A figure with three significant digits, without exponent where it stays short.
pub fn three(value: f64) -> String {
    significant(value, 3)
}

/// A figure with some significant digits.
pub fn significant(value: f64, digits: usize) -> String {
    if value == 0.0 {
        return "0".into();
    }
    if !value.is_finite() {
        return "-".into();
    }
    // Rounding first: 9.995 has one digit more before the point than its logarithm says.
    let rounded = format!("{value:.*e}", digits - 1);
    let exponent: i32 = rounded.split_once('e').and_then(|(_, e)| e.parse().ok()).unwrap_or(0);
    if !(-4..=6).contains(&exponent) {
        return rounded;
    }
    format!("{value:.*}", (digits as i32 - 1 - exponent).max(0) as usize)
}

/// A coordinate or a length in mm: at most three decimals, no idle zeros.
pub fn coordinate(value: f64) -> String {
    let text = format!("{value:.3}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    if text == "-0" { "0".into() } else { text.into() }
}

/// The two ends of an interval with as many decimals as show its width, the low one rounded down and the high one up.
pub fn outward(low: f64, high: f64) -> (String, String) {
    let size = low.abs().max(high.abs());
    if size == 0.0 || !low.is_finite() || !high.is_finite() {
        return (significant(low, 3), significant(high, 3));
    }
    let place = |x: f64| x.log10().floor() as i32;
    // Two digits of the width, at least three of the figure, never more than nine.
    let by_width = if high > low { 1 - place(high - low) } else { 12 };
    let decimals = by_width.max(2 - place(size)).min(8 - place(size)).clamp(0, 15) as usize;
    (directed(low, decimals, f64::le), directed(high, decimals, f64::ge))
}

/// The figure with some decimals that compares as asked with the value itself.
fn directed(value: f64, decimals: usize, holds: fn(&f64, &f64) -> bool) -> String {
    let unit = 10f64.powi(-(decimals as i32));
    let mut step = 0.0;
    loop {
        let text = format!("{:.*}", decimals, value + step * unit);
        // Printed decimals are read back, so the comparison is about what the reader sees.
        let shown = text.parse::<f64>().unwrap_or(f64::NAN);
        if step.abs() > 2.0 || holds(&shown, &value) {
            // A small negative end rounded up to nothing is plain zero.
            return if shown == 0.0 { text.trim_start_matches('-').into() } else { text };
        }
        step += if holds(&0.0, &1.0) { -1.0 } else { 1.0 };
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn three_significant_digits() {
        for (value, text) in [
            (0.0, "0"),
            (9.995, "9.99"),
            (9.996, "10.0"),
            (-0.012345, "-0.0123"),
            (123456.0, "123456"),
            (1e-12, "1.00e-12"),
            (1e9, "1.00e9"),
            (0.5, "0.500"),
            (f64::NAN, "-"),
        ] {
            assert_eq!(three(value), text);
        }
    }

    #[test]
    fn coordinates_have_no_idle_zeros() {
        assert_eq!([12.5, -0.0001, 30.0, 0.1236, 100.0].map(coordinate), ["12.5", "0", "30", "0.124", "100"]);
    }

    #[test]
    fn printed_intervals_enclose() {
        for (low, high) in [
            (2.557472, 2.559597),
            (-1.5, 1.0 / 3.0),
            (0.0, 1e-9),
            (1e5 / 3.0, 1e5 / 2.9),
            (7.0, 7.0),
            (1.0 / 3.0, 1.0 / 3.0),
            (-3.2e-7, -3.1e-7),
            (-1.0, -1e-9),
            (9.995, 9.9951),
            (1e-12, 1.1e-12),
            (1e9, 1e9 + 0.3),
            (0.0, 0.0),
        ] {
            let (a, b) = outward(low, high);
            let (shown_low, shown_high) = (a.parse::<f64>().unwrap(), b.parse::<f64>().unwrap());
            assert!(shown_low <= low && shown_high >= high, "{low} {high}: {a} {b}");
            assert!(shown_high - shown_low <= 1.25 * (high - low) + 2e-8 * low.abs().max(high.abs()) + 1e-14, "{low} {high}: {a} {b}");
        }
        assert_eq!(outward(2.557472, 2.559597), ("2.5574".to_string(), "2.5596".to_string()));
        assert_eq!(outward(-1.0, -1e-9), ("-1.00".to_string(), "0.00".to_string()));
        assert_eq!(outward(0.0, 0.0), ("0".to_string(), "0".to_string()));
    }
}
