//! PNG from SVG, with fonts of our own, so that it looks the same where no font is installed.

use anyhow::{Context as _, Result};
use resvg::tiny_skia::{Pixmap, Transform};
use resvg::usvg::{Options, Tree};

/// Pixels per picture unit: text stays sharp on fine screens and in print.
const PIXELS: f32 = 2.0;

/// Renders an SVG document to a PNG file's bytes.
///
/// # Errors
/// A document that cannot be rendered.
pub(super) fn png(svg: &str) -> Result<Vec<u8>> {
    let tree = tree(svg)?;
    let size =
        tree.size().to_int_size().scale_by(PIXELS).context("cannot be rendered: too large")?;
    let mut pixels =
        Pixmap::new(size.width(), size.height()).context("cannot be rendered: too large")?;
    resvg::render(&tree, Transform::from_scale(PIXELS, PIXELS), &mut pixels.as_mut());
    pixels.encode_png().context("cannot be rendered")
}

/// Reads an SVG document, its texts laid out.
///
/// # Errors
/// A document that is no SVG.
pub(super) fn tree(svg: &str) -> Result<Tree> {
    let mut options = Options::default();
    let fonts = options.fontdb_mut();
    for font in [dejavu::sans::regular(), dejavu::sans::bold(), dejavu::sans_mono::regular()] {
        fonts.load_font_data(font.to_vec());
    }
    Tree::from_str(svg, &options).context("cannot be rendered")
}
