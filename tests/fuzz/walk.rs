//! A strict walk over an output beside its input: every size, every pad byte, every
//! chunk that counts as kept.

use bandproof::wave::{Chunk, Form, Header, WrittenFigures};

use crate::check::HISTORY;
use crate::document::is_wide;

const ELSEWHERE: u32 = u32::MAX;

fn word(file: &[u8], at: u64, form: Form) -> u32 {
    let bytes = file[at as usize..][..4].try_into().unwrap();
    if form == Form::Rifx { u32::from_be_bytes(bytes) } else { u32::from_le_bytes(bytes) }
}

fn wide_word(file: &[u8], at: u64) -> u64 {
    u64::from_le_bytes(file[at as usize..][..8].try_into().unwrap())
}

fn end(chunk: &Chunk) -> u64 {
    chunk.offset + 8 + chunk.bytes
}

fn body<'f>(file: &'f [u8], chunk: &Chunk) -> &'f [u8] {
    &file[chunk.offset as usize + 8..end(chunk) as usize]
}

/// What lies between a chunk and the next, or the end of the file.
fn gap<'f>(file: &'f [u8], chunks: &[Chunk], index: usize) -> &'f [u8] {
    let to = chunks.get(index + 1).map_or(file.len() as u64, |next| next.offset);
    &file[end(&chunks[index]) as usize..to as usize]
}

fn pad(chunk: &Chunk) -> &'static [u8] {
    &[0][..chunk.bytes as usize % 2]
}

/// What the size of each chunk says: its 32-bit field, or where that says so `ds64`,
/// whose table gives each of several chunks of a name the next entry of that name.
fn declared(file: &[u8], header: &Header) -> Vec<u64> {
    let wide = is_wide(header.form);
    let mut table = Vec::new();
    if wide {
        let ds64 = &header.chunks[0];
        assert_eq!((ds64.id, ds64.offset), (*b"ds64", 12));
        let entries = u64::from(word(file, 44, header.form)).min((ds64.bytes - 28) / 12);
        table.extend((0..entries).map(|k| (file[48 + 12 * k as usize..][..4].to_vec(), wide_word(file, 52 + 12 * k))));
    }
    let one = |chunk: &Chunk| {
        let field = word(file, chunk.offset + 4, header.form);
        if !wide || field != ELSEWHERE {
            return u64::from(field);
        }
        if chunk.id == *b"data" {
            return wide_word(file, 28);
        }
        let entry = table.iter().position(|(id, _)| *id == chunk.id);
        entry.map_or(u64::from(field), |entry| table.remove(entry).1)
    };
    header.chunks.iter().map(one).collect()
}

/// Where the RIFF ends by its own size.
fn riff_end(file: &[u8], form: Form) -> u64 {
    let field = word(file, 4, form);
    if is_wide(form) && field == ELSEWHERE { wide_word(file, 20) + 8 } else { u64::from(field) + 8 }
}

/// Each size is that of what is there. `carried`: the RIFF size may still be what it was
/// in the input, where it or the input's pad bytes do not go by the rules.
fn check_sizes(output: &[u8], header: &Header, carried: bool) {
    assert_eq!(header.chunks[0].offset, 12);
    let last = header.chunks.len() - 1;
    for (index, (chunk, declared)) in header.chunks.iter().zip(declared(output, header)).enumerate() {
        // Of an unknown name it may be no chunk at all, and stays.
        let cut =
            index == last && declared > chunk.bytes && header.notes.iter().any(|note| note.contains("kept as it is"));
        assert!(
            chunk.bytes == declared || (carried && cut),
            "{declared} declared for {}: {}",
            chunk.bytes,
            chunk.name()
        );
    }
    let unpadded = end(&header.chunks[last]);
    let padded = unpadded + u64::from(!gap(output, &header.chunks, last).is_empty()) * (header.chunks[last].bytes % 2);
    let riff_end = riff_end(output, header.form);
    let odd = header.chunks[last].bytes % 2;
    assert!(
        riff_end == padded || (carried && [unpadded, unpadded + odd, output.len() as u64].contains(&riff_end)),
        "the RIFF ends at {riff_end}, its last chunk at {padded}"
    );
    if is_wide(header.form) {
        let data = header.chunks.iter().find(|chunk| chunk.id == *b"data").unwrap();
        assert_eq!(wide_word(output, 28), data.bytes, "size of `data` in `ds64`");
        let entries = u64::from(word(output, 44, header.form));
        assert!(
            28 + 12 * entries <= header.chunks[0].bytes,
            "a table of {entries} in {} bytes",
            header.chunks[0].bytes
        );
    }
}

/// What the notes on an output say was done.
fn was(written: &WrittenFigures, what: &str) -> bool {
    written.notes.iter().any(|note| note.contains(what))
}

/// Holds `output`, of which `header` was read, against `file`, from which it was
/// written, with `input` its header.
pub fn walk(file: &[u8], input: &Header, output: &[u8], header: &Header, written: &WrittenFigures, is_legal: bool) {
    check_sizes(output, header, !is_legal);

    // Each chunk beside its own in the input, in order, but for what came in.
    assert_eq!(written.chunks.len(), input.chunks.len());
    let declared = declared(file, input);
    let mut at = usize::from(was(written, "a `ds64` of 36 bytes was put in"));
    let in_place = was(written, "was turned into its `ds64`");
    assert_eq!(at > 0 || in_place, input.form != header.form);
    let has_history = was(written, "was appended to");
    let first_of = |id| input.chunks.iter().position(|chunk| chunk.id == id);
    for (index, (chunk, fate)) in input.chunks.iter().zip(&written.chunks).enumerate() {
        assert_eq!((fate.id, fate.bytes), (chunk.id, chunk.bytes));
        let new = &header.chunks[at];
        let is_placeholder = in_place && index == 0;
        assert_eq!(new.id, if is_placeholder { *b"ds64" } else { chunk.id }, "where {} should stand", chunk.name());
        if fate.kept {
            assert!(body(output, new) == body(file, chunk), "{} counts as kept and is not", chunk.name());
            assert_eq!(word(output, new.offset + 4, header.form), word(file, chunk.offset + 4, input.form));
        } else {
            let described = has_history && first_of(*b"bext").or(first_of(*b"guan")) == Some(index);
            if described {
                appended(body(file, chunk), body(output, new), &chunk.id);
            } else if is_placeholder || (index == 0 && chunk.id == *b"ds64") {
                assert_eq!(new.bytes, chunk.bytes);
            } else if ![*b"fmt ", *b"fact", *b"data"].contains(&chunk.id) {
                // Its size may have been wrong; nothing else may be.
                assert_ne!(declared[index], chunk.bytes, "{} is not kept", chunk.name());
                assert!(body(output, new) == body(file, chunk), "{} is not kept", chunk.name());
            }
        }
        check_gap(
            gap(file, &input.chunks, index),
            gap(output, &header.chunks, at),
            new,
            at + 1 == header.chunks.len(),
            is_legal,
        );
        at += 1;
        if chunk.id == *b"fmt " && was(written, "`fact` chunk was added") {
            assert_eq!((header.chunks[at].id, header.chunks[at].bytes), (*b"fact", 4));
            assert!(at + 1 == header.chunks.len() || gap(output, &header.chunks, at).is_empty());
            at += 1;
        }
    }
    assert_eq!(at, header.chunks.len(), "more chunks than the input has");
}

/// Holds what follows a chunk of the output against what followed it in the input.
fn check_gap(before: &[u8], after: &[u8], chunk: &Chunk, is_last: bool, is_legal: bool) {
    let by_rule = after == pad(chunk);
    // Behind the last chunk something may trail, and it stays.
    let trails = is_last
        && after.strip_prefix(pad(chunk)).is_some_and(|tail| before.ends_with(tail) && before.len() <= tail.len() + 1);
    assert!(
        by_rule || (!is_legal && (before == after || trails)),
        "between {} and the next stand {after:?}, in the input {before:?}",
        chunk.name()
    );
}

/// Holds a body with one line of history more against the one it had: all of its text is
/// there, NUL bytes behind it may be used up, and no line but the new one came in.
fn appended(old: &[u8], new: &[u8], id: &[u8; 4]) {
    let fixed = if id == b"bext" { 602 } else { 0 };
    let text = |body: &[u8]| (body.len() - body.iter().rev().take_while(|&&byte| byte == 0).count()).max(fixed);
    let (old_text, new_text) = (text(old), text(new));
    assert!(new.len() >= old.len() && new.starts_with(&old[..old_text]), "text before the history was changed");
    let line = String::from_utf8(new[old_text..new_text].to_vec()).unwrap();
    assert_eq!(line.matches(HISTORY).count(), 1, "{line:?}");
    assert!(line.ends_with(['\n', '\r']), "{line:?}");
    assert_eq!(line.trim().split(['\n', '\r']).count(), 1, "{line:?}");
    assert!(new_text == new.len() || old_text < old.len(), "NUL bytes after text that had none");
}
