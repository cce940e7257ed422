//! Laws of a whole run over one recording: filtered, nothing but the samples changes, and
//! whatever came in, what goes out is what the figures say.

use std::io::Cursor;
use std::sync::LazyLock;

use bandproof::design::design;
use bandproof::job::plan::treatment;
use bandproof::job::recording::{Processed, Treatment, process};
use bandproof::spec::{self, SpecSyntax};
use bandproof::wave::{Encoding, Form, Header, Reader};
use proptest::prelude::*;
use proptest::sample::select;

use crate::check::check_claims;
use crate::corpus::{FORMS, Layout, document, fmt, layouts, samples};
use crate::document::{Document, Ds64, Piece, is_wide, piece};
use crate::mutate::{restructure, strike};
use crate::random::Random;

/// A filter that changes every sample but silence, and room for what it overshoots.
const SPEC: &str = "
[output]
overload = \"clip\"
gain_db = -1.5
[[stage]]
kind = \"highpass\"
family = \"butterworth\"
order = 2
edge_hz = 300
";

static TREATMENTS: LazyLock<Vec<(u32, Treatment)>> = LazyLock::new(|| {
    let spec = spec::parse(SPEC.as_bytes(), SpecSyntax::Toml, "spec.toml").unwrap_or_else(|error| panic!("{error}"));
    let mut rates: Vec<u32> = layouts().iter().map(|layout| layout.rate_hz).collect();
    rates.sort_unstable();
    rates.dedup();
    let of = |rate_hz| treatment(&spec, &design(&spec, rate_hz).unwrap_or_else(|error| panic!("{error}")));
    rates.into_iter().map(|rate_hz| (rate_hz, of(rate_hz))).collect()
});

fn treatment_of(rate_hz: u32) -> Option<&'static Treatment> {
    TREATMENTS.iter().find(|(rate, _)| *rate == rate_hz).map(|(_, treatment)| treatment)
}

/// What comes of a recording; `None` where it is refused, or of a rate without a filter.
fn run(file: &[u8]) -> Option<(Header, Vec<u8>, Processed)> {
    let reader = Reader::open(Cursor::new(file)).ok()?;
    let header = reader.header().clone();
    let treatment = treatment_of(header.rate_hz)?;
    let (output, processed) = process(reader, Cursor::new(Vec::new()), treatment, &|_| Ok(())).ok()?;
    Some((header, output.into_inner(), processed))
}

/// Four letters that no reader gives a meaning.
fn any_id() -> impl Strategy<Value = [u8; 4]> {
    let letters = prop::collection::vec(0x21u8..0x7f, 4);
    letters.prop_map(|letters| [letters[0], letters[1], letters[2], letters[3]]).prop_filter("it has one", |id| {
        let meant: [&[u8; 4]; 14] = [
            b"fmt ", b"data", b"fact", b"wavl", b"slnt", b"RIFF", b"RIFX", b"RF64", b"BW64", b"ds64", b"LIST", b"list",
            b"bext", b"guan",
        ];
        !meant.contains(&id)
    })
}

fn leaf() -> impl Strategy<Value = Piece> {
    let body = prop_oneof![4 => 0usize..40, 1 => 0usize..3000]
        .prop_flat_map(|bytes| prop::collection::vec(any::<u8>(), bytes));
    let id = prop_oneof![any_id(), select(vec![*b"JUNK", *b"cue ", *b"smpl", *b"iXML", *b"PAD ", *b"acid", *b"MD5 "])];
    (id, body).prop_map(|(id, body)| piece(&id, body))
}

/// Lists in lists, of any chunks, each padded by the rules.
fn tree() -> impl Strategy<Value = Piece> {
    leaf().prop_recursive(3, 12, 4, |inner| {
        let kind = select(vec![*b"INFO", *b"adtl", *b"zzzz"]);
        (kind, prop::collection::vec(inner, 0..4), any::<bool>()).prop_map(|(kind, children, lower)| {
            let mut body = kind.to_vec();
            for child in children {
                body.extend(child.id);
                body.extend((child.body.len() as u32).to_le_bytes());
                body.extend(&child.body);
                body.resize(body.len() + child.body.len() % 2, 0);
            }
            piece(if lower { b"list" } else { b"LIST" }, body)
        })
    })
}

/// A legal recording: chunks of any kind, number and size around `fmt ` and `data`.
fn legal() -> impl Strategy<Value = Document> {
    let trees = || prop::collection::vec(tree(), 0..5);
    let frames = prop_oneof![4 => 1usize..200, 1 => 20_000usize..30_000];
    (select(FORMS.to_vec()), select(layouts()), trees(), trees(), trees(), frames, any::<u64>()).prop_map(
        |(form, layout, first, between, last, frames, seed)| {
            let mut random = Random::of_case(seed, 0);
            let mut pieces = first;
            pieces.push(piece(b"fmt ", fmt(form, layout)));
            pieces.extend(between);
            pieces.push(piece(b"data", samples(form, layout, frames, &mut random)));
            pieces.extend(last);
            let ds64 = is_wide(form).then(Ds64::default);
            Document { form, riff_size: None, ds64, pieces, tail: Vec::new() }
        },
    )
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 400, ..ProptestConfig::default() })]

    #[test]
    fn legal_trees_survive_a_filter_byte_for_byte_but_for_the_samples(document in legal()) {
        let file = document.bytes();
        let (header, output, processed) = run(&file).expect("a legal recording is filtered");
        let samples = header.data_offset as usize..(header.data_offset + header.data_bytes) as usize;
        prop_assert_eq!(output.len(), file.len());
        prop_assert!(output[..samples.start] == file[..samples.start]);
        prop_assert!(output[samples.end..] == file[samples.end..]);
        let trees: Vec<_> = document.pieces.iter().map(|piece| (piece.id, piece.body.len() as u64)).collect();
        let read: Vec<_> = header.chunks.iter().map(|chunk| (chunk.id, chunk.bytes)).collect();
        prop_assert_eq!(&read[usize::from(document.ds64.is_some())..], trees);
        let kept = processed.written.chunks.iter().filter(|chunk| chunk.id != *b"data").all(|chunk| chunk.kept);
        prop_assert!(kept);
        // The filter takes away what is constant: of more than a few frames something changes.
        prop_assert!(header.frames < 20 || output[samples.clone()] != file[samples]);
        check_claims(&file, &header, &output, &processed);
    }

    #[test]
    fn what_comes_of_damage_is_what_the_figures_say(
        form in select(FORMS.to_vec()), layout in select(layouts()), number in 0usize..1000, seed in any::<u64>(),
    ) {
        let mut random = Random::of_case(seed, 1);
        let lenders: Vec<_> = FORMS.iter().map(|&form| document(form, layout, number, 30, &mut random)).collect();
        let mut damaged = document(form, layout, number, 1 + number % 60, &mut random);
        for _ in 0..1 + random.below(2) {
            restructure(&mut damaged, &lenders, &mut random);
        }
        let mut file = damaged.bytes();
        if random.one_in(3) {
            strike(&mut file, &lenders[0].bytes(), &mut random);
        }
        if let Some((header, output, processed)) = run(&file) {
            check_claims(&file, &header, &output, &processed);
        }
    }
}

/// The laws say nothing if no recording gets through.
#[test]
fn most_recordings_with_one_defect_are_filtered_or_refused_in_fair_shares() {
    let mut random = Random::of_case(3, 0);
    let layout = Layout { encoding: Encoding::Pcm16, channels: 2, rate_hz: 48_000, bits: 16, extensible: None };
    let lender = [document(Form::Riff, layout, 2, 30, &mut random)];
    let filtered = (0..400).filter(|&number| {
        let mut damaged = document(FORMS[number % 4], layout, number, 40, &mut random);
        restructure(&mut damaged, &lender, &mut random);
        run(&damaged.bytes()).is_some()
    });
    let filtered = filtered.count();
    assert!((100..350).contains(&filtered), "{filtered} of 400");
}
