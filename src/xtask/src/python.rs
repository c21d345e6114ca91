use anyhow::Result;
pub fn reference() -> Result<()> {
    Ok(())
}
