//! Reading every figure, and the encircled curve, from one map of 257 × 257 pixels.
#![allow(missing_docs, reason = "the macros of criterion make public items")]

mod common;

use common::Trials;
use criterion::{Criterion, criterion_group, criterion_main};
use facula::farfield::Map;
use std::hint::black_box;

fn figures(criterion: &mut Criterion) {
    let mut group = common::group(criterion, "figures");
    let setup = common::square(100, common::ERRORS, None);
    let mut map = Map::dark(setup.grid);
    Trials::fields(&setup, &setup.scenario.errors).run(|next| next(&mut map));
    let mut workspace = setup.reader.workspace();
    let power_w = setup.array.power_w();
    group.bench_function("read/257x257", |bencher| {
        bencher.iter(|| black_box(setup.reader.read(&map, power_w, &mut workspace)));
    });
    group.finish();
}

criterion_group!(benches, figures);
criterion_main!(benches);
