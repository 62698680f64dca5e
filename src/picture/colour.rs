//! The colour map "paper to ember": where current is, ink is.
//!
//! Way points are set in the perceptual space OKLab (B. Ottosson, 2020; matrices from the published definition), joined by straight lines and
//! read off at equal arc length, so that equal steps of the value look equal. Lightness only falls: the map reads in grey print.

/// A colour of the screen: red, green, blue (sRGB).
pub type Rgb = [u8; 3];

/// Entries of the table.
const ENTRIES: usize = 1024;

/// Way points: lightness, chroma, hue in degrees.
const WAY: [[f64; 3]; 10] = [
    [0.972, 0.012, 88.0],
    [0.925, 0.055, 88.0],
    [0.865, 0.100, 82.0],
    [0.785, 0.135, 70.0],
    [0.695, 0.155, 54.0],
    [0.595, 0.165, 40.0],
    [0.490, 0.150, 30.0],
    [0.385, 0.120, 22.0],
    [0.285, 0.085, 8.0],
    [0.175, 0.045, 340.0],
];

/// The map, ready to be read.
#[derive(Debug)]
pub struct Ramp {
    table: Vec<Rgb>,
}

impl Ramp {
    /// Builds the table.
    pub fn new() -> Self {
        let way: Vec<[f64; 3]> = WAY
            .iter()
            .map(|&[lightness, chroma, hue]| {
                let (sin, cos) = hue.to_radians().sin_cos();
                [lightness, chroma * cos, chroma * sin]
            })
            .collect();
        let lengths: Vec<f64> = way.windows(2).map(|w| distance(w[0], w[1])).collect();
        let total: f64 = lengths.iter().sum();
        let mut table = Vec::with_capacity(ENTRIES);
        let (mut piece, mut before) = (0, 0.0);
        for entry in 0..ENTRIES {
            let along = total * entry as f64 / (ENTRIES - 1) as f64;
            while piece + 1 < lengths.len() && along > before + lengths[piece] {
                before += lengths[piece];
                piece += 1;
            }
            let t = ((along - before) / lengths[piece]).clamp(0.0, 1.0);
            table.push(screen(std::array::from_fn(|c| way[piece][c] + t * (way[piece + 1][c] - way[piece][c]))));
        }
        Self { table }
    }

    /// The colour of a share of the scale; below 0 the first, above 1 the last.
    pub fn at(&self, share: f32) -> Rgb {
        let entry = (share.clamp(0.0, 1.0) * (ENTRIES - 1) as f32 + 0.5) as usize;
        self.table[entry.min(ENTRIES - 1)]
    }

    /// True where the map is so dark that lines over it must be light.
    pub fn is_dark(&self, share: f32) -> bool {
        let [r, g, b] = self.at(share).map(f32::from);
        0.3 * r + 0.59 * g + 0.11 * b < 122.0
    }
}

fn distance(a: [f64; 3], b: [f64; 3]) -> f64 {
    (0..3).map(|c| (a[c] - b[c]).powi(2)).sum::<f64>().sqrt()
}

/// OKLab to linear light.
fn linear([l, a, b]: [f64; 3]) -> [f64; 3] {
    let long = (l + 0.3963377774 * a + 0.2158037573 * b).powi(3);
    let middle = (l - 0.1055613458 * a - 0.0638541728 * b).powi(3);
    let short = (l - 0.0894841775 * a - 1.2914855480 * b).powi(3);
    [
        4.0767416621 * long - 3.3077115913 * middle + 0.2309699292 * short,
        -1.2684380046 * long + 2.6097574011 * middle - 0.3413193965 * short,
        -0.0041960863 * long - 0.7034186147 * middle + 1.7076147010 * short,
    ]
}

/// OKLab to the screen's bytes.
fn screen(lab: [f64; 3]) -> Rgb {
    linear(lab).map(|v| {
        let v = v.clamp(0.0, 1.0);
        let coded = if v <= 0.0031308 { 12.92 * v } else { 1.055 * v.powf(1.0 / 2.4) - 0.055 };
        (255.0 * coded + 0.5) as u8
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The screen's bytes back to OKLab.
    fn perceived(rgb: Rgb) -> [f64; 3] {
        let [r, g, b] = rgb.map(|v| {
            let v = f64::from(v) / 255.0;
            if v <= 0.04045 { v / 12.92 } else { ((v + 0.055) / 1.055).powf(2.4) }
        });
        let long = (0.4122214708 * r + 0.5363325363 * g + 0.0514459929 * b).cbrt();
        let middle = (0.2119034982 * r + 0.6806995451 * g + 0.1073969566 * b).cbrt();
        let short = (0.0883024619 * r + 0.2817188376 * g + 0.6299787005 * b).cbrt();
        [
            0.2104542553 * long + 0.7936177850 * middle - 0.0040720468 * short,
            1.9779984951 * long - 2.4285922050 * middle + 0.4505937099 * short,
            0.0259040371 * long + 0.7827717662 * middle - 0.8086757660 * short,
        ]
    }

    #[test]
    fn the_way_points_can_be_shown_on_a_screen() {
        for [lightness, chroma, hue] in WAY {
            let (sin, cos) = f64::to_radians(hue).sin_cos();
            let light = linear([lightness, chroma * cos, chroma * sin]);
            assert!(light.iter().all(|v| (-0.002..=1.002).contains(v)), "{lightness}: {light:?}");
        }
    }

    #[test]
    fn lightness_only_falls_and_grey_print_keeps_the_order() {
        let ramp = Ramp::new();
        let samples: Vec<[f64; 3]> = (0..=64).map(|i| perceived(ramp.at(i as f32 / 64.0))).collect();
        for pair in samples.windows(2) {
            assert!(pair[1][0] < pair[0][0] - 0.004, "{pair:?}");
        }
        assert!(samples[0][0] > 0.95 && samples[64][0] < 0.2);
    }

    #[test]
    fn equal_steps_of_the_value_look_equal() {
        let ramp = Ramp::new();
        let steps: Vec<f64> =
            (0..32).map(|i| distance(perceived(ramp.at(i as f32 / 32.0)), perceived(ramp.at((i + 1) as f32 / 32.0)))).collect();
        let mean = steps.iter().sum::<f64>() / 32.0;
        for step in steps {
            assert!((step / mean - 1.0).abs() < 0.16, "{step} against {mean}");
        }
    }

    #[test]
    fn the_scale_does_not_leave_its_ends() {
        let ramp = Ramp::new();
        assert_eq!(ramp.at(-3.0), ramp.at(0.0));
        assert_eq!(ramp.at(7.0), ramp.at(1.0));
        assert_eq!(ramp.at(f32::NAN), ramp.at(0.0));
        assert!(ramp.is_dark(1.0) && !ramp.is_dark(0.0));
    }
}
