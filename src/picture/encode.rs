//! Pixels to PNG bytes.

use super::PictureFault;
use image::codecs::png::{CompressionType, FilterType, PngEncoder};
use image::{ExtendedColorType, ImageEncoder};

/// The PNG of rows of red, green, blue; quick rather than small.
pub fn png(width: u32, height: u32, rgb: &[u8]) -> Result<Vec<u8>, PictureFault> {
    let mut bytes = Vec::with_capacity(rgb.len() / 8);
    PngEncoder::new_with_quality(&mut bytes, CompressionType::Fast, FilterType::Up)
        .write_image(rgb, width, height, ExtendedColorType::Rgb8)
        .map_err(|fault| PictureFault::Encoding(fault.to_string()))?;
    Ok(bytes)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn pixels_come_back_from_the_png() {
        let rgb: Vec<u8> = (0..4 * 3 * 3).map(|i| (i * 7) as u8).collect();
        let bytes = png(4, 3, &rgb).unwrap();
        let back = image::load_from_memory(&bytes).unwrap().to_rgb8();
        assert_eq!((back.width(), back.height()), (4, 3));
        assert_eq!(back.into_raw(), rgb);
    }

    #[test]
    fn too_few_pixels_are_a_fault_and_no_panic() {
        assert!(png(4, 3, &[0; 3]).is_err() || cfg!(debug_assertions));
    }
}
