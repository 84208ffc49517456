//! Reads `[require]`.

use super::document::{Node, Value};
use super::names::Named;
use super::section::{Range, Section};
use super::{ArraySection, Errors, Layout, Target};
use super::{Bound, Comparison, Figure, Requirement, Statistic};
use crate::error::ScenarioError;
use crate::quantity;

/// Keys besides the figures.
const KEYS: &[&str] = &["statistic", "confidence"];
/// Confidence when none is asked.
const CONFIDENCE: f64 = 0.90;
/// Relative slack of a comparison.
const SLACK: f64 = 1e-9;

const CONFIDENCE_RANGE: Range = Range {
    text: "more than 0 and at most 1",
    holds: |value| value > 0.0 && value <= 1.0,
};

/// What the rest of the scenario says about which bounds can be met.
#[derive(Debug)]
pub(super) struct Context<'a> {
    pub array: &'a ArraySection,
    pub target: &'a Target,
    pub errors: &'a Errors,
}

/// Refuses keys that are no figure.
pub(super) fn check_keys(section: &Section<'_>) -> Result<(), ScenarioError> {
    let figures = Figure::ALL.iter().map(|figure| figure.name());
    let keys: Vec<&str> = figures.chain(KEYS.iter().copied()).collect();
    section.only(&keys).map_err(|mut error| {
        // The key of an output file is a figure's name with its unit.
        let written = error.key.trim_start_matches("require.");
        if let Some(figure) = Figure::ALL
            .into_iter()
            .find(|figure| figure.key() == written)
        {
            error.nearest = Some(figure.name().to_string());
        }
        error
    })
}

/// Reads `[require]`.
pub(super) fn read(
    section: &Section<'_>,
    context: &Context<'_>,
) -> Result<Requirement, ScenarioError> {
    let mut bounds = Vec::new();
    for (name, node) in section.entries() {
        if let Some(figure) = Figure::ALL.into_iter().find(|figure| figure.name() == name) {
            let of_figure = read_bounds(section, figure, node)?;
            for bound in &of_figure {
                check(section, *bound, context)?;
            }
            check_pair(section, figure, &of_figure)?;
            bounds.extend(of_figure);
        }
    }
    let confidence = section.quantity("confidence", quantity::Kind::Ratio, CONFIDENCE_RANGE)?;
    Ok(Requirement {
        bounds,
        statistic: section.choice("statistic")?.unwrap_or(Statistic::Trials),
        confidence: confidence.unwrap_or(CONFIDENCE),
    })
}

fn read_bounds(
    section: &Section<'_>,
    figure: Figure,
    node: &Node,
) -> Result<Vec<Bound>, ScenarioError> {
    let items = match &node.value {
        Value::Array(items) => items.as_slice(),
        _ => std::slice::from_ref(node),
    };
    let bounds = items
        .iter()
        .map(|item| read_bound(section, figure, item))
        .collect::<Result<Vec<_>, _>>()?;
    let count = |side| {
        bounds
            .iter()
            .filter(|bound| bound.comparison == side)
            .count()
    };
    let (lower, upper) = (count(Comparison::AtLeast), count(Comparison::AtMost));
    if bounds.is_empty() || lower > 1 || upper > 1 {
        let found = format!("found a list with {lower} lower and {upper} upper bounds");
        let allowed = "it takes one lower bound, one upper bound, or one of each";
        return Err(section.error(figure.name(), found, allowed));
    }
    Ok(bounds)
}

fn read_bound(section: &Section<'_>, figure: Figure, node: &Node) -> Result<Bound, ScenarioError> {
    let key = figure.name();
    let allowed = "a bound is a text such as \">= VALUE\" or \"<= VALUE\", or a list of both";
    let Value::Text(text) = &node.value else {
        return Err(section.wrong_type(key, node, allowed));
    };
    let sides = [Comparison::AtLeast, Comparison::AtMost];
    let split = sides.into_iter().find_map(|side| {
        let rest = text.trim().strip_prefix(side.name())?;
        Some((side, rest.trim()))
    });
    let Some((comparison, quantity)) = split else {
        let found = format!(
            "{}, which starts with neither >= nor <=",
            node.value.describe()
        );
        return Err(section.placed(key, node, found, allowed));
    };
    let value = quantity::parse(quantity, figure.kind()).map_err(|error| {
        let mut placed = section.placed(key, node, error.found, error.allowed);
        placed.nearest = error.nearest;
        placed
    })?;
    Ok(Bound {
        figure,
        comparison,
        value: value + 0.0,
    })
}

/// Refuses a bound that nothing can meet, or that nothing defines.
fn check(section: &Section<'_>, bound: Bound, context: &Context<'_>) -> Result<(), ScenarioError> {
    use Figure::{
        BeamQuality, BucketFraction, BucketPower, CombiningEfficiency, Strehl, WindowFraction,
    };
    let key = bound.figure.name();
    let needs_bucket = matches!(bound.figure, BucketPower | BucketFraction | BeamQuality);
    if needs_bucket && context.target.bucket_diameter_m.is_none() {
        let allowed = "give target.bucket_diameter, the circle in which power counts";
        return Err(section.error(key, "found a bound that needs a bucket", allowed));
    }
    let found = || match section.node(key).map(|node| &node.value) {
        Some(Value::Text(text)) => format!("found \"{text}\", which cannot be met"),
        _ => format!(
            "found \"{} {}\", which cannot be met",
            bound.comparison.name(),
            bound.value
        ),
    };
    if bound.comparison == Comparison::AtMost {
        if bound.value < 0.0 {
            return Err(section.error(key, found(), "no figure is below 0"));
        }
        return Ok(());
    }
    let never_above_1 = match bound.figure {
        BucketFraction | WindowFraction => true,
        // A power spread may put the power where it adds best, and a focus or a
        // table's offsets may leave the aim point darker without errors than with.
        Strehl | CombiningEfficiency => {
            context.errors.power_spread <= 0.0
                && context
                    .target
                    .focus_m
                    .total_cmp(&context.target.range_m)
                    .is_eq()
                && !matches!(context.array.layout, Layout::Table { .. })
        }
        _ => false,
    };
    if never_above_1 && bound.value > 1.0 + SLACK {
        return Err(section.error(key, found(), "it is never above 1"));
    }
    Ok(())
}

fn check_pair(
    section: &Section<'_>,
    figure: Figure,
    bounds: &[Bound],
) -> Result<(), ScenarioError> {
    let side = |side| bounds.iter().find(|bound| bound.comparison == side);
    let (Some(lower), Some(upper)) = (side(Comparison::AtLeast), side(Comparison::AtMost)) else {
        return Ok(());
    };
    if lower.value > upper.value {
        let found = format!(
            "found a lower bound of {} above an upper bound of {}",
            quantity::exact(lower.value, figure.kind()),
            quantity::exact(upper.value, figure.kind())
        );
        let allowed = "the lower bound is at most the upper bound";
        return Err(section.error(figure.name(), found, allowed));
    }
    Ok(())
}
