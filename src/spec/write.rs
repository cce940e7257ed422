//! The normalized spec in the keys of the spec file, so that it is a valid spec itself.

use serde::{Serialize, Serializer};

use super::keys::{BandKeys, SpecKeys, StageKeys};
use super::types::{Band, Extent, Placement, Requirement, Row, Spec, Stage, Width};

/// Width in Hz and Q, one of them.
fn width_and_q(width: Width) -> (Option<f64>, Option<f64>) {
    match width {
        Width::Hz(hz) => (Some(hz), None),
        Width::Q(q) => (None, Some(q)),
    }
}

impl StageKeys {
    fn row(self, row: &Row) -> Self {
        let (width_hz, q) = width_and_q(row.width);
        Self { center_hz: Some(row.center_hz), width_hz, q, harmonics: Some(row.harmonics), ..self }
    }
}

impl Serialize for Spec {
    /// The keys of the spec file, every default filled in.
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let top = SpecKeys {
            title: self.title.as_deref(),
            beyond_half_rate: self.beyond_half_rate,
            reference_band: self.reference_band.as_deref(),
            rate: self.rate,
            output: self.output,
            stage: &self.stages,
            band: &self.bands,
        };
        top.serialize(serializer)
    }
}

impl Serialize for Stage {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let keys = match self {
            Self::Notch(notch) => StageKeys { kind: self.kind_name(), ..StageKeys::default() }.row(&notch.row),
            Self::Filter(filter) => {
                let keys = StageKeys {
                    kind: self.kind_name(),
                    family: Some(filter.family),
                    order: Some(filter.order),
                    ripple_db: filter.ripple_db,
                    stop_db: filter.stop_db,
                    ..StageKeys::default()
                };
                match &filter.placement {
                    Placement::Edge { edge_hz } => StageKeys { edge_hz: Some(*edge_hz), ..keys },
                    Placement::Edges { edges_hz } => StageKeys { edges_hz: Some(*edges_hz), ..keys },
                    Placement::Row(row) => keys.row(row),
                }
            }
        };
        keys.serialize(serializer)
    }
}

impl Serialize for Band {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let mut keys = BandKeys { name: &self.name, ..BandKeys::default() };
        match self.extent {
            Extent::Range { from_hz, to_hz } => (keys.from_hz, keys.to_hz) = (Some(from_hz), Some(to_hz)),
            Extent::Row(row) => {
                (keys.center_hz, keys.harmonics) = (Some(row.center_hz), Some(row.harmonics));
                (keys.span_hz, keys.q) = width_and_q(row.width);
            }
        }
        match &self.requirement {
            Requirement::Reduce { reduce_db } => keys.reduce_db = Some(*reduce_db),
            Requirement::Keep { keep_db, except } => {
                (keys.keep_db, keys.except) = (Some(*keep_db), Some(except.as_slice()));
            }
            Requirement::Residual { residual_dbfs } => keys.residual_dbfs = Some(*residual_dbfs),
            Requirement::Observe => {}
        }
        keys.serialize(serializer)
    }
}
