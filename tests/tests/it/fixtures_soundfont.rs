//! The reader of sound banks, on a bank made by hand and on damaged ones.

use plumbtone_tests::soundfont::{Zone, read};

fn chunk(name: &str, body: &[u8]) -> Vec<u8> {
    let mut bytes = name.as_bytes().to_vec();
    let [a, b, c, d, ..] = body.len().to_le_bytes();
    bytes.extend([a, b, c, d]);
    bytes.extend(body);
    bytes.extend(vec![0; body.len() % 2]);
    bytes
}

fn list(kind: &str, chunks: &[Vec<u8>]) -> Vec<u8> {
    chunk("LIST", &[kind.as_bytes(), &chunks.concat()].concat())
}

fn name(text: &str) -> Vec<u8> {
    let mut bytes = text.as_bytes().to_vec();
    bytes.resize(20, 0);
    bytes
}

fn words(words: &[u16]) -> Vec<u8> {
    words.iter().flat_map(|word| word.to_le_bytes()).collect()
}

fn longs(longs: &[u32]) -> Vec<u8> {
    longs.iter().flat_map(|long| long.to_le_bytes()).collect()
}

/// One preset (program 40) of one instrument of one sample of four points, whose zone tunes by 12 cents.
fn bank() -> Vec<u8> {
    let preset =
        |text, program, bag| [name(text), words(&[program, 0, bag]), longs(&[0, 0, 0])].concat();
    let instrument = |text, bag| [name(text), words(&[bag])].concat();
    let header = |text, ends: [u32; 4]| {
        let place = longs(&[ends[0], ends[1], ends[2], ends[3], 22_050]);
        [name(text), place, vec![70, 251, 0, 0, 1, 0]].concat()
    };
    let tables = [
        chunk("phdr", &[preset("Fiddle", 40, 0), preset("EOP", 0, 1)].concat()),
        chunk("pbag", &words(&[0, 0, 1, 0])),
        chunk("pgen", &words(&[41, 0, 0, 0])),
        chunk("inst", &[instrument("Fiddle", 0), instrument("EOI", 1)].concat()),
        chunk("ibag", &words(&[0, 0, 3, 0])),
        chunk("igen", &words(&[52, 12, 58, 71, 53, 0, 0, 0])),
        chunk("shdr", &[header("Fiddle A4", [1, 5, 2, 4]), header("EOS", [0; 4])].concat()),
    ];
    let pcm = chunk("smpl", &words(&[9, 1, 2, 3, 65_535, 9]));
    let body = [b"sfbk".to_vec(), list("sdta", &[pcm]), list("pdta", &tables)].concat();
    chunk("RIFF", &body)
}

#[test]
fn a_bank_is_read() {
    let samples = read(&bank()).unwrap();
    assert_eq!(samples.len(), 1, "the last header only ends the table");
    let sample = &samples[0];
    assert_eq!(sample.name, "Fiddle A4");
    assert_eq!(sample.samples, [1, 2, 3, -1], "16-bit samples of the stretch");
    assert_eq!(sample.loop_points, (1, 3), "loop counted from the sample's start");
    assert_eq!((sample.root_key, sample.correction_cents), (70, -5), "key and correction");
    let zone = Zone { bank: 0, program: 40, root_key: Some(71), tune: (0, 12), scale_cents: 100 };
    assert_eq!(sample.zones, [zone], "what the zone says of the pitch");
}

#[test]
fn a_bank_cut_anywhere_is_an_error() {
    let whole = bank();
    for length in 0..whole.len() - 1 {
        assert!(read(&whole[..length]).is_err(), "cut after {length} of {} bytes", whole.len());
    }
}
