//! What a study prints: the answer first, at most 100 columns wide.

use super::units::{fixed, readable, significant, unit_for};
use crate::quantity::Kind;
use crate::scenario::names::Named;
use crate::scenario::{Bound, Comparison, Figure, Statistic};
use crate::study::assess::Outcome;
use crate::study::requirement::Verdict;
use comfy_table::{CellAlignment, ColumnConstraint, LineStyle, Table, TableStyle, Width};

/// Widest line.
pub const COLUMNS: usize = 100;

/// The line of caution under every result.
pub const CAUTION: &str = "Caution: such beams blind and burn. Nothing here clears a hazard: ask your laser safety officer.";

/// A name as prose: `bucket fraction`.
pub fn spoken(figure: Figure) -> String {
    match figure {
        Figure::Strehl => "Strehl ratio".to_string(),
        Figure::StrehlPeak => "Strehl ratio of the peak".to_string(),
        Figure::Fwhm => "FWHM".to_string(),
        Figure::FwhmX => "FWHM along u".to_string(),
        Figure::FwhmY => "FWHM along v".to_string(),
        Figure::SecondMomentX => "4σ width along u".to_string(),
        Figure::SecondMomentY => "4σ width along v".to_string(),
        Figure::Encircled50Diameter => "50 % circle, diameter".to_string(),
        Figure::Encircled80Diameter => "80 % circle, diameter".to_string(),
        Figure::Encircled86Diameter => "86.5 % circle, diameter".to_string(),
        other => other.name().replace('_', " "),
    }
}

/// A bound as prose: `bucket fraction ≥ 0.74`.
pub fn spoken_bound(bound: &Bound) -> String {
    let sign = match bound.comparison {
        Comparison::AtLeast => "≥",
        Comparison::AtMost => "≤",
    };
    // Four digits say every bound that people write; more would show rounding.
    format!(
        "{} {sign} {}",
        spoken(bound.figure),
        plain(bound.value, bound.figure.kind())
    )
}

/// A value with as many of four significant digits as say anything.
fn plain(value: f64, kind: Kind) -> String {
    (1..4)
        .map(|digits| readable(value, kind, digits))
        .find(|text| {
            *text == readable(value, kind, 4) || same_number(text, &readable(value, kind, 4))
        })
        .unwrap_or_else(|| readable(value, kind, 4))
}

/// Whether two texts show the same number and unit but for trailing zeros.
fn same_number(short: &str, long: &str) -> bool {
    let split = |text: &str| {
        let (number, unit) = text.split_once(' ').unwrap_or((text, ""));
        (number.parse::<f64>().ok(), unit.to_string())
    };
    let ((a, unit_a), (b, unit_b)) = (split(short), split(long));
    unit_a == unit_b
        && a.zip(b)
            .is_some_and(|(a, b)| (a - b).abs() <= 1e-12 * b.abs())
}

/// A share in per cent, with one decimal where it is not whole.
pub fn per_cent(share: f64) -> String {
    let value = 100.0 * share;
    if (value - value.round()).abs() < 1e-9 {
        format!("{value:.0} %")
    } else {
        format!("{value:.1} %")
    }
}

/// The answer in one line: met or not, by what share of the trials.
pub fn answer(outcome: &Outcome) -> String {
    let require = &outcome.setup.scenario.require;
    let Verdict {
        met_share,
        interval,
        met,
        bounds,
    } = &outcome.verdict;
    let Some(met) = met else {
        return "No requirement is stated: add bounds under [require] to be told whether it is met.".into();
    };
    let verdict = if *met {
        "Requirement met"
    } else {
        "Requirement NOT met"
    };
    let statistic = match require.statistic {
        Statistic::Trials => {
            let share = met_share.unwrap_or(0.0);
            let (low, high) = interval.unwrap_or((0.0, 1.0));
            return format!(
                "{verdict}: {} of {} trials meet every bound (95 % interval {} to {}), {} asked.",
                per_cent(share),
                outcome.trials.trials.len(),
                per_cent(low),
                per_cent(high),
                per_cent(require.confidence),
            );
        }
        Statistic::Mean => "mean over the trials",
        Statistic::LongExposure => "long exposure",
    };
    let missed = bounds.iter().filter(|each| !each.met).count();
    let which = match (bounds.len(), missed) {
        (1, 0) => "meets the bound".to_string(),
        (_, 0) => "meets every bound".to_string(),
        (1, _) => "misses the bound".to_string(),
        (all, missed) => format!("misses {missed} of {all} bounds"),
    };
    format!("{verdict}: the {statistic} {which}.")
}

/// Everything that `assess` prints, the answer first.
pub fn of_assess(outcome: &Outcome) -> String {
    let mut lines = vec![
        one_line(&outcome.setup.scenario.title),
        String::new(),
        answer(outcome),
    ];
    lines.extend(bound_lines(outcome));
    lines.extend(limits(outcome));
    lines.push(String::new());
    lines.extend(
        [4, 3, 2]
            .map(|digits| figure_table(outcome, digits))
            .iter()
            .find(|table| table.lines().all(|line| line.chars().count() <= COLUMNS))
            .unwrap_or(&figure_table(outcome, 2))
            .lines()
            .map(|line| line.trim_end().to_string()),
    );
    lines.push(String::new());
    lines.extend(setting(outcome));
    lines.extend(outcome.notes.iter().map(|note| format!("Note: {note}")));
    lines.push(CAUTION.to_string());
    lines
        .iter()
        .flat_map(|line| wrap(line))
        .map(|line| line + "\n")
        .collect()
}

/// One line for each bound.
fn bound_lines(outcome: &Outcome) -> Vec<String> {
    outcome
        .verdict
        .bounds
        .iter()
        .map(|each| {
            let verdict = match each.judged {
                _ if outcome.setup.scenario.require.statistic == Statistic::Trials => {
                    format!("{} of trials", per_cent(each.met_share))
                }
                Some(value) => readable(value, each.bound.figure.kind(), 4),
                None => "undefined".to_string(),
            };
            let mark = if each.met { "met" } else { "missed" };
            format!("  {:<44} {mark:<7} {verdict}", spoken_bound(&each.bound))
        })
        .collect()
}

/// What limits the hardest bound: its value without errors, and with each source alone.
fn limits(outcome: &Outcome) -> Vec<String> {
    let hardest = outcome
        .verdict
        .bounds
        .iter()
        .min_by(|a, b| a.met.cmp(&b.met).then(a.met_share.total_cmp(&b.met_share)));
    let Some(hardest) = hardest else {
        return Vec::new();
    };
    let figure = hardest.bound.figure;
    let show = |value: f64| readable(value, figure.kind(), 3);
    let Some(ideal) = outcome.setup.ideal.figures.get(figure) else {
        return Vec::new();
    };
    if !crate::study::requirement::meets(&hardest.bound, Some(ideal)) {
        return vec![format!(
            "Limited by the design: even without errors {} is {}.",
            spoken(figure),
            show(ideal)
        )];
    }
    let mut sources: Vec<(&str, f64)> = outcome
        .alone
        .iter()
        .filter_map(|each| Some((each.source, each.figures.get(figure)?)))
        .collect();
    // The costliest first: farthest from the ideal towards the bound.
    let sign = match hardest.bound.comparison {
        Comparison::AtLeast => 1.0,
        Comparison::AtMost => -1.0,
    };
    sources.sort_by(|a, b| (sign * a.1).total_cmp(&(sign * b.1)));
    // Only losses that the digits shown can tell.
    sources.retain(|(_, value)| sign * (ideal - value) > 0.0 && show(*value) != show(ideal));
    if sources.is_empty() {
        return vec![format!(
            "No error takes {} closer to its bound than its {} without errors.",
            spoken(figure),
            show(ideal)
        )];
    }
    let parts: Vec<String> = sources
        .iter()
        .map(|(source, value)| format!("{} {}", source.replace('_', " "), show(*value)))
        .collect();
    vec![format!(
        "Limited by {}: {} without errors; alone, {}.",
        spoken(figure),
        show(ideal),
        parts.join(", ")
    )]
}

/// The figures, a row each, in the unit that suits the row, to so many digits.
fn figure_table(outcome: &Outcome, digits: usize) -> String {
    let mut table = Table::new();
    table.load_style(TableStyle::new().header_separator(LineStyle::none().fill('─').junction('─')));
    table.set_header([
        "",
        "no errors",
        "mean ± std. error",
        "5 %",
        "95 %",
        "long exposure",
    ]);
    for (figure, summary) in &outcome.statistics {
        let ideal = outcome.setup.ideal.figures.get(*figure);
        let long = outcome.long_exposure.figures.get(*figure);
        let values = [ideal, summary.mean, summary.p05, summary.p95, long];
        if values.iter().all(Option::is_none) {
            continue;
        }
        let largest = values
            .iter()
            .flatten()
            .fold(0.0, |a: f64, b| a.max(b.abs()));
        let unit = unit_for(largest, figure.kind());
        let number = |value: Option<f64>| {
            value.map_or("–".to_string(), |value| {
                significant(value / unit.factor, digits)
            })
        };
        let mean = match (summary.mean, summary.standard_error) {
            (Some(mean), Some(error)) if error > 0.0 => {
                mean_and_error(mean / unit.factor, error / unit.factor, digits)
            }
            (mean, _) => number(mean),
        };
        let label = if unit.symbol.is_empty() {
            spoken(*figure)
        } else {
            format!("{}, {}", spoken(*figure), unit.symbol)
        };
        table.add_row([
            label,
            number(ideal),
            mean,
            number(summary.p05),
            number(summary.p95),
            number(long),
        ]);
    }
    for column in table.column_iter_mut().skip(1) {
        column.set_cell_alignment(CellAlignment::Right);
    }
    if let Some(first) = table.column_mut(0) {
        first.set_constraint(ColumnConstraint::LowerBoundary(Width::Fixed(30)));
    }
    table.set_width(COLUMNS as u16);
    table.to_string()
}

/// `0.9328 ± 0.0015`: two digits of the error decide how many decimals the mean deserves.
fn mean_and_error(mean: f64, error: f64, digits: usize) -> String {
    let decimals = 1.0 - error.log10().floor();
    if mean.abs() < 1e6 && decimals <= 9.0 {
        let decimals = decimals.max(0.0) as usize;
        format!("{} ± {}", fixed(mean, decimals), fixed(error, decimals))
    } else {
        format!("{} ± {}", significant(mean, digits), significant(error, 2))
    }
}

/// What was computed, in three lines.
fn setting(outcome: &Outcome) -> Vec<String> {
    let setup = &outcome.setup;
    let (array, scenario) = (&setup.array, &setup.scenario);
    let predicted = outcome
        .predicted
        .figures
        .get(Figure::Strehl)
        .map_or(String::new(), |strehl| {
            format!(
                " Closed form: mean Strehl ratio {}.",
                significant(strehl, 4)
            )
        });
    vec![
        format!(
            "Array: {} elements ({}), D {}, fill factor {}, aperture efficiency {}.",
            array.len(),
            array.element.shape.name(),
            readable(array.envelope_diameter_m, Kind::Length, 4),
            significant(array.fill_factor(), 3),
            significant(setup.aperture_efficiency(), 3),
        ),
        format!(
            "Target: {} away, spot λL/D {}; map {} wide, {} × {} pixels.",
            readable(array.range_m, Kind::Length, 4),
            readable(array.spot_m(), Kind::Length, 4),
            readable(setup.grid.width_m(), Kind::Length, 3),
            setup.grid.pixels,
            setup.grid.pixels,
        ),
        match setup.closed_form {
            Some(_) => "Run: means in closed form, no trials.".to_string(),
            None => format!(
                "Run: {} trials, seed {}, method \"{}\".{predicted}",
                scenario.run.trials,
                scenario.run.seed,
                setup.method(),
            ),
        },
    ]
}

/// A title as a terminal can take it: one line, no control characters, not without end.
pub fn one_line(title: &str) -> String {
    const MOST: usize = 300;
    let mut shown: String = title
        .chars()
        .take(MOST)
        .map(|letter| if letter.is_control() { ' ' } else { letter })
        .collect();
    if title.chars().nth(MOST).is_some() {
        shown.push('…');
    }
    shown
}

/// Break a line of prose at spaces; lines of a table are short enough already.
pub fn wrap(line: &str) -> Vec<String> {
    let width = |text: &str| text.chars().count();
    if width(line) <= COLUMNS {
        return vec![line.to_string()];
    }
    let mut lines = vec![String::new()];
    for word in line.split(' ') {
        let last = lines.len() - 1;
        if lines[last].is_empty() && last == 0 {
            lines[last].push_str(word);
        } else if width(&lines[last]) + 1 + width(word) <= COLUMNS {
            lines[last].push(' ');
            lines[last].push_str(word);
        } else {
            lines.push(format!("  {word}"));
        }
    }
    // A word without a space to break at is cut.
    lines
        .iter()
        .flat_map(|line| {
            let letters: Vec<char> = line.chars().collect();
            letters
                .chunks(COLUMNS)
                .map(String::from_iter)
                .collect::<Vec<_>>()
        })
        .collect()
}
