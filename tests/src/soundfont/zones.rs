//! Which presets play a sample, and what their generators say of its pitch.

use std::collections::BTreeMap;

use super::riff::{Chunks, Records};
use super::{BankError, ZonesBySample};

/// Generator numbers (specification, 8.1.2).
const INSTRUMENT: u16 = 41;
const COARSE_TUNE: u16 = 51;
const FINE_TUNE: u16 = 52;
const SAMPLE: u16 = 53;
const SCALE_TUNING: u16 = 56;
const OVERRIDING_ROOT_KEY: u16 = 58;

/// A zone that plays a sample.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Zone {
    /// Bank of the preset; 128 holds percussion.
    pub bank: u16,
    /// General MIDI program of the preset, from 0.
    pub program: u16,
    /// Root key instead of the sample's own.
    pub root_key: Option<u8>,
    /// Transposition by the player: semitones and cents.
    pub tune: (i16, i16),
    /// Cents between neighbouring keys.
    pub scale_cents: i16,
}

type Generators = BTreeMap<u16, i16>;

pub(super) fn by_sample(chunks: &Chunks<'_>) -> Result<ZonesBySample, BankError> {
    let presets = chunks.records("phdr", 38)?;
    let preset_zones = ZoneTable::read(chunks, "pbag", "pgen")?;
    let instruments = chunks.records("inst", 22)?;
    let instrument_zones = ZoneTable::read(chunks, "ibag", "igen")?;
    let mut zones = ZonesBySample::new();
    for preset in 0..presets.len().saturating_sub(1) {
        let header = presets.at(preset)?;
        let (program, bank) = (header.u16(20)?, header.u16(22)?);
        for outer in preset_zones.of(presets, preset, 24, INSTRUMENT)? {
            let Some(instrument) = index(&outer, INSTRUMENT) else { continue };
            for inner in instrument_zones.of(instruments, instrument, 20, SAMPLE)? {
                let Some(sample) = index(&inner, SAMPLE) else { continue };
                zones.entry(sample).or_default().push(zone(bank, program, &outer, &inner));
            }
        }
    }
    Ok(zones)
}

/// Values of a preset's zone add to those of its instrument's zone.
fn zone(bank: u16, program: u16, outer: &Generators, inner: &Generators) -> Zone {
    let tune = |number| {
        inner.get(&number).copied().unwrap_or(0) + outer.get(&number).copied().unwrap_or(0)
    };
    Zone {
        bank,
        program,
        root_key: inner
            .get(&OVERRIDING_ROOT_KEY)
            .and_then(|&key| u8::try_from(key).ok())
            .filter(|key| *key < 128),
        tune: (tune(COARSE_TUNE), tune(FINE_TUNE)),
        scale_cents: inner.get(&SCALE_TUNING).copied().unwrap_or(100)
            + outer.get(&SCALE_TUNING).copied().unwrap_or(0),
    }
}

fn index(generators: &Generators, number: u16) -> Option<usize> {
    // Generator amounts are 16 bits that an index uses unsigned.
    generators.get(&number).map(|&amount| usize::from(amount.cast_unsigned()))
}

/// The zones of all presets, or of all instruments.
struct ZoneTable<'a> {
    bags: Records<'a>,
    generators: Records<'a>,
}

impl<'a> ZoneTable<'a> {
    fn read(chunks: &Chunks<'a>, bags: &str, generators: &str) -> Result<Self, BankError> {
        Ok(Self { bags: chunks.records(bags, 4)?, generators: chunks.records(generators, 4)? })
    }

    /// The zones of one owner that have the generator `needed`, each with the values of the owner's global zone (its
    /// first, when that lacks `needed`) underneath.
    fn of(
        &self,
        owners: Records<'_>,
        owner: usize,
        bag_offset: usize,
        needed: u16,
    ) -> Result<Vec<Generators>, BankError> {
        let first = owners.at(owner)?.u16(bag_offset)?;
        let last = owners.at(owner + 1)?.u16(bag_offset)?;
        let mut global = Generators::new();
        let mut zones = Vec::new();
        for bag in first..last {
            let own = self.generators_of(usize::from(bag))?;
            if own.contains_key(&needed) {
                let mut all = global.clone();
                all.extend(own);
                zones.push(all);
            } else if bag == first {
                global = own;
            }
        }
        Ok(zones)
    }

    fn generators_of(&self, bag: usize) -> Result<Generators, BankError> {
        let first = self.bags.at(bag)?.u16(0)?;
        let last = self.bags.at(bag + 1)?.u16(0)?;
        (first..last)
            .map(|index| {
                let generator = self.generators.at(usize::from(index))?;
                Ok((generator.u16(0)?, generator.i16(2)?))
            })
            .collect()
    }
}
