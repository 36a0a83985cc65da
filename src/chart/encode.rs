//! From pixels to PNG bytes, the same each time.

use super::DrawError;

/// A picture's pixels: 8 bit RGB, row by row.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Pixels {
    /// Width.
    pub width: u32,
    /// Height.
    pub height: u32,
    /// `3 * width * height` bytes.
    pub rgb: Vec<u8>,
}

impl Pixels {
    /// The picture at half its size, each pixel the mean of four.
    pub fn halved(&self) -> Pixels {
        let (width, height) = (self.width / 2, self.height / 2);
        let stride = 3 * self.width as usize;
        let mut rgb = Vec::with_capacity(3 * width as usize * height as usize);
        for y in 0..height as usize {
            let upper = &self.rgb[2 * y * stride..(2 * y + 1) * stride];
            let lower = &self.rgb[(2 * y + 1) * stride..(2 * y + 2) * stride];
            for (a, b) in upper.chunks_exact(6).zip(lower.chunks_exact(6)) {
                for i in 0..3 {
                    let sum = u16::from(a[i])
                        + u16::from(a[i + 3])
                        + u16::from(b[i])
                        + u16::from(b[i + 3]);
                    rgb.push(((sum + 2) / 4) as u8);
                }
            }
        }
        Pixels { width, height, rgb }
    }

    /// The PNG file, with `notes` as text chunks (keyword, text).
    ///
    /// # Errors
    /// Where the encoder fails.
    pub fn to_png(&self, notes: &[(&str, String)]) -> Result<Vec<u8>, DrawError> {
        let mut bytes = Vec::new();
        let mut encoder = png::Encoder::new(&mut bytes, self.width, self.height);
        encoder.set_color(png::ColorType::Rgb);
        encoder.set_depth(png::BitDepth::Eight);
        encoder.set_compression(png::Compression::Balanced);
        for (keyword, text) in notes {
            encoder.add_text_chunk((*keyword).to_owned(), latin1(text))?;
        }
        let mut writer = encoder.write_header()?;
        writer.write_image_data(&self.rgb)?;
        writer.finish()?;
        Ok(bytes)
    }
}

/// A tEXt chunk holds Latin-1; what it cannot hold becomes a question mark.
fn latin1(text: &str) -> String {
    let in_latin1 = |c: char| if (c as u32) < 256 { c } else { '?' };
    text.chars().map(in_latin1).collect()
}
