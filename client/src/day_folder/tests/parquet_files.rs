//! Tables stored as Parquet.

use super::*;
use arrow_array::{
    ArrayRef, BooleanArray, Decimal128Array, Float32Array, Float64Array, Int64Array, RecordBatch,
    StringArray, TimestampMicrosecondArray,
};
use parquet::arrow::ArrowWriter;
use std::sync::Arc;

fn bytes_of(columns: Vec<(&str, ArrayRef)>) -> Vec<u8> {
    let batch = RecordBatch::try_from_iter(columns).expect("a batch");
    let mut bytes = Vec::new();
    let mut writer = ArrowWriter::try_new(&mut bytes, batch.schema(), None).expect("a writer");
    writer.write(&batch).and_then(|()| writer.close().map(drop)).expect("written");
    bytes
}

fn flights() -> Vec<u8> {
    bytes_of(vec![
        ("flight", Arc::new(StringArray::from(vec!["101", "102"]))),
        ("departure", Arc::new(StringArray::from(vec!["XAAA", "XBBB"]))),
        ("destination", Arc::new(StringArray::from(vec!["XBBB", "XAAA"]))),
        ("aircraft", Arc::new(StringArray::from(vec!["MJET", "MJET"]))),
        ("mach", Arc::new(Float32Array::from(vec![Some(0.5), None]))),
        ("movable", Arc::new(BooleanArray::from(vec![Some(false), None]))),
    ])
}

fn points(last_level: i128) -> Vec<u8> {
    // 06:00 and 06:10 UTC of 2031-03-04.
    let times = [1_930_370_400_000_000, 1_930_371_000_000_000];
    let levels = Decimal128Array::from(vec![35_000, 35_000, 36_000, last_level])
        .with_precision_and_scale(10, 2)
        .expect("a decimal");
    bytes_of(vec![
        ("level_fl", Arc::new(levels)),
        ("flight", Arc::new(Int64Array::from(vec![101, 101, 102, 102]))),
        ("time", Arc::new(TimestampMicrosecondArray::from(times.repeat(2)).with_timezone("UTC"))),
        ("lon", Arc::new(Float64Array::from(vec![0.0, 1.0, 1.0, f64::NAN]))),
        ("lat", Arc::new(StringArray::from(vec!["50", "50", "51", "51.5"]))),
    ])
}

fn folder(points: &[u8]) -> TempDir {
    let folder = folder_with("=== flights.csv\n=== points.csv\n");
    fs::write(folder.path().join("flights.parquet"), flights()).expect("written");
    fs::write(folder.path().join("points.parquet"), points).expect("written");
    folder
}

#[test]
fn cells_keep_their_types_and_defects_name_the_row() {
    let folder = folder(&points(36_000));
    expect![[r#"
        points.parquet: row 4: column lon: NaN is not a finite number
    "#]]
    .assert_eq(&outcome(folder.path()));
}

#[test]
fn a_file_cut_anywhere_is_named_and_nothing_panics() {
    let whole = points(36_000);
    for length in (0..whole.len()).step_by(37) {
        let folder = folder(&whole[..length]);
        let said = outcome(folder.path());
        assert!(said.starts_with("points.parquet: "), "{length}: {said}");
    }
}

#[test]
fn damaged_bytes_never_panic() {
    let whole = points(36_000);
    for at in (0..whole.len()).step_by(11) {
        let mut damaged = whole.clone();
        damaged[at] ^= 0xff;
        // Damage may go unseen where it hits a value; that it ends is what is tested.
        outcome(folder(&damaged).path());
    }
}

#[test]
fn decisions_and_counts_are_read_from_parquet() {
    let folder = folder_with("");
    let decisions = bytes_of(vec![
        ("proposal", Arc::new(StringArray::from(vec![Some("P1"), None]))),
        ("flight", Arc::new(StringArray::from(vec![None, Some("BBB2")]))),
        ("must", Arc::new(StringArray::from(vec!["grant", "drop"]))),
        ("option", Arc::new(Int64Array::from(vec![Some(1), None]))),
    ]);
    fs::write(folder.path().join("decisions.parquet"), decisions).expect("written");
    // 06:00 UTC of 2031-03-04.
    let times = [1_930_370_400_000_000];
    let time = || Arc::new(TimestampMicrosecondArray::from(times.to_vec()).with_timezone("UTC"));
    let background = bytes_of(vec![
        ("sector", Arc::new(StringArray::from(vec!["NORTH"]))),
        ("from", time()),
        ("until", time()),
        ("aircraft", Arc::new(Float32Array::from(vec![f32::NAN]))),
    ]);
    fs::write(folder.path().join("background.parquet"), background).expect("written");
    expect![[r#"
        background.parquet: row 1: column aircraft: NaN is not a finite number
        decisions.parquet: row 2: column must: "drop" is not grant, refuse or keep
    "#]]
    .assert_eq(&outcome(folder.path()));
}
