//! Stand-in while the record is being written.
use crate::{Caller, House, HouseError};
/// x
#[derive(Debug)]
pub struct Drawn {
    /// x
    pub pdf: Vec<u8>,
    /// x
    pub json: serde_json::Value,
    /// x
    pub batch_n: u64,
}
/// x
#[derive(Debug)]
pub struct Issued {
    /// x
    pub receipt: store::writer::Receipt,
    /// x
    pub pdf: String,
    /// x
    pub json: String,
}
impl House {
    /// x
    pub async fn batch_record(
        &self,
        _c: &Caller,
        _b: domain::ids::BatchId,
        _n: Option<u64>,
    ) -> Result<Drawn, HouseError> {
        Err(HouseError::Failed("x".into()))
    }
    /// x
    pub async fn issue_record(
        &self,
        _c: Caller,
        _k: domain::ids::CommandId,
        _p: [u8; 32],
        _b: domain::ids::BatchId,
        _t: String,
    ) -> Result<Issued, HouseError> {
        Err(HouseError::Failed("x".into()))
    }
}
