//! The words that stand for choices in a spec file.

use schemars::{JsonSchema, Schema, SchemaGenerator};
use serde::{Serialize, Serializer};
use std::borrow::Cow;

use super::schema;
use super::stages::{Curve, EqualizerKind, Family, FilterKind};
use super::types::{BeyondHalfRate, Dither, OutputEncoding, Overload, Phase, RateMeaning};

/// A choice among words.
pub(super) trait Word: Copy + 'static {
    /// Every choice, in the order messages list them.
    const ALL: &'static [Self];
    /// Words of other origin that mean one of them, in lower case without separators.
    const ALIASES: &'static [(&'static str, Self)];
    /// The word in the spec file.
    fn word(self) -> &'static str;
}

macro_rules! words {
    ($type:ty { $($variant:ident => $word:literal $(| $alias:literal)*),+ $(,)? }) => {
        impl $type {
            /// Every choice.
            pub const ALL: &[Self] = &[$(Self::$variant),+];

            /// The word that stands for it in spec and report.
            pub const fn name(self) -> &'static str {
                match self {
                    $(Self::$variant => $word),+
                }
            }
        }

        impl Word for $type {
            const ALL: &'static [Self] = Self::ALL;
            const ALIASES: &'static [(&'static str, Self)] = &[$($(($alias, Self::$variant),)*)+];

            fn word(self) -> &'static str {
                self.name()
            }
        }

        impl JsonSchema for $type {
            fn inline_schema() -> bool {
                true
            }

            fn schema_name() -> Cow<'static, str> {
                stringify!($type).into()
            }

            fn json_schema(_: &mut SchemaGenerator) -> Schema {
                schema::choice::<Self>()
            }
        }

        impl Serialize for $type {
            fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
                serializer.serialize_str(self.name())
            }
        }
    };
}

words!(BeyondHalfRate {
    Error => "error" | "fail" | "refuse" | "stop",
    LeaveOut => "leave-out" | "skip" | "drop" | "ignore" | "omit",
});

words!(RateMeaning {
    Header => "header" | "file" | "playback" | "slow" | "expanded" | "timeexpanded" | "nominal",
    Acoustic => "acoustic" | "sound" | "real" | "original" | "recorded" | "sampled" | "guano",
});

words!(OutputEncoding {
    Same => "same" | "input" | "keep" | "original",
    Pcm16 => "pcm16" | "16" | "16bit" | "int16" | "s16" | "i16",
    Pcm24 => "pcm24" | "24" | "24bit" | "int24" | "s24" | "i24",
    Pcm32 => "pcm32" | "32" | "32bit" | "int32" | "s32" | "i32",
    Float32 => "float32" | "float" | "f32" | "32bitfloat" | "single",
    Float64 => "float64" | "double" | "f64" | "64" | "64bit" | "64bitfloat",
});

words!(Dither {
    Triangular => "triangular" | "tpdf" | "on" | "yes" | "true",
    None => "none" | "off" | "no" | "false",
});

words!(Overload {
    Refuse => "refuse" | "error" | "fail",
    Clip => "clip" | "saturate" | "limit",
    Scale => "scale" | "normalize" | "attenuate",
});

// Other words for the kinds of stages stand in `kind`.
words!(FilterKind {
    Lowpass => "lowpass",
    Highpass => "highpass",
    Bandpass => "bandpass",
    Bandstop => "bandstop",
});

words!(Family {
    Butterworth => "butterworth" | "butter" | "maximallyflat",
    Chebyshev1 => "chebyshev1" | "chebyshev" | "cheby1" | "cheb1" | "chebyshevi" | "chebyshevtype1" | "type1" | "cheby",
    Chebyshev2 => "chebyshev2" | "cheby2" | "cheb2" | "chebyshevii" | "chebyshevtype2" | "type2" | "inversechebyshev",
    Elliptic => "elliptic" | "ellip" | "cauer" | "zolotarev",
    Bessel => "bessel" | "thomson" | "maximallyflatdelay",
});

words!(Phase {
    Causal => "causal" | "forward" | "once" | "minimum" | "nonlinear",
    Zero => "zero" | "zerophase" | "forwardbackward" | "bidirectional" | "filtfilt" | "noncausal",
});

/// `design`: how the cascade comes about where no stage says it.
#[derive(Clone, Copy)]
pub(super) enum DesignWay {
    /// It is found from the bands.
    Auto,
}

words!(DesignWay {
    Auto => "auto" | "automatic" | "automatically" | "find" | "frombands" | "bands" | "true" | "on" | "yes",
});

words!(EqualizerKind {
    Peak => "peak",
    Lowshelf => "lowshelf",
    Highshelf => "highshelf",
});

words!(Curve {
    A => "A" | "aweighting" | "dba",
    C => "C" | "cweighting" | "dbc",
    K => "K" | "kweighting" | "lufs" | "bs1770",
    Riaa => "riaa" | "record" | "phono",
});
