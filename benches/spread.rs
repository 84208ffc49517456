//! Spreading elements onto the grid of the factored method.
//!
//! The stage has no public entry of its own. It is reached with errors that draw
//! nothing (see `common::nothing_drawn`): then a far field is phasors, spreading, and
//! the transform and irradiance that `transform` times alone. The second case carries
//! the terms that jitter needs, so that its difference from the first is what those
//! terms cost. Without any error at all, rows are sums read from a table: the third case.
#![allow(missing_docs, reason = "the macros of criterion make public items")]

mod common;

use common::Trials;
use criterion::{Criterion, Throughput, criterion_group, criterion_main};
use facula::farfield::Map;
use facula::scenario::Errors;

fn spreads(criterion: &mut Criterion) {
    let mut group = common::group(criterion, "spread");
    let (nothing_drawn, none) = (common::nothing_drawn(), Errors::none());
    for side in [100, 1000] {
        group.throughput(Throughput::Elements((side * side) as u64));
        let still = common::square(side, "", None);
        let tilting = common::square(side, common::ERRORS, None);
        for (name, setup, errors) in [
            ("one_term", &still, &nothing_drawn),
            ("terms_of_jitter", &tilting, &nothing_drawn),
            ("without_errors", &still, &none),
        ] {
            let mut map = Map::dark(setup.grid);
            Trials::fields(setup, errors).run(|next| {
                group.bench_function(format!("{name}/{side}x{side}"), |bencher| {
                    bencher.iter(|| next(&mut map));
                });
            });
        }
    }
    group.finish();
}

criterion_group!(benches, spreads);
criterion_main!(benches);
