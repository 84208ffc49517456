//! Whole trials on one thread, from drawing to the full set of figures.
#![allow(missing_docs, reason = "the macros of criterion make public items")]

mod common;

use common::Trials;
use criterion::{Criterion, Throughput, criterion_group, criterion_main};
use facula::farfield::Map;
use facula::scenario::MethodChoice;
use facula::study::setup::Setup;

fn trials(criterion: &mut Criterion) {
    let mut group = common::group(criterion, "trial");
    let mut measure = |name: &str, setup: Setup| {
        group.throughput(Throughput::Elements(setup.array.len() as u64));
        let mut map = Map::dark(setup.grid);
        Trials::whole(&setup).run(|next| {
            group.bench_function(name, |bencher| bencher.iter(|| next(&mut map)));
        });
    };
    for side in [100, 316, 1000, 2860] {
        let name = format!("factored/{side}x{side}");
        measure(&name, common::square(side, common::ERRORS, None));
    }
    measure("factored/demo", common::demo(MethodChoice::Factored));
    measure("sampled/demo", common::demo(MethodChoice::Sampled));
    measure("direct/demo", common::demo(MethodChoice::Direct));
    group.finish();
}

criterion_group!(benches, trials);
criterion_main!(benches);
