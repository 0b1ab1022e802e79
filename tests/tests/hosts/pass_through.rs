//! What goes in comes out, bit for bit and at once.

use plumbtone_tests::clap_host::Format;

use crate::rig::{awkward, instance};

/// Block lengths in samples; the last entry changes from block to block.
const BLOCKS: [&[usize]; 7] =
    [&[1], &[17], &[64], &[480], &[512], &[4096], &[1, 511, 17, 4096, 64, 3]];

#[test]
fn every_block_length_rate_and_channel_count_passes_unchanged() {
    for sample_rate_hz in [44_100.0, 48_000.0, 96_000.0, 192_000.0] {
        for channels in [1, 2] {
            let sound: Vec<Vec<f32>> =
                (7..).map(|seed| awkward(seed, 9_000)).take(channels).collect();
            let mut instance = instance();
            for offline in [false, true] {
                for blocks in BLOCKS {
                    let block_max = blocks.iter().copied().max().unwrap_or(1);
                    let format = Format { sample_rate_hz, block_max, channels, offline };
                    let mut running = instance.start(format).expect("it starts");
                    let equal = running.play(&sound, blocks).expect("it processes");
                    assert!(equal, "{format:?}, blocks of {blocks:?}");
                    assert_eq!(instance.latency().expect("a latency"), 0, "{format:?}");
                    instance.stop(running);
                }
            }
        }
    }
}
