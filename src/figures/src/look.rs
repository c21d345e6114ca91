//! The scheme, scale and face of a drawing.
use serde::{Deserialize, Serialize};

/// Light or dark ground.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Scheme {
    /// Dark ink on a light ground; the only one for exported figures.
    #[default]
    Light,
    /// Light ink on a dark ground.
    Dark,
}

/// How a drawing is drawn.
///
/// # Units
/// A drawing area has `scale × fine` units in a CSS pixel. Lines and edges that run along an axis are laid on whole device
/// pixels (`fine` units), everything else on whole units. With a plain backend `fine` is 1; with [`crate::Fine`] around it,
/// curves gain `fine` steps between two pixels.
#[derive(Debug, Clone, PartialEq)]
pub struct Look {
    /// Light or dark.
    pub scheme: Scheme,
    /// Device pixels in a CSS pixel.
    pub scale: f64,
    /// Drawing units in a device pixel.
    pub fine: u32,
    /// Font families, as CSS writes them.
    pub face: String,
}

/// The system's own face, then faces that most systems have.
pub const FACE: &str = "system-ui, -apple-system, 'Segoe UI', 'Noto Sans', sans-serif";

impl Default for Look {
    fn default() -> Self {
        Look {
            scheme: Scheme::Light,
            scale: 1.0,
            fine: 1,
            face: FACE.to_owned(),
        }
    }
}

impl Look {
    /// Drawing units in a CSS pixel.
    pub fn units(&self) -> f64 {
        self.scale * f64::from(self.fine.max(1))
    }
}
