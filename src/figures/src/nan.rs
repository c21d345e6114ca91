//! Numbers that may be missing, as JSON can carry them: `null` stands for "not a number".
use serde::{Deserialize, Deserializer, Serialize, Serializer};

pub(crate) fn serialize<S: Serializer>(values: &[f64], to: S) -> Result<S::Ok, S::Error> {
    let kept: Vec<Option<f64>> = values.iter().map(|v| v.is_finite().then_some(*v)).collect();
    kept.serialize(to)
}

pub(crate) fn deserialize<'de, D: Deserializer<'de>>(from: D) -> Result<Vec<f64>, D::Error> {
    let kept = Vec::<Option<f64>>::deserialize(from)?;
    Ok(kept.into_iter().map(|v| v.unwrap_or(f64::NAN)).collect())
}
