//! PNG bytes: the same picture, the same bytes.

use super::DrawError;

/// Encodes RGB rows, with a title and a mark that stay with the file.
pub(super) fn png(rgb: &[u8], width: u32, height: u32, title: &str, virtual_bench: bool) -> Result<Vec<u8>, DrawError> {
    let mut out = Vec::new();
    let mut encoder = png::Encoder::new(&mut out, width, height);
    encoder.set_color(png::ColorType::Rgb);
    encoder.set_depth(png::BitDepth::Eight);
    // PNG text is Latin-1: what is not stays a question mark.
    let latin: String = title.chars().map(|c| if (c as u32) < 256 { c } else { '?' }).collect();
    encoder.add_text_chunk("Title".to_owned(), latin).map_err(DrawError::of)?;
    if virtual_bench {
        encoder.add_text_chunk("Comment".to_owned(), "VIRTUAL BENCH".to_owned()).map_err(DrawError::of)?;
    }
    let mut writer = encoder.write_header().map_err(DrawError::of)?;
    writer.write_image_data(rgb).map_err(DrawError::of)?;
    writer.finish().map_err(DrawError::of)?;
    Ok(out)
}
