//! Many instances in one process.

use plumbtone_tests::clap_host::{Format, Instance, Running};

use crate::rig::{Log, awkward, instance, tone};

/// As many as a large session may hold.
const INSTANCES: usize = 64;

#[test]
fn sixty_four_instances_render_what_one_does() {
    let sound = vec![tone(21, 220.0, 0.5, 48_000.0); 2];
    let alone = crate::rig::render(&sound, 48_000.0, &[512]);
    let log = Log::open();
    let mut instances: Vec<Instance> = (0..INSTANCES).map(|_| instance()).collect();
    let format = Format { offline: true, ..Format::default() };
    let mut running: Vec<Running> =
        instances.iter_mut().map(|instance| instance.start(format).expect("it starts")).collect();
    for from in (0..sound[0].len()).step_by(512) {
        let to = sound[0].len().min(from + 512);
        let block: Vec<Vec<f32>> = sound.iter().map(|c| c[from..to].to_vec()).collect();
        for running in &mut running {
            assert!(running.play(&block, &[512]).expect("it processes"), "at {from}");
        }
    }
    for (instance, running) in instances.iter_mut().zip(running) {
        instance.stop(running);
    }
    let logs = log.readings();
    assert_eq!(logs.len(), INSTANCES, "one log each");
    for (number, readings) in logs.iter().enumerate() {
        assert_eq!(readings, &alone, "instance {number}");
    }
}

#[test]
fn instances_may_leave_while_their_analysis_is_busy() {
    let sound = vec![awkward(22, 60_000); 2];
    for _ in 0..5 {
        let mut instances: Vec<Instance> = (0..8).map(|_| instance()).collect();
        for instance in &mut instances {
            let mut running = instance
                .start(Format { block_max: 4096, offline: true, ..Format::default() })
                .expect("it starts");
            assert!(running.play(&sound, &[4096]).expect("it processes"), "unchanged");
            instance.stop(running);
        }
    }
}
