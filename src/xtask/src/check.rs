use anyhow::Result;
pub fn test(_page: bool) -> Result<()> {
    Ok(())
}
