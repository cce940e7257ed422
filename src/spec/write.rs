//! The normalized spec in the keys of the spec file, so that it is a valid spec itself.

use serde::ser::{Error as _, SerializeStruct as _};
use serde::{Serialize, Serializer};
use serde_json::value::RawValue;

use super::keys::{BandKeys, SpecKeys, StageKeys};
use super::stages::{
    EqualizerKind, EqualizerShape, EqualizerStage, FilterStage, Order, Placement, Row, Stage, StopEdges, Width,
};
use super::transfer::{
    AnalogStage, Coefficient, DigitalFilter, DigitalStage, Root, RootUnit, Transfer, WrittenSection,
};
use super::types::{Auto, Band, Extent, Requirement, Spec};
use super::words::DesignWay;

/// Width in Hz and Q, one of them.
fn width_and_q(width: Width) -> (Option<f64>, Option<f64>) {
    match width {
        Width::Hz(hz) => (Some(hz), None),
        Width::Q(q) => (None, Some(q)),
    }
}

impl<'s> StageKeys<'s> {
    fn of(stage: &'s Stage) -> Self {
        let keys = Self { kind: stage.kind_name(), ..Self::default() };
        match stage {
            Stage::Filter(filter) => keys.filter(filter),
            Stage::Notch(notch) => keys.row(&notch.row),
            Stage::Equalizer(equalizer) => keys.equalizer(equalizer),
            Stage::Weighting(weighting) => Self { curve: Some(weighting.curve), ..keys },
            Stage::Digital(DigitalStage { filter, rate_hz }) => {
                let keys = Self { rate_hz: *rate_hz, ..keys };
                match filter {
                    DigitalFilter::Transfer(transfer) => keys.transfer(transfer, RootUnit::RadiansPerSecond),
                    DigitalFilter::Sections(sections) => Self { sections: Some(sections), ..keys },
                }
            }
            Stage::Analog(AnalogStage { transfer, unit, match_hz }) => {
                Self { match_hz: *match_hz, ..keys.transfer(transfer, *unit) }
            }
        }
    }

    fn filter(mut self, filter: &FilterStage) -> Self {
        self.family = Some(filter.family);
        match filter.order {
            Order::Given(order) => self.order = Some(order),
            Order::Limits(StopEdges::One(stop_edge_hz)) => self.stop_edge_hz = Some(stop_edge_hz),
            Order::Limits(StopEdges::Two(stop_edges_hz)) => self.stop_edges_hz = Some(stop_edges_hz),
        }
        (self.ripple_db, self.stop_db) = (filter.ripple_db, filter.stop_db);
        match &filter.placement {
            Placement::Edge { edge_hz } => Self { edge_hz: Some(*edge_hz), ..self },
            Placement::Edges { edges_hz } => Self { edges_hz: Some(*edges_hz), ..self },
            Placement::Row(row) => self.row(row),
        }
    }

    fn row(self, row: &Row) -> Self {
        let (width_hz, q) = width_and_q(row.width);
        Self { center_hz: Some(row.center_hz), width_hz, q, harmonics: Some(row.harmonics), ..self }
    }

    fn equalizer(mut self, equalizer: &EqualizerStage) -> Self {
        match equalizer.kind {
            EqualizerKind::Peak => self.center_hz = Some(equalizer.hz),
            EqualizerKind::Lowshelf | EqualizerKind::Highshelf => self.edge_hz = Some(equalizer.hz),
        }
        match equalizer.shape {
            EqualizerShape::Q(q) => self.q = Some(q),
            EqualizerShape::Slope(slope) => self.slope = Some(slope),
        }
        Self { gain_db: Some(equalizer.gain_db), ..self }
    }

    fn transfer(self, transfer: &'s Transfer, unit: RootUnit) -> Self {
        match (transfer, unit) {
            (Transfer::Polynomials { numerator, denominator }, _) => {
                Self { numerator: Some(numerator), denominator: Some(denominator), ..self }
            }
            (Transfer::Roots { zeros, poles, gain }, RootUnit::RadiansPerSecond) => {
                Self { zeros: Some(zeros), poles: Some(poles), gain: Some(*gain), ..self }
            }
            (Transfer::Roots { zeros, poles, gain }, RootUnit::Hertz) => {
                Self { zeros_hz: Some(zeros), poles_hz: Some(poles), gain: Some(*gain), ..self }
            }
        }
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
            phase: self.phase,
            design: self.auto.map(|_| DesignWay::Auto),
            auto: self.auto.filter(|auto| *auto != Auto::default()),
            output: self.output,
            stage: &self.stages,
            band: &self.bands,
        };
        top.serialize(serializer)
    }
}

impl Serialize for Stage {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        StageKeys::of(self).serialize(serializer)
    }
}

impl Serialize for Coefficient {
    /// The number with its digits; what serde_json makes a `Value` of loses zeros at the end.
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        RawValue::from_string(self.literal()).map_err(S::Error::custom)?.serialize(serializer)
    }
}

impl Serialize for Root {
    /// A number, or `[re, im]` off the real axis.
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        if self.im.value == 0.0 { self.re.serialize(serializer) } else { [self.re, self.im].serialize(serializer) }
    }
}

impl Serialize for WrittenSection {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        let mut section = serializer.serialize_struct("Section", 2)?;
        section.serialize_field("b", &self.b)?;
        section.serialize_field("a", &self.a)?;
        section.end()
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
