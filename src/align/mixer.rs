//! All channels of one recording as one signal, and whether it ever changes.

/// Weights of the channels, repeated. All different, so that neither equal nor opposite
/// channels cancel: two channels of one sound and opposite sign keep 40 % of it.
const WEIGHTS: [f64; 8] = [1.0, 0.6, 0.85, 0.5, 0.95, 0.55, 0.8, 0.45];

/// Beyond this magnitude (f32 ends at 3e38) a sample is taken as this large, so that
/// energies of whole chunks stay finite in f64 and sums in f32.
const LARGEST: f64 = 1e30;

/// Mixes the channels of one side.
#[derive(Clone, Debug, Default)]
pub(super) struct Mixer {
    first: Vec<f64>,
    frames: u64,
    changes: bool,
    sounds: bool,
}

impl Mixer {
    /// Mixes the next frames into `out`, which is emptied first; as many as the shortest
    /// plane has. f32 keeps 24 bits: its rounding lies 150 dB below the signal.
    pub(super) fn mix(&mut self, planes: &[Vec<f64>], out: &mut Vec<f32>) {
        out.clear();
        let frames = planes.iter().map(Vec::len).min().unwrap_or(0);
        if frames == 0 {
            return;
        }
        if self.first.is_empty() {
            self.first = planes.iter().map(|plane| plane[0]).collect();
        }
        if !self.changes {
            self.look(planes);
        }
        self.frames += frames as u64;
        let weights = WEIGHTS.iter().cycle();
        for (channel, (plane, weight)) in planes.iter().zip(weights).enumerate() {
            let weighted = plane[..frames].iter().map(|x| (x * weight).clamp(-LARGEST, LARGEST) as f32);
            if channel == 0 {
                out.extend(weighted);
            } else {
                out.iter_mut().zip(weighted).for_each(|(sum, x)| *sum += x);
            }
        }
    }

    fn look(&mut self, planes: &[Vec<f64>]) {
        self.changes = planes.iter().zip(&self.first).any(|(plane, first)| plane.iter().any(|x| x != first));
        self.sounds |= self.changes || self.first.iter().any(|x| *x != 0.0);
    }

    /// Frames taken.
    pub(super) fn frames(&self) -> u64 {
        self.frames
    }

    /// Whether any channel ever changes.
    pub(super) fn changes(&self) -> bool {
        self.changes
    }

    /// Whether any sample differs from 0.
    pub(super) fn sounds(&self) -> bool {
        self.sounds
    }
}
