pub(crate) async fn run(_: crate::config::Demo) -> anyhow::Result<()> {
    Ok(())
}
