//! Drawing the errors of one group of 256 elements: every source alone, then all.
#![allow(missing_docs, reason = "the macros of criterion make public items")]

mod common;

use criterion::{Criterion, Throughput, criterion_group, criterion_main};
use facula::array::bands::GROUP;
use facula::perturb::TrialErrors;
use facula::perturb::block::{Block, Recipe, draw};
use facula::scenario::{Contributions, Dropped, Errors};
use std::hint::black_box;

fn draws(criterion: &mut Criterion) {
    let rms = |value: f64| Contributions {
        parts: vec![(String::new(), value)],
    };
    let all = Errors {
        piston_rad: rms(0.3),
        jitter_rad: rms(1e-6),
        dropout: 0.02,
        power_spread: 0.05,
        ..Errors::none()
    };
    let none = Errors::none;
    let sources = [
        (
            "piston",
            Errors {
                piston_rad: rms(0.3),
                ..none()
            },
        ),
        (
            "jitter",
            Errors {
                jitter_rad: rms(1e-6),
                ..none()
            },
        ),
        (
            "power_spread",
            Errors {
                power_spread: 0.05,
                ..none()
            },
        ),
        (
            "dropout_dark",
            Errors {
                dropout: 0.02,
                ..none()
            },
        ),
        (
            "dropout_unlocked",
            Errors {
                dropout: 0.02,
                dropped: Dropped::Unlocked,
                ..none()
            },
        ),
        ("all", all),
    ];
    let mut group = common::group(criterion, "draw");
    group.throughput(Throughput::Elements(GROUP as u64));
    for (name, errors) in &sources {
        let recipe = Recipe::new(TrialErrors {
            errors,
            seed: 1,
            trial: 0,
        });
        let mut block = Block::default();
        let mut number = 0;
        group.bench_function(*name, |bencher| {
            bencher.iter(|| {
                number += 1;
                draw(&recipe, number, &mut block);
                black_box(&block);
            });
        });
    }
    group.finish();
}

criterion_group!(benches, draws);
criterion_main!(benches);
