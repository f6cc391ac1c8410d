//! The demo data is what its simulation makes, byte for byte.

use std::collections::BTreeMap;
use std::fs;
use std::path::Path;

#[allow(
    dead_code,
    reason = "the program is used here without its main function"
)]
#[path = "../demo-data/simulate.rs"]
mod simulate;

fn csv_files(folder: &Path) -> BTreeMap<String, Vec<u8>> {
    fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .filter(|path| path.extension().is_some_and(|ending| ending == "csv"))
        .map(|path| {
            let name = path.file_name().unwrap().to_string_lossy().into_owned();
            (name, fs::read(&path).unwrap())
        })
        .collect()
}

#[test]
fn the_demo_data_is_what_the_simulation_makes() {
    let made = tempfile::tempdir().unwrap();
    simulate::write_everything(made.path()).unwrap();
    let shipped = Path::new(env!("CARGO_MANIFEST_DIR")).join("demo-data");
    for (set, count) in [("lift-landings", 161), ("pump-restarts", 1)] {
        let files = csv_files(&shipped.join(set));
        assert_eq!(files.len(), count);
        assert!(files == csv_files(&made.path().join(set)), "{set} differs");
    }
}
