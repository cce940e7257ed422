//! Bytes of interleaved frames to planar `f64` and back.
//!
//! One loop an encoding, with the channel count known at compile time for one and
//! two channels, over exact chunks, so that the compiler can vectorize them.
//! Scaling is by powers of two: exact both ways. Big-endian samples are the
//! little-endian ones with their bytes reversed, which compiles to a byte swap.

use super::Encoding;

/// What happens to one sample of an encoding that takes `N` bytes.
trait Sample<const N: usize> {
    fn decode(bytes: [u8; N]) -> f64;
    fn encode(value: f64) -> [u8; N];
}

struct Pcm8;
struct Pcm16;
struct Pcm24;
struct Pcm32;
struct Float32;
struct Float64;

const SCALE_8: f64 = 128.0;
const SCALE_16: f64 = 32768.0;
const SCALE_24: f64 = 8_388_608.0;
const SCALE_32: f64 = 2_147_483_648.0;

/// Adding it leaves an integer below 2^51 in the lowest bits, in two's complement:
/// conversions that vectorize. Only values that [`first_inexact`] has passed may be
/// encoded; of others the upper bits would be lost.
const SHIFT: f64 = 1.5 * 4_503_599_627_370_496.0;

impl Sample<1> for Pcm8 {
    fn decode(bytes: [u8; 1]) -> f64 {
        (f64::from(bytes[0]) - SCALE_8) * (1.0 / SCALE_8)
    }
    fn encode(value: f64) -> [u8; 1] {
        [(value * SCALE_8 + (SHIFT + SCALE_8)).to_bits() as u8]
    }
}

impl Sample<2> for Pcm16 {
    fn decode(bytes: [u8; 2]) -> f64 {
        f64::from(i16::from_le_bytes(bytes)) * (1.0 / SCALE_16)
    }
    fn encode(value: f64) -> [u8; 2] {
        ((value * SCALE_16 + SHIFT).to_bits() as u16).to_le_bytes()
    }
}

impl Sample<3> for Pcm24 {
    fn decode([a, b, c]: [u8; 3]) -> f64 {
        // As the upper three bytes of 32 bits the sign needs no extension.
        f64::from(i32::from_le_bytes([0, a, b, c])) * (1.0 / SCALE_32)
    }
    fn encode(value: f64) -> [u8; 3] {
        let [a, b, c, ..] = (value * SCALE_24 + SHIFT).to_bits().to_le_bytes();
        [a, b, c]
    }
}

impl Sample<4> for Pcm32 {
    fn decode(bytes: [u8; 4]) -> f64 {
        f64::from(i32::from_le_bytes(bytes)) * (1.0 / SCALE_32)
    }
    fn encode(value: f64) -> [u8; 4] {
        ((value * SCALE_32 + SHIFT).to_bits() as u32).to_le_bytes()
    }
}

impl Sample<4> for Float32 {
    fn decode(bytes: [u8; 4]) -> f64 {
        f64::from(f32::from_le_bytes(bytes))
    }
    fn encode(value: f64) -> [u8; 4] {
        (value as f32).to_le_bytes()
    }
}

impl Sample<8> for Float64 {
    fn decode(bytes: [u8; 8]) -> f64 {
        f64::from_le_bytes(bytes)
    }
    fn encode(value: f64) -> [u8; 8] {
        value.to_le_bytes()
    }
}

/// The same sample in the other byte order.
struct Big<S>(std::marker::PhantomData<S>);

impl<const N: usize, S: Sample<N>> Sample<N> for Big<S> {
    fn decode(mut bytes: [u8; N]) -> f64 {
        bytes.reverse();
        S::decode(bytes)
    }
    fn encode(value: f64) -> [u8; N] {
        let mut bytes = S::encode(value);
        bytes.reverse();
        bytes
    }
}

/// Appends the whole frames in `bytes` to the planes, one a channel.
pub(crate) fn decode(encoding: Encoding, big_endian: bool, bytes: &[u8], planes: &mut [Vec<f64>]) {
    match (encoding, big_endian) {
        (Encoding::Pcm8, _) => decode_as::<1, Pcm8>(bytes, planes),
        (Encoding::Pcm16, false) => decode_as::<2, Pcm16>(bytes, planes),
        (Encoding::Pcm24, false) => decode_as::<3, Pcm24>(bytes, planes),
        (Encoding::Pcm32, false) => decode_as::<4, Pcm32>(bytes, planes),
        (Encoding::Float32, false) => decode_as::<4, Float32>(bytes, planes),
        (Encoding::Float64, false) => decode_as::<8, Float64>(bytes, planes),
        (Encoding::Pcm16, true) => decode_as::<2, Big<Pcm16>>(bytes, planes),
        (Encoding::Pcm24, true) => decode_as::<3, Big<Pcm24>>(bytes, planes),
        (Encoding::Pcm32, true) => decode_as::<4, Big<Pcm32>>(bytes, planes),
        (Encoding::Float32, true) => decode_as::<4, Big<Float32>>(bytes, planes),
        (Encoding::Float64, true) => decode_as::<8, Big<Float64>>(bytes, planes),
    }
}

fn decode_as<const N: usize, S: Sample<N>>(bytes: &[u8], planes: &mut [Vec<f64>]) {
    let (samples, _) = bytes.as_chunks::<N>();
    match planes {
        [mono] => mono.extend(samples.iter().map(|&s| S::decode(s))),
        [left, right] => {
            let (frames, _) = samples.as_chunks::<2>();
            left.extend(frames.iter().map(|&[l, _]| S::decode(l)));
            right.extend(frames.iter().map(|&[_, r]| S::decode(r)));
        }
        planes => {
            let channels = planes.len().max(1);
            for (channel, plane) in planes.iter_mut().enumerate() {
                plane.extend(samples.chunks_exact(channels).map(|frame| S::decode(frame[channel])));
            }
        }
    }
}

/// Writes frames `from..to` of the planes into `bytes`, which holds exactly them.
pub(crate) fn encode(
    encoding: Encoding,
    big_endian: bool,
    planes: &[Vec<f64>],
    from: usize,
    to: usize,
    bytes: &mut [u8],
) {
    match (encoding, big_endian) {
        (Encoding::Pcm8, _) => encode_as::<1, Pcm8>(planes, from, to, bytes),
        (Encoding::Pcm16, false) => encode_as::<2, Pcm16>(planes, from, to, bytes),
        (Encoding::Pcm24, false) => encode_as::<3, Pcm24>(planes, from, to, bytes),
        (Encoding::Pcm32, false) => encode_as::<4, Pcm32>(planes, from, to, bytes),
        (Encoding::Float32, false) => encode_as::<4, Float32>(planes, from, to, bytes),
        (Encoding::Float64, false) => encode_as::<8, Float64>(planes, from, to, bytes),
        (Encoding::Pcm16, true) => encode_as::<2, Big<Pcm16>>(planes, from, to, bytes),
        (Encoding::Pcm24, true) => encode_as::<3, Big<Pcm24>>(planes, from, to, bytes),
        (Encoding::Pcm32, true) => encode_as::<4, Big<Pcm32>>(planes, from, to, bytes),
        (Encoding::Float32, true) => encode_as::<4, Big<Float32>>(planes, from, to, bytes),
        (Encoding::Float64, true) => encode_as::<8, Big<Float64>>(planes, from, to, bytes),
    }
}

fn encode_as<const N: usize, S: Sample<N>>(planes: &[Vec<f64>], from: usize, to: usize, bytes: &mut [u8]) {
    let (samples, _) = bytes.as_chunks_mut::<N>();
    match planes {
        [mono] => {
            for (place, &value) in samples.iter_mut().zip(&mono[from..to]) {
                *place = S::encode(value);
            }
        }
        [left, right] => {
            let (frames, _) = samples.as_chunks_mut::<2>();
            for (frame, (&l, &r)) in frames.iter_mut().zip(left[from..to].iter().zip(&right[from..to])) {
                *frame = [S::encode(l), S::encode(r)];
            }
        }
        planes => {
            for (channel, plane) in planes.iter().enumerate() {
                for (frame, &value) in samples.chunks_exact_mut(planes.len()).zip(&plane[from..to]) {
                    frame[channel] = S::encode(value);
                }
            }
        }
    }
}

/// Frame of the first of `values` that `encoding` can't hold exactly: off its grid,
/// beyond its range, or not finite: it does not come back. (-0.0 is 0 to an integer.)
pub(crate) fn first_inexact(encoding: Encoding, values: &[f64]) -> Option<usize> {
    match encoding {
        Encoding::Pcm8 => first_where(values, |v| Pcm8::decode(Pcm8::encode(v)) == v),
        Encoding::Pcm16 => first_where(values, |v| Pcm16::decode(Pcm16::encode(v)) == v),
        Encoding::Pcm24 => first_where(values, |v| Pcm24::decode(Pcm24::encode(v)) == v),
        Encoding::Pcm32 => first_where(values, |v| Pcm32::decode(Pcm32::encode(v)) == v),
        Encoding::Float32 => first_where(values, |v| f64::from(v as f32) == v && v.is_finite()),
        Encoding::Float64 => first_where(values, f64::is_finite),
    }
}

/// Index of the first value that is not `good`: counted over the whole slice first,
/// which vectorizes, and looked for only if there is one.
pub(crate) fn first_where(values: &[f64], good: impl Fn(f64) -> bool) -> Option<usize> {
    let bad: u64 = values.iter().map(|&v| u64::from(!good(v))).sum();
    if bad == 0 { None } else { values.iter().position(|&v| !good(v)) }
}
