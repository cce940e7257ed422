//! Metadata of the demo recordings. Layouts: Microsoft and IBM, "Multimedia Programming
//! Interface and Data Specifications 1.0", 1991 (LIST, cue); EBU Tech 3285 (bext) and
//! R98 (coding history).

use super::chunks::Chunk;

/// Field notes: a file that is no recording.
pub const NOTES: &str = "\
Field notes, 2 May 2031

05:00  Calm, mist over the reeds, 4 C. Pumps running since high water.
05:12  First round of recordings. Booming bird west of station a.
05:40  Wind from the south-west picks up.
06:05  Pump switched from the mains to its own generator. It sounds sharper than before.
06:12  Last recording at station a.

Station b stopped by itself after three seconds at 05:42.
Station c has its low-cut switched on; its pump is under repair.
Station d was dead when we came to fetch it: battery flat.
";

/// What some file systems leave beside a recording: a name that ends in .wav, but no
/// recording.
pub fn dot_underscore() -> Vec<u8> {
    let mut bytes = vec![0x00, 0x05, 0x16, 0x07, 0x00, 0x02, 0x00, 0x00];
    bytes.resize(64, 0);
    bytes
}

/// A chunk no program knows, of odd size.
pub fn weather() -> Chunk {
    Chunk::new(b"wthr", "air 4 C, water 9 C, wind SW 2, mist")
}

/// Space kept free for an editor: not meant to be read.
pub fn padding() -> Chunk {
    Chunk::new(b"JUNK", vec![0; 28])
}

/// Title, comment and date.
pub fn info(title: &str) -> Chunk {
    let mut body = b"INFO".to_vec();
    for (id, text) in [(b"INAM", title), (b"ICMT", "Synthetic: made for a demonstration"), (b"ICRD", "2031-05-02")] {
        body.extend(Chunk::new(id, format!("{text}\0")).bytes());
    }
    Chunk::new(b"LIST", body)
}

/// Two cue points: one second in, and three.
pub fn cue(rate_hz: u32) -> Chunk {
    let mut body = 2u32.to_le_bytes().to_vec();
    for (id, seconds) in [(1u32, 1u32), (2, 3)] {
        let frame = seconds * rate_hz;
        body.extend(id.to_le_bytes());
        body.extend(frame.to_le_bytes());
        body.extend(b"data");
        body.extend([0; 8]);
        body.extend(frame.to_le_bytes());
    }
    Chunk::new(b"cue ", body)
}

/// Names of the cue points.
pub fn labels() -> Chunk {
    let mut body = b"adtl".to_vec();
    for (id, name) in [(1u32, "booming bird"), (2, "warblers")] {
        let mut label = id.to_le_bytes().to_vec();
        label.extend(name.bytes());
        label.push(0);
        body.extend(Chunk::new(b"labl", label).bytes());
    }
    Chunk::new(b"LIST", body)
}

/// Broadcast extension, version 1. `seconds` is the time since midnight.
pub fn broadcast(time: &str, seconds: u64, mode: &str) -> Chunk {
    let mut body = Vec::new();
    let mut field = |text: &str, size: usize| {
        let end = body.len() + size;
        body.extend(text.bytes().take(size));
        body.resize(end, 0);
    };
    field("Reed bed beside the pumping station, station b. Synthetic: made for a demonstration.", 256);
    field("station b", 32);
    field("REEDBED-B-20310502", 32);
    field("2031-05-02", 10);
    field(time, 8);
    body.extend((seconds * 44_100).to_le_bytes());
    body.extend(1u16.to_le_bytes());
    // UMID (none) and the reserved bytes.
    body.resize(602, 0);
    body.extend(format!("A=PCM,F=44100,W=24,M={mode},T=reed bed\r\n").bytes());
    Chunk::new(b"bext", body)
}

/// Production metadata in XML.
pub fn production() -> Chunk {
    let xml = "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n<BWFXML>\n  <IXML_VERSION>1.5</IXML_VERSION>\n  \
               <PROJECT>reed bed</PROJECT>\n  <SCENE>station b</SCENE>\n  <TAKE>1</TAKE>\n  \
               <NOTE>two microphones, 40 cm apart, 1.5 m above the water</NOTE>\n</BWFXML>\n";
    Chunk::new(b"iXML", xml)
}
