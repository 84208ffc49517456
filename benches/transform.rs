//! The transforms, as far as the public methods let them be seen alone.
//!
//! Factored: the grid's size follows from map and samples per spot, not from the number
//! of elements, so a far field of four elements is transform and irradiance of one term
//! and next to nothing else. Sampled: painting cannot be taken out, but without errors
//! it costs least; what remains is dominated by the two passes of transforms.
#![allow(missing_docs, reason = "the macros of criterion make public items")]

mod common;

use common::Trials;
use criterion::{Criterion, criterion_group, criterion_main};
use facula::farfield::Map;
use facula::scenario::{Errors, MethodChoice};

fn transforms(criterion: &mut Criterion) {
    let mut group = common::group(criterion, "transform");
    let none = Errors::none();
    for (name, setup) in [
        ("factored_one_term", common::square(2, "", None)),
        ("sampled_demo", common::demo(MethodChoice::Sampled)),
    ] {
        let mut map = Map::dark(setup.grid);
        Trials::fields(&setup, &none).run(|next| {
            group.bench_function(name, |bencher| bencher.iter(|| next(&mut map)));
        });
    }
    group.finish();
}

criterion_group!(benches, transforms);
criterion_main!(benches);
