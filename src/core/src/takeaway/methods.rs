//! methods
use crate::sheet::Sheet;
/// x
pub fn methods(_sheet: &Sheet) -> String {
    String::new()
}
/// x
pub fn references(_sheet: &Sheet) -> Vec<String> {
    Vec::new()
}
