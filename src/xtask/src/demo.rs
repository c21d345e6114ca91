use anyhow::Result;
pub fn write() -> Result<()> {
    Ok(())
}
