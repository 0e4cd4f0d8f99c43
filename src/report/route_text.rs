//! The text view of a route: resistance with its proof and its assumptions, flow, split, stations.

use super::numbers::{self, MBAR_MIN_PER_UL, per_cent, significant, with_unit};
use super::route_document::RouteDocument;
use super::table::{Align, Table, paragraph};
use super::text::{TextOptions, counted, finished, part, title, value_table, warnings};
use crate::measured::Estimate;
use crate::study::{LawOfK, RouteOperation, UsedRule};

/// Rows of the table of stations that are shown without `--verbose`.
const MOST_ROWS: usize = 60;

/// The document as text, ended by a line feed.
pub fn route_text(document: &RouteDocument<'_>, options: TextOptions) -> String {
    let mut parts = vec![
        title(document.name, document.source).replacen("Section ", "Route ", 1),
        whole(document),
        how(document),
    ];
    parts.extend(document.operations.first().map(|o| flow(document, o)));
    if document.operations.len() > 1 {
        parts.push(series(document));
    }
    parts.push(split(document));
    parts.push(stations(document, options.verbose));
    parts.extend(warnings(&document.all_warnings()));
    finished(&parts, options)
}

fn row(table: &mut Table, what: &str, value: String, also: String) {
    table.row([what.to_owned(), value, also]);
}

/// Resistance and what is added up along the channel.
fn whole(document: &RouteDocument<'_>) -> String {
    let route = document.route;
    let mut table = value_table();
    let stated = |e: Estimate, unit: &str| format!("{} {unit}", significant(e.value, 6));
    row(
        &mut table,
        "R / mu = integral of dx / K",
        stated(route.integral, "1/m\u{b3}"),
        format!("estimated error {}", per_cent(route.integral.relative())),
    );
    if let Some(resistance) = document.resistance() {
        row(
            &mut table,
            "resistance R",
            stated(resistance, "Pa s/m\u{b3}"),
            format!(
                "{} mbar min/\u{b5}L",
                significant(resistance.value / MBAR_MIN_PER_UL, 5)
            ),
        );
    }
    match (&route.bounds, document.resistance_bounds()) {
        (Err(_), _) => row(
            &mut table,
            "R, proven",
            "none, see below".to_owned(),
            String::new(),
        ),
        (Ok((low, high)), bounds) => {
            let (name, (a, b), unit) = bounds
                .map_or(("R / mu, proven", (*low, *high), "1/m\u{b3}"), |bounds| {
                    ("R, proven", bounds, "Pa s/m\u{b3}")
                });
            let value = format!("{} to {} {unit}", significant(a, 6), significant(b, 6));
            let width = 2.0 * (high - low) / (high + low);
            row(&mut table, name, value, format!("{} wide", per_cent(width)));
        }
    }
    let metres = |v: f64| {
        (
            format!("{} m", significant(v, 6)),
            with_unit(v, numbers::LENGTHS, 5),
        )
    };
    let (si, also) = metres(route.length());
    row(&mut table, "length, along the longest branches", si, also);
    let volume = route.volume();
    row(
        &mut table,
        "volume of all branches",
        format!("{} m\u{b3}", significant(volume, 6)),
        format!("{} \u{b5}L", significant(volume / 1e-9, 5)),
    );
    let wall = route.wall_area();
    row(
        &mut table,
        "wall area of all branches",
        format!("{} m\u{b2}", significant(wall, 6)),
        with_unit(wall, numbers::AREAS, 5),
    );
    part("The whole route", &table)
}

/// Interpolation, its effect, and what the proof rests on.
fn how(document: &RouteDocument<'_>) -> String {
    let route = document.route;
    let mut out = "Between the stations\n".to_owned();
    let ways = || route.branches().flat_map(|b| &b.ways).map(|(way, _)| way);
    let mut counts = Table::new(&[Align::Left, Align::Left, Align::Left]);
    let mut count = |rule: UsedRule, meaning: &str| {
        let n = ways().filter(|way| way.used == rule).count();
        if n > 0 {
            let stretches = counted(n, "stretch", "stretches");
            counts.row([stretches, rule.word().to_owned(), meaning.to_owned()]);
        }
    };
    count(UsedRule::Constant, "the same section at both ends");
    count(
        UsedRule::Dimensions,
        "dimensions in proportion, sections in between solved",
    );
    for law in LawOfK::ALL {
        count(UsedRule::Law(law), law.meaning());
    }
    out.push_str(&counts.print(2));
    if ways().any(|way| matches!(way.used, UsedRule::Dimensions | UsedRule::Law(_))) {
        let mut table = Table::new(&[Align::Left, Align::Right]);
        for law in LawOfK::ALL {
            let change = route.integral_by(law) / route.integral.value - 1.0;
            let sign = if change < 0.0 { "" } else { "+" };
            table.row([
                format!("R with {} throughout", law.word()),
                format!("{sign}{}", per_cent(change)),
            ]);
        }
        out.push_str(&table.print(2));
    }
    let mut reasons: Vec<&str> = ways().filter_map(|way| way.why.as_deref()).collect();
    reasons.sort_unstable();
    reasons.dedup();
    for reason in reasons.into_iter().take(3) {
        let text = format!("dimensions not interpolated: {}", numbers::one_line(reason));
        out.push_str(&paragraph("  ", &text));
    }
    if route.bounds.is_err() {
        out.push_str(&proven_segments(document));
    }
    let proof = match &route.bounds {
        Ok(_) => "The proven values hold if the wall moves one way only from each section to the next (whole sections \
             may shift sideways), each being proven to lie inside its neighbour or around it."
            .to_owned(),
        Err(why) => format!("No proven value of R: {}.", numbers::one_line(why)),
    };
    out.push_str(&paragraph("  ", &proof));
    out.push_str(&paragraph(
        "  ",
        "Where K goes by a law, area and perimeter are straight between stations. Steps, bends and junctions \
         between segments have no resistance of their own here.",
    ));
    out
}

/// Segments with proven values where the route as a whole has none.
fn proven_segments(document: &RouteDocument<'_>) -> String {
    let mu = document.fluid.map(|fluid| fluid.viscosity);
    let mut table = Table::new(&[Align::Left, Align::Left, Align::Left]);
    for segment in &document.route.segments {
        let Ok((low, high)) = segment.bounds else {
            continue;
        };
        let unit = if mu.is_some() {
            "Pa s/m\u{b3}"
        } else {
            "1/m\u{b3}"
        };
        let [a, b] = [low, high].map(|v| significant(v * mu.unwrap_or(1.0), 6));
        table.row([
            format!("proven of segment {}", numbers::title(&segment.name)),
            format!("{a} to {b} {unit}"),
            format!("{} wide", per_cent(2.0 * (high - low) / (high + low))),
        ]);
    }
    table.print(2)
}

/// A pressure with its unit; what rounding leaves at the outlet is nothing.
fn pressure(value: f64) -> String {
    if value < 1e-6 {
        return "0 Pa".to_owned();
    }
    with_unit(value, numbers::PRESSURES, 5)
}

fn flow(document: &RouteDocument<'_>, operation: &RouteOperation) -> String {
    let mut table = value_table();
    if let Some(fluid) = document.fluid {
        let name = numbers::one_line(&fluid.name);
        let mu = format!("viscosity {} Pa s", significant(fluid.viscosity, 6));
        row(&mut table, "fluid", name, mu);
    }
    row(
        &mut table,
        "flow rate",
        format!("{} m\u{b3}/s", significant(operation.flow_rate, 6)),
        with_unit(operation.flow_rate, numbers::FLOW_RATES, 5),
    );
    row(
        &mut table,
        "pressure drop",
        format!("{} Pa", significant(operation.pressure_drop, 6)),
        with_unit(operation.pressure_drop, numbers::PRESSURES, 5),
    );
    row(
        &mut table,
        "residence time, mean",
        format!("{} s", significant(operation.residence_time, 6)),
        with_unit(operation.residence_time, numbers::TIMES, 5),
    );
    row(
        &mut table,
        "largest wall shear",
        format!("{} Pa", significant(operation.shear_max, 5)),
        document.place(operation.shear_at),
    );
    let shown = |v: Option<f64>, f: &dyn Fn(f64) -> String| {
        v.map_or_else(|| "not known without a density".to_owned(), f)
    };
    let reynolds = shown(operation.reynolds_max, &|v| significant(v, 4));
    row(
        &mut table,
        "largest Reynolds number on Dh",
        reynolds,
        String::new(),
    );
    let share = shown(operation.entrance_share, &per_cent);
    row(
        &mut table,
        "largest entrance share of a branch",
        share,
        "entrance length over its length".to_owned(),
    );
    if let Some(pressure) = operation.entrance_pressure {
        row(
            &mut table,
            "entrances would add",
            format!("{} Pa", significant(pressure, 3)),
            format!(
                "{} of the pressure drop, at most about",
                per_cent(pressure / operation.pressure_drop)
            ),
        );
    }
    part("Flow", &table)
}

/// All flow rates asked for.
fn series(document: &RouteDocument<'_>) -> String {
    let mut table = Table::new(&[Align::Right; 4]);
    table.row(["flow rate", "pressure drop", "largest shear", "largest Re"]);
    for operation in document.operations {
        table.row([
            with_unit(operation.flow_rate, numbers::FLOW_RATES, 5),
            with_unit(operation.pressure_drop, numbers::PRESSURES, 5),
            format!("{} Pa", significant(operation.shear_max, 4)),
            operation
                .reynolds_max
                .map_or_else(String::new, |re| significant(re, 4)),
        ]);
    }
    part("Series of flow rates (above and below: the first)", &table)
}

/// Segments with their branches.
fn split(document: &RouteDocument<'_>) -> String {
    let route = document.route;
    let is_spread = document.spread.is_some();
    let mut heads = vec![
        "segment",
        "branch",
        "of",
        "length",
        "share of R",
        "share of flow",
        "residence",
    ];
    if is_spread {
        heads.extend(["u(share)/share", "by draws", "u(R)/R"]);
    }
    let mut columns = vec![Align::Right; heads.len()];
    columns[0] = Align::Left;
    columns[1] = Align::Left;
    let mut table = Table::new(&columns);
    table.row(heads);
    let operation = document.operations.first();
    for (s, segment) in route.segments.iter().enumerate() {
        for (b, branch) in segment.branches.iter().enumerate() {
            let first = b == 0;
            let of_flow = operation.and_then(|o| o.segments.get(s)?.branches.get(b));
            let mut cells = vec![
                if first {
                    numbers::title(&segment.name)
                } else {
                    String::new()
                },
                numbers::title(&branch.name),
                branch.count.to_string(),
                with_unit(branch.length, numbers::LENGTHS, 4),
                if first {
                    per_cent(segment.integral.value / route.integral.value)
                } else {
                    String::new()
                },
                format!("{} %", significant(100.0 * branch.share, 4)),
                of_flow.map_or_else(String::new, |o| {
                    with_unit(o.residence_time, numbers::TIMES, 4)
                }),
            ];
            let spread = document.spread.and_then(|spread| spread.segments.get(s));
            if let Some((of_segment, share)) = spread.and_then(|s| Some((s, s.shares.get(b)?))) {
                cells.extend([per_cent(share.linear), per_cent(share.drawn)]);
                cells.push(if first {
                    per_cent(of_segment.linear)
                } else {
                    String::new()
                });
            }
            table.row(cells);
        }
    }
    let mut out = part(
        "Segments in series, branches beside each other (share of one)",
        &table,
    );
    if let Some(spread) = document.spread {
        let text = format!(
            "Spread of K between branches, independent: u(R)/R of the route is {} (first order), {} by {} draws; \
             standard uncertainties.",
            per_cent(spread.linear),
            per_cent(spread.drawn),
            spread.draws
        );
        out.push_str(&paragraph("  ", &text));
    }
    out
}

/// Every solved section along the route.
fn stations(document: &RouteDocument<'_>, is_long: bool) -> String {
    let route = document.route;
    let mut columns = vec![Align::Right; 7];
    columns[0] = Align::Left;
    columns.push(Align::Left);
    let mut table = Table::new(&columns);
    let is_flowing = !document.operations.is_empty();
    let (third, fourth) = if is_flowing {
        ("pressure", "largest shear")
    } else {
        ("", "")
    };
    table.row([
        "segment",
        "at",
        "K / m^4",
        "area",
        "R' / (Pa s/m^4)",
        third,
        fourth,
        "section",
    ]);
    let mut left_out = 0;
    let mut rows = 0;
    for (s, segment) in route.segments.iter().enumerate() {
        for (b, branch) in segment.branches.iter().enumerate() {
            for (p, point) in branch.points.iter().enumerate() {
                if (point.station.is_none() || rows >= MOST_ROWS) && !is_long {
                    left_out += 1;
                    continue;
                }
                rows += 1;
                let flow = &route.flows[point.flow].flow;
                let at = document
                    .operations
                    .first()
                    .and_then(|o| o.segments.get(s)?.branches.get(b)?.points.get(p));
                let name = if branch.name.is_empty() {
                    segment.name.clone()
                } else {
                    format!("{}, {}", segment.name, branch.name)
                };
                let mu = document.fluid.map(|f| f.viscosity);
                table.row([
                    numbers::title(&name),
                    numbers::length_on(
                        branch.begin + point.position,
                        branch.begin.abs() + branch.length,
                    ),
                    significant(flow.conductance.value, 6),
                    with_unit(flow.geometry.area, numbers::AREAS, 4),
                    mu.map_or(String::new(), |mu| {
                        significant(mu / flow.conductance.value, 5)
                    }),
                    at.map_or(String::new(), |at| pressure(at.pressure)),
                    at.map_or(String::new(), |at| {
                        format!("{} Pa", significant(at.local.wall_shear_max, 4))
                    }),
                    numbers::title(document.section_label(point.flow)),
                ]);
            }
        }
    }
    let mut out = part("Along the route", &table);
    if left_out > 0 {
        let text = format!("{left_out} more sections with --verbose, --csv or --json.");
        out.push_str(&paragraph("  ", &text));
    }
    out
}
